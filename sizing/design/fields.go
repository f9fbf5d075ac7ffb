package design

import (
	"cmp"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"rimeline/sizing/quantity"
)

// maxFaults is how many faults of one document are told. Beyond it the lists are
// not read on: a hostile text shall not ask for a thousand times its own size in
// sentences, nor in memory.
const maxFaults = 1000

// maxWhole is the largest count a design may state. It leaves room for the
// product of two counts, and lies far beyond any roof.
const maxWhole = 1_000_000_000

// reader walks the nodes of one document and collects its faults.
type reader struct {
	nodes  []node
	faults []placedFault
	more   bool // there are faults beyond maxFaults

	// Room for the values that pointers are kept of: one allocation each instead of one a value.
	numbers []quantity.Exact
	wholes  []int64
}

// placedFault is a fault and where in the text it belongs, to be sorted by.
type placedFault struct {
	Fault
	at int32
}

func (r *reader) fault(at int32, pointer, found, expected, detail string) {
	if len(r.faults) == maxFaults {
		r.more = true
		return
	}
	r.faults = append(r.faults, placedFault{Fault{pointer, found, expected, detail}, at})
}

// faultAt records a fault of the value at n.
func (r *reader) faultAt(n int32, found, expected, detail string) {
	r.fault(r.nodes[n].start, r.pointer(n), found, expected, detail)
}

// collected returns the faults in the order of the text; at one place, in the order of the schema.
func (r *reader) collected() Faults {
	if len(r.faults) == 0 {
		return nil
	}
	slices.SortStableFunc(r.faults, func(a, b placedFault) int { return cmp.Compare(a.at, b.at) })
	faults := make(Faults, len(r.faults), len(r.faults)+1)
	for i, f := range r.faults {
		faults[i] = f.Fault
	}
	if r.more {
		faults = append(faults, Fault{Found: "more faults", Expected: "none", Detail: fmt.Sprintf("There are more faults; the first %d are listed.", maxFaults)})
	}
	return faults
}

// pointer returns the JSON Pointer (RFC 6901) of the value at n.
func (r *reader) pointer(n int32) string {
	if n == 0 {
		return ""
	}
	v := &r.nodes[n]
	parent := r.pointer(v.parent)
	if r.nodes[v.parent].kind == isList {
		return parent + "/" + strconv.Itoa(int(v.index))
	}
	return parent + "/" + pointerToken(v.name)
}

var pointerEscapes = strings.NewReplacer("~", "~0", "/", "~1")

func pointerToken(name string) string { return pointerEscapes.Replace(name) }

// describe says in a few words what stands at n.
func (r *reader) describe(n int32) string {
	v := &r.nodes[n]
	switch v.kind {
	case isObject:
		return "an object"
	case isList:
		if v.first == 0 {
			return "an empty list"
		}
		return "a list"
	case isText:
		return quote(v.text)
	case isNumber:
		return typeset(v.text)
	case isTrue:
		return "true"
	case isFalse:
		return "false"
	}
	return "null"
}

// quote puts a text in quotes, cut to a readable length, control characters escaped.
func quote(text string) string {
	q := strconv.Quote(cut(text))
	return strings.ReplaceAll(q, `\u00a0`, "\u00a0") // a no-break space is common in what is pasted
}

// typeset returns a number with a true minus.
func typeset(number string) string { return strings.ReplaceAll(cut(number), "-", "−") }

// amount returns a number with its unit, as it is shown in a fault.
func amount(number, unit string) string {
	if unit == "" {
		return typeset(number)
	}
	return typeset(number) + " " + unit
}

// sentence begins a sentence with a label.
func sentence(label string) string { return strings.ToUpper(label[:1]) + label[1:] }

// unitOf returns the unit in which a field's name ends, "" if in none.
func unitOf(name string) string {
	switch name[strings.LastIndexByte(name, '_')+1:] {
	case "v":
		return "V"
	case "a":
		return "A"
	case "w":
		return "W"
	case "c":
		return "°C"
	case "pct":
		return "%"
	case "deg":
		return "°"
	case "m":
		return "m"
	case "mm":
		return "mm"
	}
	return ""
}

