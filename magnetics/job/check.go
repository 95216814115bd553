package job

import (
	"fmt"
	"strconv"
	"strings"

	"gapwright/corelib/document"
	"gapwright/corelib/quantity"
)

// Format is the version of the files that this package reads and writes.
const Format = 1

// sumSlack is what rounding may add to a sum of a few percentages.
const sumSlack = 1e-9

func path(list string, i int, key string) string { return fmt.Sprintf("%s[%d].%s", list, i, key) }

// check finds what no single value shows: contradictions, shares, forms of
// corners. It fills in the shares and what follows from other keys.
func check(f *jobFile, rec *document.Record) {
	checkFormat(f.Format, rec)
	checkTank(f, rec)
	checkCorners(f, rec)
	checkBuild(f, rec)
	checkTolerances(&f.Build.Tolerances, rec)
	notYet(f, rec)
}

// checkTolerances refuses a tolerance that reaches down to nothing or below: no
// inductance, capacitance, area or time does.
func checkTolerances(t *Tolerances, rec *document.Record) {
	for _, one := range []struct {
		key   string
		value [2]float64
	}{
		{"open_inductance", t.OpenInductance},
		{"short_inductance.concentric", t.ShortInductance.Concentric},
		{"short_inductance.sandwich", t.ShortInductance.Sandwich},
		{"short_inductance.sections", t.ShortInductance.Sections},
		{"inductor_inductance", t.InductorInductance},
		{"permeability", t.Permeability},
		{"core_area", t.CoreArea},
		{"resonant_capacitance", t.ResonantCapacitance},
		{"node_capacitance", t.NodeCapacitance},
		{"dead_time", t.DeadTime},
	} {
		path := "build.tolerances." + one.key
		if given(rec, path) && one.value[0] >= 1 {
			rec.Fault(path, "%s down leaves nothing of the value; write less than 100 %%", percent(one.value[0]))
		}
	}
}

func checkFormat(format int, rec *document.Record) {
	if rec.Set("format") && rec.Valid("format") && format != Format {
		rec.Fault("format", "%d is not a format of this release; write %d", format, Format)
	}
}

// given tells whether the document states every path rightly.
func given(rec *document.Record, paths ...string) bool {
	for _, p := range paths {
		if !rec.Set(p) || !rec.Valid(p) {
			return false
		}
	}
	return true
}

// valid tells whether every path can be relied on, stated or default.
func valid(rec *document.Record, paths ...string) bool {
	for _, p := range paths {
		if !rec.Valid(p) {
			return false
		}
	}
	return true
}

// where names the line of path, or says that its default is meant.
func where(rec *document.Record, path string) string {
	if rec.Set(path) {
		return fmt.Sprintf("on line %d", rec.Line(path))
	}
	return "by default"
}

// blame returns the first path that the document states, else the last one.
func blame(rec *document.Record, paths ...string) string {
	for _, p := range paths {
		if rec.Set(p) {
			return p
		}
	}
	return paths[len(paths)-1]
}

func checkTank(f *jobFile, rec *document.Record) {
	t := f.Tank
	if given(rec, "tank.magnetizing_inductance", "tank.resonant_inductance") && t.Lm < t.Lr {
		rec.Fault("tank.magnetizing_inductance", "%s is below resonant_inductance %s on line %d; write the larger of the two here",
			rec.Text("tank.magnetizing_inductance"), rec.Text("tank.resonant_inductance"), rec.Line("tank.resonant_inductance"))
	}
	if given(rec, "tank.frequency_min", "tank.frequency_max") && t.FrequencyMin > t.FrequencyMax {
		rec.Fault("tank.frequency_min", "%s is above frequency_max %s on line %d; write the lower of the two here",
			rec.Text("tank.frequency_min"), rec.Text("tank.frequency_max"), rec.Line("tank.frequency_max"))
	}
	if given(rec, "tank.dead_time", "tank.frequency_max") && t.DeadTime*t.FrequencyMax >= 0.5 {
		rec.Fault("tank.dead_time", "%s is not shorter than half a period at frequency_max %s on line %d; write a shorter one",
			rec.Text("tank.dead_time"), rec.Text("tank.frequency_max"), rec.Line("tank.frequency_max"))
	}
}

func checkCorners(f *jobFile, rec *document.Record) {
	if !given(rec, "corners") {
		return
	}
	byName := map[string]string{}
	for i := range f.Corners {
		name := path("corners", i, "name")
		if !given(rec, name) {
			continue
		}
		if first, ok := byName[f.Corners[i].Name]; ok {
			rec.Fault(name, "%s is the name of the corner on line %d too; write another name", f.Corners[i].Name, rec.Line(first))
			continue
		}
		byName[f.Corners[i].Name] = name
	}
	for i := range f.Corners {
		// A mistyped key would be taken for a missing one.
		if rec.Clean(fmt.Sprintf("corners[%d]", i)) {
			checkForm(i, rec)
		}
	}
	shares(f, rec)
}

