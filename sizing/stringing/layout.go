package stringing

import (
	"cmp"
	"slices"
	"strconv"

	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// inputs judges that no more strings are on a tracker than it has inputs.
func (a *Array) inputs(t *Tracker) working.Check {
	k := &a.terms.Inverters[t.inverter].Trackers[t.tracker]
	strings, lines := total("s", "", t.entries, func(e *entry) *working.Term { return e.terms.Parallel })
	return judged(working.Check{
		ID: "inputs", About: a.about(t), Value: a.valueOf(strings), Limit: a.valueOf(k.Inputs),
		Cites: a.cites.instructions, Steps: shown(lines...),
	}, []working.Rule{rule(working.Outside, "", working.Exceeds(strings, k.Inputs))})
}

// total adds a term of every entry, with a line for each where there are several;
// it is 0 where there is none. It returns the terms to show, the total last.
func total(symbol, unit string, entries []*entry, of func(*entry) *working.Term) (*working.Term, []*working.Term) {
	if len(entries) == 0 {
		none := working.Named("Σ"+symbol, unit, working.Whole(0))
		return none, []*working.Term{none}
	}
	var sum *working.Term
	var lines []*working.Term
	for _, e := range entries {
		part := of(e)
		if len(entries) > 1 {
			part = working.Named(symbol+strconv.Itoa(e.index+1), unit, part)
			lines = append(lines, part)
		}
		if sum == nil {
			sum = part
		} else {
			sum = sum.Plus(part)
		}
	}
	named := working.Named("Σ"+symbol, unit, sum)
	return named, append(lines, named)
}

// planesMixed judges whether the strings of a tracker lie on planes of one tilt and
// azimuth. Equal strings of different planes in parallel lose little, since their
// voltages stay close; someone must still decide.
func (a *Array) planesMixed(t *Tracker) working.Check {
	rules := a.rulesFor()
	first := t.entries[0].plane
	p := &a.Design.Planes[first]
	for _, e := range t.entries[1:] {
		if e.plane == first {
			continue
		}
		q := &a.Design.Planes[e.plane]
		switch {
		case p.TiltDeg == nil || p.AzimuthDeg == nil || q.TiltDeg == nil || q.AzimuthDeg == nil:
			rules = append(rules, rule(working.Unconfirmed, "angle-not-stated", nil))
		case !p.TiltDeg.Equal(*q.TiltDeg) || !sameAzimuth(*p.AzimuthDeg, *q.AzimuthDeg):
			rules = append(rules, rule(working.Caution, "planes-differ", nil))
		}
	}
	return judged(working.Check{ID: "planes-mixed", About: a.about(t), Cites: a.cites.instructions}, rules)
}

// sameAzimuth reports whether two azimuths are one direction: 0° and 360° are.
func sameAzimuth(a, b quantity.Exact) bool {
	return a.Sub(b).Quo(quantity.Int(360)).IsWhole()
}

// Places judges that a plane has a place for every module strung on it.
func (a *Array) Places(plane int) working.Check {
	var on []*entry
	for i := range a.wired {
		if a.wired[i].plane == plane {
			on = append(on, &a.wired[i])
		}
	}
	positions := a.terms.Planes[plane].Positions
	modules, lines := total("modules", "", on, func(e *entry) *working.Term { return e.terms.Series.Times(e.terms.Parallel) })
	left := working.Named("left over", "", positions.Minus(modules))
	check := judged(working.Check{
		ID: "places", About: working.About{String: -1, Plane: a.Design.Planes[plane].ID},
		Value: a.valueOf(modules), Limit: a.valueOf(positions), Steps: shown(append([]*working.Term{left}, lines...)...),
	}, []working.Rule{rule(working.Outside, "", working.Exceeds(modules, positions))})
	if left.Value().Sign() > 0 {
		check.Reasons = append(check.Reasons, working.Reason{Code: "places-left-over"})
	}
	return check
}

// Unit is one inverter unit that strings are on.
type Unit struct {
	inverter int
	unit     int64
	entries  []*entry
}

// Units returns the inverter units that strings are on, in the order of the design.
func (a *Array) Units() []Unit {
	var found []Unit
	for i := range a.wired {
		e := &a.wired[i]
		at, ok := slices.BinarySearchFunc(found, e, func(u Unit, e *entry) int {
			return cmp.Or(cmp.Compare(u.inverter, e.inverter), cmp.Compare(u.unit, e.Unit))
		})
		if !ok {
			found = slices.Insert(found, at, Unit{inverter: e.inverter, unit: e.Unit})
		}
		found[at].entries = append(found[at].entries, e)
	}
	return found
}

// DCPower judges that the modules' power on an inverter unit does not exceed its
// maximum DC power; ok is false where none is stated.
func (a *Array) DCPower(u *Unit) (check working.Check, ok bool) {
	limit := a.terms.Inverters[u.inverter].MaxDCPower
	if limit == nil {
		return check, false
	}
	v := &a.Design.Inverters[u.inverter]
	broken := working.Outside
	if v.MaxDCPowerIs == design.PowerAdvice {
		broken = working.Caution
	}
	power, lines := total("P", "W", u.entries, func(e *entry) *working.Term {
		return a.planes[e.plane].terms.Pmax.Times(e.terms.Series).Times(e.terms.Parallel)
	})
	rules := append(a.rulesFor(), rule(broken, "", working.Exceeds(power, limit)))
	rules = a.trackerDoubts(rules, &Tracker{entries: u.entries}, "dc-power")
	return judged(working.Check{
		ID: "dc-power", About: working.About{String: -1, Inverter: v.ID, Unit: u.unit},
		Value: a.valueOf(power), Limit: a.valueOf(limit), Unit: "W",
		Cites: a.cites.instructions, Steps: shown(lines...),
	}, rules), true
}
