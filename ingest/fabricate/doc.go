// Package fabricate invents corpora of any size, together with the truth that
// was planted in each narrative: which factor, with what assertion, at which
// bytes, in what order of time.
//
// The usual steps:
//
//	m := fabricate.New(fabricate.Options{Seed: 7, Count: 1000})
//	for occurrence, truth := range m.All() {
//		...
//	}
//
// A narrative is made in three steps. An event (event.go) is drawn from the
// mix for the month and base: an ordered list of steps, each a factor. A scene
// (scene.go) fixes what the telling must not contradict: aircraft, runway,
// sides, speeds. The telling (telling.go) puts them into words from the hand
// written clauses in grammar/*.txt, in one of four voices: an investigator's
// report, a first-person voluntary report, one in capitals and abbreviations,
// and a two-line remark. About a third of the narratives carry a trap: a
// factor denied, offered as possible, advised or told of another flight, or a
// word that only looks like a factor ("VMC prevailed").
//
// The truth lists what was planted and nothing else. Sentences that plant
// nothing are written so as to affirm no factor, but a reader may still see
// more in a text than its maker did: measure recall against the truth, and
// read precision with that in mind. Factors are told by words, so every
// planted tag has the basis "told". The grammar is written by hand without
// regard to any rule book; keep it so, or what it measures is itself.
//
// The same options give the same bytes, on every machine. Making is streaming:
// memory does not grow with the count. People, places, operators and aircraft
// makes are invented and belong to nobody. The package refuses nothing at
// work: Options.Check says beforehand what is wrong, and New replaces what it
// cannot use by the default.
//
// The demo corpus is made again, byte for byte, by go generate in
// cmd/fabricate; its exact flags stand there.
//
// Floor 4 (engines); imports ingest/corpus and the standard library.
package fabricate
