package tolerance

import (
	"context"
	"fmt"
	"math"
	"os"
	"runtime"
	"sync"
	"testing"

	"gapwright/corelib/material"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/design"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
	"gapwright/tank"
)

func tables() design.Tables {
	return design.Tables{Shapes: shape.Embedded(), Ferrites: material.Embedded(), Wires: &wire.Table{}}
}

var (
	rateOnce sync.Once
	rating   design.Design
)

// rated returns a finished build, rated, that a test may change.
func rated(t testing.TB) *design.Design {
	t.Helper()
	rateOnce.Do(func() {
		data, err := os.ReadFile("../../testdata/page/build.yaml")
		if err != nil {
			t.Fatal(err)
		}
		b, err := job.ReadBuild("build.yaml", data)
		if err != nil {
			t.Fatal(err)
		}
		d, err := design.Check(context.Background(), b.Job, b.Transformer, b.Inductor, tables())
		if err != nil {
			t.Fatal(err)
		}
		rating = *d
	})
	if rating.Rating == nil {
		t.Fatal("the build could not be rated")
	}
	d, transformer, inductor := rating, *rating.Rating, *rating.InductorRating
	d.Rating, d.InductorRating = &transformer, &inductor
	return &d
}

func model(t testing.TB, d *design.Design) *Model {
	t.Helper()
	m, err := New(d, tables())
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// only leaves the given tolerances; warmth moves nothing.
func only(d *design.Design, set func(t *job.Tolerances)) {
	t := &d.Job.Build.Tolerances
	*t = job.Tolerances{}
	set(t)
	d.AsBuilt.WindingCapacitance = 0
	d.Rating.HotInductance = d.Rating.OpenInductance
	d.InductorRating.HotInductance = d.InductorRating.OpenInductance
}

func both(x float64) [2]float64 { return [2]float64{x, x} }

// TestAgainstLinearPropagation holds the deviations of a run with small spreads
// against the closed forms: a uniform tolerance has a deviation of 1/sqrt 3 of
// it; Lr = Lext + Lsc and Lm = Lp - Lsc without stray inductance, and the
// resonance goes with (Lr Cr)^(-1/2). 1.5 %: the sources of n builds correlate by
// chance with a deviation of 1/sqrt n, which moves that of a sum by half of it at
// most, 0.35 % here; the terms of second order are below 1 % of these spreads.
func TestAgainstLinearPropagation(t *testing.T) {
	d := rated(t)
	const open, leak, ext, cr = 0.004, 0.01, 0.003, 0.005
	only(d, func(t *job.Tolerances) {
		t.OpenInductance, t.InductorInductance, t.ResonantCapacitance = both(open), both(ext), both(cr)
		t.ShortInductance.Concentric = both(leak)
	})
	d.Job.Corners = nil
	r, err := model(t, d).Run(t.Context(), Options{20000, 7, Uniform}, nil)
	if err != nil {
		t.Fatal(err)
	}
	lp, lsc, lext := d.Rating.OpenInductance, d.Rating.ShortInductance, d.InductorRating.OpenInductance
	lr := lext + lsc
	// The A_L tolerance is of Lp as the shop reads it.
	want := map[string][2]float64{
		"Lr":        {lr, math.Hypot(lext*ext, lsc*leak) / math.Sqrt(3)},
		"Lm":        {lp - lsc, math.Hypot(lp*open, lsc*leak) / math.Sqrt(3)},
		"resonance": {1 / (2 * math.Pi * math.Sqrt(lr*d.AsBuilt.Cr)), math.Hypot(math.Hypot(lext*ext, lsc*leak)/lr, cr) / 2 / math.Sqrt(3) / (2 * math.Pi * math.Sqrt(lr*d.AsBuilt.Cr))},
	}
	seen := 0
	for _, b := range r.Bands {
		w, ok := want[b.Name]
		if !ok {
			continue
		}
		seen++
		if math.Abs(b.Nominal/w[0]-1) > 1e-6 || math.Abs(b.Mean/w[0]-1) > 1e-4 || math.Abs(b.Sigma/w[1]-1) > 0.015 {
			t.Errorf("%s: nominal %g, mean %g, deviation %g; by hand %g and %g", b.Name, b.Nominal, b.Mean, b.Sigma, w[0], w[1])
		}
		if !(b.Least < b.Low && b.High < b.Most) {
			t.Errorf("%s: %g .. %g .. %g .. %g", b.Name, b.Least, b.Low, b.High, b.Most)
		}
	}
	if seen != len(want) {
		t.Errorf("%d of %d figures", seen, len(want))
	}
}

// TestKnownYield: with one value alone spread, the gain margin follows it, and a
// limit that lies where the value is at a known place has a known yield. The
// hypercube puts one build in each of its parts: 1 % is two of 200. The response
// surface must know what half and twice the tolerance give: 1.5 %, the bend of the
// gain over a tenth of Cr.
func TestKnownYield(t *testing.T) {
	d := rated(t)
	only(d, func(t *job.Tolerances) { t.ResonantCapacitance = both(0.05) })
	for i := range d.Job.Corners {
		if d.Job.Corners[i].Name == "hold-up" {
			d.Job.Corners = d.Job.Corners[i : i+1]
			break
		}
	}
	m := model(t, d)
	if len(m.Sources) != 2 || m.Sources[0].What != "Cr" {
		t.Fatalf("sources %+v", m.Sources)
	}
	at := m.build([]float64{0.5, 0}, false).Corners[0].GainMargin
	below := m.build([]float64{-0.5, 0}, false).Corners[0].GainMargin
	rising := at > below
	l := &d.Job.Build.Limits
	l.GainMargin, l.PeakFrequencyMargin, l.SoftSwitchingMargin = at, -1, -1
	r, err := m.Run(t.Context(), Options{200, 1, Uniform}, nil)
	if err != nil {
		t.Fatal(err)
	}
	share := func(above float64) float64 { // of the spread above a place
		if rising {
			return above
		}
		return 1 - above
	}
	if math.Abs(r.Keeps.Share-share(0.25)) > 0.01 {
		t.Errorf("%.3f keep the limit, want %.3f", r.Keeps.Share, share(0.25))
	}
	c := r.Costs[0]
	for i, want := range []float64{share(0), share(0), share((1 - 0.25) / 2)} {
		if i == 1 {
			// At half the tolerance the place is its very end.
			want = share(0)
		}
		if math.Abs(c.Keeps[i]-want) > 0.015 {
			t.Errorf("case %d: %.3f keep the limit, want %.3f", i, c.Keeps[i], want)
		}
	}
	if r.Differ > 0.01 {
		t.Errorf("the surface judges %.3f otherwise", r.Differ)
	}
	if r.Works.Share != 1 {
		t.Errorf("%.3f work", r.Works.Share)
	}
}

// TestSameOnAnyNumberOfProcessors: the same seed gives the same result, another
// another.
func TestSameOnAnyNumberOfProcessors(t *testing.T) {
	d := rated(t)
	only(d, func(t *job.Tolerances) { t.OpenInductance, t.DeadTime = both(0.07), both(0.1) })
	d.Job.Corners = d.Job.Corners[2:3]
	m := model(t, d)
	run := func(procs int, seed uint64) string {
		defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(procs))
		r, err := m.Run(t.Context(), Options{60, seed, Normal}, nil)
		if err != nil {
			t.Fatal(err)
		}
		return fmt.Sprintf("%+v", r)
	}
	one := run(1, 3)
	if three := run(3, 3); three != one {
		t.Errorf("one processor:\n%s\nthree:\n%s", one, three)
	}
	if other := run(2, 4); other == one {
		t.Error("another seed changes nothing")
	}
}

