package text

import (
	"fmt"
	"io"
	"math"
	"strings"

	"gapwright/corelib/quantity"
	"gapwright/corelib/shape"
	"gapwright/magnetics/design"
	"gapwright/magnetics/part"
	"gapwright/tank"
)

// designJSON is the stable form of a design for programs, in SI units.
type designJSON struct {
	Format      int              `json:"format"`
	Title       string           `json:"title"`
	Feasible    bool             `json:"feasible"`
	Transformer *transformerJSON `json:"transformer"`
	Inductor    *inductorJSON    `json:"inductor"`
	AsBuilt     *asBuiltJSON     `json:"tank_as_built"`
	Verdicts    []part.Verdict   `json:"verdicts"`
	Warnings    []part.Warning   `json:"warnings"`
	Models      []part.Model     `json:"models"`
	Checks      []part.HandCheck `json:"hand_checks"`
	Sizes       []sizeJSON       `json:"sizes"`
	Pareto      []pairJSON       `json:"pareto"`
	Second      []choiceJSON     `json:"second_choices"`
	Advice      []adviceJSON     `json:"advice"`
	Loop        loopJSON         `json:"loop"`
}

type loopJSON struct {
	Iterations int     `json:"iterations"`
	Residual   float64 `json:"residual"`
}

type sizeJSON struct {
	Part     string      `json:"part"`
	Core     string      `json:"core"`
	Volume   float64     `json:"volume"`
	Feasible bool        `json:"feasible"`
	Chosen   bool        `json:"chosen"`
	Loss     *float64    `json:"loss"`
	Limited  *reasonJSON `json:"limited_by"`
}

type reasonJSON struct {
	Limit string   `json:"limit"`
	Value *float64 `json:"value"`
	Bound float64  `json:"bound"`
	Unit  string   `json:"unit"`
	Sense string   `json:"sense"`
}

type windingJSON struct {
	Name           string  `json:"name"`
	Turns          int     `json:"turns"`
	Wire           string  `json:"wire"`
	Parallel       int     `json:"parallel"`
	Layers         int     `json:"layers"`
	DCResistance   float64 `json:"dc_resistance"`
	ConductorArea  float64 `json:"conductor_area"`
	MLT            float64 `json:"mean_length_of_turn"`
	CurrentDensity float64 `json:"current_density"`
	ACFactor       float64 `json:"ac_factor"`
}

type gapJSON struct {
	Kind        string  `json:"gap_kind"`
	Length      float64 `json:"gap"`
	Pieces      int     `json:"gap_pieces"`
	AL          float64 `json:"inductance_factor"`
	Sensitivity float64 `json:"inductance_change_per_gap"` // 1/m
	Spacer      float64 `json:"spacer_alternative"`        // m, one stack under all legs
	Plain       float64 `json:"gap_without_fringing"`
	McLyman     float64 `json:"gap_mclyman"`
	Clear       float64 `json:"clear_distance"`
	Copper      float64 `json:"copper_distance"`
}

type commonJSON struct {
	Core       string `json:"core"`
	Confidence string `json:"core_confidence"`
	Material   string `json:"material"`
	gapJSON
	Windings   []windingJSON `json:"windings"`
	Flux       float64       `json:"flux_density_peak"`
	Overload   float64       `json:"flux_density_overload"`
	HeightLeft float64       `json:"height_left"`
	Mass       float64       `json:"mass"`
	Volume     float64       `json:"volume"`
	Outline    [3]float64    `json:"outline"`
}

type transformerJSON struct {
	commonJSON
	PrimaryTurns   int                 `json:"primary_turns"`
	SecondaryTurns int                 `json:"secondary_turns"`
	Arrangement    string              `json:"arrangement"`
	Lp             float64             `json:"open_inductance"`
	HotLp          float64             `json:"open_inductance_hot"`
	Ls             float64             `json:"secondary_open_inductance"`
	Lsc            float64             `json:"short_inductance"`
	Halves         []float64           `json:"short_inductance_halves"`
	Lm             float64             `json:"magnetizing_inductance"`
	Ratio          float64             `json:"effective_turns_ratio"`
	Corners        []transformerCorner `json:"corners"`
}

