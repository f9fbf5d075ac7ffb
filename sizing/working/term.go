package working

import (
	"cmp"

	"rimeline/sizing/quantity"
)

type op uint8

const (
	opNumber op = iota // a number of a code or a conversion
	opInput            // a number of the document
	opNamed            // a result with a name of its own
	opAdd
	opSub
	opMul
	opDiv
	opMax
	opMin
	opFloor // these two only print: a condition is put without them
	opCeil
)

// Input is one number of the document that a formula rests on. Two terms rest on
// the same input if they share the *Input.
type Input struct {
	Pointer string         // JSON Pointer of the number
	Now     quantity.Exact // as the document states it
	Whole   bool           // only whole numbers from 1 up are permitted

	// The values that the reader accepts lie strictly between Low and High; nil is no
	// bound. A turning point outside them is none, since no design can reach it.
	Low, High *quantity.Exact

	bit uint64 // one of 64, by which conditions that do not rest on the input are passed over
}

// Term is a node of a formula. Terms are immutable, may be shared between
// formulas, and know their value.
type Term struct {
	op    op
	rests bool // an input is somewhere below
	forks bool // a max or min that rests on an input is somewhere below
	a, b  *Term
	value quantity.Exact
	label *label // of an input, a named result or a number with a symbol
	sheet *Sheet // what it is written on; nil for a constant
}

// label is what only some terms have.
type label struct {
	symbol, unit string
	input        *Input
	step         *Step  // memo of a named result's line
	number       string // memo of the value as a sum shows it, without its sign
}

// Value returns the term's value.
func (t *Term) Value() quantity.Exact { return t.value }

// Number returns a term for a number that belongs to the formula itself: a
// code's factor, 25 °C, the 100 of a percentage.
func Number(x quantity.Exact) *Term { return &Term{op: opNumber, value: x} }

// Whole returns a term for a whole number of the formula itself.
func Whole(n int64) *Term {
	if 0 <= n && n < int64(len(wholes)) {
		return wholes[n]
	}
	return Number(quantity.Int(n))
}

// wholes are the numbers that formulas are full of, made once.
var wholes = func() (w [101]*Term) {
	for n := range w {
		w[n] = Number(quantity.Int(int64(n)))
	}
	return w
}()

// Looked returns a term for a number read from a table: a bare factor in the sum,
// a symbol in the expression.
func Looked(symbol string, x quantity.Exact) *Term {
	return &Term{op: opNumber, value: x, label: &label{symbol: symbol}}
}

// Of returns a term for an input of the document, on this sheet; so are all
// formulas that it stands in.
func (s *Sheet) Of(symbol, unit string, in *Input) *Term {
	if in.bit == 0 {
		in.bit = 1 << (s.inputs % 64)
		s.inputs++
	}
	t := s.term()
	*t = Term{op: opInput, rests: true, value: in.Now, label: s.label(label{symbol: symbol, unit: unit, input: in}), sheet: s}
	return t
}

// Named gives a formula a name. Where the named result is used, its expression
// shows the name and its numbers show the value; a value without a finite decimal
// shows as the sum it comes from, so that no printed line is off by a rounding.
func Named(symbol, unit string, formula *Term) *Term {
	s := formula.sheet
	t := s.term()
	*t = Term{op: opNamed, rests: formula.rests, forks: formula.forks, a: formula, sheet: s,
		value: formula.value.Reduced(), // it is printed, and reckoned with, more than once
		label: s.label(label{symbol: symbol, unit: unit})}
	return t
}

func node(o op, a, b *Term, value quantity.Exact) *Term {
	sheet := cmp.Or(a.sheet, b.sheet)
	t := sheet.term()
	*t = Term{op: o, rests: a.rests || b.rests, forks: a.forks || b.forks, a: a, b: b, value: value, sheet: sheet}
	return t
}

// Plus returns t + u.
func (t *Term) Plus(u *Term) *Term { return node(opAdd, t, u, t.value.Add(u.value)) }

// Minus returns t − u.
func (t *Term) Minus(u *Term) *Term { return node(opSub, t, u, t.value.Sub(u.value)) }

// Times returns t × u.
func (t *Term) Times(u *Term) *Term { return node(opMul, t, u, t.value.Mul(u.value)) }

// Over returns t ÷ u. It panics if u is 0. Turning points are found only for
// formulas in which no input stands below the line.
func (t *Term) Over(u *Term) *Term { return node(opDiv, t, u, t.value.Quo(u.value)) }

// MaxOf returns the greater of t and u.
func MaxOf(t, u *Term) *Term {
	n := node(opMax, t, u, quantity.Max(t.value, u.value))
	n.forks = n.rests
	return n
}

// MinOf returns the lesser of t and u.
func MinOf(t, u *Term) *Term {
	n := node(opMin, t, u, quantity.Min(t.value, u.value))
	n.forks = n.rests
	return n
}

// FloorOf returns the greatest whole number that is not above t.
func FloorOf(t *Term) *Term { return &Term{op: opFloor, a: t, value: t.value.Floor(), sheet: t.sheet} }

// CeilOf returns the least whole number that is not below t.
func CeilOf(t *Term) *Term { return &Term{op: opCeil, a: t, value: t.value.Ceil(), sheet: t.sheet} }

