package coreloss

import (
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"gapwright/corelib/material"
)

// law is a ferrite of one power law without temperature.
func law(t testing.TB, k, alpha, beta float64) *material.Ferrite {
	t.Helper()
	m, err := material.New("law", material.LossSet{ID: "S", K: k, Alpha: alpha, Beta: beta,
		FMin: 1e3, FMax: 1e7, TMin: -50, TMax: 200, TRef: 25, Heat: material.HeatNone})
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func pw3(t testing.TB) *material.Ferrite {
	t.Helper()
	m, err := material.Embedded().Find("PW3")
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// sampled returns corners of f over one period, n of them and the closing one.
func sampled(period float64, n int, f func(turn float64) float64) (t, b []float64) {
	for i := range n + 1 {
		u := float64(i) / float64(n)
		t = append(t, period*u)
		b = append(b, f(u-math.Floor(u)))
	}
	b[n] = b[0]
	return t, b
}

func density(t testing.TB, ts, b []float64, m *material.Ferrite, temp float64) Loss {
	t.Helper()
	l, err := Density(ts, b, m, temp)
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// Closed-form values computed with 40 digits (testdata/coreloss/igse.json names
// formula and source). Piecewise-linear cases are exact, so they must agree to the
// file's 1e-9; smooth ones are sampled with 2^17 corners, whose error, at most
// alpha pi²/(6 N²) = 2.7e-10 (a chord is shorter than its arc), stays below it too.
func TestCheckValues(t *testing.T) {
	data, err := os.ReadFile(filepath.Join("..", "..", "testdata", "coreloss", "igse.json"))
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Tolerance float64 `json:"tolerance_rel"`
		Sets      []struct{ ID, K, Alpha, Beta string }
		Cases     []struct {
			ID, Kind, Set string
			F             float64 `json:"f_Hz"`
			B             float64 `json:"B_peak_T"`
			BUnit         float64 `json:"B_unit_T"`
			Duty          float64
			Active        float64 `json:"duty_active"`
			Ratio         float64 `json:"third_ratio"`
			Phase         float64 `json:"third_phase_rad"`
			Scale         float64
			Cos           float64 `json:"cos_integral"`
			Vertices      [][2]float64
			Major         float64 `json:"major_part"`
			Minor         float64 `json:"minor_part"`
			Value         float64
		}
	}
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	type set struct{ k, alpha, beta float64 }
	sets := map[string]set{}
	for _, s := range file.Sets {
		var v [3]float64
		for i, text := range []string{s.K, s.Alpha, s.Beta} {
			if v[i], err = strconv.ParseFloat(text, 64); err != nil {
				t.Fatal(err)
			}
		}
		sets[s.ID] = set{v[0], v[1], v[2]}
	}
	seen := map[string]int{}
	for _, c := range file.Cases {
		t.Run(c.ID, func(t *testing.T) {
			seen[c.Kind]++
			s := sets[c.Set]
			m := law(t, s.k, s.alpha, s.beta)
			var ts, b []float64
			corners := func(unit float64, list ...[2]float64) {
				for _, v := range list {
					ts, b = append(ts, v[0]/c.F), append(b, v[1]*unit)
				}
			}
			const n = 1 << 17
			loops := 1
			switch c.Kind {
			case "ki":
				if got := cosIntegral(s.alpha); math.Abs(got/c.Cos-1) > 1e-13 {
					t.Errorf("integral of |cos|^%g = %.16g, want %.16g", s.alpha, got, c.Cos)
				}
				// A triangle of 1 T at 1 Hz, up and down in half a second each, has
				// ki dB^beta 2^alpha as its loss.
				got := density(t, []float64{0, 0.5, 1}, []float64{0, 1, 0}, m, 25).Density
				if want := c.Value * math.Pow(2, s.alpha); math.Abs(got/want-1) > file.Tolerance {
					t.Errorf("ki 2^alpha = %.12g, want %.12g", got, want)
				}
				return
			case "sine":
				ts, b = sampled(1/c.F, n, func(u float64) float64 { return c.B * math.Sin(2*math.Pi*u) })
			case "sine_plus_third":
				ts, b = sampled(1/c.F, n, func(u float64) float64 {
					return c.Scale * (math.Sin(2*math.Pi*u) + c.Ratio*math.Sin(6*math.Pi*u+c.Phase))
				})
			case "triangle", "asymmetric_triangle":
				corners(c.B, [2]float64{0, -1}, [2]float64{c.Duty, 1}, [2]float64{1, -1})
			case "three_level_square_voltage":
				corners(c.B, [2]float64{0, -1}, [2]float64{c.Active / 2, 1}, [2]float64{0.5, 1}, [2]float64{(1 + c.Active) / 2, -1}, [2]float64{1, -1})
			case "piecewise_linear":
				corners(c.B, c.Vertices...)
			case "piecewise_linear_with_minor_loop":
				corners(c.BUnit, c.Vertices...)
				loops = 2
			default:
				t.Fatalf("unknown kind %q", c.Kind)
			}
			got := density(t, ts, b, m, 25)
			if math.Abs(got.Density/c.Value-1) > file.Tolerance {
				t.Errorf("%.12g W/m³, want %.12g (%+.2g)", got.Density, c.Value, got.Density/c.Value-1)
			}
			if got.Loops != loops {
				t.Errorf("%d loops, want %d", got.Loops, loops)
			}
			if c.Major != 0 {
				var l Loops
				if err := l.Split(ts, b); err != nil {
					t.Fatal(err)
				}
				if _, err := l.Density(m, 1, 25); err != nil {
					t.Fatal(err)
				}
				minor, major := l.loops[0].share*c.F, l.loops[1].share*c.F
				if math.Abs(minor/c.Minor-1) > file.Tolerance || math.Abs(major/c.Major-1) > file.Tolerance {
					t.Errorf("minor %.12g, major %.12g; want %.12g, %.12g", minor, major, c.Minor, c.Major)
				}
			}
		})
	}
	for _, kind := range []string{"ki", "sine", "triangle", "asymmetric_triangle", "three_level_square_voltage", "piecewise_linear", "sine_plus_third", "piecewise_linear_with_minor_loop"} {
		if seen[kind] == 0 {
			t.Errorf("no case of kind %s", kind)
		}
	}
}

// A sine has to give back the Steinmetz value, with banded sets and heat too, and
// the error of sampling has to fall with the square of the number of corners.
func TestSineIsSteinmetz(t *testing.T) {
	m := pw3(t)
	for _, c := range []struct{ f, B, temp float64 }{{60e3, 0.2, 25}, {100e3, 0.1, 100}, {170e3, 0.08, 80}, {450e3, 0.03, 60}} {
		want, err := m.LossDensity(c.f, c.B, c.temp)
		if err != nil {
			t.Fatal(err)
		}
		var errs []float64
		for _, n := range []int{64, 128, 256} {
			ts, b := sampled(1/c.f, n, func(u float64) float64 { return c.B * math.Cos(2*math.Pi*u) })
			got := density(t, ts, b, m, c.temp)
			errs = append(errs, got.Density/want.Density-1)
			if math.Abs(got.Frequency/c.f-1) > 10/float64(n*n) {
				t.Errorf("equivalent frequency %g of a sine of %g Hz", got.Frequency, c.f)
			}
			// The bound of the package comment. Twice that share of the frequency is lost
			// too, where the slope of the loss differs from Alpha by up to 0.5: the
			// hot-over-cold ratio enters Alpha with its mean slope over an octave.
			if e := errs[len(errs)-1]; e > 0 || -e > (want.Alpha+2*0.5)*math.Pi*math.Pi/6/float64(n*n) {
				t.Errorf("%g Hz, %d corners: off by %.2g", c.f, n, errs[len(errs)-1])
			}
		}
		for i := 1; i < len(errs); i++ {
			if order := math.Log2(errs[i-1] / errs[i]); order < 1.8 || order > 2.5 {
				t.Errorf("%v: error falls with order %.2f, want 2", c, order)
			}
		}
	}
}

// wavy returns a random closed polygon, with minor loops when turns > 1.
func wavy(r *rand.Rand, turns int) (t, b []float64) {
	n := 6 + r.IntN(20)
	at := 0.0
	for i := range n {
		t = append(t, at)
		at += (0.2 + r.Float64()) * 1e-6
		u := float64(i) / float64(n)
		if turns <= 1 { // up and down once
			if u < 0.4 {
				b = append(b, float64(i)+r.Float64())
			} else {
				b = append(b, float64(n-i)+r.Float64())
			}
			continue
		}
		b = append(b, math.Sin(2*math.Pi*u)+0.6*r.Float64())
	}
	if turns <= 1 {
		top := slices.Index(b, slices.Max(b))
		slices.Sort(b[:top+1])
		slices.SortFunc(b[top:], func(x, y float64) int { return int(math.Copysign(1, y-x)) })
	}
	scale := 0.1 / slices.Max(b)
	for i := range b {
		b[i] *= scale
	}
	return append(t, at), append(b, b[0])
}

func TestInvariants(t *testing.T) {
	m := pw3(t)
	r := rand.New(rand.NewPCG(3, 9))
	minor := 0
	for i := range 200 {
		ts, b := wavy(r, 1+i%2)
		base := density(t, ts, b, m, 70)
		if base.Loops > 1 {
			minor++
		}
		same := func(what string, got Loss, factor float64) {
			t.Helper()
			// Sums of some 20 powers: rounding of 1e-13 at most.
			if math.Abs(got.Density/(factor*base.Density)-1) > 1e-12 {
				t.Errorf("case %d (%d loops): %s changes the loss from %.15g to %.15g", i, base.Loops, what, base.Density*factor, got.Density)
			}
		}
		n := len(ts) - 1
		// Start anywhere in the period.
		k := 1 + r.IntN(n-1)
		st, sb := []float64{0}, []float64{b[k]}
		for j := range n {
			a := (k + j) % n
			st = append(st, st[j]+ts[a+1]-ts[a])
			sb = append(sb, b[(a+1)%n])
		}
		same("a shift in time", density(t, st, sb, m, 70), 1)
		same("a DC offset", func() Loss {
			o := slices.Clone(b)
			for j := range o {
				o[j] += 0.03
			}
			return density(t, ts, o, m, 70)
		}(), 1)
		flip := slices.Clone(b)
		for j := range flip {
			flip[j] = -flip[j]
		}
		if base.Loops == 1 {
			same("the sign", density(t, ts, flip, m, 70), 1)
			rt, rb := make([]float64, n+1), make([]float64, n+1)
			for j := range rt {
				rt[j], rb[j] = ts[n]-ts[n-j], b[n-j]
			}
			same("reversal of time", density(t, rt, rb, m, 70), 1)
		}
		// Two periods in a row, and a corner that changes nothing.
		dt, db := slices.Clone(ts), slices.Clone(b)
		for j := 1; j <= n; j++ {
			dt, db = append(dt, ts[n]+ts[j]), append(db, b[j])
		}
		same("doubling the period", density(t, dt, db, m, 70), 1)
		ht := slices.Insert(slices.Clone(ts), 1, (ts[0]+ts[1])/2)
		hb := slices.Insert(slices.Clone(b), 1, (b[0]+b[1])/2)
		same("a corner on a straight line", density(t, ht, hb, m, 70), 1)

		// One power law: loss goes with B^beta and f^alpha.
		one := law(t, 5, 1.45, 2.6)
		base = density(t, ts, b, one, 25)
		tb, tt := slices.Clone(b), slices.Clone(ts)
		for j := range tb {
			tb[j] *= 2
			tt[j] /= 3
		}
		same("twice the flux", density(t, ts, tb, one, 25), math.Pow(2, 2.6))
		same("three times the frequency", density(t, tt, b, one, 25), math.Pow(3, 1.45))
		var l Loops
		if err := l.Split(ts, b); err != nil {
			t.Fatal(err)
		}
		got, err := l.Density(one, -2, 25)
		if err != nil {
			t.Fatal(err)
		}
		same("scale -2", got, math.Pow(2, 2.6))
	}
	if minor < 50 {
		t.Errorf("only %d waveforms with minor loops: the test is weaker than meant", minor)
	}
}

// Nested minor loops by hand, with alpha = 2 and beta = 2: the loss is then the
// integral of (dB/dt)² over everything, however it is split, and every piece counts
// once. With beta = 3 each loop's part is weighted with its own swing.
func TestNestedLoopsByHand(t *testing.T) {
	ts := []float64{0, 1, 2, 3, 4, 5, 6}
	b := []float64{0, 0.6, 0.2, 0.5, 0.3, 1, 0} // 0.6→0.2→0.6 holds 0.5→0.3→0.5
	sq := density(t, ts, b, law(t, 2, 2, 2), 25)
	// ki of alpha = beta = 2: k/(2 pi · pi).
	ki := 2 / (2 * math.Pi * math.Pi)
	want := ki * (0.36 + 0.16 + 0.09 + 0.04 + 0.49 + 1) / 6
	if sq.Loops != 3 || math.Abs(sq.Density/want-1) > 1e-12 {
		t.Errorf("%d loops, %.14g W/m³; want 3, %.14g", sq.Loops, sq.Density, want)
	}
	// beta = 3: ki is half of that; swings 0.2, 0.4, 1. The last rise of 0.7 in 1 s is
	// cut at 0.5 and 0.6: 0.2 to the inner loop, 0.1 to the outer, 0.4 to the major one.
	inner := 0.2 * (0.04 + 0.2*0.7)
	outer := 0.4 * (0.16 + 0.09 + 0.1*0.7)
	major := 1 * (0.36 + 0.4*0.7 + 1)
	cube := density(t, ts, b, law(t, 2, 2, 3), 25)
	if want := ki / 2 * (inner + outer + major) / 6; math.Abs(cube.Density/want-1) > 1e-12 {
		t.Errorf("beta 3: %.14g W/m³, want %.14g", cube.Density, want)
	}
}

func TestStandingFluxLosesNothing(t *testing.T) {
	got := density(t, []float64{0, 1e-6, 5e-6}, []float64{0.2, 0.2, 0.2}, pw3(t), 60)
	if got != (Loss{}) || got.Warnings(pw3(t)) != nil {
		t.Errorf("constant flux: %+v", got)
	}
	// Rounding noise on a flat top is no minor loop and raises no warning of its own.
	clean := density(t, []float64{0, 4e-6, 5e-6, 10e-6}, []float64{-0.1, 0.1, 0.1, -0.1}, pw3(t), 25)
	noisy := density(t, []float64{0, 4e-6, 4.2e-6, 4.4e-6, 4.6e-6, 5e-6, 10e-6},
		[]float64{-0.1, 0.1, 0.1 - 1e-15, 0.1, 0.1 - 2e-15, 0.1, -0.1}, pw3(t), 25)
	if math.Abs(noisy.Density/clean.Density-1) > 1e-12 || noisy.Loops != 1 || len(noisy.Warnings(pw3(t))) != len(clean.Warnings(pw3(t))) {
		t.Errorf("noise changes %+v to %+v", clean, noisy)
	}
}

func TestBadWaveforms(t *testing.T) {
	nan := math.NaN()
	for _, c := range []struct {
		t, b []float64
		want string
	}{
		{[]float64{0, 1}, []float64{0}, "2 times and 1 flux densities"},
		{nil, nil, "0 times"},
		{[]float64{0, 1, 1}, []float64{0, 1, 0}, "corner 2 at 1 s after 1 s"},
		{[]float64{0, 2, 1}, []float64{0, 1, 0}, "corner 2 at 1 s after 2 s"},
		{[]float64{0, 1, 2}, []float64{0, 1, 0.1}, "starts at 0 T and ends at 0.1 T"},
		{[]float64{0, 1, 2}, []float64{0, nan, 0}, "corner 1 at 1 s, NaN T"},
		{[]float64{0, math.Inf(1), 2}, []float64{0, 1, 0}, "corner 1 at +Inf s"},
		{[]float64{0, 1, 2}, []float64{-1e308, 1e308, -1e308}, "swing"},
	} {
		if _, err := Density(c.t, c.b, pw3(t), 25); !errors.Is(err, ErrWaveform) || !strings.Contains(err.Error(), c.want) {
			t.Errorf("Density(%v, %v): %v, want %q", c.t, c.b, err, c.want)
		}
	}
	if _, err := Density([]float64{0, 1e-6, 2e-6}, []float64{0, 0.1, 0}, pw3(t), nan); !errors.Is(err, material.ErrOperatingPoint) {
		t.Errorf("NaN °C: %v", err)
	}
}

// The slope that shapes the loss is the local one of the banded sets: a 50 % square
// voltage at 80 kHz and at 400 kHz in PW3 against the closed form with that slope.
func TestBandsUseTheLocalSlope(t *testing.T) {
	m := pw3(t)
	for _, f := range []float64{80e3, 130e3, 400e3} {
		const B = 0.06
		got := density(t, []float64{0, 0.5 / f, 1 / f}, []float64{-B, B, -B}, m, 25)
		fe := 8 / (math.Pi * math.Pi) * f // of a triangle
		if math.Abs(got.Frequency/fe-1) > 1e-12 {
			t.Errorf("equivalent frequency %g, want %g", got.Frequency, fe)
		}
		p, err := m.LossDensity(fe, B, 25)
		if err != nil {
			t.Fatal(err)
		}
		k := p.Density / (math.Pow(fe, p.Alpha) * math.Pow(B, p.Beta))
		ki := k / (math.Pow(2*math.Pi, p.Alpha-1) * math.Pow(2, p.Beta-p.Alpha) * cosIntegral(p.Alpha))
		want := ki * math.Pow(2*B, p.Beta) * math.Pow(f, p.Alpha) * math.Pow(2, p.Alpha)
		if math.Abs(got.Density/want-1) > 1e-12 {
			t.Errorf("%g Hz: %.12g W/m³, closed form %.12g", f, got.Density, want)
		}
		// Triangles lose a few percent less than the sine of the same swing.
		sine, _ := m.LossDensity(f, B, 25)
		if r := got.Density / sine.Density; r < 0.8 || r > 1 {
			t.Errorf("%g Hz: triangle over sine %g", f, r)
		}
	}
}

func TestDensityAllocatesNothing(t *testing.T) {
	ts, b := sampled(1e-5, 200, func(u float64) float64 { return 0.1*math.Sin(2*math.Pi*u) + 0.04*math.Sin(10*math.Pi*u) })
	m := pw3(t)
	var l Loops
	if err := l.Split(ts, b); err != nil {
		t.Fatal(err)
	}
	temp := 30.0
	if n := testing.AllocsPerRun(100, func() {
		temp += 0.1
		if err := l.Split(ts, b); err != nil {
			t.Fatal(err)
		}
		if _, err := l.Density(m, 1, temp); err != nil {
			t.Fatal(err)
		}
	}); n != 0 {
		t.Errorf("%g allocations", n)
	}
}

func FuzzDensity(f *testing.F) {
	f.Add(uint64(1), 5, 100.0)
	m := pw3(f)
	f.Fuzz(func(t *testing.T, seed uint64, n int, temp float64) {
		r := rand.New(rand.NewPCG(seed, 1))
		n = 2 + int(uint(n)%40)
		ts, b := []float64{0}, []float64{0}
		for range n {
			ts = append(ts, ts[len(ts)-1]+math.Exp(20*r.Float64()-30))
			b = append(b, float64(r.IntN(7))/10)
		}
		b[n] = b[0]
		got, err := Density(ts, b, m, temp)
		if err != nil {
			return
		}
		if !(got.Density >= 0) || math.IsInf(got.Density, 0) {
			t.Errorf("loss %v", got)
		}
	})
}

func BenchmarkLoops(b *testing.B) {
	m := pw3(b)
	for _, n := range []int{32, 200} {
		ts, w := sampled(1e-5, n, func(u float64) float64 { return 0.1 * math.Sin(2*math.Pi*u) })
		var l Loops
		b.Run(fmt.Sprintf("step=split/corners=%d", n), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if err := l.Split(ts, w); err != nil {
					b.Fatal(err)
				}
			}
		})
		if err := l.Split(ts, w); err != nil {
			b.Fatal(err)
		}
		for _, fresh := range []bool{true, false} {
			b.Run(fmt.Sprintf("step=rate/corners=%d/newslope=%v", n, fresh), func(b *testing.B) {
				b.ReportAllocs()
				temp := 60.0
				for b.Loop() {
					if fresh {
						temp += 1e-6 // moves the local slope, so the shape is computed anew
					}
					if _, err := l.Density(m, 0.5, temp); err != nil {
						b.Fatal(err)
					}
				}
			})
		}
	}
}
