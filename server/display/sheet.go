package display

import (
	"strconv"
	"strings"

	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/views"
)

// NewSheet makes the stringing sheet of a design that is neither saved nor released.
func NewSheet(d *design.Design, r *sizing.Result) views.SheetPage {
	c := newComposer(d, r)
	fittings := c.fittings()
	p := views.SheetPage{
		Title:      titleOf(d),
		Site:       d.Site.Name,
		Mark:       "DRAFT, not saved or released",
		Verdict:    verdict(r.Verdict),
		Headline:   c.headline(),
		Tally:      c.tally(),
		Job:        c.job(),
		Basis:      c.basis(),
		Rounding:   rounding,
		Coldest:    coldest(d),
		Equipment:  c.equipment(),
		Ceilings:   c.ceilings(fittings),
		Schedule:   c.schedule(),
		Totals:     c.totals(),
		Reconciled: c.reconciled(),
		Labels:     c.labels(),
		Symbols:    symbolsIn(allSteps(r)...),
		Governing:  governing(byKind(c.tell())),
		Questions:  c.questions(),
		Answered:   c.answered(),
		NotChecked: notChecked(d),
		Cautions:   sheetCautions,
		Signatures: []string{"Prepared", "Checked", "Approved"},
	}
	return p
}

// job is the title strip: what is not stated leaves a line to write on.
func (c *composer) job() []views.Row {
	j := &c.d.Job
	rows := []views.Row{
		{Name: "Client", Value: j.Client},
		{Name: "Address", Value: j.Address},
		{Name: "Authority having jurisdiction", Value: j.Authority},
		{Name: "Permit number", Value: j.PermitNumber},
		{Name: "Prepared by", Value: j.Preparer},
		{Name: "Licence", Value: j.Licence},
		{Name: "Code", Value: rulebookName(c.d.Rulebook)},
		{Name: "Structure", Value: structureName(c.d.Site.Structure)},
		{Name: "Array", Value: c.arraySize()},
	}
	if j.Note != "" {
		rows = append(rows, views.Row{Name: "Note", Value: j.Note})
	}
	return rows
}

// arraySize tells modules, DC power and, where every inverter states one, AC rating.
func (c *composer) arraySize() string {
	if len(c.d.Strings) == 0 {
		return "nothing strung yet"
	}
	s := countedExact(c.modulesOf(everyString), "module", "modules") + ", " + kilowatts(c.powerOf(everyString)) + " DC"
	ac := quantity.Int(0)
	for i := range c.d.Inverters {
		v := &c.d.Inverters[i]
		if v.ACRatedW == nil {
			return s
		}
		ac = ac.Add(v.ACRatedW.Mul(quantity.Int(v.Quantity)))
	}
	return s + ", " + kilowatts(ac) + " AC"
}

// kilowatts shows watts in kW with every digit: a watt is its third decimal.
func kilowatts(w quantity.Exact) string {
	return withUnit(shown(w.Quo(quantity.Int(1000)), 3, quantity.Up), "kW")
}

func everyString(*design.StringEntry) bool { return true }

// modulesOf adds the modules of strings entries.
func (c *composer) modulesOf(which func(*design.StringEntry) bool) quantity.Exact {
	sum := quantity.Int(0)
	for i := range c.d.Strings {
		if s := &c.d.Strings[i]; which(s) {
			sum = sum.Add(modulesIn(s))
		}
	}
	return sum
}

func modulesIn(s *design.StringEntry) quantity.Exact {
	return quantity.Int(s.ModulesInSeries).Mul(quantity.Int(s.StringsInParallel))
}

// strung adds the strings of strings entries.
func (c *composer) strung(which func(*design.StringEntry) bool) quantity.Exact {
	sum := quantity.Int(0)
	for i := range c.d.Strings {
		if s := &c.d.Strings[i]; which(s) {
			sum = sum.Add(quantity.Int(s.StringsInParallel))
		}
	}
	return sum
}

// powerOf adds the stated power of modules, W at STC.
func (c *composer) powerOf(which func(*design.StringEntry) bool) quantity.Exact {
	sum := quantity.Int(0)
	for i := range c.d.Strings {
		s := &c.d.Strings[i]
		if !which(s) {
			continue
		}
		if m := c.d.Module(c.planeOfString(i).Module); m != nil {
			sum = sum.Add(m.PmaxW.Mul(modulesIn(s)))
		}
	}
	return sum
}

// equipment lists every value used, with where it came from.
func (c *composer) equipment() []views.Equipment {
	inv := takeInventory(c.d)
	var out []views.Equipment
	for i, p := range inv.modules {
		out = append(out, c.table("Module "+c.d.Modules[i].ID+": "+p.name+", at STC", p))
	}
	for i, p := range inv.inverters {
		out = append(out, c.table("Inverter "+c.d.Inverters[i].ID+": "+p.name, p))
		out = append(out, c.trackerTables(i, inv.trackers[i])...)
	}
	for i, p := range inv.planes {
		t := c.table(p.name, p)
		if m := c.d.Module(c.d.Planes[i].Module); m != nil {
			t.Rows = append([]views.Row{{Name: "Module", Value: c.module(m)}}, t.Rows...)
		}
		out = append(out, t)
	}
	if len(inv.others.fields) > 0 {
		t := c.table(inv.others.name, inv.others)
		for i := range t.Rows {
			if t.Rows[i].Note == "" {
				t.Rows[i].Note = c.d.OtherLimits[i].Source
			}
		}
		out = append(out, t)
	}
	return out
}

