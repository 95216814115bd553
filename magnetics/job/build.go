package job

import (
	"errors"
	"fmt"
	"strings"

	"gapwright/corelib/document"
	"gapwright/corelib/quantity"
	"gapwright/corelib/wire"
	"gapwright/magnetics/part"
	"gapwright/magnetics/winding"
)

// ReadBuild reads and checks a build file. Everything that is wrong comes at
// once, in file order, as joined *document.Errors. Wires have the figures of
// the shipped tables; whoever loads the user's own rows applies them.
func ReadBuild(name string, data []byte) (BuildFile, error) {
	var d buildDocument
	rec := document.Read(name, data, &d)
	if rec.Set("tank") && rec.Set("corners") {
		return BuildFile{}, rec.At("tank", "this is a job, not a build file; give it to a command that takes a JOB, such as design")
	}
	checkFormat(d.Format, rec)
	if rec.Set("job") {
		check(&d.Job, rec.Under("job"))
	}
	b := BuildFile{MadeWith: d.MadeWith, record: rec}
	if rec.Set("transformer") && rec.Valid("transformer") {
		m := mapper{rec.Under("transformer")}
		b.Transformer = part.Transformer{
			Construction:    m.construction(&d.Transformer.construction, d.Transformer.Tests),
			OpenInductance:  m.requirement(d.Transformer.Meets.OpenInductance),
			ShortInductance: m.requirement(d.Transformer.Meets.ShortInductance),
		}
		if w := b.Transformer.Windings; m.rec.Set("windings") && len(w) == 1 {
			m.rec.Fault("windings", "a transformer has a primary and at least one secondary; write both")
		}
	}
	if d.Inductor != nil && rec.Valid("inductor") {
		m := mapper{rec.Under("inductor")}
		b.Inductor = &part.Inductor{
			Construction: m.construction(&d.Inductor.construction, d.Inductor.Tests),
			Inductance:   m.requirement(d.Inductor.Meets.Inductance),
		}
		if w := b.Inductor.Windings; len(w) > 1 {
			m.rec.Fault("windings[1]", "an inductor has one winding; leave this one out")
		}
	}
	if err := rec.Err(); err != nil {
		return BuildFile{}, err
	}
	b.Job = d.Job.job(rec.Under("job"))
	return b, nil
}

// Fault returns an input error at path, such as "transformer.core.shape", with
// file, line and column, for what only the tables can tell.
func (b BuildFile) Fault(path, format string, args ...any) error {
	if b.record == nil {
		return document.Nowhere(path, format, args...)
	}
	return b.record.At(path, format, args...)
}

// WriteBuild writes a build file that ReadBuild reads back as the same. Numbers
// are exact; round them before, where the shop cannot set more digits. An error
// means that b could not be read back, which is a mistake in b.
func WriteBuild(b BuildFile) ([]byte, error) {
	d := buildDocument{Format: Format, MadeWith: b.MadeWith, Job: b.Job.file()}
	var err error
	if d.Transformer.construction, d.Transformer.Tests, err = unmap(b.Transformer.Construction); err != nil {
		return nil, err
	}
	d.Transformer.Meets = transformerMeets{requirement(b.Transformer.OpenInductance), requirement(b.Transformer.ShortInductance)}
	if b.Inductor != nil {
		d.Inductor = new(inductorFile)
		if d.Inductor.construction, d.Inductor.Tests, err = unmap(b.Inductor.Construction); err != nil {
			return nil, err
		}
		d.Inductor.Meets = inductorMeets{requirement(b.Inductor.Inductance)}
	}
	style := document.Style{Head: buildHead, Comment: buildComment}
	if b.Job.record != nil {
		style.Record = b.Job.record.Mount("job")
	}
	data, err := document.Write(d, style)
	if err != nil {
		return nil, fmt.Errorf("build file: %w", err)
	}
	if _, err := ReadBuild("build.yaml", data); err != nil {
		return nil, fmt.Errorf("build file: not readable as written: %w", err)
	}
	return data, nil
}

const buildHead = `What was decided, and nothing that can be computed from it. Edit it by hand and
run "gapwright check" on it: the edited parts are rated again under the job below.
Lists run from the innermost outward, in the order of work. Sizes in mm.`

