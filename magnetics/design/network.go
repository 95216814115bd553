package design

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"

	"gapwright/corelib/quantity"
	"gapwright/magnetics/job"
	"gapwright/magnetics/part"
	"gapwright/tank"
)

// NetworkOrders is how many harmonics a Network knows the resistance at.
const NetworkOrders = 20

// A Network is what an equivalent circuit of one part is made from.
type Network struct {
	Part     string
	Core     string
	Windings []string // the first is the primary
	Turns    []int

	L           [][]float64   // H, currents into the dots, at the test temperature
	Frequency   float64       // Hz, of the corner
	Temperature float64       // °C, mean of the winding at the corner; of a passing corner the one its loss is rated at
	R           [][][]float64 // ohm, see part.Coil.Resistances, at 0 .. NetworkOrders times Frequency

	// The core's heat as a resistance across the last winding: across its
	// terminals lies what drives the flux, the leakage being on the primary.
	CoreResistance float64 // ohm; +Inf: no loss
	CoreCorner     string  // where the core loses most, which the resistance is of
	CoreLoss       float64 // W, there

	SelfCapacitance      float64 // F, across the first winding, estimated
	InterwindingCapacity float64 // F, from the first to the others, estimated
}

// passingTemperature is where the windings are rated in a passing corner, °C.
const passingTemperature = 100

// Networks returns the network of the transformer, and of the inductor where
// there is one, with the windings as warm and as fast as at a corner.
func Networks(d *Design, tables Tables, corner string) ([]Network, error) {
	if d.Rating == nil || d.Transformer == nil {
		return nil, errors.New("a network of a design without parts")
	}
	at := -1
	for k := range d.Operations {
		if d.Operations[k].Corner.Name == corner {
			at = k
		}
	}
	if at < 0 {
		return nil, fmt.Errorf("the job has no corner called %q", corner)
	}
	o := &d.Operations[at]
	if o.Status != tank.OK {
		return nil, fmt.Errorf("corner %s is not served: %s", corner, o.Reason)
	}
	s, err := newSearch(d.Job, tables)
	if err != nil {
		return nil, err
	}
	s.tank = d.AsBuilt
	list := []Network{{Part: job.Transformer}}
	if d.Inductor != nil {
		list = append(list, Network{Part: job.Inductor})
	}
	for i := range list {
		if err := list[i].fill(s, d, o); err != nil {
			return nil, fmt.Errorf("%s: %w", list[i].Part, err)
		}
	}
	return list, nil
}

func (n *Network) fill(s *search, d *Design, o *tank.Operation) error {
	rating, c, limits := d.Rating, d.Transformer.Construction, s.transformerLimits
	if n.Part == job.Inductor {
		rating, c, limits = d.InductorRating, d.Inductor.Construction, s.inductorLimits
	}
	cond := s.conditions(limits, true)
	coil, err := part.NewCoil(c, cond)
	if err != nil {
		return err
	}
	n.Core = c.Core.Shape
	for _, w := range c.Windings {
		n.Windings = append(n.Windings, w.Name)
		n.Turns = append(n.Turns, w.Turns)
	}
	var solvers part.Solvers
	if n.L, err = coil.Inductances(&solvers, c.Core.Gap, cond.TestTemp, cond.Modes); err != nil {
		return err
	}
	n.Frequency, n.Temperature = o.Frequency, passingTemperature
	worst := -1.0
	continuous := false
	for _, r := range rating.Corners {
		continuous = continuous || r.Continuous
	}
	for _, r := range rating.Corners {
		if r.Name == o.Corner.Name && r.Continuous {
			n.Temperature = r.WindingTemperature - limits.Limits.HotSpotAllowance
		}
		if r.CoreLoss > worst && (r.Continuous || !continuous) {
			worst, n.CoreCorner, n.CoreLoss = r.CoreLoss, r.Name, r.CoreLoss
		}
	}
	if n.R, err = coil.Resistances(n.Frequency, n.Temperature, NetworkOrders, cond.Modes); err != nil {
		return err
	}
	n.CoreResistance = math.Inf(1)
	for k := range d.Operations {
		x := &d.Operations[k]
		if x.Corner.Name != n.CoreCorner || !(n.CoreLoss > 0) {
			continue
		}
		v := 0.0
		if n.Part == job.Inductor {
			for h, i := range x.IPrimaryHarmonics {
				u := 2 * math.Pi * float64(h) * x.Frequency * n.L[0][0] * cmplx.Abs(i)
				v += u * u / 2
			}
		} else {
			u := x.MagnetizingVoltage.RMS() / d.AsBuilt.TurnsRatio
			v = u * u
		}
		n.CoreResistance = v / n.CoreLoss
	}
	n.SelfCapacitance, n.InterwindingCapacity = rating.SelfCapacitance, rating.InterwindingCapacity
	for k := range n.R {
		for a := range n.R[k] {
			for b, x := range n.R[k][a] {
				if math.IsNaN(x) || math.IsInf(x, 0) {
					return fmt.Errorf("resistance %d,%d at %s is not a number", a, b, quantity.Format(float64(k)*n.Frequency, quantity.Hertz))
				}
			}
		}
	}
	return nil
}
