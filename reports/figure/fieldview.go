package figure

import (
	"bytes"
	"encoding/base64"
	"fmt"
	"html"
	"image"
	"image/color"
	"image/png"
	"math"
	"strconv"

	"gapwright/magnetics/part"
)

// FieldTop returns a round upper end, A/m, for the colours of several maps of
// the same window: the field in the copper sets it, because right beside a gap
// it grows without bound.
func FieldTop(maps []part.FieldMap) float64 {
	top := 0.0
	for _, m := range maps {
		h := m.InCopper
		if h == 0 {
			h = m.Peak
		}
		top = math.Max(top, h)
	}
	return oneTwoFive(top)
}

// fieldStops are the colours of the map from no field to the top: lightness
// falls all the way, so that it reads without hue and in grey print.
var fieldStops = []color.RGBA{
	{0xf7, 0xf6, 0xf0, 255}, {0xd9, 0xe7, 0xdc, 255}, {0xa3, 0xcf, 0xc8, 255}, {0x63, 0xab, 0xb9, 255},
	{0x3b, 0x7f, 0xa8, 255}, {0x36, 0x51, 0x8c, 255}, {0x31, 0x2a, 0x63, 255}, {0x1d, 0x10, 0x33, 255},
}

func fieldColour(x float64) color.RGBA {
	x = math.Min(math.Max(x, 0), 1) * float64(len(fieldStops)-1)
	i := min(int(x), len(fieldStops)-2)
	f := x - float64(i)
	mix := func(a, b uint8) uint8 { return uint8(math.Round(float64(a) + f*(float64(b)-float64(a)))) }
	a, b := fieldStops[i], fieldStops[i+1]
	return color.RGBA{mix(a.R, b.R), mix(a.G, b.G), mix(a.B, b.B), 255}
}

// fieldRaster is the map as a picture: breadth to the right, the post below.
func fieldRaster(m part.FieldMap, top float64) ([]byte, error) {
	palette := make(color.Palette, 128)
	for i := range palette {
		palette[i] = fieldColour(float64(i) / float64(len(palette)-1))
	}
	img := image.NewPaletted(image.Rect(0, 0, m.NY, m.NX), palette)
	for i := range m.NX {
		for j := range m.NY {
			x := math.Min(m.At(i, j)/top, 1)
			img.SetColorIndex(j, m.NX-1-i, uint8(math.Round(x*float64(len(palette)-1))))
		}
	}
	var b bytes.Buffer
	if err := (&png.Encoder{CompressionLevel: png.BestCompression}).Encode(&b, img); err != nil {
		return nil, err
	}
	return b.Bytes(), nil
}

