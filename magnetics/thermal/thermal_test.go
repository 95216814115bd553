package thermal

import (
	"encoding/json"
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

func constant(p float64) func(float64) float64 { return func(float64) float64 { return p } }

func solve(t testing.TB, b Body, s Surroundings, w, c func(float64) float64) Result {
	t.Helper()
	r, err := Solve(b, s, w, c)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// box has the five free faces of the check values: four vertical sides and the top.
func box(a, b, height, emissivity float64) []Face {
	return []Face{{"long sides", 2 * a * height, height, Vertical, emissivity}, {"short sides", 2 * b * height, height, Vertical, emissivity},
		{"top", a * b, 4 * a * b / (2 * (a + b)), Up, emissivity}}
}

// Rules, correlations and a box in closed form, computed with mpmath; the head of
// testdata/thermal/checks.json names the sources.
func TestCheckValues(t *testing.T) {
	data, err := os.ReadFile(filepath.Join("..", "..", "testdata", "thermal", "checks.json"))
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Tolerance float64 `json:"tolerance_rel"`
		Cases     []struct {
			ID, Kind   string
			Value      float64
			V          float64 `json:"V_cm3"`
			By006      float64 `json:"rth_006_over_sqrt"`
			By53       float64 `json:"rth_53_V054"`
			Rule006    float64 `json:"rule_006"`
			Rule53     float64 `json:"rule_53_V054"`
			P          float64 `json:"P_W"`
			A          float64 `json:"A_cm2"`
			DT         float64 `json:"dT_K"`
			Psi        float64 `json:"psi_W_per_cm2"`
			L          float64 `json:"L_m"`
			Film       float64 `json:"T_film_K"`
			Nu         float64 `json:"nu"`
			K          float64 `json:"k"`
			Alpha      float64 `json:"alpha"`
			Pr         float64 `json:"Pr"`
			Ra         float64 `json:"Ra"`
			NuLaminar  float64 `json:"Nu_laminar"`
			NuAll      float64 `json:"Nu_all"`
			HLaminar   float64 `json:"h_laminar"`
			Emissivity float64
			Ts         float64 `json:"Ts_C"`
			Ta         float64 `json:"Ta_C"`
			Flux       float64 `json:"flux_W_m2"`
			Width      float64 `json:"a_m"`
			Depth      float64 `json:"b_m"`
			Height     float64 `json:"height_m"`
			Rth        float64 `json:"rth_K_per_W"`
		}
	}
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	seen := map[string]int{}
	for _, c := range file.Cases {
		t.Run(c.ID, func(t *testing.T) {
			seen[c.Kind]++
			check := func(what string, got, want float64) {
				t.Helper()
				if math.Abs(got/want-1) > file.Tolerance || want == 0 {
					t.Errorf("%s = %.12g, want %.12g", what, got, want)
				}
			}
			switch c.Kind {
			case "rth_from_core_volume":
				check("0.06/sqrt(V)", ByCoreVolume(c.V*1e-6), c.By006)
				check("53 V^-0.54", ByEffectiveVolume(c.V*1e-6), c.By53)
			case "rth_measured":
				check("0.06/sqrt(V)", ByCoreVolume(c.V*1e-6), c.Rule006)
				check("53 V^-0.54", ByEffectiveVolume(c.V*1e-6), c.Rule53)
			case "dT_from_surface_loading":
				check("rise", RiseBySurface(c.P, c.A*1e-4), c.Value)
			case "surface_loading_for_dT":
				check("loading", LoadingForRise(c.DT)*1e-4, c.Psi)
			case "h_simplified_vertical":
				check("h", Natural(Vertical, c.DT, c.L, 0), c.Value)
			case "h_simplified_horizontal_up":
				check("h", Natural(Up, c.DT, c.L, 0), c.Value)
			case "h_simplified_horizontal_down":
				check("h", Natural(Down, -c.DT, c.L, 0), c.Value)
			case "churchill_chu_vertical_plate":
				air := AirAt(c.Film-zeroCelsius, 0)
				check("viscosity", air.Viscosity, c.Nu)
				check("conductivity", air.Conductivity, c.K)
				check("diffusivity", air.Diffusivity, c.Alpha)
				check("Prandtl", air.Prandtl, c.Pr)
				ra := Rayleigh(c.DT, c.L, c.Film-zeroCelsius, air)
				check("Rayleigh", ra, c.Ra)
				laminar, all := ChurchillChu(ra, air.Prandtl)
				check("laminar Nusselt", laminar, c.NuLaminar)
				check("Nusselt", all, c.NuAll)
				check("h", laminar*air.Conductivity/c.L, c.HLaminar)
				// The simplified relation that Solve uses against the full one.
				if simple := Natural(Vertical, c.DT, c.L, 0); math.Abs(simple/c.HLaminar-1) > 0.06 {
					t.Errorf("simplified h = %g, full %g: more than 6 %% apart", simple, c.HLaminar)
				}
			case "radiation":
				check("flux", Radiation(c.Emissivity, c.Ts, c.Ta), c.Flux)
			case "box_surface_temperature":
				// As a body: the winding sits on the same box and makes no heat.
				b := Body{Core: box(c.Width, c.Depth, c.Height, c.Emissivity), Between: 1}
				r := solve(t, b, Surroundings{Ambient: c.Ta}, constant(0), constant(c.P))
				check("rise", r.CoreTemperature-c.Ta, c.DT)
				check("winding rise", r.WindingTemperature-c.Ta, c.DT)
				check("resistance", (r.CoreTemperature-c.Ta)/c.P, c.Rth)
			default:
				t.Errorf("unknown kind %q", c.Kind)
			}
		})
	}
	if len(file.Cases) < 26 || seen["box_surface_temperature"] < 3 {
		t.Errorf("%d cases, kinds %v", len(file.Cases), seen)
	}
}

// etd44 is the outline of an ETD 44/22/15 in the middle of its dimensions, wound
// full on a 1.2 mm former.
func etd44(up Direction) Outline {
	return Outline{Across: 44e-3, Along: 44.6e-3, Depth: 14.9e-3, Up: up, Round: true, PostAcross: 14.8e-3, PostDepth: 14.8e-3,
		Window: 33.3e-3, Breadth: 33e-3, Openings: 2, Clearance: 0.2e-3, Wall: 1.2e-3, WindingHeight: 6.8e-3}
}

// A transformer on an ETD 44 core was measured at 34.4 K with 3.38 W (10.2 K/W;
// Encyclopedia Magnetica, "Thermal resistance"). How its loss was shared and how it
// stood is not told, so both are varied; nothing in the model was fitted to it. The
// mean of winding and core comes out at 10.2 to 11.4 K/W, 1 to 12 % above the
// measurement; the surface rule says 35.4 K.
func TestMeasuredETD44(t *testing.T) {
	const power, rise = 3.38, 34.4
	for _, up := range []Direction{Along, Depth, Across} {
		b, err := NewBody(etd44(up))
		if err != nil {
			t.Fatal(err)
		}
		for _, share := range []float64{0.3, 0.5, 0.7} {
			r := solve(t, b, Surroundings{Ambient: 25}, constant(power*share), constant(power*(1-share)))
			mean := (r.WindingTemperature+r.CoreTemperature)/2 - 25
			t.Logf("up %s, %2.0f %% in the winding: winding %.1f K, core %.1f K, mean %.2f K/W (%+.0f %% over the measurement)",
				[...]string{"along", "across", "depth"}[up], 100*share, r.WindingTemperature-25, r.CoreTemperature-25, mean/power, 100*(mean/rise-1))
			// The stated accuracy.
			if math.Abs(mean/rise-1) > Accuracy {
				t.Errorf("mean rise %.1f K, measured %g K: %+.0f %%", mean, rise, 100*(mean/rise-1))
			}
		}
		// 450 psi^0.826 on the same surface is the usual hand check.
		t.Logf("surface %.1f cm², rule %.1f K", b.Surface()*1e4, RiseBySurface(power, b.Surface()))
		if hand := RiseBySurface(power, b.Surface()); math.Abs(hand/rise-1) > 0.4 {
			t.Errorf("surface rule %g K, measured %g K", hand, rise)
		}
	}
}

func TestFacesCoverTheOutline(t *testing.T) {
	// A rectangular part by hand: core 40 x 42 x 15 mm, winding 28 x 27 mm around a
	// 12 x 11 mm post, 30 mm long, 6 mm out of the core on either side.
	o := Outline{Across: 40e-3, Along: 42e-3, Depth: 15e-3, Up: Along, PostAcross: 12e-3, PostDepth: 11e-3, Window: 29e-3, Breadth: 30e-3,
		Openings: 2, Clearance: 0, Wall: 1e-3, WindingHeight: 7e-3}
	b, err := NewBody(o)
	if err != nil {
		t.Fatal(err)
	}
	sum := func(faces []Face) (s float64) {
		for _, f := range faces {
			s += f.Area
		}
		return s * 1e6
	}
	core := 2 * (40*15.0 + 42*15 + 40*42 - 28*30)
	winding := 2*(28+2*6)*30 + 4*28*6.0
	if got := sum(b.Core); math.Abs(got-core) > 1e-6 {
		t.Errorf("core faces %g mm², want %g", got, core)
	}
	if got := sum(b.Winding); math.Abs(got-winding) > 1e-6 {
		t.Errorf("winding faces %g mm², want %g", got, winding)
	}
	for _, up := range []Direction{Along, Across, Depth} {
		o.Up = up
		c, err := NewBody(o)
		if err != nil {
			t.Fatal(err)
		}
		if math.Abs(c.Surface()-b.Surface()) > 1e-12 {
			t.Errorf("turning the part changes its surface from %g to %g m²", b.Surface(), c.Surface())
		}
		ups, downs := 0, 0
		for _, f := range append(c.Core, c.Winding...) {
			switch f.Orientation {
			case Up:
				ups++
			case Down:
				downs++
				if f.Emissivity != 0 {
					t.Errorf("%s radiates into the board", f.Name)
				}
			}
		}
		if ups == 0 || ups != downs {
			t.Errorf("up %v: %d faces up, %d down", up, ups, downs)
		}
	}
	// Contact by hand: post 2(12+11) x 30, flanges 2(28 x 15 - 12 x 11), legs 2 x 15 x 30.
	rs := 1e-3/0.25 + 3.5e-3/0.6
	want := (46*30+2*(28*15-132.0))*1e-6/rs + 900e-6/(3.5e-3/0.6+1/(0.029/0.5e-3+6.5))
	if math.Abs(b.Between/want-1) > 1e-9 {
		t.Errorf("%g W/K between winding and core, want %g", b.Between, want)
	}
	o.Openings = 0
	closed, err := NewBody(o)
	if err != nil || len(closed.Winding) != 0 {
		t.Errorf("a closed core shows %d winding faces (%v)", len(closed.Winding), err)
	}
	if r := solve(t, closed, Surroundings{Ambient: 25}, constant(1), constant(1)); !(r.WindingTemperature > r.CoreTemperature) {
		t.Errorf("winding in a closed core: %+v", r)
	}
}

func TestBalanceHolds(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 1))
	b, err := NewBody(etd44(Depth))
	if err != nil {
		t.Fatal(err)
	}
	b.HotSpot = 12
	for range 100 {
		s := Surroundings{Ambient: 20 + 40*r.Float64(), Altitude: 3000 * r.Float64(), WallConductance: 0.3 * r.Float64(), Wall: 60 * r.Float64()}
		if r.IntN(2) == 0 {
			s.AirSpeed = 3 * r.Float64()
		}
		cu, fe := 3*r.Float64(), 3*r.Float64()
		w := func(temp float64) float64 { return cu * (1 + 0.0039*(temp-20)) }
		c := func(temp float64) float64 { return fe * (1 + 1e-4*(temp-95)*(temp-95)) }
		got := solve(t, b, s, w, c)
		if got.Runaway || got.HotSpot != got.WindingTemperature+12 {
			t.Errorf("%+v", got)
		}
		out := Shed(b.Winding, got.WindingTemperature, s) + Shed(b.Core, got.CoreTemperature, s) + got.ToWall
		made := got.WindingLoss + got.CoreLoss
		if math.Abs(out-made) > 1e-7*(made+math.Abs(got.ToWall)) || math.Abs(got.WindingLoss-w(got.WindingTemperature)) > 1e-12 {
			t.Errorf("makes %.12g W, sheds %.12g W in %d steps", made, out, got.Iterations)
		}
		if math.Abs(got.ToCore-(got.WindingLoss-Shed(b.Winding, got.WindingTemperature, s))) > 1e-7*made+1e-9 {
			t.Errorf("%g W to the core do not balance the winding", got.ToCore)
		}
		if got.Iterations > 12 {
			t.Errorf("%d steps", got.Iterations)
		}
		// More loss, warmer air, thinner air, less wind: all hotter.
		for what, change := range map[string]func(*Surroundings, *float64){
			"loss":     func(_ *Surroundings, p *float64) { *p = 1.1 },
			"ambient":  func(s *Surroundings, _ *float64) { s.Ambient += 5 },
			"altitude": func(s *Surroundings, _ *float64) { s.Altitude += 1000 },
		} {
			hotS, p := s, 1.0
			change(&hotS, &p)
			hot := solve(t, b, hotS, func(x float64) float64 { return p * w(x) }, func(x float64) float64 { return p * c(x) })
			if what == "altitude" && min(got.WindingTemperature, got.CoreTemperature) < s.Ambient {
				continue // cooled by the wall: thin air then helps
			}
			if hot.WindingTemperature <= got.WindingTemperature {
				t.Errorf("more %s makes the winding colder: %g after %g °C", what, hot.WindingTemperature, got.WindingTemperature)
			}
		}
	}
}

