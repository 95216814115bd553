package document

import (
	"errors"
	"fmt"
	"math"
	"reflect"
	"strings"

	"gopkg.in/yaml.v3"

	"gapwright/corelib/quantity"
)

// Read reads the document in data into the struct that into points to. The
// file name is for messages only. Everything that is wrong is in the record at
// once; what could be read is in the struct, and Record.Valid tells which parts
// may be relied on for further checks. The record is never nil.
func Read(file string, data []byte, into any) *Record {
	r := &reader{rec: newRecord(file)}
	v := reflect.ValueOf(into).Elem()
	r.root = v.Type()
	root, err := load(file, data)
	if err != nil {
		r.rec.log.errs = append(r.rec.log.errs, err)
		r.rec.log.bad[""] = true
		return r.rec
	}
	at := root
	if root.Kind != yaml.MappingNode {
		r.fault(at, "", "", "the file holds %s; write keys such as format: 1", kindWords(root))
		return r.rec
	}
	r.structure(root, at, "", "", v, reflect.Value{}, false)
	if r.full != nil { // what follows from the values left out would only confuse
		r.rec.log.errs = []*Error{r.full}
		r.rec.log.bad[""] = true
	}
	return r.rec
}

type reader struct {
	rec     *Record
	root    reflect.Type
	homes   map[string]string // where keys belong; made when the first unknown key is met
	visited int
	full    *Error // maxNodes was passed
	quiet   bool   // reading a default: nothing is remembered
}

// fault reports an error of the field key at node at.
func (r *reader) fault(at *yaml.Node, key, path, format string, args ...any) {
	if r.quiet {
		panic(fmt.Sprintf("document: default of %s: %s", path, fmt.Sprintf(format, args...)))
	}
	r.rec.log.spoil(path)
	r.rec.log.errs = append(r.rec.log.errs, &Error{
		File: r.rec.log.file, Line: max(1, at.Line), Column: max(1, at.Column), Field: key, Msg: fmt.Sprintf(format, args...),
	})
}

// visit counts nodes and follows an alias; nil: the bound is passed.
func (r *reader) visit(n *yaml.Node) *yaml.Node {
	for hops := 0; ; hops++ {
		if r.quiet {
			return n // defaults hold no aliases and cost the file nothing
		}
		if r.visited++; r.visited > maxNodes || hops > maxDepth {
			if r.full == nil {
				r.fault(n, "", "", "aliases repeat more than %d values; write the values out", maxNodes)
				r.full = r.rec.log.errs[len(r.rec.log.errs)-1]
			}
			return nil
		}
		if n.Kind != yaml.AliasNode {
			return n
		}
		n = n.Alias
	}
}

// pair is one key of a mapping with its value.
type pair struct{ key, value *yaml.Node }

// pairs lists the keys of mapping n, those of merge keys last and only where
// the mapping itself does not have them. Doubled keys are reported.
func (r *reader) pairs(n *yaml.Node, path string, depth int) []pair {
	var own, merged []pair
	first := map[string]*yaml.Node{}
	for i := 0; i+1 < len(n.Content); i += 2 {
		k, v := n.Content[i], n.Content[i+1]
		if k.Kind == yaml.ScalarNode && k.Tag == "!!merge" {
			merged = append(merged, r.merge(k, v, path, depth)...)
			continue
		}
		if k = r.visit(k); k == nil {
			return own
		}
		if k.Kind != yaml.ScalarNode {
			r.fault(k, "", path, "a key is %s; write a word", kindWords(k))
			continue
		}
		if before := first[k.Value]; before != nil {
			r.fault(k, k.Value, child(path, k.Value), "is already on line %d; write it once", before.Line)
			continue
		}
		first[k.Value] = k
		own = append(own, pair{k, v})
	}
	for _, p := range merged {
		if first[p.key.Value] == nil {
			first[p.key.Value] = p.key
			own = append(own, p)
		}
	}
	return own
}

func (r *reader) merge(k, v *yaml.Node, path string, depth int) []pair {
	if depth > maxDepth {
		return nil
	}
	n := r.visit(v)
	switch {
	case n == nil:
		return nil
	case n.Kind == yaml.MappingNode:
		return r.pairs(n, path, depth+1)
	case n.Kind == yaml.SequenceNode:
		var all []pair
		for _, c := range n.Content {
			all = append(all, r.merge(k, c, path, depth+1)...)
		}
		return all
	}
	r.fault(k, "<<", path, "merges %s; write an alias of a mapping", kindWords(n))
	return nil
}