type transformerCorner struct {
	Name     string  `json:"name"`
	CoreLoss float64 `json:"core_loss"`
	Loss     struct {
		Primary   float64 `json:"primary"`
		Secondary float64 `json:"secondary"`
	} `json:"winding_loss"`
	cornerJSON
}

type inductorJSON struct {
	commonJSON
	Turns      int              `json:"turns"`
	Inductance float64          `json:"inductance"`
	Corners    []inductorCorner `json:"corners"`
}

type inductorCorner struct {
	Name     string  `json:"name"`
	CoreLoss float64 `json:"core_loss"`
	Loss     float64 `json:"winding_loss"`
	cornerJSON
}

// cornerJSON is the rest of a corner; the temperatures of a passing corner are
// null.
type cornerJSON struct {
	Flux    float64  `json:"flux_density_peak"`
	Core    *float64 `json:"core_temperature"`
	Winding *float64 `json:"winding_temperature"`
}

type asBuiltJSON struct {
	Lr      float64      `json:"resonant_inductance"`
	Lm      float64      `json:"magnetizing_inductance"`
	Ratio   float64      `json:"turns_ratio"`
	Cr      float64      `json:"resonant_capacitance"`
	Corners []TankCorner `json:"corners"`
}

// DesignJSON writes a design as JSON. A design that ended without parts has
// null in their place.
func DesignJSON(w io.Writer, d *design.Design) error {
	out := designJSON{
		Format: 1, Title: d.Job.Title, Feasible: d.Feasible,
		Verdicts: orEmpty(d.Verdicts), Warnings: orEmpty(d.Warnings), Models: orEmpty(d.Models), Checks: orEmpty(d.Checks),
		Sizes: []sizeJSON{}, Pareto: pairsOf(d), Second: choicesOf(d), Advice: adviceOf(d), Loop: loopJSON{d.Iterations, d.Residual},
	}
	for _, s := range d.Ladder {
		out.Sizes = append(out.Sizes, sizeOf(s))
	}
	if d.Rating != nil {
		r := d.Rating
		t := &transformerJSON{
			commonJSON:   common(r, d.Transformer.Construction),
			PrimaryTurns: d.Transformer.Windings[0].Turns, SecondaryTurns: d.Transformer.Windings[1].Turns, Arrangement: r.Arrangement,
			Lp: r.OpenInductance, HotLp: r.HotInductance, Ls: r.SecondaryInductance, Lsc: r.ShortInductance, Halves: orEmpty(r.ShortHalves),
			Lm: r.MagnetizingInduct, Ratio: r.EffectiveTurnsRatio,
		}
		for _, c := range r.Corners {
			x := transformerCorner{Name: c.Name, CoreLoss: c.CoreLoss, cornerJSON: corner(c)}
			x.Loss.Primary, x.Loss.Secondary = c.PrimaryLoss, c.SecondaryLoss
			t.Corners = append(t.Corners, x)
		}
		out.Transformer = t
		out.AsBuilt = &asBuiltJSON{
			Lr: d.AsBuilt.Lr, Lm: d.AsBuilt.Lm, Ratio: d.AsBuilt.TurnsRatio, Cr: d.AsBuilt.Cr, Corners: TankCorners(d.Operations, nil),
		}
	}
	if r := d.InductorRating; r != nil {
		l := &inductorJSON{commonJSON: common(r, d.Inductor.Construction), Turns: d.Inductor.Windings[0].Turns, Inductance: r.OpenInductance}
		for _, c := range r.Corners {
			l.Corners = append(l.Corners, inductorCorner{Name: c.Name, CoreLoss: c.CoreLoss, Loss: c.PrimaryLoss, cornerJSON: corner(c)})
		}
		out.Inductor = l
	}
	return JSON(w, out)
}

func orEmpty[T any](list []T) []T {
	if list == nil {
		return []T{}
	}
	return list
}

