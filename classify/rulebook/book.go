package rulebook

import (
	"cmp"
	"crypto/sha256"
	"embed"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"maps"
	"path"
	"slices"
	"strings"
	"sync"

	"github.com/goccy/go-yaml"
	"github.com/goccy/go-yaml/ast"

	"catena/classify/catalogue"
	"catena/classify/text"
	"catena/ingest/corpus"
)

// Book is a compiled rule book. It does not change after Load.
type Book struct {
	Version  string // hash of all that the book holds, 12 hexadecimal digits
	Common   string // hash of what bears on the tags of every rule: cues, order, measures ...
	Tree     *catalogue.Tree
	Lexicon  *text.Lexicon
	Rules    []*Rule
	Cues     []*Cue
	Turns    []*Pattern // words after which the earlier event is told
	Onward   []*Pattern // words after which the later event is told
	Explains []*Pattern // words of a sentence that tells what brought an event about
	Always   []Before   // what comes first in time, however it is told
	Usually  []Before   // what comes first where an event is summed up

	Limits      []Limit             // where a speed that limits the flight is told
	SpeedFlown  []*Pattern          // a speed flown is told; what is shown is the number
	Measures    map[string][]string // factor -> kinds of measure that belong to it
	Actors      []Actor             // words for those who act
	Retelling   []*Pattern          // words of a sentence from which the event is told a second time
	Calibration Calibration         // how sure a tag is
	InBrief     []*Pattern          // words of an opening sentence that tells it in brief
	CentreLine  []*Pattern          // words for engines on the centre line, which have no dead side
	EngineCount map[int][]*Pattern  // words for an aircraft with 2, 3 or 4 engines
	LandingRoll []*Pattern          // words of a landing roll, where an engine has no dead side

	rules  index[*Rule]
	cues   index[*Cue]
	turns  index[struct{}]
	onward index[struct{}]
	terms  map[string]*term
	types  []typeKey
}

// Rule finds one factor.
type Rule struct {
	ID       string // factor/name
	Factor   string
	Says     string // what it means that this rule found something
	Hash     string // of the rule with every term that it uses
	Strength float64
	Side     string   // whose side the words around tell: that of the dead "engine", of a "lever" or system, of "rudder" or "motion"
	Kinds    []string // kinds of narrative that it reads; none for all
	DeadSide bool     // holds only on the side of an engine that failed before, and is inferred
	LiveSide bool     // holds only on the other side
	Denies   bool     // its words say that the factor did not happen ("the engine ran normally")
	Look     []*Pattern
	With     []*Pattern       // one of these must stand in the same sentence
	Unless   []*Pattern       // none of these may stand in the same sentence
	Near     []*Pattern       // one of these must stand in the same or a neighbouring sentence
	NotNear  []*Pattern       // none of these may stand in the same or a neighbouring sentence
	Nowhere  []*Pattern       // none of these may stand anywhere in the narrative
	PartOf   []*Pattern       // the match may not overlap one of these
	NotBy    []string         // actors whose deed it is not
	NotAfter []string         // no affirmed factor of these may come before
	NotOver  []string         // its words may not overlap those of an affirmed factor of these
	After    []catalogue.Kind // an affirmed factor of one of these kinds must come before
	Examples []Example
	File     string
	Line     int
}

// Example is a text that a rule must, or must not, find its factor in.
type Example struct {
	Text  string
	Shown corpus.Span      // what must be highlighted; empty where not said
	Want  corpus.Assertion // "" where the rule must not match at all
	File  string
	Line  int
}

// Cue is words that tell how what stands near them is spoken of.
type Cue struct {
	Sense    Sense
	Reach    Reach
	Words    int  // how many words it reaches
	Clause   bool // its reach ends at a comma
	InCauses bool // of sense possible: holds in a cause statement too
	Look     []*Pattern
}

// Sense is what a cue says of the factors in its reach.
type Sense string

// The senses beyond the four assertions: Nothing marks words that look like a
// cue and are none ("not only"), and End words that end the reach of others.
const (
	Nothing Sense = "nothing"
	End     Sense = "end"
)

