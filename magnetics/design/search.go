package design

import (
	"context"
	"errors"
	"fmt"
	"math"
	"runtime"
	"slices"

	"golang.org/x/sync/errgroup"

	"gapwright/corelib/insulation"
	"gapwright/corelib/material"
	"gapwright/corelib/quantity"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/coreloss"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/magnetics/thermal"
	"gapwright/magnetics/winding"
	"gapwright/tank"
)

// search holds what is computed once for all candidates of a job.
type search struct {
	job      job.Job
	tank     tank.Tank
	shapes   *shape.Table
	ferrites map[string]*material.Ferrite
	table    *material.Table
	wireRows *wire.Table

	transformerLimits job.PartLimits
	inductorLimits    job.PartLimits

	operations  []tank.Operation
	drives      []part.Drive // of the transformer
	inductor    []part.Drive
	shares      []float64        // of each drive; 0 for passing corners
	linkage     []coreloss.Loops // of Lm m(t), V s, for each drive
	linkagePeak float64          // V s, largest
	forms       *forms

	ratio [2]float64 // effective turns ratios with which the tank keeps its limits

	creepage  float64 // m
	clearance float64 // m
	proposals []insulation.Proposal

	wires map[bool][]wire.Wire // by whether they carry their own insulation

	// The same for the inductor.
	inductorWireList []wire.Wire
	inductorForms    *forms
	inductorSpools   []spool
	spools           map[bool][]spool // of wires
	resonant         []coreloss.Loops // of the resonant current, A
}

// newSearch prepares the search: tables, wires, distances.
func newSearch(j job.Job, tables Tables) (*search, error) {
	s := &search{
		job: j, tank: j.Tank, shapes: tables.Shapes, table: tables.Ferrites, wireRows: tables.Wires,
		transformerLimits: j.Build.For(job.Transformer), inductorLimits: j.Build.For(job.Inductor),
		ferrites: make(map[string]*material.Ferrite), wires: make(map[bool][]wire.Wire),
	}
	for _, limits := range []job.PartLimits{s.transformerLimits, s.inductorLimits} {
		for _, name := range limits.Cores.Materials {
			f, err := tables.Ferrites.Find(name)
			if err != nil {
				return nil, j.Fault("build.cores.materials", "%v", err)
			}
			s.ferrites[name] = f
		}
	}
	for _, insulated := range []bool{false, true} {
		list, err := wireList(s.transformerLimits.Wires, tables.Wires, insulated)
		if err != nil {
			return nil, j.Fault("build.wires.stock", "%v", err)
		}
		s.wires[insulated] = list
	}
	list, err := wireList(s.inductorLimits.Wires, tables.Wires, false)
	if err != nil {
		return nil, j.Fault("build.inductor.wires.stock", "%v", err)
	}
	s.inductorWireList = list
	if err := s.distances(); err != nil {
		return nil, err
	}
	return s, nil
}

// highInput is the input voltage above which an insulation grade must be stated.
const highInput = 60 // V

// distances finds creepage and clearance: the user's figure rules, else the
// table's proposal.
func (s *search) distances() error {
	in := s.transformerLimits.Insulation
	if in.Creepage != nil {
		s.creepage = *in.Creepage
	}
	if in.Clearance != nil {
		s.clearance = *in.Clearance
	}
	if in.Grade == "" || in.Grade == "functional" || (in.Creepage != nil && in.Clearance != nil) || in.WorkingVoltage == nil {
		return nil
	}
	c := insulation.Conditions{
		Grade: insulation.Grade(in.Grade), WorkingVoltage: *in.WorkingVoltage, PollutionDegree: in.PollutionDegree,
		MaterialGroup: in.MaterialGroup, Altitude: s.job.Build.Surroundings.Altitude,
	}
	if in.WorkingVoltagePeak != nil {
		c.WorkingVoltagePeak = *in.WorkingVoltagePeak
	}
	if in.Mains != nil {
		c.Mains = &insulation.Mains{Voltage: in.Mains.Voltage, Category: in.Mains.OvervoltageCategory}
	}
	creepage, clearance, err := insulation.Propose(c)
	if err != nil {
		return s.job.Fault("build.insulation", "%v", err)
	}
	if in.Creepage == nil {
		s.creepage = creepage.Distance
		s.proposals = append(s.proposals, creepage)
	}
	if in.Clearance == nil {
		s.clearance = clearance.Distance
		s.proposals = append(s.proposals, clearance)
	}
	return nil
}

