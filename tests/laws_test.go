package tests

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"maps"
	"math/rand/v2"
	"slices"
	"strings"
	"sync"
	"testing"
)

// law is something that must hold for every design. The draw gives it chance that
// is the same each time.
type law func(d draw, doc object) error

// holds tries a law on random designs and reports the shortest that breaks it.
func holds(t *testing.T, l law) {
	t.Helper()
	designs := howMany(1_500, 300, 100)
	var mu sync.Mutex
	var broken int
	var shortest []byte
	var why error
	eachDesign(designs, func(n uint64) {
		text := randomDesign(n)
		err := l(draw{rand.New(rand.NewPCG(3, n)), n%2 == 0}, readDocument(text))
		if err == nil || errors.As(err, new(refusal)) {
			return // a design that is refused wrongly is a matter of the agreement test
		}
		mu.Lock()
		defer mu.Unlock()
		broken++
		if shortest == nil || len(text) < len(shortest) {
			shortest, why = text, err
		}
	})
	if broken > 0 {
		t.Errorf("broken by %d of %d designs: %v\n%s", broken, designs, why, indented(shortest))
	}
}

// sizeDocument sizes a document that tests took apart.
func sizeDocument(doc object) (*result, error) {
	var r result
	if err := sized(documentText(doc), &r); err != nil {
		return nil, err
	}
	return &r, nil
}

func both(before, after object) (*result, *result, error) {
	a, err := sizeDocument(before)
	if err != nil {
		return nil, nil, err
	}
	b, err := sizeDocument(after)
	return a, b, err
}

// badness orders verdicts from best to worst.
func badness(v string) int {
	return slices.Index([]string{"within", "caution", "unconfirmed", "outside"}, v)
}

func (r *result) check(id string, about place) (check, bool) {
	i := slices.IndexFunc(r.Checks, func(c check) bool { return c.ID == id && c.About.place() == about })
	if i < 0 {
		return check{}, false
	}
	return r.Checks[i], true
}

func TestLaw_ColderNeverLowersVoc(t *testing.T) {
	holds(t, func(d draw, doc object) error {
		colder := copyDocument(doc)
		now := d.oracle(doc).Site.Coldest.Rat
		lowest := rat("-90")
		if doc["voltage_method"] == "table" {
			lowest = rat("-40")
		}
		then := larger(lowest, minus(now, rat(string(d.within(0, 15, 2)))))
		text, _ := decimalText(then)
		if text == "" { // −40 °F apart from a third of a degree
			text = then.FloatString(3)
		}
		put(colder, "/site/coldest_c", json.Number(text))
		a, b, err := both(doc, colder)
		if err != nil {
			return err
		}
		for i := range a.Limits {
			if exceeds(a.Limits[i].VocCold.Rat, b.Limits[i].VocCold.Rat) && exceeds(now, then) {
				return fmt.Errorf("at %s °C limits[%d] has a lower cold voltage (%s) than at %s °C (%s)",
					text, i, b.Limits[i].VocCold.text, now.FloatString(3), a.Limits[i].VocCold.text)
			}
			if exceeds(b.Limits[i].MaxModules.Rat, a.Limits[i].MaxModules.Rat) && exceeds(now, then) {
				return fmt.Errorf("at %s °C limits[%d] takes more modules than at %s °C", text, i, now.FloatString(3))
			}
		}
		return nil
	})
}

func TestLaw_OneMoreModuleNeverHelpsTheCeiling(t *testing.T) {
	holds(t, func(d draw, doc object) error {
		entries, _ := doc["strings"].(list)
		if len(entries) == 0 {
			return nil
		}
		i := d.IntN(len(entries))
		longer := copyDocument(doc)
		pointer := fmt.Sprintf("/strings/%d/modules_in_series", i)
		put(longer, pointer, json.Number(plus(d.oracle(doc).Strings[i].Modules.Rat, one).RatString()))
		a, b, err := both(doc, longer)
		if err != nil {
			return err
		}
		for _, id := range []string{"voltage-ceiling", "headroom", "full-power-high", "cold-upper"} {
			before, had := a.check(id, entryPlace(i))
			after, has := b.check(id, entryPlace(i))
			if had != has || badness(after.Verdict) < badness(before.Verdict) {
				return fmt.Errorf("%s of strings[%d] goes from %q to %q with one more module", id, i, before.Verdict, after.Verdict)
			}
		}
		return nil
	})
}

