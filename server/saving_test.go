package server

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"log/slog"
	"net/http"
	"strings"
	"testing"

	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/tests/testdb"
)

// savingServer is a server on a database of its own.
func savingServer(t *testing.T, cfg Config) (*Server, *store.Store) {
	t.Helper()
	return serverOn(t, testdb.New(t, migrate), cfg)
}

// serverOn is a server on a database that others may use too.
func serverOn(t *testing.T, dsn string, cfg Config) (*Server, *store.Store) {
	t.Helper()
	kept, err := store.Open(t.Context(), dsn, slog.New(slog.NewTextHandler(t.Output(), nil)))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(kept.Close)
	cfg.Saving = func() (Saving, error) { return kept, nil }
	s, _ := testServer(cfg)
	return s, kept
}

// migrate makes the tables in an empty database.
func migrate(ctx context.Context, dsn string) error {
	s, err := store.Open(ctx, dsn, nil)
	if err != nil {
		return err
	}
	defer s.Close()
	return s.Migrate(ctx)
}

// TestSavingFailures holds every kind of error of server/record, wrapped as the store
// wraps them, against its answer.
func TestSavingFailures(t *testing.T) {
	unknown := fmt.Errorf("%w: %w", record.ErrUnavailable, record.ErrUnknownOutcome)
	for _, c := range []struct {
		err        error
		page, api  int
		retryAfter string
		says       string // in both answers
	}{
		{record.ErrNotFound, 404, 404, "", "Nothing is saved at this address"},
		{record.ErrInvalid, 422, 422, "", "cannot be saved as it is"},
		{record.ErrConflict, 409, 409, "", "with a new key"},
		{&record.StaleError{Newest: 17}, 409, 412, "", "number 17"},
		{record.ErrUnavailable, 503, 503, "5", "try again in a moment, or keep the design as a file"},
		{unknown, 503, 503, "5", "in the instant of saving"},
		{ErrStarting, 503, 503, "1", "Sizing works already"},
		{ErrNothingSaved, 503, 503, "60", "keep a design as a file"},
		{ErrUnfit, 503, 503, "60", "the log of the service says why"},
		{errors.New("relation does not exist"), 500, 500, "", "could not be worked on"},
	} {
		t.Run(c.err.Error(), func(t *testing.T) {
			s, log := testServer(Config{})
			h := s.handle(func(http.ResponseWriter, *http.Request) error {
				return fmt.Errorf("store: save design %q: %w", "secret of the inside", c.err)
			})
			for path, status := range map[string]int{"/designs": c.page, "/api/v1/designs": c.api} {
				w := ask(t, h, "POST", path, "")
				if w.Code != status || w.Header().Get("Retry-After") != c.retryAfter {
					t.Errorf("%s: %d, Retry-After %q; want %d, %q", path, w.Code, w.Header().Get("Retry-After"), status, c.retryAfter)
				}
				if !strings.Contains(w.Body.String(), c.says) || strings.Contains(w.Body.String(), "secret of the inside") {
					t.Errorf("%s: the answer should say %q and nothing of the inside: %s", path, c.says, w.Body)
				}
				if !strings.Contains(log.String(), "secret of the inside") {
					t.Errorf("%s: the log does not have the cause: %s", path, log)
				}
				log.Reset()
			}
		})
	}
}

func TestSavingFailures_NewestInProblem(t *testing.T) {
	s, _ := testServer(Config{})
	h := s.handle(func(http.ResponseWriter, *http.Request) error { return &record.StaleError{Newest: 17} })
	var p struct{ Newest int64 }
	if err := json.Unmarshal(ask(t, h, "PUT", "/api/v1/designs/x", "").Body.Bytes(), &p); err != nil || p.Newest != 17 {
		t.Errorf("newest is %d (%v), want 17", p.Newest, err)
	}
}

// TestSaving_Comes: a service that is still starting saves as soon as it can, without
// being made anew.
func TestSaving_Comes(t *testing.T) {
	_, kept := savingServer(t, Config{})
	started := false
	s, _ := testServer(Config{Saving: func() (Saving, error) {
		if !started {
			return nil, ErrStarting
		}
		return kept, nil
	}})
	h := s.handle(s.withSaving(func(w http.ResponseWriter, r *http.Request, saved Saving) error {
		page, err := saved.Designs(r.Context(), record.Listing{})
		fmt.Fprint(w, page.Total)
		return err
	}))
	if w := ask(t, h, "GET", "/designs", ""); w.Code != 503 {
		t.Errorf("while starting: %d, want 503", w.Code)
	}
	started = true
	if w := ask(t, h, "GET", "/designs", ""); w.Code != 200 || w.Body.String() != "0" {
		t.Errorf("when started: %d %s, want 200 0", w.Code, w.Body)
	}
}
