package tests

import (
	"context"
	"fmt"
	"log/slog"
	"net"
	"net/url"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/chromedp/cdproto/emulation"
	"github.com/chromedp/chromedp"
	"github.com/jackc/pgx/v5"

	"rimeline/server"
	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/tests/testdb"
)

// savingSite is the site with a database, on an address that stays while the server is
// stopped and started.
type savingSite struct {
	t       *testing.T
	dsn     string
	listen  string // 127.0.0.1:12345
	address string
	kept    *store.Store // a second one beside the server's, to look at what is saved
	end     func()
}

func startSavingSite(t *testing.T, dsn string) *savingSite {
	t.Helper()
	s := &savingSite{t: t, dsn: dsn, listen: "127.0.0.1:0", kept: openStore(t, dsn)}
	s.start()
	t.Cleanup(func() { s.end() })
	return s
}

func openStore(t *testing.T, dsn string) *store.Store {
	t.Helper()
	kept, err := store.Open(context.Background(), dsn, slog.New(slog.DiscardHandler))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(kept.Close)
	return kept
}

// migrateTables makes the tables in an empty database.
func migrateTables(ctx context.Context, dsn string) error {
	s, err := store.Open(ctx, dsn, nil)
	if err != nil {
		return err
	}
	defer s.Close()
	return s.Migrate(ctx)
}

func (s *savingSite) start() {
	s.t.Helper()
	l, err := net.Listen("tcp", s.listen)
	if err != nil {
		s.t.Fatal(err)
	}
	s.listen, s.address = l.Addr().String(), "http://"+l.Addr().String()
	kept, err := store.Open(context.Background(), s.dsn, slog.New(slog.DiscardHandler))
	if err != nil {
		s.t.Fatal(err)
	}
	ctx, stop := context.WithCancel(context.Background())
	ended := make(chan struct{})
	go func() {
		defer close(ended)
		// A browser may hold a connection open; that is no failure.
		_ = server.New(server.Config{
			StopTimeout: 100 * time.Millisecond,
			Saving:      func() (server.Saving, error) { return kept, nil },
		}).Serve(ctx, l)
	}()
	s.end = func() {
		stop()
		<-ended
		kept.Close()
	}
}

// restart stops the server and starts another one, which knows nothing of the first.
func (s *savingSite) restart() {
	s.t.Helper()
	s.end()
	s.start()
}

// drafts returns the title of every draft.
func (s *savingSite) drafts() (titles []string) {
	s.t.Helper()
	all, err := s.kept.Drafts(s.t.Context(), 99)
	if err != nil {
		s.t.Fatal(err)
	}
	for _, d := range all {
		titles = append(titles, d.Fields["/title"])
	}
	slices.Sort(titles)
	return titles
}

// designs returns every design in use.
func (s *savingSite) designs() []record.Design {
	s.t.Helper()
	page, err := s.kept.Designs(s.t.Context(), record.Listing{})
	if err != nil {
		s.t.Fatal(err)
	}
	return page.Designs
}

// await waits until something holds on the server.
func (s *savingSite) await(what string, holds func() bool) {
	s.t.Helper()
	for deadline := time.Now().Add(patience); !holds(); time.Sleep(10 * time.Millisecond) {
		if time.Now().After(deadline) {
			s.t.Fatalf("waited in vain until %s", what)
		}
	}
}

const keptNow = `document.getElementById("kept").textContent.includes("Saved as a draft")`

// waitKept waits until the page says that what was typed is kept, and the server has it.
func (b *tab) waitKept(s *savingSite, title string) {
	b.t.Helper()
	s.await("the draft "+title+" is kept", func() bool { return slices.Contains(s.drafts(), title) })
	b.wait(keptNow)
}

// saves presses Save and waits for the page that answers.
func (b *tab) saves() {
	b.t.Helper()
	b.do(chromedp.Evaluate[chromedp.Void]("document.documentElement.dataset.before = 'yes'"))
	b.do(chromedp.Click(chromedp.CSS("#save")))
	b.wait("document.readyState === 'complete' && !document.documentElement.dataset.before")
}

