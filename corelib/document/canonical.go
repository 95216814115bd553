package document

import (
	"bytes"
	"encoding/json"
	"reflect"
	"strconv"
)

// Canonical writes the struct v as JSON that depends on its meaning alone: keys
// of the description in alphabetic order, SI numbers with 9 significant digits,
// nothing for what is zero, empty or nil. It is what a hash is taken of. The
// numbers must be finite.
func Canonical(v any) []byte {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	if err := e.Encode(canonical(reflect.ValueOf(v))); err != nil {
		panic("document: " + err.Error()) // a number that is not finite
	}
	return bytes.TrimSpace(b.Bytes())
}

// canonical returns nil for what is left out.
func canonical(v reflect.Value) any {
	switch v.Kind() {
	case reflect.Pointer:
		if v.IsNil() {
			return nil
		}
		if v.Elem().IsZero() {
			return map[string]any{} // there, though nothing in it is above zero
		}
		return canonical(v.Elem())
	case reflect.Struct:
		s := describe(v.Type())
		if s.scalar != nil && !v.Field(s.scalar.index).IsZero() {
			return canonical(v.Field(s.scalar.index))
		}
		object := map[string]any{} // encoding/json sorts the keys
		for i := range s.fields {
			if value := canonical(s.fields[i].of(v)); value != nil {
				object[s.fields[i].key] = value
			}
		}
		if len(object) == 0 {
			return nil
		}
		return object
	case reflect.Slice, reflect.Array:
		var list []any
		for i := range v.Len() {
			item := canonical(v.Index(i))
			if item == nil {
				item = 0
			}
			list = append(list, item)
		}
		if list == nil || v.IsZero() {
			return nil
		}
		return list
	case reflect.Float64:
		if v.Float() == 0 {
			return nil
		}
		return json.Number(strconv.FormatFloat(v.Float(), 'g', 9, 64))
	}
	if v.IsZero() {
		return nil
	}
	return v.Interface()
}
