package document

import (
	"bytes"
	"fmt"
	"math"
	"reflect"
	"strconv"
	"strings"
	"unicode"

	"gopkg.in/yaml.v3"

	"gapwright/corelib/quantity"
)

// A Style says how Write writes.
type Style struct {
	Head    string                   // lines above the document, without #
	Record  *Record                  // where the values were read; nil: nowhere
	Comment func(path string) string // beside a key whose line carries no comment of the file it was read from; may be nil
}

// Write writes the struct v as a YAML document: the required keys, those that
// Style.Record has in its document and those that differ from their default.
// Quantities are in the units of the description, exact to the last bit; a text
// that was read and still says the same is kept as it was. A number that is not
// finite is an error.
func Write(v any, style Style) ([]byte, error) {
	w := &writer{style: style}
	value := reflect.ValueOf(v)
	root := w.structure(value, blank(value.Type()), reflect.Value{}, "")
	root.HeadComment = style.Head
	var b bytes.Buffer
	e := yaml.NewEncoder(&b)
	e.SetIndent(2)
	if err := e.Encode(root); err != nil {
		return nil, err
	}
	return b.Bytes(), w.err
}

// Changed returns the paths of the single values and lists of v that rec has in
// its document and that differ from their default.
func Changed(v any, rec *Record) []string {
	w := &writer{style: Style{Record: rec}}
	value := reflect.ValueOf(v)
	w.structure(value, blank(value.Type()), reflect.Value{}, "")
	return w.changed
}

// Fill sets the struct that v points to, to its defaults.
func Fill(v any) {
	value := reflect.ValueOf(v).Elem()
	value.Set(blank(value.Type()))
}

// blank returns a struct of type t with its defaults.
func blank(t reflect.Type) reflect.Value {
	r := &reader{rec: newRecord(""), quiet: true}
	v := reflect.New(t).Elem()
	r.structure(nil, &yaml.Node{}, "", "", v, reflect.Value{}, false)
	return v
}

type writer struct {
	style   Style
	changed []string
	err     error
}

func (w *writer) set(path string) bool { return w.style.Record != nil && w.style.Record.Set(path) }

// structure writes what differs from base. Outer is the struct that holds v.
func (w *writer) structure(v, base, outer reflect.Value, path string) *yaml.Node {
	n := &yaml.Node{Kind: yaml.MappingNode, Tag: "!!map"}
	s := describe(v.Type())
	for i := range s.fields {
		f := &s.fields[i]
		value, def, sub := f.of(v), f.of(base), child(path, f.key)
		switch {
		case f.from:
			def = outer.FieldByName(f.name)
		case len(f.def) > 0 && f.def[0] == '=':
			def = s.find(f.def[1:]).of(v)
		}
		node := w.field(f, value, def, v, sub)
		if node == nil {
			continue
		}
		key := &yaml.Node{Kind: yaml.ScalarNode, Tag: "!!str", Value: f.key}
		w.comment(key, node, sub)
		n.Content = append(n.Content, key, node)
	}
	return n
}

func (w *writer) comment(key, node *yaml.Node, path string) {
	tail := ""
	if rec := w.style.Record; rec != nil {
		if o := rec.log.origins[rec.full(path)]; o != nil {
			tail = o.comment
		}
	}
	if strings.ContainsFunc(tail, func(r rune) bool { return !unicode.IsPrint(r) }) {
		tail = "" // what the library made of several lines is not worth keeping
	}
	if tail == "" && w.style.Comment != nil {
		tail = w.style.Comment(path)
	}
	switch {
	case tail == "":
	case node.Kind == yaml.ScalarNode || node.Style&yaml.FlowStyle != 0:
		node.LineComment = tail
	default:
		key.LineComment = tail
	}
}

