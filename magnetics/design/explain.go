package design

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"runtime"
	"slices"
	"strings"

	"golang.org/x/sync/errgroup"

	"gapwright/corelib/table"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
	"gapwright/tank"
)

// An Explanation says where a figure of a design comes from.
type Explanation struct {
	Quantity string // its name
	What     string // in words
	Corner   string // empty: of no corner
	Value    float64
	Unit     string // SI; empty: a plain number
	Formula  string
	Model    string // that the formula stands for here
	Source   string
	Inputs   []Input
	Effects  []Effect
}

// An Input is what a figure was computed from.
type Input struct {
	Name   string
	Value  float64
	Unit   string
	Origin string // job, default, build file, a table row with its source, computed
}

// An Effect is what a small change of one input does to the figure, everything
// computed again: parts, tank, losses, heat.
type Effect struct {
	Input  string
	Step   string  // "+1 %", "+1 K"
	Change float64 // of the figure: relative, or absolute when the figure is 0 or a temperature
	Unit   string  // of an absolute change
}

// UnknownQuantityError names the quantities that are nearest to a wrong name.
type UnknownQuantityError struct {
	Name    string
	Nearest []string
}

func (e *UnknownQuantityError) Error() string {
	return fmt.Sprintf("no quantity is called %q; nearest: %s", e.Name, strings.Join(e.Nearest, ", "))
}

// figure is a quantity that can be explained.
type figure struct {
	name, what, unit string
	formula          string
	model            string // quantity of the Models that says how
	inputs           string // names of inputs, blank between
	corner           bool
	temperature      bool
	value            func(d *Design, k int) (float64, bool) // k: corner
}

func ratingOf(d *Design, name string) *part.Rating {
	if name == job.Inductor {
		return d.InductorRating
	}
	return d.Rating
}

