package main

import (
	"bytes"
	"context"
	"encoding/csv"
	"errors"
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"gapwright/corelib/material"
	"gapwright/corelib/quantity"
	"gapwright/corelib/table"
	"gapwright/reports/figure"
	"gapwright/reports/text"
)

type fitOptions struct {
	points      string
	name, like  string
	source      string
	confidence  string
	heat        string
	temperature string
	borders     []string
	beta        float64
	plot        string
	library     []string
	json        bool
}

func newFitCommand(env environment) *cobra.Command {
	var opts fitOptions
	c := &cobra.Command{
		Use:   "fit POINTS.csv",
		Short: "Loss parameters from measured or catalogue points",
		Long: `fit finds k, alpha and beta of P = k f^alpha B^beta from loss points of a sine, and
a temperature factor when there are several temperatures: least squares of ln P,
so that relative errors count alike. POINTS is a CSV file with the columns f, B, P
and, if you have it, T, each with its unit in the heading (or - for standard
input):

    f [kHz],B [mT],T [degC],P [kW/m3]
    100,200,100,375

f in Hz, kHz or MHz; B, the peak, in T or mT; P in W/m3, kW/m3 or mW/cm3. Lines that
begin with # are comments.

Points that cannot decide the exponents are refused: fewer than three, all at one
flux density, or frequency and flux density on one line. With one frequency only
beta is given. The last lines are rows for a folder of your own.
` + exitCodesHelp,
		Example: `  gapwright fit points.csv --name MY1 --borders 200kHz --plot residuals.png
  gapwright fit points.csv --heat polynomial --json`,
		Args: cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			opts.points = args[0]
			return runFit(cmd.Context(), opts, env)
		},
	}
	f := c.Flags()
	f.StringVar(&opts.name, "name", "MY1", "`name` of the ferrite in the rows")
	f.StringVar(&opts.like, "like", "PW3", "`ferrite` that stands in for saturation, permeability and the rest")
	f.StringVar(&opts.source, "source", "", "where the points come from, for the `source` of the rows (default: the file's name)")
	f.StringVar(&opts.confidence, "confidence", "measured", "`word` for the rows: "+strings.Join(material.Confidences[:], ", "))
	f.StringVar(&opts.heat, "heat", string(material.HeatLogQuadratic), "temperature `form`: log-quadratic, polynomial or none")
	f.StringVar(&opts.temperature, "reference", "", "`temperature` where the factor is 1 (default: the measured one nearest 100 degC)")
	f.StringSliceVar(&opts.borders, "borders", nil, "`frequencies` where bands meet, as in 100kHz,200kHz; each band gets its own set")
	f.Float64Var(&opts.beta, "beta", 0, "hold beta at this `value` instead of fitting it")
	f.StringVar(&opts.plot, "plot", "", "draw the residuals into this `file` (.png or .svg)")
	f.BoolVar(&opts.json, "json", false, "print the sets and residuals as JSON, in SI units")
	addLibraryFlag(c, &opts.library)
	return c
}

// check turns the flags into what the fit needs.
func (o fitOptions) check() (fit material.FitOptions, borders []float64, err error) {
	var errs []error
	fit.Heat = material.HeatForm(o.heat)
	if !slices.Contains([]material.HeatForm{material.HeatLogQuadratic, material.HeatPolynomial, material.HeatNone}, fit.Heat) {
		errs = append(errs, fmt.Errorf("--heat: %q is none of log-quadratic, polynomial, none", o.heat))
	}
	if fit.Beta = o.beta; o.beta != 0 && !(o.beta > 1 && o.beta < 4.5) {
		errs = append(errs, fmt.Errorf("--beta: %g; ferrites lie between 2 and 3.3", o.beta))
	}
	fit.TRef = math.NaN()
	if o.temperature != "" {
		if fit.TRef, err = quantity.Parse(o.temperature, quantity.Celsius); err != nil {
			errs = append(errs, fmt.Errorf("--reference: %w", err))
		}
	}
	for _, b := range o.borders {
		f, err := quantity.Parse(strings.TrimSpace(b), quantity.Hertz)
		if err == nil && !(f > 0) {
			err = fmt.Errorf("%s is not above zero", b)
		}
		if err != nil {
			errs = append(errs, fmt.Errorf("--borders: %w", err))
		}
		borders = append(borders, f)
	}
	if !slices.Contains(material.Confidences[:], o.confidence) {
		errs = append(errs, fmt.Errorf("--confidence: %q is none of %s", o.confidence, strings.Join(material.Confidences[:], ", ")))
	}
	if strings.TrimSpace(o.name) == "" {
		errs = append(errs, errors.New("--name: empty"))
	}
	if ext := strings.ToLower(filepath.Ext(o.plot)); o.plot != "" && ext != ".png" && ext != ".svg" {
		errs = append(errs, fmt.Errorf("--plot: %s is neither .png nor .svg", o.plot))
	}
	if err := errors.Join(errs...); err != nil {
		return fit, nil, failure{exitUsage, err}
	}
	return fit, borders, nil
}

