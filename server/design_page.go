package server

import (
	"encoding/json"
	"fmt"
	"maps"
	"slices"
	"strconv"
	"strings"

	"rimeline/server/display"
	"rimeline/server/form"
	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/static"
	"rimeline/views"
)

// judged is a form with what the reader and the engine say of it.
type judged struct {
	form   *form.Form
	design *design.Design // nil where there are faults
	faults design.Faults
	result *sizing.Result // nil where there are faults
}

// judge reads a form and sizes it if it is a whole design.
func judge(f *form.Form) judged {
	j := judged{form: f}
	if j.design, j.faults = f.Read(); j.design != nil {
		j.result = sizing.Size(j.design)
	}
	return j
}

// marking says what a page of a form points out.
type marking struct {
	faults bool   // every fault, at the top and beside its field
	focus  string // pointer of the entry or list that the page opens at
}

// newDesignPage makes the page of a form with the answer, or with what it waits for.
func newDesignPage(base views.Base, j judged, m marking) views.DesignPage {
	b := newPageBuilder(j, m)
	base.Wide = true
	base.Styles = append(base.Styles, static.URL("saved.css"))
	p := views.DesignPage{
		Base:     base,
		Title:    b.field("", titleInquiry),
		Sections: b.sections(),
		Answer:   newAnswerPane(j),
	}
	p.Answer.Slots = nil // on a whole page the questions stand beside their fields
	if m.faults {
		p.Faults = b.summary()
	}
	return p
}

// newAnswerPane makes the answer of a form, or says what it waits for.
func newAnswerPane(j judged) views.AnswerPane {
	b := newPageBuilder(j, marking{})
	pane := views.AnswerPane{Slots: b.slots()}
	if j.result != nil {
		answer := display.NewAnswer(j.design, j.result)
		pane.Answer = &answer
	} else {
		waiting := b.waiting()
		pane.Waiting = &waiting
	}
	return pane
}

// pageBuilder makes page structs of one form.
type pageBuilder struct {
	judged
	marked map[string][]string      // what is wrong, by the pointer of the field; empty where faults are not shown
	asked  map[string][]views.Asked // what is asked, by the pointer of the field
	focus  string                   // pointer of the entry whose first field takes the focus, or of the list whose button does; "" once it is given
}

func newPageBuilder(j judged, m marking) *pageBuilder {
	b := &pageBuilder{judged: j, marked: map[string][]string{}, asked: askedBeside(j), focus: m.focus}
	if m.faults {
		for _, fault := range j.faults {
			at := form.FieldOf(fault.Pointer)
			b.marked[at] = append(b.marked[at], fault.Detail)
		}
	}
	return b
}

// sections are the parts of the form in the order in which a datasheet is read.
func (b *pageBuilder) sections() []views.Section {
	return []views.Section{
		{
			ID: "site", Number: "1", Heading: "The site, and how cold and hot it gets",
			Groups: []views.Group{
				{ID: "site-fields", Label: "Site", Fields: b.fields("/site", siteInquiries)},
				{ID: "code-fields", Label: "Code", Fields: b.fields("", codeInquiries)},
			},
		},
		{
			ID: "modules", Number: "2", Heading: "What the module's datasheet says",
			Lead:   "All of it at STC: 1000 W/m², cells at 25 °C. Not the NOCT or NMOT column.",
			Groups: b.entries("/modules", b.module),
			Add:    b.adding("/modules", "Add another module", ""),
		},
		{
			ID: "inverters", Number: "3", Heading: "What the inverter and its trackers take",
			Groups: b.entries("/inverters", b.inverter),
			Add:    b.adding("/inverters", "Add another inverter", ""),
		},
		{
			ID: "planes", Number: "4", Heading: "The roof planes",
			Groups: b.entries("/planes", b.plane),
			Add:    b.adding("/planes", "Add a roof plane", ""),
		},
		{
			ID: "strings", Number: "5", Heading: "What is wired to what",
			Lead:   "Equal strings of one plane on one tracker make one line.",
			Empty:  "Nothing is strung yet. The answer already says what fits; add strings to have them judged.",
			Groups: b.entries("/strings", b.wired),
			Add:    b.adding("/strings", "Add strings", ""),
		},
		b.margins(),
		b.job(),
	}
}