// figures lists every quantity, in the order of the report.
func figures() []figure {
	var list []figure
	for _, name := range []string{job.Transformer, job.Inductor} {
		whole := func(key, what, unit, formula, model, inputs string, value func(r *part.Rating) float64) {
			list = append(list, figure{name: name + "." + key, what: what, unit: unit, formula: formula, model: model, inputs: inputs,
				value: func(d *Design, _ int) (float64, bool) {
					r := ratingOf(d, name)
					if r == nil {
						return 0, false
					}
					return value(r), true
				}})
		}
		corner := func(key, what, unit, formula, model, inputs string, value func(c *part.CornerRating) (float64, bool)) {
			list = append(list, figure{name: name + "." + key, what: what, unit: unit, formula: formula, model: model, inputs: inputs, corner: true, temperature: unit == "degC",
				value: func(d *Design, k int) (float64, bool) {
					r := ratingOf(d, name)
					if r == nil {
						return 0, false
					}
					for i := range r.Corners {
						if r.Corners[i].Name == d.Job.Corners[k].Name {
							return value(&r.Corners[i])
						}
					}
					return 0, false
				}})
		}
		always := func(f func(c *part.CornerRating) float64) func(c *part.CornerRating) (float64, bool) {
			return func(c *part.CornerRating) (float64, bool) { return f(c), true }
		}
		inductances := name + ".turns " + name + ".gap " + name + ".core " + name + ".permeability " + name + ".wire"
		if name == job.Transformer {
			whole("open_inductance", "inductance of the primary, all others open, 25 degC", "H", "Lp = Np² / (R_gap + R_core), R_gap from the field with its fringing; by hand mu0 Np² Ae/(g + le/mu_i)", "inductances", inductances,
				func(r *part.Rating) float64 { return r.OpenInductance })
			whole("secondary_open_inductance", "inductance of one secondary, all others open", "H", "Ls = Ns² times the permeance that the secondary sees: outside the primary it links the window's flux too", "inductances", inductances,
				func(r *part.Rating) float64 { return r.SecondaryInductance })
			whole("short_inductance", "inductance of the primary with one secondary shorted, mean of the halves", "H", "Lsc = Lp - M²/Ls; by hand mu0 Np² MLT/b (sum h/3 + spaces)", "inductances", inductances,
				func(r *part.Rating) float64 { return r.ShortInductance })
			whole("magnetizing_inductance", "magnetizing inductance of the tank's equivalent, all leakage on the primary", "H", "Lm = M²/Ls = Lp - Lsc", "inductances", inductances,
				func(r *part.Rating) float64 { return r.MagnetizingInduct })
			whole("effective_turns_ratio", "turns ratio that the tank sees", "", "n = M/Ls = sqrt((Lp - Lsc)/Ls)", "inductances", inductances,
				func(r *part.Rating) float64 { return r.EffectiveTurnsRatio })
		} else {
			whole("inductance", "inductance at 25 degC", "H", "L = N² / (R_gap + R_core), R_gap from the field with its fringing; by hand mu0 N² Ae/(g + le/mu_i)", "inductances", inductances,
				func(r *part.Rating) float64 { return r.OpenInductance })
		}
		whole("flux_density_peak", "largest flux density over the smallest section", "T", fluxFormula(name), "tank", name+".turns "+name+".core tank.voltage",
			func(r *part.Rating) float64 { return r.FluxDensityPeak })
		whole("flux_density_overload", "flux density at the current limit", "T", fluxFormula(name)+", at the peak current where the controller trips", "tank", name+".turns "+name+".core job.current_limit",
			func(r *part.Rating) float64 { return r.OverloadFlux })
		whole("height_left", "window height left, bulge included", "m", "available height - sum over layers of outer diameter (1 + bulge) - tape", "", name+".wire "+name+".core",
			func(r *part.Rating) float64 { return r.HeightLeft })
		whole("mass", "mass of core, copper and former", "kg", "ferrite volume from the dimensions, copper of the turns, former estimated", "", name+".core "+name+".wire",
			func(r *part.Rating) float64 { return r.Mass })
		losses := name + ".turns " + name + ".gap " + name + ".core " + name + ".wire tank.voltage job.ambient_temperature"
		corner("core_loss", "core loss", "W", "Pv(B(t), T) Ve, iGSE over the flux waveform, mean of under-primary and under-secondary", "core loss", losses, always(func(c *part.CornerRating) float64 { return c.CoreLoss }))
		corner("winding_loss", "loss of all windings", "W", "sum over layers and harmonics of R_dc F |I_k|²/2 + rho G(d/delta_k) <|H_k|²> n length", "winding loss", losses,
			always(func(c *part.CornerRating) float64 { return c.PrimaryLoss + c.SecondaryLoss }))
		hot := func(f func(c *part.CornerRating) float64) func(c *part.CornerRating) (float64, bool) {
			return func(c *part.CornerRating) (float64, bool) { return f(c), c.Continuous }
		}
		corner("core_temperature", "core temperature", "degC", "two nodes: core loss + heat from the winding = convection + radiation of the core's faces", "temperatures", losses, hot(func(c *part.CornerRating) float64 { return c.CoreTemperature }))
		corner("winding_temperature", "hot spot of the winding", "degC", "two nodes: winding loss = convection + radiation of the heads + heat to the core; plus the hot-spot allowance", "temperatures", losses,
			hot(func(c *part.CornerRating) float64 { return c.WindingTemperature }))
	}
	built := func(key, what, unit, formula, inputs string, value func(t tank.Tank) float64) {
		list = append(list, figure{name: "tank." + key, what: what, unit: unit, formula: formula, model: "inductances", inputs: inputs,
			value: func(d *Design, _ int) (float64, bool) { return value(d.AsBuilt), true }})
	}
	both := "transformer.turns transformer.gap inductor.turns inductor.gap"
	built("resonant_inductance", "resonant inductance as built", "H", "Lr = Lext + Lp - Lm", both, func(t tank.Tank) float64 { return t.Lr })
	built("magnetizing_inductance", "magnetizing inductance as built, stray loops included", "H", "Lm = M²/(Ls + L_stray)", both, func(t tank.Tank) float64 { return t.Lm })
	built("turns_ratio", "effective turns ratio as built, stray loops included", "", "n = M/(Ls + L_stray)", both, func(t tank.Tank) float64 { return t.TurnsRatio })
	state := func(key, what, unit, formula string, value func(o *tank.Operation) (float64, bool)) {
		list = append(list, figure{name: "tank." + key, what: what, unit: unit, formula: formula, model: "tank", inputs: "tank.lr tank.cr tank.lm tank.n tank.voltage tank.load", corner: true,
			value: func(d *Design, k int) (float64, bool) {
				if o := &d.Operations[k]; o.Status == tank.OK {
					return value(o)
				}
				return 0, false
			}})
	}
	plain := func(f func(o *tank.Operation) float64) func(o *tank.Operation) (float64, bool) {
		return func(o *tank.Operation) (float64, bool) { return f(o), true }
	}
	state("frequency", "operating frequency", "Hz", "the first frequency, from frequency_max down, at which the exact output is the wanted one", plain(func(o *tank.Operation) float64 { return o.Frequency }))
	state("resonant_current", "rms current of Lr and Cr", "A", "exact periodic state; at resonance sqrt((pi/(2 sqrt 2) Io/(ki n))² + Im²/2)", plain(func(o *tank.Operation) float64 { return o.Resonant.RMS }))
	state("resonant_current_peak", "peak current of Lr and Cr", "A", "exact periodic state", plain(func(o *tank.Operation) float64 { return o.Resonant.Peak }))
	state("magnetizing_current_peak", "peak current of Lm", "A", "exact periodic state; above resonance E/(4 Lm f)", plain(func(o *tank.Operation) float64 { return o.Magnetizing.Peak }))
	state("turn_off_current", "current when the bridge switches", "A", "exact periodic state at the edge; above 0 it helps the swing", plain(func(o *tank.Operation) float64 { return o.TurnOffCurrent }))
	state("peak_gain_margin", "peak output over the wanted output, same load resistance, less 1", "", "largest exact output over frequency_min..frequency_max, over the wanted one, minus 1",
		func(o *tank.Operation) (float64, bool) { return o.PeakGainMargin, o.Corner.OutputVoltage > 0 })
	state("swing_time", "time from turn-off until the node has reached the other rail", "s", "node capacitance moved by the exact current; by hand Vin C/I_off",
		func(o *tank.Operation) (float64, bool) {
			if o.SoftSwitching == nil || !o.SoftSwitching.Complete {
				return 0, false
			}
			return o.SoftSwitching.SwingTime, true
		})
	return append(list, figure{name: "total_loss", what: "loss of both parts, weighted by share", unit: "W", formula: "sum over corners of share times (core + windings)", model: "winding loss",
		inputs: "transformer.wire inductor.wire job.ambient_temperature", value: func(d *Design, _ int) (float64, bool) { return d.TotalLoss(), true }})
}

