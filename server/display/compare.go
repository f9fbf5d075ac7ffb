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

// Side is one of two designs that are compared, with what the engine found of it.
type Side struct {
	Name   string // what the page calls it: "Revision 3", "As it is"
	Design *design.Design
	Result *sizing.Result
}

// NewComparison tells what differs between two designs: verdicts first, then inputs,
// then results. Values are compared as they are stated, so that 37.0 and 37 do not
// differ, and 21 °C and 69.8 °F do.
func NewComparison(before, after Side) views.Comparison {
	c := comparer{
		pairing: pairUp(before.Design, after.Design),
		was:     newComposer(before.Design, before.Result),
		now:     newComposer(after.Design, after.Result),
	}
	matched := c.matched()
	p := views.Comparison{
		Before:   c.was.comparedSide(before.Name),
		After:    c.now.comparedSide(after.Name),
		Verdicts: c.turned(matched),
		Inputs:   c.inputs(),
		Results:  c.results(),
		Moved:    c.moved(matched),
	}
	p.Asked, p.Closed = c.asked()
	p.Lead = lead(&p)
	return p
}

func (c *composer) comparedSide(name string) views.ComparedSide {
	return views.ComparedSide{Name: name, Verdict: verdict(c.r.Verdict), Headline: c.headline(), Tally: c.tally()}
}

// lead says in a sentence what differs.
func lead(p *views.Comparison) string {
	turned := 0
	for _, g := range p.Verdicts {
		turned += len(g.Rows)
	}
	inputs, results := int64(rowsOf(p.Inputs)), int64(rowsOf(p.Results))
	var words []string
	if inputs > 0 {
		words = append(words, counted(inputs, "input", "inputs"))
	}
	if results > 0 {
		words = append(words, counted(results, "result", "results"))
	}
	s := "No verdict turns"
	switch {
	case turned > 0:
		s = counted(int64(turned), "verdict turns", "verdicts turn")
	case len(words) == 0 && len(p.Verdicts) == 0 && len(p.Asked) == 0 && len(p.Closed) == 0 && len(p.Moved) == 0:
		return "Nothing differs."
	}
	if len(words) > 0 {
		s += "; " + list(words) + " " + isOrAre(inputs+results, "differs", "differ")
	}
	return s + "."
}

func rowsOf(groups []views.ChangeGroup) (n int) {
	for _, g := range groups {
		n += len(g.Rows)
	}
	return n
}

// comparer tells two designs side by side.
type comparer struct {
	*pairing
	was, now *composer
}

// match is a check on both sides; nil on the side where it is not made.
type match struct{ was, now *working.Check }

// matched pairs the checks, in the order of the design after; those that are no
// longer made come last.
func (c *comparer) matched() []match {
	type key struct {
		id    string
		about working.About
	}
	before := map[key]*working.Check{}
	for i := range c.was.r.Checks {
		k := &c.was.r.Checks[i]
		if about, ok := c.aboutAfter(k.About); ok {
			before[key{k.ID, about}] = k
		}
	}
	var all []match
	found := map[*working.Check]bool{}
	for i := range c.now.r.Checks {
		k := &c.now.r.Checks[i]
		m := match{before[key{k.ID, k.About}], k}
		found[m.was] = true
		all = append(all, m)
	}
	for i := range c.was.r.Checks {
		if k := &c.was.r.Checks[i]; !found[k] {
			all = append(all, match{k, nil})
		}
	}
	return all
}

// The ways in which a check may turn, in the order in which they are told.
const (
	worse = iota
	better
	made    // not made before
	dropped // made before only
	ways
)

var wayHeadings = [ways]string{"What gets worse", "What gets better", "Judged now and not before", "Judged before and not now"}

func (m match) way() int {
	switch {
	case m.was == nil:
		return made
	case m.now == nil:
		return dropped
	case m.now.Verdict > m.was.Verdict:
		return worse
	}
	return better
}

// turning is a check that turns, with its equals.
type turning struct {
	views.Turned
	match
	kind   int
	abouts []working.About
}

