package design

import (
	"context"
	"errors"
	"fmt"
	"math"
	"runtime"

	"golang.org/x/sync/errgroup"

	"gapwright/corelib/quantity"
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
// holds what is known.
func Run(ctx context.Context, j job.Job, tables Tables, progress Progress) (*Design, error) {
	s, err := newSearch(j, tables)
	if err != nil {
		return nil, err
	}
	d := &Design{Job: j, AsBuilt: j.Tank}
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
	if err := s.choose(ctx, d, progress); err != nil {
		return d, err
	}
	return d, s.judge(d)
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

// score returns the figure that the objective wants small.
func (s *search) score(r rated, best [3]float64) float64 {
	o := s.job.Build.Objective
	w := [3]float64{o.Loss, o.Volume, o.Mass}
	switch o.Word {
	case "smallest":
		return r.rating.Volume
	case "least-loss":
		return r.loss
	case "lightest":
		return r.rating.Mass
	}
	return w[0]*r.loss/best[0] + w[1]*r.rating.Volume/best[1] + w[2]*r.rating.Mass/best[2]
}

// pick returns the index of the best part that keeps every limit, ties in
// volume by loss, or -1.
func (s *search) pick(list []rated) int {
	best := [3]float64{math.Inf(1), math.Inf(1), math.Inf(1)}
	for _, r := range list {
		if r.rating != nil && r.missed == nil {
			best = [3]float64{math.Min(best[0], r.loss), math.Min(best[1], r.rating.Volume), math.Min(best[2], r.rating.Mass)}
		}
	}
	at, least := -1, math.Inf(1)
	for i, r := range list {
		if r.rating == nil || r.missed != nil {
			continue
		}
		if x := s.score(r, best); x < least {
			at, least = i, x
		}
	}
	if at < 0 || s.job.Build.Objective.Word != "smallest" {
		return at
	}
	for i, r := range list {
		if r.rating != nil && r.missed == nil && r.rating.Volume <= least*(1+tie) && r.loss < list[at].loss {
			at = i
		}
	}
	return at
}

// enough tells when the sizes looked at suffice: for the smallest parts as soon
// as one keeps every limit and the next size is larger by more than a tie.
func (s *search) enough(shapes []shape.Shape) func([]rated) bool {
	return func(done []rated) bool {
		if s.job.Build.Objective.Word != "smallest" || len(done) >= len(shapes) {
			return false
		}
		for _, r := range done {
			if r.rating != nil && r.missed == nil {
				return shapes[len(done)].Volume() > r.rating.Volume*(1+tie)
			}
		}
		return false
	}
}

// choose searches both parts and closes the loop.
func (s *search) choose(ctx context.Context, d *Design, progress Progress) error {
	transformers := s.candidates(s.transformerLimits)
	inductors := s.candidates(s.inductorLimits)
	total := len(transformers) + len(inductors)
	report := func(base int) Progress {
		if progress == nil {
			return nil
		}
		return func(done, _ int) { progress(base+done, total) }
	}
	list, err := inOrder(ctx, transformers, s.rateTransformers, s.enough(transformers), report(0))
	if err != nil {
		return err
	}
	// The parts are chosen with the currents of the tank as wanted; the ones of
	// the tank as built differ a little. When a limit breaks in that last step,
	// the next best is tried.
	for {
		at := s.pick(list)
		if at < 0 {
			d.Ladder = append(d.Ladder, ladder("transformer", list, -1)...)
			return &InfeasibleError{"transformer", nearest(ladder("transformer", list, -1))}
		}
		t := list[at]
		lext := s.job.Tank.Lr - equivalent(t.rating, s.job.Tank.StrayInductance).Lleak
		found, err := inOrder(ctx, inductors, func(ctx context.Context, sh shape.Shape, solvers *part.Solvers) (rated, error) {
			return s.rateInductors(ctx, sh, lext, solvers)
		}, s.enough(inductors), report(len(transformers)))
		if err != nil {
			return err
		}
		l := s.pick(found)
		d.Ladder = append(ladder("transformer", list, at), ladder("inductor", found, l)...)
		if l < 0 {
			return &InfeasibleError{"inductor", nearest(ladder("inductor", found, -1))}
		}
		broken, err := s.close(ctx, d, *t.part, *found[l].inductor)
		if err != nil {
			return err
		}
		switch broken {
		case "transformer":
			list[at].missed = s.firstMiss(append(s.transformerVerdicts(d.Rating), s.tankVerdicts(d.AsBuilt, d.Operations)...))
			if s.pick(list) < 0 {
				// The sizes looked at ended with this one.
				more, err := inOrder(ctx, transformers[len(list):], s.rateTransformers, s.enough(transformers[len(list):]), nil)
				if err != nil {
					return err
				}
				list = append(list, more...)
			}
		case "inductor":
			// Next time with a little less room for the losses of the loop.
			inductors = without(inductors, found[l].shape)
		default:
			return nil
		}
		if err := s.drive(s.job.Tank, d.Wanted); err != nil {
			return err
		}
	}
}

func without(list []shape.Shape, drop shape.Shape) []shape.Shape {
	var out []shape.Shape
	for _, x := range list {
		if x.Name != drop.Name {
			out = append(out, x)
		}
	}
	return out
}

// ladder lists what each size came to.
func ladder(name string, list []rated, chosen int) []Size {
	var out []Size
	for i, r := range list {
		size := Size{Part: name, Shape: r.shape.Name, Volume: r.shape.Volume(), Chosen: i == chosen}
		if r.rating != nil {
			size.Loss = r.loss
		}
		if r.missed == nil && r.rating != nil {
			size.Feasible = true
		} else if r.missed != nil {
			size.Reason = *r.missed
		}
		out = append(out, size)
	}
	return out
}

// nearest returns the size that misses by the least.
func nearest(list []Size) Size {
	best := Size{}
	for _, x := range list {
		if x.Feasible || math.IsNaN(x.Reason.excess()) {
			continue
		}
		if best.Shape == "" || x.Reason.excess() < best.Reason.excess() {
			best = x
		}
	}
	return best
}

// close puts both parts into the tank, solves it again, rates the parts with the
// new currents, trims both gaps, and so on until nothing moves. It returns the
// part that then misses a limit, if any.
func (s *search) close(ctx context.Context, d *Design, t part.Transformer, l part.Inductor) (broken string, err error) {
	var solvers part.Solvers
	tc := s.conditions(s.transformerLimits, false)
	ct, err := part.NewCoil(t.Construction, tc)
	if err != nil {
		return "", err
	}
	cl, err := part.NewCoil(l.Construction, s.conditions(s.inductorLimits, false))
	if err != nil {
		return "", err
	}
	if s.job.Tank.Lm > 0 {
		t.Core.Gap, err = ct.GapFor(&solvers, t.Core.Gap, s.job.Tank.Lm, tc.TestTemp, tc.Modes, func(m [][]float64) float64 {
			return part.NewTwoPort(m).Equivalent(s.job.Tank.StrayInductance).Lm
		})
		if err != nil {
			return "", err
		}
		t.Core.Gap = s.buildable(t.Core.Gap)
	}
	m, err := ct.Inductances(&solvers, t.Core.Gap, tc.TestTemp, tc.Modes)
	if err != nil {
		return "", err
	}
	lext := s.job.Tank.Lr - part.NewTwoPort(m).Equivalent(s.job.Tank.StrayInductance).Lleak
	if lext <= 0 {
		return "", fmt.Errorf("the transformer's leakage leaves %s for the inductor", quantity.Format(lext, quantity.Henry))
	}
	l.Core.Gap, err = cl.GapFor(&solvers, l.Core.Gap, lext, tc.TestTemp, tc.Modes, func(m [][]float64) float64 { return m[0][0] })
	if err != nil {
		return "", err
	}
	l.Core.Gap = s.buildable(l.Core.Gap)
	d.Transformer, d.Inductor = &t, &l
	if err := s.settle(ctx, d); err != nil {
		return "", err
	}
	if s.firstMiss(s.transformerVerdicts(d.Rating)) != nil || s.firstMiss(s.tankVerdicts(d.AsBuilt, d.Operations)) != nil {
		return "transformer", nil
	}
	if s.firstMiss(partVerdicts(d.InductorRating, s.inductorLimits, true)) != nil {
		return "inductor", nil
	}
	return "", nil
}

// buildable rounds a gap to what can be written on a sheet: 1 µm; the shop
// grinds to the A_L, and spacers come in foils.
func (s *search) buildable(g part.Gap) part.Gap {
	g.Total = math.Round(g.Total*1e6) / 1e6
	g.Thickness = math.Round(g.Thickness*1e6) / 1e6
	return g
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
// decision is changed.
func Check(ctx context.Context, j job.Job, t part.Transformer, l *part.Inductor, tables Tables) (*Design, error) {
	s, err := newSearch(j, tables)
	if err != nil {
		return nil, err
	}
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
	return d, s.judge(d)
}

// judge fills verdicts, warnings, models and checks.
func (s *search) judge(d *Design) error {
	d.Verdicts = append(d.Verdicts, s.transformerVerdicts(d.Rating)...)
	if d.InductorRating != nil {
		d.Verdicts = append(d.Verdicts, partVerdicts(d.InductorRating, s.inductorLimits, true)...)
	}
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

var _ = errors.New