func fluxFormula(name string) string {
	if name == job.Inductor {
		return "B = L i/(N Amin), from the exact resonant current"
	}
	return "B = Lm m/(n Ns Amin) under the secondary, (Lleak i + Lm m)/(Np Amin) under the primary, the larger; by hand E/(4 f n Ns Amin)"
}

// Quantities lists the names that Explain knows for a design, with words.
func Quantities(d *Design) [][2]string {
	var list [][2]string
	for _, f := range figures() {
		for k := range d.Job.Corners {
			if _, ok := f.value(d, k); ok {
				list = append(list, [2]string{f.name, f.what})
				break
			}
		}
	}
	return list
}

// Explain says where the figure called name comes from, at a corner (empty: the
// first continuous one that has it), and what small changes do to it. The error
// is an *UnknownQuantityError for a wrong name.
func Explain(ctx context.Context, d *Design, name, corner string, tables Tables) (*Explanation, error) {
	all := figures()
	at := slices.IndexFunc(all, func(f figure) bool { return f.name == name })
	if at < 0 {
		var names []string
		for _, f := range all {
			names = append(names, f.name)
		}
		// A name without its first word will do when only one fits.
		var ends []string
		for _, n := range names {
			if strings.HasSuffix(n, "."+name) {
				ends = append(ends, n)
			}
		}
		if len(ends) == 0 {
			ends = table.Nearest(name, names, 3)
		}
		return nil, &UnknownQuantityError{name, ends}
	}
	f := all[at]
	k, err := cornerOf(d, f, corner)
	if err != nil {
		return nil, err
	}
	v, err := variants(ctx, d, tables)
	if err != nil {
		return nil, err
	}
	return explain(d, f, k, v), nil
}

