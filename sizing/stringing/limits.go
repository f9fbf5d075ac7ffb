package stringing

import (
	"math"

	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// Limit says what one tracker can take from one plane.
type Limit struct {
	Plane, Inverter, Tracker string

	VoltageCeilingV    quantity.Exact
	VoltageCeilingFrom string // at a tie the first of inverter, module, structure, other limits
	Ceiling            []CeilingEntry

	ModuleVocColdV  quantity.Exact
	ModuleVmpHotV   quantity.Exact
	MaxModules      int64
	MinModules      *int64 // nil where one module's hot voltage is not above 0
	MinModulesStart *int64 // nil where no start voltage is stated, or one module's hot voltage is not above 0
	// The three counts without the bound of a machine word, at which those above stop:
	// a module of next to no voltage fits more often than that.
	Counted Counts

	MaxStrings     int64
	MaxStringsFrom string // "inputs", "short-circuit" or "inputs-unconfirmed"

	// ReachedAtC is the temperature at which MaxModules modules would meet the
	// ceiling; nil below −60 °C, where no row of the table breaks it, and for no module.
	ReachedAtC *quantity.Exact
	Cites      []string
	Steps      []working.Step // the working of the numbers above
}

// Limit finds what a tracker can take from a plane, by their indexes in the design.
//
// The most modules are the whole number n for which n × Voc,cold does not exceed
// the ceiling and (n + 1) × Voc,cold does; the fewest likewise from below. All in
// exact numbers: equal to the limit fits.
func (a *Array) Limit(plane, inverter, tracker int) Limit {
	d, v := a.Design, &a.planes[plane]
	k := &a.terms.Inverters[inverter].Trackers[tracker]
	entries, ceiling := a.ceiling(v, inverter)
	row := Limit{
		Plane: d.Planes[plane].ID, Inverter: d.Inverters[inverter].ID, Tracker: d.Inverters[inverter].Trackers[tracker].ID,
		VoltageCeilingV: ceiling.Value(), Ceiling: entries,
		ModuleVocColdV: v.vocCold.Value(), ModuleVmpHotV: v.vmpHot.Value(),
		Counted: Counts{
			MaxModules: mostWithin(v.vocCold.Value(), ceiling.Value()),
			MinModules: fewestReaching(v.vmpHot.Value(), k.MPPTMin.Value()),
		},
		Cites: a.cites.ceiling,
	}
	for _, e := range entries {
		if e.Governs {
			row.VoltageCeilingFrom = e.From
			break
		}
	}
	terms := append([]*working.Term{ceiling}, v.coldSteps...)
	terms = append(terms, a.hotSteps(v)...)
	if start := a.terms.Inverters[inverter].Start; start != nil {
		row.Counted.MinModulesStart = fewestReaching(v.vocHot.Value(), start.Value())
		terms = append(terms, v.vocHot)
	}
	row.MaxModules, row.MinModules, row.MinModulesStart = row.Counted.words()
	row.Steps = shown(append(terms, countTerms(v, ceiling, k.MPPTMin)...)...)
	if row.MaxModules > 0 {
		row.ReachedAtC, _ = a.reachedAt(v, working.Whole(row.MaxModules), ceiling)
	}
	row.MaxStrings, row.MaxStringsFrom = a.mostStrings(v, k)
	return row
}

// Counts are counts of modules in series, whole numbers of any size; nil as in [Limit].
type Counts struct {
	MaxModules                  quantity.Exact
	MinModules, MinModulesStart *quantity.Exact
}

func (c *Counts) words() (most int64, fewest, start *int64) {
	word := func(n *quantity.Exact) *int64 {
		if n == nil {
			return nil
		}
		return new(machineWord(*n))
	}
	return machineWord(c.MaxModules), word(c.MinModules), word(c.MinModulesStart)
}

// machineWord returns a whole number of modules, the greatest word if it is beyond.
func machineWord(n quantity.Exact) int64 {
	if word, fits := n.Int64(); fits {
		return word
	}
	return math.MaxInt64
}

// mostWithin returns the greatest n for which n × each does not exceed limit; each is above 0.
func mostWithin(each, limit quantity.Exact) quantity.Exact { return limit.Quo(each).Floor() }

// fewestReaching returns the least n ≥ 1 for which n × each reaches limit; nil where each is not above 0.
func fewestReaching(each, limit quantity.Exact) *quantity.Exact {
	if each.Sign() <= 0 {
		return nil
	}
	return new(quantity.Max(limit.Quo(each).Ceil(), quantity.Int(1)))
}

// countTerms shows the two counts as roundings of quotients, which in exact numbers
// is the same as comparing n × voltage with the limit.
func countTerms(v *plane, ceiling, minimum *working.Term) []*working.Term {
	terms := []*working.Term{working.Named("nmax", "", working.FloorOf(ceiling.Over(v.vocCold)))}
	if v.vmpHot.Value().Sign() > 0 {
		terms = append(terms, working.Named("nmin", "", working.CeilOf(minimum.Over(v.vmpHot))))
	}
	return terms
}

// mostStrings returns the lesser of the tracker's inputs and the most strings whose
// short-circuit current does not exceed its limit.
func (a *Array) mostStrings(v *plane, k *design.TrackerTerms) (int64, string) {
	inputs, _ := k.Inputs.Value().Int64()
	each := a.shortCircuitEach(v).Value()
	if k.MaxShortCircuitPerInput != nil && k.MaxShortCircuitPerInput.Value().Less(each) {
		return 0, "short-circuit"
	}
	if k.MaxShortCircuit == nil {
		return inputs, "inputs-unconfirmed"
	}
	if n := machineWord(mostWithin(each, k.MaxShortCircuit.Value())); n < inputs {
		return n, "short-circuit"
	}
	return inputs, "inputs"
}
