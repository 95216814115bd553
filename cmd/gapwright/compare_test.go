package main

import (
	"encoding/csv"
	"encoding/json"
	"strings"
	"testing"
)

// comparedJob is the demo on few sizes, so that the whole search takes no time.
func comparedJob() string {
	return strings.Replace(smallJob(), "[ETD 29/16/10, PQ 40/40, RM 8]", "[ETD 29/16/10, ETD 39/20/13, PQ 40/40, RM 8, RM 10]", 1)
}

func TestCompare(t *testing.T) {
	code, stdout, stderr := program(t, comparedJob(), "compare", "-")
	if code != exitDone {
		t.Fatalf("exit %d: %s", code, stderr)
	}
	for _, want := range []string{
		"Transformer, one row per core size", "Resonant inductor, one row per core size", "> ", "keeps all; nearest",
		"Why not a smaller transformer: ", "Why not a smaller inductor: RM 8 is the smallest size admitted.", "Pairs that no other beats", "winding_temperature",
	} {
		if !strings.Contains(stdout, want) {
			t.Errorf("no %q in\n%s", want, stdout)
		}
	}
	for _, line := range strings.Split(stdout, "\n") {
		if len([]rune(line)) > 100 {
			t.Errorf("wider than 100 columns: %q", line)
		}
	}
	// Filters.
	code, stdout, _ = program(t, comparedJob(), "compare", "-", "--family", "RM", "--part", "inductor", "--top", "1")
	listed, _, _ := strings.Cut(stdout, "Pairs that")
	if code != exitDone || strings.Contains(listed, "ETD 29") || strings.Contains(listed, "RM 10") || strings.Contains(stdout, "Transformer, one row") || !strings.Contains(stdout, "RM 8") {
		t.Errorf("exit %d\n%s", code, stdout)
	}
}

func TestCompareForPrograms(t *testing.T) {
	code, stdout, _ := program(t, comparedJob(), "compare", "-", "--csv")
	rows, err := csv.NewReader(strings.NewReader(stdout)).ReadAll()
	if err != nil || code != exitDone {
		t.Fatal(code, err)
	}
	chosen := 0
	for i, row := range rows {
		if len(row) != len(rows[0]) || len(row) != 21 {
			t.Errorf("row %d has %d cells", i, len(row))
		}
		if i > 0 && row[5] == "true" {
			chosen++
		}
	}
	if chosen != 2 || len(rows) != 11 {
		t.Errorf("%d chosen of %d rows", chosen, len(rows)-1)
	}

	code, stdout, _ = program(t, comparedJob(), "compare", "-", "--json", "--sort", "loss")
	var d struct {
		Feasible bool
		Sizes    []struct {
			Part, Core string
			Loss       *float64
			Leakage    *float64 `json:"leakage_share"`
		}
		Why    []string `json:"why_not_smaller"`
		Pareto []struct{ Loss, Volume float64 }
	}
	if err := json.Unmarshal([]byte(stdout), &d); err != nil || code != exitDone {
		t.Fatal(code, err)
	}
	if !d.Feasible || len(d.Sizes) != 10 || len(d.Why) != 2 || len(d.Pareto) == 0 {
		t.Errorf("%+v", d)
	}
	for i := 1; i < len(d.Sizes); i++ {
		if a, b := d.Sizes[i-1], d.Sizes[i]; a.Part == b.Part && a.Loss != nil && b.Loss != nil && *a.Loss > *b.Loss {
			t.Errorf("%s before %s", a.Core, b.Core)
		}
	}
	for _, x := range d.Sizes {
		if x.Part == "transformer" && x.Loss != nil && (x.Leakage == nil || *x.Leakage <= 0 || *x.Leakage >= 1) {
			t.Errorf("%s: leakage share %v", x.Core, x.Leakage)
		}
	}
}

func TestCompareRefuses(t *testing.T) {
	for _, c := range []struct {
		args []string
		want string
	}{
		{[]string{"compare"}, "give one JOB file"},
		{[]string{"compare", "--demo", "--csv", "--json"}, "give one of them"},
		{[]string{"compare", "--demo", "--sort", "price"}, "--sort price"},
		{[]string{"compare", "--demo", "--part", "core"}, "--part core"},
		{[]string{"compare", "--demo", "--family", "XY"}, "--family XY"},
		{[]string{"compare", "--demo", "--top", "-1"}, "--top -1"},
	} {
		if code, _, stderr := program(t, "", c.args...); code != exitUsage || !strings.Contains(stderr, c.want) {
			t.Errorf("%v: exit %d, %q", c.args, code, stderr)
		}
	}
}
