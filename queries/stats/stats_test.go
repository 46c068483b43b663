package stats

import (
	"bytes"
	"encoding/csv"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

func near(t *testing.T, name string, got, want, tolerance float64) {
	t.Helper()
	if math.IsNaN(got) || math.Abs(got-want) > tolerance {
		t.Errorf("%s: %.10g, want %.10g", name, got, want)
	}
}

// Newcombe, Statistics in Medicine 17:857-872 (1998), Table I, method 3
// (Wilson), values to four decimals.
func TestWilsonNewcombe(t *testing.T) {
	for _, c := range []struct {
		k, n      int
		low, high float64
	}{{81, 263, .2553, .3662}, {15, 148, .0624, .1605}, {0, 20, 0, .1611}, {1, 29, .0061, .1718}} {
		i := Wilson(c.k, c.n, .95)
		near(t, "low", i.Low, c.low, 5e-5)
		near(t, "high", i.High, c.high, 5e-5)
		near(t, "estimate", i.Estimate, float64(c.k)/float64(c.n), 1e-15)
	}
	if i := Wilson(0, 0, .95); !math.IsNaN(i.Estimate) || !math.IsNaN(i.Low) || !math.IsNaN(i.High) {
		t.Errorf("of none: %+v, want undefined", i)
	}
	if i := Wilson(20, 20, .95); i.High != 1 {
		t.Errorf("all of 20: upper limit %v, want exactly 1", i.High)
	}
}

// Clopper-Pearson limits of the same counts; from memory, recomputed in R.
func TestClopperPearson(t *testing.T) {
	for _, c := range []struct {
		k, n      int
		low, high float64
	}{{81, 263, .2527, .3676}, {15, 148, .0578, .1617}, {0, 20, 0, .1684}, {1, 29, .0009, .1776}} {
		i := ClopperPearson(c.k, c.n, .95)
		near(t, "low", i.Low, c.low, 5e-5)
		near(t, "high", i.High, c.high, 5e-5)
	}
}

// Exact 95% Poisson limits (Garwood 1936), recomputed in R with poisson.test.
// The upper limit at 0 events is the two-sided one, 3.6889: a one-sided limit
// there (2.996) would make the interval jump between 0 and 1 event.
func TestGarwoodTable(t *testing.T) {
	for _, c := range []struct {
		k         int
		low, high float64
	}{
		{0, 0, 3.6889}, {1, 0.0253, 5.5716}, {2, 0.2422, 7.2247}, {3, 0.6187, 8.7673}, {4, 1.0899, 10.2416}, {5, 1.6235, 11.6683},
		{7, 2.8144, 14.4227}, {10, 4.7954, 18.3904}, {14, 7.6539, 23.4896}, {20, 12.2165, 30.8884},
	} {
		i := Garwood(c.k, 1, .95)
		near(t, "low", i.Low, c.low, 5e-5)
		near(t, "high", i.High, c.high, 5e-5)
	}
	// 14 events in 400 person-years (a published help text of a statistics
	// program): 0.035, 0.019135 to 0.058724
	i := Garwood(14, 400, .95)
	near(t, "rate", i.Estimate, .035, 1e-12)
	near(t, "low", i.Low, .01913483, 5e-9)
	near(t, "high", i.High, .05872405, 5e-9)
	for _, exposure := range []float64{0, -1, math.NaN(), math.Inf(1)} {
		if i := Garwood(3, exposure, .95); !math.IsNaN(i.Estimate) || !math.IsNaN(i.High) {
			t.Errorf("exposure %v: %+v, want undefined", exposure, i)
		}
	}
}

// National Transportation Safety Board, Table 9 (on-demand operations, 1988
// to 2007): printed rates to two decimals; limits recomputed in R.
func TestPublishedRatesAndLimits(t *testing.T) {
	f, err := os.Open(filepath.Join("..", "..", "testdata", "reference", "part135_ondemand_1988_2007.csv"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	number := func(s string) float64 {
		x, err := strconv.ParseFloat(s, 64)
		if err != nil {
			t.Fatal(err)
		}
		return x
	}
	for _, r := range rows[1:] {
		hours := number(r[3]) / 100_000
		all := Garwood(int(number(r[1])), hours, .95)
		if got := strconv.FormatFloat(all.Estimate, 'f', 2, 64); got != r[4] {
			t.Errorf("%s: rate %s, printed %s", r[0], got, r[4])
		}
		near(t, r[0]+" low", all.Low, number(r[6]), 1e-7)
		near(t, r[0]+" high", all.High, number(r[7]), 1e-7)
		if got := strconv.FormatFloat(Garwood(int(number(r[2])), hours, .95).Estimate, 'f', 2, 64); got != r[5] {
			t.Errorf("%s: fatal rate %s, printed %s", r[0], got, r[5])
		}
	}
}

// Published examples of the conditional exact ratio of two rates. p is twice
// the smaller tail, so that p and interval agree: with R's other convention
// the second example has p = 0.033 although its interval holds 1.
func TestRateRatio(t *testing.T) {
	// R, help page of poisson.test
	i, _ := RateRatio(11, 800, 21, 3011, .95)
	near(t, "ratio", i.Estimate, 1.971488, 1e-6)
	near(t, "low", i.Low, .858426, 1e-5)
	near(t, "high", i.High, 4.277266, 1e-5)
	// Fay, documentation of rateratio.test
	i, p := RateRatio(2, 17877, 9, 16660, .95)
	near(t, "ratio", i.Estimate, .207094, 1e-6)
	near(t, "low", i.Low, .0217741, 1e-6)
	near(t, "high", i.High, 1.0005491, 1e-6)
	near(t, "p", p, .0501065, 1e-6)
	// the decades of the table above: .598981 (exact .541243 to .662657)
	a, b, ta, tb := 0, 0, 0.0, 0.0
	f, err := os.ReadFile(filepath.Join("..", "..", "testdata", "reference", "part135_ondemand_1988_2007.csv"))
	if err != nil {
		t.Fatal(err)
	}
	rows, err := csv.NewReader(bytes.NewReader(f)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	for _, r := range rows[1:] {
		n, _ := strconv.Atoi(r[1])
		h, _ := strconv.ParseFloat(r[3], 64)
		if r[0] < "1998" {
			b, tb = b+n, tb+h
		} else {
			a, ta = a+n, ta+h
		}
	}
	i, _ = RateRatio(a, ta, b, tb, .95)
	near(t, "decades", i.Estimate, .598981, 1e-6)
	near(t, "decades low", i.Low, .541243, 1e-6)
	near(t, "decades high", i.High, .662657, 1e-6)
}

// By exact enumeration the limits cover the true mean at least 95 times in a
// hundred, whatever the mean: that is what "exact" promises.
func TestGarwoodCovers(t *testing.T) {
	for mean := 0.5; mean <= 50; mean += 0.5 {
		d := distuv.Poisson{Lambda: mean}
		covered := 0.0
		for k := 0; k <= int(mean+20*math.Sqrt(mean)+20); k++ {
			if i := Garwood(k, 1, .95); i.Low <= mean && mean <= i.High {
				covered += d.Prob(float64(k))
			}
		}
		if covered < .95-1e-12 {
			t.Errorf("mean %g: covered %.6f", mean, covered)
		}
	}
}
