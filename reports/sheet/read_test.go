package sheet

import (
	"archive/zip"
	"bytes"
	"errors"
	"fmt"
	"maps"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"gapwright/magnetics/part"
	"gapwright/reports/figure"

	"github.com/xuri/excelize/v2"
)

// readings returns plausible readings of every measured row, with a fixed
// spread, by key and in the unit of the row.
func readings(s Sheet, seed uint64) map[string]float64 {
	rng := rand.New(rand.NewPCG(seed, 1))
	out := map[string]float64{}
	for _, c := range s.Checks {
		if c.Kind != part.Measured {
			continue
		}
		for i := 1; i <= s.Samples; i++ {
			base := 100.0
			if c.Nominal != nil {
				base = *c.Nominal / c.Scale
			} else if c.Min != nil {
				base = *c.Min / c.Scale * 2
			}
			x := base * (1 + 0.03*rng.NormFloat64())
			out[fmt.Sprintf("%s.S%d", c.ID, i)] = math.Round(x*1e4) / 1e4
		}
	}
	return out
}

// filled writes values into the named cells of a workbook.
func filled(t testing.TB, book []byte, values map[string]any) []byte {
	t.Helper()
	return edited(t, book, func(f *excelize.File) {
		for key, v := range values {
			tab, at := cellOf(t, f, Name(key))
			var err error
			if text, ok := v.(string); ok && strings.HasPrefix(text, "=") {
				err = f.SetCellFormula(tab, at, text)
			} else {
				err = f.SetCellValue(tab, at, v)
			}
			if err != nil {
				t.Fatal(err)
			}
		}
	})
}

