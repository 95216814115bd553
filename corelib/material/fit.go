package material

import (
	"cmp"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"

	"gonum.org/v1/gonum/mat"

	"gapwright/corelib/table"
)

// A Point is one measured or catalogue loss of a sine.
type Point struct {
	F    float64 // Hz
	B    float64 // T, peak
	T    float64 // °C; NaN when the file has no temperatures
	P    float64 // W/m³
	Line int     // in its file; 0: none
}

// ReadPoints reads a table of loss points: columns f, B, P and, if there is one, T,
// each with its unit in the heading, as in "f [kHz],B [mT],T [degC],P [kW/m3]". Every
// mistake is reported with file, line and column (table.Error).
func ReadPoints(name string, r io.Reader) ([]Point, error) {
	file, err := table.Read(name, r, table.Column{Name: "f", Unit: "Hz", Required: true}, table.Column{Name: "B", Unit: "T", Required: true},
		table.Column{Name: "T", Unit: "degC"}, table.Column{Name: "P", Unit: "W/m3", Required: true})
	if err != nil {
		return nil, err
	}
	points := make([]Point, 0, len(file.Rows))
	for i, row := range file.Rows {
		p := Point{F: row.Positive("f"), B: row.Positive("B"), T: math.NaN(), P: row.Positive("P"), Line: row.Line()}
		if t, ok := row.Number("T"); ok {
			p.T = t
			if t < -100 || t > 400 {
				row.Fail("T", "T: %g degC is not a temperature that ferrites are measured at", t)
			}
		}
		if i > 0 && math.IsNaN(p.T) != math.IsNaN(points[0].T) {
			row.Fail("T", "T is given in some rows and empty in others")
		}
		points = append(points, p)
		if p.F <= 0 || p.B <= 0 || p.P <= 0 {
			continue
		}
		if p.B > 1 {
			row.Fail("B", "B: %g T is above the saturation of every ferrite: is the unit in the heading right?", p.B)
			continue
		}
		// As in levelFault, with room for odd materials.
		if per := p.P / (p.F * p.B * p.B); !(per > 0.1 && per < 1e5) {
			row.Fail("P", "P: %.3g kW/m3 at %.4g kHz and %.4g mT is %.2g J/(m3 T2) per cycle, where ferrites have 10 to 1000: are the units in the heading right?",
				p.P/1e3, p.F/1e3, p.B*1e3, per)
		}
	}
	if err := file.Err(); err != nil {
		return nil, err
	}
	if len(points) == 0 {
		return nil, &table.Error{File: name, Line: 1, Column: 1, Msg: "no points"}
	}
	return points, nil
}

// FitOptions say what to fit. The zero value fits one power law with the
// temperature terms that the points allow.
type FitOptions struct {
	Beta float64  // hold beta at this value; 0: fit it
	Heat HeatForm // HeatLogQuadratic (also when empty), HeatPolynomial or HeatNone
	TRef float64  // °C, where the temperature factor is 1; NaN or 0 with HeatNone: the measured temperature nearest 100 °C
}

// A Fit is a power law fitted to loss points.
type Fit struct {
	Set         LossSet // ranges, points, rms and worst residual filled in; ID and provenance are the caller's
	LnK         float64 // natural logarithm of Set.K
	AlphaKnown  bool    // false with a single frequency: k and beta then hold at that frequency only
	BetaHeld    bool    // beta was given
	Correlation float64 // of ln f and ln B over the points
	Terms       int     // unknowns
	Points      []Point
	Residuals   []float64 // ln(P/fit) of each point
	QuadraticF  float64   // rms residual with a term (ln f)² added; 0: not fitted (fewer than three frequencies)
	Warnings    []string
}

// Errors of a fit. Each comes wrapped with what was found.
var (
	ErrTooFewPoints = errors.New("too few loss points")
	ErrCollinear    = errors.New("frequency and flux density cannot be told apart")
	ErrPolynomial   = errors.New("the polynomial in temperature does not stay positive")
)

// distinct returns the different values of a column, ascending; values within 0.1 %
// of each other count as one, as set points of a bench do.
func distinct(points []Point, column func(Point) float64, same func(a, b float64) bool) []float64 {
	all := make([]float64, len(points))
	for i, p := range points {
		all[i] = column(p)
	}
	slices.Sort(all)
	return slices.CompactFunc(all, same)
}

