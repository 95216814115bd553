package field

import (
	"errors"
	"math"
	"strings"
	"testing"
)

func mustSolve(t testing.TB, p *Problem) *Solver {
	t.Helper()
	var s Solver
	if err := s.Solve(p); err != nil {
		t.Fatal(err)
	}
	return &s
}

func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
		t.Errorf("%s = %.12g, want %.12g within %g", what, got, want, tolerance)
	}
}

// threeUnits is a window with margins, sections side by side, and a core.
func threeUnits(radius float64) *Problem {
	core := 600e-6 // H/m, of both windows
	if radius > 0 {
		core = 5e-6
	}
	return &Problem{
		Breadth: 20e-3, Depth: 7e-3, PostRadius: radius, Units: 3, CorePermeance: core, Modes: 128,
		Sources: []Source{
			{Rect: Rect{0.8e-3, 2.2e-3, 2e-3, 18e-3}, Unit: 0, AmpereTurns: 10},
			{Rect: Rect{2.6e-3, 3.4e-3, 2e-3, 9e-3}, Unit: 1, AmpereTurns: 3},
			{Rect: Rect{2.6e-3, 3.4e-3, 11e-3, 18e-3}, Unit: 2, AmpereTurns: 3},
			{Rect: Rect{4e-3, 5.5e-3, 2e-3, 18e-3}, Unit: 0, AmpereTurns: 10},
		},
	}
}

// The energies come from sources times potential; the same as the integral of
// mu0 H_a H_b over the window, evaluated point by point, checks both, and with
// them the reciprocity of the unit solutions.
func TestEnergyIsFieldIntegral(t *testing.T) {
	for name, radius := range map[string]float64{"planar": 0, "round": 6e-3} {
		p := threeUnits(radius)
		s := mustSolve(t, p)
		var xx, yy [9]float64
		volume := p.Depth * p.Breadth
		if radius > 0 {
			volume *= 2 * math.Pi * (radius + p.Depth/2)
		}
		s.Mean(Rect{0, p.Depth, 0, p.Breadth}, mu0*volume, xx[:], yy[:])
		for a := range 3 {
			for b := range 3 {
				// Point values around corners of copper limit the quadrature, the
				// step of the round solution the rest.
				scale := math.Sqrt(s.Energy(a, a) * s.Energy(b, b))
				if got := xx[a*3+b] + yy[a*3+b]; math.Abs(got-s.Energy(a, b)) > 2e-3*scale {
					t.Errorf("%s: integral of H%d H%d = %.8g, energy form %.8g", name, a, b, got, s.Energy(a, b))
				}
			}
		}
	}
}

// H around a conductor encloses its current, anywhere in the window.
func TestAmpere(t *testing.T) {
	for _, radius := range []float64{0, 5e-3} {
		p := threeUnits(radius)
		p.Gaps = []Gap{{10e-3, 0.5e-3}}
		p.PostHalfWidth = 5e-3
		s := mustSolve(t, p)
		x0, x1, y0, y1 := 2.4e-3, 3.7e-3, 1e-3, 10e-3 // around the winding of unit 1
		const n = 4000
		hx, hy := make([]float64, 3), make([]float64, 3)
		sum := make([]float64, 3)
		for i := range n {
			f := (float64(i) + 0.5) / n
			for u, d := range map[float64]float64{x1: 1, x0: -1} {
				s.At(u, y0+f*(y1-y0), hx, hy)
				for a := range sum {
					sum[a] += d * hy[a] * (y1 - y0) / n
				}
			}
			for v, d := range map[float64]float64{y0: 1, y1: -1} {
				s.At(x0+f*(x1-x0), v, hx, hy)
				for a := range sum {
					sum[a] += d * hx[a] * (x1 - x0) / n
				}
			}
		}
		for a, want := range []float64{0, 3, 0} {
			// 128 modes resolve the step of J at the edges of the path to 0.1 %.
			if math.Abs(sum[a]-want) > 5e-3 {
				t.Errorf("radius %g: unit %d encloses %g A, want %g", radius, a, sum[a], want)
			}
		}
	}
}

