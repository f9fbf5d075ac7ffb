// Package seed fills a database with invented designs, as many as a busy office has
// after years, in seconds: it copies rows into the tables that server/store keeps,
// and so knows them. For tests and measurements.
package seed

import (
	"bytes"
	"context"
	"crypto/sha256"
	"encoding/csv"
	"encoding/hex"
	"fmt"
	"io"
	"math/rand/v2"
	"strconv"
	"strings"
	"time"

	"github.com/jackc/pgx/v5"

	"rimeline/server/record"
	"rimeline/sizing/design"
)

// noValue is null in what is copied; an empty text is an empty text.
const noValue = `\N`

var (
	streets  = strings.Fields("Alder Birch Cedar Dogwood Elm Foxglove Gorse Hazel Ivy Juniper Larch Maple Nettle Oak Poplar Quince Rowan Sedge Thistle Willow")
	wings    = []string{"house", "barn", "west roof", "south roof", "carport", "school", "workshop", "garage 2"}
	towns    = strings.Fields("Larkspur Fernhollow Grebe Stonewater Tarn Wrenfield Ashby Coldbrook Millrace Harrow")
	makers   = strings.Fields("Tamarack Quillback Bluestem Ironwood Kestrel Lodestar Marram Osprey Petrel Redstart")
	verdicts = []string{"within", "within", "within", "within", "caution", "caution", "unconfirmed", "outside"}
)

// Designs puts n designs into an empty migrated database, each with one revision that
// is example under another title and site. The rows are the same every time. One in
// twenty is archived, one in ten has no headroom.
func Designs(ctx context.Context, connString string, n int, example record.Frozen) error {
	doc := design.Read(example.Document)
	if doc.Design == nil {
		return fmt.Errorf("seed: the example is refused: %v", doc.Faults)
	}
	chance := rand.New(rand.NewPCG(1, 2))
	pick := func(from []string) string { return from[chance.IntN(len(from))] }
	began := time.Date(2023, 1, 2, 8, 0, 0, 0, time.UTC)
	var designs, revisions, uses bytes.Buffer
	designRows, revisionRows, useRows := csv.NewWriter(&designs), csv.NewWriter(&revisions), csv.NewWriter(&uses)
	for i := range n {
		id := fmt.Sprintf("seed-%06d", i)
		title := fmt.Sprintf("%s Street %d, %s", pick(streets), 1+chance.IntN(199), pick(wings))
		site := pick(towns) + " (invented)"
		used := []record.Use{
			{Kind: record.KindModule, Maker: pick(makers) + " Demo (invented)", Model: fmt.Sprintf("%s-%dM", pick(streets)[:2], 390+5*chance.IntN(20))},
			{Kind: record.KindInverter, Maker: pick(makers) + " Demo (invented)", Model: fmt.Sprintf("%s-%dK", pick(towns)[:2], 3+chance.IntN(30))},
		}
		verdict, headroom := pick(verdicts), "-Infinity"
		if chance.IntN(10) > 0 {
			headroom = fmt.Sprintf("%d.%d", chance.IntN(60)-10, chance.IntN(10))
		}
		at := began.Add(time.Duration(chance.IntN(3*365*24*3600)) * time.Second).Format(time.RFC3339)
		archived, archiver := noValue, noValue
		if chance.IntN(20) == 0 {
			archived, archiver = at, "seed"
		}
		doc.Design.Title, doc.Design.Site.Name = title, site
		document := design.AppendJSON(nil, doc.Design)
		sum := sha256.Sum256(document)
		texts := []string{title, site}
		for place, u := range used {
			texts = append(texts, u.Maker, u.Model)
			_ = useRows.Write([]string{id, "1", strconv.Itoa(place + 1), string(u.Kind), u.Maker, u.Model, strings.ToLower(u.Maker + "\n" + u.Model)})
		}
		words := "'" + strings.Join(record.Words(texts...), "' '") + "'"
		_ = designRows.Write([]string{
			id, title, site, "1", verdict, headroom, words, at, "seed", "Seed", at, "seed", "Seed", archived, archiver, archiver,
		})
		_ = revisionRows.Write([]string{
			id, "1", "0", bytea(document), bytea(example.Result), bytea(sum[:]),
			example.Engine, example.Rulebook, title, site, verdict, headroom, "", at, "seed", "Seed",
		})
	}
	for _, w := range []*csv.Writer{designRows, revisionRows, useRows} {
		w.Flush() // into memory, which takes everything
	}
	return copyIn(ctx, connString, &designs, &revisions, &uses)
}

func bytea(content []byte) string { return `\x` + hex.EncodeToString(content) }

func copyIn(ctx context.Context, connString string, designs, revisions, uses io.Reader) error {
	conn, err := pgx.Connect(ctx, connString)
	if err != nil {
		return err
	}
	defer conn.Close(context.WithoutCancel(ctx))
	err = pgx.BeginFunc(ctx, conn, func(tx pgx.Tx) error {
		for _, c := range []struct {
			into string
			from io.Reader
		}{
			{`design (id, title, site, revision, verdict, headroom_c, words, created_at, created_by, created_by_name,
				updated_at, updated_by, updated_by_name, archived_at, archived_by, archived_by_name)`, designs},
			{`revision (design, number, base, document, result, sha256, engine, rulebook, title, site, verdict, headroom_c,
				note, saved_at, saved_by, saved_by_name)`, revisions},
			{`revision_use (design, number, place, kind, maker, model, sought)`, uses},
		} {
			if _, err := tx.Conn().PgConn().CopyFrom(ctx, c.from, `copy `+c.into+` from stdin with (format csv, null '`+noValue+`')`); err != nil {
				return err
			}
		}
		return nil
	})
	if err != nil {
		return fmt.Errorf("seed: %w", err)
	}
	_, err = conn.Exec(ctx, `vacuum analyze design, revision, revision_use`)
	return err
}
