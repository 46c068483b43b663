package stats

import (
	"encoding/csv"
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"testing"

	"gonum.org/v1/gonum/mathext"
	"pgregory.net/rapid"
)

// reference reads a file of published values; its README names the sources.
func reference(t *testing.T, name string) []byte {
	t.Helper()
	b, err := os.ReadFile(filepath.Join("..", "..", "testdata", "reference", name))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// within fails unless got is within a relative distance of want.
func within(t *testing.T, what string, got, want, relative float64) {
	t.Helper()
	if !(math.Abs(got-want) <= relative*math.Abs(want)) {
		t.Errorf("%s = %.15g, want %.15g within %g of it", what, got, want, relative)
	}
}

func allNaN(iv Interval) bool {
	return math.IsNaN(iv.Estimate) && math.IsNaN(iv.Low) && math.IsNaN(iv.High)
}

// The counts of Newcombe 1998, Table I, to full precision: R 4.2.2
// (prop.test without correction, binom.test); statsmodels 0.13.5 agrees.
func TestSharesToFullPrecision(t *testing.T) {
	for _, c := range []struct {
		k, n       int
		wilson     [2]float64
		exactLimit [2]float64
	}{
		{81, 263, [2]float64{0.2552885198782742, 0.36620957698280004}, [2]float64{0.2527367455852713, 0.3676219226013513}},
		{15, 148, [2]float64{0.06238639953073628, 0.16048724172330803}, [2]float64{0.05784401008344857, 0.161650490349479}},
		{0, 20, [2]float64{0, 0.1611251580528194}, [2]float64{0, 0.16843347098308534}},
		{1, 29, [2]float64{0.006113214292762667, 0.17175521879320294}, [2]float64{0.000872646883579922, 0.17764429548872293}},
	} {
		w, e := Wilson(c.k, c.n, 0.95), ClopperPearson(c.k, c.n, 0.95)
		within(t, "Wilson low", w.Low, c.wilson[0], 1e-12)
		within(t, "Wilson high", w.High, c.wilson[1], 1e-12)
		within(t, "exact low", e.Low, c.exactLimit[0], 1e-12)
		within(t, "exact high", e.High, c.exactLimit[1], 1e-12)
	}
}

// All of n, and none of n, have closed forms.
func TestSharesAtTheEdges(t *testing.T) {
	for _, n := range []int{1, 2, 20, 1000, 1_000_000} {
		log := math.Log(0.025) / float64(n)
		all, none := ClopperPearson(n, n, 0.95), ClopperPearson(0, n, 0.95)
		if all.High != 1 || none.Low != 0 {
			t.Errorf("n = %d: all %+v, none %+v", n, all, none)
		}
		within(t, "low of all", all.Low, math.Exp(log), 1e-12)
		within(t, "high of none", none.High, -math.Expm1(log), 1e-10)
		if none, all := Wilson(0, n, 0.95), Wilson(n, n, 0.95); none.Low != 0 || all.High != 1 {
			t.Errorf("n = %d: none %+v, all %+v", n, none, all)
		}
	}
}

func TestNoAnswerIsNaN(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	ratio := func(k1 int, t1 float64, k2 int, t2, level float64) Interval {
		iv, p := RateRatio(k1, t1, k2, t2, level)
		if !math.IsNaN(p) {
			t.Errorf("p = %v, want NaN", p)
		}
		return iv
	}
	for name, iv := range map[string]Interval{
		"Wilson, nothing of nothing":         Wilson(0, 0, 0.95),
		"Wilson, more than all":              Wilson(3, 2, 0.95),
		"Wilson, negative":                   Wilson(-1, 2, 0.95),
		"Wilson, level 0":                    Wilson(1, 2, 0),
		"Wilson, level 1":                    Wilson(1, 2, 1),
		"Wilson, level NaN":                  Wilson(1, 2, nan),
		"ClopperPearson, nothing of nothing": ClopperPearson(0, 0, 0.95),
		"ClopperPearson, more than all":      ClopperPearson(3, 2, 0.95),
		"ClopperPearson, level 95":           ClopperPearson(1, 2, 95),
		"Garwood, nothing in no exposure":    Garwood(0, 0, 0.95),
		"Garwood, negative count":            Garwood(-1, 1, 0.95),
		"Garwood, level 1":                   Garwood(1, 1, 1),
		"RateRatio, no exposure":             ratio(1, 0, 1, 1, 0.95),
		"RateRatio, unknown exposure":        ratio(1, 1, 1, nan, 0.95),
		"RateRatio, boundless exposure":      ratio(1, inf, 1, 1, 0.95),
		"RateRatio, negative count":          ratio(-1, 1, 1, 1, 0.95),
		"RateRatio, level 0":                 ratio(1, 1, 1, 1, 0),
	} {
		if !allNaN(iv) {
			t.Errorf("%s: %+v, want all NaN", name, iv)
		}
	}
}

func TestSharesAreOrderedAndMirrored(t *testing.T) {
	for name, f := range map[string]func(int, int, float64) Interval{"Wilson": Wilson, "ClopperPearson": ClopperPearson} {
		t.Run(name, func(t *testing.T) {
			rapid.Check(t, func(t *rapid.T) {
				n := rapid.IntRange(1, 5000).Draw(t, "n")
				k := rapid.IntRange(0, n).Draw(t, "k")
				level := rapid.Float64Range(0.5, 0.999).Draw(t, "level")
				a, b := f(k, n, level), f(n-k, n, level)
				if !(0 <= a.Low && a.Low <= a.Estimate && a.Estimate <= a.High && a.High <= 1) {
					t.Fatalf("not in order: %+v", a)
				}
				if math.Abs(a.Low-(1-b.High)) > 1e-10 || math.Abs(a.High-(1-b.Low)) > 1e-10 {
					t.Fatalf("k of n %+v is not the mirror of n-k of n %+v", a, b)
				}
			})
		})
	}
}

func TestGarwoodAgainstR(t *testing.T) {
	var rows []struct {
		K                int
		Level, Low, High float64
	}
	if err := json.Unmarshal(reference(t, "poisson_limits.json"), &rows); err != nil {
		t.Fatal(err)
	}
	if len(rows) != 93 {
		t.Fatalf("%d rows, want 31 counts at 3 levels", len(rows))
	}
	for _, r := range rows {
		iv := Garwood(r.K, 1, r.Level)
		within(t, "low of "+strconv.Itoa(r.K), iv.Low, r.Low, 1e-12)
		within(t, "high of "+strconv.Itoa(r.K), iv.High, r.High, 1e-12)
	}
}

func TestGarwoodFactors(t *testing.T) {
	var rows []struct {
		K         int
		Low, High float64
	}
	if err := json.Unmarshal(reference(t, "poisson_factors_95.json"), &rows); err != nil {
		t.Fatal(err)
	}
	if len(rows) != 99 {
		t.Fatalf("%d rows, want 99", len(rows))
	}
	for _, r := range rows {
		iv := Garwood(r.K, float64(r.K), 0.95)
		near(t, "low factor of "+strconv.Itoa(r.K), iv.Low, r.Low, 5.0001e-6)
		near(t, "high factor of "+strconv.Itoa(r.K), iv.High, r.High, 5.0001e-6)
	}
}

// No events: ln(2/a) in closed form, two-sided, and not ln(1/a) = 2.9957.
func TestGarwoodWithoutEvents(t *testing.T) {
	iv := Garwood(0, 1, 0.95)
	if iv.Low != 0 || iv.Estimate != 0 {
		t.Errorf("%+v, want estimate and lower limit 0", iv)
	}
	within(t, "high", iv.High, math.Log(40), 1e-13)
}

// 137 events in 24.19893, the example of R's help page of poisson.test.
func TestGarwoodHelpPage(t *testing.T) {
	iv := Garwood(137, 24.19893, 0.95)
	near(t, "rate", iv.Estimate, 5.661407, 1e-6)
	near(t, "low", iv.Low, 4.753125, 1e-6)
	near(t, "high", iv.High, 6.692709, 1e-6)
}

// Seven digits of every limit of the twenty years, fatal accidents too. R's
// figures were cut off, not rounded: hence the whole unit.
func TestLimitsOfTwentyYears(t *testing.T) {
	published := csvColumns(t, "part135_ondemand_1988_2007.csv")
	limits := csvColumns(t, "part135_limits.csv")
	if len(published["year"]) != 20 || len(limits["year"]) != 20 {
		t.Fatalf("%d and %d years, want 20", len(published["year"]), len(limits["year"]))
	}
	for i, year := range published["year"] {
		if limits["year"][i] != year {
			t.Fatalf("year %v beside %v", year, limits["year"][i])
		}
		hours := published["flight_hours"][i] / 100_000
		for counts, prefix := range map[string]string{"accidents": "rate", "fatal_accidents": "fatal_rate"} {
			iv := Garwood(int(published[counts][i]), hours, 0.95)
			within(t, prefix, iv.Estimate, limits[prefix][i], 1e-7)
			within(t, prefix+" low", iv.Low, limits[prefix+"_low"][i], 1e-7)
			within(t, prefix+" high", iv.High, limits[prefix+"_high"][i], 1e-7)
		}
	}
}

// csvColumns reads a reference CSV of numbers, by the names of its columns.
func csvColumns(t *testing.T, name string) map[string][]float64 {
	t.Helper()
	f, err := os.Open(filepath.Join("..", "..", "testdata", "reference", name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	columns := map[string][]float64{}
	for _, row := range rows[1:] {
		for i, cell := range row {
			v, err := strconv.ParseFloat(cell, 64)
			if err != nil {
				t.Fatalf("%s: %v", name, err)
			}
			columns[rows[0][i]] = append(columns[rows[0][i]], v)
		}
	}
	return columns
}

func TestRateRatioToFullPrecision(t *testing.T) {
	for _, c := range []struct {
		name             string
		k1               int
		t1               float64
		k2               int
		t2               float64
		ratio, low, high float64
	}{
		// R, help page of poisson.test: lung cancer in Fredericia.
		{"Fredericia", 11, 800, 21, 3011, 1.971488095, 0.8584264034, 4.2772659437},
		// R, package rateratio.test (Fay).
		{"Fay", 2, 17877, 9, 16660, 0.2070941557, 0.02177406276, 1.00054910449},
		// NTSB Table 9, 1998-2007 against 1988-1997, limits by R's poisson.test.
		{"on demand", 682, 342.34, 884, 265.79, 0.5989810744, 0.5412428657, 0.6626572052},
		{"on demand, fatal", 163, 342.34, 247, 265.79, 0.5123557824, 0.4177999165, 0.6269415518},
	} {
		t.Run(c.name, func(t *testing.T) {
			iv, _ := RateRatio(c.k1, c.t1, c.k2, c.t2, 0.95)
			within(t, "ratio", iv.Estimate, c.ratio, 1e-9)
			within(t, "low", iv.Low, c.low, 1e-9)
			within(t, "high", iv.High, c.high, 1e-9)
		})
	}
}

// p < 1 - level exactly when the interval leaves out 1.
func TestRateRatioAgreesWithItsInterval(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		k1, k2 := rapid.IntRange(0, 60).Draw(t, "k1"), rapid.IntRange(0, 60).Draw(t, "k2")
		t1, t2 := rapid.Float64Range(0.1, 50).Draw(t, "t1"), rapid.Float64Range(0.1, 50).Draw(t, "t2")
		level := rapid.Float64Range(0.5, 0.999).Draw(t, "level")
		iv, p := RateRatio(k1, t1, k2, t2, level)
		if math.Abs(p-(1-level)) < 1e-9 { // on the edge rounding decides
			return
		}
		if leftOut := iv.Low > 1 || iv.High < 1; leftOut != (p < 1-level) {
			t.Fatalf("interval %+v, p %v at level %v", iv, p, level)
		}
	})
}

// The binomial tails by plain summation. The sum itself is good to about
// 1e-12, the incomplete beta function far out in a tail to about 1e-9.
func TestRateRatioTails(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		k1, k2 := rapid.IntRange(0, 40).Draw(t, "k1"), rapid.IntRange(0, 40).Draw(t, "k2")
		p0 := rapid.Float64Range(0.05, 0.95).Draw(t, "p0")
		_, p := RateRatio(k1, p0, k2, 1-p0, 0.95)
		n, upTo, from := k1+k2, 0.0, 0.0
		for x := 0; x <= n; x++ {
			a, _ := math.Lgamma(float64(n) + 1)
			b, _ := math.Lgamma(float64(x) + 1)
			c, _ := math.Lgamma(float64(n-x) + 1)
			mass := math.Exp(a - b - c + float64(x)*math.Log(p0) + float64(n-x)*math.Log1p(-p0))
			if x <= k1 {
				upTo += mass
			}
			if x >= k1 {
				from += mass
			}
		}
		if want := math.Min(1, 2*math.Min(upTo, from)); math.Abs(p-want) > 1e-9*want {
			t.Fatalf("p = %v, want %v", p, want)
		}
	})
}

