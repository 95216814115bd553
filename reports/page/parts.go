package page

import (
	"fmt"
	"html/template"
	"math"
	"strings"

	"gapwright/corelib/quantity"
	"gapwright/corelib/shape"
	"gapwright/magnetics/design"
	"gapwright/magnetics/part"
	"gapwright/reports/figure"
	"gapwright/reports/text"
)

// partCard is one part.
type partCard struct {
	Part, Title, Lead string
	Facts             []fact
	Windings          []windingRow
	Second            []fact // next best wires
	Legend            []layerRow
	Maps              []panel
	Strands           []panel
	StrandNotes       []string
	Gap               template.HTML
	GapNote           template.HTML
}

// fact is one line of a card.
type fact struct {
	Name string
	Text template.HTML
	Note string
}

type windingRow struct {
	Name, Wire                                   string
	Turns, Parallel, Layers, DC, Density, Factor template.HTML
}

// layerRow says what a number in the half section stands for.
type layerRow struct{ Number, Text string }

// panel is one picture that belongs to a corner, or to a winding.
type panel struct {
	Corner  int
	Name    string
	Figure  template.HTML
	Caption string
}

// esc is a text inside of template.HTML.
func esc(s string) template.HTML { return template.HTML(template.HTMLEscapeString(s)) }

func join(list ...template.HTML) template.HTML {
	var b strings.Builder
	for _, x := range list {
		b.WriteString(string(x))
	}
	return template.HTML(b.String())
}

// svg takes a drawing into the page. The drawings escape every text that they
// are given.
func svg(data []byte, err error) (template.HTML, error) {
	if err != nil {
		return "", err
	}
	s := strings.TrimSpace(string(data))
	return template.HTML(strings.Replace(s, "<svg ", `<svg role="img" `, 1)), nil
}

func partCards(in Input, from origins) ([]partCard, error) {
	d := in.Design
	var cards []partCard
	for i := range in.View.Parts {
		v := &in.View.Parts[i]
		c, r, root := &d.Transformer.Construction, d.Rating, "transformer"
		title := "Transformer"
		if v.Part == "inductor" {
			c, r, root, title = &d.Inductor.Construction, d.InductorRating, "inductor", "Resonant inductor"
		}
		card := partCard{Part: v.Part, Title: title, Facts: facts(d, c, r, root, from), Windings: windings(r, root)}
		for i, x := range d.SecondChoices {
			if x.Part == v.Part {
				card.Second = append(card.Second, secondChoice(i, x))
			}
		}
		card.Lead = fmt.Sprintf("%s, %s", r.Shape.Name, c.Core.Material)
		coil := figure.NewCoil(title, *c, *r, v.Window, false)
		for _, l := range coil.Layers {
			if n := len(card.Legend); n > 0 && card.Legend[n-1].Text == l.Label {
				first, _, _ := strings.Cut(card.Legend[n-1].Number, " – ")
				card.Legend[n-1].Number = first + " – " + l.Number
				continue
			}
			card.Legend = append(card.Legend, layerRow{l.Number, l.Label})
		}
		top := figure.FieldTop(v.Fields)
		for _, f := range v.Fields {
			if !(top > 0) {
				break
			}
			drawing, err := svg(figure.FieldView(coil, f, top))
			if err != nil {
				return nil, err
			}
			card.Maps = append(card.Maps, panel{Corner: cornerIndex(in, f.Corner), Name: f.Corner, Figure: drawing,
				Caption: fmt.Sprintf("Field at the fundamental, %s: %s rms at most in the copper.", quantity.Format(f.Frequency, quantity.Hertz), perMeter(f.InCopper))})
		}
		if err := card.curves(v, r, root); err != nil {
			return nil, err
		}
		cards = append(cards, card)
	}
	return cards, nil
}

func perMeter(h float64) string {
	if h >= 1000 {
		return fmt.Sprintf("%.3g kA/m", h/1000)
	}
	return fmt.Sprintf("%.3g A/m", h)
}

