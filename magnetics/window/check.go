package window

import (
	"fmt"
	"math"
	"strconv"

	"gapwright/corelib/document"
	"gapwright/corelib/quantity"
)

// Bounds that keep a mistyped file from taking minutes.
const (
	maxConductors = 3000
	maxGrid       = 20000 // parts of all grids together
	maxGaps       = 50    // per leg
	maxFrequency  = 1e9   // Hz; far above what magnetostatic windows mean
)

// slack is the relative overlap that rounding of the numbers in a file may
// make.
const slack = 1e-6

// check finds what no single value shows.
func check(f *File, rec *document.Record) {
	if rec.Set("format") && rec.Valid("format") && f.Format != Format {
		rec.Fault("format", "%d is not a format of this release; write %d", f.Format, Format)
	}
	checkWindow(f, rec)
	checkFrequencies(f, rec)
	names := map[string]int{}
	for i := range f.Windings {
		at := winding(i)
		w := &f.Windings[i]
		if first, ok := names[w.Name]; ok && w.Name != "" {
			rec.Fault(at+".name", "%s is the name of the winding on line %d too; write another name", w.Name, rec.Line(winding(first)))
		} else {
			names[w.Name] = i
		}
		checkWinding(w, at, rec)
	}
	if rec.Err() != nil {
		return // places of conductors mean nothing while numbers are wrong
	}
	list := f.conductors()
	if len(list) > maxConductors {
		rec.Fault("windings", "%d wires, foils and blocks; write at most %d", len(list), maxConductors)
		return
	}
	checkPlaces(f, list, rec)
	if rec.Err() != nil {
		return
	}
	checkBalance(f, list, rec)
}

func winding(i int) string { return fmt.Sprintf("windings[%d]", i) }

// mm writes a length in millimeters with up to six digits.
func mm(x float64) string { return strconv.FormatFloat(x*1e3, 'g', 6, 64) + " mm" }

func checkWindow(f *File, rec *document.Record) {
	w := &f.Window
	// A word that was wrong has been reported; what follows from it has not.
	if !rec.Valid("window.geometry") || !rec.Valid("window.surround") {
		return
	}
	if w.Geometry == RoundPost {
		if !rec.Set("window.post_radius") {
			rec.Fault("window.geometry", "round-post needs the radius of the post; write post_radius: 7 mm beside it")
		}
		if text := rec.Text("window.ungapped_inductance"); len(text) > 2 && text[len(text)-2:] == "/m" {
			rec.Fault("window.ungapped_inductance", "%s is per meter of depth, which a round post does not have; write it in nH", text)
		}
	}
	if w.Surround == Head {
		for _, key := range []string{"gaps", "outer_gaps", "ungapped_inductance"} {
			if rec.Set("window." + key) {
				rec.Fault("window."+key, "has no meaning with surround: head on line %d, where no core is around the turns; leave it out", rec.Line("window.surround"))
			}
		}
		if w.Geometry == RoundPost {
			rec.Fault("window.geometry", "with surround: head on line %d the turns are straight; write planar", rec.Line("window.surround"))
		}
		return
	}
	if len(w.Gaps)+len(w.OuterGaps) > 0 && w.Geometry == Planar && !rec.Set("window.post_half_width") {
		rec.Fault("window.gaps", "a planar window with a gap needs the half width of the post; write post_half_width: 5 mm")
	}
	checkGaps("window.gaps", "post", w.Gaps, w.Breadth, rec)
	checkGaps("window.outer_gaps", "outer leg", w.OuterGaps, w.Breadth, rec)
}

func checkGaps(at, leg string, gaps []Gap, breadth float64, rec *document.Record) {
	if !rec.Valid(at) || !rec.Valid("window.breadth") || breadth == 0 {
		return
	}
	if len(gaps) > maxGaps {
		rec.Fault(at, "%d gaps; write at most %d", len(gaps), maxGaps)
		return
	}
	for i, g := range gaps {
		self := fmt.Sprintf("%s[%d]", at, i)
		if !rec.Valid(self+".center") || !rec.Valid(self+".length") {
			continue
		}
		low, high := g.Center-g.Length/2, g.Center+g.Length/2
		if g.Length > breadth*(1+slack) {
			rec.Fault(self+".length", "gap %d of the %s is %s long in a window breadth of %s; write a shorter one", i+1, leg, mm(g.Length), mm(breadth))
			continue
		}
		if low < -slack*breadth || high > breadth*(1+slack) {
			rec.Fault(self+".center", "gap %d of the %s reaches from %s to %s, outside the window breadth of %s; write a center between %s and %s",
				i+1, leg, mm(low), mm(high), mm(breadth), mm(g.Length/2), mm(breadth-g.Length/2))
		}
		for j, o := range gaps[:i] {
			apart, need := math.Abs(g.Center-o.Center), (g.Length+o.Length)/2
			if apart < need-slack*breadth {
				rec.Fault(self+".center", "gaps %d and %d of the %s overlap: their centers are %s apart, their lengths need %s; write one gap or move them apart",
					j+1, i+1, leg, mm(apart), mm(need))
			}
		}
	}
}

