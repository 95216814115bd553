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
// first. What counts is how many single-letter edits turn name into the beginning
// of another, so that a short form finds the full one, and whether both begin
// with the same letters, which name the family of a part; ties go to the name
// that is nearest as a whole.
func Nearest(name string, names []string, n int) []string {
	type candidate struct {
		name        string
		start, full int
	}
	wanted := Fold(name)
	list := make([]candidate, 0, len(names))
	for _, other := range names {
		folded := Fold(other)
		c := candidate{name: other}
		c.start, c.full = edits(wanted, folded)
		if letters(wanted) != letters(folded) {
			c.start += 2
		}
		list = append(list, c)
	}
	slices.SortStableFunc(list, func(a, b candidate) int {
		return cmp.Or(cmp.Compare(a.start, b.start), cmp.Compare(a.full, b.full))
	})
	best := make([]string, 0, n)
	for _, c := range list[:min(n, len(list))] {
		// Beyond the nearest one, only equally good guesses help.
		if len(best) > 0 && c.start > list[0].start {
			break
		}
		best = append(best, c.name)
	}
	return best
}

// letters returns the letters that a folded name begins with.
func letters(folded string) string {
	if i := strings.IndexFunc(folded, func(r rune) bool { return !unicode.IsLetter(r) }); i >= 0 {
		return folded[:i]
	}
	return folded
}

// edits returns the Levenshtein distance of a to the nearest beginning of b and
// to the whole of b.
func edits(a, b string) (start, full int) {
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
	return slices.Min(row), row[len(b)]
}