// checkForm finds out whether corner i asks for an output or for a frequency.
func checkForm(i int, rec *document.Record) {
	set := func(key string) bool { return rec.Set(path("corners", i, key)) }
	at := func(key string) string { return path("corners", i, key) }
	self := fmt.Sprintf("corners[%d]", i)
	var loads []string
	for _, key := range []string{"output_current", "output_power", "load_resistance"} {
		if set(key) {
			loads = append(loads, key)
		}
	}
	const loadWords = "output_current, output_power or load_resistance"
	switch {
	case set("frequency") && set("output_voltage"):
		rec.Fault(at("frequency"), "the corner has output_voltage on line %d too; write one of them, the other is found", rec.Line(at("output_voltage")))
	case set("frequency"):
		for _, key := range []string{"output_current", "output_power"} {
			if set(key) {
				rec.Fault(at(key), "does not go with frequency on line %d; write load_resistance", rec.Line(at("frequency")))
				return
			}
		}
		if !set("load_resistance") {
			rec.Fault(at("frequency"), "needs a load; write load_resistance beside it")
		}
	case !set("output_voltage"):
		rec.Fault(self, "the corner has neither output_voltage nor frequency; write output_voltage with %s, or frequency with load_resistance", loadWords)
	case len(loads) == 0:
		rec.Fault(at("output_voltage"), "needs a load; write %s beside it", loadWords)
	}
	if !set("frequency") && len(loads) > 1 {
		rec.Fault(at(loads[1]), "the load is stated by %s on line %d too; write one of them", loads[0], rec.Line(at(loads[0])))
	}
	if set("duration") && set("share") {
		rec.Fault(at("share"), "a corner with duration, on line %d, has no share; write one of them", rec.Line(at("duration")))
	}
}

// shares splits the operating time that the job does not state.
func shares(f *jobFile, rec *document.Record) {
	sum, last := 0.0, ""
	var open []int
	for i, c := range f.Corners {
		switch share := path("corners", i, "share"); {
		case rec.Set(path("corners", i, "duration")):
		case !rec.Set(share):
			open = append(open, i)
		case !rec.Valid(share):
			return
		default:
			sum, last = sum+c.Share, share
		}
	}
	switch {
	case last == "" && len(open) == 0: // passing corners only
	case sum > 1+sumSlack:
		rec.Fault(last, "the shares add up to %s; write shares of 100 %% together", percent(sum))
	case len(open) == 0 && sum < 1-sumSlack:
		rec.Fault(last, "the shares add up to %s and no corner is left for the rest; write shares of 100 %% together", percent(sum))
	default:
		for _, i := range open {
			f.Corners[i].Share = max(0, 1-sum) / float64(len(open))
		}
	}
}

func percent(x float64) string { return strconv.FormatFloat(100*x, 'g', 6, 64) + " %" }

func checkBuild(f *jobFile, rec *document.Record) {
	b := &f.Build
	if o := b.Objective; rec.Set("build.objective") && rec.Valid("build.objective") && o.Word == "" && o.Loss+o.Volume+o.Mass == 0 {
		rec.Fault("build.objective", "all weights are zero; write at least one of loss, volume, mass")
	}
	if rec.Valid("build.resonant_inductor") && b.ResonantInductor == "leakage" && valid(rec, "build.transformer.arrangements", "build.transformer.barrier_extra") {
		sections := false
		for _, a := range b.Transformer.Arrangements {
			sections = sections || a == "sections"
		}
		if !sections && b.Transformer.BarrierExtra[1] == 0 {
			rec.Fault("build.resonant_inductor", "leakage needs sections among the arrangements %s, or barrier_extra above 0 %s; write one of these, or separate",
				where(rec, "build.transformer.arrangements"), where(rec, "build.transformer.barrier_extra"))
		}
	}
	checkPart("build", &PartLimits{b.Limits, b.Cores, b.Gap, b.Wires, b.Insulation}, b, rec, func(p PartLimits) {
		b.Gap = p.Gap
		// The parts inherit it where they state neither kind nor governs themselves.
		for name, l := range map[string]*Gap{Transformer: &b.Transformer.Gap, Inductor: &b.Inductor.Gap} {
			if l.Kind == p.Gap.Kind && !rec.Set("build."+name+".gap.governs") {
				l.Governs = p.Gap.Governs
			}
		}
	})
	checkPart("build.transformer", &b.Transformer.PartLimits, b, rec, func(p PartLimits) { b.Transformer.Gap = p.Gap })
	checkPart("build.inductor", &b.Inductor.PartLimits, b, rec, func(p PartLimits) { b.Inductor.Gap = p.Gap })
}

