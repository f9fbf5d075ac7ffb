package store_test

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"net"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"

	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/tests/testdb"
)

// everyCall is every method that asks the database, with something harmless.
func everyCall(s *store.Store, f record.Frozen) map[string]func(context.Context) error {
	e := module("Acme Demo", "X")
	answer := func(context.Context) (record.Answer, error) { return record.Answer{Status: 200}, nil }
	return map[string]func(context.Context) error{
		"Ready":        s.Ready,
		"Migrate":      s.Migrate,
		"SaveRevision": func(ctx context.Context) error { _, err := s.SaveRevision(ctx, ann, store.Save{Frozen: f}); return err },
		"Design":       func(ctx context.Context) error { _, err := s.Design(ctx, "a"); return err },
		"Revision":     func(ctx context.Context) error { _, err := s.Revision(ctx, "a", 0); return err },
		"Revisions":    func(ctx context.Context) error { _, err := s.Revisions(ctx, "a"); return err },
		"Designs":      func(ctx context.Context) error { _, err := s.Designs(ctx, record.Listing{}); return err },
		"Archive":      func(ctx context.Context) error { return s.Archive(ctx, ann, "a") },
		"Restore":      func(ctx context.Context) error { return s.Restore(ctx, ann, "a") },
		"Duplicate":    func(ctx context.Context) error { _, err := s.Duplicate(ctx, ann, "a", "", ""); return err },
		"WhereUsed": func(ctx context.Context) error {
			_, err := s.WhereUsed(ctx, record.KindModule, "a", "b", 1)
			return err
		},
		"EquipmentNames":   func(ctx context.Context) error { _, err := s.EquipmentNames(ctx, 1); return err },
		"UseCounts":        func(ctx context.Context) error { _, err := s.UseCounts(ctx, nil); return err },
		"SaveDraft":        func(ctx context.Context) error { _, err := s.SaveDraft(ctx, ann, record.Draft{}); return err },
		"Draft":            func(ctx context.Context) error { _, err := s.Draft(ctx, "a"); return err },
		"DraftsOf":         func(ctx context.Context) error { _, err := s.DraftsOf(ctx, "a", 1); return err },
		"Drafts":           func(ctx context.Context) error { _, err := s.Drafts(ctx, 1); return err },
		"DiscardDraft":     func(ctx context.Context) error { return s.DiscardDraft(ctx, ann, "a", 1) },
		"SaveEquipment":    func(ctx context.Context) error { _, err := s.SaveEquipment(ctx, ann, e, ""); return err },
		"Equipment":        func(ctx context.Context) error { _, err := s.Equipment(ctx, "a"); return err },
		"EquipmentList":    func(ctx context.Context) error { _, err := s.EquipmentList(ctx, record.EquipmentListing{}); return err },
		"ArchiveEquipment": func(ctx context.Context) error { return s.ArchiveEquipment(ctx, ann, "a") },
		"RestoreEquipment": func(ctx context.Context) error { return s.RestoreEquipment(ctx, ann, "a") },
		"Remember": func(ctx context.Context) error {
			_, _, err := s.Remember(ctx, ann, "k", [32]byte{}, answer)
			return err
		},
		"Tidy": s.Tidy,
	}
}

// allAway checks that every call fails as it should where the database is away, and
// soon.
func allAway(t *testing.T, s *store.Store, within time.Duration) {
	t.Helper()
	for name, call := range everyCall(s, sample(t, "House")) {
		began := time.Now()
		err := call(t.Context())
		if !errors.Is(err, record.ErrUnavailable) || errors.Is(err, record.ErrUnknownOutcome) {
			t.Errorf("%s: %v, want ErrUnavailable, and nothing unknown", name, err)
		}
		if took := time.Since(began); took > within {
			t.Errorf("%s took %v to find out", name, took)
		}
	}
}

