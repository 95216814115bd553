package shape

import (
	"bytes"
	"sync"

	"gapwright/corelib/quantity"
	"gapwright/corelib/table"
)

// A Gap is a published pair of gap and A_L: ground in the post of ONE half and
// mated with an ungapped half. Makers' gap figures are indicative only; between
// them they differ by up to 40 % in A_L at the same gap and core.
type Gap struct {
	Shape        string
	Length       float64 // m
	AL           float64 // H, per turn squared
	ALTolerance  float64 // 0..1, when ground to this A_L; 0: not published
	GapTolerance float64 // m, when ground to this length; 0: not published
	ALUngapped   float64 // H, of the same core and grade without a gap
	Source       string
}

// Gaps returns the published gaps of a shape, in the order of their source.
func Gaps(name string) []Gap {
	var list []Gap
	for _, g := range embeddedGaps() {
		if g.Shape == name {
			list = append(list, g)
		}
	}
	return list
}

// GroundTolerance returns how exactly a gap of a given length (m) is ground when
// its length governs, in m: 0.01 mm at 0.04 mm, 0.02 mm up to 0.2 mm, 0.05 mm
// above (data sheets of E 13/7/4, ETD 29/16/10, ETD 34/17/11, E 65/32/27).
func GroundTolerance(length float64) float64 {
	switch {
	case length <= 0.04e-3:
		return 0.01e-3
	case length <= 0.2e-3:
		return 0.02e-3
	}
	return 0.05e-3
}

// GapAL returns the A_L, in H, of a core with a gap (m) in its post, if the field
// crossed the gap within the section of the post only: the least that a gap gives,
// because fringing adds to it. ungapped is the A_L of the core without a gap.
func (s Shape) GapAL(gap, ungapped float64) float64 {
	return 1 / (1/ungapped + gap/(quantity.Mu0*s.PostArea()))
}

var embeddedGaps = sync.OnceValue(func() []Gap {
	list, err := readGaps()
	if err != nil {
		panic("shape: embedded gaps: " + err.Error()) // the tests read them, so this is a mistake of the build
	}
	return list
})

func readGaps() ([]Gap, error) {
	text, err := data.ReadFile("data/gaps.csv")
	if err != nil {
		return nil, err
	}
	f, err := table.Read("gaps.csv", bytes.NewReader(text),
		table.Column{Name: "shape", Required: true},
		table.Column{Name: "gap", Unit: "m", Required: true},
		table.Column{Name: "AL", Unit: "H", Required: true},
		table.Column{Name: "AL tolerance", Unit: "1"},
		table.Column{Name: "gap tolerance", Unit: "m"},
		table.Column{Name: "AL ungapped", Unit: "H", Required: true},
		table.Column{Name: "source", Required: true})
	if err != nil {
		return nil, err
	}
	var list []Gap
	for _, row := range f.Rows {
		g := Gap{
			Shape:      row.MustText("shape"),
			Length:     row.Positive("gap"),
			AL:         row.Positive("AL"),
			ALUngapped: row.Positive("AL ungapped"),
			Source:     row.MustText("source"),
		}
		g.ALTolerance, _ = row.Number("AL tolerance")
		g.GapTolerance, _ = row.Number("gap tolerance")
		if _, err := Embedded().Find(g.Shape); err != nil {
			row.Fail("shape", "%v", err)
		}
		list = append(list, g)
	}
	return list, f.Err()
}
