package fabricate

// event is a kind of occurrence: steps in order of time.
type event struct {
	name   string
	weight float64 // share of the mix before shifts, relative to the others
	needs  requirement
	where  place
	flags  condition // what kind of gear, radio or checklist matter it is
	steps  []step
	harm   harm
	broken bool // the last recovery ends the chain without accident

	fails bool // an engine fails, is failed or loses its lever: twins have a dead side
	mild  bool // nothing to speculate about: no "possible" and no denials
	story string
}

// step plants one factor, drawn evenly from pick, with the given chance in
// percent. An early step belongs before the take-off or before the trigger and
// is told without a place or moment.
type step struct {
	chance int
	early  bool
	pick   []string
}

func must(pick ...string) step               { return step{chance: 100, pick: pick} }
func may(chance int, pick ...string) step    { return step{chance: chance, pick: pick} }
func before(chance int, pick ...string) step { return step{chance: chance, early: true, pick: pick} }

// requirement is what the aircraft or the flight must be.
type requirement uint8

const (
	needTwin requirement = 1 << iota
	needSingle
	needRetractable
	needDual
	needPiston
)

// place is where in the flight an event begins; it chooses the words that
// open the chain and the phase code.
type place uint8

const (
	onGround place = iota
	onRoll
	inClimb
	inCruise
	onApproach
	onLanding
)

// phases are the CICTT phase codes of each place.
var phases = [...][]string{
	onGround: {"STD", "TXI", "TXI"}, onRoll: {"TOF"}, inClimb: {"ICL", "ICL", "TOF"},
	inCruise: {"ENR", "ENR", "MNV"}, onApproach: {"APR"}, onLanding: {"LDG"},
}

var placeTopics = [...]string{
	onGround: "connectfirst ground", onRoll: "connectfirst roll", inClimb: "connectfirst to",
	inCruise: "connectfirst cru", onApproach: "connectfirst app", onLanding: "connectfirst land",
}

// harm is how badly an event may end.
type harm uint8

const (
	noHarm    harm = iota // incident, nothing damaged
	lightHarm             // incident, minor damage at most
	nearHarm              // serious incident
	realHarm              // accident, injuries minor at most
	graveHarm             // accident that may be fatal
)

var anyPowerLoss = []string{"power-loss", "power-loss-total", "power-loss-partial"}

