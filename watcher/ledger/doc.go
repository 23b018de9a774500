// Package ledger is the store of strayd, the only door to bbolt: one file that holds columns of returns and prices, used
// values, rolling states, flags, files, the run record and the hash-chained record.
//
// A layer is a value tagged with the step that wrote it, always the last part of its key. A step is published when the head
// row says so; readers pass over newer layers. So a large batch is written in bounded commits without being seen, and a last
// small one publishes it. The span of keys that a batch stages is noted first, and swept on opening when it was never
// published.
//
// Traps. Values handed to bbolt must stay untouched until the commit, so the arena of encoded values is reused only between
// commits. A leaf holds two keys at least and splits only above four: column values are sized so that two of them fill eight
// pages. What bbolt panics about, and faults in the mapped file, come back as *Damaged from every method, on whichever
// goroutine it runs. Slices into the map never leave the package. A file that outgrows the address space set aside on opening
// (16 GiB, less under a limit of the process) is mapped anew, and that waits for every open reading.
package ledger
