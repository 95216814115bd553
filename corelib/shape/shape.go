// Package shape holds the open table of ferrite core shapes and coil formers:
// dimensions with their limits, effective parameters, confidence and source of
// every row, and the geometry that follows from them.
//
// All lengths are in m, areas in m², volumes in m³. Dimensions are those of ONE
// half, effective parameters those of the SET of two halves. The published
// effective parameters are the ones to compute with; Computed gives those that
// follow from the mean dimensions by the rules of IEC 60205, as a proof of the
// dimensions. Whether a winding fits is judged with the worst limits (D min, E
// min, F max), not with the means.
//
// Axes: y runs along the post, which is also the winding breadth; x runs from
// the post to an outer leg; z is the thickness direction of the core.
package shape

import (
	"fmt"
	"math"
)

// A Range is a dimension with its limits, in m. A limit that is not known is 0;
// for a dimension that the family does not have both are 0.
type Range struct{ Min, Max float64 }

// Known reports whether at least one limit is known.
func (r Range) Known() bool { return r.Min > 0 || r.Max > 0 }

// Mean returns the middle of both limits, or the only one that is known.
func (r Range) Mean() float64 {
	switch {
	case r.Min > 0 && r.Max > 0:
		return (r.Min + r.Max) / 2
	case r.Max > 0:
		return r.Max
	}
	return r.Min
}

// Least returns the lower limit, or the only one that is known.
func (r Range) Least() float64 {
	if r.Min > 0 {
		return r.Min
	}
	return r.Max
}

// Most returns the upper limit, or the only one that is known.
func (r Range) Most() float64 {
	if r.Max > 0 {
		return r.Max
	}
	return r.Min
}

// The families of shapes.
const (
	ETD     = "ETD"
	ER      = "ER"
	E       = "E"
	EFD     = "EFD"
	PQ      = "PQ"
	RM      = "RM"
	RMLow   = "RM LP"
	EQ      = "EQ"
	EP      = "EP"
	P       = "P"
	PlanarE = "planar E"
	U       = "U"
)

// Families lists the families in the order of the table.
func Families() []string {
	return []string{ETD, ER, E, EFD, PQ, RM, RMLow, EQ, EP, P, PlanarE, U}
}

// A Confidence says how far the figures of a row are proven.
type Confidence string

// The letters of confidence, best first.
const (
	ConfidenceA Confidence = "A"
	ConfidenceB Confidence = "B"
	ConfidenceC Confidence = "C"
	ConfidenceD Confidence = "D"
)

// Meaning says in words what the letter promises.
func (c Confidence) Meaning() string {
	switch c {
	case ConfidenceA:
		return "dimensions and effective parameters read in a published data sheet"
	case ConfidenceB:
		return "effective parameters read in a published source, dimensions partly from memory and in agreement with them; check the maker's drawing before ordering"
	case ConfidenceC:
		return "dimensions and effective parameters from memory, in agreement with each other; check the maker's drawing before ordering"
	}
	return NotProven
}

// NotProven is what a user must read wherever a shape of confidence D is shown.
const NotProven = "dimension not proven: check the maker's drawing before ordering"

// A Shape is one row of the table of cores.
type Shape struct {
	Family   string
	Name     string
	Standard string

	A Range // m, overall length
	B Range // m, height of one half
	C Range // m, thickness
	D Range // m, depth of the window of one half
	E Range // m, width or diameter of the window
	F Range // m, width or diameter of the post; a U has none
	G Range // m, opening between the outer legs (PQ, EQ), slot between leg tips (RM), axis to open front (EP)
	H Range // m, diameter of the centre hole (P, RM)
	K Range // m, thickness of the post (EFD)
	R Range // m, size over the two cut corners (RM)
	S Range // m, width of one skirt slot (P)

	C1   float64 // 1/m, le/Ae
	Le   float64 // m
	Ae   float64 // m²
	Amin float64 // m²
	Ve   float64 // m³

	Confidence      Confidence
	DimensionSource string
	ParameterSource string
	Note            string
	Origin          string // "" for an embedded row, else the user's file
}

// Proven reports whether the dimensions may be relied on as far as their letter
// says; false means that NotProven has to be printed.
func (s Shape) Proven() bool { return s.Confidence != ConfidenceD }

// PostRound reports whether the post is a cylinder.
func (s Shape) PostRound() bool {
	switch s.Family {
	case E, PlanarE, EFD, U:
		return false
	}
	return true
}

// PostWidth returns the mean size of the post towards the outer legs (x), in m:
// its diameter when it is round, the width of one leg for a U.
func (s Shape) PostWidth() float64 {
	if s.Family == U {
		return (s.A.Mean() - s.E.Mean()) / 2
	}
	return s.F.Mean()
}

