package page

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"html"
	"math"
	"os"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"sync"
	"testing"

	"gapwright/corelib/material"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/design"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/reports/text"
	"gapwright/tank"
)

// finished rates a finished build and gives it the kinds of size that a search
// leaves: chosen, kept, stopped by a value, by nothing that fits, by the table.
func finished(t testing.TB) Input {
	t.Helper()
	rateOnce.Do(func() { rated = rate(t) })
	if rated.Design == nil {
		t.Fatal("the build could not be rated")
	}
	// Tests change what they get.
	in, d, v := rated, *rated.Design, *rated.View
	for _, r := range []**part.Rating{&d.Rating, &d.InductorRating} {
		c := **r
		c.Corners, c.Checks, c.Windings = slices.Clone(c.Corners), slices.Clone(c.Checks), slices.Clone(c.Windings)
		*r = &c
	}
	d.Operations, d.Verdicts, d.Warnings, d.Models = slices.Clone(d.Operations), slices.Clone(d.Verdicts), slices.Clone(d.Warnings), slices.Clone(d.Models)
	d.Ladder, d.Pareto, d.SecondChoices = slices.Clone(d.Ladder), slices.Clone(d.Pareto), slices.Clone(d.SecondChoices)
	v.Corners, v.Parts = slices.Clone(v.Corners), slices.Clone(v.Parts)
	for i := range v.Parts {
		p := &v.Parts[i]
		p.Fields, p.Strands = slices.Clone(p.Fields), slices.Clone(p.Strands)
	}
	in.Explanations = slices.Clone(in.Explanations)
	in.Design, in.View = &d, &v
	return in
}

var (
	rateOnce sync.Once
	rated    Input
)

func rate(t testing.TB) Input {
	t.Helper()
	data, err := os.ReadFile("../../testdata/page/build.yaml")
	if err != nil {
		t.Fatal(err)
	}
	b, err := job.ReadBuild("build.yaml", data)
	if err != nil {
		t.Fatal(err)
	}
	tables := design.Tables{Shapes: shape.Embedded(), Ferrites: material.Embedded(), Wires: &wire.Table{}}
	d, err := design.Check(context.Background(), b.Job, b.Transformer, b.Inductor, tables)
	if err != nil {
		t.Fatal(err)
	}
	d.Ladder = []design.Size{
		{Part: "transformer", Shape: "EFD 10/5/3", Volume: 0.5e-6, Reason: design.Reason{Limit: "former", Bound: 1, Sense: "min"}},
		{Part: "transformer", Shape: "RM 8", Volume: 6.1e-6, Loss: 15.3, Reason: design.Reason{Limit: "core_temperature", Value: 300, Bound: 110, Unit: "degC", Sense: "max"}},
		{Part: "transformer", Shape: "PQ 35/35", Volume: 39e-6, Loss: 2.52, Reason: design.Reason{Limit: "ratio_error", Value: 0.0213, Bound: 0.02, Sense: "max"}},
		{Part: "transformer", Shape: "E 42/21/15", Volume: 58.69e-6, Loss: 2.61, Feasible: true},
		{Part: "transformer", Shape: "PQ 40/40", Volume: 59.57e-6, Loss: 1.907, Feasible: true, Chosen: true},
		{Part: "transformer", Shape: "ETD 44/22/15", Volume: 66e-6, Loss: 2.9, Feasible: true},
		{Part: "inductor", Shape: "E 13/7/4", Volume: 1.5e-6, Reason: design.Reason{Limit: "height_left_min", Value: math.NaN(), Bound: 0.3e-3, Unit: "m", Sense: "min"}},
		{Part: "inductor", Shape: "PQ 20/16", Volume: 5.98e-6, Loss: 0.80, Feasible: true},
		{Part: "inductor", Shape: "RM 8", Volume: 6.09e-6, Loss: 0.723, Feasible: true, Chosen: true},
	}
	d.Pareto = []design.Pair{
		{Transformer: "PQ 40/40", Inductor: "PQ 20/16", Loss: 2.71, Volume: 65.55e-6, Mass: 0.152},
		{Transformer: "PQ 40/40", Inductor: "RM 8", Loss: 2.63, Volume: 65.66e-6, Mass: 0.153, Chosen: true},
		{Transformer: "ETD 49/25/16", Loss: 2.2, Volume: 90e-6, Mass: 0.2},
	}
	d.SecondChoices = []design.WireChoice{{Part: "transformer", Winding: "P", Wire: "60 x 0.08 mm litz", Parallel: 2, Layers: 2, Loss: 1.92, More: 0.013}}
	v, err := design.NewView(d, tables)
	if err != nil {
		t.Fatal(err)
	}
	explanations, err := design.ExplainAll(context.Background(), d, tables)
	if err != nil {
		t.Fatal(err)
	}
	return Input{Design: d, View: v, MadeWith: "gapwright, test", Explanations: explanations}
}

