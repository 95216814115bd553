package wire

import (
	"bytes"
	"embed"
	"errors"
	"fmt"
	"io/fs"
	"path/filepath"
	"slices"
	"sync"

	"gapwright/corelib/table"
)

//go:embed data/round.csv data/usual.csv
var data embed.FS

// A Size is one nominal size of round wire.
type Size struct {
	Diameter    float64    // m
	Series      string     // R20 or R40
	Tolerance   float64    // m, of the bare diameter; 0: not known
	MinIncrease [3]float64 // m, least increase by the enamel of grade 1, 2, 3; 0: not known
	MaxOverall  [3]float64 // m, largest overall diameter of grade 1, 2, 3; 0: not known
	Source      string
}

// Sizes returns the nominal sizes of IEC 60317-0-1 in rising order: of the series
// R20 or R40, which lies between, or all of them for "".
func Sizes(series string) []Size {
	var list []Size
	for _, s := range embedded().sizes {
		if series == "" || s.Series == series {
			list = append(list, s)
		}
	}
	return list
}

// LitzStrands returns the strand diameters that litz is usually made of, in m.
func LitzStrands() []float64 { return slices.Clone(embedded().strands) }

// LitzCounts returns the usual numbers of strands.
func LitzCounts() []int { return slices.Clone(embedded().counts) }

// FoilThicknesses returns the usual thicknesses of copper foil, in m.
func FoilThicknesses() []float64 { return slices.Clone(embedded().foils) }

// TripleInsulatedDiameters returns the usual copper diameters of triple-insulated
// wire, in m.
func TripleInsulatedDiameters() []float64 { return slices.Clone(embedded().triple) }

type tables struct {
	sizes                  []Size
	strands, foils, triple []float64
	counts                 []int
}

var embedded = sync.OnceValue(func() *tables {
	t, err := readEmbedded()
	if err != nil {
		panic("wire: embedded table: " + err.Error()) // the tests read it, so this is a mistake of the build
	}
	return t
})

func readEmbedded() (*tables, error) {
	t := &tables{}
	f, err := open("data/round.csv",
		table.Column{Name: "d", Unit: "m", Required: true},
		table.Column{Name: "series", Required: true},
		table.Column{Name: "tolerance", Unit: "m"},
		table.Column{Name: "min increase grade 1", Unit: "m"},
		table.Column{Name: "min increase grade 2", Unit: "m"},
		table.Column{Name: "min increase grade 3", Unit: "m"},
		table.Column{Name: "max overall grade 1", Unit: "m"},
		table.Column{Name: "max overall grade 2", Unit: "m"},
		table.Column{Name: "max overall grade 3", Unit: "m"},
		table.Column{Name: "source", Required: true})
	if err != nil {
		return nil, err
	}
	for _, row := range f.Rows {
		s := Size{Diameter: row.Positive("d"), Series: row.MustText("series"), Source: row.MustText("source")}
		s.Tolerance, _ = row.Number("tolerance")
		for g := range 3 {
			s.MinIncrease[g], _ = row.Number(fmt.Sprintf("min increase grade %d", g+1))
			s.MaxOverall[g], _ = row.Number(fmt.Sprintf("max overall grade %d", g+1))
		}
		t.sizes = append(t.sizes, s)
	}
	errs := []error{f.Err()}
	f, err = open("data/usual.csv",
		table.Column{Name: "what", Required: true},
		table.Column{Name: "size", Unit: "m", Required: true},
		table.Column{Name: "count", Required: true},
		table.Column{Name: "source", Required: true})
	if err != nil {
		return nil, err
	}
	for _, row := range f.Rows {
		row.MustText("source")
		switch what := row.MustText("what"); what {
		case "litz strand":
			t.strands = append(t.strands, row.Positive("size"))
		case "litz count":
			t.counts = append(t.counts, row.Count("count"))
		case "foil":
			t.foils = append(t.foils, row.Positive("size"))
		case "triple-insulated":
			t.triple = append(t.triple, row.Positive("size"))
		default:
			row.Fail("what", "unknown stock %q", what)
		}
	}
	return t, errors.Join(append(errs, f.Err())...)
}

func open(name string, columns ...table.Column) (*table.File, error) {
	text, err := data.ReadFile(name)
	if err != nil {
		return nil, err
	}
	return table.Read(name, bytes.NewReader(text), columns...)
}

// sameSize is how near a diameter must be to a nominal size to be that size: a
// tenth of the finest step that is printed.
const sameSize = 0.1e-6

// unknownIncrease stands for a least increase that the table lacks (0.018 to
// 0.063 mm): 0.6 of the largest. Neighbouring sizes and the published 0.020 mm
// litz have 0.5 to 0.7.
const unknownIncrease = 0.6

// enamelled returns the least and the largest overall diameter of an enamelled
// wire. A diameter between two nominal sizes takes the increments of the next
// larger R20 size, as the SWG sizes of published charts do (exact from 0.2 mm up,
// up to 2 um off below); above the last size those of the last.
func enamelled(d float64, grade int) (least, most float64) {
	if grade < 1 || grade > 3 {
		return d, d
	}
	s, _ := sizeFor(d, grade)
	g := grade - 1
	increase := s.MaxOverall[g] - s.Diameter
	most = d + increase
	if exactSize(s, d) {
		most = s.MaxOverall[g]
	}
	if s.MinIncrease[g] > 0 {
		return d + s.MinIncrease[g], most
	}
	return d + unknownIncrease*increase, most
}

func exactSize(s Size, d float64) bool { return d >= s.Diameter-sameSize && d <= s.Diameter+sameSize }

