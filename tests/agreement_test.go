package tests

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"maps"
	"math/big"
	"runtime"
	"runtime/debug"
	"slices"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
)

// disagreement is one place where the engine and the oracle differ.
type disagreement struct {
	kind   string // what differs, the same for every design
	place  string // where in this design
	engine string
	oracle string
}

// comparison collects the disagreements of one design.
type comparison struct{ found []disagreement }

func (c *comparison) differ(kind, place string, engine, oracle any) {
	c.found = append(c.found, disagreement{kind, place, fmt.Sprint(engine), fmt.Sprint(oracle)})
}

func (c *comparison) words(kind, place, engine, oracle string) {
	if engine != oracle {
		c.differ(kind, place, engine, oracle)
	}
}

// numbers compares a number of the result with the exact one: in full where that
// is a finite decimal, else rounded to 12 significant digits. nil is null.
func (c *comparison) numbers(kind, place string, engine number, oracle *big.Rat) {
	switch {
	case engine.Rat == nil && oracle == nil:
	case engine.Rat == nil || oracle == nil || !shows(engine.Rat, oracle):
		want := "null"
		if oracle != nil {
			want = oracle.FloatString(15)
		}
		c.differ(kind, place, engine.text, want)
	}
}

// shows reports whether a printed number is the exact one by the rule of the
// format page: finite decimals in full, else 12 significant digits.
func shows(printed, exact *big.Rat) bool {
	if _, finite := exact.FloatPrec(); finite {
		return printed.Cmp(exact) == 0
	}
	// Half a unit of the twelfth significant digit.
	unit := new(big.Rat).Abs(exact)
	ten, half := rat("10"), rat("1/2")
	scale := rat("1e-11")
	for unit.Cmp(ten) >= 0 {
		unit, scale = over(unit, ten), times(scale, ten)
	}
	for unit.Cmp(one) < 0 {
		unit, scale = times(unit, ten), over(scale, ten)
	}
	off := minus(printed, exact)
	return !exceeds(off.Abs(off), times(scale, half))
}

// compare holds the result of the engine against what the oracle says.
func compare(engine *result, oracle *oracleResult) []disagreement {
	var c comparison
	c.words("format", "", engine.Format, "rimeline-result/1")
	c.words("verdict", "", engine.Verdict, oracle.verdict.String())

	if len(engine.Limits) != len(oracle.limits) {
		c.differ("number of limits rows", "", len(engine.Limits), len(oracle.limits))
	} else {
		for i, got := range engine.Limits {
			want := oracle.limits[i]
			at := fmt.Sprintf("limits[%d]", i)
			c.words("limits order", at, got.Plane+"|"+got.Inverter+"|"+got.Tracker, want.plane+"|"+want.inverter+"|"+want.tracker)
			c.numbers("voltage_ceiling_v", at, got.Ceiling, want.ceiling)
			c.words("voltage_ceiling_from", at, got.CeilingFrom, want.ceilingFrom)
			c.numbers("module_voc_cold_v", at, got.VocCold, want.vocCold)
			c.numbers("module_vmp_hot_v", at, got.VmpHot, want.vmpHot)
			c.numbers("max_modules", at, got.MaxModules, want.maxModules)
			c.numbers("min_modules", at, got.MinModules, want.minModules)
			c.numbers("min_modules_start", at, got.MinModulesStart, want.minStart)
			c.numbers("max_strings", at, got.MaxStrings, want.maxString)
			c.words("max_strings_from", at, got.MaxStringsFrom, want.maxStringsFrom)
		}
	}

	if len(engine.Strings) != len(oracle.strings) {
		c.differ("number of strings rows", "", len(engine.Strings), len(oracle.strings))
	} else {
		for i, got := range engine.Strings {
			want := oracle.strings[i]
			at := fmt.Sprintf("strings[%d]", i)
			c.numbers("voc_cold_v", at, got.VocCold, want.vocCold)
			c.numbers("vmp_stc_v", at, got.VmpSTC, want.vmpSTC)
			c.numbers("vmp_hot_v", at, got.VmpHot, want.vmpHot)
			c.numbers("max_current_a", at, got.MaxCurrent, want.maxCurrent)
			c.words("verdict of strings row", at, got.Verdict, want.verdict.String())
		}
	}

	c.checks(engine.Checks, oracle.checks)
	c.questions(engine.Questions, oracle.questions)
	return c.found
}

func (c *comparison) checks(engine []check, oracle []oracleCheck) {
	expected := map[string]oracleCheck{}
	for _, want := range oracle {
		expected[want.id+" about "+string(want.about)] = want
	}
	for _, got := range engine {
		at := got.at()
		want, ok := expected[at]
		if !ok {
			c.differ("check too many: "+got.ID, at, "there", "no such check")
			continue
		}
		delete(expected, at)
		c.words(got.ID+" verdict", at, got.Verdict, want.verdict.String())
		if want.measured {
			c.numbers(got.ID+" value", at, got.Value, want.value)
			if want.value != nil { // with nothing to hold against it a limit may be left out
				c.numbers(got.ID+" limit", at, got.Limit, want.limit)
			}
		}
		if got.ID == "voltage-ceiling" {
			c.numbers(got.ID+" reached_at_c", at, got.ReachedAt, want.reachedAt)
		}
	}
	for at, want := range expected {
		c.differ("check missing: "+want.id, at, "no such check", "there")
	}
}

