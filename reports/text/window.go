package text

import (
	"fmt"
	"io"
	"math"

	"gapwright/corelib/quantity"
	"gapwright/magnetics/window"
)

// Window writes the field of a winding window for people.
func Window(p *Printer, r *window.Result) error {
	w := &r.File.Window
	round := w.Geometry == window.RoundPost
	windowGeometry(p, r)
	windowWindings(p, r)
	windowResistance(p, r)
	for i := range r.Windings {
		if g := r.Windings[i].Grid; g != nil {
			windowGrid(p, &r.Windings[i])
		}
	}
	p.Line("")
	p.Line("Currents are peak values in the same phase.")
	if !round {
		more := ""
		if r.Inductance > 0 {
			more = "; the inductance is that of the full section with both windows, per meter of depth"
		}
		p.Paragraph(0, "Planar: energy, resistance and loss are per meter of turn and of one window%s.", more)
	}
	if r.Modes > 0 {
		p.Paragraph(0, "Field: cosine series with %d modes; leakage energy good to 0.5 %%, gapped inductance to 1 %% (spacer 8 %%), mean square field to 1 %% with walls of infinite permeability and 3 %% with a core, against finite elements.", r.Modes)
	} else {
		p.Paragraph(0, "Field: rectangles in closed form with the post as a plane mirror; exact for the plane. A real post is shorter: for windings side by side the energy is 8 %% and the mean square field 11 %% above finite elements with a whole core, for concentric ones less than 1 %%.")
	}
	for _, m := range r.Methods {
		p.Paragraph(0, "AC resistance of %s.", m)
	}
	return p.Err()
}

func windowGeometry(p *Printer, r *window.Result) {
	w := &r.File.Window
	line := func(name, format string, args ...any) { p.item(18, "  "+name, fmt.Sprintf(format, args...)) }
	p.Line("Window")
	where := "planar"
	if w.Geometry == window.RoundPost {
		where = "around a round post of radius " + format(w.PostRadius, quantity.Meter)
	}
	if w.Surround == window.Head {
		where = "winding head: the plane of the post, open elsewhere"
	}
	line("breadth, depth", "%s × %s, %s", format(w.Breadth, quantity.Meter), format(w.Depth, quantity.Meter), where)
	for i, g := range append(w.Gaps[:len(w.Gaps):len(w.Gaps)], w.OuterGaps...) {
		leg := "post"
		if i >= len(w.Gaps) {
			leg = "outer leg"
		}
		text := ""
		if r.Net != 0 {
			text = fmt.Sprintf(", takes %s of the ampere-turns", percent(math.Abs(r.GapDrops[i]/r.Net)))
		}
		line("gap in the "+leg, "%s at %s%s", format(g.Length, quantity.Meter), format(g.Center, quantity.Meter), text)
	}
	if w.UngappedInductance > 0 {
		unit := quantity.HenryPerMeter
		if w.Geometry == window.RoundPost {
			unit = quantity.Henry
		}
		text := ""
		if r.Net != 0 {
			text = fmt.Sprintf(", the core takes %s of the ampere-turns", percent(math.Abs(r.CoreDrop/r.Net)))
		}
		line("ungapped core", "%s per turn²%s", format(w.UngappedInductance, unit), text)
	}
	p.Line("")
	unit, per := quantity.Joule, ""
	if w.Geometry == window.Planar {
		per = "/m"
	}
	line("field energy", "%s%s inside the window", format(r.Energy, unit), per)
	if r.OneDimensional > 0 && r.Energy > 0 {
		line("by hand", "%s%s by the one-dimensional formula over the breadth of the window, %+.1f %%", format(r.OneDimensional, unit), per, 100*(r.OneDimensional/r.Energy-1))
	}
	if r.Inductance > 0 {
		if w.Geometry == window.Planar {
			line("inductance", "%s per turn², full section", format(r.Inductance, quantity.HenryPerMeter))
		} else {
			line("inductance", "%s per turn²", format(r.Inductance, quantity.Henry))
		}
	}
	p.Line("")
}

