package figure

import (
	"bytes"
	"fmt"
	"html"
	"math"
	"sort"
	"strconv"
	"strings"
)

// A Chart is a plot with one x axis and one or more panels above each other
// that share it. Curves are named at their right end, so that nobody has to
// tell colours apart.
type Chart struct {
	Name   string
	Title  string  // what it shows, in words, also for those who cannot see it
	Width  float64 // mm; 0: 110
	X      Axis
	Panels []Panel
}

// An Axis is one axis. Limits that are equal are taken from the data.
type Axis struct {
	Label    string // with the unit
	Log      bool
	Min, Max float64
	Zero     bool // the data's limits are widened to zero
}

// A Panel is one plot of a Chart.
type Panel struct {
	Y      Axis
	Height float64 // mm, of the plot itself; 0: 50
	Curves []Curve
	Marks  []Mark
	Rules  []Rule
	Bands  []Band
}

// A Tone is a colour with a meaning; the same thing has the same one in every
// drawing.
type Tone int

// The tones.
const (
	Ink Tone = iota
	Primary
	Secondary
	OtherHalf
	Accent
	Faint
)

var toneColours = [...]string{inkColour, primaryColour, secondaryColour, otherHalfColour, spacerColour, faintColour}

// A Curve is one line through points in order.
type Curve struct {
	Name   string // at its right end; empty: none
	X, Y   []float64
	Tone   Tone
	Dashed bool
	Thin   bool
}

// Shapes of a mark.
const (
	Dot     = "dot"
	Ring    = "ring"
	Diamond = "diamond" // hollow
	Star    = "star"    // a dot in a ring
)

// A Mark is one point. ID goes into the SVG so that a page can find it.
type Mark struct {
	X, Y  float64
	Shape string
	Tone  Tone
	Label string // beside it
	ID    string
	Tip   string // words for the point itself
}

// A Rule is a thin line across the panel, at x or, when Across is set, at y.
type Rule struct {
	At     float64
	Across bool
	Label  string
	Tone   Tone
}

// A Band is a shaded range of x.
type Band struct {
	From, To float64
	Label    string
}

// Layout of a chart, mm.
const (
	chartFont  = 3.0
	chartSmall = 2.7
	chartLeft  = 15.5
	panelGap   = 4.5
)

// scale is one axis laid out on paper.
type scale struct {
	min, max float64
	from, to float64 // mm
	log      bool
}

func (s scale) at(v float64) float64 {
	if s.log {
		v = math.Max(v, 1e-300)
		return s.from + (math.Log(v)-math.Log(s.min))/(math.Log(s.max)-math.Log(s.min))*(s.to-s.from)
	}
	return s.from + (v-s.min)/(s.max-s.min)*(s.to-s.from)
}

// widen makes room around data that are all alike but for rounding: steps below
// the last digit would never end.
func (s *scale) widen() {
	size := math.Max(math.Abs(s.min), math.Abs(s.max))
	if s.max-s.min <= 1e-9*size || size == 0 {
		pad := math.Max(size*0.1, 1e-12)
		s.min, s.max = s.min-pad, s.max+pad
	}
}

