package sheet

import (
	"testing"

	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
)

func mustWire(t testing.TB, text string) wire.Wire {
	t.Helper()
	w, err := wire.Parse(text)
	if err != nil {
		t.Fatal(err)
	}
	return w
}

// settings are the defaults of the build file.
func settings() part.InspectionSettings {
	return part.InspectionSettings{
		OpenTolerance: [2]float64{0.07, 0.07}, ShortTolerance: [2]float64{0.12, 0.12},
		ResistanceUp: 0.08, HalfToHalf: 0.03, SampleToSample: 0.02, HalfMismatch: 0.05, CapacitanceUp: 0.5,
		Frequency: 100e3, Level: 0.1, Temperature: 25, Samples: 5, BeforeGlue: true,
		CoreCountsAs: "primary", GlueLine: 10e-6, WindingLimit: 120, AmbientInUse: 40,
	}
}

// transformer is a center-tapped 32 : 8 + 8 on an ETD 39, primary split around
// the secondary, a sheet that a shop could get. Its ratings are plausible
// figures, not results.
func transformer(t testing.TB, comma bool) Sheet {
	t.Helper()
	litz := mustWire(t, "60 x 0.1 mm litz")
	litz.Serving = wire.SingleServing
	second := mustWire(t, "90 x 0.1 mm litz")
	second.TripleInsulated = true
	tape := func(layers int, overlap float64, purpose string) winding.Entry {
		return winding.Entry{Kind: winding.Tape, Thickness: 0.056e-3, Material: "polyester", TapeLayers: layers, Overlap: overlap, Purpose: purpose}
	}
	tr := part.Transformer{Construction: part.Construction{
		Core: part.Core{Shape: "ETD 39/20/13", Material: "PW3", Pieces: 2, Clamping: "clip",
			Gap: part.Gap{Kind: part.Ground, Total: 0.63e-3, Pieces: 1, Half: "upper", Governs: "A_L"}},
		Former: part.Former{Name: "ETD 39/20/13", Chambers: 1, Pins: 16, Mounting: "horizontal", Wall: 1.2e-3, PinsCut: []int{5}},
		Windings: []part.Winding{
			{Name: "P", Turns: 32, Start: []string{"pin 1"}, Finish: []string{"pin 4"}, Parts: []string{"P1", "P2"}, JoinedAt: "pin 2"},
			{Name: "S-A", Turns: 8, Start: []string{"pin 9", "pin 10"}, Finish: []string{"pin 11", "pin 12"}},
			{Name: "S-B", Turns: 8, Start: []string{"pin 11", "pin 12"}, Finish: []string{"pin 13", "pin 14"}},
		},
		Build: []winding.Entry{
			{Kind: winding.Wind, Names: []string{"P1"}, Of: []string{"P"}, Turns: 16, Wire: litz, Parallel: 1, Layers: 1, Spread: "full", Direction: "cw"},
			tape(3, 5e-3, "barrier"),
			{Kind: winding.Wind, Names: []string{"S-A"}, Of: []string{"S-A"}, Turns: 8, Wire: second, Parallel: 1, Layers: 1, Spread: "full", Direction: "cw", Insulated: "triple"},
			tape(1, 2e-3, "interlayer"),
			{Kind: winding.Wind, Names: []string{"S-B"}, Of: []string{"S-B"}, Turns: 8, Wire: second, Parallel: 1, Layers: 1, Spread: "full", Direction: "cw", Insulated: "triple"},
			tape(3, 5e-3, "barrier"),
			{Kind: winding.Wind, Names: []string{"P2"}, Of: []string{"P"}, Turns: 16, Wire: litz, Parallel: 1, Layers: 1, Spread: "full", Direction: "cw"},
			tape(2, 10e-3, "finish"),
		},
		Tests: []part.Test{{Between: "primary_secondary", Voltage: 3000, Kind: "AC", Time: 60}, {Between: "primary_core", Voltage: 1500, Kind: "AC", Time: 60}},
		Glue:  part.Glue{Faces: "none", OuterLegs: "one elastic drop each side"},
	}}
	sh, fo, window := etd39(t)
	section, err := winding.Layout(window, tr.Build, winding.Bulge{Litz: 0.12, Solid: 0.05, Foil: 0.1})
	if err != nil {
		t.Fatal(err)
	}
	r := part.Rating{
		Part: "transformer", Shape: sh, Former: fo, Section: section, Arrangement: "P/2-S-P/2",
		Windings: []part.WindingRating{
			{Name: "P", Turns: 32, Wire: "60 x 0.1 mm litz", Parallel: 1, Layers: 2, DCResistance: 0.0845, MeanLengthOfTurn: 66e-3},
			{Name: "S-A", Turns: 8, Wire: "90 x 0.1 mm litz", Parallel: 1, Layers: 1, DCResistance: 0.01012, MeanLengthOfTurn: 62e-3},
			{Name: "S-B", Turns: 8, Wire: "90 x 0.1 mm litz", Parallel: 1, Layers: 1, DCResistance: 0.01093, MeanLengthOfTurn: 67e-3},
		},
		Gap: part.GapRating{Length: 0.63e-3, PieceLength: 0.63e-3, AL: 402e-9, Ungapped: 2700e-9, Sensitivity: -1180,
			SpacerLength: 0.345e-3, ClearDistance: 1.575e-3, CopperDistance: 1.2e-3},
		OpenInductance: 411.6e-6, SecondaryInductance: 25.7e-6, ShortInductance: 5.42e-6, ShortHalves: []float64{5.31e-6, 5.53e-6},
		SelfCapacitance: 38e-12, InterwindingCapacity: 96e-12, Outline: [3]float64{40e-3, 42e-3, 34e-3},
		Corners: []part.CornerRating{{Name: "nominal", Continuous: true, WindingTemperature: 97, CoreTemperature: 88}},
	}
	s := Sheet{
		Owner: "Grow-lamp works", Title: "Grow-lamp supply, 48 V 400 W: LLC transformer", PartNumber: "GL48-T", Revision: "A", CreatedBy: "design office", Date: "2026-11-30",
		Part: "transformer", Construction: tr.Construction, Rating: r, Window: window, Checks: tr.Inspection(r, settings()), Samples: 5,
		Material:     "MnZn power ferrite, class PW3 of IEC 61332 or equal by the loss test",
		GapTolerance: 0.05e-3, ALTolerance: 0.05, GroundSlope: 411.6e-6 / 1180 / 1, FilmSlope: 0.545 * 411.6e-6 / 1180, FilmStock: []float64{0.05e-3, 0.075e-3, 0.1e-3, 0.125e-3, 0.19e-3, 0.25e-3, 0.35e-3, 0.5e-3},
		FilmAllowed: true, CoreCountsAs: "primary",
		Assumptions: []string{"Assumed: reinforced insulation, 400 V peak working voltage, pollution degree 2, 2000 m."},
		Warnings:    []part.Warning{{Code: "W202", Text: "loss figures of PW3 hot are from memory"}},
		Hash:        "0123456789ab", Tool: "gapwright test", Comma: comma,
	}
	return s
}

