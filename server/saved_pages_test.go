package server

import (
	"bytes"
	"context"
	"crypto/sha256"
	"maps"
	"net/http"
	"net/http/httptest"
	"net/url"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"

	"golang.org/x/net/html"
	"golang.org/x/net/html/atom"

	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/sizing/design"
)

// goTo sends a form, which must lead on to another page, and returns that address.
func goTo(t *testing.T, h http.Handler, path string, fields url.Values) string {
	t.Helper()
	w := send(t, h, path, fields)
	if w.Code != http.StatusSeeOther {
		t.Fatalf("POST %s: %d, want 303: %s", path, w.Code, textOfPage(t, w))
	}
	return w.Header().Get("Location")
}

func textOfPage(t *testing.T, w *httptest.ResponseRecorder) string {
	t.Helper()
	root, err := html.Parse(bytes.NewReader(w.Body.Bytes()))
	if err != nil {
		t.Fatal(err)
	}
	return text(root)
}

// says fails unless the page holds every one of the texts.
func (p page) says(texts ...string) {
	p.t.Helper()
	said := text(p.root)
	for _, want := range texts {
		if !strings.Contains(said, want) {
			p.t.Errorf("the page does not say %q: %s", want, said)
		}
	}
}

// saveExample saves the example with some fields typed anew and returns the path of
// the design.
func saveExample(t *testing.T, h http.Handler, typed map[string]string) string {
	t.Helper()
	path, _, _ := strings.Cut(goTo(t, h, "/designs", exampleFields(t, h, typed)), "?")
	return path
}

// openSaved returns the form of a saved design with some fields typed anew.
func openSaved(t *testing.T, h http.Handler, path string, typed map[string]string) url.Values {
	t.Helper()
	v := get(t, h, path, http.StatusOK).fields("design")
	for name, s := range typed {
		v.Set(name, s)
	}
	return v
}

func designID(path string) record.ID { return record.ID(strings.TrimPrefix(path, "/designs/")) }

func TestSave(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{Version: "v9"})
	to := goTo(t, s, "/designs", exampleFields(t, s, map[string]string{"/title": "Harrow barn", "note": " first \n"}))
	path, query, _ := strings.Cut(to, "?")
	if !strings.HasPrefix(path, "/designs/") || query != "saved=1" {
		t.Fatalf("saving leads to %s", to)
	}
	p := get(t, s, to, http.StatusOK)
	p.sound()
	p.says("Saved as revision 1.", "Revision 1, saved just now by someone at this service.")
	if got := attr(p.named("/title"), "value"); got != "Harrow barn" {
		t.Errorf("the title is %q", got)
	}
	if get(t, s, path, http.StatusOK).id("design") == nil {
		t.Error("the address of the design does not open it")
	}
	rev, err := kept.Revision(t.Context(), designID(path), 1)
	if err != nil || rev.Note != "first" || rev.Frozen.Engine != "v9" || rev.Frozen.Title != "Harrow barn" || rev.Base != 0 {
		t.Errorf("revision 1: %v, note %q, engine %q, title %q, base %d", err, rev.Note, rev.Frozen.Engine, rev.Frozen.Title, rev.Base)
	}

	to = goTo(t, s, "/designs", openSaved(t, s, path, map[string]string{"/site/coldest_c/value": "−25"}))
	if to != path+"?saved=2" {
		t.Errorf("the second save leads to %s, want revision 2 of the same design", to)
	}
	rev, err = kept.Revision(t.Context(), designID(path), 0)
	if err != nil || rev.Number != 2 || rev.Base != 1 || !strings.Contains(string(rev.Frozen.Document), `"coldest_c":-25`) {
		t.Errorf("the newest is revision %d from %d, %v: %s", rev.Number, rev.Base, err, rev.Frozen.Document)
	}
}

// TestSave_CarriedAlong: checking, adding a part and the pages about the design do not
// make a design forget what it is a revision of.
func TestSave_CarriedAlong(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	path := saveExample(t, s, nil)
	v := openSaved(t, s, path, map[string]string{"note": "on the way"})
	v = post(t, s, "/design", v, http.StatusOK).fields("design")
	v.Set("do", "add /planes")
	v = post(t, s, "/design", v, http.StatusOK).fields("design")
	v.Set("do", "remove /planes/2")
	v = post(t, s, "/design", v, http.StatusOK).fields("design")
	v = post(t, s, "/design/working", v, http.StatusOK).fields("carried")
	v = post(t, s, "/design", v, http.StatusOK).fields("design")
	if to := goTo(t, s, "/designs", v); to != path+"?saved=2" {
		t.Errorf("the save leads to %s, want revision 2", to)
	}
	if rev, err := kept.Revision(t.Context(), designID(path), 2); err != nil || rev.Note != "on the way" {
		t.Errorf("the note is %q, %v", rev.Note, err)
	}
}

