package sheet

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"gapwright/corelib/wire"
	"gapwright/magnetics/part"
	"gapwright/magnetics/sample"
	"gapwright/magnetics/winding"
	"gapwright/reports/figure"
)

// Looks of the tables.
var (
	lookBand  = look{fill: band, bold: true, size: 11, align: "left"}
	lookHead  = look{fill: heading, bold: true, size: 9, align: "center", wrap: true}
	lookLabel = look{fill: heading, size: 9, align: "left", wrap: true}
	lookText  = look{align: "left", wrap: true, size: 9.5}
	lookMid   = look{align: "center", wrap: true, size: 9.5}
	lookNote  = look{fill: plain, align: "left", wrap: true, size: 9.5}
)

// tabs 1's columns.
var sheetWidths = []float64{5, 9, 9, 9, 30, 7, 6, 6, 6.5, 7, 6, 6, 8, 10, 13, 17, 8, 8, 9}

const sheetColumns = 19

// pageSheet writes tab 1.
func (b *book) pageSheet(s Sheet) {
	b.begin(TabSheet, true, s.header(), sheetWidths...)
	row := b.titleBlock(s, 1)
	row = b.schematic(s, row+1)
	row = b.core(s, row+1)
	b.breakBefore(row + 1)
	row = b.windings(s, row+1)
	row = b.insulation(s, row+1)
	b.put(row+1, 1, sheetColumns, safetyStatement, lookNote)
	b.protect()
}

func (s Sheet) header() string {
	return strings.TrimSpace(fmt.Sprintf("%s  rev. %s  %s  design %s", s.PartNumber, s.Revision, s.Title, s.Hash))
}

// breakBefore starts a new page with row.
func (b *book) breakBefore(row int) {
	if b.err == nil {
		b.fail(b.f.InsertPageBreak(b.tab, address(1, row)))
	}
}

const safetyStatement = "The insulation build on this sheet is a construction proposal. It assumes the working voltage, pollution degree, altitude and insulation class written in the notes. " +
	"Whether it complies with a safety standard is for the responsible party to show, by calculation, construction review and type test. Samples must not be connected to the mains without that."

// titleBlock writes the header of tab 1 from row on and returns its last row.
func (b *book) titleBlock(s Sheet, row int) int {
	b.put(row, 1, sheetColumns, strings.ToUpper(s.Part)+"   "+s.PartNumber+"   rev. "+s.Revision, look{fill: band, bold: true, size: 14, align: "left"})
	b.tall(row, 24)
	pair := func(r, at int, label, value string) {
		spans := [][4]int{{1, 2, 3, 5}, {6, 8, 9, 13}, {14, 14, 15, 16}, {17, 17, 18, 19}}
		sp := spans[at]
		b.put(r, sp[0], sp[1], label, lookLabel)
		b.put(r, sp[2], sp[3], value, look{align: "left", wrap: true, size: 10, bold: label == "Title" || label == "Identification no."})
	}
	field := func(r, at int, label, key, prompt string) {
		spans := [][4]int{{1, 2, 3, 5}, {6, 8, 9, 13}, {14, 14, 15, 16}, {17, 17, 18, 19}}
		sp := spans[at]
		b.put(r, sp[0], sp[1], label, lookLabel)
		b.enter(r, sp[2], sp[3], key, label, "", look{align: "left", size: 10}, label, prompt)
	}
	pair(row+1, 0, "Title", s.Title)
	pair(row+1, 1, "Identification no.", s.PartNumber)
	pair(row+1, 2, "Legal owner", s.Owner)
	pair(row+1, 3, "Revision", s.Revision)
	pair(row+2, 0, "Document type", "Winding specification")
	pair(row+2, 1, "Date of issue", s.Date)
	pair(row+2, 2, "Created by", s.CreatedBy)
	pair(row+2, 3, "Sheet", "1 of 5")
	pair(row+3, 0, "Units", "mm, uH, mOhm, pF, kHz, V, deg C")
	pair(row+3, 1, "Design hash", s.Hash)
	pair(row+3, 2, "Approved by", s.ApprovedBy)
	pair(row+3, 3, "Samples", strconv.Itoa(s.Samples))
	field(row+4, 0, "Maker (shop fills)", "field.maker", "Name of the shop that winds the samples.")
	field(row+4, 1, "Maker job no. (shop)", "field.maker_job", "Your own number for this job.")
	pair(row+4, 2, "Contact", s.Contact)
	pair(row+4, 3, "Replaces", s.Replaces)
	b.put(row+5, 1, sheetColumns, "White: fixed by the design.   Pale yellow: the shop fills in.   Pale grey: computed.   Directions and pins are seen from the pin side. "+
		"cw / ccw: former on the arbor, pins towards the winder. Do not scale the drawings.", lookNote)
	return row + 5
}

