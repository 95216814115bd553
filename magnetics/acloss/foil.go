package acloss

import (
	"math"

	"gonum.org/v1/gonum/integrate/quad"

	"gapwright/magnetics/field"
)

// A Sampler gives the field of every unit solution along a line of constant x:
// the winding window and the winding head both do.
type Sampler interface {
	Units() int
	Along(x float64, y, hx, hy []float64)
}

// Foil adds the resistance form of one foil per metre of its length to form,
// [unit][unit]. The foil lies across r.X0 ... r.X1 and carries the given current
// per ampere of its unit (below 0: none).
//
// Every strip of the breadth is a slab whose face fields are the mean of the
// two faces from the sampler, -+ half of its own current per breadth. That is exact
// at full breadth; with margins it misses the crowding of the current at the
// ends, which the field normal to the foil drives (1 to 10 % low). It cannot
// be trusted beside a gap: there the normal field acts over the whole breadth.
func Foil(s Sampler, r field.Rect, unit int, current, delta, rho float64, form []float64) {
	const panels, points = 6, 8
	var gx, gw [points]float64
	quad.Legendre{}.FixedLocations(gx[:], gw[:], 0, 1)
	units := s.Units()
	t, breadth := r.X1-r.X0, r.Y1-r.Y0
	g1, g2 := Slab(t / delta)
	y := make([]float64, panels*points)
	w := make([]float64, panels*points)
	for i := range y {
		p, q := i/points, i%points
		// Panels narrow towards both ends, where the field changes most.
		a, b := cosinePanel(p, panels), cosinePanel(p+1, panels)
		y[i] = r.Y0 + breadth*(a+(b-a)*gx[q])
		w[i] = breadth * (b - a) * gw[q]
	}
	size := len(y) * units
	buffer := make([]float64, 4*size)
	hx, inner, outer := buffer[:size], buffer[size:2*size], buffer[2*size:3*size]
	s.Along(r.X0, y, hx, inner)
	s.Along(r.X1, y, hx, outer)
	for i := range y {
		a, b := inner[i*units:(i+1)*units], outer[i*units:(i+1)*units]
		for u := range units {
			mean, half := (a[u]+b[u])/2, 0.0
			if u == unit {
				half = current / (2 * breadth)
			}
			a[u], b[u] = mean-half, mean+half
		}
		for u := range units {
			for v := range units {
				form[u*units+v] += w[i] * rho / t * (g1*(a[u]*a[v]+b[u]*b[v]) - 2*g2*(a[u]*b[v]+b[u]*a[v]))
			}
		}
	}
}

func cosinePanel(p, panels int) float64 {
	return (1 - math.Cos(math.Pi*float64(p)/float64(panels))) / 2
}
