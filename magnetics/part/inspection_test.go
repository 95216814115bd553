package part

import (
	"math"
	"strings"
	"testing"
)

func inspected() (Transformer, Rating, InspectionSettings) {
	t := Transformer{Construction: Construction{
		Core: Core{Gap: Gap{Kind: Ground, Total: 0.6e-3}},
		Windings: []Winding{
			{Name: "P", Turns: 36, Start: []string{"pin 1"}, Finish: []string{"pin 4"}},
			{Name: "S-A", Turns: 9, Start: []string{"pin 16", "pin 15"}, Finish: []string{"pin 13", "pin 12"}},
			{Name: "S-B", Turns: 9, Start: []string{"pin 13", "pin 12"}, Finish: []string{"pin 10", "pin 9"}},
		},
		Tests: []Test{{Between: "primary_secondary", Voltage: 3000, Kind: "AC", Time: 60}},
	}}
	r := Rating{
		OpenInductance: 300e-6, SecondaryInductance: 300e-6 / 16, ShortInductance: 23.52e-6, ShortHalves: []float64{23.52e-6, 23.52e-6},
		Windings: []WindingRating{{Name: "P", DCResistance: 0.1}, {Name: "S-A", DCResistance: 0.010}, {Name: "S-B", DCResistance: 0.012}},
		Gap:      GapRating{Sensitivity: -1500},
	}
	s := InspectionSettings{
		OpenTolerance: [2]float64{0.10, 0.10}, ShortTolerance: [2]float64{0.12, 0.12}, ResistanceUp: 0.08, HalfToHalf: 0.03, SampleToSample: 0.02,
		HalfMismatch: 0.05, Frequency: 100e3, Level: 0.1, Temperature: 25, Samples: 5, BeforeGlue: true, GlueLine: 10e-6, CoreCountsAs: "primary", WindingLimit: 120,
	}
	return t, r, s
}

func row(t *testing.T, list []Check, id string) Check {
	t.Helper()
	for _, c := range list {
		if c.ID == id {
			return c
		}
	}
	t.Fatalf("no row %s", id)
	return Check{}
}

func near(t *testing.T, what string, got *float64, want float64) {
	t.Helper()
	if got == nil || math.Abs(*got-want) > 1e-9*math.Abs(want) {
		t.Errorf("%s = %v, want %g", what, got, want)
	}
}

// TestInspectionRows holds the rows against worked figures of the trade: 300 uH
// +/- 10 % is 270 to 330; k = 0.96 makes 36 : 9 turns read 4.17 with the primary
// driven and 3.84 with the secondary driven, one lost turn of 36 being 2.8 %.
func TestInspectionRows(t *testing.T) {
	tr, r, s := inspected()
	list := tr.Inspection(r, s)
	lp := row(t, list, "E04")
	near(t, "Lp", lp.Nominal, 300e-6)
	near(t, "Lp min", lp.Min, 270e-6)
	near(t, "Lp max", lp.Max, 330e-6)
	if lp.Unit != "uH" || lp.Scale != 1e-6 || lp.Terminals != "1 - 4" || lp.Often != "100 %" || !lp.Needed {
		t.Errorf("E04: %+v", lp)
	}
	near(t, "ratio, primary driven", row(t, list, "E02a").Nominal, 4.167)
	near(t, "ratio, secondary driven", row(t, list, "E02b").Nominal, 3.84)
	mean := row(t, list, "E02")
	near(t, "ratio", mean.Nominal, 4)
	// 4 (1 -+ 0.4/36) = 3.9556 and 4.0444, inward.
	near(t, "ratio min", mean.Min, 3.956)
	near(t, "ratio max", mean.Max, 4.044)
	if one := 4 * 35. / 36; *mean.Min <= one || *mean.Max >= 4*37./36 {
		t.Errorf("limits %g to %g let a lost turn pass (%g)", *mean.Min, *mean.Max, one)
	}
	a, b := row(t, list, "E06"), row(t, list, "E07")
	if !strings.Contains(a.Others, "16+15 - 13+12 SHORTED, 13+12 - 10+9 OPEN") || !strings.Contains(b.Others, "13+12 - 10+9 SHORTED, 16+15 - 13+12 OPEN") {
		t.Errorf("shorts: %q and %q", a.Others, b.Others)
	}
	if !strings.Contains(a.Conditions, "+0.16 uH") { // 16 x 10 nH
		t.Errorf("the error of a poor short is not said: %q", a.Conditions)
	}
	near(t, "R P", row(t, list, "E09.P").Max, 0.108)
	halves := row(t, list, "E09.halves")
	near(t, "halves", halves.Max, 0.03)
	if math.Abs(halves.Factor*0.010/0.012-1) > 1e-12 {
		t.Errorf("the designed difference of the halves is not taken out: factor %g", halves.Factor)
	}
	near(t, "samples apart", row(t, list, "E09.S-B.apart").Max, 0.02)
	if c := row(t, list, "E12").Conditions; !strings.Contains(c, "3000 V AC") || !strings.Contains(c, "60 s") {
		t.Errorf("E12: %q", c)
	}
	for _, id := range []string{"E13a", "E13b"} {
		if c := row(t, list, id).Conditions; c != "volts by customer" {
			t.Errorf("%s without the customer's volts says %q", id, c)
		}
	}
	seen := map[string]bool{}
	for _, c := range list {
		if seen[c.ID] || c.Scale <= 0 || c.Name == "" || c.Often == "" {
			t.Errorf("row %+v", c)
		}
		seen[c.ID] = true
		for _, f := range c.From {
			if !seen[f] {
				t.Errorf("%s follows from %s, which does not stand before it", c.ID, f)
			}
		}
		if c.Min != nil && c.Max != nil && !(*c.Min < *c.Max) {
			t.Errorf("%s: min %g, max %g", c.ID, *c.Min, *c.Max)
		}
	}
}

