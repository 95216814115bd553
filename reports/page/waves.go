package page

import (
	"fmt"
	"html/template"
	"math"

	"gapwright/corelib/quantity"
	"gapwright/magnetics/design"
	"gapwright/reports/figure"
	"gapwright/tank"
)

// cornerIndex is the place of a corner among those that are shown.
func cornerIndex(in Input, name string) int {
	for i, c := range in.View.Corners {
		if c.Name == name {
			return i
		}
	}
	return 0
}

// waves are the waveforms of one corner.
type waves struct {
	Corner                int
	Name                  string
	Period, Edge          template.HTML
	EdgeWords, PeriodNote string
	Facts                 []fact
}

// traceData is what the cursor reads out, in the units of the panels.
type traceData struct {
	Corner string      `json:"corner"`
	Time   []float64   `json:"t"` // µs
	Traces []traceLine `json:"traces"`
}

type traceLine struct {
	Name   string    `json:"name"`
	Unit   string    `json:"unit"`
	Values []float64 `json:"v"`
}

func waveforms(in Input) ([]waves, []traceData, error) {
	d := in.Design
	var list []waves
	var data []traceData
	for i := range in.View.Corners {
		c := &in.View.Corners[i]
		t := times(c.Time, 1e6)
		secondary := make([]figure.Curve, len(c.Secondary))
		lines := []traceLine{
			{"resonant", "A", roundedAll(c.Resonant, 1)}, {"magnetizing", "A", roundedAll(c.Magnetizing, 1)},
		}
		for w, s := range c.Secondary {
			name := d.Rating.Windings[min(w+1, len(d.Rating.Windings)-1)].Name
			secondary[w] = figure.Curve{Name: name, X: t, Y: s, Tone: figure.Secondary}
			if w > 0 {
				secondary[w].Tone, secondary[w].Dashed = figure.OtherHalf, true
			}
			lines = append(lines, traceLine{name, "A", roundedAll(s, 1)})
		}
		flux := make([]figure.Curve, len(c.Flux))
		for p, b := range c.Flux {
			flux[p] = figure.Curve{Name: in.View.Parts[p].Part, X: t, Y: times(b, 1e3), Tone: figure.Primary}
			if p > 0 {
				flux[p].Tone, flux[p].Dashed = figure.Accent, true
			}
			lines = append(lines, traceLine{"flux, " + in.View.Parts[p].Part, "mT", roundedAll(b, 1e3)})
		}
		lines = append(lines, traceLine{"bridge", "V", roundedAll(c.Bridge, 1)})
		chart := figure.Chart{
			Name: "waveforms-" + c.Name, Title: fmt.Sprintf("Corner %s: currents, flux density and bridge voltage over one period", c.Name),
			X: figure.Axis{Label: "time from the middle of the rising edge, µs"},
			Panels: []figure.Panel{
				{Y: figure.Axis{Label: "primary current, A"}, Height: 28, Curves: []figure.Curve{
					{Name: "resonant", X: t, Y: c.Resonant, Tone: figure.Primary}, {Name: "magnetizing", X: t, Y: c.Magnetizing, Tone: figure.Accent, Dashed: true},
				}},
				{Y: figure.Axis{Label: "secondary current, A"}, Height: 20, Curves: secondary},
				{Y: figure.Axis{Label: "flux density in the smallest section, mT"}, Height: 20, Curves: flux},
				{Y: figure.Axis{Label: "bridge voltage across the tank, V"}, Height: 15, Curves: []figure.Curve{{Name: "bridge", X: t, Y: c.Bridge, Tone: figure.Ink}}},
			},
		}
		drawing, err := svg(chart.SVG())
		if err != nil {
			return nil, nil, err
		}
		w := waves{Corner: i, Name: c.Name, Period: drawing, Facts: waveFacts(d, c.Name)}
		w.EdgeWords = "No dead time is given: the edges are ideal, and soft switching is not assessed."
		if len(c.EdgeTime) > 0 {
			ns := times(c.EdgeTime, 1e9)
			edge := figure.Chart{
				Name: "edge-" + c.Name, Title: fmt.Sprintf("Corner %s: the rising edge of the bridge in the dead time", c.Name), X: figure.Axis{Label: "time from turn-off, ns"},
				Panels: []figure.Panel{
					{Y: figure.Axis{Label: "bridge voltage across the tank, V"}, Height: 32, Curves: []figure.Curve{{Name: "bridge", X: ns, Y: c.EdgeBridge, Tone: figure.Ink}},
						Bands: []figure.Band{{From: 0, To: 1e9 * d.AsBuilt.DeadTime, Label: "dead time"}}},
					{Y: figure.Axis{Label: "resonant current, A"}, Height: 22, Curves: []figure.Curve{{Name: "resonant", X: ns, Y: c.EdgeCurrent, Tone: figure.Primary}},
						Bands: []figure.Band{{From: 0, To: 1e9 * d.AsBuilt.DeadTime}}},
				},
			}
			if w.Edge, err = svg(edge.SVG()); err != nil {
				return nil, nil, err
			}
			w.EdgeWords = edgeWords(d, c.Name)
		}
		list = append(list, w)
		data = append(data, traceData{c.Name, roundedAll(c.Time, 1e6), lines})
	}
	return list, data, nil
}

func operationOf(d *design.Design, name string) (int, *tank.Operation) {
	for i := range d.Operations {
		if d.Operations[i].Corner.Name == name {
			return i, &d.Operations[i]
		}
	}
	return -1, nil
}

