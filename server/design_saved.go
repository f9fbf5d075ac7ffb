package server

import (
	"errors"
	"fmt"
	"net/http"
	"net/url"
	"strconv"
	"time"

	"github.com/go-chi/chi/v5"

	"rimeline/server/form"
	"rimeline/server/record"
	"rimeline/static"
	"rimeline/views"
)

// offeredDrafts is how many drafts of a design are looked at when it is opened.
const offeredDrafts = 10

// showSaved shows the form filled with the newest revision of a design, or with an
// older one that it is to start from, and offers its drafts.
func (s *Server) showSaved(w http.ResponseWriter, r *http.Request, saved Saving) error {
	id, query := record.ID(chi.URLParam(r, "id")), r.URL.Query()
	d, err := saved.Design(r.Context(), id)
	if err != nil {
		return err
	}
	from, err := askedRevision(query, "from", d.Revision, d.Revision)
	if err != nil {
		return err
	}
	rev, err := saved.Revision(r.Context(), id, from)
	if err != nil {
		return err
	}
	drafts, err := saved.DraftsOf(r.Context(), id, offeredDrafts)
	if err != nil {
		return err
	}
	f, err := revisionForm(rev)
	if err != nil {
		return err
	}
	now := time.Now()
	o := newOrigin()
	o.design, o.base = id, d.Revision // on top of the newest, whichever it is filled with
	p := s.keptPage(r, newBase(titled("Design", f), "/designs"), judge(f), marking{}, o)
	p.Keeping.Saved = &views.SavedAs{
		Design: string(id), Says: fmt.Sprintf("Revision %d, saved ", d.Revision),
		Saved: moment(d.Updated.At, now), By: d.Updated.By.Name, Archived: d.ArchivedAt != nil,
	}
	if from != d.Revision {
		p.Keeping.Saved.Says = fmt.Sprintf("Filled with revision %d; saving it makes the revision after %d, which was saved ", from, d.Revision)
		p.Keeping.Note = fmt.Sprintf("Back to revision %d", from)
	}
	if p.Keeping.Offer, p.Keeping.Further = offerOf(drafts, f, from, now); p.Keeping.Offer != nil {
		p.Base.Styles = append(p.Base.Styles, static.URL("comparison.css"))
	}
	p.Keeping.Said = saidOfSave(query, d)
	if query.Has("saved") {
		p.Keeping.Done = "saved"
	}
	return s.render(w, r, http.StatusOK, views.Design(p))
}

// askedRevision reads the number of a revision out of a query, which may leave it to
// us.
func askedRevision(query url.Values, name string, without, newest int) (int, error) {
	if !query.Has(name) {
		return without, nil
	}
	n, err := strconv.Atoi(query.Get(name))
	if err != nil || n < 1 || n > newest {
		return 0, &statusError{
			status:  http.StatusNotFound,
			message: fmt.Sprintf("This design has no revision “%s”. Its newest is revision %d.", query.Get(name), newest),
		}
	}
	return n, nil
}

// revisionForm fills a form with a revision.
func revisionForm(rev record.Revision) (*form.Form, error) {
	f, _, err := form.FromDocument(rev.Frozen.Document)
	if errors.Is(err, form.ErrTooMany) {
		return nil, tooManyEntries
	}
	return f, err
}

// offerOf makes an offer of the latest draft that differs from what the page shows,
// and links to the others.
func offerOf(drafts []record.Draft, shown *form.Form, number int, now time.Time) (*views.DraftOffer, []views.DraftLink) {
	var offer *views.DraftOffer
	var further []record.Draft
	for _, d := range drafts {
		f, _, err := draftForm(d)
		if err != nil {
			continue // it holds more than a page can show
		}
		changes := formChanges(shown, f)
		n := changesIn(changes)
		switch {
		case n == 0:
			continue // it says nothing that the page does not
		case offer != nil:
			further = append(further, d)
			continue
		}
		offer = &views.DraftOffer{
			ID: string(d.ID), Version: version(d), Kept: moment(d.Saved.At, now), By: d.Saved.By.Name,
			Count: differences(n), Now: fmt.Sprintf("Revision %d", number), Changes: changes, Open: n <= shownChanges,
		}
		switch {
		case d.Base == 0:
			offer.Of = "It was begun before the design was saved."
		case d.Base != number:
			offer.Of = fmt.Sprintf("It was begun from revision %d.", d.Base)
		}
	}
	return offer, draftLinks(further, now)
}

// saidOfSave tells what has just been done to the design that the page shows.
func saidOfSave(query url.Values, d record.Design) *views.Said {
	switch {
	case query.Get("saved") == strconv.Itoa(d.Revision):
		return &views.Said{Words: fmt.Sprintf("Saved as revision %d.", d.Revision)}
	case query.Has("saved"):
		return &views.Said{Words: fmt.Sprintf("Saved. Since then revision %d was saved on top of it, which stands here.", d.Revision)}
	}
	switch query.Get("done") {
	case "discarded":
		return &views.Said{Words: "The draft is discarded."}
	case "duplicated":
		return &views.Said{Words: "This is a copy; the design that it was made of stays as it is. Give the copy a title of its own."}
	}
	return nil
}
