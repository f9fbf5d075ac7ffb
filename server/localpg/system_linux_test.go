package localpg

import (
	"context"
	"os"
	"runtime"
	"syscall"
	"testing"
	"time"
)

// TestOwnerKilled_ServerEnds: a server ends by itself when its owner is killed.
func TestOwnerKilled_ServerEnds(t *testing.T) {
	t.Parallel()
	o := startOwner(t, usedDir(t), nil)
	pid := o.ready(t)
	o.kill()
	until(t, "the server has ended", func() bool { return !running(pid) })
}

// TestServerOutlivesThread: it is our end that ends the server, and not the end of the
// thread that started it.
func TestServerOutlivesThread(t *testing.T) {
	t.Parallel()
	opts := Options{Dir: usedDir(t), Getenv: os.Getenv}
	type result struct {
		server *Server
		err    error
	}
	started := make(chan result)
	var onThread func()
	onThread = func() {
		runtime.LockOSThread() // and never unlocked: the thread ends with the function
		if syscall.Gettid() == os.Getpid() {
			go onThread() // the first thread of a program ends with the program only
			return
		}
		server, err := Start(context.Background(), opts)
		started <- result{server, err}
	}
	go onThread()
	r := <-started
	if r.err != nil {
		t.Fatal(r.err)
	}
	defer stop(t, r.server)
	pid := r.server.PID()
	time.Sleep(500 * time.Millisecond) // a stop takes less than 0.1 s
	if !running(pid) || r.server.PID() != pid {
		t.Errorf("the server ended with the thread: %v", r.server.Err())
	}
}

// TestSupervise_BusyProcessLeft: a process that computes does not notice that its
// postmaster is gone, and PostgreSQL does not start while it uses the data. (Elsewhere
// such a process cannot be told from others; the server is back when it ends.)
func TestSupervise_BusyProcessLeft(t *testing.T) {
	t.Parallel()
	s := start(t, Options{Dir: usedDir(t)})
	conn := connect(t, s.DSN())
	busy := int(conn.PgConn().PID())
	result := make(chan error, 1)
	go func() {
		_, err := conn.Exec(context.WithoutCancel(t.Context()), "do $$ begin loop end loop; end $$")
		result <- err
	}()
	watch := connect(t, s.DSN())
	until(t, "it computes", func() bool {
		return query[int](t, watch, "select count(*) from pg_stat_activity where state = 'active' and query like 'do %'") == 1
	})
	pid := s.PID()
	kill(t, pid)
	until(t, "another postmaster answers", func() bool { return s.PID() != pid && s.PID() != 0 })
	if running(busy) {
		t.Errorf("process %d works on the data of another postmaster", busy)
	}
	if err := <-result; err == nil {
		t.Error("the endless statement ended")
	}
}
