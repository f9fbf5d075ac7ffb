package display

import (
	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/views"
)

// NewSheet makes the stringing sheet of a design.
func NewSheet(d *design.Design, r *sizing.Result) views.SheetPage {
	return views.SheetPage{Title: d.Title, Verdict: views.Verdict(r.Verdict.String())}
}
