package main

import (
	"encoding/json"
	"fmt"
	"image/png"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"gapwright/corelib/material"
)

// write makes a folder of files and returns its path.
func write(t *testing.T, files map[string]string) string {
	t.Helper()
	dir := t.TempDir()
	for name, text := range files {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return dir
}

// measured is the open 25 °C loss table in the form that a user would type in.
func measured(t *testing.T) string {
	t.Helper()
	data, err := os.ReadFile(filepath.Join("..", "..", "testdata", "coreloss", "loss_points.json"))
	if err != nil {
		t.Fatal(err)
	}
	var tables map[string]struct {
		Points [][3]float64 `json:"points"`
	}
	if err := json.Unmarshal(data, &tables); err != nil {
		t.Fatal(err)
	}
	var b strings.Builder
	b.WriteString("# measured at 25 degC\nf [kHz],B [mT],T [degC],P [mW/cm3]\n")
	for _, p := range tables["L1"].Points {
		fmt.Fprintf(&b, "%g,%g,25,%g\n", p[0]/1e3, p[1]*1e3, p[2]/1e3)
	}
	return b.String()
}

func TestMaterialsLists(t *testing.T) {
	code, out, errs := program(t, "", "materials")
	if code != exitDone || errs != "" {
		t.Fatalf("exit %d, stderr %q", code, errs)
	}
	for _, want := range []string{"PW2", "PW3", "PW4", "PW5", "495/390", "4 ferrites", "searched only when a job names it", "from memory (W202)"} {
		if !strings.Contains(out, want) {
			t.Errorf("list lacks %q:\n%s", want, out)
		}
	}
	for _, line := range strings.Split(out, "\n") {
		if len(line) > 100 {
			t.Errorf("%d columns: %s", len(line), line)
		}
	}
	code, out, errs = program(t, "", "materials", "pw3", "--temperature", "25degC")
	if code != exitDone || errs != "" {
		t.Fatalf("exit %d, stderr %q", code, errs)
	}
	for _, want := range []string{"IEC 61332 ed. 3 (2016)", "E1", "hot over cold", "Losses of a sine at 25 degC, kW/m3", "verified", "from memory", "Sources", "otvam/large_signal_ferrite_apec24"} {
		if !strings.Contains(out, want) {
			t.Errorf("PW3 lacks %q", want)
		}
	}
	code, _, errs = program(t, "", "materials", "PW33")
	if code != exitInput || !strings.Contains(errs, "nearest: PW3") {
		t.Errorf("unknown ferrite: exit %d, %q", code, errs)
	}
	for _, args := range [][]string{{"materials", "a", "b"}, {"materials", "PW3", "--temperature", "100"}, {"materials", "PW3", "--temperature", "45 K"}} {
		if code, _, _ := program(t, "", args...); code != exitUsage {
			t.Errorf("%v: exit %d, want %d", args, code, exitUsage)
		}
	}
}

func TestMaterialsJSON(t *testing.T) {
	code, out, errs := program(t, "", "materials", "--json")
	if code != exitDone || errs != "" {
		t.Fatalf("exit %d, stderr %q", code, errs)
	}
	var v struct {
		Format    int
		Materials []struct {
			Name      string
			OnRequest bool `json:"on_request"`
			Source    string
			Figures   []struct {
				Figure, Unit, Source, Confidence string
				Temperature                      *float64
				Value                            float64
			}
			LossSets []struct {
				Set         string
				K           float64
				Frequency   [2]float64
				FluxDensity *[2]float64 `json:"flux_density"`
				Source      string
			} `json:"loss_sets"`
			Heat []struct{ Source string }
		}
	}
	if err := json.Unmarshal([]byte(out), &v); err != nil {
		t.Fatal(err)
	}
	if v.Format != 1 || len(v.Materials) != 4 {
		t.Fatalf("format %d, %d ferrites", v.Format, len(v.Materials))
	}
	for _, m := range v.Materials {
		if m.Source == "" || len(m.LossSets) == 0 {
			t.Errorf("%s: source %q, %d sets", m.Name, m.Source, len(m.LossSets))
		}
		for _, f := range m.Figures {
			if f.Source == "" || f.Confidence == "" || f.Value <= 0 {
				t.Errorf("%s: %+v", m.Name, f)
			}
			if f.Figure == "saturation" && f.Unit != "T" {
				t.Errorf("%s: saturation in %s", m.Name, f.Unit)
			}
		}
	}
	e1 := v.Materials[1].LossSets[0]
	if e1.Set != "E1" || e1.Frequency != [2]float64{50e3, 100e3} || *e1.FluxDensity != [2]float64{0.05, 0.25} || len(v.Materials[1].Heat) != 8 {
		t.Errorf("PW3: %+v, %d heat rows", e1, len(v.Materials[1].Heat))
	}
	if b5 := v.Materials[2].LossSets[0]; b5.Set != "B5" || b5.FluxDensity != nil {
		t.Errorf("PW4: %+v; its flux range is not known", b5)
	}
}

// From points on paper to a ferrite of one's own: fit, save the printed rows, list
// them, and see the report say where they came from.
func TestOwnFerriteFromPoints(t *testing.T) {
	dir := write(t, map[string]string{"points.csv": measured(t)})
	pngFile := filepath.Join(dir, "residuals.png")
	code, out, errs := program(t, "", "fit", filepath.Join(dir, "points.csv"), "--name", "Ours 1", "--borders", "100 kHz,200kHz", "--source", "own bench, ring R22", "--plot", pngFile)
	if code != exitDone || errs != "wrote "+pngFile+"\n" {
		t.Fatalf("exit %d, stderr %q", code, errs)
	}
	f, err := os.Open(pngFile)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	if img, err := png.Decode(f); err != nil || img.Bounds().Dx() < 500 {
		t.Errorf("picture: %v", err)
	}
	rows := map[string]string{}
	for _, name := range []string{material.FerritesFile, material.LossFile} {
		_, after, found := strings.Cut(out, "\n"+name+"\n")
		if !found {
			t.Fatalf("no rows for %s in\n%s", name, out)
		}
		rows[name], _, _ = strings.Cut(after, "\n\n")
	}
	own := write(t, rows)
	code, out, errs = program(t, "", "materials", "ours1", "--library", own)
	if code != exitDone || errs != "" {
		t.Fatalf("exit %d, stderr %q", code, errs)
	}
	flat := strings.Join(strings.Fields(out), " ") // long paths wrap
	for _, want := range []string{"Ours 1 MnZn ferrite", "those of PW3 stand in", "own bench, ring R22 (measured; your own row, ", "M3", "hot over cold", "mu_i"} {
		if !strings.Contains(flat, want) {
			t.Errorf("own ferrite lacks %q:\n%s", want, out)
		}
	}
	code, out, _ = program(t, "", "materials", "--library", own)
	if code != exitDone || !strings.Contains(out, "Ours 1") || !strings.Contains(out, "+: holds rows of your own") {
		t.Errorf("list with own rows: exit %d\n%s", code, out)
	}
	// The same points under a new name have to give PW3's losses.
	table, err := material.Embedded().With(os.DirFS(own), own)
	if err != nil {
		t.Fatal(err)
	}
	mine, err := table.Find("Ours 1")
	if err != nil {
		t.Fatal(err)
	}
	pw3, err := table.Find("PW3")
	if err != nil {
		t.Fatal(err)
	}
	for _, temp := range []float64{25, 80, 110} {
		for _, freq := range []float64{60e3, 140e3, 420e3} {
			a, errA := mine.LossDensity(freq, 0.1, temp)
			b, errB := pw3.LossDensity(freq, 0.1, temp)
			// The table of PW3 rounds k and the exponents to five digits: ln f times 5e-5.
			if errA != nil || errB != nil || math.Abs(a.Density/b.Density-1) > 1e-3 {
				t.Errorf("%g Hz, %g °C: own %g, PW3 %g W/m³", freq, temp, a.Density, b.Density)
			}
		}
	}
	// A row whose source was wiped is refused with its place.
	bad := write(t, map[string]string{material.FerritesFile: rows[material.FerritesFile],
		material.LossFile: strings.Replace(rows[material.LossFile], `"own bench, ring R22"`, "", 1)})
	code, out, errs = program(t, "", "materials", "--library", bad)
	if code != exitInput || out != "" || !strings.Contains(errs, filepath.Join(bad, material.LossFile)+":2:") || !strings.Contains(errs, "no source") {
		t.Errorf("row without source: exit %d, %q", code, errs)
	}
}

func TestFitReports(t *testing.T) {
	code, out, errs := program(t, measured(t), "fit", "-")
	if code != exitDone || errs != "" {
		t.Fatalf("exit %d, stderr %q", code, errs)
	}
	// The whole table in one law: figures of testdata/coreloss/fit.json.
	for _, want := range []string{"5.5694", "1.3558", "2.4285", "9.72", "24.14", "4.79 %", "Two bands that meet at", "Residual (measured over fit"} {
		if !strings.Contains(out, want) {
			t.Errorf("report lacks %q:\n%s", want, out)
		}
	}
	code, out, errs = program(t, measured(t), "fit", "-", "--json", "--borders", "100kHz,200kHz")
	if code != exitDone || errs != "" {
		t.Fatalf("exit %d, stderr %q", code, errs)
	}
	var v struct {
		Format int
		Sets   []struct {
			Set       string
			K, Beta   float64
			Alpha     *float64
			RMS       *float64
			Residuals []struct{ Loss, Fitted, Residual float64 }
		}
		Rows map[string][]string
	}
	if err := json.Unmarshal([]byte(out), &v); err != nil {
		t.Fatal(err)
	}
	if len(v.Sets) != 3 || math.Abs(v.Sets[0].K/56.59588713422842-1) > 1e-7 || math.Abs(*v.Sets[0].Alpha-1.137611962431739) > 1e-7 || len(v.Sets[2].Residuals) != 17 || len(v.Rows["ferrite-loss.csv"]) != 4 {
		t.Errorf("%+v", v)
	}
	one := "f [kHz],B [mT],P [kW/m3]\n100,50,10\n100,100,60\n100,200,360\n"
	code, out, _ = program(t, one, "fit", "-")
	if code != exitDone || !strings.Contains(out, "not found") || !strings.Contains(out, "2.585") || !strings.Contains(out, "No rows: a loss set needs alpha") {
		t.Errorf("one frequency: exit %d\n%s", code, out)
	}
	code, out, _ = program(t, one, "fit", "-", "--json")
	if code != exitDone || !strings.Contains(out, `"alpha": null`) || !strings.Contains(out, `"rows": null`) {
		t.Errorf("one frequency as JSON: exit %d\n%s", code, out)
	}
	svg := filepath.Join(t.TempDir(), "r.svg")
	if code, _, errs = program(t, one, "fit", "-", "--plot", svg); code != exitDone {
		t.Errorf("svg: exit %d, %s", code, errs)
	}
	if data, err := os.ReadFile(svg); err != nil || !strings.HasPrefix(string(data), "<svg") {
		t.Errorf("svg: %v", err)
	}
}

func TestFitRefuses(t *testing.T) {
	head := "f [kHz],B [mT],T [degC],P [kW/m3]\n"
	for _, c := range []struct {
		name, points string
		args         []string
		code         int
		want         string
	}{
		{"collinear", head + "50,200,25,288\n100,100,25,126\n200,50,25,51\n", nil, exitInput, "standard input:2:1: band 1, 3 points: ln f and ln B lie on one line"},
		{"too few", head + "50,200,25,288\n100,100,25,126\n", nil, exitInput, "2 points, 3 are needed"},
		{"one flux density", head + "50,200,25,288\n100,200,25,640\n200,200,25,1547\n", nil, exitInput, "beta cannot be found"},
		{"units", "f [Hz],B [mT],P [kW/m3]\n50,200,288\n", nil, exitInput, "standard input:2:8: P: "},
		{"semicolons", "f;B;P\n50;200;288\n", nil, exitInput, "separated by semicolons"},
		{"empty band", head + "50,200,25,288\n100,100,25,126\n", []string{"--borders", "10kHz"}, exitInput, "no points between 0 and 10 kHz"},
		{"bare border", head, []string{"--borders", "100"}, exitUsage, "--borders: "},
		{"form", head, []string{"--heat", "cubic"}, exitUsage, `--heat: "cubic"`},
		{"beta", head, []string{"--beta", "25"}, exitUsage, "--beta: 25"},
		{"plot", head, []string{"--plot", "x.gif"}, exitUsage, "neither .png nor .svg"},
		{"like", head, []string{"--like", "PW9"}, exitUsage, "--like: unknown ferrite"},
		{"confidence", head, []string{"--confidence", "sure"}, exitUsage, "--confidence: "},
	} {
		t.Run(c.name, func(t *testing.T) {
			code, out, errs := program(t, c.points, append([]string{"fit", "-"}, c.args...)...)
			if code != c.code || out != "" || !strings.Contains(errs, c.want) {
				t.Errorf("exit %d (want %d), stdout %q, stderr %q (want %q)", code, c.code, out, errs, c.want)
			}
		})
	}
	if code, _, errs := program(t, "", "fit", filepath.Join(t.TempDir(), "none.csv")); code != exitFiles || !strings.Contains(errs, "does not exist") {
		t.Errorf("missing file: exit %d, %q", code, errs)
	}
}
