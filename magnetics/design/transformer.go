package design

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"gapwright/corelib/material"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/coreloss"
	"gapwright/magnetics/field"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/tank"
)

// A Reason is a limit that stopped a candidate.
type Reason struct {
	Limit string // key of the job's build section, or of the window
	Value float64
	Bound float64
	Unit  string
	Sense string // max or min
}

// excess tells how far a reason is from being met; 0.1 is ten per cent.
func (r Reason) excess() float64 {
	switch {
	case r.Bound == 0:
		return math.Abs(r.Value)
	case r.Sense == "min":
		return (r.Bound - r.Value) / math.Abs(r.Bound)
	}
	return (r.Value - r.Bound) / math.Abs(r.Bound)
}

// estimate is a transformer of the screening with its loss.
type estimate struct {
	plan
	loss  float64 // W, weighted by share
	ratio float64 // effective turns ratio
}

// kind tells estimates apart whose error in the ratio is alike.
type kind struct {
	arrangement string
	bifilar     bool
	build       insulationBuild
}

func (e estimate) kind() kind { return kind{e.Arrangement, e.Bifilar, e.Build} }

// builds lists the ways to keep the windings apart that the limits allow, each
// with the arrangements that can have it.
func (s *search) builds() []insulationBuild {
	in := s.transformerLimits.Insulation
	if in.Grade == "" || in.Grade == "functional" {
		return []insulationBuild{{BarrierLayers: max(1, in.BarrierLayersInsulated)}}
	}
	var list []insulationBuild
	if in.Build != "insulated-wire" {
		list = append(list, insulationBuild{Margin: s.creepage / 2, BarrierLayers: in.BarrierLayers})
	}
	if in.Build != "margins" {
		for _, side := range []string{"secondary", "primary"} {
			if in.InsulatedWinding == side || in.InsulatedWinding == "either" {
				list = append(list, insulationBuild{Insulated: side, BarrierLayers: in.BarrierLayersInsulated})
			}
		}
	}
	return list
}

// turnsPairs lists the whole turns that come near the wanted effective ratio:
// leakage makes the effective ratio smaller than Np/Ns, by up to a tenth with
// windings side by side.
func (s *search) turnsPairs(arrangement string) [][2]int {
	t := s.job.Build.Transformer
	tolerance := s.transformerLimits.Limits.RatioError
	reach := 1.03
	if arrangement == "sections" {
		reach = 1.15
	}
	var list [][2]int
	for ns := t.SecondaryTurns[0]; ns <= t.SecondaryTurns[1]; ns++ {
		ideal := s.tank.TurnsRatio * float64(ns)
		low, high := int(math.Ceil(ideal*(1-tolerance))), int(math.Floor(ideal*reach*(1+tolerance)))
		for np := max(low, t.PrimaryTurns[0]); np <= min(high, t.PrimaryTurns[1]); np++ {
			list = append(list, [2]int{np, ns})
		}
	}
	return list
}

// transformers screens all transformers on one shape and returns the best of
// each way to build them, by estimated loss, and the limit that stopped those
// that failed by the least.
func (s *search) transformers(sh shape.Shape) ([]estimate, Reason) {
	var out []estimate
	nearest := Reason{}
	miss := func(r Reason) {
		if nearest.Limit == "" || r.excess() < nearest.excess() {
			nearest = r
		}
	}
	limits := s.transformerLimits
	// Everything up to the choice of wires, in the order of the least it can lose.
	type start struct {
		plan
		core  float64 // W
		least float64 // W
	}
	var starts []start
	linkage := clones(s.linkage)
	for _, arrangement := range s.job.Build.Transformer.Arrangements {
		chambers := 1
		if arrangement == "sections" {
			chambers = 2
		}
		former, err := s.former(sh, chambers, limits.Cores)
		if err != nil {
			miss(Reason{"former", 0, 1, "", "min"})
			continue
		}
		for _, name := range limits.Cores.Materials {
			ferrite := s.ferrites[name]
			for _, turns := range s.turnsPairs(arrangement) {
				np, ns := turns[0], turns[1]
				flux, ok := s.fluxFits(sh, ferrite, ns, miss)
				if !ok {
					continue
				}
				core, err := s.coreLoss(linkage, ferrite, sh, flux)
				if err != nil {
					continue
				}
				p := plan{
					Shape: sh, Former: former, Material: name, Np: np, Ns: ns, Centertap: s.tank.Rectifier == tank.CenterTapped, Arrangement: arrangement,
					Gap: part.Gap{Kind: part.Ground, Pieces: 1, Half: "upper", Governs: limits.Gap.Governs},
				}
				starts = append(starts, start{p, core, core + s.leastCopper(former, np, ns)})
			}
		}
	}
	slices.SortStableFunc(starts, func(a, b start) int { return cmp.Compare(a.least, b.least) })
	best := math.Inf(1)
	fronts := map[frontKey][]choice{}
	for _, x := range starts {
		if x.least > prospect*best {
			break
		}
		for _, build := range s.builds() {
			if x.Arrangement == "sections" && build.Margin > 0 {
				continue // the chamber wall separates; margins would only cost breadth
			}
			for _, bifilar := range s.halves() {
				p := x.plan
				p.Build, p.Bifilar = build, bifilar
				e, ok := s.wind(p, fronts, miss)
				if !ok {
					continue
				}
				e.loss += x.core
				best = math.Min(best, e.loss)
				out = append(out, e)
			}
		}
	}
	slices.SortStableFunc(out, func(a, b estimate) int { return cmp.Compare(a.loss, b.loss) })
	return out, nearest
}

