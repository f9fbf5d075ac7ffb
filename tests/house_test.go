// Package tests holds what needs the whole site or the whole tree: published
// examples, the oracle, the browser, faults, and the rules of the house. It may use
// every room; no room may use it.
package tests

import (
	"bytes"
	"encoding/json"
	"errors"
	"go/ast"
	"go/parser"
	"go/token"
	"io"
	"io/fs"
	"maps"
	"os"
	"os/exec"
	"path"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"
)

const module = "rimeline"

// root is the top of the tree; tests run in their own folder.
const root = ".."

// room is a row of the import table: what the packages in it may use, beside the
// standard library.
type room struct {
	may     []string // rooms of ours
	outside []string // modules of others
	why     string
}

// engine is the rooms of the engine, tier by tier; each may use those of lower tiers.
var engine = [][]string{
	{"sizing/quantity"},
	{"sizing/working"},
	{"sizing/rulebook", "sizing/design"},
	{"sizing/climate", "sizing/ivcurve"},
	{"sizing/stringing", "sizing/circuit", "sizing/roof"},
	{"sizing/arrange"},
	{"sizing"},
}

// importTable is the import table of DEVELOPERS.md. It may be changed when the work
// asks for it: the table there, the row here and its reason together.
func importTable() map[string]room {
	table := map[string]room{
		"views":      {outside: []string{"github.com/a-h/templ"}, why: "a page is given finished strings, so that nothing is decided in a template"},
		"static":     {why: "files know nothing of who sends them"},
		"migrations": {why: "files know nothing of who runs them"},
	}
	var below []string
	for _, tier := range engine {
		for _, name := range tier {
			table[name] = room{may: slices.Clone(below), why: "the engine is a library that could be published alone, and a lower tier is understood without a higher one"}
		}
		below = append(below, tier...)
	}
	table["server/record"] = room{may: below, why: "what is saved, and who may do what, is decided without a database or a request at hand"}
	below = append(below, "server/record")
	table["server/form"] = room{may: below, why: "a form becomes a document of texts; the reader in sizing/design judges it"}
	table["server/display"] = room{may: slices.Concat(below, []string{"views", "server/drawing"}), why: "sentences are made of results, without a request at hand"}
	table["server/drawing"] = room{may: slices.Clone(below), why: "a drawing is made of numbers, without a request at hand"}
	table["server/intake"] = room{may: below, why: "a file becomes records, or faults by row, without a request at hand"}
	table["server/sheet"] = room{may: slices.Concat(below, []string{"server/display", "server/drawing"}), why: "one model of the sheet has many writers, none of which needs a request"}
	table["server/access"] = room{may: []string{"server/record"}, why: "passwords and sessions know people and nothing of designs"}
	table["server/store"] = room{
		may:     slices.Concat(below, []string{"migrations"}),
		outside: []string{"github.com/jackc/pgx/v5"},
		why:     "the only room that knows the database, so that its errors and its words stop here",
	}
	table["server/localpg"] = room{outside: []string{"github.com/jackc/pgx/v5"}, why: "a private Postgres knows nothing of what is kept in it"}
	table["server"] = room{
		may: slices.Concat(below, []string{"views", "static", "server/form", "server/display", "server/drawing", "server/intake",
			"server/sheet", "server/access", "server/store"}),
		outside: []string{"github.com/a-h/templ", "github.com/go-chi/chi/v5"},
		why:     "the server knows requests and pages; it puts the other rooms together",
	}
	return table
}

// everything is the rooms that may use all others.
var everything = []string{"cmd/rimeline", "tests"}

// goPackage is what the tests need of a package.
type goPackage struct {
	ImportPath, Dir, Name, Doc string
	Imports                    []string
	Standard                   bool
}

// room is the package's place in the tree: "server/form".
func (p goPackage) room() string {
	return strings.TrimPrefix(strings.TrimPrefix(p.ImportPath, module), "/")
}

