package tests

import (
	"encoding/json"
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"slices"
	"strconv"
	"strings"
)

// draw makes random designs. What it makes obeys the fault rules of the format
// page, so that the reader must accept it.
//
// Half of the designs are sound: a good datasheet, lengths that fit, places enough,
// so that verdicts other than the worst are seen too.
type draw struct {
	*rand.Rand
	sound bool
}

// randomDesign is the design with a number: the same number, the same design.
func randomDesign(n uint64) []byte {
	d := draw{rand.New(rand.NewPCG(2, n)), n%2 == 0}
	doc := d.design()
	o := d.oracle(doc)
	if !d.chance(0.03) {
		d.wire(doc, o)
	}
	d.answer(doc, o)
	for d.chance(0.4) {
		d.sharpen(doc)
	}
	return documentText(doc)
}

func (d draw) chance(p float64) bool { return d.Float64() < p }

// ifSound is the first in a sound design, else the second.
func ifSound[T any](d draw, sound, otherwise T) T {
	if d.sound {
		return sound
	}
	return otherwise
}

func (d draw) pick(words ...string) string    { return words[d.IntN(len(words))] }
func (d draw) between(low, high int) int      { return low + d.IntN(high-low+1) }
func (d draw) real(low, high float64) float64 { return low + d.Float64()*(high-low) }

// decimal writes a number with some places, now and then in an unusual form.
func (d draw) decimal(x float64, places int) json.Number {
	text := strconv.FormatFloat(x, 'f', places, 64)
	switch {
	case d.chance(0.03) && places > 0:
		text += "0"
	case d.chance(0.03) && places == 0:
		text += ".0"
	case d.chance(0.02):
		text += "e0"
	case d.chance(0.02):
		text = strconv.FormatFloat(x*1000, 'f', max(places-3, 0), 64)
		text += "E-3"
	}
	return json.Number(text)
}

// within is a random number of some places between two bounds.
func (d draw) within(low, high float64, places int) json.Number {
	return d.decimal(d.real(low, high), places)
}

// whole is a random whole number, now and then written as 12.0.
func (d draw) whole(low, high int) json.Number { return d.decimal(float64(d.between(low, high)), 0) }

// maybe sets an optional field.
func (d draw) maybe(o object, p float64, name string, value func() any) {
	if d.chance(p) {
		o[name] = value()
	}
}

// ids are distinct names, some of them awkward.
func (d draw) ids(n int, stem string) []string {
	var ids []string
	for i := range n {
		ids = append(ids, fmt.Sprintf(d.pick("%s%d", "%s %d", "%s/%d", "~1%s\"%d", "é%s·%d"), stem, i+1))
	}
	return ids
}

func (d draw) temperature(celsius float64) any {
	if d.chance(0.3) {
		return object{"value": d.decimal(math.Round(celsius*9/5+32), 0), "unit": "°F"}
	}
	return d.decimal(celsius, d.between(0, 2))
}

func (d draw) difference(celsius float64) any {
	if d.chance(0.2) {
		return object{"value": d.decimal(celsius*9/5, d.between(0, 1)), "unit": "°F"}
	}
	return d.decimal(celsius, d.between(0, 1))
}

// rowEdges are temperatures at and beside the bounds of the table of cold factors.
var rowEdges = []json.Number{"25", "24.5", "24.99", "20", "19.9", "0", "-0.1", "-5", "-5.4", "-6", "-10", "-10.0001", "-25", "-35.5", "-39.99", "-40"}

