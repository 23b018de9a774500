package ledger

import "runtime"

const (
	leastGrowth = 256 << 10
	mostGrowth  = 64 << 20
)

// grow sets by how much more than needed the file grows when it next must, each time a truncate and a sync: by what is still
// to come of a large batch, so that a first load grows it once; else by a share of its size, so that a day seldom pays for
// growing and little lies idle.
func (w *writer) grow(coming int64) {
	if coming > 0 {
		w.coming, w.garbage = coming, coming
	}
	if coming > commitSize {
		runtime.GC() // what judging left serves the arena and the pages
	}
	share := min(max(w.tx.Size()/64, leastGrowth), mostGrowth)
	w.l.db.AllocSize = int(max(share, coming-commitSize))
	if room := min(coming, commitSize); int64(cap(w.l.arena)) < room {
		w.l.arena = make([]byte, 0, room+room/8) // at once: while it grew by appending, every size would touch fresh memory
	}
}

// size is about how many bytes the columns, states and flags of a batch take.
func (p *plan) size() (n int64) {
	n = 150 * int64(len(p.flags))
	for _, s := range p.states {
		n += 20*int64(len(s.N)) + 8*int64(len(s.Var)) + 100
	}
	for _, columns := range p.columns {
		short := false
		for i, c := range columns {
			if i%64 == 0 { // the others will be like it
				_, short = longs(c)
			}
			cell := 4
			switch {
			case c.V64 != nil:
				cell = 8
			case short:
				cell = shortCell
			}
			present := c.Len() - missing(c)
			n += int64(min(c.Len()*cell, present*(2+cell)) + columnHead + 32)
		}
	}
	return n
}