func listPackages(t *testing.T) []goPackage {
	t.Helper()
	cmd := exec.CommandContext(t.Context(), "go", "list", "-json=ImportPath,Dir,Name,Doc,Imports", "./...")
	cmd.Dir = root
	var stderr bytes.Buffer
	cmd.Stderr = &stderr
	out, err := cmd.Output()
	if err != nil {
		t.Fatalf("go list: %v\n%s", err, &stderr)
	}
	var packages []goPackage
	for dec := json.NewDecoder(bytes.NewReader(out)); ; {
		var p goPackage
		if err := dec.Decode(&p); errors.Is(err, io.EOF) {
			return packages
		} else if err != nil {
			t.Fatal(err)
		}
		packages = append(packages, p)
	}
}

func isEverything(name string) bool {
	return slices.ContainsFunc(everything, func(e string) bool { return name == e || strings.HasPrefix(name, e+"/") })
}

func TestHouse_ImportTable(t *testing.T) {
	table := importTable()
	for _, p := range listPackages(t) {
		name := p.room()
		if isEverything(name) {
			for _, used := range p.Imports {
				if !strings.HasPrefix(name, "tests") && strings.HasPrefix(used, module+"/tests") {
					t.Errorf("%s uses %s: what helps the tests must not come into the program", name, used)
				}
			}
			continue
		}
		row, ok := table[name]
		if !ok {
			t.Errorf("%s is a room that the import table does not have: say there, and in DEVELOPERS.md, what it may use and why", name)
			continue
		}
		for _, used := range p.Imports {
			if fault := judgeImport(name, row, used); fault != "" {
				t.Errorf("%s uses %s: %s. The reason: %s", name, used, fault, row.why)
			}
		}
	}
}

// judgeImport says what is wrong with a room using a package, "" if nothing is.
func judgeImport(name string, row room, used string) string {
	if ours, ok := strings.CutPrefix(used, module+"/"); ok {
		if !slices.Contains(row.may, ours) {
			return "the import table does not allow it"
		}
		return ""
	}
	if first, _, _ := strings.Cut(used, "/"); strings.Contains(first, ".") {
		if !slices.ContainsFunc(row.outside, func(m string) bool { return used == m || strings.HasPrefix(used, m+"/") }) {
			return "each library is used by the rooms that the import table names, and by no other"
		}
		return ""
	}
	if inEngine(name) && slices.ContainsFunc(worldly, func(w string) bool { return used == w || strings.HasPrefix(used, w+"/") }) {
		return "the engine has no clock, no chance, no input or output, no context and no log: the same design gives the same result"
	}
	return ""
}

func inEngine(name string) bool { return name == "sizing" || strings.HasPrefix(name, "sizing/") }

// worldly is the packages of the standard library that bring the world in.
var worldly = []string{"context", "crypto", "database", "io", "log", "math/rand", "net", "os", "plugin", "runtime", "sync", "syscall", "testing", "time"}

// TestHouse_ImportTable_CanFail: the judge of the test above refuses what it should.
func TestHouse_ImportTable_CanFail(t *testing.T) {
	table := importTable()
	for _, c := range []struct {
		name, used string
		refused    bool
	}{
		{"sizing/quantity", "math/big", false},
		{"sizing/quantity", "rimeline/sizing/working", true},
		{"sizing/working", "rimeline/sizing/quantity", false},
		{"sizing/rulebook", "rimeline/sizing/design", true}, // the same tier
		{"sizing/stringing", "time", true},
		{"sizing", "os", true},
		{"sizing", "github.com/a-h/templ", true},
		{"server/form", "net/url", false},
		{"server/form", "rimeline/server/display", true},
		{"server/form", "rimeline/views", true},
		{"server/display", "rimeline/views", false},
		{"views", "github.com/a-h/templ/runtime", false},
		{"views", "rimeline/sizing", true},
		{"server", "github.com/go-chi/chi/v5/middleware", false},
		{"server", "github.com/go-chi/chi", true},
		{"server", "rimeline/cmd/rimeline", true},
		{"static", "rimeline/views", true},
		{"server", "github.com/jackc/pgx/v5", true},
		{"server/store", "github.com/jackc/pgx/v5/pgxpool", false},
		{"server/record", "rimeline/server/store", true},
	} {
		if got := judgeImport(c.name, table[c.name], c.used); (got != "") != c.refused {
			t.Errorf("judgeImport(%s, %s) = %q, refused should be %t", c.name, c.used, got, c.refused)
		}
	}
}