// turned tells the checks whose verdict turns, the worst first. Equal ones of
// different subjects are told once. Of those that come or go, what is within is told
// in a sentence.
func (c *comparer) turned(all []match) []views.TurnedGroup {
	type key struct {
		kind          int
		before, after views.TurnedTo
	}
	var groups [ways][]turning
	var within [ways][]match
	of := map[key]int{}
	for _, m := range all {
		w := m.way()
		switch {
		case m.was != nil && m.now != nil && m.was.Verdict == m.now.Verdict:
			continue
		case w == made && m.now.Verdict == working.Within, w == dropped && m.was.Verdict == working.Within:
			within[w] = append(within[w], m)
			continue
		}
		t := c.turning(m)
		k := key{t.kind, t.Before, t.After}
		if known, ok := of[k]; ok {
			groups[w][known].abouts = append(groups[w][known].abouts, t.abouts...)
			continue
		}
		of[k] = len(groups[w])
		groups[w] = append(groups[w], t)
	}
	var out []views.TurnedGroup
	for w, turns := range groups {
		if len(turns) == 0 && len(within[w]) == 0 {
			continue
		}
		slices.SortStableFunc(turns, func(a, b turning) int {
			return cmp.Or(cmp.Compare(b.worst(), a.worst()), cmp.Compare(a.kind, b.kind))
		})
		g := views.TurnedGroup{Heading: wayHeadings[w], Rest: c.withinWords(within[w], len(turns) > 0)}
		for _, t := range turns {
			t.About = c.side(t.match).about(t.abouts)
			g.Rows = append(g.Rows, t.Turned)
		}
		out = append(out, g)
	}
	return out
}

// worst is the verdict that a turn is ordered by: the one it ends in, or had at last.
func (t *turning) worst() working.Verdict {
	if t.now == nil {
		return t.was.Verdict
	}
	return t.now.Verdict
}

// side is the composer of the design in which a check's subject has its present name.
func (c *comparer) side(m match) *composer {
	if m.now == nil {
		return c.was
	}
	return c.now
}

func (c *comparer) turning(m match) turning {
	t := turning{match: m}
	for _, s := range []struct {
		c  *composer
		k  *working.Check
		to *views.TurnedTo
	}{{c.was, m.was, &t.Before}, {c.now, m.now, &t.After}} {
		if s.k == nil {
			continue
		}
		told := s.c.tellCheck(s.k)
		*s.to = views.TurnedTo{Verdict: told.Verdict, Says: strings.Join(append([]string{told.Sentence}, told.Reasons...), " ")}
		how, place := kindOf(s.k.ID)
		t.Title, t.kind, t.abouts = how.title, place, []working.About{s.k.About}
	}
	return t
}

// withinWords tells checks that come or go and are within.
func (c *comparer) withinWords(all []match, further bool) string {
	if len(all) == 0 {
		return ""
	}
	var ids []string
	for _, m := range all {
		if k := cmp.Or(m.now, m.was); !slices.Contains(ids, k.ID) {
			ids = append(ids, k.ID)
		}
	}
	n := int64(len(all))
	what := counted(n, "check", "checks")
	if further {
		what = counted(n, "further check", "further checks")
	}
	is := isOrAre(n, "is", "are")
	if all[0].now == nil {
		is = isOrAre(n, "was", "were")
	}
	return what + " " + is + " within: " + list(titles(ids)) + "."
}

// asked returns the questions that are open after and not before, and the other way round.
func (c *comparer) asked() (asked, closed []views.Question) {
	type key struct{ pointer, asked string }
	before, after := map[key]bool{}, map[key]bool{}
	wasTold, nowTold := c.was.questions(), c.now.questions()
	for _, q := range c.was.r.Questions {
		pointer, _ := c.pointerAfter(q.Pointer)
		before[key{pointer, q.Asked}] = true
	}
	for i, q := range c.now.r.Questions {
		k := key{q.Pointer, q.Asked}
		after[k] = true
		if !before[k] {
			asked = append(asked, nowTold[i])
		}
	}
	for i, q := range c.was.r.Questions {
		pointer, _ := c.pointerAfter(q.Pointer)
		if !after[key{pointer, q.Asked}] {
			closed = append(closed, wasTold[i])
		}
	}
	return asked, closed
}

// results tells the numbers that differ: the array as a whole, what fits, and each
// strings entry.
func (c *comparer) results() []views.ChangeGroup {
	groups := c.whole()
	groups = append(groups, c.limits()...)
	return append(groups, c.strung()...)
}

