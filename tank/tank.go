package tank

// Bridge is the primary half of the converter.
type Bridge string

// The bridges that can drive the tank.
const (
	HalfBridge Bridge = "half-bridge"
	FullBridge Bridge = "full-bridge"
)

// Rectifier is the secondary half of the converter.
type Rectifier string

// The rectifiers that can load the tank. They are driven rectifiers or diodes;
// only the drop and the resistance of one of them count.
const (
	CenterTapped        Rectifier = "center-tapped"
	FullBridgeRectifier Rectifier = "full-bridge"
	VoltageDoubler      Rectifier = "voltage-doubler"
)

// A Tank is the resonant tank with the bridge and the rectifier around it. All
// values are referred to the primary unless a comment says otherwise.
type Tank struct {
	Bridge               Bridge
	Rectifier            Rectifier
	TurnsRatio           float64 // primary turns per turn of ONE secondary winding, as the tank needs it
	Lr                   float64 // H, total series resonant inductance
	Cr                   float64 // F
	Lm                   float64 // H; 0: series-LC tank, solved with 10,000 Lr
	RectifierDrop        float64 // V, of one rectifier
	RectifierResistance  float64 // ohm, of one rectifier, on top of the drop
	BridgeResistance     float64 // ohm, of the conducting bridge path
	CapacitorResistance  float64 // ohm, of Cr and its layout
	PrimaryResistance    float64 // ohm
	SecondaryResistance  float64 // ohm, of one secondary winding, on the secondary side
	StrayInductance      float64 // H, layout of one secondary loop, on the secondary side; already part of Lr
	NodeCapacitance      float64 // F, of ONE bridge node to ground, both switches together, charge-equivalent
	WindingCapacitance   float64 // F, across the primary, added to the node one to one
	RectifierCapacitance float64 // F, of one rectifier, on the secondary side
	DeadTime             float64 // s; 0: ideal edges
	FrequencyMin         float64 // Hz
	FrequencyMax         float64 // Hz
}

// A Corner is one operating point asked for: an output voltage with a load (the
// frequency is found), or a frequency with a load resistance (the output is
// found). A field that was not given is zero.
type Corner struct {
	Name           string
	InputVoltage   float64 // V
	OutputVoltage  float64 // V
	OutputCurrent  float64 // A
	OutputPower    float64 // W
	LoadResistance float64 // ohm
	Frequency      float64 // Hz
	Share          float64 // part of the operating time, 0..1; of continuous corners only
	Duration       float64 // s; above 0: a passing state, whose heat does not count
}
