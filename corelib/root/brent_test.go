package root

import (
	"errors"
	"fmt"
	"math"
	"testing"
)

type testCase struct {
	name string
	f    func(float64) float64
	a, b float64
	want float64
}

// cases follow the collection of test functions in G. E. Alefeld, F. A. Potra
// and Yixun Shi, "Algorithm 748: Enclosing zeros of continuous functions", ACM
// TOMS 21 (1995), doi 10.1145/210089.210111. Those kept here have a root in
// closed form, except the sine and the sum of poles, whose roots are the ones
// published for the collection.
func cases() []testCase {
	list := []testCase{
		{"sine", func(x float64) float64 { return math.Sin(x) - x/2 }, math.Pi / 2, math.Pi, 1.895494267033981},
		{"sine reversed", func(x float64) float64 { return math.Sin(x) - x/2 }, math.Pi, math.Pi / 2, 1.895494267033981},
		{"cubic", func(x float64) float64 { return x*x*x - 8 }, -1e3, 1e6, 2},
		{"step", func(x float64) float64 { return math.Copysign(1, x-0.3) }, 0, 1, 0.3},
		{"flat then steep", func(x float64) float64 { return math.Pow(x-1, 21) }, 0, 3, 1},
		{"ends at the root", func(x float64) float64 { return x - 3 }, 3, 5, 3},
		{"tiny scale", func(x float64) float64 { return x*x - 4e-24 }, 0, 1e-11, 2e-12},
		{"huge scale", func(x float64) float64 { return x - 1e300 }, -1.7e308, 1.7e308, 1e300},
	}
	poles := func(x float64) float64 {
		sum := 0.0
		for i := 1.0; i <= 20; i++ {
			d := x - i*i
			sum -= 2 * (2*i - 5) * (2*i - 5) / (d * d * d)
		}
		return sum
	}
	for k, want := range []float64{3.0229153472730568, 6.6837535608080785, 11.238701655002211, 19.676000080623410, 29.828227326504756,
		41.906116195289414, 55.953595800143089, 71.985665586587803, 90.008868539166670, 110.02653274833020} {
		n := float64(k + 1)
		list = append(list, testCase{fmt.Sprintf("poles n=%v", n), poles, n*n + 1e-9, (n+1)*(n+1) - 1e-9, want})
	}
	for _, p := range [][2]float64{{-40, -1}, {-100, -2}, {-200, -3}} {
		list = append(list, testCase{fmt.Sprintf("x exp a=%v b=%v", p[0], p[1]), func(x float64) float64 { return p[0] * x * math.Exp(p[1]*x) }, -9, 31, 0})
	}
	for _, a := range []float64{0.2, 1} {
		for n := 4.0; n <= 12; n += 2 {
			list = append(list, testCase{fmt.Sprintf("power n=%v a=%v", n, a), func(x float64) float64 { return math.Pow(x, n) - a }, 0, 5, math.Pow(a, 1/n)})
		}
	}
	for _, n := range []float64{2, 5, 15, 20} {
		// (n x - 1) / ((n - 1) x)
		list = append(list, testCase{fmt.Sprintf("hyperbola n=%v", n), func(x float64) float64 { return (n*x - 1) / ((n - 1) * x) }, 0.01, 1, 1 / n})
		// x^(1/n) - n^(1/n)
		list = append(list, testCase{fmt.Sprintf("root function n=%v", n), func(x float64) float64 { return math.Pow(x, 1/n) - math.Pow(n, 1/n) }, 1, 100, n})
	}
	// A root of third order that underflows around zero.
	list = append(list, testCase{"underflow", func(x float64) float64 {
		if x == 0 {
			return 0
		}
		return x / math.Exp(1/(x*x))
	}, -1, 4, 0})
	return list
}

func TestFind(t *testing.T) {
	for _, c := range cases() {
		t.Run(c.name, func(t *testing.T) {
			got, err := Find(c.f, c.a, c.b, 0)
			if err != nil {
				t.Fatal(err)
			}
			// A simple root is found to a few units in the last place of x or
			// of f; a function that is zero over a stretch is at any of its
			// zeros.
			tol := 1e-14*math.Abs(c.want) + 1e-15
			if !(math.Abs(got.X-c.want) <= tol) && got.Residual != 0 {
				t.Errorf("Find = %.17g (f = %g), want %.17g ±%.1g", got.X, got.Residual, c.want, tol)
			}
			if got.Iterations > 200 {
				t.Errorf("%d iterations, want at most 200", got.Iterations)
			}
		})
	}
}

// The tolerance is a promise on x whatever the function looks like.
func TestFindKeepsTheTolerance(t *testing.T) {
	for _, c := range cases() {
		for _, tol := range []float64{1e-3, 1e-6, 1e-9} {
			got, err := Find(c.f, c.a, c.b, tol)
			if err != nil {
				t.Fatalf("%s: %v", c.name, err)
			}
			lo, hi := got.X-tol-1e-14*math.Abs(got.X), got.X+tol+1e-14*math.Abs(got.X)
			if got.Residual != 0 && !(lo <= c.want && c.want <= hi) {
				t.Errorf("%s, tol %g: root %.17g, want %.17g", c.name, tol, got.X, c.want)
			}
		}
	}
}

func TestFindRefuses(t *testing.T) {
	line := func(x float64) float64 { return x }
	nan := func(x float64) float64 {
		if math.Abs(x) < 0.5 {
			return math.NaN()
		}
		return x
	}
	for _, c := range []struct {
		name string
		f    func(float64) float64
		a, b float64
		want error
	}{
		{"same sign", line, 1, 2, ErrBracket},
		{"NaN end", line, math.NaN(), 2, ErrNotFinite},
		{"infinite end", line, -1, math.Inf(1), ErrNotFinite},
		{"NaN inside", nan, -1, 2, ErrNotFinite},
		{"NaN at an end", nan, 0, 2, ErrNotFinite},
	} {
		t.Run(c.name, func(t *testing.T) {
			if _, err := Find(c.f, c.a, c.b, 1e-9); !errors.Is(err, c.want) {
				t.Errorf("Find: %v, want %v", err, c.want)
			}
		})
	}
}

func BenchmarkFind(b *testing.B) {
	b.ReportAllocs()
	f := func(x float64) float64 { return math.Sin(x) - x/2 }
	var n int
	for b.Loop() {
		r, err := Find(f, math.Pi/2, math.Pi, 1e-12)
		if err != nil {
			b.Fatal(err)
		}
		n = r.Iterations
	}
	b.ReportMetric(float64(n), "iterations")
}
