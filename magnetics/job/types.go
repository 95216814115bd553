// Package job reads and checks what the engineer brings: the job file (tank,
// corners, build limits) and the build file (the parts as decided), and writes
// the build file.
//
// The structs of this package are the one description of the files: their tags
// name the key, the unit, the default with the mark of its origin, the words
// that are allowed and the help text. The reader, the starter file, the JSON
// Schema and the list of defaults are all made from them by corelib/document.
//
// Everything in a Job is coherent SI, temperatures in °C, rises in K, shares
// and tolerances as plain ratios.
package job

import (
	"gapwright/corelib/document"
	"gapwright/tank"
)

// A Job is a settled resonant tank, the corners it has to serve and what limits
// the parts that are to be built for it.
type Job struct {
	Title      string
	PartNumber string
	Revision   string
	Tank       tank.Tank
	Corners    []tank.Corner
	Build      Build

	record *document.Record // where each value came from; nil for a Job made in code
}

// The parts that limits can be stated for.
const (
	Transformer = "transformer"
	Inductor    = "inductor"
)

// jobFile is the job as the file holds it.
type jobFile struct {
	Format     int      `key:"format" required:"yes" example:"1" help:"version of this file format"`
	Title      string   `key:"title" example:"Supply, 48 V 400 W" help:"one line for the title block of the sheets"`
	PartNumber string   `key:"part_number" example:"T1" help:"your number for the pair of parts"`
	Revision   string   `key:"revision" example:"A"`
	Tank       tankFile `key:"tank" required:"yes" help:"the settled tank; all values referred to the primary"`
	Corners    []corner `key:"corners" required:"yes" style:"flow" help:"the operating points that the parts must serve" example:"{name: nominal, input_voltage: 390 V, output_voltage: 48 V, output_current: 8.4 A, share: 70 %}\n{name: light, input_voltage: 410 V, output_voltage: 48 V, output_power: 40 W}\n{name: hold-up, input_voltage: 320 V, output_voltage: 48 V, output_current: 8.4 A, duration: 20 ms}"`
	Build      Build    `key:"build" help:"limits, cores, gap, wires, insulation, tolerances, tests; every key is optional"`
}

// tankFile has the fields of tank.Tank in the same order, so that one converts
// into the other and neither can grow a field alone.
type tankFile struct {
	Bridge               tank.Bridge    `key:"bridge" required:"yes" oneof:"half-bridge|full-bridge" example:"half-bridge"`
	Rectifier            tank.Rectifier `key:"rectifier" required:"yes" oneof:"center-tapped|full-bridge|voltage-doubler" example:"center-tapped"`
	TurnsRatio           float64        `key:"turns_ratio" required:"yes" example:"4" help:"primary turns per turn of ONE secondary winding, as the tank needs it"`
	Lr                   float64        `key:"resonant_inductance" unit:"H" required:"yes" example:"60 uH"`
	Cr                   float64        `key:"resonant_capacitance" unit:"F" required:"yes" example:"44 nF"`
	Lm                   float64        `key:"magnetizing_inductance" unit:"H" example:"400 uH" help:"left out: series-LC tank"`
	RectifierDrop        float64        `key:"rectifier_drop" unit:"V" zero:"ok" default:"0 mV" help:"of one rectifier"`
	RectifierResistance  float64        `key:"rectifier_resistance" unit:"ohm" zero:"ok" default:"0 ohm" example:"4 mohm" help:"of one rectifier, on top of the drop; kept when the rated winding replaces secondary_resistance"`
	BridgeResistance     float64        `key:"bridge_resistance" unit:"ohm" zero:"ok" default:"0 ohm" example:"120 mohm" help:"of the conducting bridge path; kept"`
	CapacitorResistance  float64        `key:"capacitor_resistance" unit:"ohm" zero:"ok" default:"0 ohm" help:"of the resonant capacitor and its layout; kept"`
	PrimaryResistance    float64        `key:"primary_resistance" unit:"ohm" zero:"ok" default:"0 ohm" help:"before the magnetics are known; replaced by the rated parts afterwards"`
	SecondaryResistance  float64        `key:"secondary_resistance" unit:"ohm" zero:"ok" default:"0 ohm" help:"of one secondary winding; likewise"`
	StrayInductance      float64        `key:"stray_inductance" unit:"H" zero:"ok" default:"0 nH" help:"layout of one secondary loop"`
	NodeCapacitance      float64        `key:"node_capacitance" unit:"F" zero:"ok" default:"0 pF" example:"300 pF" help:"of ONE bridge node to ground, both switches together, charge-equivalent"`
	WindingCapacitance   float64        `key:"-"`
	RectifierCapacitance float64        `key:"rectifier_capacitance" unit:"F" zero:"ok" default:"0 pF" help:"of one rectifier"`
	DeadTime             float64        `key:"dead_time" unit:"s" zero:"ok" default:"0 ns" example:"200 ns" help:"0: ideal edges, soft switching is not assessed"`
	FrequencyMin         float64        `key:"frequency_min" unit:"Hz" required:"yes" example:"60 kHz"`
	FrequencyMax         float64        `key:"frequency_max" unit:"Hz" required:"yes" example:"250 kHz"`
}

