package material

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/interp"
)

// A HeatForm is the way in which a loss set depends on temperature.
type HeatForm string

// The forms of the temperature factor tau(T); A holds a0, a1, a2.
const (
	HeatNone         HeatForm = "none"          // 1
	HeatRatio        HeatForm = "ratio"         // the ferrite's own rule, see Heat
	HeatLogQuadratic HeatForm = "log-quadratic" // exp(a1 (T-TRef) + a2 (T-TRef)²)
	HeatPolynomial   HeatForm = "polynomial"    // a0 - a1 T + a2 T²
)

// A LossSet is one power law P = K f^Alpha B^Beta tau(T) with the ranges that it
// was fitted in.
type LossSet struct {
	ID          string
	K           float64 // W/m³ with f in Hz and B in T
	Alpha, Beta float64
	FMin, FMax  float64 // Hz
	BMin, BMax  float64 // T; both zero: the source states no range
	TMin, TMax  float64 // °C
	TRef        float64 // °C, where tau = 1
	Heat        HeatForm
	A           [3]float64
	Points      int     // that the set was fitted to; 0: not known
	RMS, Worst  float64 // residual of the fit, relative; 0: not known
	Band        float64 // how far the loss is to be trusted, relative
	Provenance
	lnK, center float64 // center: ln of the geometric middle of the band
	cold, span  float64 // form "ratio": ln of the column at TRef, and what it falls by from there to hot
}

// Heat carries losses from the loss sets' TRef to other temperatures: the ratio
// of hot over cold loss at a few frequencies, linear in ln f, and one column of
// losses whose shape in temperature, in ln P, is scaled to that ratio.
type Heat struct {
	Hot    []HeatPoint // by frequency; all at the same temperature
	Column []HeatPoint // by temperature
	lnF    []float64   // of Hot
	column interp.FritschButland
}

// A HeatPoint is one row of the table of temperature ratios.
type HeatPoint struct {
	F           float64 // Hz
	Temperature float64 // °C
	Value       float64 // ratio, or loss on any scale
	Provenance
}

// A LossPoint is the loss density of a sine and how it came about.
type LossPoint struct {
	Density     float64 // W/m³
	Alpha, Beta float64 // local slopes d ln P/d ln f and d ln P/d ln B
	Factor      float64 // temperature factor in Density
	Lower       int     // the loss sets used, as indices of Ferrite.Loss;
	Upper       int     // equal where one set alone holds
	Share       float64 // weight of Upper in ln P, 0 to 1
	Outside     Outside
}

// Outside tells how far an operating point lies outside the range of its loss
// set. The zero value means inside.
type Outside struct {
	F float64 // ratio to the nearer limit of frequency: 2 is twice the highest, 0.5 half the lowest; 0 inside
	B float64 // the same for the flux density
	T float64 // K above the highest temperature, negative below the lowest; 0 inside
}

// Any reports whether any range is left.
func (o Outside) Any() bool { return o != Outside{} }

// Worst returns the greater distance of each kind.
func (o Outside) Worst(p Outside) Outside {
	far := func(a, b float64) float64 {
		if a == 0 || b != 0 && math.Abs(math.Log(b)) > math.Abs(math.Log(a)) {
			return b
		}
		return a
	}
	w := Outside{F: far(o.F, p.F), B: far(o.B, p.B), T: o.T}
	if math.Abs(p.T) > math.Abs(o.T) {
		w.T = p.T
	}
	return w
}

// ErrOperatingPoint means that a frequency, flux density or temperature is not
// one that a loss can be given for.
var ErrOperatingPoint = errors.New("no loss for this operating point")

