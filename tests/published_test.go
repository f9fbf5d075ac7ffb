package tests

import (
	"encoding/json"
	"fmt"
	"testing"
)

// bench is a design in which nothing but the case's own numbers decides: wide
// limits everywhere, one string of one module. All its numbers are invented.
const bench = `{
  "format": "rimeline-design/1", "title": "Bench (invented)", "rulebook": "iec-62548-1",
  "site": {"name": "Bench (invented)", "structure": "ground-mounted",
    "coldest_c": 24, "coldest_basis": "record-low", "hottest_c": 25, "hottest_basis": "record-high"},
  "modules": [{"id": "m", "technology": "mono-si", "pmax_w": 300, "voc_v": 40, "isc_a": 10, "vmp_v": 33, "imp_a": 9,
    "voc_temp_coeff": {"value": -0.3, "unit": "%/°C"}, "max_system_voltage_v": 1500, "max_series_fuse_a": 30}],
  "inverters": [{"id": "i", "max_dc_voltage_v": 1500,
    "trackers": [{"id": "t", "mppt_min_v": 1, "mppt_max_v": 1400, "inputs": 20,
      "max_input_current_a": 200, "max_short_circuit_current_a": 300}]}],
  "planes": [{"id": "p", "module": "m", "positions": 500, "hot_cell_rise_c": 0}],
  "strings": [{"inverter": "i", "unit": 1, "tracker": "t", "plane": "p", "modules_in_series": 1, "strings_in_parallel": 1}]
}`

// Places of the bench that cases set and results that they look at.
const (
	module0  = "/modules/0/"
	tracker0 = "/inverters/0/trackers/0/"
	row0     = "/limits/0/"
	string0  = "/strings/0/"
)

