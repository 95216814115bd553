// Package text writes results for the terminal, as aligned tables and wrapped
// paragraphs, and for programs, as JSON. Texts are composed with UTF-8 signs
// (µ, Ω, °C); a printer that is not bound to a UTF-8 terminal replaces them by
// ASCII before anything is aligned.
package text

import (
	"encoding/json"
	"fmt"
	"io"
	"strings"
	"unicode/utf8"
)

// A Printer writes lines, paragraphs and tables to one stream. The first write
// error is kept and returned by Err; later calls do nothing.
type Printer struct {
	w     io.Writer
	utf8  bool
	width int
	err   error
}

// NewPrinter returns a printer for a stream that is width columns wide.
func NewPrinter(w io.Writer, utf8 bool, width int) *Printer {
	if width < 40 {
		width = 40 // narrower than this, wrapping does more harm than a long line
	}
	return &Printer{w: w, utf8: utf8, width: width}
}

// Err returns the first error met while writing.
func (p *Printer) Err() error { return p.err }

// Width returns the number of columns that paragraphs are wrapped to.
func (p *Printer) Width() int { return p.width }

// Line prints one line, unwrapped.
func (p *Printer) Line(format string, args ...any) {
	p.write(p.plain(fmt.Sprintf(format, args...)) + "\n")
}

// Paragraph prints text wrapped to the width; the lines after the first are
// indented by indent columns.
func (p *Printer) Paragraph(indent int, format string, args ...any) {
	words := strings.Fields(p.plain(fmt.Sprintf(format, args...)))
	var b strings.Builder
	column := 0
	for i, word := range words {
		n := utf8.RuneCountInString(word)
		switch {
		case i == 0:
		case column+1+n > p.width:
			b.WriteString("\n" + strings.Repeat(" ", indent))
			column = indent
		default:
			b.WriteByte(' ')
			column++
		}
		b.WriteString(word)
		column += n
	}
	p.write(b.String() + "\n")
}

// A Table is a heading and rows of cells. Columns listed in Left are aligned
// left, all others right, as numbers are.
type Table struct {
	Head []string
	Left []int
	Rows [][]string
	Fold bool // fold left-aligned columns when the table is wider than the printer
}

// Add appends one row.
func (t *Table) Add(cells ...string) { t.Rows = append(t.Rows, cells) }

// narrowest is how far a left-aligned column is folded to make a table fit.
const narrowest = 14

// Table prints t with two blanks between columns and a rule under the heading.
func (p *Printer) Table(t Table) {
	left := make(map[int]bool, len(t.Left))
	for _, c := range t.Left {
		left[c] = true
	}
	rows := make([][]string, 0, len(t.Rows)+1)
	if len(t.Head) > 0 {
		rows = append(rows, t.Head)
	}
	rows = append(rows, t.Rows...)
	var widths []int
	plain := make([][]string, len(rows))
	for r, row := range rows {
		plain[r] = make([]string, len(row))
		for c, cell := range row {
			cell = p.plain(cell)
			plain[r][c] = cell
			if c == len(widths) {
				widths = append(widths, 0)
			}
			widths[c] = max(widths[c], utf8.RuneCountInString(cell))
		}
	}
	if t.Fold {
		p.squeeze(widths, left)
	}
	total := 2 * (len(widths) - 1)
	for _, w := range widths {
		total += w
	}
	for r, row := range plain {
		lines := [][]string{row}
		if t.Fold {
			lines = folded(row, widths, left)
		}
		for _, line := range lines {
			var b strings.Builder
			for c, cell := range line {
				if c > 0 {
					b.WriteString("  ")
				}
				pad := strings.Repeat(" ", max(widths[c]-utf8.RuneCountInString(cell), 0))
				if left[c] {
					b.WriteString(cell + pad)
				} else {
					b.WriteString(pad + cell)
				}
			}
			p.write(strings.TrimRight(b.String(), " ") + "\n")
		}
		if r == 0 && len(t.Head) > 0 {
			p.write(strings.Repeat("-", total) + "\n")
		}
	}
}

// squeeze takes the widths of left-aligned columns down, the widest first, until
// the table fits or all are as narrow as they may be.
func (p *Printer) squeeze(widths []int, left map[int]bool) {
	excess := 2*(len(widths)-1) - p.width
	for _, w := range widths {
		excess += w
	}
	for excess > 0 {
		widest := -1
		for c, w := range widths {
			if left[c] && w > narrowest && (widest < 0 || w > widths[widest]) {
				widest = c
			}
		}
		if widest < 0 {
			return
		}
		widths[widest]--
		excess--
	}
}

// folded breaks the cells of a row that are wider than their column between
// words; a word that is too long stays whole.
func folded(row []string, widths []int, left map[int]bool) [][]string {
	lines := [][]string{make([]string, len(row))}
	for c, cell := range row {
		if !left[c] || utf8.RuneCountInString(cell) <= widths[c] {
			lines[0][c] = cell
			continue
		}
		n := 0
		for _, word := range strings.Fields(cell) {
			if lines[n][c] != "" && utf8.RuneCountInString(lines[n][c])+1+utf8.RuneCountInString(word) > widths[c] {
				n++
				if n == len(lines) {
					lines = append(lines, make([]string, len(row)))
				}
			}
			if lines[n][c] != "" {
				lines[n][c] += " "
			}
			lines[n][c] += word
		}
	}
	return lines
}

func (p *Printer) write(s string) {
	if p.err == nil {
		_, p.err = io.WriteString(p.w, s)
	}
}

func (p *Printer) plain(s string) string {
	if p.utf8 {
		return s
	}
	return ASCII(s)
}

var toASCII = strings.NewReplacer(
	"µ", "u", "μ", "u", "Ω", "ohm", "°C", "degC", "°", " deg", "²", "2", "³", "3", "⁴", "4", "±", "+/-", "×", "x",
	"·", "*", "–", "-", "—", "-", "−", "-", "√", "sqrt", "Δ", "d", "δ", "delta", "η", "eta", "π", "pi", "≤", "<=", "≥", ">=", "≈", "~", "→", "->",
)

// ASCII replaces the signs that the program uses by their ASCII forms, as
// pipes and files get them.
func ASCII(s string) string { return toASCII.Replace(s) }

// JSON writes v indented, with a final newline and without HTML escapes. A NaN
// or an infinity anywhere in v is an error, never output.
func JSON(w io.Writer, v any) error {
	e := json.NewEncoder(w)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	return e.Encode(v)
}
