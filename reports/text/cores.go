package text

import (
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"gapwright/corelib/shape"
)

// MassDensity is the density, in kg/m³, that masses in the list of cores are
// given for: a usual MnZn power ferrite, common practice.
const MassDensity = 4800

// Cores writes the list of shapes for people. The former is that with one
// chamber; a shape too small for one has dashes.
func Cores(p *Printer, table *shape.Table, list []shape.Shape) error {
	if len(list) == 0 {
		p.Line("No core passes these filters.")
		return p.Err()
	}
	t := Table{
		Head: []string{"core", "", "Ae mm²", "le mm", "Ve mm³", "window mm", "Ae Aw cm⁴", "winding mm", "turn mm", "outline mm", "g"},
		Left: []int{0, 1},
	}
	var unproven, derived, own bool
	for _, s := range list {
		letter := string(s.Confidence)
		if s.Origin != "" {
			letter += "+"
			own = true
		}
		unproven = unproven || !s.Proven()
		winding, turn := "-", "-"
		if f, err := table.FormerFor(s); err == nil {
			winding = fmt.Sprintf("%.1f×%.2f", 1e3*f.Breadth, 1e3*f.Height)
			if f.Derived {
				winding = "~" + winding
				derived = true
			}
			turn = fmt.Sprintf("%.1f", 1e3*f.MLT)
		}
		o := s.WoundOutline()
		t.Add(s.Name, letter,
			digits(1e6*s.Ae, 3), digits(1e3*s.Le, 3), digits(1e9*s.Ve, 3),
			fmt.Sprintf("%.1f×%.2f", 1e3*s.WindowBreadth(), 1e3*s.WindowDepth()),
			digits(1e8*s.AreaProduct(), 3), winding, turn,
			fmt.Sprintf("%.0f×%.0f×%.0f", 1e3*o.Length, 1e3*o.Width, 1e3*o.Height),
			digits(1e3*s.Mass(MassDensity), 2))
	}
	p.Table(t)
	p.Line("")
	p.Paragraph(2, "%d cores. Window: mean breadth along the post and depth of ONE window. Outline with a full winding; mass at %d kg/m³.", len(list), MassDensity)
	p.Paragraph(2, "Letter: A dimensions and parameters read in a data sheet, B parameters read, C from memory but consistent, D from memory and not proven.")
	if unproven {
		p.Paragraph(2, "D: %s.", shape.NotProven)
	}
	if derived {
		p.Paragraph(2, "~: winding space by a rule, not of a published coil former.")
	}
	if own {
		p.Paragraph(2, "+: your own row.")
	}
	return p.Err()
}

