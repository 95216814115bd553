package acloss

import (
	"fmt"
	"math"
	"math/cmplx"

	"gapwright/magnetics/field"
)

// A Sheet is one turn of foil in a closed winding window.
type Sheet struct {
	field.Rect
	Unit    int     // unit solution whose current it carries; below 0: idle
	Current float64 // A, net peak current per ampere of that unit
	Group   int     // its loss is added to this group
	Length  float64 // m, of the turn; 1 for loss per metre
}

// Sheets solves the eddy currents of all foils of a window, or of a winding
// head, together. The
// current of a foil spreads over its breadth as the field normal to it
// demands, which matters at the ends of a foil and rules beside a gap: there a
// slab in the local field alone is up to ten times low.
//
// Every foil is cut along its breadth into strips with unknown currents that
// add up to the foil's own. Across its thickness a strip is a slab: with
// gamma = (1+j)/delta its mean face field strength is
// E = (rho gamma/2) coth(gamma t/2) K at the sheet current K, and the mean of the
// tangential fields adds the slab's second loss term. The strips' inductances
// are those of the field kernel, gaps and core included.
//
// Against finite elements: within 1 % with margins, 0 to 4 % low beside a gap. What the
// eddy currents of round wires in the same window do to the field is not seen.
type Sheets struct {
	window field.Solver
	head   field.HeadSolver
	sheets []Sheet
	strips []strip
	per    int       // strips of each foil
	turn   []float64 // m, that the inductances are for; per foil
	units  int
	groups int

	inductance []float64    // [strip][strip]
	drive      []float64    // [unit][strip], of the other conductors
	tangential []float64    // [strip][unit + strips], H_y at the middle of the foil
	matrix     []complex128 // lower triangle
	currents   []complex128 // [unit][strip]
	columns    []complex128 // [foil][strip]
	small      []complex128
	mean       []complex128
	hx, y      []float64
	sources    []field.Source
}

type strip struct {
	sheet  int
	y0, y1 float64
}

// mostStrips bounds the unknowns; a foil gets from 16 to 32 of them. Twice as many
// move the loss by 0.1 %.
const mostStrips = 128

// Prepare sets up the foils of the window p, whose sources are all other
// conductors.
func (s *Sheets) Prepare(p field.Problem, sheets []Sheet) error {
	sources, err := s.cut(p.Sources, p.Units, sheets)
	if err != nil {
		return err
	}
	p.Sources = sources
	p.Units += len(s.strips)
	if len(p.Gaps)+len(p.OuterGaps) == 0 && p.CorePermeance == 0 {
		// The ampere-turns of one strip must go somewhere; those of all add up to
		// none, so that the value does not matter.
		p.CorePermeance = 1e3 * mu0
		if p.PostRadius > 0 {
			p.CorePermeance *= p.PostRadius
		}
	}
	if p.Modes == 0 {
		p.Modes = max(field.ModesFor(&p), 96)
	}
	if err := s.window.Solve(&p); err != nil {
		return err
	}
	s.turn = growReal(s.turn, len(sheets))
	for i, f := range sheets {
		s.turn[i] = 1
		if p.PostRadius > 0 {
			// The kernel's inductances are those of whole rings.
			s.turn[i] = 2 * math.Pi * (p.PostRadius + (f.X0+f.X1)/2)
		}
	}
	s.load(&s.window, s.window.Inductance)
	return nil
}

// PrepareHead sets up the foils of a winding head among other sources.
func (s *Sheets) PrepareHead(breadth float64, units int, others []field.Source, sheets []Sheet) error {
	sources, err := s.cut(others, units, sheets)
	if err != nil {
		return err
	}
	if err := s.head.Solve(breadth, units+len(s.strips), sources); err != nil {
		return err
	}
	s.turn = growReal(s.turn, len(sheets))
	for i := range sheets {
		s.turn[i] = 1
	}
	s.load(&s.head, s.head.Energy)
	return nil
}

