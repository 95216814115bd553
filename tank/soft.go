package tank

import (
	"errors"
	"math"
)

// SoftSwitching says what the node capacitance leaves of the bridge's swing
// during the dead time. The swing is part of the periodic state: the rectifier
// goes on meanwhile, and the currents are those with the slanted edges.
type SoftSwitching struct {
	Complete    bool    // the other rail is reached within the dead time and held to its end
	SwingTime   float64 // s, from turn-off to the other rail; 0 when incomplete
	VoltageLeft float64 // V, still to go for one node when the dead time ends
	EndCurrent  float64 // A, i when the dead time ends; above 0 it still drives the swing or holds the node
	Capacitance float64 // F, of one node with what winding and rectifiers add
	EdgeMiddle  float64 // s, from turn-off to the middle of the edge, which is t = 0 of the waveforms
	HandRule    float64 // H, the largest Lm by the rule of thumb, see Tank.HandRule
}

// swingCapacitance returns what one node has to move: its own capacitance with
// that across the primary and of the rectifiers added one to one, which is more
// than they draw.
func (t Tank) swingCapacitance() float64 {
	return t.NodeCapacitance + t.WindingCapacitance + 2*t.RectifierCapacitance/(t.TurnsRatio*t.TurnsRatio)
}

func (o *Operation) softSwitching(t Tank, s *solver, unit scales, origin float64) {
	if t.DeadTime == 0 {
		return
	}
	w := SoftSwitching{
		Complete:    s.swing.node == heldHigh,
		VoltageLeft: (1 - s.swing.u) / 2 * o.Corner.InputVoltage,
		EndCurrent:  -s.swing.i * unit.current, // the half period followed is the one of the rising edge
		Capacitance: t.swingCapacitance(),
		EdgeMiddle:  origin * unit.time,
		HandRule:    t.HandRule(o.Frequency),
	}
	if w.Complete {
		w.SwingTime = s.swing.reached * unit.time
	}
	o.SoftSwitching = &w
}

// HandRule returns the largest Lm by the rule of thumb for operation at or above
// resonance: the peak of a triangular magnetizing current moves the node by the
// input voltage within the dead time. It returns 0 when no dead time is given,
// and +Inf without a capacitance.
func (t Tank) HandRule(frequency float64) float64 {
	if t.DeadTime == 0 {
		return 0
	}
	c := t.swingCapacitance()
	if c == 0 {
		return math.Inf(1)
	}
	lm := t.DeadTime / (8 * c * frequency)
	if t.Bridge == FullBridge {
		lm *= 2
	}
	return lm
}

// A Reach is how large Lm may be before the swing is incomplete.
type Reach struct {
	Lm        float64 // H; 0 when no Lm completes the swing
	Unlimited bool    // complete up to 10,000 Lr, which is Lm then
	Status    Status  // OK: above Lm the swing is incomplete; else: above Lm the corner itself is lost, with this status
}

// LargestMagnetizing returns the largest Lm with which the swing still completes
// at a corner, the corner being solved again for each Lm: less gain or another
// frequency are part of the answer. It is found to a part in 10,000. The error is
// that of Solve; without a dead time there is nothing to assess and the Reach is
// unlimited.
func LargestMagnetizing(t Tank, c Corner) (Reach, error) {
	if err := errors.Join(t.check(), c.check()); err != nil {
		return Reach{}, err
	}
	const step, resolution = 1.5, 1e-4
	top, bottom := seriesRatio*t.Lr, 0.2*t.Lr
	if t.DeadTime == 0 {
		return Reach{Lm: top, Unlimited: true, Status: OK}, nil
	}
	complete := func(lm float64) (bool, Status) {
		t.Lm = lm
		o := solve(t, c, false)
		return o.Status == OK && o.SoftSwitching.Complete, o.Status
	}
	// Bracket: lo completes, hi does not.
	lo := math.Min(t.Magnetizing(), top)
	good, status := complete(lo)
	hi := lo
	if good {
		for good {
			if lo = hi; lo >= top {
				return Reach{Lm: top, Unlimited: true, Status: OK}, nil
			}
			hi = math.Min(hi*step, top)
			good, status = complete(hi)
		}
	} else {
		for !good {
			hi = lo
			if lo /= step; lo < bottom {
				return Reach{Status: status}, nil
			}
			var at Status
			if good, at = complete(lo); !good {
				status = at
			}
		}
	}
	for hi > lo*(1+resolution) {
		lm := math.Sqrt(lo * hi)
		if good, at := complete(lm); good {
			lo = lm
		} else {
			hi, status = lm, at
		}
	}
	return Reach{Lm: lo, Status: status}, nil
}

// center turns the recorded steps so that they start at the middle of the rising
// edge: the steps before it go, with their signs turned, to the end. It returns
// when that middle was.
func (s *solver) center(e float64) (origin float64) {
	split, at := -1, 0.0 // the edge is at `at` of step split
	for k := range s.record {
		r := &s.record[k]
		if r.node == driven {
			if k > 0 && split < 0 {
				split, at = k, 0 // the switch makes the edge
			}
			break
		}
		end := horner(&r.u, 1)
		switch {
		case r.u[0] < 0 && end >= 0:
			var g [degree + 1]float64
			for j := range g {
				g[j] = -r.u[j]
			}
			split, at = k, 1
			if end > 0 {
				at = cross(&g, 0, 0, 1)
			}
		case end < 0:
			split = -1
		}
	}
	if split < 0 {
		return 0
	}
	origin = s.record[split].start + at*s.record[split].h
	turned := make([]stretch, 0, len(s.record)+1)
	r := s.record[split]
	if at < 1 {
		x := r.at(at)
		late := stretch{mode: r.mode, node: r.node, h: r.h * (1 - at)}
		s.expand(r.mode, r.node, e, late.h, &x, &late.expansion)
		turned = append(turned, late)
	}
	for _, r := range s.record[split+1:] {
		r.start -= origin
		turned = append(turned, r)
	}
	negate := func(r stretch) stretch {
		r.mode, r.start = -r.mode, r.start-origin+s.half
		for k := range r.i {
			r.i[k], r.v[k], r.m[k], r.u[k] = -r.i[k], -r.v[k], -r.m[k], -r.u[k]
		}
		return r
	}
	for _, r := range s.record[:split] {
		turned = append(turned, negate(r))
	}
	if at > 0 {
		r.cut(at)
		r.h *= at
		turned = append(turned, negate(r))
	}
	s.record = turned
	return origin
}

// meanProduct returns the mean of the product of two polynomials over 0..1.
func meanProduct(a, b *[degree + 1]float64) float64 {
	sum := 0.0
	for j, x := range a {
		if x == 0 {
			continue
		}
		for k, y := range b {
			sum += x * y / float64(j+k+1)
		}
	}
	return sum
}
