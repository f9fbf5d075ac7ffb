package tests

import (
	"fmt"
	"math/big"
	"strings"
	"testing"
)

// A printed line, parsed. The parser knows the signs that the format page lists
// under steps[] and nothing else: a word, a percent sign, an ASCII hyphen or a
// comparison among the numbers is an error, and a minus may only stand first, on
// the line or inside brackets.
//
// Sums and products are flat lists, because brackets that change nothing are left
// out when a term is put in for a symbol: n × Voc, with Voc = 30 × 1.1, is printed
// as 25 × 30 × 1.1.
type term struct {
	kind   kind
	value  *big.Rat // of a number
	symbol string
	parts  []part // of a sum or product
	args   []*term
}

// part is a term of a sum or a factor of a product; inverse is "minus" or "divided by".
type part struct {
	inverse bool
	*term
}

type kind string

const (
	aNumber  kind = "number"
	aSymbol  kind = "symbol"
	aSum     kind = "sum"
	aProduct kind = "product"
	aFloor   kind = "⌊⌋"
	aCeiling kind = "⌈⌉"
	aRoot    kind = "√"
	aMinimum kind = "min"
	aMaximum kind = "max"
)

// parseNumbers reads a line in which all symbols are put in.
func parseNumbers(line string) (*term, error) { return parseLine(line, false) }

// parseExpression reads a line of symbols.
func parseExpression(line string) (*term, error) { return parseLine(line, true) }

func parseLine(line string, symbols bool) (t *term, err error) {
	p := lineReader{rest: line, symbols: symbols}
	defer func() {
		if fault := recover(); fault != nil {
			misread, ok := fault.(misprint)
			if !ok {
				panic(fault)
			}
			t, err = nil, fmt.Errorf("%q: %s before %q", line, string(misread), p.rest)
		}
	}()
	t = p.sum()
	if p.rest != "" {
		p.fail("not a sign of a sum")
	}
	return t, nil
}

// lineReader holds what is left of a line.
type lineReader struct {
	rest    string
	symbols bool
}

// misprint is what stops the reading of a line.
type misprint string

func (p *lineReader) fail(why string) { panic(misprint(why)) }

// accept takes a sign if it stands next.
func (p *lineReader) accept(sign string) bool {
	p.rest = strings.TrimLeft(p.rest, " ")
	rest, ok := strings.CutPrefix(p.rest, sign)
	if ok {
		p.rest = rest
	}
	return ok
}

func (p *lineReader) expect(sign string) {
	if !p.accept(sign) {
		p.fail("missing " + sign)
	}
}

func (p *lineReader) sum() *term {
	negative := p.accept("−")
	first := p.product()
	if negative {
		first = negated(first)
	}
	parts := []part{{false, first}}
	for {
		switch {
		case p.accept("+"):
			parts = append(parts, part{false, p.product()})
		case p.accept("−"):
			parts = append(parts, part{true, p.product()})
		case len(parts) == 1:
			return first
		default:
			return &term{kind: aSum, parts: parts}
		}
	}
}

// negated gives the minus before a product to its first number: −21 × 3 is (−21) × 3.
func negated(t *term) *term {
	switch {
	case t.kind == aNumber:
		return &term{kind: aNumber, value: new(big.Rat).Neg(t.value)}
	case t.kind == aProduct && t.parts[0].kind == aNumber:
		t.parts[0].term = negated(t.parts[0].term)
		return t
	}
	return &term{kind: aProduct, parts: []part{{false, &term{kind: aNumber, value: rat("-1")}}, {false, t}}}
}

func (p *lineReader) product() *term {
	first := p.factor()
	parts := []part{{false, first}}
	for {
		switch {
		case p.accept("×"):
			parts = append(parts, part{false, p.factor()})
		case p.accept("÷"):
			parts = append(parts, part{true, p.factor()})
		case len(parts) == 1:
			return first
		default:
			return &term{kind: aProduct, parts: parts}
		}
	}
}

