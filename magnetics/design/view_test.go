package design

import (
	"context"
	"math"
	"os"
	"testing"

	"gapwright/corelib/material"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
)

// built reads and rates a finished design.
func built(t testing.TB) (*Design, Tables) {
	data, err := os.ReadFile("../../testdata/page/build.yaml")
	if err != nil {
		t.Fatal(err)
	}
	b, err := job.ReadBuild("build.yaml", data)
	if err != nil {
		t.Fatal(err)
	}
	tables := Tables{shape.Embedded(), material.Embedded(), &wire.Table{}}
	d, err := Check(context.Background(), b.Job, b.Transformer, b.Inductor, tables)
	if err != nil {
		t.Fatal(err)
	}
	return d, tables
}

// What a view shows is what the rating says: peaks of the waveforms, flux, loss
// of the strands as built, inductance at the gap as built, output at each
// corner's frequency.
func TestViewIsTheRating(t *testing.T) {
	d, tables := built(t)
	v, err := NewView(d, tables)
	if err != nil {
		t.Fatal(err)
	}
	if len(v.Corners) != len(d.Operations) || len(v.Parts) != 2 {
		t.Fatalf("%d corners, %d parts", len(v.Corners), len(v.Parts))
	}
	near := func(what string, got, want, tolerance float64) {
		t.Helper()
		if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
			t.Errorf("%s: %g, the rating has %g", what, got, want)
		}
	}
	ratings := []*part.Rating{d.Rating, d.InductorRating}
	for k, c := range v.Corners {
		o := &d.Operations[k]
		// 240 samples of a period miss a rounded peak by (pi k/240)^2/2, where the
		// edge bends the current as quickly as the k-th harmonic: 7e-4 for k = 3.
		near(c.Name+" resonant peak", peak(c.Resonant), o.Resonant.Peak, 7e-4)
		near(c.Name+" magnetizing peak", peak(c.Magnetizing), o.Magnetizing.Peak, 7e-4)
		near(c.Name+" secondary peak", peak(c.Secondary[0]), o.Windings[0].Peak, 1e-3)
		for p, r := range ratings {
			// The rating has its flux from samples of its own, and the tank of the
			// round before.
			near(c.Name+" flux of the "+r.Part, peak(c.Flux[p]), r.Corners[k].FluxDensityPeak, 5e-4)
		}
		// The output over frequency passes through the corner; between two points
		// in equal ratios it is nearly straight.
		f := o.Frequency
		at := math.NaN()
		for i := 1; i < len(c.Gain); i++ {
			a, b := c.Gain[i-1], c.Gain[i]
			if a.Frequency <= f && f <= b.Frequency {
				at = a.Output + (b.Output-a.Output)*(f-a.Frequency)/(b.Frequency-a.Frequency)
			}
		}
		near(c.Name+" output", at, o.OutputVoltage, 2e-3)
		z := o.SoftSwitching
		if z == nil || len(c.EdgeTime) == 0 {
			t.Fatalf("%s: no edge", c.Name)
		}
		bridge := o.Corner.InputVoltage / 2
		near(c.Name+" before the edge", c.EdgeBridge[0], -bridge, 1e-6)
		near(c.Name+" after the edge", c.EdgeBridge[len(c.EdgeBridge)-1], bridge, 1e-6)
	}
	for p, r := range ratings {
		view := v.Parts[p]
		total := map[string]float64{}
		for k, c := range r.Corners {
			for w, loss := range c.WindingLoss {
				if c.Continuous {
					total[r.Windings[w].Name] += d.Operations[k].Corner.Share * loss
				}
			}
		}
		for _, s := range view.Strands {
			near(r.Part+" loss of "+s.Winding, s.Built.Loss, total[s.Winding], 1e-9)
			for _, q := range s.Points {
				if q.Diameter == s.Built.Diameter && q.Strands == s.Built.Strands && q.Loss != s.Built.Loss {
					t.Errorf("%s: the point as built has %g W, the winding %g W", s.Winding, q.Loss, s.Built.Loss)
				}
				if q.Loss < q.DC {
					t.Errorf("%s, %g m: loss %g W below that of direct current, %g W", s.Winding, q.Diameter, q.Loss, q.DC)
				}
			}
		}
		middle := view.Gap.Points[gapPoints/2]
		near(r.Part+" inductance at its gap", middle.Field, r.OpenInductance, 1e-3)
		near(r.Part+" slope", math.Log(view.Gap.Points[gapPoints/2+1].Field/view.Gap.Points[gapPoints/2-1].Field)/
			(view.Gap.Points[gapPoints/2+1].Length-view.Gap.Points[gapPoints/2-1].Length), r.Gap.Sensitivity, 0.03)
	}
}

