package design

import (
	"fmt"
	"strings"

	"rimeline/sizing/quantity"
)

// Bounds of the format page.
var (
	tableEnds         = quantity.Int(-40) // °C, the coldest row of the table of factors
	structures        = []string{StructureDwelling, StructureBuilding, StructureGround}
	coldestBases      = []string{ColdestMeanMinimum, ColdestRecordLow, BasisAuthority, BasisOther}
	hottestBases      = []string{HottestRecordHigh, HottestCooling2, HottestCooling04, BasisAuthority, BasisOther}
	voltageMethods    = []string{MethodCoefficient, MethodTable}
	shortCircuitBases = []string{BasisMaximum, BasisRated}
	powerKinds        = []string{PowerLimit, PowerAdvice}
)

// ids are the identifiers of one list.
type ids struct {
	what     string // what they name: "module"
	within   string // for trackers the inverter's id
	known    map[string]int32
	repeated map[string]bool
	complete bool // every element has one, so that an id not among them is dangling
}

// add records the id of an element, and a fault if another has it.
func (s *ids) add(r *reader, n int32, id string, index int32) {
	if s.known == nil {
		s.known = make(map[string]int32)
	}
	if _, taken := s.known[id]; taken {
		if s.repeated == nil {
			s.repeated = make(map[string]bool)
		}
		s.repeated[id] = true
		r.faultAt(n, quote(id)+" a second time", "an id that no other "+s.what+" has",
			fmt.Sprintf("Two %ss have the id %s; give each its own.", s.what, quote(id)))
		return
	}
	s.known[id] = index
}

// reference reads a field that names an element of another list. index is −1
// where it cannot be said which; there need not be a fault for that, as the list
// itself may be the faulty one.
func (o *object) reference(name, label string, s *ids) (id string, index int32) {
	id, n, ok := o.named(name, "Choose ", label)
	if !ok {
		return "", -1
	}
	index, found := s.known[id]
	switch {
	case found && !s.repeated[id]:
		return id, index
	case !found && s.complete:
		detail := fmt.Sprintf("No %s has the id %s.", s.what, quote(id))
		if s.within != "" {
			detail = fmt.Sprintf("Inverter %s has no %s with the id %s.", quote(s.within), s.what, quote(id))
		}
		o.r.faultAt(n, quote(id), "the id of one of the "+s.what+"s", detail)
	}
	return id, -1
}

// walk carries what one part of the document must know of another.
type walk struct {
	*reader
	d     *Design
	alone bool // one module or inverter is read, which has no id

	modules, inverters, planes ids
	trackers                   []ids  // by inverter
	quantities                 []bool // by inverter: its quantity can be relied on
	modulesUsed                []bool // by module: a plane uses it
}

// readDesign reads the document whose nodes the reader holds.
func (r *reader) readDesign() *Design {
	w := walk{reader: r, d: new(Design)}
	var o object
	if !o.open(r, 0, "a design") {
		return nil
	}
	d := w.d
	w.format(&o)
	d.Title, _ = o.text("title", "the title", must)
	d.Rulebook = o.word("rulebook", "the code edition", Rulebooks, "")
	methodAt := w.voltageMethod(&o)
	d.ShortCircuitBasis = o.word("short_circuit_basis", "the basis of the short-circuit comparison", shortCircuitBases, BasisMaximum)
	coldest := w.site(&o)
	w.readModules(&o)
	w.readInverters(&o)
	w.readPlanes(&o)
	w.allowances(&o)
	w.otherLimits(&o)
	w.strings(&o)
	w.job(&o)
	w.sources(&o)
	w.answers(&o)
	o.close()
	if d.VoltageMethod == MethodTable {
		w.tableApplies(methodAt, coldest)
	}
	return d
}

func (w *walk) format(o *object) {
	n, _ := o.find("format")
	switch {
	case n == 0:
		o.missing("format", quote(Format), "Enter the format, "+Format)
	case w.nodes[n].kind != isText || w.nodes[n].text != Format:
		w.faultAt(n, w.describe(n), quote(Format), fmt.Sprintf("Only documents of the format %s are read here.", Format))
	}
}

