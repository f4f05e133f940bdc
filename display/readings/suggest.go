package readings

import (
	"strings"
	"unicode"
)

// letters is s in lower case without all that is neither letter nor digit.
func letters(s string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsLetter(r) || unicode.IsDigit(r) {
			return unicode.ToLower(r)
		}
		return -1
	}, s)
}

// maxTypo is the greatest edit distance at which a word is taken for a typing mistake in another.
const maxTypo = 2

// shortWord is the length below which two edits make one ordinary word of another ("site" and
// "bits", "name" and "ramp"), so that two edits count only where the first letter has survived.
const shortWord = 6

// typo reports whether word looks like a mistyped form of known, which has at least four letters.
func typo(word, known string) bool {
	if len(known) < 4 {
		return false
	}
	d := edits(word, known)
	if d == maxTypo && len(known) < shortWord {
		return word[:1] == known[:1]
	}
	return d <= maxTypo
}

// mistypedKey is the metadata key that a key looks like, or "" where it is a word of its own. Words
// of one key run together, as in "ambient" or "serial_number", count; words of a sentence do not.
func mistypedKey(key string) string {
	plain := letters(key)
	if plain == "" {
		return ""
	}
	for _, known := range metadataKeys {
		if plain == letters(known) {
			return known
		}
	}
	lower := strings.ToLower(key)
	for _, known := range metadataKeys {
		if typo(lower, known) {
			return known
		}
	}
	if strings.ContainsAny(key, " \t") {
		return ""
	}
	joined := strings.ReplaceAll(lower, "-", "_")
	for _, known := range metadataKeys {
		if strings.HasPrefix(known, joined+"_") || strings.HasPrefix(joined, known+"_") {
			return known
		}
	}
	return ""
}

// nearest is the known word that a word was most likely meant to be, or "".
func nearest(word string, known []string) string {
	plain := letters(word)
	if plain == "" {
		return ""
	}
	best, least := "", maxTypo+1
	for _, k := range known {
		if d := edits(plain, letters(k)); d < least && (d == 0 || len(k) >= 4) {
			best, least = k, d
		}
	}
	if best != "" {
		return best
	}
	for _, k := range known {
		if strings.HasPrefix(plain, letters(k)) && len(letters(k)) > len(letters(best)) {
			best = k
		}
	}
	return best
}

// maxEdited is the length beyond which no word is compared: the longest known word has 16 letters.
const maxEdited = 40

// edits is the number of letters to insert, drop, change or swap with their neighbour that make b of
// a (optimal string alignment), or a number beyond maxTypo where the lengths rule a likeness out.
func edits(a, b string) int {
	if len(a) > maxEdited || len(b) > maxEdited || len(a)-len(b) > maxTypo || len(b)-len(a) > maxTypo {
		return maxTypo + 1
	}
	var d [maxEdited + 1][maxEdited + 1]int
	for i := range len(a) + 1 {
		d[i][0] = i
	}
	for k := range len(b) + 1 {
		d[0][k] = k
	}
	for i := 1; i <= len(a); i++ {
		for k := 1; k <= len(b); k++ {
			change := 1
			if a[i-1] == b[k-1] {
				change = 0
			}
			d[i][k] = min(d[i-1][k]+1, d[i][k-1]+1, d[i-1][k-1]+change)
			if i > 1 && k > 1 && a[i-1] == b[k-2] && a[i-2] == b[k-1] {
				d[i][k] = min(d[i][k], d[i-2][k-2]+1)
			}
		}
	}
	return d[len(a)][len(b)]
}
