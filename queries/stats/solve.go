package stats

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// solve finds x > 0 at which a tail probability equals p. The tail function
// returns the probability at x and its derivative; it is monotone, and log
// concave in log x. from is where to begin, a value of the middle of the
// distribution; step is a first step in log x towards the answer, about one
// standard deviation, its sign the way in which the probability falls to p.
//
// The ready-made quantiles of gonum (v0.17) are not used: those of the beta
// distribution agree only to about 1e-11, and in a corner (shape 1e6 and 1, tail
// 5e-7) one is wrong by a seventh without saying so. The distribution
// functions themselves are right to about 1e-13, so the limits are solved for
// there: bracket, then Newton on log p against log x, falling back to halving
// whenever Newton would leave the bracket. Against sums of 40 digits the limits
// were right to 1e-12 for counts up to a million; beyond, the incomplete beta
// function loses digits (the odds of 1e8 against 0 are wrong by 6e-8).
func solve(from, step, p float64, tail func(x float64) (value, slope float64)) float64 {
	above := math.Log(from) // the tail is larger than p here
	below := above + step   // and smaller here
	for range maxDoublings {
		if v, _ := tail(math.Exp(below)); v <= p {
			break
		}
		above, step = below, 2*step
		below += step
	}
	u := (above + below) / 2
	for range maxSteps {
		x := math.Exp(u)
		v, slope := tail(x)
		if v > p {
			above = u
		} else {
			below = u
		}
		next := u - math.Log(v/p)*v/(slope*x)
		if !(next > math.Min(above, below) && next < math.Max(above, below)) {
			next = (above + below) / 2
		}
		if math.Abs(next-u) <= tolerance {
			return math.Exp(next)
		}
		u = next
	}
	return math.Exp(u)
}

const (
	// Steps double from one standard deviation, so 60 of them span every
	// float64; 200 halvings bring any bracket down to the last digit.
	maxDoublings = 60
	maxSteps     = 200
	// tolerance is the last step in log x, which is the relative step in x.
	// Finer than 1e-14 the rounding of the tail functions decides.
	tolerance = 1e-14
)

// gammaDensity is the density of the gamma distribution with shape a and
// scale 1 at x.
func gammaDensity(a, x float64) float64 {
	lg, _ := math.Lgamma(a)
	return math.Exp((a-1)*math.Log(x) - x - lg)
}

// oddsBelow is the odds p/(1-p) at which k or more successes in k+m trials
// have the chance tail; 0 at k = 0, where no chance is too low.
//
// It solves for the odds and not for p, because a p near 1 has no digits left
// to tell 1-p by. The upper limit of k among k+m is 1/oddsBelow(m, k, tail).
func oddsBelow(k, m int, tail float64) float64 {
	if k == 0 {
		return 0
	}
	a, b := float64(k), float64(m)+1
	return solve(a/b, -math.Sqrt(1/a+1/b), tail, func(odds float64) (float64, float64) {
		u := math.Log(odds)
		return betaBelow(a, b, u), betaDensity(a, b, u) / odds
	})
}

// betaBelow is the distribution function of Beta(a, b) at the probability
// that has these log odds.
//
// Of a probability near 1 the complement keeps more digits; but one minus the
// complement's tail is empty of digits where the result is small, as it is for
// a small p-value. Above smallTail at most four of sixteen digits are lost.
func betaBelow(a, b, logOdds float64) float64 {
	const smallTail = 1e-4
	if logOdds > 0 {
		if v := 1 - mathext.RegIncBeta(b, a, 1/(1+math.Exp(logOdds))); v > smallTail {
			return v
		}
	}
	return mathext.RegIncBeta(a, b, 1/(1+math.Exp(-logOdds)))
}

// betaDensity is the density of the log odds of Beta(a, b).
func betaDensity(a, b, logOdds float64) float64 {
	return math.Exp(-a*math.Log1p(math.Exp(-logOdds)) - b*math.Log1p(math.Exp(logOdds)) - mathext.Lbeta(a, b))
}
