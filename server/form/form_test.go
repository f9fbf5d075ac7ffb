package form

import (
	"bytes"
	"errors"
	"fmt"
	"net/url"
	"os"
	"slices"
	"strings"
	"testing"

	"rimeline/sizing/design"
)

// example is the design that the format page shows.
func example(t testing.TB) []byte {
	t.Helper()
	b, err := os.ReadFile("../../sizing/design/testdata/example-design.json")
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// everyField is a sound document with every field of the format page, each with a
// value of its own (all invented).
const everyField = `{
"format": "rimeline-design/1", "title": "All of it", "rulebook": "nec-2020", "voltage_method": "coefficient", "short_circuit_basis": "rated",
"site": {"name": "Site", "structure": "ground-mounted", "station": "Station", "elevation_m": 12.5,
	"coldest_c": {"value": 7, "unit": "°F"}, "coldest_basis": "annual-extreme-mean-minimum", "hottest_c": 36.1, "hottest_basis": "cooling-2-percent"},
"modules": [{"id": "m1", "maker": "Maker", "model": "Model", "technology": "mono-si", "cells_in_series": 54, "pmax_w": 410, "voc_v": 37.32, "isc_a": 13.95,
	"vmp_v": 31.26, "imp_a": 13.12, "voc_temp_coeff": {"value": -100.5, "unit": "mV/°C"}, "isc_temp_coeff": {"value": 6.7, "unit": "mA/K"},
	"pmax_temp_coeff": {"value": -0.34, "unit": "%/C"}, "vmp_temp_coeff": {"value": -0.11, "unit": "V/°C"}, "max_system_voltage_v": 1500,
	"max_series_fuse_a": 25, "isc_marked_max_a": 15.3, "bifaciality": 0.7, "noct_c": 45, "length_mm": 1722, "width_mm": 1134}],
"inverters": [{"id": "i1", "maker": "Maker", "model": "Model", "quantity": 2, "ac_rated_w": 12000, "max_dc_power_w": 18000, "max_dc_power_is": "advice",
	"max_dc_voltage_v": 1000, "start_voltage_v": 180, "back_feed_a": 0,
	"trackers": [{"id": "t1", "mppt_min_v": 160, "mppt_max_v": 850, "full_power_min_v": 380, "full_power_max_v": 800, "inputs": 2, "max_input_current_a": 26,
		"max_input_current_per_input_a": 15, "max_short_circuit_current_a": 40, "max_short_circuit_current_per_input_a": 25, "string_fuse_a": 20}]}],
"planes": [{"id": "South", "module": "m1", "positions": 24, "hot_cell_rise_c": {"value": 54, "unit": "°F"}, "tilt_deg": 30, "azimuth_deg": 180, "current_gain_pct": 5}],
"allowances": {"hot_voltage_pct": 3, "cold_voltage_pct": 1, "headroom_c": {"value": 5.4, "unit": "°F"}},
"other_limits": [{"name": "connectors", "max_voltage_v": 1500, "source": "label"}],
"strings": [{"inverter": "i1", "unit": 2, "tracker": "t1", "plane": "South", "modules_in_series": 12, "strings_in_parallel": 1}],
"job": {"client": "Client", "address": "Address", "authority": "Authority", "permit_number": "P-1", "preparer": "Preparer", "licence": "L-1", "note": "one\ntwo"},
"sources": {"/modules/0": "datasheet", "/modules/0/voc_v": "datasheet, page 2"},
"answers": [{"pointer": "/modules/0/voc_v", "value_asked": {"cells_in_series": 54, "voc_v": 37.32}, "reason": "read twice"}]
}`

// canonical returns the canonical JSON of a document that the reader must accept.
func canonical(t testing.TB, doc []byte) string {
	t.Helper()
	read := design.Read(doc)
	if read.Design == nil {
		t.Fatalf("refused: %v\n%s", read.Faults, doc)
	}
	return string(design.AppendJSON(nil, read.Design))
}

// valuesOf is what a browser sends of a form.
func valuesOf(f *Form) url.Values {
	v := url.Values{}
	for name, typed := range f.texts {
		v.Set(name, typed)
	}
	return v
}

func TestRoundTrip(t *testing.T) {
	t.Parallel()
	for name, doc := range map[string][]byte{"example": example(t), "every field": []byte(everyField)} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			want := canonical(t, doc)
			f, without, err := FromDocument(doc)
			if err != nil || len(without) > 0 {
				t.Fatalf("FromDocument: without %q, error %v", without, err)
			}
			if got := canonical(t, f.Document()); got != want {
				t.Errorf("document to form to document:\n got %s\nwant %s", got, want)
			}
			posted, err := FromValues(valuesOf(f))
			if err != nil {
				t.Fatal(err)
			}
			if got := canonical(t, posted.Document()); got != want {
				t.Errorf("and through a post:\n got %s\nwant %s", got, want)
			}
		})
	}
}