// structure reads mapping n (nil: nothing there) into struct v. Overlay keeps
// what v holds already as the defaults. Outer is the struct that holds v.
func (r *reader) structure(n, at *yaml.Node, key, path string, v, outer reflect.Value, overlay bool) {
	s := describe(v.Type())
	nodes := map[string]pair{}
	if n != nil {
		list := r.pairs(n, path, 0)
		list = r.flatten(s, list)
		for _, p := range list {
			if s.find(p.key.Value) == nil {
				r.remember(child(path, p.key.Value), p)
				r.unknown(s, p.key, key, path)
				continue
			}
			nodes[p.key.Value] = p
		}
	}
	for i := range s.fields {
		f := &s.fields[i]
		if p, ok := nodes[f.key]; ok {
			r.remember(child(path, f.key), p)
		}
	}
	for i := range s.fields {
		f := &s.fields[i]
		target, sub := f.of(v), child(path, f.key)
		over := overlay
		if f.from {
			target.Set(outer.FieldByName(f.name))
			over = true
		}
		p, ok := nodes[f.key]
		if ok && f.whenKey != "" {
			if w := s.find(f.whenKey).of(v).String(); w != f.whenWord {
				r.fault(p.key, f.key, sub, "has a meaning only with %s: %s; leave it out or write that", f.whenKey, f.whenWord)
				continue
			}
		}
		if !ok {
			r.missing(f, at, sub, target, v, s, over, n == nil)
			continue
		}
		r.value(p.value, p.key, f, target, v, sub, over)
	}
}

// flatten moves the keys that stand directly in a flat structure into the
// mappings of the sections they belong to.
func (r *reader) flatten(s structure, list []pair) []pair {
	sections := s.sections()
	if len(sections) == 0 {
		return list
	}
	var out []pair
	at := map[string]int{} // place of a section's own pair in out
	moved := map[string][]*yaml.Node{}
	firstKey := map[string]*yaml.Node{}
	for _, p := range list {
		home := ""
		if s.find(p.key.Value) == nil {
			for _, sec := range sections {
				if describe(sec.kind).find(p.key.Value) != nil {
					home = sec.key
				}
			}
		}
		if home == "" {
			at[p.key.Value] = len(out)
			out = append(out, p)
			continue
		}
		moved[home] = append(moved[home], p.key, p.value)
		if firstKey[home] == nil {
			firstKey[home] = p.key
		}
	}
	for _, sec := range sections {
		extra := moved[sec.key]
		if extra == nil {
			continue
		}
		i, ok := at[sec.key]
		if !ok {
			k := *firstKey[sec.key]
			k.Value = sec.key
			out = append(out, pair{&k, &yaml.Node{Kind: yaml.MappingNode, Tag: "!!map", Line: k.Line, Column: k.Column, Content: extra}})
			continue
		}
		n := r.visit(out[i].value)
		if n == nil || n.Kind != yaml.MappingNode {
			if n == nil || n.Tag != "!!null" {
				continue // reported where the section is read
			}
			n = &yaml.Node{Kind: yaml.MappingNode, Tag: "!!map", Line: n.Line, Column: n.Column}
		}
		both := *n
		both.Content = append(append([]*yaml.Node(nil), n.Content...), extra...)
		out[i].value = &both
	}
	return out
}

func (r *reader) unknown(s structure, k *yaml.Node, key, path string) {
	where := "of " + key
	if key == "" {
		where = "here"
	}
	at := child(path, k.Value)
	if home := r.home(k.Value); home != "" {
		r.fault(k, k.Value, at, "is not a key %s; write it under %s", where, home)
		return
	}
	if near := nearest(k.Value, s.keys()); near != "" {
		r.fault(k, k.Value, at, "is not a key %s; write %s", where, near)
		return
	}
	var own []string
	for _, f := range s.fields {
		own = append(own, f.key)
	}
	r.fault(k, k.Value, at, "is not a key %s; write one of %s", where, list(own))
}

// home returns the path of the mapping that a key belongs to, for a key that is
// right in another place of the document.
func (r *reader) home(key string) string {
	if r.homes == nil {
		r.homes = map[string]string{}
		r.settle(r.root, "")
	}
	return r.homes[key]
}

