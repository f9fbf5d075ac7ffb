package server

import (
	"bytes"
	"context"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"net/http"
	"net/url"
	"strconv"
	"time"
	"unicode/utf8"

	"rimeline/server/record"
	"rimeline/server/store"
	"rimeline/sizing/quantity"
)

// apiListedDesign is a design as the list of designs has it.
type apiListedDesign struct {
	ID         string          `json:"id"`
	Revision   int             `json:"revision"`
	Title      string          `json:"title"`
	Site       string          `json:"site"`
	Verdict    string          `json:"verdict"`
	HeadroomC  json.RawMessage `json:"headroom_c"`
	CreatedAt  time.Time       `json:"created_at"`
	CreatedBy  apiActor        `json:"created_by"`
	UpdatedAt  time.Time       `json:"updated_at"`
	UpdatedBy  apiActor        `json:"updated_by"`
	ArchivedAt *time.Time      `json:"archived_at,omitempty"`
}

// apiDesign is a design with its newest revision.
type apiDesign struct {
	ID         string     `json:"id"`
	CreatedAt  time.Time  `json:"created_at"`
	CreatedBy  apiActor   `json:"created_by"`
	UpdatedAt  time.Time  `json:"updated_at"`
	UpdatedBy  apiActor   `json:"updated_by"`
	ArchivedAt *time.Time `json:"archived_at,omitempty"`
	apiSummary
	apiContent
}

// apiRevision is a revision of a design.
type apiRevision struct {
	Design  string    `json:"design"`
	SavedAt time.Time `json:"saved_at"`
	SavedBy apiActor  `json:"saved_by"`
	apiSummary
	apiContent
}

// apiListedRevision is a revision as the list of revisions has it.
type apiListedRevision struct {
	SavedAt time.Time `json:"saved_at"`
	SavedBy apiActor  `json:"saved_by"`
	apiSummary
}

// apiSummary is a revision in short.
type apiSummary struct {
	Revision  int             `json:"revision"`
	Base      int             `json:"base"`
	Note      string          `json:"note"`
	SHA256    string          `json:"sha256"`
	Engine    string          `json:"engine"`
	Rulebook  string          `json:"rulebook"`
	Title     string          `json:"title"`
	Site      string          `json:"site"`
	Verdict   string          `json:"verdict"`
	HeadroomC json.RawMessage `json:"headroom_c"`
}

// apiContent is what a revision holds: the document, and what the engine found then.
type apiContent struct {
	Document json.RawMessage `json:"document"`
	Result   json.RawMessage `json:"result"`
}

type apiActor struct {
	ID   string `json:"id"`
	Name string `json:"name"`
}

// numberOrNull writes an exact number, or null where there is none.
func numberOrNull(x *quantity.Exact) json.RawMessage {
	if x == nil {
		return json.RawMessage("null")
	}
	return x.AppendJSON(nil)
}

func newAPISummary(v *record.Revision) apiSummary {
	f := &v.Frozen
	return apiSummary{
		Revision: v.Number, Base: v.Base, Note: v.Note, SHA256: hex.EncodeToString(f.SHA256[:]), Engine: f.Engine, Rulebook: f.Rulebook,
		Title: f.Title, Site: f.Site, Verdict: f.Verdict.String(), HeadroomC: numberOrNull(f.HeadroomC),
	}
}

// newAPIDesign makes a design's representation of one of its revisions.
func newAPIDesign(d *record.Design, v *record.Revision) apiDesign {
	return apiDesign{
		ID: string(d.ID), CreatedAt: d.Created.At, CreatedBy: apiActor(d.Created.By),
		UpdatedAt: v.Saved.At, UpdatedBy: apiActor(v.Saved.By), ArchivedAt: d.ArchivedAt,
		apiSummary: newAPISummary(v), apiContent: apiContent{v.Frozen.Document, v.Frozen.Result},
	}
}

// apiDesigns lists the saved designs.
func (s *Server) apiDesigns(w http.ResponseWriter, r *http.Request, saved Saving) error {
	ask, err := designListing(r)
	if err != nil {
		return err
	}
	page, err := saved.Designs(r.Context(), ask)
	if err != nil {
		return listError(err)
	}
	answer := struct {
		Designs []apiListedDesign `json:"designs"`
		apiPage
	}{[]apiListedDesign{}, newAPIPage(r, page.Total, page.More, page.Next, page.Previous)}
	for _, d := range page.Designs {
		answer.Designs = append(answer.Designs, apiListedDesign{
			ID: string(d.ID), Revision: d.Revision, Title: d.Title, Site: d.Site, Verdict: d.Verdict.String(), HeadroomC: numberOrNull(d.HeadroomC),
			CreatedAt: d.Created.At, CreatedBy: apiActor(d.Created.By), UpdatedAt: d.Updated.At, UpdatedBy: apiActor(d.Updated.By), ArchivedAt: d.ArchivedAt,
		})
	}
	return sendJSON(w, r, "", answer)
}

