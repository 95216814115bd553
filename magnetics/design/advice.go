package design

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/tank"
)

// Advice is one single change that repairs what is missed, found by trying it.
type Advice struct {
	Change string // what to change, from what to what
	Effect string // what comes of it, with its numbers
	Cost   int    // 1 gap, 2 wire, 3 turns, 4 order and insulation, 5 material, 6 core, 7 limit, 8 tank
	Limit  string // the limit that it was tried for
}

// The costs of a change, in the order in which a workshop would rather do it.
const (
	costGap = iota + 1
	costWire
	costTurns
	costOrder
	costMaterial
	costCore
	costLimit
	costTank
)

// adviceSizes is how many core sizes, those that miss by the least, a change of
// the job is tried on.
const adviceSizes = 4

// advise tries single changes, one at a time, and keeps those after which
// nothing is missed.
func (s *search) advise(ctx context.Context, d *Design, tables Tables) error {
	var missed []part.Verdict
	own := true // of the parts
	for _, v := range d.Verdicts {
		if !v.Pass {
			missed = append(missed, v)
			own = own && (v.Part != "tank" || !s.lost[tankLimit(v)])
		}
	}
	if !reached(d.Wanted) || len(s.lost) > 0 {
		if err := s.adviseTank(ctx, d); err != nil {
			return err
		}
		if !reached(d.Wanted) || len(missed) > 0 && !own {
			return nil
		}
	}
	if d.Transformer != nil && d.Rating != nil && len(d.Ladder) == 0 {
		return s.adviseParts(ctx, d, tables, missed)
	}
	return s.adviseJob(ctx, d, tables)
}

// adviseTank looks for the smallest change of each tank value with which the
// wanted tank keeps what it misses.
func (s *search) adviseTank(ctx context.Context, d *Design) error {
	limit := ""
	missedBy := func(t tank.Tank) (bool, string, error) {
		operations, err := tank.SolveAll(ctx, t, s.job.Corners)
		if err != nil {
			return false, "", err
		}
		if !reached(operations) {
			return true, "reached", nil
		}
		words := ""
		nearest := math.Inf(1)
		built := t
		for _, v := range s.tankVerdictsOf(built, operations, t) {
			if !v.Pass {
				return true, v.Limit, nil
			}
			if x := -(Reason{v.Limit, v.Value, v.Bound, v.Unit, v.Sense}).excess(); v.Limit != "reached" && v.Limit != "resonance_error" && x < nearest {
				nearest = x
				words = fmt.Sprintf("nearest then %s at corner %s: %.1f %%, at least %.4g %%", v.Limit, v.Corner, 100*v.Value, 100*v.Bound)
			}
		}
		return false, words, nil
	}
	_, limit, err := missedBy(s.job.Tank)
	if err != nil {
		return err
	}
	type knob struct {
		name, unit string
		scale      float64
		at         func(t *tank.Tank) *float64
	}
	knobs := []knob{
		{"turns_ratio", "", 1, func(t *tank.Tank) *float64 { return &t.TurnsRatio }},
		{"magnetizing_inductance", "uH", 1e6, func(t *tank.Tank) *float64 { return &t.Lm }},
		{"resonant_inductance", "uH", 1e6, func(t *tank.Tank) *float64 { return &t.Lr }},
		{"resonant_capacitance", "nF", 1e9, func(t *tank.Tank) *float64 { return &t.Cr }},
		{"dead_time", "ns", 1e9, func(t *tank.Tank) *float64 { return &t.DeadTime }},
		{"frequency_min", "kHz", 1e-3, func(t *tank.Tank) *float64 { return &t.FrequencyMin }},
	}
	steps := []float64{0.01, 0.02, 0.03, 0.05, 0.07, 0.1, 0.15, 0.2, 0.3}
	type found struct {
		Advice
		step float64
	}
	var list []found
	for _, k := range knobs {
		t := s.job.Tank
		from := *k.at(&t)
		if from == 0 {
			continue
		}
	search:
		for _, step := range steps {
			for _, sign := range []float64{-1, 1} {
				if err := ctx.Err(); err != nil {
					return err
				}
				t := s.job.Tank
				*k.at(&t) = from * (1 + sign*step)
				miss, words, err := missedBy(t)
				if err != nil || miss {
					continue // such a tank may have no steady state; the next is tried
				}
				list = append(list, found{Advice{
					Change: strings.TrimSpace(fmt.Sprintf("tank.%s %.4g -> %.4g %s", k.name, from*k.scale, from*(1+sign*step)*k.scale, k.unit)),
					Effect: "the tank keeps all its limits; " + words, Cost: costTank, Limit: limit,
				}, step})
				break search
			}
		}
	}
	slices.SortStableFunc(list, func(a, b found) int {
		switch {
		case a.step < b.step:
			return -1
		case a.step > b.step:
			return 1
		}
		return 0
	})
	for _, x := range list {
		d.Advice = append(d.Advice, x.Advice)
	}
	return nil
}

