package tank

import (
	"context"
	"errors"
	"fmt"
	"math"
	"runtime"

	"golang.org/x/sync/errgroup"

	"gapwright/corelib/quantity"
)

// Solve returns the steady state of the tank at a corner. A corner that cannot
// be served is no error: Status and Reason tell. The error names every value
// that is no legal number.
func Solve(t Tank, c Corner) (Operation, error) {
	if err := errors.Join(t.check(), c.check()); err != nil {
		return Operation{}, err
	}
	return solve(t, c, true), nil
}

// solve is Solve for values that were checked.
func solve(t Tank, c Corner, margin bool) Operation {
	o := Operation{Corner: c}
	s := newCurve(t, c.InputVoltage)
	if c.OutputVoltage == 0 {
		s.setLoad(c.LoadResistance)
		o.LoadResistance = c.LoadResistance
		s.given(&o, c.Frequency)
	} else {
		o.LoadResistance = c.resistance()
		s.setLoad(o.LoadResistance)
		s.search(&o, margin)
	}
	o.Iterations = s.iterations
	if margin {
		o.warn(t)
	}
	return o
}

// SolveAll solves every corner, several at a time. The results are in the order
// of the corners and do not depend on the number of processors. The error is
// that of the context or of the first corner with an illegal number.
func SolveAll(ctx context.Context, t Tank, corners []Corner) ([]Operation, error) {
	list := make([]Operation, len(corners))
	g, ctx := errgroup.WithContext(ctx)
	g.SetLimit(runtime.GOMAXPROCS(0))
	for k, c := range corners {
		g.Go(func() error {
			if err := ctx.Err(); err != nil {
				return err
			}
			o, err := Solve(t, c)
			if err != nil {
				return fmt.Errorf("corner %s: %w", c.Name, err)
			}
			list[k] = o
			return nil
		})
	}
	if err := g.Wait(); err != nil {
		return nil, err
	}
	return list, nil
}

// resistance returns the load as a resistance at the wanted output.
func (c Corner) resistance() float64 {
	switch {
	case c.OutputCurrent > 0:
		return c.OutputVoltage / c.OutputCurrent
	case c.OutputPower > 0:
		return c.OutputVoltage * c.OutputVoltage / c.OutputPower
	}
	return c.LoadResistance
}

// No quantity of a converter in SI units is smaller or larger. The bounds keep
// every product of them inside float64.
const (
	leastValue    = 1e-18
	greatestValue = 1e18
)

type bound struct {
	name  string
	value float64
	zero  bool // zero is legal
}

func checkAll(list []bound) error {
	var errs []error
	for _, b := range list {
		switch {
		case !finite(b.value):
			errs = append(errs, fmt.Errorf("%s is %g, which is no finite number", b.name, b.value))
		case b.value < 0 || (b.value == 0 && !b.zero):
			errs = append(errs, fmt.Errorf("%s is %g and must be above zero", b.name, b.value))
		case b.value != 0 && (b.value < leastValue || b.value > greatestValue):
			errs = append(errs, fmt.Errorf("%s is %g, outside %g..%g", b.name, b.value, leastValue, greatestValue))
		}
	}
	return errors.Join(errs...)
}

func (t Tank) check() error {
	var errs []error
	if t.Bridge != HalfBridge && t.Bridge != FullBridge {
		errs = append(errs, fmt.Errorf("unknown bridge %q", t.Bridge))
	}
	if t.Rectifier != CenterTapped && t.Rectifier != FullBridgeRectifier && t.Rectifier != VoltageDoubler {
		errs = append(errs, fmt.Errorf("unknown rectifier %q", t.Rectifier))
	}
	errs = append(errs, checkAll([]bound{
		{"turns ratio", t.TurnsRatio, false}, {"Lr", t.Lr, false}, {"Cr", t.Cr, false}, {"Lm", t.Lm, true},
		{"rectifier drop", t.RectifierDrop, true}, {"rectifier resistance", t.RectifierResistance, true},
		{"bridge resistance", t.BridgeResistance, true}, {"capacitor resistance", t.CapacitorResistance, true},
		{"primary resistance", t.PrimaryResistance, true}, {"secondary resistance", t.SecondaryResistance, true},
		{"stray inductance", t.StrayInductance, true}, {"node capacitance", t.NodeCapacitance, true},
		{"winding capacitance", t.WindingCapacitance, true}, {"rectifier capacitance", t.RectifierCapacitance, true},
		{"dead time", t.DeadTime, true}, {"lowest frequency", t.FrequencyMin, false}, {"highest frequency", t.FrequencyMax, false},
	}))
	if t.FrequencyMin > t.FrequencyMax {
		errs = append(errs, fmt.Errorf("lowest frequency %g Hz is above the highest, %g Hz", t.FrequencyMin, t.FrequencyMax))
	}
	return errors.Join(errs...)
}

