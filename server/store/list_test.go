package store_test

import (
	"cmp"
	"encoding/base64"
	"errors"
	"fmt"
	"maps"
	"slices"
	"strings"
	"testing"

	gocmp "github.com/google/go-cmp/cmp"

	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
	"rimeline/tests/seed"
)

// seeded returns a store with n invented designs.
func seeded(t testing.TB, n int) *store.Store {
	t.Helper()
	s := newStore(t)
	f := sample(t, "")
	f.Result = []byte("{}") // lists do not look at it
	if err := seed.Designs(t.Context(), s.ConnString(), n, f); err != nil {
		t.Fatal(err)
	}
	return s
}

// byText compares texts as people read them, for the titles that the seed makes: in
// letters of one case, and with numbers of one and more digits.
func byText(a, b string) int {
	split := func(s string) (parts []string) {
		for s != "" {
			digits := strings.IndexFunc(s, func(r rune) bool { return r < '0' || r > '9' })
			if digits == 0 {
				digits = cmp.Or(max(strings.IndexAny(s, "0123456789"), 0), len(s))
				parts = append(parts, strings.ToLower(s[:digits]))
			} else {
				if digits < 0 {
					digits = len(s)
				}
				parts = append(parts, fmt.Sprintf("%9s", s[:digits]))
			}
			s = s[digits:]
		}
		return parts
	}
	return slices.Compare(split(a), split(b))
}

func headroom(d record.Design) quantity.Exact {
	if d.HeadroomC == nil {
		return quantity.Int(-1000)
	}
	return *d.HeadroomC
}

// inOrder says, for each order, whether a may stand before b.
var inOrder = map[record.Sort]func(a, b record.Design) int{
	record.SortUpdated: func(a, b record.Design) int { return b.Updated.At.Compare(a.Updated.At) },
	record.SortTitle:   func(a, b record.Design) int { return byText(a.Title, b.Title) },
	record.SortVerdict: func(a, b record.Design) int {
		return cmp.Or(cmp.Compare(b.Verdict, a.Verdict), b.Updated.At.Compare(a.Updated.At))
	},
	record.SortHeadroom: func(a, b record.Design) int { return headroom(a).Cmp(headroom(b)) },
}

// TestDesigns_Paging: paging through any order, either way, forth and back, shows
// every design once, in order, and the same pages back as forth.
func TestDesigns_Paging(t *testing.T) {
	t.Parallel()
	const n, limit = 500, 37
	s := seeded(t, n)
	for _, sort := range slices.Sorted(maps.Keys(inOrder)) {
		for _, reversed := range []bool{false, true} {
			t.Run(fmt.Sprintf("%s reversed %t", sort, reversed), func(t *testing.T) {
				seen := 0
				for _, archived := range []bool{false, true} {
					ask := record.Listing{Sort: sort, Reversed: reversed, Archived: archived, Limit: limit}
					seen += pageThrough(t, s, ask)
				}
				if seen != n {
					t.Errorf("%d designs on all pages, want %d", seen, n)
				}
			})
		}
	}
}

func pageThrough(t *testing.T, s *store.Store, ask record.Listing) int {
	t.Helper()
	var pages []record.DesignPage
	var rows []record.Design
	for {
		page, err := s.Designs(t.Context(), ask)
		if err != nil {
			t.Fatal(err)
		}
		if (page.Previous != "") != (len(pages) > 0) {
			t.Errorf("page %d has a page before it: %t", len(pages), page.Previous != "")
		}
		pages, rows = append(pages, page), append(rows, page.Designs...)
		if page.Next == "" {
			break
		}
		if len(page.Designs) != ask.Limit {
			t.Fatalf("page %d has %d designs, want %d", len(pages), len(page.Designs), ask.Limit)
		}
		ask.Cursor = page.Next
	}
	ids := map[record.ID]bool{}
	for i, d := range rows {
		ids[d.ID] = true
		if i == 0 {
			continue
		}
		way := inOrder[ask.Sort](rows[i-1], d)
		if ask.Reversed {
			way = -way
		}
		if way > 0 {
			t.Errorf("%q, %v, %v, %v stands before %q, %v, %v, %v", rows[i-1].Title, rows[i-1].Updated.At, rows[i-1].Verdict, headroom(rows[i-1]), d.Title, d.Updated.At, d.Verdict, headroom(d))
		}
	}
	if len(ids) != len(rows) || pages[0].Total != len(rows) || pages[0].More {
		t.Errorf("%d rows of %d designs, total %d, more %t", len(rows), len(ids), pages[0].Total, pages[0].More)
	}
	for i := len(pages) - 1; i > 0; i-- {
		ask.Cursor = pages[i].Previous
		back, err := s.Designs(t.Context(), ask)
		if diff := gocmp.Diff(pages[i-1].Designs, back.Designs, exactly); err != nil || diff != "" {
			t.Errorf("the page before page %d: %v, mismatch (-forth +back)\n%s", i, err, diff)
		}
		if back.Next == "" || (back.Previous != "") != (i > 1) {
			t.Errorf("the page before page %d: next %t, previous %t", i, back.Next != "", back.Previous != "")
		}
	}
	return len(rows)
}

