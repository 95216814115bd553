package design

import (
	"fmt"
	"math"

	"gapwright/corelib/insulation"
	"gapwright/corelib/quantity"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/gap"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/tank"
)

// warnings gathers what the reader should know.
func (s *search) warnings(d *Design) {
	seen := map[part.Warning]bool{}
	add := func(code, format string, args ...any) {
		w := part.Warning{Code: code, Text: fmt.Sprintf(format, args...)}
		if !seen[w] {
			seen[w] = true
			d.Warnings = append(d.Warnings, w)
		}
	}
	for _, o := range d.Operations {
		for _, w := range o.Warnings {
			add(w.Code, "%s", w.Text)
		}
	}
	highest := 0.0
	for _, c := range s.job.Corners {
		highest = math.Max(highest, c.InputVoltage)
	}
	in := s.transformerLimits.Insulation
	if in.Grade == "" && highest > highInput {
		add("W501", "no insulation grade is stated and %s is applied: NOT DESIGNED FOR ISOLATION", quantity.Format(highest, quantity.Volt))
	}
	if in.Grade != "" && in.Grade != "functional" && in.Build != "margins" && in.InsulatedWinding == in.CoreCountsAs {
		add("W504", "transformer: the core counts as %s and so does the winding with its own insulation: the other one needs the whole distance to the core", in.CoreCountsAs)
	}
	for _, p := range s.proposals {
		add("W502", "%.1f mm between primary and secondary is a proposal of the table, not your figure", p.Distance*1e3)
		for _, text := range p.Assumptions {
			add("W502", "%s", text)
		}
	}
	if in.Grade != "" && in.Grade != "functional" {
		add("W503", "%s", insulation.AboveFrequencyLimit)
	}
	if s.transformerLimits.Limits.CurrentLimit == nil {
		add("W310", "no current limit is given: both cores are held against 1.5 times the largest steady peak current")
	}
	for _, x := range []struct {
		r      *part.Rating
		c      *part.Construction
		limits job.PartLimits
	}{{d.Rating, constructionOf(d.Transformer), s.transformerLimits}, {d.InductorRating, inductorOf(d.Inductor), s.inductorLimits}} {
		if x.r == nil {
			continue
		}
		r, name := x.r, x.r.Part
		if !r.Shape.Proven() {
			add("W201", "%s: %s, %s", name, r.Shape.Name, shape.NotProven)
		}
		if r.Former.Derived {
			add("W203", "%s: the coil former of %s comes from a rule, not from a published one (%s)", name, r.Shape.Name, r.Former.Band)
		}
		for _, w := range r.Warnings {
			add(w.Code, "%s: %s", name, w.Text)
		}
		if g := x.c.Core.Gap; g.Kind == part.Ground && g.Pieces > 1 {
			add("W320", "%s: the gap is cut into %d pieces of %.2f mm: each piece beyond the first costs a gapped half or a disc", name, g.Pieces, r.Gap.PieceLength*1e3)
		}
		if r.Gap.Length > 0 && r.Gap.Length < x.limits.Gap.LengthMin {
			add("W301", "%s: a gap of %.3f mm is shorter than can be made to a tolerance", name, r.Gap.Length*1e3)
		}
		if r.Gap.PieceLength > r.Gap.LengthMax {
			add("W302", "%s: a gap piece of %.2f mm is longer than %.2f mm; more pieces would lose less", name, r.Gap.PieceLength*1e3, r.Gap.LengthMax*1e3)
		}
		for _, w := range r.Windings {
			if limit := x.limits.Limits.CurrentDensity; w.CurrentDensity > limit {
				add("W430", "%s: winding %s carries %.1f A/mm² (limit %.1f); loss and temperature decide", name, w.Name, w.CurrentDensity*1e-6, limit*1e-6)
			}
			if limit := x.limits.Limits.CopperACFactor; limit != nil && w.ACFactor > *limit {
				add("W431", "%s: winding %s has R_ac/R_dc %.2f (limit %.2f)", name, w.Name, w.ACFactor, *limit)
			}
		}
		for _, e := range x.c.Build {
			if e.Layers > 1 && e.Wire.Kind != wire.Foil && e.Turns%e.Layers != 0 {
				per := (e.Turns + e.Layers - 1) / e.Layers
				if last := e.Turns - (e.Layers-1)*per; 2*last <= per {
					add("W402", "%s: the last layer of %s holds %d of %d turns: spread it over the breadth", name, e.Names[0], last, per)
				}
			}
		}
		for _, w := range x.c.Windings {
			if len(w.Start) > 0 && isLead(w.Start[0]) {
				add("W450", "%s: winding %s leaves on flying leads instead of pins", name, w.Name)
			}
		}
		if x.c.Impregnation.Kind != "none" && x.c.Impregnation.Kind != "" {
			add("W620", "%s: impregnation moves the inductance: measure before and after", name)
		}
	}
}

