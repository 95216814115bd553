package insulation

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

type check struct {
	ID                  string  `json:"id"`
	Kind                string  `json:"kind"`
	Rms                 float64 `json:"V_rms"`
	Peak                float64 `json:"V_peak"`
	Group               string  `json:"material_group"`
	Degree              int     `json:"pollution_degree"`
	Insulation          Grade   `json:"insulation"`
	Basic               float64 `json:"basic_mm"`
	Value               float64 `json:"value"`
	ValueMM             float64 `json:"value_mm"`
	Reinforced          float64 `json:"reinforced_mm"`
	Altitude            float64 `json:"altitude_m"`
	ReinforcedAt230     float64 `json:"reinforced_clearance_230V_mm"`
	Mains               float64 `json:"mains_V_rms_line_to_neutral"`
	MainsOfReport       float64 `json:"mains_V_rms"`
	Category            string  `json:"overvoltage_category"`
	Withstand           float64 `json:"required_withstand_V"`
	BasicClearance      float64 `json:"basic_clearance_mm"`
	ReinforcedClearance float64 `json:"reinforced_clearance_mm"`
}

func TestTableAndReportValues(t *testing.T) {
	text, err := os.ReadFile(filepath.Join("..", "..", "testdata", "insulation", "checks.json"))
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Tolerance float64 `json:"tolerance_abs"`
		Cases     []check `json:"cases"`
	}
	if err := json.Unmarshal(text, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) != 22 {
		t.Fatalf("%d cases, want 22", len(file.Cases))
	}
	for _, c := range file.Cases {
		mm := func(what string, got, want float64) {
			t.Helper()
			if !(math.Abs(1e3*got-want) <= file.Tolerance) {
				t.Errorf("%s: %s = %.6g mm, want %.6g mm", c.ID, what, 1e3*got, want)
			}
		}
		creepage := func() Proposal {
			t.Helper()
			p, err := Creepage(Conditions{Grade: c.Insulation, WorkingVoltage: c.Rms, PollutionDegree: c.Degree, MaterialGroup: c.Group})
			if err != nil {
				t.Fatalf("%s: %v", c.ID, err)
			}
			return p
		}
		clearance := func(grade Grade, mains float64, category string, altitude float64) Proposal {
			t.Helper()
			// The working voltage is low, so that the transients decide.
			p, err := Clearance(Conditions{Grade: grade, WorkingVoltage: 100, Mains: &Mains{mains, category}, PollutionDegree: 2, MaterialGroup: "IIIa", Altitude: altitude})
			if err != nil {
				t.Fatalf("%s: %v", c.ID, err)
			}
			return p
		}
		switch c.Kind {
		case "creepage":
			p := creepage()
			mm("creepage", p.Distance, c.ValueMM)
			mm("basic creepage", p.Basic, c.Basic)
		case "clearance_above_30kHz":
			for grade, want := range map[Grade]float64{Basic: c.Basic, Reinforced: c.Reinforced} {
				p, err := Clearance(Conditions{Grade: grade, WorkingVoltage: c.Peak / 2, WorkingVoltagePeak: c.Peak, PollutionDegree: 2, MaterialGroup: "II"})
				if err != nil {
					t.Fatalf("%s: %v", c.ID, err)
				}
				mm(string(grade)+" clearance", p.Distance, want)
			}
		case "altitude_factor":
			got, _, err := AltitudeFactor(c.Altitude)
			if err != nil || math.Abs(got-c.Value) > file.Tolerance {
				t.Errorf("%s: factor %g, %v, want %g", c.ID, got, err, c.Value)
			}
			mm("reinforced clearance at 230 V", clearance(Reinforced, 230, "II", c.Altitude).Distance, c.ReinforcedAt230)
		case "clearance_mains":
			withstand, _, err := RequiredWithstand(Mains{c.Mains, c.Category})
			if err != nil || withstand != c.Withstand {
				t.Errorf("%s: withstand %g V, %v, want %g V", c.ID, withstand, err, c.Withstand)
			}
			mm("basic clearance", clearance(Basic, c.Mains, c.Category, 0).Distance, c.Basic)
			mm("reinforced clearance", clearance(Reinforced, c.Mains, c.Category, 0).Distance, c.Reinforced)
		case "published_report":
			if c.Rms > 0 {
				mm("creepage", creepage().Distance, c.ValueMM)
				continue
			}
			withstand, _, err := RequiredWithstand(Mains{c.MainsOfReport, "II"})
			if err != nil || withstand != c.Withstand {
				t.Errorf("%s: withstand %g V, %v, want %g V", c.ID, withstand, err, c.Withstand)
			}
			mm("basic clearance", clearance(Basic, c.MainsOfReport, "II", 0).Distance, c.BasicClearance)
			mm("reinforced clearance", clearance(Reinforced, c.MainsOfReport, "II", 0).Distance, c.ReinforcedClearance)
		default:
			t.Errorf("%s: unknown kind %q", c.ID, c.Kind)
		}
	}
}