func edited(t testing.TB, book []byte, edit func(*excelize.File)) []byte {
	t.Helper()
	f, err := excelize.OpenReader(bytes.NewReader(book))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	edit(f)
	var b bytes.Buffer
	if _, err := f.WriteTo(&b); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func cellOf(t testing.TB, f *excelize.File, name string) (tab, at string) {
	t.Helper()
	for _, n := range f.GetDefinedName() {
		if n.Name == name {
			p, ok := parseReference(n.RefersTo)
			if !ok {
				t.Fatalf("name %s refers to %q", name, n.RefersTo)
			}
			return p.tab, p.at
		}
	}
	t.Fatalf("no cell is named %s", name)
	return "", ""
}

func read(t testing.TB, book []byte, want []part.Check) Filled {
	t.Helper()
	f, err := Read(bytes.NewReader(book), int64(len(book)), want)
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func anyValues(m map[string]float64) map[string]any {
	out := map[string]any{}
	for k, v := range m {
		out[k] = v
	}
	return out
}

// sameReadings holds what was read against what was filled in. The workbook
// keeps 15 digits; the conversion of the unit costs the last one.
func sameReadings(t *testing.T, s Sheet, want map[string]float64, got Filled) {
	t.Helper()
	n := 0
	for _, c := range s.Checks {
		for _, sample := range got.Samples {
			w, ok := want[fmt.Sprintf("%s.S%d", c.ID, sample.Number)]
			g, found := sample.Value(c.ID)
			if ok != found {
				t.Errorf("%s sample %d: filled in %v, read %v", c.ID, sample.Number, ok, found)
				continue
			}
			if ok {
				n++
				if math.Abs(g-w*c.Scale) > 1e-12*math.Abs(w*c.Scale) {
					t.Errorf("%s sample %d = %g, want %g", c.ID, sample.Number, g, w*c.Scale)
				}
			}
		}
	}
	if n != len(want) {
		t.Errorf("%d readings came back, %d were filled in", n, len(want))
	}
	if len(got.Unread) > 0 || len(got.Missing) > 0 {
		t.Errorf("unread %v, missing %v", got.Unread, got.Missing)
	}
}

func TestRoundTrip(t *testing.T) {
	for name, s := range map[string]Sheet{"transformer": transformer(t, false), "comma": transformer(t, true), "inductor": inductor(t)} {
		t.Run(name, func(t *testing.T) {
			want := readings(s, 7)
			values := anyValues(want)
			for _, c := range s.Checks {
				if c.Kind == part.Attribute {
					values[c.ID+".S1"], values[c.ID+".S2"] = "ok", "NOK"
				}
			}
			values["field.operator"] = "=not a formula"[1:]
			values["field.ambient_c"] = 23.5
			values["gap.total_mm"] = 0.65
			got := read(t, filled(t, written(t, s), values), s.Checks)
			if got.Design != s.Hash || got.Part != s.Part || got.Sheet != Hash(s.Hash, s.Checks) {
				t.Errorf("read design %q part %q sheet hash %q", got.Design, got.Part, got.Sheet)
			}
			sameReadings(t, s, want, got)
			for _, c := range s.Checks {
				if c.Kind == part.Attribute && (got.Samples[0].Word(c.ID) != "OK" || got.Samples[1].Word(c.ID) != "NOK") {
					t.Errorf("%s: words %q and %q, want OK and NOK", c.ID, got.Samples[0].Word(c.ID), got.Samples[1].Word(c.ID))
				}
			}
			if a, ok := got.Number("field.ambient_c"); !ok || a != 23.5 {
				t.Errorf("ambient = %v %v", a, ok)
			}
			if got.Field("field.operator") != "not a formula" || got.Field("gap.total_mm") != "0.65" {
				t.Errorf("fields %v", got.Fields)
			}
			// The sheet's own list of rows gives the same readings.
			again := read(t, filled(t, written(t, s), anyValues(want)), nil)
			sameReadings(t, s, want, again)
		})
	}
}

func TestEmptySheetHasNoReadings(t *testing.T) {
	path := filepath.Join(t.TempDir(), "sheet.xlsx")
	if filled, _, err := HasReadings(path); filled || err != nil {
		t.Errorf("a file that is not there: %v %v", filled, err)
	}
	s := transformer(t, false)
	if err := os.WriteFile(path, written(t, s), 0o666); err != nil {
		t.Fatal(err)
	}
	if filled, cells, err := HasReadings(path); filled || err != nil {
		t.Errorf("a sheet as written: %v %v %v", filled, cells, err)
	}
	if err := os.WriteFile(path, filled(t, written(t, s), map[string]any{"field.maker": "someone"}), 0o666); err != nil {
		t.Fatal(err)
	}
	if filled, cells, err := HasReadings(path); !filled || err != nil || len(cells) != 1 || cells[0] != "field.maker" {
		t.Errorf("a sheet with one field: %v %v %v", filled, cells, err)
	}
	if err := os.WriteFile(path, []byte("hello"), 0o666); err != nil {
		t.Fatal(err)
	}
	if _, _, err := HasReadings(path); !errors.Is(err, ErrNotASheet) {
		t.Errorf("a text file: %v", err)
	}
}

// TestRowsMoved fills a sheet in which the shop has inserted rows, and one whose
// names are gone.
func TestRowsMoved(t *testing.T) {
	s := transformer(t, false)
	want := readings(s, 11)
	book := filled(t, written(t, s), anyValues(want))
	t.Run("rows inserted", func(t *testing.T) {
		moved := edited(t, book, func(f *excelize.File) {
			_, at := cellOf(t, f, "E04_S1")
			_, row, _ := excelize.CellNameToCoordinates(at)
			if err := f.InsertRows(TabInspection, row, 2); err != nil {
				t.Fatal(err)
			}
			if err := f.InsertRows(TabInspection, 3, 1); err != nil {
				t.Fatal(err)
			}
		})
		sameReadings(t, s, want, read(t, moved, s.Checks))
	})
	t.Run("names gone", func(t *testing.T) {
		moved := edited(t, book, func(f *excelize.File) {
			for _, n := range f.GetDefinedName() {
				if strings.Contains(n.Name, "_S") || strings.HasPrefix(n.Name, "field_") {
					if err := f.DeleteDefinedName(&excelize.DefinedName{Name: n.Name, Scope: n.Scope}); err != nil {
						t.Fatal(err)
					}
				}
			}
			if err := f.InsertRows(TabInspection, 20, 3); err != nil {
				t.Fatal(err)
			}
			if err := f.InsertCols(TabInspection, "C", 1); err != nil {
				t.Fatal(err)
			}
			if err := f.SetSheetName(TabInspection, "Tests"); err != nil {
				t.Fatal(err)
			}
		})
		got := read(t, moved, s.Checks)
		sameReadings(t, s, want, got)
		if len(got.Remarks) == 0 || got.Remarks[0].Code != "W704" {
			t.Errorf("remarks %v, want W704", got.Remarks)
		}
	})
	t.Run("inspection tab gone", func(t *testing.T) {
		gone := edited(t, book, func(f *excelize.File) {
			if err := f.DeleteSheet(TabInspection); err != nil {
				t.Fatal(err)
			}
		})
		got := read(t, gone, s.Checks)
		if len(got.Samples) > 0 || len(got.Missing) == 0 {
			t.Errorf("%d samples, missing %v; want every reading missing", len(got.Samples), got.Missing)
		}
	})
	t.Run("data tab gone", func(t *testing.T) {
		gone := edited(t, book, func(f *excelize.File) {
			if err := f.DeleteSheet(TabData); err != nil {
				t.Fatal(err)
			}
		})
		got := read(t, gone, s.Checks)
		if got.Design != "" {
			t.Errorf("design hash %q from a sheet without its machine block", got.Design)
		}
		sameReadings(t, s, want, got)
	})
}

func TestTypedTexts(t *testing.T) {
	s := transformer(t, false)
	s.Samples = MaxSamples
	type typed struct {
		cell  any
		want  float64 // in uH; 0: unread
		codes string
		why   string
	}
	cases := []typed{
		{412.5, 412.5, "", ""},
		{"412.5", 412.5, "", ""},
		{"412,5", 412.5, "W701", ""},
		{" 412,5 ", 412.5, "W701", ""},
		{"412.5 uH", 412.5, "W702", ""},
		{"412,5µH", 412.5, "W701 W702", ""},
		{"412,5 μH", 412.5, "W701 W702", ""},
		{"0.4125 mH", 412.5, "W702", ""},
		{"412500 nH", 412.5, "W702", ""},
		{"412,500", 412.5, "W701", ""},
		{"1,234.5", 1234.5, "W701", ""},
		{"1.234,5", 1234.5, "W701", ""},
		{"4.125e2", 412.5, "", ""},
		{"4,125e2", 412.5, "W701", ""},
		{"412,5,1", 0, "", "decimal mark"},
		{"412.5 pF", 0, "", "unit"},
		{"412.5 MH", 0, "", "unit"},
		{"about 412", 0, "", "not a number"},
		{"412-415", 0, "", "not a number"},
		{"> 400", 0, "", "not a number"},
		{"n/a", 0, "", "not a number"},
		{"OK", 0, "", "a number is expected"},
		{"NaN", 0, "", "not a number"},
		{"Inf", 0, "", "not a number"},
		{"0x1p3", 0, "", "not a number"},
		{"-412.5", 0, "", "negative"},
		{"=400+12", 0, "", "formula"},
		{true, 0, "", "number is expected"},
		{0.4125, 0.4125, "W705", ""},
	}
	// As many cases as there are samples on a sheet.
	empty := written(t, s)
	for group := range slices.Chunk(cases, MaxSamples) {
		values := map[string]any{}
		for i, tc := range group {
			values[fmt.Sprintf("E04.S%d", i+1)] = tc.cell
		}
		got := read(t, filled(t, empty, values), s.Checks)
		for i, tc := range group {
			t.Run(fmt.Sprint(tc.cell), func(t *testing.T) {
				key := fmt.Sprintf("E04.S%d", i+1)
				var codes, why []string
				for _, r := range got.Remarks {
					if r.Key == key {
						codes = append(codes, r.Code)
					}
				}
				for _, u := range got.Unread {
					if u.Key == key {
						why = append(why, u.Why)
					}
				}
				value, found := 0.0, false
				for _, x := range got.Samples {
					if x.Number == i+1 {
						value, found = x.Value("E04")
					}
				}
				if strings.Join(codes, " ") != tc.codes {
					t.Errorf("remarks %v, want %q", codes, tc.codes)
				}
				if tc.want == 0 {
					if len(why) != 1 || !strings.Contains(why[0], tc.why) || found {
						t.Errorf("read %g %v, unread because %q; want unread because of %q", value, found, why, tc.why)
					}
					return
				}
				if len(why) > 0 || math.Abs(value/1e-6-tc.want) > 1e-9*tc.want {
					t.Errorf("E04 = %g uH, want %g; unread because %q", value/1e-6, tc.want, why)
				}
			})
		}
	}
}

// TestDates: a spreadsheet that takes 3.5 for the third of May changes the
// format of the cell with it.
func TestDates(t *testing.T) {
	s := inductor(t)
	book := edited(t, written(t, s), func(f *excelize.File) {
		for i, format := range []string{"yyyy-mm-dd", "[$-407]D. MMM", "0.0"} {
			tab, at := cellOf(t, f, fmt.Sprintf("E04_S%d", i+1))
			id, err := f.NewStyle(&excelize.Style{CustomNumFmt: &format})
			if err != nil {
				t.Fatal(err)
			}
			f.SetCellStyle(tab, at, at, id)
			f.SetCellValue(tab, at, 57.5)
		}
	})
	got := read(t, book, s.Checks)
	if len(got.Unread) != 2 || !strings.Contains(got.Unread[1].Why, "date") || len(got.Samples) != 1 || got.Samples[0].Number != 3 {
		t.Errorf("unread %v, samples %v; want S1 and S2 unread as dates, S3 read", got.Unread, got.Samples)
	}
}

// TestCommaThousands pins what decides between 1,234 and 1234.
func TestCommaThousands(t *testing.T) {
	for _, tc := range []struct{ nominal, want float64 }{{1.3, 1.234}, {1300, 1234}, {0, 1.234}} {
		nominal := &tc.nominal
		if tc.nominal == 0 {
			nominal = nil
		}
		v, remarks, err := parseReading("1,234", "uH", nominal)
		if err != nil || v != tc.want || len(remarks) != 1 || remarks[0].Code != "W701" {
			t.Errorf("parseReading(1,234) with nominal %g = %g %v %v, want %g and W701", tc.nominal, v, remarks, err, tc.want)
		}
	}
}

// TestWrittenAsText: a title may look like a formula.
func TestWrittenAsText(t *testing.T) {
	s := transformer(t, false)
	s.Title, s.Owner, s.Contact, s.CreatedBy = `=HYPERLINK("http://x","y")`, "+1-2", "-cmd", "@SUM(A1)"
	s.Assumptions = []string{"=1+1", "bell\x07 and \x00 nul"}
	f, err := excelize.OpenReader(bytes.NewReader(written(t, s)))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	seen := 0
	for _, tab := range []string{TabSheet, TabNotes} {
		rows, err := f.GetRows(tab)
		if err != nil {
			t.Fatal(err)
		}
		for i, row := range rows {
			for j, text := range row {
				for _, want := range []string{s.Title, s.Owner, s.Contact, s.CreatedBy, "=1+1", "bell and  nul"} {
					if text == want {
						seen++
						if fo, _ := f.GetCellFormula(tab, address(j+1, i+1)); fo != "" {
							t.Errorf("%s %s is the formula %q", tab, address(j+1, i+1), fo)
						}
					}
				}
			}
		}
	}
	if seen < 6 {
		t.Errorf("found %d of 6 texts", seen)
	}
}

func TestNamesOfAllYellowCells(t *testing.T) {
	for _, s := range []Sheet{transformer(t, false), inductor(t)} {
		f, err := excelize.OpenReader(bytes.NewReader(written(t, s)))
		if err != nil {
			t.Fatal(err)
		}
		defer f.Close()
		named := map[string]bool{}
		for _, n := range f.GetDefinedName() {
			if p, ok := parseReference(n.RefersTo); ok {
				named[p.tab+p.at] = true
			}
		}
		yellow, locked := 0, 0
		for _, tab := range f.GetSheetList() {
			rows, err := f.GetRows(tab)
			if err != nil {
				t.Fatal(err)
			}
			merged, err := f.GetMergeCells(tab)
			if err != nil {
				t.Fatal(err)
			}
			inside := map[string]bool{}
			for _, m := range merged {
				c0, r0, _ := excelize.CellNameToCoordinates(m.GetStartAxis())
				c1, r1, _ := excelize.CellNameToCoordinates(m.GetEndAxis())
				for c := c0; c <= c1; c++ {
					for r := r0; r <= r1; r++ {
						if c != c0 || r != r0 {
							inside[address(c, r)] = true
						}
					}
				}
			}
			for r := 1; r <= len(rows)+20; r++ {
				for c := 1; c <= 40; c++ {
					at := address(c, r)
					id, err := f.GetCellStyle(tab, at)
					if err != nil || id == 0 || inside[at] {
						continue
					}
					st, err := f.GetStyle(id)
					if err != nil {
						t.Fatal(err)
					}
					open := st.Protection != nil && !st.Protection.Locked
					paint := len(st.Fill.Color) > 0 && strings.HasSuffix(st.Fill.Color[0], fillColours[shop])
					if open != paint {
						t.Errorf("%s %s: open %v, yellow %v", tab, at, open, paint)
					}
					if paint {
						yellow++
						if !named[tab+at] {
							t.Errorf("%s %s is yellow and has no name", tab, at)
						}
					} else {
						locked++
					}
				}
			}
		}
		if yellow < 100 || locked < 500 {
			t.Errorf("%s: %d yellow and %d locked cells", s.Part, yellow, locked)
		}
	}
}

// TestReproducible: the same sheet gives the same cells.
func TestReproducible(t *testing.T) {
	s := transformer(t, false)
	p, err := figure.Schematic("T1", s.Construction)
	if err != nil {
		t.Fatal(err)
	}
	s.Pictures = []figure.Picture{p}
	a, b := parts(t, written(t, s)), parts(t, written(t, s))
	for name, x := range a {
		// The order of entries in the list of content types is the workbook
		// library's own affair.
		if name != "[Content_Types].xml" && !bytes.Equal(x, b[name]) {
			t.Errorf("%s differs between two runs", name)
		}
	}
}

func parts(t testing.TB, book []byte) map[string][]byte {
	t.Helper()
	z, err := zip.NewReader(bytes.NewReader(book), int64(len(book)))
	if err != nil {
		t.Fatal(err)
	}
	out := map[string][]byte{}
	for _, e := range z.File {
		rc, err := e.Open()
		if err != nil {
			t.Fatal(err)
		}
		var b bytes.Buffer
		if _, err := b.ReadFrom(rc); err != nil {
			t.Fatal(err)
		}
		rc.Close()
		out[e.Name] = b.Bytes()
	}
	return out
}

func TestHostileFiles(t *testing.T) {
	other := excelize.NewFile()
	defer other.Close()
	other.SetCellValue("Sheet1", "A1", "ID")
	var foreign bytes.Buffer
	if _, err := other.WriteTo(&foreign); err != nil {
		t.Fatal(err)
	}
	bomb := func(name string, size int) []byte {
		var b bytes.Buffer
		z := zip.NewWriter(&b)
		w, err := z.Create(name)
		if err != nil {
			t.Fatal(err)
		}
		block := make([]byte, 1<<20)
		for range size {
			w.Write(block)
		}
		z.Close()
		return b.Bytes()
	}
	var many bytes.Buffer
	z := zip.NewWriter(&many)
	for i := range maxEntries + 1 {
		z.Create(fmt.Sprint(i))
	}
	z.Close()
	for name, tc := range map[string]struct {
		data []byte
		want string
	}{
		"empty":          {nil, "not an xlsx"},
		"text":           {[]byte("hello, world"), "not an xlsx"},
		"old workbook":   {append([]byte{0xD0, 0xCF, 0x11, 0xE0}, make([]byte, 600)...), "password"},
		"zip of nothing": {bomb("a.txt", 0), "not a winding sheet"},
		"bomb":           {bomb("xl/worksheets/sheet1.xml", 33), "unpacks to more"},
		"many entries":   {many.Bytes(), "parts in the workbook"},
		"other tool":     {foreign.Bytes(), "not a winding sheet"},
		"cut off":        {written(t, inductor(t))[:20000], "not an xlsx"},
	} {
		t.Run(name, func(t *testing.T) {
			_, err := Read(bytes.NewReader(tc.data), int64(len(tc.data)), nil)
			if err == nil || !errors.Is(err, ErrNotASheet) || !strings.Contains(err.Error(), tc.want) {
				t.Errorf("Read = %v, want an error with %q", err, tc.want)
			}
		})
	}
	if _, err := Read(bytes.NewReader(nil), MaxFileSize+1, nil); err == nil || !strings.Contains(err.Error(), "bytes") {
		t.Errorf("an oversize file: %v", err)
	}
	if _, err := ReadFile(t.TempDir(), nil); err == nil {
		t.Error("a folder was read")
	}
}

// TestFarCells: a small file whose rows reach to the last column.
func TestFarCells(t *testing.T) {
	all := parts(t, written(t, inductor(t)))
	var rows bytes.Buffer
	rows.WriteString(`<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><sheetData>`)
	for i := 1; i <= 2000; i++ {
		fmt.Fprintf(&rows, `<row r="%[1]d"><c r="XFD%[1]d"><v>1</v></c></row>`, i)
	}
	rows.WriteString(`</sheetData></worksheet>`)
	for name, data := range map[string][]byte{
		"columns": rows.Bytes(),
		"rows":    []byte(`<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><sheetData><row r="1048576"><c r="A1048576"/></row></sheetData></worksheet>`),
	} {
		var b bytes.Buffer
		z := zip.NewWriter(&b)
		for n, d := range all {
			if n == "xl/worksheets/sheet3.xml" {
				d = data
			}
			w, _ := z.Create(n)
			w.Write(d)
		}
		z.Close()
		if _, err := Read(bytes.NewReader(b.Bytes()), int64(b.Len()), nil); !errors.Is(err, ErrNotASheet) || !strings.Contains(err.Error(), "far outside") {
			t.Errorf("%s: Read = %v, want a refusal", name, err)
		}
	}
}

// TestLyingSizes: the directory of the archive understates what it unpacks to.
func TestLyingSizes(t *testing.T) {
	var b bytes.Buffer
	z := zip.NewWriter(&b)
	w, _ := z.Create("xl/workbook.xml")
	w.Write(make([]byte, 5<<20))
	z.Close()
	data := b.Bytes()
	// The uncompressed size stands in the central directory at offset 24.
	i := bytes.LastIndex(data, []byte{'P', 'K', 1, 2})
	copy(data[i+24:], []byte{1, 0, 0, 0})
	if _, err := Read(bytes.NewReader(data), int64(len(data)), nil); !errors.Is(err, ErrNotASheet) {
		t.Errorf("Read = %v, want an error", err)
	}
}

func TestWriteRefuses(t *testing.T) {
	for name, change := range map[string]func(*Sheet){
		"no samples":  func(s *Sheet) { s.Samples = 0 },
		"too many":    func(s *Sheet) { s.Samples = MaxSamples + 1 },
		"no rows":     func(s *Sheet) { s.Checks = nil },
		"odd unit":    func(s *Sheet) { s.Checks = []part.Check{{ID: "E99", Unit: "furlong"}} },
		"not finite":  func(s *Sheet) { x := math.NaN(); s.Checks[5].Nominal = &x },
		"inf in cell": func(s *Sheet) { s.Rating.Section.HeightLeft = math.Inf(1) },
	} {
		t.Run(name, func(t *testing.T) {
			s := transformer(t, false)
			change(&s)
			if err := Write(&bytes.Buffer{}, s); err == nil {
				t.Error("written without an error")
			}
		})
	}
	if err := Write(failingWriter{}, transformer(t, false)); err == nil {
		t.Error("a disk that is full gave no error")
	}
}

type failingWriter struct{}

func (failingWriter) Write([]byte) (int, error) { return 0, errors.New("no space left on device") }

// office runs a spreadsheet program without its window, which saves path again
// in a folder of its own. Outside of continuous integration the test is skipped
// where the program is not installed.
func office(t *testing.T, path string) string {
	t.Helper()
	program, err := exec.LookPath("soffice")
	if err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal("soffice is not installed")
		}
		t.Skip("soffice is not installed")
	}
	if testing.Short() {
		t.Skip("starts a spreadsheet program")
	}
	out := t.TempDir()
	cmd := exec.CommandContext(t.Context(), program, "--headless", "--norestore", "-env:UserInstallation=file://"+t.TempDir(), "--convert-to", "xlsx", "--outdir", out, path)
	if text, err := cmd.CombinedOutput(); err != nil {
		t.Fatalf("soffice: %v\n%s", err, text)
	}
	return filepath.Join(out, filepath.Base(path))
}