// TestInspectionStated: the user's own figures replace the rated ones; glue in
// the faces raises what is wanted before glue, by twice the line.
func TestInspectionStated(t *testing.T) {
	tr, r, s := inspected()
	tr.OpenInductance = &Requirement{Value: 310e-6, Tolerance: 0.05}
	tr.ShortInductance = &Requirement{Value: 24e-6, Tolerance: 0.1}
	tr.Glue.Faces = "thin film"
	list := tr.Inspection(r, s)
	near(t, "Lp", row(t, list, "E04").Nominal, 310e-6)
	near(t, "Lp min", row(t, list, "E04").Min, 294.5e-6)
	near(t, "Lsc max", row(t, list, "E06").Max, 26.4e-6)
	// 20 um at 1500/m are 3 %: 310/0.97.
	near(t, "Lp before glue", row(t, list, "E03").Nominal, 319.6e-6)
	s.BeforeGlue = false
	for _, c := range tr.Inspection(r, s) {
		if c.ID == "E03" {
			t.Error("E03 although it is not wanted")
		}
	}
	if got := (Transformer{}).Inspection(r, s); got != nil {
		t.Errorf("rows of a part without windings: %v", got)
	}
}

func TestInspectionOfInductor(t *testing.T) {
	l := Inductor{Construction: Construction{Windings: []Winding{{Name: "L", Turns: 18}}}}
	list := l.Inspection(Rating{OpenInductance: 57e-6, SelfCapacitance: 30e-12, Windings: []WindingRating{{Name: "L", DCResistance: 0.03}}},
		InspectionSettings{OpenTolerance: [2]float64{0.05, 0.05}, Frequency: 1e6, PeakCurrent: 6, ResistanceUp: 0.08, SampleToSample: 0.02})
	near(t, "L min", row(t, list, "E04").Min, 54.15e-6)
	near(t, "L at peak current", row(t, list, "E16").Min, 48.74e-6) // 0.9 x 54.15 = 48.735, inward
	// 1/(2 pi sqrt(57 uH 30 pF)) = 3.849 MHz: a tenth, two digits, down.
	if c := row(t, list, "E04").Conditions; !strings.Contains(c, "380 kHz") || !strings.Contains(c, "lowered") {
		t.Errorf("test frequency: %q", c)
	}
	if row(t, list, "E04").Terminals != "L start - L finish" {
		t.Errorf("terminals of an inductor without pins: %q", row(t, list, "E04").Terminals)
	}
	for _, c := range list {
		if strings.HasPrefix(c.ID, "E02") || c.ID == "E05" || c.ID == "E06" {
			t.Errorf("%s on the sheet of an inductor", c.ID)
		}
	}
}

func TestTestFrequency(t *testing.T) {
	for _, c := range []struct {
		wanted, l, c, want float64
		lowered            bool
	}{
		{100e3, 400e-6, 0, 100e3, false},      // not known
		{100e3, 400e-6, 10e-12, 100e3, false}, // 2.5 MHz
		{100e3, 400e-6, 100e-12, 79e3, true},  // 795.8 kHz
	} {
		f, lowered := TestFrequency(c.wanted, c.l, c.c)
		if math.Abs(f/c.want-1) > 1e-9 || lowered != c.lowered {
			t.Errorf("TestFrequency(%g, %g, %g) = %g %v, want %g %v", c.wanted, c.l, c.c, f, lowered, c.want, c.lowered)
		}
		if r := SelfResonance(c.l, c.c); r > 0 && f > c.wanted {
			t.Errorf("raised to %g", f)
		}
	}
}

func TestLimitsRoundInward(t *testing.T) {
	for _, c := range []struct {
		x    float64
		down bool
		want float64
	}{
		{281.79e-6, false, 281.8e-6}, {281.71e-6, false, 281.8e-6}, {324.29e-6, true, 324.2e-6}, {1e-3, true, 1e-3}, {270e-6 * (1 + 1e-13), true, 270e-6},
		{0.03, true, 0.03}, {99999, true, 99990}, {99991, false, 100000}, {0, true, 0},
	} {
		if got := inward(c.x, TestDigits, c.down); math.Abs(got-c.want) > 1e-12*c.want {
			t.Errorf("inward(%g, down %v) = %.12g, want %g", c.x, c.down, got, c.want)
		}
	}
}

func TestBuildable(t *testing.T) {
	tr, r, _ := inspected()
	r.Section.HeightLeft = 0.1e-3
	tr.Core.Gap = Gap{Kind: Spacer, Thickness: 0.3e-3, Foils: []float64{0.25e-3, 0.06e-3}}
	got := ""
	for _, w := range Buildable(tr.Construction, r, 4, 0.3e-3, []float64{0.25e-3, 0.05e-3}) {
		got += w.Code + " "
	}
	if got != "W401 W303 W303 " {
		t.Errorf("codes %q, want height, film not in stock, films that do not add up", got)
	}
}
