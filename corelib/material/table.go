package material

import (
	"cmp"
	"embed"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math"
	"path"
	"slices"
	"strings"
	"sync"

	"gapwright/corelib/table"
)

//go:embed data/*.csv
var embedded embed.FS

// Names of the files of a folder of ferrites; each may be missing.
const (
	FerritesFile = "ferrites.csv"
	FiguresFile  = "ferrite-figures.csv"
	LossFile     = "ferrite-loss.csv"
	HeatFile     = "ferrite-heat.csv"
)

// A Table is a set of ferrites. It is not changed after it was made.
type Table struct {
	ferrites []*Ferrite // in the order of the files
	entries  map[string]*entry
	order    []string
}

// An entry is what the files say of one ferrite, before "like" is followed.
type entry struct {
	m       Ferrite
	figures map[string][]Figure
	loss    []LossSet
	hot     []HeatPoint
	column  []HeatPoint
	touched *table.Row // the first row of the topmost folder that speaks of it; mistakes that show up late are put there
}

var builtIn = sync.OnceValue(func() *Table {
	sub, err := fs.Sub(embedded, "data")
	if err == nil {
		var t *Table
		if t, err = new(Table).with(folder(sub), ""); err == nil {
			return t
		}
	}
	panic(fmt.Sprintf("material: embedded tables: %v", err))
})

// Embedded returns the ferrites that the program brings along.
func Embedded() *Table { return builtIn() }

// With returns the table with the rows of a user's folder on top: files
// ferrites.csv, ferrite-figures.csv, ferrite-loss.csv and ferrite-heat.csv, each of
// which may be missing. Loss rows of a ferrite replace all its earlier loss sets, a
// figure replaces the earlier rows of that figure, hot-over-cold rows and column rows
// replace the earlier ones. The name of the folder is used in messages and as origin.
// A folder without any of the files changes nothing. The error holds every mistake
// with file, line and column (table.Error).
func (t *Table) With(fsys fs.FS, name string) (*Table, error) {
	if name == "" {
		name = "."
	}
	return t.with(folder(fsys), name)
}

// WithText is With for files that are not on a disk: their texts by name.
func (t *Table) WithText(files map[string]string, name string) (*Table, error) {
	return t.with(func(file string) (io.ReadCloser, error) {
		text, ok := files[file]
		if !ok {
			return nil, fs.ErrNotExist
		}
		return io.NopCloser(strings.NewReader(text)), nil
	}, name)
}

// An opener opens one file of a folder; fs.ErrNotExist means that it has no rows.
type opener func(file string) (io.ReadCloser, error)

func folder(fsys fs.FS) opener {
	return func(file string) (io.ReadCloser, error) { return fsys.Open(file) }
}

// All returns the ferrites in the order of the tables.
func (t *Table) All() []*Ferrite { return slices.Clone(t.ferrites) }

// Names returns the names in the order of the tables.
func (t *Table) Names() []string {
	names := make([]string, len(t.ferrites))
	for i, m := range t.ferrites {
		names[i] = m.Name
	}
	return names
}

// ErrUnknown means that the table has no ferrite of the name asked for.
var ErrUnknown = errors.New("unknown ferrite")

// Find returns the ferrite of a name; case, blanks and hyphens do not matter. The
// error wraps ErrUnknown and names the nearest and all others.
func (t *Table) Find(name string) (*Ferrite, error) {
	if m := t.find(name); m != nil {
		return m, nil
	}
	return nil, fmt.Errorf("%w %q; nearest: %s (known: %s)", ErrUnknown, name,
		strings.Join(table.Nearest(name, t.Names(), 1), ""), strings.Join(t.Names(), ", "))
}

func (t *Table) find(name string) *Ferrite {
	folded := table.Fold(name)
	for _, m := range t.ferrites {
		if table.Fold(m.Name) == folded {
			return m
		}
	}
	return nil
}

// layer reads one folder on top of copies of the entries below it.
type layer struct {
	source  opener
	name    string // empty: embedded
	entries map[string]*entry
	order   []string
	files   []*table.File
}

func (t *Table) with(source opener, name string) (*Table, error) {
	l := &layer{source: source, name: name, entries: map[string]*entry{}, order: slices.Clone(t.order)}
	for key, e := range t.entries {
		below := *e
		below.touched = nil
		below.figures = make(map[string][]Figure, len(e.figures))
		for kind, rows := range e.figures {
			below.figures[kind] = slices.Clone(rows)
		}
		l.entries[key] = &below
	}
	for _, read := range []func() error{l.readFerrites, l.readFigures, l.readLoss, l.readHeat} {
		if err := read(); err != nil {
			return nil, err
		}
	}
	ferrites := l.resolve()
	var errs []error
	for _, f := range l.files {
		errs = append(errs, f.Err())
	}
	if err := errors.Join(errs...); err != nil {
		return nil, err
	}
	return &Table{ferrites: ferrites, entries: l.entries, order: l.order}, nil
}

