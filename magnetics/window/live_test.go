package window

import (
	"bytes"
	"flag"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"gapwright/corelib/quantity"
)

var live = flag.Bool("live", false, "compare with gmsh and getdp, when they are installed")

// The live comparison meshes a window file with gmsh and solves it with getdp,
// when both are installed: planar windows with walls of infinite permeability,
// whose post gaps are slots as deep as the half post with A = 0 on its center
// plane, as in the stored cases. It proves kinds of windows that have no stored
// case, and measures the time of the kernel against finite elements.

// elements solves f at one frequency (0: static) and returns twice the
// magnetic energy or, per winding, the loss at the stated peak currents.
type elements struct {
	energy  float64
	loss    []float64
	elapsed time.Duration
}

func haveElements(t testing.TB) {
	t.Helper()
	if !*live {
		t.Skip("takes a minute; run go test ./magnetics/window -live")
	}
	for _, tool := range []string{"gmsh", "getdp"} {
		if _, err := exec.LookPath(tool); err != nil {
			t.Skipf("%s is not installed", tool)
		}
	}
}

// mesh sizes: at conductors and slot mouths, and in between.
func (f *File) geometry(list []conductor, fine, coarse float64) string {
	var b strings.Builder
	w := &f.Window
	p := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }
	p(`SetFactory("OpenCASCADE");`)
	p("Mesh.ElementOrder = 2; Mesh.Algorithm = 6; Mesh.MshFileVersion = 2.2;")
	p("Mesh.CharacteristicLengthExtendFromBoundary = 1;")
	p("Rectangle(1) = {0, 0, 0, %g, %g};", w.Depth, w.Breadth)
	tag := 1
	for _, g := range w.Gaps {
		tag++
		p("Rectangle(%d) = {%g, %.12g, 0, %g, %g};", tag, -w.PostHalfWidth, g.Center-g.Length/2, w.PostHalfWidth, g.Length)
	}
	for _, c := range list {
		tag++
		if c.round {
			p("Disk(%d) = {%.12g, %.12g, 0, %.12g};", tag, c.x(), c.y(), (c.x1-c.x0)/2)
		} else {
			p("Rectangle(%d) = {%.12g, %.12g, 0, %.12g, %.12g};", tag, c.x0, c.y0, c.x1-c.x0, c.y1-c.y0)
		}
	}
	p("BooleanFragments{ Surface{1}; Delete; }{ Surface{2:%d}; Delete; }", tag)
	const e = 1e-6 // bounding boxes of the mesher are a little larger than the shapes
	p("air() = Surface{:};")
	p("MeshSize{ PointsOf{ Surface{:}; } } = %g;", coarse)
	for i, c := range list {
		p("c() = Surface In BoundingBox{%.12g, %.12g, -1, %.12g, %.12g, 1};", c.x0-e, c.y0-e, c.x1+e, c.y1+e)
		p("Physical Surface(%d) = {c()}; air() -= {c()};", 100+i)
		p("MeshSize{ PointsOf{ Surface{c()}; } } = %g;", fine)
	}
	p("Physical Surface(1) = {air()};")
	if len(w.Gaps) > 0 {
		p("s() = Curve In BoundingBox{%g, -1, -1, %g, 1, 1};", -w.PostHalfWidth-e, -w.PostHalfWidth+e)
		p("Physical Curve(2) = {s()};")
		for _, g := range w.Gaps {
			for _, y := range []float64{g.Center - g.Length/2, g.Center + g.Length/2} {
				p("m() = Point In BoundingBox{%g, %.12g, -1, %g, %.12g, 1}; MeshSize{ m() } = %g;", -e, y-e, e, y+e, math.Min(fine, g.Length/30))
			}
		}
	} else {
		p("s() = Point In BoundingBox{%g, %g, -1, %g, %g, 1}; Physical Point(2) = {s()};", -e, -e, e, e)
	}
	return b.String()
}

