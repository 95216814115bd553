package material

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
	"testing/fstest"

	"gapwright/corelib/table"
)

func triples(list [][3]float64) []Point {
	points := make([]Point, len(list))
	for i, p := range list {
		points[i] = Point{F: p[0], B: p[1], T: 25, P: p[2]}
	}
	return points
}

// Least squares solved with mpmath (testdata/coreloss/fit.json). The tolerances are
// those of the file, relative for every figure.
func TestFitCheckValues(t *testing.T) {
	type heat struct {
		LnP0 float64 `json:"ln_P0"`
		C1   float64 `json:"c1"`
		C2   float64 `json:"c2"`
		P    float64 `json:"P_at_T0"`
		CT0  float64 `json:"ct0"`
		CT1  float64 `json:"ct1"`
		CT2  float64 `json:"ct2"`
		TMin float64 `json:"T_min_C"`
		RMS  float64 `json:"rms_log"`
	}
	var file struct {
		Cases []struct {
			ID, Kind     string
			Points       [][3]float64
			LnK          float64 `json:"ln_k"`
			K            float64
			Alpha, Beta  float64
			RMS          float64 `json:"rms_log_residual"`
			MaxRatio     float64 `json:"max_ratio"`
			Tolerance    float64 `json:"tolerance_rel"`
			BetaOnly     float64 `json:"beta_only"`
			T            []float64
			TC           []float64 `json:"-"`
			P            []float64 `json:"P_kW_m3"`
			Ratio        []float64
			T0           float64 `json:"T0_C"`
			Log          heat    `json:"log_quadratic"`
			Linear       heat    `json:"polynomial_linear"`
			Poly         heat    `json:"polynomial_log"`
			CT0          float64 `json:"ct0"`
			CT1          float64 `json:"ct1"`
			CT2          float64 `json:"ct2"`
			Coefficients []float64
		}
	}
	readJSON(t, "fit.json", &file)
	var temps []struct {
		ID string
		T  []float64 `json:"T_C"`
	}
	// T_C is a list in some kinds and a number in others: fetched apart.
	var raw struct {
		Cases []map[string]any
	}
	readJSON(t, "fit.json", &raw)
	for _, c := range raw.Cases {
		e := struct {
			ID string
			T  []float64 `json:"T_C"`
		}{ID: c["id"].(string)}
		if list, ok := c["T_C"].([]any); ok {
			for _, v := range list {
				e.T = append(e.T, v.(float64))
			}
		}
		temps = append(temps, e)
	}
	seen := map[string]int{}
	for i, c := range file.Cases {
		if c.Kind == "evaluate" {
			continue // TestLossDensityAgainstPublishedSets
		}
		seen[c.Kind]++
		t.Run(c.ID, func(t *testing.T) {
			tol := c.Tolerance
			check := func(what string, got, want float64) {
				t.Helper()
				if math.Abs(got-want) > tol*math.Abs(want) {
					t.Errorf("%s = %.12g, want %.12g", what, got, want)
				}
			}
			column := func(p []float64) []Point {
				var points []Point
				for j, temp := range temps[i].T {
					points = append(points, Point{F: 100e3, B: 0.2, T: temp, P: p[j]})
				}
				return points
			}
			switch c.Kind {
			case "fit_k_alpha_beta", "fit_exact_recovery":
				fit, err := FitLoss(triples(c.Points), FitOptions{})
				if err != nil {
					t.Fatal(err)
				}
				check("k", fit.Set.K, c.K)
				check("alpha", fit.Set.Alpha, c.Alpha)
				check("beta", fit.Set.Beta, c.Beta)
				if c.Kind == "fit_exact_recovery" {
					if fit.Set.RMS > 1e-12 {
						t.Errorf("rms %g of exact points", fit.Set.RMS)
					}
					return
				}
				check("ln k", fit.LnK, c.LnK)
				check("rms", fit.Set.RMS, c.RMS)
				check("worst", 1+fit.Set.Worst, c.MaxRatio)
			case "fit_quadratic_ln_f":
				fit, err := FitLoss(triples(c.Points), FitOptions{})
				if err != nil {
					t.Fatal(err)
				}
				check("rms with (ln f)²", fit.QuadraticF, c.RMS)
			case "fit_must_not_give_alpha":
				fit, err := FitLoss(triples(c.Points), FitOptions{})
				if err != nil {
					t.Fatal(err)
				}
				if fit.AlphaKnown || fit.Set.Alpha != 0 || !strings.Contains(strings.Join(fit.Warnings, "\n"), "alpha cannot be found") {
					t.Errorf("alpha %g from one frequency; warnings %q", fit.Set.Alpha, fit.Warnings)
				}
				check("beta", fit.Set.Beta, c.BetaOnly)
			case "temperature_fit":
				points := column(c.P)
				fit, err := FitLoss(points, FitOptions{Beta: 2.5, TRef: c.T0, Heat: HeatLogQuadratic})
				if err != nil {
					t.Fatal(err)
				}
				at0 := fit.Value(Point{F: 100e3, B: 0.2, T: c.T0})
				check("ln P(T0)", math.Log(at0), c.Log.LnP0)
				check("c1", fit.Set.A[1], c.Log.C1)
				check("c2", fit.Set.A[2], c.Log.C2)
				low, _ := fit.Set.LeastLossTemperature()
				check("minimum", low, c.Log.TMin)
				if math.Abs(fit.Set.RMS-c.Log.RMS) > 1e-9 {
					t.Errorf("rms %g, want %g", fit.Set.RMS, c.Log.RMS)
				}
				// The linear start of the polynomial form.
				var d, y []float64
				for _, p := range points {
					d, y = append(d, p.T-c.T0), append(y, p.P)
				}
				a0, a, err := leastSquares([][]float64{d, products(d, d)}, y)
				if err != nil {
					t.Fatal(err)
				}
				check("linear P(T0)", a0, c.Linear.P)
				check("linear ct1", 2*a[1]/a0*c.T0-a[0]/a0, c.Linear.CT1)
				check("linear ct2", a[1]/a0, c.Linear.CT2)
				fit, err = FitLoss(points, FitOptions{Beta: 2.5, TRef: c.T0, Heat: HeatPolynomial})
				if err != nil {
					t.Fatal(err)
				}
				check("P(T0)", fit.Value(Point{F: 100e3, B: 0.2, T: c.T0}), c.Poly.P)
				check("ct0", fit.Set.A[0], c.Poly.CT0)
				check("ct1", fit.Set.A[1], c.Poly.CT1)
				check("ct2", fit.Set.A[2], c.Poly.CT2)
				low, _ = fit.Set.LeastLossTemperature()
				check("minimum", low, c.Poly.TMin)
				if math.Abs(fit.Set.RMS-c.Poly.RMS) > 1e-9 {
					t.Errorf("rms %g, want %g", fit.Set.RMS, c.Poly.RMS)
				}
			case "temperature_exact":
				fit, err := FitLoss(column(c.Ratio), FitOptions{Beta: 2.5, TRef: 100, Heat: HeatPolynomial})
				if err != nil {
					t.Fatal(err)
				}
				check("ct0", fit.Set.A[0], c.CT0)
				check("ct1", fit.Set.A[1], c.CT1)
				check("ct2", fit.Set.A[2], c.CT2)
			default:
				t.Errorf("unknown kind %q", c.Kind)
			}
		})
	}
	if seen["fit_k_alpha_beta"] < 4 || seen["temperature_fit"] < 3 || seen["fit_must_not_give_alpha"] < 1 {
		t.Errorf("kinds %v", seen)
	}
}

