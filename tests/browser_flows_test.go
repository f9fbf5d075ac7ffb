package tests

import (
	"encoding/json"
	"fmt"
	"io"
	"maps"
	"net/http"
	"net/http/httptest"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/chromedp/cdproto/emulation"
	"github.com/chromedp/chromedp"
	"github.com/chromedp/chromedp/kb"

	"rimeline/server"
	"rimeline/sizing"
	"rimeline/sizing/design"
)

// entry is what is typed or chosen in the fields of the form, by their names.
type entry map[string]string

// aDesign is a small design as somebody types it from two datasheets (invented).
var aDesign = entry{
	"/title":                                              "Shed roof",
	"/site/name":                                          "Larkspur Mill",
	"/site/structure":                                     "other-building",
	"/site/coldest_c/value":                               "−21",
	"/site/coldest_c/unit":                                "°C",
	"/site/coldest_basis":                                 "record-low",
	"/site/hottest_c/value":                               "98.6",
	"/site/hottest_c/unit":                                "°F",
	"/site/hottest_basis":                                 "record-high",
	"/rulebook":                                           "nec-2023",
	"/modules/0/technology":                               "mono-si",
	"/modules/0/pmax_w":                                   "410",
	"/modules/0/voc_v":                                    "37.32 V",
	"/modules/0/isc_a":                                    "13.95",
	"/modules/0/vmp_v":                                    "31,26",
	"/modules/0/imp_a":                                    "13.12",
	"/modules/0/max_system_voltage_v":                     "1000",
	"/modules/0/voc_temp_coeff/value":                     "-0.27",
	"/modules/0/voc_temp_coeff/unit":                      "%/°C",
	"/modules/0/max_series_fuse_a":                        "25",
	"/inverters/0/max_dc_voltage_v":                       "1000",
	"/inverters/0/trackers/0/mppt_min_v":                  "160",
	"/inverters/0/trackers/0/mppt_max_v":                  "850",
	"/inverters/0/trackers/0/inputs":                      "2",
	"/inverters/0/trackers/0/max_input_current_a":         "26",
	"/inverters/0/trackers/0/max_short_circuit_current_a": "40",
	"/planes/0/positions":                                 "24",
	"/planes/0/hot_cell_rise_c/value":                     "30",
	"/planes/0/hot_cell_rise_c/unit":                      "°C",
}

// wiring is the strings of aDesign, typed after their row has been added.
var wiring = entry{
	"/strings/0/modules_in_series":   "12",
	"/strings/0/strings_in_parallel": "2",
}

// aDesignVerdict is what the engine says of the two above, read as a document.
func aDesignVerdict(t *testing.T) string {
	t.Helper()
	read := design.Read([]byte(`{"format": "rimeline-design/1", "title": "Shed roof", "rulebook": "nec-2023",
		"site": {"name": "Larkspur Mill", "structure": "other-building", "coldest_c": -21, "coldest_basis": "record-low", "hottest_c": {"value": 98.6, "unit": "°F"}, "hottest_basis": "record-high"},
		"modules": [{"id": "m1", "technology": "mono-si", "pmax_w": 410, "voc_v": 37.32, "isc_a": 13.95, "vmp_v": 31.26, "imp_a": 13.12, "max_system_voltage_v": 1000,
			"voc_temp_coeff": {"value": -0.27, "unit": "%/°C"}, "max_series_fuse_a": 25}],
		"inverters": [{"id": "i1", "max_dc_voltage_v": 1000, "trackers": [{"id": "t1", "mppt_min_v": 160, "mppt_max_v": 850, "inputs": 2, "max_input_current_a": 26, "max_short_circuit_current_a": 40}]}],
		"planes": [{"id": "p1", "module": "m1", "positions": 24, "hot_cell_rise_c": 30}],
		"strings": [{"inverter": "i1", "unit": 1, "tracker": "t1", "plane": "p1", "modules_in_series": 12, "strings_in_parallel": 2}]}`))
	if read.Design == nil {
		t.Fatal(read.Faults)
	}
	return sizing.Size(read.Design).Verdict.String()
}

// named is the field with a name.
func named(name string) chromedp.CSS { return chromedp.CSS(fmt.Sprintf("[name=%q]", name)) }

// value returns what stands in a field.
func (b *tab) value(name string) string {
	b.t.Helper()
	return eval[string](b, fmt.Sprintf(`document.querySelector('[name=%q]').value`, name))
}

// retype replaces what stands in a field, key by key.
func (b *tab) retype(name, text string) {
	b.t.Helper()
	b.do(chromedp.Focus(named(name)), chromedp.Evaluate[chromedp.Void]("document.activeElement.select()"))
	if text == "" {
		b.press(kb.Delete)
		return
	}
	b.press(text)
}

