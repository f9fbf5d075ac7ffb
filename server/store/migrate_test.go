package store_test

import (
	"errors"
	"flag"
	"io/fs"
	"maps"
	"os"
	"os/exec"
	"regexp"
	"slices"
	"strings"
	"sync"
	"testing"
	"testing/fstest"

	"github.com/google/go-cmp/cmp"

	"rimeline/migrations"
	"rimeline/server/record"
	"rimeline/server/store"
)

var update = flag.Bool("update", false, "write the golden files anew")

func files(contents map[string]string) fs.FS {
	fsys := fstest.MapFS{}
	for name, sql := range contents {
		fsys[name] = &fstest.MapFile{Data: []byte(sql)}
	}
	return fsys
}

func applied(t *testing.T, s *store.Store) []string {
	t.Helper()
	names, err := s.QueryTexts(t.Context(), `select name from migration order by name`)
	if err != nil {
		t.Fatal(err)
	}
	return names
}

func tables(t *testing.T, s *store.Store) []string {
	t.Helper()
	names, err := s.QueryTexts(t.Context(), `select tablename::text from pg_tables where schemaname = 'public' order by tablename`)
	if err != nil {
		t.Fatal(err)
	}
	return names
}

func TestMigrate_FourAtOnce(t *testing.T) {
	t.Parallel()
	first := emptyStore(t)
	stores := []*store.Store{first, sameDatabase(t, first), sameDatabase(t, first), sameDatabase(t, first)}
	var group sync.WaitGroup
	for _, s := range stores {
		group.Go(func() {
			if err := s.Migrate(t.Context()); err != nil {
				t.Error(err)
			}
			if err := s.Ready(t.Context()); err != nil {
				t.Error(err)
			}
		})
	}
	group.Wait()
	want, err := fs.Glob(migrations.FS, "*")
	if diff := cmp.Diff(want, applied(t, first)); err != nil || diff != "" {
		t.Errorf("%v, mismatch (-files +applied)\n%s", err, diff)
	}
}

func TestMigrate_BrokenFile(t *testing.T) {
	t.Parallel()
	s := emptyStore(t)
	contents := map[string]string{
		"0001_one.sql": "create table one (n int);",
		"0002_two.sql": "create table two (n int);\ninsert into two values (1);\ncreate table three (n integr);",
	}
	err := s.MigrateFrom(t.Context(), files(contents))
	if err == nil || !strings.Contains(err.Error(), "0002_two.sql: line 3: ") || !strings.Contains(err.Error(), "integr") {
		t.Errorf("the error does not tell where and what: %v", err)
	}
	if diff := cmp.Diff([]string{"migration", "one"}, tables(t, s)); diff != "" {
		t.Errorf("tables after the failure (-want +got)\n%s", diff)
	}
	if diff := cmp.Diff([]string{"0001_one.sql"}, applied(t, s)); diff != "" {
		t.Errorf("applied after the failure (-want +got)\n%s", diff)
	}
	contents["0002_two.sql"] = strings.ReplaceAll(contents["0002_two.sql"], "integr", "integer")
	contents["0003_three.sql"] = "" // nothing to do is fine
	for range 2 {
		if err := s.MigrateFrom(t.Context(), files(contents)); err != nil {
			t.Fatal(err)
		}
	}
	if diff := cmp.Diff([]string{"migration", "one", "three", "two"}, tables(t, s)); diff != "" {
		t.Errorf("tables after it was mended (-want +got)\n%s", diff)
	}
}

func TestMigrate_Refused(t *testing.T) {
	t.Parallel()
	s := emptyStore(t)
	good := map[string]string{"0001_one.sql": "create table one (n int);\n", "0002_two.sql": "create table two (n int);\n"}
	if err := s.MigrateFrom(t.Context(), files(good)); err != nil {
		t.Fatal(err)
	}
	with := func(change func(map[string]string)) map[string]string {
		changed := maps.Clone(good)
		change(changed)
		return changed
	}
	for _, c := range []struct {
		name     string
		contents map[string]string
		want     string // part of the error, "" if it is accepted
	}{
		{"as it was", good, ""},
		{"lines end otherwise", with(func(m map[string]string) { m["0001_one.sql"] = "create table one (n int);\r\n" }), ""},
		{"edited", with(func(m map[string]string) { m["0001_one.sql"] += "-- edited\n" }), "0001_one.sql was changed after it was applied"},
		{"edited, with a new one", with(func(m map[string]string) { m["0002_two.sql"] += " "; m["0003_new.sql"] = "create table new ();" }), "0002_two.sql was changed after it was applied"},
		{"renamed", with(func(m map[string]string) { m["0002_zwei.sql"] = m["0002_two.sql"]; delete(m, "0002_two.sql") }), "0002_two.sql applied where this program has 0002_zwei.sql"},
		{"an older program", with(func(m map[string]string) { delete(m, "0002_two.sql") }), "a newer program has used it"},
		{"a gap", with(func(m map[string]string) { m["0004_four.sql"] = "" }), "0004_four.sql should be named 0003_what.sql"},
		{"a number twice", with(func(m map[string]string) { m["0002_twice.sql"] = "" }), "should be named"},
		{"a short number", with(func(m map[string]string) { m["003_three.sql"] = "" }), "should be named"},
		{"no name", with(func(m map[string]string) { m["0003.sql"] = "" }), "0003.sql should be named"},
		{"no words", with(func(m map[string]string) { m["0003_.sql"] = "" }), "0003_.sql should be named"},
	} {
		err := s.MigrateFrom(t.Context(), files(c.contents))
		if c.want == "" && err != nil || c.want != "" && (err == nil || !strings.Contains(err.Error(), c.want)) {
			t.Errorf("%s: %v, want %q", c.name, err, c.want)
		}
	}
	if diff := cmp.Diff([]string{"migration", "one", "two"}, tables(t, s)); diff != "" {
		t.Errorf("tables after refusals (-want +got)\n%s", diff)
	}
}

