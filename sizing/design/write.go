package design

import (
	"strconv"

	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// AppendJSON appends the canonical JSON of a design, on one line: the fields in
// the order of the format page, numbers as plain decimals, units as the design
// has them. What was not stated is left out; a field with a default word or count
// (voltage_method, short_circuit_basis, quantity, and max_dc_power_is beside
// max_dc_power_w) is written out, so that a document kept for years says by
// itself what it was judged by. Reading the text gives an equal design, and
// writing that gives the same text.
func AppendJSON(dst []byte, d *Design) []byte {
	w := writer{dst: append(dst, '{')}
	w.text("format", Format)
	w.text("title", d.Title)
	w.text("rulebook", d.Rulebook)
	w.text("voltage_method", d.VoltageMethod)
	w.text("short_circuit_basis", d.ShortCircuitBasis)
	w.name("site")
	w.site(&d.Site)
	writeList(&w, "modules", d.Modules, w.module)
	writeList(&w, "inverters", d.Inverters, w.inverter)
	writeList(&w, "planes", d.Planes, w.plane)
	if d.Allowances != (Allowances{}) {
		w.name("allowances")
		w.allowances(&d.Allowances)
	}
	writeListIfAny(&w, "other_limits", d.OtherLimits, w.otherLimit)
	writeListIfAny(&w, "strings", d.Strings, w.stringEntry)
	if d.Job != (Job{}) {
		w.name("job")
		w.job(&d.Job)
	}
	if len(d.Sources) > 0 {
		w.name("sources")
		w.open('{')
		for _, s := range d.Sources {
			w.text(s.Pointer, s.From)
		}
		w.close('}')
	}
	writeListIfAny(&w, "answers", d.Answers, w.answer)
	w.close('}')
	return w.dst
}

// AppendFaults appends the faults as a JSON list, on one line.
func AppendFaults(dst []byte, faults Faults) []byte {
	w := writer{dst: append(dst, '[')}
	for _, f := range faults {
		w.comma()
		w.open('{')
		w.text("pointer", f.Pointer)
		w.text("found", f.Found)
		w.text("expected", f.Expected)
		w.text("detail", f.Detail)
		w.close('}')
	}
	w.close(']')
	return w.dst
}

// RefusalFormat is the value of the field "format" of a refusal.
const RefusalFormat = "rimeline-refusal/1"

// AppendRefusal appends, on one line, that the document k of an input, counted from 1, is refused.
func AppendRefusal(dst []byte, k int, faults Faults) []byte {
	w := writer{dst: append(dst, '{')}
	w.text("format", RefusalFormat)
	w.count("document", int64(k))
	w.name("errors")
	w.dst = AppendFaults(w.dst, faults)
	w.close('}')
	return w.dst
}

// writer appends JSON; commas come by themselves.
type writer struct{ dst []byte }

func (w *writer) open(bracket byte)  { w.dst = append(w.dst, bracket) }
func (w *writer) close(bracket byte) { w.dst = append(w.dst, bracket) }

// comma separates what follows from what stands before it on the same level.
func (w *writer) comma() {
	if last := w.dst[len(w.dst)-1]; last != '{' && last != '[' {
		w.dst = append(w.dst, ',')
	}
}

func (w *writer) name(name string) {
	w.comma()
	w.dst = append(working.AppendJSONString(w.dst, name), ':')
}

func (w *writer) text(name, text string) {
	w.name(name)
	w.dst = working.AppendJSONString(w.dst, text)
}

func (w *writer) textIfAny(name, text string) {
	if text != "" {
		w.text(name, text)
	}
}

func (w *writer) count(name string, n int64) {
	w.name(name)
	w.dst = strconv.AppendInt(w.dst, n, 10)
}

func (w *writer) number(name string, x quantity.Exact) {
	w.name(name)
	w.dst = appendNumber(w.dst, x)
}

func (w *writer) numberIfStated(name string, x *quantity.Exact) {
	if x != nil {
		w.number(name, *x)
	}
}

func (w *writer) measured(name string, x quantity.Exact, unit string) {
	w.name(name)
	w.open('{')
	w.number("value", x)
	w.text("unit", unit)
	w.close('}')
}

func (w *writer) temperature(name string, t Temperature) {
	switch {
	case t.Fahrenheit:
		w.measured(name, t.Value, "°F")
	case t.Object:
		w.measured(name, t.Value, "°C")
	default:
		w.number(name, t.Value)
	}
}

func (w *writer) coefficient(name string, c *Coefficient) {
	if c != nil {
		w.measured(name, c.Value, c.UnitText)
	}
}

func writeList[T any](w *writer, name string, list []T, write func(*T)) {
	w.name(name)
	w.open('[')
	for i := range list {
		w.comma()
		w.open('{')
		write(&list[i])
		w.close('}')
	}
	w.close(']')
}

func writeListIfAny[T any](w *writer, name string, list []T, write func(*T)) {
	if len(list) > 0 {
		writeList(w, name, list, write)
	}
}

func (w *writer) site(s *Site) {
	w.open('{')
	w.text("name", s.Name)
	w.text("structure", s.Structure)
	w.temperature("coldest_c", s.Coldest)
	w.text("coldest_basis", s.ColdestBasis)
	w.temperature("hottest_c", s.Hottest)
	w.text("hottest_basis", s.HottestBasis)
	w.textIfAny("station", s.Station)
	w.numberIfStated("elevation_m", s.ElevationM)
	w.close('}')
}

func (w *writer) module(m *Module) {
	w.text("id", m.ID)
	w.moduleData(m)
}

func (w *writer) moduleData(m *Module) {
	w.textIfAny("maker", m.Maker)
	w.textIfAny("model", m.Model)
	w.text("technology", m.Technology)
	if m.CellsInSeries != nil {
		w.count("cells_in_series", *m.CellsInSeries)
	}
	w.number("pmax_w", m.PmaxW)
	w.number("voc_v", m.VocV)
	w.number("isc_a", m.IscA)
	w.number("vmp_v", m.VmpV)
	w.number("imp_a", m.ImpA)
	w.coefficient("voc_temp_coeff", &m.VocCoeff)
	w.coefficient("isc_temp_coeff", m.IscCoeff)
	w.coefficient("pmax_temp_coeff", m.PmaxCoeff)
	w.coefficient("vmp_temp_coeff", m.VmpCoeff)
	w.number("max_system_voltage_v", m.MaxSystemVoltageV)
	w.numberIfStated("max_series_fuse_a", m.MaxSeriesFuseA)
	w.numberIfStated("isc_marked_max_a", m.IscMarkedMaxA)
	w.numberIfStated("bifaciality", m.Bifaciality)
	if m.NOCT != nil {
		w.temperature("noct_c", *m.NOCT)
	}
	w.numberIfStated("length_mm", m.LengthMM)
	w.numberIfStated("width_mm", m.WidthMM)
}

func (w *writer) inverter(v *Inverter) {
	w.text("id", v.ID)
	w.inverterData(v)
}

func (w *writer) inverterData(v *Inverter) {
	w.textIfAny("maker", v.Maker)
	w.textIfAny("model", v.Model)
	w.count("quantity", v.Quantity)
	w.numberIfStated("ac_rated_w", v.ACRatedW)
	w.numberIfStated("max_dc_power_w", v.MaxDCPowerW)
	if v.MaxDCPowerW != nil || v.MaxDCPowerIs != PowerLimit {
		w.text("max_dc_power_is", v.MaxDCPowerIs)
	}
	w.number("max_dc_voltage_v", v.MaxDCVoltageV)
	w.numberIfStated("start_voltage_v", v.StartVoltageV)
	w.numberIfStated("back_feed_a", v.BackFeedA)
	writeList(w, "trackers", v.Trackers, w.tracker)
}

func (w *writer) tracker(t *Tracker) {
	w.text("id", t.ID)
	w.number("mppt_min_v", t.MPPTMinV)
	w.number("mppt_max_v", t.MPPTMaxV)
	w.numberIfStated("full_power_min_v", t.FullPowerMinV)
	w.numberIfStated("full_power_max_v", t.FullPowerMaxV)
	w.count("inputs", t.Inputs)
	w.number("max_input_current_a", t.MaxInputCurrentA)
	w.numberIfStated("max_input_current_per_input_a", t.MaxInputPerInputA)
	w.numberIfStated("max_short_circuit_current_a", t.MaxShortCircuitA)
	w.numberIfStated("max_short_circuit_current_per_input_a", t.MaxShortCircuitPerInputA)
	w.numberIfStated("string_fuse_a", t.StringFuseA)
}

func (w *writer) plane(p *Plane) {
	w.text("id", p.ID)
	w.text("module", p.Module)
	w.count("positions", p.Positions)
	w.temperature("hot_cell_rise_c", Temperature(p.HotCellRise))
	w.numberIfStated("tilt_deg", p.TiltDeg)
	w.numberIfStated("azimuth_deg", p.AzimuthDeg)
	w.numberIfStated("current_gain_pct", p.CurrentGainPct)
}

func (w *writer) allowances(a *Allowances) {
	w.open('{')
	w.numberIfStated("hot_voltage_pct", a.HotVoltagePct)
	w.numberIfStated("cold_voltage_pct", a.ColdVoltagePct)
	if a.HeadroomC != nil {
		w.temperature("headroom_c", Temperature(*a.HeadroomC))
	}
	w.close('}')
}

func (w *writer) otherLimit(l *OtherLimit) {
	w.text("name", l.Name)
	w.number("max_voltage_v", l.MaxVoltageV)
	w.text("source", l.Source)
}

func (w *writer) stringEntry(e *StringEntry) {
	w.text("inverter", e.Inverter)
	w.count("unit", e.Unit)
	w.text("tracker", e.Tracker)
	w.text("plane", e.Plane)
	w.count("modules_in_series", e.ModulesInSeries)
	w.count("strings_in_parallel", e.StringsInParallel)
}

func (w *writer) job(j *Job) {
	w.open('{')
	w.textIfAny("client", j.Client)
	w.textIfAny("address", j.Address)
	w.textIfAny("authority", j.Authority)
	w.textIfAny("permit_number", j.PermitNumber)
	w.textIfAny("preparer", j.Preparer)
	w.textIfAny("licence", j.Licence)
	w.textIfAny("note", j.Note)
	w.close('}')
}

func (w *writer) answer(a *Answer) {
	w.text("pointer", a.Pointer)
	w.name("value_asked")
	w.dst = append(w.dst, a.ValueAsked...)
	w.text("reason", a.Reason)
}

// appendNumber appends a number that came from a document so that a document can
// hold it again: in full, and with an exponent only where the plain decimal would
// have more digits than are read ([quantity.MaxDigits]).
func appendNumber(dst []byte, x quantity.Exact) []byte {
	start := len(dst)
	dst = x.AppendJSON(dst)
	if digits(dst[start:]) <= quantity.MaxDigits {
		return dst
	}
	shift, exponent := thirtyPlaces, "e-30"
	if quantity.Int(1).Less(x.Abs()) {
		shift, exponent = quantity.Int(1).Quo(thirtyPlaces), "e30"
	}
	return append(x.Mul(shift).AppendJSON(dst[:start]), exponent...)
}

var thirtyPlaces, _ = quantity.Parse("1e30")

func digits(number []byte) int {
	n := 0
	for _, c := range number {
		if '0' <= c && c <= '9' {
			n++
		}
	}
	return n
}
