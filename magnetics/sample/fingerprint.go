package sample

import (
	"errors"
	"fmt"
	"math"
	"sort"
	"strings"

	"gonum.org/v1/gonum/mat"

	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
)

// A Design is what readings are compared with: the nominal values and how they
// depend on what the shop can get wrong.
type Design struct {
	Primary     string // names of the windings
	Secondaries []string
	Np          int
	Ns          []int
	Nominal     Readings

	CoreShare   float64    // part of 1/Lp that is the core and not the gap
	GapSlope    float64    // relative change of Lp per m of gap, negative
	BarrierLeak [2]float64 // d ln Lsc / d ln (barrier thickness), of half A and half B
	BarrierC    float64    // d ln C / d ln (barrier thickness), negative
	ShortBoth   float64    // H, Lsc with both halves shorted; 0: taken as nine tenths of the smaller half
	FacesGlued  bool
	// How far inductances per turn squared are known to agree with the primary's:
	// of the secondaries together, and of one half against the other.
	LinkSpread, HalfSpread float64
	StrandsTotal           map[string]int // of all wires in hand of a winding, for the words; optional
}

// Spread is what builds without a fault differ by: standard deviations,
// relative unless a unit is given.
type Spread struct {
	Permeability float64
	Area         float64
	Gap          float64 // m, of the ground length or the film
	Glue         float64 // m, of the line between one pair of faces
	Leakage      float64 // of both halves together
	LeakageHalf  float64 // of each half by itself
	Capacitance  float64
	Resistance   float64 // of all windings together: copper, temperature
	Winding      float64 // of each winding by itself: length of turns
	Resonance    float64 // of the estimate
	Meter        Meter
}

// UsualSpread is what good shops scatter by: half of the usual tolerances, since
// these hold nearly all parts.
var UsualSpread = Spread{
	Permeability: 0.125, Area: 0.015, Gap: 15e-6, Glue: 5e-6, Leakage: 0.05, LeakageHalf: 0.01, Capacitance: 0.1,
	Resistance: 0.015, Winding: 0.007, Resonance: 0.2, Meter: BenchMeter,
}

// NewInductorDesign gathers a design from the inductor and its rating. Only the
// faults of core, gap, turns and wire are known to it.
func NewInductorDesign(l part.Inductor, r part.Rating) (Design, error) {
	if len(l.Windings) == 0 || !(r.OpenInductance > 0) {
		return Design{}, fmt.Errorf("an inductor with %d windings and %g H", len(l.Windings), r.OpenInductance)
	}
	w := l.Windings[0]
	d := Design{Primary: w.Name, Np: w.Turns, GapSlope: r.Gap.Sensitivity}
	d.FacesGlued = l.Glue.Faces != "" && l.Glue.Faces != "none"
	if r.Gap.Ungapped > 0 && r.Gap.AL > 0 {
		d.CoreShare = math.Min(1, r.Gap.AL/r.Gap.Ungapped)
	}
	d.Nominal = Readings{Open: r.OpenInductance, OpenBefore: r.OpenInductance, Quality: 100}
	if f := part.SelfResonance(r.OpenInductance, r.SelfCapacitance); f > 0 {
		d.Nominal[Resonance] = f
	}
	d.wires(r)
	return d, nil
}

// wires adds the nominal resistances.
func (d *Design) wires(r part.Rating) {
	for _, w := range r.Windings {
		if w.DCResistance > 0 {
			d.Nominal[Resistance(w.Name)] = w.DCResistance
			if l := float64(w.Turns) * w.MeanLengthOfTurn; l > 0 {
				d.Nominal[Reel(w.Name)] = w.DCResistance / l
			}
		}
	}
}

