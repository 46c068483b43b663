// Package queries answers the questions that users ask of a collection, one
// file per question: trend.go, chains.go, cases.go.
//
// A question is a function from what the store streams to a table.Table. The
// command line, pages and reports call the same functions, so that they
// cannot disagree. Rules that hold for every table:
//
//   - a factor counts where it, or a factor below it, is affirmed;
//   - a share is over the occurrences of its row that have a usable
//     narrative, since nothing can be found where nothing was told;
//   - a rate is given only for the source that the exposure covers, and for
//     periods that it covers whole;
//   - what is not mentioned is not said not to have happened;
//   - what a reader must know before believing a figure is a note of the
//     table: small counts, breaks in coverage, sources that do not mix.
//
// Floor 5 (questions).
package queries
