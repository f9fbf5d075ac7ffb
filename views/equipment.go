package views

// EquipmentListPage is the list of the modules or the inverters that people keep.
type EquipmentListPage struct {
	Base     Base
	Said     *Said
	Kind     string        // "module" or "inverter"
	Words    string        // what is searched for, as typed
	Keep     []HiddenField // what a search keeps of the list's state
	Narrowed bool
	All      string // address of the list without the search
	Kinds    []Tab
	States   []Tab // in use, archived
	Count    string
	Columns  []Column
	Rows     []EquipmentRow
	Empty    string
	Archived bool
	Back     string // query of the list as it is shown
	Previous string
	Next     string
}

// EquipmentRow is a module or an inverter in a list.
type EquipmentRow struct {
	ID      string
	Name    string // the model
	Maker   string
	Figures []EquipmentFigure
	Uses    string // "3 designs", "" if none
	Updated Moment
}

// EquipmentFigure is a number of a row, with the head of its column.
type EquipmentFigure struct {
	Name   string
	Number string // "" where there is none
	Fill   string // spaces that set its point under the others'
	Unit   string // "" where the text has it
}

// EquipmentPage is the form of a module's or an inverter's data.
type EquipmentPage struct {
	Base     Base
	Heading  string
	Kicker   string // what it is and what is known of where it is kept
	Action   string // address to which the form is sent
	ID       string // "" for one that is not kept yet
	Said     *Said
	Refused  *Refusal
	Earlier  *Link // what an earlier press of the button kept
	Stale    *StaleEquipment
	Faults   *Faults
	Copied   string // what it is a copy of, and what to look up; "" if of nothing
	Archived *Action
	Hidden   []HiddenField
	Parts    []EquipmentPart
	Note     Field
	Keep     string // words of the button
	Used     *UsedIn
	Back     string // address of the list
}

// EquipmentPart is values of one subject, each with where it stands on the datasheet.
type EquipmentPart struct {
	ID      string
	Heading string
	Lead    string
	Hidden  []HiddenField
	Lines   []SourcedField
	Buttons []Button
	Add     *Button
}

// SourcedField is a value with where it comes from; nil where that is not asked for.
type SourcedField struct {
	Field  Field
	Source *Field
}

// StaleEquipment is what was saved meanwhile, beside what was typed.
type StaleEquipment struct {
	Heading string
	Lead    string
	Rows    []StaleRow
}

// StaleRow is a field that differs.
type StaleRow struct {
	Name         string
	Mine, Theirs string
	Take         Button // takes theirs into the form
}

// UsedIn is the designs that carry a copy.
type UsedIn struct {
	Says    string
	Designs []UsedDesign
}

// UsedDesign is a design that carries a copy.
type UsedDesign struct {
	ID      string
	Title   string
	Verdict Verdict
	Note    string // "revision 3", "archived"
	Updated Moment
}