// goes clicks and waits for the page that answers.
func (b *tab) goes(selector string) {
	b.t.Helper()
	b.do(chromedp.Evaluate[chromedp.Void]("document.documentElement.dataset.before = 'yes'"))
	b.do(chromedp.Click(chromedp.CSS(selector)))
	b.wait("document.readyState === 'complete' && !document.documentElement.dataset.before")
}

func (b *tab) text(selector string) string {
	b.t.Helper()
	return eval[string](b, fmt.Sprintf(`document.querySelector(%q)?.textContent.replace(/\s+/g, " ").trim() || ""`, selector))
}

// TestBrowser_Autosave: within two seconds of the last key the server has the text as
// it was typed, the page says so, and many keys are few requests.
func TestBrowser_Autosave(t *testing.T) {
	needBrowser(t)
	s := startSavingSite(t, testdb.New(t, migrateTables))
	b := openTab(t, s.address, desk, true)
	b.open("/design")
	const title = "Forty keys that are typed in one go here"
	b.retype("/modules/0/voc_v", "37,3 ")
	b.retype("/title", title)
	last := time.Now()
	b.waitKept(s, title)
	if took := time.Since(last); took > 2*time.Second {
		t.Errorf("the draft was kept %v after the last key, want within 2 s", took)
	}
	sent := 0
	for _, r := range b.sent() {
		if r == "POST /drafts" {
			sent++
		}
	}
	if sent > 5 {
		t.Errorf("%d keys sent %d requests", len(title), sent)
	}
	if path := eval[string](b, "location.pathname"); !strings.HasPrefix(path, "/drafts/") {
		t.Errorf("the page is at %s, where a reload does not find the draft", path)
	}
	if said := b.text("#kept"); !strings.Contains(said, "Saved as a draft at "+time.Now().Format("15:")) {
		t.Errorf("the page says %q; the time should be this machine's own", said)
	}
	b.picture("draft is kept, desk")
	b.sound()

	d, err := s.kept.Drafts(t.Context(), 9)
	if err != nil || len(d) != 1 || d[0].Fields["/modules/0/voc_v"] != "37,3 " {
		t.Errorf("%d drafts: %v", len(d), err)
	}
	// Without a pause in typing it is kept all the same.
	stop := time.Now().Add(8 * time.Second)
	began := d[0].Version
	for n := 0; time.Now().Before(stop); n++ {
		b.retype("/site/name", fmt.Sprint("Site ", n))
		time.Sleep(200 * time.Millisecond)
		if now, err := s.kept.Draft(t.Context(), d[0].ID); err == nil && now.Version > began {
			return
		}
	}
	t.Error("someone who types without a pause for 8 s has nothing kept")
}

// TestBrowser_AutosaveChanges: what a button adds is kept as well as what is typed, and
// a page that is left at once leaves its text behind.
func TestBrowser_AutosaveChanges(t *testing.T) {
	needBrowser(t)
	s := startSavingSite(t, testdb.New(t, migrateTables))
	b := openTab(t, s.address, desk, true)
	b.open("/design")
	b.do(chromedp.Click(chromedp.CSS(`[value="add /planes"]`)))
	s.await("the added plane is kept", func() bool {
		all, err := s.kept.Drafts(t.Context(), 9)
		return err == nil && len(all) == 1 && all[0].Fields["/planes/1/id"] != ""
	})
	b.wait(keptNow)
	b.retype("/title", "Left at once")
	b.do(chromedp.Navigate(s.address + "/designs")) // within the pause
	s.await("what was typed last is kept", func() bool { return slices.Equal(s.drafts(), []string{"Left at once"}) })

	b.open("/design")
	b.retype("/title", "Closed at once")
	b.do(chromedp.Evaluate[chromedp.Void]("window.dispatchEvent(new PageTransitionEvent('pagehide'))"))
	b.close()
	s.await("what was typed before the tab was closed is kept", func() bool { return slices.Contains(s.drafts(), "Closed at once") })
}

