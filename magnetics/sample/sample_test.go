package sample

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"gapwright/magnetics/part"
)

// TestCloseIsExact: the tank's three figures reproduce the impedances of the
// coupled windings they came from, at any frequency, open and shorted and with a
// load: the two-port has three free figures.
func TestCloseIsExact(t *testing.T) {
	lp, ls, k := 300e-6, 4.6875e-6, 0.96
	m := k * math.Sqrt(lp*ls)
	lsc := lp * (1 - k*k)
	for _, stray := range []float64{0, 30e-9} {
		r := Readings{Open: lp, ShortA: lsc, Secondary: ls}
		a, err := Close(r, Meter{}, stray)
		if err != nil {
			t.Fatal(err)
		}
		// Ideal meters: Lm, n and leak against the matrix with the stray inductance
		// in the secondary loop.
		lsx := ls + stray
		for _, load := range []complex128{0, 1, complex(0.3, 2), 1e9} {
			w := complex(2*math.Pi*130e3, 0)
			j := complex(0, 1)
			matrix := j*w*complex(lp, 0) + w*w*complex(m*m, 0)/(j*w*complex(lsx, 0)+load)
			n2 := complex(a.Ratio.Value*a.Ratio.Value, 0)
			zm, zl := j*w*complex(a.Lm.Value, 0), n2*load
			model := j*w*complex(a.Leak.Value, 0) + zm*zl/(zm+zl)
			if d := abs(matrix-model) / abs(matrix); d > 1e-9 {
				t.Errorf("stray %g, load %v: matrix %v, model %v", stray, load, matrix, model)
			}
		}
	}
	// The published case: Lp 300 uH, k 0.96, n 8 gives n_eff 7.68 (trade rule
	// n_eff = n k).
	a, _ := Close(Readings{Open: lp, ShortA: lsc, Secondary: ls}, Meter{}, 0)
	if math.Abs(a.Ratio.Value-7.68) > 1e-9 {
		t.Errorf("n_eff = %g, want 7.68", a.Ratio.Value)
	}
}

func abs(z complex128) float64 { return math.Hypot(real(z), imag(z)) }

func TestCloseRoutes(t *testing.T) {
	full := sound().read()
	want, err := Close(full, BenchMeter, 0)
	if err != nil {
		t.Fatal(err)
	}
	for name, drop := range map[string][]Quantity{
		"no Ls": {Secondary}, "no ratio": {RatioS, RatioP}, "only primary driven": {Secondary, RatioS},
	} {
		r := clone(full)
		for _, q := range drop {
			delete(r, q)
		}
		got, err := Close(r, BenchMeter, 0)
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		// The halves differ in Lsc by design, so that the routes through half A
		// alone and through the mean differ by half of that difference over Lp.
		tol := 0.5 * math.Abs(full[ShortA]-full[ShortB]) / full[Open]
		for _, v := range [][2]float64{{got.Lm.Value, want.Lm.Value}, {got.Ratio.Value, want.Ratio.Value}} {
			if math.Abs(v[0]/v[1]-1) > tol {
				t.Errorf("%s: %g against %g", name, v[0], v[1])
			}
		}
	}
	for name, r := range map[string]Readings{
		"nothing": {}, "no short": {Open: 1e-4, Secondary: 1e-6}, "no ratio": {Open: 1e-4, ShortA: 1e-6},
		"short above open": {Open: 1e-6, ShortA: 1e-4, Secondary: 1e-6},
	} {
		if a, err := Close(r, BenchMeter, 0); err == nil {
			t.Errorf("%s: closed to %+v", name, a)
		}
	}
	r := clone(full)
	r[Secondary] *= 1.1
	if a, err := Close(r, BenchMeter, 0); err != nil || len(a.Notes) != 1 {
		t.Errorf("an Ls that is 10 %% off the ratio: notes %v, err %v", a.Notes, err)
	}
}

