package main

import (
	"context"

	"github.com/spf13/cobra"

	"gapwright/magnetics/design"
	"gapwright/magnetics/job"
)

type checkOptions struct {
	build   string
	json    bool
	library []string
}

func newCheckCommand(env environment) *cobra.Command {
	var opts checkOptions
	c := &cobra.Command{
		Use:   "check BUILD",
		Short: "Rate an edited build again: the parts as they are, no decision changed",
		Long: `check reads a build file, rates both parts as they stand in it at every corner,
solves the tank as built and holds every limit of the job against the result.
A gap edited by hand is kept: the inductance comes out as it does, with a
verdict. BUILD is a file, or - for standard input.
` + exitCodesHelp,
		Example: `  gapwright check build/build.yaml
  gapwright check build/build.yaml --json | jq '.verdicts[] | select(.pass | not)'`,
		Args: cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			opts.build = args[0]
			return runCheck(cmd.Context(), opts, env)
		},
	}
	c.Flags().BoolVar(&opts.json, "json", false, "print the design as JSON, in SI units")
	addLibraryFlag(c, &opts.library)
	return c
}

func runCheck(ctx context.Context, opts checkOptions, env environment) error {
	_, d, err := checkBuild(ctx, opts.build, opts.library, env)
	if err != nil {
		return designFailure(env, opts.json, d, err)
	}
	return printDesign(env, d, opts.json, "")
}

// checkBuild reads a build file and rates it.
func checkBuild(ctx context.Context, path string, folders []string, env environment) (library, *design.Design, error) {
	name, data, err := readInput(path, env)
	if err != nil {
		return library{}, nil, err
	}
	b, err := job.ReadBuild(name, data)
	if err != nil {
		return library{}, nil, err
	}
	lib, err := openLibrary(append(b.Job.Build.Library, folders...))
	if err != nil {
		return lib, nil, err
	}
	applyOwnWires(&b, lib)
	if err := knownNames(b, lib); err != nil {
		return lib, nil, err
	}
	d, err := design.Check(ctx, b.Job, b.Transformer, b.Inductor, lib.tables())
	return lib, d, err
}

// applyOwnWires gives the wires of a build the figures of the user's own rows.
func applyOwnWires(b *job.BuildFile, lib library) {
	for i := range b.Transformer.Build {
		e := &b.Transformer.Build[i]
		e.Wire = lib.wires.Apply(e.Wire)
	}
	if b.Inductor != nil {
		for i := range b.Inductor.Build {
			e := &b.Inductor.Build[i]
			e.Wire = lib.wires.Apply(e.Wire)
		}
	}
}

// knownNames reports names that no table holds, at their place in the file.
func knownNames(b job.BuildFile, lib library) error {
	check := func(which, shape, material string) error {
		if _, err := lib.shapes.Find(shape); err != nil {
			return b.Fault(which+".core.shape", "%v", err)
		}
		if _, err := lib.materials.Find(material); err != nil {
			return b.Fault(which+".core.material", "%v", err)
		}
		return nil
	}
	if err := check("transformer", b.Transformer.Core.Shape, b.Transformer.Core.Material); err != nil {
		return err
	}
	if b.Inductor != nil {
		return check("inductor", b.Inductor.Core.Shape, b.Inductor.Core.Material)
	}
	return nil
}
