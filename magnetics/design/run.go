package design

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"math"
	"runtime"
	"slices"

	"golang.org/x/sync/errgroup"

	"gapwright/corelib/shape"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/tank"
)

// TankError says that the tank as asked for misses a corner; there is no point
// in winding anything for it.
type TankError struct{ Operations []tank.Operation }

func (e *TankError) Error() string {
	for _, o := range e.Operations {
		if o.Status != tank.OK {
			return fmt.Sprintf("the tank itself misses corner %s (%s): %s", o.Corner.Name, o.Status, o.Reason)
		}
	}
	return "the tank itself misses a corner"
}

// InfeasibleError says that no candidate of a part keeps every limit. The
// ladder of the design tells for each size which one stopped it.
type InfeasibleError struct {
	Part    string
	Nearest Size
}

func (e *InfeasibleError) Error() string {
	if e.Nearest.Shape == "" {
		return fmt.Sprintf("no core size is left for the %s: see families, shapes, confidence and former in the build section", e.Part)
	}
	return fmt.Sprintf("no core size gives a %s that keeps every limit; nearest is %s, which misses %s", e.Part, e.Nearest.Shape, e.Nearest.Reason.Limit)
}

// loopTolerance is the largest relative change of tank or currents at which the
// loop between parts and tank ends, and loopLimit bounds it.
const (
	loopTolerance = 1e-4
	loopLimit     = 12
)

// Run makes the whole design of a job. The error is a *TankError or an
// *InfeasibleError when the work came to an end without parts; the Design then
// holds what is known. When a limit is missed, changes that repair it are tried.
func Run(ctx context.Context, j job.Job, tables Tables, progress Progress) (*Design, error) {
	d, s, err := run(ctx, j, tables, progress)
	if s == nil || d == nil {
		return nil, err
	}
	var lost *TankError
	var none *InfeasibleError
	if err != nil && !errors.As(err, &lost) && !errors.As(err, &none) {
		return d, err
	}
	if err == nil {
		if err := s.secondChoices(ctx, d); err != nil {
			return d, err
		}
	}
	if err != nil || !d.Feasible {
		if err := s.advise(ctx, d, tables); err != nil {
			return d, err
		}
	}
	return d, err
}

// run is Run without second choices and advice.
func run(ctx context.Context, j job.Job, tables Tables, progress Progress) (*Design, *search, error) {
	s, err := newSearch(j, tables)
	if err != nil {
		return nil, nil, err
	}
	d := &Design{Job: j, AsBuilt: j.Tank}
	d.Wanted, err = tank.SolveAll(ctx, j.Tank, j.Corners)
	if err != nil {
		return nil, nil, err
	}
	d.Operations = d.Wanted
	if !reached(d.Wanted) {
		return d, s, &TankError{d.Wanted}
	}
	if err := s.choose(ctx, d, progress); err != nil {
		return d, s, err
	}
	s.setMeets(d)
	return d, s, s.judge(d)
}

func reached(operations []tank.Operation) bool {
	for _, o := range operations {
		if o.Status != tank.OK {
			return false
		}
	}
	return true
}

// tie is how much more volume counts as the same size.
const tie = 0.02

// A pair is a transformer and the inductor that goes with it, by their places in
// the lists of sizes; inductor is -1 where leakage does its work.
type pair struct{ transformer, inductor int }

func keeps(r rated) bool { return r.rating != nil && r.missed == nil }

// sum returns loss, volume and mass of a pair.
func sum(t, l rated) [3]float64 {
	x := [3]float64{t.loss, t.rating.Volume, t.rating.Mass}
	if l.rating != nil {
		x[0] += l.loss
		x[1] += l.rating.Volume
		x[2] += l.rating.Mass
	}
	return x
}

