package design

import (
	"strings"

	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// A fragment is a part of a design alone: a module or an inverter without its id,
// which each design that it is copied into gives it, or answers about one. It is read
// by the one strict reader; pointers are those inside it, such as /voc_v.

// ReadModule reads a module alone. The module is nil where there are faults.
func ReadModule(text []byte) (*Module, Faults) {
	var m Module
	if faults := readAlone(text, "a module", func(w *walk) { w.module(&m, 0) }); faults != nil {
		return nil, faults
	}
	return &m, nil
}

// ReadInverter reads an inverter alone. The inverter is nil where there are faults.
func ReadInverter(text []byte) (*Inverter, Faults) {
	var v Inverter
	if faults := readAlone(text, "an inverter", func(w *walk) { w.inverter(&v, 0) }); faults != nil {
		return nil, faults
	}
	return &v, nil
}

// ReadAnswers reads a list of answers alone, as answers stand in a design. There are
// none where there are faults.
func ReadAnswers(text []byte) ([]Answer, Faults) {
	var answers []Answer
	faults := readAlone(text, "a list of answers", func(w *walk) {
		if w.nodes[0].kind != isList {
			w.wrongKind(0, "the answers", "a list")
			return
		}
		answers = elements(w.reader, w.nodes[0].first, w.answer)
	})
	if faults != nil {
		return nil, faults
	}
	return answers, nil
}

func readAlone(text []byte, what string, read func(*walk)) Faults {
	if strings.TrimSpace(strings.TrimPrefix(string(text), byteOrderMark)) == "" {
		return Faults{{Found: "nothing", Expected: what, Detail: "The text is empty: " + what + " is expected."}}
	}
	s, fault := begin(text)
	if fault != nil {
		return Faults{*fault}
	}
	if !s.document() {
		return Faults{*s.broken}
	}
	if s.skipBetween(); s.pos < len(s.src) {
		s.fail("the end of the text", "Nothing more is read here.")
		return Faults{*s.broken}
	}
	w := walk{reader: &reader{nodes: s.nodes, numbers: make([]quantity.Exact, 0, s.numbers)}, d: new(Design), alone: true}
	read(&w)
	return w.collected()
}

// AppendModule appends the canonical JSON of a module alone.
func AppendModule(dst []byte, m *Module) []byte {
	w := writer{dst: append(dst, '{')}
	w.moduleData(m)
	w.close('}')
	return w.dst
}

// AppendInverter appends the canonical JSON of an inverter alone.
func AppendInverter(dst []byte, v *Inverter) []byte {
	w := writer{dst: append(dst, '{')}
	w.inverterData(v)
	w.close('}')
	return w.dst
}

// AppendAnswers appends the canonical JSON of answers alone.
func AppendAnswers(dst []byte, answers []Answer) []byte {
	w := writer{dst: append(dst, '[')}
	for i := range answers {
		w.comma()
		w.open('{')
		w.answer(&answers[i])
		w.close('}')
	}
	w.close(']')
	return w.dst
}

// Questions returns the plausibility questions of a module alone that are open:
// those that none of the answers, whose pointers are inside the module, closes.
func (m *Module) Questions(answers []Answer) []working.Question {
	const at = "/modules/0"
	d := &Design{Modules: []Module{*m}}
	for _, a := range answers {
		a.Pointer = at + a.Pointer
		d.Answers = append(d.Answers, a)
	}
	var open []working.Question
	doubts := Doubts(d, NewTerms(d), 0)
	for i := range doubts {
		if doubts[i].Open() {
			q := doubts[i].Question()
			q.Pointer = strings.TrimPrefix(q.Pointer, at)
			open = append(open, q)
		}
	}
	return open
}
