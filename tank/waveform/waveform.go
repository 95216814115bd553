// Package waveform holds a periodic quantity as exact pieces: polynomials that
// follow each other without a gap over one period.
//
// Times are in s, values in the unit of the quantity. All integrals (mean, rms,
// harmonics) are those of the polynomials to rounding, not of samples of them.
package waveform

import (
	"math"
	"math/cmplx"
	"sort"
)

// Degree is that of the polynomial of a piece.
const Degree = 16

// A Piece is the quantity over a part of the period: the sum of C[k] u^k with
// u = (t - Start)/Duration between 0 and 1.
type Piece struct {
	Start, Duration float64 // s
	C               [Degree + 1]float64
}

// Value returns the polynomial at u.
func (p *Piece) Value(u float64) float64 {
	x := p.C[Degree]
	for k := Degree - 1; k >= 0; k-- {
		x = x*u + p.C[k]
	}
	return x
}

// slope returns the derivative with respect to u.
func (p *Piece) slope(u float64) float64 {
	x := Degree * p.C[Degree]
	for k := Degree - 1; k >= 1; k-- {
		x = x*u + float64(k)*p.C[k]
	}
	return x
}

// A Wave is one period of a quantity. The pieces cover it from t = 0 without a
// gap; when Alternating is set they cover the first half only and the second
// half is its negative. The quantity may jump from piece to piece.
type Wave struct {
	Period      float64 // s
	Alternating bool
	Pieces      []Piece
}

// At returns the value at time t, taken modulo the period. At a jump it is the
// value after it.
func (w Wave) At(t float64) float64 {
	if len(w.Pieces) == 0 {
		return 0
	}
	t = math.Mod(t, w.Period)
	if t < 0 {
		t += w.Period
	}
	sign := 1.0
	if w.Alternating && t >= w.Period/2 {
		t -= w.Period / 2
		sign = -1
	}
	n := sort.Search(len(w.Pieces), func(k int) bool { return w.Pieces[k].Start > t })
	p := &w.Pieces[max(n-1, 0)]
	return sign * p.Value(math.Min(math.Max((t-p.Start)/p.Duration, 0), 1))
}

// Mean returns the mean over the period.
func (w Wave) Mean() float64 {
	if w.Alternating {
		return 0
	}
	return w.sum(mean) / w.Period
}

// MeanAbs returns the mean of the absolute value, as exact as the zeros of the
// pieces: a piece is taken to change its sign at most once.
func (w Wave) MeanAbs() float64 { return w.over(w.sum(meanAbs)) }

// RMS returns the root of the mean square over the period.
func (w Wave) RMS() float64 { return math.Sqrt(w.over(w.sum(meanSquare))) }

// over divides an integral over the stored pieces by the time they cover.
func (w Wave) over(integral float64) float64 {
	if w.Alternating {
		return integral / (w.Period / 2)
	}
	return integral / w.Period
}

func (w Wave) sum(f func(*Piece) float64) float64 {
	total := 0.0
	for k := range w.Pieces {
		total += f(&w.Pieces[k]) * w.Pieces[k].Duration
	}
	return total
}

func mean(p *Piece) float64 {
	m := 0.0
	for k, c := range p.C {
		m += c / float64(k+1)
	}
	return m
}

func meanSquare(p *Piece) float64 {
	m := 0.0
	for j, a := range p.C {
		for k := range j {
			m += 2 * a * p.C[k] / float64(j+k+1)
		}
		m += a * a / float64(2*j+1)
	}
	return math.Max(m, 0) // rounding of a piece that is zero
}

func meanAbs(p *Piece) float64 {
	a, b := p.Value(0), p.Value(1)
	if a == 0 || b == 0 || math.Signbit(a) == math.Signbit(b) {
		return math.Abs(mean(p))
	}
	// Bisection: 53 halvings settle the zero; the integral is then split there.
	lo, hi := 0.0, 1.0
	for range 53 {
		u := (lo + hi) / 2
		if math.Signbit(p.Value(u)) == math.Signbit(a) {
			lo = u
		} else {
			hi = u
		}
	}
	left, power := 0.0, lo
	for k, c := range p.C {
		left += c * power / float64(k+1)
		power *= lo
	}
	return math.Abs(left) + math.Abs(mean(p)-left)
}

// Extremes returns the least and the greatest value of the period.
func (w Wave) Extremes() (low, high float64) {
	low, high = math.Inf(1), math.Inf(-1)
	see := func(x float64) { low, high = math.Min(low, x), math.Max(high, x) }
	for k := range w.Pieces {
		p := &w.Pieces[k]
		see(p.Value(0))
		see(p.Value(1))
		// Pieces are short against every time constant of what made them, so a
		// quarter of one holds at most one turning point.
		const parts = 4
		for n := range parts {
			lo, hi := float64(n)/parts, float64(n+1)/parts
			a, b := p.slope(lo), p.slope(hi)
			if a*b >= 0 {
				continue
			}
			for range 60 {
				u := lo - a*(hi-lo)/(b-a)
				// False position stalls on curved slopes; bisect every step
				// that would hug an end.
				if !(u-lo > 0.01*(hi-lo) && hi-u > 0.01*(hi-lo)) {
					u = (lo + hi) / 2
				}
				s := p.slope(u)
				if s == 0 || hi-lo < 1e-9 {
					lo, hi = u, u
					break
				}
				if math.Signbit(s) == math.Signbit(a) {
					lo, a = u, s
				} else {
					hi, b = u, s
				}
			}
			see(p.Value((lo + hi) / 2))
		}
	}
	if len(w.Pieces) == 0 {
		return 0, 0
	}
	if w.Alternating {
		high = math.Max(high, -low)
		low = -high
	}
	return low, high
}

