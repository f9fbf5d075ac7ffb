// Package design is the document: its types, the strict reader and writer, the
// faults it is refused for and the plausibility questions it raises. format.md
// beside this file is the contract.
//
// It knows the form of a design and nothing of how one is judged: no code
// edition, no limit, no verdict. A form, a file and the API all come through the
// one reader here.
package design

import "rimeline/sizing/quantity"

// Format is the value of the field "format" of every design.
const Format = "rimeline-design/1"

// Design is a document that has passed the reader. Fields are in the order of the
// format page. An optional number that was not stated is nil; an optional text is "".
type Design struct {
	Title             string
	Rulebook          string // one of Rulebooks
	VoltageMethod     string // MethodCoefficient (the default), MethodTable
	ShortCircuitBasis string // BasisMaximum (the default), BasisRated
	Site              Site
	Modules           []Module
	Inverters         []Inverter
	Planes            []Plane
	Allowances        Allowances
	OtherLimits       []OtherLimit
	Strings           []StringEntry
	Job               Job
	Sources           []Source // in the order of the document
	Answers           []Answer
}

// Words that the document uses.
const (
	MethodCoefficient = "coefficient"
	MethodTable       = "table"
	MethodWeather     = "weather"

	BasisMaximum = "maximum"
	BasisRated   = "rated"

	StructureDwelling = "one-or-two-family-dwelling"
	StructureBuilding = "other-building"
	StructureGround   = "ground-mounted"

	ColdestMeanMinimum = "annual-extreme-mean-minimum"
	ColdestRecordLow   = "record-low"
	BasisAuthority     = "authority-required"
	BasisOther         = "other"

	HottestRecordHigh = "record-high"
	HottestCooling2   = "cooling-2-percent"
	HottestCooling04  = "cooling-0.4-percent"

	PowerLimit  = "limit"
	PowerAdvice = "advice"
)

// Rulebooks are the code editions a design may name, in the order in which they are offered.
var Rulebooks = []string{"nec-2017", "nec-2020", "nec-2023", "nec-2026", "iec-62548-1"}

// Technologies are the kinds of cell a module may name.
var Technologies = []string{"mono-si", "multi-si", "cdte", "cigs", "other"}

// Temperature is a temperature as written, in °C or °F.
type Temperature struct {
	Value      quantity.Exact // as written
	Fahrenheit bool           // the document says {"value": …, "unit": "°F"}
	Object     bool           // written as an object with a unit, not as a bare number; its number's pointer ends in /value
}

// Celsius returns the temperature in °C, exactly.
func (t Temperature) Celsius() quantity.Exact {
	if !t.Fahrenheit {
		return t.Value
	}
	return t.Value.Sub(quantity.Int(32)).Mul(quantity.Ratio(5, 9))
}

// Difference is a difference of temperatures as written. In °F it is × 5 ÷ 9, without the −32.
type Difference Temperature

// Celsius returns the difference in °C, exactly.
func (d Difference) Celsius() quantity.Exact {
	if !d.Fahrenheit {
		return d.Value
	}
	return d.Value.Mul(quantity.Ratio(5, 9))
}

// CoefficientUnit is the normalised unit of a temperature coefficient.
type CoefficientUnit uint8

const (
	PercentPerC CoefficientUnit = iota // %/°C of the rated value
	VoltPerC
	MillivoltPerC
	AmperePerC
	MilliamperePerC
	WattPerC
)

// Coefficient is a temperature coefficient as written.
type Coefficient struct {
	Value    quantity.Exact
	Unit     CoefficientUnit
	UnitText string // as written, such as "%/K"
}

// PercentOf returns the coefficient in %/°C of the rated value (Voc for a voltage
// coefficient, Isc for a current one, Pmax for a power one), which must not be 0.
func (c Coefficient) PercentOf(rated quantity.Exact) quantity.Exact {
	if c.Unit == PercentPerC {
		return c.Value
	}
	return c.PerC(rated).Quo(rated).Mul(quantity.Int(100))
}

// PerC returns the coefficient in the rated value's own unit (V, A or W) per °C.
func (c Coefficient) PerC(rated quantity.Exact) quantity.Exact {
	switch c.Unit {
	case PercentPerC:
		return c.Value.Mul(rated).Quo(quantity.Int(100))
	case MillivoltPerC, MilliamperePerC:
		return c.Value.Quo(quantity.Int(1000))
	}
	return c.Value
}

