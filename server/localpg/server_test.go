//go:build unix

package localpg

import (
	"bufio"
	"bytes"
	"cmp"
	"context"
	"errors"
	"fmt"
	"io"
	"log/slog"
	"os"
	"os/exec"
	"os/user"
	"path/filepath"
	"runtime"
	"strconv"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgconn"
)

// patience is how long a test waits for what takes well below a second. It is a limit
// for what hangs, not a measure of speed.
const patience = 30 * time.Second

// ownerDir, in the environment of this test program, makes it an owner of a private
// PostgreSQL in that directory rather than run tests: it says when the server is ready
// and stops it at the end of its input.
const ownerDir = "LOCALPG_TEST_OWNER_DIR"

func TestMain(m *testing.M) {
	if dir := os.Getenv(ownerDir); dir != "" {
		os.Exit(own(dir))
	}
	status := m.Run()
	for _, dir := range []string{made.dir, filepath.Dir(copied.path)} {
		if filepath.IsAbs(dir) {
			_ = os.RemoveAll(dir)
		}
	}
	os.Exit(status)
}

func own(dir string) int {
	s, err := Start(context.Background(), Options{Dir: dir, Getenv: os.Getenv})
	if err != nil {
		fmt.Println("error:", strings.ReplaceAll(err.Error(), "\n", " / "))
		return 1
	}
	fmt.Println("ready:", s.PID())
	_, _ = io.Copy(io.Discard, os.Stdin)
	if err := s.Stop(context.Background()); err != nil {
		fmt.Println("error:", err)
		return 1
	}
	fmt.Println("stopped")
	return 0
}

// owner is another process that owns a private PostgreSQL.
type owner struct {
	cmd   *exec.Cmd
	stdin io.WriteCloser
	lines *bufio.Scanner
}

// startOwner starts one, as another user if as is not nil. It does not wait.
func startOwner(t *testing.T, dir string, as *syscall.Credential) *owner {
	t.Helper()
	o := &owner{cmd: exec.Command(program(t))}
	o.cmd.Env = []string{ownerDir + "=" + dir, "PATH=" + os.Getenv("PATH"), "TMPDIR=" + os.TempDir()}
	o.cmd.Dir = "/"
	o.cmd.Stderr = os.Stderr
	o.cmd.SysProcAttr = &syscall.SysProcAttr{Credential: as}
	var err error
	if o.stdin, err = o.cmd.StdinPipe(); err != nil {
		t.Fatal(err)
	}
	stdout, err := o.cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	o.lines = bufio.NewScanner(stdout)
	if err := o.cmd.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { o.kill() })
	return o
}

// says is the next line that the owner prints.
func (o *owner) says() string {
	o.lines.Scan()
	return o.lines.Text()
}

// ready waits until the owner's server answers and returns the postmaster's process.
func (o *owner) ready(t *testing.T) int {
	t.Helper()
	line := o.says()
	pid, err := strconv.Atoi(strings.TrimPrefix(line, "ready: "))
	if err != nil {
		t.Fatalf("the owner says %q", line)
	}
	return pid
}

// stop has the owner stop its server in order.
func (o *owner) stop(t *testing.T) {
	t.Helper()
	if err := o.stdin.Close(); err != nil {
		t.Fatal(err)
	}
	if said := o.says(); said != "stopped" {
		t.Fatalf("the owner says %q", said)
	}
}

func (o *owner) kill() {
	_ = o.cmd.Process.Kill()
	_ = o.cmd.Wait()
}

var copied struct {
	once sync.Once
	path string
	err  error
}

// program is a copy of this test program that every user may run; the go command puts
// it into a directory that is closed to others.
func program(t *testing.T) string {
	t.Helper()
	copied.once.Do(func() {
		content, err := os.ReadFile(os.Args[0])
		if err != nil {
			copied.err = err
			return
		}
		dir, err := os.MkdirTemp("", "localpg-program-*")
		if err != nil {
			copied.err = err
			return
		}
		copied.path = filepath.Join(dir, "program")
		copied.err = errors.Join(os.Chmod(dir, 0o755), os.WriteFile(copied.path, content, 0o755))
	})
	if copied.err != nil {
		t.Fatal(copied.err)
	}
	return copied.path
}

