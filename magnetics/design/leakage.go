package design

import (
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
	halves := []string{"S"}
	if p.Centertap {
		halves = []string{"S-A", "S-B"}
	}
	for _, half := range halves {
		// Turns of primary and half that are still outside.
		a, b := float64(p.Np), float64(p.Ns)
		add := func(height, a1, b1 float64) {
			ps += scale * height * (a*b + a1*b1 + (a*b1+a1*b)/2) / 3
			ss += scale * height * (b*b + b1*b1 + b*b1) / 3
			pp += scale * height * (a*a + a1*a1 + a*a1) / 3
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
	}
	n := float64(len(halves))
	return pp / n, ps / n, ss / n
}

// ratioFor returns the effective turns ratio of a transformer with the window
// energies of windowEnergy whose gap gives it the magnetizing inductance lm.
func ratioFor(p plan, lm, ps, ss float64) float64 {
	np, ns := float64(p.Np), float64(p.Ns)
	core := lm / (np * np) // H per turn squared through the post
	m, ls := 0.0, 0.0
	for range 3 {
		m, ls = np*ns*core+ps, ns*ns*core+ss
		core *= lm / (m * m / ls)
	}
	return m / ls
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
