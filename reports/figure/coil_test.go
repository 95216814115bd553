package figure

import (
	"bytes"
	"encoding/xml"
	"image/png"
	"math"
	"strconv"
	"strings"
	"testing"

	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
)

// drawnMark is one element of a finished SVG.
type drawnMark struct {
	name string
	attr map[string]string
	text string
}

func marks(t *testing.T, svg []byte) []drawnMark {
	t.Helper()
	var list []drawnMark
	d := xml.NewDecoder(bytes.NewReader(svg))
	for {
		token, err := d.Token()
		if err != nil {
			break
		}
		switch x := token.(type) {
		case xml.StartElement:
			m := drawnMark{name: x.Name.Local, attr: map[string]string{}}
			for _, a := range x.Attr {
				m.attr[a.Name.Local] = a.Value
			}
			list = append(list, m)
		case xml.CharData:
			if len(list) > 0 {
				list[len(list)-1].text += strings.TrimSpace(string(x))
			}
		}
	}
	if len(list) < 5 {
		t.Fatalf("%d elements in the drawing", len(list))
	}
	return list
}

func (m drawnMark) f(t *testing.T, key string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(m.attr[key], 64)
	if err != nil {
		t.Fatalf("%s %s=%q: %v", m.name, key, m.attr[key], err)
	}
	return v
}

type box struct{ x, y, w, h float64 }

func (m drawnMark) box(t *testing.T) box {
	return box{m.f(t, "x"), m.f(t, "y"), m.f(t, "width"), m.f(t, "height")}
}

// slack is what writing coordinates with three decimals costs, mm.
const slack = 2e-3

func (b box) in(o box) bool {
	return b.x >= o.x-slack && b.y >= o.y-slack && b.x+b.w <= o.x+o.w+slack && b.y+b.h <= o.y+o.h+slack
}

func (b box) overlaps(o box) bool {
	return b.x+b.w > o.x+slack && o.x+o.w > b.x+slack && b.y+b.h > o.y+slack && o.y+o.h > b.y+slack
}

func lay(t *testing.T, text string, name string, of string, turns, layers, chamber int) winding.Entry {
	t.Helper()
	w, err := wire.Parse(text)
	if err != nil {
		t.Fatal(err)
	}
	return winding.Entry{Kind: winding.Wind, Names: strings.Split(name, "+"), Of: strings.Split(of, "+"), Turns: turns, Wire: w, Parallel: 1, Layers: layers, Spread: "full", Direction: "cw", Chamber: chamber}
}

// half builds the half section of an order of work on a shape.
func half(t *testing.T, shapeName string, chambers int, gap part.Gap, build ...winding.Entry) (Coil, part.Rating) {
	t.Helper()
	table := shape.Embedded()
	sh, err := table.Find(shapeName)
	if err != nil {
		t.Fatal(err)
	}
	former, err := table.FormerWith(sh, chambers)
	if err != nil {
		t.Fatal(err)
	}
	w := part.WindowOf(former)
	section, err := winding.Layout(w, build, winding.Bulge{Litz: 0.12, Solid: 0.05, Foil: 0.1})
	if err != nil {
		t.Fatal(err)
	}
	c := part.Construction{Core: part.Core{Shape: shapeName, Gap: gap}, Build: build}
	r := part.Rating{Shape: sh, Former: former, Section: section, Gap: part.GapRating{ClearDistance: 1.5e-3}}
	return NewCoil("test", c, r, w, false), r
}

func tapeEntry(layers, chamber int) winding.Entry {
	return winding.Entry{Kind: winding.Tape, Thickness: 0.056e-3, Material: "polyester", TapeLayers: layers, Purpose: "barrier", Chamber: chamber}
}

