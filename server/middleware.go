package server

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"net"
	"net/http"
	"net/netip"
	"runtime/debug"
	"slices"
	"strings"
	"time"

	"github.com/go-chi/chi/v5"
	"github.com/go-chi/chi/v5/middleware"
)

// recorder remembers what was answered.
type recorder struct {
	http.ResponseWriter
	status int // 0 until the answer has begun
	bytes  int64
}

func (w *recorder) WriteHeader(status int) {
	if w.status == 0 && status >= 200 {
		w.status = status
	}
	w.ResponseWriter.WriteHeader(status)
}

func (w *recorder) Write(b []byte) (int, error) {
	if w.status == 0 {
		w.status = http.StatusOK
	}
	n, err := w.ResponseWriter.Write(b)
	w.bytes += int64(n)
	return n, err
}

// Unwrap lets [http.ResponseController] reach the writer below.
func (w *recorder) Unwrap() http.ResponseWriter { return w.ResponseWriter }

// logRequests gives each request its id and writes one line about it when it is
// answered. The line has the pattern of the route rather than the address, so that
// nothing a visitor typed into an address is kept.
func (s *Server) logRequests(next http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		began := time.Now()
		v := &visit{requestID: s.cfg.NewRequestID()}
		rec := &recorder{ResponseWriter: w}
		rec.Header().Set("X-Request-Id", v.requestID)
		r = withVisit(r, v)
		defer func() {
			route := chi.RouteContext(r.Context()).RoutePattern()
			if route == "" {
				route = "none"
			}
			s.log.InfoContext(r.Context(), "request",
				"request_id", v.requestID, "method", r.Method, "route", route, "status", rec.status,
				"bytes", rec.bytes, "duration", time.Since(began), "client", r.RemoteAddr)
		}()
		next.ServeHTTP(rec, r)
	})
}

// recoverPanic makes an answer of a handler that panics.
func (s *Server) recoverPanic(next http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		defer func() {
			p := recover()
			if p == nil {
				return
			}
			if p == http.ErrAbortHandler {
				panic(p) // net/http's own way to drop a connection
			}
			rec, ok := w.(*recorder)
			begun := ok && rec.status != 0
			s.serveError(w, r, fmt.Errorf("panic: %v\n%s", p, debug.Stack()))
			if begun {
				panic(http.ErrAbortHandler) // the client must not take half an answer for a whole one
			}
		}()
		next.ServeHTTP(w, r)
	})
}

// contentPolicy lets a page use what this server sends as files and nothing else:
// no inline script or style, no frame, no other host.
const contentPolicy = "default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self'; " +
	"connect-src 'self'; form-action 'self'; base-uri 'none'; frame-ancestors 'none'"

func securityHeaders(next http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		h := w.Header()
		h.Set("Content-Security-Policy", contentPolicy)
		h.Set("X-Content-Type-Options", "nosniff")
		h.Set("Referrer-Policy", "same-origin")
		h.Set("Cross-Origin-Opener-Policy", "same-origin")
		h.Set("Cross-Origin-Resource-Policy", "same-origin")
		next.ServeHTTP(w, r)
	})
}

// onlyOwnHosts refuses a request that names another host than this server. A page
// elsewhere can point its own name at 127.0.0.1 and so reach a server that listens
// there (DNS rebinding); the browser still sends that page's name as the Host.
func (s *Server) onlyOwnHosts(next http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		if !s.ownHost(r.Host) {
			s.serveError(w, r, &statusError{
				status: http.StatusMisdirectedRequest,
				message: "This server does not answer to the host name of this request. " +
					"Open it by the address that it printed when it started, or start it with --host-name and the name that you use.",
				cause: fmt.Errorf("foreign host %q", r.Host),
			})
			return
		}
		next.ServeHTTP(w, r)
	})
}

// ownHost reports whether host, with or without a port, names this server.
func (s *Server) ownHost(host string) bool {
	name := host
	if n, _, err := net.SplitHostPort(host); err == nil {
		name = n
	}
	name = strings.ToLower(strings.TrimSuffix(strings.TrimPrefix(name, "["), "]"))
	if addr, err := netip.ParseAddr(name); err == nil {
		return s.cfg.AnyAddress || addr.Unmap().IsLoopback()
	}
	return name == "localhost" || slices.ContainsFunc(s.cfg.HostNames, func(own string) bool {
		return strings.EqualFold(own, name)
	})
}

// onlySameOrigin refuses what a page of another site makes a browser send.
// Programs, which send neither Origin nor Sec-Fetch-Site, pass.
func (s *Server) onlySameOrigin(next http.Handler) http.Handler {
	guard := http.NewCrossOriginProtection()
	guard.SetDenyHandler(s.handle(func(http.ResponseWriter, *http.Request) error {
		return &statusError{
			status:  http.StatusForbidden,
			message: "This request was sent by a page of another site, so it was not carried out.",
		}
	}))
	return guard.Handler(next)
}

// readBody reads the body before anything else is done for the request: no longer
// than MaxBodyBytes, within ReadTimeout.
func (s *Server) readBody(next http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		limit := s.cfg.MaxBodyBytes
		var b bytes.Buffer
		var err error
		if r.ContentLength > limit {
			err = &http.MaxBytesError{Limit: limit}
			w.Header().Set("Connection", "close") // the rest is not waited for
		} else {
			b.Grow(int(min(max(r.ContentLength, 0), 64<<10)) + bytes.MinRead) // the length is only claimed
			_, err = b.ReadFrom(http.MaxBytesReader(w, r.Body, limit))
		}
		if err != nil {
			s.serveError(w, r, bodyError(err))
			return
		}
		visitOf(r).body = b.Bytes()
		r.Body = io.NopCloser(bytes.NewReader(b.Bytes()))
		next.ServeHTTP(w, r)
	})
}

// bodyError says why a body could not be read.
func bodyError(err error) error {
	if tooLong, ok := errors.AsType[*http.MaxBytesError](err); ok {
		return &statusError{
			status:  http.StatusRequestEntityTooLarge,
			message: fmt.Sprintf("What was sent is longer than %d KiB, which is the most that this server reads.", tooLong.Limit>>10),
		}
	}
	if timeout, ok := errors.AsType[net.Error](err); ok && timeout.Timeout() {
		return &statusError{status: http.StatusRequestTimeout, message: "The request took too long to arrive.", cause: err}
	}
	return badRequest("The request broke off before its end.", err)
}

// takePlace lets no more than MaxConcurrent requests be worked on at the same time.
func (s *Server) takePlace(next http.Handler) http.Handler {
	full := &statusError{
		status:  http.StatusServiceUnavailable,
		message: "The server has as much to do as it can. Please try again in a few seconds.",
		header:  map[string]string{"Retry-After": "2"},
	}
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		select {
		case s.places <- struct{}{}:
		default:
			timer := time.NewTimer(s.cfg.QueueWait)
			defer timer.Stop()
			select {
			case s.places <- struct{}{}:
			case <-timer.C:
				s.serveError(w, r, full)
				return
			case <-r.Context().Done():
				s.serveError(w, r, r.Context().Err())
				return
			}
		}
		defer func() { <-s.places }()
		next.ServeHTTP(w, r)
	})
}

// compress sends pages gzipped to those who take it: a design page shrinks to less
// than a tenth. Results go as they are: a program on the same machine gains nothing.
func compress(next http.Handler) http.Handler {
	return middleware.Compress(5, "text/html", "text/css", "text/javascript", "image/svg+xml")(next)
}
