package winding

import (
	"math"
	"strings"
	"testing"

	"gapwright/corelib/wire"
)

func mustWire(t testing.TB, text string) wire.Wire {
	t.Helper()
	w, err := wire.Parse(text)
	if err != nil {
		t.Fatal(err)
	}
	return w
}

// window is 20 mm wide and 6 mm high, its floor 1 mm from a post of 40 mm
// around.
var window = Window{Breadth: 20e-3, Height: 6e-3, Wall: 1e-3, PostPerimeter: 40e-3, Chambers: 1}

func near(t *testing.T, what string, got, want float64) {
	t.Helper()
	if !(math.Abs(got-want) <= 1e-12) {
		t.Errorf("%s = %.9g, want %.9g", what, got, want)
	}
}

func TestLayersByHand(t *testing.T) {
	w := mustWire(t, "0.5 mm grade 2")
	od := w.OuterDiameter()
	s, err := Layout(window, []Entry{
		{Kind: Wind, Names: []string{"P"}, Of: []string{"P"}, Turns: 50, Wire: w, Parallel: 1, Layers: 2, Spread: "full", Margins: [2]float64{3e-3, 2e-3}},
		{Kind: Tape, Thickness: 0.05e-3, TapeLayers: 3},
		{Kind: Wind, Names: []string{"S-A", "S-B"}, Of: []string{"S-A", "S-B"}, Turns: 5, Wire: w, Parallel: 2, Layers: 1, Spread: "close"},
		{Kind: Space, Height: 0.4e-3},
		{Kind: Screen, Thickness: 0.05e-3},
	}, Bulge{Solid: 0.05})
	if err != nil {
		t.Fatal(err)
	}
	if len(s.Layers) != 3 || len(s.Insulation) != 3 {
		t.Fatalf("%d layers, %d insulations", len(s.Layers), len(s.Insulation))
	}
	pitch := od * 1.05
	a, b, c := s.Layers[0], s.Layers[1], s.Layers[2]
	near(t, "x0 of layer 1", a.X0, 1e-3)
	near(t, "x1 of layer 1", a.X1, 1e-3+pitch)
	near(t, "x0 of layer 2", b.X0, 1e-3+pitch)
	near(t, "margin below", a.Y0, 3e-3)
	near(t, "margin above", a.Y1, 18e-3)
	near(t, "room", a.Room, 15e-3)
	// 25 turns need 26 diameters: the last one crosses.
	near(t, "need", a.Need, 26*od)
	near(t, "turn length", a.Length, 40e-3+2*math.Pi*(1e-3+pitch/2))
	near(t, "x0 of layer 3", c.X0, 1e-3+2*pitch+0.15e-3)
	if a.Turns != 25 || b.Turns != 25 || c.Wires() != 20 {
		t.Errorf("turns %d, %d; %d wires in layer 3", a.Turns, b.Turns, c.Wires())
	}
	near(t, "close layer", c.Y1, 21*od)
	near(t, "height", s.Height, 3*pitch+0.15e-3+0.4e-3+0.05e-3)
	near(t, "height left", s.HeightLeft, 6e-3-s.Height)
	if len(s.Misfits) != 0 {
		t.Errorf("misfits %+v", s.Misfits)
	}
}

func TestFoilAndMisfit(t *testing.T) {
	foil, thick := mustWire(t, "0.2 mm foil"), mustWire(t, "1.5 mm grade 2")
	s, err := Layout(window, []Entry{
		{Kind: Wind, Names: []string{"A", "B"}, Of: []string{"A", "B"}, Turns: 3, Wire: foil, Parallel: 1, Layers: 6, Width: 16e-3, Interleaf: 0.05e-3},
		{Kind: Wind, Names: []string{"P"}, Of: []string{"P"}, Turns: 14, Wire: thick, Parallel: 1, Layers: 1},
	}, Bulge{Foil: 0.1})
	if err != nil {
		t.Fatal(err)
	}
	if len(s.Layers) != 7 {
		t.Fatalf("%d layers, want six of foil and one of wire", len(s.Layers))
	}
	for i, want := range []string{"A", "B", "A", "B", "A", "B"} {
		l := s.Layers[i]
		if l.Of[0] != want || l.Turns != 1 {
			t.Errorf("foil layer %d: %d turns of %v, want one of %s", i, l.Turns, l.Of, want)
		}
		near(t, "foil x0", l.X0, 1e-3+float64(i)*0.25e-3*1.1)
		near(t, "metal", l.X1-l.X0, 0.2e-3)
		near(t, "width of the wire", l.Wire.Width, 16e-3)
		near(t, "foil y0", l.Y0, 2e-3)
	}
	if len(s.Misfits) != 1 || s.Misfits[0].Entry != 1 || !(s.Misfits[0].Value > s.Misfits[0].Room) {
		t.Errorf("misfits %+v: 15 diameters of 1.5 mm do not go into 20 mm", s.Misfits)
	}
}

// Two chambers stack on their own; what lies over both starts on the taller.
func TestChambers(t *testing.T) {
	w := mustWire(t, "0.5 mm grade 2")
	two := window
	two.Breadth, two.Chambers, two.ChamberWall = 9e-3, 2, 1.2e-3
	wind := func(name string, chamber, layers int) Entry {
		return Entry{Kind: Wind, Chamber: chamber, Names: []string{name}, Of: []string{name}, Turns: 10 * layers, Wire: w, Parallel: 1, Layers: layers, Spread: "full"}
	}
	s, err := Layout(two, []Entry{wind("P", 1, 3), wind("S", 2, 1), {Kind: Tape, Thickness: 0.06e-3, TapeLayers: 2}}, Bulge{})
	if err != nil {
		t.Fatal(err)
	}
	p, q := s.Layers[0], s.Layers[3]
	near(t, "chamber 1 from", p.Y0, 0)
	near(t, "chamber 1 to", p.Y1, 9e-3)
	near(t, "chamber 2 from", q.Y0, 10.2e-3)
	near(t, "chamber 2 to", q.Y1, 19.2e-3)
	near(t, "chamber 2 starts at the floor", q.X0, 1e-3)
	tape := s.Insulation[0]
	near(t, "tape over the taller chamber", tape.X0, 1e-3+3*w.OuterDiameter())
	near(t, "tape over both", tape.Y1, 19.2e-3)
	near(t, "whole breadth", two.Whole(), 19.2e-3)
}

func TestLayoutRefuses(t *testing.T) {
	w := mustWire(t, "0.5 mm grade 2")
	for _, c := range []struct {
		name  string
		entry Entry
		want  string
	}{
		{"no turns", Entry{Kind: Wind, Names: []string{"P"}, Of: []string{"P"}, Wire: w, Layers: 1}, "without turns"},
		{"no layers", Entry{Kind: Wind, Names: []string{"P"}, Of: []string{"P"}, Turns: 3, Wire: w}, "in 0 layers"},
		{"empty last layers", Entry{Kind: Wind, Names: []string{"P"}, Of: []string{"P"}, Turns: 5, Wire: w, Layers: 4}, "do not fill 4 layers"},
		{"unknown kind", Entry{Kind: "glue"}, "unknown kind"},
		{"chamber that is not there", Entry{Kind: Tape, Chamber: 2}, "chamber 2 of a former with 1"},
	} {
		t.Run(c.name, func(t *testing.T) {
			if _, err := Layout(window, []Entry{c.entry}, Bulge{}); err == nil || !strings.Contains(err.Error(), c.want) || !strings.Contains(err.Error(), "entry 1") {
				t.Errorf("error %v, want %q", err, c.want)
			}
		})
	}
}
