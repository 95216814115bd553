package figure

import (
	"fmt"
	"math"
	"sort"
	"strconv"

	"gapwright/corelib/wire"
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
)

// Coil is what the half section of a window shows. Lengths are in m. x runs
// from the face of the post outward, y along the breadth from the first flange,
// as in package winding.
type Coil struct {
	Title         string
	Breadth       float64 // between the outer flanges
	Room          float64 // of one chamber
	Height        float64 // room for the winding, over the former's wall
	Wall          float64 // former, from the face of the post to the first wire
	WindowBreadth float64 // of the core
	WindowDepth   float64 // of the core, from the post to the outer leg; 0: Wall + Height
	Post          float64 // half the width of the post
	Yoke          float64
	Chambers      int
	ChamberWall   float64
	Layers        []CoilLayer
	Insulation    []CoilRect
	PostGaps      []CoilGap // centers from the lower yoke
	AllLegs       float64   // film under all legs at the middle; 0: none
	Clear         float64   // distance that copper should keep from a gap
	HeightLeft    float64
	Comma         bool
}

// CoilLayer is one numbered layer of turns.
type CoilLayer struct {
	winding.Rect
	Number   string // as in the winding table
	Label    string
	Role     string // primary, secondary, other: the second half of a center tap
	Roles    []string
	Wires    int // side by side
	Diameter float64
	Foil     bool
}

// CoilRect is an area without turns.
type CoilRect struct {
	winding.Rect
	Kind  string // tape, margin, screen, space
	Label string
}

// CoilGap is one gap piece in the post.
type CoilGap struct{ Center, Length float64 }

// NewCoil gathers the half section of a part from its construction and rating.
// The layer numbers are those of the winding table: the entry's position among
// the windings, and the layer within it.
func NewCoil(title string, c part.Construction, r part.Rating, w winding.Window, comma bool) Coil {
	coil := Coil{
		Title: title, Breadth: w.Whole(), Room: w.Breadth, Height: w.Height, Wall: w.Wall, Chambers: max(w.Chambers, 1), ChamberWall: w.ChamberWall,
		WindowBreadth: r.Shape.WindowBreadth(), WindowDepth: r.Shape.WindowDepth(), Post: r.Shape.PostWidth() / 2,
		Yoke: r.Shape.B.Mean() - r.Shape.D.Mean(), Clear: r.Gap.ClearDistance, HeightLeft: r.Section.HeightLeft, Comma: comma,
	}
	if coil.WindowBreadth < coil.Breadth {
		coil.WindowBreadth = coil.Breadth
	}
	if coil.WindowDepth < coil.Wall+coil.Height {
		coil.WindowDepth = coil.Wall + coil.Height
	}
	if coil.Post <= 0 {
		coil.Post = coil.WindowDepth / 2
	}
	if coil.Yoke <= 0 {
		coil.Yoke = coil.Post
	}
	numbers := WindingNumbers(c.Build)
	count := map[int]int{}
	for _, l := range r.Section.Layers {
		if l.Entry >= len(c.Build) {
			continue
		}
		e := c.Build[l.Entry]
		count[l.Entry]++
		layer := CoilLayer{Rect: l.Rect, Number: numbers[l.Entry], Wires: l.Wires(), Diameter: l.Wire.OuterDiameter(), Foil: l.Wire.Kind == wire.Foil}
		if e.Layers > 1 || layer.Foil {
			layer.Number += "." + strconv.Itoa(count[l.Entry])
		}
		for _, of := range l.Of {
			layer.Roles = append(layer.Roles, roleOf(of))
		}
		layer.Role = layer.Roles[0]
		layer.Label = fmt.Sprintf("%s  %d turns, %s", joined(e.Names), l.Turns, shortWire(l.Wire, comma))
		if layer.Foil {
			layer.Label = joined(l.Of)
		}
		coil.Layers = append(coil.Layers, layer)
	}
	for _, in := range r.Section.Insulation {
		if in.Entry >= len(c.Build) {
			continue
		}
		e := c.Build[in.Entry]
		rect := CoilRect{Rect: in.Rect, Kind: string(e.Kind)}
		switch e.Kind {
		case winding.Tape:
			rect.Label = fmt.Sprintf("%s, %d x %s", e.Purpose, e.TapeLayers, mm(e.Thickness, 3, comma))
		case winding.Screen:
			rect.Label = "screen to " + e.To
		default:
			rect.Label = "space " + mm(e.Height, 2, comma)
		}
		coil.Insulation = append(coil.Insulation, rect)
	}
	// Margin tape stands beside the layers of an entry, up to their height.
	for i, e := range c.Build {
		if e.Kind != winding.Wind || (e.Margins[0] == 0 && e.Margins[1] == 0) {
			continue
		}
		box, ok := entryBox(r.Section, i)
		if !ok {
			continue
		}
		y0, y1 := 0.0, w.Whole()
		if e.Chamber > 0 && coil.Chambers > 1 {
			y0 = float64(e.Chamber-1) * (w.Breadth + w.ChamberWall)
			y1 = y0 + w.Breadth
		}
		if e.Margins[0] > 0 {
			coil.Insulation = append(coil.Insulation, CoilRect{Rect: winding.Rect{X0: box.X0, X1: box.X1, Y0: y0, Y1: y0 + e.Margins[0]}, Kind: "margin", Label: "margin " + mm(e.Margins[0], 1, comma)})
		}
		if e.Margins[1] > 0 {
			coil.Insulation = append(coil.Insulation, CoilRect{Rect: winding.Rect{X0: box.X0, X1: box.X1, Y0: y1 - e.Margins[1], Y1: y1}, Kind: "margin", Label: "margin " + mm(e.Margins[1], 1, comma)})
		}
	}
	g := c.Core.Gap
	switch g.Kind {
	case part.Ground:
		for _, center := range GapCenters(g, coil.WindowBreadth) {
			coil.PostGaps = append(coil.PostGaps, CoilGap{center, g.Total / float64(max(g.Pieces, 1))})
		}
	case part.Spacer:
		coil.AllLegs = g.Thickness
		coil.PostGaps = []CoilGap{{coil.WindowBreadth / 2, g.Thickness}}
	}
	return coil
}

