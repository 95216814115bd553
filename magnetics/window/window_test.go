package window

import (
	"encoding/json"
	"flag"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "rewrite the expected messages")

func read(t testing.TB, text string) *File {
	t.Helper()
	f, err := Read("test.yaml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func solve(t testing.TB, text string) *Result {
	t.Helper()
	r, err := Solve(read(t, text))
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// One file per mistake, its messages beside it.
func TestBadFiles(t *testing.T) {
	files, err := filepath.Glob("../../testdata/window/bad/*.yaml")
	if err != nil || len(files) < 40 {
		t.Fatalf("%d files, %v", len(files), err)
	}
	for _, file := range files {
		name := filepath.Base(file)
		data, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		_, err = Read(name, data)
		if err == nil {
			t.Errorf("%s was read without an error", name)
			continue
		}
		got := err.Error() + "\n"
		expected := strings.TrimSuffix(file, ".yaml") + ".txt"
		if *update {
			if err := os.WriteFile(expected, []byte(got), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		want, err := os.ReadFile(expected)
		if err != nil {
			t.Fatal(err)
		}
		if got != string(want) {
			t.Errorf("%s:\n%swant\n%s", name, got, want)
		}
		for line := range strings.Lines(got) {
			if !strings.HasPrefix(line, name+":") {
				t.Errorf("%s: message without a place: %s", name, line)
			}
		}
	}
}

func FuzzRead(f *testing.F) {
	files, _ := filepath.Glob("../../testdata/window/*.yaml")
	bad, _ := filepath.Glob("../../testdata/window/bad/*.yaml")
	for _, file := range append(files, bad...) {
		data, err := os.ReadFile(file)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(data)
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		w, err := Read("fuzz.yaml", data)
		if err != nil || len(w.conductors()) > 60 || len(w.Frequencies) > 3 {
			return
		}
		for i := range w.Windings {
			if g := w.Windings[i].Grid; g != nil && g[0]*g[1] > 50 {
				return
			}
		}
		// Whatever is read is solved or refused in words; NaN is refused.
		if r, err := Solve(w); err == nil && math.IsNaN(r.Energy) {
			t.Error("the energy is no number")
		}
	})
}

// A finite-element case of each kind that this package adds something to: foils
// and wires through the file. The kernels have all cases.
func TestFiniteElementCases(t *testing.T) {
	near := func(what string, got, want, tolerance float64) {
		t.Helper()
		if !(math.Abs(got/want-1) <= tolerance) {
			t.Errorf("%s = %.6g, want %.6g", what, got, want)
		}
	}
	// D2a of testdata/field: two layers beside a gap. Finite elements 0.01 %,
	// multipoles of order 5 0.2 %.
	r := solve(t, `
format: 1
window: {breadth: 15.2 mm, depth: 4.2 mm, post_half_width: 5 mm, gaps: [{center: 7.6 mm, length: 1.12 mm}]}
windings:
  - {name: Q, current: 2 A, round_wires: {diameter: 0.5 mm, first: [1.08 mm, 1.16 mm], layers: 2, layer_pitch: 0.56 mm, turns_per_layer: 24, turn_pitch: 0.56 mm}}
frequencies: [50 kHz, 100 kHz, 200 kHz, 500 kHz, 1 MHz]
`)
	for k, want := range []float64{8.230476, 24.85077, 59.80042, 122.3179, 189.8435} {
		near("D2a Rac/Rdc", r.Windings[0].Ratio[k], want, 0.003)
	}
	// D3a: two foils over the full breadth.
	r = solve(t, `
format: 1
window: {breadth: 14 mm, depth: 3.1 mm}
windings:
  - {name: Q, current: 1 A, foils: {thickness: 0.2 mm, count: 2, first_x: 0.5 mm, pitch: 0.3 mm, y: [0 mm, 14 mm]}}
  - {name: S, ampere_turns: -2, block: {x: [1.5 mm, 2.7 mm], y: [0 mm, 14 mm]}}
frequencies: [50 kHz, 100 kHz, 200 kHz]
`)
	for k, want := range []float64{1.087812, 1.342709, 2.249727} {
		near("D3a Rac/Rdc", r.Windings[0].Ratio[k], want, 0.001)
	}
	// A7a: round post.
	r = solve(t, `
format: 1
window: {breadth: 22 mm, depth: 6.5 mm, geometry: round-post, post_radius: 6.7 mm}
windings:
  - {name: P, ampere_turns: 1, block: {x: [1 mm, 3.4 mm], y: [2 mm, 20 mm]}}
  - {name: S, ampere_turns: -1, block: {x: [3.9 mm, 6 mm], y: [2 mm, 20 mm]}}
`)
	near("A7a energy", r.Energy, 4.094738e-9, 0.002)
	near("A7a mean H2", r.Windings[0].MeanH2, 917.5223, 0.004)
	// B1a: winding head.
	r = solve(t, `
format: 1
window: {breadth: 17 mm, depth: 6 mm, surround: head}
windings:
  - {name: P, ampere_turns: 1, block: {x: [0.8 mm, 2.6 mm], y: [2 mm, 15 mm]}}
  - {name: S, ampere_turns: -1, block: {x: [3.2 mm, 5.2 mm], y: [2 mm, 15 mm]}}
`)
	near("B1a energy", r.Energy, 7.527515e-8, 0.002)
	near("B1a mean H2", r.Windings[1].MeanH2, 1354.072, 0.002)
}

// Foils beside a gap, where the field normal to them rules. The finite elements
// are good to 0.05 %; strips without thickness in the place of foils are 0.2 to
// 4 % low. A slab in the local field alone would be 2 to 91 % low.
func TestFoilsBesideGaps(t *testing.T) {
	raw, err := os.ReadFile("../../testdata/field/foils.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Cases []struct {
			ID, File, Winding string
			Loss              map[string]float64
		}
	}
	if err := json.Unmarshal(raw, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) != 3 {
		t.Fatalf("%d cases", len(file.Cases))
	}
	for _, c := range file.Cases {
		r := solve(t, c.File)
		for i := range r.Windings {
			if r.Windings[i].Name != c.Winding {
				continue
			}
			for k, f := range r.File.Frequencies {
				want, ok := c.Loss[Hertz(f)]
				if e := r.Windings[i].Loss[k]/want - 1; !ok || !(math.Abs(e) < 0.05) {
					t.Errorf("%s at %s Hz: loss %+.2f %%", c.ID, Hertz(f), 100*e)
				}
			}
		}
	}
}

const example = "../../testdata/window/example.yaml"

func TestProperties(t *testing.T) {
	data, err := os.ReadFile(example)
	if err != nil {
		t.Fatal(err)
	}
	text := string(data)
	r := solve(t, text)
	if r.Net != 53 || len(r.GapDrops) != 1 || math.Abs(r.GapDrops[0]+53) > 1e-9 {
		t.Errorf("net %g, gap %v", r.Net, r.GapDrops)
	}
	// All currents doubled: four times the energy, the same ratios and inductance.
	double := solve(t, strings.NewReplacer("ampere_turns: 1,", "ampere_turns: 2,", "current: 1 A", "current: 2 A", "current: -1 A", "current: -2 A").Replace(text))
	same := func(what string, a, b float64) {
		t.Helper()
		if math.Abs(a-b) > 1e-9*math.Abs(b) {
			t.Errorf("%s: %g and %g", what, a, b)
		}
	}
	same("energy", double.Energy, 4*r.Energy)
	same("inductance", double.Inductance, r.Inductance)
	for i := range r.Windings {
		same("mean square", double.Windings[i].MeanH2, 4*r.Windings[i].MeanH2)
		for k := range r.Windings[i].Ratio {
			same("ratio", double.Windings[i].Ratio[k], r.Windings[i].Ratio[k])
			if r.Windings[i].Ratio[k] < 1 {
				t.Errorf("%s: Rac below Rdc", r.Windings[i].Name)
			}
		}
	}
	// The grid's mean is the mean of the block.
	sum := 0.0
	for _, row := range r.Windings[0].Grid {
		for _, v := range row {
			sum += v / 32
		}
	}
	if math.Abs(sum/r.Windings[0].MeanH2-1) > 2e-3 { // two quadratures
		t.Errorf("mean of the grid %g, of the block %g", sum, r.Windings[0].MeanH2)
	}
	// At 1 Hz the resistance is that at DC. The foils are wide and stand in the
	// field of 53 ampere-turns: 1e-5 is left.
	slow := solve(t, strings.Replace(text, "[50 kHz, 100 kHz]", "[1 Hz]", 1))
	for i, w := range slow.Windings[1:] {
		if tolerance := []float64{1e-6, 1e-4}[i]; math.Abs(w.Ratio[0]-1) > tolerance {
			t.Errorf("%s at 1 Hz: Rac/Rdc = %g", w.Name, w.Ratio[0])
		}
	}
	// Turned upside down nothing changes but the grid.
	mirrored := solve(t, strings.NewReplacer("first: [1 mm, 1.3 mm]", "first: [1 mm, 1.58 mm]").Replace(text))
	same("mirrored ratio", mirrored.Windings[1].Ratio[1], r.Windings[1].Ratio[1])
}

// More wires than can be coupled are taken one by one; thin wires come out alike.
func TestManyWires(t *testing.T) {
	text := func(turns string) string {
		return `
format: 1
window: {breadth: 30 mm, depth: 6 mm, post_half_width: 5 mm, gaps: [{center: 15 mm, length: 1 mm}]}
windings:
  - {name: Q, current: 1 A, round_wires: {diameter: 0.1 mm, first: [2 mm, 1 mm], layers: 10, layer_pitch: 0.25 mm, ` + turns + `}}
frequencies: [100 kHz]
`
	}
	many := solve(t, text("turns_per_layer: 112, turn_pitch: 0.25 mm"))
	if many.Orders != 0 || many.Windings[0].Conductors != 1120 {
		t.Fatalf("%d wires, order %d", many.Windings[0].Conductors, many.Orders)
	}
	some := solve(t, text("turns_per_layer: 28, turn_pitch: 1 mm"))
	if some.Orders == 0 {
		t.Fatal("280 wires were not coupled")
	}
	// A quarter of the turns: a sixteenth of the field squared per squared current.
	a, b := many.Windings[0].Ratio[0]-1, 16*(some.Windings[0].Ratio[0]-1)
	if math.Abs(a/b-1) > 0.03 { // 2 % of the isolated wire and the ends of the layers
		t.Errorf("eddy loss of 1120 wires %g, sixteen times that of 280 wires %g", a, b)
	}
}

func BenchmarkExample(b *testing.B) {
	data, err := os.ReadFile(example)
	if err != nil {
		b.Fatal(err)
	}
	f := read(b, string(data))
	b.ReportAllocs()
	for b.Loop() {
		if _, err := Solve(f); err != nil {
			b.Fatal(err)
		}
	}
}