// adding is the button that adds an entry to a list.
func (b *pageBuilder) adding(list, words, spoken string) *views.Button {
	return &views.Button{Do: "add " + list, Words: words, Spoken: spoken, Focus: b.focus == list}
}

// entries makes the groups of a list.
func (b *pageBuilder) entries(list string, group func(k int, at string) views.Group) []views.Group {
	groups := make([]views.Group, b.form.Len(list))
	for k := range groups {
		at := pointerOf(list, k)
		groups[k] = group(k, at)
		groups[k].ID = views.FieldID(at)
		for _, name := range []string{"/id", "/module", "/inverter", "/unit"} { // what is kept without being shown
			shown := slices.ContainsFunc(groups[k].Fields, func(f views.Field) bool { return f.Name == at+name })
			if !shown && b.form.Has(at+name) {
				groups[k].Hidden = append(groups[k].Hidden, views.HiddenField{Name: at + name, Value: b.form.Text(at + name)})
			}
		}
	}
	return groups
}

func (b *pageBuilder) module(k int, at string) views.Group {
	g := views.Group{
		Label:  "Module",
		Fields: b.fields(at, moduleInquiries),
		Folds: []views.Fold{b.fold(at, "Further values of the datasheet", "Each is optional; where one is missing the answer says what it used instead.",
			append(b.fields(at, moduleMore), b.source(at, "Where these values come from")))},
	}
	g.Folds = append(g.Folds, b.valueSources(at)...)
	if b.form.Len("/modules") > 1 {
		g.Heading, g.Class = fmt.Sprintf("Module %d", k+1), "entry"
		g.Buttons = []views.Button{{Do: "remove " + at, Words: "Remove", Spoken: g.Heading}}
	}
	return g
}

func (b *pageBuilder) inverter(k int, at string) views.Group {
	g := views.Group{
		Label:  "Inverter",
		Fields: b.fields(at, inverterInquiries),
		Folds: []views.Fold{b.fold(at, "Power and back-feed", "",
			append(b.fields(at, inverterMore), b.source(at, "Where these values come from")))},
		Groups: b.entries(at+"/trackers", b.tracker),
		Add:    b.adding(at+"/trackers", "Add a tracker", ""),
	}
	g.Folds = append(g.Folds, b.valueSources(at)...)
	for i := range g.Fields {
		g.Fields[i].Renews = g.Fields[i].Name == at+"/quantity"
	}
	if b.form.Len("/inverters") > 1 {
		g.Heading, g.Class = fmt.Sprintf("Inverter %d", k+1), "entry"
		g.Buttons = []views.Button{{Do: "remove " + at, Words: "Remove", Spoken: g.Heading}}
		g.Add.Spoken = "to inverter " + strconv.Itoa(k+1)
	}
	return g
}

func (b *pageBuilder) tracker(k int, at string) views.Group {
	g := views.Group{
		Heading: trackerName(k, b.form.Text(at+"/id")),
		Class:   "entry",
		Fields:  b.fields(at, trackerInquiries),
		Folds:   []views.Fold{b.fold(at, "Full-power window, fuses, limits of one input", "", b.fields(at, trackerMore))},
	}
	of := g.Heading
	if owner, _, _ := strings.Cut(strings.TrimPrefix(at, "/inverters/"), "/"); b.form.Len("/inverters") > 1 {
		n, _ := strconv.Atoi(owner)
		of += fmt.Sprintf(" of inverter %d", n+1)
	}
	if k > 0 {
		g.Buttons = append(g.Buttons, views.Button{Do: "copy " + at, Words: "Same as tracker 1", Spoken: "for " + of})
	}
	if b.form.Len(at[:strings.LastIndexByte(at, '/')]) > 1 {
		g.Buttons = append(g.Buttons, views.Button{Do: "remove " + at, Words: "Remove", Spoken: of})
	}
	return g
}

