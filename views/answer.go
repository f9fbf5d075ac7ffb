package views

// Verdict is one of the four words "within", "caution", "unconfirmed" and
// "outside". The mark beside it takes its shape from the CSS class of that name.
type Verdict string

// Answer is what the engine found for one design, in the order in which it is read.
type Answer struct {
	Verdict    Verdict
	Headline   string // the verdict in one sentence
	Tally      string // how many checks came to which verdict
	Fits       []Fit
	Charts     []Chart
	Kinds      []CheckKind // worst first
	Questions  []Question  // open ones only
	Coldest    []string    // what the coldest temperature's statistic says and what the other would mean
	Cautions   []Caution   // the few that stand beside the action
	NotChecked []string
}

// Fit says what one plane can put on one tracker, or on several alike.
type Fit struct {
	Where   string // "South plane on tracker t1"
	Range   string // "7 to 23 modules in series, up to 2 strings"
	Open    bool   // the range rests on something that is not confirmed
	Reasons []string
}

// Chart is one temperature chart with its text equivalent.
type Chart struct {
	Of     string // "Tracker t1"
	Says   string // what the drawing shows, in a sentence
	Wide   string // the SVG element, written and escaped by server/drawing
	Narrow string // the same, laid out for a phone
	Cold   string // heading of the column for the coldest: "Coldest −21.0 °C"
	STC    string
	Hot    string
	Lines  []ChartLine
	Levels []ChartLevel
}

// ChartLine is one line of a chart in numbers; "" where the engine has none.
type ChartLine struct {
	Name           string
	Cold, STC, Hot string
}

// ChartLevel is a horizontal limit of a chart.
type ChartLevel struct{ Name, Value string }

// CheckKind is all checks of one kind.
type CheckKind struct {
	ID      string // as on the format page, such as "voltage-ceiling"
	Title   string // "Cold voltage"
	Asks    string // the question it answers, in a sentence
	Verdict Verdict
	Checks  []Check
	Rest    string // on the sheet: the checks of this kind that are not printed, "" if none
}

// Check is one judged rule, or several equal ones of different subjects.
type Check struct {
	Number   string // "7.2", for reference: the second case of the seventh kind
	Anchor   string // id of the element; the same for the same subject while the design is edited
	Verdict  Verdict
	About    string
	Sentence string
	Steps    []Step
	// WorkingOf is the subject whose working stands for all, "" if that needs no saying.
	WorkingOf string
	Shown     string // how the value was rounded for the sentence, "" if it was not
	Limit     string // the limit and where it comes from, "" where there is none
	Cites     string
	Turns     []string
	Reasons   []string
}

// HasFacts reports whether there is anything to say beside the steps.
func (c Check) HasFacts() bool {
	return c.WorkingOf != "" || c.Shown != "" || c.Limit != "" || c.Cites != "" || len(c.Turns) > 0
}

// Step is one line of the working. The value carries its unit.
type Step struct {
	Symbol, Expression, WithNumbers, Value string
}

// Question is one open question about a value that looks like a slip.
type Question struct {
	Pointer string // of the field
	Field   string // its name in words
	Asked   string
	Why     string
	Effect  string // what it keeps unconfirmed, "" if nothing
}

// Caution is a standing safety caution.
type Caution struct{ Title, Text string }

// Row is one line of a two- or three-column table.
type Row struct{ Name, Value, Note string }

// orDash returns a dash for a cell of a table that has nothing to say.
func orDash(s string) string {
	if s == "" {
		return "–"
	}
	return s
}
