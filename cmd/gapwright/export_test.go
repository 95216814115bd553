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
	for _, name := range []string{"transformer.cir", "inductor.cir", "converter.cir", "nominal.cir"} {
		data, err := os.ReadFile(filepath.Join(out, name))
		if err != nil {
			t.Fatal(err)
		}
		if strings.Contains(string(data), "NaN") || strings.Contains(string(data), "Inf") || strings.Contains(string(data), ".subckt") == (name == "nominal.cir") {
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

// TestExportToStdout: without a folder the netlist itself is the result, the
// same that goes into the file.
func TestExportToStdout(t *testing.T) {
	out := t.TempDir()
	if code, _, stderr := program(t, "", "export", finishedBuild, "--out", out); code != exitDone {
		t.Fatalf("exit %d: %s", code, stderr)
	}
	build, err := os.ReadFile(finishedBuild)
	if err != nil {
		t.Fatal(err)
	}
	for part, args := range map[string][]string{
		"converter": nil, "transformer": {"--part", "transformer"}, "inductor": {"--part", "inductor"}, "nominal": {"--part", "nominal"},
	} {
		code, stdout, stderr := program(t, string(build), append([]string{"export", "-"}, args...)...)
		want, err := os.ReadFile(filepath.Join(out, part+".cir"))
		if err != nil {
			t.Fatal(err)
		}
		if code != exitDone || stderr != "" || stdout != string(want) {
			t.Errorf("%s: exit %d, %q, %d bytes, want the %d of the file", part, code, stderr, len(stdout), len(want))
		}
	}
	alone := filepath.Join(t.TempDir(), "alone")
	if code, _, stderr := program(t, "", "export", finishedBuild, "--out", alone, "--part", "inductor"); code != exitDone {
		t.Errorf("exit %d: %s", code, stderr)
	}
	if files, err := os.ReadDir(alone); err != nil || len(files) != 1 || files[0].Name() != "inductor.cir" {
		t.Errorf("%v, %v: want inductor.cir alone", files, err)
	}
	// A build that misses a limit is exported, and says so.
	tall := strings.Replace(string(build), "height: 50 mm", "height: 20 mm", 1)
	if code, stdout, stderr := program(t, tall, "export", "-"); code != exitLimitMissed || !strings.Contains(stdout, ".end\n") || !strings.Contains(stderr, "missed by this build") {
		t.Errorf("a limit missed: exit %d, %q", code, stderr)
	}
}

func TestExportMistakes(t *testing.T) {
	if code, stdout, stderr := program(t, "", "export", finishedBuild, "--part", "core"); code != exitUsage || stdout != "" || !strings.Contains(stderr, `"core" is none of transformer, inductor, `) {
		t.Errorf("unknown part: exit %d, %q", code, stderr)
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
