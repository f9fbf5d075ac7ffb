package tests

import (
	"math/big"
	"slices"
)

// wired is one strings entry with everything it refers to.
type wired struct {
	*circuit
	entry                   *oracleEntry
	index, moduleIndex      int
	stringCold              *big.Rat // cold open-circuit voltage of one string
	trackerPlace, unitPlace place
}

func (w *wired) series() *big.Rat   { return w.entry.Modules.Rat }
func (w *wired) parallel() *big.Rat { return w.entry.Strings.Rat }

// size says what the result of a design must be.
func (d *oracleDesign) size() *oracleResult {
	var res oracleResult
	var doubts []doubt
	res.questions, doubts = d.questions()

	for p := range d.Planes {
		for i := range d.Inverters {
			for t := range d.Inverters[i].Trackers {
				c := d.circuit(&d.Planes[p], &d.Inverters[i], &d.Inverters[i].Trackers[t])
				res.limits = append(res.limits, c.limits())
			}
		}
	}

	if len(d.Strings) == 0 {
		res.checks = []oracleCheck{{id: "nothing-strung", about: designPlace, verdict: unconfirmed}}
		res.verdict = unconfirmed
		return &res
	}

	entries := d.wire()
	var onTracker, onUnit, onPlane groups
	for _, w := range entries {
		onTracker.add(w.trackerPlace, w)
		onUnit.add(w.unitPlace, w)
		onPlane.add(planePlace(w.plane.ID), w)
	}

	judge := func(about place, modules []*wired, checks []oracleCheck) {
		for _, c := range checks {
			c.about = about
			for _, doubt := range doubts {
				if slices.Contains(doubt.unsafeFor, c.id) &&
					slices.ContainsFunc(modules, func(w *wired) bool { return w.moduleIndex == doubt.module }) {
					c.verdict = max(c.verdict, unconfirmed)
				}
			}
			res.checks = append(res.checks, c)
		}
	}
	for _, w := range entries {
		judge(entryPlace(w.index), []*wired{w}, w.entryChecks())
		// The fault current comes from the modules of every string on the tracker.
		judge(entryPlace(w.index), onTracker.of[w.trackerPlace], []oracleCheck{w.backFeed(onTracker.of[w.trackerPlace])})
	}
	for _, about := range onTracker.order {
		judge(about, onTracker.of[about], trackerChecks(onTracker.of[about]))
	}
	for p := range d.Planes {
		about := planePlace(d.Planes[p].ID)
		judge(about, onPlane.of[about], []oracleCheck{places(&d.Planes[p], onPlane.of[about])})
	}
	for _, about := range onUnit.order {
		judge(about, onUnit.of[about], dcPower(onUnit.of[about]))
	}

	for _, c := range res.checks {
		res.verdict = max(res.verdict, c.verdict)
	}
	for _, w := range entries {
		row := oracleString{
			vocCold:    w.stringCold,
			vmpSTC:     times(w.series(), w.module.Vmp.Rat),
			vmpHot:     times(w.series(), w.vmpHot()),
			maxCurrent: times(w.parallel(), w.iscMaximum()),
		}
		about := []place{entryPlace(w.index), w.trackerPlace, planePlace(w.plane.ID), w.unitPlace}
		for _, c := range res.checks {
			if slices.Contains(about, c.about) {
				row.verdict = max(row.verdict, c.verdict)
			}
		}
		res.strings = append(res.strings, row)
	}
	return &res
}

func (d *oracleDesign) circuit(p *oraclePlane, i *oracleInverter, t *oracleTracker) *circuit {
	m := slices.IndexFunc(d.Modules, func(m oracleModule) bool { return m.ID == p.Module })
	return &circuit{d, &d.Modules[m], p, i, t}
}

func (d *oracleDesign) wire() []*wired {
	var entries []*wired
	for n := range d.Strings {
		e := &d.Strings[n]
		p := slices.IndexFunc(d.Planes, func(p oraclePlane) bool { return p.ID == e.Plane })
		i := slices.IndexFunc(d.Inverters, func(i oracleInverter) bool { return i.ID == e.Inverter })
		inverter := &d.Inverters[i]
		t := slices.IndexFunc(inverter.Trackers, func(t oracleTracker) bool { return t.ID == e.Tracker })
		unit := e.Unit.RatString()
		c := d.circuit(&d.Planes[p], inverter, &inverter.Trackers[t])
		entries = append(entries, &wired{
			circuit:      c,
			stringCold:   times(e.Modules.Rat, c.vocCold()),
			entry:        e,
			index:        n,
			moduleIndex:  slices.IndexFunc(d.Modules, func(m oracleModule) bool { return m.ID == d.Planes[p].Module }),
			trackerPlace: trackerPlace(e.Inverter, unit, e.Tracker),
			unitPlace:    unitPlace(e.Inverter, unit),
		})
	}
	return entries
}

