package sheet

import (
	"archive/zip"
	"bytes"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"gapwright/magnetics/part"

	"github.com/xuri/excelize/v2"
)

// Bounds on a workbook that comes from outside. A filled sheet is well below a
// megabyte.
const (
	MaxFileSize     = 32 << 20  // bytes, of the file
	maxUnzippedSize = 128 << 20 // bytes, of all its parts together
	maxEntrySize    = 32 << 20  // bytes, of one part
	maxEntries      = 2000
	maxRows         = 5000 // of a tab that is searched for a label
)

// Filled is what a shop wrote into a sheet.
type Filled struct {
	Path    string
	Part    string // transformer or inductor, as the sheet says; empty when its machine block is gone
	Design  string // design hash
	Sheet   string // sheet hash: of the rows and limits it was written with
	Tool    string
	Samples []Sample
	Fields  []Field  // everything else that was filled in
	Remarks []Remark // what was read with a conversion, or found by the row's ID because its name was gone
	Unread  []Unread // cells that hold something that could not be read
	Missing []string // keys whose cells could not be found at all
}

// A Sample is the column of one sample.
type Sample struct {
	Number   int
	Readings []Reading // measured rows, in the order of the checks
}

// A Reading is one cell of the inspection table.
type Reading struct {
	ID    string
	Value float64 // SI; 0 of an attribute
	Word  string  // of an attribute: OK or NOK
}

// Value returns the reading of a row in SI.
func (s Sample) Value(id string) (float64, bool) {
	for _, r := range s.Readings {
		if r.ID == id && r.Word == "" {
			return r.Value, true
		}
	}
	return 0, false
}

// Word returns the reading of an attribute row.
func (s Sample) Word(id string) string {
	for _, r := range s.Readings {
		if r.ID == id {
			return r.Word
		}
	}
	return ""
}

// A Field is one filled cell outside of the inspection table.
type Field struct{ Key, Text string }

// Field returns the text of a field, empty when the shop left it empty.
func (f Filled) Field(key string) string {
	for _, x := range f.Fields {
		if x.Key == key {
			return x.Text
		}
	}
	return ""
}

// Number returns a field that is a number, read as readings are.
func (f Filled) Number(key string) (float64, bool) {
	text := f.Field(key)
	if text == "" {
		return 0, false
	}
	n, _, err := parseReading(text, "", nil)
	return n, err == nil
}

// A Remark says how a cell was understood.
type Remark struct {
	Code string // W701 decimal comma, W702 unit cut off or converted, W704 found by ID, W705 far from what is expected
	Cell string // tab and address
	Key  string
	Text string
}

// Unread is a cell that holds something that is not what is expected there.
type Unread struct {
	Cell string
	Key  string
	Text string
	Why  string
}

func (u Unread) String() string {
	return fmt.Sprintf("%s (%s): %q: %s", u.Cell, u.Key, u.Text, u.Why)
}

// ErrNotASheet means that a file is no winding sheet of ours.
var ErrNotASheet = errNotASheet

// Read reads a filled workbook of size bytes. want are the rows that the build
// asks for; nil: those that the sheet's own machine block names. Cells are found
// by their defined names, then by the ID of their row and the head of their
// column; never by position. A cell that holds something unreadable is reported
// in Unread, never skipped.
//
// The input may be anything: what is not a workbook, or not a winding sheet, or
// unreasonably large when unpacked is an error.
func Read(r io.ReaderAt, size int64, want []part.Check) (f Filled, err error) {
	if err := sound(r, size); err != nil {
		return Filled{}, err
	}
	defer func() {
		// The workbook library trusts the structure of the file in places. A
		// damaged file must not stop the program.
		if p := recover(); p != nil {
			f, err = Filled{}, fmt.Errorf("%w: its structure is damaged (%v)", errNotASheet, p)
		}
	}()
	x, err := excelize.OpenReader(io.NewSectionReader(r, 0, size), excelize.Options{RawCellValue: true, UnzipSizeLimit: maxUnzippedSize, UnzipXMLSizeLimit: maxEntrySize})
	if err != nil {
		return Filled{}, fmt.Errorf("%w: %w", errNotASheet, err)
	}
	defer x.Close()
	d := newReader(x)
	if err := d.identify(); err != nil {
		return Filled{}, err
	}
	d.read(want)
	return d.out, nil
}