// tabTo moves the focus on until the expression about the element "e" that has it is
// true, as someone does who has no mouse.
func (b *tab) tabTo(expression string) {
	b.t.Helper()
	for range 400 {
		b.press(kb.Tab)
		if eval[bool](b, "(e => "+expression+")(document.activeElement)") {
			return
		}
	}
	b.t.Fatalf("the tab key never comes to an element with %s", expression)
}

// fill goes through the page with the tab key and fills in what it comes by.
func (b *tab) fill(fields entry) {
	b.t.Helper()
	left := maps.Clone(fields)
	for range 400 {
		name := eval[string](b, `document.activeElement.name || ""`)
		if text, ok := left[name]; ok {
			delete(left, name)
			if eval[string](b, "document.activeElement.tagName") == "SELECT" {
				for range 40 {
					if b.value(name) == text {
						break
					}
					b.press(kb.ArrowDown)
				}
				if got := b.value(name); got != text {
					b.t.Fatalf("%s: the arrow key ends at %q and never comes by %q", name, got, text)
				}
			} else {
				b.do(chromedp.Evaluate[chromedp.Void]("document.activeElement.select()"))
				b.press(text)
			}
		}
		if len(left) == 0 {
			return
		}
		b.press(kb.Tab)
	}
	b.t.Fatalf("the tab key never comes to %q", slices.Sorted(maps.Keys(left)))
}

// submit presses Enter in a field and waits for the page that answers.
func (b *tab) submit(name string) {
	b.t.Helper()
	b.do(chromedp.Focus(named(name)))
	b.wait("document.readyState === 'complete'")
	b.do(chromedp.Evaluate[chromedp.Void]("document.documentElement.dataset.before = 'yes'"))
	b.enter()
	b.wait("document.readyState === 'complete' && !document.documentElement.dataset.before")
}

const verdictNow = `document.getElementById("answer-now").dataset.verdict`

// TestBrowser_Keyboard: from the start page to the answer without a mouse, with
// script and without. What is typed is as people type it: a sign of minus that a
// keyboard does not have, a unit, a decimal comma, °F.
func TestBrowser_Keyboard(t *testing.T) {
	needBrowser(t)
	want := aDesignVerdict(t)
	site := startSite(t)
	for _, script := range []bool{true, false} {
		t.Run(fmt.Sprintf("script=%t", script), func(t *testing.T) {
			b := openTab(t, site, desk, script)
			b.open("/")
			b.tabTo(`e.pathname === "/design" && e.classList.contains("main")`)
			b.enter()
			b.wait(`location.pathname === "/design" && document.readyState === "complete"`)
			b.fill(aDesign)
			b.tabTo(`e.value === "add /strings"`)
			b.press(" ")
			b.wait(`!!document.querySelector('[name="/strings/0/modules_in_series"]')`)
			b.fill(wiring)
			if script {
				b.wait(verdictNow + ` !== "waiting"`)
				if got := eval[string](b, verdictNow); got != want {
					t.Errorf("the answer while typing is %q, want %q", got, want)
				}
			}
			b.submit("/strings/0/modules_in_series")
			if got := eval[string](b, verdictNow); got != want {
				t.Errorf("the answer is %q, want %q", got, want)
			}
			for name, typed := range aDesign {
				if got := b.value(name); got != typed && !strings.HasSuffix(name, "/unit") {
					t.Errorf("%s was typed as %q and stands there as %q", name, typed, got)
				}
			}
			b.sound()
		})
	}
}

