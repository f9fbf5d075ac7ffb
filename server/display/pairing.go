package display

import (
	"slices"
	"strconv"
	"strings"

	"rimeline/sizing/design"
	"rimeline/sizing/working"
)

// pair is a part of two designs by its places in their lists, -1 where one does not
// have it.
type pair struct{ before, after int }

// pairing says which part of one design is which of another. Parts go by their ids;
// those whose ids are on one side only go by their order, since a plane that is
// renamed is still that plane.
type pairing struct {
	before, after              *design.Design
	modules, inverters, planes []pair
	others, strings            []pair
	trackers                   [][]pair // by place in inverters
}

func pairUp(before, after *design.Design) *pairing {
	p := &pairing{before: before, after: after}
	p.modules = paired(len(before.Modules), len(after.Modules), func(i, j int) bool { return before.Modules[i].ID == after.Modules[j].ID })
	p.inverters = paired(len(before.Inverters), len(after.Inverters), func(i, j int) bool { return before.Inverters[i].ID == after.Inverters[j].ID })
	p.planes = paired(len(before.Planes), len(after.Planes), func(i, j int) bool { return before.Planes[i].ID == after.Planes[j].ID })
	p.others = paired(len(before.OtherLimits), len(after.OtherLimits), func(i, j int) bool { return before.OtherLimits[i].Name == after.OtherLimits[j].Name })
	p.trackers = make([][]pair, len(p.inverters))
	for k, v := range p.inverters {
		if v.before < 0 || v.after < 0 {
			p.trackers[k] = oneSided(v, before, after)
			continue
		}
		b, a := before.Inverters[v.before].Trackers, after.Inverters[v.after].Trackers
		p.trackers[k] = paired(len(b), len(a), func(i, j int) bool { return b[i].ID == a[j].ID })
	}
	place := func(i, j int) bool {
		b, a := &before.Strings[i], &after.Strings[j]
		inverter, tracker := p.terminalAfter(b.Inverter, b.Tracker)
		return inverter == a.Inverter && tracker == a.Tracker && b.Unit == a.Unit && p.planeAfter(b.Plane) == a.Plane
	}
	p.strings = paired(len(before.Strings), len(after.Strings), func(i, j int) bool {
		b, a := &before.Strings[i], &after.Strings[j]
		return place(i, j) && b.ModulesInSeries == a.ModulesInSeries && b.StringsInParallel == a.StringsInParallel
	}, place)
	return p
}

// paired pairs two lists: by the first rule what it holds for, of the rest by the
// next one, and what then remains by its order. Pairs are in the order of the list
// after; what is only in the list before comes last.
func paired(before, after int, rules ...func(i, j int) bool) []pair {
	of := make([]int, after) // place before, -1 while there is none
	for j := range of {
		of[j] = -1
	}
	taken := make([]bool, before)
	for _, same := range append(rules, func(int, int) bool { return true }) {
		for j := range of {
			for i := 0; i < before && of[j] < 0; i++ {
				if !taken[i] && same(i, j) {
					of[j], taken[i] = i, true
				}
			}
		}
	}
	pairs := make([]pair, 0, max(before, after))
	for j, i := range of {
		pairs = append(pairs, pair{i, j})
	}
	for i := range taken {
		if !taken[i] {
			pairs = append(pairs, pair{i, -1})
		}
	}
	return pairs
}

// oneSided is the trackers of an inverter that one design does not have.
func oneSided(v pair, before, after *design.Design) []pair {
	var all []pair
	if v.before >= 0 {
		for i := range before.Inverters[v.before].Trackers {
			all = append(all, pair{i, -1})
		}
		return all
	}
	for j := range after.Inverters[v.after].Trackers {
		all = append(all, pair{-1, j})
	}
	return all
}

// terminalAfter returns what a tracker of the design before is called in the one
// after, "" where it is no longer there.
func (p *pairing) terminalAfter(inverter, tracker string) (string, string) {
	for k, v := range p.inverters {
		if v.before < 0 || v.after < 0 || p.before.Inverters[v.before].ID != inverter {
			continue
		}
		b, a := &p.before.Inverters[v.before], &p.after.Inverters[v.after]
		for _, t := range p.trackers[k] {
			if t.before >= 0 && t.after >= 0 && b.Trackers[t.before].ID == tracker {
				return a.ID, a.Trackers[t.after].ID
			}
		}
		return a.ID, ""
	}
	return "", ""
}

func (p *pairing) planeAfter(id string) string {
	for _, v := range p.planes {
		if v.before >= 0 && v.after >= 0 && p.before.Planes[v.before].ID == id {
			return p.after.Planes[v.after].ID
		}
	}
	return ""
}

// aboutAfter returns what a check of the design before would be about in the one
// after; ok is false where that has no such part.
func (p *pairing) aboutAfter(a working.About) (about working.About, ok bool) {
	about = working.About{String: -1, Unit: a.Unit}
	switch {
	case a.String >= 0:
		k := slices.IndexFunc(p.strings, func(s pair) bool { return s.before == a.String })
		if k < 0 || p.strings[k].after < 0 {
			return about, false
		}
		about.String = p.strings[k].after
	case a.Plane != "":
		about.Plane = p.planeAfter(a.Plane)
		return about, about.Plane != ""
	case a.Tracker != "":
		about.Inverter, about.Tracker = p.terminalAfter(a.Inverter, a.Tracker)
		return about, about.Tracker != ""
	case a.Inverter != "":
		about.Inverter, _ = p.terminalAfter(a.Inverter, "")
		return about, about.Inverter != ""
	}
	return about, true
}

// pointerAfter returns where what is at a pointer of the design before is in the one
// after; ok is false where that has no such part.
func (p *pairing) pointerAfter(pointer string) (after string, ok bool) {
	for list, pairs := range map[string][]pair{
		"/modules/": p.modules, "/inverters/": p.inverters, "/planes/": p.planes, "/other_limits/": p.others, "/strings/": p.strings,
	} {
		k, rest, found := entryOf(pointer, list)
		if !found {
			continue
		}
		at := slices.IndexFunc(pairs, func(q pair) bool { return q.before == k })
		if at < 0 || pairs[at].after < 0 {
			return "", false
		}
		after = list + strconv.Itoa(pairs[at].after)
		t, below, isTracker := entryOf(rest, "/trackers/")
		if list != "/inverters/" || !isTracker {
			return after + rest, true
		}
		j := slices.IndexFunc(p.trackers[at], func(q pair) bool { return q.before == t })
		if j < 0 || p.trackers[at][j].after < 0 {
			return "", false
		}
		return after + "/trackers/" + strconv.Itoa(p.trackers[at][j].after) + below, true
	}
	return pointer, true
}

// entryOf splits a pointer into an entry of a list: "/modules/1/voc_v" is entry 1 of
// "/modules/", and "/voc_v" below it.
func entryOf(pointer, list string) (k int, rest string, ok bool) {
	below, ok := strings.CutPrefix(pointer, list)
	if !ok {
		return 0, "", false
	}
	segment, rest := below, ""
	if i := strings.IndexByte(below, '/'); i >= 0 {
		segment, rest = below[:i], below[i:]
	}
	k, err := strconv.Atoi(segment)
	return k, rest, err == nil
}
