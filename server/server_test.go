package server

import (
	"bufio"
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"log/slog"
	"net"
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"
	"testing/synctest"
	"time"
)

// testServer is a server whose request ids are "test-id" and whose log is returned.
func testServer(cfg Config) (*Server, *bytes.Buffer) {
	var log bytes.Buffer
	cfg.Log = slog.New(slog.NewTextHandler(&log, nil))
	cfg.NewRequestID = func() string { return "test-id" }
	return New(cfg), &log
}

// ask sends one request to h and returns the answer.
func ask(t *testing.T, h http.Handler, method, target, body string, header ...string) *httptest.ResponseRecorder {
	t.Helper()
	r := httptest.NewRequestWithContext(t.Context(), method, target, strings.NewReader(body))
	r.Host = "localhost:8380"
	for i := 0; i < len(header); i += 2 {
		if header[i] == "Host" {
			r.Host = header[i+1]
		}
		r.Header.Set(header[i], header[i+1])
	}
	w := httptest.NewRecorder()
	h.ServeHTTP(w, r)
	return w
}

func TestHealth(t *testing.T) {
	s, _ := testServer(Config{})
	w := ask(t, s, "GET", "/healthz", "")
	if w.Code != 200 || w.Body.String() != "ok\n" {
		t.Errorf("GET /healthz = %d %q, want 200 \"ok\\n\"", w.Code, w.Body)
	}
	if w := ask(t, s, "HEAD", "/healthz", ""); w.Code != 200 {
		t.Errorf("HEAD /healthz = %d, want 200: HEAD is answered wherever GET is", w.Code)
	}
}

func TestHosts(t *testing.T) {
	named := Config{HostNames: []string{"sizing.example.org"}}
	for _, c := range []struct {
		name string
		cfg  Config
		host string
		want int
	}{
		{"loopback by number", Config{}, "127.0.0.1:8380", 200},
		{"loopback without a port", Config{}, "127.0.0.1", 200},
		{"all of 127/8 is loopback", Config{}, "127.8.8.8:1", 200},
		{"loopback in IPv6", Config{}, "[::1]:8380", 200},
		{"loopback in IPv6 without a port", Config{}, "[::1]", 200},
		{"loopback by name", Config{}, "localhost:8380", 200},
		{"names have no case", Config{}, "LocalHost", 200},
		{"a name that was rebound to 127.0.0.1", Config{}, "attacker.example", 421},
		{"a name that begins like ours", Config{}, "localhost.attacker.example", 421},
		{"a name that begins like our number", Config{}, "127.0.0.1.attacker.example", 421},
		{"an address of the network", Config{}, "192.0.2.7", 421},
		{"no host", Config{}, "", 421},
		{"an own name", named, "sizing.example.org:80", 200},
		{"an own name in capitals", named, "SIZING.example.org", 200},
		{"loopback beside an own name", named, "localhost", 200},
		{"below an own name", named, "x.sizing.example.org", 421},
		{"an address where any may reach us", Config{AnyAddress: true}, "192.0.2.7:8380", 200},
		{"a foreign name where any may reach us", Config{AnyAddress: true}, "attacker.example", 421},
	} {
		t.Run(c.name, func(t *testing.T) {
			s, _ := testServer(c.cfg)
			w := ask(t, s, "GET", "/healthz", "", "Host", c.host)
			if w.Code != c.want {
				t.Errorf("host %q: status %d, want %d", c.host, w.Code, c.want)
			}
			if c.want != 200 && !strings.Contains(w.Body.String(), "--host-name") {
				t.Errorf("host %q: the refusal does not say how to allow a name: %s", c.host, w.Body)
			}
		})
	}
}