// apiDesign answers a design with its newest revision.
func (s *Server) apiDesign(w http.ResponseWriter, r *http.Request, saved Saving) error {
	d, err := saved.Design(r.Context(), record.ID(r.PathValue("id")))
	if err != nil {
		return err
	}
	v, err := saved.Revision(r.Context(), d.ID, d.Revision)
	if err != nil {
		return err
	}
	return sendJSON(w, r, designTag(d, v.Frozen.SHA256), newAPIDesign(&d, &v))
}

// apiAddDesign saves a new design.
func (s *Server) apiAddDesign(w http.ResponseWriter, r *http.Request, saved Saving) error {
	save, err := s.postedSave(r)
	if err != nil {
		return err
	}
	return s.once(w, r, saved, func(ctx context.Context, key string) (record.Answer, error) {
		save.Request = key
		return s.apiSave(ctx, r, saved, http.StatusCreated, save)
	})
}

// apiReviseDesign saves a new revision of a design.
func (s *Server) apiReviseDesign(w http.ResponseWriter, r *http.Request, saved Saving) error {
	match, err := requireMatch(r)
	if err != nil {
		return err
	}
	save, err := s.postedSave(r)
	if err != nil {
		return err
	}
	return s.once(w, r, saved, func(ctx context.Context, key string) (record.Answer, error) {
		d, err := saved.Design(ctx, record.ID(r.PathValue("id")))
		if err != nil {
			return record.Answer{}, err
		}
		save.Design, save.Request = d.ID, key
		if save.Base, err = matchedRevision(ctx, saved, &d, match); err != nil {
			return record.Answer{}, err
		}
		answer, err := s.apiSave(ctx, r, saved, http.StatusOK, save)
		if used, ok := errors.AsType[*record.UsedError](err); ok && match.any && used.Made == d.ID {
			// What * stood for may have been what this same request then saved.
			save.Base = int(used.Number) - 1
			answer, err = s.apiSave(ctx, r, saved, http.StatusOK, save)
		}
		return answer, err
	})
}

// apiSave saves a design and answers with what was saved.
func (s *Server) apiSave(ctx context.Context, r *http.Request, saved Saving, status int, save store.Save) (record.Answer, error) {
	v, err := saved.SaveRevision(ctx, actorOf(r), save)
	if err != nil {
		return record.Answer{}, err
	}
	d, err := saved.Design(ctx, v.Design)
	if err != nil {
		return record.Answer{}, err
	}
	d.Revision = v.Number // another may be saved already; this answer is about this one
	return newAnswer(status, "/api/v1/designs/"+url.PathEscape(string(d.ID)), designTag(d, v.Frozen.SHA256), newAPIDesign(&d, &v))
}

// matchedRevision returns the revision that a change rests on: one that an If-Match
// names with the hash of its content. If it is not the newest, the save is refused
// where it is made, unless it repeats the save that made the newest. A design that
// was archived or restored meanwhile does not match.
func matchedRevision(ctx context.Context, saved Saving, d *record.Design, match entityTags) (int, error) {
	if match.any {
		return d.Revision, nil
	}
	for _, tag := range match.strong {
		number, sum, archived, ok := namedRevision(tag)
		if !ok || archived != (d.ArchivedAt != nil) {
			continue
		}
		v, err := saved.Revision(ctx, d.ID, number)
		if errors.Is(err, record.ErrNotFound) {
			continue
		}
		if err != nil {
			return 0, err
		}
		if number == v.Number && sum == v.Frozen.SHA256 {
			return number, nil
		}
	}
	return 0, &record.StaleError{Newest: int64(d.Revision)}
}

// apiArchiveDesign takes a design out of use. What is archived already stays so.
func (s *Server) apiArchiveDesign(w http.ResponseWriter, r *http.Request, saved Saving) error {
	match, err := requireMatch(r)
	if err != nil {
		return err
	}
	d, err := saved.Design(r.Context(), record.ID(r.PathValue("id")))
	if err != nil {
		return err
	}
	before := d
	for _, tag := range match.strong {
		if _, _, archived, ok := namedRevision(tag); ok && !archived {
			before.ArchivedAt = nil // a repetition has the tag from before the archiving
		}
	}
	number, err := matchedRevision(r.Context(), saved, &before, match)
	if err != nil {
		return err
	}
	if number != d.Revision {
		return &record.StaleError{Newest: int64(d.Revision)}
	}
	if err := saved.Archive(r.Context(), actorOf(r), d.ID); err != nil {
		return err
	}
	w.WriteHeader(http.StatusNoContent)
	return nil
}