func TestReady(t *testing.T) {
	t.Parallel()
	s := emptyStore(t)
	wants := func(part string) {
		t.Helper()
		err := s.Ready(t.Context())
		if part == "" && err != nil || part != "" && (err == nil || !strings.Contains(err.Error(), part)) {
			t.Errorf("Ready: %v, want %q", err, part)
		}
		if errors.Is(err, record.ErrUnavailable) {
			t.Errorf("the database can be reached, but: %v", err)
		}
	}
	wants("migrations are not applied yet, the first is 0001_designs.sql")
	if err := s.Migrate(t.Context()); err != nil {
		t.Fatal(err)
	}
	wants("")
	if err := s.Exec(t.Context(), `delete from migration where name >= '0004'`); err != nil {
		t.Fatal(err)
	}
	wants("the first is 0004_requests.sql")
	if err := s.Exec(t.Context(), `update migration set sha256 = '' where name < '0002'`); err != nil {
		t.Fatal(err)
	}
	wants("0001_designs.sql was changed")
}

// TestMigrate_Schema: schema.sql is what a dump of a fresh database says.
func TestMigrate_Schema(t *testing.T) {
	t.Parallel()
	pgDump := findPgDump(t)
	s := newStore(t)
	out, err := exec.CommandContext(t.Context(), pgDump, "--schema-only", "--no-owner", "--no-privileges", "--dbname", s.ConnString()).Output()
	if err != nil {
		if exit, ok := errors.AsType[*exec.ExitError](err); ok {
			err = errors.New(string(exit.Stderr))
		}
		t.Fatal(err)
	}
	const file = "../../migrations/schema.sql"
	got := "-- What the migrations come to; made by: go test ./server/store -run Schema -update\n" + normalDump(string(out))
	if *update {
		if err := os.WriteFile(file, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(file)
	if diff := cmp.Diff(string(want), got); err != nil || diff != "" {
		t.Errorf("%s is not what a dump says; renew it with -update: %v\n%s", file, err, diff)
	}
}

// normalDump leaves out of a dump what depends on the program that made it: its
// version, its settings, and the names of its sections.
func normalDump(dump string) string {
	var kept []string
	for line := range strings.Lines(dump) {
		line = strings.TrimRight(line, "\r\n")
		if strings.HasPrefix(line, "--") || strings.HasPrefix(line, "SET ") || strings.HasPrefix(line, `\`) ||
			strings.HasPrefix(line, "SELECT pg_catalog.set_config") || line == "" && (len(kept) == 0 || kept[len(kept)-1] == "") {
			continue
		}
		kept = append(kept, line)
	}
	return strings.TrimRight(strings.Join(kept, "\n"), "\n") + "\n"
}

func findPgDump(t *testing.T) string {
	t.Helper()
	if path, err := exec.LookPath("pg_dump"); err == nil {
		return path
	}
	found, _ := fs.Glob(os.DirFS("/"), "usr/lib/postgresql/*/bin/pg_dump")
	if len(found) > 0 {
		return "/" + slices.Max(found)
	}
	if os.Getenv("CI") == "true" {
		t.Fatal("pg_dump is not there")
	}
	t.Skip("pg_dump is not there; it comes with PostgreSQL")
	return ""
}

// TestConstraints: every constraint is either told apart to callers or one that only
// a fault of ours breaks, and none is told apart that there is not.
func TestConstraints(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	ours := regexp.MustCompile(`^(migration_pkey|.*_(archived|number|version|revision)_check|design_(pkey|id_check|newest_fkey)|revision_(pkey|design_fkey)|revision_use_(pkey|revision_fkey)|equipment_pkey|save_request_pkey|answer_pkey)$`)
	names, err := s.QueryTexts(t.Context(), `select conname::text from pg_constraint where connamespace = 'public'::regnamespace and contype <> 't' order by 1`)
	if err != nil || len(names) < 30 {
		t.Fatalf("%d constraints: %v", len(names), err)
	}
	for _, name := range names {
		if (store.ConstraintKinds[name] == nil) != ours.MatchString(name) {
			t.Errorf("%s: either the caller is told its kind, or only a fault of ours breaks it", name)
		}
	}
	for name := range store.ConstraintKinds {
		if !slices.Contains(names, name) {
			t.Errorf("there is no constraint %s", name)
		}
	}
	unnamed, err := s.QueryTexts(t.Context(), `select table_name || '.' || column_name from information_schema.columns where table_schema = 'public' and data_type = 'timestamp without time zone'`)
	if err != nil || len(unnamed) > 0 {
		t.Errorf("times that do not say of which zone: %q, %v", unnamed, err)
	}
}
