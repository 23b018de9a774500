// Package sample looks at files whose form nobody has declared, and says which declaration would read them, what that rests on, and
// what a person must confirm.
//
// A sample is the beginning of a file, cut into rows of cells. Samples of one feed are looked at together, since the line that decides
// how dates are written may stand in any of them. A finding is the declaration, with a remark for each of its keys: how sure it is, and why.
//
// What the numbers alone cannot prove is never called sure: whether 0.5 is half a per cent or half of everything, or whether
// 03/04/2026 lies in March. A finding is a proposal for a configuration that a person reads, and nothing else: the pass goes by what is declared.
package sample
