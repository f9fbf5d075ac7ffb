package views

// WorkingPage is the whole arithmetic of one design on one page that prints.
type WorkingPage struct {
	Title      string
	Verdict    Verdict
	Headline   string
	Tally      string
	Basis      []Row // site, code, method, allowances
	Rounding   string
	Coldest    []string
	Symbols    []Symbol
	Ceilings   []Ceiling
	Limits     []LimitWorking
	Kinds      []CheckKind // in the order of the method
	Questions  []Question
	Answered   []Row // questions that a reason closed
	NotChecked []string
}

// Symbol explains one symbol of the working.
type Symbol struct{ Symbol, Meaning string }

// Ceiling is the named list of limits under which the cold voltage must stay.
type Ceiling struct {
	Where   string
	Entries []CeilingEntry
}

// CeilingEntry is one limit of the list.
type CeilingEntry struct {
	From, Value, Source string
	Governs             bool
}

// LimitWorking is one row of limits with the steps that lead to it.
type LimitWorking struct {
	Fit   Fit
	Steps []Step
	Cites string
}