func write(t testing.TB, in Input) string {
	t.Helper()
	var b bytes.Buffer
	if err := Write(&b, in); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

var dataElement = regexp.MustCompile(`<data value="([^"]*)"(?: data-at="([^"]*)")?>([^<]*)</data>`)

// at looks up a path such as transformer.corners.0.core_loss.
func at(root any, path string) (float64, error) {
	for _, key := range strings.Split(path, ".") {
		switch x := root.(type) {
		case map[string]any:
			v, ok := x[key]
			if !ok {
				return 0, fmt.Errorf("no %s", key)
			}
			root = v
		case []any:
			i, err := strconv.Atoi(key)
			if err != nil || i >= len(x) {
				return 0, fmt.Errorf("no element %s of %d", key, len(x))
			}
			root = x[i]
		default:
			return 0, fmt.Errorf("%s below a %T", key, root)
		}
	}
	v, ok := root.(float64)
	if !ok {
		return 0, fmt.Errorf("%T is no number", root)
	}
	return v, nil
}

// Every figure of the page is the one at its place in design.json, and its words
// are that figure rounded.
func TestNumbersAreThoseOfTheJSON(t *testing.T) {
	in := finished(t)
	page := write(t, in)
	var js bytes.Buffer
	if err := text.DesignJSON(&js, in.Design); err != nil {
		t.Fatal(err)
	}
	var root any
	if err := json.Unmarshal(js.Bytes(), &root); err != nil {
		t.Fatal(err)
	}
	placed := map[string]bool{}
	for _, m := range dataElement.FindAllStringSubmatch(page, -1) {
		value, err := strconv.ParseFloat(m[1], 64)
		if err != nil {
			t.Fatalf("value %q: %v", m[1], err)
		}
		if m[2] != "" {
			placed[m[2]] = true
			want, err := at(root, m[2])
			if err != nil {
				t.Errorf("%s: %v", m[2], err)
			} else if want != value {
				t.Errorf("%s: the page has %v, design.json %v", m[2], value, want)
			}
		}
		checkRounded(t, m[2], value, html.UnescapeString(m[3]))
	}
	if len(placed) < 250 {
		t.Errorf("only %d figures of the page have a place in design.json", len(placed))
	}
	// What nobody may miss on the page.
	for _, path := range []string{
		"transformer.gap", "transformer.open_inductance", "transformer.short_inductance", "transformer.windings.0.dc_resistance",
		"transformer.corners.0.core_loss", "transformer.corners.0.winding_loss.primary", "inductor.inductance", "inductor.corners.1.winding_loss",
		"tank_as_built.resonant_inductance", "tank_as_built.corners.1.peak_gain_margin", "verdicts.0.value", "hand_checks.0.hand", "sizes.4.loss", "pareto.1.loss", "second_choices.0.more",
	} {
		if !placed[path] {
			t.Errorf("%s is not on the page", path)
		}
	}
}

// unitFactors turn a word of the page into SI.
var unitFactors = map[string]float64{
	"": 1, "%": 1e-2, "mm": 1e-3, "cm³": 1e-6, "g": 1e-3, "mT": 1e-3, "µH": 1e-6, "nH": 1e-9, "mH": 1e-3, "Ω": 1, "mΩ": 1e-3, "kHz": 1e3, "Hz": 1, "MHz": 1e6,
	"V": 1, "A": 1, "mA": 1e-3, "W": 1, "mW": 1e-3, "°C": 1, "µJ": 1e-6, "mJ": 1e-3, "H": 1, "mm high": 1e-3, "A rms": 1, "A peak": 1, "V peak": 1, "pF": 1e-12, "nF": 1e-9, "ns": 1e-9, "mm²": 1e-6, "K": 1, "kΩ": 1e3,
}

// bareFactor is the unit that the head of a column names, by what stands there.
func bareFactor(path string) float64 {
	for key, f := range map[string]float64{"current_density": 1e6, "flux_density_peak": 1e-3, "frequency": 1e3, "volume": 1e-6, "mass": 1e-3} {
		if strings.HasSuffix(path, "."+key) {
			return f
		}
	}
	if strings.Contains(path, ".outline.") {
		return 1e-3
	}
	return 1
}

var wordsOfNumber = regexp.MustCompile(`^([≤≥] )?([+−-]?[0-9.]+)(?: ?([^0-9]*))?$`)

func checkRounded(t *testing.T, path string, value float64, words string) {
	t.Helper()
	if words == "yes" || words == "no" {
		return
	}
	words = strings.Trim(words, ", ")
	m := wordsOfNumber.FindStringSubmatch(words)
	if m == nil {
		t.Errorf("%s: %q is no figure", path, words)
		return
	}
	digits := strings.Replace(m[2], "−", "-", 1)
	shown, err := strconv.ParseFloat(digits, 64)
	if err != nil {
		t.Errorf("%s: %q: %v", path, words, err)
		return
	}
	// Half of the last digit shown; a number without decimals may stand for one
	// with fewer digits.
	step := 1.0
	if i := strings.IndexByte(digits, '.'); i >= 0 {
		step = math.Pow(10, float64(i+1-len(digits)))
	}
	unit := strings.TrimSpace(m[3])
	f := unitFactors[unit]
	if unit == "" {
		f = bareFactor(path)
	}
	if strings.HasSuffix(path, "inductance_change_per_gap") {
		f = 1e3 // per cent per 10 µm
	}
	if f != 0 && math.Abs(shown*f-value) <= 0.5000001*step*f+1e-12*math.Abs(value) {
		return
	}
	t.Errorf("%s: the page says %q for %v", path, words, value)
}

func TestSameInputSamePage(t *testing.T) {
	in := finished(t)
	first, second := write(t, in), write(t, in)
	if first != second {
		t.Error("two pages of one design differ")
	}
}

// The page needs nothing but itself.
func TestSelfContained(t *testing.T) {
	page := write(t, finished(t))
	if n := len(page); n > 2e6 {
		t.Errorf("%d bytes, more than 2 MB", n)
	}
	for _, m := range regexp.MustCompile(`(?i)(?:\b(?:src|href|action|poster|srcset)\s*=\s*"?|url\(|@import|fetch\(|XMLHttpRequest|WebSocket|sendBeacon)[^ >)]{0,40}`).FindAllString(page, -1) {
		if !strings.Contains(m, `href="#`) && !strings.Contains(m, `href="data:image/png;base64,`) {
			t.Errorf("the page reaches out: %s", m)
		}
	}
	for _, m := range regexp.MustCompile(`https?://[^"'\s<]*`).FindAllString(page, -1) {
		if m != "http://www.w3.org/2000/svg" {
			t.Errorf("an address in the page: %s", m)
		}
	}
}

const hostile = `<script>window.hurt=1</script><img src=x onerror="window.hurt=2">&"'</title></style>`

// angry puts markup into every text that a user or a table may bring.
func angry(t testing.TB) Input {
	in := finished(t)
	d := in.Design
	d.Job.Title, d.Job.PartNumber, d.Job.Revision = hostile, hostile, hostile
	for i := range d.Operations {
		d.Operations[i].Corner.Name += hostile
	}
	for _, r := range []*part.Rating{d.Rating, d.InductorRating} {
		for i := range r.Corners {
			r.Corners[i].Name += hostile
		}
		r.Shape.Name, r.Former.Name, r.Ferrite.Name = hostile, hostile, hostile
		r.Windings[0].Wire, r.Windings[0].Name = hostile, hostile
		r.Checks[0].Quantity, r.Checks[0].Formula, r.Checks[0].Note = hostile, hostile, hostile
	}
	for i := range in.View.Corners {
		in.View.Corners[i].Name += hostile
	}
	for p := range in.View.Parts {
		for i := range in.View.Parts[p].Fields {
			in.View.Parts[p].Fields[i].Corner += hostile
		}
		for i := range in.View.Parts[p].Strands {
			in.View.Parts[p].Strands[i].Winding += hostile
		}
	}
	d.Ladder[0].Shape, d.Ladder[4].Shape = hostile, hostile
	d.Pareto[1].Transformer, d.SecondChoices[0].Wire = hostile, hostile
	d.Advice = []design.Advice{{Change: hostile, Effect: hostile}}
	d.Warnings = append(d.Warnings, part.Warning{Code: hostile, Text: hostile})
	d.Models = append(d.Models, part.Model{Quantity: hostile, Model: hostile, Source: hostile})
	d.Verdicts[0].Corner, d.Verdicts[0].Limit = hostile, hostile
	in.MadeWith = hostile
	for i, e := range in.Explanations {
		x := *e
		x.What, x.Corner, x.Formula, x.Model, x.Source = hostile, e.Corner+hostile, hostile, hostile, hostile
		x.Inputs, x.Effects = slices.Clone(x.Inputs), slices.Clone(x.Effects)
		for k := range x.Inputs {
			x.Inputs[k].Name, x.Inputs[k].Origin = hostile, hostile
		}
		for k := range x.Effects {
			x.Effects[k].Input, x.Effects[k].Step = hostile, hostile
		}
		if i == 0 {
			x.Quantity = hostile
		}
		in.Explanations[i] = &x
	}
	return in
}

func TestMarkupIsShownAsText(t *testing.T) {
	page := write(t, angry(t))
	if n := strings.Count(page, "<script"); n != 2 {
		t.Errorf("%d scripts in the page, 2 are its own", n)
	}
	for _, bad := range []string{"<img", `onerror="window`, "</title></style>"} {
		if strings.Contains(page, bad) {
			t.Errorf("%q came through", bad)
		}
	}
	if n := strings.Count(page, "&lt;script&gt;window.hurt=1"); n < 20 {
		t.Errorf("the texts are shown %d times only", n)
	}
}

func TestMissedLimitsComeFirst(t *testing.T) {
	in := finished(t)
	in.Design.Feasible = false
	in.Design.Verdicts[3].Pass, in.Design.Verdicts[3].Value = false, 131
	page := write(t, in)
	verdict := page[strings.Index(page, `id="verdict"`):strings.Index(page, `id="parts"`)]
	for _, want := range []string{"1 limit is missed.", "<h2>Missed</h2>", "131.0 °C", "None of the single changes that were tried repairs it alone."} {
		if !strings.Contains(verdict, want) {
			t.Errorf("the verdict lacks %q", want)
		}
	}
	if strings.Contains(page, "Every limit is kept.") {
		t.Error("both verdicts at once")
	}
	in.Design.Advice = []design.Advice{{Change: "one more layer", Effect: "118.0 °C"}}
	if page := write(t, in); !strings.Contains(page, "<b>one more layer</b>: 118.0 °C") {
		t.Error("the advice is not shown")
	}
	if strings.Index(verdict, "Missed") > strings.Index(verdict, "Nearest limits") {
		t.Error("what is missed comes after what is kept")
	}
}

func TestEmptySetsHaveWords(t *testing.T) {
	for _, c := range []struct {
		name, want string
		change     func(*Input)
		not        string
	}{
		{"no search", "No core sizes were compared", func(in *Input) { in.Design.Ladder, in.Design.Pareto = nil, nil }, `id="size-table"`},
		{"no pair", "No pair of core sizes keeps every limit.", func(in *Input) { in.Design.Pareto = nil }, `id="pair-table"`},
		{"nothing kept", "No core size keeps every limit", func(in *Input) {
			in.Design.Pareto = nil
			for i := range in.Design.Ladder {
				s := &in.Design.Ladder[i]
				if s.Feasible {
					s.Feasible, s.Chosen, s.Reason = false, false, design.Reason{Limit: "height", Value: 0.06, Bound: 0.05, Unit: "m", Sense: "max"}
				}
			}
		}, `class="sizes"`},
		{"no corner", "No corner of the tank as built is served", func(in *Input) {
			in.View.Corners = nil
			for i := range in.View.Parts {
				in.View.Parts[i].Fields = nil
			}
			for i := range in.Design.Operations {
				in.Design.Operations[i] = tank.Operation{Corner: in.Design.Operations[i].Corner, Status: tank.BeyondPeakGain, Reason: "beyond the peak"}
			}
		}, `class="period"`},
		{"no checks", "No hand checks were computed", func(in *Input) { in.Design.Rating.Checks, in.Design.InductorRating.Checks = nil, nil }, `class="checks"`},
		{"no warnings", "No warnings.", func(in *Input) { in.Design.Warnings = nil }, `class="warnings"`},
		{"ideal edges", "the edges are ideal", func(in *Input) {
			for i := range in.View.Corners {
				in.View.Corners[i].EdgeTime = nil
			}
		}, ""},
		{"no inductor", "the leakage makes the resonant inductance", func(in *Input) {
			in.Design.Inductor, in.Design.InductorRating = nil, nil
			in.View.Parts = in.View.Parts[:1]
			for i := range in.View.Corners {
				in.View.Corners[i].Flux = in.View.Corners[i].Flux[:1]
			}
		}, "Resonant inductor: RM"},
	} {
		t.Run(c.name, func(t *testing.T) {
			in := finished(t)
			c.change(&in)
			page := write(t, in)
			if !strings.Contains(page, c.want) {
				t.Errorf("the page does not say %q", c.want)
			}
			if c.not != "" && strings.Contains(page, c.not) {
				t.Errorf("the page has %s all the same", c.not)
			}
		})
	}
}

// A search that ends without parts still has something to show, and says so
// first.
func TestWithoutParts(t *testing.T) {
	in := finished(t)
	d := &design.Design{Job: in.Design.Job, Wanted: in.Design.Wanted, Operations: in.Design.Wanted, AsBuilt: in.Design.Job.Tank}
	for _, s := range in.Design.Ladder {
		if !s.Feasible {
			d.Ladder = append(d.Ladder, s)
		}
	}
	page := write(t, Input{Design: d, Failure: "no core size gives a transformer <b>"})
	for _, want := range []string{"No design keeps every limit.", "No core size gives a transformer &lt;b&gt;.", "No core size keeps every limit, so there is no trade", `id="size-table"`, "The tank as wanted", "not a certified construction", "Defaults used"} {
		if !strings.Contains(page, want) {
			t.Errorf("the page does not say %q", want)
		}
	}
	for _, not := range []string{`id="parts"`, `href="#parts"`, "Every limit is kept", "tank_as_built", `class="sizes"`} {
		if strings.Contains(page, not) {
			t.Errorf("the page has %s", not)
		}
	}
	var b bytes.Buffer
	if err := Write(&b, Input{Design: in.Design}); err == nil || b.Len() > 0 {
		t.Errorf("parts without a view: error %v, %d bytes", err, b.Len())
	}
	if err := Write(&b, Input{}); err == nil {
		t.Error("no design is no error")
	}
}

// The sizes that no other beats: with equal ones the first stays.
func TestFront(t *testing.T) {
	list := []design.Size{
		{Part: "a", Volume: 1, Loss: 5, Feasible: true},
		{Part: "a", Volume: 2, Loss: 3, Feasible: true},
		{Part: "a", Volume: 2, Loss: 3, Feasible: true}, // the same once more
		{Part: "a", Volume: 3, Loss: 4, Feasible: true}, // beaten
		{Part: "a", Volume: 0.5, Loss: 1},               // stopped
		{Part: "b", Volume: 9, Loss: 9, Feasible: true},
		{Part: "a", Volume: 4, Feasible: true}, // not rated
	}
	want := []bool{true, true, false, false, false, true, false}
	for i, on := range front(list) {
		if on != want[i] {
			t.Errorf("size %d: on the front %t, want %t", i, on, want[i])
		}
	}
}

// Text reads on its ground in light and in dark: contrast of at least 4.5 (WCAG
// 2.1, 1.4.3), of lines and areas with a meaning at least 3 (1.4.11).
func TestContrast(t *testing.T) {
	variable := regexp.MustCompile(`--([a-z-]+):(#[0-9a-f]{6})`)
	blocks := regexp.MustCompile(`(?s):root[^{]*\{(.*?)\}`).FindAllStringSubmatch(styleText, -1)
	checked := 0
	for _, b := range blocks {
		v := map[string]string{}
		for _, m := range variable.FindAllStringSubmatch(b[1], -1) {
			v[m[1]] = m[2]
		}
		if v["ground"] == "" {
			continue
		}
		checked++
		for _, ground := range []string{"ground", "paper"} {
			for name, least := range map[string]float64{"ink": 4.5, "quiet": 4.5, "primary-ink": 4.5, "secondary-ink": 4.5, "other-ink": 4.5, "good": 4.5, "bad": 4.5, "accent": 4.5, "primary": 3, "other": 3, "faint": 2.8, "focus": 3} {
				if c := contrast(v[name], v[ground]); c < least {
					t.Errorf("block %d: %s on %s has a contrast of %.2f, below %.1f", checked, name, ground, c, least)
				}
			}
		}
	}
	if checked < 3 {
		t.Errorf("%d sets of colours found", checked)
	}
}

func contrast(a, b string) float64 {
	l := func(s string) float64 {
		n, err := strconv.ParseUint(strings.TrimPrefix(s, "#"), 16, 32)
		if err != nil {
			return math.NaN()
		}
		lin := func(c uint64) float64 {
			x := float64(c&255) / 255
			if x <= 0.04045 {
				return x / 12.92
			}
			return math.Pow((x+0.055)/1.055, 2.4)
		}
		return 0.2126*lin(n>>16) + 0.7152*lin(n>>8) + 0.0722*lin(n)
	}
	x, y := l(a)+0.05, l(b)+0.05
	return math.Max(x, y) / math.Min(x, y)
}

func BenchmarkWrite(b *testing.B) {
	in := finished(b)
	var out bytes.Buffer
	b.ReportAllocs()
	for b.Loop() {
		out.Reset()
		if err := Write(&out, in); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(out.Len()), "page-bytes")
}

var originSummary = regexp.MustCompile(`<summary id="([^"]*)"><span class="what">[^<]*<small>([^<]*)</small></span> <b>(.*?)</b></summary>`)

// Every explained figure stands on the page with its full value, at its place in
// design.json unless it is a sum of figures there, and in the terminal's words.
func TestExplanationsOnThePage(t *testing.T) {
	in := finished(t)
	page := write(t, in)
	var js bytes.Buffer
	if err := text.DesignJSON(&js, in.Design); err != nil {
		t.Fatal(err)
	}
	var root any
	if err := json.Unmarshal(js.Bytes(), &root); err != nil {
		t.Fatal(err)
	}
	list := originSummary.FindAllStringSubmatch(page, -1)
	if len(list) != len(in.Explanations) || len(list) < 25 {
		t.Fatalf("%d explanations on the page, %d given", len(list), len(in.Explanations))
	}
	var sums []string
	anchors := map[string]bool{}
	for i, e := range in.Explanations {
		anchors[list[i][1]] = true
		m := dataElement.FindStringSubmatch(list[i][3])
		if m == nil || list[i][2] != e.Quantity {
			t.Fatalf("%s: the page has %s", e.Quantity, list[i][0])
		}
		if value, err := strconv.ParseFloat(m[1], 64); err != nil || value != e.Value {
			t.Errorf("%s: the page has %s, the explanation %v", e.Quantity, m[1], e.Value)
		}
		if words := html.UnescapeString(m[3]); words != text.UnitValue(e.Value, e.Unit) {
			t.Errorf("%s: the page says %q, the terminal %q", e.Quantity, words, text.UnitValue(e.Value, e.Unit))
		}
		if m[2] == "" {
			sums = append(sums, e.Quantity)
			continue
		}
		if want, err := at(root, m[2]); err != nil || want != e.Value {
			t.Errorf("%s: %v, design.json has %v at %s, %v", e.Quantity, e.Value, want, m[2], err)
		}
		if e.Corner != "" {
			// The place is that of the corner that is named.
			parts := strings.SplitN(m[2], ".", 4)
			k, _ := strconv.Atoi(parts[2])
			name := root.(map[string]any)[parts[0]].(map[string]any)["corners"].([]any)[k].(map[string]any)["name"]
			if name != e.Corner {
				t.Errorf("%s: corner %s, but %s is corner %v", e.Quantity, e.Corner, m[2], name)
			}
		}
	}
	if want := []string{"transformer.winding_loss", "total_loss"}; !slices.Equal(sums, want) {
		t.Errorf("without a place in design.json: %v, expected %v", sums, want)
	}
	// Figures elsewhere lead to them, with the value that is explained.
	links := regexp.MustCompile(`<a class="from" href="#([^"]*)">(<data .*?</data>)</a>`).FindAllStringSubmatch(page, -1)
	led := map[string]bool{}
	for _, m := range links {
		led[m[1]] = true
		if !anchors[m[1]] {
			t.Errorf("a link leads to %s, which is not there", m[1])
		}
		for _, e := range in.Explanations {
			if anchor(e) == m[1] && !strings.HasPrefix(m[2], `<data value="`+strconv.FormatFloat(e.Value, 'g', -1, 64)+`"`) {
				t.Errorf("%s leads to %s = %v", m[2], e.Quantity, e.Value)
			}
		}
	}
	if len(led) < 25 {
		t.Errorf("%d explanations are linked from their figures", len(led))
	}
	for _, want := range []string{"gap of the transformer +1 %", "ambient temperature +1 K", "core table, ", "transformer.short_inductance"} {
		if !strings.Contains(page, html.EscapeString(want)) && !strings.Contains(page, strings.ReplaceAll(want, "+", "&#43;")) {
			t.Errorf("the page lacks %q", want)
		}
	}
	in.Explanations = nil
	page = write(t, in)
	for _, not := range []string{"Where each figure comes from", `id="origin"`, `href="#origin"`, `href="#from`, `id="find-figure"`} {
		if strings.Contains(page, not) {
			t.Errorf("no explanations, but %s", not)
		}
	}
}
