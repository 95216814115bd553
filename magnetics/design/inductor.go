package design

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"gapwright/corelib/material"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/gap"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
)

// inductorPlan is an inductor as the search thinks of it.
type inductorPlan struct {
	Shape    shape.Shape
	Former   shape.Former
	Material string
	Turns    int
	Coil     coil
	Gap      part.Gap
	Extra    float64 // m, free distance between former wall and winding
}

// inductorEstimate is an inductor of the screening with the least it can lose.
type inductorEstimate struct {
	inductorPlan
	loss float64 // W, weighted by share; fringing is not in it
}

// entries writes the order of work.
func (p inductorPlan) entries(limits job.Insulation) []winding.Entry {
	var out []winding.Entry
	if p.Extra > 0 {
		out = append(out, winding.Entry{Kind: winding.Space, Height: p.Extra, Purpose: "distance from the gap"})
	}
	e := winding.Entry{
		Kind: winding.Wind, Names: []string{"L"}, Of: []string{"L"}, Turns: p.Turns, Wire: p.Coil.Wire, Parallel: p.Coil.Parallel,
		Layers: p.Coil.Layers, Spread: "full", Direction: "cw", Sleeving: "none",
	}
	if p.Coil.Layers > 1 {
		e.Lay = "C"
	}
	out = append(out, e)
	if limits.OuterLayers > 0 {
		out = append(out, winding.Entry{
			Kind: winding.Tape, Thickness: limits.Tape, Material: "polyester", TapeLayers: limits.OuterLayers, Overlap: 10e-3, Purpose: "finish",
		})
	}
	return out
}

// inductors screens all inductors of inductance L on one shape, least possible
// loss first.
func (s *search) inductors(sh shape.Shape, L float64) ([]inductorEstimate, Reason) {
	var out []inductorEstimate
	nearest := Reason{}
	miss := func(r Reason) {
		if nearest.Limit == "" || r.excess() < nearest.excess() {
			nearest = r
		}
	}
	limits := s.inductorLimits
	former, err := s.former(sh, 1, limits.Cores)
	if err != nil {
		return nil, Reason{"former", 0, 1, "", "min"}
	}
	peak := 0.0
	for i := range s.inductor {
		peak = math.Max(peak, s.inductor[i].Peak)
	}
	trip := 1.5 * peak
	if limits.Limits.CurrentLimit != nil {
		trip = *limits.Limits.CurrentLimit
	}
	entries := inductorPlan{Turns: 1}.entries(limits.Insulation)
	fixed := tapeHeight(entries)[0]
	room := former.Height - limits.Wires.HeightLeftMin - fixed
	resonant := clones(s.resonant)
	for _, name := range limits.Cores.Materials {
		ferrite := s.ferrites[name]
		bs := ferrite.Bsat(limits.Limits.CoreTemperature)
		for n := s.job.Build.Inductor.Turns[0]; n <= s.job.Build.Inductor.Turns[1]; n++ {
			turns := float64(n)
			steady := L * peak / (turns * sh.Amin) / bs
			overload := L * trip / (turns * sh.Amin) / bs
			if steady > limits.Limits.FluxShare {
				miss(Reason{"flux_share", steady, limits.Limits.FluxShare, "", "max"})
				continue
			}
			if overload > limits.Limits.OverloadFluxShare {
				miss(Reason{"overload_flux_share", overload, limits.Limits.OverloadFluxShare, "", "max"})
				continue
			}
			core, err := s.coreLoss(resonant, ferrite, sh, L/(turns*sh.Ae))
			if err != nil {
				continue
			}
			pieces := s.piecesFor(sh, ferrite, turns, L, limits.Gap)
			if len(pieces) == 0 {
				one := gap.Core{Ae: sh.Ae, Le: sh.Le, Mu: ferrite.MuI(part.TestTemperature).Value, Breadth: sh.WindowBreadth(), Pieces: max(limits.Gap.PiecesMax, 1)}
				if g, err := gap.Length(L, turns, one); err == nil {
					bound := part.PieceLimit(sh.PostWidth(), sh.PostDepth(), limits.Gap.LengthMax)
					if per := g / float64(one.Pieces); per > bound {
						miss(Reason{"length_max", per, bound, "m", "max"})
					} else {
						miss(Reason{"length_min", g, limits.Gap.LengthMin, "m", "min"})
					}
				}
				continue
			}
			st := stretch{
				section: section{names: []string{"L"}, of: []string{"L"}, primary: true, turns: n},
				breadth: former.Breadth, length: former.MLT, windings: []int{0},
			}
			st.h0[0] = turns / sh.WindowBreadth()
			thickest, litz := bend(sh, former, limits.Wires)
			front := s.inductorForms.options(side{[]stretch{st}, s.inductorSpools, false, limits.Wires.ParallelMax, room, s.inductorPins(former), thickest, litz})
			if len(front) == 0 {
				miss(Reason{"height_left_min", math.NaN(), limits.Wires.HeightLeftMin, "m", "min"})
				continue
			}
			// Of the front: the least loss, and two lower windings that leave
			// room to keep away from the gap.
			for _, c := range thin(front) {
				for _, k := range pieces {
					for _, extra := range s.extras(room-c.height, sh, former) {
						out = append(out, inductorEstimate{
							inductorPlan{sh, former, name, n, c.coil(), k, extra}, c.mean + core,
						})
					}
				}
			}
		}
	}
	slices.SortStableFunc(out, func(a, b inductorEstimate) int { return cmp.Compare(a.loss, b.loss) })
	return out, nearest
}

