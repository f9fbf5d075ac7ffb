package display

import (
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"rimeline/sizing/design"
	"rimeline/views"
)

func sideOf(c *composer, name string) Side { return Side{Name: name, Design: c.d, Result: c.r} }

func compared(was, now *composer) views.Comparison {
	return NewComparison(sideOf(was, "Before"), sideOf(now, "After"))
}

func comparisonText(c views.Comparison) string {
	var p page
	p.line("%s: [%s] %s %s", c.Before.Name, c.Before.Verdict, c.Before.Headline, c.Before.Tally)
	p.line("%s: [%s] %s %s", c.After.Name, c.After.Verdict, c.After.Headline, c.After.Tally)
	p.line("%s", c.Lead)
	for _, g := range c.Verdicts {
		p.line("\n# %s", g.Heading)
		for _, r := range g.Rows {
			p.line("%s: %s", r.Title, r.About)
			p.line("    [%s] %s", r.Before.Verdict, r.Before.Says)
			p.line("    [%s] %s", r.After.Verdict, r.After.Says)
		}
		if g.Rest != "" {
			p.line("%s", g.Rest)
		}
	}
	for _, q := range c.Asked {
		p.line("asked now: %s: %s %s %s", q.Field, q.Asked, q.Why, q.Effect)
	}
	for _, q := range c.Closed {
		p.line("no longer asked: %s: %s", q.Field, q.Asked)
	}
	for _, part := range []struct {
		title  string
		groups []views.ChangeGroup
	}{{"Inputs", c.Inputs}, {"Results", c.Results}, {"Moved", c.Moved}} {
		for _, g := range part.groups {
			p.line("\n# %s: %s", part.title, g.Of)
			for _, r := range g.Rows {
				p.line("%s | %s | %s | %s", r.Name, r.Before, r.After, r.By)
			}
		}
	}
	return p.String()
}

