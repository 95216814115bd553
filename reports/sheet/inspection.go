package sheet

import (
	"fmt"
	"strings"

	"gapwright/magnetics/part"

	"github.com/xuri/excelize/v2"
)

// Columns of the inspection table that do not depend on the number of samples.
const (
	colID = iota + 1
	colTest
	colTerminals
	colOthers
	colCondition
	colUnit
	colNominal
	colMin
	colMax
	colOften
	colSamples // first of them
)

// inspectionColumns are the columns behind the samples.
type inspectionColumns struct {
	first, last         int // samples
	verdict             int // first verdict
	result, mean, s, up int
}

func columnsFor(samples int) inspectionColumns {
	c := inspectionColumns{first: colSamples, last: colSamples + samples - 1}
	c.verdict = c.last + 1
	c.result = c.verdict + samples
	c.mean, c.s, c.up = c.result+1, c.result+2, c.result+3
	return c
}

// inspectionHead is the text above the column of IDs; the reader looks for it
// when the defined names are gone.
const inspectionHead = "ID"

func sampleHead(i int) string { return fmt.Sprintf("S%d", i) }

// printed is the unit as it stands in the sheet.
func printed(unit string) string {
	switch unit {
	case "":
		return "-"
	case "uH":
		return "µH"
	case "mohm":
		return "mΩ"
	case "ohm":
		return "Ω"
	case "Mohm":
		return "MΩ"
	case "degC":
		return "°C"
	}
	return unit
}

// copperCoefficient corrects resistances to 20 °C, 1/K.
const copperCoefficient = 0.00393

