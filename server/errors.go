package server

import (
	"bytes"
	"cmp"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"net/http"
	"strconv"
	"strings"

	"github.com/go-chi/chi/v5"

	"rimeline/sizing/design"
	"rimeline/views"
)

// statusError is an error that knows its status and what the visitor may read.
type statusError struct {
	status  int
	message string            // sentences for the visitor; nothing of the program's inside
	cause   error             // for the log; nil if the message says it all
	header  map[string]string // further headers of the answer
	heading string            // of the page; "" is what the status means
	faults  design.Faults     // every reason why a document is refused
	newest  int64             // the number of what is newest, where the request rests on what is not; else 0
}

func (e *statusError) Error() string {
	if e.cause != nil {
		return fmt.Sprintf("%d: %v", e.status, e.cause)
	}
	return fmt.Sprintf("%d: %s", e.status, e.message)
}

func (e *statusError) Unwrap() error { return e.cause }

var errNotFound = &statusError{status: http.StatusNotFound, message: "There is no page at this address."}

// badRequest is a request that cannot be read.
func badRequest(message string, cause error) error {
	return &statusError{status: http.StatusBadRequest, message: message, cause: cause}
}

// methodNotAllowed refuses the method of a request and names those that the address takes.
func methodNotAllowed(routes chi.Routes) handler {
	return func(_ http.ResponseWriter, r *http.Request) error {
		var allowed []string
		for _, method := range []string{http.MethodGet, http.MethodHead, http.MethodPost, http.MethodPut, http.MethodDelete} {
			tried := method
			if tried == http.MethodHead {
				tried = http.MethodGet // GetHead answers HEAD wherever there is a GET
			}
			if routes.Match(chi.NewRouteContext(), tried, r.URL.Path) {
				allowed = append(allowed, method)
			}
		}
		allow := strings.Join(allowed, ", ")
		return &statusError{
			status:  http.StatusMethodNotAllowed,
			message: fmt.Sprintf("This address does not take %s. It takes %s.", r.Method, allow),
			header:  map[string]string{"Allow": allow},
		}
	}
}

// statusClientGone is what the log calls a request whose client did not wait for the answer.
const statusClientGone = 499

// describe says what an error is to the visitor, or to a program.
func describe(err error, forProgram bool) *statusError {
	if e, ok := errors.AsType[*statusError](err); ok {
		return e
	}
	if e := savingFailure(err, forProgram); e != nil {
		return e
	}
	if errors.Is(err, context.Canceled) {
		return &statusError{status: statusClientGone, message: "The request was given up."}
	}
	return &statusError{
		status:  http.StatusInternalServerError,
		message: "What was sent could not be worked on, and nothing was answered in its place. Please try again.",
	}
}

// serveError is the only place where an error becomes an answer: it chooses the
// status, logs the error and shows the visitor a message and the request's id. The
// text of an error that was not meant for visitors stays in the log.
func (s *Server) serveError(w http.ResponseWriter, r *http.Request, err error) {
	s.learn(err)
	forProgram := strings.HasPrefix(r.URL.Path, "/api/")
	f := describe(err, forProgram)
	id := visitOf(r).requestID
	log := s.log.InfoContext
	if f.status >= http.StatusInternalServerError {
		log = s.log.ErrorContext
	}
	log(r.Context(), "request refused or failed", "request_id", id, "status", f.status, "error", err)

	if rec, ok := w.(*recorder); ok && rec.status != 0 {
		s.log.ErrorContext(r.Context(), "a handler answered and returned an error", "request_id", id)
		return
	}
	for name, value := range f.header {
		w.Header().Set(name, value)
	}
	if forProgram {
		p := problem{Status: f.status, Detail: f.message, RequestID: id, Newest: f.newest}
		if f.faults != nil {
			p.Errors = design.AppendFaults(nil, f.faults)
		}
		writeProblem(w, p)
		return
	}
	heading := cmp.Or(f.heading, failureHeading(f.status))
	base := newBase(heading, "")
	base.Scripts = nil
	page := views.Failure(views.FailurePage{Base: base, Heading: heading, Message: f.message, RequestID: id})
	if err := s.render(w, r, f.status, page); err != nil {
		s.log.ErrorContext(r.Context(), "the page of an error failed too", "request_id", id, "error", err)
		http.Error(w, f.message+"\n\nRequest "+id, f.status)
	}
}

// failureHeading says in ordinary words what a status means.
func failureHeading(status int) string {
	switch status {
	case http.StatusNotFound:
		return "There is nothing here"
	case http.StatusRequestEntityTooLarge:
		return "That was too long"
	case http.StatusServiceUnavailable:
		return "Too busy at the moment"
	}
	if status >= http.StatusInternalServerError {
		return "Something failed on our side"
	}
	return "The request was not carried out"
}

// problem is an error of the JSON interface (RFC 9457). Its type is about:blank:
// the status says which kind it is, errors say the rest.
type problem struct {
	Type      string          `json:"type"`
	Title     string          `json:"title"`
	Status    int             `json:"status"`
	Detail    string          `json:"detail"`
	RequestID string          `json:"request_id,omitempty"`
	Newest    int64           `json:"newest,omitempty"` // as in statusError.newest
	Errors    json.RawMessage `json:"errors,omitempty"` // as in statusError.faults
}

func writeProblem(w http.ResponseWriter, p problem) {
	p.Type, p.Title = "about:blank", http.StatusText(p.Status)
	var body bytes.Buffer
	enc := json.NewEncoder(&body)
	enc.SetEscapeHTML(false) // the faults quote what was found
	if err := enc.Encode(p); err != nil {
		panic(err) // texts, a number and what AppendFaults wrote are always encoded
	}
	w.Header().Set("Content-Type", "application/problem+json")
	w.Header().Set("Cache-Control", "no-store")
	w.Header().Set("Content-Length", strconv.Itoa(body.Len()))
	w.WriteHeader(p.Status)
	_, _ = w.Write(body.Bytes())
}