// pick returns the pair that the objective wants among the parts that keep every
// limit, ties in volume by loss. ok is false when there is none; over is then the
// least total loss where that is what stops it.
func (s *search) pick(transformers, inductors []rated, barred map[[2]string]bool) (best pair, over float64, ok bool) {
	if s.leakage {
		inductors = []rated{{}}
	}
	type scored struct {
		pair
		x [3]float64
	}
	var list []scored
	least := [3]float64{math.Inf(1), math.Inf(1), math.Inf(1)}
	for i, t := range transformers {
		if !keeps(t) {
			continue
		}
		for k, l := range inductors {
			if !s.leakage && !keeps(l) {
				continue
			}
			if barred[[2]string{t.shape.Name, l.shape.Name}] {
				continue
			}
			p := scored{pair{i, k}, sum(t, l)}
			if limit := s.job.Build.Limits.TotalLoss; limit != nil && p.x[0] > *limit {
				if over == 0 || p.x[0] < over {
					over = p.x[0]
				}
				continue
			}
			for m := range least {
				least[m] = math.Min(least[m], p.x[m])
			}
			list = append(list, p)
		}
	}
	score := func(p scored) float64 {
		o := s.job.Build.Objective
		switch o.Word {
		case "smallest":
			return p.x[1]
		case "least-loss":
			return p.x[0]
		case "lightest":
			return p.x[2]
		}
		return o.Loss*p.x[0]/least[0] + o.Volume*p.x[1]/least[1] + o.Mass*p.x[2]/least[2]
	}
	at := -1
	for i, p := range list {
		if at < 0 || score(p) < score(list[at]) {
			at = i
		}
	}
	if at < 0 {
		return pair{}, over, false
	}
	if s.job.Build.Objective.Word == "smallest" {
		most := list[at].x[1] * (1 + tie)
		for i, p := range list {
			if p.x[1] <= most && p.x[0] < list[at].x[0] {
				at = i
			}
		}
	}
	best = list[at].pair
	if s.leakage {
		best.inductor = -1
	}
	return best, 0, true
}

// closures bounds how often a pair that keeps its limits by itself but not in the
// tank as built is replaced.
const closures = 16

// choose searches both parts and closes the loop, once for each way to make the
// resonant inductance that the job allows.
func (s *search) choose(ctx context.Context, d *Design, progress Progress) error {
	ways := map[string][]bool{"separate": {false}, "leakage": {true}, "either": {false, true}}[s.job.Build.ResonantInductor]
	var found []*Design
	var failed error
	for i, leakage := range ways {
		s.leakage = leakage
		x := *d
		err := s.pairUp(ctx, &x, func(done, total int) {
			if progress != nil {
				progress(i*total+done, len(ways)*total)
			}
		})
		var none *InfeasibleError
		switch {
		case errors.As(err, &none):
			failed = err
			d.Ladder = append(d.Ladder, x.Ladder...)
			continue
		case err != nil:
			return err
		}
		found = append(found, &x)
	}
	if len(found) == 0 {
		return failed
	}
	best := found[0]
	for _, x := range found[1:] {
		if s.prefers(x, best) {
			best = x
		}
	}
	*d = *best
	s.leakage = d.Inductor == nil
	return s.drive(d.AsBuilt, d.Operations)
}

// prefers reports whether the objective wants design a rather than b.
func (s *search) prefers(a, b *Design) bool {
	figures := func(d *Design) [3]float64 {
		x := [3]float64{d.TotalLoss(), d.Rating.Volume, d.Rating.Mass}
		if d.InductorRating != nil {
			x[1] += d.InductorRating.Volume
			x[2] += d.InductorRating.Mass
		}
		return x
	}
	x, y := figures(a), figures(b)
	o := s.job.Build.Objective
	switch o.Word {
	case "smallest":
		if math.Abs(x[1]/y[1]-1) <= tie {
			return x[0] < y[0]
		}
		return x[1] < y[1]
	case "least-loss":
		return x[0] < y[0]
	case "lightest":
		return x[2] < y[2]
	}
	return o.Loss*x[0]/y[0]+o.Volume*x[1]/y[1]+o.Mass*x[2]/y[2] < o.Loss+o.Volume+o.Mass
}

