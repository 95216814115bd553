package figure

import (
	"bytes"
	"encoding/xml"
	"html"
	"io"
	"math"
	"strconv"
	"strings"
	"testing"

	"gapwright/corelib/shape"
)

// element is what the tests read of a drawing.
type element struct {
	name string
	attr map[string]string
}

func elements(t *testing.T, svg []byte) []element {
	t.Helper()
	var list []element
	d := xml.NewDecoder(bytes.NewReader(svg))
	for {
		token, err := d.Token()
		if err == io.EOF {
			return list
		}
		if err != nil {
			t.Fatal(err)
		}
		if start, ok := token.(xml.StartElement); ok {
			e := element{start.Name.Local, map[string]string{}}
			for _, a := range start.Attr {
				e.attr[a.Name.Local] = a.Value
			}
			list = append(list, e)
		}
	}
}

func (e element) number(t *testing.T, name string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(e.attr[name], 64)
	if err != nil {
		t.Fatalf("%s of %v: %v", name, e, err)
	}
	return v
}

// Every shape of the table can be drawn, to the scale that the drawing states,
// with nothing outside the sheet.
func TestSectionIsToScale(t *testing.T) {
	for _, s := range shape.Embedded().Shapes() {
		former, err := shape.Embedded().FormerFor(s)
		if err != nil {
			t.Fatal(err)
		}
		drawing, title, err := section(s, &former)
		if err != nil {
			t.Errorf("%s: %v", s.Name, err)
			continue
		}
		p := Picture{Width: drawing.width, Height: drawing.height, SVG: drawing.svg(title)} // the PNG takes long
		if bytes.Contains(p.SVG, []byte("NaN")) || bytes.Contains(p.SVG, []byte("Inf")) {
			t.Errorf("%s: the drawing holds NaN or Inf", s.Name)
		}
		if said := strings.Contains(html.UnescapeString(string(p.SVG)), shape.NotProven); said == s.Proven() {
			t.Errorf("%s: letter %s, not proven said: %v", s.Name, s.Confidence, said)
		}
		windows, posts, scale := 0, 0, 0.0
		for _, e := range elements(t, p.SVG) {
			switch {
			case e.attr["class"] == "core":
				scale = e.number(t, "data-scale")
				if got := e.number(t, "height") / scale; math.Abs(got-2e3*s.B.Mean()) > 0.01 {
					t.Errorf("%s: drawn %.3f mm high, want %.3f", s.Name, got, 2e3*s.B.Mean())
				}
			case e.attr["class"] == "window":
				windows++
				if got := e.number(t, "height") / scale; math.Abs(got-1e3*s.WindowBreadth()) > 0.01 {
					t.Errorf("%s: window drawn %.3f mm broad, want %.3f", s.Name, got, 1e3*s.WindowBreadth())
				}
			case e.attr["class"] == "winding-space":
				if w, h := e.number(t, "width")/scale, e.number(t, "height")/scale; math.Abs(w-1e3*former.Height) > 0.01 || math.Abs(h-1e3*former.Breadth) > 0.01 {
					t.Errorf("%s: winding space drawn %.3f x %.3f mm, want %.3f x %.3f", s.Name, h, w, 1e3*former.Breadth, 1e3*former.Height)
				}
			case e.attr["class"] == "post" && e.name == "circle":
				posts++
				if got := 2 * e.number(t, "r") / scale; math.Abs(got-1e3*s.F.Mean()) > 0.01 {
					t.Errorf("%s: post drawn %.3f mm, want %.3f", s.Name, got, 1e3*s.F.Mean())
				}
			case e.name == "text":
				x, y := e.number(t, "x"), e.number(t, "y")
				if x < 0 || x > p.Width || y < 0 || y > p.Height {
					t.Errorf("%s: text at %g, %g outside the sheet %g x %g", s.Name, x, y, p.Width, p.Height)
				}
			case e.attr["points"] != "":
				for pair := range strings.FieldsSeq(e.attr["points"]) {
					x, y, _ := strings.Cut(pair, ",")
					fx, errX := strconv.ParseFloat(x, 64)
					fy, errY := strconv.ParseFloat(y, 64)
					if errX != nil || errY != nil || fx < 0 || fx > p.Width || fy < 0 || fy > p.Height {
						t.Errorf("%s: a corner at %s is outside the sheet", s.Name, pair)
					}
				}
			}
		}
		if windows != 2 || s.PostRound() && posts != 1 {
			t.Errorf("%s: %d windows, %d round posts", s.Name, windows, posts)
		}
	}
}

// The legs of the mating face have the section that the geometry says.
func TestMatingFaceHasTheArea(t *testing.T) {
	for _, name := range []string{"E 42/21/15", "ETD 39/20/13", "PQ 26/25", "RM 8", "P 26/16", "EP 13", "U 25/20/13"} {
		s, err := shape.Embedded().Find(name)
		if err != nil {
			t.Fatal(err)
		}
		drawing, title, err := section(s, nil)
		if err != nil {
			t.Fatal(err)
		}
		p := Picture{SVG: drawing.svg(title)}
		scale, area := 0.0, 0.0
		for _, e := range elements(t, p.SVG) {
			if e.attr["class"] == "core" {
				scale = e.number(t, "data-scale")
			}
			if e.attr["class"] != "leg" {
				continue
			}
			if e.name == "rect" {
				area += e.number(t, "width") * e.number(t, "height")
				continue
			}
			var x, y []float64
			for pair := range strings.FieldsSeq(e.attr["points"]) {
				a, b, _ := strings.Cut(pair, ",")
				fa, _ := strconv.ParseFloat(a, 64)
				fb, _ := strconv.ParseFloat(b, 64)
				x, y = append(x, fa), append(y, fb)
			}
			twice := 0.0
			for i := range x {
				j := (i + 1) % len(x)
				twice += x[i]*y[j] - x[j]*y[i]
			}
			area += math.Abs(twice) / 2
		}
		area /= scale * scale
		want := 1e6 * s.OuterLegArea()
		if s.Family == shape.U {
			want *= 2 // both legs are drawn
		}
		// The arcs are drawn with 32 chords, 0.2 % of these areas; the slots of a
		// P are taken as straight strips by the formula.
		if math.Abs(area/want-1) > 0.012 {
			t.Errorf("%s: legs drawn %.2f mm2, want %.2f mm2", name, area, want)
		}
	}
}

func TestSectionRefusesNonsense(t *testing.T) {
	if _, err := Section(shape.Shape{Name: "nothing"}, nil); err == nil {
		t.Error("a shape without dimensions was drawn")
	}
	s, err := shape.Embedded().Find("RM 8")
	if err != nil {
		t.Fatal(err)
	}
	if p, err := Section(s, nil); err != nil || len(p.PNG) < 1000 || p.Title == "" || bytes.Contains(p.SVG, []byte("winding-space")) {
		t.Errorf("RM 8 without a former: %v, %d bytes of PNG, title %q", err, len(p.PNG), p.Title)
	}
}
