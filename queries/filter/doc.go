// Package filter is the language of --only: a text becomes a tree that says
// which occurrences count.
//
//	source = tarnwick and (operation = training or operation = private-hire)
//	injury = fatal and not slow-airspeed
//	date >= 2015-03 and make ~ larkin
//
// A bare factor id (also factor:id) holds where the factor, or one below it,
// is affirmed. = and != compare whole values, ~ looks for a part, both
// without regard to case; < <= > >= compare dates, years, numbers of engines.
// Dates may be of reduced precision.
//
// What is not known does not match: injury != fatal leaves out the
// occurrences whose injury nobody told, as does injury = fatal; "not injury =
// fatal" takes them in. The downside is that the two are not the same; the
// other choice would count silence as an answer.
//
// The package knows no index and no database, and evaluates by itself.
//
// Floor 3 (languages).
package filter
