package field

import "math"

// meanIntegral returns the integral of H_a H_b over the window, where both are the
// means over the breadth, linear in each step: values at the nodes of a step
// and its length; planar per metre, round 2 pi r dr.
func (s *Solver) meanIntegral(a, b []float64) float64 {
	sum := 0.0
	for i := range s.n {
		t := s.edge[i+1] - s.edge[i]
		a0, a1, b0, b1 := a[i], a[i+1], b[i], b[i+1]
		if s.planar {
			sum += t * (2*a0*b0 + a0*b1 + a1*b0 + 2*a1*b1) / 6
			continue
		}
		// Third-degree polynomial: two-point Gauss is exact.
		g := t / 2 / math.Sqrt(3)
		mid := t / 2
		for _, x := range [2]float64{mid - g, mid + g} {
			u := x / t
			sum += t / 2 * (a0 + (a1-a0)*u) * (b0 + (b1-b0)*u) * 2 * math.Pi * (s.radius + s.edge[i] + x)
		}
	}
	return sum * s.breadth
}

// share distributes the ampere-turns left over in each unit over the gaps and
// the core. The drops d minimise the energy d'K d/2 + d'c under the one
// condition that the drops around the core make up the current.
func (s *Solver) share(p *Problem) {
	n, nb := s.n, s.bases()
	ng := len(s.gaps) + len(s.outer)
	nd := ng
	if s.core {
		nd++
	}
	total := s.units + nd
	// Mean fields of the drops, after those of the units.
	s.lin = grow(s.lin, nd*(n+1))
	for d := range nd {
		value := 0.0
		switch {
		case d < len(s.gaps):
			value = 1 / s.breadth
		case d >= ng:
			// Half of the drop along the post with its share of the yokes, half
			// along the outer leg.
			value = -0.5 / s.breadth
		}
		for i := range n + 1 {
			s.lin[d*(n+1)+i] = value
		}
	}
	mean := func(a int) []float64 {
		if a < s.units {
			return s.h0[a*(n+1) : (a+1)*(n+1)]
		}
		a -= s.units
		return s.lin[a*(n+1) : (a+1)*(n+1)]
	}
	// Twice the window energy of all pairs, and the drops' own energy outside.
	s.kkt = grow(s.kkt, total*total+3*nd)
	w := s.kkt[:total*total]
	for a := range total {
		for b := range a + 1 {
			e := mu0 * s.meanIntegral(mean(a), mean(b))
			if a < s.units+ng {
				e += s.wbasis[a*nb+b]
			}
			if a == b && a >= s.units && a < s.units+ng {
				e += s.unsolvedModes(a - s.units)
			}
			w[a*total+b], w[b*total+a] = e, e
		}
	}
	s.drops = grow(s.drops, s.units*nd)
	s.energy = grow(s.energy, s.units*s.units)
	s.inductance = grow(s.inductance, s.units*s.units)
	if nd > 0 {
		s.leastEnergy(p, w, total, nd)
	}
	for a := range s.units {
		for b := range s.units {
			e, own := w[a*total+b], 0.0
			for d := range nd {
				da, db := s.drops[a*nd+d], s.drops[b*nd+d]
				e += da*w[(s.units+d)*total+b] + db*w[(s.units+d)*total+a]
				for c := range nd {
					e += da * s.drops[b*nd+c] * w[(s.units+d)*total+s.units+c]
				}
				own += da * db * s.ownEnergy(p, d)
			}
			s.energy[a*s.units+b] = e
			s.inductance[a*s.units+b] = e + own
		}
	}
	// Add the fields of the drops to those of the units.
	for u := range s.units {
		for d := range nd {
			f := s.drops[u*nd+d]
			h := s.h0[u*(n+1) : (u+1)*(n+1)]
			for i, v := range s.lin[d*(n+1) : (d+1)*(n+1)] {
				h[i] += f * v
			}
			if d >= ng {
				continue
			}
			for q := range s.modes {
				v := s.v[q*nb*(n+1):]
				x, g := v[u*(n+1):(u+1)*(n+1)], v[(s.units+d)*(n+1):]
				for i := range x {
					x[i] += f * g[i]
				}
			}
		}
	}
}