// TestCloseUncertainty holds the propagated deviations against a plain
// simulation of the meter.
func TestCloseUncertainty(t *testing.T) {
	r := sound().read()
	m := BenchMeter
	m.ShortLoop = 0
	a, err := Close(r, m, 20e-9)
	if err != nil {
		t.Fatal(err)
	}
	rng := rand.New(rand.NewPCG(3, 4))
	const n = 4000
	var lm, ratio, leak []float64
	for range n {
		x := clone(r)
		for _, q := range r.quantities(r) {
			x[q] *= 1 + m.deviation(q)*rng.NormFloat64()
		}
		b, err := Close(x, m, 20e-9)
		if err != nil {
			t.Fatal(err)
		}
		lm, ratio, leak = append(lm, b.Lm.Value), append(ratio, b.Ratio.Value), append(leak, b.Leak.Value)
	}
	for _, c := range []struct {
		name string
		got  float64
		list []float64
	}{{"Lm", a.Lm.Sigma, lm}, {"n", a.Ratio.Sigma, ratio}, {"leak", a.Leak.Sigma, leak}} {
		// The deviation of 4000 draws is known to 1/sqrt(8000) = 1.1 %; 4 sigma.
		if want := deviation(c.list); math.Abs(c.got/want-1) > 0.045 {
			t.Errorf("sigma of %s = %g, simulated %g", c.name, c.got, want)
		}
	}
}

func deviation(x []float64) float64 {
	mean, sum := 0.0, 0.0
	for _, v := range x {
		mean += v / float64(len(x))
	}
	for _, v := range x {
		sum += (v - mean) * (v - mean)
	}
	return math.Sqrt(sum / float64(len(x)-1))
}

func TestMedian(t *testing.T) {
	m := Median([]Readings{{Open: 3, ShortA: 1}, {Open: 1}, {Open: 100, ShortA: 2}})
	if m[Open] != 3 || m[ShortA] != 1.5 || len(m) != 2 {
		t.Errorf("Median = %v, want 3 and 1.5", m)
	}
}

func TestMeanAsBuilt(t *testing.T) {
	list := []AsBuilt{{Lm: Uncertain{100, 1}}, {Lm: Uncertain{104, 1}}}
	// Spread 2 sqrt 2, over sqrt 2: 2; with the meter's 1 in quadrature.
	if m := MeanAsBuilt(list); m.Lm.Value != 102 || math.Abs(m.Lm.Sigma-math.Sqrt(5)) > 1e-12 {
		t.Errorf("mean %+v, want 102 and sqrt 5", m.Lm)
	}
}

// TestCorrection plays a shop: parts scatter in permeability, area, glue and
// grinding; one correction, carried out exactly, must bring Lp within 1.5 % in
// at least 95 of 100, with the nearest stock film within that and half a step of
// the film.
func TestCorrection(t *testing.T) {
	stock := []float64{0.05e-3, 0.075e-3, 0.1e-3, 0.125e-3, 0.19e-3, 0.25e-3, 0.35e-3, 0.5e-3}
	rng := rand.New(rand.NewPCG(5, 6))
	target, err := law(0.63e-3, 0)
	if err != nil {
		t.Fatal(err)
	}
	const n = 400
	good, before, worst, films, filmGood := 0, 0.0, 0.0, 0, 0
	for range n {
		s := sound()
		s.mu *= 1 + 0.25*(2*rng.Float64()-1)
		s.area *= 1 + 0.03*(2*rng.Float64()-1)
		s.gap += 30e-6 * (2*rng.Float64() - 1)
		s.joint = 40e-6 * rng.Float64()
		if rng.IntN(2) == 0 {
			s.gap -= 0.12e-3 // a shop that starts from the small side
		}
		measured := s.np * s.np * s.permeance()
		before = math.Max(before, math.Abs(measured/target-1))
		c, err := Correct(part.Ground, 0.63e-3, target, measured, 0, law, stock)
		if err != nil {
			t.Fatal(err)
		}
		ground := s
		ground.gap += c.Ground
		off := ground.np*ground.np*ground.permeance()/target - 1
		worst = math.Max(worst, math.Abs(off))
		if math.Abs(off) <= 0.015 {
			good++
		}
		if c.Ground <= 0 || len(c.Stack) == 0 {
			continue
		}
		films++
		film := s
		film.joint += c.StackTotal
		off = film.np*film.np*film.permeance()/target - 1
		// Half of a step of the thinnest film, 0.05 mm.
		lo, _ := law(c.GapNow, c.StackTotal+25e-6)
		hi, _ := law(c.GapNow, c.StackTotal-25e-6)
		if math.Abs(off) <= 0.015+(hi-lo)/2/target {
			filmGood++
		}
	}
	t.Logf("before up to %.1f %%; after grinding %d of %d within 1.5 %%, worst %.2f %%; film %d of %d", before*100, good, n, worst*100, filmGood, films)
	if good < n*95/100 || filmGood < films*95/100 || films < n/4 {
		t.Errorf("%d of %d by grinding, %d of %d by film; want 95 %%", good, n, filmGood, films)
	}
	if before < 0.08 {
		t.Errorf("the parts were off by %.3f at most: the test shows nothing", before)
	}
}

