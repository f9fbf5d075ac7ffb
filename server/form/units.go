package form

import (
	"slices"
	"strings"
)

// Units returns the units that are offered beside the field at a pointer, nil where
// it has none to choose.
func Units(pointer string) []string {
	n, at, _ := find(pointer)
	switch {
	case n == nil:
		return nil
	case n.kind == Temperature || n.kind == Difference:
		return []string{"°C", "°F"}
	case n.kind != Coefficient:
		return nil
	case strings.HasSuffix(at, "/isc_temp_coeff"):
		return []string{"%/°C", "mA/°C", "A/°C"}
	case strings.HasSuffix(at, "/pmax_temp_coeff"):
		return []string{"%/°C", "W/°C"}
	}
	return []string{"%/°C", "mV/°C", "V/°C"}
}

// sameUnit returns the unit as it is offered for a value of the kind: a
// difference of one kelvin is one of 1 °C. It reports whether values of the kind
// are ever stated in it.
func sameUnit(unit string, kind Kind) (string, bool) {
	switch kind {
	case Temperature, Difference:
		switch unit {
		case "", "°C", "°F":
			return unit, true
		case "C", "F":
			return "°" + unit, true
		case "K":
			return "°C", kind == Difference
		}
	case Coefficient:
		top, bottom, ok := strings.Cut(unit, "/")
		if unit == "" {
			return "", true
		}
		if ok && slices.Contains([]string{"K", "C", "°C"}, bottom) {
			return top + "/°C", slices.Contains([]string{"%", "mV", "V", "mA", "A", "W"}, top)
		}
	}
	return unit, false
}

// sampleOf returns what a value of the kind looks like.
func sampleOf(kind Kind) string {
	if kind == Coefficient {
		return "−0.27"
	}
	return "−21.5"
}
