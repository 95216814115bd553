package text

import (
	"fmt"
	"io"
	"math"
	"strings"

	"gapwright/corelib/material"
)

// usualPoints are where the list of ferrites gives losses: points that
// catalogues print, all at 100 °C.
var usualPoints = [...]struct{ f, B float64 }{{100e3, 0.2}, {300e3, 0.1}, {500e3, 0.05}, {1e6, 0.03}}

// lossFrequencies and lossFluxes are the rows and columns of the table of losses
// of one ferrite.
var (
	lossFrequencies = [...]float64{50e3, 70e3, 100e3, 150e3, 200e3, 300e3, 400e3, 500e3, 700e3, 1e6, 2e6, 3e6}
	lossFluxes      = [...]float64{0.01, 0.02, 0.03, 0.05, 0.07, 0.1, 0.15, 0.2, 0.25}
)

// Materials writes the list of ferrites for people.
func Materials(p *Printer, list []*material.Ferrite) error {
	head := []string{"ferrite", "", "class", "mu_i", "Bs mT"}
	var points []string
	for _, u := range usualPoints {
		head = append(head, fmt.Sprintf("%.0f kHz", u.f/1e3))
		points = append(points, fmt.Sprintf("%.0f kHz and %.0f mT", u.f/1e3, u.B*1e3))
	}
	t := Table{Head: append(head, "loss sets", "kHz"), Left: []int{0, 1, 2, 9, 10}}
	var memory, own, extrapolated bool
	for _, m := range list {
		marks := ""
		if m.OnRequest {
			marks += "r"
		}
		if fromMemory(m) {
			marks += "m"
			memory = true
		}
		if len(m.OwnRows()) > 0 {
			marks += "+"
			own = true
		}
		row := []string{m.Name, marks, m.Class, digits(m.MuI(25).Value, 3), fmt.Sprintf("%.0f/%.0f", 1e3*m.Bsat(25), 1e3*m.Bsat(100))}
		for _, u := range usualPoints {
			l, err := m.LossDensity(u.f, u.B, 100)
			switch {
			case err != nil:
				row = append(row, "-")
			case farOutside(l.Outside):
				row = append(row, "-")
			case l.Outside.Any():
				row = append(row, "~"+digits(l.Density/1e3, 3))
				extrapolated = true
			default:
				row = append(row, digits(l.Density/1e3, 3))
			}
		}
		var sets []string
		for _, s := range m.Loss {
			sets = append(sets, s.ID)
		}
		first, last := m.Loss[0], m.Loss[len(m.Loss)-1]
		t.Add(append(row, strings.Join(sets, ", "), fmt.Sprintf("%.4g-%.4g", first.FMin/1e3, last.FMax/1e3))...)
	}
	p.Table(t)
	p.Line("")
	p.Paragraph(2, "%d ferrites. mu_i at 25 °C, saturation at 25 and 100 °C; losses in kW/m³ at 100 °C and %s.", len(list), strings.Join(points, ", "))
	p.Paragraph(2, "r: searched only when a job names it.")
	if memory {
		p.Paragraph(2, "m: loss figures from memory (W202).")
	}
	if extrapolated {
		p.Paragraph(2, "~: outside the range of the loss sets; -: outside by more than a factor of two.")
	}
	if own {
		p.Paragraph(2, "+: holds rows of your own.")
	}
	return p.Err()
}

// fromMemory reports whether the losses of m, hot or cold, were recalled.
func fromMemory(m *material.Ferrite) bool {
	for _, s := range m.Loss {
		if s.FromMemory() {
			return true
		}
		if s.Heat == material.HeatRatio {
			for _, h := range m.Heat.Hot {
				if h.FromMemory() {
					return true
				}
			}
		}
	}
	return false
}

// farOutside reports whether an extrapolation is not worth printing.
func farOutside(o material.Outside) bool {
	far := func(ratio float64) bool { return ratio > 2.001 || ratio > 0 && ratio < 0.499 }
	return far(o.F) || far(o.B) || math.Abs(o.T) > 50
}

var figureNames = map[string]string{
	"saturation": "saturation", "permeability": "mu_i", "curie": "Curie point", "density": "density",
	"resistivity": "resistivity", "thermal-conductivity": "heat conduct.",
}