func frequencies(points []Point) []float64 {
	return distinct(points, func(p Point) float64 { return p.F }, func(a, b float64) bool { return math.Abs(b-a) <= 1e-3*a })
}

func fluxes(points []Point) []float64 {
	return distinct(points, func(p Point) float64 { return p.B }, func(a, b float64) bool { return math.Abs(b-a) <= 1e-3*a })
}

func temperatures(points []Point) []float64 {
	if math.IsNaN(points[0].T) {
		return nil
	}
	return distinct(points, func(p Point) float64 { return p.T }, func(a, b float64) bool { return math.Abs(b-a) < 0.5 })
}

// FitLoss fits ln P = ln k + alpha ln f + beta ln B, with temperature terms where
// the points allow them, by least squares with equal weights in ln P, that is of
// relative errors (QR on centred columns).
//
// Temperature: with three temperatures or more the form of o.Heat; with two a
// log-linear term; with one, or none stated, no term. The form HeatLogQuadratic is
// part of the linear problem; HeatPolynomial starts there and goes on by Gauss-Newton on
// the logarithm.
//
// The error wraps ErrTooFewPoints (fewer than three points, or than unknowns, or a
// single flux density with beta free), ErrCollinear (ln f and ln B lie on one line) or
// ErrPolynomial. With a single frequency only beta is found; see Fit.AlphaKnown.
func FitLoss(points []Point, o FitOptions) (Fit, error) {
	if len(points) < 3 {
		return Fit{}, fmt.Errorf("%d points, 3 are needed: %w", len(points), ErrTooFewPoints)
	}
	for _, p := range points {
		if !(p.F > 0) || !(p.B > 0) || !(p.P > 0) || math.IsInf(p.F, 0) || math.IsInf(p.B, 0) || math.IsInf(p.P, 0) || math.IsInf(p.T, 0) || math.IsNaN(p.T) != math.IsNaN(points[0].T) {
			return Fit{}, fmt.Errorf("point %g Hz, %g T, %g °C, %g W/m³: %w", p.F, p.B, p.T, p.P, ErrOperatingPoint)
		}
	}
	fs, bs, ts := frequencies(points), fluxes(points), temperatures(points)
	f := Fit{AlphaKnown: len(fs) > 1, BetaHeld: o.Beta != 0, Points: slices.Clone(points)}
	if len(bs) < 2 && !f.BetaHeld {
		return Fit{}, fmt.Errorf("all points at %.4g mT: beta cannot be found, hold it at a typical 2.5: %w", bs[0]*1e3, ErrTooFewPoints)
	}
	f.Correlation = correlation(points)
	// A correlation this high makes the errors of the exponents 100 times those of
	// independent columns.
	if f.AlphaKnown && !f.BetaHeld && 1-f.Correlation*f.Correlation < 1e-4 {
		return Fit{}, fmt.Errorf("ln f and ln B lie on one line (correlation %.5f): add points that change one alone, or hold beta: %w", f.Correlation, ErrCollinear)
	}

	s := &f.Set
	s.FMin, s.FMax = fs[0], fs[len(fs)-1]
	s.BMin, s.BMax = bs[0], bs[len(bs)-1]
	s.Points = len(points)
	s.Heat = HeatNone
	s.TRef = 25
	if len(ts) > 0 {
		s.TMin, s.TMax = ts[0], ts[len(ts)-1]
		s.TRef = o.TRef
		if s.TRef == 0 || math.IsNaN(s.TRef) {
			s.TRef = slices.MinFunc(ts, func(a, b float64) int { return cmp.Compare(math.Abs(a-100), math.Abs(b-100)) })
		}
		if len(ts) > 1 && o.Heat != HeatNone {
			s.Heat = HeatLogQuadratic
			if o.Heat == HeatPolynomial && len(ts) > 2 {
				s.Heat = HeatPolynomial
			}
		}
	} else {
		s.TMin, s.TMax = s.TRef, s.TRef
		f.warn("the points have no temperature: 25 degC is assumed")
	}

	// The linear problem, which also starts the other form.
	y := make([]float64, len(points))
	var columns [][]float64
	column := func(value func(Point) float64) {
		c := make([]float64, len(points))
		for i, p := range points {
			c[i] = value(p)
		}
		columns = append(columns, c)
	}
	for i, p := range points {
		y[i] = math.Log(p.P)
		if f.BetaHeld {
			y[i] -= o.Beta * math.Log(p.B)
		}
	}
	if f.AlphaKnown {
		column(func(p Point) float64 { return math.Log(p.F) })
	}
	if !f.BetaHeld {
		column(func(p Point) float64 { return math.Log(p.B) })
	}
	heatTerms := 0
	if s.Heat != HeatNone {
		heatTerms = min(len(ts)-1, 2)
		column(func(p Point) float64 { return p.T - s.TRef })
		if heatTerms == 2 {
			column(func(p Point) float64 { return (p.T - s.TRef) * (p.T - s.TRef) })
		}
	}
	f.Terms = 1 + len(columns)
	if len(points) < f.Terms {
		return Fit{}, fmt.Errorf("%d points for %d unknowns: %w", len(points), f.Terms, ErrTooFewPoints)
	}
	c0, c, err := leastSquares(columns, y)
	if err != nil {
		return Fit{}, err
	}
	f.take(c0, c, o, heatTerms)
	if s.Heat == HeatPolynomial {
		if err := f.polynomial(columns[:len(columns)-2], y, c0, c); err != nil {
			return Fit{}, err
		}
	}
	f.measure()
	if len(fs) > 2 && !f.BetaHeld && heatTerms == 0 && len(points) > f.Terms {
		f.quadratic(columns, y)
	}
	f.judge(ts)
	return f, nil
}

