package form

import (
	"encoding/json"
	"fmt"
	"slices"
	"strings"

	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
)

// Read makes a document of the form and has it judged. The design is nil where
// there are faults. A fault's pointer leads to a field of the form wherever the
// form has one.
func (f *Form) Read() (*design.Design, design.Faults) {
	w := writer{form: f}
	w.object(&document, "")
	read := design.Read(w.dst)
	if len(w.faults) == 0 {
		return read.Design, read.Faults
	}
	return nil, w.judged(read.Faults)
}

// judged returns what is wrong with the form: what could not be read, and of the
// reader's faults those about other fields. What the form could not read went into
// the document as text; the reader's words about that would not be what the person
// needs.
func (w *writer) judged(read design.Faults) design.Faults {
	faults := w.faults
	for _, fault := range read {
		said := slices.ContainsFunc(w.faults, func(own design.Fault) bool {
			return FieldOf(own.Pointer) == FieldOf(fault.Pointer)
		})
		if !said {
			faults = append(faults, fault)
		}
	}
	return faults
}

// Document returns the form as a document, whole or not: a field with nothing in it
// is left out, and what cannot be read stands in it as the text that was typed.
func (f *Form) Document() []byte {
	w := writer{form: f}
	w.object(&document, "")
	return w.dst
}

// writer makes the JSON of a form.
type writer struct {
	form   *Form
	dst    []byte
	faults design.Faults // of what could not be read
}

// object writes the fields of a group.
func (w *writer) object(n *node, at string) {
	w.dst = append(w.dst, '{')
	first := true
	member := func(name string) {
		if !first {
			w.dst = append(w.dst, ',')
		}
		first = false
		w.dst = append(w.text(name), ':')
	}
	if at == "" {
		member("format")
		w.dst = w.text(design.Format)
	}
	for i := range n.kids {
		kid := &n.kids[i]
		pointer := at + "/" + kid.name
		if w.form.left(kid, pointer) {
			continue
		}
		member(kid.name)
		switch {
		case kid.list:
			w.dst = append(w.dst, '[')
			for k := range w.form.lens[pointer] {
				if k > 0 {
					w.dst = append(w.dst, ',')
				}
				w.object(kid, entry(pointer, k))
			}
			w.dst = append(w.dst, ']')
		case kid.kids != nil:
			w.object(kid, pointer)
		default:
			w.field(kid, pointer)
		}
	}
	if at == "" {
		sources := slices.DeleteFunc(w.form.Names("/sources/"), func(name string) bool { return blank(w.form.texts[name]) })
		if len(sources) > 0 {
			member("sources")
			w.sources(sources)
		}
	}
	w.dst = append(w.dst, '}')
}

// left reports whether a member is left out of the document.
func (f *Form) left(n *node, at string) bool {
	switch {
	case n.list:
		return n.optional && f.lens[at] == 0
	case n.kids != nil:
		return n.optional && !slices.ContainsFunc(n.kids, func(kid node) bool { return !f.left(&kid, at+"/"+kid.name) })
	case n.kind.twoPart():
		return blank(f.texts[at+"/value"])
	}
	return blank(f.texts[at]) && !n.mayBlank
}

func blank(s string) bool { return strings.TrimSpace(s) == "" }

// field writes the value of a field that holds something.
func (w *writer) field(n *node, at string) {
	typed := strings.TrimSpace(w.form.texts[at])
	switch n.kind {
	case Number, Count:
		w.dst = append(w.dst, w.decimal(at, typed, n.unit)...)
	case Temperature, Difference, Coefficient:
		w.measured(n, at)
	case Asked:
		if json.Valid([]byte(typed)) {
			w.dst = append(w.dst, typed...)
		} else {
			w.dst = w.text(typed)
		}
	default:
		w.dst = w.text(strings.ReplaceAll(typed, "\r\n", "\n"))
	}
}

