package main

import (
	"bytes"
	"context"
	"runtime"

	"github.com/spf13/cobra"
	"golang.org/x/sync/errgroup"

	"gapwright/magnetics/job"
	"gapwright/reports/text"
	"gapwright/tank"
)

type tankOptions struct {
	job  string
	json bool
}

func newTankCommand(env environment) *cobra.Command {
	var opts tankOptions
	c := &cobra.Command{
		Use:   "tank JOB",
		Short: "Solve every corner: frequency, currents, flux, soft switching",
		Long: `tank solves the periodic steady state of the job's tank at every corner, exactly:
no harmonic or triangular approximation. A corner with an output voltage gets
the frequency that gives it, a corner with a frequency gets its output.

A corner that cannot be served is reported with the reason and the nearest
reachable value, and makes the exit code 1. JOB is a file, or - for standard
input.
` + exitCodesHelp,
		Example: `  gapwright new job.yaml && gapwright tank job.yaml
  gapwright tank job.yaml --json | jq '.corners[].frequency'`,
		Args: cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			opts.job = args[0]
			return runTank(cmd.Context(), opts, env)
		},
	}
	c.Flags().BoolVar(&opts.json, "json", false, "print the corners as JSON, in SI units")
	return c
}

func runTank(ctx context.Context, opts tankOptions, env environment) error {
	name, data, err := readInput(opts.job, env)
	if err != nil {
		return err
	}
	j, err := job.Read(name, data)
	if err != nil {
		return err
	}
	r := text.TankReport{Title: j.Title, Tank: j.Tank}
	if r.Corners, err = tank.SolveAll(ctx, j.Tank, j.Corners); err != nil {
		return err
	}
	if r.Figures, err = tank.Describe(j.Tank, r.Corners); err != nil {
		return err
	}
	if r.Reach, err = reaches(ctx, j.Tank, r.Corners); err != nil {
		return err
	}
	var out bytes.Buffer
	if opts.json {
		err = text.TankJSON(&out, r)
	} else {
		err = text.Tank(text.NewPrinter(&out, env.utf8, env.width), r)
	}
	if err != nil {
		return err
	}
	if err := writeStdout(env, out.Bytes()); err != nil {
		return err
	}
	for k := range r.Corners {
		if r.Corners[k].Status != tank.OK {
			return failure{code: exitLimitMissed}
		}
	}
	return nil
}

// reaches returns the largest Lm for soft switching of each corner that is
// served, nil without a dead time.
func reaches(ctx context.Context, t tank.Tank, corners []tank.Operation) ([]tank.Reach, error) {
	if t.DeadTime == 0 {
		return nil, nil
	}
	list := make([]tank.Reach, len(corners))
	g, ctx := errgroup.WithContext(ctx)
	g.SetLimit(runtime.GOMAXPROCS(0))
	for k := range corners {
		if corners[k].Status != tank.OK {
			continue
		}
		g.Go(func() error {
			if err := ctx.Err(); err != nil {
				return err
			}
			var err error
			list[k], err = tank.LargestMagnetizing(t, corners[k].Corner)
			return err
		})
	}
	return list, g.Wait()
}
