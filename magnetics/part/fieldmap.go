package part

import (
	"fmt"
	"math"
	"slices"

	"gapwright/corelib/wire"
)

// A FieldMap is the strength of the field over the winding window in front of
// an outer leg, at the fundamental of one corner. Currents are spread evenly
// over each layer, as the rating sees them, not drawn wire by wire.
type FieldMap struct {
	Corner    string
	Frequency float64   // Hz
	Breadth   float64   // m, of the window, along the post (y)
	Depth     float64   // m, from the post to the outer leg (x)
	NX, NY    int       // cells across and along
	H         []float64 // A/m, rms, [across][along], at the centers of the cells
	Peak      float64   // A/m, largest of H
	InCopper  float64   // A/m, largest of H at a cell inside a layer of turns
}

// At returns the rms field of a cell, A/m.
func (f FieldMap) At(i, j int) float64 { return f.H[i*f.NY+j] }

// FieldMaps samples the field of the coil in its gapped core, one map for each
// drive. The ferrite is as permeable as hot, like for the losses. It fails when
// a drive has other windings than the coil or the window cannot be solved.
func (c *Coil) FieldMaps(s *Solvers, drives []Drive, across, along int) ([]FieldMap, error) {
	if across < 2 || along < 2 {
		return nil, fmt.Errorf("a field map of %d by %d cells", across, along)
	}
	g := &c.geometry
	p := g.problem(c.Construction.Core.Gap, c.mu(hotTemperature), 0)
	if err := s.window.Solve(&p); err != nil {
		return nil, fmt.Errorf("field in the window of %s: %w", g.shape.Name, err)
	}
	n := p.Units
	maps := make([]FieldMap, len(drives))
	for k, d := range drives {
		if len(d.Phasors) != n {
			return nil, fmt.Errorf("corner %s has %d currents, the coil %d windings", d.Name, len(d.Phasors), n)
		}
		maps[k] = FieldMap{
			Corner: d.Name, Frequency: d.Frequency, Breadth: p.Breadth, Depth: p.Depth,
			NX: across, NY: along, H: make([]float64, across*along),
		}
	}
	y := make([]float64, along)
	for j := range y {
		y[j] = (float64(j) + 0.5) / float64(along) * p.Breadth
	}
	hx, hy := make([]float64, n*along), make([]float64, n*along)
	for i := range across {
		x := (float64(i) + 0.5) / float64(across) * p.Depth
		clear(hx)
		clear(hy)
		s.window.Along(x, y, hx, hy)
		for j := range along {
			copper := g.inCopper(x, y[j])
			for k := range maps {
				m := &maps[k]
				h := rmsField(hx[j*n:(j+1)*n], hy[j*n:(j+1)*n], drives[k].Phasors)
				if math.IsNaN(h) || math.IsInf(h, 0) {
					return nil, fmt.Errorf("field of %s at %g, %g m is %g", g.shape.Name, x, y[j], h)
				}
				m.H[i*along+j] = h
				m.Peak = math.Max(m.Peak, h)
				if copper {
					m.InCopper = math.Max(m.InCopper, h)
				}
			}
		}
	}
	return maps, nil
}

// rmsField adds the fields per ampere with the phasors of the fundamental.
func rmsField(hx, hy []float64, phasors [][]complex128) float64 {
	var x, y complex128
	for w, h := range phasors {
		x += complex(hx[w], 0) * h[1]
		y += complex(hy[w], 0) * h[1]
	}
	square := real(x)*real(x) + imag(x)*imag(x) + real(y)*real(y) + imag(y)*imag(y)
	return math.Sqrt(square / 2)
}

// inCopper tells whether a point of the window lies in a layer of turns.
func (g *geometry) inCopper(x, y float64) bool {
	for i := range g.section.Layers {
		r := g.rect(g.section.Layers[i].Rect)
		if x >= r.X0 && x <= r.X1 && y >= r.Y0 && y <= r.Y1 {
			return true
		}
	}
	return false
}

// A StrandPoint is one strand diameter of a litz that fills the same bundle.
type StrandPoint struct {
	Diameter float64 // m, bare
	Strands  int
	Loss     float64 // W, of the winding, weighted by share
	DC       float64 // W, the part of it that the DC resistance makes of the rms current
}

