// Package stats is the arithmetic behind the tables: interval estimates for
// shares and rates, and the comparison of two rates.
//
// It is pure: numbers go in, numbers come out. It knows no occurrence, no
// table and no file, prints nothing and rounds nothing.
//
// What cannot be computed is NaN, never a number that looks like an answer:
// a share of nothing, a rate without exposure, a level outside (0, 1). No
// function panics on any input.
//
// Every level is a two-sided confidence level such as 0.95. Limits are found
// to about 1e-12 of their value for counts up to a million, by solving for them
// on the distribution function (solve.go says why the ready-made quantiles are
// not used).
//
// Floor 2 (tools).
package stats
