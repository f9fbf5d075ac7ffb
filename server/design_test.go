package server

import (
	"bytes"
	"maps"
	"mime/multipart"
	"net/http"
	"net/http/httptest"
	"net/url"
	"os"
	"slices"
	"strings"
	"testing"

	"golang.org/x/net/html"
	"golang.org/x/net/html/atom"

	"rimeline/server/form"
	"rimeline/sizing"
	"rimeline/sizing/design"
)

// exampleFields is what a browser sends of the example, with some fields typed anew.
func exampleFields(t *testing.T, h http.Handler, typed map[string]string) url.Values {
	t.Helper()
	v := get(t, h, "/example", http.StatusOK).fields("design")
	for name, s := range typed {
		v.Set(name, s)
	}
	return v
}

// TestExample_Same: the example of the pages is the one that the format page shows.
func TestExample_Same(t *testing.T) {
	t.Parallel()
	want, err := os.ReadFile("../sizing/design/testdata/example-design.json")
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(exampleDesign, want) {
		t.Error("server/example-design.json differs from sizing/design/testdata/example-design.json")
	}
}

// TestPages_Sound looks at every page in each of the states it can be in.
func TestPages_Sound(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	full := exampleFields(t, s, nil)
	several := full
	for _, do := range []string{"add /modules", "add /inverters", "add /inverters/1/trackers", "add /planes", "add /strings", "add /other_limits"} {
		several = maps.Clone(several)
		several.Set("do", do)
		several = post(t, s, "/design", several, http.StatusOK).fields("design")
	}
	faulty := exampleFields(t, s, map[string]string{"/modules/0/voc_v": "x", "/site/coldest_c/unit": "", "/strings/0/plane": "gone", "/inverters/0/quantity": "0"})
	asked := exampleFields(t, s, map[string]string{"/modules/0/pmax_w": "390"})
	for _, tc := range []struct {
		name string
		page page
	}{
		{"start", get(t, s, "/", 200)},
		{"empty", get(t, s, "/design", 200)},
		{"example", get(t, s, "/example", 200)},
		{"empty and sent", post(t, s, "/design", get(t, s, "/design", 200).fields("design"), 422)},
		{"nothing sent", post(t, s, "/design", url.Values{}, 422)},
		{"of everything several", post(t, s, "/design", several, 422)},
		{"faults", post(t, s, "/design", faulty, 422)},
		{"questions", post(t, s, "/design", asked, 200)},
		{"working", post(t, s, "/design/working", full, 200)},
		{"sheet", post(t, s, "/design/sheet", full, 200)},
		{"not opened", read(t, open(t, s, "broken.json", "{"), 422)},
	} {
		t.Run(tc.name, func(t *testing.T) {
			tc.page.t = t
			tc.page.sound()
		})
	}
}

func TestExample_Answer(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	d := design.Read(exampleDesign).Design
	want := sizing.Size(d).Verdict.String()
	p := get(t, s, "/example", http.StatusOK)
	if got := p.verdict(); got != want {
		t.Errorf("the example's page says %s, the engine %s", got, want)
	}
	posted := post(t, s, "/design", p.fields("design"), http.StatusOK)
	if got := posted.verdict(); got != want {
		t.Errorf("and sent by its form, %s", got)
	}
	if !maps.EqualFunc(p.fields("design"), posted.fields("design"), slices.Equal) {
		t.Error("the form holds something else after it was sent")
	}
}

