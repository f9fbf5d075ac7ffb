//go:build unix

package localpg

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"os/user"
	"path/filepath"
	"runtime"
	"strconv"
	"strings"
	"syscall"
	"time"
)

// place is the directory of a private PostgreSQL and what lies in it. The directory
// and its files belong to the user of this process; data and run belong to the user
// that PostgreSQL runs as, and are closed to everybody else.
type place struct {
	dir  string   // absolute, without symbolic links
	data string   // dir/data, the cluster
	run  string   // the socket's directory: dir/run, or elsewhere if that is too long
	lock *os.File // dir/lock, held while we own the directory
}

const port = 5432 // a part of the socket's name; nothing listens on a network

// newPrefix begins the name of a cluster that is being made.
const newPrefix = "data.new-"

// claim makes the directory if need be and takes it for this process. The system gives
// it back when the process ends, however it ends.
func claim(dir string) (place, error) {
	if dir == "" {
		return place{}, errors.New("no directory for the data was given")
	}
	if err := makeDir(dir); err != nil {
		return place{}, fmt.Errorf("the data directory cannot be made: %w", err)
	}
	dir, err := absolute(dir)
	if err != nil {
		return place{}, fmt.Errorf("the data directory: %w", err)
	}
	p := place{dir: dir, data: filepath.Join(dir, "data")}
	// Not through a symbolic link: root may be asked to use a directory of another user.
	p.lock, err = os.OpenFile(filepath.Join(dir, "lock"), os.O_RDWR|os.O_CREATE|syscall.O_NOFOLLOW, 0o600)
	if err != nil {
		return place{}, fmt.Errorf("the data directory %s cannot be used: %w%s", dir, err, ownerHint(dir, err))
	}
	err = lockFile(p.lock)
	if errors.Is(err, syscall.EWOULDBLOCK) {
		err = fmt.Errorf("%w: %s belongs to process %s, which is running", ErrInUse, dir, lockHolder(p.lock))
	}
	if err == nil {
		err = noteHolder(p.lock)
	}
	if err != nil {
		return place{}, errors.Join(err, p.lock.Close())
	}
	return p, nil
}

// lockFile takes the lock. It tries for a moment: an owner that was killed while it
// started a program leaves that a copy of the lock, until the program begins to run.
func lockFile(f *os.File) error {
	const pause, tries = 20 * time.Millisecond, 25
	for n := 0; ; n++ {
		err := syscall.Flock(int(f.Fd()), syscall.LOCK_EX|syscall.LOCK_NB)
		if !errors.Is(err, syscall.EWOULDBLOCK) || n == tries {
			return err
		}
		time.Sleep(pause)
	}
}

// makeDir makes the directory, its parents as well. Where root makes it, the user that
// PostgreSQL runs as must be able to go through it, whatever the umask is.
func makeDir(dir string) error {
	if _, err := os.Stat(dir); !errors.Is(err, fs.ErrNotExist) {
		return err
	}
	mode := fs.FileMode(0o700)
	if os.Geteuid() == 0 {
		mode = 0o755
	}
	if err := os.MkdirAll(dir, mode); err != nil {
		return err
	}
	return os.Chmod(dir, mode)
}

// lockHolder is the process id that the holder of a lock wrote into it.
func lockHolder(lock *os.File) string {
	text := make([]byte, 20)
	n, _ := lock.ReadAt(text, 0) // an empty file gives the answer below
	if pid, err := strconv.Atoi(strings.TrimSpace(string(text[:n]))); err == nil {
		return strconv.Itoa(pid)
	}
	return "(unknown)"
}

func noteHolder(lock *os.File) error {
	if err := lock.Truncate(0); err != nil {
		return err
	}
	_, err := lock.WriteAt([]byte(strconv.Itoa(os.Getpid())+"\n"), 0)
	return err
}

// release gives the directory back and removes a socket's directory that lies
// elsewhere. Further calls do nothing.
func (p place) release() error {
	var err error
	if p.run != "" && filepath.Dir(p.run) != p.dir {
		err = os.RemoveAll(p.run)
	}
	if closing := p.lock.Close(); !errors.Is(closing, os.ErrClosed) {
		err = errors.Join(err, closing)
	}
	return err
}

