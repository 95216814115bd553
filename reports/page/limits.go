package page

import (
	"fmt"
	"html/template"
	"math"
	"sort"
	"strings"

	"gapwright/magnetics/design"
	"gapwright/magnetics/part"
	"gapwright/reports/text"
	"gapwright/tank"
)

// limitRow is one limit held against its value.
type limitRow struct {
	Part, Corner, Name, Key string
	Value, Bound            template.HTML
	Most                    string // at most, at least
	Margin                  string
	Pass                    bool
	Used                    float64 // 0..100, how much of the way to the limit is used
	margin                  float64
}

// limitNames are the keys of the job's limits in words.
var limitNames = map[string]string{
	"winding_temperature": "hot spot of the winding", "core_temperature": "core temperature", "flux_share": "flux density, share of saturation",
	"overload_flux_share": "flux density at the current limit, share of saturation", "gain_margin": "gain left over the wanted output",
	"peak_frequency_margin": "distance from the frequency of the peak", "soft_switching_margin": "dead time left after the swing",
	"ratio_error": "turns ratio as built", "resonance_error": "resonant inductance as built", "magnetizing_error": "magnetizing inductance as built",
	"half_mismatch": "difference of the two halves", "height_left_min": "window height left", "total_loss": "loss of both parts", "height": "height above the board",
	"footprint": "footprint", "mass": "mass", "layer_breadth": "breadth that a layer needs", "leakage": "leakage, for the resonant inductance",
	"former": "no coil former in the table", "turns": "no number of turns fits", "open_inductance": "open inductance to be met", "short_inductance": "short-circuit inductance to be met", "inductance": "inductance to be met", "length_min": "gap length", "length_max": "length of one gap piece", "reached": "corner is served",
}

// yesOrNo tells the limits that are kept or not, without a value.
func yesOrNo(key string) bool { return key == "reached" || key == "former" || key == "turns" }

func limitName(key string) string {
	if name, ok := limitNames[key]; ok {
		return name
	}
	return strings.ReplaceAll(key, "_", " ")
}

// verdictMargin is how far a verdict is from its bound, relative to it; negative
// when it is missed.
func verdictMargin(v part.Verdict) float64 {
	m := math.Inf(1)
	if v.Bound != 0 {
		m = (v.Bound - v.Value) / math.Abs(v.Bound)
		if v.Sense == "min" {
			m = -m
		}
	}
	if !v.Pass {
		m = -math.Abs(m)
	}
	return m
}

func limits(list []part.Verdict) []limitRow {
	rows := make([]limitRow, 0, len(list))
	for i, v := range list {
		r := limitRow{
			Part: v.Part, Corner: v.Corner, Name: limitName(v.Limit), Key: v.Limit, Pass: v.Pass, Most: "at most", margin: verdictMargin(v),
			Value: number(fmt.Sprintf("verdicts.%d.value", i), v.Value, text.LimitValue(v.Value, v.Unit)),
			Bound: number(fmt.Sprintf("verdicts.%d.bound", i), v.Bound, text.LimitValue(v.Bound, v.Unit)),
		}
		if v.Sense == "min" {
			r.Most = "at least"
		}
		if yesOrNo(v.Limit) {
			// Served or not: there is no way to be nearer.
			r.Value, r.Bound, r.Most = number(fmt.Sprintf("verdicts.%d.value", i), v.Value, map[bool]string{true: "yes", false: "no"}[v.Pass]), "", ""
			if v.Pass {
				r.margin = math.Inf(1)
			}
		}
		r.Margin = "–"
		if !math.IsInf(r.margin, 0) && !math.IsNaN(r.margin) {
			r.Margin = fmt.Sprintf("%.0f %%", 100*math.Abs(r.margin))
			switch {
			case r.margin > 1:
				r.Margin = "> 100 %"
			case math.Abs(r.margin) < 0.0995:
				r.Margin = fmt.Sprintf("%.1f %%", 100*math.Abs(r.margin))
			}
		}
		r.Used = 100 * math.Min(math.Max(1-r.margin, 0), 1)
		if math.IsNaN(r.Used) {
			r.Used = 100
		}
		rows = append(rows, r)
	}
	// What is missed by most comes first, then what is nearest.
	sort.SliceStable(rows, func(i, j int) bool {
		if rows[i].Pass != rows[j].Pass {
			return !rows[i].Pass
		}
		return rows[i].margin < rows[j].margin
	})
	return rows
}

// nearest are the rows for the head of the page: what is missed, then the least
// margin of each kind.
func nearest(rows []limitRow, kept int) (missed, near []limitRow) {
	seen := map[string]bool{}
	for _, r := range rows {
		if !r.Pass {
			missed = append(missed, r)
			continue
		}
		if key := r.Part + " " + r.Key; !seen[key] && len(near) < kept && r.Key != "reached" && !math.IsInf(r.margin, 0) {
			seen[key] = true
			near = append(near, r)
		}
	}
	return missed, near
}

// power is the output power weighted by share, W.
func power(d *design.Design) float64 {
	sum := 0.0
	for _, o := range d.Operations {
		if o.Status == tank.OK && o.Corner.Duration == 0 {
			sum += o.Corner.Share * o.OutputPower
		}
	}
	return sum
}
