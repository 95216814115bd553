package main

import (
	"bytes"
	"context"

	"github.com/spf13/cobra"

	"gapwright/magnetics/window"
	"gapwright/reports/text"
)

type windowOptions struct {
	file string
	json bool
}

func newWindowCommand(env environment) *cobra.Command {
	var opts windowOptions
	c := &cobra.Command{
		Use:   "window FILE",
		Short: "Field, leakage and AC resistance of one winding window drawn by hand",
		Long: `window computes the magnetic field in one winding window, or at the winding
head, from the places of its conductors: field energy (leakage), mean square
field, inductance with gaps, and AC resistance of round wires and foils.

It is meant for a special former or an unusual arrangement, and to check the
field kernel from outside. FILE is a window file, or - for standard input.
Without --json it prints a table; energies and resistances are at the stated
peak currents.

A window file, x across the window from the post, y along the breadth:

  format: 1
  window:
    breadth: 18 mm
    depth: 6 mm
    geometry: planar                # or round-post, then post_radius
    surround: core                  # or head: the post plane only
    post_half_width: 5 mm           # planar with gaps
    gaps: [{center: 8 mm, length: 0.5 mm}]
    outer_gaps: []                  # a spacer under all legs
    ungapped_inductance: 500 uH     # per turn squared, of the core alone
    conductivity: 58 MS/m
  windings:
    - {name: P, ampere_turns: 1, block: {x: [3 mm, 5 mm], y: [1 mm, 17 mm]}, grid: [4, 8]}
    - {name: Q, current: 1 A, round_wires: {diameter: 0.5 mm, first: [1 mm, 1.3 mm],
       layers: 2, layer_pitch: 0.56 mm, turns_per_layer: 28, turn_pitch: 0.56 mm}}
    - {name: R, current: 1 A, foils: {thickness: 0.1 mm, count: 4, first_x: 2.2 mm,
       pitch: 0.15 mm, y: [1 mm, 17 mm]}}
  frequencies: [50 kHz, 100 kHz]
` + exitCodesHelp,
		Example: `  gapwright window window.yaml
  gapwright window window.yaml --json | jq .rac_over_rdc`,
		Args: cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			opts.file = args[0]
			return runWindow(cmd.Context(), opts, env)
		},
	}
	c.Flags().BoolVar(&opts.json, "json", false, "print the result as JSON, in SI units")
	return c
}

func runWindow(ctx context.Context, opts windowOptions, env environment) error {
	name, data, err := readInput(opts.file, env)
	if err != nil {
		return err
	}
	f, err := window.Read(name, data)
	if err != nil {
		return err
	}
	r, err := window.Solve(f)
	if err != nil {
		return err
	}
	if err := ctx.Err(); err != nil {
		return err
	}
	var out bytes.Buffer
	if opts.json {
		err = text.WindowJSON(&out, r)
	} else {
		err = text.Window(text.NewPrinter(&out, env.utf8, env.width), r)
	}
	if err != nil {
		return err
	}
	return writeStdout(env, out.Bytes())
}