func constructionOf(t *part.Transformer) *part.Construction { return &t.Construction }

func inductorOf(l *part.Inductor) *part.Construction {
	if l == nil {
		return nil
	}
	return &l.Construction
}

// handChecks puts the figures that an engineer computes on paper beside the
// model's.
func (s *search) handChecks(d *Design) {
	add := func(r *part.Rating, c part.HandCheck) {
		if math.IsNaN(c.Hand) || math.IsInf(c.Hand, 0) || math.IsNaN(c.Model) || math.IsInf(c.Model, 0) {
			return
		}
		if c.Model != 0 && math.Abs(c.Hand/c.Model-1) <= c.Expect {
			c.Note = ""
		}
		r.Checks = append(r.Checks, c)
	}
	// The corner of the largest flux, as built.
	var worst *tank.Operation
	for i := range d.Operations {
		o := &d.Operations[i]
		if o.Status == tank.OK && (worst == nil || o.FluxLinkagePeak > worst.FluxLinkagePeak) {
			worst = o
		}
	}
	if worst == nil {
		return
	}
	o, t, r := worst, d.AsBuilt, d.Rating
	kv, kd, ki := rectifierConstants(t.Rectifier)
	e := t.TurnsRatio * (kv*o.OutputVoltage + kd*t.RectifierDrop)
	np, ns := float64(d.Transformer.Windings[0].Turns), float64(d.Transformer.Windings[1].Turns)
	add(r, part.HandCheck{
		Quantity: "flux density, corner " + o.Corner.Name, Formula: "B = E/(4 f n Ns Amin)", Hand: e / (4 * o.Frequency * t.TurnsRatio * ns * r.Shape.Amin), Model: r.FluxDensityPeak, Unit: "T",
		Expect: 0.1, Note: "the winding is not clamped for the whole half period here, or the leakage adds flux under the primary",
	})
	im := e / (4 * t.Magnetizing() * o.Frequency)
	add(r, part.HandCheck{
		Quantity: "magnetizing peak current, corner " + o.Corner.Name, Formula: "Im = E/(4 Lm f)", Hand: im, Model: o.Magnetizing.Peak, Unit: "A",
		Expect: 0.1, Note: "below resonance the winding is clamped only for a part of the half period",
	})
	if near := nearResonance(d); near != nil {
		e := t.TurnsRatio * (kv*near.OutputVoltage + kd*t.RectifierDrop)
		im := e / (4 * t.Magnetizing() * near.Frequency)
		hand := math.Hypot(math.Pi/(2*math.Sqrt2)*near.OutputCurrent/(ki*t.TurnsRatio), im/math.Sqrt2)
		add(r, part.HandCheck{
			Quantity: "resonant rms current, corner " + near.Corner.Name, Formula: "sqrt((pi/(2 sqrt 2) Io/(ki n))² + Im²/2)", Hand: hand, Model: near.Resonant.RMS, Unit: "A",
			Expect: 0.1, Note: "the formula holds at resonance; this corner is away from it",
		})
	}
	if r.Gap.Length > 0 {
		add(r, part.HandCheck{
			Quantity: "gap without fringing", Formula: "mu0 Np² Ae/Lp - le/mu_i", Hand: r.Gap.PlainLength, Model: r.Gap.Length, Unit: "m",
			Expect: 0.3, Note: gapNote(r),
		})
		add(r, part.HandCheck{
			Quantity: "gap with McLyman's fringing factor", Formula: "F = 1 + (g/sqrt Ae) ln(2 G/g)", Hand: r.Gap.McLymanLength, Model: r.Gap.Length, Unit: "m",
			Expect: 0.06, Note: gapNote(r),
		})
	}
	leak := s.leakageByHand(d.Transformer, r)
	add(r, part.HandCheck{
		Quantity: "short-circuit inductance", Formula: "mu0 Np² MLT/breadth (sum h/3 + spaces)", Hand: leak, Model: r.ShortInductance, Unit: "H",
		Expect: 0.25, Note: "one-dimensional: margins, unequal breadths, the heads and windings side by side are not in it",
	})
	add(r, part.HandCheck{
		Quantity: "effective turns ratio", Formula: "(Np/Ns) sqrt(1 - Lsc/Lp)", Hand: np / ns * math.Sqrt(1-r.ShortInductance/r.OpenInductance), Model: r.EffectiveTurnsRatio, Unit: "",
		Expect: 0.005, Note: "the windings do not have the same inductance per turn squared",
	})
	for _, x := range []*part.Rating{r, d.InductorRating} {
		if x == nil {
			continue
		}
		for _, w := range x.Windings {
			hand := rho20 * float64(w.Turns) * w.MeanLengthOfTurn / w.ConductorArea
			add(x, part.HandCheck{
				Quantity: "DC resistance of " + w.Name, Formula: "rho N MLT/A, 20 °C", Hand: hand, Model: w.DCResistance, Unit: "ohm",
				Expect: 0.07, Note: "litz strands are longer than the bundle",
			})
		}
	}
	if l := d.InductorRating; l != nil {
		n := float64(d.Inductor.Windings[0].Turns)
		peak := 0.0
		for _, o := range d.Operations {
			if o.Status == tank.OK {
				peak = math.Max(peak, o.Resonant.Peak)
			}
		}
		add(l, part.HandCheck{
			Quantity: "flux density of the inductor", Formula: "B = L Ipk/(N Amin)", Hand: l.OpenInductance * peak / (n * l.Shape.Amin), Model: l.FluxDensityPeak, Unit: "T",
			Expect: 0.01, Note: "the same formula",
		})
		add(l, part.HandCheck{
			Quantity: "gap without fringing", Formula: "mu0 N² Ae/L - le/mu_i", Hand: l.Gap.PlainLength, Model: l.Gap.Length, Unit: "m",
			Expect: 0.3, Note: gapNote(l),
		})
		add(l, part.HandCheck{
			Quantity: "gap with McLyman's fringing factor", Formula: "F = 1 + (g/sqrt Ae) ln(2 G/g)", Hand: l.Gap.McLymanLength, Model: l.Gap.Length, Unit: "m",
			Expect: 0.06, Note: gapNote(l),
		})
		b := l.OpenInductance * peak / (n * l.Shape.Ae)
		add(l, part.HandCheck{
			Quantity: "energy in the gap", Formula: "B²/(2 mu0) Ae g against L Ipk²/2", Hand: b * b / (2 * quantity.Mu0) * l.Shape.Ae * l.Gap.Length, Model: l.OpenInductance * peak * peak / 2, Unit: "J",
			Expect: 0.3, Note: "fringing flux and the core hold the rest; the gap is longer than without fringing",
		})
	}
	d.Checks = append(d.Checks, r.Checks...)
	if d.InductorRating != nil {
		d.Checks = append(d.Checks, d.InductorRating.Checks...)
	}
	seen := map[part.Model]bool{}
	for _, x := range []*part.Rating{d.Rating, d.InductorRating} {
		if x == nil {
			continue
		}
		for _, m := range x.Models {
			if !seen[m] {
				seen[m] = true
				d.Models = append(d.Models, m)
			}
		}
	}
	d.Models = append(d.Models, part.Model{
		Quantity: "tank", Model: "exact periodic steady state, event-driven pieces, Newton", Source: "own derivation; checked against ngspice",
	})
	_ = gap.AL
}

