package tests

import (
	"bytes"
	"fmt"
	"os"
	"slices"
	"strings"
	"testing"

	"github.com/chromedp/cdproto/emulation"
	"github.com/chromedp/chromedp"

	"rimeline/server/record"
	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/tests/testdb"
)

// keepExample keeps the module and the inverter of the example, a module of another
// power class, and one that is asked about; and saves the example.
func keepExample(t *testing.T, s *savingSite) (ids map[string]record.ID) {
	t.Helper()
	d := shownExample(t)
	ids = map[string]record.ID{}
	keep := func(kind record.Kind, document []byte) {
		t.Helper()
		e, faults := record.ReadEquipment(kind, document)
		if faults != nil {
			t.Fatal(faults)
		}
		e.Sources = map[string]string{"": "datasheet, rev. C", "/voc_v": "page 2, table 1"}
		kept, err := s.kept.SaveEquipment(t.Context(), record.Nobody, e, "")
		if err != nil {
			t.Fatal(err)
		}
		ids[kept.Model] = kept.ID
	}
	module := design.AppendModule(nil, &d.Modules[0])
	keep(record.KindModule, module)
	keep(record.KindModule, bytes.Replace(module, []byte("TD-410M"), []byte("TD-430M"), 1))
	keep(record.KindModule, bytes.Replace(bytes.Replace(module, []byte("TD-410M"), []byte("TD-39X"), 1), []byte(`"pmax_w":410`), []byte(`"pmax_w":390`), 1))
	keep(record.KindInverter, design.AppendInverter(nil, &d.Inverters[0]))
	return ids
}

// shownExample is the design that the site shows as its example.
func shownExample(t *testing.T) *design.Design {
	t.Helper()
	text, err := os.ReadFile("../sizing/design/testdata/example-design.json")
	if err != nil {
		t.Fatal(err)
	}
	read := design.Read(text)
	if read.Design == nil {
		t.Fatal(read.Faults)
	}
	return read.Design
}