func (d draw) design() object {
	doc := object{
		"format":   "rimeline-design/1",
		"title":    d.pick("Invented hall", "Invented barn", "Réseau inventé <3>"),
		"rulebook": d.pick("nec-2017", "nec-2020", "nec-2023", "nec-2026", "iec-62548-1"),
	}
	table := d.chance(0.3)
	if table {
		doc["voltage_method"] = "table"
	} else {
		d.maybe(doc, 0.5, "voltage_method", func() any { return "coefficient" })
	}
	d.maybe(doc, 0.6, "short_circuit_basis", func() any { return d.pick("maximum", "rated") })

	lowest := -50.0
	if table {
		lowest = -39
	} else if d.chance(0.03) {
		lowest = -88
	}
	coldest := d.real(lowest, 28)
	site := object{
		"name":          "Invented site",
		"structure":     d.pick("one-or-two-family-dwelling", "other-building", "ground-mounted"),
		"coldest_c":     d.temperature(coldest),
		"coldest_basis": d.pick("annual-extreme-mean-minimum", "record-low", ifSound(d, "record-low", "authority-required"), ifSound(d, "record-low", "other")),
		"hottest_c":     d.temperature(d.real(max(coldest+2, 29), 58)),
		"hottest_basis": d.pick("record-high", "cooling-2-percent", "cooling-0.4-percent", "authority-required", "other"),
	}
	if d.chance(0.15) {
		site["coldest_c"] = rowEdges[d.IntN(len(rowEdges))]
	}
	d.maybe(site, 0.5, "station", func() any { return "Invented airfield" })
	d.maybe(site, 0.5, "elevation_m", func() any {
		return ifSound(d, list{d.within(0, 1900, 0), json.Number("1999.9"), json.Number("2000")}, list{d.within(-50, 3500, 0), json.Number("2000"), json.Number("2000.5")})[d.IntN(3)]
	})
	doc["site"] = site

	moduleIDs := d.ids(1+d.few(3), "m")
	var modules list
	for _, id := range moduleIDs {
		modules = append(modules, d.module(id, table || d.sound))
	}
	doc["modules"] = modules

	var inverters list
	for _, id := range d.ids(1+d.few(2), "i") {
		inverters = append(inverters, d.inverter(id))
	}
	doc["inverters"] = inverters

	var planes list
	for _, id := range d.ids(1+d.few(4), "roof") {
		plane := object{
			"id":              id,
			"module":          d.pick(moduleIDs...),
			"positions":       d.whole(ifSound(d, 40, 0), ifSound(d, 300, 60)),
			"hot_cell_rise_c": d.difference(d.real(0, 45)),
		}
		d.maybe(plane, 0.7, "tilt_deg", func() any { return d.decimal(float64(d.between(0, 3)*10), 0) })
		d.maybe(plane, 0.7, "azimuth_deg", func() any { return d.decimal(float64(d.between(1, 3)*90), 0) })
		d.maybe(plane, 0.5, "current_gain_pct", func() any { return d.decimal(float64(d.between(0, 5)*4), d.between(0, 1)) })
		planes = append(planes, plane)
	}
	doc["planes"] = planes

	if d.chance(0.6) {
		allowances := object{}
		d.maybe(allowances, 0.6, "hot_voltage_pct", func() any { return d.within(0, 8, d.between(0, 1)) })
		d.maybe(allowances, 0.3, "cold_voltage_pct", func() any { return d.within(0, 4, d.between(0, 1)) })
		d.maybe(allowances, 0.4, "headroom_c", func() any { return d.difference(d.real(0, 8)) })
		doc["allowances"] = allowances
	}
	if d.chance(0.3) {
		others := list{}
		for i := range d.between(0, 2) {
			others = append(others, object{
				"name":          []string{"connectors", "switch"}[i],
				"max_voltage_v": json.Number(d.pick("600", "1000", "1000.0", "1500", "850")),
				"source":        "label (invented)",
			})
		}
		doc["other_limits"] = others
	}
	d.maybe(doc, 0.1, "job", func() any { return object{"client": "Invented client", "note": ""} })
	d.maybe(doc, 0.1, "sources", func() any { return object{"/modules/0/voc_v": "datasheet (invented)"} })
	return doc
}

// few is a small number up to most, small ones likelier.
func (d draw) few(most int) int {
	return min(int(d.ExpFloat64()*float64(most)/3), most)
}

