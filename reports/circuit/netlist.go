// Package circuit writes the tank at a corner as a plain netlist for a circuit
// simulator, so that its figures can be checked by a program that knows nothing
// of them.
//
// The netlist uses elements that every simulator of the SPICE family reads; the
// options and the .meas lines are those of ngspice. It starts from the exact
// periodic state, at a quarter of the period, so that a few periods suffice: if
// the state is right nothing moves.
package circuit

import (
	"fmt"
	"io"
	"math"
	"strings"

	"gapwright/tank"
)

// The diode is exponential with a small emission coefficient, and a source in
// series brings its drop to the given one at the output current. It then moves
// by 1.2 mV per decade of current.
const (
	saturation = 1e-12    // A
	emission   = 0.02     // coefficient
	thermal    = 0.025865 // V, k T/q at 27 °C
)

// bodyDiode is the drop of the diodes across the switches, which clamp the node
// beyond the rails; common practice 0.5..0.7 V. The exact solution leaves it out.
const bodyDiode = 0.7 // V

// leastResistance stands for a resistance of zero, which stops the simulator.
const leastResistance = 1e-6 // ohm

// pointsPerPeriod is the resolution of the run.
const pointsPerPeriod = 8000

// Netlist writes the circuit of a corner that was solved, and a run of the given
// number of periods. Over the last of them it measures what Expected returns.
// The operation must be OK; Netlist panics when it is not.
func Netlist(w io.Writer, t tank.Tank, o tank.Operation, periods int) error {
	if o.Status != tank.OK {
		panic("circuit: the corner " + o.Corner.Name + " was not solved")
	}
	var b strings.Builder
	line := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }
	period := 1 / o.Frequency
	quarter := period / 4

	line("* gapwright: corner %s, %s, %s rectifier", oneLine(o.Corner.Name), t.Bridge, t.Rectifier)
	line("* the tank as it is wanted, without parts; run: ngspice -b FILE, or pipe it into ngspice -b")
	line("* time 0 is a quarter of the period after the middle of the rising bridge edge")
	for _, e := range Expected(t, o) {
		line("* expected %-4s = %.6e  %s", e.Name, e.Value, e.Meaning)
	}
	bridge(line, t, o, quarter)

	dc := 0.0
	if t.Bridge == tank.HalfBridge {
		dc = o.Corner.InputVoltage / 2
	}
	line("Vpri b b1 0")
	line("Lr b1 c %.12g IC=%.12g", t.Lr, o.ResonantCurrent.At(quarter))
	line("Cr c d %.12g IC=%.12g", t.Cr, o.CapacitorVoltage.At(quarter)+dc)
	line("Ecr vcr 0 c d 1") // shows the capacitor's voltage to .meas
	line("Rcr vcr 0 1e9")
	line("Rpri d p %.12g", resistance(t.PrimaryResistance+t.CapacitorResistance))
	line("Vm p pm 0")
	line("Lm pm %s %.12g IC=%.12g", ground(t), t.Magnetizing(), o.MagnetizingCurrent.At(quarter))
	n, back := 1/t.TurnsRatio, ground(t)
	rectifier(line, t, o, 1000*period, func(k int, plus, minus string, sign float64) {
		line("E%d %s %s p %s %.12g", k, plus, minus, back, sign*n)
		line("Vs%d %s w%d 0", k, plus, k)
		line("F%d p %s Vs%d %.12g", k, back, k, sign*n)
		line("Rs%d w%d x%d %.12g", k, k, k, resistance(t.SecondaryResistance))
	})

	run(line, period, periods, 1, pointsPerPeriod)
	span := measureSpan(period, periods, 1)
	line(".meas tran mrms rms i(Vm) %s", span)
	line(".meas tran mpk max i(Vm) %s", span)
	line(".end")
	_, err := io.WriteString(w, b.String())
	return err
}

// run writes the models, the options, the run and what it measures over its last
// periods.
func run(line func(string, ...any), period float64, periods, last, points int) {
	line(".model DX D(IS=%g N=%g)", saturation, emission)
	// rshunt ties floating nodes to ground and keeps the step from collapsing
	// when diodes let go.
	line(".options method=gear reltol=1e-4 abstol=1e-6 vntol=1e-4 trtol=7 gmin=1e-12 rshunt=1e9 itl4=200 temp=27 tnom=27")
	step := period / float64(points)
	line(".tran %.12g %.12g %.12g %.12g uic", step, float64(periods)*period, float64(periods-last)*period, step)
	span := measureSpan(period, periods, last)
	line(".meas tran irms rms i(Vpri) %s", span)
	line(".meas tran ipk max i(Vpri) %s", span)
	line(".meas tran srms rms i(Vs1) %s", span)
	line(".meas tran smax max i(Vs1) %s", span)
	line(".meas tran iout avg i(Vo) %s", span)
	line(".meas tran vout avg v(out) %s", span)
	line(".meas tran vcrp max v(vcr) %s", span)
}

func measureSpan(period float64, periods, last int) string {
	return fmt.Sprintf("from=%.12g to=%.12g", float64(periods-last)*period, float64(periods)*period)
}

