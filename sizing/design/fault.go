package design

// Fault is one reason why a document is refused.
type Fault struct {
	Pointer  string // JSON Pointer (RFC 6901) of the place; for a missing field the field's own
	Found    string // what stands there: "−24 V", "nothing"
	Expected string // what would be right
	Detail   string // one sentence for people
}

// Faults are all the reasons at once. It is an error.
type Faults []Fault

func (f Faults) Error() string {
	if len(f) == 0 {
		return "no faults"
	}
	return f[0].Pointer + ": " + f[0].Detail
}
