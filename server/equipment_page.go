package server

import (
	"cmp"
	"fmt"
	"net/url"
	"slices"
	"strconv"
	"strings"
	"time"

	"rimeline/server/display"
	"rimeline/server/form"
	"rimeline/server/record"
	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
	"rimeline/static"
	"rimeline/views"
)

// newEquipmentListPage makes the page of a list; uses is how many designs use each
// piece of it.
func newEquipmentListPage(l record.EquipmentListing, found record.EquipmentPage, uses []int, now time.Time) views.EquipmentListPage {
	p := views.EquipmentListPage{
		Base: listBase("Equipment", "/equipment"), Kind: string(l.Kind), Words: l.Words, Archived: l.Archived,
		Narrowed: l.Words != "", Back: equipmentQuery(l).Encode(), Columns: equipmentColumns(l),
	}
	p.Base.Styles = append(p.Base.Styles, static.URL("equipment.css"))
	first := l
	first.Cursor = ""
	other := func(change func(*record.EquipmentListing)) string {
		l := first
		change(&l)
		return equipmentAddress(l)
	}
	p.All = other(func(l *record.EquipmentListing) { l.Words = "" })
	kept := equipmentQuery(first)
	kept.Del("q")
	for _, name := range []string{"kind", "archived", "sort", "order"} {
		if kept.Has(name) {
			p.Keep = append(p.Keep, views.HiddenField{Name: name, Value: kept.Get(name)})
		}
	}
	for _, k := range []struct {
		words string
		kind  record.Kind
	}{{"Modules", record.KindModule}, {"Inverters", record.KindInverter}} {
		p.Kinds = append(p.Kinds, views.Tab{Words: k.words, Href: other(func(l *record.EquipmentListing) { l.Kind = k.kind }), Here: l.Kind == k.kind})
	}
	p.States = []views.Tab{
		{Words: "In use", Href: other(func(l *record.EquipmentListing) { l.Archived = false }), Here: !l.Archived},
		{Words: "Archived", Href: other(func(l *record.EquipmentListing) { l.Archived = true }), Here: l.Archived},
	}
	at := func(cursor string) string {
		if cursor == "" {
			return ""
		}
		return other(func(l *record.EquipmentListing) { l.Cursor = cursor })
	}
	p.Previous, p.Next = at(found.Previous), at(found.Next)
	p.Count = countOf(found.Total, found.More, string(l.Kind))
	if n := len(found.Equipment); n < found.Total && n > 0 {
		p.Count += fmt.Sprintf(", %d on this page", n)
	}
	figures, _ := equipmentFigures(l.Kind, found.Equipment)
	for i, e := range found.Equipment {
		row := views.EquipmentRow{ID: string(e.ID), Name: e.Model, Maker: e.Maker, Figures: figures[i], Updated: moment(e.Updated.At, now)}
		if uses[i] > 0 {
			row.Uses = counted(uses[i], "design")
		}
		p.Rows = append(p.Rows, row)
	}
	p.Empty = emptyEquipment(l)
	return p
}

func emptyEquipment(l record.EquipmentListing) string {
	switch {
	case l.Words != "" && l.Archived:
		return fmt.Sprintf("No archived %s matches.", l.Kind)
	case l.Words != "":
		return fmt.Sprintf("No %s in use matches. What is searched for must begin a word of the maker or the model.", l.Kind)
	case l.Archived:
		return fmt.Sprintf("No %s is archived. What is archived is not offered in designs, and can be restored from here.", l.Kind)
	}
	return fmt.Sprintf("No %s is kept yet. Enter one from its datasheet here, or keep one from a design.", l.Kind)
}

// equipmentFigures are the few numbers of each piece that tell it from others, and
// what they are called. A document that is no longer taken has none.
func equipmentFigures(kind record.Kind, pieces []record.Equipment) (rows [][]views.EquipmentFigure, columns []string) {
	if kind == record.KindInverter {
		inverters := make([]*design.Inverter, len(pieces))
		for i := range pieces {
			inverters[i], _ = design.ReadInverter(pieces[i].Document)
		}
		return display.InverterFigures(inverters), display.InverterColumns
	}
	modules := make([]*design.Module, len(pieces))
	for i := range pieces {
		modules[i], _ = design.ReadModule(pieces[i].Document)
	}
	return display.ModuleFigures(modules), display.ModuleColumns
}