// GapCenters returns the centers of the pieces of a ground gap along a window
// of the given breadth, from the lower yoke.
func GapCenters(g part.Gap, breadth float64) []float64 {
	n := max(g.Pieces, 1)
	if len(g.Positions) == n {
		return g.Positions
	}
	out := make([]float64, n)
	for i := range out {
		out[i] = (float64(i) + 0.5) / float64(n) * breadth
	}
	return out
}

// WindingNumbers numbers the entries of an order of work that carry turns, as
// the winding table does; other entries get an empty text.
func WindingNumbers(build []winding.Entry) []string {
	out := make([]string, len(build))
	n := 0
	for i, e := range build {
		if e.Kind == winding.Wind {
			n++
			out[i] = strconv.Itoa(n)
		}
	}
	return out
}

// shortWire is the wire in a few characters.
func shortWire(w wire.Wire, comma bool) string {
	if w.Kind == wire.Litz {
		return fmt.Sprintf("%d x %s litz", w.Strands, mm(w.Diameter, 3, comma))
	}
	return mm(w.Diameter, 3, comma)
}

func entryBox(s winding.Section, entry int) (winding.Rect, bool) {
	var box winding.Rect
	found := false
	for _, l := range s.Layers {
		if l.Entry != entry {
			continue
		}
		if !found {
			box, found = l.Rect, true
			continue
		}
		box.X0, box.X1 = math.Min(box.X0, l.X0), math.Max(box.X1, l.X1)
	}
	return box, found
}

func roleOf(name string) string {
	switch {
	case name == "S-B":
		return "other"
	case len(name) > 0 && name[0] == 'S':
		return "secondary"
	}
	return "primary"
}

func roleColour(role string) string {
	switch role {
	case "secondary":
		return secondaryColour
	case "other":
		return otherHalfColour
	}
	return primaryColour
}

func joined(names []string) string {
	t := ""
	for i, n := range names {
		if i > 0 {
			t += "+"
		}
		t += n
	}
	return t
}

