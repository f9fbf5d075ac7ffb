package store_test

import (
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"strings"
	"sync"
	"sync/atomic"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"rimeline/server/record"
	"rimeline/server/store"
)

func TestRemember(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	asked := sha256.Sum256([]byte("asked"))
	want := record.Answer{Status: 201, Header: map[string]string{"ETag": `"a"`, "Location": "/x?a=b&c=d"}, Body: []byte("\x00\xff{}")}
	calls := 0
	do := func(context.Context) (record.Answer, error) { calls++; return want, nil }
	for i := range 3 {
		got, repeated, err := s.Remember(t.Context(), ann, "k", asked, do)
		if diff := cmp.Diff(want, got, cmpopts.IgnoreFields(record.Answer{}, "At")); err != nil || diff != "" || repeated != (i > 0) || got.At.IsZero() {
			t.Errorf("call %d: repeated %t, kept at %v, %v, mismatch (-want +got)\n%s", i, repeated, got.At, err, diff)
		}
	}
	if calls != 1 {
		t.Errorf("the work was done %d times", calls)
	}
	if _, _, err := s.Remember(t.Context(), ann, "k", sha256.Sum256([]byte("else")), do); !errors.Is(err, record.ErrConflict) {
		t.Errorf("the key with something else: %v, want ErrConflict", err)
	}
	if _, repeated, err := s.Remember(t.Context(), ben, "k", asked, do); err != nil || repeated {
		t.Errorf("someone else's key: repeated %t, %v", repeated, err)
	}

	failed := errors.New("it failed")
	if _, _, err := s.Remember(t.Context(), ann, "k2", asked, func(context.Context) (record.Answer, error) { return want, failed }); !errors.Is(err, failed) {
		t.Errorf("work that fails: %v", err)
	}
	if _, repeated, err := s.Remember(t.Context(), ann, "k2", asked, do); err != nil || repeated {
		t.Errorf("after work that failed: repeated %t, %v", repeated, err)
	}
	for name, c := range map[string]struct {
		actor  record.Actor
		key    string
		status int
	}{
		"no key":         {ann, "", 200},
		"too long a key": {ann, strings.Repeat("k", 256), 200},
		"nobody":         {record.Actor{}, "k3", 200},
		"no status":      {ann, "k4", 0},
	} {
		_, _, err := s.Remember(t.Context(), c.actor, c.key, asked, func(context.Context) (record.Answer, error) { return record.Answer{Status: c.status}, nil })
		if !errors.Is(err, record.ErrInvalid) {
			t.Errorf("%s: %v, want ErrInvalid", name, err)
		}
	}
}

// TestRemember_AtTheSameTime: many repetitions at once save one revision and get one
// answer.
func TestRemember_AtTheSameTime(t *testing.T) {
	t.Parallel()
	a := newStore(t)
	b := sameDatabase(t, a)
	save := store.Save{Frozen: sample(t, "House"), Request: "k"}
	answers := make([]record.Answer, 20)
	var first atomic.Int32
	var group sync.WaitGroup
	for i := range answers {
		group.Go(func() {
			s := []*store.Store{a, b}[i%2]
			var repeated bool
			var err error
			answers[i], repeated, err = s.Remember(t.Context(), ann, save.Request, [32]byte{1}, func(ctx context.Context) (record.Answer, error) {
				saved, err := s.SaveRevision(ctx, ann, save)
				return record.Answer{Status: 201, Body: fmt.Append(nil, saved.Design, i)}, err
			})
			if err != nil {
				t.Error(err)
			}
			if !repeated {
				first.Add(1)
			}
		})
	}
	group.Wait()
	for _, other := range answers[1:] {
		if diff := cmp.Diff(answers[0], other); diff != "" {
			t.Errorf("two answers to one request (-one +other)\n%s", diff)
		}
	}
	if first.Load() != 1 {
		t.Errorf("%d answers are called the first", first.Load())
	}
	if page, err := a.Designs(t.Context(), record.Listing{}); err != nil || page.Total != 1 {
		t.Errorf("%d designs: %v", page.Total, err)
	}
}

func TestTidy(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	answer := func(context.Context) (record.Answer, error) { return record.Answer{Status: 200}, nil }
	for _, key := range []string{"old", "new"} {
		mustSave(t, s, store.Save{Frozen: sample(t, "House"), Request: key})
		if _, _, err := s.Remember(t.Context(), ann, key, [32]byte{}, answer); err != nil {
			t.Fatal(err)
		}
	}
	for _, sql := range []string{
		`update save_request set done_at = now() - interval '31 days' where key = 'old'`,
		`update answer set given_at = now() - interval '31 days' where key = 'old'`,
	} {
		if err := s.Exec(t.Context(), sql); err != nil {
			t.Fatal(err)
		}
	}
	if err := s.Tidy(t.Context()); err != nil {
		t.Fatal(err)
	}
	for _, table := range []string{"save_request", "answer"} {
		if keys, err := s.QueryTexts(t.Context(), `select key from `+table); err != nil || cmp.Diff([]string{"new"}, keys) != "" {
			t.Errorf("%s has %q, want the new one: %v", table, keys, err)
		}
	}
	if page, err := s.Designs(t.Context(), record.Listing{}); err != nil || page.Total != 2 {
		t.Errorf("%d designs, want 2: %v", page.Total, err)
	}
}
