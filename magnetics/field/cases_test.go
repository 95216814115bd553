package field

import (
	"encoding/json"
	"math"
	"os"
	"testing"
)

// feCase is one finite-element case of testdata/field/cases.json.
type feCase struct {
	ID, Kind string
	Geometry struct {
		WindowBreadth   float64      `json:"window_breadth"`
		WindowDepth     float64      `json:"window_depth"`
		PostRadius      float64      `json:"post_radius"`
		PostHalfWidth   float64      `json:"post_half_width"`
		PostSize        float64      `json:"post_radius_or_half_width"`
		Gaps            [][2]float64 `json:"gaps"`
		GapInOuterLeg   bool         `json:"gap_in_outer_leg"`
		WindingX        [2]float64   `json:"winding_x"`
		WindingY        [2]float64   `json:"winding_y"`
		Grid            [2]int       `json:"grid"`
		BlockHalfWidth  float64      `json:"block_half_width"`
		OuterLegWidth   float64      `json:"outer_leg_width"`
		YokeThickness   float64      `json:"yoke_thickness"`
		EndPlate        float64      `json:"end_plate_thickness"`
		ShellOuter      float64      `json:"outer_shell_outer_radius"`
		HalfWindowBread float64      `json:"half_window_breadth"`
	} `json:"geometry_m"`
	Windings []struct {
		Name        string
		X, Y        [2]float64
		AmpereTurns float64 `json:"ampere_turns"`
	}
	Results struct {
		Energy       float64            `json:"energy_J_per_m_per_At2"`
		EnergyRound  float64            `json:"energy_J_per_At2"`
		MeanH2       map[string]float64 `json:"mean_H2_per_m2_per_At2"`
		L            float64            `json:"inductance_per_turn2_nH"`
		LNoGap       float64            `json:"inductance_per_turn2_no_gap_nH"`
		LPlanar      float64            `json:"inductance_per_turn2_nH_per_m"`
		LPlanarNoGap float64            `json:"inductance_per_turn2_no_gap_nH_per_m"`
		MuInfinite   eResult            `json:"mu_infinite"`
		Mu2200       eResult            `json:"mu_r_2200"`
	}
}

type eResult struct {
	Grid        [][]float64 `json:"mean_H2_per_m2_per_At2"`
	WindingMean float64     `json:"winding_mean"`
	L           float64     `json:"inductance_per_turn2_nH_per_m_full_section"`
}

