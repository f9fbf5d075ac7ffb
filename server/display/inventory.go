package display

import (
	"strconv"
	"strings"

	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
)

// field is one number or word of the document: where it stands, what it is called
// and what it says.
type field struct {
	pointer string
	name    string // in words, such as "Voc"
	owner   string // whose it is where there are several, such as "TD-410M"; else ""
	value   string // as stated, with its unit; "" if not stated
	unit    string
	now     *quantity.Exact // the number as stated; nil for a word and where it is not stated
	whole   bool            // a count
	degree  bool            // a temperature, which a percentage says nothing about
	site    bool            // a temperature of the site, not a difference
	entry   bool            // of a strings entry
}

// called returns the field's name with its owner where it needs one.
func (f field) called() string {
	if f.owner == "" {
		return f.name
	}
	return f.name + " of " + f.owner
}

// part is the fields of one module, inverter, tracker, plane or of the site.
type part struct {
	name   string
	fields []field
}

// inventory lists every engineering value of a design, stated or not, in the order
// of the format page.
type inventory struct {
	site       part
	modules    []part
	inverters  []part
	trackers   [][]part // by inverter
	planes     []part
	allowances part
	others     part
	strings    []part
}

// listing collects the fields of one part.
type listing struct {
	part
	at, owner string
}

func (l *listing) add(leaf, name, value, unit string) *field {
	l.fields = append(l.fields, field{pointer: l.at + leaf, name: name, owner: l.owner, value: value, unit: unit})
	return &l.fields[len(l.fields)-1]
}

func (l *listing) number(leaf, name string, x quantity.Exact, unit string) {
	l.add(leaf, name, statedIn(x, unit), unit).now = &x
}

func (l *listing) optional(leaf, name string, x *quantity.Exact, unit string) {
	if x == nil {
		l.add(leaf, name, "", unit)
		return
	}
	l.number(leaf, name, *x, unit)
}

func (l *listing) count(leaf, name string, n int64) {
	l.add(leaf, name, strconv.FormatInt(n, 10), "").whole = true
}

func (l *listing) temperature(leaf, name string, t design.Temperature) {
	unit := "°C"
	if t.Fahrenheit {
		unit = "°F"
	}
	f := l.add(leaf, name, statedDegrees(t), unit)
	f.degree, f.site, f.now = true, true, &t.Value
}

func (l *listing) difference(leaf, name string, d design.Difference) {
	unit := "°C"
	if d.Fahrenheit {
		unit = "°F"
	}
	f := l.add(leaf, name, statedDifference(d), unit)
	f.degree, f.now = true, &d.Value
}

func (l *listing) coefficient(leaf, name string, c *design.Coefficient) {
	if c == nil {
		l.add(leaf, name, "", "")
		return
	}
	l.number(leaf, name, c.Value, c.UnitText)
}

// takeInventory lists the values of a design.
func takeInventory(d *design.Design) *inventory {
	inv := &inventory{site: siteFields(d)}
	owner := func(several bool, name string) string {
		if several {
			return name
		}
		return ""
	}
	bare := &names{d: d}
	for i := range d.Modules {
		name := bare.module(&d.Modules[i])
		inv.modules = append(inv.modules, moduleFields(&d.Modules[i], i, owner(len(d.Modules) > 1, name)))
	}
	several := len(d.Inverters) > 1
	for i := range d.Inverters {
		v := &d.Inverters[i]
		name := bare.inverter(v.ID)
		inv.inverters = append(inv.inverters, inverterFields(v, i, owner(several, name)))
		var trackers []part
		for k := range v.Trackers {
			of := owner(several || len(v.Trackers) > 1, v.Trackers[k].ID)
			if several {
				of += " of " + name
			}
			trackers = append(trackers, trackerFields(&v.Trackers[k], i, k, of))
		}
		inv.trackers = append(inv.trackers, trackers)
	}
	for i := range d.Planes {
		inv.planes = append(inv.planes, planeFields(&d.Planes[i], i, owner(len(d.Planes) > 1, "the "+bare.plane(d.Planes[i].ID))))
	}
	inv.allowances = allowanceFields(d)
	inv.others = otherFields(d)
	for i := range d.Strings {
		l := listing{at: "/strings/" + strconv.Itoa(i), owner: owner(len(d.Strings) > 1, stringsMark(i))}
		l.count("/modules_in_series", "modules in series", d.Strings[i].ModulesInSeries)
		l.count("/strings_in_parallel", "strings in parallel", d.Strings[i].StringsInParallel)
		for k := range l.fields {
			l.fields[k].entry = true
		}
		inv.strings = append(inv.strings, l.part)
	}
	return inv
}

