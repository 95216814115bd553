package tank

import "math"

// circuit is the tank at one corner in normalised units: time sqrt(Lr Cr),
// voltage Vb, current Vb/Z0 with Z0 = sqrt(Lr/Cr). All numbers are then of order
// one, and Lr = Cr = 1.
type circuit struct {
	lambda float64 // Lr/Lm
	rp, rs float64 // resistances over Z0
	drop   float64 // E at zero output voltage
	load   float64 // kv ki n² R/Z0: E = drop + load * mean |i - m|
}

// mode says what the rectifier does: +1 and -1 conduct with the winding
// positive or negative, 0 is off.
type mode int8

const (
	backward mode = -1
	off      mode = 0
	forward  mode = +1
)

// state is i, v, m and the charge q = integral of |i - m|, in this order.
type state [4]float64

// An expansion is the Taylor series of the state over one step, in u = t/h from
// 0 to 1. It is the exact solution to rounding because steps are short.
type expansion struct {
	i, v, m, q [degree + 1]float64
}

// A stretch is one step of the recorded solution.
type stretch struct {
	mode     mode
	start, h float64
	expansion
}

// reach is how far a step goes, as the norm of the system matrix times the step:
// the first term left out is then below reach^17/17! = 6e-17 of the state.
const reach = 0.8

// inverse holds 1/(k+1).
var inverse = func() (r [degree]float64) {
	for k := range r {
		r[k] = 1 / float64(k+1)
	}
	return r
}()

// longest returns the longest step in a mode.
func (c *circuit) longest(md mode) float64 {
	if md == off {
		return reach / (1 + c.rp) // the norm falls with Lr/(Lr+Lm), the time of v does not
	}
	return reach / math.Max(1+c.rp+2*c.rs, 2*c.lambda*c.rs)
}

// expand fills s with the solution that starts at x and lasts h.
func (c *circuit) expand(md mode, bridge, e, h float64, x *state, s *expansion) {
	s.i[0], s.v[0], s.m[0], s.q[0] = x[0], x[1], x[2], x[3]
	i, v, m := x[0], x[1], x[2]
	if md == off {
		kappa := c.lambda / (1 + c.lambda)
		force := bridge
		for k := range degree {
			f := h * inverse[k]
			di := f * kappa * (force - v - c.rp*i)
			v = f * i
			i = di
			force = 0
			s.i[k+1], s.v[k+1], s.m[k+1], s.q[k+1] = i, v, i, 0
		}
		return
	}
	sign := float64(md)
	force, clamp := bridge-sign*e, sign*e
	for k := range degree {
		f := h * inverse[k]
		d := i - m
		di := f * (force - v - c.rp*i - c.rs*d)
		dm := f * c.lambda * (clamp + c.rs*d)
		v = f * i
		i, m = di, dm
		force, clamp = 0, 0
		s.i[k+1], s.v[k+1], s.m[k+1], s.q[k+1] = i, v, m, f*sign*d
	}
}

// carry takes a small change of the state through a step of length h: the same
// equations without the constant terms, de being the change of E.
func (c *circuit) carry(md mode, de, h float64, x *state) {
	i, v, m := x[0], x[1], x[2]
	if md == off {
		kappa := c.lambda / (1 + c.lambda)
		for k := range degree {
			f := h * inverse[k]
			i, v = f*kappa*(-v-c.rp*i), f*i
			x[0] += i
			x[1] += v
		}
		x[2] = x[0]
		return
	}
	sign := float64(md)
	clamp := sign * de
	for k := range degree {
		f := h * inverse[k]
		d := i - m
		i, v, m = f*(-clamp-v-c.rp*i-c.rs*d), f*i, f*c.lambda*(clamp+c.rs*d)
		clamp = 0
		x[0] += i
		x[1] += v
		x[2] += m
		x[3] += f * sign * d
	}
}

// slope returns the time derivative of the state.
func (c *circuit) slope(md mode, bridge, e float64, x *state) state {
	if md == off {
		di := c.lambda / (1 + c.lambda) * (bridge - x[1] - c.rp*x[0])
		return state{di, x[0], di, 0}
	}
	d := x[0] - x[2]
	vp := float64(md)*e + c.rs*d
	return state{bridge - x[1] - c.rp*x[0] - vp, x[0], c.lambda * vp, float64(md) * d}
}

// open returns the voltage across Lm with the rectifier off.
func (c *circuit) open(bridge float64, x *state) float64 {
	return (bridge - x[1] - c.rp*x[0]) / (1 + c.lambda)
}

// at returns the state at u.
func (s *expansion) at(u float64) state {
	return state{horner(&s.i, u), horner(&s.v, u), horner(&s.m, u), horner(&s.q, u)}
}

// cut shortens the expansion to its part from 0 to u.
func (s *expansion) cut(u float64) {
	p := u
	for k := 1; k <= degree; k++ {
		s.i[k] *= p
		s.v[k] *= p
		s.m[k] *= p
		s.q[k] *= p
		p *= u
	}
}

func horner(c *[degree + 1]float64, u float64) float64 {
	x := c[degree]
	for k := degree - 1; k >= 0; k-- {
		x = x*u + c[k]
	}
	return x
}
