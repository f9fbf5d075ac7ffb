package store

import (
	"cmp"
	"context"
	"encoding/base64"
	"encoding/json"
	"errors"
	"fmt"
	"slices"
	"strings"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgconn"

	"rimeline/server/record"
)

const (
	pageSize    = 50
	maxPageSize = 200
)

// order is an order of a list: by its keys, all of them rising, or all falling. The
// last key is different in every row. An index has them in this order.
type order struct {
	keys    []key
	falling bool
}

type key struct{ column, kind string }

// list is a question for a page of a table.
type list struct {
	table      string
	columns    string
	conditions []string
	args       pgx.StrictNamedArgs
	sort       record.Sort
	order      order
	reversed   bool
	cursor     string
	limit      int
}

// page is what was found.
type page[T any] struct {
	rows           []T
	next, previous string
	total          int
	more           bool
}

// cursor is a place in a list: between a row, of which it has the keys, and the row
// behind it, or before it.
type cursor struct {
	Sort     record.Sort `json:"s"`
	Reversed bool        `json:"r,omitempty"`
	Before   bool        `json:"b,omitempty"` // the page ends before the row, rather than beginning behind it
	Keys     []string    `json:"k"`
}

func (c cursor) String() string {
	text, err := json.Marshal(c)
	if err != nil {
		panic(err) // it holds nothing but texts
	}
	return base64.RawURLEncoding.EncodeToString(text)
}

// readCursor reads a cursor of this list.
func (l *list) readCursor() (c cursor, err error) {
	text, err := base64.RawURLEncoding.DecodeString(l.cursor)
	if err == nil {
		err = json.Unmarshal(text, &c)
	}
	switch {
	case err != nil, len(c.Keys) != len(l.order.keys):
		return c, fmt.Errorf("%w: the cursor is not one of this list", record.ErrInvalid)
	case c.Sort != l.sort || c.Reversed != l.reversed:
		return c, fmt.Errorf("%w: the cursor is of the list in another order", record.ErrInvalid)
	}
	return c, nil
}

// fetch answers a list. Paging costs the same on every page, and a row that comes or
// goes meanwhile makes no other row appear twice or be passed over.
func fetch[T any](ctx context.Context, s *Store, l list, scan func(row pgx.CollectableRow, more ...any) (T, error)) (page[T], error) {
	if l.limit <= 0 {
		l.limit = pageSize
	}
	l.limit = min(l.limit, maxPageSize)
	var from cursor
	if l.cursor != "" {
		var err error
		if from, err = l.readCursor(); err != nil {
			return page[T]{}, err
		}
	}
	count := fmt.Sprintf(`select count(*) from (select 1 from %s where %s limit %d) as counted`,
		l.table, strings.Join(l.conditions, " and "), record.CountedTo+1)
	query, args := l.sql(from)
	var p page[T]
	var keys [][]string
	err := s.read(ctx, func(ctx context.Context, conn *pgx.Conn) error {
		keys = nil
		var batch pgx.Batch
		batch.Queue(count, l.args).QueryRow(func(row pgx.Row) error { return row.Scan(&p.total) })
		batch.Queue(query, args).Query(func(rows pgx.Rows) (err error) {
			p.rows, err = pgx.CollectRows(rows, func(row pgx.CollectableRow) (T, error) {
				var at []string
				entry, err := scan(row, &at)
				keys = append(keys, at)
				return entry, err
			})
			return err
		})
		return conn.SendBatch(ctx, &batch).Close()
	})
	if pgErr, ok := errors.AsType[*pgconn.PgError](err); ok && l.cursor != "" && strings.HasPrefix(pgErr.Code, "22") {
		return page[T]{}, fmt.Errorf("%w: the cursor is not one of this list: %w", record.ErrInvalid, err) // its keys are no dates, numbers, verdicts
	}
	if err != nil {
		return page[T]{}, err
	}
	if p.total > record.CountedTo {
		p.total, p.more = record.CountedTo, true
	}
	further := len(p.rows) > l.limit
	if further {
		p.rows, keys = p.rows[:l.limit], keys[:l.limit]
	}
	if from.Before {
		if !further { // this is the first page; show it in full
			l.cursor = ""
			return fetch(ctx, s, l, scan)
		}
		slices.Reverse(p.rows)
		slices.Reverse(keys)
	}
	place := func(keys []string, before bool) string {
		return cursor{Sort: l.sort, Reversed: l.reversed, Before: before, Keys: keys}.String()
	}
	if len(p.rows) == 0 {
		if l.cursor != "" {
			p.previous = place(from.Keys, true)
		}
		return p, nil
	}
	if further || from.Before {
		p.next = place(keys[len(keys)-1], false)
	}
	if l.cursor != "" {
		p.previous = place(keys[0], true)
	}
	return p, nil
}

