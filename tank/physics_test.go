package tank

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

// supply is a half-bridge LLC supply, 390 V to 48 V.
func supply() Tank {
	return Tank{
		Bridge: HalfBridge, Rectifier: CenterTapped, TurnsRatio: 4, Lr: 60e-6, Cr: 44e-9, Lm: 400e-6,
		RectifierResistance: 4e-3, BridgeResistance: 0.12, NodeCapacitance: 300e-12, DeadTime: 200e-9,
		FrequencyMin: 60e3, FrequencyMax: 250e3,
	}
}

// Lossless, without drop and at resonance Lr and Cr carry a pure sine, the
// winding is clamped to E all the time, and everything has a closed form:
//
//	E = Vb, Im = E/(4 Lm f), Ir_rms² = (pi/(2 sqrt 2) Io/(ki n))² + Im²/2
func TestClosedFormAtResonance(t *testing.T) {
	for _, bridge := range []Bridge{HalfBridge, FullBridge} {
		for _, rectifier := range []Rectifier{CenterTapped, FullBridgeRectifier, VoltageDoubler} {
			for _, ratio := range []float64{3, 6, 20} {
				tk := Tank{Bridge: bridge, Rectifier: rectifier, TurnsRatio: 4, Lr: 60e-6, Cr: 44e-9, Lm: ratio * 60e-6, FrequencyMin: 50e3, FrequencyMax: 200e3}
				kv, _, ki := rectifier.constants()
				f := tk.ResonantFrequency()
				o := mustSolve(t, tk, Corner{InputVoltage: 390, Frequency: f, LoadResistance: 6 / (kv * ki)})
				if o.Status != OK {
					t.Fatalf("%s, %s, Lm/Lr %g: %s", bridge, rectifier, ratio, o.Reason)
				}
				vb := tk.bridgeVoltage(390)
				within(t, "output voltage", o.OutputVoltage, vb/(tk.TurnsRatio*kv), 1e-6, o.OutputVoltage)
				im := vb / (4 * tk.Lm * f)
				within(t, "magnetizing peak", o.Magnetizing.Peak, im, 1e-6, im)
				rms := math.Hypot(math.Pi/(2*math.Sqrt2)*o.OutputCurrent/(ki*tk.TurnsRatio), im/math.Sqrt2)
				within(t, "primary rms", o.Resonant.RMS, rms, 1e-6, rms)
				within(t, "turn-off current", o.TurnOffCurrent, im, 1e-6, im)
				within(t, "flux linkage", o.FluxLinkagePeak, vb/(4*f), 1e-6, vb/(4*f))
				within(t, "third harmonic", math.Hypot(real(o.IPrimaryHarmonics[3]), imag(o.IPrimaryHarmonics[3])), 0, 1e-6, rms)
				// The drop of a pure sine's capacitor: peak charge over Cr.
				within(t, "capacitor peak", o.CapacitorPeakAC, o.Resonant.Peak/(2*math.Pi*f*tk.Cr), 1e-6, o.CapacitorPeakAC)
				if math.Abs(o.EnergyBalance) > 1e-9 {
					t.Errorf("energy balance %g", o.EnergyBalance)
				}
			}
		}
	}
}

// Input power is output power plus what the drops and resistances take, counted
// on the side where each of them sits.
func TestPowerBalancesWhereItGoes(t *testing.T) {
	tk := supply()
	tk.RectifierDrop, tk.SecondaryResistance, tk.PrimaryResistance = 0.6, 5e-3, 0.1
	for _, rectifier := range []Rectifier{CenterTapped, FullBridgeRectifier, VoltageDoubler} {
		tk.Rectifier = rectifier
		_, kd, ki := rectifier.constants()
		o := mustSolve(t, tk, Corner{InputVoltage: 390, Frequency: 90e3, LoadResistance: 6})
		// Drops and resistances from the secondary side, by the circuit: each
		// rectifier carries the mean current of its path.
		copper := square(o.Resonant.RMS) * (tk.BridgeResistance + tk.PrimaryResistance)
		for _, w := range o.Windings {
			copper += square(w.RMS) * (tk.SecondaryResistance + kd*tk.RectifierResistance)
		}
		drops := kd * tk.RectifierDrop * o.OutputCurrent / ki
		within(t, string(rectifier)+": input power", o.InputPower, o.OutputPower+copper+drops, 1e-9, o.InputPower)
	}
}