// Core writes everything known about one shape, with a drawing of its half
// section.
func Core(p *Printer, table *shape.Table, s shape.Shape) error {
	p.Line("%s   family %s, %s", s.Name, s.Family, orDash(s.Standard))
	p.Paragraph(2, "Confidence %s: %s.", s.Confidence, s.Confidence.Meaning())
	if s.Origin != "" {
		p.Paragraph(2, "Your own row: %s.", s.Origin)
	}
	if s.Note != "" {
		p.Paragraph(2, "Note: %s.", s.Note)
	}
	p.Line("")

	p.Line("Dimensions of one half, mm")
	t := Table{Head: []string{"", "least", "mean", "most", "what"}, Left: []int{0, 4}}
	limit := func(v float64) string {
		if v == 0 {
			return "-"
		}
		return trimmed(1e3*v, 3)
	}
	for _, d := range s.Dimensions() {
		t.Add(d.Letter, limit(d.Range.Min), trimmed(1e3*d.Range.Mean(), 3), limit(d.Range.Max), d.Meaning)
	}
	p.Table(t)
	p.Paragraph(2, "Source: %s.", s.DimensionSource)
	if !s.Proven() {
		p.Paragraph(2, "W201 %s.", shape.NotProven)
	}
	p.Line("")

	p.Line("Effective parameters of the set")
	t = Table{Head: []string{"", "used", "from the dimensions", "deviation", ""}, Left: []int{0, 4}}
	computed, err := s.Computed()
	row := func(name string, used, other, scale float64, unit string) {
		if err != nil {
			t.Add(name, digits(scale*used, 4), "-", "-", unit)
			return
		}
		t.Add(name, digits(scale*used, 4), digits(scale*other, 4), fmt.Sprintf("%+.1f %%", 100*(other/used-1)), unit)
	}
	row("C1", s.C1, computed.C1, 1e-3, "1/mm")
	row("le", s.Le, computed.Le, 1e3, "mm")
	row("Ae", s.Ae, computed.Ae, 1e6, "mm²")
	row("Amin", s.Amin, computed.Amin, 1e6, "mm²")
	row("Ve", s.Ve, computed.Ve, 1e9, "mm³")
	p.Table(t)
	p.Paragraph(2, "Source: %s. From the dimensions: rules of IEC 60205, formulas of the families our own.", s.ParameterSource)
	p.Line("")

	wound, bare := s.WoundOutline(), s.Outline()
	core, winding := s.Surfaces()
	share := fmt.Sprintf("%.0f %% of a turn lie in front of an outer leg", 100*s.FacedShare(0))
	if !s.PostRound() {
		share = fmt.Sprintf("%.0f to %.0f %% of a turn (innermost, outermost) lie in front of an outer leg", 100*s.FacedShare(0), 100*s.FacedShare(s.WindowDepth()))
	}
	p.Line("Geometry")
	line := func(name, format string, args ...any) {
		p.item(17, "  "+name, fmt.Sprintf(format, args...))
	}
	line("post", "%s, section %s mm²; outer legs %s mm²", postText(s), digits(1e6*s.PostArea(), 4), digits(1e6*s.OuterLegArea(), 4))
	line("window", "%s × %s mm mean, %s × %s mm in the worst case; area product %s cm⁴",
		trimmed(1e3*s.WindowBreadth(), 2), trimmed(1e3*s.WindowDepth(), 2), trimmed(1e3*s.WindowBreadthLeast(), 2), trimmed(1e3*s.WindowDepthLeast(), 2), digits(1e8*s.AreaProduct(), 3))
	line("outline", "%s × %s × %s mm bare, %s × %s × %s mm with a full winding (%s cm³)",
		trimmed(1e3*bare.Length, 1), trimmed(1e3*bare.Width, 1), trimmed(1e3*bare.Height, 1),
		trimmed(1e3*wound.Length, 1), trimmed(1e3*wound.Width, 1), trimmed(1e3*wound.Height, 1), digits(1e6*wound.Volume(), 3))
	line("surface", "core %s cm², winding %s cm²", digits(1e4*core, 3), digits(1e4*winding, 3))
	line("mass", "%s g at %d kg/m³, clip not included", digits(1e3*s.Mass(MassDensity), 3), MassDensity)
	line("turns", "%s", share)
	p.Line("")

	former(p, table, s)
	gaps(p, s)
	coreDrawing(p, table, s)
	return p.Err()
}

func postText(s shape.Shape) string {
	switch {
	case s.Family == shape.U:
		return fmt.Sprintf("none, one leg %s × %s mm", trimmed(1e3*s.PostWidth(), 2), trimmed(1e3*s.PostDepth(), 2))
	case s.PostRound():
		return fmt.Sprintf("round, %s mm", trimmed(1e3*s.PostDiameter(), 2))
	}
	return fmt.Sprintf("%s × %s mm", trimmed(1e3*s.PostWidth(), 2), trimmed(1e3*s.PostDepth(), 2))
}

