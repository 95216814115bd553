package part

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
)

// InspectionSettings is what the electrical tests of a part follow from besides
// its construction and its rating. Relative figures are plain ratios; a pair
// holds the distance down and up, both positive.
type InspectionSettings struct {
	OpenTolerance  [2]float64 // of the open inductance (of an inductor: of its inductance)
	ShortTolerance [2]float64 // of the short-circuit inductance, for the arrangement built
	ResistanceUp   float64    // of a winding over its nominal resistance
	HalfToHalf     float64    // of the resistances of the two halves against each other
	SampleToSample float64    // of the resistances of one winding, from the median of the samples
	HalfMismatch   float64    // of the short-circuit inductances of the halves, over their mean
	CapacitanceUp  float64    // of the estimated primary-secondary capacitance; 0: no limit

	Frequency   float64 // Hz, of the meter
	Level       float64 // V rms
	Temperature float64 // °C
	Samples     int
	BeforeGlue  bool

	CoreCountsAs   string  // primary, secondary or floating: where the core belongs in the insulation tests
	GlueLine       float64 // m, per pair of mating faces, when the faces are glued
	PeakCurrent    float64 // A, at which an inductor is measured for saturation; 0: no such row
	WindingLimit   float64 // °C, hot spot; 0: not stated
	AmbientInUse   float64 // °C
	ResonantSide   bool    // the short-circuit inductance makes the resonant inductance: 100 % test
	ShortCurrent   float64 // A rms, of the short-circuit test; 0: 20 to 100 mA is printed
	ResistanceTemp float64 // °C, at which resistances are stated; 0: 20
}

// CheckKind tells how the result of a test is written.
type CheckKind string

// The kinds of test.
const (
	Measured  CheckKind = "measured"  // a number per sample
	Attribute CheckKind = "attribute" // OK or NOK per sample
	Computed  CheckKind = "computed"  // follows from other rows of the same sample
)

// ComputeRule tells how a computed test follows from the rows it names.
type ComputeRule string

// The rules of computed tests. a and b are the rows of From, K is Factor.
const (
	GeometricMean ComputeRule = "sqrt(a b)"
	OverMean      ComputeRule = "2 |a - b|/(a + b)"
	Quotient      ComputeRule = "a/b"
	FactorApart   ComputeRule = "|K a/b - 1|"
	FromMedian    ComputeRule = "|a/median(a) - 1|" // over the samples
)

// A Check is one row of the inspection table. Nominal, Min and Max are SI
// (ratios plain) and already rounded to the digits that are printed, the
// limits inward.
type Check struct {
	ID         string // E04, E09.S-A, ...; stable
	Name       string
	Winding    string // of a resistance; empty otherwise
	Terminals  string // measured between
	Others     string // open or shorted
	Conditions string
	Unit       string  // as printed: uH, mohm, pF, kHz, %, mm, Mohm, or empty for a ratio
	Scale      float64 // one Unit in SI
	Kind       CheckKind
	Rule       ComputeRule
	From       []string
	Factor     float64
	Nominal    *float64 // nil: none
	Min        *float64
	Max        *float64
	Often      string // 100 %, sample, one
	Needed     bool   // the tank cannot be rebuilt without it
	AtAmbient  bool   // a resistance that is corrected from the ambient temperature to 20 °C
}

// TestDigits is the number of significant digits of nominal values and limits.
const TestDigits = 4

// TestFrequency returns the frequency in Hz at which inductances are measured:
// the wanted one, or a tenth of the self-resonance of an inductance of l (H)
// with the capacitance c (F), rounded down to two digits, when that is less. A
// reading at a tenth of the self-resonance is 1.0 % high. lowered tells which.
// With c = 0 the self-resonance is not known and the wanted one is returned.
func TestFrequency(wanted, l, c float64) (f float64, lowered bool) {
	r := SelfResonance(l, c)
	if r == 0 || r/10 >= wanted {
		return wanted, false
	}
	return inward(r/10, 2, true), true
}

