package design

import (
	"bytes"
	"encoding/json"
	"fmt"
	"strconv"
	"strings"
	"testing"
	"time"
)

// edit changes one place of a document: the JSON put there, "" to take it away.
type edit struct{ pointer, put string }

// edited returns the example with some places changed.
func edited(t testing.TB, edits ...edit) []byte {
	t.Helper()
	decoder := json.NewDecoder(bytes.NewReader(example(t)))
	decoder.UseNumber()
	var document any
	if err := decoder.Decode(&document); err != nil {
		t.Fatal(err)
	}
	for _, e := range edits {
		document = put(t, document, strings.Split(e.pointer, "/")[1:], e.put)
	}
	text, err := json.Marshal(document)
	if err != nil {
		t.Fatal(err)
	}
	return text
}

func put(t testing.TB, at any, path []string, text string) any {
	t.Helper()
	if len(path) == 0 {
		return json.RawMessage(text)
	}
	switch at := at.(type) {
	case map[string]any:
		name := strings.NewReplacer("~1", "/", "~0", "~").Replace(path[0])
		if len(path) == 1 && text == "" {
			delete(at, name)
			return at
		}
		at[name] = put(t, at[name], path[1:], text)
		return at
	case []any:
		i, err := strconv.Atoi(path[0])
		if err != nil || i > len(at) {
			t.Fatalf("no element %s", path[0])
		}
		if i == len(at) {
			at = append(at, nil)
		}
		at[i] = put(t, at[i], path[1:], text)
		return at
	}
	t.Fatalf("nothing at %v", path)
	return nil
}

const secondModule = `{"id": "m2", "technology": "cdte", "pmax_w": 100, "voc_v": 60, "isc_a": 2.2, "vmp_v": 48, "imp_a": 2.1,
	"voc_temp_coeff": {"value": -0.28, "unit": "%/K"}, "max_system_voltage_v": 1000}`

