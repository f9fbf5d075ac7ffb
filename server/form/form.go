package form

import (
	"errors"
	"net/url"
	"slices"
	"strconv"
	"strings"
)

// MaxEntries is how many entries a form may hold, all its lists together. A page
// with more would be of no use to a person and of much use to an attacker.
const MaxEntries = 400

// ErrTooMany is returned for a form or document with more than [MaxEntries] entries.
var ErrTooMany = errors.New("form: too many entries")

// Form is what was typed, field by field, as it was typed.
type Form struct {
	texts map[string]string // by pointer; one that was not offered is absent
	lens  map[string]int    // the number of entries of a list, by the list's pointer
}

// New returns the form of an empty design: one module, one inverter with one
// tracker, one roof plane, no strings.
func New() *Form {
	f := empty()
	f.texts["/voltage_method"] = "coefficient"
	f.texts["/short_circuit_basis"] = "maximum"
	f.texts["/allowances/headroom_c/unit"] = "°C"
	for _, list := range []string{"/modules", "/inverters", "/planes"} {
		f.Add(list)
	}
	return f
}

func empty() *Form { return &Form{texts: map[string]string{}, lens: map[string]int{}} }

// Text returns what stands in the field of a name, "" where there is nothing.
func (f *Form) Text(name string) string { return f.texts[name] }

// Has reports whether the form has the field of a name, with or without anything in it.
func (f *Form) Has(name string) bool {
	_, ok := f.texts[name]
	return ok
}

// SourceName returns the name of the field for where the value at a pointer comes from.
func SourceName(pointer string) string { return "/sources/" + Escape(pointer) }

// SourceOf returns the pointer that the source field of a name is about.
func SourceOf(name string) string { return unescape(strings.TrimPrefix(name, "/sources/")) }

// Len returns how many entries the list at a pointer has.
func (f *Form) Len(list string) int { return f.lens[list] }

// Names returns the names of all fields that hold something and begin with prefix, sorted.
func (f *Form) Names(prefix string) []string {
	var names []string
	for name, typed := range f.texts {
		if typed != "" && strings.HasPrefix(name, prefix) {
			names = append(names, name)
		}
	}
	slices.Sort(names)
	return names
}

// renamedFrom is put before the name of an id's field to make the name of a hidden
// one that holds the id as it stood when the page was made. References to an id are
// chosen from a list that was made with the page, so they follow by it.
const renamedFrom = "was:"

// RenamedFrom returns the name of the hidden field beside the id at a pointer.
func RenamedFrom(pointer string) string { return renamedFrom + pointer }

// FromValues takes the fields of a posted form. Names that no field has are left
// aside, and a list is closed up where its numbering has gaps. Ids that the page
// does not show are made where they are missing, and a reference that can mean one
// entry only is put in.
func FromValues(values url.Values) (*Form, error) {
	f := empty()
	root := &branch{}
	entries := 0
	for name := range values {
		if root.insert(name, values.Get(name), &entries); entries > MaxEntries {
			return nil, ErrTooMany
		}
		if pointer, ok := strings.CutPrefix(name, "/sources/"); ok && !strings.Contains(pointer, "/") {
			f.texts[name] = values.Get(name)
			entries++
		}
	}
	renamed := map[string]string{}
	f.take(&document, root, "", "", func(now, was string) {
		if before := values.Get(renamedFrom + was); before != "" {
			renamed[strings.TrimSpace(before)] = strings.TrimSpace(now)
		}
	})
	f.complete(renamed)
	return f, nil
}

// branch is a part of a form while its lists are numbered as they were posted.
type branch struct {
	text string
	kids map[string]*branch
}

// insert puts a text where its name belongs; a name that no field has is left aside.
func (b *branch) insert(name, typed string, entries *int) {
	field, _, below := find(name)
	if field == nil || below != "" && (!field.kind.twoPart() || below != "/value" && below != "/unit") {
		return
	}
	for rest := name; rest != ""; {
		var segment string
		segment, rest = cutSegment(rest)
		if _, isEntry := index(segment); isEntry && b.kids[segment] == nil {
			*entries++
		}
		b = b.kid(segment)
	}
	b.text = typed
}

func (b *branch) kid(name string) *branch {
	if b.kids == nil {
		b.kids = map[string]*branch{}
	}
	if b.kids[name] == nil {
		b.kids[name] = &branch{}
	}
	return b.kids[name]
}

