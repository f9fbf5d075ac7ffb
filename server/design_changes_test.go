package server

import (
	"fmt"
	"slices"
	"strings"
	"testing"

	"rimeline/server/form"
)

func TestFormChanges(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	before := exampleFields(t, s, nil)
	for _, tc := range []struct {
		name string
		do   string
		now  map[string]string
		want []string // "part: field: before → after"
	}{
		{name: "nothing"},
		{name: "numbers written in another way", now: map[string]string{"/modules/0/voc_v": "37,3200", "/site/coldest_c/value": "−21.0", "/modules/0/voc_temp_coeff/value": "–0.27"}},
		{name: "spaces around", now: map[string]string{"/title": "  " + before.Get("/title") + " "}},
		{name: "a number", now: map[string]string{"/modules/0/voc_v": "38"}, want: []string{"Module: Voc: 37.32\u00a0V → 38\u00a0V"}},
		{name: "a number with its unit", now: map[string]string{"/modules/0/voc_v": "38 V"}, want: []string{"Module: Voc: 37.32\u00a0V → 38 V"}},
		{name: "no number", now: map[string]string{"/modules/0/voc_v": "x"}, want: []string{"Module: Voc: 37.32\u00a0V → x\u00a0V"}},
		{name: "emptied", now: map[string]string{"/modules/0/voc_v": ""}, want: []string{"Module: Voc: 37.32\u00a0V → "}},
		{name: "a temperature's unit", now: map[string]string{"/site/coldest_c/unit": "°F"}, want: []string{"Site: Coldest air temperature: −21.0\u00a0°C → −21.0\u00a0°F"}},
		{name: "a choice", now: map[string]string{"/rulebook": "iec-62548-1"}, want: []string{"The design: Code edition in force: NEC 2023 → IEC 62548-1"}},
		{name: "a tracker", now: map[string]string{"/inverters/0/trackers/1/inputs": "3"}, want: []string{"Inverter, tracker 2: Inputs: 2 → 3"}},
		{name: "in the order of the page", now: map[string]string{"/job/client": "Moss", "/strings/1/modules_in_series": "9", "/planes/1/tilt_deg": "7", "/title": "Shed"},
			want: []string{
				"The design: Title of the design: " + before.Get("/title") + " → Shed",
				"Plane 2: west: Tilt: 30\u00a0° → 7\u00a0°",
				"Strings 2: Modules in series: " + before.Get("/strings/1/modules_in_series") + " → 9",
				"Job: Client: " + before.Get("/job/client") + " → Moss",
			}},
		{name: "a source", now: map[string]string{"/sources/~1modules~10": "Page 2"}, want: []string{"Where values come from: " + "?"}},
		{name: "a part added", do: "add /other_limits", now: map[string]string{"/other_limits/1/name": "Switch", "/other_limits/1/max_voltage_v": "1100"},
			want: []string{"Rated part 2: Part:  → Switch", "Rated part 2: Max. voltage:  → 1100\u00a0V"}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			t.Parallel()
			v := exampleFields(t, s, nil)
			if tc.do != "" {
				v.Set("do", tc.do)
				v = post(t, s, "/design", v, 200).fields("design")
			}
			for name, typed := range tc.now {
				v.Set(name, typed)
			}
			a, err := form.FromValues(before)
			if err != nil {
				t.Fatal(err)
			}
			b, err := form.FromValues(v)
			if err != nil {
				t.Fatal(err)
			}
			var got []string
			for _, g := range formChanges(a, b) {
				for _, r := range g.Rows {
					got = append(got, fmt.Sprintf("%s: %s: %s → %s", g.Of, r.Name, r.Before, r.After))
				}
			}
			if tc.name == "a source" {
				if len(got) != 1 || !strings.HasPrefix(got[0], "Where values come from: ") || !strings.HasSuffix(got[0], " → Page 2") || strings.Contains(got[0], "~1") {
					t.Errorf("got %q", got)
				}
				return
			}
			if !slices.Equal(got, tc.want) {
				t.Errorf("got  %q\nwant %q", got, tc.want)
			}
			if back := formChanges(b, a); changesIn(back) != len(got) {
				t.Errorf("%d differences one way, %d the other", len(got), changesIn(back))
			}
		})
	}
}
