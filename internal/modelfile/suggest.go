package modelfile

import (
	"strconv"
	"strings"
)

// nearest returns the candidate that word is most likely a slip of, "" if none is close. One letter is a slip of its other case only.
func nearest(word string, candidates []string) string {
	best, least := "", 1+max(1, len(word)/3)
	if len(word) == 1 {
		least = 1
	}
	for _, c := range candidates {
		if len(c) > 2*len(word)+2 || len(word) > 2*len(c)+2 {
			continue
		}
		d := distance(strings.ToLower(word), strings.ToLower(c))
		if d < least {
			best, least = c, d
		}
	}
	return best
}

// distance counts the insertions, deletions, replacements and swaps of neighbours between two words (Damerau 1964, Levenshtein 1966).
func distance(a, b string) int {
	x, y := []rune(a), []rune(b)
	rows := [3][]int{make([]int, len(y)+1), make([]int, len(y)+1), make([]int, len(y)+1)}
	for j := range rows[1] {
		rows[1][j] = j
	}
	for i := 1; i <= len(x); i++ {
		before, last, row := rows[0], rows[1], rows[2]
		row[0] = i
		for j := 1; j <= len(y); j++ {
			cost := 1
			if x[i-1] == y[j-1] {
				cost = 0
			}
			row[j] = min(last[j]+1, row[j-1]+1, last[j-1]+cost)
			if i > 1 && j > 1 && x[i-1] == y[j-2] && x[i-2] == y[j-1] {
				row[j] = min(row[j], before[j-2]+1)
			}
		}
		rows[0], rows[1], rows[2] = last, row, before
	}
	return rows[1][len(y)]
}

// hint offers the nearest candidate and lists all.
func hint(word, what string, candidates []string) string {
	s := what + ": " + strings.Join(candidates, ", ")
	if n := nearest(word, candidates); n != "" {
		return "did you mean " + strconv.Quote(n) + "? " + s
	}
	return s
}
