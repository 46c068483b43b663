// Package rulebook reads the rule book: the versioned set of rules that tags
// come from, written as data that a person who does not program can read and
// extend.
//
// A rule file is YAML with any of these sections:
//
//	terms:   a name for words that mean the same ({engine}: engine, motor, ...)
//	factor:  the factor that the rules of this file find, and
//	rules:   what each looks for, with examples that must and must not match
//	cues:    words that tell how a factor is spoken of: denied, possible,
//	         advised, elsewhere; words that end their reach
//	order, onward, explains, always, in summaries:
//	         what tells the order of time (due to, which led to, ...)
//	landing roll, minimum control speed is, speed flown is:
//	         what the inference from sides and from speeds looks for
//	aircraft types: how many engines a type has, and where
//
// What a rule looks for is a pattern; see Pattern for how one is written.
//
// Load compiles all files of one or more folders; a later folder adds to and
// overrides an earlier one. Every fault is reported with file, line and the
// words at fault. The version of a book is a hash of all that it holds; the
// hash of one rule covers the rule with every term that it uses.
//
// The package compiles and matches; it does not decide what a match means.
// That, and running the examples, is the work of package classify.
//
// Floor 3 (languages).
package rulebook