// pageInspection writes tab 3.
func (b *book) pageInspection(s Sheet) {
	n := s.Samples
	cols := columnsFor(n)
	widths := []float64{10, 20, 17, 19, 5, 6, 8.5, 8.5, 8.5, 8}
	for range n {
		widths = append(widths, 8.5)
	}
	for range n {
		widths = append(widths, 6)
	}
	widths = append(widths, 8, 9, 8, 9)
	b.begin(TabInspection, false, s.header(), widths...)
	wide := cols.up
	b.put(1, 1, wide, "Inspection: measure in the order of the rows, one column per sample, numbers only", lookBand)

	// Fields of the whole lot.
	fields := []struct{ key, label, prompt string }{
		{"field.instrument", "Instrument, serial no.", "Meter used for inductance and resistance."},
		{"field.calibration", "Calibration due", "Date, as 2025-01-31."},
		{"field.ambient_c", "Ambient temperature, °C", "Number. Resistances are corrected with it; empty means 20."},
		{"field.humidity", "Humidity, %", "Number."},
		{"field.operator", "Operator", "Who measured."},
		{"field.date", "Date of test", "Date, as 2025-01-31."},
		{"field.wire_batch", "Wire batch", "Batch on the reels."},
		{"field.fixture", "Fixture, leads", "Fixture or clips used; was the short soldered?"},
	}
	row := 2
	ambient := ""
	half := wide / 2
	for i, f := range fields {
		left := i%2 == 0
		if left {
			row++
		}
		if left {
			b.put(row, 1, 2, f.label, lookLabel)
		} else {
			b.put(row, half-1, half+1, f.label, lookLabel)
		}
		l := look{align: "left", size: 10}
		if f.key == "field.ambient_c" || f.key == "field.humidity" {
			l.format = "0.0"
		}
		var at string
		if left {
			at = b.enter(row, 3, half-2, f.key, f.label, "", l, f.label, f.prompt)
		} else {
			at = b.enter(row, half+2, wide, f.key, f.label, "", l, f.label, f.prompt)
		}
		if f.key == "field.ambient_c" {
			ambient = at
		}
	}
	// What the reel really has, by winding.
	for _, w := range s.Rating.Windings {
		perMeter := reelResistance(w)
		if perMeter <= 0 {
			continue
		}
		row++
		b.put(row, 1, 4, fmt.Sprintf("Reel of %s: %s", w.Name, b.local(w.Wire)), lookLabel)
		b.put(row, 5, 8, "expected mΩ/m at 20 °C, as wound in hand", lookLabel)
		b.put(row, 9, 9, perMeter*1e3, look{align: "right", format: decimals(perMeter*1e3, 4)})
		b.put(row, 10, 11, "measured", lookLabel)
		b.enter(row, 12, 14, "reel."+w.Name, fmt.Sprintf("Reel of %s: %s", w.Name, b.local(w.Wire)), "", look{align: "right", format: decimals(perMeter*1e3, 4)}, "Reel of "+w.Name,
			"Resistance of the wire on the reel per metre at 20 deg C, all wires in hand together, in milliohm. It tells a wrong wire from a wrong length.")
	}
	row += 2

	head := row
	heads := []string{inspectionHead, "Test", "Between", "Others", "Cond.", "Unit", "Nominal", "Min", "Max", "How often"}
	for i := range n {
		heads = append(heads, sampleHead(i+1))
	}
	for i := range n {
		heads = append(heads, fmt.Sprintf("V%d", i+1))
	}
	heads = append(heads, "Result", "Mean", "s", "Mean off nominal")
	for i, h := range heads {
		b.put(row, i+1, i+1, h, lookHead)
	}
	b.tall(row, 30)

	// Long conditions go below the table, once each, with a letter.
	letters := map[string]string{}
	var legend []string
	letter := func(condition string) string {
		if condition == "" {
			return ""
		}
		if l, ok := letters[condition]; ok {
			return l
		}
		l := string(rune('a' + len(legend)%26))
		if len(legend) >= 26 {
			l += "'"
		}
		letters[condition] = l
		legend = append(legend, l+"   "+condition)
		return l
	}

	rows := map[string]int{}
	for i, c := range s.Checks {
		rows[c.ID] = head + 1 + i
	}
	for _, c := range s.Checks {
		row++
		b.put(row, colID, colID, c.ID, look{align: "left", bold: true, size: 9, shrink: true})
		b.put(row, colTest, colTest, c.Name, look{align: "left", wrap: true, size: 9.5})
		b.put(row, colTerminals, colTerminals, c.Terminals, look{align: "left", wrap: true, size: 9.5})
		b.put(row, colOthers, colOthers, c.Others, look{align: "left", wrap: true, size: 9.5, bold: strings.Contains(c.Others, "SHORTED")})
		b.put(row, colCondition, colCondition, letter(b.local(c.Conditions)), lookMid)
		unit := printed(c.Unit)
		if c.Kind == part.Attribute {
			unit = "OK/NOK"
		}
		b.put(row, colUnit, colUnit, unit, look{align: "center", size: 9, shrink: true})
		format := "0.###"
		if c.Nominal != nil && *c.Nominal != 0 {
			format = decimals(*c.Nominal/c.Scale, part.TestDigits)
		} else if c.Max != nil {
			format = decimals(*c.Max/c.Scale, part.TestDigits-1)
		} else if c.Min != nil {
			format = decimals(*c.Min/c.Scale, part.TestDigits-1)
		}
		limit := func(col int, v *float64) {
			l := look{align: "right", size: 10, format: format}
			if v == nil {
				b.put(row, col, col, "-", look{align: "center", size: 10})
				return
			}
			b.put(row, col, col, *v/c.Scale, l)
		}
		limit(colNominal, c.Nominal)
		limit(colMin, c.Min)
		limit(colMax, c.Max)
		b.put(row, colOften, colOften, c.Often, lookMid)
		for i := range n {
			col := cols.first + i
			at := address(col, row)
			if c.Kind == part.Computed {
				b.put(row, col, col, formula(computedFormula(c, rows, cols, col)), look{fill: computed, align: "right", size: 10, format: format})
			} else {
				key := fmt.Sprintf("%s.S%d", c.ID, i+1)
				l := look{align: "right", size: 10, format: format}
				prompt := fmt.Sprintf("Sample %d, number in %s only, no unit.", i+1, orElse(c.Unit, "plain ratio"))
				if c.Kind == part.Attribute {
					l.align, l.format = "center", ""
					prompt = fmt.Sprintf("Sample %d: OK or NOK.", i+1)
				}
				if c.AtAmbient {
					prompt += " As measured, at the ambient temperature entered above."
				}
				b.enter(row, col, col, key, c.ID, sampleHead(i+1), l, c.ID+" "+c.Name, prompt)
			}
			b.put(row, cols.verdict+i, cols.verdict+i, formula(verdictFormula(c, at, row, ambient)), look{fill: computed, align: "center", size: 9, shrink: true, bold: true})
		}
		span := address(cols.verdict, row) + ":" + address(cols.verdict+n-1, row)
		b.put(row, cols.result, cols.result, formula(resultFormula(span, c.Often == "one")), look{fill: computed, align: "center", size: 10, bold: true, shrink: true})
		readings := fmt.Sprintf("$%s%d:$%s%d", column(cols.first), row, column(cols.last), row)
		if c.Kind == part.Attribute {
			for _, col := range []int{cols.mean, cols.s, cols.up} {
				b.put(row, col, col, "", look{fill: computed})
			}
			continue
		}
		b.put(row, cols.mean, cols.mean, formula(fmt.Sprintf(`IF(COUNT(%s)=0,"",AVERAGE(%s))`, readings, readings)), look{fill: computed, align: "right", size: 10, format: format})
		b.put(row, cols.s, cols.s, formula(fmt.Sprintf(`IF(COUNT(%s)<2,"",STDEV(%s))`, readings, readings)), look{fill: computed, align: "right", size: 10, format: decimals(1e-1, 4)})
		corrected := fmt.Sprintf("AVERAGE(%s)", readings)
		if c.AtAmbient {
			corrected = fmt.Sprintf("AVERAGE(%s)/%s", readings, ambientFactor(ambient))
		}
		off := ""
		if c.Nominal != nil && *c.Nominal != 0 {
			off = fmt.Sprintf(`IF(COUNT(%s)=0,"",%s/$%s-1)`, readings, corrected, address(colNominal, row))
		}
		if off == "" {
			b.put(row, cols.up, cols.up, "", look{fill: computed})
		} else {
			b.put(row, cols.up, cols.up, formula(off), look{fill: computed, align: "right", size: 10, format: "+0.0%;-0.0%;0.0%"})
		}
	}
	last := row
	b.conditional(fmt.Sprintf("%s:%s", address(cols.verdict, head+1), address(cols.result, last)))
	for i := range n {
		b.attributeList(s, rows, cols.first+i)
	}

	row++
	b.put(row, 1, cols.verdict+n-1, "Sheet verdict (every 100 % and sample row)", look{fill: heading, bold: true, align: "right", size: 10})
	b.put(row, cols.result, cols.up, formula(fmt.Sprintf(`IF(COUNTIF(%[1]s,"FAIL")>0,"REJECT",IF(COUNTIF(%[1]s,"OPEN")>0,"OPEN","ACCEPT"))`,
		fmt.Sprintf("$%s$%d:$%s$%d", column(cols.result), head+1, column(cols.result), last))), look{fill: computed, bold: true, align: "center", size: 12})
	b.define(b.unique("sheet_verdict"), address(cols.result, row))
	b.conditional(address(cols.result, row))
	b.tall(row, 22)

	row++
	b.put(row, 1, wide, "Verdicts: PASS, FAIL, READ (no limit, but wanted), NOT A NUMBER (text was typed: check the decimal mark), OPEN (nothing entered). Limits are rounded inward.", lookNote)
	if len(legend) > 0 {
		row++
		b.put(row, 1, wide, "Conditions", look{fill: heading, bold: true, align: "left", size: 10})
		for _, t := range legend {
			row++
			b.put(row, 1, wide, t, lookNote)
		}
	}
	row = b.gapAdvice(s, row+1, rows, cols)
	row++
	for _, f := range []struct{ key, label string }{
		{"field.deviations", "Deviations from the sheet"}, {"field.correction", "Corrective action"}, {"field.signature", "Name, date, signature"},
	} {
		row++
		b.put(row, 1, 3, f.label, lookLabel)
		b.enter(row, 4, wide, f.key, f.label, "", look{align: "left", wrap: true, size: 10}, f.label, "")
		b.tall(row, 28)
	}
	if b.err == nil {
		ref := fmt.Sprintf("'%s'!$%d:$%d", TabInspection, head, head)
		b.fail(b.f.SetDefinedName(&excelize.DefinedName{Name: "_xlnm.Print_Titles", RefersTo: ref, Scope: TabInspection}))
		b.fail(b.f.SetPanes(b.tab, &excelize.Panes{Freeze: true, XSplit: 2, YSplit: head, TopLeftCell: address(3, head+1), ActivePane: "bottomRight"}))
	}
	b.protect()
}

