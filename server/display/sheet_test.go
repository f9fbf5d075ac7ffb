package display

import (
	"strings"
	"testing"

	"rimeline/sizing/design"
	"rimeline/sizing/working"
	"rimeline/views"
)

func TestReconciliation(t *testing.T) {
	c := changed(t)
	if got, want := c.reconciled(), "Modules by plane 24 + 13 = 37, by tracker 24 + 13 = 37, by inverter 37, in the schedule 37: they agree."; got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
	// A result that does not belong to the design must not print as if it did.
	c.d.Strings[0].ModulesInSeries++
	if got := c.reconciled(); !strings.Contains(got, "DO NOT AGREE") {
		t.Errorf("after a module more: %s", got)
	}
}

// The schedule's totals are the sums of its rows.
func TestTotals(t *testing.T) {
	eachVariant(t, func(t *testing.T, c *composer) {
		rows := c.totals()
		if len(c.d.Strings) == 0 {
			if rows != nil {
				t.Errorf("totals of nothing: %v", rows)
			}
			return
		}
		all := rows[len(rows)-1]
		if !all.All || all.Modules == "0" {
			t.Errorf("the last total is %+v", all)
		}
		if planes := rows[:len(c.d.Planes)]; len(planes) != len(c.d.Planes) {
			t.Errorf("%d plane totals", len(planes))
		}
		if got := c.reconciled(); !strings.HasSuffix(got, "they agree.") {
			t.Errorf("%s", got)
		}
	})
}

// The sheet shows the governing case of each kind and hides nothing that is not within.
func TestSheetHidesNothing(t *testing.T) {
	eachVariant(t, func(t *testing.T, c *composer) {
		all := byKind(c.tell())
		shown := governing(all)
		for i, k := range all {
			worst := k.Checks[0].Verdict
			notWithin := 0
			for _, told := range k.Checks {
				if told.Verdict != "within" {
					notWithin++
				}
			}
			if k.Verdict != worst || shown[i].Checks[0].Sentence != k.Checks[0].Sentence {
				t.Errorf("%s: the case shown first is not the worst", k.ID)
			}
			kept := 0
			for _, told := range shown[i].Checks {
				if told.Verdict != "within" {
					kept++
				}
			}
			if kept != notWithin {
				t.Errorf("%s: %d of %d cases that are not within are shown", k.ID, kept, notWithin)
			}
			if (len(shown[i].Checks) < len(k.Checks)) != (shown[i].Rest != "") {
				t.Errorf("%s: %d of %d cases shown, and the rest is %q", k.ID, len(shown[i].Checks), len(k.Checks), shown[i].Rest)
			}
			if len(k.Checks[0].Steps) > 0 && len(shown[i].Checks[0].Steps) == 0 {
				t.Errorf("%s: the governing case has lost its working", k.ID)
			}
		}
	})
}

// Of the cases of one kind with one verdict, the one with least room governs.
func TestGoverningCaseHasLeastRoom(t *testing.T) {
	c := changed(t, change{"/strings/0/modules_in_series", 20}, change{"/planes/0/positions", 40})
	for _, test := range []struct{ id, want string }{
		{"voltage-ceiling", "20 in series"}, {"hot-minimum", "13 in series"}, {"start", "13 in series"},
	} {
		for _, k := range byKind(c.tell()) {
			if k.ID == test.id && !strings.HasPrefix(k.Checks[0].About, test.want) {
				t.Errorf("%s: %q governs, want %q", test.id, k.Checks[0].About, test.want)
			}
		}
	}
}