// sql returns the query of one page, of one row more than it has, and in the
// opposite order if it is the page before the cursor.
func (l *list) sql(from cursor) (string, pgx.StrictNamedArgs) {
	falling := l.order.falling != l.reversed != from.Before
	way, beyond := "asc", ">"
	if falling {
		way, beyond = "desc", "<"
	}
	var columns, texts, given, by []string
	args := pgx.StrictNamedArgs{}
	for name, value := range l.args {
		args[name] = value
	}
	for i, k := range l.order.keys {
		column := l.table + "." + k.column // alone, it would be the column of the answer, which is a text
		columns = append(columns, column)
		texts = append(texts, column+"::text")
		by = append(by, column+" "+way)
		if from.Keys != nil {
			name := fmt.Sprintf("from%d", i)
			given = append(given, fmt.Sprintf("@%s::text::%s", name, k.kind))
			args[name] = clean(from.Keys[i])
		}
	}
	conditions := slices.Clone(l.conditions)
	if from.Keys != nil {
		conditions = append(conditions, fmt.Sprintf("(%s) %s (%s)", strings.Join(columns, ", "), beyond, strings.Join(given, ", ")))
	}
	return fmt.Sprintf("select %s, array[%s] from %s where %s order by %s limit %d",
		l.columns, strings.Join(texts, ", "), l.table, strings.Join(conditions, " and "), strings.Join(by, ", "), l.limit+1), args
}

// designOrders are the orders of the list of designs.
var designOrders = map[record.Sort]order{
	record.SortUpdated:  {keys: []key{{"updated_at", "timestamptz"}, {"id", "text"}}, falling: true},
	record.SortTitle:    {keys: []key{{"title", "text"}, {"id", "text"}}},
	record.SortVerdict:  {keys: []key{{"verdict", "verdict"}, {"updated_at", "timestamptz"}, {"id", "text"}}, falling: true},
	record.SortHeadroom: {keys: []key{{"headroom_c", "numeric"}, {"id", "text"}}},
}

// Designs returns a page of the saved designs.
func (s *Store) Designs(ctx context.Context, ask record.Listing) (found record.DesignPage, err error) {
	defer wrap(&err, "list designs")
	l := list{
		table: "design", columns: designColumns, args: pgx.StrictNamedArgs{},
		sort: cmp.Or(ask.Sort, record.SortUpdated), reversed: ask.Reversed, cursor: ask.Cursor, limit: ask.Limit,
	}
	if err := l.orderBy(designOrders); err != nil {
		return found, err
	}
	l.filter(ask.Archived, ask.Words)
	if ask.Verdict != nil {
		l.conditions = append(l.conditions, "verdict = @verdict::verdict")
		l.args["verdict"] = ask.Verdict.String()
	}
	p, err := fetch(ctx, s, l, scanDesign)
	return record.DesignPage{Designs: p.rows, Next: p.next, Previous: p.previous, Total: p.total, More: p.more}, err
}

// equipmentOrders are the orders of the list of equipment.
var equipmentOrders = map[record.Sort]order{
	record.SortName:    {keys: []key{{"maker", "text"}, {"model", "text"}, {"id", "text"}}},
	record.SortUpdated: {keys: []key{{"updated_at", "timestamptz"}, {"id", "text"}}, falling: true},
}

// EquipmentList returns a page of the equipment that people keep.
func (s *Store) EquipmentList(ctx context.Context, ask record.EquipmentListing) (found record.EquipmentPage, err error) {
	defer wrap(&err, "list equipment")
	l := list{
		table: "equipment", columns: equipmentColumns, args: pgx.StrictNamedArgs{},
		sort: cmp.Or(ask.Sort, record.SortName), reversed: ask.Reversed, cursor: ask.Cursor, limit: ask.Limit,
	}
	if err := l.orderBy(equipmentOrders); err != nil {
		return found, err
	}
	l.filter(ask.Archived, ask.Words)
	if ask.Kind != "" {
		l.conditions = append(l.conditions, "kind = @kind")
		l.args["kind"] = clean(ask.Kind)
	}
	p, err := fetch(ctx, s, l, scanEquipment)
	return record.EquipmentPage{Equipment: p.rows, Next: p.next, Previous: p.previous, Total: p.total, More: p.more}, err
}

func (l *list) orderBy(orders map[record.Sort]order) error {
	var ok bool
	if l.order, ok = orders[l.sort]; !ok {
		return fmt.Errorf("%w: this list cannot be sorted by %q", record.ErrInvalid, l.sort)
	}
	return nil
}

func (l *list) filter(archived bool, search string) {
	l.conditions = append(l.conditions, "archived_at is null")
	if archived {
		l.conditions[0] = "archived_at is not null"
	}
	if words := record.Sought(search); len(words) > 0 {
		l.conditions = append(l.conditions, "words @@ @words::text::tsquery")
		l.args["words"] = tsquery(words)
	}
}
