package server

import (
	"encoding/json"
	"fmt"
	"regexp"
	"slices"
	"strings"
	"testing"

	"rimeline/server/record"
	"rimeline/tests/testdb"
)

func emptyDatabase(t *testing.T) string { return testdb.New(t, nil) }

// TestAPIEquipment follows one module from its making to its archive.
func TestAPIEquipment(t *testing.T) {
	s, _ := savingServer(t, Config{})
	p := newProgram(t, s)
	module := keptPiece(t, record.KindModule)
	body := func(note string) string {
		return fmt.Sprintf(`{"sources": {"/voc_v": "page 2, <STC>", "": "rev. 3"}, "note": %q, "module": %s,
			"answers": [{"pointer": "/pmax_w", "value_asked": {"vmp_v": 31.50, "pmax_w": 4e2}, "reason": "as printed"}]}`, note, module)
	}
	made := p.want(201, "POST", "/api/v1/equipment", body("first"))
	one, first := made.Header().Get("Location"), made.Header().Get("ETag")
	e := decode[apiKept](t, made)
	if one != "/api/v1/equipment/"+e.ID || e.Kind != "module" || e.Version != 1 || first != `"1"` || e.Note != "first" ||
		e.Sources["/voc_v"] != "page 2, <STC>" || e.Sources[""] != "rev. 3" ||
		string(e.Answers) != `[{"pointer":"/pmax_w","value_asked":{"pmax_w":400,"vmp_v":31.5},"reason":"as printed"}]` {
		t.Errorf("made at %s with %s: %s", one, first, made.Body)
	}
	var sent, kept map[string]any
	if json.Unmarshal([]byte(module), &sent) != nil || json.Unmarshal(e.Module, &kept) != nil || fmt.Sprint(sent) != fmt.Sprint(kept) {
		t.Errorf("sent %v, kept %v", sent, kept)
	}
	if got := p.want(200, "GET", one, ""); got.Body.String() != made.Body.String() {
		t.Errorf("GET answers %s, POST answered %s", got.Body, made.Body)
	}
	second := p.want(200, "PUT", one, body("second"), "If-Match", first).Header().Get("ETag")
	if w := p.want(412, "PUT", one, body("third"), "If-Match", first); decode[problem](t, w).Newest != 2 {
		t.Errorf("stale: %s", w.Body)
	}
	p.want(412, "PUT", one, body("third"), "If-Match", `"3"`)
	p.want(412, "PUT", one, body("third"), "If-Match", `"02"`)
	p.want(412, "PUT", one, body("third"), "If-Match", "W/"+second)
	p.want(428, "PUT", one, body("third"))
	inverter := `{"inverter": ` + keptPiece(t, record.KindInverter) + `}`
	if w := p.want(422, "PUT", one, inverter, "If-Match", second); !strings.Contains(w.Body.String(), `"pointer":"/inverter"`) {
		t.Errorf("a module becomes an inverter: %s", w.Body)
	}

	p.want(412, "DELETE", one, "", "If-Match", first)
	p.want(204, "DELETE", one, "", "If-Match", second)
	p.want(204, "DELETE", one, "", "If-Match", second)
	archived := p.want(200, "GET", one, "")
	if e := decode[apiKept](t, archived); e.ArchivedAt == nil || e.Note != "second" || archived.Header().Get("ETag") != `"2-archived"` {
		t.Errorf("archived: %s %s", archived.Header().Get("ETag"), archived.Body)
	}
	p.want(204, "DELETE", one, "", "If-Match", `"2-archived"`)
	p.want(412, "PUT", one, body("third"), "If-Match", second)
	p.want(204, "POST", one+"/restore", "")
	p.want(200, "PUT", one, body("third"), "If-Match", second)
	p.want(200, "PUT", one, body("fourth"), "If-Match", "*")
}