// measured writes a value with its unit. °C is written as a bare number.
func (w *writer) measured(n *node, at string) {
	typed := strings.TrimSpace(w.form.texts[at+"/value"])
	chosen := strings.TrimSpace(w.form.texts[at+"/unit"])
	value, unit := w.reading(at, typed, chosen, n.kind)
	if n.kind != Coefficient && unit == "°C" {
		w.dst = append(w.dst, value...)
		return
	}
	w.dst = append(w.dst, `{"value":`...)
	w.dst = append(w.dst, value...)
	if unit != "" {
		w.dst = append(w.dst, `,"unit":`...)
		w.dst = w.text(unit)
	}
	w.dst = append(w.dst, '}')
}

// reading reads a value whose unit is chosen beside it or typed with it.
func (w *writer) reading(at, typed, chosen string, kind Kind) (value []byte, unit string) {
	number, own, err := readTyped(typed)
	refuse := func(found, expected, detail string) ([]byte, string) {
		w.faults = append(w.faults, design.Fault{Pointer: at, Found: found, Expected: expected, Detail: detail})
		return appendText(nil, typed), chosen
	}
	own, known := sameUnit(own, kind)
	switch {
	case err != nil:
		return refuse(quoted(typed), "a number, such as "+sampleOf(kind), fmt.Sprintf("%s cannot be read as a number: %v.", quoted(typed), err))
	case !known:
		return refuse(quoted(typed), "one of "+strings.Join(Units(at), ", "),
			fmt.Sprintf("%s is typed with the unit %s, which this value is not stated in.", quoted(typed), own))
	case own != "" && chosen != "" && own != chosen:
		return refuse(fmt.Sprintf("%s, with %s chosen", quoted(typed), chosen), "one unit",
			fmt.Sprintf("%s says %s, but the unit chosen beside it is %s. Which one is meant?", quoted(typed), own, chosen))
	case own == "" && chosen == "":
		w.faults = append(w.faults, design.Fault{Pointer: at, Found: quoted(typed) + " without a unit",
			Expected: "one of " + strings.Join(Units(at), ", "), Detail: "Choose the unit of " + quoted(typed) + "."})
		return number, ""
	case own != "":
		return number, own
	}
	return number, chosen
}

// decimal reads a number whose unit is printed beside the field.
func (w *writer) decimal(at, typed, unit string) []byte {
	number, own, err := readTyped(typed)
	refuse := func(expected, detail string) []byte {
		w.faults = append(w.faults, design.Fault{Pointer: at, Found: quoted(typed), Expected: expected, Detail: detail})
		return appendText(nil, typed)
	}
	if err != nil {
		return refuse("a number", fmt.Sprintf("%s cannot be read as a number: %v.", quoted(typed), err))
	}
	if own != "" && own != unit {
		if unit == "" {
			return refuse("a number without a unit", fmt.Sprintf("%s is typed with the unit %s; this value has none.", quoted(typed), own))
		}
		return refuse("a number of "+unit, fmt.Sprintf("%s is typed in %s; this value is asked for in %s.", quoted(typed), own, unit))
	}
	return number
}

// readTyped reads a number as it is typed, and the unit if one is typed with it.
func readTyped(typed string) (number []byte, unit string, err error) {
	reading, err := quantity.Typed(typed)
	return []byte(reading.Number), reading.Unit, err
}

// sources writes where values came from, by pointer.
func (w *writer) sources(names []string) {
	w.dst = append(w.dst, '{')
	for i, name := range names {
		if i > 0 {
			w.dst = append(w.dst, ',')
		}
		w.dst = append(w.text(unescape(strings.TrimPrefix(name, "/sources/"))), ':')
		w.dst = w.text(strings.TrimSpace(w.form.texts[name]))
	}
	w.dst = append(w.dst, '}')
}

func (w *writer) text(s string) []byte { return appendText(w.dst, s) }

// appendText appends s as a JSON string.
func appendText(dst []byte, s string) []byte {
	b, err := json.Marshal(strings.ToValidUTF8(s, "\uFFFD"))
	if err != nil {
		panic(err) // a text always has a JSON form
	}
	return append(dst, b...)
}

func quoted(s string) string { return "“" + s + "”" }
