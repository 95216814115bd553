package figure

import (
	"bytes"
	"fmt"
	"html"
	"image/color"
	"math"
	"strconv"
	"strings"

	stdfont "golang.org/x/image/font"
	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/font/liberation"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/vgimg"
)

// A Picture is one finished drawing, the same in both forms.
type Picture struct {
	Name   string  // file name without extension
	Title  string  // what it shows, in words
	Width  float64 // mm
	Height float64 // mm
	SVG    []byte
	PNG    []byte
}

// The colours differ in lightness as well as in hue, and every area that they
// fill is named in words beside it.
const (
	inkColour       = "#1f2933"
	faintColour     = "#8a94a0"
	ferriteColour   = "#b4bac2"
	plasticColour   = "#e9e6df"
	tapeColour      = "#f7e27a"
	marginColour    = "#d9c98f"
	screenColour    = "#a8672a"
	primaryColour   = "#2b6ca3"
	secondaryColour = "#e8a33d"
	otherHalfColour = "#c8552b"
	spacerColour    = "#7a4fa3"
	paperColour     = "#ffffff"
)

// sketch is a drawing made of a few kinds of mark, in mm on paper with y
// downwards. Texts are set in a sans face whose digits are about 0.56 of the
// size wide.
type sketch struct {
	width, height float64
	marks         []mark
}

type markKind int

const (
	lineMark markKind = iota
	polygonMark
	circleMark
	textMark
)

// A mark is one element of a sketch. data goes to the SVG as data attributes,
// so that a test or a script can find what an area stands for.
type mark struct {
	kind   markKind
	points []point
	radius float64
	text   string
	size   float64 // mm, of the text
	anchor string  // start, middle, end
	bold   bool
	turned bool // text reads upwards
	fill   string
	stroke string
	weight float64
	dashed bool
	class  string
	data   []string // key, value, ...
}

type point struct{ x, y float64 }

func (s *sketch) line(class string, x1, y1, x2, y2, weight float64, colour string) *mark {
	return s.add(mark{kind: lineMark, class: class, points: []point{{x1, y1}, {x2, y2}}, weight: weight, stroke: colour})
}

func (s *sketch) rect(class string, x, y, w, h float64, fill, stroke string, weight float64) *mark {
	return s.add(mark{kind: polygonMark, class: class, points: []point{{x, y}, {x + w, y}, {x + w, y + h}, {x, y + h}}, fill: fill, stroke: stroke, weight: weight})
}

func (s *sketch) polygon(class string, fill, stroke string, weight float64, points ...point) *mark {
	return s.add(mark{kind: polygonMark, class: class, points: points, fill: fill, stroke: stroke, weight: weight})
}

func (s *sketch) circle(class string, x, y, r float64, fill, stroke string, weight float64) *mark {
	return s.add(mark{kind: circleMark, class: class, points: []point{{x, y}}, radius: r, fill: fill, stroke: stroke, weight: weight})
}

func (s *sketch) text(x, y, size float64, anchor, format string, args ...any) *mark {
	return s.add(mark{kind: textMark, class: "text", points: []point{{x, y}}, size: size, anchor: anchor, text: fmt.Sprintf(format, args...), fill: inkColour})
}

func (s *sketch) add(m mark) *mark {
	s.marks = append(s.marks, m)
	return &s.marks[len(s.marks)-1]
}

// arrow draws a dimension line with a head at both ends; a distance too short
// for heads gets ticks.
func (s *sketch) arrow(x1, y1, x2, y2 float64) {
	s.line("dimension", x1, y1, x2, y2, 0.18, inkColour)
	length := math.Hypot(x2-x1, y2-y1)
	if length == 0 {
		return
	}
	ux, uy := (x2-x1)/length, (y2-y1)/length
	head := 1.6
	if length < 4*head/2 {
		for _, p := range []point{{x1, y1}, {x2, y2}} {
			s.line("dimension", p.x-uy*0.9-ux*0.5, p.y+ux*0.9-uy*0.5, p.x+uy*0.9+ux*0.5, p.y-ux*0.9+uy*0.5, 0.25, inkColour)
		}
		return
	}
	for _, e := range []struct {
		p    point
		sign float64
	}{{point{x1, y1}, 1}, {point{x2, y2}, -1}} {
		bx, by := e.p.x+e.sign*ux*head, e.p.y+e.sign*uy*head
		s.polygon("dimension", inkColour, "", 0, e.p, point{bx - uy*0.45, by + ux*0.45}, point{bx + uy*0.45, by - ux*0.45})
	}
}

