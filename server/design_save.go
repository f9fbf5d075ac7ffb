package server

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"net/http"
	"strings"
	"time"

	"rimeline/server/display"
	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/static"
	"rimeline/views"
)

// saveDesign saves the form as a new design, or as the next revision of the one it
// was made from. Whatever keeps it from that, the answer holds the whole form.
func (s *Server) saveDesign(w http.ResponseWriter, r *http.Request) error {
	f, err := postedForm(r)
	if err != nil {
		return err
	}
	j, o := judge(f), originOf(r.PostForm)
	saved, err := s.saving()
	if err != nil {
		return s.showUnsaved(w, r, j, o, err)
	}
	if j.design == nil {
		return s.showFaulty(w, r, saved, j, o)
	}
	// The save is done though the browser may not wait for it.
	ctx := context.WithoutCancel(r.Context())
	save := store.Save{
		Design: o.design, Base: o.base, Frozen: record.Freeze(j.design, s.cfg.Version),
		Note: strings.TrimSpace(o.note), Request: o.request, Draft: o.draft, DraftVersion: o.version,
	}
	rev, err := saved.SaveRevision(ctx, actorOf(r), save)
	if used, ok := errors.AsType[*record.UsedError](err); ok {
		// The page saved an earlier text, and was then gone back to.
		save.Design, save.Base = used.Made, int(used.Number)
		save.Request = nextRequest(o.request, save)
		rev, err = saved.SaveRevision(ctx, actorOf(r), save)
		o.design, o.base = save.Design, save.Base
	}
	if _, stale := errors.AsType[*record.StaleError](err); stale {
		return s.showConflict(w, r, saved, j, o)
	}
	if err != nil {
		return s.showUnsaved(w, r, j, o, err)
	}
	http.Redirect(w, r, fmt.Sprintf("/designs/%s?saved=%d", rev.Design, rev.Number), http.StatusSeeOther)
	return nil
}

// nextRequest is the key of a save by a page whose own key has saved another text. A
// repetition has the same.
func nextRequest(request string, save store.Save) string {
	h := sha256.New()
	fmt.Fprintf(h, "%s %s %d %x %s", request, save.Design, save.Base, save.Frozen.SHA256, save.Note)
	return hex.EncodeToString(h.Sum(nil))
}

// showUnsaved shows the form again, with why it was not saved and what to do.
func (s *Server) showUnsaved(w http.ResponseWriter, r *http.Request, j judged, o origin, cause error) error {
	failure := savingFailure(cause, false)
	if failure == nil {
		return cause
	}
	refused := &views.Refusal{Heading: notSavedHeading(cause), Lead: failure.message}
	if !errors.Is(cause, ErrNothingSaved) && failure.status == http.StatusServiceUnavailable {
		refused.Lead += " Everything that you typed stands below."
	}
	for name, value := range failure.header {
		w.Header().Set(name, value)
	}
	s.learn(cause)
	s.log.WarnContext(r.Context(), "design not saved", "request_id", visitOf(r).requestID, "status", failure.status, "error", cause)
	p := newDesignPage(newBase("Not saved: "+titled("Design", j.form), "/design"), j, marking{})
	p.Keeping = keeping(o, cause)
	p.Keeping.Refused = refused
	if p.Keeping.Autosave {
		p.Keeping.Away = "" // Save is what to press next
	}
	return s.render(w, r, failure.status, views.Design(p))
}

func notSavedHeading(cause error) string {
	switch {
	case errors.Is(cause, record.ErrUnknownOutcome):
		return "It is not known whether it was saved"
	case errors.Is(cause, ErrStarting):
		return "Not saved: saving is still starting"
	case errors.Is(cause, ErrNothingSaved):
		return "Not saved: nothing is saved here"
	case errors.Is(cause, record.ErrUnavailable):
		return "Not saved: the database does not answer"
	}
	return "Not saved"
}

// showFaulty shows every fault of a form that was to be saved, and keeps its text as
// a draft.
func (s *Server) showFaulty(w http.ResponseWriter, r *http.Request, saved Saving, j judged, o origin) error {
	lead := "It cannot be saved as a revision before it can be sized. "
	base := newBase("Please correct: "+titled("Design", j.form), "/design")
	kept, err := s.keep(r, saved, o, typedFields(r.PostForm))
	if err == nil {
		o.draft, o.version = kept.ID, kept.Version
		lead += "Its text is kept as a draft. " + kept.second
	} else {
		lead += "Its text could not be kept as a draft either: " + awayWords(err)
	}
	p := newDesignPage(base, j, marking{faults: true})
	p.Keeping, p.Faults.Lead = keeping(o, err), lead
	if err == nil {
		p.Keeping.Draft, p.Keeping.Done = draftNow(kept.Draft, 0), "kept"
	}
	return s.render(w, r, http.StatusUnprocessableEntity, views.Design(p))
}

// showConflict shows what was saved meanwhile beside what could therefore not be
// saved, which is kept as a draft.
func (s *Server) showConflict(w http.ResponseWriter, r *http.Request, saved Saving, j judged, o origin) error {
	newest, err := saved.Revision(r.Context(), o.design, 0)
	if err != nil {
		return s.showUnsaved(w, r, j, o, err)
	}
	if string(newest.Frozen.Document) == string(design.AppendJSON(nil, j.design)) {
		// Both wrote the same.
		_ = saved.DiscardDraft(r.Context(), actorOf(r), o.draft, o.version) // if it stays, it says nothing that the design does not
		http.Redirect(w, r, fmt.Sprintf("/designs/%s?saved=%d", o.design, newest.Number), http.StatusSeeOther)
		return nil
	}
	p := views.ConflictPage{
		Base: listBase("Not saved yet: "+titled("Design", j.form), "/designs"), Title: designTitle(newest.Frozen.Title),
		Design: string(o.design), Newest: fmt.Sprint(newest.Number), Next: fmt.Sprint(newest.Number + 1),
		Lead: fmt.Sprintf("Yours was made from revision %d. Revision %d was saved %s by %s. Below are both versions, as far as they differ.",
			o.base, newest.Number, moment(newest.Saved.At, time.Now()).Age, newest.Saved.By.Name),
		Kept: "Nothing is lost on any way: theirs is saved, and yours is kept as a draft of this design.",
	}
	kept, err := s.keep(r, saved, o, typedFields(r.PostForm))
	if err != nil {
		p.Kept = "Theirs is saved. Yours could not be kept as a draft, so it is in this page alone: " + awayWords(err)
	} else {
		o.draft, o.version = kept.ID, kept.Version
	}
	o.base, o.request = newest.Number, newOrigin().request
	p.Mine = carried(j.form, o)
	p.Base.Styles = append(p.Base.Styles, static.URL("answer.css"), static.URL("comparison.css"))
	p.Base.Scripts = append(p.Base.Scripts, static.URL("kept.js"))
	theirs := design.Read(newest.Frozen.Document)
	if theirs.Design == nil {
		return fmt.Errorf("revision %d of design %q is refused: %v", newest.Number, o.design, theirs.Faults)
	}
	comparison := display.NewComparison(
		display.Side{Name: fmt.Sprintf("Theirs, revision %d", newest.Number), Design: theirs.Design, Result: sizing.Size(theirs.Design)},
		display.Side{Name: "Mine", Design: j.design, Result: j.result})
	return s.render(w, r, http.StatusConflict, views.Conflict(p, views.ComparisonBody(comparison)))
}

// designTitle is what a design is called in lists and headings.
func designTitle(title string) string {
	if title = strings.TrimSpace(title); title != "" {
		return title
	}
	return "A design without a title"
}
