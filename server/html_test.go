package server

import (
	"net/http"
	"net/http/httptest"
	"net/url"
	"slices"
	"strings"
	"testing"

	"golang.org/x/net/html"
	"golang.org/x/net/html/atom"
)

// page is a page of the site as a browser would have it.
type page struct {
	t    *testing.T
	root *html.Node
}

// get returns the page at a path, which must answer with the status.
func get(t *testing.T, h http.Handler, path string, status int) page {
	t.Helper()
	return read(t, ask(t, h, http.MethodGet, path, ""), status)
}

// post sends the fields of a form.
func post(t *testing.T, h http.Handler, path string, fields url.Values, status int) page {
	t.Helper()
	return read(t, send(t, h, path, fields), status)
}

func send(t *testing.T, h http.Handler, path string, fields url.Values) *httptest.ResponseRecorder {
	t.Helper()
	return ask(t, h, http.MethodPost, path, fields.Encode(), "Content-Type", "application/x-www-form-urlencoded")
}

func read(t *testing.T, w *httptest.ResponseRecorder, status int) page {
	t.Helper()
	if w.Code != status {
		t.Fatalf("status %d, want %d: %s", w.Code, status, w.Body)
	}
	root, err := html.Parse(w.Body)
	if err != nil {
		t.Fatal(err)
	}
	return page{t, root}
}

// all returns the elements that a test holds for, in the order of the page.
func (p page) all(holds func(*html.Node) bool) []*html.Node {
	var found []*html.Node
	for n := range p.root.Descendants() {
		if n.Type == html.ElementNode && holds(n) {
			found = append(found, n)
		}
	}
	return found
}

func attr(n *html.Node, name string) string {
	for _, a := range n.Attr {
		if a.Key == name {
			return a.Val
		}
	}
	return ""
}

func has(n *html.Node, name string) bool {
	return slices.ContainsFunc(n.Attr, func(a html.Attribute) bool { return a.Key == name })
}

func text(n *html.Node) string {
	var b strings.Builder
	for c := range n.Descendants() {
		if c.Type == html.TextNode {
			b.WriteString(c.Data)
		}
	}
	return strings.Join(strings.Fields(b.String()), " ")
}

// id returns the element of an id, nil if there is none.
func (p page) id(id string) *html.Node {
	found := p.all(func(n *html.Node) bool { return attr(n, "id") == id })
	if len(found) == 0 {
		return nil
	}
	return found[0]
}

// named returns the control of a name, which must be there.
func (p page) named(name string) *html.Node {
	p.t.Helper()
	found := p.all(func(n *html.Node) bool { return attr(n, "name") == name })
	if len(found) != 1 {
		p.t.Fatalf("%d fields are called %s, want one", len(found), name)
	}
	return found[0]
}

// fields returns what a browser sends of the form with an id when one presses Enter.
func (p page) fields(form string) url.Values {
	p.t.Helper()
	at := p.id(form)
	if at == nil {
		p.t.Fatalf("no form %q", form)
	}
	sent := url.Values{}
	inside := map[*html.Node]bool{}
	for n := range at.Descendants() {
		inside[n] = true
	}
	for _, n := range p.all(func(n *html.Node) bool { return attr(n, "name") != "" }) {
		name := attr(n, "name")
		if of := attr(n, "form"); of != form && (of != "" || !inside[n]) {
			continue
		}
		switch n.DataAtom {
		case atom.Input:
			sent.Add(name, attr(n, "value"))
		case atom.Textarea:
			sent.Add(name, textOf(n))
		case atom.Select:
			sent.Add(name, chosen(n))
		}
	}
	return sent
}

func textOf(n *html.Node) string {
	if n.FirstChild == nil {
		return ""
	}
	return n.FirstChild.Data
}

// chosen returns the value of the option that is chosen: the first where none says so.
func chosen(list *html.Node) string {
	value := ""
	first := true
	for n := range list.Descendants() {
		if n.DataAtom == atom.Option && n.Type == html.ElementNode && (first || has(n, "selected")) {
			value, first = attr(n, "value"), false
		}
	}
	return value
}

// verdict returns what the answer says, "waiting" where there is none yet.
func (p page) verdict() string {
	p.t.Helper()
	now := p.id("answer-now")
	if now == nil {
		p.t.Fatal("the page has no answer")
	}
	return attr(now, "data-verdict")
}

// sound fails for what no page may have: an id twice, a reference to nothing, a
// control without a name for those who cannot see, script or style inside the page.
func (p page) sound() {
	p.t.Helper()
	ids := map[string]int{}
	labelled := map[string]bool{}
	for _, n := range p.all(func(*html.Node) bool { return true }) {
		if id := attr(n, "id"); id != "" {
			ids[id]++
		}
		if n.DataAtom == atom.Label {
			labelled[attr(n, "for")] = true
		}
	}
	for id, n := range ids {
		if n > 1 {
			p.t.Errorf("%d elements have the id %s", n, id)
		}
	}
	names := map[string]int{}
	for _, n := range p.all(func(*html.Node) bool { return true }) {
		for _, a := range n.Attr {
			switch {
			case a.Key == "for" || a.Key == "form" || a.Key == "aria-labelledby" || a.Key == "aria-describedby":
				for id := range strings.FieldsSeq(a.Val) {
					if ids[id] == 0 {
						p.t.Errorf("%s=%q of <%s> leads to nothing", a.Key, a.Val, n.Data)
					}
				}
			case a.Key == "href" && strings.HasPrefix(a.Val, "#"):
				if ids[a.Val[1:]] == 0 {
					p.t.Errorf("the link %q (%s) leads to nothing", text(n), a.Val)
				}
			case strings.HasPrefix(a.Key, "on") || a.Key == "style" || strings.HasPrefix(strings.TrimSpace(a.Val), "javascript:"):
				p.t.Errorf("<%s %s=%q>: the content policy forbids script and style inside the page", n.Data, a.Key, a.Val)
			}
		}
		switch n.DataAtom {
		case atom.Style:
			p.t.Error("the content policy forbids a style element")
		case atom.Script:
			if attr(n, "src") == "" {
				p.t.Error("the content policy forbids script inside the page")
			}
		case atom.Input, atom.Select, atom.Textarea:
			if name := attr(n, "name"); strings.HasPrefix(name, "/") {
				names[name]++
			}
			if attr(n, "type") != "hidden" && attr(n, "type") != "radio" && !labelled[attr(n, "id")] && attr(n, "aria-label") == "" {
				p.t.Errorf("the field %s has no label", attr(n, "name"))
			}
			if has(n, "maxlength") || has(n, "required") || attr(n, "inputmode") == "decimal" || attr(n, "type") == "number" {
				p.t.Errorf("the field %s keeps people from typing what they have", attr(n, "name"))
			}
		}
	}
	for name, n := range names {
		if n > 1 {
			p.t.Errorf("%d fields are called %s", n, name)
		}
	}
	if n := len(p.all(func(n *html.Node) bool { return n.DataAtom == atom.H1 })); n != 1 {
		p.t.Errorf("%d headings of the first rank, want 1", n)
	}
	if n := len(p.all(func(n *html.Node) bool { return has(n, "autofocus") })); n > 1 {
		p.t.Errorf("%d elements take the focus, want one at most", n)
	}
}
