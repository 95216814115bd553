package main

import (
	"encoding/json"
	"flag"
	"html"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"gapwright/corelib/shape"
)

var updateTables = flag.Bool("update-tables", false, "rewrite the expected output of cores and wires")

// The output that a user sees, word for word. These are frozen outputs: look at
// the difference before it is accepted.
func TestTablesGolden(t *testing.T) {
	folder := filepath.Join("..", "..", "testdata", "cases", "tables")
	for _, c := range []struct {
		name string
		args []string
	}{
		{"cores-list", []string{"cores", "--family", "ETD,PQ", "--min-area", "100mm2", "--max-height", "45mm", "--sort", "product"}},
		{"cores-none", []string{"cores", "--min-area", "1m2"}},
		{"cores-etd39", []string{"cores", "etd39/20/13"}},
		{"cores-rm8", []string{"cores", "RM 8"}},
		{"cores-er28", []string{"cores", "ER 28/14/11"}},
		{"cores-u25", []string{"cores", "U 25/20/13"}},
		{"wires", []string{"wires"}},
		{"wires-litz", []string{"wires", "--kind", "litz", "--strand", "0.071mm,AWG40", "--min-area", "0.5mm2", "--max-overall", "1.6mm", "--serving", "single", "--frequency", "100kHz", "--temperature", "100degC"}},
		{"wires-foil", []string{"wires", "--kind", "foil,triple-insulated", "--max-size", "0.25mm", "--width", "25mm"}},
		{"wires-one", []string{"wires", "120 x 0.1 mm litz, single serving, triple-insulated", "--frequency", "100kHz", "--temperature", "100degC"}},
		{"wires-odd", []string{"wires", "0.457 mm grade 1"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			code, stdout, stderr := program(t, "", c.args...)
			if code != exitDone || stderr != "" {
				t.Fatalf("exit %d, stderr %q", code, stderr)
			}
			file := filepath.Join(folder, c.name+".txt")
			if *updateTables {
				if err := os.MkdirAll(folder, 0o755); err != nil {
					t.Fatal(err)
				}
				if err := os.WriteFile(file, []byte(stdout), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			want, err := os.ReadFile(file)
			if err != nil {
				t.Fatal(err)
			}
			if stdout != string(want) {
				t.Errorf("got\n%s\nwant\n%s", stdout, want)
			}
			for _, r := range stdout {
				if r > 126 {
					t.Errorf("a pipe gets ASCII, found %q", r)
					break
				}
			}
		})
	}
}

// Letter D has to be said wherever the shape is shown.
func TestDoubtfulCoresSaySo(t *testing.T) {
	for _, args := range [][]string{{"cores", "PQ 32/20"}, {"cores", "--family", "PQ"}, {"cores", "PQ 32/20", "--json"}, {"cores", "PQ 32/20", "--svg", "-"}} {
		code, stdout, _ := program(t, "", args...)
		want := shape.NotProven
		if args[len(args)-1] == "--json" {
			want = `"proven": false`
		}
		if code != exitDone || !strings.Contains(html.UnescapeString(stdout), want) {
			t.Errorf("%v: exit %d, no word of %q", args, code, want)
		}
	}
	file := filepath.Join(t.TempDir(), "x.svg")
	if code, stdout, stderr := program(t, "", "cores", "PQ 32/20", "--svg", file); code != exitDone || stdout != "" || !strings.Contains(stderr, "W201 PQ 32/20: "+shape.NotProven) {
		t.Errorf("exit %d, stdout %q, stderr %q", code, stdout, stderr)
	}
	if svg, err := os.ReadFile(file); err != nil || !strings.HasPrefix(string(svg), "<svg ") {
		t.Errorf("the drawing: %v", err)
	}
}

func TestCoresJSON(t *testing.T) {
	code, stdout, stderr := program(t, "", "cores", "--json")
	if code != exitDone || stderr != "" {
		t.Fatalf("exit %d, stderr %q", code, stderr)
	}
	var out struct {
		Format int
		Cores  []struct {
			Name            string
			Confidence      string
			DimensionSource string `json:"dimension_source"`
			Effective       struct{ Le, Ae, Ve float64 }
			Dimensions      map[string]struct{ Min, Max *float64 }
			Formers         []struct {
				Chambers int
				Derived  bool
				Pins     *int
				MLT      float64 `json:"mean_length_of_turn"`
			}
			Gaps []struct{ Gap, AL float64 }
		}
	}
	if err := json.Unmarshal([]byte(stdout), &out); err != nil {
		t.Fatal(err)
	}
	if out.Format != 1 || len(out.Cores) != 79 {
		t.Fatalf("format %d, %d cores", out.Format, len(out.Cores))
	}
	for _, c := range out.Cores {
		if c.Effective.Ae <= 0 || c.DimensionSource == "" || c.Confidence == "" || len(c.Formers) == 0 || len(c.Dimensions) < 5 {
			t.Errorf("%s: %+v", c.Name, c)
		}
		if c.Name == "PQ 20/16" {
			if g := c.Dimensions["G"]; g.Min == nil || *g.Min != 12e-3 || g.Max != nil {
				t.Errorf("PQ 20/16: G = %+v, want 12 mm and null", g)
			}
		}
		if c.Name == "ETD 29/16/10" && (len(c.Gaps) != 4 || c.Formers[0].Pins == nil || *c.Formers[0].Pins != 13) {
			t.Errorf("ETD 29/16/10: %+v", c)
		}
	}
}

func TestWiresJSON(t *testing.T) {
	code, stdout, stderr := program(t, "", "wires", "0.2 mm foil", "--width", "25mm", "--frequency", "100kHz", "--json")
	if code != exitDone || stderr != "" {
		t.Fatalf("exit %d, stderr %q", code, stderr)
	}
	var out struct {
		Wires []struct {
			Text       string
			CopperArea float64 `json:"copper_area"`
			Size       float64 `json:"size_over_skin_depth"`
		}
	}
	if err := json.Unmarshal([]byte(stdout), &out); err != nil {
		t.Fatal(err)
	}
	// 0.2 mm over a skin depth of 0.209 mm.
	if len(out.Wires) != 1 || out.Wires[0].Text != "0.2 mm foil" || out.Wires[0].CopperArea < 4.99e-6 || out.Wires[0].CopperArea > 5.01e-6 || out.Wires[0].Size < 0.95 || out.Wires[0].Size > 0.96 {
		t.Errorf("%+v", out)
	}
	code, stdout, _ = program(t, "", "wires", "--json")
	if err := json.Unmarshal([]byte(stdout), &out); err != nil || code != exitDone || len(out.Wires) < 250 {
		t.Errorf("exit %d, %v, %d wires", code, err, len(out.Wires))
	}
}

// Own rows from a folder: a core with its former, a core that replaces one, a
// wire; and the mistakes in such a folder.
func TestOwnFolder(t *testing.T) {
	cases := filepath.Join("..", "..", "testdata", "cases", "library")
	good, bad := filepath.Join(cases, "good"), filepath.Join(cases, "bad")
	code, stdout, stderr := program(t, "", "cores", "E 30/15/10", "--library", good)
	if code != exitDone || stderr != "" {
		t.Fatalf("exit %d, stderr %q", code, stderr)
	}
	for _, want := range []string{"Your own row: " + filepath.Join(good, "cores.csv"), "our own drawing 4711", "your own row, " + filepath.Join(good, "formers.csv"), "12, pitch 5 mm, rows 25 mm apart, vertical"} {
		if !strings.Contains(strings.Join(strings.Fields(stdout), " "), want) {
			t.Errorf("no %q in\n%s", want, stdout)
		}
	}
	if code, stdout, _ = program(t, "", "cores", "--library", good, "--family", "E,ETD", "--confidence", "A"); code != exitDone || !strings.Contains(stdout, "ETD 39/20/13  A+") || !strings.Contains(stdout, "+: your own row.") {
		t.Errorf("exit %d:\n%s", code, stdout)
	}
	code, stdout, stderr = program(t, "", "wires", "225x0.071mm litz double serving", "--library", good)
	if code != exitDone || stderr != "" || !strings.Contains(stdout, "1.52 mm nominal, at most 1.6 mm") || !strings.Contains(stdout, "measured on the reel") {
		t.Errorf("exit %d, stderr %q:\n%s", code, stderr, stdout)
	}
	if code, stdout, _ = program(t, "", "wires", "--kind", "own", "--library", good); code != exitDone || !strings.Contains(stdout, "225 x 0.071 mm litz, double serving +") {
		t.Errorf("exit %d:\n%s", code, stdout)
	}

	code, stdout, stderr = program(t, "", "cores", "--library", bad)
	want := strings.Join([]string{
		filepath.Join(bad, "cores.csv") + ":3:3: core E 31/15/10: the post F 20 mm is wider than the window E 19.7 mm",
		filepath.Join(bad, "cores.csv") + ":4:83: dimension source is empty",
		filepath.Join(bad, "cores.csv") + ":5:3: core E 32/15/10 appears twice, first in line 4",
		filepath.Join(bad, "wires.csv") + `:2:1: wire "120x0.1": 120 is a bare number; write for example 120 x 0.1 mm litz`,
		"",
	}, "\n")
	if code != exitInput || stdout != "" || stderr != want {
		t.Errorf("exit %d, stdout %q, stderr\n%swant\n%s", code, stdout, stderr, want)
	}
}

func TestTableCommandsRefuse(t *testing.T) {
	empty := t.TempDir()
	for _, c := range []struct {
		args []string
		code int
		want string
	}{
		{[]string{"cores", "ETD39"}, exitInput, `no core is called "ETD39"; nearest: ETD 39/20/13`},
		{[]string{"cores", "PQ 26"}, exitInput, "nearest: PQ 26/20, PQ 26/25"},
		{[]string{"wires", "120x0.1"}, exitInput, "write for example 120 x 0.1 mm litz"},
		{[]string{"wires", "9 mm"}, exitInput, "write for example 3.15 mm grade 2"},
		{[]string{"cores", "--min-area", "100"}, exitUsage, "--min-area: 100 is a bare number; write 100 mm2"},
		{[]string{"cores", "--family", "QX", "--sort", "colour"}, exitUsage, "--family: no family is called \"QX\""},
		{[]string{"cores", "--family", "QX", "--sort", "colour"}, exitUsage, "--sort: \"colour\" is none of"},
		{[]string{"cores", "--confidence", "E"}, exitUsage, "is none of A, B, C, D"},
		{[]string{"cores", "--max-height", "-3mm"}, exitUsage, "not above zero"},
		{[]string{"cores", "--svg", "x.svg"}, exitUsage, "--svg draws one shape; name it"},
		{[]string{"cores", "a", "b"}, exitUsage, "usage"},
		{[]string{"wires", "--kind", "rope"}, exitUsage, "--kind: \"rope\" is none of solid"},
		{[]string{"wires", "--strand", "thin"}, exitUsage, "--strand: \"thin\" is no strand size"},
		{[]string{"wires", "--grade", "4"}, exitUsage, "--grade: 4"},
		{[]string{"wires", "--temperature", "100"}, exitUsage, "--temperature: 100 is a bare number"},
		{[]string{"wires", "--serving", "triple"}, exitUsage, "none of none, single, double"},
		{[]string{"cores", "--library", filepath.Join(empty, "absent")}, exitFiles, "does not exist"},
		{[]string{"cores", "--library", empty}, exitInput, "holds no table; the files are cores.csv"},
		{[]string{"cores", "RM 8", "--svg", filepath.Join(empty, "no", "x.svg")}, exitFiles, "does not exist"},
	} {
		code, stdout, stderr := program(t, "", c.args...)
		if code != c.code || stdout != "" || !strings.Contains(stderr, c.want) {
			t.Errorf("%v: exit %d, want %d; stdout %q, stderr %q, want %q", c.args, code, c.code, stdout, stderr, c.want)
		}
	}
}
