package tank

import (
	"errors"
	"math"
	"slices"

	"gapwright/tank/waveform"
)

const degree = waveform.Degree

// Bounds of one half period, and of all the work for one corner. Ordinary tanks
// need about ten steps and three events, and 4000 steps for a corner whose
// frequency is looked for; the bound of the work is a second or less.
const (
	maxSteps  = 4000
	maxEvents = 200
	maxWork   = 400000
)

var (
	errTooLong  = errors.New("the half period holds too many time constants of the tank")
	errDeadTime = errors.New("the dead time fills the half period")
	errWork     = errors.New("the search takes too long")
	errIdle     = errors.New("the rectifier never conducts: the voltage across Lm stays below the drop")
	errChatter  = errors.New("the rectifier changes its state without end")
	errNewton   = errors.New("no periodic state was found")
)

// solver is the circuit with the work space of one solve.
type solver struct {
	circuit
	half       float64 // half period
	iterations int     // half periods followed, all attempts together
	work       int     // steps taken, likewise
	record     []stretch
	swing      swing
	scratch    expansion
}

// unknowns are i, v, m at the rising edge and E.
type unknowns [4]float64

// change holds, for each unknown, the change of the state it makes.
type change [4]state

// swing is what the bridge did in the dead time of the half period followed last.
type swing struct {
	node    node    // at the end of the dead time
	reached float64 // when u first got to +1; negative: never
	u, i    float64 // at the end of the dead time
}

// contact says how many leading coefficients of a quantity that is watched are
// zero because the step starts at an event.
type contact struct {
	rectifier int // i - m
	low, high int // u + 1, 1 - u
}

// follow runs one half period from y and returns the state at its end. It starts
// when the low switch turns off: with no dead time u is +1 at once, else u is
// left to the current until the dead time ends. With d not nil follow also
// returns the derivatives, with record set it keeps the steps in s.record.
func (s *solver) follow(y *unknowns, d *change, record bool) (state, error) {
	s.iterations++
	x := state{y[0], y[1], y[2], 0, 1}
	e := y[3]
	if d != nil {
		*d = change{{1}, {0, 1}, {0, 0, 1}, {}}
	}
	if record {
		s.record = s.record[:0]
	}
	if s.half/math.Min(s.longest(forward, driven), s.longest(off, driven)) > maxSteps {
		return x, errTooLong
	}
	nd, deadline := driven, s.half
	var touch contact
	s.swing = swing{reached: -1}
	if s.dead > 0 {
		x[4], deadline = -1, s.dead
		nd, touch.low = swinging, 1
		if x[0] >= 0 {
			nd = heldLow
		}
	}
	var md mode
	md, touch.rectifier = s.begin(&x, nd, e, d)
	t, events := 0.0, 0
	for range maxSteps {
		if s.work++; s.work > maxWork {
			return x, errWork
		}
		left := deadline - t
		if left <= 1e-15*s.half {
			if nd == driven {
				return x, nil
			}
			// The other switch turns on.
			s.swing.node, s.swing.u, s.swing.i = nd, x[4], x[0]
			nd, deadline, x[4] = driven, s.half, 1
			touch = contact{rectifier: min(touch.rectifier, 1)}
			if md == off && math.Abs(s.open(&x)) > e {
				md, touch.rectifier = s.settle(&x, e)
			}
			if d != nil {
				for k := range d {
					d[k][4] = 0
				}
			}
			continue
		}
		h := left / math.Ceil(left/s.longest(md, nd)) // equal steps leave no sliver
		s.expand(md, nd, e, h, &x, &s.scratch)

		at := 1.0
		u, next, rectifierMoves := s.rectifierEvent(md, e, touch)
		if rectifierMoves {
			at = u
		}
		u, nodeMoves := s.nodeEvent(nd, touch)
		if nodeMoves = nodeMoves && u < at; nodeMoves {
			at, rectifierMoves = u, false
		}
		if at < 1 {
			h *= at
			s.scratch.cut(at)
		}
		if h > 0 {
			if record {
				s.record = append(s.record, stretch{md, nd, t, h, s.scratch})
			}
			if d != nil {
				for k := range d {
					s.carry(md, nd, float64(k/3), h, &d[k]) // the fourth unknown is E
				}
			}
			x = s.scratch.at(1)
			t += h
			touch = contact{}
		}
		if !rectifierMoves && !nodeMoves {
			continue
		}
		if events++; events > maxEvents {
			return x, errChatter
		}
		switch {
		case nodeMoves:
			nd = s.move(nd, t, &x, d, &touch)
		case md == off:
			// The voltage is continuous here, so both circuits have the same
			// slope and small changes pass as they are.
			md, touch.rectifier = next, 2
			x[2] = x[0]
		default:
			before := s.slope(md, nd, e, &x)
			x[2] = x[0]
			md, touch.rectifier = s.settle(&x, e)
			if d != nil {
				s.jump(d, before, s.slope(md, nd, e, &x), md)
			}
		}
	}
	return x, errTooLong
}

