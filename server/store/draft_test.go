package store_test

import (
	"errors"
	"fmt"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"rimeline/server/record"
	"rimeline/server/store"
)

func mustDraft(t testing.TB, s *store.Store, d record.Draft) record.Draft {
	t.Helper()
	saved, err := s.SaveDraft(t.Context(), ann, d)
	if err != nil {
		t.Fatal(err)
	}
	return saved
}

// TestSaveDraft_AsTyped: every byte that was typed comes back.
func TestSaveDraft_AsTyped(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	every := make([]byte, 256)
	for i := range every {
		every[i] = byte(i)
	}
	many := map[string]string{}
	for i := range 20_000 {
		many[fmt.Sprintf("/strings/%d/modules_in_series", i)] = fmt.Sprint(i)
	}
	for name, fields := range map[string]map[string]string{
		"nothing":      {},
		"empty texts":  {"": "", "/title": ""},
		"every byte":   {string(every): string(every)},
		"spaces":       {"/title": "  two  \t\r\n", " ": "+%20&=;"},
		"scripts":      {"/title": "Żółw 東京 🏠 e\u0301 \u202e\u2066", "/site/name": "\ufffd\ufeff"},
		"a megabyte":   {"/title": strings.Repeat("ü", 1<<19)},
		"20000 fields": many,
	} {
		t.Run(name, func(t *testing.T) {
			saved := mustDraft(t, s, record.Draft{Fields: fields})
			read, err := s.Draft(t.Context(), saved.ID)
			if diff := cmp.Diff(fields, read.Fields); err != nil || diff != "" {
				t.Errorf("%v, mismatch (-typed +read)\n%.2000s", err, diff)
			}
			read.Fields = saved.Fields
			if diff := cmp.Diff(saved, read); diff != "" || saved.Version != 1 || saved.Saved.By != ann || saved.Saved.At.IsZero() {
				t.Errorf("mismatch (-saved +read)\n%s", diff)
			}
		})
	}
}

func TestSaveDraft_Versions(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	typed := func(text string) map[string]string { return map[string]string{"/title": text} }
	first := mustDraft(t, s, record.Draft{Fields: typed("H")})
	second := mustDraft(t, s, record.Draft{ID: first.ID, Version: 1, Fields: typed("Ho")})
	if second.Version != 2 || second.ID != first.ID {
		t.Fatalf("saved again as %q version %d", second.ID, second.Version)
	}

	t.Run("another tab is behind", func(t *testing.T) {
		_, err := s.SaveDraft(t.Context(), ann, record.Draft{ID: first.ID, Version: 1, Fields: typed("Hut")})
		if stale, ok := errors.AsType[*record.StaleError](err); !ok || stale.Newest != 2 {
			t.Fatalf("got %v, want a StaleError with 2", err)
		}
		other := mustDraft(t, s, record.Draft{Fields: typed("Hut")}) // both are kept
		for id, want := range map[record.ID]string{first.ID: "Ho", other.ID: "Hut"} {
			if d, err := s.Draft(t.Context(), id); err != nil || d.Fields["/title"] != want {
				t.Errorf("kept %q, want %q: %v", d.Fields["/title"], want, err)
			}
		}
	})
	t.Run("the answer was lost and it is sent again", func(t *testing.T) {
		again, err := s.SaveDraft(t.Context(), ann, record.Draft{ID: first.ID, Version: 1, Fields: typed("Ho")})
		if diff := cmp.Diff(second, again); err != nil || diff != "" {
			t.Errorf("%v, mismatch (-then +now)\n%s", err, diff)
		}
	})
	t.Run("someone else types the same", func(t *testing.T) {
		_, err := s.SaveDraft(t.Context(), ben, record.Draft{ID: first.ID, Version: 1, Fields: typed("Ho")})
		if _, ok := errors.AsType[*record.StaleError](err); !ok {
			t.Errorf("got %v, want a StaleError", err)
		}
	})
	t.Run("under an id of the page's", func(t *testing.T) {
		for range 2 { // the second time, the answer was lost
			d, err := s.SaveDraft(t.Context(), ann, record.Draft{ID: "made-by-the-page", Fields: typed("H")})
			if err != nil || d.Version != 1 || d.ID != "made-by-the-page" {
				t.Fatalf("saved as %q version %d: %v", d.ID, d.Version, err)
			}
		}
		_, err := s.SaveDraft(t.Context(), ann, record.Draft{ID: "made-by-the-page", Fields: typed("Hut")})
		if stale, ok := errors.AsType[*record.StaleError](err); !ok || stale.Newest != 1 {
			t.Errorf("got %v, want a StaleError with 1", err)
		}
	})
	for name, c := range map[string]struct {
		actor record.Actor
		draft record.Draft
		want  error
	}{
		"discarded or never there": {ann, record.Draft{ID: "nowhere", Version: 3}, record.ErrNotFound},
		"a version without an id":  {ann, record.Draft{Version: 3}, record.ErrInvalid},
		"a negative base":          {ann, record.Draft{Base: -1}, record.ErrInvalid},
		"a base beyond all":        {ann, record.Draft{Base: 1 << 40}, record.ErrInvalid},
		"of no design":             {ann, record.Draft{Design: "nowhere"}, record.ErrNotFound},
		"nobody's":                 {record.Actor{}, record.Draft{}, record.ErrInvalid},
	} {
		if _, err := s.SaveDraft(t.Context(), c.actor, c.draft); !errors.Is(err, c.want) {
			t.Errorf("%s: got %v, want %v", name, err, c.want)
		}
	}
}

