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