// equipmentColumns are the heads of the columns; two of them sort the list.
func equipmentColumns(l record.EquipmentListing) []views.Column {
	sorting := func(words, class string, by record.Sort, falls bool) views.Column {
		c := views.Column{Words: words, Class: class}
		other := l
		other.Sort, other.Cursor, other.Reversed = by, "", false
		if l.Sort == by {
			other.Reversed = !l.Reversed
			c.Sorted = "ascending"
			if falls != l.Reversed {
				c.Sorted = "descending"
			}
		}
		c.Href = equipmentAddress(other)
		return c
	}
	columns := []views.Column{{Words: "Model", Class: "title"}, sorting("Maker", "maker", record.SortName, false)}
	_, names := equipmentFigures(l.Kind, nil)
	for _, name := range names {
		columns = append(columns, views.Column{Words: name, Class: "figure num"})
	}
	return append(columns, views.Column{Words: "Used in", Class: "uses"}, sorting("Changed", "age", record.SortUpdated, true), views.Column{Words: "Actions", Class: "acts", Unseen: true})
}

// pieceState is what the page of a piece says beside its values.
type pieceState struct {
	faults    design.Faults
	questions []working.Question
	used      []record.Design
	said      string
	refused   *views.Refusal
	stale     *views.StaleEquipment
	earlier   record.ID // what an earlier press of the button made
	focus     string
}

// pieceParts are the subjects of a piece's values, in the order of a datasheet.
type piecePart struct {
	id, heading, lead string
	inquiries         []inquiry
}

// The values of a module by their subjects; without sources where they name it.
var (
	moduleParts = []piecePart{
		{"stc", "At STC", "1000 W/m², cells at 25 °C. Not the NOCT or NMOT column.", asking(slices.Concat(moduleInquiries, moduleMore), "technology", "pmax_w", "voc_v", "isc_a", "vmp_v", "imp_a")},
		{"coefficients", "Temperature coefficients", "", asking(slices.Concat(moduleInquiries, moduleMore), "voc_temp_coeff", "pmax_temp_coeff", "isc_temp_coeff", "vmp_temp_coeff")},
		{"ratings", "Ratings", "", asking(slices.Concat(moduleInquiries, moduleMore), "max_system_voltage_v", "max_series_fuse_a", "isc_marked_max_a", "bifaciality")},
		{"build", "Build", "", asking(slices.Concat(moduleInquiries, moduleMore), "cells_in_series", "noct_c", "length_mm", "width_mm")},
	}
	inverterParts = []piecePart{
		{"ratings", "The inverter", "", asking(slices.Concat(inverterInquiries, inverterMore), "max_dc_voltage_v", "start_voltage_v", "max_dc_power_w", "max_dc_power_is", "ac_rated_w", "back_feed_a")},
	}
	trackerAll = slices.Concat(trackerInquiries, trackerMore)
)

// mayBeLeft are values that a piece need not have, beside those that a design's form
// says it of.
var mayBeLeft = []string{
	"vmp_temp_coeff", "cells_in_series", "isc_marked_max_a", "bifaciality", "noct_c", "length_mm", "width_mm",
	"max_dc_power_w", "ac_rated_w", "back_feed_a", "max_short_circuit_current_a",
	"full_power_min_v", "full_power_max_v", "string_fuse_a", "max_input_current_per_input_a", "max_short_circuit_current_per_input_a",
}

// asking picks inquiries by the names of their fields.
func asking(all []inquiry, names ...string) []inquiry {
	picked := make([]inquiry, len(names))
	for i, name := range names {
		k := slices.IndexFunc(all, func(q inquiry) bool { return q.name == name })
		picked[i] = all[k]
	}
	return picked
}

