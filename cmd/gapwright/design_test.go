package main

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"gapwright/magnetics/job"
)

// smallJob is the demo with few core sizes, so that it is quick; the main job
// over the whole table runs by itself.
func smallJob() string {
	return strings.Replace(string(job.DemoText()), "families: [ETD, PQ, RM, E, EFD]", "shapes: [ETD 29/16/10, PQ 40/40, RM 8]", 1)
}

// designed mirrors the parts of design.json that scripts rely on.
type designed struct {
	Format      int
	Title       string
	Feasible    bool
	Transformer *struct {
		Core, Material, Arrangement string
		GapKind                     string  `json:"gap_kind"`
		Gap                         float64 `json:"gap"`
		Pieces                      int     `json:"gap_pieces"`
		Np                          int     `json:"primary_turns"`
		Ns                          int     `json:"secondary_turns"`
		Windings                    []struct {
			Name       string
			Turns      int
			Wire       string
			Resistance float64 `json:"dc_resistance"`
			Area       float64 `json:"conductor_area"`
			MLT        float64 `json:"mean_length_of_turn"`
		}
		Lp      float64   `json:"open_inductance"`
		Ls      float64   `json:"secondary_open_inductance"`
		Lsc     float64   `json:"short_inductance"`
		Halves  []float64 `json:"short_inductance_halves"`
		Lm      float64   `json:"magnetizing_inductance"`
		Ratio   float64   `json:"effective_turns_ratio"`
		Flux    float64   `json:"flux_density_peak"`
		Height  float64   `json:"height_left"`
		Mass    float64
		Volume  float64
		Corners []struct {
			Name     string
			CoreLoss float64                              `json:"core_loss"`
			Winding  struct{ Primary, Secondary float64 } `json:"winding_loss"`
			Core     *float64                             `json:"core_temperature"`
		}
	}
	Inductor *struct {
		Core       string
		Turns      int
		Inductance float64
		Gap        float64
	}
	AsBuilt *struct {
		Lr, Lm  float64
		LrKey   float64 `json:"resonant_inductance"`
		LmKey   float64 `json:"magnetizing_inductance"`
		Ratio   float64 `json:"turns_ratio"`
		Corners []struct{ Name, Status string }
	} `json:"tank_as_built"`
	Verdicts []struct {
		Part, Corner, Limit, Unit, Sense string
		Value, Bound                     float64
		Pass                             bool
	}
	Warnings []struct{ Code, Text string }
	Models   []struct{ Quantity, Model, Source string }
}

func readDesign(t *testing.T, text string) designed {
	t.Helper()
	var d designed
	if err := json.Unmarshal([]byte(text), &d); err != nil {
		t.Fatalf("%v in %.200s", err, text)
	}
	return d
}