func (d draw) module(id string, crystalline bool) object {
	cells := []int{54, 60, 66, 72, 96, 108, 120, 132, 144}[d.IntN(9)]
	junctions := cells
	if cells > 100 {
		junctions = cells / 2
	}
	voc := float64(junctions) * d.real(0.58, 0.74)
	vmp := voc * d.real(0.78, 0.86)
	imp := d.real(4, 18)
	m := object{
		"id":                   id,
		"technology":           d.pick("mono-si", "mono-si", "multi-si"),
		"max_system_voltage_v": json.Number(d.pick("600", "1000", "1500", "1500")),
	}
	if !crystalline && d.chance(0.2) {
		m["technology"] = d.pick("cdte", "cigs", "other")
	}
	places := d.between(0, 3)
	m["voc_v"], m["vmp_v"] = d.decimal(math.Ceil(voc), places), d.decimal(math.Floor(vmp), places)
	if places > 0 {
		m["voc_v"], m["vmp_v"] = d.decimal(voc, places), d.decimal(vmp, places)
	}
	m["imp_a"], m["isc_a"] = d.decimal(imp, 2), d.decimal(imp*d.real(1.03, 1.09)+0.01, 2)
	m["pmax_w"] = d.decimal(math.Round(vmp*imp), 0)

	// Doubtful datasheets, and some exactly at the edge of doubt.
	switch ifSound(d, -1, d.IntN(20)) {
	case 0:
		m["pmax_w"] = d.decimal(vmp*imp*d.real(0.9, 1.1), 1)
	case 1: // Vmp × Imp off by 2 % exactly
		m["pmax_w"], m["vmp_v"], m["imp_a"] = json.Number("400"), json.Number("40.8"), json.Number("10")
		m["voc_v"], m["isc_a"] = d.within(46, 52, 2), d.within(10.2, 11, 2)
	case 2: // fill factor of 0.88 or 0.50 exactly, or beside it
		m["voc_v"], m["isc_a"] = json.Number("50"), json.Number("10")
		m["vmp_v"], m["imp_a"] = json.Number("46.5"), json.Number("9.46")
		m["pmax_w"] = json.Number(d.pick("440", "440.01", "250", "249.9"))
	case 3: // 0.78 or 0.50 V a cell exactly, or beside it
		m["voc_v"] = json.Number(d.pick("46.8", "46.81", "49"))
		m["vmp_v"] = json.Number(d.pick("38", "40"))
		cells = 60
	case 4:
		m["voc_v"], m["vmp_v"] = json.Number(d.pick("30", "29.9")), json.Number("25.1")
		cells = 60
	default:
		d.maybe(m, 0.3, "length_mm", func() any { return d.within(900, 2400, 0) })
		d.maybe(m, 0.9, "width_mm", func() any { return d.within(900, 1300, 0) })
		cells = junctions
	}
	d.maybe(m, 0.6, "cells_in_series", func() any { return d.decimal(float64(cells), 0) })

	slope := d.real(-0.36, -0.22)
	if d.chance(ifSound(d, 0, 0.15)) {
		slope = []float64{-0.45, -0.451, -0.15, -0.149, -0.8, -0.07}[d.IntN(6)]
	}
	m["voc_temp_coeff"] = d.coefficient(m["voc_v"].(json.Number), slope, "V")
	d.maybe(m, 0.7, "isc_temp_coeff", func() any {
		alpha := d.real(0.02, 0.08)
		if d.chance(ifSound(d, 0.02, 0.1)) {
			alpha = -alpha
		}
		return d.coefficient(m["isc_a"].(json.Number), alpha, "A")
	})
	d.maybe(m, 0.6, "pmax_temp_coeff", func() any {
		gamma := d.real(-0.45, -0.26)
		if d.chance(0.4) {
			return object{"value": d.decimal(gamma*float(m["pmax_w"].(json.Number))/100, 2), "unit": "W/" + d.pick("°C", "K", "C")}
		}
		return object{"value": d.decimal(gamma, 2), "unit": "%/" + d.pick("°C", "K", "C")}
	})
	d.maybe(m, ifSound(d, 0.7, 0.35), "vmp_temp_coeff", func() any {
		return d.coefficient(m["vmp_v"].(json.Number), d.real(-0.48, -0.28), "V")
	})
	d.maybe(m, ifSound(d, 0.98, 0.7), "max_series_fuse_a", func() any { return json.Number(d.pick("15", "20", "25", "30", "35", "22.5")) })
	d.maybe(m, 0.2, "isc_marked_max_a", func() any { return d.within(8, 20, 2) })
	d.maybe(m, 0.3, "bifaciality", func() any { return json.Number(d.pick("0", ifSound(d, "0", "0.7"), "0.85")) })
	d.maybe(m, 0.3, "noct_c", func() any { return d.temperature(d.real(42, 48)) })
	d.maybe(m, 0.3, "maker", func() any { return "Invented works" })
	d.maybe(m, 0.3, "model", func() any { return "IW-1" })
	return m
}