func (c *comparison) questions(engine []question, oracle []oracleQuestion) {
	name := func(pointer string, unsafe bool) string { return fmt.Sprintf("%s unsafe=%t", pointer, unsafe) }
	var got, want []string
	for _, q := range engine {
		got = append(got, name(q.Pointer, q.Unsafe))
	}
	for _, q := range oracle {
		want = append(want, name(q.pointer, q.unsafe))
	}
	slices.Sort(got)
	slices.Sort(want)
	c.words("questions", "questions", strings.Join(got, ", "), strings.Join(want, ", "))
}

// compareText sizes one design by both.
func compareText(text []byte) ([]disagreement, error) {
	line, err := sizeText(text)
	if err != nil {
		return nil, err
	}
	var engine result
	if err := json.Unmarshal(withoutLists(line, "steps", "turns"), &engine); err != nil {
		return nil, err
	}
	o, err := readOracleDesign(text)
	if err != nil {
		return nil, err
	}
	return compare(&engine, o.size()), nil
}

// withoutLists empties the lists of some names in a JSON text: the working is most
// of a result, and reading it most of the time that a comparison takes.
func withoutLists(text []byte, names ...string) []byte {
	for _, name := range names {
		label := []byte(`"` + name + `":[`)
		kept := make([]byte, 0, len(text))
		for {
			before, rest, found := bytes.Cut(text, label)
			kept = append(kept, before...)
			if !found {
				break
			}
			kept = append(append(kept, label...), ']')
			text = rest[endOfList(rest):]
		}
		text = kept
	}
	return text
}

// endOfList is where the list ends whose opening bracket stands before the text.
func endOfList(text []byte) int {
	depth, quoted := 1, false
	for i := 0; i < len(text); i++ {
		switch c := text[i]; {
		case quoted && c == '\\':
			i++
		case c == '"':
			quoted = !quoted
		case quoted:
		case c == '[' || c == '{':
			depth++
		case c == ']' || c == '}':
			if depth--; depth == 0 {
				return i + 1
			}
		}
	}
	return len(text)
}

func TestWithoutLists(t *testing.T) {
	text := `{"a":[1],"steps":[{"x":"]\"]","y":[2]}],"b":{"steps":[],"turns":[3]},"stepsx":[4]}`
	want := `{"a":[1],"steps":[],"b":{"steps":[],"turns":[]},"stepsx":[4]}`
	if got := withoutLists([]byte(text), "steps", "turns"); string(got) != want {
		t.Errorf("withoutLists(%s) = %s", text, got)
	}
}

// tally is what is remembered of one kind of disagreement: how often, and the
// shortest design that shows it.
type tally struct {
	designs int
	example disagreement
	text    []byte
}

// TestEngineAgreesWithOracle compares every count, verdict, number and set of
// checks on random designs.
func TestEngineAgreesWithOracle(t *testing.T) {
	designs := howMany(100_000, 2_000, 5_000)
	defer debug.SetGCPercent(debug.SetGCPercent(2000)) // many small designs, nothing to keep

	var mu sync.Mutex
	kinds := map[string]*tally{}
	record := func(text []byte, found []disagreement) {
		mu.Lock()
		defer mu.Unlock()
		seen := map[string]bool{}
		for _, f := range found {
			k := kinds[f.kind]
			if k == nil {
				k = &tally{}
				kinds[f.kind] = k
			}
			if !seen[f.kind] {
				k.designs++
				seen[f.kind] = true
			}
			if k.text == nil || len(text) < len(k.text) {
				k.example, k.text = f, text
			}
		}
	}

	eachDesign(designs, func(n uint64) {
		text := randomDesign(n)
		found, err := compareText(text)
		if err != nil {
			kind := "error"
			if errors.As(err, new(refusal)) {
				kind = "the reader refuses a design that obeys the fault rules"
			}
			found = []disagreement{{kind: kind, engine: err.Error()}}
		}
		record(text, found)
	})

	for _, kind := range slices.Sorted(maps.Keys(kinds)) {
		k := kinds[kind]
		t.Errorf("%s: differs in %d of %d designs; at %s: engine %s, oracle %s\n%s",
			kind, k.designs, designs, k.example.place, k.example.engine, k.example.oracle, indented(k.text))
	}
}

// howMany designs to try: in a full run, in a short one, under the race detector.
func howMany(full, short, race uint64) uint64 {
	switch {
	case testing.Short():
		return short
	case raceDetector:
		return race
	}
	return full
}

// eachDesign calls f with the numbers below n, on every processor.
func eachDesign(n uint64, f func(uint64)) {
	var next atomic.Uint64
	var workers sync.WaitGroup
	for range runtime.GOMAXPROCS(0) {
		workers.Go(func() {
			for i := next.Add(1) - 1; i < n; i = next.Add(1) - 1 {
				f(i)
			}
		})
	}
	workers.Wait()
}

func indented(text []byte) string {
	var b bytes.Buffer
	if err := json.Indent(&b, text, "", " "); err != nil {
		return string(text)
	}
	return b.String()
}
