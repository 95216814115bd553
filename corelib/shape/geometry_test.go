package shape

import (
	"math"
	"testing"
)

// plan says whether a point of the plan view, x from post to leg and z in the
// thickness direction, lies in an outer leg or skirt. It is drawn from the
// meaning of the letters and knows no area formula.
func plan(s Shape, x, z float64) bool {
	a, c, e, g := s.A.Mean(), s.C.Mean(), s.E.Mean(), s.G.Mean()
	r := math.Hypot(x, z)
	switch s.Family {
	case E, PlanarE, EFD:
		return math.Abs(x) > e/2 && math.Abs(x) < a/2 && math.Abs(z) < c/2
	case ETD, ER:
		return r > e/2 && math.Abs(x) < a/2 && math.Abs(z) < c/2
	case PQ, EQ:
		return r > e/2 && math.Abs(x) > g/2 && math.Abs(x) < a/2 && math.Abs(z) < c/2
	case P:
		return r > e/2 && r < a/2 && !(math.Abs(z) < s.S.Mean()/2)
	case EP: // the open front is at z = +g; the half circle of the window at z < 0
		inside := math.Abs(x) < a/2 && z < g && z > g-c
		window := r < e/2
		if z > 0 {
			window = math.Abs(x) < e/2
		}
		return inside && !window
	case RM, RMLow: // a square standing on a corner, x along its diagonal through the legs
		square := math.Abs(x)+math.Abs(z) < a/math.Sqrt2
		return square && math.Abs(x) < s.R.Mean()/2 && r > e/2 && math.Abs(math.Atan(z/x)) < math.Acos(g/e)
	}
	return false
}

// The section of the outer legs, counted point by point on a grid of 1200 x 1200
// over the plan, against the closed formulas. An edge along the grid may be off by
// half a cell, 1/1920 of the length of the core; the thinnest leg here has a
// tenth of that length between two edges: 0.5 %, and a little for the others.
func TestOuterLegAreaByCounting(t *testing.T) {
	for _, name := range []string{"ETD 39/20/13", "ER 35/21/11", "E 42/21/15", "EFD 20/10/7", "PQ 26/25", "PQ 50/50", "EQ 25/8/18", "RM 8", "RM 14", "P 26/16", "EP 13", "E 38/8/25"} {
		s, err := Embedded().Find(name)
		if err != nil {
			t.Fatal(err)
		}
		const n = 1200
		size := 1.25 * s.A.Mean()
		cell := size / n
		count := 0
		for i := range n {
			for j := range n {
				if plan(s, (float64(i)+0.5)*cell-size/2, (float64(j)+0.5)*cell-size/2) {
					count++
				}
			}
		}
		counted := float64(count) * cell * cell
		tolerance := 0.006
		if s.Family == P || s.Family == PQ || s.Family == EQ {
			// P: a slot is taken as a straight strip; PQ, EQ: the corner of a leg
			// may lie outside the thickness. Both are small.
			tolerance = 0.012
		}
		if got := s.OuterLegArea(); math.Abs(got/counted-1) > tolerance {
			t.Errorf("%s: OuterLegArea = %.2f mm2, counted %.2f mm2", name, 1e6*got, 1e6*counted)
		}
	}
}

// The arc of a round post that is faced by legs, by looking out in 20,000
// directions from the axis just beyond the edge of the window.
func TestFacedShareByLookingOut(t *testing.T) {
	for _, name := range []string{"ETD 39/20/13", "ER 35/21/11", "PQ 26/25", "EQ 25/8/18", "RM 8", "RM 14", "P 26/16", "EP 13"} {
		s, err := Embedded().Find(name)
		if err != nil {
			t.Fatal(err)
		}
		const n = 20000
		r := s.E.Mean() / 2 * (1 + 1e-9)
		faced := 0
		for i := range n {
			phi := 2 * math.Pi * (float64(i) + 0.5) / n
			x, z := r*math.Cos(phi), r*math.Sin(phi)
			if s.Family == EP && z > 0 {
				// Beside the open front the wall stands at E/2, not on the circle.
				if z < s.G.Mean() {
					faced++
				}
				continue
			}
			if plan(s, x, z) {
				faced++
			}
		}
		want := float64(faced) / n
		if got := s.FacedShare(0); math.Abs(got-want) > 0.001 {
			t.Errorf("%s: FacedShare = %.4f, looking out %.4f", name, got, want)
		}
	}
}

