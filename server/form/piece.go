package form

import (
	"bytes"
	"encoding/json"
	"maps"
	"slices"
	"strings"

	"rimeline/sizing/design"
)

// A piece is a module or an inverter of a form: what stands at its pointer, with the
// sources of its values and the answers about them. People keep pieces apart from
// designs, and copy them in and out; pointers are then those inside the piece.

// NewPiece returns a form with nothing but one entry of a list, /modules or /inverters.
func NewPiece(list string) *Form {
	f := empty()
	f.Add(list)
	return f
}

// ReadModule judges the module at a pointer alone, as Read judges a design. Faults
// have the pointers of the form.
func (f *Form) ReadModule(at string) (*design.Module, design.Faults) {
	w := f.piece(at)
	m, faults := design.ReadModule(w.dst)
	if faults = w.judged(beneath(at, faults)); faults != nil {
		return nil, faults
	}
	return m, nil
}

// ReadInverter judges the inverter at a pointer alone, as Read judges a design.
func (f *Form) ReadInverter(at string) (*design.Inverter, design.Faults) {
	w := f.piece(at)
	v, faults := design.ReadInverter(w.dst)
	if faults = w.judged(beneath(at, faults)); faults != nil {
		return nil, faults
	}
	return v, nil
}

func (f *Form) clone() *Form { return &Form{texts: maps.Clone(f.texts), lens: maps.Clone(f.lens)} }

// piece writes the entry at a pointer as a document of its own, without its id and its
// quantity, which are the design's.
func (f *Form) piece(at string) writer {
	w := writer{form: f.clone()}
	delete(w.form.texts, at+"/id")
	delete(w.form.texts, at+"/quantity")
	list, _, ok := f.entryAt(at)
	if !ok {
		w.dst = append(w.dst, "{}"...)
		return w
	}
	w.object(f.list(list), at)
	return w
}

func beneath(at string, faults design.Faults) design.Faults {
	for i := range faults {
		faults[i].Pointer = at + faults[i].Pointer
	}
	return faults
}

// Sources returns where the values of a piece come from, by their pointers inside it;
// "" is the piece as a whole. What is empty is left out.
func (f *Form) Sources(at string) map[string]string {
	sources := map[string]string{}
	for _, name := range f.Names("/sources/") {
		if inside, ok := within(SourceOf(name), at); ok && !blank(f.texts[name]) {
			sources[inside] = strings.TrimSpace(f.texts[name])
		}
	}
	return sources
}

// Answers returns the answers about the values of a piece that the reader takes.
func (f *Form) Answers(at string) []design.Answer {
	var answers []design.Answer
	for k := range f.lens["/answers"] {
		e := entry("/answers", k)
		inside, ok := within(f.texts[e+"/pointer"], at)
		if !ok {
			continue
		}
		alone := f.clone()
		alone.texts[e+"/pointer"] = inside
		w := writer{form: alone, dst: []byte{'['}}
		w.object(document.kid("answers"), e)
		read, _ := design.ReadAnswers(append(w.dst, ']'))
		answers = append(answers, read...)
	}
	return answers
}

// within returns the rest of a pointer below another.
func within(pointer, at string) (inside string, ok bool) {
	inside, ok = strings.CutPrefix(pointer, at)
	return inside, ok && (inside == "" || inside[0] == '/')
}

// Put copies a piece into the entry at a pointer, in place of all that stands there
// but its id and its quantity, which are the design's. The sources of its values and
// the answers about them come along. It reports whether there is such an entry, and
// room for what the piece has.
//
// What is wired to a tracker stays on the tracker of that name; where the piece does
// not have all the names, on the tracker in that place; and on none where there is
// none.
func (f *Form) Put(at string, piece []byte, sources map[string]string, answers []design.Answer) bool {
	list, _, ok := f.entryAt(at)
	values, err := decodeObject(piece)
	if !ok || err != nil {
		return false
	}
	delete(values, "id")
	delete(values, "quantity")
	g := f.clone()
	before := g.ids(at + "/trackers")
	g.clear(at)
	o := opener{form: g}
	o.object(f.list(list), values, at)
	g.number(at+"/trackers", "t")
	if g.texts[at+"/noct_c/unit"] == "" && list == "/modules" {
		g.texts[at+"/noct_c/unit"] = "°C"
	}
	for inside, from := range sources {
		g.texts[SourceName(at+inside)] = from
	}
	for _, a := range answers {
		e := entry("/answers", g.lens["/answers"])
		g.lens["/answers"]++
		g.texts[e+"/pointer"], g.texts[e+"/value_asked"], g.texts[e+"/reason"] = at+a.Pointer, string(a.ValueAsked), a.Reason
	}
	g.rewire(strings.TrimSpace(g.texts[at+"/id"]), before, g.ids(at+"/trackers"))
	if g.entries() > MaxEntries {
		return false
	}
	*f = *g
	return true
}

// decodeObject reads a JSON object; its numbers stay as they were written.
func decodeObject(text []byte) (map[string]any, error) {
	d := json.NewDecoder(bytes.NewReader(text))
	d.UseNumber()
	var object map[string]any
	err := d.Decode(&object)
	return object, err
}

// clear takes out all that stands in an entry but its id and its quantity, with the
// sources of its values and the answers about them.
func (f *Form) clear(at string) {
	for name := range f.texts {
		pointer := name
		if strings.HasPrefix(name, "/sources/") {
			pointer = SourceOf(name)
		}
		if _, ok := within(pointer, at); ok && name != at+"/id" && name != at+"/quantity" {
			delete(f.texts, name)
		}
	}
	for list := range f.lens {
		if _, ok := within(list, at); ok {
			delete(f.lens, list)
		}
	}
	for k := f.lens["/answers"] - 1; k >= 0; k-- {
		if _, ok := within(f.texts[entry("/answers", k)+"/pointer"], at); ok {
			f.removeEntry("/answers", k)
		}
	}
}

// ids returns the ids of a list's entries.
func (f *Form) ids(list string) []string {
	ids := make([]string, f.lens[list])
	for k := range ids {
		ids[k] = strings.TrimSpace(f.texts[entry(list, k)+"/id"])
	}
	return ids
}

// rewire lets strings follow the trackers of an inverter that got others.
func (f *Form) rewire(inverter string, before, after []string) {
	to := map[string]string{}
	byName := true
	for k, id := range before {
		to[id] = ""
		if k < len(after) {
			to[id] = after[k]
		}
		byName = byName && slices.Contains(after, id)
	}
	if byName {
		return
	}
	for k := range f.lens["/strings"] {
		at := entry("/strings", k)
		now, known := to[f.texts[at+"/tracker"]]
		if known && f.texts[at+"/inverter"] == inverter {
			f.texts[at+"/tracker"] = now
		}
	}
}