// Picture draws the half section to scale: post at the bottom, breadth across.
// Layers carry the numbers of the winding table; the dimensions at the left are
// the height of the window and what is left of it.
func (c Coil) Picture() (Picture, error) {
	const (
		left, right = 38.0, 72.0 // mm, for dimensions and labels
		top         = 13.0
		bottom      = 12.0
	)
	if !(c.WindowBreadth > 0) || !(c.WindowDepth > 0) {
		return Picture{}, fmt.Errorf("figure: a window of %g by %g m cannot be drawn", c.WindowBreadth, c.WindowDepth)
	}
	postShown := math.Min(c.Post, c.WindowDepth*0.45)
	legShown := math.Min(c.Yoke, c.WindowDepth*0.3)
	yokeShown := math.Min(c.Yoke, c.WindowBreadth*0.12)
	// The scale is a round number that fills about 185 x 92 mm.
	scale := math.Min(184/((c.WindowBreadth+2*yokeShown)*1e3), 92/((c.WindowDepth+postShown+legShown)*1e3))
	scale = roundScale(scale)
	k := scale * 1e3 // mm on paper per m
	w := (c.WindowBreadth + 2*yokeShown) * k
	h := (c.WindowDepth + postShown + legShown) * k
	s := &sketch{width: left + w + right, height: top + h + bottom}
	// Positions on paper. Window coordinates: x up from the post, y to the right
	// from the first flange.
	ox := left + yokeShown*k               // inner face of the left yoke
	oy := top + (legShown+c.WindowDepth)*k // face of the post
	flange := (c.WindowBreadth - c.Breadth) / 2
	px := func(y float64) float64 { return ox + (flange+y)*k }
	py := func(x float64) float64 { return oy - x*k }

	s.text(left, 5.6, 4, "start", "%s", c.Title).bold = true
	s.text(left, 9.8, 2.8, "start", "half section, drawn %s : 1, post at the bottom, innermost layer lowest; left edge = lower flange", trim(scale))

	// Core.
	s.rect("core", left, top, w, legShown*k, ferriteColour, "", 0).data = []string{"part", "outer leg"}
	s.rect("core", left, top+legShown*k, yokeShown*k, c.WindowDepth*k, ferriteColour, "", 0).data = []string{"part", "yoke"}
	s.rect("core", ox+c.WindowBreadth*k, top+legShown*k, yokeShown*k, c.WindowDepth*k, ferriteColour, "", 0).data = []string{"part", "yoke"}
	s.rect("core", left, oy, w, postShown*k, ferriteColour, "", 0).data = []string{"part", "post"}
	win := s.rect("window", ox, top+legShown*k, c.WindowBreadth*k, c.WindowDepth*k, paperColour, inkColour, 0.2)
	win.data = []string{"scale", trim(scale), "breadth-mm", trim6(c.WindowBreadth * 1e3), "depth-mm", trim6(c.WindowDepth * 1e3)}
	s.text(left+3, top+legShown*k/2+1, 2.6, "start", "outer leg")
	s.text(left+3, oy+postShown*k-1.6, 2.6, "start", "post")

	// Former: wall on the post, flanges, chamber wall.
	wallTop := c.Wall
	if wallTop > 0 {
		s.rect("former", ox+0.25*flange*k, py(wallTop), (c.WindowBreadth-0.5*flange)*k, wallTop*k*0.92, plasticColour, faintColour, 0.15)
	}
	if flange > 0 {
		for _, x := range []float64{ox + 0.25*flange*k, px(c.Breadth)} {
			s.rect("former", x, py(c.Wall+c.Height), 0.75*flange*k, (c.Height+c.Wall*0.08)*k, plasticColour, faintColour, 0.15)
		}
	}
	if c.Chambers > 1 && c.ChamberWall > 0 {
		for i := 1; i < c.Chambers; i++ {
			y := float64(i)*c.Room + float64(i-1)*c.ChamberWall
			s.rect("former", px(y), py(c.Wall+c.Height), c.ChamberWall*k, c.Height*k, plasticColour, faintColour, 0.15)
		}
	}

	// Insulation under the copper.
	for _, in := range c.Insulation {
		if in.X1 <= in.X0 {
			continue
		}
		colour := tapeColour
		switch in.Kind {
		case "margin":
			colour = marginColour
		case "screen":
			colour = screenColour
		case "space":
			colour = "#f3f3f3"
		}
		m := s.rect("insulation", px(in.Y0), py(in.X1), (in.Y1-in.Y0)*k, (in.X1-in.X0)*k, colour, "", 0)
		m.data = []string{"kind", in.Kind}
		if in.Kind == "margin" {
			hatch(s, px(in.Y0), py(in.X1), (in.Y1-in.Y0)*k, (in.X1-in.X0)*k)
		}
	}
	var notes []sideNote
	for _, l := range c.Layers {
		x, y, lw, lh := px(l.Y0), py(l.X1), (l.Y1-l.Y0)*k, (l.X1-l.X0)*k
		if l.Foil {
			s.rect("layer", x, y, lw, lh, roleColour(l.Role), paperColour, 0.1).data = []string{"number", l.Number}
		} else {
			s.rect("layer", x, y, lw, lh, "#ffffff", roleColour(l.Role), 0.12).data = []string{"number", l.Number}
			d := l.Diameter * k
			if l.Wires > 0 && d > 0 {
				// Wires spread over the room, the last place left for the crossing.
				pitch := lw / float64(l.Wires+1)
				for i := range l.Wires {
					role := l.Role
					if len(l.Roles) > 1 {
						role = l.Roles[i%len(l.Roles)]
					}
					s.circle("wire", x+(float64(i)+1)*pitch, y+lh/2, math.Min(d, lh)/2*0.94, roleColour(role), paperColour, 0.08)
				}
			}
		}
		notes = append(notes, sideNote{at: point{x + lw, y + lh/2}, text: l.Number, rest: l.Label, colour: roleColour(l.Role)})
	}
	for _, in := range c.Insulation {
		if in.Kind == "margin" {
			continue
		}
		notes = append(notes, sideNote{at: point{px(in.Y1), py((in.X0 + in.X1) / 2)}, rest: in.Label, colour: faintColour})
	}
	// Gap and the distance to keep clear of it.
	for _, g := range c.PostGaps {
		x := ox + g.Center*k
		gw := math.Max(g.Length*k, 0.25)
		s.rect("gap", x-gw/2, oy, gw, postShown*k, paperColour, inkColour, 0.15).data = []string{"length-mm", trim6(g.Length * 1e3)}
		if c.Clear > 0 {
			r := c.Clear * k
			m := s.polygon("clear", "", inkColour, 0.2, arc(x, oy, gw/2, r)...)
			m.dashed = true
			m.data = []string{"distance-mm", trim6(c.Clear * 1e3)}
		}
	}
	if c.AllLegs > 0 {
		x := ox + c.WindowBreadth/2*k
		gw := math.Max(c.AllLegs*k, 0.25)
		s.rect("gap", x-gw/2, top, gw, legShown*k, paperColour, inkColour, 0.15).data = []string{"length-mm", trim6(c.AllLegs * 1e3)}
	}
	if len(c.PostGaps) > 0 {
		g := c.PostGaps[0]
		label := "gap " + mm(g.Length, 2, c.Comma)
		if len(c.PostGaps) > 1 {
			label = fmt.Sprintf("%d x gap %s", len(c.PostGaps), mm(g.Length, 2, c.Comma))
		}
		if c.AllLegs > 0 {
			label = "film " + mm(c.AllLegs, 3, c.Comma) + " under all legs"
		}
		if c.Clear > 0 {
			label += ", keep copper " + mm(c.Clear, 2, c.Comma) + " clear (dashed)"
		}
		s.text(ox+g.Center*k, s.height-7.4, 2.8, "middle", "%s", label)
		s.line("leader", ox+g.Center*k, s.height-10.2, ox+g.Center*k, oy+postShown*k, 0.15, inkColour)
	}

	// Dimensions.
	dx := left - 6
	s.line("extension", dx-23, py(c.Wall+c.Height), px(0), py(c.Wall+c.Height), 0.12, faintColour)
	s.line("extension", dx-23, py(c.Wall), px(0), py(c.Wall), 0.12, faintColour)
	used := c.Wall + c.Height - c.HeightLeft
	if c.HeightLeft > 0 && c.HeightLeft < c.Height {
		s.line("extension", dx-2, py(used), px(c.Breadth), py(used), 0.15, inkColour).dashed = true
		s.arrow(dx, py(used), dx, py(c.Wall+c.Height))
		s.text(dx-2.2, (py(used)+py(c.Wall+c.Height))/2+1, 2.8, "end", "left %s", mm(c.HeightLeft, 2, c.Comma)).bold = true
		s.arrow(dx, py(c.Wall), dx, py(used))
		s.text(dx-1.2, (py(c.Wall)+py(used))/2+1, 2.8, "end", "%s", mm(c.Height-c.HeightLeft, 2, c.Comma))
	} else if c.HeightLeft <= 0 {
		s.text(dx-1, py(c.Wall+c.Height)-2, 2.8, "end", "too high by %s", mm(-c.HeightLeft, 2, c.Comma)).bold = true
	}
	s.arrow(dx-23, py(c.Wall), dx-23, py(c.Wall+c.Height))
	m := s.text(dx-24.2, (py(c.Wall)+py(c.Wall+c.Height))/2, 2.8, "middle", "window %s", mm(c.Height, 2, c.Comma))
	m.turned = true
	if c.Wall > 0 {
		s.text(dx-1.2, py(c.Wall/2)+1, 2.4, "end", "wall %s", mm(c.Wall, 2, c.Comma))
	}
	by := s.height - 3.2
	s.arrow(px(0), by, px(c.Breadth), by)
	s.line("extension", px(0), oy, px(0), by+1, 0.1, faintColour)
	s.line("extension", px(c.Breadth), oy, px(c.Breadth), by+1, 0.1, faintColour)
	label := "breadth " + mm(c.Breadth, 2, c.Comma)
	if c.Chambers > 1 {
		label += fmt.Sprintf(" (%d chambers of %s)", c.Chambers, mm(c.Room, 2, c.Comma))
	}
	mid := (px(0) + px(c.Breadth)) / 2
	s.rect("", mid-textWidth(label, 2.8)/2-1, by-1.6, textWidth(label, 2.8)+2, 3.2, paperColour, "", 0)
	s.text(mid, by+1, 2.8, "middle", "%s", label)

	placeNotes(s, notes, left+w+4, top-2, top+h, 2.8)
	return s.picture("half-section", c.Title+": half section of the window")
}

