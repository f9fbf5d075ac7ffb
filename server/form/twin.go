package form

import (
	"strings"

	"rimeline/sizing/quantity"
)

// Twin returns the temperature or difference at a pointer in the other unit: "= −5.8 °F".
// Where no unit is chosen it gives both readings of the number; where nothing can
// be read it is "".
func (f *Form) Twin(pointer string) string {
	kind := KindOf(pointer)
	x, own, ok := f.measured(pointer)
	if !ok {
		return ""
	}
	unit := strings.TrimSpace(f.texts[pointer+"/unit"])
	switch own, known := sameUnit(own, kind); {
	case !known || own != "" && unit != "" && own != unit:
		return ""
	case own != "":
		unit = own
	}
	switch unit {
	case "°C", "°F":
		return inOtherUnit(x, unit, kind)
	case "":
		return "in °C: " + inOtherUnit(x, "°C", kind) + "; in °F: " + inOtherUnit(x, "°F", kind)
	}
	return ""
}

// measured reads the number in the field at a pointer, and the unit typed with it.
func (f *Form) measured(pointer string) (x quantity.Exact, unit string, ok bool) {
	reading, err := quantity.Typed(f.texts[pointer+"/value"])
	return reading.Value, reading.Unit, err == nil
}

// inOtherUnit converts a temperature or a difference, rounded to a tenth.
func inOtherUnit(x quantity.Exact, unit string, kind Kind) string {
	other, offset := "°F", quantity.Int(32)
	if kind == Difference {
		offset = quantity.Int(0)
	}
	if unit == "°C" {
		x = x.Mul(quantity.Ratio(9, 5)).Add(offset)
	} else {
		other = "°C"
		x = x.Sub(offset).Mul(quantity.Ratio(5, 9))
	}
	text, exact := x.Fixed(1, quantity.Nearest)
	sign := "= "
	if !exact {
		sign = "≈ "
	}
	return sign + strings.ReplaceAll(text, "-", "−") + " " + other
}
