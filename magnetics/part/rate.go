package part

import (
	"fmt"
	"math"

	"gapwright/corelib/material"
	"gapwright/corelib/quantity"
	"gapwright/corelib/root"
	"gapwright/corelib/shape"
	"gapwright/magnetics/coreloss"
	"gapwright/magnetics/gap"
	"gapwright/magnetics/thermal"
	"gapwright/magnetics/winding"
	"gapwright/tank/waveform"
)

// Conditions is what a part is rated under.
type Conditions struct {
	Shapes   *shape.Table
	Ferrites *material.Table
	Bulge    winding.Bulge

	Around        thermal.Surroundings
	HotSpot       float64 // K, of the hottest turn over the mean winding temperature
	CoreLimit     float64 // °C, where Bs is taken
	CurrentLimit  float64 // A, peak, where the controller trips; 0: 1.5 times the largest steady peak
	TestTemp      float64 // °C, of the shop's inductance readings
	ClearDistance float64 // of copper from a gap piece, in its lengths
	PieceMax      float64 // m, longest gap piece of the job

	// The tank that the drives are of.
	TankLm, TankRatio float64
	Stray             float64 // H, layout of one secondary loop

	// Permeability scales mu_i of the table, for tolerances and sensitivities; 0
	// counts as 1.
	Permeability float64

	Modes  int  // of the field series; 0: as many as the window needs
	Detail bool // also what only the final report asks for: hot shift, spacer alternative, sensitivity
}

// overloadFactor stands for a current limit that was not given.
const overloadFactor = 1.5

// Coil is a construction looked up in the tables and laid out in its window:
// what does not change with the gap.
type Coil struct {
	geometry
	Construction Construction
	Ferrite      *material.Ferrite
	Window       winding.Window
	permeability float64 // scale of mu_i
}

// mu returns the relative permeability at a temperature in °C.
func (c *Coil) mu(temperature float64) float64 {
	return c.permeability * c.Ferrite.MuI(temperature).Value
}

// NewCoil resolves the names of a construction and lays out its coil. It fails
// when a name is unknown or an entry makes no sense; a coil that does not fit
// is no failure, see Section.
func NewCoil(c Construction, cond Conditions) (*Coil, error) {
	sh, err := cond.Shapes.Find(c.Core.Shape)
	if err != nil {
		return nil, err
	}
	ferrite, err := cond.Ferrites.Find(c.Core.Material)
	if err != nil {
		return nil, err
	}
	chambers := max(c.Former.Chambers, 1)
	former, err := cond.Shapes.FormerWith(sh, chambers)
	if err != nil {
		return nil, err
	}
	return newCoil(c, sh, former, ferrite, cond)
}

func newCoil(c Construction, sh shape.Shape, former shape.Former, ferrite *material.Ferrite, cond Conditions) (*Coil, error) {
	if c.Former.Wall > 0 {
		former.WallOffset = c.Former.Wall
	}
	w := WindowOf(former)
	section, err := winding.Layout(w, c.Build, cond.Bulge)
	if err != nil {
		return nil, err
	}
	k := &Coil{Construction: c, Ferrite: ferrite, Window: w, permeability: cond.Permeability}
	if k.permeability == 0 {
		k.permeability = 1
	}
	k.geometry = geometry{shape: sh, former: former, section: section, index: make(map[string]int)}
	for i, x := range c.Windings {
		k.index[x.Name] = i
		k.turns = append(k.turns, float64(x.Turns))
	}
	laid := make([]int, len(c.Windings))
	for _, l := range section.Layers {
		for _, of := range l.Of {
			i, ok := k.index[of]
			if !ok {
				return nil, fmt.Errorf("layer of winding %q, which is not among the windings", of)
			}
			laid[i] += l.Turns
		}
	}
	for i, x := range c.Windings {
		if laid[i] != x.Turns {
			return nil, fmt.Errorf("winding %s has %d turns, its sections add up to %d", x.Name, x.Turns, laid[i])
		}
	}
	return k, nil
}

