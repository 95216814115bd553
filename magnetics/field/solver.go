package field

import (
	"fmt"
	"math"
	"slices"

	"gapwright/corelib/bessel"
	"gapwright/corelib/quantity"
)

const mu0 = quantity.Mu0

// mouthEdge is s in (mu0/2) F^2 s, the energy per metre of gap edge that the
// disturbed field in the slot beside the mouth adds: sum a_n^2/(4 pi n) over
// the Fourier coefficients of the mouth shape below.
const mouthEdge = 0.00972

// mouthSingular is the part of the mouth field with the corner singularity, the
// rest is uniform. Fitted to two finite-element cases; others confirm it.
const mouthSingular = 0.8

// stepOverRadius is the thickest step, against its inner radius, that a round
// window is cut into. The error falls with its square; see the test of
// convergence.
const stepOverRadius = 0.06

// Gauss points per panel along y, and across.
const (
	pointsAlong  = 8
	pointsAcross = 3
	pointsThin   = 2
)

// A Solver holds the field of one window and the memory to solve the next one
// without allocating. The zero value is ready. It is not safe for concurrent
// use.
type Solver struct {
	breadth, depth, radius float64
	planar                 bool
	gapped                 [2]bool // walls with gaps: post, outer leg
	modes, units           int

	edge []float64 // nodes across, n+1
	n    int       // steps
	root []float64 // sqrt(r) at the middle of a step; 1 when planar
	curl []float64 // 3/(4 r^2) there; 0 when planar

	// Per unit and step: uniform part of the current density, A/m2, and mean
	// H_y at the nodes, A/m.
	j0 []float64 // [unit][step]
	jw []float64 // the same of the sources marked Wire
	h0 []float64 // [unit][node]

	jm   []float64 // [unit][step][mode], cosine coefficients of the density
	wire []float64 // the same of the sources marked Wire
	any  bool      // some are

	v    []float64 // [mode][basis][node]
	mode []wave    // [mode][step]

	// Field of each unit inside a step: v = p + b exp(-k u) + c exp(-k w), with u
	// and w measured from the two nodes.
	p, b, c    []float64 // [unit][step][mode]
	bw, cw     []float64 // the same of the sources marked Wire
	drops      []float64 // [unit][drop]: post gaps, outer gaps, core
	gaps       []Gap
	outer      []Gap
	ends       ends
	core       bool
	energy     []float64 // [unit][unit], twice the window energy
	inductance []float64 // [unit][unit], with gaps and core

	// Scratch.
	load, diag, off         []float64
	inner                   []float64
	span                    [][2]int
	shape, mouth            []float64
	wbasis                  []float64
	kkt, lin                []float64
	coef                    []float64
	rowX, rowY              []float64
	gaussX, gaussW          [pointsAlong]float64
	gaussAcrossX, gaussWAcr [pointsAcross]float64
	gaussThinX, gaussWThin  [pointsThin]float64
}

// wave is what one mode needs to know of one step.
type wave struct{ k, e, half float64 } // decay constant, exp(-k t), tanh(k t/2)/k

// grow returns s with length n, reusing its memory, and zeroed.
func grow(s []float64, n int) []float64 {
	if cap(s) < n {
		return make([]float64, n)
	}
	s = s[:n]
	clear(s)
	return s
}

// Solve computes all unit solutions of p. An error is what Check says.
func (s *Solver) Solve(p *Problem) error {
	if err := p.Check(); err != nil {
		return err
	}
	s.breadth, s.depth, s.radius = p.Breadth, p.Depth, p.PostRadius
	s.planar = p.planar()
	s.gapped = [2]bool{len(p.Gaps) > 0, len(p.OuterGaps) > 0}
	s.units, s.modes = p.Units, ModesFor(p)
	s.gaps = append(s.gaps[:0], p.Gaps...)
	s.outer = append(s.outer[:0], p.OuterGaps...)
	s.core = p.CorePermeance > 0
	s.ends = s.ends.collect(p.Sources, 1e-6*p.Breadth)
	s.steps(p)
	s.currents(p)
	s.reach(p)
	s.solveModes()
	s.share(p)
	s.finish()
	for i, v := range s.inductance {
		if math.IsNaN(v) || math.IsInf(v, 0) || math.IsNaN(s.energy[i]) {
			return fmt.Errorf("window of %g x %g m: the field is not finite", p.Depth, p.Breadth)
		}
	}
	return nil
}

