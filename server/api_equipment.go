package server

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"net/http"
	"net/url"
	"slices"
	"strings"
	"time"

	"rimeline/server/record"
	"rimeline/sizing/design"
)

// apiKept is equipment as the interface has it. Of Module and Inverter one is there.
type apiKept struct {
	ID         string            `json:"id"`
	Kind       string            `json:"kind"`
	Version    int64             `json:"version"`
	Module     json.RawMessage   `json:"module,omitempty"`
	Inverter   json.RawMessage   `json:"inverter,omitempty"`
	Sources    map[string]string `json:"sources"`
	Answers    json.RawMessage   `json:"answers"`
	Note       string            `json:"note"`
	CreatedAt  time.Time         `json:"created_at"`
	CreatedBy  apiActor          `json:"created_by"`
	UpdatedAt  time.Time         `json:"updated_at"`
	UpdatedBy  apiActor          `json:"updated_by"`
	ArchivedAt *time.Time        `json:"archived_at,omitempty"`
}

func newAPIKept(e *record.Equipment) apiKept {
	k := apiKept{
		ID: string(e.ID), Kind: string(e.Kind), Version: e.Version, Sources: e.Sources, Answers: design.AppendAnswers(nil, e.Answers), Note: e.Note,
		CreatedAt: e.Created.At, CreatedBy: apiActor(e.Created.By), UpdatedAt: e.Updated.At, UpdatedBy: apiActor(e.Updated.By), ArchivedAt: e.ArchivedAt,
	}
	if e.Kind == record.KindModule {
		k.Module = e.Document
	} else {
		k.Inverter = e.Document
	}
	return k
}

// apiEquipmentList lists the equipment that is kept.
func (s *Server) apiEquipmentList(w http.ResponseWriter, r *http.Request, saved Saving) error {
	ask, err := equipmentListing(r)
	if err != nil {
		return err
	}
	page, err := saved.EquipmentList(r.Context(), ask)
	if err != nil {
		return listError(err)
	}
	answer := struct {
		Equipment []apiKept `json:"equipment"`
		apiPage
	}{[]apiKept{}, newAPIPage(r, page.Total, page.More, page.Next, page.Previous)}
	for _, e := range page.Equipment {
		answer.Equipment = append(answer.Equipment, newAPIKept(&e))
	}
	return sendJSON(w, r, "", answer)
}

// apiEquipment answers a module or an inverter.
func (s *Server) apiEquipment(w http.ResponseWriter, r *http.Request, saved Saving) error {
	e, err := saved.Equipment(r.Context(), record.ID(r.PathValue("id")))
	if err != nil {
		return err
	}
	return sendJSON(w, r, equipmentTag(e), newAPIKept(&e))
}

// apiAddEquipment keeps a new module or inverter.
func (s *Server) apiAddEquipment(w http.ResponseWriter, r *http.Request, saved Saving) error {
	e, err := postedEquipment(r)
	if err != nil {
		return err
	}
	return s.once(w, r, saved, func(ctx context.Context, key string) (record.Answer, error) {
		return s.apiKeep(ctx, r, saved, http.StatusCreated, e, key)
	})
}

// apiReviseEquipment changes a module or an inverter. Designs that carry a copy of it
// keep what they have.
func (s *Server) apiReviseEquipment(w http.ResponseWriter, r *http.Request, saved Saving) error {
	match, err := requireMatch(r)
	if err != nil {
		return err
	}
	e, err := postedEquipment(r)
	if err != nil {
		return err
	}
	return s.once(w, r, saved, func(ctx context.Context, key string) (record.Answer, error) {
		now, err := saved.Equipment(ctx, record.ID(r.PathValue("id")))
		if err != nil {
			return record.Answer{}, err
		}
		if now.Kind != e.Kind {
			return record.Answer{}, refused(fmt.Sprintf("This is an entry of kind %s, and stays one.", now.Kind), design.Faults{{
				Pointer: "/" + string(e.Kind), Found: string(e.Kind), Expected: string(now.Kind),
				Detail: "What is kept does not change its kind. Add the other as a new entry.",
			}})
		}
		e.ID = now.ID
		if e.Version, err = matchedVersion(&now, match); err != nil {
			return record.Answer{}, err
		}
		answer, err := s.apiKeep(ctx, r, saved, http.StatusOK, e, key)
		if used, ok := errors.AsType[*record.UsedError](err); ok && match.any && used.Made == e.ID {
			// What * stood for may have been what this same request then saved.
			e.Version = used.Number - 1
			answer, err = s.apiKeep(ctx, r, saved, http.StatusOK, e, key)
		}
		return answer, err
	})
}

// apiKeep saves equipment and answers with what was saved.
func (s *Server) apiKeep(ctx context.Context, r *http.Request, saved Saving, status int, e record.Equipment, key string) (record.Answer, error) {
	e, err := saved.SaveEquipment(ctx, actorOf(r), e, key)
	if err != nil {
		return record.Answer{}, err
	}
	return newAnswer(status, "/api/v1/equipment/"+url.PathEscape(string(e.ID)), equipmentTag(e), newAPIKept(&e))
}

// matchedVersion returns the version that a change rests on: one that an If-Match
// names. If it is not the newest, the save is refused where it is made, unless it
// repeats the save that made the newest.
func matchedVersion(now *record.Equipment, match entityTags) (int64, error) {
	if match.any {
		return now.Version, nil
	}
	then := *now
	for _, tag := range match.strong {
		if _, err := fmt.Sscanf(tag, `"%d`, &then.Version); err == nil && tag == equipmentTag(then) && then.Version <= now.Version {
			return then.Version, nil
		}
	}
	return 0, &record.StaleError{Newest: now.Version}
}