// textWidth estimates the width in mm of text at a size in mm.
func textWidth(text string, size float64) float64 {
	w := 0.0
	for _, r := range text {
		switch {
		case strings.ContainsRune("iljI.,:;'|! ", r):
			w += 0.28
		case strings.ContainsRune("mwMW@%", r):
			w += 0.86
		case r >= 'A' && r <= 'Z':
			w += 0.67
		default:
			w += 0.55
		}
	}
	return w * size
}

func (s *sketch) picture(name, title string) (Picture, error) {
	p := Picture{Name: name, Title: title, Width: s.width, Height: s.height, SVG: s.svg(title)}
	var err error
	p.PNG, err = s.png()
	if err != nil {
		return Picture{}, fmt.Errorf("figure %s: %w", name, err)
	}
	return p, nil
}

func coordinate(x float64) string {
	t := strconv.FormatFloat(x, 'f', 3, 64)
	t = strings.TrimRight(strings.TrimRight(t, "0"), ".")
	if t == "-0" || t == "" {
		return "0"
	}
	return t
}

// svg writes the sketch with one user unit to the mm.
func (s *sketch) svg(title string) []byte {
	var b bytes.Buffer
	w, h := coordinate(s.width), coordinate(s.height)
	fmt.Fprintf(&b, `<svg xmlns="http://www.w3.org/2000/svg" width="%smm" height="%smm" viewBox="0 0 %s %s" font-family="'Liberation Sans',Arial,Helvetica,sans-serif">`+"\n", w, h, w, h)
	fmt.Fprintf(&b, "<title>%s</title>\n", html.EscapeString(title))
	fmt.Fprintf(&b, `<rect width="%s" height="%s" fill="%s"/>`+"\n", w, h, paperColour)
	for _, m := range s.marks {
		style := ""
		if m.kind != lineMark {
			fill := m.fill
			if fill == "" {
				fill = "none"
			}
			style += fmt.Sprintf(` fill="%s"`, fill)
		}
		if m.stroke != "" {
			style += fmt.Sprintf(` stroke="%s" stroke-width="%s"`, m.stroke, coordinate(m.weight))
			if m.dashed {
				style += ` stroke-dasharray="1.2 0.9"`
			}
		}
		if m.class != "" {
			style += fmt.Sprintf(` class="%s"`, html.EscapeString(m.class))
		}
		for i := 0; i+1 < len(m.data); i += 2 {
			style += fmt.Sprintf(` data-%s="%s"`, m.data[i], html.EscapeString(m.data[i+1]))
		}
		switch m.kind {
		case lineMark:
			fmt.Fprintf(&b, `<line x1="%s" y1="%s" x2="%s" y2="%s"%s/>`+"\n", coordinate(m.points[0].x), coordinate(m.points[0].y), coordinate(m.points[1].x), coordinate(m.points[1].y), style)
		case polygonMark:
			if r, ok := m.box(); ok {
				fmt.Fprintf(&b, `<rect x="%s" y="%s" width="%s" height="%s"%s/>`+"\n", coordinate(r[0]), coordinate(r[1]), coordinate(r[2]), coordinate(r[3]), style)
				continue
			}
			pts := make([]string, len(m.points))
			for i, p := range m.points {
				pts[i] = coordinate(p.x) + "," + coordinate(p.y)
			}
			fmt.Fprintf(&b, `<polygon points="%s"%s/>`+"\n", strings.Join(pts, " "), style)
		case circleMark:
			fmt.Fprintf(&b, `<circle cx="%s" cy="%s" r="%s"%s/>`+"\n", coordinate(m.points[0].x), coordinate(m.points[0].y), coordinate(m.radius), style)
		case textMark:
			if m.bold {
				style += ` font-weight="bold"`
			}
			if m.turned {
				style += fmt.Sprintf(` transform="rotate(-90 %s %s)"`, coordinate(m.points[0].x), coordinate(m.points[0].y))
			}
			fmt.Fprintf(&b, `<text x="%s" y="%s" font-size="%s" text-anchor="%s"%s>%s</text>`+"\n", coordinate(m.points[0].x), coordinate(m.points[0].y), coordinate(m.size), m.anchor, style, html.EscapeString(m.text))
		}
	}
	b.WriteString("</svg>\n")
	return b.Bytes()
}

