package document

import (
	"errors"
	"reflect"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// sample has every form that the tags can describe.
type sample struct {
	Format  int         `key:"format" required:"yes" example:"1"`
	Name    string      `key:"name"`
	Length  float64     `key:"length" unit:"m" required:"yes" example:"2 mm"`
	Ratio   float64     `key:"ratio" zero:"ok" default:"0.5" mark:"CP 0.4..0.6"`
	Most    *float64    `key:"most" unit:"W" default:"absent" example:"5 W"`
	Flag    bool        `key:"flag" default:"true"`
	Word    string      `key:"word" oneof:"red|green" default:"green"`
	Grade   int         `key:"grade" oneof:"1|2" default:"2"`
	Range   [2]int      `key:"range" form:"range" default:"[1, 9]"`
	Spread  [2]float64  `key:"spread" unit:"%" zero:"ok" form:"spread" default:"5 %"`
	Ends    []string    `key:"ends" form:"many"`
	Sizes   []float64   `key:"sizes" unit:"mm" bare:"mm" word:"usual" default:"usual"`
	Wish    wish        `key:"wish" default:"cheap"`
	General section     `key:"general"`
	Special special     `key:"special"`
	Rows    []row       `key:"rows" style:"flow"`
	Extra   *row        `key:"extra" word:"none"`
	Hidden  float64     `key:"-"`
	Other   *[2]float64 `key:"other" unit:"mm" default:"absent"`
}

type wish struct {
	Word   string  `key:"-" form:"scalar" oneof:"cheap|small"`
	Weight float64 `key:"weight" zero:"ok" default:"0"`
}

type section struct {
	Limits limits `key:"limits"`
}

type special struct {
	Own      string `key:"own" default:"yes"`
	sections `form:"flat"`
}

type sections struct {
	General section `key:"general" from:"parent"`
	Depth   limits  `key:"depth"`
}

type limits struct {
	Height float64 `key:"height" unit:"mm" default:"4 mm"`
	Wall   float64 `key:"wall" unit:"mm" default:"=height"`
	Mode   string  `key:"mode" oneof:"a|b" default:"a"`
	Speed  float64 `key:"speed" unit:"m/s" default:"1 m/s" when:"mode=b"`
}

type row struct {
	Key  string  `key:"key" required:"yes" example:"k"`
	Size float64 `key:"size" unit:"mm"`
}

func TestReadForms(t *testing.T) {
	var s sample
	rec := Read("s.yaml", []byte(`
format: 1
name: ~
length: 2 mm
most: 3 W # watts
range: [2, 3]
spread: [-1 %, 2 %]
ends: pin 1
sizes: [0.1, 0.2 mm]
wish: {weight: 2}
special: {height: 7 mm, own: no}
rows: [{key: a}, {key: b, size: 1 mm}]
extra: none
`), &s)
	if err := rec.Err(); err != nil {
		t.Fatal(err)
	}
	three := 3.0
	want := sample{
		Format: 1, Length: 2e-3, Ratio: 0.5, Most: &three, Flag: true, Word: "green", Grade: 2, Range: [2]int{2, 3},
		Spread: [2]float64{0.01, 0.02}, Ends: []string{"pin 1"}, Sizes: []float64{0.1e-3, 0.2e-3}, Wish: wish{Weight: 2},
		General: section{limits{4e-3, 4e-3, "a", 1}},
		Special: special{"no", sections{section{limits{4e-3, 4e-3, "a", 1}}, limits{7e-3, 7e-3, "a", 1}}},
		Rows:    []row{{"a", 0}, {"b", 1e-3}},
	}
	if !reflect.DeepEqual(want, s) {
		t.Errorf("read\n%+v\nwant\n%+v", s, want)
	}
	if file, line, column := rec.Position("rows[1].size"); file != "s.yaml" || line != 12 || column != 27 {
		t.Errorf("rows[1].size is at %s:%d:%d, want s.yaml:12:27", file, line, column)
	}
	if _, line, column := rec.Position("special.depth.height"); line != 11 || column != 11 {
		t.Errorf("special.depth.height is at %d:%d, want 11:11", line, column)
	}
	if _, line, _ := rec.Position("rows[1].key.of.nothing"); line != 12 {
		t.Errorf("what is not there is looked for on line %d, want 12", line)
	}
	if !rec.Set("most") || rec.Set("ratio") || rec.Text("most") != "3 W" || !slices.Equal(rec.Words("range"), []string{"2", "3"}) {
		t.Errorf("Set, Text, Words: %v %v %q %v", rec.Set("most"), rec.Set("ratio"), rec.Text("most"), rec.Words("range"))
	}
	if under := rec.Under("special"); !under.Set("depth.height") || under.Line("depth.height") != 11 {
		t.Error("a view does not find its values")
	}
	if mounted := rec.Mount("job"); !mounted.Set("job.most") || mounted.Set("most") {
		t.Error("a mounted record does not find its values")
	}
	var used []string
	for _, d := range rec.Defaults() {
		used = append(used, d.Path+" "+d.Value+" "+d.Mark+" "+d.Source)
	}
	wantUsed := []string{
		"ratio 0.5 CP 0.4..0.6", "flag true OWN ", "word green OWN ", "grade 2 OWN ",
		"general.limits.height 4 mm OWN ", "general.limits.wall 4 mm OWN ", "general.limits.mode a OWN ",
		"special.depth.wall 7 mm OWN ", "special.depth.mode a OWN ", "other absent OWN ",
	}
	if d := cmp.Diff(wantUsed, used); d != "" {
		t.Errorf("defaults used (-want +got):\n%s", d)
	}
	// Written and read again it is the same, in the words of the file.
	text, err := Write(s, Style{Record: rec})
	if err != nil {
		t.Fatal(err)
	}
	var again sample
	if err := Read("again.yaml", text, &again).Err(); err != nil || !reflect.DeepEqual(s, again) {
		t.Errorf("%v; read again\n%+v\nwant\n%+v\nfrom\n%s", err, again, s, text)
	}
	if !strings.Contains(string(text), "most: 3 W # watts\n") || !strings.Contains(string(text), "sizes: [0.1, 0.2 mm]\n") {
		t.Errorf("words and comments of the file are lost:\n%s", text)
	}
	changed := Changed(s, rec)
	if !slices.Contains(changed, "most") || slices.Contains(changed, "ratio") || slices.Contains(changed, "extra") {
		t.Errorf("changed: %v", changed)
	}
}

func TestReadReportsEverything(t *testing.T) {
	var s sample
	err := Read("s.yaml", []byte(`format: one
lenght: 2 mm
ratio: -1
flag: on
word: blue
grade: 3
range: [9, 1]
spread: [1 %, 2 %, 3 %]
ends: {a: b}
wish: dear
general:
  limits:
    wall: 0 mm
    speed: 2 m/s
rows: [x, {size: 1}]
extra: 5
other: [1 mm]
`), &s).Err()
	want := strings.TrimSpace(`
s.yaml:1:1: format: one is not a plain number; write a number
s.yaml:1:1: length: is missing; write length: 2 mm
s.yaml:2:1: lenght: is not a key here; write length
s.yaml:3:1: ratio: -1 is negative; write 0 or a value above it
s.yaml:4:1: flag: on is neither true nor false; write true or false
s.yaml:5:1: word: blue is none of the words red, green; write one of red, green
s.yaml:6:1: grade: 3 is none of the numbers; write one of 1, 2
s.yaml:7:1: range: min 9 is above max 1; write [min, max]
s.yaml:8:1: spread: is a list of 3; write one value or a pair [down, up]
s.yaml:9:1: ends: is a mapping; write a list
s.yaml:10:1: wish: dear is none of the words cheap, small; write one of cheap, small
s.yaml:13:5: wall: 0 mm is zero; write a value above 0
s.yaml:14:5: speed: has a meaning only with mode: b; leave it out or write that
s.yaml:15:8: rows: entry 1 is a single value; write keys: key
s.yaml:15:11: key: is missing; write key: k
s.yaml:15:12: size: 1 is a bare number; write 1 mm
s.yaml:16:1: extra: is a single value; write keys: key
s.yaml:17:1: other: is a list of 1; write two values`)
	if err == nil {
		t.Fatal("no error")
	}
	if d := cmp.Diff(want, err.Error()); d != "" {
		t.Errorf("(-want +got):\n%s", d)
	}
	many, ok := err.(interface{ Unwrap() []error })
	if !ok || len(many.Unwrap()) != strings.Count(want, "\n")+1 {
		t.Fatalf("the errors are not joined: %T", err)
	}
	for _, e := range many.Unwrap() {
		if located, ok := errors.AsType[*Error](e); !ok || located.File != "s.yaml" || located.Line < 1 || located.Column < 1 {
			t.Errorf("%v has no position", e)
		}
	}
}

func TestBounds(t *testing.T) {
	for name, c := range map[string]struct{ text, want string }{
		"size":        {strings.Repeat("#", MaxSize+1), "the file has 1048577 bytes; at most 1048576 are read"},
		"depth":       {"name: " + strings.Repeat("[", 200) + strings.Repeat("]", 200), "nested more than 32 deep"},
		"flow":        {"name: " + strings.Repeat("{a: ", 20000), "not YAML"},
		"alias loop":  {"format: &a [*a]\n", ""},
		"merge loop":  {"&a {<<: *a, format: 1}\n", ""},
		"control":     {"name: \"\\a\"\n", "holds a line break or a control character"},
		"binary":      {"\x00\x01", "not YAML"},
		"two lines":   {"name: |\n  a\n  b\n", "holds a line break"},
		"complex key": {"? [a, b]\n: 1\n", "a key is a list"},
	} {
		var s sample
		err := Read("s.yaml", []byte(c.text), &s).Err()
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", name, err, c.want)
		}
	}
}