func (f *Fit) warn(format string, args ...any) {
	f.Warnings = append(f.Warnings, fmt.Sprintf(format, args...))
}

// take puts the solution of the linear problem into the set.
func (f *Fit) take(c0 float64, c []float64, o FitOptions, heatTerms int) {
	s := &f.Set
	f.LnK = c0
	s.Beta = o.Beta
	if f.AlphaKnown {
		s.Alpha, c = c[0], c[1:]
	}
	if !f.BetaHeld {
		s.Beta, c = c[0], c[1:]
	}
	if s.Heat == HeatLogQuadratic {
		s.A[1] = c[0]
		if heatTerms == 2 {
			s.A[2] = c[1]
		}
	}
	s.K = math.Exp(f.LnK)
}

// Value returns the fitted loss density in W/m³ at a point.
func (f *Fit) Value(p Point) float64 {
	s := &f.Set
	lnP := f.LnK + s.Beta*math.Log(p.B)
	if f.AlphaKnown {
		lnP += s.Alpha * math.Log(p.F)
	}
	d := p.T - s.TRef
	switch s.Heat {
	case HeatLogQuadratic:
		lnP += s.A[1]*d + s.A[2]*d*d
	case HeatPolynomial:
		lnP += math.Log(s.A[0] - s.A[1]*p.T + s.A[2]*p.T*p.T)
	}
	return math.Exp(lnP)
}

// measure computes residuals, rms and the worst.
func (f *Fit) measure() {
	f.Residuals = make([]float64, len(f.Points))
	var sum, worst float64
	for i, p := range f.Points {
		r := math.Log(p.P / f.Value(p))
		f.Residuals[i] = r
		sum += r * r
		worst = max(worst, math.Abs(r))
	}
	f.Set.RMS = math.Sqrt(sum / float64(len(f.Points)))
	f.Set.Worst = math.Expm1(worst)
}

// quadratic fits a term (ln f)² beside the others, to show whether bands would help.
func (f *Fit) quadratic(columns [][]float64, y []float64) {
	mean := 0.0
	for _, p := range f.Points {
		mean += math.Log(p.F) / float64(len(f.Points))
	}
	square := make([]float64, len(f.Points))
	for i, p := range f.Points {
		u := math.Log(p.F) - mean
		square[i] = u * u
	}
	columns = append(slices.Clone(columns), square)
	c0, c, err := leastSquares(columns, y)
	if err != nil {
		return // the term cannot be told from the others: nothing to show
	}
	var sum float64
	for i := range y {
		r := y[i] - c0
		for j := range columns {
			r -= c[j] * columns[j][i]
		}
		sum += r * r
	}
	f.QuadraticF = math.Sqrt(sum / float64(len(y)))
}

