package server

import (
	"bytes"
	"fmt"
	"maps"
	"net/http"
	"net/url"
	"slices"
	"strings"
	"testing"

	"golang.org/x/net/html"
	"golang.org/x/net/html/atom"

	"rimeline/server/form"
	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/sizing/design"
)

// datasheet is the module of the example, as it is typed from its datasheet.
var datasheet = map[string]string{
	"/modules/0/maker": "Tamarack Demo Works (invented)", "/modules/0/model": "TD-410M", "/modules/0/technology": "mono-si",
	"/modules/0/pmax_w": "410", "/modules/0/voc_v": "37,32", "/modules/0/isc_a": "13.95 A", "/modules/0/vmp_v": "31.26", "/modules/0/imp_a": "13.12",
	"/modules/0/voc_temp_coeff/value": "−0.27", "/modules/0/voc_temp_coeff/unit": "%/°C", "/modules/0/max_system_voltage_v": "1000",
	"/sources/~1modules~10": "TD series, rev. C", "/sources/~1modules~10~1voc_v": "p. 2, table 1", "note": "as delivered",
}

// limits is an inverter as it is typed from its manual.
var limits = map[string]string{
	"/inverters/0/maker": "Quillback Demo Power (invented)", "/inverters/0/model": "QP-12K", "/inverters/0/max_dc_voltage_v": "1000",
	"/inverters/0/trackers/0/mppt_min_v": "160", "/inverters/0/trackers/0/mppt_max_v": "850", "/inverters/0/trackers/0/inputs": "2",
	"/inverters/0/trackers/0/max_input_current_a": "26", "/inverters/0/trackers/0/max_short_circuit_current_a": "40",
	"/sources/~1inverters~10~1trackers~10~1inputs": "p. 9",
}

// with returns fields with some typed anew.
func with(fields url.Values, typed ...map[string]string) url.Values {
	fields = maps.Clone(fields)
	for _, t := range typed {
		for name, s := range t {
			fields.Set(name, s)
		}
	}
	return fields
}

// typedPiece is the form of a new piece with what is typed.
func typedPiece(t *testing.T, h http.Handler, kind string, typed ...map[string]string) url.Values {
	t.Helper()
	return with(get(t, h, "/equipment/new?kind="+kind, http.StatusOK).fields("piece"), typed...)
}

// keep keeps a piece and returns the path of its page.
func keep(t *testing.T, h http.Handler, kind string, typed ...map[string]string) string {
	t.Helper()
	path, query, _ := strings.Cut(goTo(t, h, "/equipment", typedPiece(t, h, kind, typed...)), "?")
	if query != "kept=1" {
		t.Fatalf("keeping it leads to %s?%s", path, query)
	}
	return path
}

// rows are the cells of the page's tables.
func (p page) rows() (rows [][]string) {
	for _, tr := range p.all(func(n *html.Node) bool { return n.DataAtom == atom.Tr }) {
		var cells []string
		for c := range tr.ChildNodes() {
			if c.DataAtom == atom.Td || c.DataAtom == atom.Th {
				cells = append(cells, text(c))
			}
		}
		rows = append(rows, cells)
	}
	return rows
}

func equipmentID(path string) record.ID { return record.ID(strings.TrimPrefix(path, "/equipment/")) }

// kept returns what is kept at a path.
func kept(t *testing.T, s *store.Store, path string) record.Equipment {
	t.Helper()
	e, err := s.Equipment(t.Context(), equipmentID(path))
	if err != nil {
		t.Fatal(err)
	}
	return e
}

