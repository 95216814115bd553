package page

import (
	"fmt"
	"html/template"
	"strings"

	"gapwright/corelib/quantity"
	"gapwright/magnetics/design"
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
	"gapwright/tank"
)

// checkRow is one figure by hand beside the model's.
type checkRow struct {
	Quantity, Formula, Note string
	Hand, Model             template.HTML
	Off                     string
	Expected                string
}

type checkTable struct {
	Title string
	Rows  []checkRow
}

func handValue(path string, x float64, of string) template.HTML {
	switch of {
	case "T":
		return scaled(path, x, 1e3, 1, " mT")
	case "m":
		return scaled(path, x, 1e3, 3, " mm")
	case "A":
		return unit(path, x, quantity.Ampere)
	case "H":
		return unit(path, x, quantity.Henry)
	case "ohm":
		return unit(path, x, quantity.Ohm)
	case "J":
		return unit(path, x, quantity.Joule)
	}
	return number(path, x, fmt.Sprintf("%.4g %s", x, of))
}

func handChecks(d *design.Design) []checkTable {
	var list []checkTable
	n := 0
	for _, r := range []*part.Rating{d.Rating, d.InductorRating} {
		if r == nil || len(r.Checks) == 0 {
			continue
		}
		t := checkTable{Title: title(r.Part)}
		for _, c := range r.Checks {
			hand, model := "", ""
			// The design holds both parts' checks in this order.
			if n < len(d.Checks) && d.Checks[n].Quantity == c.Quantity && d.Checks[n].Hand == c.Hand {
				hand, model = fmt.Sprintf("hand_checks.%d.hand", n), fmt.Sprintf("hand_checks.%d.model", n)
			}
			n++
			t.Rows = append(t.Rows, checkRow{
				Quantity: c.Quantity, Formula: c.Formula, Note: c.Note, Hand: handValue(hand, c.Hand, c.Unit), Model: handValue(model, c.Model, c.Unit),
				Off: deviation(c.Hand, c.Model), Expected: fmt.Sprintf("± %.2g %%", 100*c.Expect),
			})
		}
		list = append(list, t)
	}
	return list
}

// assumption is one default that was used.
type assumption struct{ Path, Value, Mark, Source string }

type assumptionGroup struct {
	Name string
	List []assumption
}

func defaults(d *design.Design) []assumptionGroup {
	var groups []assumptionGroup
	for _, x := range d.Job.Defaults() {
		if strings.HasPrefix(x.Path, "build.sheet") {
			continue
		}
		path := strings.TrimPrefix(x.Path, "build.")
		group, rest, nested := strings.Cut(path, ".")
		if !nested {
			group, rest = "general", path
		}
		if !strings.HasPrefix(x.Path, "build.") && group != "tank" {
			group = "job"
		}
		a := assumption{rest, x.Value, x.Mark, x.Source}
		if a.Mark == "" {
			a.Mark = "OWN"
		}
		at := -1
		for i := range groups {
			if groups[i].Name == group {
				at = i
			}
		}
		if at < 0 {
			groups = append(groups, assumptionGroup{Name: group})
			at = len(groups) - 1
		}
		groups[at].List = append(groups[at].List, a)
	}
	return groups
}

// source says where a figure or a row comes from.
type source struct{ What, Model, Source string }

func sources(d *design.Design) []source {
	var list []source
	for _, m := range d.Models {
		list = append(list, source{m.Quantity, m.Model, m.Source})
	}
	seen := map[string]bool{}
	add := func(what, model, from string) {
		key := what + "|" + model + "|" + from
		if from != "" && !seen[key] {
			seen[key] = true
			list = append(list, source{what, model, from})
		}
	}
	own := func(text, origin string) string {
		if origin != "" {
			return text + " (own row, " + origin + ")"
		}
		return text
	}
	for _, x := range []struct {
		r *part.Rating
		c *part.Construction
	}{{d.Rating, &d.Transformer.Construction}, {d.InductorRating, inductorOf(d)}} {
		if x.r == nil || x.c == nil {
			continue
		}
		s := x.r.Shape
		add("core "+s.Name, "dimensions, confidence "+string(s.Confidence), own(s.DimensionSource, s.Origin))
		add("core "+s.Name, "effective parameters", own(s.ParameterSource, s.Origin))
		f := x.r.Former
		kind := "winding space"
		if f.Derived {
			kind = "winding space by a rule " + f.Band
		}
		add("former "+f.Name, kind, own(f.Source, f.Origin))
		m := x.r.Ferrite
		add("ferrite "+m.Name, m.Confidence, own(m.Source, m.Origin))
		for _, set := range m.Loss {
			add("ferrite "+m.Name+", loss set "+set.ID, fmt.Sprintf("%.0f to %.0f kHz, ± %.0f %%, %s", 1e-3*set.FMin, 1e-3*set.FMax, 100*set.Band, set.Confidence), own(set.Source, set.Origin))
		}
		for _, e := range x.c.Build {
			if e.Kind == winding.Wind {
				add("wire "+e.Wire.String(), "", strings.Join(e.Wire.Sources(), "; "))
			}
		}
	}
	return list
}

func inductorOf(d *design.Design) *part.Construction {
	if d.Inductor == nil {
		return nil
	}
	return &d.Inductor.Construction
}

