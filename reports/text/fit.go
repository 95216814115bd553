package text

import (
	"fmt"
	"io"
	"math"
	"slices"
	"strings"

	"gapwright/corelib/material"
)

// A FitReport is what the fit of loss points came to.
type FitReport struct {
	File       string
	Fits       []material.Fit // one per band, with ID and provenance filled in
	Suggested  float64        // Hz, border that would help; 0: none
	WouldBe    float64        // rms residual with that border
	Remarks    []string       // about the rows
	FerriteRow []string       // heading and row for ferrites.csv; empty when no row can be given
	LossRows   []string       // heading and rows for ferrite-loss.csv
}

// Fit writes the fit for people: the sets, every point with its residual, a plot
// of the residuals and the rows for the user's own table.
func Fit(p *Printer, r FitReport) error {
	t := Table{Head: []string{"set", "points", "kHz", "mT", "°C", "k", "alpha", "beta", "tau", "rms %", "worst %"}, Left: []int{0, 2, 3, 4, 8}}
	for _, f := range r.Fits {
		s := f.Set
		alpha := trimmed(s.Alpha, 4)
		if !f.AlphaKnown {
			alpha = "not found"
		}
		beta := trimmed(s.Beta, 4)
		if f.BetaHeld {
			beta += " (held)"
		}
		t.Add(s.ID, fmt.Sprint(len(f.Points)), span(s.FMin/1e3, s.FMax/1e3), span(1e3*s.BMin, 1e3*s.BMax), span(pointSpan(f)), fmt.Sprintf("%.5g", s.K), alpha, beta, tau(s),
			fmt.Sprintf("%.2f", 100*s.RMS), fmt.Sprintf("%.2f", 100*s.Worst))
	}
	p.Line("P = k f^alpha B^beta tau(T), W/m³ with f in Hz and B in T (peak); least squares of ln P, equal weights")
	p.Line("")
	p.Table(t)
	for _, f := range r.Fits {
		if low, ok := f.Set.LeastLossTemperature(); ok {
			p.Paragraph(2, "%s: least loss at %.0f °C.", f.Set.ID, low)
		}
		if f.QuadraticF > 0 {
			p.Paragraph(2, "%s: with a term (ln f)² the rms residual would be %.2f %%.", f.Set.ID, 100*f.QuadraticF)
		}
		for _, w := range f.Warnings {
			p.Paragraph(2, "%s: note: %s.", f.Set.ID, w)
		}
	}
	if r.Suggested > 0 {
		p.Paragraph(2, "Two bands that meet at %s kHz (--borders %skHz) would bring the rms residual to %.1f %%.", trimmed(r.Suggested/1e3, 3), trimmed(r.Suggested/1e3, 3), 100*r.WouldBe)
	}
	p.Line("")
	letters := fluxLetters(r.Fits)
	t = Table{Head: []string{"set", "line", "kHz", "mT", "", "°C", "kW/m³", "fit", "residual %"}, Left: []int{0, 4}}
	for _, f := range r.Fits {
		for i, pt := range f.Points {
			at := "-"
			if !math.IsNaN(pt.T) {
				at = trimmed(pt.T, 1)
			}
			t.Add(f.Set.ID, fmt.Sprint(pt.Line), trimmed(pt.F/1e3, 3), trimmed(1e3*pt.B, 2), letters.of(pt.B), at, digits(pt.P/1e3, 4), digits(f.Value(pt)/1e3, 4),
				fmt.Sprintf("%+.2f", 100*math.Expm1(f.Residuals[i])))
		}
	}
	p.Table(t)
	p.Line("")
	residualPlot(p, r.Fits, letters)
	if len(r.LossRows) == 0 {
		for _, remark := range r.Remarks {
			p.Paragraph(2, "%s", remark)
		}
		return p.Err()
	}
	p.Line("")
	p.Line("Rows for a folder of your own (use it with --library FOLDER):")
	p.Line("")
	p.Line("ferrites.csv")
	for _, row := range r.FerriteRow {
		p.Line("%s", row)
	}
	p.Line("")
	p.Line("ferrite-loss.csv")
	for _, row := range r.LossRows {
		p.Line("%s", row)
	}
	p.Line("")
	for _, remark := range r.Remarks {
		p.Paragraph(2, "%s", remark)
	}
	return p.Err()
}

func span(a, b float64) string {
	if a == b {
		return trimmed(a, 2)
	}
	return trimmed(a, 2) + "-" + trimmed(b, 2)
}

// pointSpan returns the temperatures that the points of a fit lie between.
func pointSpan(f material.Fit) (low, high float64) {
	if math.IsNaN(f.Points[0].T) {
		return f.Set.TRef, f.Set.TRef
	}
	low, high = math.Inf(1), math.Inf(-1)
	for _, p := range f.Points {
		low, high = min(low, p.T), max(high, p.T)
	}
	return low, high
}

// letterList gives every flux density a letter, which marks it in plots.
type letterList struct{ fluxes []float64 }

func fluxLetters(fits []material.Fit) letterList {
	var l letterList
	for _, f := range fits {
		for _, p := range f.Points {
			l.fluxes = append(l.fluxes, p.B)
		}
	}
	slices.Sort(l.fluxes)
	l.fluxes = slices.CompactFunc(l.fluxes, func(a, b float64) bool { return math.Abs(a-b) <= 1e-3*a })
	return l
}