// WindowOf returns the winding space of a former as the layout sees it.
func WindowOf(f shape.Former) winding.Window {
	return winding.Window{
		Breadth: f.Breadth, Height: f.Height, Wall: f.WallOffset, Chambers: f.Chambers, ChamberWall: f.ChamberWall,
		PostPerimeter: f.TurnLength(0) - 2*math.Pi*f.WallOffset,
	}
}

// Section returns the coil as laid out.
func (c *Coil) Section() winding.Section { return c.section }

// Shape returns the core shape.
func (c *Coil) Shape() shape.Shape { return c.shape }

// Inductances returns the inductance matrix of the windings with a gap, H, at
// the permeability of a temperature in °C.
func (c *Coil) Inductances(s *Solvers, g Gap, temperature float64, modes int) ([][]float64, error) {
	m, err := s.solve(&c.geometry, g, c.mu(temperature), modes, false)
	return m.L, err
}

// GapFor returns the gap of the kind of like that gives want, where value
// reduces the inductance matrix to the figure wanted (H). The gap is bracketed
// between nearly closed and half the window breadth.
func (c *Coil) GapFor(s *Solvers, like Gap, want float64, temperature float64, modes int, value func(l [][]float64) float64) (Gap, error) {
	set := func(length float64) Gap {
		g := like
		if g.Kind == Spacer {
			g.Thickness = length
			g.Total = 2 * length
		} else {
			g.Total = length
		}
		return g
	}
	var failed error
	// 1/L is nearly linear in the gap.
	miss := func(length float64) float64 {
		l, err := c.Inductances(s, set(length), temperature, modes)
		if err != nil {
			failed = err
			return math.NaN()
		}
		return want/value(l) - 1
	}
	low, high := 1e-6, 0.5*c.shape.WindowBreadth()/float64(max(like.Pieces, 1))
	if like.Kind != Spacer {
		high = 0.5 * c.shape.WindowBreadth()
	}
	// A short way in: two secant steps from McLyman's gap usually bracket it
	// within a per cent; the root finder would take it from the whole window.
	guess := gapGuess(c, like, want)
	for _, factor := range []float64{1.15, 1.6, 3} {
		a, b := math.Max(low, guess/factor), math.Min(high, guess*factor)
		if a >= b {
			continue
		}
		fa, fb := miss(a), miss(b)
		if failed != nil {
			return Gap{}, failed
		}
		if (fa < 0) != (fb < 0) {
			low, high = a, b
			break
		}
	}
	x, err := root.Find(miss, low, high, gapTolerance)
	if failed != nil {
		return Gap{}, failed
	}
	if err != nil {
		return Gap{}, fmt.Errorf("%s: no gap up to half of the window breadth gives %s: %w", c.shape.Name, quantity.Format(want, quantity.Henry), err)
	}
	return set(x.X), nil
}

// gapTolerance is how exactly a gap is found, m: well below what a grinder
// feels.
const gapTolerance = 2e-8

// gapGuess is McLyman's gap for the inductance of the first winding.
func gapGuess(c *Coil, like Gap, want float64) float64 {
	g, err := gap.Length(want, c.turns[0], c.gapCore(like, TestTemperature))
	if err != nil {
		return 0.1 * c.shape.WindowBreadth()
	}
	if like.Kind == Spacer {
		g /= 2
	}
	return math.Max(g, 2e-6)
}

// TestTemperature is where shops measure unless told otherwise, °C.
const TestTemperature = 25

func (c *Coil) gapCore(g Gap, temperature float64) gap.Core {
	return gap.Core{
		Ae: c.shape.Ae, Le: c.shape.Le, Mu: c.mu(temperature), Breadth: c.shape.WindowBreadth(), Pieces: g.Pieces,
	}
}

// RateTransformer rates a transformer at every drive. g.Total or g.Thickness of
// the construction is taken as it is.
func RateTransformer(t Transformer, drives []Drive, cond Conditions, s *Solvers) (*Rating, error) {
	c, err := NewCoil(t.Construction, cond)
	if err != nil {
		return nil, err
	}
	return c.RateTransformer(t, drives, cond, s)
}

