package main

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"gapwright/corelib/material"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
)

// library is every open table, with the user's own rows in them.
type library struct {
	shapes    *shape.Table
	materials *material.Table
	wires     *wire.Table
}

// addLibraryFlag adds --library, which may be repeated.
func addLibraryFlag(c *cobra.Command, folders *[]string) {
	c.Flags().StringArrayVar(folders, "library", nil, "`folder` with your own rows (cores.csv, formers.csv, wires.csv, ferrites.csv, ..); repeat it for more, later ones win")
}

// openLibrary reads the embedded tables and the rows of the folders, in order.
// Every mistake in every file of a folder is reported at once.
func openLibrary(folders []string) (library, error) {
	lib := library{shapes: shape.Embedded(), materials: material.Embedded(), wires: &wire.Table{}}
	for _, folder := range folders {
		if err := lib.add(folder); err != nil {
			return library{}, err
		}
	}
	return lib, nil
}

func (l *library) add(folder string) error {
	entries, err := os.ReadDir(folder)
	if err != nil {
		return fileFailure("read", folder, err)
	}
	if !slices.ContainsFunc(entries, func(e fs.DirEntry) bool { return isTable(e.Name()) }) {
		return fmt.Errorf("folder %s holds no table; the files are %s, %s, %s, ferrites.csv and its companions", folder, shape.CoresFile, shape.FormersFile, wire.OwnFile)
	}
	fsys := os.DirFS(folder)
	name := filepath.Clean(folder)
	shapes, errShapes := l.shapes.With(fsys, name)
	materials, errMaterials := l.materials.With(fsys, name)
	wires, errWires := l.wires.With(fsys, name)
	if err := errors.Join(errShapes, errMaterials, errWires); err != nil {
		if pe, ok := errors.AsType[*fs.PathError](err); ok {
			return fileFailure("read", filepath.Join(folder, pe.Path), err)
		}
		return err
	}
	l.shapes, l.materials, l.wires = shapes, materials, wires
	return nil
}

func isTable(name string) bool {
	switch name {
	case shape.CoresFile, shape.FormersFile, wire.OwnFile:
		return true
	}
	return strings.HasPrefix(name, "ferrite") && strings.HasSuffix(name, ".csv")
}
