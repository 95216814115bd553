package design

import (
	"errors"
	"fmt"
	"math"

	"golang.org/x/sync/errgroup"

	"gapwright/corelib/wire"
	"gapwright/magnetics/gap"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
	"gapwright/tank"
)

// A View is what a picture of a design needs beside its figures: waveforms,
// field, output over frequency, inductance over gap, loss over strand. It is
// computed from the parts and the tank as they are and decides nothing.
type View struct {
	Corners []CornerView // of the corners that are served
	Parts   []PartView   // transformer, inductor
}

// A CornerView is one period at a corner, and the output around it.
type CornerView struct {
	Name string

	// One period from the middle of the rising edge, all sampled at Time.
	Time        []float64   // s
	Bridge      []float64   // V, across the tank, without the half bridge's DC
	Resonant    []float64   // A
	Magnetizing []float64   // A
	Secondary   [][]float64 // A, each winding on its own side
	Flux        [][]float64 // T, over Amin, of each part, in the order of Parts

	// The rising edge from just before turn-off to just after the dead time, with
	// t = 0 at the turn-off; empty without a dead time.
	EdgeTime    []float64 // s
	EdgeBridge  []float64 // V
	EdgeCurrent []float64 // A

	// The output with the input voltage and the load resistance of the corner.
	Gain     []tank.GainPoint
	UnitGain float64 // V, the output at gain 1
}

// A PartView is one part.
type PartView struct {
	Part    string
	Window  winding.Window
	Fields  []part.FieldMap // one per served corner
	Strands []part.StrandCurve
	Gap     GapCurve
}

// A GapCurve is the inductance of the first winding over the length of the gap.
type GapCurve struct {
	Kind      part.GapKind // none: nothing is drawn
	Built     float64      // m: the sum of the pieces, or one stack of film
	Tolerance float64      // m, of the whole gap, each way
	Points    []GapPoint
}

// A GapPoint is one length of the gap.
type GapPoint struct {
	Length float64 // m
	Field  float64 // H, of the field solution
	Plain  float64 // H, without fringing
}

// How finely a View is sampled.
const (
	viewSamples  = 240 // of a period
	edgeSamples  = 80
	gainPoints   = 72
	fieldAcross  = 48
	fieldAlong   = 96
	gapPoints    = 33
	gapReachLow  = 0.4 // of the gap as built
	gapReachHigh = 1.6
)

// NewView computes the view of a design with a rated transformer.
func NewView(d *Design, tables Tables) (*View, error) {
	if d.Rating == nil || d.Transformer == nil {
		return nil, errors.New("a view of a design without parts")
	}
	s, err := newSearch(d.Job, tables)
	if err != nil {
		return nil, err
	}
	s.tank = d.AsBuilt
	v := &View{Parts: []PartView{{Part: job.Transformer}}}
	if d.Inductor != nil {
		v.Parts = append(v.Parts, PartView{Part: job.Inductor})
	}
	var served []int
	for k := range d.Operations {
		if d.Operations[k].Status == tank.OK {
			served = append(served, k)
		}
	}
	v.Corners = make([]CornerView, len(served))
	var g errgroup.Group
	g.Go(func() error {
		for i, k := range served {
			if err := v.Corners[i].fill(d, k); err != nil {
				return err
			}
		}
		return nil
	})
	for i := range v.Parts {
		g.Go(func() error { return v.Parts[i].fill(d, s, tables) })
	}
	return v, g.Wait()
}

// TankAt returns the tank as built with the resistances that the parts have at
// one corner.
func (d *Design) TankAt(corner string) tank.Tank {
	t := d.AsBuilt
	if d.Rating == nil {
		return t
	}
	for _, r := range d.Rating.Corners {
		if r.Name == corner {
			t.PrimaryResistance, t.SecondaryResistance = r.PrimaryResistance, r.SecondResistance
		}
	}
	if d.InductorRating != nil {
		for _, r := range d.InductorRating.Corners {
			if r.Name == corner {
				t.PrimaryResistance += r.PrimaryResistance
			}
		}
	}
	return t
}

