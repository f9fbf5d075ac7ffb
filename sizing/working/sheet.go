package working

import (
	"strings"

	"rimeline/sizing/quantity"
)

// Sheet is what the terms of one piece of work are written on. It makes them, their
// lines and their conditions in a few large pieces of memory, since a design has
// hundreds of each and all of them live as long as its result. The zero Sheet is
// ready; one goroutine writes on it at a time. A nil Sheet makes each thing alone.
type Sheet struct {
	terms      []Term
	labels     []label
	steps      []Step
	conditions []Condition
	roots      []root
	exacts     []quantity.Exact
	text       strings.Builder
	inputs     int // how many terms of inputs were made
}

// next returns a pointer to a zero element at the end of a slab, in a new slab of
// the given size where the last one is full. What was made before stays where it is.
func next[T any](slab *[]T, size int) *T {
	n := len(*slab)
	if n == cap(*slab) {
		*slab, n = make([]T, 0, size), 0
	}
	*slab = (*slab)[:n+1]
	return &(*slab)[n]
}

func (s *Sheet) term() *Term {
	if s == nil {
		return new(Term)
	}
	return next(&s.terms, 128)
}

func (s *Sheet) label(l label) *label {
	if s == nil {
		return &l
	}
	kept := next(&s.labels, 64)
	*kept = l
	return kept
}

func (s *Sheet) step() *Step {
	if s == nil {
		return new(Step)
	}
	return next(&s.steps, 32)
}

func (s *Sheet) condition() *Condition {
	if s == nil {
		return new(Condition)
	}
	return next(&s.conditions, 32)
}

// Keep returns a pointer to a copy of x.
func (s *Sheet) Keep(x quantity.Exact) *quantity.Exact {
	if s == nil {
		return &x
	}
	kept := next(&s.exacts, 64)
	*kept = x
	return kept
}

// rootsFor returns an empty slice with room for n roots.
func (s *Sheet) rootsFor(n int) []root {
	if s == nil {
		return make([]root, 0, n)
	}
	if cap(s.roots)-len(s.roots) < n {
		s.roots = make([]root, 0, max(n, 128))
	}
	start := len(s.roots)
	s.roots = s.roots[:start+n]
	return s.roots[start : start : start+n]
}

// keep returns text as a string.
func (s *Sheet) keep(text []byte) string {
	if s == nil {
		return string(text)
	}
	if s.text.Cap()-s.text.Len() < len(text) {
		s.text = strings.Builder{}
		s.text.Grow(max(4096, len(text)))
	}
	start := s.text.Len()
	s.text.Write(text)
	return s.text.String()[start:]
}
