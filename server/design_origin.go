package server

import (
	"crypto/rand"
	"net/url"
	"strconv"
	"strings"

	"rimeline/server/form"
	"rimeline/server/record"
	"rimeline/views"
)

// origin is what a form of a design knows of where it comes from. It goes along in
// fields that the page does not show, so that the server keeps nothing between two
// requests.
type origin struct {
	design  record.ID // "" while it was never saved
	base    int       // the revision it was made from
	draft   record.ID // the draft that the form is kept as; made up by the page that begins it
	version int64     // of the draft, as far as the page knows it; 0 while nothing was kept
	request string    // key of the save: a repetition makes nothing new
	note    string    // what changed, as typed
}

// newOrigin is the origin of a form that nobody typed into yet.
func newOrigin() origin { return origin{draft: record.ID(rand.Text()), request: rand.Text()} }

// originOf reads the origin of a posted form. What a page of ours cannot have sent is
// taken as not sent.
func originOf(values url.Values) origin {
	o := newOrigin()
	if id := values.Get("design"); isID(id) {
		o.design = record.ID(id)
		o.base, _ = strconv.Atoi(values.Get("base"))
		o.base = max(o.base, 0)
	}
	if id := values.Get("draft"); isID(id) {
		o.draft = record.ID(id)
		o.version, _ = strconv.ParseInt(values.Get("draft-version"), 10, 64)
		o.version = max(o.version, 0)
	}
	if key := values.Get("request"); isID(key) {
		o.request = key
	}
	o.note = strings.TrimSpace(values.Get("note"))
	return o
}

// isID reports whether a text can be an id or a key that this site made.
func isID(s string) bool {
	return s != "" && len(s) <= 64 && !strings.ContainsFunc(s, func(c rune) bool {
		return (c < 'a' || c > 'z') && (c < 'A' || c > 'Z') && (c < '0' || c > '9') && c != '-' && c != '_'
	})
}

// fields are the origin as fields of the form; the note has a field that is shown.
func (o origin) fields() []views.HiddenField {
	return []views.HiddenField{
		{Name: "design", Value: string(o.design)},
		{Name: "base", Value: strconv.Itoa(o.base)},
		{Name: "draft", Value: string(o.draft)},
		{Name: "draft-version", Value: strconv.FormatInt(o.version, 10)},
		{Name: "request", Value: o.request},
	}
}

// carried is a whole form as fields that are not shown.
func carried(f *form.Form, o origin) []views.HiddenField {
	fields := append(o.fields(), views.HiddenField{Name: "note", Value: o.note})
	for _, name := range f.Names("/") {
		fields = append(fields, views.HiddenField{Name: name, Value: f.Text(name)})
	}
	return fields
}

// typedFields are the texts of a posted form as a draft keeps them: as they were
// typed, under the names of their fields.
func typedFields(values url.Values) map[string]string {
	fields := map[string]string{}
	for name := range values {
		if strings.HasPrefix(name, "/") || strings.HasPrefix(name, form.RenamedFrom("/")) || name == "note" {
			fields[name] = values.Get(name)
		}
	}
	return fields
}

// draftForm is the form of a draft, and what of its origin the draft knows.
func draftForm(d record.Draft) (*form.Form, origin, error) {
	values := url.Values{}
	for name, typed := range d.Fields {
		values.Set(name, typed)
	}
	f, err := form.FromValues(values)
	o := newOrigin()
	o.design, o.base, o.draft, o.version, o.note = d.Design, d.Base, d.ID, d.Version, strings.TrimSpace(d.Fields["note"])
	return f, o, err
}
