package views

// SheetPage is the stringing sheet of one design as it prints.
type SheetPage struct {
	Title      string
	Site       string
	Mark       string // "DRAFT, not saved or released"
	Saved      bool   // it shows a revision, and says so at the foot of each page of paper
	Verdict    Verdict
	Headline   string
	Tally      string
	Job        []Row // the value is "" where a line is left to write on
	Basis      []Row
	Rounding   string
	Coldest    []string
	Equipment  []Equipment
	Ceilings   []Ceiling
	Schedule   []ScheduleRow
	Totals     []TotalRow
	Reconciled string // whether planes, trackers and inverters come to the same count
	Labels     []Row  // what the equipment's labels must say
	Symbols    []Symbol
	Governing  []CheckKind // of each kind the case that governs, with its working
	Questions  []Question
	Answered   []Row // questions that a reason closed
	NotChecked []string
	Cautions   []Caution
	Signatures []string // a line to sign for each
}

// Equipment is one table of values used, each with where it came from.
type Equipment struct {
	Caption   string
	Rows      []Row
	NotStated string // names of values that the document leaves out, "" if none
}

// ScheduleRow is one strings entry.
type ScheduleRow struct {
	Number, Plane, Faces, Inverter, Tracker string
	InSeries, Parallel, Modules             string
	VocCold, VmpSTC, VmpHot, MaxCurrent     string
	Verdict                                 Verdict
}

// TotalRow is a total of the schedule for a plane, a tracker, an inverter or all.
type TotalRow struct {
	Of, Strings, Modules, Power, Room string
	All                               bool // the total of everything
}