func TestSurroundingsAct(t *testing.T) {
	b, err := NewBody(etd44(Along))
	if err != nil {
		t.Fatal(err)
	}
	rise := func(s Surroundings) float64 {
		s.Ambient = 40
		return solve(t, b, s, constant(2), constant(2)).CoreTemperature - 40
	}
	still := rise(Surroundings{})
	// ISO 2533: 0.8216 of the density at 2000 m, so convection at 0.906 of its value;
	// with about half of the heat radiated the rise grows by 4 to 6 %.
	if d := RelativeDensity(2000); math.Abs(d-0.8216) > 1e-4 {
		t.Errorf("density at 2000 m: %g, want 0.8216", d)
	}
	if high := rise(Surroundings{Altitude: 2000}) / still; high < 1.03 || high > 1.07 {
		t.Errorf("2000 m raises the rise by %g", high)
	}
	// A 40 mm plate in 1 m/s at 320 K by hand: nu = 1.79e-5, so Re = 2234 and
	// h = 0.664 x 47.27 x 0.889 x 0.0278/0.04 = 19.39.
	air := AirAt(46.85, 0)
	if h := Forced(1, 0.04, air); math.Abs(h-19.39) > 0.02 {
		t.Errorf("forced h = %g, want 19.39", h)
	}
	slow, fast := rise(Surroundings{AirSpeed: 1}), rise(Surroundings{AirSpeed: 4})
	if !(fast < slow && slow < 0.75*still) {
		t.Errorf("rise %g still, %g at 1 m/s, %g at 4 m/s", still, slow, fast)
	}
	if tiny := rise(Surroundings{AirSpeed: 1e-6}); math.Abs(tiny/still-1) > 1e-3 {
		t.Errorf("a breath of air jumps from %g to %g K", still, tiny)
	}
	// A pad of 1 W/K to a wall at ambient carries its share of the rise.
	r := solve(t, b, Surroundings{Ambient: 40, WallConductance: 1, Wall: 40}, constant(2), constant(2))
	if math.Abs(r.ToWall-(r.CoreTemperature-40)) > 1e-9 || r.CoreTemperature-40 > still/3 {
		t.Errorf("with a pad: %+v, without %g K", r, still)
	}
	// Without loss the part is as warm as the air.
	if r := solve(t, b, Surroundings{Ambient: 40}, constant(0), constant(0)); math.Abs(r.CoreTemperature-40) > 1e-3 || math.Abs(r.WindingTemperature-40) > 1e-3 {
		t.Errorf("without loss: %+v", r)
	}
}

