package tank

import "math"

// firstZero returns the first u in [0, 1] at which the polynomial c, taken
// without its factor u^touch, falls below zero. A quantity that starts at zero
// and rises (touch 1: with a slope, touch 2: with a curvature only) is thus no
// event at its start, without any tolerance.
//
// Steps are short against every period of the circuit, so the polynomial has at
// most one turning point inside; a dip below zero between two positive ends is
// found at that point.
func firstZero(c *[degree + 1]float64, touch int) (u float64, found bool) {
	rest := 0.0
	for k := touch + 1; k <= degree; k++ {
		rest += math.Abs(c[k])
	}
	start := c[touch]
	if start >= rest {
		return 0, false
	}
	if start < 0 {
		return 0, true
	}
	end, slopeEnd := deflated(c, touch, 1)
	if end < 0 {
		return cross(c, touch, 0, 1), true
	}
	if c[touch+1] >= 0 || slopeEnd <= 0 {
		return 0, false
	}
	// Falling first and rising last: look at the lowest point.
	lo, hi := 0.0, 1.0
	for range 60 {
		u = (lo + hi) / 2
		f, d := deflated(c, touch, u)
		if f < 0 {
			return cross(c, touch, 0, u), true
		}
		if d < 0 {
			lo = u
		} else {
			hi = u
		}
		if hi-lo < 1e-12 {
			break
		}
	}
	return 0, false
}

// deflated returns c(u)/u^touch and its derivative.
func deflated(c *[degree + 1]float64, touch int, u float64) (f, d float64) {
	f = c[degree]
	for k := degree - 1; k >= touch; k-- {
		d = d*u + f
		f = f*u + c[k]
	}
	return f, d
}

// cross returns the zero between lo, where the polynomial is not negative, and
// hi, where it is: Newton's method inside a shrinking bracket.
func cross(c *[degree + 1]float64, touch int, lo, hi float64) float64 {
	f, d := deflated(c, touch, lo)
	u := lo
	for range 80 {
		next := u - f/d
		if !(next > lo && next < hi) {
			next = (lo + hi) / 2
		}
		if math.Abs(next-u) < 1e-16 || next == lo || next == hi {
			return next
		}
		u = next
		f, d = deflated(c, touch, u)
		switch {
		case f == 0:
			return u
		case f > 0:
			lo = u
		default:
			hi = u
		}
	}
	return u
}