// tankVerdictsOf holds the limits against a tank that is itself what is wanted.
func (s *search) tankVerdictsOf(built tank.Tank, operations []tank.Operation, wanted tank.Tank) []part.Verdict {
	x := *s
	x.job.Tank = wanted
	return x.tankVerdicts(built, operations)
}

// A trial is a change of the job.
type trial struct {
	change string
	cost   int
	job    job.Job
}

// pin returns a job that leaves nothing open but what is listed: the decisions
// of the parts of d are written into it as limits.
func (s *search) pin(d *Design, open ...string) (job.Job, error) {
	j := s.job
	free := func(what string) bool { return slices.Contains(open, what) }
	b := &j.Build
	b.ResonantInductor = "separate"
	if d.Inductor == nil {
		b.ResonantInductor = "leakage"
	}
	stock := func(c *part.Construction) []string {
		var list []string
		for _, e := range c.Build {
			if e.Turns > 0 {
				if w := e.Wire.String(); !slices.Contains(list, w) {
					list = append(list, w)
				}
			}
		}
		return list
	}
	pinPart := func(l *job.PartLimits, c *part.Construction) {
		if !free("core") {
			l.Cores.Shapes = []string{c.Core.Shape}
			l.Cores.Former = "derived"
		}
		if !free("material") {
			l.Cores.Materials = []string{c.Core.Material}
		}
		if !free("wire") {
			l.Wires.Stock = stock(c)
		}
		if c.Core.Gap.Kind == part.Spacer && !free("pieces") {
			l.Gap.Kind = "spacer"
		} else if !free("pieces") {
			l.Gap.Kind = "ground"
			l.Gap.PiecesMax = max(c.Core.Gap.Pieces, 1)
		}
	}
	t := &d.Transformer.Construction
	pinPart(&b.Transformer.PartLimits, t)
	if !free("turns") {
		b.Transformer.PrimaryTurns = [2]int{t.Windings[0].Turns, t.Windings[0].Turns}
		b.Transformer.SecondaryTurns = [2]int{t.Windings[1].Turns, t.Windings[1].Turns}
	}
	if !free("order") {
		b.Transformer.Arrangements = []string{d.Rating.Arrangement}
	}
	if d.Inductor != nil {
		l := &d.Inductor.Construction
		pinPart(&b.Inductor.PartLimits, l)
		if !free("turns") {
			b.Inductor.Turns = [2]int{l.Windings[0].Turns, l.Windings[0].Turns}
		}
	}
	return j, nil
}

