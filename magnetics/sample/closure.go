package sample

import (
	"errors"
	"fmt"
	"math"

	"gapwright/magnetics/part"
)

// An Uncertain figure has a standard deviation.
type Uncertain struct {
	Value float64 `json:"value"`
	Sigma float64 `json:"sigma"`
}

// AsBuilt is what a transformer as measured gives the tank, all leakage on the
// primary.
type AsBuilt struct {
	Lm    Uncertain // H
	Ratio Uncertain // effective turns ratio
	Leak  Uncertain // H, the transformer's part of the resonant inductance, stray loops included
	Open  float64   // H, Lp as read
	Short float64   // H, mean of the halves that were read
	Ls    float64   // H, of one secondary, as read or as follows from the ratio
	Route string    // where Ls comes from
	Notes []string
}

// Close rebuilds the tank's view of a transformer from its readings, by
//
//	M² = (Lp - Lsc) Ls   Lm = M²/(Ls + Lstray)   n = M/(Ls + Lstray)   leak = Lp - Lm
//
// which is exact for two coupled windings. Ls is the reading where there is one;
// the ratio with the secondary driven is n itself (without stray inductance), and
// stands in for an Ls that is too small for the meter; with both, each counts by
// its uncertainty. stray is the layout inductance of one secondary loop in H.
//
// The deviations are those of the meter and of what the short leaves over,
// propagated by central differences.
func Close(r Readings, m Meter, stray float64) (AsBuilt, error) {
	var missing []error
	if r[Open] <= 0 {
		missing = append(missing, errors.New("no Lp final (E04)"))
	}
	if r[ShortA] <= 0 && r[ShortB] <= 0 {
		missing = append(missing, errors.New("no Lsc (E06, E07)"))
	}
	if r[Secondary] <= 0 && r[RatioS] <= 0 && r[RatioP] <= 0 {
		missing = append(missing, errors.New("neither Ls (E05) nor a ratio (E02b, E02a)"))
	}
	if len(missing) > 0 {
		return AsBuilt{}, errors.Join(missing...)
	}
	out := AsBuilt{Open: r[Open]}
	w := lsWeights(r, m)
	eq, two, err := closeWith(r, w, stray)
	if err != nil {
		return AsBuilt{}, err
	}
	out.Short, out.Ls = two.Lsc, two.Ls
	out.Lm.Value, out.Ratio.Value, out.Leak.Value = eq.Lm, eq.Ratio, eq.Lleak
	switch {
	case w.secondary == 1:
		out.Route = "Ls as read (E05)"
	case w.ratioS == 1:
		out.Route = "Ls from the ratio with the secondary driven (E02b)"
	case w.ratioP == 1:
		out.Route = "Ls from the ratio with the primary driven (E02a)"
	default:
		out.Route = "Ls as read (E05) and from the ratio (E02b), by their uncertainties"
	}
	add := func(q Quantity, relative float64) {
		if r[q] <= 0 || relative <= 0 {
			return
		}
		up, down := clone(r), clone(r)
		up[q] *= 1 + relative
		down[q] *= 1 - relative
		a, _, errA := closeWith(up, w, stray)
		b, _, errB := closeWith(down, w, stray)
		if errA != nil || errB != nil {
			return
		}
		out.Lm.Sigma = math.Hypot(out.Lm.Sigma, (a.Lm-b.Lm)/2)
		out.Ratio.Sigma = math.Hypot(out.Ratio.Sigma, (a.Ratio-b.Ratio)/2)
		out.Leak.Sigma = math.Hypot(out.Leak.Sigma, (a.Lleak-b.Lleak)/2)
	}
	n := math.Sqrt(two.Lp / two.Ls)
	for _, q := range []Quantity{Open, Secondary, RatioS, RatioP, ShortA, ShortB} {
		d := m.deviation(q)
		if (q == ShortA || q == ShortB) && r[q] > 0 {
			d = math.Hypot(d, n*n*m.ShortLoop/r[q])
		}
		add(q, d)
	}
	if r[Secondary] > 0 && r[RatioS] > 0 {
		a, b := r[Secondary], (r[Open]-two.Lsc)/(r[RatioS]*r[RatioS])
		sigma := math.Hypot(m.Inductance, math.Hypot(2*m.Ratio, m.Inductance))
		if d := math.Log(a / b); math.Abs(d) > 3*sigma && sigma > 0 {
			out.Notes = append(out.Notes, fmt.Sprintf("Ls as read and Ls from the ratio differ by %.1f %%: measure E05 and E02b again", d*100))
		}
	}
	return out, nil
}

