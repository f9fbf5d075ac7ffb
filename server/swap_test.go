package server

import (
	"net/http"
	"strings"
	"testing"

	"golang.org/x/net/html"
)

// turned are the rows of the tables of verdicts that turn.
func (p page) turned() (rows []string) {
	for _, row := range p.rows() {
		if len(row) == 3 {
			rows = append(rows, strings.Join(row, "|"))
		}
	}
	return rows
}

// row reports whether a table of the page has a row that begins with these cells.
func (p page) row(cells ...string) bool {
	for _, row := range p.rows() {
		if len(row) >= len(cells) && strings.Join(row[:len(cells)], "|") == strings.Join(cells, "|") {
			return true
		}
	}
	return false
}

func TestSwap_Temperature(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{}) // nothing of it needs a database
	v := exampleFields(t, s, map[string]string{"/strings/0/modules_in_series": "23", "/strings/0/strings_in_parallel": "1"})
	p := post(t, s, "/design/swap", v, http.StatusOK)
	p.sound()
	if p.id("compared") != nil {
		t.Error("something is compared before anything is chosen")
	}
	v = p.fields("carried")
	for _, name := range []string{"/modules/0/voc_v", "draft", "request", "/strings/0/modules_in_series"} {
		if v.Get(name) == "" {
			t.Errorf("%s is not carried along", name)
		}
	}
	p = post(t, s, "/design/swap", v, http.StatusOK)
	if p.id("compared") != nil {
		t.Error("something is compared though nothing was typed anew")
	}
	p = post(t, s, "/design/swap", with(v, map[string]string{"typed:/site/coldest_c/value": "−40"}), http.StatusOK)
	p.sound()
	p.says("What gets worse")
	// 23 modules meet 1000 V at −36.1 °C, which the example's answer says.
	if turned := strings.Join(p.turned(), "\n"); !strings.Contains(turned, "Cold voltage 23 in series, south plane, tracker t1|within965.0 V open-circuit") || !strings.Contains(turned, "|outside") {
		t.Errorf("the cold voltage does not turn:\n%s", turned)
	}
	if !p.row("Coldest temperature", "−21 °C (−5.8 °F)", "−40 °C (−40.0 °F)", "−19 °C") {
		t.Errorf("the input is not compared: %q", p.rows())
	}
	if at := strings.Index(text(p.root), "What was put in"); at < strings.Index(text(p.root), "What gets worse") || at > strings.Index(text(p.root), "What comes out") {
		t.Error("the order is not verdicts, inputs, results")
	}
	took := post(t, s, "/design/swap", with(p.fields("carried"), map[string]string{"do": "take"}), http.StatusOK)
	took.sound()
	now := took.fields("design")
	if now.Get("/site/coldest_c/value") != "−40" || now.Get("/site/coldest_c/unit") != "°C" || now.Get("/modules/0/voc_v") != v.Get("/modules/0/voc_v") {
		t.Errorf("taken over, the coldest is %s %s", now.Get("/site/coldest_c/value"), now.Get("/site/coldest_c/unit"))
	}
	for _, name := range []string{"draft", "request", "design", "base"} {
		if now.Get(name) != v.Get(name) {
			t.Errorf("%s was %q and is %q", name, v.Get(name), now.Get(name))
		}
	}
	if took.verdict() != "outside" {
		t.Errorf("the answer is %s", took.verdict())
	}
}

// TestSwap_PowerClass: typed values of another power class; what was said of where
// the old ones stand is not said of them.
func TestSwap_PowerClass(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	v := exampleFields(t, s, map[string]string{"/sources/~1modules~10": "rev. C", "/sources/~1modules~10~1voc_v": "column 410", "/sources/~1modules~10~1isc_a": "column 410"})
	v = post(t, s, "/design/swap", v, http.StatusOK).fields("carried")
	v = with(v, map[string]string{"typed:/modules/0/voc_v": "37,9", "typed:/modules/0/pmax_w": "420", "typed:/modules/0/model": "TD-420M",
		"typed:/modules/0/vmp_v": "31.7", "typed:/modules/0/imp_a": "13.25", "typed:/planes/0/positions": "99"})
	p := post(t, s, "/design/swap", v, http.StatusOK)
	p.sound()
	for _, row := range [][]string{{"Model", "TD-410M", "TD-420M"}, {"Voc", "37.32 V", "37.9 V", "+0.58 V (+1.6 %)"}, {"Voc", "column 410", "–"}} {
		if !p.row(row...) {
			t.Errorf("no row %q", row)
		}
	}
	now := post(t, s, "/design/swap", with(v, map[string]string{"do": "take"}), http.StatusOK).fields("design")
	for name, want := range map[string]string{
		"/modules/0/voc_v": "37,9", "/modules/0/isc_a": "13.95", "/sources/~1modules~10": "rev. C", "/sources/~1modules~10~1voc_v": "",
		"/sources/~1modules~10~1isc_a": "column 410", "/planes/0/positions": "24", // not a thing to be swapped
	} {
		if got := now.Get(name); got != want {
			t.Errorf("%s = %q, want %q", name, got, want)
		}
	}
	p = post(t, s, "/design/swap", with(v, map[string]string{"typed:/modules/0/voc_v": "30"}), http.StatusUnprocessableEntity)
	p.sound()
	p.says("With this change the design is not complete", "Voc must be above Vmp")
	if attr(p.named("typed:/modules/0/voc_v"), "value") != "30" {
		t.Error("what was typed is gone")
	}
}

