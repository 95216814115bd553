// Package window reads a winding window drawn by hand, a file of the window and
// its conductors, and computes its field, leakage, gapped inductance and AC
// resistance with the kernels of field and acloss.
//
// x runs across the window from the face of the post outward, y along the
// winding breadth. Ampere-turns and currents are peak values, all in the same
// phase; everything is SI.
package window

import (
	"gapwright/corelib/document"
)

// Format is the version of the file that this package reads.
const Format = 1

// A File is the window file.
type File struct {
	Format      int       `key:"format" required:"yes" example:"1" help:"version of this file format"`
	Window      Window    `key:"window" required:"yes" help:"the winding window; x across it from the face of the post, y along the winding breadth"`
	Windings    []Winding `key:"windings" required:"yes" style:"flow" help:"rectangles, round wires or foils; currents are peak values in the same phase" example:"{name: P, ampere_turns: 1, block: {x: [0.5 mm, 2.5 mm], y: [1 mm, 17 mm]}, grid: [4, 8]}\n{name: Q, current: 1 A, round_wires: {diameter: 0.5 mm, first: [3.3 mm, 1.3 mm], layers: 2, layer_pitch: 0.56 mm, turns_per_layer: 27, turn_pitch: 0.56 mm}}\n{name: R, current: 1 A, foils: {thickness: 0.1 mm, count: 4, first_x: 4.6 mm, pitch: 0.15 mm, y: [1 mm, 17 mm]}}"`
	Frequencies []float64 `key:"frequencies" unit:"Hz" example:"[50 kHz, 100 kHz]" help:"of the AC resistances"`
}

// The geometries and surrounds of a window.
const (
	Planar    = "planar"
	RoundPost = "round-post"
	Core      = "core"
	Head      = "head"
)

// Window is the room for the conductors and the ferrite around it.
type Window struct {
	Breadth            float64 `key:"breadth" unit:"m" required:"yes" example:"18 mm" help:"along the winding breadth, y"`
	Depth              float64 `key:"depth" unit:"m" required:"yes" example:"6 mm" help:"from the post outward, x"`
	Geometry           string  `key:"geometry" default:"planar" oneof:"planar|round-post" help:"planar: per meter of straight turn; round-post: rings around a post"`
	PostRadius         float64 `key:"post_radius" unit:"m" example:"7 mm" when:"geometry=round-post"`
	Surround           string  `key:"surround" default:"core" oneof:"core|head" help:"core: four ferrite walls; head: the plane of the post only, open elsewhere"`
	PostHalfWidth      float64 `key:"post_half_width" unit:"m" example:"5 mm" when:"geometry=planar" help:"needed with gaps"`
	Gaps               []Gap   `key:"gaps" style:"flow" default:"[]" example:"{center: 9 mm, length: 0.5 mm}" help:"in the post"`
	OuterGaps          []Gap   `key:"outer_gaps" style:"flow" default:"[]" example:"{center: 9 mm, length: 0.5 mm}" help:"in the outer leg, which has the area of the post: a spacer under all legs"`
	UngappedInductance float64 `key:"ungapped_inductance" unit:"H/m" example:"4999 nH" help:"per turn squared (planar: per meter of depth), of the closed core alone; left out: walls of infinite permeability"`
	Conductivity       float64 `key:"conductivity" unit:"MS/m" default:"58 MS/m" mark:"CP copper at 20 degC" help:"of the conductors"`
}

// A Gap is a gap in a leg.
type Gap struct {
	Center float64 `key:"center" unit:"m" required:"yes" zero:"ok" example:"9 mm" help:"along the breadth"`
	Length float64 `key:"length" unit:"m" required:"yes" example:"0.5 mm"`
}

// A Winding is one set of conductors: a block, round wires or foils.
type Winding struct {
	Name        string      `key:"name" required:"yes" example:"P"`
	AmpereTurns *float64    `key:"ampere_turns" sign:"any" example:"1" help:"of a block, peak; 0: idle"`
	Current     *float64    `key:"current" unit:"A" sign:"any" example:"1 A" help:"in every wire or foil, peak; 0 A: idle"`
	Block       *Block      `key:"block"`
	RoundWires  *RoundWires `key:"round_wires"`
	Foils       *Foils      `key:"foils"`
	Grid        *[2]int     `key:"grid" example:"[4, 8]" help:"parts of a block, across and along, whose mean square field is wanted"`
}

// A Block is a rectangle of uniform current density.
type Block struct {
	X [2]float64 `key:"x" unit:"m" required:"yes" zero:"ok" example:"[0.5 mm, 2.5 mm]"`
	Y [2]float64 `key:"y" unit:"m" required:"yes" zero:"ok" example:"[1 mm, 17 mm]"`
}

// RoundWires are layers of equal wires on a square grid.
type RoundWires struct {
	Diameter      float64    `key:"diameter" unit:"m" required:"yes" example:"0.5 mm" help:"of the metal"`
	First         [2]float64 `key:"first" unit:"m" required:"yes" example:"[0.58 mm, 0.28 mm]" help:"center of the first wire, x and y"`
	Layers        int        `key:"layers" default:"1" example:"4"`
	LayerPitch    float64    `key:"layer_pitch" unit:"m" example:"0.56 mm"`
	TurnsPerLayer int        `key:"turns_per_layer" default:"1" example:"10"`
	TurnPitch     float64    `key:"turn_pitch" unit:"m" example:"0.56 mm"`
}

// Foils are equal sheets above each other.
type Foils struct {
	Thickness float64    `key:"thickness" unit:"m" required:"yes" example:"0.1 mm"`
	Count     int        `key:"count" default:"1" example:"4"`
	FirstX    float64    `key:"first_x" unit:"m" required:"yes" zero:"ok" example:"0.5 mm" help:"inner face of the first foil"`
	Pitch     float64    `key:"pitch" unit:"m" example:"0.15 mm"`
	Y         [2]float64 `key:"y" unit:"m" required:"yes" zero:"ok" example:"[1 mm, 17 mm]"`
}

// Read reads and checks a window file. The name is for messages. Everything
// that is wrong comes at once, in file order, as joined *document.Errors.
func Read(name string, data []byte) (*File, error) {
	var f File
	rec := document.Read(name, data, &f)
	check(&f, rec)
	if err := rec.Err(); err != nil {
		return nil, err
	}
	return &f, nil
}
