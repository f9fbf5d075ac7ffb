package store_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

var exactly = cmp.Comparer(quantity.Exact.Equal)

func TestSaveRevision_First(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	before := time.Now()
	f := sample(t, "House 1")
	saved := mustSave(t, s, store.Save{Frozen: f, Note: "first"})

	if saved.Design == "" || saved.Number != 1 || saved.Base != 0 || saved.Repeated || saved.Saved.By != ann {
		t.Errorf("saved as %q revision %d from %d, repeated %t, by %v", saved.Design, saved.Number, saved.Base, saved.Repeated, saved.Saved.By)
	}
	if at := saved.Saved.At; at.Before(before.Add(-time.Second)) || at.After(time.Now().Add(time.Second)) || at.Location() != time.UTC {
		t.Errorf("saved at %v, began at %v", at, before)
	}
	for _, number := range []int{0, 1} {
		read, err := s.Revision(t.Context(), saved.Design, number)
		if diff := cmp.Diff(saved, read, exactly); err != nil || diff != "" {
			t.Errorf("Revision(%d): %v, mismatch (-saved +read)\n%s", number, err, diff)
		}
	}
	if got := saved.Frozen; string(got.Document) != string(f.Document) || string(got.Result) != string(f.Result) || got.SHA256 != f.SHA256 {
		t.Error("the document or the result came back changed")
	}
	listed, err := s.Design(t.Context(), saved.Design)
	want := record.Design{
		ID: saved.Design, Title: "House 1", Site: f.Site, Revision: 1, Verdict: f.Verdict, HeadroomC: saved.Frozen.HeadroomC,
		Created: saved.Saved, Updated: saved.Saved,
	}
	if diff := cmp.Diff(want, listed, exactly); err != nil || diff != "" {
		t.Errorf("Design: %v, mismatch (-want +got)\n%s", err, diff)
	}
}

func TestSaveRevision_Next(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	first := mustSave(t, s, store.Save{Frozen: sample(t, "House 1")})
	second, err := s.SaveRevision(t.Context(), ben, store.Save{Design: first.Design, Base: 1, Frozen: sample(t, "House 2"), Note: "renamed"})
	if err != nil || second.Number != 2 || second.Base != 1 || second.Design != first.Design {
		t.Fatalf("saved as %q revision %d from %d: %v", second.Design, second.Number, second.Base, err)
	}
	if again, err := s.Revision(t.Context(), first.Design, 1); err != nil || cmp.Diff(first, again, exactly) != "" {
		t.Errorf("the first revision changed: %v\n%s", err, cmp.Diff(first, again, exactly))
	}
	d, err := s.Design(t.Context(), first.Design)
	if err != nil || d.Title != "House 2" || d.Revision != 2 || d.Created.By != ann || d.Updated.By != ben || !d.Updated.At.After(d.Created.At) {
		t.Errorf("the design is listed as %+v: %v", d, err)
	}
	list, err := s.Revisions(t.Context(), first.Design)
	if err != nil || len(list) != 2 {
		t.Fatalf("%d revisions: %v", len(list), err)
	}
	want := record.RevisionSummary{
		Number: 2, Base: 1, SHA256: second.Frozen.SHA256, Engine: "test", Rulebook: second.Frozen.Rulebook, Title: "House 2", Site: second.Frozen.Site,
		Verdict: second.Frozen.Verdict, HeadroomC: second.Frozen.HeadroomC, Note: "renamed", Saved: second.Saved,
	}
	if diff := cmp.Diff(want, list[0], exactly); diff != "" || list[1].Number != 1 {
		t.Errorf("revisions: the second is %d, mismatch of the first (-want +got)\n%s", list[1].Number, diff)
	}
}