// pairUp searches transformers, then the inductors that make up the rest of the
// resonant inductance, and closes the loop.
func (s *search) pairUp(ctx context.Context, d *Design, progress Progress) error {
	transformers := s.candidates(s.transformerLimits)
	shapes := s.candidates(s.inductorLimits)
	if s.leakage {
		shapes = nil
	}
	total := len(transformers) + len(shapes)
	at := func(base int) Progress { return func(done, _ int) { progress(base+done, total) } }
	if err := s.drive(s.job.Tank, d.Wanted); err != nil {
		return err
	}
	list, err := inOrder(ctx, transformers, s.rateTransformers, at(0))
	if err != nil {
		return err
	}
	rest := func(t rated) float64 { return s.job.Tank.Lr - equivalent(t.rating, s.job.Tank.StrayInductance).Lleak }
	inductors := func(lext float64) func(context.Context, shape.Shape, *part.Solvers) (rated, error) {
		return func(ctx context.Context, sh shape.Shape, solvers *part.Solvers) (rated, error) {
			return s.rateInductors(ctx, sh, lext, solvers)
		}
	}
	// The parts are chosen with the currents of the tank as wanted; the ones of
	// the tank as built differ a little. When a limit breaks in that last step,
	// another is tried.
	var found []rated
	barred, pairs := map[string]bool{}, map[[2]string]bool{}
	narrow := map[string]int{}
	for try := 0; ; try++ {
		first, _, some := s.pick(list, []rated{{rating: &part.Rating{}}}, pairs)
		if !some || try > closures {
			d.Ladder = append(s.ladder("transformer", list, -1), s.ladder("inductor", found, -1)...)
			return &InfeasibleError{"transformer", nearest(s.ladder("transformer", list, -1))}
		}
		best := pair{first.transformer, -1}
		if !s.leakage {
			found, err = inOrder(ctx, shapes, inductors(rest(list[first.transformer])), at(len(transformers)))
			if err != nil {
				return err
			}
			for i := range found {
				if barred[found[i].shape.Name] && keeps(found[i]) {
					found[i].missed = &Reason{"reached", 0, 1, "", "min"}
				}
			}
			var over float64
			best, over, some = s.pick(list, found, pairs)
			if !some {
				d.Ladder = append(s.ladder("transformer", list, -1), s.ladder("inductor", found, -1)...)
				if over > 0 {
					limit := *s.job.Build.Limits.TotalLoss
					return &InfeasibleError{"pair", Size{Part: "pair", Shape: list[first.transformer].shape.Name, Reason: Reason{"total_loss", over, limit, "W", "max"}}}
				}
				return &InfeasibleError{"inductor", nearest(s.ladder("inductor", found, -1))}
			}
			if best.transformer != first.transformer {
				// The inductor for what this transformer leaves.
				var solvers part.Solvers
				l, err := s.rateInductors(ctx, found[best.inductor].shape, rest(list[best.transformer]), &solvers)
				if err != nil {
					return err
				}
				if !keeps(l) {
					found[best.inductor] = l
					continue
				}
				found[best.inductor] = l
			}
		}
		t := list[best.transformer]
		var l *part.Inductor
		if best.inductor >= 0 {
			l = found[best.inductor].inductor
		}
		d.Operations = d.Wanted
		broken, reason, err := s.close(ctx, d, *t.part, l)
		if err != nil {
			return err
		}
		if broken == "" {
			if best.inductor >= 0 {
				if err := s.polish(ctx, d, &list[best.transformer], &found[best.inductor]); err != nil {
					return err
				}
				t = list[best.transformer]
			}
			d.Ladder = append(s.ladder("transformer", list, best.transformer), s.ladder("inductor", found, best.inductor)...)
			d.finishLadder()
			d.Pareto = s.pareto(list, found, best)
			d.chosen = t.plan
			if best.inductor >= 0 {
				d.chosenInductor = found[best.inductor].coil
			}
			return nil
		}
		if err := s.drive(s.job.Tank, d.Wanted); err != nil {
			return err
		}
		switch {
		case broken == "pair" && best.inductor >= 0:
			pairs[[2]string{t.shape.Name, found[best.inductor].shape.Name}] = true
		case broken == "inductor":
			barred[found[best.inductor].shape.Name] = true
		case broken == "tank" && best.inductor >= 0 && s.costly(d):
			// This inductor takes more gain than the transformer was chosen for.
			pairs[[2]string{t.shape.Name, found[best.inductor].shape.Name}] = true
		case broken == "tank" && narrow[t.shape.Name] < narrowMost:
			// The copper loses a little more than was thought: the same size again
			// with a ratio further inside.
			narrow[t.shape.Name]++
			s.ratio = s.ratio.shifted(1, -narrowStep)
			var solvers part.Solvers
			if list[best.transformer], err = s.rateTransformers(ctx, t.shape, &solvers); err != nil {
				return err
			}
		default:
			list[best.transformer].missed = reason
		}
	}
}