// Reach is the direction in which a cue works.
type Reach string

// The directions. Sentence reaches over the whole sentence.
const (
	Forward  Reach = "forward"
	Backward Reach = "backward"
	Whole    Reach = "sentence"
)

// Calibration turns what is known of a tag into the probability that it is
// right: the logistic function of the sum of the values that hold for it,
// between Least and Most.
type Calibration struct {
	Base     float64            `yaml:"base"`
	Written  float64            `yaml:"written"`  // times logit(strength written in the rule) - logit(0.9)
	Cause    float64            `yaml:"cause"`    // told in a cause statement
	Remarks  float64            `yaml:"remarks"`  // told in short remarks
	Repeated float64            `yaml:"repeated"` // affirmed more than once in the occurrence
	Least    float64            `yaml:"least"`
	Most     float64            `yaml:"most"`
	Rules    map[string]float64 `yaml:"rules"` // by id; 0 for a rule that is not named
}

// Limit is a named speed and the patterns that show its number.
type Limit struct {
	Kind string // vmc, stall or blue-line
	Look []*Pattern
}

// Actor is a part that people play, and the words for it.
type Actor struct {
	Name string // pilot, co-pilot, student, instructor, controller or mechanic
	Look []*Pattern
}

// Before says that one factor (or one below it) comes before another in time.
type Before struct{ First, Then string }

// Fault is an error in a rule file.
type Fault struct {
	File string
	Line int
	Text string
}

func (f *Fault) Error() string { return fmt.Sprintf("%s:%d: %s", f.File, f.Line, f.Text) }

type termState uint8

const (
	unseen termState = iota
	expanding
	expanded
)

type term struct {
	source  []located
	file    string
	line    int
	state   termState
	phrases [][]text.Word
	uses    map[string]bool
}

// located is a string of a rule file with the line that it stands on.
type located struct {
	text string
	line int
}

// UnmarshalYAML keeps the line of the node.
func (l *located) UnmarshalYAML(n ast.Node) error {
	l.line = n.GetToken().Position.Line
	switch v := n.(type) {
	case *ast.StringNode:
		l.text = v.Value
	case *ast.LiteralNode:
		l.text = strings.TrimRight(v.Value.Value, "\n")
	default:
		return fmt.Errorf("line %d: want text here; put it in quotes", l.line)
	}
	return nil
}

type fileYAML struct {
	Terms    map[string][]located `yaml:"terms"`
	Factor   located              `yaml:"factor"`
	Rules    []ruleYAML           `yaml:"rules"`
	Cues     []cueYAML            `yaml:"cues"`
	Order    []located            `yaml:"order"`
	Onward   []located            `yaml:"onward"`
	Explains []located            `yaml:"explains"`
	Always   []located            `yaml:"always"`
	Usually  []located            `yaml:"in summaries"`
	Landing  []located            `yaml:"landing roll"`
	Centre   []located            `yaml:"engines on the centre line"`
	Two      []located            `yaml:"two engines"`
	Three    []located            `yaml:"three engines"`
	Four     []located            `yaml:"four engines"`
	Minimum  []located            `yaml:"minimum control speed is"`
	Stall    []located            `yaml:"stall speed is"`
	BlueLine []located            `yaml:"blue line is"`
	Speed    []located            `yaml:"speed flown is"`
	Measures map[string][]string  `yaml:"measures"`
	Actors   map[string][]located `yaml:"actors"`
	Retold   []located            `yaml:"told again"`
	InBrief  []located            `yaml:"told in brief"`
	Strength *Calibration         `yaml:"calibration"`
	Types    []typesYAML          `yaml:"aircraft types"`
}