// ReadFile reads the filled workbook at path; nothing in it is changed.
func ReadFile(path string, want []part.Check) (Filled, error) {
	file, err := os.Open(path)
	if err != nil {
		return Filled{}, err
	}
	defer file.Close()
	info, err := file.Stat()
	if err != nil {
		return Filled{}, err
	}
	if info.IsDir() {
		return Filled{}, fmt.Errorf("%s: is a folder", path)
	}
	f, err := Read(file, info.Size(), want)
	if err != nil {
		return Filled{}, fmt.Errorf("%s: %w", path, err)
	}
	f.Path = path
	return f, nil
}

// HasReadings reports whether the workbook at path holds anything that the shop
// filled in, and names some of the cells. It is what must be asked before a
// sheet is written over an older one. A file that does not exist holds nothing;
// a file that is not a winding sheet is an error.
func HasReadings(path string) (filled bool, cells []string, err error) {
	if _, err := os.Stat(path); errors.Is(err, os.ErrNotExist) {
		return false, nil, nil
	}
	f, err := ReadFile(path, nil)
	if err != nil {
		return false, nil, err
	}
	for _, s := range f.Samples {
		for _, r := range s.Readings {
			cells = append(cells, fmt.Sprintf("%s.S%d", r.ID, s.Number))
		}
	}
	for _, x := range f.Fields {
		cells = append(cells, x.Key)
	}
	for _, u := range f.Unread {
		cells = append(cells, u.Key)
	}
	return len(cells) > 0, cells, nil
}

// sound checks the container before anything is unpacked.
func sound(r io.ReaderAt, size int64) error {
	if size > MaxFileSize {
		return fmt.Errorf("%w: %d bytes; a sheet is below %d", errNotASheet, size, MaxFileSize)
	}
	z, err := zip.NewReader(r, size)
	if err != nil {
		head := make([]byte, 8)
		n, _ := r.ReadAt(head, 0)
		if bytes.HasPrefix(head[:n], []byte{0xD0, 0xCF, 0x11, 0xE0}) {
			return fmt.Errorf("%w: an old .xls or a password-protected workbook; save it as .xlsx without a password", errNotASheet)
		}
		return fmt.Errorf("%w: not an xlsx workbook (%w)", errNotASheet, err)
	}
	if len(z.File) > maxEntries {
		return fmt.Errorf("%w: %d parts in the workbook", errNotASheet, len(z.File))
	}
	total := uint64(0)
	for _, e := range z.File {
		total += e.UncompressedSize64
		if e.UncompressedSize64 > maxEntrySize || total > maxUnzippedSize {
			return fmt.Errorf("%w: unpacks to more than %d MB", errNotASheet, maxUnzippedSize>>20)
		}
	}
	// The sizes in the directory may lie: unpack once, bounded, before the
	// library does it unbounded.
	left := int64(maxUnzippedSize)
	for _, e := range z.File {
		rc, err := e.Open()
		if err != nil {
			return fmt.Errorf("%w: %s: %w", errNotASheet, e.Name, err)
		}
		bounded := &countingReader{r: io.LimitReader(rc, min(left, maxEntrySize)+1)}
		if strings.Contains(strings.ToLower(e.Name), "worksheets/") {
			if err := spread(bounded); err != nil {
				rc.Close()
				return fmt.Errorf("%w: %s: %w", errNotASheet, e.Name, err)
			}
		}
		_, err = io.Copy(io.Discard, bounded)
		rc.Close()
		if err != nil {
			return fmt.Errorf("%w: %s: %w", errNotASheet, e.Name, err)
		}
		n := bounded.n
		left -= n
		if n > maxEntrySize || left < 0 {
			return fmt.Errorf("%w: unpacks to more than %d MB", errNotASheet, maxUnzippedSize>>20)
		}
	}
	return nil
}