// memory is a directory whose files are kept in memory, "" where there is none. Making a
// cluster on a disk that others use takes many times as long.
func memory() string {
	if info, err := os.Stat("/dev/shm"); err == nil && info.IsDir() {
		return "/dev/shm"
	}
	return ""
}

// openDir makes a directory that every user may enter. T.TempDir is closed to others.
func openDir(t testing.TB) string {
	t.Helper()
	return openDirIn(t, memory())
}

func openDirIn(t testing.TB, parent string) string {
	t.Helper()
	dir, err := os.MkdirTemp(parent, "localpg-*")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := os.RemoveAll(dir); err != nil {
			t.Error(err)
		}
	})
	if err := os.Chmod(dir, 0o755); err != nil {
		t.Fatal(err)
	}
	return dir
}

// start starts a server that is stopped at the end of the test.
func start(t testing.TB, opts Options) *Server {
	t.Helper()
	opts.Getenv = os.Getenv
	opts.Log = cmp.Or(opts.Log, slog.New(slog.NewTextHandler(t.Output(), &slog.HandlerOptions{Level: slog.LevelDebug})))
	s, err := Start(t.Context(), opts)
	if errors.Is(err, ErrNoPostgres) && os.Getenv("CI") != "true" {
		t.Skip(err)
	}
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { stop(t, s) })
	return s
}

func stop(t testing.TB, s *Server) {
	t.Helper()
	ctx, cancel := context.WithTimeout(context.Background(), patience)
	defer cancel()
	if err := s.Stop(ctx); err != nil {
		t.Error(err)
	}
}

func startError(t *testing.T, opts Options) error {
	t.Helper()
	opts.Getenv = os.Getenv
	s, err := Start(t.Context(), opts)
	if err == nil {
		stop(t, s)
		t.Fatal("it started")
	}
	return err
}

func connect(t testing.TB, dsn string) *pgx.Conn {
	t.Helper()
	conn, err := pgx.Connect(t.Context(), dsn)
	if err != nil {
		t.Fatal(err)
	}
	// A connection of a server that was killed does not close well.
	t.Cleanup(func() { _ = conn.Close(context.Background()) })
	return conn
}

func exec1(t testing.TB, conn *pgx.Conn, statement string, args ...any) {
	t.Helper()
	if _, err := conn.Exec(t.Context(), statement, args...); err != nil {
		t.Fatalf("%s: %v", statement, err)
	}
}

func query[T any](t testing.TB, conn *pgx.Conn, statement string) T {
	t.Helper()
	var found T
	if err := conn.QueryRow(t.Context(), statement).Scan(&found); err != nil {
		t.Fatalf("%s: %v", statement, err)
	}
	return found
}

// until waits until a condition is true.
func until(t testing.TB, what string, condition func() bool) {
	t.Helper()
	for deadline := time.Now().Add(patience); !condition(); {
		if time.Now().After(deadline) {
			t.Fatalf("waited in vain until %s", what)
		}
		time.Sleep(2 * time.Millisecond)
	}
}

// running reports whether a process runs. One that has ended and whose parent has not
// asked how is none.
func running(pid int) bool {
	if runtime.GOOS != "linux" {
		state, err := exec.Command("ps", "-o", "stat=", "-p", strconv.Itoa(pid)).Output()
		return err == nil && !bytes.HasPrefix(bytes.TrimSpace(state), []byte("Z"))
	}
	stat, err := os.ReadFile(fmt.Sprintf("/proc/%d/stat", pid))
	return err == nil && !bytes.Contains(stat, []byte(") Z "))
}

func kill(t testing.TB, pid int) {
	t.Helper()
	if pid <= 1 {
		t.Fatalf("no process to kill: %d", pid)
	}
	if err := syscall.Kill(pid, syscall.SIGKILL); err != nil {
		t.Fatal(err)
	}
}

var made struct {
	once sync.Once
	dir  string
	err  error
}

