package testdb_test

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgxpool"

	"rimeline/tests/testdb"
)

// abandons, in the environment of this test program, makes it one that starts a cluster
// and is killed.
const abandons = "TESTDB_TEST_ABANDONS"

var migrated atomic.Int32

// migrate makes one table, and counts how often it was asked to.
func migrate(ctx context.Context, dsn string) error {
	migrated.Add(1)
	conn, err := pgx.Connect(ctx, dsn)
	if err != nil {
		return err
	}
	_, err = conn.Exec(ctx, "create table note (word text); insert into note values ('from the template')")
	return errors.Join(err, conn.Close(ctx))
}

func connect(t testing.TB, dsn string) *pgx.Conn {
	t.Helper()
	conn, err := pgx.Connect(t.Context(), dsn)
	if err != nil {
		t.Fatal(err)
	}
	// One test leaves a connection open on purpose, others have theirs cut off.
	t.Cleanup(func() { _ = conn.Close(context.Background()) })
	return conn
}

func words(t testing.TB, conn *pgx.Conn) string {
	t.Helper()
	var all string
	if err := conn.QueryRow(t.Context(), "select string_agg(word, ', ' order by word) from note").Scan(&all); err != nil {
		t.Fatal(err)
	}
	return all
}

func TestNew(t *testing.T) {
	var mu sync.Mutex
	seen := map[string]bool{}
	t.Run("databases", func(t *testing.T) {
		for n := range 8 {
			t.Run(fmt.Sprint(n), func(t *testing.T) {
				t.Parallel()
				dsn := testdb.New(t, migrate)
				mu.Lock()
				if seen[dsn] {
					t.Errorf("%s was given before", dsn)
				}
				seen[dsn] = true
				mu.Unlock()
				conn := connect(t, dsn)
				if _, err := conn.Exec(t.Context(), "insert into note values ($1)", fmt.Sprint("of ", n)); err != nil {
					t.Fatal(err)
				}
				if got, want := words(t, conn), fmt.Sprintf("from the template, of %d", n); got != want {
					t.Errorf("%q, want %q", got, want)
				}
			})
		}
	})
	if got := migrated.Load(); got != 1 {
		t.Errorf("migrated %d times, want once", got)
	}
	for dsn := range seen {
		if _, err := pgx.Connect(t.Context(), dsn); err == nil || !strings.Contains(err.Error(), "does not exist") {
			t.Errorf("%s after its test: %v", dsn, err)
		}
	}
}

func TestNew_Empty(t *testing.T) {
	t.Parallel()
	conn := connect(t, testdb.New(t, nil))
	var tables int
	var superuser string
	if err := conn.QueryRow(t.Context(), "select count(*), current_setting('is_superuser') from pg_tables where schemaname = 'public'").Scan(&tables, &superuser); err != nil {
		t.Fatal(err)
	}
	if tables != 0 || superuser != "off" {
		t.Errorf("%d tables, superuser %s", tables, superuser)
	}
	if _, err := conn.Exec(t.Context(), "create table note (word text); create extension pg_trgm"); err != nil {
		t.Errorf("the owner may not do what a migration does: %v", err)
	}
}

// TestNew_OtherMigration: another function leads to another database.
func TestNew_OtherMigration(t *testing.T) {
	t.Parallel()
	other := func(ctx context.Context, dsn string) error {
		conn, err := pgx.Connect(ctx, dsn)
		if err != nil {
			return err
		}
		_, err = conn.Exec(ctx, "create table note (word text); insert into note values ('another')")
		return errors.Join(err, conn.Close(ctx))
	}
	if got := words(t, connect(t, testdb.New(t, other))); got != "another" {
		t.Errorf("%q", got)
	}
}