// Losses that feed themselves: exp((T-T0)/20) grows faster than any surface sheds.
func TestRunaway(t *testing.T) {
	b, err := NewBody(etd44(Along))
	if err != nil {
		t.Fatal(err)
	}
	s := Surroundings{Ambient: 40}
	fire := func(p float64) func(float64) float64 {
		return func(temp float64) float64 { return p * math.Exp((temp-40)/20) }
	}
	// Bisect for the greatest loss that still has a steady state. On the edge the
	// rise of P = G dT^1.2 with P' = P/20 is about 1.2 x 20 K = 24 K.
	lo, hi := 0.0, 10.0
	for range 50 {
		p := (lo + hi) / 2
		if solve(t, b, s, constant(0), fire(p)).Runaway {
			hi = p
		} else {
			lo = p
		}
	}
	r := solve(t, b, s, constant(0), fire(0.999*lo))
	if rise := r.CoreTemperature - 40; r.Runaway || rise < 18 || rise > 27 {
		t.Errorf("just stable at %.3g W: %+v", lo, r)
	}
	r = solve(t, b, s, constant(1), fire(1.3*lo))
	if !r.Runaway || r.WindingTemperature != Ceiling || !strings.Contains(r.Reason, "thermal runaway: no steady temperature below 300 °C") {
		t.Errorf("runaway: %+v", r)
	}
	// The winding alone, in a body that leaves it on its own.
	alone := b
	alone.Between = 0
	r = solve(t, alone, s, fire(5), constant(1))
	if !r.Runaway || r.Reason == "" {
		t.Errorf("winding runaway: %+v", r)
	}
	// Plain overload: constant loss, a balance far above the ceiling.
	r = solve(t, b, s, constant(100), constant(100))
	if !r.Runaway || math.IsNaN(r.Residual) {
		t.Errorf("overload: %+v", r)
	}
	// A loss with two stable states: the colder one is found.
	step := func(temp float64) float64 { return 1 + 20/(1+math.Exp(-(temp-130)/3)) }
	if r := solve(t, b, s, constant(0.5), step); r.Runaway || r.CoreTemperature > 70 {
		t.Errorf("two states: %+v", r)
	}
	// Ferrite losses fall steeply before they rise: still a steady state, no swinging.
	v := func(temp float64) float64 { return 3 + 12*math.Exp(-(temp-40)/15) }
	if r := solve(t, b, s, constant(1), v); r.Runaway || r.Residual > 1e-6 {
		t.Errorf("falling loss: %+v", r)
	}
}

