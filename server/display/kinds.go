package display

import (
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// kind is how the checks of one id are told.
type kind struct {
	id    string
	title string
	asks  string // what it judges, as a question
	// atLeast is true where the value must reach the limit; else it must not exceed it.
	atLeast bool
	says    func(c *composer, k *working.Check) string
	limit   func(c *composer, k *working.Check) string // where the limit comes from; nil: nothing to say
}

// kinds are in the order in which a reviewer follows the work.
var kinds = []kind{
	{id: "voltage-ceiling", title: "Cold voltage",
		asks: "Does the open-circuit voltage of the coldest morning stay under every limit?",
		says: (*composer).voltageCeiling, limit: (*composer).ceilingNamed},
	{id: "headroom", title: "Headroom below the coldest",
		asks: "How much colder must it get before the ceiling is met?", atLeast: true,
		says: (*composer).headroom, limit: (*composer).headroomAsked},
	{id: "method-difference", title: "The other method",
		asks: "Would the cold-voltage method that was not chosen break the ceiling?",
		says: (*composer).methodDifference, limit: (*composer).ceilingNamed},
	{id: "cold-validity", title: "Validity of the cold voltage",
		asks: "Is the method used where it holds?",
		says: (*composer).coldValidity},
	{id: "hot-minimum", title: "Hot operating voltage",
		asks: "Does the string stay in the tracker's window on the hottest roof?", atLeast: true,
		says: (*composer).hotMinimum, limit: trackerLimit("mppt_min_v")},
	{id: "start", title: "Start",
		asks: "Does the inverter start on a hot roof?", atLeast: true,
		says: (*composer).start, limit: inverterLimit("start_voltage_v")},
	{id: "full-power-low", title: "Full power when hot",
		asks: "Is the hot operating voltage high enough for full power?", atLeast: true,
		says: (*composer).fullPowerLow, limit: trackerLimit("full_power_min_v")},
	{id: "full-power-high", title: "Full power when cold",
		asks: "Is the cold operating voltage low enough for full power?",
		says: (*composer).fullPowerHigh, limit: trackerLimit("full_power_max_v")},
	{id: "cold-upper", title: "Cold operating voltage",
		asks: "Does the string stay in the tracker's window on the coldest morning?",
		says: (*composer).coldUpper, limit: trackerLimit("mppt_max_v")},
	{id: "short-circuit", title: "Short-circuit current",
		asks: "Does the tracker withstand the strings' short-circuit current?",
		says: (*composer).shortCircuit, limit: trackerLimit("max_short_circuit_current_a")},
	{id: "operating-current", title: "Operating current",
		asks: "Can the tracker use the strings' current?",
		says: (*composer).operatingCurrent, limit: trackerLimit("max_input_current_a")},
	{id: "current-basis", title: "Basis of the current",
		asks: "Is light on the modules' back counted?",
		says: (*composer).currentBasis},
	{id: "inputs", title: "Inputs",
		asks: "Is there an input for every string?",
		says: (*composer).inputs, limit: trackerLimit("inputs")},
	{id: "back-feed", title: "Back-feed and string fuses",
		asks: "What can the other strings feed into a failed one, and does that call for fuses?",
		says: (*composer).backFeed, limit: (*composer).seriesFuse},
	{id: "unequal-strings", title: "Unequal strings",
		asks: "Do the strings in parallel have one cold voltage?",
		says: (*composer).unequalStrings},
	{id: "planes-mixed", title: "Planes in parallel",
		asks: "Do the strings in parallel face one way?",
		says: (*composer).planesMixed},
	{id: "places", title: "Places",
		asks: "Has every module a place on the plane?",
		says: (*composer).places, limit: (*composer).positions},
	{id: "dc-power", title: "DC power",
		asks: "Does the inverter permit the modules' power?",
		says: (*composer).dcPower, limit: inverterLimit("max_dc_power_w")},
	{id: "nothing-strung", title: "Strings",
		asks: "What is wired?",
		says: func(*composer, *working.Check) string {
			return "No string is entered yet, so there is nothing to judge."
		}},
}

// kindOf returns how checks of an id are told; an id that is not known is told by its numbers.
func kindOf(id string) (kind, int) {
	for i := range kinds {
		if kinds[i].id == id {
			return kinds[i], i
		}
	}
	return kind{id: id, title: capital(id), says: (*composer).plainly}, len(kinds)
}

func (c *composer) plainly(k *working.Check) string {
	switch {
	case k.Value == nil:
		return "Judged without a number."
	case k.Limit == nil:
		return statedIn(*k.Value, k.Unit) + "; there is no limit to hold it against."
	}
	return statedIn(*k.Value, k.Unit) + ", held against " + statedIn(*k.Limit, k.Unit) + "."
}

// under tells a value that must not exceed its limit: how far it is under it, or over.
func under(k *working.Check) string {
	gap := k.Limit.Sub(*k.Value)
	if gap.Sign() < 0 {
		return gapText(gap.Neg(), k.Unit, quantity.Up) + " over"
	}
	return gapText(gap, k.Unit, quantity.Down) + " under"
}

// above tells a value that must reach its limit.
func above(k *working.Check) string {
	gap := k.Value.Sub(*k.Limit)
	if gap.Sign() < 0 {
		return gapText(gap.Neg(), k.Unit, quantity.Up) + " short of"
	}
	return gapText(gap, k.Unit, quantity.Down) + " above"
}

func gapText(gap quantity.Exact, unit string, dir quantity.Direction) string {
	return withUnit(shown(gap, placesOf(unit), dir), unit)
}

// limitOf returns the limit with its digits as stated.
func limitOf(k *working.Check) string { return statedIn(*k.Limit, k.Unit) }

func broken(k *working.Check, atLeast bool) bool {
	if k.Value == nil || k.Limit == nil {
		return false
	}
	if atLeast {
		return k.Value.Less(*k.Limit)
	}
	return k.Limit.Less(*k.Value)
}

func (c *composer) voltageCeiling(k *working.Check) string {
	s := stringVolts(*k.Value, quantity.Up) + " open-circuit on the coldest morning: "
	if broken(k, false) {
		s += under(k) + " the ceiling of " + limitOf(k) + ". Such a string must not be connected."
	} else {
		share := k.Limit.Sub(*k.Value).Quo(*k.Limit).Mul(quantity.Int(100))
		s += gapText(k.Limit.Sub(*k.Value), k.Unit, quantity.Down) + " (" + withUnit(shown(share, placesPercent, quantity.Down), "%") + ") under the ceiling of " + limitOf(k) + "."
	}
	return s + " " + c.reached(k) + c.mostModules(k)
}

// reached tells the temperature at which the string meets the ceiling.
func (c *composer) reached(k *working.Check) string {
	switch {
	case k.ReachedAtC != nil:
		return "It " + c.reachedWords(*k.ReachedAtC) + "."
	case !c.byTable():
		return "It would meet it only below " + wholeDegrees(-60) + "."
	case broken(k, false):
		return "It exceeds it in every row of the table."
	}
	return "No row of the table, down to " + wholeDegrees(-40) + ", exceeds it."
}

// reachedWords tells a temperature at which the ceiling is met, and how far from the coldest that is.
func (c *composer) reachedWords(at quantity.Exact) string {
	if c.byTable() {
		return "keeps under it, by the table, down to " + degrees(at, quantity.Up)
	}
	gap := c.d.Site.Coldest.Celsius().Sub(at)
	switch gap.Sign() {
	case -1:
		return "meets it at " + degrees(at, quantity.Up) + " already, " + degreesApart(gap.Neg(), quantity.Up) + " above the coldest"
	case 0:
		return "meets it at the coldest itself, " + degrees(at, quantity.Up)
	}
	return "would meet it at " + degrees(at, quantity.Up) + ", " + degreesApart(gap, quantity.Down) + " below the coldest"
}

func (c *composer) byTable() bool { return c.d.VoltageMethod == design.MethodTable }

// mostModules says how many modules would fit where the string is too long.
func (c *composer) mostModules(k *working.Check) string {
	row := c.limitOfString(k.About.String)
	if row == nil || !broken(k, false) {
		return ""
	}
	if row.MaxModules == 0 {
		return " Not one module fits."
	}
	return " At most " + countModules(row.MaxModules) + " stay under it."
}

func (c *composer) fewestModules(fewest *int64, k *working.Check) string {
	if !broken(k, true) {
		return ""
	}
	if fewest == nil {
		return " No number of modules reaches it."
	}
	return " At least " + countModules(*fewest) + " are needed."
}

func (c *composer) headroom(k *working.Check) string {
	wished := withUnit(stated(*k.Limit), "°C")
	if k.Value == nil || k.ReachedAtC == nil {
		switch {
		case !c.byTable():
			return "The ceiling would be met only below " + wholeDegrees(-60) + "; " + wished + " of headroom are asked for."
		case k.Verdict == working.Caution:
			return "There is none: every row of the table exceeds the ceiling."
		}
		return "No row of the table, down to " + wholeDegrees(-40) + ", exceeds the ceiling."
	}
	if k.Value.Sign() < 0 {
		return "There is none: the ceiling is met " + degreesApart(k.Value.Neg(), quantity.Up) + " above the coldest already."
	}
	return degreesApart(*k.Value, quantity.Down) + " colder than the coldest; " + wished + " are asked for."
}

func (c *composer) otherMethod() string {
	switch {
	case c.byTable():
		return "the module's coefficient"
	case isNEC(c.d):
		return "Table" + nbsp + "690.7(A)"
	}
	return "the table of cold-voltage factors"
}

func (c *composer) methodDifference(k *working.Check) string {
	if k.Value == nil {
		return "There is no other method here to compare with."
	}
	s := "By " + c.otherMethod() + " the same string comes to " + stringVolts(*k.Value, quantity.Up) + ", "
	switch {
	case !broken(k, false):
		return s + under(k) + " the ceiling as well."
	case k.Verdict == working.Caution:
		return s + under(k) + " the ceiling of " + limitOf(k) + ". A reviewer who takes that method will object."
	}
	return s + under(k) + " the ceiling of " + limitOf(k) + "."
}

func (c *composer) coldValidity(k *working.Check) string {
	if len(k.Reasons) > 0 {
		return "The method is used where its validity is in question."
	}
	s := "Crystalline silicon, no colder than " + wholeDegrees(-40) + ", a named statistic"
	if c.d.Site.ElevationM == nil {
		return s + ". The elevation is not stated; above 2000" + nbsp + "m an inverter's limit may be lower."
	}
	return s + ", no higher than 2000" + nbsp + "m."
}

func (c *composer) hotMinimum(k *working.Check) string {
	s := stringVolts(*k.Value, quantity.Down) + " operating on the hottest roof: " + above(k) + " the tracker's minimum of " + limitOf(k) + "."
	if row := c.limitOfString(k.About.String); row != nil {
		s += c.fewestModules(row.MinModules, k)
	}
	return s
}

func (c *composer) start(k *working.Check) string {
	s := stringVolts(*k.Value, quantity.Down) + " open-circuit on the hottest roof: " + above(k) + " the start voltage of " + limitOf(k) + "."
	if row := c.limitOfString(k.About.String); row != nil {
		s += c.fewestModules(row.MinModulesStart, k)
	}
	return s
}

const losesPower = " Power is lost; nothing is harmed."

func (c *composer) fullPowerLow(k *working.Check) string {
	s := stringVolts(*k.Value, quantity.Down) + " operating on the hottest roof: " + above(k) + " the " + limitOf(k) + " from which full power is given."
	if broken(k, true) {
		s += losesPower
	}
	return s
}

func (c *composer) fullPowerHigh(k *working.Check) string {
	s := stringVolts(*k.Value, quantity.Up) + " operating on the coldest morning: " + under(k) + " the " + limitOf(k) + " up to which full power is given."
	if broken(k, false) {
		s += losesPower
	}
	return s
}

func (c *composer) coldUpper(k *working.Check) string {
	s := stringVolts(*k.Value, quantity.Up) + " operating on the coldest morning: " + under(k) + " the tracker's maximum of " + limitOf(k) + "."
	if broken(k, false) {
		s += " The string runs outside the window until it warms up; power is lost."
	}
	return s
}

func (c *composer) operatingCurrent(k *working.Check) string {
	s := amperes(*k.Value, quantity.Up) + " operating in full sun: " + under(k) + " the " + limitOf(k) + " that the tracker can use."
	if broken(k, false) {
		s += " The inverter holds the current down: energy is lost, nothing is harmed."
	}
	return s
}

func (c *composer) shortCircuit(k *working.Check) string {
	basis := "Isc × 1.25"
	if c.d.ShortCircuitBasis == design.BasisRated {
		basis = "Isc without the 1.25"
	}
	s := amperes(*k.Value, quantity.Up) + " short-circuit (" + basis + ", all strings together)"
	if k.Limit == nil {
		return s + "; there is no limit to hold it against."
	}
	return s + ": " + under(k) + " the tracker's limit of " + limitOf(k) + "."
}

func (c *composer) inputs(k *working.Check) string {
	s := countedExact(*k.Value, "string", "strings") + " on " + countedExact(*k.Limit, "input", "inputs")
	if broken(k, false) {
		return s + ": " + stated(k.Value.Sub(*k.Limit)) + " too many."
	}
	return s + "."
}

func (c *composer) backFeed(k *working.Check) string {
	if k.Value == nil || k.Value.IsZero() {
		return "Nothing can feed back into it: no other string shares its tracker."
	}
	s := "The other strings could feed " + amperes(*k.Value, quantity.Up) + " into one that fails"
	if k.Limit == nil {
		return s + "; the module's maximum series fuse is not stated, so whether a fuse is needed is open."
	}
	if !broken(k, false) {
		return s + ": " + under(k) + " the " + limitOf(k) + " of its modules' maximum series fuse. The modules call for no string fuse; whether the conductors do is not checked here."
	}
	s += ": " + under(k) + " the " + limitOf(k) + " of its modules' maximum series fuse, so each string needs a fuse"
	if least := stepValue(k, "Ifuse,min"); least != nil {
		between := "at least " + amperes(*least, quantity.Up) + " and at most " + limitOf(k)
		if k.Limit.Less(*least) {
			s += "; none can be " + between
		} else {
			s += " of " + between
		}
	}
	if t := c.trackerOfString(k.About.String); t != nil && t.StringFuseA != nil {
		return s + ". Stated is " + statedIn(*t.StringFuseA, "A") + "."
	}
	return s + "."
}

// stepValue returns the value of the step with a symbol, nil if there is none.
func stepValue(k *working.Check, symbol string) *quantity.Exact {
	for i := range k.Steps {
		if k.Steps[i].Symbol == symbol {
			return &k.Steps[i].Value
		}
	}
	return nil
}

func (c *composer) unequalStrings(k *working.Check) string {
	switch {
	case k.Value == nil:
		return "The tracker carries one kind of string."
	case k.Value.IsZero():
		return "All strings on it have one cold open-circuit voltage."
	}
	return "The strings in parallel differ by " + stringVolts(*k.Value, quantity.Up) + " open-circuit on the coldest morning."
}

func (c *composer) planesMixed(k *working.Check) string {
	switch {
	case hasReason(k, "angle-not-stated"):
		return "Strings of different planes share the tracker, and an angle is missing."
	case hasReason(k, "planes-differ"):
		return "Strings of planes that face different ways share the tracker."
	}
	return "All strings on it face one way."
}

func hasReason(k *working.Check, code string) bool {
	for _, r := range k.Reasons {
		if r.Code == code {
			return true
		}
	}
	return false
}

func (c *composer) places(k *working.Check) string {
	s := countedExact(*k.Value, "module", "modules") + " on " + countedExact(*k.Limit, "place", "places")
	switch left := k.Limit.Sub(*k.Value); left.Sign() {
	case -1:
		return s + ": " + stated(left.Neg()) + " too many."
	case 1:
		return s + ": " + countedExact(left, "place stays", "places stay") + " empty."
	}
	return s + ": every place is used."
}

func (c *composer) dcPower(k *working.Check) string {
	s := withUnit(shown(*k.Value, placesWatt, quantity.Up), "W") + " of modules at STC: " + under(k) + " the " + limitOf(k)
	if v := c.inverterByID(k.About.Inverter); v != nil && v.MaxDCPowerIs == design.PowerAdvice {
		return s + " that the maker advises."
	}
	return s + " that the inverter permits."
}

func (c *composer) currentBasis(k *working.Check) string {
	if len(k.Reasons) > 0 {
		return "A bifacial module is counted with the light on its front alone."
	}
	for _, s := range c.d.Strings {
		if s.Inverter != k.About.Inverter || s.Unit != k.About.Unit || s.Tracker != k.About.Tracker {
			continue
		}
		p := c.planeByID(s.Plane)
		if p == nil {
			continue
		}
		if m := c.d.Module(p.Module); m != nil && (m.IscMarkedMaxA != nil || p.CurrentGainPct != nil && p.CurrentGainPct.Sign() > 0) {
			return "The stated gain or the marked maximum is in the currents."
		}
	}
	return "The modules are not stated to be bifacial, so their front alone counts."
}

// Where limits come from.

func trackerLimit(leaf string) func(*composer, *working.Check) string {
	return func(c *composer, k *working.Check) string {
		return c.statedOf(k, c.subject(k.About).tracker+"/"+leaf)
	}
}

func inverterLimit(leaf string) func(*composer, *working.Check) string {
	return func(c *composer, k *working.Check) string {
		return c.statedOf(k, c.subject(k.About).inverter+"/"+leaf)
	}
}

func (c *composer) positions(k *working.Check) string {
	return c.statedOf(k, c.subject(k.About).plane+"/positions")
}

func (c *composer) seriesFuse(k *working.Check) string {
	return c.statedOf(k, c.subject(k.About).module+"/max_series_fuse_a")
}

func (c *composer) headroomAsked(k *working.Check) string {
	const pointer = "/allowances/headroom_c"
	if c.d.Allowances.HeadroomC == nil {
		return c.call(pointer) + " " + withUnit(stated(*k.Limit), "°C") + ", used where none is stated"
	}
	return c.statedOf(k, pointer)
}

// statedOf tells a value of the document with its name and its source.
func (c *composer) statedOf(k *working.Check, pointer string) string {
	f, known := c.field(pointer)
	if !known {
		return ""
	}
	value := f.value
	if value == "" {
		value = "not stated"
	}
	s := c.subject(k.About).call(f) + " " + value
	if from := source(c.d, pointer); from != "" {
		s += " (" + from + ")"
	}
	return s
}

// ceilingNamed lists the limits that the ceiling is the lowest of.
func (c *composer) ceilingNamed(k *working.Check) string {
	row := c.limitOfString(k.About.String)
	if row == nil || k.Limit == nil {
		return ""
	}
	words := make([]string, len(row.Ceiling))
	for i, e := range row.Ceiling {
		words[i] = c.ceilingName(e.From) + " " + statedIn(e.MaxV, "V")
		if e.Source != "" {
			words[i] += " (" + e.Source + ")"
		}
	}
	return limitOf(k) + ", the lowest of " + list(words)
}