func buildComment(path string) string {
	section, key, _ := strings.Cut(path, ".")
	switch {
	case path == "made_with":
		return "for information only"
	case path == "job":
		return "the job that the parts were designed for; its limits stay in force"
	case section == "job":
		return ""
	}
	switch key {
	case "core", "windings":
		return "from the search"
	case "build":
		return "from the search, innermost first"
	case "former":
		return "from the table"
	case "impregnation", "glue", "terminations":
		return "default"
	case "meets":
		return "what the shop must meet; left out: taken from the rating"
	case "tests":
		return "volts as stated by the user"
	}
	return ""
}

// mapper turns a part of the file into the part, and reports what is wrong.
type mapper struct{ rec *document.Record }

func (m mapper) construction(f *construction, tests testsFile) part.Construction {
	c := part.Construction{
		Core: part.Core{
			Shape: f.Core.Shape, Material: f.Core.Material, Pieces: orOne(f.Core.Pieces, 2), Clamping: orWord(f.Core.Clamping, "clip"),
			Gap: m.gap(f.Core.Gap),
		},
		Former: part.Former{
			Name: f.Former.Name, Chambers: orOne(f.Former.Chambers, 1), Pins: f.Former.Pins,
			Mounting: f.Former.Mounting, Wall: f.Former.Wall, PinsCut: f.Former.PinsCut,
		},
		Impregnation: part.Impregnation{Kind: f.Impregnation.Kind, When: f.Impregnation.When},
		Glue:         part.Glue(f.Glue),
		Terminations: part.Terminations(f.Terminations),
		Tests:        m.tests(tests),
	}
	for i, w := range f.Windings {
		c.Windings = append(c.Windings, part.Winding(w))
		for _, list := range []struct {
			key   string
			names []string
		}{{"start", w.Start}, {"finish", w.Finish}} {
			for _, name := range list.names {
				if isNumber(name) {
					m.rec.Fault(path("windings", i, list.key), "%s is a bare number; write pin %s", name, name)
				}
			}
		}
	}
	for i := range f.Build {
		c.Build = append(c.Build, m.entry(&f.Build[i], i))
	}
	m.turns(c)
	return c
}

func orOne(n, usual int) int {
	if n == 0 {
		return usual
	}
	return n
}

func orWord(word, usual string) string {
	if word == "" {
		return usual
	}
	return word
}

func (m mapper) gap(f gapFile) part.Gap {
	g := part.Gap{
		Kind: part.GapKind(f.Kind), Total: f.Total, Pieces: f.Pieces, Positions: f.Positions, Half: f.Half,
		Governs: f.Governs, Thickness: f.Thickness, Foils: f.Foils, Under: f.Under,
	}
	const base = "core.gap."
	only := func(kind string, keys ...string) {
		for _, key := range keys {
			if m.rec.Set(base+key) && f.Kind != kind {
				m.rec.Fault(base+key, "does not belong to a gap of kind %s on line %d; leave it out", f.Kind, m.rec.Line(base+"kind"))
			}
		}
	}
	if !m.rec.Valid(base+"kind") || !m.rec.Set(base+"kind") {
		return g
	}
	only("ground", "total", "pieces", "positions", "half")
	only("spacer", "thickness", "foils", "under")
	switch g.Kind {
	case part.Ground:
		if !m.rec.Set(base + "total") {
			m.rec.Fault("core.gap", "a ground gap needs its length; write total: 0.5 mm")
		}
		g.Pieces = orOne(g.Pieces, 1)
		if len(g.Positions) > 0 && len(g.Positions) != g.Pieces && m.rec.Valid(base+"pieces") && m.rec.Valid(base+"positions") {
			m.rec.Fault(base+"positions", "there are %d positions for %d pieces; write one for each piece", len(g.Positions), g.Pieces)
		}
	case part.Spacer:
		if !m.rec.Set(base + "thickness") {
			m.rec.Fault("core.gap", "a spacer needs its thickness; write thickness: 0.25 mm")
		}
		if m.rec.Set(base+"governs") && g.Governs == "A_L" {
			m.rec.Fault(base+"governs", "A_L cannot govern a gap of kind spacer on line %d; write length", m.rec.Line(base+"kind"))
		}
		sum := 0.0
		for _, t := range g.Foils {
			sum += t
		}
		if len(g.Foils) > 0 && m.rec.Valid(base+"foils") && m.rec.Valid(base+"thickness") && differ(sum, g.Thickness) {
			m.rec.Fault(base+"foils", "the foils add up to %s, not to the thickness %s on line %d; write foils that do",
				quantity.FormatAs(sum, quantity.Meter, "mm", 3), m.rec.Text(base+"thickness"), m.rec.Line(base+"thickness"))
		}
	}
	return g
}

