package field

import "testing"

// fiveLayers is a gapped transformer window: P/2 - SA - SB - P/2 and an idle
// layer, three unit solutions.
func fiveLayers() *Problem {
	p := &Problem{Breadth: 25e-3, Depth: 7e-3, PostHalfWidth: 5e-3, Units: 3, Modes: 64, CorePermeance: 500e-9,
		Gaps: []Gap{{12.5e-3, 0.6e-3}}}
	for i, u := range []int{0, 1, 2, 0, 0} {
		x := 1.6e-3 + float64(i)*1e-3
		at := 1 / 3.
		if u > 0 {
			at = 1
		}
		p.Sources = append(p.Sources, Source{Rect: Rect{x, x + 0.8e-3, 2e-3, 23e-3}, Unit: u, AmpereTurns: at})
	}
	return p
}

func BenchmarkWindow(b *testing.B) {
	for _, c := range []struct {
		name   string
		radius float64
	}{{"planar", 0}, {"round", 6e-3}} {
		p := fiveLayers()
		p.PostRadius = c.radius
		var s Solver
		xx, yy := make([]float64, 9), make([]float64, 9)
		b.Run(c.name+"/layers=5/modes=64/units=3/solve", func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if err := s.Solve(p); err != nil {
					b.Fatal(err)
				}
			}
		})
		b.Run(c.name+"/layers=5/modes=64/units=3/solve+means", func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if err := s.Solve(p); err != nil {
					b.Fatal(err)
				}
				for _, r := range p.Sources {
					s.Mean(r.Rect, 1, xx, yy)
				}
			}
			b.ReportMetric(float64(b.N)/b.Elapsed().Seconds(), "windows/s")
		})
	}
}

func BenchmarkHead(b *testing.B) {
	p := fiveLayers()
	var s HeadSolver
	xx, yy := make([]float64, 9), make([]float64, 9)
	b.ReportAllocs()
	for b.Loop() {
		if err := s.Solve(p.Breadth, 3, p.Sources); err != nil {
			b.Fatal(err)
		}
		for _, r := range p.Sources {
			s.Mean(r.Rect, 1, xx, yy)
		}
	}
}