// bridge writes what drives node b: a source with short edges, or with a dead
// time the switches, their diodes and the node capacitance.
func bridge(line func(string, ...any), t tank.Tank, o tank.Operation, quarter float64) {
	vin, period := o.Corner.InputVoltage, 4*quarter
	if o.SoftSwitching == nil {
		low, edge := 0.0, period/5000
		if t.Bridge == tank.FullBridge {
			low = -vin
		}
		line("Vbr a 0 PULSE(%.12g %.12g %.12g %.12g %.12g %.12g %.12g)", vin, low, quarter-edge/2, edge, edge, period/2-edge, period)
		line("Rbr a b %.12g", resistance(t.BridgeResistance))
		return
	}
	s := o.SoftSwitching
	switches := 1.0
	if t.Bridge == tank.FullBridge {
		switches = 2
	}
	// Each switch turns off EdgeMiddle before its edge, the other one turns on a
	// dead time later. The gate ramps are 1 ns and switch at their middle.
	const ramp = 1e-9
	off := quarter - s.EdgeMiddle
	on := period/2 - t.DeadTime - ramp
	line("Vin vin 0 %.12g", vin)
	line("Vgl gl 0 PULSE(0 1 %.12g %g %g %.12g %.12g)", off+t.DeadTime-ramp/2, ramp, ramp, on, period)
	// The high gate is on at time 0: its pulse is the off time.
	line("Vgh gh 0 PULSE(1 0 %.12g %g %g %.12g %.12g)", off-ramp/2, ramp, ramp, period/2+t.DeadTime-ramp, period)
	line(".model SW SW(Ron=%.12g Roff=1e8 Vt=0.5 Vh=0)", math.Max(resistance(t.BridgeResistance)/switches, 1e-4))
	leg := func(node, high, low string, at float64) {
		line("Sh%s vin %s %s 0 SW", node, node, high)
		line("Sl%s %s 0 %s 0 SW", node, node, low)
		line("Dh%s %s h%s DX", node, node, node)
		line("Vh%s h%s vin %g", node, node, bodyDiode)
		line("Dl%s l%s %s DX", node, node, node)
		line("Vl%s 0 l%s %g", node, node, bodyDiode)
		line("Cn%s %s 0 %.12g IC=%.12g", node, node, math.Max(s.Capacitance, 1e-14), at)
	}
	leg("a", "gh", "gl", vin)
	if t.Bridge == tank.FullBridge {
		leg("e", "gl", "gh", 0)
	}
	line("Rbr a b 1e-6")
}

// ground is the node that the primary returns to.
func ground(t tank.Tank) string {
	if t.Bridge == tank.FullBridge && t.DeadTime > 0 {
		return "e"
	}
	return "0"
}

// rectifier writes the secondary side. secondary writes winding k between two
// nodes, its dot at the first when sign is above zero, with everything in series
// with it, up to node xk. buffer is the time constant of output capacitor and
// load, s.
func rectifier(line func(string, ...any), t tank.Tank, o tank.Operation, buffer float64, secondary func(k int, plus, minus string, sign float64)) {
	drop := t.RectifierDrop - emission*thermal*math.Log(o.OutputCurrent/saturation+1)
	diode := func(k int, from, to string) {
		line("D%d %s y%d DX", k, from, k)
		line("Vd%d y%d z%d %.12g", k, k, k, drop)
		line("Rd%d z%d %s %.12g", k, k, to, resistance(t.RectifierResistance))
	}
	load := o.LoadResistance
	c := buffer / load
	switch t.Rectifier {
	case tank.CenterTapped:
		secondary(1, "s1", "0", 1)
		secondary(2, "s2", "0", -1)
		diode(1, "x1", "out")
		diode(2, "x2", "out")
	case tank.FullBridgeRectifier:
		secondary(1, "s1", "s2", 1)
		diode(1, "x1", "out")
		diode(2, "0", "x1")
		diode(3, "s2", "out")
		diode(4, "0", "s2")
	case tank.VoltageDoubler:
		secondary(1, "s1", "mid", 1)
		diode(1, "x1", "out")
		diode(2, "0", "x1")
		// Each capacitor carries the half current of the doubler, whose ripple
		// acts on the tank at once; they start a quarter period into it.
		line("Co1 out mid %.12g IC=%.12g", 2*c, o.OutputVoltage/2)
		line("Co2 mid 0 %.12g IC=%.12g", 2*c, o.OutputVoltage/2)
		line("Vo out o2 0")
		line("RL o2 0 %.12g", load)
		return
	}
	line("Co out 0 %.12g IC=%.12g", c, o.OutputVoltage)
	line("Vo out o2 0")
	line("RL o2 0 %.12g", load)
}

// An Expectation is a figure that the run measures under the same name.
type Expectation struct {
	Name, Meaning string
	Value         float64
}

// Expected returns what the exact solution says about the measured figures.
func Expected(t tank.Tank, o tank.Operation) []Expectation {
	_, vcr := o.CapacitorVoltage.Extremes()
	if t.Bridge == tank.HalfBridge {
		vcr += o.Corner.InputVoltage / 2
	}
	_, smax := o.SecondaryCurrents[0].Extremes()
	return []Expectation{
		{"irms", "A, rms of the resonant current", o.Resonant.RMS},
		{"ipk", "A, its peak", o.Resonant.Peak},
		{"mrms", "A, rms of the magnetizing current", o.Magnetizing.RMS},
		{"mpk", "A, its peak", o.Magnetizing.Peak},
		{"srms", "A, rms of the first secondary winding", o.Windings[0].RMS},
		{"smax", "A, its peak", smax},
		{"iout", "A, output current", o.OutputCurrent},
		{"vout", "V, output voltage", o.OutputVoltage},
		{"vcrp", "V, peak across the resonant capacitor", vcr},
	}
}

func resistance(r float64) float64 { return math.Max(r, leastResistance) }

// oneLine keeps a name from breaking out of its comment.
func oneLine(s string) string { return strings.Join(strings.Fields(s), " ") }
