package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io/fs"
	"math"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"gapwright/magnetics/design"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/magnetics/sample"
	"gapwright/reports/sheet"
	"gapwright/reports/text"
	"gapwright/tank"
)

type readbackOptions struct {
	sheets  []string
	build   string
	out     string
	library []string
	force   bool
	json    bool
}

func newReadbackCommand(env environment) *cobra.Command {
	var opts readbackOptions
	c := &cobra.Command{
		Use:   "readback SHEET... --build BUILD",
		Short: "Read filled winding sheets: tank as built, gap correction, likely faults",
		Long: `readback reads winding sheets that a shop has filled in, several samples and
several sheets at once, and says

  what is fine and what is not, row by row,
  which tank the samples make (Lr, Lm, turns ratio, with their uncertainty), and
    what that tank does at every corner of the job,
  how the gap has to be corrected: in ground length, in film, in stock films,
  which fault explains the readings best, and the one further measurement that
    would tell the first two apart.

Cells are found by name, then by the ID of their row, never by position. Decimal
commas and units behind a number are read and reported; a cell that cannot be
read is named. Nothing in a sheet is changed. A sheet that does not belong to
the build is refused, unless --force says so.
` + exitCodesHelp,
		Example: `  gapwright readback winding-sheet-*.xlsx --build parts/build.yaml
  gapwright readback filled.xlsx --build parts/build.yaml --json --out parts`,
		Args: cobra.MinimumNArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			opts.sheets = args
			return runReadback(cmd.Context(), opts, env)
		},
	}
	c.Flags().StringVar(&opts.build, "build", "", "build `file` that the sheets were written from")
	c.Flags().StringVar(&opts.out, "out", "", "`folder` to write readback.txt and readback.json into")
	c.Flags().BoolVar(&opts.force, "force", false, "read sheets of another design too")
	c.Flags().BoolVar(&opts.json, "json", false, "print the result as JSON, in SI units")
	addLibraryFlag(c, &opts.library)
	if err := c.MarkFlagRequired("build"); err != nil {
		panic(err)
	}
	return c
}

func runReadback(ctx context.Context, opts readbackOptions, env environment) error {
	lib, d, err := checkBuild(ctx, opts.build, opts.library, env)
	if err != nil {
		return designFailure(env, opts.json, d, err)
	}
	r := text.ReadbackReport{Title: d.Job.Title, Wanted: d.Job.Tank, Design: d.AsBuilt, Meter: sample.BenchMeter}
	filled := map[string][]sheet.Filled{}
	var problems []error
	bad := false
	for _, path := range opts.sheets {
		f, s, err := readSheet(path, d, opts.force)
		if err != nil {
			problems = append(problems, err)
			continue
		}
		r.Sheets = append(r.Sheets, s)
		bad = bad || len(s.Unread) > 0
		filled[f.Part] = append(filled[f.Part], f)
	}
	if len(problems) > 0 {
		return errors.Join(problems...)
	}
	rows := map[string]*samplesOf{}
	for _, name := range partsOf(d) {
		if len(filled[name]) == 0 {
			continue
		}
		if err := ctx.Err(); err != nil {
			return err
		}
		set := gatherSamples(checksOf(d, name), filled[name])
		rows[name] = set
		p, err := judgePart(d, lib, name, set)
		if err != nil {
			return err
		}
		bad = bad || p.Overall == "REJECT"
		r.Parts = append(r.Parts, p)
	}
	if err := rebuildTank(ctx, &r, d, lib, rows); err != nil {
		return err
	}
	for _, v := range r.Verdicts {
		bad = bad || !v.Pass
	}
	for _, o := range r.Corners {
		bad = bad || o.Status != tank.OK
	}

	var plain, asJSON bytes.Buffer
	if err := text.ReadbackJSON(&asJSON, r); err != nil {
		return err
	}
	if err := text.Readback(text.NewPrinter(&plain, env.utf8 && opts.out == "", env.width), r); err != nil {
		return err
	}
	if opts.out != "" {
		if err := makeFolder(opts.out); err != nil {
			return err
		}
		if err := writeWhole(filepath.Join(opts.out, "readback.txt"), plain.Bytes()); err != nil {
			return err
		}
		if err := writeWhole(filepath.Join(opts.out, "readback.json"), asJSON.Bytes()); err != nil {
			return err
		}
	}
	out := plain.Bytes()
	if opts.json {
		out = asJSON.Bytes()
	}
	if err := writeStdout(env, out); err != nil {
		return err
	}
	if bad {
		return failure{code: exitLimitMissed}
	}
	return nil
}

