package display

import (
	"strconv"
	"strings"
	"unicode"

	"rimeline/sizing/design"
)

// names calls the parts of one design by their names, as shortly as the design
// allows: where there is one inverter, a tracker is "t1" and not "t1 of QP-12K".
type names struct {
	d        *design.Design
	fields   map[string]field // by pointer
	severalI bool             // several inverter types
}

func newNames(d *design.Design) *names {
	return &names{d: d, fields: inventoryByPointer(d), severalI: len(d.Inverters) > 1}
}

// plane returns "south plane" for an id that is a word, "plane p1" for a code.
func (n *names) plane(id string) string {
	if isWord(id) {
		return id + " plane"
	}
	return "plane " + id
}

func isWord(s string) bool {
	letters := 0
	for _, r := range s {
		if !unicode.IsLetter(r) && r != ' ' && r != '-' {
			return false
		}
		letters++
	}
	return letters >= 3 && !strings.HasSuffix(strings.ToLower(s), "plane") && !strings.HasSuffix(strings.ToLower(s), "roof")
}

// module returns what a module is called: its model, else its id.
func (n *names) module(m *design.Module) string {
	if m.Model == "" {
		return m.ID
	}
	for i := range n.d.Modules {
		if other := &n.d.Modules[i]; other.ID != m.ID && other.Model == m.Model {
			return m.Model + " (" + m.ID + ")"
		}
	}
	return m.Model
}

// inverter returns what an inverter type is called: its model, else its id.
func (n *names) inverter(id string) string {
	v := n.inverterByID(id)
	if v == nil || v.Model == "" {
		return id
	}
	for i := range n.d.Inverters {
		if other := &n.d.Inverters[i]; other.ID != id && other.Model == v.Model {
			return v.Model + " (" + id + ")"
		}
	}
	return v.Model
}

func (n *names) inverterByID(id string) *design.Inverter {
	for i := range n.d.Inverters {
		if n.d.Inverters[i].ID == id {
			return &n.d.Inverters[i]
		}
	}
	return nil
}

func (n *names) planeByID(id string) *design.Plane {
	for i := range n.d.Planes {
		if n.d.Planes[i].ID == id {
			return &n.d.Planes[i]
		}
	}
	return nil
}

// trackerByID returns a tracker and its place in the inverter, nil and -1 if there is none.
func (n *names) trackerByID(inverter, tracker string) (*design.Tracker, int) {
	v := n.inverterByID(inverter)
	if v == nil {
		return nil, -1
	}
	for i := range v.Trackers {
		if v.Trackers[i].ID == tracker {
			return &v.Trackers[i], i
		}
	}
	return nil, -1
}

// units calls installed inverters together: "the inverter", "inverter units 1 to 3",
// "QP-12K units 1 and 2; QP-8K".
func (n *names) units(all []terminal) string {
	var words []string
	for i := 0; i < len(all); {
		id := all[i].inverter
		var units []int64
		for ; i < len(all) && all[i].inverter == id; i++ {
			units = append(units, all[i].unit)
		}
		name := "the inverter"
		if n.severalI {
			name = n.inverter(id)
		}
		if v := n.inverterByID(id); v != nil && v.Quantity > 1 {
			name = strings.TrimPrefix(name, "the ") + " " + unitRange(units)
		}
		words = append(words, name)
	}
	return strings.Join(words, "; ")
}

// terminal is one tracker of one installed inverter; unit 0 is any unit.
type terminal struct {
	inverter string
	unit     int64
	tracker  string
}

// terminals calls several trackers together: "tracker t1", "trackers t1 to t12 of
// QP-12K units 1 to 3".
func (n *names) terminals(all []terminal) string {
	type place struct {
		inverter string
		unit     int64
	}
	var places []place
	trackers := map[place][]string{}
	for _, t := range all {
		p := place{t.inverter, t.unit}
		if trackers[p] == nil {
			places = append(places, p)
		}
		trackers[p] = append(trackers[p], t.tracker)
	}
	var groups []string
	for i := 0; i < len(places); {
		p := places[i]
		words := n.trackerRange(p.inverter, trackers[p])
		units := []int64{p.unit}
		for i++; i < len(places) && places[i].inverter == p.inverter && n.trackerRange(p.inverter, trackers[places[i]]) == words; i++ {
			units = append(units, places[i].unit)
		}
		groups = append(groups, words+n.ofUnits(p.inverter, units))
	}
	return strings.Join(groups, "; ")
}

// trackerRange calls trackers of one inverter: three or more in a row as a range.
func (n *names) trackerRange(inverter string, ids []string) string {
	var words []string
	for i := 0; i < len(ids); {
		_, at := n.trackerByID(inverter, ids[i])
		end := i + 1
		for end < len(ids) {
			if _, next := n.trackerByID(inverter, ids[end]); next != at+end-i {
				break
			}
			end++
		}
		if end-i >= 3 {
			words = append(words, ids[i]+" to "+ids[end-1])
		} else {
			words = append(words, ids[i:end]...)
		}
		i = end
	}
	if len(ids) == 1 {
		return "tracker " + words[0]
	}
	return "trackers " + list(words)
}

func (n *names) ofUnits(inverter string, units []int64) string {
	name := ""
	if n.severalI {
		name = " of " + n.inverter(inverter)
	}
	v := n.inverterByID(inverter)
	if v == nil || v.Quantity <= 1 || units[0] == 0 {
		return name
	}
	if name == "" {
		name = " of inverter"
	}
	return name + " " + unitRange(units)
}

func unitRange(units []int64) string {
	var words []string
	for i := 0; i < len(units); {
		end := i + 1
		for end < len(units) && units[end] == units[end-1]+1 {
			end++
		}
		if end-i >= 3 {
			words = append(words, strconv.FormatInt(units[i], 10)+" to "+strconv.FormatInt(units[end-1], 10))
		} else {
			for _, u := range units[i:end] {
				words = append(words, strconv.FormatInt(u, 10))
			}
		}
		i = end
	}
	if len(units) == 1 {
		return "unit" + nbsp + words[0]
	}
	return "units" + nbsp + list(words)
}