// trackerName is what a tracker is called: by its place, and by its id where a
// document gave it one of its own.
func trackerName(k int, id string) string {
	name := fmt.Sprintf("Tracker %d", k+1)
	if id = strings.TrimSpace(id); id != "" && id != fmt.Sprintf("t%d", k+1) {
		name += " (" + id + ")"
	}
	return name
}

func (b *pageBuilder) plane(k int, at string) views.Group {
	g := views.Group{Label: fmt.Sprintf("Roof plane %d", k+1), Class: "entry", Fields: b.fields(at, planeInquiries)}
	g.Fields[0].Rename = form.RenamedFrom(at + "/id")
	if b.form.Len("/modules") > 1 {
		module := b.field(at, planeModule)
		module.Choices = b.chosen(at+"/module", b.moduleChoices())
		g.Fields = append(g.Fields, module)
	}
	if b.form.Len("/planes") > 1 {
		g.Buttons = []views.Button{{Do: "remove " + at, Words: "Remove", Spoken: b.planeName(k)}}
		g.Heading = fmt.Sprintf("Plane %d", k+1)
	}
	return g
}

// wired is one strings entry. The inverter is asked for where there are several,
// its unit where several are installed.
func (b *pageBuilder) wired(k int, at string) views.Group {
	name := fmt.Sprintf("strings %d", k+1)
	g := views.Group{
		Label: "Strings " + strconv.Itoa(k+1), Class: "wire",
		Buttons: []views.Button{{Do: "remove " + at, Words: "Remove", Spoken: name}},
	}
	choose := func(field, label string, choices [][2]string) {
		f := b.field(at, inquiry{name: field, label: label, width: "w-" + field})
		f.Choices, f.Spoken = b.chosen(at+"/"+field, choices), "of "+name
		g.Fields = append(g.Fields, f)
	}
	count := func(field, label string) {
		f := b.field(at, inquiry{name: field, label: label, width: "w-" + field})
		f.Spoken = "of " + name
		g.Fields = append(g.Fields, f)
	}
	choose("plane", "From plane", b.planeChoices())
	if b.form.Len("/inverters") > 1 {
		choose("inverter", "To inverter", b.inverterChoices())
	}
	if b.severalUnits() {
		count("unit", "Unit")
	}
	choose("tracker", "To tracker", b.trackerChoices())
	count("modules_in_series", "In series")
	count("strings_in_parallel", "In parallel")
	return g
}

// severalUnits reports whether strings must say on which of several equal inverters
// they are; they must not be kept from it where that has a fault.
func (b *pageBuilder) severalUnits() bool {
	for k := range b.form.Len("/inverters") {
		if n := strings.TrimSpace(b.form.Text(pointerOf("/inverters", k) + "/quantity")); n != "" && n != "1" {
			return true
		}
	}
	for k := range b.form.Len("/strings") {
		if at := pointerOf("/strings", k) + "/unit"; b.form.Text(at) != "1" || b.marked[at] != nil {
			return true
		}
	}
	return false
}

func (b *pageBuilder) margins() views.Section {
	at := "/allowances"
	s := views.Section{
		ID: "margins", Number: "6", Heading: "Margins, and other rated parts", Folded: true,
		Lead: "Margins are your own: they are no part of the code's method and stand as their own lines in the working. " +
			"Any other part in the DC circuit lowers the ceiling if it is rated lower.",
		Groups: append([]views.Group{{ID: "allowance-fields", Label: "Margins", Fields: b.fields(at, allowanceInquiries)}},
			b.entries("/other_limits", b.otherLimit)...),
		Add: b.adding("/other_limits", "Add a rated part", "such as connectors, cable or a switch"),
	}
	s.Open = b.form.Len("/other_limits") > 0 || b.filled(s.Groups[0].Fields)
	return s
}

func (b *pageBuilder) otherLimit(k int, at string) views.Group {
	name := fmt.Sprintf("Rated part %d", k+1)
	return views.Group{
		Heading: name, Class: "entry", Fields: b.fields(at, otherLimitInquiries),
		Buttons: []views.Button{{Do: "remove " + at, Words: "Remove", Spoken: name}},
	}
}

