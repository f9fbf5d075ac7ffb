package display

import (
	"strconv"
	"strings"

	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
)

// ModuleColumns and InverterColumns are the numbers by which equipment is told apart
// in a list.
var (
	ModuleColumns   = []string{"Pmax", "Voc", "Isc", "Voc coefficient", "Max. system voltage"}
	InverterColumns = []string{"Max. DC voltage", "MPPT window", "Trackers × inputs", "Short-circuit limit", "AC rating"}
)

// ModuleFigures returns the numbers of modules by [ModuleColumns], a row for each, set
// so that the points of a column stand under each other. A nil module has none.
func ModuleFigures(modules []*design.Module) [][]string {
	rows := make([][]string, len(modules))
	for i, m := range modules {
		if m == nil {
			rows[i] = make([]string, len(ModuleColumns))
			continue
		}
		rows[i] = []string{
			statedIn(m.PmaxW, "W"), statedIn(m.VocV, "V"), statedIn(m.IscA, "A"), statedIn(m.VocCoeff.Value, m.VocCoeff.UnitText), statedIn(m.MaxSystemVoltageV, "V"),
		}
	}
	return aligned(rows)
}

// InverterFigures returns the numbers of inverters by [InverterColumns], as
// [ModuleFigures] does. Trackers that differ are told apart.
func InverterFigures(inverters []*design.Inverter) [][]string {
	rows := make([][]string, len(inverters))
	for i, v := range inverters {
		if v == nil {
			rows[i] = make([]string, len(InverterColumns))
			continue
		}
		rows[i] = []string{
			statedIn(v.MaxDCVoltageV, "V"),
			ofTrackers(v, func(t *design.Tracker) string { return stated(t.MPPTMinV) + " to " + statedIn(t.MPPTMaxV, "V") }),
			inputsOf(v),
			ofTrackers(v, func(t *design.Tracker) string {
				if t.MaxShortCircuitA == nil {
					return "not stated"
				}
				return statedIn(*t.MaxShortCircuitA, "A")
			}),
			optionallyIn(v.ACRatedW, "W"),
		}
	}
	return aligned(rows)
}

func optionallyIn(x *quantity.Exact, unit string) string {
	if x == nil {
		return ""
	}
	return statedIn(*x, unit)
}

// ofTrackers says something of an inverter's trackers: once where it is the same of all.
func ofTrackers(v *design.Inverter, say func(*design.Tracker) string) string {
	var words []string
	for i := range v.Trackers {
		words = appendNew(words, say(&v.Trackers[i]))
	}
	return strings.Join(words, ", ")
}

// inputsOf tells how many trackers there are with how many inputs: "2 × 2", "1 × 2, 1 × 1".
func inputsOf(v *design.Inverter) string {
	var words []string
	for i := 0; i < len(v.Trackers); {
		end := i + 1
		for end < len(v.Trackers) && v.Trackers[end].Inputs == v.Trackers[i].Inputs {
			end++
		}
		words = append(words, strconv.Itoa(end-i)+" × "+strconv.FormatInt(v.Trackers[i].Inputs, 10))
		i = end
	}
	return strings.Join(words, ", ")
}

const (
	digitSpace = "\u2007" // as wide as a digit
	pointSpace = "\u2008" // as wide as a point
)

// aligned fills the numbers of each column up with spaces in the places of digits, so
// that set flush right, with one unit, their points stand under each other.
func aligned(rows [][]string) [][]string {
	if len(rows) == 0 {
		return rows
	}
	for column := range rows[0] {
		most := 0
		for _, row := range rows {
			if n, ok := fraction(row[column]); ok {
				most = max(most, n)
			}
		}
		for _, row := range rows {
			n, ok := fraction(row[column])
			if !ok || n == most {
				continue
			}
			fill := strings.Repeat(digitSpace, most-n)
			if n == 0 {
				fill = pointSpace + fill
			}
			number, unit, _ := strings.Cut(row[column], nbsp)
			row[column] = number + fill + nbsp + unit
		}
	}
	return rows
}

// fraction returns how many digits a single number with its unit has behind the point.
func fraction(cell string) (digits int, ok bool) {
	number, _, found := strings.Cut(cell, nbsp)
	if !found || strings.Trim(number, minus+"0123456789.") != "" {
		return 0, false
	}
	_, behind, _ := strings.Cut(number, ".")
	return len(behind), true
}