// apiArchiveEquipment takes equipment out of use. What is archived already stays so.
func (s *Server) apiArchiveEquipment(w http.ResponseWriter, r *http.Request, saved Saving) error {
	match, err := requireMatch(r)
	if err != nil {
		return err
	}
	now, err := saved.Equipment(r.Context(), record.ID(r.PathValue("id")))
	if err != nil {
		return err
	}
	version, err := matchedVersion(&now, match)
	if err != nil {
		inUse := now
		inUse.ArchivedAt = nil // a repetition has the tag from before the archiving
		version, err = matchedVersion(&inUse, match)
	}
	if err != nil {
		return err
	}
	if version != now.Version {
		return &record.StaleError{Newest: now.Version}
	}
	if err := saved.ArchiveEquipment(r.Context(), actorOf(r), now.ID); err != nil {
		return err
	}
	w.WriteHeader(http.StatusNoContent)
	return nil
}

// apiRestoreEquipment puts archived equipment back into use.
func (s *Server) apiRestoreEquipment(w http.ResponseWriter, r *http.Request, saved Saving) error {
	if err := saved.RestoreEquipment(r.Context(), actorOf(r), record.ID(r.PathValue("id"))); err != nil {
		return err
	}
	w.WriteHeader(http.StatusNoContent)
	return nil
}

// postedEquipment reads the module or inverter that a request carries, with the
// sources of its values, the answers about them, and a note.
func postedEquipment(r *http.Request) (record.Equipment, error) {
	var none record.Equipment
	if err := requireJSON(r); err != nil {
		return none, err
	}
	body := visitOf(r).body
	if whole := design.Read(body); whole.Malformed {
		return none, malformed(whole.Faults)
	}
	sent, faults := readMembers(body, "module", "inverter", "sources", "answers", "note")
	const told = "The equipment was refused; errors lists every reason."
	_, isModule := sent["module"]
	_, isInverter := sent["inverter"]
	if faults == nil && isModule == isInverter {
		found := "neither a module nor an inverter"
		if isModule {
			found = "a module and an inverter"
		}
		faults = design.Faults{{Found: found, Expected: "one module or one inverter", Detail: "Send one piece of equipment at a time, as module or as inverter."}}
	}
	if faults != nil {
		return none, refused(told, faults)
	}
	kind := record.KindModule
	if isInverter {
		kind = record.KindInverter
	}
	e, faults := record.ReadEquipment(kind, sent[string(kind)])
	faults = beneath("/"+string(kind), faults)
	if text, ok := sent["answers"]; ok {
		answers, more := design.ReadAnswers(text)
		e.Answers, faults = answers, append(faults, beneath("/answers", more)...)
	}
	var more design.Faults
	e.Sources, e.Note, more = readSources(sent["sources"], sent["note"])
	if faults = append(faults, more...); faults != nil {
		return none, refused(told, faults)
	}
	return e, nil
}

// beneath returns faults with the pointer of what they are in put before theirs.
func beneath(place string, faults design.Faults) design.Faults {
	for i := range faults {
		faults[i].Pointer = place + faults[i].Pointer
	}
	return faults
}

// readMembers returns the members of a JSON object, whose names must be among these.
// The text is known to be JSON.
func readMembers(text []byte, names ...string) (map[string]json.RawMessage, design.Faults) {
	expected := strings.Join(names, ", ")
	dec := json.NewDecoder(bytes.NewReader(bytes.TrimPrefix(text, []byte("\ufeff"))))
	if begin, err := dec.Token(); err != nil || begin != json.Delim('{') {
		return nil, design.Faults{{Found: "another kind of value", Expected: "a JSON object", Detail: "Send an object with " + expected + "."}}
	}
	members := map[string]json.RawMessage{}
	var faults design.Faults
	for dec.More() {
		name, err := dec.Token()
		var value json.RawMessage
		if err == nil {
			err = dec.Decode(&value)
		}
		member, isText := name.(string)
		if err != nil || !isText {
			break // not JSON after all; what is missing then is told
		}
		place := "/" + strings.NewReplacer("~", "~0", "/", "~1").Replace(member)
		_, twice := members[member]
		switch {
		case twice:
			faults = append(faults, design.Fault{Pointer: place, Found: member + " a second time", Expected: member + " once", Detail: "Two members have the same name; leave one."})
		case !slices.Contains(names, member):
			faults = append(faults, design.Fault{Pointer: place, Found: fmt.Sprintf("the field %q", member), Expected: expected, Detail: "There is no such field here."})
		}
		members[member] = value
	}
	return members, faults
}

// readSources reads where the values came from, and a note; either may be missing.
// They have the form that a design gives its sources and its title, so the reader of
// designs judges them.
func readSources(sources, note json.RawMessage) (from map[string]string, words string, faults design.Faults) {
	from = map[string]string{}
	carrier := `{"format":"` + design.Format + `"`
	if sources != nil {
		carrier += `,"sources":` + string(sources)
	}
	if note != nil {
		carrier += `,"title":` + string(note)
	}
	for _, f := range design.Read([]byte(carrier + "}")).Faults {
		switch {
		case strings.HasPrefix(f.Pointer, "/sources"):
			faults = append(faults, f)
		case f.Pointer == "/title" && note != nil:
			faults = append(faults, design.Fault{Pointer: "/note", Found: f.Found, Expected: "a text", Detail: "Enter the note as a text."})
		}
	}
	if faults != nil {
		return from, "", faults
	}
	if sources != nil && json.Unmarshal(sources, &from) != nil || note != nil && json.Unmarshal(note, &words) != nil {
		faults = design.Faults{{Pointer: "/sources", Found: "what cannot be read", Expected: "an object of texts", Detail: "Send an object of texts."}}
	}
	return from, words, faults
}