// newScale widens the limits of the data to round numbers.
func newScale(a Axis, data []float64, from, to float64, wanted int) (scale, []float64, error) {
	s := scale{min: a.Min, max: a.Max, from: from, to: to, log: a.Log}
	for _, v := range append([]float64{a.Min, a.Max}, data...) {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return s, nil, fmt.Errorf("figure: %g on the axis %q", v, a.Label)
		}
	}
	if s.min == s.max {
		s.min, s.max = math.Inf(1), math.Inf(-1)
		for _, v := range data {
			s.min, s.max = math.Min(s.min, v), math.Max(s.max, v)
		}
		if a.Zero {
			s.min, s.max = math.Min(s.min, 0), math.Max(s.max, 0)
		}
		if math.IsInf(s.min, 0) {
			return s, nil, fmt.Errorf("figure: %q has no points", a.Label)
		}
		if s.log {
			if !(s.min > 0) {
				return s, nil, fmt.Errorf("figure: %g on the logarithmic axis %q", s.min, a.Label)
			}
			s.min, s.max = s.min/1.15, s.max*1.15
			return s, logTicks(s.min, s.max), nil
		}
		s.widen()
		step := roundStep((s.max - s.min) / float64(wanted))
		s.min, s.max = math.Floor(s.min/step+1e-9)*step, math.Ceil(s.max/step-1e-9)*step
	}
	if s.log {
		if !(s.min > 0) || !(s.max > s.min) {
			return s, nil, fmt.Errorf("figure: logarithmic axis %q from %g to %g", a.Label, s.min, s.max)
		}
		return s, logTicks(s.min, s.max), nil
	}
	if !(s.max > s.min) {
		return s, nil, fmt.Errorf("figure: axis %q from %g to %g", a.Label, s.min, s.max)
	}
	s.widen()
	step := roundStep((s.max - s.min) / float64(wanted))
	var ticks []float64
	for k := math.Ceil(s.min/step - 1e-9); k*step <= s.max+1e-9*step; k++ {
		ticks = append(ticks, k*step)
	}
	return s, ticks, nil
}

// logTicks are 1, 2, 5 times powers of ten, all digits over a short range, powers
// alone over a long one.
func logTicks(low, high float64) []float64 {
	digits := []float64{1, 2, 5}
	switch span := math.Log10(high / low); {
	case span < 0.9:
		digits = []float64{1, 1.5, 2, 2.5, 3, 4, 5, 6, 7, 8, 9}
	case span > 3.2:
		digits = []float64{1}
	}
	var list []float64
	for e := math.Floor(math.Log10(low)); e <= math.Ceil(math.Log10(high)); e++ {
		for _, d := range digits {
			if v := d * math.Pow(10, e); v >= low && v <= high {
				list = append(list, v)
			}
		}
	}
	return list
}

// roundStep is the least of 1, 2, 2.5, 5 times a power of ten that is not below x.
func roundStep(x float64) float64 {
	if !(x > 0) || math.IsInf(x, 0) {
		return 1
	}
	p := math.Pow(10, math.Floor(math.Log10(x)))
	for _, m := range []float64{1, 2, 2.5, 5, 10} {
		if m*p >= x*(1-1e-9) {
			return m * p
		}
	}
	return 10 * p
}

func tickText(v float64) string {
	if math.Abs(v) < 1e-12 {
		return "0"
	}
	t := strconv.FormatFloat(v, 'g', 4, 64)
	if strings.Contains(t, "e") {
		t = strconv.FormatFloat(v, 'f', -1, 64)
	}
	return strings.Replace(t, "-", "−", 1)
}

// polyline is a curve on paper.
type polyline struct {
	points []point
	colour string
	weight float64
	dashed bool
	index  string
}

// drawing is a sketch with curves over it.
type drawing struct {
	sketch
	curves []polyline
	over   sketch // marks that lie over the curves
}

// SVG draws the chart.
func (c Chart) SVG() ([]byte, error) {
	d, err := c.draw()
	if err != nil {
		return nil, err
	}
	return d.svg(c.Title), nil
}

// Picture draws the chart in both forms.
func (c Chart) Picture() (Picture, error) {
	d, err := c.draw()
	if err != nil {
		return Picture{}, err
	}
	flat := d.sketch
	for _, p := range d.curves {
		for i := 1; i < len(p.points); i++ {
			a, b := p.points[i-1], p.points[i]
			if p.dashed && i%4 >= 2 {
				continue // short pieces would each begin a dash of their own
			}
			flat.line("", a.x, a.y, b.x, b.y, p.weight, p.colour)
		}
	}
	flat.marks = append(flat.marks, d.over.marks...)
	p, err := flat.picture(c.Name, c.Title)
	p.SVG = d.svg(c.Title)
	return p, err
}

