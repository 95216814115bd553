package text

import (
	"bytes"
	"encoding/json"
	"math"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/google/go-cmp/cmp"

	"gapwright/tank"
)

func tankReport(t *testing.T, deadTime float64) TankReport {
	t.Helper()
	tk := tank.Tank{
		Bridge: tank.HalfBridge, Rectifier: tank.CenterTapped, TurnsRatio: 4, Lr: 60e-6, Cr: 44e-9, Lm: 400e-6,
		RectifierResistance: 4e-3, BridgeResistance: 0.12, NodeCapacitance: 300e-12, DeadTime: deadTime,
		FrequencyMin: 60e3, FrequencyMax: 250e3,
	}
	corners := []tank.Corner{
		{Name: "nominal", InputVoltage: 390, OutputVoltage: 48, OutputCurrent: 8.4},
		{Name: "too low an input for it, in many words", InputVoltage: 150, OutputVoltage: 48, OutputCurrent: 8.4},
		{Name: "too much", InputVoltage: 410, OutputVoltage: 20, OutputPower: 4},
		{Name: "fixed", InputVoltage: 390, Frequency: 100e3, LoadResistance: 5.7},
	}
	r := TankReport{Title: "A supply", Tank: tk}
	var err error
	if r.Corners, err = tank.SolveAll(t.Context(), tk, corners); err != nil {
		t.Fatal(err)
	}
	if r.Figures, err = tank.Describe(tk, r.Corners); err != nil {
		t.Fatal(err)
	}
	if deadTime > 0 {
		r.Reach = make([]tank.Reach, len(corners))
		r.Reach[0] = tank.Reach{Lm: 5e-4, Status: tank.BelowRange}
		r.Reach[3] = tank.Reach{Lm: 4, Unlimited: true, Status: tank.OK}
	}
	return r
}

func TestTankFitsItsWidth(t *testing.T) {
	for _, dead := range []float64{0, 200e-9} {
		r := tankReport(t, dead)
		for _, width := range []int{100, 80, 60} {
			var b bytes.Buffer
			if err := Tank(NewPrinter(&b, true, width), r); err != nil {
				t.Fatal(err)
			}
			for _, line := range strings.Split(b.String(), "\n") {
				if n := utf8.RuneCountInString(line); n > width {
					t.Errorf("width %d, %d columns: %s", width, n, line)
				}
				if strings.HasSuffix(line, " ") {
					t.Errorf("blanks at the end of %q", line)
				}
			}
			if width == 100 {
				for _, word := range []string{"Ω", "µH", "NaN", "Inf"} {
					if has := strings.Contains(b.String(), word); has != (word != "NaN" && word != "Inf") {
						t.Errorf("%q in the text: %v\n%s", word, has, b.String())
					}
				}
			}
		}
	}
}

// What the reader has to find, whatever the layout.
func TestTankTells(t *testing.T) {
	var b bytes.Buffer
	if err := Tank(NewPrinter(&b, false, 100), tankReport(t, 200e-9)); err != nil {
		t.Fatal(err)
	}
	text := b.String()
	for _, r := range text {
		if r > 126 {
			t.Errorf("sign %q in a text for files", r)
		}
	}
	words := strings.Join(strings.Fields(text), " ")
	for _, want := range []string{
		"A supply", "97.95 kHz", "35.38 kHz", "Lm/Lr 6.667", "36.93 ohm", "output shorted", "500 *", " any ",
		"above this Lm the corner itself is lost",
		"too low an input for it, in many words: below-range: the output is", "too low an input ...",
		"too much: above-range", "too much: W103", "INCOMPLETE", "off by",
	} {
		if has := strings.Contains(words, want); has == (want == "INCOMPLETE") {
			t.Errorf("%q in the text: %v\n%s", want, has, text)
		}
	}
	b.Reset()
	if err := Tank(NewPrinter(&b, false, 100), tankReport(t, 0)); err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(b.String(), "not assessed") {
		t.Errorf("without a dead time nothing says so:\n%s", b.String())
	}
}

func TestTankJSON(t *testing.T) {
	var b bytes.Buffer
	r := tankReport(t, 200e-9)
	if err := TankJSON(&b, r); err != nil {
		t.Fatal(err)
	}
	var got struct {
		Format  int
		Corners []map[string]any
	}
	if err := json.Unmarshal(b.Bytes(), &got); err != nil {
		t.Fatal(err)
	}
	if got.Format != 1 || len(got.Corners) != 4 {
		t.Fatalf("format %d, %d corners", got.Format, len(got.Corners))
	}
	keys := func(m map[string]any) map[string]bool {
		set := map[string]bool{}
		for k := range m {
			set[k] = true
		}
		return set
	}
	// A corner that is not served has these and no others.
	want := map[string]bool{"name": true, "status": true, "reason": true, "input_voltage": true}
	if diff := cmp.Diff(want, keys(got.Corners[1])); diff != "" {
		t.Errorf("corner that is not served: %s", diff)
	}
	for _, k := range []string{"frequency", "output_voltage", "output_current", "load_resistance", "resonant_current", "magnetizing_current",
		"secondary_windings", "resonant_capacitor", "flux_linkage_peak", "turn_off_current", "rectifier_off_fraction", "peak_gain_margin", "soft_switching"} {
		if !keys(got.Corners[0])[k] {
			t.Errorf("no %s", k)
		}
	}
	if got.Corners[3]["peak_gain_margin"] != nil {
		t.Errorf("peak gain margin %v of a corner with a given frequency", got.Corners[3]["peak_gain_margin"])
	}
	windings := got.Corners[0]["secondary_windings"].([]any)
	if len(windings) != 2 {
		t.Fatalf("%d windings", len(windings))
	}
	for _, w := range windings {
		w := w.(map[string]any)
		if n := len(w["harmonics"].([]any)); n != 40 {
			t.Errorf("%d harmonics, want 40", n)
		}
		// Each half carries half the output current in its own direction.
		if mean := w["mean"].(float64); math.Abs(mean-4.2) > 1e-6 {
			t.Errorf("mean %g, want 4.2", mean)
		}
	}
	swing := got.Corners[0]["soft_switching"].(map[string]any)
	if swing["complete"] != true || swing["swing_time"] == nil || swing["voltage_left"] != 0.0 {
		t.Errorf("%v", swing)
	}

	r = tankReport(t, 10e-9) // too short to swing
	if c := TankCorners(r.Corners, nil)[0]; c.SoftSwitching.Complete || c.SoftSwitching.SwingTime != nil || c.SoftSwitching.VoltageLeft < 300 {
		t.Errorf("%+v", c.SoftSwitching)
	}
	if c := TankCorners(tankReport(t, 0).Corners, nil)[0]; c.SoftSwitching != nil {
		t.Errorf("%+v without a dead time", c.SoftSwitching)
	}
}
