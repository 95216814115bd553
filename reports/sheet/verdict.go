package sheet

import (
	"math"
	"slices"

	"gapwright/magnetics/part"
)

// A Verdict is one row of the inspection table judged, as the workbook's own
// formulas judge it.
type Verdict struct {
	Check   part.Check
	Values  []*float64 // SI, by sample; resistances corrected to 20 °C; nil: none
	Words   []string   // PASS, FAIL, READ or "" by sample
	Result  string     // PASS, FAIL, READ, OPEN or ""
	Mean    *float64
	Nominal *float64 // relative distance of the mean from the nominal value
}

// Judge holds the samples of a filled sheet against the rows of the build.
func Judge(checks []part.Check, f Filled) []Verdict {
	ambient, ok := f.Number("field.ambient_c")
	if !ok {
		ambient = 20
	}
	factor := 1 + copperCoefficient*(ambient-20)
	unread := map[string]bool{}
	for _, u := range f.Unread {
		unread[u.Key] = true
	}
	byID := map[string]int{}
	out := make([]Verdict, len(checks))
	for i, c := range checks {
		byID[c.ID] = i
		v := Verdict{Check: c, Values: make([]*float64, len(f.Samples)), Words: make([]string, len(f.Samples))}
		if c.Kind != part.Computed {
			for j, s := range f.Samples {
				if x, ok := s.Value(c.ID); ok {
					if c.AtAmbient {
						x /= factor
					}
					v.Values[j] = &x
				}
			}
		}
		out[i] = v
	}
	for i, c := range checks {
		if c.Kind == part.Computed {
			computeRow(&out[i], out, byID)
		}
	}
	for i := range out {
		v := &out[i]
		c := v.Check
		for j, s := range f.Samples {
			switch {
			case unread[c.ID+"."+sampleHead(s.Number)]:
				v.Words[j] = "FAIL"
			case c.Kind == part.Attribute:
				v.Words[j] = map[string]string{"OK": "PASS", "NOK": "FAIL"}[s.Word(c.ID)]
			case v.Values[j] == nil:
			case c.Min == nil && c.Max == nil:
				v.Words[j] = "READ"
			case c.Min != nil && *v.Values[j] < *c.Min*(1-limitSlack), c.Max != nil && *v.Values[j] > *c.Max*(1+limitSlack):
				v.Words[j] = "FAIL"
			default:
				v.Words[j] = "PASS"
			}
		}
		v.Summarize()
	}
	return out
}

// Summarize fills result, mean and distance from what the samples have.
func (v *Verdict) Summarize() {
	count := map[string]int{}
	sum, n := 0.0, 0
	for j, word := range v.Words {
		count[word]++
		if v.Values[j] != nil {
			sum += *v.Values[j]
			n++
		}
	}
	v.Result = ""
	switch {
	case count["FAIL"] > 0:
		v.Result = "FAIL"
	case count["PASS"] > 0:
		v.Result = "PASS"
	case count["READ"] > 0:
		v.Result = "READ"
	case v.Check.Often != "one":
		v.Result = "OPEN"
	}
	v.Mean, v.Nominal = nil, nil
	if n > 0 {
		mean := sum / float64(n)
		v.Mean = &mean
		if c := v.Check; c.Nominal != nil && *c.Nominal != 0 {
			off := mean / *c.Nominal - 1
			v.Nominal = &off
		}
	}
}

// limitSlack is the rounding of a unit conversion, which must not decide.
const limitSlack = 1e-12

// computeRow fills in a row that follows from others.
func computeRow(v *Verdict, all []Verdict, byID map[string]int) {
	c := v.Check
	value := func(i, sample int) (float64, bool) {
		if i >= len(c.From) {
			return 0, false
		}
		k, ok := byID[c.From[i]]
		if !ok || all[k].Values[sample] == nil {
			return 0, false
		}
		return *all[k].Values[sample], true
	}
	var median float64
	if c.Rule == part.FromMedian {
		var list []float64
		for j := range v.Values {
			if x, ok := value(0, j); ok {
				list = append(list, x)
			}
		}
		if len(list) < 2 {
			return
		}
		slices.Sort(list)
		if n := len(list); n%2 == 1 {
			median = list[n/2]
		} else {
			median = (list[n/2-1] + list[n/2]) / 2
		}
		if median <= 0 {
			return
		}
	}
	for j := range v.Values {
		a, okA := value(0, j)
		b, okB := value(1, j)
		if !okA || (!okB && c.Rule != part.FromMedian) {
			continue
		}
		var x float64
		switch c.Rule {
		case part.GeometricMean:
			if a <= 0 || b <= 0 {
				continue
			}
			x = math.Sqrt(a * b)
		case part.OverMean:
			if a+b <= 0 {
				continue
			}
			x = 2 * math.Abs(a-b) / (a + b)
		case part.Quotient:
			if b <= 0 {
				continue
			}
			x = a / b
		case part.FactorApart:
			if b <= 0 {
				continue
			}
			x = math.Abs(c.Factor*a/b - 1)
		case part.FromMedian:
			x = math.Abs(a/median - 1)
		}
		v.Values[j] = &x
	}
}

// Overall is the verdict of the whole sheet: REJECT, OPEN or ACCEPT.
func Overall(verdicts []Verdict) string {
	out := "ACCEPT"
	for _, v := range verdicts {
		if v.Result == "FAIL" {
			return "REJECT"
		}
		if v.Result == "OPEN" {
			out = "OPEN"
		}
	}
	return out
}
