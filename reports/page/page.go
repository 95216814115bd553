// Package page writes a design as one HTML file that needs nothing else: no
// network, no font, no script from elsewhere. It can be read from a mail
// attachment and on paper, with and without scripts, in light and in dark, by
// keyboard and by ear.
//
// The page computes nothing that an engineer would rely on: every figure comes
// from the design or its view, and carries its full value and its place in
// design.json as attributes.
package page

import (
	"bytes"
	_ "embed"
	"errors"
	"fmt"
	"html/template"
	"io"

	"gapwright/magnetics/design"
)

// Input is what a page shows.
type Input struct {
	Design   *design.Design
	View     *design.View // nil when the design has no parts
	Failure  string       // why there are no parts, in words
	MadeWith string       // program and tables

	Explanations []*design.Explanation // where the figures come from; empty: the page has no such section
}

var (
	//go:embed page.html
	layoutText string
	//go:embed page.css
	styleText string
	//go:embed page.js
	scriptText string
)

// chooser is the group of radio buttons that picks a corner.
type chooser struct {
	Group   string
	Corners []string
}

var layout = template.Must(template.New("page").Funcs(template.FuncMap{
	"chooser": func(group string, corners []string) chooser { return chooser{group, corners} },
}).Parse(layoutText))

// Write writes the page of a design. One that ended without parts gets what is
// known: the tank, and what stopped each core size. When a drawing fails nothing
// is written.
func Write(w io.Writer, in Input) error {
	if in.Design == nil || (in.Design.Rating != nil) != (in.View != nil) {
		return errors.New("page: a design with parts comes with its view, one without parts has none")
	}
	c, err := gather(in)
	if err != nil {
		return fmt.Errorf("page: %w", err)
	}
	c.Style, c.Script = template.CSS(styleText), template.JS(scriptText)
	var b bytes.Buffer
	if err := layout.Execute(&b, c); err != nil {
		return fmt.Errorf("page: %w", err)
	}
	_, err = w.Write(b.Bytes())
	return err
}