// svg puts curves and upper marks into the sketch's own form.
func (d *drawing) svg(title string) []byte {
	var b bytes.Buffer
	b.Write(bytes.TrimSuffix(d.sketch.svg(title), []byte("</svg>\n")))
	for _, p := range d.curves {
		style := fmt.Sprintf(`stroke="%s" stroke-width="%s"`, p.colour, coordinate(p.weight))
		if p.dashed {
			style += ` stroke-dasharray="1.8 1.2"`
		}
		fmt.Fprintf(&b, `<polyline class="curve" data-curve="%s" fill="none" stroke-linejoin="round" %s points="`, html.EscapeString(p.index), style)
		for i, q := range p.points {
			if i > 0 {
				b.WriteByte(' ')
			}
			b.WriteString(short(q.x))
			b.WriteByte(',')
			b.WriteString(short(q.y))
		}
		b.WriteString("\"/>\n")
	}
	b.Write(body(&d.over))
	b.WriteString("</svg>\n")
	return b.Bytes()
}

// body is a sketch's marks without the frame of a file.
func body(s *sketch) []byte {
	all := s.svg("")
	// The frame is three lines and the closing tag.
	for range 3 {
		if i := bytes.IndexByte(all, '\n'); i >= 0 {
			all = all[i+1:]
		}
	}
	return bytes.TrimSuffix(all, []byte("</svg>\n"))
}

// short is a coordinate to the hundredth of a mm.
func short(x float64) string {
	t := strconv.FormatFloat(x, 'f', 2, 64)
	return strings.TrimSuffix(strings.TrimRight(t, "0"), ".")
}

func (c Chart) draw() (*drawing, error) {
	if len(c.Panels) == 0 {
		return nil, fmt.Errorf("figure: chart %q without a panel", c.Name)
	}
	width := c.Width
	if width == 0 {
		width = 110
	}
	right := 4.0
	var xs []float64
	for _, p := range c.Panels {
		for _, v := range p.Curves {
			if len(v.X) != len(v.Y) {
				return nil, fmt.Errorf("figure: curve %q has %d x and %d y", v.Name, len(v.X), len(v.Y))
			}
			xs = append(xs, v.X...)
			if v.Name != "" {
				right = math.Max(right, textWidth(v.Name, chartSmall)+3)
			}
		}
		for _, m := range p.Marks {
			xs = append(xs, m.X)
		}
	}
	right = math.Min(right, width*0.3)
	xAxis := c.X
	if !xAxis.Log && xAxis.Min == xAxis.Max && len(xs) > 0 && !xAxis.Zero {
		// Along x a curve fills the whole width.
		lo, hi := xs[0], xs[0]
		for _, v := range xs {
			lo, hi = math.Min(lo, v), math.Max(hi, v)
		}
		if hi > lo {
			xAxis.Min, xAxis.Max = lo, hi
		}
	}
	wanted := 6
	if width < 80 {
		wanted = 4
	}
	x, xTicks, err := newScale(xAxis, xs, chartLeft, width-right, wanted)
	if err != nil {
		return nil, err
	}
	d := &drawing{sketch: sketch{width: width}}
	top := 2.5
	for n, p := range c.Panels {
		height := p.Height
		if height == 0 {
			height = 50
		}
		top += 5 // the axis label stands over the panel
		if err := c.panel(d, n, p, x, xTicks, top, height, n == len(c.Panels)-1); err != nil {
			return nil, err
		}
		top += height + panelGap
	}
	d.text((chartLeft+width-right)/2, top+4.4, chartFont, "middle", "%s", clip(c.X.Label, width-4, chartFont))
	d.height = top + 6
	d.over.width, d.over.height = d.width, d.height
	return d, nil
}