// newEquipmentPage makes the page of a piece. kept is what is known of it, nil where
// the form was posted.
func newEquipmentPage(p *piece, kept *record.Equipment, st pieceState) views.EquipmentPage {
	b := pieceBuilder{p, newPageBuilder(judged{form: p.form, faults: st.faults, result: &sizing.Result{Questions: st.questions}}, marking{faults: true, focus: st.focus})}
	page := views.EquipmentPage{
		ID: string(p.id), Action: "/equipment", Keep: "Keep it", Refused: st.refused, Stale: st.stale, Faults: b.summary(),
		Back:   equipmentAddress(record.EquipmentListing{Kind: p.kind, Sort: record.SortName}),
		Hidden: b.hidden(), Parts: b.parts(),
		Note: views.Field{ID: "note", Name: "note", Label: "Note", Value: p.note, Long: true, Width: "w6", May: true},
	}
	page.Heading, page.Kicker = b.heading(kept)
	if p.id != "" {
		page.Action = "/equipment/" + url.PathEscape(string(p.id))
		page.Keep = "Keep the change"
	}
	if st.said != "" {
		page.Said = &views.Said{Words: st.said}
	}
	if st.earlier != "" {
		page.Earlier = &views.Link{Href: "/equipment/" + url.PathEscape(string(st.earlier)), Words: "Open what was kept"}
	}
	if p.copied != "" {
		page.Copied = fmt.Sprintf("The values are those of %s. Model and power are empty, and what differs between power classes is marked until it is changed. Check every value against its datasheet.", p.copied)
	}
	if kept != nil {
		if kept.ArchivedAt != nil {
			page.Archived = &views.Action{Words: "Restore it", Path: page.Action + "/restore"}
		}
		page.Used = usedIn(kept, st.used, time.Now())
	}
	page.Base = listBase(page.Heading, "/equipment")
	page.Base.Styles = append(page.Base.Styles, comparisonStyles...)
	page.Base.Styles = append(page.Base.Styles, static.URL("equipment.css"))
	if st.faults != nil {
		page.Base.Title = "Please correct: " + page.Base.Title
	}
	return page
}

// pieceBuilder makes the fields of a piece.
type pieceBuilder struct {
	piece *piece
	*pageBuilder
}

// heading is what the page is called, and what is known of where it is kept.
func (b *pieceBuilder) heading(kept *record.Equipment) (heading, kicker string) {
	at := b.piece.at()
	what := string(b.piece.kind)
	heading = "A new " + what
	if model := strings.TrimSpace(b.form.Text(at + "/model")); model != "" {
		heading = pieceName(strings.TrimSpace(b.form.Text(at+"/maker")), model)
	}
	switch {
	case kept != nil:
		kicker = fmt.Sprintf("%s, version %d, changed %s by %s", upperFirst(what), kept.Version, moment(kept.Updated.At, time.Now()).Age, kept.Updated.By.Name)
	case b.piece.id != "":
		kicker = fmt.Sprintf("%s, made from version %d", upperFirst(what), b.piece.version)
	default:
		kicker = upperFirst(what) + ", not kept yet"
	}
	return heading, kicker
}

// hidden are the fields that go along unseen.
func (b *pieceBuilder) hidden() []views.HiddenField {
	fields := []views.HiddenField{
		{Name: "kind", Value: string(b.piece.kind)},
		{Name: "version", Value: strconv.FormatInt(b.piece.version, 10)},
		{Name: "request", Value: b.piece.request},
	}
	if b.piece.copied != "" {
		fields = append(fields, views.HiddenField{Name: "copied", Value: b.piece.copied})
	}
	for _, name := range powerClass {
		if text, ok := b.piece.copies[b.piece.at()+"/"+name]; ok {
			fields = append(fields, views.HiddenField{Name: copiedName + b.piece.at() + "/" + name, Value: text})
		}
	}
	return append(fields, b.keptAnswers()...)
}