// TestHouse_TestHelpStaysInTests: what is made for tests is in no program that people
// run.
func TestHouse_TestHelpStaysInTests(t *testing.T) {
	for _, p := range listPackages(t) {
		if strings.HasPrefix(p.room(), "tests/") {
			continue // such as the load program, which nobody ships
		}
		for _, used := range p.Imports { // of its files that are no tests
			if strings.HasPrefix(used, module+"/tests") {
				t.Errorf("%s uses %s outside its tests: help for tests would be linked into the program", p.room(), used)
			}
		}
	}
	set, files := goFiles(t)
	for name, file := range files {
		if slices.Contains([]string{"server/localpg", "tests/testdb"}, path.Dir(name)) {
			continue
		}
		ast.Inspect(file, func(n ast.Node) bool {
			if id, ok := n.(*ast.Ident); ok && id.Name == "UnsafeForTests" {
				t.Errorf("%s sets UnsafeForTests: what somebody saved could be lost with the power", set.Position(id.Pos()))
			}
			return true
		})
	}
}

func TestHouse_PackageComments(t *testing.T) {
	for _, p := range listPackages(t) {
		doc := p.Doc
		if p.room() == "tests" {
			continue // its comment is above; go list does not read test files
		}
		if begin := "Package " + p.Name + " "; p.Name != "main" && !strings.HasPrefix(doc, begin) {
			t.Errorf("%s: the package comment does not begin with %q. It tells a newcomer what the room knows and what it must not know", p.room(), begin)
		}
		if p.Name == "main" && doc == "" {
			t.Errorf("%s: the command has no comment that says what it does", p.room())
		}
	}
}

