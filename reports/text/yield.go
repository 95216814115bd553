package text

import (
	"fmt"
	"io"
	"math"
	"slices"
	"strings"

	"gapwright/magnetics/tolerance"
)

// Yield prints what the tolerances do to a design.
func Yield(p *Printer, r *tolerance.Result) error {
	p.Paragraph(2, "%s builds, seed %d, values %s between their tolerances; every corner of each solved exactly.", thousands(r.Builds), r.Seed, spreadWords(r.Spread))
	p.Line("")
	p.item(16, "  work", fmt.Sprintf("%s: every corner is reached within the range of frequencies, every swing completes and holds", share(r.Works)))
	p.item(16, "  keep reserves", fmt.Sprintf("%s: the margins that the job asks for are left as well. They are there for the tolerances to use: a build that eats into them works", share(r.Keeps)))
	if r.Outside.Share > 0 {
		p.item(16, "  outside", fmt.Sprintf("%s read an open inductance outside what the sheet allows: the shop mends or rejects them", share(r.Outside)))
	}
	p.Line("")
	if len(r.Misses) > 0 {
		t := Table{Head: []string{"what fails", "corner", "builds"}, Left: []int{0, 1}}
		for _, x := range r.Misses {
			what := x.Limit + ", reserve used"
			if x.Function {
				what = map[string]string{"reached": "corner not reached", "swing_complete": "swing incomplete", "node_held": "node lost before the dead time ends"}[x.Limit]
			}
			t.Add(what, x.Corner, percent1(x.Share))
		}
		p.Table(t)
		p.Line("")
	}

	t := Table{Head: []string{"figure", "corner", "as designed", "95 % of builds", "least", "most"}, Left: []int{0, 1}}
	incomplete := false
	for _, b := range r.Bands {
		f := func(x float64) string { return bandValue(x, b.Unit) }
		name := b.Name
		if b.Known < 1 {
			name += " *"
			incomplete = true
		}
		t.Add(name, b.Corner, f(b.Nominal), f(b.Low)+" .. "+f(b.High), f(b.Least), f(b.Most))
	}
	p.Table(t)
	note := fmt.Sprintf("As designed: cold, every value at its middle. Least and most are over all builds and the %d with every value at an end.", r.Extremes)
	if incomplete {
		note += " * of the builds that have the figure: the others miss the corner."
	}
	p.Paragraph(0, "%s", note)
	p.Line("")

	t = Table{Head: []string{"tolerance", "now", "work: exact", "half", "twice", "keep: exact", "half", "twice"}, Left: []int{0}, Fold: true}
	var stated []string
	for _, c := range r.Costs {
		if c.Source.Origin == "job" {
			stated = append(stated, c.Source.What)
		}
		t.Add(c.Source.What, deviation(c.Source, 1),
			percent1(c.Works[0]), percent1(c.Works[1]), percent1(c.Works[2]), percent1(c.Keeps[0]), percent1(c.Keeps[1]), percent1(c.Keeps[2]))
	}
	p.Table(t)
	p.Paragraph(0, "Shares of builds that work, and that keep their reserves, with one value exact, or with half or twice its tolerance, by a response surface: it judges %s of the exact builds otherwise. An A_L holds gap, permeability and area; hot is 100 °C. %s", percent1(r.Differ), origins(stated))
	p.Line("")
	for _, s := range yieldAdvice(r) {
		p.Paragraph(2, "%s", s)
	}
	return p.Err()
}

// yieldAdvice says which tolerance costs the yield, and which ones are free.
func yieldAdvice(r *tolerance.Result) []string {
	now, what, of := r.Works, "work", func(c tolerance.Cost) [3]float64 { return c.Works }
	if now.Share == 1 {
		now, what, of = r.Keeps, "keep their reserves", func(c tolerance.Cost) [3]float64 { return c.Keeps }
	}
	var list []string
	// Less than this is within what the builds can tell.
	noise := math.Max((now.High-now.Low)/2, 0.001)
	ranked := slices.Clone(r.Costs)
	slices.SortStableFunc(ranked, func(a, b tolerance.Cost) int {
		switch x, y := of(a)[1], of(b)[1]; {
		case x > y:
			return -1
		case x < y:
			return 1
		}
		return 0
	})
	if noise > 0.06 {
		return append(list, fmt.Sprintf("%s builds tell the yield to ±%.0f %% only: ask for more before ordering anything tighter or looser.", thousands(r.Builds), 100*noise))
	}
	if now.Share < 1 {
		if best := ranked[0]; of(best)[0]-now.Share > noise {
			if tightens(best.Source) {
				list = append(list, fmt.Sprintf("Tighten first: %s from %s to %s, and %s %s instead of %s; exact, %s.",
					best.Source.What, deviation(best.Source, 1), deviation(best.Source, 0.5), percent1(of(best)[1]), what, percent1(now.Share), percent1(of(best)[0])))
			} else {
				list = append(list, fmt.Sprintf("Costs most: %s; known exactly, %s %s instead of %s: measure it.", best.Source.What, percent1(of(best)[0]), what, percent1(now.Share)))
			}
		} else {
			list = append(list, "No single tolerance costs the yield: with any of them exact it hardly changes. The values themselves leave too little room.")
		}
	} else {
		list = append(list, "Every build works and keeps its reserves.")
	}
	for _, c := range r.Costs {
		if tightens(c.Source) && math.Abs(of(c)[2]-now.Share) <= math.Min(noise, 0.01) {
			list = append(list, fmt.Sprintf("Free to loosen: %s from %s to %s: %s %s.", c.Source.What, deviation(c.Source, 1), deviation(c.Source, 2), percent1(of(c)[2]), what))
		}
	}
	return list
}

