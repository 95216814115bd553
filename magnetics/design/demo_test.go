package design

import (
	"context"
	"testing"
	"time"

	"gapwright/corelib/material"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/job"
)

func TestDemo(t *testing.T) {
	start := time.Now()
	d, err := Run(context.Background(), job.Demo(), Tables{shape.Embedded(), material.Embedded(), &wire.Table{}}, nil)
	t.Log(time.Since(start))
	if d != nil {
		for _, x := range d.Ladder {
			t.Logf("%+v", x)
		}
	}
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("it %d res %g", d.Iterations, d.Residual)
	for _, v := range d.Verdicts {
		t.Logf("%+v", v)
	}
	for _, v := range d.Warnings {
		t.Logf("%+v", v)
	}
	for _, v := range d.Checks {
		t.Logf("%+v", v)
	}
	for _, e := range d.Transformer.Build {
		t.Logf("%+v", e)
	}
	for _, w := range d.Transformer.Windings {
		t.Logf("%+v", w)
	}
	for _, e := range d.Inductor.Build {
		t.Logf("%+v", e)
	}
	for _, w := range append(d.Rating.Windings, d.InductorRating.Windings...) {
		t.Logf("%+v", w)
	}
	for _, c := range append(d.Rating.Corners, d.InductorRating.Corners...) {
		t.Logf("%+v", c)
	}
	t.Logf("%+v %+v", d.Rating.Gap, d.InductorRating.Gap)
	t.Logf("Lp %g Ls %g Lsc %v Lm %g n %g  arr %s", d.Rating.OpenInductance, d.Rating.SecondaryInductance, d.Rating.ShortHalves, d.Rating.MagnetizingInduct, d.Rating.EffectiveTurnsRatio, d.Rating.Arrangement)
}