// extraMost is the longest free distance between primary and secondary that is
// tried where the leakage does not have to make the whole resonant inductance, m.
const extraMost = 2e-3

// extraStep is what the shop can build with tape, m.
const extraStep = 0.05e-3

// prospect is how many times the best estimate of a size the least loss of
// other turns may be before they are not looked at.
const prospect = 2

// copperMost is the largest part of a winding space that metal can fill: foil
// with its insulation.
const copperMost = 0.8

// leastCopper is a lower bound of the winding loss, W weighted by share: all of
// the winding space filled with copper and nothing but direct-current loss.
func (s *search) leastCopper(former shape.Former, np, ns int) float64 {
	area := copperMost * former.Breadth * float64(max(former.Chambers, 1)) * former.Height
	sum := 0.0
	for d := range s.drives {
		amps := float64(np) * s.drives[d].RMS[0]
		for _, x := range s.drives[d].RMS[1:] {
			amps += float64(ns) * x
		}
		sum += s.shares[d] * wire.Resistivity(screenTemperature) * former.MLT * amps * amps / area
	}
	return sum
}

// frontKey names a side of a plan whose wires are the same for several plans.
type frontKey struct {
	side        int
	arrangement string
	chambers    int
	np, ns      int
	build       insulationBuild
	bifilar     bool
}

// freeDistance reports whether a plan may get a free distance between primary
// and secondary for more leakage: where the tank needs a lower effective turns
// ratio than whole turns without leakage give. Leakage lowers the ratio when the
// secondary lies outside of the primary; inside it leaves the ratio alone.
func (s *search) freeDistance(arrangement string) bool {
	return s.ratio[1] < s.job.Tank.TurnsRatio && arrangement == "P-S"
}

// halves lists whether the halves of a center tap are wound together.
func (s *search) halves() []bool {
	if s.tank.Rectifier != tank.CenterTapped {
		return []bool{false}
	}
	switch s.job.Build.Transformer.Halves {
	case "bifilar":
		return []bool{true}
	case "stacked":
		return []bool{false}
	}
	return []bool{true, false}
}

// fluxFits reports whether ns turns keep the core from saturation in steady
// state, by the flux under the secondary; the flux under the primary, a little
// higher, is judged by the rating.
func (s *search) fluxFits(sh shape.Shape, ferrite *material.Ferrite, ns int, miss func(Reason)) (linkage float64, ok bool) {
	limits := s.transformerLimits.Limits
	bound := limits.FluxShare * ferrite.Bsat(limits.CoreTemperature)
	peak := s.linkagePeak / (s.tank.TurnsRatio * float64(ns) * sh.Amin)
	if peak > bound {
		miss(Reason{"flux_share", peak / ferrite.Bsat(limits.CoreTemperature), limits.FluxShare, "", "max"})
		return 0, false
	}
	return 1 / (s.tank.TurnsRatio * float64(ns) * sh.Ae), true
}

// coreLoss returns the core loss weighted by share for flux densities of scale
// times waves, one for each drive.
func (s *search) coreLoss(waves []coreloss.Loops, ferrite *material.Ferrite, sh shape.Shape, scale float64) (float64, error) {
	sum := 0.0
	for i := range s.drives {
		if s.shares[i] == 0 {
			continue
		}
		loss, err := waves[i].Density(ferrite, scale, screenTemperature)
		if err != nil {
			return 0, err
		}
		sum += s.shares[i] * loss.Density * sh.Ve
	}
	return sum, nil
}

