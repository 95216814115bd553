package sample

import (
	"fmt"
	"math"
	"slices"

	"gapwright/corelib/root"
	"gapwright/magnetics/part"
)

// A Law gives the inductance in H of the part as designed with a gap of ground
// (m, total, in the post) and a film under all legs (m), by whatever kernel the
// rating used, fringing included. It falls with both.
type Law func(ground, film float64) (float64, error)

// A Correction says how to bring an inductance to its target.
type Correction struct {
	Kind     part.GapKind
	Measured float64 // H
	Target   float64 // H
	Off      float64 // Measured/Target - 1
	Enough   bool    // within the tolerance already: leave it

	GapNow float64 // m, of the part's own kind, that the law gives the measured inductance with
	Ground float64 // m, change of the ground gap, + longer; 0 for a film part
	Film   float64 // m, film under all legs to add, - to take out; of a ground part it can only be added

	Stack      []float64 // m, films nearest to the wanted thickness (of a film part: of the whole stack)
	StackTotal float64   // m
	StackL     float64   // H, expected with that stack
	Steps      []string  // what to do, in the order to be tried
}

// Correct finds the change of the gap that brings measured to target. nominal is
// the designed gap: total ground gap, or thickness of film. tolerance is
// relative; stock are the films at hand in m.
//
// The law is entered backwards: the reading is the gap that the part behaves
// like, whatever the reason (area, permeability, glue, grinding), and the change
// is counted from there. So the slope is that of the real fringing near the real
// gap. What can't be undone comes last.
func Correct(kind part.GapKind, nominal, target, measured, tolerance float64, law Law, stock []float64) (Correction, error) {
	c := Correction{Kind: kind, Measured: measured, Target: target}
	if !(target > 0) || !(measured > 0) || !(nominal >= 0) {
		return c, fmt.Errorf("gap correction from %g to %g H at a gap of %g m: all must be above zero", measured, target, nominal)
	}
	c.Off = measured/target - 1
	if math.Abs(c.Off) <= tolerance {
		c.Enough = true
	}
	own := func(x float64) (float64, error) { return law(x, 0) }
	if kind == part.Spacer {
		own = func(x float64) (float64, error) { return law(0, x) }
	} else if kind != part.Ground {
		return c, fmt.Errorf("a part without a gap has nothing to correct: its inductance follows the permeability")
	}
	now, err := gapOf(own, measured, nominal)
	if err != nil {
		return c, fmt.Errorf("measured %.4g uH: %w", measured*1e6, err)
	}
	want, err := gapOf(own, target, nominal)
	if err != nil {
		return c, fmt.Errorf("target %.4g uH: %w", target*1e6, err)
	}
	c.GapNow = now
	change := want - now
	if kind == part.Spacer {
		c.Film = change
		c.Stack = NearestStack(nominal+change, stock)
		for _, f := range c.Stack {
			c.StackTotal += f
		}
		if len(c.Stack) > 0 {
			if c.StackL, err = law(0, now+c.StackTotal-nominal); err != nil {
				return c, err
			}
		}
	} else {
		c.Ground = change
		if change > 0 {
			c.Film, err = gapOf(func(x float64) (float64, error) { return law(now, x) }, target, change/2)
			if err != nil {
				return c, fmt.Errorf("film for %.4g uH: %w", target*1e6, err)
			}
			c.Stack = NearestStack(c.Film, stock)
			for _, f := range c.Stack {
				c.StackTotal += f
			}
			if c.StackL, err = law(now, c.StackTotal); err != nil {
				return c, err
			}
		}
	}
	c.describe(nominal)
	return c, nil
}