// PostDepth returns the mean size of the post in the thickness direction (z), in
// m; its diameter when it is round.
func (s Shape) PostDepth() float64 {
	switch s.Family {
	case E, PlanarE, U:
		return s.C.Mean()
	case EFD:
		return s.K.Mean()
	}
	return s.F.Mean()
}

// PostDiameter returns the mean diameter of a round post, in m, and for any other
// the diameter of the circle with the area of the post.
func (s Shape) PostDiameter() float64 {
	if s.PostRound() {
		return s.F.Mean()
	}
	return math.Sqrt(4 / math.Pi * s.PostArea())
}

// PostArea returns the mean section of the post, less its centre hole, in m².
func (s Shape) PostArea() float64 {
	if s.PostRound() {
		return math.Pi / 4 * (square(s.F.Mean()) - square(s.H.Mean()))
	}
	return s.PostWidth() * s.PostDepth()
}

// WindowBreadth returns the mean breadth of the window of the closed set, along
// the post, in m.
func (s Shape) WindowBreadth() float64 { return 2 * s.D.Mean() }

// WindowDepth returns the mean distance from the post to the outer leg, in m; for
// a U the whole distance between the legs.
func (s Shape) WindowDepth() float64 {
	if s.Family == U {
		return s.E.Mean()
	}
	return (s.E.Mean() - s.F.Mean()) / 2
}

// WindowBreadthLeast returns the breadth of the window that is there in the worst
// case, in m.
func (s Shape) WindowBreadthLeast() float64 { return 2 * s.D.Least() }

// WindowDepthLeast returns the depth of the window that is there in the worst
// case, in m: narrowest window around the thickest post.
func (s Shape) WindowDepthLeast() float64 {
	if s.Family == U {
		return s.E.Least()
	}
	return (s.E.Least() - s.F.Most()) / 2
}

// WindowArea returns the mean area of ONE window, in m².
func (s Shape) WindowArea() float64 { return s.WindowBreadth() * s.WindowDepth() }

// PlateThickness returns the mean thickness of the back wall of one half, in m.
func (s Shape) PlateThickness() float64 { return s.B.Mean() - s.D.Mean() }

// thickness returns the size of the bare core in the z direction.
func (s Shape) thickness() float64 {
	switch s.Family {
	case P, RM, RMLow:
		return s.A.Mean()
	}
	return s.C.Mean()
}

// An Outline is the box around something, in m.
type Outline struct {
	Length float64 // m, x
	Width  float64 // m, z
	Height float64 // m, y, along the post
}

// Volume returns the volume of the box, in m³.
func (o Outline) Volume() float64 { return o.Length * o.Width * o.Height }

// Outline returns the box around the bare set of two halves, mean dimensions.
func (s Shape) Outline() Outline {
	return Outline{Length: s.A.Mean(), Width: s.thickness(), Height: 2 * s.B.Mean()}
}

// WoundOutline returns the box around the set with its window wound full. Where
// the winding stands out of the core (E, ETD, ..) it is wider than Outline.
func (s Shape) WoundOutline() Outline {
	o := s.Outline()
	o.Width = max(o.Width, s.woundWidth())
	if s.Family == U {
		// The windings on both legs share the window; outside each reaches as far as inside.
		o.Length += s.E.Mean()
		o.Width = s.C.Mean() + s.E.Mean()
	}
	return o
}

// woundWidth is the z size of a winding that fills the window.
func (s Shape) woundWidth() float64 {
	if s.PostRound() {
		return s.E.Mean()
	}
	return s.PostDepth() + 2*s.WindowDepth()
}

// Volume returns the volume of WoundOutline, in m³.
func (s Shape) Volume() float64 { return s.WoundOutline().Volume() }

// Surface returns the outer surface of the wound part, in m²: what gives off heat
// when nothing else touches it. It is the sum of Surfaces.
func (s Shape) Surface() float64 {
	core, winding := s.Surfaces()
	return core + winding
}

