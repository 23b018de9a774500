package config

import "strings"

// nearest is the word of the list that is fewest single-character edits away, "" when none is near enough to be meant.
func nearest(word string, list []string) string {
	best, found := len(word)/3+1, ""
	if len(word) > longest {
		return ""
	}
	for _, w := range list {
		if n := edits(strings.ToLower(word), strings.ToLower(w)); n <= best && (n < best || found == "") {
			best, found = n, w
		}
	}
	return found
}

// edits is the least number of insertions, deletions and replacements that turn a into b (Levenshtein 1966).
func edits(a, b string) int {
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := range len(a) {
		diagonal := row[0]
		row[0] = i + 1
		for j := range len(b) {
			cost := 1
			if a[i] == b[j] {
				cost = 0
			}
			diagonal, row[j+1] = row[j+1], min(diagonal+cost, row[j]+1, row[j+1]+1)
		}
	}
	return row[len(b)]
}