// TestBrowser_DraftComesBack: a draft is there again after a reload, in another tab,
// after the browser was killed, and after the server was restarted.
func TestBrowser_DraftComesBack(t *testing.T) {
	needBrowser(t)
	exe, err := findBrowser()
	if err != nil {
		t.Fatal(err)
	}
	s := startSavingSite(t, testdb.New(t, migrateTables))
	fromList := func(b *tab, title string) {
		b.t.Helper()
		b.open("/designs")
		b.do(chromedp.Evaluate[chromedp.Void](fmt.Sprintf(`[...document.querySelectorAll(".drafts a")].find(a => a.textContent.includes(%q)).click()`, title)))
		b.wait(`!!document.getElementById("design") && document.readyState === "complete"`)
	}
	for _, way := range []struct {
		name string
		back func(b *tab, title string) *tab
	}{
		{"reload", func(b *tab, title string) *tab {
			b.do(chromedp.Reload())
			return b
		}},
		{"reload after a server restart", func(b *tab, title string) *tab {
			s.restart()
			b.do(chromedp.Reload())
			return b
		}},
		{"closed tab", func(b *tab, title string) *tab {
			b.close()
			again := openTab(t, s.address, desk, true)
			fromList(again, title)
			return again
		}},
		{"another browser", func(b *tab, title string) *tab {
			b.close()
			browser, end, err := startBrowser(exe, chromedp.UserDataDir(t.TempDir()))
			if err != nil {
				t.Fatal(err)
			}
			t.Cleanup(end)
			again := openTabOf(t, browser, s.address, desk, true)
			fromList(again, title)
			return again
		}},
	} {
		t.Run(way.name, func(t *testing.T) {
			b := openTab(t, s.address, desk, true)
			title := "Half a design, " + way.name
			b.in(t, func() {
				b.open("/design")
				b.retype("/modules/0/voc_v", "37,3")
				b.retype("/site/coldest_c/value", "−2")
				b.retype("/title", title)
				b.waitKept(s, title)
			})
			b = way.back(b, title)
			b.in(t, func() {
				b.wait(fmt.Sprintf(`document.querySelector('[name="/title"]').value === %q`, title))
				for name, want := range map[string]string{"/modules/0/voc_v": "37,3", "/site/coldest_c/value": "−2"} {
					if got := b.value(name); got != want {
						t.Errorf("%s comes back as %q, typed was %q", name, got, want)
					}
				}
				b.sound()
				b.retype("/site/name", "typed on")
				s.await("the same draft goes on", func() bool {
					all, err := s.kept.Drafts(t.Context(), 1)
					return err == nil && all[0].Fields["/site/name"] == "typed on" && all[0].Fields["/title"] == title
				})
				if n := len(s.drafts()); n != 1 {
					t.Errorf("%d drafts, want the one: %q", n, s.drafts())
				}
				b.wait(keptNow)
				b.goes(`form[data-discards] button`)
			})
		})
	}
	t.Run("killed browser", func(t *testing.T) {
		profile := t.TempDir()
		browser, end, err := startBrowser(exe, chromedp.UserDataDir(profile))
		if err != nil {
			t.Fatal(err)
		}
		t.Cleanup(end)
		b := openTabOf(t, browser, s.address, desk, true)
		b.open("/design")
		b.retype("/title", "Before the kill")
		b.waitKept(s, "Before the kill")
		process := chromedp.FromContext(browser).Browser.Process()
		if process == nil {
			t.Fatal("the browser has no process to kill")
		}
		if err := process.Kill(); err != nil {
			t.Fatal(err)
		}
		end()
		again, endAgain, err := startBrowser(exe, chromedp.UserDataDir(t.TempDir()))
		if err != nil {
			t.Fatal(err)
		}
		t.Cleanup(endAgain)
		a := openTabOf(t, again, s.address, desk, true)
		a.open("/")
		a.goes(".drafts a")
		if got := a.value("/title"); got != "Before the kill" {
			t.Errorf("the draft opens with the title %q", got)
		}
		b.takeComplaints()
	})
}

