package wire

import (
	"math"

	"gapwright/corelib/quantity"
)

// Copper, IEC 60028 (annealed copper standard).
const (
	Conductivity           = 58e6    // S/m at 20 °C
	TemperatureCoefficient = 0.00393 // 1/K at 20 °C
	ReferenceTemperature   = 20      // °C
	Density                = 8890    // kg/m³

	// NominalConductivity, in S/m, is what the nominal resistances of winding
	// wire are computed with. Inferred from published litz resistances (0.020 mm:
	// 54.41 ohm/m); it reproduces the 2.176 ohm/m of 0.100 mm.
	NominalConductivity = 58.5e6
)

// Resistivity returns the resistivity of copper in ohm m at a temperature in °C.
func Resistivity(temperature float64) float64 {
	return (1 + TemperatureCoefficient*(temperature-ReferenceTemperature)) / Conductivity
}

// SkinDepth returns the depth in m at which a plane wave in copper has fallen to
// 1/e, for a frequency in Hz and a temperature in °C.
func SkinDepth(frequency, temperature float64) float64 {
	return math.Sqrt(Resistivity(temperature) / (math.Pi * frequency * quantity.Mu0))
}

// Marks of figures that no published table gives.
const (
	FromMemory     = "from memory"
	CommonPractice = "common practice"
	OwnRule        = "own rule"
)

// packing is p in OD = p sqrt(N) d_o of an unserved bundle, by the least number
// of strands: from memory of makers' practice, and confirmed by eight published
// rows of 0.020 mm litz within 0.6 % (grade 1) and 1.4 % (grade 2). The next
// larger class holds between 20 and 25, which the source leaves open.
func packing(strands int) float64 {
	switch {
	case strands <= 12:
		return 1.25
	case strands <= 16:
		return 1.26
	case strands <= 20:
		return 1.27
	}
	return 1.28
}

// BunchingSteps returns in how many twisting steps a litz of so many strands is
// made. Published resistances of 0.020 mm litz show one step up to 30, two at 60
// and 120, three at 180 strands; the borders between them are our own rule.
func BunchingSteps(strands int) int {
	switch {
	case strands <= 45:
		return 1
	case strands <= 150:
		return 2
	}
	return 3
}

// LengthFactor returns k1, by which twisting makes a strand longer than its
// bundle (procedure of IEC 60317-11 as given by a manufacturer).
func LengthFactor(strands int) float64 {
	switch BunchingSteps(strands) {
	case 1:
		return 1.02
	case 2:
		return 1.04
	}
	return 1.06
}

// What a serving adds to the diameter of a bundle, in m: least and most of a
// published litz table.
func servingAdds(s Serving) (least, most float64) {
	switch s {
	case SingleServing:
		return 0.025e-3, 0.04e-3
	case DoubleServing:
		return 0.05e-3, 0.08e-3
	}
	return 0, 0
}

// Triple insulation adds about 0.10 mm of wall all round and at most 0.05 mm more
// (from memory of wire catalogues; the standard fixes tests, not diameters). The
// same is taken for an insulated jacket around a bundle.
const (
	tripleAdds     = 0.20e-3
	tripleAddsMost = 0.25e-3
)

// bare is the wire without what does not identify its own row.
func (w Wire) bare() Wire {
	w.Own, w.Width = nil, 0
	if w.Kind == Solid && w.TripleInsulated {
		w.Grade = 0
	}
	return w
}

// own returns the user's row if it still describes this wire; a construction may
// have changed the copy since.
func (w Wire) own() *Own {
	if w.Own != nil && w.Own.Wire == w.bare() {
		return w.Own
	}
	return nil
}

// StrandOuterDiameter returns the nominal diameter over the enamel of the wire or
// of one strand, in m: midway between the least and the largest of its grade.
func (w Wire) StrandOuterDiameter() float64 {
	least, most := enamelled(w.Diameter, w.Grade)
	return (least + most) / 2
}

// StrandOuterDiameterMax returns the largest diameter over the enamel, in m.
func (w Wire) StrandOuterDiameterMax() float64 {
	_, most := enamelled(w.Diameter, w.Grade)
	return most
}

// OuterDiameter returns the nominal outer diameter in m, insulation and serving
// included; for a foil its thickness.
func (w Wire) OuterDiameter() float64 {
	if o := w.own(); o != nil {
		return o.OuterDiameter
	}
	least, most := w.outer()
	return (least + most) / 2
}