// Every row of every table has its source, and distances grow with voltage and
// with dirt.
func TestEveryRow(t *testing.T) {
	tables := embedded()
	for i, r := range tables.creepage {
		if r.source == "" {
			t.Errorf("creepage at %g V has no source", r.voltage)
		}
		for c, d := range r.distance {
			if i > 0 && (r.voltage <= tables.creepage[i-1].voltage || d < tables.creepage[i-1].distance[c]) {
				t.Errorf("creepage at %g V, column %d: %g m does not grow", r.voltage, c, d)
			}
		}
		for c := 1; c < 3; c++ {
			if r.distance[1+c] < r.distance[c] || r.distance[4+c] < r.distance[3+c] || r.distance[3+c] < r.distance[c] || r.distance[c] < r.distance[0] {
				t.Errorf("creepage at %g V does not grow with the group and the pollution: %v", r.voltage, r.distance)
			}
		}
	}
	preferred := 0
	for i, r := range tables.impulse {
		if r.source == "" {
			t.Errorf("clearance at %g V has no source", r.impulse)
		}
		if r.preferred {
			preferred++
		}
		for c, d := range r.distance {
			if i > 0 && d < tables.impulse[i-1].distance[c] || c > 0 && d < r.distance[c-1] {
				t.Errorf("clearance at %g V, pollution %d: %g m does not grow", r.impulse, c+1, d)
			}
		}
	}
	if preferred != 9 {
		t.Errorf("%d preferred impulse voltages, want 9", preferred)
	}
	for i, r := range tables.steady {
		if r.source == "" || math.Abs(r.reinforced-2*r.basic) > 1e-9 || i > 0 && r.basic <= tables.steady[i-1].basic {
			t.Errorf("steady clearance %+v", r)
		}
	}
	for i, r := range tables.altitude {
		if r.source == "" || i > 0 && r.factor <= tables.altitude[i-1].factor {
			t.Errorf("altitude %+v", r)
		}
	}
	for i, r := range tables.transient {
		if r.source == "" {
			t.Errorf("transient %+v", r)
		}
		for c, v := range r.impulse {
			if c > 0 && v <= r.impulse[c-1] || i > 0 && v <= tables.transient[i-1].impulse[c] {
				t.Errorf("transients do not grow: %+v", r)
			}
		}
	}
	if n := len(tables.creepage); n != 24 {
		t.Errorf("%d creepage rows, want 24", n)
	}
	if n := len(tables.impulse); n != 19 {
		t.Errorf("%d impulse rows, want 19", n)
	}
	for _, tape := range Tapes() {
		if tape.Source == "" || tape.Thickness <= 0 {
			t.Errorf("tape %+v", tape)
		}
	}
	for i, c := range ThermalClasses() {
		if c.Source == "" || i > 0 && c.Temperature <= ThermalClasses()[i-1].Temperature {
			t.Errorf("thermal class %+v", c)
		}
	}
	if len(Cautions()) < 6 || BarrierLayers(Reinforced) != 3 || BarrierLayers(Basic) != 1 {
		t.Error("cautions or barrier layers")
	}
}

