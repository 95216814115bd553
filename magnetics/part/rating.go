package part

import (
	"gapwright/corelib/material"
	"gapwright/corelib/shape"
	"gapwright/magnetics/winding"
)

// A Rating is what a part does: its inductances cold, its losses and
// temperatures at every corner, and how far each limit is away. Every figure
// is SI, temperatures in °C.
type Rating struct {
	Part    string // transformer or inductor
	Shape   shape.Shape
	Former  shape.Former
	Ferrite material.Ferrite
	Section winding.Section // the coil laid out in the window

	Arrangement string // P-S, P/2-S-P/2, ..., innermost first
	Windings    []WindingRating
	Gap         GapRating

	OpenInductance       float64   // H, of the first winding, all others open, 25 °C, mu_i of the table
	HotInductance        float64   // H, the same at the core temperature of the worst continuous corner
	SecondaryInductance  float64   // H, of one secondary winding, all others open
	ShortInductance      float64   // H, of the primary with one secondary shorted; center tap: mean of the halves
	ShortHalves          []float64 // H, the same for each secondary shorted alone
	MagnetizingInduct    float64   // H, of the tank's equivalent, all leakage on the primary, the part alone
	EffectiveTurnsRatio  float64   // of the tank's equivalent, the part alone
	SelfCapacitance      float64   // F, across the first winding, estimated
	InterwindingCapacity float64   // F, primary to secondary, estimated

	FluxDensityPeak float64 // T, over Amin, largest of all corners
	OverloadFlux    float64 // T, over Amin, at the current limit
	HeightLeft      float64 // m, of the window, bulge included
	Mass            float64 // kg, core, copper and former
	Volume          float64 // m3, of the outline
	Outline         [3]float64

	Corners  []CornerRating
	Verdicts []Verdict
	Warnings []Warning
	Models   []Model
	Checks   []HandCheck

	hotSpotAllowance float64 // K
	foils            int     // turns of foil solved together
	solidOrder       int     // highest multipole order of coupled solid wires; 0: none
}

// WindingRating is one electrical winding as rated.
type WindingRating struct {
	Name             string
	Turns            int
	Wire             string
	Parallel         int
	Layers           int
	DCResistance     float64 // ohm, at 20 °C
	ConductorArea    float64 // m2, of all parallel wires
	MeanLengthOfTurn float64 // m, over its sections
	CopperMass       float64 // kg
	CurrentDensity   float64 // A/m2, rms, largest continuous corner
	ACFactor         float64 // loss over I_rms^2 R_dc at the computed temperature, worst continuous corner
}

// GapRating is the gap with what the shop and the reviewer ask about it.
type GapRating struct {
	Length         float64 // m, sum of the pieces in the post; spacer: one stack
	PieceLength    float64 // m
	AL             float64 // H per turn squared
	Ungapped       float64 // H per turn squared, of the closed core
	Sensitivity    float64 // relative change of L per meter of gap, negative
	PlainLength    float64 // m, mu0 N^2 Ae/L - le/mu_i
	McLymanLength  float64 // m, with McLyman's fringing factor
	SpacerLength   float64 // m, stack under all legs that gives the same inductance
	ClearDistance  float64 // m, that copper should keep from a gap piece
	CopperDistance float64 // m, that the nearest copper keeps
	LengthMax      float64 // m, per piece, that bounds it
}

// CornerRating is one corner of the tank as the part sees it.
type CornerRating struct {
	Name               string
	Continuous         bool
	CoreLoss           float64 // W
	WindingLoss        []float64
	PrimaryLoss        float64 // W
	SecondaryLoss      float64 // W, both halves; 0 in an inductor
	FluxDensityPeak    float64 // T, over Amin, the larger of under-primary and under-secondary
	CoreTemperature    float64 // °C; of continuous corners only
	WindingTemperature float64 // °C, hot spot
	Runaway            bool
	PrimaryResistance  float64 // ohm, loss over I_rms^2, for the tank
	SecondResistance   float64 // ohm, of one secondary winding, on its own side
}

// Loss returns the total loss of the part at the corner in W.
func (c CornerRating) Loss() float64 { return c.CoreLoss + c.PrimaryLoss + c.SecondaryLoss }

// A Verdict is one limit of the job held against its value.
type Verdict struct {
	Part   string  `json:"part"`   // transformer, inductor or tank
	Corner string  `json:"corner"` // empty for a limit of the whole part
	Limit  string  `json:"limit"`  // key of the job's build section
	Value  float64 `json:"value"`
	Bound  float64 `json:"bound"`
	Unit   string  `json:"unit"`
	Sense  string  `json:"sense"` // max or min
	Pass   bool    `json:"pass"`
}

// NewVerdict holds value against bound; sense is max or min.
func NewVerdict(part, corner, limit string, value, bound float64, unit, sense string) Verdict {
	v := Verdict{Part: part, Corner: corner, Limit: limit, Value: value, Bound: bound, Unit: unit, Sense: sense}
	if sense == "max" {
		v.Pass = value <= bound
	} else {
		v.Pass = value >= bound
	}
	return v
}

// A Warning is something the reader should know that is not a missed limit.
type Warning struct {
	Code string `json:"code"` // W101 ...; the first digit says where to look
	Text string `json:"text"`
}

// A Model names where a figure comes from.
type Model struct {
	Quantity string `json:"quantity"`
	Model    string `json:"model"`
	Source   string `json:"source"`
}

// A HandCheck is a figure that an engineer can compute on paper, beside the
// full model's value.
type HandCheck struct {
	Quantity string  `json:"quantity"`
	Formula  string  `json:"formula"`
	Hand     float64 `json:"hand"`
	Model    float64 `json:"model"`
	Unit     string  `json:"unit"`
	Expect   float64 `json:"expected_difference"` // relative difference that needs no explanation
	Note     string  `json:"note"`                // a sentence when they differ by more
}
