package table

import (
	"errors"
	"slices"
	"strings"
	"testing"
)

func TestRead(t *testing.T) {
	f, err := Read("x.csv", strings.NewReader("\ufeff# source: a list\r\nname, d [um] ,count,share [%]\r\n# in between\r\n\"A, b\",71,3,5\r\nC,,,\r\n"),
		Column{Name: "name", Required: true}, Column{Name: "d", Unit: "m"}, Column{Name: "count"}, Column{Name: "share", Unit: "1"}, Column{Name: "absent"})
	if err != nil {
		t.Fatal(err)
	}
	if len(f.Rows) != 2 {
		t.Fatalf("%d rows, want 2", len(f.Rows))
	}
	r := f.Rows[0]
	d, ok := r.Number("d")
	if r.Text("name") != "A, b" || d != 71e-6 || !ok || r.Count("count") != 3 || r.Positive("share") != 0.05 || r.Line() != 4 {
		t.Errorf("first row: %q, d = %g, count %d", r.fields, d, r.Count("count"))
	}
	if _, ok := f.Rows[1].Number("d"); ok || f.Rows[1].Text("absent") != "" || f.Rows[1].Count("count") != 0 {
		t.Error("empty cells do not read as empty")
	}
	if err := f.Err(); err != nil {
		t.Error(err)
	}
}

func TestReadFails(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"", "x.csv:1:1: no header line"},
		{"# only a comment\n", "no header line"},
		{"name,d [mm],colour\n", `x.csv:1:13: unknown column "colour"; nearest: `},
		{"name,d [mm],d [um]\n", `x.csv:1:13: column "d" appears twice`},
		{"name,d\n", `x.csv:1:6: column "d" needs a unit; write "d [mm]"`},
		{"name,d [kg]\n", `column "d" is in "kg"; write one of mm, um, cm, m`},
		{"name [mm],d [mm]\n", `column "name" has no unit, found [mm]`},
		{"d [mm]\n", `x.csv:1:1: column "name" is missing`},
		{"name;d [mm]\nA;1\n", "separated by semicolons"},
		{"name,d [mm]\nA\n", "x.csv:2:1: 1 fields, but the header has 2"},
		{"name,d [mm]\nA,\"1\n", "x.csv:"},
	} {
		_, err := Read("x.csv", strings.NewReader(c.text), Column{Name: "name", Required: true}, Column{Name: "d", Unit: "m"})
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%q: got %v, want %s", c.text, err, c.want)
		}
		if e, ok := errors.AsType[*Error](err); !ok {
			t.Errorf("%q: %v has no position", c.text, err)
		} else if file, line, column := e.Position(); file != "x.csv" || line < 1 || column < 1 {
			t.Errorf("%q: position %s:%d:%d", c.text, file, line, column)
		}
	}
}

func TestCells(t *testing.T) {
	f, err := Read("x.csv", strings.NewReader("name,d [mm]\nA,\"0,5\"\n,nan\nB,1_000\nC,0x10\nD,-1\nE,1e999\nF,0\nG,\n"),
		Column{Name: "name"}, Column{Name: "d", Unit: "m"})
	if err != nil {
		t.Fatal(err)
	}
	for _, r := range f.Rows {
		r.MustText("name")
		r.Positive("d")
	}
	want := []string{
		`x.csv:2:3: d: "0,5" has a decimal comma; write 0.5`,
		`x.csv:3:1: name is empty`,
		`x.csv:3:2: d: "nan" is not a decimal number`,
		`x.csv:4:3: d: "1_000" is not a decimal number`,
		`x.csv:5:3: d: "0x10" is not a decimal number`,
		`x.csv:6:3: d: -1 is not above zero`,
		`x.csv:7:3: d: "1e999" is out of range`,
		`x.csv:8:3: d: 0 is not above zero`,
		`x.csv:9:3: d is empty`,
	}
	if got := strings.Split(f.Err().Error(), "\n"); !slices.Equal(got, want) {
		t.Errorf("got\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(want, "\n"))
	}
}

func TestNearest(t *testing.T) {
	names := []string{"E 42/21/15", "E 42/21/20", "ETD 39/20/13", "ETD 44/22/15", "RM 8", "EP 13"}
	for name, want := range map[string][]string{
		"ETD39":       {"ETD 39/20/13"},
		"etd 38":      {"ETD 39/20/13"},
		"E42":         {"E 42/21/15", "E 42/21/20"},
		"rm9":         {"RM 8"},
		"ep-31":       {"EP 13"},
		"E 42/21/151": {"E 42/21/15"},
	} {
		if got := Nearest(name, names, 3); !slices.Equal(got, want) {
			t.Errorf("Nearest(%q) = %q, want %q", name, got, want)
		}
	}
	if got := Nearest("x", nil, 3); len(got) != 0 {
		t.Errorf("Nearest without names = %q", got)
	}
}

func FuzzRead(f *testing.F) {
	f.Add("name,d [mm]\nA,1\n")
	f.Add("# x\n\"name\",\"d [um]\"\n")
	f.Fuzz(func(t *testing.T, text string) {
		file, err := Read("x.csv", strings.NewReader(text), Column{Name: "name"}, Column{Name: "d", Unit: "m"})
		if err != nil {
			return
		}
		for _, r := range file.Rows {
			if v, ok := r.Number("d"); ok && v != v {
				t.Errorf("NaN out of %q", text)
			}
		}
		_ = file.Err()
	})
}
