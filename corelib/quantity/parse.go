package quantity

import (
	"math"
	"strconv"
	"strings"
)

// An Error says what is wrong with the text of a quantity and, where the
// program can tell, what to write instead.
type Error struct {
	Text  string // as read
	Wrong string // "is a bare number"
	Write string // "60 uH"; may be empty
}

func (e *Error) Error() string {
	s := e.Text + " " + e.Wrong
	if e.Text == "" {
		s = e.Wrong
	}
	if e.Write != "" {
		s += "; write " + e.Write
	}
	return s
}

// ascii maps the signs that people type and Format prints to the ASCII forms of
// the unit table.
var ascii = strings.NewReplacer("µ", "u", "μ", "u", "Ω", "ohm", "Ω", "ohm", "°C", "degC", "²", "2", "³", "3")

// Parse reads a number with a unit, such as "60 uH", "60µH" or "6e-5 H", and
// returns it in coherent SI (temperatures in °C). The prefix is applied as a
// decimal exponent, so that "60 uH" is exactly the float64 nearest to 60e-6. A
// Plain quantity is a number without unit.
//
// A bare number for a quantity that has a unit is refused, and so are a prefix
// without unit, a decimal comma, leading zeros, digit separators and anything
// that is not finite. The error is an *Error.
func Parse(text string, u Unit) (float64, error) {
	text = strings.TrimFunc(text, isSpace)
	if text == "" {
		return 0, &Error{Wrong: "there is no value", Write: "a number" + u.suffixWords()}
	}
	number, rest := splitNumber(text)
	if number == "" {
		return 0, noNumber(text, u)
	}
	symbol := ascii.Replace(strings.TrimFunc(rest, isSpace))
	if err := checkDigits(text, number, rest, u); err != nil {
		return 0, err
	}
	if symbol == "" && u.d != nil {
		return 0, &Error{Text: text, Wrong: "is a bare number", Write: u.bare(number)}
	}
	exp, ok := u.exponent(symbol)
	if !ok {
		return 0, wrongUnit(text, number, symbol, u)
	}
	return scale(text, number, exp)
}

// scale converts number times 10^exp in one step.
func scale(text, number string, exp int) (float64, error) {
	mantissa := number
	if i := strings.IndexAny(number, "eE"); i >= 0 {
		own, err := strconv.Atoi(number[i+1:])
		if err != nil || own < -10000 || own > 10000 {
			return 0, &Error{Text: text, Wrong: "is out of the range of numbers"}
		}
		mantissa, exp = number[:i], exp+own
	}
	x, err := strconv.ParseFloat(mantissa+"e"+strconv.Itoa(exp), 64)
	if err != nil || math.IsInf(x, 0) || (x == 0 && strings.ContainsAny(mantissa, "123456789")) {
		return 0, &Error{Text: text, Wrong: "is out of the range of numbers"}
	}
	if x == 0 {
		x = 0 // no negative zero
	}
	return x, nil
}

// splitNumber cuts the longest decimal number off the front of text.
func splitNumber(text string) (number, rest string) {
	i := 0
	if i < len(text) && (text[i] == '+' || text[i] == '-') {
		i++
	}
	digits := 0
	for ; i < len(text) && isDigit(text[i]); i++ {
		digits++
	}
	if i < len(text) && text[i] == '.' {
		j := i + 1
		for ; j < len(text) && isDigit(text[j]); j++ {
			digits++
		}
		if digits > 0 {
			i = j
		}
	}
	if digits == 0 {
		return "", text
	}
	if i < len(text) && (text[i] == 'e' || text[i] == 'E') {
		j := i + 1
		if j < len(text) && (text[j] == '+' || text[j] == '-') {
			j++
		}
		first := j
		for ; j < len(text) && isDigit(text[j]); j++ {
		}
		if j > first {
			i = j
		}
	}
	return text[:i], text[i:]
}

