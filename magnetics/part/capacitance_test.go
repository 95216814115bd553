package part

import (
	"encoding/csv"
	"math"
	"os"
	"path/filepath"
	"strconv"
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
			d := 0.7e-3 - 2.3*round.Diameter/2 + 0.26*2e-3
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

// TestRowsAgainstFieldSolution holds the plates that stand for rows of round
// wires against a solution of the rows themselves. 6 %: the rule's own error where
// the rows nearly touch, twice what it is elsewhere; between aligned and
// staggered rows, whose mean is taken, it cannot tell.
func TestRowsAgainstFieldSolution(t *testing.T) {
	f, err := os.Open(filepath.Join("..", "..", "testdata", "capacitance", "rows.csv"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	for _, row := range rows[1:] {
		var x [4]float64
		for i := range x {
			if x[i], err = strconv.ParseFloat(row[i], 64); err != nil {
				t.Fatal(err)
			}
		}
		got := x[1] - 2*rowInset(x[0], 1)
		if want := (x[2] + x[3]) / 2; math.Abs(got/want-1) > 0.06 {
			t.Errorf("rows of radius %g p at %g p count as plates at %.4f p, want %.4f", x[0], x[1], got, want)
		}
	}
}

// TestCopperRadius: what is wound around the copper does not bring it nearer.
func TestCopperRadius(t *testing.T) {
	for _, text := range []string{"0.5 mm grade 2", "60 x 0.1 mm litz", "60 x 0.1 mm litz, single serving", "60 x 0.1 mm litz, single serving, triple-insulated"} {
		w, err := wire.Parse(text)
		if err != nil {
			t.Fatal(err)
		}
		r := copperRadius(w)
		if !(r < w.OuterDiameter()/2) {
			t.Errorf("%s: copper radius %g of an outer one of %g m", text, r, w.OuterDiameter()/2)
		}
		if w.Kind == wire.Litz {
			plain, _ := wire.Parse("60 x 0.1 mm litz")
			if math.Abs(r-copperRadius(plain)) > 1e-9 {
				t.Errorf("%s: copper radius %g, without serving %g m", text, r, copperRadius(plain))
			}
		}
	}
}