func TestScaling(t *testing.T) {
	for _, radius := range []float64{0, 6e-3} {
		const k = 3.7
		p := threeUnits(radius)
		p.Gaps, p.PostHalfWidth = []Gap{{9e-3, 0.7e-3}}, 5e-3
		a := mustSolve(t, p)
		big := *p
		big.Breadth, big.Depth, big.PostRadius, big.PostHalfWidth = k*p.Breadth, k*p.Depth, k*p.PostRadius, k*p.PostHalfWidth
		big.Gaps = []Gap{{k * 9e-3, k * 0.7e-3}}
		big.Sources = nil
		for _, s := range p.Sources {
			s.Rect = Rect{k * s.X0, k * s.X1, k * s.Y0, k * s.Y1}
			s.AmpereTurns *= 2 // L ~ N^2
			big.Sources = append(big.Sources, s)
		}
		factor := 4.0 // planar: per metre, no length in it
		if radius > 0 {
			factor *= k
			big.CorePermeance *= k
		}
		b := mustSolve(t, &big)
		for i := range 3 {
			for j := range 3 {
				near(t, "energy", b.Energy(i, j), factor*a.Energy(i, j), 1e-9)
				near(t, "inductance", b.Inductance(i, j), factor*a.Inductance(i, j), 1e-9)
			}
		}
		near(t, "mean square", meanAll(b, big.Sources[1].Rect), meanAll(a, p.Sources[1].Rect)*4/(k*k), 1e-9)
	}
}

func meanAll(s *Solver, r Rect) float64 {
	n := s.Units()
	xx, yy := make([]float64, n*n), make([]float64, n*n)
	s.Mean(r, 1, xx, yy)
	sum := 0.0
	for i := range xx {
		sum += xx[i] + yy[i]
	}
	return sum
}

// Full-breadth layers have the one-dimensional field exactly.
func TestOneDimensionalLimit(t *testing.T) {
	p := &Problem{Breadth: 18e-3, Depth: 6e-3, Units: 1, Sources: []Source{
		{Rect: Rect{0.5e-3, 2.5e-3, 0, 18e-3}, AmpereTurns: 1},
		{Rect: Rect{3.2e-3, 5.4e-3, 0, 18e-3}, AmpereTurns: -1},
	}}
	s := mustSolve(t, p)
	want := Leakage1D(18e-3, []Section1D{{2e-3, 1}, {0.7e-3, 0}, {2.2e-3, -1}})
	near(t, "energy", s.Energy(0, 0)/2, want, 1e-12)
	// (2/3 + 0.7 + 2.2/3) mm: the textbook form.
	near(t, "by hand", want, mu0/(2*18e-3)*(2./3+0.7+2.2/3)*1e-3, 1e-12)
	near(t, "mean square", meanOf(s, p.Sources[0].Rect), 1/(3*18e-3*18e-3), 1e-12)
}

// A large post radius is a planar window; the error falls with depth/radius.
func TestRoundTendsToPlanar(t *testing.T) {
	flat := mustSolve(t, threeUnits(0))
	p := threeUnits(1e3)
	p.CorePermeance = 600e-6 / 2 * 2 * math.Pi * 1e3 // one window of two, per metre
	ring := mustSolve(t, p)
	for i := range 3 {
		for j := range 3 {
			near(t, "energy", ring.Energy(i, j)/(2*math.Pi*1e3), flat.Energy(i, j), 1e-4)
		}
	}
}

// Leakage: the energy of a mode falls as 1/k^4 once the edges of the copper are
// resolved, so that twice the modes leave an eighth of the error; a quarter is
// asked for. Gapped inductance: the tail of the mouth is summed in closed form with
// cos^2 at its place averaged, which leaves 5e-5 whatever the number of modes.
func TestModesConverge(t *testing.T) {
	p := threeUnits(0)
	p.Gaps, p.PostHalfWidth = []Gap{{8e-3, 0.6e-3}}, 5e-3
	at := func(m int) (leakage, inductance float64) {
		q := *p
		q.Modes = m
		s := mustSolve(t, &q)
		return s.Energy(1, 1) - 2*s.Energy(1, 2) + s.Energy(2, 2), s.Inductance(0, 0)
	}
	exactLeakage, exactInductance := at(1024)
	last := math.Inf(1)
	for _, m := range []int{8, 16, 32, 64, 128} {
		w, l := at(m)
		e, el := math.Abs(w/exactLeakage-1), math.Abs(l/exactInductance-1)
		t.Logf("%d modes: leakage %.2e, inductance %.2e", m, e, el)
		if e > 5e-3 || m >= 32 && e > last/4 {
			t.Errorf("%d modes: leakage error %.2e, before %.2e", m, e, last)
		}
		last = e
		if m >= 32 && el > 1e-4 {
			t.Errorf("%d modes: inductance error %.2e", m, el)
		}
	}
	// The block next to the mouth needs M above 1.5 h/s; then it is still.
	r := Rect{0.8e-3, 1.2e-3, 7e-3, 9e-3}
	mouth := func(m int) float64 {
		q := *p
		q.Modes = m
		return meanAll(mustSolve(t, &q), r)
	}
	if d := math.Abs(mouth(64)/mouth(512) - 1); d > 5e-3 {
		t.Errorf("mean square at the mouth moves by %.2e from 64 to 512 modes", d)
	}
}