// A StrandCurve is the loss of one litz winding over the diameter of its
// strands: bundle, layers and field stay as built, finer strands come in larger
// number and with more enamel. Temperatures stay those of the rating.
type StrandCurve struct {
	Winding string
	Built   StrandPoint
	Points  []StrandPoint // thick to thin
	Knee    int           // index into Points: the thickest strand within kneeLoss of the least loss; -1: none
}

// kneeLoss is how much more than the least loss is not worth the price of
// thinner strands (own proposal).
const kneeLoss = 0.10

// StrandCurves returns the curves of the litz windings of a rated part.
func (c *Coil) StrandCurves(s *Solvers, r *Rating, drives []Drive, diameters []float64) ([]StrandCurve, error) {
	m, err := s.solve(&c.geometry, c.Construction.Core.Gap, c.mu(hotTemperature), 0, true)
	if err != nil {
		return nil, err
	}
	var curves []StrandCurve
	for w, winding := range c.Construction.Windings {
		built, ok := c.litzOf(winding.Name)
		if !ok {
			continue
		}
		at := func(with wire.Wire) StrandPoint {
			g := c.geometry
			g.section.Layers = append(g.section.Layers[:0:0], g.section.Layers...)
			for i := range g.section.Layers {
				if l := &g.section.Layers[i]; l.Wire.Kind == wire.Litz && slices.Contains(l.Of, winding.Name) {
					l.Wire = with
				}
			}
			p := StrandPoint{Diameter: with.Diameter, Strands: with.Strands}
			for k := range drives {
				d := &drives[k]
				at := slices.IndexFunc(r.Corners, func(c CornerRating) bool { return c.Name == d.Name })
				if !d.Continuous || at < 0 {
					continue
				}
				temperature := r.Corners[at].WindingTemperature - r.hotSpotAllowance
				t := g.table(&m, d)
				p.Loss += d.Share * t.loss(temperature, s.factors(), nil)[w]
				p.DC += d.Share * t.direct(w, temperature, d.RMS[w])
			}
			return p
		}
		curve := StrandCurve{Winding: winding.Name, Built: at(built), Knee: -1}
		for i := len(diameters) - 1; i >= 0; i-- {
			with := built
			with.Own, with.Diameter = nil, diameters[i]
			with.Strands = strandsFor(with, built.OuterDiameter())
			if with.Strands == 0 || with.Check() != nil {
				continue
			}
			curve.Points = append(curve.Points, at(with))
		}
		least := math.Inf(1)
		for _, p := range curve.Points {
			least = math.Min(least, p.Loss)
		}
		curve.Knee = slices.IndexFunc(curve.Points, func(p StrandPoint) bool { return p.Loss <= (1+kneeLoss)*least })
		curves = append(curves, curve)
	}
	return curves, nil
}

// litzOf returns the wire of a winding when all of its layers are of the same
// litz.
func (c *Coil) litzOf(name string) (wire.Wire, bool) {
	var found wire.Wire
	for _, l := range c.section.Layers {
		if !slices.Contains(l.Of, name) {
			continue
		}
		if l.Wire.Kind != wire.Litz || found.Strands > 0 && (l.Wire.Strands != found.Strands || l.Wire.Diameter != found.Diameter) {
			return wire.Wire{}, false
		}
		found = l.Wire
	}
	return found, found.Strands > 0
}

// strandsFor returns the largest number of strands whose bundle is not thicker
// than outer; 0: not even three.
func strandsFor(w wire.Wire, outer float64) int {
	const slack = 1e-9 // m, rounding
	low, high := 2, 60000
	for high-low > 1 {
		w.Strands = (low + high) / 2
		if w.OuterDiameter() <= outer+slack {
			low = w.Strands
		} else {
			high = w.Strands
		}
	}
	if low < 3 {
		return 0
	}
	return low
}

// direct returns the loss of winding w at a temperature if its current of rms
// flowed evenly in all of its copper, W.
func (t *lossTable) direct(w int, temperature, rms float64) float64 {
	hot := wire.Resistivity(temperature) / wire.Resistivity(wire.ReferenceTemperature)
	sum := 0.0
	for i := range t.layers {
		for j, of := range t.layers[i].of {
			if of == w {
				sum += hot * t.layers[i].dc[j] * rms * rms
			}
		}
	}
	return sum
}