func former(p *Printer, table *shape.Table, s shape.Shape) {
	p.Line("Coil former")
	for chambers := 1; chambers <= 2; chambers++ {
		f, err := table.FormerWith(s, chambers)
		name := "one chamber"
		if chambers == 2 {
			name = "two chambers"
		}
		if err != nil {
			p.item(17, "  "+name, err.Error())
			continue
		}
		origin := ""
		switch {
		case f.Derived && chambers == 1:
			origin = "; by a rule, no published former"
		case f.Derived:
			origin = fmt.Sprintf("; divided by a wall of %s mm (common practice)", trimmed(1e3*f.ChamberWall, 2))
		}
		p.item(17, "  "+name, fmt.Sprintf("%s × %s mm (%s mm²), mean turn %s mm, from the post %s mm, flange %s mm%s",
			trimmed(1e3*f.Breadth, 1), trimmed(1e3*f.Height, 2), digits(1e6*f.AreaMin, 3), trimmed(1e3*f.MLT, 1),
			trimmed(1e3*f.WallOffset, 2), trimmed(1e3*f.Flange, 2), origin))
		if chambers == 2 {
			continue
		}
		if f.Band != "" {
			p.item(17, "", f.Band)
		}
		switch {
		case f.Pins == 0:
			p.item(17, "  pins", "not known: pins by the shop")
		default:
			text := strconv.Itoa(f.Pins)
			if f.PinPitch > 0 {
				text += fmt.Sprintf(", pitch %s mm", trimmed(1e3*f.PinPitch, 2))
			}
			if f.RowSpacing > 0 {
				text += fmt.Sprintf(", rows %s mm apart", trimmed(1e3*f.RowSpacing, 2))
			}
			if f.Mounting != "" {
				text += ", " + f.Mounting
			}
			p.item(17, "  pins", fmt.Sprintf("%s (%s)", text, f.PinSource))
		}
		if f.Note != "" {
			p.item(17, "  note", f.Note)
		}
		source := f.Source
		if f.Origin != "" {
			source += "; your own row, " + f.Origin
		}
		p.item(17, "  source", source)
	}
	p.Line("")
}

func gaps(p *Printer, s shape.Shape) {
	list := shape.Gaps(s.Name)
	if len(list) == 0 {
		return
	}
	p.Line("Published gaps (in the post of one half) and their A_L")
	t := Table{Head: []string{"gap mm", "A_L nH", "tolerance", "without fringing nH"}}
	for _, g := range list {
		tolerance := "-"
		switch {
		case g.ALTolerance > 0:
			tolerance = fmt.Sprintf("A_L ±%.0f %%", 100*g.ALTolerance)
		case g.GapTolerance > 0:
			tolerance = fmt.Sprintf("gap ±%s mm", trimmed(1e3*g.GapTolerance, 2))
		}
		t.Add(trimmed(1e3*g.Length, 3), trimmed(1e9*g.AL, 0), tolerance, trimmed(1e9*s.GapAL(g.Length, g.ALUngapped), 1))
	}
	p.Table(t)
	var sources []string
	for _, g := range list {
		if len(sources) == 0 || sources[len(sources)-1] != g.Source {
			sources = append(sources, g.Source)
		}
	}
	p.Paragraph(2, "Source: %s. Gap figures of makers are indicative: order by A_L, or allow a trial grind.", strings.Join(sources, "; "))
	p.Line("")
}

// coreDrawing draws the half section from the axis of the post to the outer leg,
// to scale: a character is about twice as high as wide.
func coreDrawing(p *Printer, table *shape.Table, s shape.Shape) {
	const ratio = 2.0 // height over width of a character
	length, letter, height := s.A.Mean(), "A", 2*s.B.Mean()
	if s.Family == shape.RM || s.Family == shape.RMLow {
		// The legs stand on the diagonal, whose ends are cut to R.
		length, letter = s.R.Mean(), "R"
	}
	halfLength := length / 2
	columns := 34
	cell := halfLength / float64(columns)
	rows := int(math.Round(height / (ratio * cell)))
	if rows > 36 {
		rows = 36
		cell = height / (ratio * float64(rows))
		columns = int(math.Round(halfLength / cell))
	}
	windowInner := s.F.Mean() / 2
	windowOuter := s.E.Mean() / 2
	if s.Family == shape.U {
		// The left half of the window belongs to the other leg.
		windowInner = 0
	}
	f, err := table.FormerFor(s)
	inFormer := func(x, y float64) bool {
		if err != nil || s.Family == shape.U {
			return false
		}
		x -= windowInner + f.WallOffset
		return x > 0 && x < f.Height && math.Abs(y) < f.Breadth/2
	}
	ferrite, winding := "#", ":"
	if p.utf8 {
		ferrite, winding = "█", "░"
	}
	title := "Half section through the post, to scale"
	if s.Family == shape.U {
		title = "Half section through both legs, to scale"
	}
	p.Line("%s (1 character = %s × %s mm; %s ferrite, %s winding space)", title, trimmed(1e3*cell, 2), trimmed(1e3*ratio*cell, 2), ferrite, winding)
	hole := s.H.Mean() / 2
	for r := range rows {
		y := height/2 - (float64(r)+0.5)*height/float64(rows)
		var b strings.Builder
		b.WriteString("  ")
		for c := range columns {
			x := (float64(c) + 0.5) * cell
			switch {
			case x < hole:
				b.WriteByte(' ')
			case x < windowInner || x > windowOuter || math.Abs(y) > s.D.Mean():
				b.WriteString(ferrite)
			case inFormer(x, y):
				b.WriteString(winding)
			default:
				b.WriteByte(' ')
			}
		}
		label := ""
		switch r {
		case 0:
			label = fmt.Sprintf("   height of the set 2B = %s mm", trimmed(1e3*height, 2))
		case rows / 2:
			label = fmt.Sprintf("   window 2D = %s mm", trimmed(1e3*s.WindowBreadth(), 2))
		}
		p.Line("%s", strings.TrimRight(b.String()+label, " "))
	}
	mark := func(name string, half, whole float64) {
		n := int(math.Round(half / cell))
		p.Line("  |%s| %s/2, %s = %s mm", strings.Repeat("-", max(n-2, 1)), name, name, trimmed(1e3*whole, 2))
	}
	if s.F.Known() {
		mark("F", s.F.Mean()/2, s.F.Mean())
	}
	mark("E", s.E.Mean()/2, s.E.Mean())
	mark(letter, length/2, length)
}

