package corpus

// Double is a pair of occurrences, by their keys, that may tell one event.
type Double struct {
	A, B        int64      // A < B
	Probability float64    // that they are one, in (0, 1), by the evidence alone
	Evidence    []Evidence // what speaks for and against, the weightiest first
}

// Evidence is one thing that two occurrences agree or differ on.
type Evidence struct {
	What string  `json:"what"` // in words: "same day", "both tell engine-failure"
	Bits float64 `json:"bits"` // for (above 0) or against; each bit doubles the odds
}
