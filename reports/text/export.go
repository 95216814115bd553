package text

import (
	"fmt"
	"io"
	"math"

	"gapwright/corelib/quantity"
)

// An ExportReport says what an export wrote and how well it fits.
type ExportReport struct {
	Corner   string
	Files    []string
	Parts    []ExportPart
	Expected []ExportFigure
}

// An ExportPart is one part as elements.
type ExportPart struct {
	Part        string
	Frequency   float64 // Hz
	Temperature float64 // °C
	Cases       []ExportCase

	CoreResistance float64 // ohm, across CoreAcross; +Inf: none
	CoreAcross     string
	CoreCorner     string

	SelfCapacitance, InterwindingCapacity float64 // F
	CapacitanceBand                       float64 // relative, each way
}

// An ExportCase is one excitation: the field beside the elements.
type ExportCase struct {
	Name       string
	Inductance float64   // H, at the frequency of the part
	Resistance []float64 // ohm, of the field, at 1, 2, .. times that frequency
	Fitted     []float64 // ohm, of the elements
}

// An ExportFigure is what the bench measures.
type ExportFigure struct {
	Name, Meaning string
	Value         float64
}

func (c ExportCase) worst() float64 {
	x := 0.0
	for k := range c.Fitted {
		x = math.Max(x, math.Abs(c.Fitted[k]/c.Resistance[k]-1))
	}
	return x
}

// exportOrders are the harmonics that the table shows.
var exportOrders = []int{1, 3, 9, 20}

// exportAim is the deviation of the resistance that is aimed at; above it the
// report says so.
const exportAim = 0.03

// Export prints the report.
func Export(p *Printer, r ExportReport) error {
	for _, f := range r.Files {
		p.Line("wrote %s", f)
	}
	p.Line("")
	head := []string{"part", "case", "L"}
	for _, k := range exportOrders {
		if k == 1 {
			head = append(head, "R at f")
		} else {
			head = append(head, fmt.Sprintf("%d f", k))
		}
	}
	t := Table{Head: append(head, "fit"), Left: []int{0, 1}, Fold: true}
	missed := false
	for _, x := range r.Parts {
		for _, c := range x.Cases {
			row := []string{x.Part, c.Name, quantity.Format(c.Inductance, quantity.Henry)}
			for _, k := range exportOrders {
				row = append(row, quantity.Format(c.Resistance[k-1], quantity.Ohm))
			}
			t.Add(append(row, fmt.Sprintf("%.1f %%", 100*c.worst()))...)
			missed = missed || c.worst() > exportAim
		}
	}
	p.Table(t)
	p.Line("")
	for _, x := range r.Parts {
		core := "without core loss"
		if !math.IsInf(x.CoreResistance, 1) {
			core = fmt.Sprintf("core loss %s across %s (of corner %s)", quantity.Format(x.CoreResistance, quantity.Ohm), x.CoreAcross, x.CoreCorner)
		}
		capacitance := ""
		if x.SelfCapacitance > 0 {
			capacitance += ", across the winding " + quantity.Format(x.SelfCapacitance, quantity.Farad)
		}
		if x.InterwindingCapacity > 0 {
			capacitance += ", between the windings " + quantity.Format(x.InterwindingCapacity, quantity.Farad)
		}
		if capacitance != "" {
			capacitance += fmt.Sprintf(" (estimated, ±%.0f %%)", 100*x.CapacitanceBand)
		}
		p.Paragraph(2, "%s: f = %s, windings at %.0f °C; %s%s", x.Part, quantity.Format(x.Frequency, quantity.Hertz), x.Temperature, core, capacitance)
	}
	p.Line("")
	p.Paragraph(0, "The bench is the converter at corner %s; it prints these figures, beside which the exact solution says:", r.Corner)
	e := Table{Head: []string{"figure", "value", "what it is"}, Left: []int{0, 2}, Fold: true}
	for _, x := range r.Expected {
		e.Add("  "+x.Name, significant(x.Value, 4), x.Meaning)
	}
	p.Table(e)
	p.Line("")
	p.Paragraph(0, "R is that of the field solution, fit the largest deviation of the elements from it up to 20 f; inductances are met at f.")
	if missed {
		p.Paragraph(0, "A fit misses the aim of %.0f %%: take single losses at high harmonics from the report, not from a simulation.", 100*exportAim)
	}
	return p.Err()
}

type exportJSON struct {
	Format   int                `json:"format"`
	Corner   string             `json:"corner"`
	Files    []string           `json:"files"`
	Parts    []exportPartJSON   `json:"parts"`
	Expected []exportFigureJSON `json:"expected"`
}

type exportPartJSON struct {
	Part                 string           `json:"part"`
	Frequency            float64          `json:"frequency"`
	Temperature          float64          `json:"temperature"`
	Cases                []exportCaseJSON `json:"cases"`
	CoreResistance       *float64         `json:"core_resistance"` // null: no core loss
	CoreAcross           string           `json:"core_across"`
	CoreCorner           string           `json:"core_corner"`
	SelfCapacitance      float64          `json:"self_capacitance"`
	InterwindingCapacity float64          `json:"interwinding_capacitance"`
	CapacitanceBand      float64          `json:"capacitance_band"`
}

type exportCaseJSON struct {
	Name       string    `json:"name"`
	Inductance float64   `json:"inductance"`
	Resistance []float64 `json:"resistance"` // at 1 .. 20 times the frequency
	Fitted     []float64 `json:"fitted"`
	Error      float64   `json:"largest_error"`
}

type exportFigureJSON struct {
	Name    string  `json:"name"`
	Meaning string  `json:"meaning"`
	Value   float64 `json:"value"`
}

// ExportJSON writes the report for programs.
func ExportJSON(w io.Writer, r ExportReport) error {
	out := exportJSON{Format: 1, Corner: r.Corner, Files: r.Files}
	for _, x := range r.Parts {
		p := exportPartJSON{Part: x.Part, Frequency: x.Frequency, Temperature: x.Temperature, CoreAcross: x.CoreAcross, CoreCorner: x.CoreCorner,
			SelfCapacitance: x.SelfCapacitance, InterwindingCapacity: x.InterwindingCapacity, CapacitanceBand: x.CapacitanceBand}
		if !math.IsInf(x.CoreResistance, 1) {
			p.CoreResistance = &x.CoreResistance
		}
		for _, c := range x.Cases {
			p.Cases = append(p.Cases, exportCaseJSON{c.Name, c.Inductance, c.Resistance, c.Fitted, c.worst()})
		}
		out.Parts = append(out.Parts, p)
	}
	for _, x := range r.Expected {
		out.Expected = append(out.Expected, exportFigureJSON(x))
	}
	return JSON(w, out)
}
