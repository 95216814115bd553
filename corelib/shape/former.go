package shape

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// A Former is a coil former with its winding space. Lengths in m, areas in m².
//
// The winding space of one chamber is Breadth long and Height deep; it begins
// WallOffset outside the post. Breadth is that of ONE chamber.
type Former struct {
	Shape       string // name of the core it belongs to
	Name        string
	Chambers    int
	Breadth     float64 // m, winding breadth of one chamber
	Height      float64 // m, available winding height
	AreaMin     float64 // m², least winding area of one chamber
	MLT         float64 // m, mean length of a turn in the middle of Height
	WallOffset  float64 // m, from the mean surface of the post to the floor of the winding space
	Flange      float64 // m, from the yoke to the winding space at each end, play included
	ChamberWall float64 // m, wall between two chambers; 0 with one chamber
	Pins        int     // 0: not known
	PinPitch    float64 // m; 0: not known
	RowSpacing  float64 // m; 0: not known
	Mounting    string  // horizontal, vertical or ""
	Source      string
	PinSource   string
	Derived     bool   // the winding space comes from a rule, not from a published former
	Band        string // how far the rule has been off, for a derived former or breadth
	Note        string
	Origin      string // "" for an embedded row, else the user's file
}

// TurnLength returns the length, in m, of a turn whose middle lies depth (m)
// above the floor of the winding space. It grows by 2 pi of the depth and equals
// MLT in the middle of the winding height.
func (f Former) TurnLength(depth float64) float64 {
	return f.MLT + 2*math.Pi*(depth-f.Height/2)
}

// ChamberWallUsual is the wall between two chambers, in m, where nothing better
// is known: common practice for moulded formers.
const ChamberWallUsual = 1.2e-3

// Split returns the former with two chambers side by side, a wall (m) between
// them. A published two-chamber former should be preferred to it.
func (f Former) Split(wall float64) (Former, error) {
	breadth := (f.Breadth - wall) / 2
	if f.Chambers != 1 {
		return Former{}, fmt.Errorf("former %s has %d chambers already", f.Name, f.Chambers)
	}
	if !(wall >= 0) || !(breadth > 0) {
		return Former{}, fmt.Errorf("former %s: a chamber wall of %.3g mm does not leave any of the %.3g mm winding breadth", f.Name, 1e3*wall, 1e3*f.Breadth)
	}
	f.Chambers = 2
	f.Breadth = breadth
	f.ChamberWall = wall
	f.AreaMin = f.Breadth * f.Height
	f.Derived = true
	f.Source = join(f.Source, fmt.Sprintf("two chambers derived from it with a wall of %.3g mm (common practice)", 1e3*wall))
	f.Pins, f.PinPitch, f.RowSpacing, f.PinSource = 0, 0, 0, ""
	return f, nil
}

// A formerRule derives the winding space from the worst limits of a core:
//
//	breadth = 2 D_min - 2 tf        height = (E_min - F_max)/2 - tt
//	MLT     = pi (F_max + 2 x + height)                       round post
//	        = 2 (F_max + C_max) + 2 pi (x + height/2)         rectangular post
//
// The constants were fitted to formers whose figures are mostly from memory, so
// they are a fit and no independent proof; the bands are the largest deviations
// met, and a test holds them against the table.
type formerRule struct {
	flange, wall, inside linear // tf, tt, x: in m, from the size of the core in m
	from                 string // family the constants were fitted to
	area, mlt            [2]int // %, rule over published figure, lowest and highest
	compared             int    // formers it was compared with; 0: none of this family
}

// linear is a constant and a share of the size of the core.
type linear struct{ at0, slope float64 }

func (l linear) of(size float64) float64 { return l.at0 + l.slope*size }

func ruleFor(family string) (formerRule, bool) {
	etd := formerRule{linear{0.9e-3, 0.010}, linear{0.25e-3, 0.028}, linear{1.1e-3, 0}, ETD, [2]int{-3, 5}, [2]int{-3, 2}, 7}
	e := formerRule{linear{0.2e-3, 0.033}, linear{0.5e-3, 0.032}, linear{0.8e-3, 0.025}, E, [2]int{-13, 13}, [2]int{-7, 14}, 9}
	efd := formerRule{linear{0.85e-3, 0}, linear{0.80e-3, 0}, linear{0.6e-3, 0}, EFD, [2]int{-1, 2}, [2]int{-13, 6}, 4}
	pq := formerRule{linear{1.0e-3, 0}, linear{1.2e-3, 0}, linear{1.0e-3, 0}, PQ, [2]int{-4, 7}, [2]int{-1, 1}, 8}
	// For RM the size is its number in mm, not a dimension.
	rm := formerRule{linear{0.5e-3, 0.05}, linear{0.4e-3, 0.045}, linear{0.8e-3, 0}, RM, [2]int{-2, 7}, [2]int{-1, 9}, 6}
	p := formerRule{linear{0.7e-3, 0}, linear{0.75e-3, 0}, linear{0.6e-3, 0}, P, [2]int{-12, 11}, [2]int{-1, 1}, 7}
	borrowed := func(r formerRule) formerRule { r.compared = 0; return r }
	switch family {
	case ETD:
		return etd, true
	case ER:
		return borrowed(etd), true
	case E:
		return e, true
	case U:
		return borrowed(e), true
	case EFD:
		return efd, true
	case PQ:
		return pq, true
	case EQ:
		return borrowed(pq), true
	case RM:
		return rm, true
	case RMLow:
		return borrowed(rm), true
	case P:
		return p, true
	case EP:
		return borrowed(p), true
	case PlanarE:
		// Thin walls as for small flat formers; planar windings mostly have none.
		return borrowed(formerRule{linear{0.3e-3, 0}, linear{0.6e-3, 0}, linear{0.5e-3, 0}, PlanarE, [2]int{}, [2]int{}, 0}), true
	}
	return formerRule{}, false
}

