package quantity

import (
	"errors"
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

func TestParse(t *testing.T) {
	for _, c := range []struct {
		text string
		unit Unit
		want float64
	}{
		{"60 uH", Henry, 60e-6}, {"60uH", Henry, 60e-6}, {"60 µH", Henry, 60e-6}, {"60 μH", Henry, 60e-6},
		{"0.06 mH", Henry, 60e-6}, {"6e-5 H", Henry, 60e-6}, {"6E-5 H", Henry, 60e-6}, {"60e+0 uH", Henry, 60e-6},
		{"0.1 uH", Henry, 0.1e-6}, {"0.3 uH", Henry, 0.3e-6}, {"44 nF", Farad, 44e-9}, {"300 pF", Farad, 300e-12},
		{"5 %", Percent, 0.05}, {"7%", Percent, 0.07}, {"45 degC", Celsius, 45}, {"45 °C", Celsius, 45}, {"-40 degC", Celsius, -40},
		{"10 K", Kelvin, 10}, {"120 mohm", Ohm, 0.12}, {"120 mΩ", Ohm, 0.12}, {"0.5 mm", Meter, 0.5e-3}, {"10 um", Meter, 10e-6},
		{"200 ns", Second, 200e-9}, {"60 s", Second, 60}, {"20 ms", Second, 0.02}, {"60 kHz", Hertz, 60e3}, {"2 MHz", Hertz, 2e6},
		{"250 g", Kilogram, 0.25}, {"0.25 kg", Kilogram, 0.25}, {"8 A/mm2", AmperePerSquareMeter, 8e6}, {"8 A/mm²", AmperePerSquareMeter, 8e6},
		{"300 kW/m3", WattPerCubicMeter, 300e3}, {"300 mW/cm3", WattPerCubicMeter, 300e3}, {"125 mm2", SquareMeter, 125e-6},
		{"1.25 cm2", SquareMeter, 1.25e-4}, {"11.5 cm3", CubicMeter, 11.5e-6}, {"58 MS/m", SiemensPerMeter, 58e6},
		{"4999 nH", HenryPerMeter, 4999e-9}, {"4999 nH/m", HenryPerMeter, 4999e-9}, {"0.2 W/K", WattPerKelvin, 0.2},
		{"1 m/s", MeterPerSecond, 1}, {"100 mT", Tesla, 0.1}, {"4", Plain, 4}, {"-2.5e3", Plain, -2500}, {".5 mm", Meter, 0.5e-3},
		{"0 mV", Volt, 0}, {"-0 mV", Volt, 0}, {" 60\u00a0uH ", Henry, 60e-6}, {"0.25 mm", Meter, 0.25e-3}, {"1 GHz", Hertz, 1e9},
	} {
		got, err := Parse(c.text, c.unit)
		if err != nil || got != c.want || math.Signbit(got) != math.Signbit(c.want) {
			t.Errorf("Parse(%q, %s) = %v, %v, want exactly %v", c.text, c.unit.SI(), got, err, c.want)
		}
	}
}

func TestParseRefuses(t *testing.T) {
	for _, c := range []struct {
		text string
		unit Unit
		want string
	}{
		{"60", Henry, "60 is a bare number; write 60 uH"},
		{"0.07", Percent, "0.07 is a bare number; write 7 %"},
		{"7", Percent, "7 is a bare number; write 7 %"},
		{"300u", Farad, "300u has a prefix without a unit; write 300 uF"},
		{"300 µ", Henry, "300 µ has a prefix without a unit; write 300 uH"},
		{"5 k", Ohm, "5 k has a prefix without a unit; write 5 kohm"},
		{"1,5 mm", Meter, "1,5 mm has a decimal comma; write 1.5 mm"},
		{"1,5", Meter, "1,5 has a decimal comma; write 1.5 mm"},
		{"1.000,5 mm", Meter, "1.000,5 mm has a decimal comma"},
		{".nan", Henry, ".nan is not a finite number; write a number in uH"},
		{"-.inf", Henry, "-.inf is not a finite number; write a number in uH"},
		{"Infinity H", Henry, "Infinity H is not a finite number; write a number in uH"},
		{"012", Plain, "012 starts with a needless zero; write 12"},
		{"012 mm", Meter, "012 mm starts with a needless zero; write 12 mm"},
		{"00.5 mm", Meter, "00.5 mm starts with a needless zero; write 0.5 mm"},
		{"1_000", Plain, "1_000 has a digit separator; write 1000"},
		{"1_000 kHz", Hertz, "1_000 kHz has a digit separator; write 1000 kHz"},
		{"45 K", Celsius, "45 K is a temperature rise, but this is a temperature in degC; write 45 degC"},
		{"45 C", Celsius, "45 C has an unknown unit; write 45 degC"},
		{"10 degC", Kelvin, "10 degC is a temperature, but this is a rise in K; write 10 K"},
		{"60 V", Henry, "60 V is not an inductance; write a number in uH"},
		{"60 khz", Hertz, "60 khz has a unit in the wrong case; write 60 kHz"},
		{"4 V", Plain, "4 V has a unit, but this is a plain number; write 4"},
		{"", Henry, "there is no value; write a number in uH"},
		{"abc", Plain, "abc is not a plain number; write a number"},
		{"1e999 H", Henry, "1e999 H is out of the range of numbers"},
		{"1e-999 H", Henry, "1e-999 H is out of the range of numbers"},
		{"1e99999999999999999999 H", Henry, "1e99999999999999999999 H is out of the range of numbers"},
		{"0x10", Plain, "0x10 is not a decimal number"},
		{"−5 mm", Meter, "−5 mm has a typographic minus; write -5 mm"},
		{"5 mdegC", Celsius, "5 mdegC is not a temperature; write a number in degC"},
		{"1 kkg", Kilogram, "1 kkg is not a mass; write a number in g"},
	} {
		got, err := Parse(c.text, c.unit)
		if err == nil {
			t.Errorf("Parse(%q) = %v, want an error", c.text, got)
			continue
		}
		var e *Error
		if !errors.As(err, &e) || err.Error() != c.want {
			t.Errorf("Parse(%q): %q, want %q", c.text, err, c.want)
		}
	}
}

func TestFormat(t *testing.T) {
	for _, c := range []struct {
		x    float64
		unit Unit
		want string
	}{
		{3e-5, Henry, "30.00 µH"}, {999.96e-6, Henry, "1.000 mH"}, {999.94e-6, Henry, "999.9 µH"}, {0, Henry, "0 H"},
		{44e-9, Farad, "44.00 nF"}, {0.12, Ohm, "120.0 mΩ"}, {1e5, Hertz, "100.0 kHz"}, {110, Celsius, "110.0 °C"},
		{0.25, Kilogram, "250.0 g"}, {1.25, Kilogram, "1.250 kg"}, {8e6, AmperePerSquareMeter, "8.000 A/mm²"},
		{125e-6, SquareMeter, "125.0 mm²"}, {11.5e-6, CubicMeter, "11.50 cm³"}, {0.0723, Percent, "7.230 %"},
		{-1.5e-3, Volt, "-1.500 mV"}, {4.0312, Plain, "4.031"}, {1e-15, Farad, "0.001000 pF"}, {1e-20, Farad, "1.000e-8 pF"},
		{math.NaN(), Henry, "not finite"}, {math.Inf(-1), Henry, "not finite"}, {5.8e7, SiemensPerMeter, "58.00 MS/m"},
		{6.3e-4, Meter, "630.0 µm"}, {2000, Meter, "2.000 km"}, {18.5e-6, VoltSecond, "18.50 µVs"},
	} {
		if got := Format(c.x, c.unit); got != c.want {
			t.Errorf("Format(%v, %s) = %q, want %q", c.x, c.unit.SI(), got, c.want)
		}
	}
	if got := FormatAs(6.3e-4, Meter, "mm", 2); got != "0.63 mm" {
		t.Errorf("FormatAs = %q", got)
	}
	if got := Number(-1e-9, Meter, "mm", 2); got != "0.00" {
		t.Errorf("Number of a tiny negative = %q, want 0.00", got)
	}
}

func TestExact(t *testing.T) {
	mm, _ := Lookup("mm")
	tenth, fifth := 0.1, 0.2
	for _, c := range []struct {
		x    float64
		unit Unit
		want string
	}{
		{6.3e-4, mm, "0.63 mm"}, {6.3e-4, Meter, "0.63 mm"}, {303e-6, Henry, "303 uH"}, {3e-6, Henry, "3 uH"},
		{0.07, Percent, "7 %"}, {120, Celsius, "120 degC"}, {60, Second, "60 s"}, {0, Meter, "0 mm"}, {4, Plain, "4"},
		{tenth + fifth, Plain, "0.30000000000000004"}, {1e-30, Meter, "1e-27 mm"},
	} {
		if got := Exact(c.x, c.unit); got != c.want {
			t.Errorf("Exact(%v) = %q, want %q", c.x, got, c.want)
		}
	}
	// Every float64 of a usual size survives the round trip to the last bit.
	r := rand.New(rand.NewPCG(1, 2))
	for range 20000 {
		x := (r.Float64() - 0.5) * math.Pow(10, float64(r.IntN(24)-12))
		for _, u := range []Unit{Henry, Meter, Percent, Kilogram, Celsius, AmperePerSquareMeter, Plain} {
			if back, err := Parse(Exact(x, u), u); err != nil || back != x {
				t.Fatalf("Parse(Exact(%v)) = %v, %v via %q", x, back, err, Exact(x, u))
			}
		}
	}
}

func TestLookup(t *testing.T) {
	for symbol, want := range map[string]string{"H": "H", "uH": "H", "A/mm2": "A/m2", "kg": "kg", "g": "kg", "": "", "%": "%", "degC": "degC"} {
		u, ok := Lookup(symbol)
		if !ok || u.SI() != want {
			t.Errorf("Lookup(%q) = %s, %v", symbol, u.SI(), ok)
		}
	}
	if _, ok := Lookup("furlong"); ok {
		t.Error("furlong is a unit")
	}
	if u, _ := Lookup("m"); u.Usual() != "mm" {
		t.Errorf("usual unit of m is %s, want mm", u.Usual())
	}
}

func FuzzParse(f *testing.F) {
	for _, s := range []string{"60 uH", "1,5 mm", "300u", ".nan", "012", "1_000", "45 K", "-5 %", "1e5", "µ", "5.e3 H", "−1", "0.5mΩ", "1e+", "+.e5 k"} {
		f.Add(s)
	}
	units := []Unit{Plain, Henry, Meter, Kilogram, Percent, Celsius, Kelvin, AmperePerSquareMeter, HenryPerMeter}
	f.Fuzz(func(t *testing.T, s string) {
		for _, u := range units {
			x, err := Parse(s, u)
			if err != nil {
				var e *Error
				if !errors.As(err, &e) || strings.TrimSpace(err.Error()) == "" {
					t.Errorf("Parse(%q): error without words", s)
				}
				continue
			}
			if math.IsNaN(x) || math.IsInf(x, 0) {
				t.Errorf("Parse(%q) = %v", s, x)
			}
			if back, err := Parse(Exact(x, u), u); err != nil || back != x {
				t.Errorf("Parse(Exact(%v)) = %v, %v", x, back, err)
			}
			// What is printed with 4 digits is right to half a unit of the last.
			if back, err := Parse(Format(x, u), u); err == nil && math.Abs(back-x) > 0.5001e-3*math.Abs(x) {
				t.Errorf("Format(%v) = %q reads back as %v", x, Format(x, u), back)
			}
		}
	})
}

func BenchmarkParse(b *testing.B) {
	for b.Loop() {
		if _, err := Parse("60 uH", Henry); err != nil {
			b.Fatal(err)
		}
	}
}