func TestCorrectionWords(t *testing.T) {
	target, _ := law(0.63e-3, 0)
	for _, tc := range []struct {
		name     string
		kind     part.GapKind
		nominal  float64
		measured float64
		law      Law
		last     string
	}{
		{"high", part.Ground, 0.63e-3, 1.08 * target, law, "grind the post"},
		{"low", part.Ground, 0.63e-3, 0.93 * target, law, "off the faces of the outer legs"},
		{"fine", part.Ground, 0.63e-3, 1.005 * target, law, "leave the gap"},
		{"film low", part.Spacer, 0.35e-3, 0.93 * target, law, "nearest stock"},
	} {
		c, err := Correct(tc.kind, tc.nominal, target, tc.measured, 0.01, tc.law, []float64{0.05e-3, 0.1e-3, 0.25e-3})
		if err != nil {
			t.Fatalf("%s: %v", tc.name, err)
		}
		if last := c.Steps[len(c.Steps)-1]; !strings.Contains(last, tc.last) {
			t.Errorf("%s: last step %q, want %q", tc.name, last, tc.last)
		}
	}
	for name, f := range map[string]func() error{
		"no gap":     func() error { _, err := Correct(part.Closed, 0, target, target, 0, law, nil); return err },
		"above core": func() error { _, err := Correct(part.Ground, 1e-3, target, 100*target, 0, law, nil); return err },
		"zero":       func() error { _, err := Correct(part.Ground, 1e-3, 0, target, 0, law, nil); return err },
		"nan":        func() error { _, err := Correct(part.Ground, 1e-3, math.NaN(), target, 0, law, nil); return err },
		"law fails": func() error {
			_, err := Correct(part.Ground, 1e-3, target, target, 0, func(a, b float64) (float64, error) { return 0, fmt.Errorf("no") }, nil)
			return err
		},
	} {
		if f() == nil {
			t.Errorf("%s: no error", name)
		}
	}
}

// TestFromTwo: between two gaps that were tried the straight line in 1/L is
// good to 0.5 %, a fifth of their distance outside to 1 % (the trade's own
// figures for this method).
func TestFromTwo(t *testing.T) {
	l1, _ := law(0.5e-3, 0)
	l2, _ := law(0.7e-3, 0)
	for _, tc := range []struct{ gap, tol float64 }{{0.55e-3, 0.005}, {0.6e-3, 0.005}, {0.65e-3, 0.005}, {0.46e-3, 0.01}, {0.74e-3, 0.01}} {
		want, _ := law(tc.gap, 0)
		g, outside, err := FromTwo(0.5e-3, l1, 0.7e-3, l2, want)
		if err != nil {
			t.Fatal(err)
		}
		got, _ := law(g, 0)
		if math.Abs(got/want-1) > tc.tol || (outside > 0) != (tc.gap < 0.5e-3 || tc.gap > 0.7e-3) {
			t.Errorf("for %g mm: advice %g mm gives %+.2f %%, outside %g", tc.gap*1e3, g*1e3, (got/want-1)*100, outside)
		}
	}
	if _, _, err := FromTwo(0.4e-3, 1, 0.8e-3, 2, 1.5); err == nil {
		t.Error("a longer gap with a higher inductance was accepted")
	}
}