// usedDir makes a directory in which a server was started and stopped before: a copy of
// the first of them.
func usedDir(t testing.TB) string {
	t.Helper()
	made.once.Do(func() {
		if made.dir, made.err = os.MkdirTemp(memory(), "localpg-made-*"); made.err != nil {
			return
		}
		if made.err = os.Chmod(made.dir, 0o755); made.err != nil {
			return
		}
		var s *Server
		if s, made.err = Start(context.Background(), Options{Dir: made.dir, Getenv: os.Getenv}); made.err == nil {
			made.err = s.Stop(context.Background())
		}
	})
	if errors.Is(made.err, ErrNoPostgres) && os.Getenv("CI") != "true" {
		t.Skip(made.err)
	}
	if made.err != nil {
		t.Fatal(made.err)
	}
	dir := openDir(t)
	// With the owners, as os.CopyFS does not.
	if out, err := exec.Command("cp", "-a", made.dir+"/.", dir).CombinedOutput(); err != nil {
		t.Fatalf("cp: %v: %s", err, out)
	}
	return dir
}

func needRoot(t testing.TB) {
	t.Helper()
	if os.Geteuid() != 0 {
		t.Skip("only root can be another user")
	}
}

// unprivileged is who has no rights on this machine.
func unprivileged(t testing.TB) serverUser {
	t.Helper()
	needRoot(t)
	u, err := lookUp(user.Lookup("nobody"))
	if err != nil {
		t.Fatal(err)
	}
	return u
}

// openDirOf makes a directory that belongs to a user.
func openDirOf(t testing.TB, u serverUser) string {
	t.Helper()
	dir := openDir(t)
	if err := u.own(dir); err != nil {
		t.Fatal(err)
	}
	return dir
}

func TestStart_FirstAndWarm(t *testing.T) {
	t.Parallel()
	dir := filepath.Join(openDir(t), "of", "Rimeline")
	s := start(t, Options{Dir: dir})
	conn := connect(t, s.DSN())
	for setting, want := range map[string]string{
		"data_checksums": "on", "fsync": "on", "full_page_writes": "on", "synchronous_commit": "on",
		"listen_addresses": "", "server_encoding": "UTF8", "is_superuser": "off",
	} {
		if got := query[string](t, conn, "show "+setting); got != want {
			t.Errorf("%s is %q, want %q", setting, got, want)
		}
	}
	if got := query[string](t, conn, "select datcollate || ' ' || pg_get_userbyid(datdba) || ' ' || current_database() from pg_database where datname = current_database()"); got != "C rimeline rimeline" {
		t.Errorf("collation, owner and name of the database: %s", got)
	}
	if got := query[string](t, connect(t, s.AdminDSN()), "show is_superuser"); got != "on" {
		t.Errorf("is_superuser is %s for the administrator", got)
	}
	for _, closed := range []string{"data", "run"} {
		info, err := os.Stat(filepath.Join(dir, closed))
		if err != nil {
			t.Fatal(err)
		}
		if info.Mode().Perm() != 0o700 {
			t.Errorf("%s has mode %v, want it closed to others", closed, info.Mode())
		}
	}
	if pgid, err := syscall.Getpgid(s.PID()); err != nil || pgid == syscall.Getpgrp() {
		t.Errorf("the server is in our process group: Ctrl-C would stop it before us (%v)", err)
	}
	// As the service will: tables are made by the ordinary role, in the usual schema.
	exec1(t, conn, "create table note (word text)")
	exec1(t, conn, "insert into note values ('kept')")
	first := s.PID()
	stop(t, s)
	if s.Err() == nil || s.PID() != 0 || running(first) {
		t.Errorf("after Stop: Err %v, PID %d, process running %t", s.Err(), s.PID(), running(first))
	}
	stop(t, s) // changes nothing

	warm := start(t, Options{Dir: dir})
	if got := query[string](t, connect(t, warm.DSN()), "select word from note"); got != "kept" {
		t.Errorf("found %q", got)
	}
	if warm.DSN() != s.DSN() {
		t.Errorf("the connection string changed from %s to %s", s.DSN(), warm.DSN())
	}
	if warm.Err() != nil {
		t.Error(warm.Err())
	}
}

func TestStart_UnsafeForTests(t *testing.T) {
	t.Parallel()
	conn := connect(t, start(t, Options{Dir: usedDir(t), UnsafeForTests: true}).DSN())
	for _, setting := range []string{"fsync", "full_page_writes", "synchronous_commit"} {
		if got := query[string](t, conn, "show "+setting); got != "off" {
			t.Errorf("%s is %s", setting, got)
		}
	}
}