// voltageMethod returns the node of the method.
func (w *walk) voltageMethod(o *object) int32 {
	n, sound := o.find("voltage_method")
	switch {
	case n == 0:
		w.d.VoltageMethod = MethodCoefficient
	case w.nodes[n].kind == isText && w.nodes[n].text == MethodWeather:
		w.faultAt(n, quote(MethodWeather), listed(voltageMethods, "or"), "The weather method is not built yet; choose coefficient or table.")
	default:
		if method := w.word(n, "the voltage method", voltageMethods); sound {
			w.d.VoltageMethod = method
		}
	}
	return n
}

// site returns the coldest temperature, nil if it has a fault.
func (w *walk) site(parent *object) (coldest *Temperature) {
	o, ok := parent.inner("site", "the site", must)
	if !ok {
		return nil
	}
	s := &w.d.Site
	s.Name, _ = o.text("name", "the name of the site", must)
	s.Structure = o.word("structure", "the structure", structures, "")
	coldest = w.siteTemperature(&o, "coldest_c", "the coldest temperature")
	coldestAt := o.last
	s.ColdestBasis = o.word("coldest_basis", "what the coldest temperature rests on", coldestBases, "")
	hottest := w.siteTemperature(&o, "hottest_c", "the hottest temperature")
	s.HottestBasis = o.word("hottest_basis", "what the hottest temperature rests on", hottestBases, "")
	s.Station, _ = o.text("station", "the weather station", may)
	s.ElevationM = o.number("elevation_m", "the elevation", may, anyNumber)
	o.close()
	s.Coldest, s.Hottest = or(coldest, Temperature{}), or(hottest, Temperature{})
	if coldest != nil && hottest != nil && !coldest.Celsius().Less(hottest.Celsius()) {
		w.fault(coldestAt, o.pointer("coldest_c"), coldest.shown(), "below the hottest temperature, "+hottest.shown(),
			fmt.Sprintf("The coldest temperature must be below the hottest: %s is not below %s.", coldest.shown(), hottest.shown()))
	}
	return coldest
}

func (w *walk) siteTemperature(o *object, name, label string) *Temperature {
	t := o.temperature(name, label, must, anyNumber)
	if t == nil {
		return nil
	}
	if c := t.Celsius(); c.Less(lowestSiteC) || highestSiteC.Less(c) {
		w.fault(o.last, o.pointer(name), t.shown(), "a temperature from −90 to 60 °C",
			fmt.Sprintf("%s must lie from −90 to 60 °C (−130 to 140 °F): %s does not.", sentence(label), t.shown()))
		return nil
	}
	return t
}

// shown returns the temperature as it is shown in a fault, in the unit of the document.
func (t Temperature) shown() string {
	if t.Fahrenheit {
		return amount(t.Value.String(), "°F")
	}
	return amount(t.Value.String(), "°C")
}

func (w *walk) readModules(parent *object) {
	first, sound := parent.list("modules", "the modules", must, "module")
	w.modules = ids{what: "module", complete: sound && first != 0}
	w.d.Modules = elements(w.reader, first, w.module)
	w.modulesUsed = make([]bool, len(w.d.Modules))
}