// job is what the sheet's title strip says, and the sources that no other field shows.
func (b *pageBuilder) job() views.Section {
	fields := b.fields("/job", jobInquiries)
	for _, name := range b.form.Names("/sources/") {
		of := form.SourceOf(name)
		if !b.hasOwnSource(of) {
			fields = append(fields, views.Field{
				ID: views.FieldID(name), Name: name, Label: "Source of " + b.place(of), Value: b.form.Text(name),
				Width: "w3", Fault: strings.Join(b.marked[name], " "),
			})
		}
	}
	return views.Section{
		ID: "job", Number: "7", Heading: "The job, for the sheet's title strip", Folded: true,
		Open:   b.filled(fields),
		Groups: []views.Group{{ID: "job-fields", Label: "Job", Fields: fields, Hidden: b.keptAnswers()}},
	}
}

// keptAnswers are the answers about values that have no place for questions; they
// go along unseen.
func (b *pageBuilder) keptAnswers() []views.HiddenField {
	var kept []views.HiddenField
	shown := b.slots()
	for _, pointer := range slices.Sorted(maps.Keys(b.asked)) {
		if slices.ContainsFunc(shown, func(s views.Slot) bool { return s.ID == views.FieldID(pointer)+"-asked" }) {
			continue
		}
		for _, a := range b.asked[pointer] {
			kept = append(kept, hiddenAnswer(a)...)
		}
	}
	return kept
}

// hiddenAnswer is an answer as fields that are not shown.
func hiddenAnswer(a views.Asked) []views.HiddenField {
	at := "/answers/" + a.Index
	return []views.HiddenField{
		{Name: at + "/pointer", Value: a.Pointer},
		{Name: at + "/value_asked", Value: a.Value},
		{Name: at + "/reason", Value: a.Reason},
	}
}

// source is the field for where the values of a module or an inverter come from.
func (b *pageBuilder) source(at, label string) views.Field {
	name := form.SourceName(at)
	return views.Field{
		ID: views.FieldID(name), Name: name, Label: label, Value: b.form.Text(name), Width: "w6",
		Hint: "Datasheet, its revision and page.", Fault: strings.Join(b.marked[name], " "),
	}
}

// valueSources are the fields for where single values of a module or an inverter come
// from, folded away; none where none is stated, as kept equipment does.
func (b *pageBuilder) valueSources(at string) []views.Fold {
	fold := views.Fold{ID: views.FieldID(at) + "-sources", Words: "Where each value stands on the datasheet"}
	for _, name := range inPageOrder(b.form.Names(form.SourceName(at + "/"))) {
		f := views.Field{
			ID: views.FieldID(name), Name: name, Label: "Where: " + valueName(form.SourceOf(name)), Value: b.form.Text(name),
			Width: "w3", Fault: strings.Join(b.marked[name], " "),
		}
		fold.Open = fold.Open || f.Fault != ""
		fold.Fields = append(fold.Fields, f)
	}
	if len(fold.Fields) == 0 {
		return nil
	}
	return []views.Fold{fold}
}

// hasOwnSource reports whether the source of what is at a pointer is a field of its module or inverter.
func (b *pageBuilder) hasOwnSource(pointer string) bool {
	for _, list := range []string{"/modules", "/inverters"} {
		for k := range b.form.Len(list) {
			if at := pointerOf(list, k); pointer == at || strings.HasPrefix(pointer, at+"/") {
				return true
			}
		}
	}
	return false
}

func (b *pageBuilder) fold(at, words, note string, fields []views.Field) views.Fold {
	return views.Fold{ID: views.FieldID(at) + "-more", Words: words, Note: note, Open: b.filled(fields), Fields: fields}
}

// filled reports whether any of the fields holds something, a chosen unit aside, or has a fault.
func (b *pageBuilder) filled(fields []views.Field) bool {
	return slices.ContainsFunc(fields, func(f views.Field) bool {
		return f.Fault != "" || len(f.Asked) > 0 || strings.TrimSpace(f.Value) != "" ||
			f.Choices != nil && b.form.Text(f.Name) != ""
	})
}

