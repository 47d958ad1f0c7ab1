// Package report turns a finished run into something a person reads: a single
// page that opens with the answer (HTML), and the short table that ends a run
// on the terminal (Terminal).
//
// It computes nothing physical. What it does to numbers is arithmetic for the
// eye: rounding a value to its error bar, choosing axes, thinning curves to the
// width of the drawing. Everything it prints stands with more digits in the
// stored result.
//
// The page is well-formed as XML as well as HTML, holds its style and its
// pictures, runs no script and refers to nothing outside itself.
//
// Pictures are written by the small SVG writer in this package instead of a
// plotting library, because text has to stay text (selectable, in the reader's
// fonts), each picture has to carry a title and a description for a screen
// reader, and a page of some twenty curves has to stay below one megabyte.
package report