// CoresJSON writes shapes for programs.
func CoresJSON(w io.Writer, table *shape.Table, list []shape.Shape) error {
	type limits struct {
		Min *float64 `json:"min"`
		Max *float64 `json:"max"`
	}
	type effective struct {
		C1   float64 `json:"C1"`
		Le   float64 `json:"le"`
		Ae   float64 `json:"Ae"`
		Amin float64 `json:"Amin"`
		Ve   float64 `json:"Ve"`
	}
	type formerRow struct {
		Chambers    int      `json:"chambers"`
		Breadth     float64  `json:"breadth"`
		Height      float64  `json:"height"`
		Area        float64  `json:"area"`
		MLT         float64  `json:"mean_length_of_turn"`
		WallOffset  float64  `json:"wall_offset"`
		Flange      float64  `json:"flange"`
		ChamberWall float64  `json:"chamber_wall"`
		Pins        *int     `json:"pins"`
		PinPitch    *float64 `json:"pin_pitch"`
		RowSpacing  *float64 `json:"row_spacing"`
		Mounting    string   `json:"mounting"`
		Derived     bool     `json:"derived"`
		Band        string   `json:"band"`
		Source      string   `json:"source"`
		PinSource   string   `json:"pin_source"`
		Note        string   `json:"note"`
		Origin      string   `json:"origin"`
	}
	type gapRow struct {
		Gap          float64  `json:"gap"`
		AL           float64  `json:"AL"`
		ALTolerance  *float64 `json:"AL_tolerance"`
		GapTolerance *float64 `json:"gap_tolerance"`
		ALUngapped   float64  `json:"AL_ungapped"`
		Source       string   `json:"source"`
	}
	type core struct {
		Name            string            `json:"name"`
		Family          string            `json:"family"`
		Standard        string            `json:"standard"`
		Confidence      string            `json:"confidence"`
		Proven          bool              `json:"proven"`
		Dimensions      map[string]limits `json:"dimensions"`
		Effective       effective         `json:"effective"`
		Computed        *effective        `json:"computed"`
		PostRound       bool              `json:"post_round"`
		PostArea        float64           `json:"post_area"`
		OuterLegArea    float64           `json:"outer_leg_area"`
		WindowBreadth   float64           `json:"window_breadth"`
		WindowDepth     float64           `json:"window_depth"`
		AreaProduct     float64           `json:"area_product"`
		Outline         [3]float64        `json:"outline"`
		WoundOutline    [3]float64        `json:"wound_outline"`
		CoreSurface     float64           `json:"core_surface"`
		WindingSurface  float64           `json:"winding_surface"`
		FerriteVolume   float64           `json:"ferrite_volume"`
		Formers         []formerRow       `json:"formers"`
		Gaps            []gapRow          `json:"gaps"`
		DimensionSource string            `json:"dimension_source"`
		ParameterSource string            `json:"parameter_source"`
		Note            string            `json:"note"`
		Origin          string            `json:"origin"`
	}
	box := func(o shape.Outline) [3]float64 { return [3]float64{o.Length, o.Width, o.Height} }
	cores := []core{}
	for _, s := range list {
		c := core{
			Name: s.Name, Family: s.Family, Standard: s.Standard, Confidence: string(s.Confidence), Proven: s.Proven(),
			Dimensions: map[string]limits{},
			Effective:  effective{s.C1, s.Le, s.Ae, s.Amin, s.Ve},
			PostRound:  s.PostRound(), PostArea: s.PostArea(), OuterLegArea: s.OuterLegArea(),
			WindowBreadth: s.WindowBreadth(), WindowDepth: s.WindowDepth(), AreaProduct: s.AreaProduct(),
			Outline: box(s.Outline()), WoundOutline: box(s.WoundOutline()), FerriteVolume: s.FerriteVolume(),
			Formers: []formerRow{}, Gaps: []gapRow{},
			DimensionSource: s.DimensionSource, ParameterSource: s.ParameterSource, Note: s.Note, Origin: s.Origin,
		}
		c.CoreSurface, c.WindingSurface = s.Surfaces()
		for _, d := range s.Dimensions() {
			c.Dimensions[d.Letter] = limits{known(d.Range.Min), known(d.Range.Max)}
		}
		if e, err := s.Computed(); err == nil {
			c.Computed = &effective{e.C1, e.Le, e.Ae, e.Amin, e.Ve}
		}
		for chambers := 1; chambers <= 2; chambers++ {
			f, err := table.FormerWith(s, chambers)
			if err != nil {
				continue // the list is what there is; people read the reason in words
			}
			row := formerRow{
				Chambers: f.Chambers, Breadth: f.Breadth, Height: f.Height, Area: f.AreaMin, MLT: f.MLT,
				WallOffset: f.WallOffset, Flange: f.Flange, ChamberWall: f.ChamberWall,
				PinPitch: known(f.PinPitch), RowSpacing: known(f.RowSpacing), Mounting: f.Mounting,
				Derived: f.Derived, Band: f.Band, Source: f.Source, PinSource: f.PinSource, Note: f.Note, Origin: f.Origin,
			}
			if f.Pins > 0 {
				row.Pins = &f.Pins
			}
			c.Formers = append(c.Formers, row)
		}
		for _, g := range shape.Gaps(s.Name) {
			c.Gaps = append(c.Gaps, gapRow{g.Length, g.AL, known(g.ALTolerance), known(g.GapTolerance), g.ALUngapped, g.Source})
		}
		cores = append(cores, c)
	}
	return JSON(w, struct {
		Format int    `json:"format"`
		Cores  []core `json:"cores"`
	}{1, cores})
}

// known turns the zero that stands for an unknown figure into null.
func known(v float64) *float64 {
	if v == 0 {
		return nil
	}
	return &v
}

// digits prints a value with n significant digits and no exponent.
func digits(v float64, n int) string {
	if v == 0 || math.IsNaN(v) || math.IsInf(v, 0) {
		return strconv.FormatFloat(v, 'g', n, 64)
	}
	r, err := strconv.ParseFloat(strconv.FormatFloat(v, 'g', n, 64), 64)
	if err != nil {
		return strconv.FormatFloat(v, 'g', n, 64)
	}
	decimals := max(0, n-1-int(math.Floor(math.Log10(math.Abs(r)))))
	return strconv.FormatFloat(r, 'f', decimals, 64)
}

// trimmed prints a value with at most n decimals and no trailing zeros.
func trimmed(v float64, n int) string {
	s := strconv.FormatFloat(v, 'f', n, 64)
	if strings.Contains(s, ".") {
		s = strings.TrimRight(strings.TrimRight(s, "0"), ".")
	}
	return s
}

func orDash(s string) string {
	if s == "" {
		return "no standard named"
	}
	return s
}