// Surfaces returns the free outer surface of the core and that of a winding that
// fills the window, in m². The core counts as its outline (a cylinder for P)
// less the openings through which the winding is seen; of the winding counts
// what the outer legs and the plates do not cover.
func (s Shape) Surfaces() (core, winding float64) {
	o := s.Outline()
	breadth := s.WindowBreadth()
	if s.Family == P {
		r := s.A.Mean() / 2
		open := 2 * s.S.Mean() * breadth
		return 2*math.Pi*r*r + 2*math.Pi*r*o.Height - open, open
	}
	box := 2 * (o.Length*o.Width + o.Length*o.Height + o.Width*o.Height)
	if !s.PostRound() {
		// Two heads, each a block as wide as the window that stands out by q.
		q := (s.woundWidth() - o.Width) / 2
		e := s.E.Mean()
		if s.Family == U {
			e, q = s.A.Mean(), s.E.Mean()/2
		}
		q = max(q, 0)
		return box - 2*s.E.Mean()*breadth, 2 * (e*breadth + 2*q*(e+breadth))
	}
	e := s.E.Mean()
	open := 1 - s.FacedShare(0)
	winding = open * math.Pi * e * breadth
	if c := s.thickness() / 2; c < e/2 && s.Family != EP {
		// Of each end face of the winding two segments look past the plate.
		r := e / 2
		segment := r*r*math.Acos(c/r) - c*math.Sqrt(r*r-c*c)
		winding += 4 * segment
	}
	// In the faces that the winding looks out of, the core is not there: one
	// opening as wide as the chord between the leg tips, on each open side.
	chord := e * math.Sin(min(open*math.Pi/2, math.Pi/2))
	sides := 2.0
	if s.Family == EP {
		sides = 1
		chord = e * math.Sin(min(open*math.Pi, math.Pi/2))
	}
	return box - sides*chord*breadth, winding
}

// FacedShare returns the part (0..1) of a turn that lies inside the core, that
// is, in front of an outer leg. It is geometry: for a round post the arc that the
// legs are seen under from the axis, which is the same for every turn; for a
// rectangular post the pieces of the turn between the faces of the core. offset
// is the distance of the turn from the surface of the post, in m, at least 0.
func (s Shape) FacedShare(offset float64) float64 {
	e, c := s.E.Mean(), s.C.Mean()
	var share float64
	switch s.Family {
	case ETD, ER:
		share = 2 / math.Pi * arcsin(c/e)
	case PQ, EQ:
		share = 2 / math.Pi * arccos(s.G.Mean()/e)
	case RM, RMLow:
		share = 2 / math.Pi * arccos(s.G.Mean()/e)
	case EP:
		share = 0.5 + arcsin(2*s.G.Mean()/e)/math.Pi
	case P:
		share = 1 - 2/math.Pi*arcsin(s.S.Mean()/e)
	case U:
		offset = max(offset, 0)
		share = c / (2*(s.PostWidth()+c) + 2*math.Pi*offset)
	default:
		offset = max(offset, 0)
		w, k := s.PostWidth(), s.PostDepth()
		side := k
		if c > k { // the legs are thicker than the post: part of the rounded corners faces them too
			half := (c - k) / 2
			if offset <= half {
				side += math.Pi * offset
			} else {
				side += 2 * offset * math.Asin(half/offset)
			}
		}
		share = 2 * side / (2*(w+k) + 2*math.Pi*offset)
	}
	return min(max(share, 0), 1)
}

// OuterLegArea returns the section of all outer legs together, mean dimensions,
// in m²: what a spacer under all legs adds to the gap in the post is its
// thickness times PostArea over this. For a U it is the section of the other leg.
func (s Shape) OuterLegArea() float64 { return s.legArea() }

// FerriteVolume returns the volume of ferrite in the set, in m³, from the mean
// dimensions. It exceeds Ve by some per cent, for EP by a factor of two and more.
// The plates of P, PQ and RM are simplified; against catalogue masses (from
// memory) the result is within about 12 %.
func (s Shape) FerriteVolume() float64 {
	post := s.PostArea()
	return 2 * (s.PlateThickness()*s.plateArea() + s.D.Mean()*(s.legArea()+post))
}

// Mass returns the mass of the set, in kg, for a ferrite of the given density in
// kg/m³.
func (s Shape) Mass(density float64) float64 { return density * s.FerriteVolume() }

// plateArea is the face of one back wall as seen along the post.
func (s Shape) plateArea() float64 {
	e, f := s.E.Mean(), s.F.Mean()
	switch s.Family {
	case P:
		return math.Pi / 4 * (square(s.A.Mean()) - square(s.H.Mean()))
	case PQ, RM, RMLow:
		// Legs, the sectors between them and the axis, and the post itself on the open sides.
		beta := arccos(s.G.Mean() / e)
		return s.legArea() + beta*e*e/2 + (math.Pi-2*beta)*f*f/4 - math.Pi/4*square(s.H.Mean())
	}
	return s.A.Mean() * s.C.Mean()
}

