package window

import (
	"fmt"
	"math"

	"gapwright/magnetics/acloss"
	"gapwright/magnetics/field"
)

// A Result is the field of a window file. Peak values; 1/m2, J, H, ohm, W. In a
// planar window energy, resistance and loss are per meter of turn and of one
// window; the inductance is that of the full section with both.
type Result struct {
	File     *File
	Net      float64 // A, ampere-turns left over
	Energy   float64 // J, inside the window
	Modes    int     // of the series; 0 at a head
	Orders   int     // of the multipoles of round wires; 0: none were coupled
	GapDrops []float64
	CoreDrop float64 // A

	// Inductance per turn squared, H, of the ampere-turns left over; 0 when there
	// is nothing that takes them.
	Inductance float64

	// OneDimensional is the energy by the one-dimensional formula over the
	// breadth of the window, as a hand check; 0 when it does not apply.
	OneDimensional float64

	Windings []WindingResult
	Methods  []string // that the AC resistances rest on
}

// WindingResult is one winding of a Result.
type WindingResult struct {
	Name         string
	Conductors   int
	AmpereTurns  float64
	MeanH2       float64     // 1/m2, over the block, the wires or the foils
	Grid         [][]float64 // [across][along]
	DCResistance float64     // ohm, of all wires or foils in series; 0 for a block
	Loss         []float64   // W, per frequency
	Ratio        []float64   // loss over I^2 Rdc, per frequency; nil for a block or an idle winding
}

// Unknowns of the coupled system that are affordable, and the highest order
// that is worth it: order 5 is converged to 0.1 % up to 15 skin depths.
const (
	fewUnknowns  = 800
	mostUnknowns = 1800
	mostOrders   = 5
	mostFoils    = 40
)

// Solve computes the field of a checked file.
func Solve(f *File) (*Result, error) {
	list := f.conductors()
	r := &Result{File: f}
	r.Net, _ = balance(list)
	var err error
	if f.Window.Surround == Head {
		err = r.solveHead(list)
	} else {
		err = r.solveCore(list)
	}
	if err != nil {
		return nil, err
	}
	r.oneDimensional(list)
	return r, r.finite()
}

// sampler is what window and head have in common.
type sampler interface {
	acloss.Sampler
	At(x, y float64, hx, hy []float64)
	Mean(r field.Rect, weight float64, xx, yy []float64)
}

// sources turns conductors into rectangles of current. Round wires become
// squares of equal area.
func sources(list []conductor) []field.Source {
	var s []field.Source
	for i := range list {
		c := &list[i]
		s = append(s, field.Source{Rect: c.rect(), AmpereTurns: c.ampereTurns, Wire: c.round})
	}
	return s
}

func (c *conductor) rect() field.Rect {
	if !c.round {
		return field.Rect{X0: c.x0, X1: c.x1, Y0: c.y0, Y1: c.y1}
	}
	return acloss.Wire{X: c.x(), Y: c.y(), Diameter: c.x1 - c.x0}.Square()
}

func (r *Result) solveCore(list []conductor) error {
	w := &r.File.Window
	p := field.Problem{
		Breadth: w.Breadth, Depth: w.Depth, Units: 1,
		CorePermeance: w.UngappedInductance, Sources: sources(list),
	}
	scale := 1.0
	if w.Geometry == RoundPost {
		p.PostRadius = w.PostRadius
	} else {
		p.PostHalfWidth = w.PostHalfWidth
		scale = 2 // one window of two
	}
	for _, g := range w.Gaps {
		p.Gaps = append(p.Gaps, field.Gap(g))
	}
	for _, g := range w.OuterGaps {
		p.OuterGaps = append(p.OuterGaps, field.Gap(g))
	}
	// One window is cheap, so it gets more modes than a search would spend: 128,
	// and enough to see a single wire.
	p.Modes = max(field.ModesFor(&p), 128)
	for i := range list {
		if list[i].round {
			need := math.Ceil(3 * w.Breadth / acloss.EquivalentSquare(list[i].x1-list[i].x0))
			p.Modes = max(p.Modes, int(math.Min(need, 512)))
		}
	}
	var s field.Solver
	if err := s.Solve(&p); err != nil {
		return err
	}
	r.Modes = s.Modes()
	r.Energy = s.Energy(0, 0) / 2
	takes := len(p.Gaps)+len(p.OuterGaps) > 0 || p.CorePermeance > 0
	if _, size := balance(list); takes && math.Abs(r.Net) > balanceSlack*size {
		r.Inductance = scale * s.Inductance(0, 0) / (r.Net * r.Net)
	}
	for g := range len(p.Gaps) + len(p.OuterGaps) {
		r.GapDrops = append(r.GapDrops, s.GapDrop(0, g))
	}
	r.CoreDrop = s.CoreDrop(0)
	return r.windings(list, &p, &s, s.Background)
}

