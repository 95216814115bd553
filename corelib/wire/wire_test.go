package wire

import (
	"encoding/json"
	"errors"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"gapwright/corelib/quantity"
)

// A check is one case of the check values; every kind uses some of the fields.
type check struct {
	ID           string      `json:"id"`
	Kind         string      `json:"kind"`
	Tolerance    float64     `json:"tolerance_rel"`
	ToleranceAbs float64     `json:"tolerance_abs"`
	AWG          int         `json:"awg"`
	D            float64     `json:"d_mm"`
	Area         float64     `json:"area_mm2"`
	R20          float64     `json:"r20_ohm_per_m"`
	Temperature  float64     `json:"temp_C"`
	Value        float64     `json:"value"`
	Grade        int         `json:"grade"`
	ValueMM      float64     `json:"value_mm"`
	MinIncrease  float64     `json:"min_increase_mm"`
	NextR20      float64     `json:"next_R20_mm"`
	Published    []*float64  `json:"published_mm"`
	Rule         []float64   `json:"rule_mm"`
	Strand       float64     `json:"strand_mm"`
	Strands      json.Number `json:"strands"`
	ODMax1       float64     `json:"od_max_g1_mm"`
	ODMin1       float64     `json:"od_min_g1_mm"`
	ODMax1Rule   float64     `json:"od_max_g1_by_rule"`
	ODMax2       float64     `json:"od_max_g2_mm"`
	ODMax2Rule   float64     `json:"od_max_g2_by_rule"`
	RNom         float64     `json:"r_nom_ohm_per_m"`
	RNomRule     float64     `json:"r_nom_by_rule"`
	Steps        int         `json:"bunching_steps"`
	Turns        float64     `json:"turns"`
	StrandAWG    int         `json:"strand_awg"`
	Frequency    float64     `json:"f_Hz"`
	Breadth      float64     `json:"breadth_mm"`
	PublishedFR  float64     `json:"published_F_R"`
	ComputedFR   float64     `json:"computed_F_R"`
	FR           float64     `json:"F_R"`
	N1Max        float64     `json:"n1_max"`
}

func readChecks(t *testing.T) (cases []check, tolerance float64) {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("..", "..", "testdata", "wire", "checks.json"))
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Tolerance float64 `json:"tolerance_rel"`
		Cases     []check `json:"cases"`
	}
	if err := json.Unmarshal(text, &file); err != nil {
		t.Fatal(err)
	}
	return file.Cases, file.Tolerance
}

