package tests

import (
	"encoding/json"
	"errors"
	"fmt"
	"maps"
	"math/big"
	"math/rand/v2"
	"slices"
	"strings"
	"sync"
	"testing"
)

// turning is a check with the values at which its verdict turns.
type turning struct {
	Questions []question
	Checks    []struct {
		check
		Turns []turn
	}
}

type turn struct {
	Pointer   string
	At        number
	ChangePct number `json:"change_pct"`
}

// wholeNumbers are the fields that only whole numbers fit; for them the turning
// value is itself the first with another verdict.
var wholeNumbers = []string{"unit", "modules_in_series", "strings_in_parallel", "positions", "inputs", "quantity", "cells_in_series"}

// turnOutcome is what trying a turn came to.
type turnOutcome string

const (
	turns         turnOutcome = "turns"
	notADocument  turnOutcome = "not tried: the reader refuses the value"
	questionFirst turnOutcome = "not tried: a question opens or closes before"
	tooClose      turnOutcome = "not tried: nearer than the digits printed"
)

// try puts values beside the turning value into the document: on the near side the
// verdict must be as it is now, on the far side another.
func (tn turn) try(doc object, now check, open []string) (turnOutcome, error) {
	value, ok := at(doc, tn.Pointer)
	written, isNumber := value.(json.Number)
	if !ok || !isNumber {
		return "", fmt.Errorf("%s is no number of the document", tn.Pointer)
	}
	if tn.At.Rat == nil {
		return "", fmt.Errorf("turns at %s", tn.At.text)
	}
	stated := rat(string(written))
	if err := tn.changeFits(stated); err != nil {
		return "", err
	}

	var beside []*big.Rat // pairs of near and far side
	if slices.Contains(wholeNumbers, tn.Pointer[strings.LastIndexByte(tn.Pointer, '/')+1:]) {
		toward := big.NewRat(int64(stated.Cmp(tn.At.Rat)), 1)
		if toward.Sign() == 0 {
			return "", fmt.Errorf("turns at %s, which it is now", tn.At.text)
		}
		beside = []*big.Rat{plus(tn.At.Rat, toward), tn.At.Rat}
	} else {
		gap := minus(tn.At.Rat, stated)
		size := larger(new(big.Rat).Abs(tn.At.Rat), rat("0.001"))
		step := times(size, rat("1e-9"))
		far := times(step, big.NewRat(int64(gap.Sign()), 1))
		if gap.Sign() != 0 && exceeds(times(step, rat("2")), new(big.Rat).Abs(gap)) {
			return tooClose, nil
		}
		beside = []*big.Rat{minus(tn.At.Rat, far), plus(tn.At.Rat, far)}
		if gap.Sign() == 0 { // it stands exactly on the turn: one of the two sides is another
			beside = []*big.Rat{stated, plus(tn.At.Rat, step), stated, minus(tn.At.Rat, step)}
		}
	}

	var failure error
	for ; len(beside) > 0; beside = beside[2:] {
		var verdicts [2]string
		for side, v := range beside[:2] {
			text := v.FloatString(24)
			if places, finite := v.FloatPrec(); finite && places <= 24 {
				text = v.FloatString(places)
			}
			moved := copyDocument(doc)
			put(moved, tn.Pointer, json.Number(text))
			r, err := sizeDocument(moved)
			if errors.As(err, new(refusal)) {
				return notADocument, nil
			}
			if err != nil {
				return "", err
			}
			if side == 0 && !slices.Equal(openQuestions(r.Questions), open) {
				return questionFirst, nil
			}
			c, there := r.check(now.ID, now.About.place())
			if !there {
				return "", fmt.Errorf("no check at %s = %s", tn.Pointer, text)
			}
			verdicts[side] = c.Verdict
		}
		if verdicts[0] == now.Verdict && verdicts[1] != now.Verdict {
			return turns, nil
		}
		failure = errors.Join(failure, fmt.Errorf("%s is now %s and turns at %s; on the near side of it the verdict is %q, on the far side %q",
			tn.Pointer, written, tn.At.text, verdicts[0], verdicts[1]))
	}
	return "", failure
}