func TestCrossSiteRequests(t *testing.T) {
	s, _ := testServer(Config{})
	for _, c := range []struct {
		name   string
		header []string
		denied bool
	}{
		{"our own page", []string{"Sec-Fetch-Site", "same-origin"}, false},
		{"typed into the address line", []string{"Sec-Fetch-Site", "none"}, false},
		{"another site", []string{"Sec-Fetch-Site", "cross-site"}, true},
		{"another port of this machine", []string{"Sec-Fetch-Site", "same-site"}, true},
		{"another site in an old browser", []string{"Origin", "http://attacker.example"}, true},
		{"no origin in an old browser", []string{"Origin", "null"}, true},
		{"a program", nil, false},
	} {
		t.Run(c.name, func(t *testing.T) {
			w := ask(t, s, "POST", "/api/v1/size", "[", append(c.header, "Content-Type", "application/json")...)
			if denied := w.Code == http.StatusForbidden; denied != c.denied {
				t.Errorf("status %d, denied = %t, want %t", w.Code, denied, c.denied)
			}
			if w := ask(t, s, "GET", "/healthz", "", c.header...); w.Code != 200 {
				t.Errorf("GET = %d, want 200: a GET changes nothing and may come from anywhere", w.Code)
			}
		})
	}
}

func TestSecurityHeaders_OnEveryAnswer(t *testing.T) {
	s, _ := testServer(Config{})
	for _, c := range [][2]string{{"GET", "/healthz"}, {"GET", "/no-such-page"}, {"PUT", "/design"}, {"POST", "/api/v1/size"}, {"GET", "/static/none"}} {
		h := ask(t, s, c[0], c[1], "").Header()
		for name, want := range map[string]string{
			"Content-Security-Policy": contentPolicy,
			"X-Content-Type-Options":  "nosniff",
			"Referrer-Policy":         "same-origin",
			"X-Request-Id":            "test-id",
		} {
			if h.Get(name) != want {
				t.Errorf("%s %s: %s = %q, want %q", c[0], c[1], name, h.Get(name), want)
			}
		}
	}
	for _, loose := range []string{"unsafe-inline", "unsafe-eval", "data:", "*", "http:"} {
		if strings.Contains(contentPolicy, loose) {
			t.Errorf("the content policy contains %s, by which a slip in one page could run a stranger's script", loose)
		}
	}
}

func TestWrongAddressAndMethod(t *testing.T) {
	s, _ := testServer(Config{})
	for _, c := range []struct {
		method, target string
		status         int
		contentType    string
		allow          string
	}{
		{"GET", "/no-such-page", 404, "text/html; charset=utf-8", ""},
		{"GET", "/api/v1/no-such-thing", 404, "application/problem+json", ""},
		{"GET", "/design/", 404, "text/html; charset=utf-8", ""},
		{"PUT", "/design", 405, "text/html; charset=utf-8", "GET, HEAD, POST"},
		{"DELETE", "/healthz", 405, "text/html; charset=utf-8", "GET, HEAD"},
		{"GET", "/api/v1/size", 405, "application/problem+json", "POST"},
		{"HEAD", "/api/v1/size", 405, "application/problem+json", "POST"},
	} {
		w := ask(t, s, c.method, c.target, "")
		if w.Code != c.status || w.Header().Get("Content-Type") != c.contentType || w.Header().Get("Allow") != c.allow {
			t.Errorf("%s %s = %d, %q, Allow %q, want %d, %q, Allow %q", c.method, c.target,
				w.Code, w.Header().Get("Content-Type"), w.Header().Get("Allow"), c.status, c.contentType, c.allow)
		}
	}
}