// corner has the fields of tank.Corner, as tankFile has those of tank.Tank.
type corner struct {
	Name           string  `key:"name" required:"yes" example:"nominal"`
	InputVoltage   float64 `key:"input_voltage" unit:"V" required:"yes" example:"390 V"`
	OutputVoltage  float64 `key:"output_voltage" unit:"V" example:"48 V" help:"with a load; the frequency is found"`
	OutputCurrent  float64 `key:"output_current" unit:"A" example:"8.4 A"`
	OutputPower    float64 `key:"output_power" unit:"W"`
	LoadResistance float64 `key:"load_resistance" unit:"ohm"`
	Frequency      float64 `key:"frequency" unit:"Hz" help:"with load_resistance; the output is found"`
	Share          float64 `key:"share" unit:"%" most:"100 %" help:"part of the operating time; unstated shares split the rest"`
	Duration       float64 `key:"duration" unit:"s" help:"a passing state: currents, flux and soft switching count, heat does not"`
}

// Build says what may be built. A nil pointer means "not limited" (for
// insulation: "not stated").
type Build struct {
	Objective        Objective    `key:"objective" default:"smallest" help:"smallest | least-loss | lightest | {loss: 1, volume: 1, mass: 0}, weights of value over best value"`
	ResonantInductor string       `key:"resonant_inductor" default:"separate" oneof:"separate|leakage|either" help:"leakage: no second part, the transformer's leakage makes the resonant inductance"`
	Library          []string     `key:"library" default:"[]" help:"folders with your own rows; later ones win"`
	Surroundings     Surroundings `key:"surroundings"`
	Limits           Limits       `key:"limits"`
	Cores            Cores        `key:"cores"`
	Gap              Gap          `key:"gap"`
	Wires            Wires        `key:"wires"`
	Insulation       Insulation   `key:"insulation"`

	Transformer TransformerLimits `key:"transformer" help:"every key of limits, cores, gap, wires, insulation may be repeated here and then holds for the transformer only"`
	Inductor    InductorLimits    `key:"inductor" help:"likewise for the resonant inductor"`

	Tolerances Tolerances `key:"tolerances" help:"each is +/- unless a pair [down, up] is given"`
	Tests      Tests      `key:"tests"`
	Sheet      Sheet      `key:"sheet"`
}

// PartLimits are the sections of Build that may differ from part to part,
// merged for one part.
type PartLimits struct {
	Limits     Limits     `key:"limits" from:"parent"`
	Cores      Cores      `key:"cores" from:"parent"`
	Gap        Gap        `key:"gap" from:"parent"`
	Wires      Wires      `key:"wires" from:"parent"`
	Insulation Insulation `key:"insulation" from:"parent"`
}