// TestOffice saves a filled sheet with a spreadsheet program, reads it back, and
// holds the verdicts that the program computed against our own.
func TestOffice(t *testing.T) {
	s := drawn(t, transformer(t, false))
	want := readings(s, 3)
	// One row of each verdict, and some that fail.
	want["E04.S2"] = 500
	want["E09.P.S3"] = 95
	delete(want, "E11.S1")
	for i := 1; i <= s.Samples; i++ {
		delete(want, fmt.Sprintf("E14.S%d", i))
		delete(want, fmt.Sprintf("E15.S%d", i))
	}
	values := anyValues(want)
	values["field.ambient_c"] = 30.0
	values["E01.S1"], values["E01.S2"], values["E12.S1"] = "OK", "nok", "OK"
	path := filepath.Join(t.TempDir(), "sheet.xlsx")
	if err := os.WriteFile(path, filled(t, written(t, s), values), 0o666); err != nil {
		t.Fatal(err)
	}
	saved := office(t, path)
	got, err := ReadFile(saved, s.Checks)
	if err != nil {
		t.Fatal(err)
	}
	sameReadings(t, s, want, got)
	if got.Design != s.Hash {
		t.Errorf("design hash %q", got.Design)
	}

	f, err := excelize.OpenFile(saved, excelize.Options{RawCellValue: true})
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	cols := columnsFor(s.Samples)
	verdicts := Judge(s.Checks, got)
	seen := map[string]int{}
	d := newReader(f)
	for _, v := range verdicts {
		p, _, ok := d.find(TabInspection, v.Check.ID, sampleHead(1))
		if !ok {
			t.Fatalf("%s not found", v.Check.ID)
		}
		_, row, _ := excelize.CellNameToCoordinates(p.at)
		for j, word := range v.Words {
			cell, _ := f.GetCellValue(TabInspection, address(cols.verdict+j, row))
			if cell != word {
				t.Errorf("%s sample %d: the workbook says %q, we say %q", v.Check.ID, j+1, cell, word)
			}
			seen[word]++
		}
		if cell, _ := f.GetCellValue(TabInspection, address(cols.result, row)); cell != v.Result {
			t.Errorf("%s: the workbook's result is %q, ours %q", v.Check.ID, cell, v.Result)
		}
		seen["row "+v.Result]++
		if v.Nominal != nil {
			var off float64
			cell, _ := f.GetCellValue(TabInspection, address(cols.up, row))
			fmt.Sscan(cell, &off)
			if math.Abs(off-*v.Nominal) > 1e-9 {
				t.Errorf("%s: the workbook's mean is off by %q, ours by %g", v.Check.ID, cell, *v.Nominal)
			}
		}
	}
	for _, word := range []string{"PASS", "FAIL", "READ", "", "row PASS", "row FAIL", "row READ", "row OPEN", "row "} {
		if seen[word] == 0 {
			t.Errorf("no %q came up; the test does not show it", word)
		}
	}
	tab, at := cellOf(t, f, "sheet_verdict")
	if cell, _ := f.GetCellValue(tab, at); cell != Overall(verdicts) || cell != "REJECT" {
		t.Errorf("the workbook's verdict is %q, ours %q", cell, Overall(verdicts))
	}
	tab, at = cellOf(t, f, "advice_ground_mm")
	var advice float64
	cell, _ := f.GetCellValue(tab, at)
	fmt.Sscan(cell, &advice)
	for _, v := range verdicts {
		if v.Check.ID == "E04" {
			if w := s.GroundSlope * (1 / *v.Check.Nominal - 1 / *v.Mean) * 1e3; math.Abs(advice-w) > 1e-6*math.Abs(w) {
				t.Errorf("gap advice %g mm, want %g", advice, w)
			}
		}
	}
	for _, tab := range f.GetSheetList() {
		rows, err := f.GetRows(tab)
		if err != nil {
			t.Fatal(err)
		}
		for i, row := range rows {
			for j, text := range row {
				if strings.HasPrefix(text, "#") && len(text) > 2 || strings.HasPrefix(text, "Err:") {
					t.Errorf("%s %s shows %q", tab, address(j+1, i+1), text)
				}
			}
		}
	}
}