// parts are the values by their subjects.
func (b *pieceBuilder) parts() []views.EquipmentPart {
	at := b.piece.at()
	whole := b.source(at, "The datasheet as a whole")
	whole.Hint = "Its title or number, revision and date. Below, where each value stands on it: page, table, column."
	maker, model := asking(moduleInquiries, "maker")[0], asking(moduleInquiries, "model")[0]
	maker.width, model.width, model.may = "w6", "w6", false
	if b.piece.kind == record.KindInverter {
		model.label = "Model"
	}
	first := views.EquipmentPart{ID: "which", Heading: "Which one it is", Lines: []views.SourcedField{
		{Field: b.field(at, maker)}, {Field: b.field(at, model)}, {Field: whole},
	}}
	parts := []views.EquipmentPart{first}
	if b.piece.kind == record.KindModule {
		for _, part := range moduleParts {
			parts = append(parts, b.part(at, part))
		}
		return parts
	}
	for _, part := range inverterParts {
		parts = append(parts, b.part(at, part))
	}
	list := at + "/trackers"
	for k := range b.form.Len(list) {
		parts = append(parts, b.tracker(list, k))
	}
	last := &parts[len(parts)-1]
	last.Add = b.adding(list, "Add a tracker", "")
	return parts
}

func (b *pieceBuilder) part(at string, of piecePart) views.EquipmentPart {
	part := views.EquipmentPart{ID: of.id, Heading: of.heading, Lead: of.lead}
	for _, q := range of.inquiries {
		part.Lines = append(part.Lines, b.line(at, q))
	}
	return part
}

func (b *pieceBuilder) tracker(list string, k int) views.EquipmentPart {
	at := pointerOf(list, k)
	part := b.part(at, piecePart{id: views.FieldID(at), heading: trackerName(k, b.form.Text(at+"/id")), inquiries: trackerAll})
	part.Hidden = []views.HiddenField{{Name: at + "/id", Value: b.form.Text(at + "/id")}}
	if k > 0 {
		part.Buttons = append(part.Buttons, views.Button{Do: "copy " + at, Words: "Same as tracker 1", Spoken: "for " + part.Heading})
	}
	if b.form.Len(list) > 1 {
		part.Buttons = append(part.Buttons, views.Button{Do: "remove " + at, Words: "Remove", Spoken: part.Heading})
	}
	return part
}

// line is a value with the field for where it stands on the datasheet.
func (b *pieceBuilder) line(at string, q inquiry) views.SourcedField {
	pointer := at + "/" + q.name
	q.may = q.may || slices.Contains(mayBeLeft, q.name)
	f := b.field(at, q)
	f.Width = "w6"
	if of := trackerOf(at); of != "" {
		f.Spoken = "of " + of
	}
	if text, ok := b.piece.copies[pointer]; ok && strings.TrimSpace(text) != "" && strings.TrimSpace(f.Value) == strings.TrimSpace(text) {
		f.Width += " copied"
		f.Hint = "Still that of " + b.piece.copied + "."
	}
	if q.name == "max_dc_power_is" {
		return views.SourcedField{Field: f} // it stands where the power stands
	}
	name := form.SourceName(pointer)
	return views.SourcedField{Field: f, Source: &views.Field{
		ID: views.FieldID(name), Name: name, Label: "Where on the datasheet", Spoken: strings.TrimSpace(": " + q.label + " " + f.Spoken),
		Value: b.form.Text(name), Width: "source", Fault: strings.Join(b.marked[name], " "),
	}}
}

// trackerOf names the tracker that a pointer is of, "" where it is of none.
func trackerOf(at string) string {
	_, k, ok := strings.Cut(at, "/trackers/")
	n, err := strconv.Atoi(k)
	if !ok || err != nil {
		return ""
	}
	return fmt.Sprintf("tracker %d", n+1)
}

// summary is the list of faults at the top of the form, nil if there are none.
func (b *pieceBuilder) summary() *views.Faults {
	if len(b.faults) == 0 {
		return nil
	}
	f := &views.Faults{Heading: "One thing keeps this from being kept"}
	if n := len(b.faults); n > 1 {
		f.Heading = fmt.Sprintf("%d things keep this from being kept", n)
	}
	for _, fault := range b.faults {
		link := views.Link{Words: fault.Detail}
		field := form.FieldOf(fault.Pointer)
		if label := labels[lastSegment(field)]; label != "" && strings.HasPrefix(fault.Detail, "“") {
			link.Words = upperFirst(label) + ": " + link.Words
		}
		if of := trackerOf(fault.Pointer[:max(0, strings.LastIndexByte(fault.Pointer, '/'))]); of != "" {
			link.Words = upperFirst(of) + ": " + link.Words
		}
		if field != "" && !strings.HasSuffix(field, "/id") {
			link.Href = "#" + views.FieldID(field)
		}
		f.Links = append(f.Links, link)
	}
	return f
}

