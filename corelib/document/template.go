package document

import (
	"fmt"
	"reflect"
	"slices"
	"strings"
	"unicode/utf8"

	"gopkg.in/yaml.v3"
)

// commentColumn is where the comments of a starter file begin.
const commentColumn = 46

// Template writes a commented starter file for the struct v: required keys and
// examples as they are, everything that has a default as a comment that is made
// active by taking the "# " away. With all set, every key is active.
func Template(v any, head string, all bool) []byte {
	t := &template{all: all}
	for _, line := range strings.Split(strings.TrimRight(head, "\n"), "\n") {
		t.b.WriteString(strings.TrimRight("# "+line, " ") + "\n")
	}
	t.structure(reflect.TypeOf(v), 0)
	return []byte(t.b.String())
}

type template struct {
	b   strings.Builder
	all bool
}

func (t *template) line(indent int, active bool, text, comment string) {
	if !active {
		text = "# " + text
	}
	text = strings.Repeat(" ", indent) + text
	if comment != "" {
		gap := commentColumn - utf8.RuneCountInString(text)
		text += strings.Repeat(" ", max(2, gap)) + "# " + comment
	}
	t.b.WriteString(text + "\n")
}

func (t *template) structure(typ reflect.Type, indent int) {
	for _, f := range describe(typ).fields {
		if f.from {
			continue // the help of the holder says that these may be repeated
		}
		base, pointer := f.base()
		switch {
		case base.Kind() == reflect.Struct && !pointer && !f.hasDef && !f.flow:
			if indent == 0 {
				t.b.WriteString("\n")
			}
			t.line(indent, true, f.key+":", f.help)
			t.structure(base, indent+2)
		case base.Kind() == reflect.Slice && base.Elem().Kind() == reflect.Struct:
			t.b.WriteString("\n")
			t.line(indent, true, f.key+":", f.help)
			for _, entry := range strings.Split(f.example, "\n") {
				t.line(indent+2, true, "- "+entry, "")
			}
			t.entries(base.Elem(), indent+2)
		default:
			t.leaf(&f, indent)
		}
	}
}

// entries explains the keys of a list's entries.
func (t *template) entries(typ reflect.Type, indent int) {
	for _, f := range describe(typ).fields {
		if f.help != "" {
			t.b.WriteString(strings.Repeat(" ", indent) + "# " + f.key + " - " + f.help + "\n")
		}
	}
}

func (t *template) leaf(f *field, indent int) {
	value := f.example
	optional := f.hasDef && (f.def == "absent" || f.def[0] == '=' || value == "")
	if value == "" {
		value = f.suggestion()
	}
	if f.hasDef && f.def == "absent" && f.example == "" {
		value = "absent"
	}
	base, _ := f.base()
	if base.Kind() == reflect.Struct && value == "" {
		value = flowOf(base)
	}
	active := f.required || f.example != "" && !optional || t.all && f.whenKey == ""
	t.line(indent, active, f.key+": "+value, f.comment())
}

// flowOf writes the defaults or examples of a small struct on one line.
func flowOf(t reflect.Type) string {
	var parts []string
	for _, f := range describe(t).fields {
		parts = append(parts, f.key+": "+f.suggestion())
	}
	return "{" + strings.Join(parts, ", ") + "}"
}

// comment is help, legal words and the origin of the default.
func (f *field) comment() string {
	var parts []string
	if f.help != "" {
		parts = append(parts, f.help)
	}
	if len(f.oneof) > 0 && !strings.Contains(f.help, strings.Join(f.oneof, " | ")) {
		parts = append(parts, strings.Join(f.oneof, " | "))
	}
	switch {
	case f.def == "absent":
		parts = append(parts, "absent: "+f.absent)
	case strings.HasPrefix(f.def, "="):
		parts = append(parts, "left out: as "+f.def[1:])
	case f.hasDef && f.example != "":
		parts = append(parts, "left out: "+f.def)
	}
	if f.whenKey != "" {
		parts = append(parts, "with "+f.whenKey+": "+f.whenWord)
	}
	text := strings.Join(parts, "; ")
	if f.mark != "" {
		text = strings.TrimSpace(text + " [" + f.mark + "]")
	}
	return text
}

// Keys returns every key path of the struct v, list entries as "corners[]".
func Keys(v any) []string {
	var all []string
	var walk func(t reflect.Type, path string)
	walk = func(t reflect.Type, path string) {
		for _, f := range describe(t).fields {
			sub := child(path, f.key)
			all = append(all, sub)
			base, _ := f.base()
			if base.Kind() == reflect.Slice && base.Elem().Kind() == reflect.Struct {
				base, sub = base.Elem(), sub+"[]"
			}
			if base.Kind() == reflect.Struct {
				walk(base, sub)
			}
		}
	}
	walk(reflect.TypeOf(v), "")
	return all
}

// KeysIn returns the key paths of a YAML text in the form of Keys.
func KeysIn(data []byte) ([]string, error) {
	root, err := load("", data)
	if err != nil {
		return nil, fmt.Errorf("line %d: %s", err.Line, err.Msg)
	}
	var all []string
	var walk func(n *yaml.Node, path string)
	walk = func(n *yaml.Node, path string) {
		switch n.Kind {
		case yaml.MappingNode:
			for i := 0; i+1 < len(n.Content); i += 2 {
				sub := child(path, n.Content[i].Value)
				all = append(all, sub)
				walk(n.Content[i+1], sub)
			}
		case yaml.SequenceNode:
			for _, c := range n.Content {
				walk(c, path+"[]")
			}
		}
	}
	walk(root, "")
	slices.Sort(all)
	return slices.Compact(all), nil
}