func (c Chart) panel(d *drawing, n int, p Panel, x scale, xTicks []float64, top, height float64, last bool) error {
	var ys []float64
	for _, v := range p.Curves {
		ys = append(ys, v.Y...)
	}
	for _, m := range p.Marks {
		ys = append(ys, m.Y)
	}
	wanted := 5
	if height < 25 {
		wanted = 3
	}
	y, yTicks, err := newScale(p.Y, ys, top+height, top, wanted)
	if err != nil {
		return err
	}
	d.text(chartLeft, top-1.6, chartFont, "start", "%s", clip(p.Y.Label, d.width-chartLeft-1, chartFont))
	for i, b := range p.Bands {
		a, e := math.Max(x.at(b.From), x.from), math.Min(x.at(b.To), x.to)
		if e > a {
			d.rect("band", a, top, e-a, height, plasticColour, "", 0).data = []string{"band", strconv.Itoa(i)}
			d.text((a+e)/2, top+3.2, chartSmall, "middle", "%s", b.Label).fill = quietInk
		}
	}
	lastEnd := -1e9
	for _, v := range xTicks {
		at := x.at(v)
		d.line("grid", at, top, at, top+height, 0.1, gridColour)
		if !last {
			continue
		}
		text := tickText(v)
		half := textWidth(text, chartSmall) / 2
		if at-half > lastEnd+0.8 && at+half < d.width {
			d.text(at, top+height+3.8, chartSmall, "middle", "%s", text)
			lastEnd = at + half
		}
	}
	for _, v := range yTicks {
		at := y.at(v)
		d.line("grid", chartLeft, at, x.to, at, 0.1, gridColour)
		d.text(chartLeft-1.3, at+0.95, chartSmall, "end", "%s", tickText(v))
	}
	if y.min < 0 && y.max > 0 && !y.log {
		d.line("zero", chartLeft, y.at(0), x.to, y.at(0), 0.2, faintColour)
	}
	frame := d.rect("frame", chartLeft, top, x.to-chartLeft, height, "", faintColour, 0.2)
	frame.data = []string{"panel", strconv.Itoa(n), "x0", trim6(x.min), "x1", trim6(x.max), "y0", trim6(y.min), "y1", trim6(y.max), "xlog", strconv.FormatBool(x.log), "ylog", strconv.FormatBool(y.log)}
	for _, r := range p.Rules {
		if r.Across {
			at := y.at(r.At)
			if at < top || at > top+height {
				continue
			}
			d.line("rule", chartLeft, at, x.to, at, 0.25, toneColours[r.Tone]).dashed = true
			d.text(x.to-0.8, at-0.9, chartSmall, "end", "%s", r.Label).fill = quietInk
			continue
		}
		at := x.at(r.At)
		if at < chartLeft || at > x.to {
			continue
		}
		d.line("rule", at, top, at, top+height, 0.25, toneColours[r.Tone]).dashed = true
		anchor, shift := "start", 0.8
		if at > (chartLeft+x.to)/2 {
			anchor, shift = "end", -0.8
		}
		d.text(at+shift, top+height-1.2, chartSmall, anchor, "%s", r.Label).fill = quietInk
	}
	var names []sideLabel
	for i, v := range p.Curves {
		if len(v.X) == 0 {
			continue
		}
		l := polyline{colour: toneColours[v.Tone], weight: 0.55, dashed: v.Dashed, index: fmt.Sprintf("%d.%d", n, i)}
		if v.Thin {
			l.weight = 0.35
		}
		for k := range v.X {
			px, py := x.at(v.X[k]), y.at(v.Y[k])
			if px < x.from-0.01 || px > x.to+0.01 {
				continue
			}
			l.points = append(l.points, point{px, math.Min(math.Max(py, top), top+height)})
		}
		if len(l.points) == 0 {
			continue
		}
		d.curves = append(d.curves, l)
		if v.Name != "" {
			names = append(names, sideLabel{l.points[len(l.points)-1].y, v.Name, l.colour})
		}
	}
	placeLabels(names, top, top+height)
	for _, l := range names {
		m := d.text(x.to+1.2, l.y+0.95, chartSmall, "start", "%s", clip(l.text, d.width-x.to-1.2, chartSmall))
		m.class, m.fill = "name", nameInk(l.colour)
	}
	for _, m := range p.Marks {
		c.mark(&d.over, m, x.at(m.X), y.at(m.Y))
	}
	c.labels(d, p.Marks, x, y)
	return nil
}

