package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"log/slog"
	"os"
	"sync"
	"sync/atomic"
	"time"

	"rimeline/server"
	"rimeline/server/localpg"
	"rimeline/server/record"
	"rimeline/server/store"
)

// The pause before the database is tried again is doubled each time.
const (
	firstPause = 200 * time.Millisecond
	longPause  = 5 * time.Second
)

const (
	stopPatience = 10 * time.Second // for an orderly end of the private PostgreSQL
	tidyEvery    = 6 * time.Hour
)

// keeper gets the database ready while the service already serves, and tells the
// server whether designs can be saved yet.
type keeper struct {
	given   *store.Store // in the database of DATABASE_URL; nil is a private PostgreSQL
	dataDir string       // of the private PostgreSQL, "" is the usual place
	getenv  func(string) string
	log     *slog.Logger
	stdout  io.Writer // gets where designs are saved
	stderr  io.Writer // gets why they are not

	now    atomic.Pointer[keeping]
	told   string // the last that stderr was told
	ending context.CancelFunc
	ended  sync.WaitGroup
}

// keeping is how things stand: there is a store, or a reason why not.
type keeping struct {
	store *store.Store
	why   error
}

// Saving is what [server.Config] asks for.
func (k *keeper) Saving() (server.Saving, error) {
	now := k.now.Load()
	if now.store == nil {
		return nil, now.why
	}
	return now.store, nil
}

// start begins to get the database ready, and returns at once.
func (k *keeper) start() {
	ctx, cancel := context.WithCancel(context.Background())
	k.ending = cancel
	k.now.Store(&keeping{why: server.ErrStarting})
	k.ended.Go(func() {
		if k.given != nil {
			k.keepIn(ctx, k.given, "the database of DATABASE_URL")
			return
		}
		k.keepPrivately(ctx)
	})
}

// stop ends what start began, once the last request has been answered.
func (k *keeper) stop() {
	k.ending()
	k.ended.Wait()
}

// keepPrivately keeps designs in a PostgreSQL of our own until ctx ends.
func (k *keeper) keepPrivately(ctx context.Context) {
	if k.dataDir == "" {
		var err error
		if k.dataDir, err = localpg.DefaultDir(os.Getuid(), k.getenv); err != nil {
			k.tell(fmt.Sprintf("Nothing is saved: %v.\nChoose a directory with --data DIR, or a database with DATABASE_URL.", err))
			k.now.Store(&keeping{why: server.ErrNothingSaved})
			return
		}
	}
	var pg *localpg.Server
	err := k.untilDone(ctx, func() (err error) {
		pg, err = localpg.Start(ctx, localpg.Options{Dir: k.dataDir, Getenv: k.getenv, Log: k.log})
		return err
	})
	if err != nil {
		return
	}
	defer func() {
		ctx, cancel := context.WithTimeout(context.Background(), stopPatience)
		defer cancel()
		if err := pg.Stop(ctx); err != nil {
			k.log.Error("the private PostgreSQL did not stop as it should", "err", err)
		}
	}()
	db, err := store.Open(ctx, pg.DSN(), k.log)
	if err != nil {
		k.tell(fmt.Sprintf("Nothing is saved: %v", err))
		k.now.Store(&keeping{why: server.ErrUnfit})
		<-ctx.Done()
		return
	}
	k.keepIn(ctx, db, k.dataDir)
}

// keepIn brings a database to the newest migration and saves in it until ctx ends. It
// owns db.
func (k *keeper) keepIn(ctx context.Context, db *store.Store, where string) {
	defer db.Close()
	if err := k.untilDone(ctx, func() error { return db.Migrate(ctx) }); err != nil {
		return
	}
	k.now.Store(&keeping{store: db})
	fmt.Fprintln(k.stdout, "Designs are saved in", where)
	tick := time.NewTicker(tidyEvery)
	defer tick.Stop()
	for {
		if err := db.Tidy(ctx); err != nil && ctx.Err() == nil {
			k.log.Warn("old request keys could not be forgotten; that is tried again", "err", err)
		}
		select {
		case <-ctx.Done():
			return
		case <-tick.C:
		}
	}
}

// untilDone tries a step until it is done, and tells why it is not. It gives up where
// trying again is of no use, and when ctx ends.
func (k *keeper) untilDone(ctx context.Context, step func() error) error {
	for pause := firstPause; ; pause = min(2*pause, longPause) {
		err := step()
		if err == nil || ctx.Err() != nil {
			return err
		}
		if errors.Is(err, localpg.ErrNoPostgres) {
			k.tell(err.Error())
			k.now.Store(&keeping{why: server.ErrNothingSaved})
			return err
		}
		k.tell(fmt.Sprintf("Nothing is saved for now: %v.\nSizing goes on. Saving begins by itself as soon as that is mended.", err))
		why := fmt.Errorf("%w: %w", server.ErrUnfit, err)
		if errors.Is(err, record.ErrUnavailable) || errors.Is(err, localpg.ErrInUse) {
			why = fmt.Errorf("%w: %w", record.ErrUnavailable, err)
		}
		k.now.Store(&keeping{why: why})
		select {
		case <-ctx.Done():
			return ctx.Err()
		case <-time.After(pause):
		}
	}
}

// tell says something to whoever started the service, once.
func (k *keeper) tell(text string) {
	if text != k.told {
		fmt.Fprintln(k.stderr, text)
		k.told = text
	}
}

// together lets several goroutines write lines to one writer.
type together struct {
	mu sync.Mutex
	to io.Writer
}

func (t *together) Write(b []byte) (int, error) {
	t.mu.Lock()
	defer t.mu.Unlock()
	return t.to.Write(b)
}
