package stringing_test

import (
	"os"
	"testing"

	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// example returns the invented example design; tests then change one field.
func example(t *testing.T) *design.Design {
	t.Helper()
	text, err := os.ReadFile("../design/testdata/example-design.json")
	if err != nil {
		t.Fatal(err)
	}
	doc := design.Read(text)
	if doc.Design == nil {
		t.Fatalf("the example is refused: %v", doc.Faults)
	}
	return doc.Design
}

func number(t *testing.T, s string) *quantity.Exact {
	t.Helper()
	x, err := quantity.Parse(s)
	if err != nil {
		t.Fatal(err)
	}
	return &x
}

// checkOf returns the first check with an id.
func checkOf(t *testing.T, r *sizing.Result, id string) working.Check {
	t.Helper()
	for _, c := range r.Checks {
		if c.ID == id {
			return c
		}
	}
	t.Fatalf("there is no check %s", id)
	return working.Check{}
}

// One string of 12 has 503.461728 V on the coldest morning: 12 × 37.32 × (1 + 0.0027 × 46),
// by hand. Held against a limit of exactly that, one digit less and one more.
func TestVoltageCeilingAtTheLimit(t *testing.T) {
	cases := []struct {
		limit string
		want  working.Verdict
	}{
		{"503.461728", working.Within},
		{"503.461727999999999999999999999999999999", working.Outside},
		{"503.461728000000000000000000000000000001", working.Within},
	}
	for _, c := range cases {
		d := example(t)
		d.Inverters[0].MaxDCVoltageV = *number(t, c.limit)
		check := checkOf(t, sizing.Size(d), "voltage-ceiling")
		if check.Verdict != c.want {
			t.Errorf("503.461728 V under a limit of %s V is %v, want %v", c.limit, check.Verdict, c.want)
		}
	}
}

// Back-feed by its cases. Isc is 12.28 A, as in the worked examples of IS/IEC 62548
// (solarsaarthi.com, Selection and sizing of solar DC fuses, pp. 3 and 4), whose
// string counts and fuse rating the first two rows take; there the test is
// (N − 1) × Isc, here (N − 1) × 1.25 × Isc: 15.35 A for 2 strings, 46.05 A for 4.
// A fuse must be at least 1.5625 × 12.28 = 19.1875 A. The other rows by hand.
func TestBackFeed(t *testing.T) {
	cases := []struct {
		name                   string
		strings                int64
		moduleFuse, stringFuse string
		backFeed               string
		want                   working.Verdict
		reason                 string
	}{
		{"two strings, 15.35 A under 20 A", 2, "20", "", "", working.Within, ""},
		{"four strings, 46.05 A over 20 A, 20 A fits", 4, "20", "20", "", working.Within, ""},
		{"four strings, no fuse stated", 4, "20", "", "", working.Unconfirmed, "fuse-required-none-stated"},
		{"a fuse of 19 A is below 19.1875 A", 4, "20", "19", "", working.Outside, "string-fuse-too-small"},
		{"a fuse of 25 A is above the module's 20 A", 4, "20", "25", "", working.Outside, "string-fuse-above-module"},
		{"a fuse of an odd size that fits", 4, "20", "19.5", "", working.Within, ""},
		{"no standard rating from 19.1875 to 19.5 A", 4, "19.5", "", "", working.Outside, "no-standard-fuse"},
		{"one string, nothing to judge", 1, "", "", "", working.Within, "not-needed"},
		{"one string, the module's rating unstated, the inverter feeds back", 1, "", "", "0.1", working.Unconfirmed, "series-fuse-not-stated"},
		{"one string, the inverter feeds back exactly the rating", 1, "20", "", "20", working.Within, ""},
		{"two strings, the module's rating unstated", 2, "", "", "", working.Unconfirmed, "series-fuse-not-stated"},
		{"a stated fuse cannot stand for the module's rating", 2, "", "20", "", working.Unconfirmed, "series-fuse-not-stated"},
		{"exactly the module's rating is not above it", 2, "15.35", "", "", working.Within, ""},
	}
	for _, c := range cases {
		d := example(t)
		m, v := &d.Modules[0], &d.Inverters[0]
		// A module whose other values raise no question at this current.
		m.IscA, m.ImpA, m.PmaxW, m.VmpV, m.VocV = *number(t, "12.28"), *number(t, "11.6"), *number(t, "498.8"), *number(t, "43"), *number(t, "51.7")
		m.CellsInSeries = new(int64(72))
		m.MaxSeriesFuseA, v.Trackers[0].StringFuseA, v.BackFeedA = nil, nil, nil
		if c.moduleFuse != "" {
			m.MaxSeriesFuseA = number(t, c.moduleFuse)
		}
		if c.stringFuse != "" {
			v.Trackers[0].StringFuseA = number(t, c.stringFuse)
		}
		if c.backFeed != "" {
			v.BackFeedA = number(t, c.backFeed)
		}
		d.Strings = d.Strings[:1]
		d.Strings[0].StringsInParallel = c.strings
		check := checkOf(t, sizing.Size(d), "back-feed")
		if check.Verdict != c.want {
			t.Errorf("%s: %v, want %v (%v)", c.name, check.Verdict, c.want, check.Reasons)
		}
		found := c.reason == ""
		for _, r := range check.Reasons {
			found = found || r.Code == c.reason
		}
		if !found {
			t.Errorf("%s: reasons %v lack %s", c.name, check.Reasons, c.reason)
		}
	}
}

// The slope of the operating voltage, in the order of what may stand in. The
// example's cell is at 67 °C, 42 °C above STC; Vmp 31.26 V, Voc 37.32 V, Pmax 410 W.
// By hand, before the allowance of 3 %.
func TestModuleVmpHot(t *testing.T) {
	coefficient := func(value string, unit design.CoefficientUnit) *design.Coefficient {
		return &design.Coefficient{Value: *number(t, value), Unit: unit, UnitText: "as set"}
	}
	cases := []struct {
		name      string
		vmp, pmax *design.Coefficient
		want      string // V, less 3 %
	}{
		{"the maker's own, %/°C: 31.26 × (1 − 0.0036 × 42) = 26.533488", coefficient("-0.36", design.PercentPerC), coefficient("-0.34", design.PercentPerC), "25.73748336"},
		{"the maker's own, mV/°C: 31.26 − 0.1 × 42", coefficient("-100", design.MillivoltPerC), nil, "26.2482"},
		{"power as a percentage, on Vmp: 31.26 × (1 − 0.0034 × 42)", nil, coefficient("-0.34", design.PercentPerC), "25.99218984"},
		{"power in W/°C: 31.26 × (1 − 1.23 ÷ 410 × 42) = 27.32124", nil, coefficient("-1.23", design.WattPerC), "26.5016028"},
		{"Voc in V/°C, never its percentage: 31.26 − 0.0027 × 37.32 × 42 = 27.027912", nil, nil, "26.21707464"},
	}
	for _, c := range cases {
		d := example(t)
		d.Modules[0].VmpCoeff, d.Modules[0].PmaxCoeff = c.vmp, c.pmax
		got := sizing.Size(d).Limits[0].ModuleVmpHotV
		if !got.Equal(*number(t, c.want)) {
			t.Errorf("%s: %v V, want %s V", c.name, got, c.want)
		}
	}
}

// What is missing never makes a check disappear and never lets it say within.
func TestWhatIsMissing(t *testing.T) {
	cases := []struct {
		name   string
		remove func(*design.Design)
		check  string
		want   working.Verdict
	}{
		{"no strings", func(d *design.Design) { d.Strings = nil }, "nothing-strung", working.Unconfirmed},
		{"the short-circuit limit", func(d *design.Design) { d.Inverters[0].Trackers[0].MaxShortCircuitA = nil }, "short-circuit", working.Unconfirmed},
		{"the module's series fuse rating", func(d *design.Design) { d.Modules[0].MaxSeriesFuseA = nil }, "back-feed", working.Unconfirmed},
		{"an angle of mixed planes", func(d *design.Design) {
			d.Planes[1].TiltDeg, d.Strings[1].Tracker = nil, "t1"
		}, "planes-mixed", working.Unconfirmed},
		{"the current gain of a bifacial module", func(d *design.Design) {
			d.Modules[0].Bifaciality, d.Planes[0].CurrentGainPct = number(t, "0.7"), nil
		}, "current-basis", working.Caution},
		{"the same under NEC 2026", func(d *design.Design) {
			d.Modules[0].Bifaciality, d.Planes[0].CurrentGainPct, d.Rulebook = number(t, "0.7"), nil, "nec-2026"
		}, "current-basis", working.Unconfirmed},
	}
	for _, c := range cases {
		d := example(t)
		c.remove(d)
		r := sizing.Size(d)
		if got := checkOf(t, r, c.check); got.Verdict != c.want {
			t.Errorf("without %s, %s is %v, want %v", c.name, c.check, got.Verdict, c.want)
		}
		if r.Verdict < c.want {
			t.Errorf("without %s the design is %v", c.name, r.Verdict)
		}
	}
}
