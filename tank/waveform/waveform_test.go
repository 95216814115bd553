package waveform

import (
	"math"
	"math/cmplx"
	"testing"
)

// sine returns A sin(w t + phase) + dc of period 1 cut at the given times, each
// piece the Taylor series around its start. alternating keeps the first half.
func sine(amplitude, phase, dc float64, alternating bool, cuts ...float64) Wave {
	w := Wave{Period: 1, Alternating: alternating}
	for n := 0; n+1 < len(cuts); n++ {
		p := Piece{Start: cuts[n], Duration: cuts[n+1] - cuts[n]}
		x, f := 2*math.Pi*p.Start+phase, 1.0
		for k := range p.C {
			p.C[k] = amplitude * f * math.Sin(x+float64(k)*math.Pi/2)
			f *= 2 * math.Pi * p.Duration / float64(k+1)
		}
		p.C[0] += dc
		w.Pieces = append(w.Pieces, p)
	}
	return w
}

// ramps returns a wave of straight pieces through the given values.
func ramps(period float64, alternating bool, t []float64, x [][2]float64) Wave {
	w := Wave{Period: period, Alternating: alternating}
	for n := range x {
		p := Piece{Start: t[n], Duration: t[n+1] - t[n]}
		p.C[0], p.C[1] = x[n][0], x[n][1]-x[n][0]
		w.Pieces = append(w.Pieces, p)
	}
	return w
}

func close(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s = %.15g, want %.15g ±%g", what, got, want, tol)
	}
}

// The closed forms of a sine; the pieces are exact to rounding.
func TestSine(t *testing.T) {
	cuts := []float64{0, 0.07, 0.11, 0.2, 0.31, 0.4, 0.5}
	for n := range 5 {
		cuts = append(cuts, 0.5+float64(n+1)/10)
	}
	w := sine(3, 0.4, 0.5, false, cuts...)
	close(t, "mean", w.Mean(), 0.5, 1e-14)
	close(t, "rms", w.RMS(), math.Sqrt(4.5+0.25), 1e-14)
	close(t, "peak", w.Peak(), 3.5, 1e-13)
	low, high := w.Extremes()
	close(t, "least", low, -2.5, 1e-13)
	close(t, "greatest", high, 3.5, 1e-13)
	close(t, "value", w.At(0.3), 3*math.Sin(0.6*math.Pi+0.4)+0.5, 1e-13)
	close(t, "value a period later", w.At(1.3), w.At(0.3), 1e-13)
	close(t, "value before zero", w.At(-0.7), w.At(0.3), 1e-13)
	h := w.Harmonics(40)
	close(t, "harmonic 0", real(h[0]), 0.5, 1e-14)
	close(t, "harmonic 1", cmplx.Abs(h[1]-cmplx.Rect(3, 0.4)), 0, 1e-13)
	for k := 2; k <= 40; k++ {
		close(t, "higher harmonic", cmplx.Abs(h[k]), 0, 1e-13)
	}

	half := sine(3, 0.4, 0, true, cuts[:7]...)
	close(t, "alternating rms", half.RMS(), 3/math.Sqrt2, 1e-14)
	close(t, "alternating mean", half.Mean(), 0, 0)
	close(t, "alternating mean of the absolute value", half.MeanAbs(), 6/math.Pi, 1e-13)
	close(t, "alternating peak", half.Peak(), 3, 1e-13)
	close(t, "alternating value", half.At(0.8), 3*math.Sin(1.6*math.Pi+0.4), 1e-13)
	g := half.Harmonics(40)
	close(t, "alternating harmonic", cmplx.Abs(g[1]-cmplx.Rect(3, 0.4)), 0, 1e-13)
	low, high = half.Extremes()
	close(t, "alternating extremes", low+high, 0, 0)
}

