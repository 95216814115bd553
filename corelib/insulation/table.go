package insulation

import (
	"bytes"
	"embed"
	"errors"
	"fmt"
	"strconv"
	"sync"

	"gapwright/corelib/table"
)

//go:embed data/*.csv
var data embed.FS

type (
	creepageRow struct {
		voltage  float64
		distance [7]float64 // pollution 1; pollution 2 groups I, II, III; pollution 3 groups I, II, III
		source   string
	}
	impulseRow struct {
		impulse   float64
		preferred bool
		distance  [3]float64 // pollution 1, 2, 3
		source    string
	}
	transientRow struct {
		mains   float64
		impulse [4]float64 // category I to IV
		source  string
	}
	steadyRow struct {
		peak, basic, reinforced float64
		source                  string
	}
	altitudeRow struct {
		altitude, factor float64
		source           string
	}
)

// A Tape is a film or tape of which layers are made.
type Tape struct {
	Name      string
	Thickness float64 // m, one layer
	Use       string
	Source    string
}

// A ThermalClass is a class of IEC 60085.
type ThermalClass struct {
	Letter      string
	Temperature float64 // °C
	Source      string
}

type tables struct {
	creepage  []creepageRow
	impulse   []impulseRow
	transient []transientRow
	steady    []steadyRow
	altitude  []altitudeRow
	tapes     []Tape
	classes   []ThermalClass
}

// Tapes returns the films and tapes of the table; the first is the usual one.
func Tapes() []Tape { return append([]Tape(nil), embedded().tapes...) }

// ThermalClasses returns the thermal classes in rising order.
func ThermalClasses() []ThermalClass { return append([]ThermalClass(nil), embedded().classes...) }

// SingleSheet is the least thickness, in m, of one layer that is supplementary or
// reinforced insulation by itself (published test reports).
const SingleSheet = 0.4e-3

// BarrierLayers returns how many separable thin layers a barrier of the grade
// has: one for basic, three for reinforced insulation of which every pair passes
// the test. From memory of IEC 62368-1 and IEC 61558-1; a published decision
// sheet gives the same counts.
func BarrierLayers(g Grade) int {
	if g == Reinforced {
		return 3
	}
	return 1
}

// Cautions returns the sentences that belong beside every proposal.
func Cautions() []string {
	return []string{
		"These distances are proposals from tables that may be out of date or remembered wrongly. They are not the standard.",
		"What counts is the safety standard of the end product in its national edition, and the body that certifies it.",
		"Before mains voltage is applied, a qualified person checks insulation, creepage, clearance and tests.",
		"The working voltage is to be measured (rms and peak, with the switching frequency in it).",
		"Clearances hold up to 2000 m and grow by the altitude factor above; creepage does not change with altitude.",
		"Above 30 kHz the creepage table is not enough, and the field in solid insulation must stay free of partial discharge.",
		"Triple-insulated wire may replace tape and margin only as far as its certificate says so.",
	}
}

var embedded = sync.OnceValue(func() *tables {
	t, err := read()
	if err != nil {
		panic("insulation: embedded table: " + err.Error()) // the tests read it, so this is a mistake of the build
	}
	return t
})

func read() (*tables, error) {
	t := &tables{}
	numbers := func(row table.Row, out []float64, names ...string) {
		for i, name := range names {
			out[i] = row.Positive(name)
		}
	}
	volts := func(name string) table.Column { return table.Column{Name: name, Unit: "V", Required: true} }
	metres := func(name string) table.Column { return table.Column{Name: name, Unit: "m", Required: true} }
	words := func(name string) table.Column { return table.Column{Name: name, Required: true} }
	var errs []error
	each := func(name string, columns []table.Column, add func(table.Row)) {
		text, err := data.ReadFile("data/" + name)
		if err != nil {
			errs = append(errs, err)
			return
		}
		f, err := table.Read(name, bytes.NewReader(text), append(columns, words("source"))...)
		if err != nil {
			errs = append(errs, err)
			return
		}
		for _, row := range f.Rows {
			row.MustText("source")
			add(row)
		}
		errs = append(errs, f.Err())
	}

	creepage := []string{
		"pollution 1",
		"pollution 2 group I", "pollution 2 group II", "pollution 2 group III",
		"pollution 3 group I", "pollution 3 group II", "pollution 3 group III",
	}
	columns := []table.Column{volts("voltage")}
	for _, name := range creepage {
		columns = append(columns, metres(name))
	}
	each("creepage.csv", columns, func(row table.Row) {
		r := creepageRow{voltage: row.Positive("voltage"), source: row.Text("source")}
		numbers(row, r.distance[:], creepage...)
		t.creepage = append(t.creepage, r)
	})

	degrees := []string{"pollution 1", "pollution 2", "pollution 3"}
	each("clearance_impulse.csv", []table.Column{volts("impulse"), words("preferred"), metres(degrees[0]), metres(degrees[1]), metres(degrees[2])}, func(row table.Row) {
		r := impulseRow{impulse: row.Positive("impulse"), preferred: row.MustText("preferred") == "yes", source: row.Text("source")}
		numbers(row, r.distance[:], degrees...)
		t.impulse = append(t.impulse, r)
	})

	categories := []string{"category I", "category II", "category III", "category IV"}
	columns = []table.Column{volts("mains up to")}
	for _, name := range categories {
		columns = append(columns, volts(name))
	}
	each("transient.csv", columns, func(row table.Row) {
		r := transientRow{mains: row.Positive("mains up to"), source: row.Text("source")}
		numbers(row, r.impulse[:], categories...)
		t.transient = append(t.transient, r)
	})

	each("clearance_steady.csv", []table.Column{volts("peak up to"), metres("basic"), metres("reinforced")}, func(row table.Row) {
		t.steady = append(t.steady, steadyRow{row.Positive("peak up to"), row.Positive("basic"), row.Positive("reinforced"), row.Text("source")})
	})
	each("altitude.csv", []table.Column{metres("altitude"), words("factor")}, func(row table.Row) {
		factor, err := strconv.ParseFloat(row.Text("factor"), 64)
		if err != nil || factor < 1 {
			row.Fail("factor", "factor %q is not a number from 1 up", row.Text("factor"))
		}
		t.altitude = append(t.altitude, altitudeRow{row.Positive("altitude"), factor, row.Text("source")})
	})
	each("thermal_class.csv", []table.Column{words("class"), {Name: "temperature", Unit: "degC", Required: true}}, func(row table.Row) {
		t.classes = append(t.classes, ThermalClass{row.MustText("class"), row.Positive("temperature"), row.Text("source")})
	})
	each("tape.csv", []table.Column{words("name"), metres("thickness"), words("use")}, func(row table.Row) {
		t.tapes = append(t.tapes, Tape{row.MustText("name"), row.Positive("thickness"), row.Text("use"), row.Text("source")})
	})
	if err := errors.Join(errs...); err != nil {
		return nil, err
	}
	if len(t.creepage) < 2 || len(t.impulse) < 2 || len(t.steady) < 2 || len(t.altitude) < 2 || len(t.transient) < 2 {
		return nil, fmt.Errorf("a table is too short to interpolate in")
	}
	return t, nil
}