func (b *pageBuilder) fields(at string, inquiries []inquiry) []views.Field {
	fields := make([]views.Field, len(inquiries))
	for i, q := range inquiries {
		fields[i] = b.field(at, q)
	}
	return fields
}

// field makes the field of one inquiry about the entry or group at a pointer.
func (b *pageBuilder) field(at string, q inquiry) views.Field {
	pointer := at + "/" + q.name
	kind := form.KindOf(pointer)
	f := views.Field{
		ID:     views.FieldID(pointer),
		Name:   pointer,
		Label:  q.label,
		Symbol: q.symbol,
		Hint:   q.hint,
		Unit:   form.UnitOf(pointer),
		Whole:  kind == form.Count,
		Long:   q.long,
		May:    q.may,
		Width:  q.width,
		Fault:  strings.Join(b.marked[pointer], " "),
	}
	if k, err := strconv.Atoi(lastSegment(at)); err == nil && k > 0 && !strings.HasPrefix(at, "/modules") {
		f.Hint = "" // the first entry of the list says it
	}
	if b.focus != "" && at == b.focus {
		f.Focus, b.focus = true, ""
	}
	if f.Width == "" {
		f.Width = "w2"
	}
	if units := form.Units(pointer); units != nil {
		f.Name = pointer + "/value"
		f.Units = &views.UnitChoice{
			ID: f.ID + "-unit", Name: pointer + "/unit", Label: "Unit of: " + q.label,
			Choices: b.unitChoices(pointer+"/unit", units, kind),
		}
	}
	switch kind {
	case form.Temperature:
		f.Twin = &views.Twin{Kind: "temperature", Says: b.form.Twin(pointer)}
	case form.Difference:
		f.Twin = &views.Twin{Kind: "difference", Says: b.form.Twin(pointer)}
	}
	f.Value = b.form.Text(f.Name)
	if q.choices != nil {
		f.Choices = b.chosen(f.Name, q.choices)
	}
	if q.asked {
		f.Slot, f.Asked = f.ID+"-asked", b.asked[pointer]
	}
	return f
}

// chosen marks the choice that the form holds. One that is not offered is added, so
// that it is not lost.
func (b *pageBuilder) chosen(name string, choices [][2]string) []views.Choice {
	now := strings.TrimSpace(b.form.Text(name))
	made := make([]views.Choice, 0, len(choices)+1)
	found := false
	for _, c := range choices {
		made = append(made, views.Choice{Value: c[0], Words: c[1], Chosen: c[0] == now && !found})
		found = found || c[0] == now
	}
	if !found {
		words := now + " (not offered here)"
		if now == "" {
			words = "Choose"
		}
		made = append([]views.Choice{{Value: now, Words: words, Chosen: true}}, made...)
	}
	return made
}

// unitChoices offers no unit at first where a wrong guess would do harm.
func (b *pageBuilder) unitChoices(name string, units []string, kind form.Kind) []views.Choice {
	var choices [][2]string
	if kind != form.Difference {
		choices = append(choices, [2]string{"", "unit"})
	}
	for _, u := range units {
		choices = append(choices, [2]string{u, u})
	}
	made := b.chosen(name, choices)
	if made[0].Value == "" && kind == form.Difference {
		made = made[1:] // °C, in which differences are nearly always stated
		made[0].Chosen = true
	}
	return made
}

func (b *pageBuilder) moduleChoices() [][2]string {
	return b.choices("/modules", func(k int, at string) string {
		return fmt.Sprintf("Module %d", k+1) + prefixed(" · ", b.form.Text(at+"/model"))
	})
}

func (b *pageBuilder) inverterChoices() [][2]string {
	return b.choices("/inverters", func(k int, at string) string {
		return fmt.Sprintf("%d", k+1) + prefixed(" · ", b.form.Text(at+"/model"))
	})
}

func (b *pageBuilder) planeChoices() [][2]string {
	return b.choices("/planes", func(k int, at string) string { return b.planeName(k) })
}

