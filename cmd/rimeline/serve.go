package main

import (
	"cmp"
	"context"
	"errors"
	"flag"
	"fmt"
	"io"
	"log/slog"
	"net"
	"net/netip"
	"runtime/debug"
	"strings"
	"syscall"

	"rimeline/server"
	"rimeline/server/store"
)

const defaultListen = "127.0.0.1:8380"

// serveOptions is what the flags and the environment say about the service.
type serveOptions struct {
	listen       string
	hostNames    []string
	openToAnyone bool
	databaseURL  string
	dataDir      string
}

func parseServeOptions(args []string, getenv func(string) string) (serveOptions, error) {
	o := serveOptions{
		listen:      cmp.Or(getenv("RIMELINE_LISTEN"), defaultListen),
		hostNames:   names(getenv("RIMELINE_HOST_NAMES")),
		databaseURL: getenv("DATABASE_URL"),
		dataDir:     getenv("RIMELINE_DATA"),
	}
	flags := flag.NewFlagSet("rimeline", flag.ContinueOnError)
	flags.SetOutput(io.Discard) // the caller prints what is wrong, once
	flags.StringVar(&o.listen, "listen", o.listen, "")
	flags.StringVar(&o.dataDir, "data", o.dataDir, "")
	flags.BoolVar(&o.openToAnyone, "open-to-anyone", false, "")
	flags.Func("host-name", "", func(list string) error {
		added := names(list)
		if len(added) == 0 {
			return errors.New("a name is needed")
		}
		o.hostNames = append(o.hostNames, added...)
		return nil
	})
	if err := flags.Parse(args); err != nil {
		return o, err
	}
	if flags.NArg() > 0 {
		return o, fmt.Errorf("%q is neither a flag nor, in this place, a command", flags.Arg(0))
	}
	for _, name := range o.hostNames {
		if strings.ContainsAny(name, ":/ ") {
			return o, fmt.Errorf("host name %q: only the name is wanted, without scheme, port and path", name)
		}
	}
	return o, nil
}

// names splits a list with commas.
func names(list string) []string {
	var found []string
	for name := range strings.SplitSeq(list, ",") {
		if name = strings.TrimSpace(name); name != "" {
			found = append(found, name)
		}
	}
	return found
}

// onlyLoopback reports whether an address to listen on can be reached from this
// machine alone. A name other than localhost counts as open: what it means can change.
func onlyLoopback(listen string) (bool, error) {
	host, _, err := net.SplitHostPort(listen)
	if err != nil {
		return false, fmt.Errorf("--listen %q: an address is host:port, such as %s", listen, defaultListen)
	}
	if addr, err := netip.ParseAddr(host); err == nil {
		return addr.Unmap().IsLoopback(), nil
	}
	return strings.EqualFold(host, "localhost"), nil
}

// whereItIs is the line that tells where to find the service.
func whereItIs(listening net.Addr) string {
	if addr, err := netip.ParseAddrPort(listening.String()); err == nil && addr.Addr().IsUnspecified() {
		return fmt.Sprintf("Rimeline is at http://localhost:%d/ and at every other address of this machine", addr.Port())
	}
	return fmt.Sprintf("Rimeline is at http://%s/", listening)
}

// serve runs the service until ctx ends.
func serve(ctx context.Context, args []string, getenv func(string) string, stdout, stderr io.Writer) int {
	o, err := parseServeOptions(args, getenv)
	if err != nil {
		fmt.Fprintf(stderr, "rimeline: %v\n\"rimeline help\" lists the flags\n", err)
		return exitRefused
	}
	loopback, err := onlyLoopback(o.listen)
	if err != nil {
		fmt.Fprintln(stderr, "rimeline:", err)
		return exitRefused
	}
	if !loopback && !o.openToAnyone {
		fmt.Fprintf(stderr, "rimeline: not started. Other machines can reach %s, and there are no accounts yet: "+
			"whoever reaches it could use the service, and what is typed would cross the network unencrypted.\n"+
			"If that is wanted, add --open-to-anyone; if not, leave --listen away to serve this machine only.\n", o.listen)
		return exitRefused
	}
	out, errs := &together{to: stdout}, &together{to: stderr}
	log := slog.New(slog.NewTextHandler(errs, nil))
	k := &keeper{dataDir: o.dataDir, getenv: getenv, log: log, stdout: out, stderr: errs}
	if o.databaseURL != "" {
		if k.given, err = store.Open(ctx, o.databaseURL, log); err != nil {
			fmt.Fprintf(stderr, "rimeline: not started: DATABASE_URL: %v\n", err)
			return exitRefused
		}
	}
	listener, err := net.Listen("tcp", o.listen)
	if err != nil {
		fmt.Fprintln(stderr, "rimeline:", err)
		if errors.Is(err, syscall.EADDRINUSE) {
			fmt.Fprintln(stderr, "Another program, perhaps another Rimeline, has this port; choose one with --listen host:port.")
		}
		return exitRefused
	}
	if getenv("GOGC") == "" {
		// Little lives between requests, so at Go's default of 100 the collector
		// would run at every tenth design. This takes a quarter and more off the work
		// of each, and costs some tens of megabytes.
		debug.SetGCPercent(800)
	}
	fmt.Fprintln(out, whereItIs(listener.Addr()))
	k.start()
	defer k.stop()
	s := server.New(server.Config{
		Log:        log,
		HostNames:  o.hostNames,
		AnyAddress: !loopback,
		Version:    version(),
		Saving:     k.Saving,
	})
	if err := s.Serve(ctx, listener); err != nil {
		fmt.Fprintln(errs, "rimeline: stopped:", err)
		return exitRefused
	}
	return exitFits
}
