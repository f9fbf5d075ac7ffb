package record

import (
	"crypto/sha256"
	"errors"
	"fmt"
)

// Kinds of error that a caller can do something about. The store maps the
// database's errors to them, the server maps them to answers; any other error is
// a fault of ours.
var (
	ErrNotFound    = errors.New("not found")
	ErrInvalid     = errors.New("not valid")                      // the saved form of it would break a rule
	ErrConflict    = errors.New("in conflict with what is saved") // such as a key used for another request
	ErrUnavailable = errors.New("the database cannot be reached") // nothing was saved, or it is not known whether

	// ErrUnknownOutcome comes with ErrUnavailable where the database went away in the
	// instant of the save. Repeating it with the same request key is safe.
	ErrUnknownOutcome = errors.New("it is not known whether it was saved; repeat with the same request key")
)

// StaleError tells that what an editor started from is no longer the newest: two
// people, or two tabs, changed the same thing. It carries the number that is newest
// now; the caller reads it and shows both.
type StaleError struct{ Newest int64 }

func (e *StaleError) Error() string {
	return fmt.Sprintf("changed meanwhile: the newest is %d", e.Newest)
}

// UsedError tells that the key of a save was used before, with another content, and
// what was made then. It is of the kind [ErrConflict].
type UsedError struct {
	Made   ID    // the design or equipment
	Number int64 // its revision or version
}

func (e *UsedError) Error() string {
	return fmt.Sprintf("the request key was used before: %q, number %d, was made then", e.Made, e.Number)
}

func (e *UsedError) Unwrap() error { return ErrConflict }

func hash(document []byte) [32]byte { return sha256.Sum256(document) }