// faulty returns a build with one fault of the given kind, three to six standard
// deviations of the sound spread large, or of the smallest count.
func faulty(rng *rand.Rand, class Class, spread Spread) shop {
	s := build(rng, spread)
	size := 3 + 3*rng.Float64()
	d := designed()
	slope := -d.GapSlope
	sigmaL := math.Sqrt(sq(d.CoreShare*spread.Permeability) + sq(spread.Area) + sq(slope*spread.Gap))
	sign := 1.0
	if rng.IntN(2) == 0 {
		sign = -1
	}
	switch class {
	case ReluctanceHigh:
		if rng.IntN(2) == 0 {
			s.gap += size * sigmaL / slope
		} else {
			s.joint += size * sigmaL / slope / 2
		}
	case ReluctanceLow:
		s.gap -= size * sigmaL / slope
		if s.gap < 0 {
			s.gap = 0
		}
	case PrimaryTurn:
		s.np += sign
	case SecondaryTurn:
		switch rng.IntN(3) {
		case 0:
			s.na += sign
		case 1:
			s.nb += sign
		default:
			s.na += sign
			s.nb += sign
		}
	case ShortedTurn:
		s.shorted, s.shortedR = true, 2e-3+30e-3*rng.Float64()
	case StrandsLost:
		f := math.Exp(size * math.Hypot(spread.Winding, spread.Meter.Resistance))
		switch rng.IntN(3) {
		case 0:
			s.wireP *= f
		case 1:
			s.wireA *= f
		default:
			s.wireB *= f
		}
	case WireWrong:
		f := math.Exp(sign * size * math.Hypot(spread.Resistance, spread.Meter.Resistance))
		s.wireP *= f
		s.wireA *= f
		s.wireB *= f
	case BarrierThick, BarrierThin:
		m := size * math.Hypot(spread.Capacitance, spread.Meter.Capacitance) / -d.BarrierC
		if class == BarrierThin {
			m = -m
		}
		s.barrier *= math.Exp(m)
	case HalvesUnequal:
		m := size * math.Hypot(spread.LeakageHalf*math.Sqrt2, spread.Meter.Inductance*math.Sqrt2)
		if rng.IntN(2) == 0 {
			s.leakA *= math.Exp(sign * m)
		} else {
			s.leakA *= math.Exp(sign * m / 2)
			s.leakB *= math.Exp(-sign * m / 2)
		}
	case WrongShort:
		s.swap = []string{"swapped", "A twice", "B twice", "both"}[rng.IntN(4)]
	}
	return s
}

var faultClasses = []Class{
	ReluctanceHigh, ReluctanceLow, PrimaryTurn, SecondaryTurn, ShortedTurn, StrandsLost, WireWrong, BarrierThick, BarrierThin, HalvesUnequal, WrongShort,
}

// TestFingerprint: 200 synthetic builds, one fault each; the right kind must
// come first in at least 90 of 100.
func TestFingerprint(t *testing.T) {
	rng := rand.New(rand.NewPCG(2026, 12))
	d := designed()
	const n = 200
	right := 0
	wrong := map[string]int{}
	glue, glueRight := 0, 0
	for i := range n {
		class := faultClasses[i%len(faultClasses)]
		s := faulty(rng, class, shopSpread)
		g, err := Explain(d, measure(rng, s, shopSpread.Meter), shopSpread)
		if err != nil {
			t.Fatal(err)
		}
		if g.Causes[0].Class == class {
			right++
			if class == ReluctanceHigh {
				glue++
				if strings.Contains(g.Causes[0].Text, "mating faces") == (s.joint > 20e-6) {
					glueRight++
				}
			}
		} else {
			wrong[fmt.Sprintf("%s taken for %s", class, g.Causes[0].Class)]++
		}
		sum := 0.0
		for _, c := range g.Causes {
			sum += c.Probability
		}
		if math.Abs(sum-1) > 1e-9 {
			t.Fatalf("probabilities add up to %g", sum)
		}
	}
	t.Logf("%d of %d right; %v; glue told from grinding in %d of %d", right, n, wrong, glueRight, glue)
	if right < n*90/100 {
		t.Errorf("%d of %d right, want 90 %%", right, n)
	}
	if glueRight < glue*9/10 {
		t.Errorf("glue told from grinding in %d of %d", glueRight, glue)
	}
}

// TestSoundBuilds: parts without a fault are seldom called faulty.
func TestSoundBuilds(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 9))
	d := designed()
	const n = 200
	good := 0
	for range n {
		g, err := Explain(d, measure(rng, build(rng, shopSpread), shopSpread.Meter), shopSpread)
		if err != nil {
			t.Fatal(err)
		}
		if g.Causes[0].Class == NoFault {
			good++
		}
	}
	t.Logf("%d of %d sound builds called sound", good, n)
	if good < n*90/100 {
		t.Errorf("%d of %d sound builds called sound", good, n)
	}
}