func (c *CornerView) fill(d *Design, k int) error {
	o := &d.Operations[k]
	t := d.TankAt(o.Corner.Name)
	c.Name = o.Corner.Name
	u := o.BridgeVoltage(t)
	period := o.ResonantCurrent.Period
	joints, _ := o.ResonantCurrent.Sample(viewSamples)
	for _, at := range joints {
		// At a jump the value before it too.
		if before := at - 1e-7*period; at > 0 && math.Abs(u.At(before)-u.At(at)) > 1e-3*o.Corner.InputVoltage {
			c.Time = append(c.Time, before)
		}
		c.Time = append(c.Time, at)
	}
	c.Secondary = make([][]float64, len(o.SecondaryCurrents))
	c.Flux = make([][]float64, 1, 2)
	under, own := d.fluxPerAmpere()
	for _, at := range c.Time {
		i, m := o.ResonantCurrent.At(at), o.MagnetizingCurrent.At(at)
		c.Bridge = append(c.Bridge, u.At(at))
		c.Resonant, c.Magnetizing = append(c.Resonant, i), append(c.Magnetizing, m)
		for w := range c.Secondary {
			c.Secondary[w] = append(c.Secondary[w], o.SecondaryCurrents[w].At(at))
		}
		// Of under-primary and under-secondary the one of the larger flux.
		first, second := under[0][0]*i+under[0][1]*m, under[1][1]*m
		if math.Abs(second) > math.Abs(first) {
			first = second
		}
		c.Flux[0] = append(c.Flux[0], first)
	}
	if d.InductorRating != nil {
		flux := make([]float64, len(c.Time))
		for n, i := range c.Resonant {
			flux[n] = own * i
		}
		c.Flux = append(c.Flux, flux)
	}
	if z := o.SoftSwitching; z != nil && t.DeadTime > 0 {
		const before, after = 0.25, 0.35 // of the dead time
		for n := range edgeSamples + 1 {
			at := t.DeadTime * (-before + (1+before+after)*float64(n)/edgeSamples)
			c.EdgeTime = append(c.EdgeTime, at)
			c.EdgeBridge = append(c.EdgeBridge, u.At(at-z.EdgeMiddle))
			c.EdgeCurrent = append(c.EdgeCurrent, o.ResonantCurrent.At(at-z.EdgeMiddle))
		}
	}
	var err error
	c.Gain, err = tank.Gain(t, o.Corner.InputVoltage, o.LoadResistance, gainPoints)
	c.UnitGain = t.UnitGain(o.Corner.InputVoltage)
	if err != nil {
		return fmt.Errorf("corner %s: %w", c.Name, err)
	}
	return nil
}

// fluxPerAmpere returns what the rating takes as flux density over Amin, T/A:
// of the transformer under the primary and under the secondary, each per ampere
// of the resonant and of the magnetizing current, and of the inductor.
func (d *Design) fluxPerAmpere() (under [2][2]float64, own float64) {
	t := d.AsBuilt
	np, ns := float64(d.Transformer.Windings[0].Turns), float64(d.Transformer.Windings[1].Turns)
	leak := t.Lr
	if d.InductorRating != nil {
		leak -= d.InductorRating.OpenInductance
		own = d.InductorRating.OpenInductance / (float64(d.Inductor.Windings[0].Turns) * d.InductorRating.Shape.Amin)
	}
	a := d.Rating.Shape.Amin
	lm := t.Magnetizing()
	return [2][2]float64{{leak / (np * a), lm / (np * a)}, {0, lm / (t.TurnsRatio * ns * a)}}, own
}

// strandSizes are the strand diameters that a curve is made for, m: those of
// the open list that shops ask for (the curve is about sizes, not about stock).
func strandSizes() []float64 {
	var list []float64
	for _, d := range wire.LitzStrands() {
		if d >= 0.02e-3-1e-9 && d <= 0.4e-3+1e-9 {
			list = append(list, d)
		}
	}
	return list
}

func (p *PartView) fill(d *Design, s *search, tables Tables) error {
	construction, rating, limits := d.Transformer.Construction, d.Rating, s.transformerLimits
	drives := part.TransformerDrives(d.Operations)
	if p.Part == job.Inductor {
		construction, rating, limits = d.Inductor.Construction, d.InductorRating, s.inductorLimits
		drives = part.InductorDrives(d.Operations)
	}
	coil, err := part.NewCoil(construction, s.conditions(limits, false))
	if err != nil {
		return fmt.Errorf("%s: %w", p.Part, err)
	}
	p.Window = coil.Window
	var solvers part.Solvers
	if p.Fields, err = coil.FieldMaps(&solvers, drives, fieldAcross, fieldAlong); err != nil {
		return fmt.Errorf("%s: %w", p.Part, err)
	}
	if p.Strands, err = coil.StrandCurves(&solvers, rating, drives, strandSizes()); err != nil {
		return fmt.Errorf("%s: %w", p.Part, err)
	}
	return p.Gap.fill(d.Job, p.Part, construction, rating, tables)
}

func (c *GapCurve) fill(j job.Job, name string, construction part.Construction, rating *part.Rating, tables Tables) error {
	g := construction.Core.Gap
	c.Kind = g.Kind
	pieces := float64(max(g.Pieces, 1))
	switch g.Kind {
	case part.Ground:
		c.Built = g.Total
	case part.Spacer:
		c.Built, pieces = g.Thickness, 1
	default:
		return nil
	}
	tolerance := j.Build.Tolerances.GapLength
	c.Tolerance = tolerance.Above * pieces
	if c.Built/pieces <= tolerance.UpTo {
		c.Tolerance = tolerance.Is * pieces
	}
	law, err := NewGapLaw(j, name, construction, gapReachHigh*c.Built*(1+1e-9), tables)
	if err != nil {
		return err
	}
	n := float64(construction.Windings[0].Turns)
	core := gap.Core{Ae: rating.Shape.Ae, Le: rating.Shape.Le, Mu: rating.Ferrite.MuI(j.Build.Tests.Temperature).Value}
	for i := range gapPoints {
		x := c.Built * (gapReachLow + (gapReachHigh-gapReachLow)*float64(i)/(gapPoints-1))
		q := GapPoint{Length: x}
		if g.Kind == part.Spacer {
			q.Field, err = law(0, x)
			q.Plain = gap.Plain(n, 2*x, core)
		} else {
			q.Field, err = law(x, 0)
			q.Plain = gap.Plain(n, x, core)
		}
		if err != nil {
			return err
		}
		c.Points = append(c.Points, q)
	}
	return nil
}
