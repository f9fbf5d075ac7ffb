package server

import (
	"bytes"
	_ "embed"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"mime"
	"net/http"
	"strconv"
	"strings"

	"github.com/a-h/templ"

	"rimeline/server/display"
	"rimeline/server/form"
	"rimeline/server/record"
	"rimeline/sizing/design"
	"rimeline/static"
	"rimeline/views"
)

// exampleDesign is the invented design that the site opens as its example.
//
//go:embed example-design.json
var exampleDesign []byte

// showDesign shows the empty form, or one that begins with kept equipment.
func (s *Server) showDesign(w http.ResponseWriter, r *http.Request) error {
	f := form.New()
	id := r.URL.Query().Get("equipment")
	if id != "" {
		if err := s.putFirst(r.Context(), f, record.ID(id)); err != nil {
			return err
		}
	}
	p := s.designPage(r, newBase("Size strings", "/design"), judge(f), marking{}, newOrigin())
	p.Fresh = id == ""
	return s.render(w, r, http.StatusOK, views.Design(p))
}

// showExample shows the form filled with the example, and its answer.
func (s *Server) showExample(w http.ResponseWriter, r *http.Request) error {
	f, _, err := form.FromDocument(exampleDesign)
	if err != nil {
		return err
	}
	return s.render(w, r, http.StatusOK, views.Design(s.designPage(r, newBase("Example", "/example"), judge(f), marking{}, newOrigin())))
}

// sizeDesign answers the whole form: with its answer, with its faults, or changed by
// the button that was pressed.
func (s *Server) sizeDesign(w http.ResponseWriter, r *http.Request) error {
	f, err := postedForm(r)
	if err != nil {
		return err
	}
	do := r.PostForm.Get("do")
	if do == "" {
		return s.showJudged(w, r, judge(f))
	}
	if verb, at, _ := strings.Cut(do, " "); verb == "pick" || verb == "keep" {
		return s.workWithKept(w, r, f, verb, at)
	}
	focus, err := change(f, do)
	if err != nil {
		return err
	}
	base := newBase(titled("Design", f), "/design")
	return s.render(w, r, http.StatusOK, views.Design(s.designPage(r, base, judge(f), marking{focus: focus}, originOf(r.PostForm))))
}

// showJudged shows the form with its answer, or with every fault marked.
func (s *Server) showJudged(w http.ResponseWriter, r *http.Request, j judged) error {
	base, status := newBase(titled("Design", j.form), "/design"), http.StatusOK
	if j.design == nil {
		base.Title, status = "Please correct: "+base.Title, http.StatusUnprocessableEntity
	}
	return s.render(w, r, status, views.Design(s.designPage(r, base, j, marking{faults: true}, originOf(r.PostForm))))
}

// change does to the form what a button asks for, such as "add /modules", and
// returns the pointer of the entry or list that the page should open at.
func change(f *form.Form, do string) (focus string, err error) {
	verb, at, _ := strings.Cut(do, " ")
	done := false
	switch verb {
	case "add":
		focus = f.Add(at)
		done = focus != ""
	case "remove":
		focus = at[:max(0, strings.LastIndexByte(at, '/'))]
		done = f.Remove(at)
	case "copy":
		focus = at
		done = f.CopyFirst(at)
	case "show": // as it is, without its faults
		done = true
	}
	if !done {
		return "", badRequest("The form has no such part, or no room for another one.", fmt.Errorf("do %q", do))
	}
	return focus, nil
}

// renewAnswer answers the form with the answer alone. A form that is not finished is
// no error here: someone is typing.
func (s *Server) renewAnswer(w http.ResponseWriter, r *http.Request) error {
	f, err := postedForm(r)
	if err != nil {
		return err
	}
	return s.render(w, r, http.StatusOK, views.AnswerNow(newAnswerPane(judge(f))))
}

// showWorking shows the whole arithmetic of the form.
func (s *Server) showWorking(w http.ResponseWriter, r *http.Request) error {
	return s.showCarried(w, r, "Working", func(j judged) templ.Component {
		return views.WorkingBody(display.NewWorking(j.design, j.result))
	})
}

// showSheet shows the stringing sheet of the form.
func (s *Server) showSheet(w http.ResponseWriter, r *http.Request) error {
	return s.showCarried(w, r, "Stringing sheet", func(j judged) templ.Component {
		return views.SheetBody(display.NewSheet(j.design, j.result))
	})
}

// showCarried shows a page about the form, which takes the form along. A form that
// is no design yet comes back with its faults.
func (s *Server) showCarried(w http.ResponseWriter, r *http.Request, title string, body func(judged) templ.Component) error {
	f, err := postedForm(r)
	if err != nil {
		return err
	}
	j := judge(f)
	if j.design == nil {
		return s.showJudged(w, r, j)
	}
	page := views.CarriedPage{Base: newBase(titled(title, f), r.URL.Path), Here: r.URL.Path, Carried: carried(f, originOf(r.PostForm))}
	page.Base.Styles = append(page.Base.Styles, static.URL("sheet.css"))
	return s.render(w, r, http.StatusOK, views.Carried(page, body(j)))
}

