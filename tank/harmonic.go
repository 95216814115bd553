package tank

import (
	"math"
	"math/cmplx"
)

// harmonicState is the tank in the first-harmonic approximation, in normalised
// units.
type harmonicState struct {
	start     unknowns // at the rising edge
	primary   float64  // amplitude of i
	magnetize float64  // amplitude of m
	secondary float64  // amplitude of i - m
	output    float64  // E less the drop
}

// firstHarmonic replaces bridge and rectifier by their fundamentals: the bridge
// by a sine of 4/pi, the load by Re = 8/pi² of its value. The drop of the
// rectifier is a part of E, and is found by repeating with the current of the
// round before.
func (s *solver) firstHarmonic() harmonicState {
	w := math.Pi / s.half
	var h harmonicState
	drop := 0.0 // as a resistance in the place of the load
	for range 12 {
		re := 8 / (math.Pi * math.Pi) * (s.load + drop)
		zm := complex(0, w/s.lambda)
		zl := complex(s.rs+re, 0)
		i := complex(4/math.Pi, 0) / (complex(s.rp, w-1/w) + zm*zl/(zm+zl))
		l := i * zm / (zm + zl)
		m := i - l
		v := i / complex(0, w)
		h.primary, h.secondary, h.magnetize = cmplx.Abs(i), cmplx.Abs(l), cmplx.Abs(m)
		mean := 2 / math.Pi * h.secondary
		h.output = s.load * mean
		// i = Im(phasor exp(jwt)), so the value at t = 0 is the imaginary part.
		h.start = unknowns{imag(i), imag(v), imag(m), s.drop + h.output}
		if s.drop == 0 || mean == 0 {
			break
		}
		// Half way: the drop as a resistance rises when the current falls.
		drop = (drop + s.drop/mean) / 2
	}
	if !finite(h.start[:]...) {
		h.start = unknowns{0, -1, 0, s.drop + s.load}
	}
	return h
}
