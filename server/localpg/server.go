//go:build unix

package localpg

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"log/slog"
	"os"
	"path/filepath"
	"sync"
	"time"
)

// How long things may take before the next harsher step. Each is far above what was
// seen (a stop takes less than 0.1 s), because the harsher step costs a recovery.
const (
	attemptLimit = 5 * time.Second  // one attempt to connect
	orphanLimit  = 30 * time.Second // an orderly stop of a server that was left behind
	quitLimit    = 6 * time.Second  // an immediate stop; PostgreSQL kills its own processes after 5 s
)

// A server that died is started again at once, and after that with pauses that are
// doubled up to a limit and forgotten once a server has lived for a while.
const (
	firstPause = 100 * time.Millisecond
	longPause  = 10 * time.Second
	stableLife = time.Minute
)

// Server is a running private PostgreSQL. Its methods may be called from several
// goroutines.
type Server struct {
	place place
	user  serverUser
	bin   binaries
	opts  Options
	log   *slog.Logger

	stopping context.Context // ends when Stop begins
	stop     context.CancelFunc
	hurry    chan struct{} // closed when Stop no longer waits for an orderly end
	hurryOne sync.Once
	ended    chan struct{} // closed when nothing runs any more

	mu   sync.Mutex
	down error // nil while the server answers
	pid  int   // of the postmaster, 0 while there is none
}

// Start starts the private PostgreSQL in a directory and waits until it answers. The
// first start there makes the database. ctx limits the start alone: the server runs
// until Stop, or until this process ends.
func Start(ctx context.Context, opts Options) (*Server, error) {
	if opts.Getenv == nil {
		opts.Getenv = func(string) string { return "" }
	}
	s := &Server{
		opts:  opts,
		log:   cmp.Or(opts.Log, slog.New(slog.DiscardHandler)),
		hurry: make(chan struct{}),
		ended: make(chan struct{}),
	}
	s.stopping, s.stop = context.WithCancel(context.Background())
	var err error
	if s.place, err = claim(opts.Dir); err != nil {
		return nil, err
	}
	pm, err := s.firstLaunch(ctx)
	if err != nil {
		s.stop()
		return nil, errors.Join(err, s.place.release())
	}
	s.set(pm.pid(), nil)
	s.log.Info("private PostgreSQL is ready", "directory", s.place.dir, "version", s.bin.version, "process", pm.pid())
	go s.supervise(pm)
	return s, nil
}

// firstLaunch does all that comes before the server is watched.
func (s *Server) firstLaunch(ctx context.Context) (*postmaster, error) {
	var err error
	if s.user, err = chooseUser(s.place.data); err != nil {
		return nil, err
	}
	if s.bin, err = findBinaries(ctx, s.opts, s.user, s.place); err != nil {
		return nil, err
	}
	if err := endOrphans(s.place, s.log); err != nil {
		return nil, err
	}
	if err := s.place.makeRunDir(s.user); err != nil {
		return nil, err
	}
	if err := s.place.writeAccess(); err != nil {
		return nil, err
	}
	if !s.place.hasData() {
		if err := s.makeCluster(ctx); err != nil {
			return nil, err
		}
	}
	pm, err := s.launch()
	if err != nil {
		return nil, err
	}
	if err := s.awaitReady(ctx, pm); err != nil {
		pm.end(s.hurry, quitLimit)
		return nil, err
	}
	return pm, nil
}

// supervise watches the postmaster and starts another one when it dies, until Stop.
func (s *Server) supervise(pm *postmaster) {
	defer close(s.ended)
	defer s.set(0, errStopped)
	var pause time.Duration
	for pm != nil {
		stable := time.After(stableLife)
		select {
		case <-s.stopping.Done():
			pm.end(s.hurry, 0)
			return
		case <-pm.ended:
		}
		select {
		case <-stable:
			pause = 0
		default:
		}
		pm, pause = s.restart(pm.failure(), pause)
	}
}

// restart starts the server again, as often as it takes, with a pause before each that
// becomes longer. It returns no postmaster when Stop has begun, and the next pause.
func (s *Server) restart(down error, pause time.Duration) (*postmaster, time.Duration) {
	for s.stopping.Err() == nil {
		s.log.Error("private PostgreSQL is down", "reason", down, "started_again_in", pause)
		s.change(0, down)
		select {
		case <-s.stopping.Done():
			return nil, pause
		case <-time.After(pause):
		}
		pause = min(max(2*pause, firstPause), longPause)
		pm, err := s.relaunch()
		if err == nil {
			s.log.Info("private PostgreSQL is ready again", "process", pm.pid())
			s.change(pm.pid(), nil)
			return pm, pause
		}
		down = err
	}
	return nil, pause
}

// relaunch starts the server on data that are there, and waits until it answers.
func (s *Server) relaunch() (*postmaster, error) {
	if err := endOrphans(s.place, s.log); err != nil {
		return nil, err
	}
	pm, err := s.launch()
	if err != nil {
		return nil, err
	}
	if err := s.awaitReady(s.stopping, pm); err != nil {
		pm.end(s.hurry, quitLimit)
		return nil, err
	}
	return pm, nil
}

// errStopped is what Err says after Stop.
var errStopped = errors.New("the private PostgreSQL was stopped")

// set notes how the server is.
func (s *Server) set(pid int, down error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.pid, s.down = pid, down
}

// change notes how the server is, and tells if that is another state than before.
func (s *Server) change(pid int, down error) {
	before := s.Err()
	s.set(pid, down)
	if s.opts.OnChange != nil && (before == nil) != (down == nil) {
		s.opts.OnChange(down)
	}
}

// Err is nil while the server answers, and else why it does not: how it died, what
// keeps it from starting again, or that it was stopped.
func (s *Server) Err() error {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.down
}

// PID is the process id of the present postmaster, 0 while there is none.
func (s *Server) PID() int {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.pid
}

// DSN is the connection string of the database for pgx. It stays the same when the
// server dies and is started again.
func (s *Server) DSN() string { return s.place.dsn(role, Database) }

// AdminDSN is a connection string with all rights, for maintenance and for tests.
func (s *Server) AdminDSN() string { return s.place.dsn(superuser, Database) }

// Stop ends the server: open transactions are undone, what is committed is written
// out, and the directory is free. When ctx ends before that is over, the server is
// ended at once and the next start has to recover; nothing committed is lost by that
// either. Stop returns when nothing runs any more, at the latest some seconds after
// ctx has ended. Further calls do the same and change nothing.
func (s *Server) Stop(ctx context.Context) error {
	s.stop()
	var late error
	select {
	case <-s.ended:
	case <-ctx.Done():
		late = fmt.Errorf("the private PostgreSQL was not stopped in order: %w", context.Cause(ctx))
		s.hurryOne.Do(func() { close(s.hurry) })
		<-s.ended
	}
	return errors.Join(late, s.place.release())
}

// absolute resolves a directory that exists to the one name that the system has for it.
func absolute(dir string) (string, error) {
	abs, err := filepath.Abs(dir)
	if err != nil {
		return "", err
	}
	return filepath.EvalSymlinks(abs)
}

// isFile reports whether a path leads to a file that is not a directory.
func isFile(path string) bool {
	info, err := os.Stat(path)
	return err == nil && !info.IsDir()
}
