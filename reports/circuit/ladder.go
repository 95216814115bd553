package circuit

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// A Section of a ladder is a resistance and an inductance in parallel; a ladder
// is a chain of sections in series. At direct current it is nothing, and its
// resistance rises with frequency: passive with every R and L above zero.
type Section struct {
	R float64 // ohm
	L float64 // H
}

// impedance returns that of a ladder at an angular frequency.
func impedance(ladder []Section, omega float64) complex128 {
	z := complex(0, 0)
	for _, s := range ladder {
		x := complex(0, omega*s.L)
		z += x * complex(s.R, 0) / (complex(s.R, 0) + x)
	}
	return z
}

// gridRatio is the step between the corner frequencies that a ladder may use. A
// finer grid no longer fits better: two neighbours together make what lies
// between them.
const gridRatio = 1.4

// notNegative minimises |a x - b| with no x below zero.
//
// Source: C. L. Lawson, R. J. Hanson, Solving Least Squares Problems, 1974,
// algorithm NNLS.
func notNegative(a *mat.Dense, b []float64) []float64 {
	rows, cols := a.Dims()
	x := make([]float64, cols)
	free := make([]bool, cols)
	residual := mat.NewVecDense(rows, nil)
	var gradient mat.VecDense
	right := mat.NewVecDense(rows, b)
	size := mat.Norm(a, 2) * mat.Norm(right, 2)
	// Each round frees one variable for good or ends; the bound is the book's.
	for range 3 * cols {
		residual.MulVec(a, mat.NewVecDense(cols, x))
		residual.SubVec(right, residual)
		gradient.MulVec(a.T(), residual)
		best := -1
		for j := range cols {
			if !free[j] && gradient.AtVec(j) > 1e-12*size && (best < 0 || gradient.AtVec(j) > gradient.AtVec(best)) {
				best = j
			}
		}
		if best < 0 {
			break
		}
		free[best] = true
		for {
			z := leastSquares(a, b, free)
			if z == nil {
				free[best] = false
				return x
			}
			step, bound := 1.0, -1
			for j := range cols {
				if free[j] && z[j] <= 0 {
					if s := x[j] / (x[j] - z[j]); s < step || bound < 0 {
						step, bound = math.Min(s, step), j
					}
				}
			}
			if bound < 0 {
				copy(x, z)
				break
			}
			for j := range cols {
				if free[j] {
					x[j] += step * (z[j] - x[j])
				}
			}
			x[bound], free[bound] = 0, false
			for j := range cols {
				if free[j] && x[j] <= 0 {
					x[j], free[j] = 0, false
				}
			}
		}
	}
	return x
}

// leastSquares solves for the free columns; nil when they are too alike.
func leastSquares(a *mat.Dense, b []float64, free []bool) []float64 {
	rows, cols := a.Dims()
	var pick []int
	for j, f := range free {
		if f {
			pick = append(pick, j)
		}
	}
	if len(pick) == 0 || len(pick) > rows {
		return nil
	}
	part := mat.NewDense(rows, len(pick), nil)
	for k, j := range pick {
		for i := range rows {
			part.Set(i, k, a.At(i, j))
		}
	}
	var qr mat.QR
	qr.Factorize(part)
	var y mat.VecDense
	if qr.SolveVecTo(&y, false, mat.NewVecDense(rows, b)) != nil {
		return nil
	}
	z := make([]float64, cols)
	for k, j := range pick {
		z[j] = y.AtVec(k)
	}
	return z
}
