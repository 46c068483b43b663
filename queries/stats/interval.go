package stats

import "math"

// Interval is an estimate with its lower and upper confidence limit, in the
// unit of the estimate. All three are NaN where nothing can be said.
type Interval struct {
	Estimate, Low, High float64
}

// undefined is the interval of a question that has no answer.
func undefined() Interval {
	return Interval{math.NaN(), math.NaN(), math.NaN()}
}

// validLevel tells whether level is a confidence level: in (0, 1).
func validLevel(level float64) bool { return level > 0 && level < 1 }

// validExposure tells whether an amount of exposure can stand under a rate.
func validExposure(t float64) bool { return t > 0 && !math.IsInf(t, 1) }