// TestHalfSectionIsToScale reads the finished drawing: the window and every
// layer have their size at the stated scale, layers lie inside the window and
// not on each other, numbers are those of the winding table, and each layer
// shows the wires that lie side by side in it.
func TestHalfSectionIsToScale(t *testing.T) {
	margins := lay(t, "0.5 mm grade 2", "P", "P", 30, 2, 0)
	margins.Margins = [2]float64{3e-3, 3e-3}
	foil := lay(t, "0.2 mm foil", "S", "S", 3, 1, 0)
	foil.Width = 16e-3
	type example struct {
		shape    string
		chambers int
		gap      part.Gap
		build    []winding.Entry
		wires    int
		numbers  string
	}
	for name, e := range map[string]example{
		"sandwich": {"ETD 39/20/13", 1, part.Gap{Kind: part.Ground, Total: 0.6e-3, Pieces: 1},
			[]winding.Entry{lay(t, "60 x 0.1 mm litz", "P1", "P", 14, 1, 0), tapeEntry(3, 0), lay(t, "60 x 0.1 mm litz", "S-A+S-B", "S-A+S-B", 7, 1, 0), tapeEntry(3, 0), lay(t, "60 x 0.1 mm litz", "P2", "P", 14, 1, 0)}, 42, "1 2 3"},
		"margins": {"ETD 39/20/13", 1, part.Gap{Kind: part.Ground, Total: 1.2e-3, Pieces: 3}, []winding.Entry{margins, tapeEntry(3, 0), foil}, 30, "1.1 1.2 2.1 2.2 2.3"},
		"chambers": {"ETD 39/20/13", 2, part.Gap{Kind: part.Spacer, Thickness: 0.3e-3},
			[]winding.Entry{lay(t, "0.5 mm grade 2", "P", "P", 24, 2, 1), lay(t, "0.8 mm grade 2", "S", "S", 10, 1, 2)}, 34, "1.1 1.2 2"},
	} {
		t.Run(name, func(t *testing.T) {
			coil, r := half(t, e.shape, e.chambers, e.gap, e.build...)
			p, err := coil.Picture()
			if err != nil {
				t.Fatal(err)
			}
			var window box
			scale := 0.0
			var layers []box
			var numbers []string
			wires := 0
			var insulation []box
			gaps := 0
			all := marks(t, p.SVG)
			for _, m := range all {
				switch m.attr["class"] {
				case "window":
					window, scale = m.box(t), m.f(t, "data-scale")
				}
			}
			if scale <= 0 {
				t.Fatal("no window in the drawing")
			}
			if math.Abs(window.w-r.Shape.WindowBreadth()*1e3*scale) > slack || math.Abs(window.h-r.Shape.WindowDepth()*1e3*scale) > slack {
				t.Errorf("window %g x %g mm on paper at %g : 1, core %g x %g mm", window.w, window.h, scale, r.Shape.WindowBreadth()*1e3, r.Shape.WindowDepth()*1e3)
			}
			for _, m := range all {
				switch m.attr["class"] {
				case "layer":
					layers, numbers = append(layers, m.box(t)), append(numbers, m.attr["data-number"])
				case "wire":
					wires++
					x, y, radius := m.f(t, "cx"), m.f(t, "cy"), m.f(t, "r")
					inside := false
					for _, l := range layers {
						inside = inside || box{x - radius, y - radius, 2 * radius, 2 * radius}.in(l)
					}
					if !inside {
						t.Errorf("a wire at %g, %g lies in no layer", x, y)
					}
				case "insulation":
					insulation = append(insulation, m.box(t))
				case "gap":
					gaps++
					if b := m.box(t); e.gap.Kind == part.Ground && math.Abs(b.w-e.gap.Total/float64(e.gap.Pieces)*1e3*scale) > slack {
						t.Errorf("gap piece %g mm wide on paper at %g : 1", b.w, scale)
					}
				}
			}
			if len(layers) != len(r.Section.Layers) || strings.Join(numbers, " ") != e.numbers {
				t.Fatalf("%d layers numbered %v, want %d numbered %s", len(layers), numbers, len(r.Section.Layers), e.numbers)
			}
			for i, l := range layers {
				want := r.Section.Layers[i]
				if math.Abs(l.h-(want.X1-want.X0)*1e3*scale) > slack || math.Abs(l.w-(want.Y1-want.Y0)*1e3*scale) > slack {
					t.Errorf("layer %d is %g x %g mm on paper, want %g x %g", i, l.w, l.h, (want.Y1-want.Y0)*1e3*scale, (want.X1-want.X0)*1e3*scale)
				}
				if !l.in(window) {
					t.Errorf("layer %d at %+v lies outside of the window %+v", i, l, window)
				}
				// The post is at the bottom: the first layer starts a wall above it.
				if i == 0 && math.Abs(window.y+window.h-(l.y+l.h)-want.X0*1e3*scale) > slack {
					t.Errorf("the first layer stands %g mm above the post", window.y+window.h-l.y-l.h)
				}
				for j := range i {
					if l.overlaps(layers[j]) {
						t.Errorf("layers %d and %d overlap", j, i)
					}
				}
				for _, in := range insulation {
					if l.overlaps(in) {
						t.Errorf("layer %d overlaps insulation %+v", i, in)
					}
				}
			}
			if wires != e.wires {
				t.Errorf("%d wires drawn, want %d", wires, e.wires)
			}
			if want := max(e.gap.Pieces, 2); e.gap.Kind == part.Ground && gaps != e.gap.Pieces || e.gap.Kind == part.Spacer && gaps != want {
				t.Errorf("%d gap pieces drawn", gaps)
			}
			inPaper(t, p, all)
			if img, err := png.Decode(bytes.NewReader(p.PNG)); err != nil || math.Abs(float64(img.Bounds().Dx())-p.Width/25.4*DPI) > 1.5 {
				t.Errorf("PNG: %v", err)
			}
			if name != "sandwich" {
				return
			}
			again, err := coil.Picture()
			if err != nil || !bytes.Equal(again.SVG, p.SVG) || !bytes.Equal(again.PNG, p.PNG) {
				t.Error("the same section gives another drawing")
			}
		})
	}
}