// open reads one file of the folder; a missing file has no rows.
func (l *layer) open(name string, columns ...table.Column) ([]table.Row, error) {
	r, err := l.source(name)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	defer r.Close()
	f, err := table.Read(path.Join(l.name, name), r, columns...)
	if err != nil {
		return nil, err
	}
	l.files = append(l.files, f)
	return f.Rows, nil
}

func (l *layer) provenance(r table.Row, file string) Provenance {
	p := Provenance{Source: r.Text("source"), Confidence: r.Text("confidence")}
	if p.Source == "" {
		r.Fail("source", "no source: say where the figures of this row come from")
	}
	if !slices.Contains(Confidences[:], p.Confidence) {
		r.Fail("confidence", "confidence: %q is none of %s", p.Confidence, strings.Join(Confidences[:], ", "))
	}
	if l.name != "" {
		p.Origin = path.Join(l.name, file)
	}
	return p
}

// entry returns the entry that a row of a dependent file belongs to.
func (l *layer) entry(r table.Row) *entry {
	name := r.MustText("name")
	if name == "" {
		return nil
	}
	e, ok := l.entries[table.Fold(name)]
	if !ok {
		r.Fail("name", "ferrite %q has no row in %s; nearest: %s", name, FerritesFile, strings.Join(table.Nearest(name, l.names(), 1), ""))
		return nil
	}
	if e.touched == nil {
		e.touched = &r
	}
	return e
}

func (l *layer) names() []string {
	names := make([]string, len(l.order))
	for i, key := range l.order {
		names[i] = l.entries[key].m.Name
	}
	return names
}

func text(name string) table.Column     { return table.Column{Name: name} }
func required(name string) table.Column { return table.Column{Name: name, Required: true} }

func (l *layer) readFerrites() error {
	rows, err := l.open(FerritesFile, required("name"), text("class"), text("edition"), text("base"), text("use"),
		text("like"), text("note"), required("source"), required("confidence"))
	if err != nil {
		return err
	}
	lines := map[string]int{}
	for _, r := range rows {
		name := r.MustText("name")
		key := table.Fold(name)
		if first, twice := lines[key]; twice {
			r.Fail("name", "ferrite %q stands in line %d already", name, first)
			continue
		}
		lines[key] = r.Line()
		if key == "" {
			continue
		}
		m := Ferrite{Name: name, Class: r.Text("class"), Edition: r.Text("edition"), Base: r.Text("base"), Like: r.Text("like"),
			Note: r.Text("note"), Provenance: l.provenance(r, FerritesFile)}
		if m.Class != "" && m.Edition == "" {
			r.Fail("edition", "class %s without the edition of IEC 61332: the classes changed between editions", m.Class)
		}
		switch r.Text("use") {
		case "default":
		case "on request", "":
			m.OnRequest = true
		default:
			r.Fail("use", "use: %q is neither default nor on request", r.Text("use"))
		}
		e, known := l.entries[key]
		if !known {
			e = &entry{figures: map[string][]Figure{}}
			l.entries[key] = e
			l.order = append(l.order, key)
		}
		e.m, e.touched = m, &r
	}
	return nil
}

// figureUnits are the units of the unit column and what they are worth in SI.
var figureUnits = map[string]struct {
	si    string
	scale float64
}{
	"mT": {"T", 1e-3}, "T": {"T", 1}, "1": {"1", 1}, "": {"1", 1}, "degC": {"degC", 1}, "kg/m3": {"kg/m3", 1},
	"g/cm3": {"kg/m3", 1e3}, "ohm m": {"ohm m", 1}, "W/(m K)": {"W/(m K)", 1},
}