// For an E core the two faced pieces of a turn are exactly as long as the core is
// thick, whatever the distance from the post.
func TestFacedShareOfE(t *testing.T) {
	s, err := Embedded().Find("E 42/21/15")
	if err != nil {
		t.Fatal(err)
	}
	for _, x := range []float64{0, 1e-3, 5e-3} {
		perimeter := 2*(s.F.Mean()+s.C.Mean()) + 2*math.Pi*x
		if got, want := s.FacedShare(x)*perimeter, 2*s.C.Mean(); math.Abs(got/want-1) > 1e-12 {
			t.Errorf("FacedShare(%g) times the turn = %g m, want %g m", x, got, want)
		}
	}
	if s.FacedShare(5e-3) >= s.FacedShare(0) {
		t.Error("an outer turn must have the smaller share inside the core")
	}
}

// The ferrite of an E core is its block less the two windows.
func TestFerriteVolumeOfE(t *testing.T) {
	for _, name := range []string{"E 42/21/15", "E 64/10/50"} {
		s, err := Embedded().Find(name)
		if err != nil {
			t.Fatal(err)
		}
		block := s.Outline().Volume() - 2*s.WindowArea()*s.C.Mean()
		if got := s.FerriteVolume(); math.Abs(got/block-1) > 1e-12 {
			t.Errorf("%s: FerriteVolume = %g, want %g", name, got, block)
		}
	}
}

func TestGeometryIsPossible(t *testing.T) {
	for _, s := range Embedded().Shapes() {
		bare, wound := s.Outline(), s.WoundOutline()
		core, winding := s.Surfaces()
		switch {
		case wound.Length < bare.Length || wound.Width < bare.Width || wound.Height < bare.Height:
			t.Errorf("%s: wound outline %+v is smaller than the bare one %+v", s.Name, wound, bare)
		case s.FerriteVolume() >= bare.Volume():
			t.Errorf("%s: ferrite %g m3 does not go into its outline %g m3", s.Name, s.FerriteVolume(), bare.Volume())
		case s.FerriteVolume() < 0.8*s.Ve:
			t.Errorf("%s: ferrite %g m3 is far below Ve %g m3", s.Name, s.FerriteVolume(), s.Ve)
		case core <= 0 || winding < 0:
			t.Errorf("%s: surfaces %g, %g m2", s.Name, core, winding)
		case s.AreaProduct() <= 0:
			t.Errorf("%s: area product %g m4", s.Name, s.AreaProduct())
		case s.WindowDepthLeast() > s.WindowDepth() || s.WindowBreadthLeast() > s.WindowBreadth():
			t.Errorf("%s: the worst window is larger than the mean one", s.Name)
		}
		for _, x := range []float64{0, s.WindowDepth() / 2, s.WindowDepth()} {
			if share := s.FacedShare(x); !(share > 0 && share < 1) {
				t.Errorf("%s: FacedShare(%g) = %g", s.Name, x, share)
			}
		}
		// No shape has a surface below that of a ball of the volume of its ferrite.
		ball := math.Cbrt(36 * math.Pi * s.FerriteVolume() * s.FerriteVolume())
		if s.Surface() < ball {
			t.Errorf("%s: surface %g m2 is below that of a ball, %g m2", s.Name, s.Surface(), ball)
		}
	}
}

