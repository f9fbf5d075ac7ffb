package tests

import (
	"bufio"
	"bytes"
	"cmp"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net/http"
	"net/url"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"rimeline/server/form"
)

// builtIn is the directory of the program of this test run, "" until a test needs it.
var builtIn string

// buildProgram builds the program once in a test run and returns its path.
var buildProgram = sync.OnceValues(func() (string, error) {
	var err error
	if builtIn, err = os.MkdirTemp("", "rimeline-program-*"); err != nil {
		return "", err
	}
	program := filepath.Join(builtIn, "rimeline")
	if out, err := exec.Command("go", "build", "-o", program, "rimeline/cmd/rimeline").CombinedOutput(); err != nil {
		return "", fmt.Errorf("go build: %w\n%s", err, out)
	}
	return program, nil
})

// removeProgram is what TestMain ends with.
func removeProgram() {
	if builtIn != "" {
		_ = os.RemoveAll(builtIn) // what stays is a temporary file
	}
}

// service is the real program, at work in a process of its own.
type service struct {
	address string // http://127.0.0.1:12345
	process *os.Process
	ended   chan struct{} // closed when the process is gone
	log     *bytes.Buffer // may be read when it has ended
}

// startService starts the program on a database. At the end of the test it is killed if
// it still runs. It returns when the program listens; saving may come later.
func startService(t testing.TB, dsn string) *service {
	t.Helper()
	program, err := buildProgram()
	if err != nil {
		t.Fatal(err)
	}
	s := &service{ended: make(chan struct{}), log: new(bytes.Buffer)}
	cmd := exec.Command(program, "--listen", "127.0.0.1:0")
	cmd.Env = append(os.Environ(), "DATABASE_URL="+dsn)
	cmd.Stderr = s.log
	stdout, err := cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	s.process = cmd.Process
	lines := bufio.NewReader(stdout)
	printed, readErr := lines.ReadString('\n')
	go func() {
		_, _ = io.Copy(io.Discard, lines)
		_ = cmd.Wait() // a killed process tells of nothing but that
		close(s.ended)
	}()
	t.Cleanup(s.kill)
	_, rest, found := strings.Cut(printed, "http://")
	if readErr != nil || !found {
		s.kill()
		t.Fatalf("the service printed %q in place of its address: %v\n%s", printed, readErr, s.log)
	}
	address, _, _ := strings.Cut(rest, "/")
	s.address = "http://" + address
	return s
}

// kill ends the program without a chance to finish anything, as a loss of power does. It
// returns when the process is gone.
func (s *service) kill() {
	_ = s.process.Kill() // an error is that it has ended already
	<-s.ended
}

// awaitReady waits until /readyz answers with a status: 200 once designs can be saved,
// 503 once they cannot. It says how long that took.
func (s *service) awaitReady(t testing.TB, status int) time.Duration {
	t.Helper()
	began := time.Now()
	for {
		got, err := s.send("GET", "/readyz", nil, "")
		if err == nil && got.status == status {
			return time.Since(began)
		}
		if time.Since(began) > patience {
			t.Fatalf("waited in vain until /readyz answers %d: %d %s %v", status, got.status, got.body, err)
		}
		time.Sleep(2 * time.Millisecond)
	}
}

// answer is what a service answered.
type answer struct {
	status int
	header http.Header
	body   []byte
}

// strangers sends requests as programs do. It follows no redirect, and a connection to a
// service that was killed is of no use to the next.
var strangers = &http.Client{
	Timeout:       patience,
	CheckRedirect: func(*http.Request, []*http.Request) error { return http.ErrUseLastResponse },
	Transport:     &http.Transport{MaxIdleConnsPerHost: 32},
}

// send sends a request: headers are name, value, name, value.
func (s *service) send(method, path string, body []byte, contentType string, headers ...string) (answer, error) {
	req, err := http.NewRequest(method, s.address+path, bytes.NewReader(body))
	if err != nil {
		return answer{}, err
	}
	if contentType != "" {
		req.Header.Set("Content-Type", contentType)
	}
	for i := 0; i < len(headers); i += 2 {
		req.Header.Set(headers[i], headers[i+1])
	}
	resp, err := strangers.Do(req)
	if err != nil {
		return answer{}, err
	}
	content, err := io.ReadAll(resp.Body)
	return answer{resp.StatusCode, resp.Header, content}, errors.Join(err, resp.Body.Close())
}

