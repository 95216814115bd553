package design

import (
	"context"
	"errors"
	"math"
	"os"
	"testing"

	"gapwright/corelib/material"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/job"
)

// ratedExample is a build file, rated.
func ratedExample(t *testing.T) (*Design, Tables) {
	t.Helper()
	data, err := os.ReadFile("../../testdata/sheet/build.yaml")
	if err != nil {
		t.Fatal(err)
	}
	b, err := job.ReadBuild("build.yaml", data)
	if err != nil {
		t.Fatal(err)
	}
	tables := Tables{Shapes: shape.Embedded(), Ferrites: material.Embedded(), Wires: &wire.Table{}}
	d, err := Check(context.Background(), b.Job, b.Transformer, b.Inductor, tables)
	if err != nil {
		t.Fatal(err)
	}
	return d, tables
}

func effect(t *testing.T, e *Explanation, input string) float64 {
	t.Helper()
	for _, x := range e.Effects {
		if x.Input == input {
			return x.Change
		}
	}
	return 0
}

// Effects that are known without computing them again: the slope of the
// inductance over the gap, the closure Lr = Lext + Lp - Lm, DC resistance over
// the square of the diameter, and what cannot move.
func TestExplainEffects(t *testing.T) {
	d, tables := ratedExample(t)
	ctx := context.Background()
	all, err := ExplainAll(ctx, d, tables)
	if err != nil {
		t.Fatal(err)
	}
	explain := func(name string) *Explanation {
		t.Helper()
		for _, e := range all {
			if e.Quantity == name {
				return e
			}
		}
		t.Fatalf("no explanation of %s", name)
		return nil
	}
	near := func(what string, got, want, tolerance float64) {
		t.Helper()
		if math.Abs(got-want) > tolerance {
			t.Errorf("%s: %g, want %g within %g", what, got, want, tolerance)
		}
	}
	e := explain("transformer.open_inductance")
	if e.Value != d.Rating.OpenInductance || e.Unit != "H" || e.Formula == "" || e.Source == "" || len(e.Inputs) < 5 {
		t.Errorf("%+v", e)
	}
	// The slope is that of the tangent, the step 1 %: second order is 1e-4.
	near("Lp over its gap", effect(t, e, "gap of the transformer"), math.Expm1(d.Rating.Gap.Sensitivity*0.01*d.Rating.Gap.Length), 2e-4)
	near("Lp over the inductor's gap", effect(t, e, "gap of the inductor"), 0, 0)
	near("Lp over Cr", effect(t, e, "Cr"), 0, 0)
	if mu := effect(t, e, "permeability"); !(mu > 0 && mu < 0.002) {
		t.Errorf("Lp over permeability: %g, want a little above zero: the gap rules", mu)
	}
	l := explain("inductor.inductance")
	near("L over its gap", effect(t, l, "gap of the inductor"), math.Expm1(d.InductorRating.Gap.Sensitivity*0.01*d.InductorRating.Gap.Length), 2e-4)
	lr := explain("tank.resonant_inductance")
	near("Lr over the inductor's gap", effect(t, lr, "gap of the inductor"), effect(t, l, "gap of the inductor")*d.InductorRating.OpenInductance/d.AsBuilt.Lr, 2e-5)
	// A corner whose frequency is found: more input voltage, higher frequency.
	f := explain("tank.frequency")
	if f.Corner == "" || !(effect(t, f, "input voltage of all corners") > 0) {
		t.Errorf("frequency: %+v", f)
	}
	// The core follows the ambient nearly one to one; hotter parts shed better.
	c := explain("inductor.core_temperature")
	if x := effect(t, c, "ambient temperature"); !(x > 0.6 && x < 1.05) {
		t.Errorf("core over ambient: %g K per K", x)
	}
}

func TestExplainNames(t *testing.T) {
	d, tables := ratedExample(t)
	_, err := Explain(context.Background(), d, "peak_gain_margin", "", tables)
	if u, ok := errors.AsType[*UnknownQuantityError](err); !ok || u.Nearest[0] != "tank.peak_gain_margin" {
		t.Errorf("error %v", err)
	}
	if _, err := Explain(context.Background(), d, "tank.frequency", "nowhere", tables); err == nil {
		t.Error("a corner that is not there")
	}
	names := Quantities(d)
	if len(names) < 25 {
		t.Errorf("%d quantities", len(names))
	}
}
