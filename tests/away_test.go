package tests

import (
	"fmt"
	"net/http"
	"net/url"
	"slices"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"rimeline/tests/testdb"
)

// load is people and programs at work at a service whose database comes and goes.
type load struct {
	t       *testing.T
	service *service
	example object
	form    url.Values
	stop    atomic.Bool
	working sync.WaitGroup

	sized, saved, refused atomic.Int64

	mu           sync.Mutex
	slowest      time.Duration // answer of what needs no database
	acknowledged keptRevisions
}

// size sends again and again what needs no database. It must be answered, always.
func (l *load) size() {
	document := titled(l.example, "Sized")
	for !l.stop.Load() {
		for name, send := range map[string]func() (answer, error){
			"POST /api/v1/size": func() (answer, error) {
				return l.service.send("POST", "/api/v1/size", document, "application/json")
			},
			"GET /design":  func() (answer, error) { return l.service.send("GET", "/design", nil, "") },
			"POST /design": func() (answer, error) { return l.service.submit("/design", l.form) },
			"GET /healthz": func() (answer, error) { return l.service.send("GET", "/healthz", nil, "") },
		} {
			began := time.Now()
			a, err := send()
			if err != nil || a.status != http.StatusOK {
				l.t.Errorf("%s: %d %v", name, a.status, err)
			}
			l.mu.Lock()
			l.slowest = max(l.slowest, time.Since(began))
			l.mu.Unlock()
			l.sized.Add(1)
		}
	}
}

// save saves new designs. A refused one is repeated with the same key until it is saved;
// the last may stay refused when the test ends.
func (l *load) save(saver int) {
	for n := 0; !l.stop.Load(); n++ {
		key := fmt.Sprintf("saver %d design %d", saver, n)
		document := titled(l.example, key)
		for {
			a, err := l.service.save(key, document)
			if err != nil {
				l.t.Error(err)
				return
			}
			if a.status == http.StatusCreated {
				d, err := a.saved()
				if err != nil {
					l.t.Error(err)
					return
				}
				l.mu.Lock()
				l.acknowledged[d.ID] = []savedDesign{d}
				l.mu.Unlock()
				l.saved.Add(1)
				break
			}
			if wrong := a.asUnavailable(); wrong != "" {
				l.t.Error("a save while the database is away: ", wrong)
				return
			}
			l.refused.Add(1)
			time.Sleep(5 * time.Millisecond)
		}
	}
}

// more waits until each count has grown by n.
func (l *load) more(what string, n int64, counts ...*atomic.Int64) {
	l.t.Helper()
	var goals []int64
	for _, c := range counts {
		goals = append(goals, c.Load()+n)
	}
	deadline := time.Now().Add(patience)
	for i, c := range counts {
		for c.Load() < goals[i] {
			if l.t.Failed() || time.Now().After(deadline) {
				l.t.Fatalf("%s: waited in vain (sized %d, saved %d, refused %d)", what, l.sized.Load(), l.saved.Load(), l.refused.Load())
			}
			time.Sleep(time.Millisecond)
		}
	}
}

// TestDatabaseAway: under load the database is stopped, started and killed. Sizing goes
// on as if nothing happened, saves are refused with when to try again, and saving works
// again without a restart of the service; what was acknowledged is there.
func TestDatabaseAway(t *testing.T) {
	cluster := testdb.NewCluster(t)
	s := startService(t, cluster.DSN())
	s.awaitReady(t, http.StatusOK)
	example := usualDesign(t)
	l := &load{t: t, service: s, example: example, form: typed(t, titled(example, "Typed")), acknowledged: keptRevisions{}}
	end := sync.OnceFunc(func() {
		l.stop.Store(true)
		l.working.Wait()
	})
	for saver := range 3 {
		l.working.Go(func() { l.save(saver) })
	}
	for range 2 {
		l.working.Go(l.size)
	}
	defer end()
	down := false
	defer func() {
		if down {
			cluster.Start(t) // the savers can end, whatever failed
		}
	}()

	l.more("at first", 20, &l.sized, &l.saved)
	var unready, ready []time.Duration
	for range 2 {
		cluster.Stop(t)
		down = true
		unready = append(unready, s.awaitReady(t, http.StatusServiceUnavailable))
		l.more("stopped", 20, &l.sized, &l.refused)
		s.get(t, "/")
		if a, err := s.submit("/designs", l.form); err != nil || a.asUnavailable() != "" {
			t.Errorf("the form is saved while the database is away: %v %s", err, a.asUnavailable())
		}
		cluster.Start(t)
		down = false
		ready = append(ready, s.awaitReady(t, http.StatusOK))
		l.more("started again", 20, &l.sized, &l.saved)
	}
	for range 3 {
		cluster.Kill(t)
		l.more("killed", 8, &l.sized)
		cluster.AwaitReady(t)
		ready = append(ready, s.awaitReady(t, http.StatusOK))
		l.more("up after a kill", 20, &l.sized, &l.saved)
	}
	end()
	t.Logf("%d answers without the database's help, the slowest after %v; %d saves, %d refused; /readyz followed a stop after %v, a start after %v",
		l.sized.Load(), l.slowest, l.saved.Load(), l.refused.Load(), unready, ready)
	if l.slowest > 5*time.Second {
		t.Errorf("sizing took %v while the database was away", l.slowest)
	}
	if late := slices.Max(slices.Concat(unready, ready)); late > 10*time.Second {
		t.Errorf("/readyz followed after %v only", late)
	}
	mustBeKept(t, s, l.acknowledged)
}

// TestDatabaseAway_AtStart: a service that is started before its database sizes at once,
// and saves when the database has come.
func TestDatabaseAway_AtStart(t *testing.T) {
	cluster := testdb.NewCluster(t)
	cluster.Stop(t)
	s := startService(t, cluster.DSN())
	document := titled(usualDesign(t), "Before the database")
	s.must(t, http.StatusOK, "POST", "/api/v1/size", document, "application/json")
	s.get(t, "/design")
	s.awaitReady(t, http.StatusServiceUnavailable)
	if a, err := s.save("early", document); err != nil || a.asUnavailable() != "" {
		t.Errorf("a save before the database is there: %v %s", err, a.asUnavailable())
	}
	cluster.Start(t)
	s.awaitReady(t, http.StatusOK)
	d, _ := mustSave(t, s, "", "", "early", document)
	mustBeKept(t, s, keptRevisions{d.ID: {d}})
}