func TestEquipment_Keep(t *testing.T) {
	t.Parallel()
	s, saved := savingServer(t, Config{})
	empty := get(t, s, "/equipment/new?kind=module", http.StatusOK)
	empty.sound()
	path := keep(t, s, "module", datasheet)
	e := kept(t, saved, path)
	want := `{"maker":"Tamarack Demo Works (invented)","model":"TD-410M","technology":"mono-si","pmax_w":410,"voc_v":37.32,"isc_a":13.95,"vmp_v":31.26,"imp_a":13.12,` +
		`"voc_temp_coeff":{"value":-0.27,"unit":"%/°C"},"max_system_voltage_v":1000}`
	if string(e.Document) != want || e.Kind != record.KindModule || e.Maker != "Tamarack Demo Works (invented)" || e.Model != "TD-410M" || e.Note != "as delivered" {
		t.Errorf("kept is %+v: %s", e, e.Document)
	}
	if want := map[string]string{"": "TD series, rev. C", "/voc_v": "p. 2, table 1"}; !maps.Equal(e.Sources, want) {
		t.Errorf("sources %q, want %q", e.Sources, want)
	}
	p := get(t, s, path+"?kept=1", http.StatusOK)
	p.sound()
	p.says("It is kept, and offered in every design.", "TD-410M, Tamarack Demo Works (invented)", "No saved design uses it.")
	if got := attr(p.named("/sources/~1modules~10~1voc_v"), "value"); got != "p. 2, table 1" {
		t.Errorf("where Voc stands: %q", got)
	}
	// What the page sends back unchanged is the same.
	to := goTo(t, s, path, p.fields("piece"))
	if again := kept(t, saved, path); to != path+"?kept=2" || string(again.Document) != want || !maps.Equal(again.Sources, e.Sources) {
		t.Errorf("kept again (%s): %s", to, again.Document)
	}
}

// TestEquipment_Inverter: trackers are added, copied and removed as in a design.
func TestEquipment_Inverter(t *testing.T) {
	t.Parallel()
	s, saved := savingServer(t, Config{})
	v := typedPiece(t, s, "inverter", limits)
	for _, do := range []string{"add /inverters/0/trackers", "copy /inverters/0/trackers/1", "add /inverters/0/trackers", "remove /inverters/0/trackers/2"} {
		v = with(v, map[string]string{"do": do})
		p := post(t, s, "/equipment", v, http.StatusOK)
		p.sound()
		v = p.fields("piece")
		v.Del("do")
	}
	path, _, _ := strings.Cut(goTo(t, s, "/equipment", with(v, map[string]string{"/inverters/0/trackers/1/inputs": "1"})), "?")
	e := kept(t, saved, path)
	inverter, faults := design.ReadInverter(e.Document)
	if faults != nil || len(inverter.Trackers) != 2 || inverter.Trackers[0].Inputs != 2 || inverter.Trackers[1].Inputs != 1 || inverter.Trackers[1].ID != "t2" || inverter.Quantity != 1 {
		t.Errorf("%v: %s", faults, e.Document)
	}
	if want := map[string]string{"/trackers/0/inputs": "p. 9"}; !maps.Equal(e.Sources, want) {
		t.Errorf("sources %q, want %q", e.Sources, want)
	}
	get(t, s, path, http.StatusOK).sound()
}

// TestEquipment_Refused: nothing is kept, every fault is told, and all that was typed
// stands there.
func TestEquipment_Refused(t *testing.T) {
	t.Parallel()
	s, saved := savingServer(t, Config{})
	v := typedPiece(t, s, "module", datasheet, map[string]string{"/modules/0/model": " ", "/modules/0/voc_v": "3O", "/modules/0/voc_temp_coeff/unit": "", "/modules/0/imp_a": "14"})
	p := post(t, s, "/equipment", v, http.StatusUnprocessableEntity)
	p.sound()
	p.says("4 things keep this from being kept", "Enter the model", "Voc: “3O”", "Choose the unit of “−0.27”", "Isc must be above Imp")
	for name := range v {
		if got, want := p.fields("piece").Get(name), v.Get(name); got != want {
			t.Errorf("%s was %q and comes back as %q", name, want, got)
		}
	}
	for _, field := range []string{"/modules/0/model", "/modules/0/voc_v", "/modules/0/isc_a"} {
		if attr(p.named(field), "aria-invalid") != "true" {
			t.Errorf("%s is not marked", field)
		}
	}
	p = post(t, s, "/equipment", typedPiece(t, s, "inverter"), http.StatusUnprocessableEntity)
	p.sound()
	p.says("Tracker 1: ")
	if page, err := saved.EquipmentList(t.Context(), record.EquipmentListing{}); err != nil || page.Total != 0 {
		t.Errorf("%d are kept, %v", page.Total, err)
	}
}

