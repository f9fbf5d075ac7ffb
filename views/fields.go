package views

import (
	"strings"

	"github.com/a-h/templ"
)

// FieldID returns the id of the element for a field of the design form, by the
// field's JSON Pointer; an anchor to it is "#" and the id.
func FieldID(pointer string) string {
	return "f" + idSigns.Replace(pointer)
}

var idSigns = strings.NewReplacer("/", "-", "~", "_", " ", "_")

// Field is one thing to type or to choose, with its label.
type Field struct {
	ID      string // of the element that takes the focus
	Name    string // its JSON Pointer, with /value where the unit has a field of its own
	Label   string
	Symbol  string // as datasheets print it: "Voc"; "" if there is none
	Spoken  string // words that the label lacks for who cannot see where it stands: "of tracker 2"
	Hint    string // one sentence
	Value   string // as typed
	Unit    string // printed beside it
	Whole   bool   // a whole number
	Long    bool   // several lines of text
	May     bool   // may be left empty, and stands among those that may not
	Focus   bool   // takes the focus when the page opens
	Width   string // a CSS class of how wide it may be: w2, w3, w4, w6 of six columns
	Choices []Choice
	Units   *UnitChoice // the unit's own field, nil where there is none
	Twin    *Twin       // the same value in another unit, nil where there is none
	Fault   string      // what is wrong with it
	Rename  string      // name of the hidden field that keeps the value as the page has it; "" for none
	Renews  bool        // which fields other parts of the form have depends on it
	Slot    string      // id of the place for questions about the value; "" where none are asked
	Asked   []Asked
}

// Choice is one option of a list.
type Choice struct {
	Value, Words string
	Chosen       bool
}

// UnitChoice is the field of a unit.
type UnitChoice struct {
	ID, Name string
	Label    string
	Choices  []Choice
}

// Twin is a temperature in the other unit.
type Twin struct {
	Kind string // "temperature" or "difference"
	Says string // "= −5.8 °F"; "" where there is nothing to convert
}

// Asked is a question about a value that looks like a slip, with the box for the
// reason why it is right.
type Asked struct {
	ID       string // of the box
	Index    string // number among the answers
	Pointer  string
	Value    string // JSON of the value that it was asked about
	Question string // "" where the question is closed by the reason
	Why      string
	Effect   string        // what it keeps unconfirmed
	Earlier  string        // a reason that was given for another value, "" if none
	Kept     []HiddenField // the earlier reason's own fields
	Reason   string        // as typed
}

// HiddenField is a field that the page keeps without showing it.
type HiddenField struct{ Name, Value string }

// Button does something to the form when it is pressed.
type Button struct {
	Do     string // what, as the server reads it: "add /modules"
	Words  string
	Spoken string // words for who cannot see where it stands
	Focus  bool   // takes the focus when the page opens
}

// inputAttributes lead from an input to its hint, fault and twin, and say what else it does.
func inputAttributes(f Field) templ.Attributes {
	var by []string
	if f.Fault != "" {
		by = append(by, f.ID+"-fault")
	}
	if f.Twin != nil {
		by = append(by, f.ID+"-twin")
	}
	if f.Hint != "" {
		by = append(by, f.ID+"-hint")
	}
	a := templ.Attributes{}
	if len(by) > 0 {
		a["aria-describedby"] = strings.Join(by, " ")
	}
	if f.Fault != "" {
		a["aria-invalid"] = "true"
	}
	if f.Focus {
		a["autofocus"] = true
	}
	if f.Renews {
		a["hx-post"], a["hx-vals"], a["hx-trigger"] = "/design", `{"do": "show"}`, "change"
		a["hx-target"], a["hx-select"], a["hx-swap"] = "#strings", "#strings", "outerHTML"
		a["hx-select-oob"] = "#planes" // the names that strings refer to must be of the same moment
	}
	return a
}