// polishGain is by how much of the loss a better transformer must pay for closing
// the loop once more.
const polishGain = 0.01

// polish looks once more for the transformer of the chosen size, now that the
// inductor's resistance is known rather than guessed, and takes it when both
// parts then lose less.
func (s *search) polish(ctx context.Context, d *Design, t, l *rated) error {
	s.inductorResistance = map[string]float64{}
	for _, c := range d.InductorRating.Corners {
		s.inductorResistance[c.Name] = c.PrimaryResistance
	}
	defer func() { s.inductorResistance = nil }()
	if err := s.drive(s.job.Tank, d.Wanted); err != nil {
		return err
	}
	var solvers part.Solvers
	better, err := s.rateTransformers(ctx, t.shape, &solvers)
	if err != nil || !keeps(better) || better.loss > t.loss*(1-polishGain) {
		return err
	}
	lext := s.job.Tank.Lr - equivalent(better.rating, s.job.Tank.StrayInductance).Lleak
	rest, err := s.rateInductors(ctx, l.shape, lext, &solvers)
	if err != nil || !keeps(rest) {
		return err
	}
	x := *d
	x.Operations = x.Wanted
	broken, _, err := s.close(ctx, &x, *better.part, rest.inductor)
	if err != nil || broken != "" || x.TotalLoss() >= d.TotalLoss() {
		return err
	}
	*d, *t, *l = x, better, rest
	return nil
}

// costly reports whether the copper of the inductor of d loses more at the corner
// with least gain than transformers are chosen for.
func (s *search) costly(d *Design) bool {
	worst, margin := -1, math.Inf(1)
	for i, o := range d.Operations {
		if o.Status != tank.OK {
			worst = i
			break
		}
		if o.Corner.OutputVoltage > 0 && o.PeakGainMargin < margin {
			worst, margin = i, o.PeakGainMargin
		}
	}
	if worst < 0 {
		return false
	}
	o := d.Wanted[worst]
	for _, c := range d.InductorRating.Corners {
		if c.Name == o.Corner.Name {
			return c.PrimaryResistance > inductorShare*o.OutputPower/(o.Resonant.RMS*o.Resonant.RMS)
		}
	}
	return false
}

// How often, and by what step, the window of the turns ratio is narrowed for a
// size.
const (
	narrowMost = 3
	narrowStep = 3e-4
)

// ladder lists what each size came to.
func (s *search) ladder(name string, list []rated, chosen int) []Size {
	var out []Size
	for i, r := range list {
		size := Size{Part: name, Shape: r.shape.Name, Family: r.shape.Family, Volume: r.shape.Volume(), Chosen: i == chosen, Rating: r.rating, Fields: r.fields, Looked: r.looked}
		switch {
		case r.part != nil:
			size.Construction = &r.part.Construction
		case r.inductor != nil:
			size.Construction = &r.inductor.Construction
		}
		if r.rating != nil {
			size.Loss = r.loss
		}
		if r.rating != nil && name == job.Transformer {
			size.Leakage = equivalent(r.rating, s.job.Tank.StrayInductance).Lleak / s.job.Tank.Lr
		}
		if r.missed == nil && r.rating != nil {
			size.Feasible = true
			size.Reason = s.nearestLimit(name, r)
		} else if r.missed != nil {
			size.Reason = *r.missed
		}
		out = append(out, size)
	}
	return out
}

