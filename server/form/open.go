package form

import (
	"bytes"
	"encoding/json"
	"fmt"
	"maps"
	"slices"
	"strconv"
)

// FromDocument fills a form with a document, also with one that the reader refuses:
// whatever the form has a field for is shown as it stands there. What the form has
// no field for is returned as pointers, so that a person can be told. An error
// means that the text is not a JSON object, or that it has more than a form holds.
func FromDocument(doc []byte) (f *Form, without []string, err error) {
	d := json.NewDecoder(bytes.NewReader(doc))
	d.UseNumber() // a number stays as it was written
	var root any
	if err := d.Decode(&root); err != nil {
		return nil, nil, err
	}
	object, ok := root.(map[string]any)
	if !ok {
		return nil, nil, fmt.Errorf("form: a design is a JSON object, not %s", kindOf(root))
	}
	f = empty()
	o := opener{form: f}
	o.object(&document, object, "")
	if f.entries() > MaxEntries {
		return nil, nil, ErrTooMany
	}
	return f, o.without, nil
}

// opener fills a form.
type opener struct {
	form    *Form
	without []string
}

func (o *opener) object(n *node, values map[string]any, at string) {
	for _, name := range sortedNames(values) {
		value, pointer := values[name], at+"/"+Escape(name)
		switch kid := n.kid(name); {
		case kid != nil:
			o.value(kid, value, pointer)
		case at == "" && name == "sources":
			o.sources(value)
		case at == "" && name == "format":
		default:
			o.without = append(o.without, pointer)
		}
	}
}

func (o *opener) value(n *node, value any, at string) {
	switch {
	case n.list:
		entries, ok := value.([]any)
		if !ok {
			o.without = append(o.without, at)
			return
		}
		o.form.lens[at] = len(entries)
		for k, one := range entries {
			o.group(n, one, entry(at, k))
		}
	case n.kids != nil:
		o.group(n, value, at)
	case n.kind.twoPart():
		o.measured(n, value, at)
	case n.kind == Asked:
		b, err := json.Marshal(value)
		if err != nil {
			panic(err) // it has just been decoded from JSON
		}
		o.form.texts[at] = string(b)
	default:
		o.form.texts[at] = plain(value)
	}
}

// group opens an object, or notes that there is something else in its place.
func (o *opener) group(n *node, value any, at string) {
	if object, ok := value.(map[string]any); ok {
		o.object(n, object, at)
		return
	}
	o.without = append(o.without, at)
}

func (o *opener) measured(n *node, value any, at string) {
	object, ok := value.(map[string]any)
	if !ok {
		o.form.texts[at+"/value"] = plain(value)
		if n.kind != Coefficient {
			o.form.texts[at+"/unit"] = "°C" // what a bare number means in a document
		}
		return
	}
	for _, name := range sortedNames(object) {
		if name == "value" || name == "unit" {
			o.form.texts[at+"/"+name] = plain(object[name])
		} else {
			o.without = append(o.without, at+"/"+Escape(name))
		}
	}
}

func (o *opener) sources(value any) {
	object, ok := value.(map[string]any)
	if !ok {
		o.without = append(o.without, "/sources")
		return
	}
	for _, of := range sortedNames(object) {
		o.form.texts["/sources/"+Escape(of)] = plain(object[of])
	}
}

// plain returns a value as it stands in a field: a text without its quotes, a
// number as it was written, anything else as JSON.
func plain(value any) string {
	switch v := value.(type) {
	case string:
		return v
	case json.Number:
		return v.String()
	case bool:
		return strconv.FormatBool(v)
	}
	b, err := json.Marshal(value)
	if err != nil {
		panic(err) // it has just been decoded from JSON
	}
	return string(b)
}

func kindOf(value any) string {
	switch value.(type) {
	case nil:
		return "null"
	case []any:
		return "a list"
	case string:
		return "a text"
	case json.Number:
		return "a number"
	}
	return "true or false"
}

func sortedNames(object map[string]any) []string { return slices.Sorted(maps.Keys(object)) }
