//go:build unix

package localpg

import (
	"bytes"
	"errors"
	"fmt"
	"log/slog"
	"os"
	"path/filepath"
	"strconv"
	"syscall"
	"time"
)

// serverProcess is a process of PostgreSQL that works on our data.
type serverProcess struct {
	pid  int
	kind processKind
}

type processKind int

const (
	foreign processKind = iota // started by somebody else, such as an administrator
	ours                       // a postmaster that was started by this room
	backend                    // started by a postmaster
)

// kindOf tells from its command line what a process of PostgreSQL is. Those that a
// postmaster starts write what they do over theirs.
func kindOf(commandLine []byte, p place) processKind {
	switch {
	case bytes.HasPrefix(commandLine, []byte("postgres: ")):
		return backend
	case bytes.Contains(commandLine, []byte(accessSetting(p))):
		return ours
	}
	return foreign
}

// endOrphans ends what is left of an earlier server on the data. We hold the lock, so
// that nothing of a server that is wanted can be among it: either the process that
// started it died, and it is ending or was never told; or it died itself, and one of
// its processes still works on the last thing it was asked for.
func endOrphans(p place, log *slog.Logger) error {
	left, err := serversOn(p)
	if err != nil || len(left) == 0 {
		return err
	}
	hasPostmaster := false
	for _, o := range left {
		switch o.kind {
		case foreign:
			return fmt.Errorf("%w: a PostgreSQL that Rimeline did not start (process %d) works on %s; stop it first", ErrInUse, o.pid, p.data)
		case ours:
			hasPostmaster = true
		}
	}
	log.Warn("what is left of an earlier private PostgreSQL is ended", "processes", len(left))
	if hasPostmaster {
		if gone, err := signalUntilGone(p, ours, syscall.SIGINT, orphanLimit); gone || err != nil {
			return err
		}
	}
	// Those without a postmaster have nothing to put in order: the next start recovers.
	for _, step := range []syscall.Signal{syscall.SIGQUIT, syscall.SIGKILL} {
		if gone, err := signalUntilGone(p, backend, step, quitLimit); gone || err != nil {
			return err
		}
	}
	return errors.New("processes of an earlier private PostgreSQL do not end")
}

// signalUntilGone signals the processes on our data that are of a kind or beyond it,
// once, and waits until none is left of any.
func signalUntilGone(p place, kind processKind, signal syscall.Signal, limit time.Duration) (gone bool, err error) {
	late := time.After(limit)
	for first := true; ; first = false {
		left, err := serversOn(p)
		if err != nil || len(left) == 0 {
			return err == nil, err
		}
		for _, o := range left {
			if first && (o.kind == kind || kind == backend) {
				// It fails only when the process has just ended.
				_ = syscall.Kill(o.pid, signal)
			}
		}
		select {
		case <-late:
			return false, nil
		case <-time.After(5 * time.Millisecond):
		}
	}
}

// pidInFile is the process id that a postmaster left in the lock file of its data, 0 if
// there is none. PostgreSQL writes it negative for a server with a single user.
func pidInFile(data string) int {
	text, err := os.ReadFile(filepath.Join(data, "postmaster.pid"))
	if err != nil {
		return 0
	}
	first, _, _ := bytes.Cut(text, []byte("\n"))
	pid, err := strconv.Atoi(string(bytes.TrimSpace(first)))
	if err != nil {
		return 0
	}
	return max(pid, -pid)
}
