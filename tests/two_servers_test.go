package tests

import (
	"bytes"
	"encoding/json"
	"fmt"
	"net/http"
	"regexp"
	"strings"
	"sync"
	"testing"

	"rimeline/tests/testdb"
)

// twoServices are two programs that were started at the same time on one empty database.
func twoServices(t *testing.T) (a, b *service) {
	t.Helper()
	dsn := testdb.New(t, nil)
	a, b = startService(t, dsn), startService(t, dsn)
	a.awaitReady(t, http.StatusOK)
	b.awaitReady(t, http.StatusOK)
	return a, b
}

// mustSave is save, or revise where id is given, for what must be saved.
func mustSave(t *testing.T, s *service, id, tag, key string, document []byte) (savedDesign, answer) {
	t.Helper()
	send := func() (answer, error) { return s.save(key, document) }
	if id != "" {
		send = func() (answer, error) { return s.revise(id, tag, key, document) }
	}
	a, err := send()
	if err != nil {
		t.Fatal(err)
	}
	d, err := a.saved()
	if err != nil {
		t.Fatal(err)
	}
	return d, a
}

// mustSubmit sends a form that is to be answered with a status.
func mustSubmit(t *testing.T, s *service, status int, path string, document []byte, hidden map[string]string) answer {
	t.Helper()
	values := typed(t, document)
	for name, value := range hidden {
		values.Set(name, value)
	}
	a, err := s.submit(path, values)
	if err != nil || a.status != status {
		t.Fatalf("POST %s: %d %s %v, want %d", path, a.status, a.body, err, status)
	}
	return a
}

// TestTwoServices: what is done at one of two services on a database is there at the
// other at once.
func TestTwoServices(t *testing.T) {
	t.Parallel()
	a, b := twoServices(t)
	example := usualDesign(t)
	first, second := titled(example, "Two services"), titled(example, "Two services, changed at the other")

	design, made := mustSave(t, a, "", "", "first", first)
	path := "/api/v1/designs/" + design.ID
	t.Run("listed and opened", func(t *testing.T) {
		if all := b.listed(t); len(all) != 1 || all[design.ID] != 1 {
			t.Errorf("the other lists %v", all)
		}
		if page := b.get(t, "/designs").body; !bytes.Contains(page, []byte("Two services")) {
			t.Error("the other's page of designs does not have it")
		}
		if got := b.get(t, path); !bytes.Equal(got.body, made.body) || got.header.Get("ETag") != made.header.Get("ETag") {
			t.Errorf("the other answers %s\nwant %s", got.body, made.body)
		}
	})
	t.Run("repeated", func(t *testing.T) {
		_, again := mustSave(t, b, "", "", "first", first)
		if again.header.Get("Idempotency-Replayed") != "true" || !bytes.Equal(again.body, made.body) {
			t.Errorf("the repetition is answered %v %s\nwant %s", again.header, again.body, made.body)
		}
		if all := a.listed(t); len(all) != 1 || all[design.ID] != 1 {
			t.Errorf("after the repetition: %v", all)
		}
	})
	t.Run("stale", func(t *testing.T) {
		changed, _ := mustSave(t, b, design.ID, made.header.Get("ETag"), "second", second)
		if changed.Revision != 2 {
			t.Fatalf("revision %d, want 2", changed.Revision)
		}
		refused, err := a.revise(design.ID, made.header.Get("ETag"), "third", titled(example, "Too late"))
		var problem struct{ Newest int }
		if err != nil || refused.status != http.StatusPreconditionFailed || json.Unmarshal(refused.body, &problem) != nil || problem.Newest != 2 {
			t.Errorf("a change of what the other changed: %d %s %v, want 412 with newest 2", refused.status, refused.body, err)
		}
		page := mustSubmit(t, a, http.StatusConflict, "/designs", titled(example, "Mine of this page"),
			map[string]string{"design": design.ID, "base": "1", "draft": "page1", "request": "page1"})
		for _, both := range []string{"Mine of this page", "changed at the other"} {
			if !bytes.Contains(page.body, []byte(both)) {
				t.Errorf("the page that refuses does not show %q", both)
			}
		}
		if !bytes.Contains(b.get(t, "/drafts/page1").body, []byte("Mine of this page")) {
			t.Error("what was refused at the one is no draft at the other")
		}
	})
	t.Run("draft", func(t *testing.T) {
		autosave := func(s *service, title, version string) answer {
			return mustSubmit(t, s, http.StatusOK, "/drafts", titled(example, title),
				map[string]string{"autosave": "yes", "draft": "shared", "draft-version": version})
		}
		kept := regexp.MustCompile(`data-draft="([^"]+)" data-version="([^"]+)"`)
		one := kept.FindSubmatch(autosave(a, "Typed here", "0").body)
		if one == nil || string(one[1]) != "shared" {
			t.Fatalf("the first is kept as %q", one)
		}
		if !bytes.Contains(b.get(t, "/drafts/shared").body, []byte("Typed here")) {
			t.Error("the other does not have the draft")
		}
		two := kept.FindSubmatch(autosave(b, "Typed there", string(one[2])).body)
		if two == nil || string(two[1]) != "shared" || bytes.Equal(two[2], one[2]) {
			t.Fatalf("the second is kept as %q after %q", two, one)
		}
		late := kept.FindSubmatch(autosave(a, "Typed here too late", string(one[2])).body)
		if late == nil || string(late[1]) == "shared" {
			t.Fatalf("a text made from an older one is kept as %q, want a draft of its own", late)
		}
		for id, text := range map[string]string{"shared": "Typed there", string(late[1]): "Typed here too late"} {
			for name, s := range map[string]*service{"one": a, "other": b} {
				if !bytes.Contains(s.get(t, "/drafts/"+id).body, []byte(text)) {
					t.Errorf("draft %s is not %q at the %s", id, text, name)
				}
			}
		}
	})
}

