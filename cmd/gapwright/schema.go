package main

import (
	"context"

	"github.com/spf13/cobra"

	"gapwright/magnetics/job"
)

func newSchemaCommand(env environment) *cobra.Command {
	return &cobra.Command{
		Use:   "schema",
		Short: "Print the JSON Schema of the job file, for editors",
		Long: `schema prints the JSON Schema (draft 2020-12) of the job file. Editors that know
it complete keys and mark mistakes while you type. The reader itself is
stricter: it also finds contradictions between keys.
` + exitCodesHelp,
		Example: `  gapwright schema > job.schema.json`,
		Args:    cobra.NoArgs,
		RunE:    func(c *cobra.Command, _ []string) error { return runSchema(c.Context(), env) },
	}
}

func runSchema(_ context.Context, env environment) error { return writeStdout(env, job.Schema()) }
