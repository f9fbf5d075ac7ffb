package server

import (
	"context"
	"errors"
	"net/http"
	"time"

	"rimeline/server/record"
)

// readyPatience is how long the database may take to answer before the service calls
// itself not ready.
const readyPatience = 1500 * time.Millisecond

// ready says whether saving works. Like health it takes no place.
func (s *Server) ready(w http.ResponseWriter, r *http.Request) error {
	h := w.Header()
	h.Set("Content-Type", "text/plain; charset=utf-8")
	h.Set("Cache-Control", "no-store")
	err := s.askSaving(r.Context())
	if err == nil {
		_, _ = w.Write([]byte("ready\n"))
		return nil
	}
	s.log.WarnContext(r.Context(), "not ready", "request_id", visitOf(r).requestID, "error", err)
	reason := "the database cannot be used as it is"
	switch {
	case errors.Is(err, ErrStarting):
		reason = "the database is still starting"
	case errors.Is(err, ErrNothingSaved):
		reason = "nothing is saved, as the service was started without a database"
	case errors.Is(err, ErrUnfit):
	case errors.Is(err, record.ErrUnavailable):
		reason = "the database cannot be reached"
	}
	w.WriteHeader(http.StatusServiceUnavailable)
	_, _ = w.Write([]byte("not ready: " + reason + "; sizing works\n"))
	return nil
}

// savingWorks returns why saving does not work, nil if it does or did a moment ago:
// pages ask it each time they are shown, and a save finds out for itself.
func (s *Server) savingWorks(ctx context.Context) error {
	now := time.Now().UnixNano()
	if worked := s.savingWorkedAt.Load(); 0 < worked && worked <= now && now-worked < int64(worksFor) {
		return nil
	}
	err := s.askSaving(ctx)
	if err == nil {
		s.savingWorkedAt.Store(now)
	} else {
		s.savingWorkedAt.Store(0)
	}
	return err
}

// learn takes from the error of a save that saving does not work any more.
func (s *Server) learn(err error) {
	if errors.Is(err, record.ErrUnavailable) {
		s.savingWorkedAt.Store(0)
	}
}

// worksFor is how long an answer that saving works is taken for the next pages' too.
const worksFor = 200 * time.Millisecond

// askSaving returns why saving does not work, nil if it does, asked now.
func (s *Server) askSaving(ctx context.Context) error {
	saved, err := s.saving()
	if err != nil {
		return err
	}
	ctx, cancel := context.WithTimeout(ctx, readyPatience)
	defer cancel()
	return saved.Ready(ctx)
}
