package testdb

import (
	"errors"
	"io"
	"os"
	"os/exec"
)

// scratch is a directory that is removed at the latest when this program has ended,
// however it ends.
type scratch struct {
	path  string
	guard *exec.Cmd
	alive io.Closer // the guard's input; it ends when this program does
}

// afterUs waits until this program has closed the script's input or has ended, then
// until the cluster in the directory is stopped, and removes the directory. Linux stops
// the cluster by itself when its owner ends, other systems need to be told. A cluster
// that does not stop has its directory taken away after ten seconds.
const afterUs = `
cat >/dev/null
file=$1/data/postmaster.pid
if [ -e "$file" ] && [ "$(uname)" != Linux ]; then kill -INT "$(head -n 1 "$file")"; fi
tries=0
while [ -e "$file" ] && [ $tries -lt 100 ]; do sleep 0.1; tries=$((tries + 1)); done
rm -rf "$1"
`

func newScratch() (*scratch, error) {
	path, err := os.MkdirTemp(memory(), "rimeline-testdb-*")
	if err != nil {
		return nil, err
	}
	s := &scratch{path: path, guard: exec.Command("sh", "-c", afterUs, "sh", path)}
	if s.alive, err = s.guard.StdinPipe(); err != nil {
		return nil, errors.Join(err, os.RemoveAll(path))
	}
	// Ctrl-C in a terminal ends all that is in its foreground group.
	inOwnGroup(s.guard)
	if err := s.guard.Start(); err != nil {
		return nil, errors.Join(err, os.RemoveAll(path))
	}
	// PostgreSQL's user must be able to go through it.
	if err := os.Chmod(path, 0o711); err != nil {
		return nil, errors.Join(err, s.remove())
	}
	return s, nil
}

// remove removes the directory now.
func (s *scratch) remove() error { return errors.Join(s.alive.Close(), s.guard.Wait()) }
