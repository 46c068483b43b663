package fabricate

import (
	"catena/ingest/corpus"
)

// plot is what happened: all that a second telling of the same event keeps.
type plot struct {
	event *event
	chain []planted // in order of time
	base  *base
	job   job
	date  corpus.Date
	harm  outcome

	registration string
	runway       int    // index into the base's runways
	dead         side   // of the engine that fails; in singles and without a failure unused
	swing        side   // the way the aircraft swings
	clock        int    // minutes after midnight, local, at departure
	aboard       int    // people
	hours        int    // the pilot's, in all
	typeHours    int    // and on the type
	age          int    // the pilot's
	wind         [2]int // degrees, knots
	warmth       int    // degrees Celsius
	pressure     int    // hPa
	visibility   int    // km
	phase        string
}

// planted is a step of the plot that took place.
type planted struct {
	factor string
	early  bool
}

// outcome is how the event ended.
type outcome struct{ event, injury, damage string }

func (o outcome) accident() bool { return o.event == "accident" }
func (o outcome) fatal() bool    { return o.injury == "fatal" }

// side of the aircraft: 0 is left, 1 is right, as draws by chance need them.
type side uint8

func (s side) other() side { return 1 - s }

func (s side) String() string { return [...]string{"left", "right"}[s] }

// seasonWarmth is the mean temperature of the months at the bases, in degrees
// Celsius; invented, of a temperate coast.
var seasonWarmth = [12]int{3, 3, 6, 9, 13, 16, 18, 18, 15, 11, 7, 4}

// newPlot draws what happened from an event, a base and a date.
func (m *Maker) newPlot(e *event, b *base, date corpus.Date) *plot {
	p := &plot{event: e, base: b, date: date, job: m.drawJob(e, b)}
	for _, s := range e.steps {
		if m.chance(s.chance) {
			p.chain = append(p.chain, planted{s.pick[m.n(len(s.pick))], s.early})
		}
	}
	a := p.job.aircraft
	if a.engines != 2 {
		p.chain = keepSingle(p.chain)
	}
	p.harm = m.drawOutcome(e.harm)
	p.registration = a.registered[m.n(len(a.registered))]
	p.runway = m.n(2)
	p.dead = side(m.n(2))
	p.swing = side(m.n(2))
	if e.fails && a.engines == 2 {
		p.swing = p.dead
	}
	p.clock = 8*60 + m.n(10*60)
	p.aboard = 1 + m.n(a.seats)
	switch op := p.job.operation; {
	case p.job.dual:
		p.aboard = 2
	case op == "training", op == "mail", op == "ferry":
		p.aboard = 1
	}
	p.hours = 60 + m.n(40)*m.n(40)*4
	if p.job.operation == "training" {
		p.hours = 15 + m.n(220)
	}
	p.typeHours = 5 + p.hours/(2+m.n(9))
	p.age = 19 + m.n(46)
	p.wind = [2]int{10 * (1 + m.n(36)), 2 + m.n(17)}
	p.warmth = seasonWarmth[max(date.Month, 1)-1] - 5 + m.n(11)
	p.pressure = 988 + m.n(47)
	p.visibility = 4 + m.n(36)
	codes := phases[e.where]
	p.phase = codes[m.n(len(codes))]
	return p
}

// keepSingle drops the steps that only a twin can take.
func keepSingle(chain []planted) []planted {
	kept := chain[:0]
	for _, s := range chain {
		switch s.factor {
		case "below-vmc", "correct-rudder", "power-reduced", "secured", "not-secured",
			"wrong-bank", "roll-toward-dead-engine":
			continue
		}
		kept = append(kept, s)
	}
	return kept
}

// drawJob picks the flying, by weight among what the event fits.
func (m *Maker) drawJob(e *event, b *base) job {
	total := 0
	for _, j := range b.jobs {
		if e.fits(j) {
			total += j.weight
		}
	}
	r := m.n(total)
	for _, j := range b.jobs {
		if !e.fits(j) {
			continue
		}
		if r -= j.weight; r < 0 {
			return j
		}
	}
	return b.jobs[0] // not reached: the weights add up to total
}

// drawOutcome draws injury and damage for a degree of harm.
func (m *Maker) drawOutcome(h harm) outcome {
	switch h {
	case noHarm:
		return outcome{"incident", "none", "none"}
	case lightHarm:
		return outcome{"incident", "none", [...]string{"none", "none", "minor"}[m.n(3)]}
	case nearHarm:
		return outcome{"serious-incident", "none", [...]string{"none", "none", "none", "minor"}[m.n(4)]}
	case realHarm:
		return outcome{"accident", [...]string{"none", "none", "minor"}[m.n(3)], "substantial"}
	}
	return outcome{"accident",
		[...]string{"fatal", "serious", "serious", "minor", "minor", "minor"}[m.n(6)],
		[...]string{"destroyed", "substantial"}[m.n(2)]}
}

// conditions are the facts that clauses may ask for.
func (p *plot) conditions() condition {
	c := p.event.flags
	if p.job.aircraft.engines == 2 {
		c |= ifTwin
	} else {
		c |= ifSingle
	}
	if p.harm.accident() {
		c |= ifAccident
	} else {
		c |= ifSafe
	}
	if !p.harm.fatal() {
		c |= ifAlive
	}
	if p.job.dual {
		c |= ifTraining
	}
	if c&ifGear == 0 {
		c |= ifNotGear
	}
	if p.job.aircraft.turbine {
		c |= ifTurbine
	} else {
		c |= ifPiston
	}
	if p.event.where <= inClimb {
		c |= ifDeparting
	} else {
		c |= ifArriving
	}
	if p.event.where == onRoll || p.event.where == onLanding || c&ifGear != 0 {
		c |= ifRunway
	}
	if p.event.where >= inClimb && p.event.where != onLanding {
		c |= ifFlying
	}
	for _, s := range p.chain {
		if family[s.factor]&(speedFamily|yawFamily) != 0 || s.factor == "wake-encounter" {
			c |= ifUpset
		}
	}
	return c | p.company()
}

// company are the facts about who is aboard.
func (p *plot) company() (c condition) {
	if p.job.operation != "training" {
		c |= ifLicensed
		if p.aboard > 1 {
			c |= ifBeside
		}
	}
	if p.aboard > 1 && (p.job.operation == "charter" || p.job.operation == "private-hire") {
		c |= ifPassengers
	}
	return c
}

// occurrence fills in the fields of the record, narratives aside.
func (p *plot) occurrence() corpus.Occurrence {
	a := p.job.aircraft
	engine := "piston"
	if a.turbine {
		engine = "turboprop"
	}
	return corpus.Occurrence{
		Date: p.date, Place: p.base.name, Country: "Norland",
		Aircraft:  corpus.Aircraft{Make: a.maker, Model: a.model, Category: "airplane", Engines: a.engines, EngineType: engine},
		Operation: p.job.operation, Phase: p.phase,
		Injury: p.harm.injury, Damage: p.harm.damage, Event: p.harm.event,
	}
}