// differ tells whether two lengths differ by more than rounding.
func differ(a, b float64) bool { return max(a-b, b-a) > 1e-9*max(a, b) }

// The keys that belong to each kind of entry, and those it cannot do without.
var (
	entryKeys = map[string]string{
		"wind":   " of turns wire serving parallel layers spread direction lay margins insulated sleeving width leads chamber ",
		"tape":   " layers width overlap purpose chamber ",
		"screen": " width to ends overlap chamber ",
		"space":  " chamber ",
	}
	allEntryKeys = strings.Fields("of turns wire serving parallel layers spread direction lay margins insulated sleeving width overlap purpose leads to ends chamber")
)

func (m mapper) entry(f *entryFile, i int) winding.Entry {
	at := func(key string) string { return path("build", i, key) }
	self := fmt.Sprintf("build[%d]", i)
	var kinds []string
	for _, k := range []string{"wind", "tape", "screen", "space"} {
		if m.rec.Set(at(k)) {
			kinds = append(kinds, k)
		}
	}
	if len(kinds) != 1 {
		if m.rec.Valid(self) {
			m.rec.Fault(self, "entry %d has %s; write exactly one of wind, tape, screen, space", i+1, orWord(strings.Join(kinds, " and "), "none of them"))
		}
		return winding.Entry{}
	}
	kind := kinds[0]
	for _, key := range allEntryKeys {
		if m.rec.Set(at(key)) && !strings.Contains(entryKeys[kind], " "+key+" ") {
			m.rec.Fault(at(key), "does not belong to a %s entry; leave it out", kind)
		}
	}
	e := winding.Entry{Kind: winding.Kind(kind), Chamber: f.Chamber}
	switch e.Kind {
	case winding.Wind:
		m.wind(f, at, &e)
	case winding.Tape:
		e.Thickness, e.Material = m.sheet(f.Tape, at("tape"), "0.056 mm polyester")
		e.TapeLayers, e.Overlap, e.Purpose = orOne(f.Layers, 1), f.Overlap, f.Purpose
		e.Width = m.width(f.Width, at("width"))
	case winding.Screen:
		e.Thickness, e.Material = m.sheet(f.Screen, at("screen"), "0.05 mm copper")
		e.To, e.Ends, e.Overlap = f.To, f.Ends, f.Overlap
		e.ScreenWidth = m.width(f.Width, at("width"))
	case winding.Space:
		e.Height = f.Space
	}
	return e
}

