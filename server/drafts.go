package server

import (
	"context"
	"crypto/sha256"
	"encoding/base32"
	"errors"
	"fmt"
	"net/http"
	"strconv"
	"strings"
	"time"

	"github.com/go-chi/chi/v5"

	"rimeline/server/form"
	"rimeline/server/record"
	"rimeline/views"
)

// keptDraft is a draft that was saved.
type keptDraft struct {
	record.Draft
	second string // why it is not the draft that its page knew, in sentences; "" if it is
}

// keep keeps the text of a form as the draft that its page knows. If another tab or
// person changed that one or took it away, the text becomes a draft of its own.
func (s *Server) keep(r *http.Request, saved Saving, o origin, fields map[string]string) (keptDraft, error) {
	ctx := context.WithoutCancel(r.Context()) // a page that is being left does not wait for the answer
	d := record.Draft{ID: o.draft, Design: o.design, Base: o.base, Fields: fields, Version: o.version}
	kept, err := saved.SaveDraft(ctx, actorOf(r), d)
	s.learn(err)
	_, stale := errors.AsType[*record.StaleError](err)
	gone := errors.Is(err, record.ErrNotFound) && o.version > 0
	if !stale && !gone {
		return keptDraft{Draft: kept}, err
	}
	second := "Another tab, or somebody else, changed the draft meanwhile. Both are kept: this one is now a draft of its own."
	if gone {
		second = "The draft was saved or discarded meanwhile, so this is kept as a new one."
	}
	// A repetition, whose first answer was lost, makes no third one.
	d.ID, d.Version = secondDraft(o), 0
	kept, err = saved.SaveDraft(ctx, actorOf(r), d)
	if _, stale := errors.AsType[*record.StaleError](err); stale {
		d.ID = ""
		kept, err = saved.SaveDraft(ctx, actorOf(r), d)
	}
	return keptDraft{Draft: kept, second: second}, err
}

// secondDraft returns the id of the draft that a page makes when the one it knows is
// another's. It is the same each time.
func secondDraft(o origin) record.ID {
	sum := sha256.Sum256([]byte(string(o.draft) + " " + o.request))
	return record.ID(base32.StdEncoding.EncodeToString(sum[:])[:26])
}

// keepDraft keeps a form as a draft: for the script, which asks while someone types,
// and for the button.
func (s *Server) keepDraft(w http.ResponseWriter, r *http.Request) error {
	f, err := postedForm(r)
	if err != nil {
		return err
	}
	o, byScript := originOf(r.PostForm), r.PostForm.Has("autosave")
	saved, err := s.saving()
	var kept keptDraft
	if err == nil {
		kept, err = s.keep(r, saved, o, typedFields(r.PostForm))
	}
	switch {
	case err != nil && byScript:
		return s.tellNotKept(w, r, err)
	case err != nil:
		return s.showUnsaved(w, r, judge(f), o, err)
	case byScript:
		return s.render(w, r, http.StatusOK, views.DraftKept(string(kept.ID), version(kept.Draft), moment(kept.Saved.At, time.Now()), kept.second))
	}
	to := "/drafts/" + string(kept.ID) + "?kept=yes"
	if kept.second != "" {
		to = "/drafts/" + string(kept.ID) + "?kept=apart"
	}
	http.Redirect(w, r, to, http.StatusSeeOther)
	return nil
}

// tellNotKept tells the script why a draft was not kept.
func (s *Server) tellNotKept(w http.ResponseWriter, r *http.Request, cause error) error {
	failure := savingFailure(cause, false)
	if failure == nil {
		return cause
	}
	for name, value := range failure.header {
		w.Header().Set(name, value)
	}
	s.log.WarnContext(r.Context(), "draft not kept", "request_id", visitOf(r).requestID, "status", failure.status, "error", cause)
	why := "This could not be kept as a draft. " + failure.message
	if failure.status == http.StatusServiceUnavailable {
		why = "Not kept as a draft: the database does not answer. Sizing goes on."
	}
	return s.render(w, r, failure.status, views.DraftNotKept(why))
}

