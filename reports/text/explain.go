package text

import (
	"fmt"
	"io"

	"gapwright/corelib/quantity"
	"gapwright/magnetics/design"
)

// Explain prints where a figure comes from: value, formula, model and source,
// inputs with their origin, and what small changes do to it.
func Explain(p *Printer, e *design.Explanation) error {
	title := e.Quantity
	if e.Corner != "" {
		title += ", corner " + e.Corner
	}
	p.Line("%s = %s", title, unitValue(e.Value, e.Unit))
	p.Line("")
	p.item(12, "  what", e.What)
	p.item(12, "  formula", e.Formula)
	if e.Model != "" {
		p.item(12, "  model", e.Model)
		p.item(12, "  source", e.Source)
	}
	p.Line("")
	if len(e.Inputs) > 0 {
		t := Table{Head: []string{"input", "value", "origin"}, Left: []int{0, 2}, Fold: true}
		for _, x := range e.Inputs {
			t.Add(x.Name, unitValue(x.Value, x.Unit), x.Origin)
		}
		p.Table(t)
		p.Line("")
	}
	if len(e.Effects) == 0 {
		p.Line("No small change of the inputs moves it: it follows from whole numbers, or nothing is left to vary.")
		return p.Err()
	}
	t := Table{Head: []string{"change", "by", "moves it by"}, Left: []int{0}}
	for _, x := range e.Effects {
		t.Add(x.Input, x.Step, EffectText(x))
	}
	p.Table(t)
	p.Line("")
	p.Paragraph(0, "Each line computes parts, tank, losses and heat again with that one change. Turns and layers are whole and stay.")
	return p.Err()
}

// EffectText prints how far a small change moves a figure.
func EffectText(x design.Effect) string {
	if x.Unit != "" {
		return fmt.Sprintf("%+.3g %s", x.Change, x.Unit)
	}
	return fmt.Sprintf("%+.3f %%", 100*x.Change)
}

// Quantities lists what can be explained.
func Quantities(p *Printer, list [][2]string) error {
	t := Table{Head: []string{"quantity", "what it is"}, Left: []int{0, 1}, Fold: true}
	for _, x := range list {
		t.Add(x[0], x[1])
	}
	p.Table(t)
	return p.Err()
}

// UnitValue prints an SI value with the unit it has for people.
func UnitValue(x float64, unit string) string { return unitValue(x, unit) }

func unitValue(x float64, unit string) string {
	switch unit {
	case "":
		return significant(x, 5)
	case "degC":
		return fmt.Sprintf("%.1f °C", x)
	case "m2":
		return fmt.Sprintf("%.4g mm²", 1e6*x)
	case "m3":
		return fmt.Sprintf("%.4g cm³", 1e6*x)
	case "m":
		return mm(x, 3)
	case "kg":
		return fmt.Sprintf("%.4g g", 1e3*x)
	}
	if u, ok := quantity.Lookup(unit); ok {
		return quantity.Format(x, u)
	}
	return fmt.Sprintf("%.4g %s", x, unit)
}

type explainJSON struct {
	Format   int           `json:"format"`
	Quantity string        `json:"quantity"`
	What     string        `json:"what"`
	Corner   string        `json:"corner"`
	Value    float64       `json:"value"`
	Unit     string        `json:"unit"`
	Formula  string        `json:"formula"`
	Model    string        `json:"model"`
	Source   string        `json:"source"`
	Inputs   []explainIn   `json:"inputs"`
	Effects  []explainMove `json:"sensitivities"`
}

type explainIn struct {
	Name   string  `json:"name"`
	Value  float64 `json:"value"`
	Unit   string  `json:"unit"`
	Origin string  `json:"origin"`
}

// explainMove is relative (unit "") or absolute in its unit.
type explainMove struct {
	Input  string  `json:"input"`
	Step   string  `json:"step"`
	Change float64 `json:"change"`
	Unit   string  `json:"unit"`
}

// ExplainJSON writes an explanation for programs.
func ExplainJSON(w io.Writer, e *design.Explanation) error {
	out := explainJSON{1, e.Quantity, e.What, e.Corner, e.Value, e.Unit, e.Formula, e.Model, e.Source, []explainIn{}, []explainMove{}}
	for _, x := range e.Inputs {
		out.Inputs = append(out.Inputs, explainIn(x))
	}
	for _, x := range e.Effects {
		out.Effects = append(out.Effects, explainMove(x))
	}
	return JSON(w, out)
}
