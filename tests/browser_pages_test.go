package tests

import (
	"io"
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"

	"github.com/chromedp/cdproto/emulation"
)

// sitePages is every page of the site and how a visitor comes to it.
var sitePages = []struct {
	name string
	open func(b *tab)
}{
	{"start", func(b *tab) { b.open("/") }},
	{"empty design", func(b *tab) { b.open("/design") }},
	{"example", func(b *tab) { b.open("/example") }},
	{"design with faults", func(b *tab) { b.open("/design"); b.leave("#design button.main") }},
	{"working", func(b *tab) { b.open("/example"); b.leave(`button[formaction="/design/working"]`) }},
	{"sheet", func(b *tab) { b.open("/example"); b.leave(`button[formaction="/design/sheet"]`) }},
	{"no such page", func(b *tab) { b.open("/no-such-page") }},
}

// TestBrowser_EveryPage looks at every page on screens of several widths, with script
// and without, and in the dark.
func TestBrowser_EveryPage(t *testing.T) {
	needBrowser(t)
	site := startSite(t)
	for _, c := range []struct {
		name   string
		size   viewport
		script bool
		dark   bool
	}{
		{"desk", desk, true, false},
		{"desk without script", desk, false, false},
		{"desk in the dark", desk, true, true},
		{"phone", phone, true, false},
		{"phone without script", phone, false, false},
		{"narrow", narrow, true, false},
	} {
		t.Run(c.name, func(t *testing.T) {
			b := openTab(t, site, c.size, c.script)
			if c.dark {
				b.do(command(emulation.SetEmulatedMedia, emulation.SetEmulatedMediaParams{
					Features: []*emulation.MediaFeature{{Name: "prefers-color-scheme", Value: "dark"}},
				}))
			}
			for _, p := range sitePages {
				t.Run(p.name, func(t *testing.T) {
					b.in(t, func() {
						p.open(b)
						b.picture(p.name + ", " + c.name)
						b.sound()
					})
				})
			}
		})
	}
}

// TestBrowser_SeesFaults: the harness finds what it should in a page full of faults,
// and in pages without script none runs.
func TestBrowser_SeesFaults(t *testing.T) {
	needBrowser(t)
	site := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		w.Header().Set("Content-Security-Policy", "default-src 'none'; script-src 'self'; img-src *")
		if r.URL.Path == "/script.js" {
			w.Header().Set("Content-Type", "text/javascript")
			io.WriteString(w, `document.title = "script ran"; throw new Error("thrown on purpose")`)
			return
		}
		w.Header().Set("Content-Type", "text/html")
		io.WriteString(w, `<!doctype html><title>no script</title><script>1</script><script src="/script.js"></script>
			<img src="http://other.invalid/x.png" width="2000" height="10">`)
	}))
	defer site.Close()

	b := openTab(t, site.URL, phone, true)
	b.open("/")
	if barriers := strings.Join(b.barriers(), " "); !strings.Contains(barriers, "image-alt") || !strings.Contains(barriers, "html-has-lang") {
		t.Errorf("barriers = %s, want image-alt and html-has-lang among them", barriers)
	}
	if beyond := b.beyondTheEdge(); len(beyond) != 1 || !strings.HasPrefix(beyond[0], "<img") {
		t.Errorf("beyondTheEdge = %q, want the image", beyond)
	}
	complaints := strings.Join(b.takeComplaints(), " ")
	for _, want := range []string{"Content Security Policy", "thrown on purpose", "a request to another host"} {
		if !strings.Contains(complaints, want) {
			t.Errorf("complaints = %s, want %q among them", complaints, want)
		}
	}
	if title := eval[string](b, "document.title"); title != "script ran" {
		t.Errorf("with script: title %q", title)
	}

	without := openTab(t, site.URL, phone, false)
	without.open("/")
	if title := eval[string](without, "document.title"); title != "no script" {
		t.Errorf("without script: title %q, want that none ran", title)
	}
	without.barriers() // lets script in for axe-core and shuts it out again
	without.open("/")
	if title := eval[string](without, "document.title"); title != "no script" {
		t.Errorf("without script, after axe-core: title %q, want that none ran", title)
	}
	without.takeComplaints()
}