// TestBrowser_DraftOfDesign: a design with a draft opens as it was saved, tells what
// differs, and the draft can be restored and discarded.
func TestBrowser_DraftOfDesign(t *testing.T) {
	needBrowser(t)
	s := startSavingSite(t, testdb.New(t, migrateTables))
	b := openTab(t, s.address, desk, true)
	b.open("/example")
	b.saves()
	design := eval[string](b, "location.pathname")
	if !strings.HasPrefix(design, "/designs/") || eval[string](b, "location.search") != "" {
		t.Fatalf("after saving the page is at %s%s", design, eval[string](b, "location.search"))
	}
	if said := b.text(".said"); said != "Saved as revision 1." {
		t.Errorf("the page says %q", said)
	}
	b.retype("/modules/0/voc_v", "38.5")
	b.retype("/title", "Changed and left")
	b.waitKept(s, "Changed and left")
	b.close()

	b = openTab(t, s.address, phone, true)
	b.open(design)
	if got := b.value("/modules/0/voc_v"); got != "37.32" {
		t.Errorf("the design opens with Voc %q, not as it was saved", got)
	}
	offer := b.text("section.offer")
	for _, want := range []string{"There is a draft of", "2 inputs differ", "Voc", "37.32", "38.5", "Restore the draft"} {
		if !strings.Contains(offer, want) {
			t.Errorf("the offer does not say %q: %s", want, offer)
		}
	}
	if eval[bool](b, `!document.getElementById("offer").hidden`) {
		t.Error("the copy in this browser is offered besides the draft on the server, which is the same")
	}
	b.picture("draft is offered, phone")
	b.sound()
	b.goes("section.offer a.main")
	if got := b.value("/modules/0/voc_v") + b.value("/title"); got != "38.5Changed and left" {
		t.Errorf("the draft opens with %q", got)
	}
	b.saves()
	if said := b.text(".said"); said != "Saved as revision 2." || len(s.drafts()) != 0 {
		t.Errorf("the page says %q, and there are %d drafts", said, len(s.drafts()))
	}
	b.retype("/title", "To be discarded")
	b.waitKept(s, "To be discarded")
	b.open(design)
	b.goes("section.offer button")
	if got := b.value("/title"); got != "Changed and left" || len(s.drafts()) != 0 {
		t.Errorf("after discarding the title is %q, and there are %d drafts", got, len(s.drafts()))
	}
	b.wait(`document.getElementById("offer").hidden`)
}

// TestBrowser_TwoTabs: two tabs with the same draft, and two with the same design.
func TestBrowser_TwoTabs(t *testing.T) {
	needBrowser(t)
	s := startSavingSite(t, testdb.New(t, migrateTables))
	one := openTab(t, s.address, desk, true)
	one.open("/design")
	one.retype("/title", "Draft")
	one.waitKept(s, "Draft")
	path := eval[string](one, "location.pathname")
	two := openTab(t, s.address, phone, true)
	two.open(path)
	one.retype("/title", "Draft of tab one")
	one.waitKept(s, "Draft of tab one")
	two.retype("/title", "Draft of tab two")
	two.waitKept(s, "Draft of tab two")
	two.wait(`document.getElementById("kept").textContent.includes("Both are kept")`)
	if got := s.drafts(); !slices.Equal(got, []string{"Draft of tab one", "Draft of tab two"}) {
		t.Errorf("the drafts are %q", got)
	}
	two.retype("/title", "Draft of tab two, more")
	two.waitKept(s, "Draft of tab two, more")
	one.retype("/title", "Draft of tab one, more")
	one.waitKept(s, "Draft of tab one, more")
	if got := s.drafts(); len(got) != 2 {
		t.Errorf("the drafts are %q", got)
	}

	one.open("/example")
	one.saves()
	design := eval[string](one, "location.pathname")
	two.open(design)
	one.retype("/site/name", "Fern and Daughter")
	one.saves()
	two.retype("/strings/0/modules_in_series", "40")
	two.saves()
	said := two.text("main")
	for _, want := range []string{"Not saved yet: revision 2 came first", "Fern and Daughter", "Keep mine as revision 3", "What gets worse"} {
		if !strings.Contains(said, want) {
			t.Errorf("the page of the second tab does not say %q", want)
		}
	}
	two.picture("conflict, phone")
	two.sound()
	two.goes("#carried button.main")
	if said := two.text(".said"); said != "Saved as revision 3." {
		t.Errorf("keeping mine says %q", said)
	}
	list, err := s.kept.Revisions(t.Context(), record.ID(strings.TrimPrefix(design, "/designs/")))
	if err != nil || len(list) != 3 || list[0].Base != 2 {
		t.Errorf("revisions: %+v, %v", list, err)
	}
}

