package display

import (
	"strings"

	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
)

// This file is the one place where a number becomes text for people.
//
// A value that the document states is shown with the digits it was stated with. A
// computed value is shown with the digits below, rounded so that it never looks
// safer than it is: what must stay under a limit is rounded up, what must stay
// over one is rounded down. The working beside it shows the number in full.

// Decimal places of computed values.
const (
	placesString  = 1 // volts of a string
	placesModule  = 2 // volts of one module
	placesAmpere  = 2
	placesWatt    = 0
	placesDegree  = 1
	placesPercent = 1
)

const (
	nbsp  = "\u00a0"
	minus = "−"
)

// stated returns a number as the document has it: every digit.
func stated(x quantity.Exact) string { return trueMinus(x.String()) }

// shown returns a computed number with a fixed number of places.
func shown(x quantity.Exact, places int, dir quantity.Direction) string {
	text, _ := x.Fixed(places, dir)
	return trueMinus(text)
}

func trueMinus(s string) string { return strings.ReplaceAll(s, "-", minus) }

// withUnit joins a number and its unit so that they do not part at the end of a line.
func withUnit(number, unit string) string {
	switch unit {
	case "":
		return number
	case "°": // an angle stands close
		return number + unit
	}
	return number + nbsp + unit
}

func statedIn(x quantity.Exact, unit string) string { return withUnit(stated(x), unit) }

func stringVolts(x quantity.Exact, dir quantity.Direction) string {
	return withUnit(shown(x, placesString, dir), "V")
}

func moduleVolts(x quantity.Exact, dir quantity.Direction) string {
	return withUnit(shown(x, placesModule, dir), "V")
}

func amperes(x quantity.Exact, dir quantity.Direction) string {
	return withUnit(shown(x, placesAmpere, dir), "A")
}

// placesOf returns the places of a computed value by its unit.
func placesOf(unit string) int {
	switch unit {
	case "V":
		return placesString
	case "A":
		return placesAmpere
	case "W":
		return placesWatt
	case "°C":
		return placesDegree
	case "%":
		return placesPercent
	}
	return 0
}

// degrees returns a computed temperature in °C with °F beside it. Both are rounded
// in the given direction.
func degrees(c quantity.Exact, dir quantity.Direction) string {
	return celsius(c, dir) + " (" + fahrenheit(c, dir) + ")"
}

func celsius(c quantity.Exact, dir quantity.Direction) string {
	return withUnit(shown(c, placesDegree, dir), "°C")
}

func fahrenheit(c quantity.Exact, dir quantity.Direction) string {
	return withUnit(shown(toFahrenheit(c), placesDegree, dir), "°F")
}

// wholeDegrees returns a temperature that a rule names, such as −40 °C.
func wholeDegrees(c int64) string {
	return statedIn(quantity.Int(c), "°C") + " (" + statedIn(toFahrenheit(quantity.Int(c)), "°F") + ")"
}

func toFahrenheit(c quantity.Exact) quantity.Exact {
	return c.Mul(quantity.Ratio(9, 5)).Add(quantity.Int(32))
}

// statedDegrees returns a temperature as the document states it, with the other
// unit beside it.
func statedDegrees(t design.Temperature) string {
	if t.Fahrenheit {
		return withUnit(stated(t.Value), "°F") + " (" + celsius(t.Celsius(), quantity.Nearest) + ")"
	}
	return withUnit(stated(t.Value), "°C") + " (" + fahrenheit(t.Value, quantity.Nearest) + ")"
}

// degreesApart returns a difference of temperatures: in °C, with the difference in
// °F beside it, which has no 32 in it.
func degreesApart(c quantity.Exact, dir quantity.Direction) string {
	return celsius(c, dir) + " (" + withUnit(shown(c.Mul(quantity.Ratio(9, 5)), placesDegree, dir), "°F") + ")"
}

// statedDifference returns a difference of temperatures as the document states it.
func statedDifference(d design.Difference) string {
	if d.Fahrenheit {
		return withUnit(stated(d.Value), "°F") + " (" + celsius(d.Celsius(), quantity.Nearest) + ")"
	}
	return withUnit(stated(d.Value), "°C") + " (" + withUnit(shown(d.Value.Mul(quantity.Ratio(9, 5)), placesDegree, quantity.Nearest), "°F") + ")"
}

// counted returns a number with the singular or plural of what it counts.
func counted(n int64, one, many string) string { return countedExact(quantity.Int(n), one, many) }

// countedExact is [counted] for a count that may be too large for an int64.
func countedExact(n quantity.Exact, one, many string) string {
	if n.Equal(quantity.Int(1)) {
		return withUnit(stated(n), one)
	}
	return withUnit(stated(n), many)
}

func countModules(n int64) string { return counted(n, "module", "modules") }

func countStrings(n int64) string { return counted(n, "string", "strings") }

// list joins words as a sentence does: "a", "a and b", "a, b and c".
func list(words []string) string { return joined(words, " and ") }

func joined(words []string, last string) string {
	switch len(words) {
	case 0:
		return ""
	case 1:
		return words[0]
	}
	return strings.Join(words[:len(words)-1], ", ") + last + words[len(words)-1]
}

// capital returns a sentence with a capital at its start.
func capital(s string) string {
	if s == "" {
		return ""
	}
	for i, r := range s {
		if i > 0 {
			return strings.ToUpper(s[:i]) + s[i:]
		}
		if r > 0x7f {
			return s
		}
	}
	return strings.ToUpper(s)
}