// FuzzRead damages the XML inside of a filled workbook, which flipped bits in
// the compressed file would hardly reach. Reading it must end in a result or in
// an error that says so.
func FuzzRead(f *testing.F) {
	s := inductor(f)
	all := parts(f, filled(f, written(f, s), anyValues(readings(s, 5))))
	names := slices.Sorted(maps.Keys(all))
	for seed := range uint64(12) {
		f.Add(seed, []byte(nil))
	}
	f.Add(uint64(0), []byte("PK\x03\x04"))
	f.Fuzz(func(t *testing.T, seed uint64, raw []byte) {
		data := raw
		if len(raw) == 0 {
			rng := rand.New(rand.NewPCG(seed, 2))
			victim := names[rng.IntN(len(names))]
			var b bytes.Buffer
			z := zip.NewWriter(&b)
			for _, n := range names {
				part := all[n]
				if n == victim {
					if part = mangle(rng, bytes.Clone(part)); part == nil {
						continue
					}
				}
				w, err := z.CreateHeader(&zip.FileHeader{Name: n, Method: zip.Store})
				if err != nil {
					t.Fatal(err)
				}
				w.Write(part)
			}
			z.Close()
			data = b.Bytes()
		}
		start := time.Now()
		got, err := Read(bytes.NewReader(data), int64(len(data)), nil)
		if err != nil && (!errors.Is(err, ErrNotASheet) || len(got.Samples) > 0) {
			t.Errorf("seed %d: %v with %d samples", seed, err, len(got.Samples))
		}
		if d := time.Since(start); d > 20*time.Second {
			t.Errorf("seed %d: took %v", seed, d)
		}
	})
}