// TestSave_Repeated: a save that is sent again, because its answer was lost or the
// button was pressed twice, makes one revision.
func TestSave_Repeated(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	v := exampleFields(t, s, nil)
	first := goTo(t, s, "/designs", v)
	if again := goTo(t, s, "/designs", v); again != first {
		t.Errorf("sent again it leads to %s, first to %s", again, first)
	}
	path, _, _ := strings.Cut(first, "?")
	v = openSaved(t, s, path, map[string]string{"/title": "Second"})
	if a, b := goTo(t, s, "/designs", v), goTo(t, s, "/designs", v); a != b {
		t.Errorf("the second save sent twice leads to %s and %s", a, b)
	}
	if list, err := kept.Revisions(t.Context(), designID(path)); err != nil || len(list) != 2 {
		t.Errorf("%d revisions, want 2: %v", len(list), err)
	}
	if all, err := kept.Designs(t.Context(), record.Listing{}); err != nil || all.Total != 1 {
		t.Errorf("%d designs, want 1: %v", all.Total, err)
	}
}

// TestSave_GoneBack: someone saves, goes back to the page, types on and saves again.
// That is the next revision of the same design, and no quarrel with oneself.
func TestSave_GoneBack(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	v := exampleFields(t, s, nil)
	path, _, _ := strings.Cut(goTo(t, s, "/designs", v), "?")
	v.Set("/title", "Typed after going back")
	for range 2 { // and its repetition
		if to := goTo(t, s, "/designs", v); to != path+"?saved=2" {
			t.Errorf("it leads to %s, want %s?saved=2", to, path)
		}
	}
	v = openSaved(t, s, path, nil)
	v.Set("/title", "Three")
	goTo(t, s, "/designs", v)
	v.Set("/title", "Four")
	if to := goTo(t, s, "/designs", v); to != path+"?saved=4" {
		t.Errorf("it leads to %s, want %s?saved=4", to, path)
	}
	if list, err := kept.Revisions(t.Context(), designID(path)); err != nil || len(list) != 4 {
		t.Errorf("%d revisions: %v", len(list), err)
	}
}

// TestSave_Faulty: what cannot be sized is no revision, and its text is kept.
func TestSave_Faulty(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	v := exampleFields(t, s, map[string]string{"/modules/0/voc_v": "forty one", "/title": "Half done"})
	p := post(t, s, "/designs", v, http.StatusUnprocessableEntity)
	p.sound()
	p.says("One thing keeps this design from being sized", "Its text is kept as a draft.", "Saved as a draft at")
	if got := attr(p.named("/modules/0/voc_v"), "value"); got != "forty one" {
		t.Errorf("the field holds %q", got)
	}
	if all, err := kept.Designs(t.Context(), record.Listing{}); err != nil || all.Total != 0 {
		t.Errorf("%d designs are saved: %v", all.Total, err)
	}
	drafts, err := kept.DraftsOf(t.Context(), "", 9)
	if err != nil || len(drafts) != 1 || drafts[0].Fields["/modules/0/voc_v"] != "forty one" {
		t.Fatalf("drafts: %v, %v", drafts, err)
	}
	v = p.fields("design")
	v.Set("/modules/0/voc_v", "37.32")
	path, _, _ := strings.Cut(goTo(t, s, "/designs", v), "?")
	if left, err := kept.Drafts(t.Context(), 9); err != nil || len(left) != 0 {
		t.Errorf("once it is saved at %s, %d drafts are left: %v", path, len(left), err)
	}
}

// TestSave_Conflict: of two who save from the same revision, the second sees both
// versions, and neither is lost whatever is chosen.
func TestSave_Conflict(t *testing.T) {
	t.Parallel()
	for _, choice := range []string{"keep mine", "take theirs", "edit mine"} {
		t.Run(choice, func(t *testing.T) {
			t.Parallel()
			s, kept := savingServer(t, Config{})
			path := saveExample(t, s, nil)
			theirs := openSaved(t, s, path, map[string]string{"/job/client": "Fern and Daughter", "/strings/0/modules_in_series": "11"})
			mine := openSaved(t, s, path, map[string]string{"/site/coldest_c/value": "-40", "/planes/0/id": "south-east", "note": "colder"})
			goTo(t, s, "/designs", theirs)
			p := post(t, s, "/designs", mine, http.StatusConflict)
			p.sound()
			p.says("Not saved yet: revision 2 came first", "Yours was made from revision 1.", "Coldest temperature", "−40 °C", "Fern and Daughter", "Modules in series",
				"Keep mine as revision 3", "Take theirs, revision 2")
			drafts, err := kept.DraftsOf(t.Context(), designID(path), 9)
			if err != nil || len(drafts) != 1 || drafts[0].Fields["/site/coldest_c/value"] != "-40" || drafts[0].Fields["/planes/0/id"] != "south-east" {
				t.Fatalf("the version that was not saved is not kept as a draft: %v, %v", drafts, err)
			}
			switch choice {
			case "keep mine":
				if to := goTo(t, s, "/designs", p.fields("carried")); to != path+"?saved=3" {
					t.Errorf("it leads to %s", to)
				}
				rev, err := kept.Revision(t.Context(), designID(path), 3)
				if err != nil || rev.Base != 2 || rev.Note != "colder" || !bytes.Contains(rev.Frozen.Document, []byte(`"plane":"south-east"`)) || bytes.Contains(rev.Frozen.Document, []byte("Fern")) {
					t.Errorf("revision 3: %v, from %d, note %q: %s", err, rev.Base, rev.Note, rev.Frozen.Document)
				}
				if left, err := kept.DraftsOf(t.Context(), designID(path), 9); err != nil || len(left) != 0 {
					t.Errorf("%d drafts are left: %v", len(left), err)
				}
			case "take theirs":
				p := get(t, s, path, http.StatusOK)
				if got := attr(p.named("/job/client"), "value"); got != "Fern and Daughter" {
					t.Errorf("the design opens with the client %q", got)
				}
				p.says("There is a draft of", "It was begun from revision 1.", "Coldest air temperature", "Restore the draft")
			case "edit mine":
				v := p.fields("carried")
				v.Set("do", "show")
				q := post(t, s, "/design", v, http.StatusOK)
				if got := attr(q.named("/site/coldest_c/value"), "value"); got != "-40" {
					t.Errorf("the form holds %q", got)
				}
				if to := goTo(t, s, "/designs", q.fields("design")); to != path+"?saved=3" {
					t.Errorf("saving it leads to %s", to)
				}
			}
			if rev, err := kept.Revision(t.Context(), designID(path), 2); err != nil || !bytes.Contains(rev.Frozen.Document, []byte("Fern")) {
				t.Errorf("their revision: %v", err)
			}
		})
	}
}