// TestEquipment_Questions: a value that looks like a slip is asked about; its reason is
// kept, and goes into every design with it.
func TestEquipment_Questions(t *testing.T) {
	t.Parallel()
	s, saved := savingServer(t, Config{})
	path := keep(t, s, "module", datasheet, map[string]string{"/modules/0/pmax_w": "390"})
	p := get(t, s, path+"?kept=1", http.StatusOK)
	p.sound()
	p.says("One value looks like a slip", "Are Pmax, Vmp and Imp from the same column and row of the datasheet?")
	goTo(t, s, path, with(p.fields("piece"), map[string]string{"/answers/0/reason": "sold as 390 by contract"}))
	e := kept(t, saved, path)
	if len(e.Answers) != 1 || e.Answers[0] != (design.Answer{Pointer: "/pmax_w", ValueAsked: `{"imp_a":13.12,"pmax_w":390,"vmp_v":31.26}`, Reason: "sold as 390 by contract"}) {
		t.Errorf("answers: %+v", e.Answers)
	}
	p = get(t, s, path+"?kept=2", http.StatusOK)
	p.sound()
	if said := text(p.root); strings.Contains(said, "Are Pmax, Vmp") || strings.Contains(said, "slip") {
		t.Errorf("it is still asked: %s", said)
	}
	goTo(t, s, path, p.fields("piece"))
	if again := kept(t, saved, path); len(again.Answers) != 1 {
		t.Errorf("kept again, the answers are %+v", again.Answers)
	}
	picked := post(t, s, "/design", exampleFields(t, s, map[string]string{"do": "pick /modules/0", "pick:/modules/0": string(e.ID)}), http.StatusOK)
	if picked.sound(); strings.Contains(text(picked.root), "Are Pmax, Vmp") {
		t.Error("a design that picks it asks again")
	}
}

// TestEquipment_TwoEditors: the second sees both versions field by field, loses
// nothing, and may take over what the first changed.
func TestEquipment_TwoEditors(t *testing.T) {
	t.Parallel()
	s, saved := savingServer(t, Config{})
	path := keep(t, s, "module", datasheet)
	mine, theirs := get(t, s, path, http.StatusOK).fields("piece"), get(t, s, path, http.StatusOK).fields("piece")
	goTo(t, s, path, with(theirs, map[string]string{"/modules/0/voc_v": "37.4", "/modules/0/isc_a": "13.950", "/sources/~1modules~10~1isc_a": "p. 3", "note": "theirs"}))
	mine = with(mine, map[string]string{"/modules/0/voc_v": "37.35", "/modules/0/max_series_fuse_a": "30", "note": "mine"})
	p := post(t, s, path, mine, http.StatusConflict)
	p.sound()
	p.says("Someone kept another version meanwhile", "kept version 2")
	var differ []string
	for _, row := range p.rows()[1:] {
		differ = append(differ, strings.Join(row[:3], "|"))
	}
	want := []string{"Voc|37.4 V|37.35 V", "Where on the datasheet: Isc|p. 3|–", "Max. series fuse|–|30 A", "Note|theirs|mine"}
	if !slices.Equal(differ, want) {
		t.Errorf("beside each other stand %q, want %q", differ, want)
	}
	v := p.fields("piece")
	for name := range mine {
		if got, want := v.Get(name), mine.Get(name); got != want && name != "version" && name != "request" {
			t.Errorf("%s was %q and comes back as %q", name, want, got)
		}
	}
	v = post(t, s, path, with(v, map[string]string{"do": "theirs /modules/0/voc_v"}), http.StatusOK).fields("piece")
	v.Del("do")
	v = post(t, s, path, with(v, map[string]string{"do": "theirs note"}), http.StatusOK).fields("piece")
	v.Del("do")
	v = post(t, s, path, with(v, map[string]string{"do": "theirs /sources/~1modules~10~1isc_a"}), http.StatusOK).fields("piece")
	v.Del("do")
	if to := goTo(t, s, path, v); to != path+"?kept=3" {
		t.Errorf("keeping it leads to %s", to)
	}
	e := kept(t, saved, path)
	m, faults := design.ReadModule(e.Document)
	if faults != nil || m.VocV.String() != "37.4" || m.MaxSeriesFuseA == nil || m.MaxSeriesFuseA.String() != "30" || e.Note != "theirs" || e.Sources["/isc_a"] != "p. 3" {
		t.Errorf("version 3: %v %s, %q, %q", faults, e.Document, e.Note, e.Sources)
	}
}