// FuzzReading: any text is a finite number or an error.
func FuzzReading(f *testing.F) {
	for _, text := range []string{"412,5 uH", "1.234,5", "1 234", "4e2", "-0,5 mH", "5 % ", "\u00a0", "1e999", "١٢"} {
		f.Add(text, "uH", 400.0)
	}
	f.Add("0mH", "H", 1.0) // a unit that no row has
	f.Fuzz(func(t *testing.T, text, unit string, nominal float64) {
		v, _, err := parseReading(text, unit, &nominal)
		if err == nil && (math.IsNaN(v) || math.IsInf(v, 0)) {
			t.Errorf("parseReading(%q, %q) = %g", text, unit, v)
		}
	})
}

func mangle(rng *rand.Rand, data []byte) []byte {
	if len(data) == 0 {
		return data
	}
	switch rng.IntN(6) {
	case 0:
		return nil
	case 1:
		return data[:rng.IntN(len(data))]
	case 2: // a number becomes another
		for range 20 {
			i := rng.IntN(len(data))
			if data[i] >= '0' && data[i] <= '9' {
				data[i] = "-9.e"[rng.IntN(4)]
			}
		}
	case 3: // a piece twice
		i := rng.IntN(len(data))
		j := min(len(data), i+rng.IntN(300))
		return append(append(bytes.Clone(data[:j]), data[i:j]...), data[j:]...)
	case 4: // a piece less
		i := rng.IntN(len(data))
		j := min(len(data), i+rng.IntN(300))
		return append(bytes.Clone(data[:i]), data[j:]...)
	default:
		for range 5 {
			data[rng.IntN(len(data))] = byte(rng.IntN(256))
		}
	}
	return data
}