func TestRefuses(t *testing.T) {
	good, err := NewBody(etd44(Along))
	if err != nil {
		t.Fatal(err)
	}
	nan := math.NaN()
	for _, c := range []struct {
		name   string
		body   Body
		around Surroundings
		loss   float64
		want   error
	}{
		{"NaN loss", good, Surroundings{Ambient: 25}, nan, ErrLoss},
		{"negative loss", good, Surroundings{Ambient: 25}, -1, ErrLoss},
		{"infinite loss", good, Surroundings{Ambient: 25}, math.Inf(1), ErrLoss},
		{"ambient", good, Surroundings{Ambient: nan}, 1, ErrSurroundings},
		{"altitude", good, Surroundings{Altitude: 20000}, 1, ErrSurroundings},
		{"wind", good, Surroundings{AirSpeed: -1}, 1, ErrSurroundings},
		{"pad", good, Surroundings{WallConductance: nan}, 1, ErrSurroundings},
		{"wall", good, Surroundings{WallConductance: 1, Wall: nan}, 1, ErrSurroundings},
		{"nothing", Body{Between: 1}, Surroundings{}, 1, ErrBody},
		{"winding shut in", Body{Core: good.Core}, Surroundings{}, 1, ErrBody},
		{"face", Body{Core: []Face{{"x", nan, 1, Up, 0}}, Between: 1}, Surroundings{}, 1, ErrBody},
	} {
		if r, err := Solve(c.body, c.around, constant(c.loss), constant(c.loss)); !errors.Is(err, c.want) {
			t.Errorf("%s: %+v, %v", c.name, r, err)
		}
	}
	for _, change := range []func(*Outline){
		func(o *Outline) { o.Across = 0 }, func(o *Outline) { o.Depth = nan }, func(o *Outline) { o.Wall = -1 },
		func(o *Outline) { o.WindingHeight = 20e-3 }, func(o *Outline) { o.Window = 50e-3 }, func(o *Outline) { o.Openings = 1 },
	} {
		o := etd44(Along)
		change(&o)
		if _, err := NewBody(o); !errors.Is(err, ErrBody) {
			t.Errorf("NewBody(%+v): %v", o, err)
		}
	}
}

func BenchmarkSolve(b *testing.B) {
	body, err := NewBody(etd44(Depth))
	if err != nil {
		b.Fatal(err)
	}
	w := func(temp float64) float64 { return 2 * (1 + 0.0039*(temp-20)) }
	for _, c := range []struct {
		name string
		core func(float64) float64
	}{
		{"case=steady", func(temp float64) float64 { return 2 * (1 + 1e-4*(temp-95)*(temp-95)) }},
		{"case=runaway", func(temp float64) float64 { return 3 * math.Exp((temp-40)/20) }},
	} {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			steps := 0
			for b.Loop() {
				r, err := Solve(body, Surroundings{Ambient: 40}, w, c.core)
				if err != nil {
					b.Fatal(err)
				}
				steps = r.Iterations
			}
			b.ReportMetric(float64(steps), "steps")
		})
	}
}
