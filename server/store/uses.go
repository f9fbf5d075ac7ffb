package store

import (
	"context"

	"github.com/jackc/pgx/v5"

	"rimeline/server/record"
)

// UseCounts returns how many designs' newest revisions use each of these pieces of
// equipment, in their order; archived designs count, as in [Store.WhereUsed].
func (s *Store) UseCounts(ctx context.Context, pieces []record.Use) (counts []int, err error) {
	defer wrap(&err, "count the uses of %d pieces of equipment", len(pieces))
	kinds, names := make([]string, len(pieces)), make([]string, len(pieces))
	for i, p := range pieces {
		kinds[i], names[i] = clean(string(p.Kind)), sought(p.Maker, p.Model)
	}
	err = s.read(ctx, func(ctx context.Context, conn *pgx.Conn) (err error) {
		counts, err = all(ctx, conn, pgx.RowTo[int], `
			select (
				select count(distinct design.id) from revision_use u
				join design on design.id = u.design and design.revision = u.number
				where u.sought = piece.sought and u.kind = piece.kind)
			from unnest($1::text[], $2::text[]) with ordinality as piece (kind, sought, place)
			order by piece.place`, kinds, names)
		return err
	})
	return counts, err
}