// rectifierEvent looks for the end of the mode in the step in s.scratch.
func (s *solver) rectifierEvent(md mode, e float64, touch contact) (at float64, next mode, found bool) {
	var g [degree + 1]float64 // positive while the mode lasts
	if md != off {
		sign := float64(md)
		for k := range g {
			g[k] = sign * (s.scratch.i[k] - s.scratch.m[k])
		}
		if touch.rectifier > 0 {
			g[0] = 0
		}
		at, found = firstZero(&g, touch.rectifier)
		return at, off, found
	}
	var vp [degree + 1]float64 // voltage across Lm
	scale := 1 / (1 + s.lambda)
	for k := range vp {
		vp[k] = scale * (s.scratch.u[k] - s.scratch.v[k] - s.rp*s.scratch.i[k])
	}
	for _, sign := range [2]mode{forward, backward} {
		for k := range g {
			g[k] = -float64(sign) * vp[k]
		}
		g[0] += e
		n := 0
		if g[0] <= 1e-13*e { // the mode starts on its own border
			g[0], n = 0, 1
		}
		if u, ok := firstZero(&g, n); ok && (!found || u < at) {
			at, next, found = u, sign, true
		}
	}
	return at, next, found
}

// nodeEvent looks for the end of what holds u in the step in s.scratch.
func (s *solver) nodeEvent(nd node, touch contact) (at float64, found bool) {
	if nd == driven {
		return 0, false
	}
	var g [degree + 1]float64 // positive while nothing happens
	if nd != swinging {
		sign := 1.0
		if nd == heldHigh {
			sign = -1
		}
		for k := range g {
			g[k] = sign * s.scratch.i[k]
		}
		n := 0
		if g[0] <= 0 {
			g[0], n = 0, 1
		}
		return firstZero(&g, n)
	}
	for _, sign := range [2]float64{1, -1} {
		for k := range g {
			g[k] = -sign * s.scratch.u[k]
		}
		g[0]++
		n := touch.high
		if sign < 0 {
			n = touch.low
		}
		for k := range n {
			g[k] = 0
		}
		if u, ok := firstZero(&g, n); ok && (!found || u < at) {
			at, found = u, true
		}
	}
	return at, found
}

// move takes u through its event: a rail is reached, or the diode lets go.
func (s *solver) move(nd node, t float64, x *state, d *change, touch *contact) node {
	switch {
	case nd == heldLow:
		touch.low = 2
		return swinging
	case nd == heldHigh:
		touch.high = 2
		return swinging
	case x[4] > 0:
		x[4], nd = 1, heldHigh
		if s.swing.reached < 0 {
			s.swing.reached = t
		}
	default:
		x[4], nd = -1, heldLow
	}
	if d != nil {
		// All circuits have the same slopes except that of u, which is held.
		for k := range d {
			d[k][4] = 0
		}
	}
	return nd
}

// settle returns the mode when i = m, and the contact of i - m.
func (s *solver) settle(x *state, e float64) (md mode, touch int) {
	switch vp := s.open(x); {
	case vp > e:
		return forward, 1
	case vp < -e:
		return backward, 1
	}
	return off, 0
}