// adviseParts tries single changes of parts as they stand in a build file.
func (s *search) adviseParts(ctx context.Context, d *Design, tables Tables, missed []part.Verdict) error {
	limit := missed[0].Limit
	for _, x := range []struct {
		words string
		cost  int
		open  []string
	}{
		{"gap: ground to the length that gives the wanted inductances", costGap, nil},
		{"gap: in more pieces, or of film", costGap, []string{"pieces"}},
		{"wire: another one, same turns and order", costWire, []string{"wire"}},
		{"turns, with wires that fit", costTurns, []string{"turns", "wire"}},
		{"order of the windings, with turns and wires that fit", costOrder, []string{"order", "turns", "wire"}},
		{"material, with turns and wires that fit", costMaterial, []string{"material", "turns", "wire"}},
		{"core", costCore, []string{"core", "order", "turns", "wire", "pieces"}},
	} {
		j, err := s.pin(d, x.open...)
		if err != nil {
			return err
		}
		if slices.Contains(x.open, "material") {
			j.Build.Transformer.Cores.Materials = s.table.Names()
			j.Build.Inductor.Cores.Materials = s.table.Names()
		}
		r, ok, err := try(ctx, j, tables)
		if err != nil {
			return err
		}
		if !ok {
			continue
		}
		effect := differences(d, r)
		if slices.ContainsFunc(d.Advice, func(a Advice) bool { return a.Effect == effect }) {
			continue // a dearer change that comes to the same
		}
		d.Advice = append(d.Advice, Advice{Change: x.words, Effect: effect, Cost: x.cost, Limit: limit})
		if x.cost == costGap || len(d.Advice) >= 2 {
			break // the next move, not the best of all
		}
	}
	return nil
}

// try makes the design of a changed job and reports whether nothing is missed.
func try(ctx context.Context, j job.Job, tables Tables) (*Design, bool, error) {
	d, _, err := run(ctx, j, tables, nil)
	var lost *TankError
	var none *InfeasibleError
	switch {
	case errors.As(err, &lost), errors.As(err, &none):
		return nil, false, nil
	case ctx.Err() != nil:
		return nil, false, ctx.Err()
	case err != nil:
		return nil, false, nil // such a change makes no sense for this job
	}
	return d, d.Feasible, nil
}

// differences says in words what one design has other than another.
func differences(a, b *Design) string {
	var words []string
	gapOf := func(c *part.Construction) float64 { return c.Core.Gap.Total + c.Core.Gap.Thickness }
	for _, x := range []struct {
		name string
		a, b *part.Construction
		r    *part.Rating
	}{{"transformer", constructionOf(a.Transformer), constructionOf(b.Transformer), b.Rating}, {"inductor", inductorOf(a.Inductor), inductorOf(b.Inductor), b.InductorRating}} {
		if x.a == nil || x.b == nil {
			continue
		}
		var list []string
		change := func(what string, from, to any) {
			if from != to {
				list = append(list, fmt.Sprintf("%s %v -> %v", what, from, to))
			}
		}
		change("core", x.a.Core.Shape, x.b.Core.Shape)
		change("material", x.a.Core.Material, x.b.Core.Material)
		for i := range x.b.Windings {
			if i < len(x.a.Windings) {
				change("turns of "+x.b.Windings[i].Name, x.a.Windings[i].Turns, x.b.Windings[i].Turns)
			}
		}
		if x.name == "transformer" && a.Rating != nil {
			change("order", a.Rating.Arrangement, b.Rating.Arrangement)
		}
		if math.Abs(gapOf(x.a)-gapOf(x.b)) > 0.5e-6 {
			list = append(list, fmt.Sprintf("gap %.3f -> %.3f mm", 1e3*gapOf(x.a), 1e3*gapOf(x.b)))
		}
		wires := func(c *part.Construction) map[string]string {
			m := map[string]string{}
			for _, e := range c.Build {
				for _, of := range e.Of {
					m[of] = fmt.Sprintf("%d x %s", max(e.Parallel, 1), e.Wire)
				}
			}
			return m
		}
		from, to := wires(x.a), wires(x.b)
		for _, w := range x.b.Windings {
			if w.Name != "S-B" {
				change("wire of "+w.Name, from[w.Name], to[w.Name])
			}
		}
		if len(list) > 0 {
			words = append(words, x.name+": "+strings.Join(list, ", "))
		}
	}
	words = append(words, fmt.Sprintf("then every limit is kept, %.2f W", b.TotalLoss()))
	return strings.Join(words, "; ")
}