func TestRounding(t *testing.T) {
	for _, c := range []struct{ mm, want float64 }{
		{3.2, 3.2}, {2.5 + 0.7*50/70, 3.0}, {3.001, 3.1}, {0.5, 0.5}, {0.501, 0.6}, {0.145, 0.15}, {0.07, 0.07}, {0.1 + 0.2, 0.3},
	} {
		if got := 1e3 * roundDistance(c.mm*1e-3); math.Abs(got-c.want) > 1e-9 {
			t.Errorf("roundDistance(%.9g mm) = %.6g mm, want %.6g mm", c.mm, got, c.want)
		}
	}
	// Rows stand as printed: 12.5 V in pollution degree 2 is 0.42 mm, doubled 0.84 mm.
	p, err := Creepage(Conditions{Grade: Reinforced, WorkingVoltage: 12.5, PollutionDegree: 2, MaterialGroup: "I"})
	if err != nil || math.Abs(p.Distance-0.84e-3) > 1e-12 {
		t.Errorf("creepage at 12.5 V = %g m, %v, want 0.84 mm", p.Distance, err)
	}
}

// 700 V recurring peak is 0.145 mm in pollution degree 2: 0.8 and 1.4 of it in
// degrees 1 and 3, rounded up to 0.01 mm. 2000 V impulse is no preferred voltage:
// 160 % of it is 3200 V, and between 2 mm at 3000 V and 3 mm at 4000 V that is
// 2.2 mm.
func TestPollutionAndOtherImpulses(t *testing.T) {
	for degree, want := range map[int]float64{1: 0.12, 2: 0.15, 3: 0.21} {
		basic, _, _, err := steady(700, degree)
		if err != nil || math.Abs(1e3*basic-want) > 1e-9 {
			t.Errorf("degree %d: %g mm, %v, want %g mm", degree, 1e3*basic, err, want)
		}
	}
	basic, reinforced, _, err := impulse(2000, 2)
	if err != nil || math.Abs(1e3*basic-1) > 1e-9 || math.Abs(1e3*reinforced-2.2) > 1e-9 {
		t.Errorf("2000 V impulse: %g and %g mm, %v, want 1 and 2.2 mm", 1e3*basic, 1e3*reinforced, err)
	}
}

func TestPropose(t *testing.T) {
	// 120 V mains in category III asks for a wider clearance than the creepage of
	// 60 V in material group I.
	creepage, clearance, err := Propose(Conditions{Grade: Reinforced, WorkingVoltage: 60, Mains: &Mains{120, "III"}, PollutionDegree: 2, MaterialGroup: "I"})
	if err != nil {
		t.Fatal(err)
	}
	if creepage.Distance != clearance.Distance || math.Abs(clearance.Distance-3e-3) > 1e-12 {
		t.Errorf("creepage %g m, clearance %g m, want 3 mm of both", creepage.Distance, clearance.Distance)
	}
	text := strings.Join(creepage.Assumptions, "\n")
	for _, want := range []string{"working voltage 60 V", "pollution degree 2", "CTI 600", "30 kHz", "raised to the clearance"} {
		if !strings.Contains(text, want) {
			t.Errorf("the assumptions do not say %q:\n%s", want, text)
		}
	}
	text = strings.Join(clearance.Assumptions, "\n")
	for _, want := range []string{"overvoltage category III", "2500 V", "altitude up to 2000 m", "sqrt(2)"} {
		if !strings.Contains(text, want) {
			t.Errorf("the assumptions do not say %q:\n%s", want, text)
		}
	}
	if len(clearance.Sources) < 3 || len(creepage.Sources) == 0 {
		t.Errorf("sources %q, %q", creepage.Sources, clearance.Sources)
	}
	_, clearance, err = Propose(Conditions{Grade: Functional, WorkingVoltage: 200, PollutionDegree: 3, MaterialGroup: "IIIb"})
	if err != nil {
		t.Fatal(err)
	}
	// 283 V peak: 0.07 mm times 1.4 in pollution degree 3, rounded up to 0.1 mm.
	if math.Abs(clearance.Distance-0.1e-3) > 1e-12 {
		t.Errorf("functional clearance %g m, want 0.1 mm", clearance.Distance)
	}
	if text := strings.Join(clearance.Assumptions, "\n"); !strings.Contains(text, "common practice") || !strings.Contains(text, "transients are not considered") {
		t.Errorf("assumptions:\n%s", text)
	}
}

