// Package root finds a root of a real function inside a bracket.
//
// The bracket is never left, so a search always ends: with the root to the
// tolerance asked for, or with an error that says why there is none.
package root

import (
	"errors"
	"fmt"
	"math"
)

var (
	// ErrBracket means that the function has the same sign at both ends.
	ErrBracket = errors.New("no change of sign in the bracket")
	// ErrNotFinite means that the function returned NaN or an infinity.
	ErrNotFinite = errors.New("function value is not finite")
	// ErrIterations means that the tolerance was not reached; only functions
	// that are no functions (a different value at each call) get here.
	ErrIterations = errors.New("no convergence")
)

// maxIterations bounds a search. Brent's method needs at most about the square
// of the number of bisections, which is 53 for a bracket of one binade; with
// the forced bisections used here three steps halve the bracket at worst, and
// 3*1100 covers a bracket over all of float64.
const maxIterations = 3300

// A Root is the place found and what it took.
type Root struct {
	X          float64 // where f is zero, to the tolerance
	Residual   float64 // f(X)
	Iterations int     // evaluations of f beyond the two ends
}

// Find returns a root of f between a and b (in either order), where f must
// differ in sign. The root is within tol of a change of sign; a tol of zero or
// below asks for the resolution of float64.
//
// The method is Brent's: inverse quadratic interpolation or the secant, kept
// honest by bisection. On top of it a bisection is forced when two steps did
// not halve the bracket, which bounds the number of steps on flat functions.
//
// Source: R. P. Brent, Algorithms for Minimization without Derivatives,
// Prentice-Hall 1973, chapter 4.
func Find(f func(float64) float64, a, b, tol float64) (Root, error) {
	if math.IsNaN(a) || math.IsNaN(b) || math.IsInf(a, 0) || math.IsInf(b, 0) || math.IsNaN(tol) {
		return Root{}, fmt.Errorf("bracket %g..%g: %w", a, b, ErrNotFinite)
	}
	fa, fb := f(a), f(b)
	for _, p := range [...][2]float64{{a, fa}, {b, fb}} {
		if !finite(p[1]) {
			return Root{}, fmt.Errorf("f(%g) = %g: %w", p[0], p[1], ErrNotFinite)
		}
	}
	switch {
	case fa == 0:
		return Root{X: a}, nil
	case fb == 0:
		return Root{X: b}, nil
	case math.Signbit(fa) == math.Signbit(fb):
		return Root{}, fmt.Errorf("f(%g) = %g, f(%g) = %g: %w", a, fa, b, fb, ErrBracket)
	}
	// b is the best point, c the other end of the bracket, a the point before b.
	c, fc := a, fa
	step, before := b-a, b-a
	width, slow := math.Abs(b-a), 0
	for n := 1; n <= maxIterations; n++ {
		if math.Abs(fc) < math.Abs(fb) {
			a, b, c = b, c, b
			fa, fb, fc = fb, fc, fb
		}
		// Two units in the last place: less cannot be resolved.
		limit := math.Max(tol, 0)/2 + math.Abs(b)*0x1p-52 + math.SmallestNonzeroFloat64
		middle := c/2 - b/2
		if math.Abs(middle) <= limit || fb == 0 {
			return Root{X: b, Residual: fb, Iterations: n - 1}, nil
		}
		bisect := math.Abs(before) < limit || math.Abs(fa) <= math.Abs(fb)
		if now := math.Abs(c - b); now > width/2 {
			slow++
			bisect = bisect || slow > 2
		} else {
			width, slow = now, 0
		}
		if !bisect {
			var p, q float64
			s := fb / fa
			if a == c {
				p, q = 2*middle*s, 1-s
			} else {
				r, t := fb/fc, fa/fc
				p = s * (2*middle*t*(t-r) - (b-a)*(r-1))
				q = (t - 1) * (r - 1) * (s - 1)
			}
			if p > 0 {
				q = -q
			} else {
				p = -p
			}
			if 2*p < math.Min(3*middle*q-math.Abs(limit*q), math.Abs(before*q)) {
				before, step = step, p/q
			} else {
				bisect = true
			}
		}
		if bisect {
			step, before = middle, middle
			slow = 0
		}
		a, fa = b, fb
		if math.Abs(step) > limit {
			b += step
		} else {
			b += math.Copysign(limit, middle)
		}
		fb = f(b)
		if !finite(fb) {
			return Root{}, fmt.Errorf("f(%g) = %g: %w", b, fb, ErrNotFinite)
		}
		if math.Signbit(fb) == math.Signbit(fc) && fb != 0 {
			c, fc = a, fa
			step = b - a
			before = step
		}
	}
	return Root{X: b, Residual: fb, Iterations: maxIterations},
		fmt.Errorf("bracket %g..%g after %d steps: %w", b, c, maxIterations, ErrIterations)
}

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }
