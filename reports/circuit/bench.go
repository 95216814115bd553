package circuit

import (
	"fmt"
	"io"
	"math"
	"strings"

	"gapwright/magnetics/design"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/tank"
)

// Subcircuit writes a part as three subcircuits, one around the other: its
// windings with their resistance over frequency, named like the part with
// "_windings" after it; the part itself, with the loss of its core; and with
// "_capacitive" after its name the part with its estimated capacitances. All
// have the start and the finish of each winding as terminals, the dot at the
// start. Only elements that every simulator of the SPICE family reads are used.
func Subcircuit(w io.Writer, e *Equivalent) error {
	var b strings.Builder
	line := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }
	name := plainName(e.Part)
	line("* gapwright: equivalent circuit of one part; .include it and call one of its subcircuits:")
	line("*   %s_windings    windings and their resistance over frequency", name)
	line("*   %s             the same with the loss of the core", name)
	line("*   %s_capacitive  the same with estimated capacitances", name)
	line("* Start and finish of a winding both need a path to ground. Assumed: a core that does not saturate, windings")
	line("* at one temperature, core loss with the square of the voltage, right at its own corner only. Below the first")
	line("* frequency the resistance comes down to that of direct current; above the last it is not known.")
	e.write(&b, nil)
	_, err := io.WriteString(w, b.String())
	return err
}

// terminals are the nodes of a part, start and finish of each winding.
func (e *Equivalent) terminals() []string {
	var list []string
	for _, n := range e.names() {
		list = append(list, n+"_s", n+"_f")
	}
	return list
}

// names are those of the windings as the simulator knows them. It tells neither
// signs nor upper from lower case, so windings that would become one, or nothing,
// are numbered.
func (e *Equivalent) names() []string {
	list := make([]string, len(e.Windings))
	taken := map[string]bool{}
	for i, w := range e.Windings {
		n := plainName(w)
		for k := i + 1; n == "" || taken[strings.ToLower(n)]; k++ {
			n = fmt.Sprintf("%sw%d", plainName(w), k)
		}
		list[i] = n
		taken[strings.ToLower(n)] = true
	}
	return list
}

// plainName keeps what every simulator allows in a name.
func plainName(s string) string {
	return strings.Map(func(r rune) rune {
		if r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' {
			return r
		}
		return -1
	}, s)
}

// write writes the subcircuits; start holds the currents at time 0 or is nil.
func (e *Equivalent) write(b *strings.Builder, start []float64) {
	line := func(format string, args ...any) { fmt.Fprintf(b, format+"\n", args...) }
	name := plainName(e.Part)
	ports := strings.Join(e.terminals(), " ")
	line("* %s, core %s", e.Part, oneLine(e.Core))
	line("* windings at %.0f degC, resistance fitted from %.6g Hz to %d times that:", e.Temperature, e.Frequency, design.NetworkOrders)
	for _, c := range e.Cases {
		line("*   %s: %.6g H and %.6g ohm at %.6g Hz; resistance within %.2g %%", oneLine(c.Name), c.Inductance, c.Resistance[0], e.Frequency, math.Max(100*c.Error(design.NetworkOrders), 0.01))
	}
	if x := e.Error(); x > Aim {
		line("* CAUTION: the aim of %.0f %% is missed; losses at single harmonics may be off by %.2g %%", 100*Aim, 100*x)
	}
	// A winding's own nodes and elements have one underscore at most, those of the
	// ladders two, so that no name of a winding makes one of the others.
	names := e.names()
	for i, w := range e.Windings {
		line("* %s_s start and %s_f finish of winding %s, %d turns", names[i], names[i], oneLine(w), e.Turns[i])
	}
	line(".subckt %s_windings %s", name, ports)
	for i, n := range names {
		line("R%s %s_s %s_1 %.9g", n, n, n, e.DC[i])
		line("V%s %s_1 %s_2 0", n, n, n)
		node := n + "_2"
		for k, m := range e.Modes {
			if m.Weight[i] == 0 {
				continue
			}
			next := fmt.Sprintf("%s_%d", n, k+3)
			line("E%s_%d %s %s y%d 0 %.12g", n, k+1, node, next, k+1, m.Weight[i])
			node = next
		}
		initial := ""
		if start != nil {
			initial = fmt.Sprintf(" IC=%.12g", start[i])
		}
		line("L%s %s %s_f %.12g%s", n, node, n, e.Coils[i][i], initial)
	}
	for i, n := range names {
		for j := range i {
			k := e.Coils[i][j] / math.Sqrt(e.Coils[i][i]*e.Coils[j][j])
			line("K%s_%s L%s L%s %.15g", names[j], n, names[j], n, k)
		}
	}
	for k, m := range e.Modes {
		line("* eddy currents: %s", m.Name)
		for i, n := range names {
			if m.Weight[i] == 0 {
				continue
			}
			line("F%s_%d 0 y%d V%s %.12g", n, k+1, k+1, n, m.Weight[i])
		}
		node := fmt.Sprintf("y%d", k+1)
		for j, s := range m.Ladder {
			next := fmt.Sprintf("y_%d_%d", k+1, j+1)
			if j == len(m.Ladder)-1 {
				next = "0"
			}
			line("Ry_%d_%d %s %s %.9g", k+1, j+1, node, next, s.R)
			line("Ly_%d_%d %s %s %.9g", k+1, j+1, node, next, s.L)
			node = next
		}
	}
	line(".ends")
	line(".subckt %s %s", name, ports)
	line("Xw %s %s_windings", ports, name)
	last := names[len(names)-1]
	if !math.IsInf(e.CoreResistance, 1) {
		line("* core: %.4g W at corner %s", e.CoreLoss, oneLine(e.CoreCorner))
		line("Rcore %s_s %s_f %.6g", last, last, e.CoreResistance)
	}
	line(".ends")
	line("* the part with its capacitances, estimated, +-%.0f %%", 100*part.CapacitanceBand)
	line(".subckt %s_capacitive %s", name, ports)
	line("Xp %s %s", ports, name)
	first := names[0]
	if e.SelfCapacitance > 0 {
		line("Cself %s_s %s_f %.4g", first, first, e.SelfCapacitance)
	}
	if e.InterwindingCapacity > 0 && len(e.Windings) > 1 {
		line("* half at either end")
		line("Cstart %s_s %s_s %.4g", first, names[1], e.InterwindingCapacity/2)
		line("Cfinish %s_f %s_f %.4g", first, last, e.InterwindingCapacity/2)
	}
	line(".ends")
}

// Periods of a bench run, of those measured, points in each, and the output
// capacitor in periods of the load: large enough for a ripple without effect,
// small enough to settle in the run.
const (
	benchBuffer   = 300
	BenchPeriods  = 80
	benchMeasured = 4
	benchPoints   = 2000
)

