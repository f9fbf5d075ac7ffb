package store

import (
	"bytes"
	"context"
	"errors"
	"fmt"

	"github.com/jackc/pgx/v5"

	"rimeline/server/record"
)

// requestsKept is how long keys of requests are known, in days. A repetition comes
// within seconds; a tab that was left open may repeat after a night or a holiday.
const requestsKept = 30

// done is what a save made: a design and its revision, or equipment and its version.
type done struct {
	made   string
	number int64
}

// claim notes that this transaction makes what is asked under a key. It returns what
// an earlier one made if it was asked the same, and a [*record.UsedError] if that was
// asked something else. It waits for one that is still at work.
func claim(ctx context.Context, tx pgx.Tx, actor record.Actor, key string, content [32]byte, makes done) (earlier *done, err error) {
	if key == "" {
		return nil, nil
	}
	tag, err := tx.Exec(ctx, `
		insert into save_request (actor, key, content, made, number)
		values ($1, $2, $3, $4, $5)
		on conflict on constraint save_request_pkey do nothing`,
		clean(actor.ID), clean(key), content[:], clean(makes.made), makes.number)
	if err != nil || tag.RowsAffected() == 1 {
		return nil, err
	}
	return one(ctx, tx, func(row pgx.CollectableRow) (*done, error) {
		var was []byte
		var d done
		if err := row.Scan(&was, &d.made, &d.number); err != nil {
			return nil, err
		}
		if !bytes.Equal(was, content[:]) {
			return nil, &record.UsedError{Made: record.ID(d.made), Number: d.number}
		}
		return &d, nil
	}, `select content, made, number from save_request where actor = $1 and key = $2`, clean(actor.ID), clean(key))
}

// Remember answers a request under a key once: a repetition, which has the same hash
// of what is asked, gets the kept answer. The same key with another hash is
// [record.ErrConflict].
//
// do makes the answer, and does the work. Two repetitions at the same instant may
// both do it, and so may a repetition after a crash between the work and the keeping
// of its answer; so what do saves must carry the same key as its request key. The
// answer that was kept first is then everyone's. An error of do is returned as it
// is, and nothing is kept.
func (s *Store) Remember(ctx context.Context, actor record.Actor, key string, request [32]byte, do func(context.Context) (record.Answer, error)) (answer record.Answer, repeated bool, err error) {
	defer wrap(&err, "remember the answer to request %q", key)
	answer, err = s.kept(ctx, actor, key, request)
	if !errors.Is(err, record.ErrNotFound) {
		return answer, err == nil, err
	}
	made, err := do(ctx)
	if err != nil {
		return record.Answer{}, false, err
	}
	err = s.write(ctx, func(ctx context.Context, tx pgx.Tx) error {
		tag, err := tx.Exec(ctx, `
			insert into answer (actor, key, request, status, header, body)
			values (@actor, @key, @request, @status, @header, @body)
			on conflict on constraint answer_pkey do nothing`,
			pgx.StrictNamedArgs{
				"actor": clean(actor.ID), "key": clean(key), "request": request[:],
				"status": made.Status, "header": encodeFields(made.Header), "body": append([]byte{}, made.Body...),
			})
		repeated = err == nil && tag.RowsAffected() == 0
		return err
	})
	if err != nil {
		return record.Answer{}, false, err
	}
	answer, err = s.kept(ctx, actor, key, request)
	return answer, repeated, err
}

// kept returns the answer that was kept for a request.
func (s *Store) kept(ctx context.Context, actor record.Actor, key string, request [32]byte) (answer record.Answer, err error) {
	err = s.read(ctx, func(ctx context.Context, conn *pgx.Conn) (err error) {
		answer, err = one(ctx, conn, func(row pgx.CollectableRow) (a record.Answer, err error) {
			var was []byte
			var header string
			if err = row.Scan(&was, &a.Status, &header, &a.Body, &a.At); err != nil {
				return a, err
			}
			if !bytes.Equal(was, request[:]) {
				return a, fmt.Errorf("%w: the request key was used for something else", record.ErrConflict)
			}
			a.Header, err = decodeFields(header)
			return a, err
		}, `select request, status, header, body, given_at from answer where actor = $1 and key = $2`, clean(actor.ID), clean(key))
		return err
	})
	return answer, err
}

// Tidy forgets request keys that are too old to be repeated. Nothing that people
// saved is touched.
func (s *Store) Tidy(ctx context.Context) (err error) {
	defer wrap(&err, "tidy")
	return s.write(ctx, func(ctx context.Context, tx pgx.Tx) error {
		if _, err := tx.Exec(ctx, `delete from save_request where done_at < now() - make_interval(days => $1)`, requestsKept); err != nil {
			return err
		}
		_, err := tx.Exec(ctx, `delete from answer where given_at < now() - make_interval(days => $1)`, requestsKept)
		return err
	})
}