// TestBrowser_EquipmentPages looks at every page of the equipment and of the swap on
// screens of several widths, with script and without, and in the dark.
func TestBrowser_EquipmentPages(t *testing.T) {
	needBrowser(t)
	s := startSavingSite(t, testdb.New(t, migrateTables))
	ids := keepExample(t, s)
	swap := func(b *tab) {
		b.open("/example")
		b.leave(`button[formaction="/design/swap"]`)
	}
	pages := []struct {
		name string
		open func(b *tab)
	}{
		{"modules", func(b *tab) { b.open("/equipment") }},
		{"inverters", func(b *tab) { b.open("/equipment?kind=inverter") }},
		{"nothing found", func(b *tab) { b.open("/equipment?q=nothing&archived=yes") }},
		{"new module", func(b *tab) { b.open("/equipment/new?kind=module") }},
		{"new inverter with faults", func(b *tab) {
			b.open("/equipment/new?kind=inverter")
			b.leave(`button[value^="add "]`)
			b.leave("#piece .finish button.main")
		}},
		{"module with a question", func(b *tab) { b.open("/equipment/" + string(ids["TD-39X"])) }},
		{"duplicate", func(b *tab) {
			b.open("/equipment/" + string(ids["TD-410M"]))
			b.leave(`button[formaction$="/duplicate"]`)
		}},
		{"two editors", func(b *tab) {
			b.open("/equipment/" + string(ids["TD-430M"]))
			now, err := s.kept.Equipment(t.Context(), ids["TD-430M"])
			if err == nil {
				now.Note += " and more"
				_, err = s.kept.SaveEquipment(t.Context(), record.Nobody, now, "")
			}
			if err != nil {
				b.t.Fatal(err)
			}
			b.leave("#piece .finish button.main")
		}},
		{"swap, nothing chosen", swap},
		{"swap, compared", func(b *tab) {
			swap(b)
			b.do(chromedp.Evaluate[chromedp.Void](fmt.Sprintf(`document.querySelector('[name="put:/modules/0"]').value = %q; document.querySelector('[name="typed:/site/coldest_c/value"]').value = "-85"`, ids["TD-39X"])))
			b.leave(`#carried .finish button.main`)
		}},
		{"swap, not complete", func(b *tab) {
			swap(b)
			b.do(chromedp.Evaluate[chromedp.Void](`document.querySelector('[name="typed:/modules/0/voc_v"]').value = "x"`))
			b.leave(`#carried .finish button.main`)
		}},
		{"design that offers what is kept", func(b *tab) { b.open("/design?equipment=" + string(ids["TD-430M"])) }},
	}
	for _, c := range []struct {
		name   string
		size   viewport
		script bool
		dark   bool
	}{
		{"desk", desk, true, false},
		{"desk in the dark", desk, true, true},
		{"phone without script", phone, false, false},
		{"narrow", narrow, true, false},
	} {
		t.Run(c.name, func(t *testing.T) {
			b := openTab(t, s.address, c.size, c.script)
			if c.dark {
				b.do(command(emulation.SetEmulatedMedia, emulation.SetEmulatedMediaParams{
					Features: []*emulation.MediaFeature{{Name: "prefers-color-scheme", Value: "dark"}},
				}))
			}
			for _, p := range pages {
				if c.dark && !slices.Contains([]string{"module with a question", "two editors", "swap, compared"}, p.name) {
					continue // their colours are those of other pages
				}
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

// TestBrowser_TakeAndKeep: with script, kept equipment goes into the form, the answer
// is renewed and the draft kept; what the design has goes the other way.
func TestBrowser_TakeAndKeep(t *testing.T) {
	needBrowser(t)
	s := startSavingSite(t, testdb.New(t, migrateTables))
	keepExample(t, s)
	b := openTab(t, s.address, desk, true)
	s.await("the page offers what is kept", func() bool { // which it does not wait for long
		b.open("/example")
		return eval[bool](b, `!!document.querySelector('[name="pick:/modules/0"]')`)
	})
	b.retype("/title", "Takes and keeps")
	b.do(chromedp.Evaluate[chromedp.Void](`(() => { const list = document.querySelector('[name="pick:/modules/0"]'); list.value = [...list.options].find((o) => o.text.startsWith("TD-39X")).value; })()`))
	b.do(chromedp.Click(chromedp.CSS(`[value="pick /modules/0"]`)))
	b.wait(`document.querySelector('[name="/modules/0/pmax_w"]').value === "390" && document.querySelector(".kept-said")?.textContent.includes("Copied")`)
	b.wait(`document.getElementById("answer-now").dataset.verdict === "unconfirmed"`) // for it is asked about
	if got := b.value("/sources/~1modules~10~1voc_v"); got != "page 2, table 1" {
		t.Errorf("where Voc stands: %q", got)
	}
	s.await("the draft holds what was taken", func() bool {
		all, err := s.kept.Drafts(t.Context(), 9)
		return err == nil && len(all) == 1 && all[0].Fields["/modules/0/pmax_w"] == "390" && all[0].Fields["/modules/0/model"] == "TD-39X"
	})
	b.retype("/modules/0/model", "TD-391")
	b.do(chromedp.Click(chromedp.CSS(`[value="keep /modules/0"]`)))
	b.wait(`document.querySelector(".kept-said")?.textContent.includes("It is kept:")`)
	b.picture("kept from a design, desk")
	b.sound()
	page, err := s.kept.EquipmentList(t.Context(), record.EquipmentListing{Words: "TD-391"})
	if err != nil || len(page.Equipment) != 1 || page.Equipment[0].Sources["/voc_v"] != "page 2, table 1" {
		t.Errorf("%v: kept is %+v", err, page.Equipment)
	}
}

// TestBrowser_SwapTakenOver: a temperature is tried, what turns is shown, and the change
// is taken over into a form that is still the same draft.
func TestBrowser_SwapTakenOver(t *testing.T) {
	needBrowser(t)
	s := startSavingSite(t, testdb.New(t, migrateTables))
	b := openTab(t, s.address, phone, true)
	b.open("/example")
	b.retype("/title", "Tries the cold")
	b.waitKept(s, "Tries the cold")
	draft := b.value("draft")
	b.leave(`button[formaction="/design/swap"]`)
	b.retype("typed:/site/coldest_c/value", "−80")
	if twin := b.text(`[data-of="typed-f-site-coldest_c"]`); twin != "= −112.0 °F" {
		t.Errorf("beside −80 °C stands %q", twin)
	}
	b.leave(`#carried .finish button.main`)
	if said, is := b.text(".compared td"), sizing.Size(shownExample(t)).Verdict.String(); !strings.HasPrefix(said, is) {
		t.Errorf("as it is: %q, want %s", said, is)
	}
	b.picture("swap compared, phone")
	b.sound()
	b.leave(`button[value="take"]`)
	if got := b.value("/site/coldest_c/value"); got != "−80" {
		t.Errorf("taken over, the coldest is %q", got)
	}
	if got := b.value("draft"); got != draft {
		t.Errorf("the draft was %s and is %s", draft, got)
	}
}