func loadCases(t testing.TB) []feCase {
	t.Helper()
	raw, err := os.ReadFile("../../testdata/field/cases.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Cases []feCase }
	if err := json.Unmarshal(raw, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) != 36 {
		t.Fatalf("%d finite-element cases, want 36", len(file.Cases))
	}
	return file.Cases
}

// worst collects the largest error of each kind of quantity.
type worst map[string]float64

func (w worst) check(t *testing.T, id, what string, got, want, tolerance float64) {
	t.Helper()
	e := got/want - 1
	if !(math.Abs(e) <= tolerance) {
		t.Errorf("%s: %s = %.6g, want %.6g: %+.3f %%, allowed %.2f %%", id, what, got, want, 100*e, 100*tolerance)
	}
	if math.Abs(e) > math.Abs(w[what]) {
		w[what] = e
	}
}

func (w worst) log(t *testing.T) {
	for what, e := range w {
		t.Logf("worst %s %+.3f %%", what, 100*e)
	}
}

// solve makes one unit solution of all windings of a case.
func (c *feCase) problem() Problem {
	g := c.Geometry
	p := Problem{Breadth: g.WindowBreadth, Depth: g.WindowDepth, PostRadius: g.PostRadius, Units: 1}
	for _, w := range c.Windings {
		p.Sources = append(p.Sources, Source{Rect: Rect{w.X[0], w.X[1], w.Y[0], w.Y[1]}, AmpereTurns: w.AmpereTurns})
	}
	return p
}

func meanOf(s *Solver, r Rect) float64 {
	var xx, yy [1]float64
	s.Mean(r, 1, xx[:], yy[:])
	return xx[0] + yy[0]
}

// Tolerances: the series has 0.01 % energy and 0.1 % mean square against the
// finite elements, themselves good to 0.07 %.
func TestLeakageCases(t *testing.T) {
	w := worst{}
	for _, c := range loadCases(t) {
		if c.Kind[0] != 'A' {
			continue
		}
		p := c.problem()
		var s Solver
		if err := s.Solve(&p); err != nil {
			t.Fatalf("%s: %v", c.ID, err)
		}
		want, kind := c.Results.Energy, "planar "
		if c.Kind == "A7" {
			want, kind = c.Results.EnergyRound, "round "
		}
		w.check(t, c.ID, kind+"energy", s.Energy(0, 0)/2, want, 0.002)
		for i, wi := range c.Windings {
			w.check(t, c.ID, kind+"mean H2", meanOf(&s, p.Sources[i].Rect), c.Results.MeanH2[wi.Name], 0.004)
		}
	}
	w.log(t)
}

func TestGappedInductanceCases(t *testing.T) {
	w := worst{}
	for _, c := range loadCases(t) {
		if c.Kind[0] != 'C' {
			continue
		}
		g := c.Geometry
		p := Problem{Breadth: g.WindowBreadth, Depth: g.WindowDepth, Units: 1}
		want, factor, tolerance := c.Results.L, 1.0, 0.01
		if c.Kind == "C_planar" {
			p.PostHalfWidth = g.PostSize
			p.CorePermeance = c.Results.LPlanarNoGap * 1e-9
			want, factor, tolerance = c.Results.LPlanar, 2, 0.005
		} else {
			p.PostRadius = g.PostSize
			p.CorePermeance = c.Results.LNoGap * 1e-9
		}
		for _, gap := range g.Gaps {
			p.Gaps = append(p.Gaps, Gap{(gap[0] + gap[1]) / 2, gap[1] - gap[0]})
		}
		if g.GapInOuterLeg {
			p.OuterGaps = p.Gaps
			tolerance = 0.08
		}
		p.Sources = []Source{{Rect: Rect{g.WindingX[0] - g.PostSize, g.WindingX[1] - g.PostSize, g.WindingY[0], g.WindingY[1]}, AmpereTurns: 1}}
		var s Solver
		if err := s.Solve(&p); err != nil {
			t.Fatalf("%s: %v", c.ID, err)
		}
		w.check(t, c.ID, c.Kind, factor*s.Inductance(0, 0)*1e9, want, tolerance)
	}
	w.log(t)
}

func TestGappedFieldCases(t *testing.T) {
	w := worst{}
	for _, c := range loadCases(t) {
		if c.Kind[0] != 'E' {
			continue
		}
		g := c.Geometry
		for name, r := range map[string]eResult{"mu inf": c.Results.MuInfinite, "mu 2200": c.Results.Mu2200} {
			p := Problem{Breadth: g.WindowBreadth, Depth: g.WindowDepth, PostHalfWidth: g.PostHalfWidth, Units: 1}
			for _, gap := range g.Gaps {
				p.Gaps = append(p.Gaps, Gap{(gap[0] + gap[1]) / 2, gap[1] - gap[0]})
			}
			x, y := g.WindingX, g.WindingY
			p.Sources = []Source{{Rect: Rect{x[0], x[1], y[0], y[1]}, AmpereTurns: 1}}
			mean := 0.01
			if name != "mu inf" {
				p.CorePermeance = 1e-9 / (1/r.L - 1/c.Results.MuInfinite.L)
				mean = 0.03
			}
			var s Solver
			if err := s.Solve(&p); err != nil {
				t.Fatalf("%s: %v", c.ID, err)
			}
			w.check(t, c.ID, name+" mean", meanOf(&s, p.Sources[0].Rect), r.WindingMean, mean)
			w.check(t, c.ID, name+" inductance", 2*s.Inductance(0, 0)*1e9, r.L, 0.005)
			if name != "mu inf" {
				continue
			}
			for i := range g.Grid[0] {
				for j := range g.Grid[1] {
					dx, dy := (x[1]-x[0])/float64(g.Grid[0]), (y[1]-y[0])/float64(g.Grid[1])
					block := Rect{x[0] + float64(i)*dx, x[0] + float64(i+1)*dx, y[0] + float64(j)*dy, y[0] + float64(j+1)*dy}
					w.check(t, c.ID, name+" block", meanOf(&s, block), r.Grid[i][j], 0.03)
				}
			}
		}
	}
	w.log(t)
}

// The plane is exact (B1, B2). A finite block is another thing than the model:
// it is 11 % off in mean square for sections side by side.
func TestHeadCases(t *testing.T) {
	w := worst{}
	for _, c := range loadCases(t) {
		if c.Kind[0] != 'B' {
			continue
		}
		p := c.problem()
		var s HeadSolver
		if err := s.Solve(p.Breadth, 1, p.Sources); err != nil {
			t.Fatalf("%s: %v", c.ID, err)
		}
		kind, tolerance := "plane ", 0.002
		switch c.Kind {
		case "B3":
			kind, tolerance = "block concentric ", 0.01
		case "B4":
			kind, tolerance = "block side by side ", 0.12
		}
		w.check(t, c.ID, kind+"energy", s.Energy(0, 0)/2, c.Results.Energy, tolerance)
		for i, wi := range c.Windings {
			var xx, yy [1]float64
			s.Mean(p.Sources[i].Rect, 1, xx[:], yy[:])
			w.check(t, c.ID, kind+"mean H2", xx[0]+yy[0], c.Results.MeanH2[wi.Name], tolerance)
		}
	}
	w.log(t)
}
