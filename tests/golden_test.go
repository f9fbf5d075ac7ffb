package tests

import (
	"bytes"
	"encoding/json"
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

var update = flag.Bool("update", false, "write the golden files of testdata anew")

const resultSuffix = ".result.json"

// goldenDesigns are the designs of testdata by file name.
func goldenDesigns(t *testing.T) map[string][]byte {
	t.Helper()
	names, err := filepath.Glob("testdata/*.json")
	if err != nil {
		t.Fatal(err)
	}
	designs := map[string][]byte{}
	for _, name := range names {
		if strings.HasSuffix(name, resultSuffix) {
			continue
		}
		text, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		designs[name] = text
	}
	if len(designs) == 0 {
		t.Fatal("no designs in testdata")
	}
	return designs
}

// TestGolden compares the whole result of each design of testdata with the one
// beside it. A change of these files is a change of what people are told: read it.
func TestGolden(t *testing.T) {
	for name, text := range goldenDesigns(t) {
		t.Run(filepath.Base(name), func(t *testing.T) {
			line, err := sizeText(text)
			if err != nil {
				t.Fatal(err)
			}
			var got bytes.Buffer
			if err := json.Indent(&got, line, "", "  "); err != nil {
				t.Fatal(err)
			}
			got.WriteByte('\n')
			beside := strings.TrimSuffix(name, ".json") + resultSuffix
			if *update {
				if err := os.WriteFile(beside, got.Bytes(), 0o644); err != nil {
					t.Fatal(err)
				}
				return
			}
			want, err := os.ReadFile(beside)
			if err != nil {
				t.Fatalf("%v; go test ./tests -run TestGolden -update writes it", err)
			}
			if diff := cmp.Diff(string(want), got.String()); diff != "" {
				t.Errorf("result differs from %s (-want +got):\n%s", beside, diff)
			}
		})
	}
}

// TestGolden_AgreesWithOracle: the golden designs too are sized by the oracle.
func TestGolden_AgreesWithOracle(t *testing.T) {
	for name, text := range goldenDesigns(t) {
		found, err := compareText(text)
		if err != nil {
			t.Errorf("%s: %v", name, err)
		}
		for _, f := range found {
			t.Errorf("%s: %s at %s: engine %s, oracle %s", name, f.kind, f.place, f.engine, f.oracle)
		}
	}
}
