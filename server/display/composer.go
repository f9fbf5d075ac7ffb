package display

import (
	"cmp"
	"slices"
	"strconv"
	"strings"

	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
	"rimeline/views"
)

// composer tells one design and its result in words.
type composer struct {
	*names
	r        *sizing.Result
	abouts   []working.About // whose subject was found already
	subjects []subject
}

func newComposer(d *design.Design, r *sizing.Result) *composer {
	return &composer{names: newNames(d), r: r}
}

func verdict(v working.Verdict) views.Verdict { return views.Verdict(v.String()) }

// headline is the verdict of the whole design in a sentence.
func (c *composer) headline() string {
	if len(c.r.Checks) == 1 && c.r.Checks[0].ID == "nothing-strung" {
		return "No string is entered yet. Here is what fits."
	}
	all := int64(len(c.r.Checks))
	n := c.count(c.r.Verdict)
	switch c.r.Verdict {
	case working.Outside:
		return counted(n, "check", "checks") + " of " + strconv.FormatInt(all, 10) + " " + isOrAre(n, "breaks", "break") + " a limit."
	case working.Unconfirmed:
		return "No limit is broken by what is known, but " + counted(n, "check", "checks") + " of " + strconv.FormatInt(all, 10) + " cannot be confirmed."
	case working.Caution:
		return "Every limit is kept; " + counted(n, "check", "checks") + " of " + strconv.FormatInt(all, 10) + " " + isOrAre(n, "wants", "want") + " a decision."
	}
	return "All " + strconv.FormatInt(all, 10) + " checks keep their limits."
}

func isOrAre(n int64, one, many string) string {
	if n == 1 {
		return one
	}
	return many
}

func (c *composer) count(v working.Verdict) (n int64) {
	for i := range c.r.Checks {
		if c.r.Checks[i].Verdict == v {
			n++
		}
	}
	return n
}

// tally counts the checks by verdict, worst first.
func (c *composer) tally() string {
	var words []string
	for _, v := range []working.Verdict{working.Outside, working.Unconfirmed, working.Caution, working.Within} {
		if n := c.count(v); n > 0 {
			words = append(words, strconv.FormatInt(n, 10)+nbsp+v.String())
		}
	}
	return strings.Join(words, ", ")
}

func (c *composer) planeOfString(i int) *design.Plane {
	if i < 0 || i >= len(c.d.Strings) {
		return nil
	}
	return c.planeByID(c.d.Strings[i].Plane)
}

func (c *composer) trackerOfString(i int) *design.Tracker {
	if i < 0 || i >= len(c.d.Strings) {
		return nil
	}
	t, _ := c.trackerByID(c.d.Strings[i].Inverter, c.d.Strings[i].Tracker)
	return t
}

// limitOfString returns the limits row that a strings entry falls under, nil if there is none.
func (c *composer) limitOfString(i int) *sizing.Limit {
	if i < 0 || i >= len(c.d.Strings) {
		return nil
	}
	s := &c.d.Strings[i]
	for j := range c.r.Limits {
		if l := &c.r.Limits[j]; l.Plane == s.Plane && l.Inverter == s.Inverter && l.Tracker == s.Tracker {
			return l
		}
	}
	return nil
}

// told is a check in words with what it is needed for to group it.
type told struct {
	views.Check
	abouts []working.About
	kind   int // place in kinds
	worst  working.Verdict
	margin *quantity.Exact // (limit − value) ÷ limit, from the safe side; nil where there is none
}

// tell makes all checks words. Equal ones of one kind become one with several
// subjects: twelve trackers strung alike are told once.
func (c *composer) tell() []told {
	var all []told
	byText := map[string]int{}
	ofKind := map[string]int{}
	for i := range c.r.Checks {
		k := &c.r.Checks[i]
		t := c.tellCheck(k)
		ofKind[k.ID]++
		t.Anchor = "check-" + k.ID + "-" + strconv.Itoa(ofKind[k.ID])
		key := t.textKey(k.ID)
		if at, known := byText[key]; known {
			all[at].abouts = append(all[at].abouts, k.About)
			continue
		}
		byText[key] = len(all)
		all = append(all, t)
	}
	for i := range all {
		t := &all[i]
		t.About = c.about(t.abouts)
		if len(t.abouts) == 1 || len(t.Steps) == 0 {
			continue
		}
		// The numbers of the entries in the working are those of the first subject.
		if c.subject(t.abouts[0]).entry == "" {
			t.WorkingOf = c.about(t.abouts[:1])
			continue
		}
		for j := range t.Steps {
			t.Steps[j].Expression = unnumbered(t.Steps[j].Expression)
		}
	}
	return all
}

// textKey is everything that a check says apart from its subject.
func (t *told) textKey(id string) string {
	var b strings.Builder
	for _, s := range []string{id, string(t.Verdict), t.Sentence, t.Limit, t.Cites, t.Shown} {
		b.WriteString(s)
		b.WriteByte(0)
	}
	for _, list := range [][]string{t.Turns, t.Reasons} {
		for _, s := range list {
			b.WriteString(s)
			b.WriteByte(0)
		}
		b.WriteByte(1)
	}
	for _, s := range t.Steps {
		b.WriteString(withoutNumber(s.Symbol) + "\x00" + s.WithNumbers + "\x00" + s.Value + "\x00")
	}
	return b.String()
}