// Bench writes the converter at a corner with the parts in it, complete with
// their subcircuits. It starts from the exact state of the tank as built at a
// quarter of the period; the parts settle from there. Capacitances are where the
// exact solution has them, at the bridge node. It measures what BenchExpected
// returns. o must be the operation of the corner and OK; Bench
// panics when it is not.
func Bench(w io.Writer, d *design.Design, o tank.Operation, parts []*Equivalent) error {
	if o.Status != tank.OK {
		panic("circuit: the corner " + o.Corner.Name + " was not solved")
	}
	t := d.TankAt(o.Corner.Name)
	var b strings.Builder
	line := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }
	period := 1 / o.Frequency
	quarter := period / 4

	line("* gapwright: converter at corner %s, %s, %s rectifier, parts as designed", oneLine(o.Corner.Name), t.Bridge, t.Rectifier)
	line("* run: ngspice -b FILE, or pipe it into ngspice -b; time 0 is a quarter of the period after the middle of the rising bridge edge")
	line("* the capacitances of windings and rectifiers load the bridge node one to one, as in the exact solution; in")
	line("* their places (subcircuits %s_capacitive) they also delay each turn of the winding's voltage, which", plainName(job.Transformer))
	line("* near resonance can move the currents by some per cent")
	line("* assumed: diodes with a fixed drop, switches with a fixed resistance, no snubbers, no ripple at the output to")
	line("* speak of (capacitor of %d periods times the load), windings and cores as the subcircuits say", benchBuffer)
	line("* caution: a simulation of this shows currents and voltages; it says nothing of insulation, saturation or heat")
	for _, e := range parts {
		if first, second := e.halves(); math.Abs(first/second-1) > likeHalves {
			line("* the halves of the center tap differ: %.4g H and %.4g H in short circuit. The exact solution has two alike;", first, second)
			line("* here one carries more. The root of the mean of the squares of srms and s2rms is to be compared.")
		}
	}
	for _, e := range BenchExpected(t, o) {
		line("* expected %-4s = %.6e  %s", e.Name, e.Value, e.Meaning)
	}
	resonant := o.ResonantCurrent.At(quarter)
	for _, e := range parts {
		start := []float64{resonant}
		if e.Part == job.Transformer {
			for k, s := range o.SecondaryCurrents {
				// Out of the dot of the first, into that of the second.
				start = append(start, []float64{-1, 1}[k]*s.At(quarter))
			}
		}
		if len(start) != len(e.Windings) {
			return fmt.Errorf("%s has %d windings, the %s rectifier needs %d", e.Part, len(e.Windings), t.Rectifier, len(start))
		}
		e.write(&b, start)
	}

	bridge(line, t, o, quarter)
	dc := 0.0
	if t.Bridge == tank.HalfBridge {
		dc = o.Corner.InputVoltage / 2
	}
	line("Vpri b b1 0")
	node := "b1"
	var windings []string
	for _, e := range parts {
		if e.Part == job.Inductor {
			line("Xinductor b1 c inductor")
			node = "c"
		} else {
			windings = e.Windings
		}
	}
	line("Cr %s d %.12g IC=%.12g", node, t.Cr, o.CapacitorVoltage.At(quarter)+dc)
	line("Ecr vcr 0 %s d 1", node)
	line("Rcr vcr 0 1e9")
	line("Rpri d p %.12g", resistance(t.CapacitorResistance))
	ends := make([]string, 2*len(windings))
	ends[0], ends[1] = "p", ground(t)
	rectifier(line, t, o, benchBuffer*period, func(k int, plus, minus string, sign float64) {
		ends[2*k], ends[2*k+1] = plus, minus
		if sign < 0 {
			ends[2*k], ends[2*k+1] = minus, plus
		}
		line("Vs%d %s w%d 0", k, plus, k)
		if t.StrayInductance > 0 {
			line("Lstray%d w%d x%d %.9g IC=%.12g", k, k, k, t.StrayInductance, o.SecondaryCurrents[k-1].At(quarter))
		} else {
			line("Rs%d w%d x%d %g", k, k, k, leastResistance)
		}
	})
	line("Xtransformer %s transformer", strings.Join(ends, " "))
	run(line, period, BenchPeriods, benchMeasured, benchPoints)
	if t.Rectifier == tank.CenterTapped {
		line(".meas tran s2rms rms i(Vs2) %s", measureSpan(period, BenchPeriods, benchMeasured))
	}
	line(".end")
	_, err := io.WriteString(w, b.String())
	return err
}

// BenchExpected returns what the exact solution of the tank as built says about
// the figures that a bench measures.
func BenchExpected(t tank.Tank, o tank.Operation) []Expectation {
	var list []Expectation
	for _, e := range Expected(t, o) {
		if e.Name != "mrms" && e.Name != "mpk" { // a magnetizing branch of its own is not there
			list = append(list, e)
		}
	}
	if len(o.Windings) > 1 {
		list = append(list, Expectation{"s2rms", "A, rms of the second secondary winding", o.Windings[1].RMS})
	}
	return list
}

// likeHalves is the relative difference of their short-circuit inductances up to
// which two halves are alike: what the elements are promised within.
const likeHalves = 1e-3

// halves returns the short-circuit inductances of the halves of a center tap;
// 1, 1 of a part without.
func (e *Equivalent) halves() (first, second float64) {
	if len(e.Windings) != 3 {
		return 1, 1
	}
	short := func(s int) float64 { return e.L[0][0] - e.L[0][s]*e.L[s][0]/e.L[s][s] }
	return short(1), short(2)
}
