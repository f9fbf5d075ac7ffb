package server

import (
	"bytes"
	"encoding/hex"
	"fmt"
	"net/http"
	"strconv"
	"time"

	"github.com/a-h/templ"
	"github.com/go-chi/chi/v5"

	"rimeline/server/display"
	"rimeline/server/record"
	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/static"
	"rimeline/views"
)

// showRevisions shows the list of a design's revisions.
func (s *Server) showRevisions(w http.ResponseWriter, r *http.Request, saved Saving) error {
	id := record.ID(chi.URLParam(r, "id"))
	d, err := saved.Design(r.Context(), id)
	if err != nil {
		return err
	}
	list, err := saved.Revisions(r.Context(), id)
	if err != nil {
		return err
	}
	p := views.RevisionsPage{
		Base: listBase(designTitle(d.Title)+", Revisions", "/designs"), Title: designTitle(d.Title), Design: string(id),
		Count: counted(len(list), "revision") + ". None of them ever changes.", Archived: d.ArchivedAt != nil, Request: newOrigin().request,
	}
	now := time.Now()
	for i, rev := range list {
		row := views.RevisionRow{
			Number: strconv.Itoa(rev.Number), Saved: moment(rev.Saved.At, now), By: rev.Saved.By.Name,
			Verdict: views.Verdict(rev.Verdict.String()), Headroom: display.Headroom(rev.HeadroomC), Note: rev.Note,
			From: i == 1, To: i == 0,
		}
		if rev.Base != rev.Number-1 {
			row.Base = strconv.Itoa(rev.Base)
		}
		p.Rows = append(p.Rows, row)
	}
	return s.render(w, r, http.StatusOK, views.Revisions(p))
}

// The parts of a revision's page, by the value of "show".
const (
	showAnswer  = "answer"
	showWorking = "working"
	showSheet   = "sheet"
)

// showRevision shows a revision, which never changes, and whether the engine of today
// finds in it what the one of then found.
func (s *Server) showRevision(w http.ResponseWriter, r *http.Request, saved Saving) error {
	id := record.ID(chi.URLParam(r, "id"))
	number, err := strconv.Atoi(chi.URLParam(r, "n"))
	if err != nil || number < 1 {
		return errNotFound
	}
	d, err := saved.Design(r.Context(), id)
	if err != nil {
		return err
	}
	rev, err := saved.Revision(r.Context(), id, number)
	if err != nil {
		return err
	}
	title := designTitle(rev.Frozen.Title)
	p := views.RevisionPage{
		Base: newBase(fmt.Sprintf("%s, Revision %d", title, number), "/designs"), Title: designTitle(d.Title), Design: string(id),
		Number: strconv.Itoa(number), Newest: strconv.Itoa(d.Revision), IsNewest: number == d.Revision,
		Saved: moment(rev.Saved.At, time.Now()), By: rev.Saved.By.Name, Note: rev.Note,
	}
	if number > 1 {
		p.Previous = strconv.Itoa(number - 1)
	}
	p.Base.Styles = append(p.Base.Styles, static.URL("saved.css"), static.URL("sheet.css"), static.URL("comparison.css"))
	p.Base.Scripts = []string{static.URL("rimeline.js")}
	if f, err := revisionForm(rev); err == nil {
		p.Carried = carried(f, newOrigin())
	}
	read := design.Read(rev.Frozen.Document)
	if read.Design == nil {
		// A later edition of the format may refuse what an earlier one took.
		p.Engine = views.Recheck{
			Heading: "It cannot be sized again",
			Words:   fmt.Sprintf("The reader of today refuses what was saved then, so that it cannot be sized again. The verdict then was %s.", rev.Frozen.Verdict),
			SHA256:  hex.EncodeToString(rev.Frozen.SHA256[:]),
		}
		var why []string
		for _, fault := range read.Faults {
			why = append(why, fault.Detail)
		}
		return s.render(w, r, http.StatusOK, views.Revision(p, views.RevisionUnread(title, why)))
	}
	result := sizing.Size(read.Design)
	p.Engine = recheck(rev.Frozen, read.Design, result, s.cfg.Version)
	shown := r.URL.Query().Get("show")
	if shown != showWorking && shown != showSheet {
		shown = showAnswer
	}
	address := fmt.Sprintf("/designs/%s/revisions/%d", id, number)
	p.Parts = []views.Tab{
		{Words: "The answer", Href: address, Here: shown == showAnswer},
		{Words: "The whole working", Href: address + "?show=" + showWorking, Here: shown == showWorking},
		{Words: "Stringing sheet", Href: address + "?show=" + showSheet, Here: shown == showSheet},
	}
	var body templ.Component
	switch shown {
	case showWorking:
		body = views.WorkingBody(display.NewWorking(read.Design, result))
	case showSheet:
		sheet := display.NewSheet(read.Design, result)
		sheet.Mark = fmt.Sprintf("Revision %d of %s. DRAFT, not released", number, rev.Saved.At.UTC().Format(time.DateOnly))
		sheet.Saved = true
		body = views.SheetBody(sheet)
	default:
		body = views.RevisionAnswer(title, display.NewAnswer(read.Design, result))
	}
	return s.render(w, r, http.StatusOK, views.Revision(p, body))
}

