package sizing

import (
	"rimeline/sizing/quantity"
	"rimeline/sizing/stringing"
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

// Limit says what one tracker can take from one plane.
type Limit = stringing.Limit

// CeilingEntry is one of the named limits under which the cold voltage must stay.
type CeilingEntry = stringing.CeilingEntry

// StringResult is what one strings entry comes to.
type StringResult struct {
	Inverter          string
	Unit              int64
	Tracker           string
	Plane             string
	ModulesInSeries   int64
	StringsInParallel int64

	VocColdV, VmpSTCV, VmpHotV quantity.Exact
	VocSTCV, VocHotV           quantity.Exact  // for reading a meter and for the chart; judged only against a start voltage
	MaxCurrentA                quantity.Exact  // Isc with gain × 1.25 × strings in parallel
	Verdict                    working.Verdict // the worst about the entry, its tracker, its plane and its inverter unit
}

// LeastHeadroomC returns the least distance, in °C, between the coldest temperature
// and one at which a string would meet its ceiling; nil where no string has one.
func (r *Result) LeastHeadroomC() *quantity.Exact {
	var least *quantity.Exact
	for i := range r.Checks {
		if c := &r.Checks[i]; c.ID == "headroom" && c.Value != nil && (least == nil || c.Value.Less(*least)) {
			least = c.Value
		}
	}
	return least
}
