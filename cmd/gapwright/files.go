package main

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"

	"gapwright/corelib/document"
)

// stdinName is how messages call what came through standard input.
const stdinName = "standard input"

// readInput reads a file, or standard input for "-". The name it returns is for
// messages. What cannot be read is a failure with exitFiles.
func readInput(path string, env environment) (name string, data []byte, err error) {
	name = path
	var r io.Reader = env.stdin
	if path == "-" {
		name = stdinName
	} else {
		f, err := os.Open(path)
		if err != nil {
			return name, nil, fileFailure("read", path, err)
		}
		defer f.Close()
		if info, err := f.Stat(); err == nil && info.IsDir() {
			return name, nil, failure{exitFiles, fmt.Errorf("%s is a folder; give a file", path)}
		}
		r = f
	}
	// One byte more than the reader takes, so that it can say what is too much.
	data, err = io.ReadAll(io.LimitReader(r, document.MaxSize+1))
	if err != nil {
		return name, nil, fileFailure("read", name, err)
	}
	return name, data, nil
}

// writeWhole writes a file so that path holds either all of data or what it
// held before: into a temporary file beside it, to the disk, then renamed.
func writeWhole(path string, data []byte) (err error) {
	mode := fs.FileMode(0o644)
	if info, err := os.Stat(path); err == nil {
		switch {
		case info.IsDir():
			return failure{exitFiles, fmt.Errorf("cannot write %s: it is a folder", path)}
		case !info.Mode().IsRegular(): // a device or a pipe is written to, not replaced
			if err := os.WriteFile(path, data, 0); err != nil {
				return fileFailure("write", path, err)
			}
			return nil
		}
		mode = info.Mode().Perm()
		if target, err := filepath.EvalSymlinks(path); err == nil {
			path = target // the link stays, what it points to is replaced
		}
	}
	f, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+".*.part")
	if err != nil {
		return fileFailure("write", path, err)
	}
	defer func() {
		if err != nil {
			f.Close()
			os.Remove(f.Name())
			err = fileFailure("write", path, err)
		}
	}()
	if _, err = f.Write(data); err != nil {
		return err
	}
	if err = f.Chmod(mode); err != nil {
		return err
	}
	if err = f.Sync(); err != nil {
		return err
	}
	if err = f.Close(); err != nil {
		return err
	}
	return os.Rename(f.Name(), path)
}

// makeFolder makes the folder of an --out flag with all that lead to it.
func makeFolder(path string) error {
	if err := os.MkdirAll(path, 0o755); err != nil {
		return fileFailure("make the folder", path, err)
	}
	return nil
}

// fileFailure says what could not be done to which file, and why.
func fileFailure(doing, path string, err error) error {
	why := err
	if pe, ok := errors.AsType[*fs.PathError](err); ok {
		why = pe.Err
	} else if le, ok := errors.AsType[*os.LinkError](err); ok {
		why = le.Err
	}
	switch {
	case errors.Is(err, fs.ErrNotExist):
		if doing != "read" {
			return failure{exitFiles, fmt.Errorf("cannot %s %s: the folder %s does not exist", doing, path, filepath.Dir(path))}
		}
		return failure{exitFiles, fmt.Errorf("cannot read %s: it does not exist", path)}
	case errors.Is(err, fs.ErrPermission) && doing != "read":
		return failure{exitFiles, fmt.Errorf("cannot %s %s: the folder %s is not writable", doing, path, filepath.Dir(path))}
	}
	return failure{exitFiles, fmt.Errorf("cannot %s %s: %w", doing, path, why)}
}