// schematic writes drawings and the table of windings and pins.
func (b *book) schematic(s Sheet, row int) int {
	b.put(row, 1, sheetColumns, "Schematic and pins", lookBand)
	c := s.Construction
	byShop := c.Former.Pins == 0
	head := []struct {
		from, to int
		text     string
	}{{10, 12, "Winding"}, {13, 13, "Turns"}, {14, 14, "Start (dot)"}, {15, 15, "Finish"}, {16, 17, "Function"}, {18, 19, "Lead colour"}}
	if byShop {
		head[5].text = "Pins used (shop)"
	}
	r := row + 1
	for _, h := range head {
		b.put(r, h.from, h.to, h.text, lookHead)
	}
	for i, w := range c.Windings {
		r++
		b.put(r, 10, 12, w.Name, look{align: "center", bold: true, size: 10})
		b.put(r, 13, 13, w.Turns, look{align: "center", size: 10, format: "0"})
		b.put(r, 14, 14, part.TerminalText(w.Start), look{align: "center", bold: true, wrap: true, size: 10})
		b.put(r, 15, 15, part.TerminalText(w.Finish), look{align: "center", bold: true, wrap: true, size: 10})
		function := "secondary"
		switch {
		case s.Part == "inductor":
			function = "resonant inductor"
		case i == 0:
			function = "primary"
		case w.Name == "S-A":
			function = "secondary, half A"
		case w.Name == "S-B":
			function = "secondary, half B"
		}
		b.put(r, 16, 17, function, lookText)
		b.enter(r, 18, 19, "built."+w.Name+".ends", w.Name, head[5].text, look{align: "left"}, w.Name, "Pins or lead colours as built, if they differ from the sheet.")
		if len(w.Parts) > 1 {
			r++
			joint := part.TerminalText([]string{w.JoinedAt})
			b.put(r, 10, 19, fmt.Sprintf("%s is wound in %d sections in series: %s. Joint at %s: do not connect anything else.", w.Name, len(w.Parts), strings.Join(w.Parts, ", then "), joint), lookText)
		}
	}
	for _, e := range c.Build {
		if e.Kind == winding.Screen {
			r++
			b.put(r, 10, 19, fmt.Sprintf("Screen: copper foil %s mm, one open turn, to %s. Ends: %s. They must never touch.", b.mm(e.Thickness, 3), e.To, e.Ends), lookText)
		}
	}
	r++
	notes := "The dot is the start. Pin 1 is marked. Pins in parallel are written with +."
	if byShop {
		notes = "Pins by the shop: write down what was used. The dot is the start."
	} else if len(c.Former.PinsCut) > 0 {
		var cut []string
		for _, p := range c.Former.PinsCut {
			cut = append(cut, strconv.Itoa(p))
		}
		notes += " Cut before winding: pin " + strings.Join(cut, ", ") + "."
	}
	b.put(r, 10, 19, notes, look{fill: plain, align: "left", wrap: true, size: 9})
	// Schematic at the left, pins below the table.
	top := row + 1
	used := 0.0
	for i := top; i <= r; i++ {
		used += math.Max(b.high[i], 16)
	}
	r++
	need := 60.0
	if p, ok := s.picture("schematic"); ok {
		zoom := math.Min(1.25, math.Min(160/p.Width, 100/p.Height))
		b.picture(1, top, p, zoom)
		need = math.Max(need, p.Height*zoom/25.4*72-used+14)
	}
	if p, ok := s.picture("pins"); ok {
		zoom := math.Min(1.25, math.Min(168/p.Width, 80/p.Height))
		b.picture(10, r, p, zoom)
		need = math.Max(need, p.Height*zoom/25.4*72+14)
	}
	b.put(r, 1, 1, nil, look{fill: plain})
	b.tall(r, math.Min(need, 405))
	return r
}

