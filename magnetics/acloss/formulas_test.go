package acloss

import (
	"encoding/json"
	"math"
	"os"
	"testing"
)

type check struct {
	ID, Kind          string
	Value             float64
	DOverDelta        float64 `json:"d_over_delta"`
	Layers, Xi        float64
	ThicknessMM       float64 `json:"thickness_mm"`
	F                 float64 `json:"f_Hz"`
	Porosity          float64
	Rho               float64 `json:"rho_ohm_m"`
	DeltaMM           float64 `json:"delta_mm"`
	DMM               float64 `json:"d_mm"`
	TurnsPerLayer     float64 `json:"turns_per_layer"`
	BreadthMM         float64 `json:"breadth_mm"`
	HEquivalentMM     float64 `json:"h_equivalent_mm"`
	Dowell            float64
	BesselCentreField float64 `json:"bessel_centre_field"`
	StrandMM          float64 `json:"strand_mm"`
	Strands, Turns    float64
	BundleRadiusMM    float64 `json:"bundle_radius_mm"`
	FSkin             float64 `json:"F_skin"`
	FExternal         float64 `json:"F_external"`
	FInternal         float64 `json:"F_internal"`
	FTotal            float64 `json:"F_total"`
}

// The values have 16 digits; the file asks for 1e-9. They were made with
// mu0 = 4 pi 1e-7, ours is 1.3e-10 smaller: part of the 1e-9.
func TestFormulasAgainstTable(t *testing.T) {
	raw, err := os.ReadFile("../../testdata/acloss/checks.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Tolerance float64 `json:"tolerance_rel"`
		N         int     `json:"n_cases"`
		Cases     []check
	}
	if err := json.Unmarshal(raw, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) != file.N || file.N < 100 || file.Tolerance != 1e-9 {
		t.Fatalf("%d cases of %d, tolerance %g", len(file.Cases), file.N, file.Tolerance)
	}
	near := func(id, what string, got, want float64) {
		t.Helper()
		if e := math.Abs(got/want - 1); !(e <= file.Tolerance) {
			t.Errorf("%s: %s = %.15g, want %.15g: error %.1e", id, what, got, want, e)
		}
	}
	for _, c := range file.Cases {
		switch c.Kind {
		case "round_skin":
			near(c.ID, "RoundSkin", RoundSkin(c.DOverDelta), c.Value)
		case "round_transverse_field_G":
			near(c.ID, "RoundTransverse", RoundTransverse(c.DOverDelta), c.Value)
		case "dowell_foil":
			near(c.ID, "Dowell", Dowell(c.Layers, c.Xi), c.Value)
		case "dowell_foil_SI":
			delta := SkinDepth(c.F, c.Rho)
			near(c.ID, "SkinDepth", delta*1e3, c.DeltaMM)
			xi := Xi(c.ThicknessMM*1e-3, delta, c.Porosity)
			near(c.ID, "Xi", xi, c.Xi)
			near(c.ID, "Dowell", Dowell(c.Layers, xi), c.Value)
		case "round_wire_layers":
			delta := SkinDepth(c.F, c.Rho)
			d, b := c.DMM*1e-3, c.BreadthMM*1e-3
			h := EquivalentSquare(d)
			near(c.ID, "EquivalentSquare", h*1e3, c.HEquivalentMM)
			near(c.ID, "Dowell", Dowell(c.Layers, Xi(h, delta, c.TurnsPerLayer*h/b)), c.Dowell)
			per := c.TurnsPerLayer / b
			h2 := per * per * (4*c.Layers*c.Layers - 1) / 12 // mean of (i-1/2)^2 over the layers
			near(c.ID, "skin + field", RoundSkin(d/delta)+StrandFactor(d, delta, h2), c.BesselCentreField)
		case "litz_layerless":
			delta := SkinDepth(c.F, c.Rho)
			d, n2 := c.StrandMM*1e-3, c.Strands*c.Strands
			near(c.ID, "RoundSkin", RoundSkin(d/delta), c.FSkin)
			per := c.Turns / (c.BreadthMM * 1e-3)
			external := StrandFactor(d, delta, n2*per*per/3)
			internal := StrandFactor(d, delta, n2*BundleOwnField(c.BundleRadiusMM*1e-3))
			near(c.ID, "external", external, c.FExternal)
			near(c.ID, "internal", internal, c.FInternal)
			near(c.ID, "total", RoundSkin(d/delta)+external+internal, c.FTotal)
		default:
			t.Errorf("%s: kind %q is not known to the test", c.ID, c.Kind)
		}
	}
}

