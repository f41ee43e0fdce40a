package surveyfile

import (
	"fmt"
	"slices"
	"strings"
)

// distance is the optimal string alignment distance of two words: the least
// number of letters put in, taken out, changed or swapped with a neighbour
// that makes one of the other (Damerau 1964).
func distance(a, b string) int {
	x, y := []rune(a), []rune(b)
	row := func() []int { return make([]int, len(y)+1) }
	before, last, now := row(), row(), row()
	for j := range last {
		last[j] = j
	}
	for i := 1; i <= len(x); i++ {
		now[0] = i
		for j := 1; j <= len(y); j++ {
			change := 1
			if x[i-1] == y[j-1] {
				change = 0
			}
			now[j] = min(last[j]+1, now[j-1]+1, last[j-1]+change)
			if i > 1 && j > 1 && x[i-1] == y[j-2] && x[i-2] == y[j-1] {
				now[j] = min(now[j], before[j-2]+1)
			}
		}
		before, last, now = last, now, before
	}
	return last[len(y)]
}

// nearest returns the word of known that word is most likely a slip of. Case
// does not count. A third of the letters may differ; of equals the first wins.
func nearest(word string, known []string) (string, bool) {
	const longest = 64 // letters; longer words are no slips, and cost time
	if len(word) > longest {
		return "", false
	}
	lower := strings.ToLower(word)
	best, found := 0, ""
	for _, k := range known {
		if len(k) > longest {
			continue
		}
		allowed := max(1, max(len(word), len(k))/3)
		d := distance(lower, strings.ToLower(k))
		// Of a one-letter word nothing is left when its only letter differs.
		if d > allowed || (d > 0 && max(len([]rune(word)), len([]rune(k))) == d) {
			continue
		}
		if found == "" || d < best {
			best, found = d, k
		}
	}
	return found, found != ""
}

// oneOf says what would be right for a word that is none of known: the near
// miss when there is one, else the words themselves.
func oneOf(word, plural string, known []string) string {
	if len(known) == 0 {
		return "no " + plural + " are defined"
	}
	if k, ok := nearest(word, known); ok {
		return fmt.Sprintf("did you mean %q?", k)
	}
	const most = 20
	if len(known) > most {
		return fmt.Sprintf("known %s: %s and %d more", plural, strings.Join(known[:most], ", "), len(known)-most)
	}
	return fmt.Sprintf("known %s: %s", plural, strings.Join(known, ", "))
}

// ordinal finds word in list, or returns -1.
func ordinal(list []string, word string) int { return slices.Index(list, word) }
