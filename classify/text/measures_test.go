package text

import (
	"fmt"
	"math"
	"strings"
	"testing"
)

func TestMeasures(t *testing.T) {
	l := NewLexicon()
	for text, want := range map[string]string{
		"The airspeed fell to 71 knots at 300 ft.":                   "airspeed 71 kt, height 300 ft",
		"SPD 71KTS, PASSING 23;500 FT":                               "airspeed 71 kt, height 23500 ft",
		"He read 81 mph on the dial.":                                "airspeed 70.4 kt (mph)",
		"It flew at 130 km/h.":                                       "airspeed 70.2 kt (km/h)",
		"The wind was 240° at 12 knots, gusting 20 kt.":              "wind-direction 240 deg, wind 12 kt, wind 20 kt",
		"It rolled to about 60 degrees of bank.":                     "bank 60 deg",
		"It swung 20 degrees off the heading, with 10 degrees flap.": "heading 20 deg, flap 10 deg",
		"The runway is 900 m long.":                                  "distance 2952.8 ft (m)",
		"We were at a height of 120 metres.":                         "height 393.7 ft (m)",
		"Torque sagged to 38 per cent, then power to 20%.":           "power 38 %, power 20 %",
		"It was 90 kg over the limit, with 40 kg of fuel.":           "weight 198.4 lb (kg), fuel 88.2 lb (kg)",
		"Four seconds later, after 2 minutes":                        "time 4 s, time 120 s (min)",
		"Turned to heading 240 in a bank of 45.":                     "heading 240 deg, bank 45 deg",
		"It sank at 800 ft/min, then 900 feet per minute.":           "vertical-speed 800 ft/min, vertical-speed 900 ft/min",
		"Departure from '21' at 14:02:11 with 3 aboard.":             "",
		"The cloud was broken at 3,500 ft.":                          "cloud 3500 ft",
	} {
		d := l.Analyse(text)
		var got []string
		for _, s := range d.Sentences {
			for _, m := range l.Measures(d, s) {
				x := fmt.Sprintf("%s %v %s", m.Kind, math.Round(m.Value*10)/10, m.Unit)
				if m.Told != m.Unit {
					x += " (" + m.Told + ")"
				}
				if err := m.Check(text); err != nil {
					t.Error(err)
				}
				got = append(got, x)
			}
		}
		if strings.Join(got, ", ") != want {
			t.Errorf("%q:\n got %s\nwant %s", text, strings.Join(got, ", "), want)
		}
	}
}

// Units against exact definitions: the international knot is 1852 m an hour,
// the foot 0.3048 m, the mile 1609.344 m, the pound 0.45359237 kg (NIST
// Special Publication 811, appendix B; from memory).
func TestUnits(t *testing.T) {
	for _, c := range []struct {
		u    unit
		want float64
	}{{mph, 0.868976242}, {kmh, 0.539956803}, {meters, 3.280839895}, {kilograms, 2.204622622}} {
		if math.Abs(c.u.factor-c.want) > 1e-9 {
			t.Errorf("%s: %.10f, want %.10f", c.u.short, c.u.factor, c.want)
		}
	}
}
