package part

import (
	"math"
	"math/cmplx"

	"gapwright/corelib/wire"
	"gapwright/magnetics/acloss"
	"gapwright/magnetics/field"
)

// Thick solid wires shield each other as a group, which the loss of a single
// wire in the field of its layer does not know. In the final rating they are
// solved together, by multipoles, and the ratio to the single wires corrects
// each layer and harmonic. The search does without: single wires are cautious
// (up to 24 % high at four skin depths per diameter).

const (
	// thinWire is the diameter over skin depth up to which single wires are right
	// within 1 %.
	thinWire = 1.0
	// coupledMost bounds the unknowns: two per wire and order.
	coupledMost = 500
	// harmonicMatters is the part of a layer's eddy loss from which a harmonic is
	// solved; the others take the correction of the next lower one that is.
	harmonicMatters = 0.005
)

// couple corrects the eddy loss of the solid layers of a table. It returns the
// highest order used, 0 when there was nothing to do, and the number of wires
// that were too many.
func (s *Solvers) couple(g *geometry, how Gap, mu float64, modes int, d *Drive, t *lossTable) (orders, tooMany int, err error) {
	rho := wire.Resistivity(t.warm)
	var wires []acloss.Wire
	thick := 0.0
	for i := range g.section.Layers {
		l := &g.section.Layers[i]
		if l.Wire.Kind != wire.Solid {
			continue
		}
		thick = math.Max(thick, l.Wire.Diameter/acloss.SkinDepth(d.Frequency, rho))
		var units []int
		for _, of := range l.Of {
			units = append(units, g.index[of])
		}
		like := acloss.Wire{Diameter: l.Wire.Diameter, Current: 1 / float64(max(l.Parallel, 1)), Group: i, Length: 1}
		wires = acloss.AppendLayer(wires, g.rect(l.Rect), l.Wires(), like, units...)
	}
	if thick <= thinWire {
		return 0, 0, nil
	}
	_, orders = acloss.Choose(2*thick, false)
	for orders > 1 && 2*len(wires)*orders > coupledMost {
		orders--
	}
	if 2*len(wires)*orders > coupledMost {
		return 0, len(wires), nil
	}
	n := len(g.turns)
	p := g.problem(how, mu, modes)
	if p.PostRadius > 0 {
		// The multipoles know no curvature, so the single wires that they are held
		// against must not either: the window is rolled out.
		edge := 2 * math.Pi * p.PostRadius
		p.PostHalfWidth, p.CorePermeance, p.PostRadius = p.PostRadius/2, 2*p.CorePermeance/edge, 0
	}
	// The layers of solid wire as sheets of the wires' own height: what the wires
	// make is theirs, the rest is the background.
	k := 0
	for i := range g.section.Layers {
		l := &g.section.Layers[i]
		for range l.Of {
			if l.Wire.Kind == wire.Solid {
				src := &p.Sources[k]
				mid, half := (src.X0+src.X1)/2, acloss.EquivalentSquare(l.Wire.Diameter)/2
				src.X0, src.X1, src.Wire = mid-half, mid+half, true
			}
			k++
		}
	}
	if err := s.window.Solve(&p); err != nil {
		return 0, 0, err
	}
	var c acloss.Coupled
	if err := c.Prepare(acloss.Enclosure{Breadth: p.Breadth, Depth: p.Depth}, wires, n, orders, s.window.Background); err != nil {
		return 0, 0, err
	}
	form := make([]complex128, len(g.section.Layers)*n*n)
	single := make([][]float64, len(g.section.Layers))
	for i := range g.section.Layers {
		l := &g.section.Layers[i]
		if l.Wire.Kind != wire.Solid {
			continue
		}
		r := g.rect(l.Rect)
		mid := (r.X0 + r.X1) / 2
		thin := field.Rect{X0: mid - (r.X1-r.X0)/50, X1: mid + (r.X1-r.X0)/50, Y0: r.Y0, Y1: r.Y1}
		xx, yy := make([]float64, n*n), make([]float64, n*n)
		s.window.Mean(thin, 1, xx, yy)
		for j, v := range yy {
			xx[j] += v
		}
		single[i] = xx
	}
	// Which harmonics matter for any solid layer.
	matters := make([]bool, t.orders+1)
	for i := range t.layers {
		if single[i] == nil {
			continue
		}
		f := s.factors().of(t.layers[i].w.Diameter, t.frequency, t.warm, t.orders)
		sum := 0.0
		for k := 1; k <= t.orders; k++ {
			sum += f.transverse[k] * t.layers[i].eddy[k]
		}
		for k := 1; k <= t.orders; k++ {
			matters[k] = matters[k] || f.transverse[k]*t.layers[i].eddy[k] > harmonicMatters*sum
		}
	}
	last := make([]float64, len(t.layers))
	for i := range last {
		last[i] = 1
	}
	for k := 1; k <= t.orders; k++ {
		if matters[k] {
			clear(form)
			if err := c.Loss(acloss.SkinDepth(float64(k)*t.frequency, rho), rho, form); err != nil {
				return 0, 0, err
			}
			for i := range t.layers {
				if single[i] == nil {
					continue
				}
				l := &t.layers[i]
				f := s.factors().of(l.w.Diameter, t.frequency, t.warm, t.orders)
				h2, coupled := 0.0, 0.0
				for a := range n {
					for b := range n {
						product := cmplx.Conj(d.Phasors[a][k]) * d.Phasors[b][k]
						h2 += single[i][a*n+b] * real(product)
						coupled += real(form[(i*n+a)*n+b]*product) / 2
					}
				}
				// Per metre of turn: all of the layer's wires, own current taken out.
				own := 0.0
				for j, w := range l.of {
					x := real(d.Phasors[w][k])*real(d.Phasors[w][k]) + imag(d.Phasors[w][k])*imag(d.Phasors[w][k])
					own += l.dc[j] / l.length * rho / wire.Resistivity(wire.ReferenceTemperature) * f.skin[k] * x / 2
				}
				alone := rho * f.transverse[k] * h2 * l.strands
				if alone > 0 {
					last[i] = math.Max(coupled-own, 0) / alone
				}
			}
		}
		for i := range t.layers {
			if single[i] != nil {
				t.layers[i].eddy[k] *= last[i]
			}
		}
	}
	return orders, 0, nil
}

