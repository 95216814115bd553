package main

import (
	"encoding/json"
	"os"
	"strings"
	"testing"
)

// yieldBuild is a finished build with few corners and tolerances, so that a run
// takes no time.
func yieldBuild(t *testing.T) string {
	t.Helper()
	data, err := os.ReadFile(finishedBuild)
	if err != nil {
		t.Fatal(err)
	}
	text := string(data)
	for _, change := range [][2]string{
		{"    - {name: fixed, input_voltage: 390 V, load_resistance: 5.7 ohm, frequency: 100 kHz}\n", ""},
		{"    objective: smallest\n", "    objective: smallest\n    tolerances: {inductor_inductance: 0 %, resonant_capacitance: 0 %, dead_time: 8 %, node_capacitance: 0 %}\n"},
	} {
		if !strings.Contains(text, change[0]) {
			t.Fatalf("no %q in the build", change[0])
		}
		text = strings.Replace(text, change[0], change[1], 1)
	}
	return text
}

func TestYield(t *testing.T) {
	code, stdout, stderr := program(t, yieldBuild(t), "yield", "-", "--builds", "40")
	if code != exitDone || stderr != "" {
		t.Fatalf("exit %d: %s", code, stderr)
	}
	for _, want := range []string{"40 builds, seed 1", "95 % interval", "keep reserves", "Lp ", "resonance", "gain margin", "soft switching margin", "A_L, transformer", "leakage, P-S", "dead time                 +/-8 %", "From the job: dead time. The others", "response surface"} {
		if !strings.Contains(stdout, want) {
			t.Errorf("no %q in\n%s", want, stdout)
		}
	}
	for _, line := range strings.Split(stdout, "\n") {
		if len([]rune(line)) > 100 {
			t.Errorf("wider than 100 columns: %q", line)
		}
		for _, r := range line {
			if r > 126 {
				t.Errorf("%q in a pipe: %q", r, line)
			}
		}
	}

	code, stdout, _ = program(t, yieldBuild(t), "yield", "-", "--builds", "40", "--seed", "9", "--spread", "normal", "--json")
	var r struct {
		Builds int
		Seed   uint64
		Spread string
		Works  struct{ Share, Low, High float64 }
		Bands  []struct {
			Name              string
			Nominal           *float64
			Low, High         float64
			Least, Most, Mean float64
		}
		Tolerances []struct {
			Key   string
			Works struct{ Exact, Half, Twice float64 }
		}
	}
	if err := json.Unmarshal([]byte(stdout), &r); err != nil || code != exitDone {
		t.Fatal(code, err)
	}
	if r.Builds != 40 || r.Seed != 9 || r.Spread != "normal" || !(r.Works.Low <= r.Works.Share && r.Works.Share <= r.Works.High) || len(r.Tolerances) != 5 || r.Tolerances[0].Key != "open_inductance" {
		t.Errorf("%+v", r)
	}
	for _, b := range r.Bands {
		if !(b.Least <= b.Low && b.Low <= b.Mean && b.Mean <= b.High && b.High <= b.Most) {
			t.Errorf("%+v", b)
		}
	}
}

func TestYieldMistakes(t *testing.T) {
	for _, c := range []struct {
		args []string
		want string
	}{
		{[]string{"yield"}, "arg"},
		{[]string{"yield", finishedBuild, "--builds", "3"}, "--builds 3: between 10 and 1000000"},
		{[]string{"yield", finishedBuild, "--builds", "many"}, "builds"},
		{[]string{"yield", finishedBuild, "--spread", "triangular"}, "--spread triangular: uniform or normal"},
	} {
		if code, stdout, stderr := program(t, "", c.args...); code != exitUsage || stdout != "" || !strings.Contains(stderr, c.want) {
			t.Errorf("%v: exit %d, %q", c.args, code, stderr)
		}
	}
}
