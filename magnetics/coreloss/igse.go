// Package coreloss computes the loss density of a ferrite under any periodic flux
// from loss sets that hold for sines: the improved generalized Steinmetz equation
// (iGSE) with minor loops split off.
//
// A waveform is given by its corners: times in s, strictly increasing, and flux
// densities in T, closed (the last equals the first); between corners it is a
// straight line, and for such a waveform the integral is exact. A smooth waveform is
// sampled: a sine of N corners per period comes out low by up to alpha pi²/(6 N²), which
// is 0.1 % for 64 corners.
//
// What it does not know: DC bias, and relaxation while the flux stands still (the
// loss that goes on after a fast change; Mühlethaler et al., IEEE Trans. PE 27(2),
// 2012, add terms for it). Both make real losses higher.
//
// Sources: the integral, K. Venkatachalam, C. R. Sullivan, T. Abdallah, H. Tacca,
// "Accurate prediction of ferrite core loss with nonsinusoidal waveforms using only
// Steinmetz parameters", IEEE COMPEL 2002; the equivalent frequency, M. Albach, Th.
// Dürbaum, A. Brockmeyer, IEEE PESC 1996.
package coreloss

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"gapwright/corelib/material"
)

// Loops is a waveform taken apart into the hysteresis loops it runs through. One
// waveform is split once and then rated in any ferrite, at any scale and temperature.
// The zero value is ready for Split. Split and Density reuse memory: not for
// concurrent use.
type Loops struct {
	period float64
	loops  []loop
	pieces []piece
	path   []corner // what is left of the waveform while loops are taken off it
	turns  []int    // indices of path where the direction changes
}

// A loop is one closed excursion of the flux.
type loop struct {
	swing    float64 // peak to peak, T at scale 1
	freq     float64 // equivalent frequency, Hz
	from, to int     // its pieces
	alpha    float64 // that shape was computed for
	shape    float64 // loss over that of a sine of freq and swing, per cycle of that sine
	share    float64 // of the loss, J/m³, during one call of Density
}

// A piece is a straight part of a loop: x is its change over the swing, tau its
// duration times freq.
type piece struct {
	lnTau, lnSlope float64 // ln tau, ln(x/tau)
}

// Clone returns a copy that shares nothing with l, for another goroutine.
func (l *Loops) Clone() Loops {
	return Loops{period: l.period, loops: slices.Clone(l.loops), pieces: slices.Clone(l.pieces)}
}

type corner struct {
	b, dt float64 // flux density, time since the corner before
}

// A Loss is the result for one waveform.
type Loss struct {
	Density   float64 // W/m³, mean over the period
	Loops     int     // hysteresis loops in one period, 1 without minor loops
	Swing     float64 // T, peak to peak, of the loop that loses most
	Frequency float64 // Hz, equivalent frequency of that loop
	// Point is the loss of a sine of that frequency and swing: slopes, loss sets and
	// temperature factor used. Its Outside is the farthest of all loops that
	// contribute at least a hundredth of the loss.
	Point material.LossPoint
}

// ErrWaveform means that times and flux densities are no closed waveform.
var ErrWaveform = errors.New("not a closed waveform")

// Density returns the loss density of the ferrite m under the closed waveform t in
// s, b in T, at temp in °C. See Loops.Split and Loops.Density.
func Density(t, b []float64, m *material.Ferrite, temp float64) (Loss, error) {
	var l Loops
	if err := l.Split(t, b); err != nil {
		return Loss{}, err
	}
	return l.Density(m, 1, temp)
}

// Warnings says in words what the loss should be warned about.
func (s Loss) Warnings(m *material.Ferrite) []material.Warning {
	if s.Loops == 0 {
		return nil
	}
	return m.LossWarnings(s.Point)
}

// negligible is the swing, relative to the whole, below which a loop is rounding
// noise: with beta >= 2 even a million of them would lose less than 1e-12.
const negligible = 1e-9