func (w *walk) module(m *Module, n int32) {
	var o object
	if !o.open(w.reader, n, "a module") {
		w.modules.complete = false
		return
	}
	if !w.alone {
		m.ID = w.id(&o, &w.modules, n)
	}
	m.Maker, _ = o.text("maker", "the maker", may)
	m.Model, _ = o.text("model", "the model", may)
	m.Technology = o.word("technology", "the technology of the cells", Technologies, "")
	m.CellsInSeries = o.whole("cells_in_series", "the number of cells in series", may, 1)
	pmax := o.number("pmax_w", "the rated power (Pmax)", must, aboveZero)
	voc := o.number("voc_v", "the open-circuit voltage (Voc)", must, aboveZero)
	vocAt := o.last
	isc := o.number("isc_a", "the short-circuit current (Isc)", must, aboveZero)
	iscAt := o.last
	vmp := o.number("vmp_v", "the voltage at maximum power (Vmp)", must, aboveZero)
	imp := o.number("imp_a", "the current at maximum power (Imp)", must, aboveZero)
	vocCoeff := o.voltageCoefficient("voc_temp_coeff", "the temperature coefficient of Voc", must, voc)
	m.IscCoeff = o.coefficient("isc_temp_coeff", "the temperature coefficient of Isc", may, currentUnits)
	m.PmaxCoeff = o.fallingCoefficient("pmax_temp_coeff", "the temperature coefficient of Pmax", may, powerUnits)
	m.VmpCoeff = o.voltageCoefficient("vmp_temp_coeff", "the temperature coefficient of Vmp", may, vmp)
	maxSystem := o.number("max_system_voltage_v", "the maximum system voltage", must, aboveZero)
	m.MaxSeriesFuseA = o.number("max_series_fuse_a", "the maximum series fuse", may, aboveZero)
	m.IscMarkedMaxA = o.number("isc_marked_max_a", "the highest marked Isc", may, aboveZero)
	m.Bifaciality = o.number("bifaciality", "the bifaciality", may, zeroOrMore)
	m.NOCT = o.temperature("noct_c", "the nominal operating cell temperature", may, anyNumber)
	m.LengthMM = o.number("length_mm", "the length", may, aboveZero)
	m.WidthMM = o.number("width_mm", "the width", may, aboveZero)
	o.close()

	m.PmaxW, m.VocV, m.IscA, m.VmpV, m.ImpA = or(pmax, zero), or(voc, zero), or(isc, zero), or(vmp, zero), or(imp, zero)
	m.VocCoeff, m.MaxSystemVoltageV = or(vocCoeff, Coefficient{}), or(maxSystem, zero)
	w.above(&o, vocAt, "voc_v", "Voc", voc, "Vmp", vmp)
	w.above(&o, iscAt, "isc_a", "Isc", isc, "Imp", imp)
}

// above records that a value which must exceed another does not.
func (w *walk) above(o *object, at int32, name, symbol string, x *quantity.Exact, other string, y *quantity.Exact) {
	if x == nil || y == nil || y.Less(*x) {
		return
	}
	unit := unitOf(name)
	a, b := amount(x.String(), unit), amount(y.String(), unit)
	w.fault(at, o.pointer(name), a, fmt.Sprintf("more than %s, %s", other, b),
		fmt.Sprintf("%s must be above %s: %s is not above %s.", symbol, other, a, b))
}

// id reads the id of an element of a list.
func (w *walk) id(o *object, s *ids, element int32) string {
	id, n, ok := o.named("id", "Enter ", "an id for the "+s.what)
	if !ok {
		s.complete = false
		return ""
	}
	s.add(w.reader, n, id, w.nodes[element].index)
	return id
}

// coefficientUnits are the units that a coefficient may have, as they are listed to people.
type coefficientUnits struct {
	listed string
	units  []namedUnit
}

type namedUnit struct {
	before string // what stands before "/°C"
	unit   CoefficientUnit
}

var (
	voltageUnits = coefficientUnits{"%/°C, mV/°C or V/°C", []namedUnit{{"%", PercentPerC}, {"mV", MillivoltPerC}, {"V", VoltPerC}}}
	currentUnits = coefficientUnits{"%/°C, mA/°C or A/°C", []namedUnit{{"%", PercentPerC}, {"mA", MilliamperePerC}, {"A", AmperePerC}}}
	powerUnits   = coefficientUnits{"%/°C or W/°C", []namedUnit{{"%", PercentPerC}, {"W", WattPerC}}}
)

// find reads a unit word. A difference of 1 K is one of 1 °C, and some datasheets leave the degree sign out.
func (u *coefficientUnits) find(word string) (CoefficientUnit, bool) {
	before, after, _ := strings.Cut(word, "/")
	if after != "°C" && after != "K" && after != "C" {
		return 0, false
	}
	for _, known := range u.units {
		if known.before == before {
			return known.unit, true
		}
	}
	return 0, false
}

