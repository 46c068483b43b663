package doubles

import (
	"fmt"
	"math"
	"math/rand/v2"
	"regexp"
	"slices"
	"strings"
	"testing"

	"catena/ingest/corpus"
)

// words makes a text of n words that no other seed shares.
func words(seed uint64, n int) []string {
	r := rand.New(rand.NewPCG(seed, 1))
	out := make([]string, n)
	for i := range out {
		out[i] = fmt.Sprintf("w%d", r.IntN(1_000_000))
	}
	return out
}

// The estimate lies within three standard deviations of Jaccard's coefficient
// of the runs of words, sqrt(J(1-J)/128) (Broder 1997 for independent minima).
func TestSketchEstimatesLikeness(t *testing.T) {
	for _, keep := range []int{0, 60, 150, 240, 300} {
		a := words(1, 300)
		b := append(append([]string{}, a[:keep]...), words(2, 300-keep)...)
		var x, y Sketcher
		x.Add(strings.Join(a, " "))
		y.Add(strings.ToUpper(strings.Join(b, ", ")) + ".")
		p, q := x.Sketch(), y.Sketch()
		shared := float64(max(0, keep-shingleWords+1))
		want := shared / (2*298 - shared)
		if got, tolerance := alike(&p, &q), 3*math.Sqrt(want*(1-want)/sketchSize)+0.02; math.Abs(got-want) > tolerance {
			t.Errorf("%d words of 300 shared: likeness %.3f, want %.3f within %.3f", keep, got, want, tolerance)
		}
	}
}

func TestMarks(t *testing.T) {
	for text, want := range map[string]string{
		"The crew of ND-LKA saw ND-LKA.": "ND-LKA ND-LKA", "N123AB HIT A T-TAIL ON THE TURN": "N123AB", "the U-TURN of N1": "", "flight B-52 and PA-28": "", "VH-XYZ": "VH-XYZ",
	} {
		if got := strings.Join(marks(nil, text), " "); got != want {
			t.Errorf("%q: %q, want %q", text, got, want)
		}
	}
}

// The scan by hand finds what the expression says.
func FuzzMarks(f *testing.F) {
	mark := regexp.MustCompile(`\b(?:[A-Z]{1,2}-[A-Z]{3,4}|N[1-9][0-9]{1,4}[A-Z]{0,2})\b`)
	for _, s := range []string{"ND-LKA N123AB", "AN-ABCDE N12345A N01 XN12", "A-N12 N12-ABC AB-N12A", "N1-ABC-DEF"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, text string) {
		for _, c := range text {
			if c >= 0x80 {
				return // of letters beyond ASCII the two think differently
			}
		}
		var want []string
		for _, m := range mark.FindAllString(text, -1) {
			_, suffix, _ := strings.Cut(m, "-")
			if !slices.Contains(noMarks, suffix) && len(want) < maxMarks {
				want = append(want, m)
			}
		}
		if got := marks(nil, text); !slices.Equal(got, want) {
			t.Errorf("%q: %q, want %q", text, got, want)
		}
	})
}

func record(key int64, source, date, place, model string, text string) Record {
	d, err := corpus.ParseDate(date)
	if err != nil {
		panic(err)
	}
	o := &corpus.Occurrence{Source: source, ID: fmt.Sprint(key), Date: d, Place: place, Aircraft: corpus.Aircraft{Make: "Larkin", Model: model, Engines: 1},
		Narratives: []corpus.Narrative{{Kind: "factual", Text: text}}}
	return Told(key, o, nil, "")
}

// background is a collection of unrelated reports.
func background(n int) []Record {
	var out []Record
	for i := range n {
		r := rand.New(rand.NewPCG(uint64(i), 7))
		out = append(out, record(int64(i+1), []string{"agency", "school"}[i%2], fmt.Sprintf("20%02d-%02d-%02d", 10+r.IntN(10), 1+r.IntN(12), 1+r.IntN(28)),
			fmt.Sprintf("Field %d", r.IntN(40)), fmt.Sprintf("M%d", 100+r.IntN(30)), strings.Join(words(uint64(i)+10, 60), " ")))
	}
	return out
}

