package text

import (
	"fmt"
	"io"
	"math"
	"math/cmplx"
	"strconv"
	"strings"
	"unicode/utf8"

	"gapwright/corelib/quantity"
	"gapwright/tank"
)

// A TankReport is a tank and its corners, solved.
type TankReport struct {
	Title   string // of the job; may be empty
	Tank    tank.Tank
	Figures tank.Figures
	Corners []tank.Operation
	Reach   []tank.Reach // of each corner; nil when soft switching was not assessed
}

// Tank writes the report for people.
func Tank(p *Printer, r TankReport) error {
	if r.Title != "" {
		p.Line("%s", r.Title)
		p.Line("")
	}
	tankFigures(p, r)
	operations(p, r)
	strains(p, r)
	swings(p, r)
	approximations(p, r)
	remarks(p, r)
	assumptions(p, r)
	return p.Err()
}

func tankFigures(p *Printer, r TankReport) {
	t, f := r.Tank, r.Figures
	p.Line("Tank")
	lm := fmt.Sprintf("Lm %s, Lm/Lr %s", format(t.Lm, quantity.Henry), significant(f.InductanceRatio, 4))
	if t.Lm == 0 {
		lm = "no Lm (series-LC tank, solved with 10,000 Lr)"
	}
	line := func(name, format string, args ...any) { p.item(18, "  "+name, fmt.Sprintf(format, args...)) }
	line("circuit", "%s, %s rectifier, turns ratio %s", t.Bridge, t.Rectifier, significant(t.TurnsRatio, 5))
	line("components", "Lr %s, Cr %s, %s", format(t.Lr, quantity.Henry), format(t.Cr, quantity.Farad), lm)
	line("resonance", "%s; with Lm in series %s", format(f.ResonantFrequency, quantity.Hertz), format(f.SecondResonance, quantity.Hertz))
	line("impedance", "√(Lr/Cr) %s", format(f.CharacteristicImpedance, quantity.Ohm))
	line("full load", "corner %s: Re %s, Q %s", f.FullLoad, format(f.EquivalentResistance, quantity.Ohm), significant(f.Q, 3))
	if f.ShortedPeak > 0 {
		line("output shorted", "%s peak in Lr at %s and %s input", format(f.ShortedPeak, quantity.Ampere),
			format(t.FrequencyMax, quantity.Hertz), format(f.ShortedInput, quantity.Volt))
	} else {
		line("output shorted", "no steady state was found at %s", format(t.FrequencyMax, quantity.Hertz))
	}
	p.Line("")
}

// operations is the main table: one row per corner, served or not.
func operations(p *Printer, r TankReport) {
	p.Line("Corners, exact steady state")
	c := columns{left: []int{0, 1}}
	c.words("corner", len(r.Corners), func(k int) string { return label(&r.Corners[k]) })
	c.words("status", len(r.Corners), func(k int) string { return string(r.Corners[k].Status) })
	add := func(head string, scale float64, f func(*tank.Operation) float64) {
		c.numbers(head, len(r.Corners), func(k int) float64 {
			o := &r.Corners[k]
			if o.Status != tank.OK && head != "Vin V" {
				return math.NaN()
			}
			return f(o) * scale
		})
	}
	add("Vin V", 1, func(o *tank.Operation) float64 { return o.Corner.InputVoltage })
	c.words("f kHz", len(r.Corners), func(k int) string {
		if r.Corners[k].Status != tank.OK {
			return ""
		}
		return quantity.Number(r.Corners[k].Frequency, quantity.Hertz, "kHz", 2)
	})
	add("Vout V", 1, func(o *tank.Operation) float64 { return o.OutputVoltage })
	add("Iout A", 1, func(o *tank.Operation) float64 { return o.OutputCurrent })
	add("Ir A", 1, func(o *tank.Operation) float64 { return o.Resonant.RMS })
	add("Ir pk", 1, func(o *tank.Operation) float64 { return o.Resonant.Peak })
	add("Im pk", 1, func(o *tank.Operation) float64 { return o.Magnetizing.Peak })
	add("Is A", 1, func(o *tank.Operation) float64 { return o.Windings[0].RMS })
	add("Is pk", 1, func(o *tank.Operation) float64 { return o.Windings[0].Peak })
	c.words("gain margin", len(r.Corners), func(k int) string {
		if o := &r.Corners[k]; o.Status == tank.OK && o.Corner.OutputVoltage > 0 {
			return tenths(o.PeakGainMargin)
		}
		return ""
	})
	c.print(p)
	p.Line("")
}