// trackerChoices are the trackers of all inverters; those of the same id are one choice.
func (b *pageBuilder) trackerChoices() [][2]string {
	var all [][2]string
	for i := range b.form.Len("/inverters") {
		for _, c := range b.choices(pointerOf("/inverters", i)+"/trackers", func(k int, at string) string {
			return strings.TrimPrefix(trackerName(k, b.form.Text(at+"/id")), "Tracker ")
		}) {
			if !slices.ContainsFunc(all, func(known [2]string) bool { return known[0] == c[0] }) {
				all = append(all, c)
			}
		}
	}
	return all
}

func (b *pageBuilder) choices(list string, words func(k int, at string) string) [][2]string {
	made := make([][2]string, b.form.Len(list))
	for k := range made {
		at := pointerOf(list, k)
		made[k] = [2]string{strings.TrimSpace(b.form.Text(at + "/id")), words(k, at)}
	}
	return made
}

func (b *pageBuilder) planeName(k int) string {
	if name := strings.TrimSpace(b.form.Text(pointerOf("/planes", k) + "/id")); name != "" {
		return name
	}
	return fmt.Sprintf("Plane %d", k+1)
}

func prefixed(with, s string) string {
	if s = strings.TrimSpace(s); s == "" {
		return ""
	}
	return with + s
}

func pointerOf(list string, k int) string { return list + "/" + strconv.Itoa(k) }

// summary is the list of faults at the top of the form, nil if there are none.
func (b *pageBuilder) summary() *views.Faults {
	if len(b.faults) == 0 {
		return nil
	}
	s := &views.Faults{Heading: "One thing keeps this design from being sized"}
	if n := len(b.faults); n > 1 {
		s.Heading = fmt.Sprintf("%d things keep this design from being sized", n)
	}
	for _, fault := range b.inOrder(b.faults) {
		s.Links = append(s.Links, views.Link{Href: b.href(fault.Pointer), Words: prefixedBy(b.owner(fault.Pointer), ": ") + fault.Detail})
	}
	return s
}

func prefixedBy(s, with string) string {
	if s == "" {
		return ""
	}
	return s + with
}

// inOrder returns the faults in the order of the page.
func (b *pageBuilder) inOrder(faults design.Faults) design.Faults {
	sorted := slices.Clone(faults)
	slices.SortStableFunc(sorted, func(a, c design.Fault) int { return sectionOf(a.Pointer) - sectionOf(c.Pointer) })
	return sorted
}

// sectionOf tells where on the page a pointer lies: a greater number is further down,
// and what has no place comes first.
func sectionOf(pointer string) int {
	return slices.IndexFunc(formOrder, func(top string) bool { return pointer == top || strings.HasPrefix(pointer, top+"/") })
}

// formOrder is the parts of the form in the order of the page.
var formOrder = []string{
	"/title", "/site", "/rulebook", "/voltage_method", "/short_circuit_basis", "/modules", "/inverters", "/planes",
	"/strings", "/allowances", "/other_limits", "/job", "/sources", "/answers",
}

// href leads to the field of a pointer, or to the nearest part of the page.
func (b *pageBuilder) href(pointer string) string {
	if at := form.FieldOf(pointer); at != "" {
		if strings.HasSuffix(at, "/id") && !strings.HasPrefix(at, "/planes/") {
			at = strings.TrimSuffix(at, "/id") // the field is hidden; its group is there
		}
		return "#" + views.FieldID(at)
	}
	for at := pointer; at != ""; at = at[:strings.LastIndexByte(at, '/')] {
		switch at {
		case "/site", "/modules", "/inverters", "/planes", "/strings", "/job":
			return "#" + at[1:]
		case "/allowances", "/other_limits":
			return "#margins"
		}
	}
	return ""
}