func TestPublishedAndComputedValues(t *testing.T) {
	cases, usual := readChecks(t)
	if len(cases) != 38 {
		t.Fatalf("%d cases, want 38", len(cases))
	}
	for _, c := range cases {
		relative := usual
		if c.Tolerance > 0 {
			relative = c.Tolerance
		}
		near := func(what string, got, want, relative float64) {
			t.Helper()
			if !(math.Abs(got-want) <= relative*math.Abs(want)) {
				t.Errorf("%s: %s = %.12g, want %.12g within %g", c.ID, what, got, want, relative)
			}
		}
		absolute := func(what string, got, want, most float64) {
			t.Helper()
			if !(math.Abs(got-want) <= most) {
				t.Errorf("%s: %s = %.6g mm, want %.6g mm within %g", c.ID, what, got, want, most)
			}
		}
		strands, _ := c.Strands.Float64()
		switch c.Kind {
		case "awg_diameter":
			w := Wire{Kind: Solid, Diameter: AWGDiameter(c.AWG), Grade: 1}
			near("diameter", 1e3*w.Diameter, c.D, relative)
			near("section", 1e6*w.CopperArea(), c.Area, relative)
			near("resistance", w.ResistancePerLength(20), c.R20, relative)
		case "dc_resistance":
			w := Wire{Kind: Solid, Diameter: 1e-3 * c.D, Grade: 1}
			near("resistance", w.ResistancePerLength(c.Temperature), c.Value, relative)
		case "od_max_lookup":
			w := Wire{Kind: Solid, Diameter: 1e-3 * c.D, Grade: c.Grade}
			absolute("largest diameter", 1e3*w.OuterDiameterMax(), c.ValueMM, c.ToleranceAbs)
			least, _ := enamelled(w.Diameter, w.Grade)
			absolute("least increase", 1e3*(least-w.Diameter), c.MinIncrease, c.ToleranceAbs)
		case "od_max_intermediate":
			for g := range 3 {
				w := Wire{Kind: Solid, Diameter: 1e-3 * c.D, Grade: g + 1}
				absolute("largest diameter by the rule", 1e3*w.OuterDiameterMax(), c.Rule[g], 1e-9)
				if p := c.Published[g]; p != nil {
					absolute("published largest diameter", 1e3*w.OuterDiameterMax(), *p, c.ToleranceAbs)
				}
			}
		case "litz_od_published":
			one := Wire{Kind: Litz, Strands: int(strands), Diameter: 1e-3 * c.Strand, Grade: 1}
			two := one
			two.Grade = 2
			near("largest bundle of grade 1", 1e3*one.OuterDiameterMax(), c.ODMax1Rule, 1e-9)
			near("published largest bundle of grade 1", 1e3*one.OuterDiameterMax(), c.ODMax1, relative)
			near("largest bundle of grade 2", 1e3*two.OuterDiameterMax(), c.ODMax2Rule, 1e-9)
			near("published largest bundle of grade 2", 1e3*two.OuterDiameterMax(), c.ODMax2, relative)
			// The nominal diameter lies between the published limits.
			if od := 1e3 * one.OuterDiameter(); od < c.ODMin1 || od > c.ODMax1 {
				t.Errorf("%s: nominal bundle %.4f mm is outside the published %.3f..%.3f mm", c.ID, od, c.ODMin1, c.ODMax1)
			}
			if got := BunchingSteps(one.Strands); got != c.Steps {
				t.Errorf("%s: %d bunching steps, want %d", c.ID, got, c.Steps)
			}
			near("nominal resistance", one.NominalResistancePerLength(), c.RNomRule, 1e-9)
			near("published nominal resistance", one.NominalResistancePerLength(), c.RNom, relative)
		case "litz_published_example":
			// The example takes copper of 1.72e-8 ohm m.
			delta := math.Sqrt(1.72e-8 / (math.Pi * c.Frequency * quantity.Mu0))
			got := LowFrequencyFactor(c.Turns, int(strands), AWGDiameter(c.StrandAWG), delta, 1e-3*c.Breadth)
			near("F_R", got, c.ComputedFR, 1e-8) // the file took mu0 = 4 pi e-7, 1.3e-10 off
			near("published F_R", got, c.PublishedFR, relative)
		case "strands_for_FR":
			delta := SkinDepth(c.Frequency, 20)
			near("strands", StrandsForFactor(c.FR, c.Turns, 1e-3*c.Strand, delta, 1e-3*c.Breadth), strands, relative)
			near("first bunch", FirstBunchMost(1e-3*c.Strand, delta), c.N1Max, relative)
			near("F_R of that many strands", LowFrequencyFactor(c.Turns, int(math.Round(strands)), 1e-3*c.Strand, delta, 1e-3*c.Breadth)-1,
				(c.FR-1)*math.Pow(math.Round(strands)/strands, 2), 1e-6)
		default:
			t.Errorf("%s: unknown kind %q", c.ID, c.Kind)
		}
	}
}