type countingReader struct {
	r io.Reader
	n int64
}

func (c *countingReader) Read(p []byte) (int, error) {
	n, err := c.r.Read(p)
	c.n += int64(n)
	return n, err
}

// spread refuses a worksheet whose cells lie so far out that the workbook
// library, which keeps every row filled up to its last cell, would need
// gigabytes for a few kilobytes of file. A worksheet that is not XML is left to
// the library.
func spread(r io.Reader) error {
	const maxRow, maxCells = 100_000, 1_000_000
	d := xml.NewDecoder(r)
	cells, row, last := 0, 0, 0
	far := errors.New("its cells lie far outside of any sheet of ours")
	for {
		token, err := d.RawToken()
		if err != nil {
			return nil
		}
		start, ok := token.(xml.StartElement)
		if !ok || start.Name.Local != "row" && start.Name.Local != "c" {
			continue
		}
		ref := ""
		for _, a := range start.Attr {
			if a.Name.Local == "r" {
				ref = a.Value
			}
		}
		if start.Name.Local == "row" {
			row, last = row+1, 0
			if n, err := strconv.Atoi(ref); err == nil {
				row = n
			}
		} else {
			col := last + 1
			if c, n, err := excelize.CellNameToCoordinates(ref); err == nil {
				col, row = c, max(row, n)
			}
			if col > last {
				cells += col - last
				last = col
			}
		}
		if row > maxRow || cells > maxCells {
			return far
		}
	}
}

// place is a cell of the workbook.
type place struct{ tab, at string }

func (p place) String() string { return p.tab + "!" + p.at }

type reader struct {
	x     *excelize.File
	tabs  []string
	names map[string]place
	data  map[string]string // machine block
	cells []Cell            // of the machine block
	grid  map[string][][]string
	out   Filled
}

func newReader(x *excelize.File) *reader {
	d := &reader{x: x, tabs: x.GetSheetList(), names: map[string]place{}, data: map[string]string{}, grid: map[string][][]string{}}
	for _, n := range x.GetDefinedName() {
		if p, ok := parseReference(n.RefersTo); ok && slices.Contains(d.tabs, p.tab) {
			d.names[n.Name] = p
		}
	}
	return d
}

var reference = regexp.MustCompile(`^=?\$?'?((?:[^'!]|'')+)'?!\$?([A-Z]{1,3})\$?([0-9]{1,7})$`)

// parseReference reads 'tab'!$A$1, also as other programs write it.
func parseReference(s string) (place, bool) {
	m := reference.FindStringSubmatch(strings.TrimSpace(s))
	if m == nil {
		return place{}, false
	}
	at := m[2] + m[3]
	if _, _, err := excelize.CellNameToCoordinates(at); err != nil {
		return place{}, false
	}
	return place{strings.ReplaceAll(m[1], "''", "'"), at}, true
}

// rows returns the texts of a tab, bounded.
func (d *reader) rows(tab string) [][]string {
	if g, ok := d.grid[tab]; ok {
		return g
	}
	var out [][]string
	if it, err := d.x.Rows(tab); err == nil {
		for it.Next() && len(out) < maxRows {
			cols, err := it.Columns()
			if err != nil {
				break
			}
			if len(cols) > 200 {
				cols = cols[:200]
			}
			out = append(out, cols)
		}
		it.Close()
	}
	d.grid[tab] = out
	return out
}

