package fabricate

import "strings"

// style is how letters are set.
type style uint8

const (
	plain      style = iota
	curly            // typographic apostrophes
	capitals         // capitals
	abbreviate       // capitals, articles dropped, words abbreviated
	styles
)

// styled is one text in each style, made once when the grammar is compiled so
// that telling only copies bytes.
type styled [styles]string

func styledOf(s string) styled {
	return styled{
		plain:      s,
		curly:      strings.ReplaceAll(s, "'", "’"),
		capitals:   strings.ToUpper(s),
		abbreviate: strings.ToUpper(abbreviated(s)),
	}
}

func styledAll(texts ...string) []styled {
	out := make([]styled, len(texts))
	for i, s := range texts {
		out[i] = styledOf(s)
	}
	return out
}

// abbreviations are those of voluntary reports and incident remarks. Common
// practice, no source.
var abbreviations = map[string]string{
	"aerodrome": "ad", "aeroplane": "acft",
	"aircraft": "acft", "airspeed": "aspd", "altimeter": "altm",
	"approach": "apch", "because": "bcoz", "before": "b4", "captain": "capt",
	"checklist": "chklist", "checks": "chks", "clearance": "clrnc", "cleared": "clrd",
	"climb": "clb", "cloud": "cld", "commander": "capt", "continued": "contd",
	"control": "ctl", "controller": "ctlr", "controls": "ctls",
	"degrees": "deg", "departed": "dptd", "departure": "dep", "descent": "dsnt",
	"destination": "dest", "directional": "dirnl", "emergency": "emer", "engine": "eng",
	"engines": "engs", "failure": "fail", "feet": "ft", "flight": "flt",
	"frequency": "freq", "ground": "gnd", "heading": "hdg",
	"hours": "hrs", "immediately": "immed", "information": "info", "instructor": "instr",
	"knots": "kts", "landed": "lndd", "landing": "lndg",
	"maintenance": "maint", "miles": "nm", "minimum": "min", "minutes": "mins",
	"number": "nr", "passenger": "pax", "passengers": "pax",
	"pilot": "plt", "position": "posn", "power": "pwr", "propeller": "prop",
	"radio": "rdo", "received": "rcvd", "reported": "rptd",
	"runway": "rwy", "seconds": "secs", "speed": "spd", "student": "stu",
	"take-off": "tkof", "temperature": "temp", "throttle": "thr",
	"tower": "twr", "traffic": "tfc", "training": "trng", "turbulence": "turb",
	"visibility": "vis", "weather": "wx", "with": "w/", "without": "w/o",
}

// abbreviated drops "the" and shortens the words of the table.
func abbreviated(s string) string {
	var b strings.Builder
	for i := 0; i < len(s); {
		end := i
		for end < len(s) && wordByte(s[end]) {
			end++
		}
		if end == i {
			b.WriteByte(s[i])
			i++
			continue
		}
		word := s[i:end]
		lower := strings.ToLower(word)
		short, ok := abbreviations[lower]
		switch {
		case lower == "the" && end < len(s) && s[end] == ' ':
			end++
		case ok:
			b.WriteString(short)
		default:
			b.WriteString(word)
		}
		i = end
	}
	return b.String()
}

// wordByte tells whether c belongs to a word; bytes of longer characters do.
func wordByte(c byte) bool {
	return c|0x20 >= 'a' && c|0x20 <= 'z' || c >= '0' && c <= '9' || c == '-' || c == '\'' || c >= 0x80
}