// RateTransformer is the function of that name for a coil already laid out.
func (c *Coil) RateTransformer(t Transformer, drives []Drive, cond Conditions, s *Solvers) (*Rating, error) {
	if len(t.Windings) < 2 {
		return nil, fmt.Errorf("a transformer with %d windings", len(t.Windings))
	}
	for _, d := range drives {
		if len(d.Phasors) != len(t.Windings) {
			return nil, fmt.Errorf("the tank has %d windings on this transformer, the build %d", len(d.Phasors), len(t.Windings))
		}
	}
	r := &Rating{Part: "transformer"}
	cold, hot, err := c.magnetics(s, r, cond)
	if err != nil {
		return nil, err
	}
	p := NewTwoPort(cold.L)
	e := p.Equivalent(0)
	r.OpenInductance, r.SecondaryInductance, r.ShortInductance, r.ShortHalves = p.Lp, p.Ls, p.Lsc, p.ShortHalf
	r.MagnetizingInduct, r.EffectiveTurnsRatio = e.Lm, e.Ratio
	// Flux: under the secondary Lm m/n, under the primary what its own leakage
	// adds, both of the tank that the currents are of.
	leak := p.Equivalent(cond.Stray).Lleak
	ns := float64(t.Windings[1].Turns)
	np := float64(t.Windings[0].Turns)
	for i := range drives {
		d := &drives[i]
		second := d.Magnetize.Scaled(cond.TankLm / (cond.TankRatio * ns))
		first := waveform.Combine(leak/np, d.Resonant, cond.TankLm/np, d.Magnetize)
		if err := c.corner(s, r, d, hot, []waveform.Wave{second, first}, cond); err != nil {
			return nil, err
		}
	}
	limit := c.currentLimit(drives, cond)
	for i := range drives {
		peak := cond.TankLm*drives[i].Magnetize.Peak()/np + leak*limit/np
		r.OverloadFlux = math.Max(r.OverloadFlux, peak/c.shape.Amin)
	}
	return r, c.finish(s, r, cond, drives)
}

// RateInductor rates an inductor at every drive.
func RateInductor(l Inductor, drives []Drive, cond Conditions, s *Solvers) (*Rating, error) {
	c, err := NewCoil(l.Construction, cond)
	if err != nil {
		return nil, err
	}
	return c.RateInductor(l, drives, cond, s)
}

// RateInductor is the function of that name for a coil already laid out.
func (c *Coil) RateInductor(l Inductor, drives []Drive, cond Conditions, s *Solvers) (*Rating, error) {
	if len(l.Windings) != 1 {
		return nil, fmt.Errorf("an inductor with %d windings", len(l.Windings))
	}
	r := &Rating{Part: "inductor"}
	cold, hot, err := c.magnetics(s, r, cond)
	if err != nil {
		return nil, err
	}
	r.OpenInductance = cold.L[0][0]
	n := float64(l.Windings[0].Turns)
	for i := range drives {
		flux := drives[i].Resonant.Scaled(r.OpenInductance / n)
		if err := c.corner(s, r, &drives[i], hot, []waveform.Wave{flux}, cond); err != nil {
			return nil, err
		}
	}
	r.OverloadFlux = r.OpenInductance * c.currentLimit(drives, cond) / (n * c.shape.Amin)
	return r, c.finish(s, r, cond, drives)
}

// currentLimit is the peak current that the core must stand.
func (c *Coil) currentLimit(drives []Drive, cond Conditions) float64 {
	if cond.CurrentLimit > 0 {
		return cond.CurrentLimit
	}
	largest := 0.0
	for i := range drives {
		largest = math.Max(largest, drives[i].Peak)
	}
	return overloadFactor * largest
}

// hotTemperature is where the permeability for the loss fields is taken, °C.
const hotTemperature = 100

// magnetics solves the coil cold, for what the shop measures, and hot, for the
// fields that make the loss.
func (c *Coil) magnetics(s *Solvers, r *Rating, cond Conditions) (cold, hot magnetic, err error) {
	g := c.Construction.Core.Gap
	r.hotSpotAllowance = cond.HotSpot
	r.Shape, r.Former, r.Ferrite, r.Section = c.shape, c.former, *c.Ferrite, c.section
	r.Arrangement = arrangement(c.Construction)
	cold, err = s.solve(&c.geometry, g, c.mu(cond.TestTemp), cond.Modes, false)
	if err != nil {
		return cold, hot, err
	}
	hot, err = s.solve(&c.geometry, g, c.mu(hotTemperature), cond.Modes, true)
	r.HotInductance = hot.L[0][0]
	return cold, hot, err
}

