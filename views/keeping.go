package views

import "strconv"

// Keeping is what the page of a design says of where the design is kept, and the
// ways to keep it.
type Keeping struct {
	Origin   []HiddenField // where the form comes from; they belong to the form and stand outside of what is renewed
	Autosave bool          // the script keeps what is typed on the server
	Done     string        // for the script: "saved", "kept" as a draft; "" if neither
	Away     string        // why nothing can be saved at the moment and what to do, in sentences; "" if it can
	Note     string        // what changed, as typed
	Saved    *SavedAs      // nil for a design that was never saved
	Draft    *DraftNow     // nil if the form does not hold a draft
	Said     *Said         // what has just been done
	Refused  *Refusal      // why what was asked has not been done
	Offer    *DraftOffer   // a draft that may be restored
	Further  []DraftLink   // more drafts of the same design
}

// SavedAs is the revision that a form was made from.
type SavedAs struct {
	Design   string // its id
	Says     string // "Revision 3, saved "; or a whole sentence where the time is not known
	Saved    Moment
	By       string
	Archived bool
}

// DraftNow is the draft that a form holds.
type DraftNow struct {
	ID, Version string
	Kept        Moment
	By          string
	Of          string // what it was made from, and what was saved since, in a sentence
}

// Said tells what has just been done, and how to undo it.
type Said struct {
	Words string
	Undo  *Action
}

// Action is a button that does something to what is saved.
type Action struct {
	Words  string
	Spoken string // what it acts on, for who cannot see where it stands
	Path   string
	Fields []HiddenField
}

// Refusal says why something was not done. It stands at the top, with the focus.
type Refusal struct {
	Heading string
	Lead    string
}

// DraftOffer is a draft beside the revision that the page shows.
type DraftOffer struct {
	ID, Version string
	Kept        Moment
	By          string
	Of          string // what it was made from, where that is not what the page shows; else ""
	Count       string // "2 inputs differ"
	Now         string // "Revision 3"
	Changes     []ChangeGroup
	Open        bool // the changes are few enough to be shown at once
}

// DraftLink is a draft in a list.
type DraftLink struct {
	ID    string
	Title string
	Kept  Moment
	By    string
}

func furtherDrafts(n int) string {
	if n == 1 {
		return "There is a further draft of this design: "
	}
	return "There are " + strconv.Itoa(n) + " further drafts of this design: "
}
