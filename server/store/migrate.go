package store

import (
	"bytes"
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"io/fs"
	"strings"
	"sync"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgconn"

	"rimeline/migrations"
	"rimeline/server/record"
)

// migrationLock is the advisory lock of whoever migrates; any number that nobody
// else uses.
const migrationLock = 0x72696d65 // "rime"

// migration is one numbered file.
type migration struct {
	name   string
	sql    string
	sha256 []byte
}

// Migrate brings the database to what this version of the program needs. Any number
// of programs may do so at the same time: each step is applied once.
func (s *Store) Migrate(ctx context.Context) (err error) {
	defer wrap(&err, "migrate")
	return s.migrate(ctx, migrations.FS)
}

// Ready reports whether the database can be reached and is as this version of the
// program needs it. It says so within two seconds: who asks wants to send requests
// elsewhere.
func (s *Store) Ready(ctx context.Context) (err error) {
	defer wrap(&err, "ready")
	ctx, cancel := context.WithTimeout(ctx, connectTimeout)
	defer cancel()
	steps, err := shippedMigrations()
	if err != nil {
		return err
	}
	return s.read(ctx, func(ctx context.Context, conn *pgx.Conn) error {
		applied, err := appliedMigrations(ctx, conn)
		if pgErr, ok := errors.AsType[*pgconn.PgError](err); ok && pgErr.Code == "42P01" {
			applied, err = nil, nil // the table of migrations is made by the first one
		}
		if err != nil {
			return err
		}
		next, err := pending(steps, applied)
		if err == nil && len(next) > 0 {
			err = fmt.Errorf("%d of %d migrations are not applied yet, the first is %s", len(next), len(steps), next[0].name)
		}
		return err
	})
}

// migrate applies the steps of fsys that are not yet, each in a transaction of its
// own: one that fails leaves nothing behind and can be mended.
func (s *Store) migrate(ctx context.Context, fsys fs.FS) error {
	steps, err := readMigrations(fsys)
	if err != nil {
		return err
	}
	conn, err := s.pool.Acquire(ctx)
	if err != nil {
		return kind(ctx, fmt.Errorf("%w: %w", record.ErrUnavailable, err))
	}
	defer conn.Release()
	for {
		name, err := applyNext(ctx, conn.Conn(), steps)
		if err != nil {
			return kind(ctx, err)
		}
		if name == "" {
			return nil
		}
		s.log.InfoContext(ctx, "migration applied", "name", name)
	}
}

// applyNext applies the first step that is not yet, and returns its name, "" if
// there was none.
func applyNext(ctx context.Context, conn *pgx.Conn, steps []migration) (name string, err error) {
	tx, err := conn.Begin(ctx)
	if err != nil {
		return "", err
	}
	defer undo(ctx, tx)
	// The timeouts are made for pages; whoever waits here waits for another program
	// that migrates. What a session before us set must not reach into the files.
	const prepare = `
		set local statement_timeout = 0;
		set local lock_timeout = 0;
		set local idle_in_transaction_session_timeout = 0;
		set local client_min_messages = warning`
	if _, err := tx.Exec(ctx, prepare); err != nil {
		return "", err
	}
	if _, err := tx.Exec(ctx, `select pg_advisory_xact_lock($1)`, migrationLock); err != nil {
		return "", err
	}
	const createTable = `
		create table if not exists migration (
			name text collate "C" not null,
			sha256 bytea not null,
			applied_at timestamptz not null default now(),
			constraint migration_pkey primary key (name)
		)`
	if _, err := tx.Exec(ctx, createTable); err != nil {
		return "", err
	}
	applied, err := appliedMigrations(ctx, tx)
	if err != nil {
		return "", err
	}
	next, err := pending(steps, applied)
	if err != nil || len(next) == 0 {
		return "", err
	}
	step := next[0]
	if _, err := tx.Exec(ctx, step.sql); err != nil {
		return "", fmt.Errorf("%s: %s%w", step.name, where(step.sql, err), err)
	}
	if _, err := tx.Exec(ctx, `insert into migration (name, sha256) values ($1, $2)`, step.name, step.sha256); err != nil {
		return "", err
	}
	return step.name, tx.Commit(ctx)
}

// where says in which line of a file the database found a mistake, as far as it
// told.
func where(sql string, err error) string {
	pgErr, ok := errors.AsType[*pgconn.PgError](err)
	if !ok || pgErr.Position <= 0 {
		return ""
	}
	before := []rune(sql)
	before = before[:min(int(pgErr.Position)-1, len(before))]
	return fmt.Sprintf("line %d: ", 1+strings.Count(string(before), "\n"))
}

func appliedMigrations(ctx context.Context, db querier) ([]migration, error) {
	return all(ctx, db, func(row pgx.CollectableRow) (m migration, err error) {
		return m, row.Scan(&m.name, &m.sha256)
	}, `select name, sha256 from migration order by name`)
}

// pending returns the steps that are not applied yet. It refuses a database that was
// made by other files than these.
func pending(steps, applied []migration) ([]migration, error) {
	for i, done := range applied {
		switch {
		case i >= len(steps):
			return nil, fmt.Errorf("the database has had %s applied, which this program does not know: a newer program has used it; use that one", done.name)
		case done.name != steps[i].name:
			return nil, fmt.Errorf("the database has had %s applied where this program has %s: it belongs to another program", done.name, steps[i].name)
		case !bytes.Equal(done.sha256, steps[i].sha256):
			return nil, fmt.Errorf("%s was changed after it was applied here: restore it as it was (SHA-256 %.6x…), and make the change in a file of its own", done.name, done.sha256)
		}
	}
	return steps[len(applied):], nil
}

// shippedMigrations returns the steps that this program carries. Pages ask whether
// they are applied, so they are read once.
var shippedMigrations = sync.OnceValues(func() ([]migration, error) { return readMigrations(migrations.FS) })

// readMigrations reads the steps in order. They are named 0001_what.sql, without a
// gap.
func readMigrations(fsys fs.FS) ([]migration, error) {
	names, err := fs.Glob(fsys, "[0-9]*.sql")
	if err != nil {
		return nil, err
	}
	steps := make([]migration, len(names))
	for i, name := range names {
		if number, what, ok := strings.Cut(name, "_"); !ok || what == ".sql" || number != fmt.Sprintf("%04d", i+1) {
			return nil, fmt.Errorf("the migration %s should be named %04d_what.sql: numbers rise by one, so that two people cannot both add the next one unseen", name, i+1)
		}
		content, err := fs.ReadFile(fsys, name)
		if err != nil {
			return nil, err
		}
		content = bytes.ReplaceAll(content, []byte("\r\n"), []byte("\n")) // as a checkout elsewhere may have it
		sum := sha256.Sum256(content)
		steps[i] = migration{name: name, sql: string(content), sha256: sum[:]}
	}
	return steps, nil
}
