package record

import (
	"slices"
	"strings"
	"unicode"
)

// Limits of the words of one saved thing. A title of a megabyte is kept whole in its
// document; it is found by its beginning.
const (
	maxWordRunes = 40
	maxWords     = 400
)

// Words returns the words by which something with these texts is found, sorted and
// each once: every run of characters between spaces, in lower case and without what
// is no letter or digit, and the rest of it from each place where a reader may see a
// word begin: behind a hyphen or slash, and between letters and digits. "RL-430M"
// gives rl430m, 430m and m, so that rl430, 430 and rl-430m all find it.
func Words(texts ...string) []string {
	var words []string
	for _, text := range texts {
		for run := range strings.FieldsSeq(text) {
			kept, starts := letters(run)
			for _, start := range starts {
				if len(words) == maxWords {
					return distinct(words)
				}
				words = append(words, cut(kept[start:]))
			}
		}
	}
	return distinct(words)
}

// Sought returns the beginnings of words that a search asks for, sorted and each
// once. Something is found if every one of them begins one of its [Words].
func Sought(search string) []string {
	var words []string
	for part := range strings.FieldsFuncSeq(search, func(r rune) bool { return !isLetter(r) }) {
		if len(words) == maxWords {
			break
		}
		kept, _ := letters(part)
		words = append(words, cut(kept))
	}
	return distinct(words)
}

// letters returns the letters and digits of a run in lower case, and where in them a
// word may begin.
func letters(run string) (kept []rune, starts []int) {
	apart, digits := true, false
	for _, r := range run {
		if !isLetter(r) {
			apart = true
			continue
		}
		// A mark, such as an accent of its own, belongs to what stands before it.
		digit := unicode.IsDigit(r) || unicode.IsMark(r) && digits
		if apart || digit != digits {
			starts = append(starts, len(kept))
		}
		apart, digits = false, digit
		kept = append(kept, unicode.ToLower(r))
	}
	return kept, starts
}

func isLetter(r rune) bool { return unicode.IsLetter(r) || unicode.IsNumber(r) || unicode.IsMark(r) }

func cut(word []rune) string { return string(word[:min(len(word), maxWordRunes)]) }

func distinct(words []string) []string {
	slices.Sort(words)
	return slices.Compact(words)
}
