package tank

import (
	"errors"
	"math"
)

// A GainPoint is the output at one frequency.
type GainPoint struct {
	Frequency     float64 // Hz
	Output        float64 // V, of the exact steady state
	FirstHarmonic float64 // V, of the first-harmonic approximation
}

// Gain returns the output over the frequency range of the tank, from
// frequency_min to frequency_max in equal ratios, at one input voltage and load
// resistance. Frequencies without a steady state are left out. The error names
// every value that is no legal number.
func Gain(t Tank, input, load float64, points int) ([]GainPoint, error) {
	err := errors.Join(t.check(), checkAll([]bound{{"input voltage", input, false}, {"load resistance", load, false}}))
	if err != nil {
		return nil, err
	}
	if points < 2 {
		points = 2
	}
	s := newCurve(t, input)
	s.setLoad(load)
	kv, _, _ := t.Rectifier.constants()
	list := make([]GainPoint, 0, points)
	// Downward, like the search: each point starts from the one before.
	for k := points - 1; k >= 0; k-- {
		f := t.FrequencyMin * math.Pow(t.FrequencyMax/t.FrequencyMin, float64(k)/float64(points-1))
		found, err := s.at(f)
		if err != nil {
			continue
		}
		p := GainPoint{
			Frequency: f, Output: s.volts(found),
			FirstHarmonic: s.firstHarmonic().output * s.unit.voltage / (t.TurnsRatio * kv),
		}
		if finite(p.Output, p.FirstHarmonic) {
			list = append(list, p)
		}
	}
	for i, j := 0, len(list)-1; i < j; i, j = i+1, j-1 {
		list[i], list[j] = list[j], list[i]
	}
	return list, nil
}

// UnitGain returns the output voltage at which the tank has the gain 1: what a
// lossless one gives at its resonance, V.
func (t Tank) UnitGain(input float64) float64 {
	kv, _, _ := t.Rectifier.constants()
	return t.bridgeVoltage(input) / (t.TurnsRatio * kv)
}
