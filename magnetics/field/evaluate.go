package field

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/integrate/quad"
)

// Units returns the number of unit solutions.
func (s *Solver) Units() int { return s.units }

// Modes returns the number of modes of the series.
func (s *Solver) Modes() int { return s.modes }

// Energy returns the mutual energy form of the window alone: the energy of peak
// currents i is i'E i/2, J per metre of one planar window, J of a round one.
// Twice the energy of a balanced pair is its leakage inductance per squared
// current (per metre of turn in a planar window).
func (s *Solver) Energy(a, b int) float64 { return s.energy[a*s.units+b] }

// Inductance returns Energy with the gaps, what surrounds them, and the core
// added: the inductance matrix per turn squared, H; planar: of ONE window, H
// per metre, half of the full section.
func (s *Solver) Inductance(a, b int) float64 { return s.inductance[a*s.units+b] }

// GapDrop returns the mmf over gap g, those of the post first, in unit solution
// u, A. It is counted along +y, so a post gap that takes a positive current is
// negative.
func (s *Solver) GapDrop(u, g int) float64 {
	return s.drops[u*len(s.drops)/s.units+g]
}

// CoreDrop returns the mmf that the core takes in unit solution u, A.
func (s *Solver) CoreDrop(u int) float64 {
	if !s.core {
		return 0
	}
	nd := len(s.drops) / s.units
	return s.drops[u*nd+nd-1]
}

// row fills s.coef with the coefficients of H at depth x: [mode][unit](x part,
// y part), and returns the step.
func (s *Solver) row(x float64) int {
	n, m, e := s.n, s.modes, s.units
	i := s.step(x)
	if cap(s.coef) < 2*m*e {
		s.coef = make([]float64, 2*m*e)
	}
	s.coef = s.coef[:2*m*e]
	u, w := x-s.edge[i], s.edge[i+1]-x
	k1 := math.Pi / s.breadth
	rootR, half := 1.0, 0.0
	if !s.planar {
		r := s.radius + x
		rootR, half = math.Sqrt(r), 1/(2*r)
	}
	scale := -1 / (mu0 * rootR)
	for q := range m {
		k := s.mode[q*n+i].k
		eu, ew := math.Exp(-k*u), math.Exp(-k*w)
		kx := scale * k1 * float64(q+1)
		for a := range e {
			at := (a*n+i)*m + q
			b, c := s.b[at]*eu, s.c[at]*ew
			v := s.p[at] + b + c
			s.coef[(q*e+a)*2] = kx * v
			s.coef[(q*e+a)*2+1] = scale * (k*(c-b) + half*v)
		}
	}
	return i
}

// sum evaluates the row at y into hx and hy, one value per unit.
func (s *Solver) sum(i int, x, y float64, hx, hy []float64) {
	e := s.units
	u := (x - s.edge[i]) / (s.edge[i+1] - s.edge[i])
	for a := range e {
		h := s.h0[a*(s.n+1):]
		hx[a], hy[a] = 0, h[i]+(h[i+1]-h[i])*u
	}
	sy, cy := math.Sincos(math.Pi / s.breadth * y)
	sn, cs := 0.0, 1.0
	coef := s.coef
	switch e {
	case 1:
		x0, y0 := 0.0, 0.0
		for q := 0; q+1 < len(coef); q += 2 {
			sn, cs = sn*cy+cs*sy, cs*cy-sn*sy
			x0 += coef[q] * sn
			y0 += coef[q+1] * cs
		}
		hx[0] += x0
		hy[0] += y0
	case 2:
		var x0, y0, x1, y1 float64
		for q := 0; q+3 < len(coef); q += 4 {
			sn, cs = sn*cy+cs*sy, cs*cy-sn*sy
			c := coef[q : q+4 : q+4]
			x0 += c[0] * sn
			y0 += c[1] * cs
			x1 += c[2] * sn
			y1 += c[3] * cs
		}
		hx[0] += x0
		hy[0] += y0
		hx[1] += x1
		hy[1] += y1
	case 3:
		var x0, y0, x1, y1, x2, y2 float64
		for q := 0; q+5 < len(coef); q += 6 {
			sn, cs = sn*cy+cs*sy, cs*cy-sn*sy
			c := coef[q : q+6 : q+6]
			x0 += c[0] * sn
			y0 += c[1] * cs
			x1 += c[2] * sn
			y1 += c[3] * cs
			x2 += c[4] * sn
			y2 += c[5] * cs
		}
		hx[0] += x0
		hy[0] += y0
		hx[1] += x1
		hy[1] += y1
		hx[2] += x2
		hy[2] += y2
	default:
		at := 0
		for range s.modes {
			sn, cs = sn*cy+cs*sy, cs*cy-sn*sy
			for a := range e {
				hx[a] += coef[at] * sn
				hy[a] += coef[at+1] * cs
				at += 2
			}
		}
	}
}

// At evaluates H of every unit at one point, A/m. On the wall itself, x = 0 or
// x = Depth, the series is the prescribed mouth field and converges slowly
// where there is a gap.
func (s *Solver) At(x, y float64, hx, hy []float64) {
	s.sum(s.row(x), x, y, hx, hy)
}

