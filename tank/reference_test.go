package tank

import (
	"encoding/json"
	"math"
	"math/cmplx"
	"os"
	"testing"
)

type referenceInputs struct {
	Bridge, Rectifier              string
	Vin, N, Lr, Cr, Lm, Fsw        float64
	Vd, Rbridge, Rpri, Rsec, Cnode float64
	RdsOn                          float64 `json:"Rds_on"`
	DeadTime                       float64 `json:"dead_time"`
}

func (in referenceInputs) tank() Tank {
	t := Tank{
		Bridge:              map[string]Bridge{"half": HalfBridge, "full": FullBridge}[in.Bridge],
		Rectifier:           map[string]Rectifier{"ct": CenterTapped, "fb": FullBridgeRectifier, "vd": VoltageDoubler}[in.Rectifier],
		TurnsRatio:          in.N,
		Lr:                  in.Lr,
		Cr:                  in.Cr,
		Lm:                  in.Lm,
		RectifierDrop:       in.Vd,
		BridgeResistance:    in.Rbridge,
		PrimaryResistance:   in.Rpri,
		SecondaryResistance: in.Rsec,
		NodeCapacitance:     in.Cnode,
		DeadTime:            in.DeadTime,
		FrequencyMin:        in.Fsw * 0.3,
		FrequencyMax:        in.Fsw * 3,
	}
	if in.Rbridge == 0 { // the circuits with real switches
		t.BridgeResistance = in.RdsOn
		if t.Bridge == FullBridge {
			t.BridgeResistance *= 2
		}
	}
	return t
}

type referencePoint struct {
	ID      string
	Inputs  referenceInputs
	Rload   float64
	Results struct {
		Vout             float64
		Iout             float64
		IpriRMS          float64      `json:"Ipri_rms"`
		IpriPeak         float64      `json:"Ipri_peak"`
		ImPeak           float64      `json:"Im_peak"`
		ImRMS            float64      `json:"Im_rms"`
		Flux             float64      `json:"flux_linkage_peak"`
		VCrPeakAC        float64      `json:"VCr_peak_ac"`
		TurnOff          float64      `json:"I_switch_turn_off"`
		Harmonics        [][2]float64 `json:"pri_harmonics_mag_phase_deg"`
		SecondaryWinding []struct {
			RMS       float64      `json:"I_rms"`
			Peak      float64      `json:"I_peak"`
			Mean      float64      `json:"I_avg"`
			MeanAbs   float64      `json:"I_avg_abs"`
			Harmonics [][2]float64 `json:"harmonics_mag_phase_deg"`
		} `json:"secondary_windings"`
		Complete    bool     `json:"swing_complete_before_dead_time_ends"`
		SwingTime   *float64 `json:"time_to_complete_swing"`
		VoltageLeft float64  `json:"node_voltage_just_before_turn_on"`
		TurnOffReal float64  `json:"I_at_turn_off"`
		EndCurrent  float64  `json:"I_at_end_of_dead_time"`
	}
	CPU float64 `json:"ngspice_cpu_s_final_run"`
}

type referenceFile struct {
	SteadyState           []referencePoint `json:"steady_state"`
	BridgeNodeCapacitance []referencePoint `json:"bridge_node_capacitance"`
}

func readJSON(t testing.TB, name string, v any) {
	t.Helper()
	b, err := os.ReadFile("../testdata/tank/" + name)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(b, v); err != nil {
		t.Fatal(err)
	}
}

func mustSolve(t testing.TB, tk Tank, c Corner) Operation {
	t.Helper()
	o, err := Solve(tk, c)
	if err != nil {
		t.Fatal(err)
	}
	return o
}

// within reports a value that is off by more than a part of scale.
func within(t *testing.T, what string, got, want, part, scale float64) {
	t.Helper()
	if !(math.Abs(got-want) <= part*math.Abs(scale)) {
		t.Errorf("%s = %.7g, want %.7g ±%g%% of %.4g (off by %.3g%%)", what, got, want, part*100, scale, 100*math.Abs(got-want)/math.Abs(scale))
	}
}

// The tolerances are two to three times the accuracy of the simulation, which
// the file states.
func TestSteadyStateAgainstSimulation(t *testing.T) {
	var file referenceFile
	readJSON(t, "points.json", &file)
	if len(file.SteadyState) != 13 {
		t.Fatalf("%d points, want 13", len(file.SteadyState))
	}
	for _, p := range file.SteadyState {
		t.Run(p.ID, func(t *testing.T) {
			o := mustSolve(t, p.Inputs.tank(), Corner{Name: p.ID, InputVoltage: p.Inputs.Vin, Frequency: p.Inputs.Fsw, LoadResistance: p.Rload})
			r := p.Results
			if o.Status != OK {
				t.Fatalf("status %s: %s", o.Status, o.Reason)
			}
			within(t, "output voltage", o.OutputVoltage, r.Vout, 1e-3, r.Vout)
			within(t, "primary rms", o.Resonant.RMS, r.IpriRMS, 5e-3, r.IpriRMS)
			within(t, "primary peak", o.Resonant.Peak, r.IpriPeak, 5e-3, r.IpriPeak)
			within(t, "magnetizing rms", o.Magnetizing.RMS, r.ImRMS, 5e-3, r.ImRMS)
			within(t, "magnetizing peak", o.Magnetizing.Peak, r.ImPeak, 5e-3, r.ImPeak)
			within(t, "flux linkage", o.FluxLinkagePeak, r.Flux, 5e-3, r.Flux)
			within(t, "capacitor peak", o.CapacitorPeakAC, r.VCrPeakAC, 5e-3, r.VCrPeakAC)
			within(t, "turn-off current", o.TurnOffCurrent, r.TurnOff, 1e-2, r.IpriPeak)
			phasor := func(h [2]float64) complex128 { return cmplx.Rect(h[0], h[1]*math.Pi/180) }
			for k, h := range r.Harmonics {
				within(t, "primary harmonic", cmplx.Abs(o.IPrimaryHarmonics[k+1]-phasor(h)), 0, 1e-2, r.Harmonics[0][0])
			}
			if len(o.Windings) != len(r.SecondaryWinding) {
				t.Fatalf("%d secondary windings, want %d", len(o.Windings), len(r.SecondaryWinding))
			}
			for n, w := range r.SecondaryWinding {
				within(t, "secondary rms", o.Windings[n].RMS, w.RMS, 5e-3, w.RMS)
				within(t, "secondary peak", o.Windings[n].Peak, w.Peak, 5e-3, w.Peak)
				if o.windingsAlternate() {
					within(t, "secondary mean", o.Windings[n].Mean, 0, 1e-9, w.MeanAbs)
					within(t, "secondary mean of the absolute value", o.SecondaryCurrents[n].MeanAbs(), w.MeanAbs, 5e-3, w.MeanAbs)
				} else {
					within(t, "secondary mean", o.Windings[n].Mean, w.MeanAbs, 5e-3, w.MeanAbs)
				}
				for k, h := range w.Harmonics {
					within(t, "secondary harmonic", cmplx.Abs(o.ISecondaryHarmonics[n][k+1]-phasor(h)), 0, 1e-2, w.Harmonics[0][0])
				}
			}
			if math.Abs(o.EnergyBalance) > 1e-9 {
				t.Errorf("energy balance %g, want below 1e-9", o.EnergyBalance)
			}
		})
	}
}

func (o Operation) windingsAlternate() bool { return len(o.SecondaryCurrents) == 1 }