// Site is where the array stands.
type Site struct {
	Name         string
	Structure    string
	Coldest      Temperature // coldest_c
	ColdestBasis string
	Hottest      Temperature // hottest_c
	HottestBasis string
	Station      string
	ElevationM   *quantity.Exact
}

// Module is a module's datasheet at STC (1000 W/m², 25 °C, AM 1.5).
type Module struct {
	ID, Maker, Model  string
	Technology        string
	CellsInSeries     *int64
	PmaxW, VocV, IscA quantity.Exact
	VmpV, ImpA        quantity.Exact
	VocCoeff          Coefficient
	IscCoeff          *Coefficient
	PmaxCoeff         *Coefficient
	VmpCoeff          *Coefficient
	MaxSystemVoltageV quantity.Exact
	MaxSeriesFuseA    *quantity.Exact
	IscMarkedMaxA     *quantity.Exact
	Bifaciality       *quantity.Exact
	NOCT              *Temperature // noct_c
	LengthMM, WidthMM *quantity.Exact
}

// CrystallineSilicon reports whether the module's cells are mono- or multicrystalline silicon.
func (m *Module) CrystallineSilicon() bool {
	return m.Technology == "mono-si" || m.Technology == "multi-si"
}

// Inverter is an inverter type; Quantity of it are installed.
type Inverter struct {
	ID, Maker, Model string
	Quantity         int64 // 1 where not stated
	ACRatedW         *quantity.Exact
	MaxDCPowerW      *quantity.Exact
	MaxDCPowerIs     string // PowerLimit (the default), PowerAdvice
	MaxDCVoltageV    quantity.Exact
	StartVoltageV    *quantity.Exact
	BackFeedA        *quantity.Exact
	Trackers         []Tracker
}

// Tracker is one MPPT input group.
type Tracker struct {
	ID                       string
	MPPTMinV, MPPTMaxV       quantity.Exact
	FullPowerMinV            *quantity.Exact
	FullPowerMaxV            *quantity.Exact
	Inputs                   int64
	MaxInputCurrentA         quantity.Exact
	MaxInputPerInputA        *quantity.Exact // max_input_current_per_input_a
	MaxShortCircuitA         *quantity.Exact // max_short_circuit_current_a
	MaxShortCircuitPerInputA *quantity.Exact // max_short_circuit_current_per_input_a
	StringFuseA              *quantity.Exact
}

// Plane is one roof plane.
type Plane struct {
	ID, Module     string
	Positions      int64
	HotCellRise    Difference // hot_cell_rise_c
	TiltDeg        *quantity.Exact
	AzimuthDeg     *quantity.Exact
	CurrentGainPct *quantity.Exact // nil: not stated, which counts as 0
}

// Allowances are margins that the designer adds. nil is not stated: 0, 0 and 3 °C.
type Allowances struct {
	HotVoltagePct, ColdVoltagePct *quantity.Exact
	HeadroomC                     *Difference // headroom_c
}

// OtherLimit is another rated part in the DC circuit.
type OtherLimit struct {
	Name        string
	MaxVoltageV quantity.Exact
	Source      string
}

// StringEntry is what is wired: equal strings of one plane on one tracker.
type StringEntry struct {
	Inverter          string
	Unit              int64
	Tracker           string
	Plane             string
	ModulesInSeries   int64
	StringsInParallel int64
}

// Job is what the title strip of the sheet says.
type Job struct {
	Client, Address, Authority, PermitNumber, Preparer, Licence, Note string
}

// Source says where a value came from.
type Source struct{ Pointer, From string }

// Answer closes a question while the values it was asked about stand.
type Answer struct {
	Pointer    string
	ValueAsked Asked
	Reason     string
}

// Asked is the value an answer was given for: canonical JSON of it, numbers
// normalised (12.0 is 12), members in the order of their names.
type Asked string

// Module returns the module with the id, nil if there is none; the reader refuses dangling ids.
func (d *Design) Module(id string) *Module {
	for i := range d.Modules {
		if d.Modules[i].ID == id {
			return &d.Modules[i]
		}
	}
	return nil
}