// apiRestoreDesign puts an archived design back into use.
func (s *Server) apiRestoreDesign(w http.ResponseWriter, r *http.Request, saved Saving) error {
	if err := saved.Restore(r.Context(), actorOf(r), record.ID(r.PathValue("id"))); err != nil {
		return err
	}
	w.WriteHeader(http.StatusNoContent)
	return nil
}

// apiRevisions lists the revisions of a design, the newest first.
func (s *Server) apiRevisions(w http.ResponseWriter, r *http.Request, saved Saving) error {
	revisions, err := saved.Revisions(r.Context(), record.ID(r.PathValue("id")))
	if err != nil {
		return err
	}
	answer := struct {
		Revisions []apiListedRevision `json:"revisions"`
	}{}
	for _, v := range revisions {
		answer.Revisions = append(answer.Revisions, apiListedRevision{
			SavedAt: v.Saved.At, SavedBy: apiActor(v.Saved.By),
			apiSummary: newAPISummary(&record.Revision{
				Number: v.Number, Base: v.Base, Note: v.Note, Frozen: record.Frozen{
					SHA256: v.SHA256, Engine: v.Engine, Rulebook: v.Rulebook, Title: v.Title, Site: v.Site, Verdict: v.Verdict, HeadroomC: v.HeadroomC,
				},
			}),
		})
	}
	return sendJSON(w, r, "", answer)
}

// apiRevision answers a revision, which never changes.
func (s *Server) apiRevision(w http.ResponseWriter, r *http.Request, saved Saving) error {
	number, err := strconv.Atoi(r.PathValue("n"))
	if err != nil || number < 1 {
		return record.ErrNotFound
	}
	v, err := saved.Revision(r.Context(), record.ID(r.PathValue("id")), number)
	if err != nil {
		return err
	}
	return sendJSON(w, r, revisionTag(v.Number, v.Frozen.SHA256), apiRevision{
		Design: string(v.Design), SavedAt: v.Saved.At, SavedBy: apiActor(v.Saved.By),
		apiSummary: newAPISummary(&v), apiContent: apiContent{v.Frozen.Document, v.Frozen.Result},
	})
}

// longestNote is how many characters the note of a revision may have.
const longestNote = 1000

// postedSave reads the design that a request carries, and the note beside it.
func (s *Server) postedSave(r *http.Request) (save store.Save, err error) {
	values, err := query(r, "note")
	if err != nil {
		return save, err
	}
	save.Note = values.Get("note")
	if n := utf8.RuneCountInString(save.Note); n > longestNote {
		return save, badRequest(fmt.Sprintf("The parameter note has %d characters; %d are the most.", n, longestNote), nil)
	}
	d, err := postedDesign(r)
	if err != nil {
		return save, err
	}
	save.Frozen = record.Freeze(d, s.cfg.Version)
	return save, nil
}

// encodeJSON returns what is answered as JSON, on one line.
func encodeJSON(content any) ([]byte, error) {
	var b bytes.Buffer
	enc := json.NewEncoder(&b)
	enc.SetEscapeHTML(false)
	err := enc.Encode(content)
	return b.Bytes(), err
}

// newAnswer makes the answer of a save.
func newAnswer(status int, location, tag string, content any) (record.Answer, error) {
	body, err := encodeJSON(content)
	a := record.Answer{Status: status, Body: body, Header: map[string]string{
		"Content-Type": "application/json", "Cache-Control": "no-store", "ETag": tag,
	}}
	if status == http.StatusCreated {
		a.Header["Location"] = location
	}
	return a, err
}

// sendJSON answers a GET. tag is the strong entity tag, "" for what has none; what
// the client has already is not sent.
func sendJSON(w http.ResponseWriter, r *http.Request, tag string, content any) error {
	h := w.Header()
	h.Set("Cache-Control", "no-cache, private")
	if tag != "" {
		h.Set("ETag", tag)
		if unchanged(r, tag) {
			w.WriteHeader(http.StatusNotModified)
			return nil
		}
	}
	body, err := encodeJSON(content)
	if err != nil {
		return err
	}
	h.Set("Content-Type", "application/json")
	h.Set("Content-Length", strconv.Itoa(len(body)))
	_, _ = w.Write(body)
	return nil
}