// cut makes the strips and returns them as sources behind the others.
func (s *Sheets) cut(others []field.Source, units int, sheets []Sheet) ([]field.Source, error) {
	s.sheets = append(s.sheets[:0], sheets...)
	s.units, s.groups = units, 0
	s.per = min(max(mostStrips/max(len(sheets), 1), 16), 32)
	s.strips = s.strips[:0]
	sources := append(s.sources[:0], others...)
	for i, f := range sheets {
		if !(f.X1 > f.X0) || !(f.Y1 > f.Y0) || !(f.Length > 0) || f.Unit >= units || f.Group < 0 {
			return nil, fmt.Errorf("foil %d: x %g .. %g m, y %g .. %g m, length %g m, unit %d of %d, group %d", i+1, f.X0, f.X1, f.Y0, f.Y1, f.Length, f.Unit, units, f.Group)
		}
		s.groups = max(s.groups, f.Group+1)
		for k := range s.per {
			r := f.Rect
			r.Y0, r.Y1 = f.Y0+(f.Y1-f.Y0)*graded(k, s.per), f.Y0+(f.Y1-f.Y0)*graded(k+1, s.per)
			sources = append(sources, field.Source{Rect: r, Unit: units + len(s.strips), AmpereTurns: 1})
			s.strips = append(s.strips, strip{i, r.Y0, r.Y1})
		}
	}
	s.sources = sources
	return sources, nil
}

// load takes the inductances and the tangential fields from the kernel.
func (s *Sheets) load(k Sampler, inductance func(a, b int) float64) {
	n, u := len(s.strips), s.units
	total := n + u
	s.inductance = growReal(s.inductance, n*n)
	s.drive = growReal(s.drive, u*n)
	s.tangential = growReal(s.tangential, n*total)
	s.matrix = growComplex(s.matrix, n*n)
	s.currents = growComplex(s.currents, u*n)
	s.columns = growComplex(s.columns, len(s.sheets)*n)
	s.small = growComplex(s.small, len(s.sheets)*(len(s.sheets)+u))
	for a := range n {
		for b := range n {
			s.inductance[a*n+b] = inductance(u+a, u+b)
		}
		for v := range u {
			s.drive[v*n+a] = inductance(v, u+a)
		}
	}
	// Strips of one foil are consecutive: one row of points each.
	s.hx, s.y = growReal(s.hx, s.per*total), growReal(s.y, s.per)
	hx, y := s.hx, s.y
	for i, f := range s.sheets {
		for j := range y {
			y[j] = (s.strips[i*s.per+j].y0 + s.strips[i*s.per+j].y1) / 2
		}
		k.Along((f.X0+f.X1)/2, y, hx, s.tangential[i*s.per*total:(i+1)*s.per*total])
	}
}

// graded places the edges of strips: closer towards both ends of the foil,
// where the current crowds.
func graded(k, n int) float64 {
	x := float64(k) / float64(n)
	return 0.25*x + 0.75*(1-math.Cos(math.Pi*x))/2
}