// TestSave_BothTheSame: two who save the same do not quarrel.
func TestSave_BothTheSame(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	path := saveExample(t, s, nil)
	typed := map[string]string{"/title": "The same thought"}
	a, b := openSaved(t, s, path, typed), openSaved(t, s, path, typed)
	goTo(t, s, "/designs", a)
	if to := goTo(t, s, "/designs", b); to != path+"?saved=2" {
		t.Errorf("the second leads to %s", to)
	}
	if list, err := kept.Revisions(t.Context(), designID(path)); err != nil || len(list) != 2 {
		t.Errorf("%d revisions: %v", len(list), err)
	}
}

// TestSave_Away: where nothing can be saved, sizing goes on; a save that was tried
// shows the whole form with what to do, and the same form is saved once the database
// is back.
func TestSave_Away(t *testing.T) {
	t.Parallel()
	_, kept := savingServer(t, Config{})
	for _, tc := range []struct {
		err              error
		page, save, says string
		button           bool
		retryAfter       string
	}{
		{ErrStarting, "Saving is still starting.", "Not saved: saving is still starting", "Sizing works already", true, "1"},
		{ErrNothingSaved, "Designs are not saved here", "Not saved: nothing is saved here", "keep a design as a file", false, "60"},
		{record.ErrUnavailable, "The database does not answer", "Not saved: the database does not answer", "Everything that you typed stands below", true, "5"},
	} {
		t.Run(tc.err.Error(), func(t *testing.T) {
			away := tc.err
			s, _ := testServer(Config{Saving: func() (Saving, error) { return kept, away }})
			p := get(t, s, "/design", http.StatusOK)
			p.sound()
			p.says(tc.page)
			v := exampleFields(t, s, map[string]string{"/title": "Away " + tc.retryAfter})
			if got := post(t, s, "/design", v, http.StatusOK).verdict(); got == "waiting" {
				t.Error("sizing does not go on")
			}
			w := send(t, s, "/designs", v)
			if w.Header().Get("Retry-After") != tc.retryAfter {
				t.Errorf("Retry-After %q, want %q", w.Header().Get("Retry-After"), tc.retryAfter)
			}
			p = read(t, w, http.StatusServiceUnavailable)
			p.sound()
			p.says(tc.save, tc.says)
			if got := p.fields("design"); !maps.EqualFunc(got, v, slices.Equal) {
				t.Errorf("the page of the failed save holds something else than was typed: %v, want %v", got, v)
			}
			save := p.id("save")
			if (save != nil && !has(save, "hidden")) != tc.button {
				t.Errorf("the button to save again is there: %t, want %t", save != nil, tc.button)
			}
			for _, path := range []string{"/designs", "/designs/x", "/drafts/x", "/designs/x/revisions"} {
				get(t, s, path, http.StatusServiceUnavailable)
			}
			get(t, s, "/", http.StatusOK).sound()

			away = nil
			first := goTo(t, s, "/designs", p.fields("design"))
			if again := goTo(t, s, "/designs", v); again != first {
				t.Errorf("the form of the first try makes another design: %s and %s", first, again)
			}
		})
	}
}

// TestSave_DatabaseGone is the same with a store whose database has gone.
func TestSave_DatabaseGone(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	v := exampleFields(t, s, nil)
	kept.Close()
	p := post(t, s, "/designs", v, http.StatusServiceUnavailable)
	p.says("Everything that you typed stands below.")
	if got := p.fields("design"); !maps.EqualFunc(got, v, slices.Equal) {
		t.Error("the form lost something")
	}
	v.Set("/modules/0/voc_v", "")
	post(t, s, "/designs", v, http.StatusUnprocessableEntity).says("could not be kept as a draft either")
	post(t, s, "/drafts", v, http.StatusServiceUnavailable).says("Everything that you typed stands below.")
	v.Set("autosave", "yes")
	post(t, s, "/drafts", v, http.StatusServiceUnavailable).says("Not kept as a draft: the database does not answer.")
	get(t, s, "/", http.StatusOK).says("cannot be reached at the moment")
	get(t, s, "/design", http.StatusOK).says("The database does not answer")
}