// A published litz table of 0.020 mm strands: bundles with and without serving
// and their nominal resistance. 1.5 % is the rounding of its last digit; the
// printed nominal resistance of 12 strands is 0.6 % off its own limits.
func TestPublishedLitzTable(t *testing.T) {
	rows := readCSV(t, "litz_published.csv")
	if len(rows) != 8 {
		t.Fatalf("%d rows, want 8", len(rows))
	}
	for _, row := range rows {
		n := int(row["strands"])
		for _, c := range []struct {
			grade       int
			serving     Serving
			least, most string
		}{{1, NoServing, "OD_g1_min", "OD_g1_max"}, {2, NoServing, "OD_g2_min", "OD_g2_max"}, {1, SingleServing, "OD1S_g1_min", "OD1S_g1_max"}, {1, DoubleServing, "OD2S_g1_min", "OD2S_g1_max"}} {
			w := Wire{Kind: Litz, Strands: n, Diameter: 0.02e-3, Grade: c.grade, Serving: c.serving}
			if most, ok := row[c.most]; ok {
				if got := 1e3 * w.OuterDiameterMax(); math.Abs(got/most-1) > 0.015 {
					t.Errorf("%s: largest diameter %.4f mm, published %.3f mm", w, got, most)
				}
				if got := 1e3 * w.OuterDiameter(); got < row[c.least] || got > most {
					t.Errorf("%s: nominal diameter %.4f mm is outside the published %.3f..%.3f mm", w, got, row[c.least], most)
				}
			}
		}
		w := Wire{Kind: Litz, Strands: n, Diameter: 0.02e-3, Grade: 1}
		if got := w.NominalResistancePerLength(); math.Abs(got/row["R_nom_ohm_m"]-1) > 0.0075 {
			t.Errorf("%s: nominal resistance %.4f ohm/m, published %.4f", w, got, row["R_nom_ohm_m"])
		}
		if got := w.ResistancePerLength(20); got < row["R_min"] || got > row["R_max"] {
			t.Errorf("%s: resistance %.4f ohm/m is outside the published %.4f..%.4f", w, got, row["R_min"], row["R_max"])
		}
	}
}

func TestEverySize(t *testing.T) {
	sizes := Sizes("")
	if len(sizes) != 80 {
		t.Errorf("%d sizes, want 80", len(sizes))
	}
	if n := len(Sizes("R20")) + len(Sizes("R40")); n != len(sizes) {
		t.Errorf("R20 and R40 have %d sizes together, want %d", n, len(sizes))
	}
	for i, s := range sizes {
		if s.Source == "" {
			t.Errorf("%g m has no source", s.Diameter)
		}
		for g := range 3 {
			w := Wire{Kind: Solid, Diameter: s.Diameter, Grade: g + 1}
			least, most := enamelled(w.Diameter, w.Grade)
			if !(s.Diameter < least && least < most) {
				t.Errorf("%s: least %g m, most %g m", w, least, most)
			}
			if i == 0 {
				continue
			}
			before := Wire{Kind: Solid, Diameter: sizes[i-1].Diameter, Grade: g + 1}
			if w.Diameter <= before.Diameter || w.OuterDiameterMax() <= before.OuterDiameterMax() || w.OuterDiameter() <= before.OuterDiameter() {
				t.Errorf("%s is not larger than %s", w, before)
			}
			if g > 0 {
				thinner := Wire{Kind: Solid, Diameter: s.Diameter, Grade: g}
				if w.OuterDiameterMax() <= thinner.OuterDiameterMax() {
					t.Errorf("%s is not thicker than %s", w, thinner)
				}
			}
		}
	}
	if got := len(LitzStrands()); got != 20 {
		t.Errorf("%d strand sizes, want 20", got)
	}
	if n := len(LitzCounts()); n < 27 {
		t.Errorf("%d strand counts, want the 27 single bunches and more", n)
	}
	for _, list := range [][]float64{LitzStrands(), FoilThicknesses(), TripleInsulatedDiameters()} {
		for i, v := range list {
			if v <= 0 || i > 0 && v <= list[i-1] {
				t.Errorf("%g m does not rise in %v", v, list)
			}
		}
	}
	for i, n := range LitzCounts() {
		if i > 0 && n <= LitzCounts()[i-1] {
			t.Errorf("%d does not rise in %v", n, LitzCounts())
		}
	}
}