// Step returns the line of work that shows a named term.
func (t *Term) Step() Step {
	if t.op != opNamed {
		panic("working: only a named term has a step")
	}
	l := t.label
	if l.step == nil {
		var buf [192]byte
		l.step = t.sheet.step()
		*l.step = Step{Symbol: l.symbol, Value: t.value, Unit: l.unit}
		l.step.Expression = t.sheet.keep(t.a.appendExpression(buf[:0]))
		l.step.WithNumbers = t.sheet.keep(t.a.appendNumbers(buf[:0]))
	}
	return *l.step
}

// Binding strength of what a term prints.
const (
	bindsAdd = iota + 1
	bindsMul
	bindsAtom
)

func (o op) binds() int {
	switch o {
	case opAdd, opSub:
		return bindsAdd
	case opMul, opDiv:
		return bindsMul
	}
	return bindsAtom
}

func (o op) sign() string {
	switch o {
	case opAdd:
		return " + "
	case opSub:
		return " − "
	case opMul:
		return " × "
	}
	return " ÷ "
}

// needs returns how strongly the operands of an operation must bind to stand
// without parentheses. a + (b − c) and a × (b ÷ c) need none on the right.
func (o op) needs() (left, right int) {
	switch o {
	case opAdd:
		return bindsAdd, bindsAdd
	case opSub:
		return bindsAdd, bindsMul
	case opMul:
		return bindsMul, bindsMul
	}
	return bindsMul, bindsAtom
}

func (t *Term) appendExpression(dst []byte) []byte {
	switch t.op {
	case opNumber:
		if t.label == nil {
			return appendValue(dst, t.value)
		}
		return append(dst, t.label.symbol...)
	case opInput, opNamed:
		return append(dst, t.label.symbol...)
	}
	return t.appendOperation(dst, (*Term).appendExpression, (*Term).bindsInExpression)
}

func (t *Term) bindsInExpression() int { return t.op.binds() }

func (t *Term) appendNumbers(dst []byte) []byte {
	switch t.op {
	case opNumber:
		return appendValue(dst, t.value)
	case opInput:
		return t.appendKept(dst)
	case opNamed:
		if t.printsAsValue() {
			return t.appendKept(dst)
		}
		return t.a.appendNumbers(dst)
	}
	return t.appendOperation(dst, (*Term).appendNumbers, (*Term).bindsInNumbers)
}

// longestPlaces is how many decimal places a named result may have to stand as a
// number in a later line; beyond it the sum is as short.
const longestPlaces = 24

func (t *Term) printsAsValue() bool {
	places, finite := t.value.Decimal()
	return finite && places <= longestPlaces
}

func (t *Term) bindsInNumbers() int {
	if t.op == opNamed && !t.printsAsValue() {
		return t.a.bindsInNumbers()
	}
	return t.op.binds()
}

func (t *Term) appendOperation(dst []byte, appendTerm func(*Term, []byte) []byte, binds func(*Term) int) []byte {
	switch t.op {
	case opFloor:
		return append(appendTerm(t.a, append(dst, "⌊"...)), "⌋"...)
	case opCeil:
		return append(appendTerm(t.a, append(dst, "⌈"...)), "⌉"...)
	case opMax, opMin:
		if t.op == opMax {
			dst = append(dst, "max("...)
		} else {
			dst = append(dst, "min("...)
		}
		dst = appendTerm(t.a, dst)
		dst = append(dst, ", "...)
		return append(appendTerm(t.b, dst), ')')
	}
	left, right := t.op.needs()
	dst = appendOperand(dst, t.a, appendTerm, binds(t.a) < left)
	dst = append(dst, t.op.sign()...)
	return appendOperand(dst, t.b, appendTerm, binds(t.b) < right)
}

func appendOperand(dst []byte, t *Term, appendTerm func(*Term, []byte) []byte, bracket bool) []byte {
	if !bracket {
		return appendTerm(t, dst)
	}
	dst = append(dst, '(')
	return append(appendTerm(t, dst), ')')
}

// appendKept appends the value of a term that many lines show.
func (t *Term) appendKept(dst []byte) []byte {
	if t.label.number == "" {
		var buf [48]byte
		t.label.number = t.sheet.keep(t.value.Abs().AppendJSON(buf[:0]))
	}
	return appendSigned(dst, t.value.Sign() < 0, t.label.number)
}

// appendValue appends a number for a sum.
func appendValue(dst []byte, x quantity.Exact) []byte {
	if x.Sign() >= 0 {
		return x.AppendJSON(dst)
	}
	return appendSigned(dst, true, x.Neg().String())
}

// appendSigned appends a number with a true minus, and parentheses around a negative
// one unless it stands first in the line.
func appendSigned(dst []byte, negative bool, number string) []byte {
	if !negative {
		return append(dst, number...)
	}
	if len(dst) == 0 {
		return append(append(dst, "−"...), number...)
	}
	return append(append(append(dst, "(−"...), number...), ')')
}

// IsNamed reports whether the term is a named result, which has a step.
func (t *Term) IsNamed() bool { return t.op == opNamed }

// Formula returns what a named term names.
func (t *Term) Formula() *Term { return t.a }
