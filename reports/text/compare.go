package text

import (
	"cmp"
	"encoding/csv"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"

	"gapwright/magnetics/design"
	"gapwright/magnetics/part"
)

// Comparison says which core sizes of a design are listed, and how.
type Comparison struct {
	Families []string // none: all
	Part     string   // transformer, inductor; empty: both
	Sort     string   // volume, loss, mass or temperature
	Top      int      // rows of each part; 0: all
}

// SortKeys are what a comparison can be sorted by.
func SortKeys() []string { return []string{"volume", "loss", "mass", "temperature"} }

// rows returns the sizes of a part that are asked for. Sizes that keep every limit
// come first when only the top is wanted.
func (c Comparison) rows(d *design.Design, name string) []design.Size {
	var list []design.Size
	for _, s := range d.Ladder {
		if s.Part == name && (len(c.Families) == 0 || slices.Contains(c.Families, s.Family)) {
			list = append(list, s)
		}
	}
	figure := func(s design.Size) float64 {
		if s.Rating == nil && c.Sort != "volume" {
			return math.Inf(1)
		}
		switch c.Sort {
		case "loss":
			return s.Loss
		case "mass":
			return s.Rating.Mass
		case "temperature":
			hot, _ := hottest(s.Rating)
			return hot
		}
		return s.Volume
	}
	slices.SortStableFunc(list, func(a, b design.Size) int {
		if c.Top > 0 && a.Feasible != b.Feasible {
			if a.Feasible {
				return -1
			}
			return 1
		}
		return cmp.Compare(figure(a), figure(b))
	})
	if c.Top > 0 {
		list = list[:min(c.Top, len(list))]
	}
	return list
}

func (c Comparison) parts() []string {
	if c.Part != "" {
		return []string{c.Part}
	}
	return []string{"transformer", "inductor"}
}

// hottest returns the hot spot of the worst continuous corner, and whether it has
// a steady temperature; 0 when no corner lasts.
func hottest(r *part.Rating) (float64, bool) {
	hot, steady := 0.0, true
	for _, c := range r.Corners {
		if c.Continuous {
			hot = math.Max(hot, c.WindingTemperature)
			steady = steady && !c.Runaway
		}
	}
	return hot, steady
}

// coreShare returns the core's part of the loss weighted by share, W.
func coreShare(d *design.Design, s design.Size) (core, copper float64) {
	var all float64
	for _, c := range s.Rating.Corners {
		weight := 0.0
		for _, o := range d.Wanted {
			if o.Corner.Name == c.Name && c.Continuous {
				weight = o.Corner.Share
			}
		}
		core += weight * c.CoreLoss
		all += weight * c.Loss()
	}
	if all == 0 {
		// Nothing lasts: the plain mean.
		for _, c := range s.Rating.Corners {
			core += c.CoreLoss / float64(len(s.Rating.Corners))
		}
	}
	return core, s.Loss - core
}

func turnsText(c *part.Construction) string {
	text := ""
	for i, w := range c.Windings {
		if i > 0 {
			text += ":"
		}
		text += strconv.Itoa(w.Turns)
	}
	return text
}

// limitText is a limit with its value and bound.
func limitText(r design.Reason) string {
	switch r.Limit {
	case "":
		return ""
	case "former":
		return "former: none in the table"
	case "turns":
		return "turns: none in the range"
	}
	sign := "<="
	if r.Sense == "min" {
		sign = ">="
	}
	return fmt.Sprintf("%s %s, %s %s", r.Limit, LimitValue(r.Value, r.Unit), sign, LimitValue(r.Bound, r.Unit))
}

// wideTable is from how many columns on a row holds the limit too.
const wideTable = 150