// core writes core, gap and former.
func (b *book) core(s Sheet, row int) int {
	b.put(row, 1, sheetColumns, "Core, gap and coil former", lookBand)
	c, r := s.Construction, s.Rating
	g := c.Core.Gap
	line := row
	add := func(label, value string, strong bool) {
		line++
		b.put(line, 1, 3, label, lookLabel)
		b.put(line, 4, 13, value, look{align: "left", wrap: true, size: 10, bold: strong})
	}
	core := fmt.Sprintf("%d pcs, %s", max(c.Core.Pieces, 2), c.Core.Shape)
	if r.Shape.Standard != "" {
		core += " (" + r.Shape.Standard + ")"
	}
	add("Core", core, true)
	material := s.Material
	if material == "" {
		material = c.Core.Material
	}
	add("Material", material, false)
	al := r.Gap.AL
	governsAL := g.Governs != "length" && g.Kind == part.Ground
	switch g.Kind {
	case part.Ground:
		mark := "( ) A_L   (x) length"
		if governsAL {
			mark = "(x) A_L   ( ) length"
		}
		add("Gap governs by", mark+"   - the one that is crossed; the other is for information", true)
		if n := max(g.Pieces, 1); n == 1 {
			half, other := "UPPER piece only", "Lower"
			switch g.Half {
			case "lower":
				half, other = "LOWER piece only", "Upper"
			case "both":
				half, other = "BOTH pieces, half of it each", ""
			}
			text := fmt.Sprintf("%s, centre post, %s mm", half, b.mm(g.Total, 2))
			if !governsAL && s.GapTolerance > 0 {
				text += " +/-" + b.mm(s.GapTolerance, 2)
			} else {
				text = strings.Replace(text, b.mm(g.Total, 2)+" mm", "("+b.mm(g.Total, 2)+" mm)", 1)
			}
			if al > 0 {
				text += fmt.Sprintf(";  A_L %s nH", b.number(al*1e9, 3))
				if governsAL && s.ALTolerance > 0 {
					text += " +/-" + b.number(s.ALTolerance*100, 2) + " %"
				}
			}
			add("Gap, ground", text, true)
			if other != "" {
				add(other+" piece", "no gap, mating faces as supplied", false)
			}
		} else {
			text := fmt.Sprintf("%d pieces of %s mm in the centre post, sum %s mm", n, b.mm(g.Total/float64(n), 2), b.mm(g.Total, 2))
			if al > 0 {
				text += fmt.Sprintf(";  A_L %s nH", b.number(al*1e9, 3))
				if governsAL && s.ALTolerance > 0 {
					text += " +/-" + b.number(s.ALTolerance*100, 2) + " %"
				}
			}
			add("Gap, split", text, true)
			var at []string
			for i, p := range figure.GapCenters(g, 2*r.Shape.D.Mean()) {
				at = append(at, fmt.Sprintf("piece %d: centre %s mm from the lower yoke", i+1, b.mm(p, 1)))
			}
			add("Gap pieces", strings.Join(at, "; "), false)
		}
		if r.Gap.SpacerLength > 0 {
			answer := "NO: samples are ground too"
			if s.FilmAllowed {
				answer = "yes"
			}
			add("Film instead", fmt.Sprintf("polyester or polyimide film %s mm under ALL legs gives the same inductance (%s); leakage and loss then differ a little. Allowed for samples: %s",
				b.mm(r.Gap.SpacerLength, 3), b.stack(r.Gap.SpacerLength, s.FilmStock), answer), false)
		}
	case part.Spacer:
		add("Gap governs by", "( ) A_L   (x) length", true)
		var foils []string
		for _, f := range g.Foils {
			foils = append(foils, b.mm(f, 3))
		}
		text := fmt.Sprintf("film %s mm under ALL legs, no half ground", b.mm(g.Thickness, 3))
		if len(foils) > 1 {
			text += " (" + strings.Join(foils, " + ") + ")"
		}
		if al > 0 {
			text += fmt.Sprintf(";  gives A_L %s nH", b.number(al*1e9, 3))
		}
		add("Gap, film", text, true)
	default:
		add("Gap", "none; both pieces as supplied", true)
	}
	if r.Gap.Sensitivity != 0 {
		add("How much it matters", fmt.Sprintf("0%s01 mm more gap changes the inductance by %s %%", b.mark("."), b.number(r.Gap.Sensitivity*1e-5*100, 2)), false)
	}
	faces := c.Glue.Faces
	if faces == "" || faces == "none" {
		faces = "clean and dry, NO glue between the faces"
	}
	add("Mating faces", faces+"; outer legs: "+orElse(c.Glue.OuterLegs, "as the clamping asks"), false)
	add("Core held by", orElse(c.Core.Clamping, "shop's choice")+"; chips and cracks allowed as in IEC 63093-1", false)
	pins := "pins by the shop"
	if c.Former.Pins > 0 {
		pins = fmt.Sprintf("%d pins", c.Former.Pins)
	}
	former := fmt.Sprintf("%s, %d chamber(s), %s", orElse(c.Former.Name, c.Core.Shape), max(c.Former.Chambers, 1), pins)
	if c.Former.Mounting != "" {
		former += ", " + c.Former.Mounting
	}
	former += "; UL 94 V-0 or as the customer asks"
	if r.Former.Derived {
		former += ". Its winding room is derived by a rule, not from a drawing: check before winding"
	}
	add("Coil former", former, false)
	if r.Gap.ClearDistance > 0 && g.Kind != part.Closed {
		add("Keep clear", fmt.Sprintf("no copper nearer than %s mm to a gap piece; nearest copper as drawn: %s mm", b.mm(r.Gap.ClearDistance, 1), b.mm(r.Gap.CopperDistance, 1)), false)
	}
	// The shop's side.
	r0 := row + 1
	used := 0.0
	for i := r0; i <= line; i++ {
		used += math.Max(b.high[i], 16)
	}
	if p, ok := s.picture("gap"); ok {
		zoom := math.Min(0.95, 150/p.Width)
		b.picture(14, r0, p, zoom)
		if short := p.Height*zoom/25.4*72 + 12 - used; short > 0 {
			line++
			b.put(line, 1, 1, nil, look{fill: plain})
			b.tall(line, short)
		}
	}
	line++
	b.put(line, 1, 3, "As built (shop)", lookLabel)
	b.put(line, 4, 5, "Gap or film used, total mm", lookLabel)
	b.enter(line, 6, 8, "gap.total_mm", "Gap or film used, total mm", "", look{align: "right", format: "0.000", size: 10}, "Gap as built", "Gap or film thickness really used, in mm, number only.")
	b.put(line, 9, 12, "Core batch", lookLabel)
	b.enter(line, 13, 15, "field.core_batch", "Core batch", "", look{align: "left", size: 10}, "Core batch", "Batch or date code printed on the core box.")
	b.put(line, 16, 16, "Former used", lookLabel)
	b.enter(line, 17, 19, "field.former", "Former used", "", look{align: "left", size: 10}, "Former used", "Type of the coil former that was used.")
	return line
}