// view is what a result says, keyed by what it says it of, whatever the order.
// original gives the index that a strings entry had.
func (r *result) view(original func(int) int) map[string]string {
	say := map[string]string{"verdict": r.Verdict}
	for _, l := range r.Limits {
		key := fmt.Sprintf("limits of %q %q %q", l.Plane, l.Inverter, l.Tracker)
		l.Plane, l.Inverter, l.Tracker = "", "", ""
		say[key] = fmt.Sprint(l.Ceiling.text, l.CeilingFrom, l.VocCold.text, l.VmpHot.text, l.MaxModules.text,
			l.MinModules.text, l.MinModulesStart.text, l.MaxStrings.text, l.MaxStringsFrom)
	}
	for i, s := range r.Strings {
		say[fmt.Sprintf("string %d", original(i))] = fmt.Sprint(s.Inverter, s.Unit.text, s.Tracker, s.Plane,
			s.ModulesInSeries.text, s.StringsInParallel.text, s.VocCold.text, s.VmpSTC.text, s.VmpHot.text, s.MaxCurrent.text, s.Verdict)
	}
	for _, c := range r.Checks {
		at := c.About.place()
		if c.About.String != nil {
			at = entryPlace(original(*c.About.String))
		}
		say[c.ID+" about "+string(at)] = fmt.Sprint(c.Verdict, c.Value.text, c.Limit.text, c.Unit, c.ReachedAt.text)
	}
	for _, q := range r.Questions {
		say["question "+q.Pointer+q.Asked] = fmt.Sprint(q.Unsafe)
	}
	return say
}

// sameView names what two views say differently.
func sameView(a, b map[string]string) error {
	var differ []string
	for _, key := range slices.Sorted(maps.Keys(a)) {
		if b[key] != a[key] {
			differ = append(differ, fmt.Sprintf("%s: %q became %q", key, a[key], b[key]))
		}
	}
	for key := range b {
		if _, ok := a[key]; !ok {
			differ = append(differ, key+" is new")
		}
	}
	if len(differ) > 0 {
		return errors.New(strings.Join(differ, "\n"))
	}
	return nil
}

func asIs(i int) int { return i }

// shuffled is a permutation of a list and, for each new index, the old one.
func (d draw) shuffled(l list) (list, []int) {
	from := d.Perm(len(l))
	var out list
	for _, i := range from {
		out = append(out, l[i])
	}
	return out, from
}

func TestLaw_OrderNeverMatters(t *testing.T) {
	holds(t, func(d draw, doc object) error {
		other := copyDocument(doc)
		entryFrom := []int{}
		if entries, ok := other["strings"].(list); ok {
			other["strings"], entryFrom = d.shuffled(entries)
		}
		other["planes"], _ = d.shuffled(other["planes"].(list))
		for _, inv := range other["inverters"].(list) {
			inv.(object)["trackers"], _ = d.shuffled(inv.(object)["trackers"].(list))
		}
		other["inverters"], _ = d.shuffled(other["inverters"].(list))
		// Pointers of questions name modules by their index, so those keep their order.
		a, b, err := both(doc, other)
		if err != nil {
			return err
		}
		return sameView(a.view(asIs), b.view(func(i int) int { return entryFrom[i] }))
	})
}

// TestLaw_OrderOfModulesNeverMatters leaves the questions out: their pointers
// follow the modules.
func TestLaw_OrderOfModulesNeverMatters(t *testing.T) {
	holds(t, func(d draw, doc object) error {
		doc = copyDocument(doc)
		delete(doc, "answers")
		delete(doc, "sources")
		other := copyDocument(doc)
		other["modules"], _ = d.shuffled(other["modules"].(list))
		a, b, err := both(doc, other)
		if err != nil {
			return err
		}
		a.Questions, b.Questions = nil, nil
		return sameView(a.view(asIs), b.view(asIs))
	})
}