// published are worked examples of others, and how far the engine must agree.
var published = []struct {
	name   string
	source string
	// set are the inputs that the source prints, or that it implies.
	set map[string]any
	// want are places of the result with their values, a number or a word. A check
	// is named by its id: "/checks/back-feed/verdict".
	want map[string]any
	// never are misprints and mistakes of the source, or of the trade.
	never map[string]any
}{
	{
		name:   "table method, thirteen modules",
		source: "installer-exam practice set [wixlib 14626, question 3]; it prints 600/44.4 = 13.4, which is 13.51",
		set: map[string]any{
			"/voltage_method": "table", "/site/coldest_c": -24, module0 + "voc_v": 37.0, module0 + "vmp_v": 29.9,
			"/inverters/0/max_dc_voltage_v": 600, tracker0 + "mppt_min_v": 300, tracker0 + "mppt_max_v": 480,
			string0 + "modules_in_series": 13,
		},
		want: map[string]any{
			row0 + "module_voc_cold_v": "44.4", row0 + "max_modules": 13,
			row0 + "min_modules":                11, // 300/29.9 = 10.03 at STC; computed, not printed
			string0 + "voc_cold_v":              "577.2",
			"/checks/voltage-ceiling/verdict":   "within",
			"/checks/voltage-ceiling/value":     "577.2",
			"/checks/method-difference/verdict": "within",
		},
		never: map[string]any{row0 + "max_modules": "13.4"},
	},
	{
		name:   "table method, one module more",
		source: "installer-exam practice set [wixlib 14626, question 3], its answer plus one: 14 × 44.4 = 621.6 V",
		set: map[string]any{
			"/voltage_method": "table", "/site/coldest_c": -24, module0 + "voc_v": 37.0, module0 + "vmp_v": 29.9,
			"/inverters/0/max_dc_voltage_v": 600, tracker0 + "mppt_max_v": 480, string0 + "modules_in_series": 14,
		},
		want: map[string]any{"/checks/voltage-ceiling/verdict": "outside", "/checks/voltage-ceiling/value": "621.6"},
	},
	{
		name:   "one coefficient in V/°C for both voltages, flush roof",
		source: "public permit record, City of Zephyrhills FL, document 177393 p. 23: 42.14 V and 27.31 V, cell at 69 °C",
		set: map[string]any{
			"/site/coldest_c": 1, "/site/hottest_c": 34, "/planes/0/hot_cell_rise_c": 35,
			module0 + "voc_v": 39.48, module0 + "vmp_v": 32.19, module0 + "pmax_w": 290,
			module0 + "voc_temp_coeff":      object{"value": json.Number("-0.111"), "unit": "V/°C"},
			module0 + "vmp_temp_coeff":      object{"value": json.Number("-0.111"), "unit": "V/°C"},
			"/inverters/0/max_dc_voltage_v": 48, tracker0 + "mppt_min_v": 8, tracker0 + "mppt_max_v": 48,
		},
		want: map[string]any{
			row0 + "module_voc_cold_v": "42.144", row0 + "module_vmp_hot_v": "27.306", row0 + "max_modules": 1,
			"/checks/voltage-ceiling/verdict": "within", "/checks/hot-minimum/verdict": "within",
		},
		never: map[string]any{
			row0 + "module_vmp_hot_v": "31.191", // the ambient taken for the cell: 32.19 − 0.111 × 9
		},
	},
	{
		name:   "coldest −37 °C, twelve modules",
		source: "university-style final review, quizwizapp \"Photovoltaic Final Review\": 44.83 V, 12 modules",
		set: map[string]any{
			"/site/coldest_c": -37, "/site/hottest_c": 43, module0 + "voc_v": 37.8, module0 + "vmp_v": 31.1,
			module0 + "voc_temp_coeff":      object{"value": json.Number("-0.30"), "unit": "%/°C"},
			module0 + "pmax_temp_coeff":     object{"value": json.Number("-0.45"), "unit": "%/°C"},
			"/inverters/0/max_dc_voltage_v": 550, tracker0 + "mppt_min_v": 100, tracker0 + "mppt_max_v": 550,
		},
		want: map[string]any{
			row0 + "module_voc_cold_v": "44.8308", row0 + "max_modules": 12,
			row0 + "module_vmp_hot_v": "28.5809", // 31.1 × (1 − 0.0045 × 18), no rise: computed, not printed
		},
		never: map[string]any{
			row0 + "module_vmp_hot_v": "29.4206", // the Voc coefficient in % used for Vmp
			row0 + "max_modules":      14,        // 550/37.8, voltage at STC
		},
	},
	{
		name:   "factor 1.14, five to twelve modules",
		source: "French course \"cours photovoltaïque 2011, étape 2\", GuidEnR, by UTE C 15-712-1: 12 · 37.95 · 1.14 = 519.156 V ≤ 550; the coldest of the row is invented",
		set: map[string]any{
			"/voltage_method": "table", "/site/coldest_c": -8, module0 + "voc_v": 37.95, module0 + "vmp_v": 31,
			"/inverters/0/max_dc_voltage_v": 550, tracker0 + "mppt_min_v": 125, tracker0 + "mppt_max_v": 440,
			string0 + "modules_in_series": 12,
		},
		want: map[string]any{
			row0 + "max_modules": 12, row0 + "min_modules": 5, // 125/31 = 4.03; Vmp invented
			string0 + "voc_cold_v": "519.156", "/checks/voltage-ceiling/verdict": "within",
		},
	},
	{
		name:   "Vmp at 40 K above STC, −0.33 %/°C",
		source: "exchange between installers, re-wrenches list 2011-11-29: 35 V becomes 30.4 V; 40 K follows from both of its cases",
		set: map[string]any{
			"/site/hottest_c": 35, "/planes/0/hot_cell_rise_c": 30, module0 + "voc_v": 42, module0 + "vmp_v": 35,
			module0 + "vmp_temp_coeff": object{"value": json.Number("-0.33"), "unit": "%/°C"},
		},
		want: map[string]any{row0 + "module_vmp_hot_v": "30.38"},
	},
	{
		name:   "Vmp at 40 K above STC, −0.5 %/°C",
		source: "exchange between installers, re-wrenches list 2011-11-29: 35 V becomes 28 V",
		set: map[string]any{
			"/site/hottest_c": 35, "/planes/0/hot_cell_rise_c": 30, module0 + "voc_v": 42, module0 + "vmp_v": 35,
			module0 + "pmax_temp_coeff": object{"value": json.Number("-0.5"), "unit": "%/°C"},
		},
		want: map[string]any{row0 + "module_vmp_hot_v": 28},
	},
	{
		name:   "two strings of six at STC",
		source: "exam site greencredential.com: 104.4 V (its key prints 104 V) and 10.04 A",
		set: map[string]any{
			module0 + "voc_v": 21.5, module0 + "vmp_v": 17.4, module0 + "imp_a": 5.02, module0 + "isc_a": 5.4, module0 + "pmax_w": 87,
			string0 + "modules_in_series": 6, string0 + "strings_in_parallel": 2,
		},
		want: map[string]any{string0 + "vmp_stc_v": "104.4", "/checks/operating-current/value": "10.04"},
	},
	{
		name:   "an operating voltage held against an absolute maximum",
		source: "exam site greencredential.com, its 600/26.3 = 22.8 → 22 modules, a mistake; Voc (33 V) and the temperature are invented: 33 × 1.135 = 37.455 V, 600/37.455 = 16.02",
		set: map[string]any{
			"/site/coldest_c": -20, module0 + "voc_v": 33, module0 + "vmp_v": 26.3, module0 + "pmax_w": 237,
			"/inverters/0/max_dc_voltage_v": 600, string0 + "modules_in_series": 22, tracker0 + "mppt_max_v": 600,
		},
		want:  map[string]any{row0 + "max_modules": 16, "/checks/voltage-ceiling/verdict": "outside"},
		never: map[string]any{row0 + "max_modules": 22},
	},
	{
		name:   "two strings need no fuse",
		source: "solarsaarthi.com, \"Selection and sizing of solar DC fuses\", p. 3 (IS/IEC 62548), example 1: 12.28 A < 20 A; ours × 1.25 = 15.35 A",
		set: map[string]any{
			module0 + "isc_a": 12.28, module0 + "imp_a": 11.6, module0 + "pmax_w": 383, module0 + "max_series_fuse_a": 20,
			string0 + "modules_in_series": 18, string0 + "strings_in_parallel": 2,
		},
		want: map[string]any{"/checks/back-feed/value": "15.35", "/checks/back-feed/limit": 20, "/checks/back-feed/verdict": "within"},
	},
	{
		name:   "four strings need fuses, none stated",
		source: "solarsaarthi.com, \"Selection and sizing of solar DC fuses\", p. 4 (IS/IEC 62548), example 2: 36.84 A > 20 A; ours × 1.25 = 46.05 A",
		set: map[string]any{
			module0 + "isc_a": 12.28, module0 + "imp_a": 11.6, module0 + "voc_v": 51.7, module0 + "vmp_v": 43, module0 + "pmax_w": 499,
			module0 + "max_series_fuse_a": 20, "/site/coldest_c": 25, "/site/hottest_c": 40,
			string0 + "modules_in_series": 16, string0 + "strings_in_parallel": 4,
		},
		want: map[string]any{
			"/checks/back-feed/value": "46.05", "/checks/back-feed/verdict": "unconfirmed",
			string0 + "voc_cold_v": "827.2",
		},
		never: map[string]any{string0 + "voc_cold_v": "827.7"}, // the source's 51.7 · 16
	},
	{
		name:   "four strings with the fuse that the source chooses",
		source: "solarsaarthi.com, \"Selection and sizing of solar DC fuses\", p. 4, example 2: 20 A; ours between 1.5625 × 12.28 = 19.1875 A and 20 A",
		set: map[string]any{
			module0 + "isc_a": 12.28, module0 + "imp_a": 11.6, module0 + "pmax_w": 383, module0 + "max_series_fuse_a": 20,
			tracker0 + "string_fuse_a": 20, string0 + "modules_in_series": 16, string0 + "strings_in_parallel": 4,
		},
		want: map[string]any{"/checks/back-feed/verdict": "within"},
	},
	{
		name:   "four strings with a fuse by 1.5 × Isc alone",
		source: "solarsaarthi.com, p. 4, example 2, its lower bound of 18.42 A: under 19.1875 A",
		set: map[string]any{
			module0 + "isc_a": 12.28, module0 + "imp_a": 11.6, module0 + "pmax_w": 383, module0 + "max_series_fuse_a": 20,
			tracker0 + "string_fuse_a": json.Number("18.42"), string0 + "modules_in_series": 16, string0 + "strings_in_parallel": 4,
		},
		want: map[string]any{"/checks/back-feed/verdict": "outside"},
	},
	{
		name:   "9.2 A × 1.25, and a fuse of × 1.25 again",
		source: "equipment maker's manual for self-builders p. 39: 11.5 A and 14.4 A, exactly 14.375 A",
		set: map[string]any{
			module0 + "isc_a": 9.2, module0 + "imp_a": 8.7, module0 + "pmax_w": 287, module0 + "max_series_fuse_a": 15,
			tracker0 + "string_fuse_a": json.Number("14.375"), string0 + "strings_in_parallel": 3,
		},
		want: map[string]any{string0 + "max_current_a": "34.5", "/checks/back-feed/value": 23, "/checks/back-feed/verdict": "within"},
	},
	{
		name:   "a fuse of one milliampere less than × 1.5625",
		source: "equipment maker's manual for self-builders p. 39, its 14.375 A less 0.001 A",
		set: map[string]any{
			module0 + "isc_a": 9.2, module0 + "imp_a": 8.7, module0 + "pmax_w": 287, module0 + "max_series_fuse_a": 15,
			tracker0 + "string_fuse_a": json.Number("14.374"), string0 + "strings_in_parallel": 3,
		},
		want: map[string]any{"/checks/back-feed/verdict": "outside"},
	},
	{
		name:   "a fuse between × 1.56 and × 1.5625",
		source: "public permit sheet PV-4.1, Santa Ana CA, document 540599 p. 6: 13.87 A × 1.56 = 21.64 A, a common shortening of 1.5625 (21.671875 A)",
		set: map[string]any{
			module0 + "isc_a": 13.87, module0 + "imp_a": 13, module0 + "pmax_w": 429, module0 + "max_series_fuse_a": 25,
			tracker0 + "string_fuse_a": json.Number("21.64"), string0 + "strings_in_parallel": 3,
		},
		want: map[string]any{string0 + "max_current_a": "52.0125", "/checks/back-feed/verdict": "outside"},
	},
}