func float(n json.Number) float64 {
	x, err := n.Float64()
	if err != nil {
		panic(err)
	}
	return x
}

// coefficient writes a percentage of a rated value in one of its units.
func (d draw) coefficient(rated json.Number, pct float64, unit string) object {
	perC := pct * float(rated) / 100
	per := "/" + d.pick("°C", "°C", "K", "C")
	switch d.IntN(4) {
	case 0:
		return object{"value": d.decimal(perC*1000, d.between(1, 3)), "unit": "m" + unit + per}
	case 1:
		return object{"value": d.decimal(perC, d.between(4, 6)), "unit": unit + per}
	}
	return object{"value": d.decimal(pct, 3), "unit": "%" + per}
}

func (d draw) inverter(id string) object {
	highest := []float64{600, 1000, 1000, 1100, 1500}[d.IntN(5)]
	inv := object{"id": id, "max_dc_voltage_v": d.decimal(highest, 0)}
	d.maybe(inv, 0.5, "quantity", func() any { return d.whole(1, 3) })
	d.maybe(inv, 0.3, "maker", func() any { return "Invented power" })
	d.maybe(inv, 0.3, "ac_rated_w", func() any { return d.whole(3000, 20000) })
	if d.chance(0.6) {
		inv["max_dc_power_w"] = d.whole(ifSound(d, 20000, 4000), 60000)
		d.maybe(inv, 0.5, "max_dc_power_is", func() any { return d.pick("limit", "advice") })
	} else {
		d.maybe(inv, 0.1, "max_dc_power_is", func() any { return "advice" })
	}
	d.maybe(inv, 0.6, "start_voltage_v", func() any { return d.within(60, ifSound(d, 150., 350), 0) })
	d.maybe(inv, 0.3, "back_feed_a", func() any { return json.Number(d.pick("0", "0.5", "3")) })
	var trackers list
	for _, id := range d.ids(1+d.few(3), "t") {
		bottom, top := d.real(50, ifSound(d, 120., 250)), highest*d.real(ifSound(d, 0.85, 0.6), 1)
		t := object{
			"id":                  id,
			"mppt_min_v":          d.decimal(bottom, 0),
			"mppt_max_v":          d.decimal(top, 0),
			"inputs":              d.whole(ifSound(d, 2, 1), 4),
			"max_input_current_a": d.within(ifSound(d, 20., 10), 50, d.between(0, 1)),
		}
		d.maybe(t, 0.5, "full_power_min_v", func() any { return d.decimal(bottom+2+d.real(0, min(ifSound(d, 40., 150), top*0.85-bottom)), 0) })
		d.maybe(t, 0.5, "full_power_max_v", func() any { return d.decimal(top*d.real(0.9, 0.99), 0) })
		d.maybe(t, ifSound(d, 0.97, 0.7), "max_short_circuit_current_a", func() any { return d.within(ifSound(d, 25., 12), 80, d.between(0, 1)) })
		d.maybe(t, 0.25, "max_input_current_per_input_a", func() any { return d.within(ifSound(d, 16., 8), 22, 1) })
		d.maybe(t, 0.25, "max_short_circuit_current_per_input_a", func() any { return d.within(ifSound(d, 22., 12), 30, 1) })
		d.maybe(t, 0.3, "string_fuse_a", func() any { return json.Number(d.pick("10", "15", "16", "20", "25", "30", "40")) })
		trackers = append(trackers, t)
	}
	inv["trackers"] = trackers
	return inv
}