// drive takes over the operations of a tank.
func (s *search) drive(t tank.Tank, operations []tank.Operation) error {
	s.tank, s.operations = t, operations
	s.drives, s.inductor = part.TransformerDrives(operations), part.InductorDrives(operations)
	s.shares = make([]float64, len(s.drives))
	s.linkage = make([]coreloss.Loops, len(s.drives))
	s.linkagePeak = 0
	for i := range s.drives {
		d := &s.drives[i]
		if d.Continuous {
			s.shares[i] = d.Share
		}
		w := d.Magnetize.Scaled(t.Magnetizing())
		times, values := w.Sample(200)
		if err := s.linkage[i].Split(times, values); err != nil {
			return fmt.Errorf("flux at corner %s: %w", d.Name, err)
		}
		s.linkagePeak = math.Max(s.linkagePeak, w.Peak())
	}
	s.resonant = make([]coreloss.Loops, len(s.inductor))
	for i := range s.inductor {
		times, values := s.inductor[i].Resonant.Sample(200)
		if err := s.resonant[i].Split(times, values); err != nil {
			return fmt.Errorf("resonant current at corner %s: %w", s.inductor[i].Name, err)
		}
	}
	s.forms = newForms(s.drives, s.shares, s.wires[false], s.wires[true])
	s.inductorForms = newForms(s.inductor, s.shares, s.inductorWireList)
	s.spools = map[bool][]spool{}
	for insulated, list := range s.wires {
		s.spools[insulated] = s.forms.spools(list, bulge(s.transformerLimits.Wires), s.transformerLimits.Insulation.Tape)
	}
	if s.ratio == [2]float64{} {
		s.ratioWindow()
	}
	s.inductorSpools = s.inductorForms.spools(s.inductorWireList, bulge(s.inductorLimits.Wires), s.inductorLimits.Insulation.Tape)
	return nil
}

// copperShare is the part of the power that the windings of both parts lose, in
// the estimate of what the tank stands.
const copperShare = 0.006

// ratioWindow finds the effective turns ratios, within the ratio error allowed,
// with which the tank keeps its limits. A lower ratio gives more gain and more
// current. Where none does, the whole window is searched and the verdicts tell.
func (s *search) ratioWindow() {
	tolerance := s.transformerLimits.Limits.RatioError
	t := s.job.Tank
	low, high := t.TurnsRatio*(1-tolerance), t.TurnsRatio*(1+tolerance)
	s.ratio = [2]float64{low, high}
	keeps := func(n float64) bool {
		built := t
		built.TurnsRatio = n
		operations := make([]tank.Operation, len(s.operations))
		for k, o := range s.operations {
			each := built
			power := o.OutputPower * copperShare
			each.PrimaryResistance = power / 2 / (o.Resonant.RMS * o.Resonant.RMS)
			each.SecondaryResistance = power / 2 / float64(len(o.Windings)) / (o.Windings[0].RMS * o.Windings[0].RMS)
			x, err := tank.Solve(each, s.job.Corners[k])
			if err != nil {
				return false
			}
			operations[k] = x
		}
		return s.firstMiss(s.tankVerdicts(built, operations)) == nil
	}
	// From a ratio inside, halve towards both ends.
	const steps = 8
	inside := 0.0
	for i := range steps + 1 {
		if n := low + (high-low)*float64(i)/steps; keeps(n) {
			inside = n
			break
		}
	}
	if inside == 0 {
		return
	}
	edge := func(out float64) float64 {
		if keeps(out) {
			return out
		}
		in := inside
		for range steps {
			if middle := (in + out) / 2; keeps(middle) {
				in = middle
			} else {
				out = middle
			}
		}
		return in
	}
	s.ratio = [2]float64{edge(low), edge(high)}
}