// nearestLimit returns the limit that a part which keeps all has least room to.
func (s *search) nearestLimit(name string, r rated) Reason {
	var verdicts []part.Verdict
	if name == job.Transformer {
		verdicts = s.transformerVerdicts(r.rating, r.part.Core.Gap.Kind)
	} else {
		verdicts = partVerdicts(r.rating, s.inductorLimits)
	}
	best, room := Reason{}, math.Inf(1)
	for _, v := range verdicts {
		if v.Bound == 0 || v.Limit == "length_min" {
			continue
		}
		x := Reason{v.Limit, v.Value, v.Bound, v.Unit, v.Sense}
		left := -x.excess()
		if v.Unit == "degC" {
			// Of the rise that is allowed.
			ambient := s.job.Build.Surroundings.AmbientTemperature
			left = (v.Bound - v.Value) / (v.Bound - ambient)
		}
		if left < room {
			best, room = x, left
		}
	}
	return best
}

// finishLadder gives the chosen sizes the final ratings of the parts.
func (d *Design) finishLadder() {
	for i := range d.Ladder {
		x := &d.Ladder[i]
		switch {
		case !x.Chosen:
			continue
		case x.Part == job.Transformer:
			x.Rating, x.Construction = d.Rating, &d.Transformer.Construction
		case d.InductorRating != nil:
			x.Rating, x.Construction = d.InductorRating, &d.Inductor.Construction
		}
		x.Loss = shareWeighted(*x.Rating, d.Operations)
	}
}

// pareto returns the pairs that no other beats in both loss and volume, smallest
// first. The inductors are those for the transformer that was chosen: what other
// transformers leave of the resonant inductance differs by a few per cent.
func (s *search) pareto(transformers, inductors []rated, chosen pair) []Pair {
	if s.leakage {
		inductors = []rated{{}}
	}
	var list []Pair
	for i, t := range transformers {
		for k, l := range inductors {
			if !keeps(t) || !s.leakage && !keeps(l) {
				continue
			}
			x := sum(t, l)
			list = append(list, Pair{t.shape.Name, l.shape.Name, x[0], x[1], x[2], i == chosen.transformer && (s.leakage || k == chosen.inductor)})
		}
	}
	slices.SortStableFunc(list, func(a, b Pair) int { return cmp.Or(cmp.Compare(a.Volume, b.Volume), cmp.Compare(a.Loss, b.Loss)) })
	var out []Pair
	least := math.Inf(1)
	for _, p := range list {
		if p.Loss < least {
			least = p.Loss
			out = append(out, p)
		} else if p.Chosen {
			out = append(out, p) // a tie in volume, or not what the objective is about
		}
	}
	return out
}

// nearest returns the size that misses by the least, of those that could be wound
// where there are any.
func nearest(list []Size) Size {
	best := Size{}
	for _, x := range list {
		if x.Feasible || math.IsNaN(x.Reason.excess()) {
			continue
		}
		wound, known := x.Rating != nil, best.Rating != nil
		if best.Shape == "" || wound && !known || wound == known && x.Reason.excess() < best.Reason.excess() {
			best = x
		}
	}
	return best
}

// close puts both parts into the tank, solves it again, rates the parts with the
// new currents, trims both gaps, and so on until nothing moves. It returns the
// part that then misses a limit, if any, with the limit. l is nil where leakage
// is the resonant inductor.
func (s *search) close(ctx context.Context, d *Design, t part.Transformer, l *part.Inductor) (broken string, reason *Reason, err error) {
	var solvers part.Solvers
	tc := s.conditions(s.transformerLimits, false)
	ct, err := part.NewCoil(t.Construction, tc)
	if err != nil {
		return "", nil, err
	}
	if s.job.Tank.Lm > 0 {
		t.Core.Gap, err = ct.GapFor(&solvers, t.Core.Gap, s.job.Tank.Lm, tc.TestTemp, tc.Modes, s.magnetizing)
		if err != nil {
			return "", nil, err
		}
		t.Core.Gap = s.buildable(t.Core.Gap, s.transformerLimits.Gap)
	}
	d.Transformer, d.Inductor = &t, nil
	if l != nil {
		m, err := ct.Inductances(&solvers, t.Core.Gap, tc.TestTemp, tc.Modes)
		if err != nil {
			return "", nil, err
		}
		lext := s.job.Tank.Lr - part.NewTwoPort(m).Equivalent(s.job.Tank.StrayInductance).Lleak
		if lext <= 0 {
			return "transformer", &Reason{"leakage", s.job.Tank.Lr - lext, s.job.Tank.Lr, "H", "max"}, nil
		}
		lc := s.conditions(s.inductorLimits, false)
		cl, err := part.NewCoil(l.Construction, lc)
		if err != nil {
			return "", nil, err
		}
		x := *l
		x.Core.Gap, err = cl.GapFor(&solvers, x.Core.Gap, lext, lc.TestTemp, lc.Modes, openInductance)
		if err != nil {
			return "", nil, err
		}
		x.Core.Gap = s.buildable(x.Core.Gap, s.inductorLimits.Gap)
		d.Inductor = &x
	}
	if err := s.settle(ctx, d); err != nil {
		return "", nil, err
	}
	if r := s.firstMiss(s.transformerVerdicts(d.Rating, t.Core.Gap.Kind)); r != nil {
		return "transformer", r, nil
	}
	if d.Inductor != nil {
		if r := s.firstMiss(partVerdicts(d.InductorRating, s.inductorLimits)); r != nil {
			return "inductor", r, nil
		}
	}
	if r := s.firstMiss(s.tankVerdicts(d.AsBuilt, d.Operations)); r != nil {
		return "tank", r, nil
	}
	if limit := s.job.Build.Limits.TotalLoss; limit != nil && d.TotalLoss() > *limit {
		return "pair", &Reason{"total_loss", d.TotalLoss(), *limit, "W", "max"}, nil
	}
	return "", nil, nil
}