// box returns x, y, width and height when the polygon is an upright rectangle.
func (m mark) box() ([4]float64, bool) {
	p := m.points
	if len(p) != 4 || p[0].y != p[1].y || p[1].x != p[2].x || p[2].y != p[3].y || p[3].x != p[0].x || p[1].x < p[0].x || p[2].y < p[1].y {
		return [4]float64{}, false
	}
	return [4]float64{p[0].x, p[0].y, p[1].x - p[0].x, p[2].y - p[1].y}, true
}

// DPI is the resolution of the PNG form, enough for print.
const DPI = 220

var fonts = font.NewCache(liberation.Collection())

func (s *sketch) png() ([]byte, error) {
	mm := vg.Millimeter
	c := vgimg.PngCanvas{Canvas: vgimg.NewWith(vgimg.UseWH(vg.Length(s.width)*mm, vg.Length(s.height)*mm), vgimg.UseDPI(DPI), vgimg.UseBackgroundColor(color.White))}
	at := func(p point) vg.Point { return vg.Point{X: vg.Length(p.x) * mm, Y: vg.Length(s.height-p.y) * mm} }
	for _, m := range s.marks {
		c.SetLineDash(nil, 0)
		if m.dashed {
			c.SetLineDash([]vg.Length{1.2 * mm, 0.9 * mm}, 0)
		}
		var path vg.Path
		switch m.kind {
		case textMark:
			weight := stdfont.WeightNormal
			if m.bold {
				weight = stdfont.WeightBold
			}
			face := fonts.Lookup(font.Font{Typeface: "Liberation", Variant: "Sans", Weight: weight}, font.Length(vg.Length(m.size)*mm))
			c.SetColor(parseColour(m.fill))
			p := at(m.points[0])
			c.Push()
			c.Translate(p)
			if m.turned {
				c.Rotate(math.Pi / 2)
			}
			width := face.Width(m.text)
			shift := vg.Length(0)
			switch m.anchor {
			case "middle":
				shift = -width / 2
			case "end":
				shift = -width
			}
			c.FillString(face, vg.Point{X: shift}, m.text)
			c.Pop()
			continue
		case circleMark:
			p := at(m.points[0])
			r := vg.Length(m.radius) * mm
			path.Move(vg.Point{X: p.X + r, Y: p.Y})
			path.Arc(p, r, 0, 2*math.Pi)
			path.Close()
		default:
			path.Move(at(m.points[0]))
			for _, p := range m.points[1:] {
				path.Line(at(p))
			}
			if m.kind == polygonMark {
				path.Close()
			}
		}
		if m.fill != "" && m.kind != lineMark {
			c.SetColor(parseColour(m.fill))
			c.Fill(path)
		}
		if m.stroke != "" && m.weight > 0 {
			c.SetColor(parseColour(m.stroke))
			c.SetLineWidth(vg.Length(m.weight) * mm)
			c.Stroke(path)
		}
	}
	var b bytes.Buffer
	if _, err := c.WriteTo(&b); err != nil {
		return nil, err
	}
	return b.Bytes(), nil
}

// parseColour reads #rrggbb; the drawings use nothing else.
func parseColour(s string) color.Color {
	v, err := strconv.ParseUint(strings.TrimPrefix(s, "#"), 16, 32)
	if err != nil {
		panic("figure: colour " + s)
	}
	return color.RGBA{uint8(v >> 16), uint8(v >> 8), uint8(v), 255}
}

// mm writes a length in m as mm with the given decimals and decimal mark.
func mm(x float64, decimals int, comma bool) string {
	t := strconv.FormatFloat(x*1e3, 'f', decimals, 64)
	if comma {
		t = strings.Replace(t, ".", ",", 1)
	}
	return t
}