// For returns the limits that hold for Transformer or Inductor. It panics for
// any other part.
func (b Build) For(part string) PartLimits {
	switch part {
	case Transformer:
		return b.Transformer.PartLimits
	case Inductor:
		return b.Inductor.PartLimits
	}
	panic("job: no part is called " + part)
}

// An Objective is a word or, with an empty word, weights of value over best value.
type Objective struct {
	Word   string  `key:"-" form:"scalar" oneof:"smallest|least-loss|lightest"`
	Loss   float64 `key:"loss" zero:"ok" default:"0" help:"weight of the loss of both parts"`
	Volume float64 `key:"volume" zero:"ok" default:"0" help:"weight of the outline volume of both parts"`
	Mass   float64 `key:"mass" zero:"ok" default:"0" help:"weight of the mass of both parts"`
}

// Surroundings is what the parts are cooled by.
type Surroundings struct {
	AmbientTemperature  float64 `key:"ambient_temperature" unit:"degC" default:"40 degC" mark:"CP depends on the box" help:"air around the parts, not of the room"`
	Altitude            float64 `key:"altitude" unit:"m" default:"2000 m" mark:"PUB IEC 60664-1" help:"for clearances and convection"`
	Air                 string  `key:"air" default:"still" oneof:"still|moving"`
	AirSpeed            float64 `key:"air_speed" unit:"m/s" default:"1 m/s" when:"air=moving"`
	HeatPath            float64 `key:"heat_path" unit:"W/K" zero:"ok" default:"0 W/K" help:"extra path from the core to a wall (pad, potting); 0: none"`
	HeatPathTemperature float64 `key:"heat_path_temperature" unit:"degC" default:"=ambient_temperature" example:"40 degC" help:"of that wall"`
}

// Limits are the bounds of the verdicts; the keys are their names there.
type Limits struct {
	WindingTemperature  float64     `key:"winding_temperature" unit:"degC" default:"120 degC" mark:"MEM class B of IEC 60085 is 130 degC" help:"hot spot; must not exceed the class of the weakest material"`
	CoreTemperature     float64     `key:"core_temperature" unit:"degC" default:"110 degC" mark:"CP 100..110"`
	HotSpotAllowance    float64     `key:"hot_spot_allowance" unit:"K" default:"10 K" mark:"CP 10..15" help:"added to the mean winding temperature"`
	FluxShare           float64     `key:"flux_share" unit:"%" most:"100 %" default:"75 %" mark:"CP about 300 mT in PW3" help:"largest peak of any corner over Bs at core_temperature"`
	CurrentLimit        *float64    `key:"current_limit" unit:"A" default:"absent" example:"7.5 A" help:"peak primary current at which the controller trips; both parts stay below overload_flux_share there"`
	OverloadFluxShare   float64     `key:"overload_flux_share" unit:"%" most:"100 %" default:"90 %" help:"of Bs, hot, at current_limit; without current_limit 1.5 times the largest steady peak is used"`
	GainMargin          float64     `key:"gain_margin" unit:"%" default:"10 %" help:"peak output over wanted output at the same load resistance, as built"`
	PeakFrequencyMargin float64     `key:"peak_frequency_margin" unit:"%" default:"5 %" mark:"CP 5..10" help:"operating frequency over the frequency of peak gain"`
	SoftSwitchingMargin float64     `key:"soft_switching_margin" unit:"%" most:"100 %" default:"20 %" help:"part of the dead time left when the swing completes"`
	RatioError          float64     `key:"ratio_error" unit:"%" default:"2 %" help:"effective turns ratio as built against turns_ratio"`
	ResonanceError      float64     `key:"resonance_error" unit:"%" default:"3 %" help:"resonant inductance as built against the tank's, before tolerances"`
	MagnetizingError    float64     `key:"magnetizing_error" unit:"%" default:"1 %" help:"the same for the magnetizing inductance; with stock spacers 5 %"`
	HalfMismatch        float64     `key:"half_mismatch" unit:"%" default:"5 %" help:"difference of the short-circuit inductances of the two halves over their mean, center tap"`
	TotalLoss           *float64    `key:"total_loss" unit:"W" default:"absent" help:"both parts, weighted by share"`
	CurrentDensity      float64     `key:"current_density" unit:"A/mm2" default:"8 A/mm2" mark:"PUB range 4..10, AN-22" help:"a warning, never a rejection: loss and rise decide"`
	CopperACFactor      *float64    `key:"copper_ac_factor" default:"absent" help:"AC over DC resistance per winding; a warning only"`
	Height              *float64    `key:"height" unit:"m" default:"absent" example:"50 mm" help:"of each part above the board, with former and stand-off"`
	Footprint           *[2]float64 `key:"footprint" unit:"m" default:"absent" example:"[60 mm, 50 mm]"`
	Mass                *float64    `key:"mass" unit:"kg" default:"absent" example:"250 g"`
}