// trackerTables lists the trackers of one inverter; equal ones are listed once.
func (c *composer) trackerTables(inverter int, parts []part) []views.Equipment {
	type group struct {
		table views.Equipment
		ids   []string
	}
	var groups []group
	for i, p := range parts {
		t := c.table("", p)
		known := false
		for j := range groups {
			if sameTable(groups[j].table, t) {
				known = true
				groups[j].ids = append(groups[j].ids, c.d.Inverters[inverter].Trackers[i].ID)
			}
		}
		if !known {
			groups = append(groups, group{t, []string{c.d.Inverters[inverter].Trackers[i].ID}})
		}
	}
	var out []views.Equipment
	for _, g := range groups {
		g.table.Caption = "Inverter " + c.d.Inverters[inverter].ID + ", " + c.trackerRange(c.d.Inverters[inverter].ID, g.ids)
		if len(g.ids) > 1 {
			g.table.Caption += ", each"
		}
		out = append(out, g.table)
	}
	return out
}

func sameTable(a, b views.Equipment) bool {
	if len(a.Rows) != len(b.Rows) || a.NotStated != b.NotStated {
		return false
	}
	for i := range a.Rows {
		if a.Rows[i] != b.Rows[i] {
			return false
		}
	}
	return true
}

func (c *composer) table(caption string, p part) views.Equipment {
	t := views.Equipment{Caption: caption}
	var missing []string
	for _, f := range p.fields {
		if f.value == "" {
			missing = append(missing, f.name)
			continue
		}
		t.Rows = append(t.Rows, views.Row{Name: capital(f.name), Value: f.value, Note: source(c.d, f.pointer)})
	}
	t.NotStated = list(missing)
	return t
}

// schedule is a row for each strings entry.
func (c *composer) schedule() []views.ScheduleRow {
	var rows []views.ScheduleRow
	for i := range c.r.Strings {
		s := &c.r.Strings[i]
		row := views.ScheduleRow{
			Number:     "S" + strconv.Itoa(i+1),
			Plane:      s.Plane,
			Faces:      c.faces(s.Plane),
			Inverter:   c.unitMark(s.Inverter, s.Unit),
			Tracker:    s.Tracker,
			InSeries:   strconv.FormatInt(s.ModulesInSeries, 10),
			Parallel:   strconv.FormatInt(s.StringsInParallel, 10),
			Modules:    stated(modulesIn(&c.d.Strings[i])),
			VocCold:    shown(s.VocColdV, placesString, quantity.Up),
			VmpSTC:     shown(s.VmpSTCV, placesString, quantity.Nearest),
			VmpHot:     shown(s.VmpHotV, placesString, quantity.Down),
			MaxCurrent: shown(s.MaxCurrentA, placesAmpere, quantity.Up),
			Verdict:    verdict(s.Verdict),
		}
		rows = append(rows, row)
	}
	return rows
}

// faces tells tilt and azimuth of a plane.
func (c *composer) faces(id string) string {
	p := c.planeByID(id)
	if p == nil || p.TiltDeg == nil && p.AzimuthDeg == nil {
		return "not stated"
	}
	tilt, azimuth := "tilt not stated", "azimuth not stated"
	if p.TiltDeg != nil {
		tilt = stated(*p.TiltDeg) + "°"
	}
	if p.AzimuthDeg != nil {
		azimuth = stated(*p.AzimuthDeg) + "°"
	}
	return tilt + " / " + azimuth
}

// unitMark names one installed inverter shortly: "i1", "i1 unit 2".
func (c *composer) unitMark(inverter string, unit int64) string {
	if v := c.inverterByID(inverter); v != nil && v.Quantity > 1 {
		return inverter + " unit" + nbsp + strconv.FormatInt(unit, 10)
	}
	return inverter
}