// ExplainAll explains every figure that the design has, each at the first
// corner that has it, from one set of computations.
func ExplainAll(ctx context.Context, d *Design, tables Tables) ([]*Explanation, error) {
	v, err := variants(ctx, d, tables)
	if err != nil {
		return nil, err
	}
	var list []*Explanation
	for _, f := range figures() {
		if k, err := cornerOf(d, f, ""); err == nil {
			list = append(list, explain(d, f, k, v))
		}
	}
	return list, nil
}

func explain(d *Design, f figure, k int, v []*Design) *Explanation {
	value, _ := f.value(d, k)
	e := &Explanation{Quantity: f.name, What: f.what, Value: value, Unit: f.unit, Formula: f.formula}
	if f.corner {
		e.Corner = d.Job.Corners[k].Name
	}
	for _, m := range d.Models {
		if m.Quantity == f.model {
			e.Model, e.Source = m.Model, m.Source
			break
		}
	}
	for _, key := range strings.Fields(f.inputs) {
		e.Inputs = append(e.Inputs, inputsOf(d, key, k)...)
	}
	e.Effects = effects(d, f, k, value, v)
	return e
}

// cornerOf finds the corner to explain at.
func cornerOf(d *Design, f figure, corner string) (int, error) {
	first := -1
	for k, c := range d.Job.Corners {
		_, ok := f.value(d, k)
		if corner == c.Name {
			if !ok {
				return 0, fmt.Errorf("%s has no value at corner %s", f.name, corner)
			}
			return k, nil
		}
		if ok && (first < 0 || d.Job.Corners[first].Duration > 0 && c.Duration == 0) {
			first = k
		}
	}
	if corner != "" {
		return 0, fmt.Errorf("the job has no corner called %q", corner)
	}
	if first < 0 {
		return 0, fmt.Errorf("this design has no %s", f.name)
	}
	return first, nil
}

