package part

import (
	"math"
	"math/cmplx"
	"testing"

	"gapwright/corelib/wire"
)

// TestResistances: the matrices give back the loss that the rating computes with
// phases and harmonics as they come, direct current meets the wire's own
// resistance, and no direction of the currents gains energy.
func TestResistances(t *testing.T) {
	for _, wires := range [][2]string{{"60 x 0.1 mm litz", "200 x 0.1 mm litz"}, {"0.3 mm grade 2", "1.0 mm grade 2"}, {"60 x 0.1 mm litz", "0.1 mm foil"}} {
		tr := sandwich(t, 32, 8, wires[0], wires[1])
		c := coilOf(t, tr)
		const f, temperature, orders = 100e3, 100.0, 9
		r, err := c.Resistances(f, temperature, orders, 0)
		if err != nil {
			t.Fatal(err)
		}
		hot := wire.Resistivity(temperature) / wire.Resistivity(20)
		for w, name := range []string{"P", "S"} {
			dc := 0.0
			for _, l := range c.section.Layers {
				if l.Of[0] == name {
					dc += hot * l.Wire.ResistancePerLength(20) * float64(l.Turns) * l.Length
				}
			}
			if math.Abs(r[0][w][w]/dc-1) > 1e-9 || math.Abs(r[0][0][1]) > 1e-12*dc {
				t.Errorf("%s: direct current through %s meets %v, want %g", wires, name, r[0], dc)
			}
		}
		var s Solvers
		m, err := s.solve(&c.geometry, c.Construction.Core.Gap, c.mu(hotTemperature), 0, true)
		if err != nil {
			t.Fatal(err)
		}
		last := -1.0
		for k := 1; k <= orders; k += 4 {
			d := sine(float64(k)*f, cmplx.Rect(3, 0.3), cmplx.Rect(11, -2.9))
			table := c.table(&m, &d)
			if _, _, err := s.couple(&c.geometry, c.Construction.Core.Gap, c.mu(hotTemperature), 0, &d, &table); err != nil {
				t.Fatal(err)
			}
			if _, _, err := s.coupleFoils(&c.geometry, c.Construction.Core.Gap, c.mu(hotTemperature), 0, &d, &table); err != nil {
				t.Fatal(err)
			}
			want := sumOf(table.loss(temperature, s.factors(), nil))
			got := 0.0
			for a := range 2 {
				for b := range 2 {
					got += r[k][a][b] * real(cmplx.Conj(d.Phasors[a][1])*d.Phasors[b][1]) / 2
				}
			}
			// 2 %: wires and foils that are solved together are so at an order of
			// multipoles that the frequency chooses, and one drive chooses once.
			if math.Abs(got/want-1) > 0.02 {
				t.Errorf("%s at %g Hz: %g W from the matrix, %g W from the rating", wires, float64(k)*f, got, want)
			}
			if det := r[k][0][0]*r[k][1][1] - r[k][0][1]*r[k][1][0]; det < 0 || r[k][0][0] < last {
				t.Errorf("%s at order %d: %v gains energy or falls with frequency", wires, k, r[k])
			}
			last = r[k][0][0]
		}
	}
}

// TestResistancesAreSimilar: with the frequency in step with the resistivity the
// currents spread alike, and every resistance is in step too. The permeability is
// that of one temperature, so this is exact but for rounding.
func TestResistancesAreSimilar(t *testing.T) {
	for _, wires := range [][2]string{{"60 x 0.1 mm litz", "200 x 0.1 mm litz"}, {"0.3 mm grade 2", "1.0 mm grade 2"}, {"60 x 0.1 mm litz", "0.05 mm foil"}} {
		c := coilOf(t, sandwich(t, 32, 8, wires[0], wires[1]))
		const f, orders = 100e3, 5
		hot, err := c.Resistances(f, hotTemperature, orders, 0)
		if err != nil {
			t.Fatal(err)
		}
		step := wire.Resistivity(40) / wire.Resistivity(hotTemperature)
		cool, err := c.Resistances(f*step, 40, orders, 0)
		if err != nil {
			t.Fatal(err)
		}
		for k := range hot {
			for a := range 2 {
				for b := range 2 {
					if size := math.Sqrt(hot[k][a][a] * hot[k][b][b]); math.Abs(cool[k][a][b]-step*hot[k][a][b]) > 1e-9*size {
						t.Errorf("%s: R[%d][%d][%d] is %g cool, want %g", wires, k, a, b, cool[k][a][b], step*hot[k][a][b])
					}
				}
			}
		}
	}
}