// owner names the part of the form that a pointer lies in: "Inverter 2, tracker 1".
func (b *pageBuilder) owner(pointer string) string {
	parts := strings.Split(strings.TrimPrefix(pointer, "/"), "/")
	one := func(list, word string, segment string) string {
		k, err := strconv.Atoi(segment)
		if err != nil || b.form.Len(list) == 1 {
			return word
		}
		return fmt.Sprintf("%s %d", word, k+1)
	}
	if len(parts) < 2 {
		return ""
	}
	switch parts[0] {
	case "site":
		return "Site"
	case "modules":
		return one("/modules", "Module", parts[1])
	case "inverters":
		name := one("/inverters", "Inverter", parts[1])
		if len(parts) > 3 && parts[2] == "trackers" {
			k, _ := strconv.Atoi(parts[3])
			return fmt.Sprintf("%s, tracker %d", name, k+1)
		}
		return name
	case "planes":
		if k, err := strconv.Atoi(parts[1]); err == nil {
			return "Plane " + strconv.Itoa(k+1) + prefixed(": ", strings.TrimPrefix(b.planeName(k), fmt.Sprintf("Plane %d", k+1)))
		}
	case "strings":
		return one("/strings", "Strings", parts[1])
	case "allowances":
		return "Margins"
	case "other_limits":
		return one("/other_limits", "Rated part", parts[1])
	case "job":
		return "Job"
	}
	return ""
}

// place names what is at a pointer.
func (b *pageBuilder) place(pointer string) string {
	label := labels[lastSegment(pointer)]
	if label == "" {
		return prefixedBy(b.owner(pointer), ", ") + pointer
	}
	return prefixedBy(b.owner(pointer), ", ") + label
}

func lastSegment(pointer string) string { return pointer[strings.LastIndexByte(pointer, '/')+1:] }

// labels are the labels of all fields by the last part of their pointers, in the
// form in which they stand in a list: the symbol alone where there is one.
var labels = func() map[string]string {
	made := map[string]string{
		"plane": "plane", "inverter": "inverter", "unit": "unit", "tracker": "tracker",
		"modules_in_series": "modules in series", "strings_in_parallel": "strings in parallel",
	}
	for _, all := range [][]inquiry{
		{titleInquiry, planeModule}, siteInquiries, codeInquiries, moduleInquiries, moduleMore, inverterInquiries, inverterMore,
		trackerInquiries, trackerMore, planeInquiries, allowanceInquiries, jobInquiries,
	} {
		for _, q := range all {
			label := strings.ToLower(q.label[:1]) + q.label[1:]
			if strings.HasPrefix(q.label, "MPPT") || strings.HasPrefix(q.label, "NOCT") {
				label = q.label
			}
			if q.symbol != "" && !strings.HasSuffix(q.name, "_coeff") {
				label = q.symbol
			}
			if _, known := made[q.name]; !known {
				made[q.name] = label
			}
		}
	}
	return made
}()

// listedMissing is how many missing values are named one by one while the answer waits.
const listedMissing = 60

// waiting says what keeps the form from being sized: what cannot be read, and what is
// missing. It is no list of faults: someone is still typing.
func (b *pageBuilder) waiting() views.Waiting {
	var w views.Waiting
	missing := 0
	for _, fault := range b.inOrder(b.faults) {
		if !b.isMissing(fault) {
			w.Unread = append(w.Unread, views.Link{Href: b.href(fault.Pointer), Words: prefixedBy(b.owner(fault.Pointer), ": ") + fault.Detail})
			continue
		}
		missing++
		if missing > listedMissing {
			continue
		}
		of := b.owner(fault.Pointer)
		if of == "" {
			of = "Code"
		}
		at := form.FieldOf(fault.Pointer)
		name := labels[lastSegment(at)]
		if form.Units(at) != nil && strings.TrimSpace(b.form.Text(at+"/value")) != "" {
			name = "the unit of " + name
		}
		if name == "" {
			name = fault.Detail
		}
		if n := len(w.Missing); n == 0 || w.Missing[n-1].Of != of {
			w.Missing = append(w.Missing, views.WaitingFor{Of: of})
		}
		last := &w.Missing[len(w.Missing)-1]
		last.Fields = append(last.Fields, views.Link{Href: b.href(fault.Pointer), Words: name})
	}
	if missing > listedMissing {
		w.More = fmt.Sprintf("And %d more values.", missing-listedMissing)
	}
	values := counted(missing, "more value")
	switch {
	case missing == 0:
		w.Headline = "The answer waits for " + counted(len(w.Unread), "value") + " that cannot be taken as it stands."
		if len(w.Unread) > 1 {
			w.Headline = "The answer waits for " + counted(len(w.Unread), "value") + " that cannot be taken as they stand."
		}
		w.Short = "Waiting: " + counted(len(w.Unread), "value") + " cannot be taken"
	default:
		w.Headline = "The answer needs " + values + "."
		w.Short = "Waiting for " + values
	}
	return w
}

