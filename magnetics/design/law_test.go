package design

import (
	"math"
	"testing"

	"gapwright/corelib/material"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
)

// TestGapLaw holds the tabulated law against the field solved directly at gaps
// between its points, against the plain reluctance of a long gap, and a film on
// a ground gap against a film alone.
func TestGapLaw(t *testing.T) {
	w, err := wire.Parse("60 x 0.1 mm litz")
	if err != nil {
		t.Fatal(err)
	}
	entry := func(name string, turns int) winding.Entry {
		return winding.Entry{Kind: winding.Wind, Names: []string{name}, Of: []string{name}, Turns: turns, Wire: w, Parallel: 1, Layers: 2, Spread: "full", Direction: "cw"}
	}
	c := part.Construction{
		Core:     part.Core{Shape: "ETD 39/20/13", Material: "PW3", Pieces: 2, Gap: part.Gap{Kind: part.Ground, Total: 0.6e-3, Pieces: 1, Half: "upper"}},
		Former:   part.Former{Name: "ETD 39/20/13", Chambers: 1},
		Windings: []part.Winding{{Name: "P", Turns: 30}, {Name: "S", Turns: 10}},
		Build:    []winding.Entry{entry("P", 30), {Kind: winding.Tape, Thickness: 0.06e-3, TapeLayers: 3}, entry("S", 10)},
	}
	tables := Tables{shape.Embedded(), material.Embedded(), &wire.Table{}}
	j := job.Demo()
	law, err := NewGapLaw(j, job.Transformer, c, 2e-3, tables)
	if err != nil {
		t.Fatal(err)
	}
	s, err := newSearch(j, tables)
	if err != nil {
		t.Fatal(err)
	}
	cond := s.conditions(s.transformerLimits, false)
	coil, err := part.NewCoil(c, cond)
	if err != nil {
		t.Fatal(err)
	}
	var solvers part.Solvers
	for _, g := range []float64{0.13e-3, 0.37e-3, 0.61e-3, 1.05e-3} {
		for _, gap := range []part.Gap{{Kind: part.Ground, Total: g, Pieces: 1}, {Kind: part.Spacer, Thickness: g, Total: 2 * g, Pieces: 1}} {
			want, err := coil.Inductances(&solvers, gap, cond.TestTemp, cond.Modes)
			if err != nil {
				t.Fatal(err)
			}
			var got float64
			if gap.Kind == part.Ground {
				got, err = law(g, 0)
			} else {
				got, err = law(0, g)
			}
			// The correction that is computed with the law is to be good to 1.5 %;
			// the table must not take a tenth of that.
			if err != nil || math.Abs(got/want[0][0]-1) > 1.5e-3 {
				t.Errorf("%s %g mm: law %g, field %g H, %v", gap.Kind, g*1e3, got, want[0][0], err)
			}
		}
	}
	last := math.Inf(1)
	for g := 0.0; g <= 1.5e-3; g += 0.05e-3 {
		l, err := law(g, 0.2e-3)
		if err != nil || l >= last {
			t.Fatalf("at %g mm: %g H after %g, %v", g*1e3, l, last, err)
		}
		last = l
	}
	for _, bad := range [][2]float64{{-1e-4, 0}, {0, -1e-4}, {1.5e-3, 0.6e-3}, {math.NaN(), 0}} {
		if l, err := law(bad[0], bad[1]); err == nil {
			t.Errorf("law(%v) = %g without an error", bad, l)
		}
	}
}