// wrongKind records that something of another kind stands at n.
func (r *reader) wrongKind(n int32, label, expected string) {
	v := &r.nodes[n]
	detail := fmt.Sprintf("%s must be %s.", sentence(label), expected)
	switch {
	case v.kind == isNull:
		detail = fmt.Sprintf("%s must be %s; null is no value.", sentence(label), expected)
	case v.kind == isText && (strings.HasPrefix(expected, "a number") || strings.HasPrefix(expected, "a whole number")):
		if _, err := quantity.Parse(v.text); err == nil {
			detail = fmt.Sprintf("%s must be a number: write %s without the quotes.", sentence(label), v.text)
		}
	}
	r.faultAt(n, r.describe(n), expected, detail)
}

// presence says whether a field may be left out.
type presence bool

const (
	must presence = true
	may  presence = false
)

// object reads the fields of one object by name. What was not asked for when
// close is called is unknown; so the calls are the schema.
type object struct {
	r     *reader
	n     int32
	last  int32 // where the field read last ends: the place of a missing one
	names [mostFields]string
	asked int // how many names were asked for
}

const mostFields = 24 // a module has 21

// open starts to read the object at n, or records that there is none.
func (o *object) open(r *reader, n int32, label string) bool {
	if r.nodes[n].kind != isObject {
		r.wrongKind(n, label, "an object")
		return false
	}
	o.r, o.n, o.last = r, n, r.nodes[n].start
	return true
}

// find returns the node of the field, 0 if there is none, and whether it can be
// relied on: it is there, and once.
func (o *object) find(name string) (n int32, sound bool) {
	o.names[o.asked] = name
	o.asked++
	for i := o.r.nodes[o.n].first; i != 0; i = o.r.nodes[i].next {
		v := &o.r.nodes[i]
		if v.name != name {
			continue
		}
		v.read = true
		if n != 0 {
			o.r.again(i, name)
			sound = false
			continue
		}
		n, sound = i, true
		o.last = v.end
	}
	return n, sound
}

// again records a name that its object has already.
func (r *reader) again(n int32, name string) {
	r.faultAt(n, quote(name)+" a second time", "each field once", fmt.Sprintf("The field %s stands here twice; keep one.", quote(name)))
}

// missing records that a field is left out which must not be.
func (o *object) missing(name, expected, request string) {
	o.r.fault(o.last, o.pointer(name), "nothing", expected, request+".")
}

// pointer returns the pointer of a field, there or not.
func (o *object) pointer(name string) string { return o.r.pointer(o.n) + "/" + pointerToken(name) }

// close records the fields that the schema did not ask for.
func (o *object) close() {
	for i := o.r.nodes[o.n].first; i != 0 && !o.r.more; i = o.r.nodes[i].next {
		if v := &o.r.nodes[i]; !v.read {
			o.unknown(i, v.name)
		}
	}
}

func (o *object) unknown(n int32, name string) {
	for _, known := range o.names[:o.asked] {
		if letters(known) == letters(name) {
			o.r.faultAt(n, "the field "+quote(name), known,
				fmt.Sprintf("There is no field %s here; did you mean %s? Names are written exactly so.", quote(name), known))
			return
		}
	}
	o.r.faultAt(n, "the field "+quote(name), "one of "+listed(o.names[:o.asked], "and"),
		fmt.Sprintf("There is no field %s here.", quote(name)))
}

// letters returns a name without what people vary: case, and the signs between words.
func letters(name string) string {
	return strings.Map(func(c rune) rune {
		if c == '_' || c == '-' || c == ' ' || c == '.' {
			return -1
		}
		return c
	}, strings.ToLower(name))
}

// listed joins words as a sentence does.
func listed(words []string, before string) string {
	if len(words) < 2 {
		return strings.Join(words, "")
	}
	last := len(words) - 1
	return strings.Join(words[:last], ", ") + " " + before + " " + words[last]
}

// text reads a free text; "" where it is left out. ok is false if there is a fault.
func (o *object) text(name, label string, p presence) (text string, ok bool) {
	n, sound := o.find(name)
	if n == 0 {
		if p == must {
			o.missing(name, "a text", "Enter "+label)
		}
		return "", p == may
	}
	if o.r.nodes[n].kind != isText {
		o.r.wrongKind(n, label, "a text")
		return "", false
	}
	return o.r.nodes[n].text, sound
}

