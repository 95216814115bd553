package document

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"
	"unicode/utf8"
)

// An Error is one thing that is wrong with a document, and where.
type Error struct {
	File         string
	Line, Column int    // counted from 1
	Field        string // the key; empty for the document as a whole
	Msg          string // what is wrong; what to write
}

func (e *Error) Error() string {
	where := fmt.Sprintf("%s:%d:%d: ", e.File, e.Line, e.Column)
	if e.Field != "" {
		where += e.Field + ": "
	}
	return where + e.Msg
}

// Position returns the place of the error, for printers that let an editor jump
// to it.
func (e *Error) Position() (file string, line, column int) { return e.File, e.Line, e.Column }

// join returns errs in file order as one error, nil for none.
func join(errs []*Error) error {
	sorted := slices.Clone(errs)
	slices.SortStableFunc(sorted, func(a, b *Error) int {
		if a.Line != b.Line {
			return a.Line - b.Line
		}
		return a.Column - b.Column
	})
	var list []error
	for i, e := range sorted {
		if i == 0 || *e != *sorted[i-1] {
			list = append(list, e)
		}
	}
	return errors.Join(list...)
}

// nearest returns the word of list that a mistyped word most likely means, and
// "" when none is near.
func nearest(word string, list []string) string {
	best, bestDistance := "", max(1, utf8.RuneCountInString(word)/3)+1
	for _, w := range list {
		if d := distance(strings.ToLower(word), strings.ToLower(w)); d < bestDistance {
			best, bestDistance = w, d
		}
	}
	return best
}

// distance counts the insertions, deletions, replacements and swaps of
// neighbours that turn a into b (optimal string alignment).
func distance(a, b string) int {
	if len(a) > 64 || len(b) > 64 {
		return math.MaxInt // no key is that long
	}
	x, y := []rune(a), []rune(b)
	rows := [3][]int{make([]int, len(y)+1), make([]int, len(y)+1), make([]int, len(y)+1)}
	for j := range rows[1] {
		rows[1][j] = j
	}
	for i := 1; i <= len(x); i++ {
		before, last, now := rows[0], rows[1], rows[2]
		now[0] = i
		for j := 1; j <= len(y); j++ {
			cost := 1
			if x[i-1] == y[j-1] {
				cost = 0
			}
			now[j] = min(last[j]+1, now[j-1]+1, last[j-1]+cost)
			if i > 1 && j > 1 && x[i-1] == y[j-2] && x[i-2] == y[j-1] {
				now[j] = min(now[j], before[j-2]+1)
			}
		}
		rows[0], rows[1], rows[2] = last, now, before
	}
	return rows[1][len(y)]
}