// Split takes a waveform apart. It starts at the lowest corner, so the result does
// not depend on where in the period the waveform begins. A minor loop begins where
// the flux turns back and ends where it comes to the same value again, as the
// material itself closes it; what remains after all minor loops is the major loop.
// Run backwards in time, a minor loop whose two sides differ in slope is cut
// elsewhere, which can change the loss slightly; without minor loops it does not.
//
// The error wraps ErrWaveform when lengths differ or are below 2, a number is not
// finite, times do not increase, or the ends differ by more than 1e-9 of the swing.
func (l *Loops) Split(t, b []float64) error {
	l.loops, l.pieces, l.path, l.turns = l.loops[:0], l.pieces[:0], l.path[:0], l.turns[:0]
	l.period = 0
	if len(t) != len(b) || len(t) < 2 {
		return fmt.Errorf("%d times and %d flux densities: %w", len(t), len(b), ErrWaveform)
	}
	n := len(t) - 1
	lowest, highest := 0, 0
	for i := range t {
		if math.IsNaN(t[i]) || math.IsInf(t[i], 0) || math.IsNaN(b[i]) || math.IsInf(b[i], 0) {
			return fmt.Errorf("corner %d at %g s, %g T: %w", i, t[i], b[i], ErrWaveform)
		}
		if i > 0 && !(t[i] > t[i-1]) {
			return fmt.Errorf("corner %d at %g s after %g s: %w", i, t[i], t[i-1], ErrWaveform)
		}
		if b[i] < b[lowest] {
			lowest = i
		}
		if b[i] > b[highest] {
			highest = i
		}
	}
	swing := b[highest] - b[lowest]
	if math.Abs(b[n]-b[0]) > 1e-9*swing {
		return fmt.Errorf("starts at %g T and ends at %g T: %w", b[0], b[n], ErrWaveform)
	}
	if math.IsInf(swing, 0) {
		return fmt.Errorf("swing from %g to %g T: %w", b[lowest], b[highest], ErrWaveform)
	}
	l.period = t[n] - t[0]
	if swing == 0 {
		return nil
	}
	// The last corner is the first one of the next period.
	lowest %= n
	least := b[lowest]
	l.path = append(l.path, corner{b: least})
	l.turns = append(l.turns, 0)
	for k := range n {
		i := (lowest + k) % n
		next := b[(i+1)%n]
		if k == n-1 {
			next = least
		}
		l.advance(max(next, least), t[i+1]-t[i], negligible*swing)
	}
	return nil
}

// advance moves the flux along a straight line to b within dt, taking off every
// loop that closes on the way.
func (l *Loops) advance(b, dt, least float64) {
	at := l.path[len(l.path)-1].b
	if b == at {
		return // iGSE counts nothing while the flux stands still
	}
	up := b > at
	for {
		last := len(l.path) - 1
		if last > 0 && (l.path[last].b > l.path[last-1].b) != up {
			l.turns = append(l.turns, last)
		}
		if k := len(l.turns); k >= 2 {
			// The branch began at the last turn; the loop closes at the turn before it.
			open := l.turns[k-2]
			level := l.path[open].b
			if up && b >= level || !up && b <= level {
				part := dt * ((level - at) / (b - at))
				l.take(open, math.Abs(l.path[l.turns[k-1]].b-level), math.Abs(level-at), part, least)
				l.path = l.path[:open+1]
				l.turns = l.turns[:k-2]
				if len(l.turns) == 0 {
					l.turns = append(l.turns, 0) // the lowest corner stays the start
				}
				if b == level {
					return
				}
				at, dt = level, dt-part
				continue
			}
		}
		l.path = append(l.path, corner{b, dt})
		return
	}
}

// take keeps the loop that begins at path[open] and is closed by a last piece.
func (l *Loops) take(open int, swing, lastStep, lastTime, least float64) {
	if swing < least {
		return
	}
	var sum float64 // integral of (dB/dt)²
	for i := open + 1; i < len(l.path); i++ {
		d := l.path[i].b - l.path[i-1].b
		sum += d * d / l.path[i].dt
	}
	if lastTime > 0 {
		sum += lastStep * lastStep / lastTime
	}
	g := loop{swing: swing, from: len(l.pieces), alpha: math.NaN()}
	g.freq = 2 * sum / (math.Pi * math.Pi * swing * swing)
	for i := open + 1; i < len(l.path); i++ {
		l.add(math.Abs(l.path[i].b-l.path[i-1].b)/swing, l.path[i].dt*g.freq)
	}
	l.add(lastStep/swing, lastTime*g.freq)
	g.to = len(l.pieces)
	l.loops = append(l.loops, g)
}

