package server

import (
	"encoding/json"
	"net/http"
	"os"
	"strings"
	"testing"

	"rimeline/sizing"
	"rimeline/sizing/design"
)

// exampleText is the design of the format page.
func exampleText(t *testing.T) string {
	t.Helper()
	text, err := os.ReadFile("../sizing/design/testdata/example-design.json")
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

func TestAPISize_Result(t *testing.T) {
	s, _ := testServer(Config{})
	text := exampleText(t)
	want := string(sizing.Size(design.Read([]byte(text)).Design).AppendJSON(nil)) + "\n"
	outside := strings.Replace(text, `"modules_in_series": 12`, `"modules_in_series": 90`, 1)
	for range 2 {
		w := ask(t, s, "POST", "/api/v1/size", text, "Content-Type", "application/json")
		if w.Code != 200 || w.Header().Get("Content-Type") != "application/json" || w.Body.String() != want {
			t.Fatalf("status %d, %s, body %s\nwant 200, application/json and the engine's own text %s", w.Code, w.Header().Get("Content-Type"), w.Body, want)
		}
	}
	w := ask(t, s, "POST", "/api/v1/size", outside)
	if w.Code != 200 || !strings.Contains(w.Body.String(), `"verdict":"outside"`) {
		t.Errorf("a design whose strings are too long: status %d, %.200s, want 200 and the verdict outside: a verdict is no error", w.Code, w.Body)
	}
}

func TestAPISize_Refusals(t *testing.T) {
	s, _ := testServer(Config{})
	text := exampleText(t)
	for _, c := range []struct {
		name    string
		body    string
		status  int
		pointer string // of one of the errors
	}{
		{"a field is missing", strings.Replace(text, `"rulebook"`, `"rule_book"`, 1), 422, "/rulebook"},
		{"another thing than a design", `[]`, 422, ""},
		{"two faults", strings.NewReplacer(`"rulebook"`, `"rule_book"`, `"title"`, `"titel"`).Replace(text), 422, "/title"},
		{"not JSON", `{"format": `, 400, ""},
		{"nothing", ``, 400, ""},
		{"two designs", text + text, 400, ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			w := ask(t, s, "POST", "/api/v1/size", c.body, "Content-Type", "application/json")
			var p struct {
				Type, Title, Detail string
				Status              int
				RequestID           string `json:"request_id"`
				Errors              []struct{ Pointer, Found, Expected, Detail string }
			}
			if err := json.Unmarshal(w.Body.Bytes(), &p); err != nil {
				t.Fatalf("%v: %s", err, w.Body)
			}
			if w.Code != c.status || p.Status != c.status || w.Header().Get("Content-Type") != "application/problem+json" {
				t.Errorf("status %d, in the body %d, %s, want %d and application/problem+json", w.Code, p.Status, w.Header().Get("Content-Type"), c.status)
			}
			if p.Type == "" || p.Title != http.StatusText(c.status) || p.Detail == "" || p.RequestID != "test-id" {
				t.Errorf("the problem lacks a member: %s", w.Body)
			}
			found := false
			for _, e := range p.Errors {
				found = found || e.Pointer == c.pointer
				if e.Found == "" || e.Expected == "" || e.Detail == "" {
					t.Errorf("a reason says too little: %+v", e)
				}
			}
			if !found {
				t.Errorf("no error has the pointer %q: %s", c.pointer, w.Body)
			}
		})
	}
}

func TestAPISize_ContentTypes(t *testing.T) {
	s, _ := testServer(Config{})
	text := exampleText(t)
	for _, c := range []struct {
		header, value string
		want          int
	}{
		{"Content-Type", "application/json", 200},
		{"Content-Type", "application/json; charset=utf-8", 200},
		{"Content-Type", "Application/JSON", 200},
		{"Content-Type", "application/vnd.example+json", 200},
		{"Content-Type", "", 200},
		{"Content-Type", "application/x-www-form-urlencoded", 200}, // what clients say who were told nothing
		{"Content-Type", "application/octet-stream", 200},
		{"Content-Type", "text/plain", 200},
		{"Content-Type", "text/html", 415},
		{"Content-Type", "application/xml", 415},
		{"Content-Type", "multipart/form-data; boundary=x", 415},
		{"Content-Type", "nonsense/", 415},
		{"Content-Encoding", "identity", 200},
		{"Content-Encoding", "gzip", 415},
	} {
		w := ask(t, s, "POST", "/api/v1/size", text, c.header, c.value)
		if w.Code != c.want {
			t.Errorf("%s %q: status %d, want %d: %.200s", c.header, c.value, w.Code, c.want, w.Body)
		}
		if c.want == 415 && w.Header().Get("Content-Type") != "application/problem+json" {
			t.Errorf("%s %q: the refusal is %s", c.header, c.value, w.Header().Get("Content-Type"))
		}
	}
}

// BenchmarkAPISize is one design through the whole server, without the network.
func BenchmarkAPISize(b *testing.B) {
	text, err := os.ReadFile("../sizing/design/testdata/example-design.json")
	if err != nil {
		b.Fatal(err)
	}
	s := New(Config{})
	for b.Loop() {
		r, err := http.NewRequestWithContext(b.Context(), "POST", "http://localhost/api/v1/size", strings.NewReader(string(text)))
		if err != nil {
			b.Fatal(err)
		}
		w := &discard{header: http.Header{}}
		if s.ServeHTTP(w, r); w.status != 200 && w.status != 0 {
			b.Fatal("status ", w.status)
		}
	}
}

// discard is an answer that nobody reads.
type discard struct {
	header http.Header
	status int
}

func (w *discard) Header() http.Header         { return w.header }
func (w *discard) Write(b []byte) (int, error) { return len(b), nil }
func (w *discard) WriteHeader(status int)      { w.status = status }
