package server

import (
	"errors"
	"fmt"
	"net/http"
	"net/url"
	"strings"
	"time"

	"github.com/go-chi/chi/v5"

	"rimeline/server/display"
	"rimeline/server/record"
	"rimeline/sizing/working"
	"rimeline/static"
	"rimeline/views"
)

const (
	listedDrafts  = 20 // drafts on the page of designs
	recentDesigns = 5  // designs on the first page
	recentDrafts  = 5  // drafts there
)

var verdicts = []working.Verdict{working.Outside, working.Unconfirmed, working.Caution, working.Within}

// designSorts are the orders of the list of designs, by the columns that have them.
var designSorts = []struct {
	words, class string
	sort         record.Sort // "" where the list has no order by it
	falls        bool        // its usual way is from high to low
}{
	{"Title", "title", record.SortTitle, false},
	{"Site", "site", "", false},
	{"Worst verdict", "verdict", record.SortVerdict, true},
	{"Least headroom", "headroom num", record.SortHeadroom, false},
	{"Revision", "revision num", "", false},
	{"Changed", "age", record.SortUpdated, true},
	{"Actions", "acts", "", false},
}

// listBase is what lists have around them: they need neither htmx nor the styles of
// an answer.
func listBase(title, here string) views.Base {
	base := newBase(title, here)
	base.Styles = append(base.Styles[:1:1], static.URL("saved.css"))
	base.Scripts = []string{static.URL("rimeline.js")}
	return base
}

// askedListing reads what a list is asked for. What it does not know is left aside: a
// link that somebody cut short still shows a list.
func askedListing(query url.Values) record.Listing {
	l := record.Listing{
		Words:    strings.TrimSpace(query.Get("q")),
		Archived: query.Get("archived") == "yes",
		Sort:     record.SortUpdated,
		Reversed: query.Get("order") == "reversed",
		Cursor:   query.Get("at"),
	}
	for _, v := range verdicts {
		if query.Get("verdict") == v.String() {
			l.Verdict = &v
		}
	}
	for _, c := range designSorts {
		if c.sort != "" && query.Get("sort") == string(c.sort) {
			l.Sort = c.sort
		}
	}
	return l
}

// listQuery is the query by which a list is asked for again.
func listQuery(l record.Listing) url.Values {
	query := url.Values{}
	set := func(name, value string, on bool) {
		if on {
			query.Set(name, value)
		}
	}
	set("q", l.Words, l.Words != "")
	set("archived", "yes", l.Archived)
	set("sort", string(l.Sort), l.Sort != record.SortUpdated)
	set("order", "reversed", l.Reversed)
	set("at", l.Cursor, l.Cursor != "")
	if l.Verdict != nil {
		query.Set("verdict", l.Verdict.String())
	}
	return query
}

func listAddress(l record.Listing) string {
	if query := listQuery(l); len(query) > 0 {
		return "/designs?" + query.Encode()
	}
	return "/designs"
}

// showDesigns shows a page of the saved designs.
func (s *Server) showDesigns(w http.ResponseWriter, r *http.Request, saved Saving) error {
	query := r.URL.Query()
	l := askedListing(query)
	found, err := saved.Designs(r.Context(), l)
	if errors.Is(err, record.ErrInvalid) && l.Cursor != "" { // a link from another order, or one that was cut short
		l.Cursor = ""
		http.Redirect(w, r, listAddress(l), http.StatusSeeOther)
		return nil
	}
	if err != nil {
		return err
	}
	p := newDesignsPage(l, found, time.Now())
	if l.Cursor == "" && l.Words == "" && l.Verdict == nil && !l.Archived {
		drafts, err := saved.DraftsOf(r.Context(), "", listedDrafts)
		if err != nil {
			return err
		}
		p.Drafts = draftLinks(drafts, time.Now())
	}
	p.Said, err = saidOfDesign(r, saved, query.Get("done"), query.Get("of"), p.Back)
	if err != nil {
		return err
	}
	return s.render(w, r, http.StatusOK, views.Designs(p))
}

// newDesignsPage makes the page of a list.
func newDesignsPage(l record.Listing, found record.DesignPage, now time.Time) views.DesignsPage {
	p := views.DesignsPage{
		Base: listBase("Designs", "/designs"), Words: l.Words, Archived: l.Archived, Request: newOrigin().request,
		Narrowed: l.Words != "" || l.Verdict != nil,
		Back:     listQuery(l).Encode(),
		Columns:  designColumns(l),
		Rows:     designRows(found.Designs, now),
	}
	first := l
	first.Cursor = ""
	whole := first
	whole.Words, whole.Verdict = "", nil
	p.All = listAddress(whole)
	kept := listQuery(first)
	for _, name := range []string{"archived", "sort", "order"} {
		if kept.Has(name) {
			p.Keep = append(p.Keep, views.HiddenField{Name: name, Value: kept.Get(name)})
		}
	}
	p.Verdicts = []views.Choice{{Words: "Any", Chosen: l.Verdict == nil}}
	for _, v := range verdicts {
		p.Verdicts = append(p.Verdicts, views.Choice{Value: v.String(), Words: v.String(), Chosen: l.Verdict != nil && *l.Verdict == v})
	}
	inUse, archived := first, first
	inUse.Archived, archived.Archived = false, true
	p.States = []views.Tab{
		{Words: "In use", Href: listAddress(inUse), Here: !l.Archived},
		{Words: "Archived", Href: listAddress(archived), Here: l.Archived},
	}
	at := func(cursor string) string {
		if cursor == "" {
			return ""
		}
		other := l
		other.Cursor = cursor
		return listAddress(other)
	}
	p.Previous, p.Next = at(found.Previous), at(found.Next)
	p.Count = countOf(found.Total, found.More, "design")
	if n := len(found.Designs); n < found.Total && n > 0 {
		p.Count += fmt.Sprintf(", %d on this page", n)
	}
	switch {
	case p.Narrowed && l.Archived:
		p.Empty = "No archived design matches."
	case p.Narrowed:
		p.Empty = "No design in use matches. What is searched for must begin a word of the title, the site, or a maker or model that the design uses."
	case l.Archived:
		p.Empty = "Nothing is archived. An archived design keeps all its revisions and can be restored from here."
	default:
		p.Empty = "Nothing is saved yet. Size strings, then press Save: the design stands here with every revision of it."
	}
	return p
}