// Cores says which rows of the core and material tables may be used.
type Cores struct {
	Families   []string `key:"families" default:"[ETD, PQ, RM, E, EFD, ER, EQ, EP, P]" help:"shape families of IEC 63093; planar E, U and low types only when named"`
	Shapes     []string `key:"shapes" default:"[]" help:"exact names; when given, families are ignored"`
	Excluded   []string `key:"excluded" default:"[]" help:"exact names that must not be used"`
	Confidence string   `key:"confidence" default:"D" oneof:"A|B|C|D" help:"worst confidence letter admitted; D: dimension not proven"`
	Materials  []string `key:"materials" default:"[PW3]" help:"classes of IEC 61332 or your own rows"`
	Former     string   `key:"former" default:"required" oneof:"required|derived|none" help:"derived: a rule supplies the dimensions of a missing coil former"`
	Clamping   string   `key:"clamping" default:"clip" oneof:"clip|tape|glue"`
}

// Gap says how the air gap may be made.
type Gap struct {
	Kind          string    `key:"kind" default:"ground" oneof:"ground|spacer|either" help:"ground: post of one half; spacer: foil under all legs"`
	PiecesMax     int       `key:"pieces_max" default:"3" help:"ground only; each piece beyond the first costs a gapped half or a disc"`
	LengthMin     float64   `key:"length_min" unit:"m" default:"0.05 mm" mark:"PUB AN-18" help:"of all pieces together"`
	LengthMax     float64   `key:"length_max" unit:"m" default:"1.5 mm" mark:"CP 1..1.5 mm or a tenth of the smaller post dimension, whichever is less" help:"per piece"`
	Governs       string    `key:"governs" default:"A_L" oneof:"A_L|length" mark:"PUB gapped-core ordering note" help:"which of the two the shop obeys, never both"`
	ClearDistance float64   `key:"clear_distance" default:"2.5" mark:"CP 2..3" help:"copper not nearer to a gap piece than this many of its lengths"`
	SpacerFoils   []float64 `key:"spacer_foils" unit:"m" bare:"mm" default:"[0.05 mm, 0.075 mm, 0.1 mm, 0.125 mm, 0.19 mm, 0.25 mm, 0.35 mm, 0.5 mm]" mark:"CP" help:"foils in stock"`
	GlueLine      float64   `key:"glue_line" unit:"m" default:"10 um" mark:"CP 10..30 um" help:"per pair of mating faces"`
}