// The embedded sets E1..E3 are what FitLoss makes of the measured table.
func TestEmbeddedSetsAreTheFit(t *testing.T) {
	var tables map[string]lossTable
	readJSON(t, "loss_points.json", &tables)
	bands, err := Split(triples(tables["L1"].Points), []float64{100e3, 200e3})
	if err != nil {
		t.Fatal(err)
	}
	for i, s := range pw3(t).Loss {
		fit, err := FitLoss(bands[i], FitOptions{})
		if err != nil {
			t.Fatal(err)
		}
		// The table's figures are rounded to five digits (k of E3 to four).
		for _, c := range [][2]float64{{s.K, fit.Set.K}, {s.Alpha, fit.Set.Alpha}, {s.Beta, fit.Set.Beta}} {
			if math.Abs(c[0]/c[1]-1) > 6e-5 {
				t.Errorf("%s: %g in the table, %g fitted", s.ID, c[0], c[1])
			}
		}
		if s.Points != len(bands[i]) || math.Abs(s.RMS-fit.Set.RMS) > 0.0006 || math.Abs(s.Worst-fit.Set.Worst) > 0.0006 {
			t.Errorf("%s: %d points, rms %g, worst %g; fitted %d, %g, %g", s.ID, s.Points, s.RMS, s.Worst, len(bands[i]), fit.Set.RMS, fit.Set.Worst)
		}
		if s.FMin != fit.Set.FMin || s.FMax != fit.Set.FMax || s.BMin != fit.Set.BMin || s.BMax != fit.Set.BMax {
			t.Errorf("%s: ranges differ from the points'", s.ID)
		}
	}
}