// countOf counts the entries of a list, which are counted up to record.CountedTo.
func countOf(n int, more bool, what string) string {
	if more {
		return "More than " + counted(n, what)
	}
	return counted(n, what)
}

// designColumns are the heads of the columns. Each that can be sorted by leads to that
// order, and the one that is sorted by to the other way round.
func designColumns(l record.Listing) []views.Column {
	var columns []views.Column
	for _, c := range designSorts {
		column := views.Column{Words: c.words, Class: c.class, Unseen: c.class == "acts"}
		if c.sort != "" {
			by := l
			by.Sort, by.Cursor, by.Reversed = c.sort, "", false
			if l.Sort == c.sort {
				by.Reversed = !l.Reversed
				column.Sorted = "ascending"
				if c.falls != l.Reversed {
					column.Sorted = "descending"
				}
			}
			column.Href = listAddress(by)
		}
		columns = append(columns, column)
	}
	return columns
}

// designRows are saved designs as lists show them.
func designRows(designs []record.Design, now time.Time) []views.DesignRow {
	var rows []views.DesignRow
	for _, d := range designs {
		rows = append(rows, views.DesignRow{
			ID: string(d.ID), Title: designTitle(d.Title), Site: d.Site, Verdict: views.Verdict(d.Verdict.String()),
			Headroom: display.Headroom(d.HeadroomC), Revision: fmt.Sprint(d.Revision), Updated: moment(d.Updated.At, now),
		})
	}
	return rows
}

// saidOfDesign tells what has just been done to a design, nil if nothing was.
func saidOfDesign(r *http.Request, saved Saving, done, of, back string) (*views.Said, error) {
	if done == "discarded" {
		return &views.Said{Words: "The draft is discarded."}, nil
	}
	if done != "archived" && done != "restored" {
		return nil, nil
	}
	d, err := saved.Design(r.Context(), record.ID(of))
	if errors.Is(err, record.ErrNotFound) {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	undo := &views.Action{Spoken: " " + designTitle(d.Title), Fields: []views.HiddenField{{Name: "back", Value: back}}}
	if done == "archived" {
		undo.Words, undo.Path = "Restore it", "/designs/"+of+"/restore"
		return &views.Said{Words: fmt.Sprintf("“%s” is archived with all its revisions. It stands under Archived, and can be restored there at any time.", designTitle(d.Title)), Undo: undo}, nil
	}
	undo.Words, undo.Path = "Archive it again", "/designs/"+of+"/archive"
	return &views.Said{Words: fmt.Sprintf("“%s” is restored, and stands among the designs in use.", designTitle(d.Title)), Undo: undo}, nil
}

// archiveDesign takes a design out of the list of those in use.
func (s *Server) archiveDesign(w http.ResponseWriter, r *http.Request, saved Saving) error {
	id := chi.URLParam(r, "id")
	if err := saved.Archive(r.Context(), actorOf(r), record.ID(id)); err != nil {
		return err
	}
	return backToList(w, r, "archived", id)
}

// restoreDesign puts an archived design back.
func (s *Server) restoreDesign(w http.ResponseWriter, r *http.Request, saved Saving) error {
	id := chi.URLParam(r, "id")
	if err := saved.Restore(r.Context(), actorOf(r), record.ID(id)); err != nil {
		return err
	}
	return backToList(w, r, "restored", id)
}

// backToList leads back to the list as it was shown, which then tells what was done.
func backToList(w http.ResponseWriter, r *http.Request, done, id string) error {
	if err := r.ParseForm(); err != nil {
		return badRequest("The form could not be read.", err)
	}
	shown, _ := url.ParseQuery(r.PostForm.Get("back")) // only what a list knows is taken of it
	query := listQuery(askedListing(shown))
	query.Set("done", done)
	query.Set("of", id)
	http.Redirect(w, r, "/designs?"+query.Encode(), http.StatusSeeOther)
	return nil
}

// duplicateDesign makes a new design of the newest revision of another.
func (s *Server) duplicateDesign(w http.ResponseWriter, r *http.Request, saved Saving) error {
	if err := r.ParseForm(); err != nil {
		return badRequest("The form could not be read.", err)
	}
	id := record.ID(chi.URLParam(r, "id"))
	original, err := saved.Design(r.Context(), id)
	if err != nil {
		return err
	}
	key := r.PostForm.Get("request")
	if isID(key) {
		key += "-" + string(id) // a list has one key for all its rows
	} else {
		key = newOrigin().request
	}
	made, err := saved.Duplicate(r.Context(), actorOf(r), id, strings.TrimSpace(original.Title+" (copy)"), key)
	if used, ok := errors.AsType[*record.UsedError](err); ok { // the original was renamed since: the copy is there
		made.ID, err = used.Made, nil
	}
	if err != nil {
		return err
	}
	http.Redirect(w, r, "/designs/"+string(made.ID)+"?done=duplicated", http.StatusSeeOther)
	return nil
}
