// Command load measures the service under load, beside a bare handler and beside pgbench
// on the same machine in the same minutes, and prints ratios, which hold on other
// machines where times do not. It needs wrk and PostgreSQL. From the top of the tree:
// go run ./tests/load
//
// It is no test: it fails where something answers wrongly, not where it is slow.
package main

import (
	"bufio"
	"bytes"
	"context"
	"flag"
	"fmt"
	"io"
	"net"
	"net/http"
	"os"
	"os/exec"
	"os/signal"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"text/tabwriter"
	"time"

	"rimeline/server/localpg"
	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/sizing/design"
	"rimeline/tests/seed"
)

var (
	rounds   = flag.Int("rounds", 5, "how often each measurement is made; the median counts")
	duration = flag.Duration("duration", 4*time.Second, "how long one measurement takes")
	designIn = flag.String("design", "sizing/design/testdata/example-design.json", "the design that is posted")
	only     = flag.String("only", "", "measure only what has this in its name")
	bare     = flag.String("bare", "", "be the bare handler: answer with the content of this file (the program starts itself so)")
)

func main() {
	flag.Parse()
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
	defer stop()
	var err error
	if *bare != "" {
		err = serveBare(ctx, *bare)
	} else {
		err = measure(ctx)
	}
	if err != nil {
		fmt.Fprintln(os.Stderr, "load:", err)
		stop()
		os.Exit(1)
	}
}

// serveBare is what the service is compared with: it reads a request's body and
// sends bytes that are ready.
func serveBare(ctx context.Context, file string) error {
	answer, err := os.ReadFile(file)
	if err != nil {
		return err
	}
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		return err
	}
	context.AfterFunc(ctx, func() { l.Close() })
	fmt.Printf("at http://%s/\n", l.Addr())
	return http.Serve(l, http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		if _, err := io.ReadAll(r.Body); err != nil {
			return
		}
		w.Header().Set("Content-Type", "application/json")
		w.Header().Set("Content-Length", strconv.Itoa(len(answer)))
		_, _ = w.Write(answer)
	}))
}

// start runs a program that prints its address and returns that: "http://127.0.0.1:1".
// env is added to its environment.
func (b *bench) start(ctx context.Context, env []string, name string, args ...string) (string, error) {
	cmd := exec.CommandContext(ctx, name, args...)
	cmd.Env = append(os.Environ(), env...)
	cmd.Cancel = func() error { return cmd.Process.Signal(os.Interrupt) }
	out, err := cmd.StdoutPipe()
	if err != nil {
		return "", err
	}
	if err := cmd.Start(); err != nil {
		return "", err
	}
	b.started = append(b.started, cmd)
	lines := bufio.NewReader(out)
	printed, err := lines.ReadString('\n')
	if err != nil {
		return "", fmt.Errorf("%s printed no address: %w", name, err)
	}
	go io.Copy(io.Discard, lines)
	_, address, _ := strings.Cut(printed, "http://")
	address, _, _ = strings.Cut(address, "/")
	return "http://" + address, nil
}

// bench is what is measured and what it is compared with.
type bench struct {
	dir     string
	text    []byte        // the design that is posted
	frozen  record.Frozen // and saved
	dsn     string        // of the database, which holds many designs
	pgbench string        // the program
	store   *store.Store
	service string    // its address, with that database
	saved   record.ID // a design that holds frozen

	database *localpg.Server
	started  []*exec.Cmd
}

// stop ends what was started, the database last.
func (b *bench) stop() {
	for _, cmd := range b.started {
		_ = cmd.Process.Signal(os.Interrupt) // an error is that it has ended already, as with Ctrl-C
		_ = cmd.Wait()
	}
	if b.database != nil {
		if err := b.database.Stop(context.Background()); err != nil {
			fmt.Fprintln(os.Stderr, "load:", err)
		}
	}
}

// designs is how many designs the database holds.
const designs = 20_000

// clients is how many ask at the same time.
const clients = 16

// figures is what was found of something that was done again and again.
type figures struct {
	perSecond float64
	p50, p99  time.Duration
}

// comparison is something that is done beside what it is compared with.
type comparison struct {
	name, beside string
	goal         float64 // of the ratio; 0 is none
	plain, ours  func(context.Context) (figures, error)
}