// Fourier series in closed form: a square wave has 4/(pi k) in phase, a triangle
// 8/(pi² k²) with turning sign.
func TestSquareAndTriangle(t *testing.T) {
	square := ramps(2e-5, true, []float64{0, 1e-5}, [][2]float64{{1, 1}})
	triangle := ramps(2e-5, true, []float64{0, 0.5e-5, 1e-5}, [][2]float64{{0, 1}, {1, 0}})
	hs, ht := square.Harmonics(40), triangle.Harmonics(40)
	for k := 1; k <= 40; k++ {
		want := complex(0, 0)
		var wantT complex128
		if k%2 == 1 {
			want = complex(4/(math.Pi*float64(k)), 0)
			wantT = complex(8/(math.Pi*math.Pi*float64(k*k))*(1-2*float64(k/2%2)), 0)
		}
		close(t, "square", cmplx.Abs(hs[k]-want), 0, 1e-13)
		close(t, "triangle", cmplx.Abs(ht[k]-wantT), 0, 1e-13)
	}
	close(t, "triangle rms", triangle.RMS(), 1/math.Sqrt(3), 1e-15)
	close(t, "triangle mean of the absolute value", triangle.MeanAbs(), 0.5, 1e-15)
	close(t, "square rms", square.RMS(), 1, 1e-15)
	// Parseval, with the tail of the series beyond order 40 left out.
	sum := 0.0
	for _, m := range Magnitudes(ht)[1:] {
		sum += m * m / 2
	}
	close(t, "triangle by Parseval", sum, 1./3, 1e-6)

	// A sawtooth over the whole period has a mean and even orders: 1/2 - t is
	// the sum of sin(2 pi k t)/(pi k).
	saw := ramps(1, false, []float64{0, 1}, [][2]float64{{0.75, -0.25}})
	for k, h := range saw.Harmonics(40) {
		want := complex(0.25, 0)
		if k > 0 {
			want = complex(1/(math.Pi*float64(k)), 0)
		}
		close(t, "sawtooth", cmplx.Abs(h-want), 0, 1e-13)
	}
	zero := ramps(1, true, []float64{0, 0.25, 0.5}, [][2]float64{{-1, 3}, {0, 0}})
	close(t, "mean of the absolute value with a zero inside", zero.MeanAbs(), (0.0625*0.5+0.1875*1.5)/0.5, 1e-15)
}

func TestSample(t *testing.T) {
	w := ramps(1, true, []float64{0, 0.1, 0.5}, [][2]float64{{-1, 1}, {1, 1}})
	for _, n := range []int{1, 2, 10, 97} {
		ts, xs := w.Sample(n)
		if ts[0] != 0 || ts[len(ts)-1] != 1 || xs[0] != xs[len(xs)-1] {
			t.Errorf("n=%d: not closed: %v %v", n, ts, xs)
		}
		joints := map[float64]bool{0: true, 0.1: true, 0.5: true, 0.6: true}
		for k := range ts {
			if k > 0 && ts[k] <= ts[k-1] {
				t.Fatalf("n=%d: times do not rise: %v", n, ts)
			}
			delete(joints, ts[k])
			if k < len(ts)-1 {
				close(t, "sample", xs[k], w.At(ts[k]), 0)
			}
		}
		if len(joints) > 0 {
			t.Errorf("n=%d: joints %v are missing in %v", n, joints, ts)
		}
	}
	a, _ := w.Sample(33)
	b, _ := w.Scaled(2).Sample(33)
	if len(a) != len(b) {
		t.Errorf("%d and %d samples of waves with the same pieces", len(a), len(b))
	}
	if ts, xs := (Wave{Period: 2}).Sample(5); len(ts) != 2 || ts[1] != 2 || xs[0] != 0 {
		t.Errorf("empty wave: %v %v", ts, xs)
	}
}

func TestCombine(t *testing.T) {
	cuts := []float64{0, 0.1, 0.2, 0.3, 0.4, 0.5}
	x, y := sine(1, 0, 0, true, cuts...), sine(2, math.Pi/2, 0, true, cuts...)
	close(t, "rms of quadrature", Combine(3, x, 2, y).RMS(), 5/math.Sqrt2, 1e-14)
	defer func() {
		if recover() == nil {
			t.Error("waves with different pieces were combined")
		}
	}()
	Combine(1, x, 1, sine(1, 0, 0, true, 0, 0.1, 0.2, 0.35, 0.4, 0.5))
}

func BenchmarkHarmonics(b *testing.B) {
	cuts := []float64{0, 0.07, 0.11, 0.2, 0.31, 0.4, 0.5}
	w := sine(3, 0.4, 0, true, cuts...)
	for b.Loop() {
		w.Harmonics(40)
	}
}