// identify reads the machine block and decides whether this is a sheet at all.
func (d *reader) identify() error {
	if slices.Contains(d.tabs, TabData) {
		table := false
		for _, row := range d.rows(TabData) {
			if len(row) == 0 {
				continue
			}
			if row[0] == "key" {
				table = true
				continue
			}
			if !table {
				if len(row) > 1 {
					d.data[row[0]] = row[1]
				} else {
					d.data[row[0]] = ""
				}
				continue
			}
			c := Cell{Key: row[0]}
			for i, p := range []*string{&c.Name, &c.Tab, &c.at, &c.Row, &c.Column} {
				if i+1 < len(row) {
					*p = row[i+1]
				}
			}
			d.cells = append(d.cells, c)
		}
	}
	d.out.Part, d.out.Design, d.out.Sheet, d.out.Tool = d.data[keyPart], d.data[keyDesign], d.data[keySheet], d.data[keyTool]
	if v, ok := d.data[keyFormat]; ok {
		if v != strconv.Itoa(FormatVersion) {
			return fmt.Errorf("%w that this program can read: format version %q, known is %d", errNotASheet, v, FormatVersion)
		}
		return nil
	}
	// Without the machine block the names of the cells must speak for it.
	for name := range d.names {
		if strings.HasPrefix(name, "E04_S") {
			return nil
		}
	}
	for _, tab := range d.tabs {
		if _, _, ok := d.find(tab, "E04", sampleHead(1)); ok {
			return nil
		}
	}
	return errNotASheet
}

// find returns the cell in the row that begins with id, below a head.
func (d *reader) find(tab, id, head string) (place, string, bool) {
	rows := d.rows(tab)
	col, from := -1, 0
	for i, row := range rows {
		if j := slices.IndexFunc(row, func(s string) bool { return strings.TrimSpace(s) == head }); j >= 0 {
			col, from = j, i
		}
		if col >= 0 && i > from && len(row) > 0 && strings.TrimSpace(row[0]) == id {
			return place{tab, address(col+1, i+1)}, id, true
		}
	}
	return place{}, "", false
}

// label returns the cell that is filled in beside a label: the next one to the
// right that is not part of the label itself.
func (d *reader) label(tab, label string) (place, bool) {
	merged, err := d.x.GetMergeCells(tab)
	if err != nil {
		return place{}, false
	}
	for i, row := range d.rows(tab) {
		for j, text := range row {
			if strings.TrimSpace(text) != label {
				continue
			}
			next := j + 2
			for _, m := range merged {
				if m.GetStartAxis() == address(j+1, i+1) {
					if c, _, err := excelize.CellNameToCoordinates(m.GetEndAxis()); err == nil {
						next = c + 1
					}
				}
			}
			return place{tab, address(next, i+1)}, true
		}
	}
	return place{}, false
}

// locate finds the cell of a key.
func (d *reader) locate(c Cell) (place, bool) {
	if p, ok := d.names[c.Name]; ok {
		return p, true
	}
	order := d.tabs
	if i := slices.Index(order, c.Tab); i > 0 {
		order = append([]string{c.Tab}, slices.DeleteFunc(slices.Clone(order), func(t string) bool { return t == c.Tab })...)
	}
	for _, tab := range order {
		if tab == TabData {
			continue
		}
		var p place
		ok := false
		if c.Column != "" && c.Row != "" {
			p, _, ok = d.find(tab, c.Row, c.Column)
		} else if c.Row != "" {
			p, ok = d.label(tab, c.Row)
		}
		if ok {
			d.out.Remarks = append(d.out.Remarks, Remark{"W704", p.String(), c.Key, "its name is gone from the workbook; found by " + c.Row})
			return p, true
		}
	}
	return place{}, false
}

// read fills in the result.
func (d *reader) read(want []part.Check) {
	if want == nil {
		want = d.ownChecks()
	}
	for i := 1; i <= MaxSamples; i++ {
		s := Sample{Number: i}
		for _, c := range want {
			if c.Kind == part.Computed {
				continue
			}
			key := fmt.Sprintf("%s.S%d", c.ID, i)
			cell := Cell{Key: key, Name: Name(key), Tab: TabInspection, Row: c.ID, Column: sampleHead(i)}
			if !d.known(key, i) {
				continue
			}
			p, ok := d.locate(cell)
			if !ok {
				d.out.Missing = append(d.out.Missing, key)
				continue
			}
			if r, ok := d.reading(p, key, c); ok {
				s.Readings = append(s.Readings, r)
			}
		}
		if len(s.Readings) > 0 {
			d.out.Samples = append(d.out.Samples, s)
		}
	}
	for _, c := range d.cells {
		if isReading(c.Key) {
			continue
		}
		p, ok := d.locate(c)
		if !ok {
			continue
		}
		text, kind := d.content(p)
		if text = strings.TrimSpace(text); text == "" {
			continue
		}
		if kind == "formula" {
			d.out.Unread = append(d.out.Unread, Unread{p.String(), c.Key, text, "a formula; type the value itself"})
			continue
		}
		d.out.Fields = append(d.out.Fields, Field{c.Key, text})
	}
}

