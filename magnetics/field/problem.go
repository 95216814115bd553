package field

import (
	"errors"
	"fmt"
	"math"
)

// A Rect is a rectangle in the window, m: x from the face of the post, y along
// the breadth.
type Rect struct{ X0, X1, Y0, Y1 float64 }

// A Source is a rectangle that carries current with uniform density in one unit
// solution.
type Source struct {
	Rect
	Unit        int     // index of the unit solution
	AmpereTurns float64 // through the rectangle, per ampere of the unit
	Wire        bool    // stands for a single round wire; see Solver.Background
}

// A Gap is a gap in a leg, seen from the window.
type Gap struct {
	Center float64 // m, along the breadth
	Length float64 // m
}

// A Problem is a winding window with its currents and gaps.
type Problem struct {
	Breadth    float64 // m, along y
	Depth      float64 // m, along x
	PostRadius float64 // m; 0: planar window

	// PostHalfWidth is the ferrite behind the face of a planar post, m, that is
	// the area of a gap per metre of depth and window. The outer leg has the
	// same. A round post takes its radius.
	PostHalfWidth float64

	Gaps      []Gap // in the post
	OuterGaps []Gap // in the outer leg, which has the area of the post

	// CorePermeance is the inductance per turn squared of the closed core alone,
	// H; planar: of the full section with both windows, H per metre of depth.
	// 0: the ferrite is infinitely permeable.
	CorePermeance float64

	Units   int
	Sources []Source

	// Modes is the number of terms of the series; 0 lets ModesFor choose.
	Modes int
}

// ErrUnbalanced says that ampere-turns are left over and nothing takes them.
var ErrUnbalanced = errors.New("net ampere-turns need a gap or a core of finite permeability")

// planar reports whether there is no post radius.
func (p *Problem) planar() bool { return p.PostRadius == 0 }

// Check returns an error that names the first thing that makes no sense.
func (p *Problem) Check() error {
	for _, v := range []struct {
		name  string
		value float64
	}{{"breadth", p.Breadth}, {"depth", p.Depth}} {
		if !(v.value > 0) || math.IsInf(v.value, 1) {
			return fmt.Errorf("window %s %g m: must be above zero", v.name, v.value)
		}
	}
	if !(p.PostRadius >= 0) || math.IsInf(p.PostRadius, 1) {
		return fmt.Errorf("post radius %g m: must not be negative", p.PostRadius)
	}
	if !(p.CorePermeance >= 0) || math.IsInf(p.CorePermeance, 1) {
		return fmt.Errorf("core permeance %g H: must not be negative", p.CorePermeance)
	}
	if p.Modes < 0 || p.Units < 1 {
		return fmt.Errorf("%d modes, %d unit solutions", p.Modes, p.Units)
	}
	if len(p.Gaps)+len(p.OuterGaps) > 0 && p.planar() && !(p.PostHalfWidth > 0) {
		return errors.New("a planar window with gaps needs the half width of the post")
	}
	if err := checkGaps("post", p.Gaps, p.Breadth); err != nil {
		return err
	}
	if err := checkGaps("outer leg", p.OuterGaps, p.Breadth); err != nil {
		return err
	}
	if err := checkSources(p.Sources, p.Units, p.Depth, p.Breadth); err != nil {
		return err
	}
	if len(p.Gaps)+len(p.OuterGaps) > 0 || p.CorePermeance > 0 {
		return nil
	}
	for u := range p.Units {
		net, size := 0.0, 0.0
		for _, s := range p.Sources {
			if s.Unit == u {
				net += s.AmpereTurns
				size += math.Abs(s.AmpereTurns)
			}
		}
		if math.Abs(net) > 1e-9*size {
			return fmt.Errorf("unit solution %d has %g ampere-turns left over: %w", u, net, ErrUnbalanced)
		}
	}
	return nil
}

func checkGaps(leg string, gaps []Gap, breadth float64) error {
	for i, g := range gaps {
		low, high := g.Center-g.Length/2, g.Center+g.Length/2
		if !(g.Length > 0) || !(low >= -1e-9*breadth) || !(high <= breadth*(1+1e-9)) {
			return fmt.Errorf("gap %d in the %s, %g .. %g m, is not inside the window breadth of %g m", i+1, leg, low, high, breadth)
		}
		for j, o := range gaps[:i] {
			if math.Abs(g.Center-o.Center) < (g.Length+o.Length)/2*(1-1e-9) {
				return fmt.Errorf("gaps %d and %d in the %s overlap", j+1, i+1, leg)
			}
		}
	}
	return nil
}

func checkSources(sources []Source, units int, depth, breadth float64) error {
	for i, s := range sources {
		if s.Unit < 0 || s.Unit >= units {
			return fmt.Errorf("rectangle %d belongs to unit solution %d of %d", i+1, s.Unit, units)
		}
		if !(s.X1 > s.X0) || !(s.Y1 > s.Y0) || math.IsNaN(s.AmpereTurns) || math.IsInf(s.AmpereTurns, 0) {
			return fmt.Errorf("rectangle %d, x %g .. %g m, y %g .. %g m, %g ampere-turns: no area or no number", i+1, s.X0, s.X1, s.Y0, s.Y1, s.AmpereTurns)
		}
		const slack = 1e-9
		if s.X0 < -slack*depth || s.X1 > depth*(1+slack) || s.Y0 < -slack*breadth || s.Y1 > breadth*(1+slack) {
			return fmt.Errorf("rectangle %d, x %g .. %g m, y %g .. %g m, is not inside the window of %g x %g m", i+1, s.X0, s.X1, s.Y0, s.Y1, depth, breadth)
		}
	}
	return nil
}

// ModesFor returns the number of modes that the window needs: at least 64, and
// 2 h/s when copper stands a distance s from a wall with a gap, up to 384.
//
// Below 1.5 h/s the field of the copper next to the mouth loses whole percents.
func ModesFor(p *Problem) int {
	if p.Modes > 0 {
		return p.Modes
	}
	near := math.Inf(1)
	for _, s := range p.Sources {
		if len(p.Gaps) > 0 {
			near = min(near, s.X0)
		}
		if len(p.OuterGaps) > 0 {
			near = min(near, p.Depth-s.X1)
		}
	}
	if math.IsInf(near, 1) {
		return 64
	}
	near = max(near, 1e-6*p.Breadth)
	return int(min(max(64, math.Ceil(2*p.Breadth/near)), 384))
}