// More voltage never means less distance, but for the rounding of interpolated
// values, which rows are spared: 0.1 mm, twice that when doubled.
func TestDistancesNeverShrink(t *testing.T) {
	for _, grade := range []Grade{Basic, Reinforced} {
		rounding := 0.1e-3
		if grade == Reinforced {
			rounding = 0.2e-3
		}
		for degree := 1; degree <= 3; degree++ {
			lastCreepage, lastClearance := 0.0, 0.0
			for v := 5.0; v <= 1400; v += 7 {
				creepage, clearance, err := Propose(Conditions{Grade: grade, WorkingVoltage: v, PollutionDegree: degree, MaterialGroup: "IIIa"})
				if err != nil {
					t.Fatalf("%g V: %v", v, err)
				}
				if creepage.Distance < lastCreepage-rounding || clearance.Distance < lastClearance {
					t.Errorf("%s, degree %d: at %g V creepage %g m, clearance %g m shrink", grade, degree, v, creepage.Distance, clearance.Distance)
				}
				lastCreepage, lastClearance = creepage.Distance, clearance.Distance
			}
		}
	}
}

func TestImpossibleConditions(t *testing.T) {
	good := Conditions{Grade: Reinforced, WorkingVoltage: 250, Mains: &Mains{230, "II"}, PollutionDegree: 2, MaterialGroup: "IIIa"}
	if _, _, err := Propose(good); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		change func(*Conditions)
		want   string
	}{
		{func(c *Conditions) { c.Grade = "double" }, `grade "double"`},
		{func(c *Conditions) { c.WorkingVoltage = 0 }, "working voltage 0 V"},
		{func(c *Conditions) { c.WorkingVoltage = math.NaN() }, "working voltage NaN V"},
		{func(c *Conditions) { c.WorkingVoltage = 2500 }, "ends at 2000 V"},
		{func(c *Conditions) { c.WorkingVoltagePeak = 100 }, "below the rms value"},
		{func(c *Conditions) { c.WorkingVoltagePeak = 2100 }, "recurring peak of 2100 V"},
		{func(c *Conditions) { c.PollutionDegree = 4 }, "pollution degree 4"},
		{func(c *Conditions) { c.MaterialGroup = "IV" }, `material group "IV"`},
		{func(c *Conditions) { c.Altitude = 12000 }, "altitude of 1.2e+04 m"},
		{func(c *Conditions) { c.Mains = &Mains{230, "V"} }, `overvoltage category "V"`},
		{func(c *Conditions) { c.Mains = &Mains{690, "II"} }, "mains of 690 V"},
	} {
		bad := good
		c.change(&bad)
		_, _, err := Propose(bad)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%+v: got %v, want %q", bad, err, c.want)
		}
	}
}

func BenchmarkPropose(b *testing.B) {
	c := Conditions{Grade: Reinforced, WorkingVoltage: 281, Mains: &Mains{230, "II"}, PollutionDegree: 2, MaterialGroup: "IIIa"}
	b.ReportAllocs()
	for b.Loop() {
		if _, _, err := Propose(c); err != nil {
			b.Fatal(err)
		}
	}
}
