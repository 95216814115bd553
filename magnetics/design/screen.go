package design

import (
	"cmp"
	"math"
	"slices"

	"gapwright/corelib/wire"
	"gapwright/magnetics/acloss"
	"gapwright/magnetics/part"
)

// The search looks at many thousands of windings; this file tells it in a few
// dozen operations what each would lose. The field runs along the layers and is
// spread over the whole window breadth, so fringing is missing: the estimate is
// for ranking. What survives is rated with the field of the window.

// screenTemperature is where the estimates are made, °C.
const screenTemperature = 100

// forms holds, for every corner, the quadratic forms that turn the enclosed
// ampere-turns of a layer into its eddy-current loss, one for each conductor
// diameter.
type forms struct {
	drives []part.Drive
	cache  map[float64][]form
	own    map[float64][][]float64
}

// form is sum over k of G(d/delta_k) Re(conj(I_a) I_b), [winding][winding].
type form [3][3]float64

func newForms(drives []part.Drive) *forms {
	return &forms{drives: drives, cache: make(map[float64][]form), own: make(map[float64][][]float64)}
}

// transverse returns the form of a round conductor of diameter d for each drive.
func (f *forms) transverse(d float64) []form {
	if list, ok := f.cache[d]; ok {
		return list
	}
	list := make([]form, len(f.drives))
	for i := range f.drives {
		drive := &f.drives[i]
		n := len(drive.Phasors)
		for k := 1; k < len(drive.Phasors[0]); k++ {
			g := acloss.RoundTransverse(d / wire.SkinDepth(float64(k)*drive.Frequency, screenTemperature))
			for a := range n {
				for b := range n {
					x, y := drive.Phasors[a][k], drive.Phasors[b][k]
					list[i][a][b] += g * (real(x)*real(y) + imag(x)*imag(y))
				}
			}
		}
	}
	f.cache[d] = list
	return list
}

// skin returns, for each drive and winding, the mean square current weighted
// with the skin factor of a conductor of diameter d: times R_dc it is the loss of
// the winding's own current.
func (f *forms) skin(d float64) [][]float64 {
	if list, ok := f.own[d]; ok {
		return list
	}
	list := make([][]float64, len(f.drives))
	for i := range f.drives {
		drive := &f.drives[i]
		list[i] = make([]float64, len(drive.Phasors))
		for a, phasors := range drive.Phasors {
			sum := real(phasors[0]) * real(phasors[0])
			for k := 1; k < len(phasors); k++ {
				x := phasors[k]
				square := (real(x)*real(x) + imag(x)*imag(x)) / 2
				if square == 0 {
					continue
				}
				sum += square * acloss.RoundSkin(d/wire.SkinDepth(float64(k)*drive.Frequency, screenTemperature))
			}
			list[i][a] = sum
		}
	}
	f.own[d] = list
	return list
}

// along applies q to the mean square of a field that goes linearly from h0 to h1
// (enclosed turns of each winding).
func (q *form) along(h0, h1 [3]float64) float64 {
	sum := 0.0
	for a := range 3 {
		for b := range 3 {
			sum += q[a][b] * (h0[a]*h0[b] + h1[a]*h1[b] + (h0[a]*h1[b]+h1[a]*h0[b])/2)
		}
	}
	return sum / 3
}

// stretch is one section as the screening sees it: where its field starts and
// ends, in turns of each winding per metre of breadth.
type stretch struct {
	section
	h0, h1  [3]float64 // 1/m
	breadth float64    // m, that its layers have
	length  float64    // m, of a turn
}

// choice is a winding's wire with what it costs.
type choice struct {
	coil
	height float64   // m, of all its sections, bulge included
	loss   []float64 // W, of each drive
	mean   float64   // W, weighted by share, continuous corners
}

// options returns the wires of one electrical side (primary or secondary) that
// no other beats in both height and loss, tallest first. stretches are the
// sections of that side; winding gives the index of its first winding in the
// drives.
func (s *search) options(stretches []stretch, winding int, candidates []wire.Wire, parallelMax int, bulge func(wire.Wire) float64, heightMax float64, f *forms, shares []float64) []choice {
	var list []choice
	for _, w := range candidates {
		od := w.OuterDiameter()
		for parallel := 1; parallel <= parallelMax; parallel++ {
			c := choice{coil: coil{Wire: w, Parallel: parallel}}
			if !s.price(&c, stretches, winding, od*(1+bulge(w)), od, heightMax, f, shares) {
				continue
			}
			list = append(list, c)
		}
	}
	// Pareto front of height and loss; ties go to the simpler winding.
	slices.SortStableFunc(list, func(a, b choice) int {
		return cmp.Or(cmp.Compare(a.height, b.height), cmp.Compare(a.mean, b.mean))
	})
	front := list[:0]
	best := math.Inf(1)
	for _, c := range list {
		if c.mean < best*(1-1e-9) {
			best = c.mean
			front = append(front, c)
		}
	}
	return slices.Clone(front)
}