// bulge returns the height allowance of the wires.
func bulge(w job.Wires) winding.Bulge {
	return winding.Bulge{Litz: w.Bulge.Litz, Solid: w.Bulge.Solid, Foil: w.Bulge.Foil}
}

// conditions is what parts are rated under.
func (s *search) conditions(limits job.PartLimits, detail bool) part.Conditions {
	b := s.job.Build
	c := part.Conditions{
		Shapes: s.shapes, Ferrites: s.table,
		Bulge: bulge(limits.Wires),
		Around: thermal.Surroundings{
			Ambient: b.Surroundings.AmbientTemperature, Altitude: b.Surroundings.Altitude,
			WallConductance: b.Surroundings.HeatPath, Wall: b.Surroundings.HeatPathTemperature,
		},
		HotSpot: limits.Limits.HotSpotAllowance, CoreLimit: limits.Limits.CoreTemperature, TestTemp: b.Tests.Temperature,
		ClearDistance: limits.Gap.ClearDistance, PieceMax: limits.Gap.LengthMax,
		TankLm: s.tank.Magnetizing(), TankRatio: s.tank.TurnsRatio, Stray: s.tank.StrayInductance, Detail: detail,
	}
	if b.Surroundings.Air == "moving" {
		c.Around.AirSpeed = b.Surroundings.AirSpeed
	}
	if limits.Limits.CurrentLimit != nil {
		c.CurrentLimit = *limits.Limits.CurrentLimit
	}
	return c
}

// candidates returns the shapes that a part may use, smallest outline first.
func (s *search) candidates(limits job.PartLimits) []shape.Shape {
	var list []shape.Shape
	for _, sh := range s.shapes.Shapes() {
		if len(limits.Cores.Shapes) > 0 {
			if !slices.Contains(limits.Cores.Shapes, sh.Name) {
				continue
			}
		} else if !slices.Contains(limits.Cores.Families, string(sh.Family)) {
			continue
		}
		if slices.Contains(limits.Cores.Excluded, sh.Name) || string(sh.Confidence) > limits.Cores.Confidence {
			continue
		}
		list = append(list, sh)
	}
	slices.SortStableFunc(list, func(a, b shape.Shape) int {
		switch {
		case a.Volume() < b.Volume():
			return -1
		case a.Volume() > b.Volume():
			return 1
		}
		return 0
	})
	return list
}

// outside judges what is known of a size before anything is computed: the
// height and footprint of the finished part.
func outside(sh shape.Shape, f shape.Former, limits job.Limits) (Reason, bool) {
	length, width, height := part.Envelope(sh, f)
	if limits.Height != nil && height > *limits.Height {
		return Reason{"height", height, *limits.Height, "m", "max"}, true
	}
	if fp := limits.Footprint; fp != nil {
		a, b := math.Max(length, width), math.Min(length, width)
		if x := math.Max(fp[0], fp[1]); a > x {
			return Reason{"footprint", a, x, "m", "max"}, true
		}
		if x := math.Min(fp[0], fp[1]); b > x {
			return Reason{"footprint", b, x, "m", "max"}, true
		}
	}
	return Reason{}, false
}

// rated is a finished candidate.
type rated struct {
	shape    shape.Shape
	part     *part.Transformer
	inductor *part.Inductor
	rating   *part.Rating
	loss     float64 // W, weighted by share
	missed   *Reason // nil: keeps every limit
}

// Bounds of the field solutions of one size: so many tries at most, and fewer
// when the best is still far from keeping its limits.
const (
	triesMost     = 60
	triesHopeless = 12
	hopeless      = 0.3 // excess over the limit
)

// searchModes is the number of modes of the field series during the search; the
// final rating takes as many as the window needs.
const searchModes = 64

// biasSlack is how far the ratio of a corrected estimate may be off.
const biasSlack = 0.0015

// estimateSlack is how much less than its estimate a candidate may lose: the
// one-dimensional field is at most so much too high (margins).
const estimateSlack = 1.06