// known reports whether the sheet has a column for sample i at all.
func (d *reader) known(key string, i int) bool {
	if n, err := strconv.Atoi(d.data[keySamples]); err == nil && n >= 1 && n <= MaxSamples {
		return i <= n
	}
	if _, ok := d.names[Name(key)]; ok {
		return true
	}
	return i <= 5
}

var readingKey = regexp.MustCompile(`^(E|M)[0-9]+.*\.S[0-9]+$`)

func isReading(key string) bool { return readingKey.MatchString(key) }

// ownChecks are the rows that the machine block speaks of.
func (d *reader) ownChecks() []part.Check {
	var out []part.Check
	seen := map[string]bool{}
	for _, c := range d.cells {
		if !isReading(c.Key) {
			continue
		}
		id := c.Key[:strings.LastIndex(c.Key, ".S")]
		if seen[id] {
			continue
		}
		seen[id] = true
		check := part.Check{ID: id, Unit: d.data[id+".unit"], Kind: part.Measured}
		check.Scale = part.UnitScale(check.Unit)
		out = append(out, check)
	}
	return out
}

// content returns what a cell holds and what it is: number, text, formula,
// date, boolean, error or empty.
func (d *reader) content(p place) (text, kind string) {
	if f, err := d.x.GetCellFormula(p.tab, p.at); err == nil && f != "" {
		return "=" + f, "formula"
	}
	v, err := d.x.GetCellValue(p.tab, p.at)
	if err != nil || v == "" {
		return "", "empty"
	}
	t, err := d.x.GetCellType(p.tab, p.at)
	if err != nil {
		return v, "text"
	}
	switch t {
	case excelize.CellTypeBool:
		return v, "boolean"
	case excelize.CellTypeError:
		return v, "error"
	case excelize.CellTypeDate:
		return v, "date"
	case excelize.CellTypeUnset, excelize.CellTypeNumber:
		if d.dated(p) {
			return v, "date"
		}
		return v, "number"
	}
	return v, "text"
}

// dated reports whether the cell shows its number as a date, which is what
// spreadsheets make of 3.5 or 3-5 in some languages.
func (d *reader) dated(p place) bool {
	id, err := d.x.GetCellStyle(p.tab, p.at)
	if err != nil {
		return false
	}
	st, err := d.x.GetStyle(id)
	if err != nil || st == nil {
		return false
	}
	if n := st.NumFmt; n >= 14 && n <= 22 || n >= 45 && n <= 47 {
		return true
	}
	if st.CustomNumFmt == nil {
		return false
	}
	code := strings.ToLower(*st.CustomNumFmt)
	code = regexp.MustCompile(`\[[^\]]*\]|"[^"]*"`).ReplaceAllString(code, "")
	return strings.ContainsAny(code, "yd") && !strings.Contains(code, "general")
}

