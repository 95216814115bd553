package part

import (
	"fmt"
	"runtime"

	"golang.org/x/sync/errgroup"

	"gapwright/corelib/wire"
	"gapwright/magnetics/acloss"
)

// Resistances returns the resistance matrix of the windings, ohm, at direct
// current and at the first multiples of a frequency (Hz), the windings at a
// temperature in °C:
//
//	heat = Σ_ab R[k][a][b] Re(I_a* I_b)
//
// with rms currents into the dotted ends of the windings a and b, each on its
// own side; k = 0 is direct current. A short circuit and an open one are two
// directions of it. It is the loss that rates the part in detail, one frequency
// at a time.
func (c *Coil) Resistances(frequency, temperature float64, orders, modes int) ([][][]float64, error) {
	if !(frequency > 0) || orders < 1 {
		panic("part: resistances of no frequency")
	}
	n := len(c.turns)
	// A quadratic form is known from its values along the axes and along the
	// bisectors of each pair.
	type excitation struct{ a, b int }
	var list []excitation
	for a := range n {
		for b := a; b < n; b++ {
			list = append(list, excitation{a, b})
		}
	}
	heat := make([][]float64, len(list))
	var g errgroup.Group
	g.SetLimit(runtime.GOMAXPROCS(0))
	for i, e := range list {
		g.Go(func() error {
			var err error
			heat[i], err = c.heat(frequency, temperature, orders, modes, e.a, e.b)
			return err
		})
	}
	if err := g.Wait(); err != nil {
		return nil, err
	}
	r := make([][][]float64, orders+1)
	for k := range r {
		r[k] = square(n)
		for i, e := range list {
			if e.a == e.b {
				r[k][e.a][e.a] = heat[i][k]
			}
		}
		for i, e := range list {
			if e.a != e.b {
				x := (heat[i][k] - r[k][e.a][e.a] - r[k][e.b][e.b]) / 2
				r[k][e.a][e.b], r[k][e.b][e.a] = x, x
			}
		}
	}
	return r, nil
}

// heat returns the heat of each order, W, with 1 A rms in the windings a and b
// (once when they are the same).
func (c *Coil) heat(frequency, temperature float64, orders, modes, a, b int) ([]float64, error) {
	var s Solvers
	gap, mu := c.Construction.Core.Gap, c.mu(hotTemperature)
	m, err := s.solve(&c.geometry, gap, mu, modes, true)
	if err != nil {
		return nil, err
	}
	// Eddy loss grows at most with the square of the frequency: amplitudes 1/k
	// make every order matter when wires are solved together.
	d := Drive{Frequency: frequency, Phasors: make([][]complex128, len(c.turns))}
	for w := range d.Phasors {
		d.Phasors[w] = make([]complex128, orders+1)
		if w == a || w == b {
			d.Phasors[w][0] = 1
			for k := 1; k <= orders; k++ {
				d.Phasors[w][k] = complex(1/float64(k), 0)
			}
		}
	}
	t := c.table(&m, &d)
	// At its own temperature: what spreads over a foil grows with the resistivity
	// where a slab's loss falls with it, and directions of the currents in which
	// most of the field cancels would keep the difference.
	t.warm = temperature
	if _, _, err := s.couple(&c.geometry, gap, mu, modes, &d, &t); err != nil {
		return nil, fmt.Errorf("solid wires: %w", err)
	}
	if _, _, err := s.coupleFoils(&c.geometry, gap, mu, modes, &d, &t); err != nil {
		return nil, fmt.Errorf("foils: %w", err)
	}
	out := make([]float64, orders+1)
	for k := range out {
		out[k] = t.order(k, temperature, s.factors())
		if k > 0 {
			out[k] *= 2 * float64(k*k) // from the amplitude 1/k to 1 A rms
		}
	}
	return out, nil
}

// order returns the loss of one harmonic in all windings, W.
func (t *lossTable) order(k int, temperature float64, cache factorCache) float64 {
	rho := wire.Resistivity(temperature)
	hot := rho / wire.Resistivity(wire.ReferenceTemperature)
	sum := 0.0
	for i := range t.layers {
		l := &t.layers[i]
		if l.foil && k > 0 {
			g1, g2 := acloss.Slab(l.w.Thickness / acloss.SkinDepth(float64(k)*t.frequency, rho))
			sum += float64(len(l.of)) * rho / (2 * l.w.Thickness) * (g1*l.sum[k] - 4*g2*l.dot[k]) * l.length
			continue
		}
		skin := 1.0
		if k > 0 {
			f := cache.of(l.w.Diameter, t.frequency, temperature, t.orders)
			skin = f.skin[k]
			sum += f.transverse[k] * l.eddy[k] * rho * l.strands * l.length
		}
		for j := range l.of {
			sum += hot * l.dc[j] * skin * l.own[j][k]
		}
	}
	return sum
}
