package tank

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// between returns a number spread evenly over the logarithm of lo..hi.
func between(r *rand.Rand, lo, hi float64) float64 {
	return lo * math.Pow(hi/lo, r.Float64())
}

// randomTank draws a tank and a corner with given frequency and load.
func randomTank(r *rand.Rand, harsh bool) (Tank, Corner) {
	qLow, qHigh, mLow, mHigh, fLow, fHigh := 0.1, 1.2, 2.5, 80.0, 0.55, 1.9
	if harsh {
		qLow, qHigh, mLow, mHigh, fLow, fHigh = 0.005, 6, 1.2, 300, 0.25, 4
	}
	vin, vout, power := between(r, 36, 800), between(r, 5, 600), between(r, 20, 5000)
	fr := between(r, 40e3, 1.2e6)
	t := Tank{
		Bridge:       []Bridge{HalfBridge, FullBridge}[r.IntN(2)],
		Rectifier:    []Rectifier{CenterTapped, FullBridgeRectifier, VoltageDoubler}[r.IntN(3)],
		FrequencyMin: fr / 10,
		FrequencyMax: fr * 10,
	}
	kv, _, ki := t.Rectifier.constants()
	vb := t.bridgeVoltage(vin)
	t.TurnsRatio = vb / (kv * vout)
	full := vout * vout / power
	re := 8 / (math.Pi * math.Pi) * t.TurnsRatio * t.TurnsRatio * kv * ki * full
	z := between(r, qLow, qHigh) * re
	t.Lr = z / (2 * math.Pi * fr)
	t.Cr = 1 / (2 * math.Pi * fr * z)
	t.Lm = t.Lr * between(r, mLow, mHigh)
	if r.IntN(3) > 0 {
		loss := func() float64 { return z * 0.02 * r.Float64() }
		t.BridgeResistance, t.PrimaryResistance = loss()/2, loss()/2
		t.SecondaryResistance = loss() / (t.TurnsRatio * t.TurnsRatio)
		t.RectifierDrop = vout * 0.02 * r.Float64()
	}
	share := between(r, 0.05, 1)
	return t, Corner{Name: "random", InputVoltage: vin, Frequency: fr * between(r, fLow, fHigh), LoadResistance: full / share}
}

// Two sets of 500 tanks, the ordinary one of the range that is built and a harsh
// one around it: all have a steady state, and all of them are found.
func TestRandomTanksConverge(t *testing.T) {
	for _, set := range []struct {
		name  string
		harsh bool
	}{{"ordinary", false}, {"harsh", true}} {
		t.Run(set.name, func(t *testing.T) {
			r := rand.New(rand.NewPCG(1, 2))
			var iterations []int
			worstBalance, worstResidual := 0.0, 0.0
			for n := range 500 {
				tk, c := randomTank(r, set.harsh)
				o := mustSolve(t, tk, c)
				if o.Status != OK {
					t.Errorf("tank %d: %s: %s\n%+v\n%+v", n, o.Status, o.Reason, tk, c)
					continue
				}
				iterations = append(iterations, o.Iterations)
				worstBalance = math.Max(worstBalance, math.Abs(o.EnergyBalance))
				worstResidual = math.Max(worstResidual, o.Residual)
				if math.Abs(o.EnergyBalance) > 1e-9 {
					t.Errorf("tank %d: energy balance %g, want below 1e-9", n, o.EnergyBalance)
				}
			}
			slices.Sort(iterations)
			k := len(iterations)
			t.Logf("half periods followed: median %d, 95 %% %d, worst %d; energy balance %.2g, residual %.2g at worst",
				iterations[k/2], iterations[k*95/100], iterations[k-1], worstBalance, worstResidual)
		})
	}
}

func BenchmarkSolve(b *testing.B) {
	var file referenceFile
	readJSON(b, "points.json", &file)
	for _, p := range file.SteadyState {
		b.Run("point="+p.ID, func(b *testing.B) {
			b.ReportAllocs()
			tk := p.Inputs.tank()
			c := Corner{Name: p.ID, InputVoltage: p.Inputs.Vin, Frequency: p.Inputs.Fsw, LoadResistance: p.Rload}
			var o Operation
			for b.Loop() {
				o, _ = Solve(tk, c)
			}
			b.ReportMetric(float64(o.Iterations), "half-periods")
		})
	}
}

func BenchmarkSearch(b *testing.B) {
	var file struct{ Points []cornerPoint }
	readJSON(b, "corners.json", &file)
	for _, p := range file.Points {
		b.Run("corner="+p.ID, func(b *testing.B) {
			b.ReportAllocs()
			tk := p.Inputs.tank()
			tk.FrequencyMin, tk.FrequencyMax = p.SearchFmin, p.SearchFmax
			c := Corner{Name: p.ID, InputVoltage: p.Vin, OutputVoltage: p.VoutRequired, OutputCurrent: p.Iout}
			var o Operation
			for b.Loop() {
				o, _ = Solve(tk, c)
			}
			b.ReportMetric(float64(b.N)/b.Elapsed().Seconds(), "corners/s")
			b.ReportMetric(float64(o.Iterations), "half-periods")
		})
	}
}
