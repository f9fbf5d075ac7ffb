package views

// FailurePage says why a request was not carried out.
type FailurePage struct {
	Base
	Heading   string // in ordinary words
	Message   string // what happened and what to do
	RequestID string // by which the log knows the request
}
