package physics

import (
	"fmt"
	"strconv"
	"strings"
	"unicode/utf8"
)

// nearest returns the candidate with the smallest edit distance from a word,
// or "" where none is near.
func nearest(word string, candidates []string) string {
	best, distance := "", 2+len(word)/4
	for _, c := range candidates {
		if d := editDistance(word, c); d < distance {
			best, distance = c, d
		}
	}
	return best
}

// editDistance counts the insertions, deletions and substitutions of bytes that
// lead from a to b (Levenshtein 1966).
func editDistance(a, b string) int {
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := range len(a) {
		diagonal := row[0]
		row[0] = i + 1
		for j := range len(b) {
			change := diagonal
			if a[i] != b[j] {
				change++
			}
			diagonal = row[j+1]
			row[j+1] = min(change, row[j]+1, row[j+1]+1)
		}
	}
	return row[len(b)]
}

// Suggest names the nearest candidate or, where none is near, all of them.
func Suggest(word string, candidates []string) string {
	if best := nearest(word, candidates); best != "" {
		return fmt.Sprintf("did you mean %q?", best)
	}
	if len(candidates) == 0 {
		return "there is none"
	}
	return "choose from " + listed(candidates)
}

// listed writes names one after the other, the first ten of them.
func listed(names []string) string {
	const most = 10
	shortened := names[:min(len(names), most)]
	quotes := make([]string, len(shortened))
	for i, n := range shortened {
		quotes[i] = strconv.Quote(n)
	}
	text := strings.Join(quotes, ", ")
	if len(names) > most {
		text += ", …"
	}
	return text
}

// shown quotes what a user wrote, cut to a length that leaves one line readable.
func shown(text string) string {
	if utf8.RuneCountInString(text) > longestName {
		text = string([]rune(text)[:longestName]) + "…"
	}
	return strconv.Quote(text)
}