func TestDraftsOf(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	saved := mustSave(t, s, store.Save{Frozen: sample(t, "House")})
	loose := mustDraft(t, s, record.Draft{Fields: map[string]string{"a": "loose"}})
	one := mustDraft(t, s, record.Draft{Design: saved.Design, Base: 1, Fields: map[string]string{"a": "1"}})
	two := mustDraft(t, s, record.Draft{Design: saved.Design, Base: 1, Fields: map[string]string{"a": "2"}})
	of := func(id record.ID, limit int, want ...record.Draft) {
		t.Helper()
		d, err := s.DraftsOf(t.Context(), id, limit)
		if diff := cmp.Diff(want, d, cmpopts.EquateEmpty()); err != nil || diff != "" {
			t.Errorf("DraftsOf(%q, %d): %v, mismatch (-want +got)\n%s", id, limit, err, diff)
		}
	}
	of(saved.Design, 10, two, one)
	of(saved.Design, 1, two)
	of("", 10, loose)
	of("no such design", 10)
	one = mustDraft(t, s, one)
	of(saved.Design, 10, one, two)
	all, err := s.Drafts(t.Context(), 10)
	if diff := cmp.Diff([]record.Draft{one, two, loose}, all); err != nil || diff != "" {
		t.Errorf("Drafts: %v, mismatch (-want +got)\n%s", err, diff)
	}
	for limit, want := range map[int]int{2: 2, 0: 0, -1: 0, 1 << 40: 3} {
		if some, err := s.Drafts(t.Context(), limit); err != nil || len(some) != want {
			t.Errorf("Drafts(%d): %d, want %d: %v", limit, len(some), want, err)
		}
	}
}

func TestDiscardDraft(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	d := mustDraft(t, s, record.Draft{Fields: map[string]string{"a": "1"}})
	newer := mustDraft(t, s, d)
	if stale, ok := errors.AsType[*record.StaleError](s.DiscardDraft(t.Context(), ann, d.ID, d.Version)); !ok || stale.Newest != newer.Version {
		t.Errorf("discarding an older one: %v, want a StaleError with %d", stale, newer.Version)
	}
	if kept, err := s.Draft(t.Context(), d.ID); err != nil || cmp.Diff(newer, kept) != "" {
		t.Errorf("it went: %v", err)
	}
	for range 2 {
		if err := s.DiscardDraft(t.Context(), ann, d.ID, newer.Version); err != nil {
			t.Error(err)
		}
	}
	if _, err := s.Draft(t.Context(), d.ID); !errors.Is(err, record.ErrNotFound) {
		t.Errorf("it stayed: %v", err)
	}
}

func FuzzFields(f *testing.F) {
	f.Add("", "", "", "")
	f.Add("/title", "a+b %20&=;\x00\xff", "=", "&")
	f.Fuzz(func(t *testing.T, name, text, name2, text2 string) {
		fields := map[string]string{name: text, name2: text2}
		encoded := store.EncodeFields(fields)
		if store.Clean(encoded) != encoded {
			t.Errorf("a column cannot hold %q", encoded)
		}
		back, err := store.DecodeFields(encoded)
		if err != nil || !cmp.Equal(fields, back) {
			t.Errorf("%q became %q by way of %q: %v", fields, back, encoded, err)
		}
	})
}
