// Package thermal finds the temperatures of a wound part: two nodes, winding and
// core, each shedding heat to the air by convection and radiation from its own free
// faces, with conduction between them through the former and an extra path from the
// core to a wall. Losses depend on the temperatures and both are found together; a
// part that has no steady state (thermal runaway) is a result, not an error.
//
// Temperatures are in °C, of the air near the part, not of the room. Radiation goes
// to surroundings at the temperature of that air. Every temperature is good to about
// +-25 % of the rise: neighbours, board, leads and the contact of the former are not
// known better.
package thermal

import (
	"errors"
	"fmt"
	"math"

	"gapwright/corelib/root"
)

// Accuracy is the relative accuracy of a computed rise that reports state.
const Accuracy = 0.25

// Ceiling is the temperature in °C up to which a steady state is looked for. It is
// above the Curie point of every MnZn ferrite and the limit of every winding.
const Ceiling = 300

// Surroundings are what the part sheds its heat to.
type Surroundings struct {
	Ambient         float64 // °C, air around the part
	Altitude        float64 // m
	AirSpeed        float64 // m/s; 0: still
	WallConductance float64 // W/K from the core to a wall; 0: none
	Wall            float64 // °C, of that wall
}

// A Result is the steady state of a part.
type Result struct {
	WindingTemperature float64 // °C, mean
	CoreTemperature    float64 // °C
	HotSpot            float64 // °C, winding temperature plus the body's allowance
	WindingLoss        float64 // W, at these temperatures
	CoreLoss           float64 // W
	ToCore             float64 // W from winding to core; negative: the core heats the winding
	ToWall             float64 // W through the extra path
	Iterations         int     // of the solver
	Residual           float64 // W, largest imbalance of a node
	Runaway            bool    // no steady state below Ceiling; the temperatures are then Ceiling
	Reason             string  // words for Runaway, else empty
}

var (
	// ErrLoss means that a loss function returned a value that is negative or not finite.
	ErrLoss = errors.New("not a loss")
	// ErrSurroundings means that ambient, altitude, air speed or the wall make no sense.
	ErrSurroundings = errors.New("no such surroundings")
)

// Solve returns the steady state of a body in its surroundings. The losses in W are
// functions of the winding and of the core temperature in °C.
//
// The two heat balances are solved by Newton's method from a cold start. A solution
// counts only when it is stable, that is when a small rise sheds more than it adds.
// When Newton finds none below Ceiling, every core temperature from the air's up to
// Ceiling is tried in steps, and the lowest balance is returned; if there is none,
// the result is a runaway. The error wraps ErrBody, ErrSurroundings or ErrLoss.
func Solve(body Body, around Surroundings, lossWinding, lossCore func(float64) float64) (Result, error) {
	n := network{body: body, around: around, winding: lossWinding, core: lossCore}
	if err := body.check(); err != nil {
		return Result{}, err
	}
	if err := around.check(); err != nil {
		return Result{}, err
	}
	if !n.sheds() {
		return Result{}, fmt.Errorf("no face and no path to a wall sheds heat: %w", ErrBody)
	}
	n.thin = math.Sqrt(RelativeDensity(around.Altitude))
	r, ok := n.newton()
	if !ok && n.err == nil {
		r = n.scan()
	}
	if n.err != nil {
		return Result{}, n.err
	}
	return r, nil
}

func (s Surroundings) check() error {
	switch {
	case !(s.Ambient > -100 && s.Ambient < Ceiling):
		return fmt.Errorf("ambient temperature %g °C: %w", s.Ambient, ErrSurroundings)
	case !(s.Altitude >= -500 && s.Altitude <= 11000):
		return fmt.Errorf("altitude %g m: %w", s.Altitude, ErrSurroundings)
	case !(s.AirSpeed >= 0 && s.AirSpeed < 100):
		return fmt.Errorf("air speed %g m/s: %w", s.AirSpeed, ErrSurroundings)
	case !(s.WallConductance >= 0) || math.IsInf(s.WallConductance, 0):
		return fmt.Errorf("%g W/K to the wall: %w", s.WallConductance, ErrSurroundings)
	case s.WallConductance > 0 && !(s.Wall > -100 && s.Wall < Ceiling):
		return fmt.Errorf("wall temperature %g °C: %w", s.Wall, ErrSurroundings)
	}
	return nil
}

