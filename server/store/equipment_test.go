package store_test

import (
	"errors"
	"strings"
	"sync"
	"testing"

	"github.com/google/go-cmp/cmp"

	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/sizing/design"
)

func module(maker, model string) record.Equipment {
	return record.Equipment{
		Kind: record.KindModule, Maker: maker, Model: model, Document: []byte(`{"maker":"` + maker + `","model":"` + model + `"}`),
		Sources: map[string]string{"/voc_v": "sheet 2, table \x00", "": "everything else"}, Note: "as delivered",
		Answers: []design.Answer{{Pointer: "/voc_v", ValueAsked: `{"isc_a":1,"voc_v":37.3}`, Reason: "so printed <twice> \x00"}},
	}
}

func mustKeep(t testing.TB, s *store.Store, e record.Equipment) record.Equipment {
	t.Helper()
	kept, err := s.SaveEquipment(t.Context(), ann, e, "")
	if err != nil {
		t.Fatal(err)
	}
	return kept
}

func TestSaveEquipment(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	e := module("Acme Demo", "X-1")
	first := mustKeep(t, s, e)
	want := e
	want.ID, want.Version, want.Created, want.Updated = first.ID, 1, first.Created, first.Created
	if diff := cmp.Diff(want, first); diff != "" || first.ID == "" || first.Created.By != ann || first.Created.At.IsZero() {
		t.Errorf("mismatch (-want +saved)\n%s", diff)
	}
	changed := first
	changed.Model, changed.Kind, changed.Document, changed.Sources, changed.Answers, changed.Note = "X-2", record.KindInverter, []byte("\x00\xff"), nil, nil, ""
	second, err := s.SaveEquipment(t.Context(), ben, changed, "")
	want = changed
	want.Version, want.Updated, want.Sources = 2, second.Updated, map[string]string{}
	if diff := cmp.Diff(want, second); err != nil || diff != "" || second.Updated.By != ben || !second.Updated.At.After(first.Updated.At) {
		t.Errorf("%v, mismatch (-want +saved)\n%s", err, diff)
	}
	read, err := s.Equipment(t.Context(), first.ID)
	if diff := cmp.Diff(second, read); err != nil || diff != "" {
		t.Errorf("%v, mismatch (-saved +read)\n%s", err, diff)
	}

	for name, c := range map[string]struct {
		actor   record.Actor
		change  func(*record.Equipment)
		request string
		want    error
	}{
		"no such":           {ann, func(e *record.Equipment) { e.ID = "nowhere" }, "", record.ErrNotFound},
		"version, no id":    {ann, func(e *record.Equipment) { e.ID = "" }, "", record.ErrInvalid},
		"of no kind":        {ann, func(e *record.Equipment) { e.Kind = "cable" }, "", record.ErrInvalid},
		"no document":       {ann, func(e *record.Equipment) { e.Document = nil }, "", record.ErrInvalid},
		"an empty document": {ann, func(e *record.Equipment) { e.Document = []byte{} }, "", record.ErrInvalid},
		"nobody did it":     {record.Actor{}, func(e *record.Equipment) {}, "", record.ErrInvalid},
		"too long a key":    {ann, func(e *record.Equipment) {}, strings.Repeat("k", 256), record.ErrInvalid},
	} {
		e := second
		c.change(&e)
		if _, err := s.SaveEquipment(t.Context(), c.actor, e, c.request); !errors.Is(err, c.want) {
			t.Errorf("%s: got %v, want %v", name, err, c.want)
		}
	}
	if again, err := s.Equipment(t.Context(), first.ID); err != nil || cmp.Diff(second, again) != "" {
		t.Errorf("refusals changed it: %v\n%s", err, cmp.Diff(second, again))
	}
}

func TestSaveEquipment_TwoEditors(t *testing.T) {
	t.Parallel()
	a := newStore(t)
	b := sameDatabase(t, a)
	first := mustKeep(t, a, module("Acme Demo", "X-1"))
	outcomes := make([]error, 8)
	var group sync.WaitGroup
	for i := range outcomes {
		group.Go(func() { _, outcomes[i] = []*store.Store{a, b}[i%2].SaveEquipment(t.Context(), ann, first, "") })
	}
	group.Wait()
	saved := 0
	for _, err := range outcomes {
		if stale, ok := errors.AsType[*record.StaleError](err); err == nil {
			saved++
		} else if !ok || stale.Newest != 2 {
			t.Error(err)
		}
	}
	if saved != 1 {
		t.Errorf("%d saved, want 1", saved)
	}
}

