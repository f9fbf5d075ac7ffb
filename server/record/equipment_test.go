package record

import (
	"encoding/json"
	"os"
	"slices"
	"strings"
	"testing"

	"rimeline/sizing/design"
)

// pieces returns the modules and inverters of the design that has every field once,
// without their ids.
func pieces(t testing.TB) map[Kind]string {
	t.Helper()
	text, err := os.ReadFile("../../sizing/design/testdata/full-design.json")
	if err != nil {
		t.Fatal(err)
	}
	var full struct{ Modules, Inverters []map[string]json.RawMessage }
	if err := json.Unmarshal(text, &full); err != nil {
		t.Fatal(err)
	}
	found := map[Kind]string{}
	for kind, piece := range map[Kind]map[string]json.RawMessage{KindModule: full.Modules[0], KindInverter: full.Inverters[0]} {
		delete(piece, "id")
		text, err := json.Marshal(piece)
		if err != nil {
			t.Fatal(err)
		}
		found[kind] = string(text)
	}
	return found
}

// TestReadEquipment: every field of a module and of an inverter comes back, put into
// the canonical order, and reading that again changes nothing.
func TestReadEquipment(t *testing.T) {
	names := map[Kind][2]string{
		KindModule:   {"Tamarack Demo Works (invented)", "TD-410B"},
		KindInverter: {"Quillback Demo Power (invented)", "QP-12K"},
	}
	for kind, text := range pieces(t) {
		e, faults := ReadEquipment(kind, []byte(" \n"+text+" "))
		if faults != nil {
			t.Fatalf("%s: %v", kind, faults)
		}
		if e.Kind != kind || e.Maker != names[kind][0] || e.Model != names[kind][1] {
			t.Errorf("%s, maker %q, model %q; want %s %q", e.Kind, e.Maker, e.Model, kind, names[kind])
		}
		var in, out map[string]any
		if err := json.Unmarshal([]byte(text), &in); err != nil {
			t.Fatal(err)
		}
		if err := json.Unmarshal(e.Document, &out); err != nil {
			t.Fatalf("%v: %s", err, e.Document)
		}
		if len(in) != len(out) {
			t.Errorf("%s: %d fields of %d came back: %s", kind, len(out), len(in), e.Document)
		}
		if !strings.HasPrefix(string(e.Document), `{"maker":"`) {
			t.Errorf("the canonical form begins with the id, or not with the maker: %s", e.Document)
		}
		if again, faults := ReadEquipment(kind, e.Document); string(again.Document) != string(e.Document) {
			t.Errorf("%s is read as %s (%v)", e.Document, again.Document, faults)
		}
	}
}

func TestReadEquipment_Refused(t *testing.T) {
	module, inverter := pieces(t)[KindModule], pieces(t)[KindInverter]
	change := func(text, from, to string) string {
		if !strings.Contains(text, from) {
			t.Fatalf("%s has no %s", text, from)
		}
		return strings.Replace(text, from, to, 1)
	}
	for _, c := range []struct {
		name, text string
		kind       Kind
		pointers   []string
	}{
		{"a value that cannot be", change(module, `"voc_v":37.32`, `"voc_v":30`), KindModule, []string{"/voc_v"}},
		{"two of them, one inside a list", change(change(inverter, `"mppt_max_v":850`, `"mppt_max_v":"850"`), `"back_feed_a":0.5`, `"back_feed_a":-1`), KindInverter, []string{"/back_feed_a", "/trackers/0/mppt_max_v"}},
		{"no model", change(module, `"model":"TD-410B"`, `"model":" "`), KindModule, []string{"/model"}},
		{"an unknown field", change(module, `"voc_v"`, `"voc"`), KindModule, []string{"/voc", "/voc_v"}},
		{"an id", change(module, `{`, `{"id":"m1",`), KindModule, []string{"/id"}},
		{"an id in capitals", change(module, `{`, `{"ID":"m1",`), KindModule, []string{"/ID"}},
		{"the other kind", inverter, "wind turbine", []string{""}},
		{"a list", `[]`, KindModule, []string{""}},
		{"no JSON", `{"voc_v": 12`, KindModule, []string{""}},
		{"a way out of the list", module + `],"inverters":[{}`, KindModule, []string{""}},
		{"two", module + module, KindModule, []string{""}},
		{"nothing", ``, KindInverter, []string{""}},
	} {
		e, faults := ReadEquipment(c.kind, []byte(c.text))
		var pointers []string
		for _, f := range faults {
			pointers = append(pointers, f.Pointer)
			if f.Found == "" || f.Expected == "" || f.Detail == "" {
				t.Errorf("%s: a reason says too little: %+v", c.name, f)
			}
		}
		slices.Sort(pointers)
		if !slices.Equal(pointers, c.pointers) || e.Document != nil {
			t.Errorf("%s: faults at %q, want %q; document %s", c.name, pointers, c.pointers, e.Document)
		}
	}
	for kind, misses := range map[Kind]string{KindModule: "/voc_v", KindInverter: "/trackers"} {
		if _, faults := ReadEquipment(kind, []byte(`{ }`)); !slices.ContainsFunc(faults, func(f design.Fault) bool { return f.Pointer == misses }) {
			t.Errorf("an empty %s: %v, want one at %s", kind, faults, misses)
		}
	}
}

// FuzzReadEquipment: whatever is sent, it is refused with reasons, or what is kept of
// it can be put into a design.
func FuzzReadEquipment(f *testing.F) {
	for kind, text := range pieces(f) {
		f.Add(text, kind == KindModule)
	}
	f.Add(`{}],"planes":[{"id":"p"}`, true)
	f.Add("\ufeff{}", false)
	f.Fuzz(func(t *testing.T, text string, module bool) {
		kind := KindInverter
		if module {
			kind = KindModule
		}
		e, faults := ReadEquipment(kind, []byte(text))
		if (len(faults) > 0) == (e.Document != nil) {
			t.Fatalf("%d faults and the document %q", len(faults), e.Document)
		}
		for _, fault := range faults {
			if strings.HasPrefix(fault.Pointer, "/modules/") || strings.HasPrefix(fault.Pointer, "/planes/") {
				t.Errorf("a fault outside of what was sent: %+v", fault)
			}
		}
		if e.Document == nil {
			return
		}
		again, faults := ReadEquipment(kind, e.Document)
		if faults != nil || string(again.Document) != string(e.Document) {
			t.Errorf("%s is read as %s, %v", e.Document, again.Document, faults)
		}
	})
}
