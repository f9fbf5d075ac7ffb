package server

import (
	"bytes"
	"encoding/json"
	"fmt"
	"maps"
	"net/http"
	"net/http/httptest"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync"
	"testing"

	"github.com/go-chi/chi/v5"
	"github.com/santhosh-tekuri/jsonschema/v6"

	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/sizing"
	"rimeline/sizing/design"
)

// described is the description of the interface, ready to hold answers against.
type described struct {
	doc      map[string]any
	compiler *jsonschema.Compiler

	mu      sync.Mutex
	schemas map[string]*jsonschema.Schema
}

// description reads the description once. Objects in it are closed: the description
// leaves room for members to come, but none may be there that it does not name.
var description = sync.OnceValues(func() (*described, error) {
	doc, err := jsonschema.UnmarshalJSON(bytes.NewReader(openAPI))
	if err != nil {
		return nil, err
	}
	shut(doc.(map[string]any)["components"].(map[string]any)["schemas"])
	d := &described{doc: doc.(map[string]any), compiler: jsonschema.NewCompiler(), schemas: map[string]*jsonschema.Schema{}}
	d.compiler.DefaultDraft(jsonschema.Draft2020)
	d.compiler.AssertFormat()
	return d, d.compiler.AddResource("openapi.json", doc)
})

// shut closes every object of a schema that says which members it has.
func shut(schema any) {
	switch s := schema.(type) {
	case map[string]any:
		for _, part := range s {
			shut(part)
		}
		_, named := s["properties"]
		if _, closed := s["additionalProperties"]; named && s["type"] == "object" && !closed {
			s["additionalProperties"] = false
		}
	case []any:
		for _, part := range s {
			shut(part)
		}
	}
}

