package server

import (
	"bytes"
	"context"
	"net/http"
	"strconv"

	"github.com/a-h/templ"
)

// handler answers a request or returns why it could not; then it has written nothing.
type handler func(w http.ResponseWriter, r *http.Request) error

// handle makes an [http.HandlerFunc] of h. An error goes to serveError, the only
// place that turns one into an answer.
func (s *Server) handle(h handler) http.HandlerFunc {
	return func(w http.ResponseWriter, r *http.Request) {
		if err := h(w, r); err != nil {
			s.serveError(w, r, err)
		}
	}
}

// render answers with a page. The page is made in full before the first byte is
// sent, so that one which fails is an error and not half a page.
func (s *Server) render(w http.ResponseWriter, r *http.Request, status int, page templ.Component) error {
	var b bytes.Buffer
	if err := page.Render(r.Context(), &b); err != nil {
		return err
	}
	h := w.Header()
	h.Set("Content-Type", "text/html; charset=utf-8")
	h.Set("Cache-Control", "no-cache, private")
	h.Set("Content-Length", strconv.Itoa(b.Len()))
	w.WriteHeader(status)
	_, _ = w.Write(b.Bytes()) // a client that has gone away is no failure of ours
	return nil
}

// visit is what the server keeps about a request while it lasts.
type visit struct {
	requestID string
	body      []byte // read in full before the handler is called; see readBody
}

type visitKey struct{}

// visitOf returns the visit of a request; it is empty outside the site's middleware.
func visitOf(r *http.Request) *visit {
	if v, ok := r.Context().Value(visitKey{}).(*visit); ok {
		return v
	}
	return &visit{}
}

func withVisit(r *http.Request, v *visit) *http.Request {
	return r.WithContext(context.WithValue(r.Context(), visitKey{}, v))
}

// health says that the process answers. It takes no place, so that it answers when
// the server is full.
func (s *Server) health(w http.ResponseWriter, r *http.Request) error {
	w.Header().Set("Content-Type", "text/plain; charset=utf-8")
	w.Header().Set("Cache-Control", "no-store")
	_, _ = w.Write([]byte("ok\n"))
	return nil
}