// reading reads one cell of the inspection table. ok is false when it is empty
// or unreadable.
func (d *reader) reading(p place, key string, c part.Check) (Reading, bool) {
	text, kind := d.content(p)
	text = strings.TrimSpace(text)
	bad := func(why string) (Reading, bool) {
		d.out.Unread = append(d.out.Unread, Unread{p.String(), key, clip(clean(text), 60), why})
		return Reading{}, false
	}
	if text == "" {
		return Reading{}, false
	}
	if kind == "formula" {
		return bad("a formula where a reading is expected; type the number itself")
	}
	if kind == "error" {
		return bad("the spreadsheet shows an error in this cell")
	}
	word := strings.ToUpper(text)
	if c.Kind == part.Attribute || word == "OK" || word == "NOK" {
		switch {
		case c.Kind != part.Attribute && c.Unit != "":
			return bad("a number is expected")
		case word == "OK" || word == "NOK":
			return Reading{ID: c.ID, Word: word}, true
		}
		return bad("OK or NOK is expected")
	}
	switch kind {
	case "date":
		return bad("the spreadsheet turned this into a date; type the number with its decimal mark again")
	case "boolean":
		return bad("a number is expected")
	}
	unit := c.Unit
	scale := c.Scale
	if u, ok := d.data[c.ID+".unit"]; ok && part.UnitScale(u) > 0 {
		// What stands in the sheet is in the unit that the sheet was written with.
		unit, scale = u, part.UnitScale(u)
	}
	var nominal *float64
	if c.Nominal != nil && scale > 0 {
		n := *c.Nominal / scale
		nominal = &n
	}
	v, remarks, err := parseReading(text, unit, nominal)
	if err != nil {
		return bad(err.Error())
	}
	for _, r := range remarks {
		r.Cell, r.Key = p.String(), key
		d.out.Remarks = append(d.out.Remarks, r)
	}
	if v < 0 {
		return bad("a negative reading")
	}
	if nominal != nil && *nominal > 0 && (v > farOff**nominal || v < *nominal/farOff) {
		d.out.Remarks = append(d.out.Remarks, Remark{"W705", p.String(), key, fmt.Sprintf("%s %s where about %s is expected: was another unit meant?",
			strconv.FormatFloat(v, 'g', 6, 64), unit, strconv.FormatFloat(*nominal, 'g', 4, 64))})
	}
	v *= scale
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return bad("not a finite number")
	}
	return Reading{ID: c.ID, Value: v}, true
}

// farOff is how many times a reading may be off before another unit is suspected.
const farOff = 100

var readingForm = regexp.MustCompile(`^([+-]?[0-9][0-9.,'\x{00A0} ]*(?:[eE][+-]?[0-9]{1,2})?|[+-]?[.,][0-9]+)\s*([\p{L}%°][^\s]*(?:\s*[^\d\s]+)?)?$`)

// parseReading reads the text of a reading in the given unit: with decimal point
// or comma, with thousands apart, with a trailing unit. nominal decides what a
// single comma before three digits means.
func parseReading(text, unit string, nominal *float64) (float64, []Remark, error) {
	text = strings.TrimSpace(text)
	if v, err := strconv.ParseFloat(text, 64); err == nil {
		if math.IsNaN(v) || math.IsInf(v, 0) || strings.ContainsAny(text, "xXpP_") {
			return 0, nil, errors.New("not a number")
		}
		return v, nil, nil
	}
	m := readingForm.FindStringSubmatch(text)
	if m == nil {
		return 0, nil, errors.New("not a number")
	}
	var remarks []Remark
	digits, tail := strings.TrimSpace(m[1]), strings.TrimSpace(m[2])
	plain, said, err := plainNumber(digits, nominal)
	if err != nil {
		return 0, nil, err
	}
	if said != "" {
		remarks = append(remarks, Remark{Code: "W701", Text: fmt.Sprintf("%q read as %s (%s)", text, plain, said)})
	}
	v, err := strconv.ParseFloat(plain, 64)
	if err != nil || math.IsInf(v, 0) {
		return 0, nil, errors.New("not a number")
	}
	if tail == "" {
		return v, remarks, nil
	}
	written := asciiUnit(tail)
	switch from := part.UnitScale(written); {
	case strings.EqualFold(written, unit) && written != "":
		// "uh", "UH": the unit of the row in other letters. Case matters between
		// m and M, so that only the unit itself is taken that way.
		if strings.EqualFold(written, "Mohm") && written != unit {
			return 0, nil, fmt.Errorf("unit %q where %s is expected", tail, orElse(unit, "a plain number"))
		}
		remarks = append(remarks, Remark{Code: "W702", Text: fmt.Sprintf("%q: unit cut off, read as %s %s", text, plain, unit)})
	case from > 0 && written != "" && part.UnitScale(unit) > 0 && dimensionOf(written) == dimensionOf(unit):
		v *= from / part.UnitScale(unit)
		remarks = append(remarks, Remark{Code: "W702", Text: fmt.Sprintf("%q converted to %s %s", text, strconv.FormatFloat(v, 'g', 6, 64), unit)})
	default:
		return 0, nil, fmt.Errorf("unit %q where %s is expected", tail, orElse(unit, "a plain number"))
	}
	return v, remarks, nil
}