// buildable rounds a gap to what a build file holds: 0.1 µm, because the shop
// grinds to the A_L that it stands for; spacers come in foils.
func (s *search) buildable(g part.Gap, limits job.Gap) part.Gap {
	g.Total = math.Round(g.Total*1e7) / 1e7
	return stockFilm(g, limits)
}

// settle alternates between the tank and the ratings of the parts as they are
// until nothing moves, then rates them in detail.
func (s *search) settle(ctx context.Context, d *Design) error {
	var solvers part.Solvers
	previous := d.Operations
	for d.Iterations = 1; ; d.Iterations++ {
		if err := s.rateBoth(d, &solvers, false); err != nil {
			return err
		}
		built, each := s.asBuilt(d)
		operations, err := solveEach(ctx, each, s.job.Corners)
		if err != nil {
			return err
		}
		d.AsBuilt = built
		d.Residual = moved(previous, operations)
		d.Operations, previous = operations, operations
		if !reached(operations) {
			break // the verdict says which corner is lost
		}
		if err := s.drive(built, operations); err != nil {
			return err
		}
		if d.Residual < loopTolerance || d.Iterations >= loopLimit {
			break
		}
	}
	return s.rateBoth(d, &solvers, true)
}

// rateBoth rates both parts with the present drives.
func (s *search) rateBoth(d *Design, solvers *part.Solvers, detail bool) error {
	var err error
	d.Rating, err = part.RateTransformer(*d.Transformer, s.drives, s.conditions(s.transformerLimits, detail), solvers)
	if err != nil {
		return fmt.Errorf("transformer: %w", err)
	}
	d.InductorRating = nil
	if d.Inductor != nil {
		d.InductorRating, err = part.RateInductor(*d.Inductor, s.inductor, s.conditions(s.inductorLimits, detail), solvers)
		if err != nil {
			return fmt.Errorf("inductor: %w", err)
		}
	}
	return nil
}

// asBuilt puts the rated parts into the tank: once for the record, with the
// resistances of the continuous corner that loses most, and once for each
// corner with its own.
func (s *search) asBuilt(d *Design) (tank.Tank, []tank.Tank) {
	t := s.job.Tank
	e := equivalent(d.Rating, t.StrayInductance)
	t.Lm, t.TurnsRatio, t.Lr = e.Lm, e.Ratio, e.Lleak
	t.WindingCapacitance = d.Rating.SelfCapacitance
	if d.InductorRating != nil {
		t.Lr += d.InductorRating.OpenInductance
	}
	each := make([]tank.Tank, len(s.job.Corners))
	record := t
	worst := -1.0
	for i, c := range s.job.Corners {
		each[i] = t
		for k, r := range d.Rating.Corners {
			if r.Name != c.Name {
				continue
			}
			each[i].PrimaryResistance, each[i].SecondaryResistance = r.PrimaryResistance, r.SecondResistance
			loss := r.PrimaryLoss + r.SecondaryLoss
			if d.InductorRating != nil {
				each[i].PrimaryResistance += d.InductorRating.Corners[k].PrimaryResistance
				loss += d.InductorRating.Corners[k].PrimaryLoss
			}
			if r.Continuous && loss > worst {
				worst = loss
				record.PrimaryResistance, record.SecondaryResistance = each[i].PrimaryResistance, each[i].SecondaryResistance
			}
		}
	}
	return record, each
}