func clone(r Readings) Readings {
	c := make(Readings, len(r))
	for q, v := range r {
		c[q] = v
	}
	return c
}

// weights say how much each route to Ls counts.
type weights struct{ secondary, ratioS, ratioP float64 }

func lsWeights(r Readings, m Meter) weights {
	switch {
	case r[Secondary] > 0 && r[RatioS] > 0:
		a := m.Inductance * m.Inductance
		b := m.Inductance*m.Inductance + 4*m.Ratio*m.Ratio
		if a+b == 0 {
			return weights{secondary: 0.5, ratioS: 0.5}
		}
		return weights{secondary: b / (a + b), ratioS: a / (a + b)}
	case r[Secondary] > 0:
		return weights{secondary: 1}
	case r[RatioS] > 0:
		return weights{ratioS: 1}
	}
	return weights{ratioP: 1}
}

func closeWith(r Readings, w weights, stray float64) (part.Equivalent, part.TwoPort, error) {
	two := part.TwoPort{Lp: r[Open]}
	n := 0.0
	for _, q := range []Quantity{ShortA, ShortB} {
		if r[q] > 0 {
			two.Lsc += r[q]
			n++
		}
	}
	two.Lsc /= n
	if !(two.Lsc < two.Lp) {
		return part.Equivalent{}, two, fmt.Errorf("an Lsc of %.4g uH is not below the Lp of %.4g uH: the rows are swapped, or the short was open", two.Lsc*1e6, two.Lp*1e6)
	}
	linked := two.Lp - two.Lsc
	ls := 0.0
	if w.secondary > 0 {
		ls += w.secondary * r[Secondary]
	}
	if w.ratioS > 0 {
		ls += w.ratioS * linked / (r[RatioS] * r[RatioS])
	}
	if w.ratioP > 0 {
		// The primary-driven ratio is Lp/M.
		mutual := two.Lp / r[RatioP]
		ls += w.ratioP * mutual * mutual / linked
	}
	two.Ls = ls
	two.M = math.Sqrt(linked * ls)
	eq := two.Equivalent(stray)
	for _, v := range []float64{eq.Lm, eq.Ratio, eq.Lleak} {
		if math.IsNaN(v) || math.IsInf(v, 0) || v <= 0 {
			return eq, two, errors.New("the readings make no transformer: Lm, ratio and leakage do not all come out above zero")
		}
	}
	return eq, two, nil
}

// MeanAsBuilt returns the mean of several samples. Its deviations are those of
// the mean: the spread of the samples over the root of their number, together
// with the meter's, which all samples share.
func MeanAsBuilt(samples []AsBuilt) AsBuilt {
	if len(samples) == 0 {
		return AsBuilt{}
	}
	var out AsBuilt
	pick := func(get func(AsBuilt) Uncertain) Uncertain {
		n := float64(len(samples))
		var u Uncertain
		for _, s := range samples {
			u.Value += get(s).Value / n
			u.Sigma += get(s).Sigma / n
		}
		if len(samples) > 1 {
			sum := 0.0
			for _, s := range samples {
				d := get(s).Value - u.Value
				sum += d * d
			}
			u.Sigma = math.Hypot(u.Sigma, math.Sqrt(sum/(n-1)/n))
		}
		return u
	}
	out.Lm = pick(func(a AsBuilt) Uncertain { return a.Lm })
	out.Ratio = pick(func(a AsBuilt) Uncertain { return a.Ratio })
	out.Leak = pick(func(a AsBuilt) Uncertain { return a.Leak })
	for _, s := range samples {
		out.Open += s.Open / float64(len(samples))
		out.Short += s.Short / float64(len(samples))
		out.Ls += s.Ls / float64(len(samples))
	}
	out.Route = "mean of the samples"
	return out
}