// recheck tells whether the engine of today finds in a revision what the one of then
// found. Identical results are identical bytes.
func recheck(f record.Frozen, d *design.Design, result *sizing.Result, engine string) views.Recheck {
	c := views.Recheck{SHA256: hex.EncodeToString(f.SHA256[:])}
	now := result.AppendJSON(nil)
	if bytes.Equal(f.Result, now) {
		c.Same = true
		c.Words = fmt.Sprintf("Sized again just now by %s, it comes out the same, to the last digit.", calledEngine(engine))
		if engine != f.Engine {
			c.Words = fmt.Sprintf("Sized by %s when it was saved and again just now by %s, it comes out the same, to the last digit.", calledEngine(f.Engine), calledEngine(engine))
		}
		return c
	}
	was, after, changes := display.ResultChanges(f.Result, d, result)
	c.Was, c.Now, c.Changes = was, after, changes
	if len(changes) == 0 {
		c.Heading = "Every check comes out the same; the working is written otherwise"
		c.Words = fmt.Sprintf("%s found the same verdicts, values and limits when this revision was saved as %s does now. What stands below is the working of today.",
			upperFirst(calledEngine(f.Engine)), calledEngine(engine))
		return c
	}
	c.Heading = "The engine of today finds something else"
	c.Words = fmt.Sprintf("When this revision was saved, %s found: %s. Sized again just now by %s, it is: %s. "+
		"What stands below is what is found today; what was found then is kept with the revision, and differs in the following.",
		calledEngine(f.Engine), f.Verdict, calledEngine(engine), result.Verdict)
	return c
}

func calledEngine(version string) string {
	if version == "" {
		return "an engine without a version"
	}
	return "engine " + version
}

// compareRevisions shows what differs between two revisions.
func (s *Server) compareRevisions(w http.ResponseWriter, r *http.Request, saved Saving) error {
	id, query := record.ID(chi.URLParam(r, "id")), r.URL.Query()
	d, err := saved.Design(r.Context(), id)
	if err != nil {
		return err
	}
	to, err := askedRevision(query, "to", d.Revision, d.Revision)
	if err != nil {
		return err
	}
	from, err := askedRevision(query, "from", max(to-1, 1), d.Revision)
	if err != nil {
		return err
	}
	p := views.ComparePage{
		Base: listBase(fmt.Sprintf("%s, revisions %d and %d", designTitle(d.Title), from, to), "/designs"), Title: designTitle(d.Title), Design: string(id),
		From: revisionChoices(d.Revision, from), To: revisionChoices(d.Revision, to),
	}
	p.Base.Styles = append(p.Base.Styles, static.URL("answer.css"), static.URL("comparison.css"))
	if from == to {
		p.Why = "Choose two different revisions."
		if d.Revision == 1 {
			p.Why = "There is only one revision, so there is nothing to compare yet."
		}
		return s.render(w, r, http.StatusOK, views.Compare(p, templ.NopComponent))
	}
	before, err := comparedSide(r, saved, id, from)
	if err != nil {
		return err
	}
	after, err := comparedSide(r, saved, id, to)
	if err != nil {
		return err
	}
	if before.Design == nil || after.Design == nil {
		p.Why = "The reader of today refuses one of the two, so they cannot be compared value by value. Open each by itself."
		return s.render(w, r, http.StatusOK, views.Compare(p, templ.NopComponent))
	}
	return s.render(w, r, http.StatusOK, views.Compare(p, views.ComparisonBody(display.NewComparison(before, after))))
}

// comparedSide is a revision as one side of a comparison; its design is nil if the
// reader of today refuses it.
func comparedSide(r *http.Request, saved Saving, id record.ID, number int) (display.Side, error) {
	rev, err := saved.Revision(r.Context(), id, number)
	if err != nil {
		return display.Side{}, err
	}
	side := display.Side{Name: fmt.Sprintf("Revision %d", number), Design: design.Read(rev.Frozen.Document).Design}
	if side.Design != nil {
		side.Result = sizing.Size(side.Design)
	}
	return side, nil
}

// revisionChoices are the revisions of a design, the newest first.
func revisionChoices(newest, chosen int) []views.Choice {
	var choices []views.Choice
	for n := newest; n > 0; n-- {
		choices = append(choices, views.Choice{Value: strconv.Itoa(n), Words: fmt.Sprintf("Revision %d", n), Chosen: n == chosen})
	}
	return choices
}