// A small p keeps its digits: one group has all 40 or 200 events, so that p is
// twice a power.
func TestSmallP(t *testing.T) {
	for _, k := range []int{40, 200} {
		_, p := RateRatio(0, 3, k, 5, 0.95)
		within(t, "p of none against "+strconv.Itoa(k), p, 2*math.Pow(5.0/8, float64(k)), 1e-12)
		_, p = RateRatio(k, 5, 0, 3, 0.95)
		within(t, "p of "+strconv.Itoa(k)+" against none", p, 2*math.Pow(5.0/8, float64(k)), 1e-12)
	}
	// the fatal accidents of the two decades; R's poisson.test, whose sum of
	// outcomes no likelier, 2.362495e-11, is of the same size
	_, p := RateRatio(163, 342.34, 247, 265.79, 0.95)
	near(t, "p, fatal accidents", p, 2.36e-11, 0.5e-11)
}

func TestRateRatioAtTheEdges(t *testing.T) {
	inf := math.Inf(1)
	if iv, p := RateRatio(0, 10, 0, 10, 0.95); !math.IsNaN(iv.Estimate) || iv.Low != 0 || iv.High != inf || p != 1 {
		t.Errorf("no events: %+v, p %v", iv, p)
	}
	iv, p := RateRatio(5, 10, 0, 10, 0.95)
	if iv.Estimate != inf || iv.High != inf {
		t.Errorf("none in the second: %+v", iv)
	}
	within(t, "p of five against none", p, 2.0/32, 1e-12)
	within(t, "low of five against none", iv.Low, 1/(math.Pow(0.025, -0.2)-1), 1e-12)
	if iv, _ := RateRatio(0, 10, 5, 10, 0.95); iv.Estimate != 0 || iv.Low != 0 || math.IsInf(iv.High, 0) {
		t.Errorf("none in the first: %+v", iv)
	}
}

