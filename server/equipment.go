package server

import (
	"context"
	"crypto/rand"
	"errors"
	"fmt"
	"net/http"
	"net/url"
	"strconv"
	"strings"
	"time"

	"github.com/go-chi/chi/v5"

	"rimeline/server/form"
	"rimeline/server/record"
	"rimeline/sizing/design"
	"rimeline/sizing/working"
	"rimeline/views"
)

// piece is a module or an inverter in its form, apart from any design. The form has
// nothing else, so that every field is called there what it is called in a design.
type piece struct {
	kind    record.Kind
	form    *form.Form
	id      record.ID // "" while it is not kept
	version int64     // the version that the form was made from
	note    string
	request string            // key of the save: a repetition makes nothing new
	copied  string            // the model that it was copied from, "" if of none
	copies  map[string]string // texts that were copied from it and must be looked up, by field
}

// at is the pointer of the piece in its form.
func (p *piece) at() string { return listOf(p.kind) + "/0" }

// newPiece is the form of a module or an inverter that nobody typed into yet.
func newPiece(kind record.Kind) *piece {
	return &piece{kind: kind, form: form.NewPiece(listOf(kind)), request: rand.Text()}
}

// pieceOf is the form of what is kept.
func pieceOf(e *record.Equipment) (*piece, error) {
	p := newPiece(e.Kind)
	if !p.form.Put(p.at(), e.Document, e.Sources, e.Answers) {
		return nil, fmt.Errorf("equipment %q does not fit into a form", e.ID)
	}
	p.id, p.version, p.note = e.ID, e.Version, e.Note
	return p, nil
}

// copiedName stands before the name of a field to make the name of the hidden one with
// the text that was copied into it.
const copiedName = "copied:"

// postedPiece reads a piece that was posted. What a page of ours cannot have sent is
// taken as not sent.
func postedPiece(r *http.Request) (*piece, error) {
	f, err := postedForm(r)
	if err != nil {
		return nil, err
	}
	p := newPiece(kindOf(r.PostForm.Get("kind")))
	if f.Len(listOf(p.kind)) > 0 {
		p.form = f
	}
	p.version, _ = strconv.ParseInt(r.PostForm.Get("version"), 10, 64)
	p.note = r.PostForm.Get("note")
	p.copied = r.PostForm.Get("copied")
	if key := r.PostForm.Get("request"); isID(key) {
		p.request = key
	}
	for _, name := range powerClass {
		field := p.at() + "/" + name
		if r.PostForm.Has(copiedName + field) {
			p.copy(field, r.PostForm.Get(copiedName+field))
		}
	}
	return p, nil
}

// kindOf reads a kind of equipment; what is none is a module.
func kindOf(word string) record.Kind {
	if record.Kind(word) == record.KindInverter {
		return record.KindInverter
	}
	return record.KindModule
}

func (p *piece) copy(field, text string) {
	if p.copies == nil {
		p.copies = map[string]string{}
	}
	p.copies[field] = text
}

// read judges the piece: it returns it as it is to be kept, or every reason why it
// cannot be, and the questions about it that are open.
func (p *piece) read() (record.Equipment, design.Faults, []working.Question) {
	e, faults := readEntry(p.form, listOf(p.kind), p.at())
	e.ID, e.Version, e.Note = p.id, p.version, strings.TrimSpace(p.note)
	if faults != nil || p.kind != record.KindModule {
		return e, faults, nil
	}
	m, faults := design.ReadModule(e.Document)
	if faults != nil {
		return e, faults, nil // it was written a moment ago
	}
	questions := m.Questions(e.Answers)
	for i := range questions {
		questions[i].Pointer = p.at() + questions[i].Pointer
	}
	return e, nil, questions
}

