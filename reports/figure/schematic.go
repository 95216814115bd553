package figure

import (
	"fmt"
	"math"
	"strings"

	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
)

// Schematic draws the windings with their dots, pins and turns: the first
// winding at the left, all others at the right, screens between them.
func Schematic(title string, c part.Construction) (Picture, error) {
	if len(c.Windings) == 0 {
		return Picture{}, fmt.Errorf("figure: a schematic without windings")
	}
	const (
		top   = 14.0
		turn  = 5.2  // mm, one loop
		apart = 10.0 // mm, between two windings
	)
	loops := func(w part.Winding) int {
		// The number of loops only hints at the number of turns; the figure
		// beside them says it.
		return max(3, min(7, 3+w.Turns/8))
	}
	height := func(list []part.Winding) float64 {
		h := 0.0
		for i, w := range list {
			if i > 0 && !sharesPin(list[i-1], w) {
				h += apart
			}
			h += float64(loops(w)) * turn
		}
		return h
	}
	lefts, rights := c.Windings[:1], c.Windings[1:]
	h := math.Max(height(lefts), math.Max(height(rights), 30))
	s := &sketch{width: 124, height: top + h + 8}
	s.text(4, 5.6, 4, "start", "%s", title).bold = true
	s.text(4, 9.8, 2.8, "start", "dot = start of the winding")
	xl, xr := 52.0, 76.0
	if len(rights) == 0 {
		xr = 60
	}
	// Core.
	for _, x := range []float64{(xl+xr)/2 - 1.1, (xl+xr)/2 + 1.1} {
		if len(rights) > 0 {
			s.line("core", x, top, x, top+h, 0.5, faintColour)
		} else {
			s.line("core", x+4, top, x+4, top+h, 0.5, faintColour)
		}
	}
	for _, e := range c.Build {
		if e.Kind == winding.Screen {
			x := (xl+xr)/2 - 4.6
			m := s.line("screen", x, top+2, x, top+h-2, 0.5, screenColour)
			m.dashed = true
			s.text(x, top+h+3.4, 2.4, "middle", "screen to %s", strings.TrimPrefix(e.To, "pin "))
		}
	}
	drawWinding(s, lefts[0], xl, top+(h-height(lefts))/2, loops(lefts[0]), turn, true, false)
	y := top + (h-height(rights))/2
	for i, w := range rights {
		if i > 0 && !sharesPin(rights[i-1], w) {
			y += apart
		}
		y = drawWinding(s, w, xr, y, loops(w), turn, false, i+1 < len(rights) && sharesPin(w, rights[i+1]))
	}
	return s.picture("schematic", title+": schematic with dots and pins")
}

// sharesPin reports whether b starts where a ends, as at a center tap.
func sharesPin(a, b part.Winding) bool {
	if len(a.Finish) == 0 || len(a.Finish) != len(b.Start) {
		return false
	}
	for i := range a.Finish {
		if a.Finish[i] != b.Start[i] {
			return false
		}
	}
	return true
}

// drawWinding draws one winding from y downwards and returns where it ends. A
// winding that shares a pin with its neighbour begins where that one ended; the
// shared pin is drawn once, by the second.
func drawWinding(s *sketch, w part.Winding, x, y float64, loops int, turn float64, left, sharedFinish bool) float64 {
	side, anchor := 1.0, "start"
	if left {
		side, anchor = -1, "end"
	}
	colour := roleColour(roleOf(w.Name))
	end := y + float64(loops)*turn
	// Loops bulge towards the core.
	for i := range loops {
		cy := y + (float64(i)+0.5)*turn
		var pts []point
		const n = 14
		for j := 0; j <= n; j++ {
			a := -math.Pi/2 + math.Pi*float64(j)/n
			pts = append(pts, point{x - side*math.Cos(a)*turn*0.55, cy + math.Sin(a)*turn/2})
		}
		for j := 1; j < len(pts); j++ {
			s.line("coil", pts[j-1].x, pts[j-1].y, pts[j].x, pts[j].y, 0.6, colour)
		}
	}
	pinX := x + side*13
	s.line("lead", x, y, pinX, y, 0.4, inkColour)
	s.circle("dot", x+side*2.6, y+2.4, 0.95, inkColour, "", 0).data = []string{"winding", w.Name}
	terminal(s, w.Start, pinX, y, side, anchor)
	if !sharedFinish {
		s.line("lead", x, end, pinX, end, 0.4, inkColour)
		terminal(s, w.Finish, pinX, end, side, anchor)
	}
	mid := (y + end) / 2
	s.text(x+side*5, mid+0.4, 3.6, anchor, "%s", w.Name).bold = true
	s.text(x+side*5, mid+4.4, 3.1, anchor, "%d turns", w.Turns)
	if len(w.Parts) > 1 {
		text := strings.Join(w.Parts, " + ") + " in series"
		if w.JoinedAt != "" {
			text += ", joint " + part.TerminalText([]string{w.JoinedAt})
		}
		s.text(x+side*5, mid+8, 2.6, anchor, "%s", text)
	}
	return end
}

// terminal draws the pin of a winding's end with its number.
func terminal(s *sketch, pins []string, x, y, side float64, anchor string) {
	s.circle("pin", x, y, 0.9, paperColour, inkColour, 0.35).data = []string{"pins", strings.Join(pins, ",")}
	label := part.TerminalText(pins)
	s.text(x+side*2, y+1.1, 3.1, anchor, "%s", label).bold = true
}