// SelfResonance returns the frequency in Hz at which l (H) and c (F) resonate,
// 0 when one of them is not known.
func SelfResonance(l, c float64) float64 {
	if l <= 0 || c <= 0 {
		return 0
	}
	return 1 / (2 * math.Pi * math.Sqrt(l*c))
}

// TerminalText writes the terminals of one end in a few characters: "1",
// "16+15", "lead S-A start". An end without terminals reads "by shop".
func TerminalText(terminals []string) string {
	if len(terminals) == 0 {
		return "by shop"
	}
	out := make([]string, len(terminals))
	for i, t := range terminals {
		out[i] = strings.TrimPrefix(t, "pin ")
	}
	return strings.Join(out, "+")
}

// between writes both ends of a winding: "1 - 4"; without pins its name.
func between(w Winding) string {
	if len(w.Start) == 0 || len(w.Finish) == 0 {
		return w.Name + " start - " + w.Name + " finish"
	}
	return TerminalText(w.Start) + " - " + TerminalText(w.Finish)
}

// tied writes all ends of windings connected together.
func tied(windings []Winding) string {
	var all []string
	for _, w := range windings {
		ends := slices.Concat(w.Start, w.Finish)
		if len(ends) == 0 {
			ends = []string{w.Name}
		}
		for _, e := range ends {
			e = strings.TrimPrefix(e, "pin ")
			if !slices.Contains(all, e) {
				all = append(all, e)
			}
		}
	}
	return strings.Join(all, "+") + " tied"
}

// Inspection returns the electrical tests of the transformer in the order of
// the sheet. Nominal values come from the rating; the requirements of the
// construction, where the user has stated them, replace them.
//
// The ratio is tested twice, because with leakage the open-circuit ratio reads
// n/k with the primary driven and n k with the secondary driven: one direction
// alone is off by more than one lost turn. The limits are on their geometric
// mean, where the leakage drops out: 0.4 turns of the larger winding, narrower
// than one turn.
func (t Transformer) Inspection(r Rating, s InspectionSettings) []Check {
	if len(t.Windings) == 0 {
		return nil
	}
	p, secondaries := t.Windings[0], t.Windings[1:]
	b := inspector{s: s, r: r}
	lp, openTol := r.OpenInductance, s.OpenTolerance
	if t.OpenInductance != nil {
		lp = t.OpenInductance.Value
		openTol = [2]float64{t.OpenInductance.Tolerance, t.OpenInductance.Tolerance}
	}
	b.frequency, b.lowered = TestFrequency(s.Frequency, lp, r.SelfCapacitance)

	b.attribute("E01", "Polarity", "all windings, dots", "", "same phase at all dotted pins", "100 %")
	if len(secondaries) > 0 {
		b.ratios(p, secondaries)
	}
	b.open(p, lp, openTol, t.Construction, "Lp", "all open")
	if len(secondaries) > 0 {
		sec := secondaries[0]
		note := b.meter()
		if r.SecondaryInductance < 2e-6 {
			note += "; below 2 uH many meters cannot: E02b then replaces it"
		}
		b.add(Check{
			ID: "E05", Name: "Ls, " + sec.Name, Terminals: between(sec), Others: "all open", Conditions: note,
			Unit: "uH", Kind: Measured, Nominal: b.nominal(r.SecondaryInductance), Often: "sample", Needed: true,
		})
		b.shorts(p, secondaries, t.ShortInductance)
	}
	b.resistances(t.Windings)
	if len(secondaries) > 0 {
		var limit *float64
		if s.CapacitanceUp > 0 && r.InterwindingCapacity > 0 {
			limit = ceiling(r.InterwindingCapacity * (1 + s.CapacitanceUp))
		}
		b.add(Check{
			ID: "E10", Name: "C primary-secondary", Terminals: tied([]Winding{p}) + " : " + tied(secondaries), Conditions: "10 to 100 kHz, 1 V; nominal is an estimate",
			Unit: "pF", Kind: Measured, Nominal: b.nominal(r.InterwindingCapacity), Max: limit, Often: "sample",
		})
	}
	b.resonance(p, "all open")
	core := coreText(s.CoreCountsAs)
	if len(secondaries) > 0 {
		b.hipot("E12", "Hipot P-S", tied([]Winding{p})+" : "+tied(secondaries), core, find(t.Tests, "primary_secondary"))
		b.hipot("E13a", "Hipot P-core", tied([]Winding{p})+" : core", "secondaries open", find(t.Tests, "primary_core"))
		b.hipot("E13b", "Hipot S-core", tied(secondaries)+" : core", "primary open", find(t.Tests, "secondary_core"))
		b.add(Check{
			ID: "E14", Name: "Insulation resistance", Terminals: tied([]Winding{p}) + " : " + tied(secondaries), Conditions: "500 V DC, 60 s",
			Unit: "Mohm", Kind: Measured, Min: floorValue(100e6), Often: "sample",
		})
	}
	b.heat()
	b.outline()
	return b.rows
}

