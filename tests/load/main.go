// Command load measures the service under load, beside a bare handler on the same
// machine in the same minutes, and prints ratios, which hold on other machines where
// times do not. It needs wrk. From the top of the tree: go run ./tests/load
//
// It is no test: it fails where something answers wrongly, not where it is slow.
package main

import (
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
	"time"
)

var (
	rounds   = flag.Int("rounds", 5, "how often each measurement is made; the median counts")
	duration = flag.Duration("duration", 4*time.Second, "how long one measurement takes")
	designIn = flag.String("design", "sizing/design/testdata/example-design.json", "the design that is posted")
	only     = flag.String("only", "", "measure this alone: pages or store; both if empty")
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
func start(ctx context.Context, name string, args ...string) (string, error) {
	cmd := exec.CommandContext(ctx, name, args...)
	cmd.Cancel = func() error { return cmd.Process.Signal(os.Interrupt) }
	out, err := cmd.StdoutPipe()
	if err != nil {
		return "", err
	}
	if err := cmd.Start(); err != nil {
		return "", err
	}
	printed := make([]byte, 200)
	n, err := out.Read(printed)
	if err != nil {
		return "", fmt.Errorf("%s printed no address: %w", name, err)
	}
	_, address, _ := strings.Cut(string(printed[:n]), "http://")
	address, _, _ = strings.Cut(address, "/")
	return "http://" + address, nil
}

func measure(ctx context.Context) error {
	dir, err := os.MkdirTemp("", "rimeline-load")
	if err != nil {
		return err
	}
	defer os.RemoveAll(dir)
	design, err := os.ReadFile(*designIn)
	if err != nil {
		return fmt.Errorf("%w (run this from the top of the tree)", err)
	}
	if *only != "store" {
		if err := measurePages(ctx, dir, design); err != nil {
			return err
		}
	}
	if *only != "pages" {
		return measureStore(ctx, dir, design)
	}
	return nil
}

// measurePages compares the service with a handler that only sends bytes.
func measurePages(ctx context.Context, dir string, design []byte) error {
	if _, err := exec.LookPath("wrk"); err != nil {
		return fmt.Errorf("wrk is needed (Debian: apt-get install wrk): %w", err)
	}
	program := filepath.Join(dir, "rimeline")
	if out, err := exec.CommandContext(ctx, "go", "build", "-o", program, "./cmd/rimeline").CombinedOutput(); err != nil {
		return fmt.Errorf("go build: %w\n%s", err, out)
	}
	service, err := start(ctx, program, "--listen", "127.0.0.1:0")
	if err != nil {
		return err
	}
	answer, err := post(ctx, service+"/api/v1/size", design)
	if err != nil {
		return err
	}
	answerFile := filepath.Join(dir, "answer.json")
	if err := os.WriteFile(answerFile, answer, 0o600); err != nil {
		return err
	}
	self, err := os.Executable()
	if err != nil {
		return err
	}
	plain, err := start(ctx, self, "-bare", answerFile)
	if err != nil {
		return err
	}
	script := filepath.Join(dir, "post.lua")
	lua := fmt.Sprintf("wrk.method = \"POST\"\nwrk.headers[\"Content-Type\"] = \"application/json\"\nwrk.body = [==[%s]==]\n", design)
	if err := os.WriteFile(script, []byte(lua), 0o600); err != nil {
		return err
	}

	fmt.Printf("POST of %d bytes, answer of %d bytes, 16 connections\n", len(design), len(answer))
	var ratios []float64
	for range *rounds {
		b, err := wrk(ctx, 16, plain+"/", script)
		if err != nil {
			return err
		}
		s, err := wrk(ctx, 16, service+"/api/v1/size", script)
		if err != nil {
			return err
		}
		fmt.Printf("  bare %8.0f/s   POST /api/v1/size %8.0f/s   ratio %.3f\n", b.perSecond, s.perSecond, s.perSecond/b.perSecond)
		ratios = append(ratios, s.perSecond/b.perSecond)
	}
	fmt.Printf("requests per second, to a bare handler: %.3f (goal: 0.25 or more)\n\n", median(ratios))

	fmt.Println("one page after another, 1 connection")
	for _, path := range []string{"/", "/design", "/example"} {
		var p50s []float64
		for range *rounds {
			p, err := wrk(ctx, 1, service+path, "")
			if err != nil {
				return err
			}
			p50s = append(p50s, p.p50.Seconds()*1000)
		}
		fmt.Printf("  GET %-10s p50 %6.2f ms\n", path, median(p50s))
	}
	fmt.Println("goal: p50 of the Design page 5 ms or less")
	return nil
}

func post(ctx context.Context, url string, body []byte) ([]byte, error) {
	req, err := http.NewRequestWithContext(ctx, http.MethodPost, url, bytes.NewReader(body))
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
		err = fmt.Errorf("POST %s: %s: %s", url, resp.Status, answer)
	}
	return answer, err
}

// figures is what wrk found.
type figures struct {
	perSecond float64
	p50       time.Duration
}

var (
	perSecondLine = regexp.MustCompile(`Requests/sec:\s+([0-9.]+)`)
	p50Line       = regexp.MustCompile(`\n\s+50%\s+([0-9.]+(?:us|ms|s))`)
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
	rate, p50 := perSecondLine.FindSubmatch(out), p50Line.FindSubmatch(out)
	if rate == nil || p50 == nil {
		return figures{}, fmt.Errorf("wrk %s: its figures were not found in\n%s", url, out)
	}
	var f figures
	if f.perSecond, err = strconv.ParseFloat(string(rate[1]), 64); err != nil {
		return f, err
	}
	f.p50, err = time.ParseDuration(string(p50[1]))
	return f, err
}

func median(of []float64) float64 {
	sorted := slices.Sorted(slices.Values(of))
	return sorted[len(sorted)/2]
}