func measure(ctx context.Context) error {
	dir, err := os.MkdirTemp("", "rimeline-load")
	if err != nil {
		return err
	}
	defer os.RemoveAll(dir)
	b := &bench{dir: dir}
	defer b.stop()
	if err := b.prepare(ctx); err != nil {
		return err
	}
	comparisons, err := b.pages(ctx)
	if err != nil {
		return err
	}
	further, err := b.saving()
	if err != nil {
		return err
	}
	fmt.Printf("%d clients, %d designs, a design of %d bytes with a result of %d, medians of %d rounds of %v\n\n",
		clients, designs, len(b.frozen.Document), len(b.frozen.Result), *rounds, *duration)
	table := tabwriter.NewWriter(os.Stdout, 0, 0, 2, ' ', 0)
	fmt.Fprintln(table, "what\tper second\tbeside\tper second\tratio\tfrom\tto\tgoal\tp99\tits goal")
	for _, c := range append(comparisons, further...) {
		if !strings.Contains(c.name, *only) {
			continue
		}
		fmt.Fprintf(os.Stderr, "measuring %s\n", c.name)
		var plains, ours, ratios, p99s []float64
		for range *rounds {
			p, err := c.plain(ctx)
			if err != nil {
				return fmt.Errorf("beside %s: %w", c.name, err)
			}
			o, err := c.ours(ctx)
			if err != nil {
				return fmt.Errorf("%s: %w", c.name, err)
			}
			plains, ours = append(plains, p.perSecond), append(ours, o.perSecond)
			ratios, p99s = append(ratios, o.perSecond/p.perSecond), append(p99s, o.p99.Seconds()*1000)
		}
		goal := "-"
		if c.goal > 0 {
			goal = fmt.Sprintf("%.2f", c.goal)
		}
		fmt.Fprintf(table, "%s\t%.0f\t%s\t%.0f\t%.3f\t%.3f\t%.3f\t%s\t%.1f ms\t60 ms\n", c.name, median(ours), c.beside, median(plains),
			median(ratios), slices.Min(ratios), slices.Max(ratios), goal, median(p99s))
	}
	if err := table.Flush(); err != nil {
		return err
	}

	fmt.Println("\none page after another, 1 connection; goal: p50 of the Design page 5 ms or less")
	for _, path := range []string{"/", "/design", "/example"} {
		var p50s []float64
		for range *rounds {
			p, err := wrk(ctx, 1, b.service+path, "")
			if err != nil {
				return err
			}
			p50s = append(p50s, p.p50.Seconds()*1000)
		}
		fmt.Printf("  GET %-10s p50 %6.2f ms\n", path, median(p50s))
	}
	return nil
}

// prepare builds the service and starts it on a database of its own with many designs.
func (b *bench) prepare(ctx context.Context) (err error) {
	if _, err := exec.LookPath("wrk"); err != nil {
		return fmt.Errorf("wrk is needed (Debian: apt-get install wrk): %w", err)
	}
	if b.text, err = os.ReadFile(*designIn); err != nil {
		return fmt.Errorf("%w (run this from the top of the tree)", err)
	}
	doc := design.Read(b.text)
	if doc.Design == nil {
		return fmt.Errorf("the design is refused: %v", doc.Faults)
	}
	b.frozen = record.Freeze(doc.Design, "load")
	if b.pgbench, err = findPgbench(); err != nil {
		return err
	}
	program := filepath.Join(b.dir, "rimeline")
	if out, err := exec.CommandContext(ctx, "go", "build", "-o", program, "./cmd/rimeline").CombinedOutput(); err != nil {
		return fmt.Errorf("go build: %w\n%s", err, out)
	}
	if err := os.Chmod(b.dir, 0o711); err != nil { // PostgreSQL's own user goes through it
		return err
	}
	b.database, err = localpg.Start(ctx, localpg.Options{Dir: filepath.Join(b.dir, "pg"), Getenv: os.Getenv})
	if err != nil {
		return err
	}
	b.dsn = b.database.DSN()
	if b.store, err = store.Open(ctx, b.dsn, nil); err != nil {
		return err
	}
	if err := b.store.Migrate(ctx); err != nil {
		return err
	}
	short := b.frozen
	short.Result = []byte("{}") // lists do not look at it
	if err := seed.Designs(ctx, b.dsn, designs, short); err != nil {
		return err
	}
	first, err := b.store.SaveRevision(ctx, loader, store.Save{Frozen: b.frozen})
	if err != nil {
		return err
	}
	b.saved = first.Design
	if b.service, err = b.start(ctx, []string{"DATABASE_URL=" + b.dsn}, program, "--listen", "127.0.0.1:0"); err != nil {
		return err
	}
	return b.awaitReady(ctx)
}

// awaitReady waits until the service can save.
func (b *bench) awaitReady(ctx context.Context) (err error) {
	for range 500 {
		if _, err = ask(ctx, http.MethodGet, b.service+"/readyz", nil); err == nil {
			return nil
		}
		time.Sleep(20 * time.Millisecond)
	}
	return err
}