type ruleYAML struct {
	Name      located   `yaml:"rule"`
	Factor    string    `yaml:"factor"` // where it differs from the file's
	Says      string    `yaml:"says"`
	Strength  float64   `yaml:"strength"`
	Side      string    `yaml:"side"`
	DeadSide  bool      `yaml:"on the dead side"`
	LiveSide  bool      `yaml:"on the live side"`
	Denies    bool      `yaml:"denies"`
	Kinds     []string  `yaml:"only in"`
	Off       bool      `yaml:"off"`
	Look      []located `yaml:"look for"`
	With      []located `yaml:"with"`
	Unless    []located `yaml:"unless"`
	Near      []located `yaml:"near"`
	NotNear   []located `yaml:"not near"`
	Nowhere   []located `yaml:"nowhere"`
	PartOf    []located `yaml:"not part of"`
	NotBy     []string  `yaml:"not by"`
	After     []string  `yaml:"only after"`
	NotAfter  []string  `yaml:"not after"`
	NotOver   []string  `yaml:"not over"`
	Match     []located `yaml:"match"`
	NoMatch   []located `yaml:"no match"`
	Denied    []located `yaml:"denied"`
	Possible  []located `yaml:"possible"`
	Advised   []located `yaml:"advised"`
	Elsewhere []located `yaml:"elsewhere"`
}

type cueYAML struct {
	Sense  Sense     `yaml:"sense"`
	Within string    `yaml:"within"` // "clause" or nothing
	Causes bool      `yaml:"also in causes"`
	Reach  Reach     `yaml:"reach"`
	Words  int       `yaml:"words"`
	Look   []located `yaml:"look for"`
}

//go:embed book/*.yaml
var files embed.FS

// Builtin returns the book that ships with the program.
var Builtin = sync.OnceValues(func() (*Book, error) { return Load(catalogue.Builtin()) })

// Load reads the built-in book and, over it, the rule files (*.yaml) of each
// further folder: a term or a rule of the same name replaces the earlier one.
// The error joins every fault that was found.
func Load(tree *catalogue.Tree, folders ...fs.FS) (*Book, error) {
	builtin, err := fs.Sub(files, "book")
	if err != nil {
		return nil, err
	}
	return load(tree, append([]fs.FS{builtin}, folders...)...)
}

// load reads and compiles the given folders and no others.
func load(tree *catalogue.Tree, folders ...fs.FS) (*Book, error) {
	l := &loader{
		book:  &Book{Tree: tree, Lexicon: text.NewLexicon(), terms: map[string]*term{}},
		rules: map[string]*ruleYAML{}, files: map[string]string{}, hash: text.Spelling(),
	}
	for _, folder := range folders {
		if err := l.read(folder); err != nil {
			return nil, err
		}
	}
	l.compile()
	if len(l.faults) > 0 {
		return nil, errors.Join(l.faults...)
	}
	return l.book, nil
}

type loader struct {
	book   *Book
	rules  map[string]*ruleYAML
	files  map[string]string // rule id -> file
	cues   []fileYAML
	names  []string // files, in order, beside cues
	hash   []byte
	faults []error
}

func (l *loader) fault(file string, line int, format string, args ...any) {
	l.faults = append(l.faults, &Fault{file, line, fmt.Sprintf(format, args...)})
}

func (l *loader) read(folder fs.FS) error {
	names, err := fs.Glob(folder, "*.yaml")
	if err != nil {
		return fmt.Errorf("list rule files: %w", err)
	}
	slices.Sort(names)
	for _, name := range names {
		data, err := fs.ReadFile(folder, name)
		if err != nil {
			return fmt.Errorf("read rule file: %w", err)
		}
		if len(data) > 1<<20 {
			return &Fault{name, 1, "a rule file may hold 1 MiB at most"}
		}
		sum := sha256.New()
		sum.Write(l.hash)
		sum.Write([]byte(path.Base(name)))
		sum.Write(data)
		l.hash = sum.Sum(nil)
		var file fileYAML
		if err := decode(data, &file); err != nil {
			l.fault(name, yamlLine(err), "%s", strings.TrimSpace(yaml.FormatError(err, false, true)))
			continue
		}
		l.add(name, file)
	}
	return nil
}

// decode reads a rule file. The library can panic on a malformed document
// (a tag without a value, say); that is an error like another.
func decode(data []byte, file *fileYAML) (err error) {
	defer func() {
		if p := recover(); p != nil {
			err = fmt.Errorf("not a rule file: the YAML cannot be read (%v)", p)
		}
	}()
	return yaml.UnmarshalWithOptions(data, file, yaml.Strict())
}