// coefficient reads a temperature coefficient; nil where it is left out or has a fault.
func (o *object) coefficient(name, label string, p presence, units coefficientUnits) *Coefficient {
	n, sound := o.find(name)
	if n == 0 {
		if p == must {
			o.missing(name, `{"value": …, "unit": …}`, "Enter "+label)
		}
		return nil
	}
	r := o.r
	var inner object
	if r.nodes[n].kind != isObject {
		r.faultAt(n, r.describe(n), `{"value": …, "unit": …}`, fmt.Sprintf("Say in which unit %s is: %s.", label, units.listed))
		return nil
	}
	inner.open(r, n, label)
	x := inner.number("value", label, must, anyNumber)
	un, unitSound := inner.find("unit")
	if un == 0 {
		inner.missing("unit", units.listed, "Choose the unit of "+label)
	}
	inner.close()
	if un == 0 {
		return nil
	}
	v := &r.nodes[un]
	unit, known := units.find(v.text)
	if v.kind != isText || !known {
		r.faultAt(un, r.describe(un), units.listed, fmt.Sprintf("The unit of %s must be %s.", label, units.listed))
		return nil
	}
	if x == nil || !sound || !unitSound {
		return nil
	}
	return &Coefficient{Value: *x, Unit: unit, UnitText: v.text}
}

// fallingCoefficient reads a coefficient that must be negative.
func (o *object) fallingCoefficient(name, label string, p presence, units coefficientUnits) *Coefficient {
	c := o.coefficient(name, label, p, units)
	if c == nil || c.Value.Sign() < 0 {
		return c
	}
	found := amount(c.Value.String(), c.UnitText)
	o.r.fault(o.last, o.pointer(name), found, "a negative number",
		fmt.Sprintf("%s must be negative, for it falls as the cell gets warmer: %s is not.", sentence(label), found))
	return nil
}

// voltageCoefficient reads the coefficient of a rated voltage, which may itself be nil for a fault.
func (o *object) voltageCoefficient(name, label string, p presence, rated *quantity.Exact) *Coefficient {
	c := o.fallingCoefficient(name, label, p, voltageUnits)
	if c == nil || c.Unit != PercentPerC && rated == nil {
		return c
	}
	percent := c.PercentOf(or(rated, zero))
	away := quantity.Down // so that the rounded number lies outside the range too
	switch {
	case percent.Less(steepestPct):
	case flattestPct.Less(percent):
		away = quantity.Up
	default:
		return c
	}
	found := amount(c.Value.String(), c.UnitText)
	if c.Unit != PercentPerC {
		text, exact := percent.Fixed(4, away)
		about := ", which is "
		if !exact {
			about = ", which is about "
		}
		found += about + amount(text, "%/°C")
	}
	o.r.fault(o.last, o.pointer(name), found, "from −1.0 to −0.05 %/°C",
		fmt.Sprintf("%s must lie from −1.0 to −0.05 %%/°C: it is %s. Check the number and its unit.", sentence(label), found))
	return nil
}

func (w *walk) readInverters(parent *object) {
	first, sound := parent.list("inverters", "the inverters", must, "inverter")
	w.inverters = ids{what: "inverter", complete: sound && first != 0}
	w.d.Inverters = elements(w.reader, first, w.inverter)
}

func (w *walk) inverter(v *Inverter, n int32) {
	index := len(w.trackers)
	w.trackers = append(w.trackers, ids{})
	w.quantities = append(w.quantities, false)
	var o object
	if !o.open(w.reader, n, "an inverter") {
		w.inverters.complete = false
		return
	}
	if !w.alone {
		v.ID = w.id(&o, &w.inverters, n)
	}
	v.Maker, _ = o.text("maker", "the maker", may)
	v.Model, _ = o.text("model", "the model", may)
	units := o.whole("quantity", "the quantity", may, 1)
	w.quantities[index] = units != nil || !o.has("quantity")
	v.Quantity = or(units, 1)
	v.ACRatedW = o.number("ac_rated_w", "the rated AC power", may, aboveZero)
	v.MaxDCPowerW = o.number("max_dc_power_w", "the maximum DC power", may, aboveZero)
	v.MaxDCPowerIs = o.word("max_dc_power_is", "what the maximum DC power is", powerKinds, PowerLimit)
	v.MaxDCVoltageV = or(o.number("max_dc_voltage_v", "the maximum DC voltage", must, aboveZero), zero)
	v.StartVoltageV = o.number("start_voltage_v", "the start voltage", may, aboveZero)
	v.BackFeedA = o.number("back_feed_a", "the back-feed current", may, zeroOrMore)
	w.readTrackers(&o, v, &w.trackers[index])
	o.close()
}

