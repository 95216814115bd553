package main

import (
	"bytes"
	"fmt"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"gapwright/corelib/quantity"
	"gapwright/corelib/wire"
	"gapwright/reports/text"
)

type wiresOptions struct {
	name        string
	kinds       []string
	grade       int
	strands     []string
	serving     string
	minArea     string
	maxArea     string
	maxOverall  string
	minSize     string
	maxSize     string
	width       string
	frequency   string
	temperature string
	library     []string
	json        bool
}

// wireKinds are the lists that --kind names.
var wireKinds = []string{"solid", "awg", "litz", "foil", "triple-insulated", "own"}

func newWiresCommand(env environment) *cobra.Command {
	var opts wiresOptions
	c := &cobra.Command{
		Use:   "wires [NAME]",
		Short: "The open table of wires: enamelled, AWG, litz, foil, triple-insulated",
		Long: `wires says how wires are written and what the tables hold, lists those that pass
the filters, or shows one with its diameters, copper, resistance and sources.

Litz is listed for every strand size of --strand and every usual number of
strands.
` + exitCodesHelp,
		Example: `  gapwright wires
  gapwright wires --kind litz --strand 0.071mm,0.1mm --min-area 0.5mm2 --max-overall 2mm
  gapwright wires "120 x 0.1 mm litz, single serving" --frequency 100kHz --temperature 100degC`,
		Args: cobra.MaximumNArgs(1),
		RunE: func(_ *cobra.Command, args []string) error {
			if len(args) == 1 {
				opts.name = args[0]
			}
			return runWires(opts, env)
		},
	}
	f := c.Flags()
	f.StringSliceVar(&opts.kinds, "kind", nil, "only these `kinds`: "+strings.Join(wireKinds, ", "))
	f.IntVar(&opts.grade, "grade", 0, "`grade` 1 to 3 of the enamel (solid 2, strands 1)")
	f.StringSliceVar(&opts.strands, "strand", []string{"0.05mm", "0.071mm", "0.1mm"}, "strand `sizes` that litz is listed for")
	f.StringVar(&opts.serving, "serving", "none", "`serving` that litz is listed with: none, single or double")
	f.StringVar(&opts.minArea, "min-area", "", "least copper `section`, e.g. 0.5mm2")
	f.StringVar(&opts.maxArea, "max-area", "", "largest copper `section`")
	f.StringVar(&opts.minSize, "min-size", "", "least bare `diameter` or thickness")
	f.StringVar(&opts.maxSize, "max-size", "", "largest bare `diameter` or thickness")
	f.StringVar(&opts.maxOverall, "max-overall", "", "largest overall `diameter`")
	f.StringVar(&opts.width, "width", "10mm", "`width` of foil")
	f.StringVar(&opts.frequency, "frequency", "", "`frequency` for the skin depth, e.g. 100kHz")
	f.StringVar(&opts.temperature, "temperature", "20degC", "`temperature` of the copper")
	addLibraryFlag(c, &opts.library)
	f.BoolVar(&opts.json, "json", false, "print the wires as JSON, in SI units")
	return c
}

// wireFilter is what the flags ask for, in SI units.
type wireFilter struct {
	minArea, maxArea, minSize, maxSize, maxOverall, width float64
	strands                                               []float64
	serving                                               wire.Serving
	conductor                                             text.Conductor
	filtered                                              bool // any restriction was given
}

func (f wireFilter) passes(w wire.Wire) bool {
	size := w.Diameter
	if w.Kind == wire.Foil {
		size = w.Thickness
		w.Width = f.width
	}
	area := w.CopperArea()
	return !(area < f.minArea || f.maxArea > 0 && area > f.maxArea ||
		size < f.minSize || f.maxSize > 0 && size > f.maxSize ||
		f.maxOverall > 0 && w.OuterDiameterMax() > f.maxOverall)
}

func (o wiresOptions) filter() (wireFilter, error) {
	f := wireFilter{filtered: o.minArea+o.maxArea+o.minSize+o.maxSize+o.maxOverall != "" || len(o.kinds) > 0}
	f.conductor.Temperature = wire.ReferenceTemperature
	var errs []error
	for _, q := range []struct {
		flag, text string
		unit       quantity.Unit
		to         *float64
	}{
		{"min-area", o.minArea, quantity.SquareMeter, &f.minArea},
		{"max-area", o.maxArea, quantity.SquareMeter, &f.maxArea},
		{"min-size", o.minSize, quantity.Meter.Like("mm"), &f.minSize},
		{"max-size", o.maxSize, quantity.Meter.Like("mm"), &f.maxSize},
		{"max-overall", o.maxOverall, quantity.Meter.Like("mm"), &f.maxOverall},
		{"width", o.width, quantity.Meter.Like("mm"), &f.width},
		{"frequency", o.frequency, quantity.Hertz, &f.conductor.Frequency},
	} {
		if err := flagQuantity(q.flag, q.text, q.unit, q.to); err != nil {
			errs = append(errs, err)
		}
	}
	if t, err := quantity.Parse(o.temperature, quantity.Celsius); err != nil {
		errs = append(errs, fmt.Errorf("--temperature: %w", err))
	} else if t < -100 || t > 300 {
		errs = append(errs, fmt.Errorf("--temperature: %s is outside -100 to 300 degC", o.temperature))
	} else {
		f.conductor.Temperature = t
	}
	if o.grade < 0 || o.grade > 3 {
		errs = append(errs, fmt.Errorf("--grade: %d is none of 1, 2, 3", o.grade))
	}
	var err error
	if f.serving, err = wire.ParseServing(o.serving); err != nil {
		errs = append(errs, fmt.Errorf("--serving: %w", err))
	}
	for _, s := range o.strands {
		w, err := wire.Parse("3 x " + strings.TrimSpace(s) + " litz")
		if err != nil {
			errs = append(errs, fmt.Errorf("--strand: %q is no strand size; write for example 0.1mm or AWG40", s))
			continue
		}
		f.strands = append(f.strands, w.Diameter)
	}
	for _, k := range o.kinds {
		if !slices.Contains(wireKinds, k) {
			errs = append(errs, fmt.Errorf("--kind: %q is none of %s", k, strings.Join(wireKinds, ", ")))
		}
	}
	return f, usageErrors(errs)
}

