package acloss

import (
	"errors"
	"math/cmplx"

	"gapwright/corelib/quantity"
)

const mu0 = quantity.Mu0

var errSingular = errors.New("the equations of the eddy currents are singular")

// factorSymmetric makes the LDL^T factors (no conjugate) of a complex symmetric
// matrix, whose lower triangle is given row by row, in its place. Both uses have
// a dominant diagonal or a positive definite real part, so that no pivots are
// needed.
func factorSymmetric(m []complex128, n int) error {
	// Row i first holds the products L D, then L.
	for i := range n {
		ri := m[i*n : i*n+i+1]
		for j := range i {
			rj := m[j*n : j*n+j]
			sum := ri[j]
			for k, l := range rj {
				sum -= ri[k] * l
			}
			ri[j] = sum
		}
		d := ri[i]
		for j := range i {
			l := ri[j] / m[j*n+j]
			d -= ri[j] * l
			ri[j] = l
		}
		if d == 0 || cmplx.IsNaN(d) {
			return errSingular
		}
		ri[i] = d
	}
	return nil
}

// solveSymmetric solves with the factors, in place.
func solveSymmetric(m []complex128, n int, b []complex128) {
	for i := range n {
		sum := b[i]
		for j, l := range m[i*n : i*n+i] {
			sum -= l * b[j]
		}
		b[i] = sum
	}
	for i := range n {
		b[i] /= m[i*n+i]
	}
	for i := n - 1; i >= 0; i-- {
		x := b[i]
		for j, l := range m[i*n : i*n+i] {
			b[j] -= l * x
		}
	}
}

// eliminate solves n equations whose rows of width w hold the matrix and then
// the right-hand sides, with row exchange; the solutions replace the latter.
func eliminate(m []complex128, n, w int) error {
	for i := range n {
		best := i
		for r := i + 1; r < n; r++ {
			if cmplx.Abs(m[r*w+i]) > cmplx.Abs(m[best*w+i]) {
				best = r
			}
		}
		if d := m[best*w+i]; d == 0 || cmplx.IsNaN(d) {
			return errSingular
		}
		if best != i {
			for k := range w {
				m[i*w+k], m[best*w+k] = m[best*w+k], m[i*w+k]
			}
		}
		for r := range n {
			if r == i {
				continue
			}
			f := m[r*w+i] / m[i*w+i]
			if f == 0 {
				continue
			}
			for k := i; k < w; k++ {
				m[r*w+k] -= f * m[i*w+k]
			}
		}
	}
	for i := range n {
		for k := n; k < w; k++ {
			m[i*w+k] /= m[i*w+i]
		}
	}
	return nil
}