func sizeOf(s design.Size) sizeJSON {
	out := sizeJSON{Part: s.Part, Core: s.Shape, Volume: s.Volume, Feasible: s.Feasible, Chosen: s.Chosen}
	if s.Loss > 0 {
		out.Loss = &s.Loss
	}
	if !s.Feasible {
		r := &reasonJSON{Limit: s.Reason.Limit, Bound: s.Reason.Bound, Unit: s.Reason.Unit, Sense: s.Reason.Sense}
		if v := s.Reason.Value; !math.IsNaN(v) && !math.IsInf(v, 0) {
			r.Value = &v
		}
		out.Limited = r
	}
	return out
}

func corner(c part.CornerRating) cornerJSON {
	out := cornerJSON{Flux: c.FluxDensityPeak}
	if c.Continuous {
		out.Core, out.Winding = &c.CoreTemperature, &c.WindingTemperature
	}
	return out
}

func common(r *part.Rating, c part.Construction) commonJSON {
	out := commonJSON{
		Core: r.Shape.Name, Confidence: string(r.Shape.Confidence), Material: c.Core.Material,
		gapJSON: gapJSON{
			Kind: string(c.Core.Gap.Kind), Length: r.Gap.Length, Pieces: max(c.Core.Gap.Pieces, 1), AL: r.Gap.AL, Sensitivity: r.Gap.Sensitivity,
			Spacer: r.Gap.SpacerLength, Plain: r.Gap.PlainLength, McLyman: r.Gap.McLymanLength, Clear: r.Gap.ClearDistance, Copper: r.Gap.CopperDistance,
		},
		Windings: []windingJSON{},
		Flux:     r.FluxDensityPeak, Overload: r.OverloadFlux, HeightLeft: r.HeightLeft, Mass: r.Mass, Volume: r.Volume, Outline: r.Outline,
	}
	if c.Core.Gap.Kind == part.Closed {
		out.gapJSON.Pieces = 0
	}
	for _, w := range r.Windings {
		out.Windings = append(out.Windings, windingJSON{
			w.Name, w.Turns, w.Wire, w.Parallel, w.Layers, w.DCResistance, w.ConductorArea, w.MeanLengthOfTurn, w.CurrentDensity, w.ACFactor,
		})
	}
	return out
}

// Design prints the summary of a design: the verdict and the nearest limits
// first, then both parts, the tank as built, the hand checks and what to know.
func Design(p *Printer, d *design.Design, folder string) error {
	if d.Job.Title != "" {
		p.Line("%s", d.Job.Title)
		p.Line("")
	}
	verdict(p, d)
	if err := Advice(p, d); err != nil {
		return err
	}
	partSummary(p, "Transformer", d.Rating, &d.Transformer.Construction, d)
	secondChoices(p, d, "transformer")
	if d.InductorRating != nil {
		partSummary(p, "Resonant inductor", d.InductorRating, &d.Inductor.Construction, d)
		secondChoices(p, d, "inductor")
	} else {
		p.Line("Resonant inductor: none, the transformer's leakage makes the resonant inductance")
		p.Line("")
	}
	asBuilt(p, d)
	losses(p, d)
	handChecks(p, d)
	toKnow(p, d)
	if folder != "" {
		p.Line("")
		p.Line("Written to %s: design.html, build.yaml, design.json, the winding sheets and their figures.", folder)
	}
	return p.Err()
}

// verdict says whether all limits are kept and which are nearest.
func verdict(p *Printer, d *design.Design) {
	var missed []part.Verdict
	for _, v := range d.Verdicts {
		if !v.Pass {
			missed = append(missed, v)
		}
	}
	total := d.TotalLoss()
	power := 0.0
	for _, o := range d.Operations {
		if o.Status == tank.OK && o.Corner.Duration == 0 {
			power += o.Corner.Share * o.OutputPower
		}
	}
	loss := ""
	if power > 0 {
		loss = fmt.Sprintf(" Both parts lose %.2f W, %.2f %% of the power (weighted by share).", total, 100*total/power)
	}
	if len(missed) == 0 {
		p.Paragraph(0, "EVERY LIMIT IS KEPT.%s", loss)
	} else {
		p.Paragraph(0, "%d %s MISSED.%s", len(missed), oneOrMany(len(missed), "LIMIT IS", "LIMITS ARE"), loss)
		for _, v := range missed {
			p.item(10, "  MISSED", verdictText(v))
		}
	}
	for _, v := range nearest(d.Verdicts, 4) {
		p.item(10, "  near", verdictText(v))
	}
	p.Line("")
}

