package page

import (
	"fmt"
	"html/template"

	"gapwright/corelib/quantity"
	"gapwright/magnetics/part"
	"gapwright/reports/figure"
)

// lossRow is one part at one corner.
type lossRow struct {
	Part, Corner                        string
	Core, Primary, Secondary, Sum, Flux template.HTML
	CoreTemperature, HotSpot            template.HTML
	First, Passing                      bool
}

func losses(in Input, from origins) (rows []lossRow, bars template.HTML, err error) {
	d := in.Design
	b := figure.Bars{
		Name: "losses", Title: "Loss of both parts at every corner: core, primary, secondary", Label: "loss, W",
		Segments: []string{"core", "primary or winding", "secondary"}, Tones: []figure.Tone{figure.Faint, figure.Primary, figure.Secondary},
	}
	for _, x := range []struct {
		root string
		r    *part.Rating
	}{{"transformer", d.Rating}, {"inductor", d.InductorRating}} {
		if x.r == nil {
			continue
		}
		for i, c := range x.r.Corners {
			at := func(key string) string { return fmt.Sprintf("%s.corners.%d.%s", x.root, i, key) }
			row := lossRow{
				Part: title(x.root), Corner: c.Name, First: i == 0, Passing: !c.Continuous,
				Core: from.link(at("core_loss"), scaled(at("core_loss"), c.CoreLoss, 1, 3, "")), Sum: scaled("", c.Loss(), 1, 3, ""), Flux: from.link(at("flux_density_peak"), scaled(at("flux_density_peak"), c.FluxDensityPeak, 1e3, 0, "")),
			}
			values := []float64{c.CoreLoss, c.PrimaryLoss, c.SecondaryLoss}
			if x.root == "transformer" {
				row.Primary, row.Secondary = scaled(at("winding_loss.primary"), c.PrimaryLoss, 1, 3, ""), scaled(at("winding_loss.secondary"), c.SecondaryLoss, 1, 3, "")
			} else {
				row.Primary, row.Secondary = from.link(at("winding_loss"), scaled(at("winding_loss"), c.PrimaryLoss, 1, 3, "")), "–"
			}
			note := quantity.FormatDigits(c.Loss(), quantity.Watt, 3)
			switch {
			case !c.Continuous:
				row.CoreTemperature, row.HotSpot = "passing", ""
				note += ", passing"
			case c.Runaway:
				row.CoreTemperature, row.HotSpot = "RUNAWAY", "RUNAWAY"
				note += ", RUNAWAY"
			default:
				row.CoreTemperature, row.HotSpot = from.link(at("core_temperature"), scaled(at("core_temperature"), c.CoreTemperature, 1, 0, "")), from.link(at("winding_temperature"), scaled(at("winding_temperature"), c.WindingTemperature, 1, 0, ""))
				note += fmt.Sprintf(", %.0f °C", c.WindingTemperature)
			}
			rows = append(rows, row)
			b.Rows = append(b.Rows, figure.BarRow{Group: title(x.root), Name: c.Name, Values: values, Note: note, Quiet: !c.Continuous})
		}
	}
	bars, err = svg(b.SVG())
	return rows, bars, err
}
