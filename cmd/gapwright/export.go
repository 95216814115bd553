package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"path/filepath"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"gapwright/magnetics/design"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/reports/circuit"
	"gapwright/reports/text"
	"gapwright/tank"
)

type exportOptions struct {
	build   string
	out     string
	part    string
	corner  string
	json    bool
	library []string
}

// What an export can write beside the parts, each a converter to run.
const (
	exportConverter = "converter" // with the parts as built
	exportNominal   = "nominal"   // with the tank of the job, no parts
)

// nominalPeriods is how long the converter with the tank of the job runs: it
// starts in its steady state, so what moves by then was none.
const nominalPeriods = 20

// netlistEnding is that of the files an export writes.
const netlistEnding = ".cir"

func newExportCommand(env environment) *cobra.Command {
	var opts exportOptions
	c := &cobra.Command{
		Use:   "export BUILD",
		Short: "Equivalent circuits of the parts and a converter to run, as SPICE netlists",
		Long: `export rates the parts of a build file as they stand there and writes netlists
for a circuit simulator. Without --out the converter at a corner, with the
subcircuits of both parts in it and ready to run, goes to standard output, or
with --part one of:

  transformer, inductor  the subcircuits of one part
  converter              the converter with the parts as built
  nominal                the converter with the tank of the job, no parts

With --out all of them are written into a folder, as NAME` + netlistEnding + `.

The windings are coupled inductors with the open and short-circuit inductances
of the rating; their resistance over frequency is that of the field solution,
fitted by ladders of resistors and inductors up to the 20th harmonic of the
corner's frequency; the core's loss is a resistor, of the corner where it loses
most; the capacitances are estimates. BUILD is a file, or - for standard input.
` + exitCodesHelp,
		Example: `  gapwright export parts/build.yaml | ngspice -b
  gapwright export parts/build.yaml --part transformer > transformer.cir
  gapwright export parts/build.yaml --out parts/circuit --corner light`,
		Args: cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			opts.build = args[0]
			return runExport(cmd.Context(), opts, env)
		},
	}
	c.Flags().StringVar(&opts.out, "out", "", "`folder` to write into; it is made when it is not there")
	c.Flags().StringVar(&opts.part, "part", "", "write this `one` alone: transformer, inductor, converter, nominal")
	c.Flags().StringVar(&opts.corner, "corner", "", "`name` of the corner; without it the first continuous one")
	c.Flags().BoolVar(&opts.json, "json", false, "print how well it fits, and what --out wrote, as JSON, in SI units, in place of a netlist")
	addLibraryFlag(c, &opts.library)
	return c
}

func runExport(ctx context.Context, opts exportOptions, env environment) error {
	known := []string{job.Transformer, job.Inductor, exportConverter, exportNominal}
	if opts.part != "" && !slices.Contains(known, opts.part) {
		return failure{exitUsage, fmt.Errorf("--part: %q is none of %s", opts.part, strings.Join(known, ", "))}
	}
	lib, d, err := checkBuild(ctx, opts.build, opts.library, env)
	if err != nil {
		return designFailure(env, opts.json, d, err)
	}
	at, err := exportCorner(d, opts.corner)
	if err != nil {
		return err
	}
	if opts.part == job.Inductor && d.Inductor == nil {
		return errors.New("this build has no inductor to export: the transformer's leakage is the resonant inductance")
	}
	o := d.Operations[at]
	report := text.ExportReport{Corner: o.Corner.Name, Files: []string{}}
	for _, x := range circuit.BenchExpected(d.TankAt(o.Corner.Name), o) {
		report.Expected = append(report.Expected, text.ExportFigure(x))
	}
	networks, err := design.Networks(d, lib.tables(), o.Corner.Name)
	if err != nil {
		return err
	}
	type netlist struct {
		name string
		text bytes.Buffer
	}
	var list []*netlist
	add := func(name string, write func(w io.Writer) error) error {
		if opts.part != "" && opts.part != name {
			return nil
		}
		n := &netlist{name: name}
		list = append(list, n)
		return write(&n.text)
	}
	var parts []*circuit.Equivalent
	for _, n := range networks {
		e, err := circuit.NewEquivalent(n)
		if err != nil {
			return err
		}
		parts = append(parts, e)
		report.Parts = append(report.Parts, exportPart(e))
		if err := add(n.Part, func(w io.Writer) error { return circuit.Subcircuit(w, e) }); err != nil {
			return err
		}
	}
	if opts.out == "" && opts.part == "" {
		opts.part, list = exportConverter, nil
	}
	if err := add(exportConverter, func(w io.Writer) error { return circuit.Bench(w, d, o, parts) }); err != nil {
		return err
	}
	// A build is rated only where the tank of the job serves every corner.
	if err := add(exportNominal, func(w io.Writer) error {
		return circuit.Netlist(w, d.Job.Tank, d.Wanted[at], nominalPeriods)
	}); err != nil {
		return err
	}
	if opts.out != "" {
		if err := makeFolder(opts.out); err != nil {
			return err
		}
		for _, n := range list {
			path := filepath.Join(opts.out, n.name+netlistEnding)
			if err := writeWhole(path, n.text.Bytes()); err != nil {
				return err
			}
			report.Files = append(report.Files, path)
		}
	}
	var out bytes.Buffer
	switch {
	case opts.json:
		err = text.ExportJSON(&out, report)
	case opts.out == "":
		_, err = out.Write(list[0].text.Bytes())
	default:
		err = text.Export(text.NewPrinter(&out, env.utf8, env.width), report)
	}
	if err != nil {
		return err
	}
	if err := writeStdout(env, out.Bytes()); err != nil {
		return err
	}
	missed := 0
	for _, v := range d.Verdicts {
		if !v.Pass {
			missed++
		}
	}
	if missed > 0 {
		return failure{exitLimitMissed, fmt.Errorf("exported; %d limit(s) of the job are missed by this build: run gapwright check on it", missed)}
	}
	return nil
}

func exportPart(e *circuit.Equivalent) text.ExportPart {
	p := text.ExportPart{
		Part: e.Part, Frequency: e.Frequency, Temperature: e.Temperature,
		CoreResistance: e.CoreResistance, CoreAcross: e.Windings[len(e.Windings)-1], CoreCorner: e.CoreCorner,
		SelfCapacitance: e.SelfCapacitance, InterwindingCapacity: e.InterwindingCapacity, CapacitanceBand: part.CapacitanceBand,
	}
	for _, c := range e.Cases {
		p.Cases = append(p.Cases, text.ExportCase{Name: c.Name, Inductance: c.AtFirst, Resistance: c.Resistance, Fitted: c.Fitted})
	}
	return p
}

// exportCorner returns the place of a corner that is served.
func exportCorner(d *design.Design, name string) (int, error) {
	at := -1
	var names []string
	for k, o := range d.Operations {
		names = append(names, o.Corner.Name)
		if name != "" {
			if o.Corner.Name == name {
				if o.Status != tank.OK {
					return 0, fmt.Errorf("corner %s is not served: %s", name, o.Reason)
				}
				return k, nil
			}
			continue
		}
		if o.Status == tank.OK && (at < 0 || d.Operations[at].Corner.Duration > 0 && o.Corner.Duration == 0) {
			at = k
		}
	}
	if name != "" {
		return 0, fmt.Errorf("the job has no corner called %q; it has: %s", name, strings.Join(names, ", "))
	}
	if at < 0 {
		return 0, fmt.Errorf("no corner of this build is served: see gapwright check")
	}
	return at, nil
}