func TestSaveRevision_Refused(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	first := mustSave(t, s, store.Save{Frozen: sample(t, "House")})
	mustSave(t, s, store.Save{Design: first.Design, Base: 1, Frozen: sample(t, "House")})
	good := sample(t, "House")
	altered := good
	altered.Document = append([]byte{}, good.Document...)
	altered.Document[10] ^= 1
	empty := good
	empty.Document = nil
	cable := good
	cable.Uses = []record.Use{{Kind: "cable", Maker: "A", Model: "B"}}
	for _, c := range []struct {
		name  string
		actor record.Actor
		save  store.Save
		want  error // a StaleError has its number compared
	}{
		{"made from an older revision", ann, store.Save{Design: first.Design, Base: 1, Frozen: good}, &record.StaleError{Newest: 2}},
		{"made from one that is not there yet", ann, store.Save{Design: first.Design, Base: 3, Frozen: good}, &record.StaleError{Newest: 2}},
		{"made from none, though it is there", ann, store.Save{Design: first.Design, Frozen: good}, &record.StaleError{Newest: 2}},
		{"no such design", ann, store.Save{Design: "nowhere", Base: 1, Frozen: good}, record.ErrNotFound},
		{"an id that is no text", ann, store.Save{Design: "a\x00\xff", Base: 1, Frozen: good}, record.ErrNotFound},
		{"a new design with a base", ann, store.Save{Base: 1, Frozen: good}, record.ErrInvalid},
		{"a negative base", ann, store.Save{Design: first.Design, Base: -1, Frozen: good}, record.ErrInvalid},
		{"a base that no revision can have", ann, store.Save{Design: first.Design, Base: math.MaxInt32, Frozen: good}, record.ErrInvalid},
		{"nobody did it", record.Actor{}, store.Save{Design: first.Design, Base: 2, Frozen: good}, record.ErrInvalid},
		{"not the document of the hash", ann, store.Save{Design: first.Design, Base: 2, Frozen: altered}, record.ErrInvalid},
		{"no document", ann, store.Save{Design: first.Design, Base: 2, Frozen: empty}, record.ErrInvalid},
		{"equipment of no kind", ann, store.Save{Design: first.Design, Base: 2, Frozen: cable}, record.ErrInvalid},
		{"a request key of 256 characters", ann, store.Save{Design: first.Design, Base: 2, Frozen: good, Request: strings.Repeat("k", 256)}, record.ErrInvalid},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := s.SaveRevision(t.Context(), c.actor, c.save)
			if stale, ok := c.want.(*record.StaleError); ok {
				if got, ok := errors.AsType[*record.StaleError](err); !ok || *got != *stale {
					t.Errorf("got %v, want %v", err, c.want)
				}
			} else if !errors.Is(err, c.want) {
				t.Errorf("got %v, want %v", err, c.want)
			}
			if d, err := s.Design(t.Context(), first.Design); err != nil || d.Revision != 2 {
				t.Errorf("the design is at revision %d: %v", d.Revision, err)
			}
		})
	}
	if page, err := s.Designs(t.Context(), record.Listing{}); err != nil || len(page.Designs) != 1 {
		t.Errorf("%d designs after refusals, want the one that was there: %v", len(page.Designs), err)
	}
}

// TestSaveRevision_TwoEditors: of those who made theirs from the same revision, one
// saves, and the others are told the newest.
func TestSaveRevision_TwoEditors(t *testing.T) {
	t.Parallel()
	a := newStore(t)
	b := sameDatabase(t, a)
	first := mustSave(t, a, store.Save{Frozen: sample(t, "House")})
	const editors = 12
	outcomes := make([]error, editors)
	var group sync.WaitGroup
	for i := range editors {
		group.Go(func() {
			s := []*store.Store{a, b}[i%2]
			_, outcomes[i] = s.SaveRevision(t.Context(), ann, store.Save{Design: first.Design, Base: 1, Frozen: sample(t, fmt.Sprint("House ", i))})
		})
	}
	group.Wait()
	won := -1
	for i, err := range outcomes {
		stale, ok := errors.AsType[*record.StaleError](err)
		switch {
		case err == nil && won < 0:
			won = i
		case err == nil:
			t.Errorf("editors %d and %d both saved", won, i)
		case !ok || stale.Newest != 2:
			t.Errorf("editor %d: %v", i, err)
		}
	}
	newest, err := b.Revision(t.Context(), first.Design, 0)
	if err != nil || newest.Number != 2 || newest.Frozen.Title != fmt.Sprint("House ", won) {
		t.Errorf("the newest is %d %q, editor %d won: %v", newest.Number, newest.Frozen.Title, won, err)
	}
}

