package corpus

// Exposure is an amount of flying: the denominator of a rate.
type Exposure struct {
	Period     Period
	Covers     string            // the source of occurrences that these amounts stand for
	Hours      float64           // flight hours; NaN where not given
	Departures float64           // take-offs; NaN where not given
	Strata     map[string]string // occurrence field -> value, empty for the whole source
}
