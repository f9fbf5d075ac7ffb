package server

import (
	"context"
	"errors"
	"fmt"
	"net/http"
	"net/url"
	"slices"
	"strings"

	"rimeline/server/display"
	"rimeline/server/form"
	"rimeline/server/record"
	"rimeline/static"
	"rimeline/views"
)

// comparisonStyles are the style sheets of a page with a comparison.
var comparisonStyles = []string{static.URL("comparison.css")}

// Fields of the swap are about the field or entry of the design whose pointer follows
// in their names.
const (
	putName   = "put:"   // the id of the kept equipment that takes the place of an entry
	typedName = "typed:" // the text that takes the place of a field's
)

// powerClass is the values in which the power classes of one module differ.
var powerClass = []string{"model", "pmax_w", "voc_v", "isc_a", "vmp_v", "imp_a"}

// showSwap shows the design as it is beside the design with something else in it, or
// takes that over into the form.
func (s *Server) showSwap(w http.ResponseWriter, r *http.Request) error {
	f, err := postedForm(r)
	if err != nil {
		return err
	}
	was, o := judge(f), originOf(r.PostForm)
	if was.design == nil {
		return s.showJudged(w, r, was)
	}
	now, cause := s.swapped(r.Context(), f, r.PostForm)
	if now != nil && r.PostForm.Get("do") == "take" {
		base := newBase(titled("Design", now), "/design")
		return s.render(w, r, http.StatusOK, views.Design(s.designPage(r, base, judge(now), marking{}, o)))
	}
	kept, away := s.keptNow(r.Context())
	p := views.SwapPage{
		Base:    newBase(titled("What would another one change", f), "/design"),
		Title:   designTitle(f.Text("/title")),
		Carried: carried(f, o),
		Parts:   swapParts(was, r.PostForm, kept),
		Note:    whyNoPick(kept, away),
	}
	p.Base.Styles = append(p.Base.Styles, comparisonStyles...)
	status := http.StatusOK
	switch {
	case cause != nil:
		failure := describe(cause, false)
		if failure.status == http.StatusInternalServerError {
			return cause
		}
		status = failure.status
		p.Refused = &views.Refusal{Heading: "Nothing was compared", Lead: failure.message}
		for name, value := range failure.header {
			w.Header().Set(name, value)
		}
	case now != nil:
		j := judge(now)
		if j.design == nil {
			status = http.StatusUnprocessableEntity
			p.Faults = incomplete(j)
			break
		}
		comparison := display.NewComparison(
			display.Side{Name: "As it is", Design: was.design, Result: was.result},
			display.Side{Name: "With the change", Design: j.design, Result: j.result})
		p.After = &comparison
	}
	return s.render(w, r, status, views.Swap(p))
}

// swapped returns the form with what was chosen in the place of what it has; nil
// where nothing was chosen.
func (s *Server) swapped(ctx context.Context, f *form.Form, values url.Values) (*form.Form, error) {
	with, changed := withTyped(f, values)
	now, err := form.FromValues(with)
	if err != nil {
		return nil, err
	}
	for _, list := range []string{"/modules", "/inverters"} {
		for k := range f.Len(list) {
			at := pointerOf(list, k)
			id := values.Get(putName + at)
			if id == "" {
				continue
			}
			changed = true
			if err := s.putKept(ctx, now, at, record.ID(id)); err != nil {
				return nil, err
			}
		}
	}
	if !changed {
		return nil, nil
	}
	return now, nil
}

// withTyped returns the fields of the form with what was typed in the place of others,
// and whether anything was. What was said of where a value comes from is not true of
// another value.
func withTyped(f *form.Form, values url.Values) (with url.Values, changed bool) {
	with = url.Values{}
	for _, name := range f.Names("/") {
		with.Set(name, f.Text(name))
	}
	for name := range values {
		field, ok := strings.CutPrefix(name, typedName)
		if !ok || strings.TrimSpace(values.Get(name)) == strings.TrimSpace(f.Text(field)) || !isSwappable(f, values, field) {
			continue
		}
		changed = true
		with.Set(field, values.Get(name))
		with.Del(form.SourceName(form.FieldOf(field)))
	}
	return with, changed
}

// isSwappable reports whether the swap has a field for another value of this one, and
// the entry that it belongs to stays.
func isSwappable(f *form.Form, values url.Values, field string) bool {
	switch form.FieldOf(field) {
	case "/site/coldest_c", "/site/hottest_c":
		return true
	}
	for k := range f.Len("/modules") {
		at := pointerOf("/modules", k)
		leaf, ok := strings.CutPrefix(field, at+"/")
		if ok && slices.Contains(powerClass, leaf) {
			return values.Get(putName+at) == ""
		}
	}
	return false
}

// putKept copies kept equipment into the entry of a form at a pointer.
func (s *Server) putKept(ctx context.Context, f *form.Form, at string, id record.ID) error {
	saved, err := s.saving()
	if err != nil {
		return err
	}
	e, err := saved.Equipment(ctx, id)
	switch {
	case errors.Is(err, record.ErrNotFound) || err == nil && listOf(e.Kind) != at[:strings.LastIndexByte(at, '/')]:
		return badRequest("The equipment that was chosen is not kept here. Choose another one.", fmt.Errorf("equipment %q for %s", id, at))
	case err != nil:
		return err
	case !f.Put(at, e.Document, e.Sources, e.Answers):
		return tooManyEntries
	}
	return nil
}

