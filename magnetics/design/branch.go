package design

import (
	"cmp"
	"container/heap"
	"context"
	"errors"
	"fmt"
	"math"

	"gapwright/corelib/quantity"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/gap"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/magnetics/thermal"
	"gapwright/tank"
)

// The transformers of a size are searched best first. What is known of each is a
// lower bound of its loss: at first copper that fills the whole window, then the
// estimate of the screening, at last the field of the window. The lowest bound is
// looked at next; when it lies above the best transformer found, nothing better
// is left.
//
// The screening is corrected as it goes: what the field says of one transformer,
// turns ratio, leakage and loss of each conductor size, holds nearly for others of
// its kind.

// rated is a finished candidate.
type rated struct {
	shape    shape.Shape
	plan     *plan
	part     *part.Transformer
	inductor *part.Inductor
	coil     *inductorPlan
	rating   *part.Rating
	loss     float64 // W, weighted by share
	missed   *Reason // nil: keeps every limit
	tank     bool    // missed is one of the tank's
	gain     float64 // margin of the gain beyond what is asked for, at the corner with least; NaN: not known
	fields   int     // windows solved for the size
	looked   int     // windings looked at for the size
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

// Bounds of the field solutions of one size: so many tries at most, and fewer
// when the best is still far from keeping its limits.
const (
	triesMost     = 48
	triesHopeless = 6
	hopeless      = 0.25 // excess over the limit
	familyTries   = 6    // of the same turns, insulation and order
)

// searchModes is the number of modes of the field series during the search; the
// final rating takes as many as the window needs.
const searchModes = 64

// estimateSlack is how much less than its corrected estimate a candidate may
// lose.
const estimateSlack = 1.03

// learned is what the field said of one kind of transformer on a size, over its
// screening; 0 where nothing is known.
type learned struct {
	stamp       int // counts the lessons
	ratio, leak float64
	shift       float64 // of the upper edge of the turns ratio, relative
	loss        map[lossKey]float64
	uneven      float64        // mismatch of the halves
	slow        map[[2]int]int // by layers of primary and secondary: how often their capacitance cost soft switching
}

// lossKey names a conductor size on a side.
type lossKey struct {
	side int
	foil bool
	size float64
}

func keyOf(side int, w *wire.Wire) lossKey {
	if w.Kind == wire.Foil {
		return lossKey{side, true, w.Thickness}
	}
	return lossKey{side, false, w.Diameter}
}

// factor returns by how much the loss of a winding is thought to exceed its
// screening. A size not met yet is compared with the nearest that was: eddy loss
// at the same copper goes with the square of the size.
func (l *learned) factor(side int, w *spool) float64 {
	k := keyOf(side, &w.Wire)
	if f, ok := l.loss[k]; ok {
		return f
	}
	best, at := math.Inf(1), lossKey{}
	for x := range l.loss {
		if d := math.Abs(math.Log(x.size / k.size)); x.side == k.side && x.foil == k.foil && (d < best || d == best && x.size < at.size) {
			best, at = d, x
		}
	}
	if math.IsInf(best, 1) {
		return 1
	}
	f := l.loss[at]
	return 1 + (f-1)*math.Min(1, k.size*k.size/(at.size*at.size))
}

// A family is a start with a way to keep the windings apart; only the wires and
// the free distance are open.
type family struct {
	plan
	core        float64
	least       float64
	tries       int
	ratio, leak float64 // rated over screened, of the last try
	shift       float64 // of the upper edge of the turns ratio, of the last try
	tried       map[string]bool
}

// A node is something to look at.
type node struct {
	bound  float64
	order  int
	start  *start
	family *family
	e      estimate
	stamp  int
}

type queue []*node

func (q queue) Len() int { return len(q) }
func (q queue) Less(i, j int) bool {
	return cmp.Or(cmp.Compare(q[i].bound, q[j].bound), cmp.Compare(q[i].order, q[j].order)) < 0
}
func (q queue) Swap(i, j int) { q[i], q[j] = q[j], q[i] }
func (q *queue) Push(x any)   { *q = append(*q, x.(*node)) }
func (q *queue) Pop() any {
	old := *q
	x := old[len(old)-1]
	*q = old[:len(old)-1]
	return x
}

// rateTransformers searches a size and returns the best transformer that keeps
// every limit, or the one that misses by the least.
func (s *search) rateTransformers(ctx context.Context, sh shape.Shape, solvers *part.Solvers) (rated, error) {
	best := rated{shape: sh}
	former, err := s.former(sh, 1, s.transformerLimits.Cores)
	if err != nil {
		best.missed = &Reason{"former", 0, 1, "", "min"}
		return best, nil
	}
	if r, out := outside(sh, former, s.transformerLimits.Limits); out {
		best.missed = &r
		return best, nil
	}
	// What stopped those that failed by the least: before wires were looked at, and
	// with wires.
	var early, late Reason
	note := func(nearest *Reason) func(Reason) {
		return func(r Reason) {
			if nearest.Limit == "" || r.excess() < nearest.excess() || math.IsNaN(nearest.excess()) {
				*nearest = r
			}
		}
	}
	miss := note(&late)
	heat, err := s.mostHeat(sh, former, s.transformerLimits.Limits)
	if err != nil {
		return best, fmt.Errorf("%s: %w", sh.Name, err)
	}
	var q queue
	order := 0
	push := func(n *node) {
		n.order = order
		order++
		heap.Push(&q, n)
	}
	for _, x := range s.starts(sh, note(&early)) {
		push(&node{bound: x.least, start: &x})
	}
	fronts := map[frontKey][]choice{}
	lessons := map[kind]*learned{}
	wind := func(f *family) {
		known := lessons[f.kind()]
		best.looked++
		shift := known.shift
		if f.tries > 0 {
			shift = f.shift
		}
		e, ok := s.wind(f.plan, s.ratio.shifted(1, shift), fronts, known, f, miss)
		if !ok || f.tried[e.plan.signature()] {
			return
		}
		e.loss += f.core
		push(&node{bound: math.Max(f.least, e.loss), family: f, e: e, stamp: known.stamp})
	}
	tried := 0
	for q.Len() > 0 {
		if err := ctx.Err(); err != nil {
			return best, err
		}
		n := heap.Pop(&q).(*node)
		if best.rating != nil {
			if best.missed == nil && n.bound > best.loss*estimateSlack || n.bound > heat*estimateSlack {
				break // nothing that is left loses less, or is cool enough
			}
			if tried >= triesMost || best.missed != nil && best.missed.excess() > hopeless && tried >= triesHopeless {
				break
			}
		}
		if n.start != nil {
			for _, g := range s.gaps() {
				for _, build := range s.builds() {
					if n.start.Arrangement == "sections" && build.Margin > 0 {
						continue // the chamber wall separates; margins would only cost breadth
					}
					for _, bifilar := range s.halves() {
						f := &family{plan: n.start.plan, core: n.start.core, least: n.start.least, tried: map[string]bool{}}
						f.Build, f.Bifilar, f.Gap = build, bifilar, g
						if lessons[f.kind()] == nil {
							lessons[f.kind()] = &learned{loss: map[lossKey]float64{}, slow: map[[2]int]int{}}
						}
						wind(f)
					}
				}
			}
			continue
		}
		f := n.family
		known := lessons[f.kind()]
		if n.stamp != known.stamp {
			wind(f)
			continue
		}
		tried++
		f.tries++
		f.tried[n.e.plan.signature()] = true
		r, err := s.finishTransformer(n.e.plan, solvers)
		if err != nil {
			if errors.Is(err, errNoGap) {
				continue
			}
			return best, err
		}
		best.fields += r.fields
		s.learn(known, f, n.e, r)
		if better(r, best) {
			r.fields, r.looked = best.fields, best.looked
			best = r
		}
		if f.tries < familyTries {
			wind(f)
		}
	}
	if best.rating == nil && best.missed == nil {
		switch {
		case late.Limit != "":
			best.missed = &late
		case early.Limit != "":
			best.missed = &early
		default:
			best.missed = &Reason{"turns", 0, 1, "", "min"}
		}
	}
	return s.split(best, solvers)
}

// splitGain is by how much of the loss more gap pieces must pay for the gapped
// half or the disc that they cost (own proposal).
const splitGain = 0.03

// split tries the gap of the best transformer of a size in more pieces: for less
// loss, or because one piece would be too long.
func (s *search) split(best rated, solvers *part.Solvers) (rated, error) {
	if best.rating == nil || best.plan.Gap.Kind != part.Ground || best.missed != nil && best.missed.Limit != "length_max" {
		return best, nil
	}
	for pieces := 2; pieces <= s.transformerLimits.Gap.PiecesMax; pieces++ {
		p := *best.plan
		p.Gap.Pieces = pieces
		r, err := s.finishTransformer(p, solvers)
		if errors.Is(err, errNoGap) {
			continue
		}
		if err != nil {
			return best, err
		}
		r.fields, r.looked = best.fields+r.fields, best.looked
		best.fields = r.fields
		if keeps(r) && (!keeps(best) || r.loss < best.loss*(1-splitGain)) {
			best = r
		}
	}
	return best, nil
}

// shift returns by how much, relatively, the upper edge of the turns ratio must
// be moved so that it is what a rated transformer says: where its gain would just
// keep the margin. The copper of a kind loses more or less at the corner that
// wants most gain than the mean over all corners tells.
func (s *search) shift(r rated) (by float64, ok bool) {
	if math.IsNaN(r.gain) || s.gainSlope >= 0 {
		return 0, false
	}
	copper := 0.0
	for i, c := range r.rating.Corners {
		copper += s.shares[i] * (c.PrimaryLoss + c.SecondaryLoss)
	}
	edge := s.ratio.at(1.5 * copper / s.power)[1]
	if edge >= s.job.Tank.TurnsRatio*(1+s.transformerLimits.Limits.RatioError)*0.9999 {
		return 0, false // not the gain that bounds it
	}
	needed := equivalent(r.rating, s.job.Tank.StrayInductance).Ratio * (1 - r.gain/s.gainSlope)
	return math.Max(-0.02, math.Min(0.02, needed/edge-1)), true
}

// signature tells plans of a family apart.
func (p plan) signature() string {
	return fmt.Sprint(p.Primary.Wire, p.Primary.Parallel, p.Primary.Layers, p.Secondary.Wire, p.Secondary.Parallel, p.Secondary.Layers, math.Round(p.Extra/extraStep))
}

// learn keeps what a rating says against its estimate.
func (s *search) learn(known *learned, f *family, e estimate, r rated) {
	known.stamp++
	x := equivalent(r.rating, s.job.Tank.StrayInductance)
	f.ratio, f.leak = x.Ratio/e.ratio, 1
	if e.leak > 0 {
		f.leak = x.Lleak / e.leak
	}
	known.ratio, known.leak = f.ratio, f.leak
	if by, ok := s.shift(r); ok {
		known.shift, f.shift = by, by
	}
	var loss [2]float64
	for i, c := range r.rating.Corners {
		loss[0] += s.shares[i] * c.PrimaryLoss
		loss[1] += s.shares[i] * c.SecondaryLoss
	}
	for i, w := range []*wire.Wire{&e.Primary.Wire, &e.Secondary.Wire} {
		if e.raw[i] > 0 {
			known.loss[keyOf(i, w)] = loss[i] / e.raw[i]
		}
	}
	if r.tank && r.missed.Limit == "soft_switching_margin" {
		known.slow[[2]int{e.Primary.Layers, e.Secondary.Layers}]++
	}
	if h := r.rating.ShortHalves; len(h) == 2 && e.uneven > evenLeast {
		known.uneven = math.Max(0.1, math.Abs(h[0]-h[1])/r.rating.ShortInductance/e.uneven)
	}
}

// slowMost is after how many transformers whose capacitance costs soft switching
// no others with as many layers are tried.
const slowMost = 2

// evenLeast is the estimated mismatch of halves below which it teaches nothing.
const evenLeast = 0.002

// mostHeat is the most that a wound part can lose with winding and core no
// hotter than their limits, W: both at their limits, all heat to the air and the
// wall, as if the window were wound full. Infinite when no corner lasts.
func (s *search) mostHeat(sh shape.Shape, former shape.Former, l job.Limits) (float64, error) {
	if !s.heats {
		return math.Inf(1), nil
	}
	body, err := part.Body(sh, former, former.Height, l.HotSpotAllowance)
	if err != nil {
		return 0, err
	}
	around := s.surroundings()
	heat := thermal.Shed(body.Winding, l.WindingTemperature-l.HotSpotAllowance, around) + thermal.Shed(body.Core, l.CoreTemperature, around)
	if around.WallConductance > 0 {
		heat += around.WallConductance * (l.CoreTemperature - around.Wall)
	}
	return heat, nil
}

var errNoGap = errors.New("no gap")

// finishTransformer makes the part of a plan, finds its gap and rates it.
func (s *search) finishTransformer(p plan, solvers *part.Solvers) (rated, error) {
	cond := s.conditions(s.transformerLimits, false)
	cond.Modes = searchModes
	t := s.transformerPart(p)
	c, err := part.NewCoil(t.Construction, cond)
	if err != nil {
		return rated{}, err
	}
	out := rated{shape: p.Shape, plan: &p, part: &t, fields: 2}
	if t.Core.Gap.Kind != part.Closed {
		g, n, err := gapFor(c, solvers, t.Core.Gap, s.job.Tank.Lm, cond, s.magnetizing)
		if err != nil {
			return rated{}, fmt.Errorf("%w: %w", errNoGap, err)
		}
		t.Core.Gap = stockFilm(g, s.transformerLimits.Gap)
		out.fields += n
	}
	c.Construction = t.Construction
	out.rating, err = c.RateTransformer(t, s.drives, cond, solvers)
	if err != nil {
		return rated{}, err
	}
	out.loss = s.weighted(out.rating)
	out.missed = s.firstMiss(s.transformerVerdicts(out.rating, t.Core.Gap.Kind))
	out.gain = math.NaN()
	if out.missed == nil || out.missed.Limit == "ratio_error" {
		var miss *Reason
		miss, out.gain = s.tankMiss(out.rating)
		if out.missed == nil {
			out.missed, out.tank = miss, miss != nil
		}
	}
	return out, nil
}

// magnetizing reduces an inductance matrix to the tank's Lm.
func (s *search) magnetizing(l [][]float64) float64 {
	return part.NewTwoPort(l).Equivalent(s.job.Tank.StrayInductance).Lm
}

// weighted returns the loss of a part weighted as the search ranks.
func (s *search) weighted(r *part.Rating) float64 {
	sum := 0.0
	for i, c := range r.Corners {
		sum += s.shares[i] * c.Loss()
	}
	return sum
}

// gapFor is part's own way to a gap with fewer field solutions: 1/L is nearly
// linear in the gap, so that a secant from McLyman's gap is within a few parts in
// ten thousand after two or three. It returns how many it took.
func gapFor(c *part.Coil, solvers *part.Solvers, like part.Gap, want float64, cond part.Conditions, value func([][]float64) float64) (part.Gap, int, error) {
	set := func(length float64) part.Gap {
		g := like
		g.Total = length
		if g.Kind == part.Spacer {
			g.Thickness, g.Total = length, 2*length
		}
		return g
	}
	sh := c.Shape()
	n := float64(c.Construction.Windings[0].Turns)
	core := gap.Core{Ae: sh.Ae, Le: sh.Le, Mu: c.Ferrite.MuI(cond.TestTemp).Value, Breadth: sh.WindowBreadth(), Pieces: max(like.Pieces, 1)}
	guess, err := gap.Length(want, n, core)
	if err != nil {
		return part.Gap{}, 0, err
	}
	if like.Kind == part.Spacer {
		guess /= 2
	}
	const steps = 6
	closed := sh.C1 / (quantity.Mu0 * core.Mu * n * n)
	x, y := 0.0, closed
	for k := range steps {
		l, err := c.Inductances(solvers, set(guess), cond.TestTemp, cond.Modes)
		if err != nil {
			return part.Gap{}, k + 1, err
		}
		inverse := 1 / value(l)
		slope := (inverse - y) / (guess - x)
		next := guess + (1/want-inverse)/slope
		if !(slope > 0) || !(next > 0) || next > sh.WindowBreadth()/2 {
			break
		}
		step := math.Abs(next-guess) / next
		x, y, guess = guess, inverse, next
		// The error of a secant goes with the product of its last two steps.
		if k > 0 && step < 0.02 || step < 1e-4 {
			return set(next), k + 1, nil
		}
	}
	g, err := c.GapFor(solvers, like, want, cond.TestTemp, cond.Modes, value)
	return g, steps + 8, err
}

// inductorShare is the part of the power that the copper of a separate resonant
// inductor is thought to lose when the transformer is chosen.
const inductorShare = 0.002

// tankMiss solves the tank with a transformer as rated and returns the limit of
// the tank that it then misses by the most, and the gain it has left. A separate inductor is taken to lose
// its usual share in copper; the loop checks with the real one.
func (s *search) tankMiss(r *part.Rating) (miss *Reason, gain float64) {
	d := Design{Job: s.job, Rating: r}
	built, each := s.asBuilt(&d)
	if !s.leakage {
		built.Lr = s.job.Tank.Lr
	}
	operations := make([]tank.Operation, len(each))
	for i := range each {
		each[i].Lr = built.Lr
		if o := &s.operations[i]; !s.leakage && o.Status == tank.OK {
			more, known := s.inductorResistance[o.Corner.Name]
			if !known {
				more = inductorShare * o.OutputPower / (o.Resonant.RMS * o.Resonant.RMS)
			}
			each[i].PrimaryResistance += more
		}
		o, err := tank.Solve(each[i], s.job.Corners[i])
		if err != nil {
			return &Reason{"reached", 0, 1, "", "min"}, math.NaN()
		}
		operations[i] = o
	}
	verdicts := s.tankVerdicts(built, operations)
	return s.firstMiss(verdicts), s.gainLeft(verdicts)
}

// gainLeft returns the margin of the gain beyond what is asked for, at the corner
// that has least of it; NaN where no corner has one, or the parts cannot keep it.
func (s *search) gainLeft(verdicts []part.Verdict) float64 {
	least := math.NaN()
	for _, v := range verdicts {
		if v.Limit == "gain_margin" && !s.lost[tankLimit(v)] && !(v.Value-v.Bound >= least) {
			least = v.Value - v.Bound
		}
	}
	return least
}