// plainNumber turns digits with points, commas, blanks and apostrophes into a
// number with a decimal point, and says what was assumed.
func plainNumber(s string, nominal *float64) (plain, said string, err error) {
	exponent := ""
	if i := strings.IndexAny(s, "eE"); i >= 0 {
		s, exponent = s[:i], s[i:]
	}
	s = strings.TrimSpace(s)
	bare := strings.NewReplacer(" ", "", "\u00a0", "", "'", "").Replace(s)
	points, commas := strings.Count(bare, "."), strings.Count(bare, ",")
	ambiguous := errors.New("the decimal mark is not clear")
	switch {
	case points == 0 && commas == 0:
		if bare != s {
			said = "blanks between digits left out"
		}
		return bare + exponent, said, nil
	case commas == 0 && points == 1:
		if bare != s {
			said = "blanks between digits left out"
		}
		return bare + exponent, said, nil
	case points == 0 && commas == 1:
		i := strings.IndexByte(bare, ',')
		decimal := bare[:i] + "." + bare[i+1:]
		whole := bare[:i] + bare[i+1:]
		if exponent == "" && len(bare)-i-1 == 3 && i >= 1 && i <= 3 && strings.TrimLeft(bare[:i], "0+-") != "" && nominal != nil && *nominal > 0 {
			// 1,234 is 1.234 or 1234: the one that is nearer to what the row
			// expects.
			a, errA := strconv.ParseFloat(decimal, 64)
			b, errB := strconv.ParseFloat(whole, 64)
			if errA == nil && errB == nil && a > 0 && b > 0 && math.Abs(math.Log(b / *nominal)) < math.Abs(math.Log(a / *nominal)) {
				return whole + exponent, "comma between thousands, by the nominal value", nil
			}
		}
		return decimal + exponent, "decimal comma", nil
	case points >= 1 && commas >= 1:
		mark, group := ".", ","
		if strings.LastIndexByte(bare, ',') > strings.LastIndexByte(bare, '.') {
			mark, group = ",", "."
		}
		if strings.Count(bare, mark) != 1 || !grouped(bare[:strings.Index(bare, mark)], group) {
			return "", "", ambiguous
		}
		return strings.Replace(strings.ReplaceAll(bare, group, ""), mark, ".", 1) + exponent, "thousands apart, decimal " + map[string]string{".": "point", ",": "comma"}[mark], nil
	}
	group := "."
	if commas > 0 {
		group = ","
	}
	if !grouped(bare, group) {
		return "", "", ambiguous
	}
	return strings.ReplaceAll(bare, group, "") + exponent, "thousands apart", nil
}

// grouped reports whether the marks stand before groups of three digits.
func grouped(s, mark string) bool {
	parts := strings.Split(strings.TrimLeft(s, "+-"), mark)
	for i, p := range parts {
		if i == 0 && (len(p) < 1 || len(p) > 3) || i > 0 && len(p) != 3 {
			return false
		}
	}
	return true
}

// asciiUnit writes a unit as the checks do.
func asciiUnit(s string) string {
	s = strings.NewReplacer("µ", "u", "μ", "u", "Ω", "ohm", "Ω", "ohm", "°", "deg", " ", "", "Ohm", "ohm", "OHM", "ohm").Replace(s)
	if s == "C" {
		return "degC"
	}
	return s
}

// dimensionOf tells units of the same quantity.
func dimensionOf(unit string) string {
	switch unit {
	case "uH", "nH", "mH":
		return "H"
	case "mohm", "ohm", "Mohm":
		return "ohm"
	}
	return unit
}