func TestPublishedExamples(t *testing.T) {
	for _, c := range published {
		t.Run(c.name, func(t *testing.T) {
			doc := readDocument([]byte(bench))
			for pointer, value := range c.set {
				if !put(doc, pointer, plainValue(value)) {
					t.Fatalf("the bench has no place %s", pointer)
				}
			}
			line, err := sizeText(documentText(doc))
			if err != nil {
				t.Fatal(err)
			}
			res := readDocument(line)
			byID := object{}
			for _, c := range res["checks"].(list) {
				byID[c.(object)["id"].(string)] = c
			}
			res["checks"] = byID
			for pointer, want := range c.want {
				if got, _ := at(res, pointer); !sameValue(got, want) {
					t.Errorf("%s is %v, want %v (%s)", pointer, got, want, c.source)
				}
			}
			for pointer, never := range c.never {
				if got, there := at(res, pointer); !there || sameValue(got, never) {
					t.Errorf("%s is %v, which repeats a mistake (%s)", pointer, got, c.source)
				}
			}
		})
	}
}

// plainValue writes a Go number of a table as the document would.
func plainValue(v any) any {
	switch v.(type) {
	case int, float64:
		return json.Number(fmt.Sprint(v))
	}
	return v
}

// sameValue compares a value of a result with one of a table, numbers exactly.
func sameValue(got, want any) bool {
	n, isNumber := got.(json.Number)
	if !isNumber {
		return got == want
	}
	text := fmt.Sprint(want)
	return plainDecimal(text) != nil && rat(string(n)).Cmp(rat(text)) == 0
}

