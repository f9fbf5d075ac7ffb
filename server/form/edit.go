package form

import (
	"maps"
	"strconv"
	"strings"
)

// Add puts a new entry at the end of a list and returns its pointer, "" where there
// is no such list or no room. What needs no asking is filled in.
func (f *Form) Add(list string) string {
	n := f.list(list)
	if n == nil || f.entries() >= MaxEntries {
		return ""
	}
	at := entry(list, f.lens[list])
	id := ""
	if n.serial != "" {
		id = f.freeID(list, n.serial)
	}
	f.lens[list]++
	if id != "" {
		f.texts[at+"/id"] = id
	}
	switch n.name {
	case "modules":
		f.texts[at+"/noct_c/unit"] = "°C"
	case "inverters":
		f.texts[at+"/quantity"] = "1"
		f.Add(at + "/trackers")
	case "planes":
		f.texts[at+"/id"] = f.planeName()
		f.texts[at+"/hot_cell_rise_c/unit"] = "°C"
		if f.lens["/modules"] == 1 {
			f.texts[at+"/module"] = f.texts["/modules/0/id"]
		}
	case "strings":
		f.wire(at)
	}
	return at
}

// planeName returns a name for the plane that was added last: by its place, or a
// later one where that is taken.
func (f *Form) planeName() string {
	taken := map[string]bool{}
	for k := range f.lens["/planes"] {
		taken[strings.TrimSpace(f.texts[entry("/planes", k)+"/id"])] = true
	}
	for n := f.lens["/planes"]; ; n++ {
		if name := "Plane " + strconv.Itoa(n); !taken[name] {
			return name
		}
	}
}

// wire fills in a new strings entry: the first tracker and the first plane that
// nothing is on yet, else the last ones.
func (f *Form) wire(at string) {
	f.texts[at+"/unit"] = "1"
	f.texts[at+"/strings_in_parallel"] = "1"
	used := map[string]bool{}
	for k := range f.lens["/strings"] {
		other := entry("/strings", k)
		used["plane "+f.texts[other+"/plane"]] = true
		used["tracker "+f.texts[other+"/inverter"]+" "+f.texts[other+"/tracker"]] = true
	}
	for k := range f.lens["/planes"] {
		f.texts[at+"/plane"] = strings.TrimSpace(f.texts[entry("/planes", k)+"/id"])
		if !used["plane "+f.texts[at+"/plane"]] {
			break
		}
	}
	for k := range f.lens["/inverters"] {
		inverter := entry("/inverters", k)
		f.texts[at+"/inverter"] = strings.TrimSpace(f.texts[inverter+"/id"])
		for j := range f.lens[inverter+"/trackers"] {
			f.texts[at+"/tracker"] = strings.TrimSpace(f.texts[entry(inverter+"/trackers", j)+"/id"])
			if !used["tracker "+f.texts[at+"/inverter"]+" "+f.texts[at+"/tracker"]] {
				return
			}
		}
	}
}

// Remove takes an entry out. References to it are emptied, and pointers to the
// entries behind it follow them. It reports whether there was such an entry.
func (f *Form) Remove(pointer string) bool {
	list, k, ok := f.entryAt(pointer)
	if !ok {
		return false
	}
	id := strings.TrimSpace(f.texts[pointer+"/id"])
	owner := strings.TrimSpace(f.texts[strings.TrimSuffix(list, "/trackers")+"/id"])
	f.removeEntry(list, k)
	for _, ref := range references {
		if ref.to == list {
			f.forget(ref.list, ref.field, id, "", "")
		}
	}
	if list == "/inverters" {
		for j := range f.lens["/strings"] {
			if at := entry("/strings", j); f.texts[at+"/inverter"] == "" {
				f.texts[at+"/tracker"] = ""
			}
		}
	}
	if strings.HasSuffix(list, "/trackers") {
		f.forget("/strings", "tracker", id, "inverter", owner)
	}
	return true
}

