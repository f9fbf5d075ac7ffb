// Package testdb gives tests databases of a real PostgreSQL: to each its own, made in
// milliseconds as a copy of one that was migrated once.
//
// It knows how to have a private PostgreSQL for as long as a test program runs. It must
// not know what is saved: who asks for a database says how it is migrated. Only tests
// may use it.
package testdb

import (
	"context"
	"errors"
	"fmt"
	"os"
	"reflect"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgxpool"

	"rimeline/server/localpg"
)

// patience is how long making, copying or dropping a database may take before the test
// gives it up. It is a limit for what hangs, not a measure of speed.
const patience = 2 * time.Minute

// cluster is the PostgreSQL of this test program. It does not wait for the disk, which
// is memory where the system has that.
type cluster struct {
	dir    *scratch // kept, since the directory is removed when its scratch is collected
	server *localpg.Server
	admin  *pgxpool.Pool
	copies string // how a database is copied
	count  atomic.Int64

	mu        sync.Mutex
	templates map[uintptr]func() (string, error) // by migrate function
}

// shared starts the cluster when the first test needs it. It stays until the program
// ends, and is then stopped and removed without anybody's doing (see scratch).
var shared = sync.OnceValues(func() (*cluster, error) {
	dir, err := newScratch()
	if err != nil {
		return nil, err
	}
	ctx, cancel := context.WithTimeout(context.Background(), patience)
	defer cancel()
	server, err := localpg.Start(ctx, localpg.Options{Dir: dir.path, Getenv: os.Getenv, UnsafeForTests: true})
	if err != nil {
		return nil, errors.Join(err, dir.remove())
	}
	admin, err := pgxpool.New(ctx, server.AdminDSN())
	if err != nil {
		return nil, err
	}
	c := &cluster{dir: dir, server: server, admin: admin, templates: map[uintptr]func() (string, error){}}
	var version int
	if err := admin.QueryRow(ctx, "select current_setting('server_version_num')::int").Scan(&version); err != nil {
		return nil, err
	}
	if version >= 150000 {
		c.copies = " strategy file_copy" // in memory it takes half as long as the usual way
	}
	return c, nil
})

// need returns a result of starting PostgreSQL. A machine without it skips the test, so
// that go test ./... passes on a fresh clone; the full run (CI=true) must have it.
func need[T any](t testing.TB, result T, err error) T {
	t.Helper()
	if errors.Is(err, localpg.ErrNoPostgres) && os.Getenv("CI") != "true" {
		t.Skip(err)
	}
	if err != nil {
		t.Fatal(err)
	}
	return result
}

// New makes a database for the test and returns its connection string. The database is
// dropped at the end of the test; what is still connected then is cut off.
//
// migrate makes the tables in an empty database. It runs once in a test program and its
// work is copied, so it must be a named function that does the same each time; two
// closures made at the same place count as one. nil leaves the database empty.
//
// The string's role owns the database and has no other rights, as in the service.
func New(t testing.TB, migrate func(ctx context.Context, dsn string) error) string {
	t.Helper()
	result, err := shared()
	c := need(t, result, err)
	template := "template0"
	if migrate != nil {
		if template, err = c.template(migrate)(); err != nil {
			t.Fatalf("the database that all others are copied from: %v", err)
		}
	}
	name := fmt.Sprintf("test_%d", c.count.Add(1))
	if err := c.create(name, template); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := c.exec("drop database " + name + " with (force)"); err != nil {
			t.Error(err)
		}
	})
	return c.dsn(name)
}

// template returns what makes the database that a migrate function leads to, once, and
// returns its name.
func (c *cluster) template(migrate func(context.Context, string) error) func() (string, error) {
	c.mu.Lock()
	defer c.mu.Unlock()
	key := reflect.ValueOf(migrate).Pointer()
	if c.templates[key] == nil {
		name := fmt.Sprintf("migrated_%d", len(c.templates)+1)
		c.templates[key] = sync.OnceValues(func() (string, error) { return name, c.migrate(name, migrate) })
	}
	return c.templates[key]
}