func (w *walk) readTrackers(parent *object, v *Inverter, s *ids) {
	first, sound := parent.list("trackers", "the trackers", must, "tracker")
	*s = ids{what: "tracker", within: v.ID, complete: sound && first != 0}
	v.Trackers = elements(w.reader, first, func(t *Tracker, n int32) { w.tracker(t, s, n) })
}

func (w *walk) tracker(t *Tracker, s *ids, n int32) {
	var o object
	if !o.open(w.reader, n, "a tracker") {
		s.complete = false
		return
	}
	t.ID = w.id(&o, s, n)
	low := o.number("mppt_min_v", "the lowest MPPT voltage", must, aboveZero)
	lowAt := o.last
	high := o.number("mppt_max_v", "the highest MPPT voltage", must, aboveZero)
	t.FullPowerMinV = o.number("full_power_min_v", "the lowest voltage for full power", may, aboveZero)
	fullLowAt := o.last
	t.FullPowerMaxV = o.number("full_power_max_v", "the highest voltage for full power", may, aboveZero)
	fullHighAt := o.last
	inputs := o.whole("inputs", "the number of inputs", must, 1)
	maxInput := o.number("max_input_current_a", "the maximum input current", must, aboveZero)
	t.MaxInputPerInputA = o.number("max_input_current_per_input_a", "the maximum input current of one input", may, aboveZero)
	t.MaxShortCircuitA = o.number("max_short_circuit_current_a", "the maximum short-circuit current", may, aboveZero)
	t.MaxShortCircuitPerInputA = o.number("max_short_circuit_current_per_input_a", "the maximum short-circuit current of one input", may, aboveZero)
	t.StringFuseA = o.number("string_fuse_a", "the string fuse", may, aboveZero)
	o.close()

	t.MPPTMinV, t.MPPTMaxV, t.Inputs, t.MaxInputCurrentA = or(low, zero), or(high, zero), or(inputs, 0), or(maxInput, zero)
	w.notAbove(&o, lowAt, "mppt_min_v", "the lowest MPPT voltage", low, "the highest", high)
	w.notAbove(&o, fullLowAt, "full_power_min_v", "the lowest voltage for full power", t.FullPowerMinV, "the highest for it", t.FullPowerMaxV)
	if low != nil && high != nil && high.Less(*low) {
		return // no window to be inside of
	}
	w.inside(&o, fullLowAt, "full_power_min_v", "the lowest voltage for full power", t.FullPowerMinV, low, high)
	w.inside(&o, fullHighAt, "full_power_max_v", "the highest voltage for full power", t.FullPowerMaxV, low, high)
}

func (w *walk) notAbove(o *object, at int32, name, label string, low *quantity.Exact, than string, high *quantity.Exact) {
	if low == nil || high == nil || !high.Less(*low) {
		return
	}
	a, b := amount(low.String(), "V"), amount(high.String(), "V")
	w.fault(at, o.pointer(name), a, "no more than "+than+", "+b,
		fmt.Sprintf("%s must not be above %s: %s is above %s.", sentence(label), than, a, b))
}

// inside records that a voltage lies outside the MPPT window, either end of which may be nil for a fault.
func (w *walk) inside(o *object, at int32, name, label string, x, low, high *quantity.Exact) {
	switch {
	case x == nil:
		return
	case low != nil && x.Less(*low):
		a, b := amount(x.String(), "V"), amount(low.String(), "V")
		w.fault(at, o.pointer(name), a, "no less than the lowest MPPT voltage, "+b,
			fmt.Sprintf("%s must lie inside the MPPT window: %s is below %s.", sentence(label), a, b))
	case high != nil && high.Less(*x):
		a, b := amount(x.String(), "V"), amount(high.String(), "V")
		w.fault(at, o.pointer(name), a, "no more than the highest MPPT voltage, "+b,
			fmt.Sprintf("%s must lie inside the MPPT window: %s is above %s.", sentence(label), a, b))
	}
}