// field returns nil when nothing has to be written.
func (w *writer) field(f *field, v, def, holder reflect.Value, path string) *yaml.Node {
	t, pointer := f.base()
	same := reflect.DeepEqual(v.Interface(), def.Interface())
	if w.set(path) && !same && (t.Kind() != reflect.Struct || pointer) {
		w.changed = append(w.changed, path)
	}
	if same && !f.required && !w.set(path) {
		return nil
	}
	if pointer {
		if v.IsNil() {
			return w.nothing(f)
		}
		v = v.Elem()
		def = blankOr(t)
	}
	switch t.Kind() {
	case reflect.Struct:
		s := describe(t)
		if s.scalar != nil {
			if word := v.Field(s.scalar.index); !word.IsZero() {
				if same && !w.set(path) {
					return nil
				}
				return w.scalar(s.scalar, word, path)
			}
		}
		n := w.structure(v, def, holder, path)
		if len(n.Content) == 0 && !f.required && !pointer {
			return nil
		}
		n.Style = f.nodeStyle()
		return n
	case reflect.Slice:
		return w.slice(f, v, path)
	case reflect.Array:
		if f.form == "spread" && v.Index(0).Interface() == v.Index(1).Interface() {
			return w.scalar(f, v.Index(0), path)
		}
		n := &yaml.Node{Kind: yaml.SequenceNode, Tag: "!!seq", Style: yaml.FlowStyle}
		for i := range v.Len() {
			n.Content = append(n.Content, w.scalar(f, v.Index(i), fmt.Sprintf("%s[%d]", path, i)))
		}
		return n
	}
	return w.scalar(f, v, path)
}

func blankOr(t reflect.Type) reflect.Value {
	if t.Kind() == reflect.Struct {
		return blank(t)
	}
	return reflect.Zero(t)
}

// nothing writes the word for a value that is not there.
func (w *writer) nothing(f *field) *yaml.Node {
	switch {
	case f.def == "absent":
		return plain("absent")
	case f.word != "":
		return plain(f.word)
	}
	return nil
}

func (w *writer) slice(f *field, v reflect.Value, path string) *yaml.Node {
	if v.Len() == 0 {
		if f.word != "" {
			return plain(f.word)
		}
		if f.required {
			return nil // an empty list would be refused; let the reader say that it is missing
		}
	}
	n := &yaml.Node{Kind: yaml.SequenceNode, Tag: "!!seq"}
	if v.Type().Elem().Kind() != reflect.Struct {
		n.Style = yaml.FlowStyle
		if f.form == "many" && v.Len() == 1 {
			return w.scalar(f, v.Index(0), path)
		}
		for i := range v.Len() {
			n.Content = append(n.Content, w.scalar(f, v.Index(i), fmt.Sprintf("%s[%d]", path, i)))
		}
		return n
	}
	base := blank(v.Type().Elem())
	for i := range v.Len() {
		place := fmt.Sprintf("%s[%d]", path, i)
		item := w.structure(v.Index(i), base, reflect.Value{}, place)
		item.Style = f.nodeStyle()
		if w.style.Comment != nil {
			item.LineComment = w.style.Comment(place)
		}
		n.Content = append(n.Content, item)
	}
	return n
}

func (f *field) nodeStyle() yaml.Style {
	if f.flow {
		return yaml.FlowStyle
	}
	return 0
}

func plain(text string) *yaml.Node { return &yaml.Node{Kind: yaml.ScalarNode, Value: text} }

func (w *writer) scalar(f *field, v reflect.Value, path string) *yaml.Node {
	switch v.Kind() {
	case reflect.String:
		text := v.String()
		if text == "" && f.def == "absent" {
			return plain("absent")
		}
		if text != "" && strings.Trim(text, "0123456789") == "" {
			return plain(text) // a text key takes digits as they are
		}
		return &yaml.Node{Kind: yaml.ScalarNode, Tag: "!!str", Value: text}
	case reflect.Bool:
		return plain(strconv.FormatBool(v.Bool()))
	case reflect.Int:
		return plain(strconv.FormatInt(v.Int(), 10))
	case reflect.Float64:
		x := v.Float()
		if math.IsNaN(x) || math.IsInf(x, 0) {
			w.err = fmt.Errorf("%s is not finite", path)
			return plain("absent")
		}
		if w.style.Record != nil {
			text := w.style.Record.Text(path)
			full := text
			if f.bare != "" && plainNumber(text) {
				full += " " + f.bare
			}
			if y, err := quantity.Parse(full, f.unit); err == nil && y == x {
				return plain(text)
			}
		}
		return plain(quantity.Exact(x, f.unit))
	}
	panic("document: no way to write " + v.Type().String())
}
