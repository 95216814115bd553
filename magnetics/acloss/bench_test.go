package acloss

import (
	"testing"

	"gapwright/magnetics/field"
)

// sixtyWires is two layers of thirty wires beside a post gap.
func sixtyWires() (field.Problem, []Wire) {
	var c feCase
	g := &c.Geometry
	g.WireDiameter, g.Layers, g.TurnsInHalf = 0.5e-3, 2, 15
	g.TurnPitch, g.LayerPitch, g.FirstTurnY, g.FirstLayerX = 0.56e-3, 0.56e-3, 0.28e-3, 1.1e-3
	g.HalfBreadth, g.WindowDepth, g.PostHalfWidth = 9e-3, 5e-3, 5e-3
	g.GapsInUpperHalf = [][2]float64{{0, 0.3e-3}}
	return c.wires()
}

func BenchmarkCoupled(b *testing.B) {
	p, wires := sixtyWires()
	var s field.Solver
	if err := s.Solve(&p); err != nil {
		b.Fatal(err)
	}
	delta := SkinDepth(100e3, copper)
	for _, orders := range []int{1, 2, 3} {
		name := "orders=" + string(rune('0'+orders))
		var c Coupled
		b.Run("prepare/wires=60/"+name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if err := c.Prepare(Enclosure{Breadth: p.Breadth, Depth: p.Depth}, wires, 1, orders, s.Background); err != nil {
					b.Fatal(err)
				}
			}
		})
		form := make([]complex128, 2)
		b.Run("harmonic/wires=60/"+name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if err := c.Loss(delta, copper, form); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkSheets(b *testing.B) {
	p := field.Problem{Breadth: 15e-3, Depth: 5e-3, PostHalfWidth: 5e-3, Gaps: []field.Gap{{Center: 7.5e-3, Length: 0.6e-3}}, Units: 2,
		Sources: []field.Source{{Rect: field.Rect{X0: 2.6e-3, X1: 4e-3, Y0: 1.5e-3, Y1: 13.5e-3}, Unit: 1, AmpereTurns: 20}}}
	var sheets []Sheet
	for i := range 4 {
		x := 1.5e-3 + float64(i)*0.2e-3
		sheets = append(sheets, Sheet{Rect: field.Rect{X0: x, X1: x + 0.1e-3, Y0: 1.5e-3, Y1: 13.5e-3}, Current: 1, Length: 1})
	}
	var s Sheets
	b.Run("prepare/foils=4", func(b *testing.B) {
		b.ReportAllocs()
		for b.Loop() {
			if err := s.Prepare(p, sheets); err != nil {
				b.Fatal(err)
			}
		}
	})
	form := make([]complex128, 4)
	b.Run("harmonic/foils=4", func(b *testing.B) {
		b.ReportAllocs()
		for b.Loop() {
			if err := s.Loss(0.2e-3, copper, form); err != nil {
				b.Fatal(err)
			}
		}
	})
}
