package working

import "rimeline/sizing/quantity"

// Step is one line of shown work.
type Step struct {
	Symbol      string         // what is found: "Voc,cold"
	Expression  string         // how, in symbols: "Voc × (1 + β ÷ 100 × (Tcold − 25))"
	WithNumbers string         // the same with the numbers put in; evaluates to Value exactly
	Value       quantity.Exact // the result
	Unit        string         // its unit: "V"; "" for a count
}

// Turn tells at which value of one input the verdict of a check would turn, every
// other input held.
type Turn struct {
	Pointer   string          // JSON Pointer of the number in the document
	At        quantity.Exact  // in the unit in which the document states it; for a whole number the first one with another verdict
	ChangePct *quantity.Exact // (At ÷ now − 1) × 100; nil where the input is now 0
	To        Verdict         // the verdict beyond At
}

// About says what a check is about. Exactly one of the shapes of the format page
// is filled: a strings entry, a tracker of an inverter unit, a plane, or an
// inverter unit; none for a check of the whole design.
type About struct {
	String   int // index of the strings entry, −1 where the check is about something else
	Inverter string
	Unit     int64
	Tracker  string
	Plane    string
}

// Reason names, in a code for programs, why a verdict is not decided by the value
// alone; display makes a sentence of it.
type Reason struct {
	Code    string // such as "short-circuit-limit-not-stated" or "open-question"
	Pointer string // the place in the document that it is about, "" if none
}

// Check is one judged rule with its working.
type Check struct {
	ID         string
	About      About
	Verdict    Verdict
	Value      *quantity.Exact // nil where there is nothing to measure
	Limit      *quantity.Exact
	Unit       string
	ReachedAtC *quantity.Exact // the temperature at which the limit would be met, where the check has one
	Cites      []string        // clauses, as "NEC 690.7(A)(1)"
	Steps      []Step          // the last one's value is Value
	Turns      []Turn
	Reasons    []Reason
}

// Question asks the person about a value that looks like a slip.
type Question struct {
	Pointer    string
	Asked      string // the question in a sentence
	Why        string // the numbers behind it
	Unsafe     bool   // while it is open, the checks that rest on the value are at best unconfirmed
	UnsafeFor  []string
	ValueAsked string // JSON of what an answer must state as value_asked
}
