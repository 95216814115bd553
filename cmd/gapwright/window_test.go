package main

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

func windowExample(t *testing.T) string {
	t.Helper()
	data, err := os.ReadFile("../../testdata/window/example.yaml")
	if err != nil {
		t.Fatal(err)
	}
	return string(data)
}

func TestWindowTable(t *testing.T) {
	head := strings.NewReplacer("  post_half_width: 5 mm\n  gaps: [{center: 9 mm, length: 0.5 mm}]\n", "  surround: head\n", "ampere_turns: 1,", "ampere_turns: -52,").Replace(windowExample(t))
	code, stdout, stderr := program(t, head, "window", "-")
	if code != exitDone || stderr != "" {
		t.Fatalf("head: exit %d, stderr %q", code, stderr)
	}
	asciiLines(t, stdout)
	for _, want := range []string{"winding head: the plane of the post", "one-dimensional formula", "for windings side by side"} {
		if !strings.Contains(stdout, want) {
			t.Errorf("the table of a head lacks %q:\n%s", want, stdout)
		}
	}
	code, stdout, stderr = program(t, windowExample(t), "window", "-")
	if code != exitDone || stderr != "" {
		t.Fatalf("exit %d, stderr %q", code, stderr)
	}
	for _, want := range []string{
		"gap in the post 500.0 um at 9.000 mm, takes 100 % of the ampere-turns",
		"per turn2, full section", "Q Rac/Rdc", "Mean H2 in P", "coupled, multipoles of order 1 to 5",
	} {
		if !strings.Contains(stdout, want) {
			t.Errorf("the table lacks %q:\n%s", want, stdout)
		}
	}
	asciiLines(t, stdout)
}

// asciiLines checks what a pipe gets.
func asciiLines(t *testing.T, stdout string) {
	t.Helper()
	for line := range strings.Lines(stdout) {
		if len(line) > 101 {
			t.Errorf("line of %d columns: %s", len(line)-1, line)
		}
		for _, r := range line {
			if r > 126 {
				t.Errorf("not ASCII in a pipe: %q", line)
				break
			}
		}
	}
}

func TestWindowJSON(t *testing.T) {
	code, stdout, stderr := program(t, windowExample(t), "window", "-", "--json")
	if code != exitDone || stderr != "" {
		t.Fatalf("exit %d, stderr %q", code, stderr)
	}
	var j struct {
		Format     int
		Energy     float64
		MeanH2     map[string]float64            `json:"mean_h2"`
		GridH2     map[string][][]float64        `json:"grid_h2"`
		Inductance float64                       `json:"inductance_per_turn2"`
		Ratio      map[string]map[string]float64 `json:"rac_over_rdc"`
	}
	if err := json.Unmarshal([]byte(stdout), &j); err != nil {
		t.Fatal(err)
	}
	if j.Format != 1 || !(j.Energy > 0) || len(j.MeanH2) != 3 || len(j.GridH2["P"]) != 4 || len(j.GridH2["P"][0]) != 8 {
		t.Errorf("format %d, energy %g, %d means, grid %d", j.Format, j.Energy, len(j.MeanH2), len(j.GridH2["P"]))
	}
	if len(j.Ratio) != 2 || !(j.Ratio["Q"]["50000"] > 1) || !(j.Ratio["R"]["100000"] > 1) {
		t.Errorf("ratios %v", j.Ratio)
	}
	// A planar full section: L' = mu0 2w/g and fringing on top.
	if plain := 4e-7 * math.Pi * 10e-3 / 0.5e-3; !(j.Inductance > plain && j.Inductance < 1.5*plain) {
		t.Errorf("inductance %g H/m, without fringing %g", j.Inductance, plain)
	}
	// Balanced, without gap and frequencies: neither inductance nor resistance.
	_, stdout, _ = program(t, `
format: 1
window: {breadth: 18 mm, depth: 6 mm}
windings:
  - {name: P, ampere_turns: 1, block: {x: [0.5 mm, 2.5 mm], y: [0 mm, 18 mm]}}
  - {name: S, ampere_turns: -1, block: {x: [3.2 mm, 5.4 mm], y: [0 mm, 18 mm]}}
`, "window", "-", "--json")
	if strings.Contains(stdout, "inductance") || strings.Contains(stdout, "rac") || !strings.Contains(stdout, `"energy": 7.33`) {
		t.Errorf("balanced window: %s", stdout)
	}
}

func TestWindowRefuses(t *testing.T) {
	for _, c := range []struct {
		args  []string
		stdin string
		code  int
		want  string
	}{
		{[]string{"window"}, "", exitUsage, "accepts 1 arg"},
		{[]string{"window", "a", "b"}, "", exitUsage, "accepts 1 arg"},
		{[]string{"window", filepath.Join(t.TempDir(), "none.yaml")}, "", exitFiles, "does not exist"},
		{[]string{"window", "-"}, "", exitInput, "standard input:1:1: the file is empty"},
		{[]string{"window", "-"}, strings.Replace(windowExample(t), "breadth: 18 mm", "breadth: 0 mm", 1), exitInput, "standard input:3:3: breadth: 0 mm is zero"},
	} {
		code, stdout, stderr := program(t, c.stdin, c.args...)
		if code != c.code || stdout != "" || !strings.Contains(stderr, c.want) {
			t.Errorf("%v: exit %d, stdout %q, stderr %q; want exit %d and %q", c.args, code, stdout, stderr, c.code, c.want)
		}
	}
}