func etd39(t testing.TB) (shape.Shape, shape.Former, winding.Window) {
	t.Helper()
	table := shape.Embedded()
	sh, err := table.Find("ETD 39/20/13")
	if err != nil {
		t.Fatal(err)
	}
	fo, err := table.FormerFor(sh)
	if err != nil {
		t.Fatal(err)
	}
	return sh, fo, winding.Window{Breadth: fo.Breadth, Height: fo.Height, Wall: fo.WallOffset, PostPerimeter: 3.14159 * sh.F.Mean(), Chambers: 1}
}

// drawn returns the sheet with its pictures.
func drawn(t testing.TB, s Sheet) Sheet {
	t.Helper()
	list, err := Pictures(s)
	if err != nil {
		t.Fatal(err)
	}
	s.Pictures = list
	return s
}

// inductor is a single layer on the same core with two gap pieces, pins left to
// the shop.
func inductor(t testing.TB) Sheet {
	t.Helper()
	litz := mustWire(t, "90 x 0.1 mm litz")
	in := part.Inductor{Construction: part.Construction{
		Core:     part.Core{Shape: "ETD 39/20/13", Material: "PW3", Pieces: 2, Clamping: "tape", Gap: part.Gap{Kind: part.Ground, Total: 1.4e-3, Pieces: 2, Governs: "A_L"}},
		Former:   part.Former{Name: "ETD 39/20/13", Chambers: 1},
		Windings: []part.Winding{{Name: "L", Turns: 18}},
		Build: []winding.Entry{
			{Kind: winding.Space, Height: 2e-3, Purpose: "distance from the gap"},
			{Kind: winding.Wind, Names: []string{"L"}, Of: []string{"L"}, Turns: 18, Wire: litz, Parallel: 1, Layers: 2, Spread: "full", Direction: "cw", Lay: "C", Margins: [2]float64{3e-3, 3e-3}},
			{Kind: winding.Tape, Thickness: 0.056e-3, Material: "polyester", TapeLayers: 2, Overlap: 10e-3, Purpose: "finish"},
		},
		Impregnation: part.Impregnation{Kind: "dip", When: "after gluing"},
	}}
	sh, fo, window := etd39(t)
	section, err := winding.Layout(window, in.Build, winding.Bulge{Litz: 0.12})
	if err != nil {
		t.Fatal(err)
	}
	r := part.Rating{
		Part: "inductor", Shape: sh, Former: fo, Section: section,
		Windings:       []part.WindingRating{{Name: "L", Turns: 18, Wire: "90 x 0.1 mm litz", Parallel: 1, Layers: 2, DCResistance: 0.0357, MeanLengthOfTurn: 65e-3}},
		Gap:            part.GapRating{Length: 1.4e-3, PieceLength: 0.7e-3, AL: 176e-9, Ungapped: 2700e-9, Sensitivity: -540, ClearDistance: 1.75e-3, CopperDistance: 3.4e-3},
		OpenInductance: 57e-6, SelfCapacitance: 15e-12, Outline: [3]float64{40e-3, 42e-3, 34e-3},
	}
	set := settings()
	set.PeakCurrent = 6.2
	set.OpenTolerance = [2]float64{0.05, 0.05}
	s := Sheet{
		Title: "Resonant inductor", PartNumber: "GL48-L", Revision: "A", Part: "inductor", Construction: in.Construction, Rating: r, Window: window,
		Checks: in.Inspection(r, set), Samples: 3, ALTolerance: 0.05, GroundSlope: 57e-6 / 540, Hash: "fedcba987654", Tool: "gapwright test",
	}
	return s
}