// TestDesign_EveryFault: each fault stands at the top with a link to its field and
// beside the field; what was typed stays.
func TestDesign_EveryFault(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	typed := map[string]string{
		"/modules/0/voc_v": "forty", "/site/coldest_c/value": "-21 °F", "/strings/1/modules_in_series": "0", "/rulebook": "",
		"/allowances/hot_voltage_pct": "-1", "/modules/0/voc_temp_coeff/value": "0.27", "/planes/0/positions": "",
	}
	p := post(t, s, "/design", exampleFields(t, s, typed), http.StatusUnprocessableEntity)
	for name, want := range typed {
		n := p.named(name)
		got := attr(n, "value")
		if n.DataAtom == atom.Select {
			got = chosen(n)
		}
		if got != want {
			t.Errorf("%s was typed as %q and stands there as %q", name, want, got)
		}
		id := attr(n, "id")
		if attr(n, "aria-invalid") != "true" || !strings.Contains(attr(n, "aria-describedby"), id+"-fault") {
			t.Errorf("%s is not marked as faulty", name)
			continue
		}
		said := text(p.id(id + "-fault"))
		links := p.all(func(n *html.Node) bool { return n.DataAtom == atom.A && attr(n, "href") == "#"+id })
		if !slices.ContainsFunc(links, func(n *html.Node) bool { return strings.HasSuffix(text(n), said) }) {
			t.Errorf("no link at the top says of %s: %s", name, said)
		}
	}
	summary := p.id("faults")
	if !has(summary, "autofocus") || !strings.Contains(text(summary), "7 things") {
		t.Errorf("summary: %s", text(summary))
	}
	if p.verdict() != "waiting" {
		t.Errorf("a design with faults has the verdict %s", p.verdict())
	}
}

// TestAnswer_Waits: while someone types, nothing is a fault yet; what is missing is named.
func TestAnswer_Waits(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	for _, tc := range []struct {
		name  string
		typed map[string]string
		says  []string
	}{
		{"one value missing", map[string]string{"/modules/0/voc_v": ""}, []string{"needs 1 more value.", "Module Voc"}},
		{"a unit missing", map[string]string{"/site/coldest_c/unit": ""}, []string{"needs 1 more value.", "unit of coldest air temperature"}},
		{"one not readable", map[string]string{"/modules/0/voc_v": "4,,5"}, []string{"1 value that cannot be taken", "“4,,5”"}},
		{"both", map[string]string{"/modules/0/voc_v": "4,,5", "/planes/1/positions": ""}, []string{"needs 1 more value.", "Cannot be taken", "Plane 2"}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			t.Parallel()
			p := post(t, s, "/design/answer", exampleFields(t, s, tc.typed), http.StatusOK)
			if p.verdict() != "waiting" {
				t.Errorf("verdict %s", p.verdict())
			}
			said := text(p.id("answer-now"))
			for _, want := range tc.says {
				if !strings.Contains(said, want) {
					t.Errorf("the answer does not say %q: %s", want, said)
				}
			}
			if n := p.all(func(n *html.Node) bool { return n.DataAtom == atom.H1 || n.DataAtom == atom.Form }); len(n) > 0 {
				t.Error("the answer alone is more than the answer")
			}
		})
	}
}

