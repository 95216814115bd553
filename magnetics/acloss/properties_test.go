package acloss

import (
	"math"
	"math/cmplx"
	"strings"
	"testing"

	"gapwright/magnetics/field"
)

// The closed lattice sums are the images counted one by one.
func TestLatticeSums(t *testing.T) {
	e := Enclosure{Breadth: 3e-3, Depth: 2e-3}
	wires := []Wire{
		{X: 0.5e-3, Y: 0.7e-3, Diameter: 0.4e-3, Current: 1, Length: 1},
		{X: 0.9e-3, Y: 2.1e-3, Diameter: 0.3e-3, Current: 1, Length: 1},
	}
	var c Coupled
	none := func(x, y float64, orders int, into []complex128) { clear(into) }
	if err := c.Prepare(e, wires, 1, 3, none); err != nil {
		t.Fatal(err)
	}
	w := math.Pi / (2 * e.Breadth)
	for _, pair := range [][2]int{{0, 1}, {1, 0}, {0, 0}, {1, 1}} {
		i, j := pair[0], pair[1]
		c.imageSums(e, i, j, 6)
		for f, family := range families {
			for q := 3; q <= 6; q++ { // order 2 converges too slowly to count
				var want complex128
				for m := -80; m <= 80; m++ {
					for n := -80; n <= 80; n++ {
						s := complex(family.x*wires[j].X+2*e.Depth*float64(m)-wires[i].X, family.y*wires[j].Y+2*e.Breadth*float64(n)-wires[i].Y)
						if s == 0 {
							continue
						}
						inverse := 1 / (s * complex(w, 0))
						term := inverse * inverse * inverse
						for range q - 3 {
							term *= inverse
						}
						want += term
					}
				}
				// What lies beyond 80 images is below 80^-2; seen, it is 1e-4.
				if d := cmplx.Abs(c.sums[f][q] - want); d > 2e-4 {
					t.Errorf("wire %d from %d, family %d, order %d: %v, counted %v", j, i, f, q, c.sums[f][q], want)
				}
			}
		}
	}
	// Seen from the other side.
	c.imageSums(e, 0, 1, 6)
	c.turnAround(6)
	var turned [4][]complex128
	for f := range turned {
		turned[f] = append([]complex128(nil), c.sums[f]...)
	}
	c.imageSums(e, 1, 0, 6)
	for f := range turned {
		for q := 2; q <= 6; q++ {
			if cmplx.Abs(turned[f][q]-c.sums[f][q]) > 1e-7*(1+cmplx.Abs(c.sums[f][q])) {
				t.Errorf("family %d order %d turned around: %v, computed %v", f, q, turned[f][q], c.sums[f][q])
			}
		}
	}
}

// pair is a go and return wire near the post plane, far from all other walls.
func pair(breadth, depth float64) []Wire {
	return []Wire{
		{X: 0.5e-3, Y: breadth/2 - 0.4e-3, Diameter: 0.6e-3, Current: 1, Group: 0, Length: 1},
		{X: 0.5e-3, Y: breadth/2 + 0.4e-3, Diameter: 0.6e-3, Current: -1, Group: 1, Length: 1},
	}
}

// A window whose other walls are far away is a winding head: lattice sums and
// single images are different code, and so are their backgrounds.
func TestHeadIsAWideWindow(t *testing.T) {
	wide, deep := 60e-3, 40e-3
	wires := pair(wide, deep)
	p := field.Problem{Breadth: wide, Depth: deep, Units: 1}
	for _, w := range wires {
		source, _ := w.Source()
		p.Sources = append(p.Sources, source)
	}
	var s field.Solver
	if err := s.Solve(&p); err != nil {
		t.Fatal(err)
	}
	none := func(x, y float64, orders int, into []complex128) { clear(into) }
	for _, x := range []float64{0.5, 2, 6} {
		delta := wires[0].Diameter / x
		var closed, open Coupled
		a, b := make([]complex128, 2), make([]complex128, 2)
		if err := closed.Prepare(Enclosure{Breadth: wide, Depth: deep}, wires, 1, 4, s.Background); err != nil {
			t.Fatal(err)
		}
		if err := open.Prepare(Enclosure{Breadth: wide, Depth: deep, Open: true}, wires, 1, 4, none); err != nil {
			t.Fatal(err)
		}
		if err := closed.Loss(delta, copper, a); err != nil {
			t.Fatal(err)
		}
		if err := open.Loss(delta, copper, b); err != nil {
			t.Fatal(err)
		}
		// The far walls act on a pair 0.8 mm apart by (0.8/60)^2.
		if math.Abs(real(a[0])/real(b[0])-1) > 1e-3 {
			t.Errorf("d/delta %g: window %v, head %v", x, a[0], b[0])
		}
	}
}