func TestNearest(t *testing.T) {
	words := []string{"frequency_min", "frequency_max", "turns", "kind"}
	for _, c := range [][2]string{
		{"frequency_mim", "frequency_min"}, {"freqency_max", "frequency_max"}, {"trun", ""}, {"turnss", "turns"}, {"tunrs", "turns"},
		{"KIND", "kind"}, {"ikdn", ""}, {"colour", ""}, {strings.Repeat("x", 1000), ""},
	} {
		if got := nearest(c[0], words); got != c[1] {
			t.Errorf("nearest(%q) = %q, want %q", c[0], got, c[1])
		}
	}
	// Distances by hand: a swap of neighbours counts once.
	for _, c := range []struct {
		a, b string
		want int
	}{{"", "", 0}, {"abc", "abc", 0}, {"abc", "", 3}, {"abc", "acb", 1}, {"kitten", "sitting", 3}, {"ab", "xaby", 2}} {
		if got := distance(c.a, c.b); got != c.want {
			t.Errorf("distance(%q, %q) = %d, want %d", c.a, c.b, got, c.want)
		}
	}
}

// A wrong tag is a programmer's mistake.
func TestWrongTagsPanic(t *testing.T) {
	for name, v := range map[string]any{
		"unit": &struct {
			A float64 `key:"a" unit:"furlong"`
		}{},
		"default": &struct {
			A float64 `key:"a" unit:"m" default:"5 V"`
		}{},
		"kind": &struct {
			A chan int `key:"a" default:"1"`
		}{},
	} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("%s: no panic", name)
				}
			}()
			Read("s.yaml", []byte("b: 1"), v)
		}()
	}
}

func FuzzRead(f *testing.F) {
	f.Add([]byte("format: 1\nlength: 2 mm\n"))
	f.Add([]byte("<<: [&a {b: 1}, *a]\nspecial: {height: 1, depth: [], general: {limits: {height: 2 mm}}}\nrows: [{key: !!str a}]"))
	f.Fuzz(func(t *testing.T, data []byte) {
		var s sample
		rec := Read("s.yaml", data, &s)
		if rec.Err() != nil {
			return
		}
		text, err := Write(s, Style{Record: rec})
		if err != nil {
			t.Fatal(err)
		}
		var again sample
		if err := Read("again.yaml", text, &again).Err(); err != nil {
			t.Fatalf("%v\nin\n%s", err, text)
		}
		if !reflect.DeepEqual(s, again) {
			t.Errorf("read\n%+v\nand again\n%+v\nfrom\n%s", s, again, text)
		}
	})
}