// inPaper checks that nothing is drawn outside of the paper, texts by the
// estimate that places them.
func inPaper(t *testing.T, p Picture, all []drawnMark) {
	t.Helper()
	for _, m := range all {
		var x0, x1, y float64
		switch m.name {
		case "text":
			x0, y = m.f(t, "x"), m.f(t, "y")
			size := m.f(t, "font-size")
			w := textWidth(m.text, size) * 0.93 // the estimate is on the wide side
			if m.attr["transform"] != "" {
				continue
			}
			switch m.attr["text-anchor"] {
			case "middle":
				x0 -= w / 2
			case "end":
				x0 -= w
			}
			x1 = x0 + w
		case "circle":
			x0, x1, y = m.f(t, "cx")-m.f(t, "r"), m.f(t, "cx")+m.f(t, "r"), m.f(t, "cy")
		case "rect":
			if m.attr["x"] == "" {
				continue
			}
			b := m.box(t)
			x0, x1, y = b.x, b.x+b.w, b.y+b.h
		default:
			continue
		}
		if x0 < -slack || x1 > p.Width+slack || y < -slack || y > p.Height+slack {
			t.Errorf("%s %q at %g..%g, %g lies outside of the paper %g x %g", m.name, m.text, x0, x1, y, p.Width, p.Height)
		}
	}
}

// TestCoilThatDoesNotFit is still drawn, and says so.
func TestCoilThatDoesNotFit(t *testing.T) {
	coil, _ := half(t, "ETD 39/20/13", 1, part.Gap{Kind: part.Ground, Total: 0.5e-3, Pieces: 1}, lay(t, "1.4 mm grade 2", "P", "P", 80, 6, 0))
	p, err := coil.Picture()
	if err != nil || !strings.Contains(string(p.SVG), "too high by") {
		t.Errorf("%v; the drawing does not say that the coil is too high", err)
	}
	if _, err := (Coil{}).Picture(); err == nil {
		t.Error("an empty window was drawn")
	}
}

