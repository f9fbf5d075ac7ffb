package store

import (
	"context"
	"fmt"
	"math"
	"time"

	"github.com/jackc/pgx/v5"

	"rimeline/server/record"
)

// SaveDraft saves a form as it stands, and returns it with its new version and time.
//
// Without an ID, or with one that the caller made up and version 0, it is a new
// draft. Otherwise the version must be the stored one, else the stored draft stays
// and the error is a [*record.StaleError] with its version; to keep both, save the
// other as a new draft. A draft that was discarded is not found.
//
// Repeating a save whose answer was lost gives that answer, as long as nothing was
// saved since.
func (s *Store) SaveDraft(ctx context.Context, actor record.Actor, d record.Draft) (saved record.Draft, err error) {
	defer wrap(&err, "save draft %q at version %d", d.ID, d.Version)
	if d.ID == "" && d.Version != 0 {
		return saved, fmt.Errorf("%w: a new draft has no version yet", record.ErrInvalid)
	}
	if d.Base < 0 || d.Base > math.MaxInt32 {
		return saved, fmt.Errorf("%w: no revision has the number %d", record.ErrInvalid, d.Base)
	}
	if d.ID == "" {
		d.ID = s.newID()
	}
	fields := encodeFields(d.Fields)
	const insert = `
		insert into draft (id, design, base, fields, version, created_by, created_by_name, saved_by, saved_by_name)
		values (@id, nullif(@design::text, ''), @base, @fields, @version::bigint + 1, @actor, @actor_name, @actor, @actor_name)
		on conflict on constraint draft_pkey do nothing
		returning saved_at`
	const update = `
		update draft set base = @base, fields = @fields, version = version + 1, design = coalesce(design, nullif(@design::text, '')),
			saved_at = now(), saved_by = @actor, saved_by_name = @actor_name
		where id = @id and version = @version
		returning saved_at`
	sql := update
	if d.Version == 0 {
		sql = insert
	}
	err = s.write(ctx, func(ctx context.Context, tx pgx.Tx) error {
		times, err := all(ctx, tx, pgx.RowTo[time.Time], sql, pgx.StrictNamedArgs{
			"id": clean(d.ID), "design": clean(d.Design), "base": d.Base, "fields": fields, "version": d.Version,
			"actor": clean(actor.ID), "actor_name": clean(actor.Name),
		})
		if err != nil {
			return err
		}
		if len(times) == 0 {
			stored, err := one(ctx, tx, scanDraft, `select `+draftColumns+` from draft where id = $1`, clean(d.ID))
			if err != nil {
				return err
			}
			if stored.Version != d.Version+1 || encodeFields(stored.Fields) != fields || stored.Saved.By.ID != clean(actor.ID) {
				return &record.StaleError{Newest: stored.Version}
			}
			saved = stored
			return nil
		}
		saved = d
		saved.Version++
		saved.Saved = record.Stamp{At: times[0], By: actor}
		return nil
	})
	return saved, err
}

const draftColumns = `id, coalesce(design, ''), base, fields, version, saved_at, saved_by, saved_by_name`

func scanDraft(row pgx.CollectableRow) (d record.Draft, err error) {
	var fields string
	if err = row.Scan(&d.ID, &d.Design, &d.Base, &fields, &d.Version, &d.Saved.At, &d.Saved.By.ID, &d.Saved.By.Name); err != nil {
		return d, err
	}
	d.Fields, err = decodeFields(fields)
	return d, err
}

// Draft returns a draft.
func (s *Store) Draft(ctx context.Context, id record.ID) (d record.Draft, err error) {
	defer wrap(&err, "draft %q", id)
	err = s.read(ctx, func(ctx context.Context, conn *pgx.Conn) (err error) {
		d, err = one(ctx, conn, scanDraft, `select `+draftColumns+` from draft where id = $1`, clean(id))
		return err
	})
	return d, err
}

// DraftsOf returns up to limit drafts of a saved design, and 200 at most, the one
// saved last first. With "" they are those of designs that were never saved.
func (s *Store) DraftsOf(ctx context.Context, design record.ID, limit int) (drafts []record.Draft, err error) {
	defer wrap(&err, "drafts of design %q", design)
	which, args := `design = $2`, []any{min(max(limit, 0), maxPageSize), clean(design)}
	if design == "" {
		which, args = `design is null`, args[:1]
	}
	err = s.read(ctx, func(ctx context.Context, conn *pgx.Conn) (err error) {
		drafts, err = all(ctx, conn, scanDraft, `select `+draftColumns+` from draft where `+which+` order by saved_at desc, id desc limit $1`, args...)
		return err
	})
	return drafts, err
}

// Drafts returns up to limit drafts, and 200 at most, the one saved last first.
func (s *Store) Drafts(ctx context.Context, limit int) (drafts []record.Draft, err error) {
	defer wrap(&err, "list drafts")
	err = s.read(ctx, func(ctx context.Context, conn *pgx.Conn) (err error) {
		drafts, err = all(ctx, conn, scanDraft, `select `+draftColumns+` from draft order by saved_at desc, id desc limit $1`, min(max(limit, 0), maxPageSize))
		return err
	})
	return drafts, err
}

// DiscardDraft removes a draft, if it is still at the version that its reader saw;
// else the error is a [*record.StaleError]. One that is gone already is no error.
func (s *Store) DiscardDraft(ctx context.Context, actor record.Actor, id record.ID, version int64) (err error) {
	defer wrap(&err, "discard draft %q at version %d", id, version)
	err = s.write(ctx, func(ctx context.Context, tx pgx.Tx) error {
		tag, err := tx.Exec(ctx, `delete from draft where id = $1 and version = $2`, clean(id), version)
		if err != nil || tag.RowsAffected() > 0 {
			return err
		}
		newer, err := all(ctx, tx, pgx.RowTo[int64], `select version from draft where id = $1`, clean(id))
		if err == nil && len(newer) > 0 {
			err = &record.StaleError{Newest: newer[0]}
		}
		return err
	})
	if err == nil {
		s.log.InfoContext(ctx, "draft discarded", "draft", id, "version", version, "by", actor.ID)
	}
	return err
}