// grid makes exact points of a set, with an optional relative scatter.
func grid(s LossSet, fs, bs, ts []float64, scatter float64) []Point {
	m, err := New("exact", s)
	if err != nil {
		panic(err)
	}
	r := rand.New(rand.NewPCG(1, 2))
	var points []Point
	for _, f := range fs {
		for _, b := range bs {
			for _, temp := range ts {
				p, err := m.LossDensity(f, b, temp)
				if err != nil {
					panic(err)
				}
				points = append(points, Point{F: f, B: b, T: temp, P: p.Density * math.Exp(scatter*r.NormFloat64())})
			}
		}
	}
	return points
}

func TestJointFitFindsEverything(t *testing.T) {
	base := LossSet{ID: "X", K: 0.9, Alpha: 1.52, Beta: 2.61, FMin: 50e3, FMax: 400e3, TRef: 100}
	for _, form := range []HeatForm{HeatLogQuadratic, HeatPolynomial} {
		s := base
		s.Heat = form
		s.A = [3]float64{0, 0.003, 1.1e-4}
		if form == HeatPolynomial {
			s.A = [3]float64{2.45, 0.031, 0.000165}
		}
		for _, scatter := range []float64{0, 0.02} {
			points := grid(s, []float64{50e3, 100e3, 200e3, 400e3}, []float64{0.03, 0.06, 0.12}, []float64{25, 60, 80, 100, 120}, scatter)
			fit, err := FitLoss(points, FitOptions{Heat: form})
			if err != nil {
				t.Fatal(err)
			}
			// Without scatter the set comes back to rounding (Gauss-Newton: 1e-9); with 2 % over 60
			// points the exponents are good to 2 % / sqrt(60) over the spread of ln f (0.77): 0.0034;
			// six of those sigmas.
			tol := 1e-9
			if scatter > 0 {
				tol = 0.02
			}
			if math.Abs(fit.Set.Alpha-s.Alpha) > tol || math.Abs(fit.Set.Beta-s.Beta) > tol {
				t.Errorf("%s, scatter %g: alpha %g, beta %g", form, scatter, fit.Set.Alpha, fit.Set.Beta)
			}
			for i := range s.A {
				if math.Abs(fit.Set.A[i]-s.A[i]) > max(tol, 1e-9)*10*math.Abs(s.A[i])+1e-12 {
					t.Errorf("%s, scatter %g: a%d = %g, want %g", form, scatter, i, fit.Set.A[i], s.A[i])
				}
			}
			if scatter > 0 && math.Abs(fit.Set.RMS/scatter-1) > 0.3 {
				t.Errorf("rms %g of a scatter of %g", fit.Set.RMS, scatter)
			}
			if scatter == 0 && len(fit.Warnings) != 0 {
				t.Errorf("warnings %q", fit.Warnings)
			}
			if fit.Set.TRef != 100 || fit.Set.TMin != 25 || fit.Set.TMax != 120 {
				t.Errorf("temperatures %g, %g to %g", fit.Set.TRef, fit.Set.TMin, fit.Set.TMax)
			}
		}
	}
}

