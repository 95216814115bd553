package part

import (
	"fmt"
	"math"
	"strings"

	"gapwright/corelib/quantity"
	"gapwright/corelib/wire"
	"gapwright/magnetics/gap"
	"gapwright/magnetics/winding"
)

// finish fills what does not depend on a single corner.
func (c *Coil) finish(s *Solvers, r *Rating, cond Conditions, drives []Drive) error {
	r.HeightLeft = c.section.HeightLeft
	r.Volume = c.shape.Volume()
	r.SelfCapacitance, r.InterwindingCapacity = Capacitances(c.Construction, c.section)
	r.Outline[0], r.Outline[1], r.Outline[2] = Envelope(c.shape, c.former)
	c.rateWindings(r, drives)
	r.Mass = c.shape.Mass(c.Ferrite.Density()) + c.formerMass()
	for _, w := range r.Windings {
		r.Mass += w.CopperMass
	}
	if err := c.rateGap(s, r, cond); err != nil {
		return err
	}
	c.sources(r)
	return nil
}

// Plastic of a coil former (common practice: glass-filled thermosets and
// polyesters 1.4..1.7 g/cm3).
const formerDensity = 1500 // kg/m3

// formerMass estimates the former: its tube and its flanges.
func (c *Coil) formerMass() float64 {
	wall := 0.6 * c.former.WallOffset
	length := c.former.TurnLength(-wall / 2)
	tube := length * wall * c.Window.Whole()
	flanges := 2 * c.former.MLT * c.former.Height * math.Min(c.former.Flange, 1e-3)
	return formerDensity * (tube + flanges)
}

// rateWindings fills the electrical windings.
func (c *Coil) rateWindings(r *Rating, drives []Drive) {
	for i, w := range c.Construction.Windings {
		out := WindingRating{Name: w.Name, Turns: w.Turns}
		length := 0.0
		for _, l := range c.section.Layers {
			for _, of := range l.Of {
				if of != w.Name {
					continue
				}
				run := float64(l.Turns) * l.Length
				length += run
				out.DCResistance += l.Wire.ResistancePerLength(wire.ReferenceTemperature) * run / float64(l.Parallel)
				out.CopperMass += l.Wire.CopperMassPerLength() * run * float64(l.Parallel)
				out.ConductorArea = l.Wire.CopperArea() * float64(l.Parallel)
				out.Parallel = l.Parallel
				out.Wire = l.Wire.String()
				out.Layers++
			}
		}
		out.MeanLengthOfTurn = length / float64(max(w.Turns, 1))
		for d := range drives {
			if !drives[d].Continuous {
				continue
			}
			out.CurrentDensity = math.Max(out.CurrentDensity, drives[d].RMS[i]/out.ConductorArea)
			for _, corner := range r.Corners {
				if corner.Name != drives[d].Name || drives[d].RMS[i] == 0 {
					continue
				}
				mean := corner.WindingTemperature - r.hotSpotAllowance
				hot := wire.Resistivity(mean) / wire.Resistivity(wire.ReferenceTemperature)
				factor := corner.WindingLoss[i] / (drives[d].RMS[i] * drives[d].RMS[i] * out.DCResistance * hot)
				out.ACFactor = math.Max(out.ACFactor, factor)
			}
		}
		r.Windings = append(r.Windings, out)
	}
}

// rateGap fills the gap with its hand checks.
func (c *Coil) rateGap(s *Solvers, r *Rating, cond Conditions) error {
	g := c.Construction.Core.Gap
	n := c.turns[0]
	out := &r.Gap
	out.AL = r.OpenInductance / (n * n)
	core := c.gapCore(g, cond.TestTemp)
	out.Ungapped = quantity.Mu0 * core.Mu / c.shape.C1
	out.LengthMax = PieceLimit(c.shape.PostWidth(), c.shape.PostDepth(), cond.PieceMax)
	for _, x := range c.section.Layers {
		if out.CopperDistance == 0 || x.X0 < out.CopperDistance {
			out.CopperDistance = x.X0
		}
	}
	if g.Kind == Closed || g.Kind == "" {
		return nil
	}
	out.Length = g.Total
	out.PieceLength = g.Total / float64(max(g.Pieces, 1))
	if g.Kind == Spacer {
		out.Length, out.PieceLength = g.Thickness, g.Thickness
	}
	out.ClearDistance = cond.ClearDistance * out.PieceLength
	out.PlainLength = gap.PlainLength(r.OpenInductance, n, core)
	if length, err := gap.Length(r.OpenInductance, n, core); err == nil {
		out.McLymanLength = length
	}
	if !cond.Detail {
		return nil
	}
	shifted := func(by float64) (float64, error) {
		x := g
		if x.Kind == Spacer {
			x.Thickness += by
		} else {
			x.Total += by
		}
		l, err := c.Inductances(s, x, cond.TestTemp, cond.Modes)
		if err != nil {
			return 0, err
		}
		return l[0][0], nil
	}
	const step = 5e-6
	above, err := shifted(step)
	if err != nil {
		return err
	}
	below, err := shifted(-math.Min(step, out.Length/2))
	if err != nil {
		return err
	}
	out.Sensitivity = math.Log(above/below) / (step + math.Min(step, out.Length/2))
	if g.Kind == Ground {
		alternative, err := c.GapFor(s, Gap{Kind: Spacer, Pieces: 1}, r.OpenInductance, cond.TestTemp, cond.Modes,
			func(l [][]float64) float64 { return l[0][0] })
		if err == nil {
			out.SpacerLength = alternative.Thickness
		}
	} else {
		out.SpacerLength = g.Thickness
	}
	return nil
}

