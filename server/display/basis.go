package display

import (
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/views"
)

// rounding is the rule by which numbers are shown; it is printed wherever they are.
const rounding = "Numbers are carried in full, without rounding, from what was typed to the verdict; a limit that is met exactly is kept. " +
	"In sentences and tables a value that must not exceed a limit is shown rounded up, and one that must reach a limit rounded down; the working shows it in full, or to 12 digits where it has no end."

// basis tells what the whole design rests on.
func (c *composer) basis() []views.Row {
	d := c.d
	rows := []views.Row{
		{Name: "Code", Value: rulebookName(d.Rulebook)},
		{Name: "Cold voltage", Value: c.methodName(), Note: c.methodNote()},
		{Name: "Structure", Value: structureName(d.Site.Structure), Note: "the strictest that any DC circuit is on or in"},
		{Name: "Coldest", Value: statedDegrees(d.Site.Coldest), Note: joinNote(coldestBasisName(d.Site.ColdestBasis), source(d, "/site/coldest_c"))},
		{Name: "Hottest", Value: statedDegrees(d.Site.Hottest), Note: joinNote(hottestBasisName(d.Site.HottestBasis), source(d, "/site/hottest_c"))},
	}
	if d.Site.Station != "" {
		rows = append(rows, views.Row{Name: "Station", Value: d.Site.Station})
	}
	if d.Site.ElevationM != nil {
		rows = append(rows, views.Row{Name: "Elevation", Value: statedIn(*d.Site.ElevationM, "m")})
	}
	for i := range d.Planes {
		p := &d.Planes[i]
		rows = append(rows, views.Row{
			Name:  "Cell above ambient, " + c.plane(p.ID),
			Value: statedDifference(p.HotCellRise),
			Note:  "hottest cell " + degrees(c.hottestCell(p), quantity.Nearest),
		})
	}
	rows = append(rows,
		views.Row{Name: "Allowance off the hot voltage", Value: allowance(d.Allowances.HotVoltagePct), Note: "ageing, mismatch, wire"},
		views.Row{Name: "Allowance onto the cold voltage", Value: allowance(d.Allowances.ColdVoltagePct)},
		views.Row{Name: "Headroom asked for", Value: headroomWished(d)},
		views.Row{Name: "Short-circuit basis", Value: basisName(d.ShortCircuitBasis), Note: "held against a tracker's short-circuit limit"},
	)
	return rows
}

func joinNote(a, b string) string {
	if b == "" {
		return a
	}
	return a + "; " + b
}

func allowance(pct *quantity.Exact) string {
	if pct == nil {
		return "none"
	}
	return statedIn(*pct, "%")
}

func headroomWished(d *design.Design) string {
	if d.Allowances.HeadroomC == nil {
		return "3" + nbsp + "°C, used where none is stated"
	}
	return statedDifference(*d.Allowances.HeadroomC)
}

func basisName(b string) string {
	if b == design.BasisRated {
		return "Isc with gain, without the 1.25"
	}
	return "Isc with gain × 1.25"
}

func (c *composer) methodName() string {
	switch c.d.VoltageMethod {
	case design.MethodTable:
		return "by the table of factors"
	case design.MethodWeather:
		return "by the weather method"
	}
	return "by the module's coefficient"
}

func (c *composer) methodNote() string {
	if !isNEC(c.d) {
		return ""
	}
	switch c.d.VoltageMethod {
	case design.MethodTable:
		return "690.7(A)(2)"
	case design.MethodWeather:
		return "690.7(A)(3)"
	}
	return "690.7(A)(1)"
}

// ceilings lists the limits of each ceiling; planes and trackers under one list are told once.
func (c *composer) ceilings(fittings []fitting) []views.Ceiling {
	var out []views.Ceiling
	var whose []fitting
	for _, f := range fittings {
		entries := c.ceilingEntries(f)
		known := false
		for i := range out {
			if sameEntries(out[i].Entries, entries) {
				known = true
				whose[i].planes = appendNew(whose[i].planes, f.planes...)
				whose[i].terminals = appendNew(whose[i].terminals, f.terminals...)
			}
		}
		if !known {
			out = append(out, views.Ceiling{Entries: entries})
			whose = append(whose, f)
		}
	}
	for i := range out {
		out[i].Where = c.where(whose[i])
	}
	return out
}

func appendNew[T comparable](list []T, more ...T) []T {
	out := append([]T(nil), list...)
	for _, m := range more {
		known := false
		for _, x := range out {
			known = known || x == m
		}
		if !known {
			out = append(out, m)
		}
	}
	return out
}

func (c *composer) ceilingEntries(f fitting) []views.CeilingEntry {
	var entries []views.CeilingEntry
	for _, e := range f.row.Ceiling {
		from := e.From
		switch e.From {
		case "inverter":
			from = "Inverter " + c.inverter(f.row.Inverter) + ", maximum DC voltage"
		case "module":
			from = "Module, maximum system voltage"
			if p := c.planeByID(f.row.Plane); p != nil {
				if m := c.d.Module(p.Module); m != nil {
					from = "Module " + c.module(m) + ", maximum system voltage"
				}
			}
		case "structure":
			from = capital(structureName(c.d.Site.Structure))
		}
		entries = append(entries, views.CeilingEntry{From: capital(from), Value: statedIn(e.MaxV, "V"), Source: e.Source, Governs: e.Governs})
	}
	return entries
}

func sameEntries(a, b []views.CeilingEntry) bool {
	if len(a) != len(b) {
		return false
	}
	for i := range a {
		if a[i] != b[i] {
			return false
		}
	}
	return true
}

// answered tells the questions that a reason closed.
func (c *composer) answered() []views.Row {
	var rows []views.Row
	for _, a := range c.d.Answers {
		open := false
		for _, q := range c.r.Questions {
			open = open || q.Pointer == a.Pointer && q.ValueAsked == string(a.ValueAsked)
		}
		if !open {
			rows = append(rows, views.Row{Name: capital(c.call(a.Pointer)), Value: a.Reason, Note: "asked at " + trueMinus(string(a.ValueAsked))})
		}
	}
	return rows
}