// Background and CircleBackground are the same field by different routes, where
// there are no wires.
func TestBackgrounds(t *testing.T) {
	p := field.Problem{Breadth: 15e-3, Depth: 5e-3, Units: 2, PostHalfWidth: 4e-3, Gaps: []field.Gap{{Center: 6e-3, Length: 0.5e-3}}, Modes: 256,
		Sources: []field.Source{
			{Rect: field.Rect{X0: 3e-3, X1: 4.5e-3, Y0: 1e-3, Y1: 14e-3}, AmpereTurns: 5},
			{Rect: field.Rect{X0: 1.2e-3, X1: 2e-3, Y0: 9e-3, Y1: 13e-3}, Unit: 1, AmpereTurns: 2},
		}}
	var s field.Solver
	if err := s.Solve(&p); err != nil {
		t.Fatal(err)
	}
	const orders, radius = 4, 0.3e-3
	direct, circle := make([]complex128, 2*orders), make([]complex128, 2*orders)
	for _, at := range [][2]float64{{1.5e-3, 6e-3}, {1.6e-3, 2e-3}, {2.5e-3, 11e-3}} {
		s.Background(at[0], at[1], orders, direct)
		CircleBackground(2, radius, s.At)(at[0], at[1], orders, circle)
		for u := range 2 {
			scale := cmplx.Abs(direct[u*orders])
			for k := range orders {
				// In units of the circle; beside a block in the same slab the series
				// converges as 1/M.
				d := cmplx.Abs(direct[u*orders+k]-circle[u*orders+k]) * math.Pow(radius, float64(k))
				if d > 5e-3*scale {
					t.Errorf("at %v unit %d order %d: %v, from the circle %v", at, u, k+1, direct[u*orders+k], circle[u*orders+k])
				}
			}
		}
	}
}

// twoUnits is a window with wires of two windings, one of them idle in part.
func twoUnits(t testing.TB) *Coupled {
	t.Helper()
	p := field.Problem{Breadth: 6e-3, Depth: 4e-3, Units: 2, PostHalfWidth: 4e-3, Gaps: []field.Gap{{Center: 3e-3, Length: 0.3e-3}}, CorePermeance: 1e-3}
	var wires []Wire
	for l := range 3 {
		for i := range 8 {
			w := Wire{X: 0.8e-3 + float64(l)*0.7e-3, Y: 0.6e-3 + float64(i)*0.65e-3, Diameter: 0.5e-3, Unit: l % 2, Current: 1, Group: l % 2, Length: 1}
			if l == 2 {
				w.Unit, w.Current = 0, 0.5
			}
			wires = append(wires, w)
			source, _ := w.Source()
			p.Sources = append(p.Sources, source)
		}
	}
	var s field.Solver
	if err := s.Solve(&p); err != nil {
		t.Fatal(err)
	}
	c := new(Coupled)
	if err := c.Prepare(Enclosure{Breadth: p.Breadth, Depth: p.Depth}, wires, 2, 2, s.Background); err != nil {
		t.Fatal(err)
	}
	return c
}

