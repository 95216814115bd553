package main

import (
	"bytes"
	"context"

	"github.com/spf13/cobra"

	"gapwright/magnetics/design"
	"gapwright/reports/text"
)

type explainOptions struct {
	quantity string
	build    string
	corner   string
	json     bool
	library  []string
}

func newExplainCommand(env environment) *cobra.Command {
	var opts explainOptions
	c := &cobra.Command{
		Use:   "explain [QUANTITY] BUILD",
		Short: "Where a figure comes from: formula, inputs with origin, source, sensitivities",
		Long: `explain prints the formula of a figure of the report, every input with its unit
and where it came from (job, default, build file, table row), the model and its
source, and what a change of one per cent of each input does to it, with parts,
tank, losses and heat computed again.

Without QUANTITY it lists the names. BUILD is a file, or - for standard input.
` + exitCodesHelp,
		Example: `  gapwright explain transformer.short_inductance build/build.yaml
  gapwright explain tank.peak_gain_margin build/build.yaml --corner hold-up
  gapwright explain build/build.yaml`,
		Args: cobra.RangeArgs(1, 2),
		RunE: func(cmd *cobra.Command, args []string) error {
			opts.build = args[len(args)-1]
			if len(args) == 2 {
				opts.quantity = args[0]
			}
			return runExplain(cmd.Context(), opts, env)
		},
	}
	c.Flags().StringVar(&opts.corner, "corner", "", "`name` of the corner; without it the first continuous one")
	c.Flags().BoolVar(&opts.json, "json", false, "print it as JSON, in SI units")
	addLibraryFlag(c, &opts.library)
	return c
}

func runExplain(ctx context.Context, opts explainOptions, env environment) error {
	lib, d, err := checkBuild(ctx, opts.build, opts.library, env)
	if err != nil {
		return designFailure(env, opts.json, d, err)
	}
	var out bytes.Buffer
	if opts.quantity == "" {
		names := design.Quantities(d)
		if opts.json {
			err = text.JSON(&out, names)
		} else {
			err = text.Quantities(text.NewPrinter(&out, env.utf8, env.width), names)
		}
		if err != nil {
			return err
		}
		return writeStdout(env, out.Bytes())
	}
	e, err := design.Explain(ctx, d, opts.quantity, opts.corner, lib.tables())
	if err != nil {
		return err
	}
	if opts.json {
		err = text.ExplainJSON(&out, e)
	} else {
		err = text.Explain(text.NewPrinter(&out, env.utf8, env.width), e)
	}
	if err != nil {
		return err
	}
	return writeStdout(env, out.Bytes())
}
