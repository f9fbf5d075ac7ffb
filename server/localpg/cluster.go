//go:build unix

package localpg

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"os/exec"
	"strings"
	"syscall"
)

// makeCluster makes the data. They get their name when they are complete, so that a
// start that is interrupted, even by a loss of power, leaves nothing half made.
func (s *Server) makeCluster(ctx context.Context) error {
	s.log.Info("the private PostgreSQL is made", "directory", s.place.dir, "version", s.bin.version)
	if err := s.place.removeUnfinished(); err != nil {
		return err
	}
	// Of a directory this removes an empty one only.
	if err := os.Remove(s.place.data); err != nil && !errors.Is(err, fs.ErrNotExist) {
		return fmt.Errorf("%s is in the way and not what PostgreSQL makes: %w", s.place.data, err)
	}
	dir, err := os.MkdirTemp(s.place.dir, newPrefix+"*")
	if err != nil {
		return err
	}
	if err := s.user.own(dir); err != nil {
		return errors.Join(err, os.Remove(dir))
	}
	if err := s.initdb(ctx, dir); err != nil {
		return errors.Join(err, os.RemoveAll(dir))
	}
	if err := os.Rename(dir, s.place.data); err != nil {
		return errors.Join(err, os.RemoveAll(dir))
	}
	return syncDir(s.place.dir)
}

func (s *Server) initdb(ctx context.Context, dir string) error {
	args := []string{
		"-D", dir, "-U", superuser, "--auth-local=peer", "--auth-host=reject",
		// The plain locale is on every machine and never changes; who shows sorted
		// lists to people names a collation.
		"--encoding=UTF8", "--locale=C", "--data-checksums", "--no-instructions",
	}
	if s.opts.UnsafeForTests {
		args = append(args, "--no-sync")
	}
	cmd := exec.CommandContext(ctx, s.bin.initdb(), args...)
	cmd.Dir = dir
	cmd.Env = environment(s.opts.Getenv)
	cmd.SysProcAttr = &syscall.SysProcAttr{Setpgid: true, Credential: s.user.credential()}
	dieWithUs(cmd.SysProcAttr, syscall.SIGKILL)
	var said bytes.Buffer
	cmd.Stdout, cmd.Stderr = &said, &said
	p, err := startTied(cmd)
	if err != nil {
		return err
	}
	<-p.ended
	if ctx.Err() != nil {
		return fmt.Errorf("the private PostgreSQL was not made in time: %w", context.Cause(ctx))
	}
	if p.err != nil {
		return fmt.Errorf("the private PostgreSQL cannot be made: %w: %s", p.err, strings.TrimSpace(said.String()))
	}
	return nil
}

// syncDir makes the names in a directory last through a loss of power.
func syncDir(dir string) error {
	d, err := os.Open(dir)
	if err != nil {
		return err
	}
	return errors.Join(d.Sync(), d.Close())
}
