package page

import (
	"gapwright/magnetics/design"
	"gapwright/reports/text"
)

// explanation is where one figure comes from, in words.
type explanation struct {
	*design.Explanation
	Text   string // the value with its unit
	Rows   []explainedRow
	Shifts []explainedRow
}

// explainedRow is an input with its origin, or a change with what it does.
type explainedRow struct{ Name, Text, Note string }

func explained(list []*design.Explanation) []explanation {
	var out []explanation
	for _, e := range list {
		x := explanation{Explanation: e, Text: text.UnitValue(e.Value, e.Unit)}
		for _, in := range e.Inputs {
			x.Rows = append(x.Rows, explainedRow{in.Name, text.UnitValue(in.Value, in.Unit), in.Origin})
		}
		for _, s := range e.Effects {
			x.Shifts = append(x.Shifts, explainedRow{s.Input, s.Step, text.EffectText(s)})
		}
		out = append(out, x)
	}
	return out
}
