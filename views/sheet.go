package views

// SheetPage is the stringing sheet of one design as it prints.
type SheetPage struct {
	Title       string
	Mark        string // "DRAFT, not saved or released"
	Verdict     Verdict
	Headline    string
	Tally       string
	Job         []Row
	Basis       []Row
	Rounding    string
	Coldest     []string
	Equipment   []Equipment
	Ceilings    []Ceiling
	Schedule    []ScheduleRow
	Totals      []TotalRow
	Reconciled  string // whether planes, strings and inverters come to the same count
	Symbols     []Symbol
	Governing   []CheckKind // one check of each kind, the governing one, with its working
	Questions   []Question
	NotChecked  []string
	Cautions    []Caution
	SignatureOf []string // a line to sign for each
}

// Equipment is one table of values used, each with where it came from.
type Equipment struct {
	Caption string
	Rows    []Row
}

// ScheduleRow is one strings entry.
type ScheduleRow struct {
	Number, Plane, Faces, Inverter, Tracker string
	InSeries, Parallel, Modules             string
	VocCold, VmpSTC, VmpHot, MaxCurrent     string
	Verdict                                 Verdict
}

// TotalRow is a total of the schedule for one plane, tracker, inverter or all.
type TotalRow struct {
	Of, Strings, Modules, Power, Note string
}
