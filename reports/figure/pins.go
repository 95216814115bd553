package figure

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"gapwright/magnetics/part"
)

// PinView draws the former seen from its pins: two rows counted clockwise from
// pin 1, with the winding ends that they carry.
func PinView(title string, c part.Construction) (Picture, error) {
	n := c.Former.Pins
	if n < 2 {
		return Picture{}, fmt.Errorf("figure: a former with %d pins", n)
	}
	ends := map[string][]pinEnd{}
	for _, w := range c.Windings {
		for _, p := range w.Start {
			ends[p] = append(ends[p], pinEnd{w.Name, true})
		}
		for _, p := range w.Finish {
			ends[p] = append(ends[p], pinEnd{w.Name, false})
		}
		if w.JoinedAt != "" {
			ends[w.JoinedAt] = append(ends[w.JoinedAt], pinEnd{w.Name + " joint", false})
		}
	}
	perRow := (n + 1) / 2
	const pitch, top, left = 13.0, 30.0, 14.0
	width := left*2 + float64(perRow-1)*pitch
	s := &sketch{width: max(width, 116), height: top + 34 + 24}
	ox := (s.width - float64(perRow-1)*pitch) / 2
	s.text(4, 5.6, 4, "start", "%s", title).bold = true
	s.text(4, 9.8, 2.8, "start", "seen from the pin side, counted clockwise from pin 1 (square); not to scale")
	s.rect("former", ox-9, top-7, float64(perRow-1)*pitch+18, 48, plasticColour, inkColour, 0.25)
	for i := 1; i <= n; i++ {
		x, y, up := ox+float64(i-1)*pitch, top, true
		if i > perRow {
			x, y, up = ox+float64(n-i)*pitch, top+34, false
		}
		name := "pin " + strconv.Itoa(i)
		at := ends[name]
		fill := paperColour
		if len(at) > 0 {
			fill = roleColour(roleOf(at[0].winding))
		}
		if i == 1 {
			s.rect("pin", x-2.1, y-2.1, 4.2, 4.2, fill, inkColour, 0.35).data = []string{"pin", strconv.Itoa(i)}
		} else {
			s.circle("pin", x, y, 2.1, fill, inkColour, 0.35).data = []string{"pin", strconv.Itoa(i)}
		}
		if slices.Contains(c.Former.PinsCut, i) {
			s.line("cut", x-2.6, y-2.6, x+2.6, y+2.6, 0.5, inkColour)
			s.line("cut", x-2.6, y+2.6, x+2.6, y-2.6, 0.5, inkColour)
		}
		inside := y + 6.2
		if !up {
			inside = y - 4
		}
		s.text(x, inside, 3.3, "middle", "%d", i).bold = true
		for j, e := range at {
			yy := y - 8.8 - float64(len(at)-1-j)*3.7
			if !up {
				yy = y + 11.6 + float64(j)*3.7
			}
			text := e.winding
			if !strings.HasSuffix(text, "joint") {
				if e.start {
					text += " s"
				} else {
					text += " f"
				}
			}
			s.text(x, yy, 3.2, "middle", "%s", text)
			if e.start {
				dy := yy - 3.6
				if !up {
					dy = yy + 2.1
				}
				if len(at) == 1 {
					s.circle("dot", x, dy-0.2, 0.75, inkColour, "", 0)
				}
			}
		}
	}
	s.text(s.width/2, s.height-3, 3, "middle", "s = start (dot), f = finish; crossed pins are cut")
	return s.picture("pins", title+": pins")
}

type pinEnd struct {
	winding string
	start   bool
}