// TestGapAndCore holds the inductance of a part whose gap length governs against
// the field solved again for the changed gap and permeability. The gap is
// interpolated (2e-4); a core of another permeability is a reluctance in series
// with the gap, which does not know that the field around the gap shifts with it:
// 1e-3 at a quarter more or less.
func TestGapAndCore(t *testing.T) {
	base := rated(t)
	for _, kind := range []part.GapKind{part.Ground, part.Spacer} {
		d, tr, rating := *base, *base.Transformer, *base.Rating
		d.Transformer, d.Rating = &tr, &rating
		g := &tr.Core.Gap
		g.Governs = "length"
		if kind == part.Spacer {
			x := g.Total / 2
			*g = part.Gap{Kind: part.Spacer, Thickness: x, Total: 2 * x, Foils: []float64{x}, Under: "all legs"}
		}
		field := func(by, permeability float64) float64 {
			t.Helper()
			gap := tr.Core.Gap
			if kind == part.Spacer {
				gap.Thickness += by
			} else {
				gap.Total += by
			}
			coil, err := part.NewCoil(tr.Construction, part.Conditions{Shapes: shape.Embedded(), Ferrites: material.Embedded(), TestTemp: 25, Permeability: permeability,
				Bulge: winding.Bulge{Litz: 0.12, Solid: 0.05, Foil: 0.1}})
			if err != nil {
				t.Fatal(err)
			}
			var s part.Solvers
			l, err := coil.Inductances(&s, gap, 25, 0)
			if err != nil {
				t.Fatal(err)
			}
			return l[0][0]
		}
		rating.OpenInductance = field(0, 1)
		m := model(t, &d)
		x := &m.transformer
		if x.byAL || x.sources.gap < 0 || x.sources.area < 0 {
			t.Fatalf("%s: sources %+v", kind, m.Sources)
		}
		near := func(what string, got, want, tolerance float64) {
			t.Helper()
			if math.Abs(got/want-1) > tolerance {
				t.Errorf("%s, %s: %g H, the field gives %g", kind, what, got, want)
			}
		}
		u := make([]float64, len(m.Sources))
		near("as designed", m.inductance(x, u), rating.OpenInductance, 1e-4)
		for _, end := range []float64{-1, 1} {
			u[x.sources.gap] = end
			near("gap at its end", m.inductance(x, u), field(m.deviation(x.sources.gap, u), 1), 2e-4)
			u[x.sources.gap] = 0
			u[x.sources.permeability] = end
			near("permeability at its end", m.inductance(x, u), field(0, m.value(x.sources.permeability, u)), 1e-3)
			u[x.sources.permeability] = 0
		}
		// More area: more inductance, by at most the area's share.
		u[x.sources.area] = 1
		more := m.inductance(x, u)/rating.OpenInductance - 1
		if most := m.deviation(x.sources.area, u); more < 0.6*most || more > most*(1+1e-3) {
			t.Errorf("%s: %.4f more inductance with %.4f more area", kind, more, most)
		}
	}
}