func (c *cluster) migrate(name string, migrate func(context.Context, string) error) error {
	ctx, cancel := context.WithTimeout(context.Background(), patience)
	defer cancel()
	if err := c.create(name, "template0"); err != nil {
		return err
	}
	if err := migrate(ctx, c.dsn(name)); err != nil {
		return err
	}
	// A database that somebody is connected to cannot be copied.
	return c.exec("alter database " + name + " with is_template true allow_connections false")
}

func (c *cluster) create(name, template string) error {
	return c.exec("create database " + name + " owner rimeline template " + template + c.copies)
}

func (c *cluster) exec(statement string) error {
	ctx, cancel := context.WithTimeout(context.Background(), patience)
	defer cancel()
	if _, err := c.admin.Exec(ctx, statement); err != nil {
		return fmt.Errorf("%s: %w", statement, err)
	}
	return nil
}

// dsn is the connection string of a database. Of a setting given twice pgx takes the
// latter.
func (c *cluster) dsn(name string) string { return c.server.DSN() + " dbname=" + name }

// Cluster is a PostgreSQL of a test's own, which it may stop and kill. Unlike the shared
// one it keeps what is committed, as the service's own does. Its methods are for one
// goroutine; others may use the connection string meanwhile.
type Cluster struct {
	dir    *scratch
	server *localpg.Server
}

// NewCluster starts a cluster with an empty database. It is removed at the end of the
// test.
func NewCluster(t testing.TB) *Cluster {
	t.Helper()
	dir, err := newScratch()
	if err != nil {
		t.Fatal(err)
	}
	c := &Cluster{dir: dir}
	t.Cleanup(func() {
		c.Stop(t)
		if err := dir.remove(); err != nil {
			t.Error(err)
		}
	})
	c.Start(t)
	return c
}

// DSN is the connection string of the database. It stays the same through all that is
// done to the cluster.
func (c *Cluster) DSN() string { return c.server.DSN() }

// Start starts a cluster that was stopped and waits until it answers.
func (c *Cluster) Start(t testing.TB) {
	t.Helper()
	ctx, cancel := context.WithTimeout(context.Background(), patience)
	defer cancel()
	server, err := localpg.Start(ctx, localpg.Options{Dir: c.dir.path, Getenv: os.Getenv})
	c.server = need(t, server, err)
}

// Stop stops the cluster in order. Connections are cut off; new ones are refused until
// Start.
func (c *Cluster) Stop(t testing.TB) {
	t.Helper()
	if c.server == nil {
		return // it never started
	}
	ctx, cancel := context.WithTimeout(context.Background(), patience)
	defer cancel()
	if err := c.server.Stop(ctx); err != nil {
		t.Error(err)
	}
}

// Kill kills the first process of the cluster, as the system does when memory runs out.
// It returns when that process is gone. The cluster is then started again without
// anybody's doing; AwaitReady waits for that.
func (c *Cluster) Kill(t testing.TB) {
	t.Helper()
	killed := c.server.PID()
	process, err := os.FindProcess(killed)
	if killed == 0 || err != nil {
		t.Fatalf("no process to kill: the cluster is down: %v", errors.Join(c.server.Err(), err))
	}
	if err := process.Kill(); err != nil {
		t.Fatal(err)
	}
	c.await(t, "the killed process is gone", func() bool { return c.server.PID() != killed })
}

// AwaitReady waits until the cluster answers.
func (c *Cluster) AwaitReady(t testing.TB) {
	t.Helper()
	c.await(t, "it answers", func() bool { return c.server.Err() == nil })
	ctx, cancel := context.WithTimeout(context.Background(), patience)
	defer cancel()
	conn, err := pgx.Connect(ctx, c.DSN())
	if err != nil {
		t.Fatal(err)
	}
	if err := conn.Close(ctx); err != nil {
		t.Fatal(err)
	}
}

func (c *Cluster) await(t testing.TB, what string, condition func() bool) {
	t.Helper()
	late := time.After(patience)
	for !condition() {
		select {
		case <-late:
			t.Fatalf("waited in vain until %s: %v", what, c.server.Err())
		case <-time.After(2 * time.Millisecond):
		}
	}
}