func (l *Loops) add(x, tau float64) {
	if x > 0 && tau > 0 {
		l.pieces = append(l.pieces, piece{math.Log(tau), math.Log(x / tau)})
	}
}

// Density returns the loss density of the ferrite m at temp in °C under the
// waveform times scale (for instance 1/(N Ae) when flux linkages were split).
//
// Each loop is rated by itself and the energies add up. With P the loss density of
// a sine of the loop's equivalent frequency
//
//	fe = 2/(pi² dB²) ∫ (dB/dt)² dt
//
// (a sine gives its own frequency) and peak-to-peak swing dB, and alpha the local
// slope there, the published integral with k taken from P becomes the energy
//
//	P/fe · 2^alpha Σ x^alpha tau^(1-alpha) / ((2 pi)^(alpha-1) ∫0..2pi |cos|^alpha)
//
// over the pieces, x = |dB_i|/dB and tau = dt_i fe. For one power law this is the
// published formula itself, whatever fe is.
//
// It allocates nothing. Outside the ranges of the loss sets losses are carried on
// and Point.Outside tells how far. The error wraps material.ErrOperatingPoint.
func (l *Loops) Density(m *material.Ferrite, scale, temp float64) (Loss, error) {
	r := Loss{Loops: len(l.loops)}
	var energy float64
	major := -1
	for i := range l.loops {
		g := &l.loops[i]
		p, err := m.LossDensity(g.freq, math.Abs(scale)*g.swing/2, temp)
		if err != nil {
			return Loss{}, err
		}
		if g.alpha != p.Alpha {
			g.alpha, g.shape = p.Alpha, l.shape(g, p.Alpha)
		}
		g.share = p.Density / g.freq * g.shape
		energy += g.share
		if major < 0 || g.share > l.loops[major].share {
			major = i
			r.Point, r.Swing, r.Frequency = p, math.Abs(scale)*g.swing, g.freq
		}
	}
	if major < 0 {
		return r, nil
	}
	if len(l.loops) > 1 {
		for i := range l.loops {
			if g := &l.loops[i]; i != major && g.share >= 0.01*energy {
				p, err := m.LossDensity(g.freq, math.Abs(scale)*g.swing/2, temp)
				if err != nil {
					return Loss{}, err
				}
				r.Point.Outside = r.Point.Outside.Worst(p.Outside)
			}
		}
	}
	r.Density = energy / l.period
	if math.IsInf(r.Density, 0) || math.IsNaN(r.Density) {
		return Loss{}, fmt.Errorf("%s: loss density %g W/m³ of a loop of %g Hz: %w", m.Name, r.Density, r.Frequency, material.ErrOperatingPoint)
	}
	return r, nil
}

// shape is the loss of a loop over that of the sine it is measured by.
func (l *Loops) shape(g *loop, alpha float64) float64 {
	var sum float64
	for _, p := range l.pieces[g.from:g.to] {
		sum += math.Exp(p.lnTau + alpha*p.lnSlope)
	}
	return math.Pow(2, alpha) * sum / (math.Pow(2*math.Pi, alpha-1) * cosIntegral(alpha))
}

// cosIntegral is the integral of |cos|^alpha over 0 to 2 pi, in closed form:
// 2 sqrt(pi) Gamma((alpha+1)/2) / Gamma(alpha/2+1).
func cosIntegral(alpha float64) float64 {
	a, _ := math.Lgamma((alpha + 1) / 2)
	b, _ := math.Lgamma(alpha/2 + 1)
	return 2 * math.Sqrt(math.Pi) * math.Exp(a-b)
}