func runWires(opts wiresOptions, env environment) error {
	filter, err := opts.filter()
	if err != nil {
		return err
	}
	lib, err := openLibrary(opts.library)
	if err != nil {
		return err
	}
	var out bytes.Buffer
	printer := text.NewPrinter(&out, env.utf8, env.width)
	if opts.name != "" {
		w, err := lib.wires.Parse(opts.name)
		if err != nil {
			return err
		}
		if w.Kind == wire.Foil {
			w.Width = filter.width
		}
		if opts.json {
			err = text.WiresJSON(&out, []text.WireList{{Wires: []wire.Wire{w}}}, filter.conductor)
		} else {
			err = text.Wire(printer, w, filter.conductor)
		}
		if err != nil {
			return err
		}
		return writeStdout(env, out.Bytes())
	}
	switch {
	case opts.json:
		err = text.WiresJSON(&out, wireLists(opts, filter, lib.wires), filter.conductor)
	case filter.filtered:
		err = text.Wires(printer, wireLists(opts, filter, lib.wires), filter.conductor)
	default:
		err = text.WireStock(printer, lib.wires.Own())
	}
	if err != nil {
		return err
	}
	return writeStdout(env, out.Bytes())
}

// wireLists returns the wires of every kind asked for that pass the filter.
func wireLists(opts wiresOptions, f wireFilter, own *wire.Table) []text.WireList {
	solidGrade, strandGrade := wire.UsualSolidGrade, wire.UsualStrandGrade
	if opts.grade > 0 {
		solidGrade, strandGrade = opts.grade, opts.grade
	}
	var lists []text.WireList
	add := func(kind, title string, all func(yield func(wire.Wire) bool)) {
		if len(opts.kinds) > 0 && !slices.Contains(opts.kinds, kind) {
			return
		}
		l := text.WireList{Title: title}
		for w := range all {
			w = own.Apply(w)
			if w.Kind == wire.Foil {
				w.Width = f.width
			}
			if f.passes(w) {
				l.Wires = append(l.Wires, w)
			}
		}
		lists = append(lists, l)
	}
	add("own", "Your own rows", func(yield func(wire.Wire) bool) {
		for _, o := range own.Own() {
			if !yield(o.Wire) {
				return
			}
		}
	})
	add("solid", fmt.Sprintf("Round enamelled wire, grade %d, R20 and R40 sizes of IEC 60317-0-1", solidGrade), func(yield func(wire.Wire) bool) {
		for _, s := range wire.Sizes("") {
			if !yield(wire.Wire{Kind: wire.Solid, Diameter: s.Diameter, Grade: solidGrade}) {
				return
			}
		}
	})
	add("awg", fmt.Sprintf("Round enamelled wire by gauge (ASTM B258), enamel as grade %d of IEC 60317-0-1", solidGrade), func(yield func(wire.Wire) bool) {
		for n := wire.LargestAWG; n <= wire.SmallestAWG; n++ {
			if !yield(wire.Wire{Kind: wire.Solid, Diameter: wire.AWGDiameter(n), Grade: solidGrade}) {
				return
			}
		}
	})
	add("litz", fmt.Sprintf("Litz of grade %d strands, serving %s, usual numbers of strands", strandGrade, f.serving), func(yield func(wire.Wire) bool) {
		for _, d := range f.strands {
			for _, n := range wire.LitzCounts() {
				if !yield(wire.Wire{Kind: wire.Litz, Strands: n, Diameter: d, Grade: strandGrade, Serving: f.serving}) {
					return
				}
			}
		}
	})
	add("foil", "Copper foil, usual thicknesses (common practice)", func(yield func(wire.Wire) bool) {
		for _, t := range wire.FoilThicknesses() {
			if !yield(wire.Wire{Kind: wire.Foil, Thickness: t}) {
				return
			}
		}
	})
	add("triple-insulated", "Triple-insulated wire, usual sizes (from memory of wire catalogues)", func(yield func(wire.Wire) bool) {
		for _, d := range wire.TripleInsulatedDiameters() {
			if !yield(wire.Wire{Kind: wire.Solid, Diameter: d}.WithTripleInsulation()) {
				return
			}
		}
	})
	return lists
}
