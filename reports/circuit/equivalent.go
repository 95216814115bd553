package circuit

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"

	"gapwright/magnetics/design"
)

// An Equivalent is the network of a part as elements: coupled windings, the
// resistance of each to direct current, and ladders for the eddy currents.
//
// Eddy currents follow the field, and the field is not a matter of one winding:
// of a primary under its secondary some more current in either can lessen the
// loss of the other. So the ladders do not sit in the windings. Each belongs to
// one pattern of currents and carries how much of it flows: the first the
// current that the windings carry against each other (short circuit), the second
// what is left to magnetize the gap, the third what circulates between the halves
// of a center tap. What the patterns lose together is taken out of the later ones
// over a band of frequencies, so that the losses add up. Where the field changes
// so much with frequency that one band does not do, there are ladders of a low and
// of a high band; and where even these do not, as with foils and thick wires in
// stacked halves, more for the field at single places in the window.
type Equivalent struct {
	design.Network
	DC    []float64   // ohm, of each winding
	Coils [][]float64 // H, of the coupled coils: L less what the ladders have at Frequency
	Modes []Mode
	Cases []Case
}

// A Mode is one pattern of currents with its ladder.
type Mode struct {
	Name   string
	Weight []float64 // of each winding's current in the ladder's
	Ladder []Section
}

// A Case is an excitation at which the elements are held against the field.
type Case struct {
	Name       string
	Resistance []float64 // ohm, of the field, at 1 .. NetworkOrders times Frequency
	Fitted     []float64 // ohm, of the elements
	Inductance float64   // H, of the field
	AtFirst    float64   // H, of the elements at Frequency
}

// Error returns the largest relative deviation of the resistance up to an order.
func (c Case) Error(orders int) float64 {
	worst := 0.0
	for k := range min(orders, len(c.Fitted)) {
		worst = math.Max(worst, math.Abs(c.Fitted[k]/c.Resistance[k]-1))
	}
	return worst
}

// Error returns the largest of all cases and orders.
func (e *Equivalent) Error() float64 {
	worst := 0.0
	for _, c := range e.Cases {
		worst = math.Max(worst, c.Error(design.NetworkOrders))
	}
	return worst
}

// Corner frequencies of the ladders reach so many times the highest frequency
// that is fitted. A higher one fits better but makes the ladder's inductance
// larger, so the first that is good enough is taken, or the best of those that
// leave coupled windings possible.
var gridTops = []float64{1.5, 3, 6, 12}

// Aim is the relative deviation of the resistance that is aimed at.
const Aim = 0.03

// enough is the relative deviation at which no ladders of single places are
// added: half of what is aimed at.
const enough = 0.015

// goodEnough is the relative deviation at which no better fit is looked for:
// a sixth of what is aimed at.
const goodEnough = 0.005

// NewEquivalent fits the elements of a network.
func NewEquivalent(n design.Network) (*Equivalent, error) {
	e := &Equivalent{Network: n}
	e.apart()
	for i := range n.Windings {
		e.DC = append(e.DC, n.R[0][i][i])
	}
	orders := len(n.R) - 1
	var best []Mode
	least := math.Inf(1)
	// One band, then two, then the fields of single places in the window; if need
	// be without the ladders between the halves, whose inductance two halves in one
	// bundle have no room for.
	var modes []Mode
	for _, bands := range [][][2]int{{{1, orders}}, {{1, min(2, orders)}, {max(orders/2, 1), orders}}, {}} {
		for _, band := range bands {
			list, err := e.modes(band)
			if err != nil {
				return nil, err
			}
			modes = append(modes, list...)
		}
		if len(bands) == 0 {
			if least < enough {
				break
			}
			modes = append(modes, e.places()...)
		}
		e.try(modes, &best, &least)
		if math.IsInf(least, 1) {
			e.try(slices.DeleteFunc(slices.Clone(modes), func(m Mode) bool { return m.Name == betweenHalves }), &best, &least)
		}
		if least < goodEnough {
			break
		}
	}
	e.Modes = best
	if !e.setCoils() {
		return nil, fmt.Errorf("%s: the inductances %v make no coupled windings", n.Part, n.L)
	}
	e.compare()
	return e, nil
}

// try fits the ladders of modes and keeps them in best when their error is less.
func (e *Equivalent) try(modes []Mode, best *[]Mode, least *float64) {
	for _, top := range gridTops {
		e.Modes = e.ladders(modes, top)
		if !e.setCoils() {
			continue
		}
		e.compare()
		if x := e.Error(); x < *least {
			*best, *least = e.Modes, x
		}
		if *least < goodEnough {
			return
		}
	}
}