func orElse(s, other string) string {
	if s == "" {
		return other
	}
	return s
}

// stack writes the stock foils nearest to a thickness.
func (b *book) stack(t float64, stock []float64) string {
	foils := sample.NearestStack(t, stock)
	if len(foils) == 0 {
		return "no stock films stated"
	}
	sum := 0.0
	var text []string
	for _, f := range foils {
		sum += f
		text = append(text, b.mm(f, 3))
	}
	return fmt.Sprintf("nearest stock: %s = %s mm", strings.Join(text, " + "), b.mm(sum, 3))
}

// wireText is the wire as it is ordered, with its standard.
func (b *book) wireText(w wire.Wire, insulated string) string {
	var t string
	switch w.Kind {
	case wire.Litz:
		t = fmt.Sprintf("litz %d x %s mm, grade %d, %s serving, IEC 60317-11", w.Strands, b.mm(w.Diameter, 3), w.Grade, w.Serving)
	case wire.Foil:
		t = fmt.Sprintf("copper foil %s mm", b.mm(w.Thickness, 3))
	default:
		t = fmt.Sprintf("IEC 60317-0-1 - %s Grade %d", b.mm(w.Diameter, 3), w.Grade)
	}
	if w.TripleInsulated || insulated == "triple" {
		t += ", TRIPLE-INSULATED"
	}
	return t
}

// windings writes the winding table, one row per entry of the order of work
// that carries turns.
func (b *book) windings(s Sheet, row int) int {
	b.put(row, 1, sheetColumns, "Windings, in the order of winding, innermost first", lookBand)
	heads := []string{"#", "Name", "Start", "Finish", "Wire", "OD mm", "In hand", "Turns", "Layers", "Turns per layer", "Dir.", "Lay", "Spread", "Margin L / R", "Sleeving", "Note", "Built turns", "Built layers", "Height mm"}
	row++
	for i, h := range heads {
		b.put(row, i+1, i+1, h, lookHead)
	}
	c := s.Construction
	numbers := figure.WindingNumbers(c.Build)
	position := 0.0
	for i, e := range c.Build {
		if e.Kind != winding.Wind {
			continue
		}
		row++
		start, finish := b.ends(c, e)
		margins := "-"
		if e.Margins[0] > 0 || e.Margins[1] > 0 {
			margins = b.mm(e.Margins[0], 1) + " / " + b.mm(e.Margins[1], 1)
		}
		layers := e.Layers
		if e.Wire.Kind == wire.Foil {
			layers = e.Turns * max(e.Parallel, 1) * len(e.Of)
		}
		spread := e.Spread
		if spread == "full" || spread == "" {
			spread = "over full width"
		}
		lay := e.Lay
		if lay == "" {
			lay = "-"
		}
		note := b.windingNote(e)
		name := strings.Join(e.Names, " + ")
		height := 0.0
		for _, l := range s.Rating.Section.Layers {
			if l.Entry == i {
				height += l.X1 - l.X0
			}
		}
		position += height
		texts := []any{numbers[i], name, start, finish, b.wireText(e.Wire, e.Insulated), e.Wire.OuterDiameter() * 1e3, max(e.Parallel, 1), e.Turns, layers, perLayer(e), orElse(e.Direction, "cw"), lay, spread, margins, orElse(e.Sleeving, "none"), note}
		if e.Wire.Kind == wire.Foil {
			texts[5] = e.Wire.Thickness * 1e3
		}
		for j, t := range texts {
			l := lookMid
			switch j {
			case 4, 14, 15:
				l = lookText
			case 1, 7:
				l.bold = true
			case 5:
				l.format = "0.00"
			}
			b.put(row, j+1, j+1, t, l)
		}
		id := numbers[i]
		key := "built." + e.Names[0]
		if e.Names[0] == "" {
			key = "built." + id
		}
		b.enter(row, 17, 17, key+".turns", id, "Built turns", look{align: "center", format: "0.##"}, name+": turns", "Turns really wound, counted. Design: "+strconv.Itoa(e.Turns)+".")
		b.enter(row, 18, 18, key+".layers", id, "Built layers", look{align: "center", format: "0.##"}, name+": layers", "Layers that the turns took.")
		b.enter(row, 19, 19, key+".height_mm", id, "Height mm", look{align: "center", format: "0.00"}, name+": height", fmt.Sprintf("Height of this winding alone in mm. Expected: %s.", b.mm(height, 2)))
	}
	row++
	b.put(row, 1, sheetColumns, "Lay: C = wound back on itself, Z = every layer starts at the same side. In hand: wires wound together as one turn. Turns of one row are of EACH name. "+
		"Solderable enamel unless stated otherwise; tin every strand.", lookNote)
	return row
}