// band states the error of the rule in words.
func (r formerRule) band() string {
	if r.compared == 0 {
		return "no former of this family to compare with: take +/-20 % on the winding area and +/-10 % on the turn length (our own estimate)"
	}
	return fmt.Sprintf("over %d formers of the family the rule gave %+d..%+d %% of the winding area and %+d..%+d %% of the turn length",
		r.compared, r.area[0], r.area[1], r.mlt[0], r.mlt[1])
}

// RuleFormer derives the one-chamber former of a core from the rule of its
// family. It fails when the core is too small for the walls of the rule.
func RuleFormer(s Shape) (Former, error) {
	rule, ok := ruleFor(s.Family)
	if !ok {
		return Former{}, fmt.Errorf("no coil former rule for family %q of core %s", s.Family, s.Name)
	}
	size := s.A.Most()
	if s.Family == RM || s.Family == RMLow {
		size = 1e-3 * sizeNumber(s)
	}
	f := Former{Shape: s.Name, Name: s.Name, Chambers: 1, Derived: true, Band: rule.band()}
	f.Flange = rule.flange.of(size)
	f.Breadth = s.WindowBreadthLeast() - 2*f.Flange
	f.Height = s.WindowDepthLeast() - rule.wall.of(size)
	if f.Breadth <= 0 || f.Height <= 0 {
		return Former{}, fmt.Errorf("core %s is too small for the coil former rule: winding space %.3g x %.3g mm", s.Name, 1e3*f.Breadth, 1e3*f.Height)
	}
	x := rule.inside.of(size)
	if s.PostRound() {
		f.MLT = math.Pi * (s.F.Most() + 2*x + f.Height)
	} else {
		w, d := s.postMost()
		f.MLT = 2*(w+d) + 2*math.Pi*(x+f.Height/2)
	}
	f.AreaMin = f.Breadth * f.Height
	f.Source = "derived: rule for formers of family " + rule.from
	if s.Family == U {
		f.Note = "one former on one leg, which takes the whole window"
	}
	f.WallOffset = wallOffset(s, f)
	return f, nil
}

// postMost returns the largest width and depth of a rectangular post.
func (s Shape) postMost() (width, depth float64) {
	switch s.Family {
	case U:
		return (s.A.Most() - s.E.Least()) / 2, s.C.Most()
	case EFD:
		return s.F.Most(), s.K.Most()
	}
	return s.F.Most(), s.C.Most()
}

// wallOffset places the floor of the winding space: where the mean turn length
// puts it, but at most at four fifths of the depth that the former takes from
// the window (our own share; the rest is play to the outer leg, without which the
// former could not be closed). The second case holds for rectangular posts,
// whose turn length includes the bulge of the winding at the heads.
func wallOffset(s Shape, f Former) float64 {
	var x float64 // from the surface of the thickest post
	if s.PostRound() {
		x = (f.MLT/math.Pi - s.F.Most() - f.Height) / 2
	} else {
		w, d := s.postMost()
		x = (f.MLT-2*(w+d))/(2*math.Pi) - f.Height/2
	}
	taken := s.WindowDepthLeast() - f.Height
	x = min(max(x, 0.4*taken), 0.8*taken)
	if s.Family == U {
		return x
	}
	return x + (s.F.Most()-s.F.Mean())/2
}

// sizeNumber reads the n of "RM n".
func sizeNumber(s Shape) float64 {
	for word := range strings.FieldsSeq(s.Name) {
		if n, err := strconv.ParseFloat(word, 64); err == nil {
			return n
		}
	}
	// A name without a number: RM n is about 2.4 n mm long (RM 5 to RM 14 within 2 %).
	return math.Round(1e3 * s.A.Mean() / 2.4)
}

func join(a, b string) string {
	if a == "" {
		return b
	}
	return a + "; " + b
}