func TestSaveEquipment_Repeated(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	ids := make([]record.ID, 20)
	var group sync.WaitGroup
	for i := range ids {
		group.Go(func() {
			e, err := s.SaveEquipment(t.Context(), ann, module("Acme Demo", "X-1"), "k")
			if ids[i] = e.ID; err != nil || e.Version != 1 {
				t.Errorf("version %d: %v", e.Version, err)
			}
		})
	}
	group.Wait()
	for _, id := range ids {
		if id != ids[0] || id == "" {
			t.Errorf("the same save made %q and %q", ids[0], id)
		}
	}
	if _, err := s.SaveEquipment(t.Context(), ann, module("Acme Demo", "X-2"), "k"); !errors.Is(err, record.ErrConflict) {
		t.Errorf("the same key for another: %v, want ErrConflict", err)
	}
}

func TestEquipmentList(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	var byTime []string
	for _, name := range [][2]string{{"Beta Demo", "M 10"}, {"acme Demo", "M-2"}, {"Acme Demo", "M-10"}, {"Beta Demo", "M 9"}} {
		mustKeep(t, s, module(name[0], name[1]))
		byTime = append([]string{name[1]}, byTime...)
	}
	inverter := module("Beta Demo", "QP-12K")
	inverter.Kind = record.KindInverter
	inverter = mustKeep(t, s, inverter)
	archived := mustKeep(t, s, module("Gone Demo", "Z"))
	for range 2 {
		if err := s.ArchiveEquipment(t.Context(), ann, archived.ID); err != nil {
			t.Fatal(err)
		}
	}
	for _, c := range []struct {
		name string
		ask  record.EquipmentListing
		want []string
	}{
		// "acme" stands beside "Acme", before it; "M 9" before "M 10".
		{"by name, as people read", record.EquipmentListing{}, []string{"M-2", "M-10", "M 9", "M 10", "QP-12K"}},
		{"reversed", record.EquipmentListing{Reversed: true}, []string{"QP-12K", "M 10", "M 9", "M-10", "M-2"}},
		{"the newest first", record.EquipmentListing{Sort: record.SortUpdated}, append([]string{"QP-12K"}, byTime...)},
		{"modules", record.EquipmentListing{Kind: record.KindModule}, []string{"M-2", "M-10", "M 9", "M 10"}},
		{"inverters", record.EquipmentListing{Kind: record.KindInverter}, []string{"QP-12K"}},
		{"of no kind", record.EquipmentListing{Kind: "a\x00"}, nil},
		{"archived", record.EquipmentListing{Archived: true}, []string{"Z"}},
		{"words", record.EquipmentListing{Words: "beta 12"}, []string{"QP-12K"}},
		{"words that are not there", record.EquipmentListing{Words: "beta acme"}, nil},
	} {
		page, err := s.EquipmentList(t.Context(), c.ask)
		var got []string
		for _, e := range page.Equipment {
			got = append(got, e.Model)
		}
		if diff := cmp.Diff(c.want, got); err != nil || diff != "" || page.Total != len(c.want) || page.More || page.Next != "" || page.Previous != "" {
			t.Errorf("%s: %v, total %d, mismatch (-want +got)\n%s", c.name, err, page.Total, diff)
		}
	}
	names := func(limit int) (of []string) {
		t.Helper()
		found, err := s.EquipmentNames(t.Context(), limit)
		if err != nil {
			t.Fatal(err)
		}
		for _, n := range found {
			if e, err := s.Equipment(t.Context(), n.ID); err != nil || (record.EquipmentName{ID: e.ID, Kind: e.Kind, Maker: e.Maker, Model: e.Model}) != n {
				t.Errorf("%+v is the name of %+v, %v", n, e, err)
			}
			of = append(of, n.Model)
		}
		return of
	}
	if diff := cmp.Diff([]string{"M-2", "M-10", "M 9", "M 10", "QP-12K"}, names(99)); diff != "" {
		t.Errorf("names (-want +got)\n%s", diff)
	}
	if diff := cmp.Diff([]string{"M-2", "QP-12K"}, names(1)); diff != "" {
		t.Errorf("one name of each kind (-want +got)\n%s", diff)
	}
	if err := s.RestoreEquipment(t.Context(), ann, archived.ID); err != nil {
		t.Fatal(err)
	}
	if e, err := s.Equipment(t.Context(), archived.ID); err != nil || e.ArchivedAt != nil || e.Version != 1 {
		t.Errorf("restored: %+v, %v", e, err)
	}
	if _, err := s.EquipmentList(t.Context(), record.EquipmentListing{Sort: record.SortHeadroom}); !errors.Is(err, record.ErrInvalid) {
		t.Errorf("sorted by headroom: %v, want ErrInvalid", err)
	}
}