func TestSaveRevision_Repeated(t *testing.T) {
	t.Parallel()
	a := newStore(t)
	b := sameDatabase(t, a)
	save := store.Save{Frozen: sample(t, "House"), Note: "n", Request: "key of a page"}
	const times = 20
	saved := make([]record.Revision, times)
	var group sync.WaitGroup
	for i := range times {
		group.Go(func() {
			var err error
			if saved[i], err = []*store.Store{a, b}[i%2].SaveRevision(t.Context(), ann, save); err != nil {
				t.Error(err)
			}
		})
	}
	group.Wait()
	made := 0
	for _, r := range saved {
		if !r.Repeated {
			made++
		}
		r.Repeated = saved[0].Repeated
		if diff := cmp.Diff(saved[0], r, exactly); diff != "" {
			t.Errorf("two answers to the same save (-one +other)\n%s", diff)
		}
	}
	if made != 1 {
		t.Errorf("%d of %d saves were not repetitions, want 1", made, times)
	}
	if list, err := a.Revisions(t.Context(), saved[0].Design); err != nil || len(list) != 1 {
		t.Errorf("%d revisions: %v", len(list), err)
	}
	if page, err := a.Designs(t.Context(), record.Listing{}); err != nil || len(page.Designs) != 1 {
		t.Errorf("%d designs: %v", len(page.Designs), err)
	}

	id := saved[0].Design
	changes := map[string]func(*store.Save){
		"document": func(s *store.Save) { s.Frozen = sample(t, "Another") },
		"note":     func(s *store.Save) { s.Note = "another" },
		"design":   func(s *store.Save) { s.Design, s.Base = id, 1 },
	}
	for name, change := range changes {
		other := save
		change(&other)
		_, err := a.SaveRevision(t.Context(), ann, other)
		used, ok := errors.AsType[*record.UsedError](err)
		if !ok || used.Made != id || used.Number != 1 || !errors.Is(err, record.ErrConflict) {
			t.Errorf("the same key with another %s: %v, want a UsedError of kind ErrConflict with %s, revision 1", name, err, id)
		}
	}
	if _, err := a.Duplicate(t.Context(), ann, id, "", save.Request); !errors.Is(err, record.ErrConflict) {
		t.Errorf("the same key for a duplicate: %v, want ErrConflict", err)
	}

	engine := save
	engine.Frozen.Engine, engine.Frozen.Result = "newer", []byte(`{"of":"a newer engine"}`)
	if again, err := a.SaveRevision(t.Context(), ann, engine); err != nil || !again.Repeated || again.Frozen.Engine != "test" {
		t.Errorf("repeated after the engine was renewed: %+v, %v", again.Saved, err)
	}
	if other, err := a.SaveRevision(t.Context(), ben, save); err != nil || other.Repeated || other.Design == id {
		t.Errorf("someone else with the same key: repeated %t, %v", other.Repeated, err)
	}
}

