package tank

import (
	"fmt"
	"math"

	"gapwright/corelib/root"
)

// gridRatio is the greatest step of the frequency grid; 24 points then cover a
// range of 1 to 7.
const (
	gridRatio  = 1.085
	gridPoints = 200 // at most
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
// crossing on the way down from frequency_max.
func (s *curve) search(o *Operation) {
	want := o.Corner.OutputVoltage
	grid, err := s.grid()
	if err != nil {
		s.fail(o, s.tank.FrequencyMax, err)
		return
	}
	best := 0
	for k := range grid {
		if grid[k].volts > grid[best].volts {
			best = k
		}
	}
	peak := s.peak(grid, best)
	o.PeakOutputVoltage, o.FrequencyOfPeakGain = peak.volts, peak.f
	o.PeakGainMargin = peak.volts/want - 1

	// A change below this is no turn: it is in the noise of the solution.
	const noise = 1e-9
	if grid[0].volts > want*(1+noise) {
		o.Status = AboveRange
		o.Reason = fmt.Sprintf("the output is %s at frequency_max, %s, and %s is wanted: less needs a higher frequency or pulse skipping",
			volts(grid[0].volts), hertz(grid[0].f), volts(want))
		return
	}
	for k := range grid {
		if grid[k].volts >= want {
			s.serve(o, grid[max(k-1, 0)], grid[k])
			return
		}
		if k > 0 && grid[k].volts < grid[k-1].volts*(1-noise) {
			top := s.peak(grid, k-1)
			if top.volts >= want {
				s.serve(o, grid[max(k-2, 0)], top)
				return
			}
			o.Status = BeyondPeakGain
			o.Reason = fmt.Sprintf("%s is beyond the peak of the output, %s at %s, with the load of %s",
				volts(want), volts(top.volts), hertz(top.f), ohms(o.LoadResistance))
			o.PeakOutputVoltage, o.FrequencyOfPeakGain, o.PeakGainMargin = top.volts, top.f, top.volts/want-1
			return
		}
	}
	last := grid[len(grid)-1]
	o.Status = BelowRange
	o.Reason = fmt.Sprintf("the output is %s at frequency_min, %s, still rising, and %s is wanted",
		volts(last.volts), hertz(last.f), volts(want))
}

// grid returns the curve from frequency_max down to frequency_min.
func (s *curve) grid() ([]point, error) {
	top, bottom := s.tank.FrequencyMax, s.tank.FrequencyMin
	n := 1 + int(math.Ceil(math.Min(math.Log(top/bottom)/math.Log(gridRatio), gridPoints-1)))
	list := make([]point, 0, n)
	var failed error
	for k := range n {
		f := top
		if n > 1 {
			f = top * math.Pow(bottom/top, float64(k)/float64(n-1))
		}
		if k == n-1 {
			f = bottom
		}
		p, err := s.point(f)
		if err != nil {
			failed = err
			continue
		}
		list = append(list, p)
	}
	if len(list) == 0 {
		return nil, failed
	}
	return list, nil
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
	keep := *o
	s.given(o, f)
	o.PeakOutputVoltage, o.FrequencyOfPeakGain, o.PeakGainMargin = keep.PeakOutputVoltage, keep.FrequencyOfPeakGain, keep.PeakGainMargin
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

func volts(v float64) string { return fmt.Sprintf("%.4g V", v) }

func ohms(r float64) string {
	switch {
	case r >= 1e3:
		return fmt.Sprintf("%.4g kohm", r/1e3)
	case r < 1:
		return fmt.Sprintf("%.4g mohm", r*1e3)
	}
	return fmt.Sprintf("%.4g ohm", r)
}