func TestAPIEquipment_Refusals(t *testing.T) {
	s, _ := savingServer(t, Config{})
	p := newProgram(t, s)
	module, inverter := keptPiece(t, record.KindModule), keptPiece(t, record.KindInverter)
	for _, c := range []struct {
		name, body string
		status     int
		pointers   []string
	}{
		{"nothing", ``, 400, []string{""}},
		{"half", `{"module": {`, 400, []string{""}},
		{"a list", `[]`, 422, []string{""}},
		{"neither", `{"note": "x"}`, 422, []string{""}},
		{"both", `{"module": ` + module + `, "inverter": ` + inverter + `}`, 422, []string{""}},
		{"a module twice", `{"module": ` + module + `, "module": ` + module + `}`, 422, []string{"/module"}},
		{"an unknown member", `{"module": ` + module + `, "kind/": "module"}`, 422, []string{"/kind~1"}},
		{"a text", `{"module": "x"}`, 422, []string{"/module"}},
		{"an inverter called a module", `{"inverter": {"model": "x"}}`, 422, []string{"/inverter/max_dc_voltage_v", "/inverter/trackers"}},
		{"a model that is blank", `{"module": ` + regexp.MustCompile(`"model":"[^"]*"`).ReplaceAllString(module, `"model":" "`) + `}`, 422, []string{"/module/model"}},
		{"an answer without its reason", `{"module": ` + module + `, "answers": [{"pointer": "/voc_v", "value_asked": 1}]}`, 422, []string{"/answers/0/reason"}},
		{"answers in an object", `{"module": ` + module + `, "answers": {}}`, 422, []string{"/answers"}},
		{"a note that is a number", `{"module": ` + module + `, "note": 3}`, 422, []string{"/note"}},
		{"a note that is null", `{"module": ` + module + `, "note": null}`, 422, []string{"/note"}},
		{"a source of no pointer", `{"module": ` + module + `, "sources": {"voc_v": "page 2"}}`, 422, []string{"/sources/voc_v"}},
		{"a source that is a number", `{"module": ` + module + `, "sources": {"/voc_v": 2}}`, 422, []string{"/sources/~1voc_v"}},
		{"sources in a list", `{"module": ` + module + `, "sources": []}`, 422, []string{"/sources"}},
		{"half a surrogate pair", `{"module": ` + module + `, "note": "\ud83d"}`, 400, []string{""}},
	} {
		t.Run(c.name, func(t *testing.T) {
			w := p.do("POST", "/api/v1/equipment", c.body)
			var pr struct {
				Errors []struct{ Pointer, Found, Expected, Detail string }
			}
			if err := json.Unmarshal(w.Body.Bytes(), &pr); err != nil {
				t.Fatalf("%v: %s", err, w.Body)
			}
			var pointers []string
			for _, e := range pr.Errors {
				pointers = append(pointers, e.Pointer)
				if e.Found == "" || e.Expected == "" || e.Detail == "" {
					t.Errorf("a reason says too little: %+v", e)
				}
			}
			slices.Sort(pointers)
			if w.Code != c.status || !slices.Equal(pointers, c.pointers) {
				t.Errorf("%d with errors at %q, want %d and %q: %s", w.Code, pointers, c.status, c.pointers, w.Body)
			}
		})
	}
}

func TestAPIEquipment_List(t *testing.T) {
	s, _ := savingServer(t, Config{})
	p := newProgram(t, s)
	named := func(kind record.Kind, model string) string {
		var piece map[string]any
		if err := json.Unmarshal([]byte(keptPiece(t, kind)), &piece); err != nil {
			t.Fatal(err)
		}
		piece["maker"], piece["model"] = "Sedge Demo (invented)", model
		text, err := json.Marshal(map[string]any{string(kind): piece})
		if err != nil {
			t.Fatal(err)
		}
		return string(text)
	}
	for i := range 4 {
		p.want(201, "POST", "/api/v1/equipment", named(record.KindModule, fmt.Sprint("SD-40", i)))
	}
	p.want(201, "POST", "/api/v1/equipment", named(record.KindInverter, "SI-8"))
	type list struct {
		Equipment []struct {
			Kind             string
			Module, Inverter struct{ Model string }
		}
		Total int
		Next  string
	}
	for _, c := range []struct {
		query string
		want  []string
	}{
		{"", []string{"SD-400", "SD-401", "SD-402", "SD-403", "SI-8"}},
		{"?kind=inverter", []string{"SI-8"}},
		{"?kind=module&reversed=true&limit=2", []string{"SD-403", "SD-402", "SD-401", "SD-400"}},
		{"?q=sedge+si8", []string{"SI-8"}},
		{"?archived=true", nil},
		{"?sort=updated", []string{"SI-8", "SD-403", "SD-402", "SD-401", "SD-400"}},
	} {
		var got []string
		for target := "/api/v1/equipment" + c.query; target != ""; {
			page := decode[list](t, p.want(200, "GET", target, ""))
			for _, e := range page.Equipment {
				got = append(got, e.Module.Model+e.Inverter.Model)
			}
			if page.Total != len(c.want) {
				t.Errorf("%q: total %d, want %d", target, page.Total, len(c.want))
			}
			target = page.Next
		}
		if !slices.Equal(got, c.want) {
			t.Errorf("%q: %q, want %q", c.query, got, c.want)
		}
	}
	for _, query := range []string{"kind=battery", "sort=title", "verdict=within", "limit=-1"} {
		p.want(400, "GET", "/api/v1/equipment?"+query, "")
	}
}
