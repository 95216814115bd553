package tolerance

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"slices"
	"sync/atomic"

	"golang.org/x/sync/errgroup"
	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"
)

// A Spread is how values lie between their tolerances.
type Spread string

// The spreads.
const (
	Uniform Spread = "uniform" // anywhere with the same chance: all that a tolerance promises
	Normal  Spread = "normal"  // the tolerance is three standard deviations, what lies beyond is cut off
)

// Options of a run.
type Options struct {
	Builds int // at least 10
	Seed   uint64
	Spread Spread
}

// A Result is what a run found. The same model, options and seed give the same
// result on any number of processors.
type Result struct {
	Options
	Works    Yield // every corner reached, every swing complete
	Keeps    Yield // every limit of the job kept with its reserve
	Bands    []Band
	Extremes int // builds with every value at one of its ends
	Misses   []Count
	Costs    []Cost
	Differ   float64 // share of the builds that the response surface behind Costs judges otherwise than the exact solution
	Outside  Yield   // builds whose open inductance, cold, lies outside what the shop must meet; Share 0 where nothing is asked for
}

// A Yield is a share of builds with its 95 % interval.
type Yield struct{ Share, Low, High float64 }

// wilson returns the share of count in n with the score interval of E. B. Wilson,
// J. American Statistical Association 22, 1927, at 95 %.
func wilson(count, n int) Yield {
	if n == 0 {
		return Yield{}
	}
	const z = 1.959963984540054
	p, m := float64(count)/float64(n), float64(n)
	center := (p + z*z/(2*m)) / (1 + z*z/m)
	half := z / (1 + z*z/m) * math.Sqrt(p*(1-p)/m+z*z/(4*m*m))
	return Yield{p, math.Max(center-half, 0), math.Min(center+half, 1)}
}

// A Band is one figure over all builds. Figures of corners that are not reached
// are left out of it; Known tells the share that had one.
type Band struct {
	Name, Corner, Unit string
	Nominal            float64 // as designed, cold; NaN when unknown
	Mean, Sigma        float64
	Low, High          float64 // between which 95 % of the builds lie
	Least, Most        float64 // over all builds and extremes
	Known              float64
}

// A Count is how many builds miss a limit.
type Count struct {
	Miss
	Function bool // the build does not work; else it eats into the reserve
	Share    float64
}

// A Cost is what one tolerance does to the yields, by a response surface fitted
// to exact builds: with the value exact, with half and with twice the tolerance.
type Cost struct {
	Source       Source
	Works, Keeps [3]float64
}

// Run builds the model many times. progress may be nil. The error is that of the
// context, or names an option that makes no sense.
func (m *Model) Run(ctx context.Context, opts Options, progress func(done, total int)) (*Result, error) {
	if opts.Builds < 10 {
		return nil, fmt.Errorf("%d builds: at least 10 are needed to tell anything", opts.Builds)
	}
	if opts.Spread != Uniform && opts.Spread != Normal {
		return nil, fmt.Errorf("unknown spread %q: uniform or normal", opts.Spread)
	}
	pilot := m.sample(pilotFactor*features(len(m.Sources)), opts.Seed, pilotStream, func(q float64) float64 { return reach * (2*q - 1) })
	spread := m.sample(opts.Builds, opts.Seed, buildStream, opts.Spread.quantile)
	extremes := m.extremes()
	all := slices.Concat(spread, pilot, extremes)
	builds := make([]Build, len(all))
	g, ctx := errgroup.WithContext(ctx)
	g.SetLimit(runtime.GOMAXPROCS(0))
	var done atomic.Int64
	const chunk = 16
	for from := 0; from < len(all); from += chunk {
		g.Go(func() error {
			for i := from; i < min(from+chunk, len(all)); i++ {
				if err := ctx.Err(); err != nil {
					return err
				}
				builds[i] = m.build(all[i], false)
			}
			if n := done.Add(int64(min(from+chunk, len(all)) - from)); progress != nil {
				progress(int(n), len(all))
			}
			return nil
		})
	}
	if err := g.Wait(); err != nil {
		return nil, err
	}
	random := builds[:len(spread)]
	trial := builds[len(spread) : len(spread)+len(pilot)]
	ends := builds[len(spread)+len(pilot):]

	r := &Result{Options: opts, Extremes: len(ends)}
	m.judge(r, random, spread)
	m.bands(r, random, ends)
	m.costs(r, random, spread, newSurface(m, pilot, trial))
	return r, nil
}

// Streams of random numbers of one seed.
const (
	buildStream = 1
	pilotStream = 2
)

func (s Spread) quantile(q float64) float64 {
	if s == Uniform {
		return 2*q - 1
	}
	// Three standard deviations are the whole, cut off there.
	edge := distuv.UnitNormal.CDF(-3)
	return distuv.UnitNormal.Quantile(edge+q*(1-2*edge)) / 3
}

// sample draws a Latin hypercube: every source visits each of n equal parts of
// its spread once.
//
// Source: M. D. McKay, R. J. Beckman, W. J. Conover, Technometrics 21, 1979.
func (m *Model) sample(n int, seed, stream uint64, quantile func(float64) float64) [][]float64 {
	list := make([][]float64, n)
	for i := range list {
		list[i] = make([]float64, len(m.Sources))
	}
	random := rand.New(rand.NewPCG(seed, stream))
	for j := range m.Sources {
		for part, i := range random.Perm(n) {
			list[i][j] = quantile((float64(part) + random.Float64()) / float64(n))
		}
	}
	return list
}

