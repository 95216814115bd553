package tank

import (
	"math"
	"math/cmplx"

	"gapwright/tank/waveform"
)

// Orders is the number of harmonics of an Operation.
const Orders = 40

// Status says whether a corner is served.
type Status string

// The outcomes of a corner.
const (
	OK             Status = "ok"
	BeyondPeakGain Status = "beyond-peak-gain" // the output turns down inside the range before it is reached
	BelowRange     Status = "below-range"      // would need less than frequency_min
	AboveRange     Status = "above-range"      // would need more than frequency_max
	NoSolution     Status = "no-solution"      // no steady state was found, see Reason
)

// A Warning is something true that the user should know.
type Warning struct {
	Code string // W1..
	Text string
}

// An Operation is the exact periodic steady state at a corner. Unless Status is
// OK only Corner, Status, Reason and, where they are known, the figures of the
// gain peak are set.
type Operation struct {
	Corner Corner
	Status Status
	Reason string // words when not ok, with the nearest reachable value

	Frequency      float64 // Hz
	OutputVoltage  float64 // V
	OutputCurrent  float64 // A
	LoadResistance float64 // ohm
	InputPower     float64 // W, out of the bridge
	OutputPower    float64 // W
	EnergyBalance  float64 // input less output, drops and resistances, over the input (at least a thousandth of the apparent power)

	ResonantCurrent    waveform.Wave   // A, i of Lr, out of the bridge
	MagnetizingCurrent waveform.Wave   // A, m of Lm, on the primary side
	CapacitorVoltage   waveform.Wave   // V, without the half bridge's DC
	MagnetizingVoltage waveform.Wave   // V, across Lm; jumps with the rectifier
	SecondaryCurrents  []waveform.Wave // A, each winding on its own side; see Windings

	Resonant    Quantity   // A
	Magnetizing Quantity   // A
	Windings    []Quantity // A; center tap: two, the first conducts while its dot is positive, each counted in its rectifier's direction

	IPrimaryHarmonics   []complex128   // A, orders 0..40 of i: A exp(j phase) of A sin(k w t + phase), order 0 the mean
	ISecondaryHarmonics [][]complex128 // A, likewise for each of SecondaryCurrents

	CapacitorPeak        float64 // V, with the half bridge's DC
	CapacitorPeakAC      float64 // V
	FluxLinkagePeak      float64 // V s, half the peak-to-peak of the integral of the voltage across Lm
	TurnOffCurrent       float64 // A, i when the bridge switches; above 0 it helps the swing
	RectifierOffFraction float64 // of the period, 0..1

	// Of corners whose frequency was found; zero else. The peak is that of the
	// output over frequency_min..frequency_max at this LoadResistance, the value
	// at the end of the range when no peak lies inside.
	PeakOutputVoltage   float64 // V
	FrequencyOfPeakGain float64 // Hz
	PeakGainMargin      float64 // peak over wanted output, less 1

	SoftSwitching *SoftSwitching // nil with dead time 0: not assessed
	FirstHarmonic Approximation
	Warnings      []Warning

	Iterations int     // half periods followed to get here
	Residual   float64 // of the periodic state, relative
}

// Quantity holds the usual figures of a waveform.
type Quantity struct {
	RMS, Peak, Mean float64
}

func figures(w waveform.Wave) Quantity { return Quantity{w.RMS(), w.Peak(), w.Mean()} }

// Approximation is the same corner in the first-harmonic approximation, at the
// same frequency and load resistance.
type Approximation struct {
	OutputVoltage   float64 // V
	PrimaryRMS      float64 // A
	PrimaryPeak     float64 // A
	SecondaryRMS    float64 // A, of one winding
	MagnetizingPeak float64 // A
}

// scales are the units of the normalised circuit.
type scales struct {
	time, voltage, current float64
}

// constants returns kv, kd, ki of the package comment.
func (r Rectifier) constants() (kv, kd, ki float64) {
	switch r {
	case FullBridgeRectifier:
		return 1, 2, 1
	case VoltageDoubler:
		return 0.5, 1, 0.5
	}
	return 1, 1, 1
}

// seriesRatio stands for a magnetizing inductance that was not given: so many
// times Lr.
const seriesRatio = 10000

// Magnetizing returns Lm, or what stands for it in a series-LC tank.
func (t Tank) Magnetizing() float64 {
	if t.Lm > 0 {
		return t.Lm
	}
	return seriesRatio * t.Lr
}