// leastEnergy fills s.drops.
func (s *Solver) leastEnergy(p *Problem, w []float64, total, nd int) {
	n := s.n
	scratch := s.kkt[total*total:]
	sign, kc, ks := scratch[:nd], scratch[nd:2*nd], scratch[2*nd:3*nd]
	// Cholesky factor of K in the place of its own block; the block is needed
	// later, so it is kept in the upper triangle and the factor in the lower one
	// with its diagonal in s.diag.
	s.diag = grow(s.diag, max(nd, n+1))
	at := func(i, j int) *float64 { return &w[(s.units+i)*total+s.units+j] }
	for i := range nd {
		sign[i] = 1
		if i < len(s.gaps) {
			sign[i] = -1
		}
		for j := range i + 1 {
			sum := *at(j, i)
			if i == j {
				sum += s.ownEnergy(p, i)
			}
			for k := range j {
				sum -= *at(i, k) * *at(j, k)
			}
			if i == j {
				s.diag[i] = math.Sqrt(sum)
			} else {
				*at(i, j) = sum / s.diag[j]
			}
		}
	}
	solve := func(x []float64) {
		for i := range nd {
			for k := range i {
				x[i] -= *at(i, k) * x[k]
			}
			x[i] /= s.diag[i]
		}
		for i := nd - 1; i >= 0; i-- {
			for k := i + 1; k < nd; k++ {
				x[i] -= *at(k, i) * x[k]
			}
			x[i] /= s.diag[i]
		}
	}
	copy(ks, sign)
	solve(ks)
	norm := 0.0
	for i := range nd {
		norm += sign[i] * ks[i]
	}
	for u := range s.units {
		current := 0.0
		for i := range n {
			current += s.j0[u*n+i] * (s.edge[i+1] - s.edge[i]) * s.breadth
		}
		for i := range nd {
			kc[i] = w[u*total+s.units+i]
		}
		solve(kc)
		lambda := current
		for i := range nd {
			lambda += sign[i] * kc[i]
		}
		lambda /= norm
		for i := range nd {
			s.drops[u*nd+i] = lambda*ks[i] - kc[i]
		}
	}
	for i := range nd {
		for j := range i {
			*at(i, j) = *at(j, i)
		}
	}
}

// unsolvedModes returns twice the window energy of gap g at 1 A in the modes
// beyond the last. They end close to the mouth; cos^2 at its place averages to
// one half.
func (s *Solver) unsolvedModes(g int) float64 {
	edge := 1.0
	if !s.planar {
		edge = 2 * math.Pi * s.radius
		if g >= len(s.gaps) {
			edge = 2 * math.Pi * (s.radius + s.depth)
		}
	}
	z := (float64(s.modes) + 0.5) * math.Pi * s.gap(g).Length / (2 * s.breadth)
	return mu0 / math.Pi * edge * s.mouthTail(z)
}

// ownEnergy returns twice the energy of drop d at 1 A outside of the window:
// in the gap itself, beside its mouth, around the outer leg, in the core.
func (s *Solver) ownEnergy(p *Problem, d int) float64 {
	area, edge := p.PostHalfWidth, 1.0
	if !s.planar {
		area, edge = math.Pi*s.radius*s.radius, 2*math.Pi*s.radius
	}
	switch ng := len(s.gaps) + len(s.outer); {
	case d < len(s.gaps):
		return mu0 * (area/s.gaps[d].Length + mouthEdge*edge)
	case d < ng:
		g := s.outer[d-len(s.gaps)].Length
		if s.planar {
			return mu0 * (area/g + mouthEdge + outsideEdge(g, p.Breadth, area, 2*area+p.Depth))
		}
		inner := s.radius + s.depth
		outer := math.Sqrt(inner*inner + s.radius*s.radius) // shell of the post's area
		yoke := s.radius / 2                                // cylinder at the post of the post's area
		return mu0 * (area/g + 2*math.Pi*inner*mouthEdge + 2*math.Pi*outer*outsideEdge(g, p.Breadth, yoke, outer))
	}
	if s.planar {
		return p.CorePermeance / 2 // of one window of two
	}
	return p.CorePermeance
}

// outsideEdge is the stray permeance over mu0, per metre of the outside edge of
// a gap in the outer leg: the conformal basic block without its pole face, with
// the outside wall and the end plate as side wall.
func outsideEdge(gap, breadth, yoke, plate float64) float64 {
	wall := breadth/2 + yoke + plate
	return (1 + math.Log(math.Pi*wall/(2*gap))) / math.Pi
}

// finish turns nodal values into the coefficients of the field inside the
// steps.
func (s *Solver) finish() {
	n, m := s.n, s.modes
	size := s.units * n * m
	s.p, s.b, s.c = grow(s.p, size), grow(s.b, size), grow(s.c, size)
	s.expand(s.p, s.b, s.c, s.jm, 0)
	if s.any {
		s.bw, s.cw = grow(s.bw, size), grow(s.cw, size)
		s.expand(nil, s.bw, s.cw, s.wire, s.units+len(s.gaps)+len(s.outer))
	}
}

func (s *Solver) expand(p, b, c, j []float64, first int) {
	n, m, nb := s.n, s.modes, s.bases()
	for q := range m {
		for u := range s.units {
			x := s.v[(q*nb+first+u)*(n+1):]
			for i := range n {
				w := s.mode[q*n+i]
				at := (u*n+i)*m + q
				part := mu0 * s.root[i] * j[at] / (w.k * w.k)
				left, right := x[i]-part, x[i+1]-part
				d := 1 / ((1 - w.e) * (1 + w.e))
				b[at] = (left - w.e*right) * d
				c[at] = (right - w.e*left) * d
				if p != nil {
					p[at] = part
				}
			}
		}
	}
}
