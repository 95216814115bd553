package figure

import (
	"bytes"
	"encoding/xml"
	"errors"
	"io"
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
)

// wellFormed reads a drawing as XML and returns its elements with attributes.
func wellFormed(t *testing.T, svg []byte) []map[string]string {
	t.Helper()
	d := xml.NewDecoder(bytes.NewReader(svg))
	var list []map[string]string
	for {
		token, err := d.Token()
		if errors.Is(err, io.EOF) {
			return list
		}
		if err != nil {
			t.Fatalf("%v in %.300s", err, svg)
		}
		if e, ok := token.(xml.StartElement); ok {
			a := map[string]string{"": e.Name.Local}
			for _, x := range e.Attr {
				a[x.Name.Local] = x.Value
			}
			list = append(list, a)
		}
	}
}

func number(t *testing.T, s string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

func chart(log bool) Chart {
	return Chart{
		Name: "test", Title: `a < b & "c"`, X: Axis{Label: "frequency, kHz", Log: log},
		Panels: []Panel{{
			Y:      Axis{Label: "loss, W"},
			Curves: []Curve{{Name: "curve <1>", X: []float64{10, 20, 40, 100}, Y: []float64{1, 2, 4, 10}, Tone: Primary}},
			Marks:  []Mark{{X: 40, Y: 4, Shape: Dot, ID: "7", Tip: `tip "&"`, Label: "here"}, {X: 10, Y: 1, Shape: Ring}, {X: 20, Y: 2, Shape: Diamond}, {X: 100, Y: 10, Shape: Star}},
			Rules:  []Rule{{At: 20, Label: "rule"}, {At: 3, Across: true}},
			Bands:  []Band{{From: 15, To: 30, Label: "band"}},
		}},
	}
}

// A point lies on paper where its axes say, straight or logarithmic, and the
// curve goes through the mark at the same values.
func TestChartIsToScale(t *testing.T) {
	for _, log := range []bool{false, true} {
		svg, err := chart(log).SVG()
		if err != nil {
			t.Fatal(err)
		}
		var frame, mark, curve map[string]string
		for _, e := range wellFormed(t, svg) {
			switch {
			case e["class"] == "frame":
				frame = e
			case e["data-mark"] == "7":
				mark = e
			case e[""] == "polyline":
				curve = e
			}
		}
		if frame == nil || mark == nil || curve == nil {
			t.Fatalf("frame %v, mark %v, curve %v", frame, mark, curve)
		}
		x0, x1, y0, y1 := number(t, frame["data-x0"]), number(t, frame["data-x1"]), number(t, frame["data-y0"]), number(t, frame["data-y1"])
		left, width, top, height := number(t, frame["x"]), number(t, frame["width"]), number(t, frame["y"]), number(t, frame["height"])
		share := (40 - x0) / (x1 - x0)
		if log {
			share = math.Log(40/x0) / math.Log(x1/x0)
		}
		wantX, wantY := left+share*width, top+height-(4-y0)/(y1-y0)*height
		if x, y := number(t, mark["cx"]), number(t, mark["cy"]); math.Abs(x-wantX) > 1e-3 || math.Abs(y-wantY) > 1e-3 {
			t.Errorf("log %t: the mark is at %g, %g mm, not at %g, %g", log, x, y, wantX, wantY)
		}
		third := strings.Split(strings.Fields(curve["points"])[2], ",")
		if x, y := number(t, third[0]), number(t, third[1]); math.Abs(x-wantX) > 0.01 || math.Abs(y-wantY) > 0.01 {
			t.Errorf("log %t: the curve passes %g, %g mm, not %g, %g", log, x, y, wantX, wantY)
		}
		if mark["data-tip"] != `tip "&"` {
			t.Errorf("tip %q", mark["data-tip"])
		}
	}
}

func TestChartInBothForms(t *testing.T) {
	p, err := chart(true).Picture()
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.HasPrefix(p.PNG, []byte("\x89PNG")) || p.Width != 110 || p.Height < 50 {
		t.Errorf("%d bytes, %g x %g mm", len(p.PNG), p.Width, p.Height)
	}
	wellFormed(t, p.SVG)
}

func TestChartsRefuseNonsense(t *testing.T) {
	for name, change := range map[string]func(*Chart){
		"no panel":            func(c *Chart) { c.Panels = nil },
		"no points":           func(c *Chart) { c.Panels[0].Curves, c.Panels[0].Marks = nil, nil },
		"NaN":                 func(c *Chart) { c.Panels[0].Curves[0].Y[1] = math.NaN() },
		"Inf":                 func(c *Chart) { c.Panels[0].Curves[0].X[1] = math.Inf(1) },
		"zero on a log axis":  func(c *Chart) { c.Panels[0].Y.Log, c.Panels[0].Curves[0].Y[0] = true, 0 },
		"lengths that differ": func(c *Chart) { c.Panels[0].Curves[0].X = c.Panels[0].Curves[0].X[:2] },
	} {
		c := chart(false)
		change(&c)
		if _, err := c.SVG(); err == nil {
			t.Errorf("%s: drawn", name)
		}
	}
	if _, err := (Bars{Rows: []BarRow{{Values: []float64{-1}}}, Segments: []string{"a"}, Tones: []Tone{Ink}}).SVG(); err == nil {
		t.Error("a bar of -1 is drawn")
	}
	if _, err := (Bars{}).SVG(); err == nil {
		t.Error("no bars are drawn")
	}
	// All alike is no nonsense.
	c := chart(false)
	c.Panels[0].Curves[0].Y = []float64{3, 3, 3, 3}
	c.Panels[0].Marks = nil
	if _, err := c.SVG(); err != nil {
		t.Error(err)
	}
	c.Panels[0].Curves[0].Y = []float64{1e9, 1e9, math.Nextafter(1e9, 2e9), 1e9}
	c.Panels[0].Curves[0].X = []float64{7, 7, math.Nextafter(7, 8), 7}
	c.Panels[0].Rules, c.Panels[0].Bands = nil, nil
	if _, err := c.SVG(); err != nil {
		t.Error(err)
	}
}

func TestRoundSteps(t *testing.T) {
	for _, c := range []struct{ x, want float64 }{{0.9, 1}, {1, 1}, {1.1, 2}, {2.1, 2.5}, {3, 5}, {6, 10}, {0.0004, 0.0005}, {0, 1}, {math.Inf(1), 1}} {
		if got := roundStep(c.x); math.Abs(got-c.want) > 1e-12*c.want {
			t.Errorf("roundStep(%g) = %g, want %g", c.x, got, c.want)
		}
	}
	for _, span := range [][2]float64{{60, 250}, {1, 1.2}, {1e-3, 1e4}, {3, 40}} {
		list := logTicks(span[0], span[1])
		if len(list) < 1 || len(list) > 14 {
			t.Errorf("%v: %d ticks", span, len(list))
		}
	}
}

// Bars are as long as their values, one after the other.
func TestBarsAreToScale(t *testing.T) {
	b := Bars{
		Title: "t", Label: "loss, W", Segments: []string{"a", "b"}, Tones: []Tone{Primary, Secondary},
		Rows: []BarRow{{Group: "g", Name: "one", Values: []float64{1, 3}}, {Group: "g", Name: "two", Values: []float64{2, 0}, Quiet: true}},
	}
	p, err := b.Picture()
	if err != nil {
		t.Fatal(err)
	}
	width := map[string]float64{}
	ends := map[string]float64{}
	for _, e := range wellFormed(t, p.SVG) {
		if strings.HasPrefix(e["class"], "bar") {
			key := e["data-row"] + e["data-segment"]
			width[key] = number(t, e["width"])
			ends[key] = number(t, e["x"])
		}
	}
	if len(width) != 3 || math.Abs(width["01"]/width["00"]-3) > 1e-2 || math.Abs(width["10"]/width["00"]-2) > 1e-2 {
		t.Errorf("widths %v", width)
	}
	if math.Abs(ends["00"]+width["00"]-ends["01"]) > 1e-2 {
		t.Error("the bars of a row do not follow each other")
	}
}

// The half section over the field has the proportions of the window, the map
// fills the window exactly, and the layers are where the coil has them.
func TestFieldViewIsToScale(t *testing.T) {
	c := Coil{
		Title: `T <1>`, Breadth: 16e-3, Height: 5e-3, Wall: 1e-3, WindowBreadth: 18e-3, WindowDepth: 6.5e-3, Post: 5e-3, Yoke: 4e-3, Chambers: 1,
		Layers: []CoilLayer{
			{Rect: winding.Rect{X0: 1e-3, X1: 2e-3, Y0: 0, Y1: 16e-3}, Number: "1", Role: "primary", Wires: 10, Diameter: 1e-3},
			{Rect: winding.Rect{X0: 3e-3, X1: 3.5e-3, Y0: 1e-3, Y1: 15e-3}, Number: "2", Role: "secondary", Foil: true},
		},
		PostGaps: []CoilGap{{9e-3, 0.5e-3}},
	}
	m := part.FieldMap{Corner: `"n" & <m>`, Frequency: 1e5, Breadth: 18e-3, Depth: 6.5e-3, NX: 4, NY: 6, H: make([]float64, 24), Peak: 900, InCopper: 400}
	for i := range m.H {
		m.H[i] = float64(i) * 40
	}
	svg, err := FieldView(c, m, FieldTop([]part.FieldMap{m}))
	if err != nil {
		t.Fatal(err)
	}
	var window, image, first, gap map[string]string
	for _, e := range wellFormed(t, svg) {
		switch {
		case e["class"] == "window":
			window = e
		case e["class"] == "field":
			image = e
		case e["class"] == "layer" && e["data-number"] == "1":
			first = e
		case e["class"] == "gap":
			gap = e
		}
	}
	k := number(t, window["data-mm-per-m"])
	near := func(what string, got, want float64) {
		t.Helper()
		if math.Abs(got-want) > 2e-3 {
			t.Errorf("%s: %g mm, want %g", what, got, want)
		}
	}
	for _, side := range []string{"x", "y", "width", "height"} {
		near("map against window, "+side, number(t, image[side]), number(t, window[side]))
	}
	near("breadth", number(t, window["width"]), 18e-3*k)
	near("depth", number(t, window["height"]), 6.5e-3*k)
	face := number(t, window["y"]) + number(t, window["height"])
	near("layer 1 over the post", face-(number(t, first["y"])+number(t, first["height"])), 1e-3*k)
	near("layer 1 from the yoke", number(t, first["x"])-number(t, window["x"]), 1e-3*k)
	near("gap", number(t, gap["x"])+number(t, gap["width"])/2-number(t, window["x"]), 9e-3*k)
	if FieldTop([]part.FieldMap{m}) != 500 {
		t.Errorf("the colours end at %g A/m", FieldTop([]part.FieldMap{m}))
	}
	for _, bad := range []Coil{{}, {WindowBreadth: 1e-2}} {
		if _, err := FieldView(bad, m, 500); err == nil {
			t.Error("a coil without a window is drawn")
		}
	}
	if _, err := FieldView(c, m, 0); err == nil {
		t.Error("a map without a top is drawn")
	}
}

// The colours of the field darken all the way, so that they read in grey and by
// every eye.
func TestFieldColoursDarken(t *testing.T) {
	last := math.Inf(1)
	for i := range 129 {
		c := fieldColour(float64(i) / 128)
		lightness := 0.2126*math.Pow(float64(c.R)/255, 2.2) + 0.7152*math.Pow(float64(c.G)/255, 2.2) + 0.0722*math.Pow(float64(c.B)/255, 2.2)
		if lightness > last {
			t.Errorf("step %d is lighter than the one before", i)
		}
		last = lightness
	}
}

var hexColour = regexp.MustCompile(`(?:fill|stroke)="(#[0-9a-f]{6})"`)

// A page turns the drawings dark by their colours, so a drawing may use those of
// the palette only.
func TestChartsKeepToThePalette(t *testing.T) {
	known := map[string]bool{}
	for _, c := range []string{inkColour, faintColour, ferriteColour, plasticColour, tapeColour, marginColour, screenColour, primaryColour, secondaryColour, otherHalfColour,
		spacerColour, paperColour, quietInk, gridColour, secondaryInk, otherHalfInk, primaryInkTone} {
		known[c] = true
	}
	svg, err := chart(false).SVG()
	if err != nil {
		t.Fatal(err)
	}
	for _, m := range hexColour.FindAllSubmatch(svg, -1) {
		if !known[string(m[1])] {
			t.Errorf("colour %s", m[1])
		}
	}
}