// judge adds the warnings.
func (f *Fit) judge(ts []float64) {
	s := &f.Set
	if !f.AlphaKnown {
		f.warn("all points at %.4g kHz: alpha cannot be found; k and beta hold at that frequency only", s.FMin/1e3)
	}
	if f.AlphaKnown && !f.BetaHeld && math.Abs(f.Correlation) > 0.8 {
		f.warn("ln f and ln B go together (correlation %.2f), as in catalogues that pair high f with low B: beta is pulled down; fit bands or hold beta at 2.4 to 2.6", f.Correlation)
	}
	if f.AlphaKnown && !(s.Alpha > 1 && s.Alpha < 3) {
		f.warn("alpha = %.3f is outside 1 to 3, where power ferrites lie", s.Alpha)
	}
	if !(s.Beta > 2 && s.Beta < 3.3) {
		f.warn("beta = %.3f is outside 2 to 3.3, where power ferrites lie", s.Beta)
	}
	if len(f.Points) == f.Terms {
		f.warn("%d points for %d unknowns: the residuals say nothing about the fit", len(f.Points), f.Terms)
	} else if s.RMS > 0.05 {
		f.warn("rms residual %.1f %%: one power law does not cover %.4g to %.4g kHz; fit bands", 100*s.RMS, s.FMin/1e3, s.FMax/1e3)
	}
	switch {
	case len(ts) == 1:
		f.warn("all points at %g degC: the set knows no other temperature", ts[0])
	case len(ts) == 2 && s.Heat != HeatNone:
		f.warn("two temperatures allow no curvature: the loss minimum is not seen")
	case len(ts) > 1 && s.Heat == HeatNone:
		f.warn("points from %g to %g degC were fitted without a temperature term", s.TMin, s.TMax)
	}
	if s.Heat == HeatLogQuadratic && len(ts) > 2 && s.A[2] <= 0 {
		f.warn("the fit has no loss minimum in temperature (a2 = %.3g)", s.A[2])
	}
}

// LeastLossTemperature returns where a temperature form has its minimum, in °C; ok is
// false where there is none.
func (s *LossSet) LeastLossTemperature() (temp float64, ok bool) {
	switch {
	case s.Heat == HeatLogQuadratic && s.A[2] > 0:
		return s.TRef - s.A[1]/(2*s.A[2]), true
	case s.Heat == HeatPolynomial && s.A[2] > 0:
		return s.A[1] / (2 * s.A[2]), true
	}
	return 0, false
}

// polynomial turns the log-quadratic start into the polynomial form: with the
// exponents of the start the polynomial is linear in P; from there Gauss-Newton moves
// everything at once until the sum of squared logarithms stands still.
func (f *Fit) polynomial(power [][]float64, y []float64, c0 float64, c []float64) error {
	n := len(f.Points)
	d := make([]float64, n)
	scaled := make([]float64, n)
	for i, p := range f.Points {
		d[i] = p.T - f.Set.TRef
		lnP := c0
		for j := range power {
			lnP += c[j] * power[j][i]
		}
		scaled[i] = math.Exp(y[i] - lnP)
	}
	a0, a, err := leastSquares([][]float64{d, products(d, d)}, scaled)
	if err != nil {
		return err
	}
	// x: ln k, exponents, p1, p2 of q = 1 + p1 d + p2 d².
	x := append([]float64{c0 + math.Log(a0)}, c[:len(power)]...)
	x = append(x, a[0]/a0, a[1]/a0)
	if !(a0 > 0) {
		x[0] = c0
		x[len(x)-2], x[len(x)-1] = 0, 0
	}
	q := make([]float64, n)
	residuals := func(x []float64) ([]float64, float64) {
		r := make([]float64, n)
		var sum float64
		for i := range r {
			q[i] = 1 + x[len(x)-2]*d[i] + x[len(x)-1]*d[i]*d[i]
			if !(q[i] > 0) {
				return nil, math.Inf(1)
			}
			r[i] = y[i] - x[0] - math.Log(q[i])
			for j := range power {
				r[i] -= x[1+j] * power[j][i]
			}
			sum += r[i] * r[i]
		}
		return r, sum
	}
	r, sum := residuals(x)
	if math.IsInf(sum, 0) { // the start crosses zero: begin flat
		x[len(x)-2], x[len(x)-1] = 0, 0
		r, sum = residuals(x)
	}
	for range 100 {
		jac := slices.Clone(power)
		inv := make([]float64, n)
		for i := range inv {
			inv[i] = 1 / q[i]
		}
		jac = append(jac, products(d, inv), products(products(d, d), inv))
		s0, step, err := leastSquares(jac, r)
		if err != nil {
			return err
		}
		full := append([]float64{s0}, step...)
		moved := 0.0
		part := 1.0
		var next []float64
		for ; part > 1e-6; part /= 2 {
			next = slices.Clone(x)
			for j := range next {
				next[j] += part * full[j]
			}
			if nr, ns := residuals(next); ns <= sum*(1+1e-14) {
				r, sum = nr, ns
				break
			}
		}
		if part <= 1e-6 {
			residuals(x) // q of the point that stays
			break
		}
		for j := range next {
			moved = max(moved, math.Abs(next[j]-x[j])/(1e-3+math.Abs(next[j])))
		}
		x = next
		if moved < 1e-13 {
			break
		}
	}
	s := &f.Set
	f.LnK = x[0]
	s.K = math.Exp(x[0])
	i := 1
	if f.AlphaKnown {
		s.Alpha = x[i]
		i++
	}
	if !f.BetaHeld {
		s.Beta = x[i]
	}
	p1, p2, t0 := x[len(x)-2], x[len(x)-1], s.TRef
	s.A = [3]float64{1 - p1*t0 + p2*t0*t0, 2*p2*t0 - p1, p2}
	if low := s.A[0] - s.A[1]*s.A[1]/(4*p2); !(p2 > 0 && low > 0) {
		return fmt.Errorf("a2 = %.3g, least value %.3g; use the log-quadratic form: %w", p2, low, ErrPolynomial)
	}
	return nil
}