// TestBrowser_Faults: each slip is named where it was made, nothing of it is put
// right in silence, and what was typed stays.
func TestBrowser_Faults(t *testing.T) {
	needBrowser(t)
	site := startSite(t)
	slips := []struct {
		name, field, typed, tells string
	}{
		{"another unit", "/modules/0/voc_v", "37.32 A", "A"},
		{"a minus lost", "/modules/0/voc_temp_coeff/value", "0.27", "negative"},
		{"a word", "/modules/0/pmax_w", "four hundred", "four hundred"},
		{"nothing", "/site/coldest_c/value", "", ""},
		{"one too many", "/modules/0/isc_a", "13.95 14.1", "13.95 14.1"},
		{"not whole", "/planes/0/positions", "12.5", "12.5"},
	}
	for _, script := range []bool{true, false} {
		b := openTab(t, site, desk, script)
		for _, c := range slips {
			t.Run(fmt.Sprintf("%s, script=%t", c.name, script), func(t *testing.T) {
				b.in(t, func() {
					b.open("/example")
					b.retype(c.field, c.typed)
					if script {
						b.wait(verdictNow + ` === "waiting"`)
						if b.value(c.field) != c.typed {
							t.Errorf("while typing, %q became %q", c.typed, b.value(c.field))
						}
					}
					b.submit(c.field)
					if got := b.value(c.field); got != c.typed {
						t.Errorf("%q was typed and %q stands there", c.typed, got)
					}
					id := eval[string](b, fmt.Sprintf(`document.querySelector('[name=%q]').id`, c.field))
					fault := eval[string](b, fmt.Sprintf(`document.getElementById(%q + "-fault")?.textContent || ""`, id))
					if fault == "" || !strings.Contains(fault, c.tells) {
						t.Errorf("beside the field stands %q, want a fault that tells %q", fault, c.tells)
					}
					if !eval[bool](b, fmt.Sprintf(`document.querySelector('[name=%q]').getAttribute("aria-describedby").includes(%q)`, c.field, id+"-fault")) {
						t.Error("the field does not point to its fault, so a screen reader does not tell it")
					}
					if got := eval[string](b, verdictNow); got != "waiting" {
						t.Errorf("a design with a fault has the answer %q", got)
					}
					if got := eval[string](b, "document.activeElement.id"); got != "faults" {
						t.Errorf("the focus is on %q, want it on the summary of the faults", got)
					}
					b.tabTo(fmt.Sprintf(`e.hash === %q`, "#"+id))
					b.enter()
					b.wait(fmt.Sprintf(`document.activeElement.id === %q || location.hash === %q`, id, "#"+id))
					b.sound()
				})
			})
		}
	}
}

// TestBrowser_LiveAnswer: the answer renews itself after a pause in typing, not for
// each key, and leaves the focus and the text alone.
func TestBrowser_LiveAnswer(t *testing.T) {
	needBrowser(t)
	b := openTab(t, startSite(t), desk, true)
	b.open("/example")
	before := eval[string](b, verdictNow)
	if before == "outside" {
		t.Fatal("the example is outside")
	}
	b.retype("/strings/0/modules_in_series", "40")
	b.wait(verdictNow + ` === "outside"`)
	if got := eval[string](b, `document.activeElement.name`) + " " + b.value("/strings/0/modules_in_series"); got != "/strings/0/modules_in_series 40" {
		t.Errorf("after the answer was renewed the focus and the text are %q", got)
	}
	b.wait(`document.getElementById("announce").textContent !== ""`)
	b.retype("/strings/0/modules_in_series", "12")
	b.wait(verdictNow + ` === "` + before + `"`)

	asked := func() int {
		n := 0
		for _, r := range b.sent() {
			if r == "POST /design/answer" {
				n++
			}
		}
		return n
	}
	start := asked()
	const typed = "a title of forty keys, typed in one go ."
	b.retype("/title", typed)
	b.wait(`document.getElementById("stale").hidden`)
	if n := asked() - start; n >= len(typed)/2 {
		t.Errorf("%d keys sent %d requests: the answer is to wait for a pause", len(typed), n)
	}
	b.sound()
}

// TestBrowser_ButtonRightAfterTyping: a button that is pressed before the answer to
// the last key was asked for does what it says, however slow the service is.
func TestBrowser_ButtonRightAfterTyping(t *testing.T) {
	needBrowser(t)
	fast := server.New(server.Config{})
	site := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		if r.URL.Path == "/design" {
			time.Sleep(400 * time.Millisecond) // longer than the pause after which the answer is asked for
		}
		fast.ServeHTTP(w, r)
	}))
	defer site.Close()
	b := openTab(t, site.URL, desk, true)
	b.open("/example")
	b.retype("/strings/0/modules_in_series", "11")
	b.do(chromedp.Evaluate[chromedp.Void](`document.querySelector('[value="add /strings"]').click()`))
	b.wait(`!!document.querySelector('[name="/strings/2/modules_in_series"]')`)
	if got := b.value("/strings/0/modules_in_series"); got != "11" {
		t.Errorf("what was typed before the button is %q, want 11", got)
	}
}

// TestBrowser_ServerGone: where the service stops answering, an old answer does not
// pass for a new one.
func TestBrowser_ServerGone(t *testing.T) {
	needBrowser(t)
	site := httptest.NewServer(server.New(server.Config{}))
	defer site.Close()
	b := openTab(t, site.URL, desk, true)
	b.open("/example")
	site.CloseClientConnections()
	site.Close()
	b.retype("/strings/0/modules_in_series", "40")
	b.wait(`!document.getElementById("stale").hidden && document.getElementById("stale").textContent.includes("does not answer")`)
	if got := b.value("/strings/0/modules_in_series"); got != "40" {
		t.Errorf("the field holds %q", got)
	}
}

