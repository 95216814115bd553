package design

import (
	"math"

	"gapwright/corelib/quantity"
	"gapwright/magnetics/field"
	"gapwright/magnetics/part"
)

// windowEnergy is the one-dimensional field of a plan in its window as an
// inductance matrix, H: primary-primary, primary-secondary and
// secondary-secondary, the last two as means of the halves. The post's gap takes
// what ampere-turns are left over, so the field of a winding alone is its own
// turns over the breadth at the post and falls to zero outside of it: a winding
// near the post and one far from it do not have the same inductance per turn
// squared. heights are those of all sections of a side together.
func windowEnergy(p plan, stretches []stretch, hp, hs, barrier, interlayer float64) (pp, ps, ss float64) {
	halves := halvesOf(p)
	for _, half := range halves {
		x := halfEnergy(p, stretches, half, hp, hs, barrier, interlayer)
		pp, ps, ss = pp+x[0], ps+x[1], ss+x[2]
	}
	n := float64(len(halves))
	return pp / n, ps / n, ss / n
}

// halvesOf names the secondary windings.
func halvesOf(p plan) []string {
	if p.Centertap {
		return []string{"S-A", "S-B"}
	}
	return []string{"S"}
}

// halfEnergy is windowEnergy with one secondary winding.
func halfEnergy(p plan, stretches []stretch, half string, hp, hs, barrier, interlayer float64) [3]float64 {
	var primaries, secondaries float64
	for i := range stretches {
		if stretches[i].primary {
			primaries++
		} else {
			secondaries++
		}
	}
	breadth := p.Shape.WindowBreadth()
	scale := quantity.Mu0 * p.Former.MLT / breadth
	var x [3]float64
	// Turns of primary and half that are still outside.
	a, b := float64(p.Np), float64(p.Ns)
	add := func(height, a1, b1 float64) {
		x[0] += scale * height * (a*a + a1*a1 + a*a1) / 3
		x[1] += scale * height * (a*b + a1*b1 + (a*b1+a1*b)/2) / 3
		x[2] += scale * height * (b*b + b1*b1 + b*b1) / 3
		a, b = a1, b1
	}
	add(p.Former.WallOffset, a, b)
	for i := range stretches {
		st := &stretches[i]
		if i > 0 {
			between := interlayer
			if stretches[i-1].primary != st.primary {
				between = barrier
			}
			add(between, a, b)
		}
		height := hs / secondaries
		if st.primary {
			height = hp / primaries
		}
		a1, b1 := a, b
		for _, of := range st.of {
			switch of {
			case "P":
				a1 -= float64(st.turns)
			case half:
				b1 -= float64(st.turns)
			}
		}
		add(height, a1, b1)
	}
	return x
}

// A coupling is what the screening knows of a plan's inductances: the window
// energies are linear in the heights of both sides and in the free distance.
type coupling struct {
	p                 plan
	lm, stray         float64
	base, perP, perS  [3]float64 // of windowEnergy; per metre
	perX              [3]float64
	crossings         float64 // places that have the free distance
	halves            [2]struct{ base, perP, perS, perX [3]float64 }
	tilt              float64 // how much more of the field lies inside of the secondary than outside, squared, of 1
	ungapped, sideBys bool
}

func (s *search) coupling(p plan, stretches []stretch, lm float64) coupling {
	c := coupling{p: p, lm: lm, stray: s.job.Tank.StrayInductance, ungapped: s.job.Tank.Lm == 0, sideBys: p.Arrangement == "sections"}
	if c.sideBys {
		return c
	}
	in := s.transformerLimits.Insulation
	barrier := float64(p.Build.BarrierLayers) * in.Tape
	if in.Screen == "one" {
		barrier = 2*barrier + screenThickness
	}
	interlayer := float64(in.InterlayerLayers) * in.Tape
	slopes := func(energy func(hp, hs, extra float64) [3]float64) (base, perP, perS, perX [3]float64) {
		base, perP, perS, perX = energy(0, 0, 0), energy(unit, 0, 0), energy(0, unit, 0), energy(0, 0, unit)
		for i := range base {
			perP[i] = (perP[i] - base[i]) / unit
			perS[i] = (perS[i] - base[i]) / unit
			perX[i] = (perX[i] - base[i]) / unit
		}
		return base, perP, perS, perX
	}
	c.base, c.perP, c.perS, c.perX = slopes(func(hp, hs, extra float64) [3]float64 {
		pp, ps, ss := windowEnergy(p, stretches, hp, hs, barrier+extra, interlayer)
		return [3]float64{pp, ps, ss}
	})
	if p.Centertap {
		for k, half := range halvesOf(p) {
			h := &c.halves[k]
			h.base, h.perP, h.perS, h.perX = slopes(func(hp, hs, extra float64) [3]float64 {
				return halfEnergy(p, stretches, half, hp, hs, barrier+extra, interlayer)
			})
		}
	}
	inside := 0.0 // share of the primary inside of what was passed
	for i := range stretches {
		turns := float64(stretches[i].turns)
		if stretches[i].primary {
			inside += turns / float64(p.Np)
			continue
		}
		before := inside
		inside -= turns / float64(p.Ns) * float64(len(stretches[i].of)) / float64(len(halvesOf(p)))
		c.tilt += before*before - inside*inside
	}
	for i := 1; i < len(stretches); i++ {
		if stretches[i].primary != stretches[i-1].primary {
			c.crossings++
		}
	}
	return c
}