func TestNotChecked(t *testing.T) {
	for _, test := range []struct {
		stated []string
		want   string
	}{
		{nil, "Voltage rating of connectors, cable, switch, combiner, fuses and shutdown devices: not stated, not checked."},
		{[]string{"MC connectors"}, "Voltage rating of cable, switch, combiner, fuses and shutdown devices: not stated, not checked."},
		{[]string{"roof disconnect", "PV Wire", "combiner box", "string fuse holder"}, "Voltage rating of connectors and shutdown devices: not stated, not checked."},
	} {
		var d design.Design
		for _, name := range test.stated {
			d.OtherLimits = append(d.OtherLimits, design.OtherLimit{Name: name})
		}
		if got := notChecked(&d)[0]; got != test.want {
			t.Errorf("%v: %s, want %s", test.stated, got, test.want)
		}
	}
}

// Never "no fuse needed" without the conductors: whoever reads one sentence alone must not be misled.
func TestNoFuseNeverStandsAlone(t *testing.T) {
	eachVariant(t, func(t *testing.T, c *composer) {
		for i := range c.r.Checks {
			k := &c.r.Checks[i]
			if k.ID == "back-feed" && k.Verdict == working.Within && k.Value != nil && !k.Value.IsZero() {
				if said := c.backFeed(k); strings.Contains(said, "no string fuse") && !strings.Contains(said, "conductors") {
					t.Errorf("%s", said)
				}
			}
		}
	})
}

func TestSourcesArePrinted(t *testing.T) {
	c := changed(t, variants["film"]...)
	var found *views.Row
	for _, e := range c.equipment() {
		for i, r := range e.Rows {
			if r.Name == "Voc" {
				found = &e.Rows[i]
			}
		}
	}
	if found == nil || found.Note != "datasheet rev. C, page 2" || plain(found.Value) != "37.32 V" {
		t.Errorf("the row of Voc is %+v", found)
	}
}

func TestColdestTellsTheOtherStatistic(t *testing.T) {
	for basis, want := range map[string][]string{
		design.ColdestRecordLow:   {"record low", "annual extreme mean minimum", "43 %"},
		design.ColdestMeanMinimum: {"annual extreme mean minimum", "43 %", "record low", "a note to NEC 690.7"},
		design.BasisAuthority:     {"the authority requires", "43 %"},
		design.BasisOther:         {"without a named statistic", "average winter low"},
	} {
		c := changed(t, change{"/site/coldest_basis", basis})
		got := plain(strings.Join(coldest(c.d), " "))
		for _, words := range want {
			if !strings.Contains(got, words) {
				t.Errorf("%s: %q is missing in: %s", basis, words, got)
			}
		}
	}
	c := changed(t, change{"/site/coldest_basis", design.ColdestMeanMinimum}, change{"/rulebook", "iec-62548-1"})
	if got := strings.Join(coldest(c.d), " "); strings.Contains(got, "NEC") {
		t.Errorf("under IEC: %s", got)
	}
}

// A document may state numbers that no roof has. They are told, and quickly.
func TestHugeNumbers(t *testing.T) {
	c := changed(t,
		change{"/inverters/0/quantity", 1_000_000_000}, change{"/strings/0/unit", 1_000_000_000},
		change{"/strings/0/modules_in_series", 1_000_000_000}, change{"/strings/0/strings_in_parallel", 1_000_000_000},
		change{"/inverters/0/start_voltage_v", 1e29}, change{"/inverters/0/trackers/0/mppt_max_v", 1e30})
	for _, chart := range c.charts(c.fittings()) {
		if strings.Contains(chart.Wide+chart.Narrow, "NaN") || strings.Contains(chart.Wide+chart.Narrow, "Inf") {
			t.Errorf("%s is drawn at no place", chart.Of)
		}
	}
	const product = "1000000000000000000" // 1e9 × 1e9
	if got := c.schedule()[0].Modules; got != product {
		t.Errorf("%s modules in the schedule, want %s", got, product)
	}
	if got := c.reconciled(); !strings.HasSuffix(got, "they agree.") {
		t.Errorf("%s", got)
	}
	if got := plain(check(t, c, "places", "South plane").Sentence); got != product+" modules on 24 places: 999999999999999976 too many." {
		t.Errorf("%s", got)
	}
}
