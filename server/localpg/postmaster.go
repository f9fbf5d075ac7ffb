//go:build unix

package localpg

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"log/slog"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"sync"
	"syscall"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgconn"
)

// process is a program that was started and ends with this one at the latest.
type process struct {
	cmd   *exec.Cmd
	ended chan struct{} // closed when it has ended
	err   error         // how; to be read after that
}

// startTied starts a program on a thread of its own that lives as long as the program:
// Linux sends the signal that tells of our death when the thread that started the
// program ends, not when the process does.
func startTied(cmd *exec.Cmd) (*process, error) {
	p := &process{cmd: cmd, ended: make(chan struct{})}
	started := make(chan error)
	go func() {
		runtime.LockOSThread()
		defer runtime.UnlockOSThread()
		if err := cmd.Start(); err != nil {
			started <- err
			return
		}
		started <- nil
		p.err = cmd.Wait()
		close(p.ended)
	}()
	if err := <-started; err != nil {
		return nil, err
	}
	return p, nil
}

// postmaster is the first process of a PostgreSQL server, the one that starts the
// others and outlives them.
type postmaster struct {
	*process
	output *output
}

func (pm *postmaster) pid() int { return pm.cmd.Process.Pid }

// launch starts a postmaster; it does not wait until it answers.
func (s *Server) launch() (*postmaster, error) {
	args := []string{
		"-D", s.place.data, "-k", s.place.run, "-p", fmt.Sprint(port),
		"-c", "listen_addresses=", // no network
		"-c", "unix_socket_permissions=0700",
		"-c", accessSetting(s.place), "-c", "ident_file=" + filepath.Join(s.place.dir, identFile),
		"-c", "logging_collector=off", "-c", "log_destination=stderr", "-c", "log_line_prefix=",
		// What a client is refused it is told; the text of statements and rows, which
		// is somebody's work, stays out of the log.
		"-c", "log_min_error_statement=panic", "-c", "log_error_verbosity=terse", "-c", "log_checkpoints=off",
	}
	durable := "on"
	if s.opts.UnsafeForTests {
		durable = "off"
		args = append(args, "-c", "max_connections=500") // of many tests at once
	}
	for _, name := range []string{"fsync", "full_page_writes", "synchronous_commit"} {
		args = append(args, "-c", name+"="+durable)
	}
	cmd := exec.Command(s.bin.postgres(), args...)
	cmd.Dir = s.place.data
	cmd.Env = environment(s.opts.Getenv)
	// A process that died long ago may have left its id in the lock file of the data,
	// and another program may have that id by now. PostgreSQL would take it for a
	// server. It passes over the id in this variable, and still looks for processes
	// that use the data, which it would not if the file were removed.
	if stale := pidInFile(s.place.data); stale > 0 && !mayServe(stale) {
		cmd.Env = append(cmd.Env, fmt.Sprintf("PG_GRANDPARENT_PID=%d", stale))
	}
	// Its own group, so that Ctrl-C in a terminal reaches this process alone, which
	// then stops the server in order.
	cmd.SysProcAttr = &syscall.SysProcAttr{Setpgid: true, Credential: s.user.credential()}
	dieWithUs(cmd.SysProcAttr, syscall.SIGINT)
	// A pipe of our own: Wait would wait for one of its making until every process of
	// the server has closed it.
	reading, writing, err := os.Pipe()
	if err != nil {
		return nil, err
	}
	cmd.Stderr = writing
	p, err := startTied(cmd)
	closing := writing.Close()
	if err != nil || closing != nil {
		return nil, errors.Join(err, closing, reading.Close())
	}
	return &postmaster{process: p, output: follow(reading, s.log)}, nil
}

// accessSetting is the setting by which a server of ours is known, even when the
// process that started it is gone.
func accessSetting(p place) string { return "hba_file=" + filepath.Join(p.dir, hbaFile) }

// end ends the server in order, waits for that until hurry is closed or the limit is
// over (0 is none), and then ends it at once. It returns when the process has ended.
func (pm *postmaster) end(hurry <-chan struct{}, limit time.Duration) {
	var late <-chan time.Time
	if limit > 0 {
		late = time.After(limit)
	}
	// A signal fails only when the process has ended, which is then seen below.
	_ = pm.cmd.Process.Signal(syscall.SIGINT)
	select {
	case <-pm.ended:
		return
	case <-hurry:
	case <-late:
	}
	_ = pm.cmd.Process.Signal(syscall.SIGQUIT)
	select {
	case <-pm.ended:
		return
	case <-time.After(quitLimit):
	}
	_ = pm.cmd.Process.Kill()
	<-pm.ended
}

// failure tells how the server ended, with the last that it said. To be called after
// it has ended.
func (pm *postmaster) failure() error {
	how := "in order, though nobody here asked for it"
	if pm.err != nil {
		how = pm.err.Error()
	}
	if said := pm.output.complaints(); said != "" {
		return fmt.Errorf("PostgreSQL ended (%s): %s", how, said)
	}
	return fmt.Errorf("PostgreSQL ended (%s)", how)
}

