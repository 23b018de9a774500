// Package stats is the arithmetic of strayd: exact rolling sums, tails of a z-score, ranks, quantiles, lines and coverage
// tests. It knows nothing of returns or files and imports nothing else of strayd; it is the only door to gonum.
//
// A value k is an integer on a fixed-point scale that the caller owns; one is how many of its units make 1. Sums holds the
// exact sums of one window; Panel, WeightedPanel and SortedPanel hold the windows of many series side by side. Missing stands
// where a series has no value. A Tail turns a z-score into a probability and back. A line is where inside ends, said as a tail
// probability, a confidence, a z or once in so many days.
//
// Traps. A window holds at most MaxWindow values, each at most MaxValue in size: beyond that the exact sums would wrap, and
// nothing here checks it on the way in except Scan. Products that are added are written float64(x*y), because the compiler may
// otherwise fuse them on some machines and not on others. No NaN and no infinity is returned: an argument out of its domain
// gives an error, a false ok, or a clamp that the function's comment names.
package stats