// readSheet reads one sheet and decides whether it belongs to the build.
func readSheet(path string, d *design.Design, force bool) (sheet.Filled, text.ReadSheet, error) {
	// Which part it is of has to be known before its rows are.
	f, err := sheet.ReadFile(path, nil)
	if err != nil {
		if errors.Is(err, sheet.ErrNotASheet) {
			return f, text.ReadSheet{}, err
		}
		if pe, ok := errors.AsType[*fs.PathError](err); ok {
			return f, text.ReadSheet{}, fileFailure("read", path, pe)
		}
		return f, text.ReadSheet{}, failure{exitFiles, err}
	}
	if f.Part == "" {
		f.Part = guessPart(f)
	}
	if f.Part != job.Transformer && (f.Part != job.Inductor || d.Inductor == nil) {
		return f, text.ReadSheet{}, fmt.Errorf("%s: is the sheet of a part %q, which the build does not have", path, f.Part)
	}
	hash, err := hashOf(d, f.Part)
	if err != nil {
		return f, text.ReadSheet{}, err
	}
	out := text.ReadSheet{Path: path, Part: f.Part, Forced: f.Design != hash}
	if out.Forced && !force {
		has := "design " + f.Design
		if f.Design == "" {
			has = "a machine block that is gone, so that its design is not known"
		}
		return f, out, fmt.Errorf("%s: has %s, the %s of this build is %s: give the build that the sheet was written from, or --force", path, has, f.Part, hash)
	}
	name := f.Part
	checks := checksOf(d, name)
	if f, err = sheet.ReadFile(path, checks); err != nil {
		return f, out, err
	}
	f.Part = name
	if f.Sheet != "" && !out.Forced && f.Sheet != sheet.Hash(hash, checks) {
		out.Notes = append(out.Notes, "its limits are not those of the build as it is now (tolerances or tests were edited): judged by the build")
	}
	for _, m := range f.Remarks {
		out.Notes = append(out.Notes, fmt.Sprintf("%s %s: %s", m.Code, m.Key, m.Text))
	}
	for _, u := range f.Unread {
		out.Unread = append(out.Unread, u.String())
	}
	out.Missing = f.Missing
	out.Samples = len(f.Samples)
	return f, out, nil
}

// guessPart tells the part of a sheet without its machine block by its rows.
func guessPart(f sheet.Filled) string {
	for _, s := range f.Samples {
		for _, r := range s.Readings {
			if r.ID == "E06" || r.ID == "E02a" {
				return job.Transformer
			}
		}
	}
	return job.Transformer
}

// samplesOf is all samples of one part.
type samplesOf struct {
	labels   []string
	verdicts []sheet.Verdict
	readings []sample.Readings
	typical  sample.Readings // their median: one odd sample does not move it
}

// gatherSamples judges every sheet by its own ambient temperature and puts the
// samples of all of them side by side.
func gatherSamples(checks []part.Check, sheets []sheet.Filled) *samplesOf {
	out := &samplesOf{}
	for k, f := range sheets {
		verdicts := sheet.Judge(checks, f)
		if k == 0 {
			out.verdicts = verdicts
		} else {
			for i := range verdicts {
				v := &out.verdicts[i]
				v.Values = append(v.Values, verdicts[i].Values...)
				v.Words = append(v.Words, verdicts[i].Words...)
			}
		}
		for j, s := range f.Samples {
			label := fmt.Sprintf("S%d", s.Number)
			if len(sheets) > 1 {
				label = fmt.Sprintf("%d:S%d", k+1, s.Number)
			}
			out.labels = append(out.labels, label)
			r := sample.Readings{}
			for _, v := range verdicts {
				if q, ok := sample.FromID(v.Check.ID); ok && v.Values[j] != nil {
					r[q] = *v.Values[j]
				}
			}
			for _, c := range checks {
				if c.Winding == "" {
					continue
				}
				if x, ok := f.Number("reel." + c.Winding); ok && x > 0 {
					r[sample.Reel(c.Winding)] = x * 1e-3
				}
			}
			out.readings = append(out.readings, r)
		}
	}
	if len(sheets) > 1 {
		for i := range out.verdicts {
			out.verdicts[i].Summarize()
		}
	}
	out.typical = sample.Median(out.readings)
	return out
}

