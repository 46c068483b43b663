package fabricate

import "strconv"

// slot is a place in a clause that the scene fills.
type slot uint8

const (
	slotActor      slot = iota // P: who is flying: "the pilot", "I", "my student"
	slotActors                 // Ps: the same, possessive
	slotInstructor             // INS: as a subject
	slotByInstructor
	slotPilotNoun // "commander", without an article
	slotAircraft  // "the aircraft", "the Twin 44", "ND-TWA"
	slotType
	slotRegistration
	slotOperator
	slotEngine // "left engine", or "engine" of a single
	slotEngines
	slotThrottle
	slotLever
	slotDead
	slotDeadNumber
	slotLive
	slotSwing
	slotUnswing
	slotFlight
	slotPurpose
	slotAboard
	slotBase
	slotNear
	slotRunway
	slotTime
	slotEarlier
	slotWeekday
	slotLow  // heights in feet
	slotMid  //
	slotHigh //
	slotSlow // speeds in knots: too slow,
	slotUnder
	slotVmc
	slotBlue
	slotApproach
	slotRoll
	slotSeconds
	slotFew
	slotHours
	slotTypeHours
	slotAge
	slotWind
	slotVisibility
	slotCloud
	slotWarmth
	slotDew
	slotPressure
	slotCauses
	slotClauses
)

var slotNames = map[string]slot{
	"P": slotActor, "Ps": slotActors, "INS": slotInstructor, "INS2": slotByInstructor,
	"pilot": slotPilotNoun, "ac": slotAircraft, "type": slotType, "reg": slotRegistration,
	"op": slotOperator, "eng": slotEngine, "engines": slotEngines, "throttle": slotThrottle,
	"lever": slotLever, "dead": slotDead, "deadno": slotDeadNumber, "live": slotLive,
	"swing": slotSwing, "unswing": slotUnswing, "flight": slotFlight, "purpose": slotPurpose,
	"pob": slotAboard, "base": slotBase, "near": slotNear, "rwy": slotRunway,
	"time": slotTime, "time0": slotEarlier, "weekday": slotWeekday,
	"low": slotLow, "mid": slotMid, "high": slotHigh, "kt": slotSlow, "under": slotUnder,
	"vmc": slotVmc, "blue": slotBlue, "appr": slotApproach, "tokt": slotRoll,
	"sec": slotSeconds, "min": slotFew, "hrs": slotHours, "thrs": slotTypeHours, "age": slotAge,
	"wind": slotWind, "vis": slotVisibility, "cloud": slotCloud, "temp": slotWarmth,
	"dew": slotDew, "qnh": slotPressure, "N": slotCauses, "C": slotClauses,
}

