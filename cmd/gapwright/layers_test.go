package main

import (
	"go/parser"
	"go/token"
	"io/fs"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// doors says which of our packages each package may import; a name with /...
// means everything below it, * means all below the layer itself. The order is
// the house's: cmd -> reports -> magnetics -> tank -> corelib, one way.
var doors = map[string][]string{
	"cmd/gapwright": {"reports/...", "magnetics/...", "tank/...", "corelib/..."},

	"reports/text":    {"magnetics/...", "tank/...", "corelib/..."},
	"reports/figure":  {"magnetics/...", "tank/...", "corelib/..."},
	"reports/sheet":   {"reports/figure", "magnetics/...", "tank/...", "corelib/..."},
	"reports/page":    {"reports/figure", "reports/text", "magnetics/...", "tank/...", "corelib/..."},
	"reports/circuit": {"magnetics/...", "tank/...", "corelib/..."},

	"magnetics/job":       {"magnetics/part", "magnetics/winding", "tank", "corelib/..."},
	"magnetics/field":     {"corelib/..."},
	"magnetics/gap":       {"magnetics/field", "corelib/..."},
	"magnetics/acloss":    {"magnetics/field", "corelib/..."},
	"magnetics/coreloss":  {"corelib/..."},
	"magnetics/thermal":   {"corelib/..."},
	"magnetics/winding":   {"corelib/..."},
	"magnetics/window":    {"magnetics/field", "magnetics/gap", "magnetics/acloss", "corelib/..."},
	"magnetics/part":      {"magnetics/field", "magnetics/gap", "magnetics/acloss", "magnetics/coreloss", "magnetics/thermal", "magnetics/winding", "tank/...", "corelib/..."},
	"magnetics/design":    {"magnetics/job", "magnetics/part", "magnetics/field", "magnetics/gap", "magnetics/acloss", "magnetics/coreloss", "magnetics/thermal", "magnetics/winding", "tank/...", "corelib/..."},
	"magnetics/tolerance": {"magnetics/design", "magnetics/job", "magnetics/part", "magnetics/sample", "magnetics/winding", "tank/...", "corelib/..."},
	"magnetics/sample":    {"magnetics/part", "magnetics/gap", "magnetics/winding", "tank/...", "corelib/..."},

	"tank":          {"tank/waveform", "corelib/quantity", "corelib/root", "corelib/document"},
	"tank/waveform": {},

	"corelib/quantity":   {},
	"corelib/root":       {},
	"corelib/bessel":     {},
	"corelib/document":   {"corelib/quantity"},
	"corelib/table":      {"corelib/quantity"},
	"corelib/shape":      {"corelib/table", "corelib/quantity"},
	"corelib/material":   {"corelib/table", "corelib/quantity"},
	"corelib/wire":       {"corelib/table", "corelib/quantity"},
	"corelib/insulation": {"corelib/table", "corelib/quantity"},
}

// onlyImporters are the packages that alone may import a library.
var onlyImporters = map[string][]string{
	"gopkg.in/yaml.v3":            {"corelib/document"},
	"github.com/xuri/excelize/v2": {"reports/sheet"},
	"github.com/spf13/cobra":      {"cmd/gapwright"},
	"gonum.org/v1/plot":           {"reports/figure"},
	"golang.org/x/term":           {"cmd/gapwright"},
}

// TestDoors reads the import lines of every file of the project and fails on a
// door that the house does not have. Files are parsed, not listed by the go
// command: the test cache would not see what a sub-process reads.
func TestDoors(t *testing.T) {
	root := filepath.Join("..", "..")
	seen := map[string]bool{}
	err := filepath.WalkDir(root, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		if d.IsDir() {
			if name := d.Name(); path != root && (strings.HasPrefix(name, ".") || name == "testdata" || name == "build") {
				return filepath.SkipDir
			}
			return nil
		}
		if !strings.HasSuffix(path, ".go") {
			return nil
		}
		rel, err := filepath.Rel(root, filepath.Dir(path))
		if err != nil {
			return err
		}
		pkg := filepath.ToSlash(rel)
		seen[pkg] = true
		allowed, known := doors[pkg]
		if !known {
			t.Errorf("%s is a room that the house does not know: add its doors", pkg)
			return nil
		}
		file, err := parser.ParseFile(token.NewFileSet(), path, nil, parser.ImportsOnly)
		if err != nil {
			return err
		}
		test := strings.HasSuffix(path, "_test.go")
		for _, spec := range file.Imports {
			imported := strings.Trim(spec.Path.Value, `"`)
			if own, ok := strings.CutPrefix(imported, "gapwright/"); ok {
				if own != pkg && !test && !open(allowed, own) {
					t.Errorf("%s imports %s: no such door", path, own)
				}
				if test && layer(own) > layer(pkg) {
					t.Errorf("%s imports %s: not even a test may look up", path, own)
				}
				continue
			}
			for lib, importers := range onlyImporters {
				if (imported == lib || strings.HasPrefix(imported, lib+"/")) && !test && !slices.Contains(importers, pkg) {
					t.Errorf("%s imports %s, which belongs to %v", path, imported, importers)
				}
			}
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if len(seen) < 20 {
		t.Errorf("only %d packages found under %s", len(seen), root)
	}
}

func open(allowed []string, pkg string) bool {
	for _, a := range allowed {
		if a == pkg {
			return true
		}
		if prefix, ok := strings.CutSuffix(a, "/..."); ok && (pkg == prefix || strings.HasPrefix(pkg, prefix+"/")) {
			return true
		}
	}
	return false
}

// layer is the height of a package in the house.
func layer(pkg string) int {
	for i, top := range []string{"corelib", "tank", "magnetics", "reports", "cmd"} {
		if pkg == top || strings.HasPrefix(pkg, top+"/") {
			return i
		}
	}
	return -1
}