// strains is what the capacitor and the cores see.
func strains(p *Printer, r TankReport) {
	list := served(r)
	if len(list) == 0 {
		return
	}
	p.Paragraph(0, "Resonant capacitor, peak flux linkage of Lm, rectifier, and the peak of the output within the range")
	c := columns{left: []int{0}}
	c.words("corner", len(list), func(k int) string { return label(list[k]) })
	add := func(head string, f func(*tank.Operation) float64) {
		c.numbers(head, len(list), func(k int) float64 { return f(list[k]) })
	}
	add("Cr A rms", func(o *tank.Operation) float64 { return o.Resonant.RMS })
	add("V ac rms", func(o *tank.Operation) float64 { return o.CapacitorVoltage.RMS() })
	add("V ac pk", func(o *tank.Operation) float64 { return o.CapacitorPeakAC })
	add("V pk with dc", func(o *tank.Operation) float64 { return o.CapacitorPeak })
	add("flux µVs", func(o *tank.Operation) float64 { return o.FluxLinkagePeak * 1e6 })
	c.words("rectifier off", len(list), func(k int) string { return tenths(list[k].RectifierOffFraction) })
	c.words("peak output", len(list), func(k int) string {
		if o := list[k]; o.Corner.OutputVoltage > 0 {
			return significant(o.PeakOutputVoltage, 4) + " V at " + significant(o.FrequencyOfPeakGain/1e3, 4) + " kHz"
		}
		return ""
	})
	c.print(p)
	p.Line("")
}

// swings is the soft switching.
func swings(p *Printer, r TankReport) {
	list := served(r)
	if len(list) == 0 {
		return
	}
	reach := make([]*tank.Reach, 0, len(list))
	for k := range r.Corners {
		switch {
		case r.Corners[k].Status != tank.OK:
		case k < len(r.Reach):
			reach = append(reach, &r.Reach[k])
		default:
			reach = append(reach, nil)
		}
	}
	if r.Tank.DeadTime == 0 {
		p.Line("Soft switching: not assessed (dead_time is 0: ideal edges)")
		c := columns{left: []int{0}}
		c.words("corner", len(list), func(k int) string { return label(list[k]) })
		c.numbers("turn-off A", len(list), func(k int) float64 { return list[k].TurnOffCurrent })
		c.print(p)
		p.Line("")
		return
	}
	p.Paragraph(2, "Soft switching, dead time %s, one node with %s", format(r.Tank.DeadTime, quantity.Second), format(list[0].SoftSwitching.Capacitance, quantity.Farad))
	c := columns{left: []int{0, 1}}
	c.words("corner", len(list), func(k int) string { return label(list[k]) })
	c.words("swing", len(list), func(k int) string {
		if list[k].SoftSwitching.Complete {
			return "complete"
		}
		return "INCOMPLETE"
	})
	c.numbers("takes ns", len(list), func(k int) float64 {
		if w := list[k].SoftSwitching; w.Complete {
			return w.SwingTime * 1e9
		}
		return math.NaN()
	})
	c.numbers("left V", len(list), func(k int) float64 { return list[k].SoftSwitching.VoltageLeft })
	c.numbers("turn-off A", len(list), func(k int) float64 { return list[k].TurnOffCurrent })
	c.numbers("A at its end", len(list), func(k int) float64 { return list[k].SoftSwitching.EndCurrent })
	starred := false
	c.words("largest Lm µH", len(list), func(k int) string {
		switch w := reach[k]; {
		case w == nil:
			return ""
		case w.Unlimited:
			return "any"
		case w.Lm == 0:
			return "none"
		case w.Status != tank.OK:
			starred = true
			return significant(w.Lm*1e6, 4) + " *"
		default:
			return significant(w.Lm*1e6, 4)
		}
	})
	c.words("by hand µH", len(list), func(k int) string {
		lm := list[k].SoftSwitching.HandRule
		if math.IsInf(lm, 0) {
			return "any"
		}
		return significant(lm*1e6, 4)
	})
	c.print(p)
	if starred {
		p.Paragraph(2, "* above this Lm the corner itself is lost, not the swing")
	}
	p.Line("")
}

