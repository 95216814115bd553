package material

import (
	"errors"
	"math"
	"strings"
	"testing"
	"testing/fstest"

	"gapwright/corelib/table"
)

func TestEmbeddedRows(t *testing.T) {
	all := Embedded().All()
	if len(all) != 4 {
		t.Fatalf("%d ferrites embedded, want 4", len(all))
	}
	for _, m := range all {
		t.Run(m.Name, func(t *testing.T) {
			if wantOnRequest := m.Name != "PW3"; m.OnRequest != wantOnRequest {
				t.Errorf("on request = %v, want %v", m.OnRequest, wantOnRequest)
			}
			if !strings.Contains(m.Edition, "IEC 61332 ed.") {
				t.Errorf("edition %q does not name the edition", m.Edition)
			}
			last := math.Inf(1)
			for temp := -20.0; temp < 260; temp += 5 {
				b := m.Bsat(temp)
				if b < 0 || b > last {
					t.Errorf("Bsat(%g) = %g T after %g T: it must fall and stay above zero", temp, b, last)
				}
				last = b
				if mu := m.MuI(temp); !(mu.Low <= mu.Value && mu.Value <= mu.High && mu.Low > 0) {
					t.Errorf("MuI(%g) = %v", temp, mu)
				}
			}
			if m.Bsat(m.Curie()) != 0 || m.Bsat(m.Curie()-1) <= 0 {
				t.Errorf("saturation at the Curie temperature: %g, 1 K below: %g", m.Bsat(m.Curie()), m.Bsat(m.Curie()-1))
			}
			if m.Source == "" || len(m.Figures) < 7 || len(m.OwnRows()) != 0 {
				t.Errorf("source %q, %d figures, own rows %v", m.Source, len(m.Figures), m.OwnRows())
			}
			for _, f := range m.Figures {
				if f.Source == "" || f.Confidence == "" {
					t.Errorf("figure %s without source or confidence", f.Kind)
				}
			}
		})
	}
}

// The two figures of PW3 that were read in a published summary of a data sheet,
// and what the job's default share makes of the hot one.
func TestPW3Saturation(t *testing.T) {
	m, err := Embedded().Find("pw 3")
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ temp, want float64 }{{25, 0.490}, {100, 0.390}, {0, 0.490}, {62.5, 0.440}} {
		if got := m.Bsat(c.temp); math.Abs(got-c.want) > 1e-12 {
			t.Errorf("Bsat(%g) = %g, want %g", c.temp, got, c.want)
		}
	}
	// Catalogue curves of such grades read 355 to 370 mT at 120 °C (from memory).
	if got := m.Bsat(120); got < 0.345 || got > 0.37 {
		t.Errorf("Bsat(120) = %g T, want 0.345 to 0.37", got)
	}
	if got := m.MuI(25); got.Value != 2200 {
		t.Errorf("MuI(25) = %v, want 2200", got)
	}
	if got := m.MuI(100); got.Value != 3500 {
		t.Errorf("MuI(100) = %v, want 3500", got)
	}
}

func TestFindNamesTheNearest(t *testing.T) {
	_, err := Embedded().Find("PW33")
	if !errors.Is(err, ErrUnknown) || !strings.Contains(err.Error(), "nearest: PW3") {
		t.Errorf("Find(PW33): %v", err)
	}
}

const (
	ownFerrite = "name,class,edition,use,like,source,confidence\nMY1,PW3,IEC 61332 ed. 4 (2026),on request,PW3,own bench,measured\n"
	ownLoss    = "name,set,k,alpha,beta,f_min [Hz],f_max [Hz],B_min [T],B_max [T],T_min [degC],T_max [degC],T_ref [degC],heat,a0,a1,a2,source,confidence\n" +
		"MY1,M1,2,1.4,2.5,50e3,200000,0.05,0.2,25,100,100,log-quadratic,,0,0.0001,own bench,measured\n"
)