// TestWilson against the closed forms of its ends: none in n reach up to
// z²/(n + z²), half of them lie within z/(2 sqrt(n + z²)).
func TestWilson(t *testing.T) {
	const z2 = 3.841458820694124 // 95 % point of chi squared with one degree of freedom
	for _, n := range []int{10, 200, 2000} {
		none, half := wilson(0, n), wilson(n/2, n)
		if none.Low != 0 || math.Abs(none.High-z2/(float64(n)+z2)) > 1e-12 {
			t.Errorf("none of %d: %+v", n, none)
		}
		if want := math.Sqrt(z2/(float64(n)+z2)) / 2; math.Abs(half.High-0.5-want) > 1e-12 || math.Abs(0.5-half.Low-want) > 1e-12 {
			t.Errorf("half of %d: %+v, want +-%g", n, half, want)
		}
	}
}

// TestMissedCorners: builds that miss a corner are counted, not dropped, and
// leave no number that is none.
func TestMissedCorners(t *testing.T) {
	d := rated(t)
	only(d, func(t *job.Tolerances) { t.OpenInductance = both(0.3) })
	// hold-up runs at 68.7 kHz as designed.
	d.AsBuilt.FrequencyMin = 68e3
	for i := range d.Job.Corners {
		if d.Job.Corners[i].Name == "hold-up" {
			d.Job.Corners = []tank.Corner{d.Job.Corners[i]}
			break
		}
	}
	r, err := model(t, d).Run(t.Context(), Options{100, 1, Uniform}, nil)
	if err != nil {
		t.Fatal(err)
	}
	if !(r.Works.Share > 0.4 && r.Works.Share < 1) || len(r.Misses) == 0 {
		t.Errorf("%+v work, %+v", r.Works, r.Misses)
	}
	for _, b := range r.Bands {
		for _, x := range []float64{b.Mean, b.Sigma, b.Low, b.High, b.Least, b.Most} {
			if math.IsNaN(x) || math.IsInf(x, 0) {
				t.Errorf("%+v", b)
			}
		}
		if b.Name == "frequency" && !(b.Known < 1) {
			t.Errorf("every build has a frequency, though %v work", r.Works.Share)
		}
	}
	if _, err := model(t, d).Run(t.Context(), Options{5, 1, Uniform}, nil); err == nil {
		t.Error("five builds tell something")
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := model(t, d).Run(ctx, Options{100, 1, Uniform}, nil); err == nil {
		t.Error("a run goes on after it was cancelled")
	}
}

func BenchmarkRun(b *testing.B) {
	m := model(b, rated(b))
	builds := 0
	for b.Loop() {
		r, err := m.Run(b.Context(), Options{2000, 1, Uniform}, nil)
		if err != nil {
			b.Fatal(err)
		}
		builds += r.Builds + r.Extremes + pilotFactor*features(len(m.Sources))
	}
	b.ReportMetric(float64(builds)/b.Elapsed().Seconds(), "builds/s")
}