func (m mapper) wind(f *entryFile, at func(string) string, e *winding.Entry) {
	e.Names, e.Of = f.Wind, f.Of
	if len(e.Of) == 0 {
		e.Of = e.Names
	}
	if len(e.Of) != len(e.Names) && m.rec.Valid(at("wind")) && m.rec.Valid(at("of")) {
		m.rec.Fault(at("of"), "names %d windings for %d sections; write one for each", len(e.Of), len(e.Names))
	}
	for _, key := range []string{"turns", "wire"} {
		if !m.rec.Set(at(key)) {
			m.rec.Fault(at("wind"), "has no %s; write %s", key, map[string]string{"turns": "turns: 16", "wire": "wire: 60 x 0.1 mm litz"}[key])
		}
	}
	e.Turns, e.Parallel, e.Layers = f.Turns, orOne(f.Parallel, 1), orOne(f.Layers, 1)
	e.Spread, e.Direction, e.Lay = orWord(f.Spread, "full"), orWord(f.Direction, "cw"), f.Lay
	e.Margins, e.Sleeving = f.Margins, f.Sleeving
	e.Width = m.width(f.Width, at("width"))
	e.Leads = f.Leads.words()
	e.Interleaf = f.Interleaf
	if !m.rec.Set(at("wire")) || !m.rec.Valid(at("wire")) {
		return
	}
	w, err := wire.Parse(f.Wire)
	if err != nil {
		m.rec.Fault(at("wire"), "%s", wireWords(err))
		return
	}
	if m.rec.Set(at("serving")) && m.rec.Valid(at("serving")) {
		if w.Kind != wire.Litz && f.Serving != "none" {
			m.rec.Fault(at("serving"), "%s is no litz wire and has no serving; leave it out", f.Wire)
		} else if s, err := wire.ParseServing(f.Serving); err == nil {
			if w.Serving != wire.NoServing && w.Serving != s {
				m.rec.Fault(at("serving"), "%s contradicts the wire %s; write one of them", f.Serving, f.Wire)
			}
			w.Serving = s
		}
	}
	if f.Insulated == "triple" {
		if w.Kind == wire.Foil {
			m.rec.Fault(at("insulated"), "a foil is not triple-insulated; leave it out")
		}
		w.TripleInsulated = true
		if w.Kind == wire.Solid {
			w.Grade = 0 // the extruded layers take the place of the enamel
		}
	}
	if w.TripleInsulated {
		e.Insulated = "triple"
	}
	if w.Kind != wire.Foil && f.Width != "" {
		m.rec.Fault(at("width"), "only foil has a width; leave it out")
	}
	e.Wire = w
}

func wireWords(err error) string {
	if e, ok := errors.AsType[*wire.SyntaxError](err); ok {
		return fmt.Sprintf("%q: %s; write for example %s", e.Text, e.Problem, e.Nearest)
	}
	return err.Error()
}

// sheet reads "0.056 mm polyester".
func (m mapper) sheet(text, at, example string) (thickness float64, material string) {
	if !m.rec.Valid(at) {
		return 0, ""
	}
	if t, rest, ok := leading(strings.Fields(text), quantity.Meter.Like("mm")); ok && len(rest) > 0 {
		return t, strings.Join(rest, " ")
	}
	m.rec.Fault(at, "%q is not a thickness above 0 and a material; write %s", text, example)
	return 0, ""
}

// width reads "full", or a length.
func (m mapper) width(text, at string) float64 {
	if text == "" || text == "full" || !m.rec.Valid(at) {
		return winding.Full
	}
	w, err := quantity.Parse(text, quantity.Meter.Like("mm"))
	switch {
	case err != nil:
		m.rec.Fault(at, "%v, or full", err)
	case w <= 0:
		m.rec.Fault(at, "%s is not above 0; write a width, or full", text)
	}
	return w
}

const solderedBy = ", soldered "

func (l leadsFile) words() string {
	if l.Material != "" {
		return l.Material + solderedBy + l.Soldered
	}
	return l.Words
}

func leadsOf(words string) leadsFile {
	if material, soldered, ok := strings.Cut(words, solderedBy); ok && material != "" && soldered != "" {
		return leadsFile{Material: material, Soldered: soldered}
	}
	return leadsFile{Words: words}
}