// price fills height and loss of c. It reports false when the wire does not go
// into the breadth or the height.
func (s *search) price(c *choice, stretches []stretch, first int, pitch, od, heightMax float64, f *forms, shares []float64) bool {
	w := c.Wire
	foil := w.Kind == wire.Foil
	for i := range stretches {
		st := &stretches[i]
		wires := st.turns * c.Parallel * len(st.names)
		layers := 0
		if foil {
			if c.Parallel > 1 {
				return false
			}
			layers = st.turns * len(st.names)
		} else {
			room := int(math.Floor(st.breadth/od*(1+1e-9))) - 1
			if room < c.Parallel*len(st.names) {
				return false
			}
			perLayer := room / (c.Parallel * len(st.names))
			layers = (st.turns + perLayer - 1) / perLayer
			_ = wires
		}
		c.Layers = max(c.Layers, layers)
	}
	for i := range stretches {
		n := c.Layers
		if foil {
			n = stretches[i].turns * len(stretches[i].names)
		} else if n > stretches[i].turns {
			return false
		} else if per := (stretches[i].turns + n - 1) / n; (n-1)*per >= stretches[i].turns {
			return false // the last layer would be empty
		}
		c.height += float64(n) * pitch
	}
	if c.height > heightMax {
		return false
	}
	c.loss = make([]float64, len(f.drives))
	strands := float64(max(w.Strands, 1) * c.Parallel)
	rho := wire.Resistivity(screenTemperature)
	if foil {
		s.priceFoil(c, stretches, first, f)
	} else {
		transverse, skin := f.transverse(w.Diameter), f.skin(w.Diameter)
		r := w.ResistancePerLength(screenTemperature) / float64(c.Parallel)
		for i := range stretches {
			st := &stretches[i]
			copper := strands * float64(st.turns*len(st.names)) * st.length
			for d := range f.drives {
				eddy := rho * copper * transverse[d].along(st.h0, st.h1)
				dc := 0.0
				for j := range st.of {
					dc += r * float64(st.turns) * st.length * skin[d][s.windingIndex(st.of[j])]
				}
				c.loss[d] += dc + eddy
			}
		}
	}
	for d, share := range shares {
		c.mean += share * c.loss[d]
	}
	return true
}

// priceFoil is price for foil: each turn is a slab between two tangential fields.
func (s *search) priceFoil(c *choice, stretches []stretch, first int, f *forms) {
	t := c.Wire.Thickness
	rho := wire.Resistivity(screenTemperature)
	for i := range stretches {
		st := &stretches[i]
		layers := st.turns * len(st.names)
		for d := range f.drives {
			drive := &f.drives[d]
			n := len(drive.Phasors)
			for l := range layers {
				var ha, hb [3]float64
				for w := range n {
					step := (st.h1[w] - st.h0[w]) / float64(layers)
					ha[w] = st.h0[w] + float64(l)*step
					hb[w] = ha[w] + step
				}
				loss := 0.0
				for k := 1; k < len(drive.Phasors[0]); k++ {
					var za, zb complex128
					for w := range n {
						za += complex(ha[w], 0) * drive.Phasors[w][k]
						zb += complex(hb[w], 0) * drive.Phasors[w][k]
					}
					g1, g2 := acloss.Slab(t / wire.SkinDepth(float64(k)*drive.Frequency, screenTemperature))
					a2, b2 := real(za)*real(za)+imag(za)*imag(za), real(zb)*real(zb)+imag(zb)*imag(zb)
					ab := real(za)*real(zb) + imag(za)*imag(zb)
					loss += (g1*(a2+b2) - 4*g2*ab) / 2
				}
				// per square metre of foil, times breadth and length
				c.loss[d] += loss * rho / t * st.breadth * st.length
				name := st.of[l%len(st.of)]
				dc := real(drive.Phasors[s.windingIndex(name)][0])
				c.loss[d] += dc * dc * rho / (t * st.breadth) * st.length
			}
		}
	}
	_ = first
}

// windingIndex is the place of an electrical winding in the drives.
func (s *search) windingIndex(name string) int {
	switch name {
	case "S-B":
		return 2
	case "S", "S-A":
		return 1
	}
	return 0
}
