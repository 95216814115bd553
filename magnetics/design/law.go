package design

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/interp"

	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
)

// A GapLaw is the open inductance of a part, in H at the test temperature, for
// a ground gap (m, total) together with a film under all legs (m), from the
// field solution that rates the part. It falls with both. Outside the lengths
// that it was made for it is an error.
type GapLaw func(ground, film float64) (float64, error)

// lawPoints is how many gaps the field is solved for; between them 1/L is
// interpolated. 1/L bends most near the closed gap, where the points are dense.
const lawPoints = 14

// NewGapLaw tabulates the inductance of job.Transformer or job.Inductor, built
// as c, up to reach (m) of gap.
//
// A film under all legs on top of a ground gap g adds its thickness t to the gap
// of the post and opens the outer legs by t. The outer legs' share is what the
// film alone has more than a post gap of the same length:
//
//	1/L(g, t) = 1/Lground(g + t) + 1/Lfilm(t) - 1/Lground(t)
//
// which is exact as long as the gaps of post and legs do not see each other.
func NewGapLaw(j job.Job, name string, c part.Construction, reach float64, tables Tables) (GapLaw, error) {
	s, err := newSearch(j, tables)
	if err != nil {
		return nil, err
	}
	limits := s.transformerLimits
	if name == job.Inductor {
		limits = s.inductorLimits
	}
	cond := s.conditions(limits, false)
	coil, err := part.NewCoil(c, cond)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	var solvers part.Solvers
	solve := func(g part.Gap) (float64, error) {
		l, err := coil.Inductances(&solvers, g, cond.TestTemp, cond.Modes)
		if err != nil {
			return 0, fmt.Errorf("%s: %w", name, err)
		}
		if !(l[0][0] > 0) || math.IsInf(l[0][0], 0) {
			return 0, fmt.Errorf("%s: inductance %g H at a gap of %g m", name, l[0][0], g.Total+g.Thickness)
		}
		return 1 / l[0][0], nil
	}
	pieces := max(c.Core.Gap.Pieces, 1)
	ground := func(x float64) part.Gap {
		return part.Gap{Kind: part.Ground, Total: x, Pieces: pieces, Positions: c.Core.Gap.Positions}
	}
	film := func(x float64) part.Gap { return part.Gap{Kind: part.Spacer, Thickness: x, Total: 2 * x, Pieces: 1} }
	closed, err := solve(part.Gap{Kind: part.Closed})
	if err != nil {
		return nil, err
	}
	table := func(gap func(float64) part.Gap) (*interp.FritschButland, error) {
		x, y := []float64{0}, []float64{closed}
		for i := 1; i <= lawPoints; i++ {
			u := float64(i) / lawPoints
			length := reach * u * u
			v, err := solve(gap(length))
			if err != nil {
				return nil, err
			}
			x, y = append(x, length), append(y, v)
		}
		var f interp.FritschButland
		if err := f.Fit(x, y); err != nil {
			return nil, fmt.Errorf("%s: inductance over gap: %w", name, err)
		}
		return &f, nil
	}
	byGround, err := table(ground)
	if err != nil {
		return nil, err
	}
	byFilm, err := table(film)
	if err != nil {
		return nil, err
	}
	return func(g, t float64) (float64, error) {
		if !(g >= 0) || !(t >= 0) || g+t > reach {
			return 0, fmt.Errorf("a gap of %.3f mm with %.3f mm of film lies outside of 0 to %.3f mm", g*1e3, t*1e3, reach*1e3)
		}
		return 1 / (byGround.Predict(g+t) + byFilm.Predict(t) - byGround.Predict(t)), nil
	}, nil
}
