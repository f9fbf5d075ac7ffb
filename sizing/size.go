// Package sizing is the front door of the engine: it orders the rules of
// sizing/stringing over a design and puts their results together. It has no
// arithmetic of its own, no clock, no input or output, and no state: the same
// design gives the same result, to the byte.
package sizing

import "rimeline/sizing/design"

// Size judges a design that has passed the reader ([design.Read]).
func Size(d *design.Design) *Result {
	return &Result{}
}
