package design

import (
	"cmp"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gapwright/corelib/shape"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
)

// A front against its definition: sorted, and everything left out is beaten.
func TestFront(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for range 200 {
		var f front
		var all []quick
		for range 1 + r.IntN(60) {
			q := quick{height: float64(r.IntN(20)), mean: float64(r.IntN(20))}
			all = append(all, q)
			f.add(q)
		}
		var want []quick
		slices.SortFunc(all, func(a, b quick) int { return cmp.Or(cmp.Compare(a.height, b.height), cmp.Compare(a.mean, b.mean)) })
		best := math.Inf(1)
		for _, q := range all {
			if q.mean < best {
				best = q.mean
				want = append(want, q)
			}
		}
		if !slices.EqualFunc([]quick(f), want, func(a, b quick) bool { return a.height == b.height && a.mean == b.mean }) {
			t.Fatalf("front of %v: %v, want %v", all, f, want)
		}
	}
}

func TestStockFilm(t *testing.T) {
	stock := job.Gap{SpacerFoils: []float64{0.05e-3, 0.1e-3, 0.25e-3}}
	for _, c := range []struct {
		want  float64
		sum   float64
		films int
	}{{0.12e-3, 0.1e-3, 1}, {0.14e-3, 0.15e-3, 2}, {0.3e-3, 0.3e-3, 2}, {0.41e-3, 0.4e-3, 3}, {2e-3, 0.75e-3, 3}, {0.001e-3, 0.05e-3, 1}} {
		g := stockFilm(part.Gap{Kind: part.Spacer, Thickness: c.want}, stock)
		if math.Abs(g.Thickness-c.sum) > 1e-9 || len(g.Foils) != c.films {
			t.Errorf("%g mm: %g mm of %v", 1e3*c.want, 1e3*g.Thickness, g.Foils)
		}
	}
	ground := part.Gap{Kind: part.Ground, Total: 1e-3, Pieces: 2}
	if g := stockFilm(ground, stock); g.Total != ground.Total || g.Kind != part.Ground {
		t.Errorf("%+v", g)
	}
}

// The quick way to a gap against the bracketing one of package part: within
// 0.05 % of the inductance, with fewer fields.
func TestGapFor(t *testing.T) {
	s := prepared(t, job.Demo())
	for _, name := range []string{"ETD 39/20/13", "PQ 26/25", "E 32/16/9"} {
		sh, err := shape.Embedded().Find(name)
		if err != nil {
			t.Fatal(err)
		}
		list, reason := s.inductors(sh, 50e-6)
		if len(list) == 0 {
			t.Fatalf("%s: %+v", name, reason)
		}
		var solvers part.Solvers
		cond := s.conditions(s.inductorLimits, false)
		for _, like := range []part.Gap{{Kind: part.Ground, Pieces: 1}, {Kind: part.Ground, Pieces: 3}, {Kind: part.Spacer}} {
			c, err := part.NewCoil(s.inductorPart(list[0].inductorPlan).Construction, cond)
			if err != nil {
				t.Fatal(err)
			}
			g, n, err := gapFor(c, &solvers, like, 50e-6, cond, openInductance)
			if err != nil {
				t.Fatal(err)
			}
			l, err := c.Inductances(&solvers, g, cond.TestTemp, cond.Modes)
			if err != nil {
				t.Fatal(err)
			}
			if off := l[0][0]/50e-6 - 1; math.Abs(off) > 5e-4 || n > 6 {
				t.Errorf("%s, %s: off by %.2g after %d fields", name, like.Kind, off, n)
			}
		}
	}
}

// The heat bound: a part that is as hot as allowed loses no more than that.
func TestMostHeat(t *testing.T) {
	s := prepared(t, job.Demo())
	for _, name := range []string{"ETD 34/17/11", "RM 12", "PQ 32/30"} {
		sh, err := shape.Embedded().Find(name)
		if err != nil {
			t.Fatal(err)
		}
		former, err := s.former(sh, 1, s.transformerLimits.Cores)
		if err != nil {
			t.Fatal(err)
		}
		heat, err := s.mostHeat(sh, former, s.transformerLimits.Limits)
		if err != nil {
			t.Fatal(err)
		}
		var solvers part.Solvers
		r, err := s.rateTransformers(t.Context(), sh, &solvers)
		if err != nil || r.rating == nil {
			t.Fatal(err)
		}
		for _, c := range r.rating.Corners {
			l := s.transformerLimits.Limits
			if c.Continuous && c.WindingTemperature <= l.WindingTemperature && c.CoreTemperature <= l.CoreTemperature && c.Loss() > heat {
				t.Errorf("%s loses %g W at corner %s and is cool, the bound is %g W", name, c.Loss(), c.Name, heat)
			}
			if c.Continuous && c.Loss() > heat && c.WindingTemperature <= l.WindingTemperature {
				t.Errorf("%s: %g W at %g °C", name, c.Loss(), c.WindingTemperature)
			}
		}
		// A bound that is never near is no bound.
		if heat > 6 || heat < 2 {
			t.Errorf("%s: %g W", name, heat)
		}
	}
}

func TestWhoInsulates(t *testing.T) {
	for _, c := range []struct{ core, winding, want string }{
		{"primary", "either", "secondary"}, {"secondary", "either", "primary"}, {"floating", "either", "secondary primary"}, {"primary", "primary", "primary"},
	} {
		j := job.Demo()
		in := &j.Build.Transformer.Insulation
		in.CoreCountsAs, in.InsulatedWinding = c.core, c.winding
		s := &search{job: j, transformerLimits: j.Build.For(job.Transformer)}
		got := ""
		for i, b := range s.builds() {
			if i > 0 {
				got += " "
			}
			got += b.Insulated
		}
		if got != c.want {
			t.Errorf("core %s, insulated %s: %q, want %q", c.core, c.winding, got, c.want)
		}
	}
}