// headroomFigure is how much colder it must get until a ceiling is met. Temperatures
// below −60 °C do not occur on roofs, and differences between them say nothing.
func (c *composer) headroomFigure(gap *quantity.Exact) figure {
	switch {
	case gap == nil:
		return figure{}
	case !c.byTable() && c.d.Site.Coldest.Celsius().Sub(*gap).Less(quantity.Int(-60)):
		return figure{text: "met only below " + wholeDegrees(-60)}
	}
	return figure{text: degreesApart(*gap, quantity.Down), value: rounded(*gap, placesDegree, quantity.Down), unit: "°C", places: placesDegree, degree: true}
}

// rounded is a number as it is shown, so that a difference is that of what one reads.
func rounded(x quantity.Exact, places int, dir quantity.Direction) *quantity.Exact {
	text, _ := x.Fixed(places, dir)
	r, err := quantity.Parse(text)
	if err != nil {
		return &x // with more digits than are read
	}
	return &r
}

func (c *comparer) whole() []views.ChangeGroup {
	g := changes{of: "The whole array"}
	if len(c.was.d.Strings)+len(c.now.d.Strings) > 0 {
		g.figures("modules", exactCount(c.was.modulesOf(everyString)), exactCount(c.now.modulesOf(everyString)))
		g.figures("power at STC", kilowattFigure(c.was.powerOf(everyString)), kilowattFigure(c.now.powerOf(everyString)))
		g.figures("least headroom", c.was.headroomFigure(c.was.r.LeastHeadroomC()), c.now.headroomFigure(c.now.r.LeastHeadroomC()))
	}
	return g.group()
}

// limits tells what one plane can put on one tracker. Trackers of an inverter that
// change alike are told once, and so are planes.
func (c *comparer) limits() []views.ChangeGroup {
	type told struct {
		rows []views.Change
		text string
		side *composer
		at   fitting
	}
	var all []told
	of := map[string]int{}
	for _, p := range c.planes {
		for i, v := range c.inverters {
			for _, t := range c.trackers[i] {
				was, now := c.was.limitAt(p.before, v.before, t.before), c.now.limitAt(p.after, v.after, t.after)
				g := changes{}
				c.limit(&g, was, now)
				if len(g.rows) == 0 {
					continue
				}
				side, row := c.now, now
				if now == nil {
					side, row = c.was, was
				}
				text := rowsText(g.rows)
				key := strings.Join([]string{row.Plane, row.Inverter, strconv.FormatBool(now == nil), text}, "\x00")
				known, ok := of[key]
				if !ok {
					known = len(all)
					of[key] = known
					all = append(all, told{g.rows, text, side, fitting{row: row, planes: []string{row.Plane}}})
				}
				all[known].at.terminals = append(all[known].at.terminals, terminal{inverter: row.Inverter, tracker: row.Tracker})
			}
		}
	}
	var merged []told
	for _, t := range all {
		known := slices.IndexFunc(merged, func(o told) bool {
			return o.side == t.side && o.text == t.text && slices.Equal(o.at.terminals, t.at.terminals)
		})
		if known < 0 {
			merged = append(merged, t)
			continue
		}
		merged[known].at.planes = append(merged[known].at.planes, t.at.planes...)
	}
	var groups []views.ChangeGroup
	for _, t := range merged {
		groups = append(groups, views.ChangeGroup{Of: "What fits: " + t.side.where(t.at), Rows: t.rows})
	}
	return groups
}

// rowsText is everything that rows say.
func rowsText(rows []views.Change) string {
	var b strings.Builder
	for _, r := range rows {
		b.WriteString(r.Name + "\x00" + r.Before + "\x00" + r.After + "\x00" + r.By + "\x00")
	}
	return b.String()
}

// limitAt returns the limits row of a plane and a tracker by their places, nil where
// the design does not have them. Rows are in the order of planes, then inverters,
// then trackers.
func (c *composer) limitAt(plane, inverter, tracker int) *sizing.Limit {
	if plane < 0 || inverter < 0 || tracker < 0 {
		return nil
	}
	at, all := tracker, 0
	for i := range c.d.Inverters {
		if i < inverter {
			at += len(c.d.Inverters[i].Trackers)
		}
		all += len(c.d.Inverters[i].Trackers)
	}
	return &c.r.Limits[plane*all+at]
}