func (l letterList) of(B float64) string {
	for i, f := range l.fluxes {
		if math.Abs(B-f) <= 1e-3*f {
			if i >= 26 {
				break
			}
			return string(rune('a' + i))
		}
	}
	return "*"
}

// residualPlot draws the residuals in percent over ln f with characters.
func residualPlot(p *Printer, fits []material.Fit, letters letterList) {
	const rows, columns, left = 13, 60, 9
	low, high, worst := math.Inf(1), math.Inf(-1), 0.0
	for _, f := range fits {
		for i, pt := range f.Points {
			low, high = min(low, math.Log(pt.F)), max(high, math.Log(pt.F))
			worst = max(worst, math.Abs(100*math.Expm1(f.Residuals[i])))
		}
	}
	top := max(niceAbove(worst), 0.1)
	grid := make([][]byte, rows)
	for i := range grid {
		grid[i] = []byte(strings.Repeat(" ", columns))
		if i == rows/2 {
			grid[i] = []byte(strings.Repeat("-", columns))
		}
	}
	for _, f := range fits {
		for i, pt := range f.Points {
			x := columns / 2
			if high > low {
				x = int(math.Round((math.Log(pt.F) - low) / (high - low) * (columns - 1)))
			}
			y := rows/2 - int(math.Round(100*math.Expm1(f.Residuals[i])/top*(rows/2)))
			y = min(max(y, 0), rows-1)
			cell := &grid[y][x]
			if *cell != ' ' && *cell != '-' {
				*cell = '+'
				continue
			}
			*cell = letters.of(pt.B)[0]
		}
	}
	p.Line("Residual (measured over fit, %%) against frequency; letters are flux densities, + where several meet")
	for i, line := range grid {
		label := ""
		switch i {
		case 0:
			label = fmt.Sprintf("%+g", top)
		case rows / 2:
			label = "0"
		case rows - 1:
			label = fmt.Sprintf("%+g", -top)
		}
		p.Line("%s", strings.TrimRight(fmt.Sprintf("%*s |%s", left-2, label, line), " "))
	}
	a, b := trimmed(math.Exp(low)/1e3, 1)+" kHz", trimmed(math.Exp(high)/1e3, 1)+" kHz"
	p.Line("%s%s%s", strings.Repeat(" ", left), fmt.Sprintf("%-*s", columns-len(b), a), b)
	var names []string
	for _, f := range letters.fluxes {
		if l := letters.of(f); l != "*" {
			names = append(names, fmt.Sprintf("%s %s", l, trimmed(1e3*f, 2)))
		}
	}
	p.Paragraph(2, "mT: %s", strings.Join(names, ", "))
}

// niceAbove is the next of 1, 2, 5 times a power of ten.
func niceAbove(v float64) float64 {
	if !(v > 0) {
		return 0
	}
	scale := math.Pow(10, math.Floor(math.Log10(v)))
	for _, m := range []float64{1, 2, 5} {
		if v <= m*scale {
			return m * scale
		}
	}
	return 10 * scale
}

// FitJSON writes the fit in SI units.
func FitJSON(w io.Writer, r FitReport) error {
	type point struct {
		Line        int      `json:"line"`
		Frequency   float64  `json:"frequency"`
		FluxDensity float64  `json:"flux_density"`
		Temperature *float64 `json:"temperature"`
		Loss        float64  `json:"loss"`
		Fitted      float64  `json:"fitted"`
		Residual    float64  `json:"residual"` // ln(loss/fitted)
	}
	type set struct {
		lossJSON
		BetaHeld     bool     `json:"beta_held"`
		Correlation  float64  `json:"correlation"`
		RMSQuadratic *float64 `json:"rms_with_ln_f_squared"`
		LeastLoss    *float64 `json:"least_loss_temperature"`
		Warnings     []string `json:"warnings"`
		Residuals    []point  `json:"residuals"`
	}
	sets := make([]set, 0, len(r.Fits))
	for _, f := range r.Fits {
		s := set{lossJSON: lossToJSON(f.Set), BetaHeld: f.BetaHeld, Correlation: f.Correlation, RMSQuadratic: known(f.QuadraticF), Warnings: slices.Concat([]string{}, f.Warnings)}
		s.RMS, s.Worst = &f.Set.RMS, &f.Set.Worst
		if low, ok := f.Set.LeastLossTemperature(); ok {
			s.LeastLoss = &low
		}
		for i, p := range f.Points {
			row := point{Line: p.Line, Frequency: p.F, FluxDensity: p.B, Loss: p.P, Fitted: f.Value(p), Residual: f.Residuals[i]}
			if !math.IsNaN(p.T) {
				row.Temperature = &p.T
			}
			s.Residuals = append(s.Residuals, row)
		}
		sets = append(sets, s)
	}
	type rows struct {
		Ferrites []string `json:"ferrites.csv"`
		Loss     []string `json:"ferrite-loss.csv"`
	}
	return JSON(w, struct {
		Format    int      `json:"format"`
		Sets      []set    `json:"sets"`
		Suggested *float64 `json:"suggested_border"`
		Rows      *rows    `json:"rows"`
		Remarks   []string `json:"remarks"`
	}{1, sets, known(r.Suggested), func() *rows {
		if len(r.LossRows) == 0 {
			return nil
		}
		return &rows{r.FerriteRow, r.LossRows}
	}(), slices.Concat([]string{}, r.Remarks)})
}