// TestBrowser_BackAndSave: someone goes back to the page that was saved, types on and
// saves again: it is the same design.
func TestBrowser_BackAndSave(t *testing.T) {
	needBrowser(t)
	s := startSavingSite(t, testdb.New(t, migrateTables))
	b := openTab(t, s.address, desk, true)
	b.open("/example")
	b.retype("/title", "First")
	b.saves()
	b.do(chromedp.Evaluate[chromedp.Void]("history.back()"))
	b.wait(`!!document.getElementById("design") && document.readyState === "complete" && !document.querySelector(".said")`)
	b.do(chromedp.Evaluate[chromedp.Void](`document.documentElement.dataset.before = "yes"
		document.querySelector('[name="/title"]').value = "Second"
		document.querySelector('[name="/title"]').dispatchEvent(new InputEvent("input", {bubbles: true}))
		document.getElementById("save").click()`))
	b.wait("document.readyState === 'complete' && !document.documentElement.dataset.before")
	designs := s.designs()
	if len(designs) != 1 || designs[0].Title != "Second" || designs[0].Revision != 2 {
		t.Errorf("saved are %+v, want one design with two revisions", designs)
	}
}

// TestBrowser_DatabaseStopped: the database goes away while someone works. Sizing goes
// on, nothing typed is lost, a save tells what to do, and the same page saves once when
// it is back.
func TestBrowser_DatabaseStopped(t *testing.T) {
	needBrowser(t)
	db := testdb.NewCluster(t)
	if err := migrateTables(t.Context(), db.DSN()); err != nil {
		t.Fatal(err)
	}
	s := startSavingSite(t, db.DSN())
	b := openTab(t, s.address, desk, true)
	b.open("/example")
	b.retype("/title", "Before")
	b.waitKept(s, "Before")

	db.Stop(t)
	b.retype("/strings/0/modules_in_series", "40")
	b.wait(verdictNow + ` === "outside"`)
	b.wait(`document.getElementById("kept").textContent.includes("the database does not answer")`)
	b.wait(`document.getElementById("kept").textContent.includes("kept in this browser")`)
	b.sound()
	b.saves()
	if got := b.value("/strings/0/modules_in_series") + " " + b.value("/title"); got != "40 Before" {
		t.Errorf("the page of the failed save holds %q", got)
	}
	if said := b.text(".refused"); !strings.Contains(said, "Everything that you typed stands below") {
		t.Errorf("the page says %q", said)
	}
	b.picture("not saved, desk")
	b.sound()

	// Whoever opens the form now is told, and finds saving there again without a reload.
	other := openTab(t, s.address, desk, true)
	other.open("/design")
	if said := other.text("#away"); !strings.Contains(said, "The database does not answer") {
		t.Errorf("a new form says %q", said)
	}
	other.retype("/title", "Begun without")
	other.wait(`document.getElementById("kept").classList.contains("failed")`)

	db.Start(t)
	s.await("the database answers", func() bool { return s.kept.Ready(t.Context()) == nil })
	b.saves()
	if said := b.text(".said"); said != "Saved as revision 1." {
		t.Errorf("once the database is back, saving says %q", said)
	}
	if n := len(s.designs()); n != 1 {
		t.Errorf("%d designs, want 1", n)
	}
	other.waitKept(s, "Begun without")
	other.wait(`!document.getElementById("save").hidden && !document.getElementById("away")`)
}

