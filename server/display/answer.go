package display

import (
	"slices"

	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/views"
)

// NewAnswer makes the answer panel of a design.
func NewAnswer(d *design.Design, r *sizing.Result) views.Answer {
	c := newComposer(d, r)
	fittings := c.fittings()
	a := views.Answer{
		Verdict:    verdict(r.Verdict),
		Headline:   c.headline(),
		Tally:      c.tally(),
		Charts:     c.charts(fittings),
		Kinds:      worstFirst(byKind(c.tell())),
		Questions:  c.questions(),
		Coldest:    coldest(d),
		Cautions:   answerCautions,
		NotChecked: notChecked(d),
	}
	for _, f := range fittings {
		a.Fits = append(a.Fits, f.fit)
	}
	return a
}

// questions tells the open questions.
func (c *composer) questions() []views.Question {
	var out []views.Question
	for _, q := range c.r.Questions {
		w := views.Question{Pointer: q.Pointer, Field: capital(c.call(q.Pointer)), Asked: q.Asked, Why: sentence(q.Why)}
		if q.Unsafe {
			w.Effect = "Until it is answered these cannot be confirmed: " + list(titles(q.UnsafeFor)) + "."
		}
		out = append(out, w)
	}
	return out
}

// sentence gives a clause a capital and a full stop.
func sentence(s string) string {
	if s == "" {
		return ""
	}
	s = capital(s)
	if last := s[len(s)-1]; last != '.' && last != '?' {
		s += "."
	}
	return s
}

// titles names kinds of check as they are named in the list, in the order of the method.
func titles(ids []string) []string {
	var places []int
	for _, id := range ids {
		_, at := kindOf(id)
		places = append(places, at)
	}
	slices.Sort(places)
	var words []string
	for _, at := range slices.Compact(places) {
		if at < len(kinds) {
			words = append(words, lowered(kinds[at].title))
		}
	}
	return words
}

// lowered returns a title as it stands inside a sentence.
func lowered(title string) string {
	if len(title) > 1 && title[1] >= 'A' && title[1] <= 'Z' {
		return title // DC power
	}
	return string(title[0]|0x20) + title[1:]
}
