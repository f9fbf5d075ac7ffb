package display

import (
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"

	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
	"rimeline/views"
)

// plain writes a text with ordinary spaces, so that a test can be read.
func plain(s string) string { return strings.ReplaceAll(s, nbsp, " ") }

// check returns the first told check of a kind whose subject begins with about.
func check(t *testing.T, c *composer, id, about string) views.Check {
	t.Helper()
	for _, k := range byKind(c.tell()) {
		if k.ID != id {
			continue
		}
		for _, told := range k.Checks {
			if strings.HasPrefix(told.About, about) {
				return told
			}
		}
	}
	t.Fatalf("no check %s about %q", id, about)
	return views.Check{}
}

// The numbers are those of the working beside each sentence; where a case has its
// own, its sum stands beside it. All designs are invented.
func TestSentences(t *testing.T) {
	for _, test := range []struct {
		variant, id, about string
		want               string // sentence and reasons
	}{
		// 37.32 × (1 + −0.27 ÷ 100 × (−21 − 25)) = 41.955144; × 12 = 503.461728; 1000 − 503.461728 = 496.538272
		{"example", "voltage-ceiling", "12 in series", "503.5 V open-circuit on the coldest morning: 496.5 V (49.6 %) under the ceiling of 1000 V. It would meet it only below −60 °C (−76 °F)."},
		// × 24 = 1006.923456; 25 + (1000 ÷ 24 − 37.32) ÷ (−0.27 ÷ 100 × 37.32) = −18.1377…
		{"too long", "voltage-ceiling", "24 in series", "1007.0 V open-circuit on the coldest morning: 7.0 V over the ceiling of 1000 V. Such a string must not be connected. It meets it at −18.1 °C (−0.6 °F) already, 2.9 °C (5.2 °F) above the coldest. At most 23 modules stay under it."},
		// × 23 = 964.968312; 25 + (1000 ÷ 23 − 37.32) ÷ (−0.100764) = −36.1138…; −21 + 36.1138 = 15.1138
		{"too long", "voltage-ceiling", "23 in series", "965.0 V open-circuit on the coldest morning: 35.0 V (3.5 %) under the ceiling of 1000 V. It would meet it at −36.1 °C (−33.0 °F), 15.1 °C (27.2 °F) below the coldest."},
		// By the row −26 to −30 °C, 22 × 37.32 × 1.21 = 993.4584; by the next, × 1.23 = 1009.8792
		{"table", "voltage-ceiling", "22 in series", "985.3 V open-circuit on the coldest morning: 14.7 V (1.4 %) under the ceiling of 1000 V. It keeps under it, by the table, down to −30.0 °C (−22.0 °F)."},
		{"table", "voltage-ceiling", "13 in series", "582.2 V open-circuit on the coldest morning: 417.8 V (41.7 %) under the ceiling of 1000 V. No row of the table, down to −40 °C (−40 °F), exceeds it."},
		{"table too long", "voltage-ceiling", "28 in series", "1254.0 V open-circuit on the coldest morning: 254.0 V over the ceiling of 1000 V. Such a string must not be connected. It exceeds it in every row of the table. At most 22 modules stay under it."},
		{"too long", "headroom", "24 in series", "There is none: the ceiling is met 2.9 °C (5.2 °F) above the coldest already."},
		{"too long", "headroom", "23 in series", "15.1 °C (27.2 °F) colder than the coldest; 3 °C are asked for."},
		{"example", "headroom", "12 in series", "The ceiling would be met only below −60 °C (−76 °F); 3 °C of headroom are asked for."},
		{"table too long", "headroom", "28 in series", "There is none: every row of the table exceeds the ceiling."},
		{"example", "method-difference", "12 in series", "By Table 690.7(A) the same string comes to 537.5 V, 462.5 V under the ceiling as well."},
		{"too long", "method-difference", "23 in series", "By Table 690.7(A) the same string comes to 1030.1 V, 30.1 V over the ceiling of 1000 V. A reviewer who takes that method will object."},
		{"iec", "method-difference", "12 in series", "By the table of cold-voltage factors the same string comes to 537.5 V, 462.5 V under the ceiling as well."},
		{"film", "method-difference", "12 in series", "There is no other method here to compare with. The table is for crystalline silicon down to −40 °C (−40 °F)."},
		{"example", "cold-validity", "12 in series", "Crystalline silicon, no colder than −40 °C (−40 °F), a named statistic, no higher than 2000 m."},
		{"film", "cold-validity", "12 in series", "The method is used where its validity is in question. The module is not crystalline silicon: its voltage may be higher in its first weeks of light, and one coefficient may not hold down to the coldest. The site is above 2000 m: thin air insulates less, and the inverter's maximum DC voltage may be lower there. Its manual says."},
		// 31.26 × (1 + −0.34 ÷ 100 × 42) × 0.97 = 25.99218984; × 12 = 311.906…
		{"example", "hot-minimum", "12 in series", "311.9 V operating on the hottest roof: 151.9 V above the tracker's minimum of 160 V."},
		// × 5 = 129.9609492; 160 − 129.9609492 = 30.0390508
		{"too short", "hot-minimum", "5 in series", "129.9 V operating on the hottest roof: 30.1 V short of the tracker's minimum of 160 V. At least 7 modules are needed."},
		{"too short", "start", "1 in series", "33.0 V open-circuit on the hottest roof: 147.0 V short of the start voltage of 180 V. At least 6 modules are needed."},
		{"late start", "start", "12 in series", "397.0 V open-circuit on the hottest roof: 7.0 V above the start voltage of 390 V. At first light a string has about nine tenths of that voltage, which is below the start voltage: the inverter may start late."},
		{"example", "full-power-high", "13 in series", "470.0 V operating on the coldest morning: 330.0 V under the 800 V up to which full power is given."},
		{"too long", "cold-upper", "24 in series", "867.6 V operating on the coldest morning: 17.6 V over the tracker's maximum of 850 V. The string runs outside the window until it warms up; power is lost."},
		{"example", "operating-current", "Tracker t1", "26.24 A operating in full sun: 0.24 A over the 26 A that the tracker can use. The inverter holds the current down: energy is lost, nothing is harmed."},
		{"example", "short-circuit", "Tracker t1", "34.88 A short-circuit (Isc × 1.25, all strings together): 5.12 A under the tracker's limit of 40 A."},
		{"mixed", "short-circuit", "Tracker t1", "69.75 A short-circuit (Isc × 1.25, all strings together); there is no limit to hold it against. The tracker's short-circuit limit is not stated. Many datasheets leave it out; the manual or the maker has it."},
		{"film", "short-circuit", "Tracker t1", "27.90 A short-circuit (Isc without the 1.25, all strings together): 2.10 A under the tracker's limit of 30 A. Isc itself fits, × 1.25 does not: 34.88 A against 30 A. Makers and authorities differ on which to compare."},
		{"mixed", "inputs", "Tracker t1", "4 strings on 2 inputs: 2 too many."},
		{"example", "back-feed", "12 in series", "The other strings could feed 17.44 A into one that fails: 7.56 A under the 25 A of its modules' maximum series fuse. The modules call for no string fuse; whether the conductors do is not checked here."},
		{"example", "back-feed", "13 in series", "Nothing can feed back into it: no other string shares its tracker."},
		{"film", "back-feed", "12 in series", "The other strings could feed 17.44 A into one that fails: 7.44 A over the 10 A of its modules' maximum series fuse, so each string needs a fuse; none can be at least 21.80 A and at most 10 A. A string fuse is required and none is stated. No standard fuse lies between the least and the most that may be used. Fewer strings on the tracker is the way out."},
		{"no series fuse", "back-feed", "12 in series", "The other strings could feed 17.44 A into one that fails; the module's maximum series fuse is not stated, so whether a fuse is needed is open. The module's maximum series fuse is not stated; it is printed on the module's label."},
		{"mixed", "unequal-strings", "Tracker t1", "The strings in parallel differ by 84.0 V open-circuit on the coldest morning. What each string then contributes, and what flows backwards, is not known without their current–voltage curves. Put strings of one length on a tracker."},
		{"mixed", "planes-mixed", "Tracker t1", "Strings of different planes share the tracker, and an angle is missing. State tilt and azimuth of every plane on this tracker."},
		{"slope of Vmp", "planes-mixed", "Tracker t2", "Strings of planes that face different ways share the tracker. Equal strings in parallel lose little by it, since their voltages stay close; someone must decide, and the inverter's manual must permit it."},
		{"mixed", "places", "West plane", "33 modules on 13 places: 20 too many."},
		{"example", "places", "West plane", "13 modules on 13 places: every place is used."},
		{"too short", "places", "South plane", "10 modules on 24 places: 14 places stay empty."},
		{"example", "dc-power", "The inverter", "15170 W of modules at STC: 2830 W under the 18000 W that the inverter permits."},
		{"advice", "dc-power", "The inverter", "15170 W of modules at STC: 170 W over the 15000 W that the maker advises."},
		{"film", "current-basis", "Trackers t1 and t2", "A bifacial module is counted with the light on its front alone. State the plane's current gain, or the highest Isc marked on the module."},
		{"unstrung", "nothing-strung", "", "No string is entered yet, so there is nothing to judge. Enter strings to have them judged."},
		{"mixed", "start", "12 in series", "397.0 V open-circuit on the hottest roof: 217.0 V above the start voltage of 180 V. The question about Voc is open; until it is answered this cannot be confirmed."},
	} {
		t.Run(test.variant+" "+test.id+" "+test.about, func(t *testing.T) {
			k := check(t, changed(t, variants[test.variant]...), test.id, test.about)
			if got := plain(strings.Join(append([]string{k.Sentence}, k.Reasons...), " ")); got != test.want {
				t.Errorf("got  %s\nwant %s", got, test.want)
			}
		})
	}
}

