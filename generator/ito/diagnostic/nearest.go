package diagnostic

import "strings"

// Nearest returns the candidate that name was probably meant to be, or "" when
// none is close. Closeness is the number of single-letter changes, insertions,
// deletions and swaps of neighbours (optimal string alignment distance; from
// memory, F. Damerau, Commun. ACM 7 (1964) 171); up to a third of the letters
// may differ, and one in short names. A difference in upper and lower case
// alone is always close. The first of equally near candidates wins.
func Nearest(name string, candidates []string) string {
	a := []rune(name)
	if len(a) == 0 || len(a) > nearestLongest {
		return ""
	}
	limit := max(1, len(a)/3)
	best, bestDistance := "", limit+1
	for _, c := range candidates {
		if c == name || c == "" || len(c) > 4*nearestLongest {
			continue
		}
		if strings.EqualFold(c, name) {
			return c
		}
		b := []rune(c)
		if abs(len(a)-len(b)) > limit {
			continue
		}
		// A single letter resembles every other single letter: that is no hint.
		if d := distance(a, b); d < bestDistance && d < max(len(a), len(b)) {
			best, bestDistance = c, d
		}
	}
	return best
}

const nearestLongest = 64

func abs(n int) int {
	if n < 0 {
		return -n
	}
	return n
}

func distance(a, b []rune) int {
	rows := make([][]int, len(a)+1)
	for i := range rows {
		rows[i] = make([]int, len(b)+1)
		rows[i][0] = i
	}
	for j := range rows[0] {
		rows[0][j] = j
	}
	for i := 1; i <= len(a); i++ {
		for j := 1; j <= len(b); j++ {
			change := 1
			if a[i-1] == b[j-1] {
				change = 0
			}
			rows[i][j] = min(rows[i-1][j]+1, rows[i][j-1]+1, rows[i-1][j-1]+change)
			if i > 1 && j > 1 && a[i-1] == b[j-2] && a[i-2] == b[j-1] {
				rows[i][j] = min(rows[i][j], rows[i-2][j-2]+1)
			}
		}
	}
	return rows[len(a)][len(b)]
}