func TestAway_NeverThere(t *testing.T) {
	t.Parallel()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	silent := l.Addr().(*net.TCPAddr).Port // takes connections and says nothing
	t.Cleanup(func() { l.Close() })
	for name, c := range map[string]struct {
		dsn    string
		within time.Duration
	}{
		"no socket":       {"host=" + t.TempDir() + " user=x dbname=x", time.Second},
		"nobody listens":  {"host=127.0.0.1 port=1 user=x dbname=x", time.Second},
		"no such host":    {"host=nowhere.invalid user=x dbname=x", 3 * time.Second},
		"it never speaks": {fmt.Sprintf("host=127.0.0.1 port=%d user=x dbname=x sslmode=disable", silent), 4 * time.Second},
	} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			s := open(t, c.dsn)
			if c.within > time.Second { // every call would take that long
				began := time.Now()
				if err := s.Ready(t.Context()); !errors.Is(err, record.ErrUnavailable) || time.Since(began) > c.within {
					t.Errorf("after %v: %v", time.Since(began), err)
				}
				return
			}
			allAway(t, s, c.within)
		})
	}
}

func TestAway_Closed(t *testing.T) {
	t.Parallel()
	s := newStore(t)
	s.Close()
	allAway(t, s, time.Second)
}

// TestAway_AndBack: the database is stopped, started and killed, and the store works
// as soon as it does.
func TestAway_AndBack(t *testing.T) {
	t.Parallel()
	c := testdb.NewCluster(t)
	s := open(t, c.DSN())
	if err := s.Migrate(t.Context()); err != nil {
		t.Fatal(err)
	}
	first := mustSave(t, s, store.Save{Frozen: sample(t, "House")})
	fill(t, s, 4) // connections that will be dead
	c.Stop(t)
	allAway(t, s, time.Second)
	c.Start(t)
	// At once, without a failure for each connection that died.
	if _, err := s.Revision(t.Context(), first.Design, 0); err != nil {
		t.Errorf("the first read after the start: %v", err)
	}
	mustSave(t, s, store.Save{Design: first.Design, Base: 1, Frozen: sample(t, "House")})

	fill(t, s, 4)
	c.Stop(t)
	c.Start(t)
	mustSave(t, s, store.Save{Design: first.Design, Base: 2, Frozen: sample(t, "House")}) // the connections died unseen

	fill(t, s, 4)
	c.Kill(t)
	c.AwaitReady(t)
	mustSave(t, s, store.Save{Design: first.Design, Base: 3, Frozen: sample(t, "House")})
}

// fill makes the store open n connections.
func fill(t *testing.T, s *store.Store, n int) {
	t.Helper()
	ready := make(chan struct{}, n)
	all := make(chan struct{})
	var group sync.WaitGroup
	for range n {
		group.Go(func() {
			err := s.Write(t.Context(), func(context.Context, pgx.Tx) error {
				ready <- struct{}{}
				<-all
				return nil
			})
			if err != nil {
				t.Error(err)
			}
		})
	}
	for range n {
		<-ready
	}
	close(all)
	group.Wait()
	if got := s.OpenConns(); got < int32(n) {
		t.Fatalf("%d connections are open, want %d", got, n)
	}
}