// Inspection returns the electrical tests of the inductor in the order of the
// sheet, with the IDs that the same tests of a transformer have.
func (l Inductor) Inspection(r Rating, s InspectionSettings) []Check {
	if len(l.Windings) == 0 {
		return nil
	}
	w := l.Windings[0]
	b := inspector{s: s, r: r}
	value, tol := r.OpenInductance, s.OpenTolerance
	if l.Inductance != nil {
		value = l.Inductance.Value
		tol = [2]float64{l.Inductance.Tolerance, l.Inductance.Tolerance}
	}
	b.frequency, b.lowered = TestFrequency(s.Frequency, value, r.SelfCapacitance)
	b.open(w, value, tol, l.Construction, "L", "no other winding")
	if s.PeakCurrent > 0 {
		b.add(Check{
			ID: "E16", Name: "L at peak current", Terminals: between(w), Others: "no other winding",
			Conditions: fmt.Sprintf("DC or pulse %s A; drop from E04 not above 10 %%; only if the shop can", number(s.PeakCurrent, 3)),
			Unit:       unitOf(value), Kind: Measured, Nominal: b.nominal(value), Min: floorValue(value * (1 - tol[0]) * 0.9), Often: "one",
		})
	}
	b.resistances(l.Windings)
	b.resonance(w, "")
	b.hipot("E13a", "Hipot winding-core", tied(l.Windings)+" : core", "", find(l.Tests, "primary_core"))
	b.add(Check{
		ID: "E14", Name: "Insulation resistance", Terminals: tied(l.Windings) + " : core", Conditions: "500 V DC, 60 s",
		Unit: "Mohm", Kind: Measured, Min: floorValue(100e6), Often: "sample",
	})
	b.heat()
	b.outline()
	return b.rows
}

// inspector collects the rows of one part.
type inspector struct {
	s         InspectionSettings
	r         Rating
	frequency float64
	lowered   bool
	rows      []Check
}

func (b *inspector) add(c Check) {
	if c.Unit == "uH" && c.Nominal != nil {
		c.Unit = unitOf(*c.Nominal)
	}
	c.Scale = scales[c.Unit]
	b.rows = append(b.rows, c)
}

// scales holds one of each printed unit in SI.
var scales = map[string]float64{
	"": 1, "uH": 1e-6, "nH": 1e-9, "mH": 1e-3, "mohm": 1e-3, "ohm": 1, "Mohm": 1e6,
	"pF": 1e-12, "kHz": 1e3, "%": 1e-2, "mm": 1e-3, "degC": 1, "A": 1, "mA": 1e-3,
}

// UnitScale returns one printed unit of a check in SI, 0 for a unit that no
// check has.
func UnitScale(unit string) float64 { return scales[unit] }

