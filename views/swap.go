package views

// SwapPage shows what another module, inverter or temperature would change in a design.
type SwapPage struct {
	Base    Base
	Title   string        // of the design
	Carried []HiddenField // the whole form, so that every way back leads to what was typed
	Refused *Refusal
	Parts   []SwapPart
	Note    string      // why there is nothing to pick, "" if there is
	After   *Comparison // nil while nothing is chosen
	Faults  *Faults     // what keeps the design from being sized with what is chosen
}

// SwapPart is one thing that another can be put in the place of.
type SwapPart struct {
	ID      string
	Heading string
	Pick    *Field // what is kept in the equipment; nil where there is nothing to pick
	Typed   *Fold  // values to type in its place
	Fields  []Field
}
