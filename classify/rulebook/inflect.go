package rulebook

import "strings"

// irregular verbs of the trade's reports: base form -> the forms that are not
// made by adding -s, -ed or -ing. "left" is missing on purpose: it is a side.
var irregular = map[string]string{
	"be":     "be is are was were been being am",
	"become": "become becomes became becoming",
	"begin":  "begin begins began begun beginning",
	"break":  "break breaks broke broken breaking",
	"bring":  "bring brings brought bringing",
	"come":   "come comes came coming",
	"creep":  "creep creeps crept creeping",
	"cut":    "cut cuts cutting",
	"die":    "die dies died dying",
	"do":     "do does did done doing",
	"drive":  "drive drives drove driven driving",
	"fall":   "fall falls fell fallen falling",
	"feel":   "feel feels felt feeling",
	"find":   "find finds found finding",
	"fly":    "fly flies flew flown flying",
	"forget": "forget forgets forgot forgotten forgetting",
	"get":    "get gets got gotten getting",
	"give":   "give gives gave given giving",
	"go":     "go goes went gone going",
	"have":   "have has had having",
	"hold":   "hold holds held holding",
	"keep":   "keep keeps kept keeping",
	"let":    "let lets letting",
	"lose":   "lose loses lost losing",
	"make":   "make makes made making",
	"put":    "put puts putting",
	"quit":   "quit quits quitting",
	"run":    "run runs ran running",
	"see":    "see sees saw seen seeing",
	"set":    "set sets setting",
	"shut":   "shut shuts shutting",
	"sink":   "sink sinks sank sunk sinking",
	"slide":  "slide slides slid sliding",
	"slip":   "slip slips slipped slipping",
	"spin":   "spin spins spun spinning",
	"stop":   "stop stops stopped stopping",
	"swing":  "swing swings swung swinging",
	"take":   "take takes took taken taking",
	"tell":   "tell tells told telling",
	"think":  "think thinks thought thinking",
	"throw":  "throw throws threw thrown throwing",
	"apply":  "apply applies applied applying",
	"occur":  "occur occurs occurred occurring",
	"exceed": "exceed exceeds exceeded exceeding",
	"open":   "open opens opened opening",
	"slow":   "slow slows slowed slowing",
	"yaw":    "yaw yaws yawed yawing",
	"allow":  "allow allows allowed allowing",
	"regain": "regain regains regained regaining",
}

// Inflect lists the forms of a word: the verb's from its base form, which
// for most nouns are the right ones too (engine, engines), and the adverb
// (wrong, wrongly). A word cut before the e of -ate gives the noun as well
// (simulat: simulate, simulated, simulation). A form that does not exist does
// no harm: nobody writes it.
func Inflect(base string) []string {
	if forms, ok := irregular[base]; ok {
		return strings.Fields(forms)
	}
	if stem, ok := strings.CutSuffix(base, "at"); ok && len(stem) >= 3 {
		return []string{base + "e", base + "es", base + "ed", base + "ing", base + "ion", base + "ions", base + "or"}
	}
	return append(regular(base), adverb(base))
}

// adverb adds -ly.
func adverb(base string) string {
	switch {
	case strings.HasSuffix(base, "le"):
		return base[:len(base)-1] + "y"
	case strings.HasSuffix(base, "y"):
		return base[:len(base)-1] + "ily"
	}
	return base + "ly"
}

func regular(base string) []string {
	n := len(base)
	if n < 2 {
		return []string{base}
	}
	last, before := base[n-1], base[n-2]
	vowel := func(c byte) bool { return strings.IndexByte("aeiou", c) >= 0 }
	switch {
	case last == 'e':
		return []string{base, base + "s", base + "d", base[:n-1] + "ing"}
	case last == 'y' && !vowel(before):
		return []string{base, base[:n-1] + "ies", base[:n-1] + "ied", base + "ing"}
	case last == 's' || last == 'x' || last == 'z' || strings.HasSuffix(base, "ch") || strings.HasSuffix(base, "sh"):
		return []string{base, base + "es", base + "ed", base + "ing"}
	case n >= 3 && !vowel(last) && strings.IndexByte("wxyh", last) < 0 && vowel(before) && !vowel(base[n-3]) && (n <= 4 || doubles[base]):
		twice := base + string(last)
		return []string{base, base + "s", twice + "ed", twice + "ing"}
	}
	return []string{base, base + "s", base + "ed", base + "ing"}
}

// longer words whose last consonant doubles
var doubles = map[string]bool{"commit": true, "permit": true, "control": true, "propel": true, "admit": true, "refer": true, "omit": true, "level": false}
