// Package document reads and writes YAML documents strictly and completely: a
// document is described by the tags of Go structs, and the reader, the writer,
// the commented starter file and the JSON Schema all follow that one
// description. It is the only importer of the YAML library.
//
// The tags of a field:
//
//	key       the key in the document; "-": no key
//	unit      the symbol of a quantity ("H", "mm", "%"); without it a plain number
//	required  "yes": must be there
//	default   the value when it is not there, as it would be written;
//	          "absent": nil or empty; "=key": the value of that neighbour
//	absent    what absent means, for people; none: "not limited"
//	mark      origin of the default: PUB, CP, MEM or OWN, then its source; none: OWN
//	example   what the starter file shows, and the unit that hints use
//	help      one line for people
//	oneof     the words (or whole numbers) that are legal, separated by |
//	word      a word that stands for the empty list or the nil pointer
//	zero      "ok": may be 0; otherwise numbers must be above 0
//	sign      "any": may be negative and 0
//	most      the largest legal value
//	bare      the unit of a number written without one, where that is legal
//	when      "key=word": the key has a meaning only with that neighbour
//	from      "parent": the default is the field of the same name one level up
//	form      scalar: this field of a struct takes a scalar in place of a mapping
//	          embedded: the keys of this embedded struct are keys of the outer one
//	          flat: as embedded, and the sections of this embedded struct may be left out around their keys
//	          range: [min, max]; spread: +/- one value, or [down, up]; many: one or a list
//	style     "flow": written on one line
//
// In an example of a list of structs, every line is one entry.
//
// Struct fields may be strings, bools, ints, float64s, pointers to these and to
// arrays of two, slices, arrays of two, structs and pointers to structs.
package document

import (
	"fmt"
	"reflect"
	"slices"
	"strconv"
	"strings"
	"sync"

	"gopkg.in/yaml.v3"

	"gapwright/corelib/quantity"
)

// field is the description of one field of a struct.
type field struct {
	index    int
	name     string // of the Go field
	key      string
	kind     reflect.Type
	unit     quantity.Unit
	required bool
	def      string
	node     *yaml.Node // the default as the reader sees it
	hasDef   bool
	mark     string
	example  string
	help     string
	oneof    []string
	word     string
	zero     bool
	signed   bool
	most     string
	bare     string
	absent   string
	whenKey  string
	whenWord string
	from     bool
	form     string
	flow     bool
	section  bool // its keys may also stand directly around it
}

// structure is the description of a struct.
type structure struct {
	fields []field // those with a key
	scalar *field  // takes a scalar in place of the mapping
}

// memo holds the descriptions of types that were asked for before: describe is
// a pure function, and the tags of a job take a millisecond to read.
var memo sync.Map // reflect.Type -> structure

// describe returns the description of t. It is shared and must not be changed.
// A tag that makes no sense is a programmer's mistake and panics.
func describe(t reflect.Type) structure {
	if s, ok := memo.Load(t); ok {
		return s.(structure)
	}
	s := readTags(t)
	memo.Store(t, s)
	return s
}

func readTags(t reflect.Type) structure {
	var s structure
	for i := range t.NumField() {
		sf := t.Field(i)
		tag := func(name string) string { return sf.Tag.Get(name) }
		f := field{
			index: i, name: sf.Name, key: tag("key"), kind: sf.Type,
			required: tag("required") == "yes", mark: tag("mark"), example: tag("example"), help: tag("help"),
			word: tag("word"), zero: tag("zero") == "ok", signed: tag("sign") == "any", most: tag("most"), bare: tag("bare"),
			from: tag("from") == "parent", form: tag("form"), flow: tag("style") == "flow",
		}
		f.def, f.hasDef = sf.Tag.Lookup("default")
		if f.absent = tag("absent"); f.absent == "" {
			f.absent = "not limited"
		}
		if words := tag("oneof"); words != "" {
			f.oneof = strings.Split(words, "|")
		}
		f.whenKey, f.whenWord, _ = strings.Cut(tag("when"), "=")
		f.unit = unitOf(t, sf, f)
		if f.hasDef && f.def != "absent" && !strings.HasPrefix(f.def, "=") {
			f.node = fragment(f.def)
		}
		switch {
		case f.form == "scalar":
			f.key = ""
			s.scalar = &f
		case f.form == "flat" || f.form == "embedded":
			s.fields = append(s.fields, inner(f, describe(sf.Type))...)
		case f.key == "" || f.key == "-":
		default:
			s.fields = append(s.fields, f)
		}
	}
	return s
}