// groups are entries by what they share, in the order of their first.
type groups struct {
	order []place
	of    map[place][]*wired
}

func (g *groups) add(at place, w *wired) {
	if g.of == nil {
		g.of = map[place][]*wired{}
	}
	if g.of[at] == nil {
		g.order = append(g.order, at)
	}
	g.of[at] = append(g.of[at], w)
}

// worseIf is the verdict of a check that is broken or not.
func worseIf(broken bool, v verdict) verdict {
	if broken {
		return v
	}
	return within
}

func measured(id string, value, limit *big.Rat, v verdict) oracleCheck {
	return oracleCheck{id: id, verdict: v, measured: true, value: value, limit: limit}
}

// entryChecks are those about a strings entry that need no other entry.
func (w *wired) entryChecks() []oracleCheck {
	n := w.series()
	coldest := w.d.Site.Coldest.Rat
	ceiling, _ := w.ceiling()
	cold := w.stringCold

	at, noneFits := w.ceilingMet(n, ceiling)
	toCeiling := measured("voltage-ceiling", cold, ceiling, worseIf(exceeds(cold, ceiling), outside))
	if at != nil && !exceeds(rat("-60"), at) {
		toCeiling.reachedAt = at
	}

	// Judged with the true temperature even where −60 °C hides it.
	least := w.d.Allowances.Headroom.orElse("3")
	headroom := measured("headroom", nil, least, worseIf(noneFits, caution))
	if at != nil {
		headroom.value = minus(coldest, at)
		headroom.verdict = worseIf(exceeds(least, headroom.value), caution)
	}

	methods := measured("method-difference", nil, ceiling, within)
	if other := w.otherVocCold(); other != nil {
		methods.value = times(n, other)
		methods.verdict = worseIf(exceeds(methods.value, cold) && exceeds(methods.value, ceiling), caution)
	}

	validity := oracleCheck{id: "cold-validity", verdict: worseIf(
		!w.crystalline() ||
			w.d.Site.Elevation.Rat != nil && exceeds(w.d.Site.Elevation.Rat, rat("2000")) ||
			w.d.Site.ColdestBasis == "other" ||
			exceeds(rat("-40"), coldest), caution)}

	hot := times(n, w.vmpHot())
	// meetsOnlyByStandIn: the minimum would be missed with the steeper slope.
	meetsOnlyByStandIn := func(limit *big.Rat) bool {
		steeper := w.vmpHotSteeper()
		return steeper != nil && exceeds(limit, times(n, steeper))
	}
	mpptMin := w.tracker.MPPTMin.Rat
	hotMinimum := measured("hot-minimum", hot, mpptMin, worseIf(meetsOnlyByStandIn(mpptMin), caution))
	if exceeds(mpptMin, hot) {
		hotMinimum.verdict = outside
	}

	checks := []oracleCheck{toCeiling, headroom, methods, validity, hotMinimum}

	if start := w.inverter.StartVoltage.Rat; start != nil {
		open := times(n, w.vocHot())
		c := measured("start", open, start, worseIf(exceeds(start, times(rat("0.9"), open)), caution))
		if exceeds(start, open) {
			c.verdict = outside
		}
		checks = append(checks, c)
	}
	if limit := w.tracker.FullPowerMin.Rat; limit != nil {
		checks = append(checks, measured("full-power-low", hot, limit,
			worseIf(exceeds(limit, hot) || meetsOnlyByStandIn(limit), caution)))
	}
	coldOperating := times(n, w.operatingAt(coldest))
	if limit := w.tracker.FullPowerMax.Rat; limit != nil {
		checks = append(checks, measured("full-power-high", coldOperating, limit, worseIf(exceeds(coldOperating, limit), caution)))
	}
	upper := w.tracker.MPPTMax.Rat
	return append(checks, measured("cold-upper", coldOperating, upper, worseIf(exceeds(coldOperating, upper), caution)))
}

// Standard ratings of overcurrent devices, with the sizes that only fuses have (NEC 240.6(A)), A.
var standardRatings = []string{
	"1", "3", "6", "10", "15", "20", "25", "30", "35", "40", "45", "50", "60", "70", "80", "90", "100", "110", "125",
	"150", "175", "200", "225", "250", "300", "350", "400", "450", "500", "600", "601", "700", "800", "1000", "1200",
	"1600", "2000", "2500", "3000", "4000", "5000", "6000",
}

