// Package doubles finds pairs of occurrences that may tell one event: two
// agencies reported it, or two people who were there.
//
// It weighs evidence as record linkage does (Fellegi and Sunter, A Theory for
// Record Linkage, JASA 64, 1969): what two reports agree on counts by how
// rarely unrelated ones would, in bits; what they disagree on counts against.
// Dates, places, aircraft, registrations, the factors that the rule book found
// and the wording are weighed. The wording is compared by sketches (Broder, On
// the resemblance and containment of documents, 1997; one permutation: Li, Owen
// and Zhang, 2012; filling of empty bins: Shrivastava and Li, 2014; one byte of
// each minimum: Li and König, 2010).
//
// Not all pairs are looked at. Two reports are compared when they lie within
// days of each other and share aircraft type and place, a registration, or
// either of the two where that is rare; or when their sketches meet in a band
// (locality-sensitive hashing). Work therefore grows with the number of reports
// times how crowded their days are, not with its square.
//
// A pair is only a candidate: a person decides. The steps are Told for each
// occurrence, then Find.
//
// Floor 4 (engines). It knows no database: its caller hands in values.
package doubles
