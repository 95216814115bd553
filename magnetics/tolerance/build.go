package tolerance

import (
	"math"

	"gapwright/magnetics/part"
	"gapwright/tank"
)

// A Build is one converter put together.
type Build struct {
	Open      float64 // H, of the primary, as warm as it is
	Short     float64 // H
	External  float64 // H, of the inductor; 0 without one
	Lr        float64 // H
	Lm        float64 // H
	Ratio     float64
	Resonance float64 // Hz, of Lr and Cr
	Corners   []Corner
}

// A Corner is what a build does at one corner.
type Corner struct {
	Status tank.Status
	// NaN where unknown or not assessed.
	Frequency  float64 // Hz
	GainMargin float64 // peak over wanted output less 1; also of a corner that is missed for want of gain
	PeakMargin float64 // frequency over that of the peak, less 1; NaN when the peak is at the end of the range
	SoftMargin float64 // part of the dead time left; below zero minus the part of the input voltage left
	EndCurrent float64 // A, when the dead time ends; at or below 0 the node is not held
}

// value returns 1 plus the relative deviation of source i at u.
func (m *Model) value(i int, u []float64) float64 {
	if i < 0 {
		return 1
	}
	return 1 + m.deviation(i, u)
}

func (m *Model) deviation(i int, u []float64) float64 {
	if i < 0 {
		return 0
	}
	if u[i] < 0 {
		return u[i] * m.Sources[i].Down
	}
	return u[i] * m.Sources[i].Up
}

// inductance returns that of a part, cold, H.
func (m *Model) inductance(g *gapped, u []float64) float64 {
	if g.byAL {
		return g.nominal * m.value(g.sources.al, u)
	}
	area, mu := m.value(g.sources.area, u), m.value(g.sources.permeability, u)
	core := 1 / (g.closed * area * mu)
	if g.law == nil {
		return 1 / core
	}
	length := math.Max(g.length+m.deviation(g.sources.gap, u), g.length/1000)
	at := func(x float64) float64 {
		var l float64
		var err error
		if g.film {
			l, err = g.law(0, x)
		} else {
			l, err = g.law(x, 0)
		}
		if err != nil {
			return math.NaN()
		}
		return l
	}
	// The gap as a permeance beside the core's: of it the part of the plain
	// formula is the area's, the rest is fringing at the edge, which stays.
	x := 1 / (1/at(length) - 1/g.closed)
	plain := g.plain / length
	if g.film {
		plain /= 2
	}
	x += math.Min(plain, x) * (area - 1)
	return 1 / (core + 1/x)
}

// build puts a converter together. cold leaves the warmth out.
func (m *Model) build(u []float64, cold bool) Build {
	warmth := 0.0
	if !cold {
		warmth = (u[m.warm] + 1) / 2
	}
	d := m.design
	np, ns := m.primary, m.secondary
	open := m.inductance(&m.transformer, u) + warmth*m.transformer.hot
	shift := (open - m.transformer.nominal) / (np * np)
	leak := m.value(m.leakage, u)
	at := func(i int) float64 { return m.common + shift + leak*m.leak[i] }
	two := part.TwoPort{Lp: np * np * at(0), Ls: ns * ns * at(1), M: np * ns * at(2)}
	two.Lsc = two.Lp - two.M*two.M/two.Ls
	e := two.Equivalent(d.Job.Tank.StrayInductance)
	b := Build{Open: two.Lp, Short: two.Lsc, Lm: e.Lm, Ratio: e.Ratio, Lr: e.Lleak}
	if m.inductor != nil {
		b.External = m.inductance(m.inductor, u) + warmth*m.inductor.hot
		b.Lr += b.External
	}
	cr := d.AsBuilt.Cr * m.value(m.capacitor, u)
	b.Resonance = 1 / (2 * math.Pi * math.Sqrt(b.Lr*cr))
	for k, c := range d.Job.Corners {
		t := m.tanks[k]
		t.Lr, t.Lm, t.TurnsRatio, t.Cr = b.Lr, b.Lm, b.Ratio, cr
		t.DeadTime *= m.value(m.deadTime, u)
		t.NodeCapacitance *= m.value(m.node, u)
		t.WindingCapacitance *= math.Max(m.value(m.winding, u), 0)
		b.Corners = append(b.Corners, corner(t, c))
	}
	return b
}

// corner solves one corner. A build that is no tank at all misses it.
func corner(t tank.Tank, c tank.Corner) Corner {
	none := math.NaN()
	x := Corner{Status: tank.NoSolution, Frequency: none, GainMargin: none, PeakMargin: none, SoftMargin: none, EndCurrent: none}
	o, err := tank.Solve(t, c)
	if err != nil {
		return x
	}
	x.Status = o.Status
	switch o.Status {
	case tank.OK:
		x.Frequency = o.Frequency
		if c.OutputVoltage > 0 {
			x.GainMargin = o.PeakGainMargin
			if o.FrequencyOfPeakGain > t.FrequencyMin*(1+1e-6) {
				x.PeakMargin = o.Frequency/o.FrequencyOfPeakGain - 1
			}
		}
		if s := o.SoftSwitching; s != nil {
			x.EndCurrent = s.EndCurrent
			x.SoftMargin = 1 - s.SwingTime/t.DeadTime
			if !s.Complete {
				x.SoftMargin = -s.VoltageLeft / c.InputVoltage
			}
		}
	case tank.BeyondPeakGain:
		x.GainMargin = o.PeakGainMargin
	case tank.BelowRange:
		// Still rising at the end of the range: that end is the most it gives.
		end := tank.Corner{Name: c.Name, InputVoltage: c.InputVoltage, LoadResistance: o.LoadResistance, Frequency: t.FrequencyMin}
		if o, err := tank.Solve(t, end); err == nil && o.Status == tank.OK {
			x.GainMargin = o.OutputVoltage/c.OutputVoltage - 1
		}
	}
	return x
}

// A Miss is a limit that a build does not keep at a corner.
type Miss struct {
	Corner string
	Limit  string // key of the job, or "reached", "swing_complete", "node_held"
}

// works returns what keeps a build from working at all: a corner that is not
// reached within the range of frequencies, a swing that does not complete.
func (m *Model) works(b *Build) []Miss {
	var list []Miss
	for k, c := range b.Corners {
		name := m.design.Job.Corners[k].Name
		switch {
		case c.Status != tank.OK:
			list = append(list, Miss{name, "reached"})
		case c.SoftMargin <= 0 && c.EndCurrent <= 0:
			// The current turned before the dead time ended.
			list = append(list, Miss{name, "node_held"})
		case c.SoftMargin <= 0:
			list = append(list, Miss{name, "swing_complete"})
		}
	}
	return list
}

// keeps returns the limits of the job, with their reserves, that a build misses.
func (m *Model) keeps(b *Build) []Miss {
	l := m.design.Job.Build.Limits
	var list []Miss
	for k, c := range b.Corners {
		name := m.design.Job.Corners[k].Name
		if c.Status != tank.OK {
			list = append(list, Miss{name, "reached"})
			continue
		}
		if c.GainMargin < l.GainMargin {
			list = append(list, Miss{name, "gain_margin"})
		}
		if c.PeakMargin < l.PeakFrequencyMargin {
			list = append(list, Miss{name, "peak_frequency_margin"})
		}
		if c.SoftMargin < l.SoftSwitchingMargin {
			list = append(list, Miss{name, "soft_switching_margin"})
		}
	}
	return list
}