// checkPart finds contradictions in the limits of one part, or of both when
// base is "build". A part's own section is looked at only where it states
// something itself.
func checkPart(base string, p *PartLimits, b *Build, rec *document.Record, keep func(PartLimits)) {
	// in resolves a key to the part's own place or to the general one.
	in := func(key string) string {
		if own := base + "." + key; rec.Set(own) || base == "build" {
			return own
		}
		return "build." + key
	}
	// ours tells whether a contradiction between keys is new at this level.
	ours := func(keys ...string) bool {
		for _, k := range keys {
			if !valid(rec, base+"."+k, in(k)) {
				return false
			}
		}
		if base == "build" {
			return true
		}
		for _, k := range keys {
			if rec.Set(base + "." + k) {
				return true
			}
		}
		return false
	}
	checkNames(base, p, b, rec)
	if ours("insulation.build", "insulation.creepage", "cores.families", "cores.shapes") {
		checkMargins(p, b, rec, in)
	}
	ambient := "build.surroundings.ambient_temperature"
	for _, t := range []struct {
		key   string
		value float64
	}{{"limits.winding_temperature", p.Limits.WindingTemperature}, {"limits.core_temperature", p.Limits.CoreTemperature}} {
		if ours(t.key) && rec.Valid(ambient) && t.value <= b.Surroundings.AmbientTemperature {
			name := t.key[len("limits."):]
			if at := blame(rec, in(t.key), ambient); at == ambient {
				rec.Fault(ambient, "%s is not below %s %s %s; write a lower one", text(rec, ambient, b.Surroundings.AmbientTemperature, quantity.Celsius), name, text(rec, in(t.key), t.value, quantity.Celsius), where(rec, in(t.key)))
			} else {
				rec.Fault(at, "%s is not above ambient_temperature %s %s; write a higher one", text(rec, at, t.value, quantity.Celsius), text(rec, ambient, b.Surroundings.AmbientTemperature, quantity.Celsius), where(rec, ambient))
			}
		}
	}
	if ours("gap.length_min", "gap.length_max") && p.Gap.LengthMin > p.Gap.LengthMax {
		lo, hi := in("gap.length_min"), in("gap.length_max")
		if blame(rec, lo, hi) == lo {
			rec.Fault(lo, "%s is above length_max %s %s; write the lower of the two here", text(rec, lo, p.Gap.LengthMin, quantity.Meter), text(rec, hi, p.Gap.LengthMax, quantity.Meter), where(rec, hi))
		} else {
			rec.Fault(hi, "%s is below length_min %s %s; write the higher of the two here", text(rec, hi, p.Gap.LengthMax, quantity.Meter), text(rec, lo, p.Gap.LengthMin, quantity.Meter), where(rec, lo))
		}
	}
	if ours("gap.kind", "gap.governs") && p.Gap.Kind == "spacer" && p.Gap.Governs == "A_L" {
		if rec.Set(in("gap.governs")) {
			rec.Fault(blame(rec, base+".gap.governs", in("gap.kind"), in("gap.governs")), "A_L cannot govern a gap of kind spacer (kind is %s, governs %s); write governs: length", where(rec, in("gap.kind")), where(rec, in("gap.governs")))
		} else {
			p.Gap.Governs = "length" // a spacer is bought by its thickness
			keep(*p)
		}
	}
	ins := p.Insulation
	for _, key := range []string{"creepage", "clearance"} {
		k := "insulation." + key
		if ours(k, "insulation.grade") && rec.Set(in(k)) && rec.Text(in(k)) != "absent" && ins.Grade == "" {
			rec.Fault(in(k), "is stated without a grade (grade is absent %s); write grade: functional, basic or reinforced", where(rec, in("insulation.grade")))
		}
	}
	if k, r := "insulation.working_voltage_peak", "insulation.working_voltage"; ours(k, r) && ins.WorkingVoltage != nil && ins.WorkingVoltagePeak != nil && *ins.WorkingVoltagePeak < *ins.WorkingVoltage {
		rec.Fault(blame(rec, base+"."+k, base+"."+r, in(k)), "the peak %s (%s) is below the rms value %s (%s); write the peak value", rec.Text(in(k)), where(rec, in(k)), rec.Text(in(r)), where(rec, in(r)))
	}
	if ours("wires.stock", "wires.kinds") && len(p.Wires.Stock) > 0 {
		some := false
		for _, w := range p.Wires.Stock {
			for _, k := range p.Wires.Kinds {
				some = some || kindOf(w) == k
			}
		}
		if !some {
			rec.Fault(blame(rec, base+".wires.stock", base+".wires.kinds", in("wires.stock")), "the stock %s holds no wire of the kinds %s (%s); write one, or another kind",
				where(rec, in("wires.stock")), strings.Join(p.Wires.Kinds, ", "), where(rec, in("wires.kinds")))
		}
	}
}

// text is a value as it was written, or its default.
func text(rec *document.Record, path string, value float64, u quantity.Unit) string {
	if t := rec.Text(path); t != "" {
		return t
	}
	return quantity.Exact(value, u)
}

// kindOf tells the kind of a wire by its text.
func kindOf(wire string) string {
	switch {
	case strings.Contains(wire, "litz"):
		return "litz"
	case strings.Contains(wire, "foil"):
		return "foil"
	}
	return "solid"
}