// unitOf chooses the unit of an inductance: uH, mH above 1000 uH, nH below 1 uH.
func unitOf(l float64) string {
	switch {
	case l >= 1e-3:
		return "mH"
	case l > 0 && l < 1e-6:
		return "nH"
	}
	return "uH"
}

func (b *inspector) meter() string {
	text := fmt.Sprintf("%s kHz, <= %s mV, %s degC", number(b.frequency/1e3, 3), number(b.s.Level*1e3, 3), number(b.s.Temperature, 3))
	if b.lowered {
		text += " (frequency lowered to a tenth of the estimated self-resonance)"
	}
	return text
}

func (b *inspector) nominal(x float64) *float64 {
	if x <= 0 || math.IsInf(x, 0) || math.IsNaN(x) {
		return nil
	}
	x = nearest(x, TestDigits)
	return &x
}

func (b *inspector) attribute(id, name, terminals, others, conditions, often string) {
	b.add(Check{ID: id, Name: name, Terminals: terminals, Others: others, Conditions: conditions, Unit: "", Kind: Attribute, Often: often})
}

// open adds the inductance of winding w before glue and as finished.
func (b *inspector) open(w Winding, value float64, tol [2]float64, c Construction, symbol, others string) {
	glued := c.Glue.Faces != "" && c.Glue.Faces != "none"
	before := value
	if glued && b.s.GlueLine > 0 && b.r.Gap.Sensitivity < 0 {
		// A film in both pairs of faces of the flux path is twice its
		// thickness of gap; the finished value is the one that is wanted.
		before = value / (1 + 2*b.s.GlueLine*b.r.Gap.Sensitivity)
	}
	if b.s.BeforeGlue {
		note := b.meter() + "; halves clamped, no glue"
		if glued {
			note += "; the glue line is expected to lower it to E04"
		}
		b.add(Check{
			ID: "E03", Name: symbol + " before glue", Terminals: between(w), Others: others, Conditions: note,
			Unit: "uH", Kind: Measured, Nominal: b.nominal(before), Often: "sample",
		})
	}
	note := b.meter() + "; finished part"
	if c.Impregnation.Kind != "" && c.Impregnation.Kind != "none" {
		note += ", after varnish"
	}
	b.add(Check{
		ID: "E04", Name: symbol + " final", Terminals: between(w), Others: others, Conditions: note, Unit: "uH", Kind: Measured,
		Nominal: b.nominal(value), Min: floorValue(value * (1 - tol[0])), Max: ceiling(value * (1 + tol[1])), Often: "100 %", Needed: true,
	})
}

// OpenRatios returns what the open-circuit voltage ratio of two windings reads
// with the primary driven, Lp/M, and with the secondary driven, M/Ls, from their
// inductances (H), M² = (Lp - Lsc) Ls. Their geometric mean is sqrt(Lp/Ls): the
// ratio of the turns only as far as both windings link the core alike; a winding
// farther out has a little more inductance per turn squared. Without Ls, Np/Ns
// takes the place of the mean.
func OpenRatios(lp, ls, lsc, turns float64) (primaryDriven, secondaryDriven float64) {
	k := 1.0
	if lp > 0 && lsc > 0 && lsc < lp {
		k = math.Sqrt(1 - lsc/lp)
	}
	mean := turns
	if lp > 0 && ls > 0 {
		mean = math.Sqrt(lp / ls)
	}
	return mean / k, mean * k
}