func TestGapsShareByFlux(t *testing.T) {
	p := threeUnits(0)
	p.PostHalfWidth = 5e-3
	p.Gaps = []Gap{{4e-3, 0.2e-3}, {10e-3, 0.4e-3}, {16e-3, 0.2e-3}}
	s := mustSolve(t, p)
	for u, total := range []float64{20, 3, 3} {
		sum := s.CoreDrop(u)
		for g := range p.Gaps {
			sum -= s.GapDrop(u, g)
		}
		near(t, "sum of the drops", sum, total, 1e-9)
	}
	// Symmetric gaps share alike in a symmetric unit; by length but for what the
	// winding does to the flux along the post and the larger fringing of the
	// longer gap, about 1.93 to 2.
	near(t, "symmetric gaps", s.GapDrop(0, 0), s.GapDrop(0, 2), 1e-9)
	near(t, "double gap", s.GapDrop(0, 1), 2*s.GapDrop(0, 0), 0.06)
	// Least energy: moving drop from one gap to another raises the energy, so
	// the inductance with free sharing is below that of any forced one.
	one := *p
	one.Gaps = []Gap{{10e-3, 0.8e-3}}
	if single := mustSolve(t, &one).Inductance(0, 0); !(s.Inductance(0, 0) < single) {
		t.Errorf("three pieces have %g H, one gap %g H: splitting must cost inductance", s.Inductance(0, 0), single)
	}
}

// With the same ampere-turns in every winding the inductance form does not see
// which rectangle is cut in two.
func TestCutRectanglesChangeNothing(t *testing.T) {
	p := threeUnits(0)
	a := mustSolve(t, p)
	q := *p
	q.Sources = nil
	for _, s := range p.Sources {
		mid, half := (s.X0+s.X1)/2, s
		half.AmpereTurns /= 2
		left, right := half, half
		left.X1, right.X0 = mid, mid
		q.Sources = append(q.Sources, left, right)
	}
	b := mustSolve(t, &q)
	for i := range 3 {
		for j := range 3 {
			near(t, "energy", b.Energy(i, j), a.Energy(i, j), 1e-10)
		}
	}
}

// The head's closed-form energy is the integral of its closed-form field over a
// large box, for currents that cancel.
func TestHeadEnergyIsFieldIntegral(t *testing.T) {
	sources := []Source{
		{Rect: Rect{1e-3, 2e-3, -4e-3, 4e-3}, AmpereTurns: 1},
		{Rect: Rect{3e-3, 5e-3, -4e-3, 4e-3}, AmpereTurns: -1},
	}
	var s HeadSolver
	if err := s.Solve(10e-3, 1, sources); err != nil {
		t.Fatal(err)
	}
	sum := 0.0
	var hx, hy [1]float64
	const n, size = 500, 50e-3
	for i := range n {
		for j := range n {
			x, y := (float64(i)+0.5)/n*size, (float64(j)+0.5)/n*2*size-size
			s.At(x, y, hx[:], hy[:])
			sum += (hx[0]*hx[0] + hy[0]*hy[0]) * (size / n) * (2 * size / n)
		}
	}
	// Midpoints of 0.1 x 0.2 mm and what lies outside of the box: 0.5 %.
	near(t, "energy", s.Energy(0, 0), mu0*sum, 5e-3)
	// Far away a loop pair is a dipole; the unit of length cancels.
	var other HeadSolver
	if err := other.Solve(33e-3, 1, sources); err != nil {
		t.Fatal(err)
	}
	near(t, "energy with another unit", other.Energy(0, 0), s.Energy(0, 0), 1e-9)
}