func TestLaw_FahrenheitAndCelsiusAgree(t *testing.T) {
	holds(t, func(d draw, doc object) error {
		places := []string{"/site/coldest_c", "/site/hottest_c", "/allowances/headroom_c"}
		for i := range doc["planes"].(list) {
			places = append(places, fmt.Sprintf("/planes/%d/hot_cell_rise_c", i))
		}
		other := copyDocument(doc)
		for _, pointer := range places {
			celsius, ok := at(doc, pointer)
			n, bare := celsius.(json.Number)
			if !ok || !bare {
				continue
			}
			fahrenheit := times(rat(string(n)), rat("9/5"))
			if strings.HasPrefix(pointer, "/site/") {
				fahrenheit = plus(fahrenheit, rat("32"))
			}
			text, _ := decimalText(fahrenheit)
			put(other, pointer, object{"value": json.Number(text), "unit": "°F"})
		}
		a, b, err := both(doc, other)
		if err != nil {
			return err
		}
		return sameView(a.view(asIs), b.view(asIs))
	})
}

// TestLaw_CountsAreTheLast: the counts of a limits row pass, and one more or one
// less does not.
func TestLaw_CountsAreTheLast(t *testing.T) {
	holds(t, func(d draw, doc object) error {
		doc = copyDocument(doc)
		delete(doc, "strings")
		row, err := sizeDocument(doc)
		if err != nil {
			return err
		}
		l := row.Limits[d.IntN(len(row.Limits))]
		with := func(series, parallel number, more string) (*result, error) {
			n, s := series.Rat, parallel.Rat
			if more == "modules" {
				n = plus(n, one)
			} else if more == "fewer modules" {
				n = minus(n, one)
			} else if more == "strings" {
				s = plus(s, one)
			}
			if n.Cmp(one) < 0 || s.Cmp(one) < 0 {
				return nil, nil
			}
			wired := copyDocument(doc)
			wired["strings"] = list{object{
				"inverter": l.Inverter, "unit": json.Number("1"), "tracker": l.Tracker, "plane": l.Plane,
				"modules_in_series": json.Number(n.RatString()), "strings_in_parallel": json.Number(s.RatString()),
			}}
			return sizeDocument(wired)
		}
		tracker := trackerPlace(l.Inverter, "1", l.Tracker)
		single := number{Rat: one}
		cases := []struct {
			count            number
			parallel         number
			id               string
			about            place
			beyond, counting string
		}{
			{l.MaxModules, single, "voltage-ceiling", entryPlace(0), "modules", "max_modules"},
			{l.MinModules, single, "hot-minimum", entryPlace(0), "fewer modules", "min_modules"},
			{l.MinModulesStart, single, "start", entryPlace(0), "fewer modules", "min_modules_start"},
			{single, l.MaxStrings, "", tracker, "strings", "max_strings"},
		}
		for _, c := range cases {
			if c.count.Rat == nil {
				continue
			}
			for _, more := range []string{"", c.beyond} {
				r, err := with(c.count, c.parallel, more)
				if err != nil {
					return err
				}
				if r == nil {
					continue
				}
				broken := false
				for _, ch := range r.Checks {
					if ch.About.place() == c.about && ch.Verdict == "outside" &&
						(ch.ID == c.id || c.id == "" && (ch.ID == "inputs" || ch.ID == "short-circuit")) {
						broken = true
					}
				}
				if broken != (more != "") {
					return fmt.Errorf("%s of plane %q on tracker %q is %s modules, %s strings, but with those and %q the limit is broken: %t",
						c.counting, l.Plane, l.Tracker, c.count.RatString(), c.parallel.RatString(), more, broken)
				}
			}
		}
		return nil
	})
}

func TestLaw_SameDesignSameBytes(t *testing.T) {
	holds(t, func(d draw, doc object) error {
		text := documentText(doc)
		first, err := sizeText(text)
		if err != nil {
			return err
		}
		var spaced bytes.Buffer
		if err := json.Indent(&spaced, text, " ", "\t"); err != nil {
			return err
		}
		for _, again := range [][]byte{text, spaced.Bytes()} {
			second, err := sizeText(again)
			if err != nil {
				return err
			}
			if !bytes.Equal(first, second) {
				return errors.New("two results for one design")
			}
		}
		return nil
	})
}