// ratios adds both directions of the turns ratio and what follows from them.
func (b *inspector) ratios(p Winding, secondaries []Winding) {
	a := secondaries[0]
	short := func(i int) float64 {
		if i < len(b.r.ShortHalves) {
			return b.r.ShortHalves[i]
		}
		return b.r.ShortInductance
	}
	n := float64(p.Turns) / float64(a.Turns)
	up, down := OpenRatios(b.r.OpenInductance, b.r.SecondaryInductance, short(0), n)
	mean := math.Sqrt(up * down)
	step := 0.4 / float64(max(p.Turns, a.Turns))
	conditions := "10 to 100 kHz, 1 V, nothing connected to the other side"
	b.add(Check{
		ID: "E02a", Name: "Ratio, " + p.Name + " driven", Terminals: between(p) + " over " + between(a), Others: "open", Conditions: conditions,
		Kind: Measured, Nominal: b.nominal(up), Often: "sample",
	})
	b.add(Check{
		ID: "E02b", Name: "Ratio, " + a.Name + " driven", Terminals: between(p) + " over " + between(a), Others: "open", Conditions: conditions + "; this is n of the tank",
		Kind: Measured, Nominal: b.nominal(down), Often: "sample", Needed: true,
	})
	b.add(Check{
		ID: "E02", Name: "Turns ratio", Terminals: "computed",
		Conditions: fmt.Sprintf("geometric mean of E02a and E02b, for %d : %d turns where they lie; limits narrower than one turn (%s %%)", p.Turns, a.Turns, number(100/float64(max(p.Turns, a.Turns)), 2)),
		Kind:       Computed, Rule: GeometricMean, From: []string{"E02a", "E02b"}, Nominal: b.nominal(mean),
		Min: floorValue(mean * (1 - step)), Max: ceiling(mean * (1 + step)), Often: "sample",
	})
	if len(secondaries) < 2 {
		return
	}
	h := secondaries[1]
	q := float64(a.Turns) / float64(h.Turns)
	other, _ := OpenRatios(b.r.OpenInductance, b.r.SecondaryInductance/(q*q), short(1), n*q)
	b.add(Check{
		ID: "E02c", Name: "Ratio, " + p.Name + " driven", Terminals: between(p) + " over " + between(h), Others: "open", Conditions: conditions,
		Kind: Measured, Nominal: b.nominal(other), Often: "sample",
	})
	step = 0.4 / float64(max(a.Turns, h.Turns))
	b.add(Check{
		ID: "E02d", Name: "Halves alike", Terminals: "computed", Conditions: "E02c over E02a; one turn of a half is " + number(100/float64(a.Turns), 3) + " %",
		Kind: Computed, Rule: Quotient, From: []string{"E02c", "E02a"}, Nominal: b.nominal(q),
		Min: floorValue(q * (1 - step)), Max: ceiling(q * (1 + step)), Often: "sample",
	})
}

// shorts adds the short-circuit inductance, of each half alone.
func (b *inspector) shorts(p Winding, secondaries []Winding, stated *Requirement) {
	often := "sample"
	if b.s.ResonantSide {
		often = "100 %"
	}
	level := "20 to 100 mA"
	if b.s.ShortCurrent > 0 {
		level = number(b.s.ShortCurrent*1e3, 3) + " mA"
	}
	n := float64(p.Turns) / float64(secondaries[0].Turns)
	conditions := fmt.Sprintf("%s kHz, %s; short soldered at the pins: 10 nH of loop read as +%s uH", number(b.frequency/1e3, 3), level, number(n*n*10e-9*1e6, 2))
	ids := []string{"E06", "E07"}
	for i, w := range secondaries {
		if i >= len(ids) {
			break
		}
		value := b.r.ShortInductance
		if i < len(b.r.ShortHalves) {
			value = b.r.ShortHalves[i]
		}
		tol := b.s.ShortTolerance
		if stated != nil {
			// The user's figure is the mean of the halves; their difference is
			// the design's own.
			if b.r.ShortInductance > 0 {
				value *= stated.Value / b.r.ShortInductance
			} else {
				value = stated.Value
			}
			tol = [2]float64{stated.Tolerance, stated.Tolerance}
		}
		others := between(w) + " SHORTED"
		for j, o := range secondaries {
			if j != i {
				others += ", " + between(o) + " OPEN"
			}
		}
		name := "Lsc"
		if len(secondaries) > 1 {
			name = "Lsc, " + w.Name + " shorted"
		}
		b.add(Check{
			ID: ids[i], Name: name, Terminals: between(p), Others: others, Conditions: conditions, Unit: "uH", Kind: Measured,
			Nominal: b.nominal(value), Min: floorValue(value * (1 - tol[0])), Max: ceiling(value * (1 + tol[1])), Often: often, Needed: true,
		})
	}
	if len(secondaries) > 1 {
		var nominal *float64
		if len(b.r.ShortHalves) > 1 && b.r.ShortInductance > 0 {
			x := nearest(math.Abs(b.r.ShortHalves[0]-b.r.ShortHalves[1])/b.r.ShortInductance, 2)
			nominal = &x
		}
		b.add(Check{
			ID: "E08", Name: "Lsc of the halves apart", Terminals: "computed", Conditions: "difference of E06 and E07 over their mean",
			Unit: "%", Kind: Computed, Rule: OverMean, From: []string{"E06", "E07"}, Nominal: nominal, Max: ceiling(b.s.HalfMismatch), Often: often,
		})
	}
}

