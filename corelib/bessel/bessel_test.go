package bessel

import (
	"encoding/json"
	"math"
	"math/cmplx"
	"os"
	"strconv"
	"testing"
)

type table struct {
	Ratios []struct {
		N      int
		X      float64
		Re, Im string
	}
	Reduced []struct {
		Nu    string
		X     float64
		Value string
	}
}

func load(t *testing.T) table {
	t.Helper()
	raw, err := os.ReadFile("../../testdata/bessel/ratios.json")
	if err != nil {
		t.Fatal(err)
	}
	var tab table
	if err := json.Unmarshal(raw, &tab); err != nil {
		t.Fatal(err)
	}
	if len(tab.Ratios) < 50 || len(tab.Reduced) < 20 {
		t.Fatalf("table holds %d ratios and %d reduced values, too few", len(tab.Ratios), len(tab.Reduced))
	}
	return tab
}

func number(t *testing.T, s string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// The table has 17 digits; 1e-13 leaves room for some hundred rounding errors
// of the continued fraction.
func TestRatioAgainstTable(t *testing.T) {
	for _, c := range load(t).Ratios {
		z := complex(c.X, -c.X)
		want := complex(number(t, c.Re), number(t, c.Im))
		got := Ratio(c.N, z)
		if e := cmplx.Abs(got-want) / cmplx.Abs(want); !(e < 1e-13) {
			t.Errorf("Ratio(%d, %v) = %v, want %v: error %.1e", c.N, z, got, want, e)
		}
		// J_n is real on the real axis, so conjugate arguments give conjugate ratios.
		if conj := Ratio(c.N, cmplx.Conj(z)); cmplx.Abs(conj-cmplx.Conj(got)) > 1e-15*cmplx.Abs(got) {
			t.Errorf("Ratio(%d, conj %v) = %v, want the conjugate of %v", c.N, z, conj, got)
		}
	}
}

func TestReflection(t *testing.T) {
	for _, x := range []float64{1e-3, 0.4, 3, 30, 3000} {
		z := complex(x, -x)
		for n := 1; n <= 4; n++ {
			want := Ratio(n, z) * Ratio(n-1, z)
			if got := Reflection(n, z); cmplx.Abs(got-want) > 1e-12*cmplx.Abs(want) {
				t.Errorf("Reflection(%d, %v) = %v, want %v", n, z, got, want)
			}
		}
	}
	// Perfect conductor: J_{n+1}/J_{n-1} -> -1.
	if got := Reflection(2, 1e9*(1-1i)); cmplx.Abs(got+1) > 1e-8 {
		t.Errorf("Reflection far outside = %v, want -1", got)
	}
	if Reflection(1, 0) != 0 || Ratio(0, 0) != 0 {
		t.Error("ratios at the origin are not 0")
	}
}

// 1e-10 is the accuracy that Reduced promises: the power series loses five
// digits at x = 13, the asymptotic one ends at exp(-26).
func TestReduced(t *testing.T) {
	orders := map[string]float64{"1/6": 1.0 / 6, "0": 0, "-1/3": -1.0 / 3}
	for _, c := range load(t).Reduced {
		want := number(t, c.Value)
		if got := Reduced(orders[c.Nu], c.X); !(math.Abs(got-want) < 1e-10) {
			t.Errorf("Reduced(%s, %g) = %.15g, want %.15g", c.Nu, c.X, got, want)
		}
	}
	for _, x := range []float64{0.1, 2, 12.99, 13.01, 50} {
		if got, want := Reduced(0.5, x), math.Sin(x)/x; math.Abs(got-want) > 1e-10 {
			t.Errorf("Reduced(1/2, %g) = %g, want sin(x)/x = %g", x, got, want)
		}
		if got, want := Reduced(0, x), math.J0(x); math.Abs(got-want) > 1e-10 {
			t.Errorf("Reduced(0, %g) = %g, want J0 = %g", x, got, want)
		}
	}
}

func BenchmarkReflection(b *testing.B) {
	for _, c := range []struct {
		name string
		x    float64
	}{{"x=1", 1}, {"x=10", 10}, {"x=100", 100}} {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				Reflection(1, complex(c.x, -c.x))
			}
		})
	}
}
