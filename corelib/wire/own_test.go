package wire

import (
	"encoding/csv"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"testing/fstest"
)

// readCSV returns the numbers of a file of check values by heading; empty cells
// are left out.
func readCSV(t *testing.T, name string) []map[string]float64 {
	t.Helper()
	f, err := os.Open(filepath.Join("..", "..", "testdata", "wire", name))
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
	var rows []map[string]float64
	for _, record := range records[1:] {
		row := map[string]float64{}
		for i, head := range records[0] {
			if record[i] == "" {
				continue
			}
			v, err := strconv.ParseFloat(record[i], 64)
			if err != nil {
				t.Fatal(err)
			}
			row[head] = v
		}
		rows = append(rows, row)
	}
	return rows
}

const ownHeader = "wire,outer diameter [mm],outer diameter max [mm],resistance [mohm/m],source,note\n"

func TestOwnWires(t *testing.T) {
	table, err := (&Table{}).With(fstest.MapFS{"wires.csv": {Data: []byte(ownHeader +
		"\"225 x 0.071 mm litz, double serving\",1.5,1.58,20.6,reel measured,\n0.52 mm grade 2,0.58,0.59,,list,\n")}}, "ours")
	if err != nil {
		t.Fatal(err)
	}
	w, err := table.Parse("225x71um litz double serving")
	if err != nil {
		t.Fatal(err)
	}
	if w.OuterDiameter() != 1.5e-3 || w.OuterDiameterMax() != 1.58e-3 || w.ResistancePerLength(20) != 20.6e-3 {
		t.Errorf("%s: %g, %g m, %g ohm/m", w, w.OuterDiameter(), w.OuterDiameterMax(), w.ResistancePerLength(20))
	}
	if got, want := w.ResistancePerLength(120), 20.6e-3*1.393; got < want*(1-1e-12) || got > want*(1+1e-12) {
		t.Errorf("hot: %g ohm/m, want %g", got, want)
	}
	if got := strings.Join(w.Sources(), ""); got != "reel measured (ours/wires.csv)" {
		t.Errorf("sources %q", got)
	}
	// A copy that was changed is another wire, and the row no longer holds.
	other := w
	other.Serving = NoServing
	plain, err := Parse("225 x 0.071 mm litz")
	if err != nil {
		t.Fatal(err)
	}
	if other.OuterDiameter() != plain.OuterDiameter() {
		t.Errorf("%s keeps the figures of %s", other, w)
	}
	if w.String() != "225 x 0.071 mm litz, double serving" {
		t.Errorf("prints %q", w)
	}
	if len(table.Own()) != 2 {
		t.Errorf("%d own rows, want 2", len(table.Own()))
	}
	later, err := table.With(fstest.MapFS{"wires.csv": {Data: []byte(ownHeader + "0.52 mm grade 2,0.57,0.6,,newer list,\n")}}, "new")
	if err != nil {
		t.Fatal(err)
	}
	if w, _ := later.Parse("0.52 mm"); w.OuterDiameter() != 0.57e-3 || len(later.Own()) != 2 {
		t.Errorf("the later row does not win: %g m, %d rows", w.OuterDiameter(), len(later.Own()))
	}
}

func TestBadOwnWires(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"120x0.1,1.5,1.6,,x,\n", "ours/wires.csv:2:1: wire \"120x0.1\": 120 is a bare number; write for example 120 x 0.1 mm litz"},
		{"0.5 mm grade 2,0.55,0.56,,,\n", "ours/wires.csv:2:27: source is empty"},
		{"0.5 mm grade 2,0.45,0.56,,x,\n", "outer diameter 0.45 mm is not above 0.500 mm, which the copper alone needs"},
		{"120 x 0.1 mm litz,1.05,1.6,,x,\n", "is not above 1.095 mm"},
		{"0.5 mm grade 2,0.55,0.54,,x,\n", "below the nominal one"},
		{"0.5 mm grade 2,0.55,0.56,0.088,x,\n", "is the unit right?"},
		{"0.5 mm grade 2,0.55,0.56,,x,\n0.5 mm,0.55,0.56,,x,\n", "ours/wires.csv:3:1: wire 0.5 mm grade 2 appears twice, first in line 2"},
		{"0.2 mm foil,0.2,0.2,,x,\n", "a foil has no figures"},
		{"0.5 mm grade 2,0.55,,,x,\n", "outer diameter max is empty"},
	} {
		_, err := (&Table{}).With(fstest.MapFS{"wires.csv": {Data: []byte(ownHeader + c.text)}}, "ours")
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%q:\ngot  %v\nwant %s", c.text, err, c.want)
		}
	}
}