var (
	sideWords   = styledAll("left", "right")
	sideNumbers = [...]string{"1", "2"}
	wordEngine  = styledOf("engine")
	wordSpace   = styledOf(" ")

	thePilot    = styledAll("the pilot", "the commander", "the pilot in command")
	pilotNoun   = styledAll("pilot", "commander", "pilot in command")
	theStudent  = styledAll("the student", "the pilot under instruction", "the trainee")
	studentNoun = styledAll("student", "pilot under instruction", "trainee")
	myStudent   = styledAll("my student", "the student", "the trainee")
	theyTeach   = styledAll("the instructor", "the check pilot")
	wordI       = styledOf("I")
	wordMe      = styledOf("me")
	wordMy      = styledOf("my")
	genitive    = styledOf("'s")

	anAircraft  = styledAll("the aircraft", "the aeroplane", "the machine")
	theAirplane = styledAll("the aircraft", "the airplane", "the airplane")

	bothEngines = styledOf("both engines")
	theEngine   = styledOf("the engine")
	throttle    = styledOf("throttle")
	powerLever  = styledOf("power lever")

	degreesAt = styledOf(" degrees at ")
	knotsWord = styledOf(" knots")

	aboardWords = styledAll("one person", "two people", "three people", "four people", "five people",
		"six people", "seven people", "eight people", "nine people")
	secondWords = styledAll("two", "three", "four", "five", "six")
	fewWords    = styledAll("three", "four", "five", "six", "seven", "eight", "nine")
	weekdays    = styledAll("Monday", "Tuesday", "Wednesday", "Thursday", "Friday", "Saturday", "Sunday")
	clouds      = styledAll("few clouds at 2,500 feet", "scattered cloud at 3,000 feet", "broken cloud at 1,800 feet",
		"overcast at 2,200 feet", "no cloud below 5,000 feet", "high cirrus only", "a layer at 4,000 feet", "fair-weather cumulus")

	flights = map[string][]styled{
		"dual": styledAll("a dual training flight", "an instructional flight", "a lesson", "a check flight", "a refresher flight"),
		"training": styledAll("a solo practice flight", "a solo circuit detail", "a solo training flight",
			"a qualifying cross-country flight"),
		"private-hire": styledAll("a private flight", "a local flight by a hirer", "a pleasure flight", "a flight for old times' sake",
			"a trip to the coast"),
		"charter": styledAll("a charter flight", "a passenger flight", "an air-taxi flight", "a charter with day trippers",
			"an on-demand passenger flight"),
		"ferry": styledAll("a ferry flight", "a positioning flight", "an empty return leg"),
		"mail":  styledAll("a mail flight", "the early mail run", "a cargo flight", "the parcels run", "the newspaper flight"),
	}
	purposes = map[string][]styled{
		"dual":         styledAll("circuits", "upper air work", "a navigation exercise", "a proficiency check", "crosswind landings"),
		"dual-twin":    styledAll("circuits", "upper air work", "asymmetric practice", "an instrument approach", "a proficiency check"),
		"training":     styledAll("circuits", "a solo navigation exercise", "consolidation", "practice landings"),
		"private-hire": styledAll("to show friends the coast", "lunch at Pell Island", "photographs of the estuary", "to keep in practice"),
		"charter":      styledAll("to take surveyors to Pell Island", "to bring guests home", "a day trip", "to fetch a crew"),
		"ferry":        styledAll("to bring the aircraft home", "to take the aircraft to its inspection"),
		"mail":         styledAll("to carry the post", "to bring spare parts to Hollin Strand", "to take parcels across"),
	}
)

// flightKey is the key into flights and purposes.
func (p *plot) flightKey() string {
	if p.job.dual {
		return "dual"
	}
	return p.job.operation
}

// purposeKey is flightKey, but tells dual flights in twins apart.
func (p *plot) purposeKey() string {
	if p.job.dual && p.job.aircraft.engines == 2 {
		return "dual-twin"
	}
	return p.flightKey()
}

// fill writes what the scene puts into a slot.
func (t *telling) fill(s slot) {
	p, a := t.plot, t.plot.job.aircraft
	switch s {
	case slotActor:
		t.word(&t.actor)
	case slotActors:
		if t.actor[plain] == "I" {
			t.word(&wordMy)
		} else {
			t.word(&t.actor)
			t.word(&genitive)
		}
	case slotInstructor:
		t.word(&t.instructor)
	case slotByInstructor:
		if t.instructor[plain] == "I" {
			t.word(&wordMe)
		} else {
			t.word(&t.instructor)
		}
	case slotPilotNoun:
		t.word(&t.noun)
	case slotAircraft:
		t.fillAircraft()
	case slotType:
		t.raw(a.maker)
		t.word(&wordSpace)
		t.raw(a.model)
	case slotRegistration:
		t.raw(p.registration)
	case slotOperator:
		t.oneOf(p.base.operator)
	case slotEngine:
		if a.engines == 2 {
			t.fillSide(p.dead, true)
			t.word(&wordSpace)
		}
		t.word(&wordEngine)
	case slotEngines:
		if a.engines == 2 {
			t.word(&bothEngines)
		} else {
			t.word(&theEngine)
		}
	case slotThrottle, slotLever:
		if a.engines == 2 {
			t.fillSide(p.dead, true)
			t.word(&wordSpace)
		}
		if s == slotLever && a.turbine {
			t.word(&powerLever)
		} else {
			t.word(&throttle)
		}
	case slotDead:
		t.fillSide(p.dead, true)
	case slotDeadNumber:
		t.noteSide(p.dead, true)
		t.raw(sideNumbers[p.dead])
	case slotLive:
		t.fillSide(p.dead.other(), false)
	case slotSwing:
		t.fillSide(p.swing, false)
	case slotUnswing:
		t.fillSide(p.swing.other(), false)
	case slotFlight:
		t.oneOf(flights[p.flightKey()])
	case slotPurpose:
		t.oneOf(purposes[p.purposeKey()])
	case slotAboard:
		t.word(&aboardWords[p.aboard-1])
	case slotBase:
		t.raw(p.base.name)
	case slotNear:
		t.word(&t.near)
	case slotRunway:
		t.raw(p.base.runways[p.runway])
	case slotCauses:
		t.tellCauses()
	case slotClauses:
		t.tellSynopsis()
	default:
		t.fillNumber(s)
	}
}

