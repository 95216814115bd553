package main

import (
	"bytes"
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"gapwright/magnetics/job"
)

// program runs the whole program and returns what it wrote.
func program(t *testing.T, stdin string, args ...string) (code int, stdout, stderr string) {
	t.Helper()
	var out, errs bytes.Buffer
	code = run(t.Context(), args, environment{stdin: strings.NewReader(stdin), stdout: &out, stderr: &errs, width: 100})
	return code, out.String(), errs.String()
}

func TestNew(t *testing.T) {
	for _, args := range [][]string{{"new"}, {"new", "-"}} {
		code, stdout, stderr := program(t, "", args...)
		if code != exitDone || stderr != "" {
			t.Errorf("%v: exit %d, stderr %q", args, code, stderr)
		}
		if _, err := job.Read("job.yaml", []byte(stdout)); err != nil {
			t.Errorf("%v wrote a job that does not read: %v", args, err)
		}
	}
	file := filepath.Join(t.TempDir(), "job.yaml")
	if code, stdout, stderr := program(t, "", "new", file); code != exitDone || stdout != "" || !strings.HasPrefix(stderr, "wrote ") {
		t.Errorf("new FILE: exit %d, stdout %q, stderr %q", code, stdout, stderr)
	}
	if err := os.WriteFile(file, []byte("mine"), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Chmod(file, 0o600); err != nil {
		t.Fatal(err)
	}
	if code, _, stderr := program(t, "", "new", file); code != exitFiles || !strings.Contains(stderr, "exists already; use --force") {
		t.Errorf("new on an existing file: exit %d, stderr %q", code, stderr)
	}
	if data, _ := os.ReadFile(file); string(data) != "mine" {
		t.Errorf("new without --force changed the file to %q", data)
	}
	if code, _, stderr := program(t, "", "new", "--force", file); code != exitDone {
		t.Errorf("new --force: exit %d, stderr %q", code, stderr)
	}
	if data, _ := os.ReadFile(file); !bytes.Equal(data, job.Starter()) {
		t.Error("new --force did not write the starter job")
	}
	if info, _ := os.Stat(file); info.Mode().Perm() != 0o600 {
		t.Errorf("new --force changed the mode to %v", info.Mode())
	}
	if code, _, _ := program(t, "", "new", "a", "b"); code != exitUsage {
		t.Errorf("new a b: exit %d, want %d", code, exitUsage)
	}
}

func TestSchema(t *testing.T) {
	code, stdout, stderr := program(t, "", "schema")
	if code != exitDone || stderr != "" || !json.Valid([]byte(stdout)) {
		t.Errorf("schema: exit %d, stderr %q, valid JSON %v", code, stderr, json.Valid([]byte(stdout)))
	}
}

func TestReadInput(t *testing.T) {
	env := environment{stdin: strings.NewReader("from stdin")}
	if name, data, err := readInput("-", env); err != nil || string(data) != "from stdin" || name != stdinName {
		t.Errorf("readInput(-) = %q, %q, %v", name, data, err)
	}
	dir := t.TempDir()
	for path, want := range map[string]string{filepath.Join(dir, "none.yaml"): "does not exist", dir: "is a folder"} {
		_, _, err := readInput(path, env)
		f, ok := err.(failure)
		if !ok || f.code != exitFiles || !strings.Contains(err.Error(), want) {
			t.Errorf("readInput(%s): %v, want exit %d and %q", path, err, exitFiles, want)
		}
	}
}

func TestWriteWhole(t *testing.T) {
	dir := t.TempDir()
	file := filepath.Join(dir, "a.txt")
	for _, text := range []string{"first", "second"} {
		if err := writeWhole(file, []byte(text)); err != nil {
			t.Fatal(err)
		}
		if data, _ := os.ReadFile(file); string(data) != text {
			t.Errorf("wrote %q, read %q", text, data)
		}
	}
	if list, _ := os.ReadDir(dir); len(list) != 1 {
		t.Errorf("temporary files stayed behind: %v", list)
	}
	for path, want := range map[string]string{
		filepath.Join(dir, "none", "a.txt"): "does not exist",
		dir:                                 "it is a folder",
		filepath.Join(file, "b.txt"):        "cannot write",
	} {
		err := writeWhole(path, []byte("x"))
		if f, ok := err.(failure); !ok || f.code != exitFiles || !strings.Contains(err.Error(), want) {
			t.Errorf("writeWhole(%s): %v, want exit %d and %q", path, err, exitFiles, want)
		}
	}
	if os.Geteuid() == 0 {
		return // root may write into any folder
	}
	if err := os.Chmod(dir, 0o500); err != nil {
		t.Fatal(err)
	}
	defer os.Chmod(dir, 0o700)
	err := writeWhole(file, []byte("third"))
	if f, ok := err.(failure); !ok || f.code != exitFiles || !strings.Contains(err.Error(), "is not writable") {
		t.Errorf("a folder without write permission: %v", err)
	}
	if data, _ := os.ReadFile(file); string(data) != "second" {
		t.Errorf("a failed write changed the file to %q", data)
	}
}