func oneOrMany(n int, one, many string) string {
	if n == 1 {
		return one
	}
	return many
}

// nearest returns the kept limits with the least margin, one of each kind.
func nearest(list []part.Verdict, n int) []part.Verdict {
	margin := func(v part.Verdict) float64 {
		if v.Bound == 0 {
			return math.Inf(1)
		}
		if v.Sense == "max" {
			return (v.Bound - v.Value) / math.Abs(v.Bound)
		}
		return (v.Value - v.Bound) / math.Abs(v.Bound)
	}
	var out []part.Verdict
	for len(out) < n {
		best := -1
		for i, v := range list {
			if !v.Pass || v.Limit == "reached" || contains(out, v) {
				continue
			}
			if best < 0 || margin(v) < margin(list[best]) {
				best = i
			}
		}
		if best < 0 || margin(list[best]) > 0.5 {
			break
		}
		out = append(out, list[best])
	}
	return out
}

func contains(list []part.Verdict, v part.Verdict) bool {
	for _, x := range list {
		if x.Part == v.Part && x.Limit == v.Limit {
			return true
		}
	}
	return false
}

// verdictText words a verdict: part, limit, value, bound.
func verdictText(v part.Verdict) string {
	where := v.Part
	if v.Corner != "" {
		where += ", corner " + v.Corner
	}
	most := "at most"
	if v.Sense == "min" {
		most = "at least"
	}
	return fmt.Sprintf("%s: %s %s, %s %s", where, v.Limit, LimitValue(v.Value, v.Unit), most, LimitValue(v.Bound, v.Unit))
}

// LimitValue prints the value of a limit in its unit; ratios in per cent.
func LimitValue(x float64, unit string) string {
	switch {
	case math.IsNaN(x) || math.IsInf(x, 0):
		return "nothing that fits"
	case unit == "":
		return fmt.Sprintf("%.3g %%", 100*x)
	case unit == "degC":
		return fmt.Sprintf("%.1f °C", x)
	case unit == "m":
		return fmt.Sprintf("%.3g mm", 1e3*x)
	case unit == "kg":
		return fmt.Sprintf("%.3g g", 1e3*x)
	case unit == "H":
		return quantity.Format(x, quantity.Henry)
	case unit == "W":
		return quantity.Format(x, quantity.Watt)
	}
	return fmt.Sprintf("%.4g %s", x, unit)
}

func mm(x float64, digits int) string { return fmt.Sprintf("%.*f mm", digits, 1e3*x) }

