package server

import (
	"cmp"
	"fmt"
	"maps"
	"slices"
	"strconv"
	"strings"

	"rimeline/server/form"
	"rimeline/sizing/quantity"
	"rimeline/views"
)

// shownChanges is how many differences are listed without being asked for.
const shownChanges = 12

// formChanges tells what differs between two forms, field by field, in the order of
// the page. Neither needs to be a whole design, so texts are compared and not values;
// but a number that is only written in another way does not differ.
func formChanges(before, after *form.Form) []views.ChangeGroup {
	was, now := newPageBuilder(judged{form: before}, marking{}), newPageBuilder(judged{form: after}, marking{})
	var groups []views.ChangeGroup
	for _, pointer := range inFormOrder(fieldsOf(before), fieldsOf(after)) {
		a, b := was.stands(pointer), now.stands(pointer)
		if a == b || sameNumber(before, after, pointer) {
			continue
		}
		side := now
		if b == "" {
			side = was
		}
		of, name := side.called(pointer)
		if n := len(groups); n == 0 || groups[n-1].Of != of {
			groups = append(groups, views.ChangeGroup{Of: of})
		}
		last := &groups[len(groups)-1]
		last.Rows = append(last.Rows, views.Change{Name: name, Before: a, After: b})
	}
	return groups
}

// changesIn counts the differences.
func changesIn(groups []views.ChangeGroup) (n int) {
	for _, g := range groups {
		n += len(g.Rows)
	}
	return n
}

// fieldsOf returns the pointers of the fields that hold something. A unit alone, as
// the form begins with some, says nothing; ids that are not shown neither.
func fieldsOf(f *form.Form) map[string]bool {
	fields := map[string]bool{}
	for _, name := range f.Names("/") {
		pointer := name
		if at := form.FieldOf(name); at != "" {
			pointer = at
		}
		blank := form.Units(pointer) != nil && strings.TrimSpace(f.Text(pointer+"/value")) == ""
		hidden := strings.HasSuffix(pointer, "/id") && !strings.HasPrefix(pointer, "/planes/")
		if !blank && !hidden && !strings.HasPrefix(pointer, "/answers/") {
			fields[pointer] = true
		}
	}
	for k := range f.Len("/answers") {
		fields[pointerOf("/answers", k)+"/reason"] = true
	}
	return fields
}

// inFormOrder returns the pointers of both sets in the order of the page.
func inFormOrder(a, b map[string]bool) []string {
	all := maps.Clone(a)
	maps.Copy(all, b)
	rank := map[string]int{}
	for i, name := range form.AllNames() {
		rank[strings.TrimSuffix(strings.TrimSuffix(name, "/value"), "/unit")] = i
	}
	type place struct {
		pointer string
		section int
		entries []int // numbers of the entries it lies in
		field   int
	}
	var places []place
	for pointer := range all {
		p := place{pointer: pointer, section: sectionOf(pointer), field: len(rank)}
		var general []string
		for segment := range strings.SplitSeq(strings.TrimPrefix(pointer, "/"), "/") {
			if k, err := strconv.Atoi(segment); err == nil {
				p.entries, segment = append(p.entries, k), "*"
			}
			general = append(general, segment)
		}
		if n, ok := rank["/"+strings.Join(general, "/")]; ok {
			p.field = n
		}
		places = append(places, p)
	}
	slices.SortFunc(places, func(a, b place) int {
		return cmp.Or(a.section-b.section, slices.Compare(a.entries, b.entries), a.field-b.field, strings.Compare(a.pointer, b.pointer))
	})
	ordered := make([]string, len(places))
	for i, p := range places {
		ordered[i] = p.pointer
	}
	return ordered
}

// stands returns what a field holds, as the page shows it.
func (b *pageBuilder) stands(pointer string) string {
	if form.Units(pointer) == nil {
		text := strings.TrimSpace(b.form.Text(pointer))
		if kind := form.KindOf(pointer); kind == form.Number || kind == form.Count {
			text = trueMinus(text)
		}
		if words := choiceWords(lastSegment(pointer), text); words != "" {
			return words
		}
		if unit := form.UnitOf(pointer); unit != "" && text != "" && !strings.HasSuffix(text, unit) {
			text += "\u00a0" + unit
		}
		return text
	}
	value, unit := strings.TrimSpace(b.form.Text(pointer+"/value")), strings.TrimSpace(b.form.Text(pointer+"/unit"))
	if value != "" && unit != "" && !strings.HasSuffix(value, unit) {
		value += "\u00a0" + unit
	}
	return trueMinus(value)
}

// sameNumber reports whether a field holds the same number of the same unit in both
// forms.
func sameNumber(before, after *form.Form, pointer string) bool {
	at := pointer
	if form.Units(pointer) != nil {
		at += "/value"
		if strings.TrimSpace(before.Text(pointer+"/unit")) != strings.TrimSpace(after.Text(pointer+"/unit")) {
			return false
		}
	} else if kind := form.KindOf(pointer); kind != form.Number && kind != form.Count {
		return false
	}
	a, errA := quantity.Typed(before.Text(at))
	b, errB := quantity.Typed(after.Text(at))
	return errA == nil && errB == nil && a.Unit == b.Unit && a.Value.Cmp(b.Value) == 0
}

// called names a field: the part of the form that it lies in, and its own name there.
func (b *pageBuilder) called(pointer string) (of, name string) {
	switch {
	case strings.HasPrefix(pointer, "/sources/"):
		return "Where values come from", upperFirst(b.place(form.SourceOf(pointer)))
	case strings.HasPrefix(pointer, "/answers/"):
		at := b.form.Text(strings.TrimSuffix(pointer, "/reason") + "/pointer")
		return "Reasons given", upperFirst(b.place(at))
	}
	if of = b.owner(pointer); of == "" {
		of = "The design"
	}
	if strings.HasPrefix(pointer, "/strings/") && b.form.Len("/strings") == 1 {
		of = "Strings"
	}
	if strings.HasPrefix(pointer, "/other_limits/") {
		for _, q := range otherLimitInquiries {
			if q.name == lastSegment(pointer) {
				return of, q.label
			}
		}
	}
	name = labels[lastSegment(pointer)]
	if name == "" {
		name = pointer
	}
	return of, upperFirst(name)
}

// choiceWords returns the words of what is chosen from a list, "" for anything else.
func choiceWords(field, value string) string {
	if value == "" {
		return ""
	}
	for _, all := range [][]inquiry{siteInquiries, codeInquiries, moduleInquiries, inverterMore} {
		for _, q := range all {
			if q.name != field {
				continue
			}
			for _, c := range q.choices {
				if c[0] == value {
					return c[1]
				}
			}
		}
	}
	return ""
}

// trueMinus writes the sign of a number as pages do.
func trueMinus(typed string) string {
	if rest, ok := strings.CutPrefix(typed, "-"); ok {
		return "−" + rest
	}
	return typed
}

func upperFirst(s string) string {
	if s == "" {
		return s
	}
	return strings.ToUpper(s[:1]) + s[1:]
}

// differences says how many inputs differ.
func differences(n int) string {
	if n == 1 {
		return "1 input differs"
	}
	return fmt.Sprintf("%d inputs differ", n)
}
