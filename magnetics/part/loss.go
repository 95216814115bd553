package part

import (
	"math"

	"gapwright/corelib/wire"
	"gapwright/magnetics/acloss"
)

// A lossTable turns the field of one coil and the currents of one corner into
// winding loss at any temperature. Everything that does not depend on
// temperature is summed once.
type lossTable struct {
	frequency float64
	orders    int
	layers    []lossLayer
	windings  int
	warm      float64 // °C, where solid wires and foils are solved together
}

// lossLayer is one layer at one corner. own[k] and eddy[k] are per harmonic, so
// that only the skin depth is left to apply.
type lossLayer struct {
	of       []int // windings in it
	w        wire.Wire
	strands  float64   // conductors in the layer, strands counted one by one
	length   float64   // m, of a turn
	dc       []float64 // of each winding in of: its DC resistance here over rho(T)/rho(20), ohm
	own      [][]float64
	eddy     []float64 // 1/m2, |H|^2 of harmonic k, peak
	foil     bool
	sum, dot []float64 // foil: integrals of |Ha|^2+|Hb|^2 and Re(Ha Hb*) over the breadth
	width    float64
}

// table prepares the winding loss of one corner.
func (g *geometry) table(m *magnetic, d *Drive) lossTable {
	n := m.windings
	orders := len(d.Phasors[0]) - 1
	t := lossTable{frequency: d.Frequency, orders: orders, windings: n, warm: hotTemperature, layers: make([]lossLayer, len(g.section.Layers))}
	for i := range g.section.Layers {
		l := &g.section.Layers[i]
		out := &t.layers[i]
		out.w, out.length = l.Wire, l.Length
		out.strands = float64(l.Wires() * max(l.Wire.Strands, 1))
		for _, of := range l.Of {
			w := g.index[of]
			out.of = append(out.of, w)
			out.dc = append(out.dc, l.Wire.ResistancePerLength(wire.ReferenceTemperature)*float64(l.Turns)*l.Length/float64(l.Parallel))
			own := make([]float64, orders+1)
			own[0] = real(d.Phasors[w][0]) * real(d.Phasors[w][0])
			for k := 1; k <= orders; k++ {
				own[k] = d.product(w, w, k) / 2
			}
			out.own = append(out.own, own)
		}
		if l.Wire.Kind == wire.Foil {
			out.foil = true
			out.width = l.Y1 - l.Y0
			out.sum, out.dot = make([]float64, orders+1), make([]float64, orders+1)
			for _, f := range m.layers[i].faces {
				for k := 1; k <= orders; k++ {
					var a, b complex128
					for w := range n {
						a += complex(f.inner[w], 0) * d.Phasors[w][k]
						b += complex(f.outer[w], 0) * d.Phasors[w][k]
					}
					out.sum[k] += f.weight * (real(a)*real(a) + imag(a)*imag(a) + real(b)*real(b) + imag(b)*imag(b))
					out.dot[k] += f.weight * (real(a)*real(b) + imag(a)*imag(b))
				}
			}
			continue
		}
		out.eddy = make([]float64, orders+1)
		for k := 1; k <= orders; k++ {
			sum := 0.0
			for a := range n {
				for b := range n {
					sum += m.layers[i].h2[a*n+b] * d.product(a, b, k)
				}
			}
			out.eddy[k] = math.Max(sum, 0)
		}
	}
	return t
}

// factorKey is a conductor size in one corner at one temperature.
type factorKey struct{ size, frequency, temperature float64 }

// factors are the skin and the transverse-field factor per harmonic.
type factors struct{ skin, transverse []float64 }

// factorCache keeps factors: a search asks for the same few conductors at the
// same few frequencies and temperatures again and again.
type factorCache map[factorKey]factors

// cacheMost bounds the cache; a search has a few hundred keys.
const cacheMost = 4096

func (c factorCache) of(size, frequency, temperature float64, orders int) factors {
	key := factorKey{size, frequency, temperature}
	if f, ok := c[key]; ok && len(f.skin) == orders+1 {
		return f
	}
	f := factors{make([]float64, orders+1), make([]float64, orders+1)}
	f.skin[0] = 1
	rho := wire.Resistivity(temperature)
	for k := 1; k <= orders; k++ {
		x := size / acloss.SkinDepth(float64(k)*frequency, rho)
		f.skin[k], f.transverse[k] = acloss.RoundSkin(x), acloss.RoundTransverse(x)
	}
	if len(c) < cacheMost {
		c[key] = f
	}
	return f
}

// lossNodes are the temperatures, °C, between which the loss of a corner is
// interpolated while its steady state is found: own losses follow the
// resistivity, eddy losses of thin conductors its inverse, so a cubic through
// four points is within 0.1 %. The loss that is reported is computed at its
// temperature.
var lossNodes = [4]float64{20, 90, 180, 300}

// curve returns the total loss as a function of temperature.
func (t *lossTable) curve(cache factorCache) func(temperature float64) float64 {
	var y [4]float64
	for i, x := range lossNodes {
		y[i] = sumOf(t.loss(x, cache, nil))
	}
	return func(temperature float64) float64 {
		sum := 0.0
		for i, xi := range lossNodes {
			w := y[i]
			for j, xj := range lossNodes {
				if j != i {
					w *= (temperature - xj) / (xi - xj)
				}
			}
			sum += w
		}
		return math.Max(sum, 0)
	}
}

// loss returns the loss of each winding, W, at a temperature in °C, and of that
// the part of each layer.
func (t *lossTable) loss(temperature float64, cache factorCache, perLayer []float64) []float64 {
	total := make([]float64, t.windings)
	rho := wire.Resistivity(temperature)
	hot := rho / wire.Resistivity(wire.ReferenceTemperature)
	for i := range t.layers {
		l := &t.layers[i]
		sum := 0.0
		if l.foil {
			for j, w := range l.of {
				x := hot * l.dc[j] * l.own[j][0]
				for k := 1; k <= t.orders; k++ {
					if l.sum[k] == 0 {
						continue
					}
					g1, g2 := acloss.Slab(l.w.Thickness / acloss.SkinDepth(float64(k)*t.frequency, rho))
					x += rho / (2 * l.w.Thickness) * (g1*l.sum[k] - 4*g2*l.dot[k]) * l.length
				}
				total[w] += x
				sum += x
			}
		} else {
			f := cache.of(l.w.Diameter, t.frequency, temperature, t.orders)
			eddy := 0.0
			for k := 1; k <= t.orders; k++ {
				eddy += f.transverse[k] * l.eddy[k]
			}
			eddy *= rho * l.strands * l.length
			for j, w := range l.of {
				x := eddy / float64(len(l.of))
				for k, square := range l.own[j] {
					x += hot * l.dc[j] * f.skin[k] * square
				}
				total[w] += x
				sum += x
			}
		}
		if perLayer != nil {
			perLayer[i] = sum
		}
	}
	return total
}