// clones copies waves that other goroutines rate at the same time.
func clones(waves []coreloss.Loops) []coreloss.Loops {
	out := make([]coreloss.Loops, len(waves))
	for i := range waves {
		out[i] = waves[i].Clone()
	}
	return out
}

// stretches gives each section of a plan its field and its room.
func (s *search) stretches(p plan) ([]stretch, bool) {
	list, ok := p.sections()
	if !ok {
		return nil, false
	}
	across := p.Shape.WindowBreadth()
	total := [3]float64{}
	for _, x := range list {
		for _, of := range x.of {
			total[windingIndex(of)] += float64(x.turns)
		}
	}
	if p.Arrangement == "sections" {
		// Side by side the field runs from post to outer leg.
		across = p.Shape.WindowDepth()
		total = [3]float64{}
	}
	out := make([]stretch, len(list))
	h := total
	for i, x := range list {
		st := stretch{section: x, breadth: p.Former.Breadth - 2*p.Build.Margin, length: p.Former.MLT}
		for _, of := range x.of {
			st.windings = append(st.windings, windingIndex(of))
		}
		if st.breadth <= 0 {
			return nil, false
		}
		st.h0 = h
		for _, of := range x.of {
			h[windingIndex(of)] -= float64(x.turns)
		}
		st.h1 = h
		out[i] = st
	}
	for i := range out {
		for w := range 3 {
			out[i].h0[w] /= across
			out[i].h1[w] /= across
		}
	}
	return out, true
}

// wind finds the pair of wires with the least loss that fits the window.
func (s *search) wind(p plan, known map[frontKey][]choice, miss func(Reason)) (estimate, bool) {
	stretches, ok := s.stretches(p)
	if !ok {
		return estimate{}, false
	}
	limits := s.transformerLimits
	entries, _ := p.entries(limits.Insulation)
	room := [2]float64{}
	fixed := tapeHeight(entries)
	height := p.Former.Height - limits.Wires.HeightLeftMin
	barrier := float64(p.Build.BarrierLayers) * limits.Insulation.Tape
	interlayer := float64(limits.Insulation.InterlayerLayers) * limits.Insulation.Tape
	var sides [2][]stretch
	for _, st := range stretches {
		if st.primary {
			sides[0] = append(sides[0], st)
		} else {
			sides[1] = append(sides[1], st)
		}
	}
	var fronts [2][]choice
	for i := range 2 {
		room[i] = height - fixed[0]
		if p.Arrangement == "sections" {
			room[i] = height - fixed[i]
		}
		key := frontKey{i, p.Arrangement, p.Former.Chambers, p.Np, p.Ns, p.Build, p.Bifilar && i == 1}
		if front, ok := known[key]; ok {
			fronts[i] = front
			continue
		}
		insulated := p.Build.Insulated == [2]string{"primary", "secondary"}[i]
		// Foil beside a gap is driven over its whole breadth by the field, which
		// no formula at hand foretells: never innermost, never side by side.
		foil := p.Arrangement != "sections" && sides[i][0].primary != stretches[0].primary
		fronts[i] = s.forms.options(side{sides[i], s.spools[insulated], foil, limits.Wires.ParallelMax, room[i] + interlayer, s.pinRule(p, i)})
		known[key] = fronts[i]
	}
	if len(fronts[0]) == 0 || len(fronts[1]) == 0 {
		miss(Reason{"wires.height_left_min", math.NaN(), limits.Wires.HeightLeftMin, "m", "min"})
		return estimate{}, false
	}
	best := estimate{plan: p, loss: math.Inf(1)}
	least := math.Inf(1)
	offRatio := math.Inf(1)
	// The window energies are linear in the heights of both sides and in the
	// free distance.
	energy := func(hp, hs, extra float64) [2]float64 {
		_, ps, ss := windowEnergy(p, stretches, hp, hs, barrier+extra, interlayer)
		return [2]float64{ps, ss}
	}
	const unit = 1e-3
	base, perP, perS, perX := energy(0, 0, 0), energy(unit, 0, 0), energy(0, unit, 0), energy(0, 0, unit)
	lm := s.job.Tank.Magnetizing()
	ratioOf := func(hp, hs, extra float64) float64 {
		if p.Arrangement == "sections" {
			// Side by side and with the gap between them the windings are alike.
			leak := sideBySideLeak(p)
			return float64(p.Np) / float64(p.Ns) * math.Sqrt(lm/(lm+leak))
		}
		at := func(i int) float64 {
			return base[i] + ((perP[i]-base[i])*hp+(perS[i]-base[i])*hs+(perX[i]-base[i])*extra)/unit
		}
		return ratioFor(p, lm, at(0), at(1))
	}
	middle := (s.ratio[0] + s.ratio[1]) / 2
	free := s.freeDistance(p.Arrangement)
	for _, a := range fronts[0] {
		for _, b := range fronts[1] {
			loss := a.mean + b.mean
			used := a.height + b.height
			if p.Arrangement == "sections" {
				used = math.Max(a.height, b.height)
			}
			least = math.Min(least, used)
			if used > room[0] || loss >= best.loss {
				continue
			}
			ratio, extra := ratioOf(a.height, b.height, 0), 0.0
			if free && ratio > middle {
				perDistance := (ratio - ratioOf(a.height, b.height, unit)) / unit
				extra = math.Ceil((ratio-middle)/perDistance/extraStep) * extraStep
				if extra > extraMost || used+extra > room[0] {
					continue
				}
				ratio = ratioOf(a.height, b.height, extra)
			}
			slack := ratioSlack
			if p.Arrangement == "sections" {
				slack = 2 * ratioSlack
			}
			if ratio < s.ratio[0]*(1-slack) || ratio > s.ratio[1]*(1+slack) {
				offRatio = math.Min(offRatio, math.Abs(ratio/s.job.Tank.TurnsRatio-1))
				continue
			}
			best.loss, best.Primary, best.Secondary, best.Extra, best.ratio = loss, a.coil, b.coil, extra, ratio
		}
	}
	if math.IsInf(best.loss, 1) && !math.IsInf(offRatio, 1) {
		miss(Reason{"ratio_error", offRatio, limits.Limits.RatioError, "", "max"})
		return estimate{}, false
	}
	if math.IsInf(best.loss, 1) {
		miss(Reason{"wires.height_left_min", p.Former.Height - fixed[0] - least, limits.Wires.HeightLeftMin, "m", "min"})
		return estimate{}, false
	}
	return best, true
}

