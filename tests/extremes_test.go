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
			mustAgree(t, doc)
		})
	}
}

// mustAgree compares engine and oracle on one document.
func mustAgree(t *testing.T, doc object) {
	t.Helper()
	found, err := compareText(documentText(doc))
	if err != nil {
		t.Fatal(err)
	}
	for _, f := range found {
		t.Errorf("%s at %s: engine %s, oracle %s", f.kind, f.place, f.engine, f.oracle)
	}
}

// TestColdRows compares at, just above and just below the bound of each row of the
// table of cold factors, by the table and by the coefficient with the table beside it.
func TestColdRows(t *testing.T) {
	for _, row := range coldRows {
		for _, beside := range []string{"-0.0001", "0", "0.0001"} {
			coldest := plus(row.lowerBoundC, rat(beside))
			for _, method := range []string{"table", "coefficient"} {
				if method == "table" && exceeds(rat("-40"), coldest) {
					continue // a fault
				}
				text, _ := decimalText(coldest)
				doc := readDocument([]byte(bench))
				put(doc, "/voltage_method", method)
				put(doc, "/site/coldest_c", json.Number(text))
				put(doc, "/site/hottest_c", json.Number("40"))
				// The ceiling is met exactly by this row.
				ceiling, _ := decimalText(times(rat("40"), row.factor))
				put(doc, "/inverters/0/max_dc_voltage_v", json.Number(ceiling))
				mustAgree(t, doc)
			}
		}
	}
}

// TestStandardRatings asks for a fuse at, just under and just over each standard
// rating: 0.64 of a rating is the current of which it is × 1.5625.
func TestStandardRatings(t *testing.T) {
	for _, rating := range standardRatings {
		for _, least := range []string{"-0.001", "0", "0.001"} {
			for _, most := range []string{"-0.002", "0", "0.002"} {
				isc, _ := decimalText(times(plus(rat(rating), rat(least)), rat("0.64")))
				fuse, _ := decimalText(plus(rat(rating), rat(most)))
				doc := readDocument([]byte(bench))
				put(doc, module0+"isc_a", json.Number(isc))
				put(doc, module0+"imp_a", json.Number("0.6"))
				put(doc, module0+"max_series_fuse_a", json.Number(fuse))
				put(doc, string0+"strings_in_parallel", json.Number("5"))
				mustAgree(t, doc)
			}
		}
	}
}