// index reads the number of an entry; "01" and "-" are none.
func index(segment string) (int, bool) {
	n, err := strconv.ParseUint(segment, 10, 30)
	return int(n), err == nil && strconv.FormatUint(n, 10) == segment
}

// take copies a branch into the form. at is the pointer with its lists closed up,
// posted the one that the page had. It tells each id that a person may have changed.
func (f *Form) take(n *node, b *branch, at, posted string, id func(now, was string)) {
	switch {
	case b == nil:
	case n.kids == nil && n.kind.twoPart():
		value, unit := b.kids["value"], b.kids["unit"]
		if b.text != "" && value == nil { // as a bare number stands in a document
			value = &branch{text: b.text}
		}
		if value != nil {
			f.texts[at+"/value"] = value.text
		}
		if unit != nil {
			f.texts[at+"/unit"] = unit.text
		}
	case n.kids == nil:
		f.texts[at] = b.text
		if n.name == "id" {
			id(b.text, posted)
		}
	case n.list:
		var order []int
		for segment := range b.kids {
			k, _ := index(segment)
			order = append(order, k)
		}
		slices.Sort(order)
		f.lens[at] = len(order)
		for k, was := range order {
			f.takeKids(n, b.kids[strconv.Itoa(was)], entry(at, k), entry(posted, was), id)
		}
	default:
		f.takeKids(n, b, at, posted, id)
	}
}

func (f *Form) takeKids(n *node, b *branch, at, posted string, id func(now, was string)) {
	for i := range n.kids {
		kid := &n.kids[i]
		f.take(kid, b.kids[kid.name], at+"/"+kid.name, posted+"/"+kid.name, id)
	}
}

// entry returns the pointer of entry k of a list.
func entry(list string, k int) string { return list + "/" + strconv.Itoa(k) }

// references are the fields that name another entry by its id.
var references = []struct{ list, field, to string }{
	{"/planes", "module", "/modules"},
	{"/strings", "inverter", "/inverters"},
	{"/strings", "plane", "/planes"},
}

// complete puts in what the page knows without asking, and lets references follow
// the ids that were renamed.
func (f *Form) complete(renamed map[string]string) {
	f.number("/modules", "m")
	f.number("/inverters", "i")
	for k := range f.lens["/inverters"] {
		f.number(entry("/inverters", k)+"/trackers", "t")
	}
	for k := range f.lens["/strings"] {
		at := entry("/strings", k)
		if now, ok := renamed[f.texts[at+"/plane"]]; ok {
			f.texts[at+"/plane"] = now
		}
		if strings.TrimSpace(f.texts[at+"/unit"]) == "" {
			f.texts[at+"/unit"] = "1"
		}
	}
	f.dropOpenAnswers()
	for _, ref := range references {
		if f.lens[ref.to] != 1 {
			continue
		}
		for k := range f.lens[ref.list] {
			if at := entry(ref.list, k) + "/" + ref.field; f.texts[at] == "" {
				f.texts[at] = strings.TrimSpace(f.texts[entry(ref.to, 0)+"/id"])
			}
		}
	}
}

// number gives an id to each entry of a list that has none.
func (f *Form) number(list, serial string) {
	for k := range f.lens[list] {
		if at := entry(list, k) + "/id"; strings.TrimSpace(f.texts[at]) == "" {
			f.texts[at] = f.freeID(list, serial)
		}
	}
}

// freeID returns the first of serial1, serial2, … that no entry of the list has.
func (f *Form) freeID(list, serial string) string {
	taken := map[string]bool{}
	for k := range f.lens[list] {
		taken[strings.TrimSpace(f.texts[entry(list, k)+"/id"])] = true
	}
	for n := 1; ; n++ {
		if id := serial + strconv.Itoa(n); !taken[id] {
			return id
		}
	}
}

// dropOpenAnswers removes the answers without a reason: the box for one is offered
// beside each open question, and an empty box answers nothing.
func (f *Form) dropOpenAnswers() {
	for k := f.lens["/answers"] - 1; k >= 0; k-- {
		if strings.TrimSpace(f.texts[entry("/answers", k)+"/reason"]) == "" {
			f.removeEntry("/answers", k)
		}
	}
}