// check returns what is impossible in the dimensions and parameters of a row,
// worded for its author.
func (s Shape) check() []string {
	var wrong []string
	say := func(format string, args ...any) { wrong = append(wrong, fmt.Sprintf(format, args...)) }
	mm := func(v float64) string { return fmt.Sprintf("%.4g mm", 1e3*v) }
	for _, d := range s.Dimensions() {
		if d.Range.Most() > largestDimension {
			say("%s %s is above 1 m; is the unit right?", d.Letter, mm(d.Range.Most()))
		}
		if d.Range.Min > 0 && d.Range.Max > 0 && d.Range.Min > d.Range.Max {
			say("%s_min %s is above %s_max %s", d.Letter, mm(d.Range.Min), d.Letter, mm(d.Range.Max))
		}
	}
	for _, letter := range required[s.Family] {
		if !s.dimension(letter).Known() {
			say("a shape of family %s needs %c", s.Family, letter)
		}
	}
	if len(wrong) > 0 {
		return wrong
	}
	if s.D.Most() >= s.B.Least() {
		say("the window is %s deep in a half of %s: no back wall is left", mm(s.D.Most()), mm(s.B.Least()))
	}
	if s.E.Most() >= s.A.Least() {
		say("the window E %s is wider than the core A %s", mm(s.E.Most()), mm(s.A.Least()))
	}
	if s.F.Known() && s.F.Most() >= s.E.Least() {
		say("the post F %s is wider than the window E %s", mm(s.F.Most()), mm(s.E.Least()))
	}
	if s.H.Most() >= s.F.Least() && s.F.Known() {
		say("the hole H %s is wider than the post F %s", mm(s.H.Most()), mm(s.F.Least()))
	}
	if s.K.Known() && s.K.Most() > s.C.Most() {
		say("the post K %s is thicker than the core C %s", mm(s.K.Most()), mm(s.C.Most()))
	}
	if s.G.Known() && s.Family != EP && s.G.Mean() >= s.E.Mean() {
		say("the opening G %s is wider than the window E %s: nothing is left of the outer legs", mm(s.G.Mean()), mm(s.E.Mean()))
	}
	if len(wrong) > 0 {
		return wrong
	}
	if s.legArea() <= 0 {
		say("the dimensions leave no section for the outer legs")
		return wrong
	}
	e, err := s.Computed()
	if err != nil {
		say("the dimensions leave a section of the magnetic path without area")
		return wrong
	}
	// The formulas of the families are within 18 % of every embedded row; half and
	// more is another core or another unit.
	for _, c := range []struct {
		name               string
		given, computed, k float64
		unit               string
	}{{"le", s.Le, e.Le, 1e3, "mm"}, {"Ae", s.Ae, e.Ae, 1e6, "mm2"}} {
		if ratio := c.given / c.computed; c.given > 0 && !(ratio > 0.5 && ratio < 2) {
			say("%s %.4g %s is far from the %.4g %s of the dimensions; is the unit right?", c.name, c.k*c.given, c.unit, c.k*c.computed, c.unit)
		}
	}
	return wrong
}

// largestDimension is far beyond any ferrite core, in m.
const largestDimension = 1.0

// required lists the dimensions without which the geometry of a family cannot be
// computed.
var required = map[string]string{
	ETD: "ABCDEF", ER: "ABCDEF", E: "ABCDEF", PlanarE: "ABCDEF", EFD: "ABCDEFK",
	PQ: "ABCDEFG", EQ: "ABCDEFG", RM: "ABDEFGR", RMLow: "ABDEFGR", EP: "ABCDEFG", P: "ABDEFHS", U: "ABCDE",
}

// A Dimension is one letter of the drawing with its limits.
type Dimension struct {
	Letter  string
	Meaning string
	Range   Range
}

// Dimensions returns the known dimensions in the order of their letters.
func (s Shape) Dimensions() []Dimension {
	all := []Dimension{
		{"A", "overall length", s.A}, {"B", "height of one half", s.B}, {"C", "thickness", s.C},
		{"D", "depth of the window of one half", s.D}, {"E", "width of the window", s.E},
		{"F", "width of the post", s.F}, {"G", "", s.G}, {"H", "diameter of the centre hole", s.H},
		{"K", "thickness of the post", s.K}, {"R", "size over the two cut corners", s.R},
		{"S", "width of one skirt slot", s.S},
	}
	if s.PostRound() {
		all[4].Meaning, all[5].Meaning = "diameter of the window", "diameter of the post"
	}
	switch s.Family {
	case RM, RMLow:
		all[6].Meaning = "slot between the tips of the legs"
	case EP:
		all[6].Meaning = "axis of the post to the open front"
	default:
		all[6].Meaning = "opening between the tips of the outer legs"
	}
	known := all[:0]
	for _, d := range all {
		if d.Range.Known() {
			known = append(known, d)
		}
	}
	return known
}

func (s Shape) dimension(letter rune) Range {
	for _, d := range s.Dimensions() {
		if d.Letter == string(letter) {
			return d.Range
		}
	}
	return Range{}
}

func square(x float64) float64 { return x * x }

// arcsin and arccos of a ratio of two dimensions, whose limits may push it a
// little over 1.
func arcsin(x float64) float64 { return math.Asin(min(max(x, -1), 1)) }
func arccos(x float64) float64 { return math.Acos(min(max(x, -1), 1)) }
