package main

import (
	"context"
	"fmt"
	"os"

	"github.com/spf13/cobra"

	"gapwright/magnetics/job"
)

type newOptions struct {
	file  string
	force bool
}

func newNewCommand(env environment) *cobra.Command {
	var opts newOptions
	c := &cobra.Command{
		Use:   "new [FILE]",
		Short: "Write a commented starter job",
		Long: `new writes a job file to begin with: an example tank with its corners, and
every key of the build section with its default behind a # sign. Without FILE,
or with -, it goes to standard output. An existing file is kept unless --force
is given.
` + exitCodesHelp,
		Example: `  gapwright new job.yaml
  gapwright new | less`,
		Args: cobra.MaximumNArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			opts.file = "-"
			if len(args) == 1 {
				opts.file = args[0]
			}
			return runNew(c.Context(), opts, env)
		},
	}
	c.Flags().BoolVar(&opts.force, "force", false, "overwrite an existing file")
	return c
}

func runNew(_ context.Context, opts newOptions, env environment) error {
	if opts.file == "-" {
		return writeStdout(env, job.Starter())
	}
	if _, err := os.Lstat(opts.file); err == nil && !opts.force {
		return failure{exitFiles, fmt.Errorf("%s exists already; use --force to overwrite it", opts.file)}
	}
	if err := writeWhole(opts.file, job.Starter()); err != nil {
		return err
	}
	fmt.Fprintf(env.stderr, "wrote %s; put your tank into it, then run: gapwright tank %s\n", opts.file, opts.file)
	return nil
}

// writeStdout writes a finished text to standard output.
func writeStdout(env environment, data []byte) error {
	if _, err := env.stdout.Write(data); err != nil {
		return fileFailure("write", "standard output", err)
	}
	return nil
}
