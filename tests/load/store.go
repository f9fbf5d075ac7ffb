package main

import (
	"context"
	"crypto/rand"
	"encoding/hex"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"sync"
	"time"

	"github.com/jackc/pgx/v5"

	"rimeline/server/localpg"
	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/tests/seed"
)

// clients is how many save or read at the same time.
const clients = 16

var loader = record.Actor{ID: "load", Name: "Load"}

// saving is a save as server/store makes it, for pgbench: a further revision of the
// client's own design.
const saving = `
\set number :number + 1
begin;
insert into save_request (actor, key, content, made, number)
	values ('load', 'pgbench ' || :run || ' ' || :client_id || ' ' || :number, :sha256::bytea, :run || '-' || :client_id, :number)
	on conflict on constraint save_request_pkey do nothing;
update design set title = :title, site = :site, revision = :number, verdict = :verdict::verdict, headroom_c = :headroom::numeric,
	words = :words::tsvector, updated_at = now(), updated_by = 'load', updated_by_name = 'Load'
	where id = :run || '-' || :client_id and revision = :number - 1 returning updated_at;
insert into revision (design, number, base, document, result, sha256, engine, rulebook, title, site, verdict, headroom_c, note, saved_by, saved_by_name)
	values (:run || '-' || :client_id, :number, :number - 1, :document::bytea, :result::bytea, :sha256::bytea, 'load', :rulebook,
		:title, :site, :verdict::verdict, :headroom::numeric, '', 'load', 'Load');
insert into revision_use (design, number, place, kind, maker, model, sought)
	select :run || '-' || :client_id, :number, place, kind, maker, model, sought
	from unnest(:kinds::text[], :makers::text[], :models::text[], :looked::text[]) with ordinality as used (kind, maker, model, sought, place);
commit;
`

// listing is a page of the list of designs as server/store asks for it: of a random
// place in the list, so that not always the same page is read.
const listing = `
\set days random(0, 1000)
select count(*) from (select 1 from design where archived_at is null limit 1001) as counted;
select id, title, site, revision, verdict::text, headroom_c::text, created_at, created_by, created_by_name,
	updated_at, updated_by, updated_by_name, archived_at
	from design where archived_at is null and (design.updated_at, design.id) < (timestamptz '2026-01-01' - make_interval(days => :days), '')
	order by design.updated_at desc, design.id desc limit 51;
`

// measureStore compares the store with pgbench, which sends the same statements to the
// same database and does nothing else.
func measureStore(ctx context.Context, dir string, text []byte) error {
	pgbench, err := findPgbench()
	if err != nil {
		return err
	}
	if err := os.Chmod(dir, 0o711); err != nil { // PostgreSQL's own user goes through it
		return err
	}
	dir = filepath.Join(dir, "pg")
	pg, err := localpg.Start(ctx, localpg.Options{Dir: dir, Getenv: os.Getenv})
	if err != nil {
		return err
	}
	defer pg.Stop(context.WithoutCancel(ctx))
	s, err := store.Open(ctx, pg.DSN(), nil)
	if err != nil {
		return err
	}
	defer s.Close()
	if err := s.Migrate(ctx); err != nil {
		return err
	}
	doc := design.Read(text)
	if doc.Design == nil {
		return fmt.Errorf("the design is refused: %v", doc.Faults)
	}
	frozen := record.Freeze(doc.Design, "load")
	short := frozen
	short.Result = []byte("{}") // lists do not look at it
	if err := seed.Designs(ctx, pg.DSN(), 20_000, short); err != nil {
		return err
	}

	first, err := s.SaveRevision(ctx, loader, store.Save{Frozen: frozen})
	if err != nil {
		return err
	}

	fmt.Printf("\n%d clients, a database of 20000 designs, a revision of %d + %d bytes\n", clients, len(frozen.Document), len(frozen.Result))
	for _, c := range []struct {
		name, script string
		goal         float64
		do           func(ctx context.Context, client, n int) error
	}{
		{"saves", saving, 0.45, saver(s, frozen)},
		{"lists", listing, 0.20, func(ctx context.Context, client, n int) error {
			_, err := s.Designs(ctx, record.Listing{})
			return err
		}},
	} {
		script := filepath.Join(dir, c.name+".sql")
		if err := os.WriteFile(script, []byte(c.script), 0o600); err != nil {
			return err
		}
		var ratios []float64
		for range *rounds {
			plain, err := runPgbench(ctx, pgbench, pg.DSN(), script, first.Design, frozen)
			if err != nil {
				return err
			}
			ours, err := perSecond(ctx, c.do)
			if err != nil {
				return err
			}
			fmt.Printf("  pgbench %8.0f/s   store %8.0f/s   ratio %.3f\n", plain, ours, ours/plain)
			ratios = append(ratios, ours/plain)
		}
		fmt.Printf("%s per second, to the same statements by pgbench: %.3f (goal: %.2f or more)\n\n", c.name, median(ratios), c.goal)
	}
	return nil
}

// saver saves further revisions of a client's own design.
func saver(s *store.Store, frozen record.Frozen) func(ctx context.Context, client, n int) error {
	var last [clients]record.Revision
	return func(ctx context.Context, client, n int) (err error) {
		l := &last[client]
		key := fmt.Sprintf("store %d %s %d", client, l.Design, l.Number)
		*l, err = s.SaveRevision(ctx, loader, store.Save{Design: l.Design, Base: l.Number, Frozen: frozen, Request: key})
		return err
	}
}

