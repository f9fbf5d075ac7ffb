package views

// DesignsPage is the list of saved designs.
type DesignsPage struct {
	Base     Base
	Said     *Said
	Refused  *Refusal
	Words    string        // what is searched for, as typed
	Verdicts []Choice      // the filter by verdict
	States   []Tab         // in use, archived
	Keep     []HiddenField // what a search keeps of the list's state
	Narrowed bool          // a search or a filter is on
	All      string        // address of the list without search and filter
	Count    string        // "1 to 50 of 213 designs"
	Columns  []Column
	Rows     []DesignRow
	Empty    string // said where there are no rows
	Archived bool
	Back     string // query of the list as it is shown, for what leads back to it
	Request  string // key of the requests of this page
	Previous string // address of the page before, "" if none
	Next     string
	Drafts   []DraftLink
}

// Tab is one of several lists.
type Tab struct {
	Words, Href string
	Here        bool
}

// Column is the head of a column of a list.
type Column struct {
	Words  string
	Class  string
	Href   string // sorts by it; "" where the list cannot
	Sorted string // "ascending", "descending"; "" if the list is not sorted by it
	Unseen bool   // the words are for who cannot see the column
}

// DesignRow is a saved design in a list.
type DesignRow struct {
	ID       string
	Title    string
	Site     string
	Verdict  Verdict
	Headroom string // "7.3 °C"; "" where none is known
	Revision string
	Updated  Moment
}