func siteFields(d *design.Design) part {
	l := listing{part: part{name: "Site"}, at: "/site"}
	l.temperature("/coldest_c", "coldest temperature", d.Site.Coldest)
	l.add("/coldest_basis", "what the coldest temperature is", coldestBasisName(d.Site.ColdestBasis), "")
	l.temperature("/hottest_c", "hottest temperature", d.Site.Hottest)
	l.add("/hottest_basis", "what the hottest temperature is", hottestBasisName(d.Site.HottestBasis), "")
	l.optional("/elevation_m", "elevation", d.Site.ElevationM, "m")
	return l.part
}

func moduleFields(m *design.Module, i int, owner string) part {
	l := listing{part: part{name: equipmentName(m.Maker, m.Model, m.ID)}, at: "/modules/" + strconv.Itoa(i), owner: owner}
	l.add("/technology", "technology", technologyName(m.Technology), "")
	l.number("/pmax_w", "Pmax", m.PmaxW, "W")
	l.number("/voc_v", "Voc", m.VocV, "V")
	l.number("/isc_a", "Isc", m.IscA, "A")
	l.number("/vmp_v", "Vmp", m.VmpV, "V")
	l.number("/imp_a", "Imp", m.ImpA, "A")
	l.coefficient("/voc_temp_coeff", "Voc coefficient", &m.VocCoeff)
	l.coefficient("/vmp_temp_coeff", "Vmp coefficient", m.VmpCoeff)
	l.coefficient("/pmax_temp_coeff", "Pmax coefficient", m.PmaxCoeff)
	l.coefficient("/isc_temp_coeff", "Isc coefficient", m.IscCoeff)
	l.number("/max_system_voltage_v", "maximum system voltage", m.MaxSystemVoltageV, "V")
	l.optional("/max_series_fuse_a", "maximum series fuse", m.MaxSeriesFuseA, "A")
	l.optional("/isc_marked_max_a", "marked maximum Isc", m.IscMarkedMaxA, "A")
	l.optional("/bifaciality", "bifaciality", m.Bifaciality, "")
	if m.CellsInSeries != nil {
		l.count("/cells_in_series", "cells in series", *m.CellsInSeries)
	} else {
		l.add("/cells_in_series", "cells in series", "", "")
	}
	if m.NOCT != nil {
		l.temperature("/noct_c", "NOCT", *m.NOCT)
	} else {
		l.add("/noct_c", "NOCT", "", "°C")
	}
	l.optional("/length_mm", "length", m.LengthMM, "mm")
	l.optional("/width_mm", "width", m.WidthMM, "mm")
	return l.part
}

func equipmentName(maker, model, id string) string {
	if name := strings.TrimSpace(maker + " " + model); name != "" {
		return name
	}
	return id
}

func inverterFields(v *design.Inverter, i int, owner string) part {
	l := listing{part: part{name: equipmentName(v.Maker, v.Model, v.ID)}, at: "/inverters/" + strconv.Itoa(i), owner: owner}
	l.count("/quantity", "quantity", v.Quantity)
	l.number("/max_dc_voltage_v", "maximum DC voltage", v.MaxDCVoltageV, "V")
	l.optional("/start_voltage_v", "start voltage", v.StartVoltageV, "V")
	name := "maximum DC power"
	if v.MaxDCPowerIs == design.PowerAdvice {
		name += " (advice)"
	}
	l.optional("/max_dc_power_w", name, v.MaxDCPowerW, "W")
	l.optional("/ac_rated_w", "AC rating", v.ACRatedW, "W")
	l.optional("/back_feed_a", "back-feed of the inverter", v.BackFeedA, "A")
	return l.part
}

func trackerFields(t *design.Tracker, i, k int, owner string) part {
	l := listing{part: part{name: "Tracker " + t.ID}, at: "/inverters/" + strconv.Itoa(i) + "/trackers/" + strconv.Itoa(k), owner: owner}
	l.number("/mppt_min_v", "MPPT minimum", t.MPPTMinV, "V")
	l.number("/mppt_max_v", "MPPT maximum", t.MPPTMaxV, "V")
	l.optional("/full_power_min_v", "full-power minimum", t.FullPowerMinV, "V")
	l.optional("/full_power_max_v", "full-power maximum", t.FullPowerMaxV, "V")
	l.count("/inputs", "inputs", t.Inputs)
	l.number("/max_input_current_a", "maximum input current", t.MaxInputCurrentA, "A")
	l.optional("/max_input_current_per_input_a", "maximum current of one input", t.MaxInputPerInputA, "A")
	l.optional("/max_short_circuit_current_a", "short-circuit limit", t.MaxShortCircuitA, "A")
	l.optional("/max_short_circuit_current_per_input_a", "short-circuit limit of one input", t.MaxShortCircuitPerInputA, "A")
	l.optional("/string_fuse_a", "string fuse", t.StringFuseA, "A")
	return l.part
}

