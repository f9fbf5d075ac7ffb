package store

import (
	"encoding/json"
	"fmt"
	"maps"
	"math/big"
	"net/url"
	"slices"
	"strings"
	"unicode/utf8"

	"rimeline/server/record"
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// clean returns text that a column can hold: in place of what it cannot, U+0000 and
// what is no UTF-8, stands the sign for a character that is not known. Documents and
// drafts are kept as bytes and need none of this.
func clean[T ~string](text T) string {
	return strings.ReplaceAll(strings.ToValidUTF8(string(text), "\uFFFD"), "\x00", "\uFFFD")
}

// maxShown is how many characters of a text a list shows and an index holds; an
// index of Postgres does not take much more than 2700 bytes.
const maxShown = 200

// short returns clean text that a list can show and an index can hold.
func short(text string) string {
	text = clean(text)
	if utf8.RuneCountInString(text) <= maxShown {
		return text
	}
	runes := []rune(text)[:maxShown]
	runes[maxShown-1] = '…'
	return string(runes)
}

// sought returns how equipment of this maker and model is looked for: capitals and
// spaces are written one way today and another tomorrow.
func sought(maker, model string) string {
	fold := func(s string) string { return short(strings.ToLower(strings.Join(strings.Fields(s), " "))) }
	return fold(maker) + "\n" + fold(model)
}

// encodeFields writes texts under names as one text that any column can hold. Every
// byte of them comes back, also what is no character.
func encodeFields(fields map[string]string) string {
	var b strings.Builder
	for i, name := range slices.Sorted(maps.Keys(fields)) {
		if i > 0 {
			b.WriteByte('&')
		}
		b.WriteString(url.QueryEscape(name))
		b.WriteByte('=')
		b.WriteString(url.QueryEscape(fields[name]))
	}
	return b.String()
}

// decodeFields reads what encodeFields wrote. (url.ParseQuery refuses more than some
// thousand fields.)
func decodeFields(encoded string) (map[string]string, error) {
	fields := map[string]string{}
	if encoded == "" {
		return fields, nil
	}
	for field := range strings.SplitSeq(encoded, "&") {
		name, text, _ := strings.Cut(field, "=")
		name, err := url.QueryUnescape(name)
		if err != nil {
			return nil, fmt.Errorf("a saved field's name: %w", err)
		}
		if fields[name], err = url.QueryUnescape(text); err != nil {
			return nil, fmt.Errorf("the saved text of %q: %w", name, err)
		}
	}
	return fields, nil
}

// keptAnswer is an answer as equipment keeps it.
type keptAnswer struct {
	Pointer    string       `json:"pointer"`
	ValueAsked design.Asked `json:"value_asked"` // the JSON as a text, so that every byte of it comes back
	Reason     string       `json:"reason"`
}

func encodeAnswers(answers []design.Answer) []byte {
	list := make([]keptAnswer, len(answers))
	for i, a := range answers {
		list[i] = keptAnswer(a)
	}
	text, err := json.Marshal(list)
	if err != nil {
		panic(err) // it is made of texts
	}
	return text
}

func decodeAnswers(text []byte) ([]design.Answer, error) {
	var list []keptAnswer
	if err := json.Unmarshal(text, &list); err != nil {
		return nil, fmt.Errorf("saved answers: %w", err)
	}
	var answers []design.Answer
	for _, a := range list {
		answers = append(answers, design.Answer(a))
	}
	return answers, nil
}

// unknownHeadroom is how headroom that is not known is kept: below every number,
// since it is the worst to know least of.
const unknownHeadroom = "-Infinity"

// encodeHeadroom writes headroom as a number of the database. A third of a degree is
// cut, downwards, so that it never looks safer than it is.
func encodeHeadroom(headroomC *quantity.Exact) string {
	if headroomC == nil {
		return unknownHeadroom
	}
	text, _ := headroomC.Fixed(9, quantity.Down)
	return text
}

func decodeHeadroom(text string) (*quantity.Exact, error) {
	if text == unknownHeadroom {
		return nil, nil
	}
	if x, err := quantity.Parse(text); err == nil {
		return &x, nil
	}
	r, ok := new(big.Rat).SetString(text) // more digits than people write
	if !ok {
		return nil, fmt.Errorf("a saved headroom of %q", text)
	}
	return new(quantity.FromRat(r)), nil
}

func decodeVerdict(word string) (working.Verdict, error) {
	for v := working.Within; v <= working.Outside; v++ {
		if v.String() == word {
			return v, nil
		}
	}
	return working.Outside, fmt.Errorf("a saved verdict of %q", word)
}

// tsvector writes words as the database takes them; [record.Words] are letters and
// digits only, so that none needs more than its quotes.
func tsvector(words []string) string { return quoted(words, "", " ") }

// tsquery asks for texts of whose words each of these begins one.
func tsquery(words []string) string { return quoted(words, ":*", " & ") }

func quoted(words []string, behind, between string) string {
	var b strings.Builder
	for i, w := range words {
		if i > 0 {
			b.WriteString(between)
		}
		b.WriteString("'" + w + "'" + behind)
	}
	return b.String()
}

// words are those by which a design is found.
func words(f *record.Frozen) string {
	texts := []string{f.Title, f.Site}
	for _, u := range f.Uses {
		texts = append(texts, u.Maker, u.Model)
	}
	return tsvector(record.Words(texts...))
}