// TestCluster_UnderLoad: while writers go on, the cluster is killed, stopped and started
// again. What was acknowledged is there.
func TestCluster_UnderLoad(t *testing.T) {
	t.Parallel()
	c := testdb.NewCluster(t)
	dsn := c.DSN()
	if err := migrate(t.Context(), dsn); err != nil {
		t.Fatal(err)
	}
	pool, err := pgxpool.New(t.Context(), dsn)
	if err != nil {
		t.Fatal(err)
	}
	defer pool.Close()
	ctx, stop := context.WithCancel(t.Context())
	defer stop()
	var acknowledged, refused atomic.Int64
	var writers sync.WaitGroup
	for range 4 {
		writers.Go(func() {
			for ctx.Err() == nil {
				if _, err := pool.Exec(ctx, "insert into note values ('under load')"); err == nil {
					acknowledged.Add(1)
				} else {
					refused.Add(1)
					time.Sleep(time.Millisecond)
				}
			}
		})
	}
	// more waits until the count is higher than it was.
	more := func(what string, count *atomic.Int64) {
		t.Helper()
		before := count.Load()
		for deadline := time.Now().Add(30 * time.Second); count.Load() <= before+10; time.Sleep(time.Millisecond) {
			if time.Now().After(deadline) {
				t.Fatalf("no more is %s", what)
			}
		}
	}
	for range 2 {
		more("acknowledged", &acknowledged)
		c.Kill(t)
		c.AwaitReady(t)
		more("acknowledged after a kill", &acknowledged)
		c.Stop(t)
		more("refused while it is stopped", &refused)
		c.Start(t)
		c.AwaitReady(t)
		if c.DSN() != dsn {
			t.Errorf("the connection string changed to %s", c.DSN())
		}
	}
	more("acknowledged at the end", &acknowledged)
	stop()
	writers.Wait()
	var rows int64
	if err := pool.QueryRow(t.Context(), "select count(*) from note where word = 'under load'").Scan(&rows); err != nil {
		t.Fatal(err)
	}
	// A commit whose acknowledgement was cut off may be there as well.
	if rows < acknowledged.Load() {
		t.Errorf("%d rows, but %d were acknowledged", rows, acknowledged.Load())
	}
	t.Logf("%d acknowledged, %d refused, %d rows", acknowledged.Load(), refused.Load(), rows)
}

// TestAbandoned: a test program that is killed leaves no process and no directory.
func TestAbandoned(t *testing.T) {
	t.Parallel()
	if os.Getenv(abandons) != "" {
		fmt.Println("connection string:", testdb.New(t, nil))
		time.Sleep(time.Minute) // to be killed
		return
	}
	testdb.New(t, nil) // skips where there is no PostgreSQL
	cmd := exec.Command(os.Args[0], "-test.run", "^TestAbandoned$")
	cmd.Env = append(os.Environ(), abandons+"=yes")
	cmd.Stderr = os.Stderr
	stdout, err := cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	var config *pgx.ConnConfig
	for lines := bufio.NewScanner(stdout); config == nil && lines.Scan(); {
		if dsn, ok := strings.CutPrefix(lines.Text(), "connection string: "); ok {
			if config, err = pgx.ParseConfig(dsn); err != nil {
				t.Fatal(err)
			}
		}
	}
	if config == nil {
		t.Fatal("the other program started no cluster")
	}
	dir := filepath.Dir(config.Host) // of the socket's directory
	if _, err := os.Stat(dir); err != nil {
		t.Fatal(err)
	}
	if err := cmd.Process.Kill(); err != nil {
		t.Fatal(err)
	}
	_ = cmd.Wait() // it was killed
	for deadline := time.Now().Add(30 * time.Second); ; time.Sleep(10 * time.Millisecond) {
		if _, err := os.Stat(dir); os.IsNotExist(err) {
			return
		}
		if time.Now().After(deadline) {
			t.Fatalf("%s is left behind", dir)
		}
	}
}

func BenchmarkNew(b *testing.B) {
	testdb.New(b, migrate)
	for b.Loop() {
		testdb.New(b, migrate)
	}
}