// PieceLimit is the longest gap piece: the job's, or a tenth of the smaller
// post dimension, whichever is less (common practice).
func PieceLimit(postWidth, postDepth, limit float64) float64 {
	return math.Min(limit, math.Min(postWidth, postDepth)/10)
}

// arrangement names the order of the windings, innermost first, from the order
// of work.
func arrangement(c Construction) string {
	var list []string
	parts := map[string]int{}
	chambers := false
	side := func(of string) string {
		if of == "P" || of == "L" {
			return "P"
		}
		return "S"
	}
	for _, e := range c.Build {
		if e.Kind != winding.Wind {
			continue
		}
		chambers = chambers || e.Chamber > 0
		x := side(e.Of[0])
		if len(list) == 0 || list[len(list)-1] != x {
			list = append(list, x)
			parts[x]++
		}
	}
	if chambers {
		return "sections"
	}
	for i, x := range list {
		if parts[x] == 2 {
			list[i] = x + "/2"
		}
	}
	return strings.Join(list, "-")
}

// sources lists the models behind the figures.
func (c *Coil) sources(r *Rating) {
	add := func(quantity, model, source string) { r.Models = append(r.Models, Model{quantity, model, source}) }
	add("inductances", "field in the winding window: cosine series along the breadth, exact across; core from le, Ae and mu_i",
		"single-series window solution (Roth, Rabins, from memory), own derivation; checked against finite elements")
	add("leakage in the winding head", "closed-form rectangles with the mirror plane of the post", "own derivation; checked against finite elements")
	if r.Arrangement == "sections" {
		add("winding head of side-by-side sections", "a real post is too short for the mirror plane: leakage of the head 8 % high, field 11 %", "checked against finite elements of a finite ferrite block")
	}
	if !c.shape.PostRound() {
		add("gap of a rectangular post", "edge permeance of the window series on all four faces, the open ones at 0.95", "own rule from three-dimensional solutions, less proven (1.5 % on E and EFD)")
	}
	add("winding loss", "isolated conductor in the mean square field of its layer, plus its own skin effect, 40 harmonics",
		"J. A. Ferreira, IEEE Trans. Power Electronics 9 (1), 1994; field as above")
	if r.solidOrder > 0 {
		add("solid wires", fmt.Sprintf("all coupled, multipoles up to order %d with mirror images", r.solidOrder), "multipole lattice method, Lord Rayleigh, Phil. Mag. 34, 1892; checked against finite elements")
	}
	if r.foils > 0 {
		add("foils", "all foils together: strips with their inductances, a slab across each", "own method, checked against finite elements (within 1 % with margins, 0 to 4 % low beside a gap)")
	}
	add("winding capacitances", fmt.Sprintf("energy between neighbouring layers as plates, +-%.0f %%", 100*CapacitanceBand), "Zuhrt's distance of round-wire layers, from memory, checked against a field solution of two rows; permittivity common practice")
	add("core loss", "improved generalized Steinmetz equation on the exact flux, "+lossSets(c), "Venkatachalam, Sullivan, Abdallah, Tacca, COMPEL 2002; loss sets as listed with the material")
	add("temperatures", "two nodes with natural convection and radiation of the outline, +-25 % of the rise", "textbook convection relations; common-practice emissivities")
}

func lossSets(c *Coil) string {
	var ids []string
	for _, set := range c.Ferrite.Loss {
		ids = append(ids, set.ID)
	}
	return "loss sets " + strings.Join(ids, ", ")
}