// inductorPins is pinRule for the inductor.
func (s *search) inductorPins(former shape.Former) func(wire.Wire, int) bool {
	if s.job.Build.Inductor.Terminations.Primary != "pins" || former.Pins == 0 {
		return nil
	}
	current := 0.0
	for d := range s.inductor {
		current = math.Max(current, s.inductor[d].RMS[0])
	}
	limits := s.job.Build.Transformer
	return func(w wire.Wire, parallel int) bool {
		return 2*pinsFor(w, parallel, current, limits)+1 <= former.Pins/2
	}
}

// thin keeps the best choice of a front and those that need about three
// quarters and half of its height.
func thin(front []choice) []choice {
	best := front[len(front)-1]
	out := []choice{best}
	for _, part := range []float64{0.75, 0.5} {
		var pick *choice
		for i := range front {
			if front[i].height <= part*best.height {
				pick = &front[i]
			}
		}
		if pick != nil && pick.height < out[len(out)-1].height {
			out = append(out, *pick)
		}
	}
	return out
}

// extras lists free distances from the former wall within the height left.
func (s *search) extras(left float64, sh shape.Shape, former shape.Former) []float64 {
	out := []float64{0}
	for _, share := range []float64{0.5, 1} {
		x := math.Min(left*share, sh.WindowDepth()/2)
		// In steps of a tenth of a millimetre: the shop builds it from tape.
		x = math.Floor(x*1e4) / 1e4
		if x >= 0.3e-3 && x > out[len(out)-1] {
			out = append(out, x)
		}
	}
	return out
}

// piecesFor lists how the gap may be made so that each piece keeps the limits:
// ground in one piece or more, or of film under all legs.
func (s *search) piecesFor(sh shape.Shape, ferrite *material.Ferrite, turns, L float64, limits job.Gap) []part.Gap {
	var out []part.Gap
	bound := part.PieceLimit(sh.PostWidth(), sh.PostDepth(), limits.LengthMax)
	length := func(pieces int) float64 {
		core := gap.Core{Ae: sh.Ae, Le: sh.Le, Mu: ferrite.MuI(part.TestTemperature).Value, Breadth: sh.WindowBreadth(), Pieces: pieces}
		g, err := gap.Length(L, turns, core)
		if err != nil {
			return math.Inf(1)
		}
		return g
	}
	// The field's gap is a few per cent off this one; the rating judges.
	const slack = 1.05
	for k := 1; k <= limits.PiecesMax && limits.Kind != "spacer"; k++ {
		if g := length(k); g/float64(k) <= bound*slack && g >= limits.LengthMin/slack {
			out = append(out, part.Gap{Kind: part.Ground, Pieces: k, Half: "upper", Governs: limits.Governs})
		}
	}
	if limits.Kind != "ground" {
		// Film fringes at the outer legs too.
		if g := length(1) / 2; g <= bound*1.3 && g >= limits.LengthMin/1.3 {
			out = append(out, part.Gap{Kind: part.Spacer, Governs: "length", Under: "all legs"})
		}
	}
	return out
}

