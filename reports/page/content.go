package page

import (
	"fmt"
	"html/template"
	"strings"

	"gapwright/magnetics/design"
	"gapwright/magnetics/part"
)

// content is everything that the layout puts in its places.
type content struct {
	Explained []explanationGroup
	Explains  int // figures that are explained
	Style     template.CSS
	Script    template.JS

	Title, Subtitle, MadeWith string
	Failure                   string // no parts: why
	Feasible                  bool
	Missed, Near, Limits      []limitRow
	Total, Share              template.HTML
	Key                       []fact

	Corners []string
	Parts   []partCard
	Waves   []waves
	Traces  []traceData

	Losses []lossRow
	Bars   template.HTML

	Sizes     []sizeRow
	SizePlots []panel
	SizeWords string
	Pairs     []pairRow
	PairPlot  template.HTML
	PairWords string
	QuietPair int // pairs that are not on paper
	Advice    []design.Advice
	Advised   bool // something is missed, so that advice was looked for
	QuietRows int

	Tank       []tankRow
	TankRows   []cornerRow
	Gains      []panel
	Rounds     int
	LastChange string

	Checks   []checkTable
	Warnings []part.Warning
	Given    []fact
	Defaults []assumptionGroup
	Sources  []source
}

func gather(in Input) (*content, error) {
	d := in.Design
	c := &content{Title: d.Job.Title, MadeWith: in.MadeWith, Feasible: d.Feasible, Warnings: d.Warnings}
	if c.Title == "" {
		c.Title = "Transformer and resonant inductor"
	}
	if d.Job.PartNumber != "" {
		c.Subtitle = d.Job.PartNumber
	}
	if d.Job.Revision != "" {
		if c.Subtitle != "" {
			c.Subtitle += ", "
		}
		c.Subtitle += "revision " + d.Job.Revision
	}
	if date := d.Job.Build.Sheet.Date; date != "" {
		c.Subtitle += ", " + date
	}
	var err error
	if c.Sizes, c.SizePlots, c.SizeWords, err = sizes(d); err != nil {
		return nil, err
	}
	for _, r := range c.Sizes {
		if r.Quiet {
			c.QuietRows++
		}
	}
	if c.Pairs, c.PairPlot, err = pairs(d); err != nil {
		return nil, err
	}
	for _, r := range c.Pairs {
		if r.Quiet {
			c.QuietPair++
		}
	}
	if len(c.Pairs) == 0 && len(d.Ladder) > 0 {
		c.PairWords = "No pair of core sizes keeps every limit."
	}
	c.Advice, c.Advised = d.Advice, in.View == nil || len(d.Advice) > 0
	for _, v := range d.Verdicts {
		c.Advised = c.Advised || !v.Pass
	}
	from := originsOf(d, in.Explanations)
	c.TankRows, c.Given, c.Defaults = corners(d, from), given(d), defaults(d)
	if in.View == nil {
		c.Failure = in.Failure
		if c.Failure == "" {
			c.Failure = "the work ended without parts"
		}
		c.Failure = strings.ToUpper(c.Failure[:1]) + c.Failure[1:]
		return c, nil
	}
	c.Limits = limits(d.Verdicts)
	c.Missed, c.Near = nearest(c.Limits, 5)
	total := d.TotalLoss()
	c.Explained, c.Explains = explained(d, in.Explanations), len(in.Explanations)
	c.Total = from.link("total_loss", scaled("", total, 1, 2, " W"))
	if p := power(d); p > 0 {
		c.Share = percent("", total/p, 2)
	}
	for _, x := range in.View.Corners {
		c.Corners = append(c.Corners, x.Name)
	}
	if c.Parts, err = partCards(in, from); err != nil {
		return nil, err
	}
	if c.Waves, c.Traces, err = waveforms(in); err != nil {
		return nil, err
	}
	if c.Losses, c.Bars, err = losses(in, from); err != nil {
		return nil, err
	}
	if c.Gains, err = gains(in); err != nil {
		return nil, err
	}
	c.Tank = asBuilt(d, from)
	c.Rounds, c.LastChange = d.Iterations, fmt.Sprintf("%.1e", d.Residual)
	c.Checks, c.Sources = handChecks(d), sources(d)
	return c, nil
}
