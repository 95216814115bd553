// Package insulation proposes distances between windings: creepage and clearance
// by the tables of IEC 60664-1 and IEC 62368-1 as far as they are known, each
// proposal with the assumptions it stands on. It also lists tapes, thermal
// classes and the cautions that have to be printed.
//
// A proposal is a figure to start a construction with. It certifies nothing: the
// safety standard of the end product and the engineer who answers for it decide,
// and the figures of a user take precedence. Distances are in m, voltages in V.
package insulation

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

// Grade is what the insulation between two windings has to be.
type Grade string

// The grades of insulation.
const (
	Functional Grade = "functional"
	Basic      Grade = "basic"
	Reinforced Grade = "reinforced"
)

// Mains is the supply that brings transients to the primary.
type Mains struct {
	Voltage  float64 // V rms, line to neutral
	Category string  // overvoltage category: I, II, III or IV
}

// Conditions is what the distances depend on.
type Conditions struct {
	Grade              Grade
	WorkingVoltage     float64 // V rms between the windings
	WorkingVoltagePeak float64 // V, recurring peak; 0: taken as sqrt(2) of the rms value
	Mains              *Mains  // nil: no transients from a mains supply are considered
	PollutionDegree    int     // 1, 2 or 3
	MaterialGroup      string  // I, II, IIIa or IIIb; III is the same as IIIa
	Altitude           float64 // m above sea level
}

// A Proposal is a distance with what it stands on.
type Proposal struct {
	Distance    float64  // m, for the grade
	Basic       float64  // m, the basic value before doubling or the next step; altitude included
	Assumptions []string // sentences to be printed with the distance
	Sources     []string
}

// FrequencyLimit is the frequency, in Hz, above which the creepage table does not
// hold; the larger distances of IEC 60664-4 are not in the tables.
const FrequencyLimit = 30e3

// AboveFrequencyLimit is the sentence that goes with every creepage distance of a
// switching converter.
const AboveFrequencyLimit = "creepage was looked up in the table for up to 30 kHz; IEC 60664-4 asks for more at higher frequency and is not covered here"

// Propose returns creepage and clearance for c. Creepage is never less than the
// clearance.
func Propose(c Conditions) (creepage, clearance Proposal, err error) {
	creepage, errCreepage := Creepage(c)
	clearance, errClearance := Clearance(c)
	if err := errors.Join(errCreepage, errClearance); err != nil {
		return Proposal{}, Proposal{}, err
	}
	if creepage.Distance < clearance.Distance {
		creepage.Distance = clearance.Distance
		creepage.Assumptions = append(creepage.Assumptions, "raised to the clearance, which creepage may not fall below")
	}
	return creepage, clearance, nil
}

// Creepage returns the distance along a surface that the table gives for the
// working voltage: interpolated between rows, the interpolated basic value
// rounded up to 0.1 mm, doubled for reinforced insulation in that order. Rows
// stand unrounded, so that just below a row of a few tenths of a millimetre the
// distance may be larger than at the row. It fails for a voltage beyond the table
// and for conditions that name no column.
func Creepage(c Conditions) (Proposal, error) {
	if err := c.check(); err != nil {
		return Proposal{}, err
	}
	t := embedded()
	column, group := c.column()
	first, last := t.creepage[0], t.creepage[len(t.creepage)-1]
	v := c.WorkingVoltage
	if v > last.voltage {
		return Proposal{}, fmt.Errorf("working voltage %.4g V is beyond the creepage table, which ends at %.4g V", v, last.voltage)
	}
	var p Proposal
	i := slices.IndexFunc(t.creepage, func(r creepageRow) bool { return r.voltage >= v })
	switch row := t.creepage[i]; {
	case i == 0:
		p.Basic = first.distance[column]
	case row.voltage == v:
		p.Basic = row.distance[column]
	default:
		below := t.creepage[i-1]
		p.Basic = roundUp(between(v, below.voltage, row.voltage, below.distance[column], row.distance[column]), 10)
	}
	p.Distance = p.Basic
	if c.Grade == Reinforced {
		p.Distance = 2 * p.Basic
	}
	p.Sources = []string{t.creepage[i].source}
	p.Assumptions = append(c.assumptions(),
		fmt.Sprintf("pollution degree %d, %s", c.PollutionDegree, group),
		AboveFrequencyLimit)
	if c.Grade == Reinforced {
		p.Assumptions = append(p.Assumptions, fmt.Sprintf("reinforced: twice the basic %.4g mm", 1e3*p.Basic))
	}
	return p, nil
}