// Shed returns the heat in W that faces at a temperature in °C give to the air
// around them, by convection and radiation.
func Shed(faces []Face, temp float64, around Surroundings) float64 {
	return shed(faces, temp, around, math.Sqrt(RelativeDensity(around.Altitude)))
}

func shed(faces []Face, temp float64, around Surroundings, thin float64) float64 {
	rise := temp - around.Ambient
	var air Air
	if around.AirSpeed > 0 {
		air = AirAt((temp+around.Ambient)/2, around.Altitude)
	}
	var sum float64
	for i := range faces {
		f := &faces[i]
		h := natural(f.Orientation, rise, f.Length) * thin
		if around.AirSpeed > 0 {
			h = together(h, Forced(around.AirSpeed, f.Length, air))
		}
		sum += f.Area * (h*rise + Radiation(f.Emissivity, temp, around.Ambient))
	}
	return sum
}

type network struct {
	body          Body
	around        Surroundings
	winding, core func(float64) float64
	thin          float64
	err           error
	count         int
}

// sheds reports whether heat has a way out of each node.
func (n *network) sheds() bool {
	free := func(faces []Face) bool {
		for _, f := range faces {
			if f.Area > 0 {
				return true
			}
		}
		return false
	}
	w, c := free(n.body.Winding), free(n.body.Core) || n.around.WallConductance > 0
	if n.body.Between > 0 {
		return w || c
	}
	return w && c
}

func (n *network) loss(what string, f func(float64) float64, temp float64) float64 {
	p := f(temp)
	if !(p >= 0) || math.IsInf(p, 0) {
		if n.err == nil {
			n.err = fmt.Errorf("%s loss of %g W at %g °C: %w", what, p, temp, ErrLoss)
		}
		return 0
	}
	return p
}

func (n *network) toWall(core float64) float64 {
	if n.around.WallConductance == 0 {
		return 0
	}
	return n.around.WallConductance * (core - n.around.Wall)
}

// surplus returns the heat made minus the heat shed, in W: by the winding without
// the way to the core, by the core likewise.
func (n *network) windingSurplus(temp float64) float64 {
	return n.loss("winding", n.winding, temp) - shed(n.body.Winding, temp, n.around, n.thin)
}

func (n *network) coreSurplus(temp float64) float64 {
	return n.loss("core", n.core, temp) - shed(n.body.Core, temp, n.around, n.thin) - n.toWall(temp)
}

// newton looks for a stable balance from a cold start.
func (n *network) newton() (Result, bool) {
	const (
		maxSteps = 40
		h        = 1e-3 // K, for slopes
		maxStep  = 60   // K
	)
	start := n.around.Ambient
	pw, pc := n.loss("winding", n.winding, start), n.loss("core", n.core, start)
	// A cold guess: 12 W/(m² K) of convection and radiation together.
	surface := 12*n.body.Surface() + n.around.WallConductance
	tw := start + min((pw+pc)/surface, maxStep)
	tc := tw
	for n.count = 1; n.count <= maxSteps && n.err == nil; n.count++ {
		g := n.body.Between
		sw, sc := n.windingSurplus(tw), n.coreSurplus(tc)
		fw, fc := sw-g*(tw-tc), sc+g*(tw-tc)
		dw, dc := (n.windingSurplus(tw+h)-sw)/h-g, (n.coreSurplus(tc+h)-sc)/h-g
		det := dw*dc - g*g
		residual := max(math.Abs(fw), math.Abs(fc))
		// A microwatt more, so that a part without losses converges too.
		scale := n.loss("winding", n.winding, tw) + n.loss("core", n.core, tc) + math.Abs(n.toWall(tc)) + 1e-6
		if residual <= 1e-9*scale {
			// Stable when the matrix of slopes has two negative eigenvalues.
			if dw+dc < 0 && det > 0 && tw <= Ceiling && tc <= Ceiling {
				return n.result(tw, tc, residual), true
			}
			return Result{}, false
		}
		if det == 0 || math.IsNaN(det) {
			return Result{}, false
		}
		stepW := -(dc*fw - g*fc) / det
		stepC := -(dw*fc - g*fw) / det
		if big := max(math.Abs(stepW), math.Abs(stepC)); big > maxStep {
			stepW, stepC = stepW*maxStep/big, stepC*maxStep/big
		}
		tw, tc = tw+stepW, tc+stepC
		low := n.lowest()
		if tw < low-1 || tc < low-1 || tw > 2*Ceiling || tc > 2*Ceiling {
			return Result{}, false // no balance lies there: let the scan decide
		}
	}
	return Result{}, false
}

