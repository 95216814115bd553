package thermal

import "math"

// The rules of thumb that stand beside the network as a cross-check. They scatter:
// for one measured part of 17.8 cm³ with 10.2 K/W they say 14.2 and 11.2 K/W.

// ByCoreVolume returns 0.06/sqrt(V), the thermal resistance in K/W of a wound part
// with a core volume in m³ in still air.
//
// Source: W. G. Hurley, W. H. Wölfle, Transformers and Inductors for Power
// Electronics, Wiley 2013 (from memory).
func ByCoreVolume(volume float64) float64 { return 0.06 / math.Sqrt(volume) }

// ByEffectiveVolume returns 53 V^-0.54 with V in cm³, the thermal resistance in K/W
// of a transformer on an E-type core; the argument is in m³.
//
// Source: rule of a ferrite supplier as quoted by Encyclopedia Magnetica, "Thermal
// resistance".
func ByEffectiveVolume(volume float64) float64 { return 53 * math.Pow(volume*1e6, -0.54) }

// RiseBySurface returns 450 psi^0.826, the rise in K of a part that sheds a power in
// W through a surface in m²; psi is in W/cm².
//
// Source: Col. W. T. McLyman, Transformer and Inductor Design Handbook (from
// memory; its pairs 0.03 W/cm² and 25 K, 0.07 W/cm² and 50 K come out).
func RiseBySurface(power, surface float64) float64 {
	return 450 * math.Pow(power/(surface*1e4), 0.826)
}

// LoadingForRise is the inverse of RiseBySurface: W/m² for a rise in K.
func LoadingForRise(rise float64) float64 { return 1e4 * math.Pow(rise/450, 1/0.826) }