// LossDensity returns the loss density of a sine of frequency f in Hz and peak
// flux density B in T at temp in °C.
//
// With one loss set, and outside the middles of the outermost bands, it is that
// set's power law. Between the geometric middles of two neighbouring bands ln P
// goes over from one set to the other by a smooth step in ln f, so that neither
// the loss nor its slope jumps where published bands disagree (the three sets of
// PW3 differ by up to 8 % at their common borders inside their ranges; blended
// they meet the 34 measured points within 2.6 % rms and 5.9 % at worst). Alpha and
// Beta are the slopes of what is returned. In Alpha the slope of a hot-over-cold
// ratio, known at a few frequencies only, is its mean over the octave around f.
//
// Outside the ranges the laws are carried on and Outside tells how far. It allocates
// nothing. The error wraps ErrOperatingPoint when f <= 0, B < 0, temp is below
// absolute zero, any of them is not finite, or the result is not.
func (m *Ferrite) LossDensity(f, B, temp float64) (LossPoint, error) {
	if !(f > 0) || !(B >= 0) || !(temp > -273.15) || math.IsInf(f, 0) || math.IsInf(B, 0) || math.IsInf(temp, 0) {
		return LossPoint{}, fmt.Errorf("%s at f = %g Hz, B = %g T, %g °C: %w", m.Name, f, B, temp, ErrOperatingPoint)
	}
	lnF := math.Log(f)
	i := 0
	for i+1 < len(m.Loss) && lnF >= m.Loss[i+1].center {
		i++
	}
	p := LossPoint{Lower: i, Upper: i}
	lnTau, slope := m.lnTau(&m.Loss[i], lnF, temp)
	a := &m.Loss[i]
	lnB := math.Log(B) // -Inf for B = 0, taken care of below
	if B == 0 {
		lnB = 0
	}
	lnP := a.lnK + a.Alpha*lnF + a.Beta*lnB + lnTau
	p.Alpha, p.Beta = a.Alpha+slope, a.Beta
	p.Factor = lnTau
	if i+1 < len(m.Loss) && lnF > a.center {
		b := &m.Loss[i+1]
		width := b.center - a.center
		u := (lnF - a.center) / width
		w := u * u * (3 - 2*u)
		lnTauB, slopeB := m.lnTau(b, lnF, temp)
		lnPB := b.lnK + b.Alpha*lnF + b.Beta*lnB + lnTauB
		p.Upper, p.Share = i+1, w
		p.Alpha = (1-w)*p.Alpha + w*(b.Alpha+slopeB) + (lnPB-lnP)*6*u*(1-u)/width
		p.Beta = (1-w)*a.Beta + w*b.Beta
		p.Factor = (1-w)*lnTau + w*lnTauB
		lnP = (1-w)*lnP + w*lnPB
	}
	p.Density, p.Factor = math.Exp(lnP), math.Exp(p.Factor)
	if B == 0 {
		p.Density = 0
	}
	p.Outside = m.outside(p, f, B, temp)
	if math.IsInf(p.Density, 0) || math.IsNaN(p.Density) || math.IsNaN(p.Alpha) {
		return LossPoint{}, fmt.Errorf("%s at f = %g Hz, B = %g T, %g °C: %w", m.Name, f, B, temp, ErrOperatingPoint)
	}
	return p, nil
}

// lnTau returns the logarithm of the temperature factor of a set and its slope
// against ln f.
func (m *Ferrite) lnTau(s *LossSet, lnF, temp float64) (value, slope float64) {
	d := temp - s.TRef
	switch s.Heat {
	case HeatLogQuadratic:
		return s.A[1]*d + s.A[2]*d*d, 0
	case HeatPolynomial:
		return math.Log(s.A[0] - s.A[1]*temp + s.A[2]*temp*temp), 0
	case HeatRatio:
		h := &m.Heat
		share := (h.lnColumn(temp) - s.cold) / s.span
		const half = math.Ln2 / 2
		return share * math.Log(h.ratio(lnF)),
			share * math.Log(h.ratio(lnF+half)/h.ratio(lnF-half)) / math.Ln2
	}
	return 0, 0
}

// ratio is the hot-over-cold ratio, linear in ln f, kept beyond the ends.
func (h *Heat) ratio(lnF float64) float64 {
	rows := h.Hot
	n := len(rows)
	for i, x := range h.lnF {
		if lnF > x {
			continue
		}
		if i == 0 {
			return rows[0].Value
		}
		x0 := h.lnF[i-1]
		return rows[i-1].Value + (rows[i].Value-rows[i-1].Value)*(lnF-x0)/(x-x0)
	}
	return rows[n-1].Value
}