func checkFrequencies(f *File, rec *document.Record) {
	if !rec.Valid("frequencies") {
		return
	}
	seen := map[string]bool{}
	for i, v := range f.Frequencies {
		at := fmt.Sprintf("frequencies[%d]", i)
		if !rec.Valid(at) {
			continue
		}
		key := Hertz(v)
		switch {
		case v > maxFrequency:
			rec.Fault(at, "%s is above %s; write a lower one", rec.Text(at), quantity.Format(maxFrequency, quantity.Hertz))
		case seen[key]:
			rec.Fault(at, "%s Hz is there already; results are listed by whole hertz, write each once", key)
		}
		seen[key] = true
	}
}

// Hertz is a frequency as whole hertz in decimal.
func Hertz(f float64) string { return strconv.FormatFloat(math.Round(f), 'f', 0, 64) }

func checkWinding(w *Winding, at string, rec *document.Record) {
	if !rec.Valid(at) {
		return
	}
	var kinds []string
	for _, k := range []string{"block", "round_wires", "foils"} {
		if rec.Set(at + "." + k) {
			kinds = append(kinds, k)
		}
	}
	switch len(kinds) {
	case 0:
		rec.Fault(at, "winding %s has no conductors; write block, round_wires or foils", w.Name)
		return
	case 1:
	default:
		rec.Fault(at+"."+kinds[1], "winding %s has %s on line %d already; write a winding for each", w.Name, kinds[0], rec.Line(at+"."+kinds[0]))
		return
	}
	want, other := "current", "ampere_turns"
	example := "current: 1 A"
	if kinds[0] == "block" {
		want, other, example = other, want, "ampere_turns: 1"
	}
	if rec.Set(at + "." + other) {
		rec.Fault(at+"."+other, "winding %s has %s and takes %s; write %s", w.Name, kinds[0], want, example)
	} else if !rec.Set(at + "." + want) {
		rec.Fault(at, "winding %s has no %s; write %s", w.Name, want, example)
	}
	if rec.Set(at+".grid") && kinds[0] != "block" {
		rec.Fault(at+".grid", "only a block has a grid; leave it out of %s", w.Name)
	} else if g := w.Grid; g != nil && rec.Valid(at+".grid") && g[0]*g[1] > maxGrid {
		rec.Fault(at+".grid", "%d x %d parts; write at most %d together", g[0], g[1], maxGrid)
	}
	ordered := func(key string, v [2]float64) {
		if p := at + "." + key; rec.Valid(p) && !(v[1] > v[0]) {
			rec.Fault(p, "winding %s reaches from %s to %s; write the smaller one first, and an extent above zero", w.Name, mm(v[0]), mm(v[1]))
		}
	}
	pitch := func(key string, count int, value, size float64, of string) {
		switch p := at + "." + key; {
		case !rec.Valid(p) || count < 2:
		case !rec.Set(p):
			rec.Fault(p, "is missing: winding %s has %d; write a pitch of %s or more", w.Name, count, mm(size))
		case value < size*(1-slack):
			rec.Fault(p, "%s is less than the %s of %s: the conductors of winding %s overlap; write %s or more", rec.Text(p), of, mm(size), w.Name, mm(size))
		}
	}
	switch {
	case w.Block != nil:
		ordered("block.x", w.Block.X)
		ordered("block.y", w.Block.Y)
	case w.RoundWires != nil:
		r := w.RoundWires
		if r.Layers*r.TurnsPerLayer > maxConductors {
			rec.Fault(at+".round_wires", "%d layers of %d wires; write at most %d wires", r.Layers, r.TurnsPerLayer, maxConductors)
		}
		if rec.Valid(at + ".round_wires.diameter") {
			pitch("round_wires.turn_pitch", r.TurnsPerLayer, r.TurnPitch, r.Diameter, "diameter")
			pitch("round_wires.layer_pitch", r.Layers, r.LayerPitch, r.Diameter, "diameter")
		}
	case w.Foils != nil:
		if w.Foils.Count > maxConductors {
			rec.Fault(at+".foils.count", "%d foils; write at most %d", w.Foils.Count, maxConductors)
		}
		ordered("foils.y", w.Foils.Y)
		if rec.Valid(at + ".foils.thickness") {
			pitch("foils.pitch", w.Foils.Count, w.Foils.Pitch, w.Foils.Thickness, "thickness")
		}
	}
}

// A conductor is one wire, foil or block in the window.
type conductor struct {
	winding        int
	x0, x1, y0, y1 float64 // its extent
	round          bool
	label          string
	ampereTurns    float64
}