// yamlLine finds the line of a YAML error, 1 where it does not tell.
func yamlLine(err error) int {
	var e yaml.Error
	if errors.As(err, &e) && e.GetToken() != nil {
		return e.GetToken().Position.Line
	}
	return 1
}

func (l *loader) add(name string, file fileYAML) {
	for key, phrases := range file.Terms {
		line := 1
		if len(phrases) > 0 {
			line = phrases[0].line
		}
		if strings.ContainsAny(key, " {}()|?") {
			l.fault(name, line, "term %q: a name is one word, with hyphens at most", key)
			continue
		}
		l.book.terms[key] = &term{source: phrases, file: name, line: line}
	}
	for i := range file.Rules {
		r := &file.Rules[i]
		if r.Factor == "" {
			r.Factor = file.Factor.text
		}
		id := r.Factor + "/" + r.Name.text
		switch _, known := l.book.Tree.Factor(r.Factor); {
		case r.Name.text == "":
			l.fault(name, max(1, file.Factor.line), "a rule without a name (rule: ...)")
		case !known:
			l.fault(name, r.Name.line, "rule %q: the catalogue has no factor %q", r.Name.text, r.Factor)
		case l.files[id] == name && l.rules[id] != nil:
			l.fault(name, r.Name.line, "rule %q stands twice in this file", id)
		default:
			l.rules[id], l.files[id] = r, name
		}
	}
	l.cues, l.names = append(l.cues, file), append(l.names, name)
}

func (l *loader) compile() {
	b := l.book
	b.Version = hex.EncodeToString(l.hash)[:12]
	b.Limits = []Limit{{Kind: "vmc"}, {Kind: "stall"}, {Kind: "blue-line"}}
	b.Measures, b.EngineCount = map[string][]string{}, map[int][]*Pattern{}
	c := &compiler{lexicon: b.Lexicon, terms: b.terms, used: map[string]bool{}}
	ids := make([]string, 0, len(l.rules))
	for id := range l.rules {
		ids = append(ids, id)
	}
	slices.Sort(ids)
	for _, id := range ids {
		if y := l.rules[id]; !y.Off {
			b.Rules = append(b.Rules, l.rule(c, id, l.files[id], y))
		}
	}
	clear(c.used)
	for i, f := range l.cues {
		if f.Strength != nil {
			b.Calibration = *f.Strength
		}
		for _, y := range f.Cues {
			b.Cues = append(b.Cues, l.cue(c, l.names[i], y))
		}
		b.Turns = append(b.Turns, l.patterns(c, l.names[i], f.Order)...)
		b.Onward = append(b.Onward, l.patterns(c, l.names[i], f.Onward)...)
		b.Explains = append(b.Explains, l.patterns(c, l.names[i], f.Explains)...)
		b.Always = append(b.Always, l.befores(l.names[i], f.Always)...)
		b.Usually = append(b.Usually, l.befores(l.names[i], f.Usually)...)
		for k, from := range [][]located{f.Minimum, f.Stall, f.BlueLine} {
			b.Limits[k].Look = append(b.Limits[k].Look, l.patterns(c, l.names[i], from)...)
		}
		l.measures(l.names[i], f.Measures)
		l.actors(c, l.names[i], f.Actors)
		b.InBrief = append(b.InBrief, l.patterns(c, l.names[i], f.InBrief)...)
		b.Retelling = append(b.Retelling, l.patterns(c, l.names[i], f.Retold)...)
		b.SpeedFlown = append(b.SpeedFlown, l.patterns(c, l.names[i], f.Speed)...)
		l.aircraftTypes(l.names[i], f.Types)
		b.LandingRoll = append(b.LandingRoll, l.patterns(c, l.names[i], f.Landing)...)
		b.CentreLine = append(b.CentreLine, l.patterns(c, l.names[i], f.Centre)...)
		for n, from := range map[int][]located{2: f.Two, 3: f.Three, 4: f.Four} {
			b.EngineCount[n] = append(b.EngineCount[n], l.patterns(c, l.names[i], from)...)
		}
	}
	b.Common = l.commonHash(c.used)
	// terms that no rule uses are compiled all the same, so that their faults show
	for name := range b.terms {
		if _, err := c.term(name); err != nil {
			l.termFault(name, err)
		}
	}
	size := b.Lexicon.Size()
	b.rules, b.cues, b.turns = newIndex[*Rule](size), newIndex[*Cue](size), newIndex[struct{}](size)
	for _, r := range b.Rules {
		b.rules.add(r, r.Look)
	}
	for _, cue := range b.Cues {
		b.cues.add(cue, cue.Look)
	}
	b.turns.add(struct{}{}, b.Turns)
	b.onward = newIndex[struct{}](size)
	b.onward.add(struct{}{}, b.Onward)
	slices.SortFunc(l.faults, func(a, b error) int { return cmp.Compare(a.Error(), b.Error()) })
	l.faults = slices.CompactFunc(l.faults, func(a, b error) bool { return a.Error() == b.Error() })
}