func TestFits(t *testing.T) {
	for _, test := range []struct {
		name    string
		changes []change
		want    []string
	}{
		{"the example", nil, []string{
			"South and west planes on tracker t1 or t2: 7 to 23 modules in series, up to 2 strings. The ceiling is 1000 V (inverter, module and building alike); 23 modules would meet it at −36.1 °C (−33.0 °F), 15.1 °C (27.2 °F) below the coldest. Fewer than 7 would leave the tracker's window, 160 V, on the hottest roof."}},
		{"a dwelling", []change{{"/site/structure", "one-or-two-family-dwelling"}}, []string{
			"South and west planes on tracker t1 or t2: 7 to 14 modules in series, up to 2 strings. The ceiling is 600 V (of the dwelling); 14 modules would meet it at −29.9 °C (−21.9 °F), 8.9 °C (16.1 °F) below the coldest. Fewer than 7 would leave the tracker's window, 160 V, on the hottest roof."}},
		{"start above the window", []change{{"/inverters/0/start_voltage_v", 300}, {"/planes/1/hot_cell_rise_c", 20}}, []string{
			"South plane on tracker t1 or t2: 10 to 23 modules in series, up to 2 strings. The ceiling is 1000 V (inverter, module and building alike); 23 modules would meet it at −36.1 °C (−33.0 °F), 15.1 °C (27.2 °F) below the coldest. Fewer than 10 would not start a hot inverter, which takes 300 V.",
			"West plane on tracker t1 or t2: 9 to 23 modules in series, up to 2 strings. The ceiling is 1000 V (inverter, module and building alike); 23 modules would meet it at −36.1 °C (−33.0 °F), 15.1 °C (27.2 °F) below the coldest. Fewer than 9 would not start a hot inverter, which takes 300 V."}},
		{"nothing fits", []change{{"/inverters/0/max_dc_voltage_v", 200}}, []string{
			"South and west planes on tracker t1 or t2: no number of modules in series fits. The ceiling is 200 V (of the inverter); 4 modules would meet it only below −60 °C (−76 °F). At least 7 modules are needed, or the string would leave the tracker's window, 160 V, on the hottest roof; at most 4 stay under the ceiling."}},
		{"a single module is too much", []change{{"/modules/0/max_system_voltage_v", 41}}, []string{
			"South and west planes on tracker t1 or t2: no number of modules in series fits. The ceiling is 41 V (of the module); a single module exceeds it at the coldest. At least 7 modules are needed, or the string would leave the tracker's window, 160 V, on the hottest roof; at most 0 stay under the ceiling."}},
		{"no voltage left when hot", []change{{"/planes/0/hot_cell_rise_c", 400}, {"/planes", []any{map[string]any{"id": "p1", "module": "m1", "positions": 24, "hot_cell_rise_c": 400}}}, {"/strings", []any{}}}, []string{
			"Plane p1 on tracker t1 or t2: no number of modules in series fits. The ceiling is 1000 V (inverter, module and building alike); 23 modules would meet it at −36.1 °C (−33.0 °F), 15.1 °C (27.2 °F) below the coldest. On the hottest roof a module's voltage is not above zero, so no string reaches the tracker's window or starts the inverter."}},
		{"short-circuit limit", []change{{"/inverters/0/trackers/0/max_short_circuit_current_a", 20}, {"/inverters/0/trackers/1/max_short_circuit_current_per_input_a", 10}}, []string{
			"South and west planes on tracker t1: 7 to 23 modules in series, up to 1 string. The ceiling is 1000 V (inverter, module and building alike); 23 modules would meet it at −36.1 °C (−33.0 °F), 15.1 °C (27.2 °F) below the coldest. Fewer than 7 would leave the tracker's window, 160 V, on the hottest roof. The tracker's short-circuit limit, 20 A, permits fewer strings than its 2 inputs.",
			"South and west planes on tracker t2: 7 to 23 modules in series, but no string. The ceiling is 1000 V (inverter, module and building alike); 23 modules would meet it at −36.1 °C (−33.0 °F), 15.1 °C (27.2 °F) below the coldest. Fewer than 7 would leave the tracker's window, 160 V, on the hottest roof. A single string's short-circuit current is more than the tracker or one of its inputs withstands."}},
		{"in doubt", variants["mixed"], []string{
			"South and west planes on tracker t1: 7 to 23 modules in series, up to 2 strings. The ceiling is 1000 V (inverter, module and building alike); 23 modules would meet it at −36.1 °C (−33.0 °F), 15.1 °C (27.2 °F) below the coldest. Fewer than 7 would leave the tracker's window, 160 V, on the hottest roof. The number of strings is unconfirmed: the tracker's short-circuit limit is not stated, so only its inputs are counted. Unconfirmed while the question about Voc is open.",
			"South and west planes on tracker t2: 7 to 23 modules in series, up to 2 strings. The ceiling is 1000 V (inverter, module and building alike); 23 modules would meet it at −36.1 °C (−33.0 °F), 15.1 °C (27.2 °F) below the coldest. Fewer than 7 would leave the tracker's window, 160 V, on the hottest roof. Unconfirmed while the question about Voc is open."}},
		{"by table", variants["table"], []string{
			"South and west planes on tracker t1 or t2: 7 to 22 modules in series, up to 2 strings. The ceiling is 1000 V (inverter, module and building alike); 22 modules keep under it, by the table, down to −30.0 °C (−22.0 °F). Fewer than 7 would leave the tracker's window, 160 V, on the hottest roof."}},
	} {
		t.Run(test.name, func(t *testing.T) {
			var got []string
			for _, f := range changed(t, test.changes...).fittings() {
				got = append(got, plain(f.fit.Where+": "+f.fit.Range+". "+strings.Join(f.fit.Reasons, " ")))
			}
			if !slices.Equal(got, test.want) {
				t.Errorf("got\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(test.want, "\n"))
			}
		})
	}
}

// What is not confirmed never looks as if it were.
func TestOpenFits(t *testing.T) {
	for _, f := range changed(t, variants["mixed"]...).fittings() {
		if !f.fit.Open {
			t.Errorf("%s is not marked open", f.fit.Where)
		}
	}
	for _, f := range changed(t).fittings() {
		if f.fit.Open {
			t.Errorf("%s is marked open", f.fit.Where)
		}
	}
}

// wide is three inverters of twelve trackers strung alike.
func wide(t *testing.T) *composer {
	t.Helper()
	tracker := func(id string) map[string]any {
		return map[string]any{"id": id, "mppt_min_v": 160, "mppt_max_v": 850, "max_input_current_a": 30, "max_short_circuit_current_a": 40, "inputs": 2}
	}
	var trackers, entries []any
	for k := 1; k <= 12; k++ {
		trackers = append(trackers, tracker("t"+strconv.Itoa(k)))
		for unit := 1; unit <= 3; unit++ {
			entries = append(entries, map[string]any{"inverter": "i1", "unit": unit, "tracker": "t" + strconv.Itoa(k), "plane": "south", "modules_in_series": 20, "strings_in_parallel": 2})
		}
	}
	return changed(t, change{"/inverters/0/trackers", trackers}, change{"/inverters/0/quantity", 3}, change{"/strings", entries}, change{"/planes/0/positions", 1440})
}

// Twelve trackers strung alike are told once, not twelve times.
func TestEqualTrackersAreToldOnce(t *testing.T) {
	c := wide(t)
	fits := c.fittings()
	if len(fits) != 1 || plain(fits[0].fit.Where) != "South and west planes on each tracker, t1 to t12, of each of the 3 inverters" {
		t.Errorf("fits: %d, the first %q", len(fits), fits[0].fit.Where)
	}
	if charts := c.charts(fits); len(charts) != 1 || plain(charts[0].Of) != "Trackers t1 to t12 of inverter units 1 to 3" {
		t.Errorf("charts: %d, the first of %q", len(charts), charts[0].Of)
	}
	for _, k := range byKind(c.tell()) {
		want := 1
		if k.ID == "places" {
			want = 2 // one plane is full, one is empty
		}
		if len(k.Checks) != want {
			t.Errorf("%s: %d cases, want %d; the first is about %q", k.ID, len(k.Checks), want, k.Checks[0].About)
		}
	}
	if got := plain(check(t, c, "voltage-ceiling", "").About); got != "20 in series, south plane, trackers t1 to t12 of inverter units 1 to 3" {
		t.Errorf("about %q", got)
	}
	if got := plain(check(t, c, "dc-power", "").About); got != "Inverter units 1 to 3" {
		t.Errorf("about %q", got)
	}
}

// No check disappears: every one of the result is told, by itself or with its equals,
// under its verdict.
func TestEveryCheckIsTold(t *testing.T) {
	eachVariant(t, func(t *testing.T, c *composer) {
		told := map[working.Verdict]int{}
		for _, k := range c.tell() {
			told[k.worst] += len(k.abouts)
			if k.Sentence == "" || strings.Contains(k.Sentence, "%!") {
				t.Errorf("kind %d about %q: sentence %q", k.kind, k.About, k.Sentence)
			}
		}
		for _, v := range []working.Verdict{working.Within, working.Caution, working.Unconfirmed, working.Outside} {
			if int64(told[v]) != c.count(v) {
				t.Errorf("%d checks are told as %s, the result has %d", told[v], v, c.count(v))
			}
		}
	})
}

// Whatever is not within says why: by its numbers or by a reason.
func TestEveryVerdictHasItsReason(t *testing.T) {
	eachVariant(t, func(t *testing.T, c *composer) {
		for i := range c.r.Checks {
			k := &c.r.Checks[i]
			how, _ := kindOf(k.ID)
			if k.Verdict == working.Within || broken(k, how.atLeast) {
				continue
			}
			if said := c.tellCheck(k); len(said.Reasons) == 0 && k.ID != "method-difference" && k.ID != "headroom" && k.ID != "unequal-strings" {
				t.Errorf("%s is %s without a reason: %s", k.ID, k.Verdict, said.Sentence)
			}
		}
	})
}

var firstNumber = regexp.MustCompile(`^−?[0-9.]+`)

// The value in a sentence is never on the safe side of the value itself.
func TestShownValuesNeverFlatter(t *testing.T) {
	seen := 0
	eachVariant(t, func(t *testing.T, c *composer) {
		for i := range c.r.Checks {
			k := &c.r.Checks[i]
			how, _ := kindOf(k.ID)
			number := firstNumber.FindString(how.says(c, k))
			if number == "" || k.Value == nil || k.Unit == "" {
				continue
			}
			seen++
			said := exact(t, strings.ReplaceAll(number, minus, "-"))
			if how.atLeast && k.Value.Less(said) || !how.atLeast && said.Less(*k.Value) {
				t.Errorf("%s: %s is shown as %s", k.ID, k.Value, said)
			}
		}
	})
	if seen < 200 {
		t.Errorf("only %d values were seen", seen)
	}
}

// A margin that is left is shown no larger, and a change that is needed no smaller, than it is.
func TestTurns(t *testing.T) {
	c := changed(t)
	for _, test := range []struct {
		pointer string
		at      string
		pct     string
		needed  bool
		want    string
	}{
		{"/modules/0/voc_v", "38.1098", "2.1163", false, "Voc +2.1 %, 38.10 V"},
		{"/modules/0/voc_v", "38.1098", "2.1163", true, "Voc +2.2 %, 38.11 V"},
		{"/modules/0/voc_v", "37.0612", "-0.6935", false, "Voc −0.6 %, 37.07 V"},
		{"/modules/0/voc_v", "37.0612", "-0.6935", true, "Voc −0.7 %, 37.06 V"},
		{"/modules/0/voc_temp_coeff/value", "-0.3105", "15", false, "Voc coefficient +15.0 %, −0.310 %/°C"},
		{"/site/coldest_c", "-36.08", "71.8", false, "coldest temperature −36.0 °C (−32.9 °F)"},
		{"/strings/0/modules_in_series", "24", "100", false, "24 modules in series"},
		{"/strings/0/modules_in_series", "1", "-91.7", false, "1 module in series"},
		{"/strings/0/strings_in_parallel", "3", "50", false, "3 strings in parallel"},
		{"/planes/0/positions", "23", "-4.2", false, "places 23"},
		{"/planes/0/current_gain_pct", "14.69", "", false, "current gain 14.6 %"},
		{"/inverters/0/max_dc_voltage_v", "503.461728", "-49.65", false, "maximum DC voltage −49.6 %, 503.47 V"},
	} {
		f, known := c.field(test.pointer)
		if !known {
			t.Errorf("%s is not a field", test.pointer)
			continue
		}
		turn := working.Turn{Pointer: test.pointer, At: exact(t, test.at)}
		if test.pct != "" {
			turn.ChangePct = new(exact(t, test.pct))
		}
		if got := plain(c.turn(turn, f, f.name, test.needed)); got != test.want {
			t.Errorf("%s at %s, needed %t: %q, want %q", test.pointer, test.at, test.needed, got, test.want)
		}
	}
}

// Every pointer that the engine speaks of has words.
func TestEveryPointerHasWords(t *testing.T) {
	eachVariant(t, func(t *testing.T, c *composer) {
		for _, k := range c.r.Checks {
			for _, turn := range k.Turns {
				if _, known := c.field(turn.Pointer); !known {
					t.Errorf("%s: no words for %s", k.ID, turn.Pointer)
				}
			}
			for _, r := range k.Reasons {
				if _, known := c.field(r.Pointer); r.Pointer != "" && r.Pointer != "/strings" && !known {
					t.Errorf("%s: no words for %s", k.ID, r.Pointer)
				}
			}
		}
		for _, q := range c.r.Questions {
			if _, known := c.field(q.Pointer); !known {
				t.Errorf("question: no words for %s", q.Pointer)
			}
		}
	})
}

func TestReasonsThatAreNotKnownAreStillPrinted(t *testing.T) {
	c := changed(t)
	k := &working.Check{ID: "start", About: working.About{String: 0}}
	if got := c.reason(k, working.Reason{Code: "moon-too-bright", Pointer: "/modules/0/voc_v"}); got != "Moon too bright: Voc." {
		t.Errorf("got %q", got)
	}
	how, _ := kindOf("never-heard-of")
	k = &working.Check{ID: "never-heard-of", Value: new(quantity.Int(3)), Limit: new(quantity.Int(2)), Unit: "V"}
	if got := plain(how.says(c, k)); got != "3 V, held against 2 V." {
		t.Errorf("got %q", got)
	}
}

// Every symbol of the working is explained.
func TestEverySymbolIsExplained(t *testing.T) {
	words := regexp.MustCompile(`[\p{L}Σ]`)
	eachVariant(t, func(t *testing.T, c *composer) {
		explained := map[string]bool{}
		for _, s := range symbolsIn(allSteps(c.r)...) {
			explained[s.Symbol] = true
		}
		isExplained := func(symbol string) bool {
			under := explanations(symbol)
			for _, s := range under {
				if !explained[s] {
					return false
				}
			}
			return under != nil
		}
		for _, steps := range allSteps(c.r) {
			for _, s := range steps {
				expression := strings.ReplaceAll(s.Expression, "left over", "left_over")
				for _, word := range append(strings.Split(expression, " "), strings.ReplaceAll(s.Symbol, "left over", "left_over")) {
					symbol := strings.ReplaceAll(bare(word), "left_over", "left over")
					if words.MatchString(symbol) && !isExplained(symbol) {
						t.Errorf("%q is not explained; it stands in %s = %s", symbol, s.Symbol, s.Expression)
					}
				}
			}
		}
	})
}

func TestHeadline(t *testing.T) {
	for variant, want := range map[string]string{
		"example":  "Every limit is kept; 3 checks of 35 want a decision.",
		"unstrung": "No string is entered yet. Here is what fits.",
		"film":     "1 check of 35 breaks a limit.",
		"mixed":    "3 checks of 45 break a limit.",
	} {
		if got := plain(changed(t, variants[variant]...).headline()); got != want {
			t.Errorf("%s: %q, want %q", variant, got, want)
		}
	}
	c := changed(t)
	var sum int64
	for _, part := range strings.Split(c.tally(), ", ") {
		n, _, _ := strings.Cut(part, nbsp)
		i, err := strconv.ParseInt(n, 10, 64)
		if err != nil {
			t.Fatal(err)
		}
		sum += i
	}
	if sum != int64(len(c.r.Checks)) {
		t.Errorf("the tally %q adds to %d of %d checks", c.tally(), sum, len(c.r.Checks))
	}
}