func facts(d *design.Design, c *part.Construction, r *part.Rating, root string, from origins) []fact {
	linked := func(key string, figure template.HTML) template.HTML { return from.link(root+"."+key, figure) }
	at := func(key string) string { return root + "." + key }
	var list []fact
	add := func(name string, parts ...template.HTML) {
		list = append(list, fact{Name: name, Text: join(parts...)})
	}
	add("core", esc(fmt.Sprintf("%s, %s, Ae %.4g mm², Ve %.3g cm³; table confidence %s", r.Shape.Name, c.Core.Material, 1e6*r.Shape.Ae, 1e6*r.Shape.Ve, r.Shape.Confidence)))
	if !r.Shape.Proven() {
		list[0].Note = shape.NotProven
	}
	g := c.Core.Gap
	al := join(esc(", A_L "), unit(at("inductance_factor"), r.Gap.AL, quantity.Henry))
	slope := join(esc(", L moves "), number(at("inductance_change_per_gap"), r.Gap.Sensitivity, signed(1e-3*r.Gap.Sensitivity, 1)+" %"), esc(" per 10 µm"))
	switch g.Kind {
	case part.Closed, "":
		add("gap", esc("none"), al)
	case part.Spacer:
		add("gap", scaled(at("gap"), r.Gap.Length, 1e3, 3, " mm"), esc(" of film under all legs"), al, slope)
	default:
		pieces := esc(" ground into the post of one half")
		if g.Pieces > 1 {
			pieces = join(esc(" in "), number(at("gap_pieces"), float64(g.Pieces), fmt.Sprint(g.Pieces)), esc(fmt.Sprintf(" pieces of %.3f mm in the post", 1e3*r.Gap.PieceLength)))
		}
		governs := ""
		if g.Governs != "" {
			governs = " (" + g.Governs + " governs)"
		}
		add("gap", scaled(at("gap"), r.Gap.Length, 1e3, 3, " mm"), pieces, al, esc(governs), slope)
		if r.Gap.SpacerLength > 0 {
			add("or film", scaled(at("spacer_alternative"), r.Gap.SpacerLength, 1e3, 3, " mm"), esc(" under all legs gives the same inductance"))
		}
	}
	if r.Gap.ClearDistance > 0 {
		add("clear of the gap", esc("keep copper "), scaled(at("clear_distance"), r.Gap.ClearDistance, 1e3, 1, " mm"), esc(" away; the nearest is at "), scaled(at("copper_distance"), r.Gap.CopperDistance, 1e3, 2, " mm"))
	}
	turns := make([]template.HTML, 0, 2*len(c.Windings))
	for i, w := range c.Windings {
		if i > 0 {
			turns = append(turns, esc(" : "))
		}
		turns = append(turns, number(fmt.Sprintf("%s.windings.%d.turns", root, i), float64(w.Turns), fmt.Sprint(w.Turns)))
	}
	add("turns", join(turns...), esc(", "+r.Arrangement+" from the post outward"))
	hot := ""
	if r.OpenInductance > 0 {
		hot = fmt.Sprintf(" at %.0f °C, %s %% hot", d.Job.Build.Tests.Temperature, signed(100*(r.HotInductance/r.OpenInductance-1), 1))
	}
	if root == "transformer" {
		add("Lp, all others open", linked("open_inductance", unit(at("open_inductance"), r.OpenInductance, quantity.Henry)), esc(hot))
		add("Ls, all others open", linked("secondary_open_inductance", unit(at("secondary_open_inductance"), r.SecondaryInductance, quantity.Henry)))
		halves := []template.HTML{linked("short_inductance", unit(at("short_inductance"), r.ShortInductance, quantity.Henry))}
		if len(r.ShortHalves) > 1 {
			halves = append(halves, esc(" (halves "), unit(at("short_inductance_halves.0"), r.ShortHalves[0], quantity.Henry), esc(" and "), unit(at("short_inductance_halves.1"), r.ShortHalves[1], quantity.Henry), esc(")"))
		}
		add("Lsc, secondary shorted", halves...)
		add("for the tank", esc("Lm "), linked("magnetizing_inductance", unit(at("magnetizing_inductance"), r.MagnetizingInduct, quantity.Henry)), esc(", effective turns ratio "), linked("effective_turns_ratio", scaled(at("effective_turns_ratio"), r.EffectiveTurnsRatio, 1, 4, "")))
	} else {
		add("L", linked("inductance", unit(at("inductance"), r.OpenInductance, quantity.Henry)), esc(hot))
	}
	add("flux density", linked("flux_density_peak", scaled(at("flux_density_peak"), r.FluxDensityPeak, 1e3, 0, " mT")), esc(" peak in the smallest section, "), linked("flux_density_overload", scaled(at("flux_density_overload"), r.OverloadFlux, 1e3, 0, " mT")),
		esc(fmt.Sprintf(" at the current limit; saturation hot %.0f mT", 1e3*r.Ferrite.Bsat(d.Job.Build.For(r.Part).Limits.CoreTemperature))))
	add("fit", linked("height_left", scaled(at("height_left"), r.HeightLeft, 1e3, 2, " mm")), esc(fmt.Sprintf(" of %.2f mm window height left after bulge", 1e3*r.Former.Height)))
	add("outline", scaled(at("outline.0"), r.Outline[0], 1e3, 1, ""), esc(" × "), scaled(at("outline.1"), r.Outline[1], 1e3, 1, ""), esc(" × "), scaled(at("outline.2"), r.Outline[2], 1e3, 1, " mm high, "),
		scaled(at("volume"), r.Volume, 1e6, 1, " cm³, "), linked("mass", scaled(at("mass"), r.Mass, 1e3, 0, " g")))
	return list
}