// events is the mix: mostly ordinary days, because that is what a real file
// holds. Weights are common practice, no source.
var events = []event{
	// Chains.
	{name: "twin-failure-lost", weight: 4, needs: needTwin, where: inClimb, fails: true, harm: graveHarm, steps: []step{
		before(20, "checklist-skipped"), must(anyPowerLoss...), may(45, "wrong-rudder", "rudder-wrong-side"),
		may(25, "emergency-steps-missed"), may(25, "not-secured"), may(10, "wrong-bank"),
		must("slow-airspeed", "below-vmc"), may(45, "roll-toward-dead-engine", "directional-control-lost"),
		must("control-lost-in-flight", "stall", "control-lost-in-flight"), must("terrain-impact")}},
	{name: "twin-failure-held", weight: 6, needs: needTwin, where: inClimb, fails: true, harm: nearHarm, broken: true, steps: []step{
		must(anyPowerLoss...), may(35, "directional-control-lost", "slow-airspeed"), must("correct-rudder", "nose-lowered"),
		may(60, "secured"), may(35, "checklist-used"), must("recovered")}},
	{name: "rollback-rejected", weight: 3, needs: needTwin, where: onRoll, fails: true, flags: ifFriction, harm: lightHarm, broken: true, steps: []step{
		before(45, "checklist-skipped"), must("power-rollback", "lever-crept"), may(80, "directional-control-lost"),
		must("takeoff-rejected")}},
	{name: "rollback-lost", weight: 2.5, needs: needTwin, where: inClimb, fails: true, flags: ifFriction, harm: graveHarm, steps: []step{
		before(45, "checklist-skipped"), must("lever-crept", "power-rollback"), may(45, "wrong-rudder", "rudder-wrong-side"),
		must("below-vmc", "slow-airspeed"), may(30, "directional-control-lost"), must("control-lost-in-flight"), must("terrain-impact")}},
	{name: "rollback-held", weight: 3, where: inClimb, fails: true, flags: ifFriction, harm: nearHarm, broken: true, steps: []step{
		before(35, "checklist-skipped"), must("lever-crept", "power-rollback"), may(60, "slow-airspeed"), must("nose-lowered"), must("recovered")}},
	{name: "simulated-lost", weight: 2.5, needs: needTwin | needDual, where: inClimb, fails: true, harm: graveHarm, steps: []step{
		must("simulated-failure"), may(55, "wrong-rudder", "rudder-wrong-side"), may(40, "late-response", "supervision-lapse"),
		must("slow-airspeed", "below-vmc"), may(40, "directional-control-lost"), must("control-lost-in-flight", "stall"), must("terrain-impact")}},
	{name: "simulated-recovered", weight: 7, needs: needTwin | needDual, where: inClimb, fails: true, harm: nearHarm, broken: true, steps: []step{
		must("simulated-failure"), may(60, "wrong-rudder", "rudder-wrong-side"), may(55, "slow-airspeed", "below-vmc"),
		may(55, "directional-control-lost", "roll-toward-dead-engine"), must("took-over"), may(30, "power-reduced"), must("recovered")}},
	{name: "simulated-routine", weight: 3, needs: needTwin | needDual, where: inCruise, fails: true, harm: noHarm, steps: []step{
		must("simulated-failure")}},
	{name: "base-turn-stall", weight: 3.5, needs: needSingle, where: onApproach, harm: graveHarm, steps: []step{
		before(40, "distraction"), may(45, "steep-bank"), must("slow-airspeed"), must("stall"), may(25, "control-lost-in-flight"), must("terrain-impact")}},
	{name: "base-turn-recovered", weight: 5, needs: needSingle, where: onApproach, harm: lightHarm, broken: true, steps: []step{
		before(40, "distraction"), may(35, "steep-bank"), must("slow-airspeed"), may(55, "stall"), must("nose-lowered"), must("recovered")}},
	{name: "single-failure", weight: 6, needs: needSingle | needPiston, where: inCruise, fails: true, harm: realHarm, steps: []step{
		may(50, "fuel-exhausted", "fuel-contaminated", "induction-ice"), must(anyPowerLoss...), may(25, "slow-airspeed"), must("forced-landing")}},
	{name: "ground-loop", weight: 7, where: onLanding, harm: realHarm, steps: []step{
		may(50, "gust-or-crosswind"), must("directional-control-lost"), may(45, "rudder-overcontrol", "wrong-rudder"),
		must("control-lost-on-ground"), may(60, "runway-excursion")}},
	{name: "swing-rejected", weight: 4, where: onRoll, harm: lightHarm, broken: true, steps: []step{
		may(45, "gust-or-crosswind"), must("directional-control-lost"), must("takeoff-rejected"), may(40, "recovered")}},
	{name: "gear-not-lowered", weight: 4, needs: needRetractable, where: onApproach, flags: ifGear, harm: realHarm, steps: []step{
		may(45, "distraction"), must("checklist-not-run", "checklist-skipped"), must("abnormal-runway-contact")}},
	{name: "gear-caught-late", weight: 3, needs: needRetractable, where: onApproach, flags: ifGear, harm: lightHarm, broken: true, steps: []step{
		may(35, "distraction"), must("checklist-skipped", "checklist-not-run"), must("go-around"), may(40, "recovered")}},
	{name: "tank-not-changed", weight: 4, where: inCruise, fails: true, needs: needPiston, flags: ifFuel, harm: nearHarm, broken: true, steps: []step{
		must("checklist-skipped"), must("fuel-starved"), must("power-loss", "power-loss-total"), may(40, "nose-lowered"), may(30, "checklist-used"), must("recovered")}},
	{name: "tank-run-dry", weight: 2, where: inCruise, fails: true, needs: needSingle | needPiston, flags: ifFuel, harm: realHarm, steps: []step{
		must("checklist-skipped"), must("fuel-starved"), must("power-loss-total", "power-loss"), must("forced-landing")}},
	{name: "rough-engine", weight: 6, where: inCruise, fails: true, harm: lightHarm, broken: true, steps: []step{
		must("power-loss-partial"), may(40, "checklist-used"), must("recovered")}},

	// Ordinary days.
	{name: "bird", weight: 11, where: inClimb, harm: lightHarm, mild: true, steps: []step{must("animal-strike")}},
	{name: "animal-on-runway", weight: 3, where: onLanding, harm: lightHarm, mild: true, steps: []step{must("animal-strike")}},
	{name: "hard-landing", weight: 10, where: onLanding, harm: lightHarm, steps: []step{may(30, "gust-or-crosswind"), must("abnormal-runway-contact")}},
	{name: "door", weight: 7, where: inClimb, harm: noHarm, mild: true, steps: []step{must("door-open")}},
	{name: "radio", weight: 7, where: inCruise, flags: ifRadio, harm: noHarm, mild: true, steps: []step{must("system-fault")}},
	{name: "electrics", weight: 7, where: inCruise, flags: ifElectrical, harm: noHarm, mild: true, steps: []step{must("system-fault"), may(30, "checklist-used")}},
	{name: "gear-fault", weight: 5, needs: needRetractable, where: onApproach, flags: ifGearFault, harm: lightHarm, mild: true, steps: []step{must("system-fault"), may(50, "go-around")}},
	{name: "wake", weight: 4, where: onApproach, harm: nearHarm, broken: true, steps: []step{must("wake-encounter"), must("recovered")}},
	{name: "gust-go-around", weight: 5, where: onApproach, harm: noHarm, mild: true, steps: []step{must("gust-or-crosswind"), must("go-around")}},
	{name: "ice", weight: 3, where: inCruise, harm: noHarm, mild: true, steps: []step{must("airframe-ice")}},
	{name: "air-traffic", weight: 13, where: inCruise, harm: noHarm, mild: true, story: "story atc"},
	{name: "taxi", weight: 9, where: onGround, harm: lightHarm, mild: true, story: "story taxi"},
	{name: "weather-diversion", weight: 8, where: inCruise, harm: noHarm, mild: true, story: "story weather"},
	{name: "tyre", weight: 4, where: onLanding, harm: lightHarm, mild: true, story: "story tyre"},
	{name: "passenger", weight: 4, where: inCruise, harm: noHarm, mild: true, story: "story passenger"},
	{name: "ground-handling", weight: 6, where: onGround, harm: noHarm, mild: true, story: "story ground"},
}

