package working

import (
	"cmp"
	"slices"

	"rimeline/sizing/quantity"
)

// Condition is a comparison that is broken while its left side exceeds its right
// side. Exactly equal is not broken.
type Condition struct {
	left, right *Term
	broken      bool
	solved      bool
	roots       []root
	bits        uint64 // of the inputs of the roots, once asked for
	flipped     bool   // a sweep has passed an odd number of its roots
	seen        *Input // whose events it was last looked at for
	sheet       *Sheet
}

// root is a value of one input at which a condition changes between broken and not.
type root struct {
	input  *Input
	at     quantity.Exact // not broken at this very value
	rising bool           // broken above at; else broken below at
}

// Exceeds returns the condition that is broken while left > right.
func Exceeds(left, right *Term) *Condition {
	sheet := cmp.Or(left.sheet, right.sheet)
	c := sheet.condition()
	*c = Condition{left: left, right: right, broken: right.value.Less(left.value), sheet: sheet}
	return c
}

// Known returns a condition whose state was found otherwise, such as by looking
// into a table. Its turning points are those of the conditions it is joined with.
func Known(broken bool) *Condition { return &Condition{broken: broken, solved: true} }

// Broken reports whether the condition is broken.
func (c *Condition) Broken() bool { return c.broken }

// Join adds the turning points of another condition that says the same in terms
// of other inputs: a step of a table has one closed form for what is looked up and
// another for what the looked-up value is held against. It returns c.
func (c *Condition) Join(same *Condition) *Condition {
	c.solve()
	same.solve()
	c.roots = append(c.roots, same.roots...)
	return c
}

// Below drops the turning points of an input at or above a value, beyond which
// the formula does not hold. It returns c.
func (c *Condition) Below(in *Input, bound quantity.Exact) *Condition {
	c.solve()
	c.roots = slices.DeleteFunc(c.roots, func(r root) bool { return r.input == in && bound.Cmp(r.at) <= 0 })
	return c
}

// Without drops the turning points of an input for which the condition has no
// single closed form. It returns c.
func (c *Condition) Without(in *Input) *Condition {
	c.solve()
	c.roots = slices.DeleteFunc(c.roots, func(r root) bool { return r.input == in })
	return c
}

// mayTurnBy reports whether the solved condition may have a root in the input.
func (c *Condition) mayTurnBy(in *Input) bool {
	if c.bits == 0 {
		for _, r := range c.roots {
			c.bits |= r.input.bit
		}
	}
	return c.bits&in.bit != 0
}

// slope is the change of a difference for a change of one input.
type slope struct {
	input *Input
	by    quantity.Exact
}

// solve finds every root of left − right in each input, the others held. The
// difference is affine in each single input, apart from max and min, where it is
// affine between the values at which a max or min changes hands; so every root
// has a closed form.
func (c *Condition) solve() {
	if c.solved {
		return
	}
	c.solved = true
	if c.left.forks || c.right.forks {
		c.solveForked()
		return
	}
	var buf [16]slope
	slopes := gather(buf[:0], c.left, quantity.Int(1))
	slopes = gather(slopes, c.right, quantity.Int(-1))
	gap := c.left.value.Sub(c.right.value)
	c.roots = c.sheet.rootsFor(len(slopes))
	for _, s := range slopes {
		if sign := s.by.Sign(); sign != 0 {
			c.roots = append(c.roots, root{s.input, s.input.Now.Sub(gap.Quo(s.by)), sign > 0})
		}
	}
}

// gather adds weight × ∂t/∂input to the slopes of all inputs below t.
func gather(slopes []slope, t *Term, weight quantity.Exact) []slope {
	if !t.rests {
		return slopes
	}
	switch t.op {
	case opInput:
		return addSlope(slopes, t.label.input, weight)
	case opNamed:
		return gather(slopes, t.a, weight)
	case opAdd:
		return gather(gather(slopes, t.a, weight), t.b, weight)
	case opSub:
		return gather(gather(slopes, t.a, weight), t.b, weight.Neg())
	case opMul:
		if t.a.rests {
			slopes = gather(slopes, t.a, weight.Mul(t.b.value))
		}
		if t.b.rests {
			slopes = gather(slopes, t.b, weight.Mul(t.a.value))
		}
		return slopes
	case opDiv:
		if t.b.rests {
			panic("working: a turning point was asked of a formula with an input below the line")
		}
		return gather(slopes, t.a, weight.Quo(t.b.value))
	}
	panic("working: a fork has no slope")
}

func addSlope(slopes []slope, in *Input, by quantity.Exact) []slope {
	for i := range slopes {
		if slopes[i].input == in {
			slopes[i].by = slopes[i].by.Add(by)
			return slopes
		}
	}
	return append(slopes, slope{in, by})
}