// measures adds, for each kind of measure, the factors that it belongs to.
func (l *loader) measures(file string, kinds map[string][]string) {
	for kind, factors := range kinds {
		for _, id := range factors {
			if _, known := l.book.Tree.Factor(id); !known {
				l.fault(file, 1, "measures: the catalogue has no factor %q", id)
			}
			l.book.Measures[id] = append(l.book.Measures[id], kind)
		}
	}
	for _, of := range l.book.Measures {
		slices.Sort(of)
	}
}

// actorNames are the parts that a tag can name.
var actorNames = []string{"pilot", "co-pilot", "student", "instructor", "controller", "mechanic"}

func (l *loader) actors(c *compiler, file string, actors map[string][]located) {
	for _, name := range actorNames {
		if from := actors[name]; from != nil {
			l.book.Actors = append(l.book.Actors, Actor{name, l.patterns(c, file, from)})
		}
	}
	for name, from := range actors {
		if !slices.Contains(actorNames, name) {
			line := 1
			if len(from) > 0 {
				line = from[0].line
			}
			l.fault(file, line, "actors: no such part %q; want one of %s", name, strings.Join(actorNames, ", "))
		}
	}
}

// befores reads "a < b, c".
func (l *loader) befores(file string, lines []located) []Before {
	var out []Before
	for _, s := range lines {
		first, rest, ok := strings.Cut(s.text, "<")
		if !ok {
			l.fault(file, s.line, "%q: want FACTOR < FACTOR, FACTOR ...", s.text)
			continue
		}
		for _, then := range strings.Split(rest, ",") {
			b := Before{strings.TrimSpace(first), strings.TrimSpace(then)}
			for _, id := range []string{b.First, b.Then} {
				if _, known := l.book.Tree.Factor(id); !known {
					l.fault(file, s.line, "the catalogue has no factor %q", id)
				}
			}
			out = append(out, b)
		}
	}
	return out
}

func (l *loader) termFault(name string, err error) {
	var f *Fault
	if errors.As(err, &f) {
		l.faults = append(l.faults, f)
		return
	}
	t := l.book.terms[name]
	l.fault(t.file, t.line, "%v", err)
}

func (l *loader) patterns(c *compiler, file string, sources []located) []*Pattern {
	var out []*Pattern
	for _, s := range sources {
		p, err := c.pattern(s.text)
		var f *Fault
		switch {
		case errors.As(err, &f):
			l.faults = append(l.faults, f)
		case err != nil:
			l.fault(file, s.line, "%v", err)
		default:
			out = append(out, p)
		}
	}
	return out
}