// extremes returns every combination of the ends, sources of one group together.
func (m *Model) extremes() [][]float64 {
	var used []int
	for g := range groups {
		if slices.ContainsFunc(m.Sources, func(s Source) bool { return s.group == g }) {
			used = append(used, g)
		}
	}
	list := make([][]float64, 1<<len(used))
	for bits := range list {
		u := make([]float64, len(m.Sources))
		for i, s := range m.Sources {
			u[i] = s.sign
			if bits>>slices.Index(used, s.group)&1 == 0 {
				u[i] = -s.sign
			}
		}
		list[bits] = u
	}
	return list
}

// judge counts the builds that work and those that keep the limits.
func (m *Model) judge(r *Result, builds []Build, u [][]float64) {
	works, keeps, outside := 0, 0, 0
	type key struct {
		Miss
		function bool
	}
	count := map[key]int{}
	want := m.design.Transformer.OpenInductance
	for i := range builds {
		a, b := m.works(&builds[i]), m.keeps(&builds[i])
		if len(a) == 0 {
			works++
		}
		if len(b) == 0 {
			keeps++
		}
		for _, x := range a {
			count[key{x, true}]++
		}
		for _, x := range b {
			// Where it does not work there is no reserve to speak of.
			if !slices.ContainsFunc(a, func(y Miss) bool { return y.Corner == x.Corner }) {
				count[key{x, false}]++
			}
		}
		if want != nil && want.Value > 0 && math.Abs(m.inductance(&m.transformer, u[i])/want.Value-1) > want.Tolerance {
			outside++
		}
	}
	n := len(builds)
	r.Works, r.Keeps = wilson(works, n), wilson(keeps, n)
	if outside > 0 {
		r.Outside = wilson(outside, n)
	}
	for k, c := range count {
		r.Misses = append(r.Misses, Count{k.Miss, k.function, float64(c) / float64(n)})
	}
	slices.SortFunc(r.Misses, func(a, b Count) int {
		return cmp.Or(cmp.Compare(b.Share, a.Share), cmp.Compare(a.Corner, b.Corner), cmp.Compare(a.Limit, b.Limit))
	})
}

// bands gathers the figures.
func (m *Model) bands(r *Result, builds, ends []Build) {
	add := func(name, corner, unit string, value func(b *Build) float64) {
		b := Band{Name: name, Corner: corner, Unit: unit, Nominal: value(&m.Nominal)}
		var list []float64
		for i := range builds {
			if x := value(&builds[i]); !math.IsNaN(x) {
				list = append(list, x)
			}
		}
		if len(list) < 2 {
			return
		}
		b.Known = float64(len(list)) / float64(len(builds))
		slices.Sort(list)
		b.Mean, b.Sigma = stat.MeanStdDev(list, nil)
		b.Low, b.High = stat.Quantile(0.025, stat.Empirical, list, nil), stat.Quantile(0.975, stat.Empirical, list, nil)
		b.Least, b.Most = list[0], list[len(list)-1]
		for i := range ends {
			if x := value(&ends[i]); !math.IsNaN(x) {
				b.Least, b.Most = math.Min(b.Least, x), math.Max(b.Most, x)
			}
		}
		r.Bands = append(r.Bands, b)
	}
	add("Lp", "", "H", func(b *Build) float64 { return b.Open })
	add("Lsc", "", "H", func(b *Build) float64 { return b.Short })
	if m.inductor != nil {
		add("Lext", "", "H", func(b *Build) float64 { return b.External })
	}
	add("Lr", "", "H", func(b *Build) float64 { return b.Lr })
	add("Lm", "", "H", func(b *Build) float64 { return b.Lm })
	add("turns ratio", "", "", func(b *Build) float64 { return b.Ratio })
	add("resonance", "", "Hz", func(b *Build) float64 { return b.Resonance })
	over := func(pick func(a, b float64) float64, start float64) func(b *Build) float64 {
		return func(b *Build) float64 {
			x := start
			for k, c := range b.Corners {
				// A frequency that is given tells nothing.
				if m.design.Job.Corners[k].OutputVoltage > 0 && !math.IsNaN(c.Frequency) {
					x = pick(x, c.Frequency)
				}
			}
			if math.IsInf(x, 0) {
				return math.NaN()
			}
			return x
		}
	}
	add("lowest frequency", "", "Hz", over(math.Min, math.Inf(1)))
	add("highest frequency", "", "Hz", over(math.Max, math.Inf(-1)))
	for k, c := range m.design.Job.Corners {
		if c.OutputVoltage > 0 {
			add("frequency", c.Name, "Hz", func(b *Build) float64 { return b.Corners[k].Frequency })
		}
	}
	for k, c := range m.design.Job.Corners {
		add("gain margin", c.Name, "%", func(b *Build) float64 { return b.Corners[k].GainMargin })
	}
	for k, c := range m.design.Job.Corners {
		add("soft switching margin", c.Name, "%", func(b *Build) float64 { return b.Corners[k].SoftMargin })
	}
}