// bridgeVoltage returns Vb.
func (t Tank) bridgeVoltage(input float64) float64 {
	if t.Bridge == HalfBridge {
		return input / 2
	}
	return input
}

// normalise returns the circuit at a corner. The load is set by its caller.
func (t Tank) normalise(input float64) (circuit, scales) {
	z := math.Sqrt(t.Lr / t.Cr)
	vb := t.bridgeVoltage(input)
	_, kd, _ := t.Rectifier.constants()
	n := t.TurnsRatio
	return circuit{
		lambda: t.Lr / t.Magnetizing(),
		rp:     (t.BridgeResistance + t.CapacitorResistance + t.PrimaryResistance) / z,
		rs:     n * n * (t.SecondaryResistance + kd*t.RectifierResistance) / z,
		drop:   n * kd * t.RectifierDrop / vb,
	}, scales{math.Sqrt(t.Lr * t.Cr), vb, vb / z}
}

// loadOf returns the normalised load of a resistance at the output.
func (t Tank) loadOf(resistance float64) float64 {
	kv, _, ki := t.Rectifier.constants()
	return kv * ki * t.TurnsRatio * t.TurnsRatio * resistance / math.Sqrt(t.Lr/t.Cr)
}

// fill computes everything of an Operation that follows from a periodic state.
func (o *Operation) fill(t Tank, s *solver, found solution, unit scales) error {
	end, err := s.follow(&found.y, nil, true)
	if err != nil {
		return err
	}
	if end[3] == 0 {
		return errIdle
	}
	_, _, ki := t.Rectifier.constants()
	n := t.TurnsRatio
	period := 2 * s.half * unit.time
	o.Frequency = 1 / period
	o.OutputCurrent = ki * n * unit.current * end[3] / s.half
	o.OutputVoltage = o.OutputCurrent * o.LoadResistance
	o.OutputPower = o.OutputVoltage * o.OutputCurrent
	o.Residual = found.residual

	// The bridge terminals give the energy; it is counted before the steps are
	// put in the order of the period.
	input, offTime := 0.0, 0.0
	for k := range s.record {
		r := &s.record[k]
		input += r.h * meanProduct(&r.u, &r.i) / s.half
		if r.mode == off {
			offTime += r.h / s.half
		}
	}
	origin := s.center(found.y[3])
	winding := o.setWaves(t, s, found.y[3], unit)
	o.Resonant, o.Magnetizing = figures(o.ResonantCurrent), figures(o.MagnetizingCurrent)
	o.IPrimaryHarmonics = o.ResonantCurrent.Harmonics(Orders)
	o.setWindings(t, s, winding)
	o.CapacitorPeakAC = o.CapacitorVoltage.Peak()
	o.CapacitorPeak = o.CapacitorPeakAC
	if t.Bridge == HalfBridge {
		o.CapacitorPeak += o.Corner.InputVoltage / 2
	}
	o.FluxLinkagePeak = t.Magnetizing() * o.Magnetizing.Peak
	o.TurnOffCurrent = unit.current * end[0]
	o.RectifierOffFraction = offTime

	heat := s.rp*square(o.Resonant.RMS/unit.current) + s.rs*square(winding.RMS()/(n*unit.current))
	output := found.y[3] * end[3] / s.half
	power := unit.voltage * unit.current
	o.InputPower = input * power
	// Where next to no power flows the balance is one of the apparent power.
	apparent := o.Resonant.RMS / unit.current
	if size := max(math.Abs(input), output+heat, 1e-3*apparent); size > 0 {
		o.EnergyBalance = (input - output - heat) / size
	}

	o.softSwitching(t, s, unit, origin)
	o.approximate(t, s, unit)
	if !o.finite() {
		return errNewton
	}
	return nil
}