func (l *layer) readFigures() error {
	rows, err := l.open(FiguresFile, required("name"), required("figure"), table.Column{Name: "temperature", Unit: "degC"},
		required("value"), text("low"), text("high"), required("unit"), required("source"), required("confidence"))
	if err != nil {
		return err
	}
	type place struct {
		key, kind string
		t         float64
	}
	lines := map[place]int{}
	fresh := map[place]bool{}
	for _, r := range rows {
		e := l.entry(r)
		kind := r.MustText("figure")
		k := slices.IndexFunc(figureKinds[:], func(f struct {
			name, si string
			required bool
			lo, hi   float64
		}) bool {
			return f.name == kind
		})
		if kind != "" && k < 0 {
			r.Fail("figure", "unknown figure %q; nearest: %s", kind, strings.Join(table.Nearest(kind, kindNames(), 1), ""))
		}
		u, known := figureUnits[r.Text("unit")]
		f := Figure{Kind: kind, Temperature: math.NaN(), SI: u.si, Provenance: l.provenance(r, FiguresFile)}
		at, hasT := r.Number("temperature")
		if hasT {
			f.Temperature = at
		}
		f.Value = r.Positive("value") * u.scale
		f.Low, f.High = f.Value, f.Value
		if v, ok := r.Number("low"); ok {
			f.Low = v * u.scale
		}
		if v, ok := r.Number("high"); ok {
			f.High = v * u.scale
		}
		if e == nil || k < 0 {
			continue
		}
		want := figureKinds[k]
		key := table.Fold(r.Text("name"))
		switch {
		case !known || u.si != want.si:
			r.Fail("unit", "%s in %q; its unit is %s", kind, r.Text("unit"), want.si)
			continue
		case f.Value < want.lo || f.Value > want.hi:
			r.Fail("value", "%s %g %s is outside %g to %g %s, where every ferrite lies", kind, f.Value, want.si, want.lo, want.hi, want.si)
			continue
		case f.Low > f.Value || f.High < f.Value || f.Low <= 0:
			r.Fail("low", "the band %g to %g %s does not hold the value %g %s", f.Low, f.High, want.si, f.Value, want.si)
			continue
		case !hasT && (kind == "saturation" || kind == "permeability"):
			r.Fail("temperature", "%s needs its temperature", kind)
			continue
		}
		here := place{key, kind, at}
		if first, twice := lines[here]; twice {
			r.Fail("figure", "%s of %s at %g °C stands in line %d already", kind, e.m.Name, at, first)
			continue
		}
		lines[here] = r.Line()
		if group := (place{key, kind, 0}); !fresh[group] {
			fresh[group] = true
			e.figures[kind] = nil
		}
		e.figures[kind] = append(e.figures[kind], f)
	}
	return nil
}

func kindNames() []string {
	names := make([]string, len(figureKinds))
	for i, k := range figureKinds {
		names[i] = k.name
	}
	return names
}

func (l *layer) readLoss() error {
	rows, err := l.open(LossFile, LossColumns()...)
	if err != nil {
		return err
	}
	type id struct{ key, set string }
	lines := map[id]int{}
	fresh := map[string]bool{}
	for _, r := range rows {
		e := l.entry(r)
		s := LossSet{ID: r.MustText("set"), Heat: HeatForm(r.Text("heat")), Points: r.Count("points"), Provenance: l.provenance(r, LossFile)}
		s.K, s.Alpha, s.Beta = r.Positive("k"), r.Positive("alpha"), r.Positive("beta")
		s.FMin, s.FMax = r.Positive("f_min"), r.Positive("f_max")
		s.BMin, _ = r.Number("B_min")
		s.BMax, _ = r.Number("B_max")
		s.TRef, _ = r.Number("T_ref")
		if r.Text("T_ref") == "" {
			r.Fail("T_ref", "T_ref is empty: say at which temperature k holds")
		}
		s.TMin, s.TMax = s.TRef, s.TRef
		if v, ok := r.Number("T_min"); ok {
			s.TMin = v
		}
		if v, ok := r.Number("T_max"); ok {
			s.TMax = v
		}
		for i, name := range [3]string{"a0", "a1", "a2"} {
			s.A[i], _ = r.Number(name)
		}
		s.RMS, _ = r.Number("rms")
		s.Worst, _ = r.Number("worst")
		s.Band, _ = r.Number("band")
		if e == nil || s.K <= 0 || s.FMin <= 0 || s.FMax <= 0 {
			continue
		}
		if msg := cmp.Or(s.fault(), s.levelFault()); msg != "" {
			r.Fail("set", "loss set %s: %s", s.ID, msg)
			continue
		}
		key := table.Fold(e.m.Name)
		if first, twice := lines[id{key, s.ID}]; twice {
			r.Fail("set", "loss set %s of %s stands in line %d already", s.ID, e.m.Name, first)
			continue
		}
		lines[id{key, s.ID}] = r.Line()
		if !fresh[key] {
			fresh[key] = true
			e.loss = nil
		}
		e.loss = append(e.loss, s)
	}
	return nil
}

// LossColumns are the columns of the table of loss sets, in the order in which
// LossRow writes them.
func LossColumns() []table.Column {
	kHz := func(name string) table.Column { return table.Column{Name: name, Unit: "Hz", Required: true} }
	mT := func(name string) table.Column { return table.Column{Name: name, Unit: "T"} }
	degC := func(name string) table.Column { return table.Column{Name: name, Unit: "degC"} }
	share := func(name string) table.Column { return table.Column{Name: name, Unit: "1"} }
	return []table.Column{required("name"), required("set"), required("k"), required("alpha"), required("beta"),
		kHz("f_min"), kHz("f_max"), mT("B_min"), mT("B_max"), degC("T_min"), degC("T_max"), {Name: "T_ref", Unit: "degC", Required: true},
		required("heat"), text("a0"), text("a1"), text("a2"), text("points"), share("rms"), share("worst"), share("band"),
		required("source"), required("confidence")}
}