// lnColumn is the logarithm of the column of losses against temperature: a
// monotone cubic through the rows, the line of the last two beyond each end.
func (h *Heat) lnColumn(temp float64) float64 {
	rows := h.Column
	n := len(rows)
	line := func(a, b HeatPoint) float64 {
		ya, yb := math.Log(a.Value), math.Log(b.Value)
		return ya + (yb-ya)*(temp-a.Temperature)/(b.Temperature-a.Temperature)
	}
	switch {
	case temp < rows[0].Temperature:
		return line(rows[0], rows[1])
	case temp > rows[n-1].Temperature:
		return line(rows[n-2], rows[n-1])
	}
	return h.column.Predict(temp)
}

func (m *Ferrite) outside(p LossPoint, f, B, temp float64) (o Outside) {
	near := &m.Loss[p.Lower]
	if p.Share >= 0.5 {
		near = &m.Loss[p.Upper]
	}
	// Between two bands the loss is interpolated: only the outer limits count.
	if low := m.Loss[0].FMin; f < low*(1-rounding) {
		o.F = f / low
	} else if high := m.Loss[len(m.Loss)-1].FMax; f > high*(1+rounding) {
		o.F = f / high
	}
	if near.BMax > 0 && B > 0 {
		if B > near.BMax*(1+rounding) {
			o.B = B / near.BMax
		} else if B < near.BMin*(1-rounding) {
			o.B = B / near.BMin
		}
	}
	if temp > near.TMax {
		o.T = temp - near.TMax
	} else if temp < near.TMin {
		o.T = temp - near.TMin
	}
	return o
}

// rounding keeps a limit that was met exactly from being left by a last digit.
const rounding = 1e-9

// A Warning is a coded remark for the report. Codes are those of the contract:
// W202 figure from memory, W204 outside the range of the loss set.
type Warning struct {
	Code, Text string
}

// Sets names the loss sets behind p, as the list of models does: "E1" or "E1, E2".
func (m *Ferrite) Sets(p LossPoint) string {
	if p.Upper == p.Lower {
		return m.Loss[p.Lower].ID
	}
	return m.Loss[p.Lower].ID + ", " + m.Loss[p.Upper].ID
}

// LossWarnings says in words what p should be warned about.
func (m *Ferrite) LossWarnings(p LossPoint) []Warning {
	var list []Warning
	band := max(m.Loss[p.Lower].Band, m.Loss[p.Upper].Band)
	sets := m.Sets(p)
	memory, ratio := false, false
	for _, i := range []int{p.Lower, p.Upper} {
		s := &m.Loss[i]
		memory = memory || s.FromMemory()
		if s.Heat == HeatRatio && p.Factor != 1 {
			for _, h := range m.Heat.Hot {
				ratio = ratio || h.FromMemory()
			}
		}
	}
	switch {
	case memory:
		list = append(list, Warning{"W202", fmt.Sprintf("%s: loss set %s is from memory, ±%.0f %%", m.Name, sets, 100*band)})
	case ratio:
		list = append(list, Warning{"W202", fmt.Sprintf("%s: losses of set %s away from %g °C rest on catalogue ratios from memory, ±%.0f %%",
			m.Name, sets, m.Loss[p.Lower].TRef, 100*band)})
	}
	o := p.Outside
	first, last := m.Loss[0], m.Loss[len(m.Loss)-1]
	near := m.Loss[p.Lower]
	if p.Share >= 0.5 {
		near = m.Loss[p.Upper]
	}
	warn := func(format string, args ...any) {
		list = append(list, Warning{"W204", m.Name + ": " + fmt.Sprintf(format, args...)})
	}
	switch {
	case o.F > 1:
		warn("%.4g kHz is %.2f times the highest frequency of the loss sets (%g kHz, set %s); losses extrapolated", o.F*last.FMax/1e3, o.F, last.FMax/1e3, last.ID)
	case o.F > 0:
		warn("%.4g kHz is %.2f times the lowest frequency of the loss sets (%g kHz, set %s); losses extrapolated", o.F*first.FMin/1e3, o.F, first.FMin/1e3, first.ID)
	}
	switch {
	case o.B > 1:
		warn("%.4g mT is %.2f times the highest flux density of loss set %s (%g mT); losses extrapolated", o.B*near.BMax*1e3, o.B, near.ID, near.BMax*1e3)
	case o.B > 0:
		warn("%.4g mT is %.2f times the lowest flux density of loss set %s (%g mT); losses extrapolated", o.B*near.BMin*1e3, o.B, near.ID, near.BMin*1e3)
	}
	switch {
	case o.T == 0:
	case near.Heat == HeatNone:
		warn("loss set %s holds at %g °C and has no temperature rule; used %.0f K away without change", near.ID, near.TRef, math.Abs(o.T))
	case o.T > 0:
		warn("%.0f K above the highest temperature of loss set %s (%g °C); losses extrapolated", o.T, near.ID, near.TMax)
	default:
		warn("%.0f K below the lowest temperature of loss set %s (%g °C); losses extrapolated", -o.T, near.ID, near.TMin)
	}
	return list
}