// given is what the job states: tank and corners.
func given(d *design.Design) []fact {
	t := d.Job.Tank
	var list []fact
	add := func(name, text string) { list = append(list, fact{Name: name, Text: esc(text)}) }
	add("bridge, rectifier", string(t.Bridge)+", "+string(t.Rectifier))
	add("resonant capacitance", quantity.Format(t.Cr, quantity.Farad))
	add("frequency range", quantity.Format(t.FrequencyMin, quantity.Hertz)+" to "+quantity.Format(t.FrequencyMax, quantity.Hertz))
	add("dead time", quantity.Format(t.DeadTime, quantity.Second))
	add("node capacitance", quantity.Format(t.NodeCapacitance, quantity.Farad))
	add("bridge resistance", quantity.Format(t.BridgeResistance, quantity.Ohm))
	add("one rectifier", fmt.Sprintf("%s and %s", quantity.Format(t.RectifierDrop, quantity.Volt), quantity.Format(t.RectifierResistance, quantity.Ohm)))
	if t.StrayInductance > 0 {
		add("stray inductance of one secondary loop", quantity.Format(t.StrayInductance, quantity.Henry))
	}
	in := d.Job.Build.Insulation
	grade := in.Grade
	if grade == "" {
		grade = "not stated: not designed for isolation"
	}
	add("insulation grade", grade)
	if in.WorkingVoltage != nil {
		add("working voltage", fmt.Sprintf("%.0f V rms", *in.WorkingVoltage))
	}
	if in.Creepage != nil {
		add("creepage, stated by you", fmt.Sprintf("%.3g mm", 1e3**in.Creepage))
	}
	if in.Clearance != nil {
		add("clearance, stated by you", fmt.Sprintf("%.3g mm", 1e3**in.Clearance))
	}
	add("ambient", fmt.Sprintf("%.0f °C", d.Job.Build.Surroundings.AmbientTemperature))
	return list
}

// tankRow is the tank as wanted beside what the parts make of it.
type tankRow struct {
	Name          string
	Wanted, Built template.HTML
	Off           string
}

func asBuilt(d *design.Design, from origins) []tankRow {
	want, built := d.Job.Tank, d.AsBuilt
	rows := []tankRow{{"Lr", unit("", want.Lr, quantity.Henry), from.link("tank_as_built.resonant_inductance", unit("tank_as_built.resonant_inductance", built.Lr, quantity.Henry)), two(built.Lr, want.Lr)}}
	lm := tankRow{Name: "Lm", Wanted: "–", Built: from.link("tank_as_built.magnetizing_inductance", unit("tank_as_built.magnetizing_inductance", built.Lm, quantity.Henry)), Off: "–"}
	if want.Lm > 0 {
		lm.Wanted, lm.Off = unit("", want.Lm, quantity.Henry), two(built.Lm, want.Lm)
	}
	rows = append(rows, lm)
	rows = append(rows, tankRow{"turns ratio", scaled("", want.TurnsRatio, 1, 4, ""), from.link("tank_as_built.turns_ratio", scaled("tank_as_built.turns_ratio", built.TurnsRatio, 1, 4, "")), two(built.TurnsRatio, want.TurnsRatio)})
	return append(rows, tankRow{"resonance Lr–Cr", unit("", want.ResonantFrequency(), quantity.Hertz), unit("", built.ResonantFrequency(), quantity.Hertz), two(built.ResonantFrequency(), want.ResonantFrequency())})
}

func two(a, b float64) string { return signed(100*(a/b-1), 2) + " %" }

// cornerRow is one corner of the tank as built.
type cornerRow struct {
	Name, Status, Soft                      string
	Input, Frequency, Output, Current, Peak template.HTML
	Secondary, Margin                       template.HTML
	Served                                  bool
}

func corners(d *design.Design, from origins) []cornerRow {
	var rows []cornerRow
	for i := range d.Operations {
		o := &d.Operations[i]
		at := func(key string) string {
			if d.Rating == nil {
				return "" // the tank as wanted, which design.json leaves to the tank command
			}
			return fmt.Sprintf("tank_as_built.corners.%d.%s", i, key)
		}
		r := cornerRow{Name: o.Corner.Name, Status: string(o.Status), Input: scaled(at("input_voltage"), o.Corner.InputVoltage, 1, 0, "")}
		if o.Status != tank.OK {
			r.Soft = o.Reason
			rows = append(rows, r)
			continue
		}
		r.Served = true
		r.Frequency = from.link(at("frequency"), scaled(at("frequency"), o.Frequency, 1e-3, 2, ""))
		r.Output = scaled(at("output_voltage"), o.OutputVoltage, 1, 2, "")
		r.Current = from.link(at("resonant_current.rms"), scaled(at("resonant_current.rms"), o.Resonant.RMS, 1, 3, ""))
		r.Peak = from.link(at("resonant_current.peak"), scaled(at("resonant_current.peak"), o.Resonant.Peak, 1, 3, ""))
		r.Secondary = scaled(at("secondary_windings.0.rms"), o.Windings[0].RMS, 1, 3, "")
		r.Margin = "–"
		if o.Corner.OutputVoltage > 0 {
			r.Margin = from.link(at("peak_gain_margin"), percent(at("peak_gain_margin"), o.PeakGainMargin, 1))
		}
		r.Soft = "not assessed"
		if z := o.SoftSwitching; z != nil {
			r.Soft = "INCOMPLETE"
			if z.Complete {
				r.Soft = fmt.Sprintf("%.0f of %.0f ns", 1e9*z.SwingTime, 1e9*d.AsBuilt.DeadTime)
			}
		}
		rows = append(rows, r)
	}
	return rows
}