// NewDesign gathers a design from the transformer and its rating.
func NewDesign(t part.Transformer, r part.Rating) (Design, error) {
	if len(t.Windings) < 2 {
		return Design{}, errors.New("a fingerprint needs a primary and a secondary")
	}
	p := t.Windings[0]
	d := Design{Primary: p.Name, Np: p.Turns, Nominal: Readings{}, GapSlope: r.Gap.Sensitivity, BarrierC: -0.8}
	d.FacesGlued = t.Glue.Faces != "" && t.Glue.Faces != "none"
	for _, s := range t.Windings[1:] {
		d.Secondaries = append(d.Secondaries, s.Name)
		d.Ns = append(d.Ns, s.Turns)
	}
	if r.Gap.Ungapped > 0 && r.Gap.AL > 0 {
		d.CoreShare = math.Min(1, r.Gap.AL/r.Gap.Ungapped)
	}
	for i, name := range d.Secondaries {
		if i < len(d.BarrierLeak) {
			d.BarrierLeak[i] = barrierShare(t.Construction, r.Section, name)
		}
	}
	lp, ls := r.OpenInductance, r.SecondaryInductance
	if !(lp > 0) || !(r.ShortInductance > 0) || !(r.ShortInductance < lp) {
		return Design{}, fmt.Errorf("the rating has Lp %g H and Lsc %g H", lp, r.ShortInductance)
	}
	halves := r.ShortHalves
	if len(halves) == 0 {
		halves = []float64{r.ShortInductance}
	}
	n := d.Nominal
	n[Open], n[OpenBefore] = lp, lp
	if ls > 0 {
		n[Secondary] = ls
	}
	n[ShortA] = halves[0]
	turns := float64(d.Np) / float64(d.Ns[0])
	n[RatioP], n[RatioS] = part.OpenRatios(lp, ls, halves[0], turns)
	if ls > 0 {
		d.LinkSpread = 1e-3 + 0.25*math.Abs(math.Log(ls*turns*turns/lp))
	}
	if len(d.Ns) > 1 && len(halves) > 1 {
		n[ShortB] = halves[1]
		q := float64(d.Ns[0]) / float64(d.Ns[1])
		n[RatioB], _ = part.OpenRatios(lp, ls/(q*q), halves[1], turns*q)
		d.HalfSpread = math.Abs(halves[0]-halves[1]) / lp
	}
	if r.InterwindingCapacity > 0 {
		n[Capacitance] = r.InterwindingCapacity
	}
	if f := part.SelfResonance(lp, r.SelfCapacitance); f > 0 {
		n[Resonance] = f
	}
	n[Quality] = 100 // only how many times it falls matters
	d.wires(r)
	return d, nil
}

// barrierShare returns d ln Lsc / d ln (barrier thickness) of concentric
// windings, from the trapezoids of ampere-turns across the window: a layer with
// the mmf rising from a to b stores (a² + ab + b²)/3 per height, insulation a².
// Only the ratios matter. Side by side, where no trapezoids stand, it is a half.
func barrierShare(c part.Construction, s winding.Section, shorted string) float64 {
	type slab struct {
		x0, x1, mmf float64
		barrier     bool
	}
	turns := map[string]int{}
	for _, w := range c.Windings {
		turns[w.Name] = w.Turns
	}
	primary := c.Windings[0].Name
	var slabs []slab
	for _, l := range s.Layers {
		sum := 0.0
		for _, of := range l.Of {
			switch of {
			case primary:
				sum += float64(l.Turns) / float64(turns[primary])
			case shorted:
				sum -= float64(l.Turns) / float64(turns[shorted])
			}
		}
		slabs = append(slabs, slab{x0: l.X0, x1: l.X1, mmf: sum})
	}
	for _, in := range s.Insulation {
		if in.Entry < len(c.Build) && c.Build[in.Entry].Chamber > 0 {
			return 0.5
		}
		barrier := in.Entry < len(c.Build) && c.Build[in.Entry].Purpose == "barrier"
		slabs = append(slabs, slab{x0: in.X0, x1: in.X1, barrier: barrier})
	}
	sort.SliceStable(slabs, func(i, j int) bool { return slabs[i].x0 < slabs[j].x0 })
	m, all, barriers := 0.0, 0.0, 0.0
	for _, b := range slabs {
		after := m + b.mmf
		e := (m*m + m*after + after*after) / 3 * (b.x1 - b.x0)
		all += e
		if b.barrier {
			barriers += e
		}
		m = after
	}
	if !(all > 0) {
		return 0.5
	}
	// A barrier that is thick moves the outer windings out: their turns grow, a
	// few per cent that are left out here.
	return barriers / all
}

// A Class is a kind of fault.
type Class string

