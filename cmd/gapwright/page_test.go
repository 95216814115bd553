package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"gapwright/magnetics/job"
)

// A design without parts leaves a page that says so, and nothing that looks
// like a result.
func TestPageWithoutParts(t *testing.T) {
	for _, c := range []struct{ name, from, to, want string }{
		{"tank", "frequency_min: 60 kHz", "frequency_min: 90 kHz", "The tank itself misses corner"},
		{"cores", "families: [ETD, PQ, RM, E, EFD]", "shapes: [RM 5, RM 6]", "No core size gives a transformer"},
	} {
		t.Run(c.name, func(t *testing.T) {
			demo := string(job.DemoText())
			text := strings.Replace(demo, c.from, c.to, 1)
			if text == demo {
				t.Fatalf("the example has no %q", c.from)
			}
			out := filepath.Join(t.TempDir(), "parts")
			code, _, stderr := program(t, text, "design", "-", "--out", out)
			if code != exitLimitMissed {
				t.Fatalf("exit %d, stderr %q", code, stderr)
			}
			page, err := os.ReadFile(filepath.Join(out, pageName))
			if err != nil {
				t.Fatal(err)
			}
			for _, want := range []string{"No design keeps every limit.", c.want} {
				if !strings.Contains(string(page), want) {
					t.Errorf("the page does not say %q", want)
				}
			}
			if entries, err := os.ReadDir(out); err != nil || len(entries) != 1 {
				t.Errorf("%d files, the page alone expected", len(entries))
			}
		})
	}
}
