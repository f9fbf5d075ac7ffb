package form

import "strings"

// Kind says how the text of a field becomes JSON.
type Kind uint8

const (
	Text        Kind = iota // free text, or the id of another entry
	Choice                  // one of the document's words
	Number                  // a decimal
	Count                   // a whole number
	Temperature             // a decimal with its unit, °C or °F
	Difference              // the same, for a difference of temperatures
	Coefficient             // a decimal with its unit, such as %/°C
	Asked                   // JSON of the value that a question was asked about
)

// twoPart reports whether a field of this kind is typed into two fields, its
// pointer with /value and with /unit.
func (k Kind) twoPart() bool { return k == Temperature || k == Difference || k == Coefficient }

// A node is a field, a group of fields, or a list of equal groups.
type node struct {
	name     string
	kind     Kind   // of a field
	unit     string // of a Number, as printed beside the field: "V"
	kids     []node // of a group or of each entry of a list; nil for a field
	list     bool
	optional bool   // an empty group or list is left out of the document
	mayBlank bool   // of a Text: the document has it also when nothing is typed
	serial   string // of a list: its entries get the ids m1, m2, …; "" where people name them
}

func text(name string) node         { return node{name: name} }
func choice(name string) node       { return node{name: name, kind: Choice} }
func number(name, unit string) node { return node{name: name, kind: Number, unit: unit} }
func count(name string) node        { return node{name: name, kind: Count} }
func of(name string, k Kind) node   { return node{name: name, kind: k} }

// document is every field that the form has, in the order of the format page.
// "format" is not typed and "sources" has names of its own.
var document = node{kids: []node{
	{name: "title", mayBlank: true},
	choice("rulebook"),
	choice("voltage_method"),
	choice("short_circuit_basis"),
	{name: "site", kids: []node{
		{name: "name", mayBlank: true},
		choice("structure"),
		text("station"),
		number("elevation_m", "m"),
		of("coldest_c", Temperature),
		choice("coldest_basis"),
		of("hottest_c", Temperature),
		choice("hottest_basis"),
	}},
	{name: "modules", list: true, serial: "m", kids: []node{
		text("id"),
		text("maker"),
		text("model"),
		choice("technology"),
		count("cells_in_series"),
		number("pmax_w", "W"),
		number("voc_v", "V"),
		number("isc_a", "A"),
		number("vmp_v", "V"),
		number("imp_a", "A"),
		of("voc_temp_coeff", Coefficient),
		of("isc_temp_coeff", Coefficient),
		of("pmax_temp_coeff", Coefficient),
		of("vmp_temp_coeff", Coefficient),
		number("max_system_voltage_v", "V"),
		number("max_series_fuse_a", "A"),
		number("isc_marked_max_a", "A"),
		number("bifaciality", ""),
		of("noct_c", Temperature),
		number("length_mm", "mm"),
		number("width_mm", "mm"),
	}},
	{name: "inverters", list: true, serial: "i", kids: []node{
		text("id"),
		text("maker"),
		text("model"),
		count("quantity"),
		number("ac_rated_w", "W"),
		number("max_dc_power_w", "W"),
		choice("max_dc_power_is"),
		number("max_dc_voltage_v", "V"),
		number("start_voltage_v", "V"),
		number("back_feed_a", "A"),
		{name: "trackers", list: true, serial: "t", kids: []node{
			text("id"),
			number("mppt_min_v", "V"),
			number("mppt_max_v", "V"),
			number("full_power_min_v", "V"),
			number("full_power_max_v", "V"),
			count("inputs"),
			number("max_input_current_a", "A"),
			number("max_input_current_per_input_a", "A"),
			number("max_short_circuit_current_a", "A"),
			number("max_short_circuit_current_per_input_a", "A"),
			number("string_fuse_a", "A"),
		}},
	}},
	{name: "planes", list: true, kids: []node{
		text("id"),
		text("module"),
		count("positions"),
		of("hot_cell_rise_c", Difference),
		number("tilt_deg", "°"),
		number("azimuth_deg", "°"),
		number("current_gain_pct", "%"),
	}},
	{name: "allowances", optional: true, kids: []node{
		number("hot_voltage_pct", "%"),
		number("cold_voltage_pct", "%"),
		of("headroom_c", Difference),
	}},
	{name: "other_limits", list: true, optional: true, kids: []node{
		text("name"),
		number("max_voltage_v", "V"),
		text("source"),
	}},
	{name: "strings", list: true, optional: true, kids: []node{
		text("inverter"),
		count("unit"),
		text("tracker"),
		text("plane"),
		count("modules_in_series"),
		count("strings_in_parallel"),
	}},
	{name: "job", optional: true, kids: []node{
		text("client"),
		text("address"),
		text("authority"),
		text("permit_number"),
		text("preparer"),
		text("licence"),
		text("note"),
	}},
	{name: "answers", list: true, optional: true, kids: []node{
		text("pointer"),
		of("value_asked", Asked),
		text("reason"),
	}},
}}