// labels names marks: the chosen ones first, then each that finds room over or
// under its mark.
func (c Chart) labels(d *drawing, marks []Mark, x, y scale) {
	type box struct{ x0, x1, y0, y1 float64 }
	var taken []box
	for _, first := range []bool{true, false} {
		for _, m := range marks {
			if m.Label == "" || (m.Shape == Star) != first {
				continue
			}
			anchor, shift, label := "start", 2.0, clip(m.Label, (x.to-x.from)/2, chartSmall)
			if x.at(m.X)+textWidth(label, chartSmall)+2 > x.to {
				anchor, shift = "end", -2.0
			}
			if m.Shape == Star {
				shift *= 1.5
			}
			for _, dy := range []float64{-1.4, 3.4} {
				at := point{x.at(m.X) + shift, y.at(m.Y) + dy}
				b := box{at.x, at.x + textWidth(label, chartSmall), at.y - chartSmall*0.8, at.y + 0.3}
				if anchor == "end" {
					b.x0, b.x1 = at.x-textWidth(label, chartSmall), at.x
				}
				free := true
				for _, t := range taken {
					free = free && (b.x1 < t.x0 || b.x0 > t.x1 || b.y1 < t.y0 || b.y0 > t.y1)
				}
				if free {
					taken = append(taken, b)
					d.over.text(at.x, at.y, chartSmall, anchor, "%s", label).class = "label"
					break
				}
			}
		}
	}
}

func (c Chart) mark(s *sketch, m Mark, x, y float64) {
	colour := toneColours[m.Tone]
	var data []string
	if m.ID != "" {
		data = []string{"mark", m.ID, "tip", m.Tip}
	}
	switch m.Shape {
	case Ring:
		s.circle("mark", x, y, 1.15, paperColour, colour, 0.4).data = data
	case Diamond:
		const r = 1.3
		s.polygon("mark", paperColour, colour, 0.3, point{x, y - r}, point{x + r, y}, point{x, y + r}, point{x - r, y}).data = data
	case Star:
		s.circle("mark", x, y, 2.1, paperColour, colour, 0.4).data = data
		s.circle("core-dot", x, y, 1.15, colour, "", 0)
	default:
		s.circle("mark", x, y, 1.15, colour, paperColour, 0.25).data = data
	}
}

// sideLabel is the name of a curve at its right end.
type sideLabel struct {
	y      float64
	text   string
	colour string
}

// placeLabels moves labels apart, in the order of their curves.
func placeLabels(list []sideLabel, top, bottom float64) {
	sort.SliceStable(list, func(i, j int) bool { return list[i].y < list[j].y })
	const pitch = chartSmall * 1.15
	for i := range list {
		if i > 0 {
			list[i].y = math.Max(list[i].y, list[i-1].y+pitch)
		}
	}
	limit := bottom
	for i := len(list) - 1; i >= 0; i-- {
		list[i].y = math.Max(math.Min(list[i].y, limit), top)
		limit = list[i].y - pitch
	}
}

// More colours of charts: text that stays behind, grid lines, and darker forms
// of the tones that are too light for text on paper.
const (
	quietInk       = "#52606d"
	gridColour     = "#dfe3e8"
	secondaryInk   = "#8f5a0a"
	otherHalfInk   = "#a23f1a"
	primaryInkTone = "#1f5687"
)

func nameInk(colour string) string {
	switch colour {
	case secondaryColour:
		return secondaryInk
	case otherHalfColour:
		return otherHalfInk
	case primaryColour:
		return primaryInkTone
	case faintColour:
		return quietInk
	}
	return colour
}

