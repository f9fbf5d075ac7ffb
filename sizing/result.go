package sizing

import (
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// ResultFormat is the value of the field "format" of every result.
const ResultFormat = "rimeline-result/1"

// Result is everything that [Size] found. It is the same, to the byte of its JSON, for the same design.
type Result struct {
	Verdict   working.Verdict // the worst of Checks
	Limits    []Limit         // planes outermost, then inverters, then trackers, in the design's order
	Strings   []StringResult  // one for each strings entry, in the design's order
	Checks    []working.Check
	Questions []working.Question
}

// CeilingEntry is one of the named limits under which the cold voltage must stay.
type CeilingEntry struct {
	From    string // "inverter", "module", "structure" or the other limit's name
	MaxV    quantity.Exact
	Source  string // clause, "datasheet", or what the document says
	Pointer string // where the document states it, "" for a code's
	Governs bool   // it is the lowest, or one of the lowest at a tie
}

// Limit says what one tracker can take from one plane.
type Limit struct {
	Plane, Inverter, Tracker string

	VoltageCeilingV    quantity.Exact
	VoltageCeilingFrom string // at a tie the first of inverter, module, structure, other limits
	Ceiling            []CeilingEntry

	ModuleVocColdV  quantity.Exact
	ModuleVmpHotV   quantity.Exact
	MaxModules      int64
	MinModules      *int64 // nil where one module's hot voltage is not above 0
	MinModulesStart *int64 // nil where no start voltage is stated
	MaxStrings      int64
	MaxStringsFrom  string // "inputs", "short-circuit" or "inputs-unconfirmed"

	// ReachedAtC is the temperature at which MaxModules modules would meet the
	// ceiling; nil below −60 °C, or where no row of the table breaks it.
	ReachedAtC *quantity.Exact
	Cites      []string
	Steps      []working.Step // the working of the numbers above
}

// StringResult is what one strings entry comes to.
type StringResult struct {
	Inverter          string
	Unit              int64
	Tracker           string
	Plane             string
	ModulesInSeries   int64
	StringsInParallel int64

	VocColdV, VmpSTCV, VmpHotV quantity.Exact
	MaxCurrentA                quantity.Exact  // Isc with gain × 1.25 × strings in parallel
	Verdict                    working.Verdict // the worst about the entry, its tracker, its plane and its inverter unit
}