// autosave sends a form as the script does and returns it with the draft's id and
// version as the answer has them.
func autosave(t *testing.T, h http.Handler, fields url.Values) (next url.Values, said string) {
	t.Helper()
	fields = maps.Clone(fields)
	fields.Set("autosave", "yes")
	p := post(t, h, "/drafts", fields, http.StatusOK)
	at := p.all(func(n *html.Node) bool { return has(n, "data-draft") })
	if len(at) != 1 {
		t.Fatalf("the answer tells of %d drafts", len(at))
	}
	fields.Del("autosave")
	fields.Set("draft", attr(at[0], "data-draft"))
	fields.Set("draft-version", attr(at[0], "data-version"))
	return fields, text(at[0])
}

func TestDrafts(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	typed := map[string]string{
		"/title": "  Half a barn ", "/modules/0/voc_v": "37,3", "/site/coldest_c/value": "−2\u200a1 °", "/job/note": "two\r\nlines\x00",
		"/planes/0/positions": "twelve", "note": "why",
	}
	v := get(t, s, "/design", http.StatusOK).fields("design")
	for name, text := range typed {
		v.Set(name, text)
	}
	v, said := autosave(t, s, v)
	if !strings.HasPrefix(said, "Saved as a draft at ") || !strings.HasSuffix(said, " UTC") {
		t.Errorf("the answer says %q", said)
	}
	v.Set("/site/name", "Harrow")
	v, _ = autosave(t, s, v)
	if v.Get("draft-version") != "2" {
		t.Errorf("the second save has version %s", v.Get("draft-version"))
	}
	d, err := kept.Draft(t.Context(), record.ID(v.Get("draft")))
	if err != nil {
		t.Fatal(err)
	}
	for name, want := range typed {
		if d.Fields[name] != want {
			t.Errorf("%s is kept as %q, typed was %q", name, d.Fields[name], want)
		}
	}
	p := get(t, s, "/drafts/"+string(d.ID), http.StatusOK)
	p.sound()
	p.says("A draft, kept by someone at this service.", "Saved as a draft at")
	got := p.fields("design")
	for _, name := range []string{"/title", "/modules/0/voc_v", "/site/coldest_c/value", "/planes/0/positions", "note", "draft", "draft-version", "/site/name"} {
		if got.Get(name) != v.Get(name) {
			t.Errorf("the draft opens with %s %q, typed was %q", name, got.Get(name), v.Get(name))
		}
	}
	for _, path := range []string{"/", "/designs"} {
		if links := get(t, s, path, 200).all(func(n *html.Node) bool { return attr(n, "href") == "/drafts/"+string(d.ID) }); len(links) != 1 || text(links[0]) != "Half a barn" {
			t.Errorf("%s has %d links to the draft", path, len(links))
		}
	}
}

// TestDraft_Renamed: a draft of a plane that has another name keeps what is wired to it.
func TestDraft_Renamed(t *testing.T) {
	t.Parallel()
	s, _ := savingServer(t, Config{})
	v, _ := autosave(t, s, exampleFields(t, s, map[string]string{"/planes/0/id": "carport"}))
	p := get(t, s, "/drafts/"+v.Get("draft"), http.StatusOK)
	if got := p.fields("design").Get("/strings/0/plane"); got != "carport" {
		t.Errorf("the strings are of plane %q", got)
	}
	if p.verdict() == "waiting" {
		t.Error("the draft of a whole design is not sized")
	}
}

// TestDraft_Stale: an autosave of a page that does not know the newest version never
// overwrites it. Both texts are kept, also when the answer is lost and the page sends
// its text again.
func TestDraft_Stale(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	first, _ := autosave(t, s, get(t, s, "/design", http.StatusOK).fields("design"))
	one := get(t, s, "/drafts/"+first.Get("draft"), http.StatusOK).fields("design")
	two := get(t, s, "/drafts/"+first.Get("draft"), http.StatusOK).fields("design")
	one.Set("/title", "tab one")
	one, _ = autosave(t, s, one)
	two.Set("/title", "tab two")
	lost, _ := autosave(t, s, two)
	next, said := autosave(t, s, two)
	if !strings.Contains(said, "Both are kept") {
		t.Errorf("the answer says %q", said)
	}
	if next.Get("draft") == one.Get("draft") || next.Get("draft") != lost.Get("draft") {
		t.Errorf("the second tab's draft is %s, then %s; the first tab's is %s", lost.Get("draft"), next.Get("draft"), one.Get("draft"))
	}
	next.Set("/title", "tab two, more")
	next, said = autosave(t, s, next)
	if strings.Contains(said, "Both") {
		t.Errorf("a draft of its own is still in conflict: %q", said)
	}
	for draft, want := range map[string]string{one.Get("draft"): "tab one", next.Get("draft"): "tab two, more"} {
		if d, err := kept.Draft(t.Context(), record.ID(draft)); err != nil || d.Fields["/title"] != want {
			t.Errorf("draft %s: %q, %v; want %q", draft, d.Fields["/title"], err, want)
		}
	}
	if all, err := kept.Drafts(t.Context(), 9); err != nil || len(all) != 2 {
		t.Errorf("%d drafts, want 2: %v", len(all), err)
	}
	// Without script the same happens at the button.
	two.Set("/title", "tab two, by the button")
	to := goTo(t, s, "/drafts", two)
	get(t, s, to, http.StatusOK).says("Both are kept")
	if all, err := kept.Drafts(t.Context(), 9); err != nil || len(all) != 3 {
		t.Errorf("%d drafts, want 3: %v", len(all), err)
	}
}

