package feed

import (
	"strings"
	"testing"

	"strayd/rules"
)

// Control totals at the end of a file hold, or refuse it with what they say. Sums by hand.
func TestTrailers(t *testing.T) {
	const rows = "date,series,return\n2024-03-13,alder,1.25\n2024-03-13,birch,-0.3\n2024-03-13,cedar,NA\n"
	const wide = "date,alder,birch\n2024-03-12,1.25,-0.3\n2024-03-13,0.05,NA\n"
	tests := []struct {
		name, text, want string
		layout           rules.Layout
	}{
		{"rows", rows + "#rows 3\n", "", rules.Long},
		{"both, no newline", rows + "#rows 3\n#total 0.95", "", rules.Long},
		{"total with a blank line", rows + "\n#total  0.950 \n\n", "", rules.Long},
		{"wide", wide + "#rows 2\n#total 1.00\n", "", rules.Wide},
		{"too few", rows + "#rows 4\n", ":5: the control total says 4 rows, the file has 3; ask the provider", rules.Long},
		{"too many", rows + "#rows 2\n", "says 2 rows, the file has 3", rules.Long},
		{"another sum", rows + "#total 0.9500001\n", ":5: the sum of the values is not the control total", rules.Long},
		{"no number", rows + "#rows three\n", "is no whole number", rules.Long},
		{"no sum", rows + "#total x\n", "is no number", rules.Long},
		{"a row after", rows + "#rows 3\n2024-03-13,dale,1\n", ":6: a row follows the control totals", rules.Long},
		{"a totals line of another form", rows + "#count 3\n", "the line has 1 cell", rules.Long},
		{"repeated row", rows + "2024-03-13,alder,1.25\n#rows 4\n#total 2.2\n", "", rules.Long}, // the sum of the sender holds it twice
	}
	for _, tt := range tests {
		f := longFeed()
		if tt.layout == rules.Wide {
			f = wideFeed()
		}
		f.Unit = rules.Percent
		f.Missing = []string{"NA"}
		for _, size := range []int{8, 1 << 16} {
			_, err := read(t, f, "a.csv", tt.text, Options{chunk: size})
			switch {
			case tt.want == "" && err != nil:
				t.Errorf("%s, chunks of %d: %v", tt.name, size, err)
			case tt.want != "" && (err == nil || !strings.Contains(err.Error(), tt.want)):
				t.Errorf("%s, chunks of %d: %v, want %s", tt.name, size, err, tt.want)
			}
		}
	}
}
