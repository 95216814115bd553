package sheet

import (
	"fmt"
	_ "image/png" // pictures of the workbook
	"math"
	"regexp"
	"strconv"
	"strings"
	"unicode"

	"gapwright/reports/figure"

	"github.com/xuri/excelize/v2"
)

// fill is the meaning of a cell's background.
type fill int

const (
	fixed    fill = iota // white: decided by the design
	shop                 // pale yellow: filled in by the shop
	computed             // pale grey
	heading              // of a table
	band                 // of a block
	plain                // no border
)

var fillColours = map[fill]string{shop: "FFF6C2", computed: "ECEEF1", heading: "DDE3EA", band: "2F3E4E"}

// look is the style of a cell; equal looks share one style of the workbook.
type look struct {
	fill   fill
	bold   bool
	size   float64
	align  string // left, center, right
	top    bool
	format string
	wrap   bool
	shrink bool
	red    bool
}

// book writes a workbook cell by cell. The first error is kept; later calls do
// nothing.
type book struct {
	f      *excelize.File
	tab    string
	comma  bool
	styles map[look]int
	widths map[string][]float64 // of the columns of each tab, in characters
	high   map[int]float64      // points, of the rows of the current tab
	cells  []Cell
	names  map[string]bool
	err    error
}

// A Cell is one cell that the shop fills in.
type Cell struct {
	Key    string // E04.S1, built.1.turns, field.operator
	Name   string // defined name in the workbook: E04_S1
	Tab    string
	Row    string // text in the ID column of its row, or the label beside it
	Column string // text that heads its column; empty: the cell right of its label
	at     string
}

func newBook(comma bool) *book {
	return &book{f: excelize.NewFile(), comma: comma, styles: map[look]int{}, widths: map[string][]float64{}, names: map[string]bool{}}
}

func (b *book) fail(err error) {
	if b.err == nil && err != nil {
		b.err = fmt.Errorf("%s: %w", b.tab, err)
	}
}

// begin starts a tab with the given column widths, for A4 landscape, one page
// wide.
func (b *book) begin(tab string, first bool, header string, widths ...float64) {
	b.flush()
	b.tab = tab
	b.high = map[int]float64{}
	if first {
		b.fail(b.f.SetSheetName("Sheet1", tab))
	} else {
		_, err := b.f.NewSheet(tab)
		b.fail(err)
	}
	b.widths[tab] = widths
	for i, w := range widths {
		c := column(i + 1)
		b.fail(b.f.SetColWidth(tab, c, c, w))
	}
	size, orientation, one, auto := 9, "landscape", 1, 0
	b.fail(b.f.SetPageLayout(tab, &excelize.PageLayoutOptions{Size: &size, Orientation: &orientation, FitToWidth: &one, FitToHeight: &auto}))
	fit := true
	b.fail(b.f.SetSheetProps(tab, &excelize.SheetPropsOptions{FitToPage: &fit}))
	// Inches.
	side, top, bottom, head := 0.35, 0.62, 0.55, 0.28
	center := true
	b.fail(b.f.SetPageMargins(tab, &excelize.PageLayoutMarginsOptions{Left: &side, Right: &side, Top: &top, Bottom: &bottom, Header: &head, Footer: &head, Horizontally: &center}))
	b.fail(b.f.SetHeaderFooter(tab, &excelize.HeaderFooterOptions{
		OddHeader: "&L&8" + clip(headerText(header), 150) + "&R&8&A",
		OddFooter: "&L&8Do not scale. Sizes in mm. Construction proposal, not a certificate.&R&8Page &P of &N",
	}))
	no := false
	b.fail(b.f.SetSheetView(tab, -1, &excelize.ViewOptions{ShowGridLines: &no}))
}

// headerText doubles the sign that codes begin with in page headers.
func headerText(s string) string { return strings.ReplaceAll(clean(s), "&", "&&") }

func clip(s string, n int) string {
	r := []rune(s)
	if len(r) > n {
		return string(r[:n])
	}
	return s
}

// flush sets the heights of the rows of the tab that ends.
func (b *book) flush() {
	for row, h := range b.high {
		b.fail(b.f.SetRowHeight(b.tab, row, math.Min(h, 409)))
	}
	b.high = nil
}

func column(n int) string {
	name, err := excelize.ColumnNumberToName(n)
	if err != nil {
		panic("sheet: column " + strconv.Itoa(n))
	}
	return name
}

