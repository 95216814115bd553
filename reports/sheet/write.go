package sheet

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"

	"gapwright/magnetics/part"

	"github.com/xuri/excelize/v2"
)

// Write writes the workbook. The same sheet gives the same cells: there is no
// clock in it.
func Write(w io.Writer, s Sheet) error {
	if s.Samples < 1 || s.Samples > MaxSamples {
		return fmt.Errorf("winding sheet of the %s: %d samples; a sheet has 1 to %d columns for them", s.Part, s.Samples, MaxSamples)
	}
	if len(s.Checks) == 0 {
		return fmt.Errorf("winding sheet of the %s: no inspection rows", s.Part)
	}
	for _, c := range s.Checks {
		if c.Scale <= 0 {
			return fmt.Errorf("winding sheet of the %s: %s has the unit %q, which the sheet does not know", s.Part, c.ID, c.Unit)
		}
		for _, v := range []*float64{c.Nominal, c.Min, c.Max} {
			if v != nil && (math.IsNaN(*v) || math.IsInf(*v, 0)) {
				return fmt.Errorf("winding sheet of the %s: %s %s has a value that is not finite", s.Part, c.ID, c.Name)
			}
		}
	}
	b := newBook(s.Comma)
	defer b.f.Close()
	b.pageSheet(s)
	b.pageSection(s)
	b.pageInspection(s)
	b.pageNotes(s)
	b.pageHistory(s)
	b.pageData(s)
	b.flush()
	b.fail(b.f.SetDocProps(&excelize.DocProperties{
		Title: clean(s.header()), Subject: "Winding specification", Creator: clean(s.Tool), LastModifiedBy: clean(s.Tool),
		Created: fixedDate, Modified: fixedDate, Identifier: "xlsx",
	}))
	full := true
	b.fail(b.f.SetCalcProps(&excelize.CalcPropsOptions{FullCalcOnLoad: &full}))
	b.f.SetActiveSheet(0)
	if b.err != nil {
		return fmt.Errorf("winding sheet of the %s: %w", s.Part, b.err)
	}
	if _, err := b.f.WriteTo(w); err != nil {
		return fmt.Errorf("winding sheet of the %s: %w", s.Part, err)
	}
	return nil
}

// fixedDate stands in the document properties, so that the same input gives the
// same cells; the date of issue is on the sheet.
const fixedDate = "2000-01-01T00:00:00Z"

// Keys of the machine block.
const (
	keyFormat    = "format version"
	keyTool      = "made with"
	keyPart      = "part"
	keyDesign    = "design hash"
	keySheet     = "sheet hash"
	keySamples   = "samples"
	keyRows      = "rows"
	keyCellCount = "cells"
)

// pageData writes the machine block: what the reader needs to trust the file.
func (b *book) pageData(s Sheet) {
	cells := b.cells
	b.begin(TabData, false, s.header(), 30, 26, 24, 16, 40, 24)
	b.put(1, 1, 6, "Machine block, read back by key. Please do not edit.", lookBand)
	row := 1
	put := func(key string, value any) {
		row++
		b.put(row, 1, 1, key, look{align: "left", size: 8})
		b.put(row, 2, 2, value, look{align: "left", size: 8})
	}
	put(keyFormat, FormatVersion)
	put(keyTool, s.Tool)
	put(keyPart, s.Part)
	put(keyDesign, s.Hash)
	put(keySheet, Hash(s.Hash, s.Checks))
	put(keySamples, s.Samples)
	put(keyRows, len(s.Checks))
	put(keyCellCount, len(cells))
	if b.err == nil {
		// On paper the hashes are enough.
		b.fail(b.f.SetDefinedName(&excelize.DefinedName{Name: "_xlnm.Print_Area", RefersTo: fmt.Sprintf("'%s'!$A$1:$F$%d", TabData, row), Scope: TabData}))
	}
	for _, c := range s.Checks {
		put(c.ID+".unit", c.Unit)
		for _, v := range []struct {
			name  string
			value *float64
		}{{".nominal", c.Nominal}, {".min", c.Min}, {".max", c.Max}} {
			if v.value != nil {
				put(c.ID+v.name, *v.value/c.Scale)
			}
		}
	}
	row++
	for i, h := range []string{"key", "name", "tab", "row", "label or row", "column"} {
		b.put(row, i+1, i+1, h, look{fill: heading, size: 8, bold: true})
	}
	for _, c := range cells {
		row++
		for i, v := range []string{c.Key, c.Name, c.Tab, c.at, c.Row, c.Column} {
			b.put(row, i+1, i+1, v, look{align: "left", size: 8, shrink: true})
		}
	}
	b.protect()
}

// Hash is the hash of what the shop is asked to measure: the design and every
// row with its unit and limits. It tells a sheet whose limits were edited.
func Hash(design string, checks []part.Check) string {
	h := sha256.New()
	fmt.Fprintf(h, "%d %s\n", FormatVersion, design)
	value := func(v *float64, scale float64) string {
		if v == nil {
			return "-"
		}
		return strconv.FormatFloat(*v/scale, 'g', 9, 64)
	}
	for _, c := range checks {
		fmt.Fprintf(h, "%s %s %s %s %s\n", c.ID, c.Unit, value(c.Nominal, c.Scale), value(c.Min, c.Scale), value(c.Max, c.Scale))
	}
	return hex.EncodeToString(h.Sum(nil))[:12]
}

var errNotASheet = errors.New("not a winding sheet of gapwright")