// secondChoice words the next best wire of a winding, and the limit that speaks
// against it.
func secondChoice(i int, c design.WireChoice) fact {
	change := quantity.Format(math.Abs(c.More), quantity.Watt)
	if c.More > 0 {
		change = "+" + change
	} else if c.More < 0 {
		change = "−" + change
	}
	more := number(fmt.Sprintf("second_choices.%d.more", i), c.More, change)
	layers := "layers"
	if c.Layers == 1 {
		layers = "layer"
	}
	misses := ""
	if c.Misses != nil {
		misses = "; it misses " + limitName(c.Misses.Limit)
		if !yesOrNo(c.Misses.Limit) {
			than := "at most"
			if c.Misses.Sense == "min" {
				than = "at least"
			}
			misses += fmt.Sprintf(": %s, %s %s", text.LimitValue(c.Misses.Value, c.Misses.Unit), than, text.LimitValue(c.Misses.Bound, c.Misses.Unit))
		}
	}
	return fact{Name: "instead of " + c.Winding, Text: join(esc(fmt.Sprintf("%s, %d in hand, %d %s: loss of this part ", c.Wire, c.Parallel, c.Layers, layers)), more,
		esc(fmt.Sprintf(" (%s)%s", deviation(c.Loss, c.Loss-c.More), misses)))}
}

func windings(r *part.Rating, root string) []windingRow {
	var rows []windingRow
	for i, w := range r.Windings {
		at := func(key string) string { return fmt.Sprintf("%s.windings.%d.%s", root, i, key) }
		rows = append(rows, windingRow{
			Name: w.Name, Wire: w.Wire, Turns: number(at("turns"), float64(w.Turns), fmt.Sprint(w.Turns)), Parallel: number(at("parallel"), float64(w.Parallel), fmt.Sprint(w.Parallel)),
			Layers: number(at("layers"), float64(w.Layers), fmt.Sprint(w.Layers)), DC: unit(at("dc_resistance"), w.DCResistance, quantity.Ohm),
			Density: scaled(at("current_density"), w.CurrentDensity, 1e-6, 1, ""), Factor: scaled(at("ac_factor"), w.ACFactor, 1, 2, ""),
		})
	}
	return rows
}