func (c *comparer) limit(g *changes, was, now *sizing.Limit) {
	each := func(name string, of func(*composer, *sizing.Limit) figure) {
		var a, b figure
		if was != nil {
			a = of(c.was, was)
		}
		if now != nil {
			b = of(c.now, now)
		}
		g.figures(name, a, b)
	}
	least := func(n *int64) figure {
		if n == nil {
			return figure{text: "no number reaches it"}
		}
		return countFigure(*n)
	}
	each("most modules in series", func(_ *composer, l *sizing.Limit) figure { return countFigure(l.MaxModules) })
	each("fewest modules for the tracker's window", func(_ *composer, l *sizing.Limit) figure { return least(l.MinModules) })
	each("fewest modules to start", func(c *composer, l *sizing.Limit) figure {
		if v := c.inverterByID(l.Inverter); v == nil || v.StartVoltageV == nil {
			return figure{}
		}
		return least(l.MinModulesStart)
	})
	each("most strings", func(_ *composer, l *sizing.Limit) figure {
		f := countFigure(l.MaxStrings)
		switch l.MaxStringsFrom {
		case "short-circuit":
			f.text += ", by the short-circuit limit"
		case "inputs-unconfirmed":
			f.text += ", unconfirmed: by the inputs alone"
		default:
			f.text += ", by the inputs"
		}
		return f
	})
	each("voltage ceiling", func(c *composer, l *sizing.Limit) figure {
		return figure{text: statedIn(l.VoltageCeilingV, "V") + " (" + c.ceilingName(l.VoltageCeilingFrom) + ")", value: &l.VoltageCeilingV, unit: "V", places: placesString}
	})
	each("one module open-circuit, coldest morning", func(_ *composer, l *sizing.Limit) figure {
		return figure{text: moduleVolts(l.ModuleVocColdV, quantity.Up), value: rounded(l.ModuleVocColdV, placesModule, quantity.Up), unit: "V", places: placesModule}
	})
	each("one module operating, hottest roof", func(_ *composer, l *sizing.Limit) figure {
		return figure{text: moduleVolts(l.ModuleVmpHotV, quantity.Down), value: rounded(l.ModuleVmpHotV, placesModule, quantity.Down), unit: "V", places: placesModule}
	})
}

// strung tells what the strings entries come to. Entries that change alike are told once.
func (c *comparer) strung() []views.ChangeGroup {
	type told struct {
		rows   []views.Change
		side   *composer
		abouts []working.About
	}
	var all []told
	of := map[string]int{}
	for _, s := range c.strings {
		g := changes{}
		each := func(name, unit string, places int, dir quantity.Direction, value func(*sizing.StringResult) quantity.Exact) {
			figureOf := func(c *composer, at int) figure {
				if at < 0 {
					return figure{}
				}
				value := value(&c.r.Strings[at])
				return figure{text: withUnit(shown(value, places, dir), unit), value: rounded(value, places, dir), unit: unit, places: places}
			}
			g.figures(name, figureOf(c.was, s.before), figureOf(c.now, s.after))
		}
		each("open-circuit, coldest morning", "V", placesString, quantity.Up, func(r *sizing.StringResult) quantity.Exact { return r.VocColdV })
		each("operating at STC", "V", placesString, quantity.Nearest, func(r *sizing.StringResult) quantity.Exact { return r.VmpSTCV })
		each("operating, hottest roof", "V", placesString, quantity.Down, func(r *sizing.StringResult) quantity.Exact { return r.VmpHotV })
		each("maximum current", "A", placesAmpere, quantity.Up, func(r *sizing.StringResult) quantity.Exact { return r.MaxCurrentA })
		if len(g.rows) == 0 {
			continue
		}
		side, at := c.now, s.after
		if at < 0 {
			side, at = c.was, s.before
		}
		key := strconv.FormatBool(s.after < 0) + rowsText(g.rows)
		known, ok := of[key]
		if !ok {
			known = len(all)
			of[key] = known
			all = append(all, told{rows: g.rows, side: side})
		}
		all[known].abouts = append(all[known].abouts, working.About{String: at})
	}
	var groups []views.ChangeGroup
	for _, t := range all {
		groups = append(groups, views.ChangeGroup{Of: marks(t.abouts) + t.side.about(t.abouts), Rows: t.rows})
	}
	return groups
}

// marks are the numbers of a few strings entries: "S1 and S2: ".
func marks(abouts []working.About) string {
	if len(abouts) > 3 {
		return ""
	}
	var words []string
	for _, a := range abouts {
		words = append(words, stringsMark(a.String))
	}
	return list(words) + ": "
}