// rateTransformers rates the most promising candidates of a size and returns
// the best that keeps every limit, or the one that misses by the least.
func (s *search) rateTransformers(ctx context.Context, sh shape.Shape, solvers *part.Solvers) (rated, error) {
	none := rated{shape: sh}
	former, err := s.former(sh, 1, s.transformerLimits.Cores)
	if err != nil {
		none.missed = &Reason{"former", 0, 1, "", "min"}
		return none, nil
	}
	if r, out := outside(sh, former, s.transformerLimits.Limits); out {
		none.missed = &r
		return none, nil
	}
	list, reason := s.transformers(sh)
	if len(list) == 0 {
		none.missed = &reason
		return none, nil
	}
	best := none
	// What the field says of the ratio of one candidate corrects the estimates
	// of its kind.
	bias := map[kind]float64{}
	tried := 0
	for _, e := range shortlist(list) {
		if err := ctx.Err(); err != nil {
			return none, err
		}
		if best.rating != nil {
			if best.missed == nil && e.loss > best.loss*estimateSlack {
				continue
			}
			if tried >= triesMost || best.missed != nil && best.missed.excess() > hopeless && tried >= triesHopeless {
				break
			}
		}
		b, known := bias[e.kind()]
		if known && (e.ratio*b < s.ratio[0]*(1-biasSlack) || e.ratio*b > s.ratio[1]*(1+biasSlack)) && !s.freeDistance(e.Arrangement) {
			continue
		}
		tried++
		r, err := s.finishTransformer(e.plan, solvers, false)
		if err != nil {
			if errors.Is(err, errNoGap) {
				continue
			}
			return none, err
		}
		if !s.freeDistance(e.Arrangement) {
			bias[e.kind()] = equivalent(r.rating, s.job.Tank.StrayInductance).Ratio / e.ratio
		}
		if better(r, best) {
			best = r
		}
	}
	if best.rating == nil && best.missed == nil {
		best.missed = &Reason{"gap.length_min", 0, s.transformerLimits.Gap.LengthMin, "m", "min"}
	}
	return best, nil
}

// better prefers what keeps every limit, then less loss; among those that miss
// one, the least excess.
func better(a, b rated) bool {
	switch {
	case b.rating == nil:
		return true
	case (a.missed == nil) != (b.missed == nil):
		return a.missed == nil
	case a.missed != nil:
		return a.missed.excess() < b.missed.excess()
	}
	return a.loss < b.loss
}

// shortlist orders the estimates of a size: first the best of every way to
// arrange the windings, then the best of the rest, both by loss.
func shortlist(list []estimate) []estimate {
	seen := map[kind]bool{}
	var first, rest []estimate
	for _, e := range list {
		w := e.kind()
		if !seen[w] {
			seen[w] = true
			first = append(first, e)
		} else {
			rest = append(rest, e)
		}
	}
	return append(first, rest...)
}

var errNoGap = errors.New("no gap")

// finishTransformer makes the part of a plan, finds its gap and rates it.
func (s *search) finishTransformer(p plan, solvers *part.Solvers, detail bool) (rated, error) {
	cond := s.conditions(s.transformerLimits, detail)
	cond.Modes = searchModes
	var t part.Transformer
	var coil *part.Coil
	for try := 0; ; try++ {
		t = s.transformerPart(p)
		var err error
		coil, err = part.NewCoil(t.Construction, cond)
		if err != nil {
			return rated{}, err
		}
		if s.job.Tank.Lm == 0 {
			t.Core.Gap = part.Gap{Kind: part.Closed}
			break
		}
		var e part.Equivalent
		g, err := coil.GapFor(solvers, t.Core.Gap, s.job.Tank.Lm, cond.TestTemp, cond.Modes, func(l [][]float64) float64 {
			e = part.NewTwoPort(l).Equivalent(s.job.Tank.StrayInductance)
			return e.Lm
		})
		if err != nil {
			return rated{}, fmt.Errorf("%w: %w", errNoGap, err)
		}
		t.Core.Gap = g
		if try >= distanceTries || !s.adjust(&p, e) {
			break
		}
	}
	coil.Construction = t.Construction
	r, err := coil.RateTransformer(t, s.drives, cond, solvers)
	if err != nil {
		return rated{}, err
	}
	out := rated{shape: p.Shape, part: &t, rating: r, loss: shareWeighted(*r, s.operations)}
	out.missed = s.firstMiss(s.transformerVerdicts(r))
	if out.missed == nil {
		out.missed = s.tankMiss(r)
	}
	return out, nil
}