// The kinds of fault. NoFault is the build as designed.
const (
	NoFault        Class = "within the usual spread"
	ReluctanceHigh Class = "gap too long"
	ReluctanceLow  Class = "gap too short or missing"
	PrimaryTurn    Class = "primary turns miscounted"
	SecondaryTurn  Class = "secondary turns miscounted"
	ShortedTurn    Class = "shorted turn"
	StrandsLost    Class = "strands lost in one winding"
	WireWrong      Class = "wire or turn length wrong everywhere"
	BarrierThick   Class = "barrier too thick"
	BarrierThin    Class = "barrier too thin"
	HalvesUnequal  Class = "halves unequal"
	WrongShort     Class = "wrong half shorted"
	PoorShort      Class = "poor short in the leakage test"
)

// truth is a build as it could be: the designed one and deviations. Logarithms
// of factors unless a unit is given.
type truth struct {
	turns               float64   // of the primary, added
	half                []float64 // of each secondary, added
	core, area          float64
	gap, glue           float64 // m
	leak                float64
	leakHalf            [2]float64
	capacitance         float64
	barrier             float64
	link                float64    // of Ls
	linkHalf            [2]float64 // of Ls of each half
	wire                float64    // of all windings
	winding             []float64  // of each, primary first
	reel                []float64  // of each, of the wire itself
	resonance           float64
	shorted             float64 // part of the flux that a shorted turn takes away
	loop                float64 // H, on the secondary side, left in the short
	swap                string  // readings of Lsc: "", swapped, A twice, B twice, both at once, both at once in A
	quality             float64
	permeanceAfterOnly  float64 // of the joint as glued
	permeanceBothStages float64
}

// predict returns the readings of a build.
func (d Design) predict(t truth) Readings {
	at := func(list []float64, i int) float64 {
		if i < len(list) {
			return list[i]
		}
		return 0
	}
	np := (float64(d.Np) + t.turns) / float64(d.Np)
	ns := make([]float64, len(d.Ns))
	for i, n := range d.Ns {
		ns[i] = (float64(n) + at(t.half, i)) / float64(n)
	}
	permeance := func(film float64) float64 {
		// Reluctance of core and gap over their sum.
		core := d.CoreShare * math.Exp(-t.core-t.area)
		gap := (1 - d.CoreShare) * math.Exp(-t.area)
		// A longer gap adds reluctance; the slope is that of the whole.
		return math.Max(1e-6, 1/math.Max(1e-3, core+gap-d.GapSlope*film))
	}
	flux := 1 - t.shorted
	before := permeance(t.gap) * math.Exp(t.permeanceBothStages) * flux
	after := permeance(t.gap+2*t.glue) * math.Exp(t.permeanceBothStages+t.permeanceAfterOnly) * flux
	out := Readings{}
	n := d.Nominal
	set := func(q Quantity, factor float64) {
		if v, ok := n[q]; ok {
			out[q] = v * factor
		}
	}
	set(OpenBefore, np*np*before)
	set(Open, np*np*after)
	names := append([]string{d.Primary}, d.Secondaries...)
	for i, name := range names {
		turns := np
		if i > 0 {
			turns = ns[i-1]
		}
		set(Resistance(name), turns*math.Exp(t.wire+at(t.winding, i)+at(t.reel, i)))
		set(Reel(name), math.Exp(at(t.reel, i)))
	}
	set(Quality, math.Exp(t.quality))
	if n[Open] > 0 {
		set(Resonance, math.Exp(t.resonance)/math.Sqrt(out[Open]/n[Open]))
	}
	if len(ns) == 0 {
		return out
	}
	set(Secondary, ns[0]*ns[0]*after)
	leak := math.Exp(t.leak)
	shorts := [2]float64{}
	for i, q := range []Quantity{ShortA, ShortB} {
		if v, ok := n[q]; ok {
			shorts[i] = v * np * np * leak * math.Exp(t.leakHalf[i]+d.BarrierLeak[i]*t.barrier)
		}
	}
	lp := out[Open]
	coupling := func(i int) float64 {
		return math.Sqrt(math.Max(0.02, 1-math.Min(shorts[i]/lp, 0.98)))
	}
	// The ratios are Lp/M and M/Ls with M² = (Lp - Lsc) Ls.
	k0 := math.Sqrt(math.Max(0.02, 1-n[ShortA]/n[Open]))
	k := coupling(0)
	link := math.Exp((t.link + t.linkHalf[0]) / 2)
	if _, ok := out[Secondary]; ok {
		out[Secondary] *= link * link
	}
	set(RatioP, np/ns[0]*k0/k/link)
	set(RatioS, np/ns[0]*k/k0/link)
	ratio := float64(d.Np) / float64(d.Ns[0]) * np / ns[0]
	read := shorts
	both := d.ShortBoth
	if both == 0 {
		both = 0.9 * math.Min(n[ShortA], math.Max(n[ShortB], n[ShortA]*boolFloat(n[ShortB] == 0)))
	}
	both *= np * np * leak * math.Exp(d.BarrierLeak[0]*t.barrier)
	if len(d.Ns) > 1 && n[ShortB] > 0 {
		k0 := math.Sqrt(math.Max(0.02, 1-n[ShortB]/n[Open]))
		set(RatioB, np/ns[1]*k0/coupling(1)/math.Exp((t.link+t.linkHalf[1])/2))
		switch t.swap {
		case "swapped":
			read = [2]float64{shorts[1], shorts[0]}
		case "A twice":
			read = [2]float64{shorts[0], shorts[0]}
		case "B twice":
			read = [2]float64{shorts[1], shorts[1]}
		case "both at once":
			read = [2]float64{both, both}
		case "both at once in A":
			read = [2]float64{both, shorts[1]}
		case "both at once in B":
			read = [2]float64{shorts[0], both}
		}
		out[ShortB] = read[1] + ratio*ratio*t.loop
	}
	out[ShortA] = read[0] + ratio*ratio*t.loop
	set(Capacitance, math.Exp(t.capacitance+d.BarrierC*t.barrier))
	return out
}