// Wires says what the shop can wind.
type Wires struct {
	Kinds          []string   `key:"kinds" default:"[litz, solid, foil]" oneof:"litz|solid|foil"`
	Stock          []string   `key:"stock" default:"[]" help:"wires as text, such as 120 x 0.1 mm litz, 0.5 mm grade 2, 0.2 mm foil; when given nothing else is used"`
	SecondChoice   bool       `key:"second_choice" default:"true" help:"print the next best wire with its loss penalty"`
	LitzStrands    []float64  `key:"litz_strands" unit:"m" default:"[0.05 mm, 0.071 mm, 0.1 mm]" help:"strand diameters"`
	LitzCounts     string     `key:"litz_counts" default:"usual" oneof:"usual|any"`
	LitzStrandsMax int        `key:"litz_strands_max" default:"600"`
	LitzServing    string     `key:"litz_serving" default:"single" oneof:"none|single|double"`
	StrandGrade    int        `key:"strand_grade" default:"1" oneof:"1|2|3" help:"IEC 60317 grade of the strand enamel"`
	SolidDiameters [2]float64 `key:"solid_diameters" unit:"m" form:"range" default:"[0.2 mm, 1.6 mm]"`
	SolidGrade     int        `key:"solid_grade" default:"2" oneof:"1|2|3"`
	FoilThickness  []float64  `key:"foil_thickness" unit:"m" word:"usual" default:"usual" help:"usual, or a list"`
	ParallelMax    int        `key:"parallel_max" default:"4" help:"wires in hand per winding; each on its own pin or lead"`
	Bulge          Bulge      `key:"bulge" style:"flow" help:"height allowance"`
	HeightLeftMin  float64    `key:"height_left_min" unit:"m" default:"0.3 mm" help:"after bulge"`
	BendRadius     float64    `key:"bend_radius" default:"4" mark:"CP" help:"smallest corner radius in wire diameters"`
}

// Bulge is the height allowance over the sum of the layers.
type Bulge struct {
	Litz  float64 `key:"litz" unit:"%" default:"12 %" mark:"CP 10..15 % for litz"`
	Solid float64 `key:"solid" unit:"%" default:"5 %" mark:"CP"`
	Foil  float64 `key:"foil" unit:"%" default:"10 %" mark:"CP"`
}

// Insulation states what the user demands between primary and secondary. The
// figures are the user's; the program never invents a test voltage.
type Insulation struct {
	Grade                  string       `key:"grade" default:"absent" absent:"not stated" oneof:"functional|basic|reinforced" example:"reinforced" help:"must be stated when any corner's input is above 60 V"`
	WorkingVoltage         *float64     `key:"working_voltage" unit:"V" default:"absent" absent:"not stated" example:"250 V" help:"rms, as measured or estimated by you"`
	WorkingVoltagePeak     *float64     `key:"working_voltage_peak" unit:"V" default:"absent" absent:"not stated" example:"420 V"`
	Mains                  *Mains       `key:"mains" style:"flow" default:"absent" absent:"not stated" example:"{voltage: 230 V, overvoltage_category: II}"`
	PollutionDegree        int          `key:"pollution_degree" default:"2" oneof:"1|2|3"`
	MaterialGroup          string       `key:"material_group" default:"IIIa" oneof:"I|II|IIIa|IIIb"`
	Creepage               *float64     `key:"creepage" unit:"m" default:"absent" absent:"not stated" example:"6.4 mm" help:"your figure rules; absent with grade stated: table figure, marked as a proposal"`
	Clearance              *float64     `key:"clearance" unit:"m" default:"absent" absent:"not stated" example:"4 mm" help:"likewise"`
	Build                  string       `key:"build" default:"either" oneof:"margins|insulated-wire|either" help:"margins: on each side half the creepage, both windings, margin tape to winding height"`
	InsulatedWinding       string       `key:"insulated_winding" default:"either" oneof:"primary|secondary|either" help:"which one gets triple-insulated wire"`
	BarrierLayers          int          `key:"barrier_layers" default:"3" mark:"CP where reinforced" help:"tape layers between primary and secondary with margins"`
	BarrierLayersInsulated int          `key:"barrier_layers_insulated" default:"1" help:"with triple-insulated wire"`
	Tape                   float64      `key:"tape" unit:"m" default:"0.056 mm" help:"polyester with adhesive"`
	InterlayerLayers       int          `key:"interlayer_layers" zero:"ok" default:"1"`
	OuterLayers            int          `key:"outer_layers" default:"2"`
	SleevingWall           float64      `key:"sleeving_wall" unit:"m" default:"0.41 mm" mark:"PUB AN-17, for its safety case" help:"leads crossing a margin"`
	CoreCountsAs           string       `key:"core_counts_as" default:"primary" oneof:"primary|secondary|floating" help:"which side the core and its clip belong to"`
	Screen                 string       `key:"screen" default:"none" oneof:"none|one" help:"one: copper foil 0.05 mm, one open turn, to primary ground"`
	TestVoltages           TestVoltages `key:"test_voltages" style:"flow" help:"yours; rows without a figure are printed empty: volts by customer"`
}

