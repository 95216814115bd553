package job

import (
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "rewrite the expected messages of testdata/bad")

const badFolder = "../../testdata/bad"

// Every file of testdata/bad holds one mistake (some hold several); the text
// file beside it holds what the program must say, one line per mistake.
func TestBadFiles(t *testing.T) {
	files, err := filepath.Glob(filepath.Join(badFolder, "*.yaml"))
	if err != nil || len(files) < 35 {
		t.Fatalf("%d files, %v", len(files), err)
	}
	for _, file := range files {
		name := filepath.Base(file)
		t.Run(name, func(t *testing.T) {
			data, err := os.ReadFile(file)
			if err != nil {
				t.Fatal(err)
			}
			_, err = Read(name, data)
			if err == nil {
				t.Fatal("the file was read without an error")
			}
			got := err.Error() + "\n"
			expected := strings.TrimSuffix(file, ".yaml") + ".txt"
			if *update {
				if err := os.WriteFile(expected, []byte(got), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			want, err := os.ReadFile(expected)
			if err != nil {
				t.Fatal(err)
			}
			if got != string(want) {
				t.Errorf("the program says\n%swant\n%s", got, want)
			}
		})
	}
}