// TestAway_InTheInstantOfACommit: the connection is cut when the commit is on its
// way, or when its answer is. The editor is told that nobody knows, and a repetition
// finds out.
func TestAway_InTheInstantOfACommit(t *testing.T) {
	t.Parallel()
	dsn := testdb.New(t, migrated)
	for name, c := range map[string]struct {
		done bool // the commit reaches the database
	}{
		"on its way": {false},
		"answered":   {true},
	} {
		t.Run(name, func(t *testing.T) {
			cut := newCutter(t, dsn)
			s := open(t, cut.dsn)
			before := mustSave(t, s, store.Save{Frozen: sample(t, "House")})
			save := store.Save{Design: before.Design, Base: 1, Frozen: sample(t, "House"), Request: "key " + name}
			cut.next.Store(&c.done)
			_, err := s.SaveRevision(t.Context(), ann, save)
			if !errors.Is(err, record.ErrUnavailable) || !errors.Is(err, record.ErrUnknownOutcome) {
				t.Fatalf("got %v, want ErrUnavailable and ErrUnknownOutcome", err)
			}
			saved, err := s.SaveRevision(t.Context(), ann, save)
			if err != nil || saved.Number != 2 || saved.Repeated != c.done {
				t.Errorf("repeated: revision %d, which was saved before: %t, want %t: %v", saved.Number, saved.Repeated, c.done, err)
			}
			if list, err := s.Revisions(t.Context(), before.Design); err != nil || len(list) != 2 {
				t.Errorf("%d revisions, want 2: %v", len(list), err)
			}
		})
	}
}

// TestAway_Silent: a database that has stopped to answer, as behind a broken network,
// is given up in time, and used again when it answers.
func TestAway_Silent(t *testing.T) {
	t.Parallel()
	if testing.Short() {
		t.Skip("it waits for the timeouts, ten seconds")
	}
	cut := newCutter(t, testdb.New(t, migrated))
	s := open(t, cut.dsn)
	first := mustSave(t, s, store.Save{Frozen: sample(t, "House")})
	cut.silent.Store(true)
	for _, c := range []struct {
		name   string
		within time.Duration
		call   func() error
	}{
		{"Ready", 3 * time.Second, func() error { return s.Ready(t.Context()) }},
		{"SaveRevision", 7 * time.Second, func() error {
			_, err := s.SaveRevision(t.Context(), ann, store.Save{Design: first.Design, Base: 1, Frozen: sample(t, "House")})
			return err
		}},
	} {
		began := time.Now()
		if err := c.call(); !errors.Is(err, record.ErrUnavailable) || time.Since(began) > c.within {
			t.Errorf("%s, after %v: %v, want ErrUnavailable", c.name, time.Since(began), err)
		}
	}
	cut.silent.Store(false)
	mustSave(t, s, store.Save{Design: first.Design, Base: 1, Frozen: sample(t, "House")})
}

// cutter stands between a store and the database, and cuts a connection at the next
// commit, or lets nothing through, when it is told to.
type cutter struct {
	dsn    string
	server string               // its socket
	next   atomic.Pointer[bool] // cut: false before the database gets the commit, true after it answered
	silent atomic.Bool
}

func newCutter(t *testing.T, dsn string) *cutter {
	t.Helper()
	cfg, err := pgx.ParseConfig(dsn)
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	socket := func(dir string) string { return fmt.Sprintf("%s/.s.PGSQL.%d", dir, cfg.Port) }
	l, err := net.Listen("unix", socket(dir))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { l.Close() })
	c := &cutter{dsn: strings.ReplaceAll(dsn, cfg.Host, dir), server: socket(cfg.Host)}
	go func() {
		for {
			client, err := l.Accept()
			if err != nil {
				return
			}
			go c.carry(client)
		}
	}()
	return c
}

// carry passes on what client and server say to each other.
func (c *cutter) carry(client net.Conn) {
	defer client.Close()
	server, err := net.Dial("unix", c.server)
	if err != nil {
		return
	}
	defer server.Close()
	var deaf atomic.Bool // the client gets no more answers
	go func() {
		answer := make([]byte, 1<<16)
		for {
			n, err := server.Read(answer)
			if err != nil || deaf.Load() {
				client.Close()
				return
			}
			if c.silent.Load() {
				continue
			}
			if _, err := client.Write(answer[:n]); err != nil {
				return
			}
		}
	}()
	request := make([]byte, 1<<16)
	for {
		n, err := client.Read(request)
		if err != nil {
			return
		}
		if bytes.HasPrefix(request[:n], []byte("Q\x00\x00\x00\x0bcommit\x00")) { // a message of the protocol: the query "commit"
			if cut := c.next.Swap(nil); cut != nil {
				if !*cut {
					return
				}
				deaf.Store(true)
			}
		}
		if _, err := server.Write(request[:n]); err != nil {
			return
		}
	}
}