// duplicate is a new piece with the values of this one, but its name and its power.
// What differs between power classes is marked until it is changed.
func (p *piece) duplicate() *piece {
	at := p.at()
	d := &piece{kind: p.kind, note: p.note, request: newPiece(p.kind).request, copied: strings.TrimSpace(p.form.Text(at + "/model"))}
	if d.copied == "" {
		d.copied = "another one"
	}
	values := textsOf(p.form)
	for name := range values {
		if strings.HasPrefix(name, "/answers/") {
			values.Del(name) // they are about its own values
		}
	}
	for _, name := range []string{"model", "pmax_w", "max_dc_power_w", "ac_rated_w"} {
		values.Del(at + "/" + name)
	}
	for _, name := range powerClass {
		if text := values.Get(at + "/" + name); text != "" {
			d.copy(at+"/"+name, text)
		}
	}
	d.form = formOf(values)
	return d
}

// textsOf are the texts of a form under the names of its fields.
func textsOf(f *form.Form) url.Values {
	values := url.Values{}
	for _, name := range f.Names("/") {
		values.Set(name, f.Text(name))
	}
	return values
}

// formOf is the form with these texts, which came out of one.
func formOf(values url.Values) *form.Form {
	f, err := form.FromValues(values)
	if err != nil {
		panic(err) // it has no more entries than the form that it came from
	}
	return f
}

// take takes over what another form of the same piece has in a field.
func (p *piece) take(theirs *piece, field string) {
	if field == "note" {
		p.note = theirs.note
		return
	}
	values := textsOf(p.form)
	for _, name := range []string{field, field + "/value", field + "/unit"} {
		values.Del(name)
		if text := theirs.form.Text(name); text != "" {
			values.Set(name, text)
		}
	}
	p.form = formOf(values)
}

// newStale tells what was kept meanwhile beside what was typed.
func newStale(mine, theirs *piece, now *record.Equipment, at time.Time) *views.StaleEquipment {
	s := &views.StaleEquipment{
		Heading: "Someone kept another version meanwhile",
		Lead: fmt.Sprintf("%s kept version %d %s. Nothing was overwritten: the form below holds what you typed. Take over what you want of theirs; keeping the change then makes yours version %d.",
			upperFirst(now.Updated.By.Name), now.Version, moment(now.Updated.At, at).Age, now.Version+1),
		Rows: pieceDifferences(mine, theirs),
	}
	if len(s.Rows) == 0 {
		s.Lead = fmt.Sprintf("%s kept version %d %s, and it says what stands in the form below.", upperFirst(now.Updated.By.Name), now.Version, moment(now.Updated.At, at).Age)
	}
	return s
}

// pieceDifferences are the fields in which two forms of one piece differ.
func pieceDifferences(mine, theirs *piece) []views.StaleRow {
	var rows []views.StaleRow
	seen := map[string]bool{}
	add := func(field, name, a, b string) {
		if !sameText(a, b) {
			rows = append(rows, views.StaleRow{Name: name, Mine: a, Theirs: b, Take: views.Button{Do: "theirs " + field, Words: "Take theirs", Spoken: "of " + name}})
		}
	}
	for _, name := range inPageOrder(append(mine.form.Names("/"), theirs.form.Names("/")...)) {
		field := form.FieldOf(name)
		if field == "" || seen[field] || strings.HasPrefix(field, "/answers/") || field == mine.at()+"/id" || field == mine.at()+"/quantity" {
			continue
		}
		seen[field] = true
		add(field, pieceFieldName(field), typedText(mine.form, field), typedText(theirs.form, field))
	}
	add("note", "Note", strings.TrimSpace(mine.note), strings.TrimSpace(theirs.note))
	return rows
}

