package text

import (
	"fmt"
	"io"
	"strings"

	"gapwright/corelib/wire"
)

// A WireList is one kind of wire with the conductors that pass the filters.
type WireList struct {
	Title string // what the list holds and where it comes from
	Wires []wire.Wire
}

// Conductor is at which frequency and temperature the figures of wires are given.
type Conductor struct {
	Frequency   float64 // Hz; 0: no skin depth
	Temperature float64 // °C, of the resistance
}

func (c Conductor) skin() float64 { return wire.SkinDepth(c.Frequency, c.Temperature) }

// Wires writes lists of conductors for people.
func Wires(p *Printer, lists []WireList, c Conductor) error {
	printed := 0
	for _, l := range lists {
		if len(l.Wires) == 0 {
			continue
		}
		if printed > 0 {
			p.Line("")
		}
		printed++
		p.Paragraph(2, "%s", l.Title)
		p.Line("")
		t := Table{Head: []string{"wire", "bare mm", "overall mm", "most mm", "copper mm²", fmt.Sprintf("mΩ/m at %s °C", trimmed(c.Temperature, 1)), "g/m"}, Left: []int{0}}
		if c.Frequency > 0 {
			t.Head = append(t.Head, "d/δ")
		}
		for _, w := range l.Wires {
			size := w.Diameter
			var row []string
			if w.Kind == wire.Foil {
				size = w.Thickness
				w = withWidth(w)
			}
			row = append(row, w.String(), trimmed(1e3*size, 5), fmt.Sprintf("%.3f", 1e3*w.OuterDiameter()), fmt.Sprintf("%.3f", 1e3*w.OuterDiameterMax()),
				digits(1e6*w.CopperArea(), 4), digits(1e3*w.ResistancePerLength(c.Temperature), 4), digits(1e3*w.CopperMassPerLength(), 3))
			if c.Frequency > 0 {
				row = append(row, fmt.Sprintf("%.2f", size/c.skin()))
			}
			if w.Own != nil {
				row[0] += " +"
			}
			t.Rows = append(t.Rows, row)
		}
		p.Table(t)
	}
	if printed == 0 {
		p.Line("No wire passes these filters.")
		return p.Err()
	}
	p.Line("")
	wireRemarks(p, lists, c)
	return p.Err()
}

const foilWidth = 10e-3 // m

// withWidth gives a foil that has no width the usual one.
func withWidth(w wire.Wire) wire.Wire {
	if w.Kind == wire.Foil && w.Width == 0 {
		w.Width = foilWidth
	}
	return w
}

func wireRemarks(p *Printer, lists []WireList, c Conductor) {
	p.Paragraph(2, "Overall: nominal outer diameter with enamel, serving and jacket; most: the largest one, which layers are counted with.")
	if c.Frequency > 0 {
		p.Paragraph(2, "δ: skin depth of copper, %s mm at %s kHz and %s °C.", digits(1e3*c.skin(), 3), trimmed(1e-3*c.Frequency, 3), trimmed(c.Temperature, 1))
	}
	var foil float64
	var litz, triple, own bool
	for _, l := range lists {
		for _, w := range l.Wires {
			if w.Kind == wire.Foil {
				foil = withWidth(w).Width
			}
			litz = litz || w.Kind == wire.Litz
			triple = triple || w.TripleInsulated
			own = own || w.Own != nil
		}
	}
	if foil > 0 {
		p.Paragraph(2, "Foil: copper, resistance and mass for a width of %s mm.", trimmed(1e3*foil, 3))
	}
	if litz {
		p.Paragraph(2, "Litz: bundle diameter by a packing rule (%s, confirmed by a published table within 1.4 %%); resistance with the twist of 2 to 6 %%.", wire.FromMemory)
	}
	if triple {
		p.Paragraph(2, "Triple-insulated: copper + 0.20 mm, at most + 0.25 mm (%s of wire catalogues); what it may replace is in its certificate.", wire.FromMemory)
	}
	if own {
		p.Paragraph(2, "+: your own row.")
	}
}

