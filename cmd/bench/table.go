package main

import (
	"fmt"
	"strings"
)

// figures are one printed line.
type figures struct {
	row, work string
	usage
	rows  int   // taken by the process; 0 where it takes none
	bytes int64 // of the ledger
	held  int   // observations in it
	disk  bool  // what was written is shown
}

const heading = "row          work                       wall s   cpu s  peak MB  M rows/s  B/obs  written MB  bounds of the design: must, aim"

// bound is a figure that must hold and one to aim for.
type bound struct{ what, must, aim string }

// bounds of the design's section 10 that can be said without a peer at hand, by row and work. Seconds are shares of what the best
// peer took, by the measurements made before building (PERFORMANCE.md, A1 and A2): 4.2 to 4.7 s for the first load and 1.0
// to 1.2 s for the day, each taken at its lower end.
var bounds = map[string][]bound{
	"load 2000 x 5000":                        {{"s", "1.05 (0.25 of 4.2)", "0.50 (0.12)"}, {"B/obs", "6", "4.3"}},
	"load 10000 x 5000":                       {{"M rows/s", "10", "23"}, {"MB", "400", "150"}},
	"series order 10000 x 5000":               {{"times the load", "2", "1.3"}, {"MB", "600", "-"}},
	"shuffled 10000 x 5000":                   {{"times the load", "2", "1.3"}, {"MB", "600", "-"}},
	"series order 2000 x 5000":                {{"times the load", "2", "1.3"}, {"MB", "600", "-"}},
	"shuffled 2000 x 5000":                    {{"times the load", "2", "1.3"}, {"MB", "600", "-"}},
	"one day 1000000 after 80":                {{"s", "0.70 (0.7 of 1.0)", "0.40 (0.4)"}, {"MB written", "25", "12"}},
	"in daemon 1000000 committed":             {{"s", "0.2", "0.06"}},
	"in daemon 1000000 told":                  {{"s", "2", "0.5"}},
	"desk today":                              {{"s", "0.1", "-"}},
	"desk a flag":                             {{"s", "0.1", "-"}},
	"desk a series":                           {{"s", "0.1", "-"}},
	"desk feeds":                              {{"s", "0.1", "-"}},
	"command [flags]":                         {{"s", "0.3", "0.05"}},
	"command [explain fund001000 2020-02-28]": {{"s", "0.3", "0.05"}},
	"command [history fund001000]":            {{"s", "0.3", "0.05"}},
}

// print writes one line.
func (b *bench) print(f figures) {
	cell := func(show bool, format string, v float64) string {
		if !show {
			return "-"
		}
		return fmt.Sprintf(format, v)
	}
	fmt.Printf("%-12s %-26s %6.3f  %6.2f  %7.0f  %8s  %5s  %10s", f.row, f.work, f.wall.Seconds(), f.cpu.Seconds(), float64(f.peak)/1e6,
		cell(f.rows > 0, "%.2f", float64(f.rows)/1e6/f.wall.Seconds()), cell(f.bytes > 0, "%.2f", float64(f.bytes)/float64(f.held)),
		cell(f.disk, "%.1f", float64(f.written)/1e6))
	var words []string
	for _, w := range bounds[f.row+" "+f.work] {
		words = append(words, fmt.Sprintf("%s %s, %s", w.what, w.must, w.aim))
	}
	fmt.Println("  " + strings.Join(words, "; "))
}
