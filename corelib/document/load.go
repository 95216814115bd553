package document

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"strconv"
	"strings"
	"unicode/utf8"

	"gopkg.in/yaml.v3"
)

// Bounds of what is read. A job is some kilobytes; the bounds only keep a
// hostile or mistaken file from taking memory and time.
const (
	MaxSize  = 1 << 20 // bytes
	maxDepth = 32      // of nested lists and mappings
	maxNodes = 200_000 // visited, every use of an alias counted again
)

// load returns the root node of the only document in data.
func load(file string, data []byte) (*yaml.Node, *Error) {
	fault := func(line, column int, format string, args ...any) *Error {
		return &Error{File: file, Line: line, Column: column, Msg: fmt.Sprintf(format, args...)}
	}
	if len(data) > MaxSize {
		return nil, fault(1, 1, "the file has %d bytes; at most %d are read", len(data), MaxSize)
	}
	data = bytes.TrimPrefix(data, []byte("\ufeff"))
	for line, text := range bytes.Split(data, []byte("\n")) {
		if !utf8.Valid(text) {
			return nil, fault(line+1, 1, "the line is not UTF-8; save the file as UTF-8")
		}
	}
	decoder := yaml.NewDecoder(bytes.NewReader(data))
	root, err := decode(decoder)
	switch {
	case errors.Is(err, io.EOF):
		return nil, fault(1, 1, "the file is empty; write format: 1 and the rest of it")
	case err != nil:
		line, msg := syntax(err, data)
		return nil, fault(line, 1, "%s", msg)
	}
	second, err := decode(decoder)
	switch {
	case err == nil:
		return nil, fault(second.Line, second.Column, "a second document begins here; write one document per file")
	case !errors.Is(err, io.EOF):
		line, msg := syntax(err, data)
		return nil, fault(line, 1, "%s", msg)
	}
	if root.Kind == yaml.DocumentNode {
		if len(root.Content) == 0 {
			return nil, fault(1, 1, "the file is empty; write format: 1 and the rest of it")
		}
		root = root.Content[0]
	}
	if deep := tooDeep(root, 0); deep != nil {
		return nil, fault(deep.Line, deep.Column, "lists and mappings are nested more than %d deep", maxDepth)
	}
	if root.Kind == yaml.ScalarNode && root.Tag == "!!null" {
		return nil, fault(1, 1, "the file is empty; write format: 1 and the rest of it")
	}
	return root, nil
}

// decode turns a panic of the YAML library on hostile input into an error.
func decode(d *yaml.Decoder) (n *yaml.Node, err error) {
	defer func() {
		if p := recover(); p != nil {
			err = fmt.Errorf("yaml: %v", p)
		}
	}()
	n = new(yaml.Node)
	return n, d.Decode(n)
}

func tooDeep(n *yaml.Node, depth int) *yaml.Node {
	if depth > maxDepth {
		return n
	}
	for _, c := range n.Content { // an alias has no content of its own
		if deep := tooDeep(c, depth+1); deep != nil {
			return deep
		}
	}
	return nil
}

// syntax turns an error of the YAML library into a line and words.
func syntax(err error, data []byte) (line int, msg string) {
	line = 1
	msg = strings.TrimPrefix(err.Error(), "yaml: ")
	if rest, ok := strings.CutPrefix(msg, "line "); ok {
		if number, words, ok := strings.Cut(rest, ": "); ok {
			if n, err := strconv.Atoi(number); err == nil {
				line, msg = max(1, n), words
			}
		}
	}
	for i, text := range bytes.Split(data, []byte("\n")) {
		indent := text[:len(text)-len(bytes.TrimLeft(text, " \t"))]
		if bytes.IndexByte(indent, '\t') >= 0 && len(bytes.TrimSpace(text)) > 0 {
			return i + 1, "not YAML: a tab indents this line; write spaces"
		}
	}
	hint := "; look at the indentation, the brackets and the quotes here and just above"
	switch {
	case strings.Contains(msg, "mapping values are not allowed"):
		hint = "; write one key: value per line, and quotes around a text that holds a colon"
	case strings.Contains(msg, "did not find expected"):
		line++ // the library counts these from 0
	case strings.Contains(msg, "unknown anchor"):
		name, _, _ := strings.Cut(strings.TrimPrefix(msg, "unknown anchor '"), "'")
		if i := bytes.Index(data, []byte("*"+name)); i >= 0 {
			line = 1 + bytes.Count(data[:i], []byte("\n"))
		}
		hint = "; write the values out, or name the anchor before its use"
	}
	return line, "not YAML: " + msg + hint
}
