package part

import (
	"fmt"
	"math"

	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/field"
	"gapwright/magnetics/gap"
	"gapwright/magnetics/winding"
)

// A magnetic is a coil in its gapped core: the inductance matrix of its
// windings and the field that each of them drives into every layer.
type magnetic struct {
	windings int
	L        [][]float64 // H, [winding][winding], all turns included
	layers   []layerField
}

// layerField is the field in one layer per ampere in each winding.
type layerField struct {
	h2    []float64   // 1/m2, <H_a H_b> over the conductors, [winding][winding]
	faces []facePoint // foil: the field at both faces, at points along the breadth
}

// facePoint is the tangential field at the inner and the outer face of a foil.
type facePoint struct {
	weight       float64 // m of breadth times the part of the turn (inside or in the head)
	inner, outer []float64
}

// Solvers keeps the memory of the field solutions of one goroutine. The zero
// value is ready.
type Solvers struct {
	window field.Solver
	head   field.HeadSolver
	yy     []float64
	cache  factorCache
}

// factors returns the cache of conductor factors.
func (s *Solvers) factors() factorCache {
	if s.cache == nil {
		s.cache = factorCache{}
	}
	return s.cache
}

// geometry is what the field needs to know of a core.
type geometry struct {
	shape   shape.Shape
	former  shape.Former
	section winding.Section
	index   map[string]int // winding by name
	turns   []float64
}

// problem sets up the closed window. mu is the relative permeability of the
// ferrite.
func (g *geometry) problem(how Gap, mu float64, modes int) field.Problem {
	s := g.shape
	p := field.Problem{
		Breadth: s.WindowBreadth(), Depth: s.WindowDepth(), Units: len(g.turns), Modes: modes,
	}
	for i := range g.section.Layers {
		l := &g.section.Layers[i]
		p.Depth = math.Max(p.Depth, l.X1) // a coil that does not fit is rated as if it did
		for _, of := range l.Of {
			p.Sources = append(p.Sources, field.Source{Rect: g.rect(l.Rect), Unit: g.index[of], AmpereTurns: float64(l.Turns)})
		}
	}
	post := g.post()
	p.CorePermeance = gap.CorePermeance(mu, s.Ae, s.Le)
	if post.Round() {
		p.PostRadius = post.Radius
	} else {
		// Area and core per metre of edge, so that the planar solution times the
		// edge is the whole.
		edge := post.Edge(p.Depth)
		p.PostHalfWidth = post.Area() / edge
		p.CorePermeance *= 2 / edge
	}
	switch how.Kind {
	case Ground:
		for _, c := range how.centers(p.Breadth) {
			p.Gaps = append(p.Gaps, field.Gap{Center: c, Length: how.Total / float64(max(how.Pieces, 1))})
		}
	case Spacer:
		one := []field.Gap{{Center: p.Breadth / 2, Length: how.Thickness}}
		p.Gaps, p.OuterGaps = one, one
	}
	return p
}

// post returns the leg that carries the winding. A hole in a round one makes it
// thinner.
func (g *geometry) post() gap.Post {
	if g.shape.PostRound() {
		return gap.Post{Radius: math.Sqrt(g.shape.PostArea() / math.Pi)}
	}
	return gap.Post{Width: g.shape.PostWidth(), Depth: g.shape.PostDepth()}
}

// rect moves a rectangle from the winding space into the window of the core.
func (g *geometry) rect(r winding.Rect) field.Rect {
	return field.Rect{X0: r.X0, X1: r.X1, Y0: r.Y0 + g.former.Flange, Y1: r.Y1 + g.former.Flange}
}

// centers returns where the pieces of a ground gap are, m from the lower yoke.
func (gap Gap) centers(breadth float64) []float64 {
	if len(gap.Positions) > 0 {
		return gap.Positions
	}
	n := max(gap.Pieces, 1)
	list := make([]float64, n)
	for i := range list {
		list[i] = (float64(i) + 0.5) / float64(n) * breadth
	}
	return list
}

// solve computes inductances and, when fields is set, the field in each layer.
func (s *Solvers) solve(g *geometry, how Gap, mu float64, modes int, fields bool) (magnetic, error) {
	p := g.problem(how, mu, modes)
	if err := s.window.Solve(&p); err != nil {
		return magnetic{}, fmt.Errorf("field in the window of %s: %w", g.shape.Name, err)
	}
	if err := s.head.Solve(p.Breadth, p.Units, p.Sources); err != nil {
		return magnetic{}, fmt.Errorf("field of the winding head of %s: %w", g.shape.Name, err)
	}
	m := magnetic{windings: p.Units, L: square(p.Units)}
	s.inductances(g, &p, &m)
	if !fields {
		return m, nil
	}
	n := p.Units
	if cap(s.yy) < n*n {
		s.yy = make([]float64, n*n)
	}
	m.layers = make([]layerField, len(g.section.Layers))
	for i := range g.section.Layers {
		l := &g.section.Layers[i]
		r := g.rect(l.Rect)
		inside := g.shape.FacedShare((l.X0 + l.X1) / 2)
		lf := &m.layers[i]
		if l.Wire.Kind == wire.Foil {
			lf.faces = s.faces(r, inside, n, g.index[l.Of[0]])
			continue
		}
		if l.Wire.Kind == wire.Solid {
			// The wire's own field does not drive eddy currents in it: only the
			// field at its center counts, where its own is zero.
			mid, half := (r.X0+r.X1)/2, (r.X1-r.X0)/50
			r.X0, r.X1 = mid-half, mid+half
		}
		lf.h2 = make([]float64, n*n)
		yy := s.yy[:n*n]
		clear(yy)
		s.window.Mean(r, inside, lf.h2, yy)
		s.head.Mean(r, 1-inside, lf.h2, yy)
		for j, v := range yy {
			lf.h2[j] += v
		}
	}
	return m, nil
}