// TestDraft_Gone: typing goes on in a page whose draft was saved or discarded
// elsewhere; the text is kept as a new draft.
func TestDraft_Gone(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	v, _ := autosave(t, s, get(t, s, "/design", http.StatusOK).fields("design"))
	if to := goTo(t, s, "/drafts/"+v.Get("draft")+"/discard", url.Values{"version": {v.Get("draft-version")}}); to != "/designs?done=discarded" {
		t.Errorf("discarding leads to %s", to)
	}
	get(t, s, "/drafts/"+v.Get("draft"), http.StatusNotFound).says("This draft is not kept any more")
	v.Set("/title", "typed on")
	next, said := autosave(t, s, v)
	if !strings.Contains(said, "kept as a new one") || next.Get("draft") == v.Get("draft") {
		t.Errorf("the answer says %q, and the draft is %s", said, next.Get("draft"))
	}
	if d, err := kept.Draft(t.Context(), record.ID(next.Get("draft"))); err != nil || d.Fields["/title"] != "typed on" {
		t.Errorf("the new draft: %v, %v", d.Fields["/title"], err)
	}
	goTo(t, s, "/drafts/"+v.Get("draft")+"/discard", url.Values{"version": {"1"}}) // it is gone already
}

func TestDraft_DiscardStale(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	v, _ := autosave(t, s, get(t, s, "/design", http.StatusOK).fields("design"))
	v, _ = autosave(t, s, v)
	post(t, s, "/drafts/"+v.Get("draft")+"/discard", url.Values{"version": {"1"}}, http.StatusConflict).says("The draft was not discarded")
	post(t, s, "/drafts/"+v.Get("draft")+"/discard", nil, http.StatusConflict)
	if _, err := kept.Draft(t.Context(), record.ID(v.Get("draft"))); err != nil {
		t.Error(err)
	}
}

// TestDraft_Offered: the page of a design shows the newest revision and offers its
// draft with what differs; one that says nothing new is not offered.
func TestDraft_Offered(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	path := saveExample(t, s, nil)
	same, _ := autosave(t, s, openSaved(t, s, path, nil))
	if p := get(t, s, path, 200); len(p.all(func(n *html.Node) bool { return attr(n, "href") == "/drafts/"+same.Get("draft") })) != 0 {
		t.Error("a draft is offered that says nothing new")
	}
	v := openSaved(t, s, path, map[string]string{
		"/modules/0/voc_v": "37.50", "/site/coldest_c/value": "-2x", "/rulebook": "nec-2020", "/strings/0/modules_in_series": "",
		"/sources/~1modules~10": "Datasheet of May", "/job/client": "Fern",
	})
	v, _ = autosave(t, s, v)
	second, _ := autosave(t, s, openSaved(t, s, path, map[string]string{"/title": "Another tab's"}))
	first := v
	v.Set("/title", "Newer")
	v, _ = autosave(t, s, v) // the one saved last is offered
	p := get(t, s, path, http.StatusOK)
	p.sound()
	p.says("There is a draft of", "7 inputs differ from what stands below.", "Code edition in force", "NEC 2023", "NEC 2020", "Voc", "37.50 V", "−2x °C",
		"Where values come from", "Datasheet of May", "There is a further draft of this design")
	if got := attr(p.named("/modules/0/voc_v"), "value"); got != "37.32" {
		t.Errorf("the page shows Voc %q and not that of the revision", got)
	}
	for _, id := range []string{first.Get("draft"), second.Get("draft")} {
		if len(p.all(func(n *html.Node) bool { return n.DataAtom == atom.A && attr(n, "href") == "/drafts/"+id })) != 1 {
			t.Errorf("no link to draft %s", id)
		}
	}
	d := get(t, s, "/drafts/"+v.Get("draft"), http.StatusOK)
	if got := attr(d.named("/modules/0/voc_v"), "value"); got != "37.50" {
		t.Errorf("the draft opens with Voc %q", got)
	}
	discard := p.all(func(n *html.Node) bool { return attr(n, "data-discards") == v.Get("draft") })
	if len(discard) != 1 {
		t.Fatalf("%d ways to discard the draft", len(discard))
	}
	if to := goTo(t, s, attr(discard[0], "action"), url.Values{"version": {v.Get("draft-version")}}); to != path+"?done=discarded" {
		t.Errorf("discarding leads to %s", to)
	}
	get(t, s, path, 200).says("Another tab's")
	// A revision of somebody else's meanwhile does not make it go away.
	goTo(t, s, "/designs", openSaved(t, s, path, map[string]string{"/job/client": "Moss"}))
	get(t, s, path, 200).says("It was begun from revision 1.", "Another tab's")
	get(t, s, "/drafts/"+second.Get("draft"), 200).says("Revision 2 was saved after it was begun from revision 1; saving it shows both.")
	if all, err := kept.Drafts(t.Context(), 9); err != nil || len(all) != 2 {
		t.Errorf("%d drafts: %v", len(all), err)
	}
}

