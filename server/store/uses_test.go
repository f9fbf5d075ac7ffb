package store_test

import (
	"slices"
	"testing"

	"rimeline/server/record"
	"rimeline/server/store"
)

// TestUseCounts: each piece is counted as WhereUsed lists it.
func TestUseCounts(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	x1, x2 := record.Use{Kind: record.KindModule, Maker: "Acme Demo", Model: "X-1"}, record.Use{Kind: record.KindModule, Maker: "Acme Demo", Model: "X-2"}
	inverter := record.Use{Kind: record.KindInverter, Maker: "Acme Demo", Model: "X-1"}
	save := func(title string, uses ...record.Use) record.Revision {
		f := sample(t, title)
		f.Uses = uses
		return mustSave(t, s, store.Save{Frozen: f})
	}
	old := save("another now", x1)
	f := sample(t, "another now")
	f.Uses = []record.Use{x2}
	mustSave(t, s, store.Save{Design: old.Design, Base: 1, Frozen: f})
	save("twice", x1, x1, inverter)
	if err := s.Archive(t.Context(), ann, save("archived", record.Use{Kind: record.KindModule, Maker: "ACME  demo", Model: "x-1 "}).Design); err != nil {
		t.Fatal(err)
	}
	asked := []record.Use{x2, x1, {Kind: record.KindModule, Model: "none"}, inverter, x1}
	got, err := s.UseCounts(t.Context(), asked)
	if want := []int{1, 2, 0, 1, 2}; err != nil || !slices.Equal(got, want) {
		t.Errorf("%v, %v, want %v", got, err, want)
	}
	for i, u := range asked {
		listed, err := s.WhereUsed(t.Context(), u.Kind, u.Maker, u.Model, 100)
		if err != nil || len(listed) != got[i] {
			t.Errorf("%v: %d listed, %d counted: %v", u, len(listed), got[i], err)
		}
	}
	if none, err := s.UseCounts(t.Context(), nil); err != nil || len(none) != 0 {
		t.Errorf("of nothing: %v, %v", none, err)
	}
}