// solveForked finds the roots of a difference with a max or min in it: between
// two neighbouring values at which a fork changes hands it is affine.
func (c *Condition) solveForked() {
	difference := c.left.Minus(c.right)
	for _, in := range inputsBelow(nil, difference) {
		breaks := forkBreaks(nil, difference, in)
		slices.SortFunc(breaks, quantity.Exact.Cmp)
		breaks = slices.CompactFunc(breaks, quantity.Exact.Equal)
		for i := range len(breaks) + 1 {
			c.solveBetween(difference, in, breaks, i)
		}
	}
}

// solveBetween adds the root of the affine piece before breaks[i], if it has one there.
func (c *Condition) solveBetween(difference *Term, in *Input, breaks []quantity.Exact, i int) {
	one := quantity.Int(1)
	var x, y quantity.Exact // two points of the piece
	switch {
	case len(breaks) == 0:
		x, y = in.Now, in.Now.Add(one)
	case i == 0:
		x, y = breaks[0].Sub(one), breaks[0]
	case i == len(breaks):
		x, y = breaks[i-1], breaks[i-1].Add(one)
	default:
		x, y = breaks[i-1], breaks[i]
	}
	fx, fy := difference.at(in, x), difference.at(in, y)
	rise := fy.Sub(fx)
	if rise.IsZero() {
		return
	}
	at := x.Sub(fx.Mul(y.Sub(x)).Quo(rise))
	if i > 0 && at.Less(breaks[i-1]) || i < len(breaks) && breaks[i].Less(at) {
		return
	}
	// At a root on a break the other piece may bend back; only a true crossing counts, once.
	nudge := quantity.Ratio(1, 1<<20)
	if i > 0 {
		nudge = quantity.Min(nudge, spacing(breaks, nudge))
	}
	above := difference.at(in, at.Add(nudge)).Sign() > 0
	below := difference.at(in, at.Sub(nudge)).Sign() > 0
	if above == below || slices.ContainsFunc(c.roots, func(r root) bool { return r.input == in && r.at.Equal(at) }) {
		return
	}
	c.roots = append(c.roots, root{in, at, above})
}

// spacing returns less than the least distance between neighbouring breaks, at most limit.
func spacing(breaks []quantity.Exact, limit quantity.Exact) quantity.Exact {
	for i := 1; i < len(breaks); i++ {
		limit = quantity.Min(limit, breaks[i].Sub(breaks[i-1]).Quo(quantity.Int(4)))
	}
	return limit
}

// at returns the value of t with one input set to x.
func (t *Term) at(in *Input, x quantity.Exact) quantity.Exact {
	if !t.rests {
		return t.value
	}
	switch t.op {
	case opInput:
		if t.label.input == in {
			return x
		}
		return t.value
	case opNamed:
		return t.a.at(in, x)
	}
	a, b := t.a.at(in, x), t.b.at(in, x)
	switch t.op {
	case opAdd:
		return a.Add(b)
	case opSub:
		return a.Sub(b)
	case opMul:
		return a.Mul(b)
	case opDiv:
		return a.Quo(b)
	case opMax:
		return quantity.Max(a, b)
	}
	return quantity.Min(a, b)
}

func inputsBelow(inputs []*Input, t *Term) []*Input {
	if !t.rests {
		return inputs
	}
	if t.op == opInput {
		if !slices.Contains(inputs, t.label.input) {
			inputs = append(inputs, t.label.input)
		}
		return inputs
	}
	inputs = inputsBelow(inputs, t.a)
	if t.b != nil {
		inputs = inputsBelow(inputs, t.b)
	}
	return inputs
}

// forkBreaks adds the values of the input at which a max or min below t changes
// hands. The sides of a fork are affine in each input; forks are not nested.
func forkBreaks(breaks []quantity.Exact, t *Term, in *Input) []quantity.Exact {
	if !t.forks {
		return breaks
	}
	if t.op == opMax || t.op == opMin {
		var buf [8]slope
		slopes := gather(buf[:0], t.a, quantity.Int(1))
		slopes = gather(slopes, t.b, quantity.Int(-1))
		for _, s := range slopes {
			if s.input == in && !s.by.IsZero() {
				breaks = append(breaks, in.Now.Sub(t.a.value.Sub(t.b.value).Quo(s.by)))
			}
		}
		return breaks
	}
	breaks = forkBreaks(breaks, t.a, in)
	if t.b != nil {
		breaks = forkBreaks(breaks, t.b, in)
	}
	return breaks
}

// Rule gives a verdict while both of its conditions are broken, or the one it has;
// without conditions it always does.
type Rule struct {
	Broken  [2]*Condition // nil for none
	Verdict Verdict
	Reason  Reason // Code "" where the value says it all

	// Doubt marks a rule about whether an input is right rather than whether it fits.
	// Its turning points count for the inputs of the other rules and add none of their own.
	Doubt bool
}

// Judge returns the worst verdict of the rules that hold, [Within] if none does,
// and the reasons of those that hold, in order.
func Judge(rules []Rule) (Verdict, []Reason) {
	worst := Within
	var reasons []Reason
	for _, r := range rules {
		if !r.holds() {
			continue
		}
		worst = max(worst, r.Verdict)
		if r.Reason.Code != "" {
			reasons = append(reasons, r.Reason)
		}
	}
	return worst, reasons
}