func TestErrors_StayInTheLog(t *testing.T) {
	secret := errors.New("dial db.internal: password authentication")
	for _, c := range []struct {
		name   string
		h      handler
		target string
		status int
	}{
		{"an error of a page", func(http.ResponseWriter, *http.Request) error { return fmt.Errorf("load: %w", secret) }, "/", 500},
		{"an error of the API", func(http.ResponseWriter, *http.Request) error { return secret }, "/api/v1/x", 500},
		{"a panic", func(http.ResponseWriter, *http.Request) error { panic(secret) }, "/", 500},
		{"the cause of a bad request", func(http.ResponseWriter, *http.Request) error { return badRequest("Bad.", secret) }, "/", 400},
	} {
		t.Run(c.name, func(t *testing.T) {
			s, log := testServer(Config{})
			w := ask(t, s.logRequests(s.recoverPanic(s.handle(c.h))), "GET", c.target, "")
			if w.Code != c.status {
				t.Errorf("status %d, want %d", w.Code, c.status)
			}
			if strings.Contains(w.Body.String(), "password") {
				t.Errorf("the visitor is shown the inside of an error: %s", w.Body)
			}
			if !strings.Contains(w.Body.String(), "test-id") {
				t.Errorf("the answer does not name the request: %s", w.Body)
			}
			if !strings.Contains(log.String(), "password authentication") || !strings.Contains(log.String(), "request_id=test-id") {
				t.Errorf("the log does not hold the error and the request's id:\n%s", log)
			}
		})
	}
}

func TestErrors_AfterTheAnswerBegan(t *testing.T) {
	s, log := testServer(Config{})
	w := ask(t, s.logRequests(s.handle(func(w http.ResponseWriter, _ *http.Request) error {
		io.WriteString(w, "half")
		return errors.New("too late")
	})), "GET", "/", "")
	if w.Body.String() != "half" {
		t.Errorf("body = %q: an error page was written into an answer that had begun", w.Body)
	}
	if !strings.Contains(log.String(), "a handler answered and returned an error") {
		t.Errorf("the log does not tell:\n%s", log)
	}
}

func TestPanic_AfterTheAnswerBegan(t *testing.T) {
	s, _ := testServer(Config{})
	s.router = s.logRequests(s.recoverPanic(http.HandlerFunc(func(w http.ResponseWriter, _ *http.Request) {
		io.WriteString(w, "half")
		panic("broken")
	})))
	resp, err := http.Get("http://" + startServing(t, s).addr + "/")
	if err == nil {
		defer resp.Body.Close()
		_, err = io.ReadAll(resp.Body)
	}
	if err == nil {
		t.Error("the client was given half an answer as a whole one")
	}
}

func TestLog_KeepsNothingTyped(t *testing.T) {
	s, log := testServer(Config{})
	ask(t, s, "GET", "/no-such-page?client=Ms+Private", "")
	ask(t, s, "POST", "/api/v1/size", `{"title": "Ms Private"`)
	for line := range strings.Lines(log.String()) {
		if strings.Contains(line, "Private") {
			t.Errorf("the log holds what a visitor typed: %s", line)
		}
	}
	if want := "method=POST route=/api/v1/size status=400"; !strings.Contains(log.String(), want) {
		t.Errorf("the log has no line with %q:\n%s", want, log)
	}
}

func TestBodies_TooLong(t *testing.T) {
	s, _ := testServer(Config{MaxBodyBytes: 2048})
	for name, body := range map[string]io.Reader{
		"length stated": strings.NewReader(strings.Repeat(" ", 2049)),
		"length hidden": io.MultiReader(strings.NewReader(strings.Repeat(" ", 2049))),
	} {
		r := httptest.NewRequestWithContext(t.Context(), "POST", "/api/v1/size", body)
		r.Host = "localhost"
		w := httptest.NewRecorder()
		s.ServeHTTP(w, r)
		if w.Code != http.StatusRequestEntityTooLarge || !strings.Contains(w.Body.String(), "2 KiB") {
			t.Errorf("%s: %d %s, want 413 and the limit in words", name, w.Code, w.Body)
		}
	}
}