// TestDraft_TooMuch: what no page could show is refused as everywhere else.
func TestDraft_TooMuch(t *testing.T) {
	t.Parallel()
	s, _ := savingServer(t, Config{})
	v := url.Values{"autosave": {"yes"}}
	for k := range 500 {
		v.Set(pointerOf("/strings", k)+"/tracker", "t1")
	}
	if w := send(t, s, "/drafts", v); w.Code != http.StatusRequestEntityTooLarge {
		t.Errorf("status %d", w.Code)
	}
}

// TestOrigin_Hostile: what a form says of where it comes from is not believed further
// than an id.
func TestOrigin_Hostile(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	v := exampleFields(t, s, map[string]string{
		"design": "", "base": "-7", "draft": `"><script>`, "draft-version": "x", "request": strings.Repeat("k", 5000),
	})
	goTo(t, s, "/designs", v)
	for name, typed := range map[string]map[string]string{
		"no such design":    {"design": "NOSUCH", "base": "1"},
		"no such revision":  {"design": "NOSUCH", "base": "999999999999999999999999"},
		"a design's script": {"design": "a/../b", "base": "0"},
	} {
		w := send(t, s, "/designs", exampleFields(t, s, typed))
		if w.Code != http.StatusNotFound && w.Code != http.StatusUnprocessableEntity && w.Code != http.StatusSeeOther {
			t.Errorf("%s: %d %s", name, w.Code, textOfPage(t, w))
		}
		if strings.Contains(w.Body.String(), "<script>") {
			t.Errorf("%s: the page has what was sent as markup", name)
		}
	}
	w := send(t, s, "/drafts", exampleFields(t, s, map[string]string{"design": "NOSUCH", "base": "1", "autosave": "yes"}))
	if w.Code < 400 || w.Code >= 500 {
		t.Errorf("a draft of no design: %d", w.Code)
	}
	if all, err := kept.Drafts(t.Context(), 9); err != nil || len(all) != 0 {
		t.Errorf("%d drafts: %v", len(all), err)
	}
}

func TestDesigns_List(t *testing.T) {
	t.Parallel()
	s, _ := savingServer(t, Config{})
	p := get(t, s, "/designs", 200)
	p.sound()
	p.says("Nothing is saved yet.", "0 designs")
	paths := map[string]string{}
	for _, d := range []struct{ title, site, modules string }{{"Beta barn", "Ashby", "12"}, {"alpha house", "Tarn", "40"}, {"House 10", "Tarn", "12"}, {"House 2", "Tarn", "12"}, {"", "Wren", "12"}} {
		paths[d.title] = saveExample(t, s, map[string]string{"/title": d.title, "/site/name": d.site, "/strings/0/modules_in_series": d.modules})
	}
	titles := func(path string) (got []string) {
		t.Helper()
		for _, n := range get(t, s, path, 200).all(func(n *html.Node) bool { return attr(n, "class") == "opens" }) {
			got = append(got, text(n))
		}
		return got
	}
	none := "A design without a title"
	for path, want := range map[string][]string{
		"/designs":                              {none, "House 2", "House 10", "alpha house", "Beta barn"},
		"/designs?order=reversed":               {"Beta barn", "alpha house", "House 10", "House 2", none},
		"/designs?sort=title":                   {none, "alpha house", "Beta barn", "House 2", "House 10"},
		"/designs?sort=verdict":                 {"alpha house"},
		"/designs?sort=headroom":                {"alpha house"},
		"/designs?q=tarn+hou":                   {"House 2", "House 10", "alpha house"},
		"/designs?q=TARN&verdict=outside":       {"alpha house"},
		"/designs?verdict=unconfirmed":          nil,
		"/designs?verdict=nonsense&sort=nobody": {none, "House 2", "House 10", "alpha house", "Beta barn"},
		"/designs?archived=yes":                 nil,
	} {
		got := titles(path)
		if strings.Contains(path, "sort=verdict") || strings.Contains(path, "sort=headroom") {
			got = got[:1] // the only one that is outside
		}
		if !slices.Equal(got, want) {
			t.Errorf("%s lists %q, want %q", path, got, want)
		}
	}
	// Each head of a column leads to its order and says which one is on.
	p = get(t, s, "/designs?q=tarn&sort=title", 200)
	p.sound()
	sorted := p.all(func(n *html.Node) bool { return has(n, "aria-sort") })
	if len(sorted) != 1 || text(sorted[0]) != "Title" || attr(sorted[0], "aria-sort") != "ascending" {
		t.Errorf("sorted: %d columns", len(sorted))
	}
	if links := p.all(func(n *html.Node) bool { return attr(n, "href") == "/designs?order=reversed&q=tarn&sort=title" }); len(links) != 1 || text(links[0]) != "Title" {
		t.Errorf("%d links to the reversed order", len(links))
	}
	if links := p.all(func(n *html.Node) bool { return attr(n, "href") == "/designs?q=tarn&sort=headroom" }); len(links) != 1 {
		t.Errorf("%d links to the order by headroom", len(links))
	}
	if got := attr(get(t, s, "/designs?order=reversed", 200).all(func(n *html.Node) bool { return has(n, "aria-sort") })[0], "aria-sort"); got != "ascending" {
		t.Errorf("the oldest first is %s", got)
	}
	get(t, s, "/designs?q=nothing+at+all", 200).says("No design in use matches.", "Show all")

	// Archive and restore, and back to the same list.
	to := goTo(t, s, paths["House 2"]+"/archive", url.Values{"back": {"q=tarn&sort=title&evil=//x"}})
	if want := "/designs?done=archived&of=" + string(designID(paths["House 2"])) + "&q=tarn&sort=title"; to != want {
		t.Errorf("archiving leads to %s, want %s", to, want)
	}
	p = get(t, s, to, 200)
	p.sound()
	p.says("“House 2” is archived with all its revisions.", "Restore it")
	if got := titles("/designs?archived=yes"); !slices.Equal(got, []string{"House 2"}) {
		t.Errorf("archived: %q", got)
	}
	get(t, s, paths["House 2"], 200).says("This design is archived.", "Restore it")
	goTo(t, s, paths["House 2"]+"/restore", url.Values{})
	if got := titles("/designs?archived=yes"); len(got) != 0 {
		t.Errorf("archived after restoring: %q", got)
	}

	// Duplicate: once for each press on a page, however often that is sent.
	page := get(t, s, "/designs", 200)
	request := attr(page.named("request"), "value")
	to = goTo(t, s, paths["House 10"]+"/duplicate", url.Values{"request": {request}})
	if again := goTo(t, s, paths["House 10"]+"/duplicate", url.Values{"request": {request}}); again != to {
		t.Errorf("the same press makes %s and %s", to, again)
	}
	if other := goTo(t, s, paths["House 2"]+"/duplicate", url.Values{"request": {request}}); other == to {
		t.Error("another row's press gives the first one's copy")
	}
	p = get(t, s, to, 200)
	p.says("This is a copy")
	if got := attr(p.named("/title"), "value"); got != "House 10 (copy)" {
		t.Errorf("the copy's title is %q", got)
	}
	for _, act := range []string{"archive", "restore", "duplicate"} {
		if w := send(t, s, "/designs/NOSUCH/"+act, url.Values{}); w.Code != 404 {
			t.Errorf("%s of no design: %d", act, w.Code)
		}
	}
}

