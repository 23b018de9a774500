// Package chart draws a series with its range: as a picture for chat and mail (PNG), as a part of a page (SVG), and in words (Text).
//
// A chart is rules.Chart; what is drawn is laid out once, on the drawing library's canvas, and then painted or written. Each thing drawn has an
// ink, which is a colour in a picture and a class on a page, so that the page's own style decides there.
//
// The package is the only door to the drawing library (gonum.org/v1/plot). Trap: a value so far out that it would flatten the range to a line is
// drawn at the edge, as an arrow with its figure, not to scale.
package chart