// The figures of an operation agree with its own waveforms and with circuit
// laws that the solver does not use as such.
func TestWaveformsObeyTheCircuit(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	for n := range 60 {
		tk, c := randomTank(r, n%2 == 1)
		if n%3 == 0 {
			tk.DeadTime, tk.NodeCapacitance = 0.03/c.Frequency, tk.Cr*0.01
			tk.FrequencyMax = 2 * c.Frequency
		}
		o := mustSolve(t, tk, c)
		period := 1 / o.Frequency
		h := o.IPrimaryHarmonics
		sum := 0.0
		for k := 1; k <= Orders; k++ {
			sum += square(real(h[k]))/2 + square(imag(h[k]))/2
		}
		// The series converges like 1/k² or faster: 40 orders hold all but a part
		// in 10,000 of the square.
		within(t, "rms by Parseval", math.Sqrt(sum), o.Resonant.RMS, 1e-3, o.Resonant.RMS)
		for k, w := range o.SecondaryCurrents {
			within(t, "mean of a winding", real(o.ISecondaryHarmonics[k][0]), o.Windings[k].Mean, 1e-9, o.Windings[k].RMS)
			within(t, "mean of a winding", w.Mean(), o.Windings[k].Mean, 1e-12, o.Windings[k].RMS)
		}
		total := 0.0
		for _, w := range o.SecondaryCurrents {
			total += w.MeanAbs()
		}
		_, _, ki := tk.Rectifier.constants()
		within(t, "output current", o.OutputCurrent, ki*total, 1e-9, o.OutputCurrent)
		// n i_s = i - m in the center tap's halves together, at any time.
		for k := range 7 {
			at := period * (0.013 + float64(k)/7)
			is := o.SecondaryCurrents[0].At(at)
			if len(o.SecondaryCurrents) == 2 {
				is -= o.SecondaryCurrents[1].At(at)
			}
			within(t, "ampere-turns", is/tk.TurnsRatio, o.ResonantCurrent.At(at)-o.MagnetizingCurrent.At(at), 1e-9, o.Resonant.Peak)
		}
		// The capacitor's voltage swings by the charge of a half period; the
		// magnetizing current by the integral of its voltage.
		steps := 4000
		charge, linkage := 0.0, 0.0
		for k := range steps {
			at := period / 2 * (float64(k) + 0.5) / float64(steps)
			charge += o.ResonantCurrent.At(at) * period / 2 / float64(steps)
			linkage += o.MagnetizingVoltage.At(at) * period / 2 / float64(steps)
		}
		// The midpoint rule misses the jumps by half a step.
		within(t, "charge", charge, -2*tk.Cr*o.CapacitorVoltage.At(0), 2e-3, tk.Cr*o.CapacitorPeakAC)
		within(t, "flux linkage", linkage, -2*tk.Magnetizing()*o.MagnetizingCurrent.At(0), 2e-3, o.FluxLinkagePeak)
		within(t, "half-wave symmetry", o.ResonantCurrent.At(0.2*period), -o.ResonantCurrent.At(0.7*period), 1e-9, o.Resonant.Peak)
	}
}

