package tests

import (
	"bytes"
	"encoding/json"
	"fmt"
	"strconv"
	"strings"
)

// object and list are a JSON document that tests take apart and change.
type (
	object = map[string]any
	list   = []any
)

func readDocument(text []byte) object {
	dec := json.NewDecoder(bytes.NewReader(text))
	dec.UseNumber()
	var doc object
	if err := dec.Decode(&doc); err != nil {
		panic(fmt.Sprintf("%v: %s", err, text))
	}
	return doc
}

func documentText(doc object) []byte {
	text, err := json.Marshal(doc)
	if err != nil {
		panic(err)
	}
	return text
}

func copyDocument(doc object) object { return readDocument(documentText(doc)) }

var unescapePointer = strings.NewReplacer("~1", "/", "~0", "~")

// at is the value under a JSON Pointer, and whether there is one.
func at(doc object, pointer string) (any, bool) {
	var here any = doc
	for _, name := range strings.Split(pointer, "/")[1:] {
		switch parent := here.(type) {
		case object:
			child, ok := parent[unescapePointer.Replace(name)]
			if !ok {
				return nil, false
			}
			here = child
		case list:
			i, err := strconv.Atoi(name)
			if err != nil || i >= len(parent) {
				return nil, false
			}
			here = parent[i]
		default:
			return nil, false
		}
	}
	return here, true
}

// put sets the value under a JSON Pointer; the place above it must exist.
func put(doc object, pointer string, value any) bool {
	cut := strings.LastIndexByte(pointer, '/')
	name := unescapePointer.Replace(pointer[cut+1:])
	var parent any = doc
	if cut > 0 {
		var ok bool
		if parent, ok = at(doc, pointer[:cut]); !ok {
			return false
		}
	}
	switch parent := parent.(type) {
	case object:
		parent[name] = value
		return true
	case list:
		if i, err := strconv.Atoi(name); err == nil && i < len(parent) {
			parent[i] = value
			return true
		}
	}
	return false
}