func TestDesigns_Pages(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	d := design.Read(exampleDesign).Design
	for n := range 61 {
		d.Title = "House " + strconv.Itoa(n)
		if _, err := kept.SaveRevision(t.Context(), record.Nobody, store.Save{Frozen: record.Freeze(d, "")}); err != nil {
			t.Fatal(err)
		}
	}
	seen := map[string]int{}
	path, pages := "/designs?sort=title", 0
	for path != "" && pages < 9 {
		pages++
		p := get(t, s, path, 200)
		for _, n := range p.all(func(n *html.Node) bool { return attr(n, "class") == "opens" }) {
			seen[text(n)]++
		}
		if pages == 1 {
			p.says("61 designs, 50 on this page")
		}
		path = ""
		for _, n := range p.all(func(n *html.Node) bool { return attr(n, "rel") == "next" }) {
			path = attr(n, "href")
		}
	}
	if pages != 2 || len(seen) != 61 {
		t.Errorf("%d designs on %d pages, want 61 on 2", len(seen), pages)
	}
	for title, n := range seen {
		if n != 1 {
			t.Errorf("%s is listed %d times", title, n)
		}
	}
	for _, cursor := range []string{"nonsense", "eyJzIjoidGl0bGUiLCJrIjpbIngiXX0"} {
		if w := ask(t, s, "GET", "/designs?sort=headroom&at="+cursor, ""); w.Code != 303 || w.Header().Get("Location") != "/designs?sort=headroom" {
			t.Errorf("a cursor of nothing: %d %s", w.Code, w.Header().Get("Location"))
		}
	}
}