func (f *File) problem(list []conductor, hz float64) string {
	var b strings.Builder
	p := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }
	var massive, blocks []string
	for i, c := range list {
		if f.Windings[c.winding].Block == nil && hz > 0 {
			massive = append(massive, strconv.Itoa(100+i))
		} else {
			blocks = append(blocks, strconv.Itoa(100+i))
		}
	}
	p("Group { Air = Region[1]; Fix = Region[2]; Cond = Region[{%s}]; Block = Region[{%s}]; Dom = Region[{Air, Cond, Block}];", strings.Join(massive, ","), strings.Join(blocks, ","))
	for i := range f.Windings {
		var parts []string
		for j, c := range list {
			if c.winding == i {
				parts = append(parts, strconv.Itoa(100+j))
			}
		}
		p("W%d = Region[{%s}];", i, strings.Join(parts, ","))
	}
	p("} Function { nu[] = %.15g; sigma[] = %.15g;", 1/quantity.Mu0, f.Window.Conductivity)
	for i, c := range list {
		area := (c.x1 - c.x0) * (c.y1 - c.y0)
		if c.round {
			area *= math.Pi / 4
		}
		p("js[Region[%d]] = Vector[0, 0, %.15g];", 100+i, c.ampereTurns/area)
	}
	p("} Constraint { { Name Potential; Case { { Region Fix; Value 0; } } } { Name Current; Case {")
	for i, c := range list {
		if f.Windings[c.winding].Block == nil {
			p("{ Region Region[%d]; Value %.15g; }", 100+i, c.ampereTurns)
		}
	}
	p(`} } }
Jacobian { { Name Vol; Case { { Region All; Jacobian Vol; } } } }
Integration { { Name Int; Case { { Type Gauss; Case { { GeoElement Point; NumberOfPoints 1; } { GeoElement Line2; NumberOfPoints 4; } { GeoElement Line; NumberOfPoints 4; } { GeoElement Triangle; NumberOfPoints 12; } { GeoElement Triangle2; NumberOfPoints 12; } } } } } }
FunctionSpace {
  { Name A; Type Form1P;
    BasisFunction { { Name s; NameOfCoef a; Function BF_PerpendicularEdge; Support Dom; Entity NodesOf[All]; } }
    Constraint { { NameOfCoef a; EntityType NodesOf; NameOfConstraint Potential; } } }
  { Name V; Type Form1P;
    BasisFunction { { Name r; NameOfCoef u; Function BF_RegionZ; Support Cond; Entity Cond; } }
    GlobalQuantity { { Name U; Type AliasOf; NameOfCoef u; } { Name I; Type AssociatedWith; NameOfCoef u; } }
    Constraint { { NameOfCoef I; EntityType Region; NameOfConstraint Current; } } }
}
Formulation { { Name F; Type FemEquation;
  Quantity { { Name a; Type Local; NameOfSpace A; } { Name u; Type Local; NameOfSpace V; } { Name U; Type Global; NameOfSpace V[U]; } { Name I; Type Global; NameOfSpace V[I]; } }
  Equation {
    Galerkin { [ nu[] * Dof{d a}, {d a} ]; In Dom; Jacobian Vol; Integration Int; }
    Galerkin { [ -js[], {a} ]; In Block; Jacobian Vol; Integration Int; }`)
	if hz > 0 {
		p(`    Galerkin { DtDof[ sigma[] * Dof{a}, {a} ]; In Cond; Jacobian Vol; Integration Int; }
    Galerkin { [ sigma[] * Dof{u}, {a} ]; In Cond; Jacobian Vol; Integration Int; }
    Galerkin { DtDof[ sigma[] * Dof{a}, {u} ]; In Cond; Jacobian Vol; Integration Int; }
    Galerkin { [ sigma[] * Dof{u}, {u} ]; In Cond; Jacobian Vol; Integration Int; }
    GlobalTerm { [ Dof{I}, {U} ]; In Cond; }`)
	}
	system := "{ Name S; NameOfFormulation F; }"
	if hz > 0 {
		system = fmt.Sprintf("{ Name S; NameOfFormulation F; Type ComplexValue; Frequency %.15g; }", hz)
	}
	p("} } }\nResolution { { Name R; System { %s } Operation { Generate[S]; Solve[S]; SaveSolution[S]; } } }", system)
	p(`PostProcessing { { Name P; NameOfFormulation F; Quantity {
  { Name energy; Value { Integral { [ nu[] * SquNorm[{d a}] / 2 ]; In Air; Jacobian Vol; Integration Int; } Integral { [ nu[] * SquNorm[{d a}] / 2 ]; In Block; Jacobian Vol; Integration Int; } Integral { [ nu[] * SquNorm[{d a}] / 2 ]; In Cond; Jacobian Vol; Integration Int; } } }
  { Name loss; Value { Integral { [ sigma[] / 2 * SquNorm[ Dt[{a}] + {u} ] ]; In Cond; Jacobian Vol; Integration Int; } } }
} } }
PostOperation { { Name O; NameOfPostProcessing P; Operation {
  Print[ energy[Dom], OnGlobal, Format Table, File "energy.txt" ];`)
	if hz > 0 {
		for i := range f.Windings {
			if f.Windings[i].Block == nil {
				p(`  Print[ loss[W%d], OnGlobal, Format Table, File "loss%d.txt" ];`, i, i)
			}
		}
	}
	p("} } }")
	return b.String()
}

