package design

import (
	"fmt"
	"math"
	"strings"

	"rimeline/sizing/quantity"
)

// Document is one design of an input, or the reasons why it is refused.
type Document struct {
	Design    *Design // nil if refused
	Faults    Faults  // empty unless refused
	Malformed bool    // the text is not JSON; the rest of the input was not read
}

// ReadAll reads every document of an input: JSON values separated by white space,
// or by record separators (RFC 7464). It never returns an empty slice: an empty
// input is one refused document.
//
// A design shares memory with a copy of the input, not with input itself.
func ReadAll(input []byte) []Document {
	s, fault := begin(input)
	if fault != nil {
		return []Document{malformed(*fault)}
	}
	var documents []Document
	for {
		documents = append(documents, s.read())
		if documents[len(documents)-1].Malformed {
			return documents
		}
		end := s.pos
		s.skipBetween()
		switch {
		case s.pos == len(s.src):
			return documents
		case s.pos == end:
			s.fail("white space before the next document", "")
			return append(documents, malformed(*s.broken))
		}
	}
}

// Read reads an input that must hold exactly one document.
func Read(input []byte) Document {
	s, fault := begin(input)
	if fault != nil {
		return malformed(*fault)
	}
	document := s.read()
	if document.Malformed {
		return document
	}
	s.skipBetween()
	if s.pos < len(s.src) {
		s.fail("the end of the text", "One design is read here.")
		return malformed(*s.broken)
	}
	return document
}

func malformed(f Fault) Document { return Document{Faults: Faults{f}, Malformed: true} }

const byteOrderMark = "\uFEFF"

// begin steps to the first document, or returns why there can be none. A leading
// UTF-8 byte order mark, which some editors write, is skipped.
func begin(input []byte) (*scanner, *Fault) {
	switch {
	case len(input) > math.MaxInt32:
		return nil, &Fault{Found: fmt.Sprintf("%d bytes", len(input)), Expected: "less than 2 GiB", Detail: "The input is too large to be a design."}
	case len(input) >= 2 && (input[0] == 0xFE && input[1] == 0xFF || input[0] == 0xFF && input[1] == 0xFE):
		return nil, &Fault{Found: "text in UTF-16", Expected: "text in UTF-8", Detail: "Save the file with the encoding UTF-8: this one is in UTF-16."}
	}
	s := &scanner{src: strings.TrimPrefix(string(input), byteOrderMark)}
	s.nodes = make([]node, 0, min(16+len(input)/20, 4096)) // designs have a value every 20 bytes or so
	s.skipBetween()
	if s.pos == len(s.src) {
		return nil, &Fault{Found: "nothing", Expected: "a design", Detail: "The input is empty: a design document is expected."}
	}
	return s, nil
}

// read reads the document that starts at the scanner's position.
func (s *scanner) read() Document {
	if !s.document() {
		return malformed(*s.broken)
	}
	r := reader{nodes: s.nodes, numbers: make([]quantity.Exact, 0, s.numbers)}
	d := r.readDesign()
	if faults := r.collected(); faults != nil {
		return Document{Faults: faults}
	}
	return Document{Design: d}
}