// resistances adds the resistance of every winding, and the differences that
// betray lost strands where the absolute limit cannot.
func (b *inspector) resistances(windings []Winding) {
	temp := b.s.ResistanceTemp
	if temp == 0 {
		temp = 20
	}
	conditions := fmt.Sprintf("4-wire; stated at %s degC, verdict corrected from the ambient temperature entered", number(temp, 3))
	rated := func(name string) float64 {
		for _, w := range b.r.Windings {
			if w.Name == name {
				return w.DCResistance
			}
		}
		return 0
	}
	for _, w := range windings {
		r := rated(w.Name)
		unit := "mohm"
		if r >= 1 {
			unit = "ohm"
		}
		var limit *float64
		if r > 0 {
			limit = ceiling(r * (1 + b.s.ResistanceUp))
		}
		b.add(Check{
			ID: "E09." + w.Name, Name: "DC resistance, " + w.Name, Winding: w.Name, Terminals: between(w), Conditions: conditions,
			Unit: unit, Kind: Measured, Nominal: b.nominal(r), Max: limit, Often: "100 %", AtAmbient: true,
		})
	}
	if len(windings) == 3 {
		a, h := windings[1], windings[2]
		factor := 1.0
		if ra, rh := rated(a.Name), rated(h.Name); ra > 0 && rh > 0 {
			factor = rh / ra
		}
		b.add(Check{
			ID: "E09.halves", Name: "DC resistance, halves apart", Terminals: "computed",
			Conditions: fmt.Sprintf("%s against %s, designed difference taken out; catches lost strands", a.Name, h.Name),
			Unit:       "%", Kind: Computed, Rule: FactorApart, From: []string{"E09." + a.Name, "E09." + h.Name}, Factor: factor,
			Max: ceiling(b.s.HalfToHalf), Often: "100 %",
		})
	}
	for _, w := range windings {
		b.add(Check{
			ID: "E09." + w.Name + ".apart", Name: "DC resistance, samples apart, " + w.Name, Terminals: "computed",
			Conditions: "from the median of the samples; catches lost strands", Unit: "%", Kind: Computed, Rule: FromMedian,
			From: []string{"E09." + w.Name}, Max: ceiling(b.s.SampleToSample), Often: "100 %",
		})
	}
}

// resonance adds the self-resonance. The limit is what the test frequency asks
// for: at a fifth of the self-resonance an inductance reads 4.2 % high.
func (b *inspector) resonance(w Winding, others string) {
	b.add(Check{
		ID: "E11", Name: "Self-resonance", Terminals: between(w), Others: others, Conditions: "sweep, least current; nominal is an estimate, limit 5 times the test frequency",
		Unit: "kHz", Kind: Measured, Nominal: b.nominal(SelfResonance(b.r.OpenInductance, b.r.SelfCapacitance)), Min: floorValue(5 * b.frequency), Often: "sample",
	})
}