// Compare prints one row per core size and part, then what the next smaller size
// misses.
func Compare(p *Printer, d *design.Design, c Comparison) error {
	if d.Job.Title != "" {
		p.Line("%s", d.Job.Title)
		p.Line("")
	}
	for _, name := range c.parts() {
		rows := c.rows(d, name)
		if len(rows) == 0 {
			continue
		}
		title := "Transformer"
		if name == "inductor" {
			title = "Resonant inductor"
		}
		p.Line("%s, one row per core size: the best found on each", title)
		// The limit goes at the end of its row where there is room, else into a list
		// of its own.
		wide := p.Width() >= wideTable
		head := []string{"core", "cm³", "turns", "gap mm", "B mT", "core W", "copper W", "hot °C", "left mm", "g"}
		if name == "transformer" {
			head = append(head, "leak %")
		}
		n := len(head)
		if wide {
			head = append(head, "limited by")
		}
		t := Table{Head: head, Left: []int{0, n}, Fold: true}
		limits := Table{Head: []string{"core", "limited by"}, Left: []int{0, 1}, Fold: true}
		for _, s := range rows {
			cells := []string{mark(s), fmt.Sprintf("%.1f", 1e6*s.Volume)}
			if r := s.Rating; r != nil {
				core, copper := coreShare(d, s)
				hot, steady := hottest(r)
				heat := fmt.Sprintf("%.0f", hot)
				if !steady {
					heat = "runaway"
				}
				cells = append(cells, turnsText(s.Construction), fmt.Sprintf("%.3f", 1e3*r.Gap.Length), fmt.Sprintf("%.0f", 1e3*r.FluxDensityPeak),
					fmt.Sprintf("%.2f", core), fmt.Sprintf("%.2f", copper), heat, fmt.Sprintf("%.2f", 1e3*r.HeightLeft), fmt.Sprintf("%.0f", 1e3*r.Mass))
				if name == "transformer" {
					cells = append(cells, fmt.Sprintf("%.1f", 100*s.Leakage))
				}
			} else {
				for len(cells) < n {
					cells = append(cells, "-")
				}
			}
			why := limitText(s.Reason)
			if s.Feasible {
				why = "keeps all; nearest " + why
			}
			if wide {
				cells = append(cells, why)
			} else {
				limits.Add(mark(s), why)
			}
			t.Add(cells...)
		}
		p.Table(t)
		p.Line("")
		if !wide {
			p.Table(limits)
			p.Line("")
		}
	}
	p.Paragraph(0, "> chosen. Loss is weighted by share; hot spot of the worst continuous corner, ±25 %% of the rise; B over the smallest section; left is window height after bulge, leak the share of the resonant inductance.")
	p.Line("")
	for _, name := range c.parts() {
		if text := whyNotSmaller(d, name); text != "" {
			p.Paragraph(2, "%s", text)
		}
	}
	p.Line("")
	if len(d.Pareto) > 0 {
		p.Line("Pairs that no other beats in both loss and volume")
		t := Table{Head: []string{"transformer", "inductor", "cm³", "loss W", "g"}, Left: []int{0, 1}}
		for _, x := range d.Pareto {
			sign := "  "
			if x.Chosen {
				sign = "> "
			}
			t.Add(sign+x.Transformer, x.Inductor, fmt.Sprintf("%.1f", 1e6*x.Volume), fmt.Sprintf("%.2f", x.Loss), fmt.Sprintf("%.0f", 1e3*x.Mass))
		}
		p.Table(t)
		p.Line("")
	}
	return Advice(p, d)
}

func mark(s design.Size) string {
	if s.Chosen {
		return "> " + s.Shape
	}
	return "  " + s.Shape
}

// whyNotSmaller says what the next smaller size of the chosen one misses.
func whyNotSmaller(d *design.Design, name string) string {
	var chosen, smaller *design.Size
	for i := range d.Ladder {
		s := &d.Ladder[i]
		if s.Part == name && s.Chosen {
			chosen = s
		}
	}
	if chosen == nil {
		return ""
	}
	for i := range d.Ladder {
		s := &d.Ladder[i]
		if s.Part == name && s.Volume < chosen.Volume && s.Reason.Limit != "former" && (smaller == nil || s.Volume > smaller.Volume) {
			smaller = s
		}
	}
	if smaller == nil {
		return fmt.Sprintf("Why not a smaller %s: %s is the smallest size admitted.", name, chosen.Shape)
	}
	if smaller.Feasible {
		return fmt.Sprintf("Why not a smaller %s: %s (%.1f cm³) keeps every limit too, with %.2f W instead of %.2f W; the objective is %s.",
			name, smaller.Shape, 1e6*smaller.Volume, smaller.Loss, chosen.Loss, objectiveText(d))
	}
	return fmt.Sprintf("Why not a smaller %s: %s (%.1f cm³ instead of %.1f) misses %s.", name, smaller.Shape, 1e6*smaller.Volume, 1e6*chosen.Volume, limitText(smaller.Reason))
}

func objectiveText(d *design.Design) string {
	o := d.Job.Build.Objective
	switch {
	case o.Word == "smallest":
		return "smallest, ties within 2 % by loss"
	case o.Word != "":
		return o.Word
	}
	return fmt.Sprintf("%g loss + %g volume + %g mass", o.Loss, o.Volume, o.Mass)
}

// compareJSON is the stable form of a comparison, SI units.
type compareJSON struct {
	Format   int              `json:"format"`
	Title    string           `json:"title"`
	Feasible bool             `json:"feasible"`
	Sizes    []compareRowJSON `json:"sizes"`
	Why      []string         `json:"why_not_smaller"`
	Pareto   []pairJSON       `json:"pareto"`
	Advice   []adviceJSON     `json:"advice"`
}