func (r *Result) solveHead(list []conductor) error {
	var s, others field.HeadSolver
	all := sources(list)
	if err := s.Solve(r.File.Window.Breadth, 1, all); err != nil {
		return err
	}
	r.Energy = s.Energy(0, 0) / 2
	// The background of the wires is the field of everything else.
	rest := all[:0:0]
	radius := math.Inf(1)
	for i, c := range all {
		if !c.Wire {
			rest = append(rest, c)
		} else {
			radius = math.Min(radius, (list[i].x1-list[i].x0)/2)
		}
	}
	if err := others.Solve(r.File.Window.Breadth, 1, rest); err != nil {
		return err
	}
	return r.windings(list, nil, &s, acloss.CircleBackground(1, radius, others.At))
}

// length is what a turn at depth x counts, m.
func (r *Result) length(x float64) float64 {
	if r.File.Window.Geometry == RoundPost {
		return 2 * math.Pi * (r.File.Window.PostRadius + x)
	}
	return 1
}

func (r *Result) windings(list []conductor, p *field.Problem, s sampler, background acloss.Background) error {
	f := r.File
	rho := 1 / f.Window.Conductivity
	r.Windings = make([]WindingResult, len(f.Windings))
	volume := make([]float64, len(f.Windings))
	var wires []acloss.Wire
	var at []int // conductor of each wire
	for i := range list {
		c := &list[i]
		w := &r.Windings[c.winding]
		w.Conductors++
		w.AmpereTurns += c.ampereTurns
		length := r.length(c.x())
		kind := &f.Windings[c.winding]
		switch {
		case c.round:
			d := c.x1 - c.x0
			wires = append(wires, acloss.Wire{X: c.x(), Y: c.y(), Diameter: d, Current: c.ampereTurns, Group: c.winding, Length: length})
			at = append(at, i)
			w.DCResistance += rho * length / (math.Pi / 4 * d * d)
		case kind.Foils != nil:
			w.DCResistance += rho * length / ((c.x1 - c.x0) * (c.y1 - c.y0))
		}
		volume[c.winding] += length * (c.x1 - c.x0) * (c.y1 - c.y0)
		if !c.round {
			var xx, yy [1]float64
			s.Mean(c.rect(), length*(c.x1-c.x0)*(c.y1-c.y0), xx[:], yy[:])
			w.MeanH2 += xx[0] + yy[0]
		}
	}
	for i := range f.Windings {
		w := &r.Windings[i]
		w.Name = f.Windings[i].Name
		if g := f.Windings[i].Grid; g != nil {
			w.Grid = grid(s, f.Windings[i].Block, *g)
		}
		if f.Windings[i].Block == nil {
			w.Loss = make([]float64, len(f.Frequencies))
		}
	}
	if len(wires) > 0 {
		if err := r.roundWires(list, wires, at, s, background); err != nil {
			return err
		}
	}
	if err := r.foils(list, p, s); err != nil {
		return err
	}
	for i := range r.Windings {
		w := &r.Windings[i]
		w.MeanH2 /= volume[i]
		if f.Windings[i].Block != nil || *f.Windings[i].Current == 0 {
			continue
		}
		current := *f.Windings[i].Current
		for _, p := range w.Loss {
			w.Ratio = append(w.Ratio, p/(current*current/2*w.DCResistance))
		}
	}
	return nil
}

