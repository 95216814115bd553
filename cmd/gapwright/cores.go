package main

import (
	"bytes"
	"cmp"
	"errors"
	"fmt"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"gapwright/corelib/quantity"
	"gapwright/corelib/shape"
	"gapwright/corelib/table"
	"gapwright/reports/figure"
	"gapwright/reports/text"
)

type coresOptions struct {
	name       string
	families   []string
	minArea    string
	maxArea    string
	minWindow  string
	maxVolume  string
	maxHeight  string
	maxLength  string
	confidence string
	former     bool
	sort       string
	library    []string
	json       bool
	svg        string
}

// sortOrders are the words that --sort takes.
var sortOrders = []string{"table", "name", "area", "window", "product", "volume", "height"}

func newCoresCommand(env environment) *cobra.Command {
	var opts coresOptions
	c := &cobra.Command{
		Use:   "cores [NAME]",
		Short: "The open table of core shapes and coil formers",
		Long: `cores lists the core shapes that pass the filters, or shows one with all its
figures: dimensions with limits, effective parameters used and computed, coil
former, published gaps, source and confidence of each, and the half section to
scale. Effective parameters are the published ones.

Confidence D means: ` + shape.NotProven + `.
` + exitCodesHelp,
		Example: `  gapwright cores --family ETD,PQ --min-area 100mm2 --max-height 40mm
  gapwright cores "ETD 39/20/13" --svg etd39.svg
  gapwright cores --library our-parts --json`,
		Args: cobra.MaximumNArgs(1),
		RunE: func(_ *cobra.Command, args []string) error {
			if len(args) == 1 {
				opts.name = args[0]
			}
			return runCores(opts, env)
		},
	}
	f := c.Flags()
	f.StringSliceVar(&opts.families, "family", nil, "only these `families`: "+strings.Join(shape.Families(), ", "))
	f.StringVar(&opts.minArea, "min-area", "", "least effective `area`, e.g. 100mm2")
	f.StringVar(&opts.maxArea, "max-area", "", "largest effective `area`")
	f.StringVar(&opts.minWindow, "min-window", "", "least `area` of one window")
	f.StringVar(&opts.maxVolume, "max-volume", "", "largest outline `volume` with a full winding, e.g. 50cm3")
	f.StringVar(&opts.maxHeight, "max-height", "", "largest `height` of the set along the post, e.g. 40mm")
	f.StringVar(&opts.maxLength, "max-length", "", "largest `length` and width with a full winding")
	f.StringVar(&opts.confidence, "confidence", "", "worst `letter` admitted: A, B, C or D")
	f.BoolVar(&opts.former, "former", false, "only shapes with a published coil former")
	f.StringVar(&opts.sort, "sort", sortOrders[0], "`order`: "+strings.Join(sortOrders, ", "))
	addLibraryFlag(c, &opts.library)
	f.BoolVar(&opts.json, "json", false, "print the shapes as JSON, in SI units")
	f.StringVar(&opts.svg, "svg", "", "write the drawing of the shape NAME to this `file`; - for standard output")
	return c
}

func runCores(opts coresOptions, env environment) error {
	filter, err := opts.filter()
	if err != nil {
		return err
	}
	lib, err := openLibrary(opts.library)
	if err != nil {
		return err
	}
	shapes := lib.shapes
	var list []shape.Shape
	if opts.name == "" {
		if opts.svg != "" {
			return failure{exitUsage, errors.New("--svg draws one shape; name it")}
		}
		list = shapes.Filter(filter)
		sortShapes(list, opts.sort)
	} else {
		s, err := shapes.Find(opts.name)
		if err != nil {
			return err
		}
		list = []shape.Shape{s}
	}
	var out bytes.Buffer
	printer := text.NewPrinter(&out, env.utf8, env.width)
	switch {
	case opts.svg != "":
		return drawCore(opts, env, shapes, list[0])
	case opts.json:
		err = text.CoresJSON(&out, shapes, list)
	case opts.name != "":
		err = text.Core(printer, shapes, list[0])
	default:
		err = text.Cores(printer, shapes, list)
	}
	if err != nil {
		return err
	}
	return writeStdout(env, out.Bytes())
}