// TestFaults has at least one row for each rule of the format page. The document
// has no faults but the ones named; so a row also shows which rules keep silent.
func TestFaults(t *testing.T) {
	type want struct{ pointer, found, expected, detail string }
	tests := []struct {
		name  string
		edits []edit
		want  []want
	}{
		// The form.
		{"another format", []edit{{"/format", `"rimeline-design/2"`}},
			[]want{{"/format", `"rimeline-design/2"`, `"rimeline-design/1"`, "Only documents of the format"}}},
		{"no format", []edit{{"/format", ""}}, []want{{"/format", "nothing", `"rimeline-design/1"`, "Enter the format"}}},
		{"unknown field", []edit{{"/colour", `"red"`}}, []want{{"/colour", `the field "colour"`, "one of format, title,", "no field"}}},
		{"a later field", []edit{{"/runs", `[]`}}, []want{{"/runs", "", "", "no field"}}},
		{"unknown field inside", []edit{{"/inverters/0/trackers/1/x~1y", `1`}}, []want{{"/inverters/0/trackers/1/x~1y", "", "mppt_min_v", ""}}},
		{"case variant of a field", []edit{{"/modules/0/Maker", `"x"`}}, []want{{"/modules/0/Maker", "", "maker", "did you mean maker?"}}},
		{"a hyphen for a low line", []edit{{"/modules/0/length-mm", `1`}}, []want{{"/modules/0/length-mm", "", "length_mm", "did you mean length_mm?"}}},
		{"case variant of a required field", []edit{{"/modules/0/Voc_V", `37.32`}, {"/modules/0/voc_v", ""}}, []want{
			{"/modules/0/Voc_V", "", "voc_v", "did you mean voc_v?"}, {"/modules/0/voc_v", "nothing", "a number in V above 0", "Enter the open-circuit voltage"}}},
		{"null", []edit{{"/modules/0/voc_v", `null`}}, []want{{"/modules/0/voc_v", "null", "a number in V above 0", "null is no value"}}},
		{"null in an optional field", []edit{{"/site/station", `null`}}, []want{{"/site/station", "null", "a text", "null is no value"}}},
		{"number in quotes", []edit{{"/modules/0/voc_v", `"37.3"`}}, []want{{"/modules/0/voc_v", `"37.3"`, "a number in V above 0", "write 37.3 without the quotes"}}},
		{"count in quotes", []edit{{"/planes/0/positions", `"24"`}}, []want{{"/planes/0/positions", `"24"`, "a whole number", "write 24 without the quotes"}}},
		{"text for a number", []edit{{"/modules/0/voc_v", `"abc"`}}, []want{{"/modules/0/voc_v", `"abc"`, "a number in V above 0", "must be a number in V"}}},
		{"number for a text", []edit{{"/title", `3`}}, []want{{"/title", "3", "a text", "The title must be a text."}}},
		{"truth for a number", []edit{{"/modules/0/isc_a", `true`}}, []want{{"/modules/0/isc_a", "true", "a number in A above 0", ""}}},
		{"list for an object", []edit{{"/site", `[]`}}, []want{{"/site", "an empty list", "an object", "The site must be an object."}}},
		{"object for a list", []edit{{"/other_limits", `{}`}}, []want{{"/other_limits", "an object", "a list", ""}}},
		{"number for an element", []edit{{"/other_limits/0", `7`}}, []want{{"/other_limits/0", "7", "an object", ""}}},
		{"41 digits", []edit{{"/modules/0/voc_v", `37.` + strings.Repeat("3", 39)}}, []want{{"/modules/0/voc_v", "37.333", "at most 40 digits", "too long"}}},
		{"a large exponent", []edit{{"/modules/0/voc_v", `1e31`}}, []want{{"/modules/0/voc_v", "1e31", "from −30 to 30", "too long"}}},
		{"a long count", []edit{{"/planes/0/positions", `1e-31`}}, []want{{"/planes/0/positions", "1e−31", "from −30 to 30", "too long"}}},
		{"a long number asked about", []edit{{"/answers", `[{"pointer": "/modules/0/voc_v", "value_asked": {"voc_v": 1e31}, "reason": "r"}]`}},
			[]want{{"/answers/0/value_asked/voc_v", "1e31", "from −30 to 30", ""}}},
		{"missing title", []edit{{"/title", ""}}, []want{{"/title", "nothing", "a text", "Enter the title."}}},
		{"missing site", []edit{{"/site", ""}}, []want{{"/site", "nothing", "an object", "Enter the site."}}},
		{"missing temperature", []edit{{"/site/coldest_c", ""}}, []want{{"/site/coldest_c", "nothing", "a number in °C", "Enter the coldest temperature."}}},
		{"missing word", []edit{{"/site/structure", ""}}, []want{{"/site/structure", "nothing", "one-or-two-family-dwelling, other-building or ground-mounted", "Choose the structure."}}},
		{"missing id", []edit{{"/other_limits/0/name", ""}}, []want{{"/other_limits/0/name", "nothing", "a text that is not blank", "Enter the name of the part."}}},
		{"missing count", []edit{{"/strings/1/unit", ""}}, []want{{"/strings/1/unit", "nothing", "a whole number, 1 or more", "Enter the unit"}}},
		{"blank id", []edit{{"/other_limits/0/name", `" "`}}, []want{{"/other_limits/0/name", `" "`, "a text that is not blank", ""}}},

		// Words.
		{"rulebook", []edit{{"/rulebook", `"nec-2014"`}}, []want{{"/rulebook", `"nec-2014"`, "nec-2017, nec-2020, nec-2023, nec-2026 or iec-62548-1", "The code edition must be"}}},
		{"case of a word", []edit{{"/rulebook", `"NEC-2023"`}}, []want{{"/rulebook", `"NEC-2023"`, "nec-2023", ""}}},
		{"voltage method", []edit{{"/voltage_method", `"guess"`}}, []want{{"/voltage_method", `"guess"`, "coefficient or table", ""}}},
		{"voltage method not built", []edit{{"/voltage_method", `"weather"`}}, []want{{"/voltage_method", `"weather"`, "coefficient or table", "not built yet"}}},
		{"short-circuit basis", []edit{{"/short_circuit_basis", `"both"`}}, []want{{"/short_circuit_basis", `"both"`, "maximum or rated", ""}}},
		{"structure", []edit{{"/site/structure", `"boat"`}}, []want{{"/site/structure", `"boat"`, "ground-mounted", ""}}},
		{"coldest basis", []edit{{"/site/coldest_basis", `"record-high"`}}, []want{{"/site/coldest_basis", "", "annual-extreme-mean-minimum, record-low, authority-required or other", ""}}},
		{"hottest basis", []edit{{"/site/hottest_basis", `7`}}, []want{{"/site/hottest_basis", "7", "record-high, cooling-2-percent, cooling-0.4-percent, authority-required or other", ""}}},
		{"technology", []edit{{"/modules/0/technology", `"perovskite"`}}, []want{{"/modules/0/technology", "", "mono-si, multi-si, cdte, cigs or other", ""}}},
		{"power kind", []edit{{"/inverters/0/max_dc_power_is", `"hint"`}}, []want{{"/inverters/0/max_dc_power_is", "", "limit or advice", ""}}},

		// Ids.
		{"two modules of one id", []edit{{"/modules/1", strings.Replace(secondModule, "m2", "m1", 1)}}, []want{{"/modules/1/id", `"m1" a second time`, "an id that no other module has", "Two modules have the id \"m1\""}}},
		{"two inverters of one id", []edit{{"/inverters/1", `{"id": "i1", "max_dc_voltage_v": 600, "trackers": [{"id": "t1", "mppt_min_v": 1, "mppt_max_v": 2, "inputs": 1, "max_input_current_a": 1}]}`}},
			[]want{{"/inverters/1/id", "", "no other inverter", ""}}},
		{"two planes of one id", []edit{{"/planes/1/id", `"south"`}, {"/strings/1/plane", `"south"`}}, []want{{"/planes/1/id", "", "no other plane", ""}}},
		{"two trackers of one id", []edit{{"/inverters/0/trackers/1/id", `"t1"`}, {"/strings/1/tracker", `"t1"`}}, []want{{"/inverters/0/trackers/1/id", "", "no other tracker", ""}}},
		{"dangling module", []edit{{"/planes/0/module", `"m9"`}}, []want{{"/planes/0/module", `"m9"`, "the id of one of the modules", `No module has the id "m9".`}}},
		{"dangling inverter", []edit{{"/strings/0/inverter", `"i9"`}}, []want{{"/strings/0/inverter", `"i9"`, "the id of one of the inverters", ""}}},
		{"dangling tracker", []edit{{"/strings/0/tracker", `"t9"`}}, []want{{"/strings/0/tracker", `"t9"`, "the id of one of the trackers", `Inverter "i1" has no tracker with the id "t9".`}}},
		{"dangling plane", []edit{{"/strings/0/plane", `"north"`}}, []want{{"/strings/0/plane", `"north"`, "the id of one of the planes", ""}}},
		{"ids differ by case", []edit{{"/planes/0/module", `"M1"`}}, []want{{"/planes/0/module", `"M1"`, "", ""}}},
		{"blank module id hides the dangling", []edit{{"/modules/0/id", `""`}}, []want{{"/modules/0/id", `""`, "a text that is not blank", "Enter an id for the module."}}},
		{"unit above the quantity", []edit{{"/strings/0/unit", `2`}}, []want{{"/strings/0/unit", "2", "a whole number from 1 to 1", "the quantity of inverter \"i1\" is 1"}}},
		{"a faulty quantity bounds no unit", []edit{{"/strings/0/unit", `2`}, {"/inverters/0/quantity", `0`}}, []want{{"/inverters/0/quantity", "0", "1 or more", ""}}},
		{"no quantity is one", []edit{{"/strings/0/unit", `2`}, {"/inverters/0/quantity", ""}}, []want{{"/strings/0/unit", "2", "from 1 to 1", ""}}},

		// Empty lists.
		{"no modules", []edit{{"/modules", `[]`}}, []want{{"/modules", "an empty list", "at least one module", "Enter at least one module."}}},
		{"no inverters", []edit{{"/inverters", `[]`}}, []want{{"/inverters", "an empty list", "at least one inverter", ""}}},
		{"no trackers", []edit{{"/inverters/0/trackers", `[]`}}, []want{{"/inverters/0/trackers", "an empty list", "at least one tracker", ""}}},
		{"no planes", []edit{{"/planes", `[]`}}, []want{{"/planes", "an empty list", "at least one roof plane", ""}}},
		{"planes missing", []edit{{"/planes", ""}}, []want{{"/planes", "nothing", "a list with at least one roof plane", "Enter at least one roof plane."}}},

		// Whole numbers.
		{"cells not whole", []edit{{"/modules/0/cells_in_series", `54.5`}}, []want{{"/modules/0/cells_in_series", "54.5", "a whole number, 1 or more", "must be a whole number: 54.5 is not"}}},
		{"no cells", []edit{{"/modules/0/cells_in_series", `0`}}, []want{{"/modules/0/cells_in_series", "0", "1 or more", ""}}},
		{"quantity not whole", []edit{{"/inverters/0/quantity", `1.5`}}, []want{{"/inverters/0/quantity", "1.5", "a whole number", ""}}},
		{"no inputs", []edit{{"/inverters/0/trackers/0/inputs", `0`}}, []want{{"/inverters/0/trackers/0/inputs", "0", "1 or more", ""}}},
		{"inputs not whole", []edit{{"/inverters/0/trackers/0/inputs", `2.000001`}}, []want{{"/inverters/0/trackers/0/inputs", "2.000001", "a whole number", ""}}},
		{"negative places", []edit{{"/planes/0/positions", `-1`}}, []want{{"/planes/0/positions", "−1", "a whole number, 0 or more", "−1 is not"}}},
		{"places not whole", []edit{{"/planes/0/positions", `0.5`}}, []want{{"/planes/0/positions", "0.5", "a whole number", ""}}},
		{"no modules in series", []edit{{"/strings/0/modules_in_series", `0`}}, []want{{"/strings/0/modules_in_series", "0", "1 or more", ""}}},
		{"half a module", []edit{{"/strings/0/modules_in_series", `12.5`}}, []want{{"/strings/0/modules_in_series", "12.5", "a whole number", ""}}},
		{"no string", []edit{{"/strings/0/strings_in_parallel", `0`}}, []want{{"/strings/0/strings_in_parallel", "0", "1 or more", ""}}},
		{"minus one string", []edit{{"/strings/0/strings_in_parallel", `-1`}}, []want{{"/strings/0/strings_in_parallel", "−1", "1 or more", ""}}},
		{"unit zero", []edit{{"/strings/0/unit", `0`}}, []want{{"/strings/0/unit", "0", "1 or more", ""}}},
		{"half a unit", []edit{{"/strings/0/unit", `0.5`}}, []want{{"/strings/0/unit", "0.5", "a whole number", ""}}},
		{"a count beyond counting", []edit{{"/planes/0/positions", `1e30`}}, []want{{"/planes/0/positions", "1e30", "up to 1000000000", "at most 1000000000"}}},

		// Temperatures and coefficients.
		{"colder than the world", []edit{{"/site/coldest_c", `-90.1`}}, []want{{"/site/coldest_c", "−90.1 °C", "from −90 to 60 °C", "The coldest temperature must lie from −90 to 60 °C"}}},
		{"hotter than the world", []edit{{"/site/hottest_c", `{"value": 140.1, "unit": "°F"}`}}, []want{{"/site/hottest_c", "140.1 °F", "from −90 to 60 °C", ""}}},
		{"coldest not below hottest", []edit{{"/site/coldest_c", `37`}}, []want{{"/site/coldest_c", "37 °C", "below the hottest temperature, 37 °C", "37 °C is not below 37 °C"}}},
		{"coldest in °F not below hottest", []edit{{"/site/coldest_c", `{"value": 98.6, "unit": "°F"}`}}, []want{{"/site/coldest_c", "98.6 °F", "below the hottest temperature, 37 °C", ""}}},
		{"a faulty hottest bounds no coldest", []edit{{"/site/hottest_c", `-99`}}, []want{{"/site/hottest_c", "−99 °C", "", ""}}},
		{"kelvin", []edit{{"/site/coldest_c", `{"value": 250, "unit": "K"}`}}, []want{{"/site/coldest_c/unit", `"K"`, "°C or °F", "The unit of the temperature must be °C or °F."}}},
		{"temperature without unit", []edit{{"/site/coldest_c", `{"value": 7}`}}, []want{{"/site/coldest_c/unit", "nothing", "°C or °F", "Choose the unit of the temperature."}}},
		{"temperature without value", []edit{{"/site/coldest_c", `{"unit": "°F"}`}}, []want{{"/site/coldest_c/value", "nothing", "a number", "Enter the coldest temperature."}}},
		{"temperature with more", []edit{{"/site/coldest_c", `{"value": 7, "unit": "°F", "basis": "x"}`}}, []want{{"/site/coldest_c/basis", "", "one of value and unit", ""}}},
		{"temperature as text", []edit{{"/site/coldest_c", `"7 °F"`}}, []want{{"/site/coldest_c", `"7 °F"`, "a number in °C, or a value with the unit °C or °F", ""}}},
		{"text as the value", []edit{{"/site/coldest_c", `{"value": "7", "unit": "°F"}`}}, []want{{"/site/coldest_c/value", `"7"`, "a number", "write 7 without the quotes"}}},
		{"coefficient without unit", []edit{{"/modules/0/voc_temp_coeff", `-0.27`}}, []want{{"/modules/0/voc_temp_coeff", "−0.27", `{"value": …, "unit": …}`, "%/°C, mV/°C or V/°C"}}},
		{"coefficient missing", []edit{{"/modules/0/voc_temp_coeff", ""}}, []want{{"/modules/0/voc_temp_coeff", "nothing", `{"value": …, "unit": …}`, "Enter the temperature coefficient of Voc."}}},
		{"coefficient's unit missing", []edit{{"/modules/0/voc_temp_coeff/unit", ""}}, []want{{"/modules/0/voc_temp_coeff/unit", "nothing", "%/°C, mV/°C or V/°C", "Choose the unit"}}},
		{"coefficient's value missing", []edit{{"/modules/0/voc_temp_coeff/value", ""}}, []want{{"/modules/0/voc_temp_coeff/value", "nothing", "a number", ""}}},
		{"voltage per watt", []edit{{"/modules/0/voc_temp_coeff/unit", `"W/°C"`}}, []want{{"/modules/0/voc_temp_coeff/unit", `"W/°C"`, "%/°C, mV/°C or V/°C", ""}}},
		{"current in volts", []edit{{"/modules/0/isc_temp_coeff/unit", `"V/°C"`}}, []want{{"/modules/0/isc_temp_coeff/unit", `"V/°C"`, "%/°C, mA/°C or A/°C", ""}}},
		{"power in milliwatts", []edit{{"/modules/0/pmax_temp_coeff/unit", `"mW/°C"`}}, []want{{"/modules/0/pmax_temp_coeff/unit", `"mW/°C"`, "%/°C or W/°C", ""}}},
		{"per °F", []edit{{"/modules/0/voc_temp_coeff/unit", `"%/°F"`}}, []want{{"/modules/0/voc_temp_coeff/unit", `"%/°F"`, "%/°C", ""}}},
		{"percent alone", []edit{{"/modules/0/voc_temp_coeff/unit", `"%"`}}, []want{{"/modules/0/voc_temp_coeff/unit", `"%"`, "%/°C", ""}}},
		{"positive Voc coefficient", []edit{{"/modules/0/voc_temp_coeff/value", `0.27`}}, []want{{"/modules/0/voc_temp_coeff", "0.27 %/°C", "a negative number", "must be negative"}}},
		{"zero Voc coefficient", []edit{{"/modules/0/voc_temp_coeff/value", `0`}}, []want{{"/modules/0/voc_temp_coeff", "0 %/°C", "a negative number", ""}}},
		{"positive Vmp coefficient", []edit{{"/modules/0/vmp_temp_coeff", `{"value": 3, "unit": "mV/K"}`}}, []want{{"/modules/0/vmp_temp_coeff", "3 mV/K", "a negative number", ""}}},
		{"positive power coefficient", []edit{{"/modules/0/pmax_temp_coeff/value", `0.34`}}, []want{{"/modules/0/pmax_temp_coeff", "0.34 %/°C", "a negative number", ""}}},
		{"steep Voc coefficient", []edit{{"/modules/0/voc_temp_coeff/value", `-1.0000001`}}, []want{{"/modules/0/voc_temp_coeff", "−1.0000001 %/°C", "from −1.0 to −0.05 %/°C", "Check the number and its unit"}}},
		{"flat Voc coefficient", []edit{{"/modules/0/voc_temp_coeff/value", `-0.0499`}}, []want{{"/modules/0/voc_temp_coeff", "−0.0499 %/°C", "from −1.0 to −0.05 %/°C", ""}}},
		// −0.3732 V/°C is exactly −1 % of 37.32 V
		{"steep in volts", []edit{{"/modules/0/voc_temp_coeff", `{"value": -0.37321, "unit": "V/°C"}`}}, []want{{"/modules/0/voc_temp_coeff", "−0.37321 V/°C, which is about −1.0001 %/°C", "from −1.0 to −0.05 %/°C", ""}}},
		{"millivolts for percent", []edit{{"/modules/0/voc_temp_coeff", `{"value": -0.27, "unit": "mV/°C"}`}}, []want{{"/modules/0/voc_temp_coeff", "−0.27 mV/°C, which is about −0.0007 %/°C", "", ""}}},
		{"volts of no voltage", []edit{{"/modules/0/voc_temp_coeff", `{"value": -9, "unit": "V/°C"}`}, {"/modules/0/voc_v", `0`}}, []want{{"/modules/0/voc_v", "0 V", "a number in V above 0", ""}}},
		{"steep Vmp coefficient", []edit{{"/modules/0/vmp_temp_coeff", `{"value": -313, "unit": "mV/°C"}`}}, []want{{"/modules/0/vmp_temp_coeff", "−313 mV/°C, which is about −1.0013 %/°C", "", ""}}},

		// One value against another.
		{"Voc at Vmp", []edit{{"/modules/0/voc_v", `31.26`}}, []want{{"/modules/0/voc_v", "31.26 V", "more than Vmp, 31.26 V", "Voc must be above Vmp: 31.26 V is not above 31.26 V."}}},
		{"Isc below Imp", []edit{{"/modules/0/isc_a", `13.0`}}, []want{{"/modules/0/isc_a", "13 A", "more than Imp, 13.12 A", "Isc must be above Imp"}}},
		{"a faulty Vmp bounds no Voc", []edit{{"/modules/0/voc_v", `1`}, {"/modules/0/vmp_v", `-2`}}, []want{{"/modules/0/vmp_v", "−2 V", "", ""}}},
		{"MPPT window upside down", []edit{{"/inverters/0/trackers/0/mppt_min_v", `850.1`}}, []want{{"/inverters/0/trackers/0/mppt_min_v", "850.1 V", "no more than the highest, 850 V", "850.1 V is above 850 V"}}},
		{"full power below the window", []edit{{"/inverters/0/trackers/0/full_power_min_v", `159.9`}}, []want{{"/inverters/0/trackers/0/full_power_min_v", "159.9 V", "no less than the lowest MPPT voltage, 160 V", "inside the MPPT window"}}},
		{"full power above the window", []edit{{"/inverters/0/trackers/0/full_power_max_v", `850.1`}}, []want{{"/inverters/0/trackers/0/full_power_max_v", "850.1 V", "no more than the highest MPPT voltage, 850 V", ""}}},
		{"full power starts above the window", []edit{{"/inverters/0/trackers/0/full_power_min_v", `851`}, {"/inverters/0/trackers/0/full_power_max_v", ""}}, []want{{"/inverters/0/trackers/0/full_power_min_v", "851 V", "no more than", ""}}},
		{"full power upside down", []edit{{"/inverters/0/trackers/0/full_power_min_v", `801`}}, []want{{"/inverters/0/trackers/0/full_power_min_v", "801 V", "no more than the highest for it, 800 V", ""}}},
		{"a faulty window bounds nothing", []edit{{"/inverters/0/trackers/0/mppt_min_v", `-1`}, {"/inverters/0/trackers/0/full_power_min_v", `0.5`}}, []want{{"/inverters/0/trackers/0/mppt_min_v", "−1 V", "", ""}}},
		{"table below −40 °C", []edit{{"/voltage_method", `"table"`}, {"/site/coldest_c", `-40.1`}}, []want{{"/voltage_method", "table, with a coldest temperature of −40.1 °C", "coefficient", "ends at −40 °C"}}},
		{"table below −40 °F", []edit{{"/voltage_method", `"table"`}, {"/site/coldest_c", `{"value": -40.1, "unit": "°F"}`}}, []want{{"/voltage_method", "−40.1 °F", "", ""}}},
		{"table for thin film", []edit{{"/voltage_method", `"table"`}, {"/modules/1", secondModule}, {"/planes/1/module", `"m2"`}}, []want{{"/voltage_method", "table, with a module of cdte", "crystalline silicon", `module "m2" is cdte`}}},
		{"table and a faulty technology", []edit{{"/voltage_method", `"table"`}, {"/modules/0/technology", `"x"`}}, []want{{"/modules/0/technology", "", "", ""}}},

		// Not negative, and below 100 %.
		{"negative gain", []edit{{"/planes/0/current_gain_pct", `-0.1`}}, []want{{"/planes/0/current_gain_pct", "−0.1 %", "a number in %, 0 or more", "must be 0 or more: −0.1 % is below"}}},
		{"negative hot allowance", []edit{{"/allowances/hot_voltage_pct", `-1`}}, []want{{"/allowances/hot_voltage_pct", "−1 %", "0 or more", ""}}},
		{"hot allowance of everything", []edit{{"/allowances/hot_voltage_pct", `100`}}, []want{{"/allowances/hot_voltage_pct", "100 %", "less than 100 %", "leaves no voltage"}}},
		{"negative cold allowance", []edit{{"/allowances/cold_voltage_pct", `-1`}}, []want{{"/allowances/cold_voltage_pct", "−1 %", "0 or more", ""}}},
		{"negative headroom", []edit{{"/allowances/headroom_c", `-1`}}, []want{{"/allowances/headroom_c", "−1 °C", "0 or more", ""}}},
		{"negative rise", []edit{{"/planes/0/hot_cell_rise_c", `-1`}}, []want{{"/planes/0/hot_cell_rise_c", "−1 °C", "0 or more", ""}}},
		{"negative rise in °F", []edit{{"/planes/0/hot_cell_rise_c", `{"value": -1, "unit": "°F"}`}}, []want{{"/planes/0/hot_cell_rise_c", "−1 °F", "0 or more", ""}}},
		{"negative back-feed", []edit{{"/inverters/0/back_feed_a", `-1`}}, []want{{"/inverters/0/back_feed_a", "−1 A", "0 or more", ""}}},
		{"negative bifaciality", []edit{{"/modules/0/bifaciality", `-0.7`}}, []want{{"/modules/0/bifaciality", "−0.7", "a number, 0 or more", ""}}},

		// Free names.
		{"source without a pointer", []edit{{"/sources", `{"voc_v": "datasheet"}`}}, []want{{"/sources/voc_v", `"voc_v"`, "a JSON Pointer", ""}}},
		{"source that is no text", []edit{{"/sources", `{"/modules/0/voc_v": 1}`}}, []want{{"/sources/~1modules~10~1voc_v", "1", "a text", ""}}},
		{"sources that are a list", []edit{{"/sources", `["/modules/0/voc_v"]`}}, []want{{"/sources", "a list", "an object of texts", ""}}},
		{"answer without a reason", []edit{{"/answers", `[{"pointer": "/modules/0/voc_v", "value_asked": 37.32, "reason": ""}]`}}, []want{{"/answers/0/reason", `""`, "a text that is not blank", "Enter the reason"}}},
		{"answer to no pointer", []edit{{"/answers", `[{"pointer": "modules/0/voc_v", "value_asked": 37.32, "reason": "r"}]`}}, []want{{"/answers/0/pointer", `"modules/0/voc_v"`, "a JSON Pointer", ""}}},
		{"answer about nothing", []edit{{"/answers", `[{"pointer": "/modules/0/voc_v", "reason": "r"}]`}}, []want{{"/answers/0/value_asked", "nothing", "a number, a text, or an object of them", ""}}},
		{"answer about null", []edit{{"/answers", `[{"pointer": "/modules/0/voc_v", "value_asked": {"voc_v": null}, "reason": "r"}]`}}, []want{{"/answers/0/value_asked/voc_v", "null", "a number, a text", ""}}},
		{"text of the job", []edit{{"/job", `{"permit_number": 12}`}}, []want{{"/job/permit_number", "12", "a text", ""}}},
	}
	// Each of these must be above 0: nought and a negative number are refused.
	for _, pointer := range []string{
		"/modules/0/pmax_w", "/modules/0/voc_v", "/modules/0/isc_a", "/modules/0/vmp_v", "/modules/0/imp_a",
		"/modules/0/max_system_voltage_v", "/modules/0/max_series_fuse_a", "/modules/0/isc_marked_max_a", "/modules/0/length_mm", "/modules/0/width_mm",
		"/inverters/0/ac_rated_w", "/inverters/0/max_dc_power_w", "/inverters/0/max_dc_voltage_v", "/inverters/0/start_voltage_v",
		"/inverters/0/trackers/0/mppt_min_v", "/inverters/0/trackers/0/mppt_max_v", "/inverters/0/trackers/0/full_power_min_v", "/inverters/0/trackers/0/full_power_max_v",
		"/inverters/0/trackers/0/max_input_current_a", "/inverters/0/trackers/0/max_input_current_per_input_a",
		"/inverters/0/trackers/0/max_short_circuit_current_a", "/inverters/0/trackers/0/max_short_circuit_current_per_input_a", "/inverters/0/trackers/0/string_fuse_a",
		"/other_limits/0/max_voltage_v",
	} {
		for _, value := range []string{"0", "-0.5", "0e5"} {
			tests = append(tests, struct {
				name  string
				edits []edit
				want  []want
			}{pointer + " " + value, []edit{{pointer, value}}, []want{{pointer, typeset(value) + " " + unitOf(pointer), "above 0", "must be above 0"}}})
		}
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			read := Read(edited(t, tt.edits...))
			if read.Design != nil || read.Malformed {
				t.Fatalf("design %v, malformed %v: %v", read.Design != nil, read.Malformed, read.Faults)
			}
			if len(read.Faults) != len(tt.want) {
				t.Fatalf("%d faults, want %d:\n%s", len(read.Faults), len(tt.want), AppendFaults(nil, read.Faults))
			}
			for i, want := range tt.want {
				got := read.Faults[i]
				if got.Pointer != want.pointer || !strings.Contains(got.Found, want.found) || !strings.Contains(got.Expected, want.expected) || !strings.Contains(got.Detail, want.detail) {
					t.Errorf("got  %q\nwant %q", got, want)
				}
				for _, word := range []string{"please", "invalid", "sorry", "error"} {
					if strings.Contains(strings.ToLower(got.Detail), word) {
						t.Errorf("the detail has the word %q: %s", word, got.Detail)
					}
				}
				if got.Found == "" || got.Expected == "" || !strings.HasSuffix(got.Detail, ".") {
					t.Errorf("not a whole fault: %q", got)
				}
			}
		})
	}
}

