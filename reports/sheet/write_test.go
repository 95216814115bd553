package sheet

import (
	"bytes"
	"os"
	"path/filepath"
	"testing"
)

func written(t testing.TB, s Sheet) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := Write(&b, s); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

// TestKeepSheets writes the sheets of the fixtures to a folder for looking at.
func TestKeepSheets(t *testing.T) {
	dir := os.Getenv("GAPWRIGHT_KEEP")
	if dir == "" {
		t.Skip("GAPWRIGHT_KEEP names no folder")
	}
	for name, s := range map[string]Sheet{"transformer": drawn(t, transformer(t, false)), "inductor": drawn(t, inductor(t))} {
		if err := os.WriteFile(filepath.Join(dir, name+".xlsx"), written(t, s), 0o666); err != nil {
			t.Fatal(err)
		}
		for _, p := range s.Pictures {
			for ext, data := range map[string][]byte{".svg": p.SVG, ".png": p.PNG} {
				if err := os.WriteFile(filepath.Join(dir, name+"-"+p.Name+ext), data, 0o666); err != nil {
					t.Fatal(err)
				}
			}
		}
	}
}

func BenchmarkWrite(b *testing.B) {
	s := drawn(b, transformer(b, false))
	b.ReportAllocs()
	size := 0
	for b.Loop() {
		size = len(written(b, s))
	}
	b.ReportMetric(float64(size), "bytes/sheet")
}

func BenchmarkRead(b *testing.B) {
	s := transformer(b, false)
	book := filled(b, written(b, s), anyValues(readings(s, 1)))
	b.ReportAllocs()
	for b.Loop() {
		read(b, book, s.Checks)
	}
}