func (l *layer) readHeat() error {
	rows, err := l.open(HeatFile, required("name"), required("kind"), table.Column{Name: "f", Unit: "Hz", Required: true},
		table.Column{Name: "T", Unit: "degC", Required: true}, required("value"), required("source"), required("confidence"))
	if err != nil {
		return err
	}
	fresh := map[string]bool{}
	for _, r := range rows {
		e := l.entry(r)
		p := HeatPoint{F: r.Positive("f"), Value: r.Positive("value"), Provenance: l.provenance(r, HeatFile)}
		var ok bool
		if p.Temperature, ok = r.Number("T"); !ok && r.Text("T") == "" {
			r.Fail("T", "T is empty")
		}
		kind := r.Text("kind")
		if e == nil || p.F <= 0 || p.Value <= 0 {
			continue
		}
		var list *[]HeatPoint
		switch kind {
		case "hot-over-cold":
			list = &e.hot
			if p.Value < 0.05 || p.Value > 5 {
				r.Fail("value", "hot-over-cold ratio %g; ferrites lie between 0.3 and 1.5", p.Value)
			}
		case "column":
			list = &e.column
		default:
			r.Fail("kind", "kind: %q is neither hot-over-cold nor column", kind)
			continue
		}
		if group := table.Fold(e.m.Name) + "/" + kind; !fresh[group] {
			fresh[group] = true
			*list = nil
		}
		*list = append(*list, p)
	}
	return nil
}

// resolve makes the ferrites out of the entries, following "like".
func (l *layer) resolve() []*Ferrite {
	list := make([]*Ferrite, 0, len(l.order))
	for _, key := range l.order {
		e := l.entries[key]
		m := e.m
		chain := l.chain(e)
		if chain == nil {
			continue
		}
		at := firstTouched(chain)
		for _, kind := range figureKinds {
			var rows []Figure
			for _, c := range chain {
				if rows = c.figures[kind.name]; len(rows) > 0 {
					break
				}
			}
			if len(rows) == 0 && kind.required {
				at.Fail("name", "%s has no %s: add a row to %s, or name an existing ferrite in the column like", m.Name, kind.name, FiguresFile)
			}
			rows = slices.Clone(rows)
			slices.SortStableFunc(rows, func(a, b Figure) int { return cmp.Compare(a.Temperature, b.Temperature) })
			m.Figures = append(m.Figures, rows...)
		}
		for _, c := range chain {
			if len(m.Loss) == 0 && len(c.loss) > 0 {
				m.Loss = slices.Clone(c.loss)
			}
			if len(m.Heat.Hot) == 0 {
				m.Heat.Hot = slices.Clone(c.hot)
			}
			if len(m.Heat.Column) == 0 {
				m.Heat.Column = slices.Clone(c.column)
			}
		}
		if err := m.prepare(); err != nil {
			at.Fail("name", "%s: %v", m.Name, err)
			continue
		}
		if sat, curie := m.figures("saturation"), m.figures("curie"); len(sat) > 0 && len(curie) > 0 {
			for i, f := range sat {
				if f.Temperature >= curie[0].Value {
					at.Fail("name", "%s: saturation is given at %g °C, above the Curie temperature %g °C", m.Name, f.Temperature, curie[0].Value)
				}
				if i > 0 && f.Value > sat[i-1].Value {
					at.Fail("name", "%s: saturation rises from %g T at %g °C to %g T at %g °C", m.Name, sat[i-1].Value, sat[i-1].Temperature, f.Value, f.Temperature)
				}
			}
		}
		list = append(list, &m)
	}
	return list
}

// firstTouched returns the row that a mistake in a chain is put down to. A chain
// without a row of the topmost folder was sound before and still is.
func firstTouched(chain []*entry) table.Row {
	for _, e := range chain {
		if e.touched != nil {
			return *e.touched
		}
	}
	return table.Row{}
}

// chain returns the entry and those that stand in for it, nearest first; nil
// when a "like" leads nowhere or in a circle.
func (l *layer) chain(e *entry) []*entry {
	list := []*entry{e}
	for e.m.Like != "" {
		next, ok := l.entries[table.Fold(e.m.Like)]
		if !ok {
			e.touched.Fail("like", "like: unknown ferrite %q; nearest: %s", e.m.Like, strings.Join(table.Nearest(e.m.Like, l.names(), 1), ""))
			return nil
		}
		if slices.Contains(list, next) {
			e.touched.Fail("like", "like: %q leads back to itself", e.m.Like)
			return nil
		}
		list = append(list, next)
		e = next
	}
	return list
}
