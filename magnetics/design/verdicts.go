package design

import (
	"math"

	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/tank"
)

// partVerdicts holds the limits that both parts share against a rating.
func partVerdicts(r *part.Rating, limits job.PartLimits) []part.Verdict {
	var list []part.Verdict
	add := func(corner, limit string, value, bound float64, unit, sense string) {
		list = append(list, part.NewVerdict(r.Part, corner, limit, value, bound, unit, sense))
	}
	l := limits.Limits
	for _, c := range r.Corners {
		if !c.Continuous {
			continue
		}
		add(c.Name, "winding_temperature", c.WindingTemperature, l.WindingTemperature, "degC", "max")
		add(c.Name, "core_temperature", c.CoreTemperature, l.CoreTemperature, "degC", "max")
	}
	bs := r.Ferrite.Bsat(l.CoreTemperature)
	add("", "flux_share", r.FluxDensityPeak/bs, l.FluxShare, "", "max")
	add("", "overload_flux_share", r.OverloadFlux/bs, l.OverloadFluxShare, "", "max")
	if r.Gap.Length > 0 {
		total := r.Gap.Length
		add("", "length_min", total, limits.Gap.LengthMin, "m", "min")
		add("", "length_max", r.Gap.PieceLength, r.Gap.LengthMax, "m", "max")
	}
	add("", "height_left_min", r.HeightLeft, limits.Wires.HeightLeftMin, "m", "min")
	for _, m := range r.Section.Misfits {
		add("", "layer_breadth", m.Value, m.Room, "m", "max")
	}
	if l.Height != nil {
		add("", "height", r.Outline[2], *l.Height, "m", "max")
	}
	if l.Footprint != nil {
		add("", "footprint", math.Max(r.Outline[0], r.Outline[1]), math.Max(l.Footprint[0], l.Footprint[1]), "m", "max")
		add("", "footprint", math.Min(r.Outline[0], r.Outline[1]), math.Min(l.Footprint[0], l.Footprint[1]), "m", "max")
	}
	if l.Mass != nil {
		add("", "mass", r.Mass, *l.Mass, "kg", "max")
	}
	return list
}

// transformerVerdicts holds every limit of the transformer against its rating.
func (s *search) transformerVerdicts(r *part.Rating, gap part.GapKind) []part.Verdict {
	list := partVerdicts(r, s.transformerLimits)
	l := s.transformerLimits.Limits
	e := equivalent(r, s.job.Tank.StrayInductance)
	list = append(list, part.NewVerdict("transformer", "", "ratio_error", math.Abs(e.Ratio/s.job.Tank.TurnsRatio-1), l.RatioError, "", "max"))
	if s.job.Tank.Lm > 0 {
		list = append(list, part.NewVerdict("transformer", "", "magnetizing_error", math.Abs(e.Lm/s.job.Tank.Lm-1), s.magnetizingError(gap), "", "max"))
	}
	if len(r.ShortHalves) == 2 {
		mismatch := math.Abs(r.ShortHalves[0]-r.ShortHalves[1]) / r.ShortInductance
		list = append(list, part.NewVerdict("transformer", "", "half_mismatch", mismatch, l.HalfMismatch, "", "max"))
	}
	if !s.leakage {
		// What is left for the inductor must be positive.
		list = append(list, part.NewVerdict("transformer", "", "leakage", e.Lleak, s.job.Tank.Lr, "H", "max"))
	}
	return list
}

// filmError is the magnetizing error allowed with films of the stock where the
// job does not state one.
const filmError = 0.05

func (s *search) magnetizingError(gap part.GapKind) float64 {
	stated := s.job.IsSet("build.limits.magnetizing_error") || s.job.IsSet("build.transformer.limits.magnetizing_error")
	if gap == part.Spacer && !stated {
		return filmError
	}
	return s.transformerLimits.Limits.MagnetizingError
}

// meetsVerdicts hold the inductances that the shop must meet against the rating,
// so that a part edited by hand shows.
func meetsVerdicts(d *Design) []part.Verdict {
	var list []part.Verdict
	add := func(name, limit string, want *part.Requirement, value float64) {
		if want != nil && want.Value > 0 {
			list = append(list, part.NewVerdict(name, "", limit, math.Abs(value/want.Value-1), want.Tolerance, "", "max"))
		}
	}
	add("transformer", "open_inductance", d.Transformer.OpenInductance, d.Rating.OpenInductance)
	add("transformer", "short_inductance", d.Transformer.ShortInductance, d.Rating.ShortInductance)
	if d.Inductor != nil {
		add("inductor", "inductance", d.Inductor.Inductance, d.InductorRating.OpenInductance)
	}
	return list
}