// kid returns the node of a name in a group, nil if there is none.
func (n *node) kid(name string) *node {
	for i := range n.kids {
		if n.kids[i].name == name {
			return &n.kids[i]
		}
	}
	return nil
}

// find returns the field at a pointer and the rest of the pointer below it, such as
// "/unit"; nil where the form has no field there.
func find(pointer string) (field *node, at, below string) {
	n, rest := &document, pointer
	for strings.HasPrefix(rest, "/") && n.kids != nil {
		var name string
		name, rest = cutSegment(rest)
		if n = n.kid(unescape(name)); n == nil {
			return nil, "", ""
		}
		if n.list {
			name, rest = cutSegment(rest)
			if _, ok := index(name); !ok {
				return nil, "", ""
			}
		}
	}
	if n.kids != nil {
		return nil, "", ""
	}
	return n, strings.TrimSuffix(pointer, rest), rest
}

// FieldOf returns the pointer of the form's field that a pointer of the document
// lies in, "" if it lies in none: /site/coldest_c for /site/coldest_c/value.
func FieldOf(pointer string) string {
	if strings.HasPrefix(pointer, "/sources/") {
		return pointer
	}
	_, at, _ := find(pointer)
	return at
}

// UnitOf returns the unit of a field as it is printed beside it, "" where it has
// none or has a field of its own for it.
func UnitOf(pointer string) string {
	if n, _, _ := find(pointer); n != nil {
		return n.unit
	}
	return ""
}

// KindOf returns how the text at a pointer is read; free text where the form has no such field.
func KindOf(pointer string) Kind {
	if n, _, _ := find(pointer); n != nil {
		return n.kind
	}
	return Text
}

// cutSegment splits "/modules/0/id" into "modules" and "/0/id".
func cutSegment(pointer string) (segment, rest string) {
	s := strings.TrimPrefix(pointer, "/")
	if i := strings.IndexByte(s, '/'); i >= 0 {
		return s[:i], s[i:]
	}
	return s, ""
}

var (
	escaper   = strings.NewReplacer("~", "~0", "/", "~1")
	unescaper = strings.NewReplacer("~1", "/", "~0", "~")
)

// Escape writes a name as one segment of a JSON Pointer (RFC 6901).
func Escape(name string) string { return escaper.Replace(name) }

func unescape(segment string) string { return unescaper.Replace(segment) }

// AllNames returns the names of all fields, with * for the number of an entry.
func AllNames() []string {
	var names []string
	var walk func(n *node, at string)
	walk = func(n *node, at string) {
		if n.list {
			at += "/*"
		}
		switch {
		case n.kids == nil && n.kind.twoPart():
			names = append(names, at+"/value", at+"/unit")
		case n.kids == nil:
			names = append(names, at)
		}
		for i := range n.kids {
			walk(&n.kids[i], at+"/"+n.kids[i].name)
		}
	}
	walk(&document, "")
	return names
}