func (w *walk) readPlanes(parent *object) {
	first, sound := parent.list("planes", "the roof planes", must, "roof plane")
	w.planes = ids{what: "plane", complete: sound && first != 0}
	w.d.Planes = elements(w.reader, first, w.plane)
}

func (w *walk) plane(p *Plane, n int32) {
	var o object
	if !o.open(w.reader, n, "a plane") {
		w.planes.complete = false
		return
	}
	p.ID = w.id(&o, &w.planes, n)
	var module int32
	p.Module, module = o.reference("module", "the module of the plane", &w.modules)
	if module >= 0 {
		w.modulesUsed[module] = true
	}
	p.Positions = or(o.whole("positions", "the number of places", must, 0), 0)
	rise := o.temperature("hot_cell_rise_c", "the rise of the cell above the air", must, zeroOrMore)
	p.HotCellRise = Difference(or(rise, Temperature{}))
	p.TiltDeg = o.number("tilt_deg", "the tilt", may, anyNumber)
	p.AzimuthDeg = o.number("azimuth_deg", "the azimuth", may, anyNumber)
	p.CurrentGainPct = o.number("current_gain_pct", "the current gain", may, zeroOrMore)
	o.close()
}

func (w *walk) allowances(parent *object) {
	o, ok := parent.inner("allowances", "the allowances", may)
	if !ok {
		return
	}
	a := &w.d.Allowances
	a.HotVoltagePct = o.number("hot_voltage_pct", "the allowance off the hot voltage", may, zeroOrMore)
	if h := a.HotVoltagePct; h != nil && !h.Less(hundred) {
		found := amount(h.String(), "%")
		w.fault(o.last, o.pointer("hot_voltage_pct"), found, "less than 100 %",
			fmt.Sprintf("The allowance off the hot voltage must be below 100 %%: %s leaves no voltage.", found))
	}
	a.ColdVoltagePct = o.number("cold_voltage_pct", "the allowance onto the cold voltage", may, zeroOrMore)
	a.HeadroomC = (*Difference)(o.temperature("headroom_c", "the headroom", may, zeroOrMore))
	o.close()
}

func (w *walk) otherLimits(parent *object) {
	first, _ := parent.list("other_limits", "the other limits", may, "")
	w.d.OtherLimits = elements(w.reader, first, w.otherLimit)
}

func (w *walk) otherLimit(l *OtherLimit, n int32) {
	var o object
	if !o.open(w.reader, n, "a limit") {
		return
	}
	l.Name, _, _ = o.named("name", "Enter ", "the name of the part")
	l.MaxVoltageV = or(o.number("max_voltage_v", "the maximum voltage of the part", must, aboveZero), zero)
	l.Source, _ = o.text("source", "where the limit comes from", must)
	o.close()
}

func (w *walk) strings(parent *object) {
	first, _ := parent.list("strings", "the strings", may, "")
	w.d.Strings = elements(w.reader, first, w.stringEntry)
}

func (w *walk) stringEntry(e *StringEntry, n int32) {
	var o object
	if !o.open(w.reader, n, "an entry of strings") {
		return
	}
	var inverter int32
	e.Inverter, inverter = o.reference("inverter", "the inverter of the strings", &w.inverters)
	unit := o.whole("unit", "the unit of the inverter", must, 1)
	unitAt := o.last
	trackers := &ids{what: "tracker"}
	if inverter >= 0 {
		trackers = &w.trackers[inverter]
	}
	e.Tracker, _ = o.reference("tracker", "the tracker of the strings", trackers)
	e.Plane, _ = o.reference("plane", "the roof plane of the strings", &w.planes)
	e.Unit = or(unit, 0)
	e.ModulesInSeries = or(o.whole("modules_in_series", "the number of modules in series", must, 1), 0)
	e.StringsInParallel = or(o.whole("strings_in_parallel", "the number of strings in parallel", must, 1), 0)
	o.close()
	if unit == nil || inverter < 0 || !w.quantities[inverter] {
		return
	}
	if v := &w.d.Inverters[inverter]; *unit > v.Quantity {
		w.fault(unitAt, o.pointer("unit"), fmt.Sprint(*unit), fmt.Sprintf("a whole number from 1 to %d", v.Quantity),
			fmt.Sprintf("There is no unit %d: the quantity of inverter %s is %d.", *unit, quote(v.ID), v.Quantity))
	}
}

