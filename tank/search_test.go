package tank

import (
	"math"
	"math/rand/v2"
	"testing"
)

// The search against a dense scan of the output over the range, every point
// solved from its own first-harmonic guess: the frequency is that of the first
// crossing from above, the status is what the scan shows, the peak is no lower
// than any point of the scan.
func TestSearchAgainstScan(t *testing.T) {
	const points = 160
	count := map[Status]int{}
	for _, harsh := range []bool{false, true} {
		r := rand.New(rand.NewPCG(9, 10))
		for n := range 40 {
			tk, c := randomTank(r, harsh)
			fr := tk.ResonantFrequency()
			tk.FrequencyMin, tk.FrequencyMax = fr*between(r, 0.3, 0.9), fr*between(r, 1.1, 3)
			if n%3 == 0 {
				tk.DeadTime = 0.03 / fr
				tk.NodeCapacitance = tk.Cr * between(r, 1e-4, 3e-2)
			}
			kv, _, _ := tk.Rectifier.constants()
			unity := tk.bridgeVoltage(c.InputVoltage) / (tk.TurnsRatio * kv)
			c.Frequency = 0
			c.OutputVoltage = unity * between(r, 0.6, 1.8)
			o := mustSolve(t, tk, c)
			count[o.Status]++

			var f, v [points]float64
			for k := range f {
				f[k] = tk.FrequencyMax * math.Pow(tk.FrequencyMin/tk.FrequencyMax, float64(k)/(points-1))
				p := newCurve(tk, c.InputVoltage)
				p.setLoad(c.LoadResistance)
				x, err := p.at(f[k])
				if err != nil {
					t.Fatal(err)
				}
				v[k] = p.volts(x)
			}
			want, at, peak := BelowRange, 0, 0.0
			if v[0] > c.OutputVoltage {
				want = AboveRange
			} else {
				for k := 1; k < points; k++ {
					if v[k] >= c.OutputVoltage {
						want, at = OK, k
						break
					}
					if v[k] < v[k-1]*(1-1e-9) {
						want = BeyondPeakGain
						break
					}
				}
			}
			for k := range v {
				peak = math.Max(peak, v[k])
			}
			if o.Status != want {
				t.Errorf("tank %d (harsh %v): %s (%s), the scan shows %s\n%+v\n%+v", n, harsh, o.Status, o.Reason, want, tk, c)
				continue
			}
			if o.Status != OK {
				continue
			}
			if o.Frequency > f[at-1]*(1+1e-9) || o.Frequency < f[at]*(1-1e-9) {
				t.Errorf("tank %d (harsh %v): %g Hz, the scan crosses between %g and %g", n, harsh, o.Frequency, f[at], f[at-1])
			}
			within(t, "output voltage", o.OutputVoltage, c.OutputVoltage, 1e-8, c.OutputVoltage)
			if o.PeakOutputVoltage < peak*(1-1e-6) {
				t.Errorf("tank %d (harsh %v): peak %g at %g, the scan has %g", n, harsh, o.PeakOutputVoltage, o.FrequencyOfPeakGain, peak)
			}
		}
	}
	t.Log(count)
	for _, s := range []Status{OK, BeyondPeakGain, BelowRange, AboveRange} {
		if count[s] == 0 {
			t.Errorf("no corner is %s", s)
		}
	}
}