// turns checks that the sections of every winding add up, and that every name
// is known.
func (m mapper) turns(c part.Construction) {
	known := map[string]int{}
	for i, w := range c.Windings {
		if first, ok := known[w.Name]; ok && w.Name != "" {
			m.rec.Fault(path("windings", i, "name"), "%s is the name of the winding on line %d too; write another name", w.Name, m.rec.Line(path("windings", first, "name")))
			continue
		}
		known[w.Name] = i
	}
	sum := map[string]int{}
	places := map[string][]string{}
	sections := map[string]bool{}
	complete := true
	for i, e := range c.Build {
		if e.Kind != winding.Wind {
			complete = complete && m.rec.Valid(fmt.Sprintf("build[%d]", i)) && e.Kind != ""
			continue
		}
		line := fmt.Sprint(m.rec.Line(path("build", i, "wind")))
		complete = complete && m.rec.Valid(path("build", i, "wind")) && m.rec.Valid(path("build", i, "of")) && m.rec.Valid(path("build", i, "turns"))
		if c.Former.Chambers > 0 && e.Chamber > c.Former.Chambers {
			m.rec.Fault(path("build", i, "chamber"), "%d is more than the former's chambers, %d; write one of them", e.Chamber, c.Former.Chambers)
		}
		for k, of := range e.Of {
			if _, ok := known[of]; !ok {
				key := "of"
				if !m.rec.Set(path("build", i, "of")) {
					key = "wind"
				}
				m.rec.Fault(path("build", i, key), "there is no winding %s; write one of %s", of, names(c.Windings))
				complete = false
				continue
			}
			sum[of] += e.Turns
			places[of] = append(places[of], line)
			if k < len(e.Names) {
				if sections[e.Names[k]] {
					m.rec.Fault(path("build", i, "wind"), "%s is wound twice; write another name", e.Names[k])
				}
				sections[e.Names[k]] = true
			}
		}
	}
	if !complete {
		return
	}
	for i, w := range c.Windings {
		at := path("windings", i, "turns")
		if w.Name == "" || !m.rec.Set(at) || !m.rec.Valid(at) {
			continue
		}
		switch {
		case len(places[w.Name]) == 0:
			m.rec.Fault(path("windings", i, "name"), "no entry of build winds %s; write one with of: %s", w.Name, w.Name)
		case sum[w.Name] != w.Turns:
			m.rec.Fault(at, "%s has %d turns, but its entries of build (%s) add up to %d; write the same number in both", w.Name, w.Turns, lineWords(places[w.Name]), sum[w.Name])
		}
		for _, p := range w.Parts {
			if !sections[p] {
				m.rec.Fault(path("windings", i, "parts"), "no entry of build winds %s; write wind: %s there", p, p)
			}
		}
	}
}

func lineWords(lines []string) string {
	if len(lines) == 1 {
		return "line " + lines[0]
	}
	return "lines " + strings.Join(lines, ", ")
}

func names(windings []part.Winding) string {
	var list []string
	for _, w := range windings {
		list = append(list, w.Name)
	}
	return strings.Join(list, ", ")
}

func (m mapper) requirement(f *requirementFile) *part.Requirement {
	if f == nil {
		return nil
	}
	r := &part.Requirement{Value: f.Value, Tolerance: f.Tolerance}
	for _, p := range f.Pins {
		if isNumber(p) {
			p = "pin " + p
		}
		r.Pins = append(r.Pins, p)
	}
	return r
}

func isNumber(s string) bool { return s != "" && strings.Trim(s, "0123456789") == "" }

func requirement(r *part.Requirement) *requirementFile {
	if r == nil {
		return nil
	}
	f := &requirementFile{Value: r.Value, Tolerance: r.Tolerance}
	for _, p := range r.Pins {
		if number, ok := strings.CutPrefix(p, "pin "); ok && isNumber(number) {
			p = number
		}
		f.Pins = append(f.Pins, p)
	}
	return f
}

// Between which parts a test voltage is applied, in the order of the file.
var testRows = []string{"primary_secondary", "primary_core", "secondary_core"}

const byCustomer = "volts by customer"

func (t *testsFile) row(name string) *string {
	switch name {
	case "primary_secondary":
		return &t.PrimarySecondary
	case "primary_core":
		return &t.PrimaryCore
	case "secondary_core":
		return &t.SecondaryCore
	}
	return nil
}

// tests reads "3000 V AC 60 s".
func (m mapper) tests(f testsFile) []part.Test {
	var list []part.Test
	for _, name := range testRows {
		text := *f.row(name)
		if text == "" {
			continue
		}
		t, ok := testOf(text)
		if !ok {
			m.rec.Fault("tests."+name, "%q is not a test; write volts, AC or DC and a time such as 3000 V AC 60 s, or %s", text, byCustomer)
			continue
		}
		t.Between = name
		list = append(list, t)
	}
	return list
}