// approximations sets the first harmonic beside the exact values.
func approximations(p *Printer, r TankReport) {
	list := served(r)
	if len(list) == 0 {
		return
	}
	p.Paragraph(0, "First-harmonic approximation (FH) beside the exact values, same frequency and load")
	c := columns{left: []int{0}}
	c.words("corner", len(list), func(k int) string { return label(list[k]) })
	add := func(head string, exact, approx func(*tank.Operation) float64) {
		c.numbers(head, len(list), func(k int) float64 { return exact(list[k]) })
		c.numbers("FH", len(list), func(k int) float64 { return approx(list[k]) })
		c.words("off by", len(list), func(k int) string {
			e, a := exact(list[k]), approx(list[k])
			if e == 0 {
				return ""
			}
			return fmt.Sprintf("%+.1f %%", 100*(a/e-1))
		})
	}
	add("Vout V", func(o *tank.Operation) float64 { return o.OutputVoltage }, func(o *tank.Operation) float64 { return o.FirstHarmonic.OutputVoltage })
	add("Ir A", func(o *tank.Operation) float64 { return o.Resonant.RMS }, func(o *tank.Operation) float64 { return o.FirstHarmonic.PrimaryRMS })
	add("Im pk", func(o *tank.Operation) float64 { return o.Magnetizing.Peak }, func(o *tank.Operation) float64 { return o.FirstHarmonic.MagnetizingPeak })
	add("Is A", func(o *tank.Operation) float64 { return o.Windings[0].RMS }, func(o *tank.Operation) float64 { return o.FirstHarmonic.SecondaryRMS })
	c.print(p)
	p.Line("")
}

// remarks is a sentence per corner that is near a limit or beyond one.
func remarks(p *Printer, r TankReport) {
	none := true
	for k := range r.Corners {
		o := &r.Corners[k]
		if o.Status != tank.OK {
			p.Paragraph(2, "%s: %s: %s.", o.Corner.Name, o.Status, o.Reason)
			none = false
		}
		for _, w := range o.Warnings {
			p.Paragraph(2, "%s: %s %s.", o.Corner.Name, w.Code, w.Text)
			none = false
		}
	}
	if none {
		p.Line("No corner is near a limit.")
	}
	p.Line("")
}

func assumptions(p *Printer, r TankReport) {
	edges := "edges of the bridge without duration"
	if r.Tank.DeadTime > 0 {
		edges = "dead time and node swing simulated with a linear capacitance, body diodes without drop"
	}
	p.Paragraph(0, "A is rms, pk the peak in A; Ir flows in Lr and Cr, Im in Lm (on the primary), Is in one secondary winding. "+
		"Assumed: output voltage without ripple, constant rectifier drop, linear Lm, %s.", edges)
}

// label is the name of a corner as tables show it; the remarks have all of it.
func label(o *tank.Operation) string {
	const most = 20
	name := []rune(o.Corner.Name)
	if len(name) > most {
		return string(name[:most-3]) + "..."
	}
	return o.Corner.Name
}

func served(r TankReport) []*tank.Operation {
	var list []*tank.Operation
	for k := range r.Corners {
		if r.Corners[k].Status == tank.OK {
			list = append(list, &r.Corners[k])
		}
	}
	return list
}

// columns is a table that is filled column by column, so that the numbers of a
// column share their decimals.
type columns struct {
	left  []int
	cells [][]string // each with its head first
}

func (c *columns) words(head string, n int, f func(int) string) {
	column := []string{head}
	for k := range n {
		column = append(column, f(k))
	}
	c.cells = append(c.cells, column)
}

// numbers adds a column of numbers; NaN leaves a cell empty.
func (c *columns) numbers(head string, n int, f func(int) float64) {
	least, most := math.Inf(1), 0.0
	values := make([]float64, n)
	for k := range values {
		values[k] = f(k)
		if a := math.Abs(values[k]); a > 0 {
			least, most = math.Min(least, a), math.Max(most, a)
		}
	}
	// Four digits of the largest; more when the smallest would vanish.
	decimals := 0
	if most > 0 {
		top, bottom := int(math.Floor(math.Log10(most))), int(math.Floor(math.Log10(least)))
		decimals = min(max(3-top, min(1-bottom, 5-top), 0), 9)
	}
	c.words(head, n, func(k int) string {
		if math.IsNaN(values[k]) {
			return ""
		}
		return strconv.FormatFloat(values[k], 'f', decimals, 64)
	})
}

// print writes the table, in parts that fit the width; each part begins with the
// first column.
func (c *columns) print(p *Printer) {
	width := func(column []string) int {
		w := 0
		for _, cell := range column {
			w = max(w, utf8.RuneCountInString(p.plain(cell)))
		}
		return w
	}
	for from := 1; from < len(c.cells); {
		if from > 1 {
			p.Line("")
		}
		total := width(c.cells[0])
		to := from
		for to < len(c.cells) {
			w := 2 + width(c.cells[to])
			if total+w > p.Width() && to > from {
				break
			}
			total += w
			to++
		}
		part := append([][]string{c.cells[0]}, c.cells[from:to]...)
		var t Table
		for k := range part[0] {
			row := make([]string, len(part))
			for n := range part {
				row[n] = part[n][k]
				if row[n] == "" {
					row[n] = "-"
				}
			}
			if k == 0 {
				t.Head = row
			} else {
				t.Add(row...)
			}
		}
		t.Left = []int{0}
		for _, l := range c.left {
			if l >= from && l < to {
				t.Left = append(t.Left, l-from+1)
			}
		}
		p.Table(t)
		from = to
	}
}

