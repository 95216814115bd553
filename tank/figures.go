package tank

import (
	"errors"
	"fmt"
	"math"
)

// Figures are those of the tank alone.
type Figures struct {
	ResonantFrequency       float64 // Hz, of Lr and Cr
	SecondResonance         float64 // Hz, of Lr + Lm and Cr
	InductanceRatio         float64 // Lm/Lr
	CharacteristicImpedance float64 // ohm, sqrt(Lr/Cr)
	FullLoad                string  // name of the corner of the greatest output power
	EquivalentResistance    float64 // ohm, the load of that corner as a resistance on the primary, first harmonic
	Q                       float64 // CharacteristicImpedance/EquivalentResistance

	// With the output shorted, at frequency_max and the highest input voltage.
	ShortedInput float64 // V
	ShortedPeak  float64 // A, i; 0 when no steady state was found
}

// ResonantFrequency returns that of Lr and Cr, in Hz.
func (t Tank) ResonantFrequency() float64 { return 1 / (2 * math.Pi * math.Sqrt(t.Lr*t.Cr)) }

// Describe returns the figures of a tank whose corners were solved. It panics
// without a corner. The error is that of Solve.
func Describe(t Tank, corners []Operation) (Figures, error) {
	if err := t.check(); err != nil {
		return Figures{}, err
	}
	lm := t.Magnetizing()
	f := Figures{
		ResonantFrequency:       t.ResonantFrequency(),
		SecondResonance:         1 / (2 * math.Pi * math.Sqrt((t.Lr+lm)*t.Cr)),
		InductanceRatio:         lm / t.Lr,
		CharacteristicImpedance: math.Sqrt(t.Lr / t.Cr),
	}
	power := func(o *Operation) float64 {
		v := o.OutputVoltage
		if o.Status != OK {
			v = o.Corner.OutputVoltage
		}
		return v * v / o.LoadResistance
	}
	full := &corners[0]
	for k := range corners {
		if power(&corners[k]) > power(full) {
			full = &corners[k]
		}
		f.ShortedInput = math.Max(f.ShortedInput, corners[k].Corner.InputVoltage)
	}
	f.FullLoad = full.Corner.Name
	f.EquivalentResistance = t.EquivalentResistance(full.LoadResistance)
	f.Q = f.CharacteristicImpedance / f.EquivalentResistance
	short, err := ShortCircuit(t, f.ShortedInput, t.FrequencyMax)
	if err != nil {
		return Figures{}, err
	}
	f.ShortedPeak = short.Resonant.Peak
	return f, nil
}

// EquivalentResistance returns a load at the output as the first harmonic sees
// it on the primary, in ohm: Re = 8 n²/pi² kv ki R.
func (t Tank) EquivalentResistance(load float64) float64 {
	kv, _, ki := t.Rectifier.constants()
	return 8 / (math.Pi * math.Pi) * t.TurnsRatio * t.TurnsRatio * kv * ki * load
}

// ShortCircuit returns the steady state with the output shorted behind the
// rectifier.
func ShortCircuit(t Tank, input, frequency float64) (Operation, error) {
	c := Corner{Name: "output shorted", InputVoltage: input, Frequency: frequency}
	err := errors.Join(t.check(), checkAll([]bound{{"input voltage", input, false}, {"frequency", frequency, false}}))
	if err != nil {
		return Operation{}, fmt.Errorf("output shorted: %w", err)
	}
	o := Operation{Corner: c}
	s := newCurve(t, input)
	s.setLoad(0)
	s.given(&o, frequency)
	o.Iterations = s.iterations
	return o, nil
}
