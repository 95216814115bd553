package document

import (
	"fmt"
	"strings"
)

// A Record remembers for every value of a document where it came from, and
// collects what is wrong. Values are named by their path: "tank.dead_time",
// "corners[1].share".
type Record struct {
	log    *log
	prefix string // of every path given to this view
	mount  string // what every path given to this view must begin with
}

type log struct {
	file     string
	origins  map[string]*origin
	bad      map[string]bool
	within   map[string]bool // something below is bad
	errs     []*Error
	defaults []Default
}

// origin is what the file says about one path.
type origin struct {
	line, column int
	text         string // of a scalar, as written
	comment      string // beside it, as written
}

// A Default is a default that was used because the document does not say
// otherwise.
type Default struct {
	Path   string // "build.limits.core_temperature"
	Value  string // as it would be written: "110 degC", "absent"
	Mark   string // PUB published, CP common practice, MEM from memory, OWN our proposal
	Source string // what the mark refers to; may be empty
}

func newRecord(file string) *Record {
	return &Record{log: &log{file: file, origins: map[string]*origin{}, bad: map[string]bool{}, within: map[string]bool{}}}
}

// Under returns a view of the same record whose paths begin at path.
func (r *Record) Under(path string) *Record {
	return &Record{log: r.log, prefix: r.full(path) + "."}
}

// Mount returns a view in which the document of r stands at path, as it does
// when it becomes a section of a larger one.
func (r *Record) Mount(path string) *Record {
	return &Record{log: r.log, prefix: r.prefix, mount: path + "."}
}

func (r *Record) full(path string) string {
	rest, ok := strings.CutPrefix(path, r.mount)
	if !ok {
		return "?" // no path of any document
	}
	return r.prefix + rest
}

// Set tells whether the document itself holds a value at path.
func (r *Record) Set(path string) bool { return r.log.origins[r.full(path)] != nil }

// Valid tells whether nothing wrong was found at path or around it, so that a
// check across fields may use its value.
func (r *Record) Valid(path string) bool {
	for p := r.full(path); ; p = parent(p) {
		if r.log.bad[p] {
			return false
		}
		if p == "" {
			return true
		}
	}
}

// Clean tells whether nothing wrong was found at path, around it or below it.
func (r *Record) Clean(path string) bool {
	return !r.log.within[r.full(path)] && r.Valid(path)
}

// spoil marks a path as wrong.
func (l *log) spoil(path string) {
	l.bad[path] = true
	for p := parent(path); p != "" && !l.within[p]; p = parent(p) {
		l.within[p] = true
	}
}

// Text returns a scalar as it was written, "" when it was not.
func (r *Record) Text(path string) string {
	if o := r.log.origins[r.full(path)]; o != nil {
		return o.text
	}
	return ""
}

// Words returns the scalar at path, or the scalars of the list at path, as they
// were written.
func (r *Record) Words(path string) []string {
	if text := r.Text(path); text != "" {
		return []string{text}
	}
	var words []string
	for i := 0; ; i++ {
		o := r.log.origins[fmt.Sprintf("%s[%d]", r.full(path), i)]
		if o == nil {
			return words
		}
		words = append(words, o.text)
	}
}

// Position returns where path stands in the file; when it is not there itself,
// where what should hold it stands.
func (r *Record) Position(path string) (file string, line, column int) {
	for p := r.full(path); p != ""; p = parent(p) {
		if o := r.log.origins[p]; o != nil {
			return r.log.file, o.line, o.column
		}
	}
	return r.log.file, 1, 1
}

// Line returns the line of path, as Position does.
func (r *Record) Line(path string) int {
	_, line, _ := r.Position(path)
	return line
}

// At returns the error that the value at path is wrong in the way that the
// format says, with file, line and column.
func (r *Record) At(path, format string, args ...any) *Error {
	file, line, column := r.Position(path)
	return &Error{File: file, Line: line, Column: column, Field: lastKey(path), Msg: fmt.Sprintf(format, args...)}
}

// Nowhere returns the error of a value that no file holds.
func Nowhere(path, format string, args ...any) *Error {
	return newRecord("job").At(path, format, args...)
}

// Fault adds the error At to the record.
func (r *Record) Fault(path, format string, args ...any) {
	r.log.spoil(r.full(path))
	r.log.errs = append(r.log.errs, r.At(path, format, args...))
}

// Err returns everything that is wrong with the document as one error in file
// order, nil when nothing is. The single *Errors are behind its Unwrap method.
func (r *Record) Err() error { return join(r.log.errs) }

// Defaults returns the defaults that were used below this view, in the order
// of the description.
func (r *Record) Defaults() []Default {
	var list []Default
	for _, d := range r.log.defaults {
		if rest, ok := strings.CutPrefix(d.Path, r.prefix); ok {
			d.Path = rest
			list = append(list, d)
		}
	}
	return list
}

// parent cuts the last key or index off a path.
func parent(path string) string {
	return path[:max(0, strings.LastIndexAny(path, ".["))]
}

// lastKey returns the last key of a path, without an index behind it.
func lastKey(path string) string {
	key := path[strings.LastIndexByte(path, '.')+1:]
	if i := strings.IndexByte(key, '['); i > 0 {
		key = key[:i]
	}
	return key
}

func child(path, key string) string {
	if path == "" {
		return key
	}
	return path + "." + key
}
