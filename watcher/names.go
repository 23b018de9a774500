package watcher

import (
	"bytes"
	"hash/maphash"
	"sync"
	"sync/atomic"
)

// Names is the dictionary of series: each name has a dense number, given in order of first appearance. One goroutine may Add
// while others read.
type Names struct {
	list  atomic.Pointer[nameList]
	mu    sync.RWMutex
	slots []uint32 // open addressing, number+1; nil until names are looked up
	asked int      // names looked up without it
	seed  maphash.Seed
}

// walks is how many names are looked up by walking over all of them before a table is made, which costs as much as many walks: a
// command that asks for one series of a million needs no table.
const walks = 2

// nameList is an append-only arena: name i is text[ends[i-1]:ends[i]].
type nameList struct {
	text []byte
	ends []uint32
}

// NewNames makes a dictionary from names laid end to end in text; ends holds where each stops. It takes both over.
func NewNames(text []byte, ends []uint32) *Names {
	n := &Names{seed: maphash.MakeSeed()}
	n.list.Store(&nameList{text, ends})
	return n
}

// Copy is a dictionary of the same names to add to.
func (n *Names) Copy() *Names {
	l := n.list.Load()
	return NewNames(l.text[:len(l.text):len(l.text)], l.ends[:len(l.ends):len(l.ends)])
}

// Len is how many names there are.
func (n *Names) Len() int { return len(n.list.Load().ends) }

// Name is the name of a number, valid as long as the dictionary; do not change it. nil when there is no such number.
func (n *Names) Name(id uint32) []byte {
	l := n.list.Load()
	if int(id) >= len(l.ends) {
		return nil
	}
	return l.name(id)
}

func (l *nameList) name(id uint32) []byte {
	var from uint32
	if id > 0 {
		from = l.ends[id-1]
	}
	return l.text[from:l.ends[id]:l.ends[id]]
}

// Is says whether number id is the given name: the cheap way to follow a file that lists series in the order of their numbers.
func (n *Names) Is(id uint32, name []byte) bool {
	return bytes.Equal(n.Name(id), name) && len(name) > 0
}

// Find is the number of a name.
func (n *Names) Find(name []byte) (uint32, bool) {
	n.mu.RLock()
	ready := n.slots != nil
	var id uint32
	var ok bool
	if ready {
		id, ok = n.find(name)
	}
	n.mu.RUnlock()
	if ready {
		return id, ok
	}
	n.mu.Lock()
	defer n.mu.Unlock()
	if n.slots == nil && n.asked < walks {
		n.asked++
		return n.list.Load().walk(name)
	}
	n.index(n.Len())
	return n.find(name)
}

// walk finds a name without a table.
func (l *nameList) walk(name []byte) (uint32, bool) {
	from := uint32(0)
	for id, end := range l.ends {
		if int(end-from) == len(name) && bytes.Equal(l.text[from:end], name) {
			return uint32(id), true
		}
		from = end
	}
	return 0, false
}

// Add gives the number of a name, a new one when it is not yet there.
func (n *Names) Add(name []byte) uint32 {
	n.mu.Lock()
	defer n.mu.Unlock()
	l := n.list.Load()
	if 2*(len(l.ends)+1) > len(n.slots) {
		n.index(2 * (len(l.ends) + 1))
	}
	if id, ok := n.find(name); ok {
		return id
	}
	id := uint32(len(l.ends))
	text := append(l.text, name...)
	n.list.Store(&nameList{text, append(l.ends, uint32(len(text)))})
	n.put(id)
	return id
}

// Cut forgets the names from a number on: those of a file that was refused.
func (n *Names) Cut(size int) {
	n.mu.Lock()
	defer n.mu.Unlock()
	l := n.list.Load()
	if size >= len(l.ends) {
		return
	}
	end := uint32(0)
	if size > 0 {
		end = l.ends[size-1]
	}
	n.list.Store(&nameList{l.text[:end:end], l.ends[:size:size]})
	n.slots = nil
}

// index builds the table with room for at least the given number of names. Called with the lock held.
func (n *Names) index(room int) {
	if n.slots != nil && 2*room <= len(n.slots) {
		return
	}
	size := 64
	for size < 2*room {
		size *= 2
	}
	n.slots = make([]uint32, size)
	for id := range uint32(n.Len()) {
		n.put(id)
	}
}

func (n *Names) put(id uint32) {
	mask := uint64(len(n.slots) - 1)
	at := maphash.Bytes(n.seed, n.Name(id)) & mask
	for n.slots[at] != 0 {
		at = (at + 1) & mask
	}
	n.slots[at] = id + 1
}

func (n *Names) find(name []byte) (uint32, bool) {
	mask := uint64(len(n.slots) - 1)
	at := maphash.Bytes(n.seed, name) & mask
	l := n.list.Load()
	for n.slots[at] != 0 {
		if id := n.slots[at] - 1; bytes.Equal(l.name(id), name) {
			return id, true
		}
		at = (at + 1) & mask
	}
	return 0, false
}