// settle notes the first home of every key at and below t.
func (r *reader) settle(t reflect.Type, path string) {
	s := describe(t)
	for _, f := range s.fields {
		if r.homes[f.key] == "" {
			r.homes[f.key] = path
		}
	}
	for i := range s.fields {
		base, _ := s.fields[i].base()
		if base.Kind() == reflect.Slice {
			base = base.Elem()
		}
		if base.Kind() == reflect.Struct {
			r.settle(base, child(path, s.fields[i].key))
		}
	}
}

// missing handles a key that is not there. Required keys may be missing from an
// optional mapping that is not there itself.
func (r *reader) missing(f *field, at *yaml.Node, path string, target, holder reflect.Value, s structure, overlay, optional bool) {
	switch {
	case overlay:
		t, pointer := f.base()
		if t.Kind() == reflect.Struct && !pointer {
			r.structure(nil, at, f.key, path, target, holder, true)
		}
	case f.required && !r.quiet && !optional:
		what := ""
		if text := f.suggestion(); text != "" {
			what = "; write " + f.key + ": " + text
		}
		t, _ := f.base()
		if t.Kind() == reflect.Struct {
			what = "; write " + f.key + ": with " + describe(t).keyWords()
		}
		if t.Kind() == reflect.Slice && t.Elem().Kind() == reflect.Struct {
			what = "; write " + f.key + ": with at least one entry"
		}
		r.fault(at, f.key, path, "is missing%s", what)
	case f.hasDef && strings.HasPrefix(f.def, "="):
		n := s.find(f.def[1:])
		target.Set(n.of(holder))
		r.note(f, path, quantity.Exact(target.Float(), f.unit), holder, s)
	case f.hasDef && f.def == "absent":
		target.SetZero()
		r.note(f, path, f.def, holder, s)
	case f.hasDef:
		was := r.quiet
		r.quiet = true
		r.value(f.node, f.node, f, target, holder, path, false)
		r.quiet = was
		r.note(f, path, f.def, holder, s)
	default:
		t, pointer := f.base()
		target.SetZero()
		if t.Kind() == reflect.Struct && !pointer {
			r.structure(nil, at, f.key, path, target, holder, false)
		}
	}
}

// note remembers that the default of f was used.
func (r *reader) note(f *field, path, text string, holder reflect.Value, s structure) {
	if r.quiet {
		return
	}
	if f.whenKey != "" && s.find(f.whenKey).of(holder).String() != f.whenWord {
		return
	}
	mark, source := f.markAndSource()
	r.rec.log.defaults = append(r.rec.log.defaults, Default{Path: path, Value: text, Mark: mark, Source: source})
}

func (r *reader) remember(path string, p pair) {
	if r.quiet {
		return
	}
	o := &origin{line: p.key.Line, column: p.key.Column, comment: p.key.LineComment}
	if p.value.Kind == yaml.ScalarNode {
		o.text = p.value.Value
	}
	if o.comment == "" {
		o.comment = p.value.LineComment
	}
	r.rec.log.origins[path] = o
}

// value reads node n into target, a field of holder. At is where errors point.
func (r *reader) value(n, at *yaml.Node, f *field, target, holder reflect.Value, path string, overlay bool) {
	if n = r.visit(n); n == nil {
		return
	}
	if n.Style&yaml.TaggedStyle != 0 {
		r.fault(at, f.key, path, "has the tag %s; leave it out", n.Tag)
		return
	}
	t, pointer := f.base()
	if n.Kind == yaml.ScalarNode {
		absent := f.def == "absent" && n.Value == "absent"
		if absent || f.word != "" && n.Value == f.word {
			target.SetZero()
			return
		}
	}
	if pointer {
		fresh := reflect.New(t)
		target.Set(fresh)
		target = fresh.Elem()
	}
	if n.Kind == yaml.ScalarNode && n.Tag == "!!null" && t.Kind() != reflect.Struct && t.Kind() != reflect.String {
		what := ""
		if text := f.suggestion(); text != "" {
			what = "; write " + text
		}
		r.fault(at, f.key, path, "there is no value%s", what)
		return
	}
	switch t.Kind() {
	case reflect.Struct:
		r.nested(n, at, f, target, holder, path, overlay)
	case reflect.Slice:
		r.slice(n, at, f, target, path)
	case reflect.Array:
		r.pairOf(n, at, f, target, path)
	default:
		r.scalar(n, at, f, target, path)
	}
}

