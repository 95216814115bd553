// Package sample works with the readings of built parts: what tank they make,
// how the gap has to be corrected, and which fault in the shop explains them
// best.
//
// Readings are SI. Resistances are those at 20 °C. The halves of a center tap
// are A and B, A being the first secondary.
package sample

import (
	"sort"
	"strings"
)

// A Quantity is one kind of reading.
type Quantity string

// The readings that a sheet asks for.
const (
	OpenBefore  Quantity = "Lp before glue"
	Open        Quantity = "Lp final"
	Secondary   Quantity = "Ls of half A"
	ShortA      Quantity = "Lsc, half A shorted"
	ShortB      Quantity = "Lsc, half B shorted"
	RatioP      Quantity = "ratio, primary driven"
	RatioS      Quantity = "ratio, secondary driven"
	RatioB      Quantity = "ratio to half B, primary driven"
	Capacitance Quantity = "C primary-secondary"
	Resonance   Quantity = "self-resonance"
	// Quality is asked for only when two causes must be told apart: the ratio of
	// reactance to resistance of the open primary.
	Quality Quantity = "Q of the open primary"
)

const (
	resistancePrefix = "DC resistance of "
	reelPrefix       = "reel of "
)

// Resistance is the DC resistance of a winding.
func Resistance(winding string) Quantity { return Quantity(resistancePrefix + winding) }

// Reel is the resistance per metre of the wire on the reel of a winding.
func Reel(winding string) Quantity { return Quantity(reelPrefix + winding) }

// resistanceOf returns the winding whose resistance q is.
func resistanceOf(q Quantity) (string, bool) {
	return strings.CutPrefix(string(q), resistancePrefix)
}

func reelOf(q Quantity) (string, bool) { return strings.CutPrefix(string(q), reelPrefix) }

// FromID returns the quantity that a row of the sheet holds.
func FromID(id string) (Quantity, bool) {
	switch id {
	case "E02a":
		return RatioP, true
	case "E02b":
		return RatioS, true
	case "E02c":
		return RatioB, true
	case "E03":
		return OpenBefore, true
	case "E04":
		return Open, true
	case "E05":
		return Secondary, true
	case "E06":
		return ShortA, true
	case "E07":
		return ShortB, true
	case "E10":
		return Capacitance, true
	case "E11":
		return Resonance, true
	}
	if w, ok := strings.CutPrefix(id, "E09."); ok && w != "halves" && !strings.HasSuffix(w, ".apart") {
		return Resistance(w), true
	}
	if w, ok := strings.CutPrefix(id, "reel."); ok {
		return Reel(w), true
	}
	return "", false
}

// Readings are those of one part.
type Readings map[Quantity]float64

// quantities returns those that both hold, in a fixed order.
func (r Readings) quantities(other Readings) []Quantity {
	var out []Quantity
	for q, v := range r {
		if w, ok := other[q]; ok && v > 0 && w > 0 {
			out = append(out, q)
		}
	}
	sort.Slice(out, func(i, j int) bool { return out[i] < out[j] })
	return out
}

// Median returns the median of each quantity over the samples that have it, so
// that one odd sample does not speak for all.
func Median(samples []Readings) Readings {
	lists := map[Quantity][]float64{}
	for _, s := range samples {
		for q, v := range s {
			lists[q] = append(lists[q], v)
		}
	}
	out := Readings{}
	for q, list := range lists {
		sort.Float64s(list)
		n := len(list)
		out[q] = (list[(n-1)/2] + list[n/2]) / 2
	}
	return out
}

// Meter is how well the shop measures: standard deviations, relative.
type Meter struct {
	Inductance  float64
	Ratio       float64
	Resistance  float64
	Capacitance float64
	Frequency   float64
	ShortLoop   float64 // H, on the secondary side, what is left of a soldered short
}

// BenchMeter is a bench LCR meter with a usable fixture (common practice).
var BenchMeter = Meter{Inductance: 0.005, Ratio: 0.002, Resistance: 0.005, Capacitance: 0.02, Frequency: 0.02, ShortLoop: 5e-9}

// deviation returns the relative standard deviation of a reading.
func (m Meter) deviation(q Quantity) float64 {
	switch q {
	case RatioP, RatioS, RatioB:
		return m.Ratio
	case Capacitance:
		return m.Capacitance
	case Resonance:
		return m.Frequency
	case Quality:
		return 0.2
	}
	if _, ok := resistanceOf(q); ok {
		return m.Resistance
	}
	if _, ok := reelOf(q); ok {
		return m.Resistance
	}
	return m.Inductance
}