// wire adds strings entries, of lengths near those that fit; in a sound design one
// to a tracker.
func (d draw) wire(doc object, o *oracleDesign) {
	n := 1 + d.few(4)
	if d.chance(0.03) {
		n = 12
	}
	var entries list
	taken := map[place]bool{}
	for range n {
		i := d.IntN(len(o.Inverters))
		inverter := &o.Inverters[i]
		tracker := &inverter.Trackers[d.IntN(len(inverter.Trackers))]
		plane := &o.Planes[d.IntN(len(o.Planes))]
		units := 1
		if quantity, ok := doc["inverters"].(list)[i].(object)["quantity"]; ok {
			units = int(float(quantity.(json.Number)))
		}
		unit := d.between(1, units)
		if on := trackerPlace(inverter.ID, strconv.Itoa(unit), tracker.ID); d.sound && taken[on] {
			continue
		} else {
			taken[on] = true
		}
		most, _ := o.circuit(plane, inverter, tracker).limits().maxModules.Float64()
		series := max(1, int(most)+d.between(ifSound(d, -4, -5), ifSound(d, -1, 1)))
		if d.chance(ifSound(d, 0, 0.2)) {
			series = d.between(1, 30)
		}
		entries = append(entries, object{
			"inverter":            inverter.ID,
			"unit":                d.decimal(float64(unit), 0),
			"tracker":             tracker.ID,
			"plane":               plane.ID,
			"modules_in_series":   d.decimal(float64(series), 0),
			"strings_in_parallel": d.whole(1, 1+d.few(ifSound(d, 2, 3))),
		})
		if d.chance(0.1) { // a string of the same length, it may be from another plane
			again := copyDocument(entries[len(entries)-1].(object))
			again["plane"] = o.Planes[d.IntN(len(o.Planes))].ID
			entries = append(entries, again)
		}
	}
	doc["strings"] = entries
}

func (d draw) oracle(doc object) *oracleDesign {
	o, err := readOracleDesign(documentText(doc))
	if err != nil {
		panic(err)
	}
	return o
}

// sharpen moves one limit so that a random entry meets it exactly, or misses it by
// one digit in the last place.
func (d draw) sharpen(doc object) {
	o := d.oracle(doc)
	entries := o.wire()
	if len(entries) == 0 {
		return
	}
	w := entries[d.IntN(len(entries))]
	n := w.series()
	inverter := slices.IndexFunc(o.Inverters, func(i oracleInverter) bool { return i.ID == w.inverter.ID })
	tracker := slices.IndexFunc(w.inverter.Trackers, func(t oracleTracker) bool { return t.ID == w.tracker.ID })
	atInverter := fmt.Sprintf("/inverters/%d/", inverter)
	atTracker := fmt.Sprintf("%strackers/%d/", atInverter, tracker)
	atModule := fmt.Sprintf("/modules/%d/", w.moduleIndex)
	sum := func(each func(*wired) *big.Rat) *big.Rat {
		total := zero
		for _, other := range entries {
			if other.trackerPlace == w.trackerPlace {
				total = plus(total, times(other.parallel(), each(other)))
			}
		}
		return total
	}
	// The cold voltage at another temperature than the coldest.
	coldAt := func(c *big.Rat) *big.Rat {
		colder := *o
		colder.Site.Coldest.Rat = c
		moved := *w.circuit
		moved.d = &colder
		return times(n, moved.vocColdBy(pickAvailable(&moved, d)))
	}

	var pointer string
	var value *big.Rat
	switch d.IntN(16) {
	case 0:
		pointer, value = atInverter+"max_dc_voltage_v", w.stringCold
	case 1:
		pointer, value = atModule+"max_system_voltage_v", w.stringCold
	case 2: // the ceiling is met exactly at the headroom, or at −60 °C
		pointer = d.pick(atInverter+"max_dc_voltage_v", atModule+"max_system_voltage_v")
		value = coldAt(minus(o.Site.Coldest.Rat, o.Allowances.Headroom.orElse("3")))
		if d.chance(0.2) {
			value = coldAt(rat("-60"))
		}
	case 3: // by another row of the table, or by the other method
		pointer = d.pick(atInverter+"max_dc_voltage_v", atModule+"max_system_voltage_v")
		value = times(n, onTop(times(w.module.Voc.Rat, coldRows[d.IntN(len(coldRows))].factor), o.Allowances.ColdVoltage.orElse("0")))
		if other := w.otherVocCold(); other != nil && d.chance(0.5) {
			value = times(n, other)
		}
	case 4:
		pointer, value = atTracker+d.pick("mppt_min_v", "full_power_min_v"), times(n, w.vmpHot())
	case 5:
		if steeper := w.vmpHotSteeper(); steeper != nil {
			pointer, value = atTracker+d.pick("mppt_min_v", "full_power_min_v"), times(n, steeper)
		}
	case 6:
		pointer, value = atInverter+"start_voltage_v", times(n, w.vocHot())
		if d.chance(0.5) {
			value = times(value, rat("0.9"))
		}
	case 7:
		pointer, value = atTracker+d.pick("mppt_max_v", "full_power_max_v"), times(n, w.operatingAt(o.Site.Coldest.Rat))
	case 8:
		pointer, value = atTracker+"max_input_current_a", sum((*wired).impWithGain)
	case 9:
		pointer, value = atTracker+"max_input_current_per_input_a", w.impWithGain()
	case 10:
		pointer, value = atTracker+"max_short_circuit_current_a", sum((*wired).iscByBasis)
		if d.chance(0.3) {
			value = sum((*wired).iscMaximum)
		}
	case 11:
		pointer, value = atTracker+"max_short_circuit_current_per_input_a", w.iscByBasis()
		if d.chance(0.3) {
			value = w.iscMaximum()
		}
	case 12:
		pointer = atModule + "max_series_fuse_a"
		value = plus(minus(sum((*wired).iscMaximum), w.iscMaximum()), w.inverter.BackFeed.orElse("0"))
	case 13:
		pointer, value = d.pick(atModule+"max_series_fuse_a", atTracker+"string_fuse_a"), times(fuseFactor, w.iscWithGain())
	case 14:
		pointer, value = atTracker+"string_fuse_a", w.module.MaxSeriesFuse.Rat
	case 15:
		pointer, value = atInverter+"max_dc_power_w", zero
		for _, other := range entries {
			if other.unitPlace == w.unitPlace {
				value = plus(value, times(times(other.series(), other.parallel()), other.module.Pmax.Rat))
			}
		}
	}
	if pointer == "" || value == nil {
		return
	}
	text, finite := decimalText(value)
	if !finite {
		return
	}
	if nudge := d.between(-1, 1); nudge != 0 {
		_, decimals, _ := strings.Cut(text, ".")
		value = plus(value, times(big.NewRat(int64(nudge), 1), rat("1e-"+strconv.Itoa(len(decimals)))))
		text, _ = decimalText(value)
	}
	if !positive(value) {
		return
	}
	before, had := at(doc, pointer)
	put(doc, pointer, json.Number(text))
	if t, _ := at(doc, strings.TrimSuffix(atTracker, "/")); !obeysWindow(t) {
		put(doc, pointer, before)
		if !had {
			parent, _ := at(doc, pointer[:strings.LastIndexByte(pointer, '/')])
			delete(parent.(object), pointer[strings.LastIndexByte(pointer, '/')+1:])
		}
	}
}