func origins(stated []string) string {
	if len(stated) == 0 {
		return "All tolerances are defaults."
	}
	return "From the job: " + strings.Join(stated, "; ") + ". The others are defaults."
}

// tightens reports whether somebody can order a source tighter or looser.
func tightens(s tolerance.Source) bool { return s.Origin == "job" || s.Origin == "default" }

func spreadWords(s tolerance.Spread) string {
	if s == tolerance.Normal {
		return "normally distributed (three sigma)"
	}
	return "anywhere"
}

func thousands(n int) string {
	s := fmt.Sprint(n)
	for i := len(s) - 3; i > 0; i -= 3 {
		s = s[:i] + "," + s[i:]
	}
	return s
}

func share(y tolerance.Yield) string {
	return fmt.Sprintf("%s (95 %% interval %s .. %s)", percent1(y.Share), percent1(y.Low), percent1(y.High))
}

// percent1 never rounds up to all or down to none.
func percent1(x float64) string {
	switch {
	case x > 0.9995 && x < 1:
		return ">99.9 %"
	case x > 0 && x < 0.0005:
		return "<0.1 %"
	}
	return fmt.Sprintf("%.1f %%", 100*x)
}

func bandValue(x float64, unit string) string {
	switch {
	case math.IsNaN(x):
		return "-"
	case unit == "%":
		return fmt.Sprintf("%.1f %%", 100*x)
	}
	return unitValue(x, unit)
}

// deviation prints a tolerance, scaled.
func deviation(s tolerance.Source, scale float64) string {
	f := func(x float64) string {
		if s.Unit == "m" {
			return mm(x*scale, 3)
		}
		return fmt.Sprintf("%.3g %%", 100*x*scale)
	}
	switch {
	case s.Origin == "every start":
		return "cold .. hot"
	case s.Down == s.Up:
		return "±" + f(s.Up)
	}
	return "-" + f(s.Down) + " +" + f(s.Up)
}

type yieldJSON struct {
	Format     int             `json:"format"`
	Builds     int             `json:"builds"`
	Seed       uint64          `json:"seed"`
	Spread     string          `json:"spread"`
	Works      yieldShare      `json:"works"`
	Keeps      yieldShare      `json:"keeps_reserves"`
	Outside    yieldShare      `json:"outside_open_inductance"`
	Misses     []yieldMiss     `json:"misses"`
	Bands      []yieldBand     `json:"bands"`
	Tolerances []yieldCostJSON `json:"tolerances"`
	Extremes   int             `json:"extreme_builds"`
	Differ     float64         `json:"surface_disagreement"`
}

type yieldShare struct {
	Share float64 `json:"share"`
	Low   float64 `json:"low"`
	High  float64 `json:"high"`
}

type yieldMiss struct {
	Corner   string  `json:"corner"`
	Limit    string  `json:"limit"`
	Function bool    `json:"function"` // the build does not work
	Share    float64 `json:"share"`
}

type yieldBand struct {
	Name    string   `json:"name"`
	Corner  string   `json:"corner"`
	Unit    string   `json:"unit"` // "": a plain ratio; margins too
	Nominal *float64 `json:"nominal"`
	Mean    float64  `json:"mean"`
	Sigma   float64  `json:"sigma"`
	Low     float64  `json:"low"`
	High    float64  `json:"high"`
	Least   float64  `json:"least"`
	Most    float64  `json:"most"`
	Known   float64  `json:"known"`
}

type yieldCostJSON struct {
	Key    string       `json:"key"`
	What   string       `json:"what"`
	Down   float64      `json:"down"`
	Up     float64      `json:"up"`
	Unit   string       `json:"unit"` // "": relative
	Origin string       `json:"origin"`
	Works  yieldChanged `json:"works"`
	Keeps  yieldChanged `json:"keeps_reserves"`
}

type yieldChanged struct {
	Exact float64 `json:"exact"`
	Half  float64 `json:"half"`
	Twice float64 `json:"twice"`
}

// YieldJSON writes a result for programs.
func YieldJSON(w io.Writer, r *tolerance.Result) error {
	out := yieldJSON{Format: 1, Builds: r.Builds, Seed: r.Seed, Spread: string(r.Spread), Works: yieldShare(r.Works), Keeps: yieldShare(r.Keeps),
		Outside: yieldShare(r.Outside), Misses: []yieldMiss{}, Extremes: r.Extremes, Differ: r.Differ}
	plain := func(unit string) string {
		if unit == "%" {
			return ""
		}
		return unit
	}
	for _, x := range r.Misses {
		out.Misses = append(out.Misses, yieldMiss{x.Corner, x.Limit, x.Function, x.Share})
	}
	for _, b := range r.Bands {
		y := yieldBand{b.Name, b.Corner, plain(b.Unit), nil, b.Mean, b.Sigma, b.Low, b.High, b.Least, b.Most, b.Known}
		if !math.IsNaN(b.Nominal) {
			y.Nominal = &b.Nominal
		}
		out.Bands = append(out.Bands, y)
	}
	for _, c := range r.Costs {
		out.Tolerances = append(out.Tolerances, yieldCostJSON{c.Source.Key, c.Source.What, c.Source.Down, c.Source.Up, plain(c.Source.Unit), c.Source.Origin,
			yieldChanged{c.Works[0], c.Works[1], c.Works[2]}, yieldChanged{c.Keeps[0], c.Keeps[1], c.Keeps[2]}})
	}
	return JSON(w, out)
}