func boolFloat(b bool) float64 {
	if b {
		return 1
	}
	return 0
}

// nuisance lists the ways in which sound builds differ, each of one standard
// deviation.
func (d Design) nuisance(s Spread) []truth {
	names := 1 + len(d.Secondaries)
	list := []truth{
		{core: s.Permeability}, {area: s.Area}, {gap: s.Gap}, {glue: s.Glue}, {leak: s.Leakage},
		{leakHalf: [2]float64{s.LeakageHalf, 0}}, {leakHalf: [2]float64{0, s.LeakageHalf}},
		{capacitance: s.Capacitance}, {wire: s.Resistance}, {resonance: s.Resonance}, {loop: s.Meter.ShortLoop}, {quality: 0.5},
	}
	if d.LinkSpread > 0 {
		list = append(list, truth{link: d.LinkSpread})
	}
	if d.HalfSpread > 0 {
		list = append(list, truth{linkHalf: [2]float64{d.HalfSpread, 0}}, truth{linkHalf: [2]float64{0, d.HalfSpread}})
	}
	for i := range names {
		w := make([]float64, names)
		w[i] = s.Winding
		list = append(list, truth{winding: w})
	}
	return list
}

// a hypothesis is one fault of one size.
type hypothesis struct {
	class Class
	cause string // in words, without its size
	weigh float64
	build truth
	size  string
	loose map[Quantity]float64 // additional deviation of readings that the fault makes uncertain
}

// A Cause is one kind of fault as it explains the readings.
type Cause struct {
	Class       Class
	Text        string  // what happened, with the size that fits best
	Probability float64 // among the kinds known here, all equally likely beforehand
	Misfit      float64 // root mean square of the deviations left, in standard deviations
	Expected    Readings
}

// A Diagnosis is the causes in the order of likelihood, and the one further
// measurement that separates the first two best.
type Diagnosis struct {
	Causes []Cause
	Next   string // what to measure next, in words; empty when nothing is needed
	Reason string // what the first two causes predict for it
	Used   []Quantity
}