// steps cuts the depth at every edge of a source, and thinner around a post.
func (s *Solver) steps(p *Problem) {
	s.edge = append(s.edge[:0], 0, p.Depth)
	for _, c := range p.Sources {
		s.edge = append(s.edge, min(max(c.X0, 0), p.Depth), min(max(c.X1, 0), p.Depth))
	}
	slices.Sort(s.edge)
	// Edges closer than this are one edge written twice.
	merge := 1e-7 * p.Depth
	kept := s.edge[:1]
	for _, x := range s.edge[1:] {
		if x-kept[len(kept)-1] > merge {
			kept = append(kept, x)
		}
	}
	kept[len(kept)-1] = p.Depth
	s.edge = kept
	if !s.planar {
		n := len(s.edge)
		for i := range n - 1 {
			a, b := s.edge[i], s.edge[i+1]
			cuts := int(math.Ceil((b - a) / (stepOverRadius * (s.radius + a))))
			for j := 1; j < cuts; j++ {
				s.edge = append(s.edge, a+(b-a)*float64(j)/float64(cuts))
			}
		}
		slices.Sort(s.edge)
	}
	s.n = len(s.edge) - 1
	s.root, s.curl = grow(s.root, s.n), grow(s.curl, s.n)
	for i := range s.n {
		s.root[i] = 1
		if !s.planar {
			r := s.radius + (s.edge[i]+s.edge[i+1])/2
			s.root[i] = math.Sqrt(r)
			s.curl[i] = 3 / (4 * r * r)
		}
	}
}

// step returns the step that holds x.
func (s *Solver) step(x float64) int {
	i, found := slices.BinarySearch(s.edge, x)
	if !found {
		i--
	}
	return min(max(i, 0), s.n-1)
}

// node returns the node nearest to x.
func (s *Solver) node(x float64) int {
	i := s.step(x)
	if x-s.edge[i] > s.edge[i+1]-x {
		i++
	}
	return i
}

// currents fills the density coefficients and the mean field of the sources.
func (s *Solver) currents(p *Problem) {
	n, m := s.n, s.modes
	s.j0 = grow(s.j0, s.units*n)
	s.h0 = grow(s.h0, s.units*(n+1))
	s.jm = grow(s.jm, s.units*n*m)
	s.any = false
	for _, c := range p.Sources {
		s.any = s.any || c.Wire
	}
	s.jw = grow(s.jw, s.units*n)
	if s.any {
		s.wire = grow(s.wire, s.units*n*m)
	}
	s.shape = grow(s.shape, m)
	k1 := math.Pi / s.breadth
	for _, c := range p.Sources {
		if c.AmpereTurns == 0 {
			continue
		}
		from, to := s.node(c.X0), s.node(c.X1)
		y0, y1 := max(c.Y0, 0), min(c.Y1, s.breadth)
		// The density follows from the edges as cut, so that no current is lost.
		j := c.AmpereTurns / ((s.edge[to] - s.edge[from]) * (y1 - y0))
		full := y0 <= 1e-9*s.breadth && y1 >= s.breadth*(1-1e-9)
		if !full {
			sa, ca := math.Sincos(k1 * y0)
			sb, cb := math.Sincos(k1 * y1)
			s0, c0, s1, c1 := 0.0, 1.0, 0.0, 1.0
			for i := range m {
				s0, c0 = s0*ca+c0*sa, c0*ca-s0*sa
				s1, c1 = s1*cb+c1*sb, c1*cb-s1*sb
				s.shape[i] = j * 2 / s.breadth * (s1 - s0) / (k1 * float64(i+1))
			}
		}
		for i := from; i < to; i++ {
			s.j0[c.Unit*n+i] += j * (y1 - y0) / s.breadth
			if c.Wire {
				s.jw[c.Unit*n+i] += j * (y1 - y0) / s.breadth
			}
			if full {
				continue
			}
			at := (c.Unit*n + i) * m
			for q, v := range s.shape {
				s.jm[at+q] += v
			}
			if c.Wire {
				for q, v := range s.shape {
					s.wire[at+q] += v
				}
			}
		}
	}
	for u := range s.units {
		for i := range n {
			s.h0[u*(n+1)+i+1] = s.h0[u*(n+1)+i] + s.j0[u*n+i]*(s.edge[i+1]-s.edge[i])
		}
	}
}

// bases is the number of right-hand sides of a mode: the sources of each unit,
// the gaps, and the wires of each unit once more.
func (s *Solver) bases() int {
	nb := s.units + len(s.gaps) + len(s.outer)
	if s.any {
		nb += s.units
	}
	return nb
}

