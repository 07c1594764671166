package engine

import (
	"strings"
	"unicode/utf8"
)

// quoteLimit is how much of a caller's text is repeated in a message.
const quoteLimit = 60

// Quote returns a caller's text in quotation marks, on one line and cut to a readable length.
func Quote(text string) string {
	text = strings.Map(func(r rune) rune {
		if isBreak(r) {
			return ' '
		}
		return r
	}, text)
	if utf8.RuneCountInString(text) > quoteLimit {
		runes := []rune(text)
		text = string(runes[:quoteLimit]) + "…"
	}
	return "“" + text + "”"
}

// DidYouMean returns a sentence with the known name nearest to an unknown one, or nothing where none is near: at most a
// third of its characters wrong, and differences in case and outer blanks count as none.
func DidYouMean(name string, known []string) string {
	best, distance := "", len(name)/3+1
	for _, k := range known {
		if d := editDistance(fold(name), fold(k)); d < distance {
			best, distance = k, d
		}
	}
	if best == "" {
		return ""
	}
	return " Did you mean " + Quote(best) + "?"
}

func fold(s string) string {
	if len(s) > 4*MaxName {
		s = s[:4*MaxName]
	}
	return strings.ToLower(strings.TrimSpace(s))
}

// editDistance returns the Levenshtein distance in characters.
func editDistance(a, b string) int {
	x, y := []rune(a), []rune(b)
	row := make([]int, len(y)+1)
	for j := range row {
		row[j] = j
	}
	for i := range x {
		diagonal := row[0]
		row[0] = i + 1
		for j := range y {
			cost := diagonal
			if x[i] != y[j] {
				cost++
			}
			diagonal = row[j+1]
			row[j+1] = min(cost, diagonal+1, row[j]+1)
		}
	}
	return row[len(y)]
}
