package design

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"gapwright/corelib/material"
	"gapwright/corelib/quantity"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/coreloss"
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
	loss float64 // W, weighted by share
}

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
	for _, arrangement := range s.job.Build.Transformer.Arrangements {
		chambers := 1
		if arrangement == "sections" {
			chambers = 2
		}
		former, err := s.former(sh, chambers, limits.Cores)
		if err != nil {
			miss(Reason{Limit: "cores.former", Value: math.Inf(1), Bound: 1, Sense: "max"})
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
				core, err := s.coreLoss(ferrite, sh, flux)
				if err != nil {
					continue
				}
				for _, build := range s.builds() {
					if arrangement == "sections" && build.Margin > 0 {
						continue // the chamber wall separates; margins would only cost breadth
					}
					for _, bifilar := range s.halves() {
						p := plan{
							Shape: sh, Former: former, Material: name, Np: np, Ns: ns, Centertap: s.tank.Rectifier == tank.CenterTapped,
							Arrangement: arrangement, Bifilar: bifilar, Build: build,
							Gap: part.Gap{Kind: part.Ground, Pieces: 1, Half: "upper", Governs: limits.Gap.Governs},
						}
						best, ok := s.wind(p, miss)
						if !ok {
							continue
						}
						best.loss += core
						out = append(out, best)
					}
				}
			}
		}
	}
	slices.SortStableFunc(out, func(a, b estimate) int { return cmp.Compare(a.loss, b.loss) })
	return out, nearest
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

// coreLoss returns the core loss weighted by share for a flux density of scale
// times the flux linkage of Lm.
func (s *search) coreLoss(ferrite *material.Ferrite, sh shape.Shape, scale float64) (float64, error) {
	sum := 0.0
	for i := range s.drives {
		if s.shares[i] == 0 {
			continue
		}
		loss, err := s.linkage[i].Density(ferrite, scale, screenTemperature)
		if err != nil {
			return 0, err
		}
		sum += s.shares[i] * loss.Density * sh.Ve
	}
	return sum, nil
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
			total[s.windingIndex(of)] += float64(x.turns)
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
		if st.breadth <= 0 {
			return nil, false
		}
		st.h0 = h
		for _, of := range x.of {
			h[s.windingIndex(of)] -= float64(x.turns)
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
func (s *search) wind(p plan, miss func(Reason)) (estimate, bool) {
	stretches, ok := s.stretches(p)
	if !ok {
		return estimate{}, false
	}
	limits := s.transformerLimits
	entries, _ := p.entries(limits.Insulation)
	room := [2]float64{}
	fixed := tapeHeight(entries)
	height := p.Former.Height - limits.Wires.HeightLeftMin
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
		key := [2]bool{p.Build.Insulated == "primary" && i == 0 || p.Build.Insulated == "secondary" && i == 1, false}
		room[i] = height - fixed[0]
		if p.Arrangement == "sections" {
			room[i] = height - fixed[i]
		}
		parallel := limits.Wires.ParallelMax
		fronts[i] = s.options(sides[i], i, s.wires[key[0]], parallel, s.bulge(limits.Wires), room[i], s.forms, s.shares)
	}
	if len(fronts[0]) == 0 || len(fronts[1]) == 0 {
		miss(Reason{"wires.height_left_min", math.NaN(), limits.Wires.HeightLeftMin, "m", "min"})
		return estimate{}, false
	}
	best := estimate{plan: p, loss: math.Inf(1)}
	least := math.Inf(1)
	for _, a := range fronts[0] {
		for _, b := range fronts[1] {
			used := a.height + b.height
			if p.Arrangement == "sections" {
				used = math.Max(a.height, b.height)
			}
			least = math.Min(least, used)
			if used > room[0] {
				continue
			}
			if loss := a.mean + b.mean; loss < best.loss {
				best.loss, best.Primary, best.Secondary = loss, a.coil, b.coil
			}
		}
	}
	if math.IsInf(best.loss, 1) {
		miss(Reason{"wires.height_left_min", p.Former.Height - fixed[0] - least, limits.Wires.HeightLeftMin, "m", "min"})
		return estimate{}, false
	}
	return best, true
}

// bulge returns the height allowance of a wire.
func (s *search) bulge(w job.Wires) func(wire.Wire) float64 {
	return func(x wire.Wire) float64 {
		switch x.Kind {
		case wire.Litz:
			return w.Bulge.Litz
		case wire.Foil:
			return w.Bulge.Foil
		}
		return w.Bulge.Solid
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

// gapEstimate is the McLyman gap for an inductance, for screening.
func gapEstimate(sh shape.Shape, mu, turns, L float64) float64 {
	g := quantity.Mu0*turns*turns*sh.Ae/L - sh.Le/mu
	return math.Max(g, 0)
}

var _ = coreloss.Loss{}