func products(a, b []float64) []float64 {
	c := make([]float64, len(a))
	for i := range a {
		c[i] = a[i] * b[i]
	}
	return c
}

// correlation of ln f and ln B; 0 when either does not vary.
func correlation(points []Point) float64 {
	var mu, mw float64
	n := float64(len(points))
	for _, p := range points {
		mu += math.Log(p.F) / n
		mw += math.Log(p.B) / n
	}
	var uu, ww, uw float64
	for _, p := range points {
		u, w := math.Log(p.F)-mu, math.Log(p.B)-mw
		uu, ww, uw = uu+u*u, ww+w*w, uw+u*w
	}
	if uu <= 1e-12*n || ww <= 1e-12*n {
		return 0
	}
	return uw / math.Sqrt(uu*ww)
}

// leastSquares solves y = c0 + sum c_j column_j for the least sum of squares: QR on
// columns centred at their means and scaled to length one. The error wraps ErrCollinear
// when a column is a combination of the others to 1e-7 of its length.
func leastSquares(columns [][]float64, y []float64) (c0 float64, c []float64, err error) {
	n, k := len(y), len(columns)
	mean := func(x []float64) float64 {
		var sum float64
		for _, v := range x {
			sum += v
		}
		return sum / float64(n)
	}
	my := mean(y)
	if k == 0 {
		return my, nil, nil
	}
	a := mat.NewDense(n, k, nil)
	means, lengths := make([]float64, k), make([]float64, k)
	for j, col := range columns {
		means[j] = mean(col)
		for _, v := range col {
			lengths[j] = math.Hypot(lengths[j], v-means[j])
		}
		if !(lengths[j] > 0) {
			return 0, nil, fmt.Errorf("a column of the fit does not vary: %w", ErrCollinear)
		}
		for i, v := range col {
			a.Set(i, j, (v-means[j])/lengths[j])
		}
	}
	rhs := mat.NewVecDense(n, nil)
	for i, v := range y {
		rhs.SetVec(i, v-my)
	}
	var qr mat.QR
	qr.Factorize(a)
	var r mat.Dense
	qr.RTo(&r)
	for j := range k {
		if math.Abs(r.At(j, j)) < 1e-7 {
			return 0, nil, fmt.Errorf("a term of the fit (number %d) is a combination of the others: the points do not vary it by itself: %w", j+1, ErrCollinear)
		}
	}
	var x mat.VecDense
	if err := qr.SolveVecTo(&x, false, rhs); err != nil {
		return 0, nil, fmt.Errorf("%v: %w", err, ErrCollinear)
	}
	c = make([]float64, k)
	c0 = my
	for j := range k {
		c[j] = x.AtVec(j) / lengths[j]
		c0 -= c[j] * means[j]
	}
	return c0, c, nil
}

