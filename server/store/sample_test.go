package store_test

import (
	"context"
	"log/slog"
	"os"
	"sync"
	"testing"

	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/sizing/design"
	"rimeline/tests/testdb"
)

func migrated(ctx context.Context, dsn string) error {
	s, err := store.Open(ctx, dsn, nil)
	if err != nil {
		return err
	}
	defer s.Close()
	return s.Migrate(ctx)
}

func open(t testing.TB, dsn string) *store.Store {
	t.Helper()
	s, err := store.Open(t.Context(), dsn, slog.New(slog.NewTextHandler(t.Output(), nil)))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(s.Close)
	return s
}

// newStore returns a store in a migrated database of its own.
func newStore(t testing.TB) *store.Store {
	t.Helper()
	return open(t, testdb.New(t, migrated))
}

// emptyStore returns a store in a database that nothing was applied to.
func emptyStore(t testing.TB) *store.Store {
	t.Helper()
	return open(t, testdb.New(t, nil))
}

// sameDatabase returns a second store in the database of s, as another server has it.
func sameDatabase(t testing.TB, s *store.Store) *store.Store {
	t.Helper()
	return open(t, s.ConnString())
}

var (
	ann = record.Actor{ID: "ann", Name: "Ann Example"}
	ben = record.Actor{ID: "ben", Name: "Ben Example"}
)

var example = sync.OnceValues(func() ([]byte, error) {
	return os.ReadFile("../../sizing/design/testdata/example-design.json")
})

// sample returns the example design under another title, with what the engine finds.
func sample(t testing.TB, title string) record.Frozen {
	t.Helper()
	text, err := example()
	if err != nil {
		t.Fatal(err)
	}
	doc := design.Read(text)
	if doc.Design == nil {
		t.Fatal(doc.Faults)
	}
	doc.Design.Title = title
	return record.Freeze(doc.Design, "test")
}

// mustSave saves a new design, or a revision of the one that save names.
func mustSave(t testing.TB, s *store.Store, save store.Save) record.Revision {
	t.Helper()
	saved, err := s.SaveRevision(t.Context(), ann, save)
	if err != nil {
		t.Fatal(err)
	}
	return saved
}
