package design

import (
	"gapwright/magnetics/field"
	"gapwright/magnetics/part"
)

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
