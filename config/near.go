package config

import "strings"

// nearest is the word of the list that is fewest edits away, "" when none is near enough to be meant.
func nearest(word string, list []string) string {
	if len(word) > longest {
		return ""
	}
	best, found := min(max(len(word)/3, 1), len(word)-1)+1, ""
	for _, w := range list {
		if n := edits(strings.ToLower(word), strings.ToLower(w)); n < best {
			best, found = n, w
		}
	}
	return found
}

// edits is the least number of insertions, deletions, replacements and swaps of neighbours that turn a into b, none of them
// within another (optimal string alignment; Damerau 1964).
func edits(a, b string) int {
	rows := make([][]int, len(a)+1)
	for i := range rows {
		rows[i] = make([]int, len(b)+1)
		rows[i][0] = i
	}
	for j := range len(b) {
		rows[0][j+1] = j + 1
	}
	for i := 1; i <= len(a); i++ {
		for j := 1; j <= len(b); j++ {
			cost := 1
			if a[i-1] == b[j-1] {
				cost = 0
			}
			rows[i][j] = min(rows[i-1][j]+1, rows[i][j-1]+1, rows[i-1][j-1]+cost)
			if i > 1 && j > 1 && a[i-1] == b[j-2] && a[i-2] == b[j-1] {
				rows[i][j] = min(rows[i][j], rows[i-2][j-2]+1)
			}
		}
	}
	return rows[len(a)][len(b)]
}
