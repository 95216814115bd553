package text

import (
	"fmt"
	"io"
	"slices"
	"strings"

	"gapwright/corelib/quantity"
	"gapwright/magnetics/part"
	"gapwright/magnetics/sample"
	"gapwright/tank"
)

// A ReadbackReport is what the shop's readings came to.
type ReadbackReport struct {
	Title   string
	Sheets  []ReadSheet
	Parts   []ReadPart
	Wanted  tank.Tank
	Design  tank.Tank // as designed, both parts as rated
	Built   tank.Tank // as the samples make it, their mean
	Lr      sample.Uncertain
	Lm      sample.Uncertain
	Ratio   sample.Uncertain
	Known   bool   // Built is there
	Why     string // why it is not
	Lext    string // where the inductor's share of Lr comes from
	Samples []SampleTank
	Corners []tank.Operation
	// Verdicts are the limits held against the tank as built.
	Verdicts []part.Verdict
	Meter    sample.Meter
}

// ReadSheet is one sheet that was read.
type ReadSheet struct {
	Path    string
	Part    string
	Samples int
	Forced  bool     // it belongs to another design
	Notes   []string // how cells were understood
	Unread  []string // cells that hold something else than what belongs there
	Missing []string
}

// ReadPart is one part with all samples of all its sheets.
type ReadPart struct {
	Name       string
	Labels     []string // of the samples
	Rows       []ReadRow
	Overall    string // ACCEPT, REJECT, OPEN
	Correction *sample.Correction
	NoGap      string // why no correction is given
	Diagnosis  *sample.Diagnosis
	NoCause    string
	Odd        []string // samples whose first cause is another one
}

// ReadRow is one row of the inspection table.
type ReadRow struct {
	ID, Name, Unit          string
	Scale                   float64
	Nominal, Min, Max, Mean *float64
	Off                     *float64
	Words                   []string
	Result                  string
}

// SampleTank is the tank that one sample makes.
type SampleTank struct {
	Label         string
	Lr, Lm, Ratio sample.Uncertain
	Notes         []string
	Problem       string // when it could not be closed
}

// Readback writes the report for people.
func Readback(p *Printer, r ReadbackReport) error {
	if r.Title != "" {
		p.Line("%s", r.Title)
		p.Line("")
	}
	readSheets(p, r)
	for _, x := range r.Parts {
		readPart(p, x)
	}
	tankBuilt(p, r)
	return p.Err()
}

func readSheets(p *Printer, r ReadbackReport) {
	p.Line("Sheets read")
	for _, s := range r.Sheets {
		forced := ""
		if s.Forced {
			forced = "; BELONGS TO ANOTHER DESIGN, read because of --force"
		}
		p.indented(2, "%s: %s, %d sample(s)%s", s.Path, s.Part, s.Samples, forced)
		for _, n := range s.Notes {
			p.indented(4, "%s", n)
		}
		for _, u := range s.Unread {
			p.indented(4, "NOT READ %s", u)
		}
		if len(s.Missing) > 0 {
			p.indented(4, "cells not found: %s", strings.Join(s.Missing, ", "))
		}
	}
	p.Line("")
}