func TestDesign_Changes(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	for _, tc := range []struct {
		do    string
		there []string // names of fields that there must be
		gone  []string
		focus string // name of the field, or value of the button, that takes the focus
	}{
		{"add /modules", []string{"/modules/1/voc_v", "/planes/0/module"}, []string{"/modules/2/id"}, "/modules/1/maker"},
		{"add /inverters", []string{"/inverters/1/trackers/0/inputs", "/strings/0/inverter"}, nil, "/inverters/1/maker"},
		{"add /inverters/0/trackers", []string{"/inverters/0/trackers/2/inputs"}, nil, "/inverters/0/trackers/2/mppt_min_v"},
		{"add /planes", []string{"/planes/2/positions"}, nil, "/planes/2/id"},
		{"add /strings", []string{"/strings/2/modules_in_series"}, nil, "/strings/2/plane"},
		{"add /other_limits", []string{"/other_limits/1/name"}, nil, "/other_limits/1/name"},
		{"remove /planes/1", []string{"/planes/0/id"}, []string{"/planes/1/id"}, "add /planes"},
		{"remove /strings/0", []string{"/strings/0/plane"}, []string{"/strings/1/plane"}, "add /strings"},
		{"copy /inverters/0/trackers/1", []string{"/inverters/0/trackers/1/inputs"}, nil, "/inverters/0/trackers/1/mppt_min_v"},
		{"show", []string{"/modules/0/voc_v"}, []string{"/modules/1/id"}, ""},
	} {
		t.Run(tc.do, func(t *testing.T) {
			t.Parallel()
			v := exampleFields(t, s, map[string]string{"do": tc.do, "/modules/0/voc_v": "37,32 V"})
			p := post(t, s, "/design", v, http.StatusOK)
			p.sound()
			after := p.fields("design")
			for _, name := range tc.there {
				if !after.Has(name) {
					t.Errorf("there is no field %s", name)
				}
			}
			for _, name := range tc.gone {
				if after.Has(name) {
					t.Errorf("there still is the field %s", name)
				}
			}
			if got := after.Get("/modules/0/voc_v"); got != "37,32 V" {
				t.Errorf("what was typed is now %q", got)
			}
			focused := p.all(func(n *html.Node) bool { return has(n, "autofocus") })
			if tc.focus == "" && len(focused) == 0 {
				return
			}
			if len(focused) != 1 || attr(focused[0], "name") != tc.focus && attr(focused[0], "value") != tc.focus {
				t.Errorf("the page does not open at %s", tc.focus)
			}
			if p.id("faults") != nil {
				t.Error("faults are shown to someone who is still typing")
			}
		})
	}
	for _, do := range []string{"x", "add", "add /nothing", "remove /modules/9", "copy /planes/0", "add /modules/0", "remove "} {
		post(t, s, "/design", exampleFields(t, s, map[string]string{"do": do}), http.StatusBadRequest)
	}
}

// open sends a file to be opened.
func open(t *testing.T, h http.Handler, name, content string) *httptest.ResponseRecorder {
	t.Helper()
	var body bytes.Buffer
	w := multipart.NewWriter(&body)
	if name != "" {
		part, err := w.CreateFormFile("file", name)
		if err != nil {
			t.Fatal(err)
		}
		part.Write([]byte(content))
	}
	w.Close()
	return ask(t, h, http.MethodPost, "/design/open", body.String(), "Content-Type", w.FormDataContentType())
}

// TestFile_ThereAndBack: a form that is saved and opened is the same form, sound or not.
func TestFile_ThereAndBack(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	for _, tc := range []struct {
		name   string
		typed  map[string]string
		status int
	}{
		{"sound", nil, 200},
		{"with a reason", map[string]string{"/modules/0/pmax_w": "390", "/answers/0/pointer": "/modules/0/pmax_w",
			"/answers/0/value_asked": `{"imp_a":13.12,"pmax_w":390,"vmp_v":31.26}`, "/answers/0/reason": "as on the label"}, 200},
		{"with a reason about a value that is not asked about", map[string]string{"/answers/0/pointer": "/planes/0/tilt_deg", "/answers/0/value_asked": "30", "/answers/0/reason": "measured"}, 200},
		{"with sources", map[string]string{"/sources/~1modules~10": "datasheet", "/sources/~1planes~10~1positions": "counted on site"}, 200},
		{"in °F", map[string]string{"/site/coldest_c/value": "7", "/site/coldest_c/unit": "°F"}, 200},
		{"half finished", map[string]string{"/modules/0/voc_v": "", "/rulebook": "", "/site/coldest_c/value": ""}, 422},
		{"unreadable", map[string]string{"/modules/0/voc_v": "fourty V", "/planes/0/positions": "1.2.3", "/site/coldest_c/value": "<b>"}, 422},
	} {
		t.Run(tc.name, func(t *testing.T) {
			t.Parallel()
			sent := exampleFields(t, s, tc.typed)
			w := send(t, s, "/design/file", sent)
			if w.Code != 200 || w.Header().Get("Content-Type") != "application/json" ||
				w.Header().Get("Content-Disposition") != "attachment; filename=larkspur-mill-workshop-south-and-west-pl.json" {
				t.Fatalf("status %d, headers %v", w.Code, w.Header())
			}
			saved := w.Body.String()
			back := read(t, open(t, s, "saved.json", saved), tc.status).fields("design")
			for name := range sent {
				if !strings.HasPrefix(name, "/") { // a field of the page, such as its request key, and none of the document
					continue
				}
				if got, want := back.Get(name), sent.Get(name); got != want && !strings.HasSuffix(name, "/unit") {
					t.Errorf("%s was %q and comes back as %q", name, want, got)
				}
			}
			if again := send(t, s, "/design/file", back).Body.String(); again != saved {
				t.Errorf("saved again it is another file:\n%s\n%s", saved, again)
			}
		})
	}
}

