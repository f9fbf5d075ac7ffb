package record

import (
	"time"

	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// Listing asks for a page of the saved designs. The zero value asks for the newest
// that are in use.
type Listing struct {
	Words    string           // each of them must begin a word of the title, the site, or a maker or model that the newest revision uses; "" is all
	Verdict  *working.Verdict // only those with it; nil is all
	Archived bool             // the archived ones in place of those in use
	Sort     Sort             // "" is SortUpdated
	Reversed bool             // the other way round than Sort says
	Cursor   string           // DesignPage.Next or .Previous of the same Sort and Reversed; "" is the first page
	Limit    int              // how many at most; 0 is 50, and more than 200 is 200
}

// Sort is an order of a list.
type Sort string

const (
	SortUpdated  Sort = "updated"  // newest first
	SortTitle    Sort = "title"    // as people read: A beside a, "House 2" before "House 10"
	SortVerdict  Sort = "verdict"  // worst first, and the newest first among equals
	SortHeadroom Sort = "headroom" // unknown first, then the least
	SortName     Sort = "name"     // of equipment: by maker, then by model
)

// DesignPage is a page of the list of designs.
type DesignPage struct {
	Designs  []Design
	Next     string // the cursor of the page after it, "" if there is none
	Previous string // the cursor of the page before it, "" if there is none
	Total    int    // how many there are on all pages, counted up to CountedTo
	More     bool   // there are more than Total
}

// CountedTo is how far the entries of a list are counted.
const CountedTo = 1000

// RevisionSummary is a revision without its document and result.
type RevisionSummary struct {
	Number    int
	Base      int
	SHA256    [32]byte
	Engine    string
	Rulebook  string
	Title     string
	Site      string
	Verdict   working.Verdict
	HeadroomC *quantity.Exact
	Note      string
	Saved     Stamp
}

// EquipmentListing asks for a page of the equipment people keep. The zero value asks
// for modules and inverters in use, by name.
type EquipmentListing struct {
	Kind     Kind   // "" is both
	Words    string // each of them must begin a word of the maker or model; "" is all
	Archived bool   // the archived ones in place of those in use
	Sort     Sort   // SortName or SortUpdated; "" is SortName
	Reversed bool
	Cursor   string
	Limit    int
}

// EquipmentPage is a page of the list of equipment; its fields mean what those of
// [DesignPage] mean.
type EquipmentPage struct {
	Equipment []Equipment
	Next      string
	Previous  string
	Total     int
	More      bool
}

// EquipmentName is a module or an inverter as it is offered to be chosen.
type EquipmentName struct {
	ID    ID
	Kind  Kind
	Maker string
	Model string
}

// Answer is what an HTTP request was answered, kept so that a repetition of the
// request is answered the same.
type Answer struct {
	Status int
	Header map[string]string // those that belong to the answer: Content-Type, ETag, Location
	Body   []byte
	At     time.Time // when it was kept, by the database's clock
}
