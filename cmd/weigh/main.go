// Command weigh leads the model of causes alone through invented books with planted errors and prints what it catches and names: the quick way to
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
	folder := flag.String("factors", "", "folder of the open index data, whose returns are the factors; invented ones when left out")
	flag.Parse()
	t := newTally()
	if *folder != "" {
		var err error
		if t.factors, err = readFactors(*folder); err != nil {
			fmt.Fprintln(os.Stderr, err)
			os.Exit(1)
		}
	}
	for s := range *seeds {
		t.book(*from + uint64(s))
	}
	if _, err := fmt.Fprint(os.Stdout, t); err != nil {
		os.Exit(1)
	}
}
