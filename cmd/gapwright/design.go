package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"path/filepath"

	"github.com/spf13/cobra"

	"gapwright/magnetics/design"
	"gapwright/magnetics/job"
	"gapwright/reports/text"
)

type designOptions struct {
	job     string
	demo    bool
	out     string
	json    bool
	force   bool
	library []string
}

func newDesignCommand(env environment) *cobra.Command {
	var opts designOptions
	c := &cobra.Command{
		Use:   "design JOB --out DIR",
		Short: "Choose both parts, prove the tank as built, write build file and winding sheets",
		Long: `design solves the tank at every corner, chooses core, gap, turns, wire and layers
of the transformer and of the resonant inductor, rates both at every corner,
puts the parts as built back into the tank and solves it again until nothing
moves. It prints a summary and writes into DIR:

  build.yaml                         the parts as decided; edit it and run check
  winding-sheet-transformer.xlsx     what the shop winds and measures
  winding-sheet-inductor.xlsx        likewise; absent when leakage does its work
  figures/*.svg                      the drawings of the sheets
  design.json                        every figure, SI units
  design.html                        the page for people: one file, works offline and on paper

A sheet in DIR that somebody has filled in is not overwritten without --force.
JOB is a file, or - for standard input.
` + exitCodesHelp,
		Example: `  gapwright design --demo --out build
  gapwright new job.yaml && gapwright design job.yaml --out parts`,
		Args: func(cmd *cobra.Command, args []string) error {
			switch {
			case opts.demo && len(args) > 0:
				return errors.New("--demo brings its own job: leave JOB out")
			case !opts.demo && len(args) != 1:
				return errors.New("give one JOB file, - for standard input, or --demo")
			}
			return nil
		},
		RunE: func(cmd *cobra.Command, args []string) error {
			if !opts.demo {
				opts.job = args[0]
			}
			return runDesign(cmd.Context(), opts, env)
		},
	}
	f := c.Flags()
	f.BoolVar(&opts.demo, "demo", false, "take the built-in example job")
	f.StringVarP(&opts.out, "out", "o", "", "write build file, sheets and design.json into this `folder`")
	f.BoolVar(&opts.json, "json", false, "print the design as JSON, in SI units")
	f.BoolVar(&opts.force, "force", false, "overwrite sheets that were filled in")
	addLibraryFlag(c, &opts.library)
	return c
}

func runDesign(ctx context.Context, opts designOptions, env environment) error {
	var j job.Job
	if opts.demo {
		j = job.Demo()
	} else {
		name, data, err := readInput(opts.job, env)
		if err != nil {
			return err
		}
		if j, err = job.Read(name, data); err != nil {
			return err
		}
	}
	lib, err := openLibrary(append(j.Build.Library, opts.library...))
	if err != nil {
		return err
	}
	bar := newProgress(env)
	d, err := design.Run(ctx, j, lib.tables(), bar.report)
	bar.done()
	if err != nil {
		if err := writeFailurePage(ctx, opts.out, d, lib, err); err != nil {
			return err
		}
		return designFailure(env, opts.json, d, err)
	}
	if opts.out != "" {
		if err := writeDesign(ctx, opts.out, d, lib, opts.force); err != nil {
			return err
		}
	}
	return printDesign(env, d, opts.json, opts.out)
}

// tables returns the library as the design takes it.
func (l library) tables() design.Tables {
	return design.Tables{Shapes: l.shapes, Ferrites: l.materials, Wires: l.wires}
}

// designFailure reports work that ended without parts: what is known goes to
// stdout, why to stderr.
func designFailure(env environment, asJSON bool, d *design.Design, err error) error {
	var tankErr *design.TankError
	var none *design.InfeasibleError
	if d == nil || !errors.As(err, &tankErr) && !errors.As(err, &none) {
		return err
	}
	var out bytes.Buffer
	var printErr error
	switch {
	case asJSON:
		printErr = text.DesignJSON(&out, d)
	case tankErr != nil:
		report := text.TankReport{Title: d.Job.Title, Tank: d.Job.Tank, Corners: d.Wanted}
		printErr = text.Tank(text.NewPrinter(&out, env.utf8, env.width), report)
	default:
		printErr = text.Ladder(text.NewPrinter(&out, env.utf8, env.width), d)
	}
	if printErr == nil && !asJSON {
		out.WriteByte('\n')
		printErr = text.Advice(text.NewPrinter(&out, env.utf8, env.width), d)
	}
	if printErr != nil {
		return printErr
	}
	if err := writeStdout(env, out.Bytes()); err != nil {
		return err
	}
	return failure{exitLimitMissed, err}
}

// printDesign prints the summary; a missed limit is exit code 1.
func printDesign(env environment, d *design.Design, asJSON bool, folder string) error {
	var out bytes.Buffer
	var err error
	if asJSON {
		err = text.DesignJSON(&out, d)
	} else {
		err = text.Design(text.NewPrinter(&out, env.utf8, env.width), d, folder)
	}
	if err != nil {
		return err
	}
	if err := writeStdout(env, out.Bytes()); err != nil {
		return err
	}
	if !d.Feasible {
		return failure{code: exitLimitMissed}
	}
	return nil
}

// buildFileOf is the build file of a design.
func buildFileOf(d *design.Design) job.BuildFile {
	return job.BuildFile{MadeWith: fmt.Sprintf("gapwright %s, tables %s", version, tablesVersion), Job: d.Job, Transformer: *d.Transformer, Inductor: d.Inductor}
}

// writeDesign writes everything into the folder: first what may be refused,
// then the rest, each file whole.
func writeDesign(ctx context.Context, folder string, d *design.Design, lib library, force bool) error {
	build, err := job.WriteBuild(buildFileOf(d))
	if err != nil {
		return err
	}
	var js bytes.Buffer
	if err := text.DesignJSON(&js, d); err != nil {
		return err
	}
	html, err := newPage(ctx, d, lib, nil)
	if err != nil {
		return err
	}
	if err := makeFolder(folder); err != nil {
		return err
	}
	if err := writeSheets(folder, d, lib, force); err != nil {
		return err
	}
	if err := writeWhole(filepath.Join(folder, "build.yaml"), build); err != nil {
		return err
	}
	if err := writeWhole(filepath.Join(folder, pageName), html); err != nil {
		return err
	}
	return writeWhole(filepath.Join(folder, "design.json"), js.Bytes())
}
