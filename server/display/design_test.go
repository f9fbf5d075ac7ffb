package display

import (
	"encoding/json"
	"os"
	"strconv"
	"strings"
	"testing"

	"rimeline/sizing"
	"rimeline/sizing/design"
)

// exampleFile is the invented example that the project ships.
const exampleFile = "../../sizing/design/testdata/example-design.json"

func readDesign(tb testing.TB, file string) *design.Design {
	tb.Helper()
	text, err := os.ReadFile(file)
	if err != nil {
		tb.Fatal(err)
	}
	return parseDesign(tb, text)
}

func parseDesign(tb testing.TB, text []byte) *design.Design {
	tb.Helper()
	doc := design.Read(text)
	if doc.Design == nil {
		tb.Fatalf("the design is refused: %v", doc.Faults)
	}
	return doc.Design
}

// change is a value to put at a JSON Pointer of the example; nil takes the member
// out, and "-" at the end of the pointer appends to a list.
type change struct {
	pointer string
	value   any
}

// changed returns the example with changes, and the composer of its result.
func changed(tb testing.TB, changes ...change) *composer {
	tb.Helper()
	text, err := os.ReadFile(exampleFile)
	if err != nil {
		tb.Fatal(err)
	}
	decoder := json.NewDecoder(strings.NewReader(string(text)))
	decoder.UseNumber()
	var doc any
	if err := decoder.Decode(&doc); err != nil {
		tb.Fatal(err)
	}
	for _, c := range changes {
		doc = put(tb, doc, strings.Split(c.pointer, "/")[1:], c.value)
	}
	text, err = json.Marshal(doc)
	if err != nil {
		tb.Fatal(err)
	}
	d := parseDesign(tb, text)
	return newComposer(d, sizing.Size(d))
}

func put(tb testing.TB, at any, path []string, value any) any {
	tb.Helper()
	if len(path) == 0 {
		return value
	}
	switch at := at.(type) {
	case map[string]any:
		if len(path) == 1 && value == nil {
			delete(at, path[0])
		} else {
			at[path[0]] = put(tb, at[path[0]], path[1:], value)
		}
		return at
	case []any:
		if path[0] == "-" {
			return append(at, value)
		}
		i, err := strconv.Atoi(path[0])
		if err != nil || i >= len(at) {
			tb.Fatalf("no place %q in a list of %d", path[0], len(at))
		}
		at[i] = put(tb, at[i], path[1:], value)
		return at
	}
	tb.Fatalf("no place %v", path)
	return nil
}

func entry(tracker, plane string, series, parallel int) map[string]any {
	return map[string]any{"inverter": "i1", "unit": 1, "tracker": tracker, "plane": plane, "modules_in_series": series, "strings_in_parallel": parallel}
}

// variants are designs in which together every sentence and symbol occurs; all invented.
var variants = map[string][]change{
	"example":   nil,
	"unstrung":  {{"/strings", []any{}}},
	"too long":  {{"/strings/0/modules_in_series", 24}, {"/strings/1/modules_in_series", 23}},
	"too short": {{"/strings/0/modules_in_series", 5}, {"/strings/1/modules_in_series", 1}},
	"fahrenheit": {
		{"/site/coldest_c", map[string]any{"value": -6, "unit": "°F"}}, {"/site/hottest_c", map[string]any{"value": 99, "unit": "°F"}},
		{"/planes/0/hot_cell_rise_c", map[string]any{"value": 54, "unit": "°F"}}, {"/allowances/headroom_c", map[string]any{"value": 9, "unit": "°F"}},
		{"/strings/0/modules_in_series", 23}},
	"table":          {{"/voltage_method", "table"}, {"/strings/0/modules_in_series", 22}},
	"table too long": {{"/voltage_method", "table"}, {"/strings/0/modules_in_series", 28}},
	"table and warm": {{"/voltage_method", "table"}, {"/site/coldest_c", 20}, {"/strings/0/modules_in_series", 26}},
	"iec":            {{"/rulebook", "iec-62548-1"}, {"/site/structure", "ground-mounted"}},
	"mixed": {
		{"/strings/-", entry("t1", "west", 10, 2)}, {"/modules/0/cells_in_series", 90}, {"/planes/1/tilt_deg", nil},
		{"/inverters/0/trackers/0/max_short_circuit_current_a", nil}},
	"film": {
		{"/modules/0/technology", "cdte"}, {"/modules/0/max_series_fuse_a", 10}, {"/site/structure", "one-or-two-family-dwelling"},
		{"/rulebook", "nec-2026"}, {"/modules/0/bifaciality", 0.7}, {"/site/elevation_m", 2400}, {"/short_circuit_basis", "rated"},
		{"/inverters/0/trackers/0/max_short_circuit_current_a", 30}, {"/sources", map[string]any{"/modules/0/voc_v": "datasheet rev. C, page 2"}}},
	"very cold": {{"/site/coldest_c", -45}, {"/site/coldest_basis", "other"}, {"/site/elevation_m", nil}},
	"fuses": {
		{"/strings/0/strings_in_parallel", 4}, {"/inverters/0/trackers/0/inputs", 4}, {"/inverters/0/trackers/0/string_fuse_a", 25},
		{"/inverters/0/trackers/0/max_input_current_per_input_a", 12}, {"/inverters/0/trackers/0/max_short_circuit_current_per_input_a", 15},
		{"/inverters/0/back_feed_a", 1}, {"/strings/0/modules_in_series", 6}},
	"fuse too large": {{"/strings/0/strings_in_parallel", 4}, {"/inverters/0/trackers/0/string_fuse_a", 30}},
	"fuse too small": {{"/strings/0/strings_in_parallel", 4}, {"/inverters/0/trackers/0/string_fuse_a", 20}},
	"no series fuse": {{"/modules/0/max_series_fuse_a", nil}},
	"slope by Voc":   {{"/modules/0/pmax_temp_coeff", nil}, {"/modules/0/isc_temp_coeff", nil}, {"/strings/0/modules_in_series", 7}},
	"slope of Vmp": {
		{"/modules/0/vmp_temp_coeff", map[string]any{"value": -115, "unit": "mV/K"}}, {"/allowances/cold_voltage_pct", 1},
		{"/allowances/hot_voltage_pct", nil}, {"/modules/0/isc_marked_max_a", 15.1}, {"/planes/1/current_gain_pct", 5},
		{"/strings/-", entry("t2", "south", 13, 1)}},
	"advice":     {{"/inverters/0/max_dc_power_is", "advice"}, {"/inverters/0/max_dc_power_w", 15000}},
	"hot cells":  {{"/planes/0/hot_cell_rise_c", 300}},
	"per input":  {{"/inverters/0/trackers/1/max_short_circuit_current_per_input_a", 10}},
	"late start": {{"/inverters/0/start_voltage_v", 390}},
	"two modules": {
		{"/modules/-", map[string]any{"id": "m2", "technology": "multi-si", "pmax_w": 300, "voc_v": 40, "isc_a": 9.6, "vmp_v": 33, "imp_a": 9.1,
			"voc_temp_coeff": map[string]any{"value": -0.3, "unit": "%/°C"}, "max_system_voltage_v": 1000, "max_series_fuse_a": 20}},
		{"/planes/1/module", "m2"}, {"/strings/-", entry("t1", "west", 11, 1)}, {"/planes/1/current_gain_pct", 5}},
}

func eachVariant(t *testing.T, test func(t *testing.T, c *composer)) {
	for name, changes := range variants {
		t.Run(name, func(t *testing.T) { test(t, changed(t, changes...)) })
	}
}