// TestEquipment_Names: one maker and model is kept once; a repeated request makes
// nothing new.
func TestEquipment_Names(t *testing.T) {
	t.Parallel()
	s, saved := savingServer(t, Config{})
	v := typedPiece(t, s, "module", datasheet)
	if first, second := goTo(t, s, "/equipment", v), send(t, s, "/equipment", v); second.Code != http.StatusUnprocessableEntity && second.Header().Get("Location") != first {
		t.Errorf("sent twice: %d %s, want %s", second.Code, second.Header().Get("Location"), first)
	}
	p := post(t, s, "/equipment", typedPiece(t, s, "module", datasheet, map[string]string{"/modules/0/maker": "TAMARACK  Demo Works (invented)", "/modules/0/model": "td-410m"}), http.StatusUnprocessableEntity)
	p.sound()
	p.says("is kept already")
	keep(t, s, "inverter", limits, map[string]string{"/inverters/0/maker": "Tamarack Demo Works (invented)", "/inverters/0/model": "TD-410M"})
	if page, err := saved.EquipmentList(t.Context(), record.EquipmentListing{}); err != nil || page.Total != 2 {
		t.Errorf("%d are kept, %v, want a module and an inverter", page.Total, err)
	}
}

// TestEquipment_Duplicate: the copy waits for its own name and power, and says what
// is still the other's. Nothing is kept before.
func TestEquipment_Duplicate(t *testing.T) {
	t.Parallel()
	s, saved := savingServer(t, Config{})
	path := keep(t, s, "module", datasheet, map[string]string{"/modules/0/pmax_w": "390"})
	typed := with(get(t, s, path, http.StatusOK).fields("piece"), map[string]string{"/modules/0/isc_a": "14", "/answers/0/reason": "of the other"})
	for from, sent := range map[string]url.Values{"its form": typed, "the list": {}} {
		p := post(t, s, path+"/duplicate", sent, http.StatusOK)
		p.sound()
		p.says("The values are those of TD-410M", "Still that of TD-410M.", "not kept yet")
		v := p.fields("piece")
		for name, want := range map[string]string{"/modules/0/model": "", "/modules/0/pmax_w": "", "/modules/0/voc_v": "37.32", "/sources/~1modules~10": "TD series, rev. C", "version": "0", "/answers/0/reason": ""} {
			if got := v.Get(name); got != want {
				t.Errorf("from %s: %s = %q, want %q", from, name, got, want)
			}
		}
		if want := map[string]string{"its form": "14", "the list": "13.95"}[from]; v.Get("/modules/0/isc_a") != want {
			t.Errorf("from %s: Isc %q, want %q", from, v.Get("/modules/0/isc_a"), want)
		}
		again := post(t, s, "/equipment", with(v, map[string]string{"/modules/0/voc_v": "37.9"}), http.StatusUnprocessableEntity)
		again.sound()
		if n := strings.Count(text(again.root), "Still that of TD-410M."); n != 3 { // Isc, Vmp and Imp
			t.Errorf("from %s: %d values are marked, want 3", from, n)
		}
	}
	v := post(t, s, path+"/duplicate", typed, http.StatusOK).fields("piece")
	goTo(t, s, "/equipment", with(v, map[string]string{"/modules/0/model": "TD-420M", "/modules/0/pmax_w": "410"}))
	if page, err := saved.EquipmentList(t.Context(), record.EquipmentListing{}); err != nil || page.Total != 2 {
		t.Errorf("%d are kept, %v, want 2", page.Total, err)
	}
	if e := kept(t, saved, path); e.Version != 1 {
		t.Errorf("the original is version %d", e.Version)
	}
}

func TestEquipment_Archive(t *testing.T) {
	t.Parallel()
	s, _ := savingServer(t, Config{})
	path := keep(t, s, "module", datasheet)
	v := get(t, s, path, http.StatusOK).fields("piece")
	p := post(t, s, path+"/archive", with(v, map[string]string{"/modules/0/voc_v": "40"}), http.StatusConflict)
	p.sound()
	p.says("Not archived: the form holds changes")
	if got := attr(p.named("/modules/0/voc_v"), "value"); got != "40" {
		t.Errorf("what was typed is %q", got)
	}
	to := goTo(t, s, path+"/archive", v)
	p = get(t, s, to, http.StatusOK)
	p.sound()
	p.says("“TD-410M” is archived", "Restore it", "No module is kept yet")
	if strings.Contains(text(get(t, s, "/design", http.StatusOK).root), "TD-410M") {
		t.Error("what is archived is offered in a design")
	}
	p = get(t, s, "/equipment?archived=yes", http.StatusOK)
	p.sound()
	p.says("1 module", "TD-410M")
	p = get(t, s, path, http.StatusOK)
	p.sound()
	p.says("This is archived")
	to = goTo(t, s, path+"/restore", url.Values{"back": {"archived=yes"}})
	if p := get(t, s, to, http.StatusOK); !strings.Contains(to, "archived=yes") {
		t.Errorf("restored from the list of what is archived, it leads to %s", to)
	} else {
		p.says("“TD-410M” is restored")
	}
	get(t, s, "/design", http.StatusOK).says("TD-410M, Tamarack Demo Works (invented)")
}

