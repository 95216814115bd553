package circuit

import (
	"bytes"
	"context"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"time"

	"gapwright/tank"
)

// supply is a half-bridge LLC supply of our own, 390 V to 48 V.
func supply() tank.Tank {
	return tank.Tank{
		Bridge: tank.HalfBridge, Rectifier: tank.CenterTapped, TurnsRatio: 4, Lr: 60e-6, Cr: 44e-9, Lm: 400e-6,
		RectifierDrop: 0.05, RectifierResistance: 4e-3, BridgeResistance: 0.12, CapacitorResistance: 0.01, PrimaryResistance: 0.1,
		SecondaryResistance: 5e-3, FrequencyMin: 50e3, FrequencyMax: 250e3,
	}
}

type liveCase struct {
	name   string
	tank   func() tank.Tank
	corner tank.Corner
}

func liveCases() []liveCase {
	with := func(change func(*tank.Tank)) func() tank.Tank {
		return func() tank.Tank { t := supply(); change(&t); return t }
	}
	dead := func(t *tank.Tank) { t.NodeCapacitance, t.DeadTime = 300e-12, 200e-9 }
	return []liveCase{
		{"below resonance", supply, tank.Corner{InputVoltage: 330, OutputVoltage: 48, OutputCurrent: 8.4}},
		{"above resonance, light", supply, tank.Corner{InputVoltage: 410, OutputVoltage: 48, OutputPower: 80}},
		{"dead time", with(dead), tank.Corner{InputVoltage: 390, OutputVoltage: 48, OutputCurrent: 8.4}},
		{"full bridge, four diodes, dead time", with(func(t *tank.Tank) {
			dead(t)
			t.Bridge, t.Rectifier, t.TurnsRatio, t.RectifierDrop = tank.FullBridge, tank.FullBridgeRectifier, 8, 0.7
		}), tank.Corner{InputVoltage: 400, OutputVoltage: 48, OutputCurrent: 8}},
		{"doubler", with(func(t *tank.Tank) {
			t.Rectifier, t.TurnsRatio, t.RectifierDrop = tank.VoltageDoubler, 1, 0.7
		}), tank.Corner{InputVoltage: 380, OutputVoltage: 400, OutputCurrent: 0.8}},
	}
}

var measured = regexp.MustCompile(`(?m)^(\w+)\s+=\s+([-+0-9.eE]+)`)

// simulate runs ngspice on the netlist of an operation and returns what it
// measured and the processor time it took.
func simulate(t testing.TB, tk tank.Tank, o tank.Operation, periods int) (map[string]float64, time.Duration) {
	t.Helper()
	exe, err := exec.LookPath("ngspice")
	if err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal("ngspice is missing: install it where CI=true")
		}
		t.Skip("needs ngspice")
	}
	var deck bytes.Buffer
	if err := Netlist(&deck, tk, o, periods); err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	file := filepath.Join(dir, "corner.cir")
	if err := os.WriteFile(file, deck.Bytes(), 0o600); err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithTimeout(t.Context(), 2*time.Minute)
	defer cancel()
	c := exec.CommandContext(ctx, exe, "-b", file)
	c.Dir = dir
	out, err := c.CombinedOutput()
	if err != nil {
		t.Fatalf("ngspice: %v\n%s", err, out)
	}
	values := map[string]float64{}
	for _, m := range measured.FindAllStringSubmatch(string(out), -1) {
		if x, err := strconv.ParseFloat(m[2], 64); err == nil {
			values[strings.ToLower(m[1])] = x
		}
	}
	if len(values) == 0 {
		t.Fatalf("ngspice measured nothing:\n%s\n%s", out, deck.String())
	}
	return values, c.ProcessState.UserTime() + c.ProcessState.SystemTime()
}

// The simulator starts at the exact state and runs on its own for 20 periods:
// what was no steady state has moved by then. Tolerances: rms, mean, peak and
// capacitor voltage 0.5 %, two to three times what finite edges, the slope of
// the diode and the step of the simulator cost; the output voltage 0.1 %.
func TestAgainstSimulator(t *testing.T) {
	for _, c := range liveCases() {
		t.Run(c.name, func(t *testing.T) {
			t.Parallel()
			tk := c.tank()
			c.corner.Name = c.name
			o, err := tank.Solve(tk, c.corner)
			if err != nil || o.Status != tank.OK {
				t.Fatalf("%v %s %s", err, o.Status, o.Reason)
			}
			got, _ := simulate(t, tk, o, 20)
			for _, e := range Expected(tk, o) {
				tol := 5e-3
				if e.Name == "vout" {
					tol = 1e-3
				}
				x, ok := got[e.Name]
				if !ok {
					t.Errorf("%s was not measured", e.Name)
					continue
				}
				t.Logf("%-4s %.6g, simulator %.6g (%+.3f %%)", e.Name, e.Value, x, 100*(x/e.Value-1))
				if !(math.Abs(x-e.Value) <= tol*math.Abs(e.Value)) {
					t.Errorf("%s = %.6g, simulator says %.6g, want within %g %%", e.Meaning, e.Value, x, 100*tol)
				}
			}
		})
	}
}