func TestFormProperties(t *testing.T) {
	c := twoUnits(t)
	dc := copper / area(0.5e-3)
	// f -> 0 gives DC: only net currents lose, at their DC resistance.
	form := make([]complex128, 8)
	if err := c.Loss(1, copper, form); err != nil {
		t.Fatal(err)
	}
	want := []float64{8 * dc * (1 + 0.25), 0, 0, 8 * dc}
	for i := range want {
		sum := real(form[i] + form[4+i])
		if math.Abs(sum-want[i]) > 1e-9*want[3] {
			t.Errorf("form at DC [%d] = %g, want %g", i, sum, want[i])
		}
	}
	for _, delta := range []float64{0.5e-3, 0.2e-3, 0.05e-3} {
		clear(form)
		if err := c.Loss(delta, copper, form); err != nil {
			t.Fatal(err)
		}
		for g := range 2 {
			f := form[4*g : 4*g+4]
			if cmplx.Abs(f[1]-cmplx.Conj(f[2])) > 1e-9*cmplx.Abs(f[0]) || math.Abs(imag(f[0]))+math.Abs(imag(f[3])) > 1e-9*real(f[0]) {
				t.Errorf("delta %g: the form %v is not Hermitian", delta, f)
			}
			if det := real(f[0])*real(f[3]) - real(f[1])*real(f[1]) - imag(f[1])*imag(f[1]); !(real(f[0]) > 0) || !(real(f[3]) > 0) || !(det > -1e-9*real(f[0])*real(f[3])) {
				t.Errorf("delta %g: the form %v has negative losses", delta, f)
			}
		}
	}
	// The loss at low frequency goes with f^2: four times for half the skin depth squared.
	loss := func(delta float64) float64 {
		clear(form)
		if err := c.Loss(delta, copper, form); err != nil {
			t.Fatal(err)
		}
		return real(form[3]+form[7]) - 8*dc
	}
	// d/delta 0.05 and 0.1: the next term of the series is (d/delta)^4/200.
	if r := loss(5e-3) / loss(10e-3); math.Abs(r-16) > 1e-2 {
		t.Errorf("half the skin depth multiplies the eddy loss by %g, want 16", r)
	}
}

// A wire far from everything but a uniform background is the isolated wire.
func TestIsolatedLimit(t *testing.T) {
	uniform := func(x, y float64, orders int, into []complex128) {
		clear(into)
		into[0] = complex(-3, -4) // |H| = 5 A/m
	}
	wires := []Wire{{X: 0.5, Y: 0.5, Diameter: 1e-3, Unit: -1, Length: 1}}
	var c Coupled
	if err := c.Prepare(Enclosure{Breadth: 1, Depth: 1}, wires, 1, 2, uniform); err != nil {
		t.Fatal(err)
	}
	for _, x := range []float64{0.3, 3, 30} {
		form := make([]complex128, 1)
		if err := c.Loss(1e-3/x, copper, form); err != nil {
			t.Fatal(err)
		}
		if want := copper * RoundTransverse(x) * 25; math.Abs(real(form[0])/2/want-1) > 1e-5 {
			t.Errorf("d/delta %g: %g W/m, isolated %g", x, real(form[0])/2, want)
		}
	}
	var h2 [1]float64
	c.MeanSquare(0, 1, h2[:])
	if math.Abs(h2[0]-25) > 1e-3 {
		t.Errorf("mean square %g, want 25", h2[0])
	}
}

func TestCoupledWorkspace(t *testing.T) {
	p, wires := sixtyWires()
	var s field.Solver
	if err := s.Solve(&p); err != nil {
		t.Fatal(err)
	}
	var c Coupled
	form := make([]complex128, 2)
	background := Background(s.Background)
	work := func() {
		if err := c.Prepare(Enclosure{Breadth: p.Breadth, Depth: p.Depth}, wires, 1, 1, background); err != nil {
			t.Fatal(err)
		}
		if err := c.Loss(0.3e-3, copper, form); err != nil {
			t.Fatal(err)
		}
	}
	work()
	if n := testing.AllocsPerRun(3, work); n != 0 {
		t.Errorf("%g allocations with a used workspace", n)
	}
}

