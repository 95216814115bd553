package job

import (
	_ "embed"
	"slices"
	"strings"

	"gapwright/corelib/document"
	"gapwright/tank"
)

// DemoName is the file name under which messages speak of the built-in job.
const DemoName = "demo.yaml"

//go:embed demo.yaml
var demo []byte

// Demo returns the built-in example job, a 390 V to 48 V, 400 W supply. Its
// insulation figures are assumptions of the example.
func Demo() Job {
	j, err := Read(DemoName, demo)
	if err != nil {
		panic("job: the built-in job is wrong: " + err.Error())
	}
	return j
}

// DemoText returns the file of the built-in example job.
func DemoText() []byte { return slices.Clone(demo) }

// Read reads and checks a job file. The name is for messages. Everything that
// is wrong comes at once, in file order, as joined *document.Errors.
func Read(name string, data []byte) (Job, error) {
	var f jobFile
	rec := document.Read(name, data, &f)
	if rec.Set("job") && rec.Set("transformer") { // keys are remembered even where they do not belong
		return Job{}, rec.At("job", "this is a build file, not a job; give it to a command that takes a BUILD, such as check")
	}
	check(&f, rec)
	if err := rec.Err(); err != nil {
		return Job{}, err
	}
	return f.job(rec), nil
}

// job converts a checked file.
func (f *jobFile) job(rec *document.Record) Job {
	j := Job{Title: f.Title, PartNumber: f.PartNumber, Revision: f.Revision, Tank: tank.Tank(f.Tank), Build: f.Build, record: rec}
	for _, c := range f.Corners {
		j.Corners = append(j.Corners, tank.Corner(c))
	}
	return j
}

// file converts back. What was computed from other keys while reading and is
// not in the file is left out again.
func (j Job) file() jobFile {
	f := jobFile{Format: Format, Title: j.Title, PartNumber: j.PartNumber, Revision: j.Revision, Tank: tankFile(j.Tank), Build: j.Build}
	f.Tank.WindingCapacitance = 0 // of the parts as built, no key of a job
	for i, c := range j.Corners {
		if j.record != nil && !j.record.Set(path("corners", i, "share")) {
			c.Share = 0
		}
		f.Corners = append(f.Corners, corner(c))
	}
	return f
}

// Defaults returns every default that was used because the job does not state
// the value; nil for a Job made in code.
func (j Job) Defaults() []document.Default {
	if j.record == nil {
		return nil
	}
	return j.record.Defaults()
}

// IsSet tells whether the job itself states the value at path, such as
// "build.limits.height". It is false for a Job made in code.
func (j Job) IsSet(path string) bool { return j.record != nil && j.record.Set(path) }

// Fault returns an input error at path with file, line and column, for what
// only the tables can tell: an unknown core, material or wire.
func (j Job) Fault(path, format string, args ...any) error {
	if j.record == nil {
		return document.Nowhere(path, format, args...)
	}
	return j.record.At(path, format, args...)
}

// DefaultBuild returns the build section of a job that states none.
func DefaultBuild() Build {
	var b Build
	document.Fill(&b)
	return b
}

// Schema returns the JSON Schema of the job file.
func Schema() []byte { return document.Schema(jobFile{}, "gapwright job, format 1") }

// Starter returns a commented job file to begin with.
func Starter() []byte { return document.Template(jobFile{}, starterHead, false) }

const starterHead = `A job for gapwright: a settled resonant tank and what may be built for it.
Every value that has a unit is written with it: 60 uH, 44 nF, 120 mohm, 0.5 mm, 5 %,
45 degC for a temperature, 10 K for a rise. Lines behind a # show the defaults; take
the # and the blank after it away to change one. Marks of defaults: PUB published,
CP common practice, MEM from memory; no mark: our proposal.

The values below are an example. Replace them by those of your tank.`

// NotYet lists keys that are read but that the program does not act on yet. A
// job that sets one of them to anything but its default is refused. An entry is
// a path ("build.sheet.contact"), a path and a word or list entry
// ("build.gap.kind=spacer"), or a section ("build.tests"). An entry of limits,
// cores, gap, wires or insulation holds for the parts' own sections too.
var NotYet = []string{
	"build.cores.former=none",                  // every turn length is that of a former
	"build.transformer.secondary_parallel_max", // each half is one winding, with wires in hand side by side
}

func notYet(f *jobFile, rec *document.Record) {
	if len(NotYet) == 0 {
		return
	}
	for _, changed := range document.Changed(*f, rec) {
		if !rec.Valid(changed) {
			continue
		}
		general := changed
		for _, part := range []string{Transformer, Inductor} {
			for _, section := range []string{"limits", "cores", "gap", "wires", "insulation"} {
				if rest, ok := strings.CutPrefix(changed, "build."+part+"."+section+"."); ok {
					general = "build." + section + "." + rest
				}
			}
		}
		for _, entry := range NotYet {
			p, word, hasWord := strings.Cut(entry, "=")
			if !within(changed, p) && !within(general, p) {
				continue
			}
			if !hasWord {
				rec.Fault(changed, "is not supported yet; leave it out")
			} else if slices.Contains(rec.Words(changed), word) {
				rec.Fault(changed, "%s is not supported yet; write another or leave the key out", word)
			}
		}
	}
}

func within(path, section string) bool {
	return path == section || strings.HasPrefix(path, section+".") || strings.HasPrefix(path, section+"[")
}
