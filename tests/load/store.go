package main

import (
	"bytes"
	"context"
	"crypto/rand"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"net/http"
	"net/url"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"sync"
	"time"

	"github.com/jackc/pgx/v5"

	"rimeline/server/form"
	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/sizing/quantity"
)

var loader = record.Actor{ID: "load", Name: "Load"}

// savingScript is a save as server/store makes it, for pgbench: a further revision of the
// client's own design.
const savingScript = `
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

// listingScript is a page of the list of designs as server/store asks for it: of a random
// place in the list, so that not always the same page is read.
const listingScript = `
\set days random(0, 1000)
select count(*) from (select 1 from design where archived_at is null limit 1001) as counted;
select id, title, site, revision, verdict::text, headroom_c::text, created_at, created_by, created_by_name,
	updated_at, updated_by, updated_by_name, archived_at
	from design where archived_at is null and (design.updated_at, design.id) < (timestamptz '2026-01-01' - make_interval(days => :days), '')
	order by design.updated_at desc, design.id desc limit 51;
`

// saving are saves and lists beside pgbench, which sends the same statements to the same
// database and does nothing else: through the service, and through the store alone.
func (b *bench) saving() ([]comparison, error) {
	pgbench := func(name, content string) (func(context.Context) (figures, error), error) {
		script := filepath.Join(b.dir, name)
		return func(ctx context.Context) (figures, error) { return b.runPgbench(ctx, script) }, os.WriteFile(script, []byte(content), 0o600)
	}
	plainSave, err := pgbench("save.sql", savingScript)
	if err != nil {
		return nil, err
	}
	plainList, err := pgbench("list.sql", listingScript)
	if err != nil {
		return nil, err
	}
	fields, _, err := form.FromDocument(b.frozen.Document)
	if err != nil {
		return nil, err
	}
	typed := url.Values{}
	for _, name := range fields.Names("/") {
		typed.Set(name, fields.Text(name))
	}
	// Clients begin anew each time, with a design of their own.
	saves := func(saver func() func(ctx context.Context, client int) error) func(context.Context) (figures, error) {
		return func(ctx context.Context) (figures, error) { return again(ctx, saver()) }
	}
	get := func(path string) func(context.Context) (figures, error) {
		return func(ctx context.Context) (figures, error) { return wrk(ctx, clients, b.service+path, "") }
	}
	return []comparison{
		{"save: POST /designs", "pgbench", 0.45, plainSave, saves(func() func(context.Context, int) error { return pageSaver(b.service, typed) })},
		{"save: PUT /api/v1/designs/{id}", "pgbench", 0.45, plainSave, saves(func() func(context.Context, int) error { return programSaver(b.service, b.text) })},
		{"save: the store alone", "pgbench", 0.45, plainSave, saves(func() func(context.Context, int) error { return saver(b.store, b.frozen) })},
		{"list: GET /designs", "pgbench", 0.20, plainList, get("/designs")},
		{"list: GET /api/v1/designs", "pgbench", 0.20, plainList, get("/api/v1/designs?limit=50")},
		{"list: the store alone", "pgbench", 0.20, plainList, saves(func() func(context.Context, int) error {
			return func(ctx context.Context, _ int) error {
				_, err := b.store.Designs(ctx, record.Listing{})
				return err
			}
		})},
	}, nil
}

// visitors send the requests that wrk cannot: each rests on the answer to the one before.
var visitors = &http.Client{
	Transport:     &http.Transport{MaxIdleConnsPerHost: clients},
	CheckRedirect: func(*http.Request, []*http.Request) error { return http.ErrUseLastResponse },
}

// visit sends a request, reads the whole answer, and returns its header.
func visit(req *http.Request, status int) (http.Header, error) {
	resp, err := visitors.Do(req)
	if err != nil {
		return nil, err
	}
	defer resp.Body.Close()
	body, err := io.ReadAll(resp.Body)
	if err == nil && resp.StatusCode != status {
		err = fmt.Errorf("%s %s: %s: %s", req.Method, req.URL.Path, resp.Status, body)
	}
	return resp.Header, err
}

// pageSaver saves further revisions of a client's own design as a browser does.
func pageSaver(service string, typed url.Values) func(ctx context.Context, client int) error {
	body := typed.Encode()
	type page struct {
		design string
		base   int
	}
	var last [clients]page
	return func(ctx context.Context, client int) error {
		l := &last[client]
		hidden := url.Values{"request": {rand.Text()}, "design": {l.design}, "base": {strconv.Itoa(l.base)}}
		req, err := http.NewRequestWithContext(ctx, http.MethodPost, service+"/designs", strings.NewReader(body+"&"+hidden.Encode()))
		if err != nil {
			return err
		}
		req.Header.Set("Content-Type", "application/x-www-form-urlencoded")
		header, err := visit(req, http.StatusSeeOther)
		if err != nil {
			return err
		}
		l.base++
		design, saved, _ := strings.Cut(strings.TrimPrefix(header.Get("Location"), "/designs/"), "?saved=")
		if l.design = design; saved != strconv.Itoa(l.base) {
			return fmt.Errorf("revision %d led to %q", l.base, header.Get("Location"))
		}
		return nil
	}
}

// programSaver saves further revisions of a client's own design as a program does.
func programSaver(service string, document []byte) func(ctx context.Context, client int) error {
	type design struct{ address, tag string }
	var last [clients]design
	return func(ctx context.Context, client int) error {
		l := &last[client]
		method, address, status := http.MethodPut, l.address, http.StatusOK
		if l.address == "" {
			method, address, status = http.MethodPost, "/api/v1/designs", http.StatusCreated
		}
		req, err := http.NewRequestWithContext(ctx, method, service+address, bytes.NewReader(document))
		if err != nil {
			return err
		}
		req.Header.Set("Content-Type", "application/json")
		req.Header.Set("Idempotency-Key", rand.Text())
		if l.tag != "" {
			req.Header.Set("If-Match", l.tag)
		}
		header, err := visit(req, status)
		if err != nil {
			return err
		}
		if l.address == "" {
			l.address = header.Get("Location")
		}
		l.tag = header.Get("ETag")
		return nil
	}
}

// saver saves further revisions of a client's own design.
func saver(s *store.Store, frozen record.Frozen) func(ctx context.Context, client int) error {
	var last [clients]record.Revision
	return func(ctx context.Context, client int) (err error) {
		l := &last[client]
		key := fmt.Sprintf("store %d %s %d", client, l.Design, l.Number)
		*l, err = s.SaveRevision(ctx, loader, store.Save{Design: l.Design, Base: l.Number, Frozen: frozen, Request: key})
		return err
	}
}

// again does something with all clients for a while.
func again(ctx context.Context, do func(ctx context.Context, client int) error) (figures, error) {
	began, end := time.Now(), time.Now().Add(*duration)
	var group sync.WaitGroup
	var took [clients][]time.Duration
	var errs [clients]error
	for client := range clients {
		group.Go(func() {
			for last := time.Now(); last.Before(end) && errs[client] == nil; {
				errs[client] = do(ctx, client)
				now := time.Now()
				took[client] = append(took[client], now.Sub(last))
				last = now
			}
		})
	}
	group.Wait()
	all := slices.Sorted(slices.Values(slices.Concat(took[:]...)))
	return figures{
		perSecond: float64(len(all)) / time.Since(began).Seconds(),
		p50:       all[len(all)/2],
		p99:       all[len(all)*99/100],
	}, errors.Join(errs[:]...)
}

var tpsLine = regexp.MustCompile(`tps = ([0-9.]+)`)

// runPgbench runs a script with all clients for a while and returns how often a
// second it was done. Each client begins with a design of its own, a copy of the saved
// one.
func (b *bench) runPgbench(ctx context.Context, script string) (none figures, err error) {
	f := &b.frozen
	conn, err := pgx.Connect(ctx, b.dsn)
	if err != nil {
		return none, err
	}
	defer conn.Close(context.WithoutCancel(ctx))
	run := rand.Text()
	tx, err := conn.Begin(ctx)
	if err != nil {
		return none, err
	}
	for _, sql := range []string{`
		insert into design (id, title, site, revision, verdict, headroom_c, words, created_by, created_by_name, updated_by, updated_by_name)
		select $1 || '-' || client, title, site, 1, verdict, headroom_c, words, created_by, created_by_name, updated_by, updated_by_name
		from design, generate_series(0, $3::integer - 1) as client where id = $2`, `
		insert into revision (design, number, base, document, result, sha256, engine, rulebook, title, site, verdict, headroom_c, note, saved_by, saved_by_name)
		select $1 || '-' || client, 1, 0, document, result, sha256, engine, rulebook, title, site, verdict, headroom_c, note, saved_by, saved_by_name
		from revision, generate_series(0, $3::integer - 1) as client where design = $2 and number = 1`,
	} {
		if _, err := tx.Exec(ctx, sql, run, b.saved, clients); err != nil {
			return none, errors.Join(err, tx.Rollback(ctx))
		}
	}
	if err := tx.Commit(ctx); err != nil {
		return none, err
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
	out, err := exec.CommandContext(ctx, b.pgbench, append(args, b.dsn)...).CombinedOutput()
	found := tpsLine.FindSubmatch(out)
	if err != nil || found == nil || strings.Contains(string(out), "aborted") {
		return none, fmt.Errorf("pgbench: %v\n%s", err, out)
	}
	var behind int
	err = conn.QueryRow(ctx, `
		select count(*) from design d
		where d.id like $1 || '-%' and d.revision <> (select max(r.number) from revision r where r.design = d.id)`, run).Scan(&behind)
	if err != nil || behind > 0 {
		return none, fmt.Errorf("pgbench saved revisions that its designs do not point at: %d, %v", behind, err)
	}
	rate, err := strconv.ParseFloat(string(found[1]), 64)
	return figures{perSecond: rate}, err
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
