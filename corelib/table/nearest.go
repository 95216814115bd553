package table

import (
	"cmp"
	"slices"
	"strings"
	"unicode"
)

// Fold returns the form in which names are compared: lower case, without
// blanks, hyphens and underscores, so that "etd39/20/13" finds "ETD 39/20/13".
func Fold(name string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsSpace(r) || r == '-' || r == '_' {
			return -1
		}
		return unicode.ToLower(r)
	}, name)
}

// Nearest returns up to n of names that a person may have meant by name, best
// first. Names that begin with the folded name go before all others; the rest is
// ordered by the number of single-letter edits.
func Nearest(name string, names []string, n int) []string {
	type candidate struct {
		name     string
		distance int
	}
	wanted := Fold(name)
	list := make([]candidate, 0, len(names))
	for _, other := range names {
		folded := Fold(other)
		d := edits(wanted, folded)
		if wanted != "" && strings.HasPrefix(folded, wanted) {
			d = 0
		}
		list = append(list, candidate{other, d})
	}
	slices.SortStableFunc(list, func(a, b candidate) int { return cmp.Compare(a.distance, b.distance) })
	best := make([]string, 0, n)
	for _, c := range list[:min(n, len(list))] {
		// Beyond the nearest one, only equally good guesses help.
		if len(best) > 0 && c.distance > list[0].distance {
			break
		}
		best = append(best, c.name)
	}
	return best
}

// edits is the Levenshtein distance of two strings.
func edits(a, b string) int {
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := range len(a) {
		diagonal := row[0]
		row[0] = i + 1
		for j := range len(b) {
			cost := diagonal
			if a[i] != b[j] {
				cost++
			}
			diagonal = row[j+1]
			row[j+1] = min(cost, row[j]+1, row[j+1]+1)
		}
	}
	return row[len(b)]
}