// Explain ranks the causes of a set of readings. At least three readings are
// needed; with fewer the error says which are missing.
//
// Every cause is a pattern over the readings, computed from this design's own
// dependence on turns, gap, barrier and wire, and tried in a range of sizes. A
// pattern is judged by the normal distribution of what sound builds scatter
// (permeability, area, gap, glue, leakage, wire, each acting on all readings
// that it touches) and of the meter. The size of a fault is not known
// beforehand: its likelihood is the mean over the sizes.
func Explain(d Design, r Readings, s Spread) (Diagnosis, error) {
	known := r.quantities(d.Nominal)
	if len(known) < 3 {
		return Diagnosis{}, fmt.Errorf("%d readings that the design has a value for; at least 3 are needed: inductance before and after glue, resistances, of a transformer also both ratios and Lsc of each half", len(known))
	}
	y := make([]float64, len(known))
	for i, q := range known {
		y[i] = math.Log(r[q] / d.Nominal[q])
	}
	base := logs(d.predict(truth{}), d, known)
	cov := d.covariance(known, base, s)

	type total struct {
		sum, best float64
		at        hypothesis
		misfit    float64
		seen      bool
	}
	totals := map[Class]*total{}
	hyps := d.hypotheses(s)
	logL := make([]float64, len(hyps))
	misfits := make([]float64, len(hyps))
	for i, h := range hyps {
		x := logs(d.predict(h.build), d, known)
		residual := make([]float64, len(known))
		for j := range known {
			residual[j] = y[j] - x[j]
		}
		c := cov
		if len(h.loose) > 0 {
			c = mat.NewSymDense(len(known), nil)
			c.CopySym(cov)
			for j, q := range known {
				if v := h.loose[q]; v > 0 {
					c.SetSym(j, j, c.At(j, j)+v*v)
				}
			}
		}
		l, chi, ok := density(residual, c)
		if !ok {
			return Diagnosis{}, errors.New("the spread given makes readings that determine each other exactly: state the meter's deviation")
		}
		logL[i], misfits[i] = l, math.Sqrt(chi/float64(len(known)))
	}
	top := math.Inf(-1)
	for _, l := range logL {
		top = math.Max(top, l)
	}
	sum := 0.0
	for i, h := range hyps {
		p := h.weigh * math.Exp(logL[i]-top)
		t := totals[h.class]
		if t == nil {
			t = &total{}
			totals[h.class] = t
		}
		t.sum += p
		sum += p
		if !t.seen || logL[i] > t.best {
			t.seen, t.best, t.at, t.misfit = true, logL[i], h, misfits[i]
		}
	}
	out := Diagnosis{Used: known}
	for class, t := range totals {
		text := t.at.cause
		if t.at.size != "" {
			text += ", " + t.at.size
		}
		out.Causes = append(out.Causes, Cause{Class: class, Text: text, Probability: t.sum / sum, Misfit: t.misfit, Expected: d.predict(t.at.build)})
	}
	sort.Slice(out.Causes, func(i, j int) bool {
		a, b := out.Causes[i], out.Causes[j]
		if a.Probability != b.Probability {
			return a.Probability > b.Probability
		}
		if a.Misfit != b.Misfit {
			return a.Misfit < b.Misfit
		}
		return a.Class < b.Class
	})
	out.separate(d, r, s)
	return out, nil
}

// logs returns the logarithms of readings over their nominal values.
func logs(r Readings, d Design, known []Quantity) []float64 {
	out := make([]float64, len(known))
	for i, q := range known {
		out[i] = math.Log(math.Max(r[q], 1e-30) / d.Nominal[q])
	}
	return out
}

// covariance is that of sound builds around the design.
func (d Design) covariance(known []Quantity, base []float64, s Spread) *mat.SymDense {
	n := len(known)
	c := mat.NewSymDense(n, nil)
	for _, t := range d.nuisance(s) {
		x := logs(d.predict(t), d, known)
		for i := range n {
			for j := i; j < n; j++ {
				c.SetSym(i, j, c.At(i, j)+(x[i]-base[i])*(x[j]-base[j]))
			}
		}
	}
	for i, q := range known {
		m := s.Meter.deviation(q)
		c.SetSym(i, i, c.At(i, i)+m*m)
	}
	return c
}

// density returns the logarithm of the normal density and the squared distance.
func density(residual []float64, cov *mat.SymDense) (log, chi float64, ok bool) {
	var chol mat.Cholesky
	if !chol.Factorize(cov) {
		return 0, 0, false
	}
	n := len(residual)
	v := mat.NewVecDense(n, residual)
	var x mat.VecDense
	if err := chol.SolveVecTo(&x, v); err != nil {
		var cond mat.Condition
		if !errors.As(err, &cond) || math.IsInf(float64(cond), 0) {
			return 0, 0, false
		}
	}
	chi = mat.Dot(v, &x)
	if math.IsNaN(chi) || math.IsInf(chi, 0) || chi < 0 {
		return 0, 0, false
	}
	return -chi/2 - chol.LogDet()/2, chi, true
}