// sizeFor returns the row whose enamel a wire has; exact is false when it is that
// of the next larger R20 size.
func sizeFor(d float64, grade int) (s Size, exact bool) {
	sizes := embedded().sizes
	for _, s := range sizes {
		if s.MaxOverall[grade-1] == 0 {
			continue
		}
		if exactSize(s, d) {
			return s, true
		}
		if s.Series == "R20" && s.Diameter > d {
			return s, false
		}
	}
	return sizes[len(sizes)-1], false
}

func enamelSource(d float64, grade int) string {
	if grade < 1 || grade > 3 {
		return "bare"
	}
	s, exact := sizeFor(d, grade)
	if exact {
		return s.Source
	}
	text := fmt.Sprintf("not a nominal size: enamel of the next larger R20 size, %s", millimetres(s.Diameter))
	if d > s.Diameter {
		text = fmt.Sprintf("above the table: enamel of %s", millimetres(s.Diameter))
	}
	return text + " (rule confirmed by published SWG sizes from 0.2 mm up)"
}

// Own is a row of the user's own wires: figures that take the place of the table
// and the rules for exactly this wire.
type Own struct {
	Wire             Wire
	OuterDiameter    float64 // m
	OuterDiameterMax float64 // m
	Resistance       float64 // ohm/m at 20 °C; 0: by the rules
	Source           string
	Note             string
	Origin           string // the user's file
}

// A Table holds the user's own wires. The zero Table has none; the sizes of the
// standards are always there.
type Table struct {
	own []*Own
}

// OwnFile is the file with the user's own wires in a library folder.
const OwnFile = "wires.csv"

// Own returns the user's rows in the order of their files.
func (t *Table) Own() []Own {
	list := make([]Own, len(t.own))
	for i, o := range t.own {
		list[i] = *o
	}
	return list
}

// Parse reads the text of a wire and gives it the figures of the user's row for
// it, if there is one.
func (t *Table) Parse(text string) (Wire, error) {
	w, err := Parse(text)
	if err != nil {
		return Wire{}, err
	}
	return t.Apply(w), nil
}

// Apply returns w with the figures of the user's row for it, if there is one.
func (t *Table) Apply(w Wire) Wire {
	for _, o := range t.own {
		if o.Wire == w.bare() {
			w.Own = o
		}
	}
	return w
}

// With returns the table with the rows of a folder added; the file OwnFile may be
// absent. A row for a wire that an older row describes takes its place. folder is
// how errors and the Origin of the rows name the folder. The error joins every
// mistake, each with file, line and column.
func (t *Table) With(fsys fs.FS, folder string) (*Table, error) {
	next := &Table{own: slices.Clone(t.own)}
	r, err := fsys.Open(OwnFile)
	if errors.Is(err, fs.ErrNotExist) {
		return next, nil
	}
	if err != nil {
		return nil, err
	}
	defer r.Close()
	name := filepath.Join(folder, OwnFile)
	f, err := table.Read(name, r,
		table.Column{Name: "wire", Required: true},
		table.Column{Name: "outer diameter", Unit: "m", Required: true},
		table.Column{Name: "outer diameter max", Unit: "m", Required: true},
		table.Column{Name: "resistance", Unit: "ohm/m"},
		table.Column{Name: "source", Required: true},
		table.Column{Name: "note"})
	if err != nil {
		return nil, err
	}
	seen := map[Wire]int{}
	for _, row := range f.Rows {
		o := &Own{Source: row.MustText("source"), Note: row.Text("note"), Origin: name}
		text := row.MustText("wire")
		if text == "" {
			continue
		}
		w, err := Parse(text)
		if err != nil {
			row.Fail("wire", "%v", err)
			continue
		}
		o.Wire = w
		if line, twice := seen[w]; twice {
			row.Fail("wire", "wire %s appears twice, first in line %d", w, line)
			continue
		}
		seen[w] = row.Line()
		if w.Kind == Foil {
			row.Fail("wire", "a foil has no figures beyond its thickness")
			continue
		}
		o.OuterDiameter = row.Positive("outer diameter")
		o.OuterDiameterMax = row.Positive("outer diameter max")
		if row.Text("resistance") != "" {
			o.Resistance = row.Positive("resistance")
		}
		t.checkOwn(row, o)
		next.own = slices.DeleteFunc(next.own, func(old *Own) bool { return old.Wire == w })
		next.own = append(next.own, o)
	}
	if err := f.Err(); err != nil {
		return nil, err
	}
	return next, nil
}

// checkOwn refuses what cannot be: less room than the copper needs, or a
// resistance of another metal.
func (t *Table) checkOwn(row table.Row, o *Own) {
	if o.OuterDiameter <= 0 || o.OuterDiameterMax <= 0 {
		return
	}
	copper := o.Wire.Diameter
	if o.Wire.Kind == Litz {
		// Circles of equal area cannot fill more than the whole bundle.
		copper = bundleLeast(o.Wire)
	}
	if o.OuterDiameter <= copper {
		row.Fail("outer diameter", "outer diameter %s is not above %s, which the copper alone needs", millimetres(o.OuterDiameter), fmt.Sprintf("%.3f mm", 1e3*copper))
	}
	if o.OuterDiameterMax < o.OuterDiameter {
		row.Fail("outer diameter max", "the largest outer diameter %s is below the nominal one %s", millimetres(o.OuterDiameterMax), millimetres(o.OuterDiameter))
	}
	if o.Resistance > 0 {
		// Tolerances of diameter and twist stay within a fifth; more is a wrong unit or metal.
		if ratio := o.Resistance / o.Wire.ResistancePerLength(ReferenceTemperature); ratio < 0.8 || ratio > 1.25 {
			row.Fail("resistance", "%.4g ohm/m is %.2f times what this copper has; is the unit right?", o.Resistance, ratio)
		}
	}
}