// TestEquipment_List: figures, uses, search and pages.
func TestEquipment_List(t *testing.T) {
	t.Parallel()
	s, saved := savingServer(t, Config{})
	p := get(t, s, "/equipment", http.StatusOK)
	p.sound()
	p.says("No module is kept yet")
	path := keep(t, s, "module", datasheet)
	e := kept(t, saved, path)
	for n := range 60 {
		other := e
		other.ID, other.Version, other.Model = "", 0, fmt.Sprintf("TD-%d", 500+n)
		if _, err := saved.SaveEquipment(t.Context(), record.Nobody, other, ""); err != nil {
			t.Fatal(err)
		}
	}
	keep(t, s, "inverter", limits)
	title := saveExample(t, s, map[string]string{"/title": "Harrow barn"})
	p = get(t, s, "/equipment", http.StatusOK)
	p.sound()
	p.says("61 modules, 50 on this page")
	first := "TD-410M|Tamarack Demo Works (invented)|Pmax 410 W|Voc 37.32 V|Isc 13.95 A|Voc coefficient −0.27 %/°C|Max. system voltage 1000 V|in 1 design|just now"
	if got := strings.Join(p.rows()[1][:9], "|"); got != first {
		t.Errorf("the first row is %q, want %q", got, first)
	}
	next := p.all(func(n *html.Node) bool { return attr(n, "rel") == "next" })
	if len(next) != 1 {
		t.Fatal("no next page")
	}
	second := get(t, s, attr(next[0], "href"), http.StatusOK)
	if rows := second.rows(); len(rows) != 12 { // with the head
		t.Errorf("%d rows on the second page, want 12", len(rows))
	}
	p = get(t, s, "/equipment?q=td-41", http.StatusOK)
	p.says("1 module")
	if strings.Contains(text(p.root), "TD-510") {
		t.Error("the search finds what it should not")
	}
	p = get(t, s, "/equipment?kind=inverter", http.StatusOK)
	p.sound()
	p.says("1 inverter", "160 to 850 V", "1 × 2", "40 A")
	get(t, s, "/equipment?q=nothing&kind=inverter", http.StatusOK).says("No inverter in use matches")
	get(t, s, "/equipment?at=broken", http.StatusSeeOther)
	p = get(t, s, path, http.StatusOK)
	p.sound()
	p.says("One design uses this maker and model.", "Harrow barn", "revision 1")
	if len(p.all(func(n *html.Node) bool { return attr(n, "href") == title })) != 1 {
		t.Errorf("no link to %s", title)
	}
}

// TestEquipment_Away: without a database the form works, nothing is kept, and nothing
// typed is lost.
func TestEquipment_Away(t *testing.T) {
	t.Parallel()
	s, saved := savingServer(t, Config{})
	path := keep(t, s, "module", datasheet)
	v := get(t, s, path, http.StatusOK).fields("piece")
	saved.Close()
	none, _ := testServer(Config{})
	for name, h := range map[string]http.Handler{"gone": s, "none": none} {
		get(t, h, "/equipment", http.StatusServiceUnavailable)
		get(t, h, path, http.StatusServiceUnavailable)
		get(t, h, "/equipment/new?kind=inverter", http.StatusOK).sound()
		for at, sent := range map[string]url.Values{"/equipment": typedPiece(t, h, "module", datasheet), path: v} {
			w := send(t, h, at, sent)
			p := read(t, w, http.StatusServiceUnavailable)
			p.sound()
			p.says("Everything that you typed stands below.")
			if w.Header().Get("Retry-After") == "" {
				t.Errorf("%s, %s: no Retry-After", name, at)
			}
			back := p.fields("piece")
			for field := range sent {
				if back.Get(field) != sent.Get(field) {
					t.Errorf("%s, %s: %s was %q and comes back as %q", name, at, field, sent.Get(field), back.Get(field))
				}
			}
		}
		p := get(t, h, "/design", http.StatusOK)
		if p.sound(); strings.Contains(text(p.root), "Take from the equipment kept here") {
			t.Errorf("%s: a design is offered what cannot be had", name)
		}
	}
}