// Clearance returns the distance through air: the larger of what the transients
// of the mains need and what the recurring peak above 30 kHz needs, times the
// factor for the altitude, rounded up. It fails for voltages beyond the tables.
func Clearance(c Conditions) (Proposal, error) {
	if err := c.check(); err != nil {
		return Proposal{}, err
	}
	peak := c.WorkingVoltagePeak
	assumed := ""
	if peak == 0 {
		peak = math.Sqrt2 * c.WorkingVoltage
		assumed = ", taken as sqrt(2) of the rms value"
	}
	basic, reinforced, source, err := steady(peak, c.PollutionDegree)
	if err != nil {
		return Proposal{}, err
	}
	p := Proposal{Sources: []string{source}}
	p.Assumptions = append(c.assumptions(), fmt.Sprintf("recurring peak %.4g V above 30 kHz%s", peak, assumed), fmt.Sprintf("pollution degree %d", c.PollutionDegree))
	if c.Mains == nil {
		p.Assumptions = append(p.Assumptions, "no mains supply stated: its transients are not considered")
	} else {
		withstand, transientSource, err := RequiredWithstand(*c.Mains)
		if err != nil {
			return Proposal{}, err
		}
		b, r, impulseSource, err := impulse(withstand, c.PollutionDegree)
		if err != nil {
			return Proposal{}, err
		}
		basic, reinforced = max(basic, b), max(reinforced, r)
		p.Sources = append(p.Sources, transientSource, impulseSource)
		p.Assumptions = append(p.Assumptions, fmt.Sprintf("mains %.4g V in overvoltage category %s: impulse withstand %.4g V", c.Mains.Voltage, c.Mains.Category, withstand))
	}
	factor, source, err := AltitudeFactor(c.Altitude)
	if err != nil {
		return Proposal{}, err
	}
	if factor > 1 {
		basic, reinforced = roundDistance(basic*factor), roundDistance(reinforced*factor)
		p.Sources = append(p.Sources, source)
	}
	p.Assumptions = append(p.Assumptions, fmt.Sprintf("altitude up to %.0f m: factor %.3g", max(c.Altitude, embedded().altitude[0].altitude), factor))
	p.Basic, p.Distance = basic, basic
	if c.Grade == Reinforced {
		p.Distance = reinforced
	}
	return p, nil
}

// RequiredWithstand returns the impulse voltage, in V, that insulation to a mains
// supply has to withstand.
func RequiredWithstand(m Mains) (voltage float64, source string, err error) {
	column := slices.Index([]string{"I", "II", "III", "IV"}, m.Category)
	if column < 0 {
		return 0, "", fmt.Errorf("overvoltage category %q is none of I, II, III, IV", m.Category)
	}
	rows := embedded().transient
	if !(m.Voltage > 0) || m.Voltage > rows[len(rows)-1].mains {
		return 0, "", fmt.Errorf("mains of %.4g V to neutral are beyond the table, which ends at %.4g V", m.Voltage, rows[len(rows)-1].mains)
	}
	i := slices.IndexFunc(rows, func(r transientRow) bool { return r.mains >= m.Voltage })
	return rows[i].impulse[column], rows[i].source, nil
}

// impulse returns the clearances for an impulse voltage. Reinforced insulation
// takes the next higher preferred voltage, and 160 % of any other voltage.
func impulse(voltage float64, degree int) (basic, reinforced float64, source string, err error) {
	rows := embedded().impulse
	next := 1.6 * voltage
	for i, r := range rows {
		if r.preferred && r.impulse == voltage {
			if j := slices.IndexFunc(rows[i+1:], func(r impulseRow) bool { return r.preferred }); j >= 0 {
				next = rows[i+1+j].impulse
			}
		}
	}
	at := func(v float64) (float64, string, error) {
		i := slices.IndexFunc(rows, func(r impulseRow) bool { return r.impulse >= v })
		if i < 0 {
			return 0, "", fmt.Errorf("an impulse voltage of %.4g V is beyond the clearance table, which ends at %.4g V", v, rows[len(rows)-1].impulse)
		}
		if i == 0 || rows[i].impulse == v {
			return rows[i].distance[degree-1], rows[i].source, nil
		}
		return roundDistance(between(v, rows[i-1].impulse, rows[i].impulse, rows[i-1].distance[degree-1], rows[i].distance[degree-1])), rows[i].source, nil
	}
	if basic, source, err = at(voltage); err != nil {
		return 0, 0, "", err
	}
	reinforced, _, err = at(next)
	return basic, reinforced, source, err
}