// rateInductors rates the inductors of a size in the order of the least loss
// they can have, until none that is left can beat the best.
func (s *search) rateInductors(ctx context.Context, sh shape.Shape, L float64, solvers *part.Solvers) (rated, error) {
	best := rated{shape: sh}
	former, err := s.former(sh, 1, s.inductorLimits.Cores)
	if err != nil {
		best.missed = &Reason{"former", 0, 1, "", "min"}
		return best, nil
	}
	if r, out := outside(sh, former, s.inductorLimits.Limits); out {
		best.missed = &r
		return best, nil
	}
	list, reason := s.inductors(sh, L)
	best.looked = len(list)
	if len(list) == 0 {
		best.missed = &reason
		return best, nil
	}
	heat, err := s.mostHeat(sh, former, s.inductorLimits.Limits)
	if err != nil {
		return best, fmt.Errorf("%s: %w", sh.Name, err)
	}
	tried := 0
	for _, e := range list {
		if err := ctx.Err(); err != nil {
			return best, err
		}
		if best.rating != nil {
			// The estimate has no fringing: it is low, but for what colder copper and
			// the field beside the yokes save.
			if best.missed == nil && e.loss*inductorSlack >= best.loss || e.loss*inductorSlack > heat {
				break
			}
			if tried >= inductorTries || best.missed != nil && best.missed.excess() > hopeless && tried >= 2*triesHopeless {
				break
			}
		}
		tried++
		r, err := s.finishInductor(e.inductorPlan, L, solvers)
		if err != nil {
			if errors.Is(err, errNoGap) {
				continue
			}
			return best, err
		}
		best.fields += r.fields
		if better(r, best) {
			r.fields, r.looked = best.fields, best.looked
			best = r
		}
	}
	if best.rating == nil {
		if reason.Limit == "" {
			reason = Reason{"turns", 0, 1, "", "min"}
		}
		best.missed = &reason
	}
	return best, nil
}

const (
	inductorTries = 48   // bounds the field solutions of one size
	inductorSlack = 0.96 // of an estimate, what a winding may lose at the least
)

// finishInductor makes the part of a plan, finds its gap and rates it.
func (s *search) finishInductor(p inductorPlan, L float64, solvers *part.Solvers) (rated, error) {
	l := s.inductorPart(p)
	cond := s.conditions(s.inductorLimits, false)
	cond.Modes = searchModes
	c, err := part.NewCoil(l.Construction, cond)
	if err != nil {
		return rated{}, err
	}
	g, n, err := gapFor(c, solvers, l.Core.Gap, L, cond, openInductance)
	if err != nil {
		return rated{}, fmt.Errorf("%w: %w", errNoGap, err)
	}
	l.Core.Gap = stockFilm(g, s.inductorLimits.Gap)
	c.Construction = l.Construction
	r, err := c.RateInductor(l, s.inductor, cond, solvers)
	if err != nil {
		return rated{}, err
	}
	out := rated{shape: p.Shape, inductor: &l, coil: &p, rating: r, loss: s.weighted(r), fields: n + 2}
	verdicts := partVerdicts(r, s.inductorLimits)
	// With films of the stock it is off by what they are.
	off := math.Abs(r.OpenInductance-L) / s.job.Tank.Lr
	verdicts = append(verdicts, part.NewVerdict("inductor", "", "resonance_error", off, s.job.Build.Limits.ResonanceError, "", "max"))
	out.missed = s.firstMiss(verdicts)
	return out, nil
}

func openInductance(l [][]float64) float64 { return l[0][0] }

// inductorPart writes a plan as the part that the shop reads.
func (s *search) inductorPart(p inductorPlan) part.Inductor {
	limits := s.inductorLimits
	need := terminalNeeds{}
	for i := range s.inductor {
		d := &s.inductor[i]
		need.current = math.Max(need.current, d.RMS[0])
		need.voltage = math.Max(need.voltage, 2*math.Pi*d.Frequency*s.job.Tank.Lr*d.Peak)
	}
	w := []part.Winding{{Name: "L", Turns: p.Turns}}
	transformer := s.job.Build.Transformer
	w, leads := terminals(p.Former, w, []coil{p.Coil}, []terminalNeeds{need}, transformer, []string{s.job.Build.Inductor.Terminations.Primary})
	l := part.Inductor{Construction: part.Construction{
		Core:         part.Core{Shape: p.Shape.Name, Material: p.Material, Pieces: 2, Clamping: limits.Cores.Clamping, Gap: p.Gap},
		Former:       part.Former{Name: p.Former.Name, Chambers: 1, Pins: p.Former.Pins, Mounting: p.Former.Mounting, Wall: writable(p.Former.WallOffset)},
		Windings:     w,
		Build:        p.entries(limits.Insulation),
		Impregnation: part.Impregnation{Kind: s.job.Build.Inductor.Impregnation, When: "after gluing"},
		Glue:         glue(limits.Cores),
		Terminations: part.Terminations{Primary: "pins", Tin: "solder pot 390 °C"},
	}}
	if leads {
		l.Terminations.Primary = "leads"
		l.Terminations.LeadLength = usualLead
	}
	return l
}
