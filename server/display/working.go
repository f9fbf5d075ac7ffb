package display

import (
	"strings"

	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/sizing/working"
	"rimeline/views"
)

// NewWorking makes the page with the whole arithmetic of a design.
func NewWorking(d *design.Design, r *sizing.Result) views.WorkingPage {
	c := newComposer(d, r)
	fittings := c.fittings()
	p := views.WorkingPage{
		Title:      titleOf(d),
		Verdict:    verdict(r.Verdict),
		Headline:   c.headline(),
		Tally:      c.tally(),
		Basis:      c.basis(),
		Rounding:   rounding,
		Coldest:    coldest(d),
		Symbols:    symbolsIn(allSteps(r)...),
		Ceilings:   c.ceilings(fittings),
		Kinds:      byKind(c.tell()),
		Questions:  c.questions(),
		Answered:   c.answered(),
		NotChecked: notChecked(d),
	}
	for _, f := range fittings {
		p.Limits = append(p.Limits, views.LimitWorking{Fit: f.fit, Steps: steps(f.row.Steps), Cites: strings.Join(f.row.Cites, "; ")})
	}
	return p
}

func titleOf(d *design.Design) string {
	if title := strings.TrimSpace(d.Title); title != "" {
		return title
	}
	return "Untitled design"
}

func allSteps(r *sizing.Result) [][]working.Step {
	var all [][]working.Step
	for i := range r.Limits {
		all = append(all, r.Limits[i].Steps)
	}
	for i := range r.Checks {
		all = append(all, r.Checks[i].Steps)
	}
	return all
}
