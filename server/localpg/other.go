//go:build !unix

package localpg

import (
	"context"
	"fmt"
	"runtime"
)

// Server is a running private PostgreSQL. There is none on this system.
type Server struct{}

// Start tells that this system has none of what a private PostgreSQL rests on: sockets
// in a directory, peer authentication, file locks.
func Start(context.Context, Options) (*Server, error) {
	return nil, fmt.Errorf("%w: a private one cannot be kept on %s; name a database of your own in DATABASE_URL", ErrNoPostgres, runtime.GOOS)
}

// Err, PID, DSN, AdminDSN and Stop are never called, since Start gives no Server.
func (*Server) Err() error { return ErrNoPostgres }

// PID is 0: no process.
func (*Server) PID() int { return 0 }

// DSN is empty.
func (*Server) DSN() string { return "" }

// AdminDSN is empty.
func (*Server) AdminDSN() string { return "" }

// Stop has nothing to stop.
func (*Server) Stop(context.Context) error { return nil }