// A bundle of any usual litz holds its copper: the share of copper in the circle
// of the nominal bundle stays between the 0.4 of the thinnest strands and the 0.6 of the thickest: both
// follow from the packing factor and the enamel, and neither is near the 0.91 of
// the densest packing of circles.
func TestCopperShareOfLitz(t *testing.T) {
	for _, d := range LitzStrands() {
		for _, n := range LitzCounts() {
			w := Wire{Kind: Litz, Strands: n, Diameter: d, Grade: 1}
			od := w.OuterDiameter()
			if share := w.CopperArea() / (math.Pi / 4 * od * od); share < 0.4 || share > 0.6 {
				t.Errorf("%s: copper fills %.2f of its bundle", w, share)
			}
			// Resistance times section times conductivity is the twist alone.
			if k := w.ResistancePerLength(20) * w.CopperArea() * Conductivity; k < 1.019 || k > 1.061 {
				t.Errorf("%s: twist factor %.3f", w, k)
			}
		}
	}
}

func TestTextRoundTrip(t *testing.T) {
	for text, want := range map[string]string{
		"120 x 0.1 mm litz":                                    "",
		"120x0.1mm Litz":                                       "120 x 0.1 mm litz",
		"120 × 100 µm litz":                                    "120 x 0.1 mm litz",
		"60 x 71 um litz grade 2 double serving":               "60 x 0.071 mm litz grade 2, double serving",
		"60 x 0.071 mm litz, single serving":                   "",
		"60 x 0.071 mm litz, no serving":                       "60 x 0.071 mm litz",
		"60 x 0.071 mm litz, single serving, triple-insulated": "",
		"450 x AWG 40 litz":                                    "",
		"450 x awg40 litz, grade 3":                            "450 x AWG 40 litz grade 3",
		"AWG 24":                                               "",
		"awg24":                                                "AWG 24",
		"AWG 24 grade 1":                                       "",
		"AWG 24 grade 2":                                       "AWG 24",
		"AWG 24 triple insulated":                              "AWG 24 triple-insulated",
		"0.5 mm":                                               "0.5 mm grade 2",
		"0.50 mm grade 2":                                      "0.5 mm grade 2",
		".5mm solid grade 1":                                   "0.5 mm grade 1",
		"0.5 mm triple-insulated":                              "",
		"0.2 mm foil":                                          "",
		"35 um foil":                                           "0.035 mm foil",
		"0.018 mm grade 3":                                     "",
		"AWG 8":                                                "",
	} {
		w, err := Parse(text)
		if err != nil {
			t.Error(err)
			continue
		}
		if want == "" {
			want = text
		}
		if got := w.String(); got != want {
			t.Errorf("Parse(%q) prints %q, want %q", text, got, want)
		}
		again, err := Parse(w.String())
		if err != nil || again != w {
			t.Errorf("Parse(%q) = %+v, %v, want %+v", w.String(), again, err, w)
		}
	}
}

