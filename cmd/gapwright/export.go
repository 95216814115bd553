package main

import (
	"bytes"
	"context"
	"fmt"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"gapwright/magnetics/design"
	"gapwright/magnetics/part"
	"gapwright/reports/circuit"
	"gapwright/reports/text"
	"gapwright/tank"
)

type exportOptions struct {
	build   string
	out     string
	corner  string
	json    bool
	library []string
}

// benchFile is the runnable converter of an export.
const benchFile = "converter.cir"

func newExportCommand(env environment) *cobra.Command {
	var opts exportOptions
	c := &cobra.Command{
		Use:   "export BUILD --out DIR",
		Short: "Equivalent circuits of the parts and a converter to run, as SPICE netlists",
		Long: `export rates the parts of a build file as they stand there and writes netlists
for a circuit simulator: one file per part with its subcircuit, and
` + benchFile + `, the converter at a corner with both parts in it, ready to run.

The windings are coupled inductors with the open and short-circuit inductances
of the rating; their resistance over frequency is that of the field solution,
fitted by ladders of resistors and inductors up to the 20th harmonic of the
corner's frequency; the core's loss is a resistor, of the corner where it loses
most; the capacitances are estimates. BUILD is a file, or - for standard input.
` + exitCodesHelp,
		Example: `  gapwright export parts/build.yaml --out parts/circuit
  cd parts/circuit && ngspice -b ` + benchFile,
		Args: cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			opts.build = args[0]
			return runExport(cmd.Context(), opts, env)
		},
	}
	c.Flags().StringVar(&opts.out, "out", "", "`folder` to write into; it is made when it is not there")
	c.Flags().StringVar(&opts.corner, "corner", "", "`name` of the corner; without it the first continuous one")
	c.Flags().BoolVar(&opts.json, "json", false, "print what was written and how well it fits as JSON, in SI units")
	addLibraryFlag(c, &opts.library)
	if err := c.MarkFlagRequired("out"); err != nil {
		panic(err)
	}
	return c
}

func runExport(ctx context.Context, opts exportOptions, env environment) error {
	lib, d, err := checkBuild(ctx, opts.build, opts.library, env)
	if err != nil {
		return designFailure(env, opts.json, d, err)
	}
	at, err := exportCorner(d, opts.corner)
	if err != nil {
		return err
	}
	o := d.Operations[at]
	networks, err := design.Networks(d, lib.tables(), o.Corner.Name)
	if err != nil {
		return err
	}
	report := text.ExportReport{Corner: o.Corner.Name}
	for _, x := range circuit.BenchExpected(d.TankAt(o.Corner.Name), o) {
		report.Expected = append(report.Expected, text.ExportFigure(x))
	}
	var parts []*circuit.Equivalent
	type file struct {
		name string
		data []byte
	}
	var files []file
	for _, n := range networks {
		e, err := circuit.NewEquivalent(n)
		if err != nil {
			return err
		}
		parts = append(parts, e)
		report.Parts = append(report.Parts, exportPart(e))
		var b bytes.Buffer
		if err := circuit.Subcircuit(&b, e); err != nil {
			return err
		}
		files = append(files, file{n.Part + ".cir", b.Bytes()})
	}
	var b bytes.Buffer
	if err := circuit.Bench(&b, d, o, parts); err != nil {
		return err
	}
	files = append(files, file{benchFile, b.Bytes()})
	if err := makeFolder(opts.out); err != nil {
		return err
	}
	for _, f := range files {
		path := filepath.Join(opts.out, f.name)
		if err := writeWhole(path, f.data); err != nil {
			return err
		}
		report.Files = append(report.Files, path)
	}
	var out bytes.Buffer
	if opts.json {
		err = text.ExportJSON(&out, report)
	} else {
		err = text.Export(text.NewPrinter(&out, env.utf8, env.width), report)
	}
	if err != nil {
		return err
	}
	return writeStdout(env, out.Bytes())
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
