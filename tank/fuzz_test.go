package tank

import (
	"math"
	"testing"
	"time"
)

// Whatever the numbers are: an error or a status, no panic, no NaN, and an end.
func FuzzSolve(f *testing.F) {
	type seed struct {
		kind                                                                       uint8
		n, lr, cr, lm, drop, r, rs, cn, dead, low, high, vin, vout, iout, load, at float64
	}
	for _, s := range []seed{
		{0, 4, 60e-6, 44e-9, 400e-6, 0, 0.1, 0.01, 300e-12, 200e-9, 60e3, 250e3, 390, 48, 8.4, 0, 0},
		{1, 16, 58e-6, 44e-9, 320e-6, 0.7, 0, 0, 0, 0, 30e3, 300e3, 400, 0, 0, 0.6, 78e3},
		{2, 4, 45e-6, 56e-9, 0, 0.7, 1, 1, 1e-9, 1e-7, 30e3, 300e3, 400, 200, 1, 0, 0},
		{5, 1e-3, 1, 1, 1e9, 1e3, 1e6, 1e6, 1, 1e-3, 1e-3, 1e9, 1e-3, 1e9, 1e-9, 0, 0},
		{3, 4, 60e-6, 44e-9, 1e-9, 0, 1e3, 10, 300e-12, 200e-9, 60e3, 250e3, 390, 1e6, 8.4, 0, 0},
		{4, 4, 1e-300, 1e-300, 1e300, 0, 0, 0, 0, 0, 1e-300, 1e300, 1e-300, 0, 0, 1e300, 1},
	} {
		f.Add(s.kind, s.n, s.lr, s.cr, s.lm, s.drop, s.r, s.rs, s.cn, s.dead, s.low, s.high, s.vin, s.vout, s.iout, s.load, s.at)
	}
	f.Fuzz(func(t *testing.T, kind uint8, n, lr, cr, lm, drop, r, rs, cn, dead, low, high, vin, vout, iout, load, at float64) {
		tk := Tank{
			Bridge:     []Bridge{HalfBridge, FullBridge}[kind&1],
			Rectifier:  []Rectifier{CenterTapped, FullBridgeRectifier, VoltageDoubler}[kind/2%3],
			TurnsRatio: n, Lr: lr, Cr: cr, Lm: lm, RectifierDrop: drop, BridgeResistance: r, SecondaryResistance: rs,
			NodeCapacitance: cn, DeadTime: dead, FrequencyMin: low, FrequencyMax: high,
		}
		c := Corner{InputVoltage: vin, OutputVoltage: vout, OutputCurrent: iout, LoadResistance: load, Frequency: at}
		start := time.Now()
		o, err := Solve(tk, c)
		if d := time.Since(start); d > 20*time.Second {
			t.Fatalf("took %v", d)
		}
		if err != nil {
			return
		}
		if o.Status != OK {
			if o.Reason == "" {
				t.Errorf("status %q without a reason", o.Status)
			}
			return
		}
		if !o.finite() {
			t.Errorf("a figure is no number: %+v", o)
		}
		if !(math.Abs(o.EnergyBalance) < 1e-6) {
			t.Errorf("energy balance %g: %+v %+v", o.EnergyBalance, tk, c)
		}
		for _, w := range append(o.SecondaryCurrents, o.ResonantCurrent, o.MagnetizingCurrent, o.CapacitorVoltage, o.MagnetizingVoltage) {
			ts, xs := w.Sample(50)
			for k := range ts {
				if !finite(ts[k], xs[k]) || (k > 0 && ts[k] <= ts[k-1]) {
					t.Fatalf("sample %d: t = %g, x = %g", k, ts[k], xs[k])
				}
			}
		}
	})
}
