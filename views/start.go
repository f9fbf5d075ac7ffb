package views

// StartPage is the first page of the site.
type StartPage struct {
	Base     Base
	Cautions []Caution
}