func (l *loader) rule(c *compiler, id, file string, y *ruleYAML) *Rule {
	r := &Rule{
		ID: id, DeadSide: y.DeadSide, LiveSide: y.LiveSide, Denies: y.Denies, Kinds: y.Kinds, Factor: y.Factor, Says: y.Says, Strength: cmp.Or(y.Strength, 0.9), Side: y.Side,
		File: file, Line: y.Name.line, NotBy: y.NotBy, NotAfter: y.NotAfter, NotOver: y.NotOver,
	}
	for _, f := range slices.Concat(y.NotAfter, y.NotOver) {
		if _, known := l.book.Tree.Factor(f); !known {
			l.fault(file, r.Line, "rule %q: not after, not over: the catalogue has no factor %q", id, f)
		}
	}
	for _, name := range y.NotBy {
		if !slices.Contains(actorNames, name) {
			l.fault(file, r.Line, "rule %q: not by: no such part %q; want one of %s", id, name, strings.Join(actorNames, ", "))
		}
	}
	if r.Strength < 0 || r.Strength > 1 {
		l.fault(file, r.Line, "rule %q: strength %g is not between 0 and 1", id, r.Strength)
	}
	switch r.Side {
	case "", "engine", "lever", "rudder", "motion":
	default:
		l.fault(file, r.Line, "rule %q: side %q: want engine, lever, rudder or motion", id, r.Side)
	}
	if (r.DeadSide || r.LiveSide) && r.Side != "rudder" && r.Side != "motion" {
		l.fault(file, r.Line, "rule %q: on the dead side, and on the live side, want side: rudder or motion", id)
	}
	clear(c.used)
	for _, part := range []struct {
		into *[]*Pattern
		from []located
	}{{&r.Look, y.Look}, {&r.With, y.With}, {&r.Unless, y.Unless}, {&r.Near, y.Near}, {&r.NotNear, y.NotNear}, {&r.Nowhere, y.Nowhere}, {&r.PartOf, y.PartOf}} {
		*part.into = l.patterns(c, file, part.from)
	}
	for _, kind := range y.After {
		switch k := catalogue.Kind(kind); k {
		case catalogue.Trigger, catalogue.Response, catalogue.Condition, catalogue.Outcome, catalogue.Recovery:
			r.After = append(r.After, k)
		default:
			l.fault(file, r.Line, "rule %q: only after: no such kind %q", id, kind)
		}
	}
	if len(y.Look) == 0 {
		l.fault(file, r.Line, "rule %q looks for nothing (look for: ...)", id)
	}
	r.Hash = l.ruleHash(y, id, c.used)
	for _, group := range []struct {
		want corpus.Assertion
		from []located
	}{
		{corpus.Affirmed, y.Match}, {"", y.NoMatch}, {corpus.Denied, y.Denied},
		{corpus.Possible, y.Possible}, {corpus.Advised, y.Advised}, {corpus.Elsewhere, y.Elsewhere},
	} {
		for _, s := range group.from {
			r.Examples = append(r.Examples, example(s, group.want, file))
		}
	}
	switch {
	case r.Denies && (len(y.Denied) == 0 || len(y.Match) > 0):
		l.fault(file, r.Line, "rule %q denies its factor: its examples that must match stand under denied", id)
	case !r.Denies && len(y.Match) == 0:
		l.fault(file, r.Line, "rule %q has no example that must match (match: ...)", id)
	}
	return r
}

// ruleHash covers everything that decides what the rule finds: its own
// patterns and each term below them.
func (l *loader) ruleHash(y *ruleYAML, id string, used map[string]bool) string {
	h := sha256.New()
	fmt.Fprintf(h, "%s|%g|%s|%v|%t|%t|%t|%v|%v", id, y.Strength, y.Side, y.After, y.DeadSide, y.LiveSide, y.Denies, y.Kinds, y.NotBy)
	fmt.Fprintf(h, "|%v|%v", y.NotAfter, y.NotOver)
	for _, part := range [][]located{y.Look, y.With, y.Unless, y.Near, y.NotNear, y.Nowhere, y.PartOf} {
		fmt.Fprint(h, "\n--")
		for _, s := range part {
			fmt.Fprint(h, "\n", s.text)
		}
	}
	l.hashTerms(h, used)
	return hex.EncodeToString(h.Sum(nil))[:12]
}

func (l *loader) hashTerms(h io.Writer, used map[string]bool) {
	for _, name := range slices.Sorted(maps.Keys(used)) {
		fmt.Fprint(h, "\n=", name)
		if t := l.book.terms[name]; t != nil {
			for _, s := range t.source {
				fmt.Fprint(h, "\n", s.text)
			}
		}
	}
}

