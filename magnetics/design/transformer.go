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

// estimate is a transformer of the screening.
type estimate struct {
	plan
	loss   float64    // W, weighted by share, with what the field said of others of its kind
	raw    [2]float64 // W, of primary and secondary before that
	ratio  float64    // effective turns ratio, as screened
	uneven float64    // mismatch of the halves, as screened
	leak   float64    // H, that it adds to the resonant inductance, as screened
}

// kind tells estimates apart whose errors are alike.
type kind struct {
	arrangement string
	bifilar     bool
	build       insulationBuild
	gap         part.GapKind
}

func (p plan) kind() kind { return kind{p.Arrangement, p.Bifilar, p.Build, p.Gap.Kind} }

// builds lists the ways to keep the windings apart that the limits allow. Unless
// the user says which winding carries its own insulation, it is the one that must
// keep away from the core: a bare winding of the other side beside a core that
// counts as its opposite would need the whole creepage there too.
func (s *search) builds() []insulationBuild {
	in := s.transformerLimits.Insulation
	if in.Grade == "" || in.Grade == "functional" {
		return []insulationBuild{{BarrierLayers: max(1, in.BarrierLayersInsulated)}}
	}
	var list []insulationBuild
	if in.Build != "insulated-wire" {
		// Around a margin creepage and clearance are the same way.
		list = append(list, insulationBuild{Margin: math.Max(s.creepage, s.clearance) / 2, BarrierLayers: in.BarrierLayers})
	}
	if in.Build != "margins" {
		for _, side := range []string{"secondary", "primary"} {
			if side == in.InsulatedWinding || in.InsulatedWinding == "either" && side != in.CoreCountsAs {
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
	reach := 1.03
	switch lr := s.job.Tank.Lr; {
	case s.leakage:
		reach = math.Sqrt(1+lr/s.job.Tank.Magnetizing()) * 1.01
	case arrangement == "sections":
		reach = min(1.15, math.Sqrt(1+lr/s.job.Tank.Magnetizing())*1.01)
	}
	wide := s.ratio.widest()
	var list [][2]int
	for ns := t.SecondaryTurns[0]; ns <= t.SecondaryTurns[1]; ns++ {
		// Leakage cannot make the effective ratio larger than Np/Ns by more than a
		// few parts in ten thousand.
		low, high := int(math.Ceil(wide[0]*0.998*float64(ns))), int(math.Floor(wide[1]*reach*float64(ns)))
		for np := max(low, t.PrimaryTurns[0]); np <= min(high, t.PrimaryTurns[1]); np++ {
			list = append(list, [2]int{np, ns})
		}
	}
	return list
}

// A start is a transformer up to the choice of how its windings are kept apart,
// with a lower bound of what it loses.
type start struct {
	plan
	core  float64 // W
	least float64 // W
}

// starts lists what can be wound on a shape as far as turns, flux and material
// go, least loss first, and tells miss of those that fail.
func (s *search) starts(sh shape.Shape, miss func(Reason)) []start {
	limits := s.transformerLimits
	var list []start
	linkage := clones(s.linkage)
	for _, arrangement := range s.job.Build.Transformer.Arrangements {
		chambers := 1
		if arrangement == "sections" {
			chambers = 2
		} else if s.leakage && s.job.Build.Transformer.BarrierExtra[1] == 0 {
			continue
		}
		former, err := s.former(sh, chambers, limits.Cores)
		if err != nil {
			miss(Reason{"former", 0, 1, "", "min"})
			continue
		}
		for _, name := range limits.Cores.Materials {
			ferrite := s.ferrites[name]
			losses := map[int]float64{} // by secondary turns
			for _, turns := range s.turnsPairs(arrangement) {
				np, ns := turns[0], turns[1]
				flux, ok := s.fluxFits(sh, ferrite, ns, miss)
				if !ok {
					continue
				}
				core, ok := losses[ns]
				if !ok {
					if core, err = s.coreLoss(linkage, ferrite, sh, flux); err != nil {
						continue
					}
					losses[ns] = core
				}
				p := plan{
					Shape: sh, Former: former, Material: name, Np: np, Ns: ns, Centertap: s.tank.Rectifier == tank.CenterTapped, Arrangement: arrangement,
				}
				list = append(list, start{p, core, core + s.leastCopper(p)})
			}
		}
	}
	slices.SortStableFunc(list, func(a, b start) int { return cmp.Compare(a.least, b.least) })
	return list
}

// gaps lists how the gap of a transformer may be made.
func (s *search) gaps() []part.Gap {
	limits := s.transformerLimits.Gap
	ground := part.Gap{Kind: part.Ground, Pieces: 1, Half: "upper", Governs: limits.Governs}
	film := part.Gap{Kind: part.Spacer, Governs: "length", Under: "all legs"}
	switch {
	case s.job.Tank.Lm == 0:
		return []part.Gap{{Kind: part.Closed}}
	case limits.Kind == "spacer":
		return []part.Gap{film}
	case limits.Kind == "either":
		return []part.Gap{ground, film}
	}
	return []part.Gap{ground}
}

// extraMost is the longest free distance between primary and secondary that is
// tried where the leakage does not have to make the whole resonant inductance, m.
const extraMost = 3e-3

// extraStep is what the shop can build with tape, m.
const extraStep = 0.05e-3

// distance returns the range of the free distance between primary and secondary.
func (s *search) distance(arrangement string) (low, high float64) {
	switch {
	case s.leakage:
		x := s.job.Build.Transformer.BarrierExtra
		return x[0], x[1]
	case arrangement == "P-S" || arrangement == "sections":
		// More leakage lowers the effective turns ratio. With the secondary inside
		// of the primary it leaves the ratio alone.
		return 0, extraMost
	}
	return 0, 0
}

// leastCopper is a lower bound of the winding loss, W weighted by share: all of
// the winding space filled with the wire that has most copper for its room, and
// nothing but resistance to the mean square current, at the temperature of the
// air.
func (s *search) leastCopper(p plan) float64 {
	entries, _ := p.entries(s.transformerLimits.Insulation)
	height := p.Former.Height - s.transformerLimits.Wires.HeightLeftMin - min(tapeHeight(entries)[0], tapeHeight(entries)[1])
	if height <= 0 {
		return math.Inf(1)
	}
	rho := wire.Resistivity(s.job.Build.Surroundings.AmbientTemperature)
	// Innermost turns are the shortest.
	length := p.Former.TurnLength(height / 2)
	if p.Arrangement != "sections" {
		length = p.Former.MLT - math.Pi*(p.Former.Height-height)
	}
	sum := 0.0
	for d := range s.drives {
		primary := float64(p.Np) * s.drives[d].RMS[0] / math.Sqrt(s.fill[0])
		secondary := 0.0
		for _, x := range s.drives[d].RMS[1:] {
			secondary += float64(p.Ns) * x / math.Sqrt(s.fill[1])
		}
		amps := (primary + secondary) * (primary + secondary)
		if p.Arrangement == "sections" {
			amps = primary*primary + secondary*secondary
		}
		sum += s.shares[d] * rho * length * amps / (p.Former.Breadth * height)
	}
	return sum
}

// densest is the largest share of its room that copper takes with any of the
// wires: a layer of k turns needs at least k outer diameters.
func densest(spools []spool) float64 {
	most := 0.0
	for i := range spools {
		w := &spools[i]
		x := w.Thickness / w.pitch
		if w.Kind != wire.Foil {
			x = w.CopperArea() / (w.od * w.pitch)
		}
		most = math.Max(most, x)
	}
	return most
}

// frontKey names a side of a plan whose wires are the same for several plans.
type frontKey struct {
	side        int
	arrangement string
	chambers    int
	np, ns      int
	build       insulationBuild
	bifilar     bool
	extra       float64
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
		if p.Arrangement == "sections" {
			st.breadth -= p.Extra / 2
		}
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

// wind finds the pair of wires with the least loss that fits the window and
// gives the turns ratio (and the leakage, where it makes the resonant
// inductance) that the tank needs, as far as a screening can tell and known
// corrects it.
func (s *search) wind(p plan, windows ratioWindow, fronts map[frontKey][]choice, known *learned, own *family, miss func(Reason)) (estimate, bool) {
	limits := s.transformerLimits
	slack, ratioBias, leakBias := ratioSlack, 1.0, 1.0
	if p.Arrangement == "sections" {
		slack *= 2
	}
	if known.ratio != 0 {
		slack, ratioBias, leakBias = biasSlack, known.ratio, known.leak
	}
	if own != nil && own.ratio != 0 {
		slack, ratioBias, leakBias = 0, own.ratio, own.leak
	}
	low, high := s.distance(p.Arrangement)
	p.Extra = low
	lm := s.wantedLm(p)
	if p.Arrangement == "sections" {
		p.Extra = s.chamberDistance(p, windows.usual()[1], lm, low, high, ratioBias, leakBias)
	}
	stretches, ok := s.stretches(p)
	if !ok {
		return estimate{}, false
	}
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
	var choices [2][]choice
	for i := range 2 {
		room[i] = height - fixed[0]
		if p.Arrangement == "sections" {
			room[i] = height - fixed[i]
		}
		key := p.front(i)
		if front, ok := fronts[key]; ok {
			choices[i] = front
			continue
		}
		choices[i] = s.forms.options(s.sideOf(p, stretches, sides[i], i))
		fronts[key] = choices[i]
	}
	if len(choices[0]) == 0 || len(choices[1]) == 0 {
		miss(Reason{"height_left_min", math.NaN(), limits.Wires.HeightLeftMin, "m", "min"})
		return estimate{}, false
	}
	// Both sides in the order of their loss, as far as it is known.
	var costs [2][]cost
	var heights [2][2]float64
	for i := range 2 {
		heights[i] = [2]float64{choices[i][0].height, choices[i][len(choices[i])-1].height}
		costs[i] = make([]cost, len(choices[i]))
		for k := range choices[i] {
			c := &choices[i][k]
			costs[i][k] = cost{c, c.mean * known.factor(i, c.spool)}
		}
		slices.SortStableFunc(costs[i], func(a, b cost) int { return cmp.Compare(a.loss, b.loss) })
	}
	best := estimate{plan: p, loss: math.Inf(1)}
	var least float64
	offRatio, offLeak, uneven := math.Inf(1), math.Inf(1), math.Inf(1)
	evenBias, evenSlack := 1.0, 1.5
	if known.uneven > 0 {
		evenBias, evenSlack = known.uneven, 1
	}
	couple := s.coupling(p, stretches, lm)
	crossings := couple.crossings
	wanted := s.job.Tank.Lr
	free := p.Arrangement != "sections" && high > low
	// The ratio of two sums that are linear in heights and distance has its
	// extremes at the corners of what they can be.
	if !s.leakage {
		nearest, furthest := math.Inf(1), math.Inf(-1)
		for corner := range 8 {
			extra := p.Extra
			if free && corner&4 != 0 {
				extra = high
			}
			ratio, _ := couple.at(heights[0][corner&1], heights[1][corner>>1&1], extra)
			nearest, furthest = math.Min(nearest, ratio*ratioBias), math.Max(furthest, ratio*ratioBias)
		}
		wide := windows.widest()
		if furthest < wide[0]*(1-slack)*0.9999 || nearest > wide[1]*(1+slack)*1.0001 {
			off := math.Min(math.Abs(nearest/s.job.Tank.TurnsRatio-1), math.Abs(furthest/s.job.Tank.TurnsRatio-1))
			miss(Reason{"ratio_error", math.Max(off, limits.Limits.RatioError), limits.Limits.RatioError, "", "max"})
			return estimate{}, false
		}
	}
	least = heights[0][0] + heights[1][0]
	if p.Arrangement == "sections" {
		least = math.Max(heights[0][0]-room[0], heights[1][0]-room[1]) + room[0]
	}
	for _, x := range costs[0] {
		a := x.choice
		if x.loss+costs[1][0].loss >= best.loss {
			break
		}
		for _, y := range costs[1] {
			b := y.choice
			loss := x.loss + y.loss
			if loss >= best.loss {
				break
			}
			used := a.height + b.height
			if p.Arrangement == "sections" {
				used = math.Max(a.height-room[0], b.height-room[1]) + room[0]
			}
			if used > room[0] || known.slow[[2]int{a.layers, b.layers}] >= slowMost {
				continue
			}
			// The inductor's copper comes on top, about half of the transformer's.
			window := windows.at(1.5 * loss / s.power)
			middle := (window[0] + window[1]) / 2
			switch {
			case slack == 0:
				// Its own ratio is known; more distance loses more, which asks for
				// a little more again.
				middle = window[1] * (1 - creep*float64(own.tries-1))
			case slack < ratioSlack:
				middle = window[1] * (1 - ratioInside)
			}
			extra := p.Extra
			ratio, leak := couple.at(a.height, b.height, extra)
			switch {
			case free && s.leakage && leak*leakBias < wanted:
				_, more := couple.at(a.height, b.height, extra+unit)
				extra += math.Round((wanted/leakBias-leak)/(more-leak)*unit/extraStep) * extraStep
			case free && !s.leakage && ratio*ratioBias > middle:
				more, _ := couple.at(a.height, b.height, extra+unit)
				extra += math.Ceil((ratio-middle/ratioBias)/(ratio-more)*unit/extraStep) * extraStep
			}
			if extra != p.Extra {
				// The room of low is in the order of work already.
				if most := math.Min(high, low+math.Max(0, room[0]-used)/crossings); !(extra <= most) {
					// As far as it goes, for the words that say what stops it.
					ratio, leak = couple.at(a.height, b.height, most)
					if s.leakage {
						offLeak = math.Min(offLeak, math.Abs(leak*leakBias/wanted-1))
					} else {
						offRatio = math.Min(offRatio, math.Abs(ratio*ratioBias/s.job.Tank.TurnsRatio-1))
					}
					continue
				}
				ratio, leak = couple.at(a.height, b.height, extra)
			}
			if s.leakage {
				if off := math.Abs(leak*leakBias/wanted - 1); off > s.job.Build.Limits.ResonanceError*0.8+20*slack {
					offLeak = math.Min(offLeak, off)
					continue
				}
			}
			if ratio*ratioBias < window[0]*(1-slack) || ratio*ratioBias > window[1]*(1+slack) {
				offRatio = math.Min(offRatio, math.Abs(ratio*ratioBias/s.job.Tank.TurnsRatio-1))
				continue
			}
			unlike := 0.0
			if p.Centertap {
				apart := 0.0
				if p.Bifilar && b.spool.Kind == wire.Foil {
					apart = b.spool.pitch
				}
				unlike = couple.mismatch(a.height, b.height, extra, apart)
				if unlike*evenBias > limits.Limits.HalfMismatch*evenSlack {
					uneven = math.Min(uneven, unlike*evenBias)
					continue
				}
			}
			best.loss, best.Primary, best.Secondary, best.Extra, best.ratio, best.leak = loss, a.coil(), b.coil(), extra, ratio, leak
			best.uneven = unlike
			best.raw = [2]float64{a.mean, b.mean}
		}
	}
	switch {
	case !math.IsInf(best.loss, 1):
		return best, true
	case !math.IsInf(uneven, 1):
		miss(Reason{"half_mismatch", uneven, limits.Limits.HalfMismatch, "", "max"})
	case !math.IsInf(offRatio, 1) && offRatio > limits.Limits.RatioError:
		miss(Reason{"ratio_error", offRatio, limits.Limits.RatioError, "", "max"})
	case !math.IsInf(offRatio, 1):
		// Within the error allowed, but not where the tank keeps its gain.
		miss(Reason{"turns_ratio", s.job.Tank.TurnsRatio * (1 - offRatio), windows.usual()[1], "", "max"})
	case !math.IsInf(offLeak, 1):
		miss(Reason{"resonance_error", offLeak, s.job.Build.Limits.ResonanceError, "", "max"})
	default:
		miss(Reason{"height_left_min", height + limits.Wires.HeightLeftMin - fixed[0] - least, limits.Wires.HeightLeftMin, "m", "min"})
	}
	return estimate{}, false
}

// sideOf is one side of a plan, about to get its wire.
func (s *search) sideOf(p plan, stretches, own []stretch, i int) side {
	limits := s.transformerLimits
	insulated := p.Build.Insulated == [2]string{"primary", "secondary"}[i]
	// Foil beside a gap is driven over its whole breadth by the field, which
	// no formula at hand foretells: never innermost, never side by side.
	foil := p.Arrangement != "sections" && own[0].primary != stretches[0].primary
	thickest, litz := bend(p.Shape, p.Former, limits.Wires)
	return side{
		stretches: own, spools: s.spools[insulated], foil: foil, parallel: limits.Wires.ParallelMax,
		room: p.Former.Height - limits.Wires.HeightLeftMin, pins: s.pinRule(p, i), bend: thickest, litzBends: litz,
	}
}

// front names the wires of a side of a plan.
func (p plan) front(i int) frontKey {
	key := frontKey{i, p.Arrangement, p.Former.Chambers, p.Np, p.Ns, p.Build, p.Bifilar && i == 1, 0}
	if p.Arrangement == "sections" {
		key.extra = p.Extra
	}
	return key
}

// wantedLm is the magnetizing inductance that the gap of a plan gives, H: the
// tank's, or that of the closed core where the tank asks for none.
func (s *search) wantedLm(p plan) float64 {
	if s.job.Tank.Lm > 0 {
		return s.job.Tank.Lm
	}
	return quantity.Mu0 * s.ferrites[p.Material].MuI(part.TestTemperature).Value / p.Shape.C1 * float64(p.Np*p.Np)
}

// A cost is a choice with its loss as far as it is known.
type cost struct {
	*choice
	loss float64 // W
}

// Bounds of the effective turns ratio of the screening. Its one-dimensional
// energies are good to some 20 % of the few per cent that leakage takes from the
// ratio; side by side twice that. With the ratio of a like one known from the
// field, much less is left.
const (
	ratioSlack  = 0.006
	biasSlack   = 0.0015
	ratioInside = 0.0003 // a free distance aims so far inside the window
	creep       = 0.0001 // and so much further at every try with the ratio known
)

// unit is a step for differences of heights and distances, m.
const unit = 1e-3

// chamberDistance is how far windings side by side are kept apart beyond the
// wall between their chambers.
func (s *search) chamberDistance(p plan, most, lm, low, high, ratioBias, leakBias float64) float64 {
	want := s.job.Tank.Lr / leakBias
	if !s.leakage {
		// The leakage with which the ratio comes into its window.
		r := float64(p.Np) / float64(p.Ns) * ratioBias / (most * (1 - ratioInside))
		want = lm * (r*r - 1)
	}
	at := func(extra float64) float64 { p.Extra = extra; return sideBySideLeak(p) }
	here := at(low)
	if here >= want {
		return low
	}
	extra := low + math.Ceil((want-here)/(at(low+unit)-here)*unit/extraStep)*extraStep
	return math.Min(extra, math.Min(high, p.Former.Breadth))
}

// sideBySideLeak is the one-dimensional leakage of windings in two chambers, H.
func sideBySideLeak(p plan) float64 {
	b := p.Former.Breadth - p.Extra/2
	list := []field.Section1D{
		{Height: b, AmpereTurns: float64(p.Np)}, {Height: p.Former.ChamberWall + p.Extra}, {Height: b, AmpereTurns: -float64(p.Np)},
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