// TestPlaces_Full: where every place is taken, a request waits for one and is then
// told to come again; where one is given back in time, it is answered.
func TestPlaces_Full(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		s, _ := testServer(Config{MaxConcurrent: 1, QueueWait: time.Second})
		release := make(chan struct{})
		work := s.takePlace(http.HandlerFunc(func(http.ResponseWriter, *http.Request) { <-release }))
		go ask(t, work, "POST", "/design", "")
		synctest.Wait()

		began := time.Now()
		w := ask(t, work, "POST", "/design", "")
		if w.Code != http.StatusServiceUnavailable || w.Header().Get("Retry-After") == "" {
			t.Errorf("full: status %d, Retry-After %q, want 503 and when to come again", w.Code, w.Header().Get("Retry-After"))
		}
		if waited := time.Since(began); waited != time.Second {
			t.Errorf("full: refused after %s, want 1 s", waited)
		}
		if w := ask(t, s, "GET", "/healthz", ""); w.Code != 200 {
			t.Errorf("full: /healthz = %d, want 200: a full server is alive", w.Code)
		}

		go func() {
			time.Sleep(time.Second / 2)
			close(release)
		}()
		if w := ask(t, work, "POST", "/design", ""); w.Code != 200 {
			t.Errorf("a place is given back in time: status %d, want 200", w.Code)
		}
	})
}

// serving is a server on a port of its own.
type serving struct {
	addr  string
	stop  context.CancelFunc
	ended chan error // what Serve returned
}

// startServing serves s until the test ends or stop is called.
func startServing(t *testing.T, s *Server) serving {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	ctx, stop := context.WithCancel(context.WithoutCancel(t.Context()))
	v := serving{addr: l.Addr().String(), stop: stop, ended: make(chan error, 1)}
	go func() { v.ended <- s.Serve(ctx, l) }()
	t.Cleanup(stop)
	return v
}

func (v serving) dial(t *testing.T) net.Conn {
	t.Helper()
	c, err := net.Dial("tcp", v.addr)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { c.Close() })
	if err := c.SetDeadline(time.Now().Add(20 * time.Second)); err != nil {
		t.Fatal(err)
	}
	return c
}

func (v serving) healthy(t *testing.T) {
	t.Helper()
	c := http.Client{Timeout: 10 * time.Second}
	resp, err := c.Get("http://" + v.addr + "/healthz")
	if err != nil {
		t.Fatalf("the server does not answer: %v", err)
	}
	resp.Body.Close()
	if resp.StatusCode != 200 {
		t.Errorf("/healthz = %d, want 200", resp.StatusCode)
	}
}

// TestServe_SlowClients: more clients than there are places send half a request and
// stop; the others are served all the while, and the slow ones are cut off.
func TestServe_SlowClients(t *testing.T) {
	s, _ := testServer(Config{MaxConcurrent: 2, QueueWait: 10 * time.Millisecond, ReadTimeout: time.Second})
	v := startServing(t, s)
	var slow []net.Conn
	for range 20 {
		c := v.dial(t)
		fmt.Fprint(c, "POST /api/v1/size HTTP/1.1\r\nHost: localhost\r\nContent-Length: 100\r\n\r\n{")
		slow = append(slow, c)
	}
	resp, err := http.Post("http://"+v.addr+"/api/v1/size", "application/json", strings.NewReader("["))
	if err != nil {
		t.Fatal(err)
	}
	resp.Body.Close()
	if resp.StatusCode != 400 {
		t.Errorf("beside slow clients: status %d, want 400 (the document is not JSON): slow clients must hold no place", resp.StatusCode)
	}
	for _, c := range slow {
		answer, err := http.ReadResponse(bufio.NewReader(c), nil)
		if err != nil {
			t.Fatalf("a slow client was left without an answer: %v", err)
		}
		if answer.StatusCode != http.StatusRequestTimeout {
			t.Errorf("a slow client got %d, want 408", answer.StatusCode)
		}
	}
}