// Put back into the distribution function every limit gives the tail that it
// was asked for, also far from the usual levels and counts.
func TestLimitsAreRoots(t *testing.T) {
	for _, level := range []float64{0.5, 0.9, 0.95, 0.99, 0.999999} {
		tail := (1 - level) / 2
		for _, k := range []int{1, 2, 7, 100, 10_000, 1_000_000} {
			a := float64(k)
			within(t, "P(X >= k) at the lower limit", mathext.GammaIncReg(a, eventsBelow(k, tail)), tail, 1e-10)
			within(t, "P(X <= k) at the upper limit", mathext.GammaIncRegComp(a+1, eventsAbove(k, tail)), tail, 1e-10)
			for _, m := range []int{0, 1, 50, 1_000_000} {
				odds := oddsBelow(k, m, tail)
				within(t, "P(X >= k) at the lower odds", atLeast(k, m, math.Log(odds)), tail, 1e-9)
			}
		}
	}
}

// Limits of large counts, which sums of Poisson and binomial terms with 40
// digits confirmed to within 1e-12.
func TestLargeCounts(t *testing.T) {
	within(t, "10,000 events, low", eventsBelow(10_000, 0.025), 9804.95246726, 1e-11)
	within(t, "10,000 events, high", eventsAbove(10_000, 0.025), 10197.9516246615, 1e-11)
	within(t, "odds of 10,000 to 20,000", oddsBelow(10_000, 20_000, 0.025), 0.488092288540911, 1e-11)
	within(t, "odds of a million to a million", oddsBelow(1_000_000, 1_000_000, 0.025), 0.997231032933789, 1e-11)
}