func address(col, row int) string { return column(col) + strconv.Itoa(row) }

// tall makes a row at least h points high.
func (b *book) tall(row int, h float64) {
	if b.high != nil && h > b.high[row] {
		b.high[row] = h
	}
}

// put writes value into the cells from..to of a row, merged when they are more
// than one. Strings are always text, whatever they begin with.
func (b *book) put(row, from, to int, value any, l look) {
	b.block(row, row, from, to, value, l)
}

func (b *book) block(row, last, from, to int, value any, l look) {
	if b.err != nil {
		return
	}
	at, end := address(from, row), address(to, last)
	if l.size == 0 {
		l.size = 10
	}
	style := b.style(l)
	b.fail(b.f.SetCellStyle(b.tab, at, end, style))
	if at != end {
		b.fail(b.f.MergeCell(b.tab, at, end))
	}
	switch v := value.(type) {
	case nil:
	case string:
		text := clean(v)
		b.fail(b.f.SetCellStr(b.tab, at, text))
		if l.wrap && row == last {
			width := 0.0
			for i := from; i <= to; i++ {
				width += b.widths[b.tab][i-1]
			}
			b.tall(row, float64(lines(text, width*10/l.size, l.bold))*l.size*1.3+3)
		}
	case float64:
		if math.IsNaN(v) || math.IsInf(v, 0) {
			b.fail(fmt.Errorf("%s: a value that is not finite", at))
			return
		}
		// 12 digits: what a conversion of units left behind does not show.
		r, err := strconv.ParseFloat(strconv.FormatFloat(v, 'g', 12, 64), 64)
		b.fail(err)
		b.fail(b.f.SetCellFloat(b.tab, at, r, -1, 64))
	case int:
		b.fail(b.f.SetCellInt(b.tab, at, int64(v)))
	case formula:
		b.fail(b.f.SetCellFormula(b.tab, at, string(v)))
	default:
		panic(fmt.Sprintf("sheet: a cell of type %T", value))
	}
	if row == last {
		b.tall(row, l.size*1.3+4)
	}
}

type formula string

// clean drops the control characters that XML cannot hold.
func clean(s string) string {
	return strings.Map(func(r rune) rune {
		if r == '\n' {
			return r
		}
		if unicode.IsControl(r) || r == '\uFFFE' || r == '\uFFFF' || r == unicode.ReplacementChar {
			return -1
		}
		return r
	}, s)
}

// lines estimates how many lines a text takes in a cell of the given width in
// characters, broken at blanks.
func lines(text string, width float64, bold bool) int {
	per := width * 1.04
	if bold {
		per = width * 0.95
	}
	n := 0
	for _, paragraph := range strings.Split(text, "\n") {
		used := 0.0
		n++
		for _, word := range strings.Fields(paragraph) {
			w := float64(len([]rune(word)))
			if used > 0 && used+1+w > per {
				n++
				used = 0
			}
			for w > per {
				n++
				w -= per
			}
			if used > 0 {
				used++
			}
			used += w
		}
	}
	return n
}

func (b *book) style(l look) int {
	if id, ok := b.styles[l]; ok {
		return id
	}
	st := &excelize.Style{
		Font:       &excelize.Font{Family: "Arial", Size: l.size, Bold: l.bold, Color: "1F2933"},
		Alignment:  &excelize.Alignment{Horizontal: l.align, Vertical: "center", WrapText: l.wrap, ShrinkToFit: l.shrink},
		Protection: &excelize.Protection{Locked: l.fill != shop},
	}
	if l.top {
		st.Alignment.Vertical = "top"
	}
	if l.fill == band {
		st.Font.Color = "FFFFFF"
	}
	if l.red {
		st.Font.Color = "B3261E"
	}
	if c, ok := fillColours[l.fill]; ok {
		st.Fill = excelize.Fill{Type: "pattern", Pattern: 1, Color: []string{c}}
	}
	if l.fill != plain && l.fill != band {
		for _, side := range []string{"left", "right", "top", "bottom"} {
			st.Border = append(st.Border, excelize.Border{Type: side, Color: "9AA5B1", Style: 1})
		}
	}
	if l.format != "" {
		code := l.format
		if code != "@" {
			// The language of a format with the wanted decimal mark.
			if b.comma {
				code = "[$-407]" + code
			} else {
				code = "[$-409]" + code
			}
		}
		st.CustomNumFmt = &code
	}
	id, err := b.f.NewStyle(st)
	b.fail(err)
	b.styles[l] = id
	return id
}

