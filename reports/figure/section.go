package figure

import (
	"fmt"
	"math"

	"gapwright/corelib/shape"
)

// Section draws a set of two core halves to scale: the section through the post
// with the letters of its dimensions, the winding space of the coil former on the
// right (former may be nil), and the mating face seen along the post. All
// dimensions are means in mm.
func Section(sh shape.Shape, former *shape.Former) (Picture, error) {
	s, title, err := section(sh, former)
	if err != nil {
		return Picture{}, err
	}
	return s.picture("core", title)
}

func section(sh shape.Shape, former *shape.Former) (s *sketch, title string, err error) {
	a, b, d, e, f := sh.A.Mean(), sh.B.Mean(), sh.D.Mean(), sh.E.Mean(), sh.F.Mean()
	if !(a > e) || !(b > d) || !(d > 0) || !(e > f) {
		return nil, "", fmt.Errorf("figure: the dimensions of %s do not make a core half", sh.Name)
	}
	letter := "A"
	if sh.Family == shape.RM || sh.Family == shape.RMLow {
		// The legs stand on the diagonal, whose ends are cut to R.
		a, letter = sh.R.Mean(), "R"
	}
	deep := sh.Outline().Width
	if letter == "R" {
		deep = math.Sqrt2 * sh.E.Mean()
	}
	// Both views side by side: the scale is a round number that fills the sheet.
	scale := roundScale(math.Min(150/(2e3*a), 78/(1e3*math.Max(2*b, deep))))
	k := 1e3 * scale
	const (
		left, top = 17.0, 27.0
		between   = 24.0
		size      = 2.8
	)
	w := a * k
	tall := math.Max(2*b, deep) * k
	s = &sketch{width: math.Max(left+2*w+between+16, 150), height: top + tall + 27}
	s.text(left-11, 6.2, 4.4, "start", "%s", sh.Name).bold = true
	s.text(left-11, 10.8, size, "start", "mean dimensions in mm, drawn %s : 1 on paper; confidence %s", trim(scale), sh.Confidence)
	if !sh.Proven() {
		s.text(left-11, 15, size, "start", "%s", shape.NotProven).bold = true
	}

	// Section through the post, or through both legs of a U.
	cx, cy := left+w/2, top+tall/2
	px := func(v float64) float64 { return cx + v*k }
	py := func(v float64) float64 { return cy - v*k }
	ferrite := s.rect("core", px(-a/2), py(b), a*k, 2*b*k, ferriteColour, inkColour, 0.25)
	ferrite.data = []string{"part", "ferrite", "scale", trim(scale)}
	for _, side := range []float64{-1, 1} {
		inner, outer := side*f/2, side*e/2
		if sh.Family == shape.U {
			inner = 0
		}
		x0, x1 := math.Min(inner, outer), math.Max(inner, outer)
		window := s.rect("window", px(x0), py(d), (x1-x0)*k, 2*d*k, paperColour, "", 0)
		window.data = []string{"breadth-mm", trim6(2e3 * d), "depth-mm", trim6(1e3 * (x1 - x0))}
	}
	edges := []float64{-e / 2, e / 2}
	if sh.Family != shape.U {
		edges = append(edges, -f/2, f/2)
	}
	for _, x := range edges {
		s.line("edge", px(x), py(d), px(x), py(-d), 0.25, inkColour)
	}
	for _, y := range []float64{d, -d} {
		if sh.Family == shape.U {
			s.line("edge", px(-e/2), py(y), px(e/2), py(y), 0.25, inkColour)
			continue
		}
		s.line("edge", px(-e/2), py(y), px(-f/2), py(y), 0.25, inkColour)
		s.line("edge", px(f/2), py(y), px(e/2), py(y), 0.25, inkColour)
	}
	if h := sh.H.Mean(); h > 0 {
		s.rect("hole", px(-h/2), py(b), h*k, 2*b*k, paperColour, inkColour, 0.2)
	}
	// The mating plane runs through legs and post.
	planes := [][2]float64{{-a / 2, -e / 2}, {-f / 2, f / 2}, {e / 2, a / 2}}
	if sh.Family == shape.U {
		planes = [][2]float64{planes[0], planes[2]}
	}
	for _, p := range planes {
		s.line("mating", px(p[0]), cy, px(p[1]), cy, 0.15, inkColour)
	}
	if former != nil && former.Breadth > 0 {
		surface := f / 2
		x0 := surface + former.WallOffset
		if sh.Family == shape.U { // around the left leg, inside the window
			x0 = -e/2 + former.WallOffset
		}
		space := s.rect("winding-space", px(x0), py(former.Breadth/2), former.Height*k, former.Breadth*k, plasticColour, faintColour, 0.2)
		space.dashed = true
		space.data = []string{"breadth-mm", trim6(1e3 * former.Breadth), "height-mm", trim6(1e3 * former.Height)}
		word := "winding space"
		if former.Derived {
			word = "by rule"
		}
		x := px(x0 + former.Height/2)
		figures := trim(round2(1e3*former.Breadth)) + " × " + trim(round2(1e3*former.Height))
		wide := math.Max(textWidth(word, 2.3), textWidth(figures, 2.3)) + 1
		switch {
		case wide < former.Height*k && former.Breadth*k > 5.6:
			s.text(x, cy-0.6, 2.3, "middle", "%s", word)
			s.text(x, cy+2.4, 2.3, "middle", "%s", figures)
		case wide < former.Breadth*k && former.Height*k > 5.6:
			s.text(x-0.6, cy, 2.3, "middle", "%s", word).turned = true
			s.text(x+2.4, cy, 2.3, "middle", "%s", figures).turned = true
		}
	}
	axis := s.line("axis", cx, py(b)-3, cx, py(-b)+3, 0.15, faintColour)
	axis.dashed = true

	// Dimensions of the section.
	below := py(-b)
	measure := func(x0, x1, y float64, text string) {
		s.line("extension", x0, below+0.6, x0, y+1, 0.12, faintColour)
		s.line("extension", x1, below+0.6, x1, y+1, 0.12, faintColour)
		s.arrow(x0, y, x1, y)
		s.text((x0+x1)/2, y-0.8, size, "middle", "%s", text)
	}
	row := below + 5
	if sh.F.Known() {
		measure(px(-f/2), px(f/2), row, "F "+trim(round2(1e3*f)))
		row += 5.5
	}
	measure(px(-e/2), px(e/2), row, "E "+trim(round2(1e3*e)))
	row += 5.5
	measure(px(-a/2), px(a/2), row, letter+" "+trim(round2(1e3*a)))
	upright := func(x, y0, y1 float64, text string) {
		s.line("extension", px(-a/2)-0.6, y0, x-1, y0, 0.12, faintColour)
		s.line("extension", px(-a/2)-0.6, y1, x-1, y1, 0.12, faintColour)
		s.arrow(x, y0, x, y1)
		s.text(x-0.9, (y0+y1)/2, size, "middle", "%s", text).turned = true
	}
	upright(px(-a/2)-4.5, py(d), py(-d), "2 D "+trim(round2(2e3*d)))
	upright(px(-a/2)-10.5, py(b), py(-b), "2 B "+trim(round2(2e3*b)))

	// The mating face.
	fx, fy := left+w+between+w/2, top+tall/2
	matingFace(s, sh, fx, fy, k)
	if c := sh.C.Mean(); c > 0 {
		x := fx + w/2 + 5
		high, low := c/2, -c/2
		if sh.Family == shape.EP {
			high, low = sh.G.Mean(), sh.G.Mean()-c
			shift := (high + low) / 2
			high, low = high-shift, low-shift
		}
		s.line("extension", fx+w/2+0.6, fy-high*k, x+1, fy-high*k, 0.12, faintColour)
		s.line("extension", fx+w/2+0.6, fy-low*k, x+1, fy-low*k, 0.12, faintColour)
		s.arrow(x, fy-high*k, x, fy-low*k)
		s.text(x-0.9, fy, size, "middle", "C %s", trim(round2(1e3*c))).turned = true
	}
	s.text(cx, s.height-3, size, "middle", "section through %s", map[bool]string{true: "both legs", false: "the post"}[sh.Family == shape.U])
	word := "mating face"
	var face shape.Range // the size over the flats, where the section shows the diagonal
	if letter == "R" {
		face = sh.A
	}
	for _, x := range []struct {
		letter string
		r      shape.Range
	}{{"A", face}, {"G", sh.G}, {"H", sh.H}, {"K", sh.K}, {"S", sh.S}} {
		if x.r.Mean() > 0 {
			word += ", " + x.letter + " " + trim(round2(1e3*x.r.Mean()))
		}
	}
	s.text(fx, s.height-3, size, "middle", "%s", word)
	return s, fmt.Sprintf("%s: section through the post and mating face, %s : 1", sh.Name, trim(scale)), nil
}