// sideNote is a line of text beside the drawing with a leader to its place.
type sideNote struct {
	at         point
	text, rest string
	colour     string
}

// placeNotes sets the notes in one column, in the order of their places, apart
// enough to be read.
func placeNotes(s *sketch, notes []sideNote, x, top, bottom, size float64) {
	if len(notes) == 0 {
		return
	}
	sort.SliceStable(notes, func(i, j int) bool {
		if math.Abs(notes[i].at.y-notes[j].at.y) > 1e-6 {
			return notes[i].at.y < notes[j].at.y
		}
		return notes[i].at.x > notes[j].at.x
	})
	pitch := size * 1.32
	if need := pitch * float64(len(notes)); need > bottom-top {
		pitch = (bottom - top) / float64(len(notes))
		size = math.Max(1.7, pitch/1.25)
	}
	ys := make([]float64, len(notes))
	for i, n := range notes {
		ys[i] = n.at.y
		if i > 0 {
			ys[i] = math.Max(ys[i], ys[i-1]+pitch)
		}
	}
	// Push back up what ran over the lower end.
	limit := bottom
	for i := len(ys) - 1; i >= 0; i-- {
		if ys[i] > limit {
			ys[i] = limit
		}
		limit = ys[i] - pitch
	}
	for i, n := range notes {
		s.line("leader", n.at.x, n.at.y, x-5, n.at.y, 0.1, faintColour)
		s.line("leader", x-5, n.at.y, x, ys[i], 0.1, faintColour)
		if n.text != "" {
			s.rect("", x+0.6, ys[i]-size*0.45, size*0.9, size*0.9, n.colour, "", 0)
			m := s.text(x+0.6+size*1.3, ys[i]+size*0.36, size, "start", "%s", n.text)
			m.bold = true
			s.text(x+0.6+size*1.3+math.Max(7, textWidth(n.text, size)+2.2), ys[i]+size*0.36, size, "start", "%s", n.rest)
			continue
		}
		m := s.text(x+0.6, ys[i]+size*0.36, size*0.93, "start", "%s", n.rest)
		m.fill = "#4a5560"
	}
}