// steady returns the clearances for a recurring peak above 30 kHz.
func steady(peak float64, degree int) (basic, reinforced float64, source string, err error) {
	rows := embedded().steady
	i := slices.IndexFunc(rows, func(r steadyRow) bool { return r.peak >= peak })
	if i < 0 {
		return 0, 0, "", fmt.Errorf("a recurring peak of %.4g V is beyond the clearance table, which ends at %.4g V", peak, rows[len(rows)-1].peak)
	}
	row := rows[i]
	basic, reinforced = row.basic, row.reinforced
	if i > 0 && row.peak != peak {
		below := rows[i-1]
		basic = between(peak, below.peak, row.peak, below.basic, row.basic)
		reinforced = between(peak, below.peak, row.peak, below.reinforced, row.reinforced)
	}
	factor := [...]float64{0.8, 1, 1.4}[degree-1]
	if factor == 1 && (i == 0 || row.peak == peak) {
		return basic, reinforced, row.source, nil // rows stand as they are printed
	}
	return roundDistance(basic * factor), roundDistance(reinforced * factor), row.source, nil
}

// AltitudeFactor returns by what a clearance grows at an altitude in m; 1 up to
// 2000 m.
func AltitudeFactor(altitude float64) (factor float64, source string, err error) {
	rows := embedded().altitude
	if !(altitude >= -500) || altitude > rows[len(rows)-1].altitude {
		return 0, "", fmt.Errorf("an altitude of %.4g m is beyond the table, which ends at %.4g m", altitude, rows[len(rows)-1].altitude)
	}
	i := slices.IndexFunc(rows, func(r altitudeRow) bool { return r.altitude >= altitude })
	if i == 0 {
		return rows[0].factor, rows[0].source, nil
	}
	return between(altitude, rows[i-1].altitude, rows[i].altitude, rows[i-1].factor, rows[i].factor), rows[i].source, nil
}

func (c Conditions) check() error {
	var errs []error
	switch c.Grade {
	case Functional, Basic, Reinforced:
	default:
		errs = append(errs, fmt.Errorf("insulation grade %q is none of functional, basic, reinforced", c.Grade))
	}
	if !(c.WorkingVoltage > 0) || math.IsInf(c.WorkingVoltage, 0) {
		errs = append(errs, fmt.Errorf("working voltage %g V is not above zero", c.WorkingVoltage))
	}
	if !(c.WorkingVoltagePeak >= 0) || math.IsInf(c.WorkingVoltagePeak, 0) {
		errs = append(errs, fmt.Errorf("peak working voltage %g V is below zero", c.WorkingVoltagePeak))
	} else if c.WorkingVoltagePeak > 0 && c.WorkingVoltagePeak < c.WorkingVoltage {
		errs = append(errs, fmt.Errorf("peak working voltage %g V is below the rms value %g V", c.WorkingVoltagePeak, c.WorkingVoltage))
	}
	if c.PollutionDegree < 1 || c.PollutionDegree > 3 {
		errs = append(errs, fmt.Errorf("pollution degree %d is none of 1, 2, 3", c.PollutionDegree))
	}
	if _, ok := materialGroups[c.MaterialGroup]; !ok {
		errs = append(errs, fmt.Errorf("material group %q is none of I, II, IIIa, IIIb", c.MaterialGroup))
	}
	return errors.Join(errs...)
}

// A material group's place within a pollution degree, and its range of the
// comparative tracking index.
var materialGroups = map[string]struct {
	place int
	cti   string
}{
	"I": {0, "CTI 600 and above"}, "II": {1, "CTI 400 to 599"},
	"III": {2, "CTI 100 to 399"}, "IIIa": {2, "CTI 175 to 399"}, "IIIb": {2, "CTI 100 to 174"},
}

// column returns the column of the creepage table and its name in words.
func (c Conditions) column() (int, string) {
	g := materialGroups[c.MaterialGroup]
	words := fmt.Sprintf("material group %s (%s)", c.MaterialGroup, g.cti)
	if c.PollutionDegree == 1 {
		return 0, words + " without influence"
	}
	return 1 + 3*(c.PollutionDegree-2) + g.place, words
}

// assumptions are the sentences that both distances share.
func (c Conditions) assumptions() []string {
	list := []string{fmt.Sprintf("%s insulation, working voltage %.4g V rms as stated; it has to be measured with its switching-frequency content", c.Grade, c.WorkingVoltage)}
	if c.Grade == Functional {
		list = append(list, "functional insulation: the figures of basic insulation are proposed (common practice)")
	}
	return list
}

func between(x, x0, x1, y0, y1 float64) float64 { return y0 + (y1-y0)*(x-x0)/(x1-x0) }

// roundUp rounds a distance up to steps of 1 mm over perMillimetre. A value that
// is a whole number of steps but for binary rounding stays where it is.
func roundUp(distance, perMillimetre float64) float64 {
	steps := distance * 1e3 * perMillimetre
	return math.Ceil(steps*(1-1e-12)) / (1e3 * perMillimetre)
}

// roundDistance rounds a clearance up: to 0.01 mm up to 0.5 mm, to 0.1 mm above.
func roundDistance(distance float64) float64 {
	if distance <= 0.5e-3*(1+1e-9) {
		return roundUp(distance, 100)
	}
	return roundUp(distance, 10)
}
