package design

import (
	"cmp"
	"fmt"
	"slices"
	"strings"

	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

const askedKinds = "a number, a text, or an object of them"

// valueAsked reads the value that an answer was given for, in the form of [Asked].
func (w *walk) valueAsked(o *object) Asked {
	const name, label = "value_asked", "the value that was asked about"
	n, sound := o.find(name)
	if n == 0 {
		o.missing(name, askedKinds, "Enter "+label)
		return ""
	}
	asked, ok := w.appendAsked(nil, n, label)
	if !ok || !sound {
		return ""
	}
	return Asked(asked)
}

func (r *reader) appendAsked(dst []byte, n int32, label string) (asked []byte, ok bool) {
	switch v := &r.nodes[n]; v.kind {
	case isText:
		return working.AppendJSONString(dst, v.text), true
	case isNumber:
		x, err := quantity.Parse(v.text)
		if err != nil {
			r.tooLong(n, label)
			return dst, false
		}
		return appendNumber(dst, x), true
	case isObject:
		ok = r.distinct(n)
		var members []int32
		for i := v.first; i != 0; i = r.nodes[i].next {
			members = append(members, i)
		}
		slices.SortStableFunc(members, func(a, b int32) int { return cmp.Compare(r.nodes[a].name, r.nodes[b].name) })
		dst = append(dst, '{')
		for k, i := range members {
			if k > 0 {
				dst = append(dst, ',')
			}
			dst = append(working.AppendJSONString(dst, r.nodes[i].name), ':')
			var memberOK bool
			dst, memberOK = r.appendAsked(dst, i, label)
			ok = ok && memberOK
		}
		return append(dst, '}'), ok
	}
	r.wrongKind(n, label, askedKinds)
	return dst, false
}

// distinct records the names of an object with free names that it has twice, or
// twice but for their case, and reports whether there are none.
func (r *reader) distinct(n int32) bool {
	ok := true
	seen := make(map[string]string)
	for i := r.nodes[n].first; i != 0; i = r.nodes[i].next {
		name := r.nodes[i].name
		folded := strings.ToLower(name)
		first, taken := seen[folded]
		switch {
		case !taken:
			seen[folded] = name
			continue
		case first == name:
			r.again(i, name)
		default:
			r.faultAt(i, "the field "+quote(name), "names that differ in more than case",
				fmt.Sprintf("The fields %s and %s differ only in case; keep one.", quote(first), quote(name)))
		}
		ok = false
	}
	return ok
}
