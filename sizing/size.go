// Package sizing is the front door of the engine: it orders the rules of
// sizing/stringing over a design and puts their results together. It has no
// arithmetic of its own, no clock, no input or output, and no state: the same
// design gives the same result, to the byte.
package sizing

import (
	"rimeline/sizing/design"
	"rimeline/sizing/stringing"
	"rimeline/sizing/working"
)

// Size judges a design that has passed the reader ([design.Read]).
func Size(d *design.Design) *Result {
	a := stringing.NewArray(d)
	r := &Result{Limits: limits(a), Questions: a.Questions()}
	if len(d.Strings) == 0 {
		r.Checks = []working.Check{nothingStrung()}
		r.Verdict = working.Unconfirmed
		return r
	}
	r.Strings = strungRows(a)
	trackers, units := a.Trackers(), a.Units()
	r.Checks = make([]working.Check, 0, 10*len(d.Strings)+6*len(trackers)+len(d.Planes)+len(units))

	// A check about a tracker, plane or unit counts for every strings entry on it.
	judge := func(checks []working.Check, entries ...int) {
		r.Checks = append(r.Checks, checks...)
		for _, c := range checks {
			r.Verdict = max(r.Verdict, c.Verdict)
			for _, i := range entries {
				r.Strings[i].Verdict = max(r.Strings[i].Verdict, c.Verdict)
			}
		}
	}
	for i := range d.Strings {
		judge(a.StringChecks(i, trackerOf(trackers, i)), i)
	}
	for i := range trackers {
		judge(a.TrackerChecks(&trackers[i]), trackers[i].Strings()...)
	}
	for p := range d.Planes {
		var on []int
		for i := range d.Strings {
			if a.PlaneOf(i) == p {
				on = append(on, i)
			}
		}
		judge([]working.Check{a.Places(p)}, on...)
	}
	for i := range units {
		if c, ok := a.DCPower(&units[i]); ok {
			judge([]working.Check{c}, units[i].Strings()...)
		}
	}
	return r
}

// nothingStrung is the one check of a design without strings: what is not wired is not confirmed.
func nothingStrung() working.Check {
	return working.Check{
		ID: "nothing-strung", About: working.About{String: -1}, Verdict: working.Unconfirmed,
		Reasons: []working.Reason{{Code: "nothing-strung", Pointer: "/strings"}},
	}
}

func limits(a *stringing.Array) []Limit {
	var rows []Limit
	for p := range a.Design.Planes {
		for v := range a.Design.Inverters {
			for k := range a.Design.Inverters[v].Trackers {
				rows = append(rows, a.Limit(p, v, k))
			}
		}
	}
	return rows
}

func strungRows(a *stringing.Array) []StringResult {
	rows := make([]StringResult, len(a.Design.Strings))
	for i, s := range a.Design.Strings {
		v := a.Voltages(i)
		rows[i] = StringResult{
			Inverter: s.Inverter, Unit: s.Unit, Tracker: s.Tracker, Plane: s.Plane,
			ModulesInSeries: s.ModulesInSeries, StringsInParallel: s.StringsInParallel,
			VocColdV: v.VocCold, VocSTCV: v.VocSTC, VocHotV: v.VocHot, VmpSTCV: v.VmpSTC, VmpHotV: v.VmpHot, MaxCurrentA: a.MaxCurrent(i),
		}
	}
	return rows
}

func trackerOf(trackers []stringing.Tracker, entry int) *stringing.Tracker {
	for i := range trackers {
		for _, s := range trackers[i].Strings() {
			if s == entry {
				return &trackers[i]
			}
		}
	}
	panic("sizing: a strings entry is on no tracker, which the reader refuses")
}
