package quantity

import (
	"slices"
	"strings"
)

// A Unit is what a value is measured in. The zero Unit is Plain: a number
// without unit.
type Unit struct {
	d     *dimension
	usual string // ASCII symbol that hints and exact texts use; empty: the dimension's own
}

// dimension is one kind of quantity with every unit that is read for it.
type dimension struct {
	word     string // inductance, ...; used in messages
	si       string // ASCII symbol of the SI unit
	usual    string
	prefixed string // the symbol that takes prefixes; empty: none
	shift    int    // decimal exponent of prefixed over the SI unit
	print    []suffix
	suffixes []suffix // every accepted symbol
}

// suffix is one symbol with the decimal exponent that leads to the SI unit.
type suffix struct {
	symbol string
	exp    int
}

// prefixes are those of the reader, from small to large.
var prefixes = []suffix{{"p", -12}, {"n", -9}, {"u", -6}, {"m", -3}, {"", 0}, {"k", 3}, {"M", 6}, {"G", 9}}

func prefixed(word, symbol, usual string, shift int, more ...suffix) *dimension {
	d := &dimension{word: word, si: symbol, usual: usual, prefixed: symbol, shift: shift}
	for _, p := range prefixes {
		d.suffixes = append(d.suffixes, suffix{p.symbol + symbol, p.exp + shift})
	}
	d.suffixes = append(d.suffixes, more...)
	return d
}

// fixed is a dimension whose symbols are listed; the first is the one printed.
func fixed(word, si string, list ...suffix) *dimension {
	return &dimension{word: word, si: si, usual: list[0].symbol, print: list, suffixes: list}
}

// The units of the reader, one per kind of quantity.
var (
	Plain                = Unit{}
	Henry                = Unit{d: prefixed("an inductance", "H", "uH", 0)}
	Farad                = Unit{d: prefixed("a capacitance", "F", "nF", 0)}
	Volt                 = Unit{d: prefixed("a voltage", "V", "V", 0)}
	Ampere               = Unit{d: prefixed("a current", "A", "A", 0)}
	Watt                 = Unit{d: prefixed("a power", "W", "W", 0)}
	Hertz                = Unit{d: prefixed("a frequency", "Hz", "kHz", 0)}
	Ohm                  = Unit{d: prefixed("a resistance", "ohm", "ohm", 0)}
	Second               = Unit{d: prefixed("a time", "s", "ns", 0)}
	Meter                = Unit{d: prefixed("a length", "m", "mm", 0)}
	Kilogram             = Unit{d: gram()}
	Tesla                = Unit{d: prefixed("a flux density", "T", "mT", 0)}
	Kelvin               = Unit{d: prefixed("a temperature rise", "K", "K", 0)}
	Celsius              = Unit{d: fixed("a temperature", "degC", suffix{"degC", 0})}
	SquareMeter          = Unit{d: fixed("an area", "m2", suffix{"mm2", -6}, suffix{"cm2", -4}, suffix{"m2", 0})}
	CubicMeter           = Unit{d: fixed("a volume", "m3", suffix{"cm3", -6}, suffix{"mm3", -9}, suffix{"m3", 0})}
	AmperePerSquareMeter = Unit{d: fixed("a current density", "A/m2", suffix{"A/mm2", 6})}
	WattPerCubicMeter    = Unit{d: fixed("a loss density", "W/m3", suffix{"kW/m3", 3}, suffix{"mW/cm3", 3}, suffix{"W/m3", 0})}
	WattPerKelvin        = Unit{d: fixed("a thermal conductance", "W/K", suffix{"W/K", 0})}
	MeterPerSecond       = Unit{d: fixed("a speed", "m/s", suffix{"m/s", 0})}
	SiemensPerMeter      = Unit{d: fixed("a conductivity", "S/m", suffix{"MS/m", 6})}
	HenryPerMeter        = Unit{d: henryPerMeter()}
	Percent              = Unit{d: fixed("a share", "%", suffix{"%", -2})}

	// Joule and VoltSecond are printed only; no key of a file has them.
	Joule      = Unit{d: prefixed("an energy", "J", "uJ", 0)}
	VoltSecond = Unit{d: prefixed("a flux linkage", "Vs", "uVs", 0)}
)

