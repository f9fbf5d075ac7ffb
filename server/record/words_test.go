package record

import (
	"slices"
	"strings"
	"testing"
	"unicode/utf8"
)

func TestWords(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"", ""},
		{" - / ", ""},
		{"House", "house"},
		{"RL-430M", "430m m rl430m"},
		{"rl430m", "430m m rl430m"},
		{"Miller/Jones, west", "jones millerjones west"},
		{"O'Neill's", "neills oneills s"},
		{"ÄRZTEHAUS Größe", "größe ärztehaus"},
		{"e\u0301cole 2\u0301b", "2\u0301b b e\u0301cole"}, // an accent of its own stays with its letter
		{"the the THE", "the"},
		{"a\x00b \xff", "ab b"},
		{"東京 屋根", "屋根 東京"},
		{"12.5 kW", "125 5 kw"},
	} {
		if got := strings.Join(Words(c.text), " "); got != c.want {
			t.Errorf("Words(%q) = %q, want %q", c.text, got, c.want)
		}
	}
	if got := strings.Join(Words("House", "", "Acme X-1"), " "); got != "1 acme house x1" {
		t.Errorf("of several texts: %q", got)
	}
}

func TestWords_Bounded(t *testing.T) {
	for _, text := range []string{strings.Repeat("a1", 1<<19), strings.Repeat("ab cd", 1<<18), strings.Repeat("𝔄", 1<<18)} {
		words := Words(text)
		if len(words) > maxWords {
			t.Errorf("%d words", len(words))
		}
		for _, w := range words {
			if utf8.RuneCountInString(w) > maxWordRunes {
				t.Errorf("a word of %d characters", utf8.RuneCountInString(w))
			}
		}
	}
}

// FuzzSought: a text is found by any part of it that begins where a word does, and
// by all of it; and no word holds what a database could not.
func FuzzSought(f *testing.F) {
	f.Add("RL-430M", 2)
	f.Add("Miller/Jones, west wing 12b", 9)
	f.Add("e\u0301cole \x00\xff '&|!", 1)
	f.Fuzz(func(t *testing.T, text string, n int) {
		words := Words(text)
		if len(words) == maxWords || len(text) > 1000 {
			return
		}
		for _, w := range slices.Concat(words, Sought(text)) {
			if w == "" || !utf8.ValidString(w) || strings.ContainsAny(w, "\x00'&|!:* \\") {
				t.Errorf("%q gives the word %q", text, w)
			}
		}
		if !findable(words, text) {
			t.Errorf("%q is not found by itself: %q lacks some of %q", text, words, Sought(text))
		}
		fields := strings.Fields(text)
		if len(fields) == 0 {
			return
		}
		field := []rune(strings.ToValidUTF8(fields[abs(n)%len(fields)], ""))
		if begin := field[:min(len(field), abs(n)%20)]; !findable(words, string(begin)) {
			t.Errorf("%q is not found by %q: %q lacks some of %q", text, string(begin), words, Sought(string(begin)))
		}
	})
}

func abs(n int) int {
	if n < 0 {
		n = -(n + 1)
	}
	return n
}

func findable(words []string, search string) bool {
	for _, begin := range Sought(search) {
		if !slices.ContainsFunc(words, func(w string) bool { return strings.HasPrefix(w, begin) }) {
			return false
		}
	}
	return true
}