// New returns a ferrite made of loss sets alone, for computing losses with sets
// that are in no table. The figures of a table row (saturation, permeability, ..)
// are missing: Bsat, MuI, Curie and Density must not be called.
func New(name string, sets ...LossSet) (*Ferrite, error) {
	m := &Ferrite{Name: name, Loss: slices.Clone(sets)}
	if err := m.prepare(); err != nil {
		return nil, fmt.Errorf("ferrite %s: %w", name, err)
	}
	return m, nil
}

// prepare sorts and checks the loss sets and computes what LossDensity needs.
func (m *Ferrite) prepare() error {
	if len(m.Loss) == 0 {
		return errors.New("no loss set")
	}
	for i := range m.Loss {
		s := &m.Loss[i]
		if msg := s.fault(); msg != "" {
			return fmt.Errorf("loss set %s: %s", s.ID, msg)
		}
		s.lnK = math.Log(s.K)
		s.center = math.Log(s.FMin)/2 + math.Log(s.FMax)/2
		if s.Heat != HeatRatio {
			continue
		}
		if len(m.Heat.Hot) == 0 || len(m.Heat.Column) < 2 {
			return fmt.Errorf("loss set %s: heat is %q, but there is no hot-over-cold row or no column of two temperatures for it", s.ID, HeatRatio)
		}
	}
	slices.SortStableFunc(m.Loss, func(a, b LossSet) int { return cmp.Compare(a.center, b.center) })
	for i := 1; i < len(m.Loss); i++ {
		if a, b := m.Loss[i-1], m.Loss[i]; !(b.center > a.center) || a.FMax > b.FMax || a.FMin > b.FMin {
			return fmt.Errorf("loss sets %s (%g to %g kHz) and %s (%g to %g kHz) are not one band above the other",
				a.ID, a.FMin/1e3, a.FMax/1e3, b.ID, b.FMin/1e3, b.FMax/1e3)
		}
	}
	return m.Heat.prepare(m.Loss)
}

func (h *Heat) prepare(sets []LossSet) error {
	if len(h.Hot) == 0 || len(h.Column) < 2 {
		return nil // prepare of the ferrite has seen that no set needs them
	}
	slices.SortStableFunc(h.Hot, func(a, b HeatPoint) int { return cmp.Compare(a.F, b.F) })
	slices.SortStableFunc(h.Column, func(a, b HeatPoint) int { return cmp.Compare(a.Temperature, b.Temperature) })
	hot := h.Hot[0].Temperature
	h.lnF = make([]float64, len(h.Hot))
	for i, r := range h.Hot {
		h.lnF[i] = math.Log(r.F)
		if r.Temperature != hot {
			return fmt.Errorf("hot-over-cold rows at %g and %g °C; all must be at one temperature", hot, r.Temperature)
		}
		if i > 0 && r.F == h.Hot[i-1].F {
			return fmt.Errorf("two hot-over-cold rows at %g kHz", r.F/1e3)
		}
	}
	xs, ys := make([]float64, len(h.Column)), make([]float64, len(h.Column))
	for i, r := range h.Column {
		if i > 0 && r.Temperature == xs[i-1] {
			return fmt.Errorf("two column rows at %g °C", r.Temperature)
		}
		xs[i], ys[i] = r.Temperature, math.Log(r.Value)
	}
	// Fit panics on unsorted temperatures only, which were refused above.
	if err := h.column.Fit(xs, ys); err != nil {
		return err
	}
	for i := range sets {
		s := &sets[i]
		s.cold = h.lnColumn(s.TRef)
		s.span = h.lnColumn(hot) - s.cold
		// A column that is flat between the two temperatures has no shape to scale.
		if s.Heat == HeatRatio && math.Abs(s.span) < 0.05 {
			return fmt.Errorf("the column changes by less than 5 %% between %g and %g °C: its shape cannot be scaled to the hot-over-cold ratio; give the loss sets a log-quadratic form", s.TRef, hot)
		}
	}
	return nil
}