// Material writes everything known about one ferrite; temp in °C is that of the
// table of losses.
func Material(p *Printer, m *material.Ferrite, temp float64) error {
	class := m.Class
	if class == "" {
		class = "no class stated"
	} else {
		class += " of " + m.Edition
	}
	p.Line("%s   %s", m.Name, strings.TrimSpace(m.Base+" ferrite, class "+class))
	use := "Searched by default."
	if m.OnRequest {
		use = "Searched only when a job names it (materials: [" + m.Name + "])."
	}
	p.Paragraph(2, "%s Confidence: %s. Source: %s.", use, m.Confidence, m.Source)
	if m.Like != "" {
		p.Paragraph(2, "Where it has no figures of its own, those of %s stand in.", m.Like)
	}
	if m.Note != "" {
		p.Paragraph(2, "Note: %s.", m.Note)
	}
	for _, f := range m.OwnRows() {
		p.Paragraph(2, "Your own rows: %s.", f)
	}
	p.Line("")

	p.Line("Figures")
	t := Table{Head: []string{"", "at °C", "value", "least", "most", "unit", "confidence", "source"}, Left: []int{0, 5, 6, 7}}
	src := sources{}
	for _, f := range m.Figures {
		at, scale, unit := "-", 1.0, f.SI
		if !math.IsNaN(f.Temperature) {
			at = trimmed(f.Temperature, 0)
		}
		switch unit {
		case "T":
			scale, unit = 1e3, "mT"
		case "1":
			unit = ""
		case "degC":
			unit = "°C"
		}
		t.Add(figureNames[f.Kind], at, short(scale*f.Value), short(scale*f.Low), short(scale*f.High), unit, f.Confidence, src.mark(f.Provenance))
	}
	p.Table(t)
	p.Line("")

	p.Line("Against temperature")
	temps := []float64{0, 25, 40, 60, 80, 100, 110, 120, 140}
	head := []string{"°C"}
	bs, mu, heat := []string{"saturation, mT"}, []string{"mu_i"}, []string{fmt.Sprintf("loss at %.0f kHz over 25 °C", lossFrequency(m)/1e3)}
	cold, errCold := m.LossDensity(lossFrequency(m), 0.1, 25)
	for _, at := range temps {
		head = append(head, trimmed(at, 0))
		bs = append(bs, digits(1e3*m.Bsat(at), 3))
		mu = append(mu, digits(m.MuI(at).Value, 3))
		l, err := m.LossDensity(lossFrequency(m), 0.1, at)
		if err != nil || errCold != nil {
			heat = append(heat, "-")
			continue
		}
		outside := ""
		if l.Outside.T != 0 {
			outside = "~"
		}
		heat = append(heat, outside+digits(l.Density/cold.Density, 2))
	}
	t = Table{Head: head, Left: []int{0}}
	t.Add(bs...)
	t.Add(mu...)
	t.Add(heat...)
	p.Table(t)
	p.Line("")

	p.Line("Loss sets: P = k f^alpha B^beta tau(T), W/m³ with f in Hz and B in T (peak)")
	t = Table{Head: []string{"set", "k", "alpha", "beta", "kHz", "mT", "°C", "tau", "points", "rms %", "worst %", "band %", "source"}, Left: []int{0, 4, 5, 6, 7, 12}}
	for _, s := range m.Loss {
		flux := "not stated"
		if s.BMax > 0 {
			flux = fmt.Sprintf("%s-%s", trimmed(1e3*s.BMin, 1), trimmed(1e3*s.BMax, 1))
		}
		t.Add(s.ID, fmt.Sprintf("%.5g", s.K), trimmed(s.Alpha, 4), trimmed(s.Beta, 4), fmt.Sprintf("%s-%s", trimmed(s.FMin/1e3, 1), trimmed(s.FMax/1e3, 1)), flux,
			fmt.Sprintf("%s-%s", trimmed(s.TMin, 0), trimmed(s.TMax, 0)), tau(s), count(s.Points), perHundred(s.RMS), perHundred(s.Worst), perHundred(s.Band), src.mark(s.Provenance))
	}
	p.Table(t)
	if len(m.Loss) > 1 {
		p.Paragraph(2, "Between the middles of neighbouring bands ln P goes over smoothly from one set to the next.")
	}
	if len(m.Heat.Hot) > 0 && usesRatio(m) {
		p.Line("")
		p.Line("Hot over cold (%g over %g °C), linear in ln f", m.Heat.Hot[0].Temperature, m.Loss[0].TRef)
		t = Table{Head: []string{"kHz", "ratio", "source"}, Left: []int{2}}
		for _, h := range m.Heat.Hot {
			t.Add(trimmed(h.F/1e3, 1), trimmed(h.Value, 3), src.mark(h.Provenance))
		}
		p.Table(t)
		var column []string
		for _, h := range m.Heat.Column {
			column = append(column, fmt.Sprintf("%s at %s °C", digits(h.Value, 4), trimmed(h.Temperature, 0)))
		}
		p.Paragraph(2, "Shape in temperature: %s (%s).", strings.Join(column, ", "), src.mark(m.Heat.Column[0].Provenance))
	}
	p.Line("")
	lossTable(p, m, temp)
	p.Line("")
	p.Line("Sources")
	for i, s := range src.list {
		p.Paragraph(6, "  %s", fmt.Sprintf("[%d] %s", i+1, s))
	}
	return p.Err()
}

