package job

import (
	"errors"
	"math"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"gapwright/corelib/wire"
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
)

// same compares what a file says; where it was read does not count.
var same = cmp.Options{cmpopts.IgnoreUnexported(Job{}, BuildFile{}), cmpopts.EquateEmpty()}

func mustWire(t *testing.T, text string) wire.Wire {
	t.Helper()
	w, err := wire.Parse(text)
	if err != nil {
		t.Fatal(err)
	}
	return w
}

// everything uses every field of both parts at least once.
func everything(t *testing.T) BuildFile {
	t.Helper()
	litz := mustWire(t, "60 x 0.1 mm litz, single serving")
	triple := mustWire(t, "120 x 0.1 mm litz, single serving, triple-insulated")
	tape := func(layers int, overlap float64, purpose string) winding.Entry {
		return winding.Entry{Kind: winding.Tape, Thickness: 0.056e-3, Material: "polyester", TapeLayers: layers, Overlap: overlap, Purpose: purpose}
	}
	return BuildFile{
		MadeWith: "gapwright 0.1.0, tables 2026-12",
		Job:      Demo(),
		Transformer: part.Transformer{
			Construction: part.Construction{
				Core: part.Core{Shape: "ETD 39/20/13", Material: "PW3", Pieces: 2, Clamping: "clip",
					Gap: part.Gap{Kind: part.Ground, Total: 0.63e-3, Pieces: 2, Positions: []float64{9e-3, 18.5e-3}, Half: "upper", Governs: "A_L"}},
				Former: part.Former{Name: "ETD 39/20/13", Chambers: 2, Pins: 16, Mounting: "horizontal", Wall: 1.2e-3, PinsCut: []int{3, 14}},
				Windings: []part.Winding{
					{Name: "P", Turns: 32, Start: []string{"pin 1"}, Finish: []string{"pin 4"}, Parts: []string{"P1", "P2"}, JoinedAt: "pin 2"},
					{Name: "S-A", Turns: 8, Start: []string{"pin 16", "pin 15"}, Finish: []string{"pin 13", "pin 12"}},
					{Name: "S-B", Turns: 8, Start: []string{"pin 13", "pin 12"}, Finish: []string{"lead 1"}},
				},
				Build: []winding.Entry{
					{Kind: winding.Wind, Names: []string{"P1"}, Of: []string{"P"}, Turns: 16, Wire: litz, Parallel: 2, Layers: 2, Spread: "full",
						Direction: "cw", Lay: "C", Margins: [2]float64{3.2e-3, 3.2e-3}, Sleeving: "none", Chamber: 1},
					tape(3, 5e-3, "barrier"),
					{Kind: winding.Wind, Names: []string{"S-A", "S-B"}, Of: []string{"S-A", "S-B"}, Turns: 8, Wire: triple, Parallel: 1, Layers: 1,
						Spread: "close", Direction: "ccw", Insulated: "triple"},
					{Kind: winding.Screen, Thickness: 0.05e-3, Material: "copper", To: "pin 1", Ends: "insulated overlap 5 mm", ScreenWidth: 20e-3},
					{Kind: winding.Space, Height: 1e-3},
					{Kind: winding.Wind, Names: []string{"P2"}, Of: []string{"P"}, Turns: 16, Wire: mustWire(t, "0.5 mm triple-insulated"), Parallel: 1, Layers: 1,
						Spread: "full", Direction: "cw", Insulated: "triple", Chamber: 2},
					tape(2, 10e-3, "finish"),
				},
				Impregnation: part.Impregnation{Kind: "none", When: "after gluing"},
				Glue:         part.Glue{Faces: "none", OuterLegs: "one elastic drop each side", Cure: "1 h at 60 degC"},
				Terminations: part.Terminations{Primary: "pins", Secondary: "leads", LeadLength: 40e-3, Tin: "solder pot 390 degC"},
				Tests:        []part.Test{{Between: "primary_secondary", Voltage: 3000, Kind: "AC", Time: 60}, {Between: "primary_core"}, {Between: "secondary_core", Voltage: 500, Kind: "DC"}},
			},
			OpenInductance:  &part.Requirement{Pins: []string{"pin 1", "pin 4"}, Value: 303e-6, Tolerance: 0.07},
			ShortInductance: &part.Requirement{Value: 3.0123456789e-6, Tolerance: 0.12},
		},
		Inductor: &part.Inductor{
			Construction: part.Construction{
				Core: part.Core{Shape: "PQ 26/20", Material: "PW3", Pieces: 2, Clamping: "tape",
					Gap: part.Gap{Kind: part.Spacer, Thickness: 0.35e-3, Foils: []float64{0.25e-3, 0.1e-3}, Under: "all legs", Governs: "length"}},
				Former:   part.Former{Name: "PQ 26/20", Chambers: 1, Mounting: "vertical", Wall: 1e-3},
				Windings: []part.Winding{{Name: "L", Turns: 18, Start: []string{"pin 1"}, Finish: []string{"pin 6"}}},
				Build: []winding.Entry{
					{Kind: winding.Wind, Names: []string{"L"}, Of: []string{"L"}, Turns: 18, Wire: mustWire(t, "0.2 mm foil"), Parallel: 1, Layers: 18,
						Spread: "full", Direction: "cw", Width: 9e-3, Leads: "1.0 x 6 mm copper strip, soldered both ends"},
					tape(2, 0, "finish"),
				},
				Terminations: part.Terminations{Primary: "pins"},
			},
			Inductance: &part.Requirement{Value: 57e-6, Tolerance: 0.05},
		},
	}
}