// TestNew_Complete: what the page knows without asking is never among the faults of
// a form that nobody has typed into yet, and everything else is named.
func TestNew_Complete(t *testing.T) {
	t.Parallel()
	_, faults := New().Read()
	var missing []string
	for _, fault := range faults {
		missing = append(missing, fault.Pointer)
	}
	// Source: the fields that the format page requires, less ids, references and texts.
	want := strings.Fields(`/rulebook /site/structure /site/coldest_c /site/coldest_basis /site/hottest_c /site/hottest_basis
		/modules/0/technology /modules/0/pmax_w /modules/0/voc_v /modules/0/isc_a /modules/0/vmp_v /modules/0/imp_a
		/modules/0/voc_temp_coeff /modules/0/max_system_voltage_v /inverters/0/max_dc_voltage_v
		/inverters/0/trackers/0/mppt_min_v /inverters/0/trackers/0/mppt_max_v /inverters/0/trackers/0/inputs
		/inverters/0/trackers/0/max_input_current_a /planes/0/positions /planes/0/hot_cell_rise_c`)
	slices.Sort(missing)
	slices.Sort(want)
	if !slices.Equal(missing, want) {
		t.Errorf("missing in the empty form\n got %q\nwant %q", missing, want)
	}
}

// change returns the example as a form with some fields typed anew.
func change(t testing.TB, typed map[string]string) *Form {
	t.Helper()
	f, _, err := FromDocument(example(t))
	if err != nil {
		t.Fatal(err)
	}
	v := valuesOf(f)
	for name, s := range typed {
		v.Set(name, s)
	}
	if f, err = FromValues(v); err != nil {
		t.Fatal(err)
	}
	return f
}

// TestRead_AsTyped: what people type and paste is read as they mean it.
func TestRead_AsTyped(t *testing.T) {
	t.Parallel()
	want := canonical(t, example(t))
	for _, tc := range []struct{ name, typed string }{
		{"/modules/0/voc_v", "37,32"},
		{"/modules/0/voc_v", " 37.32 V "},
		{"/modules/0/voc_v", "37.32V"},
		{"/modules/0/voc_temp_coeff/value", "−0.27"}, // U+2212
		{"/modules/0/voc_temp_coeff/value", "–0.27"}, // en dash
		{"/modules/0/voc_temp_coeff/value", "-0,27"},
		{"/modules/0/voc_temp_coeff/value", "−0.27 %/°C"},
		{"/modules/0/voc_temp_coeff/value", "-0.27 %/K"},
		{"/site/coldest_c/value", "−21.0 °C"},
		{"/site/coldest_c/value", "-21.0C"},
		{"/modules/0/length_mm", "1722 mm"},
		{"/planes/0/azimuth_deg", "180°"},
		{"/allowances/hot_voltage_pct", "3.0 %"},
		{"/inverters/0/trackers/0/inputs", " 2 "},
		{"/title", "Larkspur Mill workshop, south and west planes "},
	} {
		if got := canonical(t, change(t, map[string]string{tc.name: tc.typed}).Document()); got != want {
			t.Errorf("%s typed %q:\n got %s\nwant %s", tc.name, tc.typed, got, want)
		}
	}
}