func readDescription(t testing.TB) *described {
	t.Helper()
	d, err := description()
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// at returns what stands at a pointer, its $ref followed, and where that is.
func (d *described) at(t testing.TB, pointer string) (found any, place string) {
	t.Helper()
	found = d.doc
	for step := range strings.SplitSeq(strings.TrimPrefix(pointer, "/"), "/") {
		object, _ := found.(map[string]any)
		found = object[strings.NewReplacer("~1", "/", "~0", "~").Replace(step)]
	}
	if object, ok := found.(map[string]any); ok {
		if ref, ok := object["$ref"].(string); ok {
			return d.at(t, strings.TrimPrefix(ref, "#"))
		}
	}
	return found, pointer
}

// check holds a JSON value against the schema at a pointer.
func (d *described) check(t testing.TB, pointer string, text []byte) error {
	t.Helper()
	d.mu.Lock()
	defer d.mu.Unlock()
	schema := d.schemas[pointer]
	if schema == nil {
		var err error
		if schema, err = d.compiler.Compile("openapi.json#" + pointer); err != nil {
			t.Fatal(err)
		}
		d.schemas[pointer] = schema
	}
	value, err := jsonschema.UnmarshalJSON(bytes.NewReader(text))
	if err != nil {
		return err
	}
	return schema.Validate(value)
}

func escape(step string) string { return strings.NewReplacer("~", "~0", "/", "~1").Replace(step) }

// operations returns every "GET /path" of the description.
func (d *described) operations() []string {
	var found []string
	for path, item := range d.doc["paths"].(map[string]any) {
		for method := range item.(map[string]any) {
			found = append(found, strings.ToUpper(method)+" "+path)
		}
	}
	slices.Sort(found)
	return found
}

// program is a client of the interface that holds every answer against its
// description.
type program struct {
	t    *testing.T
	s    *Server
	seen map[string]bool // "GET /path 200"
}

func newProgram(t *testing.T, s *Server) *program {
	return &program{t: t, s: s, seen: map[string]bool{}}
}

func (p *program) do(method, target, body string, header ...string) *httptest.ResponseRecorder {
	p.t.Helper()
	w := ask(p.t, p.s, method, target, body, header...)
	p.check(method, target, w)
	return w
}

// want is do with a status that must come.
func (p *program) want(status int, method, target, body string, header ...string) *httptest.ResponseRecorder {
	p.t.Helper()
	w := p.do(method, target, body, header...)
	if w.Code != status {
		p.t.Fatalf("%s %s %q: status %d, want %d: %s", method, target, header, w.Code, status, w.Body)
	}
	return w
}

func (p *program) check(method, target string, w *httptest.ResponseRecorder) {
	p.t.Helper()
	path, _, _ := strings.Cut(target, "?")
	route := chi.NewRouteContext()
	if !p.s.router.(chi.Routes).Match(route, method, path) {
		p.t.Fatalf("%s %s is no route", method, path)
	}
	d := readDescription(p.t)
	responses := fmt.Sprintf("/paths/%s/%s/responses/", escape(route.RoutePattern()), strings.ToLower(method))
	found, place := d.at(p.t, responses+fmt.Sprint(w.Code))
	if found == nil {
		p.t.Errorf("%s %s: the answer %d is not described: %s", method, route.RoutePattern(), w.Code, w.Body)
		return
	}
	p.seen[fmt.Sprintf("%s %s %d", method, route.RoutePattern(), w.Code)] = true
	response := found.(map[string]any)
	headers, _ := response["headers"].(map[string]any)
	for name := range headers {
		header, headerPlace := d.at(p.t, place+"/headers/"+escape(name))
		value := w.Header().Get(name)
		if value == "" {
			if header.(map[string]any)["required"] == true {
				p.t.Errorf("%s %s %d: no %s, which is described", method, target, w.Code, name)
			}
			continue
		}
		quoted, err := json.Marshal(value)
		if err == nil {
			err = d.check(p.t, headerPlace+"/schema", quoted)
		}
		if err != nil {
			p.t.Errorf("%s %s %d: %s: %v", method, target, w.Code, name, err)
		}
	}
	for _, name := range []string{"ETag", "Location", "Retry-After", "Idempotency-Replayed"} {
		if _, ok := headers[name]; !ok && w.Header().Get(name) != "" {
			p.t.Errorf("%s %s %d: %s is sent and not described", method, target, w.Code, name)
		}
	}
	content, _ := response["content"].(map[string]any)
	if content == nil {
		if w.Body.Len() > 0 {
			p.t.Errorf("%s %s %d: a body is not described: %s", method, target, w.Code, w.Body)
		}
		return
	}
	kind := w.Header().Get("Content-Type")
	if content[kind] == nil {
		p.t.Errorf("%s %s %d: the content type is %q, described are %v", method, target, w.Code, kind, slices.Collect(maps.Keys(content)))
		return
	}
	if err := d.check(p.t, place+"/content/"+escape(kind)+"/schema", w.Body.Bytes()); err != nil {
		p.t.Errorf("%s %s %d: %v: %s", method, target, w.Code, err, w.Body)
	}
}

func TestOpenAPI_Routes(t *testing.T) {
	s, _ := testServer(Config{})
	var routes []string
	err := chi.Walk(s.router.(chi.Routes), func(method, route string, _ http.Handler, _ ...func(http.Handler) http.Handler) error {
		if strings.HasPrefix(route, "/api/") {
			routes = append(routes, method+" "+route)
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	slices.Sort(routes)
	if operations := readDescription(t).operations(); !slices.Equal(routes, operations) {
		t.Errorf("the routes are\n%s\nand the description has\n%s", strings.Join(routes, "\n"), strings.Join(operations, "\n"))
	}
}

// TestOpenAPI_Whole: every $ref leads somewhere, every component is used, every
// operation has a name of its own, and every part of a path is a parameter.
func TestOpenAPI_Whole(t *testing.T) {
	d := readDescription(t)
	used := map[string]bool{}
	var walk func(any)
	walk = func(part any) {
		switch p := part.(type) {
		case map[string]any:
			if ref, ok := p["$ref"].(string); ok {
				used[strings.TrimPrefix(ref, "#")] = true
				if found, _ := d.at(t, strings.TrimPrefix(ref, "#")); found == nil {
					t.Errorf("nothing is at %s", ref)
				}
			}
			for _, inner := range p {
				walk(inner)
			}
		case []any:
			for _, inner := range p {
				walk(inner)
			}
		}
	}
	walk(d.doc)
	for kind, named := range d.doc["components"].(map[string]any) {
		for name := range named.(map[string]any) {
			if place := "/components/" + kind + "/" + escape(name); !used[place] {
				t.Errorf("nothing uses %s", place)
			}
		}
	}
	names := map[string]string{}
	for _, operation := range d.operations() {
		method, path, _ := strings.Cut(operation, " ")
		place := "/paths/" + escape(path) + "/" + strings.ToLower(method)
		found, _ := d.at(t, place)
		name, _ := found.(map[string]any)["operationId"].(string)
		if name == "" || names[name] != "" {
			t.Errorf("%s is named %q, as is %q", operation, name, names[name])
		}
		names[name] = operation
		var inPath []string
		parameters, _ := found.(map[string]any)["parameters"].([]any)
		for i, parameter := range parameters {
			if ref, ok := parameter.(map[string]any)["$ref"].(string); ok {
				parameter, _ = d.at(t, strings.TrimPrefix(ref, "#"))
			}
			p := parameter.(map[string]any)
			if p["in"] == "path" {
				inPath = append(inPath, "{"+p["name"].(string)+"}")
			}
			if p["schema"] == nil {
				t.Errorf("%s: parameter %d has no schema", operation, i)
			}
		}
		for step := range strings.SplitSeq(path, "/") {
			if strings.HasPrefix(step, "{") && !slices.Contains(inPath, step) || len(inPath) != strings.Count(path, "{") {
				t.Errorf("%s: the parameters of the path are %q", operation, inPath)
			}
		}
	}
}

// TestOpenAPI_Examples: every example is accepted, by the schema and by the service.
func TestOpenAPI_Examples(t *testing.T) {
	s, _ := savingServer(t, Config{})
	p := newProgram(t, s)
	d := readDescription(t)
	sent := 0
	for _, operation := range d.operations() {
		method, path, _ := strings.Cut(operation, " ")
		body := "/paths/" + escape(path) + "/" + strings.ToLower(method) + "/requestBody/content/application~1json"
		found, _ := d.at(t, body+"/examples")
		examples, _ := found.(map[string]any)
		for name := range examples {
			example, _ := d.at(t, body+"/examples/"+escape(name))
			text, err := json.Marshal(example.(map[string]any)["value"])
			if err != nil {
				t.Fatal(err)
			}
			if err := d.check(t, body+"/schema", text); err != nil {
				t.Errorf("%s: the example %s: %v", operation, name, err)
			}
			target, header := path, []string{"Content-Type", "application/json"}
			if method == http.MethodPut { // it changes what the same example made
				made := p.want(http.StatusCreated, "POST", strings.TrimSuffix(path, "/{id}"), string(text), header...)
				target, header = made.Header().Get("Location"), append(header, "If-Match", made.Header().Get("ETag"))
			}
			if w := p.do(method, target, string(text), header...); w.Code/100 != 2 {
				t.Errorf("%s: the example %s is answered %d: %s", operation, name, w.Code, w.Body)
			}
			sent++
		}
	}
	if sent < 10 {
		t.Errorf("only %d examples were sent", sent)
	}
}

// TestOpenAPI_EveryAnswer: every answer that the description names is given, and as
// it is described.
func TestOpenAPI_EveryAnswer(t *testing.T) {
	s, kept := savingServer(t, Config{MaxBodyBytes: 64 << 10})
	p := newProgram(t, s)
	text := exampleText(t)
	module := `{"module":` + keptPiece(t, record.KindModule) + `}`
	long := strings.Repeat(" ", 65<<10)

	p.want(304, "GET", "/api/openapi.json", "", "If-None-Match", p.want(200, "GET", "/api/openapi.json", "").Header().Get("ETag"))
	for _, list := range []struct{ path, body string }{{"/api/v1/size", text}, {"/api/v1/designs", text}, {"/api/v1/equipment", module}} {
		p.want(400, "POST", list.path, `{`)
		p.want(413, "POST", list.path, long)
		p.want(415, "POST", list.path, list.body, "Content-Type", "text/html")
		p.want(422, "POST", list.path, `{}`)
		if list.path == "/api/v1/size" {
			p.want(200, "POST", list.path, text)
			continue
		}
		p.want(200, "GET", list.path, "")
		p.want(400, "GET", list.path+"?colour=red", "")
		made := p.want(201, "POST", list.path, list.body)
		one, tag := made.Header().Get("Location"), made.Header().Get("ETag")
		p.want(200, "GET", one, "")
		p.want(304, "GET", one, "", "If-None-Match", tag)
		p.want(404, "GET", list.path+"/none", "")
		p.want(400, "PUT", one, `{`, "If-Match", tag)
		p.want(404, "PUT", list.path+"/none", list.body, "If-Match", tag)
		p.want(413, "PUT", one, long, "If-Match", tag)
		p.want(415, "PUT", one, list.body, "If-Match", tag, "Content-Type", "text/html")
		p.want(422, "PUT", one, `{}`, "If-Match", tag)
		p.want(428, "PUT", one, list.body)
		revised := p.want(200, "PUT", one, list.body, "If-Match", tag)
		p.want(412, "PUT", one, list.body, "If-Match", tag)
		p.want(400, "DELETE", one, "", "If-Match", "?")
		p.want(404, "DELETE", list.path+"/none", "", "If-Match", tag)
		p.want(412, "DELETE", one, "", "If-Match", tag)
		p.want(428, "DELETE", one, "")
		p.want(204, "DELETE", one, "", "If-Match", revised.Header().Get("ETag"))
		p.want(204, "POST", one+"/restore", "")
		p.want(404, "POST", list.path+"/none/restore", "")
		if list.path == "/api/v1/designs" {
			p.want(200, "GET", one+"/revisions", "")
			p.want(404, "GET", list.path+"/none/revisions", "")
			first := p.want(200, "GET", one+"/revisions/1", "")
			p.want(304, "GET", one+"/revisions/1", "", "If-None-Match", first.Header().Get("ETag"))
			p.want(404, "GET", one+"/revisions/9", "")
		}
	}
	underWay(t, p, kept, text, module)
	away := newProgram(t, awayServer(t))
	away.seen = p.seen
	for _, operation := range readDescription(t).operations() {
		method, path, _ := strings.Cut(operation, " ")
		target := strings.NewReplacer("{id}", "x", "{n}", "1").Replace(path)
		body := text
		if strings.HasPrefix(path, "/api/v1/equipment") {
			body = module
		}
		switch path {
		case "/api/openapi.json":
			away.want(200, method, target, "") // it needs no database
		case "/api/v1/size":
			away.want(200, method, target, body)
			full, _ := testServer(Config{MaxConcurrent: 1, QueueWait: 1})
			full.places <- struct{}{}
			busy := newProgram(t, full)
			busy.seen = p.seen
			busy.want(503, method, target, body)
		default:
			away.want(503, method, target, body, "If-Match", `"1"`)
		}
	}
	for _, operation := range readDescription(t).operations() {
		method, path, _ := strings.Cut(operation, " ")
		found, _ := readDescription(t).at(t, "/paths/"+escape(path)+"/"+strings.ToLower(method)+"/responses")
		for status := range found.(map[string]any) {
			if status != "default" && !p.seen[operation+" "+status] {
				t.Errorf("%s: the answer %s is described and was never given", operation, status)
			}
		}
	}
}

// awayServer is a server whose database cannot be reached.
func awayServer(t *testing.T) *Server {
	t.Helper()
	kept, err := store.Open(t.Context(), "host="+t.TempDir()+" dbname=none", nil)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(kept.Close)
	s, _ := testServer(Config{Saving: func() (Saving, error) { return kept, nil }})
	return s
}

// keptPiece is the module or inverter of the example design, without its id.
func keptPiece(t testing.TB, kind record.Kind) string {
	t.Helper()
	text, err := os.ReadFile("../sizing/design/testdata/example-design.json")
	if err != nil {
		t.Fatal(err)
	}
	var d map[string][]map[string]any
	_ = json.Unmarshal(text, &d) // what is no list of objects is left out
	piece := d[string(kind)+"s"][0]
	delete(piece, "id")
	piece["model"] = fmt.Sprint(piece["model"])
	out, err := json.Marshal(piece)
	if err != nil {
		t.Fatal(err)
	}
	return string(out)
}

// TestOpenAPI_Designs: the schema of a design accepts what the reader accepts; and
// where a field is taken away, is unknown, or is of another type, both refuse.
func TestOpenAPI_Designs(t *testing.T) {
	const schema = "/components/schemas/Design"
	d := readDescription(t)
	var files []string
	for _, pattern := range []string{"../sizing/design/testdata/*.json", "../tests/testdata/*.json"} {
		found, err := filepath.Glob(pattern)
		if err != nil {
			t.Fatal(err)
		}
		files = append(files, found...)
	}
	accepted := 0
	for _, file := range files {
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		doc := design.Read(text)
		if doc.Design == nil {
			continue
		}
		accepted++
		if err := d.check(t, schema, text); err != nil {
			t.Errorf("%s: %v", file, err)
		}
		if err := d.check(t, schema, design.AppendJSON(nil, doc.Design)); err != nil {
			t.Errorf("the canonical form of %s: %v", file, err)
		}
		if err := d.check(t, "/components/schemas/Result", sizing.Size(doc.Design).AppendJSON(nil)); err != nil {
			t.Errorf("the result of %s: %v", file, err)
		}
	}
	if accepted < 5 {
		t.Errorf("only %d of %d files are designs", accepted, len(files))
	}
	full, err := os.ReadFile("../sizing/design/testdata/full-design.json")
	if err != nil {
		t.Fatal(err)
	}
	var tree any
	one := strings.Replace(string(full), `"unit": 2`, `"unit": 1`, 1) // which of how many is a matter between two fields
	if err := json.Unmarshal([]byte(one), &tree); err != nil {
		t.Fatal(err)
	}
	changed := 0
	try := func(change string, strict bool) {
		text, err := json.Marshal(tree)
		if err != nil {
			t.Fatal(err)
		}
		changed++
		reads, fits := design.Read(text).Design != nil, d.check(t, schema, text)
		if reads && fits != nil {
			t.Errorf("%s: the reader accepts, the schema refuses: %v", change, fits)
		}
		if !reads && fits == nil && strict {
			t.Errorf("%s: the reader refuses, the schema accepts: %v", change, design.Read(text).Faults)
		}
	}
	var vary func(place string, part any)
	vary = func(place string, part any) {
		switch p := part.(type) {
		case map[string]any:
			free := place == "/sources" || strings.HasSuffix(place, "/value_asked")
			for _, name := range slices.Sorted(maps.Keys(p)) {
				was := p[name]
				delete(p, name)
				try("without "+place+"/"+name, true)
				for _, other := range []any{nil, true, "x", -1.0, 0.0, 0.5, 1e4, []any{}, map[string]any{}} {
					p[name] = other
					_, isText := other.(string)
					_, isNumber := other.(float64)
					// Whether a word, a reference, or a number is right can depend on others.
					try(fmt.Sprintf("%v at %s/%s", other, place, name), !isText && !isNumber && !free)
				}
				p[name] = was
				vary(place+"/"+name, was)
			}
			if !free {
				p["unknown"] = 1.0
				try("an unknown field in "+place, true)
				delete(p, "unknown")
			}
		case []any:
			vary(place+"/0", p[0])
		}
	}
	vary("", tree)
	if changed < 500 {
		t.Errorf("only %d changes were tried", changed)
	}
}
