package part

import (
	"math"
	"slices"
	"sort"

	"gapwright/corelib/wire"
	"gapwright/magnetics/winding"
)

// vacuumPermittivity is that of CODATA 2022, in F/m.
const vacuumPermittivity = 8.8541878188e-12

// coilPermittivity is the relative permittivity of what lies between two layers
// of copper, a mixture of polyester tape (3.3), enamel (3.5), serving and air.
// Common practice.
const coilPermittivity = 3.0

// CapacitanceBand is how far a measured capacitance may lie from the estimate,
// relative, each way: the mixture of tape, enamel and air between the layers is
// not known better than 2 to 4, and what the estimate leaves out adds to it.
const CapacitanceBand = 0.5

// Capacitances estimates the capacitance across the first winding and the one
// between the first winding and all others, in F, from the electrostatic
// capacitance of neighbouring layers.
//
// Two layers whose voltage differs by a share v(y) of the winding's own store
// the share mean(v²) of what their static capacitance would at the full voltage:
// 1/3 for a winding of two layers wound back on itself, 1/4 when every layer
// starts at the same side. Layers of round wire count as plates at the distance
//
//	d - 2.3 r + 0.26 p
//
// d between the centers of the layers, r the radius of the copper, p the pitch
// in the layer (Zuhrt, from memory, there with the radius over the enamel; in one
// medium all over it is the copper's that agrees with a solution of the two rows,
// within 4 % for r = 0.25 p to 0.46 p and d > p); foils as the plates they are.
// What lies between
// turns of one layer, from winding to core, and through windings that float, is
// left out: with a single layer the first result is 0, not known. A screen
// counts as part of the first winding.
func Capacitances(c Construction, s winding.Section) (across, between float64) {
	if len(c.Windings) == 0 {
		return 0, 0
	}
	primary := c.Windings[0]
	type sheetOf struct {
		winding.Rect
		layer  *winding.Layer // nil: a screen
		own    bool
		v0, v1 float64 // share of the winding's voltage at the first and second flange
	}
	var list []sheetOf
	// Turns are counted in the order of work, each layer in the sense that its
	// lay gives.
	done, entry, flip := 0.0, -1, false
	for i := range s.Layers {
		l := &s.Layers[i]
		x := sheetOf{Rect: l.Rect, layer: l, own: slices.Contains(l.Of, primary.Name)}
		if x.own && primary.Turns > 0 {
			if l.Entry != entry {
				entry, flip = l.Entry, false
			}
			from := done / float64(primary.Turns)
			done += float64(l.Turns)
			to := done / float64(primary.Turns)
			x.v0, x.v1 = from, to
			if l.Wire.Kind == wire.Foil {
				x.v0, x.v1 = (from+to)/2, (from+to)/2
			} else if flip {
				x.v0, x.v1 = to, from
			}
			if l.Entry < len(c.Build) && c.Build[l.Entry].Lay != "Z" {
				flip = !flip
			}
		}
		list = append(list, x)
	}
	for _, in := range s.Insulation {
		if in.Entry < len(c.Build) && c.Build[in.Entry].Kind == winding.Screen {
			list = append(list, sheetOf{Rect: in.Rect, own: true})
		}
	}
	sort.SliceStable(list, func(i, j int) bool { return list[i].X0 < list[j].X0 })
	half := func(x sheetOf) (center, inset float64) {
		center = (x.X0 + x.X1) / 2
		if x.layer == nil {
			return center, (x.X1 - x.X0) / 2
		}
		if x.layer.Wire.Kind == wire.Foil {
			return center, x.layer.Wire.Thickness / 2
		}
		pitch := (x.Y1 - x.Y0) / float64(max(x.layer.Wires(), 1))
		return center, rowInset(copperRadius(x.layer.Wire), pitch)
	}
	for i := range list {
		a := list[i]
		// The next layer outward that faces it.
		for j := i + 1; j < len(list); j++ {
			b := list[j]
			width := math.Min(a.Y1, b.Y1) - math.Max(a.Y0, b.Y0)
			if width <= 0 {
				continue
			}
			ca, ia := half(a)
			cb, ib := half(b)
			length := 0.0
			for _, x := range []sheetOf{a, b} {
				if x.layer != nil {
					length = math.Max(length, x.layer.Length)
				}
			}
			d := math.Max(cb-ca-ia-ib, leastDistance)
			static := vacuumPermittivity * coilPermittivity * length * width / d
			switch {
			case a.own != b.own:
				between += static
			case a.own && a.layer != nil && b.layer != nil:
				u, w := b.v0-a.v0, b.v1-a.v1
				across += static * (u*u + u*w + w*w) / 3
			}
			break
		}
	}
	return across, between
}

// rowInset is how far the plate that stands for a row of round wires lies from
// their centers toward the other plate, m.
func rowInset(radius, pitch float64) float64 { return 1.15*radius - 0.13*pitch }

// copperRadius is the radius of the copper of a round wire, m; of a bundle the
// one over its outermost strands.
func copperRadius(w wire.Wire) float64 {
	if w.Kind != wire.Litz {
		return w.Diameter / 2
	}
	bundle := w
	bundle.Own, bundle.Serving, bundle.TripleInsulated = nil, wire.NoServing, false
	r := (bundle.OuterDiameter() - (w.StrandOuterDiameter() - w.Diameter)) / 2
	return math.Min(r, w.OuterDiameter()/2) // the user's own row may say less
}

// leastDistance bounds the plates' distance from below, m: twice the enamel of a
// thin strand.
const leastDistance = 20e-6