// enter makes cells from..to of a row a field that the shop fills in, with its
// defined name and a prompt.
func (b *book) enter(row, from, to int, key, rowText, columnText string, l look, title, prompt string) string {
	l.fill = shop
	b.put(row, from, to, nil, l)
	at := address(from, row)
	name := b.unique(Name(key))
	b.define(name, at)
	b.cells = append(b.cells, Cell{Key: key, Name: name, Tab: b.tab, Row: rowText, Column: columnText, at: at})
	if prompt != "" && b.err == nil {
		dv := excelize.NewDataValidation(true)
		dv.Sqref = at
		dv.SetInput(clip(clean(title), 32), clip(clean(prompt), 250))
		b.fail(b.f.AddDataValidation(b.tab, dv))
	}
	return at
}

// define gives a cell a name for the whole workbook.
func (b *book) define(name, at string) {
	col, row, err := excelize.CellNameToCoordinates(at)
	b.fail(err)
	if err != nil {
		return
	}
	b.fail(b.f.SetDefinedName(&excelize.DefinedName{Name: name, RefersTo: fmt.Sprintf("'%s'!$%s$%d", b.tab, column(col), row)}))
}

func (b *book) unique(name string) string {
	out := name
	for i := 2; b.names[out]; i++ {
		out = name + "_" + strconv.Itoa(i)
	}
	b.names[out] = true
	return out
}

// Name returns the defined name that belongs to a key: E04.S1 -> E04_S1. Signs
// that a name cannot hold become underscores.
func Name(key string) string {
	return strings.Map(func(r rune) rune {
		if r == '_' || r < 128 && (unicode.IsLetter(r) || unicode.IsDigit(r)) {
			return r
		}
		return '_'
	}, key)
}

// picture places a drawing with its upper left corner in a cell; zoom 1 is its
// own size on a sheet printed at full size.
func (b *book) picture(col, row int, p figure.Picture, zoom float64) {
	if b.err != nil {
		return
	}
	// A spreadsheet takes one pixel of a picture for 1/96 inch.
	scale := zoom * 96 / figure.DPI
	b.fail(b.f.AddPictureFromBytes(b.tab, address(col, row), &excelize.Picture{
		Extension: ".png", File: p.PNG,
		Format: &excelize.GraphicOptions{AltText: p.Title, Name: p.Name, ScaleX: scale, ScaleY: scale, OffsetX: 6, OffsetY: 4, LockAspectRatio: true, Positioning: "oneCell"},
	}))
}

// protect locks the current tab but for the yellow cells. There is no password:
// the lock is against slips, not against people.
func (b *book) protect() {
	if b.err == nil {
		b.fail(b.f.ProtectSheet(b.tab, &excelize.SheetProtectionOptions{SelectLockedCells: true, SelectUnlockedCells: true, FormatColumns: true, FormatRows: true, InsertRows: true}))
	}
}

// number returns x with its decimal mark, at most the given significant digits.
func (b *book) number(x float64, digits int) string {
	v, err := strconv.ParseFloat(strconv.FormatFloat(x, 'e', digits-1, 64), 64)
	if err != nil {
		return "?"
	}
	return b.mark(strconv.FormatFloat(v, 'f', -1, 64))
}

// mm returns a length in m as mm with the given decimals.
func (b *book) mm(x float64, decimals int) string {
	return b.mark(strconv.FormatFloat(x*1e3, 'f', decimals, 64))
}

func (b *book) mark(s string) string {
	if b.comma {
		return strings.Replace(s, ".", ",", 1)
	}
	return s
}

var decimalPoint = regexp.MustCompile(`([0-9])\.([0-9])`)

// local puts the decimal mark into a text that was composed elsewhere.
func (b *book) local(s string) string {
	if b.comma {
		return decimalPoint.ReplaceAllString(s, "$1,$2")
	}
	return s
}

// decimals returns the number format that shows x with the given significant
// digits.
func decimals(x float64, digits int) string {
	if x == 0 || math.IsNaN(x) || math.IsInf(x, 0) {
		return "0.###"
	}
	n := digits - 1 - int(math.Floor(math.Log10(math.Abs(x))))
	if n <= 0 {
		return "0"
	}
	return "0." + strings.Repeat("0", min(n, 6))
}
