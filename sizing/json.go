package sizing

import (
	"strconv"

	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// AppendJSON appends the result as one line of JSON without a line end, in the form
// of the format page. A finite decimal stands in full, any other number with 12
// significant digits. Identical results give identical bytes.
func (r *Result) AppendJSON(dst []byte) []byte {
	w := writer{append(dst, '{')} // whatever stands before, the result begins without a comma
	w.plain("format", ResultFormat)
	w.plain("verdict", r.Verdict.String())
	w.list("limits", len(r.Limits), func(i int) { w.limit(&r.Limits[i]) })
	w.list("strings", len(r.Strings), func(i int) { w.strung(&r.Strings[i]) })
	w.list("checks", len(r.Checks), func(i int) { w.check(&r.Checks[i]) })
	w.list("questions", len(r.Questions), func(i int) { w.question(&r.Questions[i]) })
	w.shut('}')
	return w.dst
}

// writer appends JSON; a comma is due wherever something stands before.
type writer struct{ dst []byte }

func (w *writer) comma() {
	if n := len(w.dst); n > 0 && w.dst[n-1] != '{' && w.dst[n-1] != '[' && w.dst[n-1] != ':' {
		w.dst = append(w.dst, ',')
	}
}

func (w *writer) open(bracket byte) {
	w.comma()
	w.dst = append(w.dst, bracket)
}

func (w *writer) shut(bracket byte) { w.dst = append(w.dst, bracket) }

// name appends a field's name, which needs no escaping.
func (w *writer) name(name string) {
	w.comma()
	w.dst = append(w.dst, '"')
	w.dst = append(w.dst, name...)
	w.dst = append(w.dst, '"', ':')
}

func (w *writer) text(name, value string) {
	w.name(name)
	w.dst = working.AppendJSONString(w.dst, value)
}

// plain appends a text of the engine's own making, which has nothing to escape.
func (w *writer) plain(name, value string) {
	w.name(name)
	w.dst = append(w.dst, '"')
	w.dst = append(w.dst, value...)
	w.dst = append(w.dst, '"')
}

// textIf appends a text unless it is empty.
func (w *writer) textIf(name, value string) {
	if value != "" {
		w.text(name, value)
	}
}

func (w *writer) number(name string, x quantity.Exact) {
	w.name(name)
	w.dst = x.AppendJSON(w.dst)
}

// numberOrNull appends a number, null where there is none.
func (w *writer) numberOrNull(name string, x *quantity.Exact) {
	if x == nil {
		w.null(name)
		return
	}
	w.number(name, *x)
}

func (w *writer) null(name string) {
	w.name(name)
	w.dst = append(w.dst, "null"...)
}

func (w *writer) count(name string, n int64) {
	w.name(name)
	w.dst = strconv.AppendInt(w.dst, n, 10)
}

func (w *writer) truth(name string, is bool) {
	w.name(name)
	w.dst = strconv.AppendBool(w.dst, is)
}

func (w *writer) list(name string, n int, item func(i int)) {
	w.name(name)
	w.open('[')
	for i := range n {
		item(i)
	}
	w.shut(']')
}

func (w *writer) texts(name string, values []string) {
	w.list(name, len(values), func(i int) {
		w.comma()
		w.dst = working.AppendJSONString(w.dst, values[i])
	})
}

func (w *writer) limit(l *Limit) {
	w.open('{')
	w.text("plane", l.Plane)
	w.text("inverter", l.Inverter)
	w.text("tracker", l.Tracker)
	w.number("voltage_ceiling_v", l.VoltageCeilingV)
	w.text("voltage_ceiling_from", l.VoltageCeilingFrom)
	w.number("module_voc_cold_v", l.ModuleVocColdV)
	w.number("module_vmp_hot_v", l.ModuleVmpHotV)
	w.number("max_modules", l.Counted.MaxModules)
	w.numberOrNull("min_modules", l.Counted.MinModules)
	w.numberOrNull("min_modules_start", l.Counted.MinModulesStart)
	w.count("max_strings", l.MaxStrings)
	w.plain("max_strings_from", l.MaxStringsFrom)
	w.numberOrNull("reached_at_c", l.ReachedAtC)
	w.list("ceiling", len(l.Ceiling), func(i int) {
		e := &l.Ceiling[i]
		w.open('{')
		w.text("from", e.From)
		w.number("max_v", e.MaxV)
		w.text("source", e.Source)
		w.textIf("pointer", e.Pointer)
		w.truth("governs", e.Governs)
		w.shut('}')
	})
	w.texts("cites", l.Cites)
	w.steps(l.Steps)
	w.shut('}')
}

func (w *writer) strung(s *StringResult) {
	w.open('{')
	w.text("inverter", s.Inverter)
	w.count("unit", s.Unit)
	w.text("tracker", s.Tracker)
	w.text("plane", s.Plane)
	w.count("modules_in_series", s.ModulesInSeries)
	w.count("strings_in_parallel", s.StringsInParallel)
	w.number("voc_cold_v", s.VocColdV)
	w.number("voc_stc_v", s.VocSTCV)
	w.number("voc_hot_v", s.VocHotV)
	w.number("vmp_stc_v", s.VmpSTCV)
	w.number("vmp_hot_v", s.VmpHotV)
	w.number("max_current_a", s.MaxCurrentA)
	w.plain("verdict", s.Verdict.String())
	w.shut('}')
}

func (w *writer) check(c *working.Check) {
	w.open('{')
	w.plain("id", c.ID)
	w.about(&c.About)
	w.plain("verdict", c.Verdict.String())
	w.numberOrNull("value", c.Value)
	w.numberOrNull("limit", c.Limit)
	w.plain("unit", c.Unit)
	w.numberOrNull("reached_at_c", c.ReachedAtC)
	w.texts("cites", c.Cites)
	w.steps(c.Steps)
	w.list("turns", len(c.Turns), func(i int) {
		t := &c.Turns[i]
		w.open('{')
		w.plain("pointer", t.Pointer)
		w.number("at", t.At)
		w.numberOrNull("change_pct", t.ChangePct)
		w.plain("to", t.To.String())
		w.shut('}')
	})
	w.list("reasons", len(c.Reasons), func(i int) {
		w.open('{')
		w.plain("code", c.Reasons[i].Code)
		w.textIf("pointer", c.Reasons[i].Pointer)
		w.shut('}')
	})
	w.shut('}')
}

func (w *writer) about(a *working.About) {
	w.name("about")
	w.open('{')
	if a.String >= 0 {
		w.count("string", int64(a.String))
	}
	w.textIf("plane", a.Plane)
	if a.Inverter != "" {
		w.text("inverter", a.Inverter)
		w.count("unit", a.Unit)
	}
	w.textIf("tracker", a.Tracker)
	w.shut('}')
}

func (w *writer) steps(steps []working.Step) {
	w.list("steps", len(steps), func(i int) {
		s := &steps[i]
		w.open('{')
		w.plain("symbol", s.Symbol)
		w.plain("expression", s.Expression)
		w.plain("with_numbers", s.WithNumbers)
		w.number("value", s.Value)
		w.plain("unit", s.Unit)
		w.shut('}')
	})
}

func (w *writer) question(q *working.Question) {
	w.open('{')
	w.text("pointer", q.Pointer)
	w.text("asked", q.Asked)
	w.text("why", q.Why)
	w.truth("unsafe", q.Unsafe)
	w.texts("unsafe_for", q.UnsafeFor)
	w.name("value_asked")
	w.dst = append(w.dst, q.ValueAsked...)
	w.shut('}')
}