// moved tells the checks that keep their verdict while their value or limit moves.
func (c *comparer) moved(all []match) []views.ChangeGroup {
	type told struct {
		row    views.Change
		abouts []working.About
	}
	type key struct {
		kind int
		row  views.Change
	}
	rows := make([][]told, len(kinds)+1) // by kind
	of := map[key]int{}
	for _, m := range all {
		if m.was == nil || m.now == nil || m.was.Verdict != m.now.Verdict {
			continue
		}
		g := changes{}
		g.figures("", c.was.checkFigure(m.was), c.now.checkFigure(m.now))
		if len(g.rows) == 0 {
			continue
		}
		_, place := kindOf(m.now.ID)
		k := key{place, g.rows[0]}
		if _, known := of[k]; !known {
			of[k] = len(rows[place])
			rows[place] = append(rows[place], told{row: g.rows[0]})
		}
		rows[place][of[k]].abouts = append(rows[place][of[k]].abouts, m.now.About)
	}
	var groups []views.ChangeGroup
	for place := range rows {
		if len(rows[place]) == 0 {
			continue
		}
		g := views.ChangeGroup{Of: "Further checks"}
		if place < len(kinds) {
			g.Of = kinds[place].title
		}
		for _, t := range rows[place] {
			t.row.Name = c.now.about(t.abouts)
			g.Rows = append(g.Rows, t.row)
		}
		groups = append(groups, g)
	}
	return groups
}

// checkFigure is a check's value beside its limit.
func (c *composer) checkFigure(k *working.Check) figure {
	if k.ID == "headroom" {
		return c.headroomFigure(k.Value)
	}
	if k.Value == nil {
		if k.Limit == nil {
			return figure{}
		}
		return figure{text: "limit " + limitOf(k)}
	}
	dir := quantity.Up
	if how, _ := kindOf(k.ID); how.atLeast {
		dir = quantity.Down
	}
	places := placesOf(k.Unit)
	f := figure{text: withUnit(shown(*k.Value, places, dir), k.Unit), value: rounded(*k.Value, places, dir), unit: k.Unit, places: places, degree: k.Unit == "°C"}
	if k.Limit != nil {
		f.text += " against " + limitOf(k)
	}
	return f
}

// figure is a value of one side; its zero value is none.
type figure struct {
	text   string
	value  *quantity.Exact // nil where no difference can be told
	unit   string
	places int  // of the difference
	degree bool // a temperature, which a percentage says nothing about
	exact  bool // the difference is shown with all its digits
}

func countFigure(n int64) figure { return exactCount(quantity.Int(n)) }

func exactCount(n quantity.Exact) figure { return figure{text: stated(n), value: &n} }

func kilowattFigure(w quantity.Exact) figure {
	kw := w.Quo(quantity.Int(1000))
	return figure{text: kilowatts(w), value: &kw, unit: "kW", places: 3}
}

// changes collects the values of one part that differ.
type changes struct {
	of   string
	rows []views.Change
}

// figures notes a value if it reads differently on the two sides.
func (g *changes) figures(name string, was, now figure) {
	if was.text == now.text {
		return
	}
	g.rows = append(g.rows, views.Change{Name: capital(name), Before: was.text, After: now.text, By: difference(was, now)})
}

// group returns the part, nothing where it has no change.
func (g *changes) group() []views.ChangeGroup {
	if len(g.rows) == 0 {
		return nil
	}
	return []views.ChangeGroup{{Of: g.of, Rows: g.rows}}
}

// difference tells by how much a number changes: "+2.4 V (+6.4 %)", "" where it
// cannot be told.
func difference(was, now figure) string {
	if was.value == nil || now.value == nil || was.unit != now.unit {
		return ""
	}
	by := now.value.Sub(*was.value)
	if by.IsZero() {
		return ""
	}
	text := shown(by, now.places, quantity.Nearest)
	if now.exact {
		text = stated(by)
	}
	plus := func(s string) string {
		if by.Sign() > 0 {
			return "+" + s
		}
		return s
	}
	s := withUnit(plus(text), now.unit)
	if now.degree || now.unit == "" || now.unit == "%" || now.unit == "°" || was.value.Sign() <= 0 {
		return s
	}
	if pct := shown(by.Quo(*was.value).Mul(quantity.Int(100)), placesPercent, quantity.Nearest); pct != "0.0" && pct != minus+"0.0" {
		s += " (" + withUnit(plus(pct), "%") + ")"
	}
	return s
}