// TestNotFaults: what the format page says is never a fault, and the edges of the rules.
func TestNotFaults(t *testing.T) {
	tests := []struct {
		name  string
		edits []edit
	}{
		{"the example", nil},
		{"12.0 is whole", []edit{{"/strings/0/modules_in_series", `12.0`}, {"/planes/0/positions", `2.4e1`}}},
		{"more modules than places", []edit{{"/planes/0/positions", `0`}}},
		{"more strings than inputs", []edit{{"/strings/0/strings_in_parallel", `99`}}},
		{"a string far too long", []edit{{"/strings/0/modules_in_series", `1000000000`}}},
		{"a start voltage below the MPPT minimum", []edit{{"/inverters/0/start_voltage_v", `1`}}},
		{"a large module", []edit{{"/modules/0/length_mm", `99999`}}},
		{"a DC power far above the AC rating", []edit{{"/inverters/0/max_dc_power_w", `1e9`}}},
		{"a gain without bifaciality", []edit{{"/planes/0/current_gain_pct", `10`}}},
		{"implausible: Pmax", []edit{{"/modules/0/pmax_w", `4`}}},
		{"implausible: cells", []edit{{"/modules/0/cells_in_series", `5`}}},
		{"implausible: negative current coefficient", []edit{{"/modules/0/isc_temp_coeff/value", `-0.05`}}},
		{"no current coefficient at all", []edit{{"/modules/0/isc_temp_coeff/value", `0`}}},
		{"steepest coefficient", []edit{{"/modules/0/voc_temp_coeff/value", `-1`}}},
		{"flattest coefficient", []edit{{"/modules/0/voc_temp_coeff/value", `-0.05`}}},
		{"steepest in volts", []edit{{"/modules/0/voc_temp_coeff", `{"value": -0.3732, "unit": "V/K"}`}}}, // 1 % of 37.32 V
		{"flattest in millivolts", []edit{{"/modules/0/voc_temp_coeff", `{"value": -18.66, "unit": "mV/C"}`}}},
		{"a steep power coefficient", []edit{{"/modules/0/pmax_temp_coeff", `{"value": -9, "unit": "W/C"}`}}},
		{"units of current", []edit{{"/modules/0/isc_temp_coeff", `{"value": 6, "unit": "mA/K"}`}}},
		{"coldest of the world", []edit{{"/site/coldest_c", `-90`}}},
		{"hottest of the world", []edit{{"/site/hottest_c", `{"value": 140, "unit": "°F"}`}}},
		{"°C said", []edit{{"/site/coldest_c", `{"value": -21, "unit": "°C"}`}}},
		{"a window of one voltage", []edit{{"/inverters/0/trackers/0/mppt_min_v", `600`}, {"/inverters/0/trackers/0/mppt_max_v", `600`},
			{"/inverters/0/trackers/0/full_power_min_v", `600`}, {"/inverters/0/trackers/0/full_power_max_v", `600`}}},
		{"a window above the maximum DC voltage", []edit{{"/inverters/0/max_dc_voltage_v", `100`}}},
		{"table at −40 °C", []edit{{"/voltage_method", `"table"`}, {"/site/coldest_c", `{"value": -40, "unit": "°F"}`}}},
		{"table, and thin film that no plane uses", []edit{{"/voltage_method", `"table"`}, {"/modules/1", secondModule}}},
		{"nothing strung", []edit{{"/strings", ""}}},
		{"an empty list of strings", []edit{{"/strings", `[]`}, {"/other_limits", `[]`}, {"/answers", `[]`}, {"/sources", `{}`}, {"/job", `{}`}, {"/allowances", `{}`}}},
		{"below the sea", []edit{{"/site/elevation_m", `-400`}}},
		{"turned the other way", []edit{{"/planes/0/azimuth_deg", `-90`}, {"/planes/0/tilt_deg", `-5`}}},
		{"no allowance", []edit{{"/allowances", `{"hot_voltage_pct": 0, "cold_voltage_pct": 0, "headroom_c": 0}`}}},
		{"advice", []edit{{"/inverters/0/max_dc_power_is", `"advice"`}}},
		{"40 digits", []edit{{"/modules/0/voc_v", `37.` + strings.Repeat("3", 38)}}},
		{"tracker ids repeat between inverters", []edit{{"/inverters/1", `{"id": "i2", "max_dc_voltage_v": 600, "trackers": [{"id": "t1", "mppt_min_v": 1, "mppt_max_v": 2, "inputs": 1, "max_input_current_a": 1}]}`}}},
		{"a source of what is not there", []edit{{"/sources", `{"/modules/7/voc_v": "datasheet", "": "all of it"}`}}},
		{"blank free texts", []edit{{"/title", `""`}, {"/site/name", `""`}, {"/other_limits/0/source", `""`}}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			if read := Read(edited(t, tt.edits...)); read.Design == nil {
				t.Fatalf("refused: %s", AppendFaults(nil, read.Faults))
			}
		})
	}
}

