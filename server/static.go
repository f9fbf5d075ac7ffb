package server

import (
	"net/http"
	"strconv"

	"rimeline/static"
)

// staticFile sends a file whose address holds a hash of its content; the answer may
// therefore be kept for ever.
func (s *Server) staticFile(w http.ResponseWriter, r *http.Request) error {
	f, ok := static.Open(r.PathValue("file"))
	if !ok {
		return errNotFound
	}
	h := w.Header()
	h.Set("Cache-Control", "public, max-age=31536000, immutable")
	h.Set("Content-Type", f.ContentType)
	h.Set("Content-Length", strconv.Itoa(len(f.Content)))
	_, _ = w.Write(f.Content)
	return nil
}