func TestBadWires(t *testing.T) {
	e := Enclosure{Breadth: 5e-3, Depth: 3e-3}
	none := func(x, y float64, orders int, into []complex128) { clear(into) }
	for name, c := range map[string]struct {
		wires []Wire
		want  string
	}{
		"outside":     {[]Wire{{X: 2.9e-3, Y: 1e-3, Diameter: 0.5e-3, Length: 1}}, "wire 1 at 0.0029, 0.001 m"},
		"overlapping": {[]Wire{{X: 1e-3, Y: 1e-3, Diameter: 0.5e-3, Length: 1}, {X: 1.3e-3, Y: 1e-3, Diameter: 0.5e-3, Length: 1}}, "wires 1 and 2"},
		"no diameter": {[]Wire{{X: 1e-3, Y: 1e-3, Length: 1}}, "diameter 0 m"},
		"no number":   {[]Wire{{X: math.NaN(), Y: 1e-3, Diameter: 0.5e-3, Length: 1}}, "NaN"},
		"unit":        {[]Wire{{X: 1e-3, Y: 1e-3, Diameter: 0.5e-3, Unit: 1, Length: 1}}, "unit 1 of 1"},
	} {
		var k Coupled
		if err := k.Prepare(e, c.wires, 1, 1, none); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: error %v, want %q", name, err, c.want)
		}
	}
	var k Coupled
	if err := k.Prepare(e, nil, 1, 0, none); err == nil {
		t.Error("order 0 gave no error")
	}
}

// foilPair is two foils of two windings and a block that balances nothing.
func foilPair() (field.Problem, []Sheet) {
	p := field.Problem{Breadth: 14e-3, Depth: 4e-3, Units: 3, PostHalfWidth: 4e-3, Gaps: []field.Gap{{Center: 6e-3, Length: 0.4e-3}}, CorePermeance: 1e-3,
		Sources: []field.Source{{Rect: field.Rect{X0: 2.5e-3, X1: 3.5e-3, Y0: 1e-3, Y1: 13e-3}, Unit: 2, AmpereTurns: 4}}}
	r := field.Rect{X0: 1e-3, X1: 1.2e-3, Y0: 1e-3, Y1: 13e-3}
	upper := r
	upper.X0, upper.X1 = 1.4e-3, 1.5e-3
	return p, []Sheet{{Rect: r, Unit: 0, Current: 1, Group: 0, Length: 1}, {Rect: upper, Unit: 1, Current: 1, Group: 1, Length: 1}}
}

func TestSheetProperties(t *testing.T) {
	p, sheets := foilPair()
	var s Sheets
	if err := s.Prepare(p, sheets); err != nil {
		t.Fatal(err)
	}
	// f -> 0: the DC resistance of each foil in its own unit, nothing else.
	form := make([]complex128, 2*9)
	if err := s.Loss(1, copper, form); err != nil {
		t.Fatal(err)
	}
	for g, f := range sheets {
		dc := copper / ((f.X1 - f.X0) * (f.Y1 - f.Y0))
		for i := range 9 {
			want := 0.0
			if i == g*4 {
				want = dc
			}
			if cmplx.Abs(form[g*9+i]-complex(want, 0)) > 1e-6*dc {
				t.Errorf("foil %d at DC: form[%d] = %v, want %g", g, i, form[g*9+i], want)
			}
		}
	}
	for _, delta := range []float64{1e-3, 0.2e-3, 0.03e-3} {
		clear(form)
		if err := s.Loss(delta, copper, form); err != nil {
			t.Fatal(err)
		}
		for g := range 2 {
			for a := range 3 {
				for b := range 3 {
					x, y := form[g*9+a*3+b], cmplx.Conj(form[g*9+b*3+a])
					if cmplx.Abs(x-y) > 1e-9*cmplx.Abs(form[g*9]) {
						t.Errorf("delta %g: the form of foil %d is not Hermitian: %v, %v", delta, g, x, y)
					}
				}
				if !(real(form[g*9+a*4]) > 0) {
					t.Errorf("delta %g: foil %d loses %v in unit %d", delta, g, form[g*9+a*4], a)
				}
			}
		}
	}
	work := func() {
		if err := s.Prepare(p, sheets); err != nil {
			t.Fatal(err)
		}
		if err := s.Loss(0.2e-3, copper, form); err != nil {
			t.Fatal(err)
		}
	}
	if n := testing.AllocsPerRun(2, work); n != 0 {
		t.Errorf("%g allocations with a used workspace", n)
	}
	if err := s.Prepare(p, []Sheet{{Rect: sheets[0].Rect, Unit: 3, Length: 1}}); err == nil || !strings.Contains(err.Error(), "unit 3 of 3") {
		t.Errorf("a foil of no unit: %v", err)
	}
	if err := s.Loss(math.NaN(), copper, form); err == nil {
		t.Error("a skin depth of NaN gave no error")
	}
}