// hypotheses lists every fault in every size. The smallest size is three
// standard deviations of what the fault moves, below which it is no fault. The
// weights of one class add up to one.
func (d Design) hypotheses(s Spread) []hypothesis {
	var out []hypothesis
	add := func(class Class, list []hypothesis) {
		sum := 0.0
		for _, h := range list {
			sum += math.Max(h.weigh, 0)
		}
		for _, h := range list {
			h.class = class
			h.weigh /= sum
			out = append(out, h)
		}
	}
	const steps = 24
	scan := func(from, to float64, f func(m float64) hypothesis) []hypothesis {
		var list []hypothesis
		if to < from*1.05 {
			to = from * 1.5
		}
		for i := range steps {
			h := f(from * math.Pow(to/from, float64(i)/(steps-1)))
			if h.weigh == 0 {
				h.weigh = 1
			}
			list = append(list, h)
		}
		return list
	}
	percent := func(m float64) string { return fmt.Sprintf("about %+.1f %%", (math.Exp(m)-1)*100) }
	slope := math.Abs(d.GapSlope)
	spreadL := math.Sqrt(sq(d.CoreShare*s.Permeability) + sq(s.Area) + sq(slope*s.Gap) + sq(2*slope*s.Glue))
	gapText := func(m float64) string {
		if slope == 0 {
			return fmt.Sprintf("Lp %s", percent(-m))
		}
		return fmt.Sprintf("Lp %s, as %.3f mm of gap too much would", percent(-m), (math.Exp(m)-1)/slope*1e3)
	}
	shortText := func(m float64) string {
		if slope == 0 {
			return fmt.Sprintf("Lp %s", percent(m))
		}
		return fmt.Sprintf("Lp %s, as %.3f mm of gap too little would", percent(m), (1-math.Exp(-m))/slope*1e3)
	}

	add(NoFault, []hypothesis{{cause: "no fault: the readings lie within what sound builds differ by", weigh: 1}})

	from := 3 * math.Max(spreadL, 0.003)
	ground := scan(from, 0.8, func(m float64) hypothesis {
		return hypothesis{cause: "gap ground too deep, or the wrong film, before any glue", size: gapText(m), build: truth{permeanceBothStages: -m}}
	})
	glued := scan(math.Max(0.02, 3*2*slope*s.Glue), 0.8, func(m float64) hypothesis {
		return hypothesis{cause: "glue or dirt between the mating faces", size: gapText(m), build: truth{permeanceAfterOnly: -m}}
	})
	add(ReluctanceHigh, append(ground, glued...))
	closed := 0.8
	if d.CoreShare > 0 {
		closed = math.Max(2*from, -math.Log(d.CoreShare))
	}
	add(ReluctanceLow, scan(from, closed, func(m float64) hypothesis {
		return hypothesis{cause: "gap too short, not ground, or the halves swapped with an ungapped set", size: shortText(m), build: truth{permeanceBothStages: m}}
	}))

	var turns []hypothesis
	for _, n := range []float64{-1, 1, -2, 2} {
		if float64(d.Np)+n < 1 {
			continue
		}
		turns = append(turns, hypothesis{cause: fmt.Sprintf("%s has %d turns instead of %d", d.Primary, d.Np+int(n), d.Np), weigh: 1 / (n * n), build: truth{turns: n}})
	}
	add(PrimaryTurn, turns)
	turns = nil
	for _, n := range []float64{-1, 1, -2, 2} {
		if len(d.Ns) == 0 {
			break
		}
		all := make([]float64, len(d.Ns))
		fits := true
		for i := range d.Ns {
			fits = fits && float64(d.Ns[i])+n >= 1
			all[i] = n
		}
		if !fits {
			continue
		}
		for i := range d.Ns {
			one := make([]float64, len(d.Ns))
			one[i] = n
			turns = append(turns, hypothesis{cause: fmt.Sprintf("%s has %d turns instead of %d", d.Secondaries[i], d.Ns[i]+int(n), d.Ns[i]), weigh: 1 / (n * n), build: truth{half: one}})
		}
		if len(d.Ns) > 1 {
			turns = append(turns, hypothesis{cause: fmt.Sprintf("both halves have %d turns instead of %d", d.Ns[0]+int(n), d.Ns[0]), weigh: 1 / (n * n), build: truth{half: all}})
		}
	}
	if len(turns) > 0 {
		add(SecondaryTurn, turns)
	}

	// A shorted turn takes the common flux away and leaves what leaks past it.
	// How it lies to the other windings is not known: the ratio and the leakage
	// say little. Its resistance lets some of the flux through.
	add(ShortedTurn, scan(0.005, 0.5, func(m float64) hypothesis {
		return hypothesis{
			cause: "a turn is shorted", size: fmt.Sprintf("Lp down to %.0f %%", m*100),
			build: truth{shorted: 1 - m, quality: -math.Log(20)},
			loose: map[Quantity]float64{RatioP: 0.2, RatioS: 0.2, RatioB: 0.2, ShortA: 0.1, ShortB: 0.1, Secondary: 0.3, OpenBefore: 0.1, Resonance: 1},
		}
	}))

	names := append([]string{d.Primary}, d.Secondaries...)
	each := math.Hypot(s.Winding, s.Meter.Resistance)
	var lost []hypothesis
	for i, name := range names {
		lost = append(lost, scan(3*math.Max(each, 0.003), 0.7, func(m float64) hypothesis {
			w := make([]float64, len(names))
			w[i] = m
			size := fmt.Sprintf("resistance %s", percent(m))
			if n := d.StrandsTotal[name]; n > 0 {
				size += fmt.Sprintf(", about %.0f of %d strands", math.Max(1, math.Round(float64(n)*(1-math.Exp(-m)))), n)
			}
			return hypothesis{cause: "strands of " + name + " not soldered or broken", size: size, build: truth{winding: w}}
		})...)
	}
	add(StrandsLost, lost)

	all := 3 * math.Max(math.Hypot(s.Resistance, s.Meter.Resistance), 0.01)
	var wrong []hypothesis
	for _, sign := range []float64{1, -1} {
		word, length := "thinner", "longer"
		if sign < 0 {
			word, length = "thicker", "shorter"
		}
		wrong = append(wrong, scan(all, 0.6, func(m float64) hypothesis {
			reel := make([]float64, len(names))
			for i := range reel {
				reel[i] = sign * m
			}
			return hypothesis{cause: "wire " + word + " than ordered, everywhere", size: "resistances " + percent(sign*m), build: truth{reel: reel}}
		})...)
		wrong = append(wrong, scan(all, 0.6, func(m float64) hypothesis {
			return hypothesis{cause: "turns " + length + " than drawn, everywhere (order of windings, former)", size: "resistances " + percent(sign*m), build: truth{wire: sign * m}}
		})...)
	}
	add(WireWrong, wrong)

	if len(d.Ns) == 0 {
		return out
	}
	leak := math.Max(d.BarrierLeak[0], 0.02)
	least := 3 * math.Max(math.Min(math.Hypot(s.Leakage, s.Meter.Inductance)/leak, math.Hypot(s.Capacitance, s.Meter.Capacitance)/math.Max(-d.BarrierC, 0.1)), 0.02)
	thick := func(sign float64, to float64, cause string) []hypothesis {
		return scan(math.Min(least, to/1.2), to, func(m float64) hypothesis {
			return hypothesis{cause: cause, size: fmt.Sprintf("barrier %s", percent(sign*m)), build: truth{barrier: sign * m}}
		})
	}
	thickMost := math.Max(1.4, 2*least)
	add(BarrierThick, thick(1, thickMost, "barrier between primary and secondary too thick, or windings not over each other"))
	add(BarrierThin, thick(-1, thickMost, "barrier between primary and secondary too thin: STOP, this is a matter of safety"))

	if d.Nominal[ShortB] > 0 {
		var halves []hypothesis
		least := 3 * math.Max(math.Hypot(s.LeakageHalf*math.Sqrt2, s.Meter.Inductance*math.Sqrt2), 0.01)
		for _, v := range [][2]float64{{0.5, -0.5}, {-0.5, 0.5}, {1, 0}, {0, 1}, {-1, 0}, {0, -1}} {
			halves = append(halves, scan(least, 0.9, func(m float64) hypothesis {
				return hypothesis{cause: "the halves do not lie alike (not wound together, or at another depth)",
					size: fmt.Sprintf("Lsc of A against B %s of the design", percent(m*(v[0]-v[1]))), build: truth{leakHalf: [2]float64{v[0] * m, v[1] * m}}}
			})...)
		}
		add(HalvesUnequal, halves)
		a, b := d.Nominal[ShortA], d.Nominal[ShortB]
		var swaps []hypothesis
		if apart := math.Abs(math.Log(a / b)); apart > least/2 {
			swaps = append(swaps,
				hypothesis{cause: "the readings with A and with B shorted are swapped", weigh: 1, build: truth{swap: "swapped"}},
				hypothesis{cause: "half A was shorted in both tests", weigh: 1, build: truth{swap: "A twice"}},
				hypothesis{cause: "half B was shorted in both tests", weigh: 1, build: truth{swap: "B twice"}})
		}
		for _, v := range []struct{ swap, cause string }{
			{"both at once", "both halves were shorted at once in both tests"},
			{"both at once in A", "both halves were shorted at once in the test of A"},
			{"both at once in B", "both halves were shorted at once in the test of B"},
		} {
			// How much lower Lsc reads with both shorted is known only roughly
			// unless the rating says it.
			h := hypothesis{cause: v.cause, weigh: 1, build: truth{swap: v.swap}}
			if d.ShortBoth == 0 {
				h.loose = map[Quantity]float64{ShortA: 0.05, ShortB: 0.05}
			}
			swaps = append(swaps, h)
		}
		add(WrongShort, swaps)
	}
	ratio := float64(d.Np) / float64(d.Ns[0])
	loop := 3 * math.Hypot(s.Leakage, s.Meter.Inductance) * d.Nominal[ShortA] / (ratio * ratio)
	add(PoorShort, scan(loop, 10*loop, func(m float64) hypothesis {
		return hypothesis{cause: "the short has inductance of its own (a clip, long leads)", size: fmt.Sprintf("about %.0f nH of loop", m*1e9), build: truth{loop: m}}
	}))
	return out
}

