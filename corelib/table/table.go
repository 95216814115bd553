// Package table reads the open tables: plain CSV files that a person can read
// and extend with an editor or a spreadsheet.
//
// The first line that is not a comment is the header. A column that holds a
// quantity names its unit there, as in "D_min [mm]"; numbers are converted to
// coherent SI once, while reading, by a decimal exponent, so that 0.071 mm is
// exactly the float 71e-6. Lines that begin with # are comments and carry the
// sources of the file. A decimal point is the only decimal mark. All mistakes of
// a file are reported at once, each with file, line and column.
package table

import (
	"bytes"
	"cmp"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"regexp"
	"slices"
	"strconv"
	"strings"
)

// An Error is one mistake in a table file.
type Error struct {
	File         string
	Line, Column int // counted from 1; Column counts bytes, as editors do for ASCII tables
	Msg          string
}

func (e *Error) Error() string {
	return fmt.Sprintf("%s:%d:%d: %s", e.File, e.Line, e.Column, e.Msg)
}

// Position returns where the mistake is.
func (e *Error) Position() (file string, line, column int) { return e.File, e.Line, e.Column }

// A Column says what a file may hold under one heading.
type Column struct {
	Name     string
	Unit     string // coherent unit that numbers are converted to: m, m2, m3, 1/m, ohm/m, V, H, degC, 1 (from %); "": text or a plain number
	Required bool   // the column must be there; its cells may still be empty
}

// units lists what a header may write in brackets: the coherent unit and the
// decimal exponent that leads to it. The first of each kind is the one that a
// message proposes.
var units = []struct {
	name, coherent string
	exponent       int
}{
	{"mm", "m", -3}, {"um", "m", -6}, {"cm", "m", -2}, {"m", "m", 0},
	{"mm2", "m2", -6}, {"cm2", "m2", -4}, {"m2", "m2", 0},
	{"mm3", "m3", -9}, {"cm3", "m3", -6}, {"m3", "m3", 0},
	{"1/mm", "1/m", 3}, {"1/cm", "1/m", 2}, {"1/m", "1/m", 0},
	{"ohm/m", "ohm/m", 0}, {"mohm/m", "ohm/m", -3}, {"ohm/km", "ohm/m", -3},
	{"V", "V", 0}, {"kV", "V", 3},
	{"nH", "H", -9}, {"uH", "H", -6},
	{"%", "1", -2},
	{"degC", "degC", 0},
	{"kHz", "Hz", 3}, {"MHz", "Hz", 6}, {"Hz", "Hz", 0},
	{"mT", "T", -3}, {"T", "T", 0},
	{"kW/m3", "W/m3", 3}, {"mW/cm3", "W/m3", 3}, {"W/m3", "W/m3", 0},
}

// A File is a table that was read. Its rows refer to it to collect mistakes.
type File struct {
	Name  string
	Rows  []Row
	place map[string]int // heading -> field number
	scale map[string]int // heading -> decimal exponent
	errs  []*Error
}

// A Row is one line of a table.
type Row struct {
	f      *File
	fields []string
	at     [][2]int
}

// Read reads a whole table. The error holds what is wrong with the file as such:
// unreadable lines, headings that are unknown, missing, doubled or in a wrong
// unit. What is wrong with cells is collected while they are fetched; see Err.
func Read(name string, r io.Reader, columns ...Column) (*File, error) {
	data, err := io.ReadAll(r)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	data = bytes.TrimPrefix(data, []byte("\ufeff")) // spreadsheets write a byte order mark
	f := &File{Name: name, place: map[string]int{}, scale: map[string]int{}}
	reader := csv.NewReader(bytes.NewReader(data))
	reader.Comment = '#'
	reader.TrimLeadingSpace = true
	reader.FieldsPerRecord = -1
	header := true
	width := 0
	for {
		fields, err := reader.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			if pe, ok := errors.AsType[*csv.ParseError](err); ok {
				f.fail(pe.Line, pe.Column, "%v", pe.Err)
				return nil, f.Err()
			}
			return nil, fmt.Errorf("%s: %w", name, err)
		}
		row := Row{f: f, fields: fields, at: make([][2]int, len(fields))}
		for i := range fields {
			line, column := reader.FieldPos(i)
			row.at[i] = [2]int{line, column}
			fields[i] = strings.TrimSpace(fields[i])
		}
		if header {
			header = false
			width = len(fields)
			if !f.readHeader(row, columns) {
				return nil, f.Err()
			}
			continue
		}
		if len(fields) != width {
			f.fail(row.at[0][0], 1, "%d fields, but the header has %d; put texts that hold commas in double quotes", len(fields), width)
			continue
		}
		f.Rows = append(f.Rows, row)
	}
	if header {
		f.fail(1, 1, "no header line")
	}
	if err := f.Err(); err != nil {
		return nil, err
	}
	return f, nil
}

var heading = regexp.MustCompile(`^(.*?)\s*(?:\[(.*)\])?$`)