// named reads a required text that must say something. ask is the verb to ask for it with: "Enter ".
func (o *object) named(name, ask, label string) (text string, n int32, ok bool) {
	n, sound := o.find(name)
	if n == 0 {
		o.missing(name, "a text that is not blank", ask+label)
		return "", 0, false
	}
	v := &o.r.nodes[n]
	switch {
	case v.kind != isText:
		o.r.wrongKind(n, label, "a text")
		return "", n, false
	case strings.TrimSpace(v.text) == "":
		o.r.faultAt(n, quote(v.text), "a text that is not blank", ask+label+".")
		return "", n, false
	}
	return v.text, n, sound
}

// word reads one of the words a field allows; absent where it is left out, which
// is "" for a required field. It returns "" for a fault.
func (o *object) word(name, label string, allowed []string, absent string) string {
	n, sound := o.find(name)
	if n == 0 {
		if absent == "" {
			o.missing(name, listed(allowed, "or"), "Choose "+label)
		}
		return absent
	}
	word := o.r.word(n, label, allowed)
	if !sound {
		return ""
	}
	return word
}

// word reads one of the allowed words at n, "" for a fault.
func (r *reader) word(n int32, label string, allowed []string) string {
	v := &r.nodes[n]
	if v.kind == isText && slices.Contains(allowed, v.text) {
		return v.text
	}
	expected := listed(allowed, "or")
	r.faultAt(n, r.describe(n), expected, fmt.Sprintf("%s must be %s.", sentence(label), expected))
	return ""
}

// bound is the range that a number must lie in by the meaning of its field.
type bound uint8

const (
	anyNumber bound = iota
	aboveZero
	zeroOrMore
)

func (b bound) expected(unit string) string {
	s := "a number"
	if unit != "" {
		s += " in " + unit
	}
	switch b {
	case aboveZero:
		return s + " above 0"
	case zeroOrMore:
		return s + ", 0 or more"
	}
	return s
}

// number reads a number; nil where it is left out or has a fault.
func (o *object) number(name, label string, p presence, b bound) *quantity.Exact {
	n, sound := o.find(name)
	if n == 0 {
		if p == must {
			o.missing(name, b.expected(unitOf(name)), "Enter "+label)
		}
		return nil
	}
	x := o.r.number(n, name, label, b)
	if !sound {
		return nil
	}
	return x
}

// number reads the number at n, nil for a fault.
func (r *reader) number(n int32, name, label string, b bound) *quantity.Exact {
	v := &r.nodes[n]
	if v.kind != isNumber {
		r.wrongKind(n, label, b.expected(unitOf(name)))
		return nil
	}
	x, err := quantity.Parse(v.text)
	if err != nil {
		r.tooLong(n, label)
		return nil
	}
	unit := unitOf(name)
	switch {
	case b == aboveZero && x.Sign() <= 0:
		r.faultAt(n, amount(v.text, unit), b.expected(unit), fmt.Sprintf("%s must be above 0: %s is not.", sentence(label), amount(v.text, unit)))
		return nil
	case b == zeroOrMore && x.Sign() < 0:
		r.faultAt(n, amount(v.text, unit), b.expected(unit), fmt.Sprintf("%s must be 0 or more: %s is below.", sentence(label), amount(v.text, unit)))
		return nil
	}
	return r.keep(x)
}

// tooLong records a number beyond what is read, the only kind that the scanner
// lets through and [quantity.Parse] does not.
func (r *reader) tooLong(n int32, label string) {
	limits := fmt.Sprintf("at most %d digits and an exponent from −%d to %d", quantity.MaxDigits, quantity.MaxExponent, quantity.MaxExponent)
	r.faultAt(n, r.describe(n), limits, fmt.Sprintf("%s is too long: a number has %s.", sentence(label), limits))
}

// keep returns a pointer to x that costs no allocation of its own.
func (r *reader) keep(x quantity.Exact) *quantity.Exact {
	r.numbers = append(r.numbers, x)
	return &r.numbers[len(r.numbers)-1]
}

