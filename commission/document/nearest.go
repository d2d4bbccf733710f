package document

import "strings"

// Nearest gives the known word that a misspelt one most likely means: one that differs only in case, or in at most two
// letters and at most half of them; "" where none is near.
func Nearest(word string, known []string) string {
	best, least := "", 3
	for _, k := range known {
		if strings.EqualFold(k, word) {
			return k
		}
		if len(word) > 64 {
			continue
		}
		if d := distance(strings.ToLower(word), k); d < least && 2*d <= len(k) {
			best, least = k, d
		}
	}
	return best
}

// distance is the least number of letters to insert, delete or change (Levenshtein).
func distance(a, b string) int {
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := 1; i <= len(a); i++ {
		diagonal := row[0]
		row[0] = i
		for j := 1; j <= len(b); j++ {
			change := diagonal
			if a[i-1] != b[j-1] {
				change++
			}
			diagonal = row[j]
			row[j] = min(change, row[j]+1, row[j-1]+1)
		}
	}
	return row[len(b)]
}
