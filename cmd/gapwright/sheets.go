package main

import (
	"bytes"
	"fmt"
	"math"
	"path/filepath"
	"strings"

	"gapwright/magnetics/design"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/reports/sheet"
)

// partsOf names the parts of a design.
func partsOf(d *design.Design) []string {
	if d.Inductor == nil {
		return []string{job.Transformer}
	}
	return []string{job.Transformer, job.Inductor}
}

// partOf returns one part of a rated design.
func partOf(d *design.Design, name string) (part.Construction, *part.Rating) {
	if name == job.Inductor {
		return d.Inductor.Construction, d.InductorRating
	}
	return d.Transformer.Construction, d.Rating
}

// hashOf is the design hash of one part.
func hashOf(d *design.Design, name string) (string, error) { return buildFileOf(d).Hash(name) }

// inspectionSettings are the job's tolerances and tests for one part.
func inspectionSettings(d *design.Design, name string) part.InspectionSettings {
	b := d.Job.Build
	limits := b.For(name)
	s := part.InspectionSettings{
		OpenTolerance: b.Tolerances.OpenInductance, ShortTolerance: shortTolerance(d),
		ResistanceUp: b.Tolerances.DCResistance.Up, HalfToHalf: b.Tolerances.DCResistance.HalfToHalf, SampleToSample: b.Tolerances.DCResistance.SampleToSample,
		HalfMismatch: limits.Limits.HalfMismatch, CapacitanceUp: capacitanceBand,
		Frequency: b.Tests.Frequency, Level: b.Tests.Level, Temperature: b.Tests.Temperature, Samples: b.Tests.Samples, BeforeGlue: b.Tests.LpBeforeGlue,
		CoreCountsAs: limits.Insulation.CoreCountsAs, GlueLine: limits.Gap.GlueLine,
		WindingLimit: limits.Limits.WindingTemperature, AmbientInUse: b.Surroundings.AmbientTemperature, ResonantSide: d.Inductor == nil,
	}
	if name == job.Inductor {
		s.OpenTolerance = b.Tolerances.InductorInductance
		if limits.Limits.CurrentLimit != nil {
			s.PeakCurrent = *limits.Limits.CurrentLimit
		} else {
			for _, o := range d.Operations {
				s.PeakCurrent = math.Max(s.PeakCurrent, o.Resonant.Peak)
			}
		}
	}
	return s
}

// capacitanceBand is how far above its estimate the capacitance between the
// windings may read: the band of the estimate.
const capacitanceBand = part.CapacitanceBand

// shortTolerance is the job's tolerance of the short-circuit inductance for the
// arrangement that is built.
func shortTolerance(d *design.Design) [2]float64 {
	t := d.Job.Build.Tolerances.ShortInductance
	chambers, changes, last := false, 0, ""
	for _, e := range d.Transformer.Build {
		if len(e.Of) == 0 {
			continue
		}
		chambers = chambers || e.Chamber > 0
		side := "secondary"
		if e.Of[0] == d.Transformer.Windings[0].Name {
			side = "primary"
		}
		if side != last {
			changes++
			last = side
		}
	}
	switch {
	case chambers:
		return t.Sections
	case changes > 2:
		return t.Sandwich
	}
	return t.Concentric
}

// alTolerance is what the core maker must keep of A_L: at most 5 % (AN-18: 5 to
// 6 %), and a quarter of the tolerance of the inductance is left to the rest.
func alTolerance(d *design.Design, name string) float64 {
	t := inspectionSettings(d, name).OpenTolerance
	return math.Min(0.05, 0.75*math.Min(t[0], t[1]))
}

// checksOf are the rows of the sheet of one part.
func checksOf(d *design.Design, name string) []part.Check {
	settings := inspectionSettings(d, name)
	if name == job.Inductor {
		return d.Inductor.Inspection(*d.InductorRating, settings)
	}
	return d.Transformer.Inspection(*d.Rating, settings)
}

// gapReach is the longest gap in m that the correction of a part looks at.
func gapReach(c part.Construction) float64 {
	return 3*math.Max(c.Core.Gap.Total, c.Core.Gap.Thickness) + 1.5e-3
}

