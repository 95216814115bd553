// Package wire holds the open table of conductors: round enamelled wire (IEC
// 60317-0-1 and AWG), litz (IEC 60317-11), foil and triple-insulated wire, with
// their diameters, copper sections and resistances.
//
// A Wire is written the same way everywhere: "0.5 mm grade 2", "AWG 24",
// "120 x 0.1 mm litz", "0.2 mm foil"; Parse and Wire.String are each other's
// inverse. Lengths are in m, sections in m², resistances in ohm/m at a stated
// temperature in °C.
package wire

import (
	"errors"
	"fmt"
	"math"
	"regexp"
	"strconv"
	"strings"
)

// Kind is the build of a conductor.
type Kind string

// The kinds of conductors.
const (
	Solid Kind = "solid" // one round wire, enamelled or triple-insulated
	Litz  Kind = "litz"  // a bundle of enamelled strands
	Foil  Kind = "foil"  // bare copper foil as wide as the winding allows
)

// Serving is the textile cover of a litz bundle.
type Serving int

// The servings.
const (
	NoServing Serving = iota
	SingleServing
	DoubleServing
)

func (s Serving) String() string {
	switch s {
	case SingleServing:
		return "single"
	case DoubleServing:
		return "double"
	}
	return "none"
}

// ParseServing reads "none", "single" or "double".
func ParseServing(text string) (Serving, error) {
	for s := NoServing; s <= DoubleServing; s++ {
		if s.String() == text {
			return s, nil
		}
	}
	return NoServing, fmt.Errorf("serving %q is none of none, single, double", text)
}

// A Wire is one conductor as it comes from the reel.
type Wire struct {
	Kind            Kind
	Strands         int     // litz only
	Diameter        float64 // m, bare copper of the wire or of one strand; 0 for a foil
	Thickness       float64 // m, foil only
	Grade           int     // enamel of the wire or the strands by IEC 60317, 1 to 3; without meaning for a triple-insulated solid wire
	Serving         Serving // litz only
	TripleInsulated bool    // three extruded layers over a wire or a served bundle
	Width           float64 // m, foil only; set by the construction, not part of the text
	Own             *Own    // figures of the user's own row, see Table.Parse; nil: table and rules
}

// The enamel grades that a text without one means.
const (
	UsualSolidGrade  = 2
	UsualStrandGrade = 1
)

// The range of the conductors, in m. AWG 8 lies a little above the largest nominal
// size.
const (
	smallestDiameter = 0.018e-3
	largestNominal   = 3.15e-3
	largestDiameter  = 3.3e-3
	thinnestFoil     = 0.005e-3
	thickestFoil     = 3e-3
	fewestStrands    = 3
	mostStrands      = 50000
)

// A SyntaxError is a text that names no wire, with the nearest form that would.
type SyntaxError struct {
	Text    string
	Problem string
	Nearest string
}

func (e *SyntaxError) Error() string {
	return fmt.Sprintf("wire %q: %s; write for example %s", e.Text, e.Problem, e.Nearest)
}

const sizePattern = `(?:awg\s*(\d+)|((?:\d+(?:\.\d*)?|\.\d+))\s*(mm|um|µm|μm)?)`

var (
	litzForm     = regexp.MustCompile(`^(\d+)\s*x\s*` + sizePattern + `\s*litz\b(.*)$`)
	foilForm     = regexp.MustCompile(`^` + sizePattern + `\s*foil\b(.*)$`)
	solidForm    = regexp.MustCompile(`^` + sizePattern + `(?:\s*solid\b)?(.*)$`)
	gradeOption  = regexp.MustCompile(`^grade\s*(\d+)\b\s*`)
	servedOption = regexp.MustCompile(`^(single|double|no)[ -]serving\b\s*`)
	tripleOption = regexp.MustCompile(`^triple[ -]insulated\b\s*`)
	decimalComma = regexp.MustCompile(`\d,\d`)
	anyLitz      = regexp.MustCompile(`(\d+)\s*(?:x|strands?(?:\s+of)?)\s*(?:awg\s*)?(\d*[.,]?\d+)`)
	anySize      = regexp.MustCompile(`\d*[.,]?\d+`)
)

// Parse reads the text of a wire. Case, blanks and commas between the parts do
// not count; a solid wire without a grade has grade 2, strands without one have
// grade 1. The error is a *SyntaxError.
func Parse(text string) (Wire, error) {
	s := strings.ToLower(strings.TrimSpace(text))
	s = strings.ReplaceAll(s, "×", "x")
	w, err := parse(s)
	if err != nil {
		return Wire{}, &SyntaxError{Text: text, Problem: err.Error(), Nearest: nearestForm(s)}
	}
	return w, nil
}