func peak(x []float64) float64 {
	most := 0.0
	for _, v := range x {
		most = math.Max(most, math.Abs(v))
	}
	return most
}

// Ampere's law over the sampled field: along the outer wall of the window, away
// from a gap in the post, the current per breadth of an inductor is N I/breadth
// on average over the window, and the field is strongest beside the gap.
func TestFieldMapsOfInductor(t *testing.T) {
	d, tables := built(t)
	v, err := NewView(d, tables)
	if err != nil {
		t.Fatal(err)
	}
	for k, m := range v.Parts[1].Fields {
		current := real(d.Operations[k].IPrimaryHarmonics[1])
		current = math.Hypot(current, imag(d.Operations[k].IPrimaryHarmonics[1])) / math.Sqrt2
		turns := float64(d.Inductor.Windings[0].Turns)
		// The field of all turns crosses the window from wall to wall in front of
		// the post: its mean along the first row, of |H|, is at least N I/breadth
		// less what the core itself takes (here below 5 %).
		sum := 0.0
		for j := range m.NY {
			sum += m.At(0, j) / float64(m.NY)
		}
		if mean := turns * current / m.Breadth; sum < 0.95*mean {
			t.Errorf("%s: mean field at the post %g A/m, N I over breadth %g A/m", m.Corner, sum, mean)
		}
		if m.InCopper > m.Peak || m.Peak == 0 {
			t.Errorf("%s: %g A/m in copper, %g A/m anywhere", m.Corner, m.InCopper, m.Peak)
		}
	}
}

// Between primary and secondary the whole of the primary's ampere-turns drives
// the field along the breadth: H = N I/breadth (Ampere's law with ferrite all
// round), less what the layers' room short of the yokes gives away. The demo is
// wound P-S with all of P nearest to the post.
func TestFieldMapsOfTransformer(t *testing.T) {
	d, tables := built(t)
	v, err := NewView(d, tables)
	if err != nil {
		t.Fatal(err)
	}
	inner, outer := 0.0, math.Inf(1) // top of P, bottom of the secondaries, m
	for _, l := range d.Rating.Section.Layers {
		if l.Of[0] == d.Transformer.Windings[0].Name {
			inner = math.Max(inner, l.X1)
		} else {
			outer = math.Min(outer, l.X0)
		}
	}
	if inner >= outer {
		t.Fatalf("P ends at %g m, the secondaries begin at %g m", inner, outer)
	}
	for k, m := range v.Parts[0].Fields {
		h := d.Operations[k].IPrimaryHarmonics[1]
		want := float64(d.Transformer.Windings[0].Turns) * math.Hypot(real(h), imag(h)) / math.Sqrt2 / m.Breadth
		i := int((inner + outer) / 2 / m.Depth * float64(m.NX))
		sum := 0.0
		for j := m.NY / 4; j < 3*m.NY/4; j++ {
			sum += m.At(i, j) / float64(m.NY/2)
		}
		// The row of cells is 0.2 mm high and may lie half in copper; the gap's
		// field adds to it, most at light load where it is all there is.
		if got := sum / want; got < 0.85 || got > 1.25 {
			t.Errorf("%s: %g A/m between the windings, N I over breadth is %g A/m", m.Corner, sum, want)
		}
	}
}

func TestViewWithoutParts(t *testing.T) {
	if _, err := NewView(&Design{}, Tables{}); err == nil {
		t.Error("no error for a design without parts")
	}
	if _, err := (&part.Coil{}).FieldMaps(nil, nil, 0, 3); err == nil {
		t.Error("no error for a field map without cells")
	}
}

func BenchmarkView(b *testing.B) {
	d, tables := built(b)
	b.ReportAllocs()
	for b.Loop() {
		if _, err := NewView(d, tables); err != nil {
			b.Fatal(err)
		}
	}
}
