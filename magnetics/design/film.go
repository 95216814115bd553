package design

import (
	"math"

	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
)

// filmsMost is how many films a shop lays on each other; more of them do not lie
// flat (own proposal).
const filmsMost = 3

// stockFilm makes a spacer of the films in stock whose sum comes nearest to its
// thickness, of as few as do. A ground gap is returned as it is.
func stockFilm(g part.Gap, limits job.Gap) part.Gap {
	if g.Kind != part.Spacer {
		return g
	}
	g.Total = 0 // of ground gaps only
	if len(limits.SpacerFoils) == 0 {
		return g
	}
	wanted := g.Thickness
	var best []float64
	off := math.Inf(1)
	var pile func(from int, sum float64, films []float64, left int)
	pile = func(from int, sum float64, films []float64, left int) {
		// A tenth of a micrometre apart is the same.
		if d := math.Abs(sum - wanted); len(films) > 0 && (d < off-1e-7 || d < off+1e-7 && len(films) < len(best)) {
			off, best = d, append([]float64(nil), films...)
		}
		if left == 0 {
			return
		}
		for i := from; i < len(limits.SpacerFoils); i++ {
			pile(i, sum+limits.SpacerFoils[i], append(films, limits.SpacerFoils[i]), left-1)
		}
	}
	pile(0, 0, nil, filmsMost)
	g.Foils, g.Thickness = best, 0
	for _, x := range best {
		g.Thickness += x
	}
	g.Thickness = math.Round(g.Thickness*1e7) / 1e7
	return g
}
