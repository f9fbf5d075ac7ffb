package display

import (
	"slices"
	"strconv"
	"strings"

	"rimeline/sizing/working"
)

// subject is what a check is about: the places of the document that its words need
// not name again, because the check's subject names them. "" is no such place.
type subject struct {
	entry, inverter, tracker, plane, module string // pointers

	entries int // strings entries that it covers
}

// call names a field: without its owner where the subject is the owner.
func (s subject) call(f field) string {
	for _, at := range []string{s.entry, s.tracker, s.plane, s.module} {
		if at != "" && strings.HasPrefix(f.pointer, at+"/") {
			return f.name
		}
	}
	if s.inverter != "" && strings.HasPrefix(f.pointer, s.inverter+"/") && !strings.HasPrefix(f.pointer, s.inverter+"/trackers/") {
		return f.name
	}
	return f.called()
}

// subject returns what a check is about. A tracker's or an inverter's check is about
// one strings entry, plane or module where all of its strings are.
func (c *composer) subject(a working.About) subject {
	if i := slices.Index(c.abouts, a); i >= 0 {
		return c.subjects[i]
	}
	s := c.findSubject(a)
	c.abouts, c.subjects = append(c.abouts, a), append(c.subjects, s)
	return s
}

func (c *composer) findSubject(a working.About) subject {
	var s subject
	inverter, tracker := a.Inverter, a.Tracker
	var entries []int
	for i := range c.d.Strings {
		e := &c.d.Strings[i]
		switch {
		case a.String >= 0:
			if i == a.String {
				entries, inverter, tracker = append(entries, i), e.Inverter, e.Tracker
			}
		case a.Plane != "":
			if e.Plane == a.Plane {
				entries = append(entries, i)
			}
		case e.Inverter == a.Inverter && e.Unit == a.Unit && (a.Tracker == "" || e.Tracker == a.Tracker):
			entries = append(entries, i)
		}
	}
	for i := range c.d.Inverters {
		if c.d.Inverters[i].ID == inverter {
			s.inverter = "/inverters/" + strconv.Itoa(i)
		}
	}
	if _, k := c.trackerByID(inverter, tracker); k >= 0 {
		s.tracker = s.inverter + "/trackers/" + strconv.Itoa(k)
	}
	s.entries = len(entries)
	if len(entries) == 1 {
		s.entry = "/strings/" + strconv.Itoa(entries[0])
	}
	planes := map[string]bool{}
	if a.Plane != "" {
		planes[a.Plane] = true
	}
	for _, i := range entries {
		planes[c.d.Strings[i].Plane] = true
	}
	modules := map[string]bool{}
	for i := range c.d.Planes {
		if p := &c.d.Planes[i]; planes[p.ID] {
			modules[p.Module] = true
			if len(planes) == 1 {
				s.plane = "/planes/" + strconv.Itoa(i)
			}
		}
	}
	for i := range c.d.Modules {
		if len(modules) == 1 && modules[c.d.Modules[i].ID] {
			s.module = "/modules/" + strconv.Itoa(i)
		}
	}
	return s
}
