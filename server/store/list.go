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
	"time"

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
type order[T any] struct {
	keys    []key[T]
	falling bool
}

// key is a column that a list is sorted by, its type, and the text of its value in an
// entry, which the type reads.
type key[T any] struct {
	column, kind string
	of           func(T) string
}

// list is a question for a page of a table.
type list[T any] struct {
	table      string
	columns    string
	scan       pgx.RowToFunc[T]
	conditions []string
	args       pgx.StrictNamedArgs
	sort       record.Sort
	order      order[T]
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
func (l *list[T]) readCursor() (c cursor, err error) {
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
func fetch[T any](ctx context.Context, s *Store, l list[T]) (page[T], error) {
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
	err := s.read(ctx, func(ctx context.Context, conn *pgx.Conn) error {
		var batch pgx.Batch
		batch.Queue(count, l.args).QueryRow(func(row pgx.Row) error { return row.Scan(&p.total) })
		batch.Queue(query, args).Query(func(rows pgx.Rows) (err error) {
			p.rows, err = pgx.CollectRows(rows, l.scan)
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
		p.rows = p.rows[:l.limit]
	}
	if from.Before {
		if !further { // this is the first page; show it in full
			l.cursor = ""
			return fetch(ctx, s, l)
		}
		slices.Reverse(p.rows)
	}
	if n := len(p.rows); n > 0 && (further || from.Before) {
		p.next = l.place(l.keysOf(p.rows[n-1]), false)
	}
	switch {
	case l.cursor == "":
	case len(p.rows) == 0:
		p.previous = l.place(from.Keys, true)
	default:
		p.previous = l.place(l.keysOf(p.rows[0]), true)
	}
	return p, nil
}

func (l *list[T]) keysOf(entry T) []string {
	texts := make([]string, len(l.order.keys))
	for i, k := range l.order.keys {
		texts[i] = k.of(entry)
	}
	return texts
}

// place returns the cursor behind the entry with these keys, or before it.
func (l *list[T]) place(keys []string, before bool) string {
	return cursor{Sort: l.sort, Reversed: l.reversed, Before: before, Keys: keys}.String()
}

// sql returns the query of one page, of one row more than it has, and in the
// opposite order if it is the page before the cursor.
func (l *list[T]) sql(from cursor) (string, pgx.StrictNamedArgs) {
	falling := l.order.falling != l.reversed != from.Before
	way, beyond := "asc", ">"
	if falling {
		way, beyond = "desc", "<"
	}
	var columns, given, by []string
	args := pgx.StrictNamedArgs{}
	for name, value := range l.args {
		args[name] = value
	}
	for i, k := range l.order.keys {
		column := l.table + "." + k.column // alone, it would be the column of the answer, which is a text
		columns = append(columns, column)
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
	return fmt.Sprintf("select %s from %s where %s order by %s limit %d",
		l.columns, l.table, strings.Join(conditions, " and "), strings.Join(by, ", "), l.limit+1), args
}

var (
	designID      = key[record.Design]{"id", "text", func(d record.Design) string { return string(d.ID) }}
	designUpdated = key[record.Design]{"updated_at", "timestamptz", func(d record.Design) string { return instant(d.Updated.At) }}
)

// designOrders are the orders of the list of designs.
var designOrders = map[record.Sort]order[record.Design]{
	record.SortUpdated:  {[]key[record.Design]{designUpdated, designID}, true},
	record.SortTitle:    {[]key[record.Design]{{"title", "text", func(d record.Design) string { return d.Title }}, designID}, false},
	record.SortVerdict:  {[]key[record.Design]{{"verdict", "verdict", func(d record.Design) string { return d.Verdict.String() }}, designUpdated, designID}, true},
	record.SortHeadroom: {[]key[record.Design]{{"headroom_c", "numeric", func(d record.Design) string { return encodeHeadroom(d.HeadroomC) }}, designID}, false},
}

// Designs returns a page of the saved designs.
func (s *Store) Designs(ctx context.Context, ask record.Listing) (found record.DesignPage, err error) {
	defer wrap(&err, "list designs")
	l := list[record.Design]{
		table: "design", columns: designColumns, scan: scanDesign, args: pgx.StrictNamedArgs{},
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
	p, err := fetch(ctx, s, l)
	return record.DesignPage{Designs: p.rows, Next: p.next, Previous: p.previous, Total: p.total, More: p.more}, err
}

var equipmentID = key[record.Equipment]{"id", "text", func(e record.Equipment) string { return string(e.ID) }}

// equipmentOrders are the orders of the list of equipment.
var equipmentOrders = map[record.Sort]order[record.Equipment]{
	record.SortName: {[]key[record.Equipment]{
		{"maker", "text", func(e record.Equipment) string { return e.Maker }},
		{"model", "text", func(e record.Equipment) string { return e.Model }},
		equipmentID,
	}, false},
	record.SortUpdated: {[]key[record.Equipment]{
		{"updated_at", "timestamptz", func(e record.Equipment) string { return instant(e.Updated.At) }},
		equipmentID,
	}, true},
}

// EquipmentList returns a page of the equipment that people keep.
func (s *Store) EquipmentList(ctx context.Context, ask record.EquipmentListing) (found record.EquipmentPage, err error) {
	defer wrap(&err, "list equipment")
	l := list[record.Equipment]{
		table: "equipment", columns: equipmentColumns, scan: scanEquipment, args: pgx.StrictNamedArgs{},
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
	p, err := fetch(ctx, s, l)
	return record.EquipmentPage{Equipment: p.rows, Next: p.next, Previous: p.previous, Total: p.total, More: p.more}, err
}

// instant writes a time as the database takes it, to the microsecond that it keeps.
func instant(t time.Time) string { return t.Format(time.RFC3339Nano) }

func (l *list[T]) orderBy(orders map[record.Sort]order[T]) error {
	var ok bool
	if l.order, ok = orders[l.sort]; !ok {
		return fmt.Errorf("%w: this list cannot be sorted by %q", record.ErrInvalid, l.sort)
	}
	return nil
}

func (l *list[T]) filter(archived bool, search string) {
	l.conditions = append(l.conditions, "archived_at is null")
	if archived {
		l.conditions[0] = "archived_at is not null"
	}
	if words := record.Sought(search); len(words) > 0 {
		l.conditions = append(l.conditions, "words @@ @words::text::tsquery")
		l.args["words"] = tsquery(words)
	}
}
