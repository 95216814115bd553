package wire

import "math"

// bundleLeast is the diameter of a circle with the area of all strands.
func bundleLeast(w Wire) float64 { return w.Diameter * math.Sqrt(float64(w.Strands)) }

// LowFrequencyFactor returns R_ac/R_dc of a litz winding of so many turns over a
// breadth (m) whose field is zero on one side, for strands of diameter d (m) much
// thinner than the skin depth delta (m):
//
//	F = 1 + pi² N² n² d⁶ / (192 delta⁴ b²)
//
// A hand check beside the field solution. Source: Sullivan, IEEE Trans. Power
// Electronics 14(2), 1999; it gives his published example (F = 1.03) as 1.032.
func LowFrequencyFactor(turns float64, strands int, d, delta, breadth float64) float64 {
	x := math.Pi * turns * float64(strands) * d * d * d / (delta * delta * breadth)
	return 1 + x*x/192
}

// StrandsForFactor returns the number of strands, not rounded, with which
// LowFrequencyFactor has a wanted value above 1.
//
// n = k delta² b / N with k = sqrt(192 (F - 1))/(pi d³); the form is that of
// Sullivan and Zhang, APEC 2014.
func StrandsForFactor(factor, turns, d, delta, breadth float64) float64 {
	k := math.Sqrt(192*(factor-1)) / (math.Pi * d * d * d)
	return k * delta * delta * breadth / turns
}

// FirstBunchMost returns how many strands the first twisting step may hold, not
// rounded: 4 delta²/d² (Sullivan and Zhang, APEC 2014; the form is from memory).
func FirstBunchMost(d, delta float64) float64 {
	return 4 * delta * delta / (d * d)
}