// A window with all other walls far away is a head, also for foils.
func TestSheetsHeadIsAWideWindow(t *testing.T) {
	r := field.Rect{X0: 0.8e-3, X1: 1e-3, Y0: 25e-3, Y1: 33e-3}
	block := field.Source{Rect: field.Rect{X0: 1.5e-3, X1: 2.5e-3, Y0: 25e-3, Y1: 33e-3}, AmpereTurns: -1}
	sheets := []Sheet{{Rect: r, Current: 1, Length: 1}}
	var window, head Sheets
	if err := window.Prepare(field.Problem{Breadth: 60e-3, Depth: 50e-3, Units: 1, Modes: 512, Sources: []field.Source{block}}, sheets); err != nil {
		t.Fatal(err)
	}
	if err := head.PrepareHead(60e-3, 1, []field.Source{block}, sheets); err != nil {
		t.Fatal(err)
	}
	for _, delta := range []float64{0.5e-3, 0.15e-3} {
		var a, b [1]complex128
		if err := window.Loss(delta, copper, a[:]); err != nil {
			t.Fatal(err)
		}
		if err := head.Loss(delta, copper, b[:]); err != nil {
			t.Fatal(err)
		}
		// Modes resolve the strips at the ends of the foil to 0.2 %.
		if math.Abs(real(a[0])/real(b[0])-1) > 5e-3 {
			t.Errorf("delta %g: window %v, head %v", delta, a[0], b[0])
		}
	}
}

// A layer as one rectangle marked Wire gives the same loss as its turns one by
// one: only the mean field and the sharing of the gap mmf come from it.
func TestLayerRectangleOrTurns(t *testing.T) {
	layer := field.Rect{X0: 1e-3, X1: 1.56e-3, Y0: 1e-3, Y1: 9e-3}
	wires := AppendLayer(nil, layer, 14, Wire{Diameter: 0.5e-3, Current: 1, Length: 1})
	wires = AppendLayer(wires, field.Rect{X0: 1.56e-3, X1: 2.12e-3, Y0: 1e-3, Y1: 9e-3}, 14, Wire{Diameter: 0.5e-3, Current: 1, Length: 1}, 0, -1)
	idle := 0
	for _, w := range wires {
		if w.Unit < 0 {
			idle++
		}
	}
	if idle != 7 || len(wires) != 28 || math.Abs(wires[0].Y-(1e-3+8e-3/28)) > 1e-12 {
		t.Fatalf("%d wires, %d idle, first at %g", len(wires), idle, wires[0].Y)
	}
	p := field.Problem{Breadth: 10e-3, Depth: 4e-3, Units: 1, PostHalfWidth: 4e-3, Gaps: []field.Gap{{Center: 5e-3, Length: 0.4e-3}}}
	single, whole := p, p
	for _, w := range wires {
		if s, ok := w.Source(); ok {
			single.Sources = append(single.Sources, s)
		}
	}
	half := EquivalentSquare(0.5e-3) / 2
	for i, x := range []float64{1.28e-3, 1.84e-3} {
		whole.Sources = append(whole.Sources, field.Source{Rect: field.Rect{X0: x - half, X1: x + half, Y0: 1e-3, Y1: 9e-3}, AmpereTurns: 14 / float64(1+i), Wire: true})
	}
	var loss [2]float64
	for i, q := range []*field.Problem{&single, &whole} {
		var s field.Solver
		if err := s.Solve(q); err != nil {
			t.Fatal(err)
		}
		var c Coupled
		if err := c.Prepare(Enclosure{Breadth: 10e-3, Depth: 4e-3}, wires, 1, 2, s.Background); err != nil {
			t.Fatal(err)
		}
		var form [1]complex128
		if err := c.Loss(0.2e-3, copper, form[:]); err != nil {
			t.Fatal(err)
		}
		loss[i] = real(form[0])
	}
	if math.Abs(loss[0]/loss[1]-1) > 1e-3 {
		t.Errorf("turns one by one %g, as layers %g", loss[0], loss[1])
	}
}