// reelResistance is the resistance per metre of all wires in hand, in ohm/m at
// 20 °C, that a winding's resistance was computed with.
func reelResistance(w part.WindingRating) float64 {
	length := float64(w.Turns) * w.MeanLengthOfTurn
	if length <= 0 {
		return 0
	}
	return w.DCResistance / length
}

func ambientFactor(ambient string) string {
	abs := absolute(ambient)
	return fmt.Sprintf("(1+%g*(IF(ISNUMBER(%s),%s,20)-20))", copperCoefficient, abs, abs)
}

func absolute(at string) string {
	col, row, err := excelize.CellNameToCoordinates(at)
	if err != nil {
		panic("sheet: cell " + at)
	}
	return fmt.Sprintf("$%s$%d", column(col), row)
}

// verdictFormula judges the reading in cell at. A row without limits gives READ.
func verdictFormula(c part.Check, at string, row int, ambient string) string {
	if c.Kind == part.Attribute {
		return fmt.Sprintf(`IF(LEN(TRIM(%[1]s))=0,"",IF(UPPER(TRIM(%[1]s))="OK","PASS",IF(UPPER(TRIM(%[1]s))="NOK","FAIL","ENTER OK OR NOK")))`, at)
	}
	if c.Min == nil && c.Max == nil {
		return fmt.Sprintf(`IF(LEN(TRIM(%[1]s))=0,"",IF(ISNUMBER(%[1]s),"READ","NOT A NUMBER"))`, at)
	}
	value := at
	if c.AtAmbient {
		value = at + "/" + ambientFactor(ambient)
	}
	low, high := fmt.Sprintf("$%s", address(colMin, row)), fmt.Sprintf("$%s", address(colMax, row))
	return fmt.Sprintf(`IF(LEN(TRIM(%[1]s))=0,"",IF(ISNUMBER(%[1]s),IF(OR(AND(ISNUMBER(%[3]s),%[2]s<%[3]s),AND(ISNUMBER(%[4]s),%[2]s>%[4]s)),"FAIL","PASS"),"NOT A NUMBER"))`, at, value, low, high)
}

