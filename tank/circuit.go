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
	dead   float64 // dead time; 0: the bridge jumps
	alpha  float64 // du/dt = -alpha i while the bridge is left alone
}

// mode says what the rectifier does: +1 and -1 conduct with the winding
// positive or negative, 0 is off.
type mode int8

const (
	backward mode = -1
	off      mode = 0
	forward  mode = +1
)

// node says what holds the voltage u of the bridge.
type node int8

const (
	driven   node = iota // a switch, at +1
	swinging             // nothing: u moves with the charge of the node capacitance
	heldLow              // the diode at -1, while i > 0
	heldHigh             // the diode at +1, while i < 0
)

// state is i, v, m, the charge q = integral of |i - m|, and u, in this order.
type state [5]float64

// An expansion is the Taylor series of the state over one step, in t/h from 0 to
// 1. It is the exact solution to rounding because steps are short.
type expansion struct {
	i, v, m, q, u [degree + 1]float64
}

// A stretch is one step of the recorded solution.
type stretch struct {
	mode     mode
	node     node
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

// longest returns the longest step in a mode. Where the node swings the norm is
// taken with u scaled by its own resonance, which adds the root of alpha.
func (c *circuit) longest(md mode, nd node) float64 {
	size := 1 + c.rp // off: the norm falls with Lr/(Lr+Lm), the time of v does not
	if md != off {
		size = math.Max(1+c.rp+2*c.rs, 2*c.lambda*c.rs)
	}
	if nd == swinging {
		size += math.Sqrt(c.alpha)
	}
	return reach / size
}

// rate returns -du/dt over i.
func (c *circuit) rate(nd node) float64 {
	if nd == swinging {
		return c.alpha
	}
	return 0
}

// expand fills s with the solution that starts at x and lasts h.
func (c *circuit) expand(md mode, nd node, e, h float64, x *state, s *expansion) {
	s.i[0], s.v[0], s.m[0], s.q[0], s.u[0] = x[0], x[1], x[2], x[3], x[4]
	i, v, m, u := x[0], x[1], x[2], x[4]
	alpha := c.rate(nd)
	if md == off {
		kappa := c.lambda / (1 + c.lambda)
		for k := range degree {
			f := h * inverse[k]
			i, v, u = f*kappa*(u-v-c.rp*i), f*i, -f*alpha*i
			s.i[k+1], s.v[k+1], s.m[k+1], s.q[k+1], s.u[k+1] = i, v, i, 0, u
		}
		return
	}
	sign := float64(md)
	clamp := sign * e
	for k := range degree {
		f := h * inverse[k]
		d := i - m
		i, v, m, u = f*(u-clamp-v-c.rp*i-c.rs*d), f*i, f*c.lambda*(clamp+c.rs*d), -f*alpha*i
		clamp = 0
		s.i[k+1], s.v[k+1], s.m[k+1], s.q[k+1], s.u[k+1] = i, v, m, f*sign*d, u
	}
}

// carry takes a small change of the state through a step of length h: the same
// equations for the change, de being that of E.
func (c *circuit) carry(md mode, nd node, de, h float64, x *state) {
	i, v, m, u := x[0], x[1], x[2], x[4]
	alpha := c.rate(nd)
	if md == off {
		kappa := c.lambda / (1 + c.lambda)
		for k := range degree {
			f := h * inverse[k]
			i, v, u = f*kappa*(u-v-c.rp*i), f*i, -f*alpha*i
			x[0] += i
			x[1] += v
			x[4] += u
		}
		x[2] = x[0]
		return
	}
	sign := float64(md)
	clamp := sign * de
	for k := range degree {
		f := h * inverse[k]
		d := i - m
		i, v, m, u = f*(u-clamp-v-c.rp*i-c.rs*d), f*i, f*c.lambda*(clamp+c.rs*d), -f*alpha*i
		clamp = 0
		x[0] += i
		x[1] += v
		x[2] += m
		x[3] += f * sign * d
		x[4] += u
	}
}

// slope returns the time derivative of the state.
func (c *circuit) slope(md mode, nd node, e float64, x *state) state {
	du := -c.rate(nd) * x[0]
	if md == off {
		di := c.lambda / (1 + c.lambda) * (x[4] - x[1] - c.rp*x[0])
		return state{di, x[0], di, 0, du}
	}
	d := x[0] - x[2]
	vp := float64(md)*e + c.rs*d
	return state{x[4] - x[1] - c.rp*x[0] - vp, x[0], c.lambda * vp, float64(md) * d, du}
}

// open returns the voltage across Lm with the rectifier off.
func (c *circuit) open(x *state) float64 {
	return (x[4] - x[1] - c.rp*x[0]) / (1 + c.lambda)
}

// at returns the state at u.
func (s *expansion) at(u float64) state {
	return state{horner(&s.i, u), horner(&s.v, u), horner(&s.m, u), horner(&s.q, u), horner(&s.u, u)}
}

// cut shortens the expansion to its part from 0 to u.
func (s *expansion) cut(u float64) {
	p := u
	for k := 1; k <= degree; k++ {
		s.i[k] *= p
		s.v[k] *= p
		s.m[k] *= p
		s.q[k] *= p
		s.u[k] *= p
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
