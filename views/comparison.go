package views

import "strconv"

// Comparison is two designs side by side, as far as they differ.
type Comparison struct {
	Before, After ComparedSide
	Lead          string // what differs, in a sentence
	Verdicts      []TurnedGroup
	Asked         []Question // open after and not before
	Closed        []Question // open before and not after
	Inputs        []ChangeGroup
	Results       []ChangeGroup
	Moved         []ChangeGroup // checks that keep their verdict while their number moves
}

// ComparedSide is one of two designs that are compared.
type ComparedSide struct {
	Name     string // "Revision 3", "As it is"
	Verdict  Verdict
	Headline string
	Tally    string
}

// TurnedGroup is checks whose verdicts change in one way.
type TurnedGroup struct {
	Heading string
	Rows    []Turned
	Rest    string // checks that come or go and are within, in a sentence; "" if none
}

// Turned is a check whose verdict changes.
type Turned struct {
	Title, About  string
	Before, After TurnedTo
}

// TurnedTo is the verdict of a check on one side; "" where the check is not made there.
type TurnedTo struct {
	Verdict Verdict
	Says    string
}

// ChangeGroup is the values of one part that differ.
type ChangeGroup struct {
	Of   string
	Rows []Change
}

// Change is a value that differs; "" on the side that does not have it.
type Change struct {
	Name          string
	Before, After string
	By            string // the difference of two numbers, "" where there is none
}

func turnedID(i int) string { return "turned-" + strconv.Itoa(i) }
