package part

import "math"

// TwoPort is what the shop can measure of a transformer, and what the tank
// needs of it. With a center tap Ls, Lsc and M are the means of the halves.
type TwoPort struct {
	Lp        float64   // H, primary, all others open
	Ls        float64   // H, one secondary, all others open
	Lsc       float64   // H, primary with one secondary shorted, the other half open
	ShortHalf []float64 // H, for each secondary
	M         float64   // H, mutual inductance, magnitude
}

// NewTwoPort reduces the inductance matrix of the windings, primary first.
func NewTwoPort(l [][]float64) TwoPort {
	p := TwoPort{Lp: l[0][0]}
	if len(l) == 1 {
		return p
	}
	n := float64(len(l) - 1)
	for s := 1; s < len(l); s++ {
		short := l[0][0] - l[0][s]*l[0][s]/l[s][s]
		p.ShortHalf = append(p.ShortHalf, short)
		p.Lsc += short / n
		p.Ls += l[s][s] / n
	}
	p.M = math.Sqrt(math.Max(0, (p.Lp-p.Lsc)*p.Ls))
	return p
}

// Equivalent is the tank's view of a transformer: all leakage on the primary.
type Equivalent struct {
	Lm    float64 // H
	Ratio float64 // effective turns ratio
	Lleak float64 // H, what the transformer adds to the resonant inductance, stray loops included
}

// Equivalent closes the two-port with the stray inductance of one secondary
// loop. It is exact for two coupled windings:
//
//	M^2 = (Lp - Lsc) Ls   Lm = M^2/(Ls + Lstray)   n = M/(Ls + Lstray)   Lleak = Lp - Lm
func (p TwoPort) Equivalent(stray float64) Equivalent {
	ls := p.Ls + stray
	lm := p.M * p.M / ls
	return Equivalent{Lm: lm, Ratio: p.M / ls, Lleak: p.Lp - lm}
}

// Mismatch returns the difference of the short-circuit inductances of the two
// halves over their mean; 0 with a single secondary.
func (p TwoPort) Mismatch() float64 {
	if len(p.ShortHalf) < 2 || p.Lsc == 0 {
		return 0
	}
	return math.Abs(p.ShortHalf[0]-p.ShortHalf[1]) / p.Lsc
}
