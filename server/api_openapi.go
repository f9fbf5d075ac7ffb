package server

import (
	"crypto/sha256"
	_ "embed"
	"fmt"
	"net/http"
	"strconv"
)

// openAPI describes the interface for programs. A test holds it against the routes and
// the answers.
//
//go:embed openapi.json
var openAPI []byte

var openAPITag = fmt.Sprintf(`"%x"`, sha256.Sum256(openAPI))

// apiDescription answers the description of the interface.
func (s *Server) apiDescription(w http.ResponseWriter, r *http.Request) error {
	h := w.Header()
	h.Set("Cache-Control", "no-cache")
	h.Set("ETag", openAPITag)
	if unchanged(r, openAPITag) {
		w.WriteHeader(http.StatusNotModified)
		return nil
	}
	h.Set("Content-Type", "application/json")
	h.Set("Content-Length", strconv.Itoa(len(openAPI)))
	_, _ = w.Write(openAPI)
	return nil
}