// fits tells whether a job can meet the event. A dual event needs an
// instructor beside a student; any other may be flown either way.
func (e *event) fits(j job) bool {
	a := j.aircraft
	switch {
	case e.needs&needTwin != 0 && a.engines != 2,
		e.needs&needSingle != 0 && a.engines != 1,
		e.needs&needRetractable != 0 && !a.retractable,
		e.needs&needDual != 0 && !j.dual,
		e.needs&needPiston != 0 && a.turbine:
		return false
	}
	return true
}

// family groups factors that speak of one thing: a narrative that affirms one
// of a family does not deny another, nor call it a mere possibility.
var family = map[string]families{
	"power-loss": powerFamily, "power-loss-total": powerFamily, "power-loss-partial": powerFamily,
	"power-rollback": powerFamily, "lever-crept": powerFamily,
	"slow-airspeed": speedFamily, "below-vmc": speedFamily, "stall": speedFamily, "control-lost-in-flight": speedFamily,
	"directional-control-lost": yawFamily, "roll-toward-dead-engine": yawFamily, "control-lost-on-ground": yawFamily,
	"wrong-rudder": rudderFamily, "rudder-wrong-side": rudderFamily, "rudder-overcontrol": rudderFamily, "correct-rudder": rudderFamily,
	"checklist-skipped": checklistFamily, "checklist-not-run": checklistFamily, "emergency-steps-missed": checklistFamily,
	"simulated-failure": simulatedFamily, "recovered": recoveredFamily,
}

type families uint8

const (
	powerFamily families = 1 << iota
	speedFamily
	yawFamily
	rudderFamily
	checklistFamily
	simulatedFamily
	recoveredFamily
)

// sided are the factors whose side means something.
var sided = map[string]bool{
	"power-loss": true, "power-loss-total": true, "power-loss-partial": true, "power-rollback": true, "lever-crept": true,
	"simulated-failure": true, "wrong-rudder": true, "rudder-wrong-side": true, "rudder-overcontrol": true,
	"correct-rudder": true, "directional-control-lost": true, "roll-toward-dead-engine": true, "control-lost-on-ground": true,
	"secured": true, "not-secured": true, "power-reduced": true, "wrong-bank": true, "wake-encounter": true,
}

// invites tells whether somebody might speak of a factor, if only to deny it,
// where it did not happen.
func (e *event) invites(factor string) bool {
	rolling := e.where == onRoll || e.where == onLanding
	switch factor {
	case "directional-control-lost", "control-lost-on-ground":
		return rolling
	case "wrong-rudder":
		return rolling && !e.mild || e.fails
	case "stall", "slow-airspeed", "control-lost-in-flight":
		return e.where >= inClimb
	case "below-vmc", "simulated-failure", "power-rollback":
		return e.fails
	}
	return true
}

// isRecovery tells whether a factor may break a chain.
func isRecovery(factor string) bool {
	switch factor {
	case "recovered", "nose-lowered", "power-reduced", "correct-rudder", "secured",
		"takeoff-rejected", "go-around", "took-over", "checklist-used":
		return true
	}
	return false
}

// isLoss tells whether a factor is a loss of control that one can recover from.
func isLoss(factor string) bool {
	switch factor {
	case "stall", "control-lost-in-flight":
		return true
	}
	return false
}