// solveEach solves each corner with its own tank, in order.
func solveEach(ctx context.Context, tanks []tank.Tank, corners []tank.Corner) ([]tank.Operation, error) {
	out := make([]tank.Operation, len(corners))
	g, ctx := errgroup.WithContext(ctx)
	g.SetLimit(runtime.GOMAXPROCS(0))
	for i, c := range corners {
		g.Go(func() error {
			if err := ctx.Err(); err != nil {
				return err
			}
			o, err := tank.Solve(tanks[i], c)
			if err != nil {
				return fmt.Errorf("corner %s: %w", c.Name, err)
			}
			out[i] = o
			return nil
		})
	}
	return out, g.Wait()
}

// moved returns the largest relative change of frequency and currents.
func moved(a, b []tank.Operation) float64 {
	worst := 0.0
	for i := range a {
		if a[i].Status != tank.OK || b[i].Status != tank.OK {
			continue
		}
		for _, x := range [][2]float64{
			{a[i].Frequency, b[i].Frequency}, {a[i].Resonant.RMS, b[i].Resonant.RMS}, {a[i].Magnetizing.Peak, b[i].Magnetizing.Peak},
		} {
			if x[0] != 0 {
				worst = math.Max(worst, math.Abs(x[1]/x[0]-1))
			}
		}
	}
	return worst
}

// Check rates the parts of an edited build against the job as they are; no
// decision is changed. When a limit is missed, changes that repair it are tried.
func Check(ctx context.Context, j job.Job, t part.Transformer, l *part.Inductor, tables Tables) (*Design, error) {
	s, err := newSearch(j, tables)
	if err != nil {
		return nil, err
	}
	s.leakage = l == nil
	d := &Design{Job: j, AsBuilt: j.Tank, Transformer: &t, Inductor: l}
	d.Wanted, err = tank.SolveAll(ctx, j.Tank, j.Corners)
	if err != nil {
		return nil, err
	}
	d.Operations = d.Wanted
	if !reached(d.Wanted) {
		return d, &TankError{d.Wanted}
	}
	if err := s.drive(j.Tank, d.Wanted); err != nil {
		return nil, err
	}
	if err := s.settle(ctx, d); err != nil {
		return d, err
	}
	if err := s.judge(d); err != nil || d.Feasible {
		return d, err
	}
	return d, s.advise(ctx, d, tables)
}

// judge fills verdicts, warnings, models and checks.
func (s *search) judge(d *Design) error {
	d.Verdicts = append(d.Verdicts, s.transformerVerdicts(d.Rating, d.Transformer.Core.Gap.Kind)...)
	if d.InductorRating != nil {
		d.Verdicts = append(d.Verdicts, partVerdicts(d.InductorRating, s.inductorLimits)...)
	}
	d.Verdicts = append(d.Verdicts, meetsVerdicts(d)...)
	d.Verdicts = append(d.Verdicts, s.tankVerdicts(d.AsBuilt, d.Operations)...)
	if limit := s.job.Build.Limits.TotalLoss; limit != nil {
		d.Verdicts = append(d.Verdicts, part.NewVerdict("tank", "", "total_loss", d.TotalLoss(), *limit, "W", "max"))
	}
	d.Feasible = true
	for _, v := range d.Verdicts {
		if math.IsNaN(v.Value) || math.IsInf(v.Value, 0) {
			return fmt.Errorf("%s: %s is not a number", v.Part, v.Limit)
		}
		d.Feasible = d.Feasible && v.Pass
	}
	s.warnings(d)
	s.handChecks(d)
	return nil
}
