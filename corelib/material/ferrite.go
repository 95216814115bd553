// Package material holds the power ferrites: loss sets with the ranges they hold
// in, saturation, permeability, Curie point and density, every figure with its
// source, and the fitting of loss sets to measured or catalogue points.
//
// Ferrites are named by their class in IEC 61332 with the edition stated; a maker's
// grade appears only as the source of a figure. The tables are plain CSV files
// (folder data, embedded); a user's own folder with files of the same names adds
// rows or replaces them, see Table.With.
//
// Units are coherent SI: f in Hz, B in T (peak of a sine), loss densities in W/m³;
// temperatures are in °C. Ratios and bands are plain numbers (0.25 for 25 %).
package material

import (
	"math"
	"slices"
)

// A Provenance says where a figure comes from and how far to trust it.
type Provenance struct {
	Source     string // never empty
	Confidence string // one of Confidences
	Origin     string // the file of the user's folder; empty: embedded table
}

// Confidences are the words a row may use, best first.
var Confidences = [...]string{"verified", "data sheet", "measured", "derived", "common practice", "proposal", "from memory"}

// FromMemory reports whether a figure was recalled and not read again (W202).
func (p Provenance) FromMemory() bool { return p.Confidence == "from memory" }

// A Band is a figure with the band it scatters in.
type Band struct {
	Value, Low, High float64
}

// A Figure is one row of the table of figures.
type Figure struct {
	Kind        string  // saturation, permeability, ...: see figureKinds
	Temperature float64 // °C; NaN where it means nothing
	Band                // in the unit SI
	SI          string  // T, 1, degC, kg/m3, ohm m, W/(m K)
	Provenance
}

// A Ferrite is one power ferrite with all that is known about it.
type Ferrite struct {
	Name      string
	Class     string // IEC 61332 class, PW1 to PW5; empty: none stated
	Edition   string // of IEC 61332, with the rank where it is known
	Base      string // MnZn or NiZn
	OnRequest bool   // searched only when a job names it
	Like      string // the ferrite that stands in where this one has no figure
	Note      string
	Provenance
	Figures []Figure  // by kind, then temperature
	Loss    []LossSet // by frequency
	Heat    Heat      // for loss sets of the form "ratio"
}

// figureKinds are the figures a ferrite may have, in the order of print.
var figureKinds = [...]struct {
	name, si string
	required bool
	lo, hi   float64 // what is physically sensible, in SI
}{
	{"saturation", "T", true, 0.05, 1},
	{"permeability", "1", true, 5, 50000},
	{"curie", "degC", true, 60, 700},
	{"density", "kg/m3", true, 3500, 6000},
	{"resistivity", "ohm m", false, 1e-3, 1e9},
	{"thermal-conductivity", "W/(m K)", false, 0.5, 20},
}

// figures returns the rows of one kind, which are sorted by temperature.
func (m *Ferrite) figures(kind string) []Figure {
	first := -1
	for i := range m.Figures {
		if m.Figures[i].Kind == kind {
			if first < 0 {
				first = i
			}
		} else if first >= 0 {
			return m.Figures[first:i]
		}
	}
	if first < 0 {
		return nil
	}
	return m.Figures[first:]
}

// Bsat returns the saturation flux density in T at temp in °C, at about
// 1.2 kA/m. Between the rows of the table it is a straight line; below the
// coldest the coldest value is kept, which is cautious. Above the hottest row it
// falls as (Tc - T)^p to zero at the Curie temperature Tc, the form of the order
// parameter of a magnet, with p from the last two rows (0.44 for the usual
// 490 and 390 mT at 25 and 100 °C with 210 °C, where mean-field theory has 0.5).
func (m *Ferrite) Bsat(temp float64) float64 {
	rows := m.figures("saturation")
	curie := m.Curie()
	last := rows[len(rows)-1]
	if temp <= last.Temperature {
		return interpolate(rows, temp).Value
	}
	if temp >= curie {
		return 0
	}
	p := 0.4
	if n := len(rows); n > 1 {
		before := rows[n-2]
		p = math.Log(before.Value/last.Value) / math.Log((curie-before.Temperature)/(curie-last.Temperature))
		p = min(max(p, 0.1), 1) // equal or odd rows: stay between a step and a straight line
	}
	return last.Value * math.Pow((curie-temp)/(curie-last.Temperature), p)
}

// MuI returns the initial permeability with its band at temp in °C: straight
// lines between the rows of the table, the end values beyond them.
func (m *Ferrite) MuI(temp float64) Band { return interpolate(m.figures("permeability"), temp) }

// Curie returns the Curie temperature in °C, the lowest that the table gives.
func (m *Ferrite) Curie() float64 { return m.figures("curie")[0].Value }

// Density returns the mass density in kg/m³.
func (m *Ferrite) Density() float64 { return m.figures("density")[0].Value }

// Resistivity returns the DC resistivity in ohm m; zero when it is not known.
func (m *Ferrite) Resistivity() float64 { return m.optional("resistivity") }

// ThermalConductivity returns the thermal conductivity in W/(m K); zero when it
// is not known.
func (m *Ferrite) ThermalConductivity() float64 { return m.optional("thermal-conductivity") }

func (m *Ferrite) optional(kind string) float64 {
	if rows := m.figures(kind); len(rows) > 0 {
		return rows[0].Value
	}
	return 0
}

// OwnRows lists the files of the user's folder that rows of m came from.
func (m *Ferrite) OwnRows() []string {
	var files []string
	add := func(p Provenance) {
		if p.Origin != "" && !slices.Contains(files, p.Origin) {
			files = append(files, p.Origin)
		}
	}
	add(m.Provenance)
	for i := range m.Figures {
		add(m.Figures[i].Provenance)
	}
	for i := range m.Loss {
		add(m.Loss[i].Provenance)
	}
	for _, h := range m.Heat.Hot {
		add(h.Provenance)
	}
	for _, h := range m.Heat.Column {
		add(h.Provenance)
	}
	return files
}

func interpolate(rows []Figure, temp float64) Band {
	n := len(rows)
	if temp <= rows[0].Temperature || n == 1 {
		return rows[0].Band
	}
	for i := 1; i < n; i++ {
		a, b := rows[i-1], rows[i]
		if temp <= b.Temperature {
			w := (temp - a.Temperature) / (b.Temperature - a.Temperature)
			mix := func(x, y float64) float64 { return x + w*(y-x) }
			return Band{mix(a.Value, b.Value), mix(a.Low, b.Low), mix(a.High, b.High)}
		}
	}
	return rows[n-1].Band
}