// TestRead_Refused: what cannot be taken is said at its field, in words about what was typed.
func TestRead_Refused(t *testing.T) {
	t.Parallel()
	for _, tc := range []struct {
		name    string
		typed   map[string]string
		pointer string
		says    string
	}{
		{"no number", map[string]string{"/modules/0/voc_v": "abc"}, "/modules/0/voc_v", "“abc” cannot be read as a number"},
		{"two readings", map[string]string{"/modules/0/pmax_w": "1,000"}, "/modules/0/pmax_w", "1000 or 1.000"},
		{"the unit of another field", map[string]string{"/modules/0/voc_v": "13.95 A"}, "/modules/0/voc_v", "asked for in V"},
		{"another size of the unit", map[string]string{"/inverters/0/ac_rated_w": "12 kW"}, "/inverters/0/ac_rated_w", "typed in kW"},
		{"a unit where there is none", map[string]string{"/modules/0/bifaciality": "70 %"}, "/modules/0/bifaciality", "this value has none"},
		{"°F typed, °C chosen", map[string]string{"/site/coldest_c/value": "-6 °F"}, "/site/coldest_c", "Which one is meant?"},
		{"no unit chosen", map[string]string{"/site/coldest_c/unit": ""}, "/site/coldest_c", "Choose the unit"},
		{"coefficient without a unit", map[string]string{"/modules/0/voc_temp_coeff/unit": ""}, "/modules/0/voc_temp_coeff", "Choose the unit"},
		{"coefficient in a unit of its own", map[string]string{"/modules/0/voc_temp_coeff/value": "-0.27 %/m"}, "/modules/0/voc_temp_coeff", "%/m"},
		{"a sign lost", map[string]string{"/modules/0/voc_temp_coeff/value": "0.27"}, "/modules/0/voc_temp_coeff", "must be negative"},
		{"half a module", map[string]string{"/strings/0/modules_in_series": "12.5"}, "/strings/0/modules_in_series", "whole number"},
		{"nothing", map[string]string{"/modules/0/voc_v": " "}, "/modules/0/voc_v", "Enter the open-circuit voltage"},
	} {
		t.Run(tc.name, func(t *testing.T) {
			t.Parallel()
			f := change(t, tc.typed)
			d, faults := f.Read()
			if d != nil || len(faults) != 1 {
				t.Fatalf("design %v, faults %v; want none, and one fault", d != nil, faults)
			}
			if got := FieldOf(faults[0].Pointer); got != tc.pointer || !strings.Contains(faults[0].Detail, tc.says) {
				t.Errorf("fault at %q: %s\nwant at %q: …%s…", got, faults[0].Detail, tc.pointer, tc.says)
			}
			if faults[0].Found == "" || faults[0].Expected == "" {
				t.Errorf("fault %+v says nothing of what was found or would be right", faults[0])
			}
			for name, typed := range tc.typed {
				if f.Text(name) != typed {
					t.Errorf("what was typed at %s is now %q", name, f.Text(name))
				}
			}
			opened, _, err := FromDocument(f.Document())
			if err != nil {
				t.Fatal(err)
			}
			for name, typed := range tc.typed {
				if got := opened.Text(name); got != strings.TrimSpace(typed) {
					t.Errorf("saved and opened, %s is %q, want %q", name, got, typed)
				}
			}
		})
	}
}

func TestFromValues_ClosesGaps(t *testing.T) {
	t.Parallel()
	v := valuesOf(change(t, nil))
	for name, typed := range v {
		if rest, ok := strings.CutPrefix(name, "/planes/1/"); ok {
			v.Del(name)
			v["/planes/7/"+rest] = typed
		}
		if rest, ok := strings.CutPrefix(name, "/inverters/0/trackers/0/"); ok {
			v.Del(name)
			v["/inverters/0/trackers/11/"+rest] = typed // behind tracker 1
		}
	}
	f, err := FromValues(v)
	if err != nil {
		t.Fatal(err)
	}
	if n := f.Len("/planes"); n != 2 || f.Text("/planes/1/id") != "west" {
		t.Errorf("%d planes, the second %q; want 2, west", n, f.Text("/planes/1/id"))
	}
	if got := f.Text("/inverters/0/trackers/1/id"); got != "t1" {
		t.Errorf("the tracker numbered 11 is not behind the one numbered 1: %q", got)
	}
}

