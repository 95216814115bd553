package design

import (
	"context"
	"fmt"
	"maps"
	"math"
	"runtime"
	"slices"
	"sync"

	"golang.org/x/sync/errgroup"

	"gapwright/corelib/insulation"
	"gapwright/corelib/material"
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
	shares      []float64        // of each drive; 0 for passing corners, unless all are
	heats       bool             // some corner is continuous
	power       float64          // W, output weighted by share
	linkage     []coreloss.Loops // of Lm m(t), V s, for each drive
	linkagePeak float64          // V s, largest
	forms       *forms

	ratio     ratioWindow     // effective turns ratios with which the tank keeps its limits
	lost      map[string]bool // limits of the tank that no ratio keeps, by tankLimit
	gainSlope float64         // change of the least gain margin per relative change of the turns ratio; 0: it does not matter
	fill      [2]float64      // most copper in its room, of primary and secondary

	leakage bool // the transformer's leakage makes the resonant inductance

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
	// Of the inductor that was chosen, by corner, ohm; nil before.
	inductorResistance map[string]float64

	permeability float64 // scale of mu_i, for sensitivities; 0 counts as 1
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
	s.linkagePeak, s.heats = 0, false
	for i := range s.drives {
		d := &s.drives[i]
		if d.Continuous {
			s.shares[i] = d.Share
			s.heats = true
		}
		w := d.Magnetize.Scaled(t.Magnetizing())
		times, values := w.Sample(200)
		if err := s.linkage[i].Split(times, values); err != nil {
			return fmt.Errorf("flux at corner %s: %w", d.Name, err)
		}
		s.linkagePeak = math.Max(s.linkagePeak, w.Peak())
	}
	if !s.heats {
		// Nothing lasts: rank by the plain mean.
		for i := range s.shares {
			s.shares[i] = 1 / float64(len(s.shares))
		}
	}
	s.power = 0
	for i, k := 0, 0; i < len(operations); i++ {
		if operations[i].Status == tank.OK {
			s.power += s.shares[k] * operations[i].OutputPower
			k++
		}
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
	for i := range s.fill {
		s.fill[i] = math.Max(densest(s.spools[false]), densest(s.spools[true]))
	}
	if s.lost == nil {
		s.findRatios()
	}
	s.inductorSpools = s.inductorForms.spools(s.inductorWireList, bulge(s.inductorLimits.Wires), s.inductorLimits.Insulation.Tape)
	return nil
}

// A ratioWindow holds the effective turns ratios with which the tank keeps its
// limits, for two shares of the power that the copper of both parts loses. More
// loss takes gain, so the window moves.
type ratioWindow struct {
	share [2]float64
	edge  [2][2]float64 // [share][low, high]
}

// at returns the window for a copper loss over the output power, linear between
// the two shares and a little beyond.
func (w ratioWindow) at(share float64) [2]float64 {
	x := math.Max(-0.5, math.Min(2, (share-w.share[0])/(w.share[1]-w.share[0])))
	var out [2]float64
	for i := range out {
		out[i] = w.edge[0][i] + x*(w.edge[1][i]-w.edge[0][i])
	}
	return out
}

// usual is the window for a usual copper loss.
func (w ratioWindow) usual() [2]float64 { return w.at((w.share[0] + w.share[1]) / 2) }

// widest is the window with no copper loss at all, for what is known before the
// wires are.
func (w ratioWindow) widest() [2]float64 {
	a, b := w.at(0), w.at(w.share[1])
	return [2]float64{math.Min(a[0], b[0]), math.Max(a[1], b[1])}
}

// shifted moves one edge by a relative step.
func (w ratioWindow) shifted(edge int, by float64) ratioWindow {
	for i := range w.edge {
		w.edge[i][edge] *= 1 + by
	}
	return w
}

// copperShares are the parts of the power, lost in the copper of both parts, for
// which the tank is tried.
var copperShares = [2]float64{0.003, 0.012}

// findRatios finds the effective turns ratios, within the ratio error allowed,
// with which the tank keeps its limits. A lower ratio gives more gain and more
// current. Limits that are missed at every ratio are no matter of the parts:
// they are set aside, and the verdicts tell.
func (s *search) findRatios() {
	tolerance := s.transformerLimits.Limits.RatioError
	t := s.job.Tank
	low, high := t.TurnsRatio*(1-tolerance), t.TurnsRatio*(1+tolerance)
	var gains [2]float64 // at the ends, with little copper loss
	missed := func(n, share float64) (limits map[string]bool, worst float64) {
		built := t
		built.TurnsRatio = n
		operations := make([]tank.Operation, len(s.operations))
		for k, o := range s.operations {
			each := built
			power := o.OutputPower * share
			// The inductor's copper is a third of it, and on the primary side.
			each.PrimaryResistance = power * 2 / 3 / (o.Resonant.RMS * o.Resonant.RMS)
			each.SecondaryResistance = power / 3 / float64(len(o.Windings)) / (o.Windings[0].RMS * o.Windings[0].RMS)
			x, err := tank.Solve(each, s.job.Corners[k])
			if err != nil {
				return map[string]bool{"unsolved": true}, math.Inf(1)
			}
			operations[k] = x
		}
		limits = map[string]bool{}
		verdicts := s.tankVerdicts(built, operations)
		for i, end := range []float64{low, high} {
			if n == end && share == copperShares[0] {
				gains[i] = s.gainLeft(verdicts)
			}
		}
		for _, v := range verdicts {
			if !v.Pass {
				limits[tankLimit(v)] = true
				worst = math.Max(worst, Reason{v.Limit, v.Value, v.Bound, v.Unit, v.Sense}.excess())
			}
		}
		return limits, worst
	}
	const steps = 8
	at := func(i int) float64 { return low + (high-low)*float64(i)/steps }
	s.ratio.share = copperShares
	s.lost = map[string]bool{}
	for k, share := range copperShares {
		s.ratio.edge[k] = [2]float64{low, high}
		var always, nearest map[string]bool
		inside, least := 0.0, math.Inf(1)
		var grid [steps + 1]map[string]bool
		for i := range grid {
			m, worst := missed(at(i), share)
			grid[i] = m
			if worst < least {
				least, nearest = worst, m
			}
			if i == 0 {
				always = maps.Clone(m)
				continue
			}
			maps.DeleteFunc(always, func(k string, _ bool) bool { return !m[k] })
		}
		keeps := func(m map[string]bool) bool {
			for l := range m {
				if !s.lost[l] {
					return false
				}
			}
			return true
		}
		find := func() {
			for i, m := range grid {
				if keeps(m) {
					inside = at(i)
					return
				}
			}
		}
		if k == 0 {
			s.lost = always
			if find(); inside == 0 && nearest != nil {
				// No ratio keeps what other ratios do: the one that comes nearest counts.
				s.lost = nearest
			}
		}
		if find(); inside == 0 {
			// So much copper loss leaves nothing: as with little, a little lower.
			if k > 0 {
				s.ratio.edge[k] = [2]float64{s.ratio.edge[0][0], s.ratio.edge[0][1] * (1 - (share-copperShares[0])/2)}
			}
			continue
		}
		edge := func(out float64, known map[string]bool) float64 {
			if keeps(known) {
				return out
			}
			in := inside
			for range steps {
				middle := (in + out) / 2
				if m, _ := missed(middle, share); keeps(m) {
					in = middle
				} else {
					out = middle
				}
			}
			return in
		}
		s.ratio.edge[k] = [2]float64{edge(low, grid[0]), edge(high, grid[steps])}
	}
	s.gainSlope = (gains[1] - gains[0]) / math.Log(high/low)
	if !(s.gainSlope < 0) {
		s.gainSlope = 0 // not what bounds the ratio
	}
}

// tankLimit names a limit of the tank with its corner.
func tankLimit(v part.Verdict) string { return v.Limit + " " + v.Corner }

// bulge returns the height allowance of the wires.
func bulge(w job.Wires) winding.Bulge {
	return winding.Bulge{Litz: w.Bulge.Litz, Solid: w.Bulge.Solid, Foil: w.Bulge.Foil}
}

// surroundings is what the parts shed their heat to.
func (s *search) surroundings() thermal.Surroundings {
	b := s.job.Build.Surroundings
	around := thermal.Surroundings{Ambient: b.AmbientTemperature, Altitude: b.Altitude, WallConductance: b.HeatPath, Wall: b.HeatPathTemperature}
	if b.Air == "moving" {
		around.AirSpeed = b.AirSpeed
	}
	return around
}

// conditions is what parts are rated under.
func (s *search) conditions(limits job.PartLimits, detail bool) part.Conditions {
	c := part.Conditions{
		Shapes: s.shapes, Ferrites: s.table,
		Bulge:   bulge(limits.Wires),
		Around:  s.surroundings(),
		HotSpot: limits.Limits.HotSpotAllowance, CoreLimit: limits.Limits.CoreTemperature, TestTemp: s.job.Build.Tests.Temperature,
		ClearDistance: limits.Gap.ClearDistance, PieceMax: limits.Gap.LengthMax,
		TankLm: s.tank.Magnetizing(), TankRatio: s.tank.TurnsRatio, Stray: s.tank.StrayInductance, Detail: detail, Permeability: s.permeability,
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

// firstMiss returns the limit that is missed by the most, nil when none is.
// Limits of the tank that no part can keep are left out.
func (s *search) firstMiss(verdicts []part.Verdict) *Reason {
	var worst *Reason
	for _, v := range verdicts {
		if v.Pass || v.Part == "tank" && s.lost[tankLimit(v)] {
			continue
		}
		r := Reason{v.Limit, v.Value, v.Bound, v.Unit, v.Sense}
		if worst == nil || r.excess() > worst.excess() {
			worst = &r
		}
	}
	return worst
}

// writable rounds the wall of a former to what a build file holds, 0.01 mm.
func writable(wall float64) float64 { return math.Round(wall*1e5) / 1e5 }

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
			Name: p.Former.Name, Chambers: max(p.Former.Chambers, 1), Pins: p.Former.Pins, Mounting: p.Former.Mounting, Wall: writable(p.Former.WallOffset),
		},
		Windings:     windings,
		Build:        entries,
		Impregnation: part.Impregnation{Kind: b.Impregnation, When: "after gluing"},
		Glue:         glue(limits.Cores),
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

// glue says where adhesive goes: on the faces only when it holds the core.
func glue(cores job.Cores) part.Glue {
	if cores.Clamping == "glue" {
		return part.Glue{Faces: "all mating faces", OuterLegs: "none"}
	}
	return part.Glue{Faces: "none", OuterLegs: "one elastic drop each side"}
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

// inOrder runs work for each shape, several at a time. Results come in the order
// of the shapes, whatever the number of processors.
func inOrder(ctx context.Context, shapes []shape.Shape, work func(ctx context.Context, sh shape.Shape, solvers *part.Solvers) (rated, error), progress Progress) ([]rated, error) {
	results := make([]rated, len(shapes))
	var done int
	var mutex sync.Mutex
	pool := sync.Pool{New: func() any { return new(part.Solvers) }}
	g, ctx := errgroup.WithContext(ctx)
	g.SetLimit(runtime.GOMAXPROCS(0))
	for i, sh := range shapes {
		g.Go(func() error {
			if err := ctx.Err(); err != nil {
				return err
			}
			solvers := pool.Get().(*part.Solvers)
			defer pool.Put(solvers)
			var err error
			if results[i], err = work(ctx, sh, solvers); err != nil {
				return fmt.Errorf("%s: %w", sh.Name, err)
			}
			mutex.Lock()
			defer mutex.Unlock()
			if done++; progress != nil {
				progress(done, len(shapes))
			}
			return nil
		})
	}
	if err := g.Wait(); err != nil {
		return nil, err
	}
	return results, nil
}
