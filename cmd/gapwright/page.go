package main

import (
	"bytes"
	"fmt"

	"gapwright/magnetics/design"
	"gapwright/reports/page"
)

// pageName is the file of the page in the folder of a design.
const pageName = "design.html"

// newPage renders the page of a design with rated parts.
func newPage(d *design.Design, lib library) ([]byte, error) {
	view, err := design.NewView(d, lib.tables())
	if err != nil {
		return nil, err
	}
	var b bytes.Buffer
	in := page.Input{Design: d, View: view, MadeWith: fmt.Sprintf("gapwright %s, tables %s", version, tablesVersion)}
	if err := page.Write(&b, in); err != nil {
		return nil, err
	}
	return b.Bytes(), nil
}
