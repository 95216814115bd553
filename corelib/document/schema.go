package document

import (
	"encoding/json"
	"reflect"
	"regexp"
	"slices"
	"strings"

	"gapwright/corelib/quantity"
)

// Schema returns the JSON Schema (draft 2020-12) of the struct v, for editors.
// It is a little wider than the reader where the draft has no words for a rule.
func Schema(v any, title string) []byte {
	s := object(reflect.TypeOf(v))
	s["$schema"] = "https://json-schema.org/draft/2020-12/schema"
	s["title"] = title
	var b strings.Builder
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	if err := e.Encode(s); err != nil {
		panic("document: " + err.Error()) // the values are ours
	}
	return []byte(b.String())
}

// node is one object of a schema; encoding/json sorts its keys.
type node map[string]any

func object(t reflect.Type) node {
	s := describe(t)
	properties := node{}
	var required []string
	for i := range s.fields {
		f := &s.fields[i]
		properties[f.key] = f.schema()
		if f.required {
			required = append(required, f.key)
		}
	}
	for _, section := range s.sections() {
		d := describe(section.kind)
		for i := range d.fields {
			properties[d.fields[i].key] = d.fields[i].schema()
		}
	}
	n := node{"type": "object", "properties": properties, "additionalProperties": false}
	if required != nil {
		n["required"] = required
	}
	if s.scalar != nil {
		return node{"anyOf": []any{s.scalar.value(s.scalar.kind), n}}
	}
	return n
}

// schema describes one key.
func (f *field) schema() node {
	t, _ := f.base()
	n := f.value(t)
	var others []any
	if f.def == "absent" {
		others = append(others, node{"const": "absent"})
	}
	if f.word != "" {
		others = append(others, node{"const": f.word})
	}
	if t.Kind() == reflect.Struct && !f.required && f.def != "absent" && f.word == "" {
		others = append(others, node{"type": "null"})
	}
	if others != nil {
		n = node{"anyOf": append([]any{n}, others...)}
	}
	if text := f.comment(); text != "" {
		n["description"] = text
	}
	if f.hasDef && !strings.HasPrefix(f.def, "=") {
		n["default"] = plainValue(f.def)
	}
	if f.example != "" && t.Kind() != reflect.Slice {
		n["examples"] = []any{plainValue(f.example)}
	}
	return n
}

func plainValue(text string) any {
	var v any
	if err := fragment(text).Decode(&v); err != nil {
		panic("document: " + err.Error())
	}
	return v
}

// value describes what may stand behind a key of Go type t.
func (f *field) value(t reflect.Type) node {
	switch t.Kind() {
	case reflect.Struct:
		return object(t)
	case reflect.Slice:
		items := f.value(t.Elem())
		list := node{"type": "array", "items": items}
		if f.required {
			list["minItems"] = 1
		}
		if f.form == "many" {
			return node{"anyOf": []any{items, list}}
		}
		return list
	case reflect.Array:
		items := f.value(t.Elem())
		pair := node{"type": "array", "items": items, "minItems": 2, "maxItems": 2}
		if f.form == "spread" {
			down := f.number(true)
			return node{"anyOf": []any{items, node{"type": "array", "prefixItems": []any{down, items}, "minItems": 2, "maxItems": 2}}}
		}
		return pair
	case reflect.String:
		if len(f.oneof) > 0 {
			return node{"enum": f.oneof}
		}
		return node{"type": []string{"string", "number", "boolean", "null"}} // read as the text it is
	case reflect.Bool:
		return node{"type": "boolean"}
	case reflect.Int:
		if len(f.oneof) > 0 {
			var numbers []any
			for _, w := range f.oneof {
				numbers = append(numbers, plainValue(w))
			}
			return node{"enum": numbers}
		}
		n := node{"type": "integer", "exclusiveMinimum": 0}
		if f.zero {
			n = node{"type": "integer", "minimum": 0}
		}
		return n
	}
	return f.number(f.signed)
}

// number describes a quantity or a plain number.
func (f *field) number(negative bool) node {
	if f.unit == quantity.Plain {
		if negative {
			return node{"type": "number"}
		}
		if f.zero {
			return node{"type": "number", "minimum": 0}
		}
		return node{"type": "number", "exclusiveMinimum": 0}
	}
	var units []string
	for _, u := range f.unit.Spellings() {
		units = append(units, regexp.QuoteMeta(u))
	}
	slices.SortStableFunc(units, func(a, b string) int { return len(b) - len(a) })
	sign := `\+?`
	if negative {
		sign = `[+-]?`
	}
	n := node{"type": "string", "pattern": `^\s*` + sign + `((0|[1-9][0-9]*)(\.[0-9]*)?|\.[0-9]+)([eE][+-]?[0-9]+)?\s*(` + strings.Join(units, "|") + `)\s*$`}
	if f.bare != "" {
		return node{"anyOf": []any{n, node{"type": "number", "exclusiveMinimum": 0}}}
	}
	return n
}