// perLayer is the number of turns in each layer, the last one in brackets when
// it holds fewer.
func perLayer(e winding.Entry) string {
	if e.Wire.Kind == wire.Foil {
		return "1"
	}
	n := max(e.Layers, 1)
	k := (e.Turns + n - 1) / n
	last := e.Turns - k*(n-1)
	if last != k {
		return fmt.Sprintf("%d (last %d)", k, last)
	}
	return strconv.Itoa(k)
}

func (b *book) windingNote(e winding.Entry) string {
	var notes []string
	if len(e.Names) > 1 {
		notes = append(notes, "both names side by side, "+strconv.Itoa(len(e.Names))+" in hand")
	}
	if e.Chamber > 0 {
		notes = append(notes, "chamber "+strconv.Itoa(e.Chamber))
	}
	switch e.Wire.Kind {
	case wire.Litz:
		notes = append(notes, "hand tension, no kinks")
	case wire.Foil:
		width := "full width between margins"
		if e.Width > 0 {
			width = b.mm(e.Width, 1) + " mm wide"
		}
		notes = append(notes, width, "edges without burr")
		if e.Leads != "" {
			notes = append(notes, "leads: "+e.Leads)
		}
	}
	return strings.Join(notes, "; ")
}

// ends returns the terminals of an entry: of the whole winding, or with the
// joint when the winding is made of sections.
func (b *book) ends(c part.Construction, e winding.Entry) (start, finish string) {
	var starts, finishes []string
	for i, name := range e.Names {
		of := name
		if i < len(e.Of) {
			of = e.Of[i]
		}
		for _, w := range c.Windings {
			if w.Name != of {
				continue
			}
			st, fi := part.TerminalText(w.Start), part.TerminalText(w.Finish)
			if n := slices.Index(w.Parts, name); n >= 0 && len(w.Parts) > 1 {
				joint := orElse(part.TerminalText([]string{w.JoinedAt}), "joint")
				if n > 0 {
					st = "joint " + joint
				}
				if n < len(w.Parts)-1 {
					fi = "joint " + joint
				}
			}
			starts, finishes = append(starts, st), append(finishes, fi)
		}
	}
	return strings.Join(starts, "\n"), strings.Join(finishes, "\n")
}

// insulation writes the insulation table with positions after winding numbers.
func (b *book) insulation(s Sheet, row int) int {
	b.put(row, 1, sheetColumns, "Insulation, screens and spaces", lookBand)
	spans := [][2]int{{1, 2}, {3, 4}, {5, 7}, {8, 9}, {10, 11}, {12, 14}, {15, 16}, {17, 17}, {18, 19}}
	heads := []string{"Position", "Kind", "Material, one layer", "Layers", "Width mm", "Overlap of each end", "Purpose (as assumed)", "Height mm", "Built layers"}
	row++
	for i, h := range heads {
		b.put(row, spans[i][0], spans[i][1], h, lookHead)
	}
	c := s.Construction
	last := "former"
	n, steps := 0, 0
	for i, e := range c.Build {
		if e.Kind == winding.Wind {
			n++
			last = "after " + strconv.Itoa(n)
			if e.Margins[0] > 0 || e.Margins[1] > 0 {
				row++
				b.row(row, spans[:8], "beside "+strconv.Itoa(n), "margin tape", "polyester, margin tape", "to winding height", b.mm(e.Margins[0], 1)+" / "+b.mm(e.Margins[1], 1), "-",
					"creepage; wire must not slip down beside it", b.entryHeight(s, i))
				b.enter(row, 18, 19, fmt.Sprintf("built.margin%d.layers", n), "beside "+strconv.Itoa(n), "Built layers", look{align: "center"}, "Margin tape", "Layers of margin tape really wound.")
			}
			continue
		}
		steps++
		row++
		position := last
		width := "full: flange to flange"
		room := s.Window.Whole()
		if e.Chamber > 0 {
			position += ", chamber " + strconv.Itoa(e.Chamber)
			room = s.Window.Breadth
		}
		if room > 0 {
			width = b.mm(room, 1) + " (full)"
		}
		var cells []any
		switch e.Kind {
		case winding.Tape:
			if e.Width > 0 {
				width = b.mm(e.Width, 1)
			}
			overlap := b.mm(e.Overlap, 0) + " mm"
			if e.Overlap <= 0 {
				overlap = "butt"
			}
			cells = []any{position, "tape", fmt.Sprintf("%s tape, %s mm", e.Material, b.mm(e.Thickness, 3)), strconv.Itoa(e.TapeLayers), width, overlap, purposeText(e.Purpose), float64(e.TapeLayers) * e.Thickness * 1e3}
		case winding.Screen:
			if e.ScreenWidth > 0 {
				width = b.mm(e.ScreenWidth, 1)
			}
			cells = []any{position, "screen", fmt.Sprintf("copper foil, %s mm, to %s", b.mm(e.Thickness, 3), e.To), "1, open turn", width, orElse(e.Ends, "ends insulated"), "screen", e.Thickness * 1e3}
		default:
			cells = []any{position, "space", "filler tape or spacer ring", "as needed", width, "-", "keeps the distance that makes the leakage: " + orElse(e.Purpose, "functional"), e.Height * 1e3}
		}
		b.row(row, spans[:8], cells...)
		b.enter(row, 18, 19, fmt.Sprintf("built.step%d.layers", steps), position, "Built layers", look{align: "center"}, "Insulation", "Layers really wound, or what was used instead.")
	}
	return row
}