func (p *lineReader) factor() *term {
	bracketed := func(kind kind, end string) *term {
		args := []*term{p.sum()}
		for len(args) < 2 && (kind == aMinimum || kind == aMaximum) {
			p.expect(",")
			args = append(args, p.sum())
		}
		p.expect(end)
		return &term{kind: kind, args: args}
	}
	switch {
	case p.accept("("):
		inside := p.sum()
		p.expect(")")
		return inside
	case p.accept("⌊"):
		return bracketed(aFloor, "⌋")
	case p.accept("⌈"):
		return bracketed(aCeiling, "⌉")
	case p.accept("√"):
		return &term{kind: aRoot, args: []*term{p.factor()}}
	case p.accept("min("):
		return bracketed(aMinimum, ")")
	case p.accept("max("):
		return bracketed(aMaximum, ")")
	}
	return p.operand()
}

func (p *lineReader) operand() *term {
	p.rest = strings.TrimLeft(p.rest, " ")
	text := p.rest[:len(p.rest)-len(strings.TrimLeft(p.rest, "0123456789."))]
	if text == "" && p.symbols {
		end := len(p.rest)
		for i, r := range p.rest {
			if strings.ContainsRune(" +−×÷()√⌊⌋⌈⌉", r) || strings.HasPrefix(p.rest[i:], ", ") {
				end = i
				break
			}
		}
		if end > 0 {
			symbol := p.rest[:end]
			p.rest = p.rest[end:]
			return &term{kind: aSymbol, symbol: symbol}
		}
	}
	value, ok := new(big.Rat).SetString(text)
	if !ok || text[0] == '.' || text[len(text)-1] == '.' {
		p.fail("no number")
	}
	p.rest = p.rest[len(text):]
	return &term{kind: aNumber, value: value}
}

// worth works a line of numbers out.
func (t *term) worth() (*big.Rat, error) {
	parts := t.parts
	for _, arg := range t.args {
		parts = append(parts, part{false, arg})
	}
	var values []*big.Rat
	for _, p := range parts {
		v, err := p.worth()
		if err != nil {
			return nil, err
		}
		values = append(values, v)
	}
	switch t.kind {
	case aNumber:
		return t.value, nil
	case aSum:
		total := values[0]
		for i, v := range values[1:] {
			if t.parts[i+1].inverse {
				total = minus(total, v)
			} else {
				total = plus(total, v)
			}
		}
		return total, nil
	case aProduct:
		total := values[0]
		for i, v := range values[1:] {
			switch {
			case !t.parts[i+1].inverse:
				total = times(total, v)
			case v.Sign() == 0:
				return nil, fmt.Errorf("division by zero")
			default:
				total = over(total, v)
			}
		}
		return total, nil
	case aFloor:
		return roundDown(values[0]), nil
	case aCeiling:
		return roundUp(values[0]), nil
	case aRoot:
		return squareRoot(values[0])
	case aMinimum:
		return minus(plus(values[0], values[1]), larger(values[0], values[1])), nil
	case aMaximum:
		return larger(values[0], values[1]), nil
	}
	return nil, fmt.Errorf("%s is no number", t.symbol)
}

// squareRoot is exact for squares, else good to 200 bits.
func squareRoot(x *big.Rat) (*big.Rat, error) {
	if x.Sign() < 0 {
		return nil, fmt.Errorf("root of a negative number")
	}
	exact := new(big.Rat).SetFrac(new(big.Int).Sqrt(x.Num()), new(big.Int).Sqrt(x.Denom()))
	if times(exact, exact).Cmp(x) == 0 {
		return exact, nil
	}
	r, _ := new(big.Float).Sqrt(new(big.Float).SetPrec(200).SetRat(x)).Rat(nil)
	return r, nil
}

// evaluate works out what with_numbers says.
func evaluate(line string) (*big.Rat, error) {
	t, err := parseNumbers(line)
	if err != nil {
		return nil, err
	}
	v, err := t.worth()
	if err != nil {
		return nil, fmt.Errorf("%q: %w", line, err)
	}
	return v, nil
}