// Simulated with switches, diodes and capacitances by ngspice (testdata). The
// solver has the dead time in its period, so its accuracy is that of the steady
// state: swing time and voltage left within 1 %, currents 0.5 %. What remains is
// the body diodes' drop, which the solver leaves out; near the peak of the gain
// (Z06), where the current turns round within the dead time, it is 2.5 V.
func TestSoftSwitchingAgainstSimulation(t *testing.T) {
	var file referenceFile
	readJSON(t, "points.json", &file)
	if len(file.BridgeNodeCapacitance) != 4 {
		t.Fatalf("%d points, want 4", len(file.BridgeNodeCapacitance))
	}
	for _, p := range file.BridgeNodeCapacitance {
		t.Run(p.ID, func(t *testing.T) {
			o := mustSolve(t, p.Inputs.tank(), Corner{Name: p.ID, InputVoltage: p.Inputs.Vin, Frequency: p.Inputs.Fsw, LoadResistance: p.Rload})
			if o.Status != OK {
				t.Fatal(o.Reason)
			}
			r, w := p.Results, o.SoftSwitching
			within(t, "output voltage", o.OutputVoltage, r.Vout, 1e-3, r.Vout)
			within(t, "primary rms", o.Resonant.RMS, r.IpriRMS, 5e-3, r.IpriRMS)
			within(t, "primary peak", o.Resonant.Peak, r.IpriPeak, 5e-3, r.IpriPeak)
			within(t, "turn-off current", o.TurnOffCurrent, r.TurnOffReal, 5e-3, r.IpriPeak)
			within(t, "current at the end of the dead time", w.EndCurrent, r.EndCurrent, 5e-3, r.IpriPeak)
			if w.Complete != r.Complete {
				t.Fatalf("complete %v, want %v", w.Complete, r.Complete)
			}
			if r.SwingTime != nil {
				within(t, "swing time", w.SwingTime, *r.SwingTime, 1e-2, *r.SwingTime)
				within(t, "voltage left", w.VoltageLeft, 0, 1e-12, p.Inputs.Vin)
			} else {
				within(t, "voltage left", w.VoltageLeft, r.VoltageLeft, 1e-2, p.Inputs.Vin)
			}
		})
	}
}

// With tanks of every kind, and the dead time from nothing to a fifth of the
// period.
func TestRandomDeadTimesConverge(t *testing.T) {
	for _, harsh := range []bool{false, true} {
		r := rand.New(rand.NewPCG(7, 8))
		complete := 0
		for n := range 300 {
			tk, c := randomTank(r, harsh)
			tk.DeadTime = between(r, 0.005, 0.2) / c.Frequency
			tk.NodeCapacitance = tk.Cr * between(r, 1e-5, 0.1)
			tk.FrequencyMax = c.Frequency * 1.01
			if n%10 == 0 {
				tk.NodeCapacitance = 0
			}
			o := mustSolve(t, tk, c)
			if o.Status != OK {
				t.Errorf("tank %d: %s\n%+v\n%+v", n, o.Reason, tk, c)
				continue
			}
			if math.Abs(o.EnergyBalance) > 1e-9 {
				t.Errorf("tank %d: energy balance %g", n, o.EnergyBalance)
			}
			if o.SoftSwitching.Complete {
				complete++
				if s := o.SoftSwitching; s.SwingTime > tk.DeadTime || s.EndCurrent < 0 {
					t.Errorf("tank %d: %+v of %g", n, s, tk.DeadTime)
				}
			}
		}
		if complete < 50 || complete > 250 {
			t.Errorf("%d of 300 swings are complete: one kind is hardly tested", complete)
		}
	}
}

// A dead time that goes to nothing is an ideal edge. With the node's swing in it
// the edge is a ramp whose middle is t = 0, so the difference is of second order;
// where it ends before the swing it is of first order in what is left.
func TestShortDeadTimeIsAnIdealEdge(t *testing.T) {
	tk := supply()
	c := Corner{InputVoltage: 390, Frequency: 90e3, LoadResistance: 6}
	tk.DeadTime = 0
	ideal := mustSolve(t, tk, c)
	tk.NodeCapacitance = 0
	for _, dead := range []float64{1e-9, 1e-10, 1e-11} {
		tk.DeadTime = dead
		o := mustSolve(t, tk, c)
		off := math.Abs(o.Resonant.RMS/ideal.Resonant.RMS - 1)
		if !(off < dead*c.Frequency) {
			t.Errorf("dead time %g: primary rms off by %g, want below %g", dead, off, dead*c.Frequency)
		}
	}
}

