package server

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"net/http/httptest"
	"net/url"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/tests/testdb"
)

// titled is the example design under another title.
func titledText(t *testing.T, title string) string {
	t.Helper()
	var d map[string]json.RawMessage
	if err := json.Unmarshal([]byte(exampleText(t)), &d); err != nil {
		t.Fatal(err)
	}
	quoted, err := json.Marshal(title)
	if err != nil {
		t.Fatal(err)
	}
	d["title"] = quoted
	text, err := json.Marshal(d)
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

func decode[T any](t *testing.T, w *httptest.ResponseRecorder) T {
	t.Helper()
	var v T
	if err := json.Unmarshal(w.Body.Bytes(), &v); err != nil {
		t.Fatalf("%v: %s", err, w.Body)
	}
	return v
}

// TestAPIDesigns follows one design from its making to its archive.
func TestAPIDesigns(t *testing.T) {
	s, _ := savingServer(t, Config{Version: "v1.2.3"})
	p := newProgram(t, s)

	made := p.want(201, "POST", "/api/v1/designs?note=as+surveyed", titledText(t, "Alder <1>"), "Content-Type", "application/json")
	one, first := made.Header().Get("Location"), made.Header().Get("ETag")
	d := decode[apiDesign](t, made)
	if one != "/api/v1/designs/"+d.ID || d.Revision != 1 || d.Base != 0 || d.Note != "as surveyed" || d.Title != "Alder <1>" || d.Engine != "v1.2.3" {
		t.Errorf("made %s: %+v", one, d.apiSummary)
	}
	if want := fmt.Sprintf(`"1-%s"`, d.SHA256); first != want {
		t.Errorf("the ETag is %s, want %s", first, want)
	}
	sized := ask(t, s, "POST", "/api/v1/size", titledText(t, "Alder <1>"))
	if strings.TrimSpace(sized.Body.String()) != string(d.Result) {
		t.Error("the result differs from what /api/v1/size answers")
	}
	got := p.want(200, "GET", one, "")
	if got.Body.String() != made.Body.String() || got.Header().Get("ETag") != first {
		t.Errorf("GET answers %s with %s, POST answered %s with %s", got.Header().Get("ETag"), got.Body, first, made.Body)
	}

	revised := p.want(200, "PUT", one+"?note=one+more+string", titledText(t, "Alder 2"), "If-Match", first)
	second := revised.Header().Get("ETag")
	if d := decode[apiDesign](t, revised); d.Revision != 2 || d.Base != 1 || d.Title != "Alder 2" || second == first {
		t.Errorf("revised: %+v, ETag %s", d.apiSummary, second)
	}
	refused := p.want(412, "PUT", one, titledText(t, "Alder 3"), "If-Match", first)
	if p := decode[problem](t, refused); p.Newest != 2 {
		t.Errorf("the refusal says that the newest is %d, want 2", p.Newest)
	}
	if d := decode[apiDesign](t, p.want(200, "GET", one, "")); d.Revision != 2 || d.Title != "Alder 2" {
		t.Errorf("after the refusal there is %+v", d.apiSummary)
	}

	list := decode[struct{ Revisions []apiListedRevision }](t, p.want(200, "GET", one+"/revisions", "")).Revisions
	if len(list) != 2 || list[0].Revision != 2 || list[0].Note != "one more string" || list[1].Revision != 1 || list[1].SHA256 != d.SHA256 {
		t.Errorf("the revisions are %+v", list)
	}
	old := p.want(200, "GET", one+"/revisions/1", "")
	if v := decode[apiRevision](t, old); v.Design != d.ID || string(v.Document) != string(d.Document) || string(v.Result) != string(d.Result) || old.Header().Get("ETag") != first {
		t.Errorf("revision 1 is not what was saved: %s %s", old.Header().Get("ETag"), old.Body)
	}

	p.want(204, "DELETE", one, "", "If-Match", second)
	p.want(204, "DELETE", one, "", "If-Match", second) // again: it is done
	archived := p.want(200, "GET", one, "")
	third := archived.Header().Get("ETag")
	if d := decode[apiDesign](t, archived); d.ArchivedAt == nil || third == second {
		t.Errorf("archived at %v; the ETag is still %s", d.ArchivedAt, third)
	}
	p.want(412, "PUT", one, titledText(t, "Alder 3"), "If-Match", second)
	p.want(204, "POST", one+"/restore", "")
	p.want(412, "DELETE", one, "", "If-Match", third)
	p.want(200, "PUT", one, titledText(t, "Alder 3"), "If-Match", "*")
}

func TestAPIDesigns_IfMatch(t *testing.T) {
	s, _ := savingServer(t, Config{})
	p := newProgram(t, s)
	made := p.want(201, "POST", "/api/v1/designs", exampleText(t))
	one, tag := made.Header().Get("Location"), made.Header().Get("ETag")
	other := p.want(201, "POST", "/api/v1/designs", titledText(t, "another")).Header().Get("ETag")
	for _, c := range []struct {
		match  string
		status int
	}{
		{"", 428},
		{"W/" + tag, 412}, // a weak tag never matches here
		{other, 412},      // the hash is of another document
		{`"1"`, 412},
		{`"0-` + tag[3:], 412},
		{strings.TrimSuffix(tag, `"`) + `-archived"`, 412},
		{strings.ToUpper(tag), 412},
		{strings.Trim(tag, `"`), 400},
		{tag + " " + other, 400},
		{`"`, 400},
		{other + ", , " + tag, 200},
	} {
		header := []string{"If-Match", c.match}
		if c.match == "" {
			header = nil
		}
		if w := p.do("PUT", one, exampleText(t), header...); w.Code != c.status {
			t.Errorf("If-Match %s: %d, want %d: %s", c.match, w.Code, c.status, w.Body)
		}
	}
	if d := decode[apiDesign](t, p.want(200, "GET", one, "")); d.Revision != 2 {
		t.Errorf("there are %d revisions, want 2: one PUT was accepted", d.Revision)
	}
}

func TestAPIDesigns_IfNoneMatch(t *testing.T) {
	s, _ := savingServer(t, Config{})
	p := newProgram(t, s)
	made := p.want(201, "POST", "/api/v1/designs", exampleText(t))
	one, tag := made.Header().Get("Location"), made.Header().Get("ETag")
	for given, status := range map[string]int{tag: 304, "W/" + tag: 304, `"x", ` + tag: 304, "*": 304, `"x"`: 200, "nonsense": 200} {
		w := p.want(status, "GET", one, "", "If-None-Match", given)
		if w.Header().Get("ETag") != tag {
			t.Errorf("If-None-Match %s: the ETag is %s, want %s", given, w.Header().Get("ETag"), tag)
		}
	}
}

// TestAPIDesigns_TwoEditors: of many who save on the same revision at the same time
// one succeeds, and each of the others is told the newest.
func TestAPIDesigns_TwoEditors(t *testing.T) {
	s, _ := savingServer(t, Config{})
	made := ask(t, s, "POST", "/api/v1/designs", exampleText(t))
	one, tag := made.Header().Get("Location"), made.Header().Get("ETag")
	const editors = 8
	answers := make([]*httptest.ResponseRecorder, editors)
	var wg sync.WaitGroup
	for i := range editors {
		text := titledText(t, fmt.Sprint("editor ", i))
		wg.Go(func() { answers[i] = ask(t, s, "PUT", one, text, "If-Match", tag) })
	}
	wg.Wait()
	saved := 0
	for i, w := range answers {
		switch w.Code {
		case 200:
			saved++
		case 412:
			if p := decode[problem](t, w); p.Newest != 2 {
				t.Errorf("editor %d is told that the newest is %d, want 2", i, p.Newest)
			}
		default:
			t.Errorf("editor %d: %d %s", i, w.Code, w.Body)
		}
	}
	if saved != 1 {
		t.Errorf("%d of %d saved on the same revision, want 1", saved, editors)
	}
}

func TestAPIDesigns_Refusals(t *testing.T) {
	s, _ := savingServer(t, Config{})
	p := newProgram(t, s)
	wrong := strings.NewReplacer(`"rulebook"`, `"rule_book"`, `"title"`, `"titel"`).Replace(exampleText(t))
	sized := decode[problem](t, p.want(422, "POST", "/api/v1/size", wrong))
	for _, w := range []*httptest.ResponseRecorder{
		p.want(422, "POST", "/api/v1/designs", wrong),
		p.want(422, "PUT", "/api/v1/designs/none", wrong, "If-Match", "*"),
	} {
		if got := decode[problem](t, w); string(got.Errors) != string(sized.Errors) || len(got.Errors) < 100 {
			t.Errorf("the errors are %s, /api/v1/size has %s", got.Errors, sized.Errors)
		}
	}
	p.want(400, "POST", "/api/v1/designs?notes=x", exampleText(t))
	p.want(400, "POST", "/api/v1/designs?note=a&note=b", exampleText(t))
	p.want(400, "POST", "/api/v1/designs?note=%ff", exampleText(t))
	p.want(201, "POST", "/api/v1/designs?note="+strings.Repeat("ä", 1000), exampleText(t))
	p.want(400, "POST", "/api/v1/designs?note="+strings.Repeat("ä", 1001), exampleText(t))
	for _, n := range []string{"0", "-1", "x", "99999999999999999999"} {
		p.want(404, "GET", "/api/v1/designs/none/revisions/"+n, "")
	}
	w := ask(t, s, "PATCH", "/api/v1/designs/none", "")
	if w.Code != 405 || w.Header().Get("Allow") != "GET, HEAD, PUT, DELETE" {
		t.Errorf("PATCH: %d, Allow %q", w.Code, w.Header().Get("Allow"))
	}
}

type designPage struct {
	Designs        []apiListedDesign
	Total          int
	More           bool
	Next, Previous string
}

// TestAPIDesigns_Pages: following next gives every design once, in order, whatever is
// saved meanwhile; previous leads back.
func TestAPIDesigns_Pages(t *testing.T) {
	s, kept := savingServer(t, Config{})
	p := newProgram(t, s)
	want := []string{}
	for i := range 7 {
		title := fmt.Sprint("House ", i)
		p.want(201, "POST", "/api/v1/designs", titledText(t, title))
		want = append(want, title)
	}
	var got []string
	target := "/api/v1/designs?limit=3&sort=title&q=house"
	var pages []string
	for target != "" {
		page := decode[designPage](t, p.want(200, "GET", target, ""))
		if page.Total < 7 || page.More || (page.Previous == "") != (len(pages) == 0) {
			t.Errorf("page %d: total %d, more %t, previous %q", len(pages)+1, page.Total, page.More, page.Previous)
		}
		for _, d := range page.Designs {
			got = append(got, d.Title)
		}
		if page.Previous != "" {
			back := decode[designPage](t, p.want(200, "GET", page.Previous, ""))
			if len(back.Designs) != 3 || back.Designs[2].Title != want[3*len(pages)-1] {
				t.Errorf("before page %d: %+v", len(pages)+1, back)
			}
		}
		pages = append(pages, target)
		target = page.Next
		p.want(201, "POST", "/api/v1/designs", titledText(t, "House 0a")) // it comes before the place where we are
	}
	if !slices.Equal(got, want) {
		t.Errorf("the pages have %q, want %q", got, want)
	}
	for _, c := range []struct {
		query string
		want  []string
	}{
		{"q=house+6", want[6:]},
		{"q=none", []string{}},
		{"sort=title&reversed=true&limit=2", []string{"House 6", "House 5"}},
		{"verdict=outside", []string{}},
		{"archived=true", []string{"House 2"}},
		{"archived=false&q=house+2", []string{}},
	} {
		if c.query == "archived=true" {
			id := decode[designPage](t, p.want(200, "GET", "/api/v1/designs?q=house+2", "")).Designs[0].ID
			if err := kept.Archive(t.Context(), record.Nobody, record.ID(id)); err != nil {
				t.Fatal(err)
			}
		}
		titles := []string{}
		for _, d := range decode[designPage](t, p.want(200, "GET", "/api/v1/designs?"+c.query, "")).Designs {
			titles = append(titles, d.Title)
		}
		if !slices.Equal(titles, c.want) {
			t.Errorf("%s: %q, want %q", c.query, titles, c.want)
		}
	}
	next, err := url.Parse(decode[designPage](t, p.want(200, "GET", pages[0], "")).Next)
	if err != nil {
		t.Fatal(err)
	}
	for _, query := range []string{
		"limit=0", "limit=201", "limit=x", "limit=", "sort=colour", "sort=", "verdict=good", "archived=yes", "cursor=x", "limit=1&limit=2", "page=2", "q=%ff", "q=%zz",
		"sort=updated&cursor=" + url.QueryEscape(next.Query().Get("cursor")),
	} {
		if w := p.want(400, "GET", "/api/v1/designs?"+query, ""); decode[problem](t, w).Detail == "" {
			t.Errorf("%s: %s", query, w.Body)
		}
	}
}

// TestAPIRepeat: what a repetition under the same Idempotency-Key is answered.
func TestAPIRepeat(t *testing.T) {
	s, kept := savingServer(t, Config{})
	p := newProgram(t, s)
	text := exampleText(t)
	count := func(want int) {
		t.Helper()
		if page, err := kept.Designs(t.Context(), record.Listing{}); err != nil || page.Total != want {
			t.Errorf("there are %d designs (%v), want %d", page.Total, err, want)
		}
	}
	made := p.want(201, "POST", "/api/v1/designs", text, "Idempotency-Key", "k1")
	if made.Header().Get("Idempotency-Replayed") != "" {
		t.Error("the first answer calls itself a repetition")
	}
	for _, key := range []string{"k1", `"k1"`} { // the quotes of the draft standard are not part of it
		again := p.want(201, "POST", "/api/v1/designs", text, "Idempotency-Key", key)
		if again.Body.String() != made.Body.String() || again.Header().Get("Idempotency-Replayed") != "true" {
			t.Errorf("key %s: repeated: %v %s", key, again.Header(), again.Body)
		}
		for _, name := range []string{"ETag", "Location", "Content-Type"} {
			if again.Header().Get(name) != made.Header().Get(name) {
				t.Errorf("%s is %q in the repetition, was %q", name, again.Header().Get(name), made.Header().Get(name))
			}
		}
	}
	count(1)
	p.want(422, "POST", "/api/v1/designs", titledText(t, "another"), "Idempotency-Key", "k1")
	p.want(422, "POST", "/api/v1/designs?note=x", text, "Idempotency-Key", "k1")
	p.want(422, "POST", "/api/v1/equipment", `{"module":`+keptPiece(t, record.KindModule)+`}`, "Idempotency-Key", "k1")
	count(1)
	p.want(201, "POST", "/api/v1/designs", text, "Idempotency-Key", "k2")
	p.want(201, "POST", "/api/v1/designs", text)
	count(3)

	one, tag := made.Header().Get("Location"), made.Header().Get("ETag")
	revised := p.want(200, "PUT", one, text, "If-Match", tag, "Idempotency-Key", "k3")
	again := p.want(200, "PUT", one, text, "If-Match", tag, "Idempotency-Key", "k3") // not 412: its answer was lost
	if again.Body.String() != revised.Body.String() || decode[apiDesign](t, again).Revision != 2 {
		t.Errorf("the PUT is repeated as %s", again.Body)
	}
	p.want(412, "PUT", one, text, "If-Match", tag, "Idempotency-Key", "k4")
	p.want(422, "PUT", one, text, "If-Match", "*", "Idempotency-Key", "k3")

	// What was refused may be mended under its key.
	p.want(422, "POST", "/api/v1/designs", `{}`, "Idempotency-Key", "k5")
	p.want(201, "POST", "/api/v1/designs", text, "Idempotency-Key", "k5")

	for _, key := range []string{"", `""`, "ä", "a\tb", `a"b`, strings.Repeat("k", 201)} {
		p.want(400, "POST", "/api/v1/designs", text, "Idempotency-Key", key)
	}
	p.want(201, "POST", "/api/v1/designs", text, "Idempotency-Key", strings.Repeat("k", 200))
}

// crossedSaving is a store in which something happens in the middle of a request.
type crossedSaving struct {
	*store.Store
	remember func(ctx context.Context, do func(context.Context) (record.Answer, error)) error // nil for the store's own
	save     func()                                                                           // before each save
}

func (c *crossedSaving) Remember(ctx context.Context, actor record.Actor, key string, request [32]byte,
	do func(context.Context) (record.Answer, error)) (record.Answer, bool, error) {
	if c.remember != nil {
		return record.Answer{}, false, c.remember(ctx, do)
	}
	return c.Store.Remember(ctx, actor, key, request, do)
}

func (c *crossedSaving) SaveRevision(ctx context.Context, actor record.Actor, save store.Save) (record.Revision, error) {
	if c.save != nil {
		c.save()
	}
	return c.Store.SaveRevision(ctx, actor, save)
}

func (c *crossedSaving) SaveEquipment(ctx context.Context, actor record.Actor, e record.Equipment, request string) (record.Equipment, error) {
	if c.save != nil {
		c.save()
	}
	return c.Store.SaveEquipment(ctx, actor, e, request)
}

// TestAPIRepeat_AfterACrash: the service died between the save and the keeping of its
// answer. The repetition finds what was saved, and makes nothing new.
func TestAPIRepeat_AfterACrash(t *testing.T) {
	_, kept := savingServer(t, Config{})
	crossed := &crossedSaving{Store: kept}
	s, _ := testServer(Config{Saving: func() (Saving, error) { return crossed, nil }})
	p := newProgram(t, s)
	text := exampleText(t)
	crash := func(ctx context.Context, do func(context.Context) (record.Answer, error)) error {
		if _, err := do(ctx); err != nil {
			return err
		}
		return fmt.Errorf("%w: %w", record.ErrUnavailable, record.ErrUnknownOutcome)
	}
	twice := func(status int, method, target, body string, header ...string) *httptest.ResponseRecorder {
		t.Helper()
		crossed.remember = crash
		p.want(503, method, target, body, header...)
		crossed.remember = nil
		return p.want(status, method, target, body, header...)
	}
	made := twice(201, "POST", "/api/v1/designs", text, "Idempotency-Key", "k1")
	one, tag := made.Header().Get("Location"), made.Header().Get("ETag")
	revised := twice(200, "PUT", one, text, "If-Match", tag, "Idempotency-Key", "k2")
	if d := decode[apiDesign](t, revised); d.Revision != 2 {
		t.Errorf("repeated: revision %d, want 2", d.Revision)
	}
	revised = twice(200, "PUT", one, text, "If-Match", "*", "Idempotency-Key", "k2 *")
	if d := decode[apiDesign](t, revised); d.Revision != 3 {
		t.Errorf("repeated on *: revision %d, want 3", d.Revision)
	}
	module := `{"module":` + keptPiece(t, record.KindModule) + `}`
	made = twice(201, "POST", "/api/v1/equipment", module, "Idempotency-Key", "k3")
	one, tag = made.Header().Get("Location"), made.Header().Get("ETag")
	revised = twice(200, "PUT", one, module, "If-Match", tag, "Idempotency-Key", "k4")
	if e := decode[apiKept](t, revised); e.Version != 2 {
		t.Errorf("repeated: version %d, want 2", e.Version)
	}
	revised = twice(200, "PUT", one, module, "If-Match", "*", "Idempotency-Key", "k4 *")
	if e := decode[apiKept](t, revised); e.Version != 3 {
		t.Errorf("repeated on *: version %d, want 3", e.Version)
	}
	designs, err := kept.Designs(t.Context(), record.Listing{})
	equipment, err2 := kept.EquipmentList(t.Context(), record.EquipmentListing{})
	if designs.Total != 1 || equipment.Total != 1 || errors.Join(err, err2) != nil {
		t.Errorf("%d designs, %d pieces of equipment (%v), want one of each", designs.Total, equipment.Total, errors.Join(err, err2))
	}
}

// TestAPIRepeat_TwoServers: requests with one key that come to two servers on one
// database at the same time are done once, and all that are answered have one answer.
func TestAPIRepeat_TwoServers(t *testing.T) {
	dsn := testdb.New(t, migrate)
	one, kept := serverOn(t, dsn, Config{})
	two, _ := serverOn(t, dsn, Config{})
	text := exampleText(t)
	const each = 4
	answers := make([]*httptest.ResponseRecorder, 2*each)
	var wg sync.WaitGroup
	for i := range answers {
		wg.Go(func() {
			answers[i] = ask(t, []*Server{one, two}[i%2], "POST", "/api/v1/designs", text, "Idempotency-Key", "the same")
		})
	}
	wg.Wait()
	body := ""
	for i, w := range answers {
		switch {
		case w.Code == 409:
		case w.Code != 201 || body != "" && w.Body.String() != body:
			t.Errorf("answer %d: %d %s, want 201 and what the others have", i, w.Code, w.Body)
		default:
			body = w.Body.String()
		}
	}
	page, err := kept.Designs(t.Context(), record.Listing{})
	if page.Total != 1 || body == "" || err != nil {
		t.Errorf("%d designs (%v), want one", page.Total, err)
	}
}

// FuzzEntityTags: whatever the header, the tags that are found are such, and stand in
// it; and a tag of ours is read as what it was made of.
func FuzzEntityTags(f *testing.F) {
	f.Add(`"1-a", W/"b" ,,*`, uint32(3), true)
	f.Add(`"`, uint32(0), false)
	f.Add("\"1-"+strings.Repeat("0", 64)+"-archived\"", uint32(1<<31), true)
	f.Fuzz(func(t *testing.T, header string, revision uint32, archived bool) {
		number := int(revision)
		tags, err := readTags([]string{header})
		for _, tag := range append(tags.strong, tags.weak...) {
			if len(tag) < 2 || tag[0] != '"' || tag[len(tag)-1] != '"' || strings.Contains(tag[1:len(tag)-1], `"`) || !strings.Contains(header, tag) {
				t.Errorf("%q has the tag %q (%v)", header, tag, err)
			}
			if n, sum, gone, ok := namedRevision(tag); ok && withArchived(revisionTag(n, sum), gone) != tag {
				t.Errorf("%q is read as revision %d, %x, archived %t", tag, n, sum, gone)
			}
		}
		sum := [32]byte([]byte(fmt.Sprintf("%-32.32s", header))[:32])
		if n, s, gone, ok := namedRevision(withArchived(revisionTag(number, sum), archived)); !ok || n != number || s != sum || gone != archived {
			t.Errorf("revision %d, %x, archived %t is read as %d, %x, %t (%t)", number, sum, archived, n, s, gone, ok)
		}
	})
}

// underWay asks for every operation that is done once per key while the first request
// with its key is still at work; the client p sees the answers.
func underWay(t *testing.T, p *program, kept *store.Store, text, module string) {
	t.Helper()
	reached, goOn := make(chan bool), make(chan bool)
	crossed := &crossedSaving{Store: kept, save: func() { reached <- true; <-goOn }}
	s, _ := testServer(Config{Saving: func() (Saving, error) { return crossed, nil }})
	slow := newProgram(t, s)
	slow.seen = p.seen
	for _, c := range []struct{ list, body string }{{"/api/v1/designs", text}, {"/api/v1/equipment", module}} {
		made := p.want(201, "POST", c.list, c.body)
		for _, r := range []struct{ method, target string }{{"POST", c.list}, {"PUT", made.Header().Get("Location")}} {
			header := []string{"Idempotency-Key", "under way " + r.method + c.list, "If-Match", made.Header().Get("ETag")}
			ended := make(chan *httptest.ResponseRecorder)
			go func() { ended <- ask(t, s, r.method, r.target, c.body, header...) }()
			select {
			case <-reached:
			case <-time.After(10 * time.Second):
				t.Fatalf("%s %s did not come to its save", r.method, r.target)
			}
			slow.want(409, r.method, r.target, c.body, header...)
			goOn <- true
			first := <-ended
			again := slow.do(r.method, r.target, c.body, header...)
			if first.Code/100 != 2 || again.Body.String() != first.Body.String() || again.Header().Get("Idempotency-Replayed") != "true" {
				t.Errorf("%s %s: first %d, then %d %s", r.method, r.target, first.Code, again.Code, again.Body)
			}
		}
	}
}

func TestReady(t *testing.T) {
	ready, kept := savingServer(t, Config{})
	nothing, _ := testServer(Config{})
	starting, _ := testServer(Config{Saving: func() (Saving, error) { return nil, ErrStarting }})
	empty, err := store.Open(t.Context(), emptyDatabase(t), nil)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(empty.Close)
	old, _ := testServer(Config{Saving: func() (Saving, error) { return empty, nil }})
	unfit, _ := testServer(Config{Saving: func() (Saving, error) { return nil, fmt.Errorf("%w: a file was edited", ErrUnfit) }})
	for _, c := range []struct {
		name   string
		s      *Server
		status int
		says   string
	}{
		{"ready", ready, 200, "ready\n"},
		{"nothing is saved", nothing, 503, "without a database"},
		{"starting", starting, 503, "still starting"},
		{"no migration", old, 503, "cannot be used as it is"},
		{"a migration that cannot be applied", unfit, 503, "cannot be used as it is"},
		{"away", awayServer(t), 503, "cannot be reached"},
	} {
		w := ask(t, c.s, "GET", "/readyz", "")
		if w.Code != c.status || !strings.Contains(w.Body.String(), c.says) || w.Header().Get("Cache-Control") != "no-store" {
			t.Errorf("%s: %d %q, want %d and %q", c.name, w.Code, w.Body, c.status, c.says)
		}
		if w := ask(t, c.s, "GET", "/healthz", ""); w.Code != 200 {
			t.Errorf("%s: /healthz is %d", c.name, w.Code)
		}
	}
	kept.Close()
	if w := ask(t, ready, "GET", "/readyz", ""); w.Code != 503 {
		t.Errorf("when the database has gone: %d, want 503", w.Code)
	}
}