// rules prepares the Gauss points.
func (s *Solver) rules() {
	if s.gaussW[0] == 0 {
		quad.Legendre{}.FixedLocations(s.gaussX[:], s.gaussW[:], 0, 1)
		quad.Legendre{}.FixedLocations(s.gaussAcrossX[:], s.gaussWAcr[:], 0, 1)
		quad.Legendre{}.FixedLocations(s.gaussThinX[:], s.gaussWThin[:], 0, 1)
	}
}

// Mean adds weight times the means of Hx_a Hx_b and of Hy_a Hy_b over a
// rectangle to xx and yy, 1/m2, both [unit][unit]. Around a round post the mean
// is by volume. The rectangle may cross edges of sources.
//
// Panels of Gauss points are as long as the field can change: they end where
// copper ends, and reach 4/3 of the distance from a wall with a gap, at most
// half the rectangle; across, a panel is never deeper than that distance.
func (s *Solver) Mean(r Rect, weight float64, xx, yy []float64) {
	s.rules()
	s.rowX, s.rowY = grow(s.rowX, s.units), grow(s.rowY, s.units)
	volume := r.X1 - r.X0
	if !s.planar {
		volume *= s.radius + (r.X0+r.X1)/2
	}
	x := r.X0
	for x < r.X1 {
		i := s.step(x)
		if s.edge[i+1]-x <= 1e-7*s.depth && i+1 < s.n {
			i++ // x is the right node of a step, but for rounding
		}
		end := min(s.edge[i+1], r.X1)
		if end <= x || i == s.n-1 {
			end = r.X1
		}
		if s.gapped[0] {
			end = min(end, x+max(x, 1e-3*s.depth))
		}
		if s.gapped[1] {
			end = min(end, x+max((s.depth-x)/2, 1e-3*s.depth))
		}
		if r.X1-end < 1e-9*s.depth {
			end = r.X1
		}
		nodes, weights := s.gaussAcrossX[:], s.gaussWAcr[:]
		if end-x <= 0.6*s.clearance(x, end) {
			// Across a thin layer H_y is nearly linear: two points.
			nodes, weights = s.gaussThinX[:], s.gaussWThin[:]
		}
		for q, g := range nodes {
			at := x + (end-x)*g
			w := weights[q] * (end - x) / volume
			if !s.planar {
				w *= s.radius + at
			}
			s.meanRow(r, at, weight*w, xx, yy)
		}
		x = end
	}
}

// clearance is the distance of a panel across from the nearest wall with a gap, or
// a twelfth of the breadth: over what length across the field changes.
func (s *Solver) clearance(x0, x1 float64) float64 {
	d := s.breadth / 12
	if s.gapped[0] {
		d = min(d, x0)
	}
	if s.gapped[1] {
		d = min(d, s.depth-x1)
	}
	return d
}

// meanRow adds one row of Gauss points at depth x.
func (s *Solver) meanRow(r Rect, x, weight float64, xx, yy []float64) {
	i := s.row(x)
	length := (r.Y1 - r.Y0) / 2
	if s.gapped[0] {
		length = min(length, 4.0/3*x)
	}
	if s.gapped[1] {
		length = min(length, 4.0/3*(s.depth-x))
	}
	// The series has nothing shorter than two panels per wave of its last mode.
	length = max(length, 2*s.breadth/float64(s.modes))
	e := s.units
	for y0 := r.Y0; y0 < r.Y1; {
		y1 := s.ends.next(y0, r.Y1)
		panels := int(math.Ceil((y1 - y0) / length))
		step := (y1 - y0) / float64(panels)
		for p := range panels {
			for q, g := range s.gaussX {
				y := y0 + (float64(p)+g)*step
				s.sum(i, x, y, s.rowX, s.rowY)
				w := weight * s.gaussW[q] * step / (r.Y1 - r.Y0)
				for a := range e {
					for b := range e {
						xx[a*e+b] += w * s.rowX[a] * s.rowX[b]
						yy[a*e+b] += w * s.rowY[a] * s.rowY[b]
					}
				}
			}
		}
		y0 = y1
	}
}

// ends are the places along the breadth where rectangles of current end, in
// order: the field bends there, also in the copper beside it.
type ends []float64

// mostEnds is the number of different ends up to which panels are cut there. The
// turns of a layer one by one make more, and a smooth field.
const mostEnds = 12

// collect returns the ends of the sources in the memory of e.
func (e ends) collect(sources []Source, slack float64) ends {
	e = e[:0]
	for _, c := range sources {
		for _, y := range [2]float64{c.Y0, c.Y1} {
			at, _ := slices.BinarySearch(e, y)
			if at > 0 && y-e[at-1] < slack || at < len(e) && e[at]-y < slack {
				continue
			}
			if len(e) == mostEnds {
				return e[:0]
			}
			e = slices.Insert(e, at, y)
		}
	}
	return e
}

// next returns the first end above y, at most limit.
func (e ends) next(y, limit float64) float64 {
	slack := 1e-9 * (limit - y)
	for _, v := range e {
		if v > y+slack && v < limit-slack {
			return v
		}
	}
	return limit
}

// Along evaluates H of every unit at the points (x, y[i]); hx and hy take
// [point][unit], A/m.
func (s *Solver) Along(x float64, y []float64, hx, hy []float64) {
	i := s.row(x)
	for p, v := range y {
		s.sum(i, x, v, hx[p*s.units:(p+1)*s.units], hy[p*s.units:(p+1)*s.units])
	}
}
