package job

import (
	"errors"
	"fmt"
	"slices"
	"strings"

	"gapwright/corelib/document"
	"gapwright/corelib/material"
	"gapwright/corelib/quantity"
	"gapwright/corelib/shape"
	"gapwright/corelib/wire"
)

// checkNames looks up what the job names in the shipped tables. A job with a
// library may name rows that only its folders hold; its cores and materials are
// left to whoever loads them.
func checkNames(base string, p *PartLimits, b *Build, rec *document.Record) {
	at := func(key string, i int) string { return fmt.Sprintf("%s.%s[%d]", base, key, i) }
	for i, text := range p.Wires.Stock {
		if place := at("wires.stock", i); rec.Set(place) && rec.Valid(place) {
			if _, err := wire.Parse(text); err != nil {
				rec.Fault(place, "%s", wireWords(err))
			}
		}
	}
	if len(b.Library) > 0 || !rec.Valid("build.library") {
		return
	}
	for i, name := range p.Cores.Families {
		if place := at("cores.families", i); rec.Set(place) && rec.Valid(place) && !slices.Contains(shape.Families(), name) {
			rec.Fault(place, "%s is not a family of the core table; write one of %s", name, strings.Join(shape.Families(), ", "))
		}
	}
	for _, list := range []struct {
		key   string
		names []string
	}{{"cores.shapes", p.Cores.Shapes}, {"cores.excluded", p.Cores.Excluded}} {
		for i, name := range list.names {
			place := at(list.key, i)
			if !rec.Set(place) || !rec.Valid(place) {
				continue
			}
			if _, err := shape.Embedded().Find(name); err != nil {
				near := ""
				if e, ok := errors.AsType[*shape.NotFoundError](err); ok && len(e.Nearest) > 0 {
					near = "; write for example " + strings.Join(e.Nearest, " or ")
				}
				rec.Fault(place, "%s is not in the core table%s", name, near)
			}
		}
	}
	for i, name := range p.Cores.Materials {
		if place := at("cores.materials", i); rec.Set(place) && rec.Valid(place) {
			if _, err := material.Embedded().Find(name); err != nil {
				rec.Fault(place, "%s is not in the ferrite table; write one of %s", name, strings.Join(material.Embedded().Names(), ", "))
			}
		}
	}
}

// widestFormer returns the former with the greatest breadth among those the
// limits admit.
func widestFormer(c Cores) (widest shape.Former) {
	for _, s := range shape.Embedded().Shapes() {
		admitted := slices.Contains(c.Families, s.Family)
		if len(c.Shapes) > 0 {
			admitted = slices.Contains(c.Shapes, s.Name)
		}
		if !admitted || slices.Contains(c.Excluded, s.Name) {
			continue
		}
		if f, err := shape.Embedded().FormerFor(s); err == nil && f.Breadth > widest.Breadth {
			widest = f
		}
	}
	return widest
}

// checkMargins finds a creepage that leaves no breadth to wind on. In resolves
// a key to the place that states it.
func checkMargins(p *PartLimits, b *Build, rec *document.Record, in func(string) string) {
	build, creepage := in("insulation.build"), in("insulation.creepage")
	if p.Insulation.Build != "margins" || p.Insulation.Creepage == nil || len(b.Library) > 0 {
		return
	}
	widest := widestFormer(p.Cores)
	if widest.Breadth > 0 && *p.Insulation.Creepage >= widest.Breadth {
		rec.Fault(build, "margins for the creepage %s on line %d leave nothing of the widest former admitted, %s with %s; write insulated-wire",
			rec.Text(creepage), rec.Line(creepage), widest.Name, quantity.FormatAs(widest.Breadth, quantity.Meter, "mm", 1))
	}
}