func TestNotAWire(t *testing.T) {
	for _, c := range []struct{ text, problem, nearest string }{
		{"", "empty", "0.2 mm foil"},
		{"0.5", "0.5 is a bare number", "0.5 mm grade 2"},
		{"24", "24 is a bare number", "AWG 24"},
		{"120x0.1", "bare number", "120 x 0.1 mm litz"},
		{"120 strands of 0,1", "not understood", "120 x 0.1 mm litz"},
		{"0,5 mm", "decimal mark is a point", "0.5 mm grade 2"},
		{"0.5 inch", "bare number", "0.5 mm grade 2"},
		{"foil 0.2", "not the text of a wire", "0.2 mm foil"},
		{"5 mm", "a diameter of 5 mm", "3.15 mm grade 2"},
		{"0.01 mm", "a diameter of 0.01 mm", "0.018 mm grade 2"},
		{"AWG 60", "no AWG 60", "AWG 50"},
		{"AWG 7", "no AWG 7", "mm"},
		{"2 x 0.1 mm litz", "2 strands", "3 x 0.1 mm litz"},
		{"99999999999999999999 x 0.1 mm litz", "is no number of strands", "litz"},
		{"0.5 mm grade 4", "the grades are 1, 2, 3", "0.5 mm grade 2"},
		{"0.5 mm grade 1 grade 2", "given twice", "0.5 mm"},
		{"0.5 mm, single serving", "only litz is served", "0.5 mm"},
		{"0.2 mm foil grade 1", "no enamel grade", "0.2 mm foil"},
		{"0.2 mm foil triple-insulated", "not triple-insulated", "0.2 mm foil"},
		{"0.5 mm grade 2 triple-insulated", "has no enamel grade", "0.5 mm triple-insulated"},
		{"AWG 24 foil", "a thickness, no gauge", "foil"},
		{"litz", "not the text of a wire", "120 x 0.1 mm litz"},
		{"0.5 mm round", `"round" is not understood`, "0.5 mm grade 2"},
	} {
		_, err := Parse(c.text)
		e, ok := errors.AsType[*SyntaxError](err)
		if !ok {
			t.Errorf("Parse(%q) = %v, want a *SyntaxError", c.text, err)
			continue
		}
		if !strings.Contains(e.Problem, c.problem) && !(c.text == "120 strands of 0,1") || !strings.Contains(e.Nearest, c.nearest) {
			t.Errorf("Parse(%q): %v; want %q and %q", c.text, err, c.problem, c.nearest)
		}
	}
}

func TestConductors(t *testing.T) {
	foil := Wire{Kind: Foil, Thickness: 0.2e-3, Width: 25e-3}
	if got, want := foil.ResistancePerLength(20), 1/(58e6*5e-6); math.Abs(got/want-1) > 1e-12 {
		t.Errorf("foil: %g ohm/m, want %g", got, want)
	}
	if got := foil.OuterDiameter(); got != 0.2e-3 {
		t.Errorf("foil: build height %g m", got)
	}
	if got, want := foil.CopperMassPerLength(), 8890*5e-6; math.Abs(got/want-1) > 1e-12 {
		t.Errorf("foil: %g kg/m, want %g", got, want)
	}
	if got := Resistivity(20); math.Abs(got/1.724137931034483e-08-1) > 1e-12 { // IEC 60028
		t.Errorf("Resistivity(20) = %g", got)
	}
	// 66.1 mm over the root of the frequency at 20 °C, to three digits.
	if got := SkinDepth(1, 20); math.Abs(got-66.1e-3) > 0.05e-3 {
		t.Errorf("SkinDepth(1 Hz) = %g m, want 66.1 mm", got)
	}
	if got, want := SkinDepth(1e5, 100), math.Sqrt(Resistivity(100)/(math.Pi*1e5*quantity.Mu0)); got != want {
		t.Errorf("SkinDepth(100 kHz, 100 °C) = %g, want %g", got, want)
	}
	// 120 strands of 0.1 mm, 4 % longer than the bundle: 0.94248 mm2 of copper.
	if got, want := (Wire{Kind: Litz, Strands: 120, Diameter: 0.1e-3, Grade: 1}).CopperMassPerLength(), 8890*120*math.Pi/4*1e-8*1.04; math.Abs(got/want-1) > 1e-12 {
		t.Errorf("litz: %g kg/m, want %g", got, want)
	}
	tiw := Wire{Kind: Solid, Diameter: 0.5e-3, TripleInsulated: true}
	if math.Abs(tiw.OuterDiameter()-0.7e-3) > 1e-12 || math.Abs(tiw.OuterDiameterMax()-0.75e-3) > 1e-12 {
		t.Errorf("triple-insulated 0.5 mm: %g and %g m", tiw.OuterDiameter(), tiw.OuterDiameterMax())
	}
	litz := Wire{Kind: Litz, Strands: 120, Diameter: 0.1e-3, Grade: 1, Serving: SingleServing}
	jacket := litz.WithTripleInsulation()
	if d := jacket.OuterDiameter() - litz.OuterDiameter(); math.Abs(d-0.2e-3) > 1e-12 {
		t.Errorf("an insulated jacket adds %g m, want 0.2 mm", d)
	}
	if !strings.Contains(strings.Join(jacket.Sources(), "; "), FromMemory) || len(litz.Sources()) != 4 {
		t.Errorf("sources: %q", jacket.Sources())
	}
	defer func() {
		if recover() == nil {
			t.Error("the section of a foil without width did not panic")
		}
	}()
	Wire{Kind: Foil, Thickness: 0.2e-3}.CopperArea()
}