// roundWires adds loss and mean square field of all round wires. They are
// solved together up to the order that is affordable; more wires than that are
// each taken alone in the field at their center.
func (r *Result) roundWires(list []conductor, wires []acloss.Wire, at []int, s sampler, background acloss.Background) error {
	f := r.File
	rho := 1 / f.Window.Conductivity
	thick := 0.0
	for _, w := range wires {
		for _, hz := range f.Frequencies {
			thick = math.Max(thick, w.Diameter/acloss.SkinDepth(hz, rho))
		}
	}
	r.Orders = min(fewUnknowns/(2*len(wires)), mostOrders)
	if thick <= 1.4 {
		r.Orders = min(r.Orders, 2)
	}
	if r.Orders < 3 && thick > 4 && 6*len(wires) <= mostUnknowns {
		r.Orders = 3
	}
	if r.Orders < 2 && 4*len(wires) <= mostUnknowns {
		r.Orders = 2
	}
	if r.Orders < 1 && 2*len(wires) <= mostUnknowns {
		r.Orders = 1
	}
	if r.Orders < 1 {
		r.isolated(list, wires, at, s)
		r.method(fmt.Sprintf("round wires: %d are too many to couple, each alone in the field at its center; good to 2 %% up to 1.4 skin depths per diameter, here %.3g", len(wires), thick))
		return nil
	}
	var c acloss.Coupled
	e := acloss.Enclosure{Breadth: f.Window.Breadth, Depth: f.Window.Depth, Open: f.Window.Surround == Head}
	if err := c.Prepare(e, wires, 1, r.Orders, background); err != nil {
		return err
	}
	for i := range wires {
		o := &list[at[i]]
		var h2 [1]float64
		c.MeanSquare(i, wires[i].Length*(o.x1-o.x0)*(o.y1-o.y0), h2[:])
		r.Windings[o.winding].MeanH2 += h2[0]
	}
	form := make([]complex128, len(r.Windings))
	for k, hz := range f.Frequencies {
		clear(form)
		if err := c.Loss(acloss.SkinDepth(hz, rho), rho, form); err != nil {
			return err
		}
		for i := range form {
			if f.Windings[i].RoundWires != nil {
				r.Windings[i].Loss[k] += real(form[i]) / 2
			}
		}
	}
	accuracy := ""
	switch {
	case r.Orders == 1 && thick > 2:
		accuracy = ", 4 % low at 5 skin depths per diameter, 14 % at 12"
	case r.Orders == 2 && thick > 4:
		accuracy = ", 1 % low at 5 skin depths per diameter, 5 % at 12"
	}
	if f.Window.Geometry == RoundPost {
		accuracy += ", the curvature of the turns neglected between them"
	}
	r.method(fmt.Sprintf("round wires: all coupled, multipoles of order 1 to %d%s; largest diameter %.3g skin depths", r.Orders, accuracy, thick))
	return nil
}

func (r *Result) isolated(list []conductor, wires []acloss.Wire, at []int, s sampler) {
	rho := 1 / r.File.Window.Conductivity
	var hx, hy [1]float64
	for i := range wires {
		o, w := &list[at[i]], &wires[i]
		out := &r.Windings[o.winding]
		s.At(w.X, w.Y, hx[:], hy[:])
		h2 := hx[0]*hx[0] + hy[0]*hy[0]
		a := w.Diameter / 2
		out.MeanH2 += (h2 + w.Current*w.Current*acloss.BundleOwnField(a)) * w.Length * (o.x1 - o.x0) * (o.y1 - o.y0)
		for k, hz := range r.File.Frequencies {
			x := w.Diameter / acloss.SkinDepth(hz, rho)
			out.Loss[k] += w.Length * rho * (acloss.RoundTransverse(x)*h2 + acloss.RoundSkin(x)*w.Current*w.Current/(2*math.Pi*a*a))
		}
	}
}

// foils adds the loss of all foils, solved together among the other conductors:
// those of the window p, nil at a winding head.
func (r *Result) foils(list []conductor, p *field.Problem, sample sampler) error {
	f := r.File
	rho := 1 / f.Window.Conductivity
	var sheets []acloss.Sheet
	var others []field.Source
	for i, s := range sources(list) {
		c := &list[i]
		if f.Windings[c.winding].Foils == nil {
			others = append(others, s)
			continue
		}
		sheets = append(sheets, acloss.Sheet{Rect: s.Rect, Current: c.ampereTurns, Group: c.winding, Length: r.length(c.x())})
	}
	if len(sheets) == 0 || len(f.Frequencies) == 0 {
		return nil
	}
	if len(sheets) > mostFoils {
		r.slabs(list, sample)
		return nil
	}
	var s acloss.Sheets
	var err error
	if p != nil {
		q := *p
		q.Sources = others
		err = s.Prepare(q, sheets)
	} else {
		err = s.PrepareHead(f.Window.Breadth, 1, others, sheets)
	}
	if err != nil {
		return err
	}
	form := make([]complex128, len(r.Windings))
	for k, hz := range f.Frequencies {
		clear(form)
		if err := s.Loss(acloss.SkinDepth(hz, rho), rho, form); err != nil {
			return err
		}
		for i := range form {
			if f.Windings[i].Foils != nil {
				r.Windings[i].Loss[k] += real(form[i]) / 2
			}
		}
	}
	r.method("foils: current spread over the breadth of every foil by the field, slabs across; 0 to 4 % low beside a gap, 1 % with margins")
	return nil
}