func (r *reader) nested(n, at *yaml.Node, f *field, target, holder reflect.Value, path string, overlay bool) {
	s := describe(target.Type())
	switch {
	case n.Kind == yaml.MappingNode:
		r.structure(n, at, f.key, path, target, holder, overlay)
	case n.Kind == yaml.ScalarNode && n.Tag == "!!null" && !f.required:
		r.structure(nil, at, f.key, path, target, holder, overlay)
	case n.Kind == yaml.ScalarNode && s.scalar != nil:
		inner := *s.scalar
		inner.key = f.key
		r.scalar(n, at, &inner, target.Field(s.scalar.index), path)
	default:
		r.fault(at, f.key, path, "is %s; write keys: %s", kindWords(n), s.keyWords())
	}
}

func (r *reader) slice(n, at *yaml.Node, f *field, target reflect.Value, path string) {
	elem := target.Type().Elem()
	if n.Kind == yaml.ScalarNode && f.form == "many" {
		target.Set(reflect.MakeSlice(target.Type(), 1, 1))
		r.scalar(n, at, f, target.Index(0), path)
		return
	}
	if n.Kind != yaml.SequenceNode {
		what := "a list"
		if text := f.suggestion(); text != "" {
			what += " such as " + text
		}
		if elem.Kind() == reflect.Struct {
			what = "a list, each entry behind a dash"
		}
		if f.word != "" {
			what = f.word + " or " + what
		}
		r.fault(at, f.key, path, "is %s; write %s", kindWords(n), what)
		return
	}
	if len(n.Content) == 0 && (f.required || f.hasDef && f.def != "[]" && f.def != "absent") {
		r.fault(at, f.key, path, "is an empty list; write at least one entry")
		return
	}
	out := reflect.MakeSlice(target.Type(), 0, len(n.Content))
	for i, c := range n.Content {
		place := fmt.Sprintf("%s[%d]", path, i)
		r.remember(place, pair{c, c})
		item := reflect.New(elem).Elem()
		if c = r.visit(c); c == nil {
			return
		}
		if elem.Kind() == reflect.Struct {
			if c.Kind != yaml.MappingNode {
				r.fault(n.Content[i], f.key, place, "entry %d is %s; write keys: %s", i+1, kindWords(c), describe(elem).keyWords())
			} else {
				r.structure(c, n.Content[i], f.key, place, item, reflect.Value{}, false)
			}
		} else {
			r.scalar(c, n.Content[i], f, item, place)
		}
		out = reflect.Append(out, item)
	}
	if out.Len() == 0 {
		out = reflect.Zero(target.Type())
	}
	target.Set(out)
}

func (r *reader) pairOf(n, at *yaml.Node, f *field, target reflect.Value, path string) {
	spread := f.form == "spread"
	if spread && n.Kind == yaml.ScalarNode {
		r.scalar(n, at, f, target.Index(0), path)
		target.Index(1).Set(target.Index(0))
		return
	}
	if n.Kind != yaml.SequenceNode || len(n.Content) != 2 {
		what := strings.TrimSpace("two values " + f.suggestion())
		if spread {
			what = "one value or a pair [down, up]"
		}
		got := kindWords(n)
		if n.Kind == yaml.SequenceNode {
			got = fmt.Sprintf("a list of %d", len(n.Content))
		}
		r.fault(at, f.key, path, "is %s; write %s", got, what)
		return
	}
	before := len(r.rec.log.errs)
	for i, c := range n.Content {
		r.remember(fmt.Sprintf("%s[%d]", path, i), pair{c, c})
		if c = r.visit(c); c == nil {
			return
		}
		if spread && i == 0 && c.Kind == yaml.ScalarNode {
			down := *c // [-5 %, 7 %] is as clear as [5 %, 7 %]
			down.Value = strings.TrimPrefix(strings.TrimSpace(c.Value), "-")
			c = &down
		}
		r.scalar(c, at, f, target.Index(i), path)
	}
	if f.form == "range" && len(r.rec.log.errs) == before && number(target.Index(0)) > number(target.Index(1)) {
		r.fault(at, f.key, path, "min %s is above max %s; write [min, max]", n.Content[0].Value, n.Content[1].Value)
	}
}