func TestStart_OneOwner(t *testing.T) {
	t.Parallel()
	dir := usedDir(t)
	s := start(t, Options{Dir: dir})
	err := startError(t, Options{Dir: dir})
	if !errors.Is(err, ErrInUse) || !strings.Contains(err.Error(), strconv.Itoa(os.Getpid())) {
		t.Errorf("a second owner in this process is told: %v", err)
	}
	if said := startOwner(t, dir, nil).says(); !strings.Contains(said, ErrInUse.Error()) || !strings.Contains(said, strconv.Itoa(os.Getpid())) {
		t.Errorf("a second owner in another process is told: %v", said)
	}
	if err := connect(t, s.DSN()).Ping(t.Context()); err != nil {
		t.Errorf("the first owner's server does not answer any more: %v", err)
	}
	stop(t, s)
	o := startOwner(t, dir, nil)
	o.ready(t)
	o.stop(t)
}

// changes notes what OnChange is told.
type changes struct {
	mu   sync.Mutex
	told []error
}

func (c *changes) note(down error) {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.told = append(c.told, down)
}

func (c *changes) all() []error {
	c.mu.Lock()
	defer c.mu.Unlock()
	return append([]error(nil), c.told...)
}

func TestSupervise_PostmasterKilled(t *testing.T) {
	t.Parallel()
	var told changes
	s := start(t, Options{Dir: usedDir(t), OnChange: told.note})
	conn := connect(t, s.DSN())
	exec1(t, conn, "create table note (n int)")
	for round := range 3 {
		exec1(t, conn, "insert into note values ($1)", round) // acknowledged: must be there
		pid := s.PID()
		kill(t, pid)
		until(t, "another postmaster answers", func() bool { return s.PID() != pid && s.Err() == nil && s.PID() != 0 })
		conn = connect(t, s.DSN())
		if got := query[int](t, conn, "select count(*) from note"); got != round+1 {
			t.Fatalf("%d rows after kill %d", got, round+1)
		}
		exec1(t, conn, "select 1")
	}
	until(t, "all changes are told", func() bool { return len(told.all()) == 6 })
	for i, down := range told.all() {
		if (down != nil) != (i%2 == 0) {
			t.Errorf("change %d: %v", i, down)
		}
		if down != nil && !strings.Contains(down.Error(), "killed") {
			t.Errorf("the reason does not say how it died: %v", down)
		}
	}
}

// TestSupervise_CannotRestart: what keeps the server down is told, and when it is mended
// the server is back without anybody's doing.
func TestSupervise_CannotRestart(t *testing.T) {
	t.Parallel()
	dir := usedDir(t)
	s := start(t, Options{Dir: dir})
	control, aside := filepath.Join(s.place.data, "global", "pg_control"), filepath.Join(s.place.data, "aside")
	pid := s.PID()
	if err := os.Rename(control, aside); err != nil {
		t.Fatal(err)
	}
	kill(t, pid)
	until(t, "the reason is told", func() bool { return s.Err() != nil && strings.Contains(s.Err().Error(), "pg_control") })
	if s.PID() != 0 {
		t.Errorf("process %d while it is down", s.PID())
	}
	if err := os.Rename(aside, control); err != nil {
		t.Fatal(err)
	}
	until(t, "it is back", func() bool { return s.Err() == nil })
	if err := connect(t, s.DSN()).Ping(t.Context()); err != nil {
		t.Error(err)
	}
}

func TestStop_WhileItCannotRestart(t *testing.T) {
	t.Parallel()
	s := start(t, Options{Dir: usedDir(t)})
	if err := os.Remove(filepath.Join(s.place.data, "global", "pg_control")); err != nil {
		t.Fatal(err)
	}
	kill(t, s.PID())
	until(t, "it is down", func() bool { return s.Err() != nil })
	stop(t, s)
	if !errors.Is(s.Err(), errStopped) {
		t.Errorf("after Stop: %v", s.Err())
	}
}

