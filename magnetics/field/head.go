package field

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/integrate/quad"
)

// A HeadSolver holds the field of a winding head: the conductors outside of the
// core, open on all sides but for the plane of the post at x = 0, which mirrors
// them. The zero value is ready and its memory is reused. It is not safe for
// concurrent use.
//
// Every rectangle has a closed-form field, so the only approximations are the
// plane itself (against a finite ferrite block: energy +0.2 % concentric, +8 %
// side by side, where the real block is too short to carry the flux) and the
// straight turns.
type HeadSolver struct {
	sources []Source
	units   int
	breadth float64
	ends    ends
	energy  []float64

	rowX, rowY     []float64
	gaussX, gaussW []float64
}

// Solve computes the mutual energies of all unit solutions. breadth is that of
// the window; it is the distance at which the potential of an unbalanced unit
// is zero.
func (s *HeadSolver) Solve(breadth float64, units int, sources []Source) error {
	if !(breadth > 0) || math.IsInf(breadth, 1) {
		return fmt.Errorf("window breadth %g m: must be above zero", breadth)
	}
	if err := checkSources(sources, units, math.Inf(1), math.Inf(1)); err != nil {
		return err
	}
	for i, c := range sources {
		if c.X0 < -1e-9*breadth {
			return fmt.Errorf("rectangle %d begins at x = %g m, behind the post plane", i+1, c.X0)
		}
	}
	s.sources = append(s.sources[:0], sources...)
	s.units, s.breadth = units, breadth
	s.ends = s.ends.collect(sources, 1e-6*breadth)
	s.energy = grow(s.energy, units*units)
	for i := range s.sources {
		a := &s.sources[i]
		for j := range i + 1 {
			b := &s.sources[j]
			if a.AmpereTurns == 0 || b.AmpereTurns == 0 {
				continue
			}
			mirrored := Rect{-b.X1, -b.X0, b.Y0, b.Y1}
			e := -mu0 / (2 * math.Pi) * a.AmpereTurns * b.AmpereTurns *
				(meanLog(a.Rect, b.Rect, breadth) + meanLog(a.Rect, mirrored, breadth))
			s.energy[a.Unit*units+b.Unit] += e
			if i != j {
				s.energy[b.Unit*units+a.Unit] += e
			}
		}
	}
	for _, e := range s.energy {
		if math.IsNaN(e) || math.IsInf(e, 0) {
			return fmt.Errorf("winding head with %d rectangles: the energy is not finite", len(sources))
		}
	}
	return nil
}

// Units returns the number of unit solutions.
func (s *HeadSolver) Units() int { return s.units }

// Energy returns the mutual energy form per metre of turn: peak currents i have
// the energy i'E i/2, J/m. The energy of ampere-turns that do not cancel has no
// bound in two dimensions; it is counted out to one window breadth.
func (s *HeadSolver) Energy(a, b int) float64 { return s.energy[a*s.units+b] }

// meanLog returns the mean of ln(distance/unit) between the points of two
// rectangles: the fourfold integral over their sides in closed form.
//
// With z = x + jy the fourth derivative of z^4 ln z is 24 ln z + 50, so
// G = -Re(z^4 ln z)/24 - (50/96) x^2 y^2 has d^4 G/dx^2 dy^2 = ln|z|. Terms of
// the angle that this derivative removes are left out, which makes G even.
func meanLog(a, b Rect, unit float64) float64 {
	ax, ay := [2]float64{a.X0 / unit, a.X1 / unit}, [2]float64{a.Y0 / unit, a.Y1 / unit}
	bx, by := [2]float64{b.X0 / unit, b.X1 / unit}, [2]float64{b.Y0 / unit, b.Y1 / unit}
	sum := 0.0
	for i := range 2 {
		for j := range 2 {
			for k := range 2 {
				for l := range 2 {
					g := fourfold(ax[i]-bx[j], ay[k]-by[l])
					if (i+j+k+l)%2 == 1 {
						g = -g
					}
					sum += g
				}
			}
		}
	}
	return sum / ((ax[1] - ax[0]) * (ay[1] - ay[0]) * (bx[1] - bx[0]) * (by[1] - by[0]))
}

func fourfold(x, y float64) float64 {
	x, y = math.Abs(x), math.Abs(y)
	r2 := x*x + y*y
	if r2 == 0 {
		return 0
	}
	angle := math.Atan2(y, x) // atan(y/x); atan(x/y) is its complement
	x2, y2 := x*x, y*y
	re := (x2*x2-6*x2*y2+y2*y2)*math.Log(r2)/2 - 4*x*y*(x2*angle+y2*(math.Pi/2-angle))
	return -re/24 - 50.0/96*x2*y2
}

