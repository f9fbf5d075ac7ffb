package server

import (
	"bytes"
	"context"
	"crypto/rand"
	"errors"
	"fmt"
	"net/http"
	"net/url"
	"time"

	"rimeline/server/form"
	"rimeline/server/record"
	"rimeline/sizing/design"
	"rimeline/views"
)

// keptEquipment is the equipment that a page offers to pick from, as it is called in
// a list.
type keptEquipment struct {
	modules, inverters []pieceChoice
	more               bool // there is more than a page offers
}

type pieceChoice struct {
	id   record.ID
	name string
}

// mostOffered is how many pieces of a kind a page offers; a longer list is searched on
// its own page.
const mostOffered = 200

// keptMoment is the equipment as it was a moment ago.
type keptMoment struct {
	kept keptEquipment
	at   time.Time
}

// keptNow returns the equipment in use, as it is or was a moment ago, or why it cannot
// be had in the time that a page of a design can wait.
func (s *Server) keptNow(ctx context.Context) (keptEquipment, error) {
	if m := s.keptLately.Load(); m != nil && time.Since(m.at) < worksFor {
		return m.kept, nil
	}
	at := time.Now()
	saved, err := s.saving()
	if err != nil {
		return keptEquipment{}, err
	}
	ctx, cancel := context.WithTimeout(ctx, patience)
	defer cancel()
	names, err := saved.EquipmentNames(ctx, mostOffered+1)
	if err != nil {
		return keptEquipment{}, err
	}
	var kept keptEquipment
	for _, n := range names {
		list := &kept.modules
		if n.Kind == record.KindInverter {
			list = &kept.inverters
		}
		if len(*list) == mostOffered {
			kept.more = true
			continue
		}
		*list = append(*list, pieceChoice{n.ID, pieceName(n.Maker, n.Model)})
	}
	s.keptLately.Store(&keptMoment{kept, at})
	return kept, nil
}

// pieceName is what a module or an inverter is called in a list, by its model first.
func pieceName(maker, model string) string {
	switch {
	case model == "":
		return maker
	case maker == "":
		return model
	}
	return model + ", " + maker
}

// offered are pieces as choices of a list.
func offered(pieces []pieceChoice, none string) [][2]string {
	choices := [][2]string{{"", none}}
	for _, p := range pieces {
		choices = append(choices, [2]string{string(p.id), p.name})
	}
	return choices
}

// pickName stands before the pointer of an entry to make the name of the list in which
// the kept equipment is chosen that is to be copied into it.
const pickName = "pick:"

// offerKept puts beside each module and inverter of a design's page what may be copied
// into it, and the button that keeps what it has.
func (s *Server) offerKept(r *http.Request, p *views.DesignPage) {
	kept, err := s.keptNow(r.Context())
	if err != nil {
		s.log.WarnContext(r.Context(), "kept equipment is not offered", "request_id", visitOf(r).requestID, "error", err)
		return
	}
	for i := range p.Sections {
		for k := range p.Sections[i].Groups {
			g := &p.Sections[i].Groups[k]
			switch p.Sections[i].ID {
			case "modules":
				g.Kept = newKeptOffer("/modules", "module", k, g.Heading, kept.modules)
			case "inverters":
				g.Kept = newKeptOffer("/inverters", "inverter", k, g.Heading, kept.inverters)
			}
		}
	}
}

func newKeptOffer(list, what string, k int, heading string, pieces []pieceChoice) *views.KeptOffer {
	at := pointerOf(list, k)
	o := &views.KeptOffer{
		ID: "pick" + views.FieldID(at), Name: pickName + at, Label: "Take from the equipment kept here",
		Take: views.Button{Do: "pick " + at, Words: "Take it", Spoken: prefixed("into ", heading)},
		Keep: views.Button{Do: "keep " + at, Words: "Keep this " + what, Spoken: prefixed(", ", heading)},
	}
	if len(pieces) > 0 {
		for _, c := range offered(pieces, "Choose one") {
			o.Choices = append(o.Choices, views.Choice{Value: c[0], Words: c[1]})
		}
	}
	return o
}

// putFirst copies kept equipment into the first entry of its list.
func (s *Server) putFirst(ctx context.Context, f *form.Form, id record.ID) error {
	saved, err := s.saving()
	if err != nil {
		return err
	}
	e, err := saved.Equipment(ctx, id)
	if err != nil {
		return err
	}
	if !f.Put(pointerOf(listOf(e.Kind), 0), e.Document, e.Sources, e.Answers) {
		return tooManyEntries
	}
	return nil
}