func TestFitRefusesAndWarns(t *testing.T) {
	s := LossSet{ID: "X", K: 0.9, Alpha: 1.5, Beta: 2.6, FMin: 50e3, FMax: 400e3, TRef: 25, Heat: HeatNone}
	fs, bs := []float64{50e3, 100e3, 200e3}, []float64{0.05, 0.1, 0.2}
	full := grid(s, fs, bs, []float64{25}, 0.01)
	line := []Point{full[2], full[4], full[6]} // f doubles where B halves
	four := slices.Clone(full[:4])             // two frequencies, three flux densities, three temperatures
	four[1].T, four[2].T = 60, 100
	for _, c := range []struct {
		name   string
		points []Point
		o      FitOptions
		want   error
	}{
		{"two points", full[:2], FitOptions{}, ErrTooFewPoints},
		{"one flux density", grid(s, fs, bs[:1], []float64{25}, 0), FitOptions{}, ErrTooFewPoints},
		{"one line", line, FitOptions{}, ErrCollinear},
		{"four points for five unknowns", four, FitOptions{}, ErrTooFewPoints},
		{"NaN", append([]Point{{F: math.NaN(), B: 0.1, P: 1}}, full...), FitOptions{}, ErrOperatingPoint},
		{"some without temperature", append([]Point{{F: 1e5, B: 0.1, T: math.NaN(), P: 1}}, full...), FitOptions{}, ErrOperatingPoint},
	} {
		if f, err := FitLoss(c.points, c.o); !errors.Is(err, c.want) {
			t.Errorf("%s: %+v, %v", c.name, f.Set, err)
		}
	}
	// With beta held the line is enough.
	f, err := FitLoss(line, FitOptions{Beta: 2.6})
	if err != nil || math.Abs(f.Set.Alpha-1.5) > 0.05 || f.Set.Beta != 2.6 {
		t.Errorf("beta held: %+v, %v", f.Set, err)
	}
	if f, err := FitLoss(grid(s, fs, bs[:1], []float64{25}, 0), FitOptions{Beta: 2.6}); err != nil || math.Abs(f.Set.K/0.9-1) > 1e-9 {
		t.Errorf("one flux density, beta held: %+v, %v", f.Set, err)
	}
	// A temperature that changes with the frequency alone.
	tied := grid(s, fs, bs, []float64{25}, 0)
	for i := range tied {
		tied[i].T = map[float64]float64{50e3: 25, 100e3: 60, 200e3: 95}[tied[i].F]
	}
	if f, err := FitLoss(tied, FitOptions{}); !errors.Is(err, ErrCollinear) {
		t.Errorf("temperature tied to frequency: %+v, %v", f.Set, err)
	}
	warned := func(points []Point, o FitOptions, want string) {
		t.Helper()
		f, err := FitLoss(points, o)
		if err != nil || !strings.Contains(strings.Join(f.Warnings, "\n"), want) {
			t.Errorf("want %q: %v %q", want, err, f.Warnings)
		}
	}
	var tables map[string]lossTable
	readJSON(t, "loss_points.json", &tables)
	warned(triples(tables["L2"].Points), FitOptions{}, "correlation -0.87")
	warned(triples(tables["L1"].Points), FitOptions{}, "rms residual 9.7 %")
	warned(full[:6], FitOptions{}, "knows no other temperature")
	warned([]Point{full[0], full[1], full[4]}, FitOptions{}, "3 points for 3 unknowns")
	warned(grid(s, fs, bs, []float64{25, 100}, 0.01), FitOptions{}, "no curvature")
	warned(grid(s, fs, bs, []float64{25, 100}, 0.01), FitOptions{Heat: HeatNone}, "without a temperature term")
	steep := s
	steep.Beta, steep.K = 3.6, 9
	warned(grid(steep, fs, bs, []float64{25}, 0.01), FitOptions{}, "is outside 2 to 3.3")
	shallow := s
	shallow.Alpha, shallow.K = 0.9, 900
	warned(grid(shallow, fs, bs, []float64{25}, 0.01), FitOptions{}, "is outside 1 to 3")
	unknown := grid(s, fs, bs, []float64{25}, 0)
	for i := range unknown {
		unknown[i].T = math.NaN()
	}
	warned(unknown, FitOptions{}, "25 degC is assumed")
	// A hump in temperature cannot be a polynomial that opens upwards.
	hump := s
	hump.Heat, hump.A = HeatLogQuadratic, [3]float64{0, 0, -1e-4}
	warned(grid(hump, fs, bs, []float64{25, 60, 100}, 0), FitOptions{}, "no loss minimum")
	if _, err := FitLoss(grid(hump, fs, bs, []float64{25, 60, 100}, 0), FitOptions{Heat: HeatPolynomial}); !errors.Is(err, ErrPolynomial) {
		t.Errorf("hump as polynomial: %v", err)
	}
}