func (b *inspector) hipot(id, name, terminals, others string, t *Test) {
	conditions := "volts by customer"
	if t != nil && t.Voltage > 0 {
		kind := t.Kind
		if kind == "" {
			kind = "AC"
		}
		conditions = number(t.Voltage, 4) + " V " + kind
		if kind == "AC" {
			conditions += " 50/60 Hz"
		}
		if t.Time > 0 {
			conditions += ", " + number(t.Time, 3) + " s (shorter in production as agreed)"
		}
		conditions += "; trip current as agreed"
	}
	b.attribute(id, name, terminals, others, conditions, "100 %")
}

func find(tests []Test, between string) *Test {
	for i := range tests {
		if tests[i].Between == between {
			return &tests[i]
		}
	}
	return nil
}

func coreText(counts string) string {
	switch counts {
	case "primary":
		return "core to the primary side"
	case "secondary":
		return "core to the secondary side"
	}
	return "core floating"
}

// heat adds the temperature in the application.
func (b *inspector) heat() {
	worst := math.Inf(-1)
	for _, c := range b.r.Corners {
		if c.Continuous {
			worst = math.Max(worst, c.WindingTemperature)
		}
	}
	var limit *float64
	if b.s.WindingLimit > 0 {
		limit = ceiling(b.s.WindingLimit)
	}
	var nominal *float64
	if !math.IsInf(worst, 0) && !math.IsNaN(worst) {
		x := math.Round(worst)
		nominal = &x
	}
	b.add(Check{
		ID: "E15", Name: "Hot spot in the application", Terminals: "customer's test", Conditions: fmt.Sprintf("worst continuous corner, %s degC around the part", number(b.s.AmbientInUse, 3)),
		Unit: "degC", Kind: Measured, Nominal: nominal, Max: limit, Often: "one",
	})
}

// outline adds the outer dimensions.
func (b *inspector) outline() {
	names := []string{"Length", "Width", "Height"}
	for i, name := range names {
		if b.r.Outline[i] <= 0 {
			continue
		}
		x := nearest(b.r.Outline[i], 3)
		b.add(Check{
			ID: "M0" + strconv.Itoa(i+1), Name: name, Terminals: "over everything, without pins", Unit: "mm", Kind: Measured, Nominal: &x, Often: "sample",
		})
	}
	b.attribute("M04", "Pins: pitch, straight, tinned, in one plane", "", "", "former drawing", "100 %")
}

// floorValue and ceiling return limits rounded inward: a floor up, a ceiling down.
func floorValue(x float64) *float64 {
	x = inward(x, TestDigits, false)
	return &x
}

func ceiling(x float64) *float64 {
	x = inward(x, TestDigits, true)
	return &x
}

// inward rounds x to digits significant digits, down or up. A value that is
// within a billionth of a printed one is that one.
func inward(x float64, digits int, down bool) float64 {
	if x == 0 || math.IsInf(x, 0) || math.IsNaN(x) {
		return x
	}
	if n := nearest(x, digits); math.Abs(n-x) <= 1e-9*math.Abs(x) {
		return n
	}
	e := digits - 1 - int(math.Floor(math.Log10(math.Abs(x))))
	m := math.Ceil(shift(x, e))
	if down {
		m = math.Floor(shift(x, e))
	}
	return shift(m, -e)
}

// nearest rounds x to digits significant digits.
func nearest(x float64, digits int) float64 {
	v, err := strconv.ParseFloat(strconv.FormatFloat(x, 'e', digits-1, 64), 64)
	if err != nil {
		return x
	}
	return v
}

// shift returns x times 10^e without the error of a rounded power of ten.
func shift(x float64, e int) float64 {
	if e >= 0 {
		return x * math.Pow10(e)
	}
	return x / math.Pow10(-e)
}

// number writes x with at most the given significant digits, no trailing zeros
// and no exponent.
func number(x float64, digits int) string {
	return strconv.FormatFloat(nearest(x, digits), 'f', -1, 64)
}