func purposeText(p string) string {
	switch p {
	case "barrier":
		return "barrier between primary and secondary"
	case "finish":
		return "finish, mechanical"
	case "interlayer":
		return "interlayer, functional"
	}
	return orElse(p, "functional")
}

func (b *book) entryHeight(s Sheet, entry int) float64 {
	h := 0.0
	for _, l := range s.Rating.Section.Layers {
		if l.Entry == entry {
			h += (l.X1 - l.X0) * 1e3
		}
	}
	return h
}

// row writes values into spans of columns.
func (b *book) row(row int, spans [][2]int, values ...any) {
	for i, v := range values {
		l := lookMid
		if f, ok := v.(float64); ok {
			l.format = "0.00"
			if f < 0.1 {
				l.format = "0.000"
			}
		}
		b.put(row, spans[i][0], spans[i][1], v, l)
	}
}

// pageSection writes tab 2: the half section and the heights it is made of.
func (b *book) pageSection(s Sheet) {
	b.begin(TabSection, false, s.header(), 9, 30, 12, 12, 12, 4, 30, 14, 14)
	b.put(1, 1, 9, "Half section of the window, and how the height adds up", lookBand)
	row := 2
	if p, ok := s.picture("half-section"); ok {
		zoom := math.Min(1, math.Min(262/p.Width, 138/p.Height))
		b.picture(1, row, p, zoom)
		b.put(row, 1, 1, nil, look{fill: plain})
		b.tall(row, p.Height*zoom/25.4*72+12)
	}
	row += 2
	b.put(row, 1, 5, "From the former outward", lookBand)
	b.put(row, 7, 9, "Height and clear distance", lookBand)
	row++
	for i, h := range []string{"Layer", "What", "Height mm", "Sum mm", "Measured sum mm"} {
		b.put(row, i+1, i+1, h, lookHead)
	}
	top := row
	c := s.Construction
	numbers := figure.WindingNumbers(c.Build)
	used := map[int]float64{} // by chamber
	for i, e := range c.Build {
		height := 0.0
		what := ""
		label := numbers[i]
		switch e.Kind {
		case winding.Wind:
			height = b.entryHeight(s, i)
			what = fmt.Sprintf("%s, %d turns, %s", strings.Join(e.Names, "+"), e.Turns, b.local(e.Wire.String()))
		case winding.Tape:
			height = float64(e.TapeLayers) * e.Thickness * 1e3
			what = fmt.Sprintf("%s tape, %d x %s mm", e.Purpose, e.TapeLayers, b.mm(e.Thickness, 3))
		case winding.Screen:
			height, what = e.Thickness*1e3, "screen"
		default:
			height, what = e.Height*1e3, "space"
		}
		base := used[e.Chamber]
		if e.Chamber == 0 {
			for _, u := range used {
				base = math.Max(base, u)
			}
		}
		used[e.Chamber] = base + height
		if e.Chamber > 0 {
			what += ", chamber " + strconv.Itoa(e.Chamber)
		}
		row++
		b.put(row, 1, 1, label, lookMid)
		b.put(row, 2, 2, what, lookText)
		b.put(row, 3, 3, height, look{align: "right", format: "0.000"})
		b.put(row, 4, 4, base+height, look{align: "right", format: "0.00"})
		if e.Kind == winding.Wind {
			b.enter(row, 5, 5, "built."+e.Names[0]+".sum_mm", label, "Measured sum mm", look{align: "right", format: "0.00"}, "Height so far", "Height from the floor of the former to the top of this winding, in mm.")
		} else {
			b.put(row, 5, 5, "", look{fill: fixed})
		}
	}
	r := top
	side := func(label string, value float64, format, note string) {
		b.put(r, 7, 7, label, lookLabel)
		b.put(r, 8, 8, value, look{align: "right", format: format, size: 10})
		b.put(r, 9, 9, note, lookMid)
		r++
	}
	side("Window height, over the former", s.Window.Height*1e3, "0.00", "mm")
	side("Used, bulge of the wires included", s.Rating.Section.Height*1e3, "0.00", "mm")
	side("Height left", s.Rating.Section.HeightLeft*1e3, "0.00", "mm")
	side("Former wall on the post", s.Window.Wall*1e3, "0.00", "mm")
	breadth := "Breadth between the flanges"
	if s.Window.Chambers > 1 {
		breadth = fmt.Sprintf("Breadth of one of %d chambers", s.Window.Chambers)
	}
	side(breadth, s.Window.Breadth*1e3, "0.00", "mm")
	if s.Rating.Gap.ClearDistance > 0 {
		side("Clear distance wanted at the gap", s.Rating.Gap.ClearDistance*1e3, "0.00", "mm")
		side("Nearest copper as drawn", s.Rating.Gap.CopperDistance*1e3, "0.00", "mm")
	}
	b.put(r, 7, 7, "Measured total height", lookLabel)
	b.enter(r, 8, 8, "built.height_mm", "Measured total height", "", look{align: "right", format: "0.00", size: 10}, "Total height", "Height of the finished coil over the floor of the former, in mm.")
	b.put(r, 9, 9, "mm", lookMid)
	r++
	b.put(r, 7, 9, "First sample: please send a photo of each layer before the next one goes on.", lookNote)
	b.protect()
}