// inPageOrder returns the names of a piece's fields in the order in which they stand on
// its page, each value before its source.
func inPageOrder(names []string) []string {
	order := map[string]int{"maker": 1, "model": 2}
	for _, parts := range [][]piecePart{moduleParts, inverterParts, {{inquiries: trackerAll}}} {
		for _, part := range parts {
			for _, q := range part.inquiries {
				order[q.name] = len(order) + 1
			}
		}
	}
	rank := func(name string) (tracker, place, source int) {
		if strings.HasPrefix(name, "/sources/") {
			name, source = form.SourceOf(name), 1
		} else {
			name = form.FieldOf(name)
		}
		if _, k, ok := strings.Cut(name, "/trackers/"); ok {
			segment, _, _ := strings.Cut(k, "/")
			n, _ := strconv.Atoi(segment)
			tracker = n + 1
		}
		return tracker, order[lastSegment(name)], source
	}
	sorted := slices.Sorted(slices.Values(names))
	slices.SortStableFunc(sorted, func(a, b string) int {
		ta, pa, sa := rank(a)
		tb, pb, sb := rank(b)
		return cmp.Or(cmp.Compare(ta, tb), cmp.Compare(pa, pb), cmp.Compare(sa, sb))
	})
	return sorted
}

// typedText is what stands in a field, with its unit, or in the words of its list.
func typedText(f *form.Form, field string) string {
	if form.Units(field) == nil {
		text := strings.TrimSpace(f.Text(field))
		for _, q := range slices.Concat(moduleInquiries, inverterMore) {
			for _, c := range q.choices {
				if q.name == lastSegment(field) && c[0] == text && text != "" {
					return c[1]
				}
			}
		}
		if unit := form.UnitOf(field); unit != "" && text != "" {
			text += "\u00a0" + unit
		}
		return text
	}
	value := strings.TrimSpace(f.Text(field + "/value"))
	if value == "" {
		return ""
	}
	return strings.TrimSpace(value + "\u00a0" + f.Text(field+"/unit"))
}

// sameText reports whether two texts of a field say the same: 37.30 is 37.3.
func sameText(a, b string) bool {
	if a == b {
		return true
	}
	x, errX := quantity.Typed(a)
	y, errY := quantity.Typed(b)
	return errX == nil && errY == nil && x.Unit == y.Unit && x.Value.Equal(y.Value)
}

// pieceFieldName is what a field of a piece is called where it stands alone.
func pieceFieldName(field string) string {
	of, isSource := field, strings.HasPrefix(field, "/sources/")
	if isSource {
		of = form.SourceOf(field)
	}
	name := valueName(of)
	if strings.Count(of, "/") == 2 {
		name = "the datasheet as a whole"
	}
	if isSource {
		return "Where on the datasheet: " + name
	}
	return upperFirst(name)
}

// valueName is what the value at a pointer is called without its module or inverter.
func valueName(pointer string) string {
	name := labels[lastSegment(pointer)]
	if name == "" {
		name = lastSegment(pointer)
	}
	if tracker := trackerOf(pointer[:max(0, strings.LastIndexByte(pointer, '/'))]); tracker != "" {
		name += " of " + tracker
	}
	return name
}

// usedIn tells which designs carry a copy of a piece.
func usedIn(kept *record.Equipment, used []record.Design, now time.Time) *views.UsedIn {
	u := &views.UsedIn{Says: "No saved design uses it. A design is known to use it by the maker and the model."}
	switch n := len(used); {
	case n == mostOffered:
		u.Says = fmt.Sprintf("The %d designs saved last that use this maker and model. Each carries its own copy: a change here changes none of them.", n)
	case n > 0:
		u.Says = fmt.Sprintf("%s this maker and model. Each carries its own copy: a change here changes none of them.", map[bool]string{true: "One design uses", false: fmt.Sprintf("%d designs use", n)}[n == 1])
	}
	for _, d := range used {
		note := fmt.Sprintf("revision %d", d.Revision)
		if d.ArchivedAt != nil {
			note += ", archived"
		}
		u.Designs = append(u.Designs, views.UsedDesign{ID: string(d.ID), Title: designTitle(d.Title), Verdict: views.Verdict(d.Verdict.String()), Note: note, Updated: moment(d.Updated.At, now)})
	}
	return u
}