// TestComparison_Golden compares the example with itself after the module was
// substituted, a string was added and a sensor of cold was corrected.
func TestComparison_Golden(t *testing.T) {
	const file = "comparison.txt"
	now := changed(t,
		change{"/modules/0/model", "TD-430M"}, change{"/modules/0/pmax_w", 430}, change{"/modules/0/voc_v", 38.9}, change{"/modules/0/isc_a", 14.4},
		change{"/modules/0/vmp_v", 32.3}, change{"/modules/0/imp_a", 13.32}, change{"/modules/0/max_series_fuse_a", nil},
		change{"/site/coldest_c", -24}, change{"/strings/0/modules_in_series", 24}, change{"/strings/-", entry("t2", "west", 13, 1)},
		change{"/inverters/0/start_voltage_v", nil}, change{"/sources", map[string]any{"/modules/0/voc_v": "datasheet rev. D, page 2"}})
	got := comparisonText(compared(changed(t), now))
	if *update {
		if err := os.WriteFile(filepath.Join("testdata", file), []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(filepath.Join("testdata", file))
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(string(want), got); diff != "" {
		t.Errorf("%s (-want +got; -update writes it anew):\n%s", file, diff)
	}
}

// TestComparison_Same: a design does not differ from itself, however many variants.
func TestComparison_Same(t *testing.T) {
	eachVariant(t, func(t *testing.T, c *composer) {
		want := views.Comparison{
			Before: c.comparedSide("Before"), After: c.comparedSide("After"), Lead: "Nothing differs.",
		}
		if diff := cmp.Diff(want, compared(c, c)); diff != "" {
			t.Errorf("(-want +got)\n%s", diff)
		}
	})
}

// TestComparison_BothWays: what gets worse one way gets better the other way, and
// every value stands on the other side.
func TestComparison_BothWays(t *testing.T) {
	example := changed(t)
	eachVariant(t, func(t *testing.T, c *composer) {
		to, back := compared(example, c), compared(c, example)
		rows := func(p views.Comparison, way int) (n int) {
			for _, g := range p.Verdicts {
				if g.Heading == wayHeadings[way] {
					n += len(g.Rows)
				}
			}
			return n
		}
		for way, other := range map[int]int{worse: better, better: worse} {
			if a, b := rows(to, way), rows(back, other); a != b {
				t.Errorf("%d rows of %q, and %d of %q on the way back", a, wayHeadings[way], b, wayHeadings[other])
			}
		}
		for name, of := range map[string]func(views.Comparison) []views.ChangeGroup{
			"inputs": func(p views.Comparison) []views.ChangeGroup { return p.Inputs }, "results": func(p views.Comparison) []views.ChangeGroup { return p.Results },
		} {
			a, b := rowsOf(of(to)), rowsOf(of(back))
			if a != b {
				t.Errorf("%d %s differ, and %d on the way back", a, name, b)
			}
		}
	})
}

// TestComparison_EveryTurn: every verdict that differs for one and the same subject
// is told, and so is each that one side alone has and that is not within.
func TestComparison_EveryTurn(t *testing.T) {
	example := changed(t)
	eachVariant(t, func(t *testing.T, c *composer) {
		told := 0
		for _, g := range compared(example, c).Verdicts {
			told += len(g.Rows)
		}
		cmpr := comparer{pairing: pairUp(example.d, c.d), was: example, now: c}
		turns := map[string]bool{}
		for _, m := range cmpr.matched() {
			turn := cmpr.turning(m)
			switch {
			case m.was == nil && m.now.Verdict.String() == "within", m.now == nil && m.was.Verdict.String() == "within":
			case m.was == nil || m.now == nil || m.was.Verdict != m.now.Verdict:
				turns[fmt.Sprint(turn.kind, turn.Before, turn.After)] = true
			}
		}
		if told != len(turns) {
			t.Errorf("%d rows, want %d", told, len(turns))
		}
	})
}

// TestComparison_Complete: whichever value of the document changes, the comparison
// says so.
func TestComparison_Complete(t *testing.T) {
	text, err := os.ReadFile("../../sizing/design/testdata/full-design.json")
	if err != nil {
		t.Fatal(err)
	}
	was := parseDesign(t, text)
	var root any
	if err := json.Unmarshal(text, &root); err != nil {
		t.Fatal(err)
	}
	inputs := func(now *design.Design) []views.ChangeGroup {
		c := comparer{pairing: pairUp(was, now), was: newComposer(was, nil), now: newComposer(now, nil)}
		return c.inputs()
	}
	for _, pointer := range leaves(root, "") {
		designs := altered(t, text, pointer)
		if now := edit(t, text, pointer, nil); now != nil && !saysTheSame(was, now) {
			designs = append(designs, now)
		}
		for _, now := range designs {
			if len(inputs(now)) == 0 {
				t.Errorf("%s changed, and no input differs:\n%s", pointer, design.AppendJSON(nil, now))
			}
		}
	}
}

// saysTheSame reports whether two designs have the same canonical text.
func saysTheSame(a, b *design.Design) bool {
	return string(design.AppendJSON(nil, a)) == string(design.AppendJSON(nil, b))
}

// leaves returns the pointers of all values that have nothing below them.
func leaves(at any, pointer string) []string {
	var all []string
	switch at := at.(type) {
	case map[string]any:
		for name, below := range at {
			all = append(all, leaves(below, pointer+"/"+strings.NewReplacer("~", "~0", "/", "~1").Replace(name))...)
		}
	case []any:
		for i, below := range at {
			all = append(all, leaves(below, fmt.Sprintf("%s/%d", pointer, i))...)
		}
	default:
		return []string{pointer}
	}
	return all
}

// edit returns the design with a change at a pointer, nil where it is then refused.
func edit(t *testing.T, text []byte, pointer string, value any) *design.Design {
	t.Helper()
	decoder := json.NewDecoder(strings.NewReader(string(text)))
	decoder.UseNumber()
	var root any
	if err := decoder.Decode(&root); err != nil {
		t.Fatal(err)
	}
	path := strings.Split(pointer, "/")[1:]
	for i := range path {
		path[i] = strings.NewReplacer("~1", "/", "~0", "~").Replace(path[i])
	}
	text, err := json.Marshal(put(t, root, path, value))
	if err != nil {
		t.Fatal(err)
	}
	return design.Read(text).Design
}

// altered returns the designs that other values at a pointer make, as far as the
// reader takes them.
func altered(t *testing.T, text []byte, pointer string) []*design.Design {
	t.Helper()
	was := design.Read(text).Design
	var all []*design.Design
	for _, value := range []any{
		"another", json.Number("3"), json.Number("33.3"), json.Number("-0.3"), json.Number("333"), json.Number("-0.11"), json.Number("777"), "V/°C", "%/°C", "A/°C", "W/°C", "°F", "°C",
		"table", "rated", "advice", "ground-mounted", "multi-si", "nec-2017", "other", "record-high", "t2", "i2", "m2", "west", "south", "/modules/0/isc_a",
	} {
		if d := edit(t, text, pointer, value); d != nil && !saysTheSame(was, d) {
			all = append(all, d)
		}
	}
	return all
}

// TestComparison_Parts: what is moved or renamed is still the same part.
func TestComparison_Parts(t *testing.T) {
	two := variants["two modules"]
	for _, c := range []struct {
		name     string
		was, now []change
		want     []string
	}{
		{"the first strings are taken away", nil, []change{{"/strings", []any{entry("t2", "west", 13, 1)}}},
			[]string{"S1, removed: From", "S1, removed: Inverter", "S1, removed: Unit", "S1, removed: Tracker", "S1, removed: Modules in series", "S1, removed: Strings in parallel"}},
		{"a plane is renamed", nil, []change{{"/planes/0/id", "terrace"}, {"/strings/0/plane", "terrace"}}, []string{"Terrace plane: Name"}},
		{"a tracker is renamed", nil, []change{{"/inverters/0/trackers/1/id", "B"}, {"/strings/1/tracker", "B"}}, []string{"Tracker B: Name"}},
		{"a module is renamed", nil, []change{{"/modules/0/id", "x"}, {"/planes/0/module", "x"}, {"/planes/1/module", "x"}}, []string{"Module TD-410M: Id in the file"}},
		{"strings are put on another tracker", nil, []change{{"/strings/1/tracker", "t1"}, {"/strings/0/tracker", "t2"}}, []string{"S1: Tracker", "S2: Tracker"}},
		{"the strings change places in the list", nil, []change{{"/strings", []any{entry("t2", "west", 13, 1), entry("t1", "south", 12, 2)}}}, nil},
		{"a plane gets the other module", two, append(two[:len(two):len(two)], change{"/planes/1/module", "m1"}), []string{"West plane: Module"}},
		{"°C as an object", nil, []change{{"/site/coldest_c", map[string]any{"value": -21, "unit": "°C"}}}, nil},
	} {
		t.Run(c.name, func(t *testing.T) {
			var got []string
			for _, g := range compared(changed(t, c.was...), changed(t, c.now...)).Inputs {
				for _, r := range g.Rows {
					got = append(got, g.Of+": "+r.Name)
				}
			}
			if diff := cmp.Diff(c.want, got); diff != "" {
				t.Errorf("(-want +got)\n%s", diff)
			}
		})
	}
}