// TestServe_SlowHeaders: a client that never ends its headers is cut off.
func TestServe_SlowHeaders(t *testing.T) {
	s, _ := testServer(Config{ReadTimeout: 200 * time.Millisecond})
	c := startServing(t, s).dial(t)
	fmt.Fprint(c, "GET / HTTP/1.1\r\nHost: localhost\r\n")
	if _, err := io.ReadAll(c); err != nil {
		t.Errorf("the connection was not closed: %v", err)
	}
}

// TestServe_ClientsThatLeave: clients break off in the middle of a body or do not
// wait for the answer; the server goes on.
func TestServe_ClientsThatLeave(t *testing.T) {
	s, _ := testServer(Config{MaxConcurrent: 2})
	v := startServing(t, s)
	for i := range 50 {
		c := v.dial(t)
		fmt.Fprint(c, "POST /api/v1/size HTTP/1.1\r\nHost: localhost\r\nContent-Length: 4\r\n\r\n")
		if i%2 == 0 {
			fmt.Fprint(c, "null")
		}
		c.Close()
	}
	v.healthy(t)
}

func TestServe_ManyConnections(t *testing.T) {
	s, _ := testServer(Config{})
	v := startServing(t, s)
	for range 300 {
		v.dial(t) // and says nothing
	}
	v.healthy(t)
}

// TestServe_HugeBody: a body without end is refused with an answer, and not read.
func TestServe_HugeBody(t *testing.T) {
	s, _ := testServer(Config{})
	c := startServing(t, s).dial(t)
	fmt.Fprint(c, "POST /api/v1/size HTTP/1.1\r\nHost: localhost\r\nContent-Length: 1000000000000\r\n\r\n")
	answer, err := http.ReadResponse(bufio.NewReader(c), nil)
	if err != nil {
		t.Fatal(err)
	}
	if answer.StatusCode != http.StatusRequestEntityTooLarge || !answer.Close {
		t.Errorf("status %d, closes = %t, want 413 and the connection closed", answer.StatusCode, answer.Close)
	}
}

// TestServe_StopLetsRequestsEnd: a request in flight when the server is stopped is
// answered; a new one finds nobody.
func TestServe_StopLetsRequestsEnd(t *testing.T) {
	s, _ := testServer(Config{})
	entered, release := make(chan struct{}), make(chan struct{})
	s.router = s.handle(func(w http.ResponseWriter, _ *http.Request) error {
		close(entered)
		<-release
		io.WriteString(w, "whole")
		return nil
	})
	v := startServing(t, s)
	answer := make(chan string, 1)
	go func() {
		resp, err := http.Get("http://" + v.addr + "/")
		if err != nil {
			answer <- err.Error()
			return
		}
		defer resp.Body.Close()
		body, _ := io.ReadAll(resp.Body)
		answer <- string(body)
	}()
	<-entered
	v.stop()
	for { // until the listener is closed
		c, err := net.Dial("tcp", v.addr)
		if err != nil {
			break
		}
		c.Close()
		time.Sleep(time.Millisecond)
	}
	close(release)
	if got := <-answer; got != "whole" {
		t.Errorf("the request in flight got %q, want \"whole\"", got)
	}
	if err := <-v.ended; err != nil {
		t.Errorf("Serve = %v, want nil", err)
	}
}

// TestServe_StopHasAnEnd: a request that does not end is cut off, and Serve says so.
func TestServe_StopHasAnEnd(t *testing.T) {
	s, _ := testServer(Config{StopTimeout: 50 * time.Millisecond})
	entered, release := make(chan struct{}), make(chan struct{})
	defer close(release)
	s.router = http.HandlerFunc(func(http.ResponseWriter, *http.Request) { close(entered); <-release })
	v := startServing(t, s)
	go http.Get("http://" + v.addr + "/") // never answered
	<-entered
	v.stop()
	if err := <-v.ended; !errors.Is(err, context.DeadlineExceeded) {
		t.Errorf("Serve = %v, want it to tell that requests were cut off", err)
	}
}