// lowest is the temperature that no node can fall below.
func (n *network) lowest() float64 {
	if n.around.WallConductance > 0 {
		return min(n.around.Ambient, n.around.Wall)
	}
	return n.around.Ambient
}

// scan looks for the lowest balance by steps of the core temperature, the winding's
// following from its own balance.
func (n *network) scan() Result {
	balance := func(tc float64) (surplus, tw float64, ok bool) {
		tw, ok = n.first(func(t float64) float64 { return n.windingSurplus(t) - n.body.Between*(t-tc) }, n.lowest())
		return n.coreSurplus(tc) + n.body.Between*(tw-tc), tw, ok
	}
	windingEnds := false
	tc, found := n.first(func(t float64) float64 {
		s, _, ok := balance(t)
		if !ok {
			// With a hotter core the winding has no balance either.
			windingEnds = true
			return math.MaxFloat64
		}
		return s
	}, n.lowest())
	if n.err != nil {
		return Result{}
	}
	if found {
		if s, tw, ok := balance(tc); ok {
			r := n.result(tw, tc, 0)
			r.Residual = math.Abs(s)
			return r
		}
	}
	r := n.result(Ceiling, Ceiling, 0)
	made := r.WindingLoss + r.CoreLoss
	out := shed(n.body.Winding, Ceiling, n.around, n.thin) + shed(n.body.Core, Ceiling, n.around, n.thin) + r.ToWall
	r.Runaway = true
	r.Residual = math.Abs(made - out)
	switch {
	case made >= out:
		r.Reason = fmt.Sprintf("thermal runaway: no steady temperature below %d °C; there the part makes %.3g W and sheds %.3g W", Ceiling, made, out)
	case windingEnds:
		r.Reason = fmt.Sprintf("thermal runaway: the winding has no steady temperature below %d °C; there it makes %.3g W, and too little of it reaches air and core", Ceiling, r.WindingLoss)
	default:
		r.Reason = fmt.Sprintf("thermal runaway: the core has no steady temperature below %d °C; there it makes %.3g W, and too little of it reaches air, wall and winding", Ceiling, r.CoreLoss)
	}
	return r
}

// first returns the lowest temperature between from and Ceiling where the surplus of
// a node turns from heating to cooling, searched in 32 steps. A balance that exists
// only within one step (8 K) of an unstable one is overlooked; such a part is not one
// to build.
func (n *network) first(surplus func(float64) float64, from float64) (float64, bool) {
	const steps = 32
	last := from
	n.count++
	if surplus(last) <= 0 {
		return last, true
	}
	for i := 1; i <= steps && n.err == nil; i++ {
		t := from + (Ceiling-from)*float64(i)/steps
		n.count++
		s := surplus(t)
		if s == math.MaxFloat64 {
			return Ceiling, false
		}
		if s <= 0 {
			r, err := root.Find(surplus, last, t, 1e-9)
			if err != nil {
				if n.err == nil {
					n.err = fmt.Errorf("balance between %g and %g °C: %w", last, t, err)
				}
				return last, false
			}
			n.count += r.Iterations
			return r.X, true
		}
		last = t
	}
	return Ceiling, false
}

func (n *network) result(tw, tc, residual float64) Result {
	return Result{WindingTemperature: tw, CoreTemperature: tc, HotSpot: tw + n.body.HotSpot,
		WindingLoss: n.loss("winding", n.winding, tw), CoreLoss: n.loss("core", n.core, tc),
		ToCore: n.body.Between * (tw - tc), ToWall: n.toWall(tc), Iterations: n.count, Residual: residual}
}
