package display

import (
	"encoding/json"
	"strings"

	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
	"rimeline/views"
)

// frozenResult is what is read of a result that was saved: what it found, not how.
type frozenResult struct {
	Verdict string
	Checks  []frozenCheck
}

type frozenCheck struct {
	ID      string
	About   frozenAbout
	Verdict string
	Value   *json.Number
	Limit   *json.Number
	Unit    string
}

// frozenAbout is the subject of a check; String is nil where it is no strings entry.
type frozenAbout struct {
	String                   *int
	Plane, Inverter, Tracker string
	Unit                     int64
}

func (a frozenAbout) about() working.About {
	about := working.About{String: -1, Inverter: a.Inverter, Unit: a.Unit, Tracker: a.Tracker, Plane: a.Plane}
	if a.String != nil {
		about.String = *a.String
	}
	return about
}

// ResultChanges tells where a result that was saved differs from the one that the
// engine of today makes of the same design: the checks whose verdict, value or limit
// is another. There are none where only the working is written otherwise.
func ResultChanges(saved []byte, d *design.Design, result *sizing.Result) (was, now views.ComparedSide, groups []views.ChangeGroup) {
	before, after := readFrozen(saved), readFrozen(result.AppendJSON(nil))
	c := newComposer(d, result)
	was = views.ComparedSide{Name: "Found then", Verdict: views.Verdict(before.Verdict)}
	now = views.ComparedSide{Name: "Found today", Verdict: verdict(result.Verdict), Headline: c.headline(), Tally: c.tally()}
	type subject struct {
		id    string
		about working.About
	}
	then := map[subject]frozenCheck{}
	for _, k := range before.Checks {
		then[subject{k.ID, k.About.about()}] = k
	}
	change := func(id string, about working.About, was, now string) {
		if was == now {
			return
		}
		how, _ := kindOf(id)
		if n := len(groups); n == 0 || groups[n-1].Of != how.title {
			groups = append(groups, views.ChangeGroup{Of: how.title})
		}
		last := &groups[len(groups)-1]
		last.Rows = append(last.Rows, views.Change{Name: capital(c.about([]working.About{about})), Before: was, After: now})
	}
	for _, k := range after.Checks {
		s := subject{k.ID, k.About.about()}
		earlier, judged := then[s]
		delete(then, s)
		if !judged {
			change(k.ID, s.about, "", k.says())
			continue
		}
		change(k.ID, s.about, earlier.says(), k.says())
	}
	for _, k := range before.Checks {
		if s := (subject{k.ID, k.About.about()}); then[s].ID != "" {
			change(k.ID, s.about, k.says(), "")
		}
	}
	return was, now, groups
}

// readFrozen reads what it can of a result; an older form of it may hold less.
func readFrozen(text []byte) frozenResult {
	var r frozenResult
	if json.Unmarshal(text, &r) != nil {
		return frozenResult{}
	}
	return r
}

// says tells the verdict with the value and the limit in all their digits.
func (k frozenCheck) says() string {
	words := k.Verdict
	if k.Value != nil {
		words += ", " + withUnit(frozenNumber(*k.Value), k.Unit)
	}
	if k.Limit != nil {
		words += " against " + withUnit(frozenNumber(*k.Limit), k.Unit)
	}
	return words
}

func frozenNumber(n json.Number) string {
	if x, err := quantity.Parse(n.String()); err == nil {
		return stated(x)
	}
	return strings.ReplaceAll(n.String(), "-", minus)
}