func TestLargestMagnetizing(t *testing.T) {
	tk := supply()
	c := Corner{Name: "light", InputVoltage: 410, OutputVoltage: 48, OutputPower: 40}
	r, err := LargestMagnetizing(tk, c)
	if err != nil || r.Unlimited || r.Status != OK {
		t.Fatalf("%+v, %v", r, err)
	}
	for _, side := range []struct {
		lm   float64
		want bool
	}{{r.Lm, true}, {r.Lm * 1.0002, false}} {
		tk.Lm = side.lm
		if o := mustSolve(t, tk, c); o.SoftSwitching.Complete != side.want {
			t.Errorf("Lm %g: complete %v, want %v", side.lm, o.SoftSwitching.Complete, side.want)
		}
	}
	// The hand rule says the same within a tenth at light load, where the
	// magnetizing current is all there is.
	within(t, "hand rule", tk.HandRule(mustSolve(t, tk, c).Frequency), r.Lm, 0.1, r.Lm)

	tk = supply()
	tk.DeadTime = 0
	if r, err := LargestMagnetizing(tk, c); err != nil || !r.Unlimited {
		t.Errorf("without dead time: %+v, %v", r, err)
	}
	tk = supply()
	tk.NodeCapacitance = 1e-6
	if r, err := LargestMagnetizing(tk, c); err != nil || r.Lm != 0 {
		t.Errorf("with a huge capacitance: %+v, %v", r, err)
	}
	tk.Lr = -1
	if _, err := LargestMagnetizing(tk, c); err == nil {
		t.Error("a negative Lr was taken")
	}
}

// Two ways to the hand rule, and what adds to the node.
func TestHandRule(t *testing.T) {
	tk := supply()
	within(t, "half bridge", tk.HandRule(100e3), 200e-9/(8*300e-12*100e3), 1e-12, 1)
	tk.Bridge = FullBridge
	within(t, "full bridge", tk.HandRule(100e3), 200e-9/(4*300e-12*100e3), 1e-12, 1)
	tk.WindingCapacitance, tk.RectifierCapacitance = 100e-12, 800e-12
	within(t, "capacitance", tk.swingCapacitance(), 300e-12+100e-12+2*800e-12/16, 1e-12, 1e-10)
	tk.NodeCapacitance, tk.WindingCapacitance, tk.RectifierCapacitance = 0, 0, 0
	if !math.IsInf(tk.HandRule(1e5), 1) {
		t.Errorf("without capacitance: %g", tk.HandRule(1e5))
	}
}