// TestAway_UnderLoad: while editors save, the database is stopped, started and killed
// again and again. Every save that was acknowledged is there, whole and once; of the
// others, none is there by half; and an editor who repeats gets through.
func TestAway_UnderLoad(t *testing.T) {
	t.Parallel()
	rounds := 9
	if testing.Short() {
		rounds = 3
	}
	c := testdb.NewCluster(t)
	stores := []*store.Store{open(t, c.DSN()), open(t, c.DSN())}
	if err := stores[0].Migrate(t.Context()); err != nil {
		t.Fatal(err)
	}
	const editors = 6
	done := make(chan struct{})
	var saves, refusals, unknowns, repeats atomic.Int64
	var acknowledged [editors]map[int]record.Revision // by number
	var ids [editors]record.ID
	var group sync.WaitGroup
	for editor := range editors {
		acknowledged[editor] = map[int]record.Revision{}
		group.Go(func() {
			s := stores[editor%len(stores)]
			for n := 0; ; n++ {
				f := sample(t, fmt.Sprintf("House %d of editor %d", n, editor))
				save := store.Save{Design: ids[editor], Base: n, Frozen: f, Request: fmt.Sprintf("%d-%d", editor, n)}
				for { // until it is acknowledged
					saved, err := s.SaveRevision(t.Context(), ann, save)
					if err == nil {
						if saved.Repeated {
							repeats.Add(1)
						}
						saves.Add(1)
						ids[editor] = saved.Design
						acknowledged[editor][saved.Number] = saved
						break
					}
					if !errors.Is(err, record.ErrUnavailable) {
						t.Errorf("editor %d: %v", editor, err)
						return
					}
					refusals.Add(1)
					if errors.Is(err, record.ErrUnknownOutcome) {
						unknowns.Add(1)
					}
					time.Sleep(5 * time.Millisecond)
				}
				select {
				case <-done:
					return
				default:
				}
			}
		})
	}
	chance := rand.New(rand.NewPCG(3, 4))
	pause := func() { time.Sleep(time.Duration(100+chance.IntN(200)) * time.Millisecond) }
	for round := range rounds {
		pause()
		if round%3 == 0 {
			c.Stop(t)
			pause()
			c.Start(t)
		} else {
			c.Kill(t)
			c.AwaitReady(t)
		}
	}
	pause()
	close(done)
	group.Wait()

	for editor := range editors {
		list, err := stores[0].Revisions(t.Context(), ids[editor])
		if err != nil {
			t.Fatal(err)
		}
		if len(list) != len(acknowledged[editor]) {
			t.Errorf("editor %d has %d revisions, and %d were acknowledged", editor, len(list), len(acknowledged[editor]))
		}
		for number, saved := range acknowledged[editor] {
			read, err := stores[1].Revision(t.Context(), ids[editor], number)
			if err != nil || read.Frozen.SHA256 != saved.Frozen.SHA256 || len(read.Frozen.Uses) != len(saved.Frozen.Uses) {
				t.Errorf("editor %d, revision %d: %q with %d uses, saved %q: %v", editor, number, read.Frozen.Title, len(read.Frozen.Uses), saved.Frozen.Title, err)
			}
		}
	}
	page, err := stores[0].Designs(t.Context(), record.Listing{})
	if err != nil || len(page.Designs) != editors {
		t.Errorf("%d designs of %d editors: %v", len(page.Designs), editors, err)
	}
	t.Logf("%d saves; %d times the database was away, of which %d times in the instant of a save; %d repetitions found it saved",
		saves.Load(), refusals.Load(), unknowns.Load(), repeats.Load())
	if refusals.Load() == 0 {
		t.Error("the database was never away: this tested nothing")
	}
}