// resultFormula sums up the verdicts of a row. A row that is wanted of one
// sample only stays blank, not open, while it is empty.
func resultFormula(span string, optional bool) string {
	empty := `"OPEN"`
	if optional {
		empty = `""`
	}
	return fmt.Sprintf(`IF(COUNTIF(%[1]s,"FAIL")+COUNTIF(%[1]s,"NOT*")+COUNTIF(%[1]s,"ENTER*")>0,"FAIL",IF(COUNTIF(%[1]s,"PASS")>0,"PASS",IF(COUNTIF(%[1]s,"READ")>0,"READ",%[2]s)))`, span, empty)
}

// computedFormula is a row that follows from other rows of the same sample.
func computedFormula(c part.Check, rows map[string]int, cols inspectionColumns, col int) string {
	ref := func(i int) string {
		if i >= len(c.From) || rows[c.From[i]] == 0 {
			return `""`
		}
		return address(col, rows[c.From[i]])
	}
	a, h := ref(0), ref(1)
	percent := 1.0
	if c.Unit == "%" {
		percent = 100
	}
	switch c.Rule {
	case part.GeometricMean:
		return fmt.Sprintf(`IF(AND(ISNUMBER(%[1]s),ISNUMBER(%[2]s)),IF(AND(%[1]s>0,%[2]s>0),SQRT(%[1]s*%[2]s),""),"")`, a, h)
	case part.OverMean:
		return fmt.Sprintf(`IF(AND(ISNUMBER(%[1]s),ISNUMBER(%[2]s)),IF(%[1]s+%[2]s>0,%[3]g*2*ABS(%[1]s-%[2]s)/(%[1]s+%[2]s),""),"")`, a, h, percent)
	case part.Quotient:
		return fmt.Sprintf(`IF(AND(ISNUMBER(%[1]s),ISNUMBER(%[2]s)),IF(%[2]s>0,%[1]s/%[2]s,""),"")`, a, h)
	case part.FactorApart:
		return fmt.Sprintf(`IF(AND(ISNUMBER(%[1]s),ISNUMBER(%[2]s)),IF(%[2]s>0,%[4]g*ABS(%[3]g*%[1]s/%[2]s-1),""),"")`, a, h, c.Factor, percent)
	case part.FromMedian:
		row := rows[c.From[0]]
		span := fmt.Sprintf("$%s$%d:$%s$%d", column(cols.first), row, column(cols.last), row)
		return fmt.Sprintf(`IF(AND(ISNUMBER(%[1]s),COUNT(%[2]s)>1),IF(MEDIAN(%[2]s)>0,%[3]g*ABS(%[1]s/MEDIAN(%[2]s)-1),""),"")`, a, span, percent)
	}
	panic("sheet: no formula for the rule " + string(c.Rule))
}

