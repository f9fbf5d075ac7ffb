package stringing

import (
	"strconv"

	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// CeilingEntry is one of the named limits under which the cold voltage must stay.
type CeilingEntry struct {
	From    string // "inverter", "module", "structure" or the other limit's name
	MaxV    quantity.Exact
	Source  string // clause, what the document says, or "as entered"
	Pointer string // where the document states it, "" for a code's
	Governs bool   // it is the lowest, or one of the lowest at a tie

	term *working.Term
}

// ceiling returns every limit on a plane's strings at an inverter, in the order in
// which a tie is named, and the lowest of them as a term. NEC 690.7: the structure's
// ceiling; 110.3(B): each part's own rating.
func (a *Array) ceiling(v *plane, inverter int) ([]CeilingEntry, *working.Term) {
	found := &a.ceilings[v.index*len(a.Design.Inverters)+inverter]
	if found.lowest == nil {
		found.entries, found.lowest = a.newCeiling(v, inverter)
	}
	return found.entries, found.lowest
}

// ceilingOf is the ceiling of one plane's strings at one inverter.
type ceilingOf struct {
	entries []CeilingEntry
	lowest  *working.Term
}

func (a *Array) newCeiling(v *plane, inverter int) ([]CeilingEntry, *working.Term) {
	entries := make([]CeilingEntry, 0, 3+len(a.terms.OtherLimits))
	add := func(from, source, pointer string, term *working.Term) {
		entries = append(entries, CeilingEntry{From: from, MaxV: term.Value(), Source: source, Pointer: pointer, term: term})
	}
	at := "/inverters/" + strconv.Itoa(inverter) + "/max_dc_voltage_v"
	add("inverter", a.sourceOf(at), at, a.terms.Inverters[inverter].MaxDCVoltage)
	at = v.terms.Pointer("max_system_voltage_v")
	add("module", a.sourceOf(at), at, v.terms.MaxSystemVoltage)
	if c, ok := a.Book.Ceiling(a.Design.Site.Structure); ok {
		add("structure", c.Clause.Cite, "", working.Looked("Vstructure,max", quantity.Int(c.MaxV)))
	}
	for i := range a.Design.OtherLimits {
		o := &a.Design.OtherLimits[i]
		add(o.Name, o.Source, "/other_limits/"+strconv.Itoa(i)+"/max_voltage_v", a.terms.OtherLimits[i])
	}
	lowest := entries[0].term
	for _, e := range entries[1:] {
		lowest = working.MinOf(lowest, e.term)
	}
	for i := range entries {
		entries[i].Governs = entries[i].MaxV.Equal(lowest.Value())
	}
	return entries, working.Named("Vceiling", "V", lowest)
}

// sourceOf returns where the document says that a value came from, "as entered" where it does not.
func (a *Array) sourceOf(pointer string) string {
	for _, s := range a.Design.Sources {
		if s.Pointer == pointer {
			return s.From
		}
	}
	return "as entered"
}

// coldestReported is the temperature below which no meeting point is reported:
// no site of this service is as cold.
var coldestReported = quantity.Int(-60)

// meets returns the temperature at which n modules would meet the ceiling by the
// coefficient, solved from n × (1 + acold ÷ 100) × (Voc + β × (T − 25)) = Vceiling.
func (a *Array) meets(v *plane, n, ceiling *working.Term) *working.Term {
	share := ceiling.Over(times(n, a.coldAllowance()))
	t := working.Whole(25).Plus(share.Minus(v.terms.Voc).Over(v.fallsC))
	return working.Named("Tceiling", "°C", t)
}

// lastRow returns the lower bound of the coldest row of the table under whose
// factor n modules do not exceed a limit. ok is false where no row breaks the
// limit, or every row does.
func (a *Array) lastRow(v *plane, n *working.Term, limit quantity.Exact) (lowerC quantity.Exact, ok bool) {
	broken := false
	voltage := times(n.Times(v.terms.Voc), a.coldAllowance()).Value()
	for _, row := range a.Book.ColdFactors {
		if limit.Less(voltage.Mul(row.Factor)) {
			broken = true
			break
		}
		lowerC, ok = quantity.Int(row.LowerC), true
	}
	return lowerC, ok && broken
}

// reachedAt returns the temperature at which n modules would meet the ceiling by
// the chosen method, and the term that shows it; nil where there is none to report.
func (a *Array) reachedAt(v *plane, n, ceiling *working.Term) (*quantity.Exact, *working.Term) {
	if a.byTable() {
		if lower, ok := a.lastRow(v, n, ceiling.Value()); ok {
			return &lower, working.Looked("Tceiling", lower)
		}
		return nil, nil
	}
	t := a.meets(v, n, ceiling)
	if t.Value().Less(coldestReported) {
		return nil, t
	}
	return a.valueOf(t), t
}

// exceedsCold returns the condition that n modules exceed a limit on the coldest
// morning by a method, with the turning points of the temperature too.
func (a *Array) exceedsCold(v *plane, n, stringVoltage, limit *working.Term, byTable bool) *working.Condition {
	c := working.Exceeds(stringVoltage, limit)
	if !byTable {
		return c.Below(a.terms.ColdestInput, a.terms.ColdestAt25)
	}
	if lower, ok := a.lastRow(v, n, limit.Value()); ok {
		c.Join(working.Exceeds(working.Number(lower), a.terms.Coldest))
	}
	return c
}

// voltageCeiling judges that the cold open-circuit voltage does not exceed any limit.
func (a *Array) voltageCeiling(e *entry) working.Check {
	v := &a.planes[e.plane]
	entries, ceiling := a.ceiling(v, e.inverter)
	rules := a.rulesFor()
	for i := range entries {
		rules = append(rules, rule(working.Outside, "", a.exceedsCold(v, e.terms.Series, e.vocCold, entries[i].term, a.byTable())))
	}
	rules = a.doubtRules(rules, e.plane, "voltage-ceiling")
	return judged(working.Check{
		ID: "voltage-ceiling", About: aboutString(e),
		Value: a.valueOf(e.vocCold), Limit: a.valueOf(ceiling), Unit: "V", ReachedAtC: e.reachedAtC,
		Cites: a.cites.ceiling,
		Steps: shown(append(append([]*working.Term{ceiling}, v.coldSteps...), e.vocCold)...),
	}, rules)
}

// headroom judges how far the temperature at which the ceiling would be met lies
// below the coldest. Less than the wished headroom is a caution: weather is colder
// than its record sooner or later.
func (a *Array) headroom(e *entry) working.Check {
	v := &a.planes[e.plane]
	n := e.terms.Series
	entries, ceiling := a.ceiling(v, e.inverter)
	check := working.Check{
		ID: "headroom", About: aboutString(e), Limit: a.valueOf(a.terms.Headroom), Unit: "°C", ReachedAtC: e.reachedAtC,
		Cites: a.cites.cold,
	}
	if e.meets != nil {
		gap := working.Named("headroom", "°C", a.terms.Coldest.Minus(e.meets))
		check.Value = a.valueOf(gap)
		check.Steps = shown(ceiling, a.terms.Coldest, e.meets, gap)
	}
	rules := a.rulesFor()
	for i := range entries {
		rules = append(rules, rule(working.Caution, "", a.lacksHeadroom(v, n, entries[i].term)))
	}
	return judged(check, a.doubtRules(rules, e.plane, "headroom"))
}

// lacksHeadroom returns the condition that n modules would exceed a limit at the
// coldest temperature less the wished headroom, which is the same as meeting it
// less than that headroom away.
func (a *Array) lacksHeadroom(v *plane, n, limit *working.Term) *working.Condition {
	if !a.byTable() {
		return working.Exceeds(n.Times(v.colderVoc), limit)
	}
	colder := a.terms.Coldest.Minus(a.terms.Headroom)
	row, ok := a.Book.ColdFactorAt(colder.Value())
	if !ok { // beyond the table the last row tells whether any breaks
		row = a.Book.ColdFactors[len(a.Book.ColdFactors)-1]
	}
	c := working.Exceeds(times(n.Times(v.coldByRow(row)), a.coldAllowance()), limit)
	if lower, ok := a.lastRow(v, n, limit.Value()); ok {
		c.Join(working.Exceeds(working.Number(lower), colder))
	}
	return c
}

// methodDifference judges whether the method not chosen gives a higher cold voltage
// that would break the ceiling: a reviewer who takes the other one will ask.
func (a *Array) methodDifference(e *entry) working.Check {
	v := &a.planes[e.plane]
	entries, ceiling := a.ceiling(v, e.inverter)
	check := working.Check{ID: "method-difference", About: aboutString(e), Limit: a.valueOf(ceiling), Unit: "V",
		Cites: a.cites.methods}
	rules := a.rulesFor()
	if v.other == nil {
		check.Limit = nil
		check = judged(check, a.doubtRules(nil, e.plane, check.ID))
		check.Reasons = append(check.Reasons, working.Reason{Code: "other-method-not-to-be-had"})
		return check
	}
	other := working.Named("Vcold,other", "V", e.terms.Series.Times(v.other))
	// Of the temperature the table is a staircase and the coefficient a slope, so
	// that it has no single turning point here.
	higher := working.Exceeds(other, e.vocCold).Without(a.terms.ColdestInput)
	for i := range entries {
		breaks := a.exceedsCold(v, e.terms.Series, other, entries[i].term, !a.byTable()).Without(a.terms.ColdestInput)
		rules = append(rules, both(working.Caution, "other-method-higher", higher, breaks))
	}
	check.Value = a.valueOf(other)
	check.Steps = shown(append(append([]*working.Term{ceiling}, v.otherMore...), other)...)
	return judged(check, a.doubtRules(rules, e.plane, check.ID))
}

// The limits of validity of the cold-voltage methods.
var (
	highSiteM     = quantity.Int(2000) // above it air insulates less and an inverter's limit may fall
	coldestValidC = quantity.Int(-40)  // the table's end; the linear coefficient is untested below
)

// coldValidity judges whether the cold voltage was found inside the methods' limits of validity.
func (a *Array) coldValidity(e *entry) working.Check {
	v := &a.planes[e.plane]
	rules := a.rulesFor()
	if !v.datasheet.CrystallineSilicon() {
		rules = append(rules, rule(working.Caution, "thin-film", nil))
	}
	if a.terms.Elevation != nil {
		rules = append(rules, rule(working.Caution, "elevation-above-2000-m", working.Exceeds(a.terms.Elevation, working.Number(highSiteM))))
	}
	if a.Design.Site.ColdestBasis == "other" {
		rules = append(rules, rule(working.Caution, "basis-other", nil))
	}
	rules = append(rules, rule(working.Caution, "colder-than-minus-40", working.Exceeds(working.Number(coldestValidC), a.terms.Coldest)))
	return judged(working.Check{ID: "cold-validity", About: aboutString(e), Cites: a.cites.cold}, rules)
}
