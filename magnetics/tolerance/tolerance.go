// Package tolerance says what the tolerances of parts and components do to a
// converter: every build is put together from its own gap, permeability,
// leakage, capacitor and timing and solved exactly at every corner.
//
// Each source of spread is a number between -1 and 1 that moves a value from
// its lower to its upper tolerance; 0 is the value as designed. Where a part
// with a ground gap is ordered by its A_L, the A_L is what spreads: gap,
// permeability and area are inside it, because the maker grinds until it is
// met. Where the length governs, and with films, the three spread by
// themselves. All else of the tank is as built: resistances are those of the
// corner, the part of the turns ratio that the turns make is exact.
package tolerance

import (
	"errors"
	"fmt"
	"math"

	"gapwright/corelib/quantity"
	"gapwright/magnetics/design"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/tank"
)

// A Source is one tolerance.
type Source struct {
	Key      string  // of the build section of the job, or what it is called where the job has no key
	What     string  // in words
	Down, Up float64 // largest deviation each way, both positive; relative where Unit is "%", else in Unit
	Unit     string  // "%", "m"
	Origin   string  // job, default, estimate

	group int     // sources of one group act on the same value
	sign  float64 // of that action
}

// The groups of sources.
const (
	openGroup = iota
	leakageGroup
	inductorGroup
	capacitorGroup
	deadTimeGroup
	nodeGroup
	windingGroup
	temperatureGroup
	groups
)

// Places in a part's sources; -1: not among them.
type partSources struct{ al, gap, permeability, area int }

// A gapped is a part whose inductance follows its gap.
type gapped struct {
	byAL    bool          // the A_L governs: all else is unset
	law     design.GapLaw // nil: there is no gap
	film    bool
	length  float64 // m, as designed
	closed  float64 // H, of the closed core
	plain   float64 // H m: mu0 N² Ae, inductance of a plain gap times its length
	nominal float64 // H
	hot     float64 // H, what warming adds
	sources partSources
}

// A Model is a design ready to be built many times.
type Model struct {
	Sources []Source
	Nominal Build // as designed, cold, every value at its middle

	design      *design.Design
	tanks       []tank.Tank // as built, with the resistances of each corner
	transformer gapped
	inductor    *gapped

	primary, secondary float64 // turns
	common             float64 // H per turn squared, what all windings share
	leak               [3]float64
	leakage, capacitor int
	deadTime, node     int
	winding, warm      int
}

// reach is how far beyond its tolerance a source may be moved, for the question
// what a looser one does.
const reach = 2

