package watcher

import (
	"fmt"
	"testing"
)

// The first names are looked up without a table, the others with one: both find each name and
// nothing else.
func TestNamesFind(t *testing.T) {
	for first := range 6 {
		n := NewNames(nil, nil)
		for i := range 5 {
			n.Add(fmt.Append(nil, "fund", i))
		}
		held := NewNames(n.list.Load().text, n.list.Load().ends)
		for look := range 12 {
			want := (first + look) % 6
			id, ok := held.Find(fmt.Append(nil, "fund", want))
			if ok != (want < 5) || ok && id != uint32(want) {
				t.Errorf("look-up %d of fund%d: %d, %v", look, want, id, ok)
			}
			if _, ok := held.Find([]byte("fund")); ok {
				t.Error("half a name is found")
			}
		}
	}
	n := NewNames([]byte("ab"), []uint32{1, 2})
	n.Cut(1)
	if _, ok := n.Find([]byte("b")); ok {
		t.Error("a name that was cut off is found")
	}
	if id, ok := n.Find([]byte("a")); !ok || id != 0 {
		t.Error("a name before the cut is not found")
	}
}