// workWithKept copies kept equipment into a module or an inverter of the form, or keeps
// what that has. It says beside it what was done.
func (s *Server) workWithKept(w http.ResponseWriter, r *http.Request, f *form.Form, verb, at string) error {
	list, k, ok := entryOf(f, at)
	if !ok {
		return badRequest("The form has no such module or inverter.", fmt.Errorf("%s %q", verb, at))
	}
	status, said := http.StatusOK, keptSaid{}
	var err error
	if verb == "pick" {
		said, err = s.pick(r, f, at)
	} else {
		said, err = s.keepEntry(r, f, list, at)
	}
	if err != nil {
		failure := savingFailure(err, false)
		if failure == nil {
			return err
		}
		status, said = failure.status, keptSaid{words: failure.message + " Everything that you typed stands in the form."}
		for name, value := range failure.header {
			w.Header().Set(name, value)
		}
	}
	j := judge(f)
	base := newBase(titled("Design", f), "/design")
	marked, m := j, marking{focus: at}
	if said.faults != nil {
		status = http.StatusUnprocessableEntity
		marked.faults, m = said.faults, marking{faults: true}
	}
	p := s.designPage(r, base, marked, m, originOf(r.PostForm))
	p.Answer = newAnswerPane(j)
	p.Answer.Slots = nil
	if said.faults != nil {
		p.Faults.Heading = "This cannot be kept as it is"
	}
	for i := range p.Sections {
		if g := p.Sections[i].Groups; "/"+p.Sections[i].ID == list && g[k].Kept == nil {
			g[k].Kept = &views.KeptOffer{Keep: views.Button{Do: "keep " + at, Words: "Try again to keep it"}, Said: said.words}
		} else if "/"+p.Sections[i].ID == list {
			g[k].Kept.Said, g[k].Kept.Link = said.words, said.link
		}
	}
	return s.render(w, r, status, views.Design(p))
}

// entryOf splits the pointer of a module or an inverter that the form has.
func entryOf(f *form.Form, at string) (list string, k int, ok bool) {
	for _, list := range []string{"/modules", "/inverters"} {
		for k := range f.Len(list) {
			if at == pointerOf(list, k) {
				return list, k, true
			}
		}
	}
	return "", 0, false
}

// keptSaid is what is said beside a module or an inverter of a design.
type keptSaid struct {
	words  string
	link   *views.Link
	faults design.Faults // why it cannot be kept
}

func equipmentLink(e *record.Equipment, words string) *views.Link {
	return &views.Link{Href: "/equipment/" + url.PathEscape(string(e.ID)), Words: words}
}

// pick copies the kept equipment that was chosen into an entry of the form.
func (s *Server) pick(r *http.Request, f *form.Form, at string) (keptSaid, error) {
	id := r.PostForm.Get(pickName + at)
	if id == "" {
		return keptSaid{words: "Choose from the list what to take."}, nil
	}
	if err := s.putKept(r.Context(), f, at, record.ID(id)); err != nil {
		return keptSaid{}, err
	}
	return keptSaid{words: "Copied, with where its values stand on the datasheet. A later change of what is kept does not change this design."}, nil
}

// keepEntry keeps a module or an inverter of a design, unless it is kept already.
func (s *Server) keepEntry(r *http.Request, f *form.Form, list, at string) (keptSaid, error) {
	e, faults := readEntry(f, list, at)
	if faults != nil {
		return keptSaid{faults: faults}, nil
	}
	saved, err := s.saving()
	if err != nil {
		return keptSaid{}, err
	}
	ctx := context.WithoutCancel(r.Context())
	other, err := sameName(ctx, saved, &e)
	if err != nil {
		return keptSaid{}, err
	}
	switch {
	case other != nil && bytes.Equal(other.Document, e.Document):
		return keptSaid{words: "It is kept already, with the same values:", link: equipmentLink(other, pieceName(other.Maker, other.Model))}, nil
	case other != nil:
		return keptSaid{words: "It is kept already, with other values. Nothing was changed there:", link: equipmentLink(other, pieceName(other.Maker, other.Model))}, nil
	}
	kept, err := saved.SaveEquipment(ctx, actorOf(r), e, originOf(r.PostForm).request+views.FieldID(at))
	if errors.Is(err, record.ErrConflict) { // this page kept it under another name before
		kept, err = saved.SaveEquipment(ctx, actorOf(r), e, rand.Text())
	}
	if err != nil {
		return keptSaid{}, err
	}
	s.keptLately.Store(nil)
	return keptSaid{words: "It is kept:", link: equipmentLink(&kept, pieceName(kept.Maker, kept.Model))}, nil
}