// commonHash covers the sections that bear on the tags of every rule, with the
// terms that they use.
func (l *loader) commonHash(used map[string]bool) string {
	h := sha256.New()
	h.Write(text.Spelling())
	texts := func(name string, from []located) {
		if len(from) == 0 {
			return // a further file without such a section changes nothing
		}
		fmt.Fprint(h, "\n--", name)
		for _, s := range from {
			fmt.Fprint(h, "\n", s.text)
		}
	}
	for _, f := range l.cues {
		if f.Strength != nil {
			fmt.Fprintf(h, "\n%+v", *f.Strength) // maps are printed in order of their keys
		}
		for _, y := range f.Cues {
			fmt.Fprintf(h, "\n%s|%s|%s|%d|%t", y.Sense, y.Within, y.Reach, y.Words, y.Causes)
			texts("cue", y.Look)
		}
		for i, from := range [][]located{f.Order, f.Onward, f.Explains, f.Always, f.Usually, f.Landing, f.Centre, f.Two, f.Three, f.Four, f.Minimum, f.Stall, f.BlueLine, f.Speed, f.Retold, f.InBrief} {
			texts(fmt.Sprint(i), from)
		}
		for _, kind := range slices.Sorted(maps.Keys(f.Measures)) {
			fmt.Fprint(h, "\n", kind, f.Measures[kind])
		}
		for _, name := range slices.Sorted(maps.Keys(f.Actors)) {
			texts(name, f.Actors[name])
		}
		for _, y := range f.Types {
			fmt.Fprintf(h, "\n%d|%s|%s", y.Engines, y.Place, y.Kind)
			texts("types", y.Types)
		}
	}
	l.hashTerms(h, used)
	return hex.EncodeToString(h.Sum(nil))[:12]
}

// example cuts the marks [ and ] out of a text and keeps what they enclose.
func example(s located, want corpus.Assertion, file string) Example {
	e := Example{Text: s.text, Want: want, File: file, Line: s.line}
	if from := strings.IndexByte(s.text, '['); from >= 0 {
		if to := strings.IndexByte(s.text, ']'); to > from {
			e.Text = s.text[:from] + s.text[from+1:to] + s.text[to+1:]
			e.Shown = corpus.Span{Start: from, End: to - 1}
		}
	}
	return e
}

func (l *loader) cue(c *compiler, file string, y cueYAML) *Cue {
	line := 1
	if len(y.Look) > 0 {
		line = y.Look[0].line
	}
	switch y.Sense {
	case Sense(corpus.Denied), Sense(corpus.Possible), Sense(corpus.Advised), Sense(corpus.Elsewhere), Nothing, End:
	default:
		l.fault(file, line, "cue: no such sense %q", y.Sense)
	}
	switch y.Reach {
	case "":
		y.Reach = Forward
	case Forward, Backward, Whole:
	default:
		l.fault(file, line, "cue: no such reach %q", y.Reach)
	}
	if y.Within != "" && y.Within != "clause" {
		l.fault(file, line, "cue: within %q: want clause, or leave it out", y.Within)
	}
	return &Cue{Sense: y.Sense, Reach: y.Reach, Words: cmp.Or(y.Words, 8), Clause: y.Within == "clause", InCauses: y.Causes, Look: l.patterns(c, file, y.Look)}
}

// index finds, by the word at hand, the patterns that can begin with it.
type index[T any] [][]entry[T]

type entry[T any] struct {
	// mask stands beside the pattern, so that most patterns are ruled out
	// without a look at them: they lie all over the memory
	mask    text.Signature
	owner   T
	pattern *Pattern
}

func newIndex[T any](size int) index[T] { return make(index[T], size) }

func (x index[T]) add(owner T, patterns []*Pattern) {
	for _, p := range patterns {
		for _, w := range p.first {
			x[w] = append(x[w], entry[T]{p.mask(), owner, p})
		}
	}
}

// FindRules calls found for every place in the sentence where a rule's
// pattern matches.
func (b *Book) FindRules(d *text.Doc, s text.Sentence, found func(*Rule, Match)) {
	find(b.rules, d, s, found)
}

