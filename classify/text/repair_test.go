package text

import (
	"strings"
	"testing"
)

// An abbreviation of two meanings goes by the words around it (meanings: FAA
// and ICAO lists; that they clash is noted there, how to tell is common
// practice, no source).
func TestAmbiguousAbbreviations(t *testing.T) {
	l := NewLexicon()
	for text, want := range map[string]string{
		"L MAP FELL TO 18 INCHES.":            "left manifold pressure FELL TO 18 INCHES",
		"THE MAP WAS ON MY KNEE.":             "THE map WAS ON MY KNEE",
		"BFR WAS OVERDUE.":                    "flight review WAS OVERDUE",
		"JUST BFR TOUCHDOWN.":                 "JUST before touchdown",
		"RAN ENG FIRE C/L.":                   "ran engine FIRE checklist",
		"STOPPED LEFT OF C/L.":                "STOPPED left of centerline",
		"AP DISC, F/O FLYING.":                "autopilot disconnected first officer flying",
		"RETD TO AP.":                         "returned TO ap",
		"LOC INFLIGHT, STALL FOLLOWED.":       "loss of control INFLIGHT STALL FOLLOWED",
		"LOC CAPTURED.":                       "loc CAPTURED",
		"T/O RWY 22, A/T OFF, W/O INCIDENT.":  "takeoff runway 22 autothrottle off without INCIDENT",
		"24/7 and/or 1/2 the fuel, his/her a": "24 7 and or 1 2 the fuel his her a",
	} {
		if got := words(l, text); got != want {
			t.Errorf("%q: %q, want %q", text, got, want)
		}
	}
}

func TestSlipsOfTheScanner(t *testing.T) {
	l := NewLexicon()
	l.Words("airplane stalled compressor engine airspeed rudder")
	for text, want := range map[string]string{
		"The airp1ane sta11ed.":          "The airplane stalled",
		"The cornpressor failed.":        "The compressor failed",
		"The rud-\nder was full.":        "The rudder was full",
		"A well-\nknown 4 B12 B737 mark": "A well known 4 B12 B737 mark",
		"The eng1ne quit.":               "The engine quit",
	} {
		d := l.Analyse(text)
		for _, tok := range d.Tokens {
			if tok.Start < 0 || tok.End > len(text) || tok.Start >= tok.End {
				t.Errorf("%q: token %+v", text, tok)
			}
		}
		got := words(l, text)
		if got = strings.ReplaceAll(got, "\n", " "); got != want {
			t.Errorf("%q: %q, want %q", text, got, want)
		}
	}
}