func TestStop_OpenConnections(t *testing.T) {
	t.Parallel()
	dir := usedDir(t)
	s := start(t, Options{Dir: dir})
	conn := connect(t, s.DSN())
	exec1(t, conn, "create table note (word text)")
	exec1(t, conn, "insert into note values ('committed')")
	exec1(t, conn, "begin")
	exec1(t, conn, "insert into note values ('not committed')")
	waiting := make(chan error, 1)
	asleep := connect(t, s.DSN())
	go func() {
		_, err := asleep.Exec(context.WithoutCancel(t.Context()), "select pg_sleep(3600)")
		waiting <- err
	}()
	watch := connect(t, s.AdminDSN())
	until(t, "the statement runs", func() bool {
		return query[int](t, watch, "select count(*) from pg_stat_activity where wait_event = 'PgSleep'") == 1
	})
	stop(t, s)
	// Its client is told that it was the administrator who stopped it.
	if refusal, ok := errors.AsType[*pgconn.PgError](<-waiting); !ok || refusal.Code != "57P01" {
		t.Errorf("the waiting client is told %v", refusal)
	}
	if got := query[string](t, connect(t, start(t, Options{Dir: dir}).DSN()), "select string_agg(word, ' ') from note"); got != "committed" {
		t.Errorf("found %q", got)
	}
}

// TestStop_Hurry: a stop that may not take its time loses nothing either.
func TestStop_Hurry(t *testing.T) {
	t.Parallel()
	dir := usedDir(t)
	s := start(t, Options{Dir: dir})
	conn := connect(t, s.DSN())
	exec1(t, conn, "create table note (word text)")
	exec1(t, conn, "insert into note values ('committed')")
	pid := s.PID()
	// A postmaster that stands still does not stop in order.
	if err := syscall.Kill(pid, syscall.SIGSTOP); err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if err := s.Stop(ctx); !errors.Is(err, context.Canceled) {
		t.Errorf("Stop says %v", err)
	}
	if running(pid) {
		t.Error("it runs still")
	}
	if got := query[string](t, connect(t, start(t, Options{Dir: dir}).DSN()), "select word from note"); got != "committed" {
		t.Errorf("found %q", got)
	}
}

func TestStart_OwnerKilled(t *testing.T) {
	t.Parallel()
	dir := usedDir(t)
	for round := range 3 {
		o := startOwner(t, dir, nil)
		pid := o.ready(t)
		o.kill()
		s := start(t, Options{Dir: dir}) // at once, while the other one may be ending
		if running(pid) {
			t.Errorf("round %d: the server that was left behind, process %d, runs still", round, pid)
		}
		conn := connect(t, s.DSN())
		exec1(t, conn, "create table if not exists note (n int)")
		exec1(t, conn, "insert into note values (1)")
		if got := query[int](t, conn, "select count(*) from note"); got != round+1 {
			t.Errorf("round %d: %d rows", round, got)
		}
		stop(t, s)
	}
}

// TestStart_OwnerKilled_ServerStays: a server that did not notice that its owner is gone
// is ended in order by the next one. So it is where the system does not tell it.
func TestStart_OwnerKilled_ServerStays(t *testing.T) {
	t.Parallel()
	dir := usedDir(t)
	o := startOwner(t, dir, nil)
	pid := o.ready(t)
	if err := syscall.Kill(pid, syscall.SIGSTOP); err != nil { // keeps what it is told for later
		t.Fatal(err)
	}
	o.kill()
	time.AfterFunc(300*time.Millisecond, func() { _ = syscall.Kill(pid, syscall.SIGCONT) })
	start(t, Options{Dir: dir})
	if running(pid) {
		t.Errorf("process %d runs still", pid)
	}
}

func TestStart_BothKilled(t *testing.T) {
	t.Parallel()
	dir := usedDir(t)
	o := startOwner(t, dir, nil)
	pid := o.ready(t)
	if err := syscall.Kill(o.cmd.Process.Pid, syscall.SIGSTOP); err != nil { // so that it does not start another one
		t.Fatal(err)
	}
	kill(t, pid)
	o.kill()
	if pidInFile(filepath.Join(dir, "data")) != pid {
		t.Fatal("the lock file is not stale, so that this tests nothing")
	}
	start(t, Options{Dir: dir})
}