// TestBrowser_DatabaseStoppedInSave: the database goes away in the middle of a save.
func TestBrowser_DatabaseStoppedInSave(t *testing.T) {
	needBrowser(t)
	db := testdb.NewCluster(t)
	if err := migrateTables(t.Context(), db.DSN()); err != nil {
		t.Fatal(err)
	}
	s := startSavingSite(t, db.DSN())
	b := openTab(t, s.address, desk, true)
	b.open("/example")
	b.retype("/title", "In the middle")
	b.waitKept(s, "In the middle")
	block, err := pgx.Connect(t.Context(), db.DSN())
	if err != nil {
		t.Fatal(err)
	}
	defer block.Close(context.WithoutCancel(t.Context()))
	if _, err := block.Exec(t.Context(), "begin; lock table revision in access exclusive mode"); err != nil {
		t.Fatal(err)
	}
	b.do(chromedp.Evaluate[chromedp.Void](`document.documentElement.dataset.before = "yes"; document.getElementById("save").click()`))
	look := openStoreConn(t, db.DSN())
	s.await("the save waits in the database", func() bool {
		var n int
		err := look.QueryRow(t.Context(), "select count(*) from pg_locks where not granted").Scan(&n)
		return err == nil && n > 0
	})
	db.Stop(t)
	b.wait("document.readyState === 'complete' && !document.documentElement.dataset.before")
	if got := b.value("/title"); got != "In the middle" {
		t.Errorf("the title is %q", got)
	}
	b.sound()
	db.Start(t)
	s.await("the database answers", func() bool { return s.kept.Ready(t.Context()) == nil })
	if n := len(s.designs()); n != 0 {
		t.Errorf("half a save is saved: %d designs", n)
	}
	b.saves()
	if designs := s.designs(); len(designs) != 1 || designs[0].Revision != 1 {
		t.Errorf("after the second try: %+v", designs)
	}
}

func openStoreConn(t *testing.T, dsn string) *pgx.Conn {
	t.Helper()
	conn, err := pgx.Connect(t.Context(), dsn)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { conn.Close(context.Background()) })
	return conn
}

// TestBrowser_CopyInTheBrowser: what could not be kept on the server is in this browser,
// and is offered when both are back.
func TestBrowser_CopyInTheBrowser(t *testing.T) {
	needBrowser(t)
	s := startSavingSite(t, testdb.New(t, migrateTables))
	b := openTab(t, s.address, desk, true)
	b.open("/example")
	b.saves()
	design := eval[string](b, "location.pathname")
	s.end()
	b.retype("/site/name", "Typed into the void")
	b.wait(`document.getElementById("kept").textContent.includes("does not answer")`)
	b.sound()
	b.close()
	s.start()

	b = openTab(t, s.address, desk, true)
	b.open("/designs")
	b.do(chromedp.Evaluate[chromedp.Void](`document.querySelector(".entries tbody td.site").click()`)) // a row opens its design
	b.wait(`location.pathname === "` + design + `" && document.readyState === "complete"`)
	if got := b.value("/site/name"); got == "Typed into the void" {
		t.Error("the copy is in the form before anyone asked for it")
	}
	b.wait(`document.getElementById("offer").textContent.includes("In this browser alone is what you typed at") && document.getElementById("offer").textContent.includes("1 field differs")`)
	b.picture("copy is offered, desk")
	b.sound()
	b.do(chromedp.Click(chromedp.CSS("#offer button")))
	b.wait(`document.querySelector('[name="/site/name"]').value === "Typed into the void"`)
	s.await("what was restored is kept as a draft of the design", func() bool {
		all, err := s.kept.DraftsOf(t.Context(), record.ID(strings.TrimPrefix(design, "/designs/")), 9)
		return err == nil && len(all) == 1 && all[0].Fields["/site/name"] == "Typed into the void"
	})
	b.saves()
	if said := b.text(".said"); said != "Saved as revision 2." {
		t.Errorf("saving it says %q", said)
	}
}