// conditional colours verdicts; the words stay.
func (b *book) conditional(span string) {
	if b.err != nil {
		return
	}
	style := func(font, back string) *int {
		id, err := b.f.NewConditionalStyle(&excelize.Style{Font: &excelize.Font{Color: font, Bold: true}, Fill: excelize.Fill{Type: "pattern", Pattern: 1, Color: []string{back}}})
		b.fail(err)
		return &id
	}
	good, bad := style("0B5A2B", "CDEBD6"), style("8A1C13", "F9D3CF")
	first := strings.Split(span, ":")[0]
	any := func(words ...string) string {
		var t []string
		for _, w := range words {
			t = append(t, fmt.Sprintf(`%s="%s"`, first, w))
		}
		return "OR(" + strings.Join(t, ",") + ")"
	}
	b.fail(b.f.SetConditionalFormat(b.tab, span, []excelize.ConditionalFormatOptions{
		{Type: "formula", Criteria: any("PASS", "ACCEPT"), Format: good},
		{Type: "formula", Criteria: any("FAIL", "REJECT", "NOT A NUMBER", "ENTER OK OR NOK"), Format: bad},
	}))
}

// attributeList offers OK and NOK in the cells of one sample.
func (b *book) attributeList(s Sheet, rows map[string]int, col int) {
	for _, c := range s.Checks {
		if c.Kind != part.Attribute || b.err != nil {
			continue
		}
		at := address(col, rows[c.ID])
		b.fail(b.f.DeleteDataValidation(b.tab, at))
		dv := excelize.NewDataValidation(true)
		dv.Sqref = at
		b.fail(dv.SetDropList([]string{"OK", "NOK"}))
		dv.SetInput(clip(c.ID+" "+clean(c.Name), 32), "OK or NOK.")
		b.fail(b.f.AddDataValidation(b.tab, dv))
	}
}

// gapAdvice writes what to do about an inductance that is off.
func (b *book) gapAdvice(s Sheet, row int, rows map[string]int, cols inspectionColumns) int {
	target := part.Check{}
	for _, c := range s.Checks {
		if c.ID == "E04" {
			target = c
		}
	}
	if target.Nominal == nil || (s.GroundSlope <= 0 && s.FilmSlope <= 0) {
		return row - 1
	}
	b.put(row, 1, cols.up, "Gap advice from the mean of E04 (one correction; the change of fringing is in the figures)", look{fill: heading, bold: true, align: "left", size: 10})
	r := rows["E04"]
	mean := fmt.Sprintf("$%s$%d", column(cols.mean), r)
	nominal := fmt.Sprintf("$%s$%d", column(colNominal), r)
	low, high := fmt.Sprintf("$%s$%d", column(colMin), r), fmt.Sprintf("$%s$%d", column(colMax), r)
	line := func(label string, slope float64, name, note string) {
		if slope <= 0 {
			return
		}
		row++
		k := slope * 1e3 / target.Scale // in the row's unit times mm
		b.put(row, 1, 4, label, lookLabel)
		b.put(row, 5, 8, formula(fmt.Sprintf(`IF(ISNUMBER(%s),%.9g*(1/%s-1/%s),"")`, mean, k, nominal, mean)), look{fill: computed, align: "right", size: 10, format: "+0.000;-0.000;0.000"})
		b.define(b.unique(name), address(5, row))
		b.put(row, 9, cols.up, note, look{fill: plain, align: "left", wrap: true, size: 9.5})
	}
	line("Change of the ground gap, mm in all", s.GroundSlope, "advice_ground_mm", "+ : grind the post this much deeper.   - : the gap is too long; look for dirt, glue or film in the faces first. Taking ferrite off the outer legs comes last: it cannot be undone.")
	line("Or film under ALL legs, mm", s.FilmSlope, "advice_film_mm", "+ : add this thickness of film under all legs.   - : take this much film out, where there is any.")
	row++
	b.put(row, 1, 4, "In words", lookLabel)
	b.put(row, 5, cols.up, formula(fmt.Sprintf(`IF(ISNUMBER(%[1]s),IF(AND(%[1]s>=%[3]s,%[1]s<=%[4]s),"within limits: leave the gap as it is",IF(%[1]s>%[2]s,"inductance high: make the gap longer","inductance low: make the gap shorter")),"")`,
		mean, nominal, low, high)), look{fill: computed, align: "left", size: 10, bold: true})
	return row
}