// listOf is the list of a design in which equipment of a kind stands.
func listOf(k record.Kind) string {
	if k == record.KindInverter {
		return "/inverters"
	}
	return "/modules"
}

// swapBuilder makes the fields in which the change is chosen.
type swapBuilder struct {
	*pageBuilder
	values url.Values // as posted
	now    *form.Form // the form with what was typed
	kept   keptEquipment
}

func swapParts(was judged, values url.Values, kept keptEquipment) []views.SwapPart {
	b := swapBuilder{newPageBuilder(was, marking{}), values, was.form, kept}
	with, _ := withTyped(was.form, values)
	if now, err := form.FromValues(with); err == nil {
		b.now = now
	}
	var parts []views.SwapPart
	for k := range was.form.Len("/modules") {
		parts = append(parts, b.module(k, pointerOf("/modules", k)))
	}
	for k := range was.form.Len("/inverters") {
		at := pointerOf("/inverters", k)
		if pick := b.pick(at, kept.inverters); pick != nil {
			parts = append(parts, views.SwapPart{ID: "swap" + views.FieldID(at), Heading: b.called("Inverter", "/inverters", k), Pick: pick})
		}
	}
	return append(parts, views.SwapPart{ID: "swap-temperatures", Heading: "The temperatures", Fields: []views.Field{
		b.instead("/site", inquiry{name: "coldest_c", label: "Coldest air temperature", width: "w3"}),
		b.instead("/site", inquiry{name: "hottest_c", label: "Hottest air temperature", width: "w3"}),
	}})
}

func (b *swapBuilder) module(k int, at string) views.SwapPart {
	part := views.SwapPart{ID: "swap" + views.FieldID(at), Heading: b.called("Module", "/modules", k), Pick: b.pick(at, b.kept.modules)}
	part.Typed = &views.Fold{ID: part.ID + "-typed", Words: "Type another power class of it", Open: part.Pick == nil}
	if part.Pick != nil {
		part.Typed.Words = "Or type another power class of it"
	}
	for _, leaf := range powerClass {
		f := b.instead(at, moduleInquiry(leaf))
		part.Typed.Fields = append(part.Typed.Fields, f)
		part.Typed.Open = part.Typed.Open || f.Value != b.form.Text(at+"/"+leaf)
	}
	return part
}

// called names an entry by its kind, its place where there are several, and its model.
func (b *swapBuilder) called(kind, list string, k int) string {
	if b.form.Len(list) > 1 {
		kind += fmt.Sprintf(" %d", k+1)
	}
	return kind + prefixed(": ", b.form.Text(pointerOf(list, k)+"/model"))
}

func moduleInquiry(leaf string) inquiry {
	for _, q := range slices.Concat(moduleInquiries, moduleMore) {
		if q.name == leaf {
			q.hint, q.may, q.asked, q.width = "", false, false, "w2"
			return q
		}
	}
	panic("server: no inquiry about a module's " + leaf)
}

// pick is the list of what may take the place of an entry, nil where nothing is kept.
func (b *swapBuilder) pick(at string, pieces []pieceChoice) *views.Field {
	if len(pieces) == 0 {
		return nil
	}
	f := &views.Field{ID: "put" + views.FieldID(at), Name: putName + at, Label: "In its place, from the equipment kept here", Width: "w6"}
	for _, c := range offered(pieces, "Nothing: it stays") {
		f.Choices = append(f.Choices, views.Choice{Value: c[0], Words: c[1], Chosen: c[0] == b.values.Get(f.Name)})
	}
	return f
}

// instead is the field for another text in the place of one of the design.
func (b *swapBuilder) instead(at string, q inquiry) views.Field {
	f := b.field(at, q)
	text := func(name string) string {
		if b.values.Has(typedName + name) {
			return b.values.Get(typedName + name)
		}
		return b.form.Text(name)
	}
	f.Value = text(f.Name)
	f.ID, f.Name = "typed-"+f.ID, typedName+f.Name
	if u := f.Units; u != nil {
		now := strings.TrimSpace(text(u.Name))
		for i := range u.Choices {
			u.Choices[i].Chosen = u.Choices[i].Value == now
		}
		u.ID, u.Name = f.ID+"-unit", typedName+u.Name
	}
	if f.Twin != nil {
		f.Twin.Says = b.now.Twin(at + "/" + q.name)
	}
	return f
}

// whyNoPick says why there is nothing to pick from, "" where there is.
func whyNoPick(kept keptEquipment, err error) string {
	switch {
	case err != nil:
		return "The equipment kept here cannot be reached at the moment; other values can be typed."
	case len(kept.modules) == 0 && len(kept.inverters) == 0:
		return "No equipment is kept here yet. Keep modules and inverters on the Equipment page to pick them here."
	case kept.more:
		return fmt.Sprintf("The lists show the first %d of a kind by name.", mostOffered)
	}
	return ""
}

// incomplete says what keeps a design from being sized after a change.
func incomplete(j judged) *views.Faults {
	b := newPageBuilder(j, marking{faults: true})
	faults := b.summary()
	faults.Heading = "With this change the design is not complete"
	faults.Lead = "So there is nothing to compare yet:"
	for i := range faults.Links {
		faults.Links[i].Href = "" // the fields are on another page
	}
	return faults
}
