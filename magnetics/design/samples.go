package design

import (
	"context"
	"math"

	"gapwright/magnetics/part"
	"gapwright/tank"
)

// SolveSamples solves every corner of a rated design again with the inductances
// (H) and the turns ratio that samples of its parts have; resistances stay those
// of the rating, each corner's own. It returns the tank for the record, its
// operations and the limits held against them.
func SolveSamples(ctx context.Context, d *Design, tables Tables, lr, lm, ratio float64) (tank.Tank, []tank.Operation, []part.Verdict, error) {
	s, err := newSearch(d.Job, tables)
	if err != nil {
		return tank.Tank{}, nil, nil, err
	}
	record, each := s.asBuilt(d)
	put := func(t *tank.Tank) { t.Lr, t.Lm, t.TurnsRatio = lr, lm, ratio }
	put(&record)
	for i := range each {
		put(&each[i])
	}
	operations, err := solveEach(ctx, each, d.Job.Corners)
	if err != nil {
		return record, nil, nil, err
	}
	verdicts := s.tankVerdicts(record, operations)
	verdicts = append(verdicts, part.NewVerdict("tank", "", "ratio_error", math.Abs(ratio/d.Job.Tank.TurnsRatio-1), d.Job.Build.Limits.RatioError, "", "max"))
	return record, operations, verdicts, nil
}
