package page

import (
	"fmt"
	"html/template"
	"math"
	"sort"

	"gapwright/magnetics/design"
	"gapwright/reports/figure"
	"gapwright/reports/text"
)

// sizeRow is one core size of the search.
type sizeRow struct {
	ID           int
	Part, Core   string
	Volume, Loss template.HTML
	State        string // chosen, keeps all, stopped
	Reason       string
	Value, Bound template.HTML
	Over         string
	Front        bool // keeps every limit, and none is better in both loss and volume
	Quiet        bool // not on paper
	// For sorting.
	VolumeKey, LossKey, OverKey float64
	// For the words under the plot.
	Tip string
}

// paperRows is how many sizes are printed.
const paperRows = 32

// quiet marks the rows that are left out on paper. What is chosen and the front
// come first, then what misses a limit by least, at most by half: a reader asks
// why not one smaller. The others that keep every limit follow.
func quiet(rows []sizeRow) {
	order := make([]int, len(rows))
	for i := range order {
		order[i] = i
	}
	rank := func(r sizeRow) float64 {
		switch {
		case r.State == "chosen":
			return -2
		case r.Front:
			return -1
		case r.State == "keeps all":
			return 0.5
		}
		return r.OverKey
	}
	sort.SliceStable(order, func(a, b int) bool { return rank(rows[order[a]]) < rank(rows[order[b]]) })
	for n, i := range order {
		rows[i].Quiet = n >= paperRows || rank(rows[i]) > 0.5
	}
}

// front marks the sizes that keep every limit and that no other such size of
// the same part beats in both loss and volume.
func front(list []design.Size) []bool {
	on := make([]bool, len(list))
	for i, a := range list {
		if !a.Feasible || !(a.Loss > 0) {
			continue
		}
		on[i] = true
		for k, b := range list {
			if k == i || b.Part != a.Part || !b.Feasible || !(b.Loss > 0) {
				continue
			}
			if b.Loss <= a.Loss && b.Volume <= a.Volume && (b.Loss < a.Loss || b.Volume < a.Volume || k < i) {
				on[i] = false
			}
		}
	}
	return on
}

func sizes(d *design.Design) ([]sizeRow, []panel, string, error) {
	on := front(d.Ladder)
	var rows []sizeRow
	kept := 0
	for i, s := range d.Ladder {
		at := func(key string) string { return fmt.Sprintf("sizes.%d.%s", i, key) }
		r := sizeRow{
			ID: i, Part: s.Part, Core: s.Shape, Volume: scaled(at("volume"), s.Volume, 1e6, 2, ""), VolumeKey: s.Volume, LossKey: s.Loss,
			Loss: "–", Value: "", Bound: "", OverKey: -1,
		}
		if s.Loss > 0 {
			r.Loss = scaled(at("loss"), s.Loss, 1, 2, "")
		} else {
			r.LossKey = math.MaxFloat64
		}
		switch {
		case s.Feasible:
			kept++
			r.State, r.Reason = "keeps all", "keeps every limit"
			if on[i] {
				r.Front = true
				r.Reason = "keeps every limit; none is better in both loss and volume"
			}
			if s.Chosen {
				r.State, r.Reason = "chosen", "chosen"
			}
		default:
			r.State, r.Reason = "stopped", limitName(s.Reason.Limit)
			r.Value = number(at("limited_by.value"), s.Reason.Value, text.LimitValue(s.Reason.Value, s.Reason.Unit))
			sign := "≤ "
			if s.Reason.Sense == "min" {
				sign = "≥ "
			}
			r.Bound = number(at("limited_by.bound"), s.Reason.Bound, sign+text.LimitValue(s.Reason.Bound, s.Reason.Unit))
			over := math.Inf(1)
			switch {
			case yesOrNo(s.Reason.Limit):
				r.Value, r.Bound = "", ""
			case s.Reason.Bound != 0:
				over = math.Abs(s.Reason.Value-s.Reason.Bound) / math.Abs(s.Reason.Bound)
			}
			r.OverKey = math.MaxFloat64
			if !math.IsInf(over, 0) && !math.IsNaN(over) {
				r.Over, r.OverKey = fmt.Sprintf("%.0f %%", 100*over), over
			}
		}
		r.Tip = fmt.Sprintf("%s, %s: %.2f cm³", s.Shape, s.Part, 1e6*s.Volume)
		if s.Loss > 0 {
			r.Tip += fmt.Sprintf(", %.2f W", s.Loss)
		}
		r.Tip += ", " + r.Reason
		if !s.Feasible {
			r.Tip = fmt.Sprintf("%s, %s: %.2f cm³, stopped: %s", s.Shape, s.Part, 1e6*s.Volume, r.Reason)
			if !yesOrNo(s.Reason.Limit) {
				r.Tip += " " + text.LimitValue(s.Reason.Value, s.Reason.Unit)
			}
			if s.Loss > 0 {
				r.Tip += fmt.Sprintf(", %.2f W", s.Loss)
			}
		}
		rows = append(rows, r)
	}
	quiet(rows)
	words := ""
	switch {
	case len(rows) == 0:
		words = "No core sizes were compared: this build was rated as it stands, without a search."
	case kept == 0:
		words = "No core size keeps every limit, so there is no trade between loss and volume to show. The table says what stopped each size."
	}
	if kept == 0 {
		return rows, nil, words, nil
	}
	var plots []panel
	for _, name := range []string{"transformer", "inductor"} {
		p, ok, err := sizePlot(d, rows, on, name)
		if err != nil {
			return nil, nil, "", err
		}
		if ok {
			plots = append(plots, p)
		}
	}
	if len(plots) == 0 {
		words = "The search rated no loss for the sizes that keep every limit."
	}
	return rows, plots, words, nil
}