func testOf(text string) (t part.Test, ok bool) {
	rest, open := strings.CutPrefix(text, byCustomer)
	words := strings.Fields(rest)
	if !open {
		if t.Voltage, words, ok = leading(words, quantity.Volt.Like("V")); !ok {
			return t, false
		}
	}
	if len(words) > 0 && (words[0] == "AC" || words[0] == "DC") {
		t.Kind, words = words[0], words[1:]
	}
	if len(words) > 0 {
		if t.Time, words, ok = leading(words, quantity.Second.Like("s")); !ok {
			return t, false
		}
	}
	return t, len(words) == 0
}

// leading reads a quantity above 0 off the front of words.
func leading(words []string, u quantity.Unit) (x float64, rest []string, ok bool) {
	for n := min(2, len(words)); n > 0; n-- {
		if x, err := quantity.Parse(strings.Join(words[:n], " "), u); err == nil && x > 0 {
			return x, words[n:], true
		}
	}
	return 0, words, false
}

func testText(t part.Test) string {
	words := []string{byCustomer}
	if t.Voltage > 0 {
		words[0] = quantity.Exact(t.Voltage, quantity.Volt.Like("V"))
	}
	if t.Kind != "" {
		words = append(words, t.Kind)
	}
	if t.Time > 0 {
		words = append(words, quantity.Exact(t.Time, quantity.Second.Like("s")))
	}
	return strings.Join(words, " ")
}

// unmap turns a part into its form in the file.
func unmap(c part.Construction) (construction, testsFile, error) {
	g := c.Core.Gap
	f := construction{
		Core: coreFile{
			Shape: c.Core.Shape, Material: c.Core.Material, Pieces: c.Core.Pieces, Clamping: c.Core.Clamping,
			Gap: gapFile{
				Kind: string(g.Kind), Total: g.Total, Pieces: g.Pieces, Positions: g.Positions, Half: g.Half,
				Governs: g.Governs, Thickness: g.Thickness, Foils: g.Foils, Under: g.Under,
			},
		},
		Former:       formerFile(c.Former),
		Impregnation: impregnationFile(c.Impregnation),
		Glue:         glueFile(c.Glue),
		Terminations: endsFile(c.Terminations),
	}
	for _, w := range c.Windings {
		f.Windings = append(f.Windings, windingFile(w))
	}
	for _, e := range c.Build {
		f.Build = append(f.Build, unmapEntry(e))
	}
	var tests testsFile
	for _, t := range c.Tests {
		row := tests.row(t.Between)
		if row == nil {
			return f, tests, fmt.Errorf("build file: a test between %q is none of %s", t.Between, strings.Join(testRows, ", "))
		}
		*row = testText(t)
	}
	return f, tests, nil
}

func unmapEntry(e winding.Entry) entryFile {
	f := entryFile{Chamber: e.Chamber}
	width := func(w float64) string {
		if w == winding.Full {
			return "full"
		}
		return quantity.Exact(w, quantity.Meter.Like("mm"))
	}
	sheet := quantity.Exact(e.Thickness, quantity.Meter.Like("mm")) + " " + e.Material
	switch e.Kind {
	case winding.Wind:
		w := e.Wire
		f.Wind, f.Of, f.Turns = e.Names, e.Of, e.Turns
		f.Parallel, f.Layers, f.Spread, f.Direction, f.Lay = e.Parallel, e.Layers, e.Spread, e.Direction, e.Lay
		f.Margins, f.Insulated, f.Sleeving, f.Leads = e.Margins, e.Insulated, e.Sleeving, leadsOf(e.Leads)
		if w.Kind == wire.Litz {
			f.Serving = w.Serving.String()
			w.Serving = wire.NoServing
			w.TripleInsulated = w.TripleInsulated && e.Insulated == ""
		}
		if w.Kind == wire.Foil {
			f.Width = width(e.Width)
			f.Interleaf = e.Interleaf
		}
		f.Wire = w.String()
	case winding.Tape:
		f.Tape, f.Layers, f.Width, f.Overlap, f.Purpose = sheet, e.TapeLayers, width(e.Width), e.Overlap, e.Purpose
	case winding.Screen:
		f.Screen, f.Width, f.To, f.Ends, f.Overlap = sheet, width(e.ScreenWidth), e.To, e.Ends, e.Overlap
	case winding.Space:
		f.Space = e.Height
	}
	return f
}
