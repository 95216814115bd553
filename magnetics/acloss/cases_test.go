package acloss

import (
	"encoding/json"
	"math"
	"os"
	"strconv"
	"testing"

	"gapwright/magnetics/field"
)

type feCase struct {
	ID, Kind string
	Geometry struct {
		WireDiameter    float64 `json:"wire_diameter"`
		Layers          int
		TurnPitch       float64                    `json:"turn_pitch"`
		LayerPitch      float64                    `json:"layer_pitch"`
		StripHeight     float64                    `json:"strip_height"`
		WindowDepth     float64                    `json:"window_depth"`
		FirstLayerX     float64                    `json:"first_layer_centre_x"`
		FirstTurnY      float64                    `json:"first_turn_centre_y"`
		OpposingSheetX  [2]float64                 `json:"opposing_sheet_x"`
		TurnsInHalf     int                        `json:"turns_per_layer_in_half"`
		HalfBreadth     float64                    `json:"half_window_breadth"`
		PostHalfWidth   float64                    `json:"post_half_width"`
		GapsInUpperHalf [][2]float64               `json:"gaps_in_upper_half"`
		OpposingSheet   *struct{ X, Y [2]float64 } `json:"opposing_sheet"`
		FoilThickness   float64                    `json:"foil_thickness"`
		Insulation      float64
		EndMargin       float64 `json:"end_margin"`
		FirstFoilX      float64 `json:"first_foil_x"`
	} `json:"geometry_m"`
	Results struct {
		Ratio map[string]map[string]float64 `json:"Rac_over_Rdc"`
	}
}

const copper = 1 / 58e6 // ohm m, of all finite-element cases