// must sends a request that is to be answered with a status.
func (s *service) must(t testing.TB, status int, method, path string, body []byte, contentType string, headers ...string) answer {
	t.Helper()
	a, err := s.send(method, path, body, contentType, headers...)
	if err != nil || a.status != status {
		t.Fatalf("%s %s: %d %s %v, want %d", method, path, a.status, a.body, err, status)
	}
	return a
}

// get, save and revise are what programs do with designs; submit is what a browser does.

func (s *service) get(t testing.TB, path string) answer {
	t.Helper()
	return s.must(t, http.StatusOK, "GET", path, nil, "")
}

func (s *service) save(key string, document []byte) (answer, error) {
	return s.send("POST", "/api/v1/designs", document, "application/json", "Idempotency-Key", key)
}

func (s *service) revise(id, tag, key string, document []byte) (answer, error) {
	return s.send("PUT", "/api/v1/designs/"+id, document, "application/json", "If-Match", tag, "Idempotency-Key", key)
}

func (s *service) submit(path string, values url.Values) (answer, error) {
	return s.send("POST", path, []byte(values.Encode()), "application/x-www-form-urlencoded")
}

// savedDesign is a saved revision as the interface answers it.
type savedDesign struct {
	ID       string          `json:"id"`
	Revision int             `json:"revision"`
	SHA256   string          `json:"sha256"`
	Document json.RawMessage `json:"document"`
	Result   json.RawMessage `json:"result"`
	Updated  time.Time       `json:"updated_at"`
}

func (a answer) saved() (savedDesign, error) {
	var d savedDesign
	err := json.Unmarshal(a.body, &d)
	if err == nil && d.Revision == 0 {
		err = errors.New("it is no saved revision")
	}
	if err != nil {
		err = fmt.Errorf("%d %s: %w", a.status, a.body, err)
	}
	return d, err
}

// listed returns the newest revision of every saved design, by its id.
func (s *service) listed(t testing.TB) map[string]int {
	t.Helper()
	all := map[string]int{}
	for next := "/api/v1/designs?limit=200"; next != ""; {
		var page struct {
			Designs []savedDesign `json:"designs"`
			Next    string        `json:"next"`
		}
		if err := json.Unmarshal(s.get(t, next).body, &page); err != nil {
			t.Fatal(err)
		}
		for _, d := range page.Designs {
			if _, twice := all[d.ID]; twice {
				t.Errorf("design %s is listed twice", d.ID)
			}
			all[d.ID] = d.Revision
		}
		next = page.Next
	}
	return all
}

// usualDesign is a design as people save it, of some size.
func usualDesign(t testing.TB) object {
	t.Helper()
	text, err := os.ReadFile("testdata/example.json")
	if err != nil {
		t.Fatal(err)
	}
	return readDocument(text)
}

// titled is a design under another title.
func titled(doc object, title string) []byte {
	doc = copyDocument(doc)
	doc["title"] = title
	return documentText(doc)
}

// typed is a design as a browser sends its form.
func typed(t testing.TB, document []byte) url.Values {
	t.Helper()
	f, _, err := form.FromDocument(document)
	if err != nil {
		t.Fatal(err)
	}
	values := url.Values{}
	for _, name := range f.Names("/") {
		values.Set(name, f.Text(name))
	}
	return values
}

// asUnavailable says what is wrong with an answer that is to say that nothing can be
// saved at the moment, "" if nothing is.
func (a answer) asUnavailable() string {
	if a.status != http.StatusServiceUnavailable {
		return fmt.Sprintf("%d %s", a.status, cmp.Or(string(a.body), "without a body"))
	}
	if a.header.Get("Retry-After") == "" {
		return "503 without Retry-After"
	}
	return ""
}