// WireStock writes what the tables hold, for somebody who asks without a filter.
func WireStock(p *Printer, own []wire.Own) error {
	mm := func(list []float64) string {
		var parts []string
		for _, v := range list {
			parts = append(parts, trimmed(1e3*v, 4))
		}
		return strings.Join(parts, " ")
	}
	var r20, r40 []float64
	for _, s := range wire.Sizes("R20") {
		r20 = append(r20, s.Diameter)
	}
	for _, s := range wire.Sizes("R40") {
		r40 = append(r40, s.Diameter)
	}
	var counts []string
	for _, n := range wire.LitzCounts() {
		counts = append(counts, fmt.Sprint(n))
	}
	item := func(name, text string) { p.item(21, name, text) }
	p.Line("How a wire is written")
	for _, form := range []struct{ text, what string }{
		{"0.5 mm grade 2", "round wire, enamel of grade 1 to 3; 2 when left out"},
		{"AWG 24", "the same by gauge"},
		{"120 x 0.1 mm litz", "strands of grade 1, no serving"},
		{"60 x AWG 40 litz grade 2, double serving", "grade of the strands, serving none, single or double"},
		{"0.2 mm foil", "copper foil as wide as the winding"},
		{"0.5 mm triple-insulated", "three extruded layers; also after litz"},
	} {
		p.Line("  %-40s  %s", form.text, form.what)
	}
	p.Line("")
	p.Line("What the tables hold, sizes in mm")
	item("  solid R20", mm(r20))
	item("  solid R40 between", mm(r40))
	item("  solid AWG", fmt.Sprintf("%d to %d; any other diameter from 0.018 to 3.15 mm takes the enamel of the next R20 size", wire.LargestAWG, wire.SmallestAWG))
	item("  litz strands", mm(wire.LitzStrands()))
	item("  litz counts", strings.Join(counts, " "))
	item("  foil", mm(wire.FoilThicknesses()))
	item("  triple-insulated", mm(wire.TripleInsulatedDiameters()))
	if len(own) > 0 {
		p.Line("")
		p.Line("Your own rows")
		for _, o := range own {
			p.Line("  %s   %s, at most %s mm   %s (%s)", o.Wire, trimmed(1e3*o.OuterDiameter, 3), trimmed(1e3*o.OuterDiameterMax, 3), o.Source, o.Origin)
		}
	}
	p.Line("")
	p.Paragraph(2, "List them with figures: gapwright wires --kind litz --max-overall 2mm; one alone: gapwright wires \"120 x 0.1 mm litz\".")
	return p.Err()
}

// Wire writes everything known about one conductor.
func Wire(p *Printer, w wire.Wire, c Conductor) error {
	p.Line("%s   %s", w, w.Kind)
	p.Line("")
	line := func(name, format string, args ...any) {
		label := ""
		if name != "" {
			label = "  " + name
		}
		p.item(26, label, fmt.Sprintf(format, args...))
	}
	twist := ""
	switch w.Kind {
	case wire.Foil:
		line("thickness", "%s mm, width %s mm", trimmed(1e3*w.Thickness, 4), trimmed(1e3*w.Width, 3))
	case wire.Litz:
		line("strand", "%s mm bare, %s mm over the enamel of grade %d, at most %s mm", trimmed(1e3*w.Diameter, 5), trimmed(1e3*w.StrandOuterDiameter(), 4), w.Grade, trimmed(1e3*w.StrandOuterDiameterMax(), 4))
		steps := wire.BunchingSteps(w.Strands)
		line("bundle", "%d strands in %d bunching step%s, serving %s", w.Strands, steps, plural(steps), w.Serving)
		twist = fmt.Sprintf(", twist %.0f %% included", 100*(wire.LengthFactor(w.Strands)-1))
	default:
		line("copper", "%s mm", trimmed(1e3*w.Diameter, 5))
	}
	if w.Kind != wire.Foil {
		line("overall diameter", "%s mm nominal, at most %s mm", trimmed(1e3*w.OuterDiameter(), 4), trimmed(1e3*w.OuterDiameterMax(), 4))
		od := w.OuterDiameter()
		line("copper share", "%.0f %% of the overall circle", 100*w.CopperArea()/(circle*od*od))
	}
	line("copper section", "%s mm²", digits(1e6*w.CopperArea(), 5))
	hot := ""
	if c.Temperature != wire.ReferenceTemperature {
		hot = fmt.Sprintf(", %s mΩ/m at %s °C", digits(1e3*w.ResistancePerLength(c.Temperature), 5), trimmed(c.Temperature, 1))
	}
	line("resistance", "%s mΩ/m at 20 °C%s%s", digits(1e3*w.ResistancePerLength(20), 5), hot, twist)
	line("as wire lists print it", "%s mΩ/m at 20 °C (58.5 instead of 58 MS/m)", digits(1e3*w.NominalResistancePerLength(), 5))
	line("copper mass", "%s g/m", digits(1e3*w.CopperMassPerLength(), 4))
	if c.Frequency > 0 {
		size := w.Diameter
		if w.Kind == wire.Foil {
			size = w.Thickness
		}
		line("skin depth", "%s mm at %s kHz and %s °C; the copper is %.2f of it", digits(1e3*c.skin(), 4), trimmed(1e-3*c.Frequency, 3), trimmed(c.Temperature, 1), size/c.skin())
		if w.Kind == wire.Litz {
			line("first bunch", "at most %.0f strands (4 (δ/d)^2, Sullivan and Zhang 2014; form %s)", wire.FirstBunchMost(w.Diameter, c.skin()), wire.FromMemory)
		}
	}
	p.Line("")
	for i, source := range w.Sources() {
		label := ""
		if i == 0 {
			label = "source"
		}
		line(label, "%s", source)
	}
	if w.Own != nil && w.Own.Note != "" {
		line("note", "%s", w.Own.Note)
	}
	return p.Err()
}