func round2(x float64) float64 { return math.Round(100*x) / 100 }

// matingFace draws post and outer legs as seen along the post, the legs in the
// direction of x, around the point (ox, oy) on paper.
func matingFace(s *sketch, sh shape.Shape, ox, oy, k float64) {
	a, c, e, f, g := sh.A.Mean(), sh.C.Mean(), sh.E.Mean(), sh.F.Mean(), sh.G.Mean()
	shift := 0.0
	at := func(x, z float64) point { return point{ox + x*k, oy - (z+shift)*k} }
	both := func(points []point) {
		right := make([]point, len(points))
		mirrored := make([]point, len(points))
		for i, p := range points {
			right[i] = at(p.x, p.y)
			mirrored[i] = at(-p.x, p.y)
		}
		for _, p := range [][]point{right, mirrored} {
			s.polygon("leg", ferriteColour, inkColour, 0.25, p...)
		}
	}
	r := e / 2
	// bow runs along the circle of the window from one angle to another.
	bow := func(from, to, radius float64) []point {
		const steps = 32
		list := make([]point, steps+1)
		for i := range list {
			phi := from + (to-from)*float64(i)/steps
			list[i] = point{radius * math.Cos(phi), radius * math.Sin(phi)}
		}
		return list
	}
	switch sh.Family {
	case shape.ETD, shape.ER:
		theta := math.Asin(math.Min(c/e, 1))
		both(append([]point{{a / 2, -c / 2}, {a / 2, c / 2}}, bow(theta, -theta, r)...))
	case shape.PQ, shape.EQ:
		beta := math.Acos(math.Min(g/e, 1))
		if r*math.Sin(beta) > c/2 {
			beta = math.Asin(c / e)
		}
		both(append(append([]point{{a / 2, -c / 2}, {a / 2, c / 2}, {r * math.Cos(beta), c / 2}}, bow(beta, -beta, r)...), point{r * math.Cos(beta), -c / 2}))
	case shape.RM, shape.RMLow:
		// Legs on the diagonal of the square, their corners cut to R.
		beta := math.Acos(math.Min(g/e, 1))
		edge := a / math.Sqrt2
		cut := sh.R.Mean() / 2
		t := edge / (math.Cos(beta) + math.Sin(beta))
		both(append([]point{{cut, -(edge - cut)}, {cut, edge - cut}, {t * math.Cos(beta), t * math.Sin(beta)}},
			append(bow(beta, -beta, r), point{t * math.Cos(beta), -t * math.Sin(beta)})...))
	case shape.P:
		outer, inner := math.Asin(sh.S.Mean()/a), math.Asin(sh.S.Mean()/e)
		for _, turn := range []float64{-math.Pi / 2, math.Pi / 2} {
			var points []point
			for _, p := range append(bow(outer+turn, math.Pi-outer+turn, a/2), bow(math.Pi-inner+turn, inner+turn, r)...) {
				points = append(points, at(p.x, p.y))
			}
			s.polygon("leg", ferriteColour, inkColour, 0.25, points...)
		}
	case shape.EP:
		// The axis of the post is G behind the open front.
		shift = c/2 - g
		points := []point{{-a / 2, g}, {-a / 2, g - c}, {a / 2, g - c}, {a / 2, g}, {e / 2, g}}
		points = append(append(points, bow(0, -math.Pi, r)...), point{-e / 2, g})
		for i, p := range points {
			points[i] = at(p.x, p.y)
		}
		s.polygon("leg", ferriteColour, inkColour, 0.25, points...)
	default:
		both([]point{{e / 2, -c / 2}, {a / 2, -c / 2}, {a / 2, c / 2}, {e / 2, c / 2}})
	}
	switch {
	case sh.Family == shape.U:
	case sh.PostRound():
		center := at(0, 0)
		s.circle("post", center.x, center.y, f/2*k, ferriteColour, inkColour, 0.25)
		if h := sh.H.Mean(); h > 0 {
			s.circle("hole", center.x, center.y, h/2*k, paperColour, inkColour, 0.2)
		}
	default:
		depth := sh.PostDepth()
		corner := at(-f/2, depth/2)
		s.rect("post", corner.x, corner.y, f*k, depth*k, ferriteColour, inkColour, 0.25)
	}
}