func TestSchematicAndPins(t *testing.T) {
	c := part.Construction{
		Former: part.Former{Pins: 12, PinsCut: []int{6}},
		Windings: []part.Winding{
			{Name: "P", Turns: 28, Start: []string{"pin 1"}, Finish: []string{"pin 4"}, Parts: []string{"P1", "P2"}, JoinedAt: "pin 2"},
			{Name: "S-A", Turns: 7, Start: []string{"pin 7", "pin 8"}, Finish: []string{"pin 9", "pin 10"}},
			{Name: "S-B", Turns: 7, Start: []string{"pin 9", "pin 10"}, Finish: []string{"pin 11", "pin 12"}},
		},
		Build: []winding.Entry{{Kind: winding.Screen, To: "pin 1"}},
	}
	p, err := Schematic("T1", c)
	if err != nil {
		t.Fatal(err)
	}
	all := marks(t, p.SVG)
	dots := map[string]float64{}
	var pins []string
	for _, m := range all {
		switch m.attr["class"] {
		case "dot":
			dots[m.attr["data-winding"]] = m.f(t, "cy")
		case "pin":
			pins = append(pins, m.attr["data-pins"])
		}
	}
	if len(dots) != 3 || !(dots["S-A"] < dots["S-B"]) {
		t.Errorf("dots %v, want one for each winding, S-A above S-B", dots)
	}
	// The center tap is one terminal.
	if len(pins) != 5 {
		t.Errorf("terminals %q, want five", pins)
	}
	for _, text := range []string{"28 turns", "P1 + P2 in series, joint 2", "9+10", "screen to 1"} {
		if !strings.Contains(string(p.SVG), text) {
			t.Errorf("the schematic does not say %q", text)
		}
	}
	inPaper(t, p, all)

	if p, err = PinView("T1", c); err != nil {
		t.Fatal(err)
	}
	places := map[string][2]float64{}
	cut := 0
	for _, m := range marks(t, p.SVG) {
		switch m.attr["class"] {
		case "pin":
			if m.name == "rect" {
				places[m.attr["data-pin"]] = [2]float64{m.f(t, "x"), m.f(t, "y")}
			} else {
				places[m.attr["data-pin"]] = [2]float64{m.f(t, "cx"), m.f(t, "cy")}
			}
		case "cut":
			cut++
		}
	}
	if len(places) != 12 || cut != 2 {
		t.Fatalf("%d pins, %d strokes of a cross", len(places), cut)
	}
	// Clockwise from the upper left: pin 6 right of pin 1, pin 7 under pin 6, pin
	// 12 under pin 1.
	if !(places["6"][0] > places["1"][0]) || places["7"][0] != places["6"][0] || !(places["7"][1] > places["6"][1]) || math.Abs(places["12"][0]-places["1"][0]) > 2.2 {
		t.Errorf("places %v", places)
	}
	inPaper(t, p, marks(t, p.SVG))

	if _, err := Schematic("", part.Construction{}); err == nil {
		t.Error("a schematic of nothing was drawn")
	}
	if _, err := PinView("", part.Construction{}); err == nil {
		t.Error("a former without pins was drawn")
	}
}

func TestGapViewSaysWhichHalf(t *testing.T) {
	sh, err := shape.Embedded().Find("ETD 39/20/13")
	if err != nil {
		t.Fatal(err)
	}
	for name, tc := range map[string]struct {
		gap  part.Gap
		want []string
	}{
		"upper":  {part.Gap{Kind: part.Ground, Total: 0.63e-3, Pieces: 1, Half: "upper"}, []string{"UPPER half only", "ground by 0.63"}},
		"lower":  {part.Gap{Kind: part.Ground, Total: 0.63e-3, Pieces: 1, Half: "lower"}, []string{"LOWER half only"}},
		"both":   {part.Gap{Kind: part.Ground, Total: 0.6e-3, Pieces: 1, Half: "both"}, []string{"BOTH halves", "0.30 each"}},
		"three":  {part.Gap{Kind: part.Ground, Total: 1.2e-3, Pieces: 3}, []string{"3 gaps of 0.40", "sum 1.20"}},
		"film":   {part.Gap{Kind: part.Spacer, Thickness: 0.25e-3}, []string{"film 0.250", "under all legs"}},
		"closed": {part.Gap{Kind: part.Closed}, []string{"no gap"}},
	} {
		p, err := GapView("T1", sh, tc.gap, false)
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		for _, w := range tc.want {
			if !strings.Contains(string(p.SVG), w) {
				t.Errorf("%s: the drawing does not say %q", name, w)
			}
		}
		all := marks(t, p.SVG)
		films, gaps := 0, 0
		for _, m := range all {
			switch m.attr["class"] {
			case "film":
				films++
			case "gap":
				gaps++
			}
		}
		if films != map[string]int{"film": 3}[name] || gaps != map[string]int{"upper": 1, "lower": 1, "both": 1, "three": 3}[name] {
			t.Errorf("%s: %d films and %d gaps drawn", name, films, gaps)
		}
		inPaper(t, p, all)
	}
	if _, err := GapView("", shape.Shape{}, part.Gap{}, false); err == nil {
		t.Error("a shape without dimensions was drawn")
	}
	comma, err := GapView("T1", sh, part.Gap{Kind: part.Ground, Total: 0.63e-3, Pieces: 1}, true)
	if err != nil || !strings.Contains(string(comma.SVG), "0,63") {
		t.Errorf("no decimal comma in the drawing (%v)", err)
	}
}