// awaitReady waits until the server answers, recovers from a crash first if it must,
// and makes the database where there is none.
func (s *Server) awaitReady(ctx context.Context, pm *postmaster) error {
	const pause = 5 * time.Millisecond
	for {
		err := s.greet(ctx)
		if err == nil {
			pm.output.forget()
			return nil
		}
		// Class 57P is a server that starts or stops. What is no answer of the server
		// is one that does not listen yet.
		if refusal, ok := errors.AsType[*pgconn.PgError](err); ok && !strings.HasPrefix(refusal.Code, "57P") {
			return fmt.Errorf("the private PostgreSQL refuses its own client: %w", err)
		}
		if errors.Is(err, fs.ErrPermission) {
			return fmt.Errorf("the socket of the private PostgreSQL is closed to this process: %w", err)
		}
		select {
		case <-pm.ended:
			return pm.failure()
		case <-ctx.Done():
			return fmt.Errorf("the private PostgreSQL did not answer in time: %w", errors.Join(context.Cause(ctx), err))
		case <-time.After(pause):
		}
	}
}

// Codes of PostgreSQL's refusals.
const (
	noSuchDatabase     = "3D000"
	noSuchRole         = "28000"
	roleExists         = "42710"
	tooManyConnections = "53300"
)

// greet connects as the service will.
func (s *Server) greet(ctx context.Context) error {
	ctx, cancel := context.WithTimeout(ctx, attemptLimit)
	defer cancel()
	conn, err := pgx.Connect(ctx, s.DSN())
	if err == nil {
		return conn.Close(ctx)
	}
	if refusal, ok := errors.AsType[*pgconn.PgError](err); ok {
		switch refusal.Code {
		case tooManyConnections:
			return nil // others were faster: it answers
		case noSuchDatabase, noSuchRole:
			return s.makeDatabase(ctx)
		}
	}
	return err
}

// makeDatabase makes the role and the database that the service uses, as far as they
// are not there: it may have been interrupted before.
func (s *Server) makeDatabase(ctx context.Context) error {
	conn, err := pgx.Connect(ctx, s.place.dsn(superuser, "template1"))
	if err != nil {
		return err
	}
	for _, step := range []struct{ statement, instead string }{
		{"create role " + role + " login", ""},
		// A new cluster has an empty database that nobody needs here. To make another
		// one writes hundreds of files, which takes as long as all the rest.
		{"alter database postgres rename to " + Database, "create database " + Database},
		{"alter database " + Database + " owner to " + role, ""},
		{"comment on database " + Database + " is 'what Rimeline saves'", ""},
	} {
		_, err := conn.Exec(ctx, step.statement)
		if refusal, ok := errors.AsType[*pgconn.PgError](err); ok {
			switch refusal.Code {
			case roleExists:
				err = nil
			case noSuchDatabase:
				_, err = conn.Exec(ctx, step.instead)
			}
		}
		if err != nil {
			return errors.Join(fmt.Errorf("%s: %w", step.statement, err), conn.Close(ctx))
		}
	}
	return conn.Close(ctx)
}

// output follows what a server prints. It reads to the end whatever happens, because a
// server whose output nobody reads stands still.
type output struct {
	read chan struct{} // closed at the end of the output

	mu   sync.Mutex
	last []string // of what is not mere information
}

func follow(r io.ReadCloser, log *slog.Logger) *output {
	o := &output{read: make(chan struct{})}
	go func() {
		defer close(o.read)
		defer r.Close()
		lines := bufio.NewReader(r)
		for {
			line, err := lines.ReadSlice('\n') // of a line that is too long, the parts
			if text := strings.TrimRight(string(line), "\n"); text != "" {
				o.note(text)
				log.Log(context.Background(), levelOf(text), "postgres", "says", text)
			}
			if err != nil && !errors.Is(err, bufio.ErrBufferFull) {
				return
			}
		}
	}()
	return o
}

// levelOf is how much a line that a server prints is to be heeded. What goes wrong for
// one client is told to that client, so that it need not be told here.
func levelOf(line string) slog.Level {
	switch {
	case strings.HasPrefix(line, "PANIC:"):
		return slog.LevelError
	case strings.HasPrefix(line, "WARNING:"), strings.Contains(line, "was terminated by signal"):
		return slog.LevelWarn
	}
	return slog.LevelDebug
}

const keptLines = 5

func (o *output) note(line string) {
	if strings.HasPrefix(line, "LOG:") {
		return
	}
	o.mu.Lock()
	defer o.mu.Unlock()
	o.last = append(o.last, line)
	if len(o.last) > keptLines {
		o.last = slices.Delete(o.last, 0, 1)
	}
}

// forget drops what was said so far, because it is over and explains nothing later.
func (o *output) forget() {
	o.mu.Lock()
	defer o.mu.Unlock()
	o.last = nil
}

// complaints is the last that the server said, in one line. The server has ended;
// processes that it left behind may still hold its output open.
func (o *output) complaints() string {
	select {
	case <-o.read:
	case <-time.After(200 * time.Millisecond):
	}
	o.mu.Lock()
	defer o.mu.Unlock()
	return strings.Join(o.last, " ")
}