// conductors lists every conductor of the file, winding by winding.
func (f *File) conductors() []conductor {
	var list []conductor
	for i := range f.Windings {
		w := &f.Windings[i]
		switch {
		case w.Block != nil:
			b := w.Block
			list = append(list, conductor{i, b.X[0], b.X[1], b.Y[0], b.Y[1], false, "the block", *w.AmpereTurns})
		case w.RoundWires != nil:
			r := w.RoundWires
			for l := range r.Layers {
				for t := range r.TurnsPerLayer {
					x, y := r.First[0]+float64(l)*r.LayerPitch, r.First[1]+float64(t)*r.TurnPitch
					a := r.Diameter / 2
					list = append(list, conductor{i, x - a, x + a, y - a, y + a, true, fmt.Sprintf("wire %d of layer %d", t+1, l+1), *w.Current})
				}
			}
		case w.Foils != nil:
			s := w.Foils
			for l := range s.Count {
				x := s.FirstX + float64(l)*s.Pitch
				list = append(list, conductor{i, x, x + s.Thickness, s.Y[0], s.Y[1], false, fmt.Sprintf("foil %d", l+1), *w.Current})
			}
		}
	}
	return list
}

func (c *conductor) x() float64 { return (c.x0 + c.x1) / 2 }
func (c *conductor) y() float64 { return (c.y0 + c.y1) / 2 }

// overlap returns how far two conductors reach into each other, m; negative:
// the room between them.
func (c *conductor) overlap(o *conductor) float64 {
	switch {
	case c.round && o.round:
		return (c.x1-c.x0)/2 + (o.x1-o.x0)/2 - math.Hypot(c.x()-o.x(), c.y()-o.y())
	case c.round:
		dx := math.Max(math.Max(o.x0-c.x(), c.x()-o.x1), 0)
		dy := math.Max(math.Max(o.y0-c.y(), c.y()-o.y1), 0)
		return (c.x1-c.x0)/2 - math.Hypot(dx, dy)
	case o.round:
		return o.overlap(c)
	}
	return math.Min(math.Min(c.x1, o.x1)-math.Max(c.x0, o.x0), math.Min(c.y1, o.y1)-math.Max(c.y0, o.y0))
}

// checkPlaces reports, once per winding, what lies outside, and once per pair
// of windings, what overlaps.
func checkPlaces(f *File, list []conductor, rec *document.Record) {
	w := &f.Window
	outside := map[int]bool{}
	for i := range list {
		c := &list[i]
		bad := ""
		switch {
		case c.x0 < -slack*w.Depth || c.x1 > w.Depth*(1+slack):
			bad = fmt.Sprintf("x %s .. %s, is not inside the window depth of %s", mm(c.x0), mm(c.x1), mm(w.Depth))
		case c.y0 < -slack*w.Breadth || c.y1 > w.Breadth*(1+slack):
			bad = fmt.Sprintf("y %s .. %s, is not inside the window breadth of %s", mm(c.y0), mm(c.y1), mm(w.Breadth))
		}
		if bad != "" && !outside[c.winding] {
			outside[c.winding] = true
			rec.Fault(winding(c.winding), "winding %s: %s, %s; move it inside", f.Windings[c.winding].Name, c.label, bad)
		}
	}
	least := slack * math.Min(w.Depth, w.Breadth)
	told := map[[2]int]bool{}
	for i := range list {
		for j := range i {
			c, o := &list[i], &list[j]
			pair := [2]int{c.winding, o.winding}
			if told[pair] {
				continue
			}
			if by := c.overlap(o); by > math.Min(least, slack*(c.x1-c.x0)) {
				told[pair] = true
				first, second := f.Windings[o.winding].Name, f.Windings[c.winding].Name
				rec.Fault(winding(c.winding), "winding %s, %s at x %s .. %s, y %s .. %s, overlaps %s of winding %s at x %s .. %s, y %s .. %s by %s; move them apart",
					second, c.label, mm(c.x0), mm(c.x1), mm(c.y0), mm(c.y1), o.label, first, mm(o.x0), mm(o.x1), mm(o.y0), mm(o.y1), mm(by))
			}
		}
	}
}

// balanceSlack is the part of all ampere-turns that rounding may leave over.
const balanceSlack = 1e-6

func checkBalance(f *File, list []conductor, rec *document.Record) {
	net, size := balance(list)
	w := &f.Window
	if math.Abs(net) <= balanceSlack*size || len(w.Gaps)+len(w.OuterGaps) > 0 || w.UngappedInductance > 0 {
		return
	}
	parts := ""
	for i := range f.Windings {
		sum := 0.0
		for j := range list {
			if list[j].winding == i {
				sum += list[j].ampereTurns
			}
		}
		if i > 0 {
			parts += ", "
		}
		parts += fmt.Sprintf("%s %.6g", f.Windings[i].Name, sum)
	}
	what := "write a gap or ungapped_inductance, or make them cancel"
	if w.Surround == Head {
		what = "without a core around them their field has no bound; make them cancel"
	}
	rec.Fault("windings", "%.6g ampere-turns are left over (%s) and nothing takes them; %s", net, parts, what)
}

// balance returns the sum of the ampere-turns, and that of their sizes.
func balance(list []conductor) (net, size float64) {
	for i := range list {
		net += list[i].ampereTurns
		size += math.Abs(list[i].ampereTurns)
	}
	return net, size
}
