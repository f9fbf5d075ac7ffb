package views

// RevisionsPage is the list of a design's revisions.
type RevisionsPage struct {
	Base     Base
	Title    string // of the design
	Design   string // its id
	Count    string // "4 revisions"
	Archived bool
	Request  string // key of the request that duplicates the design
	Said     *Said
	Rows     []RevisionRow
}

// RevisionRow is a revision in a list.
type RevisionRow struct {
	Number   string
	Saved    Moment
	By       string
	Verdict  Verdict
	Headroom string
	Note     string
	Base     string // the revision it was made from where that is not the one before; else ""
	From, To bool   // chosen at first to be compared
}

// RevisionPage is a revision as it was saved. It cannot be changed.
type RevisionPage struct {
	Base     Base
	Title    string
	Design   string
	Number   string
	Newest   string // number of the newest revision
	IsNewest bool
	Previous string // number of the one before, "" if none
	Saved    Moment
	By       string
	Note     string
	Engine   Recheck
	Parts    []Tab // the answer, the working, the sheet
	Carried  []HiddenField
}

// Recheck tells whether the engine of today finds what the one of then found.
type Recheck struct {
	Same    bool
	Heading string // where it is not the same
	Words   string
	Was     ComparedSide // what was found then
	Now     ComparedSide
	Changes []ChangeGroup // the checks that differ
	SHA256  string
}

// ComparePage is two revisions of a design side by side.
type ComparePage struct {
	Base   Base
	Title  string
	Design string
	From   []Choice
	To     []Choice
	Why    string // why there is nothing to compare; "" if there is
}

// ConflictPage is two versions of a design that were made from the same revision.
type ConflictPage struct {
	Base   Base
	Title  string
	Design string
	Lead   string        // what happened
	Mine   []HiddenField // the form of the version that was not saved, on top of the other
	Next   string        // number of the revision that it would become
	Newest string
	Kept   string // where the version that was not saved is kept, in a sentence
}

// startFrom is the query that fills the form with a revision; the newest fills it by
// itself.
func startFrom(p RevisionPage) string {
	if p.IsNewest {
		return ""
	}
	return "?from=" + p.Number
}