// readEntry reads a module or an inverter of a form as equipment, or returns every
// reason why it cannot be kept. It must have a model, by which it is found again.
func readEntry(f *form.Form, list, at string) (record.Equipment, design.Faults) {
	e := record.Equipment{Kind: record.KindModule, Sources: f.Sources(at), Answers: f.Answers(at)}
	var faults design.Faults
	if list == listOf(record.KindInverter) {
		e.Kind = record.KindInverter
		var v *design.Inverter
		if v, faults = f.ReadInverter(at); v != nil {
			e.Maker, e.Model, e.Document = v.Maker, v.Model, design.AppendInverter(nil, v)
		}
	} else {
		var m *design.Module
		if m, faults = f.ReadModule(at); m != nil {
			e.Maker, e.Model, e.Document = m.Maker, m.Model, design.AppendModule(nil, m)
		}
	}
	if strings.TrimSpace(f.Text(at+"/model")) == "" {
		faults = append(design.Faults{{
			Pointer: at + "/model", Found: "nothing", Expected: "a model", Detail: "Enter the model, by which it is found again.",
		}}, faults...)
	}
	return e, faults
}

// askedEquipment reads what the list is asked for. What it does not know is left aside.
func askedEquipment(query url.Values) record.EquipmentListing {
	l := record.EquipmentListing{
		Kind:     kindOf(query.Get("kind")),
		Words:    strings.TrimSpace(query.Get("q")),
		Archived: query.Get("archived") == "yes",
		Sort:     record.SortName,
		Reversed: query.Get("order") == "reversed",
		Cursor:   query.Get("at"),
	}
	if query.Get("sort") == string(record.SortUpdated) {
		l.Sort = record.SortUpdated
	}
	return l
}

// equipmentQuery is the query by which a list is asked for again.
func equipmentQuery(l record.EquipmentListing) url.Values {
	query := url.Values{}
	for _, part := range []struct {
		name, value string
		on          bool
	}{
		{"kind", string(l.Kind), l.Kind != record.KindModule},
		{"q", l.Words, l.Words != ""},
		{"archived", "yes", l.Archived},
		{"sort", string(l.Sort), l.Sort != record.SortName},
		{"order", "reversed", l.Reversed},
		{"at", l.Cursor, l.Cursor != ""},
	} {
		if part.on {
			query.Set(part.name, part.value)
		}
	}
	return query
}

func equipmentAddress(l record.EquipmentListing) string {
	if query := equipmentQuery(l); len(query) > 0 {
		return "/equipment?" + query.Encode()
	}
	return "/equipment"
}

// showEquipmentList shows a page of the modules or the inverters that are kept.
func (s *Server) showEquipmentList(w http.ResponseWriter, r *http.Request, saved Saving) error {
	query := r.URL.Query()
	l := askedEquipment(query)
	found, err := saved.EquipmentList(r.Context(), l)
	if errors.Is(err, record.ErrInvalid) && l.Cursor != "" { // a link from another order, or one that was cut short
		l.Cursor = ""
		http.Redirect(w, r, equipmentAddress(l), http.StatusSeeOther)
		return nil
	}
	if err != nil {
		return err
	}
	var pieces []record.Use
	for _, e := range found.Equipment {
		pieces = append(pieces, record.Use{Kind: e.Kind, Maker: e.Maker, Model: e.Model})
	}
	uses, err := saved.UseCounts(r.Context(), pieces)
	if err != nil {
		return err
	}
	p := newEquipmentListPage(l, found, uses, time.Now())
	p.Said, err = saidOfEquipment(r.Context(), saved, query.Get("done"), query.Get("of"), p.Back)
	if err != nil {
		return err
	}
	return s.render(w, r, http.StatusOK, views.EquipmentList(p))
}