// TestFaults_AllAtOnce: faults everywhere come in one answer, in the order of the text.
func TestFaults_AllAtOnce(t *testing.T) {
	text := `{
		"format": "rimeline-design/1", "title": "x", "title": "y", "rulebook": "nec-1999", "short_circuit_basis": null,
		"site": {"name": "s", "structure": "other-building", "coldest_c": 20, "coldest_basis": "other", "hottest_c": 10, "hottest_basis": "other", "Station": "x"},
		"modules": [{"id": "m", "technology": "cdte", "pmax_w": "410", "voc_v": 30, "isc_a": 10, "vmp_v": 31, "imp_a": 9,
			"voc_temp_coeff": {"value": 0.2, "unit": "%/°C"}, "max_system_voltage_v": 1000}, 7],
		"inverters": [],
		"planes": [{"id": "p", "module": "gone", "positions": -1, "hot_cell_rise_c": 30}],
		"strings": [{"inverter": "i", "unit": 1, "tracker": "t", "plane": "gone", "modules_in_series": 1.5, "strings_in_parallel": 1}]
	}`
	want := []string{
		"/title", "/rulebook", "/short_circuit_basis", "/site/coldest_c", "/site/Station",
		"/modules/0/pmax_w", "/modules/0/voc_v", "/modules/0/voc_temp_coeff", "/modules/1",
		"/inverters", "/planes/0/positions", "/strings/0/plane", "/strings/0/modules_in_series",
	}
	read := Read([]byte(text))
	got := make([]string, len(read.Faults))
	for i, f := range read.Faults {
		got[i] = f.Pointer
	}
	if fmt.Sprint(got) != fmt.Sprint(want) {
		t.Errorf("got  %v\nwant %v\n%s", got, want, AppendFaults(nil, read.Faults))
	}
}