// TestStart_StalePID: the process id that a killed server left belongs to another
// program of the same user by now, as it may after the machine was started again.
func TestStart_StalePID(t *testing.T) {
	t.Parallel()
	dir := usedDir(t)
	o := startOwner(t, dir, nil)
	pid := o.ready(t)
	if err := syscall.Kill(o.cmd.Process.Pid, syscall.SIGSTOP); err != nil {
		t.Fatal(err)
	}
	kill(t, pid)
	o.kill()
	file := filepath.Join(dir, "data", "postmaster.pid")
	left, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	as, err := chooseUser(filepath.Join(dir, "data"))
	if err != nil {
		t.Fatal(err)
	}
	sleep := exec.Command("sleep", "3600")
	sleep.Dir = "/"
	sleep.SysProcAttr = &syscall.SysProcAttr{Credential: as.credential()}
	if err := sleep.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = sleep.Process.Kill(); _ = sleep.Wait() })
	_, rest, _ := bytes.Cut(left, []byte("\n"))
	if err := os.WriteFile(file, fmt.Appendf(nil, "%d\n%s", sleep.Process.Pid, rest), 0o600); err != nil {
		t.Fatal(err)
	}
	s := start(t, Options{Dir: dir})
	if err := connect(t, s.DSN()).Ping(t.Context()); err != nil {
		t.Error(err)
	}
	if !running(sleep.Process.Pid) {
		t.Error("the other program was ended")
	}
}

// TestStart_ForeignServer: a server that somebody else started on the data is left
// alone.
func TestStart_ForeignServer(t *testing.T) {
	t.Parallel()
	dir := usedDir(t)
	s := start(t, Options{Dir: dir})
	stop(t, s)
	cmd := exec.Command(s.bin.postgres(), "-D", s.place.data, "-k", "", "-c", "listen_addresses=", "-c", "unix_socket_directories="+s.place.run)
	cmd.Dir = "/"
	cmd.SysProcAttr = &syscall.SysProcAttr{Credential: s.user.credential()}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = cmd.Process.Signal(syscall.SIGINT); _ = cmd.Wait() })
	until(t, "it has the data", func() bool { return pidInFile(s.place.data) == cmd.Process.Pid })
	err := startError(t, Options{Dir: dir})
	if !errors.Is(err, ErrInUse) || !strings.Contains(err.Error(), strconv.Itoa(cmd.Process.Pid)) {
		t.Errorf("it says %v", err)
	}
	if !running(cmd.Process.Pid) {
		t.Error("the other server was ended")
	}
}

func TestStart_WrongMajor(t *testing.T) {
	t.Parallel()
	dir := usedDir(t)
	s := start(t, Options{Dir: dir})
	stop(t, s)
	version := filepath.Join(s.place.data, "PG_VERSION")
	for _, c := range []struct {
		content string
		want    []string
	}{
		{"12\n", []string{"PostgreSQL 12", s.bin.version, "12 and start Rimeline again"}},
		{"nonsense", []string{"PG_VERSION", "nonsense"}},
	} {
		if err := os.WriteFile(version, []byte(c.content), 0o600); err != nil {
			t.Fatal(err)
		}
		err := startError(t, Options{Dir: dir})
		for _, want := range c.want {
			if !strings.Contains(err.Error(), want) {
				t.Errorf("data of version %q: %q is not in %v", c.content, want, err)
			}
		}
	}
	if entries, err := filepath.Glob(filepath.Join(dir, newPrefix+"*")); err != nil || len(entries) > 0 {
		t.Errorf("other data were begun: %q, %v", entries, err)
	}
}

func TestStart_NoPostgres(t *testing.T) {
	t.Parallel()
	err := startError(t, Options{Dir: openDir(t), BinDir: openDir(t)})
	if !errors.Is(err, ErrNoPostgres) {
		t.Errorf("%v is not ErrNoPostgres", err)
	}
	if n := strings.Count(err.Error(), "\n"); n != 2 {
		t.Errorf("%d lines: %v", n+1, err)
	}
}