// saidOfEquipment tells what has just been done to equipment, nil if nothing was.
func saidOfEquipment(ctx context.Context, saved Saving, done, of, back string) (*views.Said, error) {
	if done != "archived" && done != "restored" {
		return nil, nil
	}
	e, err := saved.Equipment(ctx, record.ID(of))
	if errors.Is(err, record.ErrNotFound) {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	undo := &views.Action{Spoken: " " + e.Model, Fields: []views.HiddenField{{Name: "back", Value: back}}}
	if done == "archived" {
		undo.Words, undo.Path = "Restore it", "/equipment/"+of+"/restore"
		return &views.Said{Words: fmt.Sprintf("“%s” is archived: it is no longer offered. Designs that carry a copy keep it.", e.Model), Undo: undo}, nil
	}
	undo.Words, undo.Path = "Archive it again", "/equipment/"+of+"/archive"
	return &views.Said{Words: fmt.Sprintf("“%s” is restored, and offered in designs.", e.Model), Undo: undo}, nil
}

// showNewEquipment shows the empty form of a module or an inverter.
func (s *Server) showNewEquipment(w http.ResponseWriter, r *http.Request) error {
	p := newPiece(kindOf(r.URL.Query().Get("kind")))
	return s.render(w, r, http.StatusOK, views.EquipmentForm(newEquipmentPage(p, nil, pieceState{})))
}

// showEquipment shows the form of a module or an inverter that is kept.
func (s *Server) showEquipment(w http.ResponseWriter, r *http.Request, saved Saving) error {
	e, err := saved.Equipment(r.Context(), record.ID(chi.URLParam(r, "id")))
	if err != nil {
		return err
	}
	p, err := pieceOf(&e)
	if err != nil {
		return err
	}
	st := pieceState{}
	st.used, err = saved.WhereUsed(r.Context(), e.Kind, e.Maker, e.Model, mostOffered)
	if err != nil {
		return err
	}
	_, _, questions := p.read()
	st.questions = questions
	if n := r.URL.Query().Get("kept"); n != "" && n == strconv.FormatInt(e.Version, 10) {
		st.said = keptWords(e.Version, len(questions))
	}
	return s.render(w, r, http.StatusOK, views.EquipmentForm(newEquipmentPage(p, &e, st)))
}

// keptWords tells that a piece is kept, and what is still asked about it.
func keptWords(version int64, open int) string {
	said := "It is kept, and offered in every design."
	if version > 1 {
		said = fmt.Sprintf("It is kept as version %d. Designs that carry a copy stay as they are.", version)
	}
	switch {
	case open == 1:
		said += " One value looks like a slip; each design will ask until a reason is given."
	case open > 1:
		said += fmt.Sprintf(" %d values look like slips; each design will ask until reasons are given.", open)
	}
	return said
}

// addEquipment keeps a new module or inverter.
func (s *Server) addEquipment(w http.ResponseWriter, r *http.Request) error {
	p, err := postedPiece(r)
	if err != nil {
		return err
	}
	return s.workOnPiece(w, r, p)
}

// reviseEquipment keeps another version of a module or an inverter. Designs that
// carry a copy stay as they are.
func (s *Server) reviseEquipment(w http.ResponseWriter, r *http.Request) error {
	p, err := postedPiece(r)
	if err != nil {
		return err
	}
	p.id = record.ID(chi.URLParam(r, "id"))
	return s.workOnPiece(w, r, p)
}

// workOnPiece does what the button says that was pressed: it changes the form, or
// keeps what it holds. Whatever keeps it from that, the answer holds the whole form.
func (s *Server) workOnPiece(w http.ResponseWriter, r *http.Request, p *piece) error {
	do := r.PostForm.Get("do")
	if field, ok := strings.CutPrefix(do, "theirs "); ok {
		return s.takeTheirs(w, r, p, field)
	}
	if do != "" {
		focus, err := change(p.form, do)
		if err != nil {
			return err
		}
		return s.showPiece(w, r, http.StatusOK, p, pieceState{focus: focus})
	}
	e, faults, questions := p.read()
	if faults != nil {
		return s.showPiece(w, r, http.StatusUnprocessableEntity, p, pieceState{faults: faults})
	}
	saved, err := s.saving()
	if err != nil {
		return s.showUnkept(w, r, p, questions, err)
	}
	// The save is done though the browser may not wait for it.
	ctx := context.WithoutCancel(r.Context())
	if p.id != "" {
		now, err := saved.Equipment(ctx, p.id)
		if err != nil {
			return s.showUnkept(w, r, p, questions, err)
		}
		if now.Kind != p.kind {
			return badRequest("What is kept stays a module or an inverter, as it was entered.", fmt.Errorf("equipment %q is no %s", p.id, p.kind))
		}
	}
	other, err := sameName(ctx, saved, &e)
	if err != nil {
		return s.showUnkept(w, r, p, questions, err)
	}
	if other != nil {
		return s.showPiece(w, r, http.StatusUnprocessableEntity, p, pieceState{questions: questions, faults: design.Faults{nameTaken(p, other)}})
	}
	kept, err := saved.SaveEquipment(ctx, actorOf(r), e, p.request)
	if errors.Is(err, record.ErrConflict) && p.id != "" {
		// The key kept an earlier text of this page, so the version is stale by now and
		// the answer to that shows both.
		kept, err = saved.SaveEquipment(ctx, actorOf(r), e, rand.Text())
	}
	if _, stale := errors.AsType[*record.StaleError](err); stale {
		return s.showStale(w, r, saved, p)
	}
	if err != nil {
		return s.showUnkept(w, r, p, questions, err)
	}
	s.keptLately.Store(nil)
	http.Redirect(w, r, fmt.Sprintf("/equipment/%s?kept=%d", kept.ID, kept.Version), http.StatusSeeOther)
	return nil
}

// sameName returns another piece of the same kind, maker and model, nil if there is
// none: designs are known to use a piece by these, and people pick by them.
func sameName(ctx context.Context, saved Saving, e *record.Equipment) (*record.Equipment, error) {
	for _, archived := range []bool{false, true} {
		found, err := saved.EquipmentList(ctx, record.EquipmentListing{Kind: e.Kind, Words: e.Maker + " " + e.Model, Archived: archived, Limit: mostOffered})
		if err != nil {
			return nil, err
		}
		for _, other := range found.Equipment {
			if other.ID != e.ID && folded(other.Maker) == folded(e.Maker) && folded(other.Model) == folded(e.Model) {
				return &other, nil
			}
		}
	}
	return nil, nil
}

// folded is a name without what people vary: capitals and spaces.
func folded(name string) string { return strings.ToLower(strings.Join(strings.Fields(name), " ")) }

func nameTaken(p *piece, other *record.Equipment) design.Fault {
	where := "is kept already"
	if other.ArchivedAt != nil {
		where = "is kept already, among what is archived"
	}
	return design.Fault{
		Pointer: p.at() + "/model", Found: other.Model, Expected: "a model that is not kept yet",
		Detail: fmt.Sprintf("“%s” %s. Open that one to change it, or name here what differs: the power class, the revision.", pieceName(other.Maker, other.Model), where),
	}
}

// showUnkept shows the form again, with why it was not kept and what to do.
func (s *Server) showUnkept(w http.ResponseWriter, r *http.Request, p *piece, questions []working.Question, cause error) error {
	failure := savingFailure(cause, false)
	if failure == nil {
		return cause
	}
	st := pieceState{questions: questions, refused: &views.Refusal{Heading: "Not kept", Lead: failure.message}}
	if used, ok := errors.AsType[*record.UsedError](cause); ok {
		p.request = rand.Text()
		st.refused.Heading = "Not kept: this page has kept another text before"
		st.refused.Lead = "What this page sent earlier was kept after all, and what stands here now is not the same. Open that one to go on with it, or give this one a name of its own and keep it too."
		st.earlier = used.Made
	} else if failure.heading != "" {
		st.refused.Heading = failure.heading
	}
	if failure.status == http.StatusServiceUnavailable {
		st.refused.Lead += " Everything that you typed stands below."
	}
	for name, value := range failure.header {
		w.Header().Set(name, value)
	}
	s.log.WarnContext(r.Context(), "equipment not kept", "request_id", visitOf(r).requestID, "status", failure.status, "error", cause)
	return s.showPiece(w, r, failure.status, p, st)
}

// showPiece shows the form of a piece as it was posted.
func (s *Server) showPiece(w http.ResponseWriter, r *http.Request, status int, p *piece, st pieceState) error {
	if st.faults == nil && st.questions == nil {
		_, _, st.questions = p.read()
	}
	return s.render(w, r, status, views.EquipmentForm(newEquipmentPage(p, nil, st)))
}

// showStale shows what was kept meanwhile beside what was typed. The form holds what
// was typed; keeping it then takes the place of the other.
func (s *Server) showStale(w http.ResponseWriter, r *http.Request, saved Saving, p *piece) error {
	now, err := saved.Equipment(r.Context(), p.id)
	if err != nil {
		return s.showUnkept(w, r, p, nil, err)
	}
	theirs, err := pieceOf(&now)
	if err != nil {
		return err
	}
	p.version, p.request = now.Version, rand.Text()
	st := pieceState{stale: newStale(p, theirs, &now, time.Now())}
	return s.showPiece(w, r, http.StatusConflict, p, st)
}

// takeTheirs takes what is kept of one field into the form.
func (s *Server) takeTheirs(w http.ResponseWriter, r *http.Request, p *piece, field string) error {
	saved, err := s.saving()
	if err != nil {
		return s.showUnkept(w, r, p, nil, err)
	}
	now, err := saved.Equipment(r.Context(), p.id)
	if err != nil {
		return s.showUnkept(w, r, p, nil, err)
	}
	theirs, err := pieceOf(&now)
	if err != nil {
		return err
	}
	p.take(theirs, field)
	st := pieceState{stale: newStale(p, theirs, &now, time.Now())}
	return s.showPiece(w, r, http.StatusOK, p, st)
}

// duplicateEquipment shows the form of a new piece with the values of another one,
// as typed if they come along. Nothing is kept yet: what differs must be looked up.
func (s *Server) duplicateEquipment(w http.ResponseWriter, r *http.Request) error {
	p, err := postedPiece(r)
	if err != nil {
		return err
	}
	if id := record.ID(chi.URLParam(r, "id")); !r.PostForm.Has("version") { // from the list
		saved, err := s.saving()
		if err != nil {
			return err
		}
		e, err := saved.Equipment(r.Context(), id)
		if err != nil {
			return err
		}
		if p, err = pieceOf(&e); err != nil {
			return err
		}
	}
	return s.showPiece(w, r, http.StatusOK, p.duplicate(), pieceState{})
}

// archiveEquipment takes a piece out of what designs are offered. What was typed into
// its form meanwhile would be lost by that, and is shown again.
func (s *Server) archiveEquipment(w http.ResponseWriter, r *http.Request, saved Saving) error {
	id := chi.URLParam(r, "id")
	p, err := postedPiece(r)
	if err != nil {
		return err
	}
	if r.PostForm.Has("version") { // from its form
		p.id = record.ID(id)
		now, err := saved.Equipment(r.Context(), p.id)
		if err != nil {
			return err
		}
		kept, err := pieceOf(&now)
		if err != nil {
			return err
		}
		if len(pieceDifferences(p, kept)) > 0 {
			return s.showPiece(w, r, http.StatusConflict, p, pieceState{refused: &views.Refusal{
				Heading: "Not archived: the form holds changes", Lead: "Keep them first, or open the equipment anew without them; then archive it.",
			}})
		}
	}
	if err := saved.ArchiveEquipment(r.Context(), actorOf(r), record.ID(id)); err != nil {
		return err
	}
	s.keptLately.Store(nil)
	return backToEquipment(w, r, "archived", id)
}

// restoreEquipment puts an archived piece back.
func (s *Server) restoreEquipment(w http.ResponseWriter, r *http.Request, saved Saving) error {
	id := chi.URLParam(r, "id")
	if err := saved.RestoreEquipment(r.Context(), actorOf(r), record.ID(id)); err != nil {
		return err
	}
	s.keptLately.Store(nil)
	return backToEquipment(w, r, "restored", id)
}

// backToEquipment leads back to the list as it was shown, which then tells what was done.
func backToEquipment(w http.ResponseWriter, r *http.Request, done, id string) error {
	if err := r.ParseForm(); err != nil {
		return badRequest("The form could not be read.", err)
	}
	shown, _ := url.ParseQuery(r.PostForm.Get("back")) // only what a list knows is taken of it
	if r.PostForm.Has("kind") {
		shown.Set("kind", r.PostForm.Get("kind"))
	}
	query := equipmentQuery(askedEquipment(shown))
	query.Set("done", done)
	query.Set("of", id)
	http.Redirect(w, r, "/equipment?"+query.Encode(), http.StatusSeeOther)
	return nil
}
