package design

import (
	"encoding/json"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// alone returns the first module and inverter of the design that has every field,
// without their ids.
func alone(t testing.TB) (module, inverter map[string]json.RawMessage) {
	t.Helper()
	var d struct{ Modules, Inverters []map[string]json.RawMessage }
	if err := json.Unmarshal(full(t), &d); err != nil {
		t.Fatal(err)
	}
	delete(d.Modules[0], "id")
	delete(d.Inverters[0], "id")
	return d.Modules[0], d.Inverters[0]
}

func jsonOf(t testing.TB, v any) []byte {
	t.Helper()
	text, err := json.Marshal(v)
	if err != nil {
		t.Fatal(err)
	}
	return text
}

// TestReadAlone: alone, a module and an inverter are read as they are inside their
// design, and written as they are written there.
func TestReadAlone(t *testing.T) {
	whole := Read(full(t)).Design
	module, inverter := alone(t)
	m, faults := ReadModule(jsonOf(t, module))
	if faults != nil {
		t.Fatal(faults)
	}
	v, faults := ReadInverter(append([]byte(byteOrderMark+"\n"), jsonOf(t, inverter)...))
	if faults != nil {
		t.Fatal(faults)
	}
	wantM, wantV := whole.Modules[0], whole.Inverters[0]
	wantM.ID, wantV.ID = "", ""
	if diff := cmp.Diff(&wantM, m, sameNumber); diff != "" {
		t.Errorf("module (-in the design +alone):\n%s", diff)
	}
	if diff := cmp.Diff(&wantV, v, sameNumber); diff != "" {
		t.Errorf("inverter (-in the design +alone):\n%s", diff)
	}
	canonical := string(AppendJSON(nil, whole))
	for _, text := range [][]byte{AppendModule(nil, m), AppendInverter(nil, v)} {
		if !strings.Contains(canonical, strings.TrimPrefix(string(text), "{")) {
			t.Errorf("the design does not say %s", text)
		}
	}
	again, faults := ReadModule(AppendModule(nil, m))
	if diff := cmp.Diff(m, again, sameNumber); faults != nil || diff != "" {
		t.Errorf("%v, written and read again:\n%s", faults, diff)
	}
}

func TestReadAlone_Refused(t *testing.T) {
	module, inverter := alone(t)
	with := func(of map[string]json.RawMessage, name, put string) string {
		changed := map[string]json.RawMessage{}
		for k, v := range of {
			changed[k] = v
		}
		if changed[name] = json.RawMessage(put); put == "" {
			delete(changed, name)
		}
		return string(jsonOf(t, changed))
	}
	readModule := func(text []byte) Faults { _, faults := ReadModule(text); return faults }
	readInverter := func(text []byte) Faults { _, faults := ReadInverter(text); return faults }
	for _, c := range []struct {
		name, text string
		read       func([]byte) Faults
		pointers   []string
	}{
		{"nothing", " \n", readModule, []string{""}},
		{"no JSON", "{", readModule, []string{""}},
		{"two", "{} {}", readInverter, []string{""}},
		{"a list", "[]", readModule, []string{""}},
		{"an id", with(module, "id", `"m1"`), readModule, []string{"/id"}},
		{"an id of an inverter", with(inverter, "id", `"i1"`), readInverter, []string{"/id"}},
		{"Voc below Vmp", with(module, "voc_v", "30"), readModule, []string{"/voc_v"}},
		{"no Voc", with(module, "voc_v", ""), readModule, []string{"/voc_v"}},
		{"an inverter for a module", with(inverter, "", ""), readModule, nil},
		{"no trackers", with(inverter, "trackers", ""), readInverter, []string{"/trackers"}},
		{"a tracker twice", with(inverter, "trackers", `[{"id":"t","mppt_min_v":1,"mppt_max_v":2,"inputs":1,"max_input_current_a":1},{"id":"t","mppt_min_v":3,"mppt_max_v":2,"inputs":1,"max_input_current_a":1}]`),
			readInverter, []string{"/trackers/1/id", "/trackers/1/mppt_min_v"}},
	} {
		faults := c.read([]byte(c.text))
		var pointers []string
		for _, f := range faults {
			if f.Found == "" || f.Expected == "" || f.Detail == "" {
				t.Errorf("%s: a fault says too little: %+v", c.name, f)
			}
			pointers = append(pointers, f.Pointer)
		}
		if len(faults) == 0 || c.pointers != nil && !slices.Equal(pointers, c.pointers) {
			t.Errorf("%s: faults at %q, want %q", c.name, pointers, c.pointers)
		}
	}
}

// TestModuleQuestions: alone, a module is asked about as it is in a design, at the
// pointers inside it, and an answer closes the question there too.
func TestModuleQuestions(t *testing.T) {
	text := edited(t, edit{"/modules/0/pmax_w", "430"}, edit{"/modules/0/isc_temp_coeff/value", "-0.05"}, edit{"/modules/0/cells_in_series", "120"})
	d := Read(text).Design
	terms := NewTerms(d)
	m := d.Modules[0]
	m.ID = ""
	var in, out []string
	doubts := Doubts(d, terms, 0)
	for i := range doubts {
		if doubts[i].Open() {
			q := doubts[i].Question()
			in = append(in, strings.TrimPrefix(q.Pointer, "/modules/0")+" "+q.Asked+" "+q.Why+" "+q.ValueAsked)
		}
	}
	open := m.Questions(nil)
	for _, q := range open {
		out = append(out, q.Pointer+" "+q.Asked+" "+q.Why+" "+q.ValueAsked)
	}
	if diff := cmp.Diff(in, out); diff != "" || len(in) != 3 {
		t.Errorf("%d questions (-in the design +alone):\n%s", len(in), diff)
	}
	answers := []Answer{{Pointer: open[0].Pointer, ValueAsked: Asked(open[0].ValueAsked), Reason: "so printed"}}
	if left := m.Questions(answers); len(left) != 2 || left[0].Asked != open[1].Asked {
		t.Errorf("with one answered, %d are open", len(left))
	}
}

func TestReadAnswers(t *testing.T) {
	text := `[{"pointer":"/voc_v","value_asked":{"voc_v":37.30,"isc_a":1},"reason":"so printed"}]`
	answers, faults := ReadAnswers([]byte(text))
	want := []Answer{{Pointer: "/voc_v", ValueAsked: `{"isc_a":1,"voc_v":37.3}`, Reason: "so printed"}}
	if diff := cmp.Diff(want, answers); diff != "" || faults != nil {
		t.Fatalf("%v (-want +got)\n%s", faults, diff)
	}
	again, faults := ReadAnswers(AppendAnswers(nil, answers))
	if diff := cmp.Diff(want, again); diff != "" || faults != nil {
		t.Errorf("written and read again: %v\n%s", faults, diff)
	}
	if none, faults := ReadAnswers([]byte("[]")); len(none) != 0 || faults != nil || string(AppendAnswers(nil, nil)) != "[]" {
		t.Errorf("none: %v, %v", none, faults)
	}
	for text, pointer := range map[string]string{
		`{}`: "", `[1]`: "/0", `[{"pointer":"voc_v","value_asked":1,"reason":"x"}]`: "/0/pointer",
		`[{"pointer":"/voc_v","value_asked":[1],"reason":"x"}]`: "/0/value_asked", `[{"pointer":"/voc_v","value_asked":1}]`: "/0/reason",
	} {
		if answers, faults := ReadAnswers([]byte(text)); answers != nil || len(faults) != 1 || faults[0].Pointer != pointer {
			t.Errorf("%s: %v, %v, want a fault at %q", text, answers, faults, pointer)
		}
	}
}

// FuzzReadModule: whatever is sent is refused with reasons, or read, and then
// written and read again as the same.
func FuzzReadModule(f *testing.F) {
	module, inverter := alone(f)
	f.Add(jsonOf(f, module))
	f.Add(jsonOf(f, inverter))
	f.Add([]byte("\ufeff{}"))
	f.Fuzz(func(t *testing.T, text []byte) {
		m, faults := ReadModule(text)
		if (m == nil) != (len(faults) > 0) {
			t.Fatalf("module %v, faults %v", m, faults)
		}
		if m == nil {
			return
		}
		m.Questions(nil)
		written := AppendModule(nil, m)
		again, faults := ReadModule(written)
		if faults != nil || string(AppendModule(nil, again)) != string(written) {
			t.Errorf("%s is read as %v, %v", written, again, faults)
		}
	})
}
