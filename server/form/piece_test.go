package form

import (
	"encoding/json"
	"maps"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"rimeline/sizing/design"
)

// withSources is the example form with sources and answers about its parts.
func withSources(t *testing.T) *Form {
	return change(t, map[string]string{
		SourceName("/modules/0"): "datasheet rev. C", SourceName("/modules/0/voc_v"): "page 2", SourceName("/inverters/0/trackers/1/inputs"): "page 4",
		"/answers/0/pointer": "/modules/0/voc_v", "/answers/0/value_asked": "37.30", "/answers/0/reason": "so printed",
		"/answers/1/pointer": "/modules/0/pmax_w", "/answers/1/value_asked": "[1]", "/answers/1/reason": "which the reader refuses",
	})
}

// TestPiece_OutAndIn: what is copied out of a design and into another says the same there.
func TestPiece_OutAndIn(t *testing.T) {
	t.Parallel()
	f := withSources(t)
	f.lens["/answers"] = 2
	m, faults := f.ReadModule("/modules/0")
	if faults != nil {
		t.Fatal(faults)
	}
	v, faults := f.ReadInverter("/inverters/0")
	if faults != nil {
		t.Fatal(faults)
	}
	sources, answers := f.Sources("/modules/0"), f.Answers("/modules/0")
	if want := map[string]string{"": "datasheet rev. C", "/voc_v": "page 2"}; !maps.Equal(sources, want) {
		t.Errorf("sources %q, want %q", sources, want)
	}
	if want := []design.Answer{{Pointer: "/voc_v", ValueAsked: "37.3", Reason: "so printed"}}; !cmp.Equal(answers, want) {
		t.Errorf("answers %v, want %v", answers, want)
	}

	g := New()
	if !g.Put("/modules/0", design.AppendModule(nil, m), sources, answers) || !g.Put("/inverters/0", design.AppendInverter(nil, v), f.Sources("/inverters/0"), nil) {
		t.Fatal("not put")
	}
	for name, want := range map[string]string{
		"/modules/0/id": "m1", "/modules/0/voc_v": "37.32", "/modules/0/voc_temp_coeff/unit": "%/°C", SourceName("/modules/0/voc_v"): "page 2",
		"/inverters/0/trackers/1/mppt_max_v": "850", SourceName("/inverters/0/trackers/1/inputs"): "page 4",
		"/answers/0/pointer": "/modules/0/voc_v", "/answers/0/value_asked": "37.3", "/answers/0/reason": "so printed",
	} {
		if got := g.Text(name); got != want {
			t.Errorf("%s = %q, want %q", name, got, want)
		}
	}
	again, faults := g.ReadModule("/modules/0")
	if faults != nil || string(design.AppendModule(nil, again)) != string(design.AppendModule(nil, m)) {
		t.Errorf("copied in, the module is another: %v", faults)
	}
}

// TestPut_InPlace: what stood there goes, with its sources and answers, and nothing else does.
func TestPut_InPlace(t *testing.T) {
	t.Parallel()
	f := withSources(t)
	f.lens["/answers"] = 2
	f.texts["/inverters/0/quantity"] = "3"
	if !f.Put("/modules/0", []byte(`{"model":"X","pmax_w":1.50,"surprise":2,"id":"other"}`), map[string]string{"": "another sheet"}, nil) {
		t.Fatal("not put")
	}
	if !f.Put("/inverters/0", []byte(`{"model":"Y","quantity":1,"trackers":[{"id":"A"},{"inputs":4}]}`), nil, nil) {
		t.Fatal("not put")
	}
	for name, want := range map[string]string{
		"/modules/0/id": "m1", "/modules/0/pmax_w": "1.50", "/modules/0/voc_v": "", SourceName("/modules/0"): "another sheet", SourceName("/modules/0/voc_v"): "",
		"/answers/0/pointer": "", "/inverters/0/quantity": "3", "/inverters/0/trackers/0/mppt_max_v": "", "/inverters/0/trackers/1/inputs": "4",
		"/inverters/0/trackers/1/id": "t1", "/planes/0/module": "m1", "/site/name": "Larkspur Mill (invented)",
		"/strings/0/tracker": "A", "/strings/1/tracker": "t1", // in the place of the first and the second
	} {
		if got := f.Text(name); got != want {
			t.Errorf("%s = %q, want %q", name, got, want)
		}
	}
}