// foilsMost is how many turns of foil are solved together.
const foilsMost = 40

// coupleFoils corrects the foil layers of a table: the current of a foil spreads
// over its breadth as the field normal to it demands, at its ends and wherever a
// gap is near, which a slab in the local field does not know (up to ten times
// low beside a gap). All foils are solved together, in the window and in the
// head. It returns the number of foils solved, and of those that were too many.
func (s *Solvers) coupleFoils(g *geometry, how Gap, mu float64, modes int, d *Drive, t *lossTable) (solved, tooMany int, err error) {
	rho := wire.Resistivity(t.warm)
	n := len(g.turns)
	var inside, head []acloss.Sheet
	for i := range g.section.Layers {
		l := &g.section.Layers[i]
		if l.Wire.Kind != wire.Foil {
			continue
		}
		share := g.shape.FacedShare((l.X0 + l.X1) / 2)
		one := acloss.Sheet{Rect: g.rect(l.Rect), Unit: g.index[l.Of[0]], Current: 1, Group: i}
		one.Length = l.Length * share
		inside = append(inside, one)
		one.Length = l.Length * (1 - share)
		head = append(head, one)
	}
	if len(inside) == 0 {
		return 0, 0, nil
	}
	if len(inside) > foilsMost {
		return 0, len(inside), nil
	}
	p := g.problem(how, mu, modes)
	others := p.Sources[:0:0]
	k := 0
	for i := range g.section.Layers {
		for range g.section.Layers[i].Of {
			if g.section.Layers[i].Wire.Kind != wire.Foil {
				others = append(others, p.Sources[k])
			}
			k++
		}
	}
	p.Sources = others
	var window, heads acloss.Sheets
	if err := window.Prepare(p, inside); err != nil {
		return 0, 0, err
	}
	// A pot core has next to no head.
	hasHead := head[0].Length > 1e-3*inside[0].Length
	if hasHead {
		if err := heads.PrepareHead(p.Breadth, n, others, head); err != nil {
			return 0, 0, err
		}
	}
	slab := func(l *lossLayer, k int) float64 {
		g1, g2 := acloss.Slab(l.w.Thickness / acloss.SkinDepth(float64(k)*t.frequency, rho))
		return rho / (2 * l.w.Thickness) * (g1*l.sum[k] - 4*g2*l.dot[k]) * l.length
	}
	matters := make([]bool, t.orders+1)
	for i := range t.layers {
		if !t.layers[i].foil {
			continue
		}
		sum := 0.0
		for k := 1; k <= t.orders; k++ {
			sum += slab(&t.layers[i], k)
		}
		for k := 1; k <= t.orders; k++ {
			matters[k] = matters[k] || slab(&t.layers[i], k) > harmonicMatters*sum
		}
	}
	form := make([]complex128, len(t.layers)*n*n)
	last := make([]float64, len(t.layers))
	for i := range last {
		last[i] = 1
	}
	for k := 1; k <= t.orders; k++ {
		if matters[k] {
			clear(form)
			delta := acloss.SkinDepth(float64(k)*t.frequency, rho)
			if err := window.Loss(delta, rho, form); err != nil {
				return 0, 0, err
			}
			if hasHead {
				if err := heads.Loss(delta, rho, form); err != nil {
					return 0, 0, err
				}
			}
		}
		for i := range t.layers {
			l := &t.layers[i]
			if !l.foil {
				continue
			}
			if alone := slab(l, k); matters[k] && alone > 0 {
				together := 0.0
				for a := range n {
					for b := range n {
						together += real(form[(i*n+a)*n+b]*cmplx.Conj(d.Phasors[a][k])*d.Phasors[b][k]) / 2
					}
				}
				last[i] = math.Max(together, 0) / alone
			}
			l.sum[k] *= last[i]
			l.dot[k] *= last[i]
		}
	}
	return len(inside), 0, nil
}