// TestEquipment_Strange: what no page of ours sends changes nothing.
func TestEquipment_Strange(t *testing.T) {
	t.Parallel()
	s, saved := savingServer(t, Config{})
	path := keep(t, s, "module", datasheet)
	for _, c := range []struct {
		path   string
		fields url.Values
		status int
	}{
		{"/equipment", url.Values{}, 422},
		{"/equipment", url.Values{"kind": {"battery"}}, 422},
		{"/equipment/nowhere", typedPiece(t, s, "module", datasheet, map[string]string{"/modules/0/model": "X"}), 404},
		{path, typedPiece(t, s, "inverter", limits), 400},
		{path, url.Values{"do": {"theirs /modules/0/voc_v"}}, 200},
		{path, url.Values{"do": {"add /planes"}}, 200}, // of the form, not of the piece
		{path, url.Values{"do": {"explode"}}, 400},
		{"/equipment/nowhere/archive", url.Values{}, 404},
		{"/equipment/nowhere/restore", url.Values{}, 404},
		{"/equipment/nowhere/duplicate", url.Values{}, 404},
	} {
		if w := send(t, s, c.path, c.fields); w.Code != c.status {
			t.Errorf("%s %v: %d, want %d", c.path, c.fields, w.Code, c.status)
		}
	}
	get(t, s, "/equipment/nowhere", http.StatusNotFound)
	if e := kept(t, saved, path); e.Version != 1 || e.Kind != record.KindModule {
		t.Errorf("it is now %+v", e)
	}
}

// TestKept_IntoADesign: kept equipment is copied by value with its sources, and what a
// design has is kept once.
func TestKept_IntoADesign(t *testing.T) {
	t.Parallel()
	s, saved := savingServer(t, Config{})
	m := keep(t, s, "module", datasheet, map[string]string{"/modules/0/model": "TD-430M", "/modules/0/pmax_w": "415"})
	v := exampleFields(t, s, map[string]string{"do": "pick /modules/0", "pick:/modules/0": string(equipmentID(m)), "note": "kept along"})
	p := post(t, s, "/design", v, http.StatusOK)
	p.sound()
	p.says("Copied, with where its values stand on the datasheet.")
	now := p.fields("design")
	for name, want := range map[string]string{
		"/modules/0/model": "TD-430M", "/modules/0/pmax_w": "415", "/modules/0/id": "m1", "/modules/0/noct_c/value": "", "/planes/1/module": "m1",
		"/sources/~1modules~10": "TD series, rev. C", "/sources/~1modules~10~1voc_v": "p. 2, table 1", "note": "kept along", "draft": v.Get("draft"),
	} {
		if got := now.Get(name); got != want {
			t.Errorf("%s = %q, want %q", name, got, want)
		}
	}
	if label := p.all(func(n *html.Node) bool {
		return n.DataAtom == atom.Label && attr(n, "for") == "f-sources-_1modules_10_1voc_v"
	}); len(label) != 1 || text(label[0]) != "Where: Voc" {
		t.Errorf("the source of Voc has no field of its own: %v", label)
	}
	now.Set("do", "pick /modules/0")
	now.Del("pick:/modules/0")
	post(t, s, "/design", now, http.StatusOK).says("Choose from the list what to take.")
	// A later change of what is kept changes no design.
	goTo(t, s, m, with(get(t, s, m, http.StatusOK).fields("piece"), map[string]string{"/modules/0/pmax_w": "416"}))
	if got := post(t, s, "/design", with(now, map[string]string{"do": "show"}), http.StatusOK).fields("design").Get("/modules/0/pmax_w"); got != "415" {
		t.Errorf("Pmax in the design is %s", got)
	}

	for _, c := range []struct {
		typed  map[string]string
		status int
		says   string
		total  int
	}{
		{map[string]string{"do": "keep /inverters/0", "/inverters/0/quantity": "4"}, 200, "It is kept: QP-12K, Quillback Demo Power (invented)", 2},
		{map[string]string{"do": "keep /inverters/0"}, 200, "It is kept already, with the same values:", 2},
		{map[string]string{"do": "keep /inverters/0", "/inverters/0/start_voltage_v": "200"}, 200, "It is kept already, with other values. Nothing was changed there:", 2},
		{map[string]string{"do": "keep /modules/0"}, 200, "with other values", 2},
		{map[string]string{"do": "keep /modules/0", "/modules/0/model": "TD-431M"}, 200, "It is kept: TD-431M", 3},
		{map[string]string{"do": "keep /modules/0", "/modules/0/model": "", "/modules/0/isc_a": "x", "/title": "", "/rulebook": ""}, 422, "This cannot be kept as it is", 3},
		{map[string]string{"do": "keep /modules/7"}, 400, "", 3},
		{map[string]string{"do": "keep /planes/0"}, 400, "", 3},
		{map[string]string{"do": "pick /modules/0", "pick:/modules/0": "nowhere"}, 400, "", 3},
	} {
		sent := with(now, c.typed)
		p := post(t, s, "/design", sent, c.status)
		p.sound()
		p.says(c.says)
		if page, err := saved.EquipmentList(t.Context(), record.EquipmentListing{}); err != nil || page.Total != c.total {
			t.Errorf("%v: %d are kept, %v, want %d", c.typed, page.Total, err, c.total)
		}
		if c.status == 422 {
			if n := len(p.all(func(n *html.Node) bool { return attr(n, "aria-invalid") == "true" })); n != 2 {
				t.Errorf("%d fields are marked, want those two that keep the module from being kept", n)
			}
		}
	}
	kept, err := saved.EquipmentList(t.Context(), record.EquipmentListing{Words: "TD-431M"})
	if err != nil || len(kept.Equipment) != 1 || kept.Equipment[0].Sources["/voc_v"] != "p. 2, table 1" {
		t.Errorf("%v: sources are not kept: %+v", err, kept.Equipment)
	}
}