// setMeets writes what the shop must meet into the parts.
func (s *search) setMeets(d *Design) {
	t := s.job.Build.Tolerances
	round := func(x float64) float64 {
		// Four digits, as on the sheet.
		scale := math.Pow(10, 3-math.Floor(math.Log10(x)))
		return math.Round(x*scale) / scale
	}
	require := func(c part.Construction, value float64, tolerance [2]float64) *part.Requirement {
		if !(value > 0) {
			return nil
		}
		// One figure for both sides: the narrower.
		r := &part.Requirement{Value: round(value), Tolerance: math.Min(tolerance[0], tolerance[1])}
		if w := c.Windings[0]; len(w.Start) > 0 && len(w.Finish) > 0 {
			r.Pins = []string{w.Start[0], w.Finish[0]}
		}
		return r
	}
	short := t.ShortInductance.Concentric
	switch d.Rating.Arrangement {
	case "sections":
		short = t.ShortInductance.Sections
	case "P-S", "S-P":
	default:
		short = t.ShortInductance.Sandwich
	}
	c := d.Transformer.Construction
	d.Transformer.OpenInductance = require(c, d.Rating.OpenInductance, t.OpenInductance)
	if c.Core.Gap.Kind == part.Closed {
		// Without a gap the permeability decides.
		d.Transformer.OpenInductance = require(c, d.Rating.OpenInductance, t.Permeability)
	}
	d.Transformer.ShortInductance = require(c, d.Rating.ShortInductance, short)
	if d.Inductor != nil {
		d.Inductor.Inductance = require(d.Inductor.Construction, d.InductorRating.OpenInductance, t.InductorInductance)
	}
}

// equivalent closes the rated two-port with the stray inductance.
func equivalent(r *part.Rating, stray float64) part.Equivalent {
	p := part.TwoPort{Lp: r.OpenInductance, Ls: r.SecondaryInductance, Lsc: r.ShortInductance}
	p.M = math.Sqrt(math.Max(0, (p.Lp-p.Lsc)*p.Ls))
	return p.Equivalent(stray)
}

// tankVerdicts holds the limits of the tank as built against its operations.
func (s *search) tankVerdicts(built tank.Tank, operations []tank.Operation) []part.Verdict {
	var list []part.Verdict
	l := s.job.Build.Limits
	add := func(corner, limit string, value, bound float64, unit, sense string) {
		list = append(list, part.NewVerdict("tank", corner, limit, value, bound, unit, sense))
	}
	add("", "resonance_error", math.Abs(built.Lr/s.job.Tank.Lr-1), l.ResonanceError, "", "max")
	for _, o := range operations {
		reached := 0.0
		if o.Status == tank.OK {
			reached = 1
		}
		add(o.Corner.Name, "reached", reached, 1, "", "min")
		if o.Status != tank.OK {
			continue
		}
		if o.Corner.OutputVoltage > 0 {
			add(o.Corner.Name, "gain_margin", o.PeakGainMargin, l.GainMargin, "", "min")
			// A peak at the very end of the range is none: the output still rises there.
			if o.FrequencyOfPeakGain > built.FrequencyMin*(1+1e-6) {
				add(o.Corner.Name, "peak_frequency_margin", o.Frequency/o.FrequencyOfPeakGain-1, l.PeakFrequencyMargin, "", "min")
			}
		}
		if z := o.SoftSwitching; z != nil {
			add(o.Corner.Name, "soft_switching_margin", softMargin(o, built.DeadTime), l.SoftSwitchingMargin, "", "min")
		}
	}
	return list
}

// softMargin is the part of the dead time that is left when the swing is
// complete; when it is not, minus the part of the input voltage that is left.
func softMargin(o tank.Operation, deadTime float64) float64 {
	if o.SoftSwitching.Complete {
		return 1 - o.SoftSwitching.SwingTime/deadTime
	}
	return -o.SoftSwitching.VoltageLeft / o.Corner.InputVoltage
}
