package thermal

import (
	"errors"
	"fmt"
	"math"
)

// A Face is a flat part of the surface that sheds heat to the air around it.
type Face struct {
	Name        string
	Area        float64 // m²
	Length      float64 // m: height of a vertical face, 4 A/p of a horizontal one
	Orientation Orientation
	Emissivity  float64 // 0 for a face that sees only things as warm as itself
}

// A Body is a wound part as the heat sees it: a winding and a core, each at one
// temperature, with their free faces and the way between them.
type Body struct {
	Winding, Core []Face
	Between       float64 // W/K from winding to core, through former and gaps
	HotSpot       float64 // K, allowance of the hottest turn over the mean winding temperature
}

// Emissivities and conductivities used by NewBody. All are common practice, not
// measured on a part: ferrite 0.9 to 0.95, tape and varnish 0.8 to 0.95; plastic of a
// former 0.2 to 0.3, wound litz or wire across the turns 0.3 to 1.
const (
	EmissivityFerrite = 0.9
	EmissivityWinding = 0.85

	conductivityFormer  = 0.25  // W/(m K)
	conductivityWinding = 0.6   // W/(m K), across the turns
	conductivityAir     = 0.029 // W/(m K), near 60 °C
	radiationAcross     = 6.5   // W/(m² K), between close parallel faces near 90 °C, 4 eps sigma T³ with 0.8
)

// A Direction is one of the three axes of a part, named from its core.
type Direction int

// The axes: Along the post, Across the outer legs, Depth square to both (the way
// the winding heads stick out).
const (
	Along Direction = iota
	Across
	Depth
)

// An Outline is the plain geometry that NewBody makes a Body of.
type Outline struct {
	Across, Along, Depth  float64   // m, the core set: over the outer legs, along the post, the third
	Up                    Direction // the axis that stands upright on the board
	Round                 bool      // round post and winding
	PostAcross, PostDepth float64   // m; both the diameter of a round post
	Window                float64   // m, from outer leg to outer leg
	Breadth               float64   // m, from yoke to yoke
	Openings              int       // sides on which the winding heads see the air: 2 for E, ETD, PQ, RM; 0 for pot cores
	Clearance             float64   // m, air between post and former
	Wall                  float64   // m, of the former
	WindingHeight         float64   // m, on the former's wall, outer tape included
	HotSpot               float64   // K, see Body
}

// ErrBody means that an outline or a body makes no sense.
var ErrBody = errors.New("not a body")

