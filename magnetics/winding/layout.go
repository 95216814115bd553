package winding

import (
	"fmt"
	"math"

	"gapwright/corelib/wire"
)

// Window is the room that a coil former leaves for the winding, and the post
// that it surrounds.
type Window struct {
	Breadth       float64 // m, between the flanges of one chamber
	Height        float64 // m, available across the window
	Wall          float64 // m, from the face of the post to the first wire
	PostPerimeter float64 // m, around the bare post; a turn at depth x is PostPerimeter + 2 pi x long
	Chambers      int     // 1 or 2 side by side
	ChamberWall   float64 // m, between two chambers
}

// Whole returns the breadth over all chambers and the walls between them, m.
func (w Window) Whole() float64 {
	n := max(w.Chambers, 1)
	return float64(n)*w.Breadth + float64(n-1)*w.ChamberWall
}

// TurnLength returns the length of a turn whose middle lies x from the post, m.
func (w Window) TurnLength(x float64) float64 { return w.PostPerimeter + 2*math.Pi*x }

// Bulge is the relative height that a layer stands taller than its nominal
// diameter, because a bundle does not lie flat. By kind of wire.
type Bulge struct{ Litz, Solid, Foil float64 }

// Of returns the allowance for a wire.
func (b Bulge) Of(w wire.Wire) float64 {
	switch w.Kind {
	case wire.Litz:
		return b.Litz
	case wire.Foil:
		return b.Foil
	}
	return b.Solid
}

// Rect is a rectangle in the window, in m: x across from the post, y along the
// breadth from the first flange.
type Rect struct{ X0, X1, Y0, Y1 float64 }

// A Layer is one layer of turns, or one turn of foil.
type Layer struct {
	Rect
	Entry    int      // index of the entry it belongs to
	Of       []string // electrical windings whose turns lie in it
	Turns    int      // of each of them
	Parallel int      // wires in hand of each
	Wire     wire.Wire
	Length   float64 // m, of one mean turn
	Need     float64 // m, breadth that the turns need, the crossing of the last turn included
	Room     float64 // m, breadth that they have
}

// Wires returns the number of conductors that lie side by side in the layer.
func (l Layer) Wires() int { return l.Turns * l.Parallel * len(l.Of) }

// A Section is a coil laid out in its window.
type Section struct {
	Layers     []Layer
	Insulation []Insulation // tape, margin, screen and space, in the order of work
	Height     float64      // m, used, bulge included, over the former's wall
	HeightLeft float64      // m, negative when it does not fit
	Misfits    []Misfit
}

// Insulation is a rectangle that carries no turns.
type Insulation struct {
	Rect
	Entry int
}

// A Misfit is a layer that does not go into its room.
type Misfit struct {
	Entry       int
	What        string
	Value, Room float64 // m
}

// Layout places every entry. Layers of an entry lie on each other; a layer of k
// wires needs (k + 1) outer diameters of breadth, because the last turn
// crosses (common practice). Layout fails only when an entry makes no sense
// (no turns, no wire, a chamber that the former lacks).
func Layout(w Window, entries []Entry, bulge Bulge) (Section, error) {
	var s Section
	chambers := max(w.Chambers, 1)
	// Height used so far in each chamber.
	used := make([]float64, chambers)
	for i, e := range entries {
		if e.Chamber < 0 || e.Chamber > chambers {
			return Section{}, fmt.Errorf("entry %d: chamber %d of a former with %d", i+1, e.Chamber, chambers)
		}
		y0, y1 := 0.0, w.Whole()
		var base float64
		first, last := 0, chambers
		if e.Chamber > 0 && chambers > 1 {
			first, last = e.Chamber-1, e.Chamber
			y0 = float64(first) * (w.Breadth + w.ChamberWall)
			y1 = y0 + w.Breadth
		}
		for c := first; c < last; c++ {
			base = math.Max(base, used[c])
		}
		h, err := s.place(i, e, w, base, y0, y1, bulge)
		if err != nil {
			return Section{}, fmt.Errorf("entry %d: %w", i+1, err)
		}
		for c := first; c < last; c++ {
			used[c] = base + h
		}
	}
	for _, u := range used {
		s.Height = math.Max(s.Height, u)
	}
	s.HeightLeft = w.Height - s.Height
	return s, nil
}

// place adds entry i above the height base and returns its own height.
func (s *Section) place(i int, e Entry, w Window, base, y0, y1 float64, bulge Bulge) (float64, error) {
	x := w.Wall + base
	insulate := func(height float64) float64 {
		s.Insulation = append(s.Insulation, Insulation{Rect{x, x + height, y0, y1}, i})
		return height
	}
	switch e.Kind {
	case Tape:
		return insulate(float64(e.TapeLayers) * e.Thickness), nil
	case Screen:
		return insulate(e.Thickness), nil
	case Space:
		return insulate(e.Height), nil
	case Wind:
	default:
		return 0, fmt.Errorf("unknown kind %q", e.Kind)
	}
	if e.Turns < 1 || len(e.Of) == 0 {
		return 0, fmt.Errorf("a winding without turns")
	}
	parallel := max(e.Parallel, 1)
	y0 += e.Margins[0]
	y1 -= e.Margins[1]
	layers, perLayer := e.Layers, 0
	foil := e.Wire.Kind == wire.Foil
	if foil {
		layers = e.Turns * parallel * len(e.Of)
	}
	if layers < 1 {
		return 0, fmt.Errorf("%d turns in %d layers", e.Turns, layers)
	}
	perLayer = (e.Turns + layers - 1) / layers
	pitch := (e.Wire.OuterDiameter() + e.Interleaf) * (1 + bulge.Of(e.Wire))
	metal := pitch
	if foil {
		metal = e.Wire.Thickness // the rest of the pitch is insulation and air
	}
	left := e.Turns
	for l := range layers {
		k := min(perLayer, left)
		of := e.Of
		if foil {
			// Each layer of foil is one turn of one winding; windings wound
			// together alternate.
			k = 1
			of = e.Of[l%len(e.Of) : l%len(e.Of)+1]
		} else if k <= 0 {
			return 0, fmt.Errorf("%d turns do not fill %d layers: the last ones would be empty", e.Turns, layers)
		}
		left -= k
		layer := Layer{
			Entry: i, Of: of, Turns: k, Parallel: parallel, Wire: e.Wire,
			Rect: Rect{x + float64(l)*pitch, x + float64(l)*pitch + metal, y0, y1},
			Room: y1 - y0,
		}
		if foil {
			layer.Parallel = 1
			layer.Need = e.Width
			if e.Width > 0 {
				middle := (y0 + y1) / 2
				layer.Y0, layer.Y1 = middle-e.Width/2, middle+e.Width/2
			}
		} else {
			n := k * parallel * len(e.Of)
			layer.Need = float64(n+1) * e.Wire.OuterDiameter()
			if e.Spread == "close" {
				layer.Y1 = math.Min(y1, y0+layer.Need)
			}
		}
		if foil {
			layer.Wire.Width = layer.Y1 - layer.Y0
		}
		layer.Length = w.TurnLength((layer.X0 + layer.X1) / 2)
		if layer.Need > layer.Room*(1+1e-9) {
			s.Misfits = append(s.Misfits, Misfit{i, fmt.Sprintf("layer %d", l+1), layer.Need, layer.Room})
		}
		s.Layers = append(s.Layers, layer)
	}
	return float64(layers) * pitch, nil
}