// OuterDiameterMax returns the largest outer diameter in m, the one that layers
// are counted with.
func (w Wire) OuterDiameterMax() float64 {
	if o := w.own(); o != nil {
		return o.OuterDiameterMax
	}
	_, most := w.outer()
	return most
}

func (w Wire) outer() (least, most float64) {
	switch w.Kind {
	case Foil:
		return w.Thickness, w.Thickness
	case Litz:
		least, most = enamelled(w.Diameter, w.Grade)
		spread := packing(w.Strands) * math.Sqrt(float64(w.Strands))
		addLeast, addMost := servingAdds(w.Serving)
		least = spread*least + addLeast
		most = spread*most + addMost
		if w.TripleInsulated {
			// Nominal stays the nominal bundle plus 0.20 mm.
			least += 2*tripleAdds - tripleAddsMost
			most += tripleAddsMost
		}
		return least, most
	}
	if w.TripleInsulated {
		return w.Diameter + 2*tripleAdds - tripleAddsMost, w.Diameter + tripleAddsMost
	}
	return enamelled(w.Diameter, w.Grade)
}

// CopperArea returns the section of the copper in m². It panics for a foil whose
// Width is not set.
func (w Wire) CopperArea() float64 {
	switch w.Kind {
	case Foil:
		if !(w.Width > 0) {
			panic("wire: the width of a foil is not set")
		}
		return w.Thickness * w.Width
	case Litz:
		return float64(w.Strands) * math.Pi / 4 * w.Diameter * w.Diameter
	}
	return math.Pi / 4 * w.Diameter * w.Diameter
}

// lengthFactor is the length of copper per length of wire.
func (w Wire) lengthFactor() float64 {
	if w.Kind == Litz {
		return LengthFactor(w.Strands)
	}
	return 1
}

// ResistancePerLength returns the DC resistance in ohm/m at a temperature in °C
// with the conductivity of IEC 60028, which is what losses are computed with.
// Litz includes the length factor of its twist. A resistance in the user's own
// row replaces it. It panics for a foil whose Width is not set.
func (w Wire) ResistancePerLength(temperature float64) float64 {
	hot := 1 + TemperatureCoefficient*(temperature-ReferenceTemperature)
	if o := w.own(); o != nil && o.Resistance > 0 {
		return o.Resistance * hot
	}
	return hot * w.lengthFactor() / (Conductivity * w.CopperArea())
}

// NominalResistancePerLength returns what a wire list prints at 20 °C, in ohm/m:
// 0.86 % less than ResistancePerLength.
func (w Wire) NominalResistancePerLength() float64 {
	if o := w.own(); o != nil && o.Resistance > 0 {
		return o.Resistance
	}
	return w.lengthFactor() / (NominalConductivity * w.CopperArea())
}

// CopperMassPerLength returns the mass of the copper in kg/m. It panics for a
// foil whose Width is not set.
func (w Wire) CopperMassPerLength() float64 {
	return Density * w.lengthFactor() * w.CopperArea()
}

// Sources returns where the diameters of the wire come from, one phrase each,
// with the mark of every figure that no published table gives.
func (w Wire) Sources() []string {
	if o := w.own(); o != nil {
		text := o.Source
		if o.Origin != "" {
			text += " (" + o.Origin + ")"
		}
		return []string{text}
	}
	switch w.Kind {
	case Foil:
		return []string{"bare foil: thickness as named"}
	case Solid:
		if w.TripleInsulated {
			return []string{"triple-insulated: copper + 0.20 mm, at most + 0.25 mm (" + FromMemory + " of wire catalogues)"}
		}
		return []string{enamelSource(w.Diameter, w.Grade)}
	}
	list := []string{
		"strand: " + enamelSource(w.Diameter, w.Grade),
		"bundle: p sqrt(N) d, p = 1.25 to 1.28 (" + FromMemory + ", confirmed by published 0.020 mm litz within 1.4 %)",
		"resistance: twist 2, 4 or 6 % for 1, 2 or 3 bunching steps (IEC 60317-11 procedure); number of steps by count: " + OwnRule,
	}
	if w.Serving != NoServing {
		list = append(list, "serving: published litz table")
	}
	if w.TripleInsulated {
		list = append(list, "insulated jacket: + 0.20 mm, at most + 0.25 mm ("+FromMemory+", taken from triple-insulated wire)")
	}
	return list
}