// mouthCoefficients fills s.mouth with the cosine coefficients of the field of
// every gap at 1 A of mmf: [gap][mode].
//
// The mouth field is (F/g)[0.2 + 0.8 c (1-u^2)^(-1/3)], u = 2 (y - yc)/g: the
// exponent is that of the corner of a rectangular ferrite edge. Its transform
// is the reduced Bessel function of order 1/6.
func (s *Solver) mouthCoefficients() {
	m := s.modes
	total := len(s.gaps) + len(s.outer)
	s.mouth = grow(s.mouth, total*m)
	k1 := math.Pi / s.breadth
	last := -1.0
	for g := range total {
		gap := s.gap(g)
		row := s.mouth[g*m : (g+1)*m]
		if gap.Length == last {
			// Equal gaps share their shape, which is the costly part.
			copy(row, s.shape)
		} else {
			for i := range m {
				row[i] = mouthTransform(k1 * float64(i+1) * gap.Length / 2)
			}
			copy(s.shape, row)
			last = gap.Length
		}
		sa, ca := math.Sincos(k1 * gap.Center)
		sn, cs := 0.0, 1.0
		for i := range m {
			sn, cs = sn*ca+cs*sa, cs*ca-sn*sa
			row[i] *= 2 / s.breadth * cs
		}
	}
}

// mouthTail returns the integral of L(t)^2/t from z on, where L is the transform
// of the mouth field at k g/2 = t: what the modes beyond the last add to the
// energy of a gap. Their number to convergence is that of the gap length in the
// breadth, hundreds for a short gap, so they are summed in closed form.
func (s *Solver) mouthTail(z float64) float64 {
	// Beyond 8 the oscillation of L^2 averages out: 0.8^2 Gamma(7/6)^2 2^(1/3)/pi
	// t^(-4/3), of which the part left out by averaging is below 1e-3.
	const far, averaged = 8.0, 0.2209
	tail := averaged * 0.75 * math.Pow(math.Max(z, far), -4./3)
	if z >= far {
		return tail
	}
	s.rules()
	// In the logarithm the integrand is smooth: 1 for small t. Below 0.01 it is 1
	// to 1e-5.
	from := math.Log(z)
	if low := math.Log(0.01); from < low {
		tail += low - from
		from = low
	}
	const panels = 4
	step := (math.Log(far) - from) / panels
	for p := range panels {
		for q, g := range s.gaussX {
			l := mouthTransform(math.Exp(from + (float64(p)+g)*step))
			tail += s.gaussW[q] * step * l * l
		}
	}
	return tail
}

// mouthTransform is the mean of cos(k (y - yc)) over a gap mouth, weighted by its
// field, at z = k g/2.
func mouthTransform(z float64) float64 {
	return (1-mouthSingular)*math.Sin(z)/z + mouthSingular*bessel.Reduced(1.0/6, z)
}

// gap returns gap g, those in the post first.
func (s *Solver) gap(g int) Gap {
	if g < len(s.gaps) {
		return s.gaps[g]
	}
	return s.outer[g-len(s.gaps)]
}

// wallRoot returns sqrt(r) at the post (0) or at the outer wall (1).
func (s *Solver) wallRoot(wall int) float64 {
	if s.planar {
		return 1
	}
	if wall == 0 {
		return math.Sqrt(s.radius)
	}
	return math.Sqrt(s.radius + s.depth)
}