// Between two nominal sizes the enamel is that of the next larger R20 size; the
// change happens right at the size.
func TestEnamelBetweenSizes(t *testing.T) {
	for d, want := range map[float64]float64{0.5e-3: 0.566e-3, 0.4999e-3: 0.4999e-3 + 0.066e-3, 0.5003e-3: 0.5003e-3 + 0.07e-3} {
		w := Wire{Kind: Solid, Diameter: d, Grade: 2}
		if got := w.OuterDiameterMax(); math.Abs(got-want) > 1e-10 {
			t.Errorf("%s: largest diameter %.5f mm, want %.5f mm", w, 1e3*got, 1e3*want)
		}
	}
	// 0.067 mm has no grade 3 of its own: the increase of 0.071 mm, 0.026 mm.
	if got := (Wire{Kind: Solid, Diameter: 0.067e-3, Grade: 3}).OuterDiameterMax(); math.Abs(got-0.093e-3) > 1e-10 {
		t.Errorf("0.067 mm grade 3: %g m, want 0.093 mm", got)
	}
}

func FuzzParse(f *testing.F) {
	for _, s := range []string{"120 x 0.1 mm litz", "AWG 24", "0.5 mm grade 2", "0.2 mm foil", "0.5 mm triple-insulated", "7 x AWG 40 litz, double serving, triple-insulated", "1e3", "0.5 mm grade", ",", "x", "× 0.1"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, text string) {
		w, err := Parse(text)
		if err != nil {
			e, ok := errors.AsType[*SyntaxError](err)
			if !ok || e.Nearest == "" || e.Problem == "" {
				t.Fatalf("Parse(%q): %v says too little", text, err)
			}
			// A single proposal must itself be a wire.
			if !strings.Contains(e.Nearest, " or ") {
				if _, err := Parse(e.Nearest); err != nil {
					t.Fatalf("Parse(%q) proposes %q: %v", text, e.Nearest, err)
				}
			}
			return
		}
		again, err := Parse(w.String())
		if err != nil || again != w {
			t.Fatalf("Parse(%q) prints %q, which reads as %+v, %v", text, w, again, err)
		}
		if w.Kind == Foil {
			w.Width = 10e-3
		}
		for _, v := range []float64{w.OuterDiameter(), w.OuterDiameterMax(), w.CopperArea(), w.ResistancePerLength(100), w.CopperMassPerLength()} {
			if !(v > 0) || math.IsInf(v, 0) {
				t.Fatalf("%s: %g", w, v)
			}
		}
		if w.OuterDiameterMax() < w.OuterDiameter() {
			t.Fatalf("%s: largest diameter %g below the nominal %g", w, w.OuterDiameterMax(), w.OuterDiameter())
		}
	})
}

func BenchmarkParse(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		if _, err := Parse("120 x 0.1 mm litz, single serving"); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkFigures(b *testing.B) {
	w := Wire{Kind: Litz, Strands: 120, Diameter: 0.1e-3, Grade: 1}
	b.ReportAllocs()
	for b.Loop() {
		_ = w.OuterDiameterMax() + w.ResistancePerLength(100)
	}
}
