package tests

import (
	"encoding/json"
	"testing"
)

// TestExtremes holds the engine against the oracle where the format's own bounds
// are the only ones: 40 digits, exponents of ±30.
func TestExtremes(t *testing.T) {
	cases := []struct {
		name string
		set  map[string]json.Number
	}{
		{"40 digits", map[string]json.Number{
			module0 + "voc_v": "37.12345678901234567890123456789012345678",
			module0 + "vmp_v": "31.12345678901234567890123456789012345678"}},
		{"a rise of 1e30 °C", map[string]json.Number{"/planes/0/hot_cell_rise_c": "1e30"}},
		{"a gain of 1e30 %", map[string]json.Number{"/planes/0/current_gain_pct": "1e30"}},
		{"currents of 1e-28 A", map[string]json.Number{module0 + "isc_a": "2e-28", module0 + "imp_a": "1e-28"}},
		{"a ceiling of 1e-30 V", map[string]json.Number{"/inverters/0/max_dc_voltage_v": "1e-30"}},
		{"more modules than a machine word counts", map[string]json.Number{module0 + "voc_v": "2e-28", module0 + "vmp_v": "1e-28"}},
		{"−90 °C", map[string]json.Number{"/site/coldest_c": "-90"}},
		{"the ceiling met at −60 °C exactly", map[string]json.Number{
			"/inverters/0/max_dc_voltage_v": "50.2"}}, // 40 × (1 + 0.003 × 85)
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			doc := readDocument([]byte(bench))
			for pointer, value := range c.set {
				put(doc, pointer, value)
			}
			found, err := compareText(documentText(doc))
			if err != nil {
				t.Fatal(err)
			}
			for _, f := range found {
				t.Errorf("%s at %s: engine %s, oracle %s", f.kind, f.place, f.engine, f.oracle)
			}
		})
	}
}
