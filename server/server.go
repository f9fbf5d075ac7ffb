// Package server is the site over HTTP: routes, handlers, the one way to fail, and
// the guards in front of them. It knows requests and pages. It must not know how a
// design is judged (sizing does), how a sentence about a result is put
// (server/display) or what a page looks like (views), and it neither reads flags
// nor the environment (cmd/rimeline does).
package server

import (
	"cmp"
	"context"
	"crypto/rand"
	"errors"
	"log/slog"
	"net"
	"net/http"
	"sync"
	"sync/atomic"
	"time"
)

// Config is all that a [Server] is told. The zero value serves loopback names with
// the default limits and logs nothing.
type Config struct {
	// Log receives one record for each request and each failure. nil discards them.
	Log *slog.Logger

	// HostNames are the names, beside those of loopback, by which browsers may
	// address the server, without a port: "sizing.example.org".
	HostNames []string

	// AnyAddress accepts an IP address as the Host of a request, as is needed where
	// the server listens on another address than loopback. A name is still refused
	// unless it is listed: only a name can be pointed at the server by a stranger.
	AnyAddress bool

	// Version is what /healthz and the foot of the pages call the program.
	Version string

	// Saving returns where designs are kept, or an error of the kind
	// record.ErrUnavailable, such as [ErrStarting]. It is called for each request
	// that needs it, so that saving may come while the server serves. nil is a
	// server that saves nothing.
	Saving func() (Saving, error)

	// NewRequestID names a request in the log and in the answer. nil is a random
	// text of 26 characters.
	NewRequestID func() string

	// MaxBodyBytes is the longest body that is read; 0 is 1 MiB. A design with
	// hundreds of strings takes a tenth of it.
	MaxBodyBytes int64

	// MaxConcurrent is how many requests are worked on at the same time; 0 is 64.
	// A request waits QueueWait for a place (0 is 2 s) and is then asked to come
	// again. Its body has been read before it takes a place, so that a slow client
	// holds a connection but never a place.
	MaxConcurrent int
	QueueWait     time.Duration

	// ReadTimeout bounds reading one request, WriteTimeout answering it,
	// IdleTimeout the pause between two on one connection, StopTimeout how long
	// requests in flight may take to end when the server is stopped. 0 is 15 s,
	// 30 s, 60 s and 10 s.
	ReadTimeout, WriteTimeout, IdleTimeout, StopTimeout time.Duration
}

// Server answers the requests of the site. It keeps nothing between two requests
// and may be used by many goroutines.
type Server struct {
	cfg    Config
	log    *slog.Logger
	places chan struct{} // holds one element for each request at work
	router http.Handler

	underWay sync.Map // keys of the requests at work that are to be done once

	savingWorkedAt atomic.Int64               // when saving last said that it works, in Unix nanoseconds; 0 while it does not
	keptLately     atomic.Pointer[keptMoment] // what pages of designs offer; nil is not known
}

// New makes the server that cfg describes.
func New(cfg Config) *Server {
	cfg.MaxBodyBytes = cmp.Or(cfg.MaxBodyBytes, 1<<20)
	cfg.MaxConcurrent = cmp.Or(cfg.MaxConcurrent, 64)
	cfg.QueueWait = cmp.Or(cfg.QueueWait, 2*time.Second)
	cfg.ReadTimeout = cmp.Or(cfg.ReadTimeout, 15*time.Second)
	cfg.WriteTimeout = cmp.Or(cfg.WriteTimeout, 30*time.Second)
	cfg.IdleTimeout = cmp.Or(cfg.IdleTimeout, 60*time.Second)
	cfg.StopTimeout = cmp.Or(cfg.StopTimeout, 10*time.Second)
	if cfg.NewRequestID == nil {
		cfg.NewRequestID = rand.Text
	}
	s := &Server{cfg: cfg, log: cfg.Log, places: make(chan struct{}, cfg.MaxConcurrent)}
	if s.log == nil {
		s.log = slog.New(slog.DiscardHandler)
	}
	s.router = s.routes()
	return s
}

// ServeHTTP answers one request.
func (s *Server) ServeHTTP(w http.ResponseWriter, r *http.Request) { s.router.ServeHTTP(w, r) }

// Serve answers requests on l until ctx ends. It then takes no new ones, lets those
// in flight end within StopTimeout, and returns nil; it returns an error where l
// fails, or where requests had to be cut off.
func (s *Server) Serve(ctx context.Context, l net.Listener) error {
	h := &http.Server{
		Handler:           s,
		ReadHeaderTimeout: min(5*time.Second, s.cfg.ReadTimeout),
		ReadTimeout:       s.cfg.ReadTimeout,
		WriteTimeout:      s.cfg.WriteTimeout,
		IdleTimeout:       s.cfg.IdleTimeout,
		MaxHeaderBytes:    32 << 10,
		ErrorLog:          slog.NewLogLogger(s.log.Handler(), slog.LevelWarn),
	}
	failed := make(chan error, 1)
	go func() { failed <- h.Serve(l) }()
	select {
	case err := <-failed:
		return err
	case <-ctx.Done():
	}
	stopping, cancel := context.WithTimeout(context.WithoutCancel(ctx), s.cfg.StopTimeout)
	defer cancel()
	if err := h.Shutdown(stopping); err != nil {
		return errors.Join(err, h.Close())
	}
	return nil
}