// TestDesigns_PreviousIsFull: if designs were saved meanwhile, the page before is
// still a full one.
func TestDesigns_PreviousIsFull(t *testing.T) {
	t.Parallel()
	s := seeded(t, 100)
	first, err := s.Designs(t.Context(), record.Listing{Limit: 10})
	if err != nil {
		t.Fatal(err)
	}
	second, err := s.Designs(t.Context(), record.Listing{Limit: 10, Cursor: first.Next})
	if err != nil {
		t.Fatal(err)
	}
	if err := s.Archive(t.Context(), ann, first.Designs[3].ID); err != nil {
		t.Fatal(err)
	}
	back, err := s.Designs(t.Context(), record.Listing{Limit: 10, Cursor: second.Previous})
	if err != nil || len(back.Designs) != 10 || back.Previous != "" || back.Designs[9].ID != second.Designs[0].ID {
		t.Errorf("the first page has %d designs: %v", len(back.Designs), err)
	}
	for _, d := range slices.Concat(first.Designs, second.Designs) {
		if err := s.Archive(t.Context(), ann, d.ID); err != nil {
			t.Fatal(err)
		}
	}
	if err := s.Exec(t.Context(), `update design set archived_at = now(), archived_by = 'x', archived_by_name = 'x'`); err != nil {
		t.Fatal(err)
	}
	gone, err := s.Designs(t.Context(), record.Listing{Limit: 10, Cursor: second.Next})
	if err != nil || len(gone.Designs) != 0 || gone.Next != "" || gone.Previous == "" {
		t.Fatalf("a page whose designs have gone: %+v, %v", gone, err)
	}
	if start, err := s.Designs(t.Context(), record.Listing{Limit: 10, Cursor: gone.Previous}); err != nil || len(start.Designs)+start.Total != 0 || start.Previous != "" {
		t.Errorf("and the one before it: %+v, %v", start, err)
	}
}

func TestDesigns_Filters(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	save := func(title, site string, v working.Verdict, uses ...record.Use) record.ID {
		f := sample(t, title)
		f.Site, f.Verdict, f.Uses = site, v, uses
		return mustSave(t, s, store.Save{Frozen: f}).Design
	}
	save("Miller house", "Larkspur", working.Within, record.Use{Kind: record.KindModule, Maker: "Acme Demo", Model: "RL-430M"})
	save("Jones house 12", "Fernhollow", working.Outside, record.Use{Kind: record.KindInverter, Maker: "Zeta Demo", Model: "QP 12K"})
	save("Mill barn", "Larkspur", working.Outside)
	old := save("Old name", "Larkspur", working.Within, record.Use{Kind: record.KindModule, Maker: "Gone Demo", Model: "G"})
	f := sample(t, "Großes Haus")
	f.Site, f.Verdict, f.Uses = "Köln", working.Caution, nil
	mustSave(t, s, store.Save{Design: old, Base: 1, Frozen: f})
	if err := s.Archive(t.Context(), ann, save("Miller shed", "Larkspur", working.Within)); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name string
		ask  record.Listing
		want string
	}{
		{"all", record.Listing{}, "Großes Haus, Jones house 12, Mill barn, Miller house"},
		{"archived", record.Listing{Archived: true}, "Miller shed"},
		{"the beginning of a word", record.Listing{Words: "mill"}, "Mill barn, Miller house"},
		{"in capitals", record.Listing{Words: "MILLER"}, "Miller house"},
		{"not the middle of a word", record.Listing{Words: "iller"}, ""},
		{"two words, anywhere", record.Listing{Words: "lark mill"}, "Mill barn, Miller house"},
		{"two words, one missing", record.Listing{Words: "lark jones"}, ""},
		{"by model", record.Listing{Words: "rl-430"}, "Miller house"},
		{"by model without its hyphen", record.Listing{Words: "rl430m"}, "Miller house"},
		{"by a number inside the model", record.Listing{Words: "430"}, "Miller house"},
		{"by maker", record.Listing{Words: "zeta"}, "Jones house 12"},
		{"by what the newest revision has", record.Listing{Words: "köln groß"}, "Großes Haus"},
		{"not by what an older one had", record.Listing{Words: "gone"}, ""},
		{"not by its old name", record.Listing{Words: "old name"}, ""},
		{"no letters at all", record.Listing{Words: " -- '&| "}, "Großes Haus, Jones house 12, Mill barn, Miller house"},
		{"outside", record.Listing{Verdict: new(working.Outside)}, "Jones house 12, Mill barn"},
		{"within", record.Listing{Verdict: new(working.Within)}, "Miller house"},
		{"unconfirmed", record.Listing{Verdict: new(working.Unconfirmed)}, ""},
		{"within, of those with a word", record.Listing{Verdict: new(working.Within), Words: "larkspur"}, "Miller house"},
		{"within, archived", record.Listing{Verdict: new(working.Within), Archived: true}, "Miller shed"},
	} {
		t.Run(c.name, func(t *testing.T) {
			c.ask.Sort = record.SortTitle
			page, err := s.Designs(t.Context(), c.ask)
			var titles []string
			for _, d := range page.Designs {
				titles = append(titles, d.Title)
			}
			if got := strings.Join(titles, ", "); err != nil || got != c.want || page.Total != len(titles) || page.More {
				t.Errorf("got %q of %d, want %q: %v", got, page.Total, c.want, err)
			}
		})
	}
}

