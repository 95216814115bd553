package quantity

import (
	"math"
	"strconv"
	"strings"
)

// Digits is the number of significant digits that Format prints.
const Digits = 4

// signs turns the ASCII symbols of the unit table into those that people read.
var signs = strings.NewReplacer("ohm", "Ω", "degC", "°C", "m2", "m²", "m3", "m³")

// Format prints x, in SI, for people: rounded to 4 significant digits first,
// with the prefix chosen after, so that 999.96 µH becomes "1.000 mH". Signs are
// UTF-8. A value that is not finite is printed as "not finite".
func Format(x float64, u Unit) string { return FormatDigits(x, u, Digits) }

// FormatDigits is Format with a number of significant digits of its own.
func FormatDigits(x float64, u Unit, digits int) string {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return "not finite"
	}
	symbol, exp := "", 0
	if u.d != nil {
		symbol, exp = u.d.pick(x, digits)
	}
	number := decimal(x, digits, exp)
	if symbol == "" {
		return number
	}
	return number + " " + Sign(symbol)
}

// FormatAs prints x in the unit of symbol (such as "mm") with a fixed number of
// decimals, for columns of one unit; Number is the same without the unit.
func FormatAs(x float64, u Unit, symbol string, decimals int) string {
	return Number(x, u, symbol, decimals) + " " + Sign(symbol)
}

// Number returns x in the unit of symbol with a fixed number of decimals.
func Number(x float64, u Unit, symbol string, decimals int) string {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return "not finite"
	}
	exp, ok := u.exponent(symbol)
	if !ok {
		panic("quantity: " + symbol + " is not a unit of " + u.Word())
	}
	s := strconv.FormatFloat(shifted(x, exp), 'f', decimals, 64)
	if strings.HasPrefix(s, "-") && !strings.ContainsAny(s, "123456789") {
		s = s[1:] // no negative zero
	}
	return s
}

// Sign returns the UTF-8 form of an ASCII symbol: "uH" -> "µH".
func Sign(symbol string) string {
	if len(symbol) > 1 && symbol[0] == 'u' {
		symbol = "µ" + symbol[1:]
	}
	return signs.Replace(symbol)
}

// pick chooses the symbol that suits x after rounding to the given digits.
func (d *dimension) pick(x float64, digits int) (symbol string, exp int) {
	if d.prefixed == "" {
		return d.print[0].symbol, d.print[0].exp
	}
	if x == 0 {
		return d.si, exponentOf(d, d.si)
	}
	s := strconv.FormatFloat(math.Abs(x), 'e', digits-1, 64)
	e, _ := strconv.Atoi(s[strings.IndexByte(s, 'e')+1:])
	best := d.suffixes[0]
	for _, p := range d.suffixes[:len(prefixes)] {
		if e >= p.exp {
			best = p
		}
	}
	return best.symbol, best.exp
}

func exponentOf(d *dimension, symbol string) int {
	e, _ := Unit{d: d}.exponent(symbol)
	return e
}

// decimal prints x/10^exp with the given significant digits and without
// exponent, except where more than three zeros would have to be made up.
func decimal(x float64, digits, exp int) string {
	if x == 0 {
		return "0"
	}
	s := strconv.FormatFloat(x, 'e', digits-1, 64)
	i := strings.IndexByte(s, 'e')
	mantissa := s[:i]
	e, _ := strconv.Atoi(s[i+1:])
	e -= exp
	if e > digits+2 || e < -4 {
		return mantissa + "e" + strconv.Itoa(e)
	}
	return place(mantissa, e)
}

// place moves the point of a mantissa d.ddd by e digits.
func place(mantissa string, e int) string {
	minus := ""
	if strings.HasPrefix(mantissa, "-") {
		minus, mantissa = "-", mantissa[1:]
	}
	all := strings.Replace(mantissa, ".", "", 1)
	switch {
	case e < 0:
		return minus + "0." + strings.Repeat("0", -e-1) + all
	case e+1 >= len(all):
		return minus + all + strings.Repeat("0", e+1-len(all))
	}
	return minus + all[:e+1] + "." + all[e+1:]
}

// shifted returns x/10^exp, rounded once.
func shifted(x float64, exp int) float64 {
	s := strconv.FormatFloat(x, 'e', -1, 64)
	i := strings.IndexByte(s, 'e')
	e, _ := strconv.Atoi(s[i+1:])
	y, _ := strconv.ParseFloat(s[:i+1]+strconv.Itoa(e-exp), 64)
	return y
}

// Exact writes x as the shortest ASCII text that Parse reads back as the same
// float64. It uses the unit that u was made for with Like or Lookup; without
// such a preference the prefix follows the value. Exact panics when x is not
// finite.
func Exact(x float64, u Unit) string {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		panic("quantity: Exact of a value that is not finite")
	}
	s := strconv.FormatFloat(x, 'e', -1, 64)
	i := strings.IndexByte(s, 'e')
	mantissa := s[:i]
	e, _ := strconv.Atoi(s[i+1:])
	symbol, exp := "", 0
	if u.d != nil {
		symbol, exp = u.Usual(), exponentOf(u.d, u.Usual())
		if u.usual == "" && u.d.prefixed != "" && u.d != Meter.d && x != 0 {
			symbol, exp = u.d.pick(x, 17)
		}
	}
	var number string
	if d := e - exp; x != 0 && (d > 9 || d < -6) {
		number = mantissa + "e" + strconv.Itoa(d)
	} else if x == 0 {
		number = "0"
	} else {
		number = place(mantissa, d)
	}
	if symbol == "" {
		return number
	}
	return number + " " + symbol
}
