package main

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"github.com/xuri/excelize/v2"
)

const sheetBuild = "../../testdata/sheet/build.yaml"

// shopSheets writes the sheets of the build into a folder.
func shopSheets(t *testing.T) string {
	t.Helper()
	dir := filepath.Join(t.TempDir(), "parts")
	code, stdout, stderr := program(t, "", "sheet", sheetBuild, "--out", dir)
	if code != exitDone || stderr != "" || strings.Count(stdout, "wrote") != 2 {
		t.Fatalf("sheet: exit %d, stdout %q, stderr %q", code, stdout, stderr)
	}
	return dir
}

// fillSheet writes readings into the yellow cells by name. A factor multiplies
// the nominal value of its row, found in the machine block; a text or a number
// under a full name is written as it is.
func fillSheet(t *testing.T, path string, samples int, factor func(id string, sample int) float64, other map[string]any) {
	t.Helper()
	f, err := excelize.OpenFile(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	cell := regexp.MustCompile(`^'([^']+)'!\$([A-Z]+)\$([0-9]+)$`)
	names := map[string][2]string{}
	for _, n := range f.GetDefinedName() {
		if m := cell.FindStringSubmatch(n.RefersTo); m != nil {
			names[n.Name] = [2]string{m[1], m[2] + m[3]}
		}
	}
	rows, err := f.GetRows("data", excelize.Options{RawCellValue: true})
	if err != nil {
		t.Fatal(err)
	}
	for _, row := range rows {
		if len(row) < 2 || !strings.HasSuffix(row[0], ".nominal") {
			continue
		}
		id := strings.TrimSuffix(row[0], ".nominal")
		var nominal float64
		fmt.Sscan(row[1], &nominal)
		for i := 1; i <= samples; i++ {
			at, ok := names[regexp.MustCompile(`[^A-Za-z0-9_]`).ReplaceAllString(id, "_")+fmt.Sprintf("_S%d", i)]
			k := factor(id, i)
			if !ok || k == 0 {
				continue
			}
			if err := f.SetCellValue(at[0], at[1], nominal*k); err != nil {
				t.Fatal(err)
			}
		}
	}
	for name, v := range other {
		at, ok := names[name]
		if !ok {
			t.Fatalf("%s has no cell %s", path, name)
		}
		if err := f.SetCellValue(at[0], at[1], v); err != nil {
			t.Fatal(err)
		}
	}
	if err := f.Save(); err != nil {
		t.Fatal(err)
	}
}

type readbackJSON struct {
	Format int
	Sheets []struct {
		Part    string
		Samples int
		Forced  bool
		Notes   []string
		Unread  []string
	}
	Parts []struct {
		Part    string
		Verdict string
		Rows    []struct{ ID, Result string }
		Causes  []struct {
			Class       string
			Probability float64
		}
		Next       string `json:"next_measurement"`
		Correction *struct {
			Ground float64 `json:"ground_change"`
			Film   float64 `json:"film_change"`
			Enough bool    `json:"within_tolerance"`
			Steps  []string
		} `json:"gap_correction"`
	}
	Samples []struct{ Sample string }
	Tank    *struct {
		Lr      struct{ Value, Sigma float64 } `json:"resonant_inductance"`
		Lm      struct{ Value, Sigma float64 } `json:"magnetizing_inductance"`
		Ratio   struct{ Value, Sigma float64 } `json:"turns_ratio"`
		Corners []struct{ Name, Status string }
	} `json:"tank_as_built"`
	Verdicts []struct {
		Limit string
		Pass  bool
	}
}

func readBack(t *testing.T, args ...string) (int, readbackJSON, string) {
	t.Helper()
	code, stdout, stderr := program(t, "", append([]string{"readback", "--build", sheetBuild, "--json"}, args...)...)
	var r readbackJSON
	if stdout != "" {
		if err := json.Unmarshal([]byte(stdout), &r); err != nil {
			t.Fatalf("%v\n%s", err, stdout)
		}
	}
	return code, r, stderr
}

// TestReadbackOfNominal: a shop that hits every nominal value gives back the tank
// as designed, and no fault.
func TestReadbackOfNominal(t *testing.T) {
	dir := shopSheets(t)
	one := func(id string, i int) float64 { return 1 }
	// The sheet states resistances at 20 °C and the shop measures at 20 °C.
	transformer, inductor := filepath.Join(dir, "winding-sheet-transformer.xlsx"), filepath.Join(dir, "winding-sheet-inductor.xlsx")
	fillSheet(t, transformer, 3, one, map[string]any{"field_ambient_c": 20})
	fillSheet(t, inductor, 3, one, map[string]any{"field_ambient_c": 20})
	before, err := os.ReadFile(transformer)
	if err != nil {
		t.Fatal(err)
	}
	code, r, stderr := readBack(t, transformer, inductor)
	if code != exitDone || stderr != "" || len(r.Parts) != 2 || len(r.Samples) != 3 || r.Tank == nil {
		t.Fatalf("exit %d, stderr %q, %+v", code, stderr, r)
	}
	for _, p := range r.Parts {
		if p.Causes[0].Class != "within the usual spread" || p.Correction == nil || !p.Correction.Enough {
			t.Errorf("%s: causes %+v, correction %+v", p.Part, p.Causes[0], p.Correction)
		}
	}
	// The design's own tank. Readings carry four digits, the leakage is a few per
	// cent of Lr.
	code, stdout, _ := program(t, "", "check", sheetBuild, "--json")
	var d struct {
		Tank struct {
			Lr    float64 `json:"resonant_inductance"`
			Lm    float64 `json:"magnetizing_inductance"`
			Ratio float64 `json:"turns_ratio"`
		} `json:"tank_as_built"`
	}
	if err := json.Unmarshal([]byte(stdout), &d); err != nil || code != exitDone {
		t.Fatalf("check: exit %d, %v", code, err)
	}
	for _, x := range []struct {
		name      string
		got, want float64
	}{{"Lr", r.Tank.Lr.Value, d.Tank.Lr}, {"Lm", r.Tank.Lm.Value, d.Tank.Lm}, {"n", r.Tank.Ratio.Value, d.Tank.Ratio}} {
		if math.Abs(x.got/x.want-1) > 5e-4 {
			t.Errorf("%s = %g, designed %g", x.name, x.got, x.want)
		}
	}
	for _, c := range r.Tank.Corners {
		if c.Status != "ok" {
			t.Errorf("corner %s: %s", c.Name, c.Status)
		}
	}
	after, err := os.ReadFile(transformer)
	if err != nil || string(before) != string(after) {
		t.Errorf("the returned sheet was changed (%v)", err)
	}

	// The same for people, and into a folder.
	out := filepath.Join(t.TempDir(), "out")
	code, stdout, stderr = program(t, "", "readback", transformer, inductor, "--build", sheetBuild, "--out", out)
	text, err := os.ReadFile(filepath.Join(out, "readback.txt"))
	if code != exitDone || stderr != "" || err != nil || string(text) != stdout || !strings.Contains(stdout, "limits of the tank are kept") {
		t.Errorf("exit %d, stderr %q, %v\n%s", code, stderr, err, stdout)
	}
	for _, line := range strings.Split(stdout, "\n") {
		if len([]rune(line)) > 100 && !strings.Contains(line, ".xlsx") {
			t.Errorf("a line of %d columns: %s", len([]rune(line)), line)
		}
	}

	// And now the sheet must not be lost.
	code, _, stderr = program(t, "", "sheet", sheetBuild, "--out", dir)
	if code != exitFiles || !strings.Contains(stderr, "has been filled in") || !strings.Contains(stderr, "--force") {
		t.Errorf("writing over a filled sheet: exit %d, %q", code, stderr)
	}
	if again, err := os.ReadFile(transformer); err != nil || string(again) != string(before) {
		t.Errorf("the filled sheet was written over (%v)", err)
	}
	if code, _, stderr = program(t, "", "sheet", sheetBuild, "--out", dir, "--force"); code != exitDone || stderr != "" {
		t.Errorf("--force: exit %d, %q", code, stderr)
	}
}

// TestReadbackOfAFault: Lp 9 % high on all samples is a gap that is too short;
// one sample has lost strands; one cell is a text.
func TestReadbackOfAFault(t *testing.T) {
	dir := shopSheets(t)
	path := filepath.Join(dir, "winding-sheet-transformer.xlsx")
	// Lp, Ls and, through the coupling, the ratios: Lsc/Lp is about 1.6 %, so
	// that the ratios move by less than 0.1 %.
	fillSheet(t, path, 4, func(id string, i int) float64 {
		switch {
		case id == "E03", id == "E04", id == "E05":
			return 1.09
		case id == "E09.P" && i == 3:
			return 1.12
		}
		return 1
	}, map[string]any{"E11_S1": "1234,5 kHz", "E06_S2": "about six"})
	code, r, stderr := readBack(t, path)
	if code != exitLimitMissed || stderr != "" || len(r.Parts) != 1 {
		t.Fatalf("exit %d, stderr %q", code, stderr)
	}
	p := r.Parts[0]
	if p.Verdict != "REJECT" || p.Causes[0].Class != "gap too short or missing" || p.Correction == nil || p.Correction.Ground <= 0 || p.Correction.Film <= 0 {
		t.Errorf("verdict %s, causes %+v, correction %+v", p.Verdict, p.Causes, p.Correction)
	}
	if s := r.Sheets[0]; len(s.Unread) != 1 || !strings.Contains(s.Unread[0], "about six") || !strings.Contains(strings.Join(s.Notes, " "), "W701") || !strings.Contains(strings.Join(s.Notes, " "), "W702") {
		t.Errorf("notes %q, unread %q", s.Notes, s.Unread)
	}
	results := map[string]string{}
	for _, row := range p.Rows {
		results[row.ID] = row.Result
	}
	for id, want := range map[string]string{"E04": "FAIL", "E06": "FAIL", "E07": "PASS", "E09.P": "FAIL", "E09.P.apart": "FAIL", "E09.S-A": "PASS", "E02": "PASS", "E01": "OPEN"} {
		if results[id] != want {
			t.Errorf("%s: %q, want %q", id, results[id], want)
		}
	}
	// Several sheets of the same part are put together.
	second := filepath.Join(t.TempDir(), "second.xlsx")
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(second, data, 0o600); err != nil {
		t.Fatal(err)
	}
	if _, r, _ = readBack(t, path, second); len(r.Samples) != 8 || len(r.Parts) != 1 || r.Samples[4].Sample != "2:S1" {
		t.Errorf("two sheets gave %d samples %+v", len(r.Samples), r.Samples)
	}
}

func TestReadbackRefuses(t *testing.T) {
	dir := shopSheets(t)
	path := filepath.Join(dir, "winding-sheet-transformer.xlsx")
	fillSheet(t, path, 1, func(string, int) float64 { return 1 }, nil)
	build, err := os.ReadFile(sheetBuild)
	if err != nil {
		t.Fatal(err)
	}
	other := filepath.Join(t.TempDir(), "build.yaml")
	if err := os.WriteFile(other, []byte(strings.Replace(string(build), "total: 0.447 mm", "total: 0.45 mm", 1)), 0o600); err != nil {
		t.Fatal(err)
	}
	notes := filepath.Join(t.TempDir(), "notes.xlsx")
	if err := os.WriteFile(notes, []byte("hello"), 0o600); err != nil {
		t.Fatal(err)
	}
	for _, tc := range []struct {
		name string
		args []string
		code int
		want string
	}{
		{"other design", []string{"readback", path, "--build", other}, exitInput, "--force"},
		{"no workbook", []string{"readback", notes, "--build", sheetBuild}, exitInput, "not a winding sheet"},
		{"one good, one bad", []string{"readback", path, notes, "--build", sheetBuild}, exitInput, "notes.xlsx"},
		{"no file", []string{"readback", "nowhere.xlsx", "--build", sheetBuild}, exitFiles, "nowhere.xlsx"},
		{"a folder", []string{"readback", dir, "--build", sheetBuild}, exitFiles, "folder"},
		{"no build", []string{"readback", path}, exitUsage, "build"},
		{"no sheet", []string{"readback", "--build", sheetBuild}, exitUsage, "arg"},
		{"sheet without out", []string{"sheet", sheetBuild}, exitUsage, "out"},
		{"sheet of a job", []string{"sheet", "-", "--out", dir}, exitInput, ""},
	} {
		t.Run(tc.name, func(t *testing.T) {
			code, stdout, stderr := program(t, "", tc.args...)
			if code != tc.code || stdout != "" || !strings.Contains(stderr, tc.want) || stderr == "" {
				t.Errorf("exit %d, want %d with %q; stdout %q, stderr %q", code, tc.code, tc.want, stdout, stderr)
			}
		})
	}
	code, stdout, stderr := program(t, "", "readback", path, "--build", other, "--force")
	if code == exitInput || stderr != "" || !strings.Contains(stdout, "ANOTHER DESIGN") {
		t.Errorf("--force: exit %d, stderr %q, stdout\n%s", code, stderr, stdout)
	}
	// A folder that cannot be written to.
	if os.Geteuid() != 0 {
		locked := t.TempDir()
		if err := os.Chmod(locked, 0o500); err != nil {
			t.Fatal(err)
		}
		if code, _, stderr := program(t, "", "sheet", sheetBuild, "--out", filepath.Join(locked, "x")); code != exitFiles || stderr == "" {
			t.Errorf("read-only folder: exit %d, %q", code, stderr)
		}
	}
}