// showDraft shows the form of a draft.
func (s *Server) showDraft(w http.ResponseWriter, r *http.Request, saved Saving) error {
	d, err := saved.Draft(r.Context(), record.ID(chi.URLParam(r, "id")))
	if errors.Is(err, record.ErrNotFound) {
		return &statusError{
			status: http.StatusNotFound, heading: "This draft is not kept any more",
			message: "It was saved as a revision, or discarded. What was saved stands in the list of designs.", cause: err,
		}
	}
	if err != nil {
		return err
	}
	f, o, err := draftForm(d)
	if errors.Is(err, form.ErrTooMany) {
		return tooManyEntries
	}
	if err != nil {
		return err
	}
	newest := 0
	if d.Design != "" {
		of, err := saved.Design(r.Context(), d.Design)
		if err != nil {
			return err
		}
		newest = of.Revision
	}
	base := newBase(titled("Draft", f), "/designs")
	p := s.keptPage(r, base, judge(f), marking{}, o)
	p.Keeping.Draft = draftNow(d, newest)
	if r.URL.Query().Has("kept") {
		p.Keeping.Done = "kept"
	}
	switch r.URL.Query().Get("kept") {
	case "yes":
		p.Keeping.Said = &views.Said{Words: "Kept as a draft. It is no revision: press Save when it is ready."}
	case "apart":
		p.Keeping.Said = &views.Said{Words: "Another tab, or somebody else, changed the draft meanwhile. Both are kept: this one is now a draft of its own."}
	}
	return s.render(w, r, http.StatusOK, views.Design(p))
}

// draftNow tells of a draft that a form holds. newest is the newest revision of its
// design, 0 if that is not known or there is none.
func draftNow(d record.Draft, newest int) *views.DraftNow {
	now := &views.DraftNow{
		ID: string(d.ID), Version: version(d), Kept: moment(d.Saved.At, time.Now()), By: d.Saved.By.Name,
	}
	switch {
	case newest > d.Base && d.Base > 0:
		now.Of = fmt.Sprintf("Revision %d was saved after it was begun from revision %d; saving it shows both.", newest, d.Base)
	case newest > 0 && d.Base == 0:
		now.Of = "It was begun before the design was saved; saving it shows both."
	}
	return now
}

func version(d record.Draft) string { return strconv.FormatInt(d.Version, 10) }

// draftTitle is what a draft is called in lists.
func draftTitle(d record.Draft) string {
	if title := strings.TrimSpace(d.Fields["/title"]); title != "" {
		return title
	}
	return "A draft without a title"
}

// draftLinks are drafts as a list shows them.
func draftLinks(drafts []record.Draft, now time.Time) []views.DraftLink {
	var links []views.DraftLink
	for _, d := range drafts {
		links = append(links, views.DraftLink{ID: string(d.ID), Title: draftTitle(d), Kept: moment(d.Saved.At, now), By: d.Saved.By.Name})
	}
	return links
}

// discardDraft takes a draft away, if it is still what its reader saw.
func (s *Server) discardDraft(w http.ResponseWriter, r *http.Request, saved Saving) error {
	if err := r.ParseForm(); err != nil {
		return badRequest("The form could not be read.", err)
	}
	id := record.ID(chi.URLParam(r, "id"))
	to := "/designs?done=discarded"
	d, err := saved.Draft(r.Context(), id)
	switch {
	case errors.Is(err, record.ErrNotFound): // it is gone already
		http.Redirect(w, r, to, http.StatusSeeOther)
		return nil
	case err != nil:
		return err
	case d.Design != "":
		to = "/designs/" + string(d.Design) + "?done=discarded"
	}
	seen, _ := strconv.ParseInt(r.PostForm.Get("version"), 10, 64)
	err = saved.DiscardDraft(r.Context(), actorOf(r), id, seen)
	if _, stale := errors.AsType[*record.StaleError](err); stale {
		return &statusError{
			status: http.StatusConflict, heading: "The draft was not discarded", cause: err,
			message: "It was changed after you opened it, in another tab or by somebody else. Open it again to see what it holds now, and discard it there.",
		}
	}
	if err != nil {
		return err
	}
	http.Redirect(w, r, to, http.StatusSeeOther)
	return nil
}
