package design

import (
	"fmt"
	"math"

	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
)

// coil is how one electrical winding, or each of its sections, is wound.
type coil struct {
	Wire     wire.Wire
	Parallel int // wires in hand
	Layers   int // of each section
}

// plan is a transformer as the search thinks of it: decisions only. construct
// turns it into the part that the shop reads.
type plan struct {
	Shape       shape.Shape
	Former      shape.Former
	Material    string
	Np, Ns      int
	Centertap   bool
	Arrangement string // P-S, S-P, P/2-S-P/2, S/2-P-S/2, sections
	Bifilar     bool   // both halves of a center tap in one layer
	Build       insulationBuild
	Primary     coil
	Secondary   coil
	Gap         part.Gap
	Extra       float64 // m, free distance between primary and secondary
}

// insulationBuild is how primary and secondary are kept apart.
type insulationBuild struct {
	Margin        float64 // m, each side of every winding; 0: none
	Insulated     string  // primary or secondary: wound with triple-insulated wire; "": none
	BarrierLayers int
}

// bend returns the thickest wire that goes around the corners of a former, m.
// The wall of the former makes the corner, with a round post its radius too. Litz
// is limp enough for any but a round post.
func bend(sh shape.Shape, former shape.Former, limits job.Wires) (thickest float64, litz bool) {
	corner := former.WallOffset
	if sh.PostRound() {
		corner += sh.PostWidth() / 2
	}
	return corner / limits.BendRadius, sh.PostRound()
}

// screenThickness is that of a screen of copper foil, m.
const screenThickness = 0.05e-3

// section is one stretch of one winding (or of two wound together) between
// barriers, before wires are chosen.
type section struct {
	names   []string
	of      []string
	primary bool
	turns   int
	chamber int
}

// sections lists the stretches of an arrangement, innermost first. ok is false
// when the turns cannot be divided that way.
func (p plan) sections() (list []section, ok bool) {
	primary := func(name string, turns int) section {
		return section{[]string{name}, []string{"P"}, true, turns, 0}
	}
	secondary := func(suffix string, turns int) []section {
		switch {
		case !p.Centertap:
			return []section{{[]string{"S" + suffix}, []string{"S"}, false, turns, 0}}
		case p.Bifilar:
			return []section{{[]string{"S-A" + suffix, "S-B" + suffix}, []string{"S-A", "S-B"}, false, turns, 0}}
		}
		return []section{
			{[]string{"S-A" + suffix}, []string{"S-A"}, false, turns, 0},
			{[]string{"S-B" + suffix}, []string{"S-B"}, false, turns, 0},
		}
	}
	switch p.Arrangement {
	case "P-S":
		return append([]section{primary("P", p.Np)}, secondary("", p.Ns)...), true
	case "S-P":
		return append(secondary("", p.Ns), primary("P", p.Np)), true
	case "P/2-S-P/2":
		if p.Np < 2 {
			return nil, false
		}
		list = append(list, primary("P1", p.Np-p.Np/2))
		list = append(list, secondary("", p.Ns)...)
		return append(list, primary("P2", p.Np/2)), true
	case "S/2-P-S/2":
		if p.Ns < 2 {
			return nil, false
		}
		list = append(list, secondary("1", p.Ns-p.Ns/2)...)
		list = append(list, primary("P", p.Np))
		return append(list, secondary("2", p.Ns/2)...), true
	case "sections":
		list = append(list, primary("P", p.Np))
		list = append(list, secondary("", p.Ns)...)
		for i := range list {
			if list[i].primary {
				list[i].chamber = 1
			} else {
				list[i].chamber = 2
			}
		}
		return list, true
	}
	return nil, false
}

// entries writes the order of work of the plan.
func (p plan) entries(limits job.Insulation) ([]winding.Entry, bool) {
	list, ok := p.sections()
	if !ok {
		return nil, false
	}
	tape := func(chamber, layers int, overlap float64, purpose string) winding.Entry {
		return winding.Entry{
			Kind: winding.Tape, Chamber: chamber, Thickness: limits.Tape, Material: "polyester",
			TapeLayers: layers, Overlap: overlap, Purpose: purpose,
		}
	}
	var out []winding.Entry
	for i, s := range list {
		if i > 0 && list[i-1].chamber == s.chamber {
			if list[i-1].primary != s.primary {
				if p.Build.BarrierLayers > 0 {
					out = append(out, tape(s.chamber, p.Build.BarrierLayers, 5e-3, "barrier"))
				}
				if limits.Screen == "one" {
					out = append(out, winding.Entry{Kind: winding.Screen, Thickness: screenThickness, Material: "copper", To: "pin 1", Ends: "insulated overlap 5 mm"})
					out = append(out, tape(s.chamber, p.Build.BarrierLayers, 5e-3, "barrier"))
				}
				if p.Extra > 0 {
					out = append(out, winding.Entry{Kind: winding.Space, Height: p.Extra, Purpose: "barrier"})
				}
			} else if limits.InterlayerLayers > 0 {
				out = append(out, tape(s.chamber, limits.InterlayerLayers, 2e-3, "interlayer"))
			}
		}
		c := p.Secondary
		insulated := p.Build.Insulated == "secondary"
		if s.primary {
			c = p.Primary
			insulated = p.Build.Insulated == "primary"
		}
		e := winding.Entry{
			Kind: winding.Wind, Chamber: s.chamber, Names: s.names, Of: s.of, Turns: s.turns,
			Wire: c.Wire, Parallel: c.Parallel, Layers: c.Layers, Spread: "full", Direction: "cw",
			Margins: [2]float64{p.Build.Margin, p.Build.Margin},
		}
		if c.Wire.Kind == wire.Foil {
			e.Interleaf = limits.Tape
			e.Leads = "copper strip, soldered over the whole width"
		}
		if p.Arrangement == "sections" && p.Extra > 0 {
			// Towards the wall between the chambers.
			if s.chamber == 1 {
				e.Margins[1] += p.Extra / 2
			} else {
				e.Margins[0] += p.Extra / 2
			}
		}
		if insulated {
			e.Insulated = "triple"
		}
		if c.Layers > 1 {
			e.Lay = "C"
		}
		if p.Build.Margin > 0 && limits.SleevingWall > 0 {
			e.Sleeving = fmt.Sprintf("wall %.2f mm where leads cross the margin", limits.SleevingWall*1e3)
		} else {
			e.Sleeving = "none"
		}
		out = append(out, e)
	}
	if limits.OuterLayers > 0 {
		if p.Arrangement == "sections" {
			out = append(out, tape(1, limits.OuterLayers, 10e-3, "finish"), tape(2, limits.OuterLayers, 10e-3, "finish"))
		} else {
			out = append(out, tape(0, limits.OuterLayers, 10e-3, "finish"))
		}
	}
	return out, true
}