func TestStatus(t *testing.T) {
	for _, c := range []struct {
		name   string
		change func(*Tank)
		corner Corner
		want   Status
		reason string
	}{
		{"served", nil, Corner{InputVoltage: 390, OutputVoltage: 48, OutputCurrent: 8.4}, OK, ""},
		{"too much from the range", nil, Corner{InputVoltage: 250, OutputVoltage: 48, OutputCurrent: 8.4}, BelowRange, "60.00 kHz"},
		{"beyond the peak", func(t *Tank) { t.FrequencyMin = 30e3 }, Corner{InputVoltage: 200, OutputVoltage: 48, OutputCurrent: 8.4}, BeyondPeakGain, "peak"},
		{"too little", nil, Corner{InputVoltage: 410, OutputVoltage: 20, OutputCurrent: 1}, AboveRange, "250.0 kHz"},
		{"absurd gain", nil, Corner{InputVoltage: 390, OutputVoltage: 1e6, OutputCurrent: 1}, BelowRange, "V"},
		{"next to no load", nil, Corner{InputVoltage: 390, OutputVoltage: 48, OutputCurrent: 1e-9}, OK, ""},
		{"nearly shorted", nil, Corner{InputVoltage: 390, OutputVoltage: 48, OutputCurrent: 1e6}, BeyondPeakGain, "mV"},
		{"drop above everything", func(t *Tank) { t.RectifierDrop = 1e4 }, Corner{InputVoltage: 390, Frequency: 1e5, LoadResistance: 6}, NoSolution, "never conducts"},
		{"drop above everything, searched", func(t *Tank) { t.RectifierDrop = 1e4 }, Corner{InputVoltage: 390, OutputVoltage: 48, OutputCurrent: 8}, BelowRange, ""},
		{"dead time fills the period", nil, Corner{InputVoltage: 390, Frequency: 3e6, LoadResistance: 6}, NoSolution, "dead time"},
		{"far below resonance", nil, Corner{InputVoltage: 390, Frequency: 1, LoadResistance: 6}, NoSolution, "time constants"},
		{"tiny Q", func(t *Tank) { t.Lr, t.Cr = 0.6e-6, 4.4e-6 }, Corner{InputVoltage: 390, OutputVoltage: 49, OutputCurrent: 8}, BelowRange, "48.7"},
		{"overdamped", func(t *Tank) { t.Lr, t.Cr = 60e-12, 44e-3 }, Corner{InputVoltage: 390, OutputVoltage: 48, OutputCurrent: 8}, NoSolution, "characteristic impedance"},
	} {
		t.Run(c.name, func(t *testing.T) {
			tk := supply()
			if c.change != nil {
				c.change(&tk)
			}
			o := mustSolve(t, tk, c.corner)
			if o.Status != c.want || !strings.Contains(o.Reason, c.reason) || (o.Status != OK) != (o.Reason != "") {
				t.Errorf("status %s (%s), want %s (..%s..)", o.Status, o.Reason, c.want, c.reason)
			}
			if o.Status == OK && (o.Iterations == 0 || o.Residual > 1e-10) {
				t.Errorf("%d iterations, residual %g", o.Iterations, o.Residual)
			}
		})
	}
}

func TestWarnings(t *testing.T) {
	for _, c := range []struct {
		name   string
		change func(*Tank)
		corner Corner
		want   string // codes
	}{
		{"nothing", nil, Corner{InputVoltage: 390, OutputVoltage: 48, OutputCurrent: 8.4}, ""},
		{"little gain left", nil, Corner{InputVoltage: 320, OutputVoltage: 48, OutputCurrent: 8.4}, "W102"},
		{"above range", nil, Corner{InputVoltage: 410, OutputVoltage: 20, OutputCurrent: 1}, "W103"},
		{"outside the range", nil, Corner{InputVoltage: 390, Frequency: 50e3, LoadResistance: 60}, "W104"},
		{"far below resonance", nil, Corner{InputVoltage: 390, Frequency: 45e3, LoadResistance: 60}, "W101 W104"},
		{"swing incomplete", func(t *Tank) { t.NodeCapacitance = 3e-9 }, Corner{InputVoltage: 390, Frequency: 120e3, LoadResistance: 60}, "W105"},
		{"swing tight", func(t *Tank) { t.DeadTime = 130e-9 }, Corner{InputVoltage: 410, OutputVoltage: 48, OutputPower: 40}, "W105"},
		{"at the end of the range", func(t *Tank) { t.FrequencyMax = 123.5e3 }, Corner{InputVoltage: 410, OutputVoltage: 48, OutputPower: 40}, "W106"},
	} {
		t.Run(c.name, func(t *testing.T) {
			tk := supply()
			if c.change != nil {
				c.change(&tk)
			}
			var codes []string
			for _, w := range mustSolve(t, tk, c.corner).Warnings {
				codes = append(codes, w.Code)
			}
			if got := strings.Join(codes, " "); got != c.want {
				t.Errorf("warnings %q, want %q", got, c.want)
			}
		})
	}
}

