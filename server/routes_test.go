package server

import (
	"flag"
	"fmt"
	"net/http"
	"os"
	"slices"
	"strings"
	"testing"

	"github.com/go-chi/chi/v5"
)

var update = flag.Bool("update", false, "write the golden files anew")

// TestRoutes_Listed compares the routes with the list that is kept. A router takes a
// second handler for the same address without a word, and an address that is gone
// breaks somebody's link; either shows here as a line of a diff.
func TestRoutes_Listed(t *testing.T) {
	const golden = "testdata/routes.txt"
	s, _ := testServer(Config{})
	var lines []string
	err := chi.Walk(s.router.(chi.Routes), func(method, route string, _ http.Handler, _ ...func(http.Handler) http.Handler) error {
		lines = append(lines, fmt.Sprintf("%s %s\n", method, route))
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	slices.Sort(lines)
	got := strings.Join(lines, "")
	if *update {
		if err := os.WriteFile(golden, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	if got != string(want) {
		t.Errorf("the routes are\n%s\nand not, as %s says,\n%s\nIf that is meant: go test ./server -run Routes -update", got, golden, want)
	}
}