// treeFiles is the files of the tree, as slash paths below its top, without what git
// ignores or does not know of yet.
func treeFiles(t *testing.T) []string {
	t.Helper()
	cmd := exec.CommandContext(t.Context(), "git", "ls-files", "-z")
	cmd.Dir = root
	if out, err := cmd.Output(); err == nil && len(out) > 0 {
		files := strings.Split(strings.TrimRight(string(out), "\x00"), "\x00")
		return slices.DeleteFunc(files, func(f string) bool {
			_, err := os.Stat(filepath.Join(root, f))
			return err != nil // removed, and not committed yet
		})
	}
	var files []string // an unpacked archive
	err := filepath.WalkDir(root, func(p string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		rel, err := filepath.Rel(root, p)
		files = append(files, filepath.ToSlash(rel))
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return files
}

func TestHouse_TopLevel(t *testing.T) {
	known := strings.Fields("go.mod go.sum README.md DEVELOPERS.md LICENSE cmd server sizing views migrations static tests")
	top := map[string]bool{}
	for _, f := range treeFiles(t) {
		first, _, _ := strings.Cut(f, "/")
		top[first] = true
	}
	for _, name := range slices.Sorted(maps.Keys(top)) {
		if !strings.HasPrefix(name, ".") && !slices.Contains(known, name) {
			t.Errorf("%s stands at the top of the tree. A newcomer reads the top first; put it into the room that it belongs to", name)
		}
	}
}

// thirdParty reports whether a file was written by others and is kept as it came.
func thirdParty(file string) bool {
	return strings.HasPrefix(file, "tests/testdata/axe/") || strings.HasSuffix(file, ".min.js") || file == "go.sum"
}

// foreign finds what ties a file to one machine or one way to fetch packages. The
// parts are put together here so that this file does not hold them.
var foreign = regexp.MustCompile(strings.Join([]string{
	`(^|[\s"'=(` + "`" + `])/(wo` + `rk|ro` + `ot|ho` + `me|Us` + `ers)/`, // a folder of somebody's machine
	`/tm` + `p/`,
	`proxy\.gol` + `ang\.org`, `registry\.npm` + `js\.org`, `py` + `pi\.org`, `deb\.deb` + `ian\.org`,
}, "|"))

func TestHouse_NoMachineInTheTree(t *testing.T) {
	for _, f := range treeFiles(t) {
		if thirdParty(f) {
			continue
		}
		content, err := os.ReadFile(filepath.Join(root, f))
		if err != nil {
			t.Fatal(err)
		}
		if bytes.IndexByte(content, 0) >= 0 {
			continue // a picture
		}
		n := 0
		for line := range bytes.Lines(content) {
			n++
			if found := foreign.Find(line); found != nil {
				t.Errorf("%s:%d holds %q: the tree must work on any machine, whatever its folders and its package sources are", f, n, found)
			}
		}
	}
}

func TestHouse_NoMachineInTheTree_CanFail(t *testing.T) {
	for text, want := range map[string]bool{
		`dir := "/ro` + `ot/x"`:             true,
		"see /ho" + "me/ann/notes":          true,
		"https://proxy.gol" + "ang.org/x":   true,
		"server/work/list.go":               false,
		`href="/design/working"`:            false,
		"t.TempDir() + \"/homework/a.txt\"": false,
	} {
		if got := foreign.MatchString(text); got != want {
			t.Errorf("foreign finds something in %q: %t, want %t", text, got, want)
		}
	}
}

// goFiles parses the Go files of the tree that are not tests and were not generated.
func goFiles(t *testing.T) (*token.FileSet, map[string]*ast.File) {
	t.Helper()
	set, files := token.NewFileSet(), map[string]*ast.File{}
	for _, f := range treeFiles(t) {
		if !strings.HasSuffix(f, ".go") || strings.HasSuffix(f, "_test.go") || strings.HasSuffix(f, "_templ.go") {
			continue
		}
		parsed, err := parser.ParseFile(set, filepath.Join(root, f), nil, parser.SkipObjectResolution)
		if err != nil {
			t.Fatal(err)
		}
		files[f] = parsed
	}
	return set, files
}

// uses lists where a file uses name of the package imported by importPath.
func uses(file *ast.File, importPath, name string) []token.Pos {
	local := ""
	for _, imp := range file.Imports {
		if p, _ := strconv.Unquote(imp.Path.Value); p == importPath {
			local = path.Base(importPath)
			if imp.Name != nil {
				local = imp.Name.Name
			}
		}
	}
	var found []token.Pos
	ast.Inspect(file, func(n ast.Node) bool {
		if s, ok := n.(*ast.SelectorExpr); ok && local != "" && s.Sel.Name == name {
			if x, ok := s.X.(*ast.Ident); ok && x.Name == local {
				found = append(found, s.Pos())
			}
		}
		return true
	})
	return found
}

func TestHouse_WhereTheWorldComesIn(t *testing.T) {
	rules := []struct {
		importPath, name string
		rooms            []string
		why              string
	}{
		{"os", "Getenv", []string{"cmd/rimeline", "tests/load", "tests/testdb"}, "the environment is read in one place, so that everything else can be tested without it"},
		{"os", "LookupEnv", []string{"cmd/rimeline"}, "the environment is read in one place, so that everything else can be tested without it"},
		{"os", "Args", []string{"cmd/rimeline", "tests/load"}, "flags are read in one place"},
		{"os", "Exit", []string{"cmd/rimeline", "tests/load"}, "only the command ends the program"},
		{"time", "Now", []string{"server", "tests/load"}, "a time is passed in, so that the same input gives the same bytes; the server times its requests"},
		{"math/rand", "Int", nil, "chance comes from a given seed"},
	}
	set, files := goFiles(t)
	for name, file := range files {
		for _, rule := range rules {
			if slices.Contains(rule.rooms, path.Dir(name)) {
				continue
			}
			for _, pos := range uses(file, rule.importPath, rule.name) {
				t.Errorf("%s uses %s.%s: %s", set.Position(pos), path.Base(rule.importPath), rule.name, rule.why)
			}
		}
	}
}

// TestHouse_ExactDecimals: where a verdict is made, numbers are exact.
func TestHouse_ExactDecimals(t *testing.T) {
	exact := []string{"sizing", "sizing/quantity", "sizing/working", "sizing/rulebook", "sizing/design", "sizing/stringing"}
	set, files := goFiles(t)
	for name, file := range files {
		if !slices.Contains(exact, path.Dir(name)) {
			continue
		}
		ast.Inspect(file, func(n ast.Node) bool {
			if id, ok := n.(*ast.Ident); ok && (id.Name == "float64" || id.Name == "float32" || id.Name == "ParseFloat") {
				t.Errorf("%s uses %s: a limit that is met exactly is within, one digit beyond it exceeds; binary fractions cannot tell", set.Position(id.Pos()), id.Name)
			}
			return true
		})
	}
}

// TestHouse_TemplatesFresh makes the templates' Go files again, elsewhere, and
// compares them with those in the tree.
func TestHouse_TemplatesFresh(t *testing.T) {
	if testing.Short() || raceDetector {
		t.Skip("the generator is slow to build; the full run has this test")
	}
	build := exec.CommandContext(t.Context(), "go", "tool", "templ", "version")
	build.Dir = root
	if out, err := build.CombinedOutput(); err != nil {
		t.Fatalf("go tool templ version: %v\n%s", err, out)
	}
	locate := exec.CommandContext(t.Context(), "go", "tool", "-n", "templ")
	locate.Dir = root
	out, err := locate.Output()
	if err != nil {
		t.Fatalf("go tool -n templ: %v", err)
	}
	generator := strings.TrimSpace(string(out))
	dir := t.TempDir()
	// The generated files name their source as it is seen from where the generator
	// ran, so the copy has the same folders below its top.
	committed := map[string][]byte{}
	for _, f := range treeFiles(t) {
		isTemplate, isGenerated := strings.HasSuffix(f, ".templ"), strings.HasSuffix(f, "_templ.go")
		if !isTemplate && !isGenerated && f != "go.mod" {
			continue
		}
		content, err := os.ReadFile(filepath.Join(root, f))
		if err != nil {
			t.Fatal(err)
		}
		if isGenerated {
			committed[f] = content
			continue
		}
		to := filepath.Join(dir, f)
		if err := os.MkdirAll(filepath.Dir(to), 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(to, content, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	generate := exec.CommandContext(t.Context(), generator, "generate")
	generate.Dir = dir
	if out, err := generate.CombinedOutput(); err != nil {
		t.Fatalf("templ generate: %v\n%s", err, out)
	}
	fresh, err := filepath.Glob(filepath.Join(dir, "*", "*_templ.go"))
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range fresh {
		rel, err := filepath.Rel(dir, p)
		if err != nil {
			t.Fatal(err)
		}
		content, err := os.ReadFile(p)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(content, committed[filepath.ToSlash(rel)]) {
			t.Errorf("%s is not what its template says: run \"go tool templ generate\" at the top of the tree and commit it, so that a fresh clone builds without the generator", rel)
		}
		delete(committed, filepath.ToSlash(rel))
	}
	for name := range committed {
		t.Errorf("%s has no template any more: delete it", name)
	}
}