// short prints up to four digits without trailing zeros or exponent.
func short(v float64) string {
	text := digits(v, 4)
	if strings.Contains(text, ".") {
		text = strings.TrimRight(strings.TrimRight(text, "0"), ".")
	}
	return text
}

// lossFrequency is where the temperature factor is shown: 100 kHz, or the middle
// of the sets when that is outside.
func lossFrequency(m *material.Ferrite) float64 {
	first, last := m.Loss[0], m.Loss[len(m.Loss)-1]
	if first.FMin <= 100e3 && 100e3 <= last.FMax {
		return 100e3
	}
	f := math.Sqrt(first.FMin * last.FMax)
	scale := math.Pow(10, math.Floor(math.Log10(f)))
	return math.Round(f/scale) * scale
}

func usesRatio(m *material.Ferrite) bool {
	for _, s := range m.Loss {
		if s.Heat == material.HeatRatio {
			return true
		}
	}
	return false
}

func tau(s material.LossSet) string {
	switch s.Heat {
	case material.HeatNone:
		return "1"
	case material.HeatRatio:
		return "hot over cold"
	case material.HeatLogQuadratic:
		return fmt.Sprintf("exp(%.4g d %+.4g d²), d = T - %g", s.A[1], s.A[2], s.TRef)
	}
	return fmt.Sprintf("%.4g - %.4g T + %.4g T²", s.A[0], s.A[1], s.A[2])
}

func count(n int) string {
	if n == 0 {
		return "-"
	}
	return fmt.Sprint(n)
}

func perHundred(v float64) string {
	if v == 0 {
		return "-"
	}
	return digits(100*v, 2)
}

func lossTable(p *Printer, m *material.Ferrite, temp float64) {
	p.Line("Losses of a sine at %g °C, kW/m³", temp)
	head := []string{"kHz"}
	for _, B := range lossFluxes {
		head = append(head, fmt.Sprintf("%.0f mT", 1e3*B))
	}
	t := Table{Head: head}
	var marked bool
	for _, f := range lossFrequencies {
		row := []string{trimmed(f/1e3, 0)}
		shown := false
		for _, B := range lossFluxes {
			l, err := m.LossDensity(f, B, temp)
			// Above 10 W/cm³ a core is not cooled by anything, below 0.1 mW/cm³ nobody asks.
			if err != nil || farOutside(l.Outside) || l.Density > 1e7 || l.Density < 100 {
				row = append(row, "")
				continue
			}
			cell := digits(l.Density/1e3, 3)
			if l.Outside.Any() {
				cell = "~" + cell
				marked = true
			}
			shown = true
			row = append(row, cell)
		}
		if shown {
			t.Add(row...)
		}
	}
	p.Table(t)
	if marked {
		p.Paragraph(2, "~: outside the range of the loss sets.")
	}
	if w := m.LossWarnings(mustPoint(m, temp)); len(w) > 0 {
		for _, one := range w {
			if one.Code == "W202" {
				p.Paragraph(2, "%s %s.", one.Code, one.Text)
			}
		}
	}
}

// mustPoint is a point in the middle of the sets, for their warnings.
func mustPoint(m *material.Ferrite, temp float64) material.LossPoint {
	l, err := m.LossDensity(lossFrequency(m), 0.1, temp)
	if err != nil {
		return material.LossPoint{}
	}
	return l
}

// sources numbers the sources of a report in the order of their first use.
type sources struct{ list []string }

func (s *sources) mark(p material.Provenance) string {
	text := p.Source + " (" + p.Confidence
	if p.Origin != "" {
		text += "; your own row, " + p.Origin
	}
	text += ")"
	for i, have := range s.list {
		if have == text {
			return fmt.Sprintf("[%d]", i+1)
		}
	}
	s.list = append(s.list, text)
	return fmt.Sprintf("[%d]", len(s.list))
}

