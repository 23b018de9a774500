// Weigh leads the model of causes alone through invented books with planted errors and prints what it catches and names: the quick way to
// see what a change of the model does. The drill of the program runs the whole pass.
package main

import (
	"flag"
	"fmt"
	"os"
)

func main() {
	seeds := flag.Int("seeds", 8, "books")
	from := flag.Uint64("from", 1, "first seed")
	flag.Parse()
	t := newTally()
	for s := range *seeds {
		t.book(*from + uint64(s))
	}
	if _, err := fmt.Fprint(os.Stdout, t); err != nil {
		os.Exit(1)
	}
}
