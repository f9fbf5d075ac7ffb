package tests

// The oracle says what a result must be. It knows the format page and nothing of
// the rooms under sizing: it reads the JSON of a design and follows the page in
// plain rational arithmetic. Where it and the engine differ, one of them is wrong.

import (
	"encoding/json"
	"fmt"
	"math/big"
	"strconv"
	"strings"
)

// number is a JSON number as an exact rational. Rat is nil where the document
// states none, or null.
type number struct {
	*big.Rat
	text string // as the JSON has it
}

func (n *number) UnmarshalJSON(b []byte) error {
	n.text = string(b)
	if n.text == "null" {
		return nil
	}
	if n.Rat = plainDecimal(n.text); n.Rat != nil {
		return nil
	}
	r, ok := new(big.Rat).SetString(n.text)
	if !ok {
		return fmt.Errorf("%s is not a number", b)
	}
	n.Rat = r
	return nil
}

// plainDecimal reads a short decimal without an exponent, which most are; nil if
// it is anything else.
func plainDecimal(text string) *big.Rat {
	digits, decimals, _ := strings.Cut(text, ".")
	if len(text) > 16 {
		return nil
	}
	whole, err := strconv.ParseInt(digits+decimals, 10, 64)
	if err != nil {
		return nil
	}
	scale := int64(1)
	for range decimals {
		scale *= 10
	}
	return big.NewRat(whole, scale)
}

// temperature is a temperature in °C, whatever its unit in the document.
type temperature struct{ number }

func (t *temperature) UnmarshalJSON(b []byte) error {
	fahrenheit, err := t.readWithUnit(b)
	if fahrenheit {
		t.Rat = times(minus(t.Rat, rat("32")), rat("5/9"))
	}
	return err
}

// difference is a difference of temperatures in °C, whatever its unit in the document.
type difference struct{ number }

func (d *difference) UnmarshalJSON(b []byte) error {
	fahrenheit, err := d.readWithUnit(b)
	if fahrenheit {
		d.Rat = times(d.Rat, rat("5/9"))
	}
	return err
}

// readWithUnit reads a bare number or {"value", "unit"}.
func (n *number) readWithUnit(b []byte) (fahrenheit bool, err error) {
	if len(b) == 0 || b[0] != '{' {
		return false, n.UnmarshalJSON(b)
	}
	var v struct {
		Value number
		Unit  string
	}
	if err := json.Unmarshal(b, &v); err != nil {
		return false, err
	}
	*n = v.Value
	return v.Unit == "°F", nil
}

// coefficient is a temperature coefficient as stated; Value.Rat is nil where it is not.
type coefficient struct {
	Value number
	Unit  string
}

func (c coefficient) stated() bool { return c.Value.Rat != nil }

// perC is the coefficient in the unit of the rated value (V, A, W) per °C.
func (c coefficient) perC(rated *big.Rat) *big.Rat {
	switch quantity, _, _ := strings.Cut(c.Unit, "/"); quantity {
	case "%":
		return over(times(c.Value.Rat, rated), hundred)
	case "mV", "mA":
		return over(c.Value.Rat, rat("1000"))
	default: // V, A, W
		return c.Value.Rat
	}
}

// percent is the coefficient in %/°C of the rated value.
func (c coefficient) percent(rated *big.Rat) *big.Rat {
	return over(times(hundred, c.perC(rated)), rated)
}

type oracleModule struct {
	ID               string      `json:"id"`
	Technology       string      `json:"technology"`
	Cells            number      `json:"cells_in_series"`
	Pmax             number      `json:"pmax_w"`
	Voc              number      `json:"voc_v"`
	Isc              number      `json:"isc_a"`
	Vmp              number      `json:"vmp_v"`
	Imp              number      `json:"imp_a"`
	VocCoeff         coefficient `json:"voc_temp_coeff"`
	IscCoeff         coefficient `json:"isc_temp_coeff"`
	PmaxCoeff        coefficient `json:"pmax_temp_coeff"`
	VmpCoeff         coefficient `json:"vmp_temp_coeff"`
	MaxSystemVoltage number      `json:"max_system_voltage_v"`
	MaxSeriesFuse    number      `json:"max_series_fuse_a"`
	IscMarkedMax     number      `json:"isc_marked_max_a"`
	Bifaciality      number      `json:"bifaciality"`
	Length           number      `json:"length_mm"`
	Width            number      `json:"width_mm"`
}