// terminalNeeds is what the pin rule must know of one winding.
type terminalNeeds struct {
	current float64 // A rms
	voltage float64 // V peak between its ends
}

// pinRow hands out the pins of one row of the former, from the lowest up.
type pinRow struct{ next, last int }

// take returns n neighbouring pins, or nothing when the row has run out.
func (r *pinRow) take(n int) []string {
	if r.next+n-1 > r.last {
		return nil
	}
	pins := make([]string, n)
	for i := range pins {
		pins[i] = fmt.Sprintf("pin %d", r.next+i)
	}
	r.next += n
	return pins
}

// keepApart is the voltage between the ends of windings above which one pin
// stays free (common practice).
const keepApart = 100 // V

// pinsFor returns how many neighbouring pins one end needs: one for each wire in
// hand, enough for the current, and for a bundle thicker than a pin takes its
// section divided over several.
func pinsFor(w wire.Wire, parallel int, current float64, limits job.TransformerLimits) int {
	n := max(parallel, 1)
	if od := w.OuterDiameter(); od > limits.PinWireMax && w.Kind == wire.Litz {
		n *= int(math.Ceil(od * od / (limits.PinWireMax * limits.PinWireMax)))
	}
	if limits.PinCurrentMax > 0 {
		n = max(n, int(math.Ceil(current/limits.PinCurrentMax)))
	}
	return n
}

// terminals assigns pins by the rule of the build file: two rows, primary on
// the row of pin 1, secondary on the other, each winding from the lowest free
// pin, one pin free between ends with more than 100 V between them, pins in
// parallel for thick or strong ends, flying leads when the pins run out.
func terminals(former shape.Former, windings []part.Winding, coils []coil, needs []terminalNeeds, limits job.TransformerLimits, sides []string) (out []part.Winding, leads bool) {
	rows := [2]pinRow{{1, former.Pins / 2}, {former.Pins/2 + 1, former.Pins}}
	out = make([]part.Winding, len(windings))
	copy(out, windings)
	if former.Pins == 0 {
		return out, false // pins by the shop
	}
	pinsOf := func(i int) int { return pinsFor(coils[i].Wire, coils[i].Parallel, needs[i].current, limits) }
	try := func(i int) bool {
		row := &rows[1]
		if windings[i].Name == "P" || windings[i].Name == "L" {
			row = &rows[0]
		}
		w := &out[i]
		n := pinsOf(i)
		if w.Name == "S-B" {
			w.Start = out[i-1].Finish // the center tap
		} else {
			w.Start = row.take(n)
		}
		if len(w.Parts) > 1 {
			if j := row.take(1); j != nil {
				w.JoinedAt = j[0]
			}
		}
		if needs[i].voltage > keepApart {
			row.next++
		}
		w.Finish = row.take(n)
		return w.Start != nil && w.Finish != nil && (len(w.Parts) < 2 || w.JoinedAt != "")
	}
	fly := func(i int) {
		leads = true
		w := &out[i]
		w.Start, w.Finish = []string{"lead " + w.Name + " start"}, []string{"lead " + w.Name + " finish"}
		if w.Name == "S-B" {
			w.Start = out[i-1].Finish
		}
		if len(w.Parts) > 1 {
			w.JoinedAt = "inside, insulated"
		}
	}
	for i := 0; i < len(windings); i++ {
		// The halves of a center tap leave the same way.
		last := i
		if windings[i].Name == "S-A" {
			last = i + 1
		}
		saved := rows
		onPins := sides[i] != "leads" && coils[i].Wire.Kind != wire.Foil
		for k := i; k <= last && onPins; k++ {
			onPins = try(k)
		}
		if !onPins {
			rows = saved
			for k := i; k <= last; k++ {
				fly(k)
			}
		}
		i = last
	}
	return out, leads
}
