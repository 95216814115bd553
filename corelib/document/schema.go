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
	defs := node{}
	s := defs.object(reflect.TypeOf(v))
	s["$defs"] = defs
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

// The methods below return schemas that refer to n for what several keys share:
// structs and quantities.

// reference returns a schema for a struct type, defined once.
func (n node) reference(t reflect.Type) node {
	if _, ok := n[t.Name()]; !ok {
		n[t.Name()] = nil // begun
		n[t.Name()] = n.object(t)
	}
	return node{"$ref": "#/$defs/" + t.Name()}
}

func (defs node) object(t reflect.Type) node {
	s := describe(t)
	properties := node{}
	var required []string
	for i := range s.fields {
		f := &s.fields[i]
		properties[f.key] = f.schema(defs)
		if f.required {
			required = append(required, f.key)
		}
	}
	for _, section := range s.sections() {
		d := describe(section.kind)
		for i := range d.fields {
			properties[d.fields[i].key] = d.fields[i].schema(defs)
		}
	}
	n := node{"type": "object", "properties": properties, "additionalProperties": false}
	if required != nil {
		n["required"] = required
	}
	if s.scalar != nil {
		return node{"anyOf": []any{s.scalar.value(s.scalar.kind, defs), n}}
	}
	return n
}

// schema describes one key.
func (f *field) schema(defs node) node {
	t, _ := f.base()
	n := f.value(t, defs)
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
func (f *field) value(t reflect.Type, defs node) node {
	switch t.Kind() {
	case reflect.Struct:
		return defs.reference(t)
	case reflect.Slice:
		items := f.value(t.Elem(), defs)
		list := node{"type": "array", "items": items}
		if f.required {
			list["minItems"] = 1
		}
		if f.form == "many" {
			return node{"anyOf": []any{items, list}}
		}
		return list
	case reflect.Array:
		items := f.value(t.Elem(), defs)
		pair := node{"type": "array", "items": items, "minItems": 2, "maxItems": 2}
		if f.form == "spread" {
			down := f.number(true, defs)
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
	return f.number(f.signed, defs)
}

// number describes a quantity or a plain number.
func (f *field) number(negative bool, defs node) node {
	if f.unit == quantity.Plain {
		if negative {
			return node{"type": "number"}
		}
		if f.zero {
			return node{"type": "number", "minimum": 0}
		}
		return node{"type": "number", "exclusiveMinimum": 0}
	}
	name := strings.ReplaceAll(f.unit.SI(), "/", " per ") // a slash would part the reference
	if negative {
		name += " of any sign"
	}
	n := node{"$ref": "#/$defs/" + strings.NewReplacer(" ", "_", "%", "percent").Replace(name)}
	defs[strings.TrimPrefix(n["$ref"].(string), "#/$defs/")] = f.pattern(negative)
	if f.bare != "" {
		return node{"anyOf": []any{n, node{"type": "number", "exclusiveMinimum": 0}}}
	}
	return n
}

// pattern describes a number with a unit.
func (f *field) pattern(negative bool) node {
	var units []string
	for _, u := range f.unit.Spellings() {
		units = append(units, regexp.QuoteMeta(u))
	}
	slices.SortStableFunc(units, func(a, b string) int { return len(b) - len(a) })
	sign := `\+?`
	if negative {
		sign = `[+-]?`
	}
	return node{"type": "string", "pattern": `^\s*` + sign + `((0|[1-9][0-9]*)(\.[0-9]*)?|\.[0-9]+)([eE][+-]?[0-9]+)?\s*(` + strings.Join(units, "|") + `)\s*$`}
}
