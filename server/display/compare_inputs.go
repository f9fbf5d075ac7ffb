package display

import (
	"cmp"
	"slices"
	"strconv"
	"strings"

	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/views"
)

// inputs tells every value of the document that differs, part by part. It is
// complete: two documents without a difference here say the same.
func (c *comparer) inputs() []views.ChangeGroup {
	groups := c.parts("The design", wholeFields(c.before), wholeFields(c.after))
	groups = append(groups, c.parts("The site", siteParticulars(c.before), siteParticulars(c.after))...)
	groups = append(groups, c.equipment()...)
	for _, p := range c.planes {
		groups = append(groups, c.entry("Roof plane", p, func(s *composer, i int) (string, part) {
			pl := &s.d.Planes[i]
			l := listing{}
			l.add("id", "name", pl.ID, "")
			if !c.sameModule(p) {
				l.add("module", "module", s.module(s.d.Module(pl.Module)), "")
			}
			return capital(s.plane(pl.ID)), l.with(planeFields(pl, i, ""))
		})...)
	}
	for _, p := range c.strings {
		groups = append(groups, c.entry("Strings", p, func(s *composer, i int) (string, part) {
			return stringsMark(i), c.entryFields(s, i, p)
		})...)
	}
	groups = append(groups, c.parts("Margins", allowanceFields(c.before), allowanceFields(c.after))...)
	for _, p := range c.others {
		groups = append(groups, c.entry("Rated part", p, func(s *composer, i int) (string, part) {
			o := &s.d.OtherLimits[i]
			l := listing{}
			l.add("name", "part", o.Name, "")
			l.number("max_voltage_v", "maximum voltage", o.MaxVoltageV, "V")
			l.add("source", "where it is stated", o.Source, "")
			return "Rated part: " + o.Name, l.part
		})...)
	}
	groups = append(groups, c.parts("The job", jobFields(c.before), jobFields(c.after))...)
	groups = append(groups, c.sourced()...)
	return append(groups, c.answers()...)
}

// equipment tells what differs in modules, inverters and their trackers.
func (c *comparer) equipment() []views.ChangeGroup {
	var groups []views.ChangeGroup
	for _, p := range c.modules {
		groups = append(groups, c.entry("Module", p, func(s *composer, i int) (string, part) {
			m := &s.d.Modules[i]
			return "Module " + s.module(m), makerAndModel(m.Maker, m.Model, m.ID).with(moduleFields(m, i, ""))
		})...)
	}
	for k, p := range c.inverters {
		groups = append(groups, c.entry("Inverter", p, func(s *composer, i int) (string, part) {
			v := &s.d.Inverters[i]
			l := makerAndModel(v.Maker, v.Model, v.ID)
			fields := inverterFields(v, i, "")
			if v.MaxDCPowerW != nil {
				is := "a limit"
				if v.MaxDCPowerIs == design.PowerAdvice {
					is = "advice only"
				}
				l.add("max_dc_power_is", "the maximum DC power is", is, "")
			}
			return "Inverter " + s.inverter(v.ID), l.with(fields)
		})...)
		for _, t := range c.trackers[k] {
			groups = append(groups, c.entry("Tracker", t, func(s *composer, j int) (string, part) {
				i := p.after
				if s == c.was {
					i = p.before
				}
				v := &s.d.Inverters[i]
				l := listing{}
				l.add("id", "name", v.Trackers[j].ID, "")
				of := "Tracker " + v.Trackers[j].ID
				if s.severalI {
					of += " of " + s.inverter(v.ID)
				}
				return of, l.with(trackerFields(&v.Trackers[j], i, j, ""))
			})...)
		}
	}
	return groups
}

func makerAndModel(maker, model, id string) *listing {
	l := &listing{}
	l.add("maker", "maker", maker, "")
	l.add("model", "model", model, "")
	l.add("id", "id in the file", id, "")
	return l
}

// with adds the fields of a part.
func (l *listing) with(p part) part {
	return part{name: p.name, fields: append(l.fields, p.fields...)}
}

func wholeFields(d *design.Design) part {
	l := listing{}
	l.add("title", "title", d.Title, "")
	l.add("rulebook", "code edition", rulebookName(d.Rulebook), "")
	l.add("voltage_method", "cold voltage", (&composer{names: &names{d: d}}).methodName(), "")
	l.add("short_circuit_basis", "held against short-circuit limits", basisName(d.ShortCircuitBasis), "")
	return l.part
}

func siteParticulars(d *design.Design) part {
	l := listing{}
	l.add("name", "site", d.Site.Name, "")
	l.add("structure", "where DC circuits run", structureName(d.Site.Structure), "")
	l.add("station", "weather station", d.Site.Station, "")
	return l.with(siteFields(d))
}

func jobFields(d *design.Design) part {
	l := listing{}
	for _, f := range [][2]string{
		{"client", d.Job.Client}, {"address", d.Job.Address}, {"authority", d.Job.Authority}, {"permit number", d.Job.PermitNumber},
		{"prepared by", d.Job.Preparer}, {"licence", d.Job.Licence}, {"note", d.Job.Note},
	} {
		l.add(f[0], f[0], f[1], "")
	}
	return l.part
}