// Series-LC: the output falls on both sides of the resonance, and a corner that
// wants more than there is beyond the peak.
func TestSeriesTank(t *testing.T) {
	tk := supply()
	tk.Lm, tk.DeadTime = 0, 0
	o := mustSolve(t, tk, Corner{InputVoltage: 390, OutputVoltage: 45, OutputCurrent: 8})
	if o.Status != OK || o.Frequency < tk.ResonantFrequency() {
		t.Errorf("%s %s at %g", o.Status, o.Reason, o.Frequency)
	}
	if o = mustSolve(t, tk, Corner{InputVoltage: 390, OutputVoltage: 50, OutputCurrent: 8}); o.Status != BeyondPeakGain {
		t.Errorf("%s %s", o.Status, o.Reason)
	}
	within(t, "frequency of the peak", o.FrequencyOfPeakGain, tk.ResonantFrequency(), 5e-3, tk.ResonantFrequency())
}

func TestSolveRefuses(t *testing.T) {
	good := Corner{InputVoltage: 390, OutputVoltage: 48, OutputCurrent: 8}
	for _, c := range []struct {
		name   string
		change func(*Tank, *Corner)
		want   string
	}{
		{"NaN", func(t *Tank, c *Corner) { t.Cr = math.NaN() }, "Cr is NaN"},
		{"infinite", func(t *Tank, c *Corner) { c.InputVoltage = math.Inf(1) }, "input voltage is +Inf"},
		{"negative", func(t *Tank, c *Corner) { t.PrimaryResistance = -1 }, "primary resistance is -1"},
		{"zero", func(t *Tank, c *Corner) { t.Lr = 0 }, "Lr is 0"},
		{"unheard of", func(t *Tank, c *Corner) { t.Lr = 1e200 }, "outside"},
		{"bridge", func(t *Tank, c *Corner) { t.Bridge = "third" }, `unknown bridge "third"`},
		{"rectifier", func(t *Tank, c *Corner) { t.Rectifier = "" }, `unknown rectifier ""`},
		{"range", func(t *Tank, c *Corner) { t.FrequencyMin = 1e6 }, "above the highest"},
		{"no load", func(t *Tank, c *Corner) { c.OutputCurrent = 0 }, "needs a load"},
		{"nothing asked", func(t *Tank, c *Corner) { *c = Corner{InputVoltage: 1} }, "needs an output voltage"},
		{"two at once", func(t *Tank, c *Corner) { t.Lr, t.Cr = -1, -2 }, "Cr is -2"},
	} {
		t.Run(c.name, func(t *testing.T) {
			tk, corner := supply(), good
			c.change(&tk, &corner)
			if _, err := Solve(tk, corner); err == nil || !strings.Contains(err.Error(), c.want) {
				t.Errorf("error %v, want one with %q", err, c.want)
			}
		})
	}
}

func TestSolveAll(t *testing.T) {
	tk := supply()
	corners := []Corner{
		{Name: "a", InputVoltage: 390, OutputVoltage: 48, OutputCurrent: 8.4},
		{Name: "b", InputVoltage: 390, Frequency: 1e5, LoadResistance: 6},
		{Name: "c", InputVoltage: 410, OutputVoltage: 20, OutputCurrent: 1},
	}
	list, err := SolveAll(t.Context(), tk, corners)
	if err != nil {
		t.Fatal(err)
	}
	for k, o := range list {
		one := mustSolve(t, tk, corners[k])
		if o.Corner != corners[k] || o.Status != one.Status || o.Resonant != one.Resonant || o.Frequency != one.Frequency {
			t.Errorf("corner %d: %v at %g, alone %v at %g", k, o.Corner.Name, o.Frequency, one.Corner.Name, one.Frequency)
		}
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := SolveAll(ctx, tk, corners); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v, want canceled", err)
	}
	corners[1].InputVoltage = -1
	if _, err := SolveAll(t.Context(), tk, corners); err == nil || !strings.Contains(err.Error(), "corner b") {
		t.Errorf("error %v, want one that names corner b", err)
	}
}

