package tank

import (
	"fmt"
	"iter"
	"math"

	"gapwright/corelib/root"
)

// gridRatio is the greatest step of the frequency grid; 24 points then cover a
// range of 1 to 7.
const (
	gridRatio = 1.085
	gridSteps = 200 // at most
)

// point is one point of the curve.
type point struct {
	f, volts float64
	state    unknowns
}

func (s *curve) point(f float64) (point, error) {
	x, err := s.at(f)
	if err != nil {
		return point{}, err
	}
	return point{f, s.volts(x), x.y}, nil
}

// from makes the next solve start at p.
func (s *curve) from(p point) { s.near, s.known = p.state, true }

// search finds the frequency that gives the wanted output: the first upward
// crossing on the way down from frequency_max. With margin it also looks for the
// peak of the output over the whole range.
func (s *curve) search(o *Operation, margin bool) {
	want := o.Corner.OutputVoltage
	var grid []point
	found := -1 // the grid point that decides
	status := BelowRange
	var failed error
	for f := range s.frequencies() {
		p, err := s.point(f)
		if err != nil {
			failed = err
			continue
		}
		grid = append(grid, p)
		if found >= 0 {
			continue
		}
		// A change below this is no turn: it is in the noise of the solution.
		const noise = 1e-9
		k := len(grid) - 1
		switch {
		case k == 0 && p.volts > want*(1+noise):
			found, status = k, AboveRange
		case p.volts >= want:
			found, status = k, OK
		case k > 0 && p.volts < grid[k-1].volts*(1-noise):
			found, status = k, BeyondPeakGain
		}
		if found >= 0 && !margin {
			break
		}
	}
	if len(grid) == 0 {
		s.fail(o, s.tank.FrequencyMax, failed)
		return
	}
	if status == BeyondPeakGain {
		top := s.peak(grid, found-1)
		if top.volts < want {
			o.Status = BeyondPeakGain
			o.PeakOutputVoltage, o.FrequencyOfPeakGain, o.PeakGainMargin = top.volts, top.f, top.volts/want-1
			o.Reason = fmt.Sprintf("%s is beyond the peak of the output, %s at %s with the load of %s",
				volts(want), volts(top.volts), hertz(top.f), ohms(o.LoadResistance))
			return
		}
		// The crossing hides between two points of the grid.
		s.serve(o, grid[max(found-2, 0)], top)
	}
	switch first, last := grid[0], grid[len(grid)-1]; status {
	case OK:
		s.serve(o, grid[max(found-1, 0)], grid[found])
	case AboveRange:
		o.Status = AboveRange
		o.Reason = fmt.Sprintf("the output is %s at frequency_max, %s, and %s is wanted", volts(first.volts), hertz(first.f), volts(want))
	case BelowRange:
		o.Status = BelowRange
		o.Reason = fmt.Sprintf("the output is %s at frequency_min, %s, still rising, and %s is wanted", volts(last.volts), hertz(last.f), volts(want))
	}
	if o.Status == OK && margin {
		best := 0
		for k := range grid {
			if grid[k].volts > grid[best].volts {
				best = k
			}
		}
		peak := s.peak(grid, best)
		o.PeakOutputVoltage, o.FrequencyOfPeakGain = peak.volts, peak.f
		o.PeakGainMargin = peak.volts/want - 1
	}
}

// frequencies yields the grid from frequency_max down to frequency_min.
func (s *curve) frequencies() iter.Seq[float64] {
	top, bottom := s.tank.FrequencyMax, s.tank.FrequencyMin
	steps := int(math.Ceil(math.Min(math.Log(top/bottom)/math.Log(gridRatio), gridSteps)))
	return func(yield func(float64) bool) {
		for k := range steps {
			if !yield(top * math.Pow(bottom/top, float64(k)/float64(steps))) {
				return
			}
		}
		yield(bottom)
	}
}

// serve refines the crossing between a, below the wanted output, and b.
func (s *curve) serve(o *Operation, a, b point) {
	want := o.Corner.OutputVoltage
	lo, hi := math.Log(a.f), math.Log(b.f)
	s.from(b)
	var failed error
	f := b.f
	if a.f != b.f {
		r, err := root.Find(func(x float64) float64 {
			switch x {
			case lo:
				return a.volts/want - 1
			case hi:
				return b.volts/want - 1
			}
			p, err := s.point(math.Exp(x))
			if err != nil {
				failed = err
				return math.NaN()
			}
			return p.volts/want - 1
		}, lo, hi, 1e-11)
		if err != nil {
			if failed != nil {
				err = failed
			}
			s.fail(o, f, err)
			return
		}
		f = math.Exp(r.X)
	}
	s.given(o, f)
}

// peak returns the greatest output near the k-th point of the grid, which is the
// greatest of its neighbours: Brent's search of a maximum, golden section with
// parabolas.
func (s *curve) peak(grid []point, k int) point {
	best := grid[k]
	lo, hi := best.f, best.f
	if k > 0 {
		hi = grid[k-1].f
	}
	if k < len(grid)-1 {
		lo = grid[k+1].f
	}
	if lo == hi {
		return best
	}
	s.from(best)
	a, b := math.Log(lo), math.Log(hi)
	x, fx := math.Log(best.f), best.volts
	if k == 0 || k == len(grid)-1 {
		// The end of the range: is there a peak just inside?
		f := math.Exp((a + b) / 2)
		if p, err := s.point(f); err == nil && p.volts > fx {
			x, fx, best = math.Log(f), p.volts, p
		}
	}
	const golden = 0.3819660112501051 // (3 - sqrt 5)/2
	const tol = 1e-6
	w, v, fw, fv := x, x, fx, fx
	d, e := 0.0, 0.0
	for range 40 {
		mid := (a + b) / 2
		if math.Abs(x-mid) <= 2*tol-(b-a)/2 {
			break
		}
		parabola := false
		if math.Abs(e) > tol {
			r := (x - w) * (fv - fx)
			q := (x - v) * (fw - fx)
			p := (x-v)*q - (x-w)*r
			q = 2 * (q - r)
			if q > 0 {
				p = -p
			}
			q = math.Abs(q)
			if math.Abs(p) < math.Abs(q*e/2) && p > q*(a-x) && p < q*(b-x) {
				e, d = d, p/q
				parabola = true
				if u := x + d; u-a < 2*tol || b-u < 2*tol {
					d = math.Copysign(tol, mid-x)
				}
			}
		}
		if !parabola {
			if x < mid {
				e = b - x
			} else {
				e = a - x
			}
			d = golden * e
		}
		u := x + d
		if math.Abs(d) < tol {
			u = x + math.Copysign(tol, d)
		}
		p, err := s.point(math.Exp(u))
		if err != nil {
			break
		}
		fu := p.volts
		if fu >= fx {
			if u < x {
				b = x
			} else {
				a = x
			}
			v, w, x = w, x, u
			fv, fw, fx = fw, fx, fu
			best = p
			continue
		}
		if u < x {
			a = u
		} else {
			b = u
		}
		if fu >= fw || w == x {
			v, w = w, u
			fv, fw = fw, fu
		} else if fu >= fv || v == x || v == w {
			v, fv = u, fu
		}
	}
	return best
}
