package acloss

import "gapwright/magnetics/field"

// Square returns the square of equal area that stands for the wire in a field
// problem.
func (w Wire) Square() field.Rect {
	half := EquivalentSquare(w.Diameter) / 2
	return field.Rect{X0: w.X - half, X1: w.X + half, Y0: w.Y - half, Y1: w.Y + half}
}

// Source returns the wire as a source of its unit solution, marked Wire; an idle
// wire is none.
func (w Wire) Source() (s field.Source, ok bool) {
	if w.Unit < 0 || w.Current == 0 {
		return field.Source{}, false
	}
	return field.Source{Rect: w.Square(), Unit: w.Unit, AmpereTurns: w.Current, Wire: true}, true
}

// AppendLayer appends n wires side by side in the rectangle of a layer: evenly
// over its breadth, in the middle of its height. like holds what they have in
// common; with several units the wires take turns, as those of windings wound
// together do.
func AppendLayer(wires []Wire, r field.Rect, n int, like Wire, units ...int) []Wire {
	for i := range n {
		w := like
		w.X, w.Y = (r.X0+r.X1)/2, r.Y0+(float64(i)+0.5)/float64(n)*(r.Y1-r.Y0)
		if len(units) > 0 {
			w.Unit = units[i%len(units)]
		}
		wires = append(wires, w)
	}
	return wires
}