// slabs adds the loss of foils that are too many to solve together.
func (r *Result) slabs(list []conductor, s sampler) {
	rho := 1 / r.File.Window.Conductivity
	for k, hz := range r.File.Frequencies {
		delta := acloss.SkinDepth(hz, rho)
		for i := range list {
			c := &list[i]
			if r.File.Windings[c.winding].Foils == nil {
				continue
			}
			var form [1]float64
			acloss.Foil(s, c.rect(), 0, c.ampereTurns, delta, rho, form[:])
			r.Windings[c.winding].Loss[k] += form[0] / 2 * r.length(c.x())
		}
	}
	r.method("foils: too many to solve together, each a slab in the local field; with margins 1 to 10 % low, up to ten times low beside a gap")
}

func (r *Result) method(text string) {
	for _, m := range r.Methods {
		if m == text {
			return
		}
	}
	r.Methods = append(r.Methods, text)
}

func grid(s sampler, b *Block, n [2]int) [][]float64 {
	dx, dy := (b.X[1]-b.X[0])/float64(n[0]), (b.Y[1]-b.Y[0])/float64(n[1])
	out := make([][]float64, n[0])
	for i := range out {
		out[i] = make([]float64, n[1])
		for j := range out[i] {
			var xx, yy [1]float64
			s.Mean(field.Rect{
				X0: b.X[0] + float64(i)*dx, X1: b.X[0] + float64(i+1)*dx,
				Y0: b.Y[0] + float64(j)*dy, Y1: b.Y[0] + float64(j+1)*dy,
			}, 1, xx[:], yy[:])
			out[i][j] = xx[0] + yy[0]
		}
	}
	return out
}

// oneDimensional fills the hand check: the leakage formula over the breadth of
// the window, for balanced windings that lie one above the other.
func (r *Result) oneDimensional(list []conductor) {
	if _, size := balance(list); math.Abs(r.Net) > balanceSlack*size || r.File.Window.Geometry != Planar {
		return
	}
	type span struct{ x0, x1, at float64 }
	spans := make([]span, len(r.File.Windings))
	for i := range spans {
		spans[i].x0 = math.Inf(1)
	}
	for i := range list {
		c := &list[i]
		s := &spans[c.winding]
		s.x0, s.x1, s.at = math.Min(s.x0, c.x0), math.Max(s.x1, c.x1), s.at+c.ampereTurns
	}
	// From the post outward; windings side by side are no layers.
	for i := range spans {
		for j := i; j > 0 && spans[j].x0 < spans[j-1].x0; j-- {
			spans[j], spans[j-1] = spans[j-1], spans[j]
		}
	}
	var sections []field.Section1D
	x := 0.0
	for _, s := range spans {
		if s.x0 < x-slack*r.File.Window.Depth {
			return
		}
		sections = append(sections, field.Section1D{Height: s.x0 - x}, field.Section1D{Height: s.x1 - s.x0, AmpereTurns: s.at})
		x = s.x1
	}
	r.OneDimensional = field.Leakage1D(r.File.Window.Breadth, sections)
}

// finite refuses a result that is not.
func (r *Result) finite() error {
	ok := func(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }
	good := ok(r.Energy) && ok(r.Inductance) && ok(r.OneDimensional)
	for i := range r.Windings {
		w := &r.Windings[i]
		good = good && ok(w.MeanH2) && ok(w.DCResistance)
		for _, v := range w.Loss {
			good = good && ok(v)
		}
		for _, v := range w.Ratio {
			good = good && ok(v)
		}
		for _, row := range w.Grid {
			for _, v := range row {
				good = good && ok(v)
			}
		}
	}
	if !good {
		return fmt.Errorf("window of %g x %g m: the result is not finite", r.File.Window.Depth, r.File.Window.Breadth)
	}
	return nil
}
