package design

import (
	"math"
	"slices"
	"sort"

	"gapwright/corelib/wire"
	"gapwright/magnetics/acloss"
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
)

// The search looks at many thousands of windings; this file tells it in a few
// dozen operations what each would lose. The field runs along the layers and is
// spread over the whole window breadth, so fringing is missing: the estimate is
// for ranking. What survives is rated with the field of the window.

// screenTemperature is where the estimates are made, °C.
const screenTemperature = 100

// form is sum over k of a factor times Re(conj(I_a) I_b), [winding][winding]: the
// quadratic form that turns enclosed turns into loss. The factors are those of
// one conductor, the currents those of all corners, weighted by their shares.
type form [3][3]float64

// conductor is what the currents of the job make of one conductor size.
type conductor struct {
	eddy form       // factor G of an isolated round wire
	own  [3]float64 // mean square current, weighted with the skin factor
	// Foil: the two slab factors, and the DC part.
	slab1, slab2 form
	dc           [3]float64
}

// forms holds a conductor for every diameter (or foil thickness) of the wires
// of the job. It is filled before the search starts and only read afterwards.
type forms struct {
	drives []part.Drive
	shares []float64
	round  map[float64]*conductor
	foil   map[float64]*conductor
}

func newForms(drives []part.Drive, shares []float64, lists ...[]wire.Wire) *forms {
	f := &forms{drives: drives, shares: shares, round: map[float64]*conductor{}, foil: map[float64]*conductor{}}
	for _, list := range lists {
		for _, w := range list {
			switch {
			case w.Kind == wire.Foil && f.foil[w.Thickness] == nil:
				f.foil[w.Thickness] = f.slab(w.Thickness)
			case w.Kind != wire.Foil && f.round[w.Diameter] == nil:
				f.round[w.Diameter] = f.wire(w.Diameter)
			}
		}
	}
	return f
}

// each calls visit for every harmonic of every corner that counts, with its
// weight and the skin depth.
func (f *forms) each(visit func(d *part.Drive, k int, weight, delta float64)) {
	for i := range f.drives {
		if f.shares[i] == 0 {
			continue
		}
		d := &f.drives[i]
		for k := 1; k < len(d.Phasors[0]); k++ {
			visit(d, k, f.shares[i], wire.SkinDepth(float64(k)*d.Frequency, screenTemperature))
		}
	}
}

// add adds weight times the product of the currents of harmonic k.
func (q *form) add(d *part.Drive, k int, weight float64) {
	for a := range d.Phasors {
		x := d.Phasors[a][k]
		for b := range d.Phasors {
			y := d.Phasors[b][k]
			q[a][b] += weight * (real(x)*real(y) + imag(x)*imag(y))
		}
	}
}

func (f *forms) direct() (dc [3]float64) {
	for i := range f.drives {
		for a, phasors := range f.drives[i].Phasors {
			dc[a] += f.shares[i] * real(phasors[0]) * real(phasors[0])
		}
	}
	return dc
}

func (f *forms) wire(diameter float64) *conductor {
	c := &conductor{own: f.direct()}
	f.each(func(d *part.Drive, k int, weight, delta float64) {
		c.eddy.add(d, k, weight*acloss.RoundTransverse(diameter/delta))
		skin := acloss.RoundSkin(diameter / delta)
		for a := range d.Phasors {
			x := d.Phasors[a][k]
			c.own[a] += weight * skin * (real(x)*real(x) + imag(x)*imag(x)) / 2
		}
	})
	return c
}

func (f *forms) slab(thickness float64) *conductor {
	c := &conductor{dc: f.direct()}
	f.each(func(d *part.Drive, k int, weight, delta float64) {
		g1, g2 := acloss.Slab(thickness / delta)
		c.slab1.add(d, k, weight*g1)
		c.slab2.add(d, k, weight*g2)
	})
	return c
}

// times returns x'Qy.
func (q *form) times(x, y *[3]float64) float64 {
	sum := 0.0
	for a := range 3 {
		sum += x[a] * (q[a][0]*y[0] + q[a][1]*y[1] + q[a][2]*y[2])
	}
	return sum
}

// along applies q to the mean square of a field that goes linearly from h0 to h1.
func (q *form) along(h0, h1 *[3]float64) float64 {
	return (q.times(h0, h0) + q.times(h1, h1) + q.times(h0, h1)) / 3
}

// stretch is one section as the screening sees it: where its field starts and
// ends, in turns of each winding per metre of breadth.
type stretch struct {
	section
	h0, h1   [3]float64 // 1/m
	breadth  float64    // m, that its layers have
	length   float64    // m, of a turn
	windings []int      // index in the drives, of each name
}

// choice is a winding's wire with what it costs.
type choice struct {
	spool            *spool
	parallel, layers int
	height           float64 // m, of all its sections, bulge included
	mean             float64 // W, weighted by share
}

func (c *choice) coil() coil { return coil{c.spool.Wire, c.parallel, c.layers} }

// A spool is a wire with the figures that the screening asks for again and
// again.
type spool struct {
	wire.Wire
	od      float64 // m
	pitch   float64 // m, of layers: bulge and interleaf included
	r       float64 // ohm/m
	strands float64
	size    *conductor
}

// spools prepares wires for a part.
func (f *forms) spools(wires []wire.Wire, bulge winding.Bulge, interleaf float64) []spool {
	list := make([]spool, len(wires))
	for i, w := range wires {
		p := spool{Wire: w, od: w.OuterDiameter(), strands: float64(max(w.Strands, 1))}
		p.pitch = p.od * (1 + bulge.Of(w))
		if w.Kind == wire.Foil {
			p.pitch = (p.od + interleaf) * (1 + bulge.Of(w))
			p.size = f.foil[w.Thickness]
		} else {
			p.r = w.ResistancePerLength(screenTemperature)
			p.size = f.round[w.Diameter]
		}
		list[i] = p
	}
	return list
}