// TestFromValues_Foreign: names that no field has, and numbers that number nothing,
// do no harm.
func TestFromValues_Foreign(t *testing.T) {
	t.Parallel()
	f, err := FromValues(url.Values{
		"do": {"x"}, "/": {"x"}, "": {"x"}, "/modules": {"x"}, "/modules/0": {"x"}, "/modules/01/id": {"x"}, "/modules/-1/id": {"x"},
		"/modules/99999999999999999999/id": {"x"}, "/site": {"x"}, "/site/name/value": {"x"}, "/site/coldest_c/other": {"x"},
		"/site/coldest_c/value/value": {"x"}, "/nothing/0/id": {"x"}, "//": {"x"}, "/sources/a/b": {"x"},
	})
	if err != nil || len(f.texts) != 0 || f.entries() != 0 {
		t.Errorf("texts %v, lists %v, error %v; want nothing", f.texts, f.lens, err)
	}
}

func TestFromValues_TooMany(t *testing.T) {
	t.Parallel()
	v := url.Values{}
	for k := range MaxEntries + 1 {
		v.Set(fmt.Sprintf("/modules/%d/voc_v", k), "1")
	}
	if _, err := FromValues(v); !errors.Is(err, ErrTooMany) {
		t.Errorf("%d modules: error %v, want ErrTooMany", MaxEntries+1, err)
	}
	v.Del("/modules/0/voc_v")
	f, err := FromValues(v)
	if err != nil {
		t.Fatalf("%d modules: %v", MaxEntries, err)
	}
	if at := f.Add("/planes"); at != "" {
		t.Errorf("a further entry was added at %s", at)
	}
	doc := `{"strings": [` + strings.Repeat("{},", MaxEntries) + `{}]}`
	if _, _, err := FromDocument([]byte(doc)); !errors.Is(err, ErrTooMany) {
		t.Errorf("a document with %d entries: error %v, want ErrTooMany", MaxEntries+1, err)
	}
}

// TestFromValues_Completes: ids that the page hides, and references that can mean
// one thing only, are there without being sent.
func TestFromValues_Completes(t *testing.T) {
	t.Parallel()
	f, err := FromValues(url.Values{
		"/modules/0/voc_v": {"1"}, "/modules/1/id": {"m1"}, "/inverters/0/trackers/0/inputs": {"2"}, "/planes/0/id": {"South"},
		"/strings/0/modules_in_series": {"12"},
	})
	if err != nil {
		t.Fatal(err)
	}
	for name, want := range map[string]string{
		"/modules/0/id": "m2", "/inverters/0/id": "i1", "/inverters/0/trackers/0/id": "t1",
		"/strings/0/inverter": "i1", "/strings/0/plane": "South", "/strings/0/unit": "1",
		"/planes/0/module": "", // there are two
	} {
		if got := f.Text(name); got != want {
			t.Errorf("%s = %q, want %q", name, got, want)
		}
	}
}

// TestFromValues_Renamed: strings follow a plane whose name was changed after the
// page was made.
func TestFromValues_Renamed(t *testing.T) {
	t.Parallel()
	f := change(t, map[string]string{"/planes/0/id": "Workshop south", RenamedFrom("/planes/0/id"): "south"})
	if got := f.Text("/strings/0/plane"); got != "Workshop south" {
		t.Errorf("the strings are from plane %q", got)
	}
	if d, faults := f.Read(); d == nil {
		t.Errorf("refused: %v", faults)
	}
}

func TestFromValues_OpenAnswers(t *testing.T) {
	t.Parallel()
	f := change(t, map[string]string{
		"/answers/0/pointer": "/modules/0/voc_v", "/answers/0/value_asked": "37.32", "/answers/0/reason": " ",
		"/answers/3/pointer": "/modules/0/pmax_w", "/answers/3/value_asked": "410", "/answers/3/reason": "as printed",
	})
	if f.Len("/answers") != 1 || f.Text("/answers/0/pointer") != "/modules/0/pmax_w" {
		t.Errorf("%d answers, the first about %q", f.Len("/answers"), f.Text("/answers/0/pointer"))
	}
	if d, faults := f.Read(); d == nil || d.Answers[0].Reason != "as printed" {
		t.Errorf("faults %v", faults)
	}
}

