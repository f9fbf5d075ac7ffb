package store_test

import (
	"context"
	"errors"
	"fmt"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"

	"rimeline/server/record"
	"rimeline/server/store"
)

// TestWrite_CancelledMidway: a caller that goes away undoes what was begun; the
// connection is free again, and the locks are.
func TestWrite_CancelledMidway(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	first := mustSave(t, s, store.Save{Frozen: sample(t, "House")})
	for name, wait := range map[string]func(ctx context.Context, tx pgx.Tx) error{
		"between two statements": func(ctx context.Context, tx pgx.Tx) error {
			return nil
		},
		"within a statement": func(ctx context.Context, tx pgx.Tx) error {
			_, err := tx.Exec(ctx, `select pg_sleep(10)`)
			return err
		},
	} {
		t.Run(name, func(t *testing.T) {
			ctx, cancel := context.WithCancel(t.Context())
			err := s.Write(ctx, func(ctx context.Context, tx pgx.Tx) error {
				if _, err := tx.Exec(ctx, `update design set title = 'half'`); err != nil {
					return err
				}
				time.AfterFunc(20*time.Millisecond, cancel)
				if err := wait(ctx, tx); err != nil {
					return err
				}
				<-ctx.Done()
				return nil // as if all had gone well
			})
			if !errors.Is(err, context.Canceled) || errors.Is(err, record.ErrUnavailable) {
				t.Errorf("got %v, want Canceled", err)
			}
			awaitIdle(t, s)
			if d, err := s.Design(t.Context(), first.Design); err != nil || d.Title != "House" {
				t.Errorf("the title is %q: %v", d.Title, err)
			}
		})
	}
	// The lock on the row is free, at the latest when the server finds out that the
	// one who slept has gone.
	began := time.Now()
	mustSave(t, s, store.Save{Design: first.Design, Base: 1, Frozen: sample(t, "House")})
	if took := time.Since(began); took > 4*time.Second {
		t.Errorf("the lock was held for %v", took)
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := s.SaveRevision(ctx, ann, store.Save{Frozen: sample(t, "House")}); !errors.Is(err, context.Canceled) {
		t.Errorf("a caller who had gone before: %v", err)
	}
}

func TestWrite_Panics(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	func() {
		defer func() { _ = recover() }()
		_ = s.Write(t.Context(), func(ctx context.Context, tx pgx.Tx) error { panic("ours") })
	}()
	awaitIdle(t, s)
}

// awaitIdle waits until no connection of the store is at work; one that is given up
// is closed a little later.
func awaitIdle(t *testing.T, s *store.Store) {
	t.Helper()
	for end := time.Now().Add(5 * time.Second); s.BusyConns() > 0; time.Sleep(time.Millisecond) {
		if time.Now().After(end) {
			t.Fatalf("%d connections are still at work", s.BusyConns())
		}
	}
}

// TestWrite_Deadlock: two transactions that wait for each other both succeed, one of
// them at the second try.
func TestWrite_Deadlock(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	a := mustSave(t, s, store.Save{Frozen: sample(t, "A")}).Design
	b := mustSave(t, s, store.Save{Frozen: sample(t, "B")}).Design
	met := make(chan struct{}, 2)
	tries := make(chan int, 2)
	outcome := make(chan error, 2)
	for i, ids := range [][2]record.ID{{a, b}, {b, a}} {
		go func() {
			n := 0
			outcome <- s.Write(t.Context(), func(ctx context.Context, tx pgx.Tx) error {
				n++
				for step, id := range ids {
					if _, err := tx.Exec(ctx, `update design set site = site || $2 where id = $1`, id, fmt.Sprint(i)); err != nil {
						return err
					}
					if step == 0 && n == 1 {
						met <- struct{}{}
						for len(met) < 2 {
							time.Sleep(time.Millisecond)
						}
					}
				}
				return nil
			})
			tries <- n
		}()
	}
	for range 2 {
		if err := <-outcome; err != nil {
			t.Error(err)
		}
	}
	if n := <-tries + <-tries; n < 3 {
		t.Errorf("%d tries: neither transaction had to be done again, so this tested nothing", n)
	}
	sites, err := s.QueryTexts(t.Context(), `select right(site, 2) from design order by 1`)
	if err != nil || len(sites) != 2 || sites[0] != sites[1] {
		t.Errorf("each did its work once, in one order: %q, %v", sites, err)
	}
}

// TestWrite_ConnectionDies: a transaction whose connection dies before the commit is
// done again on another one, and once.
func TestWrite_ConnectionDies(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	saved := mustSave(t, s, store.Save{Frozen: sample(t, "A")})
	n := 0
	err := s.Write(t.Context(), func(ctx context.Context, tx pgx.Tx) error {
		if _, err := tx.Exec(ctx, `update design set site = site || '+'`); err != nil {
			return err
		}
		if n++; n == 1 {
			_, err := tx.Exec(ctx, `select pg_terminate_backend(pg_backend_pid())`)
			return err
		}
		return nil
	})
	d, readErr := s.Design(t.Context(), saved.Design)
	if err != nil || readErr != nil || n != 2 || d.Site != saved.Frozen.Site+"+" {
		t.Errorf("after %d tries the site is %q: %v, %v", n, d.Site, err, readErr)
	}
}

// TestWrite_Impatient: a statement that takes too long, and a lock that is not free
// in time, are the database's not being able to serve.
func TestWrite_Impatient(t *testing.T) {
	t.Parallel()
	if testing.Short() {
		t.Skip("it waits for the timeouts, ten seconds")
	}
	s := newStore(t)
	saved := mustSave(t, s, store.Save{Frozen: sample(t, "A")})
	held, release := make(chan struct{}), make(chan struct{})
	go func() {
		_ = s.Write(t.Context(), func(ctx context.Context, tx pgx.Tx) error {
			_, err := tx.Exec(ctx, `update design set site = site`)
			close(held)
			<-release
			return err
		})
	}()
	<-held
	_, err := s.SaveRevision(t.Context(), ann, store.Save{Design: saved.Design, Base: 1, Frozen: sample(t, "B")})
	close(release)
	if !errors.Is(err, record.ErrUnavailable) || errors.Is(err, record.ErrUnknownOutcome) {
		t.Errorf("a lock that is not free: %v, want ErrUnavailable", err)
	}
	err = s.Write(t.Context(), func(ctx context.Context, tx pgx.Tx) error {
		_, err := tx.Exec(ctx, `select pg_sleep(20)`)
		return err
	})
	if !errors.Is(err, record.ErrUnavailable) {
		t.Errorf("a statement that takes too long: %v, want ErrUnavailable", err)
	}
}

// TestWrite_OneClock: every time that a transaction writes is the same.
func TestWrite_OneClock(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	mustSave(t, s, store.Save{Frozen: sample(t, "A"), Request: "k"})
	times, err := s.QueryTexts(t.Context(), `
		select created_at::text from design union select updated_at::text from design
		union select saved_at::text from revision union select done_at::text from save_request`)
	if err != nil || len(times) != 1 {
		t.Errorf("one save has the times %q: %v", times, err)
	}
}

// TestSession: what the store promises of its connections.
func TestSession(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	for name, want := range map[string]string{
		"synchronous_commit": "on", "TimeZone": "UTC", "application_name": "rimeline", "statement_timeout": "4500ms", "lock_timeout": "4s",
	} {
		if got, err := s.QueryTexts(t.Context(), `select current_setting($1)`, name); err != nil || got[0] != want {
			t.Errorf("%s is %q, want %q: %v", name, got, want, err)
		}
	}
}