// saveFile sends the form as a design file, finished or not.
func (s *Server) saveFile(w http.ResponseWriter, r *http.Request) error {
	f, err := postedForm(r)
	if err != nil {
		return err
	}
	var body bytes.Buffer
	if err := json.Indent(&body, f.Document(), "", "  "); err != nil {
		return err
	}
	body.WriteByte('\n')
	h := w.Header()
	h.Set("Content-Type", "application/json")
	h.Set("Content-Disposition", mime.FormatMediaType("attachment", map[string]string{"filename": fileName(f.Text("/title"))}))
	h.Set("Cache-Control", "no-store")
	h.Set("Content-Length", strconv.Itoa(body.Len()))
	_, _ = w.Write(body.Bytes())
	return nil
}

// fileName makes a name for a design file out of its title: at most 45 signs, none
// of them special, which the strictest plan intake asks for.
func fileName(title string) string {
	const longest = 45 - len(".json")
	words := strings.FieldsFunc(strings.ToLower(title), func(r rune) bool {
		return (r < 'a' || r > 'z') && (r < '0' || r > '9')
	})
	name := strings.Join(words, "-")
	if len(name) > longest {
		name = strings.TrimRight(name[:longest], "-")
	}
	if name == "" {
		name = "design"
	}
	return name + ".json"
}

// openFile shows the form filled with a design file. One that is refused is shown as
// far as it can be read, with every reason.
func (s *Server) openFile(w http.ResponseWriter, r *http.Request) error {
	name, content, err := uploadedFile(r)
	if err != nil {
		return err
	}
	read := design.Read(content)
	f, _, err := form.FromDocument(content)
	switch {
	case errors.Is(err, form.ErrTooMany):
		return tooManyEntries
	case err != nil || read.Malformed:
		p := s.designPage(r, newBase("Not opened: "+name, "/design"), judge(form.New()), marking{}, newOrigin())
		p.Faults = unopened(name, content, read.Faults)
		return s.render(w, r, http.StatusUnprocessableEntity, views.Design(p))
	case read.Design == nil:
		// The reader's faults of the file itself: a field that is not known, or one
		// that stands there twice, is in the file and not in the form.
		p := s.designPage(r, newBase("Please correct: "+titled("Design", f), "/design"), judged{form: f, faults: read.Faults}, marking{faults: true}, newOrigin())
		p.Faults.Lead = "This is what “" + name + "” says as far as the form has a field for it. Nothing else of the file is carried over."
		return s.render(w, r, http.StatusUnprocessableEntity, views.Design(p))
	}
	return s.render(w, r, http.StatusOK, views.Design(s.designPage(r, newBase(titled("Design", f), "/design"), judge(f), marking{}, newOrigin())))
}

// uploadedFile returns the design file of a request; its name is "" where none was chosen.
func uploadedFile(r *http.Request) (name string, content []byte, err error) {
	file, header, err := r.FormFile("file")
	if errors.Is(err, http.ErrMissingFile) {
		return "", nil, nil
	}
	if err != nil {
		return "", nil, badRequest("The file could not be read from the request.", err)
	}
	defer file.Close()
	if content, err = io.ReadAll(file); err != nil {
		return "", nil, err
	}
	return header.Filename, content, nil
}

// unopened says why a file could not be opened at all.
func unopened(name string, content []byte, faults design.Faults) *views.Faults {
	if name == "" {
		return &views.Faults{Heading: "No file was chosen", Lead: "Choose a design file that was saved here, then open it."}
	}
	said := &views.Faults{Heading: "“" + name + "” could not be opened", Lead: "A design file is JSON, as “Save as a file” writes it. The form is empty; nothing was taken from the file."}
	if len(bytes.TrimSpace(content)) == 0 {
		said.Lead = "The file is empty."
		return said
	}
	for _, fault := range faults {
		said.Links = append(said.Links, views.Link{Words: fault.Detail})
	}
	return said
}

var tooManyEntries = &statusError{
	status: http.StatusRequestEntityTooLarge,
	message: fmt.Sprintf("The design has more than %d modules, inverters, trackers, planes and strings entries together. "+
		"That is more than a form can show; size it with the command line.", form.MaxEntries),
}

// postedForm returns the form of a request.
func postedForm(r *http.Request) (*form.Form, error) {
	if err := r.ParseForm(); err != nil {
		return nil, badRequest("The form could not be read.", err)
	}
	f, err := form.FromValues(r.PostForm)
	if errors.Is(err, form.ErrTooMany) {
		return nil, tooManyEntries
	}
	return f, err
}

// newBase is what the pages of the site have around them.
func newBase(title, here string) views.Base {
	return views.Base{
		Title:   title,
		Here:    here,
		Styles:  []string{static.URL("rimeline.css"), static.URL("answer.css")},
		Scripts: []string{static.URL("htmx.js"), static.URL("rimeline.js"), static.URL("kept.js")},
		Icon:    static.URL("icon.svg"),
	}
}

// titled names a page after the design; what is printed takes its name from it.
func titled(page string, f *form.Form) string {
	if title := strings.TrimSpace(f.Text("/title")); title != "" {
		return title + ", " + page
	}
	return page
}
