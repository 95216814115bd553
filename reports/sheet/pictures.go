package sheet

import (
	"errors"

	"gapwright/reports/figure"
)

// Pictures draws what belongs into the workbook: half section, schematic, gap
// and pins. A drawing that cannot be made (a core that is not E-shaped, a former
// with unknown pins) is left out; only when none can be made is that an error.
func Pictures(s Sheet) ([]figure.Picture, error) {
	name := s.PartNumber
	if name == "" {
		name = s.Part
	}
	var list []figure.Picture
	var problems []error
	add := func(p figure.Picture, err error) {
		if err != nil {
			problems = append(problems, err)
			return
		}
		list = append(list, p)
	}
	add(figure.Schematic(name, s.Construction))
	if s.Construction.Former.Pins > 0 {
		add(figure.PinView(name, s.Construction))
	}
	add(figure.GapView(name, s.Rating.Shape, s.Construction.Core.Gap, s.Comma))
	add(figure.NewCoil(name, s.Construction, s.Rating, s.Window, s.Comma).Picture())
	if len(list) == 0 {
		return nil, errors.Join(problems...)
	}
	return list, nil
}
