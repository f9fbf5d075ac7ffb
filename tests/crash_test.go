package tests

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"maps"
	"math/rand/v2"
	"net/http"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"rimeline/tests/testdb"
)

// savers is how many save at the same time while the service is killed.
const savers = 4

// longestLife is how long the service lives at most after the first request, in µs:
// time enough for a few saves of each saver.
const longestLife = 120_000

// keptRevisions are the revisions that one saver was told are saved, in order, by design.
type keptRevisions map[string][]savedDesign

// crash is a service that is killed and started again and again, and what savers learn.
type crash struct {
	t       *testing.T
	example object
	now     atomic.Pointer[service]
	stop    atomic.Bool
	began   atomic.Int64 // saves that were sent to the service that runs now
	unknown atomic.Int64 // saves that a kill left without an answer
	done    atomic.Int64 // of these, what turned out to be saved
}

// insist sends a save until it is acknowledged, with the same key each time.
func (c *crash) insist(status int, send func(*service) (answer, error)) (savedDesign, answer, bool) {
	var cut time.Time // when the first attempt was left without an answer
	for deadline := time.Now().Add(patience); time.Now().Before(deadline); time.Sleep(time.Millisecond) {
		s := c.now.Load()
		c.began.Add(1)
		a, err := send(s)
		switch {
		case err != nil: // killed, or not there yet
			if cut.IsZero() {
				cut = time.Now()
				c.unknown.Add(1)
			}
		case a.status == status:
			d, err := a.saved()
			if err != nil {
				c.t.Error(err)
			}
			if !cut.IsZero() && d.Updated.Before(cut) { // both times are of this machine
				c.done.Add(1)
			}
			return d, a, err == nil
		case a.asUnavailable() == "": // it has just been started
		default:
			c.t.Errorf("a save was answered %d: %s", a.status, a.body)
			return savedDesign{}, a, false
		}
	}
	c.t.Error("a save was never acknowledged")
	return savedDesign{}, answer{}, false
}

// saveOn saves new designs, each with two further revisions, until it is told to stop.
func (c *crash) saveOn(saver int) keptRevisions {
	kept := keptRevisions{}
	for n := 0; !c.stop.Load(); n++ {
		key := fmt.Sprintf("saver %d design %d", saver, n)
		first := titled(c.example, key)
		d, a, ok := c.insist(http.StatusCreated, func(s *service) (answer, error) { return s.save(key, first) })
		for further := 0; ok; further++ {
			kept[d.ID] = append(kept[d.ID], d)
			if further == 2 {
				break
			}
			id, tag, key := d.ID, a.header.Get("ETag"), fmt.Sprintf("%s again %d", key, further)
			document := titled(c.example, key)
			d, a, ok = c.insist(http.StatusOK, func(s *service) (answer, error) { return s.revise(id, tag, key, document) })
		}
		if !ok {
			break
		}
	}
	return kept
}

// TestCrash kills the service in the midst of saves, again and again. What was
// acknowledged is there, no save is half made, and a save whose outcome is not known is
// made once when it is repeated with its key.
func TestCrash(t *testing.T) {
	kills := int(howMany(200, 10, 10))
	cluster := testdb.NewCluster(t)
	c := &crash{t: t, example: usualDesign(t)}
	c.now.Store(startService(t, cluster.DSN()))
	c.now.Load().awaitReady(t, http.StatusOK)

	var kept [savers]keptRevisions
	var working sync.WaitGroup
	for saver := range savers {
		working.Go(func() { kept[saver] = c.saveOn(saver) })
	}
	chance := rand.New(rand.NewPCG(3, 200))
	var slowest time.Duration
	for range kills {
		// The first requests after a start also connect to the database, so that kills
		// soon after it meet other moments than later ones.
		for c.began.Store(0); c.began.Load() == 0 && !t.Failed(); {
			time.Sleep(100 * time.Microsecond)
		}
		time.Sleep(time.Duration(chance.IntN(longestLife)) * time.Microsecond)
		c.now.Load().kill()
		began := time.Now()
		next := startService(t, cluster.DSN())
		c.now.Store(next)
		next.awaitReady(t, http.StatusOK)
		slowest = max(slowest, time.Since(began))
		if t.Failed() {
			break
		}
	}
	c.stop.Store(true)
	working.Wait()

	all := keptRevisions{}
	for _, k := range kept {
		maps.Copy(all, k)
	}
	total := 0
	for _, revisions := range all {
		total += len(revisions)
	}
	t.Logf("%d kills, %d revisions of %d designs; %d saves were cut off, %d of them were saved already; slowest start until ready %v",
		kills, total, len(all), c.unknown.Load(), c.done.Load(), slowest)
	if c.unknown.Load() == 0 || kills >= 200 && (c.done.Load() == 0 || c.done.Load() == c.unknown.Load()) {
		t.Error("the kills did not meet saves in all the moments that this test is about")
	}
	mustBeKept(t, c.now.Load(), all)
}

// mustBeKept holds all that a service has saved against what was acknowledged: the same
// designs with the same revisions, no other, each whole.
func mustBeKept(t *testing.T, s *service, acknowledged keptRevisions) {
	t.Helper()
	listed := s.listed(t)
	for id, newest := range listed {
		if len(acknowledged[id]) != newest {
			t.Errorf("design %s is saved with %d revisions, acknowledged were %d", id, newest, len(acknowledged[id]))
		}
	}
	for id, revisions := range acknowledged {
		if _, there := listed[id]; !there {
			t.Errorf("design %s was acknowledged and is lost", id)
			continue
		}
		var list struct {
			Revisions []savedDesign `json:"revisions"`
		}
		if err := json.Unmarshal(s.get(t, "/api/v1/designs/"+id+"/revisions").body, &list); err != nil || len(list.Revisions) != len(revisions) {
			t.Errorf("design %s: the list has %d revisions, acknowledged were %d: %v", id, len(list.Revisions), len(revisions), err)
		}
		for i, said := range revisions {
			is, err := s.get(t, fmt.Sprintf("/api/v1/designs/%s/revisions/%d", id, i+1)).saved()
			if err != nil {
				t.Fatal(err)
			}
			if said.Revision != i+1 || is.SHA256 != said.SHA256 || !bytes.Equal(is.Document, said.Document) || !bytes.Equal(is.Result, said.Result) {
				t.Errorf("design %s, revision %d is not what was acknowledged as revision %d", id, i+1, said.Revision)
			}
			if sum := sha256.Sum256(is.Document); hex.EncodeToString(sum[:]) != is.SHA256 {
				t.Errorf("design %s, revision %d: the hash is not that of the document", id, i+1)
			}
			// The result is that of this very document: it is made again.
			if result, err := sizeText(is.Document); err != nil || !bytes.Equal(result, is.Result) {
				t.Errorf("design %s, revision %d: the result is not that of the document: %v", id, i+1, err)
			}
		}
	}
}