// inputsOf lists the inputs that a key stands for, with their origin.
func inputsOf(d *Design, key string, k int) []Input {
	origin := func(path string) string {
		if d.Job.IsSet(path) {
			return "job, " + path
		}
		return "default"
	}
	name, what, _ := strings.Cut(key, ".")
	switch name {
	case "tank":
		t, c := d.AsBuilt, d.Job.Corners[k]
		switch what {
		case "lr":
			return []Input{{"Lr", t.Lr, "H", "computed: tank.resonant_inductance"}}
		case "cr":
			return []Input{{"Cr", t.Cr, "F", "job, tank.resonant_capacitance"}}
		case "lm":
			return []Input{{"Lm", t.Magnetizing(), "H", "computed: tank.magnetizing_inductance"}}
		case "n":
			return []Input{{"n", t.TurnsRatio, "", "computed: tank.turns_ratio"}}
		case "voltage":
			list := []Input{{"Vin", c.InputVoltage, "V", "job, corner " + c.Name}}
			if c.OutputVoltage > 0 {
				list = append(list, Input{"Vout", c.OutputVoltage, "V", "job, corner " + c.Name})
			}
			return list
		case "load":
			return []Input{{"R load", d.Operations[k].LoadResistance, "ohm", "job, corner " + c.Name}}
		}
	case "job":
		if what == "ambient_temperature" {
			return []Input{{"ambient temperature", d.Job.Build.Surroundings.AmbientTemperature, "degC", origin("build.surroundings.ambient_temperature")}}
		}
		if limit := d.Job.Build.Limits.CurrentLimit; limit != nil {
			return []Input{{"current limit", *limit, "A", origin("build.limits.current_limit")}}
		}
		return nil
	}
	r := ratingOf(d, name)
	if r == nil {
		return nil
	}
	var c part.Construction
	if name == job.Inductor {
		c = d.Inductor.Construction
	} else {
		c = d.Transformer.Construction
	}
	const build = "build file"
	switch what {
	case "turns":
		var list []Input
		for _, w := range c.Windings {
			list = append(list, Input{"turns of " + w.Name, float64(w.Turns), "", build})
		}
		return list
	case "gap":
		if c.Core.Gap.Kind == part.Closed {
			return nil
		}
		return []Input{{"gap of the " + name, r.Gap.Length, "m", build}, {"pieces", float64(max(c.Core.Gap.Pieces, 1)), "", build}}
	case "core":
		row := fmt.Sprintf("core table, %s, %s (confidence %s)", r.Shape.Name, r.Shape.ParameterSource, r.Shape.Confidence)
		return []Input{{"Ae", r.Shape.Ae, "m2", row}, {"Amin", r.Shape.Amin, "m2", row}, {"le", r.Shape.Le, "m", row}, {"Ve", r.Shape.Ve, "m3", row},
			{"MLT", r.Former.MLT, "m", "former table, " + r.Former.Source}}
	case "permeability":
		source := "ferrite table"
		for _, f := range r.Ferrite.Figures {
			if f.Kind == "permeability" {
				source = fmt.Sprintf("ferrite table, %s, %s (%s)", r.Ferrite.Name, f.Source, f.Confidence)
				break
			}
		}
		return []Input{{"mu_i at 25 degC", r.Ferrite.MuI(25).Value, "", source}}
	case "wire":
		var list []Input
		for _, w := range r.Windings {
			list = append(list, Input{"R_dc of " + w.Name + ", " + w.Wire, w.DCResistance, "ohm", build})
		}
		return list
	}
	return nil
}

// A nudge changes one input a little.
type nudge struct {
	input, step string
	apply       func(x *variant)
}

// variant is a design about to be computed again.
type variant struct {
	job          job.Job
	t            part.Transformer
	l            *part.Inductor
	permeability float64
}

// percent is the step of relative nudges.
const percent = 0.01

// nudges lists what can be changed by a per cent; turns are whole.
func nudges(d *Design) []nudge {
	scale := func(x *float64) { *x *= 1 + percent }
	gap := func(g *part.Gap) {
		scale(&g.Total)
		scale(&g.Thickness)
	}
	list := []nudge{
		{"gap of the transformer", "+1 %", func(x *variant) { gap(&x.t.Core.Gap) }},
		{"gap of the inductor", "+1 %", func(x *variant) {
			if x.l != nil {
				gap(&x.l.Core.Gap)
			}
		}},
		{"permeability", "+1 %", func(x *variant) { x.permeability = 1 + percent }},
		{"diameter of wires and strands", "+1 %", func(x *variant) {
			for _, build := range x.builds() {
				for i := range build {
					scale(&build[i].Wire.Diameter)
					scale(&build[i].Wire.Thickness)
				}
			}
		}},
		{"thickness of the tape", "+1 %", func(x *variant) {
			for _, build := range x.builds() {
				for i := range build {
					if build[i].Kind == winding.Tape {
						scale(&build[i].Thickness)
					}
				}
			}
		}},
		{"spaces between the windings", "+1 %", func(x *variant) {
			for _, build := range x.builds() {
				for i := range build {
					scale(&build[i].Height)
				}
			}
		}},
		{"distance of the coils from the post", "+1 %", func(x *variant) {
			scale(&x.t.Former.Wall)
			if x.l != nil {
				scale(&x.l.Former.Wall)
			}
		}},
		{"Cr", "+1 %", func(x *variant) { scale(&x.job.Tank.Cr) }},
		{"input voltage of all corners", "+1 %", func(x *variant) { x.corners(func(c *tank.Corner) { scale(&c.InputVoltage) }) }},
		{"load of all corners", "+1 %", func(x *variant) {
			x.corners(func(c *tank.Corner) {
				scale(&c.OutputCurrent)
				scale(&c.OutputPower)
				c.LoadResistance /= 1 + percent
			})
		}},
		{"node capacitance", "+1 %", func(x *variant) { scale(&x.job.Tank.NodeCapacitance) }},
		{"ambient temperature", "+1 K", func(x *variant) { x.job.Build.Surroundings.AmbientTemperature++ }},
	}
	if d.Inductor == nil {
		list = slices.Delete(list, 1, 2)
	}
	return list
}