func TestNoAllocations(t *testing.T) {
	p := fiveLayers()
	q := fiveLayers()
	q.PostRadius = 6e-3
	var s Solver
	var h HeadSolver
	xx, yy := make([]float64, 9), make([]float64, 9)
	work := func() {
		for _, x := range []*Problem{p, q} {
			if err := s.Solve(x); err != nil {
				t.Fatal(err)
			}
			s.Mean(x.Sources[0].Rect, 1, xx, yy)
		}
		if err := h.Solve(p.Breadth, 3, p.Sources); err != nil {
			t.Fatal(err)
		}
		h.Mean(p.Sources[0].Rect, 1, xx, yy)
	}
	work()
	if n := testing.AllocsPerRun(10, work); n != 0 {
		t.Errorf("%g allocations with a used workspace", n)
	}
}

func TestBadProblems(t *testing.T) {
	good := func() Problem { return *threeUnits(0) }
	for name, c := range map[string]struct {
		change func(p *Problem)
		want   string
	}{
		"no breadth":         {func(p *Problem) { p.Breadth = 0 }, "window breadth 0 m"},
		"breadth no number":  {func(p *Problem) { p.Breadth = math.NaN() }, "window breadth NaN m"},
		"negative radius":    {func(p *Problem) { p.PostRadius = -1 }, "post radius -1 m"},
		"source outside":     {func(p *Problem) { p.Sources[3].X1 = 8e-3 }, "rectangle 4, x 0.004 .. 0.008 m"},
		"flat source":        {func(p *Problem) { p.Sources[0].Y1 = p.Sources[0].Y0 }, "rectangle 1"},
		"unit out of range":  {func(p *Problem) { p.Sources[1].Unit = 3 }, "unit solution 3 of 3"},
		"infinite current":   {func(p *Problem) { p.Sources[1].AmpereTurns = math.Inf(1) }, "no number"},
		"gap outside":        {func(p *Problem) { p.PostHalfWidth = 5e-3; p.Gaps = []Gap{{0.1e-3, 0.5e-3}} }, "not inside the window breadth of 0.02 m"},
		"gaps overlap":       {func(p *Problem) { p.PostHalfWidth = 5e-3; p.Gaps = []Gap{{5e-3, 1e-3}, {5.5e-3, 1e-3}} }, "gaps 1 and 2 in the post overlap"},
		"gap without width":  {func(p *Problem) { p.Gaps = []Gap{{5e-3, 1e-3}} }, "half width of the post"},
		"nothing takes them": {func(p *Problem) { p.CorePermeance = 0 }, "unit solution 0 has 20 ampere-turns left over"},
	} {
		p := good()
		c.change(&p)
		var s Solver
		err := s.Solve(&p)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: error %v, want %q", name, err, c.want)
		}
		if name == "nothing takes them" && !errors.Is(err, ErrUnbalanced) {
			t.Errorf("%s: %v is not ErrUnbalanced", name, err)
		}
	}
}

// Odd but legal windows stay finite: hair-thin foils, a deep narrow window, a
// gap over half the breadth, copper on the wall of the gap.
func TestOddWindowsStayFinite(t *testing.T) {
	for _, p := range []Problem{
		{Breadth: 1e-3, Depth: 0.5, Units: 1, CorePermeance: 1e-7, Sources: []Source{{Rect: Rect{0.1, 0.100001, 0, 1e-3}, AmpereTurns: 1}}},
		{Breadth: 0.5, Depth: 1e-3, Units: 1, CorePermeance: 1e-7, Sources: []Source{{Rect: Rect{0.5e-3, 0.6e-3, 0.1, 0.1001}, AmpereTurns: 1}}},
		{Breadth: 20e-3, Depth: 5e-3, Units: 1, PostHalfWidth: 4e-3, Gaps: []Gap{{10e-3, 20e-3}}, Sources: []Source{{Rect: Rect{0, 5e-3, 0, 20e-3}, AmpereTurns: 1}}},
		{Breadth: 20e-3, Depth: 5e-3, PostRadius: 1e-5, Units: 1, Gaps: []Gap{{10e-3, 1e-9}}, Sources: []Source{{Rect: Rect{0, 1e-6, 9e-3, 11e-3}, AmpereTurns: 1e6}}},
	} {
		var s Solver
		if err := s.Solve(&p); err != nil {
			t.Errorf("%+v: %v", p, err)
			continue
		}
		if v := meanOf(&s, p.Sources[0].Rect); math.IsNaN(v) || math.IsInf(v, 0) || v <= 0 {
			t.Errorf("%+v: mean square %g", p, v)
		}
	}
}
