package tests

import (
	"fmt"
	"math/big"
	"strings"
	"testing"
	"unicode"
)

// evaluate works out a printed line by the signs that the format page lists under
// steps[], and by nothing else: a word, a percent sign, an ASCII hyphen or a
// comparison is an error. A minus may only stand first, on the line or inside
// brackets.
func evaluate(line string) (r *big.Rat, err error) {
	e := evaluator{rest: []rune(line)}
	defer func() {
		if fault := recover(); fault != nil {
			misread, ok := fault.(misprint)
			if !ok {
				panic(fault)
			}
			r, err = nil, fmt.Errorf("%q: %s before %q", line, string(misread), string(e.rest))
		}
	}()
	r = e.sum()
	if len(e.rest) > 0 {
		e.fail("not a sign of a sum")
	}
	return r, nil
}

// evaluator holds what is left of a line.
type evaluator struct{ rest []rune }

// misprint is what stops an evaluation.
type misprint string

func (e *evaluator) fail(why string) { panic(misprint(why)) }

func (e *evaluator) skipSpace() {
	for len(e.rest) > 0 && e.rest[0] == ' ' {
		e.rest = e.rest[1:]
	}
}

// accept takes a sign if it stands next.
func (e *evaluator) accept(sign string) bool {
	e.skipSpace()
	if !strings.HasPrefix(string(e.rest), sign) {
		return false
	}
	e.rest = e.rest[len([]rune(sign)):]
	return true
}

func (e *evaluator) expect(sign string) {
	if !e.accept(sign) {
		e.fail("missing " + sign)
	}
}

func (e *evaluator) sum() *big.Rat {
	total := zero
	if e.accept("−") {
		total = new(big.Rat).Neg(e.product())
	} else {
		total = e.product()
	}
	for {
		switch {
		case e.accept("+"):
			total = plus(total, e.product())
		case e.accept("−"):
			total = minus(total, e.product())
		default:
			return total
		}
	}
}

func (e *evaluator) product() *big.Rat {
	total := e.factor()
	for {
		switch {
		case e.accept("×"):
			total = times(total, e.factor())
		case e.accept("÷"):
			divisor := e.factor()
			if divisor.Sign() == 0 {
				e.fail("division by zero")
			}
			total = over(total, divisor)
		default:
			return total
		}
	}
}

func (e *evaluator) factor() *big.Rat {
	switch {
	case e.accept("("):
		inside := e.sum()
		e.expect(")")
		return inside
	case e.accept("⌊"):
		inside := e.sum()
		e.expect("⌋")
		return roundDown(inside)
	case e.accept("⌈"):
		inside := e.sum()
		e.expect("⌉")
		return roundUp(inside)
	case e.accept("√"):
		return e.root(e.factor())
	case e.accept("min("):
		a, b := e.pair()
		return minus(plus(a, b), larger(a, b))
	case e.accept("max("):
		a, b := e.pair()
		return larger(a, b)
	}
	return e.decimal()
}

func (e *evaluator) pair() (a, b *big.Rat) {
	a = e.sum()
	e.expect(",")
	b = e.sum()
	e.expect(")")
	return a, b
}

// root is exact for squares, else to 200 bits.
func (e *evaluator) root(x *big.Rat) *big.Rat {
	if x.Sign() < 0 {
		e.fail("root of a negative number")
	}
	exact := new(big.Rat).SetFrac(new(big.Int).Sqrt(x.Num()), new(big.Int).Sqrt(x.Denom()))
	if times(exact, exact).Cmp(x) == 0 {
		return exact
	}
	r, _ := new(big.Float).Sqrt(new(big.Float).SetPrec(200).SetRat(x)).Rat(nil)
	return r
}

func (e *evaluator) decimal() *big.Rat {
	e.skipSpace()
	n := 0
	for n < len(e.rest) && (e.rest[n] == '.' || '0' <= e.rest[n] && e.rest[n] <= '9') {
		n++
	}
	text := string(e.rest[:n])
	r, ok := new(big.Rat).SetString(text)
	if !ok || text[0] == '.' || text[n-1] == '.' {
		e.fail("no number")
	}
	e.rest = e.rest[n:]
	return r
}

func TestEvaluator(t *testing.T) {
	good := []struct{ line, want string }{
		{"37.32", "37.32"},
		{"2 + 3 × 4", "14"},
		{"(2 + 3) × 4", "20"},
		{"7 − 2 − 1", "4"},
		{"8 ÷ 4 ÷ 2", "1"},
		{"−21 − 25", "-46"},
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
		{"one argument", "min(3)"},
		{"an exponent", "1e3"},
	}
	for _, c := range bad {
		if got, err := evaluate(c.line); err == nil {
			t.Errorf("evaluate(%q) = %s; want an error for %s", c.line, got.RatString(), c.why)
		}
	}
}

// shape is the operators and brackets of a line in their order, with x for each
// operand. A negative number counts as an operand, with its parentheses.
func shape(line string) string {
	signs := []string{}
	operand := false
	end := func() {
		if operand {
			signs = append(signs, "x")
		}
		operand = false
	}
	runes := []rune(line)
	for i := 0; i < len(runes); i++ {
		r := runes[i]
		isFunction := r == '(' && i >= 3 && (string(runes[i-3:i]) == "min" || string(runes[i-3:i]) == "max") &&
			(i == 3 || !unicode.IsLetter(runes[i-4]) && runes[i-4] != ',')
		switch {
		case isFunction:
			operand = false
			signs = append(signs, string(runes[i-3:i])+"(")
		case strings.ContainsRune("+−×÷()√⌊⌋⌈⌉", r):
			end()
			signs = append(signs, string(r))
		case r == ',' && i+1 < len(runes) && runes[i+1] == ' ':
			end()
			signs = append(signs, ",")
		case r == ' ':
		default:
			operand = true
		}
	}
	end()
	text := strings.ReplaceAll(strings.Join(signs, " "), "( − x )", "x")
	if rest, ok := strings.CutPrefix(text, "− x"); ok {
		text = "x" + rest
	}
	// The same after an opening bracket.
	for _, open := range []string{"(", "min(", "max(", "⌊", "⌈", ","} {
		text = strings.ReplaceAll(text, open+" − x", open+" x")
	}
	return text
}

func TestShape(t *testing.T) {
	same := []struct{ expression, withNumbers string }{
		{"n × Voc,cold", "12 × 41.955144"},
		{"Voc × (1 + β ÷ 100 × (Tcold − 25))", "37.32 × (1 + (−0.27) ÷ 100 × (−21 − 25))"},
		{"max(Voc, Voc + β × (Tcold − 25))", "max(37.32, 37.32 + (−0.1) × (−21 − 25))"},
		{"Tcold − Treached", "−21 − (−36.1)"},
		{"⌊Vmax ÷ Voc,cold⌋", "⌊1000 ÷ 41.95⌋"},
	}
	for _, c := range same {
		if shape(c.expression) != shape(c.withNumbers) {
			t.Errorf("%q has the shape %q, %q has %q", c.expression, shape(c.expression), c.withNumbers, shape(c.withNumbers))
		}
	}
	different := []struct{ expression, withNumbers string }{
		{"n × Voc,cold", "12 + 41.955144"},
		{"n × Voc", "12 × 37.32 × 1.12"},
		{"n × (a + b)", "12 × 3 + 4"},
		{"min(a, b)", "max(1, 2)"},
		{"a − b", "−3"},
	}
	for _, c := range different {
		if shape(c.expression) == shape(c.withNumbers) {
			t.Errorf("%q and %q have the same shape %q", c.expression, c.withNumbers, shape(c.expression))
		}
	}
}