func TestEvaluate(t *testing.T) {
	good := []struct{ line, want string }{
		{"37.32", "37.32"},
		{"2 + 3 × 4", "14"},
		{"(2 + 3) × 4", "20"},
		{"7 − 2 − 1", "4"},
		{"8 ÷ 4 ÷ 2", "1"},
		{"−21 − 25", "-46"},
		{"−21 × 3 + 1", "-62"},
		{"−(2 + 3) × 4", "-20"},
		{"37.32 × (1 + (−0.27) ÷ 100 × (−21 − 25))", "41.955144"},
		{"⌊1000 ÷ 41.955144⌋", "23"},
		{"⌈160 ÷ 25.6⌉", "7"},
		{"⌈(−7) ÷ 2⌉ + ⌊(−7) ÷ 2⌋", "-7"},
		{"min(2, 3) + max(2, 3 × 4)", "14"},
		{"min(600, min(1000, 850))", "600"},
		{"√(9 ÷ 16)", "0.75"},
		{"1 ÷ 3 × 3", "1"},
	}
	for _, c := range good {
		got, err := evaluate(c.line)
		if err != nil || got.Cmp(rat(c.want)) != 0 {
			t.Errorf("evaluate(%q) = %v, %v; want %s", c.line, got, err, c.want)
		}
	}
	if got, err := evaluate("√2"); err != nil || got.FloatString(12) != "1.414213562373" {
		t.Errorf("evaluate(√2) = %v, %v", got, err)
	}

	bad := []struct{ why, line string }{
		{"a word", "n × 41.96"},
		{"a percent sign", "37.32 × 3 %"},
		{"a comparison", "3 ≤ 4"},
		{"an equals sign", "3 + 1 = 4"},
		{"an ASCII hyphen", "3 - 1"},
		{"an ASCII star", "3 * 1"},
		{"a slash", "3 / 1"},
		{"digit grouping", "1 000 + 1"},
		{"grouping by comma", "1,000 + 1"},
		{"a bare negative number inside", "3 × −1"},
		{"two numbers", "3 4"},
		{"an open bracket", "(3 + 4"},
		{"a bracket too many", "3 + 4)"},
		{"nothing", ""},
		{"a point without digits", "3. + 1"},
		{"a division by zero", "3 ÷ (1 − 1)"},
		{"a root of a negative number", "√(−4)"},
		{"one argument", "min(3)"},
		{"three arguments", "min(3, 4, 5)"},
		{"an exponent", "1e3"},
	}
	for _, c := range bad {
		if got, err := evaluate(c.line); err == nil {
			t.Errorf("evaluate(%q) = %s; want an error for %s", c.line, got.RatString(), c.why)
		}
	}
}

// substitution finds out what was put in for each symbol of an expression.
type substitution map[string]number

// fits reports whether the line of numbers is the expression with its symbols put
// in: the same signs, the same constants, and for each symbol one value throughout
// (a number, or an expression worth it) that agrees with what is known of it.
func (known substitution) fits(expression, numbers *term) bool {
	return known.match(expression, numbers, func() bool { return true })
}

// match tries every way to read the numbers as the expression; then judges the rest.
func (known substitution) match(e, n *term, then func() bool) bool {
	switch e.kind {
	case aSymbol:
		value, err := n.worth()
		if err != nil {
			return false
		}
		if before, ok := known[e.symbol]; ok {
			return printsAs(value, before) && then()
		}
		known[e.symbol] = number{value, twelveDigits(value)}
		if then() {
			return true
		}
		delete(known, e.symbol)
		return false
	case aNumber:
		return n.kind == aNumber && n.value.Cmp(e.value) == 0 && then()
	case aSum, aProduct:
		return n.kind == e.kind && known.matchParts(e.kind, e.parts, n.parts, then)
	}
	if n.kind != e.kind || len(e.args) != len(n.args) {
		return false
	}
	return known.matchArgs(e.args, n.args, then)
}

