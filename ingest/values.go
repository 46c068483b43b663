package ingest

import (
	"bytes"
	_ "embed"
	"encoding/csv"
	"fmt"
	"html"
	"regexp"
	"strconv"
	"strings"
	"sync"
	"unicode"

	"golang.org/x/text/runes"
	"golang.org/x/text/transform"
	"golang.org/x/text/unicode/norm"
)

// placeholders are cells that say "not known" (common practice, no source).
// "None" is one as well, except where none is an answer: see word.
var placeholders = map[string]bool{
	"": true, "NULL": true, "(NULL)": true, "<NULL>": true, "NIL": true, "NONE": true, "NAN": true,
	"N/A": true, "#N/A": true, "NA": true, "N.A": true, "NONE SUBMITTED": true, "NOT SUBMITTED": true,
	"NOT APPLICABLE": true, "NOT AVAILABLE": true, "NOT REPORTED": true, "NOT PROVIDED": true, "NOT STATED": true,
	"NO DATA": true, "NOT KNOWN": true, "UNKNOWN": true, "UNK": true, "UNDETERMINED": true, "UNSPECIFIED": true,
	"UNREPORTED": true, "UNAVAILABLE": true, "BLANK": true, "TBD": true, "TO BE DETERMINED": true, "NO AIRCRAFT": true, "A DEFINIR": true,
}

// placeholder tells whether a cell stands for nothing known. A text longer
// than any placeholder never does.
func placeholder(text string) bool {
	text = strings.TrimSpace(text)
	if len(text) > 20 {
		return strings.Trim(text, "*-?.") == ""
	}
	if strings.Trim(text, "*-?. ") == "" {
		return true
	}
	return placeholders[strings.ToUpper(strings.TrimSuffix(text, "."))]
}

// words turn what publishers write into the words of the occurrence record:
// field -> squeezed cell -> word (common practice, no source).
var words = map[string]map[string]string{
	"injury": {
		"fatal": "fatal", "fatl": "fatal", "fatality": "fatal", "fatalities": "fatal", "fatalinjury": "fatal", "fatalinjuries": "fatal",
		"serious": "serious", "sers": "serious", "seri": "serious", "seriousinjury": "serious", "seriousinjuries": "serious",
		"minor": "minor", "minr": "minor", "mino": "minor", "minorinjury": "minor", "minorinjuries": "minor", "slight": "minor",
		"none": "none", "noinjury": "none", "noinjuries": "none", "uninjured": "none", "nil": "none",
	},
	"damage": {
		"destroyed": "destroyed", "dest": "destroyed", "totalloss": "destroyed", "hullloss": "destroyed", "writtenoff": "destroyed",
		"substantial": "substantial", "subs": "substantial", "subst": "substantial", "substantialdamage": "substantial",
		"minor": "minor", "minr": "minor", "minordamage": "minor", "slight": "minor",
		"none": "none", "nodamage": "none", "undamaged": "none", "nil": "none",
	},
	"event": {
		"accident": "accident", "acc": "accident", "acidente": "accident",
		"seriousincident": "serious-incident", "sinc": "serious-incident", "incidentegrave": "serious-incident",
		"incident": "incident", "inc": "incident", "incidente": "incident",
		"report": "report", "voluntaryreport": "report", "hazardreport": "report", "safetyreport": "report", "hazard": "report",
	},
}

// categories are the words of the record for kinds of aircraft (common
// practice, no source).
var categories = map[string]string{
	"airplane": "airplane", "aeroplane": "airplane", "air": "airplane", "plane": "airplane", "fixedwing": "airplane", "avion": "airplane", "aviao": "airplane",
	"helicopter": "helicopter", "heli": "helicopter", "rotorcraft": "helicopter", "rotarywing": "helicopter", "helicoptero": "helicopter",
	"glider": "glider", "gli": "glider", "sailplane": "glider", "planador": "glider", "motorglider": "motor-glider", "poweredglider": "motor-glider",
	"balloon": "balloon", "ball": "balloon", "airship": "airship", "blimp": "airship",
	"gyroplane": "gyroplane", "gyro": "gyroplane", "gyrocopter": "gyroplane", "autogyro": "gyroplane",
	"weightshift": "weight-shift", "wsft": "weight-shift", "weightshiftcontrol": "weight-shift", "trike": "weight-shift",
	"poweredparachute": "powered-parachute", "ppar": "powered-parachute", "ultralight": "ultralight", "ultr": "ultralight", "ultraleve": "ultralight",
	"unmanned": "unmanned", "uas": "unmanned", "drone": "unmanned", "uav": "unmanned", "poweredlift": "powered-lift",
}

//go:embed phases.csv
var phasesCSV []byte