func (c Corner) check() error {
	err := checkAll([]bound{
		{"input voltage", c.InputVoltage, false}, {"output voltage", c.OutputVoltage, true}, {"output current", c.OutputCurrent, true},
		{"output power", c.OutputPower, true}, {"load resistance", c.LoadResistance, true}, {"frequency", c.Frequency, true},
	})
	if err != nil {
		return err
	}
	switch {
	case c.OutputVoltage > 0 && c.OutputCurrent == 0 && c.OutputPower == 0 && c.LoadResistance == 0:
		return errors.New("an output voltage needs a load: current, power or resistance")
	case c.OutputVoltage == 0 && (c.Frequency == 0 || c.LoadResistance == 0):
		return errors.New("a corner needs an output voltage with a load, or a frequency with a load resistance")
	}
	return nil
}

// curve is the output of one tank at one input voltage and load resistance as a
// function of the frequency. Each point starts from the one before.
type curve struct {
	solver
	tank  Tank
	unit  scales
	near  unknowns // state of the last point
	known bool
}

func newCurve(t Tank, input float64) *curve {
	c := &curve{tank: t}
	c.circuit, c.unit = t.normalise(input)
	return c
}

func (s *curve) setLoad(resistance float64) {
	s.load = s.tank.loadOf(resistance)
	s.known = false
}

// at returns the periodic state at a frequency.
func (s *curve) at(f float64) (solution, error) {
	s.half = 1 / (2 * f * s.unit.time)
	if t := s.tank.DeadTime; t > 0 {
		s.dead = t / s.unit.time
		// A node without capacitance would jump back and forth with the sign of
		// the current; a hundred thousandth of Cr is nothing either and swings.
		cn := math.Max(s.tank.swingCapacitance(), 1e-5*s.tank.Cr)
		s.alpha = 2 * s.tank.bridgeVoltage(1) * s.tank.Cr / cn
	}
	if s.dead >= s.half {
		return solution{}, errDeadTime
	}
	if !finite(s.half, s.alpha, s.dead, s.lambda, s.rp, s.rs, s.drop, s.load) || s.half == 0 {
		return solution{}, errNewton
	}
	guess := s.near
	if !s.known {
		guess = s.firstHarmonic().start
	}
	found, err := s.periodic(guess)
	if err == nil {
		s.near, s.known = found.y, true
	}
	return found, err
}

// volts returns the output voltage of a periodic state.
func (s *curve) volts(x solution) float64 {
	kv, _, _ := s.tank.Rectifier.constants()
	return (x.y[3] - s.drop) * s.unit.voltage / (s.tank.TurnsRatio * kv)
}

// given solves a corner with a frequency.
func (s *curve) given(o *Operation, f float64) {
	found, err := s.at(f)
	if err == nil {
		err = o.fill(s.tank, &s.solver, found, s.unit)
	}
	if err != nil {
		s.fail(o, f, err)
		return
	}
	o.Status = OK
}

func (s *curve) fail(o *Operation, f float64, err error) {
	*o = Operation{Corner: o.Corner, Status: NoSolution, LoadResistance: o.LoadResistance}
	o.Reason = fmt.Sprintf("no steady state at %s after %d half periods: %v", hertz(f), s.iterations, err)
	switch {
	case errors.Is(err, errIdle):
		o.Reason = fmt.Sprintf("no output at %s: %v", hertz(f), err)
	case errors.Is(err, errDeadTime):
		o.Reason = fmt.Sprintf("no steady state at %s: the dead time of %s is %.3g of the half period", hertz(f), quantity.Format(s.tank.DeadTime, quantity.Second), 2*f*s.tank.DeadTime)
	case errors.Is(err, errTooLong):
		o.Reason = fmt.Sprintf("no steady state at %s: %v (resonance %s, resistances %.3g and %.3g times the characteristic impedance)",
			hertz(f), err, hertz(1/(2*math.Pi*s.unit.time)), s.rp, s.rs)
	}
}

func volts(v float64) string { return quantity.Format(v, quantity.Volt) }
func hertz(f float64) string { return quantity.Format(f, quantity.Hertz) }
func ohms(r float64) string  { return quantity.Format(r, quantity.Ohm) }