func TestUsersFolder(t *testing.T) {
	own, err := Embedded().With(fstest.MapFS{
		FerritesFile: {Data: []byte("\ufeff# bought in spring\n" + ownFerrite)},
		LossFile:     {Data: []byte(strings.ReplaceAll(ownLoss, "\n", "\r\n"))},
		FiguresFile:  {Data: []byte("name,figure,temperature [degC],value,unit,source,confidence\nMY1,saturation,100,0.4,T,own sheet,data sheet\n")},
	}, "mine")
	if err != nil {
		t.Fatal(err)
	}
	m, err := own.Find("my1")
	if err != nil {
		t.Fatal(err)
	}
	if m.Bsat(100) != 0.4 || m.Bsat(25) != 0.4 || m.MuI(25).Value != 2200 || m.Curie() != 210 {
		t.Errorf("Bsat(100) = %g, Bsat(25) = %g, mu %v, Curie %g: want the own figure, the rest as PW3", m.Bsat(100), m.Bsat(25), m.MuI(25), m.Curie())
	}
	p, err := m.LossDensity(100e3, 0.1, 100)
	if want := 2 * math.Pow(100e3, 1.4) * math.Pow(0.1, 2.5); err != nil || math.Abs(p.Density/want-1) > 1e-12 {
		t.Errorf("LossDensity = %g (%v), want %g", p.Density, err, want)
	}
	if got := m.OwnRows(); len(got) != 3 || got[0] != "mine/ferrites.csv" {
		t.Errorf("OwnRows = %v", got)
	}
	if len(Embedded().All()) != 4 {
		t.Error("the embedded table was changed")
	}

	// A second folder replaces the loss sets of PW3 alone.
	over, err := own.With(fstest.MapFS{LossFile: {Data: []byte(strings.ReplaceAll(ownLoss, "MY1", "PW3"))}}, "later")
	if err != nil {
		t.Fatal(err)
	}
	m, _ = over.Find("PW3")
	if len(m.Loss) != 1 || m.Loss[0].ID != "M1" || m.Bsat(25) != 0.49 || m.OnRequest {
		t.Errorf("PW3 with own loss rows: %d sets, Bsat %g, on request %v", len(m.Loss), m.Bsat(25), m.OnRequest)
	}
	// MY1 had its own loss rows and keeps them.
	if m, _ = over.Find("MY1"); m.Loss[0].Origin != "mine/ferrite-loss.csv" {
		t.Errorf("MY1's losses now come from %s", m.Loss[0].Origin)
	}
}

