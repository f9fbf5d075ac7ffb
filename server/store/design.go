package store

import (
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"math"
	"slices"
	"time"

	"github.com/jackc/pgx/v5"

	"rimeline/server/record"
	"rimeline/sizing/design"
)

// Save is a design to be saved, as its first revision or as the next one.
type Save struct {
	Design record.ID // "" for a new design
	Base   int       // the revision that it was made from, 0 for a new design
	Frozen record.Frozen
	Note   string

	// Request is a key that the asker made up for this save alone. A repetition with
	// the same key and content makes nothing new. "" is no key: a repetition of a
	// first save makes a second design.
	Request string

	// Draft is the working draft that was saved with it. It goes, if it is still at
	// DraftVersion; a newer one stays, and belongs to the design from now on.
	Draft        record.ID
	DraftVersion int64
}

// content is the hash of what a save asks for. The result is not part of it: another
// version of the engine may answer the repetition.
func (save *Save) content() [32]byte {
	return contentHash("save", string(save.Design), fmt.Sprint(save.Base), string(save.Frozen.Document), save.Note)
}

// contentHash hashes texts so that no two lists of texts are written the same.
func contentHash(texts ...string) [32]byte {
	h := sha256.New()
	for _, t := range texts {
		fmt.Fprintf(h, "%d:%s", len(t), t)
	}
	return [32]byte(h.Sum(nil))
}

// SaveRevision saves a design as a new revision. It returns a [*record.StaleError]
// with the newest revision's number if that is not the one that the save was made
// from.
func (s *Store) SaveRevision(ctx context.Context, actor record.Actor, save Save) (saved record.Revision, err error) {
	defer wrap(&err, "save design %q made from revision %d", save.Design, save.Base)
	id, number := save.Design, save.Base+1
	switch {
	case save.Base < 0 || save.Base >= math.MaxInt32:
		return saved, fmt.Errorf("%w: no revision has the number %d", record.ErrInvalid, save.Base)
	case id == "" && save.Base != 0:
		return saved, fmt.Errorf("%w: a new design is made from no revision", record.ErrInvalid)
	case id == "":
		id = s.newID()
	}
	content := save.content()
	save.Frozen, save.Note = storable(save.Frozen), clean(save.Note)
	err = s.write(ctx, func(ctx context.Context, tx pgx.Tx) error {
		earlier, err := claim(ctx, tx, actor, save.Request, content, done{string(id), int64(number)})
		if err != nil {
			return err
		}
		if earlier != nil {
			saved, err = revision(ctx, tx, record.ID(earlier.made), int(earlier.number))
			saved.Repeated = true
			return err
		}
		point := moveDesign
		if save.Design == "" {
			point = addDesign
		}
		at, err := point(ctx, tx, actor, id, number, &save.Frozen)
		if err != nil {
			return err
		}
		if err := addRevision(ctx, tx, actor, id, number, &save); err != nil {
			return err
		}
		saved = record.Revision{
			Design: id, Number: number, Base: save.Base, Frozen: save.Frozen, Note: save.Note,
			Saved: record.Stamp{At: at, By: actor},
		}
		return nil
	})
	return saved, err
}

// storable returns what reading a saved revision will give: its documents byte for
// byte; its texts clean; and its headroom as a number of the database.
func storable(f record.Frozen) record.Frozen {
	for _, text := range []*string{&f.Engine, &f.Rulebook, &f.Title, &f.Site} {
		*text = clean(*text)
	}
	f.Uses = slices.Clone(f.Uses)
	for i, u := range f.Uses {
		f.Uses[i] = record.Use{Kind: u.Kind, Maker: clean(u.Maker), Model: clean(u.Model)}
	}
	f.HeadroomC, _ = decodeHeadroom(encodeHeadroom(f.HeadroomC)) // what was written can be read
	return f
}

// addDesign adds a design whose first revision is about to be added, and returns the
// time.
func addDesign(ctx context.Context, tx pgx.Tx, actor record.Actor, id record.ID, number int, f *record.Frozen) (time.Time, error) {
	return one(ctx, tx, pgx.RowTo[time.Time], `
		insert into design (id, title, site, revision, verdict, headroom_c, words,
			created_by, created_by_name, updated_by, updated_by_name)
		values (@id, @title, @site, @number, @verdict::text::verdict, @headroom::text::numeric, @words::text::tsvector,
			@actor, @actor_name, @actor, @actor_name)
		returning updated_at`, designArgs(actor, id, number, f))
}