// TestNextMeasurement: where two causes cannot be told apart by the readings at
// hand, the one asked for does it.
func TestNextMeasurement(t *testing.T) {
	d := designed()
	rng := rand.New(rand.NewPCG(4, 4))
	s := build(rng, shopSpread)
	s.barrier *= 1.8
	r := measure(rng, s, shopSpread.Meter)
	without := clone(r)
	delete(without, Capacitance)
	g, err := Explain(d, without, shopSpread)
	if err != nil {
		t.Fatal(err)
	}
	if first := g.Causes[0].Class; first != BarrierThick && first != PoorShort {
		t.Errorf("first cause %q", first)
	}
	if !strings.Contains(g.Next, "E10") {
		t.Errorf("next: %q, want the capacitance", g.Next)
	}
	g, err = Explain(d, r, shopSpread)
	if err != nil || g.Causes[0].Class != BarrierThick {
		t.Errorf("with the capacitance: %v %v", g.Causes[0], err)
	}
	// Lp low without the reading before glue: glue or grinding.
	s = build(rng, shopSpread)
	s.joint = 60e-6
	r = measure(rng, s, shopSpread.Meter)
	delete(r, OpenBefore)
	if g, err = Explain(d, r, shopSpread); err != nil || g.Causes[0].Class != ReluctanceHigh {
		t.Errorf("glue: %v %v", g.Causes, err)
	}
	if _, err := Explain(d, Readings{Open: 1e-4}, shopSpread); err == nil {
		t.Error("one reading was explained")
	}
}

// TestInductor: the faults that an inductor can have are told apart by its few
// readings.
func TestInductor(t *testing.T) {
	l := part.Inductor{Construction: part.Construction{Windings: []part.Winding{{Name: "L", Turns: 18}}}}
	r := part.Rating{OpenInductance: 57e-6, Windings: []part.WindingRating{{Name: "L", Turns: 18, DCResistance: 0.036, MeanLengthOfTurn: 0.065}},
		Gap: part.GapRating{AL: 176e-9, Ungapped: 2700e-9, Sensitivity: -540}}
	d, err := NewInductorDesign(l, r)
	if err != nil {
		t.Fatal(err)
	}
	for name, tc := range map[string]struct {
		l, before, resistance float64
		want                  Class
	}{
		"sound":        {1.005, 1.005, 1.002, NoFault},
		"glue":         {0.88, 1.0, 1.0, ReluctanceHigh},
		"ground deep":  {0.88, 0.88, 1.0, ReluctanceHigh},
		"turn missing": {17. * 17 / 18 / 18, 17. * 17 / 18 / 18, 17. / 18, PrimaryTurn},
		"shorted turn": {0.06, 0.06, 1.0, ShortedTurn},
		"strands":      {1.0, 1.0, 1.12, StrandsLost},
	} {
		g, err := Explain(d, Readings{Open: tc.l * 57e-6, OpenBefore: tc.before * 57e-6, Resistance("L"): tc.resistance * 0.036}, UsualSpread)
		if err != nil {
			t.Fatal(err)
		}
		first := g.Causes[0].Class
		// One winding alone: lost strands and a wrong wire look the same.
		if first != tc.want && !(tc.want == StrandsLost && first == WireWrong) {
			t.Errorf("%s: %v", name, g.Causes[:2])
		}
	}
	if _, err := NewInductorDesign(part.Inductor{}, part.Rating{}); err == nil {
		t.Error("an inductor without a winding was accepted")
	}
}

// TestDeterministic: the order of causes does not depend on the order of maps.
func TestDeterministic(t *testing.T) {
	d := designed()
	r := measure(rand.New(rand.NewPCG(1, 1)), faulty(rand.New(rand.NewPCG(1, 2)), BarrierThin, shopSpread), BenchMeter)
	first, err := Explain(d, r, shopSpread)
	if err != nil {
		t.Fatal(err)
	}
	for range 5 {
		g, err := Explain(d, r, shopSpread)
		if err != nil || fmt.Sprint(g.Causes) != fmt.Sprint(first.Causes) || g.Next != first.Next {
			t.Errorf("differs: %v %v", g, err)
		}
	}
}

func BenchmarkExplain(b *testing.B) {
	d := designed()
	r := sound().read()
	b.ReportAllocs()
	for b.Loop() {
		if _, err := Explain(d, r, shopSpread); err != nil {
			b.Fatal(err)
		}
	}
}
