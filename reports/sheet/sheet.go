// Package sheet writes the winding sheet, the workbook that a shop winds and
// measures from, and reads it back when the shop has filled it in.
//
// One workbook describes one part. White cells are fixed by the design, pale
// yellow cells are filled in by the shop, pale grey cells are computed. Every
// yellow cell has a defined name that does not change from design to design
// (E04_S1 is the final inductance of sample 1), so that reading does not depend
// on positions. Numbers in cells are numbers; the decimal mark is a matter of
// the cell's format.
package sheet

import (
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
	"gapwright/reports/figure"
)

// FormatVersion is the version of the workbook's machine block.
const FormatVersion = 1

// MaxSamples is the largest number of sample columns that one sheet carries.
const MaxSamples = 20

// The tabs of the workbook.
const (
	TabSheet      = "1 Sheet"
	TabSection    = "2 Section"
	TabInspection = "3 Inspection"
	TabNotes      = "4 Notes"
	TabHistory    = "5 History"
	TabData       = "data"
)

// A Sheet is everything that is written on the winding sheet of one part.
type Sheet struct {
	// Title block, fields of ISO 7200.
	Owner      string
	Title      string
	PartNumber string
	Revision   string
	Date       string // ISO 8601; empty: left blank
	CreatedBy  string
	ApprovedBy string
	Contact    string
	Replaces   string

	Part         string // transformer or inductor
	Construction part.Construction
	Rating       part.Rating
	Window       winding.Window
	Checks       []part.Check
	Samples      int

	Material      string  // the ferrite as the shop may buy it: class and the loss it must keep
	GapTolerance  float64 // m, each way, when the length governs
	ALTolerance   float64 // relative, each way, when A_L governs
	GroundSlope   float64 // H m, change of a ground gap over change of 1/L, fringing included
	FilmSlope     float64 // H m, the same for film under all legs
	FilmStock     []float64
	FilmAllowed   bool // film may replace grinding in samples
	CoreCountsAs  string
	Assumptions   []string // of the insulation, as the user stated them or as proposed
	Substitutions []string
	Notes         []string // besides the usual ones
	Warnings      []part.Warning

	Hash  string // of the design, 12 hexadecimal digits
	Tool  string // program and version
	Comma bool   // decimal comma

	Pictures []figure.Picture
}

func (s Sheet) picture(name string) (figure.Picture, bool) {
	for _, p := range s.Pictures {
		if p.Name == name {
			return p, true
		}
	}
	return figure.Picture{}, false
}