// TestBrowser_Reload: what was typed is there again after a reload, and a fresh form
// offers it.
func TestBrowser_Reload(t *testing.T) {
	needBrowser(t)
	site := startSite(t)
	b := openTab(t, site, desk, true)
	b.open("/design")
	b.retype("/title", "Half a design")
	b.retype("/modules/0/voc_v", "37,3")
	b.wait(`(localStorage.getItem("rimeline.drafts") || "").includes("37,3")`)
	b.do(chromedp.Reload())
	b.wait(`document.querySelector('[name="/modules/0/voc_v"]').value === "37,3"`)
	if got := b.value("/title"); got != "Half a design" {
		t.Errorf("after a reload the title is %q", got)
	}
	b.sound()

	fresh := openTab(t, site, desk, true)
	fresh.open("/design")
	fresh.wait(`document.getElementById("offer").textContent.includes("Half a design")`)
	if got := fresh.value("/title"); got != "" {
		t.Errorf("a fresh form begins with the title %q, before anyone asked for it", got)
	}
	fresh.do(chromedp.Click(chromedp.CSS("#offer button")))
	fresh.wait(`document.querySelector('[name="/modules/0/voc_v"]').value === "37,3"`)
	fresh.sound()
}

// TestBrowser_FileAndBack: a design that is saved as a file and opened again is the
// same, with script and without.
func TestBrowser_FileAndBack(t *testing.T) {
	needBrowser(t)
	site := startSite(t)
	const title = `Ånge "7½" <b>roof</b> & co`
	for _, script := range []bool{true, false} {
		t.Run(fmt.Sprintf("script=%t", script), func(t *testing.T) {
			b := openTab(t, site, desk, script)
			b.open("/example")
			b.retype("/title", title)
			verdict := eval[string](b, verdictNow)
			sent := eval[string](b, `new URLSearchParams(new FormData(document.getElementById("design"))).toString()`)
			resp, err := http.Post(site+"/design/file", "application/x-www-form-urlencoded", strings.NewReader(sent))
			if err != nil {
				t.Fatal(err)
			}
			defer resp.Body.Close()
			saved, err := io.ReadAll(resp.Body)
			if err != nil {
				t.Fatal(err)
			}
			if d := resp.Header.Get("Content-Disposition"); resp.StatusCode != 200 || !strings.HasPrefix(d, "attachment") {
				t.Fatalf("save: %s, Content-Disposition %q", resp.Status, d)
			}
			if read := design.Read(saved); read.Design == nil || read.Design.Title != title {
				t.Fatalf("what was saved is not the design: %v\n%s", read.Faults, saved)
			}
			file := filepath.Join(t.TempDir(), "saved.json")
			if err := os.WriteFile(file, saved, 0o644); err != nil {
				t.Fatal(err)
			}
			b.open("/")
			b.do(chromedp.Click(chromedp.CSS(".open-file summary")),
				chromedp.SetUploadFiles(chromedp.CSS("#open-start"), []string{file}))
			b.leave(".open-file button")
			if got := b.value("/title"); got != title {
				t.Errorf("the title is %q, want %q", got, title)
			}
			if got := eval[string](b, verdictNow); got != verdict {
				t.Errorf("the verdict is %q, want %q as before it was saved", got, verdict)
			}
			b.sound()
		})
	}
}

// TestBrowser_NothingTypedRuns: markup that is typed stays text on every page.
func TestBrowser_NothingTypedRuns(t *testing.T) {
	needBrowser(t)
	b := openTab(t, startSite(t), desk, true)
	const hostile = `"'><img src=x onerror=alert(1)><script>alert(2)</script>`
	for _, page := range []string{"", "/design/working", "/design/sheet"} {
		b.open("/example")
		b.retype("/title", hostile)
		b.retype("/modules/0/model", hostile)
		b.retype("/planes/0/id", hostile)
		b.submit("/title")
		if got := b.value("/title"); got != hostile {
			t.Errorf("the title is %q", got)
		}
		if page != "" {
			b.leave(fmt.Sprintf("button[formaction=%q]", page))
			if text := eval[string](b, `document.getElementById("main").textContent`); !strings.Contains(text, hostile) {
				t.Errorf("%s does not show what was typed", page)
			}
		}
		if n := eval[int](b, `document.querySelectorAll("main img, main script").length`); n != 0 {
			t.Errorf("%s: %d elements were made of what was typed", page, n)
		}
		for _, c := range b.takeComplaints() {
			t.Errorf("%s: %s", page, c)
		}
	}
}

