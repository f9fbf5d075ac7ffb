package display

import (
	"strconv"
	"strings"

	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/views"
)

// ModuleColumns and InverterColumns are the numbers by which equipment is told apart
// in a list.
var (
	ModuleColumns   = []string{"Pmax", "Voc", "Isc", "Voc coefficient", "Max. system voltage"}
	InverterColumns = []string{"Max. DC voltage", "MPPT window", "Trackers × inputs", "Short-circuit limit", "AC rating"}
)

// ModuleFigures returns the numbers of modules by [ModuleColumns], a row for each, set
// so that the points of a column stand under each other. A nil module has none.
func ModuleFigures(modules []*design.Module) [][]views.EquipmentFigure {
	return figures(ModuleColumns, modules, func(m *design.Module) []string {
		return []string{
			statedIn(m.PmaxW, "W"), statedIn(m.VocV, "V"), statedIn(m.IscA, "A"), statedIn(m.VocCoeff.Value, m.VocCoeff.UnitText), statedIn(m.MaxSystemVoltageV, "V"),
		}
	})
}

// InverterFigures returns the numbers of inverters by [InverterColumns], as
// [ModuleFigures] does. Trackers that differ are told apart.
func InverterFigures(inverters []*design.Inverter) [][]views.EquipmentFigure {
	return figures(InverterColumns, inverters, func(v *design.Inverter) []string {
		return []string{
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
	})
}

func figures[T any](columns []string, pieces []*T, of func(*T) []string) [][]views.EquipmentFigure {
	rows := make([][]views.EquipmentFigure, len(pieces))
	for i, p := range pieces {
		rows[i] = make([]views.EquipmentFigure, len(columns))
		for k, name := range columns {
			rows[i][k].Name = name
		}
		if p == nil {
			continue
		}
		for k, text := range of(p) {
			f := &rows[i][k]
			f.Number, f.Unit, _ = strings.Cut(text, nbsp)
			if strings.Trim(f.Number, minus+"0123456789.") != "" {
				f.Number, f.Unit = text, ""
			}
		}
	}
	align(rows)
	return rows
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

// align fills the numbers of each column up with spaces in the places of digits, so
// that set flush right, with one unit, their points stand under each other.
func align(rows [][]views.EquipmentFigure) {
	if len(rows) == 0 {
		return
	}
	for column := range rows[0] {
		most := 0
		for _, row := range rows {
			most = max(most, fraction(row[column]))
		}
		for _, row := range rows {
			f := &row[column]
			n := fraction(*f)
			if f.Unit == "" || n == most {
				continue
			}
			f.Fill = strings.Repeat(digitSpace, most-n)
			if n == 0 {
				f.Fill = pointSpace + f.Fill
			}
		}
	}
}

// fraction returns how many digits a number with a unit has behind its point.
func fraction(f views.EquipmentFigure) int {
	_, behind, found := strings.Cut(f.Number, ".")
	if !found || f.Unit == "" {
		return 0
	}
	return len(behind)
}