// begin returns the mode at the start of the half period.
func (s *solver) begin(x *state, nd node, e float64, d *change) (md mode, touch int) {
	switch gap := x[0] - x[2]; {
	case gap > 1e-11*(math.Abs(x[0])+math.Abs(x[2])):
		return forward, 0
	case gap < -1e-11*(math.Abs(x[0])+math.Abs(x[2])):
		return backward, 0
	}
	x[2] = x[0]
	md, touch = s.settle(x, e)
	if d != nil && md == off {
		// A change that parts i from m makes a short forward conduction first.
		s.jump(d, s.slope(forward, nd, e, x), s.slope(off, nd, e, x), off)
	}
	return md, touch
}

// jump takes small changes through an event at i = m. A change that moves the
// event by dt is carried for dt by the slope before instead of the slope after.
func (s *solver) jump(d *change, before, after state, md mode) {
	rate := before[0] - before[2]
	for k := range d {
		if rate != 0 {
			dt := -(d[k][0] - d[k][2]) / rate
			for j := range d[k] {
				d[k][j] += (before[j] - after[j]) * dt
			}
		}
		if md == off {
			d[k][2] = d[k][0]
		}
	}
}

// mismatch returns by how much y fails to repeat: the state after half a period
// plus the state before, and the balance of output voltage and load, weighted so
// that it is of order one for light loads too.
func (s *solver) mismatch(y *unknowns, d *change) (r unknowns, err error) {
	x, err := s.follow(y, d, false)
	if err != nil {
		return r, err
	}
	w := 1 / (1 + s.load)
	r = unknowns{x[0] + y[0], x[1] + y[1], x[2] + y[2], w * (y[3] - s.drop - s.load*x[3]/s.half)}
	if !finite(r[:]...) {
		return r, errNewton
	}
	return r, nil
}

// jacobian turns the changes of the final state into those of the mismatch.
func (s *solver) jacobian(d *change) (j [4][4]float64) {
	w := 1 / (1 + s.load)
	for k := range d {
		for n := range 3 {
			j[n][k] = d[k][n]
		}
		j[3][k] = -w * s.load * d[k][3] / s.half
	}
	j[0][0]++
	j[1][1]++
	j[2][2]++
	j[3][3] += w
	return j
}

// A solution is a periodic state and how well it repeats.
type solution struct {
	y        unknowns
	residual float64 // relative to the size of y
}

// Newton's method is done below settled, and is content with good when no step
// makes it better.
const (
	settled = 1e-14
	good    = 1e-11
)

// newton improves y until it repeats.
func (s *solver) newton(y unknowns) (solution, error) {
	var d change
	r, err := s.mismatch(&y, &d)
	if err != nil {
		return solution{}, err
	}
	for range 60 {
		size, now := norm(y), norm(r)
		if now <= settled*size {
			return solution{y, now / size}, nil
		}
		next, nextR, nextD, better := s.step(y, r, s.jacobian(&d), now)
		if !better && now > good*size {
			// At a kink of the map the slopes of the neighbouring piece may
			// lead out.
			for _, shift := range [2]float64{1e-4, -1e-4} {
				z := y
				z[0] += shift * (math.Abs(y[0]) + math.Abs(y[2]) + 0.01*size)
				var dz change
				if _, err := s.mismatch(&z, &dz); err != nil {
					continue
				}
				if next, nextR, nextD, better = s.step(y, r, s.jacobian(&dz), now); better {
					break
				}
			}
		}
		if !better {
			if now <= good*size {
				return solution{y, now / size}, nil
			}
			return solution{y, now / size}, errNewton
		}
		y, r, d = next, nextR, nextD
	}
	if size, now := norm(y), norm(r); now <= good*size {
		return solution{y, now / size}, nil
	}
	return solution{}, errNewton
}