// gram takes the prefixes, the kilogram is the SI unit.
func gram() *dimension {
	d := prefixed("a mass", "g", "g", -3)
	d.si = "kg"
	return d
}

// henryPerMeter also reads plain henries: per meter of depth goes without
// saying in a planar window.
func henryPerMeter() *dimension {
	d := prefixed("an inductance per meter", "H/m", "nH/m", 0)
	d.suffixes = append(d.suffixes, Henry.d.suffixes...)
	return d
}

// Lookup returns the unit that a symbol such as "uH", "A/mm2" or "degC" belongs
// to, with that symbol as the one that hints use. An empty symbol is Plain.
func Lookup(symbol string) (Unit, bool) {
	if symbol == "" {
		return Plain, true
	}
	for _, u := range []Unit{
		Henry, Farad, Volt, Ampere, Watt, Hertz, Ohm, Second, Meter, Kilogram, Tesla, Kelvin, Celsius,
		SquareMeter, CubicMeter, AmperePerSquareMeter, WattPerCubicMeter, WattPerKelvin, MeterPerSecond,
		SiemensPerMeter, HenryPerMeter, Percent,
	} {
		if _, ok := u.exponent(symbol); ok {
			if symbol == u.d.si {
				return u, true // the SI symbol names the kind, it is no preference
			}
			return u.Like(symbol), true
		}
	}
	return Unit{}, false
}

// Like returns u with symbol (such as "mm") as the one that hints and Exact
// use. It panics when the symbol does not belong to u.
func (u Unit) Like(symbol string) Unit {
	if _, ok := u.exponent(symbol); !ok {
		panic("quantity: " + symbol + " is not a unit of " + u.Word())
	}
	return Unit{d: u.d, usual: symbol}
}

// Word names the kind of quantity with its article: "an inductance".
func (u Unit) Word() string {
	if u.d == nil {
		return "a plain number"
	}
	return u.d.word
}

// SI returns the ASCII symbol of the SI unit, empty for Plain.
func (u Unit) SI() string {
	if u.d == nil {
		return ""
	}
	return u.d.si
}

// Usual returns the ASCII symbol that people expect for such a value.
func (u Unit) Usual() string {
	switch {
	case u.d == nil:
		return ""
	case u.usual != "":
		return u.usual
	}
	return u.d.usual
}

// Symbols returns every ASCII symbol that is read for u, without the prefixed
// forms of one symbol but with their list: "H with p n u m k M G".
func (u Unit) Symbols() string {
	switch {
	case u.d == nil:
		return ""
	case u.d.prefixed != "":
		return u.d.prefixed + ", also with the prefixes p n u m k M G"
	}
	var list []string
	for _, s := range u.d.suffixes {
		list = append(list, s.symbol)
	}
	return strings.Join(list, ", ")
}

// Spellings returns every way of writing the unit that Parse reads.
func (u Unit) Spellings() []string {
	if u.d == nil {
		return nil
	}
	var list []string
	for _, s := range u.d.suffixes {
		list = append(list, s.symbol)
		if shown := Sign(s.symbol); shown != s.symbol {
			list = append(list, shown)
		}
		if s.symbol[0] == 'u' {
			list = append(list, "\u03bc"+s.symbol[1:], "µ"+s.symbol[1:])
		}
	}
	slices.Sort(list)
	return slices.Compact(list)
}

// exponent returns the decimal exponent of an ASCII symbol over the SI unit.
func (u Unit) exponent(symbol string) (int, bool) {
	if u.d == nil {
		return 0, symbol == ""
	}
	for _, s := range u.d.suffixes {
		if s.symbol == symbol {
			return s.exp, true
		}
	}
	return 0, false
}
