package figure

import (
	"fmt"
	"math"
	"slices"

	"gapwright/corelib/material"
)

// Residuals draws how far measured losses lie from their fit, in percent, over the
// frequency on a logarithmic scale. A letter stands for a flux density, a shade for
// a loss set.
func Residuals(title string, fits []material.Fit) (Picture, error) {
	const width, height, left, right, top, bottom = 160.0, 96.0, 18.0, 34.0, 16.0, 16.0
	low, high, worst := math.Inf(1), math.Inf(-1), 0.0
	var fluxes []float64
	for _, f := range fits {
		for i, p := range f.Points {
			low, high = min(low, p.F), max(high, p.F)
			worst = max(worst, math.Abs(100*math.Expm1(f.Residuals[i])))
			fluxes = append(fluxes, p.B)
		}
	}
	if len(fluxes) == 0 {
		return Picture{}, fmt.Errorf("figure: no points to draw")
	}
	slices.Sort(fluxes)
	same := func(a, b float64) bool { return math.Abs(a-b) <= 1e-3*a }
	fluxes = slices.CompactFunc(fluxes, same)
	letter := func(B float64) string {
		if i := slices.IndexFunc(fluxes, func(f float64) bool { return same(f, B) }); i >= 0 && i < 26 {
			return string(rune('a' + i))
		}
		return "*"
	}
	limit := max(oneTwoFive(worst), 0.1)
	l0, l1 := math.Log(low)-0.08, math.Log(high)+0.08
	x := func(f float64) float64 { return left + (math.Log(f)-l0)/(l1-l0)*(width-left-right) }
	y := func(r float64) float64 { return top + (1-r/limit)/2*(height-top-bottom) }

	s := &sketch{width: width, height: height}
	s.text(left, 6, 4, "start", "%s", title).bold = true
	s.text(left, 11, 3, "start", "measured loss over the fit, minus one")
	s.rect("frame", left, top, width-left-right, height-top-bottom, "", inkColour, 0.25)
	for _, r := range []float64{-1, -0.5, 0, 0.5, 1} {
		m := s.line("grid", left, y(r*limit), width-right, y(r*limit), 0.15, faintColour)
		m.dashed = r != 0
		label := "0"
		if r != 0 {
			label = fmt.Sprintf("%+g %%", r*limit)
		}
		s.text(left-2, y(r*limit)+1, 2.8, "end", "%s", label)
	}
	for _, f := range ticks(low, high) {
		s.line("grid", x(f), top, x(f), height-bottom, 0.12, faintColour).dashed = true
		s.text(x(f), height-bottom+4.5, 2.8, "middle", "%g", f/1e3)
	}
	s.text((left+width-right)/2, height-4, 3, "middle", "frequency, kHz")
	colours := []string{primaryColour, otherHalfColour, spacerColour, screenColour}
	for k, f := range fits {
		for i, p := range f.Points {
			m := s.text(x(p.F), y(100*math.Expm1(f.Residuals[i]))+1.1, 3.2, "middle", "%s", letter(p.B))
			m.bold, m.fill, m.class = true, colours[k%len(colours)], "point"
		}
	}
	row := top + 2
	for i, b := range fluxes {
		if i == 26 || row > height-bottom-8*float64(len(fits)) {
			break
		}
		s.text(width-right+4, row, 2.8, "start", "%s  %.4g mT", letter(b), 1e3*b)
		row += 4
	}
	for k, f := range fits {
		row += 4
		m := s.text(width-right+4, row, 2.8, "start", "%s: rms %.1f %%", f.Set.ID, 100*f.Set.RMS)
		m.bold, m.fill = true, colours[k%len(colours)]
	}
	return s.picture("residuals", title)
}

// oneTwoFive is the next of 1, 2, 5 times a power of ten.
func oneTwoFive(v float64) float64 {
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

// ticks are the 1, 2, 5 times powers of ten between two frequencies, the ends when
// there are fewer than two.
func ticks(low, high float64) []float64 {
	var list []float64
	for e := math.Floor(math.Log10(low)); e <= math.Ceil(math.Log10(high)); e++ {
		for _, m := range []float64{1, 2, 5} {
			if f := m * math.Pow(10, e); f >= low*0.999 && f <= high*1.001 {
				list = append(list, f)
			}
		}
	}
	if len(list) < 2 {
		list = slices.Compact([]float64{low, high})
	}
	return list
}