const circle = 0.78539816339744831 // pi/4

func plural(n int) string {
	if n == 1 {
		return ""
	}
	return "s"
}

type wireJSON struct {
	Text                string   `json:"text"`
	Kind                string   `json:"kind"`
	Strands             int      `json:"strands,omitempty"`
	Diameter            float64  `json:"diameter,omitempty"`
	Thickness           float64  `json:"thickness,omitempty"`
	Width               float64  `json:"width,omitempty"`
	Grade               int      `json:"grade,omitempty"`
	Serving             string   `json:"serving,omitempty"`
	TripleInsulated     bool     `json:"triple_insulated"`
	StrandOuterDiameter float64  `json:"strand_outer_diameter,omitempty"`
	OuterDiameter       float64  `json:"outer_diameter"`
	OuterDiameterMax    float64  `json:"outer_diameter_max"`
	CopperArea          float64  `json:"copper_area"`
	Resistance20        float64  `json:"resistance_20"`
	NominalResistance   float64  `json:"nominal_resistance_20"`
	Resistance          float64  `json:"resistance"`
	CopperMass          float64  `json:"copper_mass"`
	SizeOverSkinDepth   float64  `json:"size_over_skin_depth,omitempty"`
	Sources             []string `json:"sources"`
	Origin              string   `json:"origin"`
}

// WiresJSON writes conductors for programs: per metre of wire, SI units; foil for
// its Width, or 10 mm where none is set.
func WiresJSON(w io.Writer, lists []WireList, c Conductor) error {
	out := struct {
		Format      int        `json:"format"`
		Temperature float64    `json:"temperature"`
		Frequency   *float64   `json:"frequency"`
		SkinDepth   *float64   `json:"skin_depth"`
		Wires       []wireJSON `json:"wires"`
	}{Format: 1, Temperature: c.Temperature, Wires: []wireJSON{}}
	if c.Frequency > 0 {
		skin := c.skin()
		out.Frequency, out.SkinDepth = &c.Frequency, &skin
	}
	for _, l := range lists {
		for _, x := range l.Wires {
			x = withWidth(x)
			j := wireJSON{
				Text: x.String(), Kind: string(x.Kind), Strands: x.Strands, Diameter: x.Diameter, Thickness: x.Thickness, Width: x.Width,
				Grade: x.Grade, TripleInsulated: x.TripleInsulated,
				OuterDiameter: x.OuterDiameter(), OuterDiameterMax: x.OuterDiameterMax(), CopperArea: x.CopperArea(),
				Resistance20: x.ResistancePerLength(20), NominalResistance: x.NominalResistancePerLength(), Resistance: x.ResistancePerLength(c.Temperature),
				CopperMass: x.CopperMassPerLength(), Sources: x.Sources(),
			}
			size := x.Diameter
			switch x.Kind {
			case wire.Litz:
				j.Serving = x.Serving.String()
				j.StrandOuterDiameter = x.StrandOuterDiameter()
			case wire.Foil:
				size = x.Thickness
			}
			if c.Frequency > 0 {
				j.SizeOverSkinDepth = size / c.skin()
			}
			if x.Own != nil {
				j.Origin = x.Own.Origin
			}
			out.Wires = append(out.Wires, j)
		}
	}
	return JSON(w, out)
}