// FindCues calls found for every cue in the sentence.
func (b *Book) FindCues(d *text.Doc, s text.Sentence, found func(*Cue, Match)) {
	find(b.cues, d, s, found)
}

// FindTurns calls found for every word in the sentence after which something
// earlier is told.
func (b *Book) FindTurns(d *text.Doc, s text.Sentence, found func(Match)) {
	find(b.turns, d, s, func(_ struct{}, m Match) { found(m) })
}

// FindOnward calls found for every word in the sentence after which something
// later is told.
func (b *Book) FindOnward(d *text.Doc, s text.Sentence, found func(Match)) {
	find(b.onward, d, s, func(_ struct{}, m Match) { found(m) })
}

func find[T any](x index[T], d *text.Doc, s text.Sentence, found func(T, Match)) {
	signature := d.Signature(s)
	for i := s.First; i < s.Last; i++ {
		entries := x[d.Tokens[i].Word]
		for k := range entries {
			e := &entries[k]
			if !e.mask.Meets(&signature) || !e.pattern.possible(d, s) {
				continue
			}
			if m, ok := e.pattern.MatchAt(d, i, s.Last); ok {
				found(e.owner, m)
			}
		}
	}
}

// Stands tells whether one of the patterns matches anywhere in the sentence.
func Stands(patterns []*Pattern, d *text.Doc, s text.Sentence) bool {
	for _, p := range patterns {
		if !p.possible(d, s) || !d.Has(s, p.first, p.starts) {
			continue
		}
		for i := s.First; i < s.Last; i++ {
			if p.canStart(d.Tokens[i].Word) {
				if _, ok := p.MatchAt(d, i, s.Last); ok {
					return true
				}
			}
		}
	}
	return false
}

// Overlaps tells whether one of the patterns matches in the sentence over
// some of the tokens first..last-1.
func Overlaps(patterns []*Pattern, d *text.Doc, s text.Sentence, first, last int) bool {
	for _, p := range patterns {
		if !p.possible(d, s) {
			continue
		}
		for i := s.First; i < last; i++ {
			if p.canStart(d.Tokens[i].Word) {
				if m, ok := p.MatchAt(d, i, s.Last); ok && m.Last > first {
					return true
				}
			}
		}
	}
	return false
}

// Each calls found for every place in the sentence where one of the patterns
// matches.
func Each(patterns []*Pattern, d *text.Doc, s text.Sentence, found func(Match)) {
	for _, p := range patterns {
		if !p.possible(d, s) {
			continue
		}
		for i := s.First; i < s.Last; i++ {
			if p.canStart(d.Tokens[i].Word) {
				if m, ok := p.MatchAt(d, i, s.Last); ok {
					found(m)
				}
			}
		}
	}
}

// UnusedTerms lists the terms that no rule, cue or other term uses.
func (b *Book) UnusedTerms() []string {
	used := map[string]bool{}
	for _, t := range b.terms {
		for u := range t.uses {
			used[u] = true
		}
	}
	var out []string
	for name := range b.terms {
		if !used[name] && !b.mentions(name) {
			out = append(out, name)
		}
	}
	slices.Sort(out)
	return out
}

func (b *Book) mentions(name string) bool {
	has := func(ps []*Pattern) bool {
		return slices.ContainsFunc(ps, func(p *Pattern) bool { return strings.Contains(p.Source, "{"+name+"}") })
	}
	for _, r := range b.Rules {
		if has(r.Look) || has(r.With) || has(r.Unless) || has(r.Near) || has(r.NotNear) || has(r.Nowhere) || has(r.PartOf) {
			return true
		}
	}
	return has(b.Turns) || has(b.Onward) || has(b.Explains) || has(b.LandingRoll) || has(b.Retelling) || has(b.InBrief) || has(b.CentreLine) || has(b.SpeedFlown) ||
		slices.ContainsFunc(b.Limits, func(x Limit) bool { return has(x.Look) }) ||
		slices.ContainsFunc(b.Actors, func(x Actor) bool { return has(x.Look) }) ||
		slices.ContainsFunc(b.Cues, func(x *Cue) bool { return has(x.Look) })
}