// ladders returns the modes with the ladders that come nearest to the eddy loss
// of every direction of the currents that tells something, relative to the whole
// loss there.
func (e *Equivalent) ladders(modes []Mode, top float64) []Mode {
	orders := len(e.R) - 1
	first := 2 * math.Pi * e.Frequency
	var corners []float64
	for x := top * first * float64(orders); x > first/30; x /= gridRatio {
		corners = append(corners, x)
	}
	directions := e.directions()
	a := mat.NewDense(len(directions)*orders, len(modes)*len(corners), nil)
	b := make([]float64, len(directions)*orders)
	for d, v := range directions {
		dc := form(e.R[0], v, v)
		for k := range orders {
			row := d*orders + k
			whole := math.Max(form(e.R[k+1], v, v), dc)
			b[row] = (whole - dc) / whole
			for m := range modes {
				y := 0.0
				for i, w := range modes[m].Weight {
					y += w * v[i]
				}
				for j, c := range corners {
					u := first * float64(k+1) / c
					u *= u
					a.Set(row, m*len(corners)+j, y*y*u/(1+u)/whole)
				}
			}
		}
	}
	x := notNegative(a, b)
	var out []Mode
	for m := range modes {
		mode := Mode{Name: modes[m].Name, Weight: modes[m].Weight}
		for j, c := range corners {
			if r := x[m*len(corners)+j]; r > leastSection*e.DC[0] {
				mode.Ladder = append(mode.Ladder, Section{R: r, L: r / c})
			}
		}
		if mode.Ladder != nil {
			out = append(out, mode)
		}
	}
	return out
}

// leastSection is the resistance, of that of the first winding to direct current,
// below which a section is left out.
const leastSection = 1e-6

// places returns modes for the field at single places in the window: some of the
// ampere-turns of each winding, as between them and beside them. The fit takes the
// few it needs.
func (e *Equivalent) places() []Mode {
	shares := []float64{-0.5, 0, 0.25, 0.5, 0.75, 1, 1.5}
	w := len(e.Windings)
	turns := func(i int) float64 { return float64(e.Turns[i]) / float64(e.Turns[0]) }
	var list []Mode
	add := func(weight ...float64) { list = append(list, Mode{Name: "field at one place", Weight: weight}) }
	switch w {
	case 2:
		for _, x := range shares {
			add(1, x*turns(1))
		}
		add(0, 1)
	case 3:
		for _, x := range shares {
			for _, y := range shares {
				add(1, x*turns(1), y*turns(2))
			}
		}
		for _, y := range shares {
			add(0, 1, y)
		}
		add(0, 0, 1)
		add(0, 1, -1)
	}
	return list
}

// directions are the currents at which the ladders are fitted: each winding
// alone, each secondary shorted, all of them together, and between them.
func (e *Equivalent) directions() [][]float64 {
	w := len(e.Windings)
	var list [][]float64
	for a := range w {
		alone := make([]float64, w)
		alone[a] = 1
		list = append(list, alone)
		if a > 0 {
			short := make([]float64, w)
			short[0], short[a] = 1, -e.L[0][a]/e.L[a][a]
			list = append(list, short)
		}
	}
	if w == 3 {
		list = append(list, []float64{1, -e.L[0][1] / e.L[1][1] / 2, -e.L[0][2] / e.L[2][2] / 2}, []float64{0, 1, -1})
	}
	return list
}

// leastLeakage is how much the leakage between two halves wound as one bundle may
// add to the short-circuit inductance of either, of that. The field knows the
// halves as the same turns and gives none; coupled inductors that are one cannot
// be simulated, and the eddy currents between the halves need some inductance to
// be taken out of. It is a fifth of what the inductances are promised within.
const leastLeakage = 2e-4

// apart parts halves that are coupled as one.
func (e *Equivalent) apart() {
	if len(e.Windings) != 3 || len(e.L) != 3 {
		return
	}
	l := make([][]float64, 3)
	for i := range l {
		l[i] = slices.Clone(e.L[i])
	}
	least := math.Inf(1)
	for s := 1; s < 3; s++ {
		ratio := l[0][s] / l[s][s]
		least = math.Min(least, leastLeakage*(l[0][0]/(ratio*ratio)-l[s][s]))
	}
	if d := least - (l[1][1]+l[2][2]-2*l[1][2])/4; d > 0 {
		l[1][1] += d
		l[2][2] += d
		l[1][2] -= d
		l[2][1] -= d
	}
	e.L = l
}

// form returns u R v.
func form(r [][]float64, u, v []float64) float64 {
	sum := 0.0
	for a := range u {
		for b := range v {
			sum += u[a] * r[a][b] * v[b]
		}
	}
	return sum
}

// betweenHalves is the mode of a center tap that two halves in one bundle cannot
// have.
const betweenHalves = "between the halves"