// newSheet gathers the winding sheet of one part of a rated design.
func newSheet(d *design.Design, lib library, name string) (sheet.Sheet, error) {
	j := d.Job
	c, r := partOf(d, name)
	limits := j.Build.For(name)
	hash, err := hashOf(d, name)
	if err != nil {
		return sheet.Sheet{}, err
	}
	form := j.Build.Sheet
	s := sheet.Sheet{
		Owner: form.Owner, CreatedBy: form.CreatedBy, ApprovedBy: form.ApprovedBy, Contact: form.Contact, Date: form.Date,
		Title: j.Title + ": " + name, PartNumber: numberOf(j, name), Revision: j.Revision,
		Part: name, Construction: c, Rating: *r, Window: part.WindowOf(r.Former), Samples: j.Build.Tests.Samples, Checks: checksOf(d, name),
		CoreCountsAs: limits.Insulation.CoreCountsAs, FilmStock: limits.Gap.SpacerFoils, FilmAllowed: limits.Gap.Kind == "either",
		Hash: hash, Tool: "gapwright " + version + ", tables " + tablesVersion, Comma: form.DecimalMark == "comma",
		Assumptions: insulationWords(limits.Insulation, j.Build.Surroundings.Altitude), Material: materialWords(lib, c.Core.Material),
	}
	if c.Former.Wall > 0 {
		s.Window.Wall = c.Former.Wall
	}
	tol := j.Build.Tolerances
	s.GapTolerance = tol.GapLength.Above
	if math.Max(c.Core.Gap.Total, c.Core.Gap.Thickness) <= tol.GapLength.UpTo {
		s.GapTolerance = tol.GapLength.Is
	}
	s.ALTolerance = alTolerance(d, name)
	if err := gapSlopes(&s, d, lib, name); err != nil {
		return sheet.Sheet{}, err
	}
	other := job.Inductor + ": "
	if name == job.Inductor {
		other = job.Transformer + ": "
	}
	for _, w := range d.Warnings {
		if strings.HasPrefix(w.Code, "W1") || strings.HasPrefix(w.Text, other) {
			continue // the tank and the other part are no business of this shop
		}
		w.Text = strings.TrimPrefix(w.Text, name+": ")
		s.Warnings = append(s.Warnings, w)
	}
	s.Warnings = append(s.Warnings, part.Buildable(c, *r, limits.Wires.BendRadius, limits.Wires.HeightLeftMin, limits.Gap.SpacerFoils)...)
	if s.Pictures, err = sheet.Pictures(s); err != nil {
		return sheet.Sheet{}, err
	}
	return s, nil
}

func numberOf(j job.Job, name string) string {
	if j.PartNumber == "" {
		return ""
	}
	if name == job.Inductor {
		return j.PartNumber + "-L"
	}
	return j.PartNumber + "-T"
}

// gapSlopes fills the change of gap over the change of 1/L near the nominal
// inductance, from the same field solution as the rating.
func gapSlopes(s *sheet.Sheet, d *design.Design, lib library, name string) error {
	c, _ := partOf(d, name)
	g := c.Core.Gap
	if g.Kind != part.Ground && g.Kind != part.Spacer {
		return nil
	}
	law, err := design.NewGapLaw(d.Job, name, c, gapReach(c), lib.tables())
	if err != nil {
		return err
	}
	// slope is the change of length over that of 1/L between two places.
	slope := func(change, ground0, film0, ground1, film1 float64) (float64, error) {
		a, err := law(ground0, film0)
		if err != nil {
			return 0, err
		}
		b, err := law(ground1, film1)
		if err != nil {
			return 0, err
		}
		return change / (1/b - 1/a), nil
	}
	if g.Kind == part.Spacer {
		step := math.Min(20e-6, g.Thickness/2)
		s.FilmSlope, err = slope(2*step, 0, g.Thickness-step, 0, g.Thickness+step)
		return err
	}
	step := math.Min(20e-6, g.Total/2)
	if s.GroundSlope, err = slope(2*step, g.Total-step, 0, g.Total+step, 0); err != nil {
		return err
	}
	// Film can only be added: its slope is that of the first usual thickness.
	const film = 50e-6
	s.FilmSlope, err = slope(film, g.Total, 0, g.Total, film)
	return err
}