// solveModes solves -v” + (k^2 + curl) v = mu0 J sqrt(r) for every mode and
// basis. Within a step the equation has constant coefficients, so its element
// is exact: the nodal values of a planar window carry no error but rounding.
func (s *Solver) solveModes() {
	n, m, nb := s.n, s.modes, s.bases()
	ng := len(s.gaps) + len(s.outer)
	s.mouthCoefficients()
	s.v = grow(s.v, m*nb*(n+1))
	if cap(s.mode) < m*n {
		s.mode = make([]wave, m*n)
	}
	s.mode = s.mode[:m*n]
	s.load = grow(s.load, nb*(n+1))
	s.diag, s.off = grow(s.diag, n+1), grow(s.off, n)
	s.wbasis = grow(s.wbasis, nb*nb)
	s.inner = grow(s.inner, n)
	// Twice the energy of a mode is this times its quadratic form.
	scale := s.breadth / 2 / mu0
	if !s.planar {
		scale *= 2 * math.Pi
	}
	k1 := math.Pi / s.breadth
	inner, outer := s.wallRoot(0), s.wallRoot(1)
	for q := range m {
		k := k1 * float64(q+1)
		clear(s.load)
		clear(s.diag)
		waves := s.mode[q*n : (q+1)*n]
		for i := range n {
			t := s.edge[i+1] - s.edge[i]
			ke := k
			if !s.planar {
				ke = math.Sqrt(k*k + s.curl[i])
			}
			e := math.Exp(-ke * t)
			w := wave{k: ke, e: e, half: -math.Expm1(-ke*t) / (1 + e) / ke}
			waves[i] = w
			oneMinus := -math.Expm1(-2 * ke * t) // 1 - e^2 without cancellation
			coth := ke * (1 + e*e) / oneMinus
			s.diag[i] += coth
			s.diag[i+1] += coth
			s.off[i] = -2 * ke * e / oneMinus
			for u := range s.units {
				f := mu0 * s.root[i] * s.jm[(u*n+i)*m+q] * w.half
				s.load[u*(n+1)+i] += f
				s.load[u*(n+1)+i+1] += f
				if s.any {
					f := mu0 * s.root[i] * s.wire[(u*n+i)*m+q] * w.half
					at := (s.units + ng + u) * (n + 1)
					s.load[at+i] += f
					s.load[at+i+1] += f
				}
			}
		}
		if !s.planar {
			s.diag[0] -= 1 / (2 * s.radius)
			s.diag[n] += 1 / (2 * (s.radius + s.depth))
		}
		for g := range s.gaps {
			s.load[(s.units+g)*(n+1)] = mu0 * inner * s.mouth[g*m+q]
		}
		for g := range s.outer {
			at := len(s.gaps) + g
			s.load[(s.units+at)*(n+1)+n] = -mu0 * outer * s.mouth[at*m+q]
		}
		// The matrix is symmetric and dominant: elimination needs no pivots. The
		// diagonal becomes that of the factor; off keeps the original entries.
		for i := 1; i <= n; i++ {
			s.diag[i] -= s.off[i-1] * s.off[i-1] / s.diag[i-1]
		}
		v := s.v[q*nb*(n+1) : (q+1)*nb*(n+1)]
		for b := range nb {
			x := v[b*(n+1) : (b+1)*(n+1)]
			copy(x, s.load[b*(n+1):(b+1)*(n+1)])
			for i := 1; i <= n; i++ {
				x[i] -= s.off[i-1] / s.diag[i-1] * x[i-1]
			}
			x[n] /= s.diag[n]
			for i := n - 1; i >= 0; i-- {
				x[i] = (x[i] - s.off[i]*x[i+1]) / s.diag[i]
			}
		}
		s.addEnergies(q, scale)
	}
}

// reach fills the range of nodes that carry load, per basis: energies are sums
// over it. A winding in one layer has two nodes of many.
func (s *Solver) reach(p *Problem) {
	nb := s.units + len(s.gaps) + len(s.outer)
	if cap(s.span) < nb {
		s.span = make([][2]int, nb)
	}
	s.span = s.span[:nb]
	for u := range s.units {
		s.span[u] = [2]int{s.n + 1, -1} // none
	}
	for _, c := range p.Sources {
		if c.AmpereTurns != 0 {
			r := &s.span[c.Unit]
			r[0], r[1] = min(r[0], s.node(c.X0)), max(r[1], s.node(c.X1))
		}
	}
	for g := range s.gaps {
		s.span[s.units+g] = [2]int{0, 0}
	}
	for g := range s.outer {
		s.span[s.units+len(s.gaps)+g] = [2]int{s.n, s.n}
	}
}

// addEnergies adds mode q to twice the window energies of all pairs of bases:
// the integral of J A and of the wall sources times A.
func (s *Solver) addEnergies(q int, scale float64) {
	n, m, nb := s.n, s.modes, s.bases()
	v := s.v[q*nb*(n+1) : (q+1)*nb*(n+1)]
	// t - 2 tanh(kt/2)/k and the square of mu0 sqrt(r)/k, per step; the first
	// cancels in thin steps.
	for i := range n {
		w := s.mode[q*n+i]
		t := s.edge[i+1] - s.edge[i]
		rest := t - 2*w.half
		if kt := w.k * t; kt < 0.02 {
			rest = t * kt * kt / 12 * (1 - kt*kt/10)
		}
		f := mu0 * s.root[i] / w.k
		s.inner[i] = f * f * rest
	}
	for b := range s.units + len(s.gaps) + len(s.outer) {
		from, to := s.span[b][0], s.span[b][1]
		if to < from {
			continue
		}
		load := s.load[b*(n+1)+from : b*(n+1)+to+1]
		for a := b; a < s.units+len(s.gaps)+len(s.outer); a++ {
			va := v[a*(n+1)+from : a*(n+1)+to+1]
			sum := 0.0
			for i, f := range load {
				sum += f * va[i]
			}
			if a < s.units {
				for i := max(from, s.span[a][0]); i < min(to, s.span[a][1]); i++ {
					sum += s.inner[i] * s.jm[(a*n+i)*m+q] * s.jm[(b*n+i)*m+q]
				}
			}
			s.wbasis[a*nb+b] += scale * sum
		}
	}
}