func (f *File) readHeader(row Row, columns []Column) bool {
	if len(row.fields) == 1 && strings.Contains(row.fields[0], ";") {
		f.fail(row.at[0][0], row.at[0][1], "the fields are separated by semicolons; separate them by commas and use a decimal point")
		return false
	}
	byName := make(map[string]Column, len(columns))
	names := make([]string, len(columns))
	for i, c := range columns {
		byName[c.Name] = c
		names[i] = c.Name
	}
	for i, cell := range row.fields {
		m := heading.FindStringSubmatch(cell)
		name, unit := m[1], m[2]
		line, column := row.at[i][0], row.at[i][1]
		c, known := byName[name]
		if !known {
			f.fail(line, column, "unknown column %q; nearest: %s", name, strings.Join(Nearest(name, names, 1), ", "))
			continue
		}
		if _, twice := f.place[name]; twice {
			f.fail(line, column, "column %q appears twice", name)
			continue
		}
		f.place[name] = i
		switch {
		case c.Unit == "" && unit != "":
			f.fail(line, column, "column %q has no unit, found [%s]", name, unit)
		case c.Unit != "" && unit == "":
			f.fail(line, column, "column %q needs a unit; write %q", name, name+" ["+unitsFor(c.Unit)[0]+"]")
		case c.Unit != "":
			k := slices.IndexFunc(units, func(u struct {
				name, coherent string
				exponent       int
			}) bool {
				return u.name == unit && u.coherent == c.Unit
			})
			if k < 0 {
				f.fail(line, column, "column %q is in %q; write one of %s", name, unit, strings.Join(unitsFor(c.Unit), ", "))
				continue
			}
			f.scale[name] = units[k].exponent
		}
	}
	for _, c := range columns {
		if _, there := f.place[c.Name]; c.Required && !there {
			f.fail(row.at[0][0], 1, "column %q is missing", c.Name)
		}
	}
	return len(f.errs) == 0
}

func unitsFor(coherent string) []string {
	var names []string
	for _, u := range units {
		if u.coherent == coherent {
			names = append(names, u.name)
		}
	}
	return names
}

func (f *File) fail(line, column int, format string, args ...any) {
	f.errs = append(f.errs, &Error{File: f.Name, Line: line, Column: column, Msg: fmt.Sprintf(format, args...)})
}

// Err returns every mistake found so far in file order, or nil.
func (f *File) Err() error {
	if len(f.errs) == 0 {
		return nil
	}
	slices.SortStableFunc(f.errs, func(a, b *Error) int {
		return cmp.Or(cmp.Compare(a.Line, b.Line), cmp.Compare(a.Column, b.Column))
	})
	all := make([]error, len(f.errs))
	for i, e := range f.errs {
		all[i] = e
	}
	return errors.Join(all...)
}

// Fail notes a mistake in the named cell, or in the row when the file has no
// such column.
func (r Row) Fail(name, format string, args ...any) {
	line, column := r.at[0][0], r.at[0][1]
	if i, ok := r.f.place[name]; ok {
		line, column = r.at[i][0], r.at[i][1]
	}
	r.f.fail(line, column, format, args...)
}

// Line returns the line of the row in its file.
func (r Row) Line() int { return r.at[0][0] }

// Text returns a cell; an absent column reads as empty.
func (r Row) Text(name string) string {
	if i, ok := r.f.place[name]; ok {
		return r.fields[i]
	}
	return ""
}

// MustText returns a cell that may not be empty.
func (r Row) MustText(name string) string {
	s := r.Text(name)
	if s == "" {
		r.Fail(name, "%s is empty", name)
	}
	return s
}

var (
	decimal      = regexp.MustCompile(`^([+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+))(?:[eE]([+-]?[0-9]{1,4}))?$`)
	decimalComma = regexp.MustCompile(`^[+-]?[0-9]+,[0-9]+$`)
)

// Number returns a cell in the coherent unit of its column; ok is false when
// the cell is empty or not a number, and then a mistake is noted in the second
// case.
func (r Row) Number(name string) (value float64, ok bool) {
	s := r.Text(name)
	if s == "" {
		return 0, false
	}
	if decimalComma.MatchString(s) {
		r.Fail(name, "%s: %q has a decimal comma; write %s", name, s, strings.Replace(s, ",", ".", 1))
		return 0, false
	}
	parts := decimal.FindStringSubmatch(s)
	if parts == nil {
		r.Fail(name, "%s: %q is not a decimal number", name, s)
		return 0, false
	}
	exponent := r.f.scale[name]
	if parts[2] != "" {
		e, err := strconv.Atoi(parts[2])
		if err != nil {
			r.Fail(name, "%s: %q is not a decimal number", name, s)
			return 0, false
		}
		exponent += e
	}
	v, err := strconv.ParseFloat(parts[1]+"e"+strconv.Itoa(exponent), 64)
	if err != nil {
		r.Fail(name, "%s: %q is out of range", name, s)
		return 0, false
	}
	return v, true
}

// Positive returns a cell that must hold a number above zero.
func (r Row) Positive(name string) float64 {
	v, ok := r.Number(name)
	switch {
	case !ok && r.Text(name) == "":
		r.Fail(name, "%s is empty", name)
	case ok && v <= 0:
		r.Fail(name, "%s: %s is not above zero", name, r.Text(name))
	}
	return v
}

// Count returns a cell that holds a whole number from 0 up; empty reads as 0.
func (r Row) Count(name string) int {
	s := r.Text(name)
	if s == "" {
		return 0
	}
	n, err := strconv.Atoi(s)
	if err != nil || n < 0 {
		r.Fail(name, "%s: %q is not a whole number from 0 up", name, s)
		return 0
	}
	return n
}