// Loss adds, per group, the resistance form of one frequency to form,
// [group][unit][unit]: peak unit currents I lose I^H R I/2, W (per metre when the
// lengths are 1).
func (s *Sheets) Loss(delta, rho float64, form []complex128) error {
	if !(delta > 0) || !(rho > 0) {
		return fmt.Errorf("foils: skin depth %g m, resistivity %g ohm m", delta, rho)
	}
	if len(form) < s.groups*s.units*s.units {
		panic("acloss: form is too short")
	}
	n, nf := len(s.strips), len(s.sheets)
	if n == 0 {
		return nil
	}
	// omega mu0 = 2 rho/delta^2; the inductances hold mu0.
	omega := 2 * rho / (delta * delta) / mu0
	for a := range n {
		row := s.matrix[a*n : a*n+a+1]
		for b := range row {
			row[b] = complex(0, omega*s.inductance[a*n+b])
		}
		st := s.strips[a]
		f := &s.sheets[st.sheet]
		row[a] += impedance(f.X1-f.X0, delta, rho) * complex(s.turn[st.sheet]/(st.y1-st.y0), 0)
	}
	if err := factorSymmetric(s.matrix, n); err != nil {
		return fmt.Errorf("foils: %w", err)
	}
	// Columns: the strip currents of 1 V in one foil.
	clear(s.columns)
	for a := range n {
		s.columns[s.strips[a].sheet*n+a] = 1
	}
	for i := range nf {
		solveSymmetric(s.matrix, n, s.columns[i*n:(i+1)*n])
	}
	for u := range s.units {
		x := s.currents[u*n : (u+1)*n]
		for a := range x {
			x[a] = complex(0, -omega*s.drive[u*n+a])
		}
		solveSymmetric(s.matrix, n, x)
	}
	// The voltages that make the currents of every foil right.
	w := nf + s.units
	clear(s.small)
	for a := range n {
		row := s.small[s.strips[a].sheet*w:]
		for i := range nf {
			row[i] += s.columns[i*n+a]
		}
		for u := range s.units {
			row[nf+u] -= s.currents[u*n+a]
		}
	}
	for i, f := range s.sheets {
		if f.Unit >= 0 {
			s.small[i*w+nf+f.Unit] += complex(f.Current, 0)
		}
	}
	if err := eliminate(s.small, nf, w); err != nil {
		return fmt.Errorf("foils: %w", err)
	}
	for u := range s.units {
		for i := range nf {
			v := s.small[i*w+nf+u]
			for a := range n {
				s.currents[u*n+a] += v * s.columns[i*n+a]
			}
		}
	}
	s.addLosses(delta, rho, form)
	for _, v := range form {
		if cmplx.IsNaN(v) || cmplx.IsInf(v) {
			return fmt.Errorf("foils: the loss at skin depth %g m is not finite", delta)
		}
	}
	return nil
}

// impedance is the mean face field strength per sheet current.
func impedance(t, delta, rho float64) complex128 {
	x := complex(1, 1) * complex(t/(2*delta), 0)
	if cmplx.Abs(x) < 1e-4 {
		return complex(rho/t, 0)
	}
	coth := complex128(1)
	if real(x) < thickSlab {
		coth = 1 / cmplx.Tanh(x)
	}
	return complex(2*rho/t, 0) / 2 * x * coth
}

// addLosses evaluates the slab of every strip. With K = Hb - Ha and the mean
// field Hm the slab's loss per face is
// rho/(2t) [(2 G1 - 4 G2) |Hm|^2 + (G1/2 + G2) |K|^2].
func (s *Sheets) addLosses(delta, rho float64, form []complex128) {
	n, u := len(s.strips), s.units
	s.mean = growComplex(s.mean, u)
	mean := s.mean
	for a := range n {
		st := s.strips[a]
		f := &s.sheets[st.sheet]
		t, width := f.X1-f.X0, st.y1-st.y0
		g1, g2 := Slab(t / delta)
		h := s.tangential[a*(u+n) : (a+1)*(u+n)]
		for v := range u {
			sum := complex(h[v], 0)
			for b := range n {
				sum += complex(h[u+b], 0) * s.currents[v*n+b]
			}
			mean[v] = sum
		}
		scale := rho / t * width * f.Length
		out := form[f.Group*u*u:]
		for v := range u {
			kv := cmplx.Conj(s.currents[v*n+a]) / complex(width, 0)
			mv := cmplx.Conj(mean[v])
			for w := range u {
				kw := s.currents[w*n+a] / complex(width, 0)
				out[v*u+w] += complex(scale*(2*g1-4*g2), 0)*mv*mean[w] + complex(scale*(g1/2+g2), 0)*kv*kw
			}
		}
	}
}