func readPart(p *Printer, x ReadPart) {
	p.Line("%s: %s", strings.ToUpper(x.Name[:1])+x.Name[1:], x.Overall)
	var fine, open []string
	var rows []ReadRow
	for _, row := range x.Rows {
		filled := slices.ContainsFunc(row.Words, func(w string) bool { return w != "" })
		switch {
		case filled:
			rows = append(rows, row)
			if row.Result == "PASS" {
				fine = append(fine, row.ID)
			}
		case row.Result == "OPEN":
			open = append(open, row.ID)
		}
	}
	if len(rows) > 0 {
		c := columns{left: []int{0, 1, 2}}
		n := len(rows)
		c.words("row", n, func(k int) string { return rows[k].ID })
		c.words("test", n, func(k int) string { return rows[k].Name })
		c.words("unit", n, func(k int) string { return unitOrDash(rows[k].Unit) })
		for _, v := range []struct {
			head string
			get  func(r ReadRow) *float64
		}{
			{"nominal", func(r ReadRow) *float64 { return r.Nominal }}, {"min", func(r ReadRow) *float64 { return r.Min }},
			{"max", func(r ReadRow) *float64 { return r.Max }}, {"mean", func(r ReadRow) *float64 { return r.Mean }},
		} {
			c.words(v.head, n, func(k int) string { return rows[k].number(v.get(rows[k])) })
		}
		c.words("off", n, func(k int) string {
			if rows[k].Off == nil {
				return ""
			}
			return fmt.Sprintf("%+.1f %%", *rows[k].Off*100)
		})
		for i, l := range x.Labels {
			c.words(l, n, func(k int) string { return rows[k].Words[i] })
		}
		c.words("result", n, func(k int) string { return rows[k].Result })
		c.print(p)
	}
	if len(fine) > 0 {
		p.Paragraph(2, "Fine: %s.", strings.Join(fine, ", "))
	}
	if len(open) > 0 {
		p.Paragraph(2, "Not measured: %s.", strings.Join(open, ", "))
	}
	if d := x.Diagnosis; d != nil {
		p.Line("")
		p.Line("Likely causes, from the median of the samples")
		for i, c := range d.Causes {
			if i > 0 && (c.Probability < 0.02 || i > 3) {
				break
			}
			p.indented(2, "%d. %s (%.0f %%): %s", i+1, c.Class, c.Probability*100, c.Text)
			if i == 0 && c.Misfit > 3 {
				p.indented(5, "even this leaves %.1f standard deviations: more than one thing may be wrong", c.Misfit)
			}
		}
		if d.Next != "" {
			p.indented(2, "To tell the first two apart: %s.", d.Next)
			if d.Reason != "" {
				p.indented(4, "%s", d.Reason)
			}
		}
		for _, o := range x.Odd {
			p.indented(2, "%s", o)
		}
	} else if x.NoCause != "" {
		p.Paragraph(2, "No causes given: %s.", x.NoCause)
	}
	if c := x.Correction; c != nil {
		p.Line("")
		p.Line("Gap")
		for i, s := range c.Steps {
			p.indented(2, "%d. %s", i+1, s)
		}
	} else if x.NoGap != "" {
		p.Paragraph(2, "No gap correction given: %s.", x.NoGap)
	}
	p.Line("")
}

// indented prints a wrapped text that stands n columns in.
func (p *Printer) indented(n int, format string, args ...any) {
	p.item(n, "", fmt.Sprintf(format, args...))
}

func unitOrDash(s string) string {
	if s == "" {
		return "-"
	}
	return quantity.Sign(s)
}

func (r ReadRow) number(v *float64) string {
	if v == nil {
		return "-"
	}
	return significant(*v/r.Scale, 4)
}

