// Package stringing holds the rules of the main job, a file a rule: how cold and
// hot move a module's voltage, what the ceiling is made of, how many modules go in
// series and strings in parallel, and what is judged of the strings as wired.
//
// A rule returns its numbers together with the steps that show them and the
// conditions at which its verdict turns. The package knows the document's words and
// the rulebook's data; it must not know how results are ordered, written or shown.
//
// Hard ideas, once:
//   - Voltages are exact; a limit that is met exactly is kept.
//   - The cold side rests on open-circuit voltage at the lowest ambient
//     temperature: at first light a cell is as cold as the air and carries no load.
//   - The hot side rests on operating voltage at cell temperature, ambient plus the
//     rise of the mounting.
//   - Voltage adds along a string and does not add across parallel strings; current
//     is the other way round.
package stringing

import (
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/rulebook"
	"rimeline/sizing/working"
)

// Array is a design with the terms that several rules share. It is used by one
// goroutine at a time.
type Array struct {
	Design *design.Design
	Book   *rulebook.Book
	terms  *design.Terms
	doubts [][]design.Doubt            // by module
	open   []map[string][]working.Rule // by module: the rules by which its doubts bear on a check

	ceilings []ceilingOf // by plane × inverter, found when first asked for

	cites   cites
	scratch []working.Rule
	planes  []plane
	wired   []entry
}

// entry is a strings entry with its places found and its voltages.
type entry struct {
	*design.StringEntry
	index                    int
	inverter, tracker, plane int
	terms                    design.StringTerms
	vocCold, hot             *working.Term // V, the string's: open circuit when cold, operating when hot
	steeper                  *working.Term // V, hot, by the steeper slope; nil where it is not the lower of the two
	meets                    *working.Term // °C, where the string meets its ceiling; nil where it does not
	reachedAtC               *quantity.Exact
}

// NewArray prepares a design that has passed the reader. The rulebook must exist.
func NewArray(d *design.Design) *Array {
	a := &Array{
		Design: d,
		Book:   rulebook.Find(d.Rulebook),
		terms:  design.NewTerms(d),
		doubts: make([][]design.Doubt, len(d.Modules)),
		open:   make([]map[string][]working.Rule, len(d.Modules)),

		ceilings: make([]ceilingOf, len(d.Planes)*len(d.Inverters)),

		planes: make([]plane, len(d.Planes)),
		wired:  make([]entry, len(d.Strings)),

		scratch: make([]working.Rule, 0, 32),
	}
	a.cites = a.newCites()
	for i := range d.Modules {
		a.doubts[i] = design.Doubts(d, a.terms, i)
		a.open[i] = rulesOf(a.doubts[i])
	}
	for i := range d.Planes {
		a.planes[i] = a.newPlane(i)
	}
	for i := range d.Strings {
		s := &d.Strings[i]
		e := entry{StringEntry: s, index: i, terms: a.terms.Strings[i]}
		for k := range d.Inverters {
			if d.Inverters[k].ID == s.Inverter {
				e.inverter = k
			}
		}
		for k := range d.Inverters[e.inverter].Trackers {
			if d.Inverters[e.inverter].Trackers[k].ID == s.Tracker {
				e.tracker = k
			}
		}
		for k := range d.Planes {
			if d.Planes[k].ID == s.Plane {
				e.plane = k
			}
		}
		v, n := &a.planes[e.plane], e.terms.Series
		e.vocCold = working.Named("Vcold", "V", n.Times(v.vocCold))
		e.hot = working.Named("Vhot", "V", n.Times(v.vmpHot))
		if v.steeper != nil && quantity.Int(25).Less(v.cellHot.Value()) {
			e.steeper = working.Named("Vhot,steeper", "V", n.Times(v.steeper))
		}
		_, ceiling := a.ceiling(v, e.inverter)
		e.reachedAtC, e.meets = a.reachedAt(v, n, ceiling)
		a.wired[i] = e
	}
	return a
}

func (a *Array) trackerOf(e *entry) (*design.Tracker, *design.TrackerTerms) {
	return &a.Design.Inverters[e.inverter].Trackers[e.tracker], &a.terms.Inverters[e.inverter].Trackers[e.tracker]
}