// TestSaveRevision_RefusedKeyIsFree: a key under which nothing was saved can be used
// again.
func TestSaveRevision_RefusedKeyIsFree(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	first := mustSave(t, s, store.Save{Frozen: sample(t, "House")})
	mustSave(t, s, store.Save{Design: first.Design, Base: 1, Frozen: sample(t, "House")})
	save := store.Save{Design: first.Design, Base: 1, Frozen: sample(t, "House mine"), Request: "k"}
	if _, err := s.SaveRevision(t.Context(), ann, save); err == nil {
		t.Fatal("a stale save was saved")
	}
	save.Base = 2
	if saved, err := s.SaveRevision(t.Context(), ann, save); err != nil || saved.Number != 3 || saved.Repeated {
		t.Errorf("after it was put right: revision %d, %v", saved.Number, err)
	}
}

func TestSaveRevision_Draft(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	typed := func(text string) map[string]string { return map[string]string{"/title": text} }
	t.Run("saved with it", func(t *testing.T) {
		d := mustDraft(t, s, record.Draft{Fields: typed("House")})
		saved := mustSave(t, s, store.Save{Frozen: sample(t, "House"), Draft: d.ID, DraftVersion: d.Version})
		if _, err := s.Draft(t.Context(), d.ID); !errors.Is(err, record.ErrNotFound) {
			t.Errorf("the draft is still there: %v", err)
		}
		if left, err := s.DraftsOf(t.Context(), saved.Design, 1); err != nil || len(left) > 0 {
			t.Errorf("the design has %d drafts: %v", len(left), err)
		}
	})
	t.Run("typed on meanwhile", func(t *testing.T) {
		d := mustDraft(t, s, record.Draft{Fields: typed("House")})
		newer := mustDraft(t, s, record.Draft{ID: d.ID, Version: d.Version, Fields: typed("House, second thoughts")})
		saved := mustSave(t, s, store.Save{Frozen: sample(t, "House"), Draft: d.ID, DraftVersion: d.Version})
		kept, err := s.DraftsOf(t.Context(), saved.Design, 9)
		newer.Design = saved.Design
		if diff := cmp.Diff([]record.Draft{newer}, kept); err != nil || diff != "" {
			t.Errorf("DraftsOf: %v, mismatch (-want +got)\n%s", err, diff)
		}
	})
	t.Run("refused", func(t *testing.T) {
		first := mustSave(t, s, store.Save{Frozen: sample(t, "House")})
		d := mustDraft(t, s, record.Draft{Design: first.Design, Base: 1, Fields: typed("House")})
		if _, err := s.SaveRevision(t.Context(), ann, store.Save{Design: first.Design, Base: 7, Frozen: sample(t, "House"), Draft: d.ID, DraftVersion: d.Version}); err == nil {
			t.Fatal("a stale save was saved")
		}
		if kept, err := s.Draft(t.Context(), d.ID); err != nil || cmp.Diff(d, kept) != "" {
			t.Errorf("the draft of a save that was refused: %v\n%s", err, cmp.Diff(d, kept))
		}
	})
}

// TestSaveRevision_HostileTexts: what Postgres' texts and indexes do not take is kept
// in the document, and does not stand in the way of saving.
func TestSaveRevision_HostileTexts(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	for name, title := range map[string]string{
		"empty":                "",
		"U+0000":               "before\x00after",
		"no UTF-8":             "before\xffafter",
		"long":                 strings.Repeat("x", 1<<17), // eight times, more than a request holds
		"many words":           strings.Repeat("ab 12 ", 1<<15),
		"four bytes each":      strings.Repeat("𝔄", 1000),
		"operators of queries": `'a' & !b | (c:*) <-> \`,
		"quotes":               `'"` + "`$1;--",
	} {
		t.Run(name, func(t *testing.T) {
			f := sample(t, "House")
			f.Title, f.Site, f.Engine = title, title, title
			f.Uses = []record.Use{{Kind: record.KindModule, Maker: title, Model: title}}
			saved := mustSave(t, s, store.Save{Frozen: f, Note: title})
			read, err := s.Revision(t.Context(), saved.Design, 0)
			if diff := cmp.Diff(saved, read, exactly); err != nil || diff != "" {
				t.Errorf("Revision: %v, mismatch (-saved +read)\n%.1000s", err, diff)
			}
			used, err := s.WhereUsed(t.Context(), record.KindModule, title, title, 10)
			if err != nil || !slices.ContainsFunc(used, func(d record.Design) bool { return d.ID == saved.Design }) {
				t.Errorf("it is not among the %d designs that use its module: %v", len(used), err)
			}
			if _, err := s.Designs(t.Context(), record.Listing{Words: title}); err != nil {
				t.Error(err)
			}
			for _, sort := range []record.Sort{record.SortTitle, record.SortUpdated} {
				page, err := s.Designs(t.Context(), record.Listing{Sort: sort, Limit: 1})
				if err != nil {
					t.Fatal(err)
				}
				if page.Next != "" {
					if _, err := s.Designs(t.Context(), record.Listing{Sort: sort, Cursor: page.Next}); err != nil {
						t.Error(err)
					}
				}
			}
		})
	}
}

