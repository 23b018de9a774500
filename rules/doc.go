// Package rules holds what the words of strayd mean: plain values (dates, exact returns, ranges, verdicts, flags) and the
// pure judging that turns one return and its past into a verdict.
//
// A series is one stream of daily returns. An observation is one return of a series for one valuation date. A range says
// within which values a return is expected; a verdict says what a return is under a range; a flag is a verdict that a person
// must look at.
//
// Returns are fractions, held exactly as whole Units of 1e-15. Nothing here reads a file, a socket or a clock, and no input
// is changed.
package rules