func TestSuggestBorder(t *testing.T) {
	var tables map[string]lossTable
	readJSON(t, "loss_points.json", &tables)
	points := triples(tables["L1"].Points)
	border, rms, ok := SuggestBorder(points, FitOptions{})
	if !ok || border < 150e3 || border > 300e3 || rms > 0.05 {
		t.Errorf("border %g Hz, rms %g, %v; want one between 150 and 300 kHz below 5 %%", border, rms, ok)
	}
	if _, _, ok := SuggestBorder(points[:3], FitOptions{}); ok {
		t.Error("three points were split")
	}
	if _, err := Split(points, []float64{200e3, 100e3}); err == nil {
		t.Error("descending borders accepted")
	}
	if _, err := Split(points, []float64{10e3}); !errors.Is(err, ErrTooFewPoints) {
		t.Errorf("empty band: %v", err)
	}
}

// A fitted row read back as a user's table gives the fitted losses.
func TestLossRowRoundTrip(t *testing.T) {
	s := LossSet{ID: "X", K: 3.456789e-7, Alpha: 2.345678, Beta: 2.61, FMin: 50e3, FMax: 400e3, TRef: 100, Heat: HeatPolynomial, A: [3]float64{2.45, 0.031, 0.000165}}
	points := grid(s, []float64{300e3, 600e3, 900e3}, []float64{0.03, 0.06}, []float64{25, 60, 100}, 0.03)
	for _, form := range []HeatForm{HeatLogQuadratic, HeatPolynomial, HeatNone} {
		fit, err := FitLoss(points, FitOptions{Heat: form})
		if err != nil {
			t.Fatal(err)
		}
		fit.Set.ID, fit.Set.Source, fit.Set.Confidence = "M1", `bench, "second" try`, "measured"
		own, err := Embedded().With(fstest.MapFS{
			FerritesFile: {Data: []byte(ownFerrite)},
			LossFile:     {Data: []byte(LossHeading() + "\n" + LossRow("MY1", fit.Set) + "\n")},
		}, "f")
		if err != nil {
			t.Fatal(err)
		}
		m, _ := own.Find("MY1")
		if m.Loss[0].Source != fit.Set.Source || m.Loss[0].Points != len(points) || m.Loss[0].Heat != form {
			t.Errorf("%+v", m.Loss[0])
		}
		for _, p := range points {
			got, err := m.LossDensity(p.F, p.B, p.T)
			// Six decimals of alpha times ln f = 14 are 7e-6, the other digits less.
			if want := fit.Value(p); err != nil || math.Abs(got.Density/want-1) > 2e-5 {
				t.Errorf("%s: %g after the round trip, %g fitted (%v)", form, got.Density, want, err)
			}
			if got.Outside.Any() {
				t.Errorf("%s: %v lies outside the range of its own fit: %v", form, p, got.Outside)
			}
		}
	}
}

