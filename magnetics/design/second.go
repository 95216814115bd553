package design

import (
	"context"
	"errors"
	"math"

	"gapwright/corelib/wire"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
)

// A WireChoice is the next best wire for a winding: another strand size or
// another count, everything else as chosen.
type WireChoice struct {
	Part     string
	Winding  string // P, S (for both halves) or L
	Wire     string
	Parallel int
	Layers   int
	Loss     float64 // W, of the part, weighted by share
	More     float64 // W, over the wire that was chosen; negative where only a limit or a tie spoke for that
	Misses   *Reason // a limit that it misses, where none was found that keeps all; nil: none
}

// secondTries is how many other wires of a winding are rated.
const secondTries = 4

// secondChoices rates other wires for the parts as chosen.
func (s *search) secondChoices(ctx context.Context, d *Design) error {
	var solvers part.Solvers
	if d.chosen != nil && s.transformerLimits.Wires.SecondChoice {
		for i := range 2 {
			if err := ctx.Err(); err != nil {
				return err
			}
			if err := s.secondOfTransformer(d, i, &solvers); err != nil {
				return err
			}
		}
	}
	if d.chosenInductor != nil && s.inductorLimits.Wires.SecondChoice {
		return s.secondOfInductor(d, &solvers)
	}
	return nil
}

// other reports whether a wire differs in what the buyer asks for.
func other(a, b *wire.Wire) bool {
	return a.Kind != b.Kind || a.Strands != b.Strands || a.Diameter != b.Diameter || a.Thickness != b.Thickness
}

func (s *search) secondOfTransformer(d *Design, i int, solvers *part.Solvers) error {
	p := *d.chosen
	chosen := [2]coil{p.Primary, p.Secondary}
	stretches, ok := s.stretches(p)
	if !ok {
		return nil
	}
	var own [2][]stretch
	for _, st := range stretches {
		k := 1
		if st.primary {
			k = 0
		}
		own[k] = append(own[k], st)
	}
	base, err := s.finishTransformer(p, solvers)
	if err != nil {
		return err
	}
	// The choices as they were made, and what the field said of their ratio.
	fronts := map[frontKey][]choice{}
	for k := range 2 {
		same := s.sideOf(p, stretches, own[k], k)
		same.spools = only(same.spools, func(w *wire.Wire) bool { return w.String() == chosen[k].Wire.String() })
		same.parallel = chosen[k].Parallel
		for _, c := range s.forms.options(same) {
			if c.parallel == chosen[k].Parallel && c.layers == chosen[k].Layers {
				fronts[p.front(k)] = []choice{c}
			}
		}
		if len(fronts[p.front(k)]) == 0 {
			return nil
		}
	}
	couple := s.coupling(p, stretches, s.wantedLm(p))
	ratio, leak := couple.at(fronts[p.front(0)][0].height, fronts[p.front(1)][0].height, p.Extra)
	x := equivalent(base.rating, s.job.Tank.StrayInductance)
	known := &family{ratio: x.Ratio / ratio, leak: 1}
	if leak > 0 {
		known.leak = x.Lleak / leak
	}
	free := s.sideOf(p, stretches, own[i], i)
	all := free.spools
	excluded := map[string]bool{chosen[i].Wire.String(): true}
	var best *rated
	for range secondTries {
		free.spools = only(all, func(w *wire.Wire) bool { return !excluded[w.String()] && other(w, &chosen[i].Wire) })
		fronts[p.front(i)] = s.forms.options(free)
		if len(fronts[p.front(i)]) == 0 {
			break
		}
		e, ok := s.wind(p, s.ratio, fronts, &learned{}, known, func(Reason) {})
		if !ok {
			break
		}
		excluded[[2]coil{e.Primary, e.Secondary}[i].Wire.String()] = true
		r, err := s.finishTransformer(e.plan, solvers)
		if errors.Is(err, errNoGap) {
			continue
		}
		if err != nil {
			return err
		}
		if best == nil || better(r, *best) {
			best = &r
		}
	}
	if best == nil {
		return nil
	}
	c := [2]coil{best.plan.Primary, best.plan.Secondary}[i]
	d.SecondChoices = append(d.SecondChoices, WireChoice{
		job.Transformer, [2]string{"P", "S"}[i], c.Wire.String(), c.Parallel, c.Layers, best.loss, best.loss - base.loss, best.missed,
	})
	return nil
}

func only(list []spool, want func(w *wire.Wire) bool) []spool {
	var out []spool
	for i := range list {
		if want(&list[i].Wire) {
			out = append(out, list[i])
		}
	}
	return out
}

func (s *search) secondOfInductor(d *Design, solvers *part.Solvers) error {
	p := *d.chosenInductor
	L := d.InductorRating.OpenInductance
	base, err := s.finishInductor(p, L, solvers)
	if err != nil {
		return err
	}
	list, _ := s.inductors(p.Shape, L)
	var best *rated
	tried := 0
	seen := map[string]bool{}
	for _, e := range list {
		name := e.Coil.Wire.String()
		if e.Turns != p.Turns || e.Material != p.Material || e.Gap.Kind != p.Gap.Kind || e.Gap.Pieces != p.Gap.Pieces || !other(&e.Coil.Wire, &p.Coil.Wire) || seen[name] {
			continue
		}
		seen[name] = true
		if tried++; tried > secondTries {
			break
		}
		// As far from the gap as there is room for.
		e.Extra = math.Min(e.Extra, p.Extra)
		r, err := s.finishInductor(e.inductorPlan, L, solvers)
		if errors.Is(err, errNoGap) {
			continue
		}
		if err != nil {
			return err
		}
		if best == nil || better(r, *best) {
			best = &r
		}
	}
	if best == nil {
		return nil
	}
	c := best.coil.Coil
	d.SecondChoices = append(d.SecondChoices, WireChoice{job.Inductor, "L", c.Wire.String(), c.Parallel, c.Layers, best.loss, best.loss - base.loss, best.missed})
	return nil
}