// modes returns the patterns of currents whose losses add up over a band of
// orders.
func (e *Equivalent) modes(band [2]int) ([]Mode, error) {
	w := len(e.Windings)
	var list [][]float64
	var modes []Mode
	switch w {
	case 1:
		list = [][]float64{{1}}
		modes = []Mode{{Name: "winding"}}
	case 2, 3:
		short, open := make([]float64, w), make([]float64, w)
		short[0], open[0] = 1, 1
		for s := 1; s < w; s++ {
			short[s] = -e.L[0][s] / e.L[s][s] / float64(w-1)
		}
		list = [][]float64{short, open}
		modes = []Mode{{Name: "short circuit"}, {Name: "magnetizing"}}
		if w == 3 {
			list = append(list, []float64{0, 1, -1})
			modes = append(modes, Mode{Name: betweenHalves})
		}
	default:
		return nil, fmt.Errorf("%s: an equivalent circuit of %d windings is not known", e.Part, w)
	}
	// The eddy loss of the band, each order counting alike.
	mean := make([][]float64, w)
	for a := range mean {
		mean[a] = make([]float64, w)
	}
	for _, r := range e.R[band[0] : band[1]+1] {
		size := 0.0
		for a := range w {
			size += (r[a][a] - e.R[0][a][a]) / e.DC[a]
		}
		if !(size > 0) {
			continue
		}
		for a := range w {
			for b := range w {
				mean[a][b] += (r[a][b] - e.R[0][a][b]) / size
			}
		}
	}
	for i := range list {
		for j := range i {
			own := form(mean, list[j], list[j])
			if !(own > 0) {
				continue
			}
			share := form(mean, list[j], list[i]) / own
			for a := range w {
				list[i][a] -= share * list[j][a]
			}
		}
	}
	columns := mat.NewDense(w, w, nil)
	for i, p := range list {
		columns.SetCol(i, p)
	}
	var inverse mat.Dense
	if err := inverse.Inverse(columns); err != nil {
		return nil, fmt.Errorf("%s: the patterns of currents are too alike: %w", e.Part, err)
	}
	for i := range modes {
		modes[i].Weight = mat.Row(nil, i, &inverse)
	}
	return modes, nil
}

// setCoils takes the inductance of the ladders out of the windings, so that the
// whole has L at the frequency of the corner. It reports whether coupled windings
// with that inductance exist.
func (e *Equivalent) setCoils() bool {
	w := len(e.Windings)
	omega := 2 * math.Pi * e.Frequency
	e.Coils = make([][]float64, w)
	sym := mat.NewSymDense(w, nil)
	for a := range w {
		e.Coils[a] = make([]float64, w)
		for b := range w {
			e.Coils[a][b] = (e.L[a][b] + e.L[b][a]) / 2
			for _, m := range e.Modes {
				e.Coils[a][b] -= m.Weight[a] * m.Weight[b] * imag(impedance(m.Ladder, omega)) / omega
			}
		}
	}
	for a := range w {
		for b := a; b < w; b++ {
			sym.SetSym(a, b, e.Coils[a][b]/math.Sqrt(e.L[a][a]*e.L[b][b]))
		}
	}
	var c mat.Cholesky
	return c.Factorize(sym)
}

// compare fills Cases.
func (e *Equivalent) compare() {
	w := len(e.Windings)
	e.Cases = nil
	name := "short"
	for s := -1; s < w; s++ {
		c := Case{Name: "open"}
		switch {
		case s == 0:
			continue
		case s > 0:
			c.Name = name + " " + e.Windings[s]
		case w == 1:
			c.Name = "winding"
		}
		for k := 1; k < len(e.R); k++ {
			omega := 2 * math.Pi * e.Frequency * float64(k)
			field := terminal(s, func(a, b int) complex128 { return complex(e.R[k][a][b], omega*e.L[a][b]) })
			elements := terminal(s, func(a, b int) complex128 { return e.impedance(omega, a, b) })
			c.Resistance = append(c.Resistance, real(field))
			c.Fitted = append(c.Fitted, real(elements))
			if k == 1 {
				c.Inductance, c.AtFirst = imag(field)/omega, imag(elements)/omega
			}
		}
		e.Cases = append(e.Cases, c)
	}
}

// impedance returns one entry of the impedance matrix of the elements.
func (e *Equivalent) impedance(omega float64, a, b int) complex128 {
	z := complex(0, omega*e.Coils[a][b])
	if a == b {
		z += complex(e.DC[a], 0)
	}
	for _, m := range e.Modes {
		z += complex(m.Weight[a]*m.Weight[b], 0) * impedance(m.Ladder, omega)
	}
	return z
}

// terminal returns the impedance of the first winding with winding s shorted;
// s below 1: nothing is.
func terminal(s int, z func(a, b int) complex128) complex128 {
	if s < 1 {
		return z(0, 0)
	}
	return z(0, 0) - z(0, s)*z(s, 0)/z(s, s)
}
