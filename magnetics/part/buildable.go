package part

import (
	"fmt"
	"math"

	"gapwright/corelib/wire"
	"gapwright/magnetics/winding"
)

// Buildable returns what would make a shop call back, each with the fix: what
// does not fit, bends too sharply, or takes more wires than a terminal has
// pins. bend is the smallest corner radius in wire diameters, height the least
// height left (m), films the stock in m.
func Buildable(c Construction, r Rating, bend, height float64, films []float64) []Warning {
	var out []Warning
	add := func(code, format string, args ...any) {
		out = append(out, Warning{code, fmt.Sprintf(format, args...)})
	}
	for _, m := range r.Section.Misfits {
		name := fmt.Sprintf("entry %d", m.Entry+1)
		if m.Entry < len(c.Build) && len(c.Build[m.Entry].Names) > 0 {
			name = c.Build[m.Entry].Names[0]
		}
		add("W401", "%s, %s needs %.2f mm and has %.2f mm: one layer more, or a thinner wire", name, m.What, m.Value*1e3, m.Room*1e3)
	}
	if left := r.Section.HeightLeft; left < height {
		add("W401", "height left %.2f mm, wanted %.2f mm: thinner wire or one tape layer less", left*1e3, height*1e3)
	}
	terminals := map[string]Winding{}
	for _, w := range c.Windings {
		terminals[w.Name] = w
	}
	// The post's corner is what a wire bends around; a round post is its own
	// corner. The former's wall adds to either.
	corner := c.Former.Wall
	if corner == 0 {
		corner = r.Former.WallOffset
	}
	if r.Shape.PostRound() {
		corner += r.Shape.F.Mean() / 2
	}
	for _, e := range c.Build {
		if e.Kind != winding.Wind {
			continue
		}
		// Litz is limp enough for the rounded corner of a former.
		sharp := e.Wire.Kind == wire.Solid || e.Wire.Kind == wire.Litz && r.Shape.PostRound()
		if od := e.Wire.OuterDiameter(); sharp && bend > 0 && corner < bend*od {
			add("W403", "%s: a wire of %.2f mm bends around a corner of %.1f mm, less than %.0f diameters: thinner wires in parallel", e.Names[0], od*1e3, corner*1e3, bend)
		}
		for _, of := range e.Of {
			w := terminals[of]
			for _, end := range [][]string{w.Start, w.Finish} {
				if n := len(end); n > 1 && max(e.Parallel, 1) == 1 && e.Wire.Kind == wire.Solid {
					add("W404", "%s: one solid wire on %d pins: wind %d in hand, or bridge the pins", of, n, n)
					break
				}
			}
		}
	}
	if g := c.Core.Gap; g.Kind == Spacer && len(films) > 0 {
		sum := 0.0
		for _, f := range g.Foils {
			sum += f
			stock := false
			for _, s := range films {
				stock = stock || math.Abs(s-f) < 1e-7
			}
			if !stock {
				add("W303", "film of %.3f mm is not among the stock: take the nearest and correct by the readings", f*1e3)
			}
		}
		if math.Abs(sum-g.Thickness) > 1e-6 {
			add("W303", "the films add up to %.3f mm, the gap is %.3f mm", sum*1e3, g.Thickness*1e3)
		}
	}
	return out
}
