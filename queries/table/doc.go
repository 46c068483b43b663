// Package table holds the typed result table that every question answers
// with, and writes it: as text for a terminal, CSV, JSON or Markdown. What a
// reader must know travels with the figures, as notes.
//
// Machine forms (CSV, JSON) keep full precision and leave unknown cells empty
// or null. Forms for people (text, Markdown) round by the unit of a column,
// fold a figure and its limits into one cell ("9.0% (6.6-12.1)"), and leave
// out columns in which nothing is known. Text keeps to the width of the window:
// cells are wrapped, and a table too wide even so goes on below.
//
// To add a form, write format_*.go after its neighbours' shape and add one
// line to the table in table.go.
//
// Floor 2 (tools): it imports no other package of this project.
package table
