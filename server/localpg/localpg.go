// Package localpg keeps a private PostgreSQL for one machine. It finds the programs,
// makes the data directory, starts the server, watches it, starts it again when it
// dies, and stops it. Nobody else can reach that server: it listens on a socket in a
// closed directory only, and takes the operating system's word for who its one client
// is (peer authentication), so that there is no password to keep.
//
// The room knows processes, directories and users. It must not know what is saved: no
// table, no migration, and no query but those that make the empty database. It never
// fetches anything.
package localpg

import (
	"errors"
	"fmt"
	"log/slog"
	"path/filepath"
)

// Names inside the server.
const (
	Database  = "rimeline" // the database, owned by the role of the same name
	role      = "rimeline" // an ordinary role, which the service connects as
	superuser = "postgres" // for maintenance
)

// Options say where and how the private PostgreSQL runs. Only Dir must be given.
type Options struct {
	// Dir holds everything: data, lock, socket and settings. It is made if it does
	// not exist. DefaultDir says the usual place.
	Dir string
	// BinDir is the directory with the programs initdb and postgres. If it is empty
	// they are looked for in the usual places of this system.
	BinDir string
	// Getenv reads the environment; of it only PATH and the search paths of shared
	// libraries are used. nil is an empty environment.
	Getenv func(string) string
	// Log gets what happens to the server, and on level debug all that it prints
	// itself. nil discards.
	Log *slog.Logger
	// OnChange, if not nil, is called with the reason when the server has died and
	// with nil when it answers again. It must return soon: until then nothing is
	// started.
	OnChange func(down error)
	// UnsafeForTests makes commits that a crash can lose: it does not wait for the
	// disk. For nothing but the databases of tests.
	UnsafeForTests bool
}

var (
	// ErrNoPostgres is in the error of Start when the machine has no PostgreSQL that
	// could be used. The text of that error is three lines for the person who started
	// the service: that nothing is saved, that sizing goes on, and which one command
	// installs it.
	ErrNoPostgres = errors.New("no PostgreSQL")
	// ErrInUse is in the error of Start when another process keeps its PostgreSQL in
	// the directory.
	ErrInUse = errors.New("the data directory is in use")
)

// DefaultDir is where the data of a machine belong: a system directory for root (uid
// 0), because no other user may enter root's own, and else where the user keeps data.
func DefaultDir(uid int, getenv func(string) string) (string, error) {
	if uid == 0 {
		return "/var/lib/rimeline", nil
	}
	// The rules of XDG ask to ignore a relative path.
	if data := getenv("XDG_DATA_HOME"); filepath.IsAbs(data) {
		return filepath.Join(data, "rimeline"), nil
	}
	if home := getenv("HOME"); filepath.IsAbs(home) {
		return filepath.Join(home, ".local", "share", "rimeline"), nil
	}
	return "", fmt.Errorf("no place for the data: neither XDG_DATA_HOME nor HOME is set to an absolute path")
}