// fillNumber writes the slots that hold times and amounts.
func (t *telling) fillNumber(s slot) {
	p, a, m := t.plot, t.plot.job.aircraft, t.maker
	switch s {
	case slotTime:
		t.time(t.clock)
		t.clock += 3 + m.n(9)
	case slotEarlier:
		t.time(p.clock - 10 - m.n(15))
	case slotWeekday:
		t.word(&weekdays[t.weekday])
	case slotLow:
		t.number(150 + 50*m.n(12))
	case slotMid:
		t.number(800 + 100*m.n(13))
	case slotHigh:
		t.number(2500 + 500*m.n(11))
	case slotSlow:
		t.number(max(a.approach-14-m.n(9), a.vmc+1))
	case slotUnder:
		t.number(a.vmc - 1 - m.n(9))
	case slotVmc:
		t.number(a.vmc)
	case slotBlue:
		t.number(max(a.blue, a.approach))
	case slotApproach:
		t.number(a.approach)
	case slotRoll:
		t.number(25 + 5*m.n(7))
	case slotSeconds:
		t.oneOf(secondWords)
	case slotFew:
		t.oneOf(fewWords)
	case slotHours:
		t.number(p.hours + t.seniority)
	case slotTypeHours:
		t.number(p.typeHours)
	case slotAge:
		t.number(p.age)
	case slotWind:
		t.digits(p.wind[0]/100, p.wind[0]/10%10, 0)
		t.word(&degreesAt)
		t.number(p.wind[1])
		t.word(&knotsWord)
	case slotVisibility:
		t.number(p.visibility)
		t.raw(" km")
	case slotCloud:
		t.word(&t.cloud)
	case slotWarmth:
		t.number(p.warmth)
	case slotDew:
		t.number(p.warmth - 2 - m.n(6))
	case slotPressure:
		t.out = strconv.AppendInt(t.out, int64(p.pressure), 10)
	}
}

// fillAircraft names the aircraft in one of the ways of this telling.
func (t *telling) fillAircraft() {
	switch t.maker.n(6) {
	case 0:
		if t.form == formInvestigator {
			t.raw(t.plot.registration)
			return
		}
	case 1:
		a := t.plot.job.aircraft
		t.word(&theWord)
		if c := a.model[0]; c <= '9' { // "the 120" reads like a number
			t.raw(a.maker)
		} else {
			t.raw(a.model)
		}
		return
	}
	t.oneOf(t.aircraftWords)
}

var theWord = styledOf("the ")

// fillSide writes a side and remembers it for the span that is open.
func (t *telling) fillSide(s side, dead bool) {
	t.noteSide(s, dead)
	t.word(&sideWords[s])
}

func (t *telling) noteSide(s side, dead bool) {
	if t.clauseSide == "" {
		t.clauseSide = s.String()
	}
	if t.inSpan && t.spanSide == "" {
		t.spanSide = s.String()
	}
	t.deadTold = t.deadTold || dead
}

// time writes minutes after midnight as four figures.
func (t *telling) time(minutes int) {
	minutes = (minutes + 24*60) % (24 * 60)
	h, min := minutes/60, minutes%60
	t.digits(h/10, h%10, min/10, min%10)
}

// digits writes figures one by one.
func (t *telling) digits(list ...int) {
	t.sentence = false
	for _, d := range list {
		t.out = append(t.out, byte('0'+d))
	}
}

// number writes a whole number, with a comma in thousands unless in capitals.
func (t *telling) number(n int) {
	t.sentence = false
	if n >= 1000 && t.style < capitals {
		t.out = strconv.AppendInt(t.out, int64(n/1000), 10)
		t.out = append(t.out, ',')
		t.digits(n/100%10, n/10%10, n%10)
		return
	}
	t.out = strconv.AppendInt(t.out, int64(n), 10)
}