func TestReadPoints(t *testing.T) {
	points, err := ReadPoints("p.csv", strings.NewReader("\ufeff# bench 3\r\nB [mT],f [kHz],P [mW/cm3],T [degC]\r\n100,50,57.4,25\r\n200,1e2,640,25\r\n"))
	if err != nil || len(points) != 2 || points[1] != (Point{F: 100e3, B: 0.2, T: 25, P: 640e3, Line: 4}) {
		t.Errorf("%v, %v", points, err)
	}
	for _, u := range []string{"kW/m3", "mW/cm3", "W/m3"} {
		scale := map[string]float64{"kW/m3": 1e3, "mW/cm3": 1e3, "W/m3": 1}[u]
		p, err := ReadPoints("p.csv", strings.NewReader(fmt.Sprintf("f [Hz],B [T],P [%s]\n50000,0.1,%g\n", u, 57400/scale)))
		if err != nil || p[0].P != 57400 || !math.IsNaN(p[0].T) {
			t.Errorf("%s: %v, %v", u, p, err)
		}
	}
	head := "f [kHz],B [mT],T [degC],P [kW/m3]\n"
	for _, c := range []struct{ name, data, want string }{
		{"no unit", "f,B [mT],P [kW/m3]\n", `p.csv:1:1: column "f" needs a unit; write "f [kHz]"`},
		{"wrong unit", "f [kHz],B [mT],P [kW]\n", `p.csv:1:16: column "P" is in "kW"; write one of kW/m3, mW/cm3, W/m3`},
		{"no flux", "f [kHz],P [kW/m3]\n50,3\n", `column "B" is missing`},
		{"negative", head + "50,-100,25,57\n", "p.csv:2:4: B: -100 is not above zero"},
		{"text", head + "50,100,25,about 57\n", `p.csv:2:11: P: "about 57" is not a decimal number`},
		{"comma", head + "50,100,25,\"57,4\"\n", "write 57.4"},
		{"flux unit", "f [kHz],B [T],P [kW/m3]\n50,100,57\n", "p.csv:2:4: B: 100 T is above the saturation"},
		{"frequency unit", "f [Hz],B [mT],P [kW/m3]\n50,100,57\n", "are the units in the heading right?"},
		{"half the temperatures", head + "50,100,25,57\n50,200,,288\n", "p.csv:3:8: T is given in some rows and empty in others"},
		{"hot", head + "50,100,2500,57\n", "p.csv:2:8: T: 2500 degC"},
		{"empty", head, "no points"},
		{"nothing", "", "no header line"},
	} {
		_, err := ReadPoints("p.csv", strings.NewReader(c.data))
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", c.name, err, c.want)
		}
		if _, ok := errors.AsType[*table.Error](err); !ok {
			t.Errorf("%s: no position in %v", c.name, err)
		}
	}
}

func FuzzReadPoints(f *testing.F) {
	f.Add("f [kHz],B [mT],T [degC],P [kW/m3]\n50,100,25,57\n100,100,25,126\n50,200,25,288\n100,200,25,640\n")
	f.Fuzz(func(t *testing.T, data string) {
		points, err := ReadPoints("p.csv", strings.NewReader(data))
		if err != nil {
			return
		}
		for _, form := range []HeatForm{HeatNone, HeatLogQuadratic, HeatPolynomial} {
			fit, err := FitLoss(points, FitOptions{Heat: form})
			if err != nil {
				continue
			}
			if math.IsNaN(fit.Set.RMS) || math.IsNaN(fit.Set.Beta) || math.IsNaN(fit.LnK) {
				t.Errorf("%+v", fit)
			}
		}
	})
}

func BenchmarkFitLoss(b *testing.B) {
	s := LossSet{ID: "X", K: 0.9, Alpha: 1.52, Beta: 2.61, FMin: 50e3, FMax: 400e3, TRef: 100, Heat: HeatPolynomial, A: [3]float64{2.45, 0.031, 0.000165}}
	points := grid(s, []float64{50e3, 100e3, 200e3, 400e3}, []float64{0.03, 0.06, 0.12}, []float64{25, 60, 80, 100, 120}, 0.02)
	for _, form := range []HeatForm{HeatNone, HeatLogQuadratic, HeatPolynomial} {
		b.Run("heat="+string(form), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if _, err := FitLoss(points, FitOptions{Heat: form}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