// forget empties a field in the entries of a list where it holds id, only in those
// whose field with holds value if with is not "".
func (f *Form) forget(list, field, id, with, value string) {
	for k := range f.lens[list] {
		at := entry(list, k)
		if f.texts[at+"/"+field] == id && (with == "" || f.texts[at+"/"+with] == value) {
			f.texts[at+"/"+field] = ""
		}
	}
}

// CopyFirst fills an entry with what stands in the first one of its list, the id
// aside. It reports whether there was such an entry.
func (f *Form) CopyFirst(pointer string) bool {
	list, k, ok := f.entryAt(pointer)
	if !ok || k == 0 {
		return false
	}
	id := f.texts[pointer+"/id"]
	for name := range f.texts {
		if strings.HasPrefix(name, pointer+"/") {
			delete(f.texts, name)
		}
	}
	first := entry(list, 0)
	copied := map[string]string{}
	for name, typed := range f.texts {
		if rest, ok := strings.CutPrefix(name, first+"/"); ok {
			copied[pointer+"/"+rest] = typed
		}
	}
	maps.Copy(f.texts, copied)
	f.texts[pointer+"/id"] = id
	return true
}

// removeEntry closes a list up over its entry k: in the names of fields and lists,
// in the pointers that answers hold, and in those that sources are named by.
func (f *Form) removeEntry(list string, k int) {
	move := func(pointer string) (string, bool) { return closedUp(pointer, list, k) }
	texts, lens := map[string]string{}, map[string]int{}
	for name, typed := range f.texts {
		if of, ok := strings.CutPrefix(name, "/sources/"); ok {
			if moved, keep := move(unescape(of)); keep {
				texts["/sources/"+Escape(moved)] = typed
			}
			continue
		}
		if moved, keep := move(name); keep {
			texts[moved] = typed
		}
	}
	for name, n := range f.lens {
		if moved, keep := move(name); keep {
			lens[moved] = n
		}
	}
	lens[list]--
	f.texts, f.lens = texts, lens
	for j := f.lens["/answers"] - 1; j >= 0; j-- {
		at := entry("/answers", j) + "/pointer"
		moved, keep := move(f.texts[at])
		f.texts[at] = moved
		if !keep {
			f.removeEntry("/answers", j)
		}
	}
}

// closedUp returns where a pointer leads once entry k of a list is gone; false
// where it led into that entry.
func closedUp(pointer, list string, k int) (string, bool) {
	rest, ok := strings.CutPrefix(pointer, list+"/")
	if !ok {
		return pointer, true
	}
	segment, below := cutSegment(rest)
	switch j, isEntry := index(segment); {
	case !isEntry || j < k:
		return pointer, true
	case j == k:
		return "", false
	default:
		return list + "/" + strconv.Itoa(j-1) + below, true
	}
}

// list returns the node of the list at a pointer, nil where the form has none there.
func (f *Form) list(pointer string) *node {
	n := &document
	for rest := pointer; rest != ""; {
		var segment string
		segment, rest = cutSegment(rest)
		if n = n.kid(segment); n == nil {
			return nil
		}
		if !n.list || rest == "" {
			continue
		}
		at := strings.TrimSuffix(pointer, rest)
		segment, rest = cutSegment(rest)
		if k, ok := index(segment); !ok || k >= f.lens[at] || rest == "" {
			return nil
		}
	}
	if !n.list {
		return nil
	}
	return n
}

// entryAt splits the pointer of an entry that exists into its list and its number.
func (f *Form) entryAt(pointer string) (list string, k int, ok bool) {
	i := strings.LastIndexByte(pointer, '/')
	if i < 0 {
		return "", 0, false
	}
	list = pointer[:i]
	k, ok = index(pointer[i+1:])
	return list, k, ok && f.list(list) != nil && k < f.lens[list]
}

func (f *Form) entries() int {
	sum := 0
	for _, n := range f.lens {
		sum += n
	}
	return sum
}
