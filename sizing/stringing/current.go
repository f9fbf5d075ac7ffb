package stringing

import (
	"strconv"

	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// currentFactor returns the factor from short-circuit current to maximum circuit current.
func (a *Array) currentFactor() *working.Term { return working.Number(a.Book.CurrentFactor.Value) }

func (a *Array) ratedBasis() bool { return a.Design.ShortCircuitBasis == design.BasisRated }

// maximumEach is one string's maximum circuit current: Isc with gain × 1.25.
func (a *Array) maximumEach(v *plane) *working.Term { return v.isc.Times(a.currentFactor()) }

// shortCircuitEach is the current of one string that is held against a tracker's
// short-circuit limit: offices and makers differ whether the 1.25 belongs there, so
// the design states the basis.
func (a *Array) shortCircuitEach(v *plane) *working.Term {
	if a.ratedBasis() {
		return v.isc
	}
	return a.maximumEach(v)
}

// MaxCurrent is a strings entry's maximum circuit current in A: Isc with gain × 1.25 × strings in parallel.
func (a *Array) MaxCurrent(i int) quantity.Exact {
	e := &a.wired[i]
	return a.maximumEach(&a.planes[e.plane]).Times(e.terms.Parallel).Value()
}

// Tracker is one tracker of an inverter unit that strings are on.
type Tracker struct {
	inverter, tracker int
	unit              int64
	entries           []*entry
}

// Trackers returns the trackers that strings are on, in the order of the design.
func (a *Array) Trackers() []Tracker {
	var found []Tracker
	for _, u := range a.Units() {
		for k := range a.Design.Inverters[u.inverter].Trackers {
			t := Tracker{inverter: u.inverter, tracker: k, unit: u.unit}
			for _, e := range u.entries {
				if e.tracker == k {
					t.entries = append(t.entries, e)
				}
			}
			if t.entries != nil {
				found = append(found, t)
			}
		}
	}
	return found
}

func (a *Array) about(t *Tracker) working.About {
	v := &a.Design.Inverters[t.inverter]
	return working.About{String: -1, Inverter: v.ID, Unit: t.unit, Tracker: v.Trackers[t.tracker].ID}
}

// sum adds one current of every string on the tracker: a line for the module's
// current on each plane, one for each entry, then their sum.
func (a *Array) sum(t *Tracker, symbol, total string, module, each func(*plane) *working.Term) (*working.Term, []*working.Term) {
	var steps []*working.Term
	var all *working.Term
	for _, e := range t.entries {
		v := &a.planes[e.plane]
		steps = append(steps, module(v))
		current := each(v).Times(e.terms.Parallel)
		if len(t.entries) > 1 {
			current = working.Named(symbol+strconv.Itoa(e.index+1), "A", current)
			steps = append(steps, current)
		}
		if all == nil {
			all = current
		} else {
			all = all.Plus(current)
		}
	}
	return working.Named(total, "A", all), steps
}

func shortCircuitOf(v *plane) *working.Term { return v.isc }

func operatingOf(v *plane) *working.Term { return v.imp }

// operatingCurrent judges that the strings' operating current does not exceed what
// the tracker can use; above it the inverter clips.
func (a *Array) operatingCurrent(t *Tracker) working.Check {
	k := &a.terms.Inverters[t.inverter].Trackers[t.tracker]
	total, steps := a.sum(t, "Imp", "ΣImp", operatingOf, operatingOf)
	rules := append(a.rulesFor(), rule(working.Caution, "", working.Exceeds(total, k.MaxInput)))
	if k.MaxInputPerInput != nil {
		for _, e := range t.entries {
			rules = append(rules, rule(working.Caution, "per-input-limit", working.Exceeds(a.planes[e.plane].imp, k.MaxInputPerInput)))
		}
	}
	return judged(working.Check{
		ID: "operating-current", About: a.about(t), Value: a.valueOf(total), Limit: a.valueOf(k.MaxInput), Unit: "A",
		Cites: a.cites.instructions,
		Steps: shown(append(steps, total)...),
	}, a.trackerDoubts(rules, t, "operating-current"))
}

func (a *Array) trackerDoubts(rules []working.Rule, t *Tracker, check string) []working.Rule {
	var seen []int
	for _, e := range t.entries {
		module := a.planes[e.plane].module
		if !containsInt(seen, module) {
			seen = append(seen, module)
			rules = a.doubtRules(rules, e.plane, check)
		}
	}
	return rules
}

func containsInt(list []int, n int) bool {
	for _, x := range list {
		if x == n {
			return true
		}
	}
	return false
}

// shortCircuit judges that the strings' short-circuit current does not exceed what
// the tracker's input withstands. A limit that is not stated is not confirmed; a
// stated limit for one input can still break the check.
func (a *Array) shortCircuit(t *Tracker) working.Check {
	k := &a.terms.Inverters[t.inverter].Trackers[t.tracker]
	total, steps := a.sum(t, "Isc", "ΣIsc", shortCircuitOf, a.shortCircuitEach)
	check := working.Check{
		ID: "short-circuit", About: a.about(t), Value: a.valueOf(total), Unit: "A",
		Cites: a.cites.current,
		Steps: shown(append(steps, total)...),
	}
	rules := a.rulesFor()
	if k.MaxShortCircuit == nil {
		rules = append(rules, rule(working.Unconfirmed, "short-circuit-limit-not-stated", nil))
	} else {
		check.Limit = a.valueOf(k.MaxShortCircuit)
		rules = append(rules, rule(working.Outside, "", working.Exceeds(total, k.MaxShortCircuit)))
		if a.ratedBasis() {
			maximum, more := a.sum(t, "Imax", "ΣImax", shortCircuitOf, a.maximumEach)
			rules = append(rules, rule(working.Caution, "rated-basis", working.Exceeds(maximum, k.MaxShortCircuit)))
			check.Steps = shown(append(append(append(more, maximum), steps...), total)...)
		}
	}
	if k.MaxShortCircuitPerInput != nil {
		for _, e := range t.entries {
			v := &a.planes[e.plane]
			rules = append(rules, rule(working.Outside, "per-input-limit", working.Exceeds(a.shortCircuitEach(v), k.MaxShortCircuitPerInput)))
			if a.ratedBasis() {
				rules = append(rules, rule(working.Caution, "rated-basis", working.Exceeds(a.maximumEach(v), k.MaxShortCircuitPerInput)))
			}
		}
	}
	return judged(check, a.trackerDoubts(rules, t, "short-circuit"))
}

// currentBasis judges whether the light on a bifacial module's back is in its
// current: by a gain, or by the highest marked Isc. NEC 2026 690.8(A)(1)(a) names the
// highest marked value, so there a missing one cannot be confirmed.
func (a *Array) currentBasis(t *Tracker) working.Check {
	worst := working.Caution
	if a.Book.HighestMarkedIsc {
		worst = working.Unconfirmed
	}
	rules := a.rulesFor()
	for _, e := range t.entries {
		v := &a.planes[e.plane]
		gain := a.terms.Planes[e.plane].Gain
		bifacial := v.terms.Bifacial != nil && v.terms.Bifacial.Value().Sign() > 0
		if bifacial && v.terms.IscMarked == nil && (gain == nil || gain.Value().IsZero()) && len(rules) == 0 {
			rules = append(rules, working.Rule{Verdict: worst, Reason: working.Reason{Code: "gain-not-stated", Pointer: v.terms.Pointer("bifaciality")}})
		}
	}
	return judged(working.Check{ID: "current-basis", About: a.about(t), Cites: a.cites.marked}, rules)
}
