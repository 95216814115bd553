package acloss

// A Method is a way to find the loss of solid round wires.
type Method string

// The methods, cheapest first.
const (
	Isolated  Method = "isolated wire"
	InRow     Method = "row of wires"
	Multipole Method = "coupled multipoles"
)

// Choose returns the method for wires of the given diameter over skin depth, and
// the order when they are coupled. along tells that the field runs exactly along
// the layers: no gap, layers and all else over the full breadth.
//
// Errors seen against finite elements with the field along the layers: isolated
// 2 % up to d/delta 1.4 and +10 % at 2, row 0 to -4 %. Near gaps or with margins:
// isolated 0.9 % up to 1.4, +6 % at 2, +24 % at 4, +77 % beyond; coupled order 2
// -0.3 % up to 4 and -5 % beyond, order 3 -0.6 %.
func Choose(diameterOverDelta float64, along bool) (Method, int) {
	switch {
	case diameterOverDelta <= 1.4:
		return Isolated, 0
	case along:
		return InRow, 0
	case diameterOverDelta <= 2:
		return Multipole, 1
	case diameterOverDelta <= 4:
		return Multipole, 2
	}
	return Multipole, 3
}