// totals adds the schedule by plane, by tracker, by inverter and over all.
func (c *composer) totals() []views.TotalRow {
	if len(c.d.Strings) == 0 {
		return nil
	}
	total := func(of, room string, which func(*design.StringEntry) bool) views.TotalRow {
		return views.TotalRow{
			Of:      of,
			Strings: stated(c.strung(which)),
			Modules: stated(c.modulesOf(which)),
			Power:   kilowatts(c.powerOf(which)),
			Room:    room,
		}
	}
	var rows []views.TotalRow
	for i := range c.d.Planes {
		p := &c.d.Planes[i]
		rows = append(rows, total(capital(c.plane(p.ID)), "of "+counted(p.Positions, "place", "places"),
			func(s *design.StringEntry) bool { return s.Plane == p.ID }))
	}
	for _, t := range c.inUse() {
		k, _ := c.trackerByID(t.inverter, t.tracker)
		rows = append(rows, total("Inverter "+c.unitMark(t.inverter, t.unit)+", tracker "+t.tracker, "on "+counted(k.Inputs, "input", "inputs"),
			func(s *design.StringEntry) bool {
				return s.Inverter == t.inverter && s.Unit == t.unit && s.Tracker == t.tracker
			}))
	}
	for _, u := range c.unitsInUse() {
		room := ""
		if v := c.inverterByID(u.inverter); v.MaxDCPowerW != nil {
			room = "of " + kilowatts(*v.MaxDCPowerW)
			if v.MaxDCPowerIs == design.PowerAdvice {
				room += ", advice"
			}
		}
		rows = append(rows, total("Inverter "+c.unitMark(u.inverter, u.unit), room,
			func(s *design.StringEntry) bool { return s.Inverter == u.inverter && s.Unit == u.unit }))
	}
	all := total("All", "", everyString)
	all.All = true
	return append(rows, all)
}

// unitsInUse returns the inverter units that strings are on.
func (c *composer) unitsInUse() []terminal {
	var all []terminal
	for _, t := range c.inUse() {
		all = appendNew(all, terminal{inverter: t.inverter, unit: t.unit})
	}
	return all
}

// reconciled adds the modules four ways and says whether they agree: the schedule,
// the planes as the engine counted them, the trackers and the inverters.
func (c *composer) reconciled() string {
	if len(c.d.Strings) == 0 {
		return ""
	}
	all := c.modulesOf(everyString)
	var planes, trackers, inverters []quantity.Exact
	for i := range c.r.Checks {
		if k := &c.r.Checks[i]; k.ID == "places" && k.Value != nil {
			planes = append(planes, *k.Value)
		}
	}
	for _, t := range c.inUse() {
		trackers = append(trackers, c.modulesOf(func(s *design.StringEntry) bool {
			return s.Inverter == t.inverter && s.Unit == t.unit && s.Tracker == t.tracker
		}))
	}
	for _, u := range c.unitsInUse() {
		inverters = append(inverters, c.modulesOf(func(s *design.StringEntry) bool { return s.Inverter == u.inverter && s.Unit == u.unit }))
	}
	s := "Modules by plane " + addition(planes) + ", by tracker " + addition(trackers) + ", by inverter " + addition(inverters) + ", in the schedule " + stated(all)
	for _, ways := range [][]quantity.Exact{planes, trackers, inverters} {
		if !added(ways).Equal(all) {
			return s + ". THESE DO NOT AGREE: do not use this sheet."
		}
	}
	return s + ": they agree."
}

func added(parts []quantity.Exact) quantity.Exact {
	sum := quantity.Int(0)
	for _, p := range parts {
		sum = sum.Add(p)
	}
	return sum
}

// addition writes a sum: "24 + 13 = 37"; a long one by its result alone.
func addition(parts []quantity.Exact) string {
	total := stated(added(parts))
	if len(parts) < 2 || len(parts) > 8 {
		return total
	}
	words := make([]string, len(parts))
	for i, p := range parts {
		words[i] = stated(p)
	}
	return strings.Join(words, " + ") + " = " + total
}

// labels tells what the label of the DC voltage must say.
func (c *composer) labels() []views.Row {
	if len(c.r.Strings) == 0 {
		return nil
	}
	highest := c.r.Strings[0].VocColdV
	for i := range c.r.Strings {
		highest = quantity.Max(highest, c.r.Strings[i].VocColdV)
	}
	row := views.Row{Name: "Maximum DC voltage", Value: withUnit(shown(highest, 0, quantity.Up), "V"), Note: "the highest of all strings, rounded up to a whole volt"}
	switch c.d.Rulebook {
	case "nec-2017", "nec-2020":
		row.Note += "; NEC" + nbsp + "690.53"
	case "nec-2023", "nec-2026":
		row.Note += "; NEC" + nbsp + "690.7(D)"
	}
	return []views.Row{row}
}

// governing keeps of every kind the case that governs, with its working, and of the
// others those that are not within, by their sentence. The rest is counted.
func governing(all []views.CheckKind) []views.CheckKind {
	out := make([]views.CheckKind, len(all))
	for i, k := range all {
		kept := []views.Check{k.Checks[0]}
		var rest int64
		for _, other := range k.Checks[1:] {
			if other.Verdict == "within" {
				rest++
				continue
			}
			other.Steps, other.Turns, other.Shown, other.Limit, other.Cites = nil, nil, "", "", ""
			kept = append(kept, other)
		}
		k.Checks = kept
		if rest > 0 {
			k.Rest = capital(counted(rest, "further case", "further cases")) + " of this kind " + isOrAre(rest, "is", "are") + " within; the whole working shows " + isOrAre(rest, "it", "them") + "."
		}
		out[i] = k
	}
	return out
}