func TestDescribe(t *testing.T) {
	tk := supply()
	list, err := SolveAll(t.Context(), tk, []Corner{
		{Name: "light", InputVoltage: 410, OutputVoltage: 48, OutputPower: 40},
		{Name: "full", InputVoltage: 390, OutputVoltage: 48, OutputCurrent: 8.4},
	})
	if err != nil {
		t.Fatal(err)
	}
	f, err := Describe(tk, list)
	if err != nil {
		t.Fatal(err)
	}
	within(t, "resonance", f.ResonantFrequency, 97953.096, 1e-7, 1e5)
	within(t, "second resonance", f.SecondResonance, f.ResonantFrequency/math.Sqrt(1+400./60), 1e-12, 1e5)
	within(t, "impedance", f.CharacteristicImpedance, math.Sqrt(60e-6/44e-9), 1e-12, 40)
	within(t, "Re", f.EquivalentResistance, 8*16/(math.Pi*math.Pi)*48/8.4, 1e-12, 70)
	within(t, "Q", f.Q, f.CharacteristicImpedance/f.EquivalentResistance, 1e-12, 1)
	if f.FullLoad != "full" || f.ShortedInput != 410 {
		t.Errorf("%+v", f)
	}
	// Shorted, above resonance and next to lossless, the tank is Lr and Cr on a
	// square wave: v goes from -v0 to v0 in half a period with i0 at both ends,
	// so i0 = (Vb/Z) tan(w T/4) and that is the peak when the phase stays below
	// a quarter turn.
	tk.DeadTime, tk.Lm, tk.BridgeResistance, tk.RectifierResistance = 0, 0, 0, 0
	o, err := ShortCircuit(tk, 410, 250e3)
	if err != nil || o.Status != OK {
		t.Fatalf("%v %s", err, o.Reason)
	}
	want := 205 / f.CharacteristicImpedance * math.Tan(math.Pi/2*f.ResonantFrequency/250e3)
	within(t, "shorted peak", o.Resonant.Peak, want, 1e-9, want)
	if _, err := ShortCircuit(tk, 0, 250e3); err == nil {
		t.Error("no input voltage was taken")
	}
}

// Following half periods allocates nothing once the work space has grown.
func TestFollowDoesNotAllocate(t *testing.T) {
	tk := supply()
	c := newCurve(tk, 390)
	c.setLoad(6)
	found, err := c.at(90e3)
	if err != nil {
		t.Fatal(err)
	}
	var d change
	c.follow(&found.y, &d, true)
	if n := testing.AllocsPerRun(100, func() { c.follow(&found.y, &d, true) }); n != 0 {
		t.Errorf("%g allocations per half period, want none", n)
	}
}

// The derivatives of the half period, against differences.
func TestDerivatives(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 6))
	for n := range 100 {
		tk, corner := randomTank(r, n%2 == 0)
		if n%3 == 0 {
			tk.DeadTime, tk.NodeCapacitance = 0.04/corner.Frequency, 0.02*tk.Cr
		}
		c := newCurve(tk, corner.InputVoltage)
		c.setLoad(corner.LoadResistance)
		found, err := c.at(corner.Frequency)
		if err != nil {
			t.Fatal(err)
		}
		// Off the periodic state, where the rectifier may sit on a kink.
		y := found.y
		for k := range y {
			y[k] *= 1 + 0.02*r.Float64()
		}
		var d change
		if _, err := c.follow(&y, &d, false); err != nil {
			t.Fatal(err)
		}
		for k := range y {
			h := 1e-6 * (1 + math.Abs(y[k]))
			up, down := y, y
			up[k] += h
			down[k] -= h
			a, _ := c.follow(&up, nil, false)
			b, _ := c.follow(&down, nil, false)
			for j := range 4 {
				// Second-order differences with steps of 1e-6: an error of about
				// 1e-9 from rounding and from curvature, times slopes up to 100.
				if diff := (a[j] - b[j]) / (2 * h); math.Abs(d[k][j]-diff) > 2e-5*(1+math.Abs(diff)) {
					t.Errorf("tank %d: d%d/d%d = %g, difference %g", n, j, k, d[k][j], diff)
				}
			}
		}
	}
}