// entryFields are the fields of a strings entry. A plane or a tracker that is only
// called otherwise is no change of the entry.
func (c *comparer) entryFields(of *composer, i int, p pair) part {
	var samePlane, sameInverter, sameTracker bool
	if p.before >= 0 && p.after >= 0 {
		b, a := &c.before.Strings[p.before], &c.after.Strings[p.after]
		inverter, tracker := c.terminalAfter(b.Inverter, b.Tracker)
		samePlane, sameInverter = c.planeAfter(b.Plane) == a.Plane, inverter == a.Inverter
		sameTracker = sameInverter && tracker == a.Tracker
	}
	s := &of.d.Strings[i]
	l := listing{}
	if !samePlane {
		l.add("plane", "from", of.plane(s.Plane), "")
	}
	if !sameInverter {
		l.add("inverter", "inverter", of.inverter(s.Inverter), "")
	}
	l.count("unit", "unit", s.Unit)
	if !sameTracker {
		l.add("tracker", "tracker", s.Tracker, "")
	}
	l.count("modules_in_series", "modules in series", s.ModulesInSeries)
	l.count("strings_in_parallel", "strings in parallel", s.StringsInParallel)
	return l.part
}

// sameModule reports whether a plane has the same module on both sides, whatever it
// is called.
func (c *comparer) sameModule(plane pair) bool {
	return plane.before >= 0 && plane.after >= 0 && slices.ContainsFunc(c.modules, func(m pair) bool {
		return m.before >= 0 && m.after >= 0 && c.before.Modules[m.before].ID == c.before.Planes[plane.before].Module &&
			c.after.Modules[m.after].ID == c.after.Planes[plane.after].Module
	})
}

// entry tells what differs in one entry of a list. of names it and lists its fields
// on one side; what is the name of its kind.
func (c *comparer) entry(what string, p pair, of func(s *composer, i int) (string, part)) []views.ChangeGroup {
	switch {
	case p.before < 0:
		name, fields := of(c.now, p.after)
		return c.parts(name+", added", part{}, fields)
	case p.after < 0:
		name, fields := of(c.was, p.before)
		return c.parts(name+", removed", fields, part{})
	}
	_, was := of(c.was, p.before)
	name, now := of(c.now, p.after)
	return c.parts(cmp.Or(name, what), was, now)
}

// parts tells what differs in one part, whose fields go by their pointers below it.
func (c *comparer) parts(of string, was, now part) []views.ChangeGroup {
	g := changes{of: of}
	before := map[string]field{}
	for _, f := range was.fields {
		before[leaf(f)] = f
	}
	after := map[string]bool{}
	for _, f := range now.fields {
		after[leaf(f)] = true
		g.figures(f.name, before[leaf(f)].figure(), f.figure())
	}
	for _, f := range was.fields {
		if !after[leaf(f)] {
			g.figures(f.name, f.figure(), figure{})
		}
	}
	return g.group()
}

// leaf is the last part of a field's pointer.
func leaf(f field) string { return f.pointer[strings.LastIndexByte(f.pointer, '/')+1:] }

// figure is the value of a field as it is compared.
func (f field) figure() figure {
	w := figure{text: f.value, value: f.now, unit: f.unit, degree: f.degree, exact: true}
	if f.whole {
		if n, err := strconv.ParseInt(f.value, 10, 64); err == nil {
			w.value = new(quantity.Int(n))
		}
	}
	return w
}

// sourced tells which values are said to come from elsewhere than before.
func (c *comparer) sourced() []views.ChangeGroup {
	g := changes{of: "Where values come from"}
	was := map[string]string{}
	for _, s := range c.before.Sources {
		if at, ok := c.pointerAfter(s.Pointer); ok {
			was[at] = s.From
		} else {
			g.figures(c.was.placeName(s.Pointer), figure{text: s.From}, figure{})
		}
	}
	now := map[string]bool{}
	for _, s := range c.after.Sources {
		now[s.Pointer] = true
		g.figures(c.now.placeName(s.Pointer), figure{text: was[s.Pointer]}, figure{text: s.From})
	}
	for _, s := range c.before.Sources {
		if at, ok := c.pointerAfter(s.Pointer); ok && !now[at] {
			g.figures(c.was.placeName(s.Pointer), figure{text: s.From}, figure{})
		}
	}
	return g.group()
}

// answers tells which reasons were given for values that look like slips.
func (c *comparer) answers() []views.ChangeGroup {
	g := changes{of: "Reasons given for values that were asked about"}
	type key struct{ pointer, asked string }
	was, now := map[key]string{}, map[key]string{}
	for _, a := range c.before.Answers {
		at, _ := c.pointerAfter(a.Pointer)
		was[key{at, string(a.ValueAsked)}] = a.Reason
	}
	for _, a := range c.after.Answers {
		k := key{a.Pointer, string(a.ValueAsked)}
		now[k] = a.Reason
		g.figures(c.now.placeName(a.Pointer), figure{text: was[k]}, figure{text: a.Reason})
	}
	for _, a := range c.before.Answers {
		at, _ := c.pointerAfter(a.Pointer)
		if _, kept := now[key{at, string(a.ValueAsked)}]; !kept {
			g.figures(c.was.placeName(a.Pointer), figure{text: a.Reason}, figure{})
		}
	}
	return g.group()
}

// placeName names what is at a pointer, also a whole module or inverter.
func (c *composer) placeName(pointer string) string {
	if f, known := c.field(pointer); known {
		return f.called()
	}
	if i, rest, ok := entryOf(pointer, "/modules/"); ok && rest == "" && i < len(c.d.Modules) {
		return "module " + c.module(&c.d.Modules[i])
	}
	if i, rest, ok := entryOf(pointer, "/inverters/"); ok && i < len(c.d.Inverters) {
		v := &c.d.Inverters[i]
		if t, below, isTracker := entryOf(rest, "/trackers/"); isTracker && below == "" && t < len(v.Trackers) {
			return "tracker " + v.Trackers[t].ID
		}
		if rest == "" {
			return "inverter " + c.inverter(v.ID)
		}
	}
	return pointer
}