func TestBuildFileRoundTrip(t *testing.T) {
	want := everything(t)
	data, err := WriteBuild(want)
	if err != nil {
		t.Fatal(err)
	}
	got, err := ReadBuild("build.yaml", data)
	if err != nil {
		t.Fatalf("%v\n%s", err, data)
	}
	if d := cmp.Diff(want, got, same); d != "" {
		t.Errorf("what was written reads back as (-written +read):\n%s", d)
	}
	again, err := WriteBuild(got)
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(string(data), string(again)); d != "" {
		t.Errorf("written again (-first +second):\n%s", d)
	}
	for _, line := range []string{
		"gap: {kind: ground, total: 0.63 mm, pieces: 2, positions: [9 mm, 18.5 mm], half: upper, governs: A_L}",
		"  - {wind: P1, of: P, turns: 16, wire: 60 x 0.1 mm litz, serving: single, parallel: 2, layers: 2, spread: full, direction: cw, lay: C, margins: [3.2 mm, 3.2 mm], sleeving: none, chamber: 1}",
		"  - {tape: 0.056 mm polyester, layers: 3, width: full, overlap: 5 mm, purpose: barrier}",
		"  - {wind: [S-A, S-B], of: [S-A, S-B], turns: 8, wire: 120 x 0.1 mm litz, serving: single, parallel: 1, layers: 1, spread: close, direction: ccw, insulated: triple}",
		"  - {screen: 0.05 mm copper, width: 20 mm, to: pin 1, ends: insulated overlap 5 mm}",
		"  - {space: 1 mm}",
		"leads: {material: 1.0 x 6 mm copper strip, soldered: both ends}",
		"open_inductance: {pins: [1, 4], value: 303 uH, tolerance: 7 %}",
		"primary_secondary: 3000 V AC 60 s",
		"    resonant_inductance: 60 uH\n",
		"{name: S-B, turns: 8, start: [pin 13, pin 12], finish: lead 1}",
	} {
		if !strings.Contains(string(data), line) {
			t.Errorf("no line %q in\n%s", line, data)
		}
	}
}

func TestBuildFileWithoutInductor(t *testing.T) {
	b := everything(t)
	b.Inductor = nil
	data, err := WriteBuild(b)
	if err != nil {
		t.Fatal(err)
	}
	got, err := ReadBuild("build.yaml", data)
	if err != nil || got.Inductor != nil || !strings.Contains(string(data), "inductor: none\n") {
		t.Errorf("inductor %v, error %v, in\n%s", got.Inductor, err, data)
	}
}