// TestDesigns_TitlesAsPeopleRead: capitals, accents and numbers stand where a reader
// looks for them.
func TestDesigns_TitlesAsPeopleRead(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	want := []string{"", "2 kW", "10 kW", "Äpfel", "apple", "Apple", "House 2", "house 10", "House 10", "Zebra"}
	for i := range want {
		mustSave(t, s, store.Save{Frozen: sample(t, want[(i*7)%len(want)])})
	}
	page, err := s.Designs(t.Context(), record.Listing{Sort: record.SortTitle})
	var got []string
	for _, d := range page.Designs {
		got = append(got, d.Title)
	}
	if diff := gocmp.Diff(want, got); err != nil || diff != "" {
		t.Errorf("%v, mismatch (-want +got)\n%s", err, diff)
	}
}

func TestDesigns_Counted(t *testing.T) {
	t.Parallel()
	s := seeded(t, 1100) // one in twenty is archived
	page, err := s.Designs(t.Context(), record.Listing{Limit: 1})
	if err != nil || page.Total != record.CountedTo || !page.More {
		t.Errorf("of more than a thousand: %d, more %t: %v", page.Total, page.More, err)
	}
	for limit, want := range map[int]int{0: 50, -5: 50, 7: 7, 200: 200, 201: 200, 1 << 40: 200} {
		if page, err := s.Designs(t.Context(), record.Listing{Limit: limit}); err != nil || len(page.Designs) != want {
			t.Errorf("limit %d: %d designs, want %d: %v", limit, len(page.Designs), want, err)
		}
	}
}

func TestDesigns_BadAsks(t *testing.T) {
	t.Parallel()
	s := seeded(t, 20)
	first, err := s.Designs(t.Context(), record.Listing{Limit: 5})
	if err != nil {
		t.Fatal(err)
	}
	cursor := func(json string) string { return base64.RawURLEncoding.EncodeToString([]byte(json)) }
	for name, ask := range map[string]record.Listing{
		"an order that there is not":   {Sort: "colour"},
		"the order of equipment":       {Sort: record.SortName},
		"a cursor of nothing":          {Cursor: "x"},
		"a cursor that is no base64":   {Cursor: "!!"},
		"a cursor that is no JSON":     {Cursor: cursor("{")},
		"a cursor without keys":        {Cursor: cursor(`{"s":"updated"}`)},
		"a cursor with a key too many": {Cursor: cursor(`{"s":"updated","k":["2024-01-01","a","b"]}`)},
		"a cursor with no date":        {Cursor: cursor(`{"s":"updated","k":["yesterday evening","a"]}`)},
		"a cursor with a bad date":     {Cursor: cursor(`{"s":"updated","k":["2024-13-41","a"]}`)},
		"a cursor with no verdict":     {Sort: record.SortVerdict, Cursor: cursor(`{"s":"verdict","k":["perhaps","2024-01-01","a"]}`)},
		"a cursor with no number":      {Sort: record.SortHeadroom, Cursor: cursor(`{"s":"headroom","k":["warm","a"]}`)},
		"a cursor with U+0000":         {Sort: record.SortHeadroom, Cursor: cursor(`{"s":"headroom","k":["\u0000","a"]}`)},
		"a cursor of another order":    {Sort: record.SortTitle, Cursor: first.Next},
		"a cursor of the other way":    {Reversed: true, Cursor: first.Next},
	} {
		if _, err := s.Designs(t.Context(), ask); !errors.Is(err, record.ErrInvalid) {
			t.Errorf("%s: %v, want ErrInvalid", name, err)
		}
	}
	if _, err := s.Designs(t.Context(), record.Listing{Sort: record.SortTitle, Cursor: cursor(`{"s":"title","k":["a\u0000'; drop table design; --","a"]}`)}); err != nil {
		t.Errorf("a cursor at a title that there is not: %v", err)
	}
}