// moveDesign moves a design from the revision before number to number, which is about
// to be added, and returns the time. Of several who try, the others wait for the
// first and then find that it has moved.
func moveDesign(ctx context.Context, tx pgx.Tx, actor record.Actor, id record.ID, number int, f *record.Frozen) (time.Time, error) {
	at, err := one(ctx, tx, pgx.RowTo[time.Time], `
		update design set title = @title, site = @site, revision = @number, verdict = @verdict::text::verdict,
			headroom_c = @headroom::text::numeric, words = @words::text::tsvector,
			updated_at = now(), updated_by = @actor, updated_by_name = @actor_name
		where id = @id and revision = @number - 1
		returning updated_at`, designArgs(actor, id, number, f))
	if !errors.Is(err, pgx.ErrNoRows) {
		return at, err
	}
	newest, err := one(ctx, tx, pgx.RowTo[int64], `select revision from design where id = $1`, clean(id))
	if err != nil {
		return at, err
	}
	return at, &record.StaleError{Newest: newest}
}

func designArgs(actor record.Actor, id record.ID, number int, f *record.Frozen) pgx.StrictNamedArgs {
	return pgx.StrictNamedArgs{
		"id": clean(id), "number": number, "title": short(f.Title), "site": short(f.Site),
		"verdict": f.Verdict.String(), "headroom": encodeHeadroom(f.HeadroomC), "words": words(f),
		"actor": clean(actor.ID), "actor_name": clean(actor.Name),
	}
}

// addRevision adds the revision with what it uses, and takes away the draft.
func addRevision(ctx context.Context, tx pgx.Tx, actor record.Actor, id record.ID, number int, save *Save) error {
	f := &save.Frozen
	var batch pgx.Batch
	batch.Queue(`
		insert into revision (design, number, base, document, result, sha256, engine, rulebook,
			title, site, verdict, headroom_c, note, saved_by, saved_by_name)
		values (@design, @number, @base, @document, @result, @sha256, @engine, @rulebook,
			@title, @site, @verdict::text::verdict, @headroom::text::numeric, @note, @actor, @actor_name)`,
		pgx.StrictNamedArgs{
			"design": clean(id), "number": number, "base": save.Base,
			"document": f.Document, "result": f.Result, "sha256": f.SHA256[:], "engine": f.Engine, "rulebook": f.Rulebook,
			"title": f.Title, "site": f.Site, "verdict": f.Verdict.String(), "headroom": encodeHeadroom(f.HeadroomC),
			"note": save.Note, "actor": clean(actor.ID), "actor_name": clean(actor.Name),
		})
	if len(f.Uses) > 0 {
		var kinds, makers, models, looked []string
		for _, u := range f.Uses {
			kinds = append(kinds, clean(u.Kind))
			makers = append(makers, u.Maker)
			models = append(models, u.Model)
			looked = append(looked, sought(u.Maker, u.Model))
		}
		batch.Queue(`
			insert into revision_use (design, number, place, kind, maker, model, sought)
			select @design, @number, place, kind, maker, model, sought
			from unnest(@kinds::text[], @makers::text[], @models::text[], @looked::text[])
				with ordinality as used (kind, maker, model, sought, place)`,
			pgx.StrictNamedArgs{
				"design": clean(id), "number": number, "kinds": kinds, "makers": makers, "models": models, "looked": looked,
			})
	}
	if save.Draft != "" {
		batch.Queue(`delete from draft where id = $1 and version = $2`, clean(save.Draft), save.DraftVersion)
		batch.Queue(`update draft set design = $2 where id = $1 and design is null`, clean(save.Draft), clean(id))
	}
	return tx.SendBatch(ctx, &batch).Close()
}

const designColumns = `id, title, site, revision, verdict::text, headroom_c::text,
	created_at, created_by, created_by_name, updated_at, updated_by, updated_by_name, archived_at`

