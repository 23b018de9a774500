// Package drill plants known errors in a copy of a book of returns and scores the flags that come of them.
//
// A Book is a matrix of returns, dates by series, with what is known of each series. A Kind is a kind of error, or a true move that must
// not be called one. A Plant is one of them at one place; a Plan is all plants of a run, drawn from a seed, spaced so that they do not
// disturb each other. An Outcome is what the flags made of a plant: caught on its day, within five days, named rightly, wrongly, or not.
//
// Everything is a value and a function of values: the same book, options and seed give the same plan, and no input is changed. Returns are
// rules.Units at the decimals that the series prints; what a plant changes is printed at the same decimals. Flags on untouched days
// are called false, which on a real history is too harsh: something may have happened on them.
package drill