// partSummary prints one part: core and gap, windings, what it measures.
func partSummary(p *Printer, title string, r *part.Rating, c *part.Construction, d *design.Design) {
	p.Line("%s", title)
	note := ""
	if !r.Shape.Proven() {
		note = "; " + shape.NotProven
	}
	p.item(18, "  core", fmt.Sprintf("%s, %s, Ae %.4g mm², Ve %.3g cm³, table confidence %s%s", r.Shape.Name, c.Core.Material, 1e6*r.Shape.Ae, 1e6*r.Shape.Ve, r.Shape.Confidence, note))
	if rows := ownRows(r, c); len(rows) > 0 {
		p.item(18, "  own rows", strings.Join(rows, "; "))
	}
	p.item(18, "  gap", gapText(r, c))
	turns := ""
	for i, w := range c.Windings {
		if i > 0 {
			turns += " : "
		}
		turns += fmt.Sprint(w.Turns)
	}
	p.item(18, "  turns", fmt.Sprintf("%s, arranged %s", turns, r.Arrangement))
	if r.Part == "transformer" {
		p.item(18, "  inductance", fmt.Sprintf("Lp %s at 25 °C (%+.1f %% hot), Ls %s, Lsc %s%s",
			quantity.Format(r.OpenInductance, quantity.Henry), 100*(r.HotInductance/r.OpenInductance-1),
			quantity.Format(r.SecondaryInductance, quantity.Henry), quantity.Format(r.ShortInductance, quantity.Henry), halvesText(r)))
		p.item(18, "  for the tank", fmt.Sprintf("Lm %s, effective turns ratio %.4f, all leakage on the primary",
			quantity.Format(r.MagnetizingInduct, quantity.Henry), r.EffectiveTurnsRatio))
	} else {
		p.item(18, "  inductance", fmt.Sprintf("L %s at 25 °C (%+.1f %% hot)", quantity.Format(r.OpenInductance, quantity.Henry), 100*(r.HotInductance/r.OpenInductance-1)))
	}
	p.item(18, "  flux density", fmt.Sprintf("%.0f mT peak in the smallest section, %.0f mT at the current limit; Bs hot %.0f mT",
		1e3*r.FluxDensityPeak, 1e3*r.OverloadFlux, 1e3*r.Ferrite.Bsat(d.Job.Build.For(r.Part).Limits.CoreTemperature)))
	p.item(18, "  fit", fmt.Sprintf("%s of %s window height left after bulge, %s x %s x %s high, %.0f g",
		mm(r.HeightLeft, 2), mm(r.Former.Height, 2), mm(r.Outline[0], 1), mm(r.Outline[1], 1), mm(r.Outline[2], 1), 1e3*r.Mass))
	p.Line("")
	t := Table{Head: []string{"winding", "turns", "wire", "in hand", "layers", "Rdc 20 °C", "J A/mm²", "Rac/Rdc"}, Left: []int{0, 2}, Fold: true}
	for _, w := range r.Windings {
		t.Add(w.Name, fmt.Sprint(w.Turns), w.Wire, fmt.Sprint(w.Parallel), fmt.Sprint(w.Layers), quantity.Format(w.DCResistance, quantity.Ohm),
			fmt.Sprintf("%.1f", 1e-6*w.CurrentDensity), fmt.Sprintf("%.2f", w.ACFactor))
	}
	p.Table(t)
	p.Line("")
}

// ownRows names the table rows of a part that came from the user's own files.
func ownRows(r *part.Rating, c *part.Construction) []string {
	var rows []string
	add := func(what, origin string) {
		if origin != "" {
			rows = append(rows, what+" from "+origin)
		}
	}
	add("core "+r.Shape.Name, r.Shape.Origin)
	add("former "+r.Former.Name, r.Former.Origin)
	for _, file := range r.Ferrite.OwnRows() {
		add("ferrite "+r.Ferrite.Name, file)
	}
	for _, e := range c.Build {
		if e.Wire.Own != nil {
			add("wire "+e.Wire.String(), e.Wire.Own.Origin)
		}
	}
	return rows
}

func halvesText(r *part.Rating) string {
	if len(r.ShortHalves) < 2 {
		return ""
	}
	return fmt.Sprintf(" (halves %s and %s)", quantity.Format(r.ShortHalves[0], quantity.Henry), quantity.Format(r.ShortHalves[1], quantity.Henry))
}

func gapText(r *part.Rating, c *part.Construction) string {
	g := c.Core.Gap
	switch g.Kind {
	case part.Closed, "":
		return fmt.Sprintf("none, A_L %s", quantity.Format(r.Gap.AL, quantity.Henry))
	case part.Spacer:
		return fmt.Sprintf("film of %s under all legs, A_L %s, %.1f %% per 10 µm", mm(r.Gap.Length, 3), quantity.Format(r.Gap.AL, quantity.Henry), 1e-3*r.Gap.Sensitivity)
	}
	pieces := "ground into the post of one half"
	if g.Pieces > 1 {
		pieces = fmt.Sprintf("in %d pieces of %s in the post", g.Pieces, mm(r.Gap.PieceLength, 3))
	}
	text := fmt.Sprintf("%s %s, A_L %s (%s governs), %.1f %% per 10 µm", mm(r.Gap.Length, 3), pieces, quantity.Format(r.Gap.AL, quantity.Henry), g.Governs, 1e-3*r.Gap.Sensitivity)
	if r.Gap.SpacerLength > 0 {
		text += fmt.Sprintf("; instead film of %s under all legs", mm(r.Gap.SpacerLength, 3))
	}
	return text + fmt.Sprintf("; keep copper %s away, the nearest is at %s", mm(r.Gap.ClearDistance, 1), mm(r.Gap.CopperDistance, 2))
}