// gapNote says why a gap by hand and that of the field differ.
func gapNote(r *part.Rating) string {
	post := r.Shape.PostArea()
	if math.Abs(post/r.Shape.Ae-1) > 0.03 {
		return fmt.Sprintf("the formula takes Ae, %.0f mm²; the field crosses the gap from a post of %.0f mm², with fringing", 1e6*r.Shape.Ae, 1e6*post)
	}
	return "fringing makes the real gap longer than without; McLyman's factor knows neither the winding nor the shape of the post"
}

// rho20 is the resistivity of copper at 20 °C, ohm m (IEC 60028).
const rho20 = 1 / 58e6

// rectifierConstants are kv, kd, ki of E = n (kv Vout + kd Vd) and Iout = ki n <|i - m|>.
func rectifierConstants(r tank.Rectifier) (kv, kd, ki float64) {
	switch r {
	case tank.FullBridgeRectifier:
		return 1, 2, 1
	case tank.VoltageDoubler:
		return 0.5, 1, 0.5
	}
	return 1, 1, 1
}

// nearResonance returns the corner nearest to the series resonance, within 10 %.
func nearResonance(d *Design) *tank.Operation {
	fr := 1 / (2 * math.Pi * math.Sqrt(d.AsBuilt.Lr*d.AsBuilt.Cr))
	var best *tank.Operation
	for i := range d.Operations {
		o := &d.Operations[i]
		if o.Status == tank.OK && math.Abs(o.Frequency/fr-1) < 0.1 && (best == nil || math.Abs(o.Frequency-fr) < math.Abs(best.Frequency-fr)) {
			best = o
		}
	}
	return best
}