func (w *walk) job(parent *object) {
	o, ok := parent.inner("job", "the job", may)
	if !ok {
		return
	}
	j := &w.d.Job
	j.Client, _ = o.text("client", "the client", may)
	j.Address, _ = o.text("address", "the address", may)
	j.Authority, _ = o.text("authority", "the authority", may)
	j.PermitNumber, _ = o.text("permit_number", "the permit number", may)
	j.Preparer, _ = o.text("preparer", "the preparer", may)
	j.Licence, _ = o.text("licence", "the licence", may)
	j.Note, _ = o.text("note", "the note", may)
	o.close()
}

func (w *walk) sources(parent *object) {
	n, _ := parent.find("sources")
	if n == 0 {
		return
	}
	if w.nodes[n].kind != isObject {
		w.wrongKind(n, "the sources", "an object of texts by JSON Pointer")
		return
	}
	w.distinct(n)
	for i := w.nodes[n].first; i != 0 && !w.more; i = w.nodes[i].next {
		v := &w.nodes[i]
		if !isPointer(v.name) {
			w.faultAt(i, quote(v.name), aPointer, "A source belongs to a place of the design, named by a JSON Pointer such as /modules/0/voc_v.")
		}
		if v.kind != isText {
			w.wrongKind(i, "a source", "a text")
			continue
		}
		w.d.Sources = append(w.d.Sources, Source{v.name, v.text})
	}
}

const aPointer = "a JSON Pointer such as /modules/0/voc_v"

// isPointer reports whether s has the form of a JSON Pointer. It need not lead anywhere.
func isPointer(s string) bool {
	if s != "" && s[0] != '/' {
		return false
	}
	for i := range len(s) {
		if s[i] == '~' && (i+1 == len(s) || s[i+1] != '0' && s[i+1] != '1') {
			return false
		}
	}
	return true
}

func (w *walk) answers(parent *object) {
	first, _ := parent.list("answers", "the answers", may, "")
	w.d.Answers = elements(w.reader, first, w.answer)
}

func (w *walk) answer(a *Answer, n int32) {
	var o object
	if !o.open(w.reader, n, "an answer") {
		return
	}
	var at int32
	a.Pointer, at, _ = o.named("pointer", "Enter ", "the pointer of the question")
	if a.Pointer != "" && !isPointer(a.Pointer) {
		w.faultAt(at, quote(a.Pointer), aPointer, "An answer names its question by a JSON Pointer such as /modules/0/voc_v.")
	}
	a.ValueAsked = w.valueAsked(&o)
	a.Reason, _, _ = o.named("reason", "Enter ", "the reason of the answer")
	o.close()
}

// tableApplies records why the table of factors, chosen at n, cannot be used.
func (w *walk) tableApplies(n int32, coldest *Temperature) {
	if coldest != nil && coldest.Celsius().Less(tableEnds) {
		w.faultAt(n, "table, with a coldest temperature of "+coldest.shown(), "coefficient, or −40 °C and warmer",
			fmt.Sprintf("The table of factors ends at −40 °C, and the coldest temperature is %s; choose the method coefficient.", coldest.shown()))
	}
	for i := range w.d.Modules {
		m := &w.d.Modules[i]
		if w.modulesUsed[i] && m.Technology != "" && !m.CrystallineSilicon() {
			w.faultAt(n, "table, with a module of "+m.Technology, "coefficient, or modules of crystalline silicon",
				fmt.Sprintf("The table of factors is for crystalline silicon, and module %s is %s; choose the method coefficient.", quote(m.ID), m.Technology))
		}
	}
}