func TestPut_Wires(t *testing.T) {
	t.Parallel()
	for trackers, want := range map[string]string{
		`[{"id":"t2"},{"id":"t1"}]`:            "t1 t2", // by name
		`[{"id":"t1"},{"id":"x"},{"id":"t2"}]`: "t1 t2",
		`[{"id":"t2"},{"id":"x"}]`:             "t2 x", // by place, as t1 is not there
		`[{"id":"t2"}]`:                        "t2 ",
		`[]`:                                   " ",
	} {
		f := change(t, nil)
		f.Put("/inverters/0", []byte(`{"trackers":`+trackers+`}`), nil, nil)
		if got := f.Text("/strings/0/tracker") + " " + f.Text("/strings/1/tracker"); got != want {
			t.Errorf("%s: %q, want %q", trackers, got, want)
		}
	}
}

func TestPut_NoRoomNoPlace(t *testing.T) {
	t.Parallel()
	f := change(t, nil)
	before := string(f.Document())
	many := `{"trackers":[` + strings.TrimSuffix(strings.Repeat(`{},`, MaxEntries), ",") + `]}`
	for at, piece := range map[string]string{"/inverters/0": many, "/modules/7": "{}", "/site": "{}", "/modules/0": "[]", "/modules": "{}"} {
		if f.Put(at, []byte(piece), nil, nil) {
			t.Errorf("put at %s", at)
		}
	}
	if after := string(f.Document()); after != before {
		t.Errorf("the form has changed:\n%s\n%s", before, after)
	}
}

// TestReadPiece_Faults: what cannot be read, and what the reader refuses, at the
// pointers of the form.
func TestReadPiece_Faults(t *testing.T) {
	t.Parallel()
	f := change(t, map[string]string{"/modules/0/voc_v": "37,32,1", "/modules/0/pmax_w": "", "/inverters/0/trackers/1/inputs": "0", "/modules/0/id": ""})
	m, faults := f.ReadModule("/modules/0")
	var pointers []string
	for _, fault := range faults {
		pointers = append(pointers, fault.Pointer)
	}
	if want := []string{"/modules/0/voc_v", "/modules/0/pmax_w"}; !slices.Equal(pointers, want) || m != nil {
		t.Errorf("faults at %q, want %q", pointers, want)
	}
	if v, faults := f.ReadInverter("/inverters/0"); v != nil || len(faults) != 1 || faults[0].Pointer != "/inverters/0/trackers/1/inputs" {
		t.Errorf("%v", faults)
	}
	if m, faults := f.ReadModule("/modules/3"); m != nil || len(faults) == 0 {
		t.Errorf("no such module: %v", faults)
	}
}

func TestNewPiece(t *testing.T) {
	t.Parallel()
	for list, want := range map[string]map[string]int{
		"/modules": {"/modules": 1}, "/inverters": {"/inverters": 1, "/inverters/0/trackers": 1},
	} {
		if f := NewPiece(list); !maps.Equal(f.lens, want) {
			t.Errorf("%s: %v, want %v", list, f.lens, want)
		}
	}
}

// FuzzPut: whatever is put into a form, the form stays one that can be posted and
// written.
func FuzzPut(f *testing.F) {
	f.Add(`{"voc_v":1,"trackers":[{"id":"t9"}]}`, "/inverters/0", "/voc_v")
	f.Add(`{"voc_temp_coeff":{"value":1,"unit":2,"x":3},"noct_c":[1]}`, "/modules/0", "")
	f.Fuzz(func(t *testing.T, piece, at, inside string) {
		form := New()
		form.Put(at, []byte(piece), map[string]string{inside: "somewhere"}, []design.Answer{{Pointer: inside, ValueAsked: "1", Reason: "so"}})
		if !json.Valid(form.Document()) {
			t.Errorf("%s at %s: the document is not JSON:\n%s", piece, at, form.Document())
		}
	})
}