func scanDesign(row pgx.CollectableRow) (d record.Design, err error) {
	var verdict, headroom string
	err = row.Scan(&d.ID, &d.Title, &d.Site, &d.Revision, &verdict, &headroom,
		&d.Created.At, &d.Created.By.ID, &d.Created.By.Name, &d.Updated.At, &d.Updated.By.ID, &d.Updated.By.Name, &d.ArchivedAt)
	if err != nil {
		return d, err
	}
	if d.Verdict, err = decodeVerdict(verdict); err != nil {
		return d, err
	}
	d.HeadroomC, err = decodeHeadroom(headroom)
	return d, err
}

// Design returns a design as lists show it, also an archived one.
func (s *Store) Design(ctx context.Context, id record.ID) (d record.Design, err error) {
	defer wrap(&err, "design %q", id)
	err = s.read(ctx, func(ctx context.Context, conn *pgx.Conn) (err error) {
		d, err = one(ctx, conn, scanDesign, `select `+designColumns+` from design where id = $1`, clean(id))
		return err
	})
	return d, err
}

// Revision returns a revision of a design, the newest for number 0.
func (s *Store) Revision(ctx context.Context, id record.ID, number int) (r record.Revision, err error) {
	defer wrap(&err, "revision %d of design %q", number, id)
	if number < 0 || number > math.MaxInt32 {
		return r, record.ErrNotFound
	}
	err = s.read(ctx, func(ctx context.Context, conn *pgx.Conn) (err error) {
		r, err = revision(ctx, conn, id, number)
		return err
	})
	return r, err
}

func revision(ctx context.Context, db querier, id record.ID, number int) (record.Revision, error) {
	return one(ctx, db, scanRevision, `
		select r.design, r.number, r.base, r.document, r.result, r.sha256, r.engine, r.rulebook,
			r.title, r.site, r.verdict::text, r.headroom_c::text, r.note, r.saved_at, r.saved_by, r.saved_by_name,
			array(select u.kind from revision_use u where u.design = r.design and u.number = r.number order by u.place),
			array(select u.maker from revision_use u where u.design = r.design and u.number = r.number order by u.place),
			array(select u.model from revision_use u where u.design = r.design and u.number = r.number order by u.place)
		from revision r
		where r.design = $1 and r.number = case $2::integer when 0 then (select d.revision from design d where d.id = $1) else $2 end`,
		clean(id), number)
}

func scanRevision(row pgx.CollectableRow) (r record.Revision, err error) {
	f := &r.Frozen
	var sum []byte
	var verdict, headroom string
	var kinds, makers, models []string
	err = row.Scan(&r.Design, &r.Number, &r.Base, &f.Document, &f.Result, &sum, &f.Engine, &f.Rulebook,
		&f.Title, &f.Site, &verdict, &headroom, &r.Note, &r.Saved.At, &r.Saved.By.ID, &r.Saved.By.Name,
		&kinds, &makers, &models)
	if err != nil {
		return r, err
	}
	copy(f.SHA256[:], sum)
	for i := range kinds {
		f.Uses = append(f.Uses, record.Use{Kind: record.Kind(kinds[i]), Maker: makers[i], Model: models[i]})
	}
	if f.Verdict, err = decodeVerdict(verdict); err != nil {
		return r, err
	}
	f.HeadroomC, err = decodeHeadroom(headroom)
	return r, err
}

// Revisions returns the revisions of a design, the newest first.
func (s *Store) Revisions(ctx context.Context, id record.ID) (list []record.RevisionSummary, err error) {
	defer wrap(&err, "revisions of design %q", id)
	err = s.read(ctx, func(ctx context.Context, conn *pgx.Conn) (err error) {
		list, err = all(ctx, conn, scanSummary, `
			select number, base, sha256, engine, rulebook, title, site, verdict::text, headroom_c::text, note,
				saved_at, saved_by, saved_by_name
			from revision where design = $1 order by number desc`, clean(id))
		if err == nil && len(list) == 0 {
			err = record.ErrNotFound
		}
		return err
	})
	return list, err
}

func scanSummary(row pgx.CollectableRow) (r record.RevisionSummary, err error) {
	var sum []byte
	var verdict, headroom string
	err = row.Scan(&r.Number, &r.Base, &sum, &r.Engine, &r.Rulebook, &r.Title, &r.Site, &verdict, &headroom, &r.Note,
		&r.Saved.At, &r.Saved.By.ID, &r.Saved.By.Name)
	if err != nil {
		return r, err
	}
	copy(r.SHA256[:], sum)
	if r.Verdict, err = decodeVerdict(verdict); err != nil {
		return r, err
	}
	r.HeadroomC, err = decodeHeadroom(headroom)
	return r, err
}