func (c *composer) tellCheck(k *working.Check) told {
	how, place := kindOf(k.ID)
	t := told{kind: place, worst: k.Verdict, abouts: []working.About{k.About}, margin: margin(k, how.atLeast)}
	t.Verdict = verdict(k.Verdict)
	t.Sentence = how.says(c, k)
	t.Steps = steps(k.Steps)
	t.Shown = remark(k, how.atLeast, t.Sentence)
	if how.limit != nil {
		t.Limit = capital(how.limit(c, k))
	}
	t.Cites = strings.Join(k.Cites, "; ")
	t.Turns = c.turns(k, how.atLeast)
	for _, r := range k.Reasons {
		if broken(k, how.atLeast) && (r.Code == "stand-in-coefficient" || r.Code == "start-at-first-light") {
			continue // the stricter look adds nothing to a limit that is broken already
		}
		if s := c.reason(k, r); s != "" && !slices.Contains(t.Reasons, s) {
			t.Reasons = append(t.Reasons, s)
		}
	}
	return t
}

// margin returns how far a value is from its limit as a share of it, negative where it is broken.
func margin(k *working.Check, atLeast bool) *quantity.Exact {
	if k.Value == nil || k.Limit == nil || k.Limit.IsZero() {
		return nil
	}
	m := k.Limit.Sub(*k.Value).Quo(*k.Limit)
	if atLeast {
		m = m.Neg()
	}
	return &m
}

func steps(of []working.Step) []views.Step {
	out := make([]views.Step, len(of))
	for i, s := range of {
		out[i] = views.Step{Symbol: s.Symbol, Expression: s.Expression, WithNumbers: s.WithNumbers, Value: statedIn(s.Value, s.Unit)}
		if out[i].WithNumbers == stated(s.Value) {
			out[i].WithNumbers = "" // a number read from a table is its own result
		}
	}
	return out
}

// remark says how the value of a check was rounded where its sentence shows it.
func remark(k *working.Check, atLeast bool, sentence string) string {
	if k.Value == nil || k.Unit == "" || len(k.Steps) == 0 {
		return ""
	}
	dir, word := quantity.Up, "up"
	if atLeast {
		dir, word = quantity.Down, "down"
	}
	text, exact := k.Value.Fixed(placesOf(k.Unit), dir)
	as := withUnit(trueMinus(text), k.Unit)
	if exact || !strings.Contains(sentence, as) {
		return ""
	}
	return withUnit(stated(*k.Value), k.Unit) + ", shown as " + as + ", rounded " + word
}

// turns tells at which value of each input the verdict would turn: counts first,
// then temperatures, then by the share of change. What is more than its own size away
// is named only.
func (c *composer) turns(k *working.Check, atLeast bool) []string {
	type turning struct {
		rank  int
		share quantity.Exact
		text  string
	}
	var near []turning
	var far []string
	own := c.subject(k.About)
	of := map[string][]string{} // the entries that share a turning point in words
	for _, t := range k.Turns {
		f, known := c.field(t.Pointer)
		if !known {
			near = append(near, turning{rank: 3, text: t.Pointer + " " + stated(t.At)})
			continue
		}
		name := own.call(f)
		if f.entry && own.entry == "" {
			name = f.name
		}
		w := turning{rank: 2, text: c.turn(t, f, name, broken(k, atLeast))}
		if t.ChangePct != nil {
			w.share = t.ChangePct.Abs()
		}
		switch {
		case f.entry && own.entry == "":
			w.rank = 0
			of[w.text] = append(of[w.text], f.owner)
			if len(of[w.text]) > 1 {
				continue
			}
		case f.whole:
			w.rank = 0
		case f.degree:
			w.rank = 1
		case f.unit != "%" && w.share.Cmp(quantity.Int(100)) > 0:
			if !slices.Contains(far, name) {
				far = append(far, name)
			}
			continue
		}
		near = append(near, w)
	}
	slices.SortStableFunc(near, func(a, b turning) int { return cmp.Or(cmp.Compare(a.rank, b.rank), a.share.Cmp(b.share)) })
	var words []string
	for _, w := range near {
		switch owners := of[w.text]; {
		case len(owners) > 0 && len(owners) == own.entries:
			w.text += " of any of its strings"
		case len(owners) > 0:
			w.text += " of " + list(owners)
		}
		words = append(words, w.text)
	}
	if len(far) > 0 {
		words = append(words, "more than ±100"+nbsp+"% away: "+list(far))
	}
	return words
}

