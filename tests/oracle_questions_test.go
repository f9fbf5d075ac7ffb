package tests

import (
	"encoding/json"
	"fmt"
	"math/big"
	"reflect"
	"strings"
)

// doubt is an open question about one module, and the checks that must not pass
// while it is open.
type doubt struct {
	module    int
	unsafeFor []string
}

// questions are the open ones, and the doubts that the unsafe ones leave.
func (d *oracleDesign) questions() (open []oracleQuestion, doubts []doubt) {
	ask := func(i int, field string, restsOn []string, unsafeFor ...string) {
		pointer := fmt.Sprintf("/modules/%d/%s", i, field)
		if d.answered(pointer, i, field, restsOn) {
			return
		}
		open = append(open, oracleQuestion{pointer, len(unsafeFor) > 0, i, restsOn})
		if len(unsafeFor) > 0 {
			doubts = append(doubts, doubt{i, unsafeFor})
		}
	}
	outsideRange := func(x *big.Rat, low, high string) bool { return exceeds(rat(low), x) || exceeds(x, rat(high)) }

	for i := range d.Modules {
		m := &d.Modules[i]
		crystalline := m.Technology == "mono-si" || m.Technology == "multi-si"

		off := minus(times(m.Vmp.Rat, m.Imp.Rat), m.Pmax.Rat)
		if exceeds(off.Abs(off), times(rat("0.02"), m.Pmax.Rat)) {
			ask(i, "pmax_w", []string{"pmax_w", "vmp_v", "imp_a"},
				"hot-minimum", "full-power-low", "full-power-high", "cold-upper", "operating-current", "dc-power")
		}

		if fill := over(m.Pmax.Rat, times(m.Voc.Rat, m.Isc.Rat)); outsideRange(fill, "0.50", "0.88") {
			ask(i, "voc_v", []string{"pmax_w", "voc_v", "isc_a"},
				"hot-minimum", "full-power-low", "full-power-high", "cold-upper", "operating-current",
				"voltage-ceiling", "headroom", "start", "short-circuit", "back-feed")
		}

		if crystalline && m.Cells.Rat != nil && outsideRange(over(m.Voc.Rat, m.Cells.Rat), "0.50", "0.78") {
			ask(i, "voc_v", []string{"voc_v", "cells_in_series"},
				"voltage-ceiling", "headroom", "method-difference", "start")
		}

		voc := []string{"voc_temp_coeff"}
		if !strings.HasPrefix(m.VocCoeff.Unit, "%") {
			voc = append(voc, "voc_v")
		}
		if crystalline && outsideRange(m.VocCoeff.percent(m.Voc.Rat), "-0.45", "-0.15") {
			unsafeFor := []string{"voltage-ceiling", "headroom", "method-difference", "start"}
			if !m.VmpCoeff.stated() && !m.PmaxCoeff.stated() {
				unsafeFor = append(unsafeFor, "hot-minimum")
			}
			ask(i, "voc_temp_coeff", voc, unsafeFor...)
		}

		if m.PmaxCoeff.stated() && exceeds(m.PmaxCoeff.percent(m.Pmax.Rat), m.VocCoeff.percent(m.Voc.Rat)) {
			restsOn := append([]string{"pmax_temp_coeff"}, voc...)
			if !strings.HasPrefix(m.PmaxCoeff.Unit, "%") {
				restsOn = append(restsOn, "pmax_w")
			}
			ask(i, "voc_temp_coeff", restsOn)
		}
		if m.IscCoeff.stated() && m.IscCoeff.Value.Sign() < 0 {
			ask(i, "isc_temp_coeff", []string{"isc_temp_coeff"})
		}
		if m.Length.Rat != nil && m.Width.Rat != nil {
			squareMM := times(m.Length.Rat, m.Width.Rat)
			// 30 % of 1000 W/m² is 0.0003 W/mm².
			if exceeds(m.Pmax.Rat, times(rat("0.0003"), squareMM)) {
				ask(i, "length_mm", []string{"pmax_w", "length_mm", "width_mm"})
			}
		}
	}
	return open, doubts
}

// answered reports whether an answer states every value that the question rests
// on as it now stands: the value itself where it is one field, else an object of
// the fields by name.
func (d *oracleDesign) answered(pointer string, module int, field string, restsOn []string) bool {
	for _, a := range d.Answers {
		if a.Pointer != pointer {
			continue
		}
		now := func(field string) json.RawMessage { return d.modulesAsWritten[module][field] }
		if len(restsOn) == 1 {
			if sameJSON(a.ValueAsked, now(field)) {
				return true
			}
			continue
		}
		want := map[string]json.RawMessage{}
		for _, f := range restsOn {
			want[f] = now(f)
		}
		text, err := json.Marshal(want)
		if err != nil {
			panic(err)
		}
		if sameJSON(a.ValueAsked, text) {
			return true
		}
	}
	return false
}

// sameJSON compares two values; numbers by what they are worth.
func sameJSON(a, b json.RawMessage) bool {
	return reflect.DeepEqual(plainJSON(a), plainJSON(b))
}

func plainJSON(text json.RawMessage) any {
	var fields map[string]json.RawMessage
	if json.Unmarshal(text, &fields) == nil {
		plain := map[string]any{}
		for name, value := range fields {
			plain[name] = plainJSON(value)
		}
		return plain
	}
	var n number
	if n.UnmarshalJSON(text) == nil && n.Rat != nil {
		return n.RatString()
	}
	return string(text)
}