func sizePlot(d *design.Design, rows []sizeRow, on []bool, name string) (panel, bool, error) {
	p := figure.Panel{Y: figure.Axis{Label: "loss of the " + name + ", W, weighted by share", Log: true}, Height: 52}
	var line figure.Curve
	line.Tone, line.Name, line.Thin = figure.Primary, "", true
	best := 0.0
	rated := 0
	for _, s := range d.Ladder {
		if s.Part == name && s.Feasible && s.Loss > 0 && (best == 0 || s.Loss < best) {
			best = s.Loss
		}
		if s.Part == name && s.Loss > 0 {
			rated++
		}
	}
	if rated == 0 || best == 0 {
		return panel{}, false, nil
	}
	left, above := 0, 0
	for i, s := range d.Ladder {
		if s.Part != name {
			continue
		}
		if !(s.Loss > 0) {
			left++
			continue
		}
		if s.Loss > 20*best {
			above++
			continue
		}
		m := figure.Mark{X: 1e6 * s.Volume, Y: s.Loss, ID: fmt.Sprint(i), Tip: rows[i].Tip, Shape: figure.Diamond, Tone: figure.Faint}
		if s.Feasible {
			m.Shape, m.Tone = figure.Ring, figure.Primary
		}
		if s.Chosen {
			m.Shape, m.Label = figure.Star, s.Shape
		}
		p.Marks = append(p.Marks, m)
	}
	for i, s := range d.Ladder {
		if s.Part == name && on[i] {
			line.X, line.Y = append(line.X, 1e6*s.Volume), append(line.Y, s.Loss)
		}
	}
	if len(line.X) > 1 {
		sortByX(&line)
		p.Curves = append(p.Curves, line)
	}
	chart := figure.Chart{
		Name: "sizes-" + name, Title: "Loss over volume of every core size rated for the " + name,
		X: figure.Axis{Label: "volume of the outline, cm³", Log: true}, Panels: []figure.Panel{p},
	}
	drawing, err := svg(chart.SVG())
	if err != nil {
		return panel{}, false, err
	}
	caption := fmt.Sprintf("%s: dot in a ring chosen, ring keeps every limit, diamond is stopped by a limit.", title(name))
	if above > 0 {
		caption += fmt.Sprintf(" %d with more than 20 times the least loss are in the table only.", above)
	}
	if left > 0 {
		caption += fmt.Sprintf(" %d could not be rated.", left)
	}
	return panel{Name: name, Figure: drawing, Caption: caption}, true, nil
}

func title(part string) string {
	if part == "inductor" {
		return "Resonant inductor"
	}
	return "Transformer"
}

func sortByX(c *figure.Curve) {
	for i := 1; i < len(c.X); i++ {
		for k := i; k > 0 && c.X[k] < c.X[k-1]; k-- {
			c.X[k], c.X[k-1] = c.X[k-1], c.X[k]
			c.Y[k], c.Y[k-1] = c.Y[k-1], c.Y[k]
		}
	}
}