// Questions returns the open questions, module by module.
func (a *Array) Questions() []working.Question {
	var open []working.Question
	for _, doubts := range a.doubts {
		for i := range doubts {
			if doubts[i].Open() {
				open = append(open, doubts[i].Question())
			}
		}
	}
	return open
}

// rulesOf returns, by check, the rules by which doubts about a module keep the check
// from being confirmed. A doubt that an answer closed is not among them.
func rulesOf(doubts []design.Doubt) map[string][]working.Rule {
	rules := map[string][]working.Rule{}
	for i := range doubts {
		doubt := &doubts[i]
		if doubt.Answered {
			continue
		}
		for k := range doubt.Conditions {
			r := working.Rule{
				Broken:  [2]*working.Condition{doubt.Conditions[k]},
				Verdict: working.Unconfirmed,
				Reason:  working.Reason{Code: "open-question", Pointer: doubt.Pointer},
				Doubt:   true,
			}
			for _, check := range doubt.UnsafeFor {
				rules[check] = append(rules[check], r)
			}
		}
	}
	return rules
}

// doubtRules adds the rules by which open questions about a plane's module bear on a check.
func (a *Array) doubtRules(rules []working.Rule, plane int, check string) []working.Rule {
	return append(rules, a.open[a.planes[plane].module][check]...)
}

// judged completes a check with the verdict, reasons and turning points of its rules.
func judged(c working.Check, rules []working.Rule) working.Check {
	c.Verdict, c.Reasons = working.Judge(rules)
	c.Turns = working.Turns(rules)
	return c
}

// rule gives a verdict while a condition is broken; always, if it is nil.
func rule(verdict working.Verdict, reason string, broken *working.Condition) working.Rule {
	return both(verdict, reason, broken, nil)
}

// both gives a verdict while two conditions are broken.
func both(verdict working.Verdict, reason string, first, second *working.Condition) working.Rule {
	return working.Rule{Broken: [2]*working.Condition{first, second}, Verdict: verdict, Reason: working.Reason{Code: reason}}
}

// shown returns the steps of named terms in order, repeats left out; a nil term or
// one without a formula of its own has none.
func shown(terms ...*working.Term) []working.Step {
	steps := make([]working.Step, 0, len(terms))
	for _, t := range terms {
		if t == nil || !t.IsNamed() {
			continue
		}
		if step := t.Step(); !containsStep(steps, &step) {
			steps = append(steps, step)
		}
	}
	return steps
}

func containsStep(steps []working.Step, s *working.Step) bool {
	for i := range steps {
		if steps[i].Symbol == s.Symbol && steps[i].WithNumbers == s.WithNumbers {
			return true
		}
	}
	return false
}

// valueOf returns a term's value as a check states it.
func (a *Array) valueOf(t *working.Term) *quantity.Exact { return a.terms.Sheet.Keep(t.Value()) }

// rulesFor returns an empty list of rules with room for those of one check. It is
// the same memory each time: a check is judged before the next one begins.
func (a *Array) rulesFor() []working.Rule { return a.scratch[:0] }

func aboutString(e *entry) working.About { return working.About{String: e.index} }

// Wired returns how many strings entries there are.
func (a *Array) Wired() int { return len(a.wired) }

// cites are the clauses that checks print, made once.
type cites struct {
	ceiling, cold, methods, instructions, current, backFeed, marked []string
}

func (a *Array) newCites() cites {
	b := a.Book
	c := cites{
		cold:         []string{b.ColdCoefficient.Cite},
		methods:      []string{b.ColdCoefficient.Cite, b.ColdTable.Cite},
		instructions: []string{b.Instructions.Cite},
		current:      []string{b.CurrentFactor.Clause.Cite, b.Instructions.Cite},
		backFeed:     []string{b.FuseRequired.Cite, b.FuseFactor.Clause.Cite, b.RatingsClause.Cite},
		marked:       []string{b.MarkedIsc.Cite},
	}
	if a.byTable() {
		c.cold = []string{b.ColdTable.Cite}
	}
	c.ceiling = append(c.ceiling, c.cold...)
	if s, ok := b.Ceiling(a.Design.Site.Structure); ok {
		c.ceiling = append(c.ceiling, s.Clause.Cite)
	}
	c.ceiling = append(c.ceiling, b.Instructions.Cite)
	return c
}
