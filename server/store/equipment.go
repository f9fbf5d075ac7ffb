package store

import (
	"context"
	"fmt"

	"github.com/jackc/pgx/v5"

	"rimeline/server/record"
)

// SaveEquipment saves a module or an inverter, and returns it as it is stored.
//
// Without an ID it is a new one. Otherwise the version must be the stored one, else
// the error is a [*record.StaleError] with that. request is a key as in [Save]; a
// repetition returns the equipment as it is now.
func (s *Store) SaveEquipment(ctx context.Context, actor record.Actor, e record.Equipment, request string) (saved record.Equipment, err error) {
	defer wrap(&err, "save equipment %q at version %d", e.ID, e.Version)
	if e.ID == "" && e.Version != 0 {
		return saved, fmt.Errorf("%w: new equipment has no version yet", record.ErrInvalid)
	}
	sources, answers := encodeFields(e.Sources), encodeAnswers(e.Answers)
	content := contentHash("equipment", string(e.ID), fmt.Sprint(e.Version), string(e.Kind), e.Maker, e.Model, string(e.Document), sources, string(answers), e.Note)
	const insert = `
		insert into equipment (id, kind, maker, model, document, sources, answers, note, version, words,
			created_by, created_by_name, updated_by, updated_by_name)
		values (@id, @kind, @maker, @model, @document, @sources, @answers, @note, @version::bigint + 1, @words::text::tsvector,
			@actor, @actor_name, @actor, @actor_name)
		returning ` + equipmentColumns
	const update = `
		update equipment set kind = @kind, maker = @maker, model = @model, document = @document, sources = @sources, answers = @answers, note = @note,
			version = version + 1, words = @words::text::tsvector,
			updated_at = now(), updated_by = @actor, updated_by_name = @actor_name
		where id = @id and version = @version
		returning ` + equipmentColumns
	id, sql := e.ID, update
	if id == "" {
		id, sql = s.newID(), insert
	}
	err = s.write(ctx, func(ctx context.Context, tx pgx.Tx) error {
		earlier, err := claim(ctx, tx, actor, request, content, done{string(id), e.Version + 1})
		if err != nil {
			return err
		}
		if earlier != nil {
			saved, err = equipment(ctx, tx, record.ID(earlier.made))
			return err
		}
		found, err := all(ctx, tx, scanEquipment, sql, pgx.StrictNamedArgs{
			"id": clean(id), "kind": clean(e.Kind), "maker": short(e.Maker), "model": short(e.Model),
			"document": e.Document, "sources": sources, "answers": answers, "note": clean(e.Note), "version": e.Version,
			"words": tsvector(record.Words(e.Maker, e.Model)),
			"actor": clean(actor.ID), "actor_name": clean(actor.Name),
		})
		if err != nil {
			return err
		}
		if len(found) == 0 {
			stored, err := equipment(ctx, tx, id)
			if err != nil {
				return err
			}
			return &record.StaleError{Newest: stored.Version}
		}
		saved = found[0]
		return nil
	})
	return saved, err
}

const equipmentColumns = `id, kind, maker, model, document, sources, answers, note, version,
	created_at, created_by, created_by_name, updated_at, updated_by, updated_by_name, archived_at`

func scanEquipment(row pgx.CollectableRow) (e record.Equipment, err error) {
	var sources string
	var answers []byte
	err = row.Scan(&e.ID, &e.Kind, &e.Maker, &e.Model, &e.Document, &sources, &answers, &e.Note, &e.Version,
		&e.Created.At, &e.Created.By.ID, &e.Created.By.Name, &e.Updated.At, &e.Updated.By.ID, &e.Updated.By.Name, &e.ArchivedAt)
	if err != nil {
		return e, err
	}
	if e.Sources, err = decodeFields(sources); err != nil {
		return e, err
	}
	e.Answers, err = decodeAnswers(answers)
	return e, err
}

func equipment(ctx context.Context, db querier, id record.ID) (record.Equipment, error) {
	return one(ctx, db, scanEquipment, `select `+equipmentColumns+` from equipment where id = $1`, clean(id))
}

// Equipment returns a module or inverter, also an archived one.
func (s *Store) Equipment(ctx context.Context, id record.ID) (e record.Equipment, err error) {
	defer wrap(&err, "equipment %q", id)
	err = s.read(ctx, func(ctx context.Context, conn *pgx.Conn) (err error) {
		e, err = equipment(ctx, conn, id)
		return err
	})
	return e, err
}

// EquipmentNames returns the equipment in use by its names: up to limit modules and up
// to limit inverters, each by maker and then by model.
func (s *Store) EquipmentNames(ctx context.Context, limit int) (names []record.EquipmentName, err error) {
	defer wrap(&err, "names of equipment")
	const ofKind = `(
		select id, kind, maker, model from equipment
		where kind = '%s' and archived_at is null
		order by equipment.maker, equipment.model, equipment.id limit $1)`
	sql := fmt.Sprintf(ofKind, record.KindModule) + ` union all ` + fmt.Sprintf(ofKind, record.KindInverter)
	err = s.read(ctx, func(ctx context.Context, conn *pgx.Conn) (err error) {
		names, err = all(ctx, conn, pgx.RowToStructByPos[record.EquipmentName], sql, max(limit, 0))
		return err
	})
	return names, err
}

// ArchiveEquipment takes equipment out of the list of what is in use. Designs that
// carry a copy keep it. Archiving what is archived changes nothing.
func (s *Store) ArchiveEquipment(ctx context.Context, actor record.Actor, id record.ID) (err error) {
	defer wrap(&err, "archive equipment %q", id)
	return s.setArchived(ctx, actor, "equipment", id, true)
}

// RestoreEquipment puts archived equipment back among what is in use.
func (s *Store) RestoreEquipment(ctx context.Context, actor record.Actor, id record.ID) (err error) {
	defer wrap(&err, "restore equipment %q", id)
	return s.setArchived(ctx, actor, "equipment", id, false)
}