// holds reports whether the rule holds, with the conditions that a sweep has flipped.
func (r *Rule) holds() bool {
	for _, c := range r.Broken {
		if c != nil && c.broken == c.flipped {
			return false
		}
	}
	return true
}

func verdictOf(rules []Rule) Verdict {
	worst := Within
	for i := range rules {
		if rules[i].Verdict > worst && rules[i].holds() {
			worst = rules[i].Verdict
		}
	}
	return worst
}

// event is a condition that flips when an input passes a value.
type event struct {
	at        quantity.Exact
	condition *Condition
}

// Turns returns, for each input that the rules rest on, the nearest value at
// which the verdict turns; inputs that cannot turn it are left out. The order is
// that in which the inputs stand in the formulas.
func Turns(rules []Rule) []Turn {
	var seen [24]*Input
	inputs := seen[:0]
	now := verdictOf(rules)
	var found [16]Turn
	turns := found[:0]
	for i := range rules {
		if rules[i].Doubt {
			continue
		}
		for _, c := range rules[i].Broken {
			if c == nil {
				continue
			}
			c.solve()
			for k := range c.roots {
				in := c.roots[k].input
				if slices.Contains(inputs, in) {
					continue
				}
				inputs = append(inputs, in)
				if at, to := nearestTurn(rules, in, now); to != now {
					turns = append(turns, Turn{in.Pointer, at, c.sheet.changePct(in.Now, at), to})
				}
			}
		}
	}
	return slices.Clone(turns)
}

func (s *Sheet) changePct(now, at quantity.Exact) *quantity.Exact {
	if now.IsZero() {
		return nil
	}
	return s.Keep(at.Sub(now).Quo(now).Mul(quantity.Int(100)))
}

// nearestTurn returns the value of an input nearest to now at which the verdict
// turns, and to what; the verdict now where it does not.
func nearestTurn(rules []Rule, in *Input, now Verdict) (at quantity.Exact, to Verdict) {
	var aboveBuf, belowBuf [12]event
	above, below := aboveBuf[:0], belowBuf[:0]
	for i := range rules {
		for _, c := range rules[i].Broken {
			if c == nil {
				continue
			}
			c.solve()
			if c.seen == in || !c.mayTurnBy(in) {
				continue
			}
			c.seen = in
			for _, r := range c.roots {
				if r.input != in {
					continue
				}
				side := r.at.Cmp(in.Now)
				if side > 0 || side == 0 && r.rising {
					above = insert(above, event{in.reached(r, true), c}, 1)
				} else {
					below = insert(below, event{in.reached(r, false), c}, -1)
				}
			}
		}
	}
	for i := range rules { // another check may share the conditions
		for _, c := range rules[i].Broken {
			if c != nil {
				c.seen = nil
			}
		}
	}
	up, toUp := sweep(rules, in, above, now)
	down, toDown := sweep(rules, in, below, now)
	if toUp == now || toDown != now && in.Now.Sub(down).Less(up.Sub(in.Now)) {
		return down, toDown
	}
	return up, toUp
}

// insert puts an event into a list that is ordered outwards: upwards for side 1,
// downwards for −1. The lists are too short for a library's sort to pay.
func insert(events []event, e event, side int) []event {
	events = append(events, e)
	for i := len(events) - 1; i > 0 && events[i].at.Cmp(events[i-1].at)*side < 0; i-- {
		events[i], events[i-1] = events[i-1], events[i]
	}
	return events
}

// reached returns the value at which going away from now passes the root: for a
// whole number the first one on the other side.
func (in *Input) reached(r root, up bool) quantity.Exact {
	if !in.Whole {
		return r.at
	}
	switch {
	case up && r.rising:
		return r.at.Floor().Add(quantity.Int(1))
	case up:
		return r.at.Ceil()
	case r.rising:
		return r.at.Floor()
	}
	return r.at.Ceil().Sub(quantity.Int(1))
}

// sweep passes the events, which are ordered outwards, and returns the first value at
// which the verdict is another, and which; the verdict now where there is none.
func sweep(rules []Rule, in *Input, events []event, now Verdict) (at quantity.Exact, to Verdict) {
	to = now
	passed := 0
	for to == now && passed < len(events) && in.permits(events[passed].at) {
		at = events[passed].at
		for passed < len(events) && events[passed].at.Equal(at) {
			events[passed].condition.flipped = !events[passed].condition.flipped
			passed++
		}
		to = verdictOf(rules)
	}
	for _, e := range events[:passed] {
		e.condition.flipped = false
	}
	return at, to
}

func (in *Input) permits(x quantity.Exact) bool {
	if in.Whole && x.Less(quantity.Int(1)) {
		return false
	}
	return (in.Low == nil || in.Low.Less(x)) && (in.High == nil || x.Less(*in.High))
}
