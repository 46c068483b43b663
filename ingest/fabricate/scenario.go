package fabricate

// An aircraft type of the invented fleet. Speeds in knots indicated.
type aircraftType struct {
	maker, model string
	engines      int
	turbine      bool
	retractable  bool
	vmc, blue    int // twins only
	approach     int
	seats        int
	registered   []string
}

var (
	larkin120 = &aircraftType{maker: "Larkin", model: "120", engines: 1, approach: 62, seats: 2,
		registered: []string{"ND-LKA", "ND-LKC", "ND-LKD", "ND-LKF", "ND-LKH"}}
	larkin160 = &aircraftType{maker: "Larkin", model: "160", engines: 1, approach: 68, seats: 4,
		registered: []string{"ND-LSB", "ND-LSM", "ND-LSP", "ND-LSR"}}
	twin44 = &aircraftType{maker: "Marrow", model: "Twin 44", engines: 2, retractable: true, vmc: 62, blue: 86, approach: 82, seats: 4,
		registered: []string{"ND-TWA", "ND-TWB", "ND-TWE"}}
	twin60 = &aircraftType{maker: "Marrow", model: "Twin 60", engines: 2, retractable: true, vmc: 74, blue: 98, approach: 94, seats: 6,
		registered: []string{"ND-MSA", "ND-MSC", "ND-MSF", "ND-MSK"}}
	dorrinD9 = &aircraftType{maker: "Dorrin", model: "D9", engines: 2, turbine: true, retractable: true, vmc: 88, blue: 112, approach: 106, seats: 9,
		registered: []string{"ND-DNA", "ND-DNB", "ND-DNE"}}
	larkin210 = &aircraftType{maker: "Larkin", model: "210", engines: 1, retractable: true, approach: 75, seats: 3,
		registered: []string{"ND-LXA", "ND-LXD", "ND-LXE"}}
)

// job is a kind of flying done with a type at a base.
type job struct {
	aircraft  *aircraftType
	operation string
	dual      bool // an instructor sits beside a student
	weight    int
}

// base is an aerodrome under which flights are counted.
type base struct {
	name     string
	source   string // of the occurrence file that is kept there
	initial  string // of ids in that file
	operator []styled
	runways  [2]string
	nearby   []styled
	jobs     []job

	// Monthly exposure: hours swing between low (January) and high (July).
	lowHours, highHours float64
	hoursPerDeparture   float64
}

// voluntary is the source of reports by pilots of every base.
const voluntary = "hangar-talk"

var bases = []*base{
	{
		name: "Tarnwick", source: "tarnwick", initial: "T", runways: [2]string{"08", "26"},
		operator: styledAll("Tarnwick Flying School", "the school", "the flying school"),
		nearby:   styledAll("Hollin Strand", "Ackerdale", "Nether Moss", "Pell Island"),
		jobs: []job{
			{larkin120, "training", true, 24}, {larkin120, "training", false, 14}, {larkin120, "private-hire", false, 12},
			{larkin160, "training", true, 10}, {larkin160, "private-hire", false, 16},
			{twin44, "training", true, 20}, {twin44, "private-hire", false, 4},
		},
		lowHours: 250, highHours: 900, hoursPerDeparture: 0.72,
	},
	{
		name: "Sellow", source: "sellow", initial: "S", runways: [2]string{"13", "31"},
		operator: styledAll("Sellow Air Charter", "the company", "the charter company"),
		nearby:   styledAll("Pell Island", "Hollin Strand", "Ackerdale", "Brackmoor"),
		jobs: []job{
			{twin60, "charter", false, 28}, {dorrinD9, "charter", false, 30}, {larkin210, "mail", false, 24},
			{twin60, "ferry", false, 5}, {dorrinD9, "training", true, 5}, {twin60, "training", true, 8},
		},
		lowHours: 180, highHours: 420, hoursPerDeparture: 0.86,
	},
	{
		name: "Brackmoor", source: "sellow", initial: "S", runways: [2]string{"04", "22"},
		operator: styledAll("Sellow Air Charter", "the company", "the charter company"),
		nearby:   styledAll("Ackerdale", "Nether Moss", "Sellow", "Pell Island"),
		jobs: []job{
			{twin60, "charter", false, 34}, {dorrinD9, "charter", false, 20}, {larkin210, "mail", false, 32},
			{larkin210, "ferry", false, 4}, {twin60, "training", true, 10},
		},
		lowHours: 90, highHours: 260, hoursPerDeparture: 0.78,
	},
}