func TestSaveRevision_Headroom(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	for _, c := range []struct {
		name       string
		is, stored *quantity.Exact
	}{
		{"not known", nil, nil},
		{"a decimal", new(quantity.Ratio(125, 10)), new(quantity.Ratio(125, 10))},
		{"a third, cut downwards", new(quantity.Ratio(1, 3)), new(quantity.Ratio(333333333, 1e9))},
		{"minus a third, cut downwards", new(quantity.Ratio(-1, 3)), new(quantity.Ratio(-333333334, 1e9))},
		{"none", new(quantity.Int(0)), new(quantity.Int(0))},
		{"beyond a machine word", new(quantity.Int(1 << 62).Mul(quantity.Int(1 << 62))), new(quantity.Int(1 << 62).Mul(quantity.Int(1 << 62)))},
	} {
		f := sample(t, c.name)
		f.HeadroomC = c.is
		saved := mustSave(t, s, store.Save{Frozen: f})
		d, err := s.Design(t.Context(), saved.Design)
		if err != nil {
			t.Fatal(err)
		}
		if diff := cmp.Diff(c.stored, d.HeadroomC, exactly); diff != "" {
			t.Errorf("%s: mismatch (-want +got)\n%s", c.name, diff)
		}
	}
}

func TestRevision_NeverChanges(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	saved := mustSave(t, s, store.Save{Frozen: sample(t, "House")})
	for _, sql := range []string{
		`update revision set note = 'another'`,
		`update revision set note = note where false`,
		`delete from revision`,
		`truncate revision cascade`,
		`update revision_use set maker = 'another'`,
		`delete from revision_use`,
		`truncate revision_use`,
		`insert into revision (design, number, base, document, result, sha256, engine, rulebook, title, site, verdict, headroom_c, note, saved_by, saved_by_name)
			select design, number, base, document, result, sha256, engine, rulebook, title, site, verdict, headroom_c, note, saved_by, saved_by_name from revision`,
	} {
		if err := s.Exec(t.Context(), sql); err == nil {
			t.Errorf("the database did it: %s", sql)
		}
	}
	if again, err := s.Revision(t.Context(), saved.Design, 1); err != nil || cmp.Diff(saved, again, exactly) != "" {
		t.Errorf("it changed: %v\n%s", err, cmp.Diff(saved, again, exactly))
	}
	if err := s.Exec(t.Context(), `update design set revision = 2`); err == nil {
		t.Error("a design points at a revision that is not there")
	}
	if err := s.Exec(t.Context(), `delete from design`); err == nil {
		t.Error("a design was deleted that has revisions")
	}
}

