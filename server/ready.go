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
	err := s.savingWorks(r.Context())
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

// savingWorks returns why saving does not work, nil if it does.
func (s *Server) savingWorks(ctx context.Context) error {
	saved, err := s.saving()
	if err != nil {
		return err
	}
	ctx, cancel := context.WithTimeout(ctx, readyPatience)
	defer cancel()
	return saved.Ready(ctx)
}