// count returns the area of the plan in which inside holds, on the grid of
// TestOuterLegAreaByCounting.
func count(s Shape, inside func(x, z float64) bool) float64 {
	const n = 1200
	size := 1.25 * s.A.Mean()
	cell := size / n
	hits := 0
	for i := range n {
		for j := range n {
			if inside((float64(i)+0.5)*cell-size/2, (float64(j)+0.5)*cell-size/2) {
				hits++
			}
		}
	}
	return float64(hits) * cell * cell
}

// The back walls of PQ and RM cover legs, the sectors between them and the axis,
// and the post.
func TestPlatesByCounting(t *testing.T) {
	for _, name := range []string{"PQ 26/25", "RM 8"} {
		s, err := Embedded().Find(name)
		if err != nil {
			t.Fatal(err)
		}
		beta := math.Acos(s.G.Mean() / s.E.Mean())
		counted := count(s, func(x, z float64) bool {
			r := math.Hypot(x, z)
			return plan(s, x, z) || r < s.F.Mean()/2 || r < s.E.Mean()/2 && math.Abs(math.Atan(z/x)) < beta
		})
		if got := s.plateArea(); math.Abs(got/counted-1) > 0.006 {
			t.Errorf("%s: plate %.2f mm2, counted %.2f mm2", name, 1e6*got, 1e6*counted)
		}
	}
}

func TestSurfacesAndOutlines(t *testing.T) {
	find := func(name string) Shape {
		s, err := Embedded().Find(name)
		if err != nil {
			t.Fatal(err)
		}
		return s
	}
	near := func(what string, got, want, tolerance float64) {
		t.Helper()
		if math.Abs(got-want) > tolerance*want {
			t.Errorf("%s = %g, want %g", what, got, want)
		}
	}
	// E 42/21/15, by hand: box 42.15 x 14.9 x 42.0 mm, window 30.2 x 30.2 mm in
	// front and back, heads standing out by (30.2 - 11.95)/2 = 9.125 mm.
	e := find("E 42/21/15")
	core, winding := e.Surfaces()
	near("core surface of E 42", 1e6*core, 2*(42.15*14.9+42.15*42+14.9*42)-2*30.2*30.2, 1e-9)
	near("winding surface of E 42", 1e6*winding, 2*(30.2*30.2+2*9.125*(30.2+30.2)), 1e-9)
	o := e.WoundOutline()
	near("wound width of E 42", 1e3*o.Width, 14.9+2*9.125, 1e-9)
	near("volume of E 42", 1e9*e.Volume(), 42.15*33.15*42, 1e-9)

	// ETD 39: the winding is as wide as the window is round; past the plate its
	// end faces show two segments at each end.
	etd := find("ETD 39/20/13")
	near("wound width of ETD 39", 1e3*etd.WoundOutline().Width, 30.1, 1e-9)
	_, winding = etd.Surfaces()
	jacket := (1 - etd.FacedShare(0)) * math.Pi * etd.E.Mean() * etd.WindowBreadth()
	ends := 2 * count(etd, func(x, z float64) bool {
		return math.Hypot(x, z) < etd.E.Mean()/2 && math.Abs(z) > etd.C.Mean()/2
	})
	near("winding surface of ETD 39", winding, jacket+ends, 0.002)

	// P 26/16: a cylinder of 25.5 x 16.1 mm with two slots of 3.8 mm.
	p := find("P 26/16")
	core, winding = p.Surfaces()
	near("surface of P 26", 1e6*(core+winding), math.Pi*(2*12.75*12.75+25.5*16.1), 1e-9)
	near("slots of P 26", 1e6*winding, 2*3.8*11.2, 1e-9)
	if w := p.WoundOutline(); w != p.Outline() {
		t.Errorf("the winding of P 26 stands out: %+v", w)
	}

	// U 25/20/13: windings of half the window, 8.6/2 mm, around both legs.
	u := find("U 25/20/13")
	near("wound length of U 25", 1e3*u.WoundOutline().Length, 24.8+8.6, 1e-9)
	near("wound width of U 25", 1e3*u.WoundOutline().Width, 12.7+8.6, 1e-9)
}