// perSecond does something with all clients for a while.
func perSecond(ctx context.Context, do func(ctx context.Context, client, n int) error) (float64, error) {
	began, end := time.Now(), time.Now().Add(*duration)
	var group sync.WaitGroup
	var counts [clients]int
	var errs [clients]error
	for client := range clients {
		group.Go(func() {
			for time.Now().Before(end) && errs[client] == nil {
				errs[client] = do(ctx, client, counts[client])
				counts[client]++
			}
		})
	}
	group.Wait()
	total := 0
	for _, n := range counts {
		total += n
	}
	return float64(total) / time.Since(began).Seconds(), errors.Join(errs[:]...)
}

var tpsLine = regexp.MustCompile(`tps = ([0-9.]+)`)

// runPgbench runs a script with all clients for a while and returns how often a
// second it was done. Each client begins with a design of its own, a copy of the one
// named.
func runPgbench(ctx context.Context, pgbench, dsn, script string, like record.ID, f record.Frozen) (float64, error) {
	conn, err := pgx.Connect(ctx, dsn)
	if err != nil {
		return 0, err
	}
	defer conn.Close(context.WithoutCancel(ctx))
	run := rand.Text()
	tx, err := conn.Begin(ctx)
	if err != nil {
		return 0, err
	}
	for _, sql := range []string{`
		insert into design (id, title, site, revision, verdict, headroom_c, words, created_by, created_by_name, updated_by, updated_by_name)
		select $1 || '-' || client, title, site, 1, verdict, headroom_c, words, created_by, created_by_name, updated_by, updated_by_name
		from design, generate_series(0, $3::integer - 1) as client where id = $2`, `
		insert into revision (design, number, base, document, result, sha256, engine, rulebook, title, site, verdict, headroom_c, note, saved_by, saved_by_name)
		select $1 || '-' || client, 1, 0, document, result, sha256, engine, rulebook, title, site, verdict, headroom_c, note, saved_by, saved_by_name
		from revision, generate_series(0, $3::integer - 1) as client where design = $2 and number = 1`,
	} {
		if _, err := tx.Exec(ctx, sql, run, like, clients); err != nil {
			return 0, errors.Join(err, tx.Rollback(ctx))
		}
	}
	if err := tx.Commit(ctx); err != nil {
		return 0, err
	}
	bytea := func(b []byte) string { return `\x` + hex.EncodeToString(b) }
	list := func(of func(record.Use) string) string {
		var quoted []string
		for _, u := range f.Uses {
			quoted = append(quoted, strconv.Quote(of(u)))
		}
		return "{" + strings.Join(quoted, ",") + "}"
	}
	headroom := "-Infinity"
	if f.HeadroomC != nil {
		headroom, _ = f.HeadroomC.Fixed(9, quantity.Down)
	}
	words := []string{f.Title, f.Site}
	for _, u := range f.Uses {
		words = append(words, u.Maker, u.Model)
	}
	args := []string{"-n", "-M", "prepared", "-c", strconv.Itoa(clients), "-j", "1", "-T", strconv.Itoa(int(duration.Seconds())), "-f", script}
	for name, value := range map[string]string{
		"run": run, "number": "1", "title": f.Title, "site": f.Site, "rulebook": f.Rulebook, "verdict": f.Verdict.String(), "headroom": headroom,
		"words":    "'" + strings.Join(record.Words(words...), "' '") + "'",
		"document": bytea(f.Document), "result": bytea(f.Result), "sha256": bytea(f.SHA256[:]),
		"kinds":  list(func(u record.Use) string { return string(u.Kind) }),
		"makers": list(func(u record.Use) string { return u.Maker }),
		"models": list(func(u record.Use) string { return u.Model }),
		"looked": list(func(u record.Use) string { return strings.ToLower(u.Maker + " " + u.Model) }),
	} {
		args = append(args, "-D", name+"="+value)
	}
	out, err := exec.CommandContext(ctx, pgbench, append(args, dsn)...).CombinedOutput()
	found := tpsLine.FindSubmatch(out)
	if err != nil || found == nil || strings.Contains(string(out), "aborted") {
		return 0, fmt.Errorf("pgbench: %v\n%s", err, out)
	}
	var behind int
	err = conn.QueryRow(ctx, `
		select count(*) from design d
		where d.id like $1 || '-%' and d.revision <> (select max(r.number) from revision r where r.design = d.id)`, run).Scan(&behind)
	if err != nil || behind > 0 {
		return 0, fmt.Errorf("pgbench saved revisions that its designs do not point at: %d, %v", behind, err)
	}
	return strconv.ParseFloat(string(found[1]), 64)
}

// findPgbench finds pgbench, which Debian does not put into the path.
func findPgbench() (string, error) {
	if path, err := exec.LookPath("pgbench"); err == nil {
		return path, nil
	}
	found, err := filepath.Glob("/usr/lib/postgresql/*/bin/pgbench")
	if err == nil && len(found) == 0 {
		err = errors.New("pgbench is needed; it comes with PostgreSQL")
	}
	if err != nil {
		return "", err
	}
	return found[len(found)-1], nil
}