// adviseJob tries single changes of what the job allows, on the sizes that miss
// by the least, when no size keeps every limit.
func (s *search) adviseJob(ctx context.Context, d *Design, tables Tables) error {
	near := slices.Clone(d.Ladder)
	near = slices.DeleteFunc(near, func(x Size) bool { return x.Feasible || x.Rating == nil && x.Reason.Limit == "former" })
	slices.SortStableFunc(near, func(a, b Size) int {
		x, y := a.Reason.excess(), b.Reason.excess()
		switch {
		case (a.Rating == nil) != (b.Rating == nil):
			// What could be wound at all is nearer.
			if a.Rating != nil {
				return -1
			}
			return 1
		case math.IsNaN(x) && !math.IsNaN(y), x > y:
			return 1
		case math.IsNaN(y) && !math.IsNaN(x), x < y:
			return -1
		}
		return 0
	})
	if len(near) == 0 {
		return nil
	}
	which := near[0].Part
	near = slices.DeleteFunc(near, func(x Size) bool { return x.Part != which })
	near = near[:min(len(near), adviceSizes)]
	limit := near[0].Reason.Limit
	names := make([]string, len(near))
	for i, x := range near {
		names[i] = x.Shape
	}
	restrict := func(j job.Job) job.Job {
		if which == job.Transformer {
			j.Build.Transformer.Cores.Shapes = names
		} else {
			j.Build.Inductor.Cores.Shapes = names
		}
		return j
	}
	for _, x := range s.trials(near, restrict) {
		if err := ctx.Err(); err != nil {
			return err
		}
		r, ok, err := try(ctx, x.job, tables)
		if err != nil {
			return err
		}
		if !ok {
			continue
		}
		chosen := r.Transformer.Core.Shape
		if r.Inductor != nil {
			chosen += " with " + r.Inductor.Core.Shape
		}
		size := fmt.Sprintf("%.1f mm high, %.0f g", 1e3*tallest(r), 1e3*massOf(r))
		d.Advice = append(d.Advice, Advice{Change: x.change, Effect: fmt.Sprintf("%s keeps every limit, %.2f W, %s", chosen, r.TotalLoss(), size), Cost: x.cost, Limit: limit})
		if len(d.Advice) >= adviceMost {
			break
		}
	}
	slices.SortStableFunc(d.Advice, func(a, b Advice) int { return a.Cost - b.Cost })
	return nil
}

func tallest(d *Design) float64 {
	h := d.Rating.Outline[2]
	if d.InductorRating != nil {
		h = math.Max(h, d.InductorRating.Outline[2])
	}
	return h
}

func massOf(d *Design) float64 {
	m := d.Rating.Mass
	if d.InductorRating != nil {
		m += d.InductorRating.Mass
	}
	return m
}

// adviceMost is how many ways out are enough.
const adviceMost = 3