// describe writes the steps.
func (c *Correction) describe(nominal float64) {
	mm := func(x float64) string { return fmt.Sprintf("%.3f mm", x*1e3) }
	stack := func() string {
		t := ""
		for i, f := range c.Stack {
			if i > 0 {
				t += " + "
			}
			t += fmt.Sprintf("%.3f", f*1e3)
		}
		return t + " mm"
	}
	off := fmt.Sprintf("%+.1f %%", c.Off*100)
	if c.Enough {
		c.Steps = append(c.Steps, "inductance is "+off+" from its target, within tolerance: leave the gap as it is")
		return
	}
	expect := fmt.Sprintf("expected then: %.4g uH, %+.1f %%", c.StackL*1e6, (c.StackL/c.Target-1)*100)
	switch {
	case c.Kind == part.Spacer:
		verb := "add " + mm(c.Film) + " of film under all legs"
		if c.Film < 0 {
			verb = "take " + mm(-c.Film) + " of film out under all legs"
		}
		c.Steps = append(c.Steps, off+": "+verb)
		if len(c.Stack) > 0 {
			c.Steps = append(c.Steps, fmt.Sprintf("nearest stock: %s in place of %s; %s", stack(), mm(nominal), expect))
		}
	case c.Ground > 0:
		c.Steps = append(c.Steps, off+": make the gap longer")
		if len(c.Stack) > 0 {
			c.Steps = append(c.Steps, fmt.Sprintf("film under all legs, %s wanted, nearest stock %s; %s. It can be taken out again", mm(c.Film), stack(), expect))
		} else {
			c.Steps = append(c.Steps, fmt.Sprintf("film under all legs would have to be %s: no stock film comes nearer than none", mm(c.Film)))
		}
		c.Steps = append(c.Steps, "or grind the post "+mm(c.Ground)+" deeper; that cannot be undone, so grind a little less first and measure")
	default:
		c.Steps = append(c.Steps, off+": the gap is too long by "+mm(-c.Ground))
		c.Steps = append(c.Steps,
			"open the joint first: glue, dirt, tape or a chip between the faces acts like a gap",
			"then try a gapped half with "+mm(-c.Ground)+" less gap",
			"last: take "+mm(-c.Ground)+" off the faces of the outer legs; that cannot be undone")
	}
}

// gapOf inverts a falling law. It looks between a closed gap and far beyond the
// usual one, beginning near guess.
func gapOf(law func(float64) (float64, error), want, guess float64) (float64, error) {
	var failed error
	miss := func(x float64) float64 {
		l, err := law(x)
		if err != nil && failed == nil {
			failed = err
		}
		return want/l - 1 // nearly linear in the gap
	}
	low, high := 0.0, math.Max(2*guess, 0.1e-3)
	at := miss(low)
	if failed != nil {
		return 0, failed
	}
	if at > 0 {
		return 0, fmt.Errorf("not reached even with the gap closed (%.4g uH)", want/(1+at)*1e6)
	}
	for range 12 {
		if miss(high) >= 0 || failed != nil {
			break
		}
		high *= 2
	}
	if failed != nil {
		return 0, failed
	}
	if miss(high) < 0 {
		return 0, fmt.Errorf("not reached with a gap of %.3g mm either", high*1e3)
	}
	r, err := root.Find(miss, low, high, 1e-9)
	if failed != nil {
		return 0, failed
	}
	if err != nil {
		return 0, err
	}
	return r.X, nil
}

// NearestStack returns the one to three films of a stock whose sum is nearest to
// t (m), the fewest films on a tie; nothing when no film at all is nearer.
func NearestStack(t float64, stock []float64) []float64 {
	if t <= 0 {
		return nil
	}
	var best []float64
	off := t // of no film
	try := func(f ...float64) {
		sum := 0.0
		for _, x := range f {
			sum += x
		}
		if e := math.Abs(sum - t); e < off-1e-9 {
			off, best = e, slices.Clone(f)
		}
	}
	for i, a := range stock {
		try(a)
		for j, b := range stock[i:] {
			try(a, b)
			for _, d := range stock[i+j:] {
				try(a, b, d)
			}
		}
	}
	return best
}

// FromTwo returns the gap that gives target, from two gaps that were tried and
// the inductances that they gave: 1/L is nearly straight between them. No core
// data are needed. Beyond the two gaps the result is an extrapolation; outside
// tells by how much of their distance.
func FromTwo(gap1, l1, gap2, l2, target float64) (gap, outside float64, err error) {
	if !(l1 > 0) || !(l2 > 0) || !(target > 0) || gap1 == gap2 || (gap2-gap1)*(l1-l2) <= 0 {
		return 0, 0, fmt.Errorf("two gaps %.3g and %.3g mm with %.4g and %.4g uH: the longer gap must have the lower inductance", gap1*1e3, gap2*1e3, l1*1e6, l2*1e6)
	}
	share := (1/target - 1/l1) / (1/l2 - 1/l1)
	outside = math.Max(0, math.Max(-share, share-1))
	return gap1 + share*(gap2-gap1), outside, nil
}
