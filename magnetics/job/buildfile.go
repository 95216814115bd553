package job

import (
	"gapwright/corelib/document"
	"gapwright/magnetics/part"
)

// A BuildFile is what was decided: the job and both parts, and nothing that can
// be computed from them.
type BuildFile struct {
	MadeWith    string // program and tables that wrote it, for information
	Job         Job
	Transformer part.Transformer
	Inductor    *part.Inductor // nil: the leakage of the transformer is the resonant inductor

	record *document.Record // nil for a BuildFile made in code
}

// buildDocument is the build file as it stands on disk.
type buildDocument struct {
	Format      int             `key:"format" required:"yes" example:"1"`
	MadeWith    string          `key:"made_with"`
	Job         jobFile         `key:"job" required:"yes"`
	Transformer transformerFile `key:"transformer" required:"yes"`
	Inductor    *inductorFile   `key:"inductor" required:"yes" word:"none"`
}

// construction is what both parts have in common.
type construction struct {
	Core         coreFile         `key:"core" required:"yes"`
	Former       formerFile       `key:"former" style:"flow" required:"yes"`
	Windings     []windingFile    `key:"windings" style:"flow" required:"yes"`
	Build        []entryFile      `key:"build" style:"flow" required:"yes"`
	Impregnation impregnationFile `key:"impregnation" style:"flow"`
	Glue         glueFile         `key:"glue" style:"flow"`
	Terminations endsFile         `key:"terminations" style:"flow"`
}

type transformerFile struct {
	construction `form:"embedded"`
	Meets        transformerMeets `key:"meets"`
	Tests        testsFile        `key:"tests"`
}

type inductorFile struct {
	construction `form:"embedded"`
	Meets        inductorMeets `key:"meets"`
	Tests        testsFile     `key:"tests"`
}

type coreFile struct {
	Shape    string  `key:"shape" required:"yes" example:"ETD 39/20/13"`
	Material string  `key:"material" required:"yes" example:"PW3"`
	Pieces   int     `key:"pieces"`
	Clamping string  `key:"clamping" oneof:"clip|tape|glue"`
	Gap      gapFile `key:"gap" style:"flow" required:"yes"`
}

type gapFile struct {
	Kind      string    `key:"kind" required:"yes" oneof:"ground|spacer|none" example:"ground"`
	Total     float64   `key:"total" unit:"mm"`
	Pieces    int       `key:"pieces"`
	Positions []float64 `key:"positions" unit:"mm"`
	Half      string    `key:"half" oneof:"upper|lower|both"`
	Governs   string    `key:"governs" oneof:"A_L|length"`
	Thickness float64   `key:"thickness" unit:"mm"`
	Foils     []float64 `key:"foils" unit:"mm"`
	Under     string    `key:"under"`
}

type formerFile struct {
	Name     string  `key:"name" required:"yes" example:"ETD 39/20/13"`
	Chambers int     `key:"chambers"`
	Pins     int     `key:"pins" zero:"ok"`
	Mounting string  `key:"mounting"`
	Wall     float64 `key:"wall" unit:"mm" zero:"ok"`
	PinsCut  []int   `key:"pins_cut"`
}

type windingFile struct {
	Name     string   `key:"name" required:"yes" example:"P"`
	Turns    int      `key:"turns" required:"yes" example:"32"`
	Start    []string `key:"start" form:"many"`
	Finish   []string `key:"finish" form:"many"`
	Parts    []string `key:"parts" form:"many"`
	JoinedAt string   `key:"joined_at"`
}

// entryFile is one step of the work. Exactly one of wind, tape, screen, space
// says which.
type entryFile struct {
	Wind      []string   `key:"wind" form:"many"`
	Tape      string     `key:"tape"`
	Screen    string     `key:"screen"`
	Space     float64    `key:"space" unit:"mm"`
	Of        []string   `key:"of" form:"many"`
	Turns     int        `key:"turns"`
	Wire      string     `key:"wire"`
	Serving   string     `key:"serving" oneof:"none|single|double"`
	Parallel  int        `key:"parallel"`
	Layers    int        `key:"layers"`
	Spread    string     `key:"spread" oneof:"full|close"`
	Direction string     `key:"direction" oneof:"cw|ccw"`
	Lay       string     `key:"lay" oneof:"C|Z"`
	Margins   [2]float64 `key:"margins" unit:"mm" zero:"ok"`
	Insulated string     `key:"insulated" oneof:"triple"`
	Sleeving  string     `key:"sleeving"`
	Width     string     `key:"width"`
	Interleaf float64    `key:"interleaf" unit:"mm" zero:"ok" help:"insulation wound in with every turn of a foil"`
	Overlap   float64    `key:"overlap" unit:"mm" zero:"ok"`
	Purpose   string     `key:"purpose" oneof:"barrier|interlayer|finish|margin"`
	Leads     leadsFile  `key:"leads" style:"flow"`
	To        string     `key:"to"`
	Ends      string     `key:"ends"`
	Chamber   int        `key:"chamber"`
}

// leadsFile is a text, or material and how it is soldered.
type leadsFile struct {
	Words    string `key:"-" form:"scalar"`
	Material string `key:"material" required:"yes" example:"1.0 x 6 mm copper strip"`
	Soldered string `key:"soldered" required:"yes" example:"both ends"`
}

type impregnationFile struct {
	Kind string `key:"kind" oneof:"none|dip|vacuum"`
	When string `key:"when"`
}

type glueFile struct {
	Faces     string `key:"faces"`
	OuterLegs string `key:"outer_legs"`
	Cure      string `key:"cure"`
}

type endsFile struct {
	Primary    string  `key:"primary" oneof:"pins|leads"`
	Secondary  string  `key:"secondary" oneof:"pins|leads"`
	LeadLength float64 `key:"lead_length" unit:"mm" zero:"ok"`
	Tin        string  `key:"tin"`
}

type transformerMeets struct {
	OpenInductance  *requirementFile `key:"open_inductance" style:"flow"`
	ShortInductance *requirementFile `key:"short_inductance" style:"flow"`
}

type inductorMeets struct {
	Inductance *requirementFile `key:"inductance" style:"flow"`
}

type requirementFile struct {
	Pins      []string `key:"pins" form:"many"`
	Value     float64  `key:"value" unit:"uH" required:"yes"`
	Tolerance float64  `key:"tolerance" unit:"%" zero:"ok" required:"yes" example:"7 %"`
}

type testsFile struct {
	PrimarySecondary string `key:"primary_secondary"`
	PrimaryCore      string `key:"primary_core"`
	SecondaryCore    string `key:"secondary_core"`
}
