package views

// StartPage is the first page of the site.
type StartPage struct {
	Base     Base
	Saving   string // what is kept here, and where, in sentences
	Recent   []DesignRow
	Drafts   []DraftLink
	Cautions []Caution
}