// judgePart says what is wrong with a part and what to do about it.
func judgePart(d *design.Design, lib library, name string, set *samplesOf) (text.ReadPart, error) {
	p := text.ReadPart{Name: name, Labels: set.labels, Overall: sheet.Overall(set.verdicts)}
	var target *part.Check
	for i, v := range set.verdicts {
		c := v.Check
		p.Rows = append(p.Rows, text.ReadRow{
			ID: c.ID, Name: c.Name, Unit: c.Unit, Scale: c.Scale, Nominal: c.Nominal, Min: c.Min, Max: c.Max, Mean: v.Mean, Off: v.Nominal, Words: v.Words, Result: v.Result,
		})
		if c.ID == "E04" {
			target = &set.verdicts[i].Check
		}
	}
	diagnose(&p, d, name, set)
	c, _ := partOf(d, name)
	g := c.Core.Gap
	measured := set.typical[sample.Open]
	switch {
	case target == nil || target.Nominal == nil || measured == 0:
		p.NoGap = "there is no reading of the final inductance (E04)"
		return p, nil
	case p.Diagnosis != nil && notTheGap(p.Diagnosis):
		p.NoGap = fmt.Sprintf("the readings speak for \"%s\"; mend that first, a longer or shorter gap would only hide it", p.Diagnosis.Causes[0].Class)
		return p, nil
	}
	law, err := design.NewGapLaw(d.Job, name, c, gapReach(c), lib.tables())
	if err != nil {
		return p, err
	}
	tolerance := math.Min(1 - *target.Min / *target.Nominal, *target.Max / *target.Nominal - 1)
	correction, err := sample.Correct(g.Kind, math.Max(g.Total, g.Thickness), *target.Nominal, measured, tolerance, sample.Law(law), d.Job.Build.For(name).Gap.SpacerFoils)
	if err != nil {
		p.NoGap = err.Error()
		return p, nil
	}
	p.Correction = &correction
	return p, nil
}

// notTheGap reports whether the likely cause is one that the gap has nothing to
// do with and that moves the inductance.
func notTheGap(g *sample.Diagnosis) bool {
	first := g.Causes[0]
	if first.Probability < 0.8 {
		return false
	}
	switch first.Class {
	case sample.PrimaryTurn, sample.ShortedTurn:
		return true
	}
	return false
}

// spreadOf turns the tolerances of the job into standard deviations: a tolerance
// holds nearly all parts and is taken for two of them.
func spreadOf(d *design.Design, name string) sample.Spread {
	j := d.Job
	t := j.Build.Tolerances
	half := func(x [2]float64) float64 { return math.Max(x[0], x[1]) / 2 }
	s := sample.UsualSpread
	s.Permeability, s.Area = half(t.Permeability), half(t.CoreArea)
	c, _ := partOf(d, name)
	if g := c.Core.Gap; g.Kind == part.Ground && g.Governs != "length" && d.Job.Build.For(name).Gap.Governs != "length" {
		// A maker that grinds to A_L takes permeability and area into the gap.
		_, r := partOf(d, name)
		s.Permeability, s.Area = 0, 0.002
		if r.Gap.Sensitivity != 0 {
			s.Gap = alTolerance(d, name) / 2 / math.Abs(r.Gap.Sensitivity)
			return partSpread(s, d, name)
		}
	}
	s.Gap = t.GapLength.Above / 2
	if math.Max(c.Core.Gap.Total, c.Core.Gap.Thickness) <= t.GapLength.UpTo {
		s.Gap = t.GapLength.Is / 2
	}
	return partSpread(s, d, name)
}

// partSpread adds what does not depend on how the gap is made.
func partSpread(s sample.Spread, d *design.Design, name string) sample.Spread {
	j := d.Job
	t := j.Build.Tolerances
	half := func(x [2]float64) float64 { return math.Max(x[0], x[1]) / 2 }
	c, _ := partOf(d, name)
	if faces := c.Glue.Faces; faces != "" && faces != "none" {
		s.Glue = j.Build.For(name).Gap.GlueLine / 2
	}
	s.Leakage = half(shortTolerance(d))
	s.LeakageHalf = math.Max(0.005, j.Build.For(name).Limits.HalfMismatch/4)
	s.Resistance = math.Max(0.005, t.DCResistance.Up/4)
	s.Winding = math.Max(0.003, t.DCResistance.HalfToHalf/4)
	return s
}