// asBuilt prints the tank with the parts in it, wanted beside built.
func asBuilt(p *Printer, d *design.Design) {
	want, built := d.Job.Tank, d.AsBuilt
	p.Line("Tank as built (loop closed in %d rounds, last change %.1e)", d.Iterations, d.Residual)
	t := Table{Head: []string{"", "wanted", "as built", "off by"}, Left: []int{0}, Fold: true}
	row := func(name string, a, b float64, u quantity.Unit) {
		t.Add(name, quantity.Format(a, u), quantity.Format(b, u), fmt.Sprintf("%+.2f %%", 100*(b/a-1)))
	}
	row("Lr", want.Lr, built.Lr, quantity.Henry)
	if want.Lm > 0 {
		row("Lm", want.Lm, built.Lm, quantity.Henry)
	} else {
		t.Add("Lm", "-", quantity.Format(built.Lm, quantity.Henry), "-")
	}
	t.Add("turns ratio", fmt.Sprintf("%.4g", want.TurnsRatio), fmt.Sprintf("%.4f", built.TurnsRatio), fmt.Sprintf("%+.2f %%", 100*(built.TurnsRatio/want.TurnsRatio-1)))
	p.Table(t)
	p.Line("")
	c := Table{Head: []string{"corner", "status", "f kHz", "Vout V", "Ir A", "Ir pk A", "Is A", "gain margin", "soft switching"}, Left: []int{0, 1, 8}, Fold: true}
	for i := range d.Operations {
		o := &d.Operations[i]
		if o.Status != tank.OK {
			c.Add(o.Corner.Name, string(o.Status))
			continue
		}
		margin, soft := "-", "not assessed"
		if o.Corner.OutputVoltage > 0 {
			margin = fmt.Sprintf("%.1f %%", 100*o.PeakGainMargin)
		}
		if z := o.SoftSwitching; z != nil {
			soft = "INCOMPLETE"
			if z.Complete {
				soft = fmt.Sprintf("%.0f of %.0f ns", 1e9*z.SwingTime, 1e9*built.DeadTime)
			}
		}
		c.Add(o.Corner.Name, "ok", fmt.Sprintf("%.2f", 1e-3*o.Frequency), fmt.Sprintf("%.2f", o.OutputVoltage), fmt.Sprintf("%.3f", o.Resonant.RMS),
			fmt.Sprintf("%.3f", o.Resonant.Peak), fmt.Sprintf("%.3f", o.Windings[0].RMS), margin, soft)
	}
	p.Table(c)
	p.Line("")
}

// losses prints losses and temperatures by corner.
func losses(p *Printer, d *design.Design) {
	p.Line("Losses in W and temperatures in °C (each ±25 %% of the rise)")
	t := Table{Head: []string{"part", "corner", "core", "primary", "secondary", "sum", "B mT", "core °C", "hot spot °C"}, Left: []int{0, 1}, Fold: true}
	for _, r := range []*part.Rating{d.Rating, d.InductorRating} {
		if r == nil {
			continue
		}
		for _, c := range r.Corners {
			secondary := fmt.Sprintf("%.3f", c.SecondaryLoss)
			if r.Part == "inductor" {
				secondary = "-"
			}
			core, hot := "passing", ""
			if c.Continuous {
				core, hot = fmt.Sprintf("%.0f", c.CoreTemperature), fmt.Sprintf("%.0f", c.WindingTemperature)
				if c.Runaway {
					core, hot = "RUNAWAY", "RUNAWAY"
				}
			}
			t.Add(r.Part, c.Name, fmt.Sprintf("%.3f", c.CoreLoss), fmt.Sprintf("%.3f", c.PrimaryLoss), secondary, fmt.Sprintf("%.3f", c.Loss()),
				fmt.Sprintf("%.0f", 1e3*c.FluxDensityPeak), core, hot)
		}
	}
	p.Table(t)
	p.Line("")
}