// TestLaw_MissingNeverRemovesACheck takes each optional value out that has a check
// of its own, except those for which the page says "no check".
func TestLaw_MissingNeverRemovesACheck(t *testing.T) {
	holds(t, func(d draw, doc object) error {
		before, err := sizeDocument(doc)
		if err != nil {
			return err
		}
		var optional []string
		for i, inv := range doc["inverters"].(list) {
			optional = append(optional, fmt.Sprintf("/inverters/%d/back_feed_a", i))
			for t := range inv.(object)["trackers"].(list) {
				for _, name := range []string{"max_short_circuit_current_a", "max_short_circuit_current_per_input_a",
					"max_input_current_per_input_a", "string_fuse_a"} {
					optional = append(optional, fmt.Sprintf("/inverters/%d/trackers/%d/%s", i, t, name))
				}
			}
		}
		for i := range doc["modules"].(list) {
			for _, name := range []string{"cells_in_series", "isc_temp_coeff", "pmax_temp_coeff", "vmp_temp_coeff",
				"max_series_fuse_a", "isc_marked_max_a", "bifaciality", "noct_c", "length_mm", "width_mm"} {
				optional = append(optional, fmt.Sprintf("/modules/%d/%s", i, name))
			}
		}
		for i := range doc["planes"].(list) {
			for _, name := range []string{"tilt_deg", "azimuth_deg", "current_gain_pct"} {
				optional = append(optional, fmt.Sprintf("/planes/%d/%s", i, name))
			}
		}
		optional = append(optional, "/site/elevation_m", "/site/station", "/allowances/headroom_c", "/allowances", "/other_limits")
		d.Shuffle(len(optional), func(i, j int) { optional[i], optional[j] = optional[j], optional[i] })

		for _, pointer := range optional[:min(6, len(optional))] {
			if _, stated := at(doc, pointer); !stated {
				continue
			}
			less := copyDocument(doc)
			parent, name := any(less), pointer[strings.LastIndexByte(pointer, '/')+1:]
			if above := strings.TrimSuffix(pointer, "/"+name); above != "" {
				parent, _ = at(less, above)
			}
			delete(parent.(object), name)
			after, err := sizeDocument(less)
			if err != nil {
				return fmt.Errorf("without %s: %w", pointer, err)
			}
			for _, c := range before.Checks {
				now, there := after.check(c.ID, c.About.place())
				if !there {
					return fmt.Errorf("without %s there is no %s", pointer, c.at())
				}
				// These limits are needed: without them nothing is confirmed.
				short := name == "max_short_circuit_current_a" && c.ID == "short-circuit" && now.Limit.Rat == nil
				fuse := name == "max_series_fuse_a" && c.ID == "back-feed" && now.Limit.Rat == nil && positive(now.Value.Rat)
				if (short || fuse) && badness(now.Verdict) < badness("unconfirmed") {
					return fmt.Errorf("without %s %s is %s", pointer, c.at(), now.Verdict)
				}
			}
			if len(after.Checks) != len(before.Checks) {
				return fmt.Errorf("without %s there are %d checks, before %d", pointer, len(after.Checks), len(before.Checks))
			}
		}
		return nil
	})
}

// TestLaw_UnstatedNumbersAreTheirDefaults: what the page says stands where nothing is stated.
func TestLaw_UnstatedNumbersAreTheirDefaults(t *testing.T) {
	defaults := []struct {
		below, name string
		value       any
	}{
		{"", "voltage_method", "coefficient"},
		{"", "short_circuit_basis", "maximum"},
		{"/allowances", "hot_voltage_pct", json.Number("0")},
		{"/allowances", "cold_voltage_pct", json.Number("0")},
		{"/allowances", "headroom_c", json.Number("3")},
		{"/inverters/0", "quantity", json.Number("1")},
		{"/inverters/0", "max_dc_power_is", "limit"},
		{"/inverters/0", "back_feed_a", json.Number("0")},
		{"/planes/0", "current_gain_pct", json.Number("0")},
	}
	holds(t, func(d draw, doc object) error {
		for range 2 {
			def := defaults[d.IntN(len(defaults))]
			stated := copyDocument(doc)
			if def.below == "/allowances" && stated["allowances"] == nil {
				stated["allowances"] = object{}
			}
			if _, there := at(doc, def.below+"/"+def.name); there {
				continue
			}
			put(stated, def.below+"/"+def.name, def.value)
			a, b, err := both(doc, stated)
			if err != nil {
				return err
			}
			if err := sameView(a.view(asIs), b.view(asIs)); err != nil {
				return fmt.Errorf("with %s/%s stated as %v: %w", def.below, def.name, def.value, err)
			}
		}
		return nil
	})
}