func runFit(_ context.Context, opts fitOptions, env environment) error {
	fitOpts, borders, err := opts.check()
	if err != nil {
		return err
	}
	lib, err := openLibrary(opts.library)
	if err != nil {
		return err
	}
	like, err := lib.materials.Find(opts.like)
	if err != nil {
		return failure{exitUsage, fmt.Errorf("--like: %w", err)}
	}
	name, data, err := readInput(opts.points, env)
	if err != nil {
		return err
	}
	points, err := material.ReadPoints(name, bytes.NewReader(data))
	if err != nil {
		return err
	}
	bands, err := material.Split(points, borders)
	if err != nil {
		return fmt.Errorf("%s: %w", name, err)
	}
	r := text.FitReport{File: name}
	var refused []error
	for i, band := range bands {
		f, err := material.FitLoss(band, fitOpts)
		if err != nil {
			refused = append(refused, &table.Error{File: name, Line: band[0].Line, Column: 1, Msg: fmt.Sprintf("band %d, %d points: %v", i+1, len(band), err)})
			continue
		}
		f.Set.ID = fmt.Sprintf("M%d", i+1)
		f.Set.Source, f.Set.Confidence = opts.source, opts.confidence
		if opts.source == "" {
			f.Set.Source = fmt.Sprintf("fitted to %d points of %s", len(band), filepath.Base(name))
		}
		r.Fits = append(r.Fits, f)
	}
	if err := errors.Join(refused...); err != nil {
		return err
	}
	if len(borders) == 0 && r.Fits[0].Set.RMS > 0.05 {
		if border, rms, ok := material.SuggestBorder(points, fitOpts); ok && rms < 0.8*r.Fits[0].Set.RMS {
			r.Suggested, r.WouldBe = border, rms
		}
	}
	if err := fitRows(&r, opts, lib.materials, like); err != nil {
		return err
	}
	if opts.plot != "" {
		pic, err := figure.Residuals("Loss points of "+filepath.Base(name), r.Fits)
		if err != nil {
			return err
		}
		data := pic.PNG
		if strings.EqualFold(filepath.Ext(opts.plot), ".svg") {
			data = pic.SVG
		}
		if err := writeWhole(opts.plot, data); err != nil {
			return err
		}
		fmt.Fprintf(env.stderr, "wrote %s\n", opts.plot)
	}
	var out bytes.Buffer
	if opts.json {
		err = text.FitJSON(&out, r)
	} else {
		err = text.Fit(text.NewPrinter(&out, env.utf8, env.width), r)
	}
	if err != nil {
		return err
	}
	return writeStdout(env, out.Bytes())
}

// fitRows makes the rows for the user's own table and checks that they are read.
func fitRows(r *text.FitReport, opts fitOptions, known *material.Table, like *material.Ferrite) error {
	var ruled []string
	for i := range r.Fits {
		f := &r.Fits[i]
		if !f.AlphaKnown {
			r.Remarks = append(r.Remarks, "No rows: a loss set needs alpha, and that needs a second frequency.")
			return nil
		}
		// A fit to one temperature takes the like ferrite's rule where that starts
		// from about the same temperature.
		s := &f.Set
		s.Band = math.Ceil(100*max(s.Worst, 0.05)) / 100
		if cold := like.Loss[0]; s.Heat == material.HeatNone && s.TMin == s.TMax && cold.Heat == material.HeatRatio && math.Abs(s.TRef-cold.TRef) <= 15 {
			s.Heat, s.TMin, s.TMax = material.HeatRatio, min(cold.TMin, s.TRef), cold.TMax
			s.Band = max(s.Band, cold.Band)
			ruled = append(ruled, s.ID)
		}
	}
	if len(ruled) > 0 {
		r.Remarks = append(r.Remarks, fmt.Sprintf("%s: other temperatures by the hot-over-cold rule of %s, ±%.0f %%. Write heat none to do without it, or fit points at three temperatures.",
			strings.Join(ruled, ", "), like.Name, 100*like.Loss[0].Band))
	}
	source := opts.source
	if source == "" {
		source = "losses fitted to " + filepath.Base(r.File) + ", the rest as " + like.Name
	}
	var row strings.Builder
	w := csv.NewWriter(&row)
	if err := w.Write([]string{opts.name, like.Class, like.Edition, like.Base, "on request", like.Name, source, opts.confidence}); err != nil {
		return err
	}
	w.Flush()
	r.FerriteRow = []string{"name,class,edition,base,use,like,source,confidence", strings.TrimRight(row.String(), "\n")}
	r.LossRows = []string{material.LossHeading()}
	for _, f := range r.Fits {
		r.LossRows = append(r.LossRows, material.LossRow(opts.name, f.Set))
	}
	// The rows are only worth printing when the reader of tables takes them.
	if _, err := known.WithText(map[string]string{
		material.FerritesFile: strings.Join(r.FerriteRow, "\n"),
		material.LossFile:     strings.Join(r.LossRows, "\n"),
	}, "rows"); err != nil {
		first, _, _ := strings.Cut(err.Error(), "\n")
		_, msg, _ := strings.Cut(first, ": ")
		r.FerriteRow, r.LossRows = nil, nil
		r.Remarks = append(r.Remarks, "No rows: the table of loss sets would refuse this fit ("+msg+").")
	}
	return nil
}
