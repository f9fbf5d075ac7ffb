// Package record is what is saved: designs, their working drafts and revisions, and
// the equipment people keep; the kinds of error, and who acted.
//
// It is pure: it knows neither the database nor HTTP, reads no clock and makes no
// ids. It knows the engine's documents and results.
package record

import (
	"time"

	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// ID names a saved thing. It is opaque.
type ID string

// Actor is who did something. Every call that changes what is saved names one.
type Actor struct {
	ID   string
	Name string
}

// Nobody is the actor while the service has no accounts.
var Nobody = Actor{ID: "local", Name: "someone at this service"}

// Design is a saved design as the list of designs shows it: its newest revision in short.
type Design struct {
	ID         ID
	Title      string
	Site       string
	Revision   int // the newest revision's number, from 1
	Verdict    working.Verdict
	HeadroomC  *quantity.Exact // least headroom of its strings, °C; nil where none is known
	Created    Stamp
	Updated    Stamp
	ArchivedAt *time.Time // nil while it is in use
}

// Stamp is when something was done, by the database's clock, and by whom.
type Stamp struct {
	At time.Time
	By Actor
}

// Revision is a design as it was saved once. It never changes.
type Revision struct {
	Design   ID
	Number   int
	Base     int // the revision it was made from; 0 for the first
	Frozen   Frozen
	Note     string // what changed, in the words of who saved it; may be empty
	Saved    Stamp
	Repeated bool // the save was a repetition of one already done: nothing new was made
}

// Frozen is a document with what the engine found in it.
type Frozen struct {
	Document  []byte   // canonical JSON of the design (design.AppendJSON)
	Result    []byte   // JSON of the result, as the engine wrote it then
	SHA256    [32]byte // of Document
	Engine    string   // version of the engine
	Rulebook  string
	Title     string
	Site      string
	Verdict   working.Verdict
	HeadroomC *quantity.Exact
	Uses      []Use
}

// Use is a piece of equipment that a design carries by value.
type Use struct {
	Kind  Kind
	Maker string
	Model string
}

// Kind is a kind of equipment.
type Kind string

const (
	KindModule   Kind = "module"
	KindInverter Kind = "inverter"
)

// Draft is a form as it stands, complete or not: every field's text under its name.
// One draft belongs to a saved design, or to none yet.
type Draft struct {
	ID      ID
	Design  ID  // "" while the design was never saved
	Base    int // the revision it started from; 0 for none
	Fields  map[string]string
	Version int64 // grows by one with every save of the draft
	Saved   Stamp
}

// Equipment is a module's or an inverter's data that people keep, each value with
// where it came from. A design copies it by value.
type Equipment struct {
	ID         ID
	Kind       Kind
	Maker      string
	Model      string
	Document   []byte            // JSON of the module or inverter as it stands in a design, without its id
	Sources    map[string]string // JSON Pointer inside Document → where on the datasheet; "" is all of it
	Answers    []design.Answer   // why values that look like slips are right; pointers inside Document
	Note       string
	Version    int64 // grows by one with every save
	Created    Stamp
	Updated    Stamp
	ArchivedAt *time.Time
}

// Freeze sizes a design and returns what a revision keeps of it.
func Freeze(d *design.Design, engine string) Frozen {
	r := sizing.Size(d)
	f := Frozen{
		Document: design.AppendJSON(nil, d), Result: r.AppendJSON(nil), Engine: engine, Rulebook: d.Rulebook,
		Title: d.Title, Site: d.Site.Name, Verdict: r.Verdict, HeadroomC: r.LeastHeadroomC(),
	}
	f.SHA256 = hash(f.Document)
	for _, m := range d.Modules {
		f.Uses = append(f.Uses, Use{KindModule, m.Maker, m.Model})
	}
	for _, v := range d.Inverters {
		f.Uses = append(f.Uses, Use{KindInverter, v.Maker, v.Model})
	}
	return f
}
