package main

import (
	"bytes"
	"context"
	"fmt"

	"github.com/spf13/cobra"

	"gapwright/magnetics/tolerance"
	"gapwright/reports/text"
)

type yieldOptions struct {
	build   string
	builds  int
	seed    uint64
	spread  string
	json    bool
	library []string
}

// How many builds a yield may ask for.
const (
	fewestBuilds = 10
	mostBuilds   = 1_000_000
)

func newYieldCommand(env environment) *cobra.Command {
	opts := yieldOptions{builds: 2000, seed: 1, spread: string(tolerance.Uniform)}
	c := &cobra.Command{
		Use:   "yield BUILD",
		Short: "What the tolerances do: bands, share of builds that work, what to tighten",
		Long: `yield puts the converter of a build file together many times, each with its own
inductances, leakage, resonant capacitor, dead time, node capacitance and
warmth within the tolerances of the job, and solves the exact tank of each at
every corner. It prints the bands of Lp, Lr, resonance, frequency, gain margin
and soft switching, the share of builds that work, which tolerance costs the
yield, and what half and twice of each would do.

Where a gap is ordered by its A_L, that is what spreads; where its length
governs, and with films, gap, permeability and core area do. The same seed gives
the same result on any machine. BUILD is a file, or - for standard input.
` + exitCodesHelp,
		Example: `  gapwright yield parts/build.yaml
  gapwright yield parts/build.yaml --builds 10000 --spread normal
  gapwright yield parts/build.yaml --json | jq .works`,
		Args: cobra.ExactArgs(1),
		PreRunE: func(*cobra.Command, []string) error {
			if opts.builds < fewestBuilds || opts.builds > mostBuilds {
				return fmt.Errorf("--builds %d: between %d and %d, please", opts.builds, fewestBuilds, mostBuilds)
			}
			if opts.spread != string(tolerance.Uniform) && opts.spread != string(tolerance.Normal) {
				return fmt.Errorf("--spread %s: uniform or normal", opts.spread)
			}
			return nil
		},
		RunE: func(cmd *cobra.Command, args []string) error {
			opts.build = args[0]
			return runYield(cmd.Context(), opts, env)
		},
	}
	c.Flags().IntVar(&opts.builds, "builds", opts.builds, "`number` of builds")
	c.Flags().Uint64Var(&opts.seed, "seed", opts.seed, "`number` that the random builds start from")
	c.Flags().StringVar(&opts.spread, "spread", opts.spread, "`how` values lie between their tolerances: uniform, or normal with the tolerance at three sigma")
	c.Flags().BoolVar(&opts.json, "json", false, "print the result as JSON, in SI units")
	addLibraryFlag(c, &opts.library)
	return c
}

func runYield(ctx context.Context, opts yieldOptions, env environment) error {
	lib, d, err := checkBuild(ctx, opts.build, opts.library, env)
	if err != nil {
		return designFailure(env, opts.json, d, err)
	}
	m, err := tolerance.New(d, lib.tables())
	if err != nil {
		return err
	}
	bar := newProgress(env)
	bar.what = "build %d of %d "
	r, err := m.Run(ctx, tolerance.Options{Builds: opts.builds, Seed: opts.seed, Spread: tolerance.Spread(opts.spread)}, bar.report)
	bar.done()
	if err != nil {
		return err
	}
	var out bytes.Buffer
	if opts.json {
		err = text.YieldJSON(&out, r)
	} else {
		err = text.Yield(text.NewPrinter(&out, env.utf8, env.width), r)
	}
	if err != nil {
		return err
	}
	if err := writeStdout(env, out.Bytes()); err != nil {
		return err
	}
	if !d.Feasible {
		return failure{exitLimitMissed, fmt.Errorf("the design misses a limit even as designed: see gapwright check")}
	}
	return nil
}