// facePoints along the breadth of a foil; Gauss would crowd them at the ends,
// where the slab does not hold anyway.
const facePoints = 16

// faces evaluates the tangential field at both faces of a foil: the mean of the
// two from the solution, -+ half of the foil's own current per breadth, so that
// the net current is right on every strip. It holds away from gaps only; beside
// one the normal field drives currents over the whole breadth.
func (s *Solvers) faces(r field.Rect, inside float64, n, own int) []facePoint {
	var list []facePoint
	hx, a, b := make([]float64, n), make([]float64, n), make([]float64, n)
	for i := range facePoints {
		y := r.Y0 + (float64(i)+0.5)/facePoints*(r.Y1-r.Y0)
		for _, place := range [2]struct {
			at    func(x, y float64, hx, hy []float64)
			share float64
		}{{s.window.At, inside}, {s.head.At, 1 - inside}} {
			f := facePoint{weight: (r.Y1 - r.Y0) / facePoints * place.share, inner: make([]float64, n), outer: make([]float64, n)}
			place.at(r.X0, y, hx, a)
			place.at(r.X1, y, hx, b)
			for w := range n {
				mean := (a[w] + b[w]) / 2
				f.inner[w], f.outer[w] = mean, mean
			}
			half := 1 / (2 * (r.Y1 - r.Y0))
			f.inner[own] -= half
			f.outer[own] += half
			list = append(list, f)
		}
	}
	return list
}

// inductances fills the matrix. Around a round post the window is a ring and
// the solution holds all round; around a rectangular one it is the planar one
// times the edge of the post.
//
// Of a turn only the part in front of an outer leg lies in the window. What is
// left over of the ampere-turns goes through the post wherever the turn is, so
// only the balanced part of the currents is moved: each winding against the
// innermost one, whose energy in the window is replaced by that in the head for
// the part of the turn that is there.
func (s *Solvers) inductances(g *geometry, p *field.Problem, m *magnetic) {
	n := p.Units
	post := g.post()
	edge := 1.0
	if !post.Round() {
		edge = post.Edge(p.Depth)
	}
	for a := range n {
		for b := range n {
			m.L[a][b] = edge * s.window.Inductance(a, b)
		}
	}
	if n < 2 {
		return
	}
	r := g.innermost()
	center := g.centers()
	for a := range n {
		for b := range n {
			if a == r || b == r {
				continue
			}
			balanced := func(energy func(a, b int) float64) float64 {
				na, nb, nr := g.turns[a], g.turns[b], g.turns[r]
				return energy(a, b)/(na*nb) - energy(a, r)/(na*nr) - energy(r, b)/(nr*nb) + energy(r, r)/(nr*nr)
			}
			x := ((center[a]+center[b])/2 + center[r]) / 2
			turn := g.former.TurnLength(x - g.former.WallOffset)
			inside := g.shape.FacedShare(x)
			window := balanced(s.window.Energy)
			head := balanced(s.head.Energy) * turn * (1 - inside)
			var move float64
			if post.Round() {
				// window is that of the whole ring.
				move = head - window*(1-inside)
			} else {
				move = head + window*(turn*inside-edge)
			}
			m.L[a][b] += g.turns[a] * g.turns[b] * move
		}
	}
}

// innermost returns the winding whose turns lie nearest to the post.
func (g *geometry) innermost() int {
	best, least := 0, math.Inf(1)
	for i, x := range g.centers() {
		if x < least {
			best, least = i, x
		}
	}
	return best
}

// centers returns the mean distance of each winding's turns from the post, m.
func (g *geometry) centers() []float64 {
	sum, turns := make([]float64, len(g.turns)), make([]float64, len(g.turns))
	for i := range g.section.Layers {
		l := &g.section.Layers[i]
		for _, of := range l.Of {
			w := g.index[of]
			sum[w] += float64(l.Turns) * (l.X0 + l.X1) / 2
			turns[w] += float64(l.Turns)
		}
	}
	for i := range sum {
		sum[i] /= math.Max(turns[i], 1)
	}
	return sum
}

func square(n int) [][]float64 {
	m := make([][]float64, n)
	for i := range m {
		m[i] = make([]float64, n)
	}
	return m
}
