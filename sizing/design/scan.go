package design

import (
	"fmt"
	"strconv"
	"strings"
	"unicode/utf16"
	"unicode/utf8"
)

// maxDepth is how many objects and lists may stand inside each other. A design
// needs five; the limit keeps a hostile text from exhausting the stack.
const maxDepth = 32

type kind uint8

const (
	isObject kind = iota
	isList
	isText
	isNumber
	isTrue
	isFalse
	isNull
)

// node is one value of a scanned text. Its children are linked through first and next.
type node struct {
	kind       kind
	read       bool  // the schema asked for it
	start, end int32 // offsets in the text
	parent     int32
	first      int32 // 0: none, for the root, node 0, is nobody's child
	next       int32
	index      int32  // its place in a list
	name       string // its name in an object
	text       string // a text, unescaped; a number, as written
}

// scanner reads the JSON grammar (RFC 8259), and is stricter than it in three
// points: text is UTF-8 throughout, an escaped surrogate comes in a pair, and
// nesting ends at maxDepth.
type scanner struct {
	src     string
	pos     int
	nodes   []node // of the document being read
	numbers int    // how many of them are numbers
	broken  *Fault // why the text is not JSON
}

const recordSeparator = 0x1E // RFC 7464

// skipSpace steps over the white space of JSON.
func (s *scanner) skipSpace() {
	for s.pos < len(s.src) {
		switch s.src[s.pos] {
		case ' ', '\t', '\n', '\r':
			s.pos++
		default:
			return
		}
	}
}

// skipBetween steps over what may stand between documents.
func (s *scanner) skipBetween() {
	for {
		s.skipSpace()
		if s.pos == len(s.src) || s.src[s.pos] != recordSeparator {
			return
		}
		s.pos++
	}
}

// document scans one value into s.nodes, whose first is its root.
func (s *scanner) document() bool {
	s.nodes, s.numbers = s.nodes[:0], 0
	_, ok := s.value(0, 0)
	return ok
}

func (s *scanner) value(parent int32, depth int) (int32, bool) {
	if s.pos == len(s.src) {
		return 0, s.fail("a value", "")
	}
	n := int32(len(s.nodes))
	s.nodes = append(s.nodes, node{parent: parent, start: int32(s.pos)})
	ok := false
	switch c := s.src[s.pos]; {
	case c == '{' || c == '[':
		if depth == maxDepth {
			return 0, s.fail(fmt.Sprintf("no more than %d objects and lists inside each other", maxDepth), "")
		}
		s.pos++
		if c == '{' {
			ok = s.object(n, depth+1)
		} else {
			ok = s.list(n, depth+1)
		}
	case c == '"':
		s.nodes[n].kind = isText
		s.nodes[n].text, ok = s.text()
	case c == '-' || '0' <= c && c <= '9':
		s.nodes[n].kind = isNumber
		s.numbers++
		if ok = s.number(); ok {
			s.nodes[n].text = s.src[s.nodes[n].start:s.pos]
		}
	default:
		s.nodes[n].kind, ok = s.literal()
	}
	s.nodes[n].end = int32(s.pos)
	return n, ok
}

func (s *scanner) literal() (kind, bool) {
	word := leadingWord(s.src[s.pos:])
	k := isNull
	switch word {
	case "true":
		k = isTrue
	case "false":
		k = isFalse
	case "null":
	default:
		return 0, s.fail("a value", hintForValue(s.src[s.pos:], word))
	}
	s.pos += len(word)
	return k, true
}

// hintForValue says how to mend what people and other programs write where a value belongs.
func hintForValue(rest, word string) string {
	switch {
	case word == "NaN" || word == "Infinity":
		return "Leave a field out where there is no number for it."
	case word != "":
		return "A text stands in double quotes."
	case rest[0] == '\'' || strings.HasPrefix(rest, "“") || strings.HasPrefix(rest, "‘"):
		return `A text stands in straight double quotes, "…".`
	case rest[0] == '}' || rest[0] == ']':
		return "No comma stands before a closing bracket."
	case rest[0] == '+':
		return "A plus sign is not written."
	case rest[0] == '.':
		return "A zero stands before the decimal point."
	case strings.HasPrefix(rest, "\u2212") || strings.HasPrefix(rest, "–"):
		return "A minus is the character - of the keyboard."
	case rest[0] == '/' || rest[0] == '#':
		return "JSON has no comments."
	}
	return ""
}