// at returns the effective turns ratio and what the transformer adds to the
// resonant inductance, H, with windings of heights hp and hs (m) and a free
// distance between them. The gap gives the wanted magnetizing inductance.
func (c *coupling) at(hp, hs, extra float64) (ratio, leak float64) {
	np, ns := float64(c.p.Np), float64(c.p.Ns)
	if c.sideBys {
		// Side by side and with the gap between them the windings are alike.
		leak := sideBySideLeak(c.p)
		ls := (c.lm + leak) * ns * ns / (np * np)
		m := math.Sqrt(c.lm * ls)
		return m / (ls + c.stray), c.lm + leak - m*m/(ls+c.stray)
	}
	energy := func(i int) float64 { return c.base[i] + c.perP[i]*hp + c.perS[i]*hs + c.perX[i]*extra }
	pp, ps, ss := energy(0), energy(1), energy(2)
	core := c.lm / (np * np) // H per turn squared through the post
	m, ls := 0.0, 0.0
	for range 3 {
		m, ls = np*ns*core+ps, ns*ns*core+ss+c.stray
		if c.ungapped {
			break
		}
		core *= c.lm / (m * m / ls)
	}
	return m / ls, np*np*core + pp - m*m/ls
}

// leakageByHand is the one-dimensional short-circuit inductance of the first
// secondary, H: the usual mu0 N² MLT/b (sum h/3 + spaces) over the layers as
// they lie.
func (s *search) leakageByHand(t *part.Transformer, r *part.Rating) float64 {
	np, ns := float64(t.Windings[0].Turns), float64(t.Windings[1].Turns)
	shorted := t.Windings[1].Name
	var list []field.Section1D
	at := 0.0
	first, length, count := true, 0.0, 0.0
	breadth := 0.0
	for _, l := range r.Section.Layers {
		amps := 0.0
		for _, of := range l.Of {
			switch of {
			case "P":
				amps += float64(l.Turns)
			case shorted:
				amps -= float64(l.Turns) * np / ns
			}
		}
		if amps == 0 {
			continue
		}
		if !first && l.X0 > at {
			list = append(list, field.Section1D{Height: l.X0 - at})
		}
		first = false
		list = append(list, field.Section1D{Height: l.X1 - l.X0, AmpereTurns: amps})
		at = l.X1
		length += l.Length
		count++
		if b := l.Y1 - l.Y0; b > breadth {
			breadth = b
		}
	}
	if count == 0 || breadth == 0 {
		return 0
	}
	if r.Arrangement == "sections" {
		// Side by side: the field runs across the window, the breadth of each
		// chamber is its height.
		return s.sideBySide(t, r, shorted)
	}
	return 2 * field.Leakage1D(breadth, list) * length / count
}

// sideBySide is the same with the roles of height and breadth exchanged.
func (s *search) sideBySide(t *part.Transformer, r *part.Rating, shorted string) float64 {
	np := float64(t.Windings[0].Turns)
	var y [2][2]float64
	var found [2]bool
	length, count := 0.0, 0.0
	for _, l := range r.Section.Layers {
		for _, of := range l.Of {
			k := -1
			switch of {
			case "P":
				k = 0
			case shorted:
				k = 1
			}
			if k < 0 {
				continue
			}
			if !found[k] {
				y[k], found[k] = [2]float64{l.Y0, l.Y1}, true
			}
			length += l.Length
			count++
		}
	}
	if !found[0] || !found[1] {
		return 0
	}
	list := []field.Section1D{
		{Height: y[0][1] - y[0][0], AmpereTurns: np},
		{Height: y[1][0] - y[0][1]},
		{Height: y[1][1] - y[1][0], AmpereTurns: -np},
	}
	return 2 * field.Leakage1D(r.Shape.WindowDepth(), list) * length / count
}

// mismatch estimates by how much the short-circuit inductances of the halves of
// a center tap differ, over their mean. Foils of halves wound together lie one
// pitch (m) apart throughout; litz and wires lie alike.
func (c *coupling) mismatch(hp, hs, extra, pitch float64) float64 {
	if !c.p.Centertap || c.sideBys {
		return 0
	}
	np := float64(c.p.Np)
	ns := float64(c.p.Ns)
	core := c.lm / (np * np)
	var leak [2]float64
	for k := range c.halves {
		h := &c.halves[k]
		energy := func(i int) float64 { return h.base[i] + h.perP[i]*hp + h.perS[i]*hs + h.perX[i]*extra }
		m, ls := np*ns*core+energy(1), ns*ns*core+energy(2)
		leak[k] = np*np*core + energy(0) - m*m/ls
	}
	mean := (leak[0] + leak[1]) / 2
	if c.p.Bifilar {
		return math.Abs(c.tilt) * quantity.Mu0 * c.p.Former.MLT / c.p.Shape.WindowBreadth() * np * np * pitch / mean
	}
	return math.Abs(leak[0]-leak[1]) / mean
}