type oracleTracker struct {
	ID                     string `json:"id"`
	MPPTMin                number `json:"mppt_min_v"`
	MPPTMax                number `json:"mppt_max_v"`
	FullPowerMin           number `json:"full_power_min_v"`
	FullPowerMax           number `json:"full_power_max_v"`
	Inputs                 number `json:"inputs"`
	MaxInputCurrent        number `json:"max_input_current_a"`
	MaxInputPerInput       number `json:"max_input_current_per_input_a"`
	MaxShortCircuit        number `json:"max_short_circuit_current_a"`
	MaxShortCircuitAnInput number `json:"max_short_circuit_current_per_input_a"`
	StringFuse             number `json:"string_fuse_a"`
}

type oracleInverter struct {
	ID           string          `json:"id"`
	MaxDCPower   number          `json:"max_dc_power_w"`
	MaxDCPowerIs string          `json:"max_dc_power_is"`
	MaxDCVoltage number          `json:"max_dc_voltage_v"`
	StartVoltage number          `json:"start_voltage_v"`
	BackFeed     number          `json:"back_feed_a"`
	Trackers     []oracleTracker `json:"trackers"`
}

type oraclePlane struct {
	ID          string     `json:"id"`
	Module      string     `json:"module"`
	Positions   number     `json:"positions"`
	HotCellRise difference `json:"hot_cell_rise_c"`
	Tilt        number     `json:"tilt_deg"`
	Azimuth     number     `json:"azimuth_deg"`
	CurrentGain number     `json:"current_gain_pct"`
}

type oracleEntry struct {
	Inverter string `json:"inverter"`
	Unit     number `json:"unit"`
	Tracker  string `json:"tracker"`
	Plane    string `json:"plane"`
	Modules  number `json:"modules_in_series"`
	Strings  number `json:"strings_in_parallel"`
}

type oracleDesign struct {
	Rulebook          string `json:"rulebook"`
	VoltageMethod     string `json:"voltage_method"`
	ShortCircuitBasis string `json:"short_circuit_basis"`
	Site              struct {
		Structure    string      `json:"structure"`
		Elevation    number      `json:"elevation_m"`
		Coldest      temperature `json:"coldest_c"`
		ColdestBasis string      `json:"coldest_basis"`
		Hottest      temperature `json:"hottest_c"`
	} `json:"site"`
	Modules    []oracleModule   `json:"modules"`
	Inverters  []oracleInverter `json:"inverters"`
	Planes     []oraclePlane    `json:"planes"`
	Allowances struct {
		HotVoltage  number     `json:"hot_voltage_pct"`
		ColdVoltage number     `json:"cold_voltage_pct"`
		Headroom    difference `json:"headroom_c"`
	} `json:"allowances"`
	OtherLimits []struct {
		Name       string `json:"name"`
		MaxVoltage number `json:"max_voltage_v"`
	} `json:"other_limits"`
	Strings []oracleEntry `json:"strings"`
	Answers []struct {
		Pointer    string          `json:"pointer"`
		ValueAsked json.RawMessage `json:"value_asked"`
	} `json:"answers"`

	// modulesAsWritten are the modules as the document has them, for the answers.
	modulesAsWritten []map[string]json.RawMessage
}

func readOracleDesign(text []byte) (*oracleDesign, error) {
	var d oracleDesign
	if err := json.Unmarshal(text, &d); err != nil {
		return nil, err
	}
	var written struct{ Modules []map[string]json.RawMessage }
	if len(d.Answers) > 0 {
		if err := json.Unmarshal(text, &written); err != nil {
			return nil, err
		}
	}
	d.modulesAsWritten = written.Modules
	return &d, nil
}