// distanceTries bounds how often a free distance is corrected.
const distanceTries = 2

// adjust corrects the free distance of a plan whose effective turns ratio came
// out beside the window, and reports whether it did.
func (s *search) adjust(p *plan, e part.Equivalent) bool {
	if !s.freeDistance(p.Arrangement) || e.Ratio >= s.ratio[0] && e.Ratio <= s.ratio[1] {
		return false
	}
	// A free distance adds to the inductance of the outer secondary only.
	np := float64(p.Np)
	perDistance := e.Ratio * quantity.Mu0 * p.Former.MLT * np * np / (p.Shape.WindowBreadth() * e.Lm)
	middle := (s.ratio[0] + s.ratio[1]) / 2
	extra := math.Round((p.Extra+(e.Ratio-middle)/perDistance)/extraStep) * extraStep
	if extra < 0 || extra > extraMost || extra == p.Extra {
		return false
	}
	p.Extra = extra
	return true
}

// tankMiss solves the tank with a transformer as rated and returns the limit of
// the tank that it then misses by the most. The inductor is taken to have the
// resistance of the primary; the loop checks with the real one.
func (s *search) tankMiss(r *part.Rating) *Reason {
	d := Design{Job: s.job, Rating: r}
	built, each := s.asBuilt(&d)
	built.Lr = s.job.Tank.Lr
	operations := make([]tank.Operation, len(each))
	for i := range each {
		each[i].Lr = s.job.Tank.Lr
		each[i].PrimaryResistance *= 2
		o, err := tank.Solve(each[i], s.job.Corners[i])
		if err != nil {
			return &Reason{"reached", 0, 1, "", "min"}
		}
		operations[i] = o
	}
	return s.firstMiss(s.tankVerdicts(built, operations))
}

// firstMiss returns the limit that is missed by the most, nil when none is.
func (s *search) firstMiss(verdicts []part.Verdict) *Reason {
	var worst *Reason
	for _, v := range verdicts {
		if v.Pass {
			continue
		}
		r := Reason{v.Limit, v.Value, v.Bound, v.Unit, v.Sense}
		if worst == nil || r.excess() > worst.excess() {
			worst = &r
		}
	}
	return worst
}

// transformerPart writes a plan as the part that the shop reads.
func (s *search) transformerPart(p plan) part.Transformer {
	limits := s.transformerLimits
	b := s.job.Build.Transformer
	entries, _ := p.entries(limits.Insulation)
	list, _ := p.sections()
	names := []string{"P"}
	if p.Centertap {
		names = append(names, "S-A", "S-B")
	} else {
		names = append(names, "S")
	}
	var windings []part.Winding
	var coils []coil
	var needs []terminalNeeds
	var sides []string
	for i, name := range names {
		w := part.Winding{Name: name}
		for _, x := range list {
			for j, of := range x.of {
				if of == name {
					w.Turns += x.turns
					if x.names[j] != name {
						w.Parts = append(w.Parts, x.names[j])
					}
				}
			}
		}
		windings = append(windings, w)
		need := terminalNeeds{}
		for d := range s.drives {
			need.current = math.Max(need.current, s.drives[d].RMS[i])
		}
		perTurn := s.voltPeak() / float64(p.Np)
		need.voltage = perTurn * float64(w.Turns)
		needs = append(needs, need)
		if i == 0 {
			coils = append(coils, p.Primary)
			sides = append(sides, b.Terminations.Primary)
		} else {
			coils = append(coils, p.Secondary)
			sides = append(sides, b.Terminations.Secondary)
		}
	}
	windings, leads := terminals(p.Former, windings, coils, needs, b, sides)
	t := part.Transformer{Construction: part.Construction{
		Core: part.Core{
			Shape: p.Shape.Name, Material: p.Material, Pieces: 2, Clamping: limits.Cores.Clamping, Gap: p.Gap,
		},
		Former: part.Former{
			Name: p.Former.Name, Chambers: max(p.Former.Chambers, 1), Pins: p.Former.Pins, Mounting: p.Former.Mounting, Wall: p.Former.WallOffset,
		},
		Windings:     windings,
		Build:        entries,
		Impregnation: part.Impregnation{Kind: b.Impregnation, When: "after gluing"},
		Glue:         part.Glue{Faces: "none", OuterLegs: "one elastic drop each side"},
		Terminations: part.Terminations{Primary: "pins", Secondary: "pins", Tin: "solder pot 390 °C"},
		Tests:        s.tests(),
	}}
	if leads {
		t.Terminations.LeadLength = usualLead
		for _, w := range windings {
			if len(w.Start) == 0 || !isLead(w.Start[0]) {
				continue
			}
			if w.Name == "P" {
				t.Terminations.Primary = "leads"
			} else {
				t.Terminations.Secondary = "leads"
			}
		}
	}
	return t
}

