package main

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"io"
	"net"
	"net/http"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"testing/iotest"
)

// outcome is what a run of the program left.
type outcome struct {
	status         int
	stdout, stderr string
}

func runWith(t *testing.T, stdin io.Reader, args ...string) outcome {
	t.Helper()
	var stdout, stderr bytes.Buffer
	status := run(t.Context(), args, func(string) string { return "" }, stdin, &stdout, &stderr)
	return outcome{status, stdout.String(), stderr.String()}
}

// example is the design of the format page. All of it is within or caution.
func example(t *testing.T) string {
	t.Helper()
	text, err := os.ReadFile("../../sizing/design/testdata/example-design.json")
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// edited returns the example with a change to its JSON object.
func edited(t *testing.T, change func(d map[string]any)) string {
	t.Helper()
	var d map[string]any
	dec := json.NewDecoder(strings.NewReader(example(t)))
	dec.UseNumber()
	if err := dec.Decode(&d); err != nil {
		t.Fatal(err)
	}
	change(d)
	text, err := json.Marshal(d)
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// lines decodes each line of an output.
func lines(t *testing.T, output string) []map[string]any {
	t.Helper()
	var found []map[string]any
	for line := range strings.Lines(output) {
		if !strings.HasSuffix(line, "\n") {
			t.Errorf("the output ends without a line end: %q", line)
		}
		var one map[string]any
		if err := json.Unmarshal([]byte(line), &one); err != nil {
			t.Fatalf("a line is not JSON: %v: %s", err, line)
		}
		found = append(found, one)
	}
	return found
}

func TestSize(t *testing.T) {
	fits := example(t)
	tooLong := edited(t, func(d map[string]any) {
		d["strings"].([]any)[0].(map[string]any)["modules_in_series"] = 90
	})
	unwired := edited(t, func(d map[string]any) { delete(d, "strings") })
	refused := edited(t, func(d map[string]any) { delete(d, "rulebook") })
	const (
		result  = "rimeline-result/1"
		refusal = "rimeline-refusal/1"
	)
	for _, c := range []struct {
		name   string
		input  string
		status int
		lines  []string // the format of each
	}{
		{"all within or caution", fits, 0, []string{result}},
		{"a limit is broken", tooLong, 1, []string{result}},
		{"nothing strung is not confirmed", unwired, 1, []string{result}},
		{"refused", refused, 2, []string{refusal}},
		{"two documents", fits + "\n" + fits, 0, []string{result, result}},
		{"with record separators", "\x1e" + fits + "\n\x1e" + fits + "\n", 0, []string{result, result}},
		{"the highest status counts, wherever it stands", tooLong + refused + "\n" + fits, 2, nil},
		{"a refused one keeps its place", fits + "\n" + refused + "\n" + tooLong, 2, []string{result, refusal, result}},
		{"after malformed JSON nothing is read", fits + "\n{\"format\": \n" + fits, 2, []string{result, refusal}},
		{"empty input", "", 2, []string{refusal}},
		{"only white space", " \n", 2, []string{refusal}},
	} {
		t.Run(c.name, func(t *testing.T) {
			got := runWith(t, strings.NewReader(c.input), "size", "-")
			if got.status != c.status {
				t.Errorf("status %d, want %d; stderr: %s", got.status, c.status, got.stderr)
			}
			found := lines(t, got.stdout)
			if c.lines != nil && len(found) != len(c.lines) {
				t.Fatalf("%d lines, want %d:\n%s", len(found), len(c.lines), got.stdout)
			}
			var refusals []string
			for i, line := range found {
				if c.lines != nil && line["format"] != c.lines[i] {
					t.Errorf("line %d has format %v, want %v", i+1, line["format"], c.lines[i])
				}
				if line["format"] != refusal {
					continue
				}
				if line["document"] != float64(i+1) {
					t.Errorf("line %d is the refusal of document %v", i+1, line["document"])
				}
				if errors, ok := line["errors"].([]any); !ok || len(errors) == 0 {
					t.Errorf("line %d is a refusal without reasons", i+1)
				}
				refusals = append(refusals, strings.SplitAfter(got.stdout, "\n")[i])
			}
			if want := strings.Join(refusals, ""); got.stderr != want {
				t.Errorf("standard error is\n%s\nwant the refusals as on standard output:\n%s", got.stderr, want)
			}
		})
	}
}

func TestSize_FileAndStandardInputAlike(t *testing.T) {
	file := filepath.Join(t.TempDir(), "design.json")
	if err := os.WriteFile(file, []byte(example(t)), 0o644); err != nil {
		t.Fatal(err)
	}
	fromFile, fromStdin := runWith(t, nil, "size", file), runWith(t, strings.NewReader(example(t)), "size", "-")
	if fromFile != fromStdin {
		t.Errorf("from a file %+v, from standard input %+v", fromFile, fromStdin)
	}
	if again := runWith(t, nil, "size", file); again != fromFile {
		t.Error("a second run printed something else")
	}
}

func TestCommands_ThatCannotBeCarriedOut(t *testing.T) {
	missing := filepath.Join(t.TempDir(), "none.json")
	for _, c := range []struct {
		args  []string
		tells string
	}{
		{[]string{"size"}, "rimeline size FILE"},
		{[]string{"size", "a", "b"}, "rimeline size FILE"},
		{[]string{"size", "--fast", "a"}, "rimeline size FILE"},
		{[]string{"size", missing}, missing},
		{[]string{"size", t.TempDir()}, "is a directory"},
		{[]string{"resize"}, `no command "resize"`},
		{[]string{"arrange", missing}, `no command "arrange"`},
		{[]string{"--fast"}, "-fast"},
		{[]string{"--listen", "8380"}, "host:port"},
		{[]string{"--listen", "127.0.0.1:0", "size"}, `"size"`},
		{[]string{"--host-name", "http://sizing.example.org"}, "only the name"},
		{[]string{"--host-name", ","}, "a name is needed"},
		{[]string{"--listen", "0.0.0.0:0"}, "--open-to-anyone"},
		{[]string{"--listen", ":0"}, "--open-to-anyone"},
		{[]string{"--listen", "[::]:0"}, "--open-to-anyone"},
		{[]string{"--listen", "192.0.2.1:0"}, "--open-to-anyone"},
		{[]string{"--listen", "sizing.example.org:0"}, "--open-to-anyone"},
	} {
		got := runWith(t, strings.NewReader(""), c.args...)
		if got.status != 2 || got.stdout != "" || !strings.Contains(got.stderr, c.tells) {
			t.Errorf("rimeline %q: status %d, stdout %q, stderr %q, want 2, nothing, and %q told", c.args, got.status, got.stdout, got.stderr, c.tells)
		}
	}
	if got := runWith(t, iotest.ErrReader(errors.New("the pipe broke")), "size", "-"); got.status != 2 || !strings.Contains(got.stderr, "the pipe broke") {
		t.Errorf("unreadable standard input: %+v", got)
	}
}

// brokenWriter is a full disk.
type brokenWriter struct{}

func (brokenWriter) Write([]byte) (int, error) { return 0, errors.New("no space left") }

func TestSize_ResultsThatCannotBeWritten(t *testing.T) {
	var stderr bytes.Buffer
	status := run(t.Context(), []string{"size", "-"}, func(string) string { return "" }, strings.NewReader(example(t)), brokenWriter{}, &stderr)
	if status != 2 || !strings.Contains(stderr.String(), "no space left") {
		t.Errorf("status %d, stderr %q: a result that did not arrive must not look like a success", status, &stderr)
	}
}

func TestHelp(t *testing.T) {
	for _, args := range [][]string{{"help"}, {"--help"}, {"-h"}} {
		got := runWith(t, nil, args...)
		if got.status != 0 || !strings.Contains(got.stdout, "rimeline size FILE") || got.stderr != "" {
			t.Errorf("rimeline %q: %+v", args, got)
		}
	}
	if got := runWith(t, nil, "version"); got.status != 0 || !strings.HasPrefix(got.stdout, "rimeline ") {
		t.Errorf("rimeline version: %+v", got)
	}
}

// service starts the program as a service and returns the line that it prints and
// what ends it.
func service(t *testing.T, env map[string]string, args ...string) (printed string, stop func() outcome) {
	t.Helper()
	ctx, cancel := context.WithCancel(context.WithoutCancel(t.Context()))
	out, in := io.Pipe()
	var stderr bytes.Buffer
	ended := make(chan int, 1)
	go func() {
		ended <- run(ctx, args, func(name string) string { return env[name] }, nil, in, &stderr)
		in.Close()
	}()
	buf := make([]byte, 200)
	n, err := out.Read(buf)
	if err != nil {
		t.Fatalf("the service did not start: %s", &stderr)
	}
	t.Cleanup(cancel)
	go io.Copy(io.Discard, out)
	return string(buf[:n]), func() outcome {
		cancel()
		return outcome{status: <-ended, stderr: stderr.String()}
	}
}

// without is an environment whose database cannot be reached.
func without(t *testing.T, more ...string) map[string]string {
	t.Helper()
	env := map[string]string{"DATABASE_URL": "host=" + t.TempDir()}
	for i := 0; i < len(more); i += 2 {
		env[more[i]] = more[i+1]
	}
	return env
}

func TestServe(t *testing.T) {
	for _, c := range []struct {
		name string
		env  map[string]string
		args []string
		host string // in the request
		want int
	}{
		{"loopback", without(t), []string{"--listen", "127.0.0.1:0"}, "", 200},
		{"loopback by name", without(t), []string{"--listen", "localhost:0"}, "", 200},
		{"from the environment", without(t, "RIMELINE_LISTEN", "127.0.0.1:0"), nil, "", 200},
		{"a flag overrules the environment", without(t, "RIMELINE_LISTEN", "0.0.0.0:0"), []string{"--listen", "127.0.0.1:0"}, "", 200},
		{"a foreign name", without(t), []string{"--listen", "127.0.0.1:0"}, "attacker.example", 421},
		{"an own name", without(t), []string{"--listen", "127.0.0.1:0", "--host-name", "a.example,b.example", "--host-name", "c.example"}, "c.example", 200},
		{"an own name of a list", without(t), []string{"--listen", "127.0.0.1:0", "--host-name", "a.example, b.example"}, "b.example", 200},
		{"an own name from the environment", without(t, "RIMELINE_HOST_NAMES", "d.example"), []string{"--listen", "127.0.0.1:0"}, "d.example:80", 200},
		{"open, by an address of the network", without(t), []string{"--listen", "0.0.0.0:0", "--open-to-anyone"}, "192.0.2.7", 200},
		{"open, a foreign name", without(t), []string{"--listen", "0.0.0.0:0", "--open-to-anyone"}, "attacker.example", 421},
	} {
		t.Run(c.name, func(t *testing.T) {
			printed, stop := service(t, c.env, c.args...)
			_, rest, found := strings.Cut(printed, "http://")
			address, _, found2 := strings.Cut(rest, "/")
			if !found || !found2 {
				t.Fatalf("printed %q, want its address", printed)
			}
			req, err := http.NewRequestWithContext(t.Context(), "GET", "http://"+address+"/healthz", nil)
			if err != nil {
				t.Fatal(err)
			}
			req.Host = c.host
			resp, err := http.DefaultClient.Do(req)
			if err != nil {
				t.Fatal(err)
			}
			resp.Body.Close()
			if resp.StatusCode != c.want {
				t.Errorf("host %q: status %d, want %d", c.host, resp.StatusCode, c.want)
			}
			http.DefaultClient.CloseIdleConnections()
			if got := stop(); got.status != 0 {
				t.Errorf("stopped with status %d: %s", got.status, got.stderr)
			}
		})
	}
}

func TestServe_PortTaken(t *testing.T) {
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	got := runWith(t, nil, "--listen", l.Addr().String())
	if got.status != 2 || !strings.Contains(got.stderr, "choose one with --listen") {
		t.Errorf("%+v, want to be told that the port is taken and what to do", got)
	}
}
