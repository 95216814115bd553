package main

import (
	"bytes"
	"context"
	"fmt"

	"github.com/spf13/cobra"

	"gapwright/corelib/quantity"
	"gapwright/reports/text"
)

type materialsOptions struct {
	name        string
	temperature string
	library     []string
	json        bool
}

func newMaterialsCommand(env environment) *cobra.Command {
	var opts materialsOptions
	c := &cobra.Command{
		Use:   "materials [NAME]",
		Short: "The table of ferrites: list it, or show one with every figure and source",
		Long: `materials lists the ferrites, named by their class in IEC 61332, or shows one:
saturation and permeability against temperature, loss sets with their ranges,
residuals and sources, and a table of losses.

Losses of the default ferrite rest on open measured data at 25 degC; what is
hotter follows from catalogue ratios that are from memory, good to +-25 %. Fit
loss points of the ferrite you buy with 'gapwright fit' and add them with
--library.
` + exitCodesHelp,
		Example: `  gapwright materials
  gapwright materials PW3 --temperature 90degC`,
		Args: cobra.MaximumNArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			if len(args) > 0 {
				opts.name = args[0]
			}
			return runMaterials(cmd.Context(), opts, env)
		},
	}
	c.Flags().StringVar(&opts.temperature, "temperature", "100degC", "`temperature` of the table of losses")
	c.Flags().BoolVar(&opts.json, "json", false, "print every figure as JSON, in SI units")
	addLibraryFlag(c, &opts.library)
	return c
}

func runMaterials(_ context.Context, opts materialsOptions, env environment) error {
	temp, err := quantity.Parse(opts.temperature, quantity.Celsius)
	if err != nil {
		return failure{exitUsage, fmt.Errorf("--temperature: %w", err)}
	}
	lib, err := openLibrary(opts.library)
	if err != nil {
		return err
	}
	list := lib.materials.All()
	if opts.name != "" {
		m, err := lib.materials.Find(opts.name)
		if err != nil {
			return err
		}
		list = list[:0]
		list = append(list, m)
		if _, err := m.LossDensity(100e3, 0.1, temp); err != nil {
			return failure{exitUsage, fmt.Errorf("--temperature: %w", err)}
		}
	}
	var out bytes.Buffer
	p := text.NewPrinter(&out, env.utf8, env.width)
	switch {
	case opts.json:
		err = text.MaterialsJSON(&out, list)
	case opts.name != "":
		err = text.Material(p, list[0], temp)
	default:
		err = text.Materials(p, list)
	}
	if err != nil {
		return err
	}
	return writeStdout(env, out.Bytes())
}