func edgeWords(d *design.Design, name string) string {
	_, o := operationOf(d, name)
	if o == nil || o.SoftSwitching == nil {
		return ""
	}
	z := o.SoftSwitching
	if z.Complete {
		return fmt.Sprintf("The node is across after %.0f of %.0f ns and is held.", 1e9*z.SwingTime, 1e9*d.AsBuilt.DeadTime)
	}
	return fmt.Sprintf("INCOMPLETE: when the dead time of %.0f ns ends, %.0f V are left and are switched hard.", 1e9*d.AsBuilt.DeadTime, z.VoltageLeft)
}

func waveFacts(d *design.Design, name string) []fact {
	i, o := operationOf(d, name)
	if o == nil {
		return nil
	}
	at := func(key string) string { return fmt.Sprintf("tank_as_built.corners.%d.%s", i, key) }
	f := []fact{
		{Name: "frequency", Text: unit(at("frequency"), o.Frequency, quantity.Hertz)},
		{Name: "output", Text: join(scaled(at("output_voltage"), o.OutputVoltage, 1, 2, " V"), esc(", "), scaled(at("output_current"), o.OutputCurrent, 1, 2, " A"))},
		{Name: "resonant current", Text: join(scaled(at("resonant_current.rms"), o.Resonant.RMS, 1, 3, " A rms, "), scaled(at("resonant_current.peak"), o.Resonant.Peak, 1, 3, " A peak"))},
		{Name: "magnetizing current", Text: scaled(at("magnetizing_current.peak"), o.Magnetizing.Peak, 1, 3, " A peak")},
		{Name: "one secondary", Text: join(scaled(at("secondary_windings.0.rms"), o.Windings[0].RMS, 1, 3, " A rms, "), scaled(at("secondary_windings.0.peak"), o.Windings[0].Peak, 1, 3, " A peak"))},
		{Name: "resonant capacitor", Text: scaled(at("resonant_capacitor.voltage_peak"), o.CapacitorPeak, 1, 0, " V peak")},
		{Name: "turn-off current", Text: scaled(at("turn_off_current"), o.TurnOffCurrent, 1, 3, " A")},
	}
	if o.Corner.OutputVoltage > 0 {
		f = append(f, fact{Name: "gain left", Text: percent(at("peak_gain_margin"), o.PeakGainMargin, 1)})
	}
	return f
}

// gains draws the output over frequency of each corner, exact beside the first
// harmonic.
func gains(in Input) ([]panel, error) {
	d := in.Design
	var list []panel
	for i := range in.View.Corners {
		c := &in.View.Corners[i]
		_, o := operationOf(d, c.Name)
		if len(c.Gain) < 2 || o == nil || !(c.UnitGain > 0) {
			continue
		}
		var f, exact, first []float64
		worst, worstAt := 0.0, 0.0
		for _, p := range c.Gain {
			f, exact, first = append(f, 1e-3*p.Frequency), append(exact, p.Output), append(first, p.FirstHarmonic)
			if e := p.FirstHarmonic/p.Output - 1; math.Abs(e) > math.Abs(worst) && !math.IsInf(e, 0) && !math.IsNaN(e) {
				worst, worstAt = e, p.Frequency
			}
		}
		y := figure.Axis{Label: "output voltage, V (gain 1 dashed)"}
		chart := figure.Chart{
			Name: "gain-" + c.Name, Title: fmt.Sprintf("Corner %s: output voltage over frequency at its input voltage and load resistance, exact and first harmonic", c.Name),
			X: figure.Axis{Label: "frequency, kHz", Log: true, Min: f[0], Max: f[len(f)-1]},
			Panels: []figure.Panel{{
				Y: y, Height: 36,
				Curves: []figure.Curve{{Name: "exact", X: f, Y: exact, Tone: figure.Primary}, {Name: "1st harmonic", X: f, Y: first, Tone: figure.OtherHalf, Dashed: true}},
				Marks:  []figure.Mark{{X: 1e-3 * o.Frequency, Y: o.OutputVoltage, Shape: figure.Star, Tone: figure.Primary, Label: c.Name}},
				Rules:  []figure.Rule{{At: c.UnitGain, Across: true, Tone: figure.Faint}, {At: 1e-3 * d.AsBuilt.ResonantFrequency(), Tone: figure.Faint, Label: "Lr–Cr"}},
			}},
		}
		drawing, err := svg(chart.SVG())
		if err != nil {
			return nil, err
		}
		caption := fmt.Sprintf("%s: %.0f V in, %s.", c.Name, o.Corner.InputVoltage, quantity.Format(o.LoadResistance, quantity.Ohm))
		if o.Corner.OutputVoltage > 0 {
			caption += fmt.Sprintf(" The peak of %.1f V lies at %s.", o.PeakOutputVoltage, quantity.Format(o.FrequencyOfPeakGain, quantity.Hertz))
		}
		here := o.FirstHarmonic.OutputVoltage/o.OutputVoltage - 1
		caption += fmt.Sprintf(" The first harmonic is %s %% off at the corner and %s %% at %s.", signed(100*here, 1), signed(100*worst, 0), quantity.Format(worstAt, quantity.Hertz))
		list = append(list, panel{Corner: i, Name: c.Name, Figure: drawing, Caption: caption})
	}
	return list, nil
}