// isMissing reports whether a fault is about a field with nothing in it.
func (b *pageBuilder) isMissing(fault design.Fault) bool {
	at := form.FieldOf(fault.Pointer)
	if at == "" {
		return false
	}
	if form.Units(at) == nil {
		return strings.TrimSpace(b.form.Text(at)) == ""
	}
	return strings.TrimSpace(b.form.Text(at+"/value")) == "" || strings.TrimSpace(b.form.Text(at+"/unit")) == ""
}

func counted(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return strconv.Itoa(n) + " " + what + "s"
}

// slots are the questions of every field that may be asked about, for the script to
// put beside them.
func (b *pageBuilder) slots() []views.Slot {
	var made []views.Slot
	for k := range b.form.Len("/modules") {
		at := pointerOf("/modules", k)
		for _, q := range slices.Concat(moduleInquiries, moduleMore) {
			if pointer := at + "/" + q.name; q.asked {
				made = append(made, views.Slot{ID: views.FieldID(pointer) + "-asked", Asked: b.asked[pointer]})
			}
		}
	}
	return made
}

// askedBeside puts the open questions of a result beside their fields, and the
// reasons that were given beside theirs. A reason given for another value stays on
// record until a new one is given.
func askedBeside(j judged) map[string][]views.Asked {
	made := map[string][]views.Asked{}
	type about struct{ pointer, members string }
	given := map[about]views.Asked{} // the latest reason for each thing that can be asked
	var order []about
	next := j.form.Len("/answers")
	for k := range next {
		at := pointerOf("/answers", k)
		a := views.Asked{
			Index: strconv.Itoa(k), Pointer: j.form.Text(at + "/pointer"),
			Value: j.form.Text(at + "/value_asked"), Reason: j.form.Text(at + "/reason"),
		}
		key := about{a.Pointer, members(a.Value)}
		if _, again := given[key]; !again {
			order = append(order, key)
		}
		given[key] = a
	}
	if j.result != nil {
		for _, q := range j.result.Questions {
			key := about{q.Pointer, members(q.ValueAsked)}
			a := views.Asked{
				Index: strconv.Itoa(next), Pointer: q.Pointer, Value: q.ValueAsked,
				Question: q.Asked, Why: sentence(q.Why),
			}
			if q.Unsafe {
				a.Effect = "Until it is answered, what rests on it stays unconfirmed."
			}
			if earlier, ok := given[key]; ok {
				a.Earlier = earlier.Reason
				a.Kept = hiddenAnswer(earlier)
				delete(given, key)
			}
			next++
			made[q.Pointer] = append(made[q.Pointer], a)
		}
	}
	for _, key := range order {
		if a, ok := given[key]; ok {
			made[a.Pointer] = append(made[a.Pointer], a)
		}
	}
	for pointer := range made {
		for i := range made[pointer] {
			made[pointer][i].ID = views.FieldID(pointer) + "-reason-" + strconv.Itoa(i)
		}
	}
	return made
}

// members names the fields that a question rests on, as far as its value tells.
func members(value string) string {
	var object map[string]json.RawMessage
	if json.Unmarshal([]byte(value), &object) != nil {
		return ""
	}
	return strings.Join(slices.Sorted(maps.Keys(object)), " ")
}

// sentence ends a text with a full stop.
func sentence(s string) string {
	if s == "" || strings.HasSuffix(s, ".") || strings.HasSuffix(s, "?") {
		return s
	}
	return s + "."
}