func TestStart_NoDirectory(t *testing.T) {
	t.Parallel()
	if err := startError(t, Options{}); !strings.Contains(err.Error(), "directory") {
		t.Error(err)
	}
	file := filepath.Join(openDir(t), "file")
	if err := os.WriteFile(file, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	if err := startError(t, Options{Dir: file}); !strings.Contains(err.Error(), file) {
		t.Errorf("a file in the place of the directory: %v", err)
	}
}

// TestStart_DataWithoutVersion: what is not a cluster but lies in its place is neither
// used nor removed.
func TestStart_DataWithoutVersion(t *testing.T) {
	t.Parallel()
	dir := openDir(t)
	precious := filepath.Join(dir, "data", "precious")
	if err := os.Mkdir(filepath.Dir(precious), 0o700); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(precious, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	if os.Geteuid() == 0 {
		if err := unprivileged(t).own(filepath.Dir(precious)); err != nil {
			t.Fatal(err)
		}
	}
	if err := startError(t, Options{Dir: dir}); !strings.Contains(err.Error(), "in the way") {
		t.Error(err)
	}
	if !isFile(precious) {
		t.Error("it was removed")
	}
}

func TestStart_Unreachable(t *testing.T) {
	t.Parallel()
	needRoot(t)
	closed := openDir(t)
	dir := filepath.Join(closed, "below")
	if err := os.Chmod(closed, 0o700); err != nil {
		t.Fatal(err)
	}
	err := startError(t, Options{Dir: dir})
	for _, want := range []string{"data directory", "may not enter " + closed, "chmod o+x " + closed} {
		if !strings.Contains(err.Error(), want) {
			t.Errorf("%q is not in %v", want, err)
		}
	}
	if strings.Contains(err.Error(), "rimeline again") {
		t.Errorf("it advises to install PostgreSQL: %v", err)
	}
}

// TestStart_ProgramsUnreachable: PostgreSQL's programs lie where root alone can enter.
func TestStart_ProgramsUnreachable(t *testing.T) {
	t.Parallel()
	needRoot(t)
	s := start(t, Options{Dir: usedDir(t)})
	closed := openDir(t)
	bin := filepath.Join(closed, "bin")
	if err := os.Mkdir(bin, 0o755); err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"postgres", "initdb"} {
		if err := os.Symlink(filepath.Join(s.bin.dir, name), filepath.Join(bin, name)); err != nil {
			t.Fatal(err)
		}
	}
	if err := os.Chmod(closed, 0o700); err != nil {
		t.Fatal(err)
	}
	err := startError(t, Options{Dir: openDir(t), BinDir: bin})
	if !errors.Is(err, ErrNoPostgres) || !strings.Contains(err.Error(), "may not enter "+closed) {
		t.Error(err)
	}
}

func TestStart_AsRoot(t *testing.T) {
	t.Parallel()
	needRoot(t)
	s := start(t, Options{Dir: openDir(t)})
	info, err := os.Stat(filepath.Join(s.place.data, "postmaster.pid"))
	if err != nil {
		t.Fatal(err)
	}
	uid := info.Sys().(*syscall.Stat_t).Uid
	if uid == 0 || uid != s.user.uid {
		t.Errorf("PostgreSQL runs as the user %d, want %d", uid, s.user.uid)
	}
	stop(t, s)
	if err := os.Chown(s.place.data, 0, 0); err != nil {
		t.Fatal(err)
	}
	if err := startError(t, Options{Dir: s.place.dir}); !strings.Contains(err.Error(), "chown") {
		t.Errorf("data that belong to root: %v", err)
	}
}

// TestStart_AsSomeUser: by a user without rights; then the same data by root, who goes
// on as that user; then by the user again.
func TestStart_AsSomeUser(t *testing.T) {
	t.Parallel()
	u := unprivileged(t)
	dir := openDirOf(t, u)
	first := startOwner(t, dir, u.credential())
	first.ready(t)
	// Others, even the superuser's, do not get in but through peer authentication.
	config, err := pgx.ParseConfig(place{run: filepath.Join(dir, "run")}.dsn(role, Database))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := pgx.ConnectConfig(t.Context(), config); err == nil || !strings.Contains(strings.ToLower(err.Error()), "peer") {
		t.Errorf("somebody else is let in: %v", err)
	}
	first.stop(t)
	s := start(t, Options{Dir: dir})
	if s.user.uid != u.uid {
		t.Errorf("root runs PostgreSQL as %s, want the owner of the data, %s", s.user.name, u.name)
	}
	exec1(t, connect(t, s.DSN()), "create table note (n int)")
	stop(t, s)
	again := startOwner(t, dir, u.credential())
	again.ready(t)
	again.stop(t)
}

// TestStart_NotOurs: a user is told whom a directory belongs to.
func TestStart_NotOurs(t *testing.T) {
	t.Parallel()
	u := unprivileged(t)
	for name, dir := range map[string]string{
		"the directory is root's": openDir(t),
		"the data are another's": func() string {
			dir := openDirOf(t, u)
			if err := os.Mkdir(filepath.Join(dir, "data"), 0o755); err != nil {
				t.Fatal(err)
			}
			return dir
		}(),
	} {
		if said := startOwner(t, dir, u.credential()).says(); !strings.Contains(said, "user root") {
			t.Errorf("%s: it says %q", name, said)
		}
	}
}

func TestStart_OddDirectories(t *testing.T) {
	t.Parallel()
	for _, name := range []string{strings.Repeat("long", 25), "with, comma", `a b's "c" \d [e] $f`, "Dächer"} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			dir := filepath.Join(openDir(t), name)
			s := start(t, Options{Dir: dir})
			if err := connect(t, s.DSN()).Ping(t.Context()); err != nil {
				t.Error(err)
			}
			stop(t, s)
			if filepath.Dir(s.place.run) != s.place.dir {
				if _, err := os.Stat(s.place.run); !os.IsNotExist(err) {
					t.Errorf("the socket's directory %s is left behind: %v", s.place.run, err)
				}
			}
			if err := connect(t, start(t, Options{Dir: dir}).DSN()).Ping(t.Context()); err != nil {
				t.Error(err)
			}
		})
	}
}