// quick is a choice before it is worth a copy of its wire.
type quick struct {
	height, mean            float64
	spool, parallel, layers int
}

// side is one electrical side of a part, primary or secondary, about to get its
// wire.
type side struct {
	stretches []stretch
	spools    []spool
	foil      bool // foil may be used
	parallel  int
	room      float64                              // m, height
	pins      func(w wire.Wire, parallel int) bool // whether its ends go on the pins; nil: leads will do
	bend      float64                              // m, corner that its wires go around, over the diameters they ask for; 0: any
	litzBends bool                                 // that holds for litz too
}

// options returns the wires that no other beats in both height and loss, lowest
// first.
func (f *forms) options(s side) []choice {
	var front front
	rho := wire.Resistivity(screenTemperature)
	// Length of turns times field, and times mean square current, of the last
	// conductor size; wires come sorted by size often enough.
	var last *conductor
	field, own := 0.0, 0.0
	fields := map[*conductor][2]float64{}
	for i := range s.spools {
		w := &s.spools[i]
		if w.Kind == wire.Foil {
			if !s.foil || s.pins != nil {
				continue
			}
			q := quick{spool: i, parallel: 1}
			for j := range s.stretches {
				n := s.stretches[j].turns * len(s.stretches[j].names)
				q.layers = max(q.layers, n)
				q.height += float64(n) * w.pitch
			}
			if q.height <= s.room {
				q.mean = f.priceFoil(w.Wire, s.stretches)
				front.add(q)
			}
			continue
		}
		if s.bend > 0 && w.od > s.bend && (w.Kind == wire.Solid || s.litzBends) {
			continue
		}
		if w.size != last {
			last = w.size
			sums, ok := fields[last]
			if !ok {
				for j := range s.stretches {
					st := &s.stretches[j]
					sums[0] += float64(st.turns*len(st.names)) * st.length * last.eddy.along(&st.h0, &st.h1)
					for _, x := range st.windings {
						sums[1] += float64(st.turns) * st.length * last.own[x]
					}
				}
				fields[last] = sums
			}
			field, own = sums[0], sums[1]
		}
		for parallel := 1; parallel <= s.parallel; parallel++ {
			layers, height, ok := stack(s.stretches, w.od, parallel, w.pitch)
			if !ok || height > s.room || s.pins != nil && !s.pins(w.Wire, parallel) {
				continue
			}
			front.add(quick{
				height, w.r/float64(parallel)*own + rho*w.strands*float64(parallel)*field, i, parallel, layers,
			})
		}
	}
	out := make([]choice, len(front))
	for i, q := range front {
		out[i] = choice{&s.spools[q.spool], q.parallel, q.layers, q.height, q.mean}
	}
	return out
}

// A front holds what nothing else beats in both height and loss, lowest first.
type front []quick

// add puts q where it belongs, unless something lower or as low loses no more;
// ties go to what came first.
func (f *front) add(q quick) {
	list := *f
	at := sort.Search(len(list), func(i int) bool { return list[i].height > q.height })
	if at > 0 && list[at-1].mean <= q.mean*(1+1e-9) {
		return
	}
	// What is as low or higher and loses no less goes.
	from, to := at, at
	for from > 0 && list[from-1].height == q.height {
		from--
	}
	for to < len(list) && list[to].mean >= q.mean*(1-1e-9) {
		to++
	}
	*f = slices.Replace(list, from, to, q)
}

// stack finds the number of layers that every section of a side needs for a
// wire, the same for all, and their height. It reports false when the breadth
// is too small or a last layer would be empty.
func stack(stretches []stretch, od float64, parallel int, pitch float64) (layers int, height float64, ok bool) {
	for i := range stretches {
		st := &stretches[i]
		together := parallel * len(st.names)
		room := int(math.Floor(st.breadth/od*(1+1e-9))) - 1
		perLayer := room / together
		if perLayer < 1 {
			return 0, 0, false
		}
		layers = max(layers, (st.turns+perLayer-1)/perLayer)
	}
	for i := range stretches {
		turns := stretches[i].turns
		if layers > turns {
			return 0, 0, false
		}
		if per := (turns + layers - 1) / layers; (layers-1)*per >= turns {
			return 0, 0, false
		}
		height += float64(layers) * pitch
	}
	return layers, height, true
}

// priceFoil returns the loss of a side wound with foil: each turn is a slab
// between two tangential fields.
func (f *forms) priceFoil(w wire.Wire, stretches []stretch) float64 {
	size := f.foil[w.Thickness]
	rho := wire.Resistivity(screenTemperature)
	total := 0.0
	for i := range stretches {
		st := &stretches[i]
		layers := st.turns * len(st.names)
		a := st.h0
		for l := range layers {
			var b [3]float64
			for k := range 3 {
				b[k] = st.h0[k] + float64(l+1)/float64(layers)*(st.h1[k]-st.h0[k])
			}
			x := size.slab1.times(&a, &a) + size.slab1.times(&b, &b) - 4*size.slab2.times(&a, &b)
			total += x * rho / (2 * w.Thickness) * st.breadth * st.length
			total += size.dc[st.windings[l%len(st.windings)]] * rho / (w.Thickness * st.breadth) * st.length
			a = b
		}
	}
	return total
}

// windingIndex is the place of an electrical winding in the drives.
func windingIndex(name string) int {
	switch name {
	case "S-B":
		return 2
	case "S", "S-A":
		return 1
	}
	return 0
}
