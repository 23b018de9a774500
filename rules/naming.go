package rules

import (
	"fmt"
	"slices"
	"strings"
)

// mostNamed is how many series a note names.
const mostNamed = 10

// Naming counts series and names the first few of them by the alphabet. The zero value is empty.
type Naming struct {
	Count int
	names []string // ascending, at most mostNamed
}

// Add counts a series.
func (n *Naming) Add(series string) {
	n.Count++
	at, _ := slices.BinarySearch(n.names, series)
	if at == mostNamed {
		return
	}
	if len(n.names) == mostNamed {
		n.names = n.names[:mostNamed-1]
	}
	n.names = slices.Insert(n.names, at, series)
}

// String lists the names: "alder, birch and 3 more".
func (n *Naming) String() string {
	s := strings.Join(n.names, ", ")
	if more := n.Count - len(n.names); more > 0 {
		s += fmt.Sprintf(" and %d more", more)
	}
	return s
}