// NewBody makes the two-node model of a wound part from its outline.
//
// Free faces of the core: the yokes' backs, the outer legs' outsides, and of the two
// sides with openings what the winding does not cover. Free faces of the winding: per
// opening the head's mantle (the arc outside the core for a round winding) and its two
// ends. A winding that does not stick out counts with the flat area seen through the
// opening. A face that looks down sheds by convection alone: the board below it is
// about as warm as itself. Channels between winding and leg count as closed.
//
// From winding to core three ways in parallel: through clearance, former wall and
// half the winding's height to the post; through the flanges to the yokes inside the
// core; across the air to the outer legs by conduction and radiation. Depths and
// conductivities are those of the constants above; a former with worse contact on one
// side is why the result is not better than +-25 %.
func NewBody(o Outline) (Body, error) {
	for _, c := range []struct {
		what  string
		value float64
		zero  bool
	}{
		{"size over the outer legs", o.Across, false}, {"size along the post", o.Along, false}, {"depth", o.Depth, false},
		{"post across", o.PostAcross, false}, {"post depth", o.PostDepth, false}, {"window", o.Window, false}, {"breadth", o.Breadth, false},
		{"clearance", o.Clearance, true}, {"former wall", o.Wall, true}, {"winding height", o.WindingHeight, false}, {"hot-spot allowance", o.HotSpot, true},
	} {
		if !(c.value >= 0) || math.IsInf(c.value, 0) || c.value == 0 && !c.zero {
			return Body{}, fmt.Errorf("%s = %g: %w", c.what, c.value, ErrBody)
		}
	}
	around := o.Clearance + o.Wall + o.WindingHeight
	across, depth := o.PostAcross+2*around, o.PostDepth+2*around
	switch {
	case across > o.Window*(1+1e-9):
		return Body{}, fmt.Errorf("winding of %.3g mm in a window of %.3g mm: %w", across*1e3, o.Window*1e3, ErrBody)
	case o.Window >= o.Across, o.Breadth >= o.Along:
		return Body{}, fmt.Errorf("window %.3g x %.3g mm outside the core of %.3g x %.3g mm: %w", o.Window*1e3, o.Breadth*1e3, o.Across*1e3, o.Along*1e3, ErrBody)
	case o.Openings != 0 && o.Openings != 2:
		return Body{}, fmt.Errorf("%d openings: %w", o.Openings, ErrBody)
	}
	b := Body{HotSpot: o.HotSpot}

	// Free faces. Each comes in a pair that looks both ways along its normal.
	core := func(name string, normal Direction, area, w, h float64, wAxis Direction) {
		b.Core = append(b.Core, o.pair("core "+name, normal, area, w, h, wAxis, EmissivityFerrite)...)
	}
	core("yoke", Along, o.Across*o.Depth, o.Across, o.Depth, Across)
	core("leg", Across, o.Along*o.Depth, o.Along, o.Depth, Along)
	side := o.Across * o.Along
	if o.Openings == 2 {
		side -= across * o.Breadth
	}
	core("side", Depth, side, o.Across, o.Along, Across)

	var mantle, end float64 // per opening: developed width of the mantle, area of one end
	out := max(0, (depth-o.Depth)/2)
	if o.Openings == 2 {
		mantle, end = across+2*out, across*out
		if o.Round {
			r := across / 2
			phi := math.Acos(min(1, o.Depth/(2*r)))
			mantle = max(2*r*phi, across)
			end = r * r * (phi - math.Sin(phi)*math.Cos(phi))
		}
		b.Winding = append(b.Winding, o.pair("winding mantle", Depth, mantle*o.Breadth, across, o.Breadth, Across, EmissivityWinding)...)
		if end > 0 {
			ends := o.pair("winding end", Along, 2*end, across, out, Across, EmissivityWinding) // both heads
			b.Winding = append(b.Winding, ends...)
		}
	}

	// Ways from winding to core.
	inner := o.WindingHeight / 2 / conductivityWinding
	contact := o.Wall/conductivityFormer + o.Clearance/conductivityAir
	perimeter := 2 * (o.PostAcross + o.PostDepth)
	post := o.PostAcross * o.PostDepth
	facing := 2 * min(o.Depth, depth) // width of both legs' insides
	if o.Round {
		perimeter = math.Pi * o.PostAcross
		post = math.Pi / 4 * o.PostAcross * o.PostAcross
	}
	b.Between = perimeter * o.Breadth / (inner + contact)
	if area := across*min(o.Depth, depth) - post; area > 0 {
		b.Between += 2 * area / (inner + contact)
	}
	gap := (o.Window - across) / 2
	b.Between += facing * o.Breadth / (inner + 1/(conductivityAir/max(gap, 1e-4)+radiationAcross))
	return b, nil
}

// pair returns the two faces with a normal along one axis. w and h are the sides of
// the rectangle that the face is part of, wAxis the axis that w lies along.
func (o Outline) pair(name string, normal Direction, area, w, h float64, wAxis Direction, emissivity float64) []Face {
	if normal == o.Up {
		f := Face{name + ", top", area, 4 * w * h / (2 * (w + h)), Up, emissivity}
		g := f
		g.Name, g.Orientation, g.Emissivity = name+", bottom", Down, 0
		return []Face{f, g}
	}
	height := h
	if wAxis == o.Up {
		height = w
	}
	return []Face{{name + ", both", 2 * area, height, Vertical, emissivity}}
}

// Surface returns the free area in m², faces that look down included.
func (b Body) Surface() float64 {
	var sum float64
	for _, list := range [][]Face{b.Winding, b.Core} {
		for _, f := range list {
			sum += f.Area
		}
	}
	return sum
}

func (b Body) check() error {
	for _, list := range [][]Face{b.Winding, b.Core} {
		for _, f := range list {
			if !(f.Area >= 0) || !(f.Length > 0) || !(f.Emissivity >= 0 && f.Emissivity <= 1) || math.IsInf(f.Area, 0) || math.IsInf(f.Length, 0) {
				return fmt.Errorf("face %q of %g m², length %g m, emissivity %g: %w", f.Name, f.Area, f.Length, f.Emissivity, ErrBody)
			}
		}
	}
	if !(b.Between >= 0) || math.IsInf(b.Between, 0) || !(b.HotSpot >= 0) || math.IsInf(b.HotSpot, 0) {
		return fmt.Errorf("%g W/K between winding and core, hot spot %g K: %w", b.Between, b.HotSpot, ErrBody)
	}
	return nil
}