// samples per period of a flux waveform; iGSE of a sine sampled so often is low
// by 1e-4.
const samples = 160

// What wires and foils do together is found at one temperature, and again where
// the winding turns out to be warmEnough away from it, K: across a foil beside a
// gap the corrected loss follows the resistivity where that of a slab follows
// its inverse, 10 K are then 6 % of the correction's share.
const (
	warmEnough = 3
	warmRounds = 4
)

// losses returns the winding loss of one corner as a function of temperature; in
// a detailed rating with solid wires and foils solved together at the
// temperature given, °C, and whether there were any.
func (c *Coil) losses(s *Solvers, r *Rating, d *Drive, hot *magnetic, temperature float64, cond Conditions) (lossTable, bool, error) {
	table := c.table(hot, d)
	if !cond.Detail {
		return table, false, nil
	}
	table.warm = temperature
	gap, mu := c.Construction.Core.Gap, c.mu(hotTemperature)
	orders, tooMany, err := s.couple(&c.geometry, gap, mu, cond.Modes, d, &table)
	if err != nil {
		return table, false, fmt.Errorf("solid wires at corner %s: %w", d.Name, err)
	}
	r.solidOrder = max(r.solidOrder, orders)
	if tooMany > 0 {
		r.warn("W432", fmt.Sprintf("%d solid wires are too many to solve together: each is taken alone in its layer's field, which is cautious", tooMany))
	}
	foils, tooMany, err := s.coupleFoils(&c.geometry, gap, mu, cond.Modes, d, &table)
	if err != nil {
		return table, false, fmt.Errorf("foils at corner %s: %w", d.Name, err)
	}
	r.foils = max(r.foils, foils)
	if tooMany > 0 {
		r.warn("W433", fmt.Sprintf("%d turns of foil are too many to solve together: each is a slab in the local field, which is low where its ends or a gap are near", tooMany))
	}
	return table, orders > 0 || foils > 0, nil
}

// corner rates one drive. flux holds the flux linkages per turn, Wb, under each
// winding group; the core loss is the mean of theirs.
func (c *Coil) corner(s *Solvers, r *Rating, d *Drive, hot magnetic, flux []waveform.Wave, cond Conditions) error {
	out := CornerRating{Name: d.Name, Continuous: d.Continuous}
	loops := make([]coreloss.Loops, len(flux))
	for i, w := range flux {
		t, b := w.Sample(samples)
		if err := loops[i].Split(t, b); err != nil {
			return fmt.Errorf("flux at corner %s: %w", d.Name, err)
		}
		low, high := w.Extremes()
		out.FluxDensityPeak = math.Max(out.FluxDensityPeak, math.Max(-low, high)/c.shape.Amin)
	}
	r.FluxDensityPeak = math.Max(r.FluxDensityPeak, out.FluxDensityPeak)
	var coreErr error
	core := func(t float64) float64 {
		sum := 0.0
		for i := range loops {
			loss, err := loops[i].Density(c.Ferrite, 1/c.shape.Ae, t)
			if err != nil {
				coreErr = err
				return 0
			}
			sum += loss.Density * c.shape.Ve / float64(len(loops))
		}
		return sum
	}
	temperature, coreTemperature := float64(hotTemperature), float64(hotTemperature)
	var table lossTable
	for range warmRounds {
		var coupled bool
		var err error
		if table, coupled, err = c.losses(s, r, d, &hot, temperature, cond); err != nil {
			return err
		}
		if !d.Continuous {
			break
		}
		body, err := c.body(cond)
		if err != nil {
			return err
		}
		res, err := thermal.Solve(body, cond.Around, table.curve(s.factors()), core)
		if coreErr != nil {
			return coreErr
		}
		if err != nil {
			return fmt.Errorf("temperatures at corner %s: %w", d.Name, err)
		}
		temperature, coreTemperature = res.WindingTemperature, res.CoreTemperature
		out.CoreTemperature, out.WindingTemperature, out.Runaway = res.CoreTemperature, res.HotSpot, res.Runaway
		if !coupled || out.Runaway || math.Abs(temperature-table.warm) < warmEnough {
			break
		}
	}
	out.CoreLoss = core(coreTemperature)
	if coreErr != nil {
		return fmt.Errorf("core loss at corner %s: %w", d.Name, coreErr)
	}
	out.WindingLoss = table.loss(temperature, s.factors(), nil)
	out.PrimaryLoss = out.WindingLoss[0]
	for i, loss := range out.WindingLoss[1:] {
		out.SecondaryLoss += loss
		out.SecondResistance += loss / (d.RMS[i+1] * d.RMS[i+1]) / float64(len(out.WindingLoss)-1)
	}
	out.PrimaryResistance = out.PrimaryLoss / (d.RMS[0] * d.RMS[0])
	for i := range loops {
		loss, err := loops[i].Density(c.Ferrite, 1/c.shape.Ae, coreTemperature)
		if err != nil {
			return err
		}
		for _, w := range loss.Warnings(c.Ferrite) {
			r.warn(w.Code, w.Text)
		}
	}
	r.Corners = append(r.Corners, out)
	return nil
}