// ratioSlack is how far the effective turns ratio of the screening may be off:
// its one-dimensional energies are good to some 20 % of the few per cent that
// leakage takes from the ratio; side by side twice that.
const ratioSlack = 0.006

// sideBySideLeak is the one-dimensional leakage of windings in two chambers, H.
func sideBySideLeak(p plan) float64 {
	list := []field.Section1D{
		{Height: p.Former.Breadth, AmpereTurns: float64(p.Np)}, {Height: p.Former.ChamberWall}, {Height: p.Former.Breadth, AmpereTurns: -float64(p.Np)},
	}
	return 2 * field.Leakage1D(p.Shape.WindowDepth(), list) * p.Former.MLT
}

// pinRule returns the test whether a wire goes on the pins of its row, or nil
// where leads are allowed or the pins are not known.
func (s *search) pinRule(p plan, side int) func(wire.Wire, int) bool {
	limits := s.job.Build.Transformer
	want, names := limits.Terminations.Primary, []string{"P"}
	if side == 1 {
		want, names = limits.Terminations.Secondary, []string{"S"}
		if p.Centertap {
			names = []string{"S-A", "S-B"}
		}
	}
	if want != "pins" || p.Former.Pins == 0 {
		return nil
	}
	list, _ := p.sections()
	joints := 0
	for _, x := range list {
		if x.primary == (side == 0) {
			joints++
		}
	}
	joints -= 1
	if !p.Bifilar && p.Centertap && side == 1 {
		joints -= 1
	}
	current, spare := 0.0, 0
	for d := range s.drives {
		current = math.Max(current, s.drives[d].RMS[side])
	}
	turns := p.Np
	if side == 1 {
		turns = p.Ns
	}
	if s.voltPeak()/float64(p.Np)*float64(turns) > keepApart {
		spare = 1
	}
	row := p.Former.Pins / 2
	ends := len(names) + 1
	return func(w wire.Wire, parallel int) bool {
		n := pinsFor(w, parallel, current, limits)
		return ends*n+max(joints, 0)+spare*len(names) <= row
	}
}

// former returns the coil former of a shape as the limits ask for it.
func (s *search) former(sh shape.Shape, chambers int, cores job.Cores) (shape.Former, error) {
	f, err := s.shapes.FormerWith(sh, chambers)
	if err != nil {
		return shape.Former{}, err
	}
	if cores.Former == "required" && f.Derived && chambers == 1 {
		return shape.Former{}, fmt.Errorf("no published coil former for %s", sh.Name)
	}
	return f, nil
}
