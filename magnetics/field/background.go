package field

import "math"

// Background evaluates, at the center of a round wire, the field that is left
// when every source marked Wire is taken away but for the mean over the
// breadth: what blocks, gaps and the core's drop make. The caller adds the
// wires as line currents with their mirror images, exactly.
//
// into takes [unit][order]: the complex coefficients C_k of
// A/mu0 = Re sum C_k z^k, k = 1 ... orders, with z = (x + jy) from the center, A/m^k.
// C_1 = -H_y - j H_x.
//
// Around a round post the orders above the first neglect the curvature.
func (s *Solver) Background(x, y float64, orders int, into []complex128) {
	n, m := s.n, s.modes
	i := s.step(x)
	u, w := x-s.edge[i], s.edge[i+1]-x
	k1 := math.Pi / s.breadth
	rootR, half := 1.0, 0.0
	if !s.planar {
		r := s.radius + x
		rootR, half = math.Sqrt(r), 1/(2*r)
	}
	scale := 1 / (mu0 * rootR)
	clear(into[:s.units*orders])
	for a := range s.units {
		out := into[a*orders : (a+1)*orders]
		h := s.h0[a*(n+1):]
		out[0] = complex(-(h[i] + (h[i+1]-h[i])*u/(s.edge[i+1]-s.edge[i])), 0)
		if orders > 1 {
			out[1] = complex(-(s.j0[a*n+i]-s.jw[a*n+i])/2, 0)
		}
	}
	sy, cy := math.Sincos(k1 * y)
	sn, cs := 0.0, 1.0
	for q := range m {
		sn, cs = sn*cy+cs*sy, cs*cy-sn*sy
		km := k1 * float64(q+1)
		k := s.mode[q*n+i].k
		eu, ew := math.Exp(-k*u), math.Exp(-k*w)
		for a := range s.units {
			at := (a*n+i)*m + q
			p, b, c := s.p[at], s.b[at], s.c[at]
			if s.any {
				p -= mu0 * s.root[i] * s.wire[at] / (k * k)
				b -= s.bw[at]
				c -= s.cw[at]
			}
			b *= eu * scale
			c *= ew * scale
			p *= scale
			out := into[a*orders : (a+1)*orders]
			// Derivative of order j across, over j!: d; the one of order j-1, over
			// j!, carries the y part. Only the zeroth contains p.
			below := p + b + c
			d := k*(c-b) + half*below
			out[0] += complex(d*cs, km*below*sn)
			power := k
			for j := 1; j < orders; j++ {
				power *= k / float64(j+1)
				next := power * (c + b)
				if j%2 == 0 {
					next = power * (c - b)
				}
				// s_k = d(A_x^(k-1))/dy / k!: the previous derivative d, with its
				// own factorial, over k.
				previous := d
				if j == 1 {
					previous = k * (c - b)
				}
				out[j] += complex(next*cs, km*previous*sn/float64(j+1))
				d = next
			}
		}
	}
}