// turn tells one turning point. A margin that is left is shown rounded towards
// today's value, a change that is needed rounded away from it, so that neither looks
// better than it is.
func (c *composer) turn(t working.Turn, f field, name string, needed bool) string {
	if f.whole {
		return countTurn(t.At, name)
	}
	rises := f.now != nil && f.now.Less(t.At)
	dir := quantity.Up
	if rises != needed {
		dir = quantity.Down
	}
	at := withUnit(shown(t.At, turnPlaces(f), dir), f.unit)
	switch {
	case f.site && f.unit == "°C":
		return name + " " + at + " (" + fahrenheit(t.At, dir) + ")"
	case f.degree, f.unit == "%", t.ChangePct == nil:
		return name + " " + at
	}
	return name + " " + signed(*t.ChangePct, needed) + ", " + at
}

// countTurn tells a count: "24 modules in series", "inputs 1".
func countTurn(at quantity.Exact, name string) string {
	for _, counted := range []string{"modules", "strings"} {
		if rest, found := strings.CutPrefix(name, counted); found {
			if at.Equal(quantity.Int(1)) {
				counted = strings.TrimSuffix(counted, "s")
			}
			return stated(at) + nbsp + counted + rest
		}
	}
	return name + " " + stated(at)
}

func signed(pct quantity.Exact, needed bool) string {
	dir := quantity.Up
	if (pct.Sign() > 0) != needed {
		dir = quantity.Down
	}
	text := shown(pct, placesPercent, dir)
	if pct.Sign() > 0 {
		text = "+" + text
	}
	return withUnit(text, "%")
}

func turnPlaces(f field) int {
	switch {
	case strings.Contains(f.unit, "/"): // a coefficient
		return 3
	case f.unit == "V", f.unit == "A":
		return 2
	case f.unit == "°C", f.unit == "°F", f.unit == "%":
		return 1
	}
	return placesOf(f.unit)
}

// about names the subjects of a check.
func (c *composer) about(all []working.About) string {
	var order []string
	terminals := map[string][]terminal{}
	var planes []string
	var units []terminal
	for _, a := range all {
		switch {
		case a.String >= 0 && a.String < len(c.d.Strings):
			s := &c.d.Strings[a.String]
			what := strconv.FormatInt(s.ModulesInSeries, 10) + " in series, " + c.plane(s.Plane)
			if terminals[what] == nil {
				order = append(order, what)
			}
			terminals[what] = append(terminals[what], terminal{s.Inverter, s.Unit, s.Tracker})
		case a.Tracker != "":
			if terminals[""] == nil {
				order = append(order, "")
			}
			terminals[""] = append(terminals[""], terminal{a.Inverter, a.Unit, a.Tracker})
		case a.Inverter != "":
			units = append(units, terminal{inverter: a.Inverter, unit: a.Unit})
		case a.Plane != "":
			planes = append(planes, c.plane(a.Plane))
		}
	}
	var words []string
	for _, what := range order {
		at := c.terminals(uniqueTerminals(terminals[what]))
		if what != "" {
			at = what + ", " + at
		}
		words = append(words, at)
	}
	if len(units) > 0 {
		words = append(words, c.units(units))
	}
	if len(planes) > 0 {
		words = append(words, list(planes))
	}
	return capital(strings.Join(words, "; "))
}

func uniqueTerminals(all []terminal) []terminal {
	var unique []terminal
	for _, t := range all {
		if !slices.Contains(unique, t) {
			unique = append(unique, t)
		}
	}
	return unique
}

// byKind groups told checks by their kind, in the order of the method, the worst
// check of a kind first.
func byKind(all []told) []views.CheckKind {
	sorted := slices.Clone(all)
	slices.SortStableFunc(sorted, func(a, b told) int {
		return cmp.Or(cmp.Compare(a.kind, b.kind), cmp.Compare(b.worst, a.worst), compareMargins(a.margin, b.margin))
	})
	var out []views.CheckKind
	last := -1
	for i, t := range sorted {
		if i == 0 || t.kind != last {
			how := kinds[min(t.kind, len(kinds)-1)]
			if t.kind == len(kinds) {
				how = kind{title: "Further checks"}
			}
			out = append(out, views.CheckKind{ID: how.id, Title: how.title, Asks: how.asks, Verdict: t.Verdict})
			last = t.kind
		}
		k := &out[len(out)-1]
		t.Number = strconv.Itoa(len(out)) + "." + strconv.Itoa(len(k.Checks)+1)
		k.Checks = append(k.Checks, t.Check)
	}
	return out
}

func compareMargins(a, b *quantity.Exact) int {
	switch {
	case a == nil && b == nil:
		return 0
	case a == nil:
		return 1
	case b == nil:
		return -1
	}
	return a.Cmp(*b)
}

// worstFirst orders kinds by their verdict; equal ones keep the order of the method.
func worstFirst(kinds []views.CheckKind) []views.CheckKind {
	rank := func(v views.Verdict) int {
		for _, w := range []working.Verdict{working.Outside, working.Unconfirmed, working.Caution} {
			if v == verdict(w) {
				return -int(w)
			}
		}
		return 0
	}
	sorted := slices.Clone(kinds)
	slices.SortStableFunc(sorted, func(a, b views.CheckKind) int { return cmp.Compare(rank(a.Verdict), rank(b.Verdict)) })
	return sorted
}
