package design

import (
	"cmp"
	"fmt"
	"slices"

	"gapwright/corelib/wire"
	"gapwright/magnetics/job"
)

// wireList returns the wires that the limits allow, plain and, where a winding
// must carry its own insulation, triple-insulated. The list is sorted by copper
// area (foil by thickness), so that the search is the same whatever the order of the input.
func wireList(limits job.Wires, table *wire.Table, insulated bool) ([]wire.Wire, error) {
	var list []wire.Wire
	add := func(w wire.Wire) {
		if insulated {
			if w.Kind == wire.Foil {
				return
			}
			w = w.WithTripleInsulation()
		}
		if w.Check() == nil {
			list = append(list, table.Apply(w))
		}
	}
	if len(limits.Stock) > 0 {
		for _, text := range limits.Stock {
			w, err := table.Parse(text)
			if err != nil {
				return nil, fmt.Errorf("wires.stock: %w", err)
			}
			switch {
			case insulated && !w.TripleInsulated && w.Kind == wire.Litz:
				// The jacket is put on by the wire maker: only stock that has one serves.
			case insulated && !w.TripleInsulated:
			case !insulated && w.TripleInsulated:
			default:
				list = append(list, w)
			}
		}
		return sorted(list), nil
	}
	if slices.Contains(limits.Kinds, "litz") {
		serving, err := wire.ParseServing(limits.LitzServing)
		if err != nil {
			return nil, fmt.Errorf("wires.litz_serving: %w", err)
		}
		counts := wire.LitzCounts()
		if limits.LitzCounts == "any" {
			counts = everyCount(limits.LitzStrandsMax)
		}
		for _, d := range limits.LitzStrands {
			for _, n := range counts {
				if n <= limits.LitzStrandsMax {
					add(wire.Wire{Kind: wire.Litz, Strands: n, Diameter: d, Grade: limits.StrandGrade, Serving: serving})
				}
			}
		}
	}
	if slices.Contains(limits.Kinds, "solid") {
		if insulated {
			for _, d := range wire.TripleInsulatedDiameters() {
				if d >= limits.SolidDiameters[0] && d <= limits.SolidDiameters[1] {
					add(wire.Wire{Kind: wire.Solid, Diameter: d})
				}
			}
		} else {
			for _, size := range wire.Sizes("R20") {
				if size.Diameter >= limits.SolidDiameters[0] && size.Diameter <= limits.SolidDiameters[1] {
					add(wire.Wire{Kind: wire.Solid, Diameter: size.Diameter, Grade: limits.SolidGrade})
				}
			}
		}
	}
	if slices.Contains(limits.Kinds, "foil") && !insulated {
		thicknesses := limits.FoilThickness
		if len(thicknesses) == 0 {
			thicknesses = wire.FoilThicknesses()
		}
		for _, t := range thicknesses {
			add(wire.Wire{Kind: wire.Foil, Thickness: t})
		}
	}
	return sorted(list), nil
}

// everyCount is a fine geometric ladder of strand counts: a few per cent apart,
// because a shop that can have any count still orders round numbers.
func everyCount(most int) []int {
	var list []int
	for n := 3; n <= most; n += max(1, n/20) {
		list = append(list, n)
	}
	return list
}

func sorted(list []wire.Wire) []wire.Wire {
	size := func(w wire.Wire) float64 {
		if w.Kind == wire.Foil {
			return w.Thickness // its width is the winding's
		}
		return w.CopperArea()
	}
	slices.SortStableFunc(list, func(a, b wire.Wire) int { return cmp.Compare(size(a), size(b)) })
	return list
}
