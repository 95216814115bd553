package circuit

import (
	"bytes"
	"errors"
	"strings"
	"testing"

	"gapwright/tank"
)

func netlist(t *testing.T, tk tank.Tank, c tank.Corner) string {
	t.Helper()
	o, err := tank.Solve(tk, c)
	if err != nil || o.Status != tank.OK {
		t.Fatalf("%v %s %s", err, o.Status, o.Reason)
	}
	var b bytes.Buffer
	if err := Netlist(&b, tk, o, 5); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// Every node of a circuit has at least two ends, and every element its own name.
func TestNetlistIsWhole(t *testing.T) {
	for _, c := range liveCases() {
		t.Run(c.name, func(t *testing.T) {
			c.corner.Name = "two\nlines"
			deck := netlist(t, c.tank(), c.corner)
			ends, names := map[string]int{}, map[string]bool{}
			for _, line := range strings.Split(strings.TrimSpace(deck), "\n") {
				f := strings.Fields(line)
				if line == "" || strings.ContainsAny(line[:1], "*.") {
					continue
				}
				if name := strings.ToLower(f[0]); names[name] {
					t.Errorf("%s stands twice", f[0])
				} else {
					names[name] = true
				}
				nodes := 2
				switch f[0][0] {
				case 'E', 'S':
					nodes = 4
				case 'F': // its third word is a source, not a node
				case 'R', 'C', 'L', 'V', 'D':
				default:
					t.Errorf("unknown element: %s", line)
				}
				for _, n := range f[1 : 1+nodes] {
					ends[n]++
				}
			}
			for n, k := range ends {
				if k < 2 {
					t.Errorf("node %s hangs in the air", n)
				}
			}
			if strings.Contains(deck, "NaN") || strings.Contains(deck, "Inf") {
				t.Errorf("a value is no number:\n%s", deck)
			}
			if deck != netlist(t, c.tank(), c.corner) {
				t.Error("the same corner gives two netlists")
			}
		})
	}
}

type fullDisk struct{}

func (fullDisk) Write([]byte) (int, error) { return 0, errors.New("no space left") }

func TestNetlistReportsWriteErrors(t *testing.T) {
	o, err := tank.Solve(supply(), tank.Corner{InputVoltage: 390, Frequency: 1e5, LoadResistance: 6})
	if err != nil {
		t.Fatal(err)
	}
	if err := Netlist(fullDisk{}, supply(), o, 5); err == nil {
		t.Error("a failed write went unnoticed")
	}
}