func tankBuilt(p *Printer, r ReadbackReport) {
	p.Line("Tank as built")
	if !r.Known {
		p.indented(2, "not rebuilt: %s", r.Why)
		return
	}
	t := Table{Head: []string{"", "wanted", "designed", "as built", "+/-"}, Left: []int{0}}
	row := func(name string, u quantity.Unit, wanted, designed float64, built sample.Uncertain) {
		w := "-"
		if wanted > 0 {
			w = format(wanted, u)
		}
		t.Add(name, w, format(designed, u), format(built.Value, u), format(2*built.Sigma, u))
	}
	row("Lr", quantity.Henry, r.Wanted.Lr, r.Design.Lr, r.Lr)
	row("Lm", quantity.Henry, r.Wanted.Lm, r.Design.Lm, r.Lm)
	t.Add("turns ratio", significant(r.Wanted.TurnsRatio, 4), significant(r.Design.TurnsRatio, 4), significant(r.Ratio.Value, 4), significant(2*r.Ratio.Sigma, 2))
	p.Table(t)
	p.Paragraph(2, "+/- is two standard deviations: meter (inductance %.2g %%, ratio %.2g %%, %.0f nH left in the short) and spread of the samples. %s",
		r.Meter.Inductance*100, r.Meter.Ratio*100, r.Meter.ShortLoop*1e9, r.Lext)
	if len(r.Samples) > 0 {
		p.Line("")
		t := Table{Head: []string{"sample", "Lr", "+/-", "Lm", "+/-", "turns ratio", "+/-"}, Left: []int{0}}
		for _, s := range r.Samples {
			if s.Problem != "" {
				t.Add(s.Label, "-", "-", "-", "-", "-", "-")
				continue
			}
			t.Add(s.Label, format(s.Lr.Value, quantity.Henry), format(2*s.Lr.Sigma, quantity.Henry), format(s.Lm.Value, quantity.Henry), format(2*s.Lm.Sigma, quantity.Henry),
				significant(s.Ratio.Value, 4), significant(2*s.Ratio.Sigma, 2))
		}
		p.Table(t)
		for _, s := range r.Samples {
			if s.Problem != "" {
				p.indented(2, "%s: %s", s.Label, s.Problem)
			}
			for _, n := range s.Notes {
				p.indented(2, "%s: %s", s.Label, n)
			}
		}
	}
	p.Line("")
	p.Line("Corners with the tank as built")
	corners := Table{Head: []string{"corner", "status", "f", "Ir rms", "Ir peak", "Im peak", "gain margin", "soft switching"}, Left: []int{0, 1}}
	for i := range r.Corners {
		o := &r.Corners[i]
		if o.Status != tank.OK {
			corners.Add(o.Corner.Name, string(o.Status), "-", "-", "-", "-", "-", "-")
			continue
		}
		gain := "-"
		if o.PeakOutputVoltage > 0 {
			gain = fmt.Sprintf("%.1f %%", o.PeakGainMargin*100)
		}
		soft := "not assessed"
		if s := o.SoftSwitching; s != nil {
			soft = "incomplete"
			if s.Complete {
				soft = "complete"
			}
		}
		corners.Add(o.Corner.Name, string(o.Status), format(o.Frequency, quantity.Hertz), format(o.Resonant.RMS, quantity.Ampere), format(o.Resonant.Peak, quantity.Ampere),
			format(o.Magnetizing.Peak, quantity.Ampere), gain, soft)
	}
	p.Table(corners)
	for i := range r.Corners {
		if o := &r.Corners[i]; o.Status != tank.OK {
			p.indented(2, "%s: %s", o.Corner.Name, o.Reason)
		}
	}
	missed := 0
	for _, v := range r.Verdicts {
		if v.Pass {
			continue
		}
		if missed == 0 {
			p.Line("")
		}
		missed++
		at := ""
		if v.Corner != "" {
			at = " at corner " + v.Corner
		}
		p.Paragraph(2, "MISSED %s%s: %s, limit %s %s", v.Limit, at, plainValue(v.Value, v.Unit), v.Sense, plainValue(v.Bound, v.Unit))
	}
	if missed == 0 && len(r.Verdicts) > 0 {
		p.Paragraph(2, "All %d limits of the tank are kept with the parts as built.", len(r.Verdicts))
	}
}

func plainValue(v float64, unit string) string {
	switch unit {
	case "", "1":
		return significant(v, 4)
	case "%":
		return significant(v, 4) + " %"
	}
	return significant(v, 4) + " " + unit
}

