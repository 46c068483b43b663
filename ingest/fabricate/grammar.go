package fabricate

import (
	"embed"
	"fmt"
	"strings"
)

// The grammar files hold one clause a line, under headings "== factor
// assertion" (or "== topic variant"):
//
//	if.twin: <the {dead} side went dead> with a [yaw|lurch]
//
// Before the colon stand the voices that may use the clause (i investigator,
// f first person, which capitals use too, c capitals only, r remark, n noun
// phrase for a cause statement) and, after full stops, the conditions that the
// scene must meet. In the text, [a|b] is a choice, {name} a slot that the
// scene fills, and <...> the words that show the factor. Clauses carry no full
// stop of their own; the telling capitalises and joins them.
//
//go:embed grammar/chain.txt grammar/trap.txt grammar/filler.txt
var grammarFiles embed.FS

// form is a use of a clause.
type form uint8

const (
	formInvestigator form = iota
	formFirst
	formCapitals
	formRemark
	formNoun
	forms
)

// condition is a set of facts about a scene; a clause needs all of its own.
type condition uint32

const (
	ifTwin condition = 1 << iota
	ifSingle
	ifAccident
	ifSafe
	ifAlive
	ifTraining
	ifGear
	ifNotGear
	ifFuel
	ifFriction
	ifRadio
	ifElectrical
	ifGearFault
	ifTurbine
	ifPiston
	ifDeparting // on the ground before or on the take-off and climb
	ifArriving  // the cruise and all after
	ifRunway    // it ended on the runway
	ifPassengers
	ifBeside   // somebody who is no instructor sits beside the pilot
	ifLicensed // who flies is no student
	ifUpset    // speed, heading or control was lost
	ifFlying   // it began in the air
)

var conditionNames = map[string]condition{
	"twin": ifTwin, "single": ifSingle, "acc": ifAccident, "ok": ifSafe,
	"alive": ifAlive, "train": ifTraining, "gear": ifGear, "nogear": ifNotGear,
	"fuel": ifFuel, "friction": ifFriction, "radio": ifRadio, "elec": ifElectrical,
	"gearfault": ifGearFault, "turb": ifTurbine, "piston": ifPiston,
	"dep": ifDeparting, "arr": ifArriving, "rwy": ifRunway, "pax": ifPassengers,
	"beside": ifBeside, "licensed": ifLicensed,
	"upset": ifUpset, "air": ifFlying,
}

// clause is one line of the grammar.
type clause struct {
	number int // over all files: the index of its bit in a used set
	needs  condition
	body   []node
}

// group holds the clauses under one heading, by form.
type group [forms][]*clause

// node is a part of a clause: a literal, a slot, a choice or a marked span.
type node struct {
	kind    nodeKind
	literal styled
	slot    slot
	choices [][]node // the choices, or the one content of a span
}

type nodeKind uint8

const (
	literalNode nodeKind = iota
	slotNode
	choiceNode
	spanNode
)

// grammar is the compiled form of the files, keyed "factor assertion".
type grammar struct {
	groups  map[string]*group
	keys    []string // in order of the files
	clauses int
}

// language is compiled once. The files are embedded, so a fault in them is a
// fault of the build; the tests find it first.
var language = mustGrammar()

func mustGrammar() *grammar {
	g := &grammar{groups: map[string]*group{}}
	for _, name := range []string{"chain", "trap", "filler"} {
		file := "grammar/" + name + ".txt"
		data, err := grammarFiles.ReadFile(file)
		if err == nil {
			err = g.add(file, string(data))
		}
		if err != nil {
			panic(err)
		}
	}
	return g
}

// add compiles one file into the grammar.
func (g *grammar) add(file, text string) error {
	var current *group
	for i, line := range strings.Split(text, "\n") {
		fault := func(format string, args ...any) error {
			return fmt.Errorf("%s:%d: %s", file, i+1, fmt.Sprintf(format, args...))
		}
		if heading, ok := strings.CutPrefix(line, "== "); ok {
			key := strings.TrimSuffix(strings.TrimSpace(heading), " -")
			if g.groups[key] != nil {
				return fault("heading %q stands twice", key)
			}
			current = &group{}
			g.groups[key] = current
			g.keys = append(g.keys, key)
			continue
		}
		if line == "" || line[0] == '#' {
			continue
		}
		head, body, ok := strings.Cut(line, ": ")
		if !ok || current == nil {
			return fault("want a heading, then lines of the form voices: text")
		}
		c := &clause{number: g.clauses}
		g.clauses++
		letters, err := c.readHead(head)
		if err != nil {
			return fault("%v", err)
		}
		p := clauseParser{rest: body}
		if c.body, err = p.sequence(""); err != nil {
			return fault("%v", err)
		}
		for _, f := range letters {
			current[f] = append(current[f], c)
		}
	}
	return nil
}

// readHead reads "if.twin.acc" into forms and conditions.
func (c *clause) readHead(head string) ([]form, error) {
	letters, conditions, _ := strings.Cut(head, ".")
	var out []form
	for _, letter := range letters {
		switch letter {
		case 'i':
			out = append(out, formInvestigator)
		case 'f':
			out = append(out, formFirst, formCapitals)
		case 'c':
			if !strings.Contains(letters, "f") {
				out = append(out, formCapitals)
			}
		case 'r':
			out = append(out, formRemark)
		case 'n':
			out = append(out, formNoun)
		default:
			return nil, fmt.Errorf("no voice %q", letter)
		}
	}
	for name := range strings.SplitSeq(conditions, ".") {
		bit, ok := conditionNames[name]
		if !ok && name != "" {
			return nil, fmt.Errorf("no condition %q", name)
		}
		c.needs |= bit
	}
	return out, nil
}

// clauseParser reads the text of a clause; it is recursive because choices
// and spans nest.
type clauseParser struct{ rest string }

// sequence reads nodes up to, not including, a byte of stop at this level.
func (p *clauseParser) sequence(stop string) ([]node, error) {
	var out []node
	for p.rest != "" && !strings.Contains(stop, p.rest[:1]) {
		switch p.rest[0] {
		case '[':
			n := node{kind: choiceNode}
			for p.rest[0] != ']' {
				p.rest = p.rest[1:]
				choice, err := p.sequence("|]")
				if err != nil {
					return nil, err
				}
				if p.rest == "" {
					return nil, fmt.Errorf("a choice is not closed")
				}
				n.choices = append(n.choices, choice)
			}
			p.rest = p.rest[1:]
			out = append(out, n)
		case '<':
			p.rest = p.rest[1:]
			inner, err := p.sequence(">")
			if err != nil {
				return nil, err
			}
			if p.rest == "" || len(inner) == 0 {
				return nil, fmt.Errorf("a span is empty or not closed")
			}
			p.rest = p.rest[1:]
			out = append(out, node{kind: spanNode, choices: [][]node{inner}})
		case '{':
			name, rest, ok := strings.Cut(p.rest[1:], "}")
			s, known := slotNames[name]
			if !ok || !known {
				return nil, fmt.Errorf("no slot %q", name)
			}
			p.rest = rest
			out = append(out, node{kind: slotNode, slot: s})
		case ']', '|', '>', '}':
			return nil, fmt.Errorf("%q stands alone", p.rest[0])
		default:
			end := strings.IndexAny(p.rest, "[]|<>{}")
			if end < 0 {
				end = len(p.rest)
			}
			out = append(out, node{literal: styledOf(p.rest[:end])})
			p.rest = p.rest[end:]
		}
	}
	return out, nil
}