// warn adds a warning once.
func (r *Rating) warn(code, text string) {
	for _, w := range r.Warnings {
		if w.Code == code && w.Text == text {
			return
		}
	}
	r.Warnings = append(r.Warnings, Warning{code, text})
}

func sumOf(list []float64) float64 {
	sum := 0.0
	for _, x := range list {
		sum += x
	}
	return sum
}

// upright tells along which axis a wound core of a family usually stands on the
// board: pot-like cores on one yoke, E-like ones lying on their side (common
// practice; a former with the other mounting turns it).
func upright(sh shape.Shape, former shape.Former) thermal.Direction {
	switch sh.Family {
	case shape.PQ, shape.RM, shape.RMLow, shape.P, shape.EQ, shape.PlanarE:
		return thermal.Along
	}
	if former.Mounting == "vertical" {
		return thermal.Along
	}
	return thermal.Depth
}

// standOff is what former and pins put under the part, m (common practice).
const standOff = 2e-3

// Envelope returns the box of the wound part as it stands on the board: two
// sides and the height with stand-off, m.
func Envelope(sh shape.Shape, former shape.Former) (length, width, height float64) {
	o := sh.WoundOutline()
	if upright(sh, former) == thermal.Along {
		return o.Length, o.Width, o.Height + standOff
	}
	return o.Length, o.Height, o.Width + standOff
}

// body is the wound part as the heat sees it.
func (c *Coil) body(cond Conditions) (thermal.Body, error) {
	return Body(c.shape, c.former, c.section.Height, cond.HotSpot)
}

// Body is a part as the heat sees it: a shape with its former, wound up to a
// height (m) over the former's wall. hotSpot (K) is the allowance for the hottest
// turn.
func Body(s shape.Shape, former shape.Former, height, hotSpot float64) (thermal.Body, error) {
	o := thermal.Outline{
		Across: s.A.Mean(), Along: 2 * s.B.Mean(), Depth: s.Outline().Width, Up: upright(s, former),
		Round: s.PostRound(), PostAcross: s.PostWidth(), PostDepth: s.PostDepth(),
		Window: s.PostWidth() + 2*s.WindowDepth(), Breadth: s.WindowBreadth(), Openings: 2, HotSpot: hotSpot,
	}
	if s.Family == shape.P {
		o.Openings = 0
	}
	// Where former figures give only the sum of play and wall, three fifths of
	// it count as plastic (own share; published formers have 0.8..1.2 mm walls in
	// 1.2..2 mm).
	o.Wall = 0.6 * former.WallOffset
	o.Clearance = 0.4 * former.WallOffset
	o.WindingHeight = math.Min(height, s.WindowDepth()-former.WallOffset)
	return thermal.NewBody(o)
}
