package main

import (
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"gapwright/magnetics/job"
)

func TestTank(t *testing.T) {
	demo := string(job.DemoText())
	code, stdout, stderr := program(t, demo, "tank", "-")
	if code != exitDone || stderr != "" || !strings.Contains(stdout, "nominal  ok") {
		t.Errorf("exit %d, stderr %q, stdout\n%s", code, stderr, stdout)
	}
	file := filepath.Join(t.TempDir(), "job.yaml")
	if err := os.WriteFile(file, []byte(demo), 0o600); err != nil {
		t.Fatal(err)
	}
	if code, again, _ := program(t, "", "tank", file); code != exitDone || again != stdout {
		t.Errorf("exit %d; a file and standard input give different texts", code)
	}

	code, stdout, stderr = program(t, demo, "tank", "-", "--json")
	var got struct {
		Corners []struct {
			Status    string
			Frequency float64
		}
	}
	if err := json.Unmarshal([]byte(stdout), &got); code != exitDone || stderr != "" || err != nil || len(got.Corners) != 4 {
		t.Fatalf("exit %d, stderr %q, %v, %d corners", code, stderr, err, len(got.Corners))
	}
	for k, c := range got.Corners {
		if c.Status != "ok" || c.Frequency < 60e3 || c.Frequency > 250e3 {
			t.Errorf("corner %d: %+v", k, c)
		}
	}
}

// A corner that is not served is a result: the table on stdout, exit 1, nothing
// on stderr.
func TestTankMissesACorner(t *testing.T) {
	text := strings.Replace(string(job.DemoText()), "input_voltage: 320 V", "input_voltage: 220 V", 1)
	for _, args := range [][]string{{"tank", "-"}, {"tank", "-", "--json"}} {
		code, stdout, stderr := program(t, text, args...)
		if code != exitLimitMissed || stderr != "" || !strings.Contains(stdout, "below-range") || !strings.Contains(stdout, "still rising") {
			t.Errorf("%v: exit %d, stderr %q, stdout\n%s", args, code, stderr, stdout)
		}
	}
}

func TestTankRefuses(t *testing.T) {
	demo := string(job.DemoText())
	for _, c := range []struct {
		name, stdin string
		args        []string
		code        int
		want        string
	}{
		{"no job", "", []string{"tank"}, exitUsage, "accepts 1 arg"},
		{"two jobs", "", []string{"tank", "a", "b"}, exitUsage, "accepts 1 arg"},
		{"unknown flag", "", []string{"tank", "-", "--jsn"}, exitUsage, "unknown flag"},
		{"no file", "", []string{"tank", "nowhere.yaml"}, exitFiles, "nowhere.yaml"},
		{"bare number", strings.Replace(demo, "60 uH", "60", 1), []string{"tank", "-"}, exitInput, "write 60 uH"},
		{"empty", "", []string{"tank", "-"}, exitInput, ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			code, stdout, stderr := program(t, c.stdin, c.args...)
			if code != c.code || stdout != "" || stderr == "" || !strings.Contains(stderr, c.want) {
				t.Errorf("exit %d, want %d with %q; stdout %q, stderr %q", code, c.code, c.want, stdout, stderr)
			}
		})
	}
}
