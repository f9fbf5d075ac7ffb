package stringing

import (
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// StringChecks judges one strings entry, by its index in the design.
func (a *Array) StringChecks(i int, tracker *Tracker) []working.Check {
	e := &a.wired[i]
	_, k := a.trackerOf(e)
	checks := make([]working.Check, 0, 11)
	checks = append(checks, a.voltageCeiling(e), a.headroom(e), a.methodDifference(e), a.coldValidity(e), a.hotMinimum(e))
	if a.terms.Inverters[e.inverter].Start != nil {
		checks = append(checks, a.start(e))
	}
	if k.FullPowerMin != nil {
		checks = append(checks, a.fullPowerLow(e))
	}
	if k.FullPowerMax != nil {
		checks = append(checks, a.fullPowerHigh(e))
	}
	return append(checks, a.coldUpper(e), a.backFeed(e, tracker))
}

// TrackerChecks judges one tracker with all of its strings.
func (a *Array) TrackerChecks(t *Tracker) []working.Check {
	return []working.Check{
		a.operatingCurrent(t), a.shortCircuit(t), a.inputs(t),
		a.unequalStrings(t), a.planesMixed(t), a.currentBasis(t),
	}
}

// Strings returns the indexes of the strings entries on the tracker.
func (t *Tracker) Strings() []int { return indexes(t.entries) }

// Strings returns the indexes of the strings entries on the unit.
func (u *Unit) Strings() []int { return indexes(u.entries) }

func indexes(entries []*entry) []int {
	list := make([]int, len(entries))
	for i, e := range entries {
		list[i] = e.index
	}
	return list
}

// Voltages are a strings entry's voltages in V: open circuit and operating, on the
// coldest morning by the chosen method with the allowance, at STC, and on the hottest
// roof; the hot operating voltage with the allowance.
type Voltages struct{ VocCold, VocSTC, VocHot, VmpSTC, VmpHot quantity.Exact }

// Voltages returns the voltages of a strings entry, by its index in the design.
func (a *Array) Voltages(i int) Voltages {
	e := &a.wired[i]
	v, n := &a.planes[e.plane], e.terms.Series.Value()
	return Voltages{
		VocCold: e.vocCold.Value(), VocSTC: n.Mul(v.datasheet.VocV), VocHot: n.Mul(v.vocHot.Value()),
		VmpSTC: n.Mul(v.datasheet.VmpV), VmpHot: n.Mul(v.vmpHot.Value()),
	}
}

// PlaneOf returns the index of the plane a strings entry lies on.
func (a *Array) PlaneOf(i int) int { return a.wired[i].plane }