func planeFields(p *design.Plane, i int, owner string) part {
	l := listing{part: part{name: capital((&names{}).plane(p.ID))}, at: "/planes/" + strconv.Itoa(i), owner: owner}
	l.count("/positions", "places", p.Positions)
	l.difference("/hot_cell_rise_c", "cell above ambient", p.HotCellRise)
	l.optional("/tilt_deg", "tilt", p.TiltDeg, "°")
	l.optional("/azimuth_deg", "azimuth", p.AzimuthDeg, "°")
	l.optional("/current_gain_pct", "current gain", p.CurrentGainPct, "%")
	return l.part
}

func allowanceFields(d *design.Design) part {
	l := listing{part: part{name: "Allowances"}, at: "/allowances"}
	l.optional("/hot_voltage_pct", "allowance off the hot voltage", d.Allowances.HotVoltagePct, "%")
	l.optional("/cold_voltage_pct", "allowance onto the cold voltage", d.Allowances.ColdVoltagePct, "%")
	if d.Allowances.HeadroomC == nil {
		l.add("/headroom_c", "headroom asked for", "", "°C").degree = true
	} else {
		l.difference("/headroom_c", "headroom asked for", *d.Allowances.HeadroomC)
	}
	return l.part
}

func otherFields(d *design.Design) part {
	l := listing{part: part{name: "Other rated parts"}}
	for i, o := range d.OtherLimits {
		l.number("/other_limits/"+strconv.Itoa(i)+"/max_voltage_v", "limit of the "+o.Name, o.MaxVoltageV, "V")
	}
	return l.part
}

// stringsMark names a strings entry as the schedule does: S1, S2.
func stringsMark(i int) string { return "S" + strconv.Itoa(i+1) }

func inventoryByPointer(d *design.Design) map[string]field {
	inv := takeInventory(d)
	byPointer := map[string]field{}
	take := func(parts ...part) {
		for _, p := range parts {
			for _, f := range p.fields {
				byPointer[f.pointer] = f
			}
		}
	}
	take(inv.site, inv.allowances, inv.others)
	take(inv.modules...)
	take(inv.inverters...)
	for _, trackers := range inv.trackers {
		take(trackers...)
	}
	take(inv.planes...)
	take(inv.strings...)
	return byPointer
}

// field finds the field a pointer names; the number of a temperature or coefficient
// written as an object is that field's.
func (n *names) field(pointer string) (field, bool) {
	f, known := n.fields[strings.TrimSuffix(pointer, "/value")]
	return f, known
}

// call returns the words for a pointer; the pointer itself where it has none.
func (n *names) call(pointer string) string {
	if f, known := n.field(pointer); known {
		return f.called()
	}
	return pointer
}

// source returns where the document says that a value came from, "" if it does not.
func source(d *design.Design, pointer string) string {
	for _, s := range d.Sources {
		if s.Pointer == pointer {
			return s.From
		}
	}
	return ""
}

func technologyName(t string) string {
	switch t {
	case "mono-si":
		return "monocrystalline silicon"
	case "multi-si":
		return "multicrystalline silicon"
	case "cdte":
		return "cadmium telluride thin film"
	case "cigs":
		return "CIGS thin film"
	}
	return "another technology"
}

func coldestBasisName(b string) string {
	switch b {
	case design.ColdestMeanMinimum:
		return "annual extreme mean minimum"
	case design.ColdestRecordLow:
		return "record low"
	case design.BasisAuthority:
		return "required by the authority"
	}
	return "another statistic"
}

func hottestBasisName(b string) string {
	switch b {
	case design.HottestRecordHigh:
		return "record high"
	case design.HottestCooling2:
		return "2" + nbsp + "% cooling temperature"
	case design.HottestCooling04:
		return "0.4" + nbsp + "% cooling temperature"
	case design.BasisAuthority:
		return "required by the authority"
	}
	return "another statistic"
}

func structureName(s string) string {
	switch s {
	case design.StructureDwelling:
		return "one- or two-family dwelling"
	case design.StructureGround:
		return "ground-mounted, no DC circuit on or in a building"
	}
	return "building other than a one- or two-family dwelling"
}

func rulebookName(b string) string {
	if edition, isNEC := strings.CutPrefix(b, "nec-"); isNEC {
		return "NEC (NFPA" + nbsp + "70) " + edition
	}
	if b == "iec-62548-1" {
		return "IEC" + nbsp + "62548-1"
	}
	return b
}

func isNEC(d *design.Design) bool { return strings.HasPrefix(d.Rulebook, "nec-") }