// TestExample works the example design by hand.
//
//	Voc,cold = 37.32 × (1 + 0.0027 × 46) = 37.32 × 1.1242          = 41.955144 V
//	ceiling: inverter, module and building all 1000 V, connectors 1500 V
//	23 × 41.955144 = 964.968312 ≤ 1000 < 24 × 41.955144 = 1006.923456
//	cell = 37 + 30 = 67 °C; Vmp,hot by the power coefficient
//	  = 31.26 × (1 − 0.0034 × 42) × 0.97 = 31.26 × 0.8572 × 0.97   = 25.99218984 V
//	6 × 25.99 = 155.95 < 160 ≤ 7 × 25.99 = 181.95
//	Voc,hot = 37.32 × (1 − 0.0027 × 42) = 37.32 × 0.8866           = 33.087912 V
//	5 × 33.09 = 165.44 < 180 ≤ 6 × 33.09 = 198.53
//	Isc × 1.25 = 17.4375 A; 2 × = 34.875 ≤ 40 < 3 × = 52.3125; two inputs
//	12 × Vmp,hot = 311.90627808 and 13 × = 337.89846792, both under 380: limited power
//	2 × 13.12 = 26.24 > 26: the current is clipped
//	37 × 410 = 15170 ≤ 18000
//	back-feed: 1 × 17.4375 ≤ 25
func TestExample(t *testing.T) {
	r := mustSize[result](t, goldenDesigns(t)["testdata/example.json"])
	if r.Verdict != "caution" || len(r.Limits) != 4 || len(r.Strings) != 2 || len(r.Questions) != 0 {
		t.Fatalf("verdict %s, %d limits rows, %d strings rows, %d questions; want caution, 4, 2, 0",
			r.Verdict, len(r.Limits), len(r.Strings), len(r.Questions))
	}
	numbers := []struct {
		what string
		got  number
		want string
	}{
		{"voltage_ceiling_v", r.Limits[0].Ceiling, "1000"},
		{"module_voc_cold_v", r.Limits[0].VocCold, "41.955144"},
		{"module_vmp_hot_v", r.Limits[0].VmpHot, "25.99218984"},
		{"max_modules", r.Limits[0].MaxModules, "23"},
		{"min_modules", r.Limits[0].MinModules, "7"},
		{"min_modules_start", r.Limits[0].MinModulesStart, "6"},
		{"max_strings", r.Limits[0].MaxStrings, "2"},
		{"voc_cold_v of south", r.Strings[0].VocCold, "503.461728"},
		{"voc_cold_v of west", r.Strings[1].VocCold, "545.416872"},
		{"vmp_stc_v of south", r.Strings[0].VmpSTC, "375.12"},
		{"vmp_hot_v of south", r.Strings[0].VmpHot, "311.90627808"},
		{"vmp_hot_v of west", r.Strings[1].VmpHot, "337.89846792"},
		{"max_current_a of south", r.Strings[0].MaxCurrent, "34.875"},
		{"max_current_a of west", r.Strings[1].MaxCurrent, "17.4375"},
	}
	for _, n := range numbers {
		if n.got.Rat == nil || n.got.Cmp(rat(n.want)) != 0 {
			t.Errorf("%s is %s, want %s", n.what, n.got.text, n.want)
		}
	}
	if r.Limits[0].CeilingFrom != "inverter" || r.Limits[0].MaxStringsFrom != "inputs" {
		t.Errorf("ceiling from %s, strings from %s; want inverter, inputs", r.Limits[0].CeilingFrom, r.Limits[0].MaxStringsFrom)
	}
	t1 := trackerPlace("i1", "1", "t1")
	cautions := map[string]string{
		"full-power-low about " + string(entryPlace(0)): "311.90627808",
		"full-power-low about " + string(entryPlace(1)): "337.89846792",
		"operating-current about " + string(t1):         "26.24",
	}
	for _, c := range r.Checks {
		want, isCaution := cautions[c.at()]
		if isCaution != (c.Verdict == "caution") || !isCaution && c.Verdict != "within" {
			t.Errorf("%s is %s", c.at(), c.Verdict)
		}
		if isCaution && c.Value.Cmp(rat(want)) != 0 {
			t.Errorf("%s has %s, want %s", c.at(), c.Value.text, want)
		}
	}
	power, _ := r.check("dc-power", unitPlace("i1", "1"))
	fault, _ := r.check("back-feed", entryPlace(0))
	if power.Value.text != "15170" || fault.Value.text != "17.4375" {
		t.Errorf("dc-power has %s, back-feed %s; want 15170, 17.4375", power.Value.text, fault.Value.text)
	}
}
