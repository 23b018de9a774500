// Command bench measures strayd from outside: it makes books of invented returns, runs whole processes of a freshly built
// strayd over them and prints wall, processor time, peak memory, disk written and bytes an observation, at one, two and four
// times the work.
//
// A book is a table of series by dates; every value is a function of its series and date alone, so that one book can be written
// in any order and layout. A row is one measurement; its bounds are those of the design, printed beside the figure. Figures only:
// nothing here passes or fails.
//
// Traps. The peak memory of a process includes the pages of the ledger that it had mapped. Linux counts the memory of the process
// that starts another into the other's peak, so this one keeps its own small. Other work on the machine shows in every figure.
package main
