// Package design chooses the transformer and the resonant inductor of a job,
// closes the loop with the tank as built, and holds every limit of the job
// against what came out.
//
// The transformer is chosen first, because its leakage is part of the resonant
// inductance; the inductor makes up the rest. Then the tank is solved again with
// the inductances and resistances of both parts, until nothing moves. Where the
// leakage is to be the resonant inductance, the distance between the windings is
// what is found, and there is no second part.
//
// Every core size that the job admits is searched, each apart from the others:
// shapes, ferrites, turns, order of the windings, insulation and wires are first
// estimated with one-dimensional fields, thousands to a size, then rated with the
// field of the window, best first, some dozens to a size (branch.go). What stops
// a size is kept for the ladder. The objective picks a pair of sizes; when the
// pair breaks a limit in the loop with the tank, the next one is taken.
//
// What is missed is followed by advice: single changes, each tried by making the
// design again (advice.go).
package design

import (
	"gapwright/corelib/material"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/tank"
)

// Tables are the open tables that a design is made from, with the user's own
// rows where there are any.
type Tables struct {
	Shapes   *shape.Table
	Ferrites *material.Table
	Wires    *wire.Table
}

// A Design is both parts with their ratings, the tank as built, and what the
// limits say about it.
type Design struct {
	Job            job.Job
	Transformer    *part.Transformer
	Inductor       *part.Inductor // nil: leakage is the resonant inductor
	Rating         *part.Rating   // of the transformer
	InductorRating *part.Rating

	Wanted     []tank.Operation // of the tank as asked for
	AsBuilt    tank.Tank
	Operations []tank.Operation // of the tank as built
	Iterations int              // of the loop between parts and tank
	Residual   float64          // largest relative change in the last one

	Feasible bool
	Verdicts []part.Verdict
	Warnings []part.Warning
	Models   []part.Model
	Checks   []part.HandCheck

	Ladder []Size // what each core size came to, smallest first

	SecondChoices []WireChoice // next best wires, where the job asks for them
	Advice        []Advice     // what to change, when a limit is missed

	Pareto []Pair // what no other pair beats in both loss and volume, smallest first

	chosen         *plan
	chosenInductor *inductorPlan
}

// A Size is one core size of the search.
type Size struct {
	Part     string
	Shape    string
	Volume   float64 // m3
	Feasible bool
	Loss     float64 // W, weighted by share; 0 when nothing could be rated
	Reason   Reason  // the limit that stopped it; of a feasible size the one it is nearest to
	Chosen   bool

	Family       string
	Rating       *part.Rating       // of the best on this size; nil when nothing could be rated
	Construction *part.Construction // likewise
	Leakage      float64            // of the resonant inductance, what a transformer adds; 0 for an inductor
	Fields       int                // windows solved
	Looked       int                // ways to wind it looked at
}

// A Pair is two core sizes that go together; Inductor is empty where leakage is
// the resonant inductor.
type Pair struct {
	Transformer, Inductor string
	Loss                  float64 // W, weighted by share
	Volume                float64 // m3, outlines
	Mass                  float64 // kg
	Chosen                bool
}

// TotalLoss returns the loss of both parts in W, weighted by share; where every
// corner is a passing one, the plain mean.
func (d Design) TotalLoss() float64 {
	sum := 0.0
	for _, r := range []*part.Rating{d.Rating, d.InductorRating} {
		if r != nil {
			sum += shareWeighted(*r, d.Operations)
		}
	}
	return sum
}

// shareWeighted returns the loss of a part weighted by the shares of the corners.
func shareWeighted(r part.Rating, operations []tank.Operation) float64 {
	sum, mean, lasting := 0.0, 0.0, false
	for _, c := range r.Corners {
		mean += c.Loss() / float64(len(r.Corners))
		for _, o := range operations {
			if o.Corner.Name == c.Name && c.Continuous {
				sum += o.Corner.Share * c.Loss()
				lasting = true
			}
		}
	}
	if !lasting {
		return mean
	}
	return sum
}

// Progress is told how much of the work is done. It may be nil.
type Progress func(done, total int)
