package tank

import (
	"testing"
)

type cornerPoint struct {
	ID             string
	Inputs         referenceInputs
	Vin            float64
	VoutRequired   float64 `json:"Vout_required"`
	Iout           float64
	SearchFmin     float64 `json:"search_fmin"`
	SearchFmax     float64 `json:"search_fmax"`
	Exists         bool
	Why            string
	Fsw            float64
	IpriRMS        float64  `json:"Ipri_rms"`
	IpriPeak       float64  `json:"Ipri_peak"`
	ImPeak         float64  `json:"Im_peak"`
	IsecRMS        float64  `json:"Isec_rms_per_winding"`
	VCrPeakAC      float64  `json:"VCr_peak_ac"`
	TurnOff        float64  `json:"I_switch_turn_off"`
	PeakGainMargin *float64 `json:"peak_gain_margin"`
	PeakFrequency  float64  `json:"peak_frequency"`
}

// Both solvers are exact, so what they differ by is the 9 digits of the file
// and the tolerance of the searches; the peak is flat, which its place shows.
func TestCornersAgainstIndependentSolver(t *testing.T) {
	var file struct{ Points []cornerPoint }
	readJSON(t, "corners.json", &file)
	if len(file.Points) != 23 {
		t.Fatalf("%d points, want 23", len(file.Points))
	}
	for _, p := range file.Points {
		t.Run(p.ID, func(t *testing.T) {
			tk := p.Inputs.tank()
			tk.FrequencyMin, tk.FrequencyMax = p.SearchFmin, p.SearchFmax
			o := mustSolve(t, tk, Corner{Name: p.ID, InputVoltage: p.Vin, OutputVoltage: p.VoutRequired, OutputCurrent: p.Iout})
			if !p.Exists {
				want := map[string]Status{"beyond_peak_gain": BeyondPeakGain, "above_fmax": AboveRange}[p.Why]
				if o.Status != want || o.Reason == "" {
					t.Errorf("status %s (%s), want %s", o.Status, o.Reason, want)
				}
				return
			}
			if o.Status != OK {
				t.Fatalf("status %s: %s", o.Status, o.Reason)
			}
			within(t, "frequency", o.Frequency, p.Fsw, 1e-6, p.Fsw)
			within(t, "output voltage", o.OutputVoltage, p.VoutRequired, 1e-8, p.VoutRequired)
			within(t, "primary rms", o.Resonant.RMS, p.IpriRMS, 1e-6, p.IpriRMS)
			within(t, "primary peak", o.Resonant.Peak, p.IpriPeak, 1e-6, p.IpriPeak)
			within(t, "magnetizing peak", o.Magnetizing.Peak, p.ImPeak, 1e-6, p.ImPeak)
			within(t, "capacitor peak", o.CapacitorPeakAC, p.VCrPeakAC, 1e-6, p.VCrPeakAC)
			within(t, "turn-off current", o.TurnOffCurrent, p.TurnOff, 1e-6, p.IpriPeak)
			within(t, "secondary rms", o.Windings[0].RMS, p.IsecRMS, 1e-6, p.IsecRMS)
			if p.PeakGainMargin != nil {
				within(t, "peak gain", 1+o.PeakGainMargin, 1+*p.PeakGainMargin, 1e-5, 1+*p.PeakGainMargin)
				within(t, "peak frequency", o.FrequencyOfPeakGain, p.PeakFrequency, 1e-3, p.PeakFrequency)
			}
		})
	}
}