func number(v reflect.Value) float64 {
	if v.CanInt() {
		return float64(v.Int())
	}
	return v.Float()
}

func (r *reader) scalar(n, at *yaml.Node, f *field, target reflect.Value, path string) {
	if n.Kind != yaml.ScalarNode {
		what := ""
		if text := f.suggestion(); text != "" && target.Kind() != reflect.Slice && !strings.HasPrefix(text, "[") {
			what = " such as " + text
		}
		r.fault(at, f.key, path, "is %s; write one value%s", kindWords(n), what)
		return
	}
	switch target.Kind() {
	case reflect.String:
		r.text(n, at, f, target, path)
	case reflect.Bool:
		switch n.Value {
		case "true", "false":
			target.SetBool(n.Value == "true")
		default:
			r.fault(at, f.key, path, "%s is neither true nor false; write true or false", n.Value)
		}
	case reflect.Int:
		x, ok := r.number(n, at, f, path)
		switch {
		case !ok:
		case x != math.Trunc(x) || math.Abs(x) > 1e6:
			r.fault(at, f.key, path, "%s is not a whole number up to a million; write %s", n.Value, whole(f))
		case len(f.oneof) > 0 && !contains(f.oneof, fmt.Sprint(int(x))):
			r.fault(at, f.key, path, "%s is none of the numbers; write one of %s", n.Value, list(f.oneof))
		default:
			target.SetInt(int64(x))
		}
	case reflect.Float64:
		if x, ok := r.number(n, at, f, path); ok {
			target.SetFloat(x)
		}
	default:
		panic("document: no way to read " + target.Type().String())
	}
}

func whole(f *field) string {
	if text := f.suggestion(); text != "" && !strings.HasPrefix(text, "[") {
		return "a number such as " + text
	}
	return "a whole number"
}

func (r *reader) text(n, at *yaml.Node, f *field, target reflect.Value, path string) {
	text := n.Value
	if n.Tag == "!!null" {
		text = ""
	}
	switch {
	case len(f.oneof) > 0 && !contains(f.oneof, text):
		what := "one of " + list(f.oneof)
		if near := nearest(text, f.oneof); near != "" && text != "" {
			what = near
		}
		if text == "" {
			r.fault(at, f.key, path, "there is no value; write %s", what)
			return
		}
		r.fault(at, f.key, path, "%s is none of the words %s; write %s", text, list(f.oneof), what)
	case strings.ContainsFunc(text, func(c rune) bool { return c < ' ' || c == 0x7f || c == '\u2028' || c == '\u2029' }):
		r.fault(at, f.key, path, "holds a line break or a control character; write one line")
	case f.required && strings.TrimSpace(text) == "":
		what := ""
		if s := f.suggestion(); s != "" {
			what = "; write " + s
		}
		r.fault(at, f.key, path, "is empty%s", what)
	default:
		target.SetString(text)
	}
}

// number reads a quantity or a plain number and checks its sign.
func (r *reader) number(n, at *yaml.Node, f *field, path string) (float64, bool) {
	text := n.Value
	if f.bare != "" && plainNumber(text) {
		text += " " + f.bare
	}
	x, err := quantity.Parse(text, f.unit)
	if e, ok := errors.AsType[*quantity.Error](err); ok {
		r.fault(at, f.key, path, "%v", e)
		return 0, false
	}
	switch {
	case f.signed:
	case x < 0:
		r.fault(at, f.key, path, "%s is negative; write %s", text, least(f))
		return 0, false
	case x == 0 && !f.zero:
		r.fault(at, f.key, path, "%s is zero; write a value above 0", text)
		return 0, false
	}
	if f.most != "" {
		top, err := quantity.Parse(f.most, f.unit)
		if err != nil {
			panic("document: most of " + f.key + ": " + err.Error())
		}
		if x > top {
			r.fault(at, f.key, path, "%s is above %s; write at most %s", text, f.most, f.most)
			return 0, false
		}
	}
	return x, true
}

func least(f *field) string {
	if f.zero {
		return "0 or a value above it"
	}
	return "a value above 0"
}

func kindWords(n *yaml.Node) string {
	switch n.Kind {
	case yaml.MappingNode:
		return "a mapping"
	case yaml.SequenceNode:
		return "a list"
	case yaml.ScalarNode:
		if n.Tag == "!!null" {
			return "empty"
		}
		return "a single value"
	}
	return "an alias"
}
