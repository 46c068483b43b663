// Package classify finds factors in narratives: it runs the rule book over a
// text, decides how each factor is spoken of, and puts the affirmed ones in
// order of time.
//
// The steps, each in a file of its own:
//
//	match.go      the rules' patterns, sentence by sentence
//	assertion.go  affirmed, denied, possible, advised or elsewhere, from the
//	              cues around a match
//	side.go       left or right, from the words around a match
//	infer.go      what the side of a dead engine implies
//	actor.go      who did it
//	quantity.go   the numbers told with a factor, and what two speeds imply
//	clock.go      times of day and elapsed times
//	chain.go      the order of the affirmed tags
//	explain.go    why a tag was made, and why one was not
//	examples.go   the examples of the rule book itself
//
// All of it is pure: an occurrence goes in, tags and a chain come out, the
// same for the same book and text on every machine. A Classifier may be used
// by many goroutines at once.
//
// Silence is no denial: a factor that no words speak of has no tag. The reach
// of negation and the like ends with the sentence.
//
// Floor 4 (engines).
package classify

// EngineVersion changes whenever this package would tag the same text with
// the same book in another way; the collection then tags everything again.
const EngineVersion = 2