// handChecks prints the figures that can be checked on paper beside the model's.
func handChecks(p *Printer, d *design.Design) {
	if len(d.Checks) == 0 {
		return
	}
	p.Line("Checks by hand")
	for _, r := range []*part.Rating{d.Rating, d.InductorRating} {
		if r == nil {
			continue
		}
		t := Table{Head: []string{r.Part, "by hand", "model", "off by", "formula"}, Left: []int{0, 4}, Fold: true}
		for _, c := range r.Checks {
			t.Add(c.Quantity, handValue(c.Hand, c.Unit), handValue(c.Model, c.Unit), fmt.Sprintf("%+.1f %%", 100*(c.Hand/c.Model-1)), c.Formula)
		}
		p.Table(t)
		for _, c := range r.Checks {
			if c.Note != "" {
				p.item(4, "", c.Quantity+": "+c.Note+".")
			}
		}
		p.Line("")
	}
}

func handValue(x float64, unit string) string {
	switch unit {
	case "T":
		return fmt.Sprintf("%.1f mT", 1e3*x)
	case "m":
		return mm(x, 3)
	case "A":
		return quantity.Format(x, quantity.Ampere)
	case "H":
		return quantity.Format(x, quantity.Henry)
	case "ohm":
		return quantity.Format(x, quantity.Ohm)
	case "J":
		return quantity.Format(x, quantity.Joule)
	}
	return fmt.Sprintf("%.4g", x)
}

// toKnow prints defaults, warnings and cautions.
func toKnow(p *Printer, d *design.Design) {
	if len(d.Warnings) > 0 {
		p.Line("To know")
		for _, w := range d.Warnings {
			p.item(7, "  "+w.Code, w.Text)
		}
		p.Line("")
	}
	defaults(p, d)
	p.Paragraph(0, "The insulation is a proposal under the assumptions stated, not a certified construction: compliance with the safety standard that applies is shown by the responsible party. Samples are not for connection to the mains without that.")
}

// defaults lists every default that was used, with its mark.
func defaults(p *Printer, d *design.Design) {
	list := d.Job.Defaults()
	if len(list) == 0 {
		return
	}
	var items []string
	for _, x := range list {
		if !strings.HasPrefix(x.Path, "build.") || strings.HasPrefix(x.Path, "build.sheet") || x.Value == "absent" {
			continue
		}
		mark := x.Mark
		if mark == "" {
			mark = "OWN"
		}
		items = append(items, fmt.Sprintf("%s %s (%s)", strings.TrimPrefix(x.Path, "build."), x.Value, mark))
	}
	p.Line("Defaults used (CP common practice, PUB published, MEM from memory, OWN our proposal)")
	p.item(2, "", strings.Join(items, "; "))
	p.Line("")
}

// Ladder prints what stopped each core size, when no design came out.
func Ladder(p *Printer, d *design.Design) error {
	if d.Job.Title != "" {
		p.Line("%s", d.Job.Title)
		p.Line("")
	}
	p.Line("No design keeps every limit. What stopped each core size, smallest first:")
	p.Line("")
	t := Table{Head: []string{"part", "core", "cm³", "loss W", "stopped by", "value", "bound"}, Left: []int{0, 1, 4}, Fold: true}
	for _, s := range d.Ladder {
		loss := "-"
		if s.Loss > 0 {
			loss = fmt.Sprintf("%.2f", s.Loss)
		}
		if s.Feasible {
			t.Add(s.Part, s.Shape, fmt.Sprintf("%.1f", 1e6*s.Volume), loss, "keeps every limit", "", "")
			continue
		}
		sign := "<= "
		if s.Reason.Sense == "min" {
			sign = ">= "
		}
		t.Add(s.Part, s.Shape, fmt.Sprintf("%.1f", 1e6*s.Volume), loss, s.Reason.Limit, LimitValue(s.Reason.Value, s.Reason.Unit), sign+LimitValue(s.Reason.Bound, s.Reason.Unit))
	}
	p.Table(t)
	return p.Err()
}
