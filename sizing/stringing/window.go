package stringing

import (
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// hotMinimum judges that on the hottest roof the string stays in the tracker's window.
func (a *Array) hotMinimum(e *entry) working.Check {
	_, k := a.trackerOf(e)
	return a.reaches("hot-minimum", e, k.MPPTMin, working.Outside)
}

// fullPowerLow judges that on the hottest roof the inverter can still give full power.
func (a *Array) fullPowerLow(e *entry) working.Check {
	_, k := a.trackerOf(e)
	return a.reaches("full-power-low", e, k.FullPowerMin, working.Caution)
}

// reaches judges that the hot operating voltage is not below a minimum. Where the
// slope is a stand-in and the minimum is met, it is held a second time with the
// slope made steeper by the current coefficient, since a stand-in is optimistic by
// about that much; not met then is a caution with both values.
func (a *Array) reaches(id string, e *entry, minimum *working.Term, broken working.Verdict) working.Check {
	v, n := &a.planes[e.plane], e.terms.Series
	terms := append(a.hotSteps(v), e.steeper, e.hot)
	rules := append(a.rulesFor(), rule(broken, "", v.heldHot.below(minimum, n)))
	if v.slope.standIn {
		rules = append(rules, rule(working.Caution, "stand-in-coefficient", v.heldSteeper.below(minimum, n)))
	}
	return judged(working.Check{
		ID: id, About: aboutString(e), Value: a.valueOf(e.hot), Limit: a.valueOf(minimum), Unit: "V",
		Cites: a.cites.instructions,
		Steps: shown(terms...),
	}, a.doubtRules(rules, e.plane, id))
}

// startShare is the share of its voltage that a string has at first light; the
// inverter must start on that. Common practice: Voc at dawn is 85 to 90 % of STC.
var startShare = quantity.Ratio(9, 10)

// start judges that a hot string's open-circuit voltage starts the inverter. No
// check where no start voltage is stated.
func (a *Array) start(e *entry) working.Check {
	v := &a.planes[e.plane]
	minimum := a.terms.Inverters[e.inverter].Start
	voltage := working.Named("Voc,hot,string", "V", e.terms.Series.Times(v.vocHot))
	rules := []working.Rule{
		rule(working.Outside, "", working.Exceeds(minimum, voltage)),
		rule(working.Caution, "start-at-first-light", working.Exceeds(minimum, working.Number(startShare).Times(voltage))),
	}
	return judged(working.Check{
		ID: "start", About: aboutString(e), Value: a.valueOf(voltage), Limit: a.valueOf(minimum), Unit: "V",
		Cites: a.cites.instructions,
		Steps: shown(a.terms.Hottest, a.terms.Planes[e.plane].Rise, v.cellHot, v.vocHot, voltage),
	}, a.doubtRules(rules, e.plane, "start"))
}

// fullPowerHigh judges that on the coldest morning the operating voltage stays
// where the inverter gives full power; coldUpper that it stays in the tracker's window.
func (a *Array) fullPowerHigh(e *entry) working.Check {
	_, k := a.trackerOf(e)
	return a.staysBelow("full-power-high", e, k.FullPowerMax)
}

func (a *Array) coldUpper(e *entry) working.Check {
	_, k := a.trackerOf(e)
	return a.staysBelow("cold-upper", e, k.MPPTMax)
}

func (a *Array) staysBelow(id string, e *entry, maximum *working.Term) working.Check {
	v := &a.planes[e.plane]
	n := e.terms.Series
	cold := working.Named("Vmp,cold,string", "V", n.Times(v.vmpCold))
	rules := append(a.rulesFor(), rule(working.Caution, "", v.heldCold.exceeds(n, maximum)))
	return judged(working.Check{
		ID: id, About: aboutString(e), Value: a.valueOf(cold), Limit: a.valueOf(maximum), Unit: "V",
		Cites: a.cites.instructions,
		Steps: shown(a.terms.Coldest, v.vmpCold, cold),
	}, a.doubtRules(rules, e.plane, id))
}
