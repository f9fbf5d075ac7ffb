package store

import (
	"context"
	"errors"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgconn"

	"rimeline/server/record"
)

const (
	// attempts is how often something is tried whose connection turned out to be dead,
	// or which the database refused for the sake of another transaction (deadlock).
	attempts = 3

	// pause is what lets that other transaction have what it waited for.
	pause = 20 * time.Millisecond
)

// read runs do on a connection, and again on another one if the first turns out to be
// dead: after a restart of the database the pool is full of such.
func (s *Store) read(ctx context.Context, do func(ctx context.Context, conn *pgx.Conn) error) error {
	return s.run(ctx, func(ctx context.Context, conn *pgx.Conn) (bool, error) {
		err := do(ctx, conn)
		return conn.IsClosed(), err
	})
}

// write runs do in a transaction: all of it is done, or nothing. It runs do again if
// the database refuses the transaction for the sake of another one, or if the
// connection turns out to be dead before the commit; do must set what it returns
// anew each time.
func (s *Store) write(ctx context.Context, do func(ctx context.Context, tx pgx.Tx) error) error {
	return s.run(ctx, func(ctx context.Context, conn *pgx.Conn) (bool, error) {
		tx, err := conn.Begin(ctx)
		if err != nil {
			return conn.IsClosed(), err
		}
		if err = do(ctx, tx); err == nil {
			err = ctx.Err()
		}
		if err != nil {
			dead := conn.IsClosed()
			undo(ctx, tx)
			return dead || refusedForAnother(err), err
		}
		return commit(ctx, tx, conn)
	})
}

// commit ends a transaction. It reports whether it may be tried again, which it may
// not where it is not known whether the database did it.
func commit(ctx context.Context, tx pgx.Tx, conn *pgx.Conn) (again bool, err error) {
	if conn.IsClosed() {
		return true, pgconn.ErrConnClosed
	}
	// The work is done: a caller that goes away now must not make it unknown whether
	// it was saved.
	ctx, cancel := context.WithTimeout(context.WithoutCancel(ctx), patience)
	defer cancel()
	err = tx.Commit(ctx)
	if err == nil {
		return false, nil
	}
	if pgErr, told := errors.AsType[*pgconn.PgError](err); errors.Is(err, pgx.ErrTxCommitRollback) || told && pgErr.SeverityUnlocalized == "ERROR" {
		return refusedForAnother(err), err // the server says that it undid it
	}
	// pgconn.SafeToRetry is of no use here: it says that a commit was never sent also
	// where the connection was cut before its answer came.
	return false, fmt.Errorf("%w: %w: %w", record.ErrUnavailable, record.ErrUnknownOutcome, err)
}

// undo rolls back although the context may have ended, so that the connection can be
// used again.
func undo(ctx context.Context, tx pgx.Tx) {
	ctx, cancel := context.WithTimeout(context.WithoutCancel(ctx), time.Second)
	defer cancel()
	_ = tx.Rollback(ctx) // if it fails, the connection is closed, and the server rolls back
}

// run runs do on a connection until it says that it is not to be tried again.
func (s *Store) run(caller context.Context, do func(context.Context, *pgx.Conn) (again bool, err error)) error {
	ctx, cancel := context.WithTimeout(caller, patience)
	defer cancel()
	for attempt := 1; ; attempt++ {
		again, err := s.runOnce(ctx, do)
		if err == nil || !again || attempt == attempts || ctx.Err() != nil {
			return kind(caller, err)
		}
		if refusedForAnother(err) {
			time.Sleep(pause)
		}
	}
}

func (s *Store) runOnce(ctx context.Context, do func(context.Context, *pgx.Conn) (again bool, err error)) (again bool, err error) {
	conn, err := s.pool.Acquire(ctx)
	if err != nil {
		return false, fmt.Errorf("%w: %w", record.ErrUnavailable, err)
	}
	defer conn.Release()
	again, err = do(ctx, conn.Conn())
	if err != nil && conn.Conn().IsClosed() && ctx.Err() == nil {
		s.log.WarnContext(ctx, "a connection to the database broke", "err", err)
		s.pool.Reset() // the others are dead too, more often than not
	}
	return again, err
}

// one returns the only row of a query.
func one[T any](ctx context.Context, db querier, scan pgx.RowToFunc[T], sql string, args ...any) (T, error) {
	rows, _ := db.Query(ctx, sql, args...) // its error comes with the row
	return pgx.CollectExactlyOneRow(rows, scan)
}

// all returns every row of a query.
func all[T any](ctx context.Context, db querier, scan pgx.RowToFunc[T], sql string, args ...any) ([]T, error) {
	rows, _ := db.Query(ctx, sql, args...) // its error comes with the rows
	return pgx.CollectRows(rows, scan)
}

// querier is a connection or a transaction.
type querier interface {
	Query(ctx context.Context, sql string, args ...any) (pgx.Rows, error)
	Exec(ctx context.Context, sql string, args ...any) (pgconn.CommandTag, error)
	SendBatch(ctx context.Context, b *pgx.Batch) pgx.BatchResults
}
