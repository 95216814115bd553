package field

import "gapwright/corelib/quantity"

// A Section1D is one step of the one-dimensional leakage formula: a winding
// section, or a space, counted across the window.
type Section1D struct {
	Height      float64 // m, across the window
	AmpereTurns float64 // peak, of this section; 0: a space
}

// Leakage1D returns the field energy per metre of turn length, J/m, of sections
// listed from the post outwards, with the field along the layers only and
// spread over the given breadth:
//
//	W = mu0/(2 b) sum h (F0^2 + F0 F1 + F1^2)/3
//
// F0 and F1 are the ampere-turns enclosed at the two faces of a section. Twice
// this energy times the mean length of turn is the short-circuit inductance
// per squared current. It is the usual mu0 N^2 MLT/b (sum h/3 + spaces): a hand
// check, wrong by -45..+50 % where breadths are unequal or sections lie side by
// side. It panics if breadth is not positive.
func Leakage1D(breadth float64, sections []Section1D) float64 {
	if !(breadth > 0) {
		panic("field: one-dimensional leakage needs a breadth above zero")
	}
	sum, inner := 0.0, 0.0
	for _, s := range sections {
		outer := inner + s.AmpereTurns
		sum += s.Height * (inner*inner + inner*outer + outer*outer) / 3
		inner = outer
	}
	return quantity.Mu0 / (2 * breadth) * sum
}