func isLead(terminal string) bool { return len(terminal) >= 4 && terminal[:4] == "lead" }

// usualLead is the length of a flying lead where nothing is stated, m (own
// proposal).
const usualLead = 80e-3

// voltPeak is the largest voltage across the primary, V.
func (s *search) voltPeak() float64 {
	v := 0.0
	for _, o := range s.operations {
		if o.Status == tank.OK {
			v = math.Max(v, o.MagnetizingVoltage.Peak())
		}
	}
	return v
}

// tests copies the user's test volts.
func (s *search) tests() []part.Test {
	v := s.transformerLimits.Insulation.TestVoltages
	var list []part.Test
	for _, x := range []struct {
		between string
		volts   *float64
	}{{"primary_secondary", v.PrimarySecondary}, {"primary_core", v.PrimaryCore}, {"secondary_core", v.SecondaryCore}} {
		t := part.Test{Between: x.between, Kind: v.Kind}
		if x.volts != nil {
			t.Voltage = *x.volts
			if v.Time != nil {
				t.Time = *v.Time
			}
		}
		list = append(list, t)
	}
	return list
}

// tapeHeight sums the insulation of an order of work, for each chamber.
func tapeHeight(entries []winding.Entry) [2]float64 {
	var h [2]float64
	for _, e := range entries {
		x := 0.0
		switch e.Kind {
		case winding.Tape:
			x = float64(e.TapeLayers) * e.Thickness
		case winding.Screen:
			x = e.Thickness
		case winding.Space:
			x = e.Height
		}
		if e.Chamber == 2 {
			h[1] += x
		} else {
			h[0] += x
			if e.Chamber == 0 {
				h[1] += x
			}
		}
	}
	return h
}

// inOrder runs work for each shape, several at a time, and stops once enough
// says that the results so far suffice. Results come in the order of the
// shapes, whatever the number of processors.
func inOrder(ctx context.Context, shapes []shape.Shape, work func(ctx context.Context, sh shape.Shape, solvers *part.Solvers) (rated, error), enough func([]rated) bool, progress Progress) ([]rated, error) {
	// A fixed batch keeps the set of sizes looked at the same on any machine.
	const batch = 4
	var out []rated
	solvers := make([]part.Solvers, batch)
	for start := 0; start < len(shapes); start += batch {
		group := shapes[start:min(start+batch, len(shapes))]
		results := make([]rated, len(group))
		g, gctx := errgroup.WithContext(ctx)
		g.SetLimit(runtime.GOMAXPROCS(0))
		for i, sh := range group {
			g.Go(func() error {
				var err error
				results[i], err = work(gctx, sh, &solvers[i])
				if err != nil {
					return fmt.Errorf("%s: %w", sh.Name, err)
				}
				return nil
			})
		}
		if err := g.Wait(); err != nil {
			return nil, err
		}
		out = append(out, results...)
		if progress != nil {
			progress(len(out), len(shapes))
		}
		if enough(out) {
			break
		}
	}
	return out, nil
}