// Bars are horizontal bars in rows, each stacked of segments that are named
// once above.
type Bars struct {
	Name, Title string
	Width       float64 // mm; 0: 110
	Label       string  // of the value, with the unit
	Segments    []string
	Tones       []Tone
	Rows        []BarRow
}

// A BarRow is one bar.
type BarRow struct {
	Group  string // printed above the first row of each group
	Name   string
	Values []float64
	Note   string // behind the bar
	Quiet  bool   // does not count, drawn paler
}

// SVG draws the bars.
func (b Bars) SVG() ([]byte, error) {
	s, err := b.draw()
	if err != nil {
		return nil, err
	}
	return s.svg(b.Title), nil
}

// Picture draws the bars in both forms.
func (b Bars) Picture() (Picture, error) {
	s, err := b.draw()
	if err != nil {
		return Picture{}, err
	}
	return s.picture(b.Name, b.Title)
}

func (b Bars) draw() (*sketch, error) {
	width := b.Width
	if width == 0 {
		width = 110
	}
	most, left, note := 0.0, 12.0, 10.0
	for _, r := range b.Rows {
		sum := 0.0
		for _, v := range r.Values {
			if !(v >= 0) || math.IsInf(v, 0) {
				return nil, fmt.Errorf("figure: a bar of %g in %s", v, r.Name)
			}
			sum += v
		}
		most = math.Max(most, sum)
		left = math.Max(left, textWidth(r.Name, chartFont)+2.5)
		note = math.Max(note, textWidth(r.Note, chartSmall)+2)
	}
	if most == 0 {
		return nil, fmt.Errorf("figure: bars without a length")
	}
	left, note = math.Min(left, width*0.32), math.Min(note, width*0.3)
	x, ticks, err := newScale(Axis{Label: b.Label, Zero: true}, []float64{0, most}, left, width-note, 4)
	if err != nil {
		return nil, err
	}
	s := &sketch{width: width}
	at := left
	for i, name := range b.Segments {
		s.rect("key", at, 1.6, 3, 3, toneColours[b.Tones[i]], "", 0)
		s.text(at+4, 4.2, chartSmall, "start", "%s", name)
		at += 7 + textWidth(name, chartSmall)
	}
	y := 8.0
	first := y
	const thick, pitch = 4.2, 5.8
	group := ""
	var bars sketch
	for i, r := range b.Rows {
		if r.Group != group {
			group = r.Group
			bars.text(left, y+2.6, chartFont, "start", "%s", group).bold = true
			y += 4.6
		}
		bars.text(left-1.5, y+thick/2+1, chartFont, "end", "%s", clip(r.Name, left-2.5, chartFont))
		from := x.at(0)
		sum := 0.0
		for k, v := range r.Values {
			sum += v
			to := x.at(sum)
			if to-from > 0.01 {
				m := bars.rect("bar", from, y, to-from, thick, toneColours[b.Tones[k]], paperColour, 0.2)
				m.data = []string{"row", strconv.Itoa(i), "segment", strconv.Itoa(k)}
				if r.Quiet {
					m.class = "bar quiet"
				}
			}
			from = to
		}
		bars.text(from+1.2, y+thick/2+0.95, chartSmall, "start", "%s", r.Note)
		y += pitch
	}
	for _, v := range ticks {
		s.line("grid", x.at(v), first, x.at(v), y, 0.12, gridColour)
		s.text(x.at(v), y+3.2, chartSmall, "middle", "%s", tickText(v))
	}
	s.line("zero", x.at(0), first, x.at(0), y, 0.25, faintColour)
	s.marks = append(s.marks, bars.marks...)
	s.text((left+width-note)/2, y+8, chartFont, "middle", "%s", b.Label)
	s.height = y + 10
	return s, nil
}

// clip shortens a text to a width in mm.
func clip(text string, width, size float64) string {
	if textWidth(text, size) <= width {
		return text
	}
	r := []rune(text)
	for len(r) > 1 && textWidth(string(r)+"…", size) > width {
		r = r[:len(r)-1]
	}
	return string(r) + "…"
}
