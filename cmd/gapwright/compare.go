package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"gapwright/corelib/shape"
	"gapwright/magnetics/design"
	"gapwright/magnetics/job"
	"gapwright/reports/text"
)

type compareOptions struct {
	job     string
	demo    bool
	csv     bool
	json    bool
	rows    text.Comparison
	library []string
}

func newCompareCommand(env environment) *cobra.Command {
	var opts compareOptions
	c := &cobra.Command{
		Use:   "compare JOB",
		Short: "One row per core size for both parts, and what limits each",
		Long: `compare makes the design of a job and lists every core size that was searched:
turns, gap, flux density, losses, hot spot, height left, mass, the share of the
resonant inductance that is leakage, and the limit that stops the size (or, when
it keeps all, the one it is nearest to), with value and bound. Then it says what
the next smaller size misses, which pairs nothing beats in both loss and volume,
and, when no pair keeps every limit, which single changes would repair that.
JOB is a file, or - for standard input.
` + exitCodesHelp,
		Example: `  gapwright compare job.yaml --family PQ --family RM
  gapwright compare job.yaml --part transformer --top 5 --sort loss
  gapwright compare --demo --csv > sizes.csv`,
		Args: func(cmd *cobra.Command, args []string) error {
			switch {
			case opts.demo && len(args) > 0:
				return errors.New("--demo brings its own job: leave JOB out")
			case !opts.demo && len(args) != 1:
				return errors.New("give one JOB file, - for standard input, or --demo")
			case opts.csv && opts.json:
				return errors.New("--csv and --json: give one of them")
			case opts.rows.Top < 0:
				return fmt.Errorf("--top %d: give a number of rows, or 0 for all", opts.rows.Top)
			case !slices.Contains(text.SortKeys(), opts.rows.Sort):
				return fmt.Errorf("--sort %s: write one of %s", opts.rows.Sort, strings.Join(text.SortKeys(), ", "))
			case opts.rows.Part != "" && opts.rows.Part != job.Transformer && opts.rows.Part != job.Inductor:
				return fmt.Errorf("--part %s: write %s or %s", opts.rows.Part, job.Transformer, job.Inductor)
			}
			for _, f := range opts.rows.Families {
				if !slices.Contains(shape.Families(), f) && len(opts.library) == 0 {
					return fmt.Errorf("--family %s: write one of %s", f, strings.Join(shape.Families(), ", "))
				}
			}
			return nil
		},
		RunE: func(cmd *cobra.Command, args []string) error {
			if !opts.demo {
				opts.job = args[0]
			}
			return runCompare(cmd.Context(), opts, env)
		},
	}
	f := c.Flags()
	f.BoolVar(&opts.demo, "demo", false, "take the built-in example job")
	f.StringSliceVar(&opts.rows.Families, "family", nil, "list sizes of this `family` only; may be repeated")
	f.StringVar(&opts.rows.Part, "part", "", "list this `part` only: transformer or inductor")
	f.StringVar(&opts.rows.Sort, "sort", "volume", "sort rows by this `key`: "+strings.Join(text.SortKeys(), ", "))
	f.IntVar(&opts.rows.Top, "top", 0, "list so many rows of each part, those that keep every limit first; 0: all")
	f.BoolVar(&opts.csv, "csv", false, "print the rows as CSV, units in the heading")
	f.BoolVar(&opts.json, "json", false, "print the comparison as JSON, in SI units")
	addLibraryFlag(c, &opts.library)
	return c
}

func runCompare(ctx context.Context, opts compareOptions, env environment) error {
	j := job.Demo()
	if !opts.demo {
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
	var none *design.InfeasibleError
	if err != nil && !errors.As(err, &none) {
		return designFailure(env, opts.json, d, err)
	}
	var out bytes.Buffer
	var printErr error
	switch {
	case opts.json:
		printErr = text.CompareJSON(&out, d, opts.rows)
	case opts.csv:
		printErr = text.CompareCSV(&out, d, opts.rows)
	default:
		printErr = text.Compare(text.NewPrinter(&out, env.utf8, env.width), d, opts.rows)
	}
	if printErr != nil {
		return printErr
	}
	if err := writeStdout(env, out.Bytes()); err != nil {
		return err
	}
	if err != nil || !d.Feasible {
		return failure{exitLimitMissed, err}
	}
	return nil
}