// backFeed is the fault current into one of the entry's strings from all others on its tracker.
func (w *wired) backFeed(onTracker []*wired) oracleCheck {
	sum := w.inverter.BackFeed.orElse("0")
	for _, other := range onTracker {
		sum = plus(sum, times(other.parallel(), other.iscMaximum()))
	}
	sum = minus(sum, w.iscMaximum())

	greatest := w.module.MaxSeriesFuse.Rat
	c := measured("back-feed", sum, greatest, within)
	least := times(fuseFactor, w.iscWithGain())
	fits := func(rating *big.Rat) bool { return !exceeds(least, rating) && !exceeds(rating, greatest) }
	switch {
	case sum.Sign() == 0:
	case greatest == nil:
		c.verdict = unconfirmed
	case !exceeds(sum, greatest):
	case w.tracker.StringFuse.Rat != nil:
		c.verdict = worseIf(!fits(w.tracker.StringFuse.Rat), outside)
	case !slices.ContainsFunc(standardRatings, func(r string) bool { return fits(rat(r)) }):
		c.verdict = outside
	default:
		c.verdict = unconfirmed
	}
	return c
}

func trackerChecks(entries []*wired) []oracleCheck {
	t := entries[0].tracker
	imp, isc, iscMaximum, count := zero, zero, zero, zero
	impEach, iscEach, iscMaximumEach := zero, zero, zero
	basis := verdict(within)
	for _, w := range entries {
		imp = plus(imp, times(w.parallel(), w.impWithGain()))
		isc = plus(isc, times(w.parallel(), w.iscByBasis()))
		iscMaximum = plus(iscMaximum, times(w.parallel(), w.iscMaximum()))
		count = plus(count, w.parallel())
		impEach = larger(impEach, w.impWithGain())
		iscEach = larger(iscEach, w.iscByBasis())
		iscMaximumEach = larger(iscMaximumEach, w.iscMaximum())
		if positive(w.module.Bifaciality.Rat) && !positive(w.plane.CurrentGain.Rat) && w.module.IscMarkedMax.Rat == nil {
			basis = caution
			if w.d.Rulebook == "nec-2026" {
				basis = unconfirmed
			}
		}
	}
	above := func(x *big.Rat, limit number) bool { return limit.Rat != nil && exceeds(x, limit.Rat) }

	operating := measured("operating-current", imp, t.MaxInputCurrent.Rat,
		worseIf(above(imp, t.MaxInputCurrent) || above(impEach, t.MaxInputPerInput), caution))

	shortCircuit := measured("short-circuit", isc, t.MaxShortCircuit.Rat, within)
	switch {
	case above(isc, t.MaxShortCircuit) || above(iscEach, t.MaxShortCircuitAnInput):
		shortCircuit.verdict = outside
	case t.MaxShortCircuit.Rat == nil:
		shortCircuit.verdict = unconfirmed
	case above(iscMaximum, t.MaxShortCircuit) || above(iscMaximumEach, t.MaxShortCircuitAnInput):
		shortCircuit.verdict = caution // only by the rated basis
	}

	var unequal, mixed verdict
	for i, a := range entries {
		for _, b := range entries[:i] {
			unequal = max(unequal, worseIf(a.stringCold.Cmp(b.stringCold) != 0, unconfirmed))
			// The page says "equal strings"; unequal ones from planes that look
			// different ways are not better off, so their planes are judged too.
			mixed = max(mixed, facing(a.plane, b.plane))
		}
	}
	return []oracleCheck{
		operating,
		shortCircuit,
		measured("inputs", count, t.Inputs.Rat, worseIf(exceeds(count, t.Inputs.Rat), outside)),
		{id: "unequal-strings", verdict: unequal},
		{id: "planes-mixed", verdict: mixed},
		{id: "current-basis", verdict: basis},
	}
}

// facing judges strings of one tracker from two planes by the way the planes look.
func facing(a, b *oraclePlane) verdict {
	switch {
	case a.ID == b.ID:
		return within
	case a.Tilt.Rat == nil || b.Tilt.Rat == nil || a.Azimuth.Rat == nil || b.Azimuth.Rat == nil:
		return unconfirmed
	}
	return worseIf(a.Tilt.Cmp(b.Tilt.Rat) != 0 || a.Azimuth.Cmp(b.Azimuth.Rat) != 0, caution)
}

func places(p *oraclePlane, entries []*wired) oracleCheck {
	sum := zero
	for _, w := range entries {
		sum = plus(sum, times(w.series(), w.parallel()))
	}
	return measured("places", sum, p.Positions.Rat, worseIf(exceeds(sum, p.Positions.Rat), outside))
}

func dcPower(entries []*wired) []oracleCheck {
	i := entries[0].inverter
	if i.MaxDCPower.Rat == nil {
		return nil
	}
	sum := zero
	for _, w := range entries {
		sum = plus(sum, times(times(w.series(), w.parallel()), w.module.Pmax.Rat))
	}
	severity := outside
	if i.MaxDCPowerIs == "advice" {
		severity = caution
	}
	return []oracleCheck{measured("dc-power", sum, i.MaxDCPower.Rat, worseIf(exceeds(sum, i.MaxDCPower.Rat), severity))}
}
