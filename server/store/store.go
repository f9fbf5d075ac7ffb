// Package store keeps what is saved in Postgres: designs with their revisions and
// drafts, equipment, and the requests that were answered. It is the only room that
// knows the database and its driver, and it tells of its errors in the kinds of
// server/record.
//
// It must not know HTTP, forms or pages, and it judges nothing: what may be done is
// decided before it is called.
//
// # Times, ids, actors
//
// All times are the database's, one for each transaction. Ids are made here, of
// chance. Every row says who wrote it.
//
// # When the database is away
//
// Every call then fails with [record.ErrUnavailable], after at most a few seconds,
// and works again as soon as the database does; nothing has to be restarted. If the
// database goes away in the instant of a save, the error is also
// [record.ErrUnknownOutcome]: a repetition with the same request key finds out, and
// saves if nothing was.
//
// A context that ends undoes a write that has not been committed. Where a save shall
// be done though its asker has gone, pass context.WithoutCancel.
package store

import (
	"context"
	"crypto/rand"
	"fmt"
	"log/slog"
	"strings"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgtype"
	"github.com/jackc/pgx/v5/pgxpool"

	"rimeline/server/record"
)

const (
	connectTimeout = 2 * time.Second // for one connection
	patience       = 5 * time.Second // for one call, waiting for a connection included
	maxConns       = 12              // where the connection string has no pool_max_conns

	// The server gives up a statement a little before the caller does, so that it
	// does not work on for nobody.
	statementTimeout = "4500"
	lockTimeout      = "4000"
	idleTimeout      = "15000" // of a transaction whose client has vanished
)

// Store is what is saved. It holds a pool of connections and nothing else, so any
// number of programs can share a database. It may be used by many goroutines.
type Store struct {
	pool  *pgxpool.Pool
	log   *slog.Logger
	newID func() record.ID
}

// Open returns the store in the database that connString names, as a URL or in the
// keyword form of libpq. It does not connect: whether the database is there, and
// ready, is told by [Store.Ready]. log may be nil.
func Open(ctx context.Context, connString string, log *slog.Logger) (*Store, error) {
	cfg, err := pgxpool.ParseConfig(connString)
	if err != nil {
		return nil, fmt.Errorf("store: the database's address: %w", err)
	}
	if !strings.Contains(connString, "pool_max_conns") {
		cfg.MaxConns = maxConns
	}
	if cfg.ConnConfig.ConnectTimeout == 0 || cfg.ConnConfig.ConnectTimeout > connectTimeout {
		cfg.ConnConfig.ConnectTimeout = connectTimeout
	}
	lookUp := cfg.ConnConfig.LookupFunc
	cfg.ConnConfig.LookupFunc = func(ctx context.Context, host string) ([]string, error) {
		ctx, cancel := context.WithTimeout(ctx, connectTimeout)
		defer cancel()
		return lookUp(ctx, host)
	}
	cfg.PingTimeout = connectTimeout
	for name, value := range map[string]string{
		"application_name":                    "rimeline",
		"timezone":                            "UTC",
		"datestyle":                           "ISO",
		"statement_timeout":                   statementTimeout,
		"lock_timeout":                        lockTimeout,
		"idle_in_transaction_session_timeout": idleTimeout,
		"synchronous_commit":                  "on", // a save is acknowledged when it is on the disk
	} {
		if _, set := cfg.ConnConfig.RuntimeParams[name]; !set {
			cfg.ConnConfig.RuntimeParams[name] = value
		}
	}
	cfg.AfterConnect = func(_ context.Context, conn *pgx.Conn) error {
		conn.TypeMap().RegisterType(&pgtype.Type{
			Name: "timestamptz", OID: pgtype.TimestamptzOID,
			Codec: &pgtype.TimestamptzCodec{ScanLocation: time.UTC},
		})
		return nil
	}
	pool, err := pgxpool.NewWithConfig(ctx, cfg)
	if err != nil {
		return nil, fmt.Errorf("store: %w", err)
	}
	if log == nil {
		log = slog.New(slog.DiscardHandler)
	}
	return &Store{pool: pool, log: log, newID: func() record.ID { return record.ID(rand.Text()) }}, nil
}

// Close ends every connection, once the calls at work have ended. Later calls fail
// with [record.ErrUnavailable].
func (s *Store) Close() { s.pool.Close() }
