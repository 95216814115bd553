// Package part describes one transformer or one inductor, everything the shop
// must know to wind it and nothing else, and rates it at every corner of the
// tank: inductances, leakage, losses, temperatures and margins.
//
// A description holds decisions only, no results, so that an edited
// description cannot contradict itself.
package part

import (
	"gapwright/magnetics/winding"
)

// GapKind tells how the gap is made.
type GapKind string

// The ways to make a gap.
const (
	Ground GapKind = "ground" // the post of one half, or discs for more than one piece
	Spacer GapKind = "spacer" // film under all legs
	Closed GapKind = "none"   // ungapped
)

// Gap is how the core is gapped.
type Gap struct {
	Kind      GapKind
	Total     float64   // m, ground: sum of the pieces in the post
	Pieces    int       // ground
	Positions []float64 // m, centers of the pieces from the lower yoke; empty: (i + 1/2)/n of the window breadth
	Half      string    // ground: upper or lower, the half that is ground
	Governs   string    // A_L or length, which of the two the shop obeys
	Thickness float64   // m, spacer: one stack of film
	Foils     []float64 // m, spacer: the films of that stack
	Under     string    // spacer: all legs
}

// Core is the ferrite of a part and how its halves are held.
type Core struct {
	Shape    string // name of a row of the core table
	Material string // name of a row of the ferrite table
	Pieces   int
	Clamping string // clip, tape or glue
	Gap      Gap
}

// Former is the coil former.
type Former struct {
	Name     string
	Chambers int
	Pins     int // 0: unknown, pins by the shop
	Mounting string
	Wall     float64 // m, from the face of the post to the first wire
	PinsCut  []int
}

// Winding is one electrical winding, as the schematic shows it.
type Winding struct {
	Name     string
	Turns    int
	Start    []string // terminals in parallel at the dot: "pin 1", "lead"
	Finish   []string
	Parts    []string // names of the sections in series, in the order of winding; empty: one section with the winding's own name
	JoinedAt string   // terminal of the series joint of two sections
}

// Impregnation, Glue and Terminations are the rest of the assembly.
type (
	// Impregnation says whether the wound part is dipped.
	Impregnation struct {
		Kind string // none, dip, vacuum
		When string
	}
	// Glue says where adhesive goes.
	Glue struct {
		Faces     string
		OuterLegs string
		Cure      string
	}
	// Terminations says how the ends leave the part.
	Terminations struct {
		Primary    string // pins or leads
		Secondary  string
		LeadLength float64 // m
		Tin        string
	}
)

// Requirement is a measured quantity the shop must meet.
type Requirement struct {
	Pins      []string // terminals to measure between, empty: those of the primary
	Value     float64  // H
	Tolerance float64  // relative, each way
}

// Construction is what a transformer and an inductor have in common.
type Construction struct {
	Core         Core
	Former       Former
	Windings     []Winding
	Build        []winding.Entry // innermost first, in the order of work
	Impregnation Impregnation
	Glue         Glue
	Terminations Terminations
	Tests        []Test
}

// Test is one insulation test, its volts stated by the user.
type Test struct {
	Between string  // primary_secondary, primary_core, secondary_core
	Voltage float64 // V; 0: "volts by customer"
	Kind    string  // AC or DC
	Time    float64 // s
}

// Transformer is a transformer with the magnetizing inductance built in by its
// gap. The first winding is the primary, named P; the others are secondaries:
// S, or S-A and S-B of a center tap.
type Transformer struct {
	Construction
	OpenInductance  *Requirement // nil: taken from the rating
	ShortInductance *Requirement
}

// Inductor is the separate resonant inductor. It has one winding, named L.
type Inductor struct {
	Construction
	Inductance *Requirement // nil: taken from the rating
}
