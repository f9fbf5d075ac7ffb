package design

import (
	"slices"
	"strings"

	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// Doubt is a plausibility test of a datasheet. It holds while one of its
// conditions is broken; then a question is asked, unless it was answered.
type Doubt struct {
	Conditions []*working.Condition
	Pointer    string   // of the field that is asked about
	UnsafeFor  []string // ids of the checks that are at best unconfirmed while the question is open
	Answered   bool     // it holds, and an answer closes it
	question   func() working.Question
}

// Holds reports whether the values look like a slip.
func (t *Doubt) Holds() bool {
	return slices.ContainsFunc(t.Conditions, (*working.Condition).Broken)
}

// Open reports whether the question must be asked.
func (t *Doubt) Open() bool { return t.Holds() && !t.Answered }

// Question returns the question to ask.
func (t *Doubt) Question() working.Question { return t.question() }

// The bounds of plausibility. Source of all: common practice; the ranges of cell
// voltage and coefficient hold for crystalline silicon only.
var (
	powerOff       = quantity.Ratio(2, 100) // Vmp × Imp against Pmax
	fillFactorLow  = quantity.Ratio(50, 100)
	fillFactorHigh = quantity.Ratio(88, 100)
	cellLowV       = quantity.Ratio(50, 100)
	cellHighV      = quantity.Ratio(78, 100)
	coeffSteepPct  = quantity.Ratio(-45, 100)
	coeffFlatPct   = quantity.Ratio(-15, 100)
	efficiencyHigh = quantity.Ratio(30, 100) // of 1000 W/m²
)

var (
	unsafePower      = []string{"hot-minimum", "full-power-low", "full-power-high", "cold-upper", "operating-current", "dc-power"}
	unsafeFillFactor = []string{"hot-minimum", "full-power-low", "full-power-high", "cold-upper", "operating-current",
		"voltage-ceiling", "headroom", "start", "short-circuit", "back-feed"}
	unsafeVoc        = []string{"voltage-ceiling", "headroom", "method-difference", "start"}
	unsafeVocStandIn = append(slices.Clone(unsafeVoc), "hot-minimum")
)

// Doubts returns every plausibility test of one module, in the order of the format
// page.
func Doubts(d *Design, t *Terms, module int) []Doubt {
	m, v := &d.Modules[module], &t.Modules[module]
	doubts := make([]Doubt, 0, 7)
	ask := func(field string, rests []string, unsafeFor []string, asked, why func() string, conditions ...*working.Condition) {
		t := Doubt{Conditions: conditions, UnsafeFor: unsafeFor, Pointer: v.Pointer(field)}
		pointer := t.Pointer
		valueAsked := func() string { return m.valueAsked(rests) }
		if t.Holds() {
			t.Answered = answered(d.Answers, pointer, valueAsked())
		}
		t.question = func() working.Question {
			return working.Question{Pointer: pointer, Asked: asked(), Why: why(), Unsafe: unsafeFor != nil, UnsafeFor: unsafeFor, ValueAsked: valueAsked()}
		}
		doubts = append(doubts, t)
	}

	power := v.Vmp.Times(v.Imp)
	ask("pmax_w", []string{"imp_a", "pmax_w", "vmp_v"}, unsafePower,
		func() string { return "Are Pmax, Vmp and Imp from the same column and row of the datasheet?" },
		func() string {
			return "Vmp × Imp is " + shown(power.Value(), 1) + " W, which is more than 2 % off Pmax " + m.PmaxW.String() + " W"
		},
		working.Exceeds(power, working.Number(quantity.Int(1).Add(powerOff)).Times(v.Pmax)),
		working.Exceeds(working.Number(quantity.Int(1).Sub(powerOff)).Times(v.Pmax), power))

	product := v.Voc.Times(v.Isc)
	ask("voc_v", []string{"isc_a", "pmax_w", "voc_v"}, unsafeFillFactor,
		func() string { return "Are Voc, Isc and Pmax right?" },
		func() string {
			return "the fill factor Pmax ÷ (Voc × Isc) is " + shown(m.PmaxW.Quo(product.Value()), 3) + "; it lies between 0.50 and 0.88"
		},
		working.Exceeds(v.Pmax, working.Number(fillFactorHigh).Times(product)),
		working.Exceeds(working.Number(fillFactorLow).Times(product), v.Pmax))

	if m.CrystallineSilicon() && v.Cells != nil {
		ask("voc_v", []string{"cells_in_series", "voc_v"}, unsafeVoc,
			func() string { return "Are Voc and the number of cells in series right?" },
			func() string {
				return "Voc is " + shown(m.VocV.Quo(v.Cells.Value()), 3) + " V a cell; crystalline silicon lies between 0.50 and 0.78 V. Half-cut cells count once for the two halves in parallel"
			},
			working.Exceeds(v.Voc, working.Number(cellHighV).Times(v.Cells)),
			working.Exceeds(working.Number(cellLowV).Times(v.Cells), v.Voc))
	}

	betaPct := m.VocCoeff.PercentOf(m.VocV)
	if m.CrystallineSilicon() {
		unsafeFor := unsafeVoc
		if m.VmpCoeff == nil && m.PmaxCoeff == nil {
			unsafeFor = unsafeVocStandIn
		}
		rests := []string{"voc_temp_coeff"}
		perPct := working.Whole(1) // of the coefficient's own unit
		switch m.VocCoeff.Unit {
		case VoltPerC:
			perPct, rests = v.Voc.Over(working.Whole(100)), []string{"voc_temp_coeff", "voc_v"}
		case MillivoltPerC:
			perPct, rests = v.Voc.Times(working.Whole(10)), []string{"voc_temp_coeff", "voc_v"}
		}
		ask("voc_temp_coeff", rests, unsafeFor,
			func() string { return "Is the Voc coefficient right, with its unit?" },
			func() string {
				return "it comes to " + shown(betaPct, 3) + " %/°C; crystalline silicon lies between −0.45 and −0.15 %/°C"
			},
			working.Exceeds(working.Number(coeffSteepPct).Times(perPct), v.VocCoeff.Term),
			working.Exceeds(v.VocCoeff.Term, working.Number(coeffFlatPct).Times(perPct)))
	}

	if m.PmaxCoeff != nil {
		gammaPct := m.PmaxCoeff.PercentOf(m.PmaxW)
		rests := []string{"pmax_temp_coeff", "voc_temp_coeff"}
		if m.PmaxCoeff.Unit != PercentPerC {
			rests = append(rests, "pmax_w")
		}
		if m.VocCoeff.Unit != PercentPerC {
			rests = append(rests, "voc_v")
		}
		slices.Sort(rests)
		ask("voc_temp_coeff", rests, nil,
			func() string { return "Were the coefficients of Voc and of power swapped?" },
			func() string {
				return "Voc falls by " + shown(betaPct.Abs(), 3) + " %/°C and power by only " + shown(gammaPct.Abs(), 3) + " %/°C; power is usually the steeper"
			},
			working.Known(betaPct.Less(gammaPct)))
	}
	if m.IscCoeff != nil {
		ask("isc_temp_coeff", []string{"isc_temp_coeff"}, nil,
			func() string { return "Is the current coefficient negative?" },
			func() string { return "short-circuit current usually rises with temperature" },
			working.Known(m.IscCoeff.Value.Sign() < 0))
	}
	if m.LengthMM != nil && m.WidthMM != nil {
		efficiency := m.PmaxW.Mul(quantity.Int(1000)).Quo(m.LengthMM.Mul(*m.WidthMM))
		ask("length_mm", []string{"length_mm", "pmax_w", "width_mm"}, nil,
			func() string { return "Are the module's length and width right?" },
			func() string {
				return "Pmax on that area is an efficiency of " + shown(efficiency.Mul(hundred), 1) + " %; it is above 30 %"
			},
			working.Known(efficiencyHigh.Less(efficiency)))
	}
	return doubts
}

// shown returns a number for a sentence, with a true minus.
func shown(x quantity.Exact, places int) string {
	text, _ := x.Fixed(places, quantity.Nearest)
	return strings.Replace(text, "-", "−", 1)
}

func answered(answers []Answer, pointer, valueAsked string) bool {
	return slices.ContainsFunc(answers, func(a Answer) bool {
		return a.Pointer == pointer && string(a.ValueAsked) == valueAsked
	})
}

// valueAsked returns the canonical JSON of the fields that a question rests on:
// the value itself of a single field, an object by name of several.
func (m *Module) valueAsked(fields []string) string {
	if len(fields) == 1 {
		return string(m.appendField(nil, fields[0]))
	}
	dst := []byte{'{'}
	for i, f := range fields {
		if i > 0 {
			dst = append(dst, ',')
		}
		dst = append(working.AppendJSONString(dst, f), ':')
		dst = m.appendField(dst, f)
	}
	return string(append(dst, '}'))
}

func (m *Module) appendField(dst []byte, field string) []byte {
	switch field {
	case "pmax_w":
		return appendNumber(dst, m.PmaxW)
	case "voc_v":
		return appendNumber(dst, m.VocV)
	case "isc_a":
		return appendNumber(dst, m.IscA)
	case "vmp_v":
		return appendNumber(dst, m.VmpV)
	case "imp_a":
		return appendNumber(dst, m.ImpA)
	case "cells_in_series":
		return appendNumber(dst, quantity.Int(*m.CellsInSeries))
	case "length_mm":
		return appendNumber(dst, *m.LengthMM)
	case "width_mm":
		return appendNumber(dst, *m.WidthMM)
	case "voc_temp_coeff":
		return m.VocCoeff.appendAsked(dst)
	case "isc_temp_coeff":
		return m.IscCoeff.appendAsked(dst)
	case "pmax_temp_coeff":
		return m.PmaxCoeff.appendAsked(dst)
	}
	panic("design: no question rests on " + field)
}

func (c *Coefficient) appendAsked(dst []byte) []byte {
	dst = append(dst, `{"unit":`...)
	dst = working.AppendJSONString(dst, c.UnitText)
	dst = append(dst, `,"value":`...)
	return append(appendNumber(dst, c.Value), '}')
}