// drawCore writes the drawing of a shape and says where.
func drawCore(opts coresOptions, env environment, shapes *shape.Table, s shape.Shape) error {
	former := &shape.Former{}
	if f, err := shapes.FormerFor(s); err == nil {
		former = &f
	} else {
		former = nil
		fmt.Fprintf(env.stderr, "gapwright: drawn without a coil former: %v\n", err)
	}
	picture, err := figure.Section(s, former)
	if err != nil {
		return err
	}
	if opts.svg == "-" {
		return writeStdout(env, picture.SVG)
	}
	if err := writeWhole(opts.svg, picture.SVG); err != nil {
		return err
	}
	fmt.Fprintf(env.stderr, "wrote %s\n", opts.svg)
	if !s.Proven() {
		fmt.Fprintf(env.stderr, "W201 %s: %s\n", s.Name, shape.NotProven)
	}
	return nil
}

// filter reads the flags; every mistake in them is reported at once.
func (o coresOptions) filter() (shape.Filter, error) {
	f := shape.Filter{WithFormer: o.former}
	var errs []error
	for _, q := range []struct {
		flag, text string
		unit       quantity.Unit
		to         *float64
	}{
		{"min-area", o.minArea, quantity.SquareMeter, &f.AeMin},
		{"max-area", o.maxArea, quantity.SquareMeter, &f.AeMax},
		{"min-window", o.minWindow, quantity.SquareMeter, &f.WindowMin},
		{"max-volume", o.maxVolume, quantity.CubicMeter, &f.VolumeMax},
		{"max-height", o.maxHeight, quantity.Meter.Like("mm"), &f.HeightMax},
		{"max-length", o.maxLength, quantity.Meter.Like("mm"), &f.LengthMax},
	} {
		if err := flagQuantity(q.flag, q.text, q.unit, q.to); err != nil {
			errs = append(errs, err)
		}
	}
	for _, name := range o.families {
		name = strings.TrimSpace(name)
		known := slices.ContainsFunc(shape.Families(), func(other string) bool { return table.Fold(other) == table.Fold(name) })
		if !known {
			errs = append(errs, fmt.Errorf("--family: no family is called %q; the families are %s", name, strings.Join(shape.Families(), ", ")))
		}
		f.Families = append(f.Families, name)
	}
	f.WorstConfidence = shape.Confidence(strings.ToUpper(o.confidence))
	if o.confidence != "" && !strings.Contains("ABCD", string(f.WorstConfidence)) {
		errs = append(errs, fmt.Errorf("--confidence: %q is none of A, B, C, D", o.confidence))
	}
	if !slices.Contains(sortOrders, o.sort) {
		errs = append(errs, fmt.Errorf("--sort: %q is none of %s", o.sort, strings.Join(sortOrders, ", ")))
	}
	return f, usageErrors(errs)
}

// usageErrors joins what is wrong with the values of flags.
func usageErrors(errs []error) error {
	for i, err := range errs {
		errs[i] = failure{exitUsage, err}
	}
	return errors.Join(errs...)
}

// flagQuantity reads the value of a flag with a unit; a flag that was not given
// leaves to alone.
func flagQuantity(flag, value string, unit quantity.Unit, to *float64) error {
	if value == "" {
		return nil
	}
	v, err := quantity.Parse(value, unit)
	if err != nil {
		return fmt.Errorf("--%s: %w", flag, err)
	}
	if v <= 0 {
		return fmt.Errorf("--%s: %s is not above zero", flag, value)
	}
	*to = v
	return nil
}

// sortShapes sorts by the chosen figure; equal ones keep the order of the table.
func sortShapes(list []shape.Shape, order string) {
	var by func(shape.Shape) float64
	switch order {
	case "name":
		slices.SortStableFunc(list, func(a, b shape.Shape) int { return cmp.Compare(a.Name, b.Name) })
		return
	case "area":
		by = func(s shape.Shape) float64 { return s.Ae }
	case "window":
		by = shape.Shape.WindowArea
	case "product":
		by = shape.Shape.AreaProduct
	case "volume":
		by = shape.Shape.Volume
	case "height":
		by = func(s shape.Shape) float64 { return s.WoundOutline().Height }
	default:
		return
	}
	slices.SortStableFunc(list, func(a, b shape.Shape) int { return cmp.Compare(by(a), by(b)) })
}