func TestUsersMistakes(t *testing.T) {
	loss := func(change ...string) string { return strings.NewReplacer(change...).Replace(ownLoss) }
	heat := "name,kind,f [kHz],T [degC],value,source,confidence\n"
	for _, c := range []struct{ name, file, data, want string }{
		{"no source", FerritesFile, "name,like,source,confidence\nMY1,PW3,,measured\n", "f/ferrites.csv:2:9: no source"},
		{"confidence", FerritesFile, "name,like,source,confidence\nMY1,PW3,x,sure\n", `f/ferrites.csv:2:11: confidence: "sure" is none of verified`},
		{"twice", FerritesFile, "name,like,source,confidence\nMY1,PW3,x,measured\nmy-1,PW3,x,measured\n", `f/ferrites.csv:3:1: ferrite "my-1" stands in line 2 already`},
		{"edition", FerritesFile, "name,class,like,source,confidence\nMY1,PW4,PW3,x,measured\n", "without the edition"},
		{"no like", FerritesFile, "name,source,confidence\nMY1,x,measured\n", "MY1 has no saturation"},
		{"like nobody", FerritesFile, "name,like,source,confidence\nMY1,PW33,x,measured\n", `2:5: like: unknown ferrite "PW33"; nearest: PW3`},
		{"circle", FerritesFile, "name,like,source,confidence\nA,B,x,measured\nB,A,x,measured\n", "leads back to itself"},
		{"use", FerritesFile, "name,use,like,source,confidence\nMY1,always,PW3,x,measured\n", "neither default nor on request"},
		{"column", FerritesFile, "name,likes,source,confidence\nMY1,PW3,x,measured\n", `1:6: unknown column "likes"; nearest: like`},
		{"stranger", LossFile, ownLoss, `f/ferrite-loss.csv:2:1: ferrite "MY1" has no row in ferrites.csv`},
		{"unit", LossFile, loss("MY1", "PW3", "f_min [Hz]", "f_min [s]"), `"s"; write one of kHz, MHz, Hz`},
		{"k in mW/cm3", LossFile, loss("MY1", "PW3", ",2,1.4", ",0.002,1.4"), "which no power ferrite has"},
		{"alpha", LossFile, loss("MY1", "PW3", ",1.4,", ",14,"), "alpha = 14; ferrites lie between 1 and 3"},
		{"negative", LossFile, loss("MY1", "PW3", "50e3", "-50e3"), "not above zero"},
		{"range", LossFile, loss("MY1", "PW3", "50e3", "500e3"), "frequency range 500000 to 200000 Hz"},
		{"no T_ref", LossFile, loss("MY1", "PW3", ",100,100,log", ",100,,log"), "T_ref is empty"},
		{"heat", LossFile, loss("MY1", "PW3", "log-quadratic", "cubic"), `heat form "cubic"`},
		{"falling polynomial", LossFile, loss("MY1", "PW3", "log-quadratic,,0,0.0001", "polynomial,1,0.02,0.00001"), "falls to"},
		{"ratio without rule", LossFile, loss("MY1", "PW4", "log-quadratic", "ratio"), "no hot-over-cold row"},
		{"overlap", LossFile, loss("MY1", "PW3") + "PW3,M2,2,1.4,2.5,60000,190000,,,25,100,100,none,,,,x,measured\n", "not one band above the other"},
		{"set twice", LossFile, loss("MY1", "PW3") + strings.SplitAfter(loss("MY1", "PW3"), "\n")[1], "stands in line 2 already"},
		{"no number", LossFile, loss("MY1", "PW3", ",2.5,", ",steep,"), `beta: "steep" is not a decimal number`},
		{"semicolons", LossFile, "name;set;k\nPW3;M;2\n", "separated by semicolons"},
		{"unknown figure", FiguresFile, "name,figure,temperature [degC],value,unit,source,confidence\nPW3,saturaton,25,400,mT,x,measured\n", "nearest: saturation"},
		{"figure unit", FiguresFile, "name,figure,temperature [degC],value,unit,source,confidence\nPW3,saturation,25,400,degC,x,measured\n", "its unit is T"},
		{"figure size", FiguresFile, "name,figure,temperature [degC],value,unit,source,confidence\nPW3,saturation,25,400,T,x,measured\n", "where every ferrite lies"},
		{"no temperature", FiguresFile, "name,figure,temperature [degC],value,unit,source,confidence\nPW3,saturation,,400,mT,x,measured\n", "saturation needs its temperature"},
		{"rising", FiguresFile, "name,figure,temperature [degC],value,unit,source,confidence\nPW3,saturation,25,300,mT,x,measured\nPW3,saturation,100,400,mT,x,measured\n", "saturation rises"},
		{"above Curie", FiguresFile, "name,figure,temperature [degC],value,unit,source,confidence\nPW3,curie,,90,degC,x,measured\n", "above the Curie temperature"},
		{"band", FiguresFile, "name,figure,temperature [degC],value,low,high,unit,source,confidence\nPW3,density,,4800,4900,5000,kg/m3,x,measured\n", "does not hold the value"},
		{"heat kind", HeatFile, heat + "PW3,warm,100,100,0.6,x,measured\n", "neither hot-over-cold nor column"},
		{"flat column", HeatFile, heat + "PW3,column,100,25,300,x,measured\nPW3,column,100,100,300,x,measured\n", "f/ferrite-heat.csv:2:1: PW3: the column changes by less than 5 %"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := Embedded().With(fstest.MapFS{c.file: {Data: []byte(c.data)}}, "f")
			if err == nil {
				t.Fatal("accepted")
			}
			if !strings.Contains(err.Error(), c.want) {
				t.Errorf("%v\nwant: %s", err, c.want)
			}
			if _, ok := errors.AsType[*table.Error](err); !ok {
				t.Errorf("error without a position: %v", err)
			}
		})
	}
}

func FuzzWith(f *testing.F) {
	f.Add(ownFerrite, ownLoss, "name,figure,temperature [degC],value,unit,source,confidence\nMY1,saturation,100,0.4,T,own sheet,data sheet\n",
		"name,kind,f [kHz],T [degC],value,source,confidence\nMY1,column,100,25,300,x,measured\n")
	f.Fuzz(func(t *testing.T, ferrites, loss, figures, heat string) {
		own, err := Embedded().With(fstest.MapFS{FerritesFile: {Data: []byte(ferrites)}, LossFile: {Data: []byte(loss)},
			FiguresFile: {Data: []byte(figures)}, HeatFile: {Data: []byte(heat)}}, "f")
		if err != nil {
			return
		}
		for _, m := range own.All() {
			if m.Source == "" {
				t.Errorf("%s without source", m.Name)
			}
			if b := m.Bsat(60); math.IsNaN(b) || b < 0 {
				t.Errorf("%s: Bsat(60) = %g", m.Name, b)
			}
			if p, err := m.LossDensity(100e3, 0.1, 90); err == nil && !(p.Density >= 0 && !math.IsInf(p.Density, 0)) {
				t.Errorf("%s: loss %v", m.Name, p)
			}
		}
	})
}