// TestBrowser_SavedWithoutScript goes all the ways of saved designs without script.
func TestBrowser_SavedWithoutScript(t *testing.T) {
	needBrowser(t)
	s := startSavingSite(t, testdb.New(t, migrateTables))
	b := openTab(t, s.address, desk, false)
	says := func(want string) {
		t.Helper()
		if said := b.text("main"); !strings.Contains(said, want) {
			t.Errorf("%s does not say %q: %.300s", eval[string](b, "location.pathname"), want, said)
		}
	}
	b.open("/design")
	b.retype("/title", "Without script")
	b.goes("#keep-draft")
	says("Kept as a draft.")
	b.retype("/modules/0/voc_v", "37,x")
	b.goes("#keep-draft")
	b.open("/designs")
	b.goes(".drafts a")
	if got := b.value("/title") + b.value("/modules/0/voc_v"); got != "Without script37,x" {
		t.Errorf("the draft holds %q", got)
	}
	b.saves()
	says("keep this design from being sized")
	says("Its text is kept as a draft.")
	b.open("/designs")
	b.goes(".drafts a")
	b.goes("form[data-discards] button")
	says("The draft is discarded.")

	b.open("/example")
	b.saves()
	says("Saved as revision 1.")
	design := eval[string](b, "location.pathname")
	b.retype("/strings/0/modules_in_series", "40")
	b.retype("note", "Far too many")
	b.do(chromedp.Evaluate[chromedp.Void]("document.documentElement.dataset.before = 'yes'"))
	b.goes(".finish.saving button")
	says("Saved as revision 2.")
	b.goes(".whence a")
	says("2 revisions.")
	says("Far too many")
	b.goes(`.decide button`)
	says("What gets worse")
	b.open(design + "/revisions/1")
	says("superseded")
	b.goes(`.tabs a[href$="sheet"]`)
	says("Stringing sheet")
	b.goes(".toolbar a.main")
	says("Filled with revision 1")
	b.saves()
	says("Saved as revision 3.")

	b.open("/designs?q=larkspur&sort=title")
	b.goes(`[formaction$="/archive"]`)
	says("is archived with all its revisions")
	b.goes(".said button")
	says("is restored")
	b.goes(`[formaction$="/duplicate"]`)
	says("This is a copy")
	if n := len(s.designs()); n != 2 {
		t.Errorf("%d designs, want 2", n)
	}
	b.open("/designs")
	b.goes(".entries thead a")
	if got := eval[string](b, `document.querySelector("[aria-sort]").textContent.trim()`); got != "Title" {
		t.Errorf("sorted by %q", got)
	}
	b.retype("q", "copy")
	b.submit("q")
	if n := eval[int](b, `document.querySelectorAll(".entries tbody tr").length`); n != 1 {
		t.Errorf("the search finds %d", n)
	}
	b.sound()
}

// TestBrowser_SavedPages looks at every page about what is saved on several screens.
func TestBrowser_SavedPages(t *testing.T) {
	needBrowser(t)
	s := startSavingSite(t, testdb.New(t, migrateTables))
	setup := openTab(t, s.address, desk, true)
	setup.open("/example")
	setup.saves()
	design := eval[string](setup, "location.pathname")
	setup.retype("/strings/0/modules_in_series", "40")
	setup.retype("note", "Module changed after purchase")
	setup.saves()
	setup.retype("/title", "A draft of a design, with a title that is rather long for what it is")
	setup.waitKept(s, "A draft of a design, with a title that is rather long for what it is")
	draft := eval[string](setup, "location.pathname")
	setup.open("/design")
	setup.retype("/title", "Never saved")
	setup.waitKept(s, "Never saved")
	setup.close()
	pages := []struct{ name, path string }{
		{"start with designs", "/"},
		{"designs", "/designs"},
		{"no designs", "/designs?archived=yes"},
		{"found designs", "/designs?q=larkspur&verdict=outside&sort=title"},
		{"saved design", design + "?saved=2"},
		{"draft", draft + "?kept=yes"},
		{"revisions", design + "/revisions"},
		{"revision", design + "/revisions/1"},
		{"revision working", design + "/revisions/2?show=working"},
		{"revision sheet", design + "/revisions/2?show=sheet"},
		{"compared", design + "/compare?from=1&to=2"},
		{"nothing to compare", design + "/compare?from=1&to=1"},
		{"no such design", "/designs/" + url.PathEscape("no such")},
	}
	for _, c := range []struct {
		name   string
		size   viewport
		script bool
		dark   bool
	}{
		{"desk", desk, true, false},
		{"desk in the dark", desk, true, true},
		{"phone", phone, true, false},
		{"narrow without script", narrow, false, false},
	} {
		t.Run(c.name, func(t *testing.T) {
			b := openTab(t, s.address, c.size, c.script)
			if c.dark {
				b.do(command(emulation.SetEmulatedMedia, emulation.SetEmulatedMediaParams{
					Features: []*emulation.MediaFeature{{Name: "prefers-color-scheme", Value: "dark"}},
				}))
			}
			for _, p := range pages {
				t.Run(p.name, func(t *testing.T) {
					b.in(t, func() {
						b.open(p.path)
						b.picture(p.name + ", " + c.name)
						b.sound()
					})
				})
			}
		})
	}
}
