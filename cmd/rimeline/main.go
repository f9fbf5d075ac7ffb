// Command rimeline sizes the strings of rooftop photovoltaic arrays: as a service
// for browsers and programs, and on the command line.
//
// It is the only room that reads flags and the environment, and it puts the others
// together. It judges nothing itself.
package main

import (
	"context"
	"fmt"
	"io"
	"os"
	"os/signal"
	"runtime/debug"
	"syscall"
)

const usage = `Rimeline sizes the strings of rooftop photovoltaic arrays.

  rimeline [flags]        serve the pages and the HTTP interface
  rimeline size FILE      size the designs in FILE ("-" is standard input)
  rimeline version        print the version
  rimeline help           print this text

Flags of the service:

  --listen HOST:PORT      the address to serve on (127.0.0.1:8380)
  --host-name NAME        a further name by which browsers address the service;
                          may be given several times, or several names with commas
  --open-to-anyone        allow an address that other machines can reach: whoever
                          reaches it can use the service, there are no accounts
  --data DIR              where the service keeps a PostgreSQL of its own

RIMELINE_LISTEN, RIMELINE_HOST_NAMES and RIMELINE_DATA in the environment stand for
the flags. DATABASE_URL names a PostgreSQL database to save designs in. Without it the
service keeps one for itself, if the machine has PostgreSQL; sizing works without any.

size prints one result a line, in the order of the designs. A design that is refused
prints the reasons in its place, and on standard error too. Exit status: 0 all within
or caution, 1 any outside or unconfirmed, 2 any refused or unreadable.
`

// Exit statuses. Of several designs the highest counts.
const (
	exitFits    = 0 // all within or caution
	exitDoubt   = 1 // any outside or unconfirmed
	exitRefused = 2 // any refused; also a command that cannot be carried out
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	status := run(ctx, os.Args[1:], os.Getenv, os.Stdin, os.Stdout, os.Stderr)
	stop()
	os.Exit(status)
}

// run is the whole program: args are without its name, and the end of ctx stops the
// service. It returns the exit status.
func run(ctx context.Context, args []string, getenv func(string) string, stdin io.Reader, stdout, stderr io.Writer) int {
	command, rest := "", args
	if len(args) > 0 && !isFlag(args[0]) {
		command, rest = args[0], args[1:]
	}
	if command == "" && len(args) > 0 && (args[0] == "-h" || args[0] == "-help" || args[0] == "--help") {
		command, rest = "help", nil
	}
	switch command {
	case "":
		return serve(ctx, rest, getenv, stdout, stderr)
	case "size":
		return sizeFile(rest, stdin, stdout, stderr)
	case "version":
		fmt.Fprintln(stdout, "rimeline", version())
		return exitFits
	case "help":
		fmt.Fprint(stdout, usage)
		return exitFits
	}
	fmt.Fprintf(stderr, "rimeline: there is no command %q; \"rimeline help\" lists them\n", command)
	return exitRefused
}

// isFlag reports whether an argument is a flag. "-" alone is a file: standard input.
func isFlag(arg string) bool { return len(arg) > 1 && arg[0] == '-' }

// version is the version of the module that the program was built from.
func version() string {
	if info, ok := debug.ReadBuildInfo(); ok && info.Main.Version != "" {
		return info.Main.Version
	}
	return "(unknown version)"
}