// trials lists the changes of a job that are worth a try for what its nearest
// sizes miss, cheapest first.
func (s *search) trials(near []Size, restrict func(job.Job) job.Job) []trial {
	var list []trial
	both := func(j *job.Job, set func(l *job.PartLimits)) {
		set(&j.Build.Transformer.PartLimits)
		set(&j.Build.Inductor.PartLimits)
	}
	add := func(cost int, change string, set func(j *job.Job)) {
		j := s.job
		set(&j)
		list = append(list, trial{change, cost, restrict(j)})
	}
	l := s.transformerLimits
	if n := l.Gap.PiecesMax; n < 3 {
		add(costGap, fmt.Sprintf("gap.pieces_max %d -> 3", n), func(j *job.Job) { both(j, func(l *job.PartLimits) { l.Gap.PiecesMax = 3 }) })
	}
	if k := l.Gap.Kind; k != "either" {
		add(costGap, fmt.Sprintf("gap.kind %s -> either", k), func(j *job.Job) { both(j, func(l *job.PartLimits) { l.Gap.Kind = "either" }) })
	}
	if len(l.Wires.Stock) > 0 {
		add(costWire, "wires.stock: any wire", func(j *job.Job) { both(j, func(l *job.PartLimits) { l.Wires.Stock = nil }) })
	} else if len(l.Wires.Kinds) < 3 {
		add(costWire, "wires.kinds: litz, solid, foil", func(j *job.Job) {
			both(j, func(l *job.PartLimits) { l.Wires.Kinds = []string{"litz", "solid", "foil"} })
		})
	}
	if len(l.Wires.Stock) == 0 && !slices.Contains(l.Wires.LitzStrands, 0.05e-3) {
		add(costWire, "wires.litz_strands: 0.05 mm too", func(j *job.Job) {
			both(j, func(l *job.PartLimits) { l.Wires.LitzStrands = append(slices.Clone(l.Wires.LitzStrands), 0.05e-3) })
		})
	}
	if all := []string{"P-S", "S-P", "P/2-S-P/2", "S/2-P-S/2", "sections"}; len(s.job.Build.Transformer.Arrangements) < len(all) {
		add(costOrder, "transformer.arrangements: all", func(j *job.Job) { j.Build.Transformer.Arrangements = all })
	}
	if h := s.job.Build.Transformer.Halves; h != "either" && s.job.Tank.Rectifier == tank.CenterTapped {
		add(costOrder, "transformer.halves "+h+" -> either", func(j *job.Job) { j.Build.Transformer.Halves = "either" })
	}
	if b := l.Insulation.Build; b != "either" && l.Insulation.Grade != "" && l.Insulation.Grade != "functional" {
		add(costOrder, "insulation.build "+b+" -> either", func(j *job.Job) { both(j, func(l *job.PartLimits) { l.Insulation.Build = "either" }) })
	}
	if r := s.job.Build.ResonantInductor; r != "either" {
		add(costOrder, "resonant_inductor "+r+" -> either", func(j *job.Job) { j.Build.ResonantInductor = "either" })
	}
	for _, name := range s.table.Names() {
		if !slices.Contains(l.Cores.Materials, name) {
			add(costMaterial, "cores.materials: "+name+" too", func(j *job.Job) {
				both(j, func(l *job.PartLimits) { l.Cores.Materials = append(slices.Clone(l.Cores.Materials), name) })
			})
		}
	}
	// The limit itself, by what the nearest size misses.
	r := near[0].Reason
	if v := r.Value; !math.IsNaN(v) && r.excess() < 0.5 {
		const past = 1.002 // a little past what was found
		up, down := v*past, v/past
		set := func(change string, apply func(l *job.Limits)) {
			add(costLimit, change, func(j *job.Job) {
				apply(&j.Build.Limits)
				both(j, func(l *job.PartLimits) { apply(&l.Limits) })
			})
		}
		switch r.Limit {
		case "winding_temperature":
			set(fmt.Sprintf("limits.winding_temperature %.4g -> %.4g degC", r.Bound, up), func(l *job.Limits) { l.WindingTemperature = up })
		case "core_temperature":
			set(fmt.Sprintf("limits.core_temperature %.4g -> %.4g degC", r.Bound, up), func(l *job.Limits) { l.CoreTemperature = up })
		case "ratio_error":
			set(fmt.Sprintf("limits.ratio_error %.3g -> %.3g %%", 100*r.Bound, 100*up), func(l *job.Limits) { l.RatioError = up })
		case "half_mismatch":
			set(fmt.Sprintf("limits.half_mismatch %.3g -> %.3g %%", 100*r.Bound, 100*up), func(l *job.Limits) { l.HalfMismatch = up })
		case "gain_margin":
			set(fmt.Sprintf("limits.gain_margin %.3g -> %.3g %%", 100*r.Bound, 100*down), func(l *job.Limits) { l.GainMargin = down })
		}
	}
	// Limits of size: left out, on every core, to see what the smallest then has.
	for _, x := range []struct {
		key  string
		set  bool
		drop func(l *job.Limits)
	}{
		{"height", l.Limits.Height != nil, func(l *job.Limits) { l.Height = nil }},
		{"footprint", l.Limits.Footprint != nil, func(l *job.Limits) { l.Footprint = nil }},
		{"mass", l.Limits.Mass != nil, func(l *job.Limits) { l.Mass = nil }},
		{"total_loss", s.job.Build.Limits.TotalLoss != nil, func(l *job.Limits) { l.TotalLoss = nil }},
	} {
		j := s.job
		if !x.set || !slices.ContainsFunc(near, func(y Size) bool { return y.Reason.Limit == x.key }) {
			continue
		}
		x.drop(&j.Build.Limits)
		both(&j, func(l *job.PartLimits) { x.drop(&l.Limits) })
		list = append(list, trial{"limits." + x.key + " left out", costLimit, j})
	}
	if f := l.Cores.Former; f == "required" {
		add(costCore, "cores.former required -> derived", func(j *job.Job) {
			both(j, func(l *job.PartLimits) { l.Cores.Former = "derived" })
			// Other sizes come in: all of them.
			j.Build.Transformer.Cores.Shapes, j.Build.Inductor.Cores.Shapes = s.transformerLimits.Cores.Shapes, s.inductorLimits.Cores.Shapes
		})
		list[len(list)-1].job.Build.Transformer.Cores.Shapes = s.transformerLimits.Cores.Shapes
		list[len(list)-1].job.Build.Inductor.Cores.Shapes = s.inductorLimits.Cores.Shapes
	}
	if len(l.Cores.Shapes) > 0 || len(l.Cores.Families) < 9 {
		add(costCore, "cores: any family", func(j *job.Job) {})
		x := &list[len(list)-1].job.Build
		for _, l := range []*job.PartLimits{&x.Transformer.PartLimits, &x.Inductor.PartLimits} {
			l.Cores.Shapes, l.Cores.Families = nil, job.DefaultBuild().Cores.Families
		}
	}
	for _, step := range []float64{-0.05, 0.05, -0.1, 0.1} {
		t := s.job.Tank
		add(costTank, fmt.Sprintf("tank.resonant_inductance %.4g -> %.4g uH, resonant_capacitance %.4g -> %.4g nF", 1e6*t.Lr, 1e6*t.Lr*(1+step), 1e9*t.Cr, 1e9*t.Cr/(1+step)), func(j *job.Job) {
			j.Tank.Lr *= 1 + step
			j.Tank.Cr /= 1 + step
		})
	}
	list = slices.DeleteFunc(list, func(x trial) bool {
		return !slices.ContainsFunc(near, func(y Size) bool { return slices.Contains(worthwhile(y.Reason.Limit), x.cost) })
	})
	slices.SortStableFunc(list, func(a, b trial) int { return a.cost - b.cost })
	return list
}

// worthwhile lists the costs of the changes that can do something about a limit.
func worthwhile(limit string) []int {
	switch limit {
	case "height", "footprint", "mass":
		return []int{costLimit, costCore}
	case "former":
		return []int{costCore}
	case "length_max", "length_min":
		return []int{costGap, costCore, costTank}
	case "ratio_error", "turns_ratio", "gain_margin", "peak_frequency_margin", "reached", "resonance_error", "leakage", "magnetizing_error":
		return []int{costGap, costOrder, costLimit, costTank}
	case "half_mismatch":
		return []int{costOrder, costLimit}
	case "flux_share", "overload_flux_share":
		return []int{costMaterial, costCore, costTank}
	}
	return []int{costWire, costOrder, costMaterial, costLimit, costCore, costTank}
}