// pickAvailable is the method of the circuit, the coefficient where the table is silent.
func pickAvailable(c *circuit, d draw) string {
	if c.vocCold() == nil {
		return "coefficient"
	}
	return c.method()
}

// obeysWindow reports whether a tracker's windows lie as the fault rules ask.
func obeysWindow(tracker any) bool {
	var edges []*big.Rat
	for _, name := range []string{"mppt_min_v", "full_power_min_v", "full_power_max_v", "mppt_max_v"} {
		if edge, stated := tracker.(object)[name]; stated {
			edges = append(edges, rat(string(edge.(json.Number))))
		}
	}
	return slices.IsSortedFunc(edges, (*big.Rat).Cmp)
}

// decimalText writes a rational in full, if it is a finite decimal of at most 36 places.
func decimalText(r *big.Rat) (text string, finite bool) {
	places, exact := r.FloatPrec()
	if !exact || places > 30 {
		return "", false
	}
	return r.FloatString(places), true
}

// answer answers some of the questions that the design raises, some for values
// that no longer stand.
func (d draw) answer(doc object, o *oracleDesign) {
	questions, _ := o.questions()
	var answers list
	for _, q := range questions {
		if !d.chance(0.4) {
			continue
		}
		module := doc["modules"].(list)[q.module].(object)
		var asked any
		if len(q.restsOn) == 1 {
			asked = module[q.restsOn[0]]
			if d.chance(0.2) {
				asked = json.Number("1")
			}
		} else {
			fields := object{}
			for _, name := range q.restsOn {
				fields[name] = module[name]
			}
			if d.chance(0.2) {
				stale := q.restsOn[d.IntN(len(q.restsOn))]
				fields[stale] = json.Number("1")
			}
			asked = fields
		}
		answers = append(answers, object{"pointer": q.pointer, "value_asked": asked, "reason": "read twice on the label (invented)"})
	}
	if len(answers) > 0 {
		doc["answers"] = answers
	}
}