func leadingWord(s string) string {
	n := 0
	for n < len(s) && (s[n] == '_' || 'a' <= s[n]|0x20 && s[n]|0x20 <= 'z') {
		n++
	}
	return s[:n]
}

func (s *scanner) object(n int32, depth int) bool {
	s.nodes[n].kind = isObject
	last := int32(0)
	for {
		s.skipSpace()
		if last == 0 && s.take('}') {
			return true
		}
		if s.pos == len(s.src) || s.src[s.pos] != '"' {
			return s.fail("a field name in double quotes", s.hintForName(last != 0))
		}
		name, ok := s.text()
		if !ok {
			return false
		}
		s.skipSpace()
		if !s.take(':') {
			return s.fail("a colon", "")
		}
		s.skipSpace()
		child, ok := s.value(n, depth)
		if !ok {
			return false
		}
		s.nodes[child].name = name
		s.link(n, last, child)
		last = child
		s.skipSpace()
		if s.take('}') {
			return true
		}
		if !s.take(',') {
			return s.fail("a comma or }", "")
		}
	}
}

func (s *scanner) hintForName(afterComma bool) string {
	if afterComma && s.pos < len(s.src) && s.src[s.pos] == '}' {
		return "No comma stands before a closing bracket."
	}
	return ""
}

func (s *scanner) list(n int32, depth int) bool {
	s.nodes[n].kind = isList
	last := int32(0)
	for index := int32(0); ; index++ {
		s.skipSpace()
		if last == 0 && s.take(']') {
			return true
		}
		child, ok := s.value(n, depth)
		if !ok {
			return false
		}
		s.nodes[child].index = index
		s.link(n, last, child)
		last = child
		s.skipSpace()
		if s.take(']') {
			return true
		}
		if !s.take(',') {
			return s.fail("a comma or ]", "")
		}
	}
}

func (s *scanner) link(parent, last, child int32) {
	if last == 0 {
		s.nodes[parent].first = child
	} else {
		s.nodes[last].next = child
	}
}

func (s *scanner) take(c byte) bool {
	if s.pos < len(s.src) && s.src[s.pos] == c {
		s.pos++
		return true
	}
	return false
}

func (s *scanner) digits() int {
	start := s.pos
	for s.pos < len(s.src) && '0' <= s.src[s.pos] && s.src[s.pos] <= '9' {
		s.pos++
	}
	return s.pos - start
}

func (s *scanner) number() bool {
	s.take('-')
	start := s.pos
	if s.digits() == 0 {
		return s.fail("a digit", "")
	}
	if s.src[start] == '0' && s.pos-start > 1 {
		s.pos = start
		return s.fail("a number without a leading zero", "")
	}
	if s.take('.') && s.digits() == 0 {
		return s.fail("a digit after the decimal point", "")
	}
	if s.take('e') || s.take('E') {
		if !s.take('-') {
			s.take('+')
		}
		if s.digits() == 0 {
			return s.fail("a digit of the exponent", "")
		}
	}
	return true
}

// text reads a quoted text and returns it unescaped. Without escapes it shares memory with the source.
func (s *scanner) text() (string, bool) {
	s.pos++ // the quote
	start := s.pos
	var unescaped []byte // what stood before start, where there was an escape
	for s.pos < len(s.src) {
		switch c := s.src[s.pos]; {
		case c == '"':
			part := s.src[start:s.pos]
			s.pos++
			if unescaped == nil {
				return part, true
			}
			return string(append(unescaped, part...)), true
		case c == '\\':
			unescaped = append(unescaped, s.src[start:s.pos]...)
			r, ok := s.escape()
			if !ok {
				return "", false
			}
			unescaped = utf8.AppendRune(unescaped, r)
			start = s.pos
		case c < ' ':
			return "", s.fail("a closing quote", `A line end inside a text is written \n, a tab \t.`)
		case c < utf8.RuneSelf:
			s.pos++
		default:
			r, size := utf8.DecodeRuneInString(s.src[s.pos:])
			if r == utf8.RuneError && size == 1 {
				return "", s.fail("text in UTF-8", "Save the file with the encoding UTF-8.")
			}
			s.pos += size
		}
	}
	return "", s.fail("a closing quote", "")
}