// pageNotes writes tab 4: numbered sentences with a box to tick.
func (b *book) pageNotes(s Sheet) {
	b.begin(TabNotes, false, s.header(), 6, 110, 9, 26)
	b.put(1, 1, 4, "Notes: assembly, impregnation, marking, safety", lookBand)
	row := 2
	for i, h := range []string{"No.", "Do this", "Done", "Remark"} {
		b.put(row, i+1, i+1, h, lookHead)
	}
	n := 0
	for _, g := range s.noteGroups(b) {
		if len(g.texts) == 0 {
			continue
		}
		row++
		b.put(row, 1, 4, g.title, look{fill: heading, bold: true, align: "left", size: 10})
		for _, t := range g.texts {
			n++
			row++
			id := "N" + strconv.Itoa(n)
			b.put(row, 1, 1, id, lookMid)
			b.put(row, 2, 2, t, look{align: "left", wrap: true, size: 10})
			if g.tick {
				at := b.enter(row, 3, 3, id+".done", id, "Done", look{align: "center"}, id, "Write x when done.")
				_ = at
				b.enter(row, 4, 4, id+".remark", id, "Remark", look{align: "left", wrap: true, size: 9}, id, "Deviation or remark.")
			} else {
				b.put(row, 3, 4, "", look{fill: fixed})
			}
		}
	}
	b.protect()
}

type noteGroup struct {
	title string
	tick  bool
	texts []string
}