// FieldView draws the half section of a window to scale with the strength of
// the field behind the layers: post at the bottom, breadth across, the same
// numbers as the winding table. top is the field of the darkest colour, A/m.
func FieldView(c Coil, m part.FieldMap, top float64) ([]byte, error) {
	if !(c.WindowBreadth > 0) || !(c.WindowDepth > 0) || !(top > 0) || m.NX*m.NY == 0 {
		return nil, fmt.Errorf("figure: no field map for a window of %g by %g m up to %g A/m", c.WindowBreadth, c.WindowDepth, top)
	}
	raster, err := fieldRaster(m, top)
	if err != nil {
		return nil, fmt.Errorf("figure: field map: %w", err)
	}
	const (
		width = 110.0
		edge  = 2.0
		most  = 92.0 // mm high, a tall window
		above = 1.5
	)
	postShown := math.Min(c.Post, 0.3*c.WindowDepth)
	legShown := math.Min(c.Yoke, 0.16*c.WindowDepth)
	yokeShown := math.Min(c.Yoke, 0.06*c.WindowBreadth)
	depth := math.Max(c.WindowDepth, m.Depth)
	k := math.Min((width-2*edge)/(c.WindowBreadth+2*yokeShown), most/(depth+postShown+legShown))
	w, h := (c.WindowBreadth+2*yokeShown)*k, (depth+postShown+legShown)*k
	left := (width - w) / 2
	ox, oy := left+yokeShown*k, above+(legShown+depth)*k
	flange := (c.WindowBreadth - c.Breadth) / 2
	px := func(y float64) float64 { return ox + (flange+y)*k }
	py := func(x float64) float64 { return oy - x*k }

	under := &sketch{width: width}
	under.rect("core", left, above, w, h, ferriteColour, "", 0)
	under.text(left+1.5, oy+postShown*k/2+1, chartSmall, "start", "post")
	under.text(left+1.5, above+legShown*k/2+0.9, chartSmall, "start", "outer leg")

	over := &sketch{width: width}
	over.rect("window", ox, oy-depth*k, c.WindowBreadth*k, depth*k, "", inkColour, 0.2).data = []string{"mm-per-m", trim6(k)}
	// Former: where the first wire lies.
	if c.Wall > 0 {
		for _, x := range []float64{c.Wall, c.Wall + c.Height} {
			over.line("former", px(0), py(x), px(c.Breadth), py(x), 0.15, quietInk).dashed = true
		}
	}
	for _, in := range c.Insulation {
		if in.X1 > in.X0 && (in.Kind == "margin" || in.Kind == "screen") {
			over.rect("insulation", px(in.Y0), py(in.X1), (in.Y1-in.Y0)*k, (in.X1-in.X0)*k, "", tapeColour, 0.2).data = []string{"kind", in.Kind}
		}
	}
	for _, l := range c.Layers {
		x, y, lw, lh := px(l.Y0), py(l.X1), (l.Y1-l.Y0)*k, (l.X1-l.X0)*k
		if l.Foil {
			over.rect("layer", x, y, lw, lh, "", roleColour(l.Role), 0.3).data = []string{"number", l.Number}
			continue
		}
		if d := l.Diameter * k; l.Wires > 0 && d > 0 {
			pitch := lw / float64(l.Wires+1)
			for i := range l.Wires {
				role := l.Role
				if len(l.Roles) > 1 {
					role = l.Roles[i%len(l.Roles)]
				}
				over.circle("wire", x+(float64(i)+1)*pitch, y+lh/2, math.Min(d, lh)/2*0.94, "", roleColour(role), 0.28)
			}
		}
		m := over.rect("layer", x, y, lw, lh, "", roleColour(l.Role), 0.12)
		m.data = []string{"number", l.Number}
		size := math.Min(math.Max(lh*0.62, 1.8), chartSmall)
		tw := textWidth(l.Number, size) + 1.2
		over.rect("tag", x+0.25, y+lh/2-size*0.55, tw, size*1.1, paperColour, "", 0)
		t := over.text(x+0.25+tw/2, y+lh/2+size*0.36, size, "middle", "%s", l.Number)
		t.bold, t.fill = true, nameInk(roleColour(l.Role))
	}
	for _, g := range c.PostGaps {
		x := ox + g.Center*k
		gw := math.Max(g.Length*k, 0.3)
		over.rect("gap", x-gw/2, oy, gw, postShown*k, paperColour, inkColour, 0.12).data = []string{"length-mm", trim6(g.Length * 1e3)}
	}
	if c.AllLegs > 0 {
		x := ox + c.WindowBreadth/2*k
		gw := math.Max(c.AllLegs*k, 0.3)
		over.rect("gap", x-gw/2, above, gw, legShown*k, paperColour, inkColour, 0.12)
	}
	bottom := above + h
	// Scale bar, then the colours.
	bar := roundScaleBar(c.WindowBreadth / 4)
	over.line("scale", left, bottom+4.2, left+bar*k, bottom+4.2, 0.5, inkColour)
	over.text(left+bar*k+1.5, bottom+5.1, chartSmall, "start", "%s mm", trim6(bar*1e3))
	const steps, keyWidth = 32, 40.0
	keyLeft := width - edge - keyWidth - 10
	over.text(keyLeft-1.5, bottom+5.1, chartSmall, "end", "|H| rms, kA/m:  0")
	for i := range steps {
		f := fieldColour((float64(i) + 0.5) / steps)
		over.rect("key", keyLeft+float64(i)*keyWidth/steps, bottom+2.7, keyWidth/steps+0.05, 3, fmt.Sprintf("#%02x%02x%02x", f.R, f.G, f.B), "", 0)
	}
	over.text(keyLeft+keyWidth+1, bottom+5.1, chartSmall, "start", "≥ %s", trim6(top/1e3))
	height := bottom + 7.5
	under.height, over.height = height, height

	title := fmt.Sprintf("%s: half section to scale with the field at %s Hz, corner %s; largest in the copper %s kA/m rms", c.Title, trim(m.Frequency), m.Corner, trim(m.InCopper/1e3))
	var b bytes.Buffer
	b.Write(bytes.TrimSuffix(under.svg(title), []byte("</svg>\n")))
	fmt.Fprintf(&b, `<image class="field" x="%s" y="%s" width="%s" height="%s" preserveAspectRatio="none" data-corner="%s" href="data:image/png;base64,%s"/>`+"\n",
		coordinate(ox), coordinate(oy-m.Depth*k), coordinate(m.Breadth*k), coordinate(m.Depth*k), html.EscapeString(m.Corner), base64.StdEncoding.EncodeToString(raster))
	b.Write(body(over))
	b.WriteString("</svg>\n")
	return b.Bytes(), nil
}

// roundScaleBar is a length of 1, 2, 5 times a power of ten mm, at most x.
func roundScaleBar(x float64) float64 {
	if v := oneTwoFive(x); v > x*(1+1e-9) {
		s := strconv.FormatFloat(v, 'e', 0, 64)
		if s[0] == '5' {
			return v / 2.5
		}
		return v / 2
	}
	return oneTwoFive(x)
}