func diagnose(p *text.ReadPart, d *design.Design, name string, set *samplesOf) {
	var known sample.Design
	var err error
	if name == job.Inductor {
		known, err = sample.NewInductorDesign(*d.Inductor, *d.InductorRating)
	} else {
		known, err = sample.NewDesign(*d.Transformer, *d.Rating)
	}
	if err != nil {
		p.NoCause = err.Error()
		return
	}
	c, _ := partOf(d, name)
	known.StrandsTotal = map[string]int{}
	for _, e := range c.Build {
		for _, of := range e.Of {
			known.StrandsTotal[of] = e.Wire.Strands * max(e.Parallel, 1)
		}
	}
	spread := spreadOf(d, name)
	g, err := sample.Explain(known, set.typical, spread)
	if err != nil {
		p.NoCause = err.Error()
		return
	}
	p.Diagnosis = &g
	if len(set.readings) < 2 {
		return
	}
	for i, r := range set.readings {
		one, err := sample.Explain(known, r, spread)
		if err != nil {
			continue
		}
		if a, b := one.Causes[0], g.Causes[0]; a.Class != b.Class && a.Class != sample.NoFault && a.Probability > 0.5 {
			p.Odd = append(p.Odd, fmt.Sprintf("sample %s by itself: %s (%.0f %%): %s", set.labels[i], a.Class, a.Probability*100, a.Text))
		}
	}
}

// rebuildTank makes the tank as built of each sample and of their mean, and
// solves every corner again with the mean.
func rebuildTank(ctx context.Context, r *text.ReadbackReport, d *design.Design, lib library, rows map[string]*samplesOf) error {
	transformer := rows[job.Transformer]
	if transformer == nil {
		r.Why = "no sheet of the transformer was given"
		return nil
	}
	lext, from := sample.Uncertain{}, "The leakage of the transformer is all of Lr."
	if d.Inductor != nil {
		lext.Value = d.InductorRating.OpenInductance
		lext.Sigma = math.Max(d.Job.Build.Tolerances.InductorInductance[0], d.Job.Build.Tolerances.InductorInductance[1]) / 2 * lext.Value
		from = "The resonant inductor is taken as designed, with its tolerance: no sheet of it has a reading of L (E04)."
		if set := rows[job.Inductor]; set != nil && set.typical[sample.Open] > 0 {
			lext = meanOf(set.readings, sample.Open, sample.BenchMeter.Inductance)
			from = "The resonant inductor counts with the mean of its samples."
		}
	}
	r.Lext = from
	stray := d.Job.Tank.StrayInductance
	var list []sample.AsBuilt
	for i, x := range transformer.readings {
		s := text.SampleTank{Label: transformer.labels[i]}
		a, err := sample.Close(x, sample.BenchMeter, stray)
		if err != nil {
			s.Problem = strings.ReplaceAll(err.Error(), "\n", "; ")
			r.Samples = append(r.Samples, s)
			continue
		}
		list = append(list, a)
		s.Lm, s.Ratio, s.Notes = a.Lm, a.Ratio, a.Notes
		s.Lr = sample.Uncertain{Value: a.Leak.Value + lext.Value, Sigma: math.Hypot(a.Leak.Sigma, lext.Sigma)}
		r.Samples = append(r.Samples, s)
	}
	if len(list) == 0 {
		r.Why = "no sample of the transformer has the readings that it takes: Lp (E04), Lsc (E06, E07) and Ls (E05) or the ratio with the secondary driven (E02b)"
		return nil
	}
	mean := sample.MeanAsBuilt(list)
	r.Known = true
	r.Lm, r.Ratio = mean.Lm, mean.Ratio
	r.Lr = sample.Uncertain{Value: mean.Leak.Value + lext.Value, Sigma: math.Hypot(mean.Leak.Sigma, lext.Sigma)}
	var err error
	r.Built, r.Corners, r.Verdicts, err = design.SolveSamples(ctx, d, lib.tables(), r.Lr.Value, r.Lm.Value, r.Ratio.Value)
	return err
}

// meanOf is the mean of one reading over the samples that have it.
func meanOf(list []sample.Readings, q sample.Quantity, meter float64) sample.Uncertain {
	var samples []sample.AsBuilt
	for _, r := range list {
		if v := r[q]; v > 0 {
			samples = append(samples, sample.AsBuilt{Lm: sample.Uncertain{Value: v, Sigma: v * meter}})
		}
	}
	return sample.MeanAsBuilt(samples).Lm
}