// MaterialsJSON writes ferrites in SI units, with every figure and its source.
func MaterialsJSON(w io.Writer, list []*material.Ferrite) error {
	type provenance struct {
		Source     string `json:"source"`
		Confidence string `json:"confidence"`
		Origin     string `json:"origin,omitempty"`
	}
	from := func(p material.Provenance) provenance { return provenance{p.Source, p.Confidence, p.Origin} }
	type figure struct {
		Figure      string   `json:"figure"`
		Temperature *float64 `json:"temperature"`
		Value       float64  `json:"value"`
		Low         float64  `json:"low"`
		High        float64  `json:"high"`
		Unit        string   `json:"unit"`
		provenance
	}
	type point struct {
		Kind        string  `json:"kind"`
		Frequency   float64 `json:"frequency"`
		Temperature float64 `json:"temperature"`
		Value       float64 `json:"value"`
		provenance
	}
	type ferrite struct {
		Name      string     `json:"name"`
		Class     string     `json:"class"`
		Edition   string     `json:"edition"`
		Base      string     `json:"base"`
		OnRequest bool       `json:"on_request"`
		Like      string     `json:"like,omitempty"`
		Note      string     `json:"note,omitempty"`
		OwnRows   []string   `json:"own_rows,omitempty"`
		Figures   []figure   `json:"figures"`
		LossSets  []lossJSON `json:"loss_sets"`
		Heat      []point    `json:"heat"`
		provenance
	}
	ferrites := make([]ferrite, 0, len(list))
	for _, m := range list {
		f := ferrite{Name: m.Name, Class: m.Class, Edition: m.Edition, Base: m.Base, OnRequest: m.OnRequest, Like: m.Like, Note: m.Note,
			OwnRows: m.OwnRows(), Heat: []point{}, provenance: from(m.Provenance)}
		for _, g := range m.Figures {
			row := figure{Figure: g.Kind, Value: g.Value, Low: g.Low, High: g.High, Unit: g.SI, provenance: from(g.Provenance)}
			if !math.IsNaN(g.Temperature) {
				row.Temperature = &g.Temperature
			}
			f.Figures = append(f.Figures, row)
		}
		for _, s := range m.Loss {
			f.LossSets = append(f.LossSets, lossToJSON(s))
		}
		if usesRatio(m) {
			for _, h := range m.Heat.Hot {
				f.Heat = append(f.Heat, point{"hot-over-cold", h.F, h.Temperature, h.Value, from(h.Provenance)})
			}
			for _, h := range m.Heat.Column {
				f.Heat = append(f.Heat, point{"column", h.F, h.Temperature, h.Value, from(h.Provenance)})
			}
		}
		ferrites = append(ferrites, f)
	}
	return JSON(w, struct {
		Format    int       `json:"format"`
		Materials []ferrite `json:"materials"`
	}{1, ferrites})
}

// lossJSON is a loss set as programs get it; unknown figures are null.
type lossJSON struct {
	Set         string      `json:"set"`
	K           float64     `json:"k"`
	Alpha       *float64    `json:"alpha"` // null: not found
	Beta        float64     `json:"beta"`
	Frequency   [2]float64  `json:"frequency"`
	FluxDensity *[2]float64 `json:"flux_density"`
	Temperature [2]float64  `json:"temperature"`
	Reference   float64     `json:"reference_temperature"`
	Heat        string      `json:"heat"`
	A           [3]float64  `json:"a"`
	Points      int         `json:"points"`
	RMS         *float64    `json:"rms"`
	Worst       *float64    `json:"worst"`
	Band        *float64    `json:"band"`
	Source      string      `json:"source"`
	Confidence  string      `json:"confidence"`
	Origin      string      `json:"origin,omitempty"`
}

func lossToJSON(s material.LossSet) lossJSON {
	j := lossJSON{Set: s.ID, K: s.K, Alpha: known(s.Alpha), Beta: s.Beta, Frequency: [2]float64{s.FMin, s.FMax}, Temperature: [2]float64{s.TMin, s.TMax},
		Reference: s.TRef, Heat: string(s.Heat), A: s.A, Points: s.Points, RMS: known(s.RMS), Worst: known(s.Worst), Band: known(s.Band),
		Source: s.Source, Confidence: s.Confidence, Origin: s.Origin}
	if s.BMax > 0 {
		j.FluxDensity = &[2]float64{s.BMin, s.BMax}
	}
	return j
}
