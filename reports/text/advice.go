package text

import (
	"fmt"

	"gapwright/corelib/quantity"
	"gapwright/magnetics/design"
)

// Advice prints the single changes that repair what is missed, each as it was
// tried, cheapest first; nothing when there are none.
func Advice(p *Printer, d *design.Design) error {
	missed := len(d.Ladder) > 0 && d.Rating == nil
	for _, v := range d.Verdicts {
		missed = missed || !v.Pass
	}
	if !missed && len(d.Advice) == 0 {
		return p.Err()
	}
	if len(d.Advice) == 0 {
		p.Line("What to change: none of the single changes that were tried repairs it alone.")
		p.Line("")
		return p.Err()
	}
	p.Line("What to change: single changes that were tried and repair it, cheapest first")
	for i, a := range d.Advice {
		p.item(5, fmt.Sprintf("  %d", i+1), a.Change+": "+a.Effect)
	}
	p.Line("")
	return p.Err()
}

// secondChoices prints the next best wires of a part.
func secondChoices(p *Printer, d *design.Design, name string) {
	any := false
	for _, c := range d.SecondChoices {
		if c.Part != name {
			continue
		}
		any = true
		what := "more"
		more := c.More
		if more < 0 {
			what, more = "less", -more
		}
		miss := ""
		if c.Misses != nil {
			miss = "; it misses " + limitText(*c.Misses)
		}
		p.item(18, "  second choice", fmt.Sprintf("%s: %s, %d in hand, %d %s: %s %s in this part (%+.1f %%)%s",
			c.Winding, c.Wire, c.Parallel, c.Layers, oneOrMany(c.Layers, "layer", "layers"), quantity.Format(more, quantity.Watt), what, 100*c.More/(c.Loss-c.More), miss))
	}
	if any {
		p.Line("")
	}
}

// adviceJSON, pairJSON and choiceJSON are the forms for programs, in SI units.
type (
	adviceJSON struct {
		Change string `json:"change"`
		Effect string `json:"effect"`
		Cost   int    `json:"cost"` // 1 gap .. 8 tank
		Limit  string `json:"limit"`
	}
	pairJSON struct {
		Transformer string  `json:"transformer"`
		Inductor    *string `json:"inductor"` // null where leakage is the resonant inductor
		Loss        float64 `json:"loss"`
		Volume      float64 `json:"volume"`
		Mass        float64 `json:"mass"`
		Chosen      bool    `json:"chosen"`
	}
	choiceJSON struct {
		Part     string  `json:"part"`
		Winding  string  `json:"winding"`
		Wire     string  `json:"wire"`
		Parallel int     `json:"parallel"`
		Layers   int     `json:"layers"`
		Loss     float64 `json:"loss"`
		More     float64 `json:"more"`
		Misses   *string `json:"misses"` // a limit, null when it keeps all
	}
)

func adviceOf(d *design.Design) []adviceJSON {
	out := []adviceJSON{}
	for _, a := range d.Advice {
		out = append(out, adviceJSON(a))
	}
	return out
}

func pairsOf(d *design.Design) []pairJSON {
	out := []pairJSON{}
	for _, x := range d.Pareto {
		q := pairJSON{Transformer: x.Transformer, Loss: x.Loss, Volume: x.Volume, Mass: x.Mass, Chosen: x.Chosen}
		if x.Inductor != "" {
			q.Inductor = &x.Inductor
		}
		out = append(out, q)
	}
	return out
}

func choicesOf(d *design.Design) []choiceJSON {
	out := []choiceJSON{}
	for _, c := range d.SecondChoices {
		x := choiceJSON{Part: c.Part, Winding: c.Winding, Wire: c.Wire, Parallel: c.Parallel, Layers: c.Layers, Loss: c.Loss, More: c.More}
		if c.Misses != nil {
			x.Misses = &c.Misses.Limit
		}
		out = append(out, x)
	}
	return out
}
