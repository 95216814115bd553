package tank

import (
	"math"
	"math/rand/v2"
	"testing"
)

// The curve of the output goes through every corner that was solved by itself,
// exact and in the first harmonic.
func TestGainGoesThroughCorners(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	for range 40 {
		tk, c := randomTank(r, false)
		tk.FrequencyMin, tk.FrequencyMax = c.Frequency, 2*c.Frequency
		o, err := Solve(tk, c)
		if err != nil || o.Status != OK {
			t.Fatalf("corner: %v, %s", err, o.Reason)
		}
		list, err := Gain(tk, c.InputVoltage, c.LoadResistance, 12)
		if err != nil || len(list) != 12 {
			t.Fatalf("%d points, %v", len(list), err)
		}
		// Both stop Newton at the same residual; 1e-8 leaves room for the other start.
		if p := list[0]; math.Abs(p.Output/o.OutputVoltage-1) > 1e-8 || math.Abs(p.FirstHarmonic/o.FirstHarmonic.OutputVoltage-1) > 1e-8 {
			t.Errorf("at %g Hz the curve has %g and %g V, the corner %g and %g V", c.Frequency, p.Output, p.FirstHarmonic, o.OutputVoltage, o.FirstHarmonic.OutputVoltage)
		}
		for k := 1; k < len(list); k++ {
			if list[k].Frequency <= list[k-1].Frequency {
				t.Fatalf("frequencies not in order: %g after %g", list[k].Frequency, list[k-1].Frequency)
			}
		}
	}
	if _, err := Gain(Tank{}, 1, 1, 5); err == nil {
		t.Error("an empty tank has a gain")
	}
}

// Without losses the gain at resonance is 1 for every load: the textbook's
// point that all curves share.
func TestUnitGainAtResonance(t *testing.T) {
	for _, rect := range []Rectifier{CenterTapped, FullBridgeRectifier, VoltageDoubler} {
		for _, bridge := range []Bridge{HalfBridge, FullBridge} {
			tk := Tank{Bridge: bridge, Rectifier: rect, TurnsRatio: 4, Lr: 60e-6, Cr: 44e-9, Lm: 400e-6}
			tk.FrequencyMin = tk.ResonantFrequency()
			tk.FrequencyMax = 2 * tk.FrequencyMin
			for _, load := range []float64{3, 6, 20} {
				list, err := Gain(tk, 390, load, 3)
				if err != nil {
					t.Fatal(err)
				}
				if g := list[0].FirstHarmonic / tk.UnitGain(390); math.Abs(g-1) > 1e-9 {
					t.Errorf("%s, %s, %g ohm: first-harmonic gain %.9f at resonance", bridge, rect, load, g)
				}
				if g := list[0].Output / tk.UnitGain(390); math.Abs(g-1) > 1e-9 {
					t.Errorf("%s, %s, %g ohm: exact gain %.9f at resonance", bridge, rect, load, g)
				}
			}
		}
	}
}

// The bridge is at its rail for all of the half period but the dead time, and
// goes from one to the other within it.
func TestBridgeVoltage(t *testing.T) {
	tk := Tank{
		Bridge: HalfBridge, Rectifier: CenterTapped, TurnsRatio: 4, Lr: 60e-6, Cr: 44e-9, Lm: 400e-6, BridgeResistance: 0.12,
		PrimaryResistance: 0.1, SecondaryResistance: 4e-3, NodeCapacitance: 300e-12, DeadTime: 200e-9, FrequencyMin: 60e3, FrequencyMax: 250e3,
	}
	for _, dead := range []float64{0, 200e-9} {
		tk.DeadTime = dead
		o, err := Solve(tk, Corner{Name: "nominal", InputVoltage: 390, OutputVoltage: 48, OutputCurrent: 8.4})
		if err != nil || o.Status != OK {
			t.Fatal(err, o.Reason)
		}
		u := o.BridgeVoltage(tk)
		period := u.Period
		for k := range 400 {
			at := dead + (period/2-2*dead)*(float64(k)+0.5)/400
			// The derivative of a polynomial of degree 16 loses a few digits.
			if v := u.At(at); math.Abs(v-195) > 1e-6*195 {
				t.Fatalf("dead time %g s: %g V at %g s, not 195 V", dead, v, at)
			}
		}
		if v := u.At(0); dead > 0 && math.Abs(v) > 1 {
			t.Errorf("%g V in the middle of the edge", v)
		}
	}
}
