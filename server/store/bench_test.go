package store_test

import (
	"fmt"
	"testing"
	"time"

	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/sizing/working"
)

// lists are the questions that the page of designs asks.
var lists = map[string]record.Listing{
	"newest":                  {},
	"by title":                {Sort: record.SortTitle},
	"worst":                   {Sort: record.SortVerdict},
	"least headroom":          {Sort: record.SortHeadroom},
	"most headroom":           {Sort: record.SortHeadroom, Reversed: true},
	"archived":                {Archived: true},
	"outside":                 {Verdict: new(working.Outside)},
	"outside, by title":       {Verdict: new(working.Outside), Sort: record.SortTitle},
	"a word of many":          {Words: "street"},
	"a letter":                {Words: "t"},
	"two words":               {Words: "tamarack alder"},
	"a model":                 {Words: "al-430m"},
	"a word of none":          {Words: "zzz"},
	"two words of many":       {Words: "street invented", Sort: record.SortHeadroom},
	"of many, of one verdict": {Words: "street", Verdict: new(working.Unconfirmed), Sort: record.SortTitle},
}

// BenchmarkDesigns: a page of 50 out of 20000.
func BenchmarkDesigns(b *testing.B) {
	s := seeded(b, 20_000)
	for name, ask := range lists {
		b.Run(name, func(b *testing.B) {
			for b.Loop() {
				if _, err := s.Designs(b.Context(), ask); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// TestDesigns_TwentyThousand: no list of twenty thousand takes long, on the first
// page nor far behind it. The bound leaves room for a busy machine; a plan that reads
// and sorts all rows for each page would pass it by far.
func TestDesigns_TwentyThousand(t *testing.T) {
	t.Parallel()
	if testing.Short() {
		t.Skip("it makes twenty thousand designs")
	}
	s := seeded(t, 20_000)
	const bound = 300 * time.Millisecond
	for name, ask := range lists {
		ask.Limit = 200
		for range 20 {
			best := time.Hour
			var page record.DesignPage
			for range 3 {
				began := time.Now()
				var err error
				if page, err = s.Designs(t.Context(), ask); err != nil {
					t.Fatal(err)
				}
				best = min(best, time.Since(began))
			}
			if best > bound {
				t.Errorf("%s: a page took %v, three times", name, best)
			}
			if ask.Cursor = page.Next; ask.Cursor == "" {
				break
			}
		}
	}
}

// BenchmarkSaveRevision: a design saved as the next revision, its draft taken away,
// under a request key.
func BenchmarkSaveRevision(b *testing.B) {
	s := newStore(b)
	f := sample(b, "House")
	saved := mustSave(b, s, store.Save{Frozen: f})
	for b.Loop() {
		var err error
		saved, err = s.SaveRevision(b.Context(), ann, store.Save{Design: saved.Design, Base: saved.Number, Frozen: f, Request: fmt.Sprint("key ", saved.Number)})
		if err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkSaveDraft(b *testing.B) {
	s := newStore(b)
	fields := map[string]string{}
	for i := range 150 {
		fields[fmt.Sprintf("/strings/%d/modules_in_series", i)] = "12"
	}
	d := record.Draft{Fields: fields}
	for b.Loop() {
		var err error
		if d, err = s.SaveDraft(b.Context(), ann, d); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkRevision(b *testing.B) {
	s := newStore(b)
	saved := mustSave(b, s, store.Save{Frozen: sample(b, "House")})
	for b.Loop() {
		if _, err := s.Revision(b.Context(), saved.Design, 0); err != nil {
			b.Fatal(err)
		}
	}
}