// pages are what the service answers beside a handler that sends the same bytes, which
// are ready.
func (b *bench) pages(ctx context.Context) ([]comparison, error) {
	self, err := os.Executable()
	if err != nil {
		return nil, err
	}
	script := filepath.Join(b.dir, "post.lua")
	lua := fmt.Sprintf("wrk.method = \"POST\"\nwrk.headers[\"Content-Type\"] = \"application/json\"\nwrk.body = [==[%s]==]\n", b.text)
	if err := os.WriteFile(script, []byte(lua), 0o600); err != nil {
		return nil, err
	}
	var comparisons []comparison
	for i, c := range []struct {
		name, path string
		body       []byte
		goal       float64
	}{
		{"POST /api/v1/size", "/api/v1/size", b.text, 0.25},
		{"GET /design", "/design", nil, 0.15},
		{"GET /example", "/example", nil, 0.15},
		{"GET /designs/{id}", "/designs/" + string(b.saved), nil, 0.15},
	} {
		method, script := http.MethodGet, ""
		if c.body != nil {
			method, script = http.MethodPost, filepath.Join(b.dir, "post.lua")
		}
		answer, err := ask(ctx, method, b.service+c.path, c.body)
		if err != nil {
			return nil, err
		}
		file := filepath.Join(b.dir, fmt.Sprint("answer ", i))
		if err := os.WriteFile(file, answer, 0o600); err != nil {
			return nil, err
		}
		bare, err := b.start(ctx, nil, self, "-bare", file)
		if err != nil {
			return nil, err
		}
		comparisons = append(comparisons, comparison{
			fmt.Sprintf("%s (%d bytes)", c.name, len(answer)), "bare handler", c.goal,
			func(ctx context.Context) (figures, error) { return wrk(ctx, clients, bare+"/", script) },
			func(ctx context.Context) (figures, error) { return wrk(ctx, clients, b.service+c.path, script) },
		})
	}
	return comparisons, nil
}

// ask sends a request that is answered with 200, and returns the body.
func ask(ctx context.Context, method, url string, body []byte) ([]byte, error) {
	req, err := http.NewRequestWithContext(ctx, method, url, bytes.NewReader(body))
	if err != nil {
		return nil, err
	}
	resp, err := http.DefaultClient.Do(req)
	if err != nil {
		return nil, err
	}
	defer resp.Body.Close()
	answer, err := io.ReadAll(resp.Body)
	if err == nil && resp.StatusCode != http.StatusOK {
		err = fmt.Errorf("%s %s: %s: %s", method, url, resp.Status, answer)
	}
	return answer, err
}

var (
	perSecondLine = regexp.MustCompile(`Requests/sec:\s+([0-9.]+)`)
	p50Line       = regexp.MustCompile(`\n\s+50%\s+([0-9.]+(?:us|ms|s))`)
	p99Line       = regexp.MustCompile(`\n\s+99%\s+([0-9.]+(?:us|ms|s))`)
	badLine       = regexp.MustCompile(`(?:Non-2xx|Socket errors).*`)
)

func wrk(ctx context.Context, connections int, url, script string) (figures, error) {
	args := []string{"--latency", "-t1", "-c" + strconv.Itoa(connections), "-d" + strconv.Itoa(int(duration.Seconds())) + "s"}
	if script != "" {
		args = append(args, "-s", script)
	}
	out, err := exec.CommandContext(ctx, "wrk", append(args, url)...).CombinedOutput()
	if err != nil {
		return figures{}, fmt.Errorf("wrk %s: %w\n%s", url, err, out)
	}
	if bad := badLine.Find(out); bad != nil {
		return figures{}, fmt.Errorf("wrk %s: %s", url, bad)
	}
	rate, p50, p99 := perSecondLine.FindSubmatch(out), p50Line.FindSubmatch(out), p99Line.FindSubmatch(out)
	if rate == nil || p50 == nil || p99 == nil {
		return figures{}, fmt.Errorf("wrk %s: its figures were not found in\n%s", url, out)
	}
	var f figures
	if f.perSecond, err = strconv.ParseFloat(string(rate[1]), 64); err != nil {
		return f, err
	}
	if f.p50, err = time.ParseDuration(string(p50[1])); err != nil {
		return f, err
	}
	f.p99, err = time.ParseDuration(string(p99[1]))
	return f, err
}

func median(of []float64) float64 {
	sorted := slices.Sorted(slices.Values(of))
	return sorted[len(sorted)/2]
}