// hasData reports whether the cluster was made.
func (p place) hasData() bool { return isFile(filepath.Join(p.data, "PG_VERSION")) }

// maxSocketPath is how many bytes the path of a socket may have: the length of
// sun_path in sockaddr_un less the zero at its end.
func maxSocketPath() int {
	if runtime.GOOS == "linux" {
		return 107
	}
	return 103
}

// socket is the path of the socket in a directory.
func socket(run string) string { return filepath.Join(run, fmt.Sprintf(".s.PGSQL.%d", port)) }

// servesAsRun reports whether a directory can hold the socket. pgx takes a comma for
// the end of a host's name.
func servesAsRun(run string) bool {
	return len(socket(run)) <= maxSocketPath() && !strings.Contains(run, ",")
}

// makeRunDir makes the directory of the socket, empty.
func (p *place) makeRunDir(owner serverUser) error {
	run := filepath.Join(p.dir, "run")
	if err := os.RemoveAll(run); err != nil {
		return err
	}
	var err error
	if servesAsRun(run) {
		err = os.Mkdir(run, 0o700)
	} else {
		// A new name each time: in a directory that all may write to, one that can be
		// guessed could be taken by somebody else before us.
		run, err = os.MkdirTemp("", "rimeline-*")
	}
	if err != nil {
		return err
	}
	p.run = run
	if !servesAsRun(run) {
		return fmt.Errorf("no place for the socket: %q has %d bytes and may have %d, and no comma; "+
			"choose a shorter data directory, or set TMPDIR to a shorter one", socket(run), len(socket(run)), maxSocketPath())
	}
	return owner.own(run)
}

// dsn is the connection string for a role and a database.
func (p place) dsn(role, database string) string {
	quote := strings.NewReplacer(`\`, `\\`, `'`, `\'`)
	return fmt.Sprintf("host='%s' port=%d user=%s dbname=%s sslmode=disable", quote.Replace(p.run), port, role, database)
}

// writeAccess writes who may connect: the user of this process, as either role, and
// nobody else. Roles of fixed names keep the data usable when the service is run by
// another user later, or as root.
func (p place) writeAccess() error {
	me, err := user.Current()
	if err != nil {
		return fmt.Errorf("PostgreSQL needs a name for the user %d who runs this: %w", os.Geteuid(), err)
	}
	const banner = "# Written at every start of Rimeline; changes are lost.\n"
	name := `"` + strings.ReplaceAll(me.Username, `"`, `""`) + `"`
	if err := p.write(hbaFile, banner+"local all all peer map=rimeline\n"); err != nil {
		return err
	}
	return p.write(identFile, fmt.Sprintf("%srimeline %s %s\nrimeline %s %s\n", banner, name, role, name, superuser))
}

const (
	hbaFile   = "pg_hba.conf"
	identFile = "pg_ident.conf"
)

// write puts a file that PostgreSQL may read into the directory, whole or not at all.
func (p place) write(name, content string) error {
	f, err := os.CreateTemp(p.dir, name+".new-*")
	if err != nil {
		return err
	}
	_, err = f.WriteString(content)
	err = errors.Join(err, f.Chmod(0o644), f.Close())
	if err == nil {
		err = os.Rename(f.Name(), filepath.Join(p.dir, name))
	}
	if err != nil {
		return errors.Join(err, os.Remove(f.Name()))
	}
	return nil
}

// removeUnfinished removes what a start left that was interrupted.
func (p place) removeUnfinished() error {
	entries, err := os.ReadDir(p.dir)
	if err != nil {
		return err
	}
	for _, e := range entries {
		if strings.HasPrefix(e.Name(), newPrefix) || strings.Contains(e.Name(), ".conf.new-") {
			err = errors.Join(err, os.RemoveAll(filepath.Join(p.dir, e.Name())))
		}
	}
	return err
}