func loadCases(t testing.TB, kind byte) []feCase {
	t.Helper()
	raw, err := os.ReadFile("../../testdata/field/cases.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Cases []json.RawMessage }
	if err := json.Unmarshal(raw, &file); err != nil {
		t.Fatal(err)
	}
	var cases []feCase
	for _, r := range file.Cases {
		var c feCase
		var k struct{ Kind string }
		if err := json.Unmarshal(r, &k); err != nil {
			t.Fatal(err)
		}
		if k.Kind[0] != kind {
			continue
		}
		if err := json.Unmarshal(r, &c); err != nil {
			t.Fatal(err)
		}
		cases = append(cases, c)
	}
	return cases
}

// wires lays out the round wires of a D case in its full window, mirrored at
// half breadth, and the field problem around them. One unit solution: 1 A in
// every wire.
func (c *feCase) wires() (field.Problem, []Wire) {
	g := c.Geometry
	p := field.Problem{Depth: g.WindowDepth, Units: 1}
	var ys []float64
	if c.Kind == "D1_strip" {
		p.Breadth = g.StripHeight
		ys = []float64{g.StripHeight / 2}
	} else {
		p.Breadth = 2 * g.HalfBreadth
		for i := range g.TurnsInHalf {
			d := g.FirstTurnY + float64(i)*g.TurnPitch
			ys = append(ys, g.HalfBreadth-d, g.HalfBreadth+d)
		}
	}
	for _, gap := range g.GapsInUpperHalf {
		p.PostHalfWidth = g.PostHalfWidth
		if gap[0] == 0 {
			p.Gaps = append(p.Gaps, field.Gap{Center: g.HalfBreadth, Length: 2 * gap[1]})
			continue
		}
		for _, sign := range []float64{-1, 1} {
			p.Gaps = append(p.Gaps, field.Gap{Center: g.HalfBreadth + sign*(gap[0]+gap[1])/2, Length: gap[1] - gap[0]})
		}
	}
	var wires []Wire
	for l := range g.Layers {
		for _, y := range ys {
			x := g.FirstLayerX + float64(l)*g.LayerPitch
			w := Wire{X: x, Y: y, Diameter: g.WireDiameter, Current: 1, Group: l, Length: 1}
			source, _ := w.Source()
			wires, p.Sources = append(wires, w), append(p.Sources, source)
		}
	}
	sheet := field.Rect{X0: g.OpposingSheetX[0], X1: g.OpposingSheetX[1], Y1: p.Breadth}
	if o := g.OpposingSheet; o != nil {
		sheet = field.Rect{X0: o.X[0], X1: o.X[1], Y0: g.HalfBreadth - o.Y[1], Y1: g.HalfBreadth + o.Y[1]}
	}
	if sheet.X1 > 0 {
		p.Sources = append(p.Sources, field.Source{Rect: sheet, AmpereTurns: -float64(len(wires))})
	}
	return p, wires
}

// area is that of a round wire.
func area(d float64) float64 { return math.Pi / 4 * d * d }

// ratio is Rac/Rdc of all wires together from the form of one unit solution.
func ratio(form []complex128, wires []Wire) float64 {
	sum := 0.0
	for _, v := range form {
		sum += real(v)
	}
	return sum / (copper / area(wires[0].Diameter)) / float64(len(wires))
}

// Finite elements are good to 0.04 %. What the truncated multipoles leave: order
// 1 up to 5 % at 5 skin depths per diameter near gaps and 15 % at 12 (11 % at 5.4
// in the tight row D1a); order 2 1.5 % up to 5.5 and 8 % at 15; order 3 0.6 %.
func TestCoupledCases(t *testing.T) {
	worst := map[string]float64{}
	for _, c := range loadCases(t, 'D') {
		if c.Kind == "D3_foil" {
			continue
		}
		p, wires := c.wires()
		var s field.Solver
		if err := s.Solve(&p); err != nil {
			t.Fatalf("%s: %v", c.ID, err)
		}
		for order := 1; order <= 3; order++ {
			if order*len(wires) > 300 {
				continue // seconds; the smaller windows say the same
			}
			var cp Coupled
			if err := cp.Prepare(Enclosure{Breadth: p.Breadth, Depth: p.Depth}, wires, 1, order, s.Background); err != nil {
				t.Fatalf("%s: %v", c.ID, err)
			}
			for f, want := range c.Results.Ratio {
				hz, err := strconv.ParseFloat(f, 64)
				if err != nil {
					t.Fatal(err)
				}
				form := make([]complex128, c.Geometry.Layers)
				delta := SkinDepth(hz, copper)
				if err := cp.Loss(delta, copper, form); err != nil {
					t.Fatalf("%s: %v", c.ID, err)
				}
				x := c.Geometry.WireDiameter / delta
				tolerance := [...]float64{0, 0.15, 0.08, 0.006}[order]
				if x < 5.5 {
					tolerance = [...]float64{0, 0.12, 0.015, 0.003}[order]
				}
				if x < 2 {
					tolerance = [...]float64{0, 0.01, 0.001, 0.001}[order]
				}
				e := ratio(form, wires)/want["winding"] - 1
				if !(math.Abs(e) <= tolerance) {
					t.Errorf("%s order %d at d/delta %.2f: Rac/Rdc %+.3f %%, allowed %.2f %%", c.ID, order, x, 100*e, 100*tolerance)
				}
				key := c.Kind[:2] + " order " + strconv.Itoa(order)
				if math.Abs(e) > math.Abs(worst[key]) {
					worst[key] = e
				}
			}
		}
	}
	for k, e := range worst {
		t.Logf("worst %s %+.2f %%", k, 100*e)
	}
}

// With the field exactly along the layers the row factors are exact for one
// layer and up to 4 % low for more.
func TestRowCases(t *testing.T) {
	for _, c := range loadCases(t, 'D') {
		if c.Kind != "D1_strip" {
			continue
		}
		g := c.Geometry
		for f, want := range c.Results.Ratio {
			hz, err := strconv.ParseFloat(f, 64)
			if err != nil {
				t.Fatal(err)
			}
			delta := SkinDepth(hz, copper)
			row := Row(g.WireDiameter, g.TurnPitch, delta)
			h2 := 0.0
			for l := range g.Layers {
				h := (float64(l) + 0.5) / g.TurnPitch
				h2 += h * h / float64(g.Layers)
			}
			got := RoundSkin(g.WireDiameter/delta) + 2*area(g.WireDiameter)*(row.Along*h2+row.Own)
			tolerance := 0.045
			if g.Layers == 1 {
				tolerance = 0.001
			}
			if e := got/want["winding"] - 1; !(math.Abs(e) <= tolerance) {
				t.Errorf("%s at d/delta %.2f: Rac/Rdc %+.2f %%", c.ID, g.WireDiameter/delta, 100*e)
			}
		}
	}
}

// The choice by diameter over skin depth keeps what its table promises.
func TestChooseCases(t *testing.T) {
	for _, c := range loadCases(t, 'D') {
		if c.Kind == "D3_foil" {
			continue
		}
		p, wires := c.wires()
		var s field.Solver
		if err := s.Solve(&p); err != nil {
			t.Fatal(err)
		}
		along := c.Kind == "D1_strip"
		for f, want := range c.Results.Ratio {
			hz, err := strconv.ParseFloat(f, 64)
			if err != nil {
				t.Fatal(err)
			}
			delta := SkinDepth(hz, copper)
			method, order := Choose(c.Geometry.WireDiameter/delta, along)
			var got float64
			switch method {
			case Multipole:
				if order*len(wires) > 300 {
					continue
				}
				var cp Coupled
				if err := cp.Prepare(Enclosure{Breadth: p.Breadth, Depth: p.Depth}, wires, 1, order, s.Background); err != nil {
					t.Fatal(err)
				}
				form := make([]complex128, c.Geometry.Layers)
				if err := cp.Loss(delta, copper, form); err != nil {
					t.Fatal(err)
				}
				got = ratio(form, wires)
			default:
				row := Row(c.Geometry.WireDiameter, c.Geometry.TurnPitch, delta)
				if method == Isolated {
					g := RoundTransverse(c.Geometry.WireDiameter / delta)
					row = RowFactors{Along: g, Across: g}
				}
				var hx, hy [1]float64
				sum := 0.0
				for _, w := range wires {
					s.At(w.X, w.Y, hx[:], hy[:])
					sum += row.Along*hy[0]*hy[0] + row.Across*hx[0]*hx[0] + row.Own
				}
				got = RoundSkin(c.Geometry.WireDiameter/delta) + 2*area(c.Geometry.WireDiameter)*sum/float64(len(wires))
			}
			if e := got/want["winding"] - 1; !(math.Abs(e) <= 0.05) {
				t.Errorf("%s at d/delta %.2f: %s, order %d: Rac/Rdc %+.2f %%", c.ID, c.Geometry.WireDiameter/delta, method, order, 100*e)
			}
		}
	}
}

func TestFoilCases(t *testing.T) {
	for _, c := range loadCases(t, 'D') {
		if c.Kind != "D3_foil" {
			continue
		}
		g := c.Geometry
		p := field.Problem{Breadth: 2 * g.HalfBreadth, Depth: g.WindowDepth, Units: 1}
		var foils []field.Rect
		for i := range g.Layers {
			x := g.FirstFoilX + float64(i)*(g.FoilThickness+g.Insulation)
			r := field.Rect{X0: x, X1: x + g.FoilThickness, Y0: g.EndMargin, Y1: 2*g.HalfBreadth - g.EndMargin}
			foils = append(foils, r)
			p.Sources = append(p.Sources, field.Source{Rect: r, AmpereTurns: 1})
		}
		o := g.OpposingSheet
		p.Sources = append(p.Sources, field.Source{Rect: field.Rect{X0: o.X[0], X1: o.X[1], Y0: g.HalfBreadth - o.Y[1], Y1: g.HalfBreadth + o.Y[1]}, AmpereTurns: -float64(g.Layers)})
		var s field.Solver
		if err := s.Solve(&p); err != nil {
			t.Fatal(err)
		}
		for f, want := range c.Results.Ratio {
			hz, err := strconv.ParseFloat(f, 64)
			if err != nil {
				t.Fatal(err)
			}
			var sheets []Sheet
			for _, r := range foils {
				sheets = append(sheets, Sheet{Rect: r, Current: 1, Length: 1})
			}
			other := p
			other.Sources = p.Sources[len(foils):]
			var sh Sheets
			if err := sh.Prepare(other, sheets); err != nil {
				t.Fatal(err)
			}
			var one [1]complex128
			if err := sh.Loss(SkinDepth(hz, copper), copper, one[:]); err != nil {
				t.Fatal(err)
			}
			sum := 0.0
			for _, r := range foils {
				var form [1]float64
				Foil(&s, r, 0, 1, SkinDepth(hz, copper), copper, form[:])
				sum += form[0]
			}
			dc := copper / (g.FoilThickness * (foils[0].Y1 - foils[0].Y0)) * float64(g.Layers)
			// Exact at full breadth but for the mesh, 0.04 %. With margins the
			// crowding at the foil ends is missed: seen up to 10 %.
			tolerance := 0.001
			if g.EndMargin > 0 {
				tolerance = 0.12
			}
			e := sum/dc/want["winding"] - 1
			if !(math.Abs(e) <= tolerance) {
				t.Errorf("%s at %s Hz: slabs Rac/Rdc %+.2f %%", c.ID, f, 100*e)
			}
			// Solved together the crowding is there: 0.1 % at full breadth, 1 % with
			// margins, where strips of finite breadth and thickness are left.
			together := real(one[0])/dc/want["winding"] - 1
			if !(math.Abs(together) <= tolerance/8+0.001) {
				t.Errorf("%s at %s Hz: sheets Rac/Rdc %+.2f %%", c.ID, f, 100*together)
			}
			t.Logf("%s %s Hz: slabs %+.2f %%, sheets %+.2f %%", c.ID, f, 100*e, 100*together)
		}
	}
}