// materialWords says what ferrite may be bought: the class, and the loss that
// the design counts on.
func materialWords(lib library, name string) string {
	f, err := lib.materials.Find(name)
	if err != nil {
		return name
	}
	words := f.Base + " power ferrite " + f.Name
	if f.Class != "" {
		standard := f.Edition
		if standard == "" {
			standard = "IEC 61332"
		}
		words = fmt.Sprintf("%s power ferrite, class %s of %s", f.Base, f.Class, standard)
	}
	const frequency, flux, hot = 100e3, 0.1, 100
	if p, err := f.LossDensity(frequency, flux, hot); err == nil {
		words += fmt.Sprintf("; the design counts on %.0f kW/m3 at 100 kHz, 100 mT, 100 degC: \"or equal by this test\"", p.Density*1e-3)
	}
	return words
}

// insulationWords states what the insulation build assumes.
func insulationWords(in job.Insulation, altitude float64) []string {
	if in.Grade == "" {
		return []string{"No insulation grade was stated: NOT DESIGNED FOR ISOLATION between primary and secondary."}
	}
	words := "Assumed: " + in.Grade + " insulation"
	if in.WorkingVoltage != nil {
		words += fmt.Sprintf(", working voltage %.0f V rms", *in.WorkingVoltage)
	}
	if in.WorkingVoltagePeak != nil {
		words += fmt.Sprintf(", %.0f V peak", *in.WorkingVoltagePeak)
	}
	if in.Mains != nil {
		words += fmt.Sprintf(", mains %.0f V category %s", in.Mains.Voltage, in.Mains.OvervoltageCategory)
	}
	words += fmt.Sprintf(", pollution degree %d, material group %s, up to %.0f m.", in.PollutionDegree, in.MaterialGroup, altitude)
	out := []string{words}
	if in.Creepage == nil && in.Clearance == nil {
		return append(out, "Distances are a proposal from a table; the customer has not stated his own.")
	}
	words = "Distances stated by the customer:"
	if in.Creepage != nil {
		words += fmt.Sprintf(" creepage %.1f mm", *in.Creepage*1e3)
	}
	if in.Clearance != nil {
		words += fmt.Sprintf(" clearance %.1f mm", *in.Clearance*1e3)
	}
	return append(out, words+".")
}

// sheetFile is the name of a part's winding sheet.
func sheetFile(name string) string { return "winding-sheet-" + name + ".xlsx" }

// writeSheets writes the winding sheets of a rated design into a folder, and
// their drawings beside them. A sheet that a shop has filled in is written over
// only with force; without it nothing is written then.
func writeSheets(folder string, d *design.Design, lib library, force bool) error {
	if !force {
		for _, name := range partsOf(d) {
			path := filepath.Join(folder, sheetFile(name))
			filled, cells, err := sheet.HasReadings(path)
			if err != nil {
				return failure{exitFiles, fmt.Errorf("%w; it stands where the sheet goes: move it, or use --force", err)}
			}
			if filled {
				return failure{exitFiles, fmt.Errorf("%s has been filled in (%s): move it, or use --force to write over it", path, some(cells, 4))}
			}
		}
	}
	// Everything is made before anything is written.
	type file struct {
		path string
		data []byte
	}
	var files []file
	for _, name := range partsOf(d) {
		s, err := newSheet(d, lib, name)
		if err != nil {
			return err
		}
		var book bytes.Buffer
		if err := sheet.Write(&book, s); err != nil {
			return err
		}
		files = append(files, file{filepath.Join(folder, sheetFile(name)), book.Bytes()})
		for _, p := range s.Pictures {
			files = append(files, file{filepath.Join(folder, "figures", name+"-"+p.Name+".svg"), p.SVG})
		}
	}
	if err := makeFolder(filepath.Join(folder, "figures")); err != nil {
		return err
	}
	for _, f := range files {
		if err := writeWhole(f.path, f.data); err != nil {
			return err
		}
	}
	return nil
}

// some joins the first n texts and counts the rest.
func some(list []string, n int) string {
	if len(list) <= n {
		return strings.Join(list, ", ")
	}
	return fmt.Sprintf("%s and %d more", strings.Join(list[:n], ", "), len(list)-n)
}