// parse is Parse without the guess at what was meant.
func parse(s string) (Wire, error) {
	fail := func(format string, args ...any) (Wire, error) { return Wire{}, fmt.Errorf(format, args...) }
	if decimalComma.MatchString(s) {
		return fail("the decimal mark is a point")
	}
	s = strings.Join(strings.Fields(strings.ReplaceAll(s, ",", " ")), " ")
	if s == "" {
		return fail("the text is empty")
	}
	var w Wire
	var awg, number, unit, rest string
	if m := litzForm.FindStringSubmatch(s); m != nil {
		w = Wire{Kind: Litz, Grade: UsualStrandGrade}
		n, err := strconv.Atoi(m[1])
		if err != nil {
			return fail("%s is no number of strands", m[1])
		}
		w.Strands = n
		awg, number, unit, rest = m[2], m[3], m[4], m[5]
	} else if m := foilForm.FindStringSubmatch(s); m != nil {
		w = Wire{Kind: Foil}
		awg, number, unit, rest = m[1], m[2], m[3], m[4]
		if awg != "" {
			return fail("a foil has a thickness, no gauge")
		}
	} else if m := solidForm.FindStringSubmatch(s); m != nil {
		w = Wire{Kind: Solid, Grade: UsualSolidGrade}
		awg, number, unit, rest = m[1], m[2], m[3], m[4]
	} else {
		return fail("not the text of a wire")
	}
	size, err := parseSize(awg, number, unit)
	if err != nil {
		return Wire{}, err
	}
	if w.Kind == Foil {
		w.Thickness = size
	} else {
		w.Diameter = size
	}
	if err := w.parseOptions(strings.TrimSpace(rest)); err != nil {
		return Wire{}, err
	}
	return w, w.check()
}

// parseSize reads a gauge, or a number with its unit.
func parseSize(awg, number, unit string) (float64, error) {
	if awg != "" {
		n, err := strconv.Atoi(awg)
		if err != nil || n < LargestAWG || n > SmallestAWG {
			return 0, fmt.Errorf("the table has no AWG %s, it goes from AWG %d to AWG %d", awg, LargestAWG, SmallestAWG)
		}
		return AWGDiameter(n), nil
	}
	exponent := "e-6"
	switch unit {
	case "":
		return 0, fmt.Errorf("%s is a bare number", number)
	case "mm":
		exponent = "e-3"
	}
	size, err := strconv.ParseFloat(number+exponent, 64)
	if err != nil {
		return 0, fmt.Errorf("%s is not a size", number)
	}
	return size, nil
}

// parseOptions reads what may follow the size.
func (w *Wire) parseOptions(rest string) error {
	graded := false
	for rest != "" {
		if m := gradeOption.FindStringSubmatch(rest); m != nil {
			switch {
			case w.Kind == Foil:
				return errors.New("a foil has no enamel grade")
			case graded:
				return errors.New("the grade is given twice")
			case m[1] != "1" && m[1] != "2" && m[1] != "3":
				return fmt.Errorf("grade %s; the grades are 1, 2, 3", m[1])
			}
			w.Grade, graded = int(m[1][0]-'0'), true
			rest = rest[len(m[0]):]
		} else if m := servedOption.FindStringSubmatch(rest); m != nil {
			if w.Kind != Litz {
				return errors.New("only litz is served")
			}
			switch m[1] {
			case "single":
				w.Serving = SingleServing
			case "double":
				w.Serving = DoubleServing
			}
			rest = rest[len(m[0]):]
		} else if m := tripleOption.FindString(rest); m != "" {
			if w.Kind == Foil {
				return errors.New("a foil is not triple-insulated")
			}
			w.TripleInsulated = true
			rest = rest[len(m):]
		} else {
			return fmt.Errorf("%q is not understood", rest)
		}
	}
	if w.Kind == Solid && w.TripleInsulated {
		if graded {
			return errors.New("a triple-insulated wire has no enamel grade")
		}
		w.Grade = 0
	}
	return nil
}

// nearestForm guesses what a text was meant to be: the numbers in it, written as
// they should be and moved into the range of the table.
func nearestForm(s string) string {
	valid := func(w Wire) string {
		if w.check() != nil {
			return ""
		}
		return w.String()
	}
	size := func(text string, least, most float64) float64 {
		text = strings.Replace(text, ",", ".", 1)
		// A whole number in the range of the gauges is one unless it has a unit.
		if n, err := strconv.Atoi(text); err == nil && n >= LargestAWG && !strings.Contains(s, "mm") {
			return AWGDiameter(min(n, SmallestAWG))
		}
		v, err := strconv.ParseFloat(text+"e-3", 64)
		if err != nil {
			return 0
		}
		return min(max(v, least), most)
	}
	guess := ""
	if m := anyLitz.FindStringSubmatch(s); m != nil {
		if n, err := strconv.Atoi(m[1]); err == nil {
			guess = valid(Wire{Kind: Litz, Strands: min(max(n, fewestStrands), mostStrands), Diameter: size(m[2], smallestDiameter, largestNominal), Grade: UsualStrandGrade})
		}
	} else if m := anySize.FindString(s); m != "" {
		d := size(m, smallestDiameter, largestNominal)
		switch {
		case strings.Contains(s, "foil"):
			guess = valid(Wire{Kind: Foil, Thickness: size(m, thinnestFoil, thickestFoil)})
		case strings.Contains(s, "triple"):
			guess = valid(Wire{Kind: Solid, Diameter: d}.WithTripleInsulation())
		default:
			guess = valid(Wire{Kind: Solid, Diameter: d, Grade: UsualSolidGrade})
		}
	}
	if guess != "" {
		return guess
	}
	return "120 x 0.1 mm litz, 0.5 mm grade 2, AWG 24 or 0.2 mm foil"
}