// curves draws what a change of gap or strand would do.
func (c *partCard) curves(v *design.PartView, r *part.Rating, root string) error {
	if g := v.Gap; len(g.Points) > 1 {
		var x, field, plain []float64
		for _, p := range g.Points {
			x, field, plain = append(x, 1e3*p.Length), append(field, 1e6*p.Field), append(plain, 1e6*p.Plain)
		}
		what, of := "gap in the post", "inductance over the length of the gap"
		if g.Kind == part.Spacer {
			what, of = "film under all legs", "inductance over the thickness of the film"
		}
		chart := figure.Chart{
			Name: c.Part + "-gap", Title: c.Title + ": " + of, X: figure.Axis{Label: what + ", sum of pieces, mm"},
			Panels: []figure.Panel{{
				Y: figure.Axis{Label: "inductance at the test temperature, µH"}, Height: 36,
				Curves: []figure.Curve{{Name: "field", X: x, Y: field, Tone: figure.Primary}, {Name: "no fringing", X: x, Y: plain, Tone: figure.Faint, Dashed: true}},
				Marks:  []figure.Mark{{X: 1e3 * g.Built, Y: 1e6 * r.OpenInductance, Shape: figure.Dot, Tone: figure.Primary, Label: "as built"}},
				Bands:  []figure.Band{{From: 1e3 * (g.Built - g.Tolerance), To: 1e3 * (g.Built + g.Tolerance), Label: fmt.Sprintf("± %.0f µm", 1e6*g.Tolerance)}},
			}},
		}
		var err error
		if c.Gap, err = svg(chart.SVG()); err != nil {
			return err
		}
		c.GapNote = join(esc("10 µm more gap move L by "), number(root+".inductance_change_per_gap", r.Gap.Sensitivity, signed(1e-3*r.Gap.Sensitivity, 2)+" %"),
			esc(fmt.Sprintf(". The band is what the job says a shop keeps; it stands for about ± %.1f %% of L.", -100*r.Gap.Sensitivity*g.Tolerance)))
	}
	for i, s := range v.Strands {
		if len(s.Points) < 2 || repeated(v.Strands[:i], s) {
			continue
		}
		var x, loss, dc []float64
		for _, p := range s.Points {
			x, loss, dc = append(x, 1e3*p.Diameter), append(loss, p.Loss), append(dc, p.DC)
		}
		name := s.Winding
		for _, other := range v.Strands[i+1:] {
			if same(other, s) {
				name += " and " + other.Winding
			}
		}
		marks := []figure.Mark{{X: 1e3 * s.Built.Diameter, Y: s.Built.Loss, Shape: figure.Dot, Tone: figure.Primary, Label: "as built"}}
		note := ""
		if s.Knee >= 0 {
			k := s.Points[s.Knee]
			if k.Diameter != s.Built.Diameter {
				marks = append(marks, figure.Mark{X: 1e3 * k.Diameter, Y: k.Loss, Shape: figure.Ring, Tone: figure.Primary, Label: "knee"})
			} else {
				marks[0].Label = "as built, the knee"
			}
			note = fmt.Sprintf("Knee at %d × %.3g mm, %.3g W: thinner strands save at most a tenth.", k.Strands, 1e3*k.Diameter, k.Loss)
		}
		for k, p := range s.Points {
			if p.Diameter == s.Built.Diameter && k > 0 {
				thick := s.Points[k-1]
				note += fmt.Sprintf(" The next thicker, %d × %.3g mm, costs %s of this winding's loss.", thick.Strands, 1e3*thick.Diameter, deviation(thick.Loss, s.Built.Loss))
			}
		}
		chart := figure.Chart{
			Name: c.Part + "-strand", Title: fmt.Sprintf("%s: loss of winding %s over the diameter of its strands, same bundle", c.Title, name),
			X: figure.Axis{Label: "strand diameter (copper), mm; bundle diameter kept", Log: true},
			Panels: []figure.Panel{{
				Y: figure.Axis{Label: fmt.Sprintf("loss of %s, W, weighted by share", name), Zero: true}, Height: 36,
				Curves: []figure.Curve{{Name: "total", X: x, Y: loss, Tone: figure.Primary}, {Name: "DC part", X: x, Y: dc, Tone: figure.Faint, Dashed: true}},
				Marks:  marks,
			}},
		}
		chart.Panels[0].Y.Min, chart.Panels[0].Y.Max = 0, lossTop(s)
		drawing, err := svg(chart.SVG())
		if err != nil {
			return err
		}
		c.Strands = append(c.Strands, panel{Name: name, Figure: drawing, Caption: fmt.Sprintf("Winding %s, %d × %.3g mm as built. %s", name, s.Built.Strands, 1e3*s.Built.Diameter, note)})
	}
	return nil
}

// lossTop cuts the curve of the strands at four times what is built, or at its
// largest.
func lossTop(s part.StrandCurve) float64 {
	most := 0.0
	for _, p := range s.Points {
		most = max(most, p.Loss)
	}
	return min(1.02*most, max(4*s.Built.Loss, 1e-9))
}

func same(a, b part.StrandCurve) bool {
	if a.Built.Diameter != b.Built.Diameter || a.Built.Strands != b.Built.Strands {
		return false
	}
	d := a.Built.Loss - b.Built.Loss
	return d < 1e-3*a.Built.Loss && d > -1e-3*a.Built.Loss
}

func repeated(before []part.StrandCurve, s part.StrandCurve) bool {
	for _, b := range before {
		if same(b, s) {
			return true
		}
	}
	return false
}