const escapes = "\"\"\\\\//b\bf\fn\nr\rt\t" // pairs: as written, what it stands for

func (s *scanner) escape() (rune, bool) {
	start := s.pos
	s.pos++
	if s.pos < len(s.src) {
		c := s.src[s.pos]
		for i := 0; i < len(escapes); i += 2 {
			if escapes[i] == c {
				s.pos++
				return rune(escapes[i+1]), true
			}
		}
		if c == 'u' {
			return s.escapedRune(start)
		}
	}
	return 0, s.fail(`one of " \ / b f n r t u after a backslash`, `A backslash itself is written \\.`)
}

func (s *scanner) escapedRune(start int) (rune, bool) {
	r, ok := s.fourHex()
	if !ok || !utf16.IsSurrogate(r) {
		return r, ok
	}
	if strings.HasPrefix(s.src[s.pos:], `\u`) {
		s.pos++
		second, ok := s.fourHex()
		if !ok {
			return 0, false
		}
		if pair := utf16.DecodeRune(r, second); pair != utf8.RuneError {
			return pair, true
		}
	}
	s.pos = start
	return 0, s.fail("a whole character", "Half of a surrogate pair is no character.")
}

// fourHex reads the u of an escape and its four digits.
func (s *scanner) fourHex() (rune, bool) {
	s.pos++
	r := rune(0)
	for range 4 {
		if s.pos == len(s.src) {
			return 0, s.fail("four hexadecimal digits", "")
		}
		c := s.src[s.pos]
		switch {
		case '0' <= c && c <= '9':
			r = r<<4 | rune(c-'0')
		case 'a' <= c|0x20 && c|0x20 <= 'f':
			r = r<<4 | rune(c|0x20-'a'+10)
		default:
			return 0, s.fail("four hexadecimal digits", "")
		}
		s.pos++
	}
	return r, true
}

// fail records why the text is not JSON at s.pos. It returns false, for its callers to return.
func (s *scanner) fail(expected, hint string) bool {
	found := s.foundHere()
	line, column := s.place()
	detail := fmt.Sprintf("Line %d, column %d: found %s where %s is expected.", line, column, found, expected)
	if strings.HasPrefix(expected, "no more") {
		detail = fmt.Sprintf("Line %d, column %d: there may be %s.", line, column, expected)
	}
	if hint != "" {
		detail += " " + hint
	}
	s.broken = &Fault{Found: found, Expected: expected, Detail: detail}
	return false
}

func (s *scanner) foundHere() string {
	rest := s.src[s.pos:]
	if rest == "" {
		return "the end of the text"
	}
	if word := leadingWord(rest); word != "" {
		return cut(word)
	}
	r, size := utf8.DecodeRuneInString(rest)
	switch {
	case r == utf8.RuneError && size == 1:
		return fmt.Sprintf("the byte %02X, which is not UTF-8", rest[0])
	case r == '\n' || r == '\r':
		return "the end of the line"
	case r == '\t':
		return "a tab"
	case !strconv.IsPrint(r):
		return fmt.Sprintf("the character U+%04X", r)
	}
	return rest[:size]
}

// place returns line and column of s.pos, counted from 1, columns in characters.
func (s *scanner) place() (line, column int) {
	before := s.src[:s.pos]
	line = 1 + strings.Count(before, "\n")
	before = before[strings.LastIndexByte(before, '\n')+1:]
	return line, 1 + utf8.RuneCountInString(before)
}

// maxFound is how many characters of a found value a fault repeats.
const maxFound = 60

func cut(s string) string {
	n := 0
	for i := range s {
		if n++; n > maxFound {
			return s[:i] + "…"
		}
	}
	return s
}