func TestFind(t *testing.T) {
	text := words(9000, 80)
	edited := append(append([]string{}, text[:30]...), text[36:]...)
	edited[40], edited[50] = "other", "terms"
	one := record(9001, "agency", "2015-06-07", "Sellow", "D9", strings.Join(text, " "))
	for name, c := range map[string]struct {
		other Record
		found bool
	}{
		"edited, next day, model spelled otherwise": {record(9002, "school", "2015-06-08", "SELLOW, NORLAND", "D-9", strings.Join(edited, " ")), true},
		"other words":                        {record(9002, "school", "2015-06-07", "Sellow", "D9", "Quite another text of the same event."), true},
		"edited, the month only":             {record(9002, "school", "2015-06", "Sellow", "D9", strings.Join(edited, " ")), true},
		"word for word, without a date":      {record(9002, "school", "", "", "", strings.Join(text, " ")), true},
		"other words, other day":             {record(9002, "school", "2015-09-01", "Sellow", "D9", "Quite another text of the same event."), false},
		"same day, other aircraft and place": {record(9002, "school", "2015-06-07", "Brackmoor", "M104", "Quite another text of the same event."), false},
	} {
		t.Run(name, func(t *testing.T) {
			f := Find(append(background(3000), one, c.other), Options{})
			found := false
			for _, p := range f.Pairs {
				if p.A == 9001 && p.B == 9002 {
					found = true
					if len(p.Evidence) < 2 || p.Evidence[0].Bits <= 0 {
						t.Errorf("evidence %+v", p.Evidence)
					}
				}
			}
			if found != c.found {
				w := newFinder(append(background(3000), one, c.other), Options{})
				t.Errorf("found: %v, want %v: %.1f bits, %+v", found, c.found, w.bits(3000, 3001), w.evidence(3000, 3001))
			}
			if len(f.Pairs) > 8 {
				t.Errorf("%d pairs of 3,000 strangers", len(f.Pairs))
			}
		})
	}
}

// The same records in another order give the same pairs.
func TestFindIsTheSameInAnyOrder(t *testing.T) {
	all := background(2000)
	for i := range 40 {
		again := all[i*7]
		again.Key, again.Source = int64(5000+i), "again"
		all = append(all, again)
	}
	want := Find(all, Options{})
	shuffled := append([]Record{}, all...)
	rand.New(rand.NewPCG(3, 3)).Shuffle(len(shuffled), func(i, j int) { shuffled[i], shuffled[j] = shuffled[j], shuffled[i] })
	got := Find(shuffled, Options{})
	if len(want.Pairs) < 40 || len(got.Pairs) != len(want.Pairs) {
		t.Fatalf("%d pairs, then %d", len(want.Pairs), len(got.Pairs))
	}
	set := map[[2]int64]bool{}
	for _, p := range want.Pairs {
		set[[2]int64{min(p.A, p.B), max(p.A, p.B)}] = true
	}
	for _, p := range got.Pairs {
		if !set[[2]int64{p.A, p.B}] {
			t.Errorf("%d and %d are found in one order only", p.A, p.B)
		}
	}
}

// A short formula shared word for word says little.
func TestFormulasAreNoDoubles(t *testing.T) {
	all := background(500)
	for i := range 100 {
		all = append(all, record(int64(6000+i), []string{"agency", "school"}[i%2], fmt.Sprintf("20%02d-01-02", 10+i%10), fmt.Sprintf("Place%d", i), fmt.Sprintf("T%d", 100+i),
			"The pilot did not keep control during landing."))
	}
	if f := Find(all, Options{}); len(f.Pairs) > 2 {
		t.Errorf("%d pairs among formulas: %+v", len(f.Pairs), f.Pairs[0])
	}
}
