package stats

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// Garwood is the exact interval for the rate of k events over an exposure,
// in events per unit of exposure.
//
// The limits for the expected number of events are half the a/2 quantile of
// chi-square with 2k degrees of freedom and half the 1-a/2 quantile with
// 2k+2, a = 1 - level; divided by the exposure they are limits for the rate.
//
// Reference: F. Garwood, Biometrika 28 (1936), 437-442; the form with
// chi-square: K. Ulm, American Journal of Epidemiology 131 (1990), 373-375.
//
// At k = 0 the lower limit is 0 and the upper limit stays two-sided: 3.6889
// expected events at 95%, not the one-sided 2.9957. Changing the rule at zero
// would make a quiet year look more certain than its neighbours in the same
// column, and a reader could not tell that the level had changed; it would
// also break the coverage of at least the level that makes the interval exact.
//
// Valid for k >= 0 and a finite exposure above 0. Otherwise all NaN: without
// exposure there is no rate, and no events in no hours is not a rate of zero.
func Garwood(k int, exposure, level float64) Interval {
	if k < 0 || !validExposure(exposure) || !validLevel(level) {
		return undefined()
	}
	tail := (1 - level) / 2
	return Interval{
		Estimate: float64(k) / exposure,
		Low:      eventsBelow(k, tail) / exposure,
		High:     eventsAbove(k, tail) / exposure,
	}
}

// RateRatio compares two rates: k1 events over the exposure t1 against k2
// over t2, the exposures in the same unit. It returns the ratio (k1/t1) /
// (k2/t2) with its limits, and the p-value of "the two rates are equal".
//
// Given n = k1 + k2, k1 is binomial with the chance p0 = t1/(t1+t2) if the
// rates are equal. Limits: the Clopper-Pearson limits of k1/n as odds, times
// t2/t1. The p-value is min(1, twice the smaller tail), the tails being
// P(X <= k1) and P(X >= k1). So p and interval agree: p < 1 - level exactly
// when the interval leaves out 1. The other common p, the sum over all
// outcomes no likelier than the one seen, does not have this property.
//
// Reference: the conditioning, F. Ederer and N. Mantel, American Journal of
// Epidemiology 100 (1974), 165-167; p from the doubled tail as in M. P. Fay's
// description of the exact Poisson test, The R Journal 2 (2010), 53-58 (cited
// from memory, not looked up).
//
// Valid for k1, k2 >= 0 and finite exposures above 0, otherwise all NaN. With
// k2 = 0 estimate and upper limit are +Inf; with k1 = 0 estimate and lower
// limit are 0; with no event at all the estimate is NaN, the limits are 0 and
// +Inf, and p is 1: nothing has been learned.
func RateRatio(k1 int, t1 float64, k2 int, t2 float64, level float64) (Interval, float64) {
	if k1 < 0 || k2 < 0 || !validExposure(t1) || !validExposure(t2) || !validLevel(level) {
		return undefined(), math.NaN()
	}
	tail := (1 - level) / 2
	iv := Interval{
		Estimate: float64(k1) / float64(k2) * (t2 / t1), // 0/0 is NaN, k/0 is +Inf
		Low:      oddsBelow(k1, k2, tail) * (t2 / t1),
		High:     1 / (oddsBelow(k2, k1, tail) * (t1 / t2)),
	}
	logOdds := math.Log(t1) - math.Log(t2)
	p := 2 * math.Min(atLeast(k1, k2, logOdds), atLeast(k2, k1, -logOdds))
	return iv, math.Min(1, p)
}

// atLeast is P(X >= k) for X binomial with k+m trials and the given log odds
// of success.
func atLeast(k, m int, logOdds float64) float64 {
	if k == 0 {
		return 1
	}
	return betaBelow(float64(k), float64(m)+1, logOdds)
}

// eventsBelow is the expected number of events at which k or more events have
// the chance tail; 0 at k = 0, where no expectation is too low.
func eventsBelow(k int, tail float64) float64 {
	if k == 0 {
		return 0
	}
	a := float64(k)
	return solve(a, -1/math.Sqrt(a), tail, func(x float64) (float64, float64) {
		return mathext.GammaIncReg(a, x), gammaDensity(a, x)
	})
}

// eventsAbove is the expected number of events at which k or fewer events
// have the chance tail.
func eventsAbove(k int, tail float64) float64 {
	a := float64(k) + 1
	return solve(a, 1/math.Sqrt(a), tail, func(x float64) (float64, float64) {
		return mathext.GammaIncRegComp(a, x), -gammaDensity(a, x)
	})
}