// TestStart_Interrupted kills the owner at each step of its first start. Whatever is left
// then, the next start makes the server, and leaves nothing half made behind.
func TestStart_Interrupted(t *testing.T) {
	t.Parallel()
	for _, step := range []struct{ name, file string }{
		{"locked", "lock"},
		{"begun", newPrefix + "*"},
		{"initdb at work", newPrefix + "*/PG_VERSION"},
		{"initdb further", newPrefix + "*/base/1/PG_VERSION"},
		{"complete", "data"},
		{"starting", "data/postmaster.pid"},
		{"answering", "run/.s.PGSQL.5432"},
	} {
		t.Run(step.name, func(t *testing.T) {
			dir := openDir(t)
			o := startOwner(t, dir, nil)
			until(t, step.file+" is there", func() bool {
				found, err := filepath.Glob(filepath.Join(dir, step.file))
				return err == nil && len(found) > 0
			})
			o.kill()
			s := start(t, Options{Dir: dir})
			exec1(t, connect(t, s.DSN()), "create table note (n int)")
			if left, err := filepath.Glob(filepath.Join(dir, "*.new-*")); err != nil || len(left) > 0 {
				t.Errorf("left behind: %q, %v", left, err)
			}
			stop(t, s)
		})
	}
}

// TestStart_InterruptedBeforeDatabase: the cluster is whole, but the database is not in
// it yet.
func TestStart_InterruptedBeforeDatabase(t *testing.T) {
	t.Parallel()
	dir := usedDir(t)
	s := start(t, Options{Dir: dir})
	for _, lacking := range [][]string{{"database"}, {"database", "role"}} {
		admin := connect(t, s.place.dsn(superuser, "template1"))
		for _, what := range lacking {
			exec1(t, admin, "drop "+what+" rimeline")
		}
		stop(t, s)
		s = start(t, Options{Dir: dir})
		exec1(t, connect(t, s.DSN()), "create table note (n int)")
		stop(t, s)
		s = start(t, Options{Dir: dir})
	}
}

func TestStart_Cancelled(t *testing.T) {
	t.Parallel()
	dir := openDir(t)
	start(t, Options{Dir: usedDir(t)}) // skips where there is no PostgreSQL
	ctx, cancel := context.WithTimeout(t.Context(), 300*time.Millisecond)
	defer cancel()
	if s, err := Start(ctx, Options{Dir: dir, Getenv: os.Getenv}); err == nil {
		stop(t, s)
		t.Skip("this machine makes a cluster in less time than it was given")
	} else if !errors.Is(err, context.DeadlineExceeded) {
		t.Errorf("it says %v", err)
	}
	start(t, Options{Dir: dir}) // the directory is free
}

func BenchmarkStart_First(b *testing.B) {
	for b.Loop() {
		dir := openDirIn(b, "")
		s, err := Start(b.Context(), Options{Dir: dir, Getenv: os.Getenv})
		if err != nil {
			b.Fatal(err)
		}
		b.StopTimer()
		stop(b, s)
		b.StartTimer()
	}
}

func BenchmarkStart_Warm(b *testing.B) {
	dir := openDirIn(b, "")
	stop(b, start(b, Options{Dir: dir}))
	for b.Loop() {
		s, err := Start(b.Context(), Options{Dir: dir, Getenv: os.Getenv})
		if err != nil {
			b.Fatal(err)
		}
		b.StopTimer()
		stop(b, s)
		b.StartTimer()
	}
}
