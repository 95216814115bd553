package tank

import "fmt"

// Bounds of the warnings.
const (
	nearPeakGain      = 0.10 // of the wanted output
	nearPeakFrequency = 1.05 // of the frequency of the peak
	swingReserve      = 0.20 // of the dead time
	nearRangeEnd      = 0.02 // of the end of the frequency range
)

// warn adds what the user should know about a corner.
func (o *Operation) warn(t Tank) {
	add := func(code, format string, args ...any) {
		o.Warnings = append(o.Warnings, Warning{code, fmt.Sprintf(format, args...)})
	}
	if o.Status == AboveRange {
		add("W103", "needs more than frequency_max: pulse skipping or a higher frequency_max must keep the output down")
	}
	if o.Status != OK {
		return
	}
	fr := t.ResonantFrequency()
	if o.Frequency < fr/2 {
		add("W101", "runs at %.3g of the resonant frequency; below a half the tank is hardly used as one", o.Frequency/fr)
	}
	if o.found() {
		switch ratio := o.Frequency / o.FrequencyOfPeakGain; {
		case o.PeakGainMargin < nearPeakGain && o.FrequencyOfPeakGain <= t.FrequencyMin:
			add("W102", "little gain in reserve: at frequency_min, %s, the output is %s, %.3g %% more than is wanted", hertz(t.FrequencyMin), volts(o.PeakOutputVoltage), 100*o.PeakGainMargin)
		case o.PeakGainMargin < nearPeakGain:
			add("W102", "near the peak of the gain: at most %s can be reached, %.3g %% more than is wanted", volts(o.PeakOutputVoltage), 100*o.PeakGainMargin)
		case ratio < nearPeakFrequency:
			add("W102", "near the peak of the gain: it lies at %s, the corner runs only %.3g %% above", hertz(o.FrequencyOfPeakGain), 100*(ratio-1))
		}
		switch {
		case o.Frequency > t.FrequencyMax*(1-nearRangeEnd):
			add("W106", "runs at the upper end of the frequency range")
		case o.Frequency < t.FrequencyMin*(1+nearRangeEnd):
			add("W106", "runs at the lower end of the frequency range")
		}
	} else if o.Frequency < t.FrequencyMin || o.Frequency > t.FrequencyMax {
		add("W104", "the given frequency is outside the range of %s to %s", hertz(t.FrequencyMin), hertz(t.FrequencyMax))
	}
	switch w := o.SoftSwitching; {
	case w == nil:
	case !w.Complete && w.EndCurrent <= 0:
		add("W105", "soft switching is incomplete: the current turns round within the dead time and %s are left when the switch turns on", volts(w.VoltageLeft))
	case !w.Complete:
		add("W105", "soft switching is incomplete: %s are left when the dead time ends", volts(w.VoltageLeft))
	case w.SwingTime > t.DeadTime*(1-swingReserve):
		add("W105", "soft switching is tight: the swing takes %.3g %% of the dead time", 100*w.SwingTime/t.DeadTime)
	}
}

// found reports whether the frequency was looked for.
func (o *Operation) found() bool { return o.Corner.OutputVoltage > 0 }