// place names what a check is about, so that it can be the key of a map.
type place string

func entryPlace(i int) place { return place(fmt.Sprintf("string %d", i)) }
func trackerPlace(inverter, unit, tr string) place {
	return place(fmt.Sprintf("tracker %q %s %q", inverter, unit, tr))
}
func unitPlace(inverter, unit string) place { return place(fmt.Sprintf("unit %q %s", inverter, unit)) }
func planePlace(plane string) place         { return place(fmt.Sprintf("plane %q", plane)) }

const designPlace place = "design"

// verdict is ordered from best to worst.
type verdict int

const (
	within verdict = iota
	caution
	unconfirmed
	outside
)

func (v verdict) String() string {
	return [...]string{"within", "caution", "unconfirmed", "outside"}[v]
}

// oracleCheck is one check as the format page says it must come out.
type oracleCheck struct {
	id      string
	about   place
	verdict verdict

	// measured: the page says what value and limit are; nil is then "must be null".
	measured     bool
	value, limit *big.Rat
	reachedAt    *big.Rat
}

// oracleLimits is one row of limits[]; nil is null.
type oracleLimits struct {
	plane, inverter, tracker                    string
	ceiling                                     *big.Rat
	ceilingFrom                                 string
	vocCold, vmpHot                             *big.Rat
	maxModules, minModules, minStart, maxString *big.Rat
	maxStringsFrom                              string
}

type oracleString struct {
	vocCold, vmpSTC, vmpHot, maxCurrent *big.Rat
	verdict                             verdict
}

type oracleQuestion struct {
	pointer string
	unsafe  bool
	module  int
	restsOn []string // fields of the module whose values an answer must state
}

type oracleResult struct {
	verdict   verdict
	limits    []oracleLimits
	strings   []oracleString
	checks    []oracleCheck
	questions []oracleQuestion
}

// The arithmetic, each with a new result. The constants are shared and never written to.

var (
	zero    = rat("0")
	one     = rat("1")
	hundred = rat("100")
	stcC    = rat("25") // cell temperature of the rated values, °C
)

func rat(s string) *big.Rat {
	r, ok := new(big.Rat).SetString(s)
	if !ok {
		panic("not a rational number: " + s)
	}
	return r
}

func plus(a, b *big.Rat) *big.Rat  { return new(big.Rat).Add(a, b) }
func minus(a, b *big.Rat) *big.Rat { return new(big.Rat).Sub(a, b) }
func times(a, b *big.Rat) *big.Rat { return new(big.Rat).Mul(a, b) }
func over(a, b *big.Rat) *big.Rat  { return new(big.Rat).Quo(a, b) }

func exceeds(a, b *big.Rat) bool { return a.Cmp(b) > 0 }
func positive(a *big.Rat) bool   { return a != nil && a.Sign() > 0 }

func larger(a, b *big.Rat) *big.Rat {
	if exceeds(b, a) {
		return b
	}
	return a
}

// orElse is the number, or what stands for it where it is not stated.
func (n number) orElse(s string) *big.Rat {
	if n.Rat == nil {
		return rat(s)
	}
	return n.Rat
}

// roundDown is the greatest whole number that is not above x.
func roundDown(x *big.Rat) *big.Rat {
	return new(big.Rat).SetInt(new(big.Int).Div(x.Num(), x.Denom())) // Div is Euclidean; the denominator is positive
}

// roundUp is the least whole number that is not below x.
func roundUp(x *big.Rat) *big.Rat {
	return new(big.Rat).Neg(roundDown(new(big.Rat).Neg(x)))
}

// onTop is x × (1 + pct ÷ 100).
func onTop(x, pct *big.Rat) *big.Rat {
	return times(x, plus(one, over(pct, hundred)))
}