// Archive takes a design out of the list of those in use. It stays as it is, and can
// be restored. Archiving an archived one changes nothing.
func (s *Store) Archive(ctx context.Context, actor record.Actor, id record.ID) (err error) {
	defer wrap(&err, "archive design %q", id)
	return s.setArchived(ctx, actor, "design", id, true)
}

// Restore puts an archived design back among those in use.
func (s *Store) Restore(ctx context.Context, actor record.Actor, id record.ID) (err error) {
	defer wrap(&err, "restore design %q", id)
	return s.setArchived(ctx, actor, "design", id, false)
}

// setArchived archives or restores a row of a table that can be archived.
func (s *Store) setArchived(ctx context.Context, actor record.Actor, table string, id record.ID, archived bool) error {
	sql := `update ` + table + ` set archived_at = coalesce(archived_at, now()),
			archived_by = coalesce(archived_by, $2), archived_by_name = coalesce(archived_by_name, $3)
		where id = $1`
	args := []any{clean(id), clean(actor.ID), clean(actor.Name)}
	if !archived {
		sql, args = `update `+table+` set archived_at = null, archived_by = null, archived_by_name = null where id = $1`, args[:1]
	}
	return s.write(ctx, func(ctx context.Context, tx pgx.Tx) error {
		tag, err := tx.Exec(ctx, sql, args...)
		if err == nil && tag.RowsAffected() == 0 {
			err = record.ErrNotFound
		}
		return err
	})
}

// Duplicate saves the newest revision of a design as a new design with another
// title, "" for the same. What the engine found stays with it: it does not depend on
// the title. request is a key as in [Save].
func (s *Store) Duplicate(ctx context.Context, actor record.Actor, id record.ID, title, request string) (d record.Design, err error) {
	defer wrap(&err, "duplicate design %q", id)
	newID := s.newID()
	err = s.write(ctx, func(ctx context.Context, tx pgx.Tx) error {
		earlier, err := claim(ctx, tx, actor, request, contentHash("duplicate", string(id), title), done{string(newID), 1})
		if err != nil {
			return err
		}
		made := newID
		if earlier != nil {
			made = record.ID(earlier.made)
		} else {
			source, err := revision(ctx, tx, id, 0)
			if err != nil {
				return err
			}
			frozen, err := retitled(source.Frozen, title)
			if err != nil {
				return err
			}
			if _, err := addDesign(ctx, tx, actor, newID, 1, &frozen); err != nil {
				return err
			}
			if err := addRevision(ctx, tx, actor, newID, 1, &Save{Frozen: frozen}); err != nil {
				return err
			}
		}
		d, err = one(ctx, tx, scanDesign, `select `+designColumns+` from design where id = $1`, clean(made))
		return err
	})
	return d, err
}

func retitled(f record.Frozen, title string) (record.Frozen, error) {
	if title == "" {
		return f, nil
	}
	doc := design.Read(f.Document)
	if doc.Design == nil {
		return f, fmt.Errorf("the saved document is refused: %v", doc.Faults)
	}
	doc.Design.Title = title
	f.Title = title
	f.Document = design.AppendJSON(nil, doc.Design)
	f.SHA256 = sha256.Sum256(f.Document)
	return f, nil
}

// WhereUsed returns up to limit designs, and 200 at most, whose newest revision uses equipment of this
// maker and model, in whatever capitals and spaces; archived ones too, since what
// was built of them stands. The one changed last is first.
func (s *Store) WhereUsed(ctx context.Context, kind record.Kind, maker, model string, limit int) (designs []record.Design, err error) {
	defer wrap(&err, "where %s %s %s is used", kind, maker, model)
	err = s.read(ctx, func(ctx context.Context, conn *pgx.Conn) (err error) {
		designs, err = all(ctx, conn, scanDesign, `
			select `+designColumns+` from design
			where exists (
				select 1 from revision_use u
				where u.sought = $1 and u.kind = $2 and u.design = design.id and u.number = design.revision)
			order by updated_at desc, id desc limit $3`, sought(maker, model), clean(kind), min(max(limit, 0), maxPageSize))
		return err
	})
	return designs, err
}