// New prepares a rated design. The error is that of the field solution of the
// gap, or says that there are no parts.
func New(d *design.Design, tables design.Tables) (*Model, error) {
	if d.Rating == nil || d.Transformer == nil {
		return nil, errors.New("tolerances of a design without parts")
	}
	m := &Model{design: d}
	for _, c := range d.Job.Corners {
		m.tanks = append(m.tanks, d.TankAt(c.Name))
	}
	t := d.Job.Build.Tolerances
	origin := func(key string) string {
		if d.Job.IsSet("build.tolerances." + key) {
			return "job"
		}
		return "default"
	}
	add := func(key, what, unit string, down, up float64, group int, sign float64) int {
		if down == 0 && up == 0 {
			return -1
		}
		m.Sources = append(m.Sources, Source{Key: key, What: what, Unit: unit, Down: down, Up: up, Origin: origin(key), group: group, sign: sign})
		return len(m.Sources) - 1
	}
	var err error
	m.transformer, err = newGapped(d, tables, job.Transformer, d.Transformer.Construction, d.Rating, t.OpenInductance, "open_inductance", openGroup, add)
	if err != nil {
		return nil, err
	}
	short, key := shortTolerance(d)
	m.leakage = add(key, "leakage, "+d.Rating.Arrangement, "%", short[0], short[1], leakageGroup, 1)
	if d.Inductor != nil {
		l, err := newGapped(d, tables, job.Inductor, d.Inductor.Construction, d.InductorRating, t.InductorInductance, "inductor_inductance", inductorGroup, add)
		if err != nil {
			return nil, err
		}
		m.inductor = &l
	}
	m.capacitor = add("resonant_capacitance", "Cr", "%", t.ResonantCapacitance[0], t.ResonantCapacitance[1], capacitorGroup, 1)
	m.deadTime, m.node, m.winding = -1, -1, -1
	if d.Job.Tank.DeadTime > 0 {
		m.deadTime = add("dead_time", "dead time", "%", t.DeadTime[0], t.DeadTime[1], deadTimeGroup, 1)
		if d.Job.Tank.NodeCapacitance > 0 {
			m.node = add("node_capacitance", "node capacitance", "%", t.NodeCapacitance[0], t.NodeCapacitance[1], nodeGroup, 1)
		}
		if d.AsBuilt.WindingCapacitance > 0 {
			m.winding = add("winding capacitance", "winding capacitance", "%", part.CapacitanceBand, part.CapacitanceBand, windingGroup, 1)
			m.Sources[m.winding].Origin = "estimate"
		}
	}
	m.warm = add("temperature", "warmth of the cores", "%", 0, 1, temperatureGroup, 1)
	m.Sources[m.warm].Origin = "every start"

	np, ns := float64(d.Transformer.Windings[0].Turns), float64(d.Transformer.Windings[1].Turns)
	m.primary, m.secondary = np, ns
	p := part.TwoPort{Lp: d.Rating.OpenInductance, Ls: d.Rating.SecondaryInductance, Lsc: d.Rating.ShortInductance}
	mutual := math.Sqrt(math.Max(0, (p.Lp-p.Lsc)*p.Ls))
	// The innermost winding has what all share; what a winding has more lies
	// between it and the innermost and does not see the gap.
	m.common = math.Min(p.Lp/(np*np), p.Ls/(ns*ns))
	m.leak = [3]float64{p.Lp/(np*np) - m.common, p.Ls/(ns*ns) - m.common, mutual/(np*ns) - m.common}
	if !(m.common > 0) {
		return nil, fmt.Errorf("tolerances of a transformer with %s", quantity.Format(p.Lp, quantity.Henry))
	}
	m.Nominal = m.build(make([]float64, len(m.Sources)), true)
	return m, nil
}

func newGapped(d *design.Design, tables design.Tables, name string, c part.Construction, r *part.Rating, tolerance [2]float64, key string, group int,
	add func(key, what, unit string, down, up float64, group int, sign float64) int) (gapped, error) {
	g := gapped{nominal: r.OpenInductance, hot: r.HotInductance - r.OpenInductance, sources: partSources{-1, -1, -1, -1}}
	gap, t := c.Core.Gap, d.Job.Build.Tolerances
	if gap.Kind == part.Ground && gap.Governs != "length" {
		g.byAL = true
		g.sources.al = add(key, "A_L, "+name, "%", tolerance[0], tolerance[1], group, 1)
		return g, nil
	}
	area := add("core_area", "core area, "+name, "%", t.CoreArea[0], t.CoreArea[1], group, 1)
	permeability := add("permeability", "permeability, "+name, "%", t.Permeability[0], t.Permeability[1], group, 1)
	g.sources.area, g.sources.permeability = area, permeability
	g.closed = r.OpenInductance
	if gap.Kind != part.Ground && gap.Kind != part.Spacer {
		return g, nil
	}
	pieces := float64(max(gap.Pieces, 1))
	g.length, g.film = gap.Total, gap.Kind == part.Spacer
	if g.film {
		g.length, pieces = gap.Thickness, 1
	}
	each := t.GapLength.Above
	if g.length/pieces <= t.GapLength.UpTo {
		each = t.GapLength.Is
	}
	// Pieces are ground one like the other, so their errors add.
	g.sources.gap = add("gap_length", "gap, "+name, "m", each*pieces, each*pieces, group, -1)
	n := float64(c.Windings[0].Turns)
	g.plain = quantity.Mu0 * n * n * r.Shape.Ae
	var err error
	g.law, err = design.NewGapLaw(d.Job, name, c, g.length+reach*each*pieces*(1+1e-9), tables)
	if err != nil {
		return g, err
	}
	g.closed, err = g.law(0, 0)
	return g, err
}

// shortTolerance returns the tolerance of the leakage of the arrangement that is
// built, and its key.
func shortTolerance(d *design.Design) ([2]float64, string) {
	t := d.Job.Build.Tolerances.ShortInductance
	switch d.Rating.Arrangement {
	case "sections":
		return t.Sections, "short_inductance.sections"
	case "P-S", "S-P":
		return t.Concentric, "short_inductance.concentric"
	}
	return t.Sandwich, "short_inductance.sandwich"
}