// inner returns the fields of the embedded struct e as fields of the outer one.
func inner(e field, s structure) []field {
	fields := slices.Clone(s.fields)
	for i := range fields {
		fields[i].index = -1 - e.index // reached through the embedded struct
		fields[i].section = e.form == "flat"
	}
	return fields
}

// of returns the field f of the struct v.
func (f *field) of(v reflect.Value) reflect.Value {
	if f.index < 0 {
		return v.Field(-1 - f.index).FieldByName(f.name)
	}
	return v.Field(f.index)
}

func unitOf(t reflect.Type, sf reflect.StructField, f field) quantity.Unit {
	symbol := sf.Tag.Get("unit")
	u, ok := quantity.Lookup(symbol)
	if !ok {
		panic(fmt.Sprintf("document: %s.%s: unit %q is not known", t, sf.Name, symbol))
	}
	if symbol == "" {
		return u
	}
	for _, text := range []string{f.example, f.def} {
		for _, word := range strings.FieldsFunc(text, func(r rune) bool { return strings.ContainsRune("[]{}, ", r) }) {
			if _, err := quantity.Parse("1 "+word, u); err == nil {
				return u.Like(word)
			}
		}
	}
	return u
}

// find returns the field with the given key.
func (s structure) find(key string) *field {
	for i := range s.fields {
		if s.fields[i].key == key {
			return &s.fields[i]
		}
	}
	return nil
}

// keys returns the keys of s in order, with those inside flat sections last.
func (s structure) keys() []string {
	var list []string
	for _, f := range s.fields {
		list = append(list, f.key)
	}
	for _, f := range s.sections() {
		for _, inner := range describe(f.kind).fields {
			list = append(list, inner.key)
		}
	}
	return list
}

// keyWords names the required keys, or the first few when none is.
func (s structure) keyWords() string {
	var required []string
	for _, f := range s.fields {
		if f.required {
			required = append(required, f.key)
		}
	}
	if required != nil {
		return list(required)
	}
	keys := s.keys()
	if len(keys) > 4 {
		keys = append(keys[:4:4], "...")
	}
	return list(keys)
}

// sections returns the fields whose keys may also stand directly in s.
func (s structure) sections() []field {
	var list []field
	for _, f := range s.fields {
		if f.section {
			list = append(list, f)
		}
	}
	return list
}

// base returns what f holds beneath pointers, and whether there was a pointer.
func (f *field) base() (t reflect.Type, pointer bool) {
	if f.kind.Kind() == reflect.Pointer {
		return f.kind.Elem(), true
	}
	return f.kind, false
}

// suggestion is what to write for f when the value itself gives no hint.
func (f *field) suggestion() string {
	for _, text := range []string{f.example, f.def} {
		if text != "" && text != "absent" && !strings.HasPrefix(text, "=") && !strings.Contains(text, "\n") {
			return text
		}
	}
	t, _ := f.base()
	switch {
	case len(f.oneof) > 0:
		return f.oneof[0]
	case t.Kind() == reflect.Float64 && f.unit != quantity.Plain:
		return "1 " + f.unit.Usual()
	}
	return ""
}

// markAndSource splits the mark of a default.
func (f *field) markAndSource() (mark, source string) {
	mark, source, _ = strings.Cut(f.mark, " ")
	if mark == "" {
		mark = "OWN"
	}
	return mark, source
}

func fragment(text string) *yaml.Node {
	var n yaml.Node
	if err := yaml.Unmarshal([]byte(text), &n); err != nil || len(n.Content) != 1 {
		panic(fmt.Sprintf("document: the default %q is not YAML: %v", text, err))
	}
	return n.Content[0]
}

// list joins words for a sentence.
func list(words []string) string { return strings.Join(words, ", ") }

func plainNumber(text string) bool {
	_, err := strconv.ParseFloat(text, 64)
	return err == nil
}

func contains(words []string, word string) bool { return slices.Contains(words, word) }
