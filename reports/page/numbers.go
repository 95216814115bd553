package page

import (
	"fmt"
	"html"
	"html/template"
	"math"
	"strconv"
	"strings"

	"gapwright/corelib/quantity"
)

// number marks up a figure: the text for people, the full value and its place
// in design.json for programs. An empty path is a figure that is not in there.
func number(path string, value float64, text string) template.HTML {
	if math.IsNaN(value) || math.IsInf(value, 0) {
		return template.HTML(html.EscapeString(text))
	}
	at := ""
	if path != "" {
		at = ` data-at="` + html.EscapeString(path) + `"`
	}
	return template.HTML(`<data value="` + strconv.FormatFloat(value, 'g', -1, 64) + `"` + at + `>` + html.EscapeString(text) + `</data>`)
}

// unit prints a figure in its unit with the usual number of digits.
func unit(path string, value float64, u quantity.Unit) template.HTML {
	return number(path, value, quantity.Format(value, u))
}

// scaled prints value*factor with a number of decimals, and what follows.
func scaled(path string, value, factor float64, decimals int, after string) template.HTML {
	return number(path, value, fmt.Sprintf("%.*f", decimals, value*factor)+after)
}

// percent prints a ratio.
func percent(path string, value float64, decimals int) template.HTML {
	return scaled(path, value, 100, decimals, " %")
}

// deviation prints by how much a is off b, with its sign.
func deviation(a, b float64) string {
	if b == 0 || math.IsNaN(a/b) || math.IsInf(a/b, 0) {
		return "–"
	}
	return signed(100*(a/b-1), 1) + " %"
}

// signed prints a number with its sign, and zero without.
func signed(x float64, decimals int) string {
	t := fmt.Sprintf("%+.*f", decimals, x)
	if strings.Trim(t, "+-0.") == "" {
		return t[1:]
	}
	return strings.Replace(t, "-", "−", 1)
}

// rounded is a number for a script, to five digits.
func rounded(x float64) float64 {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return 0
	}
	v, err := strconv.ParseFloat(strconv.FormatFloat(x, 'g', 5, 64), 64)
	if err != nil {
		return 0
	}
	return v
}

func roundedAll(list []float64, factor float64) []float64 {
	out := make([]float64, len(list))
	for i, x := range list {
		out[i] = rounded(x * factor)
	}
	return out
}

func times(list []float64, factor float64) []float64 {
	out := make([]float64, len(list))
	for i, x := range list {
		out[i] = x * factor
	}
	return out
}