// checkDigits refuses the ways of writing digits that different readers take
// for different numbers.
func checkDigits(text, number, rest string, u Unit) error {
	unsigned := strings.TrimLeft(number, "+-")
	if len(unsigned) > 1 && unsigned[0] == '0' && isDigit(unsigned[1]) {
		short := strings.TrimLeft(unsigned, "0")
		if short == "" || !isDigit(short[0]) {
			short = "0" + short
		}
		return &Error{Text: text, Wrong: "starts with a needless zero", Write: u.example(sign(number) + short)}
	}
	if rest == "" {
		return nil
	}
	switch {
	case rest[0] == ',' && len(rest) > 1 && isDigit(rest[1]):
		digits, _ := splitNumber(rest[1:])
		write := ""
		if !strings.ContainsAny(number, ".eE") && !strings.Contains(rest[1:], ",") {
			write = withUnit(number+"."+digits, strings.TrimFunc(rest[1+len(digits):], isSpace), u)
		}
		return &Error{Text: text, Wrong: "has a decimal comma", Write: write}
	case (rest[0] == 'x' || rest[0] == 'X') && number == "0":
		return &Error{Text: text, Wrong: "is not a decimal number"}
	case rest[0] == '_':
		write := ""
		if clean, tail := splitNumber(strings.ReplaceAll(text, "_", "")); clean != "" {
			write = withUnit(clean, strings.TrimFunc(tail, isSpace), u)
		}
		return &Error{Text: text, Wrong: "has a digit separator", Write: write}
	}
	return nil
}

// noNumber explains a text that does not begin with digits.
func noNumber(text string, u Unit) error {
	word := strings.ToLower(strings.TrimLeft(text, "+-."))
	for _, w := range []string{"inf", "nan"} {
		if strings.HasPrefix(word, w) {
			return &Error{Text: text, Wrong: "is not a finite number", Write: "a number" + u.suffixWords()}
		}
	}
	if strings.HasPrefix(text, "−") || strings.HasPrefix(text, "–") {
		return &Error{Text: text, Wrong: "has a typographic minus", Write: "-" + strings.TrimLeft(text, "−–")}
	}
	return &Error{Text: text, Wrong: "is not " + u.Word(), Write: "a number" + u.suffixWords()}
}

// wrongUnit explains a symbol that does not belong to u.
func wrongUnit(text, number, symbol string, u Unit) error {
	if u.d == nil {
		return &Error{Text: text, Wrong: "has a unit, but this is a plain number", Write: number}
	}
	switch {
	case u == Celsius || u.d == Celsius.d:
		if symbol == "K" {
			return &Error{Text: text, Wrong: "is a temperature rise, but this is a temperature in degC", Write: u.example(number)}
		}
		if symbol == "C" || symbol == "degc" || symbol == "deg" {
			return &Error{Text: text, Wrong: "has an unknown unit", Write: u.example(number)}
		}
	case u.d == Kelvin.d && symbol == "degC":
		return &Error{Text: text, Wrong: "is a temperature, but this is a rise in K", Write: u.example(number)}
	}
	for _, p := range prefixes {
		if p.symbol != "" && symbol == p.symbol && u.d.prefixed != "" {
			return &Error{Text: text, Wrong: "has a prefix without a unit", Write: number + " " + symbol + u.d.prefixed}
		}
	}
	for _, s := range u.d.suffixes {
		if strings.EqualFold(s.symbol, symbol) {
			return &Error{Text: text, Wrong: "has a unit in the wrong case", Write: number + " " + s.symbol}
		}
	}
	return &Error{Text: text, Wrong: "is not " + u.Word(), Write: "a number" + u.suffixWords()}
}

// bare completes a number without unit. Below 1, a bare share is more likely a
// ratio than a percentage.
func (u Unit) bare(number string) string {
	if u.d == Percent.d {
		if x, err := strconv.ParseFloat(number, 64); err == nil && math.Abs(x) < 1 && x != 0 {
			return Exact(x, Percent)
		}
	}
	return u.example(number)
}

// example writes a number in the usual unit.
func (u Unit) example(number string) string {
	if u.d == nil {
		return number
	}
	return number + " " + u.Usual()
}

// withUnit puts number before the symbol that was read, when it is a right one.
func withUnit(number, symbol string, u Unit) string {
	if _, ok := u.exponent(ascii.Replace(symbol)); ok && symbol != "" {
		return number + " " + symbol
	}
	return u.example(number)
}

// suffixWords continues "a number" by the units that would be right.
func (u Unit) suffixWords() string {
	if u.d == nil {
		return ""
	}
	return " in " + u.Usual()
}

func sign(number string) string {
	if strings.HasPrefix(number, "-") {
		return "-"
	}
	return ""
}

func isDigit(c byte) bool { return '0' <= c && c <= '9' }

// isSpace includes the no-break spaces that typeset quantities carry.
func isSpace(r rune) bool { return r == ' ' || r == '\t' || r == '\u00a0' || r == '\u202f' }
