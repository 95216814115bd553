package sample

import (
	"math"
	"math/cmplx"
	"math/rand/v2"

	"gapwright/corelib/quantity"
)

// shop is a transformer as a shop could build it, computed from its dimensions
// by textbook forms and from its inductance matrix: nothing of the package under
// test is used. Two stacked secondaries lie over the primary, so that the halves
// differ.
type shop struct {
	np, na, nb             float64
	mu, area, gap, joint   float64 // relative permeability, m2, m of ground gap, m of film or glue in every joint
	le                     float64 // m
	breadth, turn          float64 // m, winding breadth and mean turn
	hp, hs, barrier, inter float64 // m, heights of primary and one secondary, barrier and interlayer
	leak, leakA, leakB     float64 // factors
	cap                    float64 // factor
	wireP, wireA, wireB    float64 // factors of the resistance
	shorted                bool
	shortedR               float64 // ohm
	swap                   string
}

func sound() shop {
	return shop{
		np: 32, na: 8, nb: 8, mu: 2300, area: 125e-6, gap: 0.63e-3, le: 92e-3, breadth: 25.7e-3, turn: 66e-3,
		hp: 2.4e-3, hs: 1.3e-3, barrier: 0.5e-3, inter: 0.06e-3, leak: 1, leakA: 1, leakB: 1, cap: 1, wireP: 1, wireA: 1, wireB: 1,
	}
}

// fringing is McLyman's factor for a gap in the post.
func fringing(gap, area, window float64) float64 {
	if gap <= 0 {
		return 1
	}
	return 1 + gap/math.Sqrt(area)*math.Log(2*window/gap)
}

// permeance is the inductance per turn squared. Film or glue lies in the joint
// of the post and in those of the outer legs.
func (s shop) permeance() float64 {
	mu0 := quantity.Mu0
	post := s.gap + s.joint
	r := s.le / (mu0 * s.mu * s.area)
	r += post / (mu0 * s.area * fringing(post, s.area, 28e-3))
	r += s.joint / (mu0 * s.area * fringing(s.joint, s.area, 28e-3))
	return 1 / r
}

// leakages per turn squared: of each half with the primary, and between them.
func (s shop) leakages() (a, b, ab float64) {
	k := quantity.Mu0 * s.turn / s.breadth * s.leak
	a = k * (s.hp/3 + s.barrier + s.hs/3) * s.leakA
	b = k * (s.hp/3 + s.barrier + s.hs + s.inter + s.hs/3) * s.leakB
	ab = k * (2*s.hs/3 + s.inter)
	return a, b, ab
}

const shopFrequency = 100e3

// matrix returns the complex inductances of P, A and B, the shorted turn
// eliminated.
func (s shop) matrix() [3][3]complex128 {
	lambda := s.permeance()
	a, b, ab := s.leakages()
	n := [3]float64{s.np, s.na, s.nb}
	var m [3][3]complex128
	for i := range 3 {
		m[i][i] = complex(n[i]*n[i]*lambda, 0)
	}
	mutual := func(i, j int, leak float64) {
		// Lsc = Np² leak = Lp - M²/Ls.
		v := n[i] * n[j] * lambda * math.Sqrt(1-leak/lambda)
		m[i][j], m[j][i] = complex(v, 0), complex(v, 0)
	}
	mutual(0, 1, a)
	mutual(0, 2, b)
	mutual(1, 2, ab)
	if s.shorted {
		// One turn inside the primary: near to it, farther from the others.
		leak := [3]float64{a * 0.2, a * 0.7, b * 0.75}
		w := 2 * math.Pi * shopFrequency
		z := complex(s.shortedR, w*lambda)
		var t [3]complex128
		for i := range 3 {
			t[i] = complex(n[i]*lambda*math.Sqrt(1-leak[i]/lambda), 0)
		}
		for i := range 3 {
			for j := range 3 {
				m[i][j] -= complex(0, w) * t[i] * t[j] / z
			}
		}
	}
	return m
}

