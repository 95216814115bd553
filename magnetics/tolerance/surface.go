package tolerance

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"

	"gapwright/tank"
)

// pilotFactor is how many exact builds are solved per coefficient of a response
// surface, over twice the tolerances.
const pilotFactor = 8

// features is the number of coefficients of a full quadratic in k values.
func features(k int) int { return (k + 1) * (k + 2) / 2 }

func fillFeatures(row, u []float64) {
	row[0] = 1
	at := 1
	for i, x := range u {
		row[at] = x
		at++
		for _, y := range u[i:] {
			row[at] = x * y
			at++
		}
	}
}

// A surface is a quadratic for each figure that decides about a build.
type surface struct {
	m       *Model
	corners []cornerSurface
}

// cornerSurface holds coefficients; nil: the figure decides nothing here.
type cornerSurface struct {
	gain, peak, soft, end, frequency []float64
	lost                             bool // most builds do not even have the figures
}

func newSurface(m *Model, u [][]float64, builds []Build) *surface {
	s := &surface{m: m}
	fit := func(k int, value func(c *Corner) float64) []float64 {
		n := features(len(m.Sources))
		var rows [][]float64
		var y []float64
		for i := range builds {
			if x := value(&builds[i].Corners[k]); !math.IsNaN(x) && !math.IsInf(x, 0) {
				row := make([]float64, n)
				fillFeatures(row, u[i])
				rows, y = append(rows, row), append(y, x)
			}
		}
		if len(rows) < 2*n {
			return nil
		}
		a := mat.NewDense(len(rows), n, nil)
		for i, row := range rows {
			a.SetRow(i, row)
		}
		var qr mat.QR
		qr.Factorize(a)
		var c mat.VecDense
		if qr.SolveVecTo(&c, false, mat.NewVecDense(len(y), y)) != nil {
			return nil
		}
		return slices.Clone(c.RawVector().Data)
	}
	for k := range m.design.Job.Corners {
		served, complete := 0, 0
		for i := range builds {
			if c := &builds[i].Corners[k]; c.Status == tank.OK {
				served++
				if c.SoftMargin > 0 {
					complete++
				}
			}
		}
		c := cornerSurface{lost: 2*served < len(builds)}
		c.gain = fit(k, func(c *Corner) float64 { return c.GainMargin })
		c.peak = fit(k, func(c *Corner) float64 { return c.PeakMargin })
		// The margin means something else below zero: the surface is that of the
		// complete swings where there are enough.
		c.soft = fit(k, func(c *Corner) float64 {
			if c.SoftMargin <= 0 {
				return math.NaN()
			}
			return c.SoftMargin
		})
		if c.soft == nil || 2*complete < served {
			c.soft = fit(k, func(c *Corner) float64 { return c.SoftMargin })
		}
		// A swing may be quick and the node still be lost before the dead time ends.
		c.end = fit(k, func(c *Corner) float64 { return c.EndCurrent })
		if m.design.Job.Corners[k].OutputVoltage > 0 {
			c.frequency = fit(k, func(c *Corner) float64 { return c.Frequency })
		}
		s.corners = append(s.corners, c)
	}
	return s
}

// judge predicts whether a build works and whether it keeps the limits. row is
// scratch for the features.
func (s *surface) judge(u, row []float64) (works, keeps bool) {
	fillFeatures(row, u)
	at := func(c []float64) float64 {
		sum := 0.0
		for i, x := range c {
			sum += x * row[i]
		}
		return sum
	}
	l, highest := s.m.design.Job.Build.Limits, s.m.design.Job.Tank.FrequencyMax
	works, keeps = true, true
	for i := range s.corners {
		c := &s.corners[i]
		works = works && !c.lost
		if c.gain != nil {
			x := at(c.gain)
			works, keeps = works && x >= 0, keeps && x >= l.GainMargin
		}
		if c.peak != nil {
			keeps = keeps && at(c.peak) >= l.PeakFrequencyMargin
		}
		if c.soft != nil {
			x := at(c.soft)
			works, keeps = works && x > 0, keeps && x >= l.SoftSwitchingMargin
		}
		if c.end != nil {
			works = works && at(c.end) > 0
		}
		if c.frequency != nil {
			works = works && at(c.frequency) <= highest
		}
	}
	return works, works && keeps
}

// costs asks what each tolerance does. The exact yield is moved by what the
// surface says of the same builds with one source changed.
func (m *Model) costs(r *Result, builds []Build, u [][]float64, s *surface) {
	row := make([]float64, features(len(m.Sources)))
	share := func(list [][]float64) (works, keeps float64) {
		for _, x := range list {
			a, b := s.judge(x, row)
			if a {
				works++
			}
			if b {
				keeps++
			}
		}
		n := float64(len(list))
		return works / n, keeps / n
	}
	differ := 0
	for i := range builds {
		a, b := s.judge(u[i], row)
		if a != (len(m.works(&builds[i])) == 0) || b != (len(m.keeps(&builds[i])) == 0) {
			differ++
		}
	}
	r.Differ = float64(differ) / float64(len(builds))
	works, keeps := share(u)
	changed := make([][]float64, len(u))
	for j, source := range m.Sources {
		c := Cost{Source: source}
		for v, scale := range [3]float64{0, 0.5, 2} {
			for i := range u {
				changed[i] = append(changed[i][:0], u[i]...)
				changed[i][j] *= scale
			}
			w, k := share(changed)
			c.Works[v] = math.Min(math.Max(r.Works.Share+w-works, 0), 1)
			c.Keeps[v] = math.Min(math.Max(r.Keeps.Share+k-keeps, 0), 1)
		}
		r.Costs = append(r.Costs, c)
	}
}
