package gap

import (
	"errors"
	"fmt"
	"math"

	"gapwright/corelib/quantity"
	"gapwright/corelib/root"
	"gapwright/magnetics/field"
)

// Edges of a rectangular post, in the planar solution of its window: the open
// faces count for this part of the window faces, and each corner for a quarter
// of a circle of this many window depths.
//
// From the project's own three-dimensional finite-volume runs with a thin
// winding on five cores at gaps of 0.5, 1 and 2 mm: 0.90..1.03 on E and EFD shapes,
// total within about 1.5 %; planar E needs 0.6..0.8. Less proven than round posts.
const (
	openFaces    = 0.95
	cornerRadius = 0.15
)

// A Post is the leg that carries the winding: round, or rectangular.
type Post struct {
	Radius float64 // m; above zero: round
	Width  float64 // m, between the two windows
	Depth  float64 // m, of the faces that look into the windows
}

// Round reports whether the post is round.
func (p Post) Round() bool { return p.Radius > 0 }

// Area returns the section of the post, m2.
func (p Post) Area() float64 {
	if p.Round() {
		return math.Pi * p.Radius * p.Radius
	}
	return p.Width * p.Depth
}

// Edge returns the length of window face that the edges of a gap in a
// rectangular post count for, m, in a window of the given depth.
func (p Post) Edge(windowDepth float64) float64 {
	return 2*p.Depth + openFaces*2*p.Width + 2*math.Pi*cornerRadius*windowDepth
}

// An Assembly is a wound core whose gap is to be found from the field in its
// window. Its methods solve with memory that they keep, so it is not safe for
// concurrent use.
type Assembly struct {
	Post
	Breadth, WindowDepth float64 // m, of the winding window
	CorePermeance        float64 // H per turn squared, of the closed core: mu0 mu Ae/le
	Winding              []field.Rect
	Pieces               int  // of the gap in the post, centers at (i + 1/2)/Pieces of the breadth; 0 counts as 1
	Spacer               bool // one gap of the stated length in every leg instead
	Modes                int  // 0: as many as the window needs

	solver  field.Solver
	problem field.Problem
}

// CorePermeance returns mu0 mu Ae/le, H per turn squared.
func CorePermeance(mu, ae, le float64) float64 { return quantity.Mu0 * mu * ae / le }

// Proven reports whether the inductance rests on finite-element cases (round
// posts: within 0.6 % for gaps in the post, 4 % low for a spacer) or on the rule
// for rectangular posts, about 1.5 %.
func (a *Assembly) Proven() bool { return a.Round() }

// Inductance returns the inductance per turn squared, H, with a gap of the given
// length in the post, sum of its pieces; with a spacer, of one stack. The turns
// are spread over the winding rectangles by area.
func (a *Assembly) Inductance(length float64) (float64, error) {
	l, err := a.inductance(length)
	if err != nil {
		return 0, fmt.Errorf("inductance with a gap of %g m: %w", length, err)
	}
	return l, nil
}

func (a *Assembly) inductance(length float64) (float64, error) {
	if len(a.Winding) == 0 {
		return 0, errors.New("no winding in the window")
	}
	if !(a.CorePermeance > 0) || !(length >= 0) || !(a.Area() > 0) || a.Pieces < 0 {
		return 0, fmt.Errorf("core permeance %g H, post area %g m2, %d pieces: must be above zero", a.CorePermeance, a.Area(), a.Pieces)
	}
	p := &a.problem
	p.Breadth, p.Depth, p.Units, p.Modes = a.Breadth, a.WindowDepth, 1, a.Modes
	scale := 1.0
	if a.Round() {
		p.PostRadius, p.CorePermeance = a.Radius, a.CorePermeance
	} else {
		// Area and core per metre of edge, so that the planar solution times the
		// edge is the whole.
		scale = a.Edge(a.WindowDepth)
		p.PostRadius, p.PostHalfWidth = 0, a.Area()/scale
		p.CorePermeance = 2 * a.CorePermeance / scale
	}
	p.Gaps, p.OuterGaps = p.Gaps[:0], p.OuterGaps[:0]
	if length > 0 {
		n := max(a.Pieces, 1)
		if a.Spacer {
			n = 1
		}
		for i := range n {
			p.Gaps = append(p.Gaps, field.Gap{Center: (float64(i) + 0.5) / float64(n) * a.Breadth, Length: length / float64(n)})
		}
		if a.Spacer {
			p.OuterGaps = append(p.OuterGaps, p.Gaps[0])
		}
	}
	area := 0.0
	for _, r := range a.Winding {
		area += (r.X1 - r.X0) * (r.Y1 - r.Y0)
	}
	p.Sources = p.Sources[:0]
	for _, r := range a.Winding {
		p.Sources = append(p.Sources, field.Source{Rect: r, AmpereTurns: (r.X1 - r.X0) * (r.Y1 - r.Y0) / area})
	}
	if err := a.solver.Solve(p); err != nil {
		return 0, err
	}
	return scale * a.solver.Inductance(0, 0), nil
}

// Length returns the gap with which n turns have inductance L, H, to 1e-6 of its
// length. It lies between 0.1 um and a third of the window breadth; an error
// that wraps ErrNoGap names the inductances at both ends.
func (a *Assembly) Length(L, n float64) (float64, error) {
	if !(L > 0) || !(n > 0) {
		return 0, fmt.Errorf("gap for %g H with %g turns: both must be positive", L, n)
	}
	want := L / (n * n)
	low, high := 1e-7, a.Breadth/3
	most, err := a.Inductance(low)
	if err != nil {
		return 0, err
	}
	least, err := a.Inductance(high)
	if err != nil {
		return 0, err
	}
	if want > most || want < least {
		return 0, fmt.Errorf("%g H with %g turns: the core has %.4g H with a gap of 0.1 um and %.4g H with one of a third of the window breadth (%.4g m): %w",
			L, n, most*n*n, least*n*n, high, ErrNoGap)
	}
	// In the logarithm of the length the search reaches a relative tolerance.
	r, err := root.Find(func(x float64) float64 {
		l, e := a.inductance(math.Exp(x))
		if e != nil {
			return math.NaN() // Find stops and says so
		}
		return want/l - 1
	}, math.Log(low), math.Log(high), 1e-6)
	if err != nil {
		return 0, fmt.Errorf("gap for %g H with %g turns: %w", L, n, err)
	}
	return math.Exp(r.X), nil
}

// Sensitivity returns (dL/dg)/L at the given gap, 1/m; it is negative. Times 1e-5
// it is the relative change per 10 um.
func (a *Assembly) Sensitivity(length float64) (float64, error) {
	if !(length > 0) {
		return 0, fmt.Errorf("sensitivity at a gap of %g m: must be above zero", length)
	}
	const step = 0.01
	high, err := a.Inductance(length * (1 + step))
	if err != nil {
		return 0, err
	}
	low, err := a.Inductance(length * (1 - step))
	if err != nil {
		return 0, err
	}
	return math.Log(high/low) / (2 * step * length), nil
}