func TestRemove(t *testing.T) {
	t.Parallel()
	base := map[string]string{
		"/sources/~1planes~11~1positions":              "counted",
		"/sources/~1inverters~10~1trackers~10~1inputs": "manual, page 3",
		"/sources/~1inverters~10~1trackers~11~1inputs": "manual, page 4",
		"/answers/0/pointer":                           "/modules/0/voc_v",
		"/answers/0/value_asked":                       "1",
		"/answers/0/reason":                            "so printed",
	}
	for _, tc := range []struct {
		name, remove string
		want         map[string]string
		lens         map[string]int
	}{
		{"a plane that strings are from", "/planes/0", map[string]string{
			"/planes/0/id": "west", "/strings/0/plane": "", "/strings/1/plane": "west", "/sources/~1planes~10~1positions": "counted", "/sources/~1planes~11~1positions": "",
		}, map[string]int{"/planes": 1, "/strings": 2}},
		{"a tracker that strings are on", "/inverters/0/trackers/0", map[string]string{
			"/inverters/0/trackers/0/id": "t2", "/strings/0/tracker": "", "/strings/1/tracker": "t2",
			"/sources/~1inverters~10~1trackers~10~1inputs": "manual, page 4", "/sources/~1inverters~10~1trackers~11~1inputs": "",
		}, map[string]int{"/inverters/0/trackers": 1}},
		{"the only inverter", "/inverters/0", map[string]string{
			"/strings/0/inverter": "", "/strings/0/tracker": "", "/sources/~1inverters~10~1trackers~10~1inputs": "",
		}, map[string]int{"/inverters": 0}},
		{"a module that was asked about", "/modules/0", map[string]string{
			"/planes/0/module": "", "/planes/1/module": "", "/answers/0/pointer": "",
		}, map[string]int{"/modules": 0, "/answers": 0}},
		{"a strings entry", "/strings/0", map[string]string{"/strings/0/plane": "west", "/planes/0/id": "south"}, map[string]int{"/strings": 1, "/planes": 2}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			t.Parallel()
			f := change(t, base)
			if !f.Remove(tc.remove) {
				t.Fatal("not removed")
			}
			for name, want := range tc.want {
				if got := f.Text(name); got != want {
					t.Errorf("%s = %q, want %q", name, got, want)
				}
			}
			for list, want := range tc.lens {
				if got := f.Len(list); got != want {
					t.Errorf("%s has %d entries, want %d", list, got, want)
				}
			}
		})
	}
}

func TestEdits_NoSuchPlace(t *testing.T) {
	t.Parallel()
	f := change(t, nil)
	before := string(f.Document())
	for _, at := range []string{"", "/", "x", "/modules", "/modules/1", "/modules/-1", "/modules/0/id", "/nothing/0", "/inverters/5/trackers/0", "/site", "/planes/00"} {
		if f.Remove(at) || f.CopyFirst(at) {
			t.Errorf("something was done at %q", at)
		}
	}
	for _, list := range []string{"", "/", "/modules/0", "/site", "/nothing", "/inverters/1/trackers", "/inverters/x/trackers"} {
		if at := f.Add(list); at != "" {
			t.Errorf("Add(%q) = %q", list, at)
		}
	}
	if after := string(f.Document()); after != before {
		t.Errorf("the form has changed:\n%s\n%s", before, after)
	}
}

