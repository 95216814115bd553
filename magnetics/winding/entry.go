// Package winding turns the order of work of a coil (wind, tape, screen, space,
// innermost first) into rectangles in the winding window and says whether they
// fit. It knows geometry only: no current, no field, no loss.
//
// Coordinates: x runs across the window from the face of the post outward, y
// along the winding breadth from the lower flange of the coil former. Heights
// are along x, breadths along y. All lengths are in m.
package winding

import "gapwright/corelib/wire"

// Kind tells what one entry of the order of work is.
type Kind string

// The kinds of entry.
const (
	Wind   Kind = "wind"
	Tape   Kind = "tape"
	Screen Kind = "screen"
	Space  Kind = "space"
)

// Full is the Width of tape, foil or screen that covers the whole breadth
// between the flanges (between the margins for foil).
const Full = 0

// An Entry is one step of the winder's work. The fields that do not belong to
// its Kind are zero.
type Entry struct {
	Kind    Kind
	Chamber int // 1, 2 on a two-chamber former, 0 otherwise

	// Wind.
	Names     []string  // of this section; two names: both wound together in one layer (bifilar)
	Of        []string  // the electrical winding each name is a part of
	Turns     int       // of each name
	Wire      wire.Wire // of one wire in hand
	Parallel  int       // wires in hand of each name
	Layers    int
	Spread    string     // full: over the breadth; close: wire beside wire from the first flange
	Direction string     // cw or ccw, seen from the pin side
	Lay       string     // C: wound back on itself; Z: each layer from the same side; "" for a single layer
	Margins   [2]float64 // m, at the first and at the second flange
	Insulated string     // triple: the wire carries its own insulation; "" otherwise
	Sleeving  string     // on the leads; none or ""
	Width     float64    // m, of foil; Full: the breadth between the margins
	Leads     string     // of a foil, in words; "" otherwise
	Interleaf float64    // m, insulation wound in with every turn of a foil

	// Tape, and the thickness of a screen.
	Thickness   float64 // m, one layer
	Material    string  // polyester, copper
	TapeLayers  int
	Overlap     float64 // m
	Purpose     string  // barrier, interlayer, finish, margin
	To          string  // screen: the pin it is tied to
	Ends        string  // screen: how its ends are kept apart
	ScreenWidth float64 // m; Full: the whole breadth

	// Space.
	Height float64 // m
}