// Mains is the supply network that the primary side belongs to.
type Mains struct {
	Voltage             float64 `key:"voltage" unit:"V" required:"yes" example:"230 V"`
	OvervoltageCategory string  `key:"overvoltage_category" required:"yes" oneof:"I|II|III|IV" example:"II"`
}

// TestVoltages are the user's hipot figures; nil: by customer.
type TestVoltages struct {
	PrimarySecondary *float64 `key:"primary_secondary" unit:"V" default:"absent" absent:"not stated" example:"3000 V"`
	PrimaryCore      *float64 `key:"primary_core" unit:"V" default:"absent" absent:"not stated" example:"1500 V"`
	SecondaryCore    *float64 `key:"secondary_core" unit:"V" default:"absent" absent:"not stated" example:"500 V"`
	Kind             string   `key:"kind" default:"absent" absent:"not stated" oneof:"AC|DC" example:"AC"`
	Time             *float64 `key:"time" unit:"s" default:"absent" absent:"not stated" example:"60 s"`
}

// TransformerLimits are the keys of the transformer alone.
type TransformerLimits struct {
	Arrangements         []string     `key:"arrangements" default:"[P-S, S-P, P/2-S-P/2, S/2-P-S/2, sections]" oneof:"P-S|S-P|P/2-S-P/2|S/2-P-S/2|sections" help:"innermost first; sections: side by side on a two-chamber former"`
	Halves               string       `key:"halves" default:"either" oneof:"bifilar|stacked|either" help:"of a center tap; bifilar: both in one layer"`
	SecondaryParallelMax int          `key:"secondary_parallel_max" default:"4" help:"parallel windings of each half"`
	SecondaryTurns       [2]int       `key:"secondary_turns" form:"range" default:"[1, 24]"`
	PrimaryTurns         [2]int       `key:"primary_turns" form:"range" default:"[4, 120]"`
	BarrierExtra         [2]float64   `key:"barrier_extra" unit:"m" zero:"ok" form:"range" default:"[0 mm, 3 mm]" help:"free distance when leakage makes the resonant inductance"`
	Impregnation         string       `key:"impregnation" default:"none" oneof:"none|dip|vacuum"`
	Terminations         Terminations `key:"terminations" style:"flow"`
	PinCurrentMax        float64      `key:"pin_current_max" unit:"A" default:"6 A" mark:"CP depends on the pin" help:"rms per pin; above: pins in parallel, then leads"`
	PinWireMax           float64      `key:"pin_wire_max" unit:"m" default:"1.2 mm" mark:"CP" help:"bundle diameter that a pin takes; above: leads"`
	PartLimits           `form:"flat"`
}

// Terminations say how each side leaves the transformer.
type Terminations struct {
	Primary   string `key:"primary" default:"pins" oneof:"pins|leads|either"`
	Secondary string `key:"secondary" default:"either" oneof:"pins|leads|either"`
}

// InductorLimits are the keys of the inductor alone.
type InductorLimits struct {
	Arrangements []string             `key:"arrangements" default:"[P]" oneof:"P" help:"one winding; its free distance from the post is searched up to half the window"`
	Turns        [2]int               `key:"turns" form:"range" default:"[4, 80]"`
	Impregnation string               `key:"impregnation" default:"none" oneof:"none|dip|vacuum"`
	Terminations InductorTerminations `key:"terminations" style:"flow"`
	PartLimits   `form:"flat"`
}

// InductorTerminations say how the inductor's winding ends.
type InductorTerminations struct {
	Primary string `key:"primary" default:"pins" oneof:"pins|leads|either"`
}

