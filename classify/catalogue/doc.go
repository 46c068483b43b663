// Package catalogue holds the factor tree: the elements that an accident or
// incident chain is made of, each with its kind, its parent and its meaning.
//
// The tree is data (factors.yaml), embedded in the binary. The ids are fixed:
// exports, rules and saved filters of users rely on them. A child implies its
// parent: an occurrence tagged below-vmc also counts under slow-airspeed.
//
// Floor 1 (nouns): it imports no other package of this project.
package catalogue