type compareRowJSON struct {
	sizeJSON
	Family      string   `json:"family"`
	Turns       []int    `json:"turns"`
	GapKind     string   `json:"gap_kind"`
	Gap         *float64 `json:"gap"`
	Flux        *float64 `json:"flux_density_peak"`
	Core        *float64 `json:"core_loss"`
	Copper      *float64 `json:"winding_loss"`
	Winding     *float64 `json:"winding_temperature"`
	HeightLeft  *float64 `json:"height_left"`
	Mass        *float64 `json:"mass"`
	Leakage     *float64 `json:"leakage_share"`
	Nearest     *string  `json:"nearest_limit"` // of a size that keeps all
	Arrangement string   `json:"arrangement"`
}

func compareRow(d *design.Design, s design.Size) compareRowJSON {
	out := compareRowJSON{sizeJSON: sizeOf(s), Family: s.Family, Turns: []int{}}
	if s.Feasible {
		out.Nearest = &s.Reason.Limit
	}
	r := s.Rating
	if r == nil {
		return out
	}
	core, copper := coreShare(d, s)
	for _, w := range s.Construction.Windings {
		out.Turns = append(out.Turns, w.Turns)
	}
	out.GapKind, out.Arrangement = string(s.Construction.Core.Gap.Kind), r.Arrangement
	out.Gap, out.Flux, out.Core, out.Copper, out.HeightLeft, out.Mass = &r.Gap.Length, &r.FluxDensityPeak, &core, &copper, &r.HeightLeft, &r.Mass
	if hot, steady := hottest(r); steady && hot > 0 {
		out.Winding = &hot
	}
	if s.Part == "transformer" {
		out.Leakage = &s.Leakage
	}
	return out
}

// CompareJSON writes a comparison for programs.
func CompareJSON(w io.Writer, d *design.Design, c Comparison) error {
	out := compareJSON{Format: 1, Title: d.Job.Title, Feasible: d.Feasible, Sizes: []compareRowJSON{}, Why: []string{}, Pareto: pairsOf(d), Advice: adviceOf(d)}
	for _, name := range c.parts() {
		for _, s := range c.rows(d, name) {
			out.Sizes = append(out.Sizes, compareRow(d, s))
		}
		if text := whyNotSmaller(d, name); text != "" {
			out.Why = append(out.Why, text)
		}
	}
	return JSON(w, out)
}

// CompareCSV writes the rows of a comparison with their units in the heading, for
// a spreadsheet.
func CompareCSV(w io.Writer, d *design.Design, c Comparison) error {
	out := csv.NewWriter(w)
	rows := [][]string{{
		"part", "core", "family", "volume [cm3]", "keeps all", "chosen", "turns", "arrangement", "gap [mm]", "B [mT]", "core loss [W]", "copper loss [W]",
		"hot spot [degC]", "height left [mm]", "mass [g]", "leakage share of Lr [%]", "limit", "value", "bound", "unit", "sense",
	}}
	number := func(x float64, digits int) string {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return ""
		}
		return strconv.FormatFloat(x, 'f', digits, 64)
	}
	for _, name := range c.parts() {
		for _, s := range c.rows(d, name) {
			row := []string{s.Part, s.Shape, s.Family, number(1e6*s.Volume, 2), strconv.FormatBool(s.Feasible), strconv.FormatBool(s.Chosen)}
			if r := s.Rating; r != nil {
				core, copper := coreShare(d, s)
				hot, steady := hottest(r)
				heat := number(hot, 1)
				if !steady || hot == 0 {
					heat = ""
				}
				leak := ""
				if s.Part == "transformer" {
					leak = number(100*s.Leakage, 2)
				}
				row = append(row, turnsText(s.Construction), r.Arrangement, number(1e3*r.Gap.Length, 4), number(1e3*r.FluxDensityPeak, 1), number(core, 3), number(copper, 3),
					heat, number(1e3*r.HeightLeft, 3), number(1e3*r.Mass, 1), leak)
			} else {
				row = append(row, "", "", "", "", "", "", "", "", "", "")
			}
			value := strconv.FormatFloat(s.Reason.Value, 'g', 6, 64)
			if math.IsNaN(s.Reason.Value) || math.IsInf(s.Reason.Value, 0) {
				value = ""
			}
			rows = append(rows, append(row, s.Reason.Limit, value, strconv.FormatFloat(s.Reason.Bound, 'g', 6, 64), s.Reason.Unit, s.Reason.Sense))
		}
	}
	if err := out.WriteAll(rows); err != nil {
		return err
	}
	return out.Error()
}