// setWaves turns the recorded steps into the waveforms and returns the current
// of the secondary side as if it were one winding.
func (o *Operation) setWaves(t Tank, s *solver, e float64, unit scales) waveform.Wave {
	wave := func() waveform.Wave {
		return waveform.Wave{Period: 2 * s.half * unit.time, Alternating: true, Pieces: make([]waveform.Piece, len(s.record))}
	}
	i, m, v, vp, sec := wave(), wave(), wave(), wave(), wave()
	for k := range s.record {
		r := &s.record[k]
		for _, w := range [...]*waveform.Wave{&i, &m, &v, &vp, &sec} {
			w.Pieces[k].Start, w.Pieces[k].Duration = r.start*unit.time, r.h*unit.time
		}
		for j := range degree + 1 {
			i.Pieces[k].C[j] = unit.current * r.i[j]
			m.Pieces[k].C[j] = unit.current * r.m[j]
			v.Pieces[k].C[j] = unit.voltage * r.v[j]
			if r.mode == off {
				vp.Pieces[k].C[j] = unit.voltage * (r.u[j] - r.v[j] - s.rp*r.i[j]) / (1 + s.lambda)
			} else {
				d := r.i[j] - r.m[j]
				vp.Pieces[k].C[j] = unit.voltage * s.rs * d
				sec.Pieces[k].C[j] = t.TurnsRatio * unit.current * d
			}
		}
		if r.mode != off {
			vp.Pieces[k].C[0] += unit.voltage * float64(r.mode) * e
		}
	}
	o.ResonantCurrent, o.MagnetizingCurrent, o.CapacitorVoltage, o.MagnetizingVoltage = i, m, v, vp
	return sec
}

// setWindings gives the secondary current to the windings. In a center tap each
// conducts in its own mode, and in the second half of the period they change
// their parts.
func (o *Operation) setWindings(t Tank, s *solver, sec waveform.Wave) {
	if t.Rectifier != CenterTapped {
		o.SecondaryCurrents = []waveform.Wave{sec}
		o.Windings = []Quantity{figures(sec)}
		o.ISecondaryHarmonics = [][]complex128{sec.Harmonics(Orders)}
		return
	}
	n := len(sec.Pieces)
	a := waveform.Wave{Period: sec.Period, Pieces: make([]waveform.Piece, 2*n)}
	b := waveform.Wave{Period: sec.Period, Pieces: make([]waveform.Piece, 2*n)}
	for k, p := range sec.Pieces {
		none := waveform.Piece{Start: p.Start, Duration: p.Duration}
		first, second := none, none
		switch s.record[k].mode {
		case forward:
			first = p
		case backward:
			for j := range p.C {
				p.C[j] = -p.C[j]
			}
			second = p
		}
		a.Pieces[k], b.Pieces[k] = first, second
		first.Start += sec.Period / 2
		second.Start += sec.Period / 2
		a.Pieces[n+k], b.Pieces[n+k] = second, first
	}
	h := a.Harmonics(Orders)
	late := make([]complex128, len(h)) // the same half a period later
	for k := range h {
		late[k] = h[k]
		if k%2 == 1 {
			late[k] = -h[k]
		}
	}
	one := figures(a)
	o.SecondaryCurrents = []waveform.Wave{a, b}
	o.Windings = []Quantity{one, one}
	o.ISecondaryHarmonics = [][]complex128{h, late}
}

func (o *Operation) approximate(t Tank, s *solver, unit scales) {
	kv, _, _ := t.Rectifier.constants()
	h := s.firstHarmonic()
	o.FirstHarmonic = Approximation{
		OutputVoltage:   h.output * unit.voltage / (t.TurnsRatio * kv),
		PrimaryRMS:      h.primary * unit.current / math.Sqrt2,
		PrimaryPeak:     h.primary * unit.current,
		SecondaryRMS:    t.TurnsRatio * h.secondary * unit.current / math.Sqrt2,
		MagnetizingPeak: h.magnetize * unit.current,
	}
	if t.Rectifier == CenterTapped {
		o.FirstHarmonic.SecondaryRMS /= math.Sqrt2
	}
}

// finite reports whether every figure is a number.
func (o *Operation) finite() bool {
	ok := finite(o.Frequency, o.OutputVoltage, o.OutputCurrent, o.InputPower, o.OutputPower, o.EnergyBalance,
		o.Resonant.RMS, o.Resonant.Peak, o.Magnetizing.RMS, o.Magnetizing.Peak, o.CapacitorPeak, o.FluxLinkagePeak,
		o.TurnOffCurrent, o.RectifierOffFraction, o.FirstHarmonic.OutputVoltage, o.FirstHarmonic.PrimaryRMS,
		o.FirstHarmonic.SecondaryRMS, o.FirstHarmonic.MagnetizingPeak)
	for _, q := range o.Windings {
		ok = ok && finite(q.RMS, q.Peak, q.Mean)
	}
	for _, list := range append([][]complex128{o.IPrimaryHarmonics}, o.ISecondaryHarmonics...) {
		for _, h := range list {
			ok = ok && !cmplx.IsNaN(h) && !cmplx.IsInf(h)
		}
	}
	return ok
}

func square(x float64) float64 { return x * x }