// noteGroups composes the notes from what the construction needs.
func (s Sheet) noteGroups(b *book) []noteGroup {
	c := s.Construction
	var winds, litz, foil, margins, triple bool
	for _, e := range c.Build {
		if e.Kind != winding.Wind {
			continue
		}
		winds = true
		litz = litz || e.Wire.Kind == wire.Litz
		foil = foil || e.Wire.Kind == wire.Foil
		margins = margins || e.Margins[0] > 0 || e.Margins[1] > 0
		triple = triple || e.Insulated == "triple" || e.Wire.TripleInsulated
	}
	var wind, assembly []string
	if winds {
		wind = append(wind, "Wind every winding in the direction of the table. Start at the pin with the dot.")
		wind = append(wind, "When a layer does not fill or does not fit: stop and ask. Do not put the last turns on top.")
	}
	if litz {
		wind = append(wind, "Litz: no kinks, no scraping. Tin in a solder pot at the temperature of the enamel ("+orElse(c.Terminations.Tin, "390 degC for solderable enamel, common practice")+") until all strands are wetted. A lost strand shows in the resistance.")
	}
	if foil {
		wind = append(wind, "Foil: no burr, edges covered; solder the leads at both ends over their full width.")
	}
	if margins {
		wind = append(wind, "Margin tape is built up to the height of its winding, so that no wire slips down beside it.")
	}
	if triple {
		wind = append(wind, "Triple-insulated wire: do not nick or stretch it; strip and solder only outside the winding room.")
	}
	if c.Terminations.LeadLength > 0 {
		wind = append(wind, "Flying leads: "+b.mm(c.Terminations.LeadLength, 0)+" mm free length, ends tinned.")
	}
	assembly = append(assembly, "Wipe the mating faces of the core. A grain of dust is a gap.")
	g := c.Core.Gap
	switch g.Kind {
	case part.Ground:
		half := "upper"
		if g.Half == "lower" {
			half = "lower"
		}
		if max(g.Pieces, 1) == 1 && g.Half != "both" {
			assembly = append(assembly, "Put the ground half at the "+half+" end. Do not swap the halves.")
		}
	case part.Spacer:
		assembly = append(assembly, "Lay the same film under all legs of the core.")
	}
	assembly = append(assembly, "Preheat before soldering. Support the pins.")
	switch c.Core.Clamping {
	case "clip":
		assembly = append(assembly, "Hold the halves with the clip of the core. The halves must not rock.")
	case "tape":
		assembly = append(assembly, "Hold the halves with two turns of tape around the outer legs, pulled tight.")
	case "glue":
		assembly = append(assembly, "Clamp the halves until the adhesive has cured.")
	}
	faces := "No glue between the mating faces."
	if c.Glue.Faces != "" && c.Glue.Faces != "none" {
		faces = "Mating faces: " + c.Glue.Faces + "."
	}
	assembly = append(assembly, faces+" Outer legs: "+orElse(c.Glue.OuterLegs, "as needed")+". Elastic adhesive only: a hard one stresses the ferrite, lowers its permeability and can crack it. "+orElse(c.Glue.Cure, ""))
	symbol := "Lp"
	if s.Part == "inductor" {
		symbol = "L"
	}
	measure := "Measure " + symbol + " before glue and after glue."
	var impregnation []string
	if k := c.Impregnation.Kind; k != "" && k != "none" {
		impregnation = append(impregnation, "Impregnate: "+k+", "+orElse(c.Impregnation.When, "after gluing")+". Keep pins and mating faces clean.")
		measure = "Measure " + symbol + " before glue, after glue and after varnish. Varnish moves it."
	} else {
		impregnation = append(impregnation, "No impregnation.")
	}
	assembly = append(assembly, measure)
	marking := []string{fmt.Sprintf("Label: %s rev. %s, date code, maker, pin 1.", orElse(s.PartNumber, "part number"), orElse(s.Revision, "-"))}
	core := "floating"
	if s.CoreCountsAs == "primary" || s.CoreCountsAs == "secondary" {
		core = "part of the " + s.CoreCountsAs + " side"
	}
	safety := append([]string{"The core and its clip count as " + core + " in the insulation tests."}, s.Assumptions...)
	safety = append(safety, safetyStatement)
	substitution := s.Substitutions
	if len(substitution) == 0 {
		substitution = []string{
			"Wire: same copper section within 3 % and strands not thicker than stated; anything else only after asking.",
			"Core: another maker's ferrite of the same class that keeps the loss figure; same shape and same gap rule.",
			"Tape: same or larger thickness of one layer only if the height allows; never fewer layers.",
		}
	}
	var cautions []string
	for _, w := range s.Warnings {
		cautions = append(cautions, w.Code+": "+w.Text)
	}
	return []noteGroup{
		{"Winding", true, wind},
		{"Assembly", true, assembly},
		{"Impregnation", true, impregnation},
		{"Marking", true, marking},
		{"For this part", true, s.Notes},
		{"Substitution", false, substitution},
		{"Cautions of the design", false, cautions},
		{"Insulation and safety", false, safety},
		{"What the words mean", false, words(s.Part)},
	}
}

func words(name string) []string {
	if name == "inductor" {
		return []string{"L: inductance between the two ends of the winding at a low level. A_L: inductance of one turn squared; L = A_L N^2."}
	}
	return []string{
		"Lp: primary inductance, everything else open. Lsc: primary inductance with the named secondary shorted and the other half open. Ls: inductance of one secondary, everything else open.",
		"A short counts only when it is soldered at the pins. A clip adds loop inductance that reads as leakage, multiplied by the square of the turns ratio.",
		"Ratio tests read high with the primary driven and low with the secondary driven, because of the leakage; the mean of both is what tells a lost turn.",
	}
}

// pageHistory writes tab 5.
func (b *book) pageHistory(s Sheet) {
	b.begin(TabHistory, false, s.header(), 7, 14, 70, 34, 18, 18)
	b.put(1, 1, 6, "Revision history", lookBand)
	b.put(2, 1, 6, "A change of turns, wire, gap, insulation, pins or text is a new revision. Letters without I, O, Q, S, X, Z.", lookNote)
	for i, h := range []string{"Rev", "Date", "Change (what and why)", "Measured reason (sample no.)", "By", "Approved"} {
		b.put(3, i+1, i+1, h, lookHead)
	}
	for i, v := range []string{s.Revision, s.Date, "Issue of this sheet, design " + s.Hash, "", s.CreatedBy, s.ApprovedBy} {
		b.put(4, i+1, i+1, v, lookText)
	}
	keys := []string{"rev", "date", "change", "reason", "by", "approved"}
	heads := []string{"Rev", "Date", "Change (what and why)", "Measured reason (sample no.)", "By", "Approved"}
	for i := 1; i <= 14; i++ {
		for j, k := range keys {
			b.enter(4+i, j+1, j+1, fmt.Sprintf("history.%d.%s", i, k), "", heads[j], look{align: "left", wrap: true, size: 9.5}, "", "")
		}
		b.tall(4+i, 22)
	}
	b.protect()
}