// Split sorts points into bands at the border frequencies in Hz, ascending. A point
// on a border belongs to both bands, so that neighbouring sets meet there. The error
// names a band that has no points.
func Split(points []Point, borders []float64) ([][]Point, error) {
	edges := append(append([]float64{0}, borders...), math.Inf(1))
	bands := make([][]Point, len(edges)-1)
	for i := range bands {
		if !(edges[i] < edges[i+1]) {
			return nil, fmt.Errorf("borders of bands must ascend: %g Hz is followed by %g Hz", edges[i], edges[i+1])
		}
		for _, p := range points {
			if p.F >= edges[i]*(1-rounding) && p.F <= edges[i+1]*(1+rounding) {
				bands[i] = append(bands[i], p)
			}
		}
		if len(bands[i]) == 0 {
			return nil, fmt.Errorf("no points between %g and %g kHz: %w", edges[i]/1e3, edges[i+1]/1e3, ErrTooFewPoints)
		}
	}
	return bands, nil
}

// SuggestBorder returns the measured frequency at which splitting the points into two
// bands leaves the least rms residual, counted over both, and that rms; ok is false
// when no split leaves each band more points than unknowns.
func SuggestBorder(points []Point, o FitOptions) (border, rms float64, ok bool) {
	best := math.Inf(1)
	fs := frequencies(points)
	for _, f := range fs[min(1, len(fs)):max(1, len(fs)-1)] {
		bands, err := Split(points, []float64{f})
		if err != nil {
			continue
		}
		var sum float64
		n := 0
		for _, band := range bands {
			fit, err := FitLoss(band, o)
			if err != nil || !fit.AlphaKnown || len(band) <= fit.Terms {
				sum = math.Inf(1)
				break
			}
			sum += fit.Set.RMS * fit.Set.RMS * float64(len(band))
			n += len(band)
		}
		if r := math.Sqrt(sum / float64(n)); n > 0 && r < best {
			best, border, ok = r, f, true
		}
	}
	return border, best, ok
}

// LossHeading is the heading of the table of loss sets.
func LossHeading() string {
	unit := map[string]string{"Hz": "kHz", "T": "mT", "degC": "degC", "1": "%"}
	var names []string
	for _, c := range LossColumns() {
		name := c.Name
		if c.Unit != "" {
			name += " [" + unit[c.Unit] + "]"
		}
		names = append(names, name)
	}
	return strings.Join(names, ",")
}

// LossRow writes a loss set as a row under LossHeading. Six decimals of the exponents
// and seven digits of k keep the loss to 1e-5.
func LossRow(name string, s LossSet) string {
	number := func(v float64, digits int) string { return strconv.FormatFloat(v, 'g', digits, 64) }
	scaled := func(v, factor float64) string {
		if v == 0 {
			return ""
		}
		return number(v*factor, 7)
	}
	a := func(i int) string {
		if s.A[i] == 0 {
			return ""
		}
		return number(s.A[i], 9)
	}
	points := ""
	if s.Points > 0 {
		points = strconv.Itoa(s.Points)
	}
	percent := func(v float64) string {
		if v == 0 {
			return ""
		}
		return strconv.FormatFloat(100*v, 'f', 2, 64)
	}
	cells := []string{name, s.ID, number(s.K, 7), strconv.FormatFloat(s.Alpha, 'f', 6, 64), strconv.FormatFloat(s.Beta, 'f', 6, 64),
		scaled(s.FMin, 1e-3), scaled(s.FMax, 1e-3), scaled(s.BMin, 1e3), scaled(s.BMax, 1e3),
		number(s.TMin, 7), number(s.TMax, 7), number(s.TRef, 7), string(s.Heat), a(0), a(1), a(2), points,
		percent(s.RMS), percent(s.Worst), percent(s.Band), s.Source, s.Confidence}
	for i, c := range cells {
		if strings.ContainsAny(c, ",\"\n\r") || strings.HasPrefix(c, "#") {
			cells[i] = `"` + strings.ReplaceAll(c, `"`, `""`) + `"`
		}
	}
	return strings.Join(cells, ",")
}