// finiteElements runs both tools in a folder of the test.
func (f *File) finiteElements(t testing.TB, hz, fine, coarse float64) elements {
	t.Helper()
	dir := t.TempDir()
	list := f.conductors()
	for name, text := range map[string]string{"w.geo": f.geometry(list, fine, coarse), "w.pro": f.problem(list, hz)} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	do := func(name string, args ...string) {
		c := exec.CommandContext(t.Context(), name, args...)
		c.Dir = dir
		var out bytes.Buffer
		c.Stdout, c.Stderr = &out, &out
		if err := c.Run(); err != nil {
			t.Fatalf("%s: %v\n%s", name, err, out.String())
		}
	}
	start := time.Now()
	do("gmsh", "-2", "w.geo", "-o", "w.msh", "-v", "1")
	do("getdp", "w.pro", "-msh", "w.msh", "-solve", "R", "-pos", "O", "-v", "1")
	e := elements{elapsed: time.Since(start)}
	last := func(name string) float64 {
		data, err := os.ReadFile(filepath.Join(dir, name))
		if err != nil {
			t.Fatal(err)
		}
		for _, word := range strings.Fields(string(data))[1:] {
			if v, err := strconv.ParseFloat(word, 64); err == nil && v != 0 {
				return v // the first value after the time; its imaginary part is 0
			}
		}
		t.Fatalf("%s holds no number: %s", name, data)
		return 0
	}
	e.energy = last("energy.txt")
	for i := range f.Windings {
		v := 0.0
		if f.Windings[i].Block == nil && hz > 0 {
			v = last(fmt.Sprintf("loss%d.txt", i))
		}
		e.loss = append(e.loss, v)
	}
	return e
}

func TestLiveLeakage(t *testing.T) {
	haveElements(t)
	const text = `
format: 1
window: {breadth: 20 mm, depth: 6.5 mm}
windings:
  - {name: P, ampere_turns: 1, block: {x: [0.8 mm, 3 mm], y: [3 mm, 17 mm]}}
  - {name: S, ampere_turns: -1, block: {x: [3.6 mm, 5.9 mm], y: [3 mm, 15 mm]}}
`
	f := read(t, text)
	e := f.finiteElements(t, 0, 0.1e-3, 0.3e-3)
	var r *Result
	took := time.Hour
	for range 50 {
		start := time.Now()
		var err error
		if r, err = Solve(f); err != nil {
			t.Fatal(err)
		}
		took = min(took, time.Since(start))
	}
	t.Logf("energy %.6g, finite elements %.6g; %v against %v, %.0f times", r.Energy, e.energy, took, e.elapsed, float64(e.elapsed)/float64(took))
	if ratio := float64(e.elapsed) / float64(took); ratio < 1000 {
		t.Errorf("finite elements take %.0f times as long, want 1000 and more", ratio)
	}
	if !(math.Abs(r.Energy/e.energy-1) < 1e-3) {
		t.Errorf("energy %.6g J/m, finite elements %.6g J/m", r.Energy, e.energy)
	}
}

func TestLiveFoils(t *testing.T) {
	haveElements(t)
	for name, c := range map[string]struct{ text string }{
		"margins": {`
format: 1
window: {breadth: 17 mm, depth: 3.3 mm}
windings:
  - {name: F, current: 1 A, foils: {thickness: 0.12 mm, count: 4, first_x: 0.5 mm, pitch: 0.2 mm, y: [1 mm, 16 mm]}}
  - {name: S, ampere_turns: -4, block: {x: [1.7 mm, 2.9 mm], y: [1 mm, 16 mm]}}
`},
		"gap": {`
format: 1
window: {breadth: 15 mm, depth: 5 mm, post_half_width: 5 mm, gaps: [{center: 7.5 mm, length: 0.6 mm}]}
windings:
  - {name: F, current: 1 A, foils: {thickness: 0.1 mm, count: 3, first_x: 1.5 mm, pitch: 0.2 mm, y: [1.5 mm, 13.5 mm]}}
  - {name: S, ampere_turns: 5, block: {x: [2.6 mm, 4 mm], y: [1.5 mm, 13.5 mm]}}
`},
		"thick": {`
format: 1
window: {breadth: 15 mm, depth: 5 mm, post_half_width: 5 mm, gaps: [{center: 7.5 mm, length: 0.6 mm}]}
windings:
  - {name: F, current: 1 A, foils: {thickness: 0.3 mm, count: 2, first_x: 2 mm, pitch: 0.4 mm, y: [1.5 mm, 13.5 mm]}}
  - {name: S, ampere_turns: 5, block: {x: [3.2 mm, 4.2 mm], y: [1.5 mm, 13.5 mm]}}
`},
	} {
		for _, hz := range []float64{50e3, 100e3, 200e3, 500e3} {
			f := read(t, c.text+fmt.Sprintf("frequencies: [%g Hz]\n", hz))
			r, err := Solve(f)
			if err != nil {
				t.Fatal(err)
			}
			e := f.finiteElements(t, hz, 0.06e-3, 0.4e-3)
			got := r.Windings[0].Loss[0]/e.loss[0] - 1
			t.Logf("%s %g kHz: loss %.6g, finite elements %.6g: %+.2f %%", name, hz/1e3, r.Windings[0].Loss[0], e.loss[0], 100*got)
			// Strips in place of a foil of finite thickness; see the stored cases.
			if !(math.Abs(got) < 0.06) {
				t.Errorf("%s at %g kHz: loss %+.2f %%", name, hz/1e3, 100*got)
			}
		}
	}
}