// Peak returns the greatest absolute value.
func (w Wave) Peak() float64 {
	low, high := w.Extremes()
	return math.Max(math.Abs(low), math.Abs(high))
}

// Scaled returns the wave times a factor.
func (w Wave) Scaled(factor float64) Wave { return Combine(factor, w, 0, w) }

// Combine returns a x + b y. Both must be cut into the same pieces, as the
// quantities of one operation are; it panics when they are not.
func Combine(a float64, x Wave, b float64, y Wave) Wave {
	if x.Period != y.Period || x.Alternating != y.Alternating || len(x.Pieces) != len(y.Pieces) {
		panic("waveform: pieces differ")
	}
	sum := Wave{x.Period, x.Alternating, make([]Piece, len(x.Pieces))}
	for n := range x.Pieces {
		p, q, s := &x.Pieces[n], &y.Pieces[n], &sum.Pieces[n]
		if p.Start != q.Start || p.Duration != q.Duration {
			panic("waveform: pieces differ")
		}
		s.Start, s.Duration = p.Start, p.Duration
		for k := range s.C {
			s.C[k] = a*p.C[k] + b*q.C[k]
		}
	}
	return sum
}

// Sample returns the wave at n equally spaced times and at every joint of two
// pieces, over one closed period: t runs strictly upward from 0 to the period,
// and the last value equals the first. Waves cut into the same pieces are
// sampled at the same times. At a jump the value is the one after it.
func (w Wave) Sample(n int) (t, x []float64) {
	if n < 1 {
		panic("waveform: fewer than one sample")
	}
	if len(w.Pieces) == 0 {
		return []float64{0, w.Period}, []float64{0, 0}
	}
	all := make([]float64, 0, n+1+2*len(w.Pieces))
	for k := range w.Pieces {
		all = append(all, w.Pieces[k].Start)
		if w.Alternating {
			all = append(all, w.Pieces[k].Start+w.Period/2)
		}
	}
	// Equally spaced times that nearly meet a joint give way to it.
	near := 1e-6 * w.Period
	joints := append(append([]float64{}, all...), w.Period)
	sort.Float64s(joints)
	for k := range n {
		s := w.Period * float64(k) / float64(n)
		j := sort.SearchFloat64s(joints, s)
		if (j < len(joints) && joints[j]-s < near) || (j > 0 && s-joints[j-1] < near) {
			continue
		}
		all = append(all, s)
	}
	sort.Float64s(all)
	t = all[:0]
	for _, s := range all {
		if len(t) == 0 || s > t[len(t)-1] {
			t = append(t, s)
		}
	}
	if t[0] != 0 { // the first piece starts there by contract
		t[0] = 0
	}
	x = make([]float64, len(t), len(t)+1)
	for k, s := range t {
		x[k] = w.At(s)
	}
	return append(t, w.Period), append(x, x[0])
}

// panelPhase is the greatest phase, in rad, of the highest harmonic over which
// one Gauss rule is used. A rule with n nodes is exact to rounding for
// polynomials up to degree 2 n - 1; with 20 nodes the remainder for exp(j 16 x)
// over a unit interval is (16/2)^40/40!/2^40 or so, below 1e-20, and 3e-15 when
// multiplied by a polynomial of degree 16.
const panelPhase = 16

// Harmonics returns the phasors of the orders 0 to n: element k is A exp(j phi)
// of A sin(k w t + phi), with t = 0 at the start of the period; element 0 is the
// mean. So x(t) = h[0] + sum of Im(h[k] exp(j k w t)).
func (w Wave) Harmonics(n int) []complex128 {
	h := make([]complex128, n+1)
	omega := 2 * math.Pi / w.Period
	for k := range w.Pieces {
		p := &w.Pieces[k]
		if p.C == [Degree + 1]float64{} {
			continue
		}
		panels := max(1, int(math.Ceil(float64(n)*omega*p.Duration/panelPhase)))
		width := 1 / float64(panels)
		for m := range panels {
			for g := range gaussNode {
				u := (float64(m) + (1+gaussNode[g])/2) * width
				f := p.Value(u) * gaussWeight[g] * width * p.Duration // the weights add up to 2
				sin, cos := math.Sincos(omega * (p.Start + u*p.Duration))
				turn := complex(cos, -sin)
				if !w.Alternating {
					h[0] += complex(f/2, 0)
					r := turn
					for j := 1; j <= n; j++ {
						h[j] += complex(f*real(r), f*imag(r))
						r *= turn
					}
					continue
				}
				r, twice := turn, turn*turn
				for j := 1; j <= n; j += 2 {
					h[j] += complex(2*f*real(r), 2*f*imag(r))
					r *= twice
				}
			}
		}
	}
	for k := range h {
		h[k] /= complex(w.Period, 0)
		if k > 0 {
			h[k] *= 1i // cosine amplitude to the phase of a sine
		}
	}
	return h
}

// Magnitudes returns the absolute values of phasors.
func Magnitudes(h []complex128) []float64 {
	m := make([]float64, len(h))
	for k := range h {
		m[k] = cmplx.Abs(h[k])
	}
	return m
}