// changeFits compares change_pct with the two values that it is of.
func (tn turn) changeFits(stated *big.Rat) error {
	if stated.Sign() == 0 {
		if tn.ChangePct.Rat != nil {
			return fmt.Errorf("%s is 0 and changes by %s %%", tn.Pointer, tn.ChangePct.text)
		}
		return nil
	}
	want := times(hundred, minus(over(tn.At.Rat, stated), one))
	if tn.ChangePct.Rat == nil {
		return fmt.Errorf("%s has no change_pct, want %s", tn.Pointer, want.FloatString(6))
	}
	off := minus(tn.ChangePct.Rat, want)
	if exceeds(off.Abs(off), rat("1e-6")) {
		return fmt.Errorf("%s goes from %s to %s, which is not %s %%", tn.Pointer, stated.FloatString(6), tn.At.text, tn.ChangePct.text)
	}
	return nil
}

func openQuestions(questions []question) []string {
	var open []string
	for _, q := range questions {
		open = append(open, fmt.Sprint(q.Pointer, q.Unsafe))
	}
	return open
}

// TestTurns puts turning values into the document itself: every one of the golden
// designs, some of each random design.
func TestTurns(t *testing.T) {
	const ofEach = 6
	designs := howMany(1_500, 150, 40)
	var mu sync.Mutex
	outcomes := map[turnOutcome]int{}
	type failure struct {
		count int
		text  []byte
		why   error
	}
	failures := map[string]*failure{} // by check and field
	try := func(text []byte, chosen func() bool) {
		doc := readDocument(text)
		var r turning
		if sized(text, &r) != nil {
			return
		}
		for _, c := range r.Checks {
			for _, tn := range c.Turns {
				if !chosen() {
					continue
				}
				outcome, err := tn.try(doc, c.check, openQuestions(r.Questions))
				mu.Lock()
				if outcome != "" {
					outcomes[outcome]++
				}
				if err != nil {
					key := c.ID + ", " + tn.Pointer[strings.LastIndexByte(tn.Pointer, '/')+1:]
					f := failures[key]
					if f == nil {
						f = &failure{}
						failures[key] = f
					}
					f.count++
					if f.text == nil || len(text) < len(f.text) {
						f.text, f.why = text, fmt.Errorf("%s: %w", c.at(), err)
					}
				}
				mu.Unlock()
			}
		}
	}
	for _, text := range goldenDesigns(t) {
		try(text, func() bool { return true })
	}
	eachDesign(designs, func(n uint64) {
		text := randomDesign(n)
		var r turning
		if sized(text, &r) != nil {
			return // wrongly refused: a matter of the agreement test
		}
		all := 0
		for _, c := range r.Checks {
			all += len(c.Turns)
		}
		d := draw{rand.New(rand.NewPCG(4, n)), n%2 == 0}
		try(text, func() bool { return d.chance(float64(ofEach) / float64(max(all, ofEach))) })
	})

	for _, key := range slices.Sorted(maps.Keys(failures)) {
		f := failures[key]
		t.Errorf("%s: %d turns that do not turn; %v\n%s", key, f.count, f.why, indented(f.text))
	}
	for outcome, n := range outcomes {
		t.Logf("%d %s", n, outcome)
	}
	tried, all := outcomes[turns], 0
	for _, n := range outcomes {
		all += n
	}
	if tried*2 < all {
		t.Errorf("only %d of %d turns could be tried", tried, all)
	}
}

// TestTurns_OfTheCeiling: the check that matters most names every input that it
// rests on, as far as the document can hold the value at which it would turn.
func TestTurns_OfTheCeiling(t *testing.T) {
	r := mustSize[turning](t, goldenDesigns(t)["testdata/fahrenheit.json"])
	for _, c := range r.Checks {
		if c.ID != "voltage-ceiling" {
			continue
		}
		var named []string
		for _, tn := range c.Turns {
			named = append(named, tn.Pointer)
		}
		for _, pointer := range []string{"/site/coldest_c/value", "/modules/0/voc_v", "/modules/0/voc_temp_coeff/value",
			"/inverters/0/max_dc_voltage_v", "/strings/0/modules_in_series"} {
			if !slices.Contains(named, pointer) {
				t.Errorf("voltage-ceiling does not say at which %s it turns; it names %q", pointer, named)
			}
		}
	}
}
