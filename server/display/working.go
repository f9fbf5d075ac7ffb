package display

import (
	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/views"
)

// NewWorking makes the page with the whole arithmetic of a design.
func NewWorking(d *design.Design, r *sizing.Result) views.WorkingPage {
	return views.WorkingPage{Title: d.Title, Verdict: views.Verdict(r.Verdict.String())}
}
