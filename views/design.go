package views

// DesignPage is the form of a design beside its answer.
type DesignPage struct {
	Base     Base
	Fresh    bool // nothing has been typed yet: the script may offer what was typed before
	Keeping  Keeping
	Faults   *Faults
	Title    Field
	Sections []Section
	Answer   AnswerPane
}

// Faults is the summary at the top of a form that was refused.
type Faults struct {
	Heading string
	Lead    string // "" if there is nothing to add
	Links   []Link
}

// Link leads to a field. Href is "" where the page has no field for what is said.
type Link struct{ Href, Words string }

// Section is one numbered part of the form.
type Section struct {
	ID      string
	Number  string
	Heading string
	Lead    string // what belongs here, in a sentence
	Folded  bool   // may be folded away; the page works without it
	Open    bool   // of a folded section: it is not folded now
	Groups  []Group
	Empty   string // said where there are no groups
	Add     *Button
}

// Group is a set of fields that belong together: a module, a tracker, a strings entry.
type Group struct {
	ID      string
	Heading string // "" where the section's heading says it
	Label   string // what the group is called where there is no heading
	Class   string // CSS class of its layout
	Hidden  []HiddenField
	Fields  []Field
	Folds   []Fold
	Groups  []Group
	Buttons []Button
	Add     *Button
	Kept    *KeptOffer // of a module or an inverter, where equipment is kept
}

// KeptOffer leads from a module or an inverter of a design to the equipment that is
// kept, and back.
type KeptOffer struct {
	ID      string // of the list
	Name    string
	Label   string
	Choices []Choice // none where nothing is kept
	Take    Button
	Keep    Button
	Said    string // what has just been done, "" if nothing was
	Link    *Link
}

// Fold is fields that may be folded away.
type Fold struct {
	ID     string
	Words  string
	Note   string
	Open   bool
	Fields []Field
}

// AnswerPane is the right-hand side of a design: the answer, or what it waits for.
type AnswerPane struct {
	Answer  *Answer  // nil while it waits
	Waiting *Waiting // nil once there is an answer
	Slots   []Slot   // the questions of each field that may be asked about
}

// Waiting says what an answer still needs.
type Waiting struct {
	Headline string
	Short    string // the same for the line at the foot of a small screen
	Unread   []Link // what stands in a field and cannot be taken
	Missing  []WaitingFor
	More     string // how many further ones are not listed, "" if none
}

// WaitingFor is what is missing in one part of the form.
type WaitingFor struct {
	Of     string
	Fields []Link
}

// Slot is the questions that belong beside one field.
type Slot struct {
	ID    string
	Asked []Asked
}

// CarriedPage is a page about a design that takes the form's texts along, so that
// every way back to the form leads to what was typed.
type CarriedPage struct {
	Base    Base
	Carried []HiddenField
	Here    string // path of the page: "/design/working"
}