// Names that repeat cannot be written by encoding/json; so here as text.
func TestFaults_Names(t *testing.T) {
	tests := []struct{ name, old, new, pointer, detail string }{
		{"twice", `"voc_v": 37.32,`, `"voc_v": 37.32, "voc_v": 37.33,`, "/modules/0/voc_v", "stands here twice"},
		{"twice by an escape", `"voc_v": 37.32,`, `"voc_v": 37.32, "\u0076oc_v": 37.32,`, "/modules/0/voc_v", "stands here twice"},
		{"twice but for case", `"voc_v": 37.32,`, `"voc_v": 37.32, "VOC_V": 37.32,`, "/modules/0/VOC_V", "did you mean voc_v"},
		{"a whole list twice", `"planes": [`, `"planes": [{"id": "a", "module": "m1", "positions": 1, "hot_cell_rise_c": 1}], "planes": [`, "/planes", "stands here twice"},
		{"a source twice", `"allowances"`, `"sources": {"/title": "a", "/title": "b"}, "allowances"`, "/sources/~1title", "stands here twice"},
		{"a source twice but for case", `"allowances"`, `"sources": {"/title": "a", "/Title": "b"}, "allowances"`, "/sources/~1Title", "differ only in case"},
		{"an asked value twice", `"allowances"`, `"answers": [{"pointer": "/title", "value_asked": {"a": 1, "a": 2}, "reason": "r"}], "allowances"`, "/answers/0/value_asked/a", "stands here twice"},
		{"an asked value twice but for case", `"allowances"`, `"answers": [{"pointer": "/title", "value_asked": {"a": 1, "A": 2}, "reason": "r"}], "allowances"`, "/answers/0/value_asked/A", "differ only in case"},
	}
	for _, tt := range tests {
		text := string(example(t))
		if strings.Count(text, tt.old) != 1 {
			t.Fatalf("%s: the example has %s %d times", tt.name, tt.old, strings.Count(text, tt.old))
		}
		read := Read([]byte(strings.Replace(text, tt.old, tt.new, 1)))
		if len(read.Faults) != 1 || read.Faults[0].Pointer != tt.pointer || !strings.Contains(read.Faults[0].Detail, tt.detail) {
			t.Errorf("%s: got %s", tt.name, AppendFaults(nil, read.Faults))
		}
	}
}