// Tolerances are used by the limits on the sheet, by readback and by yield. A
// pair holds the distance down and up, both positive.
type Tolerances struct {
	OpenInductance      [2]float64     `key:"open_inductance" unit:"%" zero:"ok" form:"spread" default:"7 %" mark:"CP 10 normal, 7 good, 5 needs a controlled A_L"`
	ShortInductance     ShortTolerance `key:"short_inductance" style:"flow"`
	InductorInductance  [2]float64     `key:"inductor_inductance" unit:"%" zero:"ok" form:"spread" default:"5 %" mark:"CP 5..7 %"`
	GapLength           GapTolerance   `key:"gap_length" style:"flow"`
	Permeability        [2]float64     `key:"permeability" unit:"%" zero:"ok" form:"spread" default:"25 %" mark:"PUB Ferroxcube, ungapped A_L"`
	CoreArea            [2]float64     `key:"core_area" unit:"%" zero:"ok" form:"spread" default:"3 %"`
	ResonantCapacitance [2]float64     `key:"resonant_capacitance" unit:"%" zero:"ok" form:"spread" default:"5 %" mark:"CP"`
	NodeCapacitance     [2]float64     `key:"node_capacitance" unit:"%" zero:"ok" form:"spread" default:"20 %"`
	DeadTime            [2]float64     `key:"dead_time" unit:"%" zero:"ok" form:"spread" default:"10 %"`
	DCResistance        DCTolerance    `key:"dc_resistance" style:"flow"`
}

// ShortTolerance is the tolerance of the short-circuit inductance by arrangement.
type ShortTolerance struct {
	Concentric [2]float64 `key:"concentric" unit:"%" zero:"ok" form:"spread" default:"12 %" mark:"CP"`
	Sandwich   [2]float64 `key:"sandwich" unit:"%" zero:"ok" form:"spread" default:"12 %" mark:"CP"`
	Sections   [2]float64 `key:"sections" unit:"%" zero:"ok" form:"spread" default:"8 %" mark:"CP"`
}

// GapTolerance is +/- Is for gaps up to UpTo, +/- Above beyond.
type GapTolerance struct {
	UpTo  float64 `key:"up_to" unit:"m" zero:"ok" default:"0.2 mm" mark:"PUB EPCOS/TDK gapped-half tables"`
	Is    float64 `key:"is" unit:"m" zero:"ok" default:"0.02 mm" mark:"PUB EPCOS/TDK gapped-half tables"`
	Above float64 `key:"above" unit:"m" zero:"ok" default:"0.05 mm" mark:"PUB EPCOS/TDK gapped-half tables"`
}

// DCTolerance bounds the DC resistance of a winding from above, and the
// differences that betray lost strands.
type DCTolerance struct {
	Up             float64 `key:"up" unit:"%" zero:"ok" default:"8 %"`
	HalfToHalf     float64 `key:"half_to_half" unit:"%" zero:"ok" default:"3 %" help:"catches lost strands"`
	SampleToSample float64 `key:"sample_to_sample" unit:"%" zero:"ok" default:"2 %" help:"catches lost strands"`
}

// Tests says how the shop measures.
type Tests struct {
	Frequency    float64 `key:"frequency" unit:"Hz" default:"100 kHz" help:"lowered to a tenth of the estimated self-resonance when that is less"`
	Level        float64 `key:"level" unit:"V" default:"100 mV"`
	Temperature  float64 `key:"temperature" unit:"degC" default:"25 degC"`
	Samples      int     `key:"samples" default:"5"`
	LpBeforeGlue bool    `key:"lp_before_glue" default:"true"`
}

// Sheet fills the title block of the winding sheets.
type Sheet struct {
	DecimalMark string `key:"decimal_mark" default:"point" oneof:"point|comma" help:"cell formats and printed text"`
	Owner       string `key:"owner" default:"\"\"" help:"title block, fields of ISO 7200"`
	CreatedBy   string `key:"created_by" default:"\"\""`
	ApprovedBy  string `key:"approved_by" default:"\"\""`
	Contact     string `key:"contact" default:"\"\""`
	Date        string `key:"date" default:"\"\"" help:"ISO 8601; left blank when empty, so that the same input gives the same bytes"`
}
