package page

import (
	"fmt"
	"html/template"

	"gapwright/magnetics/design"
	"gapwright/reports/figure"
)

// pairRow is one pair of core sizes that no other beats in both loss and volume.
type pairRow struct {
	ID                    string
	Transformer, Inductor string
	Volume, Loss, Mass    template.HTML
	Chosen                bool
	Quiet                 bool // not on paper
}

// paperPairs is how many pairs are printed, those around the chosen one.
const paperPairs = 16

// labelled is up to how many pairs have their names in the plot.
const labelled = 6

// pairs lists and draws the pairs. A single one is no curve, but still a mark.
func pairs(d *design.Design) ([]pairRow, template.HTML, error) {
	if len(d.Pareto) == 0 {
		return nil, "", nil
	}
	panel := figure.Panel{Y: figure.Axis{Label: "loss of both parts, W, weighted by share"}, Height: 52}
	line := figure.Curve{Tone: figure.Primary, Thin: true}
	var rows []pairRow
	for i, x := range d.Pareto {
		at := func(key string) string { return fmt.Sprintf("pareto.%d.%s", i, key) }
		r := pairRow{
			ID: fmt.Sprintf("p%d", i), Transformer: x.Transformer, Inductor: x.Inductor, Chosen: x.Chosen,
			Volume: scaled(at("volume"), x.Volume, 1e6, 1, ""), Loss: scaled(at("loss"), x.Loss, 1, 2, ""), Mass: scaled(at("mass"), x.Mass, 1e3, 0, ""),
		}
		name := x.Transformer
		if x.Inductor == "" {
			r.Inductor = "leakage"
		} else {
			name += " + " + x.Inductor
		}
		rows = append(rows, r)
		m := figure.Mark{
			X: 1e6 * x.Volume, Y: x.Loss, Shape: figure.Ring, Tone: figure.Primary, ID: r.ID,
			Tip: fmt.Sprintf("%s: %.1f cm³, %.2f W, %.0f g", name, 1e6*x.Volume, x.Loss, 1e3*x.Mass),
		}
		if x.Chosen {
			m.Shape = figure.Star
			m.Tip += ", chosen"
		}
		if x.Chosen || len(d.Pareto) <= labelled {
			m.Label = name
		}
		panel.Marks = append(panel.Marks, m)
		line.X, line.Y = append(line.X, m.X), append(line.Y, m.Y)
	}
	chosen := 0
	for i, r := range rows {
		if r.Chosen {
			chosen = i
		}
	}
	first := max(0, min(chosen-paperPairs/2, len(rows)-paperPairs))
	for i := range rows {
		rows[i].Quiet = i < first || i >= first+paperPairs
	}
	if len(line.X) > 1 {
		sortByX(&line)
		panel.Curves = []figure.Curve{line}
	}
	chart := figure.Chart{
		Name: "pairs", Title: "Loss over volume of the pairs of core sizes that keep every limit and that no other pair beats in both",
		X: figure.Axis{Label: "volume of both outlines, cm³", Log: true}, Panels: []figure.Panel{panel},
	}
	drawing, err := svg(chart.SVG())
	return rows, drawing, err
}