func TestRevision_NotFound(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	saved := mustSave(t, s, store.Save{Frozen: sample(t, "House")})
	for _, number := range []int{-1, 2, math.MaxInt32, math.MaxInt32 + 1} {
		if _, err := s.Revision(t.Context(), saved.Design, number); !errors.Is(err, record.ErrNotFound) {
			t.Errorf("revision %d: %v, want ErrNotFound", number, err)
		}
	}
	for _, id := range []record.ID{"", "nowhere", "a\x00b", "\xff", record.ID(strings.Repeat("x", 1<<16))} {
		calls := map[string]func() error{
			"Design":           func() error { _, err := s.Design(t.Context(), id); return err },
			"Revision":         func() error { _, err := s.Revision(t.Context(), id, 0); return err },
			"Revisions":        func() error { _, err := s.Revisions(t.Context(), id); return err },
			"Archive":          func() error { return s.Archive(t.Context(), ann, id) },
			"Restore":          func() error { return s.Restore(t.Context(), ann, id) },
			"Duplicate":        func() error { _, err := s.Duplicate(t.Context(), ann, id, "", ""); return err },
			"Draft":            func() error { _, err := s.Draft(t.Context(), id); return err },
			"Equipment":        func() error { _, err := s.Equipment(t.Context(), id); return err },
			"ArchiveEquipment": func() error { return s.ArchiveEquipment(t.Context(), ann, id) },
			"RestoreEquipment": func() error { return s.RestoreEquipment(t.Context(), ann, id) },
		}
		for name, call := range calls {
			if err := call(); !errors.Is(err, record.ErrNotFound) {
				t.Errorf("%s(%.20q): %v, want ErrNotFound", name, id, err)
			}
		}
	}
}

func TestArchive(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	saved := mustSave(t, s, store.Save{Frozen: sample(t, "House")})
	listed := func(archived bool) int {
		t.Helper()
		page, err := s.Designs(t.Context(), record.Listing{Archived: archived})
		if err != nil || page.Total != len(page.Designs) {
			t.Fatalf("%d of %d: %v", len(page.Designs), page.Total, err)
		}
		return len(page.Designs)
	}
	do := func(what string, call func(context.Context, record.Actor, record.ID) error, inUse, archived int) record.Design {
		t.Helper()
		if err := call(t.Context(), ann, saved.Design); err != nil {
			t.Fatal(err)
		}
		if a, b := listed(false), listed(true); a != inUse || b != archived {
			t.Errorf("%s: %d in use and %d archived, want %d and %d", what, a, b, inUse, archived)
		}
		d, err := s.Design(t.Context(), saved.Design)
		if err != nil || (d.ArchivedAt != nil) != (archived == 1) {
			t.Errorf("%s: archived at %v, %v", what, d.ArchivedAt, err)
		}
		return d
	}
	first := do("archived", s.Archive, 0, 1)
	second := do("archived again", s.Archive, 0, 1)
	if !first.ArchivedAt.Equal(*second.ArchivedAt) {
		t.Errorf("archiving again moved the time from %v to %v", first.ArchivedAt, second.ArchivedAt)
	}
	// What was typed in a tab that was open all the time is kept, archived or not.
	mustSave(t, s, store.Save{Design: saved.Design, Base: 1, Frozen: sample(t, "House")})
	if listed(true) != 1 {
		t.Error("saving a revision of an archived design restored it")
	}
	do("restored", s.Restore, 1, 0)
	do("restored again", s.Restore, 1, 0)
}

