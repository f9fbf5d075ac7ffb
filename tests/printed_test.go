package tests

import (
	"errors"
	"fmt"
	"maps"
	"math/big"
	"strings"
	"sync"
	"testing"
)

// The working as the JSON of a result shows it.
type (
	working struct {
		Limits []struct {
			limitsRow
			Steps []step
		}
		Checks []struct {
			check
			Steps []step
		}
	}
	step struct {
		Symbol, Expression string
		WithNumbers        string `json:"with_numbers"`
		Value              number
		Unit               string
	}
)

// misprints are the reasons why a step is not what the format page says of steps[].
// known are the symbols of the lines before it.
func (s step) misprints(known substitution) []string {
	var found []string
	say := func(format string, args ...any) { found = append(found, fmt.Sprintf(format, args...)) }
	if s.Symbol == "" || s.Expression == "" {
		say("no symbol or no expression")
	}
	if s.Value.Rat == nil {
		say("no value")
		return found
	}
	worth, err := evaluate(s.WithNumbers)
	if err != nil {
		say("%v", err)
		return found
	}
	if !printsAs(worth, s.Value) {
		say("%s = %s, printed %s", s.WithNumbers, worth.FloatString(15), s.Value.text)
	}
	expression, err := parseExpression(s.Expression)
	if err != nil {
		say("%v", err)
		return found
	}
	numbers, _ := parseNumbers(s.WithNumbers)
	if !maps.Clone(known).fits(expression, numbers) {
		say("%q is not %q with the values of its symbols put in", s.WithNumbers, s.Expression)
	}
	return found
}

// printsAs reports whether a printed value is what its line is worth: exactly for
// a finite decimal of at most 12 digits, else within half a unit of the last digit.
func printsAs(worth *big.Rat, printed number) bool {
	if worth.Cmp(printed.Rat) == 0 {
		return true
	}
	if places, finite := worth.FloatPrec(); finite && significant(worth.FloatString(places)) <= 12 {
		return false
	}
	mantissa, _, _ := strings.Cut(strings.ToLower(printed.text), "e")
	_, decimals, _ := strings.Cut(mantissa, ".")
	last := rat("1e-" + fmt.Sprint(len(decimals)))
	if len(decimals) == 0 { // 12 digits of a large number
		last = rat("1e" + fmt.Sprint(max(0, len(strings.TrimPrefix(mantissa, "-"))-12)))
	} else if missing := 12 - significant(mantissa); missing > 0 { // zeros at the end are not printed
		last = over(last, rat("1e"+fmt.Sprint(missing)))
	}
	off := minus(worth, printed.Rat)
	return !exceeds(off.Abs(off), times(last, rat("1/2")))
}

// significant counts the significant digits of a plain decimal.
func significant(decimal string) int {
	digits := strings.Trim(strings.TrimPrefix(decimal, "-"), "0.")
	return len(strings.ReplaceAll(digits, ".", ""))
}

func TestPrintsAs(t *testing.T) {
	cases := []struct {
		worth, printed string
		want           bool
	}{
		{"41.955144", "41.955144", true},
		{"41.955144", "41.96", false},    // a short decimal is printed in full
		{"1/3", "0.333333333333", true},  // 12 digits
		{"1/3", "0.333333333334", false}, // wrong in the last
		{"1/3", "0.33", false},           // too few
		{"2/3", "0.666666666667", true},  // rounded
		{"2/3", "0.666666666666", false}, // cut off
		{"-40000/3", "-13333.3333333", true},
		{"1000000000000.4", "1000000000000", true},
		{"0", "0", true},
		{"3", "3.0", true},
	}
	for _, c := range cases {
		if got := printsAs(rat(c.worth), number{rat(c.printed), c.printed}); got != c.want {
			t.Errorf("printsAs(%s, %s) = %t", c.worth, c.printed, got)
		}
	}
}

// misprints are those of every line of the working, keyed by the kind of check.
func (w *working) misprints() map[string][]string {
	found := map[string][]string{}
	lines := func(of string, steps []step) {
		known := substitution{}
		for _, s := range steps {
			for _, fault := range s.misprints(known) {
				found[of] = append(found[of], s.Symbol+": "+fault)
			}
			if before, ok := known[s.Symbol]; ok && before.text != s.Value.text {
				found[of] = append(found[of], fmt.Sprintf("%s is %s and %s", s.Symbol, before.text, s.Value.text))
			}
			known[s.Symbol] = s.Value
		}
	}
	for _, row := range w.Limits {
		lines("limits", row.Steps)
		if len(row.Steps) == 0 {
			found["limits"] = append(found["limits"], "no steps")
		}
	}
	for _, c := range w.Checks {
		lines(c.ID, c.Steps)
		switch {
		case c.Value.Rat == nil:
		case len(c.Steps) == 0:
			found[c.ID] = append(found[c.ID], "a value without a step")
		case c.Steps[len(c.Steps)-1].Value.Rat == nil || c.Steps[len(c.Steps)-1].Value.Cmp(c.Value.Rat) != 0:
			found[c.ID] = append(found[c.ID], fmt.Sprintf("the last step is worth %s, the check %s",
				c.Steps[len(c.Steps)-1].Value.text, c.Value.text))
		}
	}
	return found
}

// TestPrintedLines recomputes every line of the working from its own text.
func TestPrintedLines(t *testing.T) {
	designs := howMany(4_000, 500, 150)
	var mu sync.Mutex
	seen := map[string]int{}
	lines := func(name string, text []byte) {
		var w working
		err := sized(text, &w)
		mu.Lock()
		defer mu.Unlock()
		if err != nil {
			if !errors.As(err, new(refusal)) { // a refused design is a matter of the agreement test
				t.Errorf("%s: %v", name, err)
			}
			return
		}
		for of, faults := range w.misprints() {
			if seen[of]++; seen[of] <= 3 {
				t.Errorf("%s, working of %s:\n  %s", name, of, strings.Join(faults, "\n  "))
			}
		}
	}
	for name, text := range goldenDesigns(t) {
		lines(name, text)
	}
	eachDesign(designs, func(n uint64) { lines(fmt.Sprintf("random design %d", n), randomDesign(n)) })
	for of, n := range seen {
		t.Logf("%s: misprints in %d designs", of, n)
	}
}
