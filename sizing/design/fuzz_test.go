package design

import (
	"bytes"
	"encoding/json"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/google/go-cmp/cmp"
)

// FuzzReadAll: no input makes the reader panic; each document is accepted or
// refused with reasons; what is accepted survives being written; and what is
// called JSON is what encoding/json calls so, but for the strictness that the
// scanner's comment names.
func FuzzReadAll(f *testing.F) {
	f.Add(example(f))
	f.Add(full(f))
	f.Add([]byte("\x1e{}\n\x1e[1e3, \"\\ud83d\\ude00\", null]\n"))
	f.Add([]byte(`{"format":"rimeline-design/1","title":"x","Title":null,"modules":[{"voc_v":"1","voc_v":-1}]}`))
	f.Fuzz(func(t *testing.T, input []byte) {
		documents := ReadAll(input)
		if len(documents) == 0 {
			t.Fatal("no document")
		}
		for k, d := range documents {
			if (d.Design == nil) == (len(d.Faults) == 0) || d.Malformed && (d.Design != nil || k != len(documents)-1) {
				t.Fatalf("document %d is neither accepted nor refused: %+v", k+1, d)
			}
			if refusal := AppendRefusal(nil, k+1, d.Faults); !json.Valid(refusal) || !utf8.Valid(refusal) || bytes.ContainsAny(refusal, "\n\r") {
				t.Fatalf("the refusal is not a line of JSON: %s", refusal)
			}
			if d.Design != nil {
				checkRoundTrip(t, d.Design)
			}
		}
		if one := Read(input); len(documents) == 1 {
			if diff := cmp.Diff(documents[0], one, sameNumber); diff != "" {
				t.Fatalf("Read and ReadAll differ:\n%s", diff)
			}
			checkGrammar(t, input, one)
		}
	})
}

func checkRoundTrip(t *testing.T, d *Design) {
	t.Helper()
	text := AppendJSON(nil, d)
	again := Read(text)
	if again.Design == nil {
		t.Fatalf("refused when written: %v\n%s", again.Faults, text)
	}
	if diff := cmp.Diff(d, again.Design, sameNumber); diff != "" {
		t.Fatalf("changed by writing:\n%s", diff)
	}
	if second := AppendJSON(nil, again.Design); !bytes.Equal(text, second) {
		t.Fatalf("written as\n%s\nand then\n%s", text, second)
	}
}

// checkGrammar compares with encoding/json, which knows no byte order mark and no
// record separators, and is laxer in what the scanner refuses by its own comment.
func checkGrammar(t *testing.T, input []byte, d Document) {
	t.Helper()
	plain := bytes.TrimPrefix(input, []byte(byteOrderMark))
	plain = bytes.Trim(plain, " \t\r\n\x1e")
	valid := json.Valid(plain)
	if !d.Malformed && !valid {
		t.Fatalf("read as JSON, which encoding/json does not: %q", input)
	}
	if d.Malformed && valid {
		detail := d.Faults[0].Detail
		for _, stricter := range []string{"UTF-8", "surrogate", "inside each other"} {
			if strings.Contains(detail, stricter) {
				return
			}
		}
		t.Fatalf("encoding/json reads %q; here: %s", input, detail)
	}
}