func TestRevisions(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{Version: "v9"})
	path := saveExample(t, s, nil)
	get(t, s, path+"/compare", 200).says("There is only one revision")
	goTo(t, s, "/designs", openSaved(t, s, path, map[string]string{"/strings/0/modules_in_series": "40", "note": "Too many"}))
	goTo(t, s, "/designs", openSaved(t, s, path, map[string]string{"/strings/0/modules_in_series": "11"}))
	p := get(t, s, path+"/revisions", 200)
	p.sound()
	p.says("3 revisions.", "Too many", "outside")
	if rows := p.all(func(n *html.Node) bool { return attr(n, "class") == "opens" }); len(rows) != 3 || attr(rows[0], "href") != path+"/revisions/3" {
		t.Errorf("%d rows", len(rows))
	}
	for _, show := range []string{"", "?show=working", "?show=sheet", "?show=nonsense"} {
		p := get(t, s, path+"/revisions/2"+show, 200)
		p.sound()
		p.says("Revision 2 of 3", "superseded", "Too many", "comes out the same, to the last digit", "Start from this revision", "Compare with revision 1")
		if n := p.all(func(n *html.Node) bool {
			return (n.DataAtom == atom.Input || n.DataAtom == atom.Select || n.DataAtom == atom.Textarea) && attr(n, "type") != "hidden"
		}); len(n) != 0 {
			t.Errorf("%s: a revision has %d fields that can be typed into", show, len(n))
		}
	}
	get(t, s, path+"/revisions/2?show=sheet", 200).says("Revision 2 of " + time.Now().UTC().Format("2006-01-02") + ". DRAFT, not released")
	for _, n := range []string{"0", "4", "x", "-1", "99999999999999999999"} {
		get(t, s, path+"/revisions/"+n, 404)
		get(t, s, path+"?from="+n, 404)
		get(t, s, path+"/compare?from=1&to="+n, 404)
	}
	p = get(t, s, path+"/compare?from=1&to=2", 200)
	p.sound()
	said := text(p.root)
	turned, inputs, results := strings.Index(said, "What gets worse"), strings.Index(said, "What was put in"), strings.Index(said, "What comes out")
	if turned < 0 || inputs < turned || results < inputs {
		t.Errorf("verdicts at %d, inputs at %d, results at %d of the page", turned, inputs, results)
	}
	get(t, s, path+"/compare", 200).says("Revision 2", "Revision 3", "What gets better")
	get(t, s, path+"/compare?from=2&to=2", 200).says("Choose two different revisions.")

	v := openSaved(t, s, path+"?from=1", nil)
	if v.Get("/strings/0/modules_in_series") != exampleFields(t, s, nil).Get("/strings/0/modules_in_series") || v.Get("base") != "3" {
		t.Errorf("started from revision 1: %s in series, base %s", v.Get("/strings/0/modules_in_series"), v.Get("base"))
	}
	get(t, s, path+"?from=1", 200).says("Filled with revision 1")
	if to := goTo(t, s, "/designs", v); to != path+"?saved=4" {
		t.Errorf("saving it leads to %s", to)
	}
	first, err := kept.Revision(t.Context(), designID(path), 1)
	if err != nil {
		t.Fatal(err)
	}
	fourth, err := kept.Revision(t.Context(), designID(path), 4)
	if err != nil || !bytes.Equal(first.Frozen.Document, fourth.Frozen.Document) || fourth.Note != "Back to revision 1" {
		t.Errorf("revision 4 is not what revision 1 was: %v, note %q", err, fourth.Note)
	}
	for _, of := range []string{"", "/revisions", "/revisions/1", "/compare"} {
		get(t, s, "/designs/NOSUCH"+of, 404)
	}
}

// TestRevision_EngineDiffers: where the engine of today finds something else in a
// revision than the one of then, the page says so and where.
func TestRevision_EngineDiffers(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{Version: "v9"})
	f := record.Freeze(design.Read(exampleDesign).Design, "v1")
	f.Result = bytes.Replace(f.Result, []byte(`"verdict":"caution"`), []byte(`"verdict":"within"`), 1)
	at := bytes.Index(f.Result, []byte(`"id":"voltage-ceiling"`))
	if at < 0 {
		t.Fatal("the example has no check of the voltage ceiling")
	}
	f.Result = append(bytes.Clone(f.Result[:at]), bytes.Replace(f.Result[at:], []byte(`"verdict":"within"`), []byte(`"verdict":"outside"`), 1)...)
	rev, err := kept.SaveRevision(t.Context(), record.Nobody, store.Save{Frozen: f})
	if err != nil {
		t.Fatal(err)
	}
	path := "/designs/" + string(rev.Design) + "/revisions/1"
	p := get(t, s, path, 200)
	p.sound()
	p.says("The engine of today finds something else", "engine v1 found: caution", "by engine v9", "Cold voltage", "outside, ", "within, ")
}

// TestRevision_Unread: a revision that the reader of today refuses still has its page,
// and its text opens in the form.
func TestRevision_Unread(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	f := record.Freeze(design.Read(exampleDesign).Design, "v1")
	f.Document = bytes.Replace(f.Document, []byte(`"mono-si"`), []byte(`"of-the-past"`), 1)
	f.SHA256 = sha256.Sum256(f.Document)
	rev, err := kept.SaveRevision(t.Context(), record.Nobody, store.Save{Frozen: f})
	if err != nil {
		t.Fatal(err)
	}
	path := "/designs/" + string(rev.Design)
	p := get(t, s, path+"/revisions/1", 200)
	p.sound()
	p.says("The reader of today refuses what was saved then", "The verdict then was caution.", "must be mono-si")
	p = get(t, s, path, 200)
	p.sound()
	if got := p.fields("design").Get("/modules/0/technology"); got != "of-the-past" {
		t.Errorf("the form opens with the cells %q", got)
	}
	goTo(t, s, "/designs", openSaved(t, s, path, map[string]string{"/modules/0/technology": "mono-si"}))
	get(t, s, path+"/compare", 200).says("cannot be compared value by value")
}

// TestSave_AskerGone: a save is done although the browser that asked has gone.
func TestSave_AskerGone(t *testing.T) {
	t.Parallel()
	s, kept := savingServer(t, Config{})
	v := exampleFields(t, s, nil)
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	for _, path := range []string{"/designs", "/drafts"} {
		r := httptest.NewRequestWithContext(ctx, "POST", path, strings.NewReader(v.Encode()))
		r.Host = "localhost"
		r.Header.Set("Content-Type", "application/x-www-form-urlencoded")
		s.ServeHTTP(httptest.NewRecorder(), r)
	}
	if all, err := kept.Designs(t.Context(), record.Listing{}); err != nil || all.Total != 1 {
		t.Errorf("%d designs: %v", all.Total, err)
	}
	if all, err := kept.Drafts(t.Context(), 9); err != nil || len(all) != 1 {
		t.Errorf("%d drafts: %v", len(all), err)
	}
}