// A job keeps the user's own words, units and comments in the build file, and
// neither defaults nor computed shares are added to it.
func TestBuildFileKeepsTheJob(t *testing.T) {
	text := `format: 1
title: "On: two"
tank:
  bridge: full-bridge
  rectifier: full-bridge # diodes
  turns_ratio: 4.0
  resonant_inductance: 0.06 mH
  resonant_capacitance: 44nF
  frequency_min: 60 kHz
  frequency_max: 0.25 MHz
corners:
  - {name: a, input_voltage: 48 V, output_voltage: 12 V, output_power: 0.2 kW}
  - {name: b, input_voltage: 48 V, frequency: 1e5 Hz, load_resistance: 700 mohm, share: 20 %}
build:
  gap:
    spacer_foils: [0.1, 0.2 mm]
  transformer:
    height: 40 mm
  tolerances:
    open_inductance: [5 %, 10 %]
`
	j, err := Read("job.yaml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	b := everything(t)
	b.Job = j
	data, err := WriteBuild(b)
	if err != nil {
		t.Fatal(err)
	}
	for _, line := range []string{
		"  title: 'On: two'\n", "    rectifier: full-bridge # diodes\n", "    turns_ratio: 4.0\n", "    resonant_inductance: 0.06 mH\n",
		"    resonant_capacitance: 44nF\n", "    frequency_max: 0.25 MHz\n", "spacer_foils: [0.1, 0.2 mm]\n", "        height: 40 mm\n",
		"{name: a, input_voltage: 48 V, output_voltage: 12 V, output_power: 0.2 kW}\n", "open_inductance: [5 %, 10 %]\n",
	} {
		if !strings.Contains(string(data), line) {
			t.Errorf("no %q in\n%s", line, data)
		}
	}
	for _, word := range []string{"magnetizing_inductance", "winding_temperature", "heat_path", "80 %"} {
		if job, _, _ := strings.Cut(string(data), "\ntransformer:"); strings.Contains(job, word) {
			t.Errorf("%q, which the job does not state, is in\n%s", word, job)
		}
	}
	got, err := ReadBuild("build.yaml", data)
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(j, got.Job, same); d != "" {
		t.Errorf("the job in the build file (-job +build):\n%s", d)
	}
}

// A job made or changed in code is written by its values.
func TestBuildFileOfAChangedJob(t *testing.T) {
	b := everything(t)
	b.Job.Build.Library = []string{"rows"}
	b.Job.Tank.Lr = 61.25e-6
	height := 33e-3
	b.Job.Build.Inductor.Limits.Height = &height
	data, err := WriteBuild(b)
	if err != nil {
		t.Fatal(err)
	}
	got, err := ReadBuild("build.yaml", data)
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(b.Job, got.Job, same); d != "" {
		t.Errorf("(-written +read):\n%s", d)
	}
	b.Job.record = nil
	if data, err = WriteBuild(b); err != nil {
		t.Fatal(err)
	}
	if got, err = ReadBuild("build.yaml", data); err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(b.Job, got.Job, same); d != "" {
		t.Errorf("without its file (-written +read):\n%s", d)
	}
}

func TestWriteBuildRefuses(t *testing.T) {
	for name, spoil := range map[string]func(*BuildFile){
		"not a number":     func(b *BuildFile) { b.Transformer.Core.Gap.Total = math.NaN() },
		"turns":            func(b *BuildFile) { b.Transformer.Windings[0].Turns++ },
		"negative":         func(b *BuildFile) { b.Transformer.Former.Wall = -1 },
		"test":             func(b *BuildFile) { b.Transformer.Tests[0].Between = "a_b" },
		"no primary turns": func(b *BuildFile) { b.Transformer.Windings = nil },
	} {
		b := everything(t)
		spoil(&b)
		if data, err := WriteBuild(b); err == nil {
			t.Errorf("%s: no error, wrote\n%s", name, data)
		}
	}
}

func TestReadBuildRefuses(t *testing.T) {
	data, err := WriteBuild(everything(t))
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ name, old, new, want string }{
		{"turns", "name: P, turns: 32", "name: P, turns: 31", "turns: P has 31 turns, but its entries of build (lines"},
		{"unknown key", "former: {name", "former: {nme", "nme: is not a key of former; write name"},
		{"unknown winding", "of: P, turns: 16, wire: 60", "of: Q, turns: 16, wire: 60", "of: there is no winding Q; write one of P, S-A, S-B"},
		{"wire", "wire: 0.2 mm foil", "wire: 0.2 mm floil", "wire: "},
		{"tape", "tape: 0.056 mm polyester", "tape: polyester", "tape: \"polyester\" is not a thickness above 0 and a material; write 0.056 mm polyester"},
		{"kinds", "{space: 1 mm}", "{space: 1 mm, tape: 0.056 mm polyester}", "build: entry 5 has tape and space; write exactly one of wind, tape, screen, space"},
		{"foreign key", "{space: 1 mm}", "{space: 1 mm, turns: 4}", "turns: does not belong to a space entry; leave it out"},
		{"positions", "positions: [9 mm, 18.5 mm]", "positions: [9 mm]", "positions: there are 1 positions for 2 pieces; write one for each piece"},
		{"spacer keys", "kind: spacer,", "kind: spacer, total: 1 mm,", "total: does not belong to a gap of kind spacer"},
		{"foils", "foils: [0.25 mm, 0.1 mm]", "foils: [0.25 mm]", "foils: the foils add up to 0.250 mm, not to the thickness 0.35 mm on line"},
		{"test", "3000 V AC 60 s", "3000 AC", "primary_secondary: \"3000 AC\" is not a test"},
		{"chamber", "chamber: 2}", "chamber: 3}", "chamber: 3 is more than the former's chambers, 2"},
		{"job inside", "resonant_inductance: 60 uH", "resonant_inductance: 60", "resonant_inductance: 60 is a bare number; write 60 uH"},
		{"pin", "start: pin 1, finish: pin 4", "start: 1, finish: pin 4", "start: 1 is a bare number; write pin 1"},
		{"format", "format: 1\nmade_with", "format: 2\nmade_with", "format: 2 is not a format of this release; write 1"},
	} {
		if !strings.Contains(string(data), c.old) {
			t.Fatalf("%s: %q is not in\n%s", c.name, c.old, data)
		}
		_, err := ReadBuild("build.yaml", []byte(strings.Replace(string(data), c.old, c.new, 1)))
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", c.name, err, c.want)
		}
		var located interface {
			Position() (string, int, int)
		}
		if err != nil && !errors.As(err, &located) {
			t.Errorf("%s: the error has no position", c.name)
		}
	}
}
