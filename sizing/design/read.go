package design

// Document is one design of an input, or the reasons why it is refused.
type Document struct {
	Design    *Design // nil if refused
	Faults    Faults  // empty unless refused
	Malformed bool    // the text is not JSON; the rest of the input was not read
}

// ReadAll reads every document of an input: JSON values separated by white space,
// or by record separators (RFC 7464). It never returns an empty slice: an empty
// input is one refused document.
func ReadAll(input []byte) []Document { panic("not built") }

// Read reads an input that must hold exactly one document.
func Read(input []byte) Document { panic("not built") }

// AppendJSON appends the canonical JSON of a design.
func AppendJSON(dst []byte, d *Design) []byte { panic("not built") }