// step tries the Newton step, shortened until the mismatch falls.
func (s *solver) step(y, r unknowns, j [4][4]float64, now float64) (next, nextR unknowns, d change, better bool) {
	delta, ok := solve4(j, r)
	if !ok {
		return
	}
	// No further than a factor of three in E and twice the size of the state.
	limit := 1.0
	if e := y[3] - delta[3]; e > 3*y[3] {
		limit = math.Min(limit, 2*y[3]/-delta[3])
	} else if e < y[3]/3 {
		limit = math.Min(limit, 2./3*y[3]/delta[3])
	}
	size := norm(unknowns{y[0], y[1], y[2], y[3]})
	if far := norm(unknowns{delta[0], delta[1], delta[2], 0}); far > 2*size {
		limit = math.Min(limit, 2*size/far)
	}
	for a := limit; a > limit/2000; a /= 2 {
		for k := range y {
			next[k] = y[k] - a*delta[k]
		}
		var err error
		nextR, err = s.mismatch(&next, &d)
		if err == nil && norm(nextR) < now*(1-1e-4*a) {
			return next, nextR, d, true
		}
		if now < good*size {
			break // at rounding level a shorter step says nothing new
		}
	}
	return next, nextR, d, false
}

// march follows n half periods while the output voltage relaxes towards the
// load, which leads to the neighbourhood of the periodic state from anywhere.
func (s *solver) march(y unknowns, n int) (unknowns, error) {
	for range n {
		x, err := s.follow(&y, nil, false)
		if err != nil {
			return y, err
		}
		e := y[3] + 0.5/(1+2*s.load/s.half)*(s.drop+s.load*x[3]/s.half-y[3])
		y = unknowns{-x[0], -x[1], -x[2], e}
	}
	if !finite(y[:]...) {
		return y, errNewton
	}
	return y, nil
}

// periodic finds the periodic state at half period s.half, first from the guess,
// then by what helps when Newton's method fails: marching, and added resistance
// that is withdrawn in steps.
func (s *solver) periodic(guess unknowns) (solution, error) {
	found, err := s.newton(guess)
	if err == nil || errors.Is(err, errTooLong) || errors.Is(err, errDeadTime) {
		return found, err
	}
	start := s.firstHarmonic().start
	if start != guess {
		if found, err = s.newton(start); err == nil {
			return found, nil
		}
	}
	y := start
	for _, n := range []int{30, 30, 60, 120} {
		var err error
		if y, err = s.march(y, n); err != nil {
			break
		}
		if found, err := s.newton(y); err == nil {
			return found, nil
		}
	}
	defer func(rp, rs float64) { s.rp, s.rs = rp, rs }(s.rp, s.rs)
	rp := s.rp
	y = start
	for _, extra := range []float64{1, 0.5, 0.25, 0.12, 0.06, 0.03, 0.015, 0.007, 0.003, 0.001, 3e-4, 1e-4, 1e-5, 0} {
		s.rp = rp + extra
		found, err := s.newton(y)
		if err != nil {
			z, err2 := s.march(y, 60)
			if err2 != nil {
				return solution{}, errNewton
			}
			if found, err = s.newton(z); err != nil {
				continue
			}
		}
		y = found.y
		if extra == 0 {
			return found, nil
		}
	}
	return solution{}, errNewton
}

// solve4 solves j x = r by elimination with partial pivoting.
func solve4(j [4][4]float64, r unknowns) (x unknowns, ok bool) {
	x = r
	for c := range 4 {
		p := c
		for k := c + 1; k < 4; k++ {
			if math.Abs(j[k][c]) > math.Abs(j[p][c]) {
				p = k
			}
		}
		if math.Abs(j[p][c]) < 1e-14 {
			return x, false
		}
		j[c], j[p] = j[p], j[c]
		x[c], x[p] = x[p], x[c]
		for k := c + 1; k < 4; k++ {
			f := j[k][c] / j[c][c]
			for n := c; n < 4; n++ {
				j[k][n] -= f * j[c][n]
			}
			x[k] -= f * x[c]
		}
	}
	for c := 3; c >= 0; c-- {
		for n := c + 1; n < 4; n++ {
			x[c] -= j[c][n] * x[n]
		}
		x[c] /= j[c][c]
	}
	return x, finite(x[:]...)
}

func norm(y unknowns) float64 {
	sum := 0.0
	for _, v := range y {
		sum += v * v
	}
	return math.Sqrt(sum)
}

func finite(x ...float64) bool {
	return !slices.ContainsFunc(x, func(v float64) bool { return math.IsNaN(v) || math.IsInf(v, 0) })
}