// TestBrowser_FocusIsSeen: on a phone, where the verdict stays at the foot of the
// screen, nothing covers the field that has the focus.
func TestBrowser_FocusIsSeen(t *testing.T) {
	needBrowser(t)
	b := openTab(t, startSite(t), phone, true)
	b.open("/example")
	seen := map[string]bool{}
	for range 400 {
		b.press(kb.Tab)
		if eval[bool](b, "document.activeElement === document.body") {
			break
		}
		var at struct {
			Name    string
			Covered string
		}
		raw := eval[[]byte](b, `(async () => {
			await new Promise(requestAnimationFrame)
			const e = document.activeElement, r = e.getBoundingClientRect()
			const x = r.left + r.width / 2, y = r.top + Math.min(r.height, innerHeight) / 2
			const top = document.elementFromPoint(x, y)
			const ok = top && (e.contains(top) || top.contains(e) && top !== document.body && top !== document.documentElement || top.closest("label")?.control === e)
			return {name: e.name || e.id || e.textContent.trim().slice(0, 30), covered: ok ? "" : "at y " + Math.round(y) + " of " + innerHeight + ": " + (top ? top.outerHTML.slice(0, 80) : "nothing")}
		})()`)
		if err := json.Unmarshal(raw, &at); err != nil {
			t.Fatal(err)
		}
		if at.Covered != "" {
			t.Errorf("%s has the focus and is not seen: %s", at.Name, at.Covered)
		}
		seen[at.Name] = true
	}
	if !seen["/modules/0/voc_v"] || !seen["/strings/1/modules_in_series"] {
		t.Errorf("the tab key did not come through the form; it came to %q", slices.Sorted(maps.Keys(seen)))
	}
}

// TestBrowser_Paper: what is printed needs no colour and no screen.
func TestBrowser_Paper(t *testing.T) {
	needBrowser(t)
	site := startSite(t)
	for _, page := range []string{"/design/working", "/design/sheet"} {
		t.Run(page, func(t *testing.T) {
			b := openTab(t, site, desk, true)
			b.open("/example")
			b.leave(fmt.Sprintf("button[formaction=%q]", page))
			b.do(
				command(emulation.SetEmulatedMedia, emulation.SetEmulatedMediaParams{Media: "print"}),
				command(emulation.SetEmulatedVisionDeficiency, emulation.SetEmulatedVisionDeficiencyParams{Type: emulation.SetEmulatedVisionDeficiencyTypeAchromatopsia}),
			)
			b.picture("paper" + strings.ReplaceAll(page, "/", " "))
			if shown := eval[[]string](b, `[...document.querySelectorAll("nav, button, .skip, .no-print")].filter(e => e.checkVisibility()).map(e => e.outerHTML.slice(0, 80))`); len(shown) > 0 {
				t.Errorf("what is for the screen alone is printed: %q", shown)
			}
			if silent := eval[[]string](b, `[...document.querySelectorAll(".mark")].filter(e => !["within", "caution", "unconfirmed", "outside"].includes(e.textContent.trim())).map(e => e.outerHTML)`); len(silent) > 0 {
				t.Errorf("a verdict is not in words: %q", silent)
			}
			if closed := eval[int](b, `[...document.querySelectorAll("details:not([open])")].filter(e => e.checkVisibility()).length`); closed > 0 {
				t.Errorf("%d folded parts are printed folded", closed)
			}
			pdf := ask(b, chromedp.PrintToPDF(chromedp.PDFPreferCSSPageSize()))
			if !strings.HasPrefix(string(pdf), "%PDF-") || len(pdf) < 10_000 {
				t.Errorf("printing made %d bytes", len(pdf))
			}
		})
	}
}

// TestBrowser_FirstLoad: the first page, with all that it needs, is at most 100 KiB.
func TestBrowser_FirstLoad(t *testing.T) {
	needBrowser(t)
	site := startSite(t)
	for _, path := range []string{"/", "/design", "/example"} {
		b := openTab(t, site, desk, true)
		b.open(path)
		b.wait(`document.readyState === "complete"`)
		b.mu.Lock()
		received := b.bytes
		b.mu.Unlock()
		if received == 0 || received > 100<<10 {
			t.Errorf("%s: the first load is %d bytes, want at most %d", path, received, 100<<10)
		}
		t.Log(path, "first load:", strconv.FormatInt(received, 10), "bytes")
	}
}
