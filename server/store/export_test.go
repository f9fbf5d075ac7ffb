package store

import (
	"context"
	"io/fs"

	"github.com/jackc/pgx/v5"

	"rimeline/server/record"
)

// What the tests of this room see of its inside.
var (
	ConstraintKinds = constraintKinds
	KindOf          = kindOf
	Kind            = kind
	EncodeFields    = encodeFields
	DecodeFields    = decodeFields
	EncodeHeadroom  = encodeHeadroom
	DecodeHeadroom  = decodeHeadroom
	Short           = short
	Clean           = clean[string]
)

const MaxShown = maxShown

// MigrateFrom applies the migrations of fsys.
func (s *Store) MigrateFrom(ctx context.Context, fsys fs.FS) error { return s.migrate(ctx, fsys) }

// Write runs do in a transaction, as the methods that save do.
func (s *Store) Write(ctx context.Context, do func(context.Context, pgx.Tx) error) error {
	return s.write(ctx, do)
}

// Exec runs a statement beside the store's methods.
func (s *Store) Exec(ctx context.Context, sql string, args ...any) error {
	_, err := s.pool.Exec(ctx, sql, args...)
	return err
}

// QueryTexts returns the first column of a query's rows.
func (s *Store) QueryTexts(ctx context.Context, sql string, args ...any) ([]string, error) {
	return all(ctx, s.pool, pgx.RowTo[string], sql, args...)
}

// SetIDs makes the store take its ids from next.
func (s *Store) SetIDs(next func() record.ID) { s.newID = next }

// OpenConns is how many connections the pool holds.
func (s *Store) OpenConns() int32 { return s.pool.Stat().TotalConns() }

// BusyConns is how many of them are at work.
func (s *Store) BusyConns() int32 { return s.pool.Stat().AcquiredConns() }

// ConnString is what the store was opened with.
func (s *Store) ConnString() string { return s.pool.Config().ConnString() }