// read measures the part, without the meter's own error.
func (s shop) read() Readings {
	m := s.matrix()
	out := Readings{
		Open: real(m[0][0]), Secondary: real(m[1][1]),
		RatioP: cmplx.Abs(m[0][0] / m[1][0]), RatioS: cmplx.Abs(m[0][1] / m[1][1]), RatioB: cmplx.Abs(m[0][0] / m[2][0]),
	}
	dry := s
	dry.joint = 0
	out[OpenBefore] = real(dry.matrix()[0][0])
	short := func(i int) float64 { return real(m[0][0] - m[0][i]*m[0][i]/m[i][i]) }
	// Both at once: the two-by-two block of the secondaries is inverted.
	det := m[1][1]*m[2][2] - m[1][2]*m[1][2]
	both := real(m[0][0] - (m[0][1]*m[0][1]*m[2][2]-2*m[0][1]*m[0][2]*m[1][2]+m[0][2]*m[0][2]*m[1][1])/det)
	a, b := short(1), short(2)
	switch s.swap {
	case "swapped":
		a, b = b, a
	case "A twice":
		b = a
	case "B twice":
		a = b
	case "both":
		a, b = both, both
	}
	out[ShortA], out[ShortB] = a, b
	// Plate capacitor: barrier and the enamel and serving on both sides of it.
	const er, e0, enamel = 3.3, 8.8541878128e-12, 0.06e-3
	out[Capacitance] = s.cap * er * e0 * s.turn * s.breadth / (s.barrier + 2*enamel)
	rho := 1 / 58e6
	out[Resistance("P")] = s.wireP * rho * s.np * 60e-3 / (60 * math.Pi / 4 * 0.1e-3 * 0.1e-3)
	out[Resistance("S-A")] = s.wireA * rho * s.na * 70e-3 / (120 * math.Pi / 4 * 0.1e-3 * 0.1e-3)
	out[Resistance("S-B")] = s.wireB * rho * s.nb * 76e-3 / (120 * math.Pi / 4 * 0.1e-3 * 0.1e-3)
	return out
}

// designed is what the package knows of the sound part: nominal readings and
// slopes taken from the part by differences.
func designed() Design {
	s := sound()
	d := Design{Primary: "P", Secondaries: []string{"S-A", "S-B"}, Np: 32, Ns: []int{8, 8}, Nominal: s.read()}
	d.Nominal[Quality] = 100
	for _, w := range []string{"P", "S-A", "S-B"} {
		d.Nominal[Reel(w)] = 0.04
	}
	closed := s
	closed.gap = 0
	d.CoreShare = s.permeance() / closed.permeance()
	up := s
	up.gap += 1e-5
	d.GapSlope = (up.permeance()/s.permeance() - 1) / 1e-5
	thick := s
	thick.barrier *= 1.01
	r := thick.read()
	d.BarrierLeak[0] = math.Log(r[ShortA]/d.Nominal[ShortA]) / math.Log(1.01)
	d.BarrierLeak[1] = math.Log(r[ShortB]/d.Nominal[ShortB]) / math.Log(1.01)
	d.BarrierC = math.Log(r[Capacitance]/d.Nominal[Capacitance]) / math.Log(1.01)
	return d
}

// shopSpread is what the synthetic shop scatters by.
var shopSpread = Spread{
	Permeability: 0.125, Area: 0.015, Gap: 12e-6, Glue: 3e-6, Leakage: 0.04, LeakageHalf: 0.01, Capacitance: 0.07,
	Resistance: 0.012, Winding: 0.006, Resonance: 0.2, Meter: BenchMeter,
}

// build returns a part with the shop's scatter.
func build(rng *rand.Rand, spread Spread) shop {
	s := sound()
	factor := func(sigma float64) float64 { return math.Exp(sigma * rng.NormFloat64()) }
	s.mu *= factor(spread.Permeability)
	s.area *= factor(spread.Area)
	s.gap += spread.Gap * rng.NormFloat64()
	s.joint = math.Abs(spread.Glue * rng.NormFloat64())
	s.leak = factor(spread.Leakage)
	s.leakA, s.leakB = factor(spread.LeakageHalf), factor(spread.LeakageHalf)
	s.cap = factor(spread.Capacitance)
	all := factor(spread.Resistance)
	s.wireP, s.wireA, s.wireB = all*factor(spread.Winding), all*factor(spread.Winding), all*factor(spread.Winding)
	return s
}

// measure adds the meter's error.
func measure(rng *rand.Rand, s shop, m Meter) Readings {
	out := Readings{}
	r := s.read()
	for _, q := range r.quantities(r) {
		out[q] = r[q] * (1 + m.deviation(q)*rng.NormFloat64())
	}
	return out
}

// law is the sound part's inductance, as the rating would give it.
func law(ground, film float64) (float64, error) {
	s := sound()
	s.gap, s.joint = ground, film
	return s.np * s.np * s.permeance(), nil
}