// TestTwoServices_AtOnce: requests to both in the same instant. The same save is made
// once; of two different ones that rest on the same revision one is made.
func TestTwoServices_AtOnce(t *testing.T) {
	t.Parallel()
	a, b := twoServices(t)
	example := usualDesign(t)
	atOnce := func(send func(s *service, name string) (answer, error)) (answers [2]answer) {
		var group sync.WaitGroup
		for i, s := range []*service{a, b} {
			group.Go(func() {
				var err error
				if answers[i], err = send(s, fmt.Sprint("service ", i)); err != nil {
					t.Error(err)
				}
			})
		}
		group.Wait()
		return answers
	}
	const rounds = 20
	for round := range rounds {
		key := fmt.Sprintf("round %d", round)
		document := titled(example, key)
		same := atOnce(func(s *service, _ string) (answer, error) { return s.save(key, document) })
		d, err := same[0].saved()
		if err != nil || same[1].status != http.StatusCreated || !bytes.Equal(same[0].body, same[1].body) {
			t.Fatalf("the same save at both: %d %s\nand %d %s\n%v", same[0].status, same[0].body, same[1].status, same[1].body, err)
		}
		tag := same[0].header.Get("ETag")
		different := atOnce(func(s *service, name string) (answer, error) {
			return s.revise(d.ID, tag, key+" at "+name, titled(example, key+" at "+name))
		})
		won, lost := different[0], different[1]
		if won.status != http.StatusOK {
			won, lost = lost, won
		}
		if won.status != http.StatusOK || lost.status != http.StatusPreconditionFailed {
			t.Fatalf("two changes of the same revision: %d %s\nand %d %s", won.status, won.body, lost.status, lost.body)
		}
		now, err := b.get(t, "/api/v1/designs/"+d.ID).saved()
		if err != nil || now.Revision != 2 || !strings.Contains(string(won.body), now.SHA256) {
			t.Errorf("the newest is not the one that was acknowledged: %+v %v", now, err)
		}
	}
	if all := a.listed(t); len(all) != rounds {
		t.Errorf("%d designs after %d saves at both", len(all), rounds)
	}
}