// arc returns a path around a gap piece on the face of the post at the distance
// r: flat over the piece, quarter circles at its ends.
func arc(x, y, half, r float64) []point {
	var out []point
	const n = 12
	for i := 0; i <= n; i++ {
		a := math.Pi/2 + math.Pi/2*(1-float64(i)/n)
		out = append(out, point{x - half + r*math.Cos(a), y - r*math.Sin(a)})
	}
	for i := 0; i <= n; i++ {
		a := math.Pi / 2 * (1 - float64(i)/n)
		out = append(out, point{x + half + r*math.Cos(a), y - r*math.Sin(a)})
	}
	return out
}

// hatch draws slanted lines over a rectangle.
func hatch(s *sketch, x, y, w, h float64) {
	const step = 1.3
	for d := step / 2; d < w+h; d += step {
		x1, y1 := x+math.Min(d, w), y+math.Max(0, d-w)
		x2, y2 := x+math.Max(0, d-h), y+math.Min(d, h)
		s.line("hatch", x1, y1, x2, y2, 0.1, "#8d7a34")
	}
}

// roundScale lowers a scale to a round one.
func roundScale(x float64) float64 {
	best := 0.1
	for _, v := range []float64{0.2, 0.5, 1, 1.5, 2, 2.5, 3, 4, 5, 6, 7, 8, 10, 12, 15, 20} {
		if v <= x {
			best = v
		}
	}
	return best
}

func trim(x float64) string  { return strconv.FormatFloat(x, 'g', 4, 64) }
func trim6(x float64) string { return strconv.FormatFloat(x, 'g', 6, 64) }