func windowWindings(p *Printer, r *window.Result) {
	t := Table{Head: []string{"winding", "conductors", "ampere-turns", "mean H² 1/m²", "its root A/m"}, Left: []int{0}}
	resistance := false
	for i := range r.Windings {
		resistance = resistance || r.Windings[i].DCResistance > 0
	}
	if resistance {
		head := "Rdc mΩ/m"
		if r.File.Window.Geometry == window.RoundPost {
			head = "Rdc mΩ"
		}
		t.Head = append(t.Head, head)
	}
	for i := range r.Windings {
		w := &r.Windings[i]
		row := []string{w.Name, fmt.Sprint(w.Conductors), significant(w.AmpereTurns, 4), significant(w.MeanH2, 4), significant(math.Sqrt(w.MeanH2), 4)}
		if resistance {
			cell := "-"
			if w.DCResistance > 0 {
				cell = significant(w.DCResistance*1e3, 4)
			}
			row = append(row, cell)
		}
		t.Add(row...)
	}
	p.Table(t)
}

func windowResistance(p *Printer, r *window.Result) {
	t := Table{Head: []string{"f kHz"}}
	var shown []*window.WindingResult
	for i := range r.Windings {
		if w := &r.Windings[i]; w.Loss != nil {
			shown = append(shown, w)
			if w.Ratio != nil {
				t.Head = append(t.Head, w.Name+" Rac/Rdc")
			}
			t.Head = append(t.Head, w.Name+" loss W"+perMeter(r))
		}
	}
	if len(shown) == 0 || len(r.File.Frequencies) == 0 {
		return
	}
	p.Line("")
	for k, f := range r.File.Frequencies {
		row := []string{significant(f/1e3, 4)}
		for _, w := range shown {
			if w.Ratio != nil {
				row = append(row, significant(w.Ratio[k], 4))
			}
			row = append(row, significant(w.Loss[k], 4))
		}
		t.Add(row...)
	}
	p.Table(t)
}

func perMeter(r *window.Result) string {
	if r.File.Window.Geometry == window.Planar {
		return "/m"
	}
	return ""
}

func windowGrid(p *Printer, w *window.WindingResult) {
	p.Line("")
	p.Line("Mean H² in %s, 1/m²: along the breadth downward, from the post to the right", w.Name)
	t := Table{Head: []string{"part"}}
	for i := range w.Grid {
		t.Head = append(t.Head, fmt.Sprintf("x %d", i+1))
	}
	for j := range w.Grid[0] {
		row := []string{fmt.Sprintf("y %d", j+1)}
		for i := range w.Grid {
			row = append(row, significant(w.Grid[i][j], 4))
		}
		t.Add(row...)
	}
	p.Table(t)
}

// windowJSON is the form that other programs read.
type windowJSON struct {
	Format     int                           `json:"format"`
	Energy     float64                       `json:"energy"`
	MeanH2     map[string]float64            `json:"mean_h2"`
	GridH2     map[string][][]float64        `json:"grid_h2,omitempty"`
	Inductance *float64                      `json:"inductance_per_turn2,omitempty"`
	RacOverRdc map[string]map[string]float64 `json:"rac_over_rdc,omitempty"`
	Loss       map[string]map[string]float64 `json:"loss,omitempty"`
	GapShares  []float64                     `json:"gap_ampere_turns,omitempty"`
	CoreShare  *float64                      `json:"core_ampere_turns,omitempty"`
	Methods    []string                      `json:"methods,omitempty"`
}

// WindowJSON writes the field of a winding window for programs, in SI.
func WindowJSON(w io.Writer, r *window.Result) error {
	j := windowJSON{Format: 1, Energy: r.Energy, MeanH2: map[string]float64{}, GapShares: r.GapDrops, Methods: r.Methods}
	if r.Inductance > 0 {
		j.Inductance = &r.Inductance
	}
	if r.File.Window.UngappedInductance > 0 {
		j.CoreShare = &r.CoreDrop
	}
	for i := range r.Windings {
		v := &r.Windings[i]
		j.MeanH2[v.Name] = v.MeanH2
		if v.Grid != nil {
			if j.GridH2 == nil {
				j.GridH2 = map[string][][]float64{}
			}
			j.GridH2[v.Name] = v.Grid
		}
		byFrequency := func(into *map[string]map[string]float64, list []float64) {
			if len(list) == 0 {
				return
			}
			if *into == nil {
				*into = map[string]map[string]float64{}
			}
			m := map[string]float64{}
			for k, f := range r.File.Frequencies {
				m[window.Hertz(f)] = list[k]
			}
			(*into)[v.Name] = m
		}
		byFrequency(&j.RacOverRdc, v.Ratio)
		byFrequency(&j.Loss, v.Loss)
	}
	return JSON(w, j)
}
