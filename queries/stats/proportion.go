package stats

import "math"

// Wilson is the score interval for the share k/n.
//
// With z the normal quantile of the level, the limits are the roots of
//
//	(n + z²)·p² - (2k + z²)·p + k²/n = 0
//
// Reference: E. B. Wilson, Journal of the American Statistical Association 22
// (1927), 209-212; method 3 of R. G. Newcombe, Statistics in Medicine 17
// (1998), 857-872 (no continuity correction).
//
// Valid for 0 <= k <= n and n >= 1, small n included: the limits never leave
// [0, 1], and are exactly 0 at k = 0 and 1 at k = n. Its coverage is near the
// level on average, not at least the level for every share; ClopperPearson
// has that guarantee and is wider. With n = 0 there is no share: all NaN, as
// for k or level out of range.
func Wilson(k, n int, level float64) Interval {
	if n < 1 || k < 0 || k > n || !validLevel(level) {
		return undefined()
	}
	z := math.Sqrt2 * math.Erfinv(level)
	x, m, zz := float64(k), float64(n), z*z
	iv := Interval{Estimate: x / m, High: 1}
	if k < n {
		iv.High = (2*x + zz + z*math.Sqrt(zz+4*x*((m-x)/m))) / (2 * (m + zz))
	}
	// The product of the roots gives the lower one without the subtraction
	// that would cost its last digits when k is small.
	iv.Low = (x / m) * (x / (m + zz)) / iv.High
	return iv
}

// ClopperPearson is the exact interval for the share k/n: the shares that an
// equal-tailed binomial test at this level would not reject.
//
// The lower limit is the a/2 quantile of Beta(k, n-k+1), the upper one the
// 1-a/2 quantile of Beta(k+1, n-k), with a = 1 - level.
//
// Reference: C. J. Clopper and E. S. Pearson, Biometrika 26 (1934), 404-413.
//
// Valid for 0 <= k <= n and n >= 1. At k = 0 the lower limit is 0, at k = n
// the upper limit is 1; the other limit stays two-sided. With n = 0, or k or
// level out of range, all NaN.
func ClopperPearson(k, n int, level float64) Interval {
	if n < 1 || k < 0 || k > n || !validLevel(level) {
		return undefined()
	}
	tail := (1 - level) / 2
	return Interval{
		Estimate: float64(k) / float64(n),
		Low:      1 / (1 + 1/oddsBelow(k, n-k, tail)),
		High:     1 / (1 + oddsBelow(n-k, k, tail)),
	}
}