func sq(x float64) float64 { return x * x }

// separate chooses the measurement in which the first two causes differ most,
// in standard deviations of that measurement. A reading that is there already
// counts only as a repetition.
func (g *Diagnosis) separate(d Design, r Readings, s Spread) {
	if len(g.Causes) < 2 || g.Causes[0].Class == NoFault && g.Causes[0].Probability > 0.9 {
		return
	}
	a, b := g.Causes[0], g.Causes[1]
	best, gain := Quantity(""), 0.0
	var all []Quantity
	for q := range d.Nominal {
		all = append(all, q)
	}
	sort.Slice(all, func(i, j int) bool { return all[i] < all[j] })
	base := logs(d.predict(truth{}), d, all)
	cov := d.covariance(all, base, s)
	for i, q := range all {
		x, y := a.Expected[q], b.Expected[q]
		if x <= 0 || y <= 0 {
			continue
		}
		z := math.Abs(math.Log(x/y)) / math.Sqrt(cov.At(i, i))
		if r[q] > 0 {
			z *= 0.5
		}
		if z > gain {
			best, gain = q, z
		}
	}
	if best == "" || gain < 0.5 {
		g.Next = "open one sample and count: no reading of this sheet separates the first two causes"
		return
	}
	g.Next = advice(best, r[best] > 0)
	g.Reason = fmt.Sprintf("%s: %+.1f %% of the design if \"%s\", %+.1f %% if \"%s\"", best,
		(a.Expected[best]/d.Nominal[best]-1)*100, a.Class, (b.Expected[best]/d.Nominal[best]-1)*100, b.Class)
}

// advice says how a quantity is measured.
func advice(q Quantity, again bool) string {
	verb := "measure "
	if again {
		verb = "measure again "
	}
	switch q {
	case Quality:
		return "read the Q (or the loss resistance) of the open primary at the test frequency, beside a good part: a shorted turn makes it collapse"
	case OpenBefore:
		return verb + "Lp with the halves pressed together without glue (E03)"
	case Capacitance:
		return verb + "the capacitance primary to secondary (E10)"
	case ShortA, ShortB:
		return verb + "Lsc of each half with a short soldered at the pins (E06, E07)"
	case RatioP, RatioS:
		return verb + "the ratio from both sides (E02a, E02b)"
	case RatioB:
		return verb + "the ratio to half B (E02c)"
	}
	if w, ok := reelOf(q); ok {
		return verb + "one metre of the wire of " + w + " from the reel: it tells a wrong wire from a wrong length"
	}
	if w, ok := resistanceOf(q); ok {
		return verb + "the resistance of " + w + " four-wire, at a known temperature (E09)"
	}
	return verb + strings.ToLower(string(q[:1])) + string(q[1:])
}