func TestLimits(t *testing.T) {
	// f -> 0 gives DC; the next terms of the series are below 1e-12 here.
	for name, v := range map[string]float64{
		"RoundSkin": RoundSkin(1e-4), "Dowell": Dowell(7, 1e-5),
	} {
		if math.Abs(v-1) > 1e-12 {
			t.Errorf("%s near DC = %.15g, want 1", name, v)
		}
	}
	if RoundSkin(0) != 1 || RoundTransverse(0) != 0 || Dowell(3, 0) != 1 {
		t.Error("DC is not exact")
	}
	if got, want := RoundTransverse(1e-3), math.Pi/32*1e-12; math.Abs(got/want-1) > 1e-9 {
		t.Errorf("RoundTransverse(1e-3) = %g, want %g", got, want)
	}
	// High frequency: published series, next term 0.1 delta/d and smaller.
	for _, x := range []float64{100, 1e4, 1e8} {
		if got, want := RoundSkin(x), x/4+0.25+3/(16*x); math.Abs(got/want-1) > 1e-6 {
			t.Errorf("RoundSkin(%g) = %g, want %g", x, got, want)
		}
		if got, want := RoundTransverse(x), math.Pi*x-math.Pi; math.Abs(got/want-1) > 1e-4 {
			t.Errorf("RoundTransverse(%g) = %g, want %g", x, got, want)
		}
	}
	// Nothing overflows, and the branches join.
	for _, x := range []float64{1e-200, 1e-6, 0.4999999, 0.5, 39.9999999, 40.0000001, 400, 800, 1e9, 1e200} {
		g1, g2 := Slab(x)
		for name, v := range map[string]float64{"g1": g1, "g2": g2, "dowell": Dowell(1.5, x)} {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				t.Errorf("%s(%g) = %g", name, x, v)
			}
		}
	}
	for _, x := range []float64{1e-6, 0.5, 40} {
		below, above := Dowell(6, math.Nextafter(x, 0)), Dowell(6, math.Nextafter(x, 100))
		if math.Abs(below/above-1) > 1e-13 {
			t.Errorf("Dowell jumps at %g: %.16g to %.16g", x, below, above)
		}
	}
}

// A stack of m foils seen one by one is Dowell's closed form: foil i has
// (i-1) and i ampere-turns at its faces.
func TestSlabsMakeDowell(t *testing.T) {
	for _, d := range []float64{0.01, 0.3, 1, 2.7, 9, 60} {
		g1, g2 := Slab(d)
		sum, m := 0.0, 5
		for i := 1; i <= m; i++ {
			a, b := float64(i-1), float64(i)
			sum += g1*(a*a+b*b) - 4*g2*a*b
		}
		if got, want := sum/float64(m), Dowell(float64(m), d); math.Abs(got/want-1) > 1e-10 {
			t.Errorf("D = %g: slabs %.12g, Dowell %.12g", d, got, want)
		}
	}
}

func TestSkinDepthAtDC(t *testing.T) {
	if d := SkinDepth(0, 1.7e-8); !math.IsInf(d, 1) || RoundSkin(1e-3/d) != 1 {
		t.Errorf("SkinDepth(0) = %g", d)
	}
}
