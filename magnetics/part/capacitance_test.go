package part

import (
	"math"
	"testing"

	"gapwright/corelib/wire"
	"gapwright/magnetics/winding"
)

// TestCapacitancesOfPlates holds foils against the plate capacitor, and layers
// wound back on themselves or not against the closed forms 4 (m-1)/(3 m²) and
// (m-1)/m² of the capacitance between two layers.
func TestCapacitancesOfPlates(t *testing.T) {
	foil := wire.Wire{Kind: wire.Foil, Thickness: 0.1e-3}
	layer := func(entry int, of string, x float64, turns int, w wire.Wire) winding.Layer {
		return winding.Layer{Entry: entry, Of: []string{of}, Turns: turns, Parallel: 1, Wire: w, Length: 60e-3, Rect: winding.Rect{X0: x, X1: x + 0.1e-3, Y0: 0, Y1: 20e-3}}
	}
	c := Construction{
		Windings: []Winding{{Name: "P", Turns: 1}, {Name: "S", Turns: 1}},
		Build:    []winding.Entry{{Kind: winding.Wind}, {Kind: winding.Wind}},
	}
	s := winding.Section{Layers: []winding.Layer{layer(0, "P", 1e-3, 1, foil), layer(1, "S", 1.3e-3, 1, foil)}}
	across, between := Capacitances(c, s)
	// 0.2 mm between the faces.
	if want := 8.8541878188e-12 * coilPermittivity * 60e-3 * 20e-3 / 0.2e-3; math.Abs(between/want-1) > 1e-9 || across != 0 {
		t.Errorf("plates: %g and %g F, want 0 and %g", across, between, want)
	}

	round, err := wire.Parse("0.5 mm grade 2")
	if err != nil {
		t.Fatal(err)
	}
	for _, m := range []int{2, 3, 4} {
		for _, lay := range []string{"C", "Z"} {
			c := Construction{Windings: []Winding{{Name: "P", Turns: 10 * m}}, Build: []winding.Entry{{Kind: winding.Wind, Lay: lay, Layers: m}}}
			var s winding.Section
			for i := range m {
				l := layer(0, "P", float64(i)*0.7e-3, 10, round)
				l.X1 = l.X0 + 0.6e-3
				s.Layers = append(s.Layers, l)
			}
			across, between := Capacitances(c, s)
			d := 0.7e-3 - 2.3*round.OuterDiameter()/2 + 0.26*2e-3
			static := vacuumPermittivity * coilPermittivity * 60e-3 * 20e-3 / d
			want := static * float64(m-1) / float64(m*m)
			if lay == "C" {
				want *= 4. / 3
			}
			if math.Abs(across/want-1) > 1e-9 || between != 0 {
				t.Errorf("%d layers, lay %s: %g F, want %g", m, lay, across, want)
			}
		}
	}
	if a, b := Capacitances(Construction{}, s); a != 0 || b != 0 {
		t.Errorf("no windings: %g %g", a, b)
	}
}
