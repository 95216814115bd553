package shape

import (
	"encoding/csv"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"testing"
)

// readCSV returns the rows of a file of check values by heading.
func readCSV(t *testing.T, name string) []map[string]string {
	t.Helper()
	f, err := os.Open(filepath.Join("..", "..", "testdata", "shape", name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	records, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var rows []map[string]string
	for _, record := range records[1:] {
		row := map[string]string{}
		for i, head := range records[0] {
			row[head] = record[i]
		}
		rows = append(rows, row)
	}
	return rows
}

func number(t *testing.T, text string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(text, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// near reports whether got equals a printed value to half a unit of its last
// digit, with a grain for values that lie between two digits.
func near(got, printed, digit float64) bool { return math.Abs(got-printed) <= 0.5001*digit }

func TestComputedAgainstSeparateProgram(t *testing.T) {
	rows := readCSV(t, "computed.csv")
	if len(rows) != 79 {
		t.Fatalf("%d rows, want 79", len(rows))
	}
	for _, row := range rows {
		s, err := Embedded().Find(row["name"])
		if err != nil {
			t.Error(err)
			continue
		}
		e, err := s.Computed()
		if err != nil {
			t.Error(err)
			continue
		}
		if want := number(t, row["le_mm"]); !near(1e3*e.Le, want, 0.01) {
			t.Errorf("%s: Le = %.4f mm, want %.2f", s.Name, 1e3*e.Le, want)
		}
		if want := number(t, row["Ae_mm2"]); !near(1e6*e.Ae, want, 0.1) {
			t.Errorf("%s: Ae = %.3f mm2, want %.1f", s.Name, 1e6*e.Ae, want)
		}
		if got, want := 100*(e.Amin/s.Amin-1), number(t, row["Amin_dev_pct"]); !near(got, want, 0.1) {
			t.Errorf("%s: Amin deviates by %+.2f %%, want %+.1f %%", s.Name, got, want)
		}
		if got, want := 100*(e.Le/s.Le-1), number(t, row["le_dev_pct"]); !near(got, want, 0.1) {
			t.Errorf("%s: Le deviates by %+.2f %%, want %+.1f %%", s.Name, got, want)
		}
	}
}

// The letters promise how well dimensions and published parameters agree. A and
// B rows have proven parameters, and what is left is the formula of the family:
// the bands below are those that the notes of the rows state.
func TestComputedWithinTheBandOfTheLetter(t *testing.T) {
	type band struct{ le, ae, amin float64 } // %
	letter := map[Confidence]band{
		ConfidenceC: {2, 2, 3},
	}
	proven := map[string]band{ // A and B
		ETD: {0.5, 0.6, 0.3}, E: {0.5, 0.5, 0.6},
		EFD:     {2, 3, 6},   // chamfers and offset of the post are not in the table
		RM:      {3, 3, 0.3}, // the back plate is taken as a full ring
		PlanarE: {1, 5, 5},   // rounded edges of E 14/3.5/5; all others are within 2.2 %
	}
	doubtful := map[string]band{ // D: what the notes say
		ER: {2, 6, 0.5}, E: {2.2, 0.5, 0.5}, EFD: {2.5, 2, 6}, PQ: {15, 18.5, 5}, EQ: {5, 5, 1}, RM: {5, 4, 1.1},
		RMLow: {3.5, 5.5, 1.1}, P: {3, 4, 1}, EP: {3, 3.5, 13.1},
	}
	for _, s := range Embedded().Shapes() {
		limit, ok := letter[s.Confidence]
		switch s.Confidence {
		case ConfidenceA, ConfidenceB:
			limit, ok = proven[s.Family]
		case ConfidenceD:
			limit, ok = doubtful[s.Family]
		}
		if !ok {
			t.Errorf("%s: no band for family %s with letter %s", s.Name, s.Family, s.Confidence)
			continue
		}
		e, err := s.Computed()
		if err != nil {
			t.Error(err)
			continue
		}
		for _, c := range []struct {
			name                  string
			computed, given, most float64
		}{{"le", e.Le, s.Le, limit.le}, {"Ae", e.Ae, s.Ae, limit.ae}, {"Amin", e.Amin, s.Amin, limit.amin}} {
			if d := 100 * (c.computed/c.given - 1); math.Abs(d) > c.most {
				t.Errorf("%s (%s): computed %s is %+.2f %% from the published one, the band is %g %%", s.Name, s.Confidence, c.name, d, c.most)
			}
		}
	}
}

func TestComputedRefusesAShapeWithoutSection(t *testing.T) {
	s, err := Embedded().Find("PQ 26/25")
	if err != nil {
		t.Fatal(err)
	}
	s.G = Range{60e-3, 60e-3}
	if e, err := s.Computed(); err == nil {
		t.Errorf("Computed = %+v for an opening wider than the core, want an error", e)
	}
}

// Scaling all lengths by k scales le by k, Ae by k², Ve by k³.
func TestComputedScales(t *testing.T) {
	const k = 1.7
	for _, s := range Embedded().Shapes() {
		e, err := s.Computed()
		if err != nil {
			t.Fatal(err)
		}
		for _, r := range []*Range{&s.A, &s.B, &s.C, &s.D, &s.E, &s.F, &s.G, &s.H, &s.K, &s.R, &s.S} {
			r.Min *= k
			r.Max *= k
		}
		big, err := s.Computed()
		if err != nil {
			t.Fatal(err)
		}
		for _, c := range []struct{ got, want float64 }{{big.Le, k * e.Le}, {big.Ae, k * k * e.Ae}, {big.Amin, k * k * e.Amin}, {big.Ve, k * k * k * e.Ve}} {
			if math.Abs(c.got/c.want-1) > 1e-12 {
				t.Errorf("%s: scaled %g, want %g", s.Name, c.got, c.want)
			}
		}
	}
}

func BenchmarkComputed(b *testing.B) {
	shapes := Embedded().Shapes()
	for b.Loop() {
		for _, s := range shapes {
			if _, err := s.Computed(); err != nil {
				b.Fatal(err)
			}
		}
	}
	b.ReportMetric(float64(len(shapes)), "shapes/op")
}