func (x *variant) builds() [][]winding.Entry {
	list := [][]winding.Entry{x.t.Build}
	if x.l != nil {
		list = append(list, x.l.Build)
	}
	return list
}

func (x *variant) corners(change func(c *tank.Corner)) {
	for i := range x.job.Corners {
		change(&x.job.Corners[i])
	}
}

// negligible is the change of a figure, relative to the nudge, below which an
// effect is not listed: it would print as nothing.
const negligible = 1e-3

// variants computes the whole design again, unchanged and for every nudge. A
// variant that cannot be computed is nil.
func variants(ctx context.Context, d *Design, tables Tables) ([]*Design, error) {
	list := nudges(d)
	results := make([]*Design, len(list)+1)
	g, ctx := errgroup.WithContext(ctx)
	g.SetLimit(runtime.GOMAXPROCS(0))
	for i := range results {
		g.Go(func() error {
			x := variant{job: d.Job, t: *d.Transformer, permeability: 1}
			x.job.Corners = slices.Clone(d.Job.Corners)
			x.t.Build = slices.Clone(d.Transformer.Build)
			if d.Inductor != nil {
				l := *d.Inductor
				l.Build = slices.Clone(l.Build)
				x.l = &l
			}
			if i > 0 {
				list[i-1].apply(&x)
			}
			again, err := evaluate(ctx, x, tables)
			if err == nil {
				results[i] = again
			}
			return ctx.Err()
		})
	}
	return results, g.Wait()
}

// effects compares the variants with the unchanged design computed by the same
// route, so that only the nudge differs.
func effects(d *Design, f figure, k int, value float64, v []*Design) []Effect {
	at := func(i int) (float64, bool) {
		if v[i] == nil {
			return 0, false
		}
		return f.value(v[i], k)
	}
	base, ok := at(0)
	if !ok {
		return nil
	}
	var out []Effect
	for i, n := range nudges(d) {
		x, ok := at(i + 1)
		if !ok {
			continue
		}
		e := Effect{Input: n.input, Step: n.step}
		if f.temperature || value == 0 || base == 0 {
			e.Change, e.Unit = x-base, f.unit
			if f.temperature {
				e.Unit = "K"
			}
			if math.Abs(e.Change) < 1e-3 {
				continue
			}
		} else {
			e.Change = x/base - 1
			if math.Abs(e.Change) < negligible*percent {
				continue
			}
		}
		out = append(out, e)
	}
	slices.SortStableFunc(out, func(a, b Effect) int { return cmp.Compare(math.Abs(b.Change), math.Abs(a.Change)) })
	return out
}

// evaluate rates a variant and closes its loop with the tank.
func evaluate(ctx context.Context, x variant, tables Tables) (*Design, error) {
	s, err := newSearch(x.job, tables)
	if err != nil {
		return nil, err
	}
	s.leakage = x.l == nil
	s.permeability = x.permeability
	d := &Design{Job: x.job, AsBuilt: x.job.Tank, Transformer: &x.t, Inductor: x.l}
	d.Wanted, err = tank.SolveAll(ctx, x.job.Tank, x.job.Corners)
	if err != nil {
		return nil, err
	}
	d.Operations = d.Wanted
	if !reached(d.Wanted) {
		return nil, &TankError{d.Wanted}
	}
	if err := s.drive(x.job.Tank, d.Wanted); err != nil {
		return nil, err
	}
	return d, s.settle(ctx, d)
}
