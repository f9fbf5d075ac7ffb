package store

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgconn"

	"rimeline/server/record"
)

// constraintKinds says what it means to a caller when a row would break a
// constraint. A constraint that is not here can only be broken by a fault of ours.
var constraintKinds = map[string]error{
	"design_actor_check":      record.ErrInvalid,
	"revision_actor_check":    record.ErrInvalid,
	"revision_document_check": record.ErrInvalid,
	"revision_sha256_check":   record.ErrInvalid,
	"revision_base_check":     record.ErrInvalid,
	"revision_use_kind_check": record.ErrInvalid,

	"draft_id_check":     record.ErrInvalid,
	"draft_base_check":   record.ErrInvalid,
	"draft_actor_check":  record.ErrInvalid,
	"draft_design_fkey":  record.ErrNotFound, // the design that the draft is of
	"draft_pkey":         record.ErrConflict,
	"equipment_id_check": record.ErrInvalid,

	"equipment_kind_check":     record.ErrInvalid,
	"equipment_document_check": record.ErrInvalid,
	"equipment_actor_check":    record.ErrInvalid,

	"save_request_key_check":   record.ErrInvalid,
	"save_request_actor_check": record.ErrInvalid,
	"answer_key_check":         record.ErrInvalid,
	"answer_actor_check":       record.ErrInvalid,
	"answer_status_check":      record.ErrInvalid,
}

// wrap says which call an error came from, once.
func wrap(err *error, format string, args ...any) {
	if *err != nil {
		*err = fmt.Errorf("store: %s: %w", fmt.Sprintf(format, args...), *err)
	}
}

// kind returns err as an error of a kind of server/record where it is one. caller is
// the context as the caller gave it: what ends because the caller has gone is no
// fault of the database.
func kind(caller context.Context, err error) error {
	switch {
	case err == nil:
		return nil
	case hasKind(err) && !errors.Is(err, record.ErrUnavailable), errors.Is(err, record.ErrUnknownOutcome):
		return err
	case errors.Is(caller.Err(), context.Canceled):
		return fmt.Errorf("the caller has gone: %w", context.Cause(caller))
	case hasKind(err):
		return err
	}
	if k := kindOf(err); k != nil {
		return fmt.Errorf("%w: %w", k, err)
	}
	return err
}

func hasKind(err error) bool {
	_, stale := errors.AsType[*record.StaleError](err)
	return stale || errors.Is(err, record.ErrNotFound) || errors.Is(err, record.ErrInvalid) ||
		errors.Is(err, record.ErrConflict) || errors.Is(err, record.ErrUnavailable)
}

// kindOf returns the kind of an error of the driver, nil for a fault of ours.
func kindOf(err error) error {
	if errors.Is(err, pgx.ErrNoRows) {
		return record.ErrNotFound
	}
	if pgErr, ok := errors.AsType[*pgconn.PgError](err); ok {
		if pgErr.ConstraintName != "" {
			return constraintKinds[pgErr.ConstraintName]
		}
		if pgErr.Code == "23502" {
			return record.ErrInvalid // something that must be given was not
		}
		if away(pgErr.Code) {
			return record.ErrUnavailable
		}
		return nil
	}
	if broken(err) {
		return record.ErrUnavailable
	}
	return nil
}

// broken reports whether the connection failed, rather than what was asked on it.
func broken(err error) bool {
	if _, ok := errors.AsType[*pgconn.ConnectError](err); ok {
		return true
	}
	if _, ok := errors.AsType[net.Error](err); ok {
		return true
	}
	return errors.Is(err, context.DeadlineExceeded) || pgconn.Timeout(err) ||
		errors.Is(err, pgconn.ErrConnClosed) || errors.Is(err, net.ErrClosed) ||
		errors.Is(err, io.EOF) || errors.Is(err, io.ErrUnexpectedEOF)
}

// away reports whether a server that answers with this code cannot serve now, though
// it may later.
func away(code string) bool {
	switch code[:min(2, len(code))] {
	case "08", // connection exception
		"28", // not let in
		"3D", // no such database
		"53", // out of connections, memory or disk
		"58": // system error
		return true
	}
	switch code {
	case "25006", // it only reads now: a standby, or one that is being taken over
		"55P03",                                     // a lock was not free in time
		"57014",                                     // the statement took too long
		"57P01", "57P02", "57P03", "57P04", "57P05": // shut down, crashed, starting, database dropped, idle too long
		return true
	}
	return false
}

// refusedForAnother reports whether the database undid a transaction only because
// another one was at work; the same may succeed when it is tried again.
func refusedForAnother(err error) bool {
	pgErr, ok := errors.AsType[*pgconn.PgError](err)
	return ok && (pgErr.Code == "40001" || pgErr.Code == "40P01")
}