// fault says in words what is wrong with a loss set, and nothing when it is sound.
func (s *LossSet) fault() string {
	finite := true
	for _, v := range []float64{s.K, s.Alpha, s.Beta, s.FMin, s.FMax, s.BMin, s.BMax, s.TMin, s.TMax, s.TRef, s.A[0], s.A[1], s.A[2]} {
		finite = finite && !math.IsNaN(v) && !math.IsInf(v, 0)
	}
	switch {
	case !finite:
		return "a value is not finite"
	case !(s.K > 0):
		return fmt.Sprintf("k = %g is not above zero", s.K)
	case !(s.Alpha > 0.5 && s.Alpha < 4):
		return fmt.Sprintf("alpha = %g; ferrites lie between 1 and 3", s.Alpha)
	case !(s.Beta > 1 && s.Beta < 4.5):
		return fmt.Sprintf("beta = %g; ferrites lie between 2 and 3.3", s.Beta)
	case !(s.FMin > 0 && s.FMin < s.FMax):
		return fmt.Sprintf("frequency range %g to %g Hz", s.FMin, s.FMax)
	case s.BMin < 0 || s.BMax < s.BMin || s.BMin == 0 && s.BMax != 0 || s.BMax == s.BMin && s.BMax != 0:
		return fmt.Sprintf("flux density range %g to %g T", s.BMin, s.BMax)
	case s.TMax < s.TMin || s.TMin <= -273.15:
		return fmt.Sprintf("temperature range %g to %g °C", s.TMin, s.TMax)
	case !slices.Contains([]HeatForm{HeatNone, HeatRatio, HeatLogQuadratic, HeatPolynomial}, s.Heat):
		return fmt.Sprintf("heat form %q; write none, ratio, log-quadratic or polynomial", s.Heat)
	}
	if s.Heat == HeatPolynomial {
		a := s.A
		if !(a[2] > 0) {
			return fmt.Sprintf("a2 = %g: the polynomial in T must open upwards", a[2])
		}
		if low := a[0] - a[1]*a[1]/(4*a[2]); !(low > 0) {
			return fmt.Sprintf("the polynomial in T falls to %.3g at %.0f °C: losses cannot be negative", low, a[1]/(2*a[2]))
		}
	}
	return ""
}

// levelFault catches a k in wrong units: the loss per cycle is then far from
// what any power ferrite shows. P/(f B²) of the sets in the table runs from 16 to
// 980 J/(m³ T²) between 10 and 200 mT; a k per cm³ instead of per m³ or in kHz
// instead of Hz is wrong by 1000 and more.
func (s *LossSet) levelFault() string {
	f, B := math.Sqrt(s.FMin*s.FMax), 0.1
	if s.BMax > 0 {
		B = min(max(math.Sqrt(s.BMin*s.BMax), 0.03), 0.2)
	}
	p := s.K * math.Pow(f, s.Alpha) * math.Pow(B, s.Beta)
	if per := p / (f * B * B); !(per > 1 && per < 1e4) {
		return fmt.Sprintf("k gives %.3g kW/m3 at %.4g kHz, %.4g mT, which no power ferrite has; k is in W/m3 with f in Hz and B in T (mW/cm3: times 1000)", p/1e3, f/1e3, B*1e3)
	}
	return ""
}
