package page

import (
	"fmt"
	"html/template"
	"strings"

	"gapwright/magnetics/design"
	"gapwright/magnetics/part"
	"gapwright/reports/text"
)

// explanation is where one figure comes from, in words.
type explanation struct {
	*design.Explanation
	Anchor string        // of its summary
	Figure template.HTML // the value with its unit
	Rows   []explainedRow
	Shifts []explainedRow
}

// explainedRow is an input with its origin, or a change with what it does.
type explainedRow struct {
	Name   string
	Figure template.HTML
	Note   string
}

// explanationGroup are the figures of one part, or of the tank.
type explanationGroup struct {
	Name string
	List []explanation
}

func explained(d *design.Design, list []*design.Explanation) []explanationGroup {
	var groups []explanationGroup
	for _, e := range list {
		name := "Tank as built, total loss"
		if root, _, _ := strings.Cut(e.Quantity, "."); root == "transformer" || root == "inductor" {
			name = title(root)
		}
		if n := len(groups); n == 0 || groups[n-1].Name != name {
			groups = append(groups, explanationGroup{Name: name})
		}
		x := explanation{Explanation: e, Anchor: anchor(e), Figure: number(placeOf(d, e), e.Value, text.UnitValue(e.Value, e.Unit))}
		for _, in := range e.Inputs {
			x.Rows = append(x.Rows, explainedRow{in.Name, number("", in.Value, text.UnitValue(in.Value, in.Unit)), in.Origin})
		}
		for _, s := range e.Effects {
			x.Shifts = append(x.Shifts, explainedRow{s.Input + " " + s.Step, number("", s.Change, text.EffectText(s)), ""})
		}
		g := &groups[len(groups)-1]
		g.List = append(g.List, x)
	}
	return groups
}

func anchor(e *design.Explanation) string { return "from-" + strings.ReplaceAll(e.Quantity, ".", "-") }

// tankKeys are the figures of a tank corner that design.json files under another
// name than their own.
var tankKeys = map[string]string{
	"resonant_current": "resonant_current.rms", "resonant_current_peak": "resonant_current.peak", "magnetizing_current_peak": "magnetizing_current.peak",
	"swing_time": "soft_switching.swing_time",
}

// placeOf is where design.json has the explained figure; empty when it is the sum
// of figures there.
func placeOf(d *design.Design, e *design.Explanation) string {
	root, key, ok := strings.Cut(e.Quantity, ".")
	if !ok || e.Quantity == "transformer.winding_loss" {
		return ""
	}
	var names []string
	var rating *part.Rating
	switch root {
	case "transformer":
		rating = d.Rating
	case "inductor":
		rating = d.InductorRating
	default:
		root = "tank_as_built"
		for _, o := range d.Operations {
			names = append(names, o.Corner.Name)
		}
		if k, ok := tankKeys[key]; ok {
			key = k
		}
	}
	if rating != nil {
		for _, c := range rating.Corners {
			names = append(names, c.Name)
		}
	}
	if e.Corner == "" {
		return root + "." + key
	}
	for i, name := range names {
		if name == e.Corner {
			return fmt.Sprintf("%s.corners.%d.%s", root, i, key)
		}
	}
	return ""
}

// origins leads from the place of a figure in design.json, or from its quantity
// when it has no place there, to where its explanation stands.
type origins map[string]string

func originsOf(d *design.Design, list []*design.Explanation) origins {
	o := origins{}
	for _, e := range list {
		key := placeOf(d, e)
		if key == "" {
			key = e.Quantity
		}
		o[key] = anchor(e)
	}
	return o
}

// link makes a figure lead to its explanation, if it has one.
func (o origins) link(place string, figure template.HTML) template.HTML {
	id, ok := o[place]
	if !ok {
		return figure
	}
	return `<a class="from" href="#` + template.HTML(template.HTMLEscapeString(id)) + `">` + figure + `</a>`
}