func TestDuplicate(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	first := mustSave(t, s, store.Save{Frozen: sample(t, "House 1")})
	source := mustSave(t, s, store.Save{Design: first.Design, Base: 1, Frozen: sample(t, "House 1b")})
	d, err := s.Duplicate(t.Context(), ben, first.Design, "House 2", "k")
	if err != nil || d.ID == first.Design || d.Title != "House 2" || d.Revision != 1 || d.Created.By != ben {
		t.Fatalf("%+v, %v", d, err)
	}
	again, err := s.Duplicate(t.Context(), ben, first.Design, "House 2", "k")
	if diff := cmp.Diff(d, again, exactly); err != nil || diff != "" {
		t.Errorf("repeated: %v, mismatch\n%s", err, diff)
	}
	r, err := s.Revision(t.Context(), d.ID, 0)
	if err != nil {
		t.Fatal(err)
	}
	want := record.Freeze(design.Read(r.Frozen.Document).Design, "test") // what the engine makes of the saved text
	if diff := cmp.Diff(want.Title, "House 2"); diff != "" || string(want.Result) != string(r.Frozen.Result) || want.SHA256 != r.Frozen.SHA256 {
		t.Errorf("the duplicate is not as if it had been saved: title %s", diff)
	}
	same, err := s.Duplicate(t.Context(), ben, first.Design, "", "")
	if err != nil || same.Title != "House 1b" {
		t.Errorf("with the same title: %+v, %v", same, err)
	}
	if now, err := s.Revision(t.Context(), first.Design, 0); err != nil || cmp.Diff(source, now, exactly) != "" {
		t.Errorf("duplicating changed the source: %v", err)
	}
}

func TestWhereUsed(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	with := func(title string, uses ...record.Use) store.Save {
		f := sample(t, title)
		f.Uses = uses
		return store.Save{Frozen: f}
	}
	m := func(maker, model string) record.Use {
		return record.Use{Kind: record.KindModule, Maker: maker, Model: model}
	}
	old := mustSave(t, s, with("had it before", m("Acme Demo", "X-1")))
	now := with("has another now", m("Acme Demo", "X-2"))
	now.Design, now.Base = old.Design, 1
	mustSave(t, s, now)
	mustSave(t, s, with("has it", m("Acme Demo", "X-1"), m("Acme Demo", "X-1")))
	mustSave(t, s, with("has it in capitals", m("ACME  demo ", "x-1")))
	archived := mustSave(t, s, with("has it, archived", m("Acme Demo", "X-1")))
	if err := s.Archive(t.Context(), ann, archived.Design); err != nil {
		t.Fatal(err)
	}
	mustSave(t, s, with("has an inverter of the name", record.Use{Kind: record.KindInverter, Maker: "Acme Demo", Model: "X-1"}))
	mustSave(t, s, with("has the names apart otherwise", m("Acme", "Demo X-1")))
	for _, c := range []struct {
		model string
		limit int
		want  []string
	}{
		{"X-1", 10, []string{"has it, archived", "has it in capitals", "has it"}},
		{"X-1", 2, []string{"has it, archived", "has it in capitals"}},
		{"X-1", -1, nil},
		{"X-2", 10, []string{"has another now"}},
		{"X", 10, nil},
	} {
		found, err := s.WhereUsed(t.Context(), record.KindModule, "Acme Demo", c.model, c.limit)
		var got []string
		for _, d := range found {
			got = append(got, d.Title)
		}
		if diff := cmp.Diff(c.want, got); err != nil || diff != "" {
			t.Errorf("%s: %v, mismatch (-want +got)\n%s", c.model, err, diff)
		}
	}
}

// TestIDs: ids are long and of chance.
func TestIDs(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	seen := map[record.ID]bool{}
	for range 20 {
		id := mustSave(t, s, store.Save{Frozen: sample(t, "House")}).Design
		if len(id) < 20 || seen[id] {
			t.Errorf("the id %q is short, or was given before", id)
		}
		seen[id] = true
	}
	s.SetIDs(func() record.ID { return "chosen" })
	if id := mustSave(t, s, store.Save{Frozen: sample(t, "House")}).Design; id != "chosen" {
		t.Errorf("the id is %q, not the one of its source", id)
	}
}

// TestVerdicts: each verdict comes back as it went in.
func TestVerdicts(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	for v := working.Within; v <= working.Outside; v++ {
		f := sample(t, v.String())
		f.Verdict = v
		saved := mustSave(t, s, store.Save{Frozen: f})
		if d, err := s.Design(t.Context(), saved.Design); err != nil || d.Verdict != v {
			t.Errorf("saved %v, listed %v: %v", v, d.Verdict, err)
		}
	}
}
