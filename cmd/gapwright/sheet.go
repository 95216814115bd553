package main

import (
	"bytes"
	"context"
	"path/filepath"

	"github.com/spf13/cobra"

	"gapwright/reports/text"
)

type sheetOptions struct {
	build   string
	out     string
	library []string
	force   bool
}

func newSheetCommand(env environment) *cobra.Command {
	var opts sheetOptions
	c := &cobra.Command{
		Use:   "sheet BUILD --out DIR",
		Short: "Write the winding sheets of a build file",
		Long: `sheet rates the parts of a build file as they stand there and writes one
winding sheet per part: a workbook (xlsx) that the shop winds from and fills in,
and its drawings as SVG in the folder figures.

Pale yellow cells are the shop's. "gapwright readback" reads them back. A sheet
in DIR that has been filled in is not written over, unless --force says so.
BUILD is a file, or - for standard input.
` + exitCodesHelp,
		Example: `  gapwright sheet parts/build.yaml --out parts`,
		Args:    cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			opts.build = args[0]
			return runSheet(cmd.Context(), opts, env)
		},
	}
	c.Flags().StringVar(&opts.out, "out", "", "`folder` to write into; it is made when it is not there")
	c.Flags().BoolVar(&opts.force, "force", false, "write over sheets that have been filled in")
	addLibraryFlag(c, &opts.library)
	if err := c.MarkFlagRequired("out"); err != nil {
		panic(err)
	}
	return c
}

func runSheet(ctx context.Context, opts sheetOptions, env environment) error {
	lib, d, err := checkBuild(ctx, opts.build, opts.library, env)
	if err != nil {
		return designFailure(env, false, d, err)
	}
	if err := writeSheets(opts.out, d, lib, opts.force); err != nil {
		return err
	}
	var out bytes.Buffer
	p := text.NewPrinter(&out, env.utf8, env.width)
	for _, name := range partsOf(d) {
		p.Line("wrote %s", filepath.Join(opts.out, sheetFile(name)))
	}
	p.Line("drawings in %s", filepath.Join(opts.out, "figures"))
	missed := 0
	for _, v := range d.Verdicts {
		if !v.Pass {
			missed++
		}
	}
	if missed > 0 {
		p.Paragraph(0, "%d limit(s) of the job are missed by this build: run gapwright check on it before the sheets leave the house.", missed)
	}
	if err := p.Err(); err != nil {
		return err
	}
	if err := writeStdout(env, out.Bytes()); err != nil {
		return err
	}
	if missed > 0 {
		return failure{code: exitLimitMissed}
	}
	return nil
}