func TestOpen_Refused(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	for _, tc := range []struct {
		name, file, content string
		says                string
	}{
		{"not JSON", "a.json", "voc 37.32", "“a.json” could not be opened"},
		{"broken off", "a.json", string(exampleDesign[:300]), "“a.json” could not be opened"},
		{"a picture", "b.png", "\x89PNG\r\n\x1a\n\x00\x00", "“b.png” could not be opened"},
		{"empty", "a.json", " \n", "The file is empty"},
		{"none", "", "", "No file was chosen"},
		{"a list", "a.json", "[]", "“a.json” could not be opened"},
		{"a field that is not known", "a.json", strings.Replace(string(exampleDesign), `"title"`, `"tittle": 1, "title"`, 1), "“tittle”"},
		{"a field twice", "a.json", strings.Replace(string(exampleDesign), `"title"`, `"title": "x", "title"`, 1), "twice"},
		{"another format", "a.json", strings.Replace(string(exampleDesign), "rimeline-design/1", "rimeline-design/9", 1), "rimeline-design/1"},
		{"a value that is none", "a.json", strings.Replace(string(exampleDesign), "37.32", "null", 1), "null"},
	} {
		t.Run(tc.name, func(t *testing.T) {
			t.Parallel()
			p := read(t, open(t, s, tc.file, tc.content), http.StatusUnprocessableEntity)
			p.sound()
			if said := strings.NewReplacer(`"`, "“").Replace(text(p.id("faults"))); !strings.Contains(strings.ReplaceAll(said, "”", "“"), strings.ReplaceAll(tc.says, "”", "“")) {
				t.Errorf("the page says %q, want …%s…", said, tc.says)
			}
		})
	}
	read(t, open(t, s, "a.json", `{"modules": [`+strings.Repeat("{},", form.MaxEntries)+`{}]}`), http.StatusRequestEntityTooLarge)
}

// TestCarried: the pages about a design take the form along, and a form with faults
// comes back instead.
func TestCarried(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	sent := exampleFields(t, s, map[string]string{"/modules/0/voc_v": "37,32 V"})
	for _, path := range []string{"/design/working", "/design/sheet"} {
		back := post(t, s, path, sent, http.StatusOK).fields("carried")
		for name := range sent {
			if !strings.HasPrefix(name, "/") {
				continue // what only the page needs
			}
			if got, want := back.Get(name), sent.Get(name); got != want {
				t.Errorf("%s: %s was %q and comes back as %q", path, name, want, got)
			}
		}
		p := post(t, s, path, exampleFields(t, s, map[string]string{"/modules/0/voc_v": "x"}), http.StatusUnprocessableEntity)
		if p.id("faults") == nil || p.fields("design").Get("/modules/0/voc_v") != "x" {
			t.Errorf("%s: a form with a fault does not come back with it", path)
		}
	}
}

