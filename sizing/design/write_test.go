package design

import (
	"bytes"
	"encoding/json"
	"flag"
	"os"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"rimeline/sizing/quantity"
)

var update = flag.Bool("update", false, "write the golden files anew")

// sameNumber compares numbers by value: 12.0 and 12 are one.
var sameNumber = cmp.Comparer(func(a, b quantity.Exact) bool { return a.Equal(b) })

func TestAppendJSON_Golden(t *testing.T) {
	const golden = "testdata/full-design-canonical.json"
	got := AppendJSON(nil, Read(full(t)).Design)
	if *update {
		if err := os.WriteFile(golden, append(got, '\n'), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(string(want), string(got)+"\n"); diff != "" {
		t.Errorf("run with -update if this is meant (-want +got):\n%s", diff)
	}
}

// TestAppendJSON_RoundTrip: what is written is read as the same design, and that is
// written as the same bytes.
func TestAppendJSON_RoundTrip(t *testing.T) {
	documents := map[string][]byte{
		"example": example(t),
		"full":    full(t),
		"fewest fields": []byte(`{"format":"rimeline-design/1","title":"","rulebook":"iec-62548-1",
			"site":{"name":"","structure":"other-building","coldest_c":-1e1,"coldest_basis":"other","hottest_c":1E1,"hottest_basis":"other"},
			"modules":[{"id":"\"m\"","technology":"other","pmax_w":0.0001e-30,"voc_v":2,"isc_a":2,"vmp_v":1,"imp_a":1,"voc_temp_coeff":{"value":-0.3,"unit":"%/C"},"max_system_voltage_v":1e30}],
			"inverters":[{"id":"i","max_dc_voltage_v":1.000,"max_dc_power_is":"advice","trackers":[{"id":"t","mppt_min_v":1,"mppt_max_v":2,"inputs":1,"max_input_current_a":1}]}],
			"planes":[{"id":"p","module":"\"m\"","positions":0,"hot_cell_rise_c":0}]}`),
		"long numbers": edited(t, edit{"/inverters/0/max_dc_voltage_v", strings.Repeat("9", 40) + "e30"}, edit{"/modules/0/max_series_fuse_a", "0." + strings.Repeat("1", 39) + "e-30"},
			edit{"/modules/0/pmax_w", "1." + strings.Repeat("3", 39) + "e-10"}, edit{"/site/elevation_m", "-" + strings.Repeat("7", 20) + "." + strings.Repeat("3", 20) + "e30"}),
	}
	for name, document := range documents {
		first := Read(document)
		if first.Design == nil {
			t.Fatalf("%s is refused: %v", name, first.Faults)
		}
		text := AppendJSON(nil, first.Design)
		second := Read(text)
		if second.Design == nil {
			t.Fatalf("%s is refused when written: %v\n%s", name, second.Faults, text)
		}
		if diff := cmp.Diff(first.Design, second.Design, sameNumber); diff != "" {
			t.Errorf("%s changed (-read +read again):\n%s", name, diff)
		}
		if again := AppendJSON(nil, second.Design); !bytes.Equal(text, again) {
			t.Errorf("%s is written\n%s\nand then\n%s", name, text, again)
		}
	}
}

func TestAppendNumber(t *testing.T) {
	for _, tt := range []struct{ text, want string }{
		{"12.0", "12"}, {"-0", "0"}, {"1e3", "1000"}, {"1.50e-3", "0.0015"}, {"1e30", "1" + strings.Repeat("0", 30)},
		{"1e-30", "0." + strings.Repeat("0", 29) + "1"},
		{strings.Repeat("9", 40) + "e30", strings.Repeat("9", 40) + "e30"},
		{"-0." + strings.Repeat("1", 39) + "e-30", "-0." + strings.Repeat("1", 39) + "e-30"},
	} {
		x, err := quantity.Parse(tt.text)
		if err != nil {
			t.Fatal(err)
		}
		got := string(appendNumber([]byte("9"), x))[1:]
		if got != tt.want {
			t.Errorf("%s is written %s, want %s", tt.text, got, tt.want)
		}
		if back, err := quantity.Parse(got); err != nil || !back.Equal(x) {
			t.Errorf("%s is written %s, which is read as %v, %v", tt.text, got, back, err)
		}
	}
}

func TestAsked(t *testing.T) {
	for value, want := range map[string]string{
		`12.0`: `12`, `"a"`: `"a"`, `{}`: `{}`, `{"b": 1e1, "a": "x"}`: `{"a":"x","b":10}`,
		`{"voc_temp_coeff": {"value": -0.270, "unit": "%/K"}, "cells": 54.0}`: `{"cells":54,"voc_temp_coeff":{"unit":"%/K","value":-0.27}}`,
	} {
		d := Read(edited(t, edit{"/answers", `[{"pointer": "/title", "value_asked": ` + value + `, "reason": "r"}]`})).Design
		if d == nil || string(d.Answers[0].ValueAsked) != want {
			t.Errorf("%s is asked as %v, want %s", value, d, want)
		}
	}
}

func TestAppendRefusal(t *testing.T) {
	faults := Faults{{"/a~1b", "\"x\"\n", "a number", "One."}, {"", "nothing", "a design", "Two."}}
	got := string(AppendRefusal([]byte("x"), 3, faults))
	want := `x{"format":"rimeline-refusal/1","document":3,"errors":[{"pointer":"/a~1b","found":"\"x\"\n","expected":"a number","detail":"One."},{"pointer":"","found":"nothing","expected":"a design","detail":"Two."}]}`
	if got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
	if !json.Valid([]byte(got[1:])) {
		t.Error("not JSON")
	}
	if got := string(AppendFaults(nil, nil)); got != "[]" {
		t.Errorf("no faults are written %s", got)
	}
}
