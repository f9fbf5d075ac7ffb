package stringing

import (
	"strconv"

	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// backFeed judges what can flow backwards into one string of an entry when it
// fails: the maximum current of every other string on the tracker, and what the
// inverter feeds back, against the module's maximum series fuse rating. Where that
// is exceeded each string needs an overcurrent device of at least 1.5625 × Isc and
// at most the module's rating. NEC 690.9(A), (B); IEC 62548-1. The conductor's side
// of the same test is not judged here.
func (a *Array) backFeed(e *entry, t *Tracker) working.Check {
	v := &a.planes[e.plane]
	k := &a.terms.Inverters[t.inverter].Trackers[t.tracker]
	sum, steps := a.backFeedSum(e, t)
	check := working.Check{
		ID: "back-feed", About: aboutString(e), Value: a.valueOf(sum), Unit: "A",
		Cites: a.cites.backFeed,
	}
	limit := v.terms.MaxSeriesFuse
	least := working.Named("Ifuse,min", "A", working.Number(a.Book.FuseFactor.Value).Times(v.isc))
	check.Steps = shown(append(append([]*working.Term{v.isc, least}, steps...), sum)...)

	rules := a.rulesFor()
	if limit == nil {
		rules = append(rules, rule(working.Unconfirmed, "series-fuse-not-stated", working.Exceeds(sum, working.Whole(0))))
	} else {
		check.Limit = a.valueOf(limit)
		required := working.Exceeds(sum, limit)
		if k.StringFuse != nil {
			rules = append(rules,
				both(working.Outside, "string-fuse-too-small", required, working.Exceeds(least, k.StringFuse)),
				both(working.Outside, "string-fuse-above-module", required, working.Exceeds(k.StringFuse, limit)))
		} else {
			rules = append(rules,
				rule(working.Unconfirmed, "fuse-required-none-stated", required),
				both(working.Outside, "no-standard-fuse", required, a.noRating(least, limit)))
		}
	}
	check = judged(check, a.trackerDoubts(rules, t, check.ID)) // it rests on the other strings' modules too
	if sum.Value().IsZero() {
		check.Reasons = append(check.Reasons, working.Reason{Code: "not-needed"})
	}
	return check
}

// backFeedSum returns the current that can flow backwards into one string of the entry.
func (a *Array) backFeedSum(e *entry, t *Tracker) (*working.Term, []*working.Term) {
	var steps []*working.Term
	var all *working.Term
	add := func(x *working.Term) {
		if all == nil {
			all = x
		} else {
			all = all.Plus(x)
		}
	}
	for _, other := range t.entries {
		v := &a.planes[other.plane]
		steps = append(steps, v.isc)
		strings := other.terms.Parallel
		if other == e {
			strings = strings.Minus(working.Whole(1))
		}
		add(a.maximumEach(v).Times(strings))
	}
	if back := a.terms.Inverters[t.inverter].BackFeed; back != nil {
		add(back)
	}
	return working.Named("Iback-feed", "A", all), steps
}

// noRating returns the condition that no standard rating lies between least and
// most. The staircase of ratings has one closed form for what moves its lower end,
// the largest rating that still fits, and one for its upper end.
func (a *Array) noRating(least, most *working.Term) *working.Condition {
	smallest, okSmallest := a.Book.SmallestRatingFrom(least.Value())
	largest, okLargest := a.Book.LargestRatingTo(most.Value())
	none := !okSmallest || most.Value().Less(smallest)
	c := working.Known(none)
	if okLargest {
		c.Join(working.Exceeds(least, working.Number(largest)))
	}
	if okSmallest {
		c.Join(working.Exceeds(working.Number(smallest), most))
	}
	return c
}

// unequalStrings judges whether parallel strings have one cold open-circuit
// voltage. Where they do not, what each contributes and what flows backwards is not
// known without their curves.
func (a *Array) unequalStrings(t *Tracker) working.Check {
	check := working.Check{ID: "unequal-strings", About: a.about(t), Unit: "V", Cites: a.cites.instructions}
	rules := a.rulesFor()
	first := t.entries[0]
	highest, lowest := first, first
	for _, e := range t.entries[1:] {
		if highest.vocCold.Value().Less(e.vocCold.Value()) {
			highest = e
		}
		if e.vocCold.Value().Less(lowest.vocCold.Value()) {
			lowest = e
		}
		rules = append(rules,
			rule(working.Unconfirmed, "strings-unequal", working.Exceeds(first.vocCold, e.vocCold)),
			rule(working.Unconfirmed, "strings-unequal", working.Exceeds(e.vocCold, first.vocCold)))
	}
	for i := range rules {
		rules[i].Broken[0].Without(a.terms.ColdestInput) // both sides move with it, by the table in steps
	}
	if len(t.entries) > 1 {
		high, low := highest.numberedCold(), lowest.numberedCold()
		difference := working.Named("ΔVcold", "V", high.Minus(low))
		check.Value, check.Limit = a.valueOf(difference), new(quantity.Int(0))
		check.Steps = shown(high, low, difference)
	}
	return judged(check, rules)
}

// numberedCold returns the entry's cold voltage under a symbol of its own.
func (e *entry) numberedCold() *working.Term {
	return working.Named("Vcold"+strconv.Itoa(e.index+1), "V", e.vocCold.Formula())
}