func TestDesign(t *testing.T) {
	out := filepath.Join(t.TempDir(), "parts")
	code, stdout, stderr := program(t, smallJob(), "design", "-", "--out", out)
	if code != exitDone || stderr != "" {
		t.Fatalf("exit %d, stderr %q\n%s", code, stderr, stdout)
	}
	for _, want := range []string{"EVERY LIMIT IS KEPT", "Tank as built", "Checks by hand", "Defaults used", "not a certified construction"} {
		if !strings.Contains(stdout, want) {
			t.Errorf("the summary lacks %q", want)
		}
	}
	for _, line := range strings.Split(stdout, "\n") {
		if len(line) > 130 {
			t.Errorf("a line of %d columns: %s", len(line), line)
		}
	}
	data, err := os.ReadFile(filepath.Join(out, "design.json"))
	if err != nil {
		t.Fatal(err)
	}
	d := readDesign(t, string(data))
	if d.Format != 1 || !d.Feasible || d.Transformer == nil || d.Inductor == nil || d.AsBuilt == nil || len(d.Models) == 0 {
		t.Fatalf("design.json: %+v", d)
	}
	x := d.Transformer
	near := func(what string, got, want, tolerance float64) {
		t.Helper()
		if !(math.Abs(got/want-1) <= tolerance) {
			t.Errorf("%s = %g, want %g within %g", what, got, want, tolerance)
		}
	}
	// The closure of the two-port, exact: M^2 = (Lp - Lsc) Ls, no stray here.
	near("Lm = Lp - Lsc", x.Lm, x.Lp-x.Lsc, 1e-9)
	near("n = sqrt((Lp - Lsc)/Ls)", x.Ratio, math.Sqrt((x.Lp-x.Lsc)/x.Ls), 1e-9)
	near("Lr = Lext + Lsc", d.AsBuilt.LrKey, d.Inductor.Inductance+x.Lsc, 1e-9)
	near("Lm of the tank", d.AsBuilt.LmKey, x.Lm, 1e-9)
	near("Lr wanted", d.AsBuilt.LrKey, 60e-6, 1e-3)
	near("Lm wanted", d.AsBuilt.LmKey, 400e-6, 1e-3)
	// DC resistance by hand; litz is up to 6 % longer than its bundle (IEC 60317-11).
	for _, w := range x.Windings {
		hand := float64(w.Turns) * w.MLT / (58e6 * w.Area)
		if r := w.Resistance / hand; r < 0.999 || r > 1.07 {
			t.Errorf("winding %s: %g ohm, by hand %g", w.Name, w.Resistance, hand)
		}
	}
	for _, v := range d.Verdicts {
		keeps := v.Value <= v.Bound
		if v.Sense == "min" {
			keeps = v.Value >= v.Bound
		}
		if keeps != v.Pass || !v.Pass {
			t.Errorf("verdict %+v", v)
		}
	}
	for _, c := range x.Corners {
		if (c.Core == nil) != (c.Name == "hold-up") {
			t.Errorf("corner %s: temperature %v; a passing corner has none", c.Name, c.Core)
		}
	}

	// The build file gives the same ratings.
	build := filepath.Join(out, "build.yaml")
	code, stdout, stderr = program(t, "", "check", build, "--json")
	if code != exitDone || stderr != "" {
		t.Fatalf("check: exit %d, stderr %q", code, stderr)
	}
	again := readDesign(t, stdout)
	near("Lp of check", again.Transformer.Lp, x.Lp, 1e-9)
	near("core loss of check", again.Transformer.Corners[0].CoreLoss, x.Corners[0].CoreLoss, 1e-3)
	near("primary loss of check", again.Transformer.Corners[0].Winding.Primary, x.Corners[0].Winding.Primary, 1e-3)

	// A gap edited by hand is kept, and its inductance comes out as it does.
	text, err := os.ReadFile(build)
	if err != nil {
		t.Fatal(err)
	}
	first := strings.Index(string(text), "total: ")
	end := first + strings.Index(string(text)[first:], " mm")
	edited := string(text[:first]) + "total: 0.6" + string(text[end:])
	code, stdout, _ = program(t, edited, "check", "-", "--json")
	e := readDesign(t, stdout)
	if code != exitLimitMissed || e.Feasible || e.Transformer.Gap != 0.6e-3 || !(e.Transformer.Lp < 0.9*x.Lp) {
		t.Errorf("edited gap: exit %d, gap %g, Lp %g", code, e.Transformer.Gap, e.Transformer.Lp)
	}
}

func TestDesignWithoutResult(t *testing.T) {
	// A tank that misses a corner: the tank table and no parts.
	lost := strings.Replace(smallJob(), "input_voltage: 320 V", "input_voltage: 220 V", 1)
	code, stdout, stderr := program(t, lost, "design", "-")
	if code != exitLimitMissed || !strings.Contains(stdout, "below-range") || !strings.Contains(stderr, "the tank itself misses corner hold-up") {
		t.Errorf("exit %d, stderr %q\n%s", code, stderr, stdout)
	}
	// No core that fits: every size with the limit that stopped it.
	tiny := strings.Replace(smallJob(), "shapes: [ETD 29/16/10, PQ 40/40, RM 8]", "shapes: [RM 5, EFD 15/8/5]", 1)
	code, stdout, stderr = program(t, tiny, "design", "-")
	if code != exitLimitMissed || !strings.Contains(stdout, "RM 5") || !strings.Contains(stderr, "no core size gives a transformer") {
		t.Errorf("exit %d, stderr %q\n%s", code, stderr, stdout)
	}
	code, stdout, _ = program(t, tiny, "design", "-", "--json")
	if d := readDesign(t, stdout); code != exitLimitMissed || d.Transformer != nil || d.Feasible {
		t.Errorf("exit %d, %+v", code, d)
	}
}

func TestDesignRefuses(t *testing.T) {
	for _, c := range []struct {
		name, stdin string
		args        []string
		code        int
		want        string
	}{
		{"nothing given", "", []string{"design"}, exitUsage, "give one JOB file"},
		{"demo and a job", "", []string{"design", "--demo", "job.yaml"}, exitUsage, "--demo brings its own job"},
		{"unknown flag", "", []string{"design", "--dmeo"}, exitUsage, "unknown flag"},
		{"no such file", "", []string{"design", "nowhere.yaml"}, exitFiles, "does not exist"},
		{"bad job", "format: 1\n", []string{"design", "-"}, exitInput, "tank"},
		{"job given to check", string(job.DemoText()), []string{"check", "-"}, exitInput, "this is a job, not a build file"},
		{"unknown library", string(job.DemoText()), []string{"design", "-", "--library", "nowhere"}, exitFiles, "nowhere"},
	} {
		t.Run(c.name, func(t *testing.T) {
			code, _, stderr := program(t, c.stdin, c.args...)
			if code != c.code || !strings.Contains(stderr, c.want) {
				t.Errorf("exit %d, want %d; stderr %q, want %q in it", code, c.code, stderr, c.want)
			}
		})
	}
}