// TestKept_FirstOfADesign: a design can begin with what is kept.
func TestKept_FirstOfADesign(t *testing.T) {
	t.Parallel()
	s, _ := savingServer(t, Config{})
	path := keep(t, s, "inverter", limits)
	p := get(t, s, "/design?equipment="+string(equipmentID(path)), http.StatusOK)
	p.sound()
	if got := p.fields("design"); got.Get("/inverters/0/model") != "QP-12K" || got.Get("/inverters/0/quantity") != "1" || has(p.id("design"), "data-fresh") {
		t.Errorf("the form begins with %q", got.Get("/inverters/0/model"))
	}
	get(t, s, "/design?equipment=nowhere", http.StatusNotFound)
}

// TestKept_GoneMidway: the database goes away while somebody picks and keeps; the form
// comes back whole.
func TestKept_GoneMidway(t *testing.T) {
	t.Parallel()
	s, saved := savingServer(t, Config{})
	path := keep(t, s, "module", datasheet)
	v := exampleFields(t, s, map[string]string{"pick:/modules/0": string(equipmentID(path))})
	saved.Close()
	for _, do := range []string{"pick /modules/0", "keep /modules/0"} {
		w := send(t, s, "/design", with(v, map[string]string{"do": do}))
		p := read(t, w, http.StatusServiceUnavailable)
		p.sound()
		p.says("Everything that you typed stands in the form.")
		back := p.fields("design")
		for name := range v {
			if strings.HasPrefix(name, "/") && back.Get(name) != v.Get(name) {
				t.Errorf("%s: %s was %q and comes back as %q", do, name, v.Get(name), back.Get(name))
			}
		}
	}
}

// TestEquipment_Hostile: texts that a page must not take for its own.
func TestEquipment_Hostile(t *testing.T) {
	t.Parallel()
	s, _ := savingServer(t, Config{})
	const text = `"><script>alert(1)</script>&amp;'`
	path := keep(t, s, "module", datasheet, map[string]string{
		"/modules/0/model": text, "/modules/0/maker": text, "note": text, form.SourceName("/modules/0/voc_v"): text,
	})
	for _, at := range []string{path, "/equipment", "/design"} {
		w := ask(t, s, http.MethodGet, at, "")
		if bytes.Contains(w.Body.Bytes(), []byte("<script>")) {
			t.Errorf("%s holds the script", at)
		}
		read(t, w, http.StatusOK).sound()
	}
}