// WithTripleInsulation returns the wire with three extruded layers; a solid one
// then has no enamel grade.
func (w Wire) WithTripleInsulation() Wire {
	w.TripleInsulated = true
	if w.Kind == Solid {
		w.Grade = 0
	}
	return w
}

// String returns the text that Parse reads.
func (w Wire) String() string {
	var b strings.Builder
	switch w.Kind {
	case Litz:
		fmt.Fprintf(&b, "%d x %s litz", w.Strands, sizeText(w.Diameter))
		if w.Grade != UsualStrandGrade {
			fmt.Fprintf(&b, " grade %d", w.Grade)
		}
		if w.Serving != NoServing {
			fmt.Fprintf(&b, ", %s serving", w.Serving)
		}
		if w.TripleInsulated {
			b.WriteString(", triple-insulated")
		}
	case Foil:
		b.WriteString(millimetres(w.Thickness) + " foil")
	default:
		size := sizeText(w.Diameter)
		b.WriteString(size)
		switch {
		case w.TripleInsulated:
			b.WriteString(" triple-insulated")
		case !(strings.HasPrefix(size, "AWG") && w.Grade == UsualSolidGrade):
			fmt.Fprintf(&b, " grade %d", w.Grade)
		}
	}
	return b.String()
}

// sizeText prints a diameter as its gauge when it is exactly one, else in mm.
func sizeText(d float64) string {
	for n := LargestAWG; n <= SmallestAWG; n++ {
		if d == AWGDiameter(n) { // exact on purpose: both come from the same expression
			return "AWG " + strconv.Itoa(n)
		}
	}
	return millimetres(d)
}

// millimetres prints a length with the shortest decimal that reads back as the
// same float.
func millimetres(m float64) string {
	s := strconv.FormatFloat(m, 'e', -1, 64)
	mantissa, exponent, found := strings.Cut(s, "e")
	if !found {
		return s + " mm" // not finite; Check refuses it
	}
	e, _ := strconv.Atoi(exponent)
	v, err := strconv.ParseFloat(mantissa+"e"+strconv.Itoa(e+3), 64)
	if err != nil {
		return s + " m"
	}
	return strconv.FormatFloat(v, 'f', -1, 64) + " mm"
}

// Check returns an error when the wire cannot exist or lies outside the table.
func (w Wire) Check() error {
	if err := w.check(); err != nil {
		return fmt.Errorf("wire %s: %w", w, err)
	}
	return nil
}

func (w Wire) check() error {
	switch w.Kind {
	case Foil:
		if !(w.Thickness >= thinnestFoil && w.Thickness <= thickestFoil) {
			return fmt.Errorf("a foil of %s; the thickness goes from %s to %s", millimetres(w.Thickness), millimetres(thinnestFoil), millimetres(thickestFoil))
		}
		return nil
	case Litz:
		if w.Strands < fewestStrands || w.Strands > mostStrands {
			return fmt.Errorf("%d strands; litz has %d to %d", w.Strands, fewestStrands, mostStrands)
		}
	case Solid:
		if w.Serving != NoServing {
			return errors.New("only litz is served")
		}
	default:
		return fmt.Errorf("kind %q is none of solid, litz, foil", w.Kind)
	}
	if !(w.Diameter >= smallestDiameter && w.Diameter <= largestDiameter) {
		return fmt.Errorf("a diameter of %s; round wire goes from 0.018 mm to 3.15 mm, AWG %d to AWG %d", millimetres(w.Diameter), LargestAWG, SmallestAWG)
	}
	if (w.Grade < 1 || w.Grade > 3) && !(w.Kind == Solid && w.TripleInsulated) {
		return fmt.Errorf("grade %d; the grades are 1, 2, 3", w.Grade)
	}
	return nil
}

// LargestAWG and SmallestAWG bound the gauges of the table.
const (
	LargestAWG  = 8
	SmallestAWG = 50
)

// AWGDiameter returns the bare diameter of a gauge, in m, by the formula of ASTM
// B258.
func AWGDiameter(n int) float64 {
	return 0.127e-3 * math.Pow(92, float64(36-n)/39)
}