// At evaluates H of every unit at one point, A/m.
func (s *HeadSolver) At(x, y float64, hx, hy []float64) {
	clear(hx[:s.units])
	clear(hy[:s.units])
	for i := range s.sources {
		c := &s.sources[i]
		if c.AmpereTurns == 0 {
			continue
		}
		j := c.AmpereTurns / (2 * math.Pi * (c.X1 - c.X0) * (c.Y1 - c.Y0))
		gx, gy := rectangleField(x, y, c.Rect)
		// The mirror image carries the same current.
		mx, my := rectangleField(-x, y, c.Rect)
		hx[c.Unit] += j * (gx + mx)
		hy[c.Unit] += j * (gy - my)
	}
}

// rectangleField returns 2 pi H/J of a rectangle of uniform current density.
// With (u, v) from the field point to a corner,
//
//	2 pi Hy/J = corner sum of [ (v/2) ln(u^2+v^2) + u atan(v/u) ]
//	2 pi Hx/J = - corner sum of [ (u/2) ln(u^2+v^2) + v atan(u/v) ]
//
// up to the sign of the corner, from integrating H_y = I dx/(2 pi r^2).
func rectangleField(x, y float64, r Rect) (hx, hy float64) {
	for i, cx := range [2]float64{r.X0, r.X1} {
		for k, cy := range [2]float64{r.Y0, r.Y1} {
			u, v := x-cx, y-cy
			r2 := u*u + v*v
			if r2 == 0 {
				continue // both terms vanish at the corner itself
			}
			half := math.Log(r2) / 2
			angle := math.Atan(v / u) // u = 0: +-pi/2, times u
			if u == 0 {
				angle = math.Copysign(math.Pi/2, v)
			}
			other := math.Copysign(math.Pi/2, angle) - angle // atan(u/v)
			fy := v*half + u*angle
			fx := u*half + v*other
			if i == k {
				hx -= fx
				hy += fy
			} else {
				hx += fx
				hy -= fy
			}
		}
	}
	return hx, hy
}

// Mean adds weight times the means of Hx_a Hx_b and of Hy_a Hy_b over a
// rectangle to xx and yy, 1/m2, both [unit][unit].
func (s *HeadSolver) Mean(r Rect, weight float64, xx, yy []float64) {
	if len(s.gaussX) == 0 {
		s.gaussX, s.gaussW = make([]float64, pointsAlong), make([]float64, pointsAlong)
		quad.Legendre{}.FixedLocations(s.gaussX, s.gaussW, 0, 1)
	}
	s.rowX, s.rowY = grow(s.rowX, s.units), grow(s.rowY, s.units)
	// Across, panels are no deeper than they are long; a layer has one.
	const t0, t1 = 0.1127016653792583, 0.5 // three-point Gauss on 0..1
	nodes, weights := [3]float64{t0, t1, 1 - t0}, [3]float64{5. / 18, 8. / 18, 5. / 18}
	volume := (r.X1 - r.X0) * (r.Y1 - r.Y0)
	for y0 := r.Y0; y0 < r.Y1; {
		y1 := s.ends.next(y0, r.Y1)
		const along = 2
		across := int(min(max(math.Ceil(2*(r.X1-r.X0)/(y1-y0)), 1), 8))
		dx, dy := (r.X1-r.X0)/float64(across), (y1-y0)/along
		for i := range across {
			for p := range along {
				for k, t := range nodes {
					for q, g := range s.gaussX {
						x, y := r.X0+(float64(i)+t)*dx, y0+(float64(p)+g)*dy
						s.At(x, y, s.rowX, s.rowY)
						w := weight * weights[k] * s.gaussW[q] * dx * dy / volume
						for a := range s.units {
							for b := range s.units {
								xx[a*s.units+b] += w * s.rowX[a] * s.rowX[b]
								yy[a*s.units+b] += w * s.rowY[a] * s.rowY[b]
							}
						}
					}
				}
			}
		}
		y0 = y1
	}
}

// Along evaluates H of every unit at the points (x, y[i]); hx and hy take
// [point][unit], A/m.
func (s *HeadSolver) Along(x float64, y []float64, hx, hy []float64) {
	for p, v := range y {
		s.At(x, v, hx[p*s.units:(p+1)*s.units], hy[p*s.units:(p+1)*s.units])
	}
}
