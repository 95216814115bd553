package figure

import (
	"fmt"
	"math"

	"gapwright/corelib/shape"
	"gapwright/magnetics/part"
)

// GapView draws the two core halves from the side, cut through the post, with
// the gap to scale: which half is ground and by how much, or which film lies
// under which legs.
func GapView(title string, sh shape.Shape, g part.Gap, comma bool) (Picture, error) {
	a, b, d, e, f := sh.A.Mean(), sh.B.Mean(), sh.D.Mean(), sh.E.Mean(), sh.F.Mean()
	if !(a > 0) || !(b > d) || !(d > 0) || !(e > f) || !(f > 0) {
		return Picture{}, fmt.Errorf("figure: the dimensions of %s do not make an E-shaped half", sh.Name)
	}
	scale := roundScale(math.Min(62/(a*1e3), 70/(2*b*1e3)))
	k := scale * 1e3
	film := 0.0
	if g.Kind == part.Spacer {
		film = g.Thickness
	}
	const top, left = 14.0, 10.0
	s := &sketch{width: left + a*k + 54, height: top + (2*b+film)*k + 9}
	s.text(4, 5.6, 4, "start", "%s", title).bold = true
	s.text(4, 9.8, 2.8, "start", "side view, cut through the post, drawn %s : 1", trim(scale))
	cx := left + a*k/2
	half := func(y float64, up bool, cut float64) {
		// y is the mating plane; an upper half stands above it.
		sgn := 1.0
		if up {
			sgn = -1
		}
		yy := func(v float64) float64 { return y + sgn*v*k }
		xx := func(v float64) float64 { return cx + v*k }
		s.polygon("half", ferriteColour, inkColour, 0.2,
			point{xx(-a / 2), yy(0)}, point{xx(-e / 2), yy(0)}, point{xx(-e / 2), yy(d)}, point{xx(-f / 2), yy(d)},
			point{xx(-f / 2), yy(cut)}, point{xx(f / 2), yy(cut)}, point{xx(f / 2), yy(d)}, point{xx(e / 2), yy(d)},
			point{xx(e / 2), yy(0)}, point{xx(a / 2), yy(0)}, point{xx(a / 2), yy(b)}, point{xx(-a / 2), yy(b)},
		)
	}
	plane := top + b*k
	x := left + a*k + 4
	note := func(y float64, bold bool, format string, args ...any) {
		s.text(x, y, 2.9, "start", format, args...).bold = bold
	}
	switch g.Kind {
	case part.Ground:
		n := max(g.Pieces, 1)
		piece := g.Total / float64(n)
		upper, lower := 0.0, 0.0
		if n == 1 {
			switch g.Half {
			case "lower":
				lower = piece
			case "both":
				upper, lower = piece/2, piece/2
			default:
				upper = piece
			}
		}
		half(plane, true, upper)
		half(plane, false, lower)
		if n > 1 {
			for _, c := range GapCenters(g, 2*d) {
				y := plane + d*k - c*k
				s.rect("gap", cx-f/2*k, y-piece*k/2, f*k, piece*k, paperColour, inkColour, 0.2).data = []string{"length-mm", trim6(piece * 1e3)}
			}
			note(plane-6, true, "%d gaps of %s", n, mm(piece, 2, comma))
			note(plane-1.8, false, "in the post, sum %s", mm(g.Total, 2, comma))
			note(plane+2.4, false, "discs, or gapped halves")
			break
		}
		y0, y1 := plane-upper*k, plane+lower*k
		s.rect("gap", cx-f/2*k, y0, f*k, y1-y0, paperColour, "", 0).data = []string{"length-mm", trim6(piece * 1e3)}
		ym := (y0 + y1) / 2
		s.line("leader", cx+f/4*k, ym, x-1, ym, 0.15, inkColour)
		switch g.Half {
		case "both":
			note(ym-4.6, true, "BOTH halves: posts")
			note(ym-0.8, true, "ground by %s each", mm(piece/2, 2, comma))
		case "lower":
			note(ym-4.6, true, "LOWER half only:")
			note(ym-0.8, true, "post ground by %s", mm(piece, 2, comma))
		default:
			note(ym-4.6, true, "UPPER half only:")
			note(ym-0.8, true, "post ground by %s", mm(piece, 2, comma))
		}
		note(ym+3.6, false, "outer legs touch,")
		note(ym+7.4, false, "no film, no glue between")
		s.text(cx, plane-(b+d)/2*k+1, 2.7, "middle", "upper")
		s.text(cx, plane+(b+d)/2*k+1, 2.7, "middle", "lower")
	case part.Spacer:
		half(plane, true, 0)
		half(plane+film*k, false, 0)
		for _, leg := range [][2]float64{{-a / 2, -e / 2}, {-f / 2, f / 2}, {e / 2, a / 2}} {
			s.rect("film", cx+leg[0]*k, plane, (leg[1]-leg[0])*k, math.Max(film*k, 0.3), spacerColour, "", 0).data = []string{"thickness-mm", trim6(film * 1e3)}
		}
		s.line("leader", left+a*k, plane+film*k/2, x-1, plane+film*k/2, 0.15, inkColour)
		note(plane-2.6, true, "film %s", mm(film, 3, comma))
		note(plane+1.4, false, "under all legs")
		note(plane+5.4, false, "no half is ground")
	default:
		half(plane, true, 0)
		half(plane, false, 0)
		note(plane-1, true, "no gap")
		note(plane+3, false, "faces as supplied")
	}
	s.text(left, s.height-3, 2.5, "start", "%s: %s x %s mm, post %s mm", sh.Name, mm(a, 1, comma), mm(2*b, 1, comma), mm(f, 1, comma))
	return s.picture("gap", title+": which half is ground, and by how much")
}
