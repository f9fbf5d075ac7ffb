package server

import (
	"fmt"
	"mime"
	"net/http"
	"slices"
	"strconv"
	"strings"
	"sync"

	"rimeline/sizing"
	"rimeline/sizing/design"
)

// apiSize answers one design with its result, whatever the verdict.
func (s *Server) apiSize(w http.ResponseWriter, r *http.Request) error {
	d, err := postedDesign(r)
	if err != nil {
		return err
	}
	buf := results.Get().(*[]byte)
	body := append(sizing.Size(d).AppendJSON((*buf)[:0]), '\n')
	w.Header().Set("Content-Type", "application/json")
	w.Header().Set("Cache-Control", "no-store")
	w.Header().Set("Content-Length", strconv.Itoa(len(body)))
	_, _ = w.Write(body)
	if cap(body) <= largestKeptResult {
		*buf = body
		results.Put(buf)
	}
	return nil
}

// results are buffers that results were written into, for the next ones; one that
// grew large for a large design is let go.
var results = sync.Pool{New: func() any { return new(make([]byte, 0, 64<<10)) }}

const largestKeptResult = 1 << 20

// postedDesign reads the design that a request carries.
func postedDesign(r *http.Request) (*design.Design, error) {
	if err := requireJSON(r); err != nil {
		return nil, err
	}
	doc := design.Read(visitOf(r).body)
	switch {
	case doc.Malformed:
		return nil, malformed(doc.Faults)
	case doc.Design == nil:
		return nil, refused("The design was refused; errors lists every reason.", doc.Faults)
	}
	return doc.Design, nil
}

// malformed is a body that is not JSON.
func malformed(faults design.Faults) error {
	return &statusError{
		status: http.StatusBadRequest, faults: faults,
		message: "What was sent is not one JSON document; errors says where it goes wrong.",
	}
}

// refused is a body with faults.
func refused(message string, faults design.Faults) error {
	return &statusError{status: http.StatusUnprocessableEntity, faults: faults, message: message}
}

// unlabelled are the content types that clients put on a body which they know
// nothing about. They do not say that it is something else than JSON.
var unlabelled = []string{"", "application/x-www-form-urlencoded", "application/octet-stream", "text/plain"}

// requireJSON refuses a body that calls itself something else than JSON.
func requireJSON(r *http.Request) error {
	header := r.Header.Get("Content-Type")
	kind, _, err := mime.ParseMediaType(header)
	if header == "" {
		kind, err = "", nil
	}
	isJSON := kind == "application/json" || kind == "text/json" || strings.HasPrefix(kind, "application/") && strings.HasSuffix(kind, "+json")
	if err != nil || !isJSON && !slices.Contains(unlabelled, kind) {
		return &statusError{
			status:  http.StatusUnsupportedMediaType,
			message: fmt.Sprintf("The body calls itself %q; a design is sent as application/json.", header),
		}
	}
	if encoding := r.Header.Get("Content-Encoding"); encoding != "" && !strings.EqualFold(encoding, "identity") {
		return &statusError{
			status:  http.StatusUnsupportedMediaType,
			message: fmt.Sprintf("The body is encoded as %q; a design is sent as it is.", encoding),
			header:  map[string]string{"Accept-Encoding": "identity"},
		}
	}
	return nil
}
