package thermal

import "math"

// Constants of the heat balance.
const (
	stefanBoltzmann = 5.670374419e-8 // W/(m² K⁴), CODATA 2018, exact
	gravity         = 9.80665        // m/s², standard
	zeroCelsius     = 273.15         // K
)

// An Air holds the properties of air at one film temperature.
type Air struct {
	Viscosity    float64 // kinematic, m²/s
	Conductivity float64 // W/(m K)
	Diffusivity  float64 // thermal, m²/s
	Prandtl      float64
}

// airRows are two rows of F. P. Incropera, D. P. DeWitt, Fundamentals of Heat and Mass
// Transfer, table A.4 (from memory), air at sea level.
var airRows = [2]struct {
	kelvin float64
	Air
}{
	{300, Air{1.589e-5, 0.0263, 2.25e-5, 0.707}},
	{350, Air{2.092e-5, 0.0300, 2.99e-5, 0.700}},
}

// AirAt returns the properties of air at a film temperature in °C and an altitude
// in m: a straight line through two rows of the table, the viscosity and
// diffusivity divided by the relative density.
func AirAt(film, altitude float64) Air {
	a, b := airRows[0], airRows[1]
	// Down to 200 K and up to 600 K the line is within some 10 % of the table;
	// beyond, the ends are kept so that no property changes sign.
	k := min(max(film+zeroCelsius, 200), 600)
	w := (k - a.kelvin) / (b.kelvin - a.kelvin)
	mix := func(x, y float64) float64 { return x + w*(y-x) }
	rho := RelativeDensity(altitude)
	return Air{mix(a.Viscosity, b.Viscosity) / rho, mix(a.Conductivity, b.Conductivity),
		mix(a.Diffusivity, b.Diffusivity) / rho, mix(a.Prandtl, b.Prandtl)}
}

// RelativeDensity returns the density of air at an altitude in m over that at sea
// level in the ISO 2533 standard atmosphere: (1 - 2.25577e-5 h)^4.2559, up to
// 11 km. Below sea level it goes on.
func RelativeDensity(altitude float64) float64 {
	return math.Pow(1-2.25577e-5*min(altitude, 11000), 4.2559)
}

// An Orientation is the way in which a hot face looks.
type Orientation int

// The orientations for which a convection figure exists.
const (
	Vertical Orientation = iota
	Up
	Down
)

func (o Orientation) String() string { return [...]string{"vertical", "up", "down"}[o] }

// Natural returns the convection coefficient in W/(m² K) of a face in still air, for
// a rise in K (of either sign) over the air and a length in m: the height of a
// vertical face, 4 A/p of a horizontal one. Laminar, air near sea level:
// 1.42, 1.32 (hot side up) and 0.59 (hot side down) times (rise/length)^(1/4).
// Thinner air carries less: the Rayleigh number goes with the density squared, so h
// goes with its root.
//
// Source: simplified laminar relations for air in textbooks (Çengel; Holman).
func Natural(o Orientation, rise, length, altitude float64) float64 {
	return natural(o, rise, length) * math.Sqrt(RelativeDensity(altitude))
}

func natural(o Orientation, rise, length float64) float64 {
	c := [...]float64{Vertical: 1.42, Up: 1.32, Down: 0.59}[o]
	return c * math.Sqrt(math.Sqrt(math.Abs(rise)/length))
}

// Forced returns the mean convection coefficient in W/(m² K) of a flat face with
// air of a speed in m/s along a length in m: laminar boundary layer,
// Nu = 0.664 Re^(1/2) Pr^(1/3), good up to Re = 5e5 (10 cm at 90 m/s) and low for
// the turbulent air of a real fan, which is cautious.
//
// Source: E. Pohlhausen 1921, as in every textbook of heat transfer.
func Forced(speed, length float64, air Air) float64 {
	return 0.664 * math.Sqrt(speed*length/air.Viscosity) * math.Cbrt(air.Prandtl) * air.Conductivity / length
}

// together joins natural and forced convection: the third root of the sum of
// cubes (S. W. Churchill, AIChE Journal 23, 1977, for assisting flow).
func together(natural, forced float64) float64 {
	return math.Cbrt(natural*natural*natural + forced*forced*forced)
}

// ChurchillChu returns the Nusselt number of a vertical plate for a Rayleigh and a
// Prandtl number, for laminar flow alone (Ra below 1e9) and for every Ra. It is the
// full correlation beside the simplified relation of Natural.
//
// Source: S. W. Churchill, H. H. S. Chu, Int. J. Heat Mass Transfer 18, 1975.
func ChurchillChu(rayleigh, prandtl float64) (laminar, all float64) {
	p := 1 + math.Pow(0.492/prandtl, 9.0/16)
	laminar = 0.68 + 0.670*math.Pow(rayleigh, 0.25)/math.Pow(p, 4.0/9)
	root := 0.825 + 0.387*math.Pow(rayleigh, 1.0/6)/math.Pow(p, 8.0/27)
	return laminar, root * root
}

// Rayleigh returns the Rayleigh number of a face for a rise in K, a length in m and
// a film temperature in °C.
func Rayleigh(rise, length, film float64, air Air) float64 {
	return gravity * math.Abs(rise) * length * length * length / ((film + zeroCelsius) * air.Viscosity * air.Diffusivity)
}

// Radiation returns the heat flux in W/m² that a grey face of a temperature sends to
// surroundings of another, both in °C.
func Radiation(emissivity, face, around float64) float64 {
	a, b := face+zeroCelsius, around+zeroCelsius
	// (a⁴ - b⁴) in a form that keeps its digits for small differences.
	return emissivity * stefanBoltzmann * (a - b) * (a + b) * (a*a + b*b)
}