// whole reads a whole number of at least least; nil where it is left out or has a fault.
func (o *object) whole(name, label string, p presence, least int64) *int64 {
	n, sound := o.find(name)
	if n == 0 {
		if p == must {
			o.missing(name, wholeFrom(least), "Enter "+label)
		}
		return nil
	}
	r, v := o.r, &o.r.nodes[n]
	if v.kind != isNumber {
		r.wrongKind(n, label, wholeFrom(least))
		return nil
	}
	x, err := quantity.Parse(v.text)
	if err != nil {
		r.tooLong(n, label)
		return nil
	}
	i, fits := x.Int64()
	switch found := typeset(v.text); {
	case !x.IsWhole():
		r.faultAt(n, found, wholeFrom(least), fmt.Sprintf("%s must be a whole number: %s is not.", sentence(label), found))
		return nil
	case x.Less(quantity.Int(least)):
		r.faultAt(n, found, wholeFrom(least), fmt.Sprintf("%s must be %d or more: %s is not.", sentence(label), least, found))
		return nil
	case !fits || i > maxWhole:
		r.faultAt(n, found, fmt.Sprintf("a whole number up to %d", maxWhole), fmt.Sprintf("%s can be at most %d.", sentence(label), maxWhole))
		return nil
	case !sound:
		return nil
	}
	r.wholes = append(r.wholes, i)
	return &r.wholes[len(r.wholes)-1]
}

func wholeFrom(least int64) string { return fmt.Sprintf("a whole number, %d or more", least) }

// or returns *p, or absent where p is nil.
func or[T any](p *T, absent T) T {
	if p == nil {
		return absent
	}
	return *p
}

var temperatureUnits = []string{"°C", "°F"}

// temperature reads a temperature or a difference of temperatures; nil where it is left out or has a fault.
func (o *object) temperature(name, label string, p presence, b bound) *Temperature {
	n, sound := o.find(name)
	if n == 0 {
		if p == must {
			o.missing(name, b.expected("°C"), "Enter "+label)
		}
		return nil
	}
	r := o.r
	var t Temperature
	switch r.nodes[n].kind {
	case isNumber:
		x := r.number(n, name, label, b)
		if x == nil {
			return nil
		}
		t.Value = *x
	case isObject:
		var inner object
		inner.open(r, n, label)
		x := inner.number("value", label, must, anyNumber)
		unit := inner.word("unit", "the unit of the temperature", temperatureUnits, "")
		inner.close()
		if x == nil || unit == "" {
			return nil
		}
		t = Temperature{Value: *x, Fahrenheit: unit == "°F", Object: true}
		if b == zeroOrMore && x.Sign() < 0 {
			found := amount(x.String(), unit)
			r.faultAt(n, found, "0 or more", fmt.Sprintf("%s must be 0 or more: %s is below.", sentence(label), found))
			return nil
		}
	default:
		r.wrongKind(n, label, b.expected("°C")+", or a value with the unit °C or °F")
		return nil
	}
	if !sound {
		return nil
	}
	return &t
}

// list returns the first element of a list and whether the list can be relied on.
// what names one element; "" allows an empty list.
func (o *object) list(name, label string, p presence, what string) (first int32, sound bool) {
	n, sound := o.find(name)
	if n == 0 {
		if p == must {
			o.missing(name, "a list with at least one "+what, "Enter at least one "+what)
		}
		return 0, p == may
	}
	v := &o.r.nodes[n]
	switch {
	case v.kind != isList:
		o.r.wrongKind(n, label, "a list")
		return 0, false
	case v.first == 0 && what != "":
		o.r.faultAt(n, "an empty list", "at least one "+what, fmt.Sprintf("Enter at least one %s.", what))
		return 0, false
	}
	return v.first, sound
}

// inner finds an object among the fields of o and opens it.
func (o *object) inner(name, label string, p presence) (inner object, ok bool) {
	n, _ := o.find(name)
	if n == 0 {
		if p == must {
			o.missing(name, "an object", "Enter "+label)
		}
		return inner, false
	}
	return inner, inner.open(o.r, n, label)
}

// has reports whether the field is there, whatever it holds.
func (o *object) has(name string) bool {
	for i := o.r.nodes[o.n].first; i != 0; i = o.r.nodes[i].next {
		if o.r.nodes[i].name == name {
			return true
		}
	}
	return false
}

// elements returns the list that the elements from first on make, one by one. It
// does not allocate for elements that are too faulty to be read.
func elements[T any](r *reader, first int32, read func(*T, int32)) []T {
	if first == 0 {
		return nil
	}
	list := make([]T, 0, min(r.count(first), 64))
	for n := first; n != 0 && !r.more; n = r.nodes[n].next {
		var empty T
		list = append(list, empty)
		read(&list[len(list)-1], n)
	}
	return list
}

// count returns how many siblings start at first.
func (r *reader) count(first int32) int {
	count := 0
	for n := first; n != 0; n = r.nodes[n].next {
		count++
	}
	return count
}