// TestQuestions: what looks like a slip is asked beside the field; a reason closes
// the question for as long as the values stand.
func TestQuestions(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	const slot = "f-modules-0-pmax_w-asked" // Pmax 390 W is 5 % off Vmp × Imp, 410 W
	doubtful := exampleFields(t, s, map[string]string{"/modules/0/pmax_w": "390"})
	p := post(t, s, "/design", doubtful, http.StatusOK)
	if got := text(p.id(slot)); !strings.Contains(got, "?") {
		t.Fatalf("nothing is asked beside Pmax: %q", got)
	}
	if p.verdict() != "unconfirmed" {
		t.Errorf("with the question open the verdict is %s", p.verdict())
	}
	live := post(t, s, "/design/answer", doubtful, http.StatusOK)
	carried := live.all(func(n *html.Node) bool { return n.DataAtom == atom.Template && attr(n, "data-slot") == slot })
	if len(carried) != 1 {
		t.Fatalf("the live answer carries %d texts for the place beside Pmax, want 1", len(carried))
	}

	answered := p.fields("design")
	answered.Set("/answers/0/reason", "so on the label")
	p = post(t, s, "/design", answered, http.StatusOK)
	if p.verdict() == "unconfirmed" || strings.Contains(text(p.id(slot)), "?") {
		t.Errorf("the reason does not close the question: %s, %s", p.verdict(), text(p.id(slot)))
	}
	if got := attr(p.named("/answers/0/reason"), "value"); got != "so on the label" {
		t.Errorf("the reason is now %q", got)
	}

	changed := p.fields("design")
	changed.Set("/modules/0/pmax_w", "385")
	p = post(t, s, "/design", changed, http.StatusOK)
	if p.verdict() != "unconfirmed" || !strings.Contains(text(p.id(slot)), "so on the label") {
		t.Errorf("for another value the question is not asked anew, with the earlier reason beside it: %s, %s", p.verdict(), text(p.id(slot)))
	}
	again := p.fields("design")
	if got := again.Get("/answers/0/reason"); got != "so on the label" {
		t.Errorf("the earlier reason is lost: %q", got)
	}
	again.Set("/answers/1/reason", "read again")
	p = post(t, s, "/design", again, http.StatusOK)
	if p.verdict() == "unconfirmed" || strings.Contains(text(p.id(slot)), "?") {
		t.Errorf("the second reason does not close the question: %s, %s", p.verdict(), text(p.id(slot)))
	}
	var reasons []string
	for name, v := range p.fields("design") {
		if strings.HasPrefix(name, "/answers/") && strings.HasSuffix(name, "/reason") {
			reasons = append(reasons, v...)
		}
	}
	if !slices.Equal(reasons, []string{"read again"}) {
		t.Errorf("the reasons on record are %q, want the one that counts", reasons)
	}
}

// TestForm_EveryField: every field of the format can be typed, or is kept unseen.
func TestForm_EveryField(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	v := get(t, s, "/design", http.StatusOK).fields("design")
	for _, do := range []string{"add /strings", "add /other_limits"} {
		v.Set("do", do)
		v = post(t, s, "/design", v, http.StatusOK).fields("design")
	}
	for _, name := range form.AllNames() {
		name = strings.ReplaceAll(name, "*", "0")
		if !v.Has(name) && !strings.HasPrefix(name, "/answers/") {
			t.Errorf("the form has no field %s", name)
		}
	}
}

func TestDesign_TooMany(t *testing.T) {
	t.Parallel()
	s, _ := testServer(Config{})
	v := url.Values{}
	for k := range form.MaxEntries + 1 {
		v.Set(pointerOf("/modules", k)+"/voc_v", "1")
	}
	post(t, s, "/design", v, http.StatusRequestEntityTooLarge)
}

func TestFileName(t *testing.T) {
	t.Parallel()
	for title, want := range map[string]string{
		"":                                    "design.json",
		"Shed":                                "shed.json",
		"  Hall 3: south/west  ":              "hall-3-south-west.json",
		"../../etc/passwd":                    "etc-passwd.json",
		"Größe":                               "gr-e.json",
		"屋根":                                  "design.json",
		strings.Repeat("a", 39) + " and more": strings.Repeat("a", 39) + ".json",
		strings.Repeat("x", 300):              strings.Repeat("x", 40) + ".json",
	} {
		if got := fileName(title); got != want {
			t.Errorf("fileName(%q) = %q, want %q", title, got, want)
		}
	}
}

func BenchmarkDesignPage(b *testing.B) {
	s, _ := testServer(Config{})
	w := &discard{header: http.Header{}}
	for b.Loop() {
		r := httptest.NewRequest(http.MethodGet, "/example", nil)
		r.Host = "127.0.0.1"
		s.ServeHTTP(w, r)
	}
}