func format(x float64, u quantity.Unit) string { return quantity.Format(x, u) }

// significant prints x with the given significant digits and without exponent.
func significant(x float64, digits int) string {
	if x == 0 {
		return "0"
	}
	x, _ = strconv.ParseFloat(strconv.FormatFloat(x, 'e', digits-1, 64), 64)
	return strconv.FormatFloat(x, 'f', -1, 64)
}

// tenths prints a share in % with one decimal, for columns.
func tenths(x float64) string { return strconv.FormatFloat(100*x, 'f', 1, 64) + " %" }

func percent(x float64) string {
	if x == 0 {
		return "0 %"
	}
	return significant(100*x, 3) + " %"
}

// item prints a label and, from column indent on, wrapped text.
func (p *Printer) item(indent int, label, text string) {
	line := p.plain(label)
	column := utf8.RuneCountInString(line)
	for k, word := range strings.Fields(p.plain(text)) {
		n := utf8.RuneCountInString(word)
		switch {
		case k == 0:
			line += strings.Repeat(" ", max(1, indent-column))
			column = max(column+1, indent)
		case column+1+n > p.width:
			line += "\n" + strings.Repeat(" ", indent)
			column = indent
		default:
			line += " "
			column++
		}
		line += word
		column += n
	}
	p.write(line + "\n")
}

// TankCorner is a corner as programs get it. Units are SI.
type TankCorner struct {
	Name         string  `json:"name"`
	Status       string  `json:"status"`
	Reason       string  `json:"reason"`
	InputVoltage float64 `json:"input_voltage"`
	*tankOperation
}

type tankOperation struct {
	Frequency            float64       `json:"frequency"`
	OutputVoltage        float64       `json:"output_voltage"`
	OutputCurrent        float64       `json:"output_current"`
	LoadResistance       float64       `json:"load_resistance"`
	ResonantCurrent      tankCurrent   `json:"resonant_current"`
	MagnetizingCurrent   tankCurrent   `json:"magnetizing_current"`
	SecondaryWindings    []tankCurrent `json:"secondary_windings"`
	ResonantCapacitor    tankCapacitor `json:"resonant_capacitor"`
	FluxLinkagePeak      float64       `json:"flux_linkage_peak"`
	TurnOffCurrent       float64       `json:"turn_off_current"`
	RectifierOffFraction float64       `json:"rectifier_off_fraction"`
	PeakGainMargin       *float64      `json:"peak_gain_margin"` // null when the frequency was given
	FrequencyOfPeakGain  *float64      `json:"frequency_of_peak_gain"`
	SoftSwitching        *tankSwing    `json:"soft_switching"` // null with dead time 0
	FirstHarmonic        tankFirst     `json:"first_harmonic"`
}

type tankCurrent struct {
	RMS       float64      `json:"rms"`
	Peak      float64      `json:"peak"`
	Mean      *float64     `json:"mean,omitempty"`
	Harmonics [][2]float64 `json:"harmonics,omitempty"`
}

type tankCapacitor struct {
	VoltagePeak   float64 `json:"voltage_peak"`
	VoltagePeakAC float64 `json:"voltage_peak_ac"`
	VoltageRMSAC  float64 `json:"voltage_rms_ac"`
	CurrentRMS    float64 `json:"current_rms"`
}

type tankSwing struct {
	Complete    bool     `json:"complete"`
	SwingTime   *float64 `json:"swing_time"` // null when incomplete
	VoltageLeft float64  `json:"voltage_left"`
	EndCurrent  float64  `json:"end_current"`
	LargestLm   *float64 `json:"largest_magnetizing_inductance,omitempty"` // the corner solved again for each; absent when unlimited or not looked for, 0 when none completes
	HandRule    *float64 `json:"hand_rule_inductance,omitempty"`           // absent when unlimited
}

type tankFirst struct {
	OutputVoltage   float64 `json:"output_voltage"`
	PrimaryRMS      float64 `json:"primary_rms"`
	SecondaryRMS    float64 `json:"secondary_rms"`
	MagnetizingPeak float64 `json:"magnetizing_peak"`
}

