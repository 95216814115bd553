package job

import (
	"regexp"
	"testing"
)

func TestHash(t *testing.T) {
	hash := func(b BuildFile, part string) string {
		t.Helper()
		h, err := b.Hash(part)
		if err != nil {
			t.Fatal(err)
		}
		return h
	}
	b := everything(t)
	transformer, inductor := hash(b, Transformer), hash(b, Inductor)
	if !regexp.MustCompile(`^[0-9a-f]{12}$`).MatchString(transformer) || transformer == inductor {
		t.Errorf("hashes %q and %q", transformer, inductor)
	}
	data, err := WriteBuild(b)
	if err != nil {
		t.Fatal(err)
	}
	read, err := ReadBuild("build.yaml", data)
	if err != nil {
		t.Fatal(err)
	}
	if hash(read, Transformer) != transformer || hash(read, Inductor) != inductor {
		t.Error("writing and reading changes the hash")
	}
	for name, c := range map[string]struct {
		edit                  func(*BuildFile)
		transformer, inductor bool // changes
	}{
		"title":      {func(b *BuildFile) { b.Job.Title, b.Job.Build.Sheet.Owner, b.MadeWith = "x", "y", "z" }, false, false},
		"limits":     {func(b *BuildFile) { b.Job.Build.Limits.CoreTemperature = 99 }, false, false},
		"tank":       {func(b *BuildFile) { b.Job.Tank.Lr *= 1.0001 }, true, true},
		"last digit": {func(b *BuildFile) { b.Job.Tank.Lr *= 1 + 1e-15 }, false, false},
		"gap":        {func(b *BuildFile) { b.Transformer.Core.Gap.Total += 1e-6 }, true, false},
		"wire":       {func(b *BuildFile) { b.Inductor.Build[0].Layers++ }, false, true},
		"meets":      {func(b *BuildFile) { b.Inductor.Inductance = nil }, false, true},
		"corner":     {func(b *BuildFile) { b.Job.Corners[0].InputVoltage++ }, true, true},
	} {
		b := everything(t)
		c.edit(&b)
		if got := hash(b, Transformer) != transformer; got != c.transformer {
			t.Errorf("%s: the transformer's hash changes: %v, want %v", name, got, c.transformer)
		}
		if got := hash(b, Inductor) != inductor; got != c.inductor {
			t.Errorf("%s: the inductor's hash changes: %v, want %v", name, got, c.inductor)
		}
	}
	b.Inductor = nil
	if h := hash(b, Inductor); h != "" {
		t.Errorf("hash of no inductor is %q", h)
	}
}