func TestSwap_Kept(t *testing.T) {
	t.Parallel()
	s, _ := savingServer(t, Config{})
	m := keep(t, s, "module", datasheet, map[string]string{"/modules/0/model": "TD-9", "/modules/0/voc_v": "37.9"})
	i := keep(t, s, "inverter", limits, map[string]string{"/inverters/0/model": "QP-6K", "/inverters/0/max_dc_voltage_v": "600"})
	v := exampleFields(t, s, map[string]string{"/strings/1/tracker": "t1", "/strings/1/strings_in_parallel": "1", "/strings/0/strings_in_parallel": "1"})
	p := post(t, s, "/design/swap", v, http.StatusOK)
	p.sound()
	v = p.fields("carried")
	p = post(t, s, "/design/swap", with(v, map[string]string{
		"put:/modules/0": string(equipmentID(m)), "put:/inverters/0": string(equipmentID(i)), "typed:/modules/0/voc_v": "40",
	}), http.StatusOK)
	p.sound()
	for _, row := range [][]string{
		{"Model", "TD-410M", "TD-9"}, {"Voc", "37.32 V", "37.9 V"}, {"Model", "QP-12K", "QP-6K"}, {"Maximum DC voltage", "1000 V", "600 V", "−400 V (−40.0 %)"},
		{"Module TD-9", "–", "TD series, rev. C"}, {"Most modules in series", "23", "14", "−9"},
	} {
		if !p.row(row...) {
			t.Errorf("no row %q in %q", row, p.rows())
		}
	}
	if attr(p.named("typed:/modules/0/voc_v"), "value") != "40" {
		t.Error("what was typed beside is gone")
	}
	now := post(t, s, "/design/swap", with(p.fields("carried"), map[string]string{"do": "take"}), http.StatusOK).fields("design")
	for name, want := range map[string]string{"/modules/0/model": "TD-9", "/modules/0/voc_v": "37.9", "/modules/0/id": "m1", "/inverters/0/model": "QP-6K", "/inverters/0/trackers/1/id": ""} {
		if got := now.Get(name); got != want {
			t.Errorf("%s = %q, want %q", name, got, want)
		}
	}

	// An inverter without the second tracker leaves strings without one.
	two := exampleFields(t, s, map[string]string{"put:/inverters/0": string(equipmentID(i))})
	p = post(t, s, "/design/swap", two, http.StatusUnprocessableEntity)
	p.sound()
	p.says("With this change the design is not complete", "Strings 2: Choose the tracker of the strings.")
	p = post(t, s, "/design/swap", with(two, map[string]string{"do": "take"}), http.StatusOK)
	p.sound()
	if now := p.fields("design"); now.Get("/strings/1/tracker") != "" || now.Get("/strings/0/tracker") != "t1" || now.Get("/strings/1/modules_in_series") != "13" {
		t.Errorf("taken over, the strings are on %q and %q", now.Get("/strings/0/tracker"), now.Get("/strings/1/tracker"))
	}

	for _, typed := range []map[string]string{
		{"put:/modules/0": "nowhere"}, {"put:/modules/0": string(equipmentID(i))}, {"put:/inverters/0": string(equipmentID(m)), "do": "take"},
	} {
		p := post(t, s, "/design/swap", with(v, typed), http.StatusBadRequest)
		p.sound()
		p.says("Nothing was compared", "is not kept here")
	}
}

// TestSwap_Away: the database goes away in between; temperatures can still be tried.
func TestSwap_Away(t *testing.T) {
	t.Parallel()
	s, saved := savingServer(t, Config{})
	m := keep(t, s, "module", datasheet, map[string]string{"/modules/0/model": "TD-9"})
	v := exampleFields(t, s, map[string]string{"put:/modules/0": string(equipmentID(m)), "typed:/site/hottest_c/value": "45", "typed:/site/hottest_c/unit": "°C"})
	saved.Close()
	s.keptLately.Store(nil) // as it is a moment later
	w := send(t, s, "/design/swap", v)
	p := read(t, w, http.StatusServiceUnavailable)
	p.sound()
	p.says("Nothing was compared", "other values can be typed")
	if w.Header().Get("Retry-After") == "" || attr(p.named("typed:/site/hottest_c/value"), "value") != "45" {
		t.Error("what was typed is gone, or it is not said when to try again")
	}
	v.Del("put:/modules/0")
	p = post(t, s, "/design/swap", v, http.StatusOK)
	p.sound()
	if !p.row("Hottest temperature", "37 °C (98.6 °F)", "45 °C (113.0 °F)", "+8 °C") {
		t.Error("the temperature is not compared")
	}
}

// TestSwap_Unfinished: a form that is no design yet comes back with its faults.
func TestSwap_Unfinished(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	p := post(t, s, "/design/swap", exampleFields(t, s, map[string]string{"/modules/0/voc_v": ""}), http.StatusUnprocessableEntity)
	p.sound()
	if p.id("design") == nil || p.id("faults") == nil {
		t.Error("the form does not come back with its faults")
	}
	if button := get(t, s, "/example", http.StatusOK).all(func(n *html.Node) bool { return attr(n, "formaction") == "/design/swap" }); len(button) != 1 {
		t.Errorf("%d buttons lead to the swap, want 1", len(button))
	}
}
