package display

import (
	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/views"
)

// NewAnswer makes the answer panel of a design.
func NewAnswer(d *design.Design, r *sizing.Result) views.Answer {
	return views.Answer{Verdict: views.Verdict(r.Verdict.String())}
}