func TestAdd(t *testing.T) {
	t.Parallel()
	f := change(t, nil)
	for _, tc := range []struct {
		list, at string
		filled   map[string]string // by the last part of the name
	}{
		{"/modules", "/modules/1", map[string]string{"id": "m2"}},
		{"/inverters", "/inverters/1", map[string]string{"id": "i2", "quantity": "1", "trackers/0/id": "t1"}},
		{"/inverters/0/trackers", "/inverters/0/trackers/2", map[string]string{"id": "t3"}},
		{"/planes", "/planes/2", map[string]string{"id": "Plane 3", "module": "", "hot_cell_rise_c/unit": "°C"}}, // two modules by now
		{"/strings", "/strings/2", map[string]string{"plane": "Plane 3", "inverter": "i1", "tracker": "t3", "unit": "1", "strings_in_parallel": "1", "modules_in_series": ""}},
		{"/strings", "/strings/3", map[string]string{"plane": "Plane 3", "inverter": "i2", "tracker": "t1"}},
		{"/other_limits", "/other_limits/1", nil},
	} {
		if at := f.Add(tc.list); at != tc.at {
			t.Errorf("Add(%s) = %q, want %q", tc.list, at, tc.at)
		}
		for name, want := range tc.filled {
			if got := f.Text(tc.at + "/" + name); got != want {
				t.Errorf("Add(%s): %s = %q, want %q", tc.list, name, got, want)
			}
		}
	}
}

func TestCopyFirst(t *testing.T) {
	t.Parallel()
	f := change(t, map[string]string{"/inverters/0/trackers/1/inputs": "1", "/inverters/0/trackers/1/string_fuse_a": "15"})
	if !f.CopyFirst("/inverters/0/trackers/1") {
		t.Fatal("not copied")
	}
	for name, want := range map[string]string{"id": "t2", "inputs": "2", "string_fuse_a": "", "mppt_max_v": "850"} {
		if got := f.Text("/inverters/0/trackers/1/" + name); got != want {
			t.Errorf("%s = %q, want %q", name, got, want)
		}
	}
}

func TestTwin(t *testing.T) {
	t.Parallel()
	// Expected values by hand: °F = °C × 9 ÷ 5 + 32; a difference without the 32.
	for _, tc := range []struct{ pointer, value, unit, want string }{
		{"/site/coldest_c", "-21.0", "°C", "= −5.8 °F"},
		{"/site/coldest_c", "−24", "°F", "≈ −31.1 °C"},
		{"/site/coldest_c", "-24", "", "in °C: = −11.2 °F; in °F: ≈ −31.1 °C"},
		{"/site/coldest_c", "-24 °F", "", "≈ −31.1 °C"},
		{"/site/coldest_c", "-24 °F", "°C", ""},
		{"/site/coldest_c", "x", "°C", ""},
		{"/site/coldest_c", "", "°C", ""},
		{"/site/hottest_c", "37.02", "°C", "≈ 98.6 °F"}, // 98.636
		{"/planes/0/hot_cell_rise_c", "30", "°C", "= 54.0 °F"},
		{"/planes/0/hot_cell_rise_c", "54", "°F", "= 30.0 °C"},
	} {
		f := change(t, map[string]string{tc.pointer + "/value": tc.value, tc.pointer + "/unit": tc.unit})
		if got := f.Twin(tc.pointer); got != tc.want {
			t.Errorf("Twin of %q %s = %q, want %q", tc.value, tc.unit, got, tc.want)
		}
	}
}

func TestFromDocument_Broken(t *testing.T) {
	t.Parallel()
	for _, doc := range []string{"", "{", "[]", "1", `"x"`, "null", "nonsense"} {
		if _, _, err := FromDocument([]byte(doc)); err == nil {
			t.Errorf("FromDocument(%q): no error", doc)
		}
	}
	f, without, err := FromDocument([]byte(`{"title": 5, "foo": 1, "site": [], "modules": [7, {"voc_v": null, "bar/baz": 1, "voc_temp_coeff": {"value": "−0.27", "x": 1}}], "planes": {}, "sources": 3}`))
	if err != nil {
		t.Fatal(err)
	}
	if want := []string{"/foo", "/modules/0", "/modules/1/bar~1baz", "/modules/1/voc_temp_coeff/x", "/planes", "/site", "/sources"}; !slices.Equal(without, want) {
		t.Errorf("without %q, want %q", without, want)
	}
	for name, want := range map[string]string{"/title": "5", "/modules/1/voc_v": "null", "/modules/1/voc_temp_coeff/value": "−0.27"} {
		if got := f.Text(name); got != want {
			t.Errorf("%s = %q, want %q", name, got, want)
		}
	}
}