// A hostile text is not answered with a list, or with memory, many times its size.
func TestFaults_AreCapped(t *testing.T) {
	for name, text := range map[string]string{
		"fields":      `{` + strings.Repeat(`"x":0,`, 100_000) + `"x":0}`,
		"one field":   `{` + strings.Repeat(`"title":"",`, 100_000) + `"title":""}`,
		"modules":     `{"modules":[` + strings.Repeat(`{},`, 100_000) + `{}]}`,
		"trackers":    `{"inverters":[{"trackers":[` + strings.Repeat(`{},`, 100_000) + `0]}]}`,
		"strings":     `{"strings":[` + strings.Repeat(`0,`, 100_000) + `0]}`,
		"sources":     `{"sources":{` + strings.Repeat(`"a":0,`, 100_000) + `"a":0}}`,
		"asked":       `{"answers":[{"value_asked":{` + strings.Repeat(`"a":null,`, 100_000) + `"a":0}}]}`,
		"empty lists": `{"modules":[` + strings.Repeat(`[],`, 100_000) + `[]]}`,
	} {
		start := time.Now()
		faults := Read([]byte(text)).Faults
		if len(faults) != maxFaults+1 || !strings.Contains(faults[maxFaults].Detail, "more faults") {
			t.Errorf("%s: %d faults, want %d and one that says there are more", name, len(faults), maxFaults)
		}
		if spent := time.Since(start); spent > 5*time.Second {
			t.Errorf("%s: took %v", name, spent)
		}
		t.Logf("%s: %d bytes in %v", name, len(text), time.Since(start))
	}
}
