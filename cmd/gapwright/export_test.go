package main

import (
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

const finishedBuild = "../../testdata/page/build.yaml"

func TestExport(t *testing.T) {
	out := filepath.Join(t.TempDir(), "circuit")
	code, stdout, stderr := program(t, "", "export", finishedBuild, "--out", out)
	if code != exitDone || stderr != "" {
		t.Fatalf("exit %d: %s", code, stderr)
	}
	for _, name := range []string{"transformer.cir", "inductor.cir", "converter.cir"} {
		data, err := os.ReadFile(filepath.Join(out, name))
		if err != nil {
			t.Fatal(err)
		}
		if strings.Contains(string(data), "NaN") || strings.Contains(string(data), "Inf") || !strings.Contains(string(data), ".subckt") {
			t.Errorf("%s:\n%s", name, data)
		}
		if !strings.Contains(stdout, "wrote "+filepath.Join(out, name)) {
			t.Errorf("stdout does not name %s", name)
		}
	}
	for _, line := range strings.Split(stdout, "\n") {
		if len([]rune(line)) > 100 && !strings.HasPrefix(line, "wrote ") {
			t.Errorf("wider than 100 columns: %q", line)
		}
	}

	code, stdout, stderr = program(t, "", "export", finishedBuild, "--out", out, "--corner", "light", "--json")
	var report struct {
		Corner string
		Parts  []struct {
			Part  string
			Cases []struct {
				Resistance []float64
				Error      float64 `json:"largest_error"`
			}
		}
	}
	if err := json.Unmarshal([]byte(stdout), &report); err != nil || code != exitDone {
		t.Fatalf("exit %d, %v, %s", code, err, stderr)
	}
	if report.Corner != "light" || len(report.Parts) != 2 || len(report.Parts[0].Cases) != 3 || len(report.Parts[0].Cases[0].Resistance) != 20 {
		t.Errorf("%+v", report)
	}
}

func TestExportMistakes(t *testing.T) {
	if code, _, stderr := program(t, "", "export", finishedBuild); code != exitUsage || !strings.Contains(stderr, "out") {
		t.Errorf("without --out: exit %d, %q", code, stderr)
	}
	out := filepath.Join(t.TempDir(), "none")
	code, stdout, stderr := program(t, "", "export", finishedBuild, "--out", out, "--corner", "nominale")
	if code != exitInput || stdout != "" || !strings.Contains(stderr, `no corner called "nominale"; it has: nominal, `) {
		t.Errorf("unknown corner: exit %d, %q", code, stderr)
	}
	if _, err := os.Stat(out); err == nil {
		t.Error("a folder was made for nothing")
	}
	if code, _, stderr := program(t, "", "export", "no-such.yaml", "--out", out); code != exitFiles {
		t.Errorf("missing file: exit %d, %q", code, stderr)
	}
}