func (known substitution) matchArgs(e, n []*term, then func() bool) bool {
	if len(e) == 0 {
		return then()
	}
	return known.match(e[0], n[0], func() bool { return known.matchArgs(e[1:], n[1:], then) })
}

// matchParts gives each part of the expression one part of the numbers, or several
// where brackets were left out.
func (known substitution) matchParts(kind kind, e, n []part, then func() bool) bool {
	if len(e) == 0 {
		return len(n) == 0 && then()
	}
	for taken := 1; taken <= len(n)-len(e)+1; taken++ {
		if n[0].inverse != e[0].inverse || taken > 1 && (e[0].inverse || e[0].kind != aSymbol && e[0].kind != kind) {
			break
		}
		run := n[0].term
		if taken > 1 {
			run = &term{kind: kind, parts: n[:taken]}
		}
		if known.match(e[0].term, run, func() bool { return known.matchParts(kind, e[1:], n[taken:], then) }) {
			return true
		}
	}
	return false
}

// twelveDigits writes a value as the format page writes numbers of a result.
func twelveDigits(r *big.Rat) string {
	if places, finite := r.FloatPrec(); finite {
		return r.FloatString(places)
	}
	f, _ := new(big.Float).SetPrec(200).SetRat(r).MarshalText()
	exact, _, _ := big.ParseFloat(string(f), 10, 200, big.ToNearestEven)
	return exact.Text('f', max(0, 12-len(strings.TrimPrefix(exact.Text('f', 0), "-"))))
}

func TestFits(t *testing.T) {
	cases := []struct {
		expression, numbers string
		want                bool
	}{
		{"n × Voc,cold", "12 × 41.955144", true},
		{"Voc × (1 + β ÷ 100 × (Tcold − 25))", "37.32 × (1 + (−0.27) ÷ 100 × (−21 − 25))", true},
		{"max(Voc, Voc + β × (Tcold − 25))", "max(37.32, 37.32 + (−0.1) × (−21 − 25))", true},
		{"Tcold − Treached", "−21 − (−36.1)", true},
		{"⌊Vmax ÷ Voc,cold⌋", "⌊1000 ÷ 41.95⌋", true},
		{"Thot + rise", "(101 − 32) × 5 ÷ 9 + 35", true},
		{"Tcell − 25", "(101 − 32) × 5 ÷ 9 + 35 − 25", true},
		{"n × Voc,cold", "25 × 30 × (1 + 2 ÷ 100)", true},
		{"Tcold × Isc", "−21 × 3", true},

		{"n × Voc,cold", "12 + 41.955144", false},
		{"n × (a + b)", "12 × 3 + 4", false},
		{"n × a × 1.25", "12 × 37.32 × 1.12", false},
		{"min(a, b)", "max(1, 2)", false},
		{"a − b", "−3", false},
		{"a + b", "3 + 4 − 5 + 6 − 7", true}, // b = 4 − 5 + 6 − 7
		{"a − b", "3 − 4 + 5", false},        // b would need brackets
		{"Voc + β × Voc", "37 + (−0.1) × 38", false},
		{"Isc × s + Isc × s", "9 × 1 + 9 × 2", false},
		{"known × 2", "41 × 2", false},
		{"known × 2", "42 × 2", true},
		{"third × 2", "1 ÷ 3 × 2", true},
	}
	for _, c := range cases {
		e, err := parseExpression(c.expression)
		if err != nil {
			t.Error(err)
			continue
		}
		n, err := parseNumbers(c.numbers)
		if err != nil {
			t.Error(err)
			continue
		}
		known := substitution{"known": {rat("42"), "42"}, "third": {rat("0.333333333333"), "0.333333333333"}}
		if got := known.fits(e, n); got != c.want {
			t.Errorf("%q put in as %q: fits is %t, want %t", c.expression, c.numbers, got, c.want)
		}
	}
}
