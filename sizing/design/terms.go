package design

import (
	"strconv"

	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// Terms are the numbers of a design as terms of formulas: each knows its JSON
// Pointer and the bounds within which the reader accepts it, so that a turning
// point which no document could state is never offered. A number that is not
// stated is nil.
type Terms struct {
	Sheet            *working.Sheet // that they are written on
	Coldest, Hottest *working.Term  // °C
	ColdestInput     *working.Input
	ColdestAt25      quantity.Exact // 25 °C in the unit of ColdestInput
	Elevation        *working.Term  // m
	ColdPct, HotPct  *working.Term  // nil: not stated, no allowance
	Headroom         *working.Term  // °C; 3 where not stated
	Modules          []ModuleTerms
	Inverters        []InverterTerms
	Planes           []PlaneTerms
	OtherLimits      []*working.Term
	Strings          []StringTerms
}

// ModuleTerms are a module's numbers at STC.
type ModuleTerms struct {
	Pmax, Voc, Isc, Vmp, Imp           *working.Term
	VocCoeff, IscCoeff                 *CoefficientTerm
	PmaxCoeff, VmpCoeff                *CoefficientTerm
	Cells, MaxSystemVoltage            *working.Term
	MaxSeriesFuse, IscMarked, Bifacial *working.Term
	Length, Width                      *working.Term
	Suffix                             string // of the module\'s symbols, "" where there is only one module
	pointer                            string
}

// Pointer returns the JSON Pointer of one of the module's fields.
func (m *ModuleTerms) Pointer(field string) string { return m.pointer + field }

// CoefficientTerm is a temperature coefficient as a term.
type CoefficientTerm struct {
	Term *working.Term
	Unit CoefficientUnit
}

// PerC returns the coefficient in the rated value's unit per °C, as a formula on
// the rated value where the coefficient is a percentage of it.
func (c *CoefficientTerm) PerC(rated *working.Term) *working.Term {
	switch c.Unit {
	case PercentPerC:
		return c.Term.Over(working.Whole(100)).Times(rated)
	case MillivoltPerC, MilliamperePerC:
		return c.Term.Over(working.Whole(1000))
	}
	return c.Term
}

// InverterTerms are an inverter type's numbers.
type InverterTerms struct {
	MaxDCVoltage                *working.Term
	MaxDCPower, Start, BackFeed *working.Term
	Trackers                    []TrackerTerms
}

// TrackerTerms are a tracker's numbers.
type TrackerTerms struct {
	MPPTMin, MPPTMax, FullPowerMin, FullPowerMax *working.Term
	Inputs, MaxInput, MaxInputPerInput           *working.Term
	MaxShortCircuit, MaxShortCircuitPerInput     *working.Term
	StringFuse                                   *working.Term
}

// PlaneTerms are a roof plane's numbers.
type PlaneTerms struct {
	Positions *working.Term
	Rise      *working.Term // °C
	Gain      *working.Term // %; nil: not stated
	Suffix    string        // of the plane's symbols, "" where no line speaks of two planes
}

// StringTerms are the counts of a strings entry.
type StringTerms struct{ Series, Parallel *working.Term }

var (
	zero         = quantity.Int(0)
	hundred      = quantity.Int(100)
	lowestSiteC  = quantity.Int(-90)
	highestSiteC = quantity.Int(60)
	steepestPct  = quantity.Int(-1)
	flattestPct  = quantity.Ratio(-1, 20)
	defaultRoomC = quantity.Int(3)
)

// NewTerms returns the terms of a design.
func NewTerms(d *Design) *Terms {
	s := new(working.Sheet)
	t := &Terms{
		Sheet:       s,
		Modules:     make([]ModuleTerms, len(d.Modules)),
		Inverters:   make([]InverterTerms, len(d.Inverters)),
		Planes:      make([]PlaneTerms, len(d.Planes)),
		OtherLimits: make([]*working.Term, len(d.OtherLimits)),
		Strings:     make([]StringTerms, len(d.Strings)),
	}
	coldest, hottest := d.Site.Coldest.Celsius(), d.Site.Hottest.Celsius()
	t.Coldest, t.ColdestInput = temperatureTerm(s, "Tcold", "/site/coldest_c", d.Site.Coldest, lowestSiteC, quantity.Min(hottest, highestSiteC))
	t.Hottest, _ = temperatureTerm(s, "Thot", "/site/hottest_c", d.Site.Hottest, quantity.Max(coldest, lowestSiteC), highestSiteC)
	t.ColdestAt25 = quantity.Int(25)
	if d.Site.Coldest.Fahrenheit {
		t.ColdestAt25 = toFahrenheit(t.ColdestAt25)
	}
	t.Elevation = stated(s, "elevation", "m", "/site/elevation_m", d.Site.ElevationM, nil, nil)
	t.ColdPct = stated(s, "acold", "%", "/allowances/cold_voltage_pct", d.Allowances.ColdVoltagePct, &zero, nil)
	t.HotPct = stated(s, "ahot", "%", "/allowances/hot_voltage_pct", d.Allowances.HotVoltagePct, &zero, &hundred)
	if d.Allowances.HeadroomC != nil {
		t.Headroom = differenceTerm(s, "headroom", "/allowances/headroom_c", *d.Allowances.HeadroomC)
	} else {
		t.Headroom = working.Number(defaultRoomC)
	}
	for i := range d.Modules {
		t.Modules[i] = moduleTerms(s, &d.Modules[i], "/modules/"+strconv.Itoa(i)+"/", numbered(",m", i, len(d.Modules) > 1))
	}
	for i := range d.Inverters {
		t.Inverters[i] = inverterTerms(s, &d.Inverters[i], "/inverters/"+strconv.Itoa(i)+"/")
	}
	mixed := planesShareTracker(d)
	for i := range d.Planes {
		t.Planes[i] = planeTerms(s, &d.Planes[i], "/planes/"+strconv.Itoa(i)+"/", numbered(",p", i, mixed))
	}
	for i := range d.OtherLimits {
		o := &d.OtherLimits[i]
		t.OtherLimits[i] = positive(s, "Vother,"+strconv.Itoa(i+1), "V", "/other_limits/"+strconv.Itoa(i)+"/max_voltage_v", o.MaxVoltageV)
	}
	for i := range d.Strings {
		e, at := &d.Strings[i], "/strings/"+strconv.Itoa(i)+"/"
		suffix := numbered("", i, len(d.Strings) > 1)
		t.Strings[i] = StringTerms{
			Series:   count(s, "n"+suffix, at+"modules_in_series", e.ModulesInSeries),
			Parallel: count(s, "s"+suffix, at+"strings_in_parallel", e.StringsInParallel),
		}
	}
	return t
}

// numbered returns the end of a symbol that tells one of several apart, counted
// from 1; nothing where there is only one.
func numbered(mark string, i int, several bool) string {
	if !several {
		return ""
	}
	return mark + strconv.Itoa(i+1)
}

// planesShareTracker reports whether a tracker carries strings of several planes,
// so that one line of work may speak of two.
func planesShareTracker(d *Design) bool {
	type tracker struct {
		inverter, tracker string
		unit              int64
	}
	plane := map[tracker]string{}
	for _, s := range d.Strings {
		k := tracker{s.Inverter, s.Tracker, s.Unit}
		if p, ok := plane[k]; ok && p != s.Plane {
			return true
		}
		plane[k] = s.Plane
	}
	return false
}

func bounded(s *working.Sheet, symbol, unit, pointer string, now quantity.Exact, low, high *quantity.Exact) *working.Term {
	return s.Of(symbol, unit, &working.Input{Pointer: pointer, Now: now, Low: low, High: high})
}

func positive(s *working.Sheet, symbol, unit, pointer string, now quantity.Exact) *working.Term {
	return bounded(s, symbol, unit, pointer, now, &zero, nil)
}

func stated(s *working.Sheet, symbol, unit, pointer string, now *quantity.Exact, low, high *quantity.Exact) *working.Term {
	if now == nil {
		return nil
	}
	return bounded(s, symbol, unit, pointer, *now, low, high)
}

func count(s *working.Sheet, symbol, pointer string, now int64) *working.Term {
	return s.Of(symbol, "", &working.Input{Pointer: pointer, Now: quantity.Int(now), Whole: true})
}

// temperatureTerm returns a temperature in °C, by its conversion where the
// document states °F, and the input itself. The bounds are in °C.
func temperatureTerm(s *working.Sheet, symbol, pointer string, t Temperature, low, high quantity.Exact) (*working.Term, *working.Input) {
	if t.Object {
		pointer += "/value"
	}
	if !t.Fahrenheit {
		in := &working.Input{Pointer: pointer, Now: t.Value, Low: &low, High: &high}
		return s.Of(symbol, "°C", in), in
	}
	low, high = toFahrenheit(low), toFahrenheit(high)
	in := &working.Input{Pointer: pointer, Now: t.Value, Low: &low, High: &high}
	f := s.Of(symbol+",F", "°F", in)
	return working.Named(symbol, "°C", f.Minus(working.Whole(32)).Times(working.Whole(5)).Over(working.Whole(9))), in
}

func toFahrenheit(c quantity.Exact) quantity.Exact {
	return c.Mul(quantity.Ratio(9, 5)).Add(quantity.Int(32))
}

func moduleTerms(s *working.Sheet, m *Module, at, suffix string) ModuleTerms {
	vocLow, vocHigh := vocBounds(m)
	t := ModuleTerms{
		Pmax:             positive(s, "Pmax"+suffix, "W", at+"pmax_w", m.PmaxW),
		Voc:              bounded(s, "Voc"+suffix, "V", at+"voc_v", m.VocV, vocLow, vocHigh),
		Isc:              bounded(s, "Isc"+suffix, "A", at+"isc_a", m.IscA, &m.ImpA, nil),
		Vmp:              bounded(s, "Vmp"+suffix, "V", at+"vmp_v", m.VmpV, &zero, &m.VocV),
		Imp:              bounded(s, "Imp"+suffix, "A", at+"imp_a", m.ImpA, &zero, &m.IscA),
		MaxSystemVoltage: positive(s, "Vmodule,max"+suffix, "V", at+"max_system_voltage_v", m.MaxSystemVoltageV),
		MaxSeriesFuse:    stated(s, "Ifuse,module"+suffix, "A", at+"max_series_fuse_a", m.MaxSeriesFuseA, &zero, nil),
		IscMarked:        stated(s, "Isc,marked"+suffix, "A", at+"isc_marked_max_a", m.IscMarkedMaxA, &zero, nil),
		Bifacial:         stated(s, "φ"+suffix, "", at+"bifaciality", m.Bifaciality, nil, nil),
		Length:           stated(s, "length"+suffix, "mm", at+"length_mm", m.LengthMM, &zero, nil),
		Width:            stated(s, "width"+suffix, "mm", at+"width_mm", m.WidthMM, &zero, nil),
		Suffix:           suffix,
		pointer:          at,
	}
	low, high := voltageCoefficientBounds(m.VocCoeff.Unit, m.VocV)
	t.VocCoeff = coefficientTerm(s, "βVoc"+suffix, at+"voc_temp_coeff", &m.VocCoeff, low, high)
	if m.VmpCoeff != nil {
		low, high = voltageCoefficientBounds(m.VmpCoeff.Unit, m.VmpV)
		t.VmpCoeff = coefficientTerm(s, "βVmp"+suffix, at+"vmp_temp_coeff", m.VmpCoeff, low, high)
	}
	t.PmaxCoeff = coefficientTerm(s, "γPmax"+suffix, at+"pmax_temp_coeff", m.PmaxCoeff, nil, &zero)
	t.IscCoeff = coefficientTerm(s, "αIsc"+suffix, at+"isc_temp_coeff", m.IscCoeff, nil, nil)
	if m.CellsInSeries != nil {
		t.Cells = count(s, "Ncells"+suffix, at+"cells_in_series", *m.CellsInSeries)
	}
	return t
}

func coefficientTerm(s *working.Sheet, symbol, pointer string, c *Coefficient, low, high *quantity.Exact) *CoefficientTerm {
	if c == nil {
		return nil
	}
	return &CoefficientTerm{bounded(s, symbol, c.UnitText, pointer+"/value", c.Value, low, high), c.Unit}
}

// voltageCoefficientBounds returns the least and greatest value that the reader
// accepts for a voltage coefficient in its unit: −1.0 to −0.05 %/°C.
func voltageCoefficientBounds(unit CoefficientUnit, rated quantity.Exact) (low, high *quantity.Exact) {
	perPct := quantity.Int(1)
	switch unit {
	case VoltPerC:
		perPct = rated.Quo(hundred)
	case MillivoltPerC:
		perPct = rated.Mul(quantity.Int(10))
	}
	return new(steepestPct.Mul(perPct)), new(flattestPct.Mul(perPct))
}

// vocBounds returns the bounds of Voc: above Vmp, and such that a coefficient in
// volts stays between −1.0 and −0.05 %/°C of it.
func vocBounds(m *Module) (low, high *quantity.Exact) {
	low = &m.VmpV
	if m.VocCoeff.Unit == PercentPerC {
		return low, nil
	}
	perC := m.VocCoeff.PerC(m.VocV).Mul(hundred)
	if steepest := perC.Quo(steepestPct); low.Less(steepest) {
		low = &steepest
	}
	return low, new(perC.Quo(flattestPct))
}

func inverterTerms(s *working.Sheet, v *Inverter, at string) InverterTerms {
	t := InverterTerms{
		MaxDCVoltage: positive(s, "Vinverter,max", "V", at+"max_dc_voltage_v", v.MaxDCVoltageV),
		MaxDCPower:   stated(s, "Pdc,max", "W", at+"max_dc_power_w", v.MaxDCPowerW, &zero, nil),
		Start:        stated(s, "Vstart", "V", at+"start_voltage_v", v.StartVoltageV, &zero, nil),
		BackFeed:     stated(s, "Iback", "A", at+"back_feed_a", v.BackFeedA, &zero, nil),
		Trackers:     make([]TrackerTerms, len(v.Trackers)),
	}
	for i := range v.Trackers {
		k, at := &v.Trackers[i], at+"trackers/"+strconv.Itoa(i)+"/"
		t.Trackers[i] = TrackerTerms{
			MPPTMin:                 bounded(s, "Vmppt,min", "V", at+"mppt_min_v", k.MPPTMinV, &zero, mppMinBelow(k)),
			MPPTMax:                 bounded(s, "Vmppt,max", "V", at+"mppt_max_v", k.MPPTMaxV, mppMaxAbove(k), nil),
			FullPowerMin:            stated(s, "Vfull,min", "V", at+"full_power_min_v", k.FullPowerMinV, &k.MPPTMinV, fullMinBelow(k)),
			FullPowerMax:            stated(s, "Vfull,max", "V", at+"full_power_max_v", k.FullPowerMaxV, fullMaxAbove(k), &k.MPPTMaxV),
			Inputs:                  count(s, "inputs", at+"inputs", k.Inputs),
			MaxInput:                positive(s, "Iin,max", "A", at+"max_input_current_a", k.MaxInputCurrentA),
			MaxInputPerInput:        stated(s, "Iin,max,1", "A", at+"max_input_current_per_input_a", k.MaxInputPerInputA, &zero, nil),
			MaxShortCircuit:         stated(s, "Isc,max", "A", at+"max_short_circuit_current_a", k.MaxShortCircuitA, &zero, nil),
			MaxShortCircuitPerInput: stated(s, "Isc,max,1", "A", at+"max_short_circuit_current_per_input_a", k.MaxShortCircuitPerInputA, &zero, nil),
			StringFuse:              stated(s, "Ifuse", "A", at+"string_fuse_a", k.StringFuseA, &zero, nil),
		}
	}
	return t
}

// The four bounds below keep the full-power window inside the MPPT window, as the reader demands.

func mppMinBelow(k *Tracker) *quantity.Exact {
	if k.FullPowerMinV != nil {
		return k.FullPowerMinV
	}
	if k.FullPowerMaxV != nil {
		return k.FullPowerMaxV
	}
	return &k.MPPTMaxV
}

func mppMaxAbove(k *Tracker) *quantity.Exact {
	if k.FullPowerMaxV != nil {
		return k.FullPowerMaxV
	}
	if k.FullPowerMinV != nil {
		return k.FullPowerMinV
	}
	return &k.MPPTMinV
}

func fullMinBelow(k *Tracker) *quantity.Exact {
	if k.FullPowerMaxV != nil {
		return k.FullPowerMaxV
	}
	return &k.MPPTMaxV
}

func fullMaxAbove(k *Tracker) *quantity.Exact {
	if k.FullPowerMinV != nil {
		return k.FullPowerMinV
	}
	return &k.MPPTMinV
}

func planeTerms(s *working.Sheet, p *Plane, at, suffix string) PlaneTerms {
	t := PlaneTerms{
		Positions: s.Of("positions", "", &working.Input{Pointer: at + "positions", Now: quantity.Int(p.Positions), Whole: true}),
		Gain:      stated(s, "gain"+suffix, "%", at+"current_gain_pct", p.CurrentGainPct, &zero, nil),
	}
	t.Suffix = suffix
	t.Rise = differenceTerm(s, "rise", at+"hot_cell_rise_c", p.HotCellRise)
	return t
}

// differenceTerm returns a difference of temperatures in °C, by its conversion where the document states °F.
func differenceTerm(s *working.Sheet, symbol, pointer string, d Difference) *working.Term {
	if d.Object {
		pointer += "/value"
	}
	if !d.Fahrenheit {
		return bounded(s, symbol, "°C", pointer, d.Value, &zero, nil)
	}
	f := bounded(s, symbol+",F", "°F", pointer, d.Value, &zero, nil)
	return working.Named(symbol, "°C", f.Times(working.Whole(5)).Over(working.Whole(9)))
}

// IsPercent reports whether the coefficient is a percentage of its rated value.
func (c *CoefficientTerm) IsPercent() bool { return c.Unit == PercentPerC }