// phaseCodes maps squeezed words to the codes of the CICTT phase-of-flight
// taxonomy; a code stands for itself.
var phaseCodes = sync.OnceValue(func() map[string]string {
	codes := map[string]string{"unk": "UNK"}
	r := csv.NewReader(bytes.NewReader(phasesCSV))
	rows, err := r.ReadAll()
	if err != nil {
		panic(err) // the file is part of the program
	}
	for _, row := range rows[1:] {
		codes[squeeze(row[0])] = row[1]
		codes[strings.ToLower(row[1])] = row[1]
	}
	return codes
})

// phase is the code of a cell. Of several phases it is the first that is
// known; whole is false when the cell says more or other than the code. A
// cell without a known phase stays as it is.
func phase(cell string) (code string, whole, known bool) {
	cell = strings.TrimSpace(cell)
	if code := phaseCodes()[plainLetters(cell)]; code != "" {
		return code, code == cell, true
	}
	for _, part := range strings.FieldsFunc(cell, func(r rune) bool { return r == ';' || r == ',' || r == '|' }) {
		if code := phaseCodes()[plainLetters(part)]; code != "" {
			return code, false, true
		}
	}
	return cell, true, placeholder(cell)
}

// plainLetters squeezes a text and takes the accents of its letters off.
func plainLetters(text string) string {
	plain, _, err := transform.String(transform.Chain(norm.NFD, runes.Remove(runes.In(unicode.Mn)), norm.NFC), text)
	if err != nil {
		plain = text
	}
	return squeeze(plain)
}

// severity ranks the words of a field, the gravest first.
var severity = map[string][]string{
	"injury": {"fatal", "serious", "minor", "none"},
	"damage": {"destroyed", "substantial", "minor", "none"},
	"event":  {"accident", "serious-incident", "incident", "report"},
}

// counted is the number of people that may follow an injury: "Fatal(2)".
var counted = regexp.MustCompile(`\s*\(\d+\)$`)

// word is the record's word for a cell of the field injury, damage or event,
// or "" when the cell says something else. Of a list, one value for each
// aircraft, it is the gravest, and whole is false.
func word(field, cell string) (w string, whole bool) {
	cell = counted.ReplaceAllString(strings.TrimSpace(cell), "")
	parts := listed(cell)
	if w := words[field][squeeze(cell)]; w != "" && len(parts) == 1 {
		return w, true
	}
	best := len(severity[field])
	for _, part := range parts {
		w, ok := words[field][squeeze(part)]
		if !ok && !placeholder(part) {
			return "", false
		}
		for rank, other := range severity[field] {
			if w == other {
				best = min(best, rank)
			}
		}
	}
	if best == len(severity[field]) {
		return "", false
	}
	return severity[field][best], false
}

// listed cuts a cell that holds one value for each of several aircraft; a
// value may be blank.
func listed(cell string) []string {
	return strings.Split(strings.NewReplacer(";", ",", "/", ",", "|", ",").Replace(cell), ",")
}

// maxEngines is more than any aircraft has had; more is a slip of the key.
const maxEngines = 64

// parseEngines reads a number of engines such as "2" or "2.0". Of a list, one
// number for each aircraft, it is the first, and whole is false. The reason
// tells why a cell is no number of engines; 0 is unknown.
func parseEngines(cell string) (n int, whole bool, reason string) {
	cell = strings.TrimSpace(cell)
	if len(cell) == 1 && cell[0] >= '0' && cell[0] <= '9' { // almost every cell
		return int(cell[0] - '0'), true, ""
	}
	if placeholder(cell) {
		return 0, true, ""
	}
	parts := listed(cell)
	for i, part := range parts {
		part = strings.TrimSpace(part)
		if placeholder(part) {
			continue
		}
		v, err := strconv.ParseFloat(part, 64)
		if err != nil {
			return 0, false, fmt.Sprintf("engines %q: not a number", brief(cell))
		}
		if v != float64(int(v)) || v < 0 || v > maxEngines {
			return 0, false, fmt.Sprintf("engines %q: no such number of engines", brief(cell))
		}
		if i == 0 {
			n = int(v)
		}
	}
	return n, len(parts) == 1, ""
}

// entity is an HTML character reference with its semicolon. Without one it
// is not taken for a reference: "R&D" and "P&L" are words.
var entity = regexp.MustCompile(`&(?:#[0-9]{1,7}|#[xX][0-9a-fA-F]{1,6}|[A-Za-z][A-Za-z0-9]{1,31});`)

// decodeEntities decodes HTML character references once.
func decodeEntities(s string) string {
	if i := strings.IndexByte(s, '&'); i < 0 || strings.IndexByte(s[i:], ';') < 0 {
		return s
	}
	return entity.ReplaceAllStringFunc(s, func(ref string) string {
		// An unknown name keeps its semicolon; html would still decode a known
		// name that it begins with.
		if text := html.UnescapeString(ref); !strings.HasSuffix(text, ";") || text == ";" {
			return text
		}
		return ref
	})
}

// brief is a text short enough to be shown in a reason.
func brief(text string) string {
	const most = 40
	if len(text) <= most {
		return text
	}
	return strings.ToValidUTF8(text[:most], "") + "…"
}