// TankCorners turns solved corners into their form for programs. The reach of
// soft switching may be nil.
func TankCorners(list []tank.Operation, reach []tank.Reach) []TankCorner {
	out := make([]TankCorner, len(list))
	for k := range list {
		o := &list[k]
		c := TankCorner{Name: o.Corner.Name, Status: string(o.Status), Reason: ASCII(o.Reason), InputVoltage: o.Corner.InputVoltage}
		if o.Status == tank.OK {
			c.tankOperation = operation(o)
			if s := c.SoftSwitching; s != nil && k < len(reach) && !reach[k].Unlimited {
				s.LargestLm = &reach[k].Lm
			}
		}
		out[k] = c
	}
	return out
}

func operation(o *tank.Operation) *tankOperation {
	w := &tankOperation{
		Frequency:            o.Frequency,
		OutputVoltage:        o.OutputVoltage,
		OutputCurrent:        o.OutputCurrent,
		LoadResistance:       o.LoadResistance,
		ResonantCurrent:      tankCurrent{RMS: o.Resonant.RMS, Peak: o.Resonant.Peak, Harmonics: phasors(o.IPrimaryHarmonics)},
		MagnetizingCurrent:   tankCurrent{RMS: o.Magnetizing.RMS, Peak: o.Magnetizing.Peak},
		ResonantCapacitor:    tankCapacitor{o.CapacitorPeak, o.CapacitorPeakAC, o.CapacitorVoltage.RMS(), o.Resonant.RMS},
		FluxLinkagePeak:      o.FluxLinkagePeak,
		TurnOffCurrent:       o.TurnOffCurrent,
		RectifierOffFraction: o.RectifierOffFraction,
		FirstHarmonic: tankFirst{o.FirstHarmonic.OutputVoltage, o.FirstHarmonic.PrimaryRMS,
			o.FirstHarmonic.SecondaryRMS, o.FirstHarmonic.MagnetizingPeak},
	}
	for n, q := range o.Windings {
		w.SecondaryWindings = append(w.SecondaryWindings,
			tankCurrent{RMS: q.RMS, Peak: q.Peak, Mean: &q.Mean, Harmonics: phasors(o.ISecondaryHarmonics[n])})
	}
	if o.Corner.OutputVoltage > 0 {
		w.PeakGainMargin, w.FrequencyOfPeakGain = &o.PeakGainMargin, &o.FrequencyOfPeakGain
	}
	if s := o.SoftSwitching; s != nil {
		w.SoftSwitching = &tankSwing{Complete: s.Complete, VoltageLeft: s.VoltageLeft, EndCurrent: s.EndCurrent}
		if s.Complete {
			w.SoftSwitching.SwingTime = &s.SwingTime
		}
		if !math.IsInf(s.HandRule, 0) {
			w.SoftSwitching.HandRule = &s.HandRule
		}
	}
	return w
}

// phasors returns magnitude and phase in degrees of the orders from 1 on.
func phasors(h []complex128) [][2]float64 {
	list := make([][2]float64, 0, len(h))
	for _, c := range h[1:] {
		r, phase := cmplx.Polar(c)
		list = append(list, [2]float64{r, phase * 180 / math.Pi})
	}
	return list
}

// TankJSON writes the corners for programs.
func TankJSON(w io.Writer, r TankReport) error {
	f := r.Figures
	warnings := []tankWarning{}
	for k := range r.Corners {
		for _, x := range r.Corners[k].Warnings {
			warnings = append(warnings, tankWarning{r.Corners[k].Corner.Name, x.Code, ASCII(x.Text)})
		}
	}
	return JSON(w, struct {
		Format   int           `json:"format"`
		Title    string        `json:"title"`
		Tank     tankNumbers   `json:"tank"`
		Corners  []TankCorner  `json:"corners"`
		Warnings []tankWarning `json:"warnings"`
	}{1, r.Title, tankNumbers{f.ResonantFrequency, f.SecondResonance, f.InductanceRatio, f.CharacteristicImpedance,
		f.EquivalentResistance, f.Q, f.ShortedPeak}, TankCorners(r.Corners, r.Reach), warnings})
}

type tankWarning struct {
	Corner string `json:"corner"`
	Code   string `json:"code"`
	Text   string `json:"text"`
}

type tankNumbers struct {
	ResonantFrequency       float64 `json:"resonant_frequency"`
	SecondResonance         float64 `json:"second_resonance"`
	InductanceRatio         float64 `json:"inductance_ratio"`
	CharacteristicImpedance float64 `json:"characteristic_impedance"`
	EquivalentResistance    float64 `json:"equivalent_resistance"`
	Q                       float64 `json:"q"`
	ShortedPeak             float64 `json:"shorted_peak_current"`
}