func TestFieldOf(t *testing.T) {
	t.Parallel()
	for pointer, want := range map[string]string{
		"/site/coldest_c": "/site/coldest_c", "/site/coldest_c/value": "/site/coldest_c", "/modules/3/voc_temp_coeff/unit": "/modules/3/voc_temp_coeff",
		"/inverters/0/trackers/1/inputs": "/inverters/0/trackers/1/inputs", "/modules": "", "/modules/0": "", "/foo": "", "": "", "/sources/~1modules~10": "/sources/~1modules~10",
		"/inverters/0/trackers/1": "", "/title": "/title",
	} {
		if got := FieldOf(pointer); got != want {
			t.Errorf("FieldOf(%q) = %q, want %q", pointer, got, want)
		}
	}
}

// FuzzFromDocument: whatever is opened, the form's own document is JSON that says
// the same: a sound design is the same design, and opening it again changes nothing.
func FuzzFromDocument(f *testing.F) {
	f.Add(example(f))
	f.Add([]byte(everyField))
	f.Add([]byte(`{"site": {"coldest_c": "−21 °F"}, "answers": [{}], "sources": {"": ""}}`))
	f.Add([]byte(`{"sources": {"": " "}}`))
	f.Add([]byte(`{"modules": [{"id": "~/ \u0000"}], "title": "\ud800"}`))
	f.Fuzz(func(t *testing.T, doc []byte) {
		form, _, err := FromDocument(doc)
		if err != nil {
			return
		}
		first := form.Document()
		again, without, err := FromDocument(first)
		if err != nil || len(without) > 0 {
			t.Fatalf("the form's own document cannot be opened: without %q, %v\n%s", without, err, first)
		}
		if second := again.Document(); !bytes.Equal(first, second) {
			t.Fatalf("opened again it says something else:\n%s\n%s", first, second)
		}
		read := design.Read(doc)
		if read.Design == nil || blankText(read.Design) {
			return
		}
		own := design.Read(first)
		if own.Design == nil {
			t.Fatalf("a sound design is refused as a form: %v\n%s", own.Faults, first)
		}
	})
}

// blankText reports whether a design names something by white space around a text,
// which a form takes off.
func blankText(d *design.Design) bool {
	return strings.ContainsAny(fmt.Sprintf("%+v", d), " \t\n\r\u00a0\u0085\v\f")
}

// FuzzFromValues: any post makes a form whose document is JSON, and whose fields,
// posted again, make the same form.
func FuzzFromValues(f *testing.F) {
	form, _, err := FromDocument([]byte(everyField))
	if err != nil {
		f.Fatal(err)
	}
	f.Add(valuesOf(form).Encode(), "remove /planes/0")
	f.Add(valuesOf(New()).Encode(), "add /strings")
	f.Add("/modules/3/voc_v=1%2C000&/answers/0/value_asked=x&/answers/0/reason=y&was:/planes/0/id=a&/planes/0/id=b", "copy /modules/0")
	f.Fuzz(func(t *testing.T, query, do string) {
		v, err := url.ParseQuery(query)
		if err != nil {
			return
		}
		form, err := FromValues(v)
		if err != nil {
			return
		}
		form.Remove(strings.TrimPrefix(do, "remove "))
		form.Add(strings.TrimPrefix(do, "add "))
		form.CopyFirst(strings.TrimPrefix(do, "copy "))
		form.dropOpenAnswers()
		form.complete(nil)
		doc := form.Document()
		if _, _, err := FromDocument(doc); err != nil {
			t.Fatalf("the document is not JSON: %v\n%s", err, doc)
		}
		again, err := FromValues(valuesOf(form))
		if err != nil {
			t.Fatal(err)
		}
		if second := again.Document(); !bytes.Equal(doc, second) {
			t.Fatalf("posted again it says something else:\n%s\n%s", doc, second)
		}
	})
}