// ReadbackJSON writes the report for programs, in SI.
func ReadbackJSON(w io.Writer, r ReadbackReport) error {
	type row struct {
		ID      string   `json:"id"`
		Name    string   `json:"name"`
		Nominal *float64 `json:"nominal"`
		Min     *float64 `json:"min"`
		Max     *float64 `json:"max"`
		Mean    *float64 `json:"mean"`
		Samples []string `json:"samples"`
		Result  string   `json:"result"`
	}
	type cause struct {
		Class       string  `json:"class"`
		Text        string  `json:"text"`
		Probability float64 `json:"probability"`
		Misfit      float64 `json:"misfit"`
	}
	type correction struct {
		Kind     string    `json:"kind"`
		Measured float64   `json:"measured"`
		Target   float64   `json:"target"`
		GapNow   float64   `json:"gap_now"`
		Ground   float64   `json:"ground_change"`
		Film     float64   `json:"film_change"`
		Stack    []float64 `json:"film_stack"`
		StackL   float64   `json:"expected_inductance"`
		Enough   bool      `json:"within_tolerance"`
		Steps    []string  `json:"steps"`
	}
	type partOut struct {
		Part       string      `json:"part"`
		Verdict    string      `json:"verdict"`
		Rows       []row       `json:"rows"`
		Causes     []cause     `json:"causes"`
		Next       string      `json:"next_measurement"`
		Correction *correction `json:"gap_correction"`
	}
	type sheetOut struct {
		Path    string   `json:"path"`
		Part    string   `json:"part"`
		Samples int      `json:"samples"`
		Forced  bool     `json:"forced"`
		Notes   []string `json:"notes"`
		Unread  []string `json:"unread"`
		Missing []string `json:"missing"`
	}
	type sampleOut struct {
		Sample  string            `json:"sample"`
		Lr      *sample.Uncertain `json:"resonant_inductance"`
		Lm      *sample.Uncertain `json:"magnetizing_inductance"`
		Ratio   *sample.Uncertain `json:"turns_ratio"`
		Problem string            `json:"problem"`
	}
	type tankOut struct {
		Lr      sample.Uncertain `json:"resonant_inductance"`
		Lm      sample.Uncertain `json:"magnetizing_inductance"`
		Ratio   sample.Uncertain `json:"turns_ratio"`
		Cr      float64          `json:"resonant_capacitance"`
		Corners []TankCorner     `json:"corners"`
	}
	out := struct {
		Format   int            `json:"format"`
		Title    string         `json:"title"`
		Sheets   []sheetOut     `json:"sheets"`
		Parts    []partOut      `json:"parts"`
		Samples  []sampleOut    `json:"samples"`
		Tank     *tankOut       `json:"tank_as_built"`
		Why      string         `json:"reason"`
		Verdicts []part.Verdict `json:"verdicts"`
	}{Format: 1, Title: r.Title, Why: r.Why, Verdicts: append([]part.Verdict{}, r.Verdicts...), Sheets: []sheetOut{}, Parts: []partOut{}, Samples: []sampleOut{}}
	list := func(s []string) []string { return append([]string{}, s...) }
	for _, s := range r.Sheets {
		out.Sheets = append(out.Sheets, sheetOut{s.Path, s.Part, s.Samples, s.Forced, list(s.Notes), list(s.Unread), list(s.Missing)})
	}
	for _, x := range r.Parts {
		o := partOut{Part: x.Name, Verdict: x.Overall, Rows: []row{}, Causes: []cause{}}
		for _, v := range x.Rows {
			o.Rows = append(o.Rows, row{v.ID, v.Name, v.Nominal, v.Min, v.Max, v.Mean, list(v.Words), v.Result})
		}
		if x.Diagnosis != nil {
			o.Next = x.Diagnosis.Next
			for _, c := range x.Diagnosis.Causes {
				o.Causes = append(o.Causes, cause{string(c.Class), c.Text, c.Probability, c.Misfit})
			}
		}
		if c := x.Correction; c != nil {
			o.Correction = &correction{string(c.Kind), c.Measured, c.Target, c.GapNow, c.Ground, c.Film, append([]float64{}, c.Stack...), c.StackL, c.Enough, list(c.Steps)}
		}
		out.Parts = append(out.Parts, o)
	}
	for _, s := range r.Samples {
		o := sampleOut{Sample: s.Label, Problem: s.Problem}
		if s.Problem == "" {
			o.Lr, o.Lm, o.Ratio = &s.Lr, &s.Lm, &s.Ratio
		}
		out.Samples = append(out.Samples, o)
	}
	if r.Known {
		out.Tank = &tankOut{Lr: r.Lr, Lm: r.Lm, Ratio: r.Ratio, Cr: r.Built.Cr, Corners: TankCorners(r.Corners, nil)}
	}
	return JSON(w, out)
}
