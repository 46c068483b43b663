// Package filter is the language of --only: a text becomes a tree that says
// which occurrences count.
//
//	source = tarnwick and (operation = training or operation = private-hire)
//	injury = fatal and not slow-airspeed
//	date >= 2015-03 and make ~ larkin
//
// A bare factor id (also factor:id) holds where the factor, or one below it,
// is affirmed. = and != compare whole values, ~ looks for a part, both
// without regard to case; < <= > >= compare dates, numbers of engines, and what
// reads as a number in extra.NAME. not binds before and, and before or.
//
// Dates may be of reduced precision, in the filter and in the occurrence, and
// a comparison holds only if it holds for every day that the occurrence's date
// can mean: date = 2014 is any day within 2014; date >= 2014 takes in an
// occurrence of which only "2014" is known, date >= 2014-03 does not. The
// downside: neither date < 2014-03 nor date >= 2014-03 finds that occurrence.
//
// What is not known does not match: injury != fatal leaves out the
// occurrences whose injury nobody told, as does injury = fatal; "not injury =
// fatal" takes them in. The downside is that the two are not the same; the
// other choice would count silence as an answer.
//
// Explain tells a filter in plain words, for the head of a table. An Error shows
// where a filter cannot be understood, and what may have been meant.
//
// The package knows no index and no database, and evaluates by itself: Eval is
// what any faster way of answering must agree with.
//
// Floor 3 (languages).
package filter
